/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Proving a study file against itself: everything it claims is computed again from the kept bytes. */
#ifndef EVENHAND_TRIAL_VERIFY_H
#define EVENHAND_TRIAL_VERIFY_H
#include "base/fault.h"
#include "base/text.h"
#include <stdbool.h>

/* Checks SQLite's own integrity, tables and triggers, the fingerprints of the kept bytes, entry 0, the chain of decisions and
 * looks (store_verify); reads the kept bytes again and compares them with the table of cells; replays every decision and
 * compares the fingerprint after each batch with the recorded one. `expect`: a head written down elsewhere, 64
 * hexadecimal digits, or NULL. *sound says whether all agreed; `account` gets sentences for a person, the first difference
 * named. False with a fault only where the file cannot be read at all. */
bool study_verify(const char *path, const char *expect, bool *sound, struct text *account, struct fault *fault);
#endif
