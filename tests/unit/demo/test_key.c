/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The whole way on the invented trial: every planted trouble of its key is noticed, and after the right decisions every
 * estimate equals, to the last digit, what the generator's clean data give. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "unit/exhibits/exhibit_case.h"

static cJSON *key_of_demo(void) {
    struct quayside quayside;
    quayside_make(QUAYSIDE_SEED, &quayside);
    cJSON *key = cJSON_ParseWithOpts(quayside.key_json.data, NULL, true);
    assert_non_null(key);
    quayside_release(&quayside);
    return key;
}

static void open_clean(struct exhibit_case *c) {
    struct quayside quayside;
    quayside_make(QUAYSIDE_SEED, &quayside);
    char *plan = replaced(quayside.plan_json.data, "\"blinding\": \"coded\"", "\"blinding\": \"unblinded\"");
    case_open(c, quayside.clean_csv.data, plan);
    memory_free(plan);
    quayside_release(&quayside);
}

/* A discrepancy names one participant, or all whose cells of the column read alike, with what they read. */
static bool speaks_of(const cJSON *discrepancy, const cJSON *trouble) {
    const char *column = string_at(trouble, "column"), *value = string_at(discrepancy, "value");
    if (strcmp(string_at(discrepancy, "check"), string_at(trouble, "check")) != 0) {
        return false;
    }
    if (column && (!string_at(discrepancy, "column") || strcmp(string_at(discrepancy, "column"), column) != 0)) {
        return false;
    }
    bool named = false;
    const cJSON *participant;
    cJSON_ArrayForEach(participant, field(discrepancy, "participants")) {
        named = named || strcmp(participant->valuestring, string_at(trouble, "participant")) == 0;
    }
    return named && (!value || strcmp(value, string_at(trouble, "received")) == 0);
}

/* A genuine outlier is nobody's error, so no check names it: the distribution of its column shows it apart. */
static bool lies_apart(struct exhibit_case *c, const cJSON *trouble) {
    struct renderings r;
    struct asked asked = {"variable", string_at(trouble, "column")};
    bool found = false;
    render(c, "distribution", &asked, 1, &r, NULL);
    const cJSON *point;
    cJSON_ArrayForEach(point, field(r.parsed, "beyond")) {
        found = found || strcmp(string_at(point, "participant"), string_at(trouble, "participant")) == 0;
    }
    renderings_release(&r);
    return found;
}

static void test_every_trouble_is_noticed(void **state) {
    (void)state;
    struct exhibit_case c;
    struct renderings r;
    cJSON *key = key_of_demo();
    case_quayside(&c, "unblinded", false);
    render(&c, "discrepancies", NULL, 0, &r, NULL);
    size_t troubles = 0;
    const cJSON *trouble, *discrepancy;
    cJSON_ArrayForEach(trouble, field(key, "troubles")) {
        bool found = false;
        cJSON_ArrayForEach(discrepancy, field(r.parsed, "discrepancies")) {
            found = found || speaks_of(discrepancy, trouble);
        }
        if (strcmp(string_at(trouble, "check"), "beyond-fences") == 0) {
            found = lies_apart(&c, trouble);
        }
        if (!found) {
            fail_msg("%s of %s is not noticed", string_at(trouble, "check"), string_at(trouble, "participant"));
        }
        troubles++;
    }
    assert_true(troubles > 30);
    cJSON_ArrayForEach(discrepancy, field(r.parsed, "discrepancies")) { /* and nothing is noticed that is not there */
        bool planted = false;
        cJSON_ArrayForEach(trouble, field(key, "troubles")) {
            planted = planted || speaks_of(discrepancy, trouble);
        }
        if (!planted) {
            fail_msg("noticed but not planted: %s", string_at(discrepancy, "message"));
        }
    }
    renderings_release(&r);
    case_close(&c);
    cJSON_Delete(key);
}

