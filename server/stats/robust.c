/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "stats/robust.h"
#include "stats/linear.h"
#include "stats/order.h"
#include <math.h>
#include <stdbool.h>
#include <string.h>

static const double tuning = 1.345, enough = 1e-12;
enum { STEPS_MAX = 2000 };

static double scale_of(const double *residuals, size_t n, double *scratch) {
    for (size_t i = 0; i < n; i++)
        scratch[i] = fabs(residuals[i]);
    sort_numbers(scratch, n);
    return median_of_sorted(scratch, n) / 0.6745;
}

static double weight_of(double u) {
    return fabs(u) <= tuning ? 1.0 : tuning / fabs(u);
}

static double largest_size(const double *values, size_t n) {
    double largest = 0.0;
    for (size_t i = 0; i < n; i++)
        largest = fmax(largest, fabs(values[i]));
    return largest;
}

/* One step: least squares with rows weighted, on an orthonormal basis of the columns (as good a design, and the
 * columns' offsets cannot spoil it). False when the weighted rows are singular. */
static bool step(const struct huber_fit *fit, const double *basis, const double *y, struct arena *arena) {
    size_t n = fit->n, p = fit->p;
    double *weighted = ARENA_NEW(arena, n * (p + 1), double), *target = weighted + n * p;
    const double **columns = ARENA_NEW(arena, p, const double *);
    for (size_t j = 0; j < p; j++)
        columns[j] = weighted + j * n;
    for (size_t i = 0; i < n; i++) {
        double root = sqrt(fit->weights[i]);
        for (size_t j = 0; j < p; j++)
            weighted[j * n + i] = root * basis[j * n + i];
        target[i] = root * y[i];
    }
    struct linear_fit inner;
    linear_fit(&inner, columns, p, target, n, arena);
    if (inner.status != STATUS_OK)
        return false;
    for (size_t i = 0; i < n; i++) {
        long double fitted = 0.0L;
        for (size_t j = 0; j < p; j++)
            fitted += (long double)inner.coefficients[j] * (long double)basis[j * n + i];
        fit->residuals[i] = (double)((long double)y[i] - fitted);
    }
    return true;
}

/* On the residuals of least squares in place of y: the residuals sought are the same, and an offset of y by millions
 * leaves no rounding that would keep the steps from settling. */
static enum status iterate(
    struct huber_fit *fit, const struct linear_fit *start, const double *y, struct arena *scratch) {
    size_t n = fit->n;
    double *before = ARENA_NEW(scratch, n, double), *sizes = ARENA_NEW(scratch, n, double);
    double nothing = 1e-13 * largest_size(y, n);
    for (fit->steps = 1; fit->steps <= STEPS_MAX; fit->steps++) {
        memcpy(before, fit->residuals, n * sizeof *before);
        fit->scale = scale_of(before, n, sizes);
        if (!(fit->scale > nothing))
            return STATUS_NO_VARIANCE;
        for (size_t i = 0; i < n; i++)
            fit->weights[i] = weight_of(before[i] / fit->scale);
        struct arena arena;
        arena_init(&arena);
        bool done = step(fit, start->basis, start->residuals, &arena);
        arena_release(&arena);
        if (!done)
            return STATUS_SINGULAR;
        long double change = 0.0L, size = 0.0L;
        for (size_t i = 0; i < n; i++) {
            long double off = (long double)fit->residuals[i] - (long double)before[i];
            change += off * off;
            size += (long double)before[i] * (long double)before[i];
        }
        if (change <= (long double)(enough * enough) * size)
            return STATUS_OK;
    }
    return STATUS_NOT_CONVERGED;
}

/* Coefficients from what the residuals moved since least squares, and their covariance: (X'X)^-1 S (kappa / m)^2, with
 * S the sum of squares of the weighted residuals over n - p, m the share of rows with full weight,
 * kappa = 1 + p var(psi') / (n m^2). */
static void finish(struct huber_fit *fit, const struct linear_fit *start) {
    size_t n = fit->n, p = fit->p;
    long double squares = 0.0L, full = 0.0L, count = (long double)n;
    for (size_t i = 0; i < n; i++) {
        double u = fit->residuals[i] / fit->scale;
        long double psi = (long double)fit->residuals[i] * (long double)weight_of(u);
        squares += psi * psi;
        full += fabs(u) <= tuning ? 1.0L : 0.0L;
    }
    long double share = full / count, variance = count * share * (1.0L - share) / (count - 1.0L);
    long double kappa = 1.0L + (long double)p * variance / (count * share * share);
    long double factor = squares / (long double)fit->df * (kappa / share) * (kappa / share);
    for (size_t j = 0; j < p; j++) {
        long double sum = 0.0L;
        for (size_t i = 0; i < n; i++)
            sum += (long double)start->gain[j * n + i] *
                ((long double)start->residuals[i] - (long double)fit->residuals[i]);
        fit->coefficients[j] = (double)((long double)start->coefficients[j] + sum);
    }
    for (size_t k = 0; k < p * p; k++)
        fit->covariance[k] = (double)((long double)start->unscaled[k] * factor);
}

void huber_fit(
    struct huber_fit *fit, const double *const *columns, size_t p, const double *y, size_t n, struct arena *arena) {
    struct arena scratch;
    arena_init(&scratch);
    struct linear_fit start;
    linear_fit(&start, columns, p, y, n, &scratch);
    *fit = (struct huber_fit){.status = start.status,
        .singular_column = start.singular_column,
        .n = n,
        .p = p,
        .df = start.df,
        .scale = (double)NAN};
    if (start.status == STATUS_OK) {
        fit->coefficients = ARENA_NEW(arena, p, double);
        fit->residuals = ARENA_NEW(arena, n, double);
        fit->weights = ARENA_NEW(arena, n, double);
        fit->covariance = ARENA_NEW(arena, p * p, double);
        memcpy(fit->residuals, start.residuals, n * sizeof *fit->residuals);
        fit->status = start.exact ? STATUS_NO_VARIANCE : iterate(fit, &start, y, &scratch);
    }
    if (fit->status == STATUS_OK)
        finish(fit, &start);
    else
        fit->coefficients = fit->residuals = fit->weights = fit->covariance = NULL;
    arena_release(&scratch);
}

struct estimate huber_coefficient(const struct huber_fit *fit, size_t column, double confidence) {
    if (fit->status != STATUS_OK)
        return estimate_none(fit->status);
    BUG_IF(column >= fit->p);
    return estimate_by_t(
        fit->coefficients[column], sqrt(fit->covariance[column * fit->p + column]), fit->df, confidence);
}
