/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The one table from which the text, HTML and CSV of an exhibit are derived, so that they cannot disagree.
 *
 * Columns first, then rows, each filled from left to right; a row may stop short (the rest is empty). A table and all
 * it holds live in the arena; strings are copied. Filling past the last column is a programmer error.
 *
 *     struct table *table = table_new(arena, "Participants by arm");
 *     table_column(table, "arm", "Arm", NULL, TABLE_WORDS);
 *     table_column(table, "mean", "Mean", "mmHg", TABLE_NUMBERS);
 *     table_row(table);
 *     table_put_header(table, "A");
 *     table_put_number(table, 131.52, 1);
 */
#ifndef EVENHAND_DRAW_TABLE_H
#define EVENHAND_DRAW_TABLE_H
#include "base/memory.h"
#include "base/text.h"
#include "draw/html.h"
#include <stdbool.h>
#include <stdint.h>

enum table_alignment { TABLE_WORDS, TABLE_NUMBERS }; /* to the left, to the right */

enum table_kind { TABLE_EMPTY, TABLE_TEXT, TABLE_NUMBER, TABLE_COUNT };

struct table_cell {
    enum table_kind kind;
    const char *text;
    double number;
    int decimals;
    bool with_sign, header, emphasised;
    const char *participant, *column; /* what a click on the cell opens; NULL: nothing */
};

struct table_row {
    struct table_cell *cells; /* as many as the table has columns */
    size_t used;
    const char *group;       /* a heading over the rows that follow; such a row has no cells */
    const char *participant; /* what a click on the row opens */
    bool emphasised;
};

struct table_column {
    const char *key, *heading, *unit;
    enum table_alignment alignment;
};

struct table {
    struct arena *arena;
    const char *caption, *note;
    struct table_column *columns;
    size_t column_count, column_room;
    struct table_row *rows;
    size_t row_count, row_room;
};

struct table *table_new(struct arena *arena, const char *caption);
void table_note(struct table *table, const char *note); /* a sentence below the table */
/* key: the heading in CSV (NULL: heading and unit); unit: second line of the heading, may be NULL. */
void table_column(
    struct table *table, const char *key, const char *heading, const char *unit, enum table_alignment alignment);
void table_row(struct table *table);
void table_group(struct table *table, const char *heading); /* in CSV a first column "group" repeats it on every row */

void table_put_header(struct table *table, const char *text); /* the cell that names the row */
void table_put_text(struct table *table, const char *text);   /* NULL: as table_put_empty */
void table_put_format(struct table *table, const char *format, ...) __attribute__((format(printf, 2, 3)));
void table_put_number(struct table *table, double value, int decimals); /* NaN: as table_put_empty */
void table_put_signed(struct table *table, double value, int decimals);
void table_put_count(struct table *table, int64_t count);
void table_put_empty(struct table *table); /* an en dash to read, nothing in CSV */

/* About the cell put last, and about the row begun last. */
void table_cell_opens(struct table *table, const char *participant, const char *column);
void table_cell_emphasise(struct table *table);
void table_row_opens(struct table *table, const char *participant);
void table_row_emphasise(struct table *table);

void table_text(const struct table *table, struct text *out); /* aligned by the display width of its characters */
/* <table class="table"> with caption, scope on every header, class "number" on numeric cells; cells and rows that open
 * a participant carry data-participant (and data-column) and tabindex; rows "group" and "emphasised". */
void table_html(const struct table *table, struct html *html);
void table_csv(const struct table *table, struct text *out);
#endif
