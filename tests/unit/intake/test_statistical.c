/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Transport files and files of statistical systems -> cells. The files are written in the test by ReadStat's own writer;
 * tests/reference/test_formats.c reads files that another program wrote. */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <cmocka.h>
#include "base/memory.h"
#include "base/text.h"
#include "demo/quayside.h"
#include "intake/number.h"
#include "intake/read.h"
#include "server/intake/shown.h"
#include <ctype.h>
#include <readstat.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

typedef readstat_error_t (*begin_writing)(readstat_writer_t *writer, void *user, long records);

static const struct kind {
    const char *name, *word;
    begin_writing begin;
    uint8_t version;
    readstat_compress_t compression;
    bool labels, ranges, tags, long_names;
    char tag;
    const char *tagged;
} kinds[] = {
    {"x5.xpt", "transport file (.xpt), version 5", readstat_begin_writing_xport, 5, READSTAT_COMPRESS_NONE, false, false,
        true, false, 'A', ".A"},
    {"x8.xpt", "transport file (.xpt), version 8", readstat_begin_writing_xport, 8, READSTAT_COMPRESS_NONE, false, false,
        true, true, 'A', ".A"},
    {"s.sav", "statistical file (.sav), UTF-8", readstat_begin_writing_sav, 2, READSTAT_COMPRESS_NONE, true, true, false,
        true, 0, NULL},
    {"r.sav", "statistical file (.sav), UTF-8", readstat_begin_writing_sav, 2, READSTAT_COMPRESS_ROWS, true, true, false,
        true, 0, NULL},
    {"z.zsav", "statistical file (.zsav), UTF-8", readstat_begin_writing_sav, 3, READSTAT_COMPRESS_BINARY, true, true, false,
        true, 0, NULL},
    {"p.por", "statistical file (.por)", readstat_begin_writing_por, 0, READSTAT_COMPRESS_NONE, true, true, false, false, 0,
        NULL},
    {"d114.dta", "statistical file (.dta), version 114", readstat_begin_writing_dta, 114, READSTAT_COMPRESS_NONE, true, false,
        true, true, 'a', ".a"},
    {"d118.dta", "statistical file (.dta), version 118", readstat_begin_writing_dta, 118, READSTAT_COMPRESS_NONE, true, false,
        true, true, 'a', ".a"},
    {"b.sas7bdat", "statistical file (.sas7bdat), UTF-8", readstat_begin_writing_sas7bdat, 0, READSTAT_COMPRESS_NONE, false,
        false, true, true, 'A', ".A"},
};
enum { KINDS = sizeof kinds / sizeof *kinds };

static ssize_t append(const void *bytes, size_t length, void *out) {
    text_append(out, bytes, length);
    return (ssize_t)length;
}

static void must(readstat_error_t error, const char *name) {
    if (error != READSTAT_OK) {
        fail_msg("%s: ReadStat's writer: %s", name, readstat_error_message(error));
    }
}

static readstat_writer_t *new_writer(const struct kind *kind) {
    readstat_writer_t *writer = readstat_writer_init();
    readstat_set_data_writer(writer, append);
    readstat_writer_set_file_timestamp(writer, 1796000000);
    if (kind->version) {
        readstat_writer_set_file_format_version(writer, kind->version);
    }
    if (kind->compression) {
        readstat_writer_set_compression(writer, kind->compression);
    }
    return writer;
}

/* --- one small file of everything --------------------------------------------------------------------------------- */

/* How each family writes the format of a date, its number for 2026-03-14, and how much a day is. */
static const char *date_format(const struct kind *kind, double *date, double *step) {
    bool labelled = kind->begin == readstat_begin_writing_sav || kind->begin == readstat_begin_writing_por;
    *date = labelled ? (double)(days_of(2026, 3, 14) - days_of(1582, 10, 14)) * 86400
                     : (double)(days_of(2026, 3, 14) - days_of(1960, 1, 1));
    *step = labelled ? 86400 : 1;
    return labelled ? "DATE11" : kind->begin == readstat_begin_writing_dta ? "%td" : "DATE9";
}

