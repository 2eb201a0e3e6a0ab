/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What the files of the checks share: a run over one frame and how a discrepancy is added to it. */
#ifndef EVENHAND_TRIAL_CHECKS_PARTS_H
#define EVENHAND_TRIAL_CHECKS_PARTS_H
#include "trial/checks.h"

struct finding { /* a run of the checks over one frame */
    const struct frame *frame;
    struct arena *arena;
    struct discrepancy *list;
    size_t count, room;
    const bool *hidden; /* [variables] whose text may not be shown now */
    bool **site_asked;  /* [variables][participants] a discrepancy about their site's unit is not settled by a note;
                           NULL: none */
};

/* A new discrepancy of the check of that name, with the id check/column/what (column NULL: check/what). It may move
 * when the next one is added. */
struct discrepancy *finding_add(struct finding *finding, const char *check, const char *column, const char *what);
void finding_concerns(struct finding *finding, struct discrepancy *what, const char *participant); /* that one alone */
/* A decision's JSON of `count` text fields after its kind, and its row where that is not 0. */
const char *finding_proposal(
    struct finding *finding, const char *kind, const char *const fields[][2], size_t count, uint32_t row);

/* In checks-sites.c: fills site_asked. */
void check_site_units(struct finding *finding);

/* In checks-dates.c. */
void check_dates(struct finding *finding);
#endif
