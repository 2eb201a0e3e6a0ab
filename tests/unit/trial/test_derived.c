/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Derived values: each formula, what stands for missing items, how far a claim may differ, and that they follow their inputs through
 * corrections and reversals. Sources stand beside the cases; the rest are worked by hand. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "base/text.h"
#include "near.h"
#include "trial/derived.h"
#include "trial_case.h"

/* ---- formulas ---- */

static void test_formulas(void **state) {
    (void)state;
    static const struct {
        enum derived_formula formula;
        bool cm;
        size_t count, minimum;
        double input[4];
        enum derived_status status;
        size_t present;
        double value;
    } cases[] = {
        {DERIVED_MEAN, false, 2, 2, {121, 70}, DERIVED_COMPUTED, 2, 95.5},
        {DERIVED_MEAN, false, 2, 2, {121, NAN}, DERIVED_INPUT_MISSING, 1, NAN},
        {DERIVED_MEAN, false, 4, 2, {1, NAN, 2, NAN}, DERIVED_COMPUTED, 2, 1.5},
        {DERIVED_MEAN, false, 4, 2, {1, NAN, NAN, NAN}, DERIVED_INPUT_MISSING, 1, NAN},
        {DERIVED_MEAN, false, 2, 1, {NAN, NAN}, DERIVED_INPUT_MISSING, 0, NAN},
        {DERIVED_SUM, false, 3, 3, {0.1, 0.2, 0.3}, DERIVED_COMPUTED, 3, 0.6},
        {DERIVED_SUM, false, 3, 3, {1, 2, NAN}, DERIVED_INPUT_MISSING, 2, NAN},
        /* Prorated under the half rule: 4 items, 2 there with mean 2.5, so 10 (the rule of questionnaires' manuals, as in Fayers &
         * Machin, Quality of Life, chapter on missing data; from memory). */
        {DERIVED_SUM, false, 4, 2, {2, NAN, 3, NAN}, DERIVED_COMPUTED, 2, 10},
        {DERIVED_SUM, false, 4, 2, {NAN, NAN, 3, NAN}, DERIVED_INPUT_MISSING, 1, NAN},
        {DERIVED_DIFFERENCE, false, 2, 2, {5, 7}, DERIVED_COMPUTED, 2, -2},
        {DERIVED_DIFFERENCE, false, 2, 2, {NAN, 7}, DERIVED_INPUT_MISSING, 1, NAN},
        {DERIVED_RATIO, false, 2, 2, {3, 4}, DERIVED_COMPUTED, 2, 0.75},
        {DERIVED_RATIO, false, 2, 2, {3, 0}, DERIVED_UNDEFINED, 2, NAN},
        {DERIVED_RATIO, false, 2, 2, {0, 0}, DERIVED_UNDEFINED, 2, NAN},
        {DERIVED_RATIO, false, 2, 2, {1e300, 1e-300}, DERIVED_UNDEFINED, 2, NAN},
        /* 68 kg and 165 cm make 24.98: a public health agency's worked example (from memory); digits from R: 68 / 1.65^2 */
        {DERIVED_BODY_MASS_INDEX, true, 2, 2, {68, 165}, DERIVED_COMPUTED, 2, 24.977043158861342},
        {DERIVED_BODY_MASS_INDEX, false, 2, 2, {68, 1.65}, DERIVED_COMPUTED, 2, 24.977043158861342},
        {DERIVED_BODY_MASS_INDEX, true, 2, 2, {68, 0}, DERIVED_UNDEFINED, 2, NAN},
        {DERIVED_BODY_MASS_INDEX, true, 2, 2, {-68, 165}, DERIVED_UNDEFINED, 2, NAN},
        {DERIVED_BODY_MASS_INDEX, true, 2, 2, {68, NAN}, DERIVED_INPUT_MISSING, 1, NAN},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        struct derived derived = {.formula = cases[i].formula, .of_count = cases[i].count, .minimum_items = cases[i].minimum,
            .height_in_cm = cases[i].cm};
        enum derived_status status;
        size_t present;
        char label[64];
        snprintf(label, sizeof label, "case %zu, %s", i, derived_formula_name(cases[i].formula));
        near(derived_compute(&derived, cases[i].input, &status, &present), cases[i].value, 1e-15, 0, label);
        assert_int_equal(status, cases[i].status);
        assert_int_equal(present, cases[i].present);
    }
}

