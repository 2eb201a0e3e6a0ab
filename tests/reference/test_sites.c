/* SPDX-License-Identifier: GPL-3.0-or-later */
/* One site's wrong unit, on open measurements (R's package MASS; see data/sites.csv): shared out over nine sites
 * nothing is asked; one site rewritten in another unit gives one question, with the factor of the published table, and
 * accepting its proposal brings the measurements back as far as the digits written go. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "base/text.h"
#include "reference.h"
#include "unit/trial/trial_case.h"
#include <math.h>

enum { SITES = 9, SHIFTS = 10 };

static const char plan[] =
    "{'title': 'T', 'participant': 'pid', 'site': {'column': 'site'},"
    " 'outcomes': [{'id': 'glucose', 'label': 'Glucose', 'unit': 'mg/dL', 'role': 'primary', 'better': 'lower',%s"
    "   'visits': [{'label': 'End', 'column': 'glucose'}]}],"
    " 'covariates': [{'id': 'height', 'label': 'Height', 'unit': 'cm', 'column': 'height', 'kind': 'number'},"
    "   {'id': 'weight', 'label': 'Weight', 'unit': 'lb', 'column': 'weight', 'kind': 'number'},"
    "   {'id': 'bmi', 'label': 'Body mass index', 'column': 'bmi', 'kind': 'number'}]}";

static const struct {
    const char *column;
    double divisor; /* the site writes value / divisor */
    int decimals;
    const char *from; /* the unit the question must name */
} shifts[SHIFTS] = {
    {"glucose", 1 / 0.0555, 1, "mmol/L"},
    {"glucose", 0.1, 0, "0.1 mg/dL"},
    {"glucose", 1000, 3, "1000 mg/dL"},
    {"height", 2.54, 0, "inch"},
    {"height", 100, 2, "100 cm"},
    {"height", 0.1, 0, "0.1 cm"},
    {"weight", 1 / 0.45359237, 1, "kg"},
    {"weight", 0.01, 0, "0.01 lb"},
    {"bmi", 10, 2, "10 of that unit"},
    {"bmi", 0.1, 0, "0.1 of that unit"},
};

/* The measurements over `sites` sites by turns; those of one column at one site in another unit (shift < 0: none). */
static char *export_of(const struct table *data, int sites, int shift, int at, struct arena *arena) {
    static const char *const columns[] = {"glucose", "height", "weight", "bmi"};
    struct text csv;
    text_init(&csv);
    text_literal(&csv, "pid,site,glucose,height,weight,bmi\n");
    for (size_t r = 0; r < data->rows; r++) {
        int site = (int)(r % (size_t)sites);
        text_format(&csv, "P%03zu,%02d", r, site + 1);
        for (size_t c = 0; c < 4; c++) {
            bool other = shift >= 0 && site == at && strcmp(shifts[shift].column, columns[c]) == 0;
            double value = table_number(data, r, columns[c]);
            if (other) {
                text_format(&csv, ",%.*f", shifts[shift].decimals, value / shifts[shift].divisor);
            } else {
                text_format(&csv, ",%.15g", value);
            }
        }
        text_literal(&csv, "\n");
    }
    char *copy = arena_text(arena, csv.data);
    text_release(&csv);
    return copy;
}

static size_t questions(const struct discrepancies *found, const struct discrepancy **one) {
    size_t count = 0;
    for (size_t i = 0; i < found->count; i++) {
        if (strcmp(found->list[i].check, "site-unit") == 0) {
            *one = &found->list[i];
            count++;
        }
    }
    return count;
}

static void test_nothing_is_asked(void **state) {
    (void)state;
    struct table data = table_read("tests/reference/data/sites.csv");
    for (int sites = 1; sites <= 30; sites++) {
        struct arena arena;
        arena_init(&arena);
        struct trial_case c;
        char filled[2048];
        const struct discrepancy *one = NULL;
        struct discrepancies found;
        snprintf(filled, sizeof filled, plan, "");
        case_open(&c, export_of(&data, sites, -1, 0, &arena), filled);
        checks_run(c.frame, c.received, &arena, &found);
        if (questions(&found, &one)) {
            fail_msg("%d sites: %s", sites, one->message);
        }
        case_close(&c);
        arena_release(&arena);
    }
    table_release(&data);
}

