/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "draw/canvas.h"
#include "base/memory.h"
#include "draw/number.h"
#include <math.h>
#include <stdio.h>
#include <string.h>
#include <unistr.h>

#define FONT "system-ui, -apple-system, \"Segoe UI\", Roboto, \"Noto Sans\", \"DejaVu Sans\", sans-serif"

static const double page_sizes[] = {13.0, 14.0, 16.0, 20.0}, meeting_sizes[] = {25.0, 26.0, 28.0, 36.0};

static void prepare(struct canvas *canvas, const struct figure *figure, struct html *html) {
    const double *sizes = figure->meeting ? meeting_sizes : page_sizes;
    double usual = figure->meeting ? FIGURE_MEETING_WIDTH : FIGURE_WIDTH;
    *canvas = (struct canvas){
        .figure = figure,
        .html = html,
        .width = figure->width > 0.0 ? figure->width : usual,
        .small = sizes[0],
        .normal = sizes[1],
        .strong = sizes[2],
        .key = sizes[3],
        .unit = figure->meeting ? 1.5 : 1.0,
    };
}

static void touch(struct canvas *canvas, double y) {
    canvas->lowest = fmax(canvas->lowest, y);
}

static void draw_identity(struct canvas *canvas) {
    if (canvas->figure->identity) {
        struct canvas_style style = {.size = canvas->small, .colour = PALETTE_QUIET};
        double y = canvas->lowest + canvas_line_height(canvas->small) + 10.0 * canvas->unit;
        canvas_paragraph(canvas, 0.0, y, canvas->width, style, canvas->figure->identity);
    }
}

static void id_attribute(struct html *html, const char *name, const struct figure *figure, const char *suffix) {
    struct text id;
    text_init(&id);
    text_format(&id, "%s-%s", figure->id, suffix);
    html_attribute(html, name, id.data);
    text_release(&id);
}

static void begin_svg(const struct canvas *canvas, double height, bool interactive) {
    const struct figure *figure = canvas->figure;
    struct html *html = canvas->html;
    struct text value;
    text_init(&value);
    html_open(html, "svg");
    html_attribute(html, "xmlns", "http://www.w3.org/2000/svg");
    text_format(&value, "0 0 %.0f %.0f", canvas->width, height);
    html_attribute(html, "viewBox", value.data);
    html_attribute(html, "class", figure->meeting ? "figure meeting" : "figure");
    /* What is within an image is hidden from screen readers, so a figure whose marks can be opened is a group. */
    html_attribute(html, "role", interactive ? "group" : "img");
    text_clear(&value);
    text_format(&value, figure->description ? "%s-title %s-description" : "%s-title", figure->id, figure->id);
    html_attribute(html, "aria-labelledby", value.data);
    html_attribute(html, "font-family", FONT);
    html_attribute(html, "font-variant", "tabular-nums");
    html_attribute(html, "fill", PALETTE_INK);
    html_open(html, "title");
    id_attribute(html, "id", figure, "title");
    html_text(html, figure->title);
    html_close(html);
    if (figure->description) {
        html_open(html, "desc");
        id_attribute(html, "id", figure, "description");
        html_text(html, figure->description);
        html_close(html);
    }
    text_release(&value);
}

void canvas_render(const struct figure *figure, struct html *html, canvas_drawing *drawing, const void *data) {
    BUG_IF(!figure->id || !figure->title);
    struct canvas canvas;
    prepare(&canvas, figure, NULL);
    drawing(&canvas, data);
    draw_identity(&canvas);
    double height = ceil(canvas.lowest + 4.0);
    bool interactive = canvas.participants > 0;
    prepare(&canvas, figure, html);
    begin_svg(&canvas, height, interactive);
    canvas_rectangle(&canvas, 0.0, 0.0, canvas.width, height, PALETTE_PAPER, NULL, 0.0, NULL);
    canvas.lowest = 0.0;
    drawing(&canvas, data);
    draw_identity(&canvas);
    html_close(html);
}

/* ---- text ---- */

double canvas_line_height(double size) {
    return size * 1.25;
}