/* h_B + BMI (h_w / w + 2 h_h / h), computed in R for 68 kg and 165 cm, or 68.0 kg and 1.65 m, and a claim with one decimal:
 * b <- 68/1.65^2; 0.05 + b*(0.5/68 + 2*0.5/165); 0.05 + b*(0.05/68 + 2*0.005/1.65). The bound holds: no true weight and height
 * that round to the recorded ones give a body mass index farther off than it, to first order. */
static void test_rounding(void **state) {
    (void)state;
    struct derived bmi = {.formula = DERIVED_BODY_MASS_INDEX, .of_count = 2, .height_in_cm = true}, mean = {.formula = DERIVED_MEAN};
    double b = 68 / (1.65 * 1.65);
    near(derived_rounding(&bmi, b, (double[]){68, 165}, (int[]){0, 0}, 1), 0.38503074825388872, 1e-14, 0, "kg and cm");
    bmi.height_in_cm = false;
    near(derived_rounding(&bmi, b, (double[]){68, 1.65}, (int[]){1, 2}, 1), 0.21974149205554167, 1e-14, 0, "kg and m");
    near(derived_rounding(&mean, 95.5, (double[]){121, 70}, (int[]){0, 0}, 0), 0.5, 0, 0, "whole");
    near(derived_rounding(&mean, 95.5, (double[]){121, 70}, (int[]){0, 0}, 2), 0.005, 1e-15, 0, "two decimals");
    for (double w = 67.51; w < 68.5; w += 0.07) {
        for (double h = 164.51; h < 165.5; h += 0.07) {
            double claim = round(w / (h * h) * 1e5) / 10;
            assert_true(fabs(claim - b) <= 0.38503074825388872 * 1.02); /* terms of second order are below 2% */
        }
    }
}

/* ---- in a frame ---- */

#define HEAD "{'title': 'T', 'participant': 'pid', 'missing_codes': ['999'],"
#define TAIL " 'blinding': 'pooled'}"

static const char plan[] = HEAD
    " 'outcomes': [{'id': 'y', 'role': 'primary', 'better': 'lower',"
    "   'visits': [{'label': 'Baseline', 'column': 'derived.map_0'}, {'label': 'End', 'column': 'y1'}]}],"
    " 'covariates': [{'id': 'bmi', 'label': 'BMI', 'column': 'derived.bmi', 'kind': 'number', 'bands': [25]}],"
    " 'derived': [{'id': 'map_0', 'label': 'Mean pressure', 'unit': 'mmHg', 'formula': 'mean', 'of': ['s0', 'd0'], 'claims': 'm0'},"
    "   {'id': 'bmi', 'formula': 'body-mass-index', 'of': ['kg', 'cm'], 'height_unit': 'cm', 'claims': 'bmi', 'plausible': [12, 80]},"
    "   {'id': 'items', 'formula': 'sum', 'of': ['i1', 'i2', 'i3', 'i4'], 'minimum_items': 2, 'claims': 'tot', 'tolerance': 1},"
    "   {'id': 'twice', 'formula': 'difference', 'of': ['derived.items', 'i1']}],"
    " 'adjust_for': ['bmi'],"
    TAIL;

static const char csv[] =
    "pid,s0,d0,m0,kg,cm,bmi,i1,i2,i3,i4,tot,y1\n"
    "P1,121,70,95.5,68,165,25.3,1,2,3,4,10,90\n"   /* all agree */
    "P2,121,70,96,68,165,25.4,1,,3,,9,90\n"        /* 96 is 95.5 rounded; 25.4 is 0.423 off, beyond 0.385; prorated 8, 9 is within 1 */
    "P3,121,70,97,68,165,24.6,1,,,,1,90\n"         /* 97 is not; 24.6 is 0.377 off, within */
    "P4,999,70,95,0,165,,1,2,3,4,12,90\n"          /* a code; weight 0; 12 is 2 off */
    "P5,120.5,70.25,95.4,700,165,,1,2,3,4,11,90\n" /* 95.375; implausible weight; 11 is exactly 1 off */
    "P6,1,2,,1,1,,1,1,1,1,,90\n"
    "P6,1,2,,1,1,,1,1,1,1,,91\n";

static struct derived_value taken(const struct trial_case *c, const char *column, const char *who) {
    struct derived_value value;
    derived_take(&value, c->frame, &c->plan.derived[plan_derived(&c->plan, column)], case_who(c, who));
    return value;
}

