/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "stats/select.h"
#include "base/memory.h"
#include "stats/order.h"
#include <stdbool.h>

enum { DRAWS = 127, FEW = 1024, STEPS_MAX = 1000 };

/* What is still in question: columns from[i] .. to[i] - 1 of each row i. */
struct search {
    const struct staircase *matrix;
    size_t *from, *to, *less, *upto;
    uint64_t left;  /* entries in question */
    uint64_t below; /* entries known to come before them */
    uint64_t random;
};

static double at(const struct search *search, size_t row, size_t column) {
    return search->matrix->value(search->matrix->context, row, column);
}

static double next_uniform(struct search *search) {
    search->random = search->random * 6364136223846793005u + 1442695040888963407u; /* Knuth's MMIX generator */
    return (double)(search->random >> 11) * 0x1p-53;
}

/* An entry in question whose rank among them is likely to be near k's: a quantile of a stratified draw. */
static double draw_pivot(struct search *search, uint64_t k) {
    double draws[DRAWS], step = (double)search->left / DRAWS;
    size_t row = 0;
    uint64_t passed = 0;
    for (int d = 0; d < DRAWS; d++) {
        uint64_t place = (uint64_t)((d + next_uniform(search)) * step);
        if (place >= search->left)
            place = search->left - 1;
        while (place >= passed + (search->to[row] - search->from[row])) {
            passed += search->to[row] - search->from[row];
            row++;
        }
        draws[d] = at(search, row, search->from[row] + (size_t)(place - passed));
    }
    sort_numbers(draws, DRAWS);
    size_t rank = (size_t)((double)(k - search->below) / (double)search->left * DRAWS);
    return draws[rank < DRAWS ? rank : DRAWS - 1];
}

/* How many of each row are less than the pivot, and how many at most equal to it. */
static void count(struct search *search, double pivot, uint64_t *less, uint64_t *upto) {
    size_t columns = search->matrix->columns, a = columns, b = columns;
    *less = *upto = 0;
    for (size_t row = 0; row < search->matrix->rows; row++) {
        while (a > 0 && at(search, row, a - 1) >= pivot)
            a--;
        while (b > a && at(search, row, b - 1) > pivot)
            b--;
        *less += search->less[row] = a;
        *upto += search->upto[row] = b;
    }
}

static void narrow(struct search *search, bool keep_lower) {
    search->left = search->below = 0;
    for (size_t row = 0; row < search->matrix->rows; row++) {
        if (keep_lower && search->less[row] < search->to[row])
            search->to[row] = search->less[row] > search->from[row] ? search->less[row] : search->from[row];
        if (!keep_lower && search->upto[row] > search->from[row])
            search->from[row] = search->upto[row] < search->to[row] ? search->upto[row] : search->to[row];
        search->left += search->to[row] - search->from[row];
        search->below += search->from[row];
    }
}

static double pick_from_rest(struct search *search, uint64_t k) {
    double *rest = memory_new((size_t)search->left, sizeof *rest);
    size_t n = 0;
    for (size_t row = 0; row < search->matrix->rows; row++)
        for (size_t column = search->from[row]; column < search->to[row]; column++)
            rest[n++] = at(search, row, column);
    sort_numbers(rest, n);
    double value = rest[k - search->below];
    memory_free(rest);
    return value;
}

double select_smallest(const struct staircase *matrix, uint64_t k) {
    size_t rows = matrix->rows;
    BUG_IF(rows == 0 || matrix->columns == 0 || k >= (uint64_t)rows * matrix->columns);
    size_t *memory = memory_new(rows, 4 * sizeof *memory);
    struct search search = {matrix, memory, memory + rows, memory + 2 * rows, memory + 3 * rows,
        (uint64_t)rows * matrix->columns, 0, 20261201};
    for (size_t row = 0; row < rows; row++)
        search.to[row] = matrix->columns;
    double value = 0.0;
    bool found = false;
    for (int step = 0; step < STEPS_MAX && search.left > FEW && !found; step++) {
        uint64_t less, upto;
        value = draw_pivot(&search, k);
        count(&search, value, &less, &upto);
        found = less <= k && k < upto;
        if (!found)
            narrow(&search, k < less);
        if (k < search.below || k >= search.below + search.left)
            found = true; /* entries out of order by a rounding: the pivot is k's within one */
    }
    if (!found)
        value = pick_from_rest(&search, k);
    memory_free(memory);
    return value;
}

/* The entry of rank k - 1, given that of rank k: the same where more than one is equal, else the largest below it. */
static double before(const struct staircase *matrix, uint64_t k, double upper) {
    uint64_t less = 0;
    double largest = upper;
    size_t edge = matrix->columns;
    for (size_t row = 0; row < matrix->rows; row++) {
        while (edge > 0 && matrix->value(matrix->context, row, edge - 1) >= upper)
            edge--;
        if (edge > 0) {
            double value = matrix->value(matrix->context, row, edge - 1);
            largest = less == 0 || value > largest ? value : largest;
        }
        less += edge;
    }
    return less < k ? upper : largest;
}

double select_median(const struct staircase *matrix) {
    uint64_t n = (uint64_t)matrix->rows * matrix->columns;
    double upper = select_smallest(matrix, n / 2);
    if (n % 2 == 1)
        return upper;
    double lower = before(matrix, n / 2, upper);
    return lower + (upper - lower) / 2.0;
}
