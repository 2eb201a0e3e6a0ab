/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "draw/bars.h"
#include "draw/canvas.h"
#include <math.h>
#include <stdio.h>

struct columns {
    double label, number; /* widths */
    size_t present, all, most;
};

static void number_words(const struct columns *columns, const struct bars_level *level, char words[64], size_t room) {
    size_t whole = level->missing ? columns->all : columns->present;
    if (whole == 0) {
        snprintf(words, room, "%zu", level->count);
        return;
    }
    double percent = 100.0 * (double)level->count / (double)whole;
    snprintf(words, room, "%zu (%.1f%%%s)", level->count, percent, level->missing ? " of all" : "");
}

static void find_columns(const struct canvas *canvas, const struct bars *bars, struct columns *columns) {
    struct canvas_style style = {.size = canvas->normal};
    *columns = (struct columns){0};
    for (size_t i = 0; i < bars->level_count; i++) {
        const struct bars_level *level = &bars->levels[i];
        columns->all += level->count;
        columns->present += level->missing ? 0 : level->count;
        columns->most = level->count > columns->most ? level->count : columns->most;
        columns->label = fmax(columns->label, canvas_width(style, level->label));
    }
    columns->label = fmin(columns->label, canvas->width * 0.3) + canvas->normal;
    for (size_t i = 0; i < bars->level_count; i++) {
        char words[64];
        number_words(columns, &bars->levels[i], words, sizeof words);
        columns->number = fmax(columns->number, canvas_width(style, words) + 2.0 * canvas->normal);
    }
}

static double draw_level(
    struct canvas *canvas, const struct columns *columns, const struct bars_level *level, double top) {
    struct canvas_style style = {.size = canvas->normal, .colour = level->missing ? PALETTE_QUIET : PALETTE_INK};
    double width = columns->label - canvas->normal, line = canvas_line_height(canvas->normal);
    double lines = (double)canvas_lines(width, style, level->label), bar = 20.0 * canvas->unit;
    double height = fmax(lines * line, bar) + 8.0 * canvas->unit, middle = top + height / 2.0;
    canvas_paragraph(
        canvas, 0.0, middle + canvas->normal * 0.36 - (lines - 1.0) * line / 2.0, width, style, level->label);
    double room = canvas->width - columns->label - columns->number;
    double length = columns->most ? room * (double)level->count / (double)columns->most : 0.0;
    canvas_rectangle(canvas, columns->label, middle - bar / 2.0, length, bar,
        level->missing ? PALETTE_PAPER : PALETTE_QUIET, level->missing ? PALETTE_QUIET : NULL, canvas->unit, "3 3");
    char words[64];
    number_words(columns, level, words, sizeof words);
    canvas_text(canvas, columns->label + length + canvas->normal * 0.7, middle + canvas->normal * 0.36, style, words);
    return top + height;
}

static void draw(struct canvas *canvas, const void *data) {
    const struct bars *bars = data;
    struct columns columns;
    find_columns(canvas, bars, &columns);
    struct canvas_style style = {.size = canvas->normal, .bold = true};
    double y = 2.0;
    if (bars->title) {
        y = canvas_paragraph(canvas, 0.0, canvas->normal * 1.2, canvas->width, style, bars->title);
        y -= canvas->normal * 0.5;
    }
    double first = y;
    for (size_t i = 0; i < bars->level_count; i++) {
        y += bars->levels[i].missing && i && !bars->levels[i - 1].missing ? 10.0 * canvas->unit : 0.0;
        y = draw_level(canvas, &columns, &bars->levels[i], y);
    }
    canvas_line(canvas, columns.label, first, columns.label, y, PALETTE_INK, canvas->unit, NULL);
}

void bars_svg(const struct bars *bars, const struct figure *figure, struct html *html) {
    canvas_render(figure, html, draw, bars);
}
