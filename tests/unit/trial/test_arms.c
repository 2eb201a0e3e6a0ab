/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Blinding: the arms as each state shows them, and which columns are hidden with them. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "base/text.h"
#include "trial/arms.h"
#include "trial_case.h"

static const char plan[] =
    "{'title': 'T', 'participant': 'pid', 'arm': {'column': 'grp', 'levels': [{'code': 'S', 'label': 'Swim'},"
    "  {'code': 'L', 'label': 'Leaflet', 'reference': true}, {'code': 'W', 'label': 'Walk'}]},"
    " 'outcomes': [{'id': 'y', 'role': 'primary', 'better': 'lower', 'visits': [{'label': 'End', 'column': 'y'}]}],"
    " 'covariates': [{'id': 'c', 'column': 'c', 'kind': 'category'}], 'events': [{'id': 'e', 'column': 'e', 'yes': ['1'], 'no': ['0']}],"
    " 'blinding': '%s'}";
static const char csv[] = "pid,grp,c,e,y\nP1,L,a,1,1\nP2,W,a,0,2\nP3,S,b,1,3\nP4,?,b,1,4\nP5,,a,0,5\nP6,L,a,0,6\nP6,L,a,0,7\n";

static void open_as(struct trial_case *c, const char *data, const char *blinding) {
    char filled[1024];
    snprintf(filled, sizeof filled, plan, blinding);
    case_open(c, data, filled);
}

static void test_shown(void **state) {
    (void)state;
    static const struct {
        const char *blinding;
        unsigned char letters[3]; /* of S, L, W */
        size_t count, reference;
        const char *codes[3], *labels[3];
        size_t palette[3];
        int of[6]; /* P1 .. P6 */
    } cases[] = {
        {"pooled", {0, 1, 2}, 1, 0, {"all"}, {"All participants"}, {0}, {0, 0, 0, NOWHERE, NOWHERE, NOWHERE}},
        {"unblinded", {2, 1, 0}, 3, 1, {"S", "L", "W"}, {"Swim", "Leaflet", "Walk"}, {1, 0, 2}, {1, 2, 0, NOWHERE, NOWHERE, NOWHERE}},
        {"coded", {2, 1, 0}, 3, 0, {"A", "B", "C"}, {"A", "B", "C"}, {0, 1, 2}, {1, 0, 2, NOWHERE, NOWHERE, NOWHERE}},
        {"coded", {1, 0, 2}, 3, 0, {"A", "B", "C"}, {"A", "B", "C"}, {0, 1, 2}, {0, 2, 1, NOWHERE, NOWHERE, NOWHERE}},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        struct trial_case c;
        open_as(&c, csv, cases[i].blinding);
        memcpy(c.letters, cases[i].letters, 3);
        struct arms arms;
        arms_shown(c.frame, &c.arena, &arms);
        assert_int_equal(arms.count, cases[i].count);
        assert_int_equal(arms.reference, cases[i].reference);
        assert_int_equal(arms.pooled, strcmp(cases[i].blinding, "pooled") == 0);
        assert_int_equal(arms.coded, strcmp(cases[i].blinding, "coded") == 0);
        for (size_t a = 0; a < arms.count; a++) {
            assert_string_equal(arms.arm[a].code, cases[i].codes[a]);
            assert_string_equal(arms.arm[a].label, cases[i].labels[a]);
            assert_int_equal(arms.arm[a].palette, cases[i].palette[a]);
        }
        for (size_t p = 0; p < 6; p++) {
            if (arms.of[p] != cases[i].of[p]) {
                fail_msg("%s: P%zu is in %d, wanted %d", cases[i].blinding, p + 1, arms.of[p], cases[i].of[p]);
            }
        }
        case_close(&c);
    }
}

/* Without arms in the plan everything is pooled. */
static void test_no_arms(void **state) {
    (void)state;
    struct trial_case c;
    case_open(&c, "p,y\nA,1\nB,2\n", "{'title': 'T', 'participant': 'p', 'outcomes': [{'id': 'y', 'role': 'primary', 'better': 'lower',"
                                      " 'visits': [{'label': 'E', 'column': 'y'}]}]}");
    struct arms arms;
    arms_shown(c.frame, &c.arena, &arms);
    assert_true(arms.pooled && arms.count == 1 && arms.of[0] == 0 && arms.of[1] == 0);
    assert_false(arms_given_away(c.frame, c.frame->columns[0]));
    case_refused(&c, "[{'kind': 'unblind', 'to': 'coded', 'reason': 'r'}]",
        "decision 1 of the batch (unblind) cannot be: the plan has no arm; nothing was recorded");
    case_close(&c);
}

