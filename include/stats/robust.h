/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Huber's M-estimate of a linear model (Huber 1964, Ann Math Stat 35:73; Huber & Ronchetti 2009, ch. 7): k = 1.345,
 * start at least squares, scale = median |residual| / 0.6745 without centring at each step, no leverage weights, until
 * the residuals change by less than 1e-12 of their size. Covariance (X'X)^-1 with Huber's correction (1981, eq. 6.5),
 * t(n - p). */
#ifndef EVENHAND_STATS_ROBUST_H
#define EVENHAND_STATS_ROBUST_H
#include "base/memory.h"
#include "stats/estimate.h"
#include <stddef.h>

struct huber_fit {
    enum status status; /* too-few, singular, no-variance (half of the residuals are 0), not-converged */
    size_t singular_column;
    size_t n, p;
    double df; /* n - p */
    double scale;
    size_t steps;
    double *coefficients; /* p */
    double *residuals;    /* n */
    double *weights;      /* n, in (0, 1] */
    double *covariance;   /* p x p */
};

/* As linear_fit: columns[j][i], p >= 1, arrays from the arena, NULL unless ok. */
void huber_fit(
    struct huber_fit *fit, const double *const *columns, size_t p, const double *y, size_t n, struct arena *arena);
struct estimate huber_coefficient(const struct huber_fit *fit, size_t column, double confidence);
#endif
