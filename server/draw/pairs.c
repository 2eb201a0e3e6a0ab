/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "draw/pairs.h"
#include "base/memory.h"
#include "draw/canvas.h"
#include "draw/number.h"
#include <math.h>
#include <stdio.h>
#include <stdlib.h>

/* A panel's place: the plot lies between left and right, top and bottom. */
struct frame {
    const struct pairs *pairs;
    const struct pairs_panel *panel;
    double left, right, top, bottom;
    struct axis up;     /* values upwards: both occasions, or the follow-up of a scatter */
    struct axis across; /* values of the baseline, in a scatter */
    bool first;         /* carries the labels of the values */
    struct places places;
};

static bool is_pair(const struct pairs_point *point) {
    return !isnan(point->before) && !isnan(point->after);
}

static size_t pair_count(const struct pairs_panel *panel) {
    size_t count = 0;
    for (size_t i = 0; i < panel->point_count; i++) {
        count += is_pair(&panel->points[i]);
    }
    return count;
}

static bool as_scatter(const struct pairs *pairs) {
    for (size_t p = 0; p < pairs->panel_count; p++) {
        if (pair_count(&pairs->panels[p]) > PAIRS_LINES) {
            return true;
        }
    }
    return false;
}

static void find_range(const struct pairs *pairs, double *low, double *high) {
    *low = INFINITY;
    *high = -INFINITY;
    for (size_t p = 0; p < pairs->panel_count; p++) {
        for (size_t i = 0; i < pairs->panels[p].point_count; i++) {
            const struct pairs_point *point = &pairs->panels[p].points[i];
            *low = fmin(*low, fmin(point->before, point->after));
            *high = fmax(*high, fmax(point->before, point->after));
        }
    }
    *low = isnan(pairs->axis.low) ? *low : pairs->axis.low;
    *high = isnan(pairs->axis.high) ? *high : pairs->axis.high;
}

/* "Q2400, 152.0 then 141.5" for a screen reader. */
static void point_words(const struct frame *frame, const struct pairs_point *point, struct text *out) {
    text_clear(out);
    number_shown(out, point->before, frame->pairs->decimals, false);
    if (isnan(point->after)) {
        text_literal(out, ", no follow-up");
    } else {
        text_literal(out, " then ");
        number_shown(out, point->after, frame->pairs->decimals, false);
    }
}

static char *name_of(const struct frame *frame, const struct pairs_point *point) {
    struct text name;
    text_init(&name);
    text_string(&name, point->participant);
    if (axis_beyond(&frame->up, point->before) || axis_beyond(&frame->up, point->after)) {
        text_literal(&name, " ");
        number_shown(
            &name, axis_beyond(&frame->up, point->after) ? point->after : point->before, frame->pairs->decimals, false);
    }
    return name.data;
}

static bool is_named(const struct frame *frame, const struct pairs_point *point) {
    bool beyond = axis_beyond(&frame->up, point->before) || axis_beyond(&frame->up, point->after);
    return is_pair(point) && point->participant && (point->outlier || beyond);
}

/* ---- heading and values ---- */

static double draw_heading(struct canvas *canvas, const struct frame *frame, double top) {
    const struct pairs_panel *panel = frame->panel;
    const char *colour = panel->mark->colour;
    struct canvas_style name = {.size = canvas->strong, .colour = colour, .bold = true};
    struct canvas_style counts = {.size = canvas->small, .colour = PALETTE_QUIET};
    double width = frame->right - frame->left, y = top + canvas->strong;
    if (panel->arm) {
        y = canvas_paragraph(canvas, frame->left, y, width, name, panel->arm);
    }
    y = canvas_paragraph(canvas, frame->left, y, width, counts, panel->counts);
    if (as_scatter(frame->pairs) && !isnan(panel->median_before)) {
        struct text words;
        text_init(&words);
        text_literal(&words, "medians of the pairs ");
        number_shown(&words, panel->median_before, frame->pairs->decimals, false);
        text_literal(&words, " and ");
        number_shown(&words, panel->median_after, frame->pairs->decimals, false);
        counts.colour = colour;
        counts.bold = true;
        y = canvas_paragraph(canvas, frame->left, y, width, counts, words.data);
        text_release(&words);
    }
    return y;
}

