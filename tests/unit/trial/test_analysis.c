/* SPDX-License-Identifier: GPL-3.0-or-later */
/* From a frame to plain arrays: members and why others are not, scales, baselines that stand in or drop, designs column by
 * column. Small data whose answers are worked by hand. Mean in place of a missing baseline: White & Thompson 2005,
 * Statistics in Medicine 24:993. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "near.h"
#include "trial/analysis.h"
#include "trial_case.h"

static const char plan[] =
    "{'title': 'T', 'participant': 'pid', 'arm': {'column': 'grp', 'levels': [{'code': 'L', 'label': 'Leaflet', 'reference': true},"
    "  {'code': 'W', 'label': 'Walk'}]},"
    " 'outcomes': [{'id': 'y', 'role': 'primary', 'better': 'lower',"
    "   'visits': [{'label': 'Baseline', 'column': 'y0'}, {'label': 'Mid', 'column': 'y1'}, {'label': 'End', 'column': 'y2'}]},"
    "  {'id': 'z', 'role': 'secondary', 'better': 'lower', 'visits': [{'label': 'End', 'column': 'z'}]}],"
    " 'covariates': [{'id': 'sex', 'label': 'Sex', 'column': 'sex', 'kind': 'category',"
    "   'levels': [{'code': 'F', 'label': 'Female'}, {'code': 'M', 'label': 'Male'}, {'code': 'X', 'label': 'Other'}]},"
    "  {'id': 'age', 'label': 'Age', 'column': 'age', 'kind': 'number', 'bands': [50, 60]}],"
    " 'missing_baseline': '%s', 'blinding': '%s'}";

static const char csv[] = "pid,grp,sex,age,y0,y1,y2,z\n"
                          "P1,L,F,40,10,11,12,1\n"
                          "P2,W,M,50,20,21,100,2\n"
                          "P3,L,,60,,31,30,3\n"      /* no baseline, sex blank */
                          "P4,W,q,,40,41,1000,-1\n"  /* unlisted code, no age */
                          "P5,W,F,59.9,0,51,10,5\n"  /* 0 has no logarithm */
                          "P6,L,M,70,30,61,,6\n"     /* no end */
                          "P7,,F,45,10,10,10,7\n"    /* no arm */
                          "P8,L,F,45,10,10,10,8\n"   /* twice */
                          "P8,L,F,45,10,10,10,8\n";

struct analysed {
    struct trial_case c;
    struct arms arms;
    struct analysis analysis;
};

static void analyse(struct analysed *a, size_t outcome, size_t visit, enum scale scale, enum set set) {
    arms_shown(a->c.frame, &a->c.arena, &a->arms);
    analysis_take(&a->analysis, a->c.frame, &a->arms, outcome, visit, scale, set, &a->c.arena);
}

static void open_as(struct analysed *a, const char *missing_baseline, const char *blinding) {
    char filled[1536];
    snprintf(filled, sizeof filled, plan, missing_baseline, blinding);
    case_open(&a->c, csv, filled);
}

static void assert_adds_up(const struct analysed *a) {
    assert_int_equal(a->analysis.count + a->analysis.held_aside + a->analysis.no_arm + a->analysis.excluded, a->c.frame->participant_count);
}

/* Values of an array against a list, NaN where missing. */
static void expect_values(const double *got, size_t count, const double *want, size_t wanted, const char *label) {
    assert_int_equal(count, wanted);
    for (size_t i = 0; i < count; i++) {
        near(got[i], want[i], 1e-15, 0, label);
    }
}

