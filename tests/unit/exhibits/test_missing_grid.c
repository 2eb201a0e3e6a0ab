/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The grid of missing values: states cell by cell on a small trial, patterns by hand, and the key of the invented
 * trial. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "exhibit_case.h"

static const char csv[] = "id,grp,sex,y0,y1,stop\n"
                          "p3,L,F,140,130,N\n"
                          "p1,L,,150,999,N\n"
                          "p2,W,M,<5,12 mm,Y\n"
                          "p4,W,M,>400,120,N\n"
                          "p5,W,M,130,,N\n"
                          "p6,L,F,120,,N\n"
                          "p7,L,F,130,120,N\n"
                          "p7,L,F,131,120,N\n"
                          "p8,L,F,130,120,N\n";

static const char plan[] =
    "{\"title\": \"Small trial\", \"participant\": \"id\", \"missing_codes\": [\"999\"],"
    "\"arm\": {\"column\": \"grp\", \"levels\": ["
    "{\"code\": \"L\", \"label\": \"Advice\", \"reference\": true}, {\"code\": \"W\", \"label\": \"Walking\"}]},"
    "\"outcomes\": [{\"id\": \"y\", \"label\": \"Pressure\", \"unit\": \"mmHg\", \"role\": \"primary\", \"better\": "
    "\"lower\","
    "\"scale\": \"linear\", \"visits\": [{\"label\": \"Baseline\", \"column\": \"y0\"}, {\"label\": \"Week 4\", "
    "\"column\": "
    "\"y1\"}]}],"
    "\"covariates\": [{\"id\": \"sex\", \"label\": \"Sex\", \"column\": \"sex\", \"kind\": \"category\", \"levels\": ["
    "{\"code\": \"F\", \"label\": \"Female\"}, {\"code\": \"M\", \"label\": \"Male\"}]}],"
    "\"events\": [{\"id\": \"stop\", \"label\": \"Stopped\", \"column\": \"stop\", \"yes\": [\"Y\"], \"no\": [\"N\"]}],"
    "\"blinding\": \"BLINDING\"}";

static void open_small(struct exhibit_case *c, const char *blinding) {
    char *text = replaced(plan, "BLINDING", blinding);
    case_open(c, csv, text);
    memory_free(text);
}

static void test_states(void **state) {
    (void)state;
    static const char *const wanted[8][5] = {{"p1", "blank", "observed", "missing-code", "observed"},
        {"p2", "observed", "below-limit", "unreadable", "observed"},
        {"p3", "observed", "observed", "observed", "observed"},
        {"p4", "observed", "above-limit", "observed", "observed"}, {"p5", "observed", "observed", "blank", "observed"},
        {"p6", "observed", "observed", "blank", "observed"},
        {"p7", "held-aside", "held-aside", "held-aside", "held-aside"},
        {"p8", "observed", "observed", "observed", "observed"}};
    static const char *const columns[] = {"sex", "y0", "y1", "stop"};
    static const char *const orders[] = {NULL, "pattern", "identifier", "arm"};
    struct exhibit_case c;
    open_small(&c, "coded");
    for (size_t i = 0; i < sizeof orders / sizeof *orders; i++) {
        struct renderings r;
        const struct asked asked[] = {{"order", orders[i]}};
        render(&c, "missing-grid", asked, orders[i] != NULL, &r, NULL);
        /* lists of participants are in identifier order whatever the figure's order */
        for (int p = 0; p < 8; p++) {
            assert_string_equal(cJSON_GetArrayItem(field(r.parsed, "participants"), p)->valuestring, wanted[p][0]);
            for (int v = 0; v < 4; v++) {
                assert_string_equal(cJSON_GetArrayItem(field(r.parsed, "variables"), v)->valuestring, columns[v]);
                const cJSON *row = cJSON_GetArrayItem(field(r.parsed, "cells"), p);
                assert_string_equal(cJSON_GetArrayItem(row, v)->valuestring, wanted[p][v + 1]);
            }
        }
        assert_int_equal(strstr(r.json.data, "1 participant in the tables but not in the figure") != NULL, i == 3);
        renderings_release(&r);
    }
    case_close(&c);
}

