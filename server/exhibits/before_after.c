/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Change: each participant before and after, by arm. It shows change within persons, which is no effect of treatment;
 * so there is no test of it anywhere. */
#include "draw/pairs.h"
#include "exhibits/ledger.h"
#include "exhibits/list.h"
#include "exhibits/words.h"
#include "stats/describe.h"
#include <math.h>

static const double UNKNOWN = NAN;

struct pairs_group {   /* one shown arm */
    size_t members, n; /* n: with both values, in identifier order */
    size_t no_before, no_after, no_both;
    struct pairs_point *points; /* [members] who has a value before; `after` is NaN where there is none */
    size_t point_count;
    double median_before, median_after; /* of the pairs, in the unit */
};

struct pairs_result {
    struct analysis analysis;
    struct pairs_group *groups;
};

static const struct outcome *outcome_of(const struct view *view) {
    return &view->frame->plan->outcomes[view->outcome];
}

static const char *visit_words(const struct view *view, int visit) {
    return lower_first(view, outcome_of(view)->visits[visit].label);
}

/* ---- computing ---- */

static double in_unit(const struct view *view, size_t visit, size_t participant) {
    return view->frame->columns[outcome_of(view)->visits[visit].variable]->number[participant];
}

/* Changes beyond the fences of the arm's changes, on the scale of the analysis, get their names drawn. */
static void name_outliers(const struct view *view, const double *change, struct pairs_group *group) {
    double *kept = ARENA_NEW(view->arena, group->point_count, double);
    size_t n = keep_finite(change, group->point_count, kept);
    struct fences fences = tukey_fences(sorted_copy(view->arena, kept, n), n);
    for (size_t i = 0; i < group->point_count; i++) {
        group->points[i].outlier = change[i] < fences.inner.low || change[i] > fences.inner.high;
    }
}

static void take_group(
    const struct view *view, const struct analysis *analysis, size_t arm, struct pairs_group *group) {
    group->points = ARENA_NEW(view->arena, analysis->count, struct pairs_point);
    double *change = ARENA_NEW(view->arena, analysis->count, double),
           *before = ARENA_NEW(view->arena, analysis->count, double);
    double *after = ARENA_NEW(view->arena, analysis->count, double);
    for (size_t i = 0; i < analysis->count; i++) {
        if (analysis->arm[i] != (int)arm) {
            continue;
        }
        size_t p = analysis->participant[i];
        bool has_before = !isnan(analysis->baseline[i]), has_after = !isnan(analysis->follow_up[i]);
        group->members++;
        group->no_both += !has_before && !has_after;
        group->no_before += !has_before && has_after;
        group->no_after += has_before && !has_after;
        if (!has_before) {
            continue;
        }
        struct pairs_point *point = &group->points[group->point_count];
        *point = (struct pairs_point){view->frame->participants[p].id, in_unit(view, 0, p),
            has_after ? in_unit(view, analysis->visit, p) : UNKNOWN, false};
        change[group->point_count++] = analysis->change[i];
        if (has_after) {
            before[group->n] = point->before;
            after[group->n++] = point->after;
        }
    }
    group->median_before = describe(sorted_copy(view->arena, before, group->n), group->n).median;
    group->median_after = describe(sorted_copy(view->arena, after, group->n), group->n).median;
    name_outliers(view, change, group);
}

static const char *caption_of(const struct view *view) {
    const struct outcome *outcome = outcome_of(view);
    return arena_format(view->arena,
        "%s%s%s at %s and at %s, drawn on the %s scale; %s. What is seen here is change within persons, "
        "which comes about without any treatment too; the effect is the difference between arms, adjusted for "
        "baseline.",
        outcome->label, *outcome->unit ? ", " : "", outcome->unit, visit_words(view, 0), visit_words(view, view->visit),
        scale_name(view->scale), set_words(view->set));
}

static void notes(struct view *view, const struct analysis *analysis) {
    if (analysis->not_on_scale) {
        view_note(view, "%s a value that is not positive, which has no place on the log10 scale.",
            analysis->not_on_scale == 1 ? "1 participant has"
                                        : arena_format(view->arena, "%zu participants have", analysis->not_on_scale));
    }
    struct members left_out = {
        .held_aside = analysis->held_aside, .no_arm = analysis->no_arm, .excluded = analysis->excluded};
    members_note(view, &left_out);
}

/* A pair needs a visit after the baseline. */
static bool paired(const struct view *view, struct fault *fault) {
    const struct outcome *outcome = outcome_of(view);
    if (outcome->visit_count == 1) {
        return fault_set(fault, FAULT_INPUT,
            "before-after: %s has one visit, so there is nothing before it to pair it with", outcome->label);
    }
    return view->visit > 0 ||
           fault_set(fault, FAULT_INPUT, "before-after: visit=%s is the baseline itself; say a later visit",
               outcome->visits[0].label);
}

