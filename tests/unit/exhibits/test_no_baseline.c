/* SPDX-License-Identifier: GPL-3.0-or-later */
/* An outcome measured once has no baseline: no word of the exhibits may say that one was adjusted for. Numbers by hand. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "exhibit_case.h"

static const char csv[] = "id,grp,y0,y8,z,sex\n"
                          "p1,L,140,130,7,F\n"
                          "p2,L,150,145,9,M\n"
                          "p3,L,160,150,8,F\n"
                          "p4,L,155,120,6,M\n"
                          "p5,W,150,141,12,F\n"
                          "p6,W,152,150,10,M\n"
                          "p7,W,154,133,11,F\n"
                          "p8,W,149,144,15,M\n";

static const char plan[] =
    "{\"title\": \"Small trial\", \"participant\": \"id\", \"arm\": {\"column\": \"grp\", \"levels\": ["
    "{\"code\": \"L\", \"label\": \"Advice\", \"reference\": true}, {\"code\": \"W\", \"label\": \"Walking\"}]},"
    "\"outcomes\": [{\"id\": \"y\", \"label\": \"Pressure\", \"unit\": \"mmHg\", \"role\": \"primary\", \"better\": \"lower\","
    "\"scale\": \"linear\", \"visits\": [{\"label\": \"Baseline\", \"column\": \"y0\"}, {\"label\": \"8 weeks\", \"column\": \"y8\"}]},"
    "{\"id\": \"z\", \"label\": \"Score\", \"unit\": \"\", \"role\": \"secondary\", \"better\": \"lower\", \"scale\": \"linear\","
    "\"visits\": [{\"label\": \"Discharge\", \"column\": \"z\"}]}],"
    "\"covariates\": [{\"id\": \"sex\", \"label\": \"Sex\", \"column\": \"sex\", \"kind\": \"category\","
    "\"levels\": [{\"code\": \"F\", \"label\": \"Female\"}, {\"code\": \"M\", \"label\": \"Male\"}]}],"
    "\"adjust_for\": [ADJUST], \"blinding\": \"BLINDING\"}";

static void open_small(struct exhibit_case *c, const char *blinding, const char *adjust) {
    char *chosen = replaced(plan, "BLINDING", blinding), *text = replaced(chosen, "ADJUST", adjust);
    case_open(c, csv, text);
    memory_free(chosen);
    memory_free(text);
}

static void assert_silent(const struct renderings *r, const char *words) {
    const struct text *const all[] = {&r->text, &r->csv, &r->html, &r->meeting, &r->svg, &r->meeting_svg};
    for (size_t i = 0; i < sizeof all / sizeof *all; i++) {
        const char *fold = strstr(all[i]->data, "<details"); /* how it was computed tells the method in general */
        const char *found = strstr(all[i]->data, words);
        assert_true(!found || (fold && found > fold));
    }
}

static void test_effect(void **state) {
    (void)state;
    static const struct {
        const char *outcome, *scale, *adjust, *label, *lead;
    } cases[] = {
        {"y", "linear", "", "Baseline-adjusted difference", ">Adjusted mean difference <"},
        {"y", "log10", "", "Baseline-adjusted ratio", ">Adjusted ratio of geometric means <"},
        {"z", "linear", "", "Difference in means", ">Mean difference <"},
        {"z", "log10", "", "Ratio of geometric means", ">Ratio of geometric means <"},
        {"z", "linear", "\"sex\"", "Adjusted difference", ">Adjusted mean difference <"},
        {"z", "log10", "\"sex\"", "Adjusted ratio", ">Adjusted ratio of geometric means <"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        struct exhibit_case c;
        struct renderings r;
        open_small(&c, "unblinded", cases[i].adjust);
        const struct asked asked[] = {{"outcome", cases[i].outcome}, {"scale", cases[i].scale}};
        render(&c, "effect", asked, 2, &r, NULL);
        const cJSON *estimates = field(cJSON_GetArrayItem(field(r.parsed, "contrasts"), 0), "estimates");
        assert_string_equal(string_at(member_with(estimates, "method", "ancova"), "label"), cases[i].label);
        assert_string_equal(string_at(member_with(estimates, "method", "ancova-hc3"), "label"), "The same, robust standard error");
        assert_non_null(strstr(r.svg.data, cases[i].label));
        assert_non_null(strstr(r.html.data, cases[i].lead));
        bool has_baseline = *cases[i].outcome == 'y';
        assert_int_equal(strstr(r.text.data, "interval of the Hodges-Lehmann shift") != NULL, has_baseline);
        if (!has_baseline) {
            assert_silent(&r, "aseline-adjusted");
            assert_silent(&r, "for baseline");
        }
        if (!has_baseline && *cases[i].scale == 'l' && cases[i].scale[1] == 'i' && !*cases[i].adjust) {
            near(number_at(member_with(estimates, "method", "ancova"), "estimate"), 4.5, 0, 1e-12, "12 less 7.5");
        }
        renderings_release(&r);
        case_close(&c);
    }
}

static void test_change_by_arm(void **state) {
    (void)state;
    static const struct {
        const char *blinding, *outcome, *title;
    } cases[] = {
        {"unblinded", "y", "Does the change in pressure to 8 weeks differ between the arms?"},
        {"unblinded", "z", "Does score at discharge differ between the arms?"},
        {"coded", "z", "Does score at discharge differ between the arms?"},
        {"pooled", "y", "How did pressure change from baseline to 8 weeks?"},
        {"pooled", "z", "How is score at discharge spread?"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        struct exhibit_case c;
        struct renderings r;
        open_small(&c, cases[i].blinding, "");
        const struct asked asked[] = {{"outcome", cases[i].outcome}};
        render(&c, "change-by-arm", asked, 1, &r, NULL);
        assert_string_equal(string_at(r.parsed, "title"), cases[i].title);
        if (*cases[i].outcome == 'z') {
            assert_silent(&r, "aseline-adjusted");
        }
        renderings_release(&r);
        case_close(&c);
    }
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_effect),
        cmocka_unit_test(test_change_by_arm),
    };
    return cmocka_run_group_tests_name("exhibits/no-baseline", tests, NULL, NULL);
}
