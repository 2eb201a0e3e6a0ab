/* SPDX-License-Identifier: GPL-3.0-or-later */
/* One participant: every value as received and as now current, what is doubtful, what was decided, where they count. */
#include "exhibits/doubtful.h"
#include "exhibits/list.h"
#include "exhibits/words.h"
#include "trial/convert.h"
#include "trial/derived.h"
#include <math.h>
#include <string.h>

struct value {
    const struct variable *variable;
    const struct column *column;
    const char *received, *current; /* NULL: set missing, or several records and none kept */
    enum cell_state state;
    uint32_t origin;
    bool doubtful, hidden;
    const char *converted; /* "101 mg/dL, from 5.6 by decision 7"; NULL: in its own unit */
    const char **on_records; /* what each record of the column's file and visit says while none is kept, else NULL */
    size_t on_record_count;
    const struct derived *derived; /* where it is computed, else NULL; `inputs` are then what it rests on, as it now reads */
    const char *inputs, *why;      /* why: words, where it could not be computed, else NULL */
};

struct analysis_of {
    const struct outcome *outcome;
    const char *visit, *why; /* why not, NULL where the participant counts */
};

enum { SHOWN_RECORDS = 32 };

struct records { /* of a participant in one file, or at one visit of it */
    size_t record[SHOWN_RECORDS], count;
};

struct participant_result {
    size_t participant;
    struct records records;  /* of the first file, of all visits */
    struct records *of_slot; /* [plan.slot_count] */
    const char *arm; /* shown arm's label, NULL while pooled or without one */
    struct value *values;
    size_t value_count;
    struct discrepancies found;
    bool *concerned; /* [found.count] */
    struct analysis_of *analyses;
    size_t analysis_count;
};

static bool is_doubtful(const struct participant_result *result, const char *column) {
    for (size_t i = 0; i < result->found.count; i++) {
        const struct discrepancy *discrepancy = &result->found.list[i];
        if (result->concerned[i] && discrepancy->state != DISCREPANCY_SETTLED && discrepancy->column &&
            strcmp(discrepancy->column, column) == 0) {
            return true;
        }
    }
    return false;
}

/* A converted number beside the text it stands for. */
static const char *converted_words(const struct view *view, size_t variable, size_t participant, const char *text) {
    const struct column *column = view->frame->columns[variable];
    const struct decision *by = column->number && !isnan(column->number[participant]) ? convert_of(view->frame, variable, participant) : NULL;
    return by && !decision_hidden(view, by) ? arena_format(view->arena, "%.6g %s, converted from %s by decision %u", column->number[participant],
        by->unit_to, text, by->number) : NULL;
}

static void take_derived(struct view *view, const struct participant_result *result, struct value *value) {
    const struct frame *frame = view->frame;
    struct derived_value taken;
    derived_take(&taken, frame, value->derived, result->participant);
    value->current = frame_text(frame, value->column, result->participant);
    value->inputs = derived_inputs(view->arena, frame, value->derived, result->participant);
    value->why = taken.status == DERIVED_COMPUTED ? NULL : derived_status_words(taken.status);
    value->doubtful = is_doubtful(result, value->variable->column);
    if (taken.status == DERIVED_HELD_ASIDE) {
        value->on_record_count = result->records.count;
        value->on_records = ARENA_NEW(view->arena, value->on_record_count, const char *);
    }
}

static void take_values(struct view *view, struct participant_result *result) {
    const struct frame *frame = view->frame;
    for (size_t v = 0; v < frame->plan->variable_count; v++) {
        struct value *value = &result->values[result->value_count++];
        const struct column *column = frame->columns[v];
        *value = (struct value){.variable = &frame->plan->variables[v], .column = column, .state = (enum cell_state)column->state[result->participant]};
        value->hidden = arms_hide_column(frame, value->variable->column);
        if (value->variable->derived != NOWHERE) {
            value->derived = &frame->plan->derived[value->variable->derived];
            take_derived(view, result, value);
            continue;
        }
        size_t record = frame_place(frame, column, result->participant);
        if (record != NO_RECORD && record != HELD_RECORD && !value->hidden) {
            value->received = frame_received(frame, column, result->participant);
            value->current = frame_text(frame, column, result->participant);
            value->origin = column->origin ? column->origin[record] : 0;
            value->doubtful = is_doubtful(result, value->variable->column);
            value->converted = converted_words(view, v, result->participant, value->current);
        } else if (!value->hidden) {
            const struct records *records = &result->of_slot[column->slot];
            value->on_records = ARENA_NEW(view->arena, records->count, const char *);
            value->on_record_count = records->count;
            for (size_t i = 0; i < records->count; i++) {
                value->on_records[i] = cells_at(column->cells, records->record[i], column->index);
            }
        }
    }
}

