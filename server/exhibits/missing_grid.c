/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Missing values: every participant by every variable, and which are missing together. */
#include "draw/grid.h"
#include "exhibits/ledger.h"
#include "exhibits/list.h"
#include "exhibits/words.h"
#include <stdlib.h>
#include <string.h>

_Static_assert((int)GRID_BLANK == (int)CELL_BLANK && (int)GRID_BELOW_LIMIT == (int)CELL_BELOW_LIMIT &&
                   (int)GRID_HELD_ASIDE == (int)CELL_HELD_ASIDE && (int)GRID_STATES == (int)CELL_STATE_COUNT,
    "the grid draws the states of cells under the same numbers");

enum order { ORDER_PATTERN, ORDER_ARM, ORDER_IDENTIFIER };
static const char *const order_words[] = {"pattern", "arm", "identifier"};

struct pattern {                /* participants who lack the same variables */
    const unsigned char *lacks; /* [variables] */
    size_t first, count;        /* within result.by_pattern */
};

struct grid_result {
    enum order order;
    const int *variables;
    size_t variable_count, participant_count;
    unsigned char
        *states; /* enum cell_state, [participant * variable_count + variable], participants in identifier order */
    unsigned char *lacks;     /* the same shape: 1 where there is no observed value */
    size_t *by_pattern;       /* participants, those of a pattern together in identifier order */
    struct pattern *patterns; /* the most frequent first */
    size_t pattern_count;
    size_t complete;                    /* participants who lack nothing */
    size_t (*counts)[CELL_STATE_COUNT]; /* [variables] */
};

/* ---- computing ---- */

static void take_cells(const struct view *view, struct grid_result *result) {
    size_t v = result->variable_count;
    result->states = ARENA_NEW(view->arena, result->participant_count * v, unsigned char);
    result->lacks = ARENA_NEW(view->arena, result->participant_count * v, unsigned char);
    result->counts = arena_new(view->arena, v, sizeof *result->counts);
    for (size_t i = 0; i < v; i++) {
        const unsigned char *state = view->frame->columns[result->variables[i]]->state;
        for (size_t p = 0; p < result->participant_count; p++) {
            result->states[p * v + i] = state[p];
            result->lacks[p * v + i] = state[p] != CELL_OBSERVED;
            result->counts[i][state[p]]++;
        }
    }
}

static int by_lacks(const void *a, const void *b, void *context) {
    const struct grid_result *result = context;
    size_t left = *(const size_t *)a, right = *(const size_t *)b, v = result->variable_count;
    int order = memcmp(&result->lacks[left * v], &result->lacks[right * v], v);
    return order ? order : (left > right) - (left < right);
}

static int by_frequency(const void *a, const void *b, void *context) {
    const struct grid_result *result = context;
    const struct pattern *left = a, *right = b;
    return left->count != right->count ? (left->count < right->count) - (left->count > right->count)
                                       : memcmp(left->lacks, right->lacks, result->variable_count);
}

/* Sorted by what they lack, equal ones stand side by side; then the patterns go by frequency. */
static void take_patterns(const struct view *view, struct grid_result *result) {
    size_t n = result->participant_count, v = result->variable_count;
    size_t *sorted = ARENA_NEW(view->arena, n, size_t);
    for (size_t p = 0; p < n; p++) {
        sorted[p] = p;
    }
    qsort_r(sorted, n, sizeof *sorted, by_lacks, result);
    result->patterns = ARENA_NEW(view->arena, n, struct pattern);
    for (size_t i = 0; i < n; i++) {
        const unsigned char *lacks = &result->lacks[sorted[i] * v];
        struct pattern *last = result->pattern_count ? &result->patterns[result->pattern_count - 1] : NULL;
        if (last && memcmp(last->lacks, lacks, v) == 0) {
            last->count++;
        } else {
            result->patterns[result->pattern_count++] = (struct pattern){lacks, i, 1};
        }
    }
    qsort_r(result->patterns, result->pattern_count, sizeof *result->patterns, by_frequency, result);
    result->by_pattern = ARENA_NEW(view->arena, n, size_t);
    size_t at = 0;
    for (size_t i = 0; i < result->pattern_count; i++) {
        struct pattern *pattern = &result->patterns[i];
        memcpy(&result->by_pattern[at], &sorted[pattern->first], pattern->count * sizeof *sorted);
        pattern->first = at;
        at += pattern->count;
        result->complete = memchr(pattern->lacks, 1, v) ? result->complete : pattern->count;
    }
}

static bool understand_order(const struct view *view, struct grid_result *result, struct fault *fault) {
    const char *asked = view_asked(view, "order");
    for (size_t i = 0; asked && i < sizeof order_words / sizeof *order_words; i++) {
        result->order = strcmp(asked, order_words[i]) == 0 ? (enum order)i : result->order;
    }
    if (result->order == ORDER_ARM && view->arms.pooled) {
        return fault_set(fault, FAULT_REFUSED,
            view->frame->arm ? "missing-grid: order=arm would show who shares an arm, so it is not shown while the "
                               "study is pooled; order=pattern and "
                               "order=identifier are"
                             : "missing-grid: order=arm needs an arm, and this plan has none; order=pattern and "
                               "order=identifier do not");
    }
    return true;
}

