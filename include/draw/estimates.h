/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Estimates with their intervals, one row each, over one axis: analyses of one effect, or levels of subgroups. The
 * axis is the plan's; ratios take a log axis with the null line at 1. Rows that cannot be estimated say so in a
 * sentence. */
#ifndef EVENHAND_DRAW_ESTIMATES_H
#define EVENHAND_DRAW_ESTIMATES_H
#include "draw/axis.h"
#include "draw/figure.h"
#include "draw/palette.h"

struct estimates_row {
    const char *label;          /* "Baseline-adjusted mean difference" */
    const char *role;           /* "planned analysis", or "61 v 56"; may be NULL */
    double estimate, low, high; /* unused when there is a sentence */
    const char *figures;        /* at the right: "−4.6 (−6.9 to −2.3)"; may be NULL */
    const char *sentence;       /* instead of the interval when not estimable */
    bool emphasised;            /* drawn with the figure's mark, heavier */
    const char *group;          /* a heading with a break before this row; "" a break alone; NULL neither */
    double weight;              /* share of the area of the mark, 0 to 1; 0: all alike */
    const char *participant;    /* the row stands for leaving out this participant, and opens it; or NULL */
};

struct estimates {
    struct axis_plan axis;                      /* lower and upper: "favours walking group" */
    const struct palette_mark *mark;            /* of emphasised rows; NULL: ink */
    double band_low, band_high;                 /* shaded range, an infinity for an open side; NaN: none */
    const char *band_label;                     /* "at least the important difference" */
    const char *role_heading, *figures_heading; /* over the columns; may be NULL */
    const struct estimates_row *rows;
    size_t row_count;
};

void estimates_svg(const struct estimates *estimates, const struct figure *figure, struct html *html);
#endif
