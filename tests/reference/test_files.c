/* SPDX-License-Identifier: GPL-3.0-or-later */
/* An open trial as it comes, one row per participant, and turned by this test into people and visits: the same effects. The
 * data are R's HSAUR3::BtheB (Proudfoot et al. 2003, Psychological Medicine 33:217); see data.R. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "unit/exhibits/exhibit_case.h"
#include <stdio.h>

static const char *const months[] = {"before", "month2", "month3", "month5", "month8"};
enum { MONTHS = 5, FIRST_MONTH = 3 };

/* The four texts: as it comes with an identifier in front, and people and visits; a blank score is a visit without record. */
static size_t read_trial(struct text *wide, struct text *people, struct text *visits) {
    FILE *file = fopen("tests/reference/data/btheb.csv", "r");
    assert_non_null(file);
    char line[256];
    size_t records = 0;
    text_init(wide);
    text_init(people);
    text_init(visits);
    text_literal(wide, "id,drug,length,treatment,before,month2,month3,month5,month8\n");
    text_literal(people, "drug,id,length,treatment\n");
    text_literal(visits, "score,when,patient\n");
    while (fgets(line, sizeof line, file)) {
        line[strcspn(line, "\r\n")] = '\0';
        if (line[0] == '#' || strncmp(line, "drug", 4) == 0) {
            continue;
        }
        records++;
        text_format(wide, "B%03zu,%s\n", records, line);
        char *at = line, *cell;
        for (size_t c = 0; (cell = strsep(&at, ",")); c++) {
            if (c == 0) {
                text_format(people, "%s,B%03zu", cell, records);
            } else if (c < FIRST_MONTH) {
                text_format(people, ",%s%s", cell, c + 1 == FIRST_MONTH ? "\n" : "");
            } else if (*cell) {
                assert_true(c < FIRST_MONTH + MONTHS);
                text_format(visits, "%s,%s,B%03zu\n", cell, months[c - FIRST_MONTH], records);
            }
        }
    }
    fclose(file);
    return records;
}

static void write_plan(struct text *out, bool files) {
    text_init(out);
    text_literal(out, "{\"title\": \"Beating the blues\", \"participant\": \"id\", ");
    if (files) {
        text_literal(out, "\"files\": [{\"id\": \"people\", \"participant\": \"id\"}, {\"id\": \"scores\", \"layout\": \"visit\", \"participant\": \"patient\", "
                          "\"visit\": \"when\", \"codes\": [\"before\", \"month2\", \"month3\", \"month5\", \"month8\"]}], ");
    }
    text_literal(out, "\"arm\": {\"column\": \"treatment\", \"levels\": [{\"code\": \"TAU\", \"reference\": true}, {\"code\": \"BtheB\"}]}, \"outcomes\": "
                      "[{\"id\": \"bdi\", \"label\": \"Depression score\", \"role\": \"primary\", \"better\": \"lower\", \"visits\": [");
    for (size_t m = 0; m < MONTHS; m++) {
        text_format(out, "%s{\"label\": \"%s\", ", m ? ", " : "", months[m]);
        if (files) {
            text_format(out, "\"file\": \"scores\", \"visit\": \"%s\", \"column\": \"score\"}", months[m]);
        } else {
            text_format(out, "\"column\": \"%s\"}", months[m]);
        }
    }
    text_literal(out, "]}], \"covariates\": [{\"id\": \"drug\", \"column\": \"drug\", \"kind\": \"category\"}, {\"id\": \"length\", \"column\": \"length\", "
                      "\"kind\": \"category\"}], \"adjust_for\": [\"drug\", \"length\"], \"blinding\": \"unblinded\"}");
}

static char *body_made(struct exhibit_case *c, const char *exhibit, const char *visit) {
    struct renderings r;
    struct asked asked = {"visit", visit};
    render(c, exhibit, &asked, 1, &r, NULL);
    char *body = strstr(r.json.data, "\"arguments\"");
    assert_non_null(body);
    body = memory_text(body);
    renderings_release(&r);
    return body;
}

static void test_wide_and_long_give_the_same(void **state) {
    (void)state;
    struct text wide, people, visits, wide_plan, long_plan;
    assert_int_equal(read_trial(&wide, &people, &visits), 100);
    write_plan(&wide_plan, false);
    write_plan(&long_plan, true);
    struct exhibit_case one, two;
    case_open(&one, wide.data, wide_plan.data);
    const struct study_file files[] = {{"people.csv", people.data, people.length}, {"visits.csv", visits.data, visits.length}};
    case_open_files(&two, files, 2, long_plan.data);
    for (size_t m = 1; m < MONTHS; m++) {
        static const char *const compared[] = {"effect", "change-by-arm"};
        for (size_t e = 0; e < 2; e++) {
            char *a = body_made(&one, compared[e], months[m]), *b = body_made(&two, compared[e], months[m]);
            assert_string_equal(a, b);
            memory_free(a);
            memory_free(b);
        }
    }
    case_close(&one);
    case_close(&two);
    struct text *const all[] = {&wide, &people, &visits, &wide_plan, &long_plan};
    for (size_t i = 0; i < 5; i++) {
        text_release(all[i]);
    }
}

/* R 4.2.2: summary(lm(bdi.8m ~ treatment + bdi.pre + drug + length, HSAUR3::BtheB)), 52 complete records. */
static void test_long_form_is_r_s(void **state) {
    (void)state;
    struct text wide, people, visits, plan;
    read_trial(&wide, &people, &visits);
    write_plan(&plan, true);
    struct exhibit_case c;
    struct renderings r;
    const struct study_file files[] = {{"people.csv", people.data, people.length}, {"visits.csv", visits.data, visits.length}};
    case_open_files(&c, files, 2, plan.data);
    render(&c, "effect", NULL, 0, &r, NULL);
    const cJSON *contrast = cJSON_GetArrayItem(field(r.parsed, "contrasts"), 0);
    const cJSON *primary = member_with(field(contrast, "estimates"), "method", "ancova");
    near(number_at(primary, "estimate"), -3.0815046209283312, 1e-10, 0, "difference");
    near(number_at(primary, "standard_error"), 2.3837241397335833, 1e-10, 0, "standard error");
    renderings_release(&r);
    case_close(&c);
    struct text *const all[] = {&wide, &people, &visits, &plan};
    for (size_t i = 0; i < 4; i++) {
        text_release(all[i]);
    }
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_wide_and_long_give_the_same),
        cmocka_unit_test(test_long_form_is_r_s),
    };
    return cmocka_run_group_tests_name("reference/files", tests, NULL, NULL);
}
