/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Fisher's exact test against R's fisher.test, the multinomial distance against its formula in R
 * (tests/reference/compute.R), and printed examples. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <cmocka.h>
#include "base/clock.h"
#include "reference.h"
#include "stats/table.h"

static const struct {
    const char *name;
    size_t k, with[5], without[5];
} cases[] = {
    {"tea", 2, {3, 1}, {1, 3}},
    {"seven", 2, {7, 8}, {12, 3}},
    {"none", 2, {0, 0}, {20, 25}},
    {"twins", 2, {2, 15}, {10, 3}},
    {"big", 2, {230, 180}, {1270, 1320}},
    {"lopsided", 2, {0, 9}, {400, 391}},
    {"three", 3, {3, 5, 11}, {40, 38, 31}},
    {"four", 4, {1, 4, 2, 9}, {24, 20, 23, 15}},
    {"wide", 4, {14, 22, 9, 30}, {136, 128, 141, 120}},
    {"gap", 3, {3, 0, 7}, {17, 0, 13}},
    {"five", 5, {1, 0, 3, 5, 2}, {11, 9, 14, 6, 8}},
    {"even", 3, {5, 5, 5}, {5, 5, 5}},
};

static void fisher_agrees_with_r(void **state) {
    (void)state;
    struct table values = table_read("tests/reference/values/table.csv");
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        struct exact_test e = fisher_exact(cases[i].with, cases[i].without, cases[i].k);
        struct exact_test turned = fisher_exact(cases[i].without, cases[i].with, cases[i].k);
        assert_int_equal(e.status, STATUS_OK);
        /* more than two arms: R's network algorithm keeps about nine digits */
        table_check(&values, cases[i].name, "p", e.p, cases[i].k == 2 ? 1e-10 : 1e-8);
        near(turned.p, e.p, 1e-12, 0, "rows exchanged");
    }
    table_release(&values);
}

static void distance_agrees_with_r(void **state) {
    (void)state;
    struct table values = table_read("tests/reference/values/table.csv");
    static const char *const wanted[] = {"tea", "three", "four", "five"};
    for (size_t w = 0; w < 4; w++)
        for (size_t i = 0; i < sizeof cases / sizeof *cases; i++)
            if (strcmp(cases[i].name, wanted[w]) == 0) {
                struct standardised_difference d = standardised_levels(cases[i].with, cases[i].without, cases[i].k);
                assert_int_equal(d.status, STATUS_OK);
                table_check(&values, wanted[w], "distance", d.value, 1e-12);
            }
    table_release(&values);
}

/* Fisher's tea tasting (1935): 34/70 two-sided. */
static void tea_is_a_fraction(void **state) {
    (void)state;
    near(fisher_exact(cases[0].with, cases[0].without, 2).p, 34.0 / 70.0, 1e-14, 0, "tea");
}

/* The sizes the header promises, and one beyond them. Times are for a slow machine under other work. */
static void large_tables_are_quick_or_refused(void **state) {
    (void)state;
    static const struct {
        size_t k, with[6], without[6];
        enum status status;
    } large[] = {
        {2, {5200, 4800}, {494800, 495200}, STATUS_OK},
        {3, {400, 500, 450}, {1600, 1500, 1550}, STATUS_OK},
        {4, {40, 61, 45, 52}, {260, 239, 255, 248}, STATUS_OK},
        {6, {400, 500, 450, 420, 380, 410}, {1600, 1500, 1550, 1580, 1620, 1590}, STATUS_BEYOND_METHOD},
    };
    for (size_t i = 0; i < sizeof large / sizeof *large; i++) {
        double start = clock_seconds();
        struct exact_test e = fisher_exact(large[i].with, large[i].without, large[i].k);
        double took = clock_seconds() - start;
        print_message("    %zu arms: p %.6g in %.3f s\n", large[i].k, e.p, took);
        assert_int_equal(e.status, large[i].status);
        assert_true(took < 5.0);
        if (e.status == STATUS_OK)
            assert_true(e.p > 0.0 && e.p < 1.0);
        else
            assert_true(isnan(e.p));
    }
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(fisher_agrees_with_r),
        cmocka_unit_test(distance_agrees_with_r),
        cmocka_unit_test(tea_is_a_fraction),
        cmocka_unit_test(large_tables_are_quick_or_refused),
    };
    return cmocka_run_group_tests_name("reference/table", tests, NULL, NULL);
}
