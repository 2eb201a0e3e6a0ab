/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What the figures of draw/ are drawn with; exhibits use the figures, not this.
 *
 * A figure is drawn twice by one function: first measuring, when nothing is written and only the lowest point is noted,
 * then for good, when the height is known. So a drawing function depends on its data alone. Sizes come from the canvas,
 * so that the meeting view is the same drawing with larger text. Borrows everything; one thread. */
#ifndef EVENHAND_DRAW_CANVAS_H
#define EVENHAND_DRAW_CANVAS_H
#include "draw/axis.h"
#include "draw/figure.h"
#include "draw/palette.h"
#include <stdbool.h>
#include <stddef.h>

struct canvas {
    const struct figure *figure;
    struct html *html; /* NULL while measuring */
    double width, lowest;
    double small, normal, strong, key; /* sizes of text */
    double unit;                       /* factor of marks, gaps and boxes */
    size_t participants;               /* marks that open one */
};

typedef void canvas_drawing(struct canvas *canvas, const void *data);
/* Writes the whole <svg>. */
void canvas_render(const struct figure *figure, struct html *html, canvas_drawing *drawing, const void *data);

enum canvas_anchor { ANCHOR_START, ANCHOR_MIDDLE, ANCHOR_END };

struct canvas_style {
    double size;
    const char *colour; /* NULL: ink */
    enum canvas_anchor anchor;
    bool bold, halo; /* a rim of paper, where lines run behind */
};

/* One line with its baseline at y. */
void canvas_text(struct canvas *canvas, double x, double y, struct canvas_style style, const char *string);
/* Broken at blanks into lines no wider than `width` (a longer word is broken too), the first with its baseline at y;
 * returns the baseline of the line that would follow. */
double canvas_paragraph(
    struct canvas *canvas, double x, double y, double width, struct canvas_style style, const char *string);
size_t canvas_lines(double width, struct canvas_style style, const char *string); /* how many lines that makes */
/* The least width that makes no more lines than `width` does: for words that look better evenly broken. */
double canvas_balance(double width, struct canvas_style style, const char *string);
double canvas_width(struct canvas_style style, const char *string);
double canvas_line_height(double size);
double canvas_widest_word(struct canvas_style style, const char *string);

void canvas_line(struct canvas *canvas, double x1, double y1, double x2, double y2, const char *colour, double width,
    const char *dash);
void canvas_rectangle(struct canvas *canvas, double x, double y, double width, double height, const char *fill,
    const char *stroke, double stroke_width, const char *dash);
void canvas_path(struct canvas *canvas, const char *path, const char *fill, const char *stroke, double stroke_width);
/* A small solid triangle pointing along `direction` (-1 left, 1 right) with its tip at x. */
void canvas_arrow(struct canvas *canvas, double x, double y, double size, int direction, const char *colour);

/* Attributes of an element just opened that make it open a participant; `value` is what is said after the identifier.
 */
void canvas_opens(struct canvas *canvas, const char *participant, const char *value);
/* A mark of the arm's shape about (x, y); participant may be NULL. */
void canvas_mark(struct canvas *canvas, enum palette_shape shape, double x, double y, double radius, const char *fill,
    const char *stroke, const char *participant, const char *value);

/* The axis at height y with ticks, labels, direction words and title below; labels that would touch are left out.
 * Returns the lowest baseline used. */
double canvas_axis(struct canvas *canvas, const struct axis *axis, const struct axis_plan *plan, double y);
/* How many ticks suit a stretch of this length. */
size_t canvas_ticks(const struct canvas *canvas, double length);

/* Places texts beside marks so that nothing touches: boxes taken so far. */
struct places {
    struct place {
        double left, top, right, bottom;
    } * taken;
    size_t count, room;
};

void places_init(struct places *places);
void places_release(struct places *places);
void places_take(struct places *places, double left, double top, double right, double bottom);
bool places_free(const struct places *places, double left, double top, double right, double bottom);
#endif
