/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Missing values by arm: counts by hand on a small trial, Fisher's p against a published table. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "exhibit_case.h"

static const char plan[] =
    "{\"title\": \"Small trial\", \"participant\": \"id\", \"missing_codes\": [\"999\"],"
    "\"arm\": {\"column\": \"grp\", \"levels\": ["
    "{\"code\": \"L\", \"label\": \"Advice\", \"reference\": true}, {\"code\": \"W\", \"label\": \"Walking\"}]},"
    "\"outcomes\": [{\"id\": \"y\", \"label\": \"Pressure\", \"unit\": \"mmHg\", \"role\": \"primary\", \"better\": "
    "\"lower\","
    "\"scale\": \"linear\", \"visits\": [{\"label\": \"Baseline\", \"column\": \"y0\"}, {\"label\": \"Week 4\", "
    "\"column\": "
    "\"y1\"}]}], \"blinding\": \"BLINDING\"}";

/* Fisher's tea tasting (1935, The Design of Experiments): 3 and 1 against 1 and 3, two-sided p = 34/70. */
static const char csv[] = "id,grp,y0,y1\n"
                          "p1,L,140,\n"
                          "p2,L,150,999\n"
                          "p3,L,<5,abc\n"
                          "p4,L,160,150\n"
                          "p5,W,130,120\n"
                          "p6,W,150,140\n"
                          "p7,W,140,\n"
                          "p8,W,140,130\n";

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
    render(&c, "missing-by-arm", NULL, 0, &r, NULL);
    const cJSON *variables = field(r.parsed, "variables");
    assert_int_equal(cJSON_GetArraySize(variables), 2);
    const cJSON *final = member_with(variables, "variable", "y1");
    const cJSON *advice = member_with(field(final, "arms"), "arm", "L");
    near(number_at(advice, "n"), 4, 0, 0, "participants of the arm");
    near(number_at(advice, "missing"), 3, 0, 0, "blank, code and unreadable");
    near(number_at(field(advice, "reasons"), "blank"), 1, 0, 0, "blank");
    near(number_at(field(advice, "reasons"), "missing-code"), 1, 0, 0, "code for missing");
    near(number_at(field(advice, "reasons"), "unreadable"), 1, 0, 0, "unreadable");
    near(number_at(final, "fisher_p"), 34 / 70.0, 1e-12, 0, "Fisher 1935, tea tasting");
    assert_string_equal(string_at(final, "status"), "ok");
    const cJSON *first = member_with(variables, "variable", "y0");
    near(number_at(field(member_with(field(first, "arms"), "arm", "L"), "reasons"), "below-limit"), 1, 0, 0, "<5");
    near(number_at(first, "fisher_p"), 1, 1e-12, 0, "1 of 4 against 0 of 4");
    assert_non_null(
        strstr(r.html.data, "<strong>4 of 8 (50%)</strong> missing; Advice 3 of 4 (75%), Walking 1 of 4 (25%)"));
    renderings_release(&r);
    case_close(&c);
}

static void test_one_arm_while_pooled(void **state) {
    (void)state;
    struct exhibit_case c;
    struct renderings r;
    open_small(&c, "pooled");
    render(&c, "missing-by-arm", NULL, 0, &r, NULL);
    const cJSON *final = member_with(field(r.parsed, "variables"), "variable", "y1");
    assert_int_equal(cJSON_GetArraySize(field(final, "arms")), 1);
    near(number_at(member_with(field(final, "arms"), "arm", "all"), "missing"), 4, 0, 0, "all missing");
    assert_true(cJSON_IsNull(field(final, "fisher_p")));
    assert_string_equal(string_at(final, "status"), "blinded");
    assert_null(strstr(r.text.data, "Fisher"));
    renderings_release(&r);
    case_close(&c);
}

/* Time goes covariates, visit by visit over all outcomes, events; sums over letters are those of the pooled table. */
static void test_invented_trial(void **state) {
    (void)state;
    static const char *const order[] = {
        "sex", "age", "bmi", "site", "sbp_0", "uacr_0", "sbp_8", "uacr_8", "sbp_26", "uacr_26", "rescue"};
    struct exhibit_case pooled, coded;
    struct renderings one, two;
    case_quayside(&pooled, "pooled", false);
    case_quayside(&coded, "coded", false);
    render(&pooled, "missing-by-arm", NULL, 0, &one, NULL);
    render(&coded, "missing-by-arm", NULL, 0, &two, NULL);
    for (int i = 0; i < (int)(sizeof order / sizeof *order); i++) {
        const cJSON *all = cJSON_GetArrayItem(field(one.parsed, "variables"), i);
        const cJSON *split = cJSON_GetArrayItem(field(two.parsed, "variables"), i), *arm;
        assert_string_equal(string_at(all, "variable"), order[i]);
        double n = 0, missing = 0;
        cJSON_ArrayForEach(arm, field(split, "arms")) {
            n += number_at(arm, "n");
            missing += number_at(arm, "missing");
        }
        near(number_at(cJSON_GetArrayItem(field(all, "arms"), 0), "n"), n, 0, 0, "n over letters");
        near(number_at(cJSON_GetArrayItem(field(all, "arms"), 0), "missing"), missing, 0, 0, "missing over letters");
    }
    assert_null(strstr(two.json.data, "Walking group"));
    renderings_release(&one);
    renderings_release(&two);
    case_close(&pooled);
    case_close(&coded);
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_counted_by_hand),
        cmocka_unit_test(test_one_arm_while_pooled),
        cmocka_unit_test(test_invented_trial),
    };
    return cmocka_run_group_tests_name("exhibits/missing-by-arm", tests, NULL, NULL);
}
