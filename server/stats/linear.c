/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "stats/linear.h"
#include <math.h>
#include <string.h>

/* What the columns leave of a column of theirs, relative to its length, when it is a combination of the others:
 * rounding makes about 1e-16 of it; the ten powers of a number, the worst honest design in print, leave 1e-10. */
static const double determined = 1e-11;
/* Sums run in extended precision: it has the range for squares of any double, and three more digits. */
typedef long double wide;

struct work {
    const double *const *columns;
    size_t n, p;
    size_t *order; /* the constant first, then the others as they come */
    wide *q;       /* p x n orthonormal */
    wide *r;       /* p x p upper triangle, in order */
    wide *inverse; /* of r */
    wide *lengths; /* of the centred columns, in order */
};

static bool is_constant(const double *values, size_t n) {
    for (size_t i = 1; i < n; i++)
        if (values[i] != values[0])
            return false;
    return n > 0 && values[0] != 0.0;
}

static size_t find_constant(const double *const *columns, size_t p, size_t n) {
    for (size_t j = 0; j < p; j++)
        if (is_constant(columns[j], n))
            return j;
    return p;
}

static double mean_of(const double *values, size_t n) {
    wide sum = 0.0L;
    for (size_t i = 0; i < n; i++)
        sum += (wide)values[i];
    return (double)(sum / (wide)n);
}

static wide dot(const wide *a, const wide *b, size_t n) {
    wide sum = 0.0L;
    for (size_t i = 0; i < n; i++)
        sum += a[i] * b[i];
    return sum;
}

/* Takes out of v what the first `count` rows of q explain, twice (Kahan and Parlett: twice is enough); adds to parts.
 */
static void project_out(const struct work *work, size_t count, wide *v, wide *parts, size_t stride) {
    for (int pass = 0; pass < 2; pass++)
        for (size_t l = 0; l < count; l++) {
            const wide *q = work->q + l * work->n;
            wide part = dot(q, v, work->n);
            for (size_t i = 0; i < work->n; i++)
                v[i] -= part * q[i];
            parts[l * stride] += part;
        }
}

/* False when column order[k] is determined by those before it. */
static bool add_column(struct work *work, size_t k, wide centre) {
    const double *column = work->columns[work->order[k]];
    wide *v = work->q + k * work->n, size = 0.0L;
    for (size_t i = 0; i < work->n; i++) {
        v[i] = (wide)column[i] - centre;
        size = fmaxl(size, fabsl((wide)column[i]));
    }
    wide length = sqrtl(dot(v, v, work->n));
    if (length <= 1e-15L * size * sqrtl((wide)work->n))
        return false;
    for (size_t i = 0; i < work->n; i++)
        v[i] /= length;
    project_out(work, k, v, work->r + k, work->p);
    wide rest = sqrtl(dot(v, v, work->n));
    if (rest < (wide)determined)
        return false;
    for (size_t i = 0; i < work->n; i++)
        v[i] /= rest;
    work->r[k * work->p + k] = rest;
    work->lengths[k] = length;
    return true;
}

static void invert_triangle(struct work *work) {
    size_t p = work->p;
    for (size_t column = 0; column < p; column++)
        for (size_t row = column + 1; row-- > 0;) {
            wide sum = row == column ? 1.0L : 0.0L;
            for (size_t k = row + 1; k <= column; k++)
                sum -= work->r[row * p + k] * work->inverse[k * p + column];
            work->inverse[row * p + column] = sum / work->r[row * p + row];
        }
}

/* Coefficients, residuals and fitted values from y. `parts` are y's in the directions of q. */
static void solve(struct linear_fit *fit, const struct work *work, const double *y, wide *rest, wide *parts) {
    size_t n = work->n, p = work->p;
    for (size_t i = 0; i < n; i++)
        rest[i] = (wide)y[i];
    project_out(work, p, rest, parts, 1);
    wide sum = dot(rest, rest, n), largest = 0.0L;
    for (size_t i = 0; i < n; i++) {
        fit->residuals[i] = (double)rest[i];
        fit->fitted[i] = (double)((wide)y[i] - rest[i]);
        largest = fmaxl(largest, fabsl((wide)y[i]));
    }
    wide sigma = sqrtl(sum / (wide)(n - p));
    fit->sum_of_squares = (double)sum;
    fit->sigma = (double)sigma;
    fit->exact = sigma <= 1e-13L * largest;
}

