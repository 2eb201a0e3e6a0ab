/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The k-th smallest of a matrix that is too large to write down, but whose entries do not fall along any row or column
 * (all differences of two sorted samples, the medcouple's kernel): each step draws a pivot from the entries still in
 * question and counts along the staircase, so the cost is (rows + columns) log(rows * columns). After Johnson &
 * Mizoguchi 1978 (SIAM J Comput 7:147), with pivots from a fixed stream in place of medians of medians. Thread-safe;
 * the result is an entry of the matrix, whatever the pivots. */
#ifndef EVENHAND_STATS_SELECT_H
#define EVENHAND_STATS_SELECT_H
#include <stddef.h>
#include <stdint.h>

struct staircase {
    size_t rows, columns; /* at least one each */
    double (*value)(const void *context, size_t row, size_t column);
    const void *context;
};
double select_smallest(const struct staircase *matrix, uint64_t k); /* k from 0 */
double select_median(const struct staircase *matrix);               /* the mean of the middle two at an even count */
#endif
