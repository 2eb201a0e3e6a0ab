/* SPDX-License-Identifier: GPL-3.0-or-later */
/* One small table written by R's packages haven 2.5.1 and openxlsx 4.2.5 (formats.R) against what R says its cells are
 * (formats.csv): numbers to the last bit, dates and texts to the letter. */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <cmocka.h>
#include "base/memory.h"
#include "base/text.h"
#include "intake/number.h"
#include "intake/read.h"
#include <math.h>
#include <stdio.h>
#include <string.h>

#define FOLDER "tests/reference/data/formats."

static void read_file(struct text *out, const char *path) {
    FILE *file = fopen(path, "rb");
    if (!file) {
        fail_msg("%s cannot be opened; run from the repository's top folder", path);
        return;
    }
    char room[4096];
    for (size_t got; (got = fread(room, 1, sizeof room, file)) > 0;) {
        text_append(out, room, got);
    }
    fclose(file);
}

static void read_cells_of(struct cells *cells, const char *ending, const char *sheet) {
    char path[128];
    struct text file;
    struct fault fault;
    snprintf(path, sizeof path, FOLDER "%s", ending);
    text_init(&file);
    fault_init(&fault);
    read_file(&file, path);
    if (!read_cells(cells, file.data, file.length, path, sheet, &fault)) {
        fail_msg("%s", fault.message);
    }
    text_release(&file);
}

static const struct kind {
    const char *ending, *sheet, *encoding;
    const char *third_pressure;  /* the missing value of the third record, as each format can say it */
    bool sheet_digits;           /* numbers have 15 digits at most */
    const char *label;           /* of the pressure; NULL where the format has none */
    size_t value_labels;         /* of the arm */
    const char *missing;         /* declared for the pressure */
} kinds[] = {
    {"xlsx", "Export", "spreadsheet (.xlsx), sheet \"Export\"", "", true, NULL, 0, NULL},
    {"xpt", NULL, "transport file (.xpt), version 5", "", false, "Systolic pressure", 0, NULL},
    {"sav", NULL, "statistical file (.sav), UTF-8", "999", false, "Systolic pressure", 2, "999"},
    {"dta", NULL, "statistical file (.dta), version 118", ".b", false, "Systolic pressure", 2, ".b"},
};

static void compare_cell(const struct kind *kind, const char *got, const char *wanted, size_t record, size_t column) {
    double have, want;
    if (number_read(wanted, '.', &want, NULL) == NUMBER_READ && column > 0 && column < 4) {
        /* The sheet shows 15 digits; every other format gives the same double back. */
        double slack = kind->sheet_digits ? 1e-15 * fabs(want) : 0;
        if (number_read(got, '.', &have, NULL) != NUMBER_READ || fabs(have - want) > slack) {
            fail_msg("%s, record %zu, column %zu: %s in place of %s", kind->ending, record + 1, column + 1, got, wanted);
        }
    } else if (strcmp(got, wanted)) {
        fail_msg("%s, record %zu, column %zu: \"%s\" in place of \"%s\"", kind->ending, record + 1, column + 1, got, wanted);
    }
}

static void check_about(const struct kind *kind, const struct cells *cells) {
    if (!kind->label) {
        assert_null(cells->about);
        return;
    }
    const struct cell_about *arm = &cells->about[1], *sbp = &cells->about[2];
    assert_string_equal(sbp->label, kind->label);
    assert_string_equal(arm->label, "Randomised group");
    assert_int_equal(arm->value_count, kind->value_labels);
    assert_int_equal(sbp->missing_count, kind->missing ? 1 : 0);
    if (kind->missing) {
        assert_string_equal(sbp->missing[0], kind->missing);
        assert_string_equal(arm->values[1].code, "2");
        assert_string_equal(arm->values[1].label, "Printed advice");
    }
}

static void reads_what_other_programs_write(void **state) {
    (void)state;
    struct cells wanted;
    read_cells_of(&wanted, "csv", NULL);
    for (size_t i = 0; i < sizeof kinds / sizeof *kinds; i++) {
        const struct kind *kind = &kinds[i];
        struct cells got;
        read_cells_of(&got, kind->ending, kind->sheet);
        assert_string_equal(got.encoding, kind->encoding);
        assert_int_equal(got.records, wanted.records);
        assert_int_equal(got.columns, wanted.columns);
        for (size_t c = 0; c < wanted.columns; c++) {
            assert_string_equal(got.names[c], wanted.names[c]);
            for (size_t r = 0; r < wanted.records; r++) {
                bool special = c == 2 && r == 2;
                compare_cell(kind, cells_at(&got, r, c), special ? kind->third_pressure : cells_at(&wanted, r, c), r, c);
            }
        }
        check_about(kind, &got);
        cells_release(&got);
    }
    cells_release(&wanted);
}

int main(void) {
    const struct CMUnitTest tests[] = {cmocka_unit_test(reads_what_other_programs_write)};
    return cmocka_run_group_tests_name("formats", tests, NULL, NULL);
}
