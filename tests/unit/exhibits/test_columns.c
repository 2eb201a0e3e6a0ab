/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What came in, of one file and of several: counted by hand on a small trial; and every exhibit on the invented trial as four
 * files, with no arm's name in any of them while blinded. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "base/hash.h"
#include "exhibit_case.h"

static const char people[] = "pid,grp\nP1,Lx\nP2,Wx\nP3,Wx\nP3,Wx\n,Lx\n";
static const char visits[] = "pid,v,y,room\nP1,0,1,a\nP1,1,2,a\nP2,0,3,b\nP2,0,4,b\nP4,0,5,a\nP1,9,6,a\n,0,7,a\nP3,1,8,a\n";

static const char plan[] =
    "{\"title\": \"Small\", \"participant\": \"pid\", \"files\": [{\"id\": \"who\", \"participant\": \"pid\"}, {\"id\": \"when\", \"layout\": \"visit\", "
    "\"participant\": \"pid\", \"visit\": \"v\", \"codes\": [\"0\", \"1\"]}], \"arm\": {\"column\": \"grp\", \"levels\": [{\"code\": \"Lx\", \"reference\": "
    "true}, {\"code\": \"Wx\"}]}, \"outcomes\": [{\"id\": \"y\", \"label\": \"Y\", \"role\": \"primary\", \"better\": \"lower\", \"visits\": [{\"label\": "
    "\"B\", \"column\": \"when.y@0\"}, {\"label\": \"E\", \"column\": \"when.y@1\"}]}], \"blinding\": \"pooled\"}";

static void expect_count(const cJSON *object, const char *name, double count) {
    near(number_at(object, name), count, 0, 0, name);
}

static void test_files_counted_by_hand(void **state) {
    (void)state;
    const struct study_file files[] = {{"people.csv", people, strlen(people)}, {"visits.csv", visits, strlen(visits)}};
    struct exhibit_case c;
    struct renderings r;
    case_open_files(&c, files, 2, plan);
    render(&c, "columns", NULL, 0, &r, NULL);
    const cJSON *who = member_with(field(r.parsed, "files"), "id", "who"), *when = member_with(field(r.parsed, "files"), "id", "when");
    static const struct {
        const char *name;
        double who, when;
    } counts[] = {{"records", 5, 8}, {"columns", 2, 4}, {"matched", 4, 5}, {"unmatched", 0, 1}, {"double", 1, 1}, {"unplanned", 0, 1},
        {"blank", 1, 1}, {"bytes", sizeof people - 1, sizeof visits - 1}};
    for (size_t i = 0; i < sizeof counts / sizeof *counts; i++) {
        expect_count(who, counts[i].name, counts[i].who);
        expect_count(when, counts[i].name, counts[i].when);
    }
    char sha256[HASH_SIZE];
    hash_of(visits, strlen(visits), sha256);
    assert_string_equal(string_at(when, "sha256"), sha256);
    assert_string_equal(string_at(who, "layout"), "participant");
    assert_string_equal(string_at(when, "layout"), "visit");
    assert_int_equal(cJSON_GetArraySize(field(who, "visits")), 0);
    const cJSON *first = member_with(field(when, "visits"), "code", "0"), *second = member_with(field(when, "visits"), "code", "1");
    expect_count(first, "n", 1); /* P1; P2 has two of it */
    expect_count(first, "held_aside", 1);
    expect_count(second, "n", 1); /* P1; P3 is held aside as a whole */
    expect_count(second, "held_aside", 1);
    static const char *const columns[][2] = {{"who.pid", "participant's identifier"}, {"who.grp", "arm"}, {"when.pid", "participant's identifier"},
        {"when.v", "visit's code"}, {"when.y@0", "primary outcome"}, {"when.y@1", "primary outcome"}, {"when.room", "none in the plan"}};
    assert_int_equal(cJSON_GetArraySize(field(r.parsed, "columns")), 7);
    for (size_t i = 0; i < 7; i++) {
        const cJSON *column = cJSON_GetArrayItem(field(r.parsed, "columns"), (int)i);
        assert_string_equal(string_at(column, "column"), columns[i][0]);
        assert_string_equal(string_at(column, "meaning"), columns[i][1]);
    }
    expect_count(member_with(field(r.parsed, "columns"), "column", "when.y@0"), "n", 1);
    expect_count(member_with(field(r.parsed, "columns"), "column", "when.y@0"), "held_aside", 2);
    assert_string_equal(cJSON_GetArrayItem(field(r.parsed, "notes"), 0)->valuestring,
        "1 column of the files has no meaning in the plan; kept as received, and in no analysis.");
    assert_non_null(strstr(r.text.data, sha256));
    assert_null(strstr(r.text.data, "Wx"));
    renderings_release(&r);
    case_close(&c);
}

