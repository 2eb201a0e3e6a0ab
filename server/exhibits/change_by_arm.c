/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Change: box plots of follow-up minus baseline by arm, over all or within the levels of a covariate. */
#include "draw/boxes.h"
#include "exhibits/list.h"
#include "exhibits/model.h"
#include "exhibits/words.h"
#include "stats/describe.h"
#include <math.h>
#include <string.h>

struct cell { /* one arm within one group */
    size_t group, arm, members, n; /* members: of the cell; n: with a change */
    struct description summary;
    struct interval whiskers;
    struct figure_point *points; /* [n] in identifier order */
};

struct change_result {
    struct model model; /* not fitted while one arm is shown */
    bool fitted, has_change;
    size_t group_count, cell_count, no_level;
    struct cell *cells; /* group by group, arms in shown order */
};

static void fill_cell(struct cell *cell, const struct model *model, const struct view *view) {
    const struct analysis *analysis = &model->analysis;
    double *values = ARENA_NEW(view->arena, analysis->count, double);
    cell->points = ARENA_NEW(view->arena, analysis->count, struct figure_point);
    for (size_t i = 0; i < analysis->count; i++) {
        if (analysis->arm[i] != (int)cell->arm || model->by.of[analysis->participant[i]] != (int)cell->group) {
            continue;
        }
        cell->members++;
        double value = analysis->has_baseline ? analysis->change[i] : analysis->follow_up[i];
        if (!isnan(value)) {
            const char *id = view->frame->participants[analysis->participant[i]].id;
            cell->points[cell->n] = (struct figure_point){id, value, false};
            values[cell->n++] = value;
        }
    }
    const double *sorted = sorted_copy(view->arena, values, cell->n);
    cell->summary = describe(sorted, cell->n);
    cell->whiskers = whiskers(sorted, cell->n);
    for (size_t i = 0; i < cell->n; i++) {
        double value = cell->points[i].value;
        cell->points[i].outlier = value < cell->whiskers.low || value > cell->whiskers.high;
    }
}

static const char *what_words(const struct view *view) {
    const struct outcome *outcome = &view->frame->plan->outcomes[view->outcome];
    return lower_first(view, outcome->label);
}

/* An interval says its level and its error, here as beside every other. */
static const char *differences_words(const struct view *view, const struct change_result *result) {
    return arena_format(view->arena, " Differences at the right are %sfrom one model, with %s CI (%s standard error).",
        result->has_change ? "baseline-adjusted, " : "", percent_words(view, view->frame->plan->confidence),
        view->frame->plan->robust ? "robust" : "classical");
}

static void make_caption(struct view *view, const struct change_result *result) {
    const struct outcome *outcome = &view->frame->plan->outcomes[view->outcome];
    const char *visit = outcome->visits[view->visit].label;
    const char *scale = view->scale == SCALE_LOG10 ?
        "log10 scale, so that a difference is the log of a ratio: 0 is no change, a ratio of 1" : "linear scale";
    const char *what = result->has_change ?
        arena_format(view->arena, "Change = %s minus %s", visit, lower_first(view, outcome->visits[0].label)) :
        arena_format(view->arena, "Values at %s (there is no baseline)", visit);
    view->caption = arena_format(view->arena, "%s, %s%s%s, %s. Box: quartiles (type 7); heavy bar: median; cross: mean; line: furthest value "
        "within 1.5 box lengths; every participant is drawn, those beyond the lines are named.%s", what, scale,
        view->scale == SCALE_LINEAR && *outcome->unit ? ", " : "", view->scale == SCALE_LINEAR ? outcome->unit : "",
        set_words(view->set), result->fitted ? differences_words(view, result) : "");
}

static bool compute(struct view *view, struct fault *fault) {
    (void)fault;
    struct change_result *result = ARENA_NEW(view->arena, 1, struct change_result);
    struct model_request request = {.outcome = (size_t)view->outcome, .visit = (size_t)view->visit, .scale = view->scale,
        .set = view->set, .covariate = view->covariate,
        .covariance = view->frame->plan->robust ? COVARIANCE_HC3 : COVARIANCE_CLASSICAL};
    model_fit(&result->model, view, &request);
    result->fitted = !view->arms.pooled;
    result->has_change = result->model.analysis.has_baseline;
    result->group_count = result->model.by.count;
    result->cells = ARENA_NEW(view->arena, result->group_count * view->arms.count, struct cell);
    for (size_t g = 0; g < result->group_count; g++) {
        for (size_t a = 0; a < view->arms.count; a++) {
            struct cell *cell = &result->cells[result->cell_count++];
            *cell = (struct cell){.group = g, .arm = a};
            fill_cell(cell, &result->model, view);
        }
    }
    for (size_t i = 0; i < result->model.analysis.count; i++) {
        result->no_level += result->model.by.of[result->model.analysis.participant[i]] == NOWHERE;
    }
    view->result = result;
    if (result->fitted) {
        model_notes(&result->model, view);
    }
    if (result->no_level) {
        view_note(view, "%zu of the set have no level of the covariate shown.", result->no_level);
    }
    if (view->covariate != NOWHERE) {
        view_note(view, "A difference within a level is not evidence that levels differ; the interaction speaks to that, with low power.");
    }
    make_caption(view, result);
    return true;
}

