/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "draw/boxes.h"
#include "draw/box_row.h"
#include <math.h>
#include <string.h>

struct columns {
    double level, arm, contrast; /* widths, 0 where there is none */
    double radius;               /* of points */
    double room;                 /* height for a row's stack */
    struct axis axis;
};

static struct canvas_style level_style(const struct canvas *canvas) {
    return (struct canvas_style){.size = canvas->strong, .bold = true};
}

static struct canvas_style label_style(const struct canvas *canvas) {
    return (struct canvas_style){.size = canvas->small, .colour = PALETTE_QUIET, .anchor = ANCHOR_END};
}

static struct canvas_style key_style(const struct canvas *canvas) {
    return (struct canvas_style){.size = canvas->key, .anchor = ANCHOR_END, .bold = true};
}

static struct canvas_style plain_style(const struct canvas *canvas) {
    return (struct canvas_style){.size = canvas->small, .anchor = ANCHOR_END};
}

static double contrast_width(const struct canvas *canvas, const struct boxes_contrast *contrast) {
    double width = canvas_width(label_style(canvas), contrast->label);
    if (contrast->sentence) {
        return fmax(width, 13.0 * canvas->small);
    }
    width = fmax(width, canvas_width(key_style(canvas), contrast->estimate));
    return fmax(width, canvas_width(plain_style(canvas), contrast->interval));
}

static void find_axis(const struct canvas *canvas, const struct boxes *boxes, struct columns *columns) {
    double low = boxes->axis.null_line, high = low, gap = 18.0; /* a NaN gives way to any number in fmin and fmax */
    for (size_t g = 0; g < boxes->group_count; g++) {
        for (size_t r = 0; r < boxes->groups[g].row_count; r++) {
            box_row_range(&boxes->groups[g].rows[r], &low, &high);
        }
        low = boxes->groups[g].banded ? fmin(low, boxes->groups[g].band_low) : low;
        high = boxes->groups[g].banded ? fmax(high, boxes->groups[g].band_high) : high;
    }
    low = isnan(boxes->axis.low) ? low : boxes->axis.low;
    high = isnan(boxes->axis.high) ? high : boxes->axis.high;
    double from = columns->level + columns->arm + gap * canvas->unit;
    double to = canvas->width - fmax(columns->contrast + 1.5 * gap * canvas->unit, 2.5 * canvas->small);
    axis_init(&columns->axis, boxes->axis.scale, low, high, from, to, canvas_ticks(canvas, to - from));
    columns->axis.with_sign = boxes->axis.with_sign;
}

/* One size for the points of all rows, as long as it can be seen well: a row that needs smaller ones goes its own way.
 * Fewer rows leave more room for each. */
static void find_radius(const struct canvas *canvas, const struct boxes *boxes, struct columns *columns) {
    double rows = 0.0;
    for (size_t g = 0; g < boxes->group_count; g++) {
        rows += (double)boxes->groups[g].row_count;
    }
    double room = canvas->unit * fmin(fmax((475.0 - 66.0 * rows) / fmax(rows, 1.0), 44.0), 100.0);
    double least = 2.2 * canvas->unit;
    columns->room = room;
    columns->radius = box_row_radius(canvas, &columns->axis, NULL, room);
    for (size_t g = 0; g < boxes->group_count; g++) {
        for (size_t r = 0; r < boxes->groups[g].row_count; r++) {
            double radius = box_row_radius(canvas, &columns->axis, &boxes->groups[g].rows[r], room);
            columns->radius = radius >= least ? fmin(columns->radius, radius) : columns->radius;
        }
    }
}

static void find_columns(const struct canvas *canvas, const struct boxes *boxes, struct columns *columns) {
    *columns = (struct columns){0};
    for (size_t g = 0; g < boxes->group_count; g++) {
        const struct boxes_group *group = &boxes->groups[g];
        columns->level = fmax(columns->level, canvas_width(level_style(canvas), group->level));
        for (size_t r = 0; r < group->row_count; r++) {
            if (group->rows[r].arm || group->rows[r].counts) {
                columns->arm = 9.5 * canvas->small;
            }
        }
        for (size_t c = 0; c < group->contrast_count; c++) {
            columns->contrast = fmax(columns->contrast, contrast_width(canvas, &group->contrasts[c]));
        }
    }
    columns->level = fmin(columns->level, canvas->width * 0.15);
    columns->level += columns->level > 0.0 ? canvas->small : 0.0;
    columns->contrast = fmin(columns->contrast, canvas->width * 0.22);
    find_axis(canvas, boxes, columns);
    find_radius(canvas, boxes, columns);
}

/* The words at the left of a row; returns their lowest point. */
static double draw_arm(struct canvas *canvas, const struct columns *columns, const struct boxes_row *row, double top) {
    double x = columns->level + columns->arm / 2.0, y = top + canvas->strong * 1.5;
    struct canvas_style name = {
        .size = canvas->strong, .colour = row->mark->colour, .anchor = ANCHOR_MIDDLE, .bold = true};
    struct canvas_style counts = {.size = canvas->small, .colour = PALETTE_QUIET, .anchor = ANCHOR_MIDDLE};
    if (row->arm) {
        y = canvas_paragraph(canvas, x, y, columns->arm, name, row->arm);
    }
    y = canvas_paragraph(canvas, x, y, canvas_balance(columns->arm, counts, row->counts), counts, row->counts);
    return y - canvas->small * 0.8;
}

