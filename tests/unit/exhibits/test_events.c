/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Events and screening on a small trial, counted by hand. The strategies' names are those of ICH E9(R1), section A.3.2;
 * the stages above "records" follow the CONSORT 2010 diagram (assessed for eligibility, excluded with reasons). */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "exhibit_case.h"

static const char plan[] =
    "{\"title\": \"Small trial\", \"participant\": \"id\", \"missing_codes\": [],"
    "\"arm\": {\"column\": \"grp\", \"levels\": ["
    "{\"code\": \"L\", \"label\": \"Advice\", \"reference\": true}, {\"code\": \"W\", \"label\": \"Walking\"}]},"
    "\"outcomes\": [{\"id\": \"y\", \"label\": \"Pressure\", \"role\": \"primary\", \"better\": \"lower\","
    "\"visits\": [{\"label\": \"Baseline\", \"column\": \"y0\"}, {\"label\": \"Week 4\", \"column\": \"y1\"}]}],"
    "\"events\": ["
    "{\"id\": \"stopped\", \"label\": \"Stopped treatment\", \"column\": \"end\", \"yes\": [\"S\", \"D\"], \"no\": "
    "[\"C\"],"
    " \"kind\": \"stopped-treatment\", \"strategy\": \"treatment-policy\", \"reason\": \"why\", \"date\": \"on\"},"
    "{\"id\": \"died\", \"label\": \"Died\", \"column\": \"end\", \"yes\": [\"D\"], \"no\": [\"C\", \"S\"],"
    " \"kind\": \"died\", \"strategy\": \"composite\"}],"
    "\"screening\": {\"source\": \"Screening log, 12 May\", \"assessed\": 20, \"reasons\": ["
    "{\"reason\": \"not eligible\", \"n\": 7}, {\"reason\": \"declined\", \"n\": DECLINED}]},"
    "\"blinding\": \"BLINDING\"}";

/* p9 has no arm; p10 stands on two records. */
static const char csv[] = "id,grp,y0,y1,end,why,on\n"
                          "p1,L,140,138,C,,\n"
                          "p2,L,150,149,S,moved,3/4/26\n"
                          "p3,L,155,,S,tired,\n"
                          "p4,L,160,150,D,,5/4/26\n"
                          "p5,W,130,120,C,,\n"
                          "p6,W,150,140,C,,\n"
                          "p7,W,140,,S,moved,6/4/26\n"
                          "p8,W,140,130,x,,\n"
                          "p9,,140,130,S,moved,\n"
                          "p10,W,140,130,C,,\n"
                          "p10,W,141,130,C,,\n";

static void open_small(struct exhibit_case *c, const char *blinding, const char *declined) {
    char *text = replaced(plan, "BLINDING", blinding), *whole = replaced(text, "DECLINED", declined);
    case_open(c, csv, whole);
    memory_free(text);
    memory_free(whole);
}

static void expect_counts(const cJSON *event, const char *arm, const double counts[6]) {
    static const char *const names[] = {"n", "with", "without", "not_recorded", "outcome_observed", "dated"};
    const cJSON *row = member_with(field(event, "arms"), "arm", arm);
    for (int i = 0; i < 6; i++) {
        near(number_at(row, names[i]), counts[i], 0, 0, names[i]);
    }
}

static double reason_count(const cJSON *event, int reason, const char *arm) {
    return number_at(member_with(field(cJSON_GetArrayItem(field(event, "reasons"), reason), "arms"), "arm", arm), "n");
}

static void test_counted_by_hand(void **state) {
    (void)state;
    struct exhibit_case c;
    struct renderings r;
    open_small(&c, "unblinded", "4");
    render(&c, "events", NULL, 0, &r, NULL);
    const cJSON *stopped = member_with(field(r.parsed, "events"), "event", "stopped");
    const cJSON *died = member_with(field(r.parsed, "events"), "event", "died");
    assert_string_equal(string_at(stopped, "kind"), "stopped-treatment");
    assert_string_equal(string_at(stopped, "strategy"), "treatment-policy");
    assert_string_equal(string_at(died, "strategy"), "composite");
    expect_counts(stopped, "L", (const double[]){4, 3, 1, 0, 2, 2});
    expect_counts(stopped, "W", (const double[]){4, 1, 2, 1, 0, 1}); /* p8 reads x: not recorded, and asked about */
    expect_counts(died, "L", (const double[]){4, 1, 3, 0, 1, (double)NAN});
    const cJSON *reasons = field(stopped, "reasons");
    assert_int_equal(cJSON_GetArraySize(reasons), 3);
    assert_string_equal(string_at(cJSON_GetArrayItem(reasons, 0), "reason"), "moved");
    assert_string_equal(string_at(cJSON_GetArrayItem(reasons, 1), "reason"), "tired");
    assert_true(cJSON_IsNull(field(cJSON_GetArrayItem(reasons, 2), "reason")));
    near(reason_count(stopped, 0, "L"), 1, 0, 0, "moved, L");
    near(reason_count(stopped, 0, "W"), 1, 0, 0, "moved, W");
    near(reason_count(stopped, 2, "L"), 1, 0, 0, "no reason recorded");
    assert_null(strstr(r.json.data, "\"p\""));
    renderings_release(&r);
    case_close(&c);
}

