/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "stats/distributions.h"
#include "base/memory.h"
#include <gsl/gsl_cdf.h>
#include <gsl/gsl_sf_gamma.h>
#include <math.h>

double normal_lower(double z) {
    return gsl_cdf_ugaussian_P(z);
}

double normal_upper(double z) {
    return gsl_cdf_ugaussian_Q(z);
}

double normal_two_sided(double z) {
    return 2.0 * gsl_cdf_ugaussian_Q(fabs(z));
}

double normal_quantile(double probability) {
    if (!(probability >= 0.0 && probability <= 1.0))
        return (double)NAN;
    return gsl_cdf_ugaussian_Pinv(probability);
}

/* Arguments near 1 and large parameters lose digits in double; extended precision has three to spare. */
typedef long double wide;

/* ln B(a, b). Student's case by the series of ln gamma(a + 1/2) - ln gamma(a) (Abramowitz & Stegun 6.1.47), as three
 * gamma functions cancel where a is large. */
static wide log_beta(wide a, wide b) {
    if (b == 0.5L && a > 1000.0L) {
        wide square = a * a;
        return 0.5L * logl((wide)M_PI / a) +
               (1.0L - 1.0L / (24.0L * square) + 1.0L / (80.0L * square * square)) / (8.0L * a);
    }
    int sign;
    return lgammal_r(a, &sign) + lgammal_r(b, &sign) - lgammal_r(a + b, &sign);
}

static wide away_from_zero(wide x) {
    return fabsl(x) < 1e-300L ? 1e-300L : x;
}

/* The continued fraction of I_x(a, b), Abramowitz & Stegun 26.5.8, by Lentz' method; quick for x < (a+1)/(a+b+2). */
static wide beta_fraction(wide x, wide a, wide b) {
    wide c = 1.0L, d = 1.0L / away_from_zero(1.0L - (a + b) * x / (a + 1.0L)), fraction = d;
    for (int m = 1; m < 100000; m++) {
        wide k = (wide)m, even = k * (b - k) * x / ((a + 2.0L * k - 1.0L) * (a + 2.0L * k));
        wide odd = -(a + k) * (a + b + k) * x / ((a + 2.0L * k) * (a + 2.0L * k + 1.0L));
        d = 1.0L / away_from_zero(1.0L + even * d);
        c = away_from_zero(1.0L + even / c);
        fraction *= d * c;
        d = 1.0L / away_from_zero(1.0L + odd * d);
        c = away_from_zero(1.0L + odd / c);
        fraction *= d * c;
        if (fabsl(d * c - 1.0L) < 1e-18L)
            break;
    }
    return fraction;
}

/* I_x(a, b) with y = 1 - x given as well, so that neither end loses digits. */
static double beta_both(wide x, wide y, wide a, wide b) {
    if (isnan(x) || isnan(y) || !(a > 0.0L) || !(b > 0.0L))
        return (double)NAN;
    if (x <= 0.0L)
        return 0.0;
    if (y <= 0.0L)
        return 1.0;
    wide log_x = y < 0.5L ? log1pl(-y) : logl(x), log_y = x < 0.5L ? log1pl(-x) : logl(y);
    wide front = expl(a * log_x + b * log_y - log_beta(a, b));
    if (x < (a + 1.0L) / (a + b + 2.0L))
        return (double)(front * beta_fraction(x, a, b) / a);
    return (double)(1.0L - front * beta_fraction(y, b, a) / b);
}

double beta_lower(double x, double a, double b) {
    return beta_both((wide)x, 1.0L - (wide)x, (wide)a, (wide)b);
}

/* Hill 1970 (Algorithm 395, Commun ACM 13:617): a normal deviate with Student's tail, the better the larger df. */
static double normal_deviate(double t, double df) {
    double a = df - 0.5, b = 48.0 * a * a, y = a * log1p(t / df * t);
    double correction = (((-0.4 * y - 3.3) * y - 24.0) * y - 85.5) / (0.8 * y * y + 100.0 + b) + y + 3.0;
    return (correction / b + 1.0) * sqrt(y);
}