static void draw_values(struct canvas *canvas, const struct frame *frame) {
    struct canvas_style style = {.size = canvas->small, .anchor = ANCHOR_END};
    struct text label;
    text_init(&label);
    for (size_t t = 0; t < frame->up.tick_count; t++) {
        double y = axis_place(&frame->up, frame->up.ticks[t]);
        canvas_line(canvas, frame->left, y, frame->right, y, PALETTE_HAIRLINE, 0.75 * canvas->unit, NULL);
        if (frame->first) {
            text_clear(&label);
            axis_label(&frame->up, frame->up.ticks[t], &label);
            canvas_text(canvas, frame->left - 7.0 * canvas->unit, y + canvas->small * 0.36, style, label.data);
        }
    }
    text_release(&label);
}

static double values_width(const struct canvas *canvas, const struct axis *axis) {
    double widest = 0.0;
    struct text label;
    text_init(&label);
    for (size_t t = 0; t < axis->tick_count; t++) {
        text_clear(&label);
        axis_label(axis, axis->ticks[t], &label);
        widest = fmax(widest, number_width(label.data, canvas->small, false));
    }
    text_release(&label);
    return widest + 10.0 * canvas->unit;
}

/* ---- names ---- */

/* Looks for room beside (x, y) or further down or up, within the plot's height. */
static bool try_name(
    struct canvas *canvas, struct frame *frame, double x, double y, const char *name, int side, int step) {
    double size = canvas->small, width = number_width(name, size, true), gap = 8.0 * canvas->unit;
    double middle = y + size * 0.5 * ((step + 1) / 2) * (step % 2 ? 1.0 : -1.0);
    double left = side > 0 ? x + gap : x - gap - width, top = middle - size * 0.62, bottom = middle + size * 0.62;
    if (top < frame->top - size || bottom > frame->bottom + size * 0.3 || left < frame->left ||
        left + width > frame->right + size || !places_free(&frame->places, left, top, left + width, bottom)) {
        return false;
    }
    places_take(&frame->places, left, top, left + width, bottom);
    if (step > 1) {
        double to = side > 0 ? left - 1.0 : left + width + 1.0;
        canvas_line(canvas, x, y, to, middle, PALETTE_QUIET, 0.75 * canvas->unit, NULL);
    }
    struct canvas_style style = {.size = size, .bold = true, .halo = true};
    canvas_text(canvas, left, middle + size * 0.36, style, name);
    return true;
}

/* In a scatter the nearest place on either side; beside lines the right as long as there is room. */
static void draw_name(struct canvas *canvas, struct frame *frame, bool scatter, double x, double y, const char *name) {
    enum { STEPS = 160 };
    for (int turn = 0; turn < 2 * STEPS; turn++) {
        int step = scatter ? turn / 2 : turn % STEPS, side = (scatter ? turn % 2 : turn / STEPS) ? -1 : 1;
        if (try_name(canvas, frame, x, y, name, side, step)) {
            return;
        }
    }
}

static void draw_names(struct canvas *canvas, struct frame *frame, bool scatter, double after) {
    for (size_t i = 0; i < frame->panel->point_count; i++) {
        const struct pairs_point *point = &frame->panel->points[i];
        if (is_named(frame, point)) {
            char *name = name_of(frame, point);
            double x = scatter ? axis_place(&frame->across, point->before) : after;
            draw_name(canvas, frame, scatter, x, axis_place(&frame->up, point->after), name);
            memory_free(name);
        }
    }
}

/* An end beyond the axis: a triangle pointing out of it. */
static void draw_beyond(struct canvas *canvas, double x, double y, int beyond, const char *colour) {
    char path[120];
    double size = 7.0 * canvas->unit;
    snprintf(
        path, sizeof path, "M%.2f %.2fl%.2f %.2fh%.2fz", x, y - beyond * size, size * 0.6, beyond * size, -size * 1.2);
    canvas_path(canvas, path, colour, NULL, 0.0);
}

/* ---- lines ---- */

