/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Blinding, in one place: the arms as they may be shown. Exhibits take arms from here and nowhere else, so that while
 * blinded no arm's code or label can reach a result. */
#ifndef EVENHAND_TRIAL_ARMS_H
#define EVENHAND_TRIAL_ARMS_H
#include "trial/frame.h"

struct shown_arm {
    const char *code, *label; /* unblinded: the plan's; coded: "A", "A"; pooled: "all", "All participants" */
    size_t palette;           /* 0 for the reference (unblinded) or the letter's index (coded) */
};

struct arms {
    struct shown_arm *arm;
    size_t count;     /* 1 while pooled or where the plan has no arms */
    size_t reference; /* contrasts are every other arm minus this one: the plan's, or A */
    bool pooled, coded;
    const int *of;    /* [participants] shown arm (pooled: 0), or NOWHERE for no arm or an unlisted one */
};

void arms_shown(const struct frame *frame, struct arena *arena, struct arms *arms);

/* True where a category gives the arm away: levels of 5 or more records that each lie in one arm cover 90% of records. */
bool arms_given_away(const struct frame *frame, const struct column *column);
/* True where the text of this column of the file may not be shown now: the arm itself, or one that gives it away. */
bool arms_hide_column(const struct frame *frame, const char *column);
#endif
