/* SPDX-License-Identifier: GPL-3.0-or-later */
/* One column of numbers: summary, quantiles, fences, shape, histogram bins. `sorted` is n finite values in ascending
 * order (sorted_copy makes it), so results do not depend on the order of rows. All in n log n at most. */
#ifndef EVENHAND_STATS_DESCRIBE_H
#define EVENHAND_STATS_DESCRIBE_H
#include "base/memory.h"
#include "stats/estimate.h"
#include <stddef.h>

double *sorted_copy(struct arena *arena, const double *values, size_t n); /* never NULL, also for n = 0 */

/* NaN where undefined: all at n = 0; sd at n = 1; skewness where nothing varies.
 * sd has divisor n - 1; skewness is m3 / m2^1.5 (divisor n); quartiles are type 7.
 * Two passes with sums in extended precision: no overflow up to 1e300. */
struct description {
    size_t n;
    double mean, sd, minimum, lower_quartile, median, upper_quartile, maximum, skewness;
};
struct description describe(const double *sorted, size_t n);

/* Hyndman & Fan 1996 (Am Stat 50:361), type 7. probability in [0, 1]; NaN at n = 0. */
double quantile(const double *sorted, size_t n, double probability);

/* Box plot whiskers: the most extreme values within 1.5 IQR of the box. NaN at n = 0. */
struct interval whiskers(const double *sorted, size_t n);

/* Tukey 1977: quartiles -+ 1.5 IQR (inner) and 3 IQR (outer). NaN at n = 0. */
struct fences {
    struct interval inner, outer;
};
struct fences tukey_fences(const double *sorted, size_t n);

/* Medcouple (Brys, Hubert & Struyf 2004, J Comput Graph Stat 13:996), in [-1, 1], the plain median of its kernel (mean
 * of the middle two at an even count); 0 where nothing varies, NaN at n = 0. */
double medcouple(const double *sorted, size_t n);
/* Fences for skewed data (Hubert & Vandervieren 2008, Comput Stat Data Anal 52:5186): [Q1 - 1.5 exp(-4 M) IQR,
 * Q3 + 1.5 exp(3 M) IQR] for M >= 0, with exponents -3 M and 4 M for M < 0. */
struct adjusted_fences {
    double medcouple;
    struct interval fences;
};
struct adjusted_fences adjusted_fences(const double *sorted, size_t n);

/* 1.4826 times the median of |x - median|; NaN at n = 0. A value's robust z is (value - median) / this. */
double median_absolute_deviation(const double *sorted, size_t n);
/* NaN where the deviation is 0. */
double robust_z(double value, double median, double deviation);

/* Shapiro-Wilk by Royston 1995 (Appl Stat 44:547, AS R94); n = 3 exactly. Status too-few below 3, beyond-method above
 * 5,000, no-variance for constants (a range within rounding of the largest size included). */
struct shapiro_wilk {
    enum status status;
    double w, p;
};
struct shapiro_wilk shapiro_wilk(const double *sorted, size_t n);

/* Histogram bins [limit i, limit i + 1), the last one closed; width is 1, 2 or 5 times a power of ten and limits are
 * its multiples. As many as Freedman & Diaconis' rule asks (1981, Z Wahrscheinlichkeitstheorie 57:453, 2 IQR n^(-1/3))
 * or Sturges' (1926), whichever are more, but at most BINS_MAX, and where most values repeat no bin is narrower than
 * the smallest step between values. Where all values are equal, one bin about them; none at n = 0. */
enum { BINS_MAX = 60 };
struct bins {
    size_t count;
    double limits[BINS_MAX + 1]; /* count + 1 ascending limits */
    size_t counts[BINS_MAX];     /* they add up to n */
};
struct bins nice_bins(const double *sorted, size_t n);
#endif
