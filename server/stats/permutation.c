/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "stats/permutation.h"
#include "base/memory.h"
#include "stats/distributions.h"
#include "stats/linear.h"
#include "stats/random.h"
#include <math.h>
#include <stdlib.h>
#include <string.h>

size_t permutation_count(size_t n) {
    enum { MOST = 9999, LEAST = 199 };
    const size_t work = 4000000;
    size_t count = n == 0 ? MOST : work / n;
    return count > MOST ? MOST : count < LEAST ? LEAST : count;
}

/* Rows in order of stratum: rows start[s] .. start[s + 1] - 1 of `rows` are one stratum. */
struct strata {
    size_t *rows, *start, count;
};

struct labelled {
    size_t label, row;
};

static int by_label_and_row(const void *a, const void *b) {
    const struct labelled *x = a, *y = b;
    return x->label != y->label ? (x->label > y->label ? 1 : -1) : (x->row > y->row) - (x->row < y->row);
}

static struct strata group_rows(const size_t *labels, size_t n, struct arena *arena) {
    struct labelled *order = ARENA_NEW(arena, n, struct labelled);
    for (size_t i = 0; i < n; i++)
        order[i] = (struct labelled){labels ? labels[i] : 0, i};
    qsort(order, n, sizeof *order, by_label_and_row);
    struct strata strata = {ARENA_NEW(arena, n, size_t), ARENA_NEW(arena, n + 1, size_t), 0};
    for (size_t i = 0; i < n; i++) {
        if (i == 0 || order[i].label != order[i - 1].label)
            strata.start[strata.count++] = i;
        strata.rows[i] = order[i].row;
    }
    strata.start[strata.count] = n;
    return strata;
}

/* Fisher & Yates within each stratum, from the values as they are left. */
static void shuffle(const struct strata *strata, double *values, struct generator *generator) {
    for (size_t s = 0; s < strata->count; s++) {
        const size_t *rows = strata->rows + strata->start[s];
        for (size_t left = strata->start[s + 1] - strata->start[s]; left > 1; left--) {
            size_t pick = generator_below(generator, left);
            double held = values[rows[left - 1]];
            values[rows[left - 1]] = values[rows[pick]];
            values[rows[pick]] = held;
        }
    }
}

/* What the shuffles need of the full model. An outcome is `fitted without the arm + shuffled residuals`; the first part
 * lies in the span of the columns without touching the arm's coefficients, so only the residuals count, through their
 * parts along an orthonormal basis. */
enum { LANES = 4 };
struct projector {
    size_t n, p, lanes;     /* lanes: p rounded up */
    double *rows;           /* n x lanes: the basis, row by row, filled up with zeros */
    double *parts;          /* lanes */
    const double *weights;  /* arms x p: each arm coefficient from the parts */
    const double *unscaled; /* arms: its variance per unit of sigma squared */
    double df;
};

static double dot(const double *a, const double *b, size_t n) {
    double sum = 0.0;
    for (size_t i = 0; i < n; i++)
        sum += a[i] * b[i];
    return sum;
}

static struct projector projector_of(
    const struct permutation_task *task, const struct linear_fit *full, struct arena *arena) {
    size_t n = task->n, p = task->p, lanes = (p + LANES - 1) / LANES * LANES;
    double *rows = ARENA_NEW(arena, n * lanes, double), *weights = ARENA_NEW(arena, task->arms * p, double);
    double *unscaled = ARENA_NEW(arena, task->arms, double);
    for (size_t k = 0; k < p; k++)
        for (size_t i = 0; i < n; i++)
            rows[i * lanes + k] = full->basis[k * n + i];
    for (size_t a = 0; a < task->arms; a++) {
        size_t j = task->first_arm + a;
        unscaled[a] = full->unscaled[j * p + j];
        for (size_t k = 0; k < p; k++)
            weights[a * p + k] = dot(full->gain + j * n, full->basis + k * n, n);
    }
    return (struct projector){n, p, lanes, rows, ARENA_NEW(arena, lanes, double), weights, unscaled, full->df};
}

