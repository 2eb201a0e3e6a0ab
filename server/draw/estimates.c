/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "draw/estimates.h"
#include "base/memory.h"
#include "draw/canvas.h"
#include "draw/number.h"
#include <math.h>

struct columns {
    double label, role, figures; /* widths */
    double row;                  /* height of a row of one line */
    struct axis axis;
};

static struct canvas_style label_style(const struct canvas *canvas, bool emphasised) {
    return (struct canvas_style){.size = emphasised ? canvas->strong : canvas->normal, .bold = emphasised};
}

static struct canvas_style quiet_style(const struct canvas *canvas) {
    return (struct canvas_style){.size = canvas->small, .colour = PALETTE_QUIET};
}

static void take_in(double *low, double *high, double value) {
    if (isfinite(value)) {
        *low = fmin(*low, value);
        *high = fmax(*high, value);
    }
}

static void find_axis(const struct canvas *canvas, const struct estimates *estimates, struct columns *columns) {
    double low = INFINITY, high = -INFINITY;
    take_in(&low, &high, estimates->axis.null_line);
    take_in(&low, &high, estimates->band_low);
    take_in(&low, &high, estimates->band_high);
    for (size_t r = 0; r < estimates->row_count; r++) {
        if (!estimates->rows[r].sentence) {
            take_in(&low, &high, estimates->rows[r].estimate);
            take_in(&low, &high, estimates->rows[r].low);
            take_in(&low, &high, estimates->rows[r].high);
        }
    }
    low = isnan(estimates->axis.low) ? low : estimates->axis.low;
    high = isnan(estimates->axis.high) ? high : estimates->axis.high;
    double null_line = estimates->axis.null_line;
    if (estimates->axis.scale == AXIS_LINEAR && isnan(estimates->axis.low) && isnan(estimates->axis.high)) {
        /* Both sides of the null line are there to be seen, also when every interval lies on one. */
        double margin = 0.2 * (high - low);
        low = null_line == low ? low - margin : low;
        high = null_line == high ? high + margin : high;
    }
    double gap = 18.0 * canvas->unit;
    double from = columns->label + columns->role + gap, to = canvas->width - columns->figures - gap;
    axis_init(&columns->axis, estimates->axis.scale, low, high, from, to, canvas_ticks(canvas, to - from));
    columns->axis.with_sign = estimates->axis.with_sign;
}

/* What a cell needs of its column: its words in one line, or broken evenly where they are wider than `most`. */
static double column_width(struct canvas_style style, double most, const char *string) {
    return fmin(canvas_width(style, string), canvas_balance(most, style, string));
}

static void find_columns(const struct canvas *canvas, const struct estimates *estimates, struct columns *columns) {
    struct canvas_style quiet = quiet_style(canvas);
    *columns = (struct columns){.row = fmax(canvas->normal * 2.2, 31.0 * canvas->unit)};
    columns->role = column_width(quiet, canvas->width * 0.13, estimates->role_heading);
    columns->figures = canvas_width(quiet, estimates->figures_heading);
    for (size_t r = 0; r < estimates->row_count; r++) {
        const struct estimates_row *row = &estimates->rows[r];
        struct canvas_style style = label_style(canvas, row->emphasised);
        columns->label = fmax(columns->label, column_width(style, canvas->width * 0.27, row->label));
        columns->role = fmax(columns->role, column_width(quiet, canvas->width * 0.13, row->role));
        columns->figures = fmax(columns->figures, row->sentence ? 0.0 : canvas_width(style, row->figures));
    }
    columns->label += canvas->small;
    columns->figures = fmin(columns->figures, canvas->width * 0.24) + (columns->figures > 0.0 ? canvas->small : 0.0);
    find_axis(canvas, estimates, columns);
    columns->figures -= columns->figures > 0.0 ? canvas->small : 0.0;
}

/* ---- the shaded range ---- */

static bool has_band(const struct estimates *estimates) {
    return !isnan(estimates->band_low) && !isnan(estimates->band_high);
}

static void band_places(const struct estimates *estimates, const struct columns *columns, double *left, double *right) {
    *left = axis_place(&columns->axis, fmax(estimates->band_low, columns->axis.low));
    *right = axis_place(&columns->axis, fmin(estimates->band_high, columns->axis.high));
}