void canvas_text(struct canvas *canvas, double x, double y, struct canvas_style style, const char *string) {
    static const char *const anchors[] = {NULL, "middle", "end"};
    if (!string || !*string) {
        return;
    }
    touch(canvas, y + style.size * 0.3);
    if (!canvas->html) {
        return;
    }
    html_open(canvas->html, "text");
    html_number_attribute(canvas->html, "x", x);
    html_number_attribute(canvas->html, "y", y);
    html_number_attribute(canvas->html, "font-size", style.size);
    html_attribute(canvas->html, "font-weight", style.bold ? "600" : NULL);
    html_attribute(canvas->html, "fill", style.colour);
    html_attribute(canvas->html, "text-anchor", anchors[style.anchor]);
    if (style.halo) {
        html_attribute(canvas->html, "stroke", PALETTE_PAPER);
        html_number_attribute(canvas->html, "stroke-width", 4.0 * canvas->unit);
        html_attribute(canvas->html, "stroke-linejoin", "round");
        html_attribute(canvas->html, "paint-order", "stroke");
    }
    html_text(canvas->html, string);
    html_close(canvas->html);
}

/* The bytes of the longest start of `string` that fits and ends at a blank or at the end; a word that fits nowhere is
 * cut. */
static size_t line_bytes(const char *string, double width, double size, bool bold) {
    struct text line;
    text_init(&line);
    size_t best = 0, at = 0;
    while (string[at]) {
        size_t end = at + strspn(string + at, " ");
        end += strcspn(string + end, " ");
        text_append(&line, string + at, end - at);
        if (number_width(line.data, size, bold) > width + 0.01) {
            break;
        }
        best = at = end;
    }
    text_clear(&line);
    while (best == 0 && string[at]) {
        int step = u8_strmblen((const uint8_t *)string + at);
        size_t bytes = step > 0 ? (size_t)step : 1;
        text_append(&line, string + at, bytes);
        if (at > 0 && number_width(line.data, size, bold) > width) {
            best = at;
        }
        at += bytes;
    }
    text_release(&line);
    return best ? best : at;
}

double canvas_paragraph(
    struct canvas *canvas, double x, double y, double width, struct canvas_style style, const char *string) {
    struct text line;
    text_init(&line);
    while (string && *(string += strspn(string, " "))) {
        size_t bytes = line_bytes(string, width, style.size, style.bold);
        text_clear(&line);
        text_append(&line, string, bytes);
        canvas_text(canvas, x, y, style, line.data);
        string += bytes;
        y += canvas_line_height(style.size);
    }
    text_release(&line);
    return y;
}

size_t canvas_lines(double width, struct canvas_style style, const char *string) {
    size_t lines = 0;
    while (string && *(string += strspn(string, " "))) {
        string += line_bytes(string, width, style.size, style.bold);
        lines++;
    }
    return lines;
}

double canvas_width(struct canvas_style style, const char *string) {
    return number_width(string, style.size, style.bold);
}

double canvas_widest_word(struct canvas_style style, const char *string) {
    double widest = 0.0;
    struct text word;
    text_init(&word);
    while (string && *(string += strspn(string, " "))) {
        size_t bytes = strcspn(string, " ");
        text_clear(&word);
        text_append(&word, string, bytes);
        widest = fmax(widest, canvas_width(style, word.data));
        string += bytes;
    }
    text_release(&word);
    return widest;
}

double canvas_balance(double width, struct canvas_style style, const char *string) {
    size_t lines = canvas_lines(width, style, string);
    double narrow = width;
    while (narrow > style.size && canvas_lines(narrow - style.size * 0.25, style, string) == lines &&
           canvas_widest_word(style, string) <= narrow - style.size * 0.25) {
        narrow -= style.size * 0.25;
    }
    return narrow;
}

/* ---- lines and areas ---- */

static void stroke_attributes(struct html *html, const char *colour, double width, const char *dash) {
    html_attribute(html, "stroke", colour);
    if (colour) {
        html_number_attribute(html, "stroke-width", width);
        html_attribute(html, "stroke-dasharray", dash);
    }
}

void canvas_line(struct canvas *canvas, double x1, double y1, double x2, double y2, const char *colour, double width,
    const char *dash) {
    touch(canvas, fmax(y1, y2));
    if (!canvas->html) {
        return;
    }
    html_open(canvas->html, "line");
    html_number_attribute(canvas->html, "x1", x1);
    html_number_attribute(canvas->html, "y1", y1);
    html_number_attribute(canvas->html, "x2", x2);
    html_number_attribute(canvas->html, "y2", y2);
    stroke_attributes(canvas->html, colour, width, dash);
    html_close(canvas->html);
}

