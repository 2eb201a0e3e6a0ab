/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The Quayside Walking Trial: an invented trial, made from a seed, for the demonstration and for the tests.
 * Adults with raised blood pressure, randomised within six sites to a walking group ("W") or printed advice ("L",
 * the reference); systolic pressure (primary) and urine albumin-to-creatinine ratio (secondary, right-skewed) at
 * baseline, 8 and 26 weeks. Nothing in it comes from a real trial.
 *
 * Columns of both CSV texts, in this order:
 *   pid site grp sex age bmi sbp_0 sbp_8 sbp_26 uacr_0 uacr_8 uacr_26 rescue
 * UTF-8, comma, no byte order mark, lines end in "\n". A record number is 1-based and does not count the header.
 *
 * The same seed gives the same bytes on every machine (only +, -, * and / of doubles, nothing from libm, whose last
 * digits differ). Pure: no files, no clock, thread-safe. */
#ifndef EVENHAND_DEMO_QUAYSIDE_H
#define EVENHAND_DEMO_QUAYSIDE_H
#include "base/text.h"
#include <stdint.h>

/* The seed of the demonstration; also the seed in the plan. */
#define QUAYSIDE_SEED UINT64_C(20261201)
/* A seed beyond this would not come through JSON whole. */
#define QUAYSIDE_SEED_MOST (UINT64_C(1) << 53)

struct quayside {
    struct text export_csv;     /* what the trial's data base gave out, with troubles planted in it */
    struct text clean_csv;      /* the truth: one record per participant, same order; "<0.3" stays "<0.3" */
    struct text plan_json;      /* a whole plan for either CSV; blinding "coded" */
    struct text decisions_json; /* the right decisions; with them every current value of the export is the clean one */
    struct text key_json;       /* what was planted and what is true; see below */
};

/* key_json: {"seed", "participants", "records",
 *   "troubles": [{"kind", "check", "column", "participant", "received", "true", "row"}],
 *   "counts": {CHECK: number of troubles},
 *   "arms": {"L": {...}, "W": {...}},         randomised, and what the generator drew from
 *   "effects": {"sbp": {"8 weeks", "26 weeks"}, "uacr": {...}}}   W minus L in mmHg; W over L as a ratio
 * check is one of missing-code, category-variant, unreadable-number, out-of-plausible-range, out-of-eligibility,
 * repeated-participant, below-limit; and beyond-fences, a genuine outlier, within the plausible range, that a box plot
 * of its column shows apart. One trouble per cell (repeated-participant: per participant, "column" is null,
 * "row" is the record that stands, "received" and "true" the two texts of the cell that differs); else "row" is the
 * record the cell is in. "true" is "" where the value is truly missing. */

/* Fills all five texts of out, which need not be initialised; the caller releases them. Draws again, from the seed
 * still, until every kind of trouble has found a participant to sit on, so no seed fails. */
void quayside_make(uint64_t seed, struct quayside *out);
void quayside_release(struct quayside *quayside);

/* The same trial with the same troubles as its data base would give it out in four files, one of them per participant,
 * two per visit, one per event. No file has a record of what did not take place: a visit without a value, a sample not
 * taken, an event nobody was asked about. The participant entered twice stands twice in people.csv and has two records of
 * the visit at 8 weeks. Dates are D/M/Y.
 *   people.csv  pid site grp sex age bmi randomised
 *   visits.csv  pid visit date sbp           visit is V0, V8 or V26
 *   labs.csv    pid visit sampled uacr
 *   events.csv  pid rescue rescue_date       rescue_date is blank unless rescue is Y
 * With the plan the four give the state of the wide export; with the decisions, that of the wide one decided. */
struct quayside_files {
    struct text people_csv, visits_csv, labs_csv, events_csv;
    struct text plan_json;      /* with "files": people, visits, labs, events, named as above */
    struct text decisions_json; /* those of the wide export in this plan's names */
};

/* Fills all six texts of out, which need not be initialised; the caller releases them. */
void quayside_make_files(uint64_t seed, struct quayside_files *out);
void quayside_files_release(struct quayside_files *files);
#endif