/* The caption stands over the rows, centred on the band as far as the axis allows; returns where the rows begin. */
static double draw_headings(
    struct canvas *canvas, const struct estimates *estimates, const struct columns *columns, double top) {
    struct canvas_style style = quiet_style(canvas);
    const struct axis *axis = &columns->axis;
    double line = canvas_line_height(canvas->small), y = top + canvas->small * 1.2, next = top;
    if (estimates->role_heading) {
        next = canvas_paragraph(canvas, columns->label, y, columns->role, style, estimates->role_heading);
    }
    if (estimates->figures_heading) {
        next = fmax(next, canvas_paragraph(canvas, canvas->width - columns->figures, y, columns->figures, style,
                              estimates->figures_heading));
    }
    if (has_band(estimates) && estimates->band_label) {
        double left, right, room = axis->to - axis->from;
        band_places(estimates, columns, &left, &right);
        double half = fmin(canvas_width(style, estimates->band_label), room) / 2.0;
        double x = fmin(fmax((left + right) / 2.0, axis->from + half), axis->to - half);
        style.anchor = ANCHOR_MIDDLE;
        next = fmax(next, canvas_paragraph(canvas, x, y, room, style, estimates->band_label));
    }
    return next > top ? next - line + 8.0 * canvas->unit : top;
}

/* ---- rows ---- */

static double row_height(const struct canvas *canvas, const struct columns *columns, const struct estimates_row *row) {
    struct canvas_style style = label_style(canvas, row->emphasised), quiet = quiet_style(canvas);
    double line = canvas_line_height(style.size), small = canvas_line_height(canvas->small);
    double label = line * (double)canvas_lines(columns->label - canvas->small, style, row->label);
    double role = small * (double)canvas_lines(columns->role, quiet, row->role);
    double figures = row->sentence
                         ? small * (double)canvas_lines(canvas->width - columns->axis.from, quiet, row->sentence)
                         : line * (double)canvas_lines(columns->figures, style, row->figures);
    double tallest = fmax(label, fmax(role, figures)) + 8.0 * canvas->unit;
    bool arrows = !row->sentence && (axis_beyond(&columns->axis, row->low) || axis_beyond(&columns->axis, row->high));
    return fmax(tallest, columns->row) + (arrows ? canvas->small * 0.7 : 0.0);
}

/* A paragraph centred on the middle of its row. */
static void centred(
    struct canvas *canvas, double x, double middle, double width, struct canvas_style style, const char *string) {
    double extra = canvas_line_height(style.size) * ((double)canvas_lines(width, style, string) - 1.0);
    canvas_paragraph(canvas, x, middle + style.size * 0.36 - extra / 2.0, width, style, string);
}

/* An end of the interval: a cap, or where the axis is too short an arrow with its value above it; with both values when
 * the whole interval lies beyond. */
static void draw_end(struct canvas *canvas, const struct columns *columns, double value, double other, double y,
    double stroke, const char *colour) {
    const struct axis *axis = &columns->axis;
    double x = axis_place(axis, value), cap = 4.0 * canvas->unit + stroke;
    int beyond = axis_beyond(axis, value), decimals = axis->scale == AXIS_LOG10 ? 2 : axis->decimals + 1;
    if (!beyond) {
        canvas_line(canvas, x, y - cap, x, y + cap, colour, stroke, NULL);
        return;
    }
    canvas_arrow(canvas, x, y, 9.0 * canvas->unit, beyond, colour);
    bool whole = axis_beyond(axis, other) == beyond;
    if (whole && beyond * other > beyond * value) {
        return;
    }
    struct text label;
    text_init(&label);
    number_shown(&label, whole ? fmin(value, other) : value, decimals, axis->with_sign);
    if (whole && value != other) {
        text_literal(&label, " to ");
        number_shown(&label, fmax(value, other), decimals, axis->with_sign);
    }
    struct canvas_style style = quiet_style(canvas);
    style.anchor = beyond < 0 ? ANCHOR_START : ANCHOR_END;
    canvas_text(canvas, x, y - cap - 2.0 * canvas->unit, style, label.data);
    text_release(&label);
}

