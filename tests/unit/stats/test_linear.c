/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Properties of the linear model and its robust sister: units, row order, arms exchanged, change against follow-up,
 * far baselines, collinear columns, exact fits, rows of leverage 1. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <cmocka.h>
#include "near.h"
#include "stats/linear.h"
#include "stats/random.h"
#include "stats/robust.h"
#include <string.h>

enum { N = 40, P = 4 };

static struct arena arena;

struct trial {
    double one[N], arm[N], before[N], sex[N], after[N];
    const double *columns[P];
};

static void make(struct trial *t, double far) {
    struct generator g;
    generator_init(&g, 3, "trial");
    for (size_t i = 0; i < N; i++) {
        t->one[i] = 1;
        t->arm[i] = (double)(i % 2);
        t->sex[i] = (double)(i % 3 == 0);
        t->before[i] = far + 10.0 * generator_uniform(&g);
        double u = generator_uniform(&g);
        t->after[i] = t->before[i] - far - 2 * t->arm[i] + t->sex[i] + log(u / (1 - u));
    }
    const double *columns[P] = {t->one, t->arm, t->before, t->sex};
    memcpy(t->columns, columns, sizeof columns);
}

static struct linear_fit fit_of(const double *const *columns, size_t p, const double *y, size_t n) {
    struct linear_fit fit;
    linear_fit(&fit, columns, p, y, n, &arena);
    return fit;
}

static void residuals_are_orthogonal_and_add_up(void **state) {
    (void)state;
    struct trial t;
    make(&t, 100);
    struct linear_fit fit = fit_of(t.columns, P, t.after, N);
    double leverage = 0, squares = 0;
    for (size_t j = 0; j < P; j++) {
        double dot = 0, by_gain = 0;
        for (size_t i = 0; i < N; i++) {
            dot += t.columns[j][i] * fit.residuals[i];
            by_gain += fit.gain[j * N + i] * t.after[i];
        }
        near(dot, 0, 0, 1e-9, "residuals along a column");
        near(by_gain, fit.coefficients[j], 1e-10, 1e-10, "gain times outcome");
    }
    for (size_t i = 0; i < N; i++) {
        near(fit.fitted[i] + fit.residuals[i], t.after[i], 1e-14, 1e-13, "fitted and residual");
        leverage += fit.leverages[i];
        squares += fit.residuals[i] * fit.residuals[i];
    }
    near(leverage, P, 1e-13, 0, "leverages add up to p");
    near(squares, fit.sum_of_squares, 1e-13, 0, "sum of squares");
}

/* The arm's effect is the same for follow-up and for change when the baseline is in the model. */
static void change_and_follow_up_agree(void **state) {
    (void)state;
    struct trial t;
    double change[N];
    make(&t, 100);
    for (size_t i = 0; i < N; i++)
        change[i] = t.after[i] - t.before[i];
    struct linear_fit a = fit_of(t.columns, P, t.after, N), b = fit_of(t.columns, P, change, N);
    for (int kind = COVARIANCE_CLASSICAL; kind <= COVARIANCE_HC3; kind++) {
        struct estimate x = linear_coefficient(&a, (enum covariance_kind)kind, 1, 0.95);
        struct estimate y = linear_coefficient(&b, (enum covariance_kind)kind, 1, 0.95);
        near(x.estimate, y.estimate, 1e-11, 0, "estimate");
        near(x.low, y.low, 1e-11, 0, "low");
        near(x.p, y.p, 1e-9, 0, "p");
    }
}

static void units_and_order_and_arms(void **state) {
    (void)state;
    struct trial t, u;
    make(&t, 100);
    make(&u, 100);
    for (size_t i = 0; i < N; i++) {
        size_t from = (i * 7) % N;
        u.arm[i] = 1 - t.arm[from];
        u.sex[i] = t.sex[from];
        u.before[i] = 18 * t.before[from] - 5;
        u.after[i] = 0.5 * t.after[from] + 3;
    }
    struct linear_fit a = fit_of(t.columns, P, t.after, N), b = fit_of(u.columns, P, u.after, N);
    struct huber_fit c, d;
    huber_fit(&c, t.columns, P, t.after, N, &arena);
    huber_fit(&d, u.columns, P, u.after, N, &arena);
    assert_int_equal(c.status, STATUS_OK);
    assert_int_equal(d.status, STATUS_OK);
    struct estimate pairs[][2] = {
        {linear_coefficient(&a, COVARIANCE_CLASSICAL, 1, 0.95), linear_coefficient(&b, COVARIANCE_CLASSICAL, 1, 0.95)},
        {linear_coefficient(&a, COVARIANCE_HC3, 1, 0.95), linear_coefficient(&b, COVARIANCE_HC3, 1, 0.95)},
        {huber_coefficient(&c, 1, 0.95), huber_coefficient(&d, 1, 0.95)}};
    for (size_t k = 0; k < 3; k++) {
        near(pairs[k][1].estimate, -0.5 * pairs[k][0].estimate, 1e-10, 0, "estimate");
        near(pairs[k][1].standard_error, 0.5 * pairs[k][0].standard_error, 1e-10, 0, "standard error");
        near(pairs[k][1].high, -0.5 * pairs[k][0].low, 1e-10, 0, "limit");
        near(pairs[k][1].p, pairs[k][0].p, 1e-8, 0, "p");
    }
}

