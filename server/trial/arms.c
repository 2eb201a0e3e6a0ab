/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "trial/arms.h"
#include <string.h>

/* Who has no arm that the plan lists is out of exhibits by arm in every state of blinding, so that counts agree. */
static bool has_arm(const struct frame *frame, size_t participant) {
    return !frame->arm || (frame->arm->level[participant] != NOWHERE &&
                              (size_t)frame->arm->level[participant] < frame->plan->arm_count);
}

static void show_pooled(const struct frame *frame, struct arena *arena, struct arms *arms) {
    int *of = ARENA_NEW(arena, frame->participant_count, int);
    for (size_t p = 0; p < frame->participant_count; p++) {
        of[p] = has_arm(frame, p) ? 0 : NOWHERE;
    }
    *arms = (struct arms){.arm = ARENA_NEW(arena, 1, struct shown_arm), .count = 1, .pooled = true, .of = of};
    arms->arm[0] = (struct shown_arm){"all", "All participants", 0};
}

/* Where a level of the arm stands among the shown arms: by letter while coded, as the plan has them otherwise. */
static int shown_place(const struct frame *frame, bool coded, int32_t level) {
    return level == NOWHERE || (size_t)level >= frame->plan->arm_count ? NOWHERE : coded ? frame->letters[level] : level;
}

void arms_shown(const struct frame *frame, struct arena *arena, struct arms *arms) {
    if (frame->blinding == BLINDING_POOLED || !frame->arm) {
        show_pooled(frame, arena, arms);
        return;
    }
    const struct plan *plan = frame->plan;
    bool coded = frame->blinding == BLINDING_CODED;
    int *of = ARENA_NEW(arena, frame->participant_count, int);
    *arms = (struct arms){.arm = ARENA_NEW(arena, plan->arm_count, struct shown_arm), .count = plan->arm_count,
        .reference = coded ? 0 : plan->reference, .coded = coded, .of = of};
    size_t others = 0;
    for (size_t i = 0; i < plan->arm_count; i++) {
        const char *letter = arena_format(arena, "%c", (char)('A' + (int)i));
        arms->arm[i] = coded ? (struct shown_arm){letter, letter, i} :
                               (struct shown_arm){plan->arms[i].code, plan->arms[i].label, i == plan->reference ? 0 : ++others};
    }
    for (size_t p = 0; p < frame->participant_count; p++) {
        of[p] = shown_place(frame, coded, frame->arm->level[p]);
    }
}

bool arms_given_away(const struct frame *frame, const struct column *column) {
    enum { ENOUGH = 5 };
    if (!frame->arm || !column->level || column == frame->arm) {
        return false;
    }
    size_t levels = column->kind == VARIABLE_EVENT ? 2 : column->level_count, arms = frame->arm->level_count, all = 0, told = 0;
    struct arena arena;
    arena_init(&arena);
    size_t *count = ARENA_NEW(&arena, levels * arms, size_t);
    for (size_t p = 0; p < frame->participant_count; p++) {
        if (column->level[p] != NOWHERE && has_arm(frame, p)) { /* a misspelt arm must not make its level look mixed */
            count[(size_t)column->level[p] * arms + (size_t)frame->arm->level[p]]++;
            all++;
        }
    }
    for (size_t l = 0; l < levels; l++) {
        size_t sum = 0, most = 0;
        for (size_t a = 0; a < arms; a++) {
            size_t here = count[l * arms + a];
            sum += here;
            most = here > most ? here : most;
        }
        told += sum >= ENOUGH && sum == most ? sum : 0;
    }
    arena_release(&arena);
    return told > 0 && (double)told >= 0.9 * (double)all;
}

bool arms_hide_column(const struct frame *frame, const char *name) {
    if (frame->blinding == BLINDING_UNBLINDED) {
        return false;
    }
    if (frame->arm && plan_covers(name, frame->plan->arm_column)) { /* FILE.COLUMN too, where the arm stands at one visit */
        return true;
    }
    for (size_t v = 0; v < frame->plan->variable_count; v++) { /* several may rest on one column, and any of them may tell */
        if (plan_covers(name, frame->plan->variables[v].column) && arms_given_away(frame, frame->columns[v])) {
            return true;
        }
    }
    return false;
}
