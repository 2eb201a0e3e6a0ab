/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What is missing, of whom, and why: a row for each variable in order of time, a thin column for each participant in
 * the order given, one block for each arm or one for all. An observed cell is quiet paper; every reason has a shape
 * of its own, in ink. With more participants than GRID_COLUMNS in all, neighbours share a column and the shape shows
 * their commonest reason at a height by their share. Counts of missing stand in the margin. Marks carry
 * data-participant and data-column. */
#ifndef EVENHAND_DRAW_GRID_H
#define EVENHAND_DRAW_GRID_H
#include "draw/figure.h"
#include "draw/palette.h"

enum { GRID_COLUMNS = 400 };

/* Order of the names is the order of the legend. */
enum grid_state {
    GRID_OBSERVED,
    GRID_BLANK,
    GRID_MISSING_CODE,
    GRID_UNREADABLE,
    GRID_BELOW_LIMIT,
    GRID_ABOVE_LIMIT,
    GRID_SET_MISSING,
    GRID_AFTER_EVENT,
    GRID_HELD_ASIDE,
    GRID_STATES
};

struct grid_variable {
    const char *label;  /* "Pressure, 26 weeks" */
    const char *column; /* data-column */
    const char *counts; /* in the margin: "40"; NULL: counted from the cells (all that are not observed) */
};

struct grid_block {
    const char *label;               /* "A"; NULL for one block of all */
    const struct palette_mark *mark; /* colour of the label; NULL: ink */
    const char *const *participants;
    size_t participant_count;
    const unsigned char *states; /* enum grid_state, [participant * variable_count + variable] */
};

struct grid {
    const struct grid_variable *variables;
    size_t variable_count;
    const struct grid_block *blocks;
    size_t block_count;
};

const char *grid_state_words(enum grid_state state); /* "code for missing", as the legend says it */
void grid_svg(const struct grid *grid, const struct figure *figure, struct html *html);
#endif
