/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Two samples against R (t.test, wilcox.test, base R's trimmed mean in Yuen's formula: tests/reference/compute.R). */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <cmocka.h>
#include "reference.h"
#include "stats/two-sample.h"

static struct table samples, values;

static void check_number(
    const char *name, const char *method, const char *level, const char *what, double got, double tolerance) {
    char quantity[64];
    snprintf(quantity, sizeof quantity, "%s %s %s", method, level, what);
    table_check(&values, name, quantity, got, tolerance);
}

static void check_estimate(const char *name, const char *method, const char *level, const struct estimate *e) {
    assert_int_equal(e->status, STATUS_OK);
    check_number(name, method, level, "estimate", e->estimate, 1e-12);
    check_number(name, method, level, "standard_error", e->standard_error, 1e-12);
    check_number(name, method, level, "df", e->df, 1e-11);
    check_number(name, method, level, "low", e->low, 1e-10);
    check_number(name, method, level, "high", e->high, 1e-10);
    check_number(name, method, level, "p", e->p, 1e-10);
}

static void check_pair(const char *name, const double *x, size_t nx, const double *y, size_t ny) {
    static const struct {
        const char *text;
        double level;
    } levels[] = {{"0.95", 0.95}, {"0.99", 0.99}};
    for (size_t i = 0; i < 2; i++) {
        const char *level = levels[i].text;
        struct estimate w = welch(x, nx, y, ny, levels[i].level);
        struct estimate t = trimmed_mean_difference(x, nx, y, ny, 0.2, levels[i].level);
        struct rank_shift r = rank_shift(x, nx, y, ny, levels[i].level);
        check_estimate(name, "welch", level, &w);
        check_estimate(name, "trimmed", level, &t);
        assert_int_equal(r.estimate.status, STATUS_OK);
        check_number(name, "rank", level, "estimate", r.estimate.estimate, 1e-13);
        check_number(name, "rank", level, "low", r.estimate.low, 1e-14);
        check_number(name, "rank", level, "high", r.estimate.high, 1e-14);
        check_number(name, "rank", level, "p", r.estimate.p, 1e-10);
        check_number(name, "rank", level, "achieved", r.achieved, 1e-12);
        check_number(name, "rank", level, "statistic", r.statistic, 0);
    }
}

static void check_file(const char *path, const char *column, const char *key, const char *x, const char *y,
    const char *minus, const char *name) {
    struct table t = table_read(path);
    size_t nx = 0, ny = 0;
    double *first = ARENA_NEW(&t.arena, t.rows, double), *second = ARENA_NEW(&t.arena, t.rows, double);
    for (size_t i = 0; i < t.rows; i++) {
        double value = table_number(&t, i, column) - (minus ? table_number(&t, i, minus) : 0.0);
        if (isnan(value))
            continue;
        if (strcmp(table_cell(&t, i, key), x) == 0)
            first[nx++] = value;
        else if (strcmp(table_cell(&t, i, key), y) == 0)
            second[ny++] = value;
    }
    check_pair(name, first, nx, second, ny);
    table_release(&t);
}

static void agrees_with_r_on_trials(void **state) {
    (void)state;
    check_file("tests/reference/data/sleep.csv", "extra", "group", "1", "2", NULL, "sleep");
    check_file("tests/reference/data/anorexia.csv", "Postwt", "Treat", "FT", "Cont", "Prewt", "anorexia");
    check_file("tests/reference/data/btheb.csv", "month2", "treatment", "BtheB", "TAU", "before", "btheb");
}

static void agrees_with_r_on_samples(void **state) {
    (void)state;
    static const char *const sets[] = {
        "permeability", "depression", "outlier", "small", "eleven", "fours", "rivers_ozone", "eruptions"};
    for (size_t s = 0; s < sizeof sets / sizeof *sets; s++) {
        double *x = ARENA_NEW(&samples.arena, samples.rows, double),
               *y = ARENA_NEW(&samples.arena, samples.rows, double);
        size_t nx = 0, ny = 0;
        for (size_t i = 0; i < samples.rows; i++)
            if (strcmp(table_cell(&samples, i, "set"), sets[s]) == 0) {
                double value = table_number(&samples, i, "value");
                if (*table_cell(&samples, i, "sample") == 'x')
                    x[nx++] = value;
                else
                    y[ny++] = value;
            }
        check_pair(sets[s], x, nx, y, ny);
    }
}

/* R's help on rank tests prints for the permeability data W = 35, p = 0.2544 (0.1272 one-sided); the interval is exact.
 */
static void prints_the_known_example(void **state) {
    (void)state;
    const double x[] = {0.80, 0.83, 1.89, 1.04, 1.45, 1.38, 1.91, 1.64, 0.73, 1.46};
    const double y[] = {1.15, 0.88, 0.90, 0.74, 1.21};
    struct rank_shift r = rank_shift(x, 10, y, 5, 0.95);
    assert_true(r.exact);
    near(r.statistic, 35, 0, 0, "W");
    near(r.estimate.p, 2 * 0.127206, 1e-5, 0, "p");
    near(r.estimate.estimate, 0.305, 1e-12, 0, "shift");
    near(r.estimate.low, -0.15, 1e-12, 0, "low");
    near(r.estimate.high, 0.76, 1e-12, 0, "high");
    near(r.achieved, 0.96, 0, 5e-4, "achieved level");
}

int main(void) {
    samples = table_read("tests/reference/data/samples.csv");
    values = table_read("tests/reference/values/two-sample.csv");
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(agrees_with_r_on_trials),
        cmocka_unit_test(agrees_with_r_on_samples),
        cmocka_unit_test(prints_the_known_example),
    };
    int failed = cmocka_run_group_tests_name("reference/two-sample", tests, NULL, NULL);
    table_release(&samples);
    table_release(&values);
    return failed;
}
