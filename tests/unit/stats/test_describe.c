/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Properties of summaries: size 0, 1, 2, ties, shift and scale, mirror image, brute force where there is one. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <cmocka.h>
#include "base/clock.h"
#include "near.h"
#include "stats/describe.h"
#include "stats/order.h"
#include "stats/random.h"
#include "stats/select.h"

static struct arena arena;
enum { MANY = 100000 };

static double *draw(size_t n, const char *task, bool rounded) {
    struct generator g;
    generator_init(&g, 1, task);
    double *x = ARENA_NEW(&arena, n, double);
    for (size_t i = 0; i < n; i++) {
        double u = generator_uniform(&g);
        x[i] = rounded ? floor(-10.0 * log(u)) : -10.0 * log(u);
    }
    return x;
}

static void nothing_is_not_a_number(void **state) {
    (void)state;
    struct description d = describe(NULL, 0);
    assert_int_equal(d.n, 0);
    assert_true(isnan(d.mean) && isnan(d.sd) && isnan(d.minimum) && isnan(d.median) && isnan(d.skewness));
    assert_true(isnan(whiskers(NULL, 0).low) && isnan(tukey_fences(NULL, 0).inner.high));
    assert_true(
        isnan(medcouple(NULL, 0)) && isnan(median_absolute_deviation(NULL, 0)) && isnan(quantile(NULL, 0, 0.5)));
    assert_int_equal(shapiro_wilk(NULL, 0).status, STATUS_TOO_FEW);
    assert_int_equal(nice_bins(NULL, 0).count, 0);
    assert_non_null(sorted_copy(&arena, NULL, 0));
}

static void one_and_two_values(void **state) {
    (void)state;
    const double x[] = {3, 7};
    struct description one = describe(x, 1), two = describe(x, 2);
    assert_true(one.mean == 3 && one.median == 3 && isnan(one.sd) && isnan(one.skewness));
    near(two.sd, 4 / sqrt(2), 1e-15, 0, "sd of two");
    near(two.lower_quartile, 4, 0, 0, "quartile of two");
    near(two.skewness, 0, 0, 1e-15, "skewness of two");
    near(medcouple(x, 2), 0, 0, 0, "medcouple of two");
    near(median_absolute_deviation(x, 2), 1.4826 * 2, 1e-15, 0, "deviation of two");
    assert_int_equal(shapiro_wilk(x, 2).status, STATUS_TOO_FEW);
}

static void constants_have_no_spread(void **state) {
    (void)state;
    const double x[] = {0.1, 0.1, 0.1, 0.1, 0.1};
    struct description d = describe(x, 5);
    assert_true(d.sd == 0.0 && d.mean == 0.1 && isnan(d.skewness));
    near(medcouple(x, 5), 0, 0, 0, "medcouple of a constant");
    assert_int_equal(shapiro_wilk(x, 5).status, STATUS_NO_VARIANCE);
    assert_true(isnan(robust_z(0.1, d.median, median_absolute_deviation(x, 5))));
    struct bins b = nice_bins(x, 5);
    assert_int_equal(b.count, 1);
    assert_int_equal(b.counts[0], 5);
    assert_true(b.limits[0] < 0.1 && b.limits[1] > 0.1);
}

static void huge_values_do_not_overflow(void **state) {
    (void)state;
    const double x[] = {-1e300, -0.5e300, 0, 0.25e300, 1e300};
    struct description d = describe(x, 5), small = describe((const double[]){-1, -0.5, 0, 0.25, 1}, 5);
    near(d.mean, small.mean * 1e300, 1e-14, 0, "mean");
    near(d.sd, small.sd * 1e300, 1e-14, 0, "sd");
    near(d.skewness, small.skewness, 1e-12, 1e-14, "skewness");
    near(shapiro_wilk(x, 5).w, shapiro_wilk((const double[]){-1, -0.5, 0, 0.25, 1}, 5).w, 1e-12, 0, "w");
    struct bins b = nice_bins(x, 5);
    assert_true(b.count > 1 && b.limits[0] <= -1e300 && b.limits[b.count] >= 1e300);
}

