/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Numbers and words as every writer of draw/ needs them. Assumes the C locale, as the whole program does. */
#ifndef EVENHAND_DRAW_NUMBER_H
#define EVENHAND_DRAW_NUMBER_H
#include "base/text.h"
#include <stdbool.h>
#include <stddef.h>

/* 15, 16 or 17 significant digits, the fewest that read back as the same double, trailing zeros dropped ("%.17g" at
 * worst); whole numbers below 2^53 without exponent; the minus is the ASCII hyphen. value must be finite. */
void number_exact(struct text *out, double value);
/* For a person: fixed decimals, true minus, and when with_sign a plus before positive numbers. NaN gives an en dash;
 * from 1e12 on it is number_powers. */
void number_shown(struct text *out, double value, int decimals, bool with_sign);
/* "2×10⁹", up to six digits before the power; value finite and not 0. */
void number_powers(struct text *out, double value, bool with_sign);
/* Decimals that show every digit of a step or of data recorded to that step: 5 -> 0, 0.25 -> 2; at most 8. */
int number_decimals(double step);

/* Columns a terminal needs for a UTF-8 string (libunistring's uniwidth; broken bytes count one each). */
size_t number_columns(const char *string);
/* An upper estimate of the width of a string set at `size` units in the widest of the usual sans-serif fonts,
 * never less than 0.6 em for each column. */
double number_width(const char *string, double size, bool bold);
#endif
