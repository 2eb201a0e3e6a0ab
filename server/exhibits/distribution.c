/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Distribution and scale: one variable of all participants together, a number on the linear and the log10 scale side by
 * side, a category by its levels. Nothing here knows the arms. */
#include "exhibits/ledger.h"
#include "exhibits/list.h"
#include "exhibits/words.h"
#include "draw/bars.h"
#include "draw/histogram.h"
#include "stats/describe.h"
#include <math.h>

static const double UNKNOWN = NAN;
enum { SCALES = 2 };

/* A number on one scale: every number here is of the values on that scale. */
struct side {
    enum scale scale;
    size_t n, not_on_scale;
    size_t *participant; /* [n] in identifier order */
    double *value;       /* [n] */
    struct description numbers;
    struct interval whiskers;
    struct fences fences;
    struct adjusted_fences adjusted;
    struct shapiro_wilk shapiro;
    struct bins bins;
    size_t beyond; /* values outside the inner fences */
};

struct distribution_result {
    struct members members;
    size_t n, state[CELL_STATE_COUNT]; /* members by what their cell holds */
    struct side side[SCALES];          /* of a number, indexed by enum scale */
    size_t side_count;                 /* 1 where no value has a place on log10 */
    const struct level *levels;        /* of a category or an event */
    size_t level_count;
    size_t *level; /* [level_count] */
};

static const struct variable *variable_of(const struct view *view) {
    return &view->frame->plan->variables[view->variable];
}

static const struct distribution_result *result_of(const struct view *view) {
    return view->result;
}

static const struct side *chosen(const struct view *view) {
    return &result_of(view)->side[view->scale];
}

/* ---- computing ---- */

static bool is_beyond(const struct side *side, double value) {
    return value < side->fences.inner.low || value > side->fences.inner.high;
}

static void take_side(const struct view *view, struct distribution_result *result, enum scale scale) {
    const double *number = view->frame->columns[view->variable]->number;
    struct side *side = &result->side[scale];
    *side = (struct side){.scale = scale,
        .participant = ARENA_NEW(view->arena, result->n, size_t),
        .value = ARENA_NEW(view->arena, result->n, double)};
    for (size_t i = 0; i < result->members.count; i++) {
        size_t p = result->members.participant[i];
        double value = on_scale(scale, number[p]);
        if (!isnan(value)) {
            side->participant[side->n] = p;
            side->value[side->n++] = value;
        }
    }
    side->not_on_scale = result->n - side->n;
    const double *sorted = sorted_copy(view->arena, side->value, side->n);
    side->numbers = describe(sorted, side->n);
    side->whiskers = whiskers(sorted, side->n);
    side->fences = tukey_fences(sorted, side->n);
    side->adjusted = adjusted_fences(sorted, side->n);
    side->shapiro = shapiro_wilk(sorted, side->n);
    side->bins = nice_bins(sorted, side->n);
    for (size_t i = 0; i < side->n; i++) {
        side->beyond += is_beyond(side, side->value[i]);
    }
}

static void count_levels(const struct view *view, struct distribution_result *result) {
    const int32_t *level = view->frame->columns[view->variable]->level;
    result->level = ARENA_NEW(view->arena, result->level_count, size_t);
    for (size_t i = 0; i < result->members.count; i++) {
        int32_t here = level[result->members.participant[i]];
        if (here != NOWHERE) {
            result->level[here]++;
        }
    }
}

static void choose_scale(struct view *view) {
    const struct variable *what = variable_of(view);
    const char *asked = view_asked(view, "scale");
    if ((!asked || !*asked) && what->outcome != NOWHERE) {
        view->scale = view->frame->scales[what->outcome];
    }
    if (what->kind != VARIABLE_NUMBER) {
        view->scale = SCALE_LINEAR;
        if (asked && *asked) {
            view_note(view, "A category has no scale, so scale= is not used.");
        }
    }
}

