/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Units of one site: published factors, the decision "convert", and who is at which site. A conversion is a rule for
 * reading a column at one site: current text, then number, then times factor plus offset. The text stays as it is, so a
 * correction at that site is written in the site's unit. Pure functions of a frame; any thread. */
#ifndef EVENHAND_TRIAL_CONVERT_H
#define EVENHAND_TRIAL_CONVERT_H
#include "trial/frame.h"

/* A published factor: a value in `from` times `factor` is the value in `to`. */
struct unit_factor {
    const char *from, *to; /* NULL: powers of ten of whatever the unit is */
    double factor;
    const char *analyte; /* word of a label that tells it, NULL: any */
    const char *source;
};
extern const struct unit_factor unit_factors[]; /* ends with a factor of 0; each stands for its inverse too */

/* The current text of a participant's site; "" where it is blank, missing or the plan names no site. */
const char *site_of(const struct frame *frame, size_t participant);

/* Whether the decision converts numbers of the column of that name. */
bool convert_covers(const struct decision *decision, const char *column);
/* While the frame is being built: converts numbers and limits of the column at the decision's site; how many are there.
 */
size_t convert_apply(const struct frame *frame, struct column *column, const struct decision *decision);
/* How many cells now hold a number that the decision converts. */
size_t convert_cells(const struct frame *frame, const struct decision *decision);
/* The standing conversions that a participant's value of a variable has gone through: the last of them, or NULL. */
const struct decision *convert_of(const struct frame *frame, size_t variable, size_t participant);
/* "times 18.0182 (mmol/L to mg/dL)" */
const char *convert_words(struct arena *arena, const struct decision *decision);
#endif
