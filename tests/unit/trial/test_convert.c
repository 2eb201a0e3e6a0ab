/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Units of one site. Factors against the AMA Manual of Style's table of SI conversions (glucose 100 mg/dL = 5.55
 * mmol/L, cholesterol 200 mg/dL = 5.18 mmol/L, creatinine 1.0 mg/dL = 88.4 µmol/L), 1 lb = 0.45359237 kg and 1 inch
 * = 2.54 cm exactly, 760 mmHg = 101.325 kPa (the standard atmosphere). */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "base/text.h"
#include "near.h"
#include "trial/convert.h"
#include "trial_case.h"

static const char plan[] =
    "{'title': 'T', 'participant': 'pid', 'missing_codes': ['9'], 'site': {'column': 'site'},"
    " 'outcomes': [{'id': 'g', 'label': 'Glucose', 'unit': 'mg/dL', 'role': 'primary', 'better': 'lower',"
    "   'visits': [{'label': 'Start', 'column': 'g0'}, {'label': 'End', 'column': 'g1'}]}]}";
static const char csv[] = "pid,site,g0,g1\nP1,01,100,110\nP2,02,5.0,\nP3,02,\"6,0\",<2\nP4,2,7.0,9\nP5,,90,95\n";
#define CONVERT(column, site, factor)                                                                                  \
    "[{'kind': 'convert', 'column': '" column "', 'site': '" site "', 'factor': " factor                               \
    ", 'unit_from': 'mmol/L', 'unit_to': 'mg/dL', 'source': 'AMA Manual of Style', 'reason': 'r'}]"

static double value_of(const struct trial_case *c, const char *column, const char *who) {
    return frame_column(c->frame, column)->number[case_who(c, who)];
}

static void test_factors(void **state) {
    (void)state;
    static const struct {
        const char *from, *to, *analyte;
        double value, is, within;
    } cases[] = {
        {"mg/dL", "mmol/L", "glucose", 100, 5.55, 0.005},
        {"mg/dL", "mmol/L", "cholesterol", 200, 5.18, 0.005},
        {"mg/dL", "µmol/L", "creatinine", 1, 88.4, 0.05},
        {"mmHg", "kPa", NULL, 760, 101.325, 0.0005},
        {"lb", "kg", NULL, 1, 0.45359237, 0},
        {"inch", "cm", NULL, 1, 2.54, 0},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        const struct unit_factor *entry = unit_factors;
        while (!entry->from || strcmp(entry->from, cases[i].from) != 0 || strcmp(entry->to, cases[i].to) != 0 ||
               (cases[i].analyte && strcmp(entry->analyte, cases[i].analyte) != 0)) {
            entry++;
            assert_true(entry->factor > 0);
        }
        assert_true(fabs(cases[i].value * entry->factor - cases[i].is) <= cases[i].within);
        assert_true(strlen(entry->source) > 10);
    }
}

static void test_converts_and_comes_back(void **state) {
    (void)state;
    struct trial_case c;
    case_open(&c, csv, plan);
    char before[HASH_SIZE];
    memcpy(before, c.frame->state_sha256, HASH_SIZE);
    case_must(&c, CONVERT("g0", "02", "18"));
    near(value_of(&c, "g0", "P1"), 100, 0, 0, "another site");
    near(value_of(&c, "g0", "P2"), 90, 0, 0, "5.0 times 18");
    near(value_of(&c, "g0", "P4"), 7, 0, 0, "site 2 is not site 02");
    near(value_of(&c, "g0", "P5"), 90, 0, 0, "no site");
    assert_string_equal(frame_text(c.frame, frame_column(c.frame, "g0"), case_who(&c, "P2")), "5.0");
    assert_int_equal(frame_column(c.frame, "g0")->state[case_who(&c, "P2")], CELL_OBSERVED);
    assert_int_equal(convert_cells(c.frame, &c.decisions[c.count - 1]), 1);
    /* a comma read later, a site read as another, a correction in the site's unit: all are converted */
    case_must(&c,
        "[{'kind': 'number-format', 'column': 'g0', 'decimal': ',', 'reason': 'r'},"
        "{'kind': 'read-as', 'column': 'site', 'from': '2', 'to': '02', 'reason': 'r'},"
        "{'kind': 'correct', 'column': 'g0', 'participant': 'P2', 'from': '5.0', 'to': '5,5', 'reason': 'r'}]");
    near(value_of(&c, "g0", "P2"), 99, 0, 0, "5.5 times 18");
    near(value_of(&c, "g0", "P3"), 108, 0, 0, "6,0 times 18");
    case_must(
        &c, "[{'kind': 'correct', 'column': 'g0', 'participant': 'P4', 'from': '7.0', 'to': '7', 'reason': 'r'}]");
    near(value_of(&c, "g0", "P4"), 126, 0, 0, "7 times 18, its site now 02");
    assert_int_equal(convert_cells(c.frame, &c.decisions[c.planned]), 3);
    assert_int_equal(convert_of(c.frame, 0, case_who(&c, "P4"))->number, c.planned + 1);
    assert_null(convert_of(c.frame, 0, case_who(&c, "P1")));
    case_close(&c);
    /* the reverse gives the state before it, to the byte */
    case_open(&c, csv, plan);
    case_must(&c, CONVERT("g0", "02", "18"));
    assert_string_not_equal(c.frame->state_sha256, before);
    char reverse[80];
    snprintf(reverse, sizeof reverse, "[{'kind': 'reverse', 'number': %zu, 'reason': 'r'}]", c.count);
    case_must(&c, reverse);
    assert_string_equal(c.frame->state_sha256, before);
    case_close(&c);
}

