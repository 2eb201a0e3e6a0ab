/* SPDX-License-Identifier: GPL-3.0-or-later */
/* NIST Statistical Reference Datasets (itl.nist.gov/div898/strd): certified means, standard deviations and
 * regressions. Certified values as carried by the tests of GSL 2.7.1's source package; those of Wampler 1 to 5 and the
 * formulas of NumAcc and Wampler from memory, confirmed (as were all others) in exact rational arithmetic. Prints the
 * digits agreed, the least of each set; 15 is all there are. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <cmocka.h>
#include "reference.h"
#include "stats/describe.h"
#include "stats/linear.h"

static struct table univariate, linear;

/* Least digits wanted: what the stored doubles allow. NumAcc4's spread of 0.1 sits on 1e7, so the decimals themselves
 * are stored to 8 digits of it. */
static const struct {
    const char *set;
    double mean, sd, mean_digits, sd_digits;
} summaries[] = {
    {"lew", -177.435000000000, 277.332168044316, 14.5, 14.4},
    {"lottery", 518.958715596330, 291.699727470969, 14.5, 14.4},
    {"mavro", 2.00185600000000, 0.000429123454003053, 14.5, 12.5},
    {"michelson", 299.852400000000, 0.0790105478190518, 14.5, 13.4},
    {"pidigits", 4.53480000000000, 2.86733906028871, 14.5, 14.4},
    {"numacc1", 10000002, 1, 15, 15},
    {"numacc2", 1.2, 0.1, 14.5, 14.4},
    {"numacc3", 1000000.2, 0.1, 14.5, 9.0},
    {"numacc4", 10000000.2, 0.1, 14.5, 8.0},
};

/* NumAcc2 to 4: `whole` + .2 and then 500 pairs of .1 and .3. */
static double *numacc(struct arena *arena, const char *whole, size_t *n) {
    double *values = ARENA_NEW(arena, 1001, double);
    for (*n = 0; *n < 1001; ++*n) {
        char text[32];
        snprintf(text, sizeof text, "%s.%d", whole, *n == 0 ? 2 : *n % 2 ? 1 : 3);
        values[*n] = strtod(text, NULL);
    }
    return values;
}

static double *values_of(const char *set, size_t *n) {
    static const double numacc1[] = {10000001, 10000003, 10000002};
    struct arena *arena = &univariate.arena;
    if (strcmp(set, "numacc1") == 0) {
        *n = 3;
        return sorted_copy(arena, numacc1, 3);
    }
    if (strcmp(set, "numacc2") == 0)
        return numacc(arena, "1", n);
    if (strcmp(set, "numacc3") == 0)
        return numacc(arena, "1000000", n);
    if (strcmp(set, "numacc4") == 0)
        return numacc(arena, "10000000", n);
    return table_numbers(&univariate, "value", "set", set, n);
}

static void expect_digits(const char *set, const char *what, double digits, double least) {
    print_message("    %-10s %-20s %4.1f digits (at least %g)\n", set, what, digits, least);
    assert_true(digits >= least);
}

static void summaries_are_certified(void **state) {
    (void)state;
    for (size_t i = 0; i < sizeof summaries / sizeof *summaries; i++) {
        size_t n;
        double *values = values_of(summaries[i].set, &n);
        struct description d = describe(sorted_copy(&univariate.arena, values, n), n);
        assert_true(n >= 3);
        expect_digits(summaries[i].set, "mean", digits_agreed(d.mean, summaries[i].mean), summaries[i].mean_digits);
        expect_digits(summaries[i].set, "sd", digits_agreed(d.sd, summaries[i].sd), summaries[i].sd_digits);
    }
}

enum { ROWS_MAX = 82, COLUMNS_MAX = 11 };

struct regression {
    const char *set;
    size_t p;
    double noise;               /* of Wampler's formulas */
    double least, least_errors; /* digits of coefficients, and of their standard errors and sigma */
    double coefficients[COLUMNS_MAX], errors[COLUMNS_MAX], sigma;
};

static const struct regression regressions[] = {
    {"norris", 2, 0, 12.5, 13.4, {-0.262323073774029, 1.00211681802045}, {0.232818234301152, 0.429796848199937E-03},
        0.884796396144373},
    {"pontius", 3, 0, 12.5, 12.5, {0.673565789473684E-03, 0.732059160401003E-06, -0.316081871345029E-14},
        {0.107938612033077E-03, 0.157817399981659E-09, 0.486652849992036E-16}, 0.205177424076185E-03},
    {"longley", 7, 0, 12, 12,
        {-3482258.63459582, 15.0618722713733, -0.358191792925910E-01, -2.02022980381683, -1.03322686717359,
            -0.511041056535807E-01, 1829.15146461355},
        {890420.383607373, 84.9149257747669, 0.334910077722432E-01, 0.488399681651699, 0.214274163161675,
            0.226073200069370, 455.478499142212},
        304.854073561965},
    {"filip", 11, 0, 7, 7,
        {-1467.48961422980, -2772.17959193342, -2316.37108160893, -1127.97394098372, -354.478233703349,
            -75.1242017393757, -10.8753180355343, -1.06221498588947, -0.670191154593408E-01, -0.246781078275479E-02,
            -0.402962525080404E-04},
        {298.084530995537, 559.779865474950, 466.477572127796, 227.204274477751, 71.6478660875927, 15.2897178747400,
            2.23691159816033, 0.221624321934227, 0.142363763154724E-01, 0.535617408889821E-03, 0.896632837373868E-05},
        0.334801051324544E-02},
    {"wampler1", 6, 0, 10, 0, {1, 1, 1, 1, 1, 1}, {0}, 0},
    {"wampler2", 6, 0, 12, 0, {1, 0.1, 0.01, 0.001, 0.0001, 0.00001}, {0}, 0},
    {"wampler3", 6, 1, 10, 12, {1, 1, 1, 1, 1, 1},
        {2152.32624678170, 2363.55173469681, 779.343524331583, 101.475507550350, 5.64566512170752, 0.112324854679312},
        2360.14502379268},
    {"wampler4", 6, 100, 9, 12, {1, 1, 1, 1, 1, 1},
        {215232.624678170, 236355.173469681, 77934.3524331583, 10147.5507550350, 564.566512170752, 11.2324854679312},
        236014.502379268},
    {"wampler5", 6, 10000, 7, 12, {1, 1, 1, 1, 1, 1},
        {21523262.4678170, 23635517.3469681, 7793435.24331583, 1014755.07550350, 56456.6512170752, 1123.24854679312},
        23601450.2379268},
};