static void group_json(const struct view *view, const struct change_result *result, size_t group, struct json *json) {
    const struct grouping *by = &result->model.by;
    json_field_string(json, "by", by->covariate ? by->level[group].code : NULL);
    json_field_string(json, "by_label", by->covariate ? by->level[group].label : NULL);
    (void)view;
}

static void json(const struct view *view, struct json *json) {
    const struct change_result *result = view->result;
    json_key_array(json, "groups");
    for (size_t i = 0; i < result->cell_count; i++) {
        const struct cell *cell = &result->cells[i];
        json_object(json);
        group_json(view, result, cell->group, json);
        arm_json(view, cell->arm, json);
        json_field_integer(json, "n", (int64_t)cell->n);
        json_field_integer(json, "missing", (int64_t)(cell->members - cell->n));
        json_field_number(json, "mean", cell->summary.mean);
        json_field_number(json, "sd", cell->summary.sd);
        json_field_number(json, "minimum", cell->summary.minimum);
        json_field_number(json, "lower_quartile", cell->summary.lower_quartile);
        json_field_number(json, "median", cell->summary.median);
        json_field_number(json, "upper_quartile", cell->summary.upper_quartile);
        json_field_number(json, "maximum", cell->summary.maximum);
        interval_json(json, "whiskers", cell->whiskers.low, cell->whiskers.high);
        json_key_array(json, "beyond");
        for (size_t p = 0; p < cell->n; p++) {
            if (cell->points[p].outlier) {
                json_object(json);
                json_field_string(json, "participant", cell->points[p].participant);
                json_field_number(json, "value", cell->points[p].value);
                json_close(json);
            }
        }
        json_close(json);
        json_close(json);
    }
    json_close(json);
    json_key_array(json, "differences");
    for (size_t i = 0; result->fitted && i < result->cell_count; i++) {
        const struct cell *cell = &result->cells[i];
        if (cell->arm != view->arms.reference) {
            json_object(json);
            group_json(view, result, cell->group, json);
            json_field_string(json, "arm", view->arms.arm[cell->arm].code);
            json_field_string(json, "reference", view->arms.arm[view->arms.reference].code);
            estimate_json(json, &result->model.effect[cell->group * view->arms.count + cell->arm]);
            json_close(json);
        }
    }
    json_close(json);
    if (view->covariate != NOWHERE && result->fitted) {
        interaction_json(json, &result->model);
    }
}

static void tables(const struct view *view, struct table **tables, size_t *count) {
    const struct change_result *result = view->result;
    const struct outcome *outcome = &view->frame->plan->outcomes[view->outcome];
    int decimals = decimals_of(view, outcome, view->scale);
    struct table *table = table_new(view->arena, result->has_change ? "Change by arm" : "Values by arm");
    if (view->covariate != NOWHERE) {
        table_column(table, "by", grouping_words(view, result->model.by.covariate), NULL, TABLE_WORDS);
    }
    table_column(table, "arm", "Arm", NULL, TABLE_WORDS);
    static const char *const numbers[][2] = {{"n", "Analysed"}, {"missing", "Missing"}, {"mean", "Mean"}, {"sd", "SD"},
        {"minimum", "Minimum"}, {"lower_quartile", "Lower quartile"}, {"median", "Median"}, {"upper_quartile", "Upper quartile"},
        {"maximum", "Maximum"}};
    for (size_t i = 0; i < sizeof numbers / sizeof *numbers; i++) {
        table_column(table, numbers[i][0], numbers[i][1], i > 1 && view->scale == SCALE_LINEAR && *outcome->unit ? outcome->unit : NULL,
            TABLE_NUMBERS);
    }
    for (size_t i = 0; i < result->cell_count; i++) {
        const struct cell *cell = &result->cells[i];
        table_row(table);
        if (view->covariate != NOWHERE) {
            table_put_header(table, result->model.by.level[cell->group].label);
        }
        table_put_header(table, view->arms.arm[cell->arm].label);
        table_put_count(table, (int64_t)cell->n);
        table_put_count(table, (int64_t)(cell->members - cell->n));
        const struct description *s = &cell->summary;
        const double values[] = {s->mean, s->sd, s->minimum, s->lower_quartile, s->median, s->upper_quartile, s->maximum};
        for (size_t v = 0; v < sizeof values / sizeof *values; v++) {
            table_put_number(table, values[v], decimals);
        }
    }
    tables[(*count)++] = table;
}

