/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Invented data for every figure: ordinary, crowded, tied, empty, and with words that are too long. Numbers come from a
 * fixed generator, so that every run draws the same. */
#ifndef EVENHAND_TESTS_DRAW_EXAMPLES_H
#define EVENHAND_TESTS_DRAW_EXAMPLES_H
#include "base/memory.h"
#include "draw/bars.h"
#include "draw/boxes.h"
#include "draw/estimates.h"
#include "draw/figure.h"
#include "draw/flow.h"
#include "draw/grid.h"
#include "draw/histogram.h"
#include "draw/html.h"
#include "draw/pairs.h"
#include <math.h>
#include <stdint.h>
#include <stdlib.h>

struct example {
    const char *name;
    void (*draw)(struct arena *arena, const struct figure *figure, struct html *html);
};

static double uniform(uint64_t *seed) {
    *seed = *seed * 6364136223846793005u + 1442695040888963407u;
    return ((double)(*seed >> 11) + 0.5) / 9007199254740992.0;
}

static double normal(uint64_t *seed) {
    return sqrt(-2.0 * log(uniform(seed))) * cos(6.283185307179586 * uniform(seed));
}

static int ascending(const void *a, const void *b) {
    double x = *(const double *)a, y = *(const double *)b;
    return (x > y) - (x < y);
}

/* Fills a row's box from its points: quartiles by simple ranks, which is all a drawing needs. */
static void fill_box(struct arena *arena, struct boxes_row *row, struct figure_point *points, size_t count) {
    double *values = ARENA_NEW(arena, count + 1, double), sum = 0.0;
    for (size_t i = 0; i < count; i++) {
        values[i] = points[i].value;
        sum += values[i];
    }
    qsort(values, count, sizeof *values, ascending);
    row->points = points;
    row->point_count = count;
    row->low_quartile = values[count / 4];
    row->median = values[count / 2];
    row->high_quartile = values[count * 3 / 4];
    row->mean = sum / (double)count;
    double reach = 1.5 * (row->high_quartile - row->low_quartile);
    row->low_whisker = row->high_quartile;
    row->high_whisker = row->low_quartile;
    for (size_t i = 0; i < count; i++) {
        points[i].outlier = points[i].value < row->low_quartile - reach || points[i].value > row->high_quartile + reach;
        if (!points[i].outlier) {
            row->low_whisker = fmin(row->low_whisker, points[i].value);
            row->high_whisker = fmax(row->high_whisker, points[i].value);
        }
    }
}

static struct figure_point *make_points(
    struct arena *arena, uint64_t seed, size_t count, double mean, double sd, double step) {
    struct figure_point *points = ARENA_NEW(arena, count + 1, struct figure_point);
    for (size_t i = 0; i < count; i++) {
        double value = mean + sd * normal(&seed);
        points[i].value = step > 0.0 ? round(value / step) * step : value;
        points[i].participant = arena_format(arena, "Q%04zu", (size_t)(seed % 9000) + 1000);
    }
    return points;
}

static const struct boxes_contrast two_contrasts[] = {
    {"B minus A", "+7.6", "4.0 to 11.2", NULL},
    {"B minus A", NULL, NULL, "Not estimable: too few participants have the values this method needs."},
};

static struct boxes boxes_of(
    struct arena *arena, bool coded, size_t groups, size_t arms, size_t per_row, double step, bool limits) {
    static const char *const levels[] = {"Female", "Male", "65 years and over"};
    static const char *const letters[] = {"A", "B", "C", "D"};
    static const char *const names[] = {"printed advice", "walking group", "walking and coaching", "coaching"};
    struct boxes_group *group = ARENA_NEW(arena, groups, struct boxes_group);
    for (size_t g = 0; g < groups; g++) {
        struct boxes_row *rows = ARENA_NEW(arena, arms, struct boxes_row);
        for (size_t a = 0; a < arms; a++) {
            struct figure_point *points =
                make_points(arena, 7 * g + a + 1, per_row, -9.0 + 4.0 * (double)a, 11.0 + 2.0 * (double)a, step);
            points[0].value = g % 2 ? -41.2 : 27.4;
            if (limits) {
                points[1].value = 300.0;
            }
            rows[a].arm = coded ? letters[a] : names[a];
            rows[a].mark = palette_arm(coded, a);
            rows[a].counts = arena_format(arena, "%zu analysed of %zu", per_row, per_row + 11);
            fill_box(arena, &rows[a], points, per_row);
        }
        group[g] = (struct boxes_group){
            .level = groups > 1 ? levels[g] : NULL,
            .rows = rows,
            .row_count = arms,
            .contrasts = &two_contrasts[arms > 1 ? g % 2 : 0],
            .contrast_count = arms > 1 ? 1 : 0,
        };
    }
    return (struct boxes){
        .axis = {.low = limits ? -60.0 : (double)NAN,
            .high = limits ? 60.0 : (double)NAN,
            .with_sign = true,
            .title = "Change in systolic pressure, mmHg",
            .lower = "better: pressure fell",
            .upper = "pressure rose"},
        .decimals = 1,
        .groups = group,
        .group_count = groups,
        .interaction = groups > 1 ? "Sex by group: difference of differences 4.8 (\u22120.3 to 9.9)." : NULL,
    };
}