static struct estimate adjusted_mean(const struct linear_fit *fit, double arm) {
    double weights[P];
    memcpy(weights, fit->mean_row, sizeof weights);
    weights[1] = arm;
    return linear_contrast(fit, COVARIANCE_CLASSICAL, weights, 0.95);
}

/* A baseline near 1e8 (a time stamp, say) gives the adjusted means of one near 0. */
static void far_baselines_keep_their_digits(void **state) {
    (void)state;
    struct trial near_zero, far;
    make(&near_zero, 0);
    make(&far, 0);
    for (size_t i = 0; i < N; i++) {
        near_zero.before[i] = rint(1024 * near_zero.before[i]) / 1024; /* so that adding 2^27 is exact */
        far.before[i] = near_zero.before[i] + 134217728.0;
    }
    struct linear_fit a = fit_of(near_zero.columns, P, near_zero.after, N), b = fit_of(far.columns, P, far.after, N);
    assert_int_equal(b.status, STATUS_OK);
    for (int arm = 0; arm < 2; arm++) {
        struct estimate x = adjusted_mean(&a, arm), y = adjusted_mean(&b, arm);
        near(y.estimate, x.estimate, 1e-12, 0, "adjusted mean");
        near(y.low, x.low, 1e-12, 0, "its limit");
        near(y.standard_error, x.standard_error, 1e-12, 0, "its error");
    }
    struct huber_fit c, d;
    huber_fit(&c, near_zero.columns, P, near_zero.after, N, &arena);
    huber_fit(&d, far.columns, P, far.after, N, &arena);
    near(d.coefficients[1], c.coefficients[1], 1e-10, 0, "robust effect");
}

static void determined_columns_are_named(void **state) {
    (void)state;
    struct trial t;
    make(&t, 100);
    double other[N], zero[N] = {0}, scaled[N];
    for (size_t i = 0; i < N; i++) {
        other[i] = 1 - t.arm[i];
        scaled[i] = 3 * t.before[i] - 7 * t.sex[i] + 2;
    }
    const struct {
        const double *columns[P];
        size_t wanted;
    } cases[] = {
        {{t.one, t.arm, other, t.before}, 2}, {{t.one, t.arm, t.before, t.before}, 3},
        {{t.one, zero, t.arm, t.before}, 1}, {{t.one, t.before, t.sex, scaled}, 3},
        {{t.arm, t.one, t.one, t.before}, 2}, {{t.arm, other, t.one, t.before}, 1}, /* the constant counts before all */
    };
    for (size_t k = 0; k < sizeof cases / sizeof *cases; k++) {
        struct linear_fit fit = fit_of(cases[k].columns, P, t.after, N);
        struct huber_fit huber;
        assert_int_equal(fit.status, STATUS_SINGULAR);
        assert_int_equal(fit.singular_column, cases[k].wanted);
        assert_null(fit.coefficients);
        assert_int_equal(linear_coefficient(&fit, COVARIANCE_CLASSICAL, 1, 0.95).status, STATUS_SINGULAR);
        huber_fit(&huber, cases[k].columns, P, t.after, N, &arena);
        assert_int_equal(huber.status, STATUS_SINGULAR);
        assert_int_equal(huber.singular_column, cases[k].wanted);
        assert_int_equal(huber_coefficient(&huber, 1, 0.95).status, STATUS_SINGULAR);
    }
}

static void few_rows_and_exact_fits_have_a_status(void **state) {
    (void)state;
    struct trial t;
    make(&t, 100);
    for (size_t n = 0; n <= P; n++) {
        struct linear_fit fit = fit_of(t.columns, P, t.after, n);
        assert_int_equal(fit.status, STATUS_TOO_FEW);
        assert_true(isnan(linear_coefficient(&fit, COVARIANCE_CLASSICAL, 1, 0.95).estimate));
    }
    double line[N], flat[N];
    for (size_t i = 0; i < N; i++) {
        line[i] = 0.1 * t.before[i] - 0.3 * t.arm[i] + 0.7;
        flat[i] = 0.1;
    }
    const double *const outcomes[] = {line, flat};
    for (size_t k = 0; k < 2; k++) {
        struct linear_fit fit = fit_of(t.columns, P, outcomes[k], N);
        struct huber_fit huber;
        assert_int_equal(fit.status, STATUS_OK);
        assert_true(fit.exact);
        near(fit.coefficients[1], k == 0 ? -0.3 : 0, 1e-12, 1e-12, "coefficient of an exact fit");
        assert_int_equal(linear_coefficient(&fit, COVARIANCE_CLASSICAL, 1, 0.95).status, STATUS_NO_VARIANCE);
        huber_fit(&huber, t.columns, P, outcomes[k], N, &arena);
        assert_int_equal(huber.status, STATUS_NO_VARIANCE);
    }
}

