/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Axes: which values get a tick and where a value lies. Linear ticks step by 1, 2 or 5 times a power of ten; ticks of
 * log axes stand at 1, 2 and 5 times powers of ten, with labels at the powers alone when room is short; over more than
 * seven powers, at every second or third power; where the high end is less than three times the low one, at linear
 * steps. Pure arithmetic, thread-safe. */
#ifndef EVENHAND_DRAW_AXIS_H
#define EVENHAND_DRAW_AXIS_H
#include "base/text.h"
#include <stdbool.h>
#include <stddef.h>

enum axis_scale { AXIS_LINEAR, AXIS_LOG10 };

enum { AXIS_TICKS = 24 };

/* What a figure's axis should be, in the trade's words. */
struct axis_plan {
    enum axis_scale scale;
    /* the values to hold; NaN: taken from what is drawn. Values beyond get an arrow at the edge */
    double low, high;
    bool with_sign;            /* "+15": for differences */
    const char *title;         /* "Change in systolic pressure, mmHg" */
    const char *lower, *upper; /* direction words at both ends: "better: pressure fell"; may be NULL */
    double null_line;          /* 0, or 1 for ratios; NaN: none */
};

struct axis {
    enum axis_scale scale;
    double low, high; /* the values at both ends */
    double from, to;  /* where they are drawn */
    size_t tick_count;
    double ticks[AXIS_TICKS];
    int decimals; /* of a linear axis' labels */
    bool with_sign;
    bool powers; /* of a log axis: powers of ten alone are labelled, for want of room */
};

/* Takes in [low, high] and widens it to whole ticks, about `wanted` of them (>= 2). low = high is widened too; not
 * finite is 0 to 1. A log axis needs low > 0: what is not is taken as a thousandth of high. */
void axis_init(
    struct axis *axis, enum axis_scale scale, double low, double high, double from, double to, size_t wanted);
/* As axis_init, but the ends stay where they are and ticks fall within. */
void axis_init_exact(
    struct axis *axis, enum axis_scale scale, double low, double high, double from, double to, size_t wanted);
double axis_place(const struct axis *axis, double value); /* held within from and to */
int axis_beyond(const struct axis *axis, double value);   /* -1 below the axis, 1 above, 0 on it */
bool axis_labelled(const struct axis *axis, double tick);
void axis_label(const struct axis *axis, double tick, struct text *out);
#endif
