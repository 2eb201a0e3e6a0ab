/* SPDX-License-Identifier: GPL-3.0-or-later */
/* One variable's distribution in one or two panels side by side (linear; log10): a histogram, below it a box and
 * every participant's point on the same axis, and the ranges of the plan as labelled brackets. Rows of more than
 * BOXES_POINTS points show the outliers only, the histogram being their density. */
#ifndef EVENHAND_DRAW_HISTOGRAM_H
#define EVENHAND_DRAW_HISTOGRAM_H
#include "draw/axis.h"
#include "draw/boxes.h"
#include "draw/figure.h"

struct histogram_bin {
    double from, to; /* in the variable's unit, also on a log axis */
    size_t count;
};

struct histogram_range {
    const char *label; /* "eligibility 18 to 85" */
    double low, high;  /* an infinity for an open side */
};

struct histogram_panel {
    struct axis_plan axis; /* the title names scale and unit: "Albumin ratio, mg/mmol, log10 scale" */
    const char *counts;    /* "231 observed of 240"; on log10 it says how many have no place there */
    const struct histogram_bin *bins;
    size_t bin_count;
    struct boxes_row row; /* box and points of this panel; arm and counts unused */
};

struct histogram {
    int decimals;
    const struct histogram_panel *panels;
    size_t panel_count;                   /* 1 or 2 */
    const struct histogram_range *ranges; /* drawn in every panel as far as its axis goes */
    size_t range_count;
};

void histogram_svg(const struct histogram *histogram, const struct figure *figure, struct html *html);
#endif