#define EXPECT(got, count, ...) \
    expect_values(got, count, (const double[]){__VA_ARGS__}, sizeof((const double[]){__VA_ARGS__}) / sizeof(double), #got)

static void test_members(void **state) {
    (void)state;
    struct analysed a;
    open_as(&a, "mean", "unblinded");
    analyse(&a, 0, 2, SCALE_LINEAR, SET_FULL);
    assert_true(a.analysis.has_baseline);
    assert_int_equal(a.analysis.count, 6); /* P1 .. P6, in identifier order */
    assert_int_equal(a.analysis.held_aside, 1);
    assert_int_equal(a.analysis.no_arm, 1);
    assert_int_equal(a.analysis.excluded, 0);
    assert_int_equal(a.analysis.not_on_scale, 0);
    EXPECT(a.analysis.baseline, 6, 10, 20, NAN, 40, 0, 30);
    EXPECT(a.analysis.follow_up, 6, 12, 100, 30, 1000, 10, NAN);
    EXPECT(a.analysis.change, 6, 2, 80, NAN, 960, 10, NAN);
    static const int arms[] = {0, 1, 0, 1, 1, 0};
    for (size_t i = 0; i < 6; i++) {
        assert_int_equal(a.analysis.participant[i], i);
        assert_int_equal(a.analysis.arm[i], arms[i]);
    }
    assert_adds_up(&a);
    case_must(&a.c, "[{'kind': 'exclude', 'participant': 'P1', 'set': 'per-protocol', 'reason': 'r'},"
                    " {'kind': 'exclude', 'participant': 'P2', 'set': 'full', 'reason': 'r'},"
                    " {'kind': 'exclude', 'participant': 'P7', 'set': 'full', 'reason': 'r'}]");
    analyse(&a, 0, 2, SCALE_LINEAR, SET_FULL);
    assert_int_equal(a.analysis.count, 5);
    assert_int_equal(a.analysis.excluded + a.analysis.no_arm, 2); /* P7 is counted once */
    assert_adds_up(&a);
    analyse(&a, 0, 2, SCALE_LINEAR, SET_PER_PROTOCOL);
    assert_int_equal(a.analysis.count, 4);
    assert_adds_up(&a);
    case_must(&a.c, "[{'kind': 'keep-record', 'participant': 'P8', 'row': 8, 'reason': 'r'}]");
    analyse(&a, 0, 2, SCALE_LINEAR, SET_FULL);
    assert_int_equal(a.analysis.held_aside, 0);
    assert_int_equal(a.analysis.count, 6);
    assert_adds_up(&a);
    case_close(&a.c);
}

static void test_scales(void **state) {
    (void)state;
    struct analysed a;
    open_as(&a, "mean", "unblinded");
    analyse(&a, 0, 2, SCALE_LOG10, SET_FULL);
    EXPECT(a.analysis.baseline, 6, 1, log10(20), NAN, log10(40), NAN, log10(30));
    EXPECT(a.analysis.follow_up, 6, log10(12), 2, log10(30), 3, 1, NAN);
    assert_true(isnan(a.analysis.change[4])); /* P5 began at 0 */
    assert_int_equal(a.analysis.not_on_scale, 1);
    analyse(&a, 1, 0, SCALE_LOG10, SET_FULL);
    assert_int_equal(a.analysis.not_on_scale, 1); /* P4's -1 */
    assert_false(a.analysis.has_baseline);
    assert_true(isnan(a.analysis.baseline[0]) && isnan(a.analysis.change[0]));
    near(on_scale(SCALE_LOG10, 1000), 3, 1e-15, 0, "log10");
    assert_true(isnan(on_scale(SCALE_LOG10, 0)) && isnan(on_scale(SCALE_LOG10, -1)) && isnan(on_scale(SCALE_LINEAR, NAN)));
    case_close(&a.c);
}

static void test_baseline_visit(void **state) {
    (void)state;
    struct analysed a;
    open_as(&a, "mean", "unblinded");
    analyse(&a, 0, 0, SCALE_LINEAR, SET_FULL);
    assert_false(a.analysis.has_baseline);
    EXPECT(a.analysis.follow_up, 6, 10, 20, NAN, 40, 0, 30);
    case_close(&a.c);
}

/* Pooled, nobody's arm shows; coded, the letters stand in the arms' place. */
static void test_blinded_members(void **state) {
    (void)state;
    struct analysed a;
    open_as(&a, "mean", "pooled");
    analyse(&a, 0, 2, SCALE_LINEAR, SET_FULL);
    assert_int_equal(a.analysis.count, 6);
    for (size_t i = 0; i < a.analysis.count; i++) {
        assert_int_equal(a.analysis.arm[i], 0);
    }
    assert_adds_up(&a);
    case_close(&a.c);
    open_as(&a, "mean", "coded"); /* the last arm, W, is A */
    analyse(&a, 0, 2, SCALE_LINEAR, SET_FULL);
    static const int arms[] = {1, 0, 1, 0, 0, 1};
    for (size_t i = 0; i < a.analysis.count; i++) {
        assert_int_equal(a.analysis.arm[i], arms[i]);
    }
    struct design design;
    design_take(&design, &a.analysis, &(struct design_request){0}, &a.c.arena);
    assert_int_equal(design.arm_column[0], NOWHERE); /* A is the reference */
    assert_int_equal(design.arm_column[1], 1);
    expect_text(design.name[1], "B minus A", "coded");
    EXPECT(design.column[1], design.rows, 1, 0, 1, 0, 0);
    case_close(&a.c);
}

/* ---- designs ---- */

static void test_design(void **state) {
    (void)state;
    struct analysed a;
    open_as(&a, "mean", "unblinded");
    analyse(&a, 0, 2, SCALE_LINEAR, SET_FULL);
    struct design design;
    int adjust[] = {0, 1};
    design_take(&design, &a.analysis, &(struct design_request){.adjust = adjust, .adjust_count = 2}, &a.c.arena);
    assert_int_equal(design.rows, 5); /* P6 has no end */
    EXPECT(design.y, design.rows, 12, 100, 30, 1000, 10);
    static const char *const names[] = {"intercept", "Walk minus Leaflet", "baseline", "Sex: Male", "Sex: \"q\", not listed", "Sex: blank", "Age"};
    assert_int_equal(design.columns, 7);
    for (size_t i = 0; i < 7; i++) {
        expect_text(design.name[i], names[i], "column");
    }
    EXPECT(design.column[0], design.rows, 1, 1, 1, 1, 1);
    EXPECT(design.column[1], design.rows, 0, 1, 0, 1, 1);
    EXPECT(design.column[2], design.rows, 10, 20, 20, 40, 0); /* the mean of all members' baselines, (10+20+40+0+30)/5 */
    EXPECT(design.column[3], design.rows, 0, 1, 0, 0, 0);
    EXPECT(design.column[4], design.rows, 0, 0, 0, 1, 0);
    EXPECT(design.column[5], design.rows, 0, 0, 1, 0, 0);
    EXPECT(design.column[6], design.rows, 40, 50, 60, 55.98, 59.9); /* the mean of all members' ages, (40+50+60+59.9+70)/5 */
    assert_int_equal(design.arm_column[0], NOWHERE);
    assert_int_equal(design.arm_column[1], 1);
    assert_int_equal(design.baseline_column, 2);
    assert_int_equal(design.baseline_filled, 1);
    assert_int_equal(design.baseline_dropped, 0);
    assert_int_equal(design.covariate_filled, 1);
    assert_int_equal(design.blank_category, 1);
    assert_int_equal(design.n_of_arm[0], 2);
    assert_int_equal(design.n_of_arm[1], 3);
    static const size_t member[] = {0, 1, 2, 3, 4};
    assert_memory_equal(design.member, member, sizeof member);
    case_close(&a.c);
}

static void test_dropped_baseline(void **state) {
    (void)state;
    struct analysed a;
    open_as(&a, "drop", "unblinded");
    analyse(&a, 0, 2, SCALE_LINEAR, SET_FULL);
    struct design design;
    design_take(&design, &a.analysis, &(struct design_request){0}, &a.c.arena);
    EXPECT(design.y, design.rows, 12, 100, 1000, 10);
    EXPECT(design.column[2], design.rows, 10, 20, 40, 0);
    assert_int_equal(design.columns, 3);
    assert_int_equal(design.baseline_dropped, 1);
    assert_int_equal(design.baseline_filled, 0);
    analyse(&a, 0, 2, SCALE_LOG10, SET_FULL); /* off the scale is missing too */
    design_take(&design, &a.analysis, &(struct design_request){0}, &a.c.arena);
    EXPECT(design.y, design.rows, log10(12), 2, 3);
    assert_int_equal(design.baseline_dropped, 2);
    analyse(&a, 1, 0, SCALE_LINEAR, SET_FULL); /* nothing to drop where there is no baseline */
    design_take(&design, &a.analysis, &(struct design_request){0}, &a.c.arena);
    assert_int_equal(design.rows, 6);
    assert_int_equal(design.columns, 2);
    assert_int_equal(design.baseline_column, NOWHERE);
    case_close(&a.c);
}

static void test_without(void **state) {
    (void)state;
    struct analysed a;
    open_as(&a, "mean", "unblinded");
    analyse(&a, 0, 2, SCALE_LINEAR, SET_FULL);
    bool without[8] = {true, false, true};
    struct design design;
    design_take(&design, &a.analysis, &(struct design_request){.without = without}, &a.c.arena);
    EXPECT(design.y, design.rows, 100, 1000, 10);
    assert_int_equal(design.n_of_arm[0], 0); /* an arm without rows: the reference here */
    assert_int_equal(design.n_of_arm[1], 3);
    bool no_walk[8] = {false, true, false, true, true};
    design_take(&design, &a.analysis, &(struct design_request){.without = no_walk}, &a.c.arena);
    assert_int_equal(design.arm_column[1], NOWHERE);
    assert_int_equal(design.columns, 2);
    bool nobody[8] = {true, true, true, true, true, true, true, true};
    design_take(&design, &a.analysis, &(struct design_request){.without = nobody}, &a.c.arena);
    assert_int_equal(design.rows, 0);
    case_close(&a.c);
}

static void test_groupings(void **state) {
    (void)state;
    struct analysed a;
    open_as(&a, "mean", "unblinded");
    struct grouping grouping;
    grouping_take(&grouping, a.c.frame, NOWHERE, &a.c.arena);
    assert_int_equal(grouping.count, 1);
    assert_null(grouping.covariate);
    assert_int_equal(grouping.of[3], 0);
    static const char *const sexes[] = {"F", "M", "X", "q"};
    static const int sex_of[] = {0, 1, NOWHERE, 3, 0, 1, 0, NOWHERE};
    grouping_take(&grouping, a.c.frame, 0, &a.c.arena);
    assert_int_equal(grouping.count, 4);
    for (size_t g = 0; g < 4; g++) {
        assert_string_equal(grouping.level[g].code, sexes[g]);
    }
    assert_string_equal(grouping.level[0].label, "Female");
    assert_memory_equal(grouping.of, sex_of, sizeof sex_of);
    static const int band_of_age[] = {0, 1, 2, NOWHERE, 1, 2, 0, NOWHERE};
    grouping_take(&grouping, a.c.frame, 1, &a.c.arena);
    assert_int_equal(grouping.count, 3);
    assert_string_equal(grouping.level[1].label, "50 to below 60");
    assert_memory_equal(grouping.of, band_of_age, sizeof band_of_age);
    case_close(&a.c);
}

static void test_design_by(void **state) {
    (void)state;
    struct analysed a;
    open_as(&a, "mean", "unblinded");
    analyse(&a, 0, 1, SCALE_LINEAR, SET_FULL);
    struct grouping sex;
    grouping_take(&sex, a.c.frame, 0, &a.c.arena);
    struct design design;
    int adjust[] = {0};
    struct design_request request = {.adjust = adjust, .adjust_count = 1, .by = &sex, .interaction = true};
    design_take(&design, &a.analysis, &request, &a.c.arena);
    assert_int_equal(design.rows, 5); /* P3's sex is blank */
    assert_int_equal(design.no_level, 1);
    static const size_t cells[] = {1, 1, 1, 1, 0, 0, 0, 1}; /* F: P1 L, P5 W; M: P6 L, P2 W; X none; q: P4 W */
    assert_memory_equal(design.n_of_cell, cells, sizeof cells);
    assert_int_equal(design.arm_column[1], NOWHERE);
    static const bool estimable[] = {false, true, false, true, false, false, false, false};
    for (size_t i = 0; i < 8; i++) {
        assert_int_equal(design.cell_column[i] != NOWHERE, estimable[i]);
    }
    EXPECT(design.column[design.cell_column[1]], design.rows, 0, 0, 0, 1, 0); /* P1 P2 P4 P5 P6 */
    EXPECT(design.column[design.cell_column[3]], design.rows, 0, 1, 0, 0, 0);
    request.interaction = false;
    design_take(&design, &a.analysis, &request, &a.c.arena);
    EXPECT(design.column[design.arm_column[1]], design.rows, 0, 1, 1, 1, 0);
    size_t male = 0;
    for (size_t i = 0; i < design.columns; i++) { /* the grouping stands in the model once */
        male += strstr(design.name[i], "Male") != NULL;
    }
    assert_int_equal(male, 1);
    case_close(&a.c);
}

static void test_words_of_sets(void **state) {
    (void)state;
    assert_string_equal(set_name(SET_FULL), "full");
    assert_string_equal(set_name(SET_PER_PROTOCOL), "per-protocol");
    assert_string_equal(set_words(SET_FULL), "full analysis set");
    assert_string_equal(set_words(SET_PER_PROTOCOL), "per-protocol set");
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_members), cmocka_unit_test(test_scales), cmocka_unit_test(test_baseline_visit),
        cmocka_unit_test(test_blinded_members), cmocka_unit_test(test_design), cmocka_unit_test(test_dropped_baseline),
        cmocka_unit_test(test_without), cmocka_unit_test(test_groupings), cmocka_unit_test(test_design_by),
        cmocka_unit_test(test_words_of_sets),
    };
    return cmocka_run_group_tests_name("trial/analysis", tests, NULL, NULL);
}