static void boxes_by_sex(struct arena *arena, const struct figure *figure, struct html *html) {
    struct boxes boxes = boxes_of(arena, true, 2, 2, 61, 0.0, false);
    boxes_svg(&boxes, figure, html);
}

static void boxes_three_arms(struct arena *arena, const struct figure *figure, struct html *html) {
    struct boxes boxes = boxes_of(arena, false, 3, 3, 240, 1.0, false);
    boxes_svg(&boxes, figure, html);
}

static void boxes_crowded(struct arena *arena, const struct figure *figure, struct html *html) {
    struct boxes boxes = boxes_of(arena, true, 1, 2, 2000, 0.1, true);
    boxes_svg(&boxes, figure, html);
}

static void boxes_strips(struct arena *arena, const struct figure *figure, struct html *html) {
    struct boxes boxes = boxes_of(arena, true, 1, 2, 5000, 0.1, false);
    boxes_svg(&boxes, figure, html);
}

static void boxes_tied(struct arena *arena, const struct figure *figure, struct html *html) {
    struct boxes boxes = boxes_of(arena, false, 1, 4, 1500, 15.0, false);
    boxes_svg(&boxes, figure, html);
}

/* Outliers crowding together at both ends, none, one and two values, all alike. */
static void boxes_awkward(struct arena *arena, const struct figure *figure, struct html *html) {
    static const size_t counts[] = {60, 0, 1, 2, 40};
    struct boxes_row *rows = ARENA_NEW(arena, 5, struct boxes_row);
    for (size_t r = 0; r < 5; r++) {
        struct figure_point *points = make_points(arena, r + 40, counts[r], 10.0, r == 4 ? 0.0 : 1.0, 0.0);
        for (size_t i = 0; r == 0 && i < 18; i++) {
            points[i].value = (i % 2 ? 29.5 : -8.0) + 0.13 * (double)i;
        }
        rows[r].arm = r % 2 ? "walking group with a rather long name" : "A";
        rows[r].mark = palette_arm(true, r);
        rows[r].counts = arena_format(arena, "%zu analysed of 140", counts[r]);
        rows[r].sentence = counts[r] < 3 ? "Too few values for a box." : NULL;
        rows[r].points = points;
        rows[r].point_count = counts[r];
        if (counts[r] >= 3) {
            fill_box(arena, &rows[r], points, counts[r]);
        }
    }
    struct boxes_group group = {.level = "Extraordinarily overweight & <unknown>",
        .rows = rows,
        .row_count = 5,
        .contrasts = two_contrasts,
        .contrast_count = 2};
    struct boxes boxes = {
        .axis = {.low = NAN,
            .high = NAN,
            .null_line = NAN,
            .title = "Urine albumin-to-creatinine ratio at 26 weeks as a percentage of baseline, log10 "
                     "scale, from the central laboratory",
            .lower = "better: less albumin in the urine than at baseline",
            .upper = "more albumin in the urine than at baseline"},
        .decimals = 2,
        .groups = &group,
        .group_count = 1};
    boxes_svg(&boxes, figure, html);
}

