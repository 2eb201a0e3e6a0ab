/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "draw/box_row.h"
#include "base/memory.h"
#include "draw/number.h"
#include <math.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* A point as it will be drawn. */
struct spot {
    const struct figure_point *point;
    double x, y;
    int beyond;
};

struct row {
    struct canvas *canvas;
    const struct axis *axis;
    const struct boxes_row *data;
    int decimals;
    bool with_sign;
    struct spot *spots; /* those drawn one by one, in order of value */
    size_t spot_count;
    double radius, bottom;
    struct places places; /* what names must not touch */
};

static const double tower = 260.0; /* a stack higher than this would push the page away */

void box_row_range(const struct boxes_row *row, double *low, double *high) {
    for (size_t i = 0; i < row->point_count; i++) {
        *low = fmin(*low, row->points[i].value);
        *high = fmax(*high, row->points[i].value);
    }
    if (!row->sentence) {
        *low = fmin(*low, fmin(row->low_whisker, row->mean));
        *high = fmax(*high, fmax(row->high_whisker, row->mean));
    }
}

static void shown(const struct row *row, double value, struct text *out) {
    text_clear(out);
    number_shown(out, value, row->decimals, row->with_sign);
}

/* ---- the box ---- */

static void whisker(const struct row *row, double y, double from, double to, int direction) {
    struct canvas *canvas = row->canvas;
    const char *colour = row->data->mark->colour;
    double start = axis_place(row->axis, from), end = axis_place(row->axis, to);
    canvas_line(canvas, start, y, end, y, colour, 1.5 * canvas->unit, NULL);
    if (axis_beyond(row->axis, to)) {
        canvas_arrow(canvas, end, y, 8.0 * canvas->unit, direction, colour);
    }
}

static void mean_cross(const struct row *row, double y) {
    struct canvas *canvas = row->canvas;
    if (isnan(row->data->mean) || axis_beyond(row->axis, row->data->mean)) {
        return;
    }
    double x = axis_place(row->axis, row->data->mean), arm = 4.5 * canvas->unit, width = 1.75 * canvas->unit;
    canvas_line(canvas, x - arm, y - arm, x + arm, y + arm, row->data->mark->colour, width, NULL);
    canvas_line(canvas, x - arm, y + arm, x + arm, y - arm, row->data->mark->colour, width, NULL);
}

static void draw_box(const struct row *row, double top, double height) {
    struct canvas *canvas = row->canvas;
    const struct boxes_row *data = row->data;
    const struct axis *axis = row->axis;
    double unit = canvas->unit, middle = top + height / 2.0;
    double left = axis_place(axis, data->low_quartile), right = axis_place(axis, data->high_quartile);
    double median = axis_place(axis, data->median);
    whisker(row, middle, data->low_quartile, data->low_whisker, -1);
    whisker(row, middle, data->high_quartile, data->high_whisker, 1);
    canvas_rectangle(
        canvas, left, top, right - left, height, PALETTE_PAPER, data->mark->colour, 1.75 * unit, data->mark->dash);
    canvas_line(
        canvas, median, top - 3.0 * unit, median, top + height + 3.0 * unit, data->mark->colour, 4.0 * unit, NULL);
    mean_cross(row, middle);
    struct text label;
    text_init(&label);
    shown(row, data->median, &label);
    double half = number_width(label.data, canvas->strong, true) / 2.0;
    double x = fmin(fmax(median, axis->from + half), fmax(axis->to - half, axis->from + half));
    struct canvas_style style = {
        .size = canvas->strong, .colour = data->mark->colour, .anchor = ANCHOR_MIDDLE, .bold = true, .halo = true};
    canvas_text(canvas, x, top - 6.0 * unit, style, label.data);
    text_release(&label);
}

/* ---- the points ---- */

static int by_value(const void *a, const void *b) {
    const struct figure_point *one = ((const struct spot *)a)->point, *two = ((const struct spot *)b)->point;
    if (one->value != two->value) {
        return one->value < two->value ? -1 : 1;
    }
    return strcmp(one->participant ? one->participant : "", two->participant ? two->participant : "");
}

