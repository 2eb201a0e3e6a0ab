/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Bytes -> cells. Records follow RFC 4180 (Shafranovich 2005), section 2; the beyond (semicolon, tab, CR, blank lines)
 * is common practice of exports. Windows-1252 by the Unicode Consortium's CP1252.TXT. */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <cmocka.h>
#include "intake/cells.h"
#include "base/memory.h"
#include "base/text.h"
#include <stdio.h>
#include <string.h>

#define BYTES(literal) literal, sizeof(literal) - 1

struct good {
    const char *what, *bytes;
    size_t length;
    const char *shown;      /* names|..., then /line:cell|cell per record */
    const char *delimiter, *encoding;
    size_t blank_lines;
};

static const struct good goods[] = {
    {"plain", BYTES("pid,sex\n1,F\n2,M\n"), "pid|sex/2:1|F/3:2|M", "comma", "UTF-8", 0},
    {"no newline at the end", BYTES("pid,sex\n1,F\n2,M"), "pid|sex/2:1|F/3:2|M", "comma", "UTF-8", 0},
    {"CRLF", BYTES("pid,sex\r\n1,F\r\n2,M\r\n"), "pid|sex/2:1|F/3:2|M", "comma", "UTF-8", 0},
    {"CR alone", BYTES("pid,sex\r1,F\r2,M\r"), "pid|sex/2:1|F/3:2|M", "comma", "UTF-8", 0},
    {"header alone", BYTES("pid,sex"), "pid|sex", "comma", "UTF-8", 0},
    {"header alone, with newline", BYTES("pid,sex\n"), "pid|sex", "comma", "UTF-8", 0},
    {"one column", BYTES("pid\n1\n2\n"), "pid/2:1/3:2", "none (one column)", "UTF-8", 0},
    {"one column, a blank that is meant", BYTES("pid\n1\n\"\"\n2\n"), "pid/2:1/3:/4:2", "none (one column)", "UTF-8",
        0},
    {"RFC 4180 2.6: comma, newline and quote in quotes", BYTES("a,b\n\"x,\r\ny\",\"say \"\"so\"\"\"\n3,4\n"),
        "a|b/2:x,\r\ny|say \"so\"/4:3|4", "comma", "UTF-8", 0},
    {"quotes around everything", BYTES("\"a\",\"b\"\n\"1\",\"2\"\n"), "a|b/2:1|2", "comma", "UTF-8", 0},
    {"newline in a quoted name", BYTES("\"a\nb\",c\n1,2\n"), "a\nb|c/3:1|2", "comma", "UTF-8", 0},
    {"CR in quotes counts as a line", BYTES("a,b\r\"x\ry\",2\r3,4"), "a|b/2:x\ry|2/4:3|4", "comma", "UTF-8", 0},
    {"empty fields, the last too", BYTES("a,b,c\n,,\n1,,"), "a|b|c/2:||/3:1||", "comma", "UTF-8", 0},
    {"empty quoted field", BYTES("a,b\n\"\",\"\"\n"), "a|b/2:|", "comma", "UTF-8", 0},
    {"spaces are kept in cells, not around names", BYTES(" a ,\tb\n F , \n"), "a|b/2: F | ", "comma", "UTF-8", 0},
    {"a quote inside a plain field is text", BYTES("a,b\n5\" pipe,it\"s\n"), "a|b/2:5\" pipe|it\"s", "comma", "UTF-8",
        0},
    {"blank lines at every place", BYTES("\n\r\na,b\n\n1,2\n  \n3,4\n\n"), "a|b/5:1|2/7:3|4", "comma", "UTF-8", 5},
    {"blank lines by CR", BYTES("a,b\r\r1,2\r"), "a|b/3:1|2", "comma", "UTF-8", 1},
    {"space at the very end", BYTES("a,b\n1,2\n  "), "a|b/2:1|2", "comma", "UTF-8", 1},
    {"semicolon, decimal comma", BYTES("pid;bmi\n1;27,5\n2;31,0\n"), "pid|bmi/2:1|27,5/3:2|31,0", "semicolon", "UTF-8",
        0},
    {"semicolon, commas in a quoted name", BYTES("\"a,b,c\";d\n1;2\n"), "a,b,c|d/2:1|2", "semicolon", "UTF-8", 0},
    {"tab", BYTES("pid\tname\n1\tx, y\n2\t\n"), "pid|name/2:1|x, y/3:2|", "tab", "UTF-8", 0},
    {"a line of one tab is a record of two blanks", BYTES("a\tb\n\t\n"), "a|b/2:|", "tab", "UTF-8", 0},
    {"tie, the semicolon is even", BYTES("a;b,c\n1;2\n3;4\n"), "a|b,c/2:1|2/3:3|4", "semicolon", "UTF-8", 0},
    {"tie, the comma is even", BYTES("a;b,c\n1,2\n3,4\n"), "a;b|c/2:1|2/3:3|4", "comma", "UTF-8", 0},
    {"tie, both are even: comma", BYTES("a;b,c\n1,2;3\n"), "a;b|c/2:1|2;3", "comma", "UTF-8", 0},
    {"tie, last record ends in a blank", BYTES("a;b,c\n1;2\n3;"), "a|b,c/2:1|2/3:3|", "semicolon", "UTF-8", 0},
    {"a stray quote in a name hides no delimiter", BYTES("height 5\";b;c,d\n1;2;3\n"), "height 5\"|b|c,d/2:1|2|3",
        "semicolon", "UTF-8", 0},
    {"UTF-8 with its mark", BYTES("\xEF\xBB\xBFpid,n\n1,\xC3\xA9\n"), "pid|n/2:1|\xC3\xA9", "comma", "UTF-8", 0},
    {"UTF-8 without", BYTES("pid,n\n1,\xE2\x82\xAC\n"), "pid|n/2:1|\xE2\x82\xAC", "comma", "UTF-8", 0},
    {"Windows-1252", BYTES("pid,n\n1,Ren\xE9\n2,\x80\x99\n"), "pid|n/2:1|Ren\xC3\xA9/3:2|\xE2\x82\xAC\xE2\x84\xA2",
        "comma", "Windows-1252", 0},
    {"UTF-16 LE with its mark", BYTES("\xFF\xFE" "a\0,\0b\0\n\0" "1\0,\0\xE9\0"), "a|b/2:1|\xC3\xA9", "comma",
        "UTF-16, little-endian", 0},
    {"UTF-16 BE with its mark, a pair", BYTES("\xFE\xFF\0a\0,\0b\0\n\0" "1\0,\xD8\x3D\xDE\x00"),
        "a|b/2:1|\xF0\x9F\x98\x80", "comma", "UTF-16, big-endian", 0},
    {"UTF-16 LE by its pattern", BYTES("a\0,\0b\0\r\0\n\0" "1\0,\0" "2\0"), "a|b/2:1|2", "comma",
        "UTF-16, little-endian", 0},
    {"UTF-16 BE by its pattern", BYTES("\0a\0,\0b\0\n\0" "1\0,\0" "2"), "a|b/2:1|2", "comma", "UTF-16, big-endian", 0},
    {"names may be numbers where not all are", BYTES("pid,2024\n1,2\n"), "pid|2024/2:1|2", "comma", "UTF-8", 0},
};

