/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Paired values before and after: counted by hand on a small trial, and the same pairs in all states of blinding. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "exhibit_case.h"

static const char csv[] = "id,grp,y0,y4,y8,z\n"
                          "p1,L,140,1,130,7\n"
                          "p2,L,150,2,145,7\n"
                          "p3,L,160,3,,7\n"
                          "p4,L,,4,120,7\n"
                          "p5,L,,5,,7\n"
                          "p6,W,150,6,0,7\n"
                          "p7,W,152,7,141,7\n"
                          "p8,W,154,8,150,7\n"
                          "p9,,150,9,140,7\n";

static const char plan[] =
    "{\"title\": \"Small trial\", \"participant\": \"id\","
    "\"arm\": {\"column\": \"grp\", \"levels\": ["
    "{\"code\": \"L\", \"label\": \"Advice\", \"reference\": true}, {\"code\": \"W\", \"label\": \"Walking\"}]},"
    "\"outcomes\": [{\"id\": \"y\", \"label\": \"Pressure\", \"unit\": \"mmHg\", \"role\": \"primary\", \"better\": "
    "\"lower\","
    "\"scale\": \"linear\", \"visits\": [{\"label\": \"Baseline\", \"column\": \"y0\"}, {\"label\": \"4 weeks\", "
    "\"column\": \"y4\"},"
    "{\"label\": \"8 weeks\", \"column\": \"y8\"}]},"
    "{\"id\": \"z\", \"label\": \"Score\", \"unit\": \"\", \"role\": \"secondary\", \"better\": \"lower\", \"scale\": "
    "\"linear\","
    "\"visits\": [{\"label\": \"8 weeks\", \"column\": \"z\"}]}],"
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
    render(&c, "before-after", NULL, 0, &r, NULL);
    assert_string_equal(
        string_at(r.parsed, "title"), "How did pressure move from baseline to 8 weeks in each participant?");
    const cJSON *advice = member_with(field(r.parsed, "groups"), "arm", "L");
    assert_string_equal(string_at(advice, "label"), "Advice");
    near(number_at(advice, "n"), 2, 0, 0, "p1 and p2");
    near(number_at(advice, "missing"), 3, 0, 0, "p3, p4, p5");
    near(number_at(advice, "missing_after"), 1, 0, 0, "p3");
    near(number_at(advice, "missing_before"), 1, 0, 0, "p4");
    near(number_at(advice, "missing_both"), 1, 0, 0, "p5");
    near(number_at(advice, "median_before"), 145, 0, 0, "of 140 and 150: of the pairs, without p3");
    near(number_at(advice, "median_after"), 137.5, 0, 0, "of 130 and 145: without p4");
    const cJSON *pair = member_with(field(advice, "pairs"), "participant", "p2");
    near(number_at(pair, "before"), 150, 0, 0, "before");
    near(number_at(pair, "after"), 145, 0, 0, "after");
    near(number_at(member_with(field(r.parsed, "groups"), "arm", "W"), "n"), 3, 0, 0, "linear takes the zero");
    assert_non_null(strstr(r.text.data, "change within persons"));
    assert_null(strstr(r.json.data, "\"p\":"));
    assert_non_null(strstr(r.text.data, "1 participant not counted here: no arm"));
    renderings_release(&r);
    case_close(&c);
}

/* On log10 the zero makes no pair and is counted; values stay in the unit. */
static void test_arguments(void **state) {
    (void)state;
    struct exhibit_case c;
    struct renderings r;
    open_small(&c, "coded");
    const struct asked log[] = {{"scale", "log10"}};
    render(&c, "before-after", log, 1, &r, NULL);
    double n = 0;
    const cJSON *group;
    cJSON_ArrayForEach(group, field(r.parsed, "groups")) {
        n += number_at(group, "n");
    }
    near(n, 4, 0, 0, "p1, p2, p7, p8");
    near(number_at(r.parsed, "not_on_scale"), 1, 0, 0, "p6");
    assert_non_null(strstr(r.text.data, "1 participant has a value that is not positive"));
    assert_non_null(strstr(r.json.data, "{\"participant\":\"p7\",\"before\":152,\"after\":141}"));
    renderings_release(&r);
    const struct asked visit[] = {{"visit", "4 weeks"}};
    render(&c, "before-after", visit, 1, &r, NULL);
    assert_string_equal(string_at(r.parsed, "after"), "4 weeks");
    assert_non_null(strstr(r.json.data, "{\"participant\":\"p7\",\"before\":152,\"after\":7}"));
    renderings_release(&r);
    case_close(&c);
}

static void test_refusals(void **state) {
    (void)state;
    static const struct {
        struct asked asked;
        const char *sentence;
    } cases[] = {
        {{"visit", "Baseline"}, "before-after: visit=Baseline is the baseline itself; say a later visit"},
        {{"outcome", "z"}, "before-after: Score has one visit, so there is nothing before it to pair it with"},
        {{"visit", "9 weeks"}, "before-after: visit=9 weeks is not known; it takes Baseline, 4 weeks, 8 weeks"},
    };
    struct exhibit_case c;
    open_small(&c, "pooled");
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        struct renderings r;
        struct fault fault;
        assert_false(render(&c, "before-after", &cases[i].asked, 1, &r, &fault));
        assert_string_equal(fault.message, cases[i].sentence);
        renderings_release(&r);
    }
    case_close(&c);
}

/* Pooled there is one group of all who have an arm, with the pairs of both letters. */
static void test_states_of_blinding(void **state) {
    (void)state;
    static const char *const states[] = {"pooled", "coded", "unblinded"};
    size_t pairs[3] = {0};
    for (size_t i = 0; i < 3; i++) {
        struct exhibit_case c;
        struct renderings r;
        case_quayside(&c, states[i], true);
        render(&c, "before-after", NULL, 0, &r, NULL);
        const cJSON *group;
        cJSON_ArrayForEach(group, field(r.parsed, "groups")) {
            pairs[i] += (size_t)cJSON_GetArraySize(field(group, "pairs"));
            assert_int_equal(cJSON_GetArraySize(field(group, "pairs")), (int)number_at(group, "n"));
        }
        assert_int_equal(cJSON_GetArraySize(field(r.parsed, "groups")), i ? 2 : 1);
        assert_int_equal(strstr(r.svg.data, "Walking group") != NULL, i == 2);
        renderings_release(&r);
        case_close(&c);
    }
    assert_true(pairs[0] > 150);
    assert_int_equal(pairs[1], pairs[0]);
    assert_int_equal(pairs[2], pairs[0]);
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_counted_by_hand),
        cmocka_unit_test(test_arguments),
        cmocka_unit_test(test_refusals),
        cmocka_unit_test(test_states_of_blinding),
    };
    return cmocka_run_group_tests_name("exhibits/before-after", tests, NULL, NULL);
}
