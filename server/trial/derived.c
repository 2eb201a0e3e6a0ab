/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "trial/derived.h"
#include "base/text.h"
#include "intake/number.h"
#include <float.h>
#include <math.h>
#include <string.h>

static const char *const names[DERIVED_FORMULA_COUNT] = {
    [DERIVED_MEAN] = "mean",
    [DERIVED_SUM] = "sum",
    [DERIVED_DIFFERENCE] = "difference",
    [DERIVED_RATIO] = "ratio",
    [DERIVED_BODY_MASS_INDEX] = "body-mass-index",
    [DERIVED_DAYS_BETWEEN] = "days-between",
    [DERIVED_AGE_AT] = "age-at",
};

const char *derived_formula_name(enum derived_formula formula) {
    return names[formula];
}

static const char *const status_words[DERIVED_STATUS_COUNT] = {
    [DERIVED_COMPUTED] = "computed",
    [DERIVED_HELD_ASIDE] = "record held aside",
    [DERIVED_INPUT_MISSING] = "an input is missing",
    [DERIVED_UNDEFINED] = "not defined for these inputs",
};

const char *derived_status_words(enum derived_status status) {
    return status_words[status];
}

static const char *items_words(struct arena *arena, const struct derived *derived) {
    struct text text;
    text_init(&text);
    text_format(&text, "%s of ", names[derived->formula]);
    for (size_t i = 0; i < derived->of_count; i++) {
        text_format(&text, "%s%s", i == 0 ? "" : i + 1 == derived->of_count ? " and " : ", ", derived->of[i].column);
    }
    if (derived->minimum_items < derived->of_count) {
        text_format(&text, "; at least %zu of the %zu must be there%s", derived->minimum_items, derived->of_count,
            derived->formula == DERIVED_SUM ? ", and the sum is then their mean times the number of all" : "");
    }
    const char *words = arena_text(arena, text.data);
    text_release(&text);
    return words;
}

const char *derived_words(struct arena *arena, const struct derived *derived) {
    const char *first = derived->of[0].column, *second = derived->of[1].column;
    switch (derived->formula) {
    case DERIVED_DIFFERENCE:
        return arena_format(arena, "%s minus %s", first, second);
    case DERIVED_RATIO:
        return arena_format(arena, "%s divided by %s", first, second);
    case DERIVED_BODY_MASS_INDEX:
        return arena_format(arena, "weight %s in kg divided by the square of height %s in m%s", first, second,
            derived->height_in_cm ? " (recorded in cm)" : "");
    case DERIVED_DAYS_BETWEEN:
        return arena_format(arena, "days from %s to %s", first, second);
    case DERIVED_AGE_AT:
        return arena_format(arena, "whole years completed from %s to %s", first, second);
    default:
        return items_words(arena, derived);
    }
}

/* ---- one value ---- */

/* Somebody born on 29 February completes a year on 1 March where there is no such day. */
static double whole_years(double birth, double at) {
    int birth_year, birth_month, birth_day, year, month, day;
    date_parts(birth, &birth_year, &birth_month, &birth_day);
    date_parts(at, &year, &month, &day);
    bool before = month < birth_month || (month == birth_month && day < birth_day);
    return at < birth ? (double)NAN : year - birth_year - (before ? 1 : 0);
}

static double of_two(const struct derived *derived, double first, double second) {
    switch (derived->formula) {
    case DERIVED_DIFFERENCE:
        return first - second;
    case DERIVED_RATIO:
        return second < 0 || second > 0 ? first / second : (double)NAN;
    case DERIVED_DAYS_BETWEEN:
        return second - first;
    case DERIVED_AGE_AT:
        return whole_years(first, second);
    default: { /* body mass index */
        double metres = derived->height_in_cm ? second / 100 : second;
        return metres > 0 && first > 0 ? first / (metres * metres) : (double)NAN;
    }
    }
}

double derived_compute(const struct derived *derived, const double *input, enum derived_status *status, size_t *present) {
    double sum = 0;
    *present = 0;
    for (size_t i = 0; i < derived->of_count; i++) {
        sum += isnan(input[i]) ? 0 : input[i];
        *present += isnan(input[i]) ? 0 : 1;
    }
    *status = DERIVED_INPUT_MISSING;
    if (*present == 0 || *present < derived->minimum_items) {
        return NAN;
    }
    bool all = *present == derived->of_count;
    double value = derived->formula == DERIVED_MEAN ? sum / (double)*present :
        derived->formula == DERIVED_SUM             ? (all ? sum : sum / (double)*present * (double)derived->of_count) :
                                                      of_two(derived, input[0], input[1]);
    *status = isfinite(value) ? DERIVED_COMPUTED : DERIVED_UNDEFINED;
    return isfinite(value) ? value : (double)NAN;
}

double derived_rounding(
    const struct derived *derived, double value, const double *input, const int *input_decimals, int claimed_decimals) {
    double half_claimed = 0.5 * pow(10, -claimed_decimals);
    if (derived->formula != DERIVED_BODY_MASS_INDEX) {
        return half_claimed;
    }
    double half_weight = 0.5 * pow(10, -input_decimals[0]), half_height = 0.5 * pow(10, -input_decimals[1]);
    return half_claimed + value * (half_weight / input[0] + 2 * half_height / input[1]);
}

