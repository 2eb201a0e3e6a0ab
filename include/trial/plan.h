/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The plan: what the columns mean and what was decided in advance. Read from JSON (RFC 8259, UTF-8); unknown keys are
 * refused by name. Immutable after plan_read; one arena owns everything; threads may share it. */
#ifndef EVENHAND_TRIAL_PLAN_H
#define EVENHAND_TRIAL_PLAN_H
#include "base/fault.h"
#include "base/memory.h"
#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

enum scale { SCALE_LINEAR, SCALE_LOG10 };
enum blinding { BLINDING_POOLED, BLINDING_CODED, BLINDING_UNBLINDED };
enum variable_kind {
    VARIABLE_NUMBER,
    VARIABLE_CATEGORY,
    VARIABLE_EVENT,
    VARIABLE_ARM,
    VARIABLE_PARTICIPANT,
    VARIABLE_VISIT,
    VARIABLE_DATE /* day numbers, see trial/dates.h */
};
enum { NOWHERE = -1 }; /* an index that points at nothing */

struct texts {
    size_t count;
    const char **item;
};

struct range { /* inclusive; `given` is false where the plan says nothing */
    bool given;
    double low, high;
};

struct level {
    const char *code, *label;
};

/* A file the plan expects. Without "files" in the plan there is one, with NULL id, one row per participant. */
struct plan_file {
    const char *id, *name;   /* name: of the file as it comes, NULL: any; files are then taken in the order given */
    const char *sheet;       /* of a spreadsheet with several, NULL: the only one */
    bool by_visit;           /* one row per participant and visit, else one per participant */
    const char *participant; /* its column of the identifier, as in the header */
    const char *visit;       /* by_visit: its column of the visit's code */
    struct texts codes;      /* by_visit: the planned codes, in order of time */
    const char *identifier_name, *visit_name; /* the same as decisions name them */
    const char *window, *window_name; /* by_visit: the column of the date by which a record finds its visit, and its name in
                                         decisions; NULL: the visit's code says */
    size_t first_slot;       /* see plan.slots */
};

/* Where a participant has at most one record: a file, or one visit of a file with one row per visit. */
struct slot {
    size_t file;
    const char *code; /* NULL: the file has one row per participant */
};

/* Where a column lives. Its name in the plan, in decisions and in exhibits is COLUMN without files, else FILE.COLUMN, or
 * FILE.COLUMN@CODE in a file with one row per visit. */
struct place {
    size_t file, slot;
    const char *column; /* as in that file's header */
};

struct arm_level {
    const char *code, *label;
    bool reference; /* exactly one */
    double ratio;   /* planned allocation, 1 by default */
};

struct visit {
    const char *label, *column;
    struct place place;
    int variable; /* index into plan.variables */
};

struct outcome {
    const char *id, *label, *unit; /* unit "" where none */
    bool primary, lower_is_better;
    enum scale scale;
    struct range plausible;
    double important_difference; /* NaN where none; in the unit (linear) or as a ratio (log10) */
    struct visit *visits;
    size_t visit_count;   /* with one visit there is no baseline; else visits[0] is the baseline */
    size_t primary_visit; /* index into visits */
    const struct texts *missing_codes;
    double responder_threshold; /* NaN where none */
    const char *population, *event_strategy, *summary; /* of the estimand; NULL where none */
};

struct covariate {
    const char *id, *label, *unit, *column;
    struct place place;
    bool number;          /* else a category */
    struct level *levels; /* categories: as the plan lists them; may be empty */
    size_t level_count;
    struct range eligible, plausible;
    double *bands; /* increasing cut points */
    size_t band_count;
    const struct texts *missing_codes;
    int variable;
};

struct event {
    const char *id, *label, *column;
    struct place place;
    struct texts yes, no;
    const char *kind;           /* NULL where none, as the next three */
    const char *strategy;       /* of the estimand for it, by ICH E9(R1) */
    const char *date, *reason;  /* names of columns */
    struct place date_place, reason_place;
    int variable;
};

/* Numbers of the screening log, typed in with their source. */
struct screening_reason {
    const char *reason;
    size_t n;
};
struct screening {
    bool given;
    const char *source;
    size_t assessed;
    struct screening_reason *reasons; /* why somebody assessed was not randomised */
    size_t reason_count, not_randomised; /* not_randomised: sum of the reasons */
};

