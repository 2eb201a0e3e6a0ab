/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The exhibit of derived values, the panel of a participant with one, and a derived value as an outcome of the model. Worked by
 * hand. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "exhibit_case.h"

static const char plan[] =
    "{\"title\": \"T\", \"participant\": \"pid\", \"blinding\": \"unblinded\","
    " \"arm\": {\"column\": \"arm\", \"levels\": [{\"code\": \"a\", \"reference\": true}, {\"code\": \"b\"}]},"
    " \"outcomes\": [{\"id\": \"p\", \"label\": \"Pressure\", \"role\": \"primary\", \"better\": \"lower\","
    "   \"visits\": [{\"label\": \"Start\", \"column\": \"derived.p0\"}, {\"label\": \"End\", \"column\": \"derived.p1\"}]}],"
    " \"derived\": ["
    "   {\"id\": \"p0\", \"unit\": \"mmHg\", \"formula\": \"mean\", \"of\": [\"x0\", \"z0\"], \"minimum_items\": 1},"
    "   {\"id\": \"p1\", \"unit\": \"mmHg\", \"formula\": \"mean\", \"of\": [\"x1\", \"z1\"], \"claims\": \"p1\"}]}";

static const char csv[] =
    "pid,arm,x0,z0,x1,z1,p1\n"
    "P1,a,100,110,101,105,103\n"
    "P2,a,120,,118,120,119\n"
    "P3,a,130,131,128,,127\n"
    "P4,a,140,142,141,141,151\n"
    "P5,b,101,103,90,92,91\n"
    "P6,b,121,123,111,112,112\n"
    "P7,b,131,135,125,121,\n"
    "P8,b,141,,130,128,129\n"
    "P9,b,1,1,1,1,1\n"
    "P9,b,2,2,2,2,2\n";

static void test_exhibit(void **state) {
    (void)state;
    struct exhibit_case c;
    struct renderings r;
    case_open(&c, csv, plan);
    assert_true(render(&c, "derived", NULL, 0, &r, NULL));
    const cJSON *list = field(r.parsed, "derived"), *p0 = member_with(list, "id", "p0"), *p1 = member_with(list, "id", "p1");
    static const struct {
        const char *name;
        double first, second;
    } counts[] = {{"n", 8, 7}, {"prorated", 2, 0}, {"missing", 0, 1}, {"undefined", 0, 0}, {"held_aside", 1, 1}, {"agreeing", 0, 5},
        {"differing", 0, 1}, {"claimed_only", 0, 1}};
    for (size_t i = 0; i < sizeof counts / sizeof *counts; i++) {
        near(number_at(p0, counts[i].name), counts[i].first, 0, 0, counts[i].name);
        near(number_at(p1, counts[i].name), counts[i].second, 0, 0, counts[i].name);
    }
    assert_string_equal(string_at(p0, "words"), "mean of x0 and z0; at least 1 of the 2 must be there");
    const cJSON *one = cJSON_GetArrayItem(field(p1, "participants"), 0);
    assert_string_equal(string_at(one, "participant"), "P4");
    near(number_at(one, "claimed"), 151, 0, 0, "claimed");
    near(number_at(one, "derived"), 141, 0, 0, "derived");
    assert_string_equal(string_at(one, "inputs"), "x1 141, z1 141");
    assert_non_null(strstr(r.text.data, "x1 141, z1 141"));
    renderings_release(&r);
    case_close(&c);
}

static void test_panel(void **state) {
    (void)state;
    struct exhibit_case c;
    struct renderings r;
    case_open(&c, csv, plan);
    struct asked asked = {"participant", "P2"};
    assert_true(render(&c, "participant", &asked, 1, &r, NULL));
    const cJSON *value = member_with(field(r.parsed, "values"), "column", "derived.p0");
    assert_string_equal(string_at(value, "current"), "120.0");
    assert_string_equal(string_at(value, "label"), "Pressure, Start");
    assert_string_equal(string_at(field(value, "derived"), "formula"), "mean of x0 and z0; at least 1 of the 2 must be there");
    assert_string_equal(string_at(field(value, "derived"), "inputs"), "x0 120, z0 blank");
    assert_true(cJSON_IsNull(field(member_with(field(r.parsed, "values"), "column", "x0"), "derived")));
    renderings_release(&r);
    asked.value = "P3";
    assert_true(render(&c, "participant", &asked, 1, &r, NULL));
    value = member_with(field(r.parsed, "values"), "column", "derived.p1");
    assert_true(cJSON_IsNull(field(value, "current")));
    assert_string_equal(string_at(value, "words"), "an input is missing");
    renderings_release(&r);
    asked.value = "P9"; /* two records, none kept */
    assert_true(render(&c, "participant", &asked, 1, &r, NULL));
    assert_string_equal(string_at(member_with(field(r.parsed, "values"), "column", "derived.p1"), "state"), "held-aside");
    renderings_release(&r);
    case_close(&c);
}

/* The model on derived columns gives what it gives on the same numbers recorded in a file. */
static void test_same_as_recorded(void **state) {
    (void)state;
    static const char recorded[] = "pid,arm,p0,p1\nP1,a,105,103\nP2,a,120,119\nP3,a,130.5,\nP4,a,141,141\nP5,b,102,91\nP6,b,122,111.5\n"
                                   "P7,b,133,123\nP8,b,141,129\n";
    static const char simple[] =
        "{\"title\": \"T\", \"participant\": \"pid\", \"blinding\": \"unblinded\","
        " \"arm\": {\"column\": \"arm\", \"levels\": [{\"code\": \"a\", \"reference\": true}, {\"code\": \"b\"}]},"
        " \"outcomes\": [{\"id\": \"p\", \"label\": \"Pressure\", \"role\": \"primary\", \"better\": \"lower\","
        "   \"visits\": [{\"label\": \"Start\", \"column\": \"p0\"}, {\"label\": \"End\", \"column\": \"p1\"}]}]}";
    double estimates[2];
    for (int i = 0; i < 2; i++) {
        struct exhibit_case c;
        struct renderings r;
        case_open(&c, i ? recorded : csv, i ? simple : plan);
        assert_true(render(&c, "effect", NULL, 0, &r, NULL));
        const cJSON *contrast = cJSON_GetArrayItem(field(r.parsed, "contrasts"), 0);
        estimates[i] = number_at(member_with(field(contrast, "estimates"), "method", "ancova"), "estimate");
        assert_true(isfinite(estimates[i]) ? 1 : 0);
        renderings_release(&r);
        case_close(&c);
    }
    near(estimates[0], estimates[1], 0, 0, "effect");
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_exhibit),
        cmocka_unit_test(test_panel),
        cmocka_unit_test(test_same_as_recorded),
    };
    return cmocka_run_group_tests_name("exhibits/derived", tests, NULL, NULL);
}