static void test_values_in_frame(void **state) {
    (void)state;
    static const struct {
        const char *who, *column;
        enum cell_state state;
        double value;
        const char *text;
        bool prorated, differs;
    } cases[] = {
        {"P1", "derived.map_0", CELL_OBSERVED, 95.5, "95.500", false, false},
        {"P2", "derived.map_0", CELL_OBSERVED, 95.5, "95.500", false, false},
        {"P3", "derived.map_0", CELL_OBSERVED, 95.5, "95.500", false, true},
        {"P4", "derived.map_0", CELL_BLANK, NAN, NULL, false, false},
        {"P5", "derived.map_0", CELL_OBSERVED, 95.375, "95.375", false, false},
        {"P6", "derived.map_0", CELL_HELD_ASIDE, NAN, NULL, false, false},
        {"P1", "derived.bmi", CELL_OBSERVED, 24.977043158861342, "25.0", false, false},
        {"P2", "derived.bmi", CELL_OBSERVED, 24.977043158861342, "25.0", false, true},
        {"P3", "derived.bmi", CELL_OBSERVED, 24.977043158861342, "25.0", false, false},
        {"P4", "derived.bmi", CELL_BLANK, NAN, NULL, false, false},
        {"P1", "derived.items", CELL_OBSERVED, 10, "10.0", false, false},
        {"P2", "derived.items", CELL_OBSERVED, 8, "8.0", true, false},
        {"P3", "derived.items", CELL_BLANK, NAN, NULL, false, false},
        {"P4", "derived.items", CELL_OBSERVED, 10, "10.0", false, true},
        {"P5", "derived.items", CELL_OBSERVED, 10, "10.0", false, false},
        {"P2", "derived.twice", CELL_OBSERVED, 7, "7.00", false, false},
        {"P3", "derived.twice", CELL_BLANK, NAN, NULL, false, false},
    };
    struct trial_case c;
    case_open(&c, csv, plan);
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        char label[64];
        snprintf(label, sizeof label, "%s of %s", cases[i].column, cases[i].who);
        const char *text = frame_text(c.frame, case_column(&c, cases[i].column), case_who(&c, cases[i].who));
        struct derived_value value = taken(&c, cases[i].column, cases[i].who);
        near(case_number(&c, cases[i].who, cases[i].column), cases[i].value, 1e-15, 0, label);
        expect_text(cell_state_name(case_state(&c, cases[i].who, cases[i].column)), cell_state_name(cases[i].state), label);
        expect_text(text ? text : "none", cases[i].text ? cases[i].text : "none", label);
        assert_int_equal(value.prorated, cases[i].prorated);
        if (value.differs != cases[i].differs) {
            fail_msg("%s: claimed %g, derived %g, tolerance %g", label, value.claimed, value.value, value.tolerance);
        }
    }
    assert_int_equal(taken(&c, "derived.bmi", "P4").status, DERIVED_UNDEFINED);
    assert_int_equal(taken(&c, "derived.map_0", "P4").status, DERIVED_INPUT_MISSING);
    assert_int_equal(taken(&c, "derived.map_0", "P6").status, DERIVED_HELD_ASIDE);
    /* The variables: derived ones carry what the plan says of them, and codes only where the plan means a column of the file. */
    const struct variable *bmi = &c.plan.variables[plan_variable(&c.plan, "derived.bmi")];
    assert_int_equal(bmi->covariate, 0);
    near(bmi->plausible.high, 80, 0, 0, "its own range");
    expect_text(bmi->unit, "kg/m\xC2\xB2", "unit of a body mass index");
    assert_int_equal(bmi->missing_codes->count, 0);
    assert_int_equal(c.plan.variables[plan_variable(&c.plan, "s0")].missing_codes->count, 1);
    case_close(&c);
}

static void same_frame(const struct trial_case *c, const struct frame *a, const struct frame *b) {
    assert_string_equal(a->state_sha256, b->state_sha256);
    for (size_t v = 0; v < c->plan.variable_count; v++) {
        assert_string_equal(a->columns[v]->hash, b->columns[v]->hash);
    }
}

