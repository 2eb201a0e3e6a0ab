/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "draw/grid.h"
#include "base/memory.h"
#include "draw/canvas.h"
#include "draw/number.h"
#include <math.h>
#include <stdio.h>

/* A shape is up to three bars or one stroke within a cell, in shares of its width and height. */
struct shape {
    const char *words;
    struct bar {
        double x, y, width, height; /* height 0: no bar */
    } bars[3];
    bool hollow, slash;
};

static const struct shape shapes[GRID_STATES] = {
    [GRID_OBSERVED] = {"observed", .bars = {{0, 0, 0, 0}}},
    [GRID_BLANK] = {"blank", .bars = {{0.0, 0.0, 1.0, 1.0}}, .hollow = true},
    [GRID_MISSING_CODE] = {"code for missing", .bars = {{0.0, 0.0, 1.0, 0.36}, {0.0, 0.64, 1.0, 0.36}}},
    [GRID_UNREADABLE] = {"unreadable", .slash = true},
    [GRID_BELOW_LIMIT] = {"below limit", .bars = {{0.0, 0.6, 1.0, 0.4}}},
    [GRID_ABOVE_LIMIT] = {"above limit", .bars = {{0.0, 0.0, 1.0, 0.4}}},
    [GRID_SET_MISSING] = {"set missing by decision", .bars = {{0.0, 0.35, 1.0, 0.3}}},
    [GRID_AFTER_EVENT] = {"after leaving", .bars = {{0.0, 0.0, 1.0, 1.0}}},
    [GRID_HELD_ASIDE] = {"record held aside",
        .bars = {{0.0, 0.0, 1.0, 0.2}, {0.0, 0.4, 1.0, 0.2}, {0.0, 0.8, 1.0, 0.2}}},
};

const char *grid_state_words(enum grid_state state) {
    BUG_IF((unsigned)state >= GRID_STATES);
    return shapes[state].words;
}

struct layout {
    double label, margin; /* widths of the columns at both sides */
    double left, right;   /* of the cells */
    double block_gap, row, row_gap;
    size_t participants;
};

static enum grid_state state_of(
    const struct grid *grid, const struct grid_block *block, size_t participant, size_t variable) {
    unsigned char state = block->states[participant * grid->variable_count + variable];
    BUG_IF(state >= GRID_STATES);
    return (enum grid_state)state;
}

static size_t missing_count(const struct grid *grid, size_t variable) {
    size_t count = 0;
    for (size_t b = 0; b < grid->block_count; b++) {
        for (size_t i = 0; i < grid->blocks[b].participant_count; i++) {
            count += state_of(grid, &grid->blocks[b], i, variable) != GRID_OBSERVED;
        }
    }
    return count;
}

static void count_words(const struct grid *grid, size_t variable, struct text *out) {
    text_clear(out);
    if (grid->variables[variable].counts) {
        text_string(out, grid->variables[variable].counts);
    } else {
        text_format(out, "%zu", missing_count(grid, variable));
    }
}

static void find_layout(const struct canvas *canvas, const struct grid *grid, struct layout *layout) {
    struct canvas_style style = {.size = canvas->small}, bold = {.size = canvas->small, .bold = true};
    *layout = (struct layout){.block_gap = 16.0 * canvas->unit, .row_gap = 4.0 * canvas->unit};
    layout->margin = canvas_width(style, "missing");
    struct text words;
    text_init(&words);
    for (size_t v = 0; v < grid->variable_count; v++) {
        layout->label = fmax(layout->label, canvas_width(style, grid->variables[v].label));
        count_words(grid, v, &words);
        layout->margin = fmax(layout->margin, canvas_width(bold, words.data));
    }
    text_release(&words);
    layout->label = fmin(layout->label, canvas->width * 0.25);
    layout->margin = fmin(layout->margin, canvas->width * 0.15);
    layout->row = fmax(18.0 * canvas->unit, canvas_line_height(canvas->small));
    layout->left = layout->label + 12.0 * canvas->unit;
    layout->right = canvas->width - layout->margin - 14.0 * canvas->unit;
    for (size_t b = 0; b < grid->block_count; b++) {
        layout->participants += grid->blocks[b].participant_count;
    }
}

/* ---- cells ---- */

static void draw_bar(struct canvas *canvas, const struct bar *bar, const struct bar *cell, bool hollow) {
    double line = hollow ? fmin(1.0 * canvas->unit, cell->width * 0.3) : 0.0;
    canvas_rectangle(canvas, cell->x + bar->x * cell->width + line / 2.0, cell->y + bar->y * cell->height + line / 2.0,
        bar->width * cell->width - line, bar->height * cell->height - line, hollow ? PALETTE_PAPER : PALETTE_INK,
        hollow ? PALETTE_INK : NULL, line, NULL);
}

