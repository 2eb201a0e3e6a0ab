/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Decisions: their kinds as one table, reading them from JSON, and which of them stand after reversals. */
#ifndef EVENHAND_TRIAL_RECORD_H
#define EVENHAND_TRIAL_RECORD_H
#include "base/fault.h"
#include "base/memory.h"
#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

enum decision_kind {
    DECISION_READ_AS,
    DECISION_MISSING_CODE,
    DECISION_NUMBER_FORMAT,
    DECISION_DATE_ORDER,
    DECISION_CONVERT,
    DECISION_CORRECT,
    DECISION_SET_MISSING,
    DECISION_CONFIRM,
    DECISION_KEEP_RECORD,
    DECISION_QUERY,
    DECISION_RESPONSE,
    DECISION_EXCLUDE,
    DECISION_FLAG,
    DECISION_SCALE,
    DECISION_PLAUSIBLE_SHIFTS,
    DECISION_AMEND_PLAN,
    DECISION_ATTENDING,
    DECISION_NOTE,
    DECISION_READING,
    DECISION_UNBLIND,
    DECISION_LOCK,
    DECISION_UNLOCK,
    DECISION_SIGN,
    DECISION_REVERSE,
    DECISION_KIND_COUNT
};

struct decision_rule {
    const char *name;      /* as in JSON: "read-as" */
    const char *says;      /* one line for help and page */
    const char *required;  /* fields beside reason, space-separated: "column from to" */
    const char *optional;  /* further fields, beside evidence, discrepancy and row */
    bool data;             /* changes data, so refused after a lock */
    bool reversible;
    bool reason_needed;
};
extern const struct decision_rule decision_rules[DECISION_KIND_COUNT];

/* One decision. Texts are owned by the arena it was read into and NULL where not given or null in JSON. */
struct decision {
    uint32_t number;
    enum decision_kind kind;
    const char *at, *by, *account, *participant, *column, *from, *to, *reason, *evidence, *discrepancy, *blinding;
    const char *state, *hash; /* fingerprint after; chain */
    const char *body;         /* canonical JSON of the fields that have no column of their own, "{}" where none */
    /* taken out of the body for use: */
    const char *value, *meaning, *decimal, *outcome, *scale, *set, *text, *exhibit;
    const char *path;   /* amend-plan: where; from and to are JSON texts, NULL: absent */
    const char *file;   /* keep-record: id of the file, NULL for the first */
    const char *order, *site; /* date-order: site NULL for every site */
    const char *unit_from, *unit_to, *source; /* convert, beside its site */
    double factor, offset;
    const char *people; /* attending: the list as JSON */
    uint32_t row;      /* 1-based data record in the file, 0 where not given */
    uint32_t reverses; /* number of the decision that a reverse takes back */
    bool planned;      /* entered at load from the plan */
};

struct record {
    struct arena arena;
    struct decision *decisions; /* decisions[i].number == i + 1 */
    size_t count, capacity;
};

/* Reads a JSON array of decisions, or {"version": N, "decisions": [...]} (version is UINT32_MAX where it is not said), into
 * the arena. Checks kinds, fields and types; `from` against the data is the frame's business. fault.row: 1-based entry. */
bool decisions_read(struct arena *arena, const char *json, size_t length, const char *name, struct decision **decisions,
    size_t *count, uint32_t *version, struct fault *fault);
/* Fills value, meaning ... row, reverses, planned from the body (as read from the study file), number, kind and the fields with
 * columns of their own being there already; refuses what a replay could not use. */
bool decision_unpack(struct arena *arena, struct decision *decision, struct fault *fault);
int decision_kind_of(const char *name); /* or NOWHERE */

/* stands[i] is false where decision i+1 has been reversed (and the reversal itself not). Array of `count`. */
void record_standing(const struct decision *decisions, size_t count, bool *stands);
#endif