static void collect(struct row *row, bool outliers_only) {
    row->spot_count = 0;
    for (size_t i = 0; i < row->data->point_count; i++) {
        const struct figure_point *point = &row->data->points[i];
        if (isnan(point->value) || (outliers_only && !point->outlier)) {
            continue;
        }
        row->spots[row->spot_count++] = (struct spot){
            .point = point,
            .x = axis_place(row->axis, point->value),
            .beyond = axis_beyond(row->axis, point->value),
        };
    }
    qsort(row->spots, row->spot_count, sizeof *row->spots, by_value);
}

/* The first lane with room for each point, from left to right; y is the lane's number. Returns how many lanes, or,
 * stopping early, most + 1: a tower is not worth building. */
static size_t stack(struct row *row, double spacing, size_t most) {
    double *ends = memory_new(row->spot_count + 1, sizeof *ends);
    size_t lanes = 0;
    for (size_t i = 0; i < row->spot_count && lanes <= most; i++) {
        struct spot *spot = &row->spots[i];
        size_t lane = 0;
        while (lane < lanes && ends[lane] > spot->x - spacing) {
            lane++;
        }
        lanes += lane == lanes;
        ends[lane] = spot->x;
        spot->y = (double)lane;
    }
    memory_free(ends);
    return lanes;
}

static double spacing_of(double radius) {
    return radius * 2.5 + 0.7;
}

static bool fits(struct row *row, double radius, double room) {
    size_t most = (size_t)floor(room / spacing_of(radius));
    return stack(row, spacing_of(radius), most) <= most;
}

/* The largest radius, from this one down, with which the stack is no higher than `room`, or the smallest there is. */
static double fitting_radius(struct row *row, double radius, double room) {
    double smallest = 0.9 * row->canvas->unit;
    while (radius > smallest && !fits(row, radius, room)) {
        radius = fmax(radius * 0.9, smallest);
    }
    return radius;
}

double box_row_radius(const struct canvas *canvas, const struct axis *axis, const struct boxes_row *data, double room) {
    double usual = 3.8 * canvas->unit;
    if (!data || data->point_count == 0) {
        return usual;
    }
    if (data->point_count > BOXES_POINTS) {
        return 0.0;
    }
    struct canvas probe = *canvas;
    struct row row = {.canvas = &probe, .axis = axis, .data = data};
    row.spots = memory_new(data->point_count, sizeof *row.spots);
    collect(&row, false);
    double radius = fitting_radius(&row, usual, room);
    bool drawn = fits(&row, radius, fmax(room, tower * canvas->unit));
    memory_free(row.spots);
    return drawn ? radius : 0.0;
}

static void place_points(struct row *row, double radius, double top) {
    row->radius = radius;
    double height = spacing_of(radius) * (double)stack(row, spacing_of(radius), SIZE_MAX - 1);
    for (size_t i = 0; i < row->spot_count; i++) {
        row->spots[i].y = top + spacing_of(radius) * (row->spots[i].y + 0.5);
    }
    row->bottom = top + height;
}

static void draw_points(const struct row *row) {
    struct canvas *canvas = row->canvas;
    const struct palette_mark *mark = row->data->mark;
    struct text value;
    text_init(&value);
    for (size_t i = 0; i < row->spot_count; i++) {
        const struct spot *spot = &row->spots[i];
        shown(row, spot->point->value, &value);
        const char *fill = spot->point->outlier || spot->beyond ? mark->colour : mark->tint;
        double radius = spot->point->outlier ? fmax(row->radius, 1.8 * canvas->unit) : row->radius;
        canvas_mark(
            canvas, mark->shape, spot->x, spot->y, radius, fill, mark->colour, spot->point->participant, value.data);
        if (spot->beyond) {
            canvas_arrow(canvas, spot->x + spot->beyond * (row->radius + 8.0 * canvas->unit), spot->y,
                6.0 * canvas->unit, spot->beyond, mark->colour);
        }
    }
    text_release(&value);
}

