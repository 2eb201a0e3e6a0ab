/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Participants: what came in, and what each column means. */
#include "exhibits/conversions.h"
#include "exhibits/list.h"
#include "exhibits/words.h"
#include <stdio.h>
#include <string.h>

struct row {
    size_t file;
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

static const char meaningless[] = "none in the plan";

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
        variable->covariate == NOWHERE  ? "of a derived value" :
                                       arena_format(view->arena, "covariate, %s", kind_words(variable->kind));
    count_states(row, frame, frame->columns[index]);
    if (arms_hide_column(frame, row->column)) {
        row->note = "hidden while blinded: its levels tell the arms apart";
        row->counted = false;
    }
}

static void describe_column(struct view *view, struct row *row) {
    const struct frame *frame = view->frame;
    const struct plan *plan = frame->plan;
    int variable = plan_variable(plan, row->column);
    if (plan_identifier_file(plan, row->column) != NOWHERE) {
        row->meaning = "participant's identifier";
    } else if (plan_visit_file(plan, row->column) != NOWHERE) {
        row->meaning = "visit's code";
    } else if (plan_window_file(plan, row->column) != NOWHERE) {
        row->meaning = "date by which visits are found";
    } else if (plan->arm_column && strcmp(row->column, plan->arm_column) == 0) {
        row->meaning = "arm";
        row->note = frame->blinding == BLINDING_UNBLINDED ? NULL : "its texts are not shown while blinded";
        count_states(row, frame, frame->arm);
    } else if (variable != NOWHERE) {
        describe_variable(view, row, variable);
    }
}

static void add_row(struct view *view, struct columns_result *result, size_t file, const char *column) {
    struct row *row = &result->rows[result->count++];
    *row = (struct row){.file = file, .column = column, .label = "", .unit = "", .meaning = meaningless};
    describe_column(view, row);
}

static bool has_meaning(const struct plan *plan, const char *name) {
    return plan_variable(plan, name) != NOWHERE || (plan->arm_column && strcmp(plan->arm_column, name) == 0);
}

/* In a file with one row per visit a row for each visit at which the column has a meaning; without any, one. */
static void add_column(struct view *view, struct columns_result *result, size_t f, const char *column) {
    const struct plan_file *file = &view->frame->plan->files[f];
    const char *name = plan_column_name(view->arena, view->frame->plan, f, column);
    size_t before = result->count;
    for (size_t c = 0; c < file->codes.count; c++) {
        const char *at_visit = arena_format(view->arena, "%s@%s", name, file->codes.item[c]);
        if (has_meaning(view->frame->plan, at_visit)) {
            add_row(view, result, f, at_visit);
        }
    }
    if (result->count == before || plan_window_file(view->frame->plan, name) != NOWHERE) {
        add_row(view, result, f, name);
    }
}

static void say_what_came(struct view *view) {
    const struct study_facts *facts = &view->facts;
    if (!view->frame->plan->files[0].id) {
        view->caption = arena_format(view->arena, "%s, received %s: %zu bytes, %zu records of %zu columns, %s, delimiter %s. SHA-256 of the bytes: %s.",
            facts->data_name, facts->received_at, facts->data_length, view->frame->cells->records, view->frame->cells->columns, facts->encoding,
            facts->delimiter, facts->data_sha256);
        return;
    }
    view->caption = arena_format(view->arena, "%zu file%s, received %s: %zu bytes. SHA-256 of %s: %s.", facts->file_count,
        facts->file_count == 1 ? "" : "s", facts->received_at, facts->data_length,
        facts->file_count == 1 ? "the bytes" : "the list of their fingerprints", facts->data_sha256);
}

