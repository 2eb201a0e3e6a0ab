/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Permutation test of an arm in a linear model, by Freedman & Lane (1983, J Bus Econ Stat 1:292): residuals of the
 * model without the arm are shuffled within strata and the full model's |t| of each arm coefficient is compared with
 * the observed one; p = (b + 1) / (m + 1) (Phipson & Smyth 2010, Stat Appl Genet Mol Biol 9:39). */
#ifndef EVENHAND_STATS_PERMUTATION_H
#define EVENHAND_STATS_PERMUTATION_H
#include "stats/estimate.h"
#include <stddef.h>
#include <stdint.h>

struct permutation_result {
    enum status status;          /* as linear_fit; no-variance for an exact fit */
    size_t permutations;         /* m */
    size_t as_extreme;           /* b: |t| at least the observed one, less a relative 1e-9 for rounding */
    double t;                    /* observed */
    double p;                    /* never 0 */
    struct interval monte_carlo; /* Clopper-Pearson of b / m */
};

/* 9,999 while m n <= 4e6, else fewer, at least 199. */
size_t permutation_count(size_t n);

struct permutation_task {
    const double *const *columns; /* p columns of the full model, n values each */
    size_t p, n;
    size_t first_arm, arms; /* columns first_arm .. first_arm + arms - 1 are the arm's indicators; arms < p */
    const double *y;
    const size_t *strata; /* n labels (any numbers) within which is shuffled; NULL: one stratum */
    size_t permutations;  /* m, usually permutation_count(n) */
    uint64_t seed;
    const char *name;  /* of the task, for its generator */
    double confidence; /* of the Monte Carlo interval */
};
/* One result per arm coefficient, all from the same shuffles. */
void permutation_test(const struct permutation_task *task, struct permutation_result *results);
#endif