static void draw_pair(struct canvas *canvas, const struct frame *frame, const struct pairs_point *point, double before,
    double after, struct text *words) {
    double y1 = axis_place(&frame->up, point->before), y2 = axis_place(&frame->up, point->after);
    const struct palette_mark *mark = frame->panel->mark;
    if (canvas->html) {
        struct html *html = canvas->html;
        html_open(html, "line");
        html_number_attribute(html, "x1", before);
        html_number_attribute(html, "y1", y1);
        html_number_attribute(html, "x2", after);
        html_number_attribute(html, "y2", y2);
        html_attribute(html, "stroke", mark->colour);
        html_number_attribute(html, "stroke-width", (point->outlier ? 1.5 : 1.0) * canvas->unit);
        html_attribute(html, "stroke-opacity", point->outlier ? "1" : "0.4");
        html_attribute(html, "stroke-dasharray", mark->dash);
        html_attribute(html, "class", "point");
    }
    if (point->participant) {
        point_words(frame, point, words);
        canvas_opens(canvas, point->participant, words->data);
    }
    if (canvas->html) {
        html_close(canvas->html);
    }
    double radius = 2.2 * canvas->unit;
    canvas_mark(canvas, mark->shape, before, y1, radius, mark->tint, mark->colour, NULL, NULL);
    canvas_mark(canvas, mark->shape, after, y2, radius, mark->tint, mark->colour, NULL, NULL);
    int low = axis_beyond(&frame->up, point->before), high = axis_beyond(&frame->up, point->after);
    if (low) {
        draw_beyond(canvas, before, y1, low, mark->colour);
    }
    if (high) {
        draw_beyond(canvas, after, y2, high, mark->colour);
    }
}

static int by_before(const void *a, const void *b) {
    const struct pairs_point *one = *(const struct pairs_point *const *)a, *two = *(const struct pairs_point *const *)b;
    return (one->before > two->before) - (one->before < two->before);
}

/* Those without a follow-up, in order of baseline; the caller frees the list. */
static const struct pairs_point **without_follow_up(const struct pairs_panel *panel, size_t *count) {
    const struct pairs_point **list = memory_new(panel->point_count + 1, sizeof *list);
    *count = 0;
    for (size_t i = 0; i < panel->point_count; i++) {
        if (!isnan(panel->points[i].before) && isnan(panel->points[i].after)) {
            list[(*count)++] = &panel->points[i];
        }
    }
    qsort(list, *count, sizeof *list, by_before);
    return list;
}

static void draw_tick(struct canvas *canvas, const struct frame *frame, const struct pairs_point *point, double x1,
    double y1, double x2, double y2, struct text *words) {
    if (canvas->html) {
        struct html *html = canvas->html;
        html_open(html, "line");
        html_number_attribute(html, "x1", x1);
        html_number_attribute(html, "y1", y1);
        html_number_attribute(html, "x2", x2);
        html_number_attribute(html, "y2", y2);
        html_attribute(html, "stroke", frame->panel->mark->colour);
        html_number_attribute(html, "stroke-width", 1.75 * canvas->unit);
        html_attribute(html, "class", "point");
    }
    if (point->participant) {
        point_words(frame, point, words);
        canvas_opens(canvas, point->participant, words->data);
    }
    if (canvas->html) {
        html_close(canvas->html);
    }
}

/* Ticks from an end outwards, in as many lanes as keep them apart. `along` is the axis of the baseline; lanes go down
 * from (x, y) in a scatter and to the left otherwise. Returns the lanes used. */
static size_t draw_ticks(struct canvas *canvas, const struct frame *frame, bool scatter, double x, double y) {
    enum { LANES = 4 };
    double ends[LANES], unit = canvas->unit, lane_width = 11.0 * unit;
    size_t count, lanes = 0;
    const struct pairs_point **list = without_follow_up(frame->panel, &count);
    struct text words;
    text_init(&words);
    for (size_t i = 0; i < count; i++) {
        double at = axis_place(scatter ? &frame->across : &frame->up, list[i]->before);
        size_t lane = 0;
        while (lane < lanes && fabs(ends[lane] - at) < 3.0 * unit) {
            lane++;
        }
        lane = lane == LANES ? i % LANES : lane;
        lanes = lane >= lanes ? lane + 1 : lanes;
        ends[lane] = at;
        double start = 6.0 * unit + lane_width * (double)lane, stop = start + 8.0 * unit;
        if (scatter) {
            draw_tick(canvas, frame, list[i], at, y - start, at, y - stop, &words);
        } else {
            draw_tick(canvas, frame, list[i], x - start, at, x - stop, at, &words);
        }
    }
    text_release(&words);
    memory_free(list);
    return lanes;
}