static void test_follows_its_inputs(void **state) {
    (void)state;
    struct trial_case c;
    case_open(&c, csv, plan);
    struct frame *before = frame_retain(c.frame);
    const struct column *bmi = case_column(&c, "derived.bmi"), *items = case_column(&c, "derived.items");
    case_must(&c, "[{'kind': 'correct', 'column': 'i2', 'participant': 'P1', 'from': '2', 'to': '4', 'reason': 'r'}]");
    near(case_number(&c, "P1", "derived.items"), 12, 0, 0, "corrected");
    near(case_number(&c, "P1", "derived.twice"), 11, 0, 0, "what rests on it");
    assert_ptr_equal(case_column(&c, "derived.bmi"), bmi); /* shared: nothing it rests on has changed */
    assert_ptr_not_equal(case_column(&c, "derived.items"), items);
    assert_true(strcmp(before->state_sha256, c.frame->state_sha256) != 0);
    struct frame *anew = case_build(&c, c.count, NULL, false);
    same_frame(&c, anew, c.frame);
    frame_release(anew);
    char batch[128];
    snprintf(batch, sizeof batch, "[{'kind': 'reverse', 'number': %zu, 'reason': 'r'}]", c.count);
    case_must(&c, batch);
    same_frame(&c, before, c.frame);
    near(case_number(&c, "P1", "derived.twice"), 9, 0, 0, "and back");
    frame_release(before);
    case_close(&c);
}

static void test_missing_inputs_and_records(void **state) {
    (void)state;
    struct trial_case c;
    case_open(&c, csv, plan);
    case_must(&c, "[{'kind': 'set-missing', 'column': 'i1', 'participant': 'P2', 'from': '1', 'reason': 'r'},"
                  " {'kind': 'keep-record', 'participant': 'P6', 'row': 6, 'reason': 'r'},"
                  " {'kind': 'missing-code', 'column': 'i3', 'value': '3', 'reason': 'r'}]");
    assert_int_equal(case_state(&c, "P2", "derived.items"), CELL_BLANK);
    near(case_number(&c, "P1", "derived.items"), 7.0 / 3 * 4, 1e-15, 0, "prorated once an item is a code");
    near(case_number(&c, "P6", "derived.map_0"), 1.5, 0, 0, "kept record");
    case_close(&c);
}

static void test_decisions_about_it(void **state) {
    (void)state;
    struct trial_case c;
    case_open(&c, csv, plan);
    case_refused(&c, "[{'kind': 'correct', 'column': 'derived.bmi', 'participant': 'P1', 'from': '25.0', 'to': '26', 'reason': 'r'}]",
        "decision 1 of the batch (correct) is about \"derived.bmi\", which is computed; decide about the columns it rests on; nothing was "
        "recorded");
    case_refused(&c, "[{'kind': 'missing-code', 'column': 'derived.bmi', 'value': '25.0', 'reason': 'r'}]",
        "decision 1 of the batch (missing-code) is about \"derived.bmi\", which is computed; decide about the columns it rests on; nothing "
        "was recorded");
    case_refused(&c, "[{'kind': 'confirm', 'column': 'derived.bmi', 'participant': 'P1', 'value': '24', 'reason': 'r'}]",
        "decision 1 of the batch (confirm) confirms a value that is not the one now computed; nothing was recorded");
    case_refused(&c, "[{'kind': 'confirm', 'column': 'derived.bmi', 'value': '25.0', 'reason': 'r'}]",
        "decision 1 of the batch (confirm) is about a computed value; say whose with \"participant\"; nothing was recorded");
    case_must(&c, "[{'kind': 'confirm', 'column': 'derived.bmi', 'participant': 'P1', 'value': '25.0', 'reason': 'r'}]");
    case_close(&c);
}

/* ---- what the checks say ---- */

static const struct discrepancy *discrepancy_of(const struct discrepancies *all, const char *id) {
    for (size_t i = 0; i < all->count; i++) {
        if (strcmp(all->list[i].id, id) == 0) {
            return &all->list[i];
        }
    }
    return NULL;
}