static const char *why_not(const struct view *view, const struct outcome *outcome, size_t p, size_t visit) {
    const struct frame *frame = view->frame;
    const struct column *column = frame->columns[outcome->visits[visit].variable];
    const struct column *baseline = frame->columns[outcome->visits[0].variable];
    enum scale scale = frame->scales[outcome - frame->plan->outcomes];
    const struct participant *who = &frame->participants[p];
    return who->record == NO_RECORD                                       ? "several records, and none kept yet" :
        view->arms.of[p] == NOWHERE                                       ? "no arm that the plan lists" :
        who->excluded_full                                                ? "left out of the full analysis set by a decision" :
        column->state[p] != CELL_OBSERVED                                 ? cell_state_words((enum cell_state)column->state[p]) :
        scale == SCALE_LOG10 && !(column->number[p] > 0)                  ? "the logarithmic scale cannot take the value" :
        frame->plan->drop_missing_baseline && visit > 0 && baseline->state[p] != CELL_OBSERVED ? "no baseline, dropped as the plan says" :
                                                                                                 NULL;
}

static void take_analyses(struct view *view, struct participant_result *result) {
    const struct plan *plan = view->frame->plan;
    size_t room = 0;
    for (size_t o = 0; o < plan->outcome_count; o++) {
        room += plan->outcomes[o].visit_count;
    }
    result->analyses = ARENA_NEW(view->arena, room, struct analysis_of);
    for (size_t o = 0; o < plan->outcome_count; o++) {
        const struct outcome *outcome = &plan->outcomes[o];
        for (size_t v = outcome->visit_count > 1; v < outcome->visit_count; v++) {
            result->analyses[result->analysis_count++] = (struct analysis_of){outcome, outcome->visits[v].label,
                why_not(view, outcome, result->participant, v)};
        }
    }
}

static bool compute(struct view *view, struct fault *fault) {
    (void)fault;
    const struct frame *frame = view->frame;
    struct participant_result *result = ARENA_NEW(view->arena, 1, struct participant_result);
    result->participant = (size_t)frame_participant(frame, view_asked(view, "participant"));
    size_t all = frame_records(frame, result->participant, result->records.record, SHOWN_RECORDS);
    result->records.count = all < SHOWN_RECORDS ? all : SHOWN_RECORDS;
    result->of_slot = ARENA_NEW(view->arena, frame->plan->slot_count, struct records);
    for (size_t s = 0; s < frame->plan->slot_count; s++) {
        struct records *records = &result->of_slot[s];
        all = frame_slot_records(frame, s, result->participant, records->record, SHOWN_RECORDS);
        records->count = all < SHOWN_RECORDS ? all : SHOWN_RECORDS;
    }
    checks_run(frame, view->received, view->arena, &result->found);
    result->concerned = ARENA_NEW(view->arena, result->found.count, bool);
    for (size_t i = 0; i < result->found.count; i++) {
        result->concerned[i] = discrepancy_concerns(&result->found.list[i], frame->participants[result->participant].id);
    }
    result->values = ARENA_NEW(view->arena, frame->plan->variable_count, struct value);
    take_values(view, result);
    take_analyses(view, result);
    int arm = view->arms.of[result->participant];
    result->arm = frame->blinding != BLINDING_UNBLINDED || arm == NOWHERE ? NULL : view->arms.arm[arm].label;
    view->result = result;
    return true;
}

