/* SPDX-License-Identifier: GPL-3.0-or-later */
/* One box with its points on an axis: the piece that box plots and histograms share. Figures use it, exhibits do not.
 */
#ifndef EVENHAND_DRAW_BOX_ROW_H
#define EVENHAND_DRAW_BOX_ROW_H
#include "draw/boxes.h"
#include "draw/canvas.h"

enum { BOX_ROW_NAMED = 12 };

/* The largest size of point that keeps the row's stack within `room`, or the smallest there is; 0 when even those would
 * make a tower, or when there are more than BOXES_POINTS: such a row becomes a strip. A NULL row gives the usual size.
 */
double box_row_radius(const struct canvas *canvas, const struct axis *axis, const struct boxes_row *row, double room);

/* Draws the row below `top` and returns its lowest point. Points stand at their exact place, stacked downwards in order
 * of value (ties in order of identifier). In a strip, bars hanging from one line show how many lie where, and outliers
 * are drawn still. With radius 0 outliers alone are drawn. As many outliers as the axis has room for beside each other,
 * BOX_ROW_NAMED at most, are named, the furthest first; a line says how many are not. */
double box_row_draw(struct canvas *canvas, const struct axis *axis, const struct boxes_row *row, int decimals,
    bool with_sign, double radius, double top);

/* Takes the row's box and points into a range; NaN ends are empty. */
void box_row_range(const struct boxes_row *row, double *low, double *high);
#endif