/* ---- by participant ---- */

enum { FEW = 16 };

/* The decimals a cell is written with; of a computed one those it is shown with. */
static int decimals_written(const struct frame *frame, const struct column *column, size_t participant) {
    int decimals = column->decimals;
    const char *text = column->texts ? NULL : frame_text(frame, column, participant);
    if (text && number_read(text, ',', NULL, &decimals) != NUMBER_READ) {
        decimals = column->decimals;
    }
    return decimals;
}

static void compare(struct derived_value *taken, const struct frame *frame, const struct derived *derived, size_t p,
    const double *input) {
    const struct column *claims = frame->columns[derived->claims_variable];
    taken->claimed = claims->number[p];
    if (taken->status != DERIVED_COMPUTED || isnan(taken->claimed)) {
        return;
    }
    int decimals[2] = {0, 0};
    for (size_t i = 0; i < 2; i++) {
        decimals[i] = decimals_written(frame, frame->columns[derived->of[i].variable], p);
    }
    taken->tolerance = isnan(derived->tolerance) ?
        derived_rounding(derived, taken->value, input, decimals, decimals_written(frame, claims, p)) : derived->tolerance;
    /* A claim exactly at the bound agrees, though binary fractions put it a hair beyond. */
    double hair = 8 * DBL_EPSILON * (fabs(taken->value) + fabs(taken->claimed));
    taken->differs = fabs(taken->claimed - taken->value) > taken->tolerance + hair;
}

static void take(struct derived_value *taken, const struct frame *frame, const struct derived *derived, size_t p, double *input) {
    bool held = frame->participants[p].record == NO_RECORD;
    *taken = (struct derived_value){.value = NAN, .claimed = NAN, .tolerance = NAN};
    for (size_t i = 0; i < derived->of_count; i++) {
        const struct column *column = frame->columns[derived->of[i].variable];
        held = held || column->state[p] == CELL_HELD_ASIDE;
        input[i] = column->number[p];
    }
    taken->value = derived_compute(derived, input, &taken->status, &taken->present);
    if (held) {
        taken->status = DERIVED_HELD_ASIDE;
        taken->value = NAN;
    }
    taken->prorated = taken->status == DERIVED_COMPUTED && taken->present < derived->of_count;
    if (derived->claims) {
        compare(taken, frame, derived, p, input);
    }
}

void derived_take(struct derived_value *taken, const struct frame *frame, const struct derived *derived, size_t participant) {
    double few[FEW], *input = derived->of_count <= FEW ? few : memory_new(derived->of_count, sizeof *input);
    take(taken, frame, derived, participant, input);
    if (input != few) {
        memory_free(input);
    }
}

const char *derived_inputs(struct arena *arena, const struct frame *frame, const struct derived *derived, size_t participant) {
    struct text text;
    text_init(&text);
    for (size_t i = 0; i < derived->of_count; i++) {
        const struct column *column = frame->columns[derived->of[i].variable];
        enum cell_state state = (enum cell_state)column->state[participant];
        const char *now = state == CELL_OBSERVED ? frame_text(frame, column, participant) : NULL;
        text_format(&text, "%s%s %s", i ? ", " : "", derived->of[i].column, now ? now : cell_state_words(state));
    }
    const char *words = arena_text(arena, text.data);
    text_release(&text);
    return words;
}

/* ---- the column ---- */

/* What rounds to 0 is not written with a minus. */
static const char *value_text(struct arena *arena, double value, int decimals) {
    const char *text = arena_format(arena, "%.*f", decimals, value);
    return text[0] == '-' && text[strspn(text, "-0.")] == '\0' ? text + 1 : text;
}

void derived_fill(struct column *column, const struct frame *frame, const struct derived *derived) {
    enum { MOST = 6 };
    size_t n = frame->participant_count;
    column->number = ARENA_NEW(&column->arena, n, double);
    column->state = ARENA_NEW(&column->arena, n, unsigned char);
    column->texts = ARENA_NEW(&column->arena, n, const char *);
    for (size_t i = 0; i < derived->of_count; i++) {
        const struct column *input = frame->columns[derived->of[i].variable];
        int decimals = input->kind == VARIABLE_DATE ? 0 : input->decimals + 1;
        decimals = decimals < MOST ? decimals : MOST;
        column->decimals = decimals > column->decimals ? decimals : column->decimals;
    }
    for (size_t p = 0; p < n; p++) {
        struct derived_value taken;
        derived_take(&taken, frame, derived, p);
        column->number[p] = taken.value;
        column->state[p] = taken.status == DERIVED_COMPUTED ? CELL_OBSERVED :
            taken.status == DERIVED_HELD_ASIDE              ? CELL_HELD_ASIDE :
                                                              CELL_BLANK;
        column->texts[p] = taken.status == DERIVED_COMPUTED ? value_text(&column->arena, taken.value, column->decimals) : NULL;
    }
}
