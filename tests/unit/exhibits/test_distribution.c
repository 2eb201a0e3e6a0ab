/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Distribution: numbers against R on published vectors, counts by hand, and the same whatever the arms. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "exhibit_case.h"

/* fib: the vector behind the medcouple below; sw: an example of eleven weights that goes round with the Shapiro-Wilk
 * test (R's shapiro.test); u: a zero, a value below the limit and a blank beside 1, 10, 100. */
static const char csv[] = "id,grp,fib,sw,u,sex\n"
                          "p01,L,1,148,0,F\n"
                          "p02,W,2,154,1,M\n"
                          "p03,L,3,158,10,F\n"
                          "p04,W,4,160,100,x\n"
                          "p05,L,7,161,<0.5,F\n"
                          "p06,W,11,162,,\n"
                          "p07,L,18,166,,\n"
                          "p08,W,29,170,,\n"
                          "p09,L,47,182,,\n"
                          "p10,W,76,195,,\n"
                          "p11,,,236,,\n";

static const char plan[] =
    "{\"title\": \"Small trial\", \"participant\": \"id\","
    "\"arm\": {\"column\": \"grp\", \"levels\": ["
    "{\"code\": \"L\", \"label\": \"Advice\", \"reference\": true}, {\"code\": \"W\", \"label\": \"Walking\"}]},"
    "\"outcomes\": [{\"id\": \"f\", \"label\": \"Rabbits\", \"unit\": \"pairs\", \"role\": \"primary\", \"better\": "
    "\"lower\","
    "\"scale\": \"linear\", \"plausible\": [0, 80], \"visits\": [{\"label\": \"Baseline\", \"column\": \"fib\"}, "
    "{\"label\": \"Week 4\", \"column\": \"sw\"}]},"
    "{\"id\": \"u\", \"label\": \"Albumin\", \"unit\": \"mg\", \"role\": \"secondary\", \"better\": \"lower\", "
    "\"scale\": \"log10\","
    "\"visits\": [{\"label\": \"Week 4\", \"column\": \"u\"}]}],"
    "\"covariates\": [{\"id\": \"sex\", \"label\": \"Sex\", \"column\": \"sex\", \"kind\": \"category\", \"levels\": ["
    "{\"code\": \"F\", \"label\": \"Female\"}, {\"code\": \"M\", \"label\": \"Male\"}]}],"
    "\"blinding\": \"BLINDING\"}";

static void show(struct exhibit_case *c, const char *variable, const char *scale, struct renderings *r) {
    const struct asked asked[] = {{"variable", variable}, {"scale", scale}};
    render(c, "distribution", asked, scale ? 2 : 1, r, NULL);
}

static void open_small(struct exhibit_case *c, const char *blinding) {
    char *text = replaced(plan, "BLINDING", blinding);
    case_open(c, csv, text);
    memory_free(text);
}

static void near_interval(const cJSON *interval, double low, double high, double tolerance, const char *label) {
    near(cJSON_GetArrayItem(interval, 0)->valuedouble, low, tolerance, 0, label);
    near(cJSON_GetArrayItem(interval, 1)->valuedouble, high, tolerance, 0, label);
}

static void test_numbers(void **state) {
    (void)state;
    struct exhibit_case c;
    struct renderings r;
    open_small(&c, "pooled");
    show(&c, "fib", NULL, &r);
    assert_string_equal(string_at(r.parsed, "title"), "How is rabbits at baseline distributed?");
    assert_string_equal(string_at(r.parsed, "scale"), "linear");
    near(number_at(r.parsed, "n"), 10, 0, 0, "n");
    near(number_at(r.parsed, "missing"), 1, 0, 0, "missing");
    near(number_at(field(r.parsed, "reasons"), "blank"), 1, 0, 0, "why");
    near(number_at(r.parsed, "mean"), 19.8, 1e-15, 0, "198 / 10");
    near(number_at(r.parsed, "median"), 9, 0, 0, "between 7 and 11");
    near(number_at(r.parsed, "lower_quartile"), 3.25, 0, 0, "type 7");
    near(number_at(r.parsed, "upper_quartile"), 26.25, 0, 0, "type 7");
    /* Q1 - 1.5 IQR ... by hand; medcouple and its fences: R 4.2.2 and robustbase's formula on these ten numbers */
    near_interval(field(field(r.parsed, "fences"), "inner"), -31.25, 60.75, 1e-14, "inner fences");
    near_interval(field(field(r.parsed, "fences"), "outer"), -65.75, 95.25, 1e-14, "outer fences");
    near(number_at(field(r.parsed, "adjusted_fences"), "medcouple"), 0.6, 1e-12, 0, "medcouple");
    near_interval(field(field(r.parsed, "adjusted_fences"), "fences"), 0.1202, 234.96, 1e-3, "adjusted fences");
    assert_int_equal(cJSON_GetArraySize(field(r.parsed, "beyond")), 1);
    near(number_at(member_with(field(r.parsed, "beyond"), "participant", "p10"), "value"), 76, 0, 0, "beyond");
    double sum = 0;
    const cJSON *bin;
    cJSON_ArrayForEach(bin, field(r.parsed, "bins")) {
        sum += number_at(bin, "count");
    }
    near(sum, 10, 0, 0, "bins add up");
    assert_non_null(strstr(r.svg.data, "plausible 0 to 80"));
    assert_non_null(strstr(r.svg.data, "linear scale (chosen)"));
    renderings_release(&r);
    show(&c, "sw", NULL, &r);
    near(number_at(field(r.parsed, "shapiro_wilk"), "w"), 0.7888147, 1e-6, 0, "R 4.2.2, shapiro.test");
    near(number_at(field(r.parsed, "shapiro_wilk"), "p"), 0.0067038, 1e-4, 0, "R 4.2.2, shapiro.test");
    renderings_release(&r);
    case_close(&c);
}