void canvas_rectangle(struct canvas *canvas, double x, double y, double width, double height, const char *fill,
    const char *stroke, double stroke_width, const char *dash) {
    touch(canvas, y + height);
    if (!canvas->html) {
        return;
    }
    html_open(canvas->html, "rect");
    html_number_attribute(canvas->html, "x", x);
    html_number_attribute(canvas->html, "y", y);
    html_number_attribute(canvas->html, "width", fmax(width, 0.0));
    html_number_attribute(canvas->html, "height", fmax(height, 0.0));
    html_attribute(canvas->html, "fill", fill ? fill : "none");
    stroke_attributes(canvas->html, stroke, stroke_width, dash);
    html_close(canvas->html);
}

void canvas_path(struct canvas *canvas, const char *path, const char *fill, const char *stroke, double stroke_width) {
    if (!canvas->html) {
        return;
    }
    html_open(canvas->html, "path");
    html_attribute(canvas->html, "d", path);
    html_attribute(canvas->html, "fill", fill ? fill : "none");
    stroke_attributes(canvas->html, stroke, stroke_width, NULL);
    html_close(canvas->html);
}

void canvas_arrow(struct canvas *canvas, double x, double y, double size, int direction, const char *colour) {
    char path[160];
    snprintf(path, sizeof path, "M%.2f %.2fl%.2f %.2fv%.2fz", x, y, -direction * size, -size * 0.55, size * 1.1);
    canvas_path(canvas, path, colour, NULL, 0.0);
}

/* ---- marks ---- */

void canvas_opens(struct canvas *canvas, const char *participant, const char *value) {
    canvas->participants++;
    if (!canvas->html) {
        return;
    }
    struct text name;
    text_init(&name);
    text_string(&name, participant);
    if (value && *value) {
        text_format(&name, ", %s", value);
    }
    html_attribute(canvas->html, "data-participant", participant);
    html_attribute(canvas->html, "tabindex", "0");
    html_attribute(canvas->html, "role", "button");
    html_attribute(canvas->html, "aria-label", name.data);
    text_release(&name);
}

/* Areas alike, so that no shape looks heavier: the factors are of a circle's radius. */
static void shape_path(char path[200], size_t room, enum palette_shape shape, double x, double y, double r) {
    double d = r * 1.25, s = r * 0.89, t = r * 1.25;
    switch (shape) {
    case SHAPE_DIAMOND:
        snprintf(path, room, "M%.2f %.2fl%.2f %.2fl%.2f %.2fl%.2f %.2fz", x, y - d, d, d, -d, d, -d, -d);
        break;
    case SHAPE_TRIANGLE:
        snprintf(path, room, "M%.2f %.2fl%.2f %.2fh%.2fz", x, y - t, t * 1.1, t * 1.8, -t * 2.2);
        break;
    case SHAPE_SQUARE:
    case SHAPE_CIRCLE:
        snprintf(path, room, "M%.2f %.2fh%.2fv%.2fh%.2fz", x - s, y - s, 2 * s, 2 * s, -2 * s);
        break;
    }
}

void canvas_mark(struct canvas *canvas, enum palette_shape shape, double x, double y, double radius, const char *fill,
    const char *stroke, const char *participant, const char *value) {
    touch(canvas, y + radius * 1.3);
    struct html *html = canvas->html;
    if (!html) {
        canvas->participants += participant != NULL;
        return;
    }
    if (shape == SHAPE_CIRCLE) {
        html_open(html, "circle");
        html_number_attribute(html, "cx", x);
        html_number_attribute(html, "cy", y);
        html_number_attribute(html, "r", radius);
    } else {
        char path[200];
        shape_path(path, sizeof path, shape, x, y, radius);
        html_open(html, "path");
        html_attribute(html, "d", path);
    }
    html_attribute(html, "fill", fill);
    html_attribute(html, "stroke", stroke);
    if (stroke) {
        html_number_attribute(html, "stroke-width", fmin(1.0 * canvas->unit, radius * 0.4));
    }
    if (participant) {
        html_attribute(html, "class", "point");
        canvas_opens(canvas, participant, value);
    }
    html_close(html);
}

/* ---- axis ---- */

