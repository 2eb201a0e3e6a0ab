/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The colours and marks of every figure. Arms are told apart by colour, shape and dash together; the colours of coded
 * arms are never those of unblinded ones. A test holds the table to contrast (WCAG 2.1, 1.4.3 and 1.4.11) and to
 * staying apart under simulated protanopia, deuteranopia and in grey. */
#ifndef EVENHAND_DRAW_PALETTE_H
#define EVENHAND_DRAW_PALETTE_H
#include <stdbool.h>
#include <stddef.h>

#define PALETTE_PAPER "#FBFAF7"
#define PALETTE_INK "#1D2430"
#define PALETTE_QUIET "#5F6672"    /* secondary text, 4.5:1 on paper */
#define PALETTE_HAIRLINE "#D8D3C8" /* rules that carry no meaning */
#define PALETTE_BAND "#EFECE3"     /* shaded ranges behind marks */

enum palette_shape { SHAPE_CIRCLE, SHAPE_DIAMOND, SHAPE_TRIANGLE, SHAPE_SQUARE };

enum { PALETTE_ARMS = 4 };

struct palette_mark {
    const char *name;   /* "indigo" */
    const char *colour; /* strokes, filled marks and text */
    const char *tint;   /* the fill of ordinary points */
    enum palette_shape shape;
    const char *dash; /* stroke-dasharray, NULL for a solid line */
};

/* The mark of the arm at this place (0 is the reference, or letter A); beyond the fourth they come round again, and the
 * label beside the mark tells them apart. Static, never NULL. */
const struct palette_mark *palette_arm(bool coded, size_t place);
/* For all participants together: ink, circles, solid lines. */
const struct palette_mark *palette_pooled(void);
#endif