/* 1, 10, 100 are 0, 1, 2 on log10; the zero has no place there and is counted, the value below the limit is missing. */
static void test_log10(void **state) {
    (void)state;
    struct exhibit_case c;
    struct renderings r;
    open_small(&c, "coded");
    show(&c, "u", NULL, &r);
    assert_string_equal(string_at(r.parsed, "scale"), "log10");
    assert_string_equal(string_at(field(r.parsed, "arguments"), "scale"), "log10");
    near(number_at(r.parsed, "n"), 3, 0, 0, "n on log10");
    near(number_at(r.parsed, "not_on_scale"), 1, 0, 0, "the zero");
    near(number_at(r.parsed, "missing"), 7, 0, 0, "six blank, one below the limit");
    near(number_at(r.parsed, "mean"), 1, 1e-15, 0, "mean of 0, 1, 2");
    near(number_at(r.parsed, "sd"), 1, 1e-15, 0, "SD of 0, 1, 2");
    near(number_at(r.parsed, "geometric_mean"), 10, 1e-14, 0, "geometric mean");
    assert_non_null(strstr(r.svg.data, "log10 scale (chosen)"));
    assert_non_null(strstr(r.svg.data, "3 of 11 have a value here, 1 not positive"));
    assert_non_null(strstr(r.text.data, "1 value not positive and so without a place on log10."));
    renderings_release(&r);
    show(&c, "u", "linear", &r);
    near(number_at(r.parsed, "n"), 4, 0, 0, "n on the linear scale");
    near(number_at(r.parsed, "mean"), 27.75, 1e-15, 0, "mean of 0, 1, 10, 100");
    renderings_release(&r);
    case_close(&c);
}

static void test_category(void **state) {
    (void)state;
    struct exhibit_case c;
    struct renderings r;
    open_small(&c, "pooled");
    show(&c, "sex", "log10", &r);
    near(number_at(r.parsed, "n"), 5, 0, 0, "n");
    near(number_at(r.parsed, "missing"), 6, 0, 0, "missing");
    const cJSON *levels = field(r.parsed, "levels");
    near(number_at(member_with(levels, "level", "F"), "n"), 3, 0, 0, "women");
    near(number_at(member_with(levels, "level", "F"), "percent"), 60, 1e-15, 0, "of those with a value");
    near(number_at(member_with(levels, "level", "x"), "n"), 1, 0, 0, "unlisted code as it stands");
    assert_non_null(strstr(r.text.data, "\"x\", not in the plan"));
    assert_non_null(strstr(r.text.data, "scale= is not used"));
    assert_non_null(strstr(r.svg.data, "missing"));
    renderings_release(&r);
    case_close(&c);
}

/* The arms change nothing: every number is the same in all states of blinding. */
static void test_knows_no_arms(void **state) {
    (void)state;
    static const char *const states[] = {"pooled", "coded", "unblinded"};
    struct text first;
    text_init(&first);
    for (size_t i = 0; i < 3; i++) {
        struct exhibit_case c;
        struct renderings r;
        case_quayside(&c, states[i], true);
        show(&c, "sbp_26", NULL, &r);
        if (i == 0) {
            text_string(&first, r.csv.data);
        }
        assert_string_equal(r.csv.data, first.data);
        assert_null(strstr(r.html.data, "Walking group"));
        renderings_release(&r);
        case_close(&c);
    }
    text_release(&first);
}

static void test_refusals(void **state) {
    (void)state;
    struct exhibit_case c;
    struct renderings r;
    struct fault fault;
    open_small(&c, "pooled");
    const struct asked arm[] = {{"variable", "grp"}};
    assert_false(render(&c, "distribution", arm, 1, &r, &fault));
    assert_int_equal(fault.code, FAULT_REFUSED);
    assert_string_equal(fault.message,
        "distribution: what variable= asks for would tell the arms apart, so it is hidden while the study "
        "is pooled");
    renderings_release(&r);
    const struct asked unknown[] = {{"variable", "weight"}};
    assert_false(render(&c, "distribution", unknown, 1, &r, &fault));
    assert_string_equal(fault.message, "distribution: variable=weight is not known; it takes sex, fib, sw, u");
    renderings_release(&r);
    case_close(&c);
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_numbers),
        cmocka_unit_test(test_log10),
        cmocka_unit_test(test_category),
        cmocka_unit_test(test_knows_no_arms),
        cmocka_unit_test(test_refusals),
    };
    return cmocka_run_group_tests_name("exhibits/distribution", tests, NULL, NULL);
}