/* A participant's panel shows the records of each file, and what those held aside say. */
static void test_records_of_each_file(void **state) {
    (void)state;
    const struct study_file files[] = {{"people.csv", people, strlen(people)}, {"visits.csv", visits, strlen(visits)}};
    struct exhibit_case c;
    struct renderings r;
    struct asked asked = {"participant", "P2"};
    case_open_files(&c, files, 2, plan);
    render(&c, "participant", &asked, 1, &r, NULL);
    const cJSON *places = field(r.parsed, "files");
    assert_int_equal(cJSON_GetArraySize(places), 3); /* one file per participant, and two visits of the other */
    const cJSON *double_visit = field(cJSON_GetArrayItem(places, 1), "records");
    assert_int_equal(cJSON_GetArraySize(double_visit), 2);
    near(cJSON_GetArrayItem(double_visit, 0)->valuedouble, 3, 0, 0, "first record");
    near(cJSON_GetArrayItem(double_visit, 1)->valuedouble, 4, 0, 0, "second record");
    assert_int_equal(cJSON_GetArraySize(field(cJSON_GetArrayItem(places, 2), "records")), 0);
    const cJSON *texts = field(member_with(field(r.parsed, "values"), "column", "when.y@0"), "on_records");
    assert_int_equal(cJSON_GetArraySize(texts), 2);
    assert_string_equal(cJSON_GetArrayItem(texts, 0)->valuestring, "3");
    assert_string_equal(cJSON_GetArrayItem(texts, 1)->valuestring, "4");
    renderings_release(&r);
    case_close(&c);
}

static void test_one_file(void **state) {
    (void)state;
    struct exhibit_case c;
    struct renderings r;
    case_quayside(&c, "coded", false);
    render(&c, "columns", NULL, 0, &r, NULL);
    assert_int_equal(cJSON_GetArraySize(field(r.parsed, "files")), 1);
    const cJSON *file = cJSON_GetArrayItem(field(r.parsed, "files"), 0);
    assert_null(string_at(file, "id"));
    expect_count(file, "records", 241);
    expect_count(file, "matched", 241);
    expect_count(file, "double", 1);
    assert_string_equal(string_at(file, "sha256"), string_at(r.parsed, "data_sha256"));
    assert_null(strstr(r.text.data, "Matched"));
    renderings_release(&r);
    case_close(&c);
}

static void test_every_exhibit_of_four_files(void **state) {
    (void)state;
    static const char *const blinding[] = {"pooled", "coded", "unblinded"};
    static const struct asked asked[] = {{NULL, NULL}, {"variable", "visits.sbp@V26"}, {"participant", "Q1216"}, {"event", "rescue"}, {"outcome", "uacr"}};
    for (size_t b = 0; b < 3; b++) {
        struct exhibit_case c;
        size_t shown = 0;
        case_quayside_files(&c, QUAYSIDE_SEED, blinding[b], b == 1);
        for (size_t e = 0; exhibits[e]; e++) {
            for (size_t a = 0; a < sizeof asked / sizeof *asked; a++) {
                struct renderings r;
                struct fault fault;
                if (render(&c, exhibits[e]->name, &asked[a], a > 0, &r, &fault)) {
                    shown++;
                    bool named = strstr(r.json.data, "Walking group") || strstr(r.html.data, "Printed advice");
                    if (b < 2 && named) {
                        fail_msg("%s names an arm while %s", exhibits[e]->name, blinding[b]);
                    }
                }
                renderings_release(&r);
            }
        }
        assert_true(shown > 15);
        case_close(&c);
    }
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_files_counted_by_hand),
        cmocka_unit_test(test_records_of_each_file),
        cmocka_unit_test(test_one_file),
        cmocka_unit_test(test_every_exhibit_of_four_files),
    };
    return cmocka_run_group_tests_name("exhibits/columns", tests, NULL, NULL);
}
