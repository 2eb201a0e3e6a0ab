/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Values computed from columns: formulas, in a frame by participant, and against what the file claims of the same. */
#ifndef EVENHAND_TRIAL_DERIVED_H
#define EVENHAND_TRIAL_DERIVED_H
#include "trial/frame.h"

const char *derived_formula_name(enum derived_formula formula); /* "body-mass-index" */
/* The formula with the names of its inputs, such as "mean of sbp_0 and dbp_0"; for a mean or sum of items of which some may be
 * missing, how many must be there. Lives in the arena. */
const char *derived_words(struct arena *arena, const struct derived *derived);

enum derived_status {
    DERIVED_COMPUTED,
    DERIVED_HELD_ASIDE,    /* an input's record is held aside */
    DERIVED_INPUT_MISSING, /* an input, or so many that too few items are present */
    DERIVED_UNDEFINED,     /* all are there, but the formula has no value: a denominator of 0, a height that is not positive */
    DERIVED_STATUS_COUNT
};
const char *derived_status_words(enum derived_status status); /* "an input is missing" */

/* The value of a formula from its inputs in the plan's order, NaN where missing; NaN unless computed. `present` inputs are not NaN.
 * Pure and thread-safe. Mean and sum take what is present, from `minimum` items on (prorated: sum = mean of those present times
 * `count`; the half rule of questionnaires is minimum = half of them); the other formulas take exactly two, both of which must be there.
 * Body mass index: weight in kg / (height in m)^2, WHO Technical Report Series 894 (2000). */
double derived_compute(const struct derived *derived, const double *input, enum derived_status *status, size_t *present);

/* One participant's derived value with what it rests on. */
struct derived_value {
    enum derived_status status;
    double value;     /* NaN unless computed */
    size_t present;   /* inputs that are there */
    bool prorated;    /* computed, with items missing */
    double claimed;   /* NaN where the file claims nothing */
    double tolerance; /* by which the claim may differ; NaN without value or claim */
    bool differs;     /* |claimed - value| > tolerance */
};
void derived_take(struct derived_value *taken, const struct frame *frame, const struct derived *derived, size_t participant);
/* "sbp_0 121, dbp_0 blank": the inputs as they now read. Lives in the arena. */
const char *derived_inputs(struct arena *arena, const struct frame *frame, const struct derived *derived, size_t participant);

/* How far rounding alone can take a claim from the value: half a unit in the claim's last place; for a body mass index also what
 * the rounding of weight and height carries into it: h_B + BMI (h_w / weight + 2 h_h / height), each h half a unit in the last place
 * recorded (first-order propagation of the bounds of rounding). Decimals are those written; height in the plan's unit. */
double derived_rounding(const struct derived *derived, double value, const double *input, const int *input_decimals, int claimed_decimals);

/* Fills number, state, texts and decimals of a derived column from the frame's columns it rests on (built before it). */
void derived_fill(struct column *column, const struct frame *frame, const struct derived *derived);
#endif
