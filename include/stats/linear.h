/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Ordinary least squares by QR (Gram-Schmidt, each column orthogonalised twice, sums in extended precision) on centred
 * columns of unit length; never normal equations. columns[j][i] is column j of row i; the constant, where wanted, is a
 * column of equal values like any other. */
#ifndef EVENHAND_STATS_LINEAR_H
#define EVENHAND_STATS_LINEAR_H
#include "base/memory.h"
#include "stats/estimate.h"
#include <stdbool.h>
#include <stddef.h>

struct linear_fit {
    enum status status;     /* ok; too-few: n <= p; singular. The arrays are NULL unless ok */
    size_t singular_column; /* singular: the first column that the constant and those before it determine */
    size_t n, p;
    double df;             /* n - p */
    double sigma;          /* residual standard deviation */
    double sum_of_squares; /* of the residuals */
    bool exact;            /* residuals are rounding only: contrasts have status no-variance */
    double *coefficients;  /* p */
    double *fitted;        /* n */
    double *residuals;     /* n */
    double *leverages;     /* n, in [0, 1] */
    double *unscaled;      /* p x p, (X'X)^-1 */
    double *gain;          /* p x n, (X'X)^-1 X': row j is how each value enters coefficient j */
    double *basis;         /* p x n: orthonormal rows that span what the columns span */
    double *mean_row;      /* p: the columns' means */
    /* For linear_contrast, so that nothing cancels when a baseline lies far from 0: */
    size_t constant;         /* the constant's column, p where there is none */
    double *centred_gain;    /* n: gain of the constant when all other columns are centred; NULL without one */
    double centred_constant; /* that coefficient */
};

/* p >= 1. All arrays come from the arena. A column counts as determined when what the others leave of it is below
 * 1e-11 of its centred length. */
void linear_fit(
    struct linear_fit *fit, const double *const *columns, size_t p, const double *y, size_t n, struct arena *arena);

/* Covariances of the coefficients. HC0 to HC3: White 1980 (Econometrica 48:817); MacKinnon & White 1985 (J Econometrics
 * 29:305); Long & Ervin 2000 (Am Stat 54:217). A row of leverage 1 (alone in its level, say) has residual 0: in HC2 and
 * HC3 it adds nothing to what it does not touch, and makes what it determines not estimable. */
enum covariance_kind { COVARIANCE_CLASSICAL, COVARIANCE_HC0, COVARIANCE_HC1, COVARIANCE_HC2, COVARIANCE_HC3 };

/* sum of weights[j] * coefficient j (p weights) with interval and p by t(n - p). A fit that is not ok hands its status
 * on; an exact fit or a zero error is no-variance; a contrast that a row of leverage 1 determines is too-few under HC2
 * and HC3.
 * An adjusted mean (average prediction over the rows with the arm set for all) is the contrast whose weights are
 * mean_row with the arm's indicators replaced, as the model is linear and the arm stands in those columns alone. */
struct estimate linear_contrast(
    const struct linear_fit *fit, enum covariance_kind kind, const double *weights, double confidence);
/* The same for one coefficient. */
struct estimate linear_coefficient(
    const struct linear_fit *fit, enum covariance_kind kind, size_t column, double confidence);
/* The whole covariance matrix, p x p numbers, of a fit that is ok; NaN where a row of leverage 1 decides. */
void linear_covariance(const struct linear_fit *fit, enum covariance_kind kind, double *covariance);
#endif
