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
    GUESS_VISIT, /* the code of a visit, in a file with one row per participant and visit */
    GUESS_ROLE_COUNT
};
const char *guess_role_name(enum guess_role role); /* "nothing", "participant", "arm", "number" ... */

/* One received file, and what a person has said of it; what was not said is guessed. */
enum guess_layout { LAYOUT_GUESSED, LAYOUT_PARTICIPANT, LAYOUT_VISIT };
struct guess_source {
    const char *name, *sheet; /* sheet: of a spreadsheet with several, NULL: the only one */
    const struct cells *cells;
    enum guess_layout layout;
    const char *participant, *visit; /* names of columns; NULL, or one that the file does not have: guessed */
    const char *const *codes;        /* of visits, in order of time; those that the file does not have are kept */
    size_t code_count;               /* 0: guessed */
};

struct guess_code {           /* a visit of a file with one row per participant and visit */
    const char *code, *label; /* label in words: "Baseline", "8 weeks" */
    double order;             /* in time; NaN where the code says none */
    size_t records;
};

struct guess_file {
    const char *id, *name, *sheet; /* id: one word from the name, as the plan's "files" has it */
    size_t records;
    size_t first_column, column_count; /* among the guess's columns */
    bool by_visit;
    int participant, visit;   /* among the guess's columns, or NOWHERE */
    size_t participants;      /* how many different identifiers */
    size_t shared;            /* how many of them the first file has */
    struct guess_code *codes; /* by_visit: the visits that seem to be planned, in order of time */
    size_t code_count;
};

struct guess_value {
    const char *text;  /* as it stands in the cells; borrowed from them */
    const char *label; /* "Female" for F; the text itself where nothing better is known */
    size_t count;
    bool listed;       /* would be a level of the plan: not a variant in other letters, not a code for missing */
    bool missing_code; /* suspected of standing for "missing" */
};
enum { GUESS_VALUES = 12 };

struct guess_column {
    const char *name;         /* as in its file's header */
    const char *full_name;    /* as plans and decisions name it: FILE.COLUMN where the plan will have "files" */
    const char *label, *unit; /* unit "" where it is not plain from the name */
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
    size_t file;
    bool varies;       /* by_visit: it differs from visit to visit in more than a tenth of the participants */
    size_t *filled_at; /* by_visit: filled cells at each of the file's codes; NULL otherwise */
};

struct guess_series { /* one quantity at several visits, the first the baseline */
    const char *id, *label, *unit;
    size_t *columns;     /* in order of time */
    const char **codes;  /* the visit's code of each, NULL in a file with one row per participant */
    const char **visits; /* labels in words: "Baseline", "26 weeks" */
    size_t count;
    enum scale scale;
    bool lower_is_better;
};

struct guess {
    struct arena arena;
    const char *name; /* of the first file, as the next */
    size_t records;
    struct guess_file *files; /* in the order given */
    size_t file_count, first; /* first: the file that has every participant */
    bool with_files;          /* the plan has "files": there are several, or the one has a row per visit or a sheet */
    struct guess_column *columns;
    size_t column_count;
    struct guess_series *series;
    size_t series_count;
    int participant, arm; /* columns, or NOWHERE; participant: the first file's */
};

/* What the columns of one file mean, guessed from nothing but the file. Borrows cells and name while the guess lives.
 */
void guess_take(struct guess *guess, const struct cells *cells, const char *name);
/* The same of several files that belong together, and of files with one row per participant and visit. Which column is
 * the identifier follows from names and from the values that the files share; the first file is the one with one row
 * per participant that knows the arm, else that has most participants. count >= 1. */
void guess_take_all(struct guess *guess, const struct guess_source *sources, size_t count);
void guess_release(struct guess *guess);
/* An object: {"name", "records", "participant", "arm", "columns": [{"name", "label", "unit", "role", "filled", "blank",
 * "distinct", "numbers", "unreadable", "low", "median", "high", "decimals", "series", "visit", "values": [{"text",
 * "label", "count", "listed", "missing_code"}]}], "series": [{"id", "label", "unit", "scale", "better", "visits":
 * [{"label", "column"}]}], "missing_codes": [{"code", "columns": [NAME]}], "files": [{"id", "name", "sheet", "records",
 * "columns", "first", "layout", "participant", "participants", "shared", "visit", "codes": [{"code", "label",
 * "records"}]}]}; participant, arm and visit are column names or null. Where the plan has "files" the columns' names
 * are FILE.COLUMN, a column also has "file", "layout" and "varies", and a series' columns are FILE.COLUMN or
 * FILE.COLUMN@CODE; a file's own "participant" and "visit" are as in its header, its "columns" the list of its header.
 */
void guess_json(const struct guess *guess, struct json *json);
/* A whole draft plan after the contract of plans: plan_read takes it when a participant's column and a number were
 * found
 * that may be an outcome. Plausible ranges, eligibility and adjustment are left for the person to say. Covariates of a
 * file with one row per visit are taken at its first visit. */
void guess_plan_json(const struct guess *guess, struct json *json);
#endif
