/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Comparing numbers in tests. Rules: NaN agrees with NaN only; an infinity with the same infinity only; otherwise the
 * gap |got - want| must not exceed the larger of relative * |want| and absolute, so that a wanted 0 needs an absolute
 * bound (or an exact 0). A failure prints both numbers with 17 digits. Include after cmocka.h. */
#ifndef EVENHAND_TESTS_NEAR_H
#define EVENHAND_TESTS_NEAR_H
#include <math.h>
#include <stdbool.h>
#include <stdio.h>

static inline bool near_holds(double got, double want, double relative, double absolute) {
    if (isnan(got) || isnan(want))
        return isnan(got) && isnan(want);
    if (isinf(got) || isinf(want))
        return isinf(got) && isinf(want) && (got > 0) == (want > 0);
    return fabs(got - want) <= fmax(relative * fabs(want), absolute);
}

static inline void near_at(
    double got, double want, double relative, double absolute, const char *label, const char *file, int line) {
    if (near_holds(got, want, relative, absolute))
        return;
    print_error("%s: got %.17g, wanted %.17g (gap %.3g; relative %g, absolute %g allowed)\n", label, got, want,
        fabs(got - want), relative, absolute);
    _fail(file, line);
}

#define near(got, want, relative, absolute, label)                                                                     \
    near_at((got), (want), (relative), (absolute), (label), __FILE__, __LINE__)

/* The gap of statistics: |got - want| / max(|want|, standard error) at most `tolerance`. */
#define near_estimate(got, want, standard_error, tolerance, label)                                                     \
    near_at((got), (want), (tolerance), (tolerance) * (standard_error), (label), __FILE__, __LINE__)

/* Significant digits on which two numbers agree, as NIST counts them (log relative error), 0 to 15. */
static inline double digits_agreed(double got, double want) {
    double gap = want == 0.0 ? fabs(got) : fabs(got - want) / fabs(want);
    if (isnan(gap) || gap >= 1.0)
        return 0.0;
    return gap < 1e-15 ? 15.0 : -log10(gap);
}
#endif