/* "blank 36, code for missing 2", or "none". */
static const char *reason_words(const struct view *view, const struct distribution_result *result) {
    struct text text;
    text_init(&text);
    for (int state = CELL_OBSERVED + 1; state < CELL_STATE_COUNT; state++) {
        if (result->state[state]) {
            text_format(&text, "%s%s %zu", *text.data ? ", " : "", cell_state_words((enum cell_state)state),
                result->state[state]);
        }
    }
    const char *words = *text.data ? arena_text(view->arena, text.data) : "none";
    text_release(&text);
    return words;
}

static const char *caption_of(const struct view *view, const struct distribution_result *result) {
    const char *head = arena_format(view->arena, "%s of %s of the %s have a value; missing: %s.",
        arena_format(view->arena, "%zu", result->n), count_words(view, result->members.count, "participant"),
        set_words(view->set), reason_words(view, result));
    if (result->levels) {
        return arena_format(view->arena, "%s Percentages are of those with a value.", head);
    }
    const char *off = "";
    if (result->side[SCALE_LOG10].not_on_scale) {
        off = arena_format(view->arena, " %s not positive and so without a place on log10.",
            count_words(view, result->side[SCALE_LOG10].not_on_scale, "value"));
    }
    return arena_format(view->arena,
        "%s%s The chosen scale is %s. Values beyond the inner fences (1.5 times the "
        "interquartile range from the quartiles, on each panel's scale) are filled and named.",
        head, off, scale_name(view->scale));
}

static bool compute(struct view *view, struct fault *fault) {
    if (variable_of(view)->kind == VARIABLE_DATE) {
        return fault_set(fault, FAULT_INPUT, "distribution: %.60s is a date and has no distribution here; the exhibit dates shows it",
            variable_of(view)->column);
    }
    struct distribution_result *result = ARENA_NEW(view->arena, 1, struct distribution_result);
    const unsigned char *state = view->frame->columns[view->variable]->state;
    choose_scale(view);
    members_take(&result->members, view, MEMBERS_ALL);
    for (size_t i = 0; i < result->members.count; i++) {
        result->state[state[result->members.participant[i]]]++;
    }
    result->n = result->state[CELL_OBSERVED];
    result->levels = levels_of(view->frame, view->variable, &result->level_count);
    if (result->levels) {
        count_levels(view, result);
    } else {
        take_side(view, result, SCALE_LINEAR);
        take_side(view, result, SCALE_LOG10);
        result->side_count = result->side[SCALE_LOG10].n ? 2 : 1;
    }
    members_note(view, &result->members);
    view->caption = caption_of(view, result);
    view->result = result;
    return true;
}

static void title_of(const struct view *view, struct text *title) {
    const struct plan *plan = view->frame->plan;
    const struct variable *what = variable_of(view);
    if (what->outcome != NOWHERE) {
        const struct outcome *outcome = &plan->outcomes[what->outcome];
        text_format(title, "How is %s at %s distributed?", lower_first(view, outcome->label),
            lower_first(view, outcome->visits[what->visit].label));
    } else if (what->kind == VARIABLE_EVENT) {
        text_format(title, "How often is it recorded: %s?", lower_first(view, what->label));
    } else {
        text_format(title, "How is %s distributed?", lower_first(view, what->label));
    }
}

/* ---- JSON ---- */

static void beyond_json(const struct view *view, const struct side *side, struct json *json) {
    const double *number = view->frame->columns[view->variable]->number;
    json_key_array(json, "beyond");
    for (size_t i = 0; i < side->n; i++) {
        if (is_beyond(side, side->value[i])) {
            json_object(json);
            json_field_string(json, "participant", view->frame->participants[side->participant[i]].id);
            json_field_number(json, "value", side->value[i]);
            json_field_number(json, "recorded", number[side->participant[i]]);
            json_close(json);
        }
    }
    json_close(json);
}

static void bins_json(const struct bins *bins, struct json *json) {
    json_key_array(json, "bins");
    for (size_t i = 0; i < bins->count; i++) {
        json_object(json);
        json_field_number(json, "from", bins->limits[i]);
        json_field_number(json, "to", bins->limits[i + 1]);
        json_field_integer(json, "count", (int64_t)bins->counts[i]);
        json_close(json);
    }
    json_close(json);
}

