/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Who counts in an exhibit and which columns it may show, so that several exhibits give the same n. Everything made
 * lives in the view's arena. */
#ifndef EVENHAND_EXHIBITS_LEDGER_H
#define EVENHAND_EXHIBITS_LEDGER_H
#include "exhibits/registry.h"

/* Participants of the view's set with a record in force, in identifier order; those left out are counted. */
struct members {
    size_t count;
    size_t *participant; /* [count] index into the frame */
    int *arm;            /* [count] shown arm; NOWHERE only where MEMBERS_ALL lets in who has none */
    size_t *n_of_arm;    /* [arms] */
    size_t held_aside, no_arm, excluded;
};
enum membership { MEMBERS_ALL, MEMBERS_WITH_ARM };
void members_take(struct members *members, const struct view *view, enum membership membership);
/* One note for each kind of participant left out, with the count. */
void members_note(struct view *view, const struct members *members);

/* Indices of the plan's variables that may be shown now, in order of time: covariates, outcomes visit by visit (all
 * outcomes of one visit together), events; dates are not among them. A note names those hidden because they would tell the arms apart. */
int *variables_in_time(struct view *view, size_t *count);

/* Levels of a category or an event ("no", "yes"); NULL and 0 for a number. */
const struct level *levels_of(const struct frame *frame, int variable, size_t *count);
/* The label; of a code that the plan does not list: "f" in quotes, not in the plan. */
const char *level_words(const struct view *view, int variable, size_t level);
const char *variable_label(const struct view *view, int variable);   /* "Age" */
const char *variable_heading(const struct view *view, int variable); /* "Age, years" */
/* Decimals of a summary: those of the data plus one. */
int variable_decimals(const struct view *view, int variable);

/* "12 of 120 (10.0%)" and "12 (10.0%)"; no decimal where the whole is below 100, and no percent of nothing. */
const char *part_of_words(const struct view *view, size_t part, size_t whole);
const char *part_words(const struct view *view, size_t part, size_t whole);
/* "1 participant", "7 participants": the noun with an s unless count is 1. */
const char *count_words(const struct view *view, size_t count, const char *noun);
#endif
