/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What the writers of the invented trial share: the trial as drawn, with its troubles. */
#ifndef EVENHAND_DEMO_INNER_H
#define EVENHAND_DEMO_INNER_H
#include "demo/quayside.h"

enum { PARTICIPANTS = 240, SITES = 6, CELL_SIZE = 24, TROUBLES_MAX = 96, FIRST_IDENTIFIER = 1001 };
enum column { PID, SITE, GRP, SEX, AGE, BMI, SBP_0, SBP_8, SBP_26, UACR_0, UACR_8, UACR_26, RESCUE, COLUMNS };
enum arm { ADVICE, WALKING, ARMS };

/* How a trouble is settled: each is one kind of decision, or none. */
enum settling { BY_PLAN, LEFT, READ_AS, NUMBER_FORMAT, CORRECT, SET_MISSING, CONFIRM, KEEP_RECORD };
enum kind {
    MISSING_CODE, SEX_VARIANT, AGE_TENFOLD, PRESSURE_TENFOLD, DECIMAL_COMMA, UNIT_INSIDE, WORD_INSIDE, ENTERED_TWICE,
    BEYOND_ELIGIBILITY, GENUINE_OUTLIER, BELOW_LIMIT, KINDS
};

struct record {
    char cell[COLUMNS][CELL_SIZE];
};

struct trouble {
    enum kind kind;
    enum column column;
    size_t participant;
    char received[CELL_SIZE], truth[CELL_SIZE];
};

struct trial {
    uint64_t state[4]; /* of the generator */
    double spare;      /* the second of a pair of normal deviates */
    bool has_spare;
    struct record truth[PARTICIPANTS], received[PARTICIPANTS];
    enum arm arm[PARTICIPANTS];
    bool troubled[PARTICIPANTS]; /* at most one planted trouble each, so that each is seen by itself */
    struct trouble troubles[TROUBLES_MAX];
    size_t trouble_count;
    size_t twice;                         /* the participant entered twice */
    char first_entry[CELL_SIZE];          /* and what the first record says */
};

/* How the texts of one form of the export call what they speak of. */
struct naming {
    const char *const *columns; /* [COLUMNS] as decisions name them */
    const char *files;          /* the plan's "files" as JSON; NULL for one wide file */
    const char *dates;          /* the plan's "dates" as JSON; NULL: none */
    size_t visit_row;           /* in several files: the record of visits.csv that stands of the one entered twice */
};

struct trial *trial_new(uint64_t seed); /* drawn and its troubles planted; the caller frees it with memory_free */
void trial_write_plan(const struct naming *naming, uint64_t seed, struct text *out);
void trial_write_decisions(const struct trial *trial, const struct naming *naming, struct text *out);
uint64_t split_next(uint64_t *state); /* splitmix64 */
#endif