/* A value computed from columns: the plan writes it derived.ID wherever it may write a column. */
enum derived_formula {
    DERIVED_MEAN,            /* of the items present */
    DERIVED_SUM,             /* mean of the items present times the number of items */
    DERIVED_DIFFERENCE,      /* first minus second */
    DERIVED_RATIO,           /* first over second */
    DERIVED_BODY_MASS_INDEX, /* weight in kg over the square of height in m */
    DERIVED_DAYS_BETWEEN,    /* dates: second minus first */
    DERIVED_AGE_AT,          /* dates: whole years completed from the first to the second */
    DERIVED_FORMULA_COUNT
};
struct derived_input {
    const char *column; /* a column's name, or derived.ID of one before it in the list */
    struct place place; /* without a meaning where derived */
    int variable;
};
struct derived {
    const char *id, *label, *unit;
    const char *column; /* "derived.ID" */
    enum derived_formula formula;
    struct derived_input *of;
    size_t of_count;
    size_t minimum_items; /* mean and sum: as many must be present; of_count for the others */
    bool height_in_cm;    /* body mass index: else m */
    const char *claims;   /* the file's own column of the same, NULL where none */
    struct place claims_place;
    int claims_variable; /* NOWHERE where none */
    double tolerance;    /* a claim may differ by as much; NaN: what rounding explains */
    struct range plausible;
    const struct texts *missing_codes; /* of inputs and claim, where nothing else in the plan gives them a meaning */
    int variable;
};

/* Every column the plan gives a meaning to, once (a column of several events once for each of them): covariates, then
 * outcomes visit by visit, then events, then dates, then derived values and what only they rest on. The arm and the
 * participant are not among them. */
struct variable {
    const char *column, *label, *unit; /* of an outcome's visit: "Systolic blood pressure, 26 weeks" */
    struct place place;
    enum variable_kind kind;
    int outcome, visit, covariate, event; /* where it comes from, else NOWHERE */
    int derived; /* index into plan.derived where it is computed (place.column is NULL then), else NOWHERE */
    int moment;                           /* index into plan.dates->moments, else NOWHERE */
    struct range plausible, eligible;
    const struct texts *missing_codes;
};

struct plan {
    struct arena arena;
    struct plan_file *files; /* the first has every participant; the others are joined to it by their identifiers */
    size_t file_count;       /* at least 1 */
    struct slot *slots;
    size_t slot_count;
    const char *title, *participant; /* participant: the name of the first file's column of identifiers */
    const char *arm_column; /* NULL: no arms yet, only pooled exhibits work */
    struct place arm_place;
    struct arm_level *arms;
    size_t arm_count, reference;
    struct texts missing_codes;
    struct outcome *outcomes;
    size_t outcome_count, primary; /* index of the primary outcome */
    struct covariate *covariates;
    size_t covariate_count;
    struct event *events;
    size_t event_count;
    int *adjust_for; /* indices of covariates */
    size_t adjust_count;
    int *subgroups;
    size_t subgroup_count;
    int *stratified_by;
    size_t stratified_count;
    bool drop_missing_baseline; /* false: the mean of the set stands in (White & Thompson 2005, Stat Med 24:993) */
    bool robust;                /* the plan says so, or planned allocation is unequal, or there are more than two arms */
    const char *robust_because; /* words for the reader where robust, else NULL */
    double confidence;
    enum blinding blinding;
    uint64_t seed;
    const char *amended;     /* fingerprint of its text where amendments stand, NULL: as loaded */
    struct derived *derived; /* none rests on one after it */
    size_t derived_count;
    struct dates *dates;     /* NULL where the plan has none; see trial/dates.h */
    const char *site_column; /* NULL where none */
    struct place site_place;
    struct screening screening;
    struct variable *variables;
    size_t variable_count;
};

/* Reads and checks a plan. `name` is the file's name for the sentence. On failure everything is released. */
bool plan_read(struct plan *plan, const char *json, size_t length, const char *name, struct fault *fault);
void plan_release(struct plan *plan);

int plan_outcome(const struct plan *plan, const char *id); /* index or NOWHERE */
int plan_covariate(const struct plan *plan, const char *id);
int plan_event(const struct plan *plan, const char *id);
int plan_variable(const struct plan *plan, const char *column); /* index into variables or NOWHERE */
int plan_derived(const struct plan *plan, const char *column); /* of "derived.ID"; index or NOWHERE */
/* The file whose identifiers (or, by_visit, visit codes) the name means: "FILE.COLUMN". NOWHERE where it means neither. */
int plan_identifier_file(const struct plan *plan, const char *column);
int plan_visit_file(const struct plan *plan, const char *column);
int plan_window_file(const struct plan *plan, const char *column); /* whose visits that date finds */
/* Whether what a decision says of a column means the column of that name: the same, or FILE.COLUMN for FILE.COLUMN@CODE, the
 * column at every visit. */
bool plan_covers(const char *said, const char *name);
/* The name of a file's column in decisions, without a visit: COLUMN or FILE.COLUMN. */
const char *plan_column_name(struct arena *arena, const struct plan *plan, size_t file, const char *column);

const char *scale_name(enum scale scale); /* "linear", "log10" */
bool scale_read(const char *name, enum scale *scale);
const char *blinding_name(enum blinding blinding); /* "pooled", "coded", "unblinded" */
bool blinding_read(const char *name, enum blinding *blinding);

/* The band of a number among cut points, 0..count; and its words: "below 50", "50 to below 60", "60 and above". */
size_t band_of(const double *bands, size_t count, double value);
const char *band_words(struct arena *arena, const double *bands, size_t count, size_t band);
#endif