static void draw_median(struct canvas *canvas, struct frame *frame, double before, double after, double left_gap) {
    const struct pairs_panel *panel = frame->panel;
    if (isnan(panel->median_before) || isnan(panel->median_after)) {
        return;
    }
    double y[] = {axis_place(&frame->up, panel->median_before), axis_place(&frame->up, panel->median_after)};
    double x[] = {before, after}, values[] = {panel->median_before, panel->median_after}, size = canvas->strong;
    canvas_line(canvas, before, y[0], after, y[1], PALETTE_PAPER, 7.0 * canvas->unit, NULL);
    canvas_line(canvas, before, y[0], after, y[1], panel->mark->colour, 3.5 * canvas->unit, NULL);
    struct text label;
    text_init(&label);
    for (int end = 0; end < 2; end++) {
        canvas_mark(canvas, panel->mark->shape, x[end], y[end], 5.5 * canvas->unit, panel->mark->colour, PALETTE_PAPER,
            NULL, NULL);
        text_clear(&label);
        number_shown(&label, values[end], frame->pairs->decimals, false);
        struct canvas_style style = {.size = size,
            .colour = panel->mark->colour,
            .anchor = end ? ANCHOR_START : ANCHOR_END,
            .bold = true,
            .halo = true};
        double at = end ? after + 10.0 * canvas->unit : before - left_gap, width = canvas_width(style, label.data);
        canvas_text(canvas, at, y[end] + size * 0.36, style, label.data);
        places_take(
            &frame->places, end ? at : at - width, y[end] - size * 0.62, end ? at + width : at, y[end] + size * 0.62);
    }
    text_release(&label);
}

/* Room for the medians written outside the two ends, half the panel at most. */
static void find_ends(struct canvas *canvas, const struct frame *frame, double *before, double *after) {
    const struct pairs_panel *panel = frame->panel;
    struct canvas probe = *canvas;
    probe.html = NULL;
    double lanes = (double)draw_ticks(&probe, frame, false, 0.0, 0.0), width = frame->right - frame->left;
    double values[] = {panel->median_before, panel->median_after}, room[2];
    struct text label;
    text_init(&label);
    for (int end = 0; end < 2; end++) {
        text_clear(&label);
        number_shown(&label, values[end], frame->pairs->decimals, false);
        room[end] = number_width(label.data, canvas->strong, true) + 12.0 * canvas->unit;
    }
    text_release(&label);
    *before = frame->left + fmin(fmax(room[0] + 11.0 * lanes * canvas->unit, 0.3 * width), 0.5 * width);
    *after = frame->right - fmin(fmax(room[1], 0.27 * width), 0.4 * width);
}

static double draw_lines(struct canvas *canvas, struct frame *frame) {
    double width = frame->right - frame->left, before, after;
    find_ends(canvas, frame, &before, &after);
    struct text words;
    text_init(&words);
    canvas_line(canvas, before, frame->top, before, frame->bottom, PALETTE_HAIRLINE, canvas->unit, NULL);
    canvas_line(canvas, after, frame->top, after, frame->bottom, PALETTE_HAIRLINE, canvas->unit, NULL);
    for (size_t i = 0; i < frame->panel->point_count; i++) {
        if (is_pair(&frame->panel->points[i])) {
            draw_pair(canvas, frame, &frame->panel->points[i], before, after, &words);
        }
    }
    text_release(&words);
    size_t lanes = draw_ticks(canvas, frame, false, before, 0.0);
    draw_median(canvas, frame, before, after, (10.0 + 11.0 * (double)lanes) * canvas->unit);
    draw_names(canvas, frame, false, after);
    struct canvas_style style = {.size = canvas->small, .anchor = ANCHOR_MIDDLE};
    double y = frame->bottom + canvas->small * 1.6, room = fmin(0.42 * width, (after - before) * 0.95);
    double end = canvas_paragraph(canvas, before, y, room, style, frame->pairs->before);
    return fmax(end, canvas_paragraph(canvas, after, y, room, style, frame->pairs->after));
}

