/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What the columns of an export probably mean, so that the form on which a person says so starts filled in. Guesses
 * from names, values and counts alone; nothing here is ever used without having been confirmed on the form. Common
 * practice in naming columns, no published source. Pure; one arena owns everything. */
#ifndef EVENHAND_TRIAL_GUESS_H
#define EVENHAND_TRIAL_GUESS_H
#include "draw/json.h"
#include "intake/cells.h"
#include "trial/plan.h"

enum guess_role {
    GUESS_NOTHING, /* free text, constants, empty columns */
    GUESS_PARTICIPANT,
    GUESS_ARM,
    GUESS_NUMBER,
    GUESS_CATEGORY,
    GUESS_EVENT,
    GUESS_DATE,
    GUESS_ROLE_COUNT
};
const char *guess_role_name(enum guess_role role); /* "nothing", "participant", "arm", "number" ... */

struct guess_value {
    const char *text;  /* as it stands in the cells; borrowed from them */
    const char *label; /* "Female" for F; the text itself where nothing better is known */
    size_t count;
    bool listed;       /* would be a level of the plan: not a variant in other letters, not a code for missing */
    bool missing_code; /* suspected of standing for "missing" */
};
enum { GUESS_VALUES = 12 };

struct guess_column {
    const char *name, *label, *unit; /* unit "" where it is not plain from the name */
    enum guess_role role;
    size_t filled, blank, distinct; /* filled: cells with more than space in them; distinct texts among them */
    size_t numbers, unreadable;     /* filled cells that are numbers or limits; those that are neither */
    double low, median, high;       /* of the numbers that are no suspected codes; NaN where there are none */
    double skewness; /* of the same, from the outer tenths: (q90 - 2 q50 + q10) / (q90 - q10), in -1..1; a wild
                      * value or two do not move it (Hinkley 1975, Biometrika 62:101); NaN where undefined */
    double spread;   /* q90 / q10 of the same where all are positive, else NaN */
    int decimals;
    bool positive; /* every one of them is above zero */
    struct guess_value
        *values; /* the most frequent first: all of a category's, else GUESS_VALUES and the suspected codes */
    size_t value_count;
    int series; /* index, or NOWHERE */
};

struct guess_series { /* one quantity at several visits, the first the baseline */
    const char *id, *label, *unit;
    size_t *columns;     /* in order of time */
    const char **visits; /* labels in words: "Baseline", "26 weeks" */
    size_t count;
    enum scale scale;
    bool lower_is_better;
};

struct guess {
    struct arena arena;
    const char *name; /* of the file */
    size_t records;
    struct guess_column *columns;
    size_t column_count;
    struct guess_series *series;
    size_t series_count;
    int participant, arm; /* columns, or NOWHERE */
};

/* Borrows cells and name for as long as the guess lives. */
void guess_take(struct guess *guess, const struct cells *cells, const char *name);
void guess_release(struct guess *guess);
/* An object: {"name", "records", "participant", "arm", "columns": [{"name", "label", "unit", "role", "filled", "blank",
 * "distinct", "numbers", "unreadable", "low", "median", "high", "decimals", "series", "visit", "values": [{"text",
 * "label", "count", "listed", "missing_code"}]}], "series": [{"id", "label", "unit", "scale", "better", "visits":
 * [{"label", "column"}]}], "missing_codes": [{"code", "columns": [NAME]}]}; participant and arm are column names or
 * null. */
void guess_json(const struct guess *guess, struct json *json);
/* A whole draft plan after the contract of plans: plan_read takes it when a participant's column and a number were
 * found. Plausible ranges, eligibility and adjustment are left for the person to say. */
void guess_plan_json(const struct guess *guess, struct json *json);
#endif