static void fences_json(const struct side *side, struct json *json) {
    json_key_object(json, "shapiro_wilk");
    json_field_string(json, "status", status_name(side->shapiro.status));
    json_field_number(json, "w", side->shapiro.w);
    json_field_number(json, "p", side->shapiro.p);
    json_close(json);
    json_key_object(json, "fences");
    interval_json(json, "inner", side->fences.inner.low, side->fences.inner.high);
    interval_json(json, "outer", side->fences.outer.low, side->fences.outer.high);
    json_close(json);
    json_key_object(json, "adjusted_fences");
    json_field_number(json, "medcouple", side->adjusted.medcouple);
    interval_json(json, "fences", side->adjusted.fences.low, side->adjusted.fences.high);
    json_close(json);
}

static void side_json(const struct view *view, const struct side *side, struct json *json) {
    const struct description *numbers = &side->numbers;
    json_field_string(json, "scale", scale_name(side->scale));
    json_field_integer(json, "n", (int64_t)side->n);
    json_field_integer(json, "not_on_scale", (int64_t)side->not_on_scale);
    json_field_number(json, "mean", numbers->mean);
    json_field_number(json, "sd", numbers->sd);
    json_field_number(json, "minimum", numbers->minimum);
    json_field_number(json, "lower_quartile", numbers->lower_quartile);
    json_field_number(json, "median", numbers->median);
    json_field_number(json, "upper_quartile", numbers->upper_quartile);
    json_field_number(json, "maximum", numbers->maximum);
    json_field_number(json, "skewness", numbers->skewness);
    if (side->scale == SCALE_LOG10) {
        json_field_number(json, "geometric_mean", pow(10, numbers->mean));
    }
    fences_json(side, json);
    beyond_json(view, side, json);
    bins_json(&side->bins, json);
}

static void levels_json(const struct distribution_result *result, struct json *json) {
    json_field_integer(json, "n", (int64_t)result->n);
    json_key_array(json, "levels");
    for (size_t l = 0; l < result->level_count; l++) {
        json_object(json);
        json_field_string(json, "level", result->levels[l].code);
        json_field_string(json, "label", result->levels[l].label);
        json_field_integer(json, "n", (int64_t)result->level[l]);
        json_field_number(json, "percent", result->n ? 100 * (double)result->level[l] / (double)result->n : UNKNOWN);
        json_close(json);
    }
    json_close(json);
}

static void json(const struct view *view, struct json *json) {
    const struct distribution_result *result = result_of(view);
    const struct variable *what = variable_of(view);
    json_field_string(json, "variable", what->column);
    json_field_string(json, "label", what->label);
    json_field_string(json, "unit", what->unit);
    json_field_string(json, "kind", result->levels ? "category" : "number");
    json_field_integer(json, "missing", (int64_t)(result->members.count - result->n));
    json_key_object(json, "reasons");
    for (int state = CELL_OBSERVED + 1; state < CELL_STATE_COUNT; state++) {
        if (result->state[state]) {
            json_field_integer(json, cell_state_name((enum cell_state)state), (int64_t)result->state[state]);
        }
    }
    json_close(json);
    if (result->levels) {
        levels_json(result, json);
    } else {
        side_json(view, chosen(view), json);
    }
}

/* ---- tables ---- */

static double mean_of(const struct side *side) {
    return side->numbers.mean;
}
static double geometric_mean_of(const struct side *side) {
    return side->scale == SCALE_LOG10 ? pow(10, side->numbers.mean) : UNKNOWN;
}
static double sd_of(const struct side *side) {
    return side->numbers.sd;
}
static double minimum_of(const struct side *side) {
    return side->numbers.minimum;
}
static double lower_quartile_of(const struct side *side) {
    return side->numbers.lower_quartile;
}
static double median_of(const struct side *side) {
    return side->numbers.median;
}
static double upper_quartile_of(const struct side *side) {
    return side->numbers.upper_quartile;
}
static double maximum_of(const struct side *side) {
    return side->numbers.maximum;
}
static double skewness_of(const struct side *side) {
    return side->numbers.skewness;
}
static double inner_low_of(const struct side *side) {
    return side->fences.inner.low;
}
static double inner_high_of(const struct side *side) {
    return side->fences.inner.high;
}
static double outer_low_of(const struct side *side) {
    return side->fences.outer.low;
}
static double outer_high_of(const struct side *side) {
    return side->fences.outer.high;
}
static double medcouple_of(const struct side *side) {
    return side->adjusted.medcouple;
}
static double adjusted_low_of(const struct side *side) {
    return side->adjusted.fences.low;
}
static double adjusted_high_of(const struct side *side) {
    return side->adjusted.fences.high;
}
static double w_of(const struct side *side) {
    return side->shapiro.w;
}
static double p_of(const struct side *side) {
    return side->shapiro.p;
}