static bool compute(struct view *view, struct fault *fault) {
    (void)fault;
    const struct frame *frame = view->frame;
    const struct plan *plan = frame->plan;
    struct columns_result *result = ARENA_NEW(view->arena, 1, struct columns_result);
    size_t room = 0, unused = 0;
    for (size_t f = 0; f < plan->file_count; f++) {
        room += frame->cells[f].columns * (plan->files[f].by_visit ? plan->files[f].codes.count : 1) + 1;
    }
    result->rows = ARENA_NEW(view->arena, room, struct row);
    for (size_t f = 0; f < plan->file_count; f++) {
        for (size_t c = 0; c < frame->cells[f].columns; c++) {
            add_column(view, result, f, frame->cells[f].names[c]);
        }
    }
    for (size_t i = 0; i < result->count; i++) {
        unused += strcmp(result->rows[i].meaning, meaningless) == 0;
    }
    view->result = result;
    if (unused) {
        view_note(view, "%zu column%s of the file%s %s no meaning in the plan; kept as received, and in no analysis.", unused,
            unused == 1 ? "" : "s", plan->file_count > 1 ? "s" : "", unused == 1 ? "has" : "have");
    }
    say_what_came(view);
    return true;
}

/* ---- the files ---- */

static size_t with_record(const struct frame *frame, size_t slot, bool held) {
    size_t count = 0;
    for (size_t p = 0; p < frame->participant_count; p++) {
        bool held_here = frame->place[slot][p] == HELD_RECORD || frame->participants[p].record == NO_RECORD;
        count += frame->place[slot][p] != NO_RECORD && held_here == held;
    }
    return count;
}

static void file_json(const struct view *view, size_t f, struct json *json) {
    const struct frame *frame = view->frame;
    const struct plan_file *file = &frame->plan->files[f];
    const struct study_file_facts *facts = &view->facts.files[f];
    const struct join *join = &frame->joins[f];
    json_object(json);
    json_field_string(json, "id", file->id);
    json_field_string(json, "name", facts->name);
    json_field_string(json, "sha256", facts->sha256);
    json_field_string(json, "layout", file->by_visit ? "visit" : "participant");
    json_field_integer(json, "bytes", (int64_t)facts->length);
    json_field_string(json, "encoding", facts->encoding);
    json_field_string(json, "delimiter", facts->delimiter);
    json_field_integer(json, "records", (int64_t)facts->records);
    json_field_integer(json, "columns", (int64_t)facts->columns);
    json_field_integer(json, "matched", (int64_t)join->matched);
    json_field_integer(json, "unmatched", (int64_t)join->unmatched);
    json_field_integer(json, "double", (int64_t)join->doubled);
    json_field_integer(json, "unplanned", (int64_t)join->unplanned);
    json_field_integer(json, "blank", (int64_t)join->blank);
    json_field_integer(json, "undated", (int64_t)join->undated);
    json_field_integer(json, "farther", (int64_t)join->farther);
    json_key_array(json, "visits");
    for (size_t c = 0; c < file->codes.count; c++) {
        json_object(json);
        json_field_string(json, "code", file->codes.item[c]);
        json_field_integer(json, "n", (int64_t)with_record(frame, file->first_slot + c, false));
        json_field_integer(json, "held_aside", (int64_t)with_record(frame, file->first_slot + c, true));
        json_close(json);
    }
    json_close(json);
    json_close(json);
}

static bool finds_visits_by_date(const struct plan *plan) {
    bool found = false;
    for (size_t f = 0; f < plan->file_count; f++) {
        found = found || plan->files[f].window;
    }
    return found;
}