/* One participant alone in a site: the site's effect has no HC3 error, the arm's is that of the others. */
static void leverage_one_is_guarded(void **state) {
    (void)state;
    struct trial t;
    make(&t, 100);
    double alone[N] = {0}, covariance[P * P], same[P * P];
    alone[N - 1] = 1;
    const double *with[] = {t.one, t.arm, t.before, alone}, *without[] = {t.one, t.arm, t.before};
    struct linear_fit a = fit_of(with, 4, t.after, N), b = fit_of(without, 3, t.after, N - 1);
    near(a.leverages[N - 1], 1, 1e-12, 0, "leverage");
    for (int kind = COVARIANCE_CLASSICAL; kind <= COVARIANCE_HC3; kind++) {
        if (kind == COVARIANCE_HC1)
            continue; /* n / (n - p) differs */
        struct estimate x = linear_coefficient(&a, (enum covariance_kind)kind, 1, 0.95);
        struct estimate y = linear_coefficient(&b, (enum covariance_kind)kind, 1, 0.95);
        near(x.estimate, y.estimate, 1e-11, 0, "effect");
        near(x.standard_error, y.standard_error, 1e-10, 0, "error");
    }
    assert_int_equal(linear_coefficient(&a, COVARIANCE_HC3, 3, 0.95).status, STATUS_TOO_FEW);
    linear_covariance(&a, COVARIANCE_HC3, covariance);
    linear_covariance(&b, COVARIANCE_HC3, same);
    near(covariance[1 * 4 + 1], same[1 * 3 + 1], 1e-10, 0, "matrix");
    assert_true(isnan(covariance[3 * 4 + 3]) && isnan(covariance[1 * 4 + 3]));
}

static void huge_outcomes_do_not_overflow(void **state) {
    (void)state;
    struct trial t;
    double huge[N];
    make(&t, 100);
    for (size_t i = 0; i < N; i++)
        huge[i] = 1e300 * t.after[i] / 64;
    struct linear_fit a = fit_of(t.columns, P, t.after, N), b = fit_of(t.columns, P, huge, N);
    struct estimate x = linear_coefficient(&a, COVARIANCE_HC3, 1, 0.95),
                    y = linear_coefficient(&b, COVARIANCE_HC3, 1, 0.95);
    near(y.estimate, 1e300 * x.estimate / 64, 1e-11, 0, "estimate");
    near(y.standard_error, 1e300 * x.standard_error / 64, 1e-11, 0, "standard error");
    near(y.p, x.p, 1e-9, 0, "p");
}

/* Two samples by a model with an arm alone: the pooled t of a textbook. */
static void arm_alone_is_the_pooled_t(void **state) {
    (void)state;
    struct trial t;
    make(&t, 0);
    struct linear_fit fit = fit_of(t.columns, 2, t.after, N);
    double sum[2] = {0}, squares[2] = {0}, n = N / 2.0;
    for (size_t i = 0; i < N; i++)
        sum[i % 2] += t.after[i] / n;
    for (size_t i = 0; i < N; i++)
        squares[i % 2] += (t.after[i] - sum[i % 2]) * (t.after[i] - sum[i % 2]);
    struct estimate e = linear_coefficient(&fit, COVARIANCE_CLASSICAL, 1, 0.95);
    near(e.estimate, sum[1] - sum[0], 1e-12, 0, "difference");
    near(e.standard_error, sqrt((squares[0] + squares[1]) / (N - 2) * (2 / n)), 1e-12, 0, "pooled error");
}

/* Without outliers beyond k the estimate is least squares; one far outlier moves it little. */
static void huber_resists_an_outlier(void **state) {
    (void)state;
    struct trial t;
    make(&t, 100);
    struct huber_fit before, after;
    huber_fit(&before, t.columns, P, t.after, N, &arena);
    t.after[5] += 1e6;
    huber_fit(&after, t.columns, P, t.after, N, &arena);
    assert_int_equal(after.status, STATUS_OK);
    assert_true(fabs(after.coefficients[1] - before.coefficients[1]) < 1.0);
    assert_true(after.weights[5] < 1e-4 && after.weights[5] > 0);
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(residuals_are_orthogonal_and_add_up),
        cmocka_unit_test(change_and_follow_up_agree),
        cmocka_unit_test(units_and_order_and_arms),
        cmocka_unit_test(far_baselines_keep_their_digits),
        cmocka_unit_test(determined_columns_are_named),
        cmocka_unit_test(few_rows_and_exact_fits_have_a_status),
        cmocka_unit_test(leverage_one_is_guarded),
        cmocka_unit_test(huge_outcomes_do_not_overflow),
        cmocka_unit_test(arm_alone_is_the_pooled_t),
        cmocka_unit_test(huber_resists_an_outlier),
    };
    arena_init(&arena);
    int failed = cmocka_run_group_tests_name("stats/linear", tests, NULL, NULL);
    arena_release(&arena);
    return failed;
}
