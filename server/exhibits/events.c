/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Events after randomisation: who had which, why, and whose outcome is observed all the same. They are no missing
 * values. */
#include "base/map.h"
#include "exhibits/ledger.h"
#include "exhibits/list.h"
#include "exhibits/words.h"
#include <stdlib.h>
#include <string.h>

struct event_arm {
    size_t n, with, without, not_recorded;
    size_t dated;    /* with it, and its date is not blank */
    size_t observed; /* with it, and the primary outcome is observed */
};

struct event_reason {
    const char *text;
    size_t *arms; /* [arms] */
};

struct event_row {
    const struct event *event;
    const struct column *column;
    struct event_arm *arms;
    struct event_reason *reasons; /* in byte order, the blank one last */
    size_t reason_count;
};

struct events_result {
    struct members members;
    struct event_row *rows;
    size_t count;
    const char *outcome; /* "Pressure at week 4" */
};

/* ---- computing ---- */

/* What a column beside the event's reads of a participant: current where the plan gives it a meaning, else as received.
 */
static const char *text_beside(
    const struct frame *frame, const char *name, const struct place *place, size_t participant) {
    const struct column *column = frame_column(frame, name);
    if (column) {
        return frame_text(frame, column, participant);
    }
    const struct cells *cells = &frame->cells[place->file];
    size_t record = frame->place[place->slot][participant];
    bool there = record != NO_RECORD && record != HELD_RECORD;
    return there ? cells_at(cells, record, cells_column(cells, place->column)) : NULL;
}

static bool is_blank(const char *text) {
    return !text || text[strspn(text, " \t\r\n\f\v")] == '\0';
}

static void count_arms(const struct view *view, const struct events_result *result, struct event_row *row) {
    const struct frame *frame = view->frame;
    const struct outcome *outcome = &frame->plan->outcomes[frame->plan->primary];
    const struct column *primary = frame->columns[outcome->visits[outcome->primary_visit].variable];
    for (size_t i = 0; i < result->members.count; i++) {
        size_t p = result->members.participant[i];
        struct event_arm *arm = &row->arms[result->members.arm[i]];
        int32_t answer = row->column->level[p];
        arm->n++;
        arm->with += answer == 1;
        arm->without += answer == 0;
        arm->not_recorded += answer == NOWHERE;
        arm->observed += answer == 1 && primary->state[p] == CELL_OBSERVED;
        arm->dated += answer == 1 && row->event->date &&
                      !is_blank(text_beside(frame, row->event->date, &row->event->date_place, p));
    }
}

static int by_reason(const void *a, const void *b) {
    const struct event_reason *x = a, *y = b;
    return !x->text || !y->text ? !x->text - !y->text : strcmp(x->text, y->text);
}

/* While blinded a reason must not give the arms away: by its distribution, or by naming one. */
static bool reasons_tell(const struct view *view, const struct event_row *row, const int32_t *level) {
    const struct frame *frame = view->frame;
    if (frame->blinding == BLINDING_UNBLINDED || !frame->arm) {
        return false;
    }
    for (size_t r = 0; r < row->reason_count; r++) {
        const char *text = row->reasons[r].text;
        for (size_t a = 0; text && a < frame->plan->arm_count; a++) {
            if (strcmp(text, frame->plan->arms[a].code) == 0 || strcasestr(text, frame->plan->arms[a].label)) {
                return true;
            }
        }
    }
    struct column as_column = {.kind = VARIABLE_CATEGORY, .level = (int32_t *)level, .level_count = row->reason_count};
    return arms_given_away(frame, &as_column) || arms_hide_column(frame, row->event->reason);
}

static void count_reasons(struct view *view, const struct events_result *result, struct event_row *row) {
    const struct frame *frame = view->frame;
    int32_t *level = ARENA_NEW(view->arena, frame->participant_count, int32_t);
    memset(level, 0xFF, frame->participant_count * sizeof *level); /* NOWHERE */
    row->reasons = ARENA_NEW(view->arena, result->members.count, struct event_reason);
    struct map seen;
    map_init(&seen);
    for (size_t i = 0; i < result->members.count; i++) {
        size_t p = result->members.participant[i];
        if (row->column->level[p] != 1) {
            continue;
        }
        const char *text = text_beside(frame, row->event->reason, &row->event->reason_place, p);
        text = is_blank(text) ? NULL : text;
        level[p] = map_put(&seen, text ? text : "", (int32_t)row->reason_count);
        if ((size_t)level[p] == row->reason_count) {
            row->reasons[row->reason_count++] =
                (struct event_reason){text, ARENA_NEW(view->arena, view->arms.count, size_t)};
        }
        row->reasons[level[p]].arms[result->members.arm[i]]++;
    }
    map_release(&seen);
    if (reasons_tell(view, row, level)) {
        view_note(view, "The reasons of %s are not shown while the study is %s: they would tell the arms apart.",
            row->event->label, blinding_name(frame->blinding));
        row->reason_count = 0;
    }
    if (row->reason_count) {
        qsort(row->reasons, row->reason_count, sizeof *row->reasons, by_reason);
    }
}

