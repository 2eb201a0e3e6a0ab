/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Record: where the study departs from its plan as loaded, and what was known when it did. */
#include "exhibits/list.h"
#include "exhibits/words.h"
#include <string.h>

struct deviation {
    const struct decision *decision;
    const char *path, *from, *to; /* from and to NULL where absent or hidden */
    bool stands, hidden, after_unblinding;
};

struct deviations_result {
    struct deviation *list;
    size_t count, standing, late;
};

/* The scale before a decision: the last one decided that stands now, else the plan's. */
static const char *scale_before(const struct frame *frame, size_t i, int outcome) {
    const char *scale = scale_name(frame->plan->outcomes[outcome].scale);
    for (size_t j = 0; j < i; j++) {
        const struct decision *other = &frame->decisions[j];
        if (frame->stands[j] && other->kind == DECISION_SCALE && strcmp(other->outcome, frame->decisions[i].outcome) == 0) {
            scale = other->scale;
        }
    }
    return scale;
}

/* Whether a decision departs from the plan, and how. A scale decision that returns to the plan's is none. */
static bool departs(struct view *view, size_t i, struct deviation *deviation) {
    const struct frame *frame = view->frame;
    const struct decision *decision = &frame->decisions[i];
    bool hidden = decision_hidden(view, decision);
    *deviation = (struct deviation){.decision = decision, .stands = frame->stands[i], .hidden = hidden,
        .after_unblinding = decision->blinding && strcmp(decision->blinding, blinding_name(BLINDING_UNBLINDED)) == 0};
    if (decision->kind == DECISION_AMEND_PLAN) {
        deviation->path = decision->path;
        deviation->from = hidden ? NULL : decision->from;
        deviation->to = hidden ? NULL : decision->to;
        return true;
    }
    int outcome = decision->kind == DECISION_SCALE ? plan_outcome(frame->plan, decision->outcome) : NOWHERE;
    if (outcome == NOWHERE || strcmp(decision->scale, scale_name(frame->plan->outcomes[outcome].scale)) == 0) {
        return false;
    }
    deviation->path = arena_format(view->arena, "outcomes[%d].scale", outcome);
    deviation->from = scale_before(frame, i, outcome);
    deviation->to = decision->scale;
    return true;
}

static bool compute(struct view *view, struct fault *fault) {
    (void)fault;
    const struct frame *frame = view->frame;
    struct deviations_result *result = ARENA_NEW(view->arena, 1, struct deviations_result);
    result->list = ARENA_NEW(view->arena, frame->version, struct deviation);
    for (size_t i = 0; i < frame->version; i++) {
        struct deviation *next = &result->list[result->count];
        if (departs(view, i, next)) {
            result->count++;
            result->standing += next->stands;
            result->late += next->stands && next->after_unblinding ? 1 : 0;
        }
    }
    view->result = result;
    view->caption = result->count == 0 ? "The study stands to its plan: no amendment, and no scale other than the planned." :
        arena_format(view->arena, "%zu deviation%s from the plan, of which %zu stand%s, %zu of these decided after unblinding.", result->count,
            result->count == 1 ? "" : "s", result->standing, result->standing == 1 ? "s" : "", result->late);
    return true;
}

static void json(const struct view *view, struct json *json) {
    const struct deviations_result *result = view->result;
    json_key_array(json, "deviations");
    for (size_t i = 0; i < result->count; i++) {
        const struct deviation *one = &result->list[i];
        json_object(json);
        json_field_integer(json, "number", one->decision->number);
        json_field_string(json, "at", one->decision->at);
        json_field_string(json, "by", one->decision->by);
        json_field_string(json, "kind", decision_rules[one->decision->kind].name);
        json_field_string(json, "path", one->path);
        json_field_string(json, "from", one->from);
        json_field_string(json, "to", one->to);
        json_field_string(json, "reason", one->hidden ? NULL : one->decision->reason);
        json_field_string(json, "blinding", one->decision->blinding);
        json_field_bool(json, "after_unblinding", one->after_unblinding);
        json_field_bool(json, "hidden", one->hidden);
        json_field_bool(json, "stands", one->stands);
        json_close(json);
    }
    json_close(json);
    json_field_integer(json, "standing", (int64_t)result->standing);
}

static void put_text(struct table *table, const struct deviation *one, const char *text) {
    table_put_text(table, one->hidden ? "not shown while blinded" : text);
}

static void tables(const struct view *view, struct table **tables, size_t *count) {
    const struct deviations_result *result = view->result;
    struct table *table = table_new(view->arena, "Deviations from the plan, in order");
    table_column(table, "number", "Decision", NULL, TABLE_NUMBERS);
    table_column(table, "at", "When", "UTC", TABLE_WORDS);
    table_column(table, "by", "Who", NULL, TABLE_WORDS);
    table_column(table, "path", "Of the plan", NULL, TABLE_WORDS);
    table_column(table, "from", "From", NULL, TABLE_WORDS);
    table_column(table, "to", "To", NULL, TABLE_WORDS);
    table_column(table, "reason", "Why", NULL, TABLE_WORDS);
    table_column(table, "blinding", "Blinding then", NULL, TABLE_WORDS);
    table_column(table, "stands", "Stands", NULL, TABLE_WORDS);
    for (size_t i = 0; i < result->count; i++) {
        const struct deviation *one = &result->list[i];
        table_row(table);
        table_put_count(table, one->decision->number);
        table_put_text(table, one->decision->at);
        table_put_text(table, one->decision->by);
        table_put_text(table, one->path);
        put_text(table, one, one->from);
        put_text(table, one, one->to);
        put_text(table, one, one->decision->reason);
        table_put_text(table, one->decision->blinding);
        table_put_text(table, one->stands ? "yes" : "reversed");
    }
    tables[(*count)++] = table;
}

static const struct argument_rule arguments[] = {{0}};

const struct exhibit exhibit_deviations = {
    .name = "deviations",
    .item = 9,
    .title = "Where does the study depart from its plan?",
    .tab = "Deviations",
    .says = "Every amendment of the plan and every scale other than the planned, with who, when, why and how blinded",
    .pooled = SHOWN,
    .table_first = true,
    .method = "The plan as loaded is kept unchanged. The plan in force is the plan as loaded with the amendments that stand, in order; a reversal takes one "
              "back and both stay in the record. Deviations are to be described and justified, and what was known of the arms when they were decided "
              "matters to how they are read (ICH E9, 5.1 and 7.1).",
    .arguments = arguments,
    .compute = compute,
    .json = json,
    .tables = tables,
};