static bool compute(struct view *view, struct fault *fault) {
    if (!paired(view, fault)) {
        return false;
    }
    struct pairs_result *result = ARENA_NEW(view->arena, 1, struct pairs_result);
    struct analysis *analysis = &result->analysis;
    analysis_take(analysis, view->frame, &view->arms, (size_t)view->outcome, (size_t)view->visit, view->scale,
        view->set, view->arena);
    result->groups = ARENA_NEW(view->arena, view->arms.count, struct pairs_group);
    for (size_t a = 0; a < view->arms.count; a++) {
        take_group(view, analysis, a, &result->groups[a]);
    }
    notes(view, analysis);
    view->caption = caption_of(view);
    view->result = result;
    return true;
}

static void title_of(const struct view *view, struct text *title) {
    text_format(title, "How did %s move from %s to %s in each participant?", lower_first(view, outcome_of(view)->label),
        visit_words(view, 0), visit_words(view, view->visit));
}

/* ---- JSON ---- */

static void group_json(const struct view *view, size_t arm, const struct pairs_group *group, struct json *json) {
    json_object(json);
    arm_json(view, arm, json);
    json_field_integer(json, "n", (int64_t)group->n);
    json_field_integer(json, "missing", (int64_t)(group->members - group->n));
    json_field_integer(json, "missing_before", (int64_t)group->no_before);
    json_field_integer(json, "missing_after", (int64_t)group->no_after);
    json_field_integer(json, "missing_both", (int64_t)group->no_both);
    json_field_number(json, "median_before", group->median_before);
    json_field_number(json, "median_after", group->median_after);
    json_key_array(json, "pairs");
    for (size_t i = 0; i < group->point_count; i++) {
        if (!isnan(group->points[i].after)) {
            json_object(json);
            json_field_string(json, "participant", group->points[i].participant);
            json_field_number(json, "before", group->points[i].before);
            json_field_number(json, "after", group->points[i].after);
            json_close(json);
        }
    }
    json_close(json);
    json_close(json);
}

static void json(const struct view *view, struct json *json) {
    const struct pairs_result *result = view->result;
    const struct outcome *outcome = outcome_of(view);
    json_field_string(json, "outcome", outcome->id);
    json_field_string(json, "label", outcome->label);
    json_field_string(json, "unit", outcome->unit);
    json_field_string(json, "scale", scale_name(view->scale));
    json_field_string(json, "before", outcome->visits[0].label);
    json_field_string(json, "after", outcome->visits[view->visit].label);
    json_field_integer(json, "not_on_scale", (int64_t)result->analysis.not_on_scale);
    json_key_array(json, "groups");
    for (size_t a = 0; a < view->arms.count; a++) {
        group_json(view, a, &result->groups[a], json);
    }
    json_close(json);
}

/* ---- tables ---- */

static struct table *group_table(const struct view *view, const struct pairs_result *result) {
    const struct outcome *outcome = outcome_of(view);
    int decimals = decimals_of(view, outcome, SCALE_LINEAR);
    const char *before = visit_words(view, 0), *after = visit_words(view, view->visit);
    struct table *table = table_new(view->arena, "Pairs by arm");
    table_column(table, "arm", "Arm", NULL, TABLE_WORDS);
    table_column(table, "participants", "Participants", NULL, TABLE_NUMBERS);
    table_column(table, "pairs", "Pairs", NULL, TABLE_NUMBERS);
    table_column(table, "missing_before", arena_format(view->arena, "Without %s", before), NULL, TABLE_NUMBERS);
    table_column(table, "missing_after", arena_format(view->arena, "Without %s", after), NULL, TABLE_NUMBERS);
    table_column(table, "missing_both", "Without both", NULL, TABLE_NUMBERS);
    table_column(
        table, "median_before", arena_format(view->arena, "Median at %s", before), outcome->unit, TABLE_NUMBERS);
    table_column(table, "median_after", arena_format(view->arena, "Median at %s", after), outcome->unit, TABLE_NUMBERS);
    for (size_t a = 0; a < view->arms.count; a++) {
        const struct pairs_group *group = &result->groups[a];
        table_row(table);
        table_put_header(table, view->arms.arm[a].label);
        table_put_count(table, (int64_t)group->members);
        table_put_count(table, (int64_t)group->n);
        table_put_count(table, (int64_t)group->no_before);
        table_put_count(table, (int64_t)group->no_after);
        table_put_count(table, (int64_t)group->no_both);
        table_put_number(table, group->median_before, decimals);
        table_put_number(table, group->median_after, decimals);
    }
    table_note(table, "Medians are of the pairs, in the unit as recorded.");
    return table;
}

static struct table *pair_table(const struct view *view, const struct pairs_result *result) {
    const struct outcome *outcome = outcome_of(view);
    int decimals = decimals_of(view, outcome, SCALE_LINEAR) - 1;
    struct table *table = table_new(view->arena, "Every pair");
    table_column(table, "participant", "Participant", NULL, TABLE_WORDS);
    table_column(table, "before", outcome->visits[0].label, outcome->unit, TABLE_NUMBERS);
    table_column(table, "after", outcome->visits[view->visit].label, outcome->unit, TABLE_NUMBERS);
    for (size_t a = 0; a < view->arms.count; a++) {
        const struct pairs_group *group = &result->groups[a];
        table_group(
            table, arena_format(view->arena, "%s, %s", view->arms.arm[a].label, count_words(view, group->n, "pair")));
        for (size_t i = 0; i < group->point_count; i++) {
            const struct pairs_point *point = &group->points[i];
            if (!isnan(point->after)) {
                table_row(table);
                table_row_opens(table, point->participant);
                table_put_header(table, point->participant);
                table_put_number(table, point->before, decimals);
                table_put_number(table, point->after, decimals);
            }
        }
    }
    return table;
}