/* Whatever letters are drawn, coded contrasts are each other letter minus A, and nobody changes company. */
static void test_letters_permute(void **state) {
    (void)state;
    static const unsigned char orders[][3] = {{0, 1, 2}, {0, 2, 1}, {1, 0, 2}, {1, 2, 0}, {2, 0, 1}, {2, 1, 0}};
    struct trial_case c;
    open_as(&c, csv, "coded");
    for (size_t i = 0; i < 6; i++) {
        memcpy(c.letters, orders[i], 3);
        struct arms arms;
        arms_shown(c.frame, &c.arena, &arms);
        assert_int_equal(arms.reference, 0);
        assert_int_equal(arms.of[2], orders[i][0]); /* P3 is in S */
        assert_int_equal(arms.of[0], orders[i][1]); /* P1 is in L */
        assert_int_equal(arms.of[1], orders[i][2]); /* P2 is in W */
    }
    case_close(&c);
}

/* ---- a category that gives the arm away: n records each of (arm, category) ---- */

struct part {
    const char *arm, *category;
    int count;
};

static void test_given_away(void **state) {
    (void)state;
    static const struct {
        struct part parts[6];
        bool given_away;
    } cases[] = {
        {{{"L", "x", 10}, {"W", "y", 10}}, true},
        {{{"L", "x", 10}, {"W", "x", 10}}, false},
        {{{"L", "x", 10}, {"W", "y", 9}, {"W", "x", 1}}, false},            /* x is in two arms: 9 of 20 are told */
        {{{"L", "x", 10}, {"W", "y", 9}, {"W", "z", 1}}, true},             /* z is too small, 19 of 20 are told */
        {{{"L", "x", 9}, {"W", "y", 9}, {"L", "z", 1}, {"W", "z", 1}}, true},    /* 18 of 20: 90% exactly */
        {{{"L", "x", 9}, {"W", "y", 8}, {"L", "z", 1}, {"W", "z", 2}}, false},   /* 17 of 20 */
        {{{"L", "x", 4}, {"W", "y", 4}}, false},                            /* levels below 5 records */
        {{{"L", "x", 5}, {"W", "y", 5}}, true},
        {{{"L", "", 30}, {"L", "x", 5}, {"W", "y", 5}}, true},              /* blanks are no level */
        {{{"L", "x", 6}, {"S", "y", 6}, {"W", "z", 6}}, true},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        struct text data;
        text_init(&data);
        text_literal(&data, "pid,grp,c,e,y\n");
        int id = 0;
        for (const struct part *part = cases[i].parts; part->arm; part++) {
            for (int k = 0; k < part->count; k++) {
                text_format(&data, "P%03d,%s,%s,%d,1\n", id++, part->arm, part->category, part->arm[0] == 'L');
            }
        }
        struct trial_case c;
        open_as(&c, data.data, "coded");
        if (arms_given_away(c.frame, case_column(&c, "c")) != cases[i].given_away) {
            fail_msg("case %zu", i);
        }
        assert_int_equal(arms_hide_column(c.frame, "c"), cases[i].given_away);
        assert_true(arms_hide_column(c.frame, "grp"));
        assert_false(arms_hide_column(c.frame, "y") || arms_hide_column(c.frame, "pid") || arms_hide_column(c.frame, "nothing"));
        case_must(&c, "[{'kind': 'unblind', 'to': 'unblinded', 'reason': 'r'}]");
        assert_false(arms_hide_column(c.frame, "c") || arms_hide_column(c.frame, "grp") || arms_hide_column(c.frame, "e"));
        case_close(&c);
        text_release(&data);
    }
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_shown), cmocka_unit_test(test_no_arms), cmocka_unit_test(test_letters_permute),
        cmocka_unit_test(test_given_away),
    };
    return cmocka_run_group_tests_name("trial/arms", tests, NULL, NULL);
}