struct design {
    size_t n;
    double y[ROWS_MAX], columns[COLUMNS_MAX][ROWS_MAX];
};

static void powers(struct design *d, size_t row, double x, size_t p) {
    d->columns[0][row] = 1.0;
    for (size_t j = 1; j < p; j++)
        d->columns[j][row] = pow(x, (double)j);
}

/* y = sum of coefficient j times x^j, x = 0 .. 20, plus noise times a fixed pattern. */
static void wampler(struct design *d, const struct regression *r) {
    static const double pattern[21] = {759, -2048, 2048, -2048, 2523, -2048, 2048, -2048, 1838, -2048, 2048, -2048,
        1838, -2048, 2048, -2048, 2523, -2048, 2048, -2048, 759};
    static const double unit = 100000; /* wampler2 has five decimals: summed as whole numbers, then divided once */
    for (d->n = 0; d->n < 21; d->n++) {
        double sum = 0.0;
        powers(d, d->n, (double)d->n, r->p);
        for (size_t j = 0; j < r->p; j++)
            sum += rint(unit * r->coefficients[j]) * d->columns[j][d->n];
        d->y[d->n] = (sum + unit * r->noise * pattern[d->n]) / unit;
    }
}

static void read_design(struct design *d, const struct regression *r) {
    static const char *const names[] = {"x1", "x2", "x3", "x4", "x5", "x6"};
    d->n = 0;
    for (size_t i = 0; i < linear.rows; i++)
        if (strcmp(table_cell(&linear, i, "set"), r->set) == 0) {
            powers(d, d->n, table_number(&linear, i, "x1"), r->p);
            for (size_t j = 1; strcmp(r->set, "longley") == 0 && j < r->p; j++)
                d->columns[j][d->n] = table_number(&linear, i, names[j - 1]);
            d->y[d->n++] = table_number(&linear, i, "y");
        }
}

static void check_regression(const struct regression *r) {
    struct design d;
    struct arena arena;
    struct linear_fit fit;
    const double *columns[COLUMNS_MAX];
    double digits = 15, error_digits = 15;
    arena_init(&arena);
    if (strncmp(r->set, "wampler", 7) == 0)
        wampler(&d, r);
    else
        read_design(&d, r);
    for (size_t j = 0; j < r->p; j++)
        columns[j] = d.columns[j];
    linear_fit(&fit, columns, r->p, d.y, d.n, &arena);
    assert_int_equal(fit.status, STATUS_OK);
    assert_int_equal(fit.exact, r->sigma == 0.0); /* a certified 0 is told from a small number */
    for (size_t j = 0; j < r->p; j++) {
        digits = fmin(digits, digits_agreed(fit.coefficients[j], r->coefficients[j]));
        if (r->sigma > 0.0) {
            double error = linear_coefficient(&fit, COVARIANCE_CLASSICAL, j, 0.95).standard_error;
            error_digits = fmin(error_digits, digits_agreed(error, r->errors[j]));
        }
    }
    expect_digits(r->set, "coefficients", digits, r->least);
    if (r->sigma > 0.0) {
        expect_digits(r->set, "standard errors", error_digits, r->least_errors);
        expect_digits(r->set, "residual sd", digits_agreed(fit.sigma, r->sigma), r->least_errors);
    } else {
        near(fit.sigma, 0, 0, 1e-9, "residual sd of an exact polynomial");
    }
    arena_release(&arena);
}

static void regressions_are_certified(void **state) {
    (void)state;
    for (size_t i = 0; i < sizeof regressions / sizeof *regressions; i++)
        check_regression(&regressions[i]);
}

int main(void) {
    univariate = table_read("tests/reference/data/nist-univariate.csv");
    linear = table_read("tests/reference/data/nist-linear.csv");
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(summaries_are_certified),
        cmocka_unit_test(regressions_are_certified),
    };
    int failed = cmocka_run_group_tests_name("reference/nist", tests, NULL, NULL);
    table_release(&univariate);
    table_release(&linear);
    return failed;
}
