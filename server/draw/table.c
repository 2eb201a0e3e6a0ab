/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "draw/table.h"
#include "draw/csv.h"
#include "draw/number.h"
#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <string.h>

struct table *table_new(struct arena *arena, const char *caption) {
    struct table *table = ARENA_NEW(arena, 1, struct table);
    table->arena = arena;
    table->caption = arena_text(arena, caption);
    return table;
}

void table_note(struct table *table, const char *note) {
    table->note = arena_text(table->arena, note);
}

/* Room in the arena for one more; what was there moves, the old place stays until the arena goes. */
static void *grown(struct arena *arena, void *old, size_t count, size_t *room, size_t size) {
    if (count < *room) {
        return old;
    }
    *room = *room ? *room * 2 : 8;
    void *larger = arena_new(arena, *room, size);
    if (count) {
        memcpy(larger, old, count * size);
    }
    return larger;
}

void table_column(
    struct table *table, const char *key, const char *heading, const char *unit, enum table_alignment alignment) {
    BUG_IF(table->row_count != 0);
    table->columns =
        grown(table->arena, table->columns, table->column_count, &table->column_room, sizeof *table->columns);
    table->columns[table->column_count++] = (struct table_column){
        .key = arena_text(table->arena, key),
        .heading = arena_text(table->arena, heading ? heading : ""),
        .unit = arena_text(table->arena, unit),
        .alignment = alignment,
    };
}

static struct table_row *add_row(struct table *table) {
    BUG_IF(table->column_count == 0);
    table->rows = grown(table->arena, table->rows, table->row_count, &table->row_room, sizeof *table->rows);
    struct table_row *row = &table->rows[table->row_count++];
    *row = (struct table_row){0};
    return row;
}

void table_row(struct table *table) {
    struct table_row *row = add_row(table);
    row->cells = ARENA_NEW(table->arena, table->column_count, struct table_cell);
}

void table_group(struct table *table, const char *heading) {
    struct table_row *row = add_row(table);
    row->group = arena_text(table->arena, heading ? heading : "");
}

static struct table_row *last_row(struct table *table) {
    BUG_IF(table->row_count == 0);
    return &table->rows[table->row_count - 1];
}

static struct table_cell *next_cell(struct table *table) {
    struct table_row *row = last_row(table);
    BUG_IF(row->group || row->used == table->column_count);
    return &row->cells[row->used++];
}

static struct table_cell *last_cell(struct table *table) {
    struct table_row *row = last_row(table);
    BUG_IF(row->group || row->used == 0);
    return &row->cells[row->used - 1];
}

void table_put_text(struct table *table, const char *text) {
    struct table_cell *cell = next_cell(table);
    if (text) {
        cell->kind = TABLE_TEXT;
        cell->text = arena_text(table->arena, text);
    }
}

void table_put_header(struct table *table, const char *text) {
    table_put_text(table, text ? text : "");
    last_cell(table)->header = true;
}

void table_put_format(struct table *table, const char *format, ...) {
    char *text = NULL;
    va_list arguments;
    va_start(arguments, format);
    int length = vasprintf(&text, format, arguments);
    va_end(arguments);
    BUG_IF(length < 0);
    table_put_text(table, text);
    memory_free(text);
}

static void put_value(struct table *table, double value, int decimals, bool with_sign) {
    struct table_cell *cell = next_cell(table);
    if (!isnan(value)) {
        cell->kind = TABLE_NUMBER;
        cell->number = value;
        cell->decimals = decimals;
        cell->with_sign = with_sign;
    }
}

void table_put_number(struct table *table, double value, int decimals) {
    put_value(table, value, decimals, false);
}

void table_put_signed(struct table *table, double value, int decimals) {
    put_value(table, value, decimals, true);
}

void table_put_count(struct table *table, int64_t count) {
    struct table_cell *cell = next_cell(table);
    cell->kind = TABLE_COUNT;
    cell->number = (double)count;
}

void table_put_empty(struct table *table) {
    next_cell(table);
}

void table_cell_opens(struct table *table, const char *participant, const char *column) {
    struct table_cell *cell = last_cell(table);
    cell->participant = arena_text(table->arena, participant);
    cell->column = arena_text(table->arena, column);
}

void table_cell_emphasise(struct table *table) {
    last_cell(table)->emphasised = true;
}

void table_row_opens(struct table *table, const char *participant) {
    last_row(table)->participant = arena_text(table->arena, participant);
}

