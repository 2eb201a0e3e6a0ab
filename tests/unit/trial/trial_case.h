/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What the tests of trial/ share: a plan and a small file written in the test, and the frames that decisions make of
 * them, without a study file. JSON in tests is written with single quotes. Include after cmocka.h. */
#ifndef EVENHAND_TESTS_TRIAL_CASE_H
#define EVENHAND_TESTS_TRIAL_CASE_H
#include "trial/checks.h"
#include "trial/frame.h"
#include <stdio.h>
#include <string.h>

enum { CASE_DECISIONS = 512, CASE_FILES = 4 };

struct trial_case {
    struct arena arena;
    struct plan plan;
    struct cells cells[CASE_FILES]; /* of the plan's files, in their order */
    struct decision decisions[CASE_DECISIONS];
    size_t count, planned;
    unsigned char letters[26];
    struct frame *received, *frame;
    struct fault fault; /* of the last refusal */
};

static inline char *quoted(struct arena *arena, const char *text) {
    char *copy = arena_text(arena, text);
    for (char *p = copy; *p; p++) {
        *p = *p == '\'' ? '"' : *p;
    }
    return copy;
}

static inline struct frame *case_build(struct trial_case *c, size_t count, struct frame *previous, bool check) {
    return frame_build(&c->plan, c->cells, "data", c->letters, c->decisions, count, previous, check, &c->fault);
}

/* The plan's codes for missing are the first decisions, as a study has them. */
static inline void case_plan_codes(struct trial_case *c) {
    for (size_t v = 0; v < c->plan.variable_count; v++) {
        const struct variable *variable = &c->plan.variables[v];
        for (size_t i = 0; i < variable->missing_codes->count; i++) {
            c->decisions[c->count] = (struct decision){.number = (uint32_t)c->count + 1, .kind = DECISION_MISSING_CODE,
                .column = variable->column, .value = variable->missing_codes->item[i], .body = "{}", .planned = true};
            c->count++;
        }
    }
    c->planned = c->count;
}

static inline void case_open_files(struct trial_case *c, const char *const *csv, size_t count, const char *plan) {
    memset(c, 0, sizeof *c);
    arena_init(&c->arena);
    const char *json = quoted(&c->arena, plan);
    if (!plan_read(&c->plan, json, strlen(json), "plan.json", &c->fault)) {
        fail_msg("%s", c->fault.message);
    }
    assert_int_equal(c->plan.file_count, count);
    for (size_t f = 0; f < count; f++) {
        if (!cells_read(&c->cells[f], csv[f], strlen(csv[f]), "data.csv", &c->fault)) {
            fail_msg("%s", c->fault.message);
        }
    }
    for (size_t i = 0; i < 26; i++) { /* the last arm is A */
        c->letters[i] = i < c->plan.arm_count ? (unsigned char)(c->plan.arm_count - 1 - i) : 0;
    }
    case_plan_codes(c);
    c->received = case_build(c, c->count, NULL, false);
    assert_non_null(c->received);
    c->frame = frame_retain(c->received);
}

static inline void case_open(struct trial_case *c, const char *csv, const char *plan) {
    case_open_files(c, &csv, 1, plan);
}

static inline void case_close(struct trial_case *c) {
    frame_release(c->frame);
    frame_release(c->received);
    for (size_t f = 0; f < CASE_FILES; f++) {
        cells_release(&c->cells[f]);
    }
    plan_release(&c->plan);
    arena_release(&c->arena);
}

/* Takes a batch as a study does: all or none. */
static inline bool case_decide(struct trial_case *c, const char *batch) {
    const char *json = quoted(&c->arena, batch);
    struct decision *decisions;
    size_t count;
    uint32_t version;
    fault_init(&c->fault);
    if (!decisions_read(&c->arena, json, strlen(json), "batch.json", &decisions, &count, &version, &c->fault)) {
        return false;
    }
    assert_true(c->count + count <= CASE_DECISIONS);
    for (size_t i = 0; i < count; i++) {
        c->decisions[c->count + i] = decisions[i];
        c->decisions[c->count + i].number = (uint32_t)(c->count + i + 1);
    }
    struct frame *next = case_build(c, c->count + count, c->frame, true);
    if (!next) {
        return false;
    }
    frame_release(c->frame);
    c->frame = next;
    c->count += count;
    return true;
}

static inline void case_must(struct trial_case *c, const char *batch) {
    if (!case_decide(c, batch)) {
        fail_msg("%s was refused: %s", batch, c->fault.message);
    }
}

static inline void case_refused(struct trial_case *c, const char *batch, const char *sentence) {
    char before[HASH_SIZE];
    memcpy(before, c->frame->state_sha256, HASH_SIZE);
    if (case_decide(c, batch)) {
        fail_msg("%s was taken", batch);
    }
    if (strcmp(c->fault.message, sentence) != 0) {
        fail_msg("%s\n  got    %s\n  wanted %s", batch, c->fault.message, sentence);
    }
    assert_string_equal(before, c->frame->state_sha256);
}

static inline size_t case_who(const struct trial_case *c, const char *id) {
    int who = frame_participant(c->frame, id);
    if (who == NOWHERE) {
        fail_msg("no participant %s", id);
    }
    return (size_t)who;
}

static inline const struct column *case_column(const struct trial_case *c, const char *name) {
    const struct column *column = frame_column(c->frame, name);
    assert_non_null(column);
    return column;
}

static inline enum cell_state case_state(const struct trial_case *c, const char *id, const char *column) {
    return (enum cell_state)case_column(c, column)->state[case_who(c, id)];
}

static inline double case_number(const struct trial_case *c, const char *id, const char *column) {
    return case_column(c, column)->number[case_who(c, id)];
}

/* The code of a category's level; "" where there is none. */
static inline const char *case_level(const struct trial_case *c, const char *id, const char *name) {
    const struct column *column = case_column(c, name);
    int32_t level = column->level[case_who(c, id)];
    return level == NOWHERE ? "" : column->levels[level].code;
}

static inline void expect_text(const char *got, const char *want, const char *about) {
    if (strcmp(got, want) != 0) {
        fail_msg("%s\n  got    %s\n  wanted %s", about, got, want);
    }
}
#endif
