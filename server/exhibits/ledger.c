/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "exhibits/ledger.h"
#include "exhibits/words.h"
#include <string.h>

/* ---- participants ---- */

void members_take(struct members *members, const struct view *view, enum membership membership) {
    const struct frame *frame = view->frame;
    size_t n = frame->participant_count;
    *members = (struct members){.participant = ARENA_NEW(view->arena, n, size_t),
        .arm = ARENA_NEW(view->arena, n, int),
        .n_of_arm = ARENA_NEW(view->arena, view->arms.count, size_t)};
    for (size_t p = 0; p < n; p++) {
        int arm = view->arms.of[p];
        if (frame->participants[p].record == NO_RECORD) {
            members->held_aside++;
        } else if (arm == NOWHERE && membership == MEMBERS_WITH_ARM) {
            members->no_arm++;
        } else if (!set_holds(frame, view->set, p)) {
            members->excluded++;
        } else {
            members->participant[members->count] = p;
            members->arm[members->count++] = arm;
            members->n_of_arm[arm == NOWHERE ? 0 : arm] += arm != NOWHERE;
        }
    }
}

void members_note(struct view *view, const struct members *members) {
    if (members->held_aside) {
        view_note(view,
            "%s not counted here: the identifier stands in more than one record, and no decision says yet which one "
            "stands.",
            count_words(view, members->held_aside, "participant"));
    }
    if (members->no_arm) {
        view_note(view, "%s not counted here: no arm, or one that the plan does not list.",
            count_words(view, members->no_arm, "participant"));
    }
    if (members->excluded) {
        view_note(view, "%s not counted here: left out of the %s by a decision.",
            count_words(view, members->excluded, "participant"), set_words(view->set));
    }
}

/* ---- variables ---- */

/* Labels of visits of all outcomes in one order that keeps each outcome's own. */
struct timeline {
    const char **label;
    size_t count;
};

static size_t place_in(const struct timeline *timeline, const char *label) {
    size_t at = 0;
    while (at < timeline->count && strcmp(timeline->label[at], label) != 0) {
        at++;
    }
    return at;
}

static void timeline_take(struct timeline *timeline, const struct plan *plan, struct arena *arena) {
    *timeline = (struct timeline){.label = ARENA_NEW(arena, plan->variable_count, const char *)};
    for (size_t o = 0; o < plan->outcome_count; o++) {
        const struct outcome *outcome = &plan->outcomes[o];
        /* an outcome with one visit has no baseline: where nothing is known of the visit it comes last */
        size_t next = outcome->visit_count > 1 ? 0 : timeline->count;
        for (size_t v = 0; v < outcome->visit_count; v++) {
            size_t at = place_in(timeline, outcome->visits[v].label);
            if (at == timeline->count) {
                memmove(&timeline->label[next + 1], &timeline->label[next],
                    (timeline->count - next) * sizeof *timeline->label);
                timeline->label[next] = outcome->visits[v].label;
                timeline->count++;
                at = next;
            }
            next = at + 1;
        }
    }
}

/* Room in order of time: covariates before all visits, events after them. */
static size_t time_of(const struct timeline *timeline, const struct plan *plan, size_t variable) {
    const struct variable *what = &plan->variables[variable];
    return what->outcome != NOWHERE ? 1 + place_in(timeline, plan->outcomes[what->outcome].visits[what->visit].label)
           : what->event != NOWHERE ? 1 + timeline->count
                                    : 0;
}

int *variables_in_time(struct view *view, size_t *count) {
    const struct plan *plan = view->frame->plan;
    int *variables = ARENA_NEW(view->arena, plan->variable_count, int);
    struct timeline timeline;
    timeline_take(&timeline, plan, view->arena);
    *count = 0;
    for (size_t time = 0; time <= timeline.count + 1; time++) {
        for (size_t v = 0; v < plan->variable_count; v++) {
            if (time_of(&timeline, plan, v) != time || plan->variables[v].kind == VARIABLE_DATE) {
                continue; /* dates have an exhibit of their own */
            }
            if (arms_hide_column(view->frame, plan->variables[v].column)) {
                view_note(view, "%s is not shown while the study is %s: its levels would tell the arms apart.",
                    plan->variables[v].label, blinding_name(view->frame->blinding));
            } else {
                variables[(*count)++] = (int)v;
            }
        }
    }
    return variables;
}

const struct level *levels_of(const struct frame *frame, int variable, size_t *count) {
    static const struct level answers[] = {{"no", "No"}, {"yes", "Yes"}};
    const struct column *column = frame->columns[variable];
    *count = column->kind == VARIABLE_EVENT ? 2 : column->kind == VARIABLE_CATEGORY ? column->level_count : 0;
    return column->kind == VARIABLE_EVENT ? answers : column->kind == VARIABLE_CATEGORY ? column->levels : NULL;
}

const char *level_words(const struct view *view, int variable, size_t level) {
    size_t count;
    const struct level *levels = levels_of(view->frame, variable, &count);
    const struct column *column = view->frame->columns[variable];
    bool listed = column->kind != VARIABLE_CATEGORY || level < column->listed_count || column->listed_count == 0;
    return listed ? levels[level].label : arena_format(view->arena, "\"%s\", not in the plan", levels[level].code);
}

const char *variable_label(const struct view *view, int variable) {
    return view->frame->plan->variables[variable].label;
}

const char *variable_heading(const struct view *view, int variable) {
    const struct variable *what = &view->frame->plan->variables[variable];
    return what->unit && *what->unit ? arena_format(view->arena, "%s, %s", what->label, what->unit) : what->label;
}

int variable_decimals(const struct view *view, int variable) {
    enum { MOST = 6 };
    int decimals = view->frame->columns[variable]->decimals + 1;
    return decimals < MOST ? decimals : MOST;
}

/* ---- words ---- */

static const char *share_words(const struct view *view, size_t part, size_t whole) {
    enum { ENOUGH_FOR_A_DECIMAL = 100 };
    return arena_format(
        view->arena, "%.*f%%", whole < ENOUGH_FOR_A_DECIMAL ? 0 : 1, 100 * (double)part / (double)whole);
}

const char *part_of_words(const struct view *view, size_t part, size_t whole) {
    return whole ? arena_format(view->arena, "%zu of %zu (%s)", part, whole, share_words(view, part, whole))
                 : arena_format(view->arena, "%zu of 0", part);
}

const char *part_words(const struct view *view, size_t part, size_t whole) {
    return whole ? arena_format(view->arena, "%zu (%s)", part, share_words(view, part, whole))
                 : arena_format(view->arena, "%zu", part);
}

const char *count_words(const struct view *view, size_t count, const char *noun) {
    return arena_format(view->arena, "%zu %s%s", count, noun, count == 1 ? "" : "s");
}