void table_row_emphasise(struct table *table) {
    last_row(table)->emphasised = true;
}

/* What a person reads in the cell. */
static void cell_shown(const struct table_cell *cell, struct text *out) {
    switch (cell->kind) {
    case TABLE_EMPTY:
        text_literal(out, "\u2013");
        break;
    case TABLE_TEXT:
        text_string(out, cell->text);
        break;
    case TABLE_NUMBER:
        number_shown(out, cell->number, cell->decimals, cell->with_sign);
        break;
    case TABLE_COUNT:
        number_shown(out, cell->number, 0, false);
        break;
    }
}

/* ---- text ---- */

static void pad(struct text *out, size_t columns) {
    while (columns--) {
        text_char(out, ' ');
    }
}

static void aligned(struct text *out, const char *string, size_t width, enum table_alignment alignment, bool last) {
    size_t used = number_columns(string), rest = width > used ? width - used : 0;
    if (alignment == TABLE_NUMBERS) {
        pad(out, rest);
    }
    /* A line's end inside a value would break the row: a blank stands for it. */
    for (const char *at = string; *at; at++) {
        text_char(out, *at == '\n' || *at == '\r' || *at == '\t' ? ' ' : *at);
    }
    if (alignment == TABLE_WORDS && !last) {
        pad(out, rest);
    }
}

static size_t larger(size_t a, size_t b) {
    return a > b ? a : b;
}

static size_t *column_widths(const struct table *table) {
    size_t *widths = memory_new(table->column_count, sizeof *widths);
    struct text shown;
    text_init(&shown);
    for (size_t c = 0; c < table->column_count; c++) {
        const struct table_column *column = &table->columns[c];
        widths[c] = larger(number_columns(column->heading), column->unit ? number_columns(column->unit) : 0);
        for (size_t r = 0; r < table->row_count; r++) {
            if (!table->rows[r].group) {
                text_clear(&shown);
                cell_shown(&table->rows[r].cells[c], &shown);
                widths[c] = larger(widths[c], number_columns(shown.data));
            }
        }
    }
    text_release(&shown);
    return widths;
}

static void trim_line(struct text *out) {
    while (out->length && out->data[out->length - 1] == ' ') {
        out->data[--out->length] = '\0';
    }
    text_literal(out, "\n");
}

static void text_heading(const struct table *table, const size_t *widths, struct text *out) {
    bool units = false;
    for (size_t c = 0; c < table->column_count; c++) {
        const struct table_column *column = &table->columns[c];
        text_string(out, c ? "  " : "");
        aligned(out, column->heading, widths[c], column->alignment, c + 1 == table->column_count);
        units = units || column->unit;
    }
    trim_line(out);
    for (size_t c = 0; units && c < table->column_count; c++) {
        const struct table_column *column = &table->columns[c];
        text_string(out, c ? "  " : "");
        aligned(out, column->unit ? column->unit : "", widths[c], column->alignment, c + 1 == table->column_count);
    }
    if (units) {
        trim_line(out);
    }
    for (size_t c = 0; c < table->column_count; c++) {
        text_string(out, c ? "  " : "");
        for (size_t i = 0; i < widths[c]; i++) {
            text_literal(out, "\u2500");
        }
    }
    trim_line(out);
}

void table_text(const struct table *table, struct text *out) {
    if (table->caption) {
        text_string(out, table->caption);
        text_literal(out, "\n\n");
    }
    size_t *widths = column_widths(table);
    text_heading(table, widths, out);
    struct text shown;
    text_init(&shown);
    for (size_t r = 0; r < table->row_count; r++) {
        const struct table_row *row = &table->rows[r];
        if (row->group) {
            text_string(out, r ? "\n" : "");
            text_string(out, row->group);
            text_literal(out, "\n");
            continue;
        }
        for (size_t c = 0; c < table->column_count; c++) {
            text_clear(&shown);
            cell_shown(&row->cells[c], &shown);
            text_string(out, c ? "  " : "");
            aligned(out, shown.data, widths[c], table->columns[c].alignment, c + 1 == table->column_count);
        }
        trim_line(out);
    }
    text_release(&shown);
    memory_free(widths);
    if (table->note) {
        text_literal(out, "\n");
        text_string(out, table->note);
        text_literal(out, "\n");
    }
}

/* ---- html ---- */

static const char *cell_class(const struct table_cell *cell, enum table_alignment alignment) {
    bool number = alignment == TABLE_NUMBERS;
    if (cell->emphasised) {
        return number ? "number emphasised" : "emphasised";
    }
    return number ? "number" : NULL;
}

