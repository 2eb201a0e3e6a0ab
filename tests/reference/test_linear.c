/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Analysis of covariance, sandwich errors, adjusted means and Huber's estimate against R: lm, sandwich::vcovHC and
 * MASS::rlm(acc = 1e-14) on open trial data (tests/reference/compute.R). */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <cmocka.h>
#include "reference.h"
#include "stats/linear.h"
#include "stats/robust.h"

enum { COLUMNS_MAX = 6 };

/* One column of a model: a cell's number (log10 of it where so), or 1 where the cell is `level`. */
struct term {
    const char *column, *level;
    bool logged;
};

static const struct model {
    const char *name, *file;
    struct term outcome, terms[COLUMNS_MAX];
    size_t arms; /* the first so many terms */
    const char *arm_names[2];
    double confidence;
} models[] = {
    {"anorexia", "anorexia", {"Postwt", NULL, false},
        {{"Treat", "CBT", false}, {"Treat", "FT", false}, {"Prewt", NULL, false}}, 2, {"cbt", "ft"}, 0.95},
    {"btheb2", "btheb", {"month2", NULL, false},
        {{"treatment", "BtheB", false}, {"before", NULL, false}, {"drug", "Yes", false}, {"length", "short", false}}, 1,
        {"arm", NULL}, 0.95},
    {"btheb8", "btheb", {"month8", NULL, false},
        {{"treatment", "BtheB", false}, {"before", NULL, false}, {"drug", "Yes", false}, {"length", "short", false}}, 1,
        {"arm", NULL}, 0.90},
    {"polyps", "polyps", {"number3m", NULL, true}, {{"treatment", "active", false}, {"baseline", NULL, true}}, 1,
        {"arm", NULL}, 0.95},
    {"twelve", "twelve", {"after", NULL, false}, {{"arm", NULL, false}, {"before", NULL, false}}, 1, {"arm", NULL},
        0.95},
    {"stackloss", "stackloss", {"stack.loss", NULL, false},
        {{"Air.Flow", NULL, false}, {"Water.Temp", NULL, false}, {"Acid.Conc.", NULL, false}}, 0, {NULL, NULL}, 0.95},
};
enum { MODELS = sizeof models / sizeof *models };

struct design {
    struct table table;
    size_t n, p;
    double *columns[COLUMNS_MAX], *y;
};

static double number_of(const struct table *table, size_t row, const struct term *term) {
    if (term->level)
        return strcmp(table_cell(table, row, term->column), term->level) == 0 ? 1.0 : 0.0;
    double value = table_number(table, row, term->column);
    return term->logged ? log10(value) : value;
}

static struct design design_of(const struct model *model) {
    char path[96];
    snprintf(path, sizeof path, "tests/reference/data/%s.csv", model->file);
    struct design d = {.table = table_read(path), .p = 1};
    while (d.p < COLUMNS_MAX && model->terms[d.p - 1].column)
        d.p++;
    d.y = ARENA_NEW(&d.table.arena, d.table.rows, double);
    for (size_t j = 0; j < d.p; j++)
        d.columns[j] = ARENA_NEW(&d.table.arena, d.table.rows, double);
    for (size_t i = 0; i < d.table.rows; i++) {
        double y = number_of(&d.table, i, &model->outcome);
        if (isnan(y))
            continue;
        d.y[d.n] = y;
        d.columns[0][d.n] = 1.0;
        for (size_t j = 1; j < d.p; j++)
            d.columns[j][d.n] = number_of(&d.table, i, &model->terms[j - 1]);
        d.n++;
    }
    return d;
}

static void check_estimate(const struct table *values, const char *name, const char *label, const struct estimate *e,
    bool with_p, double tolerance) {
    const struct {
        const char *what;
        double got;
    } parts[] = {{"estimate", e->estimate}, {"standard_error", e->standard_error}, {"df", e->df}, {"low", e->low},
        {"high", e->high}, {"p", e->p}};
    assert_int_equal(e->status, STATUS_OK);
    for (size_t i = 0; i < (with_p ? 6 : 5); i++) {
        char quantity[64];
        snprintf(quantity, sizeof quantity, "%s %s", label, parts[i].what);
        /* a p far out moves by t^2 times the relative gap of t */
        table_check(values, name, quantity, parts[i].got, i == 5 ? 30 * tolerance : tolerance);
    }
}

