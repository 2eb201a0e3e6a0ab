/* SPDX-License-Identifier: GPL-3.0-or-later */
/* How often each level of a category occurs: plain horizontal bars from zero, with n and percent written out. */
#ifndef EVENHAND_DRAW_BARS_H
#define EVENHAND_DRAW_BARS_H
#include "draw/figure.h"
#include "draw/palette.h"

struct bars_level {
    const char *label;
    size_t count;
    bool missing; /* drawn hollow, after a break: "missing" */
};

struct bars {
    const char *title; /* over the bars: "Sex, 240 participants" */
    const struct bars_level *levels;
    size_t level_count;
};

/* Percentages are of all levels that are not missing; of a missing level, of everything. */
void bars_svg(const struct bars *bars, const struct figure *figure, struct html *html);
#endif