/* What a row of the table is a number of: decides how it is written. */
enum written { WRITTEN_ON_SCALE, WRITTEN_IN_UNIT, WRITTEN_PLAIN, WRITTEN_P };

static const struct statistic {
    const char *label;
    double (*of)(const struct side *side);
    enum written written;
} statistics[] = {
    {"Mean", mean_of, WRITTEN_ON_SCALE},
    {"Geometric mean, in the unit", geometric_mean_of, WRITTEN_IN_UNIT},
    {"SD", sd_of, WRITTEN_ON_SCALE},
    {"Minimum", minimum_of, WRITTEN_ON_SCALE},
    {"Lower quartile", lower_quartile_of, WRITTEN_ON_SCALE},
    {"Median", median_of, WRITTEN_ON_SCALE},
    {"Upper quartile", upper_quartile_of, WRITTEN_ON_SCALE},
    {"Maximum", maximum_of, WRITTEN_ON_SCALE},
    {"Skewness", skewness_of, WRITTEN_PLAIN},
    {"Inner fence, low", inner_low_of, WRITTEN_ON_SCALE},
    {"Inner fence, high", inner_high_of, WRITTEN_ON_SCALE},
    {"Outer fence, low", outer_low_of, WRITTEN_ON_SCALE},
    {"Outer fence, high", outer_high_of, WRITTEN_ON_SCALE},
    {"Medcouple", medcouple_of, WRITTEN_PLAIN},
    {"Fence for skewed data, low", adjusted_low_of, WRITTEN_ON_SCALE},
    {"Fence for skewed data, high", adjusted_high_of, WRITTEN_ON_SCALE},
    {"Shapiro-Wilk W", w_of, WRITTEN_PLAIN},
    {"Shapiro-Wilk p", p_of, WRITTEN_P},
};

static int scale_decimals(const struct view *view, enum scale scale) {
    enum { LOG_DECIMALS = 3 };
    return scale == SCALE_LOG10 ? LOG_DECIMALS : variable_decimals(view, view->variable);
}

static void put_statistic(
    const struct view *view, struct table *table, const struct statistic *row, const struct side *side) {
    enum { PLAIN_DECIMALS = 3 };
    double value = row->of(side);
    if (row->written == WRITTEN_P) {
        table_put_text(table, p_words(view, value));
    } else {
        table_put_number(table, value,
            row->written == WRITTEN_PLAIN     ? PLAIN_DECIMALS
            : row->written == WRITTEN_IN_UNIT ? scale_decimals(view, SCALE_LINEAR)
                                              : scale_decimals(view, side->scale));
    }
}

static void count_row(const struct distribution_result *result, struct table *table, const char *label, size_t linear,
    size_t log10_count) {
    table_row(table);
    table_put_header(table, label);
    table_put_count(table, (int64_t)linear);
    if (result->side_count > 1) {
        table_put_count(table, (int64_t)log10_count);
    }
}