static void write_small(struct text *out, const struct kind *kind) {
    readstat_writer_t *writer = new_writer(kind);
    readstat_label_set_t *set = NULL;
    double date, step;
    if (kind->labels) {
        set = readstat_add_label_set(writer, READSTAT_TYPE_DOUBLE, "arms");
        readstat_label_double_value(set, 1, "Walking group");
        readstat_label_double_value(set, 2, "Printed advice");
    }
    readstat_variable_t *pid = readstat_add_variable(writer, "PID", READSTAT_TYPE_STRING, 12);
    readstat_variable_t *arm = readstat_add_variable(writer, "ARM", READSTAT_TYPE_DOUBLE, 0);
    readstat_variable_t *sbp = readstat_add_variable(writer, kind->long_names ? "SBP_26_WEEKS" : "SBP_26", READSTAT_TYPE_DOUBLE,
        0);
    readstat_variable_t *day = readstat_add_variable(writer, "DAY", READSTAT_TYPE_DOUBLE, 0);
    readstat_variable_set_label(sbp, "Systolic pressure, mmHg");
    readstat_variable_set_label_set(arm, set);
    readstat_variable_set_format(day, date_format(kind, &date, &step));
    if (kind->ranges) {
        readstat_variable_add_missing_double_value(sbp, 999);
        readstat_variable_add_missing_double_range(sbp, -9, -1);
    }
    must(kind->begin(writer, out, 3), kind->name);
    static const char *const names[] = {"", "10 02  ", "1003"};
    static const double pressures[] = {148.5, 999, -8};
    for (int i = 0; i < 3; i++) {
        must(readstat_begin_row(writer), kind->name);
        must(readstat_insert_string_value(writer, pid, names[i]), kind->name);
        must(readstat_insert_double_value(writer, arm, i % 2 + 1), kind->name);
        if (i == 1 && kind->tags) {
            must(readstat_insert_tagged_missing_value(writer, sbp, kind->tag), kind->name);
        } else {
            must(readstat_insert_double_value(writer, sbp, pressures[i]), kind->name);
        }
        must(i == 2 ? readstat_insert_missing_value(writer, day) : readstat_insert_double_value(writer, day, date + i * step),
            kind->name);
        must(readstat_end_row(writer), kind->name);
    }
    must(readstat_end_writing(writer), kind->name);
    readstat_writer_free(writer);
}

/* The bytes are given in a block of exactly their size, so that the sanitizer sees a read beyond. */
static bool read_exact(struct cells *cells, const char *bytes, size_t length, const char *name, struct fault *fault) {
    fault_init(fault);
    char *copy = memory_grow(NULL, length, 1);
    memcpy(copy, bytes, length);
    bool done = read_cells(cells, copy, length, name, NULL, fault);
    memory_free(copy);
    return done;
}

static void show(struct text *text, const struct cells *cells) {
    for (size_t r = 0; r < cells->records; r++) {
        text_format(text, "/%u:", cells->line[r]);
        for (size_t c = 0; c < cells->columns; c++) {
            text_format(text, "%s%s", c ? "|" : "", cells_at(cells, r, c));
        }
    }
}

static void check_about(const struct kind *kind, const struct cells *cells) {
    const struct cell_about *arm = &cells->about[1], *sbp = &cells->about[2];
    assert_string_equal(sbp->label, "Systolic pressure, mmHg");
    assert_string_equal(arm->label, "");
    assert_int_equal(arm->value_count, kind->labels ? 2 : 0);
    assert_int_equal(sbp->value_count, 0);
    if (kind->labels) {
        assert_string_equal(arm->values[0].code, "1");
        assert_string_equal(arm->values[0].label, "Walking group");
        assert_string_equal(arm->values[1].code, "2");
    }
    assert_int_equal(arm->missing_count, 0);
    assert_int_equal(sbp->missing_count, kind->ranges ? 2 : 1);
    assert_string_equal(sbp->missing[0], kind->ranges ? "999" : kind->tagged);
    if (kind->ranges) {
        assert_string_equal(sbp->missing[1], "-8");
    }
}

static void reads_what_was_written(void **state) {
    (void)state;
    for (size_t i = 0; i < KINDS; i++) {
        const struct kind *kind = &kinds[i];
        struct text file, text, wanted;
        struct cells cells;
        struct fault fault;
        text_init(&file);
        text_init(&text);
        text_init(&wanted);
        write_small(&file, kind);
        if (!read_exact(&cells, file.data, file.length, kind->name, &fault)) {
            fail_msg("%s: %s", kind->name, fault.message);
        }
        show(&text, &cells);
        text_format(&wanted, "/1:|1|148.5|2026-03-14/2:10 02|2|%s|2026-03-15/3:1003|1|-8|",
            kind->tags ? kind->tagged : "999");
        assert_string_equal(text.data, wanted.data);
        assert_string_equal(cells.names[2], kind->long_names ? "SBP_26_WEEKS" : "SBP_26");
        assert_string_equal(cells.encoding, kind->word);
        assert_string_equal(cells.place, "observation");
        check_about(kind, &cells);
        cells_release(&cells);
        text_release(&file);
        text_release(&text);
        text_release(&wanted);
    }
}

/* Cut anywhere: refused with a sentence, or every record that is read is whole. Only a transport file may lose records
 * unseen, where the cut falls between two of them: the format has no count. */