static void show(struct text *text, const struct cells *cells) {
    for (size_t c = 0; c < cells->columns; c++) {
        text_format(text, "%s%s", c ? "|" : "", cells->names[c]);
    }
    for (size_t r = 0; r < cells->records; r++) {
        text_format(text, "/%u:", cells->line[r]);
        for (size_t c = 0; c < cells->columns; c++) {
            text_format(text, "%s%s", c ? "|" : "", cells_at(cells, r, c));
        }
    }
}

/* The bytes are given in a block of exactly their size, so that the sanitizer sees a read beyond. */
static bool read_exact(struct cells *cells, const char *bytes, size_t length, struct fault *fault) {
    fault_init(fault);
    char *copy = memory_grow(NULL, length, 1);
    memcpy(copy, bytes, length);
    bool done = cells_read(cells, copy, length, "export.csv", fault);
    memory_free(copy);
    return done;
}

static void reads_what_can_be_read(void **state) {
    (void)state;
    for (size_t i = 0; i < sizeof goods / sizeof *goods; i++) {
        const struct good *good = &goods[i];
        struct cells cells;
        struct fault fault;
        if (!read_exact(&cells, good->bytes, good->length, &fault)) {
            fail_msg("%s: %s", good->what, fault.message);
        }
        struct text text;
        text_init(&text);
        show(&text, &cells);
        if (strcmp(text.data, good->shown) || strcmp(cells.delimiter_word, good->delimiter) ||
            strcmp(cells.encoding, good->encoding) || cells.blank_lines != good->blank_lines) {
            fail_msg("%s: got %s by %s, %s, %zu blank", good->what, text.data, cells.delimiter_word, cells.encoding,
                cells.blank_lines);
        }
        for (size_t k = 0; k < cells.records * cells.columns; k++) {
            assert_int_equal(strlen(cells.bytes + cells.start[k]), cells.start[k + 1] - cells.start[k] - 1);
        }
        text_release(&text);
        cells_release(&cells);
    }
}

