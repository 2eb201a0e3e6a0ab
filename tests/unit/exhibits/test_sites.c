/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Sites of a small trial, counted by hand. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "exhibit_case.h"

static const char plan[] =
    "{\"title\": \"Small trial\", \"participant\": \"id\", \"missing_codes\": [], SITE"
    "\"arm\": {\"column\": \"grp\", \"levels\": ["
    "{\"code\": \"Lx\", \"label\": \"Advice\", \"reference\": true}, {\"code\": \"Wx\", \"label\": \"Walking\"}]},"
    "\"outcomes\": [{\"id\": \"y\", \"label\": \"Pressure\", \"unit\": \"mmHg\", \"role\": \"primary\", \"better\": "
    "\"lower\","
    "\"plausible\": [50, 260], \"visits\": [{\"label\": \"Baseline\", \"column\": \"y0\"}, {\"label\": \"Week 4\", "
    "\"column\": \"y1\"}]}],"
    "\"blinding\": \"coded\"}";

/* p4 stands on two records of site 10; p6 has no site; a record of site 9 names nobody. */
static const char csv[] = "id,grp,where,y0,y1\n"
                          "p1,Lx,10,140,\n"
                          "p2,Wx,10,150,14\n"
                          "p3,Lx,2,155,130\n"
                          "p4,Wx,10,160,150\n"
                          "p4,Wx,10,161,150\n"
                          "p5,Wx,2,130,120\n"
                          "p6,Lx,,150,140\n"
                          ",Lx,9,140,120\n";

static void open_small(struct exhibit_case *c, bool with_site) {
    char *text = replaced(plan, "SITE", with_site ? "\"site\": {\"column\": \"where\"}," : "");
    case_open(c, csv, text);
    memory_free(text);
}

static void decide(struct exhibit_case *c, const char *batch) {
    struct fault fault;
    fault_init(&fault);
    if (!study_decide(c->study, "M. Tide, statistician", batch, strlen(batch), "batch", ANY_VERSION, NULL, &fault)) {
        fail_msg("%s", fault.message);
    }
}

static void expect_site(const cJSON *sites, int place, const char *code, const double counts[7]) {
    const cJSON *site = cJSON_GetArrayItem(sites, place), *visits = field(site, "visits");
    assert_string_equal(string_at(site, "site"), code);
    near(number_at(site, "participants"), counts[0], 0, 0, "participants");
    near(number_at(site, "held_aside"), counts[1], 0, 0, "held aside");
    near(number_at(cJSON_GetArrayItem(visits, 0), "n"), counts[2], 0, 0, "in force");
    near(number_at(cJSON_GetArrayItem(visits, 0), "observed"), counts[3], 0, 0, "observed at baseline");
    near(number_at(cJSON_GetArrayItem(visits, 1), "observed"), counts[4], 0, 0, "observed at week 4");
    near(number_at(field(site, "discrepancies"), "open"), counts[5], 0, 0, "open");
    near(number_at(site, "queries_unanswered"), counts[6], 0, 0, "unanswered");
}

static void test_counted_by_hand(void **state) {
    (void)state;
    struct exhibit_case c;
    struct renderings r;
    open_small(&c, true);
    render(&c, "sites", NULL, 0, &r, NULL);
    const cJSON *sites = field(r.parsed, "sites");
    assert_int_equal(cJSON_GetArraySize(sites), 4);
    expect_site(sites, 0, "", (const double[]){1, 0, 1, 1, 1, 0, 0});
    expect_site(sites, 1, "10", (const double[]){3, 2, 2, 2, 1, 2, 0}); /* p2's 14 is not plausible, p4 is repeated */
    expect_site(sites, 2, "2", (const double[]){2, 0, 2, 2, 2, 0, 0});  /* byte order: 10 before 2 */
    expect_site(sites, 3, "9", (const double[]){0, 1, 0, 0, 0, 0, 0});
    assert_non_null(strstr(r.text.data, "1 discrepancy is about no participant"));
    renderings_release(&r);
    decide(&c, "[{\"kind\": \"query\", \"participant\": \"p2\", \"column\": \"y1\", \"question\": \"14 or 140?\", "
               "\"reason\": \"r\"},"
               "{\"kind\": \"keep-record\", \"participant\": \"p4\", \"row\": 5, \"reason\": \"r\"}]");
    render(&c, "sites", NULL, 0, &r, NULL);
    expect_site(field(r.parsed, "sites"), 1, "10", (const double[]){3, 1, 3, 3, 2, 0, 1});
    near(number_at(field(cJSON_GetArrayItem(field(r.parsed, "sites"), 1), "discrepancies"), "queried"), 1, 0, 0,
        "queried");
    near(number_at(field(cJSON_GetArrayItem(field(r.parsed, "sites"), 1), "discrepancies"), "settled"), 1, 0, 0,
        "settled");
    renderings_release(&r);
    case_close(&c);
}

static void test_conversions_are_shown(void **state) {
    (void)state;
    static const char *const where[] = {"sites", "columns"};
    struct exhibit_case c;
    struct renderings r;
    open_small(&c, true);
    decide(&c, "[{\"kind\": \"convert\", \"column\": \"y1\", \"site\": \"10\", \"factor\": 7.5, \"unit_from\": "
               "\"kPa\", \"unit_to\": \"mmHg\","
               "\"source\": \"NIST SP 811\", \"reason\": \"r\"}]");
    for (size_t i = 0; i < 2; i++) {
        render(&c, where[i], NULL, 0, &r, NULL);
        const cJSON *conversion = cJSON_GetArrayItem(field(r.parsed, "conversions"), 0);
        near(number_at(conversion, "factor"), 7.5, 0, 0, "factor");
        near(number_at(conversion, "cells"), 1, 0, 0, "p2; p1 has no value and p4 is held aside");
        assert_string_equal(string_at(conversion, "source"), "NIST SP 811");
        assert_non_null(strstr(r.text.data, "times 7.5 (kPa to mmHg)"));
        renderings_release(&r);
    }
    const struct asked asked = {"participant", "p2"};
    render(&c, "participant", &asked, 1, &r, NULL);
    const cJSON *value = member_with(field(r.parsed, "values"), "column", "y1");
    assert_string_equal(string_at(value, "received"), "14");
    assert_string_equal(string_at(value, "current"), "14");
    assert_string_equal(string_at(value, "state"), "observed");
    assert_string_equal(string_at(value, "converted"), "105 mmHg, converted from 14 by decision 1");
    assert_int_equal(cJSON_GetArraySize(field(r.parsed, "decisions")), 1);
    renderings_release(&r);
    case_close(&c);
}

static void test_without_sites(void **state) {
    (void)state;
    struct exhibit_case c;
    struct renderings r;
    open_small(&c, false);
    render(&c, "sites", NULL, 0, &r, NULL);
    assert_int_equal(cJSON_GetArraySize(field(r.parsed, "sites")), 0);
    assert_non_null(strstr(r.text.data, "The plan names no column of sites"));
    renderings_release(&r);
    case_close(&c);
    char *told = replaced(plan, "SITE", "\"site\": {\"column\": \"grp\"},"); /* the arm called a site */
    case_open(&c, csv, told);
    render(&c, "sites", NULL, 0, &r, NULL);
    assert_null(strstr(r.json.data, "Lx"));
    renderings_release(&r);
    case_close(&c);
    memory_free(told);
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_counted_by_hand),
        cmocka_unit_test(test_conversions_are_shown),
        cmocka_unit_test(test_without_sites),
    };
    return cmocka_run_group_tests_name("exhibits/sites", tests, NULL, NULL);
}
