/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Amendments: the plan in force at a version = the plan as loaded, with the standing amend-plan decisions applied in order.
 * A path is what the plan's sentences use: "outcomes[0].scale", "adjust_for". from and to are JSON texts; NULL: absent. */
#ifndef EVENHAND_TRIAL_AMEND_H
#define EVENHAND_TRIAL_AMEND_H
#include "base/fault.h"
#include "base/memory.h"
#include "trial/record.h"

/* Whether any amendment stands. */
bool amend_any(const struct decision *decisions, const bool *stands, size_t count);

/* The text of the plan in force after `count` decisions, in the arena; `loaded` itself where none stands. Decisions from index
 * `new_from` on are new: their `from` may be the JSON or, given as a string, the text of it; it must be what the path now holds,
 * and from and to are replaced by their canonical texts (in the arena). With `blinded` new ones under "arm" are refused. What may not be
 * amended (files, identifier, arms' codes ...) is refused. fault.row: 1-based entry among the new ones; for an old amendment that
 * no longer fits (a reversal beneath it) it is 0 and the sentence names both. */
bool amend_plan(const char *loaded, struct decision *decisions, const bool *stands, size_t count, size_t new_from, bool blinded,
    struct arena *arena, const char **text, struct fault *fault);

/* Whether what is at the path tells of the arms ("arm" and below it). */
bool amend_about_arms(const char *path);
#endif