static double contrast_height(const struct canvas *canvas, const struct boxes_contrast *contrast, double width) {
    double line = canvas_line_height(canvas->small);
    double label = line * (double)canvas_lines(width, label_style(canvas), contrast->label);
    if (contrast->sentence) {
        return label + line * (double)canvas_lines(width, plain_style(canvas), contrast->sentence);
    }
    return label + canvas->key * 1.1 + line * (double)canvas_lines(width, plain_style(canvas), contrast->interval);
}

static void draw_contrast(
    struct canvas *canvas, const struct boxes_contrast *contrast, double x, double width, double top) {
    double y = canvas_paragraph(canvas, x, top + canvas->small, width, label_style(canvas), contrast->label);
    if (contrast->sentence) {
        canvas_paragraph(canvas, x, y, width, plain_style(canvas), contrast->sentence);
        return;
    }
    y += canvas->key * 1.1 - canvas->small * 1.1;
    canvas_text(canvas, x, y, key_style(canvas), contrast->estimate);
    y += canvas_line_height(canvas->small) * 1.1;
    canvas_paragraph(canvas, x, y, width, plain_style(canvas), contrast->interval);
}

/* Centred on the rows they compare; returns the lowest point. */
static double draw_contrasts(
    struct canvas *canvas, const struct columns *columns, const struct boxes_group *group, double top, double bottom) {
    double height = 0.0, gap = canvas->small * 0.8;
    for (size_t c = 0; c < group->contrast_count; c++) {
        height += contrast_height(canvas, &group->contrasts[c], columns->contrast) + (c ? gap : 0.0);
    }
    double y = fmax(top + canvas->small * 0.5, (top + bottom - height) / 2.0);
    for (size_t c = 0; c < group->contrast_count; c++) {
        draw_contrast(canvas, &group->contrasts[c], canvas->width - 2.0, columns->contrast, y);
        y += contrast_height(canvas, &group->contrasts[c], columns->contrast) + gap;
    }
    return group->contrast_count ? y : top;
}

static double draw_group(struct canvas *canvas, const struct boxes *boxes, const struct columns *columns,
    const struct boxes_group *group, double top) {
    double y = top, gap = 10.0 * canvas->unit;
    double level_width = fmax(columns->level - canvas->small, canvas->small);
    double level_bottom =
        canvas_paragraph(canvas, 0.0, top + canvas->strong * 1.5, level_width, level_style(canvas), group->level);
    for (size_t r = 0; r < group->row_count; r++) {
        const struct boxes_row *row = &group->rows[r];
        double words = draw_arm(canvas, columns, row, y);
        double own = box_row_radius(canvas, &columns->axis, row, columns->room);
        double radius = own > 0.0 ? fmin(own, columns->radius) : columns->radius;
        double drawn = box_row_draw(canvas, &columns->axis, row, boxes->decimals, boxes->axis.with_sign, radius, y);
        y = fmax(words, drawn) + gap;
    }
    y = fmax(y, draw_contrasts(canvas, columns, group, top, y - gap));
    return fmax(y, level_bottom);
}

/* The shaded stretch of a group that ends at `bottom`, as far as the axis goes. */
static void draw_band(struct canvas *canvas, const struct columns *columns, const struct boxes_group *group, double top, double bottom) {
    double left = axis_place(&columns->axis, group->band_low), right = axis_place(&columns->axis, group->band_high);
    if (group->banded && right > left) {
        canvas_rectangle(canvas, left, top, right - left, bottom - top, PALETTE_BAND, NULL, 0.0, NULL);
    }
}

static double draw_groups(struct canvas *canvas, const struct boxes *boxes, const struct columns *columns) {
    double y = 2.0, gap = 6.0 * canvas->unit;
    for (size_t g = 0; g < boxes->group_count; g++) {
        if (g) {
            canvas_line(canvas, 0.0, y, canvas->width, y, PALETTE_HAIRLINE, canvas->unit, NULL);
            y += gap;
        }
        if (boxes->groups[g].banded) { /* it lies under the rows, so their height is asked first */
            struct canvas probe = *canvas;
            probe.html = NULL;
            draw_band(canvas, columns, &boxes->groups[g], y, draw_group(&probe, boxes, columns, &boxes->groups[g], y));
        }
        y = draw_group(canvas, boxes, columns, &boxes->groups[g], y);
    }
    return y;
}

static void draw(struct canvas *canvas, const void *data) {
    const struct boxes *boxes = data;
    struct columns columns;
    find_columns(canvas, boxes, &columns);
    struct canvas probe = *canvas; /* the null line lies under the rows, so their height is asked first */
    probe.html = NULL;
    double bottom = draw_groups(&probe, boxes, &columns);
    double null_line = boxes->axis.null_line;
    if (!isnan(null_line) && !axis_beyond(&columns.axis, null_line)) {
        double x = axis_place(&columns.axis, null_line);
        canvas_line(
            canvas, x, 2.0, x, bottom, PALETTE_INK, 1.25 * canvas->unit, canvas->figure->meeting ? "2 5" : "1.5 3.5");
    }
    draw_groups(canvas, boxes, &columns);
    double y = canvas_axis(canvas, &columns.axis, &boxes->axis, bottom);
    struct canvas_style style = {.size = canvas->normal};
    canvas_paragraph(canvas, 0.0, y + canvas->normal * 2.0, canvas->width, style, boxes->interaction);
}

void boxes_svg(const struct boxes *boxes, const struct figure *figure, struct html *html) {
    canvas_render(figure, html, draw, boxes);
}