struct bad {
    const char *what, *bytes;
    size_t length, row, column;
    const char *sentence;
};
#define NUL_END "a NUL byte, which no text file has; export the file again as text and load that"
#define AGAIN "; mend the line or its quotes and load again"

static const struct bad bads[] = {
    {"empty", BYTES(""), 1, 1, "export.csv, line 1, column 1: the file is empty; export it again and load that"},
    {"blank lines alone", BYTES("\n \n\r\n"), 1, 1, "export.csv, line 1, column 1: no header, only blank lines; the "
        "first line must name the columns; export the file again and load that"},
    {"a mark alone", BYTES("\xEF\xBB\xBF"), 1, 1, "export.csv, line 1, column 1: no header, only blank lines; the "
        "first line must name the columns; export the file again and load that"},
    {"numbers for a header", BYTES("1,2.5,3\n4,5,6\n"), 1, 1, "export.csv, line 1, column 1: no header: the first line "
        "holds only numbers; put a line with the columns' names above it and load again"},
    {"too few", BYTES("a,b,c\n1,2,3\n4,5\n"), 3, 2,
        "export.csv, line 3, column 2: 2 fields where the header has 3" AGAIN},
    {"too many", BYTES("a,b\n1,2\n4,5,6,7\n"), 3, 3,
        "export.csv, line 3, column 3: 4 fields where the header has 2" AGAIN},
    {"one field", BYTES("a,b\nx\n"), 2, 1, "export.csv, line 2, column 1: 1 field where the header has 2" AGAIN},
    {"a comma where the header has one column", BYTES("pid\n\"a\"\nx\ny,z\n"), 4, 2,
        "export.csv, line 4, column 2: 2 fields where the header has 1" AGAIN},
    {"too few, after a record of two lines", BYTES("a,b\n\"x\ny\",2\n\n3\n"), 5, 1,
        "export.csv, line 5, column 1: 1 field where the header has 2" AGAIN},
    {"a comma too many at the end", BYTES("a,b\n1,2,\n"), 2, 3,
        "export.csv, line 2, column 3: 3 fields where the header has 2" AGAIN},
    {"unclosed quote", BYTES("a,b\n1,\"x\n2,y\n3,z\n"), 2, 2, "export.csv, line 2, column 2: the quote opened here is "
        "never closed; close it or take it out and load again"},
    {"unclosed quote in the header", BYTES("\"a,b\n1,2\n"), 1, 1, "export.csv, line 1, column 1: the quote opened here "
        "is never closed; close it or take it out and load again"},
    {"a quote as the last byte", BYTES("a,b\n1,\""), 2, 2, "export.csv, line 2, column 2: the quote opened here is "
        "never closed; close it or take it out and load again"},
    {"text after a closing quote", BYTES("a,b\n1,\"x\"y\n"), 2, 2, "export.csv, line 2, column 2: text after a closing "
        "quote; a quote inside a quoted field is written twice; mend the line and load again"},
    {"space after a closing quote", BYTES("a,b\n\"x\" ,1\n"), 2, 1, "export.csv, line 2, column 1: text after a "
        "closing quote; a quote inside a quoted field is written twice; mend the line and load again"},
    {"NUL in a cell", BYTES("a,b\n1,2\n1,x\0y\n"), 3, 2, "export.csv, line 3, column 2: " NUL_END},
    {"NUL in a quoted cell", BYTES("a,b\n\"x\n\0\",2\n"), 3, 1, "export.csv, line 3, column 1: " NUL_END},
    {"NUL in the header", BYTES("a,b\0\n1,2\n"), 1, 2, "export.csv, line 1, column 2: " NUL_END},
    {"NUL in UTF-16", BYTES("\xFF\xFE" "a\0,\0b\0\n\0" "1\0,\0\0\0"), 2, 2, "export.csv, line 2, column 2: " NUL_END},
    {"empty name", BYTES("a,,c\n1,2,3\n"), 1, 2, "export.csv, line 1, column 2: this column has no name in the header; "
        "give it one and load again"},
    {"name of spaces", BYTES("\n\na,  \n1,2\n"), 3, 2, "export.csv, line 3, column 2: this column has no name in the "
        "header; give it one and load again"},
    {"comma at the header's end", BYTES("a,b,\n1,2,\n"), 1, 3, "export.csv, line 1, column 3: this column has no name "
        "in the header; give it one and load again"},
    {"name twice", BYTES("pid,sbp,sbp\n1,2,3\n"), 1, 3, "export.csv, line 1, column 3: the name sbp stands in column 2 "
        "already; give each column a name of its own and load again"},
    {"name twice once trimmed", BYTES("sbp, sbp\n1,2\n"), 1, 2, "export.csv, line 1, column 2: the name sbp stands in "
        "column 1 already; give each column a name of its own and load again"},
    {"not UTF-8 after its mark", BYTES("\xEF\xBB\xBFpid\n1\xE9\n"), 2, 2, "export.csv, line 2, byte 2: the file's "
        "first bytes say UTF-8, but this byte is not UTF-8; save the file as UTF-8 and load that"},
    {"neither UTF-8 nor Windows-1252", BYTES("a,b\r\n1,\xE9\x81\n"), 2, 4, "export.csv, line 2, byte 4: a byte that "
        "neither UTF-8 nor Windows-1252 explains; save the file as UTF-8 and load that"},
    {"UTF-16, odd", BYTES("\xFF\xFE" "a\0\n\0b"), 2, 1, "export.csv, line 2, byte 1: half a character of UTF-16 at the "
        "end of the file; save the file as UTF-8 and load that"},
    {"UTF-16, half a pair", BYTES("\xFE\xFF\0a\0\r\0\n\xDC\0\0b"), 2, 1, "export.csv, line 2, byte 1: half of a UTF-16 "
        "pair without its other half; save the file as UTF-8 and load that"},
};