static void test_checks(void **state) {
    (void)state;
    struct trial_case c;
    case_open(&c, csv, plan);
    struct discrepancies all;
    checks_run(c.frame, c.received, &c.arena, &all);
    const struct discrepancy *bmi = discrepancy_of(&all, "derived-differs/bmi/P2");
    assert_non_null(bmi);
    assert_int_equal(bmi->severity, SEVERITY_MUST_SETTLE);
    expect_text(bmi->message, "bmi of P2 is 25.4 kg/m\xC2\xB2 by the file (bmi), but 25.0 kg/m\xC2\xB2 as weight kg in kg divided by the square of "
                              "height cm in m (recorded in cm) (kg 68, cm 165); rounding explains a difference of 0.385.", "message");
    assert_non_null(discrepancy_of(&all, "derived-differs/m0/P3"));
    assert_non_null(discrepancy_of(&all, "derived-differs/tot/P4"));
    size_t differ = 0;
    for (size_t i = 0; i < all.count; i++) {
        differ += strcmp(all.list[i].check, "derived-differs") == 0;
    }
    assert_int_equal(differ, 3);
    const struct discrepancy *plausible = discrepancy_of(&all, "out-of-plausible-range/derived.bmi/P5");
    assert_non_null(plausible);
    expect_text(plausible->message, "BMI of P5 is 257.116620752984 kg/m\xC2\xB2, outside the plausible range 12 to 80. It is computed: weight kg in "
                                    "kg divided by the square of height cm in m (recorded in cm) (kg 700, cm 165).", "message");
    case_must(&c, "[{'kind': 'correct', 'column': 'kg', 'participant': 'P2', 'from': '68', 'to': '69', 'reason': 'r'},"
                  " {'kind': 'confirm', 'column': 'm0', 'participant': 'P3', 'value': '97', 'reason': 'r'}]");
    checks_run(c.frame, c.received, &c.arena, &all);
    assert_int_equal(discrepancy_of(&all, "derived-differs/bmi/P2")->state, DISCREPANCY_SETTLED);
    assert_int_equal(discrepancy_of(&all, "derived-differs/m0/P3")->state, DISCREPANCY_SETTLED);
    assert_int_equal(discrepancy_of(&all, "derived-differs/tot/P4")->state, DISCREPANCY_OPEN);
    case_close(&c);
}

/* ---- dates ---- */

/* Days counted by R: as.Date("2026-03-01") - as.Date("2025-12-25") is 66, across a leap day from 2024-02-28 to 2024-03-01 2. Ages by the
 * calendar: the year is complete on the birthday, and for 29 February on 1 March where there is none. */
static void test_dates(void **state) {
    (void)state;
    static const struct {
        const char *born, *from, *to;
        double age, days;
    } cases[] = {
        {"1960-03-01", "2025-12-25", "2026-03-01", 66, 66}, {"1960-03-02", "2024-02-28", "2024-03-01", 63, 2},
        {"1964-02-29", "2026-02-28", "2026-02-28", 61, 0},  {"1964-02-29", "2026-02-28", "2026-03-01", 62, 1},
        {"2026-03-02", "2026-03-02", "2026-03-01", NAN, -1}, {"", "", "2026-03-01", NAN, NAN},
    };
    struct text data;
    text_init(&data);
    text_format(&data, "pid,born,rand,end,y0,y1\n");
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        text_format(&data, "P%zu,%s,%s,%s,1,2\n", i, cases[i].born, cases[i].from, cases[i].to);
    }
    struct trial_case c;
    case_open(&c, data.data, HEAD
        " 'outcomes': [{'id': 'y', 'role': 'primary', 'better': 'lower',"
        "   'visits': [{'label': 'Baseline', 'column': 'y0'}, {'label': 'End', 'column': 'y1'}]}],"
        " 'dates': {'order': 'Y/M/D', 'randomised': {'column': 'rand'}},"
        " 'derived': [{'id': 'age', 'formula': 'age-at', 'of': ['born', 'end']}, {'id': 'days', 'formula': 'days-between', 'of': ['rand', 'end']}],"
        TAIL);
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        char who[8];
        snprintf(who, sizeof who, "P%zu", i);
        near(case_number(&c, who, "derived.age"), cases[i].age, 0, 0, cases[i].born);
        near(case_number(&c, who, "derived.days"), cases[i].days, 0, 0, cases[i].to);
    }
    expect_text(frame_text(c.frame, case_column(&c, "derived.days"), 0), "66", "days are whole");
    struct discrepancies all;
    checks_run(c.frame, c.received, &c.arena, &all);
    case_close(&c);
    text_release(&data);
}

/* ---- against R ---- */

