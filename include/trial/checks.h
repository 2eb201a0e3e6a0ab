/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Discrepancies: what a check noticed. Nothing here changes a value; a decision settles. */
#ifndef EVENHAND_TRIAL_CHECKS_H
#define EVENHAND_TRIAL_CHECKS_H
#include "trial/frame.h"

enum severity { SEVERITY_MUST_SETTLE, SEVERITY_WORTH_A_LOOK };
const char *severity_name(enum severity severity); /* "must-settle", "worth-a-look" */
enum discrepancy_state { DISCREPANCY_OPEN, DISCREPANCY_SETTLED, DISCREPANCY_QUERIED };
const char *discrepancy_state_name(enum discrepancy_state state); /* "open" ... */

struct discrepancy {
    const char *id; /* stable: "out-of-eligibility/bmi/Q1032" */
    const char *check;
    enum severity severity;
    const char *column;         /* NULL where it is not about one column */
    const char *participant;    /* NULL where it is about several */
    const char *value;          /* the text, NULL where there is none or it may not be shown */
    const char *message;        /* one sentence for the reader */
    const char *proposal;       /* a decision as JSON without its reason, or NULL */
    const char *proposal_words; /* "Read f as F", or NULL */
    const char **participants;  /* everyone concerned, in identifier order */
    size_t participant_count;
    const unsigned *rows;       /* repeated participant: 1-based data records; else NULL */
    size_t row_count;
    const char *file;           /* several records: the file's id in the plan, where it has one */
    enum discrepancy_state state;
    uint32_t settled_by; /* number of the decision, 0 where open or where no single one did it */
};

struct check {
    const char *name, *title, *says; /* "out-of-eligibility", "Outside eligibility", one line */
    enum severity severity;
};
extern const struct check checks[]; /* ends with a NULL name */

struct discrepancies {
    struct discrepancy *list;
    size_t count, open, settled, queried;
};

/* How many the data say were randomised: participants but those without an arm that the plan lists; one whose records are
 * held aside counts once. */
size_t checks_randomised(const struct frame *frame);
/* All discrepancies of a frame, those settled since load among them, in the order of the table of checks, then column, then
 * participant. `received` is the frame after the decisions entered at load. While blinded the arm column's own show a count only. */
void checks_run(const struct frame *frame, const struct frame *received, struct arena *arena, struct discrepancies *found);
#endif
