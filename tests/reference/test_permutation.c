/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Permutation p against all 70 allocations of four against four, and against a Freedman-Lane run of R's own random
 * numbers, both known from tests/reference/compute.R. Bounds are Monte Carlo: 4.5 standard errors. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <cmocka.h>
#include "reference.h"
#include "stats/permutation.h"

enum { MANY = 20000 };

static void check_simulated(const char *name, double got, double want, double n_wanted) {
    double error = sqrt(want * (1 - want) * (1.0 / MANY + 1.0 / n_wanted));
    near(got, want, 0, 4.5 * error + 1.0 / MANY, name);
}

static void agrees_with_all_allocations(void **state) {
    (void)state;
    struct table values = table_read("tests/reference/values/permutation.csv");
    struct table samples = table_read("tests/reference/data/samples.csv");
    double y[8], ones[8], arm[8];
    size_t n = 0;
    for (size_t i = 0; i < samples.rows; i++)
        if (strcmp(table_cell(&samples, i, "set"), "fours") == 0) {
            ones[n] = 1;
            arm[n] = *table_cell(&samples, i, "sample") == 'x';
            y[n++] = table_number(&samples, i, "value");
        }
    assert_int_equal(n, 8);
    const double *columns[] = {ones, arm};
    struct permutation_result r;
    permutation_test(&(struct permutation_task){columns, 2, 8, 1, 1, y, NULL, MANY, 7, "fours", 0.999}, &r);
    assert_int_equal(r.status, STATUS_OK);
    double exact = table_wanted(&values, "fours", "exact p");
    check_simulated("fours", r.p, exact, 1e12);
    assert_true(r.monte_carlo.low <= exact && exact <= r.monte_carlo.high);
    table_release(&values);
    table_release(&samples);
}

/* month2 on the arm, the baseline, the drug and the length; and the twelve made-up participants. */
static void agrees_with_r_in_models(void **state) {
    (void)state;
    struct table values = table_read("tests/reference/values/permutation.csv");
    struct table twelve = table_read("tests/reference/data/twelve.csv"),
                 btheb = table_read("tests/reference/data/btheb.csv");
    double y[100], columns[5][100];
    const double *design[5] = {columns[0], columns[1], columns[2], columns[3], columns[4]};
    struct permutation_result r;
    for (size_t i = 0; i < twelve.rows; i++) {
        columns[0][i] = 1;
        columns[1][i] = table_number(&twelve, i, "arm");
        columns[2][i] = table_number(&twelve, i, "before");
        y[i] = table_number(&twelve, i, "after");
    }
    permutation_test(&(struct permutation_task){design, 3, twelve.rows, 1, 1, y, NULL, MANY, 7, "twelve", 0.95}, &r);
    check_simulated("twelve", r.p, table_wanted(&values, "twelve", "simulated p"), 20000);
    near(fabs(r.t), table_wanted(&values, "twelve", "t"), 1e-10, 0, "t of the twelve");
    size_t n = 0;
    for (size_t i = 0; i < btheb.rows; i++)
        if (!isnan(table_number(&btheb, i, "month2"))) {
            columns[0][n] = 1;
            columns[1][n] = strcmp(table_cell(&btheb, i, "treatment"), "BtheB") == 0;
            columns[2][n] = table_number(&btheb, i, "before");
            columns[3][n] = strcmp(table_cell(&btheb, i, "drug"), "Yes") == 0;
            columns[4][n] = strcmp(table_cell(&btheb, i, "length"), "short") == 0;
            y[n++] = table_number(&btheb, i, "month2");
        }
    permutation_test(&(struct permutation_task){design, 5, n, 1, 1, y, NULL, MANY, 7, "btheb", 0.95}, &r);
    check_simulated("btheb2", r.p, table_wanted(&values, "btheb2", "simulated p"), 20000);
    near(fabs(r.t), table_wanted(&values, "btheb2", "t"), 1e-10, 0, "t of btheb2");
    table_release(&values);
    table_release(&twelve);
    table_release(&btheb);
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(agrees_with_all_allocations),
        cmocka_unit_test(agrees_with_r_in_models),
    };
    return cmocka_run_group_tests_name("reference/permutation", tests, NULL, NULL);
}
