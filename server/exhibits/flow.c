/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Participants: from records to those analysed. Every stage adds up, for each arm. */
#include "draw/flow.h"
#include "exhibits/ledger.h"
#include "exhibits/list.h"
#include "exhibits/model.h"
#include "exhibits/words.h"
#include <math.h>
#include <string.h>

struct stage {
    const char *stage, *label;
    size_t total;
    size_t *arms; /* [arms], NULL where the stage stands before the arms */
};

enum { FIXED_STAGES = 6 };
struct flow_result {
    struct stage *stages;
    size_t count;
    size_t records, randomised, excluded, analysed; /* indices of stages */
    size_t unusable; /* members with a value at the visit who are not analysed all the same */
};

static struct stage *add(struct view *view, struct flow_result *result, const char *stage, const char *label, bool by_arm) {
    struct stage *new = &result->stages[result->count++];
    *new = (struct stage){stage, label, 0, by_arm ? ARENA_NEW(view->arena, view->arms.count, size_t) : NULL};
    return new;
}

static void count_one(struct stage *stage, int arm) {
    stage->total++;
    stage->arms[arm]++;
}

/* Members of the set with an observed value of the outcome at a visit (on any scale). */
static void count_visit(struct view *view, struct stage *stage, size_t visit) {
    const struct frame *frame = view->frame;
    const struct column *column = frame->columns[frame->plan->outcomes[view->outcome].visits[visit].variable];
    for (size_t p = 0; p < frame->participant_count; p++) {
        if (view->arms.of[p] != NOWHERE && set_holds(frame, view->set, p) && column->state[p] == CELL_OBSERVED) {
            count_one(stage, view->arms.of[p]);
        }
    }
}

/* Who has a value at the visit and yet is not analysed, so that observed and analysed can be told apart. */
static size_t note_not_analysed(struct view *view, const struct model *model) {
    const struct analysis *analysis = &model->analysis;
    const double *raw = view->frame->columns[analysis->outcome->visits[analysis->visit].variable]->number;
    size_t off = 0;
    for (size_t i = 0; i < analysis->count; i++) {
        off += !isnan(raw[analysis->participant[i]]) && isnan(analysis->follow_up[i]);
    }
    const char *visit = lower_first(view, analysis->outcome->visits[analysis->visit].label);
    if (off) {
        view_note(view, "%s at %s not analysed: log10 cannot take %s.", count_words(view, off, "value"), visit,
            off == 1 ? "it" : "them");
    }
    if (model->design.baseline_dropped) {
        view_note(view, "%s with a value at %s not analysed: no baseline, and the plan drops those.",
            count_words(view, model->design.baseline_dropped, "participant"), visit);
    }
    return off + model->design.baseline_dropped;
}

/* What the screening log says, as typed into the plan, above what is in the file. */
static void add_screening(struct view *view, struct flow_result *result) {
    const struct frame *frame = view->frame;
    const struct screening *screening = &frame->plan->screening;
    if (!screening->given) {
        return;
    }
    add(view, result, "assessed", "assessed for eligibility", false)->total = screening->assessed;
    for (size_t i = 0; i < screening->reason_count; i++) {
        const char *reason = screening->reasons[i].reason;
        add(view, result, arena_format(view->arena, "not-randomised:%s", reason),
            arena_format(view->arena, "not randomised: %s", reason), false)->total = screening->reasons[i].n;
    }
    size_t expected = screening->assessed - screening->not_randomised, randomised = checks_randomised(frame);
    if (expected == randomised) {
        view_note(view, "Screening numbers are typed in from %s: %zu assessed less %zu not randomised is %zu, as many as the data have randomised.",
            screening->source, screening->assessed, screening->not_randomised, expected);
    } else {
        view_note(view, "Screening numbers are typed in from %s and do not add up: %zu assessed less %zu not randomised is %zu, and the data have "
            "%zu randomised.", screening->source, screening->assessed, screening->not_randomised, expected, randomised);
    }
}

