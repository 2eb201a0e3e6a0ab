/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "stats/two-sample.h"
#include "base/memory.h"
#include "stats/describe.h"
#include "stats/distributions.h"
#include "stats/order.h"
#include "stats/select.h"
#include <math.h>
#include <stdint.h>

/* Two groups, each with a location, the squared error of it and that error's degrees of freedom: Welch's way. The
 * location is in extended precision, so that of two means near a million their difference keeps its digits. */
struct group {
    long double location;
    double squared_error, df;
};

static struct estimate compare(struct group x, struct group y, double confidence) {
    double total = x.squared_error + y.squared_error;
    if (!(total > 0.0))
        return estimate_none(STATUS_NO_VARIANCE);
    double share_x = x.squared_error / total, share_y = y.squared_error / total;
    double df = 1.0 / (share_x * share_x / x.df + share_y * share_y / y.df);
    return estimate_by_t((double)(x.location - y.location), sqrt(total), df, confidence);
}

static long double mean_of(const double *values, size_t n) {
    long double sum = 0.0L;
    for (size_t i = 0; i < n; i++)
        sum += (long double)values[i] - (long double)values[0];
    return (long double)values[0] + sum / (long double)n;
}

static struct group by_mean(struct arena *arena, const double *values, size_t n) {
    const double *sorted = sorted_copy(arena, values, n); /* the order of rows changes no digit */
    struct description d = describe(sorted, n);
    return (struct group){mean_of(sorted, n), d.sd * d.sd / (double)n, (double)(n - 1)};
}

struct estimate welch(const double *x, size_t nx, const double *y, size_t ny, double confidence) {
    if (nx < 2 || ny < 2)
        return estimate_none(STATUS_TOO_FEW);
    struct arena arena;
    arena_init(&arena);
    struct estimate result = compare(by_mean(&arena, x, nx), by_mean(&arena, y, ny), confidence);
    arena_release(&arena);
    return result;
}

static size_t cut_of(size_t n, double trim) {
    return (size_t)floor(trim * (double)n);
}

static struct group by_trimmed_mean(struct arena *arena, const double *values, size_t n, double trim) {
    size_t cut = cut_of(n, trim), left = n - 2 * cut;
    double *sorted = sorted_copy(arena, values, n);
    long double mean = mean_of(sorted + cut, left);
    for (size_t i = 0; i < cut; i++) { /* winsorise: the order stays */
        sorted[i] = sorted[cut];
        sorted[n - 1 - i] = sorted[n - 1 - cut];
    }
    double sd = describe(sorted, n).sd, h = (double)left;
    return (struct group){mean, (double)(n - 1) * sd * sd / (h * (h - 1.0)), h - 1.0};
}

struct estimate trimmed_mean_difference(
    const double *x, size_t nx, const double *y, size_t ny, double trim, double confidence) {
    BUG_IF(!(trim >= 0.0 && trim < 0.5));
    if (nx - 2 * cut_of(nx, trim) < 2 || ny - 2 * cut_of(ny, trim) < 2)
        return estimate_none(STATUS_TOO_FEW);
    struct arena arena;
    arena_init(&arena);
    struct estimate result =
        compare(by_trimmed_mean(&arena, x, nx, trim), by_trimmed_mean(&arena, y, ny, trim), confidence);
    arena_release(&arena);
    return result;
}

/* Two sorted samples and what their joint ranks say. */
struct ranked {
    const double *x, *y;
    size_t nx, ny;
    double w;       /* pairs with x > y, ties one half */
    double tie_sum; /* sum of t^3 - t over groups of t equal values */
};

static void rank(struct ranked *r) {
    size_t i = 0, j = 0;
    while (i < r->nx || j < r->ny) {
        double value = i == r->nx ? r->y[j] : j == r->ny ? r->x[i] : fmin(r->x[i], r->y[j]);
        size_t from_x = 0, from_y = 0;
        for (; i < r->nx && r->x[i] == value; i++)
            from_x++;
        for (; j < r->ny && r->y[j] == value; j++)
            from_y++;
        double t = (double)(from_x + from_y);
        r->w += (double)from_x * ((double)(j - from_y) + 0.5 * (double)from_y);
        r->tie_sum += t * t * t - t;
    }
}