/* Codes for missing and limits are read before the factor; a frame built anew equals the one built step by step. */
static void test_codes_and_limits(void **state) {
    (void)state;
    struct trial_case c;
    case_open(&c, csv, plan);
    case_must(&c, CONVERT("g1", "02", "18"));
    const struct column *column = frame_column(c.frame, "g1");
    assert_int_equal(column->state[case_who(&c, "P4")], CELL_MISSING_CODE);
    near(column->limit[case_who(&c, "P3")], 36, 0, 0, "<2 times 18");
    struct frame *anew = case_build(&c, c.count, NULL, false);
    assert_string_equal(anew->state_sha256, c.frame->state_sha256);
    frame_release(anew);
    case_close(&c);
}

static void test_refusals(void **state) {
    (void)state;
    static const struct {
        const char *batch, *sentence;
    } cases[] = {
        {CONVERT("g0", "03", "18"), "decision 1 of the batch (convert) is about the site \"03\", where the file has no "
                                    "participant; nothing was recorded"},
        {CONVERT("site", "02", "18"), "decision 1 of the batch (convert) is about the column \"site\", which holds no "
                                      "numbers; nothing was recorded"},
        {CONVERT("g0", "02", "0"),
            "batch.json: decision 1 of the batch (convert) has a \"factor\" that is not above 0; nothing was recorded"},
        {CONVERT("g0", "02", "'18'"), "batch.json: decision 1 of the batch (convert) has a \"factor\" that is not a "
                                      "number; nothing was recorded"},
        {"[{'kind': 'convert', 'column': 'g0', 'site': '02', 'factor': 18, 'unit_from': 'a', 'unit_to': 'b', 'source': "
         "' ', 'reason': 'r'}]",
            "batch.json: decision 1 of the batch (convert) has a blank \"source\"; say where the factor is published; "
            "nothing was recorded"},
    };
    struct trial_case c;
    case_open(&c, csv, plan);
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        case_refused(&c, cases[i].batch, cases[i].sentence);
    }
    case_must(&c, CONVERT("g0", "02", "18"));
    char sentence[200];
    snprintf(sentence, sizeof sentence,
        "decision 1 of the batch (convert) is about what decision %zu has converted already; reverse that one first; "
        "nothing was recorded",
        c.count);
    case_refused(&c, CONVERT("g0", "02", "18"), sentence);
    case_must(&c, "[{'kind': 'lock', 'reason': 'r'}]");
    assert_false(case_decide(&c, CONVERT("g1", "02", "18")));
    case_close(&c);
    static const char no_site[] =
        "{'title': 'T', 'participant': 'pid', 'outcomes': [{'id': 'g', 'role': 'primary', 'better': 'lower',"
        " 'visits': [{'label': 'End', 'column': 'g1'}]}]}";
    case_open(&c, csv, no_site);
    case_refused(&c, CONVERT("g1", "02", "18"),
        "decision 1 of the batch (convert) is about a site, and the plan names no column of sites; nothing was "
        "recorded");
    case_close(&c);
}

/* In a file with one row per visit a site is asked about once for all visits of the column, and converted at all of
 * them. */
static void test_every_visit_at_once(void **state) {
    (void)state;
    static const char by_visit[] =
        "{'title': 'T', 'participant': 'pid', 'site': {'column': 'v.site@V0'},"
        " 'files': [{'id': 'v', 'layout': 'visit', 'participant': 'pid', 'visit': 'visit', 'codes': ['V0', 'V1']}],"
        " 'outcomes': [{'id': 'g', 'label': 'Glucose', 'unit': 'mg/dL', 'role': 'primary', 'better': 'lower', "
        "'plausible': [40, 600],"
        "   'visits': [{'label': 'Start', 'column': 'glu', 'file': 'v', 'visit': 'V0'}, {'label': 'End', 'column': "
        "'glu', 'file': 'v', 'visit': 'V1'}]}]}";
    struct text made;
    text_init(&made);
    text_literal(&made, "pid,visit,site,glu\n");
    for (int p = 0; p < 24; p++) { /* 85 to 131 mg/dL, eight participants at each of three sites; the third in mmol/L */
        for (int v = 0; v < 2; v++) {
            double glucose = 85 + 2 * p + v;
            text_format(&made, "P%02d,V%d,0%d,%.3f\n", p, v, p % 3 + 1, p % 3 == 2 ? glucose * 0.0555 : glucose);
        }
    }
    struct trial_case c;
    struct arena arena;
    struct discrepancies found;
    arena_init(&arena);
    case_open(&c, made.data, by_visit);
    checks_run(c.frame, c.received, &arena, &found);
    assert_int_equal(found.count, 1);
    assert_string_equal(found.list[0].id, "site-unit/v.glu/03");
    assert_int_equal(found.list[0].participant_count, 8);
    char batch[600];
    snprintf(
        batch, sizeof batch, "[%.*s,'reason':'r'}]", (int)strlen(found.list[0].proposal) - 1, found.list[0].proposal);
    case_must(&c, batch);
    assert_int_equal(convert_cells(c.frame, &c.decisions[c.count - 1]), 16);
    near(value_of(&c, "v.glu@V0", "P02"), 89, 0.01, 0, "written with three decimals");
    near(value_of(&c, "v.glu@V1", "P02"), 90, 0.01, 0, "written with three decimals");
    checks_run(c.frame, c.received, &arena, &found);
    assert_int_equal(found.open, 0);
    case_close(&c);
    text_release(&made);
    arena_release(&arena);
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_factors),
        cmocka_unit_test(test_converts_and_comes_back),
        cmocka_unit_test(test_codes_and_limits),
        cmocka_unit_test(test_refusals),
        cmocka_unit_test(test_every_visit_at_once),
    };
    return cmocka_run_group_tests_name("trial/convert", tests, NULL, NULL);
}
