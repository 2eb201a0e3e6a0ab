/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The baseline table on a trial small enough to count by hand, and on the invented trial in all states of blinding. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "exhibit_case.h"

/* Nine records of eight participants: p7 twice (held aside), p8 in no arm. */
static const char csv[] = "id,grp,sex,age,dose,y0,y1,z\n"
                          "p1,L,F,50,high,140,130,7\n"
                          "p2,L,M,60,high,150,,8\n"
                          "p3,L,F,70,high,160,150,9\n"
                          "p4,W,M,40,low,130,120,7\n"
                          "p5,W,F,,low,150,140,8\n"
                          "p6,W,M,56,low,140,,9\n"
                          "p7,W,F,99,low,100,90,7\n"
                          "p7,W,F,98,low,100,90,7\n"
                          "p8,,F,33,low,100,90,7\n";

static const char plan[] =
    "{\"title\": \"Small trial\", \"participant\": \"id\","
    "\"arm\": {\"column\": \"grp\", \"levels\": [{\"code\": \"L\", \"label\": \"Advice\", \"reference\": true}, "
    "{\"code\": \"W\", \"label\": "
    "\"Walking\"}]},"
    "\"outcomes\": [{\"id\": \"y\", \"label\": \"Pressure\", \"unit\": \"mmHg\", \"role\": \"primary\", \"better\": "
    "\"lower\", \"scale\": "
    "\"linear\", \"visits\": [{\"label\": \"Baseline\", \"column\": \"y0\"}, {\"label\": \"Week 4\", \"column\": "
    "\"y1\"}]},"
    "{\"id\": \"z\", \"label\": \"Score\", \"unit\": \"\", \"role\": \"secondary\", \"better\": \"lower\", \"scale\": "
    "\"linear\", \"visits\": "
    "[{\"label\": \"Week 4\", \"column\": \"z\"}]}],"
    "\"covariates\": [{\"id\": \"sex\", \"label\": \"Sex\", \"column\": \"sex\", \"kind\": \"category\", \"levels\": "
    "[{\"code\": \"F\", "
    "\"label\": \"Female\"}, {\"code\": \"M\", \"label\": \"Male\"}]},"
    "{\"id\": \"age\", \"label\": \"Age\", \"column\": \"age\", \"kind\": \"number\", \"unit\": \"years\"}],"
    "\"blinding\": \"BLINDING\"}";

static void open_small(struct exhibit_case *c, const char *blinding) {
    char *text = replaced(plan, "BLINDING", blinding);
    case_open(c, csv, text);
    memory_free(text);
}

static void test_counted_by_hand(void **state) {
    (void)state;
    struct exhibit_case c;
    struct renderings r;
    open_small(&c, "unblinded");
    render(&c, "baseline", NULL, 0, &r, NULL);
    const cJSON *variables = field(r.parsed, "variables");
    /* covariates, then the baseline of y; z has one visit and so none */
    assert_int_equal(cJSON_GetArraySize(variables), 3);
    const cJSON *age = member_with(variables, "variable", "age");
    const cJSON *advice = member_with(field(age, "arms"), "arm", "L"),
                *walking = member_with(field(age, "arms"), "arm", "W");
    assert_string_equal(string_at(advice, "label"), "Advice");
    near(number_at(advice, "n"), 3, 0, 0, "n of the reference");
    near(number_at(advice, "mean"), 60, 0, 0, "mean of 50, 60, 70");
    near(number_at(advice, "sd"), 10, 1e-15, 0, "SD of 50, 60, 70");
    near(number_at(advice, "lower_quartile"), 55, 0, 0, "quartile of type 7");
    near(number_at(walking, "n"), 2, 0, 0, "n of 40, blank, 56");
    near(number_at(walking, "missing"), 1, 0, 0, "missing of 40, blank, 56");
    near(number_at(walking, "median"), 48, 0, 0, "median of 40 and 56");
    near(
        number_at(age, "standardised_difference"), (48 - 60) / sqrt((128 + 100) / 2.0), 1e-14, 0, "Austin 2009, means");
    assert_string_equal(string_at(age, "status"), "ok");
    const cJSON *sex = member_with(variables, "variable", "sex");
    const cJSON *levels = field(member_with(field(sex, "arms"), "arm", "W"), "levels");
    near(number_at(member_with(levels, "level", "M"), "n"), 2, 0, 0, "men in the walking arm");
    near(number_at(sex, "standardised_difference"), (2 / 3.0 - 1 / 3.0) / sqrt(2 / 9.0), 1e-14, 0,
        "Austin 2009, shares");
    near(number_at(r.parsed, "chance_envelope"), 1.959963984540054 * sqrt(1 / 3.0 + 1 / 3.0), 1e-12, 0,
        "z sqrt(1/n + 1/n)");
    assert_non_null(
        strstr(r.text.data, "1 participant not counted here: the identifier stands in more than one record"));
    assert_non_null(strstr(r.text.data, "1 participant not counted here: no arm"));
    assert_non_null(strstr(r.text.data, "2 of 3"));
    assert_null(strstr(r.json.data, "\"p\":"));
    renderings_release(&r);
    case_close(&c);
}

