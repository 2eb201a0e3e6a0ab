/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "draw/histogram.h"
#include "base/memory.h"
#include "draw/box_row.h"
#include "draw/number.h"
#include <math.h>
#include <stdio.h>

/* A panel's place on the canvas. */
struct frame {
    const struct histogram *histogram;
    const struct histogram_panel *panel;
    struct axis axis;
    double left, right; /* of the panel, with the counts' labels */
    double bars;        /* height of the histogram */
};

static bool within_axis(const struct axis *axis, double value) {
    return isfinite(value) && !axis_beyond(axis, value);
}

static void find_frame(
    const struct canvas *canvas, const struct histogram *histogram, size_t which, struct frame *frame) {
    const struct histogram_panel *panel = &histogram->panels[which];
    double gap = 28.0 * canvas->unit, count = (double)histogram->panel_count;
    double width = (canvas->width - gap * (count - 1.0)) / count;
    *frame = (struct frame){histogram, panel, .left = (width + gap) * (double)which, .bars = 150.0 * canvas->unit};
    frame->right = frame->left + width;
    double low = INFINITY, high = -INFINITY;
    box_row_range(&panel->row, &low, &high);
    for (size_t b = 0; b < panel->bin_count; b++) {
        low = fmin(low, panel->bins[b].from);
        high = fmax(high, panel->bins[b].to);
    }
    low = isnan(panel->axis.low) ? low : panel->axis.low;
    high = isnan(panel->axis.high) ? high : panel->axis.high;
    double from = frame->left + canvas->small * 3.2, to = frame->right - canvas->small * 2.2;
    axis_init(&frame->axis, panel->axis.scale, low, high, from, to, canvas_ticks(canvas, to - from));
    frame->axis.with_sign = panel->axis.with_sign;
}

/* A bracket for each range that meets the axis, its label above it; an open or far end runs off with an arrow. */
static double draw_range(
    struct canvas *canvas, const struct frame *frame, const struct histogram_range *range, double top) {
    const struct axis *axis = &frame->axis;
    if (range->low > axis->high || range->high < axis->low) {
        return top;
    }
    struct canvas_style style = {.size = canvas->small, .anchor = ANCHOR_MIDDLE, .colour = PALETTE_QUIET};
    double left = axis_place(axis, fmax(range->low, axis->low)),
           right = axis_place(axis, fmin(range->high, axis->high));
    double room = axis->to - axis->from, half = fmin(canvas_width(style, range->label), room) / 2.0;
    double x = fmin(fmax((left + right) / 2.0, axis->from + half), axis->to - half);
    double y = canvas_paragraph(canvas, x, top + canvas->small, room, style, range->label);
    y -= canvas->small * 0.75;
    double foot = 5.0 * canvas->unit, ends[] = {left, right}, values[] = {range->low, range->high};
    canvas_line(canvas, left, y, right, y, PALETTE_INK, 1.25 * canvas->unit, NULL);
    for (int end = 0; end < 2; end++) {
        if (within_axis(axis, values[end])) {
            canvas_line(canvas, ends[end], y, ends[end], y + foot, PALETTE_INK, 1.25 * canvas->unit, NULL);
        } else {
            canvas_arrow(canvas, ends[end], y, 7.0 * canvas->unit, end ? 1 : -1, PALETTE_INK);
        }
    }
    return y + foot + 4.0 * canvas->unit;
}

static double top_of_bars(struct canvas *canvas, const struct frame *frame, double top) {
    struct canvas_style style = {.size = canvas->small, .colour = PALETTE_QUIET};
    double width = frame->right - frame->left, y = top;
    if (frame->panel->counts) {
        y = canvas_paragraph(canvas, frame->left, top + canvas->small, width, style, frame->panel->counts);
        y -= canvas->small * 0.5;
    }
    for (size_t r = 0; r < frame->histogram->range_count; r++) {
        y = draw_range(canvas, frame, &frame->histogram->ranges[r], y);
    }
    return y;
}