/* ---- scatter ---- */

static void draw_no_change(struct canvas *canvas, struct frame *frame) {
    struct canvas_style style = {.size = canvas->small, .colour = PALETTE_QUIET, .anchor = ANCHOR_END, .halo = true};
    canvas_line(canvas, frame->left, frame->bottom, frame->right, frame->top, PALETTE_INK, 1.25 * canvas->unit,
        canvas->figure->meeting ? "2 5" : "1.5 3.5");
    double width = canvas_width(style, "no change"), size = canvas->small, y = frame->top + size * 0.3;
    double x = frame->right - size * 1.6;
    canvas_text(canvas, x, y, style, "no change");
    places_take(&frame->places, x - width, y - size, x, y + size * 0.3);
}

static double draw_scatter(struct canvas *canvas, struct frame *frame) {
    const struct palette_mark *mark = frame->panel->mark;
    struct text words;
    text_init(&words);
    draw_no_change(canvas, frame);
    for (size_t i = 0; i < frame->panel->point_count; i++) {
        const struct pairs_point *point = &frame->panel->points[i];
        if (!is_pair(point)) {
            continue;
        }
        double x = axis_place(&frame->across, point->before), y = axis_place(&frame->up, point->after);
        int beyond = axis_beyond(&frame->up, point->after);
        double reach = 3.6 * canvas->unit;
        places_take(&frame->places, x - reach, y - reach, x + reach, y + reach);
        point_words(frame, point, &words);
        canvas_mark(canvas, mark->shape, x, y, 2.8 * canvas->unit, point->outlier ? mark->colour : mark->tint,
            mark->colour, point->participant, words.data);
        if (beyond) {
            draw_beyond(canvas, x, y - beyond * 4.0 * canvas->unit, beyond, mark->colour);
        }
    }
    text_release(&words);
    draw_ticks(canvas, frame, true, 0.0, frame->bottom);
    if (!isnan(frame->panel->median_before) && !isnan(frame->panel->median_after)) {
        double x = axis_place(&frame->across, frame->panel->median_before);
        double y = axis_place(&frame->up, frame->panel->median_after), reach = 8.0 * canvas->unit;
        canvas_mark(canvas, mark->shape, x, y, reach, mark->colour, PALETTE_PAPER, NULL, NULL);
        places_take(&frame->places, x - reach, y - reach, x + reach, y + reach);
    }
    draw_names(canvas, frame, true, 0.0);
    struct axis_plan plan = {.title = frame->pairs->before};
    return canvas_axis(canvas, &frame->across, &plan, frame->bottom) + canvas_line_height(canvas->small);
}

/* ---- the whole ---- */

static void make_axes(const struct canvas *canvas, struct frame *frame, bool scatter, double low, double high) {
    const struct pairs *pairs = frame->pairs;
    size_t ticks = canvas_ticks(canvas, frame->right - frame->left);
    axis_init(&frame->up, pairs->axis.scale, low, high, frame->bottom, frame->top, scatter ? ticks : 6);
    axis_init(&frame->across, pairs->axis.scale, low, high, frame->left, frame->right, ticks);
    frame->up.with_sign = frame->across.with_sign = pairs->axis.with_sign;
}

static double draw_top(struct canvas *canvas, const struct pairs *pairs, bool scatter) {
    struct canvas_style bold = {.size = canvas->small, .bold = true},
                        quiet = {.size = canvas->small, .colour = PALETTE_QUIET};
    struct text title;
    text_init(&title);
    text_string(&title, pairs->axis.title);
    if (scatter && pairs->after) {
        text_format(&title, "; upwards: %s", pairs->after);
    }
    double y = canvas_paragraph(canvas, 0.0, canvas->small * 1.1, canvas->width, bold, title.data);
    text_release(&title);
    if (pairs->axis.upper) {
        draw_beyond(canvas, canvas->small * 0.45, y - canvas->small * 0.1, 1, PALETTE_QUIET);
        y = canvas_paragraph(
            canvas, canvas->small * 1.3, y, canvas->width - canvas->small * 1.3, quiet, pairs->axis.upper);
    }
    return y;
}