/* Several sums side by side: each in the order of the rows, so the digits do not depend on how they are grouped. */
static void project(const struct projector *projector, const double *values) {
    for (size_t from = 0; from < projector->lanes; from += LANES) {
        double sums[LANES] = {0.0};
        const double *row = projector->rows + from;
        for (size_t i = 0; i < projector->n; i++, row += projector->lanes)
            for (size_t k = 0; k < LANES; k++)
                sums[k] += row[k] * values[i];
        memcpy(projector->parts + from, sums, sizeof sums);
    }
}

/* |t| of each arm coefficient; `squares` is the values' sum of squares, which no shuffle changes. */
static void t_of_arms(const struct projector *projector, size_t arms, const double *values, double squares, double *t) {
    project(projector, values);
    double rest = squares - dot(projector->parts, projector->parts, projector->p);
    double sigma = fmax(sqrt(fmax(rest, 0.0) / projector->df), 1e-300); /* a shuffle may fit by chance: |t| is huge */
    for (size_t a = 0; a < arms; a++)
        t[a] = fabs(dot(projector->weights + a * projector->p, projector->parts, projector->p)) /
               (sigma * sqrt(projector->unscaled[a]));
}

static void finish(
    const struct permutation_task *task, const struct linear_fit *full, struct permutation_result *results) {
    for (size_t a = 0; a < task->arms; a++) {
        struct permutation_result *r = &results[a];
        struct estimate e = linear_coefficient(full, COVARIANCE_CLASSICAL, task->first_arm + a, task->confidence);
        r->status = e.status;
        r->t = e.estimate / e.standard_error;
        r->permutations = task->permutations;
        r->p = ((double)r->as_extreme + 1.0) / ((double)r->permutations + 1.0);
        r->monte_carlo = binomial_interval(r->as_extreme, r->permutations, task->confidence);
    }
}

static void run(const struct permutation_task *task, const struct linear_fit *full, const struct linear_fit *reduced,
    struct permutation_result *results, struct arena *arena) {
    struct generator generator;
    generator_init(&generator, task->seed, task->name);
    struct strata strata = group_rows(task->strata, task->n, arena);
    double *values = ARENA_NEW(arena, task->n, double);
    double *observed = ARENA_NEW(arena, task->arms, double), *t = ARENA_NEW(arena, task->arms, double);
    memcpy(values, reduced->residuals, task->n * sizeof *values);
    struct projector projector = projector_of(task, full, arena);
    double squares = dot(values, values, task->n);
    t_of_arms(&projector, task->arms, values, squares, observed);
    for (size_t m = 0; m < task->permutations; m++) {
        shuffle(&strata, values, &generator);
        t_of_arms(&projector, task->arms, values, squares, t);
        for (size_t a = 0; a < task->arms; a++)
            results[a].as_extreme += !(t[a] < observed[a] * (1.0 - 1e-9));
    }
    finish(task, full, results);
}

void permutation_test(const struct permutation_task *task, struct permutation_result *results) {
    BUG_IF(
        task->arms == 0 || task->arms >= task->p || task->first_arm + task->arms > task->p || task->permutations == 0);
    struct arena arena;
    arena_init(&arena);
    const double **without = ARENA_NEW(&arena, task->p, const double *);
    size_t kept = 0;
    for (size_t j = 0; j < task->p; j++)
        if (j < task->first_arm || j >= task->first_arm + task->arms)
            without[kept++] = task->columns[j];
    struct linear_fit full, reduced;
    linear_fit(&full, task->columns, task->p, task->y, task->n, &arena);
    linear_fit(&reduced, without, kept, task->y, task->n, &arena);
    enum status status = full.status != STATUS_OK ? full.status : full.exact ? STATUS_NO_VARIANCE : reduced.status;
    for (size_t a = 0; a < task->arms; a++)
        results[a] = (struct permutation_result){
            .status = status, .t = (double)NAN, .p = (double)NAN, .monte_carlo = {(double)NAN, (double)NAN}};
    if (status == STATUS_OK)
        run(task, &full, &reduced, results, &arena);
    arena_release(&arena);
}
