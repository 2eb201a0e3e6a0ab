/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "draw/flow.h"
#include "draw/canvas.h"
#include <math.h>
#include <stdio.h>

/* A column of the diagram: all participants, or one arm. */
struct lane {
    double left, box, side; /* left end; width of the boxes; width of the words beside them, after a gap */
    double gap;
};

static struct canvas_style word_style(const struct canvas *canvas) {
    return (struct canvas_style){.size = canvas->normal};
}

static struct canvas_style side_style(const struct canvas *canvas) {
    return (struct canvas_style){.size = canvas->small, .colour = PALETTE_QUIET};
}

static struct canvas_style count_style(const struct canvas *canvas) {
    return (struct canvas_style){.size = canvas->strong, .bold = true};
}

static struct lane lane_of(const struct canvas *canvas, const struct flow *flow, bool arms, size_t which) {
    double gap = 26.0 * canvas->unit, between = 24.0 * canvas->unit;
    if (!arms) {
        double box = fmin(canvas->width * 0.36, 380.0 * canvas->unit), left = (canvas->width - box) / 2.0;
        return (struct lane){left, box, canvas->width - left - box - gap, gap};
    }
    double count = (double)flow->arm_count, each = (canvas->width - between * (count - 1.0)) / count;
    double box = (each - gap) * 0.46;
    return (struct lane){(each + between) * (double)which, box, each - gap - box, gap};
}

static void exclusion_words(const struct flow_exclusion *exclusion, char words[512], size_t room) {
    snprintf(words, room, "%zu %s", exclusion->count, exclusion->reason ? exclusion->reason : "");
}

/* The words of a box: its count large, what they are below. */
static double draw_words(struct canvas *canvas, const struct lane *lane, const struct palette_mark *mark,
    const char *label, const struct flow_box *box, double top) {
    double pad = 10.0 * canvas->unit, width = lane->box - 2.0 * pad, x = lane->left + pad;
    struct canvas_style count = count_style(canvas);
    count.colour = mark ? mark->colour : NULL;
    char number[32];
    snprintf(number, sizeof number, "%zu", box->count);
    double y = top + canvas->strong * 1.25, after = canvas_width(count, number) + canvas->normal * 0.6;
    canvas_text(canvas, x, y, count, number);
    if (canvas_lines(width - after, word_style(canvas), label) <= 1) {
        canvas_text(canvas, x + after, y, word_style(canvas), label);
        return y + pad;
    }
    y = canvas_paragraph(canvas, x, y + canvas_line_height(canvas->normal), width, word_style(canvas), label);
    return y - canvas_line_height(canvas->normal) + pad;
}

/* Those who leave, in words beside the way down. */
static double draw_leaving(struct canvas *canvas, const struct lane *lane, const struct flow_box *box, double top) {
    double x = lane->left + lane->box + lane->gap, y = top + canvas->small;
    for (size_t i = 0; i < box->exclusion_count; i++) {
        char words[512];
        exclusion_words(&box->exclusions[i], words, sizeof words);
        y = canvas_paragraph(canvas, x, y, lane->side, side_style(canvas), words);
    }
    return box->exclusion_count ? y - canvas->small * 0.7 : top;
}

struct level {
    double top, box_bottom, bottom; /* of a stage: its boxes, and the way to the next with those who leave */
};

static const struct flow_box *box_of(const struct flow_stage *stage, size_t which) {
    return stage->arms ? &stage->arms[which] : &stage->total;
}

static struct level measure(
    const struct canvas *canvas, const struct flow *flow, const struct flow_stage *stage, double top, bool last) {
    struct canvas probe = *canvas;
    probe.html = NULL;
    size_t boxes = stage->arms ? flow->arm_count : 1;
    struct level level = {top, top, top};
    for (size_t b = 0; b < boxes; b++) {
        struct lane lane = lane_of(canvas, flow, stage->arms != NULL, b);
        level.box_bottom = fmax(level.box_bottom, draw_words(&probe, &lane, NULL, stage->label, box_of(stage, b), top));
    }
    level.bottom = level.box_bottom + (last ? 0.0 : 18.0 * canvas->unit);
    for (size_t b = 0; b < boxes; b++) {
        struct lane lane = lane_of(canvas, flow, stage->arms != NULL, b);
        double start = level.box_bottom + 6.0 * canvas->unit,
               end = draw_leaving(&probe, &lane, box_of(stage, b), start);
        level.bottom = fmax(level.bottom, end > start ? end + 6.0 * canvas->unit : 0.0);
    }
    return level;
}

static void arrow_down(struct canvas *canvas, double x, double y) {
    double size = 6.0 * canvas->unit;
    char path[100];
    snprintf(path, sizeof path, "M%.2f %.2fl%.2f %.2fh%.2fz", x, y, size * 0.6, -size, -size * 1.2);
    canvas_path(canvas, path, PALETTE_INK, NULL, 0.0);
}