static bool compute(struct view *view, struct fault *fault) {
    (void)fault;
    const struct frame *frame = view->frame;
    const struct outcome *outcome = &frame->plan->outcomes[view->outcome];
    struct flow_result *result = ARENA_NEW(view->arena, 1, struct flow_result);
    result->stages = ARENA_NEW(view->arena, FIXED_STAGES + 1 + frame->plan->screening.reason_count + outcome->visit_count + 1, struct stage);
    add_screening(view, result);
    result->records = result->count;
    add(view, result, "records", "records in the file", false)->total = frame->roster;
    add(view, result, "held-aside", "records held aside", false)->total = frame->held_aside;
    struct stage *no_arm = add(view, result, "no-arm", "no arm that the plan lists", false);
    result->randomised = result->count;
    struct stage *randomised = add(view, result, "randomised", "randomised", true);
    result->excluded = result->count;
    struct stage *excluded = add(view, result, "excluded",
        arena_format(view->arena, "left out of the %s", set_words(view->set)), true);
    for (size_t p = 0; p < frame->participant_count; p++) {
        if (frame->participants[p].record == NO_RECORD) {
            continue;
        }
        if (view->arms.of[p] == NOWHERE) {
            no_arm->total++;
            continue;
        }
        count_one(randomised, view->arms.of[p]);
        if (!set_holds(frame, view->set, p)) {
            count_one(excluded, view->arms.of[p]);
        }
    }
    for (size_t v = 0; v < outcome->visit_count; v++) {
        bool baseline = v == 0 && outcome->visit_count > 1;
        struct stage *stage = add(view, result, baseline ? "baseline" : arena_format(view->arena, "visit:%s", outcome->visits[v].label),
            arena_format(view->arena, "observed at %s", lower_first(view, outcome->visits[v].label)), true);
        count_visit(view, stage, v);
    }
    struct model_request request = {.outcome = (size_t)view->outcome, .visit = outcome->primary_visit,
        .scale = frame->scales[view->outcome], .set = view->set, .covariate = NOWHERE, .covariance = COVARIANCE_CLASSICAL};
    struct model model;
    model_fit(&model, view, &request);
    result->analysed = result->count;
    struct stage *analysed = add(view, result, "analysed",
        arena_format(view->arena, "analysed for %s", lower_first(view, outcome->label)), true);
    analysed->total = model.design.rows;
    memcpy(analysed->arms, model.design.n_of_arm, view->arms.count * sizeof *analysed->arms);
    result->unusable = note_not_analysed(view, &model);
    view->result = result;
    view->caption = arena_format(view->arena, "%s at %s, %s. Every record of the file is counted once: records = held aside + no arm + randomised, and "
        "randomised = left out + without a value for this analysis + analysed.", outcome->label,
        lower_first(view, outcome->visits[outcome->primary_visit].label), set_words(view->set));
    return true;
}

static void json(const struct view *view, struct json *json) {
    const struct flow_result *result = view->result;
    json_key_array(json, "stages");
    for (size_t i = 0; i < result->count; i++) {
        const struct stage *stage = &result->stages[i];
        json_object(json);
        json_field_string(json, "stage", stage->stage);
        json_field_string(json, "label", stage->label);
        json_key_array(json, "arms");
        for (size_t a = 0; stage->arms && a < view->arms.count; a++) {
            json_object(json);
            arm_json(view, a, json);
            json_field_integer(json, "n", (int64_t)stage->arms[a]);
            json_close(json);
        }
        json_close(json);
        json_field_integer(json, "total", (int64_t)stage->total);
        json_close(json);
    }
    json_close(json);
}

static void tables(const struct view *view, struct table **tables, size_t *count) {
    const struct flow_result *result = view->result;
    struct table *table = table_new(view->arena, "Flow of participants");
    table_column(table, "stage", "Stage", NULL, TABLE_WORDS);
    for (size_t a = 0; !view->arms.pooled && a < view->arms.count; a++) {
        table_column(table, view->arms.arm[a].code, view->arms.arm[a].label, NULL, TABLE_NUMBERS);
    }
    table_column(table, "total", "All", NULL, TABLE_NUMBERS);
    for (size_t i = 0; i < result->count; i++) {
        const struct stage *stage = &result->stages[i];
        table_row(table);
        table_put_header(table, stage->label);
        for (size_t a = 0; !view->arms.pooled && a < view->arms.count; a++) {
            if (stage->arms) {
                table_put_count(table, (int64_t)stage->arms[a]);
            } else {
                table_put_empty(table);
            }
        }
        table_put_count(table, (int64_t)stage->total);
    }
    tables[(*count)++] = table;
}