/* Who has no arm, or whose record is held aside, stands in the tables and in no arm's block. */
static void note_without_arm(struct view *view) {
    size_t without = 0;
    for (size_t p = 0; p < view->frame->participant_count; p++) {
        without += view->arms.of[p] == NOWHERE;
    }
    if (without) {
        view_note(view, "%s in the tables but not in the figure: no arm, or a record held aside.",
            count_words(view, without, "participant"));
    }
}

static bool compute(struct view *view, struct fault *fault) {
    static const char *const said[] = {
        "by pattern of what is missing, the most frequent first", "by arm", "by identifier"};
    struct grid_result *result = ARENA_NEW(view->arena, 1, struct grid_result);
    if (!understand_order(view, result, fault)) {
        return false;
    }
    result->variables = variables_in_time(view, &result->variable_count);
    result->participant_count = view->frame->participant_count;
    take_cells(view, result);
    take_patterns(view, result);
    if (result->order == ORDER_ARM) {
        note_without_arm(view);
    }
    view->caption = arena_format(view->arena,
        "%s by %s in order of time; participants stand %s. Where there is no observed value a mark "
        "says why.",
        count_words(view, result->participant_count, "participant"),
        count_words(view, result->variable_count, "variable"), said[result->order]);
    view->result = result;
    return true;
}

/* ---- JSON ---- */

static void patterns_json(const struct view *view, const struct grid_result *result, struct json *json) {
    json_key_array(json, "patterns");
    for (size_t i = 0; i < result->pattern_count; i++) {
        json_object(json);
        json_key_array(json, "missing");
        for (size_t v = 0; v < result->variable_count; v++) {
            if (result->patterns[i].lacks[v]) {
                json_string(json, view->frame->plan->variables[result->variables[v]].column);
            }
        }
        json_close(json);
        json_field_integer(json, "n", (int64_t)result->patterns[i].count);
        json_close(json);
    }
    json_close(json);
}

static void json(const struct view *view, struct json *json) {
    const struct grid_result *result = view->result;
    json_key_array(json, "participants");
    for (size_t p = 0; p < result->participant_count; p++) {
        json_string(json, view->frame->participants[p].id);
    }
    json_close(json);
    json_key_array(json, "variables");
    for (size_t v = 0; v < result->variable_count; v++) {
        json_string(json, view->frame->plan->variables[result->variables[v]].column);
    }
    json_close(json);
    json_key_array(json, "cells");
    for (size_t p = 0; p < result->participant_count; p++) {
        json_array(json);
        for (size_t v = 0; v < result->variable_count; v++) {
            json_string(json, cell_state_name((enum cell_state)result->states[p * result->variable_count + v]));
        }
        json_close(json);
    }
    json_close(json);
    patterns_json(view, result, json);
}

/* ---- tables ---- */

/* The columns' own names: labels with their visits would be longer than any line. */
static const char *pattern_words(
    const struct view *view, const struct grid_result *result, const struct pattern *pattern) {
    struct text text;
    text_init(&text);
    size_t lacking = 0;
    for (size_t v = 0; v < result->variable_count; v++) {
        if (pattern->lacks[v]) {
            text_format(
                &text, "%s%s", lacking++ ? ", " : "", view->frame->plan->variables[result->variables[v]].column);
        }
    }
    const char *words = lacking == 0                        ? "nothing"
                        : lacking == result->variable_count ? "everything"
                                                            : arena_text(view->arena, text.data);
    text_release(&text);
    return words;
}

static struct table *pattern_table(const struct view *view, const struct grid_result *result) {
    enum { MOST = 40 };
    struct table *table = table_new(view->arena, "What is missing together");
    table_column(table, "missing", "Missing columns", NULL, TABLE_WORDS);
    table_column(table, "n", "Participants", NULL, TABLE_NUMBERS);
    table_column(table, "percent", "Percent", NULL, TABLE_NUMBERS);
    size_t rest = 0;
    for (size_t i = 0; i < result->pattern_count; i++) {
        const struct pattern *pattern = &result->patterns[i];
        if (i >= MOST) {
            rest += pattern->count;
            continue;
        }
        table_row(table);
        if (pattern->count == 1) {
            table_row_opens(table, view->frame->participants[result->by_pattern[pattern->first]].id);
        }
        table_put_header(table, pattern_words(view, result, pattern));
        table_put_count(table, (int64_t)pattern->count);
        table_put_number(table, 100 * (double)pattern->count / (double)result->participant_count,
            result->participant_count < 100 ? 0 : 1);
    }
    if (rest) {
        table_note(table, arena_format(view->arena, "%zu further patterns, of %s.", result->pattern_count - MOST,
                              count_words(view, rest, "participant")));
    }
    return table;
}

static bool occurs(const struct grid_result *result, int state) {
    for (size_t v = 0; v < result->variable_count; v++) {
        if (result->counts[v][state]) {
            return true;
        }
    }
    return false;
}