/* How many lie where, as bars hanging from one line; what is drawn one by one is left out. */
static void draw_strip(struct row *row, double top) {
    enum { WIDEST = 1000 };
    size_t counts[WIDEST] = {0}, most = 0;
    double unit = row->canvas->unit, step = 4.0 * unit, length = row->axis->to - row->axis->from;
    size_t bins = (size_t)fmin(fmax(floor(length / step), 1.0), (double)WIDEST);
    for (size_t i = 0; i < row->data->point_count; i++) {
        const struct figure_point *point = &row->data->points[i];
        if (point->outlier || isnan(point->value)) {
            continue;
        }
        double share = (axis_place(row->axis, point->value) - row->axis->from) / length;
        size_t bin = (size_t)fmin(share * (double)bins, (double)(bins - 1));
        counts[bin]++;
        most = counts[bin] > most ? counts[bin] : most;
    }
    double width = length / (double)bins, height = 48.0 * unit;
    for (size_t b = 0; b < bins; b++) {
        if (counts[b]) {
            double left = row->axis->from + width * (double)b;
            double down = fmax(height * (double)counts[b] / (double)most, unit);
            canvas_rectangle(row->canvas, left, top, width * 0.85, down, row->data->mark->colour, NULL, 0.0, NULL);
            places_take(&row->places, left, top, left + width, top + down);
        }
    }
    row->bottom = top + height;
}

/* ---- the names ---- */

static double distance(const struct row *row, const struct spot *spot) {
    double centre = row->data->sentence ? 0.0 : row->data->median;
    return fabs(spot->point->value - centre);
}

/* Outliers that get a name, the furthest first; returns how many, *left those without. */
static size_t choose_named(const struct row *row, const struct spot *named[BOX_ROW_NAMED + 1], size_t *left) {
    double room = floor((row->axis->to - row->axis->from) / (5.5 * row->canvas->small));
    size_t count = 0, most = (size_t)fmin(fmax(room, 4.0), BOX_ROW_NAMED);
    *left = 0;
    for (size_t i = 0; i < row->spot_count; i++) {
        const struct spot *spot = &row->spots[i];
        if ((!spot->point->outlier && !spot->beyond) || !spot->point->participant) {
            continue;
        }
        size_t at = count;
        while (at > 0 && distance(row, named[at - 1]) < distance(row, spot)) {
            at--;
        }
        if (at == most) {
            (*left)++;
            continue;
        }
        *left += count == most;
        count += count < most;
        memmove(&named[at + 1], &named[at], (count - at - 1) * sizeof *named);
        named[at] = spot;
    }
    return count;
}

/* Where a name stands. */
struct name {
    char *string;
    const struct spot *spot;
    double x, y, width;
    bool apart; /* a line leads back to its point */
    int side;   /* of the point: 1 right, -1 left */
};

/* Beside the point, on the outer side first, else lower and lower. */
static void place_name(struct row *row, struct name *name) {
    const struct spot *spot = name->spot;
    double unit = row->canvas->unit, size = row->canvas->small, line = canvas_line_height(size) * 0.5;
    double gap = row->radius * 1.3 + 4.0 * unit, outside = spot->beyond ? 10.0 * unit : 0.0;
    double left_end = row->axis->from - 14.0 * unit, right_end = row->axis->to + 14.0 * unit;
    int outer = row->data->sentence || spot->point->value >= row->data->median ? 1 : -1;
    for (int step = 0;; step++) {
        for (int turn = 1; turn >= -1; turn -= 2) {
            int side = outer * turn;
            double away = gap + (side == spot->beyond ? outside : 0.0);
            double x = side > 0 ? spot->x + away : spot->x - away - name->width;
            double y = spot->y + line * step, top = y - size * 0.62, bottom = y + size * 0.62;
            /* Far below everything a name may reach over an end: that is better than none. */
            bool within = (x >= left_end && x + name->width <= right_end) || step > 400;
            if (within && places_free(&row->places, x, top, x + name->width, bottom)) {
                places_take(&row->places, x, top, x + name->width, bottom);
                row->bottom = fmax(row->bottom, bottom);
                *name = (struct name){name->string, spot, x, y, name->width, step > 0, side};
                return;
            }
        }
    }
}

static void draw_names(const struct row *row, const struct name *names, size_t count) {
    struct canvas *canvas = row->canvas;
    struct canvas_style style = {.size = canvas->small, .bold = true, .halo = true};
    for (size_t i = 0; i < count; i++) {
        const struct name *name = &names[i];
        if (name->apart) {
            double end = name->side > 0 ? name->x - 2.0 : name->x + name->width + 2.0;
            double start = name->spot->y + row->radius * 1.2;
            canvas_line(canvas, name->spot->x, start, end, name->y, PALETTE_QUIET, 0.75 * canvas->unit, NULL);
        }
    }
    for (size_t i = 0; i < count; i++) {
        canvas_text(canvas, names[i].x, names[i].y + canvas->small * 0.36, style, names[i].string);
    }
}