static void draw_shape(struct canvas *canvas, enum grid_state state, const struct bar *cell) {
    const struct shape *shape = &shapes[state];
    for (size_t i = 0; i < 3; i++) {
        if (shape->bars[i].height > 0.0) {
            draw_bar(canvas, &shape->bars[i], cell, shape->hollow);
        }
    }
    if (shape->slash) {
        canvas_line(canvas, cell->x, cell->y + cell->height, cell->x + cell->width, cell->y, PALETTE_INK,
            1.5 * canvas->unit, NULL);
    }
}

/* A missing cell, with an unseen area over its whole height so that it can be hit. */
static void draw_cell(struct canvas *canvas, const struct bar *cell, const struct bar *target, enum grid_state state,
    const char *participant, const struct grid_variable *variable) {
    if (!participant) {
        draw_shape(canvas, state, cell);
        return;
    }
    struct text words;
    text_init(&words);
    text_format(&words, "%s: %s", variable->label, shapes[state].words);
    if (canvas->html) {
        html_open(canvas->html, "g");
        html_attribute(canvas->html, "class", "point");
        html_attribute(canvas->html, "data-column", variable->column);
    }
    canvas_opens(canvas, participant, words.data);
    text_release(&words);
    if (canvas->html) {
        html_open(canvas->html, "rect");
        html_number_attribute(canvas->html, "x", target->x);
        html_number_attribute(canvas->html, "y", target->y);
        html_number_attribute(canvas->html, "width", target->width);
        html_number_attribute(canvas->html, "height", target->height);
        html_attribute(canvas->html, "fill-opacity", "0");
        html_close(canvas->html);
    }
    draw_shape(canvas, state, cell);
    if (canvas->html) {
        html_close(canvas->html);
    }
}

/* The missing of participants [from, to) of one variable in one column: one by one when the column is one
 * participant's, else their commonest reason, as high as their share. */
static void draw_column(struct canvas *canvas, const struct grid *grid, const struct grid_block *block, size_t variable,
    size_t from, size_t to, const struct bar *column) {
    size_t counts[GRID_STATES] = {0}, missing = 0, last = from;
    for (size_t i = from; i < to; i++) {
        enum grid_state state = state_of(grid, block, i, variable);
        counts[state]++;
        missing += state != GRID_OBSERVED;
        last = state != GRID_OBSERVED ? i : last;
    }
    if (!missing) {
        return;
    }
    enum grid_state commonest = GRID_BLANK;
    for (size_t s = GRID_BLANK; s < GRID_STATES; s++) {
        commonest = counts[s] > counts[commonest] ? (enum grid_state)s : commonest;
    }
    double share = (double)missing / (double)(to - from), height = column->height * fmax(share, 0.25);
    double air = fmin(column->width * 0.15, 1.0 * canvas->unit);
    struct bar cell = {column->x + air / 2.0, column->y + column->height - height, column->width - air, height};
    draw_cell(
        canvas, &cell, column, commonest, missing == 1 ? block->participants[last] : NULL, &grid->variables[variable]);
}

static void draw_block_row(struct canvas *canvas, const struct grid *grid, const struct grid_block *block,
    size_t variable, const struct bar *area, size_t participants) {
    canvas_rectangle(canvas, area->x, area->y, area->width, area->height, PALETTE_BAND, NULL, 0.0, NULL);
    size_t count = block->participant_count, columns = count;
    if (participants > GRID_COLUMNS) {
        columns = (size_t)ceil((double)count * GRID_COLUMNS / (double)participants);
    }
    for (size_t c = 0; c < columns; c++) {
        double width = area->width / (double)columns;
        struct bar column = {area->x + width * (double)c, area->y, width, area->height};
        draw_column(canvas, grid, block, variable, c * count / columns, (c + 1) * count / columns, &column);
    }
}

/* ---- the whole ---- */

/* Where block b lies; widths go by participants. */
static struct bar block_area(const struct grid *grid, const struct layout *layout, size_t b) {
    double gaps = layout->block_gap * ((double)grid->block_count - 1.0), room = layout->right - layout->left - gaps;
    double before = 0.0, all = fmax((double)layout->participants, 1.0);
    for (size_t i = 0; i < b; i++) {
        before += (double)grid->blocks[i].participant_count;
    }
    return (struct bar){.x = layout->left + room * before / all + layout->block_gap * (double)b,
        .width = room * (double)grid->blocks[b].participant_count / all};
}