static void draw_counts(struct canvas *canvas, const struct frame *frame, const struct axis *counts) {
    struct canvas_style style = {.size = canvas->small, .colour = PALETTE_QUIET, .anchor = ANCHOR_END};
    struct text label;
    text_init(&label);
    for (size_t t = 0; t < counts->tick_count; t++) {
        if (counts->ticks[t] != trunc(counts->ticks[t])) {
            continue;
        }
        double y = axis_place(counts, counts->ticks[t]);
        canvas_line(canvas, frame->axis.from, y, frame->axis.to, y, PALETTE_HAIRLINE, 0.75 * canvas->unit, NULL);
        text_clear(&label);
        number_shown(&label, counts->ticks[t], 0, false);
        canvas_text(canvas, frame->axis.from - 5.0 * canvas->unit, y + canvas->small * 0.36, style, label.data);
    }
    text_release(&label);
}

static void draw_bins(struct canvas *canvas, const struct frame *frame, double top) {
    const struct histogram_panel *panel = frame->panel;
    size_t most = 1;
    for (size_t b = 0; b < panel->bin_count; b++) {
        most = panel->bins[b].count > most ? panel->bins[b].count : most;
    }
    struct axis counts;
    axis_init(&counts, AXIS_LINEAR, 0.0, (double)most, top + frame->bars, top, 3);
    draw_counts(canvas, frame, &counts);
    for (size_t b = 0; b < panel->bin_count; b++) {
        const struct histogram_bin *bin = &panel->bins[b];
        double left = axis_place(&frame->axis, bin->from), right = axis_place(&frame->axis, bin->to);
        double y = axis_place(&counts, (double)bin->count);
        if (bin->count && right > left) {
            canvas_rectangle(canvas, left, y, right - left, top + frame->bars - y, panel->row.mark->tint,
                panel->row.mark->colour, 0.75 * canvas->unit, NULL);
        }
    }
    canvas_line(canvas, frame->axis.from, top + frame->bars, frame->axis.to, top + frame->bars, PALETTE_INK,
        canvas->unit, NULL);
}

static double draw_row(struct canvas *canvas, const struct frame *frame, double top) {
    const struct boxes_row *row = &frame->panel->row;
    double room = 66.0 * canvas->unit, radius = box_row_radius(canvas, &frame->axis, row, room);
    return box_row_draw(
        canvas, &frame->axis, row, frame->histogram->decimals, frame->panel->axis.with_sign, radius, top);
}

static void draw(struct canvas *canvas, const void *data) {
    const struct histogram *histogram = data;
    BUG_IF(histogram->panel_count < 1 || histogram->panel_count > 2);
    struct frame frames[2];
    struct canvas probe = *canvas; /* panels share their levels: the lowest start of bars and end of points */
    probe.html = NULL;
    double bars = 0.0, bottom = 0.0, gap = 8.0 * canvas->unit;
    for (size_t p = 0; p < histogram->panel_count; p++) {
        find_frame(canvas, histogram, p, &frames[p]);
        bars = fmax(bars, top_of_bars(&probe, &frames[p], 2.0) + gap);
    }
    for (size_t p = 0; p < histogram->panel_count; p++) {
        bottom = fmax(bottom, draw_row(&probe, &frames[p], bars + frames[p].bars + gap) + gap);
    }
    for (size_t p = 0; p < histogram->panel_count; p++) {
        top_of_bars(canvas, &frames[p], 2.0);
        draw_bins(canvas, &frames[p], bars);
        draw_row(canvas, &frames[p], bars + frames[p].bars + gap);
        canvas_axis(canvas, &frames[p].axis, &frames[p].panel->axis, bottom);
    }
}

void histogram_svg(const struct histogram *histogram, const struct figure *figure, struct html *html) {
    canvas_render(figure, html, draw, histogram);
}