/* How a computed value came about; null for one that was recorded. */
static void derived_json(const struct view *view, const struct value *value, struct json *json) {
    if (!value->derived) {
        json_null(json);
        return;
    }
    json_object(json);
    json_field_string(json, "formula", derived_words(view->arena, value->derived));
    json_field_string(json, "inputs", value->inputs);
    json_field_string(json, "why", value->why);
    json_close(json);
}

static void value_json(const struct view *view, const struct value *value, struct json *json) {
    static const char *const kinds[] = {[VARIABLE_NUMBER] = "number", [VARIABLE_CATEGORY] = "category", [VARIABLE_EVENT] = "event",
        [VARIABLE_DATE] = "date"};
    json_object(json);
    json_field_string(json, "column", value->variable->column);
    json_field_string(json, "label", value->variable->label);
    json_field_string(json, "unit", value->variable->unit);
    json_field_string(json, "kind", kinds[value->variable->kind]);
    json_field_string(json, "received", value->received);
    json_field_string(json, "current", value->current);
    json_field_string(json, "converted", value->converted);
    json_field_string(json, "state", value->hidden ? NULL : cell_state_name(value->state));
    json_field_string(json, "words", value->hidden ? "hidden while blinded: its levels tell the arms apart" :
        value->why ? value->why : cell_state_words(value->state));
    json_key(json, "derived");
    derived_json(view, value, json);
    json_field_integer(json, "origin", value->origin);
    json_field_bool(json, "doubtful", value->doubtful);
    json_key_array(json, "on_records");
    for (size_t i = 0; value->on_records && i < value->on_record_count; i++) {
        json_string(json, value->on_records[i]);
    }
    json_close(json);
    json_key_array(json, "levels");
    for (size_t l = 0; value->variable->kind == VARIABLE_CATEGORY && !value->hidden && l < value->column->level_count; l++) {
        json_object(json);
        json_field_string(json, "code", value->column->levels[l].code);
        json_field_string(json, "label", value->column->levels[l].label);
        json_field_bool(json, "listed", l < value->column->listed_count);
        json_close(json);
    }
    json_close(json);
    json_close(json);
}

/* Decisions about this participant, or about a code of a column that made one of their values what it is. */
static bool about(const struct frame *frame, const struct participant_result *result, const struct decision *decision, const char *id) {
    if (decision->participant) {
        return strcmp(decision->participant, id) == 0;
    }
    for (size_t i = 0; i < result->value_count; i++) {
        const struct value *value = &result->values[i];
        bool code = decision->kind == DECISION_MISSING_CODE && decision->column && value->state == CELL_MISSING_CODE &&
                    plan_covers(decision->column, value->variable->column) && value->current && decision->value &&
                    strcmp(value->current, decision->value) == 0;
        bool format = decision->kind == DECISION_NUMBER_FORMAT && decision->column && value->current &&
                      plan_covers(decision->column, value->variable->column) && strchr(value->current, ',');
        const struct decision *convert = value->converted ? convert_of(frame, i, result->participant) : NULL;
        if (value->origin == decision->number || code || format || convert == decision) {
            return true;
        }
    }
    return false;
}

static void write_rows(const struct records *records, struct json *json) {
    for (size_t i = 0; i < records->count; i++) {
        json_integer(json, (int64_t)records->record[i] + 1);
    }
}

/* Where the plan names files, the participant's records of each, and of each planned visit. */
static void files_json(const struct plan *plan, const struct participant_result *result, struct json *json) {
    json_key_array(json, "files");
    for (size_t s = 0; s < plan->slot_count && plan->files[0].id; s++) {
        json_object(json);
        json_field_string(json, "file", plan->files[plan->slots[s].file].id);
        json_field_string(json, "visit", plan->slots[s].code);
        json_key_array(json, "records");
        write_rows(&result->of_slot[s], json);
        json_close(json);
        json_close(json);
    }
    json_close(json);
}