static void test_decisions_settle_them(void **state) {
    (void)state;
    struct exhibit_case c;
    struct renderings r;
    case_quayside(&c, "unblinded", true);
    render(&c, "discrepancies", NULL, 0, &r, NULL);
    const cJSON *discrepancy;
    cJSON_ArrayForEach(discrepancy, field(r.parsed, "discrepancies")) {
        bool left = strcmp(string_at(discrepancy, "check"), "below-limit") == 0; /* true as they stand */
        assert_string_equal(string_at(discrepancy, "state"), left ? "open" : "settled");
    }
    renderings_release(&r);
    case_close(&c);
}

static const struct {
    const char *exhibit;
    struct asked asked;
} compared[] = {
    {"effect", {"outcome", "sbp"}},         {"effect", {"outcome", "uacr"}},
    {"change-by-arm", {"outcome", "sbp"}},  {"change-by-arm", {"outcome", "uacr"}},
    {"baseline", {NULL, NULL}},             {"distribution", {"variable", "age"}},
    {"distribution", {"variable", "bmi"}},  {"distribution", {"variable", "sbp_0"}},
    {"distribution", {"variable", "sbp_8"}}, {"distribution", {"variable", "sbp_26"}},
    {"distribution", {"variable", "sex"}},
};

/* The JSON carries 17 digits, so equal texts are equal numbers. Left out are the head, naming file and version, and why
 * cells are missing: 999 in one file is blank in the other. The caller frees it. */
static char *body_of(const struct renderings *r) {
    char *body = strstr(r->json.data, "\"arguments\"");
    assert_non_null(body);
    body = memory_text(body);
    for (char *at = body; (at = strstr(at, "\"reasons\":{"));) {
        char *end = strchr(at, '}') + 1;
        memmove(at, end, strlen(end) + 1);
    }
    return body;
}

static char *body_made(struct exhibit_case *c, const char *exhibit, const struct asked *asked) {
    struct renderings r;
    render(c, exhibit, asked, asked->name != NULL, &r, NULL);
    char *body = body_of(&r);
    renderings_release(&r);
    return body;
}

static void test_estimates_are_those_of_the_truth(void **state) {
    (void)state;
    struct exhibit_case received, decided, clean;
    case_quayside(&received, "unblinded", false);
    case_quayside(&decided, "unblinded", true);
    open_clean(&clean);
    for (size_t i = 0; i < sizeof compared / sizeof *compared; i++) {
        char *before = body_made(&received, compared[i].exhibit, &compared[i].asked);
        char *after = body_made(&decided, compared[i].exhibit, &compared[i].asked);
        char *truth = body_made(&clean, compared[i].exhibit, &compared[i].asked);
        assert_string_equal(after, truth);
        assert_string_not_equal(before, truth); /* the troubles had moved it */
        memory_free(before);
        memory_free(after);
        memory_free(truth);
    }
    case_close(&received);
    case_close(&decided);
    case_close(&clean);
}

/* R 4.2.2 on the clean CSV: lm(sbp_26 ~ grp + sbp_0 + sex), coefficient grpW and its standard error. */
static void test_primary_estimate_is_r_s(void **state) {
    (void)state;
    struct exhibit_case c;
    struct renderings r;
    open_clean(&c);
    render(&c, "effect", NULL, 0, &r, NULL);
    const cJSON *contrast = cJSON_GetArrayItem(field(r.parsed, "contrasts"), 0);
    const cJSON *primary = member_with(field(contrast, "estimates"), "method", "ancova");
    assert_string_equal(string_at(contrast, "arm"), "W");
    near(number_at(primary, "estimate"), -5.6002614056143836, 1e-12, 0, "difference");
    near(number_at(primary, "standard_error"),  1.5227074726113345, 1e-12, 0, "standard error");
    renderings_release(&r);
    case_close(&c);
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_every_trouble_is_noticed),
        cmocka_unit_test(test_decisions_settle_them),
        cmocka_unit_test(test_estimates_are_those_of_the_truth),
        cmocka_unit_test(test_primary_estimate_is_r_s),
    };
    return cmocka_run_group_tests_name("demo/key", tests, NULL, NULL);
}