static void refuses_what_is_cut_short(void **state) {
    (void)state;
    for (size_t i = 0; i < KINDS; i++) {
        struct text file;
        text_init(&file);
        write_small(&file, &kinds[i]);
        for (size_t length = 0; length < file.length; length += file.length < 6000 ? 16 : 64) {
            struct cells cells;
            struct fault fault;
            if (read_exact(&cells, file.data, length, kinds[i].name, &fault)) {
                bool no_signature = !strcmp(cells.format, "delimited text"); /* of .por it stands after 456 bytes of text */
                bool may = no_signature ? length < 520 : kinds[i].begin == readstat_begin_writing_xport ? cells.records < 3 : cells.records == 3;
                if (!may) {
                    fail_msg("%s cut at %zu of %zu: %zu records", kinds[i].name, length, file.length, cells.records);
                }
            } else {
                assert_true(fault.code == FAULT_INPUT && fault.message[0]);
            }
            cells_release(&cells);
        }
        text_release(&file);
    }
}

/* Bytes changed by chance: read or refused with a sentence, never a crash, a leak or a read beyond. */
static void stands_changed_bytes(void **state) {
    (void)state;
    uint64_t bits = 88172645463325252u;
    for (size_t i = 0; i < KINDS; i++) {
        struct text file;
        text_init(&file);
        write_small(&file, &kinds[i]);
        for (int trial = 0; trial < 1500; trial++) {
            struct cells cells;
            struct fault fault;
            char *copy = memory_grow(NULL, file.length, 1);
            memcpy(copy, file.data, file.length);
            for (int change = 0; change <= trial % 4; change++) {
                bits ^= bits << 13, bits ^= bits >> 7, bits ^= bits << 17; /* Marsaglia 2003, "Xorshift RNGs" */
                static const unsigned char telling[] = {0, 1, 0x7F, 0x80, 0xFF, ' '};
                size_t at = (size_t)(bits >> 20) % file.length;
                copy[at] = (char)(bits % 3 ? telling[bits % 6] : bits & 0xFF);
            }
            if (!read_exact(&cells, copy, file.length, kinds[i].name, &fault)) {
                if (!fault.message[0]) {
                    fail_msg("%s, trial %d: refused without a sentence", kinds[i].name, trial);
                }
            }
            cells_release(&cells);
            memory_free(copy);
        }
        text_release(&file);
    }
}

/* --- sentences ---------------------------------------------------------------------------------------------------- */

static void refuse_bytes(const char *bytes, size_t length, const char *sentence) {
    struct cells cells;
    struct fault fault;
    assert_false(read_exact(&cells, bytes, length, "t.xpt", &fault));
    assert_string_equal(fault.message, sentence);
    assert_true(cells.records == 0 && cells.columns == 0 && !cells.bytes);
}

static void refuses_transport_files_with_their_sentence(void **state) {
    (void)state;
    struct text file;
    text_init(&file);
    write_small(&file, &kinds[0]);
    size_t length = file.length;
    refuse_bytes(file.data, length - 1, "t.xpt, a transport file (.xpt): it is cut short (its length is no multiple of 80 "
        "bytes); copy or export it again and load that");
    refuse_bytes(file.data, length - 80, "t.xpt, a transport file (.xpt): it ends within a record; copy or export it again "
        "and load that");
    refuse_bytes(file.data, 240, "t.xpt, a transport file (.xpt): it is cut short or damaged and cannot be read beyond record "
        "0 (Unable to read from file); copy or export it again and load that");
    char *member = memmem(file.data, file.length, "HEADER RECORD*******MEMBER", 26);
    size_t at = (size_t)(member - file.data);
    char *again = memory_grow(NULL, length, 1);
    memcpy(again, file.data, length);
    text_append(&file, again + at, length - at);
    refuse_bytes(file.data, file.length, "t.xpt, a transport file (.xpt): it holds several data sets; write each to a file of "
        "its own and load those");
    memory_free(again);
    struct cells cells;
    struct fault fault;
    fault_init(&fault);
    assert_false(read_cells(&cells, file.data, length, "t.xpt", "Export", &fault));
    assert_string_equal(fault.message, "t.xpt is a transport file (.xpt) and has no sheets; take sheet \"Export\" out of the "
        "plan's files");
    text_release(&file);
}

/* Transport files do not say their encoding: texts that are not UTF-8 are read as Windows-1252, as delimited text is. */
static void reads_texts_of_windows_1252(void **state) {
    (void)state;
    struct text file;
    struct cells cells;
    struct fault fault;
    text_init(&file);
    write_small(&file, &kinds[0]);
    char *at = memmem(file.data, file.length, "10 02", 5);
    memcpy(at, "Ren\xE9 ", 5);
    assert_true(read_exact(&cells, file.data, file.length, "t.xpt", &fault));
    assert_string_equal(cells_at(&cells, 1, 0), "Ren\xC3\xA9");
    assert_string_equal(cells.encoding, "transport file (.xpt), version 5, Windows-1252");
    cells_release(&cells);
    at[3] = '\x81';
    refuse_bytes(file.data, file.length, "t.xpt, a transport file (.xpt): its texts are neither UTF-8 nor Windows-1252; export "
        "it again in UTF-8 and load that");
    text_release(&file);
}

