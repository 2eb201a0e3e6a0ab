/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "stats/describe.h"
#include "stats/distributions.h"
#include "stats/order.h"
#include "stats/select.h"
#include <math.h>
#include <stdbool.h>
#include <string.h>

/* Sums run in extended precision: range for cubes of any double, and three more digits. */
typedef long double wide;
static const double none = (double)NAN;

double *sorted_copy(struct arena *arena, const double *values, size_t n) {
    double *copy = ARENA_NEW(arena, n ? n : 1, double);
    if (n > 0)
        memcpy(copy, values, n * sizeof *copy);
    sort_numbers(copy, n);
    return copy;
}

double quantile(const double *sorted, size_t n, double probability) {
    BUG_IF(!(probability >= 0.0 && probability <= 1.0));
    if (n == 0)
        return none;
    double place = (double)(n - 1) * probability, whole = floor(place), part = place - whole;
    size_t below = (size_t)whole;
    if (below + 1 >= n)
        return sorted[n - 1];
    return part == 0.0 ? sorted[below] : sorted[below] + part * (sorted[below + 1] - sorted[below]);
}

struct moments {
    wide mean, m2, m3; /* about the mean, divisor n */
};

static struct moments moments_of(const double *values, size_t n) {
    wide sum = 0.0L, rest = 0.0L, squares = 0.0L, cubes = 0.0L, count = (wide)n;
    for (size_t i = 0; i < n; i++)
        sum += (wide)values[i];
    wide mean = sum / count;
    for (size_t i = 0; i < n; i++)
        rest += (wide)values[i] - mean;
    mean += rest / count;
    for (size_t i = 0; i < n; i++) {
        wide off = (wide)values[i] - mean, square = off * off;
        squares += square;
        cubes += square * off;
    }
    return (struct moments){mean, squares / count, cubes / count};
}

struct description describe(const double *sorted, size_t n) {
    struct description d = {n, none, none, none, none, none, none, none, none};
    if (n == 0)
        return d;
    struct moments moments = moments_of(sorted, n);
    bool varies = sorted[0] < sorted[n - 1];
    d.mean = varies ? (double)moments.mean : sorted[0];
    if (n > 1)
        d.sd = varies ? (double)sqrtl(moments.m2 * (wide)n / (wide)(n - 1)) : 0.0;
    if (varies)
        d.skewness = (double)(moments.m3 / (moments.m2 * sqrtl(moments.m2)));
    d.minimum = sorted[0];
    d.lower_quartile = quantile(sorted, n, 0.25);
    d.median = quantile(sorted, n, 0.5);
    d.upper_quartile = quantile(sorted, n, 0.75);
    d.maximum = sorted[n - 1];
    return d;
}

static struct interval about_box(const double *sorted, size_t n, double below, double above) {
    if (n == 0)
        return (struct interval){none, none};
    double lower = quantile(sorted, n, 0.25), upper = quantile(sorted, n, 0.75), range = upper - lower;
    return (struct interval){lower - below * range, upper + above * range};
}

struct fences tukey_fences(const double *sorted, size_t n) {
    return (struct fences){about_box(sorted, n, 1.5, 1.5), about_box(sorted, n, 3.0, 3.0)};
}

struct interval whiskers(const double *sorted, size_t n) {
    struct interval fence = about_box(sorted, n, 1.5, 1.5);
    if (n == 0)
        return fence;
    size_t first = 0, last = n - 1;
    while (first < last && sorted[first] < fence.low)
        first++;
    while (last > first && sorted[last] > fence.high)
        last--;
    return (struct interval){sorted[first], sorted[last]};
}

/* The kernel of the medcouple: rows are the values up to the median, columns those from it on, both ascending. */
struct couple {
    const double *lower, *upper;
    double median;
    size_t ties, first_tie; /* values equal to the median; the first of them among the lower */
};

static double couple_kernel(const void *context, size_t row, size_t column) {
    const struct couple *c = context;
    double below = c->median - c->lower[row], above = c->upper[column] - c->median;
    if (below > 0.0 || above > 0.0)
        return (above - below) / (above + below);
    size_t place = row - c->first_tie + column + 1; /* both at the median: -1, 0 or 1 by their places */
    return place < c->ties ? -1.0 : place > c->ties ? 1.0 : 0.0;
}

double medcouple(const double *sorted, size_t n) {
    if (n == 0)
        return none;
    if (!(sorted[0] < sorted[n - 1]))
        return 0.0;
    double median = median_of_sorted(sorted, n);
    size_t below = 0, upto = 0;
    while (below < n && sorted[below] < median)
        below++;
    for (upto = below; upto < n && sorted[upto] == median;)
        upto++;
    struct couple couple = {sorted, sorted + below, median, upto - below, below};
    struct staircase kernel = {upto, n - below, couple_kernel, &couple};
    return select_median(&kernel);
}