/* The four follow-up scores of R's HSAUR3::BtheB, of which at least two must be there:
 *   f <- BtheB[, c("bdi.2m", "bdi.3m", "bdi.5m", "bdi.8m")]; n <- rowSums(!is.na(f))
 *   m <- ifelse(n >= 2, rowMeans(f, na.rm = TRUE), NA); s <- ifelse(n >= 2, 4 * rowMeans(f, na.rm = TRUE), NA)
 *   table(n); mean(m, na.rm = TRUE); sum(s, na.rm = TRUE); var(s, na.rm = TRUE)                              (R 4.2) */
static void test_against_r(void **state) {
    (void)state;
    FILE *file = fopen("tests/reference/data/btheb.csv", "r");
    assert_non_null(file);
    struct text data;
    text_init(&data);
    char line[256];
    for (size_t row = 0; fgets(line, sizeof line, file);) {
        if (line[0] != '#') {
            text_format(&data, row ? "P%03zu,%s" : "pid%.0zu,%s", row, line);
            row++;
        }
    }
    fclose(file);
    struct trial_case c;
    case_open(&c, data.data, "{'title': 'T', 'participant': 'pid',"
        " 'outcomes': [{'id': 'm', 'role': 'primary', 'better': 'lower', 'visits': [{'label': 'All', 'column': 'derived.m'}]},"
        "   {'id': 's', 'role': 'secondary', 'better': 'lower', 'visits': [{'label': 'All', 'column': 'derived.s'}]}],"
        " 'derived': [{'id': 'm', 'formula': 'mean', 'of': ['month2', 'month3', 'month5', 'month8'], 'minimum_items': 2},"
        "   {'id': 's', 'formula': 'sum', 'of': ['month2', 'month3', 'month5', 'month8'], 'minimum_items': 2}]}");
    text_release(&data);
    size_t n = 0, prorated = 0, present[5] = {0};
    double means = 0, sum = 0, squares = 0;
    for (size_t p = 0; p < c.frame->participant_count; p++) {
        struct derived_value m, s;
        derived_take(&m, c.frame, &c.plan.derived[0], p);
        derived_take(&s, c.frame, &c.plan.derived[1], p);
        present[s.present]++;
        prorated += s.prorated;
        if (m.status == DERIVED_COMPUTED) {
            n++;
            means += m.value;
            sum += s.value;
            squares += s.value * s.value;
        }
    }
    static const size_t wanted[] = {3, 24, 15, 6, 52};
    for (size_t i = 0; i < 5; i++) {
        assert_int_equal(present[i], wanted[i]);
    }
    assert_int_equal(n, 73);
    assert_int_equal(prorated, 21);
    double count = (double)n;
    near(means / count, 14.398401826484019, 1e-13, 0, "mean of the means");
    near(sum, 4204.333333333333, 1e-13, 0, "sum of the sums");
    near((squares - sum * sum / count) / (count - 1), 1739.2168104177235, 1e-11, 0, "their variance");
    case_close(&c);
}

/* ---- what a plan may say ---- */