/* coefficients = map parts, row by original column; the constant's row moved from the columns' centres to 0. */
static void map_to_columns(struct linear_fit *fit, const struct work *work, const wide *parts, wide *map) {
    size_t n = work->n, p = work->p, constant = fit->constant;
    for (size_t k = 0; k < p; k++)
        for (size_t l = k; l < p; l++)
            map[work->order[k] * p + l] = work->inverse[k * p + l] / work->lengths[k];
    if (constant < p) {
        wide value = (wide)work->columns[constant][0], *row = map + constant * p;
        fit->centred_constant = (double)(row[0] * parts[0]); /* the others are orthogonal to it */
        for (size_t i = 0; i < n; i++)
            fit->centred_gain[i] = (double)(row[0] * work->q[i]);
        for (size_t j = 0; j < p; j++)
            for (size_t l = 0; l < p && j != constant; l++)
                row[l] -= map[j * p + l] * (wide)fit->mean_row[j] / value;
    }
    for (size_t j = 0; j < p; j++)
        fit->coefficients[j] = (double)dot(map + j * p, parts, p);
    for (size_t j = 0; j < p; j++)
        for (size_t k = 0; k < p; k++)
            fit->unscaled[j * p + k] = (double)dot(map + j * p, map + k * p, p);
}

static void spread(struct linear_fit *fit, const struct work *work, const wide *map) {
    size_t n = work->n, p = work->p;
    for (size_t i = 0; i < n; i++) {
        wide leverage = 0.0L;
        for (size_t k = 0; k < p; k++) {
            wide q = work->q[k * n + i];
            fit->basis[k * n + i] = (double)q;
            leverage += q * q;
        }
        fit->leverages[i] = (double)fminl(leverage, 1.0L);
        for (size_t j = 0; j < p; j++) {
            wide sum = 0.0L;
            for (size_t k = 0; k < p; k++)
                sum += map[j * p + k] * work->q[k * n + i];
            fit->gain[j * n + i] = (double)sum;
        }
    }
}

static void allocate(struct linear_fit *fit, struct arena *arena) {
    size_t n = fit->n, p = fit->p;
    fit->coefficients = ARENA_NEW(arena, p, double);
    fit->fitted = ARENA_NEW(arena, n, double);
    fit->residuals = ARENA_NEW(arena, n, double);
    fit->leverages = ARENA_NEW(arena, n, double);
    fit->unscaled = ARENA_NEW(arena, p * p, double);
    fit->gain = ARENA_NEW(arena, p * n, double);
    fit->basis = ARENA_NEW(arena, p * n, double);
    fit->mean_row = ARENA_NEW(arena, p, double);
    fit->centred_gain = fit->constant < p ? ARENA_NEW(arena, n, double) : NULL;
}

static struct linear_fit without_arrays(const struct linear_fit *fit, enum status status, size_t column) {
    return (struct linear_fit){.status = status,
        .singular_column = column,
        .n = fit->n,
        .p = fit->p,
        .df = fit->n > fit->p ? (double)(fit->n - fit->p) : 0.0,
        .sigma = (double)NAN,
        .sum_of_squares = (double)NAN,
        .constant = fit->p};
}

static bool decompose(struct linear_fit *fit, struct work *work) {
    size_t constant = fit->constant;
    if (constant < work->p)
        work->order[0] = constant;
    for (size_t j = 0, next = constant < work->p; j < work->p; j++)
        if (j != constant)
            work->order[next++] = j;
    for (size_t k = 0; k < work->p; k++) {
        bool centred = constant < work->p && work->order[k] != constant;
        if (!add_column(work, k, centred ? (wide)fit->mean_row[work->order[k]] : 0.0L)) {
            *fit = without_arrays(fit, STATUS_SINGULAR, work->order[k]);
            return false;
        }
    }
    return true;
}

void linear_fit(
    struct linear_fit *fit, const double *const *columns, size_t p, const double *y, size_t n, struct arena *arena) {
    BUG_IF(p == 0);
    *fit = (struct linear_fit){.n = n, .p = p};
    if (n <= p) {
        *fit = without_arrays(fit, STATUS_TOO_FEW, 0);
        return;
    }
    fit->df = (double)(n - p);
    fit->constant = find_constant(columns, p, n);
    allocate(fit, arena);
    for (size_t j = 0; j < p; j++)
        fit->mean_row[j] = j == fit->constant ? columns[j][0] : mean_of(columns[j], n);
    struct arena scratch;
    arena_init(&scratch);
    struct work work = {columns, n, p, ARENA_NEW(&scratch, p, size_t), ARENA_NEW(&scratch, p * n, wide),
        ARENA_NEW(&scratch, p * p, wide), ARENA_NEW(&scratch, p * p, wide), ARENA_NEW(&scratch, p, wide)};
    if (decompose(fit, &work)) {
        wide *parts = ARENA_NEW(&scratch, p, wide), *map = ARENA_NEW(&scratch, p * p, wide);
        invert_triangle(&work);
        solve(fit, &work, y, ARENA_NEW(&scratch, n, wide), parts);
        map_to_columns(fit, &work, parts, map);
        spread(fit, &work, map);
    }
    arena_release(&scratch);
}