static struct table *number_table(const struct view *view, const struct distribution_result *result) {
    const struct side *side = result->side;
    const struct variable *what = variable_of(view);
    struct table *table = table_new(view->arena, "Numbers on both scales");
    size_t missing = result->members.count - result->n;
    table_column(table, "statistic", "Statistic", NULL, TABLE_WORDS);
    table_column(
        table, "linear", view->scale == SCALE_LINEAR ? "Linear (chosen)" : "Linear", what->unit, TABLE_NUMBERS);
    if (result->side_count > 1) {
        table_column(table, "log10", view->scale == SCALE_LOG10 ? "Log10 (chosen)" : "Log10",
            what->unit && *what->unit ? arena_format(view->arena, "log10 of %s", what->unit) : NULL, TABLE_NUMBERS);
    }
    count_row(result, table, "Values", side[SCALE_LINEAR].n, side[SCALE_LOG10].n);
    count_row(result, table, "Missing", missing, missing);
    count_row(result, table, "Not positive, no place on log10", 0, side[SCALE_LOG10].not_on_scale);
    for (size_t i = 0; i < sizeof statistics / sizeof *statistics; i++) {
        bool log_only = statistics[i].written == WRITTEN_IN_UNIT;
        if (log_only && result->side_count == 1) {
            continue;
        }
        table_row(table);
        table_put_header(table, statistics[i].label);
        for (size_t s = 0; s < result->side_count; s++) {
            put_statistic(view, table, &statistics[i], &side[s]);
        }
    }
    count_row(result, table, "Values beyond the inner fences", side[SCALE_LINEAR].beyond, side[SCALE_LOG10].beyond);
    table_note(table, "Shapiro-Wilk describes these values; neither the scale nor a method is chosen by it. The "
                      "analysis asks for residuals "
                      "of its model, not values, to be near normal.");
    return table;
}

static struct table *beyond_table(const struct view *view, const struct distribution_result *result) {
    const double *number = view->frame->columns[view->variable]->number;
    const struct side *linear = &result->side[SCALE_LINEAR], *log = &result->side[SCALE_LOG10];
    int decimals = variable_decimals(view, view->variable) - 1;
    struct table *table = table_new(view->arena, "Values beyond the inner fences, and on which scale");
    table_column(table, "participant", "Participant", NULL, TABLE_WORDS);
    table_column(table, "value", "Value", variable_of(view)->unit, TABLE_NUMBERS);
    table_column(table, "linear", "Linear", NULL, TABLE_WORDS);
    table_column(table, "log10", "Log10", NULL, TABLE_WORDS);
    for (size_t i = 0; i < linear->n; i++) {
        size_t p = linear->participant[i];
        double on_log = on_scale(SCALE_LOG10, number[p]);
        bool beyond_linear = is_beyond(linear, number[p]), beyond_log = !isnan(on_log) && is_beyond(log, on_log);
        if (!beyond_linear && !beyond_log) {
            continue;
        }
        const char *id = view->frame->participants[p].id;
        table_row(table);
        table_row_opens(table, id);
        table_put_header(table, id);
        table_put_number(table, number[p], decimals);
        table_cell_opens(table, id, variable_of(view)->column);
        table_put_text(table, beyond_linear ? "beyond" : "within");
        table_put_text(table, isnan(on_log) ? "no place" : beyond_log ? "beyond" : "within");
    }
    return table;
}

static struct table *level_table(const struct view *view, const struct distribution_result *result) {
    struct table *table = table_new(view->arena, "How often each level occurs");
    table_column(table, "level", variable_label(view, view->variable), NULL, TABLE_WORDS);
    table_column(table, "n", "n", NULL, TABLE_NUMBERS);
    table_column(table, "percent", "Percent", "of those with a value", TABLE_NUMBERS);
    for (size_t l = 0; l < result->level_count; l++) {
        table_row(table);
        table_put_header(table, level_words(view, view->variable, l));
        table_put_count(table, (int64_t)result->level[l]);
        table_put_number(
            table, result->n ? 100 * (double)result->level[l] / (double)result->n : UNKNOWN, result->n < 100 ? 0 : 1);
    }
    return table;
}

static struct table *reason_table(const struct view *view, const struct distribution_result *result) {
    struct table *table = table_new(view->arena, "Why there is no observed value");
    table_column(table, "reason", "Reason", NULL, TABLE_WORDS);
    table_column(table, "n", "n", NULL, TABLE_NUMBERS);
    for (int state = CELL_OBSERVED + 1; state < CELL_STATE_COUNT; state++) {
        if (result->state[state]) {
            table_row(table);
            table_put_header(table, cell_state_words((enum cell_state)state));
            table_put_count(table, (int64_t)result->state[state]);
        }
    }
    return table;
}