static void refuses_with_its_sentence(void **state) {
    (void)state;
    for (size_t i = 0; i < sizeof bads / sizeof *bads; i++) {
        const struct bad *bad = &bads[i];
        struct cells cells;
        struct fault fault;
        if (read_exact(&cells, bad->bytes, bad->length, &fault)) {
            fail_msg("%s: was read", bad->what);
        }
        if (fault.code != FAULT_INPUT || fault.row != bad->row || fault.column != bad->column ||
            strcmp(fault.message, bad->sentence)) {
            fail_msg("%s: got (%zu, %zu) %s", bad->what, fault.row, fault.column, fault.message);
        }
        assert_true(cells.records == 0 && cells.columns == 0 && !cells.bytes);
    }
}

/* Any prefix of any good file is read or refused with a sentence, and never read beyond. */
static void stands_any_prefix(void **state) {
    (void)state;
    for (size_t i = 0; i < sizeof goods / sizeof *goods; i++) {
        for (size_t length = 0; length < goods[i].length; length++) {
            struct cells cells;
            struct fault fault;
            bool done = read_exact(&cells, goods[i].bytes, length, &fault);
            assert_true(done || fault.message[0]);
            cells_release(&cells);
        }
    }
}

/* Any byte of any good file replaced by each byte with a meaning: read or refused with its place, never read beyond. */
static void stands_any_byte(void **state) {
    (void)state;
    static const unsigned char bytes[] = {0, '"', ',', ';', '\t', '\n', '\r', ' ', '7', 0x80,
        0x81, 0xC3, 0xD8, 0xFE, 0xFF};
    for (size_t i = 0; i < sizeof goods / sizeof *goods; i++) {
        char *copy = memory_grow(NULL, goods[i].length, 1);
        memcpy(copy, goods[i].bytes, goods[i].length);
        for (size_t at = 0; at < goods[i].length; at++) {
            for (size_t b = 0; b < sizeof bytes; b++) {
                struct cells cells;
                struct fault fault;
                copy[at] = (char)bytes[b];
                if (!read_exact(&cells, copy, goods[i].length, &fault)) {
                    assert_true(fault.row > 0 && fault.column > 0 && strstr(fault.message, "export.csv, line "));
                } else if (cells.records) {
                    assert_int_equal(strlen(cells_at(&cells, cells.records - 1, cells.columns - 1)) + 1,
                        cells.start[cells.records * cells.columns] - cells.start[cells.records * cells.columns - 1]);
                }
                cells_release(&cells);
            }
            copy[at] = goods[i].bytes[at];
        }
        memory_free(copy);
    }
}

