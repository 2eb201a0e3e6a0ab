/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The one growable text: always NUL-terminated, length known, data never NULL after text_init.
 * Escaping for a format lives in draw/ (html, svg, json, csv) and nowhere else. Never keep a pointer into
 * `data` across an append. */
#ifndef EVENHAND_BASE_TEXT_H
#define EVENHAND_BASE_TEXT_H
#include <stdbool.h>
#include <stddef.h>

struct text {
    char *data;
    size_t length, capacity;
};

void text_init(struct text *text);
void text_release(struct text *text);
void text_clear(struct text *text);
/* Takes string literals only: anything else does not compile. */
#define text_literal(text, literal) text_append((text), "" literal "", sizeof(literal) - 1)
void text_append(struct text *text, const char *bytes, size_t length);
void text_string(struct text *text, const char *string); /* NULL appends nothing */
void text_char(struct text *text, char c);
void text_format(struct text *text, const char *format, ...) __attribute__((format(printf, 2, 3)));
/* Hands the bytes over: the caller frees them with memory_free; the text is as after text_init. */
char *text_take(struct text *text);
/* The number with exactly `decimals` places, U+2212 as minus, never "-0.0"; NaN gives an en dash. */
void text_decimal(struct text *text, double value, int decimals);
/* The same with a plus sign before a positive number. */
void text_signed(struct text *text, double value, int decimals);
/* p as the trade prints it: two significant digits, three decimals at most, "<0.001" below; NaN gives an en dash. */
void text_p_value(struct text *text, double p);
#endif
