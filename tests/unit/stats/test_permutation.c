/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The permutation test against a plain reading of its definition: shuffle, add to the fit without the arm, refit,
 * compare; and the generator it draws from. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <cmocka.h>
#include "base/memory.h"
#include "near.h"
#include "stats/linear.h"
#include "stats/permutation.h"
#include "stats/random.h"
#include <string.h>

enum { N = 30, M = 499 };

static double one[N], first[N], second[N], before[N], after[N];
static size_t strata[N];
static const double *columns[] = {one, first, second, before};

static void make(void) {
    struct generator g;
    generator_init(&g, 4, "trial");
    for (size_t i = 0; i < N; i++) {
        one[i] = 1;
        first[i] = (double)(i % 3 == 1);
        second[i] = (double)(i % 3 == 2);
        strata[i] = i % 2 ? 10 : 4;
        before[i] = 5 * generator_uniform(&g);
        after[i] = before[i] + 0.4 * first[i] + generator_uniform(&g) + (double)(i % 2);
    }
}

static struct permutation_task task_of(const size_t *labels) {
    return (struct permutation_task){columns, 4, N, 1, 2, after, labels, M, 42, "outcome", 0.95};
}

static double size_of_t(const double *y, size_t column, struct arena *arena) {
    struct linear_fit fit;
    linear_fit(&fit, columns, 4, y, N, arena);
    struct estimate e = linear_coefficient(&fit, COVARIANCE_CLASSICAL, column, 0.95);
    return fabs(e.estimate / e.standard_error);
}

/* Rows of one stratum in ascending order, strata by label; Fisher & Yates from the last row of each. */
static void shuffle_plainly(double *values, const size_t *labels, struct generator *g) {
    static const size_t label_order[] = {4, 10};
    for (size_t s = 0; s < 2; s++) {
        size_t rows[N], n = 0;
        for (size_t i = 0; i < N; i++)
            if (labels ? labels[i] == label_order[s] : s == 0)
                rows[n++] = i;
        for (size_t left = n; left > 1; left--) {
            size_t pick = generator_below(g, left);
            double held = values[rows[left - 1]];
            values[rows[left - 1]] = values[rows[pick]];
            values[rows[pick]] = held;
        }
    }
}

static void is_what_it_says(void **state) {
    (void)state;
    const size_t *const labels[] = {NULL, strata};
    for (size_t k = 0; k < 2; k++) {
        struct arena arena;
        arena_init(&arena);
        struct permutation_task task = task_of(labels[k]);
        struct permutation_result results[2];
        permutation_test(&task, results);
        const double *without[] = {one, before};
        struct linear_fit reduced;
        linear_fit(&reduced, without, 2, after, N, &arena);
        struct generator g;
        generator_init(&g, 42, "outcome");
        double values[N], y[N];
        size_t count[2] = {0, 0};
        memcpy(values, reduced.residuals, sizeof values);
        for (size_t m = 0; m < M; m++) {
            shuffle_plainly(values, labels[k], &g);
            for (size_t i = 0; i < N; i++)
                y[i] = reduced.fitted[i] + values[i];
            for (size_t a = 0; a < 2; a++)
                count[a] += size_of_t(y, 1 + a, &arena) >= size_of_t(after, 1 + a, &arena) * (1 - 1e-9);
        }
        for (size_t a = 0; a < 2; a++) {
            assert_int_equal(results[a].status, STATUS_OK);
            assert_int_equal(results[a].as_extreme, count[a]);
            assert_int_equal(results[a].permutations, M);
            near(fabs(results[a].t), size_of_t(after, 1 + a, &arena), 1e-12, 0, "t");
            near(results[a].p, ((double)count[a] + 1) / (M + 1), 1e-15, 0, "p");
            assert_true(results[a].monte_carlo.low <= (double)count[a] / M);
            assert_true(results[a].monte_carlo.high >= (double)count[a] / M);
        }
        arena_release(&arena);
    }
}

