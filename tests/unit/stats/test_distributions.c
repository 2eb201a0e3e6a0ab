/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Properties of tails and quantiles: they are each other's inverse, meet at known points, and are guarded. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <cmocka.h>
#include "near.h"
#include "stats/distributions.h"

static const double dfs[] = {0.5, 1, 2, 7.3, 30, 31, 240, 1e4, 1e6, 1e9};
enum { DFS = sizeof dfs / sizeof *dfs };

static void student_and_its_quantile(void **state) {
    (void)state;
    static const double tails[] = {0.4, 0.1, 0.025, 1e-4, 1e-9, 0x1p-53};
    for (size_t i = 0; i < DFS; i++)
        for (size_t k = 0; k < 6; k++) {
            double t = student_quantile(1 - tails[k], dfs[i]);
            double tail = 1 - (1 - tails[k]); /* as the double has it */
            near(student_two_sided(t, dfs[i]) / 2, tail, 2e-12, 0, "tail of a quantile");
            near(student_quantile(tail, dfs[i]), -t, 2e-12, 0, "symmetry");
        }
}

static void known_points(void **state) {
    (void)state;
    near(student_two_sided(1, 1), 0.5, 1e-15, 0, "Cauchy at 1");
    near(student_two_sided(1e8, 1), 2 * atan(1e-8) / M_PI, 1e-13, 0, "Cauchy far out");
    near(student_two_sided(sqrt(2), 2), 1 - sqrt(0.5), 1e-14, 0, "two degrees of freedom");
    near(student_two_sided(0, 5), 1, 0, 0, "no difference");
    near(student_two_sided(INFINITY, 5), 0, 0, 0, "an endless one");
    near(student_two_sided(1.5, INFINITY), normal_two_sided(1.5), 1e-15, 0, "normal limit");
    near(student_two_sided(2.0, 1e12), normal_two_sided(2.0), 1e-11, 0, "near the normal limit");
    for (double t = 0.5; t < 20; t *= 2) /* where the fraction hands over to Hill's deviate */
        near(student_two_sided(t, 1e6 * (1 + 1e-15)), student_two_sided(t, 1e6), 1e-12, 0, "both methods at 1e6");
    near(student_quantile(0.975, INFINITY), normal_quantile(0.975), 0, 0, "normal limit of the quantile");
    near(student_quantile(0.5, 3), 0, 0, 0, "median");
    near(chi_square_upper(3, 2), exp(-1.5), 1e-14, 0, "exponential");
    near(f_upper(4, 1, 9), student_two_sided(2, 9), 1e-14, 0, "t squared is F");
    near(f_upper(2.5, 3, INFINITY), chi_square_upper(7.5, 3), 1e-14, 0, "F of endless denominator");
    near(beta_lower(0.3, 1, 1), 0.3, 1e-15, 0, "uniform");
    near(beta_lower(0.3, 2, 3) + beta_lower(0.7, 3, 2), 1, 1e-15, 0, "both ends");
    near(beta_quantile(beta_lower(0.2, 4, 9), 4, 9), 0.2, 1e-13, 0, "inverse");
    /* 95% with no event in 20: 1 - 0.025^(1/20), the "rule of three and a bit" */
    near(binomial_interval(0, 20, 0.95).high, 1 - pow(0.025, 1 / 20.0), 1e-12, 0, "none in twenty");
    near(binomial_interval(0, 0, 0.95).high, 1, 0, 0, "nothing known");
    near(normal_lower(1) + normal_upper(1), 1, 1e-15, 0, "normal ends");
}

static void wrong_arguments_are_not_numbers(void **state) {
    (void)state;
    assert_true(isnan(student_two_sided(2, 0)) && isnan(student_two_sided(2, -1)) && isnan(student_two_sided(NAN, 3)));
    assert_true(isnan(student_quantile(0.9, 0)) && isnan(student_quantile(1.1, 3)) && isnan(student_quantile(NAN, 3)));
    assert_true(isnan(chi_square_upper(5, 0)) && isnan(f_upper(2, 0, 5)) && isnan(f_upper(2, 5, 0)));
    assert_true(isnan(normal_quantile(-0.1)) && isnan(beta_quantile(0.5, 0, 1)));
}

static void estimates_by_t_have_a_status(void **state) {
    (void)state;
    assert_int_equal(estimate_by_t(1, 0, 5, 0.95).status, STATUS_NO_VARIANCE);
    assert_int_equal(estimate_by_t(1, NAN, 5, 0.95).status, STATUS_NO_VARIANCE);
    assert_int_equal(estimate_by_t(1, 1, 0, 0.95).status, STATUS_TOO_FEW);
    struct estimate e = estimate_by_t(1, 0.5, 10, 0.9);
    near((e.low + e.high) / 2, 1, 1e-15, 0, "middle");
    near(estimate_by_t(e.high - 1, 0.5, 10, 0.9).p, 0.1, 1e-12, 0, "a limit at no effect has p = 1 - confidence");
    assert_true(isnan(estimate_none(STATUS_SINGULAR).p));
}

int main(void) {
    stats_init();
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(student_and_its_quantile),
        cmocka_unit_test(known_points),
        cmocka_unit_test(wrong_arguments_are_not_numbers),
        cmocka_unit_test(estimates_by_t_have_a_status),
    };
    return cmocka_run_group_tests_name("stats/distributions", tests, NULL, NULL);
}