static void estimates_effect(struct arena *arena, const struct figure *figure, struct html *html) {
    (void)arena;
    static const struct estimates_row rows[] = {
        {.label = "Baseline-adjusted mean difference",
            .role = "planned analysis",
            .estimate = -4.6,
            .low = -6.9,
            .high = -2.3,
            .figures = "\u22124.6 (\u22126.9 to \u22122.3)",
            .emphasised = true},
        {.label = "same, robust standard error",
            .role = "sensitivity",
            .estimate = -4.6,
            .low = -7.0,
            .high = -2.2,
            .figures = "\u22124.6 (\u22127.0 to \u22122.2)"},
        {.label = "Unadjusted difference in change",
            .role = "supplementary",
            .estimate = -4.1,
            .low = -6.8,
            .high = -1.4,
            .figures = "\u22124.1 (\u22126.8 to \u22121.4)"},
        {.label = "Unadjusted difference, 26 weeks",
            .role = "supplementary",
            .estimate = -5.2,
            .low = -8.3,
            .high = -2.1,
            .figures = "\u22125.2 (\u22128.3 to \u22122.1)"},
        {.label = "Rank-based shift of the change",
            .role = "supplementary",
            .estimate = -4.0,
            .low = -6.5,
            .high = -1.5,
            .figures = "\u22124.0 (\u22126.5 to \u22121.5)"},
        {.label = "Jump to reference",
            .role = "sensitivity",
            .sentence = "Not shown while blinded: it would need to know which arm is the reference."},
        {.label = "Without Q2400, Q4115",
            .role = "sensitivity",
            .estimate = -4.3,
            .low = -6.5,
            .high = -2.1,
            .figures = "\u22124.3 (\u22126.5 to \u22122.1)",
            .group = "",
            .participant = "Q2400"},
    };
    struct estimates estimates = {.axis = {.low = NAN,
                                      .high = NAN,
                                      .title = "Difference in systolic pressure, mmHg",
                                      .lower = "favours walking group",
                                      .upper = "favours printed advice"},
        .mark = palette_arm(false, 1),
        .band_low = -INFINITY,
        .band_high = -5.0,
        .band_label = "at least the important difference",
        .rows = rows,
        .row_count = sizeof rows / sizeof *rows};
    estimates_svg(&estimates, figure, html);
}

static void estimates_ratios(struct arena *arena, const struct figure *figure, struct html *html) {
    (void)arena;
    static const struct estimates_row rows[] = {
        {.label = "All participants",
            .role = "101 v 105",
            .estimate = 0.82,
            .low = 0.7,
            .high = 0.96,
            .figures = "0.82 (0.70 to 0.96)",
            .emphasised = true,
            .weight = 1.0},
        {.label = "Female",
            .role = "51 v 49",
            .estimate = 0.75,
            .low = 0.6,
            .high = 0.95,
            .figures = "0.75 (0.60 to 0.95)",
            .group = "Sex",
            .weight = 0.48},
        {.label = "Male",
            .role = "50 v 56",
            .estimate = 0.9,
            .low = 0.72,
            .high = 1.13,
            .figures = "0.90 (0.72 to 1.13)",
            .weight = 0.52},
        {.label = "under 30 kg/m\u00b2, as measured at the first visit by the site's own scales",
            .role = "4 v 3",
            .estimate = 1.4,
            .low = 0.06,
            .high = 31.0,
            .figures = "1.40 (0.06 to 31.00)",
            .group = "Body mass index",
            .weight = 0.03},
        {.label = "30 kg/m\u00b2 and over",
            .role = "2 v 1",
            .estimate = 40.0,
            .low = 25.0,
            .high = 99.0,
            .figures = "40.0 (25.0 to 99.0)",
            .weight = 0.01},
        {.label = "unknown",
            .role = "0 v 1",
            .sentence = "Not estimable: too few participants have the values this method needs."},
    };
    struct estimates estimates = {.axis = {.scale = AXIS_LOG10,
                                      .low = 0.2,
                                      .high = 5.0,
                                      .null_line = 1.0,
                                      .title = "Ratio of geometric means",
                                      .lower = "favours walking group",
                                      .upper = "favours printed advice"},
        .mark = palette_arm(false, 1),
        .band_low = NAN,
        .band_high = NAN,
        .role_heading = "n, walking v advice",
        .figures_heading = "ratio (95% interval)",
        .rows = rows,
        .row_count = sizeof rows / sizeof *rows};
    estimates_svg(&estimates, figure, html);
}