/* An event never blanks an outcome: whoever stopped and was measured is analysed. */
static void test_no_outcome_is_blanked(void **state) {
    (void)state;
    struct exhibit_case c;
    struct renderings r;
    open_small(&c, "unblinded", "4");
    render(&c, "missing-by-arm", NULL, 0, &r, NULL);
    const cJSON *final = member_with(field(r.parsed, "variables"), "variable", "y1");
    near(number_at(member_with(field(final, "arms"), "arm", "L"), "missing"), 1, 0, 0, "only p3 has no value");
    renderings_release(&r);
    case_close(&c);
}

/* One question about the code x of a column on which two events rest. */
static void test_one_question_for_both(void **state) {
    (void)state;
    struct exhibit_case c;
    struct renderings r;
    open_small(&c, "unblinded", "4");
    render(&c, "discrepancies", NULL, 0, &r, NULL);
    int found = 0;
    const cJSON *one;
    cJSON_ArrayForEach(one, field(r.parsed, "discrepancies")) {
        found += strcmp(string_at(one, "check"), "unlisted-category") == 0;
    }
    assert_int_equal(found, 1);
    renderings_release(&r);
    case_close(&c);
}

static void test_blinded(void **state) {
    (void)state;
    struct exhibit_case c;
    struct renderings r;
    open_small(&c, "pooled", "4");
    render(&c, "events", NULL, 0, &r, NULL);
    expect_counts(
        member_with(field(r.parsed, "events"), "event", "stopped"), "all", (const double[]){8, 4, 3, 1, 2, 3});
    renderings_release(&r);
    case_close(&c);
    char *named = replaced(csv, "tired", "no walking for her"); /* a reason that names an arm */
    char *text = replaced(plan, "BLINDING", "coded"), *whole = replaced(text, "DECLINED", "4");
    case_open(&c, named, whole);
    render(&c, "events", NULL, 0, &r, NULL);
    assert_null(strcasestr(r.json.data, "walking"));
    assert_non_null(strstr(r.text.data, "The reasons of Stopped treatment are not shown"));
    renderings_release(&r);
    case_close(&c);
    memory_free(named);
    memory_free(text);
    memory_free(whole);
}

static double total_of(const cJSON *flow, const char *stage) {
    return number_at(member_with(field(flow, "stages"), "stage", stage), "total");
}

static int screening_state(struct exhibit_case *c, char state[16]) {
    struct renderings r;
    int found = 0;
    render(c, "discrepancies", NULL, 0, &r, NULL);
    const cJSON *one;
    cJSON_ArrayForEach(one, field(r.parsed, "discrepancies")) {
        if (strcmp(string_at(one, "check"), "screening-sum") == 0) {
            snprintf(state, 16, "%s", string_at(one, "state"));
            found++;
        }
    }
    renderings_release(&r);
    return found;
}

/* 20 assessed, 7 + 4 not randomised: 9, and the data have ten identifiers, one of them without an arm. */
static void test_screening(void **state) {
    (void)state;
    static const struct {
        const char *declined;
        int found;
        const char *words;
    } cases[] = {{"4", 0, "20 assessed less 11 not randomised is 9, as many as the data have randomised"},
        {"6", 1, "do not add up: 20 assessed less 13 not randomised is 7, and the data have 9 randomised"}};
    for (size_t i = 0; i < 2; i++) {
        struct exhibit_case c;
        struct renderings r;
        char now[16] = "";
        open_small(&c, "pooled", cases[i].declined);
        render(&c, "flow", NULL, 0, &r, NULL);
        assert_string_equal(string_at(cJSON_GetArrayItem(field(r.parsed, "stages"), 0), "stage"), "assessed");
        assert_string_equal(string_at(cJSON_GetArrayItem(field(r.parsed, "stages"), 3), "stage"), "records");
        near(total_of(r.parsed, "assessed"), 20, 0, 0, "assessed");
        near(total_of(r.parsed, "not-randomised:not eligible"), 7, 0, 0, "not eligible");
        near(total_of(r.parsed, "records"), 11, 0, 0, "records of the file");
        near(total_of(r.parsed, "randomised"), 8, 0, 0, "p10 is held aside");
        assert_non_null(strstr(r.text.data, cases[i].words));
        assert_non_null(strstr(r.svg.data, "assessed for eligibility"));
        assert_int_equal(screening_state(&c, now), cases[i].found);
        renderings_release(&r);
        case_close(&c);
    }
}

static void test_screening_is_settled_by_a_note(void **state) {
    (void)state;
    struct exhibit_case c;
    char now[16] = "";
    open_small(&c, "pooled", "6");
    assert_int_equal(screening_state(&c, now), 1);
    assert_string_equal(now, "open");
    static const char note[] =
        "[{\"kind\": \"note\", \"exhibit\": \"flow\", \"text\": \"The log was closed early.\","
        "\"reason\": \"Asked the coordinator.\", \"discrepancy\": \"screening-sum/randomised\"}]";
    struct fault fault;
    fault_init(&fault);
    assert_true(study_decide(c.study, "M. Tide, statistician", note, strlen(note), "note", ANY_VERSION, NULL, &fault));
    assert_int_equal(screening_state(&c, now), 1);
    assert_string_equal(now, "settled");
    case_close(&c);
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_counted_by_hand),
        cmocka_unit_test(test_no_outcome_is_blanked),
        cmocka_unit_test(test_one_question_for_both),
        cmocka_unit_test(test_blinded),
        cmocka_unit_test(test_screening),
        cmocka_unit_test(test_screening_is_settled_by_a_note),
    };
    return cmocka_run_group_tests_name("exhibits/events", tests, NULL, NULL);
}