static double draw_headings(struct canvas *canvas, const struct grid *grid, const struct layout *layout) {
    struct canvas_style quiet = {.size = canvas->small, .colour = PALETTE_QUIET};
    double bottom = 0.0;
    for (size_t b = 0; b < grid->block_count; b++) {
        const struct grid_block *block = &grid->blocks[b];
        struct canvas_style name = {
            .size = canvas->strong, .colour = block->mark ? block->mark->colour : NULL, .bold = true};
        struct bar area = block_area(grid, layout, b);
        double y = canvas->strong * 1.1, width = fmax(area.width, canvas->small);
        if (block->label) {
            y = canvas_paragraph(canvas, area.x, y, width, name, block->label);
        }
        char words[64];
        snprintf(words, sizeof words, "%zu participants", block->participant_count);
        bottom = fmax(bottom, canvas_paragraph(canvas, area.x, y, width, quiet, words));
    }
    quiet.anchor = ANCHOR_END;
    canvas_text(canvas, canvas->width, bottom - canvas_line_height(canvas->small), quiet, "missing");
    return bottom - canvas->small * 0.5;
}

/* Returns where the next row begins. */
static double draw_variable(
    struct canvas *canvas, const struct grid *grid, const struct layout *layout, size_t variable, double top) {
    struct canvas_style label = {.size = canvas->small, .anchor = ANCHOR_END};
    struct canvas_style count = {.size = canvas->small, .anchor = ANCHOR_END, .bold = true};
    const char *words = grid->variables[variable].label;
    double line = canvas_line_height(canvas->small), lines = (double)canvas_lines(layout->label, label, words);
    double height = fmax(layout->row, line * lines), middle = top + height / 2.0;
    canvas_paragraph(
        canvas, layout->label, middle + canvas->small * 0.36 - (lines - 1.0) * line / 2.0, layout->label, label, words);
    for (size_t b = 0; b < grid->block_count; b++) {
        struct bar area = block_area(grid, layout, b);
        area.y = top;
        area.height = height;
        draw_block_row(canvas, grid, &grid->blocks[b], variable, &area, layout->participants);
    }
    struct text counts;
    text_init(&counts);
    count_words(grid, variable, &counts);
    canvas_text(canvas, canvas->width, middle + canvas->small * 0.36, count, counts.data);
    text_release(&counts);
    return top + height + layout->row_gap;
}

static void states_present(const struct grid *grid, bool present[GRID_STATES]) {
    for (size_t b = 0; b < grid->block_count; b++) {
        size_t cells = grid->blocks[b].participant_count * grid->variable_count;
        for (size_t i = 0; i < cells; i++) {
            present[grid->blocks[b].states[i]] = true;
        }
    }
}

static void draw_legend(struct canvas *canvas, const struct grid *grid, const struct layout *layout, double top) {
    struct canvas_style style = {.size = canvas->small, .colour = PALETTE_QUIET};
    bool present[GRID_STATES] = {false};
    states_present(grid, present);
    double x = layout->left, y = top, height = canvas->small * 1.1, width = canvas->small * 0.7;
    for (size_t s = 0; s < GRID_STATES; s++) {
        if (!present[s]) {
            continue;
        }
        double need = width * 1.7 + canvas_width(style, shapes[s].words) + canvas->small * 1.6;
        if (x > layout->left && x + need > canvas->width) {
            x = layout->left;
            y += canvas_line_height(canvas->small) * 1.2;
        }
        struct bar cell = {x, y, width, height};
        canvas_rectangle(canvas, x, y, width, height, PALETTE_BAND, NULL, 0.0, NULL);
        draw_shape(canvas, (enum grid_state)s, &cell);
        canvas_text(canvas, x + width * 1.7, y + canvas->small * 0.92, style, shapes[s].words);
        x += need;
    }
    if (layout->participants > GRID_COLUMNS) {
        canvas_paragraph(canvas, layout->left, y + height + canvas->small * 1.5, canvas->width - layout->left, style,
            "Neighbours share a column: the shape is their commonest reason, its height their share missing.");
    }
}

static void draw(struct canvas *canvas, const void *data) {
    const struct grid *grid = data;
    struct layout layout;
    find_layout(canvas, grid, &layout);
    double y = draw_headings(canvas, grid, &layout);
    for (size_t v = 0; v < grid->variable_count; v++) {
        y = draw_variable(canvas, grid, &layout, v, y);
    }
    draw_legend(canvas, grid, &layout, y + 8.0 * canvas->unit);
}

void grid_svg(const struct grid *grid, const struct figure *figure, struct html *html) {
    canvas_render(figure, html, draw, grid);
}