static struct histogram_panel panel_of(struct arena *arena, enum axis_scale scale, size_t count) {
    struct figure_point *points = make_points(arena, 5, count, 0.6, 1.1, 0.0);
    struct histogram_panel panel = {.axis = {.scale = scale,
                                        .low = NAN,
                                        .high = NAN,
                                        .null_line = NAN,
                                        .title = scale == AXIS_LOG10 ? "Albumin ratio, mg/mmol, log10 scale"
                                                                     : "Albumin ratio, mg/mmol, linear scale"},
        .counts = scale == AXIS_LOG10 ? "229 of 240 on this scale, 2 not above zero, 9 missing"
                                      : "231 observed of 240, 9 missing",
        .bin_count = 14};
    panel.row.mark = palette_pooled();
    double low = INFINITY, high = 0.0;
    for (size_t i = 0; i < count; i++) {
        points[i].value = exp(points[i].value);
        low = fmin(low, points[i].value);
        high = fmax(high, points[i].value);
    }
    struct histogram_bin *bins = ARENA_NEW(arena, panel.bin_count, struct histogram_bin);
    for (size_t b = 0; b < panel.bin_count; b++) {
        double from = (double)b / (double)panel.bin_count, to = (double)(b + 1) / (double)panel.bin_count;
        bins[b].from = scale == AXIS_LOG10 ? low * pow(high / low, from) : low + (high - low) * from;
        bins[b].to = scale == AXIS_LOG10 ? low * pow(high / low, to) : low + (high - low) * to;
        for (size_t i = 0; i < count; i++) {
            bins[b].count += points[i].value >= bins[b].from && points[i].value < bins[b].to;
        }
    }
    panel.bins = bins;
    fill_box(arena, &panel.row, points, count);
    return panel;
}

static const struct histogram_range ranges[] = {
    {"eligibility 0.5 to 10", 0.5, 10.0}, {"plausible 0 to 300", 0.0, 300.0}, {"elsewhere", 900.0, INFINITY}};

static void histogram_both(struct arena *arena, const struct figure *figure, struct html *html) {
    struct histogram_panel panels[] = {panel_of(arena, AXIS_LINEAR, 231), panel_of(arena, AXIS_LOG10, 231)};
    struct histogram histogram = {
        .decimals = 2, .panels = panels, .panel_count = 2, .ranges = ranges, .range_count = 3};
    histogram_svg(&histogram, figure, html);
}

static void histogram_many(struct arena *arena, const struct figure *figure, struct html *html) {
    struct histogram_panel panel = panel_of(arena, AXIS_LINEAR, 6000);
    struct histogram histogram = {
        .decimals = 2, .panels = &panel, .panel_count = 1, .ranges = ranges, .range_count = 2};
    histogram_svg(&histogram, figure, html);
}

static void draw_pairs(
    struct arena *arena, size_t panels, size_t count, const struct figure *figure, struct html *html) {
    static const char *const letters[] = {"A", "B", "C", "D"};
    struct pairs_panel *panel = ARENA_NEW(arena, panels, struct pairs_panel);
    for (size_t p = 0; p < panels; p++) {
        struct figure_point *before = make_points(arena, p + 60, count, 152.0, 11.0, 1.0);
        struct figure_point *change = make_points(arena, p + 90, count, -8.0, 9.0, 1.0);
        struct pairs_point *points = ARENA_NEW(arena, count, struct pairs_point);
        for (size_t i = 0; i < count; i++) {
            double after = i % 7 == 3 ? (double)NAN : before[i].value + change[i].value;
            points[i] = (struct pairs_point){before[i].participant, before[i].value, after, i % 23 == 5};
        }
        panel[p] = (struct pairs_panel){.arm = letters[p],
            .mark = palette_arm(true, p),
            .counts = arena_format(arena, "%zu pairs, %zu without follow-up", count - count / 7, count / 7),
            .points = points,
            .point_count = count,
            .median_before = 152.0,
            .median_after = 144.0};
    }
    struct pairs pairs = {.axis = {.low = NAN,
                              .high = NAN,
                              .null_line = NAN,
                              .title = "Systolic pressure, mmHg",
                              .lower = "better: lower pressure",
                              .upper = "higher pressure"},
        .decimals = 1,
        .before = "baseline",
        .after = "26 weeks",
        .panels = panel,
        .panel_count = panels};
    pairs_svg(&pairs, figure, html);
}

static void pairs_lines(struct arena *arena, const struct figure *figure, struct html *html) {
    draw_pairs(arena, 2, 70, figure, html);
}

static void pairs_four(struct arena *arena, const struct figure *figure, struct html *html) {
    draw_pairs(arena, 4, 40, figure, html);
}

static void pairs_scatter(struct arena *arena, const struct figure *figure, struct html *html) {
    draw_pairs(arena, 2, 120, figure, html);
}

