/* SPDX-License-Identifier: GPL-3.0-or-later */
/* One table, three renderings. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <cmocka.h>

#include "draw/number.h"
#include "draw/table.h"
#include <math.h>
#include <string.h>

static struct table *example(struct arena *arena) {
    struct table *table = table_new(arena, "Change by arm");
    table_column(table, "arm", "Arm", NULL, TABLE_WORDS);
    table_column(table, NULL, "n", NULL, TABLE_NUMBERS);
    table_column(table, NULL, "Mean", "mmHg", TABLE_NUMBERS);
    table_column(table, "note", "Note", NULL, TABLE_WORDS);
    table_note(table, "Change is 26 weeks minus baseline.");
    table_group(table, "Femme, na\u00efve");
    table_row(table);
    table_put_header(table, "A");
    table_put_count(table, 61);
    table_put_signed(table, -9.8765, 1);
    table_cell_opens(table, "Q2673", "pressure_26");
    table_row(table);
    table_row_emphasise(table);
    table_row_opens(table, "Q\"1");
    table_put_header(table, "\u6771\u4eac");
    table_put_count(table, 1056);
    table_put_signed(table, 2.25, 1);
    table_put_text(table, "a, b <c>");
    table_group(table, "Male");
    table_row(table);
    table_put_header(table, "e\u0301t\u00e9");
    table_put_empty(table);
    table_put_number(table, NAN, 1);
    table_put_format(table, "%d of %d", 0, 3);
    table_cell_emphasise(table);
    return table;
}

static void test_text(void **state) {
    (void)state;
    struct arena arena;
    arena_init(&arena);
    struct text out;
    text_init(&out);
    table_text(example(&arena), &out);
    assert_string_equal(out.data, "Change by arm\n"
                                  "\n"
                                  "Arm      n  Mean  Note\n"
                                  "            mmHg\n"
                                  "────  ────  ────  ────────\n"
                                  "Femme, na\u00efve\n"
                                  "A       61  \u22129.9  \u2013\n"
                                  "\u6771\u4eac  1056  +2.2  a, b <c>\n"
                                  "\n"
                                  "Male\n"
                                  "e\u0301t\u00e9      \u2013     \u2013  0 of 3\n"
                                  "\n"
                                  "Change is 26 weeks minus baseline.\n");
    text_release(&out);
    arena_release(&arena);
}

static void test_csv(void **state) {
    (void)state;
    struct arena arena;
    arena_init(&arena);
    struct text out;
    text_init(&out);
    table_csv(example(&arena), &out);
    assert_string_equal(out.data, "group,arm,n,Mean (mmHg),note\n"
                                  "\"Femme, na\u00efve\",A,61,-9.8765,\n"
                                  "\"Femme, na\u00efve\",\u6771\u4eac,1056,2.25,\"a, b <c>\"\n"
                                  "Male,e\u0301t\u00e9,,,0 of 3\n");
    text_release(&out);
    arena_release(&arena);
}

static void test_html(void **state) {
    (void)state;
    struct arena arena;
    arena_init(&arena);
    struct text out;
    text_init(&out);
    struct html html;
    html_init(&html, &out);
    table_html(example(&arena), &html);
    html_finish(&html);
    assert_string_equal(out.data,
        "<table class=\"table\"><caption>Change by arm</caption><thead><tr>"
        "<th scope=\"col\">Arm</th><th scope=\"col\" class=\"number\">n</th>"
        "<th scope=\"col\" class=\"number\">Mean <span class=\"unit\">mmHg</span></th><th "
        "scope=\"col\">Note</th></tr></thead>"
        "<tbody><tr class=\"group\"><th scope=\"colgroup\" colspan=\"4\">Femme, na\u00efve</th></tr>"
        "<tr><th scope=\"row\">A</th><td class=\"number\">61</td>"
        "<td class=\"number\" data-participant=\"Q2673\" data-column=\"pressure_26\" "
        "tabindex=\"0\">\u22129.9</td><td>\u2013</td></tr>"
        "<tr class=\"emphasised\" data-participant=\"Q&quot;1\" tabindex=\"0\"><th scope=\"row\">\u6771\u4eac</th>"
        "<td class=\"number\">1056</td><td class=\"number\">+2.2</td><td>a, b &lt;c&gt;</td></tr>"
        "<tr class=\"group\"><th scope=\"colgroup\" colspan=\"4\">Male</th></tr>"
        "<tr><th scope=\"row\">e\u0301t\u00e9</th><td class=\"number\">\u2013</td><td class=\"number\">\u2013</td>"
        "<td class=\"emphasised\">0 of 3</td></tr></tbody></table>"
        "<p class=\"table-note\">Change is 26 weeks minus baseline.</p>");
    text_release(&out);
    arena_release(&arena);
}

/* Many rows: every line of the body is as wide as the ruled line, whatever the growth of the arrays. */
static void test_many_rows(void **state) {
    (void)state;
    struct arena arena;
    arena_init(&arena);
    struct table *table = table_new(&arena, NULL);
    for (int c = 0; c < 20; c++) {
        table_column(table, NULL, "x", NULL, TABLE_NUMBERS);
    }
    for (int r = 0; r < 500; r++) {
        table_row(table);
        for (int c = 0; c < 20; c++) {
            table_put_number(table, (r - 250) * pow(10.0, c % 5), c % 3);
        }
    }
    struct text out;
    text_init(&out);
    table_text(table, &out);
    size_t lines = 0, width = 0;
    for (char *line = strtok(out.data, "\n"); line; line = strtok(NULL, "\n"), lines++) {
        width = width ? width : number_columns(line);
        assert_int_equal(number_columns(line), width);
    }
    assert_int_equal(lines, 502);
    text_release(&out);
    arena_release(&arena);
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_text),
        cmocka_unit_test(test_csv),
        cmocka_unit_test(test_html),
        cmocka_unit_test(test_many_rows),
    };
    return cmocka_run_group_tests_name("draw/table", tests, NULL, NULL);
}
