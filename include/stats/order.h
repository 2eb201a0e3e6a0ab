/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Order: sorting and the median. Values are finite. Thread-safe, no allocation by us. */
#ifndef EVENHAND_STATS_ORDER_H
#define EVENHAND_STATS_ORDER_H
#include <stddef.h>

void sort_numbers(double *values, size_t n);             /* in place, ascending */
double median_of_sorted(const double *sorted, size_t n); /* the mean of the middle two at an even count; NaN at n = 0 */
#endif
