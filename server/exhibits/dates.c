/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Dates: for each visit with one, the days from randomisation, and how many lie in the planned window. */
#include "draw/boxes.h"
#include "exhibits/ledger.h"
#include "exhibits/list.h"
#include "exhibits/words.h"
#include "stats/describe.h"
#include <math.h>
#include <string.h>

struct dates_cell { /* one arm at one visit */
    size_t n, dated, in_window, early,
        late; /* n: members of the arm; dated: with both dates; the last three of those */
    struct description summary;
    struct interval whiskers;
    struct figure_point *points; /* [dated] in identifier order */
};

struct dates_result {
    struct members members;
    const struct dates *dates; /* NULL where the plan has none */
    const struct moment **visits;
    size_t visit_count;
    struct dates_cell *cells; /* [visits * arms] */
};

static const double *days_of(const struct view *view, const struct moment *moment) {
    return view->frame->columns[moment->variable]->number;
}

static void place_in_window(struct dates_cell *cell, const struct moment *moment, double days) {
    double off = days - moment->target;
    cell->early += off < moment->window.low;
    cell->late += off > moment->window.high;
    cell->in_window += off >= moment->window.low && off <= moment->window.high;
}

static void fill_cell(struct dates_cell *cell, const struct view *view, const struct dates_result *result,
    const struct moment *moment, size_t arm) {
    const struct members *members = &result->members;
    const double *randomised = days_of(view, &result->dates->moments[result->dates->randomised]),
                 *visit = days_of(view, moment);
    double *values = ARENA_NEW(view->arena, members->count, double);
    cell->points = ARENA_NEW(view->arena, members->count, struct figure_point);
    for (size_t i = 0; i < members->count; i++) {
        size_t p = members->participant[i];
        double days = visit[p] - randomised[p];
        cell->n += members->arm[i] == (int)arm;
        if (members->arm[i] == (int)arm && !isnan(days)) {
            cell->points[cell->dated] = (struct figure_point){view->frame->participants[p].id, days, false};
            values[cell->dated++] = days;
            if (moment->window.given) {
                place_in_window(cell, moment, days);
            }
        }
    }
    const double *sorted = sorted_copy(view->arena, values, cell->dated);
    cell->summary = describe(sorted, cell->dated);
    cell->whiskers = whiskers(sorted, cell->dated);
    for (size_t i = 0; i < cell->dated; i++) {
        double days = cell->points[i].value, off = days - moment->target;
        cell->points[i].outlier = moment->window.given ? off < moment->window.low || off > moment->window.high
                                                       : days < cell->whiskers.low || days > cell->whiskers.high;
    }
}

static void note_windows(struct view *view) {
    const struct frame *frame = view->frame;
    for (size_t f = 0; f < frame->plan->file_count; f++) {
        const struct join *join = &frame->joins[f];
        if (!frame->plan->files[f].window) {
            continue;
        }
        view_note(view,
            "Visits of %s are found by date: a record is of the visit whose planned day is nearest, within its window; "
            "of several records "
            "the nearest stands, the later on a tie. %zu records lie in a window, %zu of them farther than another; "
            "%zu ties; %zu outside every "
            "window; %zu without a date to count from; %zu visits have several records of one day, held aside.",
            frame->plan->files[f].id, join->matched, join->farther, join->ties, join->unplanned, join->undated,
            join->doubled);
    }
}

static bool compute(struct view *view, struct fault *fault) {
    (void)fault;
    const struct dates *dates = view->frame->plan->dates;
    struct dates_result *result = ARENA_NEW(view->arena, 1, struct dates_result);
    view->result = result;
    result->dates = dates;
    members_take(&result->members, view, MEMBERS_WITH_ARM);
    if (!dates || dates->randomised == NOWHERE) {
        view->caption =
            dates ? "The plan gives no date of randomisation to count days from." : "The plan gives no dates.";
        return true;
    }
    result->visits = ARENA_NEW(view->arena, dates->moment_count, const struct moment *);
    for (size_t m = 0; m < dates->moment_count; m++) {
        if (dates->moments[m].kind == MOMENT_VISIT) {
            result->visits[result->visit_count++] = &dates->moments[m];
        }
    }
    result->cells = ARENA_NEW(view->arena, result->visit_count * view->arms.count, struct dates_cell);
    for (size_t i = 0; i < result->visit_count * view->arms.count; i++) {
        fill_cell(&result->cells[i], view, result, result->visits[i / view->arms.count], i % view->arms.count);
    }
    members_note(view, &result->members);
    note_windows(view);
    view->caption = arena_format(view->arena,
        "Days from randomisation to each visit, %s. Shaded: the planned window; those outside it are filled and named. "
        "Box: quartiles (type 7); heavy bar: median; cross: mean. A date that is missing or cannot be read, of the "
        "visit or of randomisation, "
        "is counted as missing.",
        set_words(view->set));
    return true;
}

