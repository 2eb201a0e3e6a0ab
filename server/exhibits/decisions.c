/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Record: every decision, in order. */
#include "exhibits/ledger.h"
#include "exhibits/list.h"
#include "exhibits/words.h"
#include <string.h>

struct decisions_result {
    const struct decision *decisions;
    const bool *stands;
    size_t count;
    bool *hidden; /* about the arm, or a column that gives it away: its texts are not shown now */
};

static bool compute(struct view *view, struct fault *fault) {
    (void)fault;
    const struct frame *frame = view->frame;
    struct decisions_result *result = ARENA_NEW(view->arena, 1, struct decisions_result);
    *result = (struct decisions_result){frame->decisions, frame->stands, frame->version,
        ARENA_NEW(view->arena, frame->version, bool)};
    size_t without_evidence = 0;
    for (size_t i = 0; i < result->count; i++) {
        const struct decision *decision = &frame->decisions[i];
        result->hidden[i] = decision_hidden(view, decision);
        without_evidence += frame->stands[i] && decision->kind == DECISION_CORRECT && !decision->evidence;
    }
    view->result = result;
    view->caption = arena_format(view->arena, "%s, %s without evidence of a source.", count_words(view, result->count, "decision"),
        count_words(view, without_evidence, "correction"));
    return true;
}

static void json(const struct view *view, struct json *json) {
    const struct decisions_result *result = view->result;
    json_key_array(json, "decisions");
    for (size_t i = 0; i < result->count; i++) {
        const struct decision *decision = &result->decisions[i];
        decision_json(view, decision, result->stands[i], json);
    }
    json_close(json);
    json_field_string(json, "head", head_of(view));
}

static void tables(const struct view *view, struct table **tables, size_t *count) {
    const struct decisions_result *result = view->result;
    struct table *table = table_new(view->arena, "Decisions in order");
    table_column(table, "number", "Number", NULL, TABLE_NUMBERS);
    table_column(table, "at", "When", "UTC", TABLE_WORDS);
    table_column(table, "by", "Who", NULL, TABLE_WORDS);
    table_column(table, "kind", "Kind", NULL, TABLE_WORDS);
    table_column(table, "what", "What", NULL, TABLE_WORDS);
    table_column(table, "reason", "Why", NULL, TABLE_WORDS);
    table_column(table, "evidence", "Evidence", NULL, TABLE_WORDS);
    table_column(table, "blinding", "Blinding", NULL, TABLE_WORDS);
    for (size_t i = 0; i < result->count; i++) {
        const struct decision *decision = &result->decisions[i];
        table_row(table);
        table_put_count(table, decision->number);
        table_put_text(table, decision->at);
        table_put_text(table, decision->by);
        table_put_format(table, "%s%s", decision_rules[decision->kind].name, result->stands[i] ? "" : " (reversed)");
        table_put_text(table, decision_words(view, decision));
        if (decision->participant) {
            table_cell_opens(table, decision->participant, result->hidden[i] ? NULL : decision->column);
        }
        table_put_text(table, result->hidden[i] ? "not shown while blinded" : decision->reason);
        table_put_text(table, result->hidden[i] ? NULL : decision->evidence);
        table_put_text(table, decision->blinding);
    }
    table_note(table, arena_format(view->arena, "Head of the chain: %s", head_of(view)));
    tables[(*count)++] = table;
}

static const struct argument_rule arguments[] = {{0}};

const struct exhibit exhibit_decisions = {
    .name = "decisions",
    .item = 9,
    .title = "What was decided, by whom and why?",
    .tab = "Decisions",
    .says = "Every decision in order, with who, when, why and on what evidence, and the head of the chain",
    .pooled = SHOWN,
    .table_first = true,
    .method = "The record is only ever added to: a reversal is an entry of its own. Each entry carries the SHA-256 (FIPS 180-4) of the "
              "entry before it and of all its own fields, so that a changed, removed or inserted entry shows; entry 0 covers the "
              "received bytes, the plan, the letters of the arms and the format.\n"
              "What the chain cannot prove: who sat at the keyboard (the name is as typed), and that the whole file was not made anew; "
              "for that, note the head of the chain somewhere else.",
    .arguments = arguments,
    .compute = compute,
    .json = json,
    .tables = tables,
};
