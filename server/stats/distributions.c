/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "stats/distributions.h"
#include "base/memory.h"
#include <gsl/gsl_cdf.h>
#include <gsl/gsl_sf_gamma.h>
#include <math.h>

double normal_lower(double z)
{
    return gsl_cdf_ugaussian_P(z);
}

double normal_upper(double z)
{
    return gsl_cdf_ugaussian_Q(z);
}

double normal_two_sided(double z)
{
    return 2.0 * gsl_cdf_ugaussian_Q(fabs(z));
}

double normal_quantile(double probability)
{
    if (!(probability >= 0.0 && probability <= 1.0))
        return (double)NAN;
    return gsl_cdf_ugaussian_Pinv(probability);
}

/* ln B(a, b) without the cancellation that three gamma functions have where one argument is large. */
static double log_beta(double a, double b)
{
    double small = fmin(a, b), large = fmax(a, b);
    gsl_sf_result result;
    if (large > 20.0 && gsl_sf_lnpoch_e(large, small, &result) == 0)
        return lgamma(small) - result.val; /* B = gamma(small) / (large)_small */
    return gsl_sf_lnbeta(a, b);
}

/* The continued fraction of I_x(a, b), Abramowitz & Stegun 26.5.8, by Lentz' method; quick for x < (a+1)/(a+b+2). */
static double beta_fraction(double x, double a, double b)
{
    const double tiny = 1e-300;
    double c = 1.0, d = 1.0 - (a + b) * x / (a + 1.0);
    d = 1.0 / (fabs(d) < tiny ? tiny : d);
    double fraction = d;
    for (int m = 1; m < 100000; m++) {
        double k = m, even = k * (b - k) * x / ((a + 2.0 * k - 1.0) * (a + 2.0 * k));
        d = 1.0 + even * d;
        c = 1.0 + even / c;
        d = 1.0 / (fabs(d) < tiny ? tiny : d);
        c = fabs(c) < tiny ? tiny : c;
        fraction *= d * c;
        double odd = -(a + k) * (a + b + k) * x / ((a + 2.0 * k) * (a + 2.0 * k + 1.0));
        d = 1.0 + odd * d;
        c = 1.0 + odd / c;
        d = 1.0 / (fabs(d) < tiny ? tiny : d);
        c = fabs(c) < tiny ? tiny : c;
        double step = d * c;
        fraction *= step;
        if (fabs(step - 1.0) < 1e-16)
            break;
    }
    return fraction;
}

/* I_x(a, b) with y = 1 - x given as well, so that neither end loses digits. */
static double beta_both(double x, double y, double a, double b)
{
    if (isnan(x) || isnan(y) || !(a > 0.0) || !(b > 0.0))
        return (double)NAN;
    if (x <= 0.0)
        return 0.0;
    if (y <= 0.0)
        return 1.0;
    double log_x = y < 0.5 ? log1p(-y) : log(x), log_y = x < 0.5 ? log1p(-x) : log(y);
    double front = exp(a * log_x + b * log_y - log_beta(a, b));
    if (x < (a + 1.0) / (a + b + 2.0))
        return front * beta_fraction(x, a, b) / a;
    return 1.0 - front * beta_fraction(y, b, a) / b;
}

double beta_lower(double x, double a, double b)
{
    return beta_both(x, 1.0 - x, a, b);
}

double student_two_sided(double t, double df)
{
    if (isnan(t) || !(df > 0.0))
        return (double)NAN;
    if (isinf(df))
        return normal_two_sided(t);
    double size = fabs(t), ratio = size / df * size; /* t^2 / df */
    if (ratio < 1.0)
        return beta_both(1.0 / (1.0 + ratio), ratio / (1.0 + ratio), df / 2.0, 0.5);
    return beta_both(1.0 / (1.0 + ratio), 1.0 / (1.0 + 1.0 / ratio), df / 2.0, 0.5);
}

static double student_density(double t, double df)
{
    return exp(-0.5 * (df + 1.0) * log1p(t / df * t) - log_beta(df / 2.0, 0.5)) / sqrt(df);
}

double student_quantile(double probability, double df)
{
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
    for (int step = 0; step < 50; step++) { /* Newton: the tail is convex and falling, so it does not overshoot far */
        double change = (0.5 * student_two_sided(t, df) - tail) / student_density(t, df);
        double next = fmax(t + change, t / 2.0);
        if (!isfinite(next) || fabs(next - t) <= 1e-15 * fabs(t))
            break;
        t = next;
    }
    return probability < 0.5 ? -t : t;
}

double chi_square_upper(double x, double df)
{
    if (isnan(x) || !(df > 0.0))
        return (double)NAN;
    return x <= 0.0 ? 1.0 : isinf(x) ? 0.0 : gsl_sf_gamma_inc_Q(df / 2.0, x / 2.0);
}

double f_upper(double f, double df1, double df2)
{
    if (isnan(f) || !(df1 > 0.0) || !(df2 > 0.0))
        return (double)NAN;
    if (f <= 0.0)
        return 1.0;
    if (isinf(f))
        return 0.0;
    if (isinf(df2))
        return chi_square_upper(f * df1, df1);
    double numerator = df1 * f;
    return beta_both(df2 / (df2 + numerator), numerator / (df2 + numerator), df2 / 2.0, df1 / 2.0);
}

double beta_quantile(double probability, double a, double b)
{
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

struct interval binomial_interval(size_t events, size_t n, double confidence)
{
    BUG_IF(events > n || !(confidence > 0.0 && confidence < 1.0));
    double tail = (1.0 - confidence) / 2.0, with = (double)events, without = (double)(n - events);
    return (struct interval){events == 0 ? 0.0 : beta_quantile(tail, with, without + 1.0),
                             events == n ? 1.0 : 1.0 - beta_quantile(tail, without, with + 1.0)};
}
