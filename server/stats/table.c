/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "stats/table.h"
#include "base/memory.h"
#include "stats/distributions.h"
#include <math.h>
#include <stdbool.h>

/* Logarithms of factorials run to millions, and their differences must be good to 1e-11: extended precision. */
typedef long double wide;

/* Columns in ascending order of their totals; the last two are summed over in one go, those before are visited. */
struct enumeration {
    size_t *totals, columns, all;       /* all = the sum of totals */
    size_t drawn;                       /* the first row's sum */
    const wide *factorial;              /* ln i! */
    wide bound;                         /* ln of the observed probability with its slack, times the number of ways */
    wide *row, *from_left, *from_right; /* the last two columns with a given sum: ln ways, and summed from either end */
    size_t first, last;                 /* of the row: values of the last column but one */
    size_t mode;
    long double sum;
    wide ways; /* ln of the number of ways in all */
};

static wide ln_choose(const wide *factorial, size_t n, size_t k) {
    return factorial[n] - factorial[k] - factorial[n - k];
}

static size_t smaller(size_t a, size_t b) {
    return a < b ? a : b;
}

static void fill_row(struct enumeration *e, size_t sum) {
    size_t a = e->totals[e->columns - 2], b = e->totals[e->columns - 1];
    e->first = sum > b ? sum - b : 0;
    e->last = smaller(sum, a);
    e->mode = e->first;
    for (size_t x = e->first; x <= e->last; x++) {
        e->row[x] = ln_choose(e->factorial, a, x) + ln_choose(e->factorial, b, sum - x);
        if (e->row[x] > e->row[e->mode])
            e->mode = x;
    }
    wide top = e->row[e->mode], running = 0.0L;
    for (size_t x = e->first; x <= e->last; x++)
        e->from_left[x] = running += (wide)exp((double)(e->row[x] - top));
    running = 0.0L;
    for (size_t x = e->last + 1; x-- > e->first;)
        e->from_right[x] = running += (wide)exp((double)(e->row[x] - top));
}

/* The row rises to its mode and falls after it, so what is improbable enough is its two ends. */
static void add_ends(struct enumeration *e, wide prefix) {
    wide limit = e->bound - prefix, top = e->row[e->mode], part = 0.0L;
    if (top <= limit) {
        part = e->from_left[e->last];
    } else {
        size_t low = e->first, high = e->mode; /* first of the left side that is too probable */
        while (low < high) {
            size_t middle = low + (high - low) / 2;
            if (e->row[middle] <= limit)
                low = middle + 1;
            else
                high = middle;
        }
        part += low > e->first ? e->from_left[low - 1] : 0.0L;
        low = e->mode + 1;
        high = e->last + 1; /* first of the right side that is improbable enough */
        while (low < high) {
            size_t middle = low + (high - low) / 2;
            if (e->row[middle] <= limit)
                high = middle;
            else
                low = middle + 1;
        }
        part += low <= e->last ? e->from_right[low] : 0.0L;
    }
    if (part > 0.0L)
        e->sum += part * (wide)exp((double)(prefix + top - e->ways));
}

/* All ways to put `left` into the columns from `column` on, up to the last two; capacity is what these still hold. */
static void visit(struct enumeration *e, size_t column, size_t left, size_t capacity, wide prefix) {
    if (column + 2 == e->columns) {
        add_ends(e, prefix);
        return;
    }
    size_t total = e->totals[column], after = capacity - total;
    for (size_t x = left > after ? left - after : 0; x <= smaller(total, left); x++)
        visit(e, column + 1, left - x, after, prefix + ln_choose(e->factorial, total, x));
}

static double work_of(const struct enumeration *e, size_t prefix_capacity) {
    double prefixes = 1.0;
    for (size_t j = 0; j + 3 < e->columns; j++) /* the last of the prefix follows from its sum */
        prefixes *= (double)smaller(e->totals[j], e->drawn) + 1.0;
    double sums = (double)smaller(prefix_capacity, e->drawn) + 1.0;
    double row = (double)smaller(e->totals[e->columns - 2], e->drawn) + 1.0;
    return sums * (row + prefixes);
}

static double enumerate(struct enumeration *e, size_t prefix_capacity) {
    size_t rest = e->totals[e->columns - 2] + e->totals[e->columns - 1];
    for (size_t prefix = 0; prefix <= smaller(prefix_capacity, e->drawn); prefix++)
        if (e->drawn - prefix <= rest) {
            fill_row(e, e->drawn - prefix);
            visit(e, 0, prefix, prefix_capacity, 0.0L);
        }
    return (double)fminl(1.0L, e->sum);
}

/* Puts a column in its place among those before it; an insertion, as arms are few. */
static void insert_total(struct enumeration *e, size_t total) {
    size_t place = e->columns++;
    for (; place > 0 && e->totals[place - 1] > total; place--)
        e->totals[place] = e->totals[place - 1];
    e->totals[place] = total;
}

/* The probability of the observed table, with its slack, and room for a row. */
static void prepare(struct enumeration *e, const size_t *with, const size_t *without, size_t k, struct arena *arena) {
    wide *factorial = ARENA_NEW(arena, e->all + 1, wide);
    int sign;
    for (size_t i = 2; i <= e->all; i++)
        factorial[i] = lgammal_r((wide)i + 1.0L, &sign);
    e->factorial = factorial;
    e->ways = ln_choose(factorial, e->all, e->drawn);
    e->bound = log1pl(1e-7L);
    for (size_t j = 0; j < k; j++)
        e->bound += ln_choose(factorial, with[j] + without[j], with[j]);
    size_t width = e->totals[e->columns - 2] + 1;
    e->row = ARENA_NEW(arena, width, wide);
    e->from_left = ARENA_NEW(arena, width, wide);
    e->from_right = ARENA_NEW(arena, width, wide);
}