static double difference(const void *context, size_t row, size_t column) {
    const struct ranked *r = context;
    return r->x[row] - r->y[r->ny - 1 - column];
}

/* Number of ways W takes each value 0 .. nx ny: coefficients of the Gaussian binomial, Mann & Whitney 1947. */
static double *ways(size_t nx, size_t ny) {
    size_t last = nx * ny;
    double *count = memory_new(last + 1, sizeof *count);
    count[0] = 1.0;
    for (size_t k = 1; k <= nx; k++) {
        for (size_t w = last; w >= ny + k && w <= last; w--) /* times 1 - q^(ny + k) */
            count[w] -= count[w - ny - k];
        for (size_t w = k; w <= last; w++) /* over 1 - q^k */
            count[w] += count[w - k];
    }
    return count;
}

/* P(W <= w) for w = 0 .. nx ny, in place. */
static void accumulate(double *count, size_t last) {
    for (size_t w = 1; w <= last; w++)
        count[w] += count[w - 1];
    double total = count[last];
    for (size_t w = 0; w <= last; w++)
        count[w] /= total;
}

/* Fills p and achieved; returns C. */
static uint64_t by_exact(const struct ranked *r, double confidence, struct rank_shift *result) {
    size_t last = r->nx * r->ny, w = (size_t)r->w, smaller = w < last - w ? w : last - w, c = 0;
    double *cumulative = ways(r->nx, r->ny), tail = (1.0 - confidence) / 2.0;
    accumulate(cumulative, last);
    while (cumulative[c] < tail * (1.0 - 1e-12))
        c++;
    c = c == 0 ? 1 : c;
    result->exact = true;
    result->estimate.p = fmin(1.0, 2.0 * cumulative[smaller]);
    result->achieved = 1.0 - 2.0 * cumulative[c - 1];
    memory_free(cumulative);
    return c;
}

static uint64_t by_normal(const struct ranked *r, double variance, double confidence, struct rank_shift *result) {
    double middle = 0.5 * (double)r->nx * (double)r->ny, sd = sqrt(variance);
    double off = fmax(0.0, fabs(r->w - middle) - 0.5);
    double c = fmax(1.0, floor(middle - normal_quantile(0.5 + confidence / 2.0) * sd));
    result->estimate.p = r->w == middle ? 1.0 : fmin(1.0, normal_two_sided(off / sd));
    result->achieved = fmax(0.0, 1.0 - normal_two_sided(fmax(0.0, (middle - c + 0.5) / sd)));
    return (uint64_t)c;
}

struct rank_shift rank_shift(const double *x, size_t nx, const double *y, size_t ny, double confidence) {
    BUG_IF(!(confidence > 0.0 && confidence < 1.0));
    struct rank_shift result = {estimate_none(STATUS_TOO_FEW), (double)NAN, false, (double)NAN};
    if (nx < 2 || ny < 2)
        return result;
    struct arena arena;
    arena_init(&arena);
    struct ranked r = {sorted_copy(&arena, x, nx), sorted_copy(&arena, y, ny), nx, ny, 0.0, 0.0};
    rank(&r);
    double n = (double)nx + (double)ny, pairs = (double)nx * (double)ny;
    double variance = pairs / 12.0 * (n + 1.0 - r.tie_sum / (n * (n - 1.0)));
    result.statistic = r.w;
    if (r.tie_sum >= n * n * n - n) {
        result.estimate.status = STATUS_NO_VARIANCE;
    } else {
        bool exact = r.tie_sum == 0.0 && nx < 50 && ny < 50;
        uint64_t c = exact ? by_exact(&r, confidence, &result) : by_normal(&r, variance, confidence, &result);
        struct staircase differences = {nx, ny, difference, &r};
        uint64_t count = (uint64_t)nx * ny;
        result.estimate.status = STATUS_OK;
        result.estimate.estimate = select_median(&differences);
        result.estimate.low = select_smallest(&differences, c - 1);
        result.estimate.high = select_smallest(&differences, count - c);
    }
    arena_release(&arena);
    return result;
}