static void cell_json(const struct view *view, const struct dates_cell *cell, const struct moment *moment, size_t arm,
    struct json *json) {
    json_object(json);
    arm_json(view, arm, json);
    json_field_integer(json, "n", (int64_t)cell->dated);
    json_field_integer(json, "missing", (int64_t)(cell->n - cell->dated));
    json_field_number(json, "minimum", cell->summary.minimum);
    json_field_number(json, "lower_quartile", cell->summary.lower_quartile);
    json_field_number(json, "median", cell->summary.median);
    json_field_number(json, "upper_quartile", cell->summary.upper_quartile);
    json_field_number(json, "maximum", cell->summary.maximum);
    static const char *const names[] = {"in_window", "early", "late"};
    const size_t counts[] = {cell->in_window, cell->early, cell->late};
    for (size_t i = 0; i < 3; i++) {
        if (moment->window.given) {
            json_field_integer(json, names[i], (int64_t)counts[i]);
        } else {
            json_field_null(json, names[i]);
        }
    }
    json_close(json);
}

static void windows_json(const struct view *view, struct json *json) {
    const struct frame *frame = view->frame;
    json_key_array(json, "by_window");
    for (size_t f = 0; f < frame->plan->file_count; f++) {
        if (frame->plan->files[f].window) {
            const struct join *join = &frame->joins[f];
            json_object(json);
            json_field_string(json, "file", frame->plan->files[f].id);
            json_field_integer(json, "in_window", (int64_t)join->matched);
            json_field_integer(json, "farther", (int64_t)join->farther);
            json_field_integer(json, "ties", (int64_t)join->ties);
            json_field_integer(json, "outside", (int64_t)join->unplanned);
            json_field_integer(json, "undated", (int64_t)join->undated);
            json_field_integer(json, "held_aside", (int64_t)join->doubled);
            json_close(json);
        }
    }
    json_close(json);
}

static void json(const struct view *view, struct json *json) {
    const struct dates_result *result = view->result;
    size_t arms = view->arms.count;
    json_key_array(json, "arms");
    for (size_t a = 0; a < arms; a++) {
        json_object(json);
        arm_json(view, a, json);
        json_field_integer(json, "n", (int64_t)result->members.n_of_arm[a]);
        json_close(json);
    }
    json_close(json);
    json_key_array(json, "visits");
    for (size_t v = 0; v < result->visit_count; v++) {
        const struct moment *moment = result->visits[v];
        json_object(json);
        json_field_string(json, "visit", moment->label);
        json_field_string(json, "column", moment->column);
        json_field_number(json, "target", moment->target);
        if (moment->window.given) {
            interval_json(json, "window", moment->target + moment->window.low, moment->target + moment->window.high);
        } else {
            json_field_null(json, "window");
        }
        json_key_array(json, "arms");
        for (size_t a = 0; a < arms; a++) {
            cell_json(view, &result->cells[v * arms + a], moment, a, json);
        }
        json_close(json);
        json_close(json);
    }
    json_close(json);
    windows_json(view, json);
}

static void put_window_counts(struct table *table, const struct dates_cell *cell, const struct moment *moment) {
    const size_t counts[] = {cell->in_window, cell->early, cell->late};
    for (size_t i = 0; i < 3; i++) {
        if (moment->window.given) {
            table_put_count(table, (int64_t)counts[i]);
        } else {
            table_put_empty(table);
        }
    }
}