/* A row that the model reproduces whatever its value is. */
static bool has_full_leverage(double leverage) {
    return leverage >= 1.0 - 1e-9;
}

/* The size of the error each kind takes row i to have. */
static wide row_error(const struct linear_fit *fit, enum covariance_kind kind, size_t i) {
    wide residual = (wide)fit->residuals[i], rest = 1.0L - (wide)fit->leverages[i];
    switch (kind) {
    case COVARIANCE_CLASSICAL:
        return (wide)fit->sigma;
    case COVARIANCE_HC0:
        return residual;
    case COVARIANCE_HC1:
        return residual * sqrtl((wide)fit->n / (wide)fit->df);
    case COVARIANCE_HC2:
        return residual / sqrtl(rest);
    case COVARIANCE_HC3:
        return residual / rest;
    }
    return (wide)NAN;
}

static bool divides_by_leverage(enum covariance_kind kind) {
    return kind == COVARIANCE_HC2 || kind == COVARIANCE_HC3;
}

/* Covariance of the two quantities in which value i enters with u[i] and v[i]; NaN where a row of leverage 1 decides.
 */
static wide covary(const struct linear_fit *fit, enum covariance_kind kind, const double *u, const double *v) {
    wide uu = 0.0L, vv = 0.0L, sum = 0.0L;
    for (size_t i = 0; i < fit->n; i++) {
        uu += (wide)u[i] * (wide)u[i];
        vv += (wide)v[i] * (wide)v[i];
    }
    for (size_t i = 0; i < fit->n; i++) {
        if (divides_by_leverage(kind) && has_full_leverage(fit->leverages[i])) {
            if ((wide)u[i] * (wide)u[i] > 1e-18L * uu || (wide)v[i] * (wide)v[i] > 1e-18L * vv)
                return (wide)NAN;
            continue;
        }
        wide error = row_error(fit, kind, i);
        sum += (error * (wide)u[i]) * (error * (wide)v[i]);
    }
    return sum;
}

void linear_covariance(const struct linear_fit *fit, enum covariance_kind kind, double *covariance) {
    BUG_IF(fit->status != STATUS_OK);
    size_t n = fit->n, p = fit->p;
    for (size_t j = 0; j < p; j++)
        for (size_t k = 0; k <= j; k++) {
            double value = (double)covary(fit, kind, fit->gain + j * n, fit->gain + k * n);
            covariance[j * p + k] = covariance[k * p + j] = value;
        }
}

struct estimate linear_contrast(
    const struct linear_fit *fit, enum covariance_kind kind, const double *weights, double confidence) {
    if (fit->status != STATUS_OK)
        return estimate_none(fit->status);
    if (fit->exact)
        return estimate_none(STATUS_NO_VARIANCE);
    size_t n = fit->n, p = fit->p, constant = fit->constant;
    double *u = memory_new(n, sizeof *u);
    wide estimate = 0.0L;
    for (size_t j = 0; j < p; j++) {
        const double *gain = fit->gain + j * n;
        wide weight = (wide)weights[j], coefficient = (wide)fit->coefficients[j];
        if (j == constant) {
            gain = fit->centred_gain;
            coefficient = (wide)fit->centred_constant;
        } else if (constant <
                   p) { /* the constant now speaks of the columns' centres, so the others of what is off it */
            weight -= (wide)weights[constant] * (wide)fit->mean_row[j] / (wide)fit->mean_row[constant];
        }
        estimate += weight * coefficient;
        for (size_t i = 0; i < n; i++)
            u[i] = (double)((wide)u[i] + weight * (wide)gain[i]);
    }
    wide variance = covary(fit, kind, u, u);
    memory_free(u);
    if (isnan(variance))
        return estimate_none(STATUS_TOO_FEW);
    return estimate_by_t((double)estimate, (double)sqrtl(variance), fit->df, confidence);
}

struct estimate linear_coefficient(
    const struct linear_fit *fit, enum covariance_kind kind, size_t column, double confidence) {
    BUG_IF(column >= fit->p);
    double *weights = memory_new(fit->p, sizeof *weights);
    weights[column] = 1.0;
    struct estimate estimate = linear_contrast(fit, kind, weights, confidence);
    memory_free(weights);
    return estimate;
}