static bool compute(struct view *view, struct fault *fault) {
    (void)fault;
    const struct frame *frame = view->frame;
    const struct plan *plan = frame->plan;
    const struct outcome *outcome = &plan->outcomes[plan->primary];
    struct events_result *result = ARENA_NEW(view->arena, 1, struct events_result);
    result->rows = ARENA_NEW(view->arena, plan->event_count, struct event_row);
    result->outcome = arena_format(view->arena, "%s at %s", lower_first(view, outcome->label),
        lower_first(view, outcome->visits[outcome->primary_visit].label));
    members_take(&result->members, view, MEMBERS_WITH_ARM);
    for (size_t e = 0; e < plan->event_count; e++) {
        const struct event *event = &plan->events[e];
        const struct column *column = frame->columns[event->variable];
        if (arms_hide_column(frame, event->column)) {
            view_note(view, "%s is not shown while the study is %s: it would tell the arms apart.", event->label,
                blinding_name(frame->blinding));
            continue;
        }
        struct event_row *row = &result->rows[result->count++];
        *row = (struct event_row){
            .event = event, .column = column, .arms = ARENA_NEW(view->arena, view->arms.count, struct event_arm)};
        count_arms(view, result, row);
        if (event->reason) {
            count_reasons(view, result, row);
        }
    }
    if (!plan->event_count) {
        view_note(view, "The plan lists no events.");
    }
    members_note(view, &result->members);
    view->caption = arena_format(view->arena,
        "%s of the %s. An event stands apart from missing values: it blanks no outcome, and %s is used "
        "wherever it is observed.",
        count_words(view, result->members.count, "participant"), set_words(view->set), result->outcome);
    view->result = result;
    return true;
}

/* ---- writing ---- */

static void arm_counts_json(const struct view *view, const struct event_row *row, size_t a, struct json *json) {
    const struct event_arm *arm = &row->arms[a];
    json_object(json);
    arm_json(view, a, json);
    json_field_integer(json, "n", (int64_t)arm->n);
    json_field_integer(json, "with", (int64_t)arm->with);
    json_field_integer(json, "without", (int64_t)arm->without);
    json_field_integer(json, "not_recorded", (int64_t)arm->not_recorded);
    if (row->event->date) {
        json_field_integer(json, "dated", (int64_t)arm->dated);
    } else {
        json_field_null(json, "dated");
    }
    json_field_integer(json, "outcome_observed", (int64_t)arm->observed);
    json_close(json);
}

static void reasons_json(const struct view *view, const struct event_row *row, struct json *json) {
    json_key_array(json, "reasons");
    for (size_t r = 0; r < row->reason_count; r++) {
        json_object(json);
        json_field_string(json, "reason", row->reasons[r].text);
        json_key_array(json, "arms");
        for (size_t a = 0; a < view->arms.count; a++) {
            json_object(json);
            arm_json(view, a, json);
            json_field_integer(json, "n", (int64_t)row->reasons[r].arms[a]);
            json_close(json);
        }
        json_close(json);
        json_close(json);
    }
    json_close(json);
}

static void json(const struct view *view, struct json *json) {
    const struct events_result *result = view->result;
    const struct outcome *outcome = &view->frame->plan->outcomes[view->frame->plan->primary];
    json_field_string(json, "outcome", outcome->id);
    json_field_string(json, "visit", outcome->visits[outcome->primary_visit].label);
    json_key_array(json, "events");
    for (size_t i = 0; i < result->count; i++) {
        const struct event_row *row = &result->rows[i];
        json_object(json);
        json_field_string(json, "event", row->event->id);
        json_field_string(json, "label", row->event->label);
        json_field_string(json, "column", row->event->column);
        json_field_string(json, "kind", row->event->kind);
        json_field_string(json, "strategy", row->event->strategy);
        json_key_array(json, "arms");
        for (size_t a = 0; a < view->arms.count; a++) {
            arm_counts_json(view, row, a, json);
        }
        json_close(json);
        reasons_json(view, row, json);
        json_close(json);
    }
    json_close(json);
}