struct layout {
    bool scatter;
    double low, high;         /* of the values */
    double margin, each, gap; /* room for labels at the left; width of a panel; between panels */
    double height;            /* of a plot */
    size_t per_row;
};

static void find_layout(const struct canvas *canvas, const struct pairs *pairs, struct layout *layout) {
    double unit = canvas->unit, least = 215.0 * unit;
    *layout = (struct layout){.scatter = as_scatter(pairs), .gap = 30.0 * unit};
    find_range(pairs, &layout->low, &layout->high);
    struct axis axis;
    axis_init(&axis, pairs->axis.scale, layout->low, layout->high, 0.0, 1.0, 6);
    layout->margin = values_width(canvas, &axis) + canvas->small;
    double room = canvas->width - layout->margin - canvas->small, panels = fmax((double)pairs->panel_count, 1.0);
    double most = fmin(fmax(floor((room + layout->gap) / (least + layout->gap)), 1.0), panels);
    double rows = ceil(panels / most), in_row = ceil(panels / rows); /* as evenly as they go */
    layout->per_row = (size_t)in_row;
    layout->each = (room - layout->gap * (in_row - 1.0)) / in_row;
    layout->height = layout->scatter ? fmin(layout->each, 400.0 * unit) : 320.0 * unit;
}

static struct frame frame_of(const struct pairs *pairs, const struct layout *layout, size_t panel) {
    size_t column = panel % layout->per_row;
    double left = layout->margin + (layout->each + layout->gap) * (double)column;
    return (struct frame){
        pairs, &pairs->panels[panel], .left = left, .right = left + layout->each, .first = column == 0};
}

/* Panels [from, to) beside each other; returns the lowest baseline. */
static double draw_row(
    struct canvas *canvas, const struct pairs *pairs, const struct layout *layout, size_t from, size_t to, double top) {
    double plot = top, last = top;
    for (size_t p = from; p < to; p++) { /* headings first, so that all plots begin at one height */
        struct frame frame = frame_of(pairs, layout, p);
        plot = fmax(plot, draw_heading(canvas, &frame, top) + 6.0 * canvas->unit);
    }
    for (size_t p = from; p < to; p++) {
        struct frame frame = frame_of(pairs, layout, p);
        frame.right = layout->scatter ? frame.left + layout->height : frame.right;
        frame.top = plot;
        frame.bottom = plot + layout->height;
        make_axes(canvas, &frame, layout->scatter, layout->low, layout->high);
        places_init(&frame.places);
        draw_values(canvas, &frame);
        last = fmax(last, layout->scatter ? draw_scatter(canvas, &frame) : draw_lines(canvas, &frame));
        places_release(&frame.places);
    }
    return last;
}

static void draw(struct canvas *canvas, const void *data) {
    const struct pairs *pairs = data;
    struct layout layout;
    find_layout(canvas, pairs, &layout);
    double last = draw_top(canvas, pairs, layout.scatter);
    for (size_t p = 0; p < pairs->panel_count; p += layout.per_row) {
        size_t end = p + layout.per_row < pairs->panel_count ? p + layout.per_row : pairs->panel_count;
        last = draw_row(canvas, pairs, &layout, p, end, last);
    }
    if (pairs->axis.lower) {
        struct canvas_style quiet = {.size = canvas->small, .colour = PALETTE_QUIET};
        double y = last + canvas->small * 0.4, indent = canvas->small * 1.3;
        draw_beyond(canvas, canvas->small * 0.45, y - canvas->small * 0.6, -1, PALETTE_QUIET);
        canvas_paragraph(canvas, indent, y, canvas->width - indent, quiet, pairs->axis.lower);
    }
}

void pairs_svg(const struct pairs *pairs, const struct figure *figure, struct html *html) {
    canvas_render(figure, html, draw, pairs);
}