static struct boxes_contrast contrast_of(const struct view *view, const struct change_result *result, size_t group, size_t arm,
    int decimals) {
    const struct estimate *effect = &result->model.effect[group * view->arms.count + arm];
    struct boxes_contrast contrast = {.label = contrast_words(view, arm)};
    if (effect->status != STATUS_OK) {
        contrast.sentence = status_sentence(effect->status);
    } else if (view->scale == SCALE_LOG10) {
        contrast.label = arena_format(view->arena, "ratio, %s to %s", view->arms.arm[arm].label,
            view->arms.arm[view->arms.reference].label);
        contrast.estimate = decimal_words(view, pow(10, effect->estimate), 2);
        contrast.interval = interval_words(view, pow(10, effect->low), pow(10, effect->high), 2);
    } else {
        contrast.estimate = signed_words(view, effect->estimate, decimals);
        contrast.interval = interval_words(view, effect->low, effect->high, decimals);
    }
    return contrast;
}

static const char *interaction_words(const struct view *view, const struct change_result *result, int decimals) {
    const struct model *model = &result->model;
    if (view->covariate == NOWHERE || !result->fitted) {
        return NULL;
    }
    const char *what = grouping_words(view, model->by.covariate);
    if (model->interaction.status != STATUS_OK) {
        return arena_format(view->arena, "%s by arm: %s", what, status_sentence(model->interaction.status));
    }
    struct text p;
    text_init(&p);
    text_p_value(&p, model->interaction.p);
    const char *words = arena_format(view->arena, "%s by arm, interaction: p %s (F %s on %.0f and %.0f df)", what, p.data,
        decimal_words(view, model->interaction.f, 2), model->interaction.df1, model->interaction.df2);
    text_release(&p);
    const struct estimate *difference = &model->interaction.difference;
    if (difference->status == STATUS_OK && view->scale == SCALE_LINEAR) {
        words = arena_format(view->arena, "%s; difference of differences %s (%s).", words,
            decimal_words(view, difference->estimate, decimals), interval_words(view, difference->low, difference->high, decimals));
    } else if (difference->status == STATUS_OK) {
        words = arena_format(view->arena, "%s; ratio of ratios %s (%s).", words, decimal_words(view, pow(10, difference->estimate), 2),
            interval_words(view, pow(10, difference->low), pow(10, difference->high), 2));
    }
    return words;
}

static void limit_axis(const struct view *view, const struct change_result *result, struct axis_plan *axis) {
    size_t n = 0;
    double *all = ARENA_NEW(view->arena, result->model.analysis.count, double);
    for (size_t i = 0; i < result->cell_count; i++) {
        for (size_t p = 0; p < result->cells[i].n; p++) {
            all[n++] = result->cells[i].points[p].value;
        }
    }
    axis_about(view, all, n, false, axis);
}

