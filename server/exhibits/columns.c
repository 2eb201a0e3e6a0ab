/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Participants: what came in, and what each column means. */
#include "exhibits/list.h"
#include "exhibits/words.h"
#include <stdio.h>
#include <string.h>

struct row {
    const char *column, *label, *meaning, *unit, *note;
    size_t observed, missing, held_aside; /* of participants; not counted (SIZE_MAX) for columns without a meaning */
    bool counted;
};

struct columns_result {
    struct row *rows;
    size_t count;
};

static const char *kind_words(enum variable_kind kind) {
    static const char *const words[] = {"number", "category", "event", "arm", "participant", "visit", "date"};
    return words[kind];
}

static void count_states(struct row *row, const struct frame *frame, const struct column *column) {
    row->counted = true;
    for (size_t p = 0; p < frame->participant_count; p++) {
        row->observed += column->state[p] == CELL_OBSERVED;
        row->held_aside += column->state[p] == CELL_HELD_ASIDE;
    }
    row->missing = frame->participant_count - row->observed - row->held_aside;
}

static void describe_variable(struct view *view, struct row *row, int index) {
    const struct frame *frame = view->frame;
    const struct variable *variable = &frame->plan->variables[index];
    row->label = variable->label;
    row->unit = variable->unit;
    row->meaning = variable->outcome != NOWHERE && variable->covariate != NOWHERE ? "outcome and covariate" :
        variable->outcome != NOWHERE ? (frame->plan->outcomes[variable->outcome].primary ? "primary outcome" : "secondary outcome") :
        variable->event != NOWHERE   ? "event" :
        variable->kind == VARIABLE_DATE ? "date" :
                                       arena_format(view->arena, "covariate, %s", kind_words(variable->kind));
    count_states(row, frame, frame->columns[index]);
    if (arms_hide_column(frame, row->column)) {
        row->note = "hidden while blinded: its levels tell the arms apart";
        row->counted = false;
    }
}

static bool compute(struct view *view, struct fault *fault) {
    (void)fault;
    const struct frame *frame = view->frame;
    const struct plan *plan = frame->plan;
    struct columns_result *result = ARENA_NEW(view->arena, 1, struct columns_result);
    result->count = frame->cells->columns;
    result->rows = ARENA_NEW(view->arena, result->count, struct row);
    size_t unused = 0;
    for (size_t c = 0; c < result->count; c++) {
        struct row *row = &result->rows[c];
        *row = (struct row){.column = frame->cells->names[c], .label = "", .unit = "", .meaning = "none in the plan"};
        int variable = plan_variable(plan, row->column);
        if (strcmp(row->column, plan->participant) == 0) {
            row->meaning = "participant's identifier";
        } else if (plan->arm_column && strcmp(row->column, plan->arm_column) == 0) {
            row->meaning = "arm";
            row->note = frame->blinding == BLINDING_UNBLINDED ? NULL : "its texts are not shown while blinded";
            count_states(row, frame, frame->arm);
        } else if (variable != NOWHERE) {
            describe_variable(view, row, variable);
        } else {
            unused++;
        }
    }
    view->result = result;
    if (unused) {
        view_note(view, "%zu column%s of the file no meaning in the plan; kept as received, and in no analysis.", unused,
            unused == 1 ? " has" : "s have");
    }
    const struct study_facts *facts = &view->facts;
    view->caption = arena_format(view->arena, "%s, received %s: %zu bytes, %zu records of %zu columns, %s, delimiter %s. SHA-256 of the bytes: %s.",
        facts->data_name, facts->received_at, facts->data_length, frame->cells->records, frame->cells->columns, facts->encoding,
        facts->delimiter, facts->data_sha256);
    return true;
}

static void json(const struct view *view, struct json *json) {
    const struct columns_result *result = view->result;
    const struct study_facts *facts = &view->facts;
    json_key_object(json, "file");
    json_field_string(json, "name", facts->data_name);
    json_field_string(json, "received_at", facts->received_at);
    json_field_integer(json, "bytes", (int64_t)facts->data_length);
    json_field_integer(json, "records", (int64_t)view->frame->cells->records);
    json_field_string(json, "encoding", facts->encoding);
    json_field_string(json, "delimiter", facts->delimiter);
    json_close(json);
    json_key_array(json, "columns");
    for (size_t i = 0; i < result->count; i++) {
        const struct row *row = &result->rows[i];
        json_object(json);
        json_field_string(json, "column", row->column);
        json_field_string(json, "label", row->label);
        json_field_string(json, "meaning", row->meaning);
        json_field_string(json, "unit", row->unit);
        if (row->counted) {
            json_field_integer(json, "n", (int64_t)row->observed);
            json_field_integer(json, "missing", (int64_t)row->missing);
            json_field_integer(json, "held_aside", (int64_t)row->held_aside);
        } else {
            json_field_null(json, "n");
            json_field_null(json, "missing");
            json_field_null(json, "held_aside");
        }
        json_field_string(json, "note", row->note);
        json_close(json);
    }
    json_close(json);
}

static void put_counts(struct table *table, const struct row *row) {
    if (row->counted) {
        table_put_count(table, (int64_t)row->observed);
        table_put_count(table, (int64_t)row->missing);
    } else {
        table_put_empty(table);
        table_put_empty(table);
    }
}

static void tables(const struct view *view, struct table **tables, size_t *count) {
    const struct columns_result *result = view->result;
    struct table *table = table_new(view->arena, "Columns of the file");
    table_column(table, "column", "Column", NULL, TABLE_WORDS);
    table_column(table, "label", "Label", NULL, TABLE_WORDS);
    table_column(table, "meaning", "Meaning", NULL, TABLE_WORDS);
    table_column(table, "unit", "Unit", NULL, TABLE_WORDS);
    table_column(table, "n", "Observed", NULL, TABLE_NUMBERS);
    table_column(table, "missing", "Missing", NULL, TABLE_NUMBERS);
    table_column(table, "note", "Note", NULL, TABLE_WORDS);
    for (size_t i = 0; i < result->count; i++) {
        const struct row *row = &result->rows[i];
        table_row(table);
        table_put_header(table, row->column);
        table_put_text(table, *row->label ? row->label : NULL);
        table_put_text(table, row->meaning);
        table_put_text(table, *row->unit ? row->unit : NULL);
        put_counts(table, row);
        table_put_text(table, row->note);
    }
    tables[(*count)++] = table;
}

static const struct argument_rule arguments[] = {{0}};

const struct exhibit exhibit_columns = {
    .name = "columns",
    .item = 1,
    .title = "What came in, and what does each column mean?",
    .tab = "File and columns",
    .says = "The file as received, its fingerprint, and what each column means by the plan",
    .pooled = SHOWN,
    .table_first = true,
    .method = "The received bytes are kept unchanged in the study file; their SHA-256 (FIPS 180-4) is their fingerprint. Counts are of participants "
              "at this version of the record; those of a participant whose records are held aside are in neither column.",
    .arguments = arguments,
    .compute = compute,
    .json = json,
    .tables = tables,
};