static char *name_of(const struct row *row, const struct spot *spot) {
    struct text name;
    text_init(&name);
    text_string(&name, spot->point->participant);
    if (spot->beyond) {
        text_literal(&name, " ");
        number_shown(&name, spot->point->value, row->decimals, row->with_sign);
    }
    return name.data;
}

static void say_unnamed(struct row *row, size_t count) {
    struct canvas *canvas = row->canvas;
    struct canvas_style style = {.size = canvas->small, .colour = PALETTE_QUIET, .halo = true};
    char words[80];
    snprintf(words, sizeof words, "and %zu more beyond the fences, not named", count);
    double next = canvas_paragraph(
        canvas, row->axis->from, row->bottom + canvas->small * 1.2, row->axis->to - row->axis->from, style, words);
    row->bottom = next - canvas->small * 0.8;
}

static void name_outliers(struct row *row) {
    const struct spot *chosen[BOX_ROW_NAMED + 1];
    struct name names[BOX_ROW_NAMED];
    size_t left, count = choose_named(row, chosen, &left);
    for (size_t i = 0; i < row->spot_count; i++) {
        const struct spot *spot = &row->spots[i];
        double reach = row->radius * 1.3;
        places_take(&row->places, spot->x - reach, spot->y - reach, spot->x + reach, spot->y + reach);
    }
    for (size_t i = 0; i < count; i++) {
        names[i] = (struct name){.string = name_of(row, chosen[i]), .spot = chosen[i]};
        names[i].width = number_width(names[i].string, row->canvas->small, true);
        place_name(row, &names[i]);
    }
    draw_names(row, names, count);
    for (size_t i = 0; i < count; i++) {
        memory_free(names[i].string);
    }
    if (left) {
        say_unnamed(row, left);
    }
}

/* Tied outliers can make a tower too: then their lanes are pressed together. */
static void press(struct row *row, double top, double height) {
    double scale = fmin(1.0, height / fmax(row->bottom - top, 1.0));
    for (size_t i = 0; i < row->spot_count; i++) {
        row->spots[i].y = top + (row->spots[i].y - top) * scale;
    }
    row->bottom = fmin(row->bottom, top + height);
}

static void draw_all_points(struct row *row, double radius, double room, double top) {
    bool strip = radius > 0.0 && box_row_radius(row->canvas, row->axis, row->data, room) == 0.0;
    double strip_bottom = top;
    places_init(&row->places);
    if (strip) {
        draw_strip(row, top);
        strip_bottom = row->bottom;
    }
    bool outliers_only = strip || radius == 0.0;
    collect(row, outliers_only);
    if (outliers_only) {
        double low = 80.0 * row->canvas->unit;
        radius = fitting_radius(row, 3.0 * row->canvas->unit, low);
        place_points(row, radius, top);
        press(row, top, low);
    } else {
        place_points(row, radius, top);
    }
    draw_points(row);
    row->bottom = fmax(row->bottom, strip_bottom);
    name_outliers(row);
    places_release(&row->places);
}

double box_row_draw(struct canvas *canvas, const struct axis *axis, const struct boxes_row *data, int decimals,
    bool with_sign, double radius, double top) {
    double unit = canvas->unit, box_top = top + canvas->strong * 0.95 + 6.0 * unit, box_height = 28.0 * unit;
    struct row row = {canvas, axis, data, decimals, with_sign, .bottom = box_top + box_height};
    if (data->sentence) {
        struct canvas_style style = {.size = canvas->normal, .colour = PALETTE_QUIET, .halo = true};
        double next = canvas_paragraph(
            canvas, axis->from, top + canvas->normal * 1.6, axis->to - axis->from, style, data->sentence);
        row.bottom = next - canvas->normal * 0.8;
    } else {
        draw_box(&row, box_top, box_height);
    }
    if (data->point_count) {
        row.spots = memory_new(data->point_count, sizeof *row.spots);
        draw_all_points(&row, radius, tower * unit, row.bottom + 7.0 * unit);
        memory_free(row.spots);
    }
    return row.bottom;
}
