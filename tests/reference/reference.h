/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Reads the committed tables of data/ and values/: lines that start with # are comments, then a header, then rows of
 * plain cells without quotes. Tests run from the repository's top folder. Include after cmocka.h. */
#ifndef EVENHAND_TESTS_REFERENCE_H
#define EVENHAND_TESTS_REFERENCE_H
#include "base/memory.h"
#include "near.h"
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { TABLE_COLUMNS = 12 };

struct table {
    struct arena arena;
    size_t columns, rows;
    char *names[TABLE_COLUMNS];
    char *(*cells)[TABLE_COLUMNS];
};

static inline size_t table_split(char *line, char **cells) {
    size_t n = 0;
    line[strcspn(line, "\r\n")] = '\0';
    for (char *cell = line, *next; cell; cell = next) {
        assert_true(n < TABLE_COLUMNS);
        next = strchr(cell, ',');
        if (next)
            *next++ = '\0';
        cells[n++] = cell;
    }
    return n;
}

static inline struct table table_read(const char *path) {
    struct table table = {0};
    char line[1024];
    size_t capacity = 0;
    FILE *file = fopen(path, "r");
    if (!file)
        print_error("%s is not here: run the tests from the repository's top folder\n", path);
    assert_non_null(file);
    while (fgets(line, sizeof line, file)) {
        if (line[0] == '#')
            continue;
        char *copy = arena_text(&table.arena, line);
        if (table.columns == 0) {
            table.columns = table_split(copy, table.names);
            continue;
        }
        if (table.rows == capacity) {
            capacity = capacity ? 2 * capacity : 64;
            table.cells = memory_grow(table.cells, capacity, sizeof *table.cells);
        }
        assert_int_equal(table_split(copy, table.cells[table.rows]), table.columns);
        table.rows++;
    }
    fclose(file);
    return table;
}

static inline void table_release(struct table *table) {
    memory_free(table->cells);
    arena_release(&table->arena);
}

static inline const char *table_cell(const struct table *table, size_t row, const char *name) {
    for (size_t j = 0; j < table->columns; j++)
        if (strcmp(table->names[j], name) == 0)
            return table->cells[row][j];
    print_error("there is no column %s\n", name);
    fail();
    return NULL;
}

/* NaN for an empty cell. */
static inline double table_number(const struct table *table, size_t row, const char *name) {
    const char *cell = table_cell(table, row, name);
    return *cell ? strtod(cell, NULL) : (double)NAN;
}

/* The numbers of `column` in rows whose cell of `key` is `value` (all rows where key is NULL); in the table's arena. */
static inline double *table_numbers(
    struct table *table, const char *column, const char *key, const char *value, size_t *n) {
    double *numbers = ARENA_NEW(&table->arena, table->rows, double);
    *n = 0;
    for (size_t i = 0; i < table->rows; i++)
        if (!key || strcmp(table_cell(table, i, key), value) == 0)
            numbers[(*n)++] = table_number(table, i, column);
    return numbers;
}

static inline size_t table_wanted_row(const struct table *table, const char *name, const char *quantity) {
    for (size_t i = 0; i < table->rows; i++)
        if (strcmp(table_cell(table, i, "case"), name) == 0 && strcmp(table_cell(table, i, "quantity"), quantity) == 0)
            return i;
    print_error("there is no value %s, %s\n", name, quantity);
    fail();
    return 0;
}

static inline double table_wanted(const struct table *table, const char *name, const char *quantity) {
    return table_number(table, table_wanted_row(table, name, quantity), "value");
}

/* Compares with the committed value: gap |got - want| / max(|want|, its standard error). */
static inline void table_check(
    const struct table *table, const char *name, const char *quantity, double got, double tolerance) {
    size_t row = table_wanted_row(table, name, quantity);
    double want = table_number(table, row, "value"), error = table_number(table, row, "standard_error");
    char label[128];
    snprintf(label, sizeof label, "%s, %s", name, quantity);
    near(got, want, tolerance, isnan(error) ? 0.0 : tolerance * error, label);
}
#endif