static void draw_grid_of(
    struct arena *arena, size_t blocks, size_t count, const struct figure *figure, struct html *html) {
    static const struct grid_variable variables[] = {{"Sex", "sex", NULL}, {"Age", "age", NULL}, {"BMI", "bmi", NULL},
        {"Pressure, baseline", "p0", NULL}, {"Pressure, 8 weeks", "p8", NULL}, {"Pressure, 26 weeks", "p26", NULL},
        {"Albumin ratio, baseline", "a0", NULL}, {"Albumin ratio, 8 weeks", "a8", NULL},
        {"Albumin ratio, 26 weeks", "a26", NULL}, {"Stopped treatment before the planned end", "stop", NULL}};
    enum { VARIABLES = sizeof variables / sizeof *variables };
    uint64_t seed = 11;
    struct grid_block *block = ARENA_NEW(arena, blocks, struct grid_block);
    for (size_t b = 0; b < blocks; b++) {
        const char **participants = ARENA_NEW(arena, count, const char *);
        unsigned char *states = ARENA_NEW(arena, count * VARIABLES, unsigned char);
        for (size_t i = 0; i < count; i++) {
            participants[i] = arena_format(arena, "Q%zu%04zu", b, i);
            size_t leaves = uniform(&seed) < 0.2 ? (size_t)(3.0 + 6.0 * uniform(&seed)) : VARIABLES;
            for (size_t v = 0; v < VARIABLES; v++) {
                unsigned char reason = (unsigned char)(1.0 + 8.0 * uniform(&seed));
                states[i * VARIABLES + v] = v >= leaves ? GRID_AFTER_EVENT : uniform(&seed) < 0.03 ? reason : 0;
            }
        }
        block[b] = (struct grid_block){
            blocks > 1 ? (b ? "Arm B" : "Arm A") : NULL, palette_arm(true, b), participants, count, states};
    }
    struct grid grid = {variables, VARIABLES, block, blocks};
    grid_svg(&grid, figure, html);
}

static void grid_by_arm(struct arena *arena, const struct figure *figure, struct html *html) {
    draw_grid_of(arena, 2, 120, figure, html);
}

static void grid_small(struct arena *arena, const struct figure *figure, struct html *html) {
    draw_grid_of(arena, 1, 24, figure, html);
}

static void grid_many(struct arena *arena, const struct figure *figure, struct html *html) {
    draw_grid_of(arena, 2, 2500, figure, html);
}

static void flow_of_arms(struct arena *arena, size_t arms, const struct figure *figure, struct html *html) {
    static const struct flow_exclusion aside[] = {{"repeated record held aside", 1}};
    static const struct flow_exclusion left[] = {
        {"withdrew consent", 9}, {"moved away", 4}, {"could not be reached at any of three attempts", 6}};
    static const struct flow_arm names[] = {{"A", NULL}, {"B", NULL}, {"C", NULL}};
    struct flow_arm *named = ARENA_NEW(arena, 3, struct flow_arm);
    struct flow_box *boxes = ARENA_NEW(arena, 9, struct flow_box);
    for (size_t a = 0; a < 3; a++) {
        named[a] = (struct flow_arm){names[a].label, palette_arm(true, a)};
        boxes[a].count = 120 - a;
        boxes[3 + a] = (struct flow_box){118 - a, left, a == 2 ? 1 : 3};
        boxes[6 + a].count = 99 - a;
    }
    const struct flow_stage stages[] = {
        {.label = "records received", .total = {241, aside, 1}},
        {.label = "randomised", .total = {.count = 240}},
        {.label = "in this arm", .total = {.count = 240}, .arms = arms ? boxes : NULL},
        {.label = "with a baseline value", .total = {236, left, 3}, .arms = arms ? boxes + 3 : NULL},
        {.label = "analysed at 26 weeks, full analysis set", .total = {.count = 198}, .arms = arms ? boxes + 6 : NULL},
    };
    struct flow flow = {named, arms, stages, 5};
    flow_svg(&flow, figure, html);
}

static void flow_two(struct arena *arena, const struct figure *figure, struct html *html) {
    flow_of_arms(arena, 2, figure, html);
}

static void flow_three(struct arena *arena, const struct figure *figure, struct html *html) {
    flow_of_arms(arena, 3, figure, html);
}

static void flow_pooled(struct arena *arena, const struct figure *figure, struct html *html) {
    flow_of_arms(arena, 0, figure, html);
}

static void bars_levels(struct arena *arena, const struct figure *figure, struct html *html) {
    (void)arena;
    static const struct bars_level levels[] = {{"Female", 117, false}, {"Male", 121, false},
        {"not recorded at all", 0, false},
        {"a level whose name is much longer than anyone would wish for in a column of labels", 1, false},
        {"missing", 2, true}};
    struct bars bars = {"Sex, 241 records", levels, sizeof levels / sizeof *levels};
    bars_svg(&bars, figure, html);
}