static struct flow_box leaving(const struct view *view, size_t count, const char *reason, size_t left, const char *reason2, size_t left2) {
    struct flow_exclusion *exclusions = ARENA_NEW(view->arena, 2, struct flow_exclusion);
    struct flow_box box = {.count = count, .exclusions = exclusions};
    if (left) {
        exclusions[box.exclusion_count++] = (struct flow_exclusion){reason, left};
    }
    if (left2) {
        exclusions[box.exclusion_count++] = (struct flow_exclusion){reason2, left2};
    }
    return box;
}

/* The box above all: who was assessed, and beside it those not randomised, by reason. */
static struct flow_box not_randomised(const struct view *view, const struct flow_result *result) {
    const struct screening *screening = &view->frame->plan->screening;
    struct flow_exclusion *exclusions = ARENA_NEW(view->arena, screening->reason_count, struct flow_exclusion);
    for (size_t i = 0; i < screening->reason_count; i++) {
        exclusions[i] = (struct flow_exclusion){result->stages[i + 1].label, screening->reasons[i].n};
    }
    return (struct flow_box){.count = screening->assessed, .exclusions = exclusions, .exclusion_count = screening->reason_count};
}

static void figure(const struct view *view, const struct figure *figure, struct html *html) {
    const struct flow_result *result = view->result;
    const struct outcome *outcome = &view->frame->plan->outcomes[view->outcome];
    const struct stage *s = result->stages, *randomised = &s[result->randomised], *excluded = &s[result->excluded],
                       *analysed = &s[result->analysed],
                       *records = &s[result->records];
    bool screened = result->records > 0;
    size_t arms = view->arms.count;
    bool split = !view->arms.pooled;
    struct flow_stage all[4] = {{.label = "assessed for eligibility"}, {.label = "records in the file"}, {.label = "randomised"},
        {.label = analysed->label}}, *stages = &all[1];
    all[0].total = not_randomised(view, result);
    stages[0].total = leaving(view, records->total, records[1].total == 1 ? "record held aside" : "records held aside", records[1].total,
        "without an arm that the plan lists", records[2].total);
    const char *no_value = arena_format(view->arena, "%s at %s", result->unusable ? "no value to analyse" : "no value",
        lower_first(view, outcome->visits[outcome->primary_visit].label));
    stages[1].total = leaving(view, randomised->total, excluded->label, excluded->total, no_value,
        randomised->total - excluded->total - analysed->total);
    stages[2].total = (struct flow_box){.count = analysed->total};
    struct flow_arm *labels = ARENA_NEW(view->arena, arms, struct flow_arm);
    struct flow_box *middle = ARENA_NEW(view->arena, arms, struct flow_box), *last = ARENA_NEW(view->arena, arms, struct flow_box);
    for (size_t a = 0; a < arms; a++) {
        labels[a] = (struct flow_arm){view->arms.arm[a].label, mark_of(view, a)};
        middle[a] = leaving(view, randomised->arms[a], excluded->label, excluded->arms[a], no_value,
            randomised->arms[a] - excluded->arms[a] - analysed->arms[a]);
        last[a].count = analysed->arms[a];
    }
    stages[1].arms = split ? middle : NULL;
    stages[2].arms = split ? last : NULL;
    struct flow flow = {.arms = split ? labels : NULL, .arm_count = split ? arms : 0, .stages = screened ? all : stages,
        .stage_count = screened ? 4 : 3};
    flow_svg(&flow, figure, html);
}

static const struct argument_rule arguments[] = {
    {"outcome", ARGUMENT_OUTCOME, "Analysed for which outcome; default the primary", NULL, true},
    {"set", ARGUMENT_SET, "full or per-protocol; default full", NULL, true},
    {0},
};

const struct exhibit exhibit_flow = {
    .name = "flow",
    .item = 1,
    .title = "Who came in, and who is analysed?",
    .tab = "Flow",
    .says = "Records, participants randomised, left out, observed and analysed, for each arm as blinding allows",
    .pooled = SHOWN_AS_ONE_ARM,
    .method = "Counts of records and participants at this version of the record, after the items on participant flow of the CONSORT statement. A "
              "participant whose records are held aside (several records, none kept yet) is not counted as randomised until one is kept. Analysed: has "
              "the follow-up the planned analysis needs, on its scale. Numbers of the screening log are the plan's, typed in with their source, and are "
              "held against the data.",
    .arguments = arguments,
    .compute = compute,
    .json = json,
    .tables = tables,
    .figure = figure,
};