static void draw_interval(struct canvas *canvas, const struct estimates *estimates, const struct columns *columns,
    const struct estimates_row *row, double y) {
    const struct axis *axis = &columns->axis;
    const char *colour = row->emphasised && estimates->mark ? estimates->mark->colour : PALETTE_INK;
    double stroke = (row->emphasised ? 2.75 : 1.5) * canvas->unit;
    double radius = (row->emphasised ? 6.0 : 4.2) * canvas->unit;
    if (row->weight > 0.0) { /* areas in proportion, and the least still to be seen */
        radius = canvas->unit * fmax(3.0, 9.0 * sqrt(fmin(row->weight, 1.0)));
    }
    if (isfinite(row->low) && isfinite(row->high)) {
        canvas_line(canvas, axis_place(axis, row->low), y, axis_place(axis, row->high), y, colour, stroke, NULL);
        draw_end(canvas, columns, row->low, row->high, y, stroke, colour);
        draw_end(canvas, columns, row->high, row->low, y, stroke, colour);
    }
    int beyond = axis_beyond(axis, row->estimate);
    if (isfinite(row->estimate) && !beyond) {
        enum palette_shape shape = row->weight > 0.0 ? SHAPE_SQUARE : SHAPE_DIAMOND;
        canvas_mark(
            canvas, shape, axis_place(axis, row->estimate), y, radius, colour, NULL, row->participant, row->figures);
    } else if (isfinite(row->estimate) && !isfinite(row->low)) {
        draw_end(canvas, columns, row->estimate, row->estimate, y, stroke, colour);
    }
}

static void draw_row(struct canvas *canvas, const struct estimates *estimates, const struct columns *columns,
    const struct estimates_row *row, double top) {
    double middle = top + row_height(canvas, columns, row) / 2.0;
    struct canvas_style style = label_style(canvas, row->emphasised), quiet = quiet_style(canvas);
    centred(canvas, 0.0, middle, columns->label - canvas->small, style, row->label);
    centred(canvas, columns->label, middle, columns->role, quiet, row->role);
    if (row->sentence) {
        centred(canvas, columns->axis.from, middle, canvas->width - columns->axis.from, quiet, row->sentence);
        return;
    }
    bool arrows = axis_beyond(&columns->axis, row->low) || axis_beyond(&columns->axis, row->high);
    draw_interval(canvas, estimates, columns, row, middle + (arrows ? canvas->small * 0.35 : 0.0));
    centred(canvas, canvas->width - columns->figures, middle, columns->figures, style, row->figures);
}

static double draw_group(
    struct canvas *canvas, const struct columns *columns, const char *heading, bool first, double top) {
    struct canvas_style style = {.size = canvas->normal, .bold = true};
    double y = top + (first ? 0.0 : 8.0 * canvas->unit);
    if (!*heading) {
        return y;
    }
    y += canvas->normal * 1.4;
    return canvas_paragraph(canvas, 0.0, y, columns->axis.from - canvas->small, style, heading) - canvas->normal * 0.9;
}

/* The null line runs behind the rows but not through sentences. */
static double draw_rows(
    struct canvas *canvas, const struct estimates *estimates, const struct columns *columns, double top) {
    double y = top, null_line = estimates->axis.null_line;
    bool has_null = !isnan(null_line) && !axis_beyond(&columns->axis, null_line);
    for (size_t r = 0; r < estimates->row_count; r++) {
        const struct estimates_row *row = &estimates->rows[r];
        double start = y;
        if (row->group) {
            y = draw_group(canvas, columns, row->group, r == 0, y);
        }
        double next = y + row_height(canvas, columns, row);
        if (has_null) {
            double x = axis_place(&columns->axis, null_line);
            canvas_line(canvas, x, start, x, row->sentence ? y : next, PALETTE_INK, 1.25 * canvas->unit, NULL);
        }
        draw_row(canvas, estimates, columns, row, y);
        y = next;
    }
    return y;
}

static void draw(struct canvas *canvas, const void *data) {
    const struct estimates *estimates = data;
    struct columns columns;
    find_columns(canvas, estimates, &columns);
    struct canvas probe = *canvas; /* the band lies under the rows, so their height is asked first */
    probe.html = NULL;
    double top = draw_headings(&probe, estimates, &columns, 2.0), bottom = draw_rows(&probe, estimates, &columns, top);
    const struct axis *axis = &columns.axis;
    if (has_band(estimates)) {
        double left, right;
        band_places(estimates, &columns, &left, &right);
        canvas_rectangle(canvas, left, top, right - left, bottom - top, PALETTE_BAND, NULL, 0.0, NULL);
    }
    draw_headings(canvas, estimates, &columns, 2.0);
    draw_rows(canvas, estimates, &columns, top);
    canvas_axis(canvas, axis, &estimates->axis, bottom + 4.0 * canvas->unit);
}

void estimates_svg(const struct estimates *estimates, const struct figure *figure, struct html *html) {
    canvas_render(figure, html, draw, estimates);
}