static void arm_columns(const struct view *view, const struct events_result *result, struct table *table) {
    for (size_t a = 0; a < view->arms.count; a++) {
        table_column(table, view->arms.arm[a].code, view->arms.arm[a].label,
            arena_format(view->arena, "n = %zu", result->members.n_of_arm[a]), TABLE_NUMBERS);
    }
}

static const char *heading(const struct view *view, const struct event *event) {
    return arena_format(view->arena, "%s%s%s · strategy: %s", event->label, event->kind ? " · " : "",
        event->kind ? event->kind : "", event->strategy ? event->strategy : "not said in the plan");
}

static void event_table_rows(
    const struct view *view, const struct events_result *result, const struct event_row *row, struct table *table) {
    const struct {
        const char *words;
        size_t place, whole; /* of a count in struct event_arm, and of what it is a part of */
        bool shown;
    } lines[] = {
        {"with it", offsetof(struct event_arm, with), offsetof(struct event_arm, n), true},
        {"without it", offsetof(struct event_arm, without), offsetof(struct event_arm, n), true},
        {"not recorded", offsetof(struct event_arm, not_recorded), offsetof(struct event_arm, n), true},
        {"with it and dated", offsetof(struct event_arm, dated), offsetof(struct event_arm, with),
            row->event->date != NULL},
        {arena_format(view->arena, "with it and %s observed", lower_first(view, result->outcome)),
            offsetof(struct event_arm, observed), offsetof(struct event_arm, with), true},
    };
    table_group(table, heading(view, row->event));
    for (size_t l = 0; l < sizeof lines / sizeof *lines; l++) {
        if (!lines[l].shown) {
            continue;
        }
        table_row(table);
        table_put_header(table, lines[l].words);
        for (size_t a = 0; a < view->arms.count; a++) {
            const char *arm = (const char *)&row->arms[a];
            size_t part, whole;
            memcpy(&part, arm + lines[l].place, sizeof part);
            memcpy(&whole, arm + lines[l].whole, sizeof whole);
            table_put_text(table, part_of_words(view, part, whole));
        }
    }
}

static void tables(const struct view *view, struct table **tables, size_t *count) {
    const struct events_result *result = view->result;
    struct table *table = table_new(view->arena, view->arms.count > 1 ? "Events by arm" : "Events");
    struct table *reasons = table_new(view->arena, "Reasons recorded, of those with the event");
    table_column(table, "participants", "Participants", NULL, TABLE_WORDS);
    table_column(reasons, "reason", "Reason", NULL, TABLE_WORDS);
    arm_columns(view, result, table);
    arm_columns(view, result, reasons);
    size_t given = 0;
    for (size_t i = 0; i < result->count; i++) {
        const struct event_row *row = &result->rows[i];
        event_table_rows(view, result, row, table);
        for (size_t r = 0; r < row->reason_count; r++) {
            if (r == 0) {
                table_group(reasons, row->event->label);
            }
            table_row(reasons);
            table_put_header(reasons, row->reasons[r].text ? row->reasons[r].text : "no reason recorded");
            for (size_t a = 0; a < view->arms.count; a++) {
                table_put_count(reasons, (int64_t)row->reasons[r].arms[a]);
            }
            given++;
        }
    }
    tables[(*count)++] = table;
    if (given) {
        tables[(*count)++] = reasons;
    }
}

static const struct argument_rule arguments[] = {
    {"set", ARGUMENT_SET, "full or per-protocol; default full", NULL, true},
    {0},
};

const struct exhibit exhibit_events = {
    .name = "events",
    .item = 3,
    .title = "Who stopped, withdrew, died or took rescue treatment?",
    .tab = "Events",
    .says = "Events of the plan by arm as blinding allows, with reasons, strategy and how many of those with one have "
            "the primary outcome observed",
    .pooled = SHOWN_AS_ONE_ARM,
    .by_arm_look = true,
    .table_first = true,
    .method = "An event is counted where its column reads one of the plan's codes for yes; a cell with none of the "
              "codes is not recorded. Events that rest "
              "on one column are read from it each by itself. An event never blanks an outcome: a value observed after "
              "it stays observed and is used "
              "as the analysis uses any other, and a missing one keeps its own reason under missing values. What an "
              "event means for the effect is the "
              "plan's strategy for it (ICH E9(R1), 2019: treatment policy, hypothetical, composite variable, while on "
              "treatment, principal stratum); "
              "it is stated here and applied by no exhibit. Counts only: nothing here compares the arms.",
    .arguments = arguments,
    .compute = compute,
    .json = json,
    .tables = tables,
};