/* y = a x + b: locations follow, spreads scale, shapes stay (or turn round where a < 0). */
static void shift_and_scale(void **state) {
    (void)state;
    static const struct { double a, b; } maps[] = {{1, 1000}, {2.5, 0}, {-1, 0}, {-0.01, 7}};
    const size_t n = 101;
    double *x = sorted_copy(&arena, draw(n, "shift", false), n), y[101];
    struct description d = describe(x, n);
    double m = medcouple(x, n), deviation = median_absolute_deviation(x, n);
    struct shapiro_wilk s = shapiro_wilk(x, n);
    for (size_t k = 0; k < sizeof maps / sizeof *maps; k++) {
        double a = maps[k].a, b = maps[k].b, sign = a < 0 ? -1 : 1;
        for (size_t i = 0; i < n; i++)
            y[i] = a * x[i] + b;
        sort_numbers(y, n);
        struct description e = describe(y, n);
        near(e.mean, a * d.mean + b, 1e-13, 1e-13, "mean");
        near(e.sd, fabs(a) * d.sd, 1e-11, 0, "sd");
        near(e.lower_quartile, a * (a < 0 ? d.upper_quartile : d.lower_quartile) + b, 1e-13, 1e-13, "quartile");
        near(e.skewness, sign * d.skewness, 1e-9, 0, "skewness");
        near(medcouple(y, n), sign * m, 1e-9, 0, "medcouple");
        near(median_absolute_deviation(y, n), fabs(a) * deviation, 1e-10, 0, "deviation");
        near(shapiro_wilk(y, n).w, s.w, 1e-10, 0, "w");
    }
}

static double kernel(double low, double high, double median) {
    return ((high - median) - (median - low)) / (high - low);
}

/* The medcouple by all pairs, for samples without a value equal to the median. */
static void medcouple_by_all_pairs(void **state) {
    (void)state;
    const size_t n = 90;
    double *x = sorted_copy(&arena, draw(n, "pairs", false), n), *all = ARENA_NEW(&arena, n * n, double);
    double median = median_of_sorted(x, n);
    size_t count = 0;
    for (size_t i = 0; i < n / 2; i++)
        for (size_t j = n / 2; j < n; j++)
            all[count++] = kernel(x[i], x[j], median);
    sort_numbers(all, count);
    near(medcouple(x, n), median_of_sorted(all, count), 1e-14, 0, "medcouple");
}

static double sum_of(const void *context, size_t row, size_t column) {
    const double *x = context;
    return x[row] + x[column];
}

static void selection_finds_every_rank(void **state) {
    (void)state;
    for (int rounded = 0; rounded < 2; rounded++) {
        const size_t n = 60;
        double *x = sorted_copy(&arena, draw(n, "ranks", rounded), n), *all = ARENA_NEW(&arena, n * n, double);
        struct staircase matrix = {n, n, sum_of, x};
        for (size_t i = 0; i < n * n; i++)
            all[i] = x[i / n] + x[i % n];
        sort_numbers(all, n * n);
        for (size_t k = 0; k < n * n; k += 7)
            assert_true(select_smallest(&matrix, k) == all[k]);
        assert_true(select_smallest(&matrix, 0) == all[0] && select_smallest(&matrix, n * n - 1) == all[n * n - 1]);
    }
}

/* Hyndman & Fan's type 7 by hand. */
static void quantiles_by_hand(void **state) {
    (void)state;
    const double x[] = {1, 2, 4, 8};
    near(quantile(x, 4, 0), 1, 0, 0, "least");
    near(quantile(x, 4, 0.25), 1.75, 1e-15, 0, "lower quartile");
    near(quantile(x, 4, 0.5), 3, 1e-15, 0, "median");
    near(quantile(x, 4, 0.75), 5, 1e-15, 0, "upper quartile");
    near(quantile(x, 4, 1), 8, 0, 0, "largest");
}

