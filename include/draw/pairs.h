/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Paired values before and after, a panel for each arm: up to PAIRS_LINES participants as faint lines from baseline
 * to follow-up, more as a scatter about the line of no change. Medians of the pairs are bold. Who has a baseline but
 * no follow-up stands as a tick at the baseline. All panels share one axis of values. */
#ifndef EVENHAND_DRAW_PAIRS_H
#define EVENHAND_DRAW_PAIRS_H
#include "draw/axis.h"
#include "draw/figure.h"
#include "draw/palette.h"

enum { PAIRS_LINES = 80 };

struct pairs_point {
    const char *participant;
    double before, after; /* after is NaN where the follow-up is missing */
    bool outlier;         /* named */
};

struct pairs_panel {
    const char *arm;
    const struct palette_mark *mark;
    const char *counts; /* "101 pairs, 19 without follow-up" */
    const struct pairs_point *points;
    size_t point_count;
    double median_before, median_after; /* of the pairs; NaN: none */
};

struct pairs {
    struct axis_plan axis; /* of both occasions; the title names variable and unit */
    int decimals;
    const char *before, *after; /* "baseline", "26 weeks" */
    const struct pairs_panel *panels;
    size_t panel_count;
};

void pairs_svg(const struct pairs *pairs, const struct figure *figure, struct html *html);
#endif