/* A text on one endless line is no table: 3,000 names. */
static void refuses_too_many_columns(void **state) {
    (void)state;
    struct text text;
    text_init(&text);
    for (int c = 0; c < 3000; c++) {
        text_format(&text, "%sv%d", c ? "," : "", c);
    }
    struct cells cells;
    struct fault fault;
    assert_false(read_exact(&cells, text.data, text.length, &fault));
    assert_string_equal(fault.message, "export.csv, line 1, column 2000: more than 1999 columns, the most a study "
        "takes; take out what the plan does not need and load again");
    text_release(&text);
}

/* What is written by RFC 4180 reads back as it was, whatever it holds. */
static void reads_back_what_was_written(void **state) {
    (void)state;
    static const char *const pieces[] = {"", "x", ",", "\"", "\n", "\r\n", ";", " ", "\t", "\xC3\xA9", "12.5"};
    enum { RECORDS = 200, COLUMNS = 7, PIECES = sizeof pieces / sizeof *pieces };
    struct text file, cell;
    text_init(&file);
    text_init(&cell);
    text_literal(&file, "a,b,c,d,e,f,g\r\n");
    static char wanted[RECORDS * COLUMNS][32];
    unsigned seed = 1;
    for (size_t k = 0; k < RECORDS * COLUMNS; k++) {
        text_literal(&file, "\"");
        for (int p = 0; p < 4; p++) {
            seed = seed * 1103515245u + 12345u; /* the generator of the C standard's example, 7.22.2 */
            const char *piece = pieces[(seed >> 16) % PIECES];
            strcat(wanted[k], piece);
            text_string(&file, strcmp(piece, "\"") ? piece : "\"\"");
        }
        text_string(&file, k % COLUMNS == COLUMNS - 1 ? "\"\r\n" : "\",");
    }
    struct cells cells;
    struct fault fault;
    assert_true(read_exact(&cells, file.data, file.length, &fault));
    assert_int_equal(cells.records, RECORDS);
    for (size_t k = 0; k < RECORDS * COLUMNS; k++) {
        assert_string_equal(cells_at(&cells, k / COLUMNS, k % COLUMNS), wanted[k]);
    }
    assert_int_equal(cells_column(&cells, "g"), 6);
    assert_true(cells_column(&cells, "G") == SIZE_MAX);
    cells_release(&cells);
    text_release(&file);
    text_release(&cell);
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(reads_what_can_be_read),
        cmocka_unit_test(refuses_with_its_sentence),
        cmocka_unit_test(stands_any_prefix),
        cmocka_unit_test(stands_any_byte),
        cmocka_unit_test(refuses_too_many_columns),
        cmocka_unit_test(reads_back_what_was_written),
    };
    return cmocka_run_group_tests_name("intake/cells", tests, NULL, NULL);
}
