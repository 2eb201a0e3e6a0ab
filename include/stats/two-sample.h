/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Two independent samples; effects are x minus y, in their unit. Arrays in any order. confidence in (0, 1). */
#ifndef EVENHAND_STATS_TWO_SAMPLE_H
#define EVENHAND_STATS_TWO_SAMPLE_H
#include "stats/estimate.h"
#include <stdbool.h>
#include <stddef.h>

/* Welch 1947 (Biometrika 34:28). Fewer than 2 in either: too-few; no spread in both: no-variance. */
struct estimate welch(const double *x, size_t nx, const double *y, size_t ny, double confidence);

/* Yuen 1974 (Biometrika 61:165): difference of trimmed means, `trim` off each end (0.2 is the usual 20%),
 * 0 <= trim < 0.5. Fewer than 2 left in either: too-few; winsorised variances both 0: no-variance. */
struct estimate trimmed_mean_difference(
    const double *x, size_t nx, const double *y, size_t ny, double trim, double confidence);

/* Hodges & Lehmann 1963 (Ann Math Stat 34:598): the exact median of all nx * ny differences, by selection in n log n;
 * p of the rank-sum test. No ties and both n < 50: exact distribution, interval [D(C), D(N + 1 - C)] with C its
 * quantile; else normal with tie and continuity correction, C = max(1, floor(N / 2 - z sqrt V)), N = nx ny, V the
 * tie-corrected variance. `achieved` is the interval's own level (1 - 2 P(W < C), in the normal case with the
 * continuity correction). Fewer than 2 in either: too-few; all values equal: no-variance. Has no standard_error and no
 * df. */
struct rank_shift {
    struct estimate estimate;
    double statistic; /* W: number of pairs with x > y, ties count one half */
    bool exact;
    double achieved;
};
struct rank_shift rank_shift(const double *x, size_t nx, const double *y, size_t ny, double confidence);
#endif