static void tables(const struct view *view, struct table **tables, size_t *count) {
    tables[(*count)++] = group_table(view, view->result);
    tables[(*count)++] = pair_table(view, view->result);
}

/* ---- the figure ---- */

static const char *panel_counts(const struct view *view, const struct pairs_group *group) {
    struct text text;
    text_init(&text);
    text_format(
        &text, "%s of %s", count_words(view, group->n, "pair"), count_words(view, group->members, "participant"));
    if (group->no_after) {
        text_format(&text, ", %zu without a value at %s", group->no_after, visit_words(view, view->visit));
    }
    if (group->no_before) {
        text_format(&text, ", %zu without a value at %s", group->no_before, visit_words(view, 0));
    }
    if (group->no_both) {
        text_format(&text, ", %zu without both", group->no_both);
    }
    const char *words = arena_text(view->arena, text.data);
    text_release(&text);
    return words;
}

/* Every value that is drawn, before and after. */
static void limit_axis(const struct view *view, const struct pairs_result *result, struct axis_plan *axis) {
    size_t n = 0;
    double *all = ARENA_NEW(view->arena, 2 * result->analysis.count, double);
    for (size_t a = 0; a < view->arms.count; a++) {
        const struct pairs_group *group = &result->groups[a];
        for (size_t i = 0; i < group->point_count; i++) {
            all[n++] = group->points[i].before;
            if (!isnan(group->points[i].after)) {
                all[n++] = group->points[i].after;
            }
        }
    }
    axis_about(view, all, n, axis->scale == AXIS_LOG10, axis);
}

static void figure(const struct view *view, const struct figure *figure, struct html *html) {
    const struct pairs_result *result = view->result;
    const struct outcome *outcome = outcome_of(view);
    struct pairs_panel *panels = ARENA_NEW(view->arena, view->arms.count, struct pairs_panel);
    for (size_t a = 0; a < view->arms.count; a++) {
        const struct pairs_group *group = &result->groups[a];
        panels[a] = (struct pairs_panel){.arm = view->arms.count > 1 ? view->arms.arm[a].label : NULL,
            .mark = mark_of(view, a),
            .counts = panel_counts(view, group),
            .points = group->points,
            .point_count = group->point_count,
            .median_before = group->median_before,
            .median_after = group->median_after};
    }
    const char *title = arena_format(view->arena, "%s%s%s%s", outcome->label, *outcome->unit ? ", " : "", outcome->unit,
        view->scale == SCALE_LOG10 ? ", log10 scale" : "");
    struct pairs pairs = {.axis = {.scale = view->scale == SCALE_LOG10 ? AXIS_LOG10 : AXIS_LINEAR,
                              .low = UNKNOWN,
                              .high = UNKNOWN,
                              .title = title,
                              .null_line = UNKNOWN},
        .decimals = decimals_of(view, outcome, SCALE_LINEAR),
        .before = visit_words(view, 0),
        .after = visit_words(view, view->visit),
        .panels = panels,
        .panel_count = view->arms.count};
    limit_axis(view, result, &pairs.axis);
    pairs_svg(&pairs, figure, html);
}

static const struct argument_rule arguments[] = {
    {"outcome", ARGUMENT_OUTCOME, "id of an outcome; default the primary", NULL, true},
    {"visit", ARGUMENT_VISIT, "label of the visit after; default the primary visit", NULL, true},
    {"scale", ARGUMENT_SCALE, "linear or log10: the scale it is drawn on; default the latest decision, else the plan",
        NULL, false},
    {"set", ARGUMENT_SET, "full or per-protocol; default full", NULL, false}, {0}};

const struct exhibit exhibit_before_after = {
    .name = "before-after",
    .item = 5,
    .title = "How did each participant move from before to after?",
    .tab = "Before and after",
    .says = "Each participant's value before and after, by arm; change within persons, not the effect",
    .pooled = SHOWN_AS_ONE_ARM,
    .by_arm_look = true,
    .method = "A pair is a participant with a value at baseline and at the visit, both with a place on the scale. Up "
              "to 80 pairs in each arm "
              "are drawn as lines, more as points about the line of no change. Medians are of the pairs, in the unit.\n"
              "Pairs are named whose change on the scale of the analysis lies beyond the fences of their arm, 1.5 "
              "interquartile "
              "ranges from the quartiles (Tukey 1977).\n"
              "There is no test of change within an arm: regression to the mean, time and attention change values in "
              "every arm, and testing "
              "each arm apart misleads (Bland & Altman 2011, Trials 12:264).",
    .arguments = arguments,
    .compute = compute,
    .json = json,
    .tables = tables,
    .figure = figure,
    .title_of = title_of,
};