static struct table *files_table(const struct view *view) {
    bool dated = finds_visits_by_date(view->frame->plan);
    struct table *table = table_new(view->arena, "Files as received, and how their records join the participants of the first");
    table_column(table, "file", "File", NULL, TABLE_WORDS);
    table_column(table, "name", "Name", NULL, TABLE_WORDS);
    table_column(table, "layout", "One row per", NULL, TABLE_WORDS);
    table_column(table, "records", "Records", NULL, TABLE_NUMBERS);
    table_column(table, "matched", "Matched", NULL, TABLE_NUMBERS);
    table_column(table, "unmatched", "Unmatched", NULL, TABLE_NUMBERS);
    table_column(table, "double", "Held double", NULL, TABLE_NUMBERS);
    table_column(table, "unplanned", "Visit not planned", NULL, TABLE_NUMBERS);
    table_column(table, "blank", "No identifier", NULL, TABLE_NUMBERS);
    if (dated) {
        table_column(table, "undated", "No date to place it by", NULL, TABLE_NUMBERS);
        table_column(table, "farther", "Another nearer", NULL, TABLE_NUMBERS);
    }
    table_column(table, "sha256", "SHA-256 of the bytes", NULL, TABLE_WORDS);
    for (size_t f = 0; f < view->frame->plan->file_count; f++) {
        const struct plan_file *file = &view->frame->plan->files[f];
        const struct join *join = &view->frame->joins[f];
        table_row(table);
        table_put_header(table, file->id);
        table_put_text(table, view->facts.files[f].name);
        table_put_text(table, file->by_visit ? "visit" : "participant");
        table_put_count(table, (int64_t)view->facts.files[f].records);
        table_put_count(table, (int64_t)join->matched);
        table_put_count(table, (int64_t)join->unmatched);
        table_put_count(table, (int64_t)join->doubled);
        table_put_count(table, (int64_t)join->unplanned);
        table_put_count(table, (int64_t)join->blank);
        if (dated) {
            table_put_count(table, (int64_t)join->undated);
            table_put_count(table, (int64_t)join->farther);
        }
        table_put_text(table, view->facts.files[f].sha256);
    }
    table_note(table, arena_format(view->arena, "Matched, unmatched, visit not planned%s and no identifier add up to the records. Unmatched: of participants the "
        "first file does not have. Held double: participants and visits with several records, held aside until one is kept.%s",
        dated ? ", no date" : "", dated ? " Another nearer: matched, but another record of the visit's window is nearer to the target day." : ""));
    return table;
}

/* NULL where no file has one row per visit. */
static struct table *visits_table(const struct view *view) {
    struct table *table = table_new(view->arena, "Records by planned visit");
    table_column(table, "file", "File", NULL, TABLE_WORDS);
    table_column(table, "visit", "Visit", NULL, TABLE_WORDS);
    table_column(table, "n", "Participants with a record", NULL, TABLE_NUMBERS);
    table_column(table, "held_aside", "Held aside", NULL, TABLE_NUMBERS);
    size_t rows = 0;
    for (size_t s = 0; s < view->frame->plan->slot_count; s++) {
        const struct slot *slot = &view->frame->plan->slots[s];
        if (slot->code) {
            table_row(table);
            table_put_header(table, view->frame->plan->files[slot->file].id);
            table_put_text(table, slot->code);
            table_put_count(table, (int64_t)with_record(view->frame, s, false));
            table_put_count(table, (int64_t)with_record(view->frame, s, true));
            rows++;
        }
    }
    return rows ? table : NULL;
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
    json_key_array(json, "files");
    for (size_t f = 0; f < view->frame->plan->file_count; f++) {
        file_json(view, f, json);
    }
    json_close(json);
    json_key_array(json, "columns");
    for (size_t i = 0; i < result->count; i++) {
        const struct row *row = &result->rows[i];
        json_object(json);
        json_field_string(json, "column", row->column);
        if (view->frame->plan->files[row->file].id) {
            json_field_string(json, "file", view->frame->plan->files[row->file].id);
        }
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
    conversions_json(view, json);
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
    bool several = view->frame->plan->files[0].id != NULL;
    struct table *by_visit = several ? visits_table(view) : NULL;
    if (several) {
        tables[(*count)++] = files_table(view);
    }
    if (by_visit) {
        tables[(*count)++] = by_visit;
    }
    struct table *table = table_new(view->arena, several ? "Columns of the files" : "Columns of the file");
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
    struct table *conversions = conversions_table(view);
    if (conversions) {
        tables[(*count)++] = conversions;
    }
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