static void expect_question(const struct table *data, int shift, int at) {
    struct arena arena;
    arena_init(&arena);
    struct trial_case c;
    char filled[2048], id[80], wanted[80], batch[600];
    const struct discrepancy *one = NULL;
    struct discrepancies found;
    snprintf(filled, sizeof filled, plan, "");
    case_open(&c, export_of(data, SITES, shift, at, &arena), filled);
    checks_run(c.frame, c.received, &arena, &found);
    size_t count = questions(&found, &one);
    snprintf(id, sizeof id, "site-unit/%s/%02d", shifts[shift].column, at + 1);
    snprintf(wanted, sizeof wanted, "\"unit_from\":\"%s\"", shifts[shift].from);
    if (count != 1 || strcmp(one->id, id) != 0 || !strstr(one->proposal, wanted)) {
        fail_msg("%s in %s: %zu questions, %s %s", id, shifts[shift].from, count, one ? one->id : "",
            one ? one->proposal : "");
    }
    snprintf(batch, sizeof batch, "[%.*s,'reason':'r'}]", (int)strlen(one->proposal) - 1, one->proposal);
    case_must(&c, batch);
    const struct column *column = frame_column(c.frame, shifts[shift].column);
    double step = 0.5 * pow(10, -shifts[shift].decimals) * shifts[shift].divisor;
    for (size_t p = 0; p < c.frame->participant_count; p++) {
        double value = table_number(data, p, shifts[shift].column);
        assert_true(fabs(column->number[p] - value) <= step + 1e-9 * value);
    }
    checks_run(c.frame, c.received, &arena, &found);
    assert_int_equal(questions(&found, &one), 1);
    assert_int_equal(one->state, DISCREPANCY_SETTLED);
    assert_int_equal(one->settled_by, c.count);
    case_close(&c);
    arena_release(&arena);
}

static void test_each_unit_at_each_site(void **state) {
    (void)state;
    struct table data = table_read("tests/reference/data/sites.csv");
    for (int shift = 0; shift < SHIFTS; shift++) {
        for (int at = 0; at < SITES; at++) {
            expect_question(&data, shift, at);
        }
    }
    table_release(&data);
}

/* With two sites only a plausible range can say which is wrong; and who is asked about as a site is not asked about one
 * by one. */
static void test_two_sites(void **state) {
    (void)state;
    struct table data = table_read("tests/reference/data/sites.csv");
    static const char *const ranges[] = {"", " 'plausible': [40, 600],"};
    for (size_t i = 0; i < 2; i++) {
        struct arena arena;
        arena_init(&arena);
        struct trial_case c;
        char filled[2048];
        const struct discrepancy *one = NULL;
        struct discrepancies found;
        snprintf(filled, sizeof filled, plan, ranges[i]);
        case_open(&c, export_of(&data, 2, 0, 1, &arena), filled);
        checks_run(c.frame, c.received, &arena, &found);
        assert_int_equal(questions(&found, &one), i);
        assert_int_equal(found.open, i);
        if (i) {
            assert_string_equal(one->id, "site-unit/glucose/02");
            case_must(&c,
                "[{'kind': 'note', 'exhibit': 'sites', 'text': 'It is so.', 'discrepancy': 'site-unit/glucose/02'}]");
            checks_run(c.frame, c.received, &arena, &found);
            assert_int_equal(questions(&found, &one), 1);
            assert_int_equal(one->state, DISCREPANCY_SETTLED);
            assert_true(found.open > 90); /* the unit is right: then every value is asked about by itself */
        }
        case_close(&c);
        arena_release(&arena);
    }
    table_release(&data);
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_nothing_is_asked),
        cmocka_unit_test(test_each_unit_at_each_site),
        cmocka_unit_test(test_two_sites),
    };
    return cmocka_run_group_tests_name("reference/sites", tests, NULL, NULL);
}