static void bars_none(struct arena *arena, const struct figure *figure, struct html *html) {
    (void)arena;
    static const struct bars_level levels[] = {{"missing", 0, true}};
    struct bars bars = {NULL, levels, 1};
    bars_svg(&bars, figure, html);
}

/* Nothing to draw, and numbers that are none, must still give a figure. */
static void empty_boxes(struct arena *arena, const struct figure *figure, struct html *html) {
    (void)arena;
    const struct boxes boxes = {.axis = {.low = NAN, .high = NAN, .null_line = NAN}};
    boxes_svg(&boxes, figure, html);
}

static void odd_boxes(struct arena *arena, const struct figure *figure, struct html *html) {
    (void)arena;
    const struct figure_point points[] = {
        {"Q1", NAN, false}, {"Q2", INFINITY, true}, {"Q3", -1e300, true}, {NULL, 0.0, true}};
    const struct boxes_row row = {.mark = palette_pooled(),
        .low_whisker = NAN,
        .low_quartile = NAN,
        .median = NAN,
        .mean = NAN,
        .high_quartile = NAN,
        .high_whisker = NAN,
        .points = points,
        .point_count = 4};
    const struct boxes_group group = {.rows = &row, .row_count = 1};
    struct boxes boxes = {
        .axis = {.scale = AXIS_LOG10, .low = NAN, .high = NAN, .null_line = 1.0}, .groups = &group, .group_count = 1};
    boxes_svg(&boxes, figure, html);
}

static void empty_estimates(struct arena *arena, const struct figure *figure, struct html *html) {
    (void)arena;
    static const struct estimates_row row = {.label = "x", .estimate = NAN, .low = NAN, .high = INFINITY};
    const struct estimates estimates = {.axis = {.low = NAN, .high = NAN, .null_line = NAN},
        .band_low = NAN,
        .band_high = NAN,
        .rows = &row,
        .row_count = 1};
    estimates_svg(&estimates, figure, html);
}

static void empty_histogram(struct arena *arena, const struct figure *figure, struct html *html) {
    (void)arena;
    const struct histogram_panel panel = {.axis = {.low = NAN, .high = NAN, .null_line = NAN},
        .row = {.mark = palette_pooled(), .sentence = "No value was observed."}};
    const struct histogram histogram = {.panels = &panel, .panel_count = 1};
    histogram_svg(&histogram, figure, html);
}

static void empty_pairs(struct arena *arena, const struct figure *figure, struct html *html) {
    (void)arena;
    const struct pairs_panel panel = {.mark = palette_pooled(), .median_before = NAN, .median_after = NAN};
    const struct pairs pairs = {.axis = {.low = NAN, .high = NAN}, .panels = &panel, .panel_count = 1};
    pairs_svg(&pairs, figure, html);
}

static void empty_grid(struct arena *arena, const struct figure *figure, struct html *html) {
    (void)arena;
    static const struct grid_variable variable = {"Sex", "sex", NULL};
    static const struct grid_block block = {.label = "A"};
    const struct grid grid = {&variable, 1, &block, 1};
    grid_svg(&grid, figure, html);
}

static const struct example examples[] = {
    {"boxes-sex", boxes_by_sex},
    {"boxes-three", boxes_three_arms},
    {"boxes-crowded", boxes_crowded},
    {"boxes-strips", boxes_strips},
    {"boxes-tied", boxes_tied},
    {"boxes-awkward", boxes_awkward},
    {"estimates-effect", estimates_effect},
    {"estimates-ratios", estimates_ratios},
    {"histogram-both", histogram_both},
    {"histogram-many", histogram_many},
    {"pairs-lines", pairs_lines},
    {"pairs-four", pairs_four},
    {"pairs-scatter", pairs_scatter},
    {"grid-by-arm", grid_by_arm},
    {"grid-small", grid_small},
    {"grid-many", grid_many},
    {"flow-two", flow_two},
    {"flow-three", flow_three},
    {"flow-pooled", flow_pooled},
    {"bars-levels", bars_levels},
    {"bars-none", bars_none},
    {"boxes-empty", empty_boxes},
    {"boxes-odd", odd_boxes},
    {"estimates-empty", empty_estimates},
    {"histogram-empty", empty_histogram},
    {"pairs-empty", empty_pairs},
    {"grid-empty", empty_grid},
};

enum { EXAMPLES = sizeof examples / sizeof *examples };
#endif