static void json(const struct view *view, struct json *json) {
    const struct participant_result *result = view->result;
    const struct frame *frame = view->frame;
    const char *id = frame->participants[result->participant].id;
    json_field_string(json, "participant", id);
    json_field_string(json, "arm", result->arm);
    json_field_bool(json, "held_aside", frame->participants[result->participant].record == NO_RECORD);
    json_key_array(json, "records");
    write_rows(&result->records, json);
    json_close(json);
    files_json(frame->plan, result, json);
    json_key_array(json, "values");
    for (size_t i = 0; i < result->value_count; i++) {
        value_json(view, &result->values[i], json);
    }
    json_close(json);
    json_key_array(json, "discrepancies");
    for (size_t i = 0; i < result->found.count; i++) {
        if (result->concerned[i]) {
            discrepancy_json(&result->found.list[i], json);
        }
    }
    json_close(json);
    json_key_array(json, "decisions");
    for (size_t i = 0; i < frame->version; i++) {
        if (about(frame, result, &frame->decisions[i], id)) {
            decision_json(view, &frame->decisions[i], frame->stands[i], json);
        }
    }
    json_close(json);
    json_key_array(json, "analyses");
    for (size_t i = 0; i < result->analysis_count; i++) {
        const struct analysis_of *analysis = &result->analyses[i];
        json_object(json);
        json_field_string(json, "outcome", analysis->outcome->id);
        json_field_string(json, "label", analysis->outcome->label);
        json_field_string(json, "visit", analysis->visit);
        json_field_bool(json, "counts", !analysis->why);
        json_field_string(json, "why", analysis->why);
        json_close(json);
    }
    json_close(json);
}

static void tables(const struct view *view, struct table **tables, size_t *count) {
    const struct participant_result *result = view->result;
    struct table *values = table_new(view->arena, "Values");
    table_column(values, "variable", "Variable", NULL, TABLE_WORDS);
    table_column(values, "received", "Received", NULL, TABLE_WORDS);
    table_column(values, "current", "Current", NULL, TABLE_WORDS);
    table_column(values, "state", "State", NULL, TABLE_WORDS);
    for (size_t i = 0; i < result->value_count; i++) {
        const struct value *value = &result->values[i];
        table_row(values);
        table_put_header(values, value->variable->label);
        table_put_text(values, value->received);
        table_put_text(values, value->converted ? value->converted : value->current);
        if (value->derived) {
            table_put_format(values, "%s: %s (%s)", value->why ? value->why : "computed", derived_words(view->arena, value->derived),
                value->inputs);
        } else {
            table_put_text(values, value->hidden ? "hidden while blinded" : cell_state_words(value->state));
        }
    }
    tables[(*count)++] = values;
    struct table *analyses = table_new(view->arena, "Analyses");
    table_column(analyses, "outcome", "Outcome", NULL, TABLE_WORDS);
    table_column(analyses, "visit", "Visit", NULL, TABLE_WORDS);
    table_column(analyses, "counts", "Counts", NULL, TABLE_WORDS);
    table_column(analyses, "why", "Why not", NULL, TABLE_WORDS);
    for (size_t i = 0; i < result->analysis_count; i++) {
        const struct analysis_of *analysis = &result->analyses[i];
        table_row(analyses);
        table_put_header(analyses, analysis->outcome->label);
        table_put_text(analyses, analysis->visit);
        table_put_text(analyses, analysis->why ? "no" : "yes");
        table_put_text(analyses, analysis->why);
    }
    tables[(*count)++] = analyses;
}

static void title_of(const struct view *view, struct text *title) {
    text_format(title, "What is recorded of %s?", view_asked(view, "participant"));
}

static const struct argument_rule arguments[] = {
    {"participant", ARGUMENT_PARTICIPANT, "The participant's identifier as the file has it", NULL, false},
    {0},
};

const struct exhibit exhibit_participant = {
    .name = "participant",
    .item = 0,
    .title = "What is recorded of this participant?",
    .tab = "Participant",
    .says = "One participant's values as received and as now current, discrepancies, decisions, and the analyses they count in",
    .pooled = SHOWN,
    .table_first = true,
    .method = "Received: the text of the file, kept for ever. Current: after every decision that stands. No arm is shown while blinded.",
    .arguments = arguments,
    .compute = compute,
    .json = json,
    .tables = tables,
    .title_of = title_of,
};