static struct table *reason_table(const struct view *view, const struct grid_result *result) {
    struct table *table = table_new(view->arena, "Why values are missing");
    table_column(table, "variable", "Variable", NULL, TABLE_WORDS);
    table_column(table, "column", "Column", NULL, TABLE_WORDS);
    table_column(table, "observed", "observed", NULL, TABLE_NUMBERS);
    for (int state = CELL_OBSERVED + 1; state < CELL_STATE_COUNT; state++) {
        if (occurs(result, state)) {
            table_column(table, cell_state_name((enum cell_state)state), cell_state_words((enum cell_state)state), NULL,
                TABLE_NUMBERS);
        }
    }
    for (size_t v = 0; v < result->variable_count; v++) {
        table_row(table);
        table_put_header(table, variable_label(view, result->variables[v]));
        table_put_text(table, view->frame->plan->variables[result->variables[v]].column);
        for (int state = CELL_OBSERVED; state < CELL_STATE_COUNT; state++) {
            if (state == CELL_OBSERVED || occurs(result, state)) {
                table_put_count(table, (int64_t)result->counts[v][state]);
            }
        }
    }
    return table;
}

static void tables(const struct view *view, struct table **tables, size_t *count) {
    tables[(*count)++] = pattern_table(view, view->result);
    tables[(*count)++] = reason_table(view, view->result);
}

/* ---- the figure ---- */

static struct grid_block block_of(
    const struct view *view, const struct grid_result *result, const size_t *chosen, size_t count) {
    size_t v = result->variable_count;
    const char **ids = ARENA_NEW(view->arena, count, const char *);
    unsigned char *states = ARENA_NEW(view->arena, count * v, unsigned char);
    for (size_t i = 0; i < count; i++) {
        ids[i] = view->frame->participants[chosen[i]].id;
        memcpy(&states[i * v], &result->states[chosen[i] * v], v);
    }
    return (struct grid_block){.participants = ids, .participant_count = count, .states = states};
}

static size_t arm_blocks(const struct view *view, const struct grid_result *result, struct grid_block *blocks) {
    size_t *chosen = ARENA_NEW(view->arena, result->participant_count, size_t), blocks_made = 0;
    for (size_t a = 0; a < view->arms.count; a++) {
        size_t count = 0;
        for (size_t p = 0; p < result->participant_count; p++) {
            if (view->arms.of[p] == (int)a) {
                chosen[count++] = p;
            }
        }
        if (count) {
            struct grid_block *block = &blocks[blocks_made++];
            *block = block_of(view, result, chosen, count);
            block->label = view->arms.arm[a].label;
            block->mark = mark_of(view, a);
        }
    }
    return blocks_made;
}

static void figure(const struct view *view, const struct figure *figure, struct html *html) {
    const struct grid_result *result = view->result;
    struct grid_variable *variables = ARENA_NEW(view->arena, result->variable_count, struct grid_variable);
    for (size_t v = 0; v < result->variable_count; v++) {
        const struct variable *what = &view->frame->plan->variables[result->variables[v]];
        variables[v] = (struct grid_variable){.label = what->label, .column = what->column};
    }
    size_t *identifiers = ARENA_NEW(view->arena, result->participant_count, size_t);
    for (size_t p = 0; p < result->participant_count; p++) {
        identifiers[p] = p;
    }
    struct grid_block *blocks = ARENA_NEW(view->arena, view->arms.count, struct grid_block);
    size_t block_count = 1;
    if (result->order == ORDER_ARM) {
        block_count = arm_blocks(view, result, blocks);
    } else {
        const size_t *order = result->order == ORDER_PATTERN ? result->by_pattern : identifiers;
        blocks[0] = block_of(view, result, order, result->participant_count);
    }
    struct grid grid = {
        .variables = variables, .variable_count = result->variable_count, .blocks = blocks, .block_count = block_count};
    grid_svg(&grid, figure, html);
}

static void lead(const struct view *view, struct html *html) {
    const struct grid_result *result = view->result;
    html_element(html, "strong", NULL, part_of_words(view, result->complete, result->participant_count));
    html_text(html, " participants have every value");
}

static const struct argument_rule arguments[] = {
    {"order", ARGUMENT_WORD,
        "how the figure orders participants: pattern (default), arm (not while pooled) or identifier",
        "pattern arm identifier", true},
    {0}};

const struct exhibit exhibit_missing_grid = {
    .name = "missing-grid",
    .item = 3,
    .title = "What is missing, of whom and why?",
    .tab = "Grid",
    .says =
        "Every participant by every variable, with the reason for each missing value, and which are missing together",
    .pooled = SHOWN,
    .method = "Every participant of the file stands here, those left out of a set too. A cell is observed, or it says "
              "why not: blank, a code "
              "for missing, unreadable, below or above a limit of measurement, set missing by a decision, or the whole "
              "record held aside "
              "until a decision says which of several stands.\n"
              "A pattern is the set of variables without an observed value, whatever the reasons.",
    .arguments = arguments,
    .compute = compute,
    .json = json,
    .tables = tables,
    .figure = figure,
    .lead = lead,
};