size_t canvas_ticks(const struct canvas *canvas, double length) {
    double count = floor(length / (canvas->small * 7.0));
    return count < 2.0 ? 2 : count > 10.0 ? 10 : (size_t)count;
}

static void axis_ticks(struct canvas *canvas, const struct axis *axis, double y) {
    double length = 5.0 * canvas->unit, free_from = -1e9;
    struct canvas_style style = {.size = canvas->small, .anchor = ANCHOR_MIDDLE};
    struct text label;
    text_init(&label);
    for (size_t t = 0; t < axis->tick_count; t++) {
        double x = axis_place(axis, axis->ticks[t]);
        bool labelled = axis_labelled(axis, axis->ticks[t]);
        canvas_line(canvas, x, y, x, y + length * (labelled ? 1.0 : 0.6), PALETTE_INK, canvas->unit, NULL);
        if (!labelled) {
            continue;
        }
        text_clear(&label);
        axis_label(axis, axis->ticks[t], &label);
        double half = number_width(label.data, canvas->small, false) / 2.0;
        if (x - half < free_from) {
            continue;
        }
        free_from = x + half + canvas->small * 0.4;
        canvas_text(canvas, x, y + length + canvas->small * 1.15, style, label.data);
    }
    text_release(&label);
}

static void direction_words(
    struct canvas *canvas, const struct axis *axis, double y, const char *words, int direction) {
    struct canvas_style style = {.size = canvas->small, .colour = PALETTE_QUIET};
    double arrow = canvas->small * 0.75, x = direction < 0 ? axis->from : axis->to;
    style.anchor = direction < 0 ? ANCHOR_START : ANCHOR_END;
    canvas_arrow(canvas, x, y - canvas->small * 0.35, arrow, direction, PALETTE_QUIET);
    canvas_text(canvas, x - direction * arrow * 1.5, y, style, words);
}

double canvas_axis(struct canvas *canvas, const struct axis *axis, const struct axis_plan *plan, double y) {
    double line = canvas_line_height(canvas->small), length = axis->to - axis->from;
    double arrow = canvas->small * 1.2, gap = canvas->small * 1.5;
    canvas_line(canvas, axis->from, y, axis->to, y, PALETTE_INK, canvas->unit, NULL);
    axis_ticks(canvas, axis, y);
    double below = y + 5.0 * canvas->unit + canvas->small * 1.15 + line * 1.15;
    double lower = plan->lower ? number_width(plan->lower, canvas->small, false) + arrow : 0.0;
    double upper = plan->upper ? number_width(plan->upper, canvas->small, false) + arrow : 0.0;
    double title = plan->title ? number_width(plan->title, canvas->small, true) : 0.0;
    bool beside = title / 2.0 + fmax(lower, upper) + gap <= length / 2.0;
    double last = below;
    if (plan->lower) {
        direction_words(canvas, axis, below, plan->lower, -1);
    }
    if (plan->upper) {
        last = below += lower + upper + gap > length && plan->lower ? line : 0.0;
        direction_words(canvas, axis, below, plan->upper, 1);
    }
    if (plan->title) {
        struct canvas_style style = {.size = canvas->small, .anchor = ANCHOR_MIDDLE, .bold = true};
        double at = beside || (!plan->lower && !plan->upper) ? below : below + line;
        last = canvas_paragraph(
                   canvas, (axis->from + axis->to) / 2.0, at, fmax(length, 8.0 * canvas->small), style, plan->title) -
               line;
    }
    return last;
}

/* ---- places ---- */

void places_init(struct places *places) {
    *places = (struct places){0};
}

void places_release(struct places *places) {
    memory_free(places->taken);
    *places = (struct places){0};
}

void places_take(struct places *places, double left, double top, double right, double bottom) {
    if (places->count == places->room) {
        places->room = places->room ? places->room * 2 : 64;
        places->taken = memory_grow(places->taken, places->room, sizeof *places->taken);
    }
    places->taken[places->count++] = (struct place){left, top, right, bottom};
}

bool places_free(const struct places *places, double left, double top, double right, double bottom) {
    for (size_t i = 0; i < places->count; i++) {
        const struct place *place = &places->taken[i];
        if (left < place->right && place->left < right && top < place->bottom && place->top < bottom) {
            return false;
        }
    }
    return true;
}