static void test_one_arm_while_pooled(void **state) {
    (void)state;
    struct exhibit_case c;
    struct renderings r;
    open_small(&c, "pooled");
    render(&c, "baseline", NULL, 0, &r, NULL);
    const cJSON *age = member_with(field(r.parsed, "variables"), "variable", "age");
    assert_int_equal(cJSON_GetArraySize(field(age, "arms")), 1);
    const cJSON *all = member_with(field(age, "arms"), "arm", "all");
    near(number_at(all, "n"), 5, 0, 0, "everyone but p5 (blank), p7 (held aside) and p8 (no arm)");
    near(number_at(all, "mean"), (50 + 60 + 70 + 40 + 56) / 5.0, 1e-15, 0, "mean of all");
    assert_true(cJSON_IsNull(field(age, "standardised_difference")));
    assert_string_equal(string_at(age, "status"), "blinded");
    assert_true(cJSON_IsNull(field(r.parsed, "chance_envelope")));
    assert_null(strstr(r.text.data, "Standardised"));
    renderings_release(&r);
    case_close(&c);
}

/* A category whose levels lie in one arm each is hidden while coded, named in a note, and shown once unblinded. */
static void test_hides_what_tells_the_arms(void **state) {
    (void)state;
    static const struct {
        const char *blinding;
        bool shown;
    } cases[] = {{"pooled", false}, {"coded", false}, {"unblinded", true}};
    struct text file;
    text_init(&file);
    text_literal(&file, "id,grp,sex,age,dose,y0,y1,z\n");
    for (int i = 0; i < 20; i++) {
        text_format(&file, "p%02d,%c,F,50,%s,140,130,7\n", i, i % 2 ? 'L' : 'W', i % 2 ? "high" : "low");
    }
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        struct exhibit_case c;
        struct renderings r;
        char *with = replaced(plan, "\"covariates\": [",
            "\"covariates\": [{\"id\": \"dose\", \"label\": \"Dose\", \"column\": \"dose\", "
            "\"kind\": \"category\"}, ");
        char *text = replaced(with, "BLINDING", cases[i].blinding);
        case_open(&c, file.data, text);
        render(&c, "baseline", NULL, 0, &r, NULL);
        assert_int_equal(strstr(r.json.data, "\"low\"") != NULL, cases[i].shown);
        assert_int_equal(strstr(r.json.data, "Dose is not shown while the study is") != NULL, !cases[i].shown);
        renderings_release(&r);
        case_close(&c);
        memory_free(with);
        memory_free(text);
    }
    text_release(&file);
}

static void test_invented_trial(void **state) {
    (void)state;
    static const char *const states[] = {"pooled", "coded", "unblinded"};
    for (size_t i = 0; i < 3; i++) {
        struct exhibit_case c;
        struct renderings r;
        case_quayside(&c, states[i], true);
        render(&c, "baseline", NULL, 0, &r, NULL);
        assert_int_equal(strstr(r.html.data, "Walking group") != NULL, i == 2);
        assert_null(strstr(r.html.data, "not in the plan")); /* all codes of sex are settled */
        assert_int_equal(
            cJSON_GetArraySize(field(cJSON_GetArrayItem(field(r.parsed, "variables"), 0), "arms")), i ? 2 : 1);
        renderings_release(&r);
        case_close(&c);
    }
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_counted_by_hand),
        cmocka_unit_test(test_one_arm_while_pooled),
        cmocka_unit_test(test_hides_what_tells_the_arms),
        cmocka_unit_test(test_invented_trial),
    };
    return cmocka_run_group_tests_name("exhibits/baseline", tests, NULL, NULL);
}
