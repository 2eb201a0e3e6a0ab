/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Properties of two-sample estimates: arms exchanged, shift and scale, row order, small and tied samples. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <cmocka.h>
#include "base/clock.h"
#include "base/memory.h"
#include "near.h"
#include "stats/order.h"
#include "stats/random.h"
#include "stats/two-sample.h"

enum { NX = 23, NY = 31, METHODS = 3 };

static void draw(double *x, size_t n, const char *task, double step) {
    struct generator g;
    generator_init(&g, 2, task);
    for (size_t i = 0; i < n; i++) {
        double u = generator_uniform(&g), value = 20.0 * log(u / (1.0 - u));
        x[i] = step > 0 ? step * rint(value / step) : value;
    }
}

static struct estimate by(int method, const double *x, size_t nx, const double *y, size_t ny) {
    return method == 0   ? welch(x, nx, y, ny, 0.95)
           : method == 1 ? trimmed_mean_difference(x, nx, y, ny, 0.2, 0.95)
                         : rank_shift(x, nx, y, ny, 0.95).estimate;
}

static void same(const struct estimate *a, const struct estimate *b, double scale, double shift, const char *label) {
    assert_int_equal(a->status, b->status);
    near(a->estimate, scale * b->estimate + shift, 1e-11, 1e-11, label);
    near(a->low, scale * (scale < 0 ? b->high : b->low) + shift, 1e-11, 1e-11, label);
    near(a->high, scale * (scale < 0 ? b->low : b->high) + shift, 1e-11, 1e-11, label);
    near(a->standard_error, fabs(scale) * b->standard_error, 1e-11, 0, label);
    near(a->df, b->df, 1e-10, 0, label);
}

static void arms_are_symmetric_and_units_follow(void **state) {
    (void)state;
    for (int step = 0; step < 2; step++)
        for (int method = 0; method < METHODS; method++) {
            double x[NX], y[NY], u[NX], v[NY];
            draw(x, NX, "x", step * 4.0);
            draw(y, NY, "y", step * 4.0);
            struct estimate e = by(method, x, NX, y, NY), turned = by(method, y, NY, x, NX);
            same(&turned, &e, -1, 0, "arms exchanged");
            near(turned.p, e.p, 1e-11, 0, "p with arms exchanged");
            for (size_t i = 0; i < NX; i++)
                u[i] = 2.0 * x[NX - 1 - i] + 64.0; /* rows turned round as well */
            for (size_t i = 0; i < NY; i++)
                v[i] = 2.0 * y[NY - 1 - i] + 60.0;
            struct estimate moved = by(method, u, NX, v, NY);
            /* p is of no difference, so only unmoved arms keep it */
            same(&moved, &e, 2, 4, "shift and scale");
            for (size_t i = 0; i < NY; i++)
                v[i] += 4.0;
            near(by(method, u, NX, v, NY).p, e.p, 1e-10, 0, "p of scaled values");
        }
}

static void small_samples_have_a_status(void **state) {
    (void)state;
    const double x[] = {1, 2, 3}, tied[] = {5, 5, 5, 5};
    for (int method = 0; method < METHODS; method++) {
        assert_int_equal(by(method, x, 0, x, 3).status, STATUS_TOO_FEW);
        assert_int_equal(by(method, x, 1, x, 3).status, STATUS_TOO_FEW);
        assert_int_equal(by(method, x, 3, x, 1).status, STATUS_TOO_FEW);
        assert_true(isnan(by(method, x, 1, x, 3).estimate));
        struct estimate e = by(method, tied, 4, tied, 3);
        assert_int_equal(e.status, STATUS_NO_VARIANCE);
        assert_true(isnan(e.estimate) && isnan(e.low) && isnan(e.p));
    }
    assert_int_equal(welch(x, 2, x, 2, 0.95).status, STATUS_OK);
}

static void no_trimming_is_welch(void **state) {
    (void)state;
    double x[NX], y[NY];
    draw(x, NX, "a", 0);
    draw(y, NY, "b", 0);
    struct estimate w = welch(x, NX, y, NY, 0.9), t = trimmed_mean_difference(x, NX, y, NY, 0, 0.9);
    same(&t, &w, 1, 0, "trim 0");
    near(t.p, w.p, 1e-12, 0, "p");
}

static void huge_values_keep_their_digits(void **state) {
    (void)state;
    const double x[] = {1e300, 1.1e300, 1.3e300}, y[] = {-1e300, -0.7e300, -1.2e300};
    const double u[] = {1, 1.1, 1.3}, v[] = {-1, -0.7, -1.2};
    struct rank_shift big = rank_shift(x, 3, y, 3, 0.95), small = rank_shift(u, 3, v, 3, 0.95);
    near(big.estimate.estimate, 1e300 * small.estimate.estimate, 1e-14, 0, "shift");
    near(big.estimate.p, 0.1, 1e-14, 0, "the smallest p of three against three");
}

/* The estimate and both limits are entries of the sorted differences. */
static void shift_by_all_differences(void **state) {
    (void)state;
    static const struct {
        size_t nx, ny;
        double step;
        bool exact;
    } cases[] = {{5, 4, 0, true}, {49, 49, 0, true}, {50, 20, 0, false}, {30, 30, 10, false}, {200, 170, 0, false}};
    for (size_t k = 0; k < sizeof cases / sizeof *cases; k++) {
        size_t nx = cases[k].nx, ny = cases[k].ny, n = nx * ny;
        double x[200], y[200], *all = memory_new(n, sizeof *all);
        draw(x, nx, "first", cases[k].step);
        draw(y, ny, "second", cases[k].step);
        for (size_t i = 0; i < n; i++)
            all[i] = x[i / ny] - y[i % ny];
        sort_numbers(all, n);
        struct rank_shift r = rank_shift(x, nx, y, ny, 0.95);
        assert_int_equal(r.exact, cases[k].exact);
        assert_true(r.estimate.estimate == median_of_sorted(all, n));
        size_t c = 0;
        while (all[c] < r.estimate.low)
            c++;
        assert_true(all[c] == r.estimate.low);
        assert_true(all[n - 1 - c] <= r.estimate.high); /* ties may start before C */
        assert_true(r.achieved >= (r.exact ? 0.95 : 0.94) && r.achieved < 1.0);
        memory_free(all);
    }
}

static void fifty_thousand_an_arm_are_quick(void **state) {
    (void)state;
    enum { EACH = 50000 };
    double *x = memory_new(2 * EACH, sizeof *x);
    draw(x, 2 * EACH, "many", 0);
    double start = clock_seconds();
    struct rank_shift r = rank_shift(x, EACH, x + EACH, EACH, 0.95);
    double took = clock_seconds() - start;
    print_message("    50,000 against 50,000 in %.0f ms\n", 1e3 * took);
    assert_int_equal(r.estimate.status, STATUS_OK);
    assert_true(r.estimate.low < r.estimate.estimate && r.estimate.estimate < r.estimate.high);
    assert_true(took < 5.0);
    memory_free(x);
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(arms_are_symmetric_and_units_follow),
        cmocka_unit_test(small_samples_have_a_status),
        cmocka_unit_test(no_trimming_is_welch),
        cmocka_unit_test(huge_values_keep_their_digits),
        cmocka_unit_test(shift_by_all_differences),
        cmocka_unit_test(fifty_thousand_an_arm_are_quick),
    };
    return cmocka_run_group_tests_name("stats/two-sample", tests, NULL, NULL);
}