static void tables(const struct view *view, struct table **tables, size_t *count) {
    const struct dates_result *result = view->result;
    size_t arms = view->arms.count;
    struct table *table = table_new(view->arena, "Days from randomisation to each visit");
    table_column(table, "visit", "Visit", NULL, TABLE_WORDS);
    table_column(table, "arm", "Arm", NULL, TABLE_WORDS);
    static const char *const numbers[][2] = {{"target", "Planned day"}, {"n", "Dated"}, {"missing", "Missing"},
        {"minimum", "Minimum"}, {"lower_quartile", "Lower quartile"}, {"median", "Median"},
        {"upper_quartile", "Upper quartile"}, {"maximum", "Maximum"}, {"in_window", "In window"}, {"early", "Early"},
        {"late", "Late"}};
    for (size_t i = 0; i < sizeof numbers / sizeof *numbers; i++) {
        table_column(table, numbers[i][0], numbers[i][1], NULL, TABLE_NUMBERS);
    }
    for (size_t i = 0; i < result->visit_count * arms; i++) {
        const struct moment *moment = result->visits[i / arms];
        const struct dates_cell *cell = &result->cells[i];
        const struct description *s = &cell->summary;
        table_row(table);
        table_put_header(table, moment->label);
        table_put_header(table, view->arms.arm[i % arms].label);
        table_put_number(table, moment->target, 0);
        table_put_count(table, (int64_t)cell->dated);
        table_put_count(table, (int64_t)(cell->n - cell->dated));
        const double values[] = {s->minimum, s->lower_quartile, s->median, s->upper_quartile, s->maximum};
        for (size_t v = 0; v < sizeof values / sizeof *values; v++) {
            table_put_number(table, values[v], v == 0 || v == 4 ? 0 : 1);
        }
        put_window_counts(table, cell, moment);
    }
    tables[(*count)++] = table;
}

static void figure(const struct view *view, const struct figure *figure, struct html *html) {
    const struct dates_result *result = view->result;
    size_t arms = view->arms.count;
    struct boxes_group *groups = ARENA_NEW(view->arena, result->visit_count, struct boxes_group);
    struct boxes_row *rows = ARENA_NEW(view->arena, result->visit_count * arms, struct boxes_row);
    for (size_t i = 0; i < result->visit_count * arms; i++) {
        const struct dates_cell *cell = &result->cells[i];
        const struct description *s = &cell->summary;
        rows[i] = (struct boxes_row){.arm = view->arms.pooled ? NULL : view->arms.arm[i % arms].label,
            .mark = mark_of(view, i % arms),
            .counts = arena_format(view->arena, "%zu dated of %zu", cell->dated, cell->n),
            .sentence = cell->dated == 0 ? "No dates." : NULL,
            .low_whisker = cell->whiskers.low,
            .low_quartile = s->lower_quartile,
            .median = s->median,
            .mean = s->mean,
            .high_quartile = s->upper_quartile,
            .high_whisker = cell->whiskers.high,
            .points = cell->points,
            .point_count = cell->dated};
    }
    for (size_t v = 0; v < result->visit_count; v++) {
        const struct moment *moment = result->visits[v];
        groups[v] = (struct boxes_group){.level = moment->label,
            .rows = &rows[v * arms],
            .row_count = arms,
            .banded = moment->window.given,
            .band_low = moment->target + moment->window.low,
            .band_high = moment->target + moment->window.high};
    }
    struct boxes boxes = {.decimals = 0, .groups = groups, .group_count = result->visit_count};
    boxes.axis = (struct axis_plan){.scale = AXIS_LINEAR,
        .low = (double)NAN,
        .high = (double)NAN,
        .null_line = 0,
        .title = "Days from randomisation"};
    boxes_svg(&boxes, figure, html);
}

static bool applies(const struct plan *plan) {
    return plan->dates != NULL;
}

static const struct argument_rule arguments[] = {
    {"set", ARGUMENT_SET, "full or per-protocol; default full", NULL, false},
    {0},
};

const struct exhibit exhibit_dates = {
    .name = "dates",
    .item = 1,
    .title = "When were the visits, counted from randomisation?",
    .tab = "Dates",
    .says = "Days from randomisation to each visit by arm as blinding allows, with the planned windows",
    .pooled = SHOWN_AS_ONE_ARM,
    .applies = applies,
    .method = "Dates are days of the proleptic Gregorian calendar (ISO 8601), read in the order the plan or a decision "
              "declares for the file and site; a "
              "visit's day is its date minus the date of randomisation. A visit is early or late where its day lies "
              "outside the planned day with its "
              "window, bounds included. Quartiles by Hyndman & Fan 1996 (Am Stat 50:361), type 7; whiskers reach the "
              "furthest value within 1.5 times "
              "the interquartile range of the box (Tukey 1977).",
    .arguments = arguments,
    .compute = compute,
    .json = json,
    .tables = tables,
    .figure = figure,
};