/* From the boxes of one stage to those of the next: straight, or spreading over the arms. */
static void draw_way(struct canvas *canvas, const struct flow *flow, const struct flow_stage *from,
    const struct flow_stage *to, const struct level *level) {
    double line = 1.25 * canvas->unit, fork = level->bottom - 10.0 * canvas->unit;
    size_t starts = from->arms ? flow->arm_count : 1, ends = to->arms ? flow->arm_count : 1;
    double first = INFINITY, last = -INFINITY;
    for (size_t i = 0; i < starts; i++) {
        struct lane lane = lane_of(canvas, flow, from->arms != NULL, i);
        double x = lane.left + lane.box / 2.0;
        canvas_line(canvas, x, level->box_bottom, x, starts == ends ? level->bottom : fork, PALETTE_INK, line, NULL);
        first = fmin(first, x);
        last = fmax(last, x);
    }
    for (size_t i = 0; i < ends; i++) {
        struct lane lane = lane_of(canvas, flow, to->arms != NULL, i);
        double x = lane.left + lane.box / 2.0;
        if (starts != ends) {
            canvas_line(canvas, x, fork, x, level->bottom, PALETTE_INK, line, NULL);
        }
        arrow_down(canvas, x, level->bottom);
        first = fmin(first, x);
        last = fmax(last, x);
    }
    if (starts != ends) {
        canvas_line(canvas, first, fork, last, fork, PALETTE_INK, line, NULL);
    }
}

static void draw_box(struct canvas *canvas, const struct flow *flow, const struct flow_stage *stage, size_t which,
    const struct level *level) {
    struct lane lane = lane_of(canvas, flow, stage->arms != NULL, which);
    const struct palette_mark *mark = stage->arms ? flow->arms[which].mark : NULL;
    const struct flow_box *box = box_of(stage, which);
    canvas_rectangle(canvas, lane.left + 1.0, level->top, lane.box - 2.0, level->box_bottom - level->top, PALETTE_PAPER,
        mark ? mark->colour : PALETTE_INK, 1.25 * canvas->unit, mark ? mark->dash : NULL);
    draw_words(canvas, &lane, mark, stage->label, box, level->top);
    if (box->exclusion_count) {
        double y = level->box_bottom + 6.0 * canvas->unit + canvas->small * 0.62, from = lane.left + lane.box / 2.0;
        double to = lane.left + lane.box + lane.gap - 6.0 * canvas->unit;
        canvas_line(canvas, from, y, to, y, PALETTE_INK, 1.25 * canvas->unit, NULL);
        canvas_arrow(canvas, to, y, 6.0 * canvas->unit, 1, PALETTE_INK);
        draw_leaving(canvas, &lane, box, level->box_bottom + 6.0 * canvas->unit);
    }
}

/* The arms' names stand once, over their first boxes. */
static double draw_arm_names(struct canvas *canvas, const struct flow *flow, double top) {
    double bottom = top;
    for (size_t a = 0; a < flow->arm_count; a++) {
        struct lane lane = lane_of(canvas, flow, true, a);
        struct canvas_style style = {
            .size = canvas->strong, .colour = flow->arms[a].mark ? flow->arms[a].mark->colour : NULL, .bold = true};
        double y = canvas_paragraph(canvas, lane.left + lane.box + lane.gap / 2.0, top + canvas->strong * 1.25,
            lane.side, style, flow->arms[a].label);
        bottom = fmax(bottom, y - canvas->strong * 0.9);
    }
    return bottom;
}

static void draw(struct canvas *canvas, const void *data) {
    const struct flow *flow = data;
    double y = 2.0;
    bool named = false;
    for (size_t s = 0; s < flow->stage_count; s++) {
        const struct flow_stage *stage = &flow->stages[s];
        bool last = s + 1 == flow->stage_count;
        struct level level = measure(canvas, flow, stage, y, last);
        if (stage->arms && !named) {
            double names = draw_arm_names(canvas, flow, y);
            double more = fmax(0.0, names - level.box_bottom);
            level.box_bottom += more;
            level.bottom += more;
            named = true;
        }
        size_t boxes = stage->arms ? flow->arm_count : 1;
        if (!last) {
            draw_way(canvas, flow, stage, &flow->stages[s + 1], &level);
        }
        for (size_t b = 0; b < boxes; b++) {
            draw_box(canvas, flow, stage, b, &level);
        }
        y = level.bottom;
    }
}

void flow_svg(const struct flow *flow, const struct figure *figure, struct html *html) {
    canvas_render(figure, html, draw, flow);
}