static void check_coefficients(const struct table *values, const struct model *model, const struct linear_fit *fit) {
    static const struct {
        const char *name;
        enum covariance_kind kind;
    } kinds[] = {{"", COVARIANCE_CLASSICAL}, {" HC0", COVARIANCE_HC0}, {" HC1", COVARIANCE_HC1},
        {" HC2", COVARIANCE_HC2}, {" HC3", COVARIANCE_HC3}};
    double covariance[COLUMNS_MAX * COLUMNS_MAX];
    for (size_t k = 0; k < 5; k++) {
        linear_covariance(fit, kinds[k].kind, covariance);
        for (size_t j = 0; j < fit->p; j++) {
            char label[32];
            struct estimate e = linear_coefficient(fit, kinds[k].kind, j, model->confidence);
            snprintf(label, sizeof label, "b%zu%s", j, kinds[k].name);
            if (kinds[k].kind == COVARIANCE_CLASSICAL || kinds[k].kind == COVARIANCE_HC3)
                check_estimate(values, model->name, label, &e, true, 1e-10);
            else
                table_check(values, model->name, label, e.standard_error, 1e-10);
            near(sqrt(covariance[j * fit->p + j]), e.standard_error, 1e-9, 0, "matrix and contrast");
        }
    }
}

static void check_means(const struct table *values, const struct model *model, const struct linear_fit *fit) {
    for (size_t arm = 0; arm <= model->arms && model->arms > 0; arm++) {
        double weights[COLUMNS_MAX];
        char label[32];
        memcpy(weights, fit->mean_row, fit->p * sizeof *weights);
        for (size_t a = 1; a <= model->arms; a++)
            weights[a] = a == arm ? 1.0 : 0.0;
        struct estimate e = linear_contrast(fit, COVARIANCE_CLASSICAL, weights, model->confidence);
        snprintf(label, sizeof label, "mean %s", arm == 0 ? "none" : model->arm_names[arm - 1]);
        check_estimate(values, model->name, label, &e, false, 1e-10);
    }
}

static void covariance_agrees_with_r(void **state) {
    (void)state;
    struct table values = table_read("tests/reference/values/linear.csv");
    for (size_t m = 0; m < MODELS; m++) {
        struct design d = design_of(&models[m]);
        struct linear_fit fit;
        linear_fit(&fit, (const double *const *)d.columns, d.p, d.y, d.n, &d.table.arena);
        assert_int_equal(fit.status, STATUS_OK);
        double largest = 0.0;
        for (size_t i = 0; i < d.n; i++)
            largest = fmax(largest, fit.leverages[i]);
        table_check(&values, models[m].name, "sigma", fit.sigma, 1e-10);
        table_check(&values, models[m].name, "largest leverage", largest, 1e-10);
        check_coefficients(&values, &models[m], &fit);
        check_means(&values, &models[m], &fit);
        table_release(&d.table);
    }
    table_release(&values);
}

static void huber_agrees_with_r(void **state) {
    (void)state;
    struct table values = table_read("tests/reference/values/robust.csv");
    for (size_t m = 0; m < MODELS; m++) {
        struct design d = design_of(&models[m]);
        struct huber_fit fit;
        huber_fit(&fit, (const double *const *)d.columns, d.p, d.y, d.n, &d.table.arena);
        assert_int_equal(fit.status, STATUS_OK);
        table_check(&values, models[m].name, "scale", fit.scale, 1e-8);
        for (size_t j = 0; j < d.p; j++) {
            char label[32];
            struct estimate e = huber_coefficient(&fit, j, models[m].confidence);
            snprintf(label, sizeof label, "b%zu", j);
            check_estimate(&values, models[m].name, label, &e, true, 1e-8);
        }
        table_release(&d.table);
    }
    table_release(&values);
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(covariance_agrees_with_r),
        cmocka_unit_test(huber_agrees_with_r),
    };
    return cmocka_run_group_tests_name("reference/linear", tests, NULL, NULL);
}