static void opens(struct html *html, const char *participant, const char *column) {
    if (participant) {
        html_attribute(html, "data-participant", participant);
        html_attribute(html, "data-column", column);
        html_attribute(html, "tabindex", "0");
    }
}

static void html_heading(const struct table *table, struct html *html) {
    html_open(html, "thead");
    html_open(html, "tr");
    for (size_t c = 0; c < table->column_count; c++) {
        const struct table_column *column = &table->columns[c];
        html_open(html, "th");
        html_attribute(html, "scope", "col");
        html_attribute(html, "class", column->alignment == TABLE_NUMBERS ? "number" : NULL);
        html_text(html, column->heading);
        if (column->unit) {
            html_text(html, " ");
            html_element(html, "span", "unit", column->unit);
        }
        html_close(html);
    }
    html_close(html);
    html_close(html);
}

static void html_row(const struct table *table, const struct table_row *row, struct html *html) {
    struct text shown;
    text_init(&shown);
    html_open(html, "tr");
    html_attribute(html, "class", row->emphasised ? "emphasised" : NULL);
    opens(html, row->participant, NULL);
    for (size_t c = 0; c < table->column_count; c++) {
        const struct table_cell *cell = &row->cells[c];
        html_open(html, cell->header ? "th" : "td");
        html_attribute(html, "scope", cell->header ? "row" : NULL);
        html_attribute(html, "class", cell_class(cell, table->columns[c].alignment));
        opens(html, cell->participant, cell->column);
        text_clear(&shown);
        cell_shown(cell, &shown);
        html_text(html, shown.data);
        html_close(html);
    }
    html_close(html);
    text_release(&shown);
}

static void html_group(const struct table *table, const struct table_row *row, struct html *html) {
    struct text span;
    text_init(&span);
    text_format(&span, "%zu", table->column_count);
    html_open(html, "tr");
    html_attribute(html, "class", "group");
    html_open(html, "th");
    html_attribute(html, "scope", "colgroup");
    html_attribute(html, "colspan", span.data);
    html_text(html, row->group);
    html_close(html);
    html_close(html);
    text_release(&span);
}

void table_html(const struct table *table, struct html *html) {
    html_open(html, "table");
    html_attribute(html, "class", "table");
    if (table->caption) {
        html_element(html, "caption", NULL, table->caption);
    }
    html_heading(table, html);
    html_open(html, "tbody");
    for (size_t r = 0; r < table->row_count; r++) {
        if (table->rows[r].group) {
            html_group(table, &table->rows[r], html);
        } else {
            html_row(table, &table->rows[r], html);
        }
    }
    html_close(html);
    html_close(html);
    if (table->note) {
        html_element(html, "p", "table-note", table->note);
    }
}

/* ---- csv ---- */

static void csv_heading(const struct table *table, bool grouped, struct csv *csv) {
    struct text name;
    text_init(&name);
    if (grouped) {
        csv_string(csv, "group");
    }
    for (size_t c = 0; c < table->column_count; c++) {
        const struct table_column *column = &table->columns[c];
        text_clear(&name);
        text_string(&name, column->key ? column->key : column->heading);
        if (!column->key && column->unit) {
            text_format(&name, " (%s)", column->unit);
        }
        csv_string(csv, name.data);
    }
    csv_end(csv);
    text_release(&name);
}

static void csv_cell(const struct table_cell *cell, struct csv *csv) {
    switch (cell->kind) {
    case TABLE_EMPTY:
        csv_string(csv, NULL);
        break;
    case TABLE_TEXT:
        csv_string(csv, cell->text);
        break;
    case TABLE_NUMBER:
    case TABLE_COUNT:
        csv_number(csv, cell->number);
        break;
    }
}

void table_csv(const struct table *table, struct text *out) {
    struct csv csv;
    csv_init(&csv, out);
    bool grouped = false;
    for (size_t r = 0; r < table->row_count; r++) {
        grouped = grouped || table->rows[r].group;
    }
    csv_heading(table, grouped, &csv);
    const char *group = NULL;
    for (size_t r = 0; r < table->row_count; r++) {
        const struct table_row *row = &table->rows[r];
        if (row->group) {
            group = row->group;
            continue;
        }
        if (grouped) {
            csv_string(&csv, group);
        }
        for (size_t c = 0; c < table->column_count; c++) {
            csv_cell(&row->cells[c], &csv);
        }
        csv_end(&csv);
    }
}