double student_two_sided(double t, double df) {
    if (isnan(t) || !(df > 0.0))
        return (double)NAN;
    if (isinf(df) || isinf(t))
        return normal_two_sided(t);
    if (df > 1e6) /* the fraction would take thousands of terms */
        return normal_two_sided(normal_deviate(t, df));
    wide size = fabsl((wide)t), ratio = size / (wide)df * size; /* t^2 / df */
    wide y = isinf(ratio) ? 1.0L : ratio / (1.0L + ratio);
    return beta_both(1.0L / (1.0L + ratio), y, (wide)df / 2.0L, 0.5L);
}

static double student_log_density(double t, double df) {
    return -0.5 * (df + 1.0) * log1p(t / df * t) - (double)log_beta((wide)df / 2.0L, 0.5L) - 0.5 * log(df);
}

double student_quantile(double probability, double df) {
    if (!(probability >= 0.0 && probability <= 1.0) || !(df > 0.0))
        return (double)NAN;
    if (isinf(df) || probability == 0.0 || probability == 1.0)
        return normal_quantile(probability);
    if (probability == 0.5)
        return 0.0;
    double tail = probability < 0.5 ? probability : 1.0 - probability;
    double t = gsl_cdf_tdist_Qinv(tail, df);
    if (!isfinite(t) || t <= 0.0)
        t = gsl_cdf_ugaussian_Qinv(tail);
    for (int step = 0; step < 200;
         step++) { /* Newton's steps; far out on logarithms, where the tail is a straight line */
        double now = 0.5 * student_two_sided(t, df), density = student_log_density(t, df);
        double next = tail > 0.05 ? t + (now - tail) / exp(density)
                                  : t * exp((log(now) - log(tail)) * exp(log(now) - log(t) - density));
        next = fmax(next, t / 2.0);
        if (!isfinite(next) || fabs(next - t) <= 1e-15 * t)
            break;
        t = next;
    }
    return probability < 0.5 ? -t : t;
}

double chi_square_upper(double x, double df) {
    if (isnan(x) || !(df > 0.0))
        return (double)NAN;
    return x <= 0.0 ? 1.0 : isinf(x) ? 0.0 : gsl_sf_gamma_inc_Q(df / 2.0, x / 2.0);
}

double f_upper(double f, double df1, double df2) {
    if (isnan(f) || !(df1 > 0.0) || !(df2 > 0.0))
        return (double)NAN;
    if (f <= 0.0)
        return 1.0;
    if (isinf(f))
        return 0.0;
    if (isinf(df2))
        return chi_square_upper(f * df1, df1);
    wide numerator = (wide)df1 * (wide)f, all = (wide)df2 + numerator;
    return beta_both((wide)df2 / all, numerator / all, (wide)df2 / 2.0L, (wide)df1 / 2.0L);
}

double beta_quantile(double probability, double a, double b) {
    if (!(probability >= 0.0 && probability <= 1.0) || !(a > 0.0) || !(b > 0.0))
        return (double)NAN;
    double low = 0.0, high = 1.0; /* bisection to the last bit: certain, and rare enough not to need speed */
    for (int step = 0; step < 1100 && high > low; step++) {
        double middle = low + (high - low) / 2.0;
        if (middle <= low || middle >= high)
            break;
        if (beta_lower(middle, a, b) < probability)
            low = middle;
        else
            high = middle;
    }
    return probability <= 0.0 ? 0.0 : probability >= 1.0 ? 1.0 : low + (high - low) / 2.0;
}

struct interval binomial_interval(size_t events, size_t n, double confidence) {
    BUG_IF(events > n || !(confidence > 0.0 && confidence < 1.0));
    double tail = (1.0 - confidence) / 2.0, with = (double)events, without = (double)(n - events);
    return (struct interval){events == 0 ? 0.0 : beta_quantile(tail, with, without + 1.0),
        events == n ? 1.0 : 1.0 - beta_quantile(tail, without, with + 1.0)};
}