static void shapiro_wilk_has_its_limits(void **state) {
    (void)state;
    double *x = sorted_copy(&arena, draw(5001, "limits", false), 5001);
    assert_int_equal(shapiro_wilk(x, 5000).status, STATUS_OK);
    assert_int_equal(shapiro_wilk(x, 5001).status, STATUS_BEYOND_METHOD);
    near(shapiro_wilk((const double[]){1, 2, 3}, 3).p, 1, 1e-12, 0, "three evenly spaced");
    near(shapiro_wilk((const double[]){1, 1, 2}, 3).p, 0, 0, 1e-7, "three, two of them equal: W = 0.75");
}

static void bins_hold_everything(void **state) {
    (void)state;
    static const struct {
        size_t n;
        bool rounded;
        double scale, shift;
    } cases[] = {{2, false, 1, 0}, {10, false, 1, 0}, {300, false, 1, 140}, {300, true, 1, 0}, {5000, true, 1, 0},
        {5000, false, 1e-6, 0}, {5000, false, 1e6, -3e7}, {MANY, true, 0.1, 5}};
    for (size_t k = 0; k < sizeof cases / sizeof *cases; k++) {
        size_t n = cases[k].n, total = 0;
        double *x = sorted_copy(&arena, draw(n, "bins", cases[k].rounded), n), step = INFINITY;
        for (size_t i = 0; i < n; i++)
            x[i] = cases[k].scale * x[i] + cases[k].shift;
        struct bins b = nice_bins(x, n);
        assert_true(b.count >= 1 && b.count <= BINS_MAX);
        assert_true(b.limits[0] <= x[0] && b.limits[b.count] >= x[n - 1] && b.limits[1] > x[0]);
        for (size_t i = 0; i < b.count; i++) {
            size_t count = 0;
            for (size_t j = 0; j < n; j++)
                count +=
                    x[j] >= b.limits[i] && (x[j] < b.limits[i + 1] || (i + 1 == b.count && x[j] <= b.limits[i + 1]));
            assert_int_equal(count, b.counts[i]);
            total += count;
            step = fmin(step, b.limits[i + 1] - b.limits[i]);
        }
        assert_int_equal(total, n);
        if (cases[k].rounded && n >= 300)
            assert_true(step >= cases[k].scale * (1 - 1e-9)); /* no comb */
    }
}

static void a_hundred_thousand_are_quick(void **state) {
    (void)state;
    double *values = draw(MANY, "quick", false), start = clock_seconds();
    double *x = sorted_copy(&arena, values, MANY);
    double sum = describe(x, MANY).mean + adjusted_fences(x, MANY).medcouple + median_absolute_deviation(x, MANY) +
                 (double)nice_bins(x, MANY).count + tukey_fences(x, MANY).inner.low + whiskers(x, MANY).high;
    double took = clock_seconds() - start;
    print_message("    everything but the test of normality at 100,000 values: %.1f ms\n", 1e3 * took);
    assert_true(isfinite(sum));
    assert_true(took < 2.0); /* 60 ms is meant; sanitizers and busy machines are slower */
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(nothing_is_not_a_number),
        cmocka_unit_test(one_and_two_values),
        cmocka_unit_test(constants_have_no_spread),
        cmocka_unit_test(huge_values_do_not_overflow),
        cmocka_unit_test(shift_and_scale),
        cmocka_unit_test(medcouple_by_all_pairs),
        cmocka_unit_test(selection_finds_every_rank),
        cmocka_unit_test(quantiles_by_hand),
        cmocka_unit_test(shapiro_wilk_has_its_limits),
        cmocka_unit_test(bins_hold_everything),
        cmocka_unit_test(a_hundred_thousand_are_quick),
    };
    arena_init(&arena);
    int failed = cmocka_run_group_tests_name("stats/describe", tests, NULL, NULL);
    arena_release(&arena);
    return failed;
}