struct adjusted_fences adjusted_fences(const double *sorted, size_t n) {
    double m = medcouple(sorted, n);
    double below = m >= 0.0 ? exp(-4.0 * m) : exp(-3.0 * m), above = m >= 0.0 ? exp(3.0 * m) : exp(4.0 * m);
    return (struct adjusted_fences){m, about_box(sorted, n, 1.5 * below, 1.5 * above)};
}

/* The distances from the median ascend on either side of it: their median needs a merge, no sort. */
double median_absolute_deviation(const double *sorted, size_t n) {
    if (n == 0)
        return none;
    double median = median_of_sorted(sorted, n), before = 0.0, now = 0.0;
    size_t right = 0;
    while (right < n && sorted[right] < median)
        right++;
    size_t left = right; /* the next on the left is left - 1 */
    for (size_t taken = 0; taken <= n / 2; taken++) {
        before = now;
        bool from_left = right >= n || (left > 0 && median - sorted[left - 1] <= sorted[right] - median);
        now = from_left ? median - sorted[--left] : sorted[right++] - median;
    }
    return 1.4826 * (n % 2 == 1 ? now : 0.5 * (before + now));
}

double robust_z(double value, double median, double deviation) {
    return deviation > 0.0 ? (value - median) / deviation : none;
}

static double polynomial(const double *coefficients, size_t count, double x) {
    double sum = 0.0;
    for (size_t i = count; i-- > 0;)
        sum = sum * x + coefficients[i];
    return sum;
}
#define POLYNOMIAL(coefficients, x) polynomial((coefficients), sizeof(coefficients) / sizeof *(coefficients), (x))

/* Royston's weights of the upper half, largest first: weights[0] belongs to the maximum. */
static void royston_weights(double *weights, size_t n) {
    static const double largest[] = {0.0, 0.221157, -0.147981, -2.071190, 4.434685, -2.706056};
    static const double second[] = {0.0, 0.042981, -0.293762, -1.752461, 5.682633, -3.582633};
    size_t half = n / 2;
    if (n == 3) {
        weights[0] = sqrt(0.5);
        return;
    }
    double sum = 0.0, root = 1.0 / sqrt((double)n);
    for (size_t i = 0; i < half; i++) {
        weights[i] = -normal_quantile(((double)i + 1.0 - 0.375) / ((double)n + 0.25));
        sum += 2.0 * weights[i] * weights[i];
    }
    double a1 = POLYNOMIAL(largest, root) + weights[0] / sqrt(sum), m1 = weights[0], m2 = weights[1], a2 = 0.0;
    size_t fixed = n > 5 ? 2 : 1;
    double over = sum - 2.0 * m1 * m1, under = 1.0 - 2.0 * a1 * a1;
    if (fixed == 2) {
        a2 = POLYNOMIAL(second, root) + m2 / sqrt(sum);
        over -= 2.0 * m2 * m2;
        under -= 2.0 * a2 * a2;
    }
    double scale = sqrt(over / under);
    for (size_t i = fixed; i < half; i++)
        weights[i] /= scale;
    weights[0] = a1;
    if (fixed == 2)
        weights[1] = a2;
}

/* p from ln(1 - W), `rest` being 1 - W. */
static double royston_p(double w, double rest, size_t n) {
    static const double small_mean[] = {0.5440, -0.39978, 0.025054, -0.0006714};
    static const double small_sd[] = {1.3822, -0.77857, 0.062767, -0.0020322};
    static const double large_mean[] = {-1.5861, -0.31082, -0.083751, 0.0038915};
    static const double large_sd[] = {-0.4803, -0.082676, 0.0030302};
    double size = (double)n, y = log(rest);
    if (n == 3)
        return fmax(0.0, 6.0 / M_PI * (asin(sqrt(w)) - asin(sqrt(0.75))));
    if (n > 11)
        return normal_upper((y - POLYNOMIAL(large_mean, log(size))) / exp(POLYNOMIAL(large_sd, log(size))));
    double bound = -2.273 + 0.459 * size;
    if (y >= bound)
        return 1e-99; /* as AS R94 has it */
    return normal_upper((-log(bound - y) - POLYNOMIAL(small_mean, size)) / exp(POLYNOMIAL(small_sd, size)));
}

