/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Tails and quantiles, good to about 1e-12 of the value also far out and at large degrees of freedom (Student and F
 * by the continued fraction of the incomplete beta function: Abramowitz & Stegun 1964, 26.5.8 and 26.7.1).
 * Degrees of freedom that are not positive, and NaN anywhere, give NaN; never a silent 0. Thread-safe. */
#ifndef EVENHAND_STATS_DISTRIBUTIONS_H
#define EVENHAND_STATS_DISTRIBUTIONS_H
#include "stats/estimate.h"
#include <stddef.h>

double normal_lower(double z);     /* P(Z <= z) */
double normal_upper(double z);     /* P(Z > z) */
double normal_two_sided(double z); /* P(|Z| >= |z|) */
double normal_quantile(double probability);
double student_two_sided(double t, double df);          /* P(|T| >= |t|); df may be INFINITY */
double student_quantile(double probability, double df); /* lower tail; df may be INFINITY */
double chi_square_upper(double x, double df);           /* P(X > x) */
double f_upper(double f, double df1, double df2);       /* P(F > f) */
double beta_lower(double x, double a, double b);        /* the regularised incomplete beta function I_x(a, b) */
double beta_quantile(double probability, double a, double b);
/* Clopper & Pearson's exact interval for events/n (1934, Biometrika 26:404). n = 0 gives [0, 1]. */
struct interval binomial_interval(size_t events, size_t n, double confidence);
#endif
