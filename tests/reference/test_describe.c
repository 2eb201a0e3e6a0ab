/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Summaries against R on open data (tests/reference/compute.R: quantile type 7, mad, shapiro.test, robustbase::mc). */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <cmocka.h>
#include "reference.h"
#include "stats/describe.h"

static struct table numbers, values;

static void check_set(const char *set) {
    size_t n;
    double *sorted = table_numbers(&numbers, "value", "set", set, &n);
    sorted = sorted_copy(&numbers.arena, sorted, n);
    struct description d = describe(sorted, n);
    struct fences f = tukey_fences(sorted, n);
    struct adjusted_fences a = adjusted_fences(sorted, n);
    struct interval w = whiskers(sorted, n);
    struct shapiro_wilk s = shapiro_wilk(sorted, n);
    const struct {
        const char *quantity;
        double got, tolerance;
    } checks[] = {
        {"mean", d.mean, 1e-12}, {"sd", d.sd, 1e-12}, {"minimum", d.minimum, 0}, {"maximum", d.maximum, 0},
        {"lower_quartile", d.lower_quartile, 1e-14}, {"median", d.median, 1e-14},
        {"upper_quartile", d.upper_quartile, 1e-14}, {"skewness", d.skewness, 1e-12}, {"whisker low", w.low, 0},
        {"whisker high", w.high, 0}, {"inner low", f.inner.low, 1e-13}, {"inner high", f.inner.high, 1e-13},
        {"outer low", f.outer.low, 1e-13}, {"outer high", f.outer.high, 1e-13},
        {"tenth", quantile(sorted, n, 0.1), 1e-13}, {"deviation", median_absolute_deviation(sorted, n), 1e-13},
        {"medcouple", a.medcouple, 1e-12}, {"adjusted low", a.fences.low, 1e-11},
        {"adjusted high", a.fences.high, 1e-11}, {"w", s.w, 1e-10},
        {"p", s.p, 1e-8}, /* R's p comes from its own 1 - W in another order of sums; far tails magnify that */
    };
    assert_int_equal(s.status, STATUS_OK);
    for (size_t i = 0; i < sizeof checks / sizeof *checks; i++)
        table_check(&values, set, checks[i].quantity, checks[i].got, checks[i].tolerance);
}

static void agrees_with_r(void **state) {
    (void)state;
    static const char *const sets[] = {"trees", "rivers", "precip", "ozone", "faithful", "depth", "islands", "weights",
        "sums", "three", "four", "five", "six", "ties"};
    for (size_t i = 0; i < sizeof sets / sizeof *sets; i++)
        check_set(sets[i]);
}

/* Shapiro & Wilk's own example prints W = 0.79 (1965, Biometrika 52:591; from memory). */
static void shapiro_prints_as_published(void **state) {
    (void)state;
    size_t n;
    double *x = table_numbers(&numbers, "value", "set", "weights", &n);
    near(shapiro_wilk(x, n).w, 0.79, 0, 0.005, "W of the men's weights");
}

int main(void) {
    numbers = table_read("tests/reference/data/numbers.csv");
    values = table_read("tests/reference/values/describe.csv");
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(agrees_with_r),
        cmocka_unit_test(shapiro_prints_as_published),
    };
    int failed = cmocka_run_group_tests_name("reference/describe", tests, NULL, NULL);
    table_release(&numbers);
    table_release(&values);
    return failed;
}
