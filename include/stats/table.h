/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Tables of counts: Fisher's exact test for 2 x k, and standardised differences between two arms. */
#ifndef EVENHAND_STATS_TABLE_H
#define EVENHAND_STATS_TABLE_H
#include "stats/estimate.h"
#include <stddef.h>

struct exact_test {
    enum status status;
    double p;
};
/* Fisher's exact test of a 2 x k table (Fisher 1934; Freeman & Halton 1951, Biometrika 38:141): the sum of all tables
 * with the observed margins that are no more probable than the observed one (relative slack 1e-7), by enumeration in
 * all but the two largest columns. k >= 2. Margins that leave one table only give p = 1; no counts at all: too-few;
 * beyond-method where the work would pass FISHER_LIMIT terms (about a second). 2 x 2 is quick at any size up to
 * millions; three arms of thousands and four arms of several hundred are within the limit. */
#define FISHER_LIMIT 2e7
struct exact_test fisher_exact(const size_t *with, const size_t *without, size_t k);

/* A difference in units of the spread; NaN unless ok. */
struct standardised_difference {
    enum status status;
    double value;
};
/* (m1 - m0) / sqrt((s1^2 + s0^2) / 2); standard deviations NaN (n < 2): too-few, both 0: no-variance.
 * Austin 2009, Stat Med 28:3083. */
struct standardised_difference standardised_means(double mean1, double sd1, double mean0, double sd0);
/* (p1 - p0) / sqrt((p1 q1 + p0 q0) / 2); an empty arm: too-few; no spread in both: no-variance. Austin 2009. */
struct standardised_difference standardised_shares(size_t events1, size_t n1, size_t events0, size_t n0);
/* k levels: sqrt(d' S^-1 d), d the differences of shares without the first level, S the mean of the two multinomial
 * covariances; never negative; levels empty in both arms do not count. Yang & Dalton 2012, "A unified approach to
 * measuring the effect size between two groups" (from memory). S not invertible (all in one level, or no level
 * shared): no-variance; an empty arm: too-few. */
struct standardised_difference standardised_levels(const size_t *counts1, const size_t *counts0, size_t k);
/* Within -+ this a standardised difference lies by chance alone at the confidence: z sqrt(1/n1 + 1/n0). */
double chance_envelope(size_t n1, size_t n0, double confidence);
#endif
