/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Tails and quantiles against R's (tests/reference/compute.R). */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <cmocka.h>
#include "reference.h"
#include "stats/distributions.h"

static double value_of(const char *name, const char *quantity) {
    double a = 0, b = 0, x = 0;
    bool quantile_wanted = sscanf(quantity, "quantile %lf", &x) == 1;
    if (sscanf(name, "t %lf", &a) == 1)
        return quantile_wanted                              ? student_quantile(x, a)
               : sscanf(quantity, "two_sided %lf", &x) == 1 ? student_two_sided(x, a)
                                                            : (double)NAN;
    if (sscanf(name, "binomial %lf %lf", &a, &b) == 2) {
        struct interval i = binomial_interval((size_t)a, (size_t)b, 0.95);
        return strcmp(quantity, "low") == 0 ? i.low : i.high;
    }
    if (!quantile_wanted)
        assert_int_equal(sscanf(quantity, "upper %lf", &x), 1);
    if (strcmp(name, "normal") == 0)
        return quantile_wanted ? normal_quantile(x) : normal_upper(x);
    if (sscanf(name, "chi_square %lf", &a) == 1)
        return chi_square_upper(x, a);
    if (sscanf(name, "f %lf %lf", &a, &b) == 2)
        return f_upper(x, a, b);
    fail();
    return 0;
}

static void agree_with_r(void **state) {
    (void)state;
    struct table values = table_read("tests/reference/values/distribution.csv");
    for (size_t i = 0; i < values.rows; i++) {
        const char *name = table_cell(&values, i, "case"), *quantity = table_cell(&values, i, "quantity");
        table_check(&values, name, quantity, value_of(name, quantity), 1e-12);
    }
    table_release(&values);
}

int main(void) {
    const struct CMUnitTest tests[] = {cmocka_unit_test(agree_with_r)};
    return cmocka_run_group_tests_name("reference/distributions", tests, NULL, NULL);
}
