/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "stats/order.h"
#include <math.h>
#include <stdlib.h>

static int by_value(const void *a, const void *b) {
    double x = *(const double *)a, y = *(const double *)b;
    return (x > y) - (x < y);
}

void sort_numbers(double *values, size_t n) {
    if (n > 1)
        qsort(values, n, sizeof *values, by_value);
}

double median_of_sorted(const double *sorted, size_t n) {
    if (n == 0)
        return (double)NAN;
    double upper = sorted[n / 2];
    if (n % 2 == 1)
        return upper;
    double lower = sorted[n / 2 - 1];
    return lower + 0.5 * (upper - lower);
}