struct exact_test fisher_exact(const size_t *with, const size_t *without, size_t k) {
    BUG_IF(k < 2);
    struct arena arena;
    arena_init(&arena);
    struct enumeration e = {.totals = ARENA_NEW(&arena, k, size_t)};
    for (size_t j = 0; j < k; j++) {
        e.drawn += with[j];
        e.all += with[j] + without[j];
        if (with[j] + without[j] > 0)
            insert_total(&e, with[j] + without[j]);
    }
    struct exact_test result = {STATUS_OK, 1.0};
    if (e.all == 0) {
        result = (struct exact_test){STATUS_TOO_FEW, (double)NAN};
    } else if (e.columns >= 2 && e.drawn > 0 && e.drawn < e.all) {
        size_t prefix_capacity = e.all - e.totals[e.columns - 1] - e.totals[e.columns - 2];
        if (work_of(&e, prefix_capacity) > FISHER_LIMIT) {
            result = (struct exact_test){STATUS_BEYOND_METHOD, (double)NAN};
        } else {
            prepare(&e, with, without, k, &arena);
            result.p = enumerate(&e, prefix_capacity);
        }
    }
    arena_release(&arena);
    return result;
}

static struct standardised_difference no_difference(enum status status) {
    return (struct standardised_difference){status, (double)NAN};
}

static struct standardised_difference standardise(double difference, double variance) {
    if (!(variance > 0.0))
        return no_difference(STATUS_NO_VARIANCE);
    return (struct standardised_difference){STATUS_OK, difference / sqrt(variance)};
}

struct standardised_difference standardised_means(double mean1, double sd1, double mean0, double sd0) {
    if (isnan(mean1) || isnan(sd1) || isnan(mean0) || isnan(sd0))
        return no_difference(STATUS_TOO_FEW);
    return standardise(mean1 - mean0, (sd1 * sd1 + sd0 * sd0) / 2.0);
}

struct standardised_difference standardised_shares(size_t events1, size_t n1, size_t events0, size_t n0) {
    BUG_IF(events1 > n1 || events0 > n0);
    if (n1 == 0 || n0 == 0)
        return no_difference(STATUS_TOO_FEW);
    double p1 = (double)events1 / (double)n1, p0 = (double)events0 / (double)n0;
    return standardise(p1 - p0, (p1 * (1.0 - p1) + p0 * (1.0 - p0)) / 2.0);
}

/* d' S^-1 d by Cholesky in place, S positive definite of size p; NaN where it is not. */
static double quadratic_form(double *s, double *d, size_t p) {
    double sum = 0.0;
    for (size_t j = 0; j < p; j++) {
        double start = s[j * p + j], pivot = start;
        for (size_t k = 0; k < j; k++)
            pivot -= s[j * p + k] * s[j * p + k];
        if (!(pivot > 1e-12 * start))
            return (double)NAN;
        double root = sqrt(pivot);
        for (size_t i = j + 1; i < p; i++) {
            for (size_t k = 0; k < j; k++)
                s[i * p + j] -= s[i * p + k] * s[j * p + k];
            s[i * p + j] /= root;
        }
        for (size_t k = 0; k < j; k++)
            d[j] -= s[j * p + k] * d[k];
        d[j] /= root;
        sum += d[j] * d[j];
    }
    return sum;
}

struct standardised_difference standardised_levels(const size_t *counts1, const size_t *counts0, size_t k) {
    double n1 = 0.0, n0 = 0.0;
    for (size_t j = 0; j < k; j++) {
        n1 += (double)counts1[j];
        n0 += (double)counts0[j];
    }
    if (!(n1 > 0.0) || !(n0 > 0.0))
        return no_difference(STATUS_TOO_FEW);
    struct arena arena;
    arena_init(&arena);
    double *p1 = ARENA_NEW(&arena, k, double), *p0 = ARENA_NEW(&arena, k, double);
    size_t used = 0;
    for (size_t j = 0; j < k; j++)
        if (counts1[j] + counts0[j] > 0) {
            p1[used] = (double)counts1[j] / n1;
            p0[used++] = (double)counts0[j] / n0;
        }
    size_t p = used - 1; /* without the first level */
    double *s = ARENA_NEW(&arena, p * p + 1, double), *d = ARENA_NEW(&arena, p + 1, double);
    for (size_t i = 0; i < p; i++) {
        d[i] = p1[i + 1] - p0[i + 1];
        for (size_t j = 0; j < p; j++)
            s[i * p + j] =
                ((i == j ? p1[i + 1] + p0[i + 1] : 0.0) - p1[i + 1] * p1[j + 1] - p0[i + 1] * p0[j + 1]) / 2.0;
    }
    double squared = p == 0 ? (double)NAN : quadratic_form(s, d, p);
    arena_release(&arena);
    if (isnan(squared))
        return no_difference(STATUS_NO_VARIANCE);
    return (struct standardised_difference){STATUS_OK, sqrt(squared)};
}

double chance_envelope(size_t n1, size_t n0, double confidence) {
    if (n1 == 0 || n0 == 0)
        return (double)NAN;
    return normal_quantile(0.5 + confidence / 2.0) * sqrt(1.0 / (double)n1 + 1.0 / (double)n0);
}