static void test_plans(void **state) {
    (void)state;
#define LATE "recorded after randomisation, when the arms may have changed it; take a column from before"
    static const struct {
        const char *old, *new, *sentence; /* NULL: taken */
    } cases[] = {
        {"'formula': 'mean'", "'formula': 'median'",
            "plan.json: derived[0].formula must be mean, sum, difference, ratio, body-mass-index, days-between or age-at"},
        {"'of': ['s0', 'd0']", "'of': ['s0']", "plan.json: derived[0].of must list two or more columns for the formula \"mean\""},
        {"'of': ['kg', 'cm']", "'of': ['kg', 'cm', 's0']",
            "plan.json: derived[1].of must list two columns for the formula \"body-mass-index\""},
        {"'of': ['s0', 'd0']", "'of': ['s0', 's0']", "plan.json: derived[0].of[1] repeats a column before it; each counts once"},
        {"'of': ['s0', 'd0']", "'of': ['s0', 'derived.bmi']",
            "plan.json: derived[0].of[1] \"derived.bmi\" is not the name of a derived value of this plan; one may rest on those before it in "
            "the list only"},
        {"'minimum_items': 2", "'minimum_items': 5",
            "plan.json: derived[2].minimum_items must be a whole number from 1 to the number of columns it is made of"},
        {"'minimum_items': 2", "'minimum_items': 0.5",
            "plan.json: derived[2].minimum_items must be a whole number from 1 to the number of columns it is made of"},
        {"'height_unit': 'cm'", "'height_unit': 'cm', 'minimum_items': 1",
            "plan.json: derived[1].minimum_items belongs to the formulas mean and sum"},
        {"'height_unit': 'cm', ", "",
            "plan.json: derived[1].height_unit is missing; say \"cm\" or \"m\" (the columns are weight in kg, then height)"},
        {"'height_unit': 'cm'", "'height_unit': 'in'", "plan.json: derived[1].height_unit must be \"cm\" or \"m\""},
        {"'minimum_items': 2", "'height_unit': 'm'", "plan.json: derived[2].height_unit belongs to the formula body-mass-index"},
        {"'claims': 'm0'", "'claims': 's0'", "plan.json: derived[0].claims is one of the columns it is made of"},
        {"'claims': 'tot', ", "", "plan.json: derived[2].tolerance needs \"claims\": the column of the file to compare with"},
        {"'tolerance': 1", "'tolerance': -1", "plan.json: derived[2].tolerance must not be negative"},
        {"'id': 'items'", "'id': 'bmi'", "plan.json: derived[2].id is that of a derived value before it; each needs its own"},
        {"'id': 'items'", "'id': 'a.b'", "plan.json: derived[2].id must be one word without . @ , = or &"},
        {"'claims': 'm0'", "'round': 1",
            "plan.json: the key \"round\" in derived[0] is not one a plan has here; known are: id label unit formula of minimum_items "
            "height_unit claims tolerance plausible missing_codes"},
        {"'of': ['s0', 'd0']", "'of': ['s0', 'pid']",
            "plan.json: the column \"pid\" is both pid and the participant's identifier; a column has one meaning"},
        {"'column': 'derived.bmi', 'kind': 'number', 'bands': [25]", "'column': 'derived.bmi', 'kind': 'category'",
            "plan.json: derived.bmi is a number, and BMI uses it as something else"},
        {"'column': 'derived.bmi'", "'column': 'derived.bim'",
            "plan.json: covariates[0] \"derived.bim\" is not the name of a derived value of this plan; one may rest on those before it in the "
            "list only"},
        {"'adjust_for'", "'site': {'column': 'derived.bmi'}, 'adjust_for'",
            "plan.json: site.column must be a column of a file; a derived value stands for numbers only"},
        /* What was recorded after randomisation is not adjusted for, also not in disguise (ICH E9, 5.7; EMA/CHMP/295050/2013, 5.8). */
        {"'of': ['kg', 'cm']", "'of': ['y1', 'cm']", "plan.json: adjust_for names \"bmi\", which rests on y1, " LATE},
        {"'adjust_for'", "'stratified_by': ['bmi'], 'subgroups': ['bmi'], 'adjust_for'", NULL},
        {"'of': ['s0', 'd0']", "'of': ['s0', 'y1']",
            "plan.json: outcomes[0].visits[0] is the baseline of \"y\", but it rests on y1, recorded after randomisation; take a column from "
            "before"},
        {"'adjust_for': ['bmi']", "'subgroups': ['bmi']", NULL},
    };
    struct arena arena;
    arena_init(&arena);
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        const char *at = strstr(plan, cases[i].old);
        assert_non_null(at);
        const char *json = quoted(&arena, arena_format(&arena, "%.*s%s%s", (int)(at - plan), plan, cases[i].new, at + strlen(cases[i].old)));
        struct plan made;
        struct fault fault;
        fault_init(&fault);
        bool read = plan_read(&made, json, strlen(json), "plan.json", &fault);
        if (read != (cases[i].sentence == NULL)) {
            fail_msg("%s: %s", cases[i].new, read ? "taken" : fault.message);
        }
        if (read) {
            plan_release(&made);
        } else {
            expect_text(fault.message, cases[i].sentence, cases[i].new);
        }
    }
    arena_release(&arena);
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_formulas),
        cmocka_unit_test(test_rounding),
        cmocka_unit_test(test_values_in_frame),
        cmocka_unit_test(test_follows_its_inputs),
        cmocka_unit_test(test_missing_inputs_and_records),
        cmocka_unit_test(test_decisions_about_it),
        cmocka_unit_test(test_checks),
        cmocka_unit_test(test_dates),
        cmocka_unit_test(test_against_r),
        cmocka_unit_test(test_plans),
    };
    return cmocka_run_group_tests_name("trial/derived", tests, NULL, NULL);
}
