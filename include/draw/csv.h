/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A writer of comma-separated values after RFC 4180, with LF as the line's end. A field with a comma, a quote, a
 * line's end or a blank at either side is quoted. Numbers are exact (number_exact), with a point and the ASCII minus.
 * Nothing is put before a text that a spreadsheet might take for a formula: the file says what the data say. */
#ifndef EVENHAND_DRAW_CSV_H
#define EVENHAND_DRAW_CSV_H
#include "base/text.h"
#include <stdbool.h>
#include <stdint.h>

struct csv {
    struct text *out;
    bool started; /* the row has a field already */
};

void csv_init(struct csv *csv, struct text *out);
void csv_string(struct csv *csv, const char *value); /* NULL is an empty field */
void csv_number(struct csv *csv, double value);      /* NaN and infinities are empty fields */
void csv_integer(struct csv *csv, int64_t value);
void csv_end(struct csv *csv); /* ends the row */
#endif
