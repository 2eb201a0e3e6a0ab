/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What all figures share. A figure is one <svg class="figure"> with title and description, complete as a file: its
 * colours, sizes and fonts are attributes, its footer says which trial, version and blinding it was drawn from. Its
 * role is "img", or "group" when marks in it can be opened (what is within an image is hidden from screen readers).
 * Marks of arms (struct palette_mark) are needed where not said otherwise. Every mark of a participant carries
 * data-participant, tabindex, role="button" and an aria-label "Q2400, −41.2". Units are pixels at the figure's own
 * width. No text is smaller than 13 units (25 in the meeting view), none overlaps another, and a value beyond the axis
 * is an arrow at the edge with the value written beside it. */
#ifndef EVENHAND_DRAW_FIGURE_H
#define EVENHAND_DRAW_FIGURE_H
#include "draw/html.h"
#include <stdbool.h>

enum { FIGURE_WIDTH = 1060, FIGURE_MEETING_WIDTH = 1800 };

struct figure {
    const char *id;          /* prefix of ids within the svg, unique on the page; letters, digits and "-" */
    const char *title;       /* the question it answers, for screen readers and files */
    const char *description; /* the answer in a sentence or two; may be NULL */
    const char *identity; /* footer: "Quayside Walking Trial · after decision 14 · 8f3c21aa · CODED"; NULL: none */
    double width;         /* 0: FIGURE_WIDTH, in the meeting view FIGURE_MEETING_WIDTH */
    bool meeting;         /* large text: at least 25 units, key numbers 34 */
};
#endif