static void tables(const struct view *view, struct table **tables, size_t *count) {
    const struct distribution_result *result = result_of(view);
    tables[(*count)++] = result->levels ? level_table(view, result) : number_table(view, result);
    if (!result->levels && (result->side[SCALE_LINEAR].beyond || result->side[SCALE_LOG10].beyond)) {
        tables[(*count)++] = beyond_table(view, result);
    }
    if (result->n < result->members.count) {
        tables[(*count)++] = reason_table(view, result);
    }
}

/* ---- the figure ---- */

static double in_unit(enum scale scale, double value) {
    return scale == SCALE_LOG10 ? pow(10, value) : value;
}

static struct boxes_row row_of(const struct view *view, const struct side *side) {
    const double *number = view->frame->columns[view->variable]->number;
    struct figure_point *points = ARENA_NEW(view->arena, side->n, struct figure_point);
    for (size_t i = 0; i < side->n; i++) {
        points[i] = (struct figure_point){view->frame->participants[side->participant[i]].id,
            number[side->participant[i]], is_beyond(side, side->value[i])};
    }
    const struct description *numbers = &side->numbers;
    enum scale scale = side->scale;
    return (struct boxes_row){.mark = palette_pooled(),
        .sentence = side->n ? NULL : "No values.",
        .low_whisker = in_unit(scale, side->whiskers.low),
        .low_quartile = in_unit(scale, numbers->lower_quartile),
        .median = in_unit(scale, numbers->median),
        .mean = in_unit(scale, numbers->mean),
        .high_quartile = in_unit(scale, numbers->upper_quartile),
        .high_whisker = in_unit(scale, side->whiskers.high),
        .points = points,
        .point_count = side->n};
}

static struct histogram_panel panel_of(const struct view *view, const struct side *side) {
    const struct distribution_result *result = result_of(view);
    const struct variable *what = variable_of(view);
    struct histogram_bin *bins = ARENA_NEW(view->arena, side->bins.count, struct histogram_bin);
    for (size_t i = 0; i < side->bins.count; i++) {
        bins[i] = (struct histogram_bin){in_unit(side->scale, side->bins.limits[i]),
            in_unit(side->scale, side->bins.limits[i + 1]), side->bins.counts[i]};
    }
    const char *title = arena_format(view->arena, "%s%s%s scale%s", what->unit ? what->unit : "",
        what->unit && *what->unit ? ", " : "", scale_name(side->scale), side->scale == view->scale ? " (chosen)" : "");
    const char *off = side->not_on_scale ? arena_format(view->arena, ", %zu not positive", side->not_on_scale) : "";
    return (struct histogram_panel){.axis = {.scale = side->scale == SCALE_LOG10 ? AXIS_LOG10 : AXIS_LINEAR,
                                        .low = UNKNOWN,
                                        .high = UNKNOWN,
                                        .title = title,
                                        .null_line = UNKNOWN},
        .counts = arena_format(view->arena, "%zu of %zu have a value here%s", side->n, result->members.count, off),
        .bins = bins,
        .bin_count = side->bins.count,
        .row = row_of(view, side)};
}

static size_t ranges_of(const struct view *view, struct histogram_range ranges[2]) {
    const struct variable *what = variable_of(view);
    const struct {
        const char *word;
        const struct range *range;
    } both[] = {{"plausible", &what->plausible}, {"eligible", &what->eligible}};
    size_t count = 0;
    for (size_t i = 0; i < 2; i++) {
        if (both[i].range->given) {
            ranges[count++] = (struct histogram_range){
                arena_format(view->arena, "%s %.15g to %.15g", both[i].word, both[i].range->low, both[i].range->high),
                both[i].range->low, both[i].range->high};
        }
    }
    return count;
}