static void figure(const struct view *view, const struct figure *figure, struct html *html) {
    const struct change_result *result = view->result;
    const struct outcome *outcome = &view->frame->plan->outcomes[view->outcome];
    size_t arms = view->arms.count;
    int decimals = decimals_of(view, outcome, view->scale);
    struct boxes_group *groups = ARENA_NEW(view->arena, result->group_count, struct boxes_group);
    struct boxes_row *rows = ARENA_NEW(view->arena, result->cell_count, struct boxes_row);
    struct boxes_contrast *contrasts = ARENA_NEW(view->arena, result->cell_count, struct boxes_contrast);
    size_t shown = 0;
    for (size_t g = 0; g < result->group_count; g++) {
        struct boxes_group *group = &groups[shown];
        *group = (struct boxes_group){.level = view->covariate != NOWHERE ? result->model.by.level[g].label : NULL,
            .rows = &rows[g * arms], .row_count = arms, .contrasts = &contrasts[g * arms]};
        size_t members = 0;
        for (size_t a = 0; a < arms; a++) {
            const struct cell *cell = &result->cells[g * arms + a];
            const struct description *s = &cell->summary;
            members += cell->members;
            rows[g * arms + a] = (struct boxes_row){.arm = view->arms.pooled ? NULL : view->arms.arm[a].label, .mark = mark_of(view, a),
                .counts = arena_format(view->arena, "%zu analysed of %zu", cell->n, cell->members),
                .sentence = cell->n == 0 ? "No values." : NULL, .low_whisker = cell->whiskers.low, .low_quartile = s->lower_quartile,
                .median = s->median, .mean = s->mean, .high_quartile = s->upper_quartile, .high_whisker = cell->whiskers.high,
                .points = cell->points, .point_count = cell->n};
            if (result->fitted && a != view->arms.reference) {
                contrasts[g * arms + group->contrast_count++] = contrast_of(view, result, g, a, decimals);
            }
        }
        shown += members > 0 || result->group_count == 1;
    }
    struct boxes boxes = {.decimals = decimals, .groups = groups, .group_count = shown,
        .interaction = interaction_words(view, result, decimals)};
    bool log10_scale = view->scale == SCALE_LOG10;
    boxes.axis = (struct axis_plan){.scale = AXIS_LINEAR, .low = NAN, .high = NAN, .with_sign = result->has_change,
        .null_line = result->has_change ? 0 : (double)NAN};
    limit_axis(view, result, &boxes.axis);
    boxes.axis.title = arena_format(view->arena, "%s%s%s%s", result->has_change ? "Change in " : "", what_words(view),
        log10_scale ? ", log10 of the ratio" : *outcome->unit ? ", " : "", log10_scale ? "" : outcome->unit);
    if (result->has_change) {
        direction_words(outcome, &boxes.axis.lower, &boxes.axis.upper);
    }
    boxes_svg(&boxes, figure, html);
}

static void title_of(const struct view *view, struct text *title) {
    const struct outcome *outcome = &view->frame->plan->outcomes[view->outcome];
    const char *visit = outcome->visits[view->visit].label;
    if (outcome->visit_count == 1) {
        text_format(title, view->arms.pooled ? "How is %s at %s spread?" : "Does %s at %s differ between the arms?", what_words(view),
            lower_first(view, visit));
    } else if (view->arms.pooled) {
        text_format(title, "How did %s change from baseline to %s?", what_words(view), lower_first(view, visit));
    } else {
        text_format(title, "Does the change in %s to %s differ between the arms?", what_words(view), lower_first(view, visit));
    }
}

static const struct argument_rule arguments[] = {
    {"outcome", ARGUMENT_OUTCOME, "Which outcome; default the primary", NULL, true},
    {"by", ARGUMENT_COVARIATE, "Split by the levels or bands of a covariate; default all together", NULL, true},
    {"visit", ARGUMENT_VISIT, "At which visit; default the primary visit", NULL, true},
    {"set", ARGUMENT_SET, "full or per-protocol; default full", NULL, false},
    {"scale", ARGUMENT_SCALE, "linear or log10; default the latest decision, else the plan", NULL, false},
    {0},
};

const struct exhibit exhibit_change_by_arm = {
    .name = "change-by-arm",
    .item = 5,
    .title = "Does the change from baseline differ between the arms?",
    .tab = "Change by arm",
    .says = "Box plots of the change from baseline by arm, with every participant, over all or by sex, age band, any covariate",
    .pooled = SHOWN_AS_ONE_ARM,
    .by_arm_look = true,
    .method = "Change is follow-up minus baseline on the analysis scale, for participants with both. Quartiles by Hyndman & Fan 1996 (Am Stat "
              "50:361), type 7; whiskers reach the furthest value within 1.5 times the interquartile range of the box (Tukey 1977).\n"
              "The difference at the right is the baseline-adjusted one: follow-up on arm, baseline and the plan's covariates by least "
              "squares, t with the residual degrees of freedom. Split by a covariate, all levels come from one model with arm by level, and "
              "the interaction is the F test of that model against the one with a single effect of arm (Altman & Bland 2003, BMJ 326:219). "
              "There is no p for a single level.\n"
              "A change within an arm says nothing about the treatment by itself: regression to the mean moves it too.",
    .arguments = arguments,
    .compute = compute,
    .json = json,
    .tables = tables,
    .figure = figure,
    .title_of = title_of,
};