static void repeats_and_depends_on_seed_and_name(void **state) {
    (void)state;
    struct permutation_task task = task_of(NULL), other = task_of(NULL), named = task_of(NULL);
    struct permutation_result a[2], b[2], c[2], d[2];
    other.seed = 43;
    named.name = "another";
    permutation_test(&task, a);
    permutation_test(&task, b);
    permutation_test(&other, c);
    permutation_test(&named, d);
    assert_int_equal(a[0].as_extreme, b[0].as_extreme);
    assert_int_equal(a[1].as_extreme, b[1].as_extreme);
    assert_true(a[0].as_extreme != c[0].as_extreme || a[1].as_extreme != c[1].as_extreme);
    assert_true(a[0].as_extreme != d[0].as_extreme || a[1].as_extreme != d[1].as_extreme);
}

static void hands_a_status_on(void **state) {
    (void)state;
    struct permutation_task few = task_of(NULL), exact = task_of(NULL), collinear = task_of(NULL);
    struct permutation_result r[2];
    const double *twice[] = {one, first, second, second};
    few.n = 4;
    permutation_test(&few, r);
    assert_int_equal(r[0].status, STATUS_TOO_FEW);
    assert_true(isnan(r[1].p));
    exact.y = before;
    permutation_test(&exact, r);
    assert_int_equal(r[0].status, STATUS_NO_VARIANCE);
    collinear.columns = twice;
    permutation_test(&collinear, r);
    assert_int_equal(r[1].status, STATUS_SINGULAR);
}

static void counts_follow_the_rule(void **state) {
    (void)state;
    static const struct {
        size_t n, count;
    } cases[] = {
        {0, 9999}, {1, 9999}, {300, 9999}, {400, 9999}, {401, 9975}, {4000, 1000}, {20000, 200}, {100000, 199}};
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++)
        assert_int_equal(permutation_count(cases[i].n), cases[i].count);
}

static void draws_are_even(void **state) {
    (void)state;
    struct generator g;
    size_t counts[7] = {0};
    double sum = 0, chi_square = 0;
    generator_init(&g, 5, "even");
    for (int i = 0; i < 70000; i++) {
        size_t x = generator_below(&g, 7);
        assert_true(x < 7);
        counts[x]++;
        double u = generator_uniform(&g);
        assert_true(u > 0.0 && u < 1.0);
        sum += u;
    }
    for (size_t i = 0; i < 7; i++)
        chi_square += ((double)counts[i] - 10000) * ((double)counts[i] - 10000) / 10000;
    assert_true(chi_square < 30); /* p about 4e-5 at 6 df; the seed is fixed */
    near(sum / 70000, 0.5, 0, 0.005, "mean of uniform draws");
    assert_int_equal(generator_below(&g, 1), 0);
    double large = 0;
    for (int i = 0; i < 10000; i++)
        large += (double)generator_below(&g, SIZE_MAX - 5) / (double)SIZE_MAX / 10000;
    near(large, 0.5, 0, 0.015, "mean of draws below a large limit");
}

/* First outputs of xoshiro256** from the state 1, 2, 3, 4, by hand from its definition: rotl(2 * 5, 7) * 9 = 11520,
 * then 0. */
static void generator_is_the_published_one(void **state) {
    (void)state;
    struct generator g = {{1, 2, 3, 4}};
    static const uint64_t wanted[] = {11520, 0, 1509978240, 1215971899390074240};
    for (size_t i = 0; i < 4; i++)
        assert_true(generator_next(&g) == wanted[i]);
}

int main(void) {
    make();
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(is_what_it_says),
        cmocka_unit_test(repeats_and_depends_on_seed_and_name),
        cmocka_unit_test(hands_a_status_on),
        cmocka_unit_test(counts_follow_the_rule),
        cmocka_unit_test(draws_are_even),
        cmocka_unit_test(generator_is_the_published_one),
    };
    return cmocka_run_group_tests_name("stats/permutation", tests, NULL, NULL);
}