static void draw_numbers(const struct view *view, const struct figure *figure, struct html *html) {
    const struct distribution_result *result = result_of(view);
    struct histogram_panel panels[SCALES];
    struct histogram_range ranges[2];
    for (size_t s = 0; s < result->side_count; s++) {
        panels[s] = panel_of(view, &result->side[s]);
    }
    struct histogram histogram = {.decimals = variable_decimals(view, view->variable),
        .panels = panels,
        .panel_count = result->side_count,
        .ranges = ranges,
        .range_count = ranges_of(view, ranges)};
    histogram_svg(&histogram, figure, html);
}

static void draw_levels(const struct view *view, const struct figure *figure, struct html *html) {
    const struct distribution_result *result = result_of(view);
    size_t missing = result->members.count - result->n;
    struct bars_level *levels = ARENA_NEW(view->arena, result->level_count + 1, struct bars_level);
    for (size_t l = 0; l < result->level_count; l++) {
        levels[l] = (struct bars_level){level_words(view, view->variable, l), result->level[l], false};
    }
    levels[result->level_count] = (struct bars_level){"missing", missing, true};
    struct bars bars = {.title = arena_format(view->arena, "%s, %s", variable_label(view, view->variable),
                            count_words(view, result->members.count, "participant")),
        .levels = levels,
        .level_count = result->level_count + (missing > 0)};
    bars_svg(&bars, figure, html);
}

static void figure(const struct view *view, const struct figure *figure, struct html *html) {
    if (result_of(view)->levels) {
        draw_levels(view, figure, html);
    } else {
        draw_numbers(view, figure, html);
    }
}

static void lead(const struct view *view, struct html *html) {
    const struct distribution_result *result = result_of(view);
    if (!result->n) {
        html_text(html, "No participant has a value.");
    } else if (result->levels) {
        size_t most = 0;
        for (size_t l = 1; l < result->level_count; l++) {
            most = result->level[l] > result->level[most] ? l : most;
        }
        html_format(html, "Most often %s: ", level_words(view, view->variable, most));
        html_element(html, "strong", NULL, part_of_words(view, result->level[most], result->n));
    } else {
        const struct description *numbers = &result->side[SCALE_LINEAR].numbers;
        int decimals = variable_decimals(view, view->variable);
        const char *unit = unit_after(view, variable_of(view)->unit);
        html_text(html, "Median ");
        html_element(html, "strong", NULL,
            arena_format(view->arena, "%s%s", decimal_words(view, numbers->median, decimals), unit));
        html_format(html, ", the middle half from %s%s",
            interval_words(view, numbers->lower_quartile, numbers->upper_quartile, decimals), unit);
    }
}

static const struct argument_rule arguments[] = {
    {"variable", ARGUMENT_VARIABLE, "a column of the plan; default the primary outcome's baseline", NULL, true},
    {"scale", ARGUMENT_SCALE,
        "linear or log10: which the numbers of the JSON are of; default the outcome's latest decision, else its plan, "
        "else linear",
        NULL, false},
    {0}};

const struct exhibit exhibit_distribution = {
    .name = "distribution",
    .item = 4,
    .title = "How are the values distributed?",
    .tab = "Distribution",
    .says = "One variable of all participants: histogram, box, numbers and fences, linear and log10 side by side; "
            "levels of a category",
    .pooled = SHOWN,
    .method = "All participants together, whatever their arm: the scale is chosen before arms are compared.\n"
              "SD with divisor n \xE2\x88\x92 1; quartiles of type 7 (Hyndman & Fan 1996); skewness m3 / m2^1.5. "
              "Fences lie 1.5 (inner) and 3 "
              "(outer) interquartile ranges from the quartiles (Tukey 1977); for skewed data they are moved by the "
              "medcouple (Brys, Hubert & "
              "Struyf 2004; Hubert & Vandervieren 2008). About 0.7% of normal values lie beyond the inner fences, more "
              "in small samples: "
              "beyond is not wrong.\n"
              "Bins by Freedman & Diaconis (1981), at least Sturges' number. Shapiro-Wilk by Royston (1995). On log10 "
              "the mean is the log10 "
              "of the geometric mean; values that are not positive have no place there and nothing is added to them.",
    .arguments = arguments,
    .compute = compute,
    .json = json,
    .tables = tables,
    .figure = figure,
    .lead = lead,
    .title_of = title_of,
};
