/* SPDX-License-Identifier: GPL-3.0-or-later */
/* From a frame to plain arrays: one outcome at one visit in one set on one scale, the same counts for every exhibit. */
#ifndef EVENHAND_TRIAL_ANALYSIS_H
#define EVENHAND_TRIAL_ANALYSIS_H
#include "trial/arms.h"

enum set { SET_FULL, SET_PER_PROTOCOL };
const char *set_name(enum set set);  /* "full", "per-protocol" */
const char *set_words(enum set set); /* "full analysis set" */
bool set_holds(const struct frame *frame, enum set set, size_t participant); /* has a record in force, not excluded */

/* Members: participants of the set that have a shown arm (pooled: all of the set), in identifier order. */
struct analysis {
    const struct frame *frame;
    const struct arms *arms;
    const struct outcome *outcome;
    size_t outcome_index, visit;
    enum scale scale;
    enum set set;
    bool has_baseline;   /* more than one visit, and the visit is not the baseline itself */
    size_t count;
    size_t *participant; /* [count] index into the frame */
    int *arm;            /* [count] shown arm */
    double *baseline;    /* [count] on the analysis scale, NaN where missing or not on the scale */
    double *follow_up;   /* [count] the same for the visit */
    double *change;      /* [count] follow-up minus baseline, NaN where either is */
    size_t not_on_scale; /* members with an observed value that log10 cannot take, at either visit */
    size_t held_aside, no_arm, excluded; /* participants who are not members, and why */
};

void analysis_take(struct analysis *analysis, const struct frame *frame, const struct arms *arms, size_t outcome,
    size_t visit, enum scale scale, enum set set, struct arena *arena);
double on_scale(enum scale scale, double value); /* log10 of a positive value; NaN otherwise */

/* A covariate's grouping: levels of a category (listed, then unlisted codes) or bands of a number. */
struct grouping {
    const struct covariate *covariate; /* NULL: one group, everyone */
    size_t count;
    struct level *level; /* code and label; for bands the band's words are both */
    const int *of;       /* [participants] group, or NOWHERE where missing */
};
void grouping_take(struct grouping *grouping, const struct frame *frame, int covariate, struct arena *arena);

/* The design of the one linear model over the members with a follow-up (and, where the plan drops a missing baseline, a
 * baseline): intercept, arm indicators (all but the reference, in shown order), baseline, adjust_for. With a grouping its levels
 * stand in the model (once, also where adjust_for names it), members without a level are out, and with `interaction` each
 * arm has an indicator within each level instead of one over all, so that the model fits every cell. */
struct design_request {
    const int *adjust; /* indices of covariates */
    size_t adjust_count;
    const bool *without; /* [participants] true: out as if excluded, also of the means that fill; may be NULL */
    const struct grouping *by; /* may be NULL */
    bool interaction;
};
struct design {
    size_t rows, columns;
    double **column;        /* [columns][rows] */
    double *y;              /* [rows] follow-up */
    size_t *member;         /* [rows] index into the analysis */
    size_t *n_of_arm;       /* [arms] rows */
    int *arm_column;        /* [arms] column of the arm's indicator; NOWHERE: the reference, an arm without rows, interaction */
    size_t *n_of_cell;      /* [groups * arms] rows; NULL without a grouping */
    int *cell_column;       /* [groups * arms] interaction: indicator of the arm in the level; NOWHERE where it or the
                               reference has no rows there */
    int baseline_column;    /* NOWHERE without a baseline */
    size_t baseline_filled; /* rows whose missing baseline took the mean */
    size_t baseline_dropped;
    size_t covariate_filled; /* rows with a missing number in adjust_for that took the mean of the set */
    size_t blank_category;   /* rows where a blank category is its own level */
    size_t no_level;         /* members with a follow-up whose level in the grouping is missing */
    const char **name;       /* [columns] words: "baseline", "Sex: Male" */
};
void design_take(
    struct design *design, const struct analysis *analysis, const struct design_request *request, struct arena *arena);
#endif
