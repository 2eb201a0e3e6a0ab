/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The exhibit of dates: days from randomisation counted by hand, by arm as blinding allows; and what a plan without
 * dates gets. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "exhibit_case.h"

static const char plan[] = "{\"title\": \"Harbour\", \"participant\": \"pid\", \"arm\": {\"column\": \"grp\", "
                           "\"levels\": [{\"code\": \"Lx\", \"reference\": true}, "
                           "{\"code\": \"Wx\"}]}, \"blinding\": \"BLINDING\", \"outcomes\": [{\"id\": \"y\", \"role\": "
                           "\"primary\", \"better\": \"lower\", \"visits\": "
                           "[{\"label\": \"End\", \"column\": \"y\"}]}], \"dates\": {\"order\": \"D/M/Y\", "
                           "\"randomised\": {\"column\": \"rand\"}, \"visits\": ["
                           "{\"label\": \"8 weeks\", \"column\": \"d8\", \"target\": 56, \"window\": [-7, 7]}, "
                           "{\"label\": \"End\", \"column\": \"d26\"}]}}";

/* Days to 8 weeks: 49 and 63, both bounds of the window; 48 early; 64 late; 56; none; a month 13; without
 * randomisation. */
static const char csv[] = "pid,grp,y,rand,d8,d26\n"
                          "P1,Lx,1,01/01/2026,19/02/2026,01/07/2026\n"
                          "P2,Lx,2,01/01/2026,05/03/2026,2026-07-02\n"
                          "P3,Lx,3,01/01/2026,18/02/2026,\n"
                          "P4,Lx,4,01/01/2026,06/03/2026,\n"
                          "P5,Wx,5,01/01/2026,26/02/2026,\n"
                          "P6,Wx,6,01/01/2026,,\n"
                          "P7,Wx,7,01/01/2026,02/26/2026,\n"
                          "P8,Wx,8,,26/02/2026,\n";

static void open_as(struct exhibit_case *c, const char *blinding) {
    char *filled = replaced(plan, "BLINDING", blinding);
    case_open(c, csv, filled);
    memory_free(filled);
}

static void expect_arm(const cJSON *visit, const char *arm, const double *wanted) {
    static const char *const names[] = {"n", "missing", "minimum", "median", "maximum", "in_window", "early", "late"};
    const cJSON *row = member_with(field(visit, "arms"), "arm", arm);
    for (size_t i = 0; i < sizeof names / sizeof *names; i++) {
        near(number_at(row, names[i]), wanted[i], 0, 0, names[i]);
    }
}

static void test_unblinded(void **state) {
    (void)state;
    struct exhibit_case c;
    struct renderings r;
    open_as(&c, "unblinded");
    assert_true(render(&c, "dates", NULL, 0, &r, NULL));
    const cJSON *week8 = member_with(field(r.parsed, "visits"), "visit", "8 weeks"),
                *end = member_with(field(r.parsed, "visits"), "visit", "End");
    expect_arm(week8, "Lx", (const double[]){4, 0, 48, 56, 64, 2, 1, 1});
    expect_arm(week8, "Wx", (const double[]){1, 3, 56, 56, 56, 1, 0, 0});
    near(cJSON_GetArrayItem(field(week8, "window"), 0)->valuedouble, 49, 0, 0, "window");
    near(cJSON_GetArrayItem(field(week8, "window"), 1)->valuedouble, 63, 0, 0, "window");
    /* 1 and 2 July are days 181 and 182; no window is planned */
    expect_arm(end, "Lx", (const double[]){2, 2, 181, 181.5, 182, (double)NAN, (double)NAN, (double)NAN});
    assert_true(cJSON_IsNull(field(end, "target")) && cJSON_IsNull(field(end, "window")));
    assert_non_null(strstr(r.svg.data, "4 dated of 4"));
    renderings_release(&r);
    case_close(&c);
}

static void test_blinded(void **state) {
    (void)state;
    static const char *const states[] = {"pooled", "coded"};
    for (size_t i = 0; i < 2; i++) {
        struct exhibit_case c;
        struct renderings r;
        open_as(&c, states[i]);
        assert_true(render(&c, "dates", NULL, 0, &r, NULL));
        const cJSON *arms = field(member_with(field(r.parsed, "visits"), "visit", "8 weeks"), "arms");
        assert_int_equal(cJSON_GetArraySize(arms), i + 1);
        if (i == 0) {
            expect_arm(member_with(field(r.parsed, "visits"), "visit", "8 weeks"), "all",
                (const double[]){5, 3, 48, 56, 64, 3, 1, 1});
        }
        const struct text *const all[] = {&r.text, &r.json, &r.csv, &r.html, &r.svg};
        for (size_t a = 0; a < sizeof all / sizeof *all; a++) {
            assert_null(strstr(all[a]->data, "Lx"));
            assert_null(strstr(all[a]->data, "Wx"));
        }
        renderings_release(&r);
        case_close(&c);
    }
}

static void test_without_dates(void **state) {
    (void)state;
    struct exhibit_case c;
    struct renderings r;
    char *cut = replaced(plan, "BLINDING", "pooled");
    char *at = strstr(cut, ", \"dates\""); /* the plan up to its dates */
    at[0] = '}';
    at[1] = '\0';
    case_open(&c, csv, cut);
    memory_free(cut);
    assert_true(render(&c, "dates", NULL, 0, &r, NULL));
    assert_non_null(strstr(r.text.data, "The plan gives no dates."));
    assert_int_equal(cJSON_GetArraySize(field(r.parsed, "visits")), 0);
    renderings_release(&r);
    case_close(&c);
}

/* A date has no distribution as a number: the sentence says where it is shown. */
static void test_distribution_refused(void **state) {
    (void)state;
    struct exhibit_case c;
    struct renderings r;
    struct fault fault;
    open_as(&c, "pooled");
    const struct asked asked = {"variable", "d8"};
    assert_false(render(&c, "distribution", &asked, 1, &r, &fault));
    assert_string_equal(
        fault.message, "distribution: d8 is a date and has no distribution here; the exhibit dates shows it");
    renderings_release(&r);
    case_close(&c);
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_unblinded),
        cmocka_unit_test(test_blinded),
        cmocka_unit_test(test_without_dates),
        cmocka_unit_test(test_distribution_refused),
    };
    return cmocka_run_group_tests_name("exhibits/dates", tests, NULL, NULL);
}
