/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Exact tests and standardised differences: order of arms, margins that decide, empty arms, known values. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <cmocka.h>
#include "near.h"
#include "stats/table.h"

static double p_of(size_t k, const size_t *with, const size_t *without) {
    struct exact_test e = fisher_exact(with, without, k);
    assert_int_equal(e.status, STATUS_OK);
    return e.p;
}

/* Three arms by brute force over every table with the margins. */
static double by_all_tables(const size_t *with, const size_t *without) {
    size_t n[3], drawn = 0;
    double observed = 0, all = 0, sum = 0;
    for (int pass = 0; pass < 2; pass++) {
        for (size_t j = 0; j < 3; j++)
            n[j] = with[j] + without[j];
        drawn = with[0] + with[1] + with[2];
        all = lgamma((double)(n[0] + n[1] + n[2]) + 1) - lgamma((double)drawn + 1) -
              lgamma((double)(n[0] + n[1] + n[2] - drawn) + 1);
        for (size_t a = 0; a <= n[0]; a++)
            for (size_t b = 0; b <= n[1]; b++) {
                if (a + b > drawn || drawn - a - b > n[2])
                    continue;
                size_t x[3] = {a, b, drawn - a - b};
                double ways = -all;
                for (size_t j = 0; j < 3; j++)
                    ways += lgamma((double)n[j] + 1) - lgamma((double)x[j] + 1) - lgamma((double)(n[j] - x[j]) + 1);
                if (pass == 0 && a == with[0] && b == with[1])
                    observed = ways;
                if (pass == 1 && ways <= observed + 1e-7)
                    sum += exp(ways);
            }
    }
    return sum;
}

static void fisher_by_all_tables(void **state) {
    (void)state;
    static const size_t cases[][2][3] = {{{3, 5, 11}, {4, 38, 9}}, {{0, 1, 9}, {14, 7, 2}}, {{2, 2, 2}, {2, 2, 2}},
        {{10, 0, 0}, {0, 10, 10}}, {{7, 1, 4}, {0, 30, 12}}};
    for (size_t k = 0; k < sizeof cases / sizeof *cases; k++)
        near(p_of(3, cases[k][0], cases[k][1]), by_all_tables(cases[k][0], cases[k][1]), 1e-11, 0, "three arms");
}

static void order_of_arms_does_not_matter(void **state) {
    (void)state;
    const size_t with[] = {1, 4, 2, 9}, without[] = {24, 20, 23, 15};
    const size_t turned_with[] = {9, 1, 2, 4}, turned_without[] = {15, 24, 23, 20};
    near(p_of(4, with, without), p_of(4, turned_with, turned_without), 1e-13, 0, "arms in another order");
    /* an empty arm adds nothing */
    const size_t padded_with[] = {7, 0, 8}, padded_without[] = {12, 0, 3};
    near(p_of(3, padded_with, padded_without), p_of(2, (const size_t[]){7, 8}, (const size_t[]){12, 3}), 1e-14, 0,
        "an empty arm");
}

static void margins_may_decide(void **state) {
    (void)state;
    near(p_of(2, (const size_t[]){0, 0}, (const size_t[]){5, 9}), 1, 0, 0, "no event");
    near(p_of(3, (const size_t[]){5, 9, 2}, (const size_t[]){0, 0, 0}), 1, 0, 0, "all events");
    near(p_of(2, (const size_t[]){4, 0}, (const size_t[]){3, 0}), 1, 0, 0, "one arm");
    assert_int_equal(fisher_exact((const size_t[]){0, 0}, (const size_t[]){0, 0}, 2).status, STATUS_TOO_FEW);
    near(p_of(2, (const size_t[]){5, 5}, (const size_t[]){5, 5}), 1, 1e-14, 0, "the most probable table");
}

static void standardised_differences(void **state) {
    (void)state;
    /* (8.1 - 7.9) / sqrt((1.2^2 + 1.4^2) / 2) */
    near(standardised_means(8.1, 1.2, 7.9, 1.4).value, 0.2 / sqrt(1.7), 1e-12, 0, "means");
    near(standardised_means(7.9, 1.4, 8.1, 1.2).value, -0.2 / sqrt(1.7), 1e-12, 0, "arms exchanged");
    assert_int_equal(standardised_means(1, 0, 1, 0).status, STATUS_NO_VARIANCE);
    assert_int_equal(standardised_means(1, NAN, 1, 2).status, STATUS_TOO_FEW);
    near(standardised_shares(6, 10, 3, 10).value, 0.3 / sqrt((0.24 + 0.21) / 2), 1e-14, 0, "shares");
    assert_int_equal(standardised_shares(0, 10, 0, 12).status, STATUS_NO_VARIANCE);
    assert_int_equal(standardised_shares(0, 0, 0, 12).status, STATUS_TOO_FEW);
    near(standardised_levels((const size_t[]){4, 6}, (const size_t[]){7, 3}, 2).value,
        fabs(standardised_shares(6, 10, 3, 10).value), 1e-13, 0, "two levels are one share");
    near(standardised_levels((const size_t[]){4, 6, 5}, (const size_t[]){7, 3, 9}, 3).value,
        standardised_levels((const size_t[]){9, 7, 0, 3}, (const size_t[]){5, 4, 0, 6}, 4).value, 1e-12, 0,
        "levels in another order, arms exchanged, one level empty");
    assert_int_equal(standardised_levels((const size_t[]){4, 0}, (const size_t[]){7, 0}, 2).status, STATUS_NO_VARIANCE);
    assert_int_equal(standardised_levels((const size_t[]){4, 0}, (const size_t[]){0, 7}, 2).status, STATUS_NO_VARIANCE);
    assert_int_equal(standardised_levels((const size_t[]){0, 0}, (const size_t[]){7, 2}, 2).status, STATUS_TOO_FEW);
    /* 1.96 sqrt(2 / n) at n = 20, 60 an arm */
    near(chance_envelope(20, 20, 0.95), 0.62, 0, 0.005, "envelope of 20");
    near(chance_envelope(60, 60, 0.95), 0.36, 0, 0.005, "envelope of 60");
    assert_true(isnan(chance_envelope(0, 5, 0.95)));
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(fisher_by_all_tables),
        cmocka_unit_test(order_of_arms_does_not_matter),
        cmocka_unit_test(margins_may_decide),
        cmocka_unit_test(standardised_differences),
    };
    return cmocka_run_group_tests_name("stats/table", tests, NULL, NULL);
}