struct shapiro_wilk shapiro_wilk(const double *sorted, size_t n) {
    enum { MOST = 5000 };
    if (n < 3 || n > MOST)
        return (struct shapiro_wilk){n < 3 ? STATUS_TOO_FEW : STATUS_BEYOND_METHOD, none, none};
    double range = sorted[n - 1] - sorted[0], size = fmax(fabs(sorted[0]), fabs(sorted[n - 1]));
    if (!(range > 1e-14 * size))
        return (struct shapiro_wilk){STATUS_NO_VARIANCE, none, none};
    double weights[MOST / 2];
    royston_weights(weights, n);
    wide product = 0.0L, squares = 0.0L;
    for (size_t i = 0; i < n / 2; i++) {
        product += (wide)weights[i] * (((wide)sorted[n - 1 - i] - (wide)sorted[i]) / (wide)range);
        squares += 2.0L * (wide)weights[i] * (wide)weights[i];
    }
    wide spread = moments_of(sorted, n).m2 * (wide)n / ((wide)range * (wide)range);
    /* 1 - W by the difference of roots, as W is near 1; the weights' squares sum to 1 but for rounding. */
    wide both = sqrtl(squares * spread);
    double rest = (double)((both - product) * (both + product) / (squares * spread)), w = 1.0 - rest;
    return (struct shapiro_wilk){STATUS_OK, w, royston_p(w, rest, n)};
}

/* A width of 1, 2 or 5 times a power of ten, kept as integers so that its multiples are exact to the last digit. */
struct nice_width {
    int digit, power;
};

static double nice_multiple(struct nice_width width, double times) {
    double whole = times * width.digit;
    return width.power < 0 ? whole / pow(10.0, -width.power) : whole * pow(10.0, width.power);
}

static struct nice_width wider(struct nice_width width) {
    return width.digit == 1   ? (struct nice_width){2, width.power}
           : width.digit == 2 ? (struct nice_width){5, width.power}
                              : (struct nice_width){1, width.power + 1};
}

/* The widest nice width that is not wider than asked. */
static struct nice_width nice_below(double asked) {
    struct nice_width width = {1, (int)floor(log10(asked)) - 1};
    while (nice_multiple(wider(width), 1.0) <= asked * (1.0 + 1e-12))
        width = wider(width);
    return width;
}

/* Where values repeat, bins narrower than the step of the scale would make a comb: ages in years, pressures in even
 * numbers. 0 where most values are unlike any other. */
static double scale_step(const double *sorted, size_t n) {
    double step = INFINITY;
    size_t distinct = 1;
    for (size_t i = 1; i < n; i++) {
        double gap = sorted[i] - sorted[i - 1];
        if (gap > 0.0) {
            distinct++;
            step = fmin(step, gap);
        }
    }
    return distinct * 2 <= n && isfinite(step) ? step : 0.0;
}

static double wanted_bins(const double *sorted, size_t n) {
    double sturges = ceil(log2((double)n)) + 1.0;
    double width = 2.0 * (quantile(sorted, n, 0.75) - quantile(sorted, n, 0.25)) / cbrt((double)n);
    double range = sorted[n - 1] - sorted[0];
    return width > 0.0 ? fmax(sturges, fmin(ceil(range / width), (double)BINS_MAX)) : sturges;
}

static struct bins one_bin(const double *sorted, size_t n) {
    struct bins bins = {.count = 1};
    double low = sorted[0], high = sorted[n - 1], half = low == 0.0 && high == 0.0 ? 0.5 : 0.05 * fabs(low);
    bins.limits[0] = low - half;
    bins.limits[1] = high + half;
    bins.counts[0] = n;
    return bins;
}

/* Bins first .. first + count - 1, in widths, that cover low to high. */
struct cover {
    double first, count;
};

static struct cover cover(struct nice_width width, double low, double high) {
    double unit = nice_multiple(width, 1.0), first = floor(low / unit);
    while (nice_multiple(width, first) > low) /* the division was rounded */
        first -= 1.0;
    while (nice_multiple(width, first + 1.0) <= low)
        first += 1.0;
    double count = fmax(1.0, ceil((high - nice_multiple(width, first)) / unit - 1e-9));
    while (nice_multiple(width, first + count) < high)
        count += 1.0;
    return (struct cover){first, count};
}

static void count_values(struct bins *bins, const double *sorted, size_t n) {
    for (size_t i = 0, bin = 0; i < n; i++) {
        while (bin + 1 < bins->count && sorted[i] >= bins->limits[bin + 1])
            bin++;
        bins->counts[bin]++;
    }
}

struct bins nice_bins(const double *sorted, size_t n) {
    struct bins bins = {0};
    if (n == 0)
        return bins;
    double low = sorted[0], high = sorted[n - 1], range = high - low;
    if (!(range > 1e-12 * fmax(fabs(low), fabs(high))))
        return one_bin(sorted, n);
    double least = scale_step(sorted, n) * (1.0 - 1e-9);
    struct nice_width width = nice_below(range / wanted_bins(sorted, n));
    struct cover chosen = cover(width, low, high);
    while (chosen.count > (double)BINS_MAX || nice_multiple(width, 1.0) < least) {
        width = wider(width);
        chosen = cover(width, low, high);
    }
    bins.count = (size_t)chosen.count;
    for (size_t i = 0; i <= bins.count; i++)
        bins.limits[i] = nice_multiple(width, chosen.first + (double)i);
    count_values(&bins, sorted, n);
    return bins;
}