/* --- the demonstration ---------------------------------------------------------------------------------------------- */

static bool shows_same(const char *text) {
    char shown[SHOWN_ROOM];
    double value;
    if (!*text) {
        return true;
    }
    if (number_read(text, '.', &value, NULL) != NUMBER_READ) {
        return false;
    }
    shown_number(shown, value);
    return !strcmp(shown, text);
}

/* A column is one of numbers where every cell is just how its number is shown; else one of texts. */
static bool is_number_column(const struct cells *cells, size_t column) {
    for (size_t r = 0; r < cells->records; r++) {
        if (!shows_same(cells_at(cells, r, column))) {
            return false;
        }
    }
    return true;
}

static void write_cells(struct text *out, const struct kind *kind, const struct cells *cells, size_t *number_columns) {
    readstat_writer_t *writer = new_writer(kind);
    bool number[32];
    for (size_t c = 0; c < cells->columns; c++) {
        number[c] = is_number_column(cells, c);
        *number_columns += number[c];
        char name[16] = "";
        for (size_t i = 0; cells->names[c][i]; i++) {
            name[i] = (char)toupper((unsigned char)cells->names[c][i]); /* one of the formats has no others */
        }
        readstat_add_variable(writer, name, number[c] ? READSTAT_TYPE_DOUBLE : READSTAT_TYPE_STRING,
            number[c] ? 0 : 24);
    }
    must(kind->begin(writer, out, (long)cells->records), kind->name);
    for (size_t r = 0; r < cells->records; r++) {
        must(readstat_begin_row(writer), kind->name);
        for (size_t c = 0; c < cells->columns; c++) {
            readstat_variable_t *variable = readstat_get_variable(writer, (int)c);
            const char *text = cells_at(cells, r, c);
            must(!number[c] ? readstat_insert_string_value(writer, variable, text)
                 : *text    ? readstat_insert_double_value(writer, variable, strtod(text, NULL))
                            : readstat_insert_missing_value(writer, variable),
                kind->name);
        }
        must(readstat_end_row(writer), kind->name);
    }
    must(readstat_end_writing(writer), kind->name);
    readstat_writer_free(writer);
}

/* Texts of fixed width cannot say spaces at their end ("M " of the demonstration): all else is the same, text for text. */
static void compare_cells(const struct kind *kind, const struct cells *got, const struct cells *wanted) {
    assert_int_equal(got->records, wanted->records);
    assert_int_equal(got->columns, wanted->columns);
    size_t trimmed = 0;
    for (size_t k = 0; k < wanted->records * wanted->columns; k++) {
        const char *text = wanted->bytes + wanted->start[k], *have = got->bytes + got->start[k];
        size_t length = strlen(text);
        while (length && text[length - 1] == ' ') {
            length--;
        }
        trimmed += text[length] == ' ';
        if (strlen(have) != length || strncmp(have, text, length) != 0) {
            fail_msg("%s, cell %zu: %s in place of %s", kind->name, k, have, text);
        }
    }
    assert_int_equal(trimmed, 1);
}

static void reads_the_demonstration_the_same(void **state) {
    (void)state;
    struct quayside quayside;
    struct cells wanted, got;
    struct fault fault;
    quayside_make(QUAYSIDE_SEED, &quayside);
    assert_true(read_exact(&wanted, quayside.export_csv.data, quayside.export_csv.length, "export.csv", &fault));
    for (size_t i = 0; i < KINDS; i++) {
        struct text file;
        size_t number_columns = 0;
        text_init(&file);
        write_cells(&file, &kinds[i], &wanted, &number_columns);
        assert_true(number_columns > 2 && number_columns < wanted.columns);
        if (!read_exact(&got, file.data, file.length, kinds[i].name, &fault)) {
            fail_msg("%s: %s", kinds[i].name, fault.message);
        }
        compare_cells(&kinds[i], &got, &wanted);
        cells_release(&got);
        text_release(&file);
    }
    cells_release(&wanted);
    quayside_release(&quayside);
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(reads_what_was_written),
        cmocka_unit_test(refuses_what_is_cut_short),
        cmocka_unit_test(refuses_transport_files_with_their_sentence),
        cmocka_unit_test(reads_texts_of_windows_1252),
        cmocka_unit_test(reads_the_demonstration_the_same),
        cmocka_unit_test(stands_changed_bytes),
    };
    return cmocka_run_group_tests_name("intake/statistical", tests, NULL, NULL);
}