/* p3 and p8 lack nothing; p5 and p6 lack y1; the other four lack something each of their own. */
static void test_patterns(void **state) {
    (void)state;
    struct exhibit_case c;
    struct renderings r;
    open_small(&c, "pooled");
    render(&c, "missing-grid", NULL, 0, &r, NULL);
    const cJSON *patterns = field(r.parsed, "patterns");
    assert_int_equal(cJSON_GetArraySize(patterns), 6);
    double sum = 0;
    const cJSON *pattern;
    cJSON_ArrayForEach(pattern, patterns) {
        sum += number_at(pattern, "n");
    }
    near(sum, 8, 0, 0, "patterns add up");
    const cJSON *first = cJSON_GetArrayItem(patterns, 0), *second = cJSON_GetArrayItem(patterns, 1);
    near(number_at(first, "n"), 2, 0, 0, "complete");
    assert_int_equal(cJSON_GetArraySize(field(first, "missing")), 0);
    near(number_at(second, "n"), 2, 0, 0, "without y1");
    assert_string_equal(cJSON_GetArrayItem(field(second, "missing"), 0)->valuestring, "y1");
    assert_non_null(strstr(r.html.data, "<strong>2 of 8 (25%)</strong> participants have every value"));
    assert_non_null(strstr(r.csv.data, "\nnothing,2,25\ny1,2,25\n"));
    renderings_release(&r);
    case_close(&c);
}

static void test_arm_order_while_pooled(void **state) {
    (void)state;
    struct exhibit_case c;
    struct renderings r;
    struct fault fault;
    open_small(&c, "pooled");
    const struct asked asked[] = {{"order", "arm"}};
    assert_false(render(&c, "missing-grid", asked, 1, &r, &fault));
    assert_int_equal(fault.code, FAULT_REFUSED);
    assert_string_equal(fault.message,
        "missing-grid: order=arm would show who shares an arm, so it is not shown while the study is "
        "pooled; order=pattern and order=identifier are");
    renderings_release(&r);
    render(&c, "missing-grid", NULL, 0, &r, NULL);
    assert_null(strstr(r.html.data, "data-value=\"arm\"")); /* no tab for what would be refused */
    assert_non_null(strstr(r.html.data, "data-value=\"identifier\""));
    renderings_release(&r);
    case_close(&c);
}

/* The invented trial after the right decisions: what is missing is what its key's clean data lack. */
static void test_invented_trial(void **state) {
    (void)state;
    struct exhibit_case c;
    struct renderings r;
    struct quayside quayside;
    quayside_make(QUAYSIDE_SEED, &quayside);
    case_quayside(&c, "unblinded", true);
    render(&c, "missing-grid", NULL, 0, &r, NULL);
    /* columns of the clean CSV after pid, site and grp, against the grid's */
    static const char *const columns[] = {
        "sex", "age", "bmi", "sbp_0", "sbp_8", "sbp_26", "uacr_0", "uacr_8", "uacr_26", "rescue"};
    size_t lacking = 0;
    for (const char *line = strchr(quayside.clean_csv.data, '\n') + 1; *line; line = strchr(line, '\n') + 1) {
        int p = 0;
        while (strncmp(cJSON_GetArrayItem(field(r.parsed, "participants"), p)->valuestring, line, strcspn(line, ",")) !=
               0) {
            p++;
        }
        const char *at = line;
        for (size_t i = 0; i < 3; i++) {
            at = strchr(at, ',') + 1;
        }
        for (size_t i = 0; i < sizeof columns / sizeof *columns; i++) {
            int v = 0;
            while (strcmp(cJSON_GetArrayItem(field(r.parsed, "variables"), v)->valuestring, columns[i]) != 0) {
                v++;
            }
            const char *got = cJSON_GetArrayItem(cJSON_GetArrayItem(field(r.parsed, "cells"), p), v)->valuestring;
            size_t length = strcspn(at, ",\n");
            bool missing = length == 0 || *at == '<';
            lacking += missing;
            assert_int_equal(strcmp(got, "observed") != 0, missing);
            assert_int_equal(strcmp(got, "below-limit") == 0, *at == '<');
            at += length + 1;
        }
    }
    assert_true(lacking > 50);
    renderings_release(&r);
    case_close(&c);
    quayside_release(&quayside);
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_states),
        cmocka_unit_test(test_patterns),
        cmocka_unit_test(test_arm_order_while_pooled),
        cmocka_unit_test(test_invented_trial),
    };
    return cmocka_run_group_tests_name("exhibits/missing-grid", tests, NULL, NULL);
}
