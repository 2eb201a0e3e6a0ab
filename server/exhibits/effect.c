/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Effect: the baseline-adjusted difference, and every other published way of estimating it, on one axis. */
#include "draw/estimates.h"
#include "exhibits/list.h"
#include "exhibits/model.h"
#include "exhibits/words.h"
#include "stats/permutation.h"
#include "stats/robust.h"
#include "stats/two-sample.h"
#include <math.h>
#include <stdlib.h>
#include <string.h>

/* ---- the methods, as a table: the order is the order of every rendering and never depends on a result ---- */

enum method { ANCOVA, ANCOVA_HC3, HUBER, PERMUTATION, CHANGE_WELCH, FINAL_WELCH, RANK_SHIFT, TRIMMED_MEAN, METHODS };
enum role { ROLE_PRIMARY, ROLE_SENSITIVITY, ROLE_SUPPLEMENTARY };
static const char *const role_names[] = {"primary", "sensitivity", "supplementary"};
static const char *const role_words[] = {"planned analysis", "sensitivity", "supplementary"};

static const struct {
    const char *name, *label, *ratio_label; /* the label where the effect is a ratio */
    enum role role;
    bool adjusted, of_change;
} methods[METHODS] = {
    [ANCOVA] = {"ancova", "Baseline-adjusted difference", "Baseline-adjusted ratio", ROLE_PRIMARY, true, false},
    [ANCOVA_HC3] = {"ancova-hc3", "The same, robust standard error", "The same, robust standard error", ROLE_SENSITIVITY, true, false},
    [HUBER] = {"huber", "The same, Huber M-estimate", "The same, Huber M-estimate", ROLE_SENSITIVITY, true, false},
    [PERMUTATION] = {"permutation", "The same, permutation p", "The same, permutation p", ROLE_SENSITIVITY, true, false},
    [CHANGE_WELCH] = {"change-welch", "Unadjusted difference in change", "Unadjusted ratio of changes", ROLE_SUPPLEMENTARY, false, true},
    [FINAL_WELCH] = {"final-welch", "Unadjusted difference at follow-up", "Unadjusted ratio at follow-up", ROLE_SUPPLEMENTARY, false, false},
    [RANK_SHIFT] = {"rank-shift", "Hodges-Lehmann shift in change", "Hodges-Lehmann shift in change", ROLE_SUPPLEMENTARY, false, true},
    [TRIMMED_MEAN] = {"trimmed-mean", "20% trimmed means of change", "20% trimmed means of change", ROLE_SUPPLEMENTARY, false, true},
};

struct contrast {
    size_t arm;
    struct estimate estimates[METHODS];
    size_t n_change[2];                    /* pairs with a change: arm, reference */
    size_t n_final[2];                     /* with a follow-up: arm, reference */
    struct permutation_result permutation;
    struct rank_shift shift;
};

struct effect_result {
    struct model model;
    struct contrast *contrasts;
    size_t contrast_count, shown; /* shown: index of the one in front */
    struct estimate *adjusted_means; /* [arms] */
    enum covariance_kind primary;
    enum method first; /* the planned one */
    bool post_hoc;
    const int *adjust; /* covariates in the model */
    size_t adjust_count, without_count;
};

/* ---- arguments that only this exhibit takes ---- */

static bool next_item(const char **at, char *item, size_t room) {
    *at += **at == ',';
    size_t length = strcspn(*at, ",");
    if (!**at || length + 1 > room) {
        return false;
    }
    memcpy(item, *at, length);
    item[length] = '\0';
    *at += length;
    return true;
}

static bool read_adjust(struct view *view, int **adjust, size_t *count, struct fault *fault) {
    const char *list = view_asked(view, "adjust");
    *adjust = list ? ARENA_NEW(view->arena, strlen(list) / 2 + 2, int) : NULL;
    char item[128];
    for (const char *at = list ? list : ""; next_item(&at, item, sizeof item);) {
        int covariate = plan_covariate(view->frame->plan, item);
        if (covariate == NOWHERE) {
            return fault_set(fault, FAULT_MISSING, "effect: adjust=%.60s is not the id of a covariate of the plan", item);
        }
        if (arms_hide_column(view->frame, view->frame->plan->covariates[covariate].column)) {
            return fault_set(fault, FAULT_REFUSED, "effect: adjust=%.60s would tell the arms apart, so it is hidden while the study is %s", item,
                blinding_name(view->frame->blinding));
        }
        for (size_t i = 0; i < *count; i++) {
            if ((*adjust)[i] == covariate) {
                return fault_set(fault, FAULT_INPUT, "effect: adjust= names %.60s twice; say it once", item);
            }
        }
        (*adjust)[(*count)++] = covariate;
    }
    return true;
}

static bool read_without(struct view *view, bool **without, size_t *count, struct fault *fault) {
    const char *list = view_asked(view, "without");
    *without = list ? ARENA_NEW(view->arena, view->frame->participant_count, bool) : NULL;
    char item[256];
    for (const char *at = list ? list : ""; next_item(&at, item, sizeof item);) {
        int who = frame_participant(view->frame, item);
        if (who == NOWHERE) {
            return fault_set(fault, FAULT_MISSING, "effect: without=%.60s is no participant's identifier", item);
        }
        *count += !(*without)[who];
        (*without)[who] = true;
    }
    return true;
}

/* ---- estimating ---- */

/* The values of one arm, of change or of the follow-up, without those left out. */
static size_t values_of(const struct model *model, size_t arm, bool change, const bool *without, double *kept) {
    const struct analysis *analysis = &model->analysis;
    size_t n = 0;
    for (size_t i = 0; i < analysis->count; i++) {
        double value = change ? analysis->change[i] : analysis->follow_up[i];
        if (analysis->arm[i] == (int)arm && !isnan(value) && !(without && without[analysis->participant[i]])) {
            kept[n++] = value;
        }
    }
    return n;
}

static void two_samples(struct contrast *contrast, const struct model *model, const struct view *view, const bool *without) {
    double confidence = view->frame->plan->confidence;
    size_t room = model->analysis.count, reference = view->arms.reference;
    double *x = ARENA_NEW(view->arena, room, double), *y = ARENA_NEW(view->arena, room, double);
    size_t nx = contrast->n_final[0] = values_of(model, contrast->arm, false, without, x);
    size_t ny = contrast->n_final[1] = values_of(model, reference, false, without, y);
    contrast->estimates[FINAL_WELCH] = welch(x, nx, y, ny, confidence);
    if (!model->analysis.has_baseline) {
        contrast->estimates[CHANGE_WELCH] = contrast->estimates[RANK_SHIFT] = contrast->estimates[TRIMMED_MEAN] =
            estimate_none(STATUS_NO_BASELINE);
        return;
    }
    nx = contrast->n_change[0] = values_of(model, contrast->arm, true, without, x);
    ny = contrast->n_change[1] = values_of(model, reference, true, without, y);
    contrast->estimates[CHANGE_WELCH] = welch(x, nx, y, ny, confidence);
    contrast->shift = rank_shift(x, nx, y, ny, confidence);
    contrast->estimates[RANK_SHIFT] = contrast->shift.estimate;
    contrast->estimates[TRIMMED_MEAN] = trimmed_mean_difference(x, nx, y, ny, 0.2, confidence);
}

/* Each combination of the randomisation's strata gets a label of its own. */
static size_t *strata_of(const struct model *model, const struct view *view) {
    const struct plan *plan = view->frame->plan;
    if (!plan->stratified_count) {
        return NULL;
    }
    size_t *strata = ARENA_NEW(view->arena, model->design.rows, size_t);
    for (size_t s = 0; s < plan->stratified_count; s++) {
        struct grouping grouping;
        grouping_take(&grouping, view->frame, plan->stratified_by[s], view->arena);
        for (size_t r = 0; r < model->design.rows; r++) {
            int group = grouping.of[model->analysis.participant[model->design.member[r]]];
            strata[r] = strata[r] * (grouping.count + 1) + (size_t)(group + 1);
        }
    }
    return strata;
}

static void permute(struct effect_result *result, const struct view *view) {
    const struct design *design = &result->model.design;
    const double **columns = ARENA_NEW(view->arena, design->columns, const double *);
    size_t first = design->columns, arms = 0;
    for (size_t c = 0; c < design->columns; c++) {
        columns[c] = design->column[c];
    }
    for (size_t a = 0; a < view->arms.count; a++) {
        size_t column = (size_t)design->arm_column[a];
        if (design->arm_column[a] != NOWHERE) {
            first = column < first ? column : first;
            arms++;
        }
    }
    if (!arms || result->model.fit.status != STATUS_OK) {
        return;
    }
    struct permutation_result *results = ARENA_NEW(view->arena, arms, struct permutation_result);
    struct permutation_task task = {.columns = columns, .p = design->columns, .n = design->rows, .first_arm = first, .arms = arms,
        .y = design->y, .strata = strata_of(&result->model, view), .permutations = permutation_count(design->rows),
        .seed = view->frame->plan->seed, .name = arena_format(view->arena, "permutation %s %s", result->model.analysis.outcome->id,
            result->model.analysis.outcome->visits[view->visit].label), .confidence = view->frame->plan->confidence};
    permutation_test(&task, results);
    for (size_t c = 0; c < result->contrast_count; c++) {
        struct contrast *contrast = &result->contrasts[c];
        int column = design->arm_column[contrast->arm];
        struct estimate *estimate = &contrast->estimates[PERMUTATION];
        if (column == NOWHERE) {
            continue;
        }
        contrast->permutation = results[(size_t)column - first];
        *estimate = estimate_none(contrast->permutation.status);
        if (estimate->status == STATUS_OK) {
            estimate->estimate = contrast->estimates[ANCOVA].estimate;
            estimate->p = contrast->permutation.p;
        }
    }
}

static void huber(struct effect_result *result, const struct view *view) {
    const struct design *design = &result->model.design;
    const double **columns = ARENA_NEW(view->arena, design->columns, const double *);
    for (size_t c = 0; c < design->columns; c++) {
        columns[c] = design->column[c];
    }
    struct huber_fit fit = {.status = result->model.fit.status};
    if (fit.status == STATUS_OK) {
        huber_fit(&fit, columns, design->columns, design->y, design->rows, view->arena);
    }
    for (size_t c = 0; c < result->contrast_count; c++) {
        int column = design->arm_column[result->contrasts[c].arm];
        result->contrasts[c].estimates[HUBER] = fit.status != STATUS_OK ? estimate_none(fit.status) :
            column == NOWHERE ? estimate_none(STATUS_TOO_FEW) :
                                huber_coefficient(&fit, (size_t)column, view->frame->plan->confidence);
    }
}

static void estimate_all(struct effect_result *result, const struct view *view, const bool *without) {
    const struct model *model = &result->model;
    result->contrasts = ARENA_NEW(view->arena, view->arms.count, struct contrast);
    for (size_t a = 0; a < view->arms.count; a++) {
        if (a == view->arms.reference) {
            continue;
        }
        result->shown = (int)a == view->arm ? result->contrast_count : result->shown;
        struct contrast *contrast = &result->contrasts[result->contrast_count++];
        contrast->arm = a;
        contrast->estimates[ANCOVA] = model_effect(model, view, a, COVARIANCE_CLASSICAL);
        contrast->estimates[ANCOVA_HC3] = model_effect(model, view, a, COVARIANCE_HC3);
        contrast->estimates[PERMUTATION] = estimate_none(
            contrast->estimates[ANCOVA].status == STATUS_OK ? STATUS_TOO_FEW : contrast->estimates[ANCOVA].status);
        two_samples(contrast, model, view, without);
    }
    huber(result, view);
    permute(result, view);
    result->adjusted_means = ARENA_NEW(view->arena, view->arms.count, struct estimate);
    for (size_t a = 0; a < view->arms.count; a++) {
        result->adjusted_means[a] = model_adjusted_mean(model, view, a, result->primary);
    }
}

/* ---- words ---- */

/* What the model in front is called: an outcome with one visit has no baseline to adjust for. */
static const char *model_words(const struct effect_result *result, enum scale scale) {
    bool ratio = scale == SCALE_LOG10;
    if (result->model.design.baseline_column != NOWHERE) {
        return ratio ? methods[ANCOVA].ratio_label : methods[ANCOVA].label;
    }
    return result->adjust_count ? (ratio ? "Adjusted ratio" : "Adjusted difference") :
                                  (ratio ? "Ratio of geometric means" : "Difference in means");
}

/* With the robust standard error in front, it is the classical one that is "the same". */
static const char *label_of(const struct effect_result *result, enum method method, enum scale scale) {
    if (method == result->first) {
        return model_words(result, scale);
    }
    if (method == ANCOVA) {
        return "The same, classical standard error";
    }
    return scale == SCALE_LOG10 ? methods[method].ratio_label : methods[method].label;
}

static const struct outcome *outcome_of(const struct view *view) {
    return &view->frame->plan->outcomes[view->outcome];
}

static const char *terms_words(const struct view *view, const struct effect_result *result) {
    struct text text;
    text_init(&text);
    text_string(&text, "arm");
    if (result->model.design.baseline_column != NOWHERE) {
        text_string(&text, result->adjust_count ? ", baseline" : " and baseline");
    }
    for (size_t i = 0; i < result->adjust_count; i++) {
        const char *label = view->frame->plan->covariates[result->adjust[i]].label;
        text_format(&text, "%s%s", i + 1 == result->adjust_count ? " and " : ", ", lower_first(view, label));
    }
    const char *copy = arena_text(view->arena, text.data);
    text_release(&text);
    return copy;
}

static void make_caption(struct view *view, const struct effect_result *result) {
    const struct contrast *contrast = &result->contrasts[result->shown];
    const char *terms = terms_words(view, result);
    const char *why = view->frame->plan->robust_because;
    view->caption = arena_format(view->arena, "%s, %s scale, %s. Planned analysis: follow-up on %s by least squares, %s standard error%s%s, t with "
        "%.0f df. It assumes that missing values are missing at random given %s.%s", contrast_words(view, contrast->arm),
        scale_name(view->scale), set_words(view->set), terms, result->primary == COVARIANCE_HC3 ? "robust (HC3)" : "classical",
        why ? " because " : "", why ? why : "", result->model.fit.df, terms,
        result->model.design.baseline_column != NOWHERE ?
            " Change and follow-up give the same adjusted difference, because baseline is in the model." : "");
}

static void make_notes(struct view *view, const struct effect_result *result) {
    const struct outcome *outcome = outcome_of(view);
    if (result->post_hoc) {
        view_note(view, "Post hoc: not the planned analysis; adjust= or without= was asked for%s.", result->without_count ?
            arena_format(view->arena, ", %zu participants left out", result->without_count) : "");
    }
    if (outcome->population || outcome->event_strategy || outcome->summary) {
        view_note(view, "Estimand: %s%s%s%s%s.", outcome->population ? outcome->population : "all randomised",
            outcome->event_strategy ? "; events: " : "", outcome->event_strategy ? outcome->event_strategy : "",
            outcome->summary ? "; summary: " : "", outcome->summary ? outcome->summary : "");
    }
    model_notes(&result->model, view);
    const struct contrast *contrast = &result->contrasts[result->shown];
    if (contrast->permutation.permutations) {
        view_note(view, "Permutation p from %zu shuffles (seed %llu): Monte Carlo interval %s.", contrast->permutation.permutations,
            (unsigned long long)view->frame->plan->seed,
            interval_words(view, contrast->permutation.monte_carlo.low, contrast->permutation.monte_carlo.high, 4));
    }
    if (contrast->estimates[RANK_SHIFT].status == STATUS_OK) {
        view_note(view, "The interval of the Hodges-Lehmann shift holds at %s%% (%s).", decimal_words(view, 100 * contrast->shift.achieved, 2),
            contrast->shift.exact ? "exact" : "normal, ties corrected");
    }
    if (view->arms.count > 2) {
        view_note(view, "Intervals are for one comparison at a time; nothing here corrects for several arms.");
    }
}

static bool compute(struct view *view, struct fault *fault) {
    struct effect_result *result = ARENA_NEW(view->arena, 1, struct effect_result);
    int *adjust = NULL;
    bool *without = NULL;
    size_t adjust_count = 0;
    if (!read_adjust(view, &adjust, &adjust_count, fault) || !read_without(view, &without, &result->without_count, fault)) {
        return false;
    }
    bool robust = view->frame->plan->robust;
    result->primary = robust ? COVARIANCE_HC3 : COVARIANCE_CLASSICAL;
    result->first = robust ? ANCOVA_HC3 : ANCOVA;
    result->post_hoc = adjust || without;
    result->adjust = adjust ? adjust : view->frame->plan->adjust_for;
    result->adjust_count = adjust ? adjust_count : view->frame->plan->adjust_count;
    struct model_request request = {.outcome = (size_t)view->outcome, .visit = (size_t)view->visit, .scale = view->scale,
        .set = view->set, 
        .covariate = NOWHERE, .adjust = result->adjust, .adjust_count = result->adjust_count, .without = without,
        .covariance = result->primary};
    model_fit(&result->model, view, &request);
    estimate_all(result, view, without);
    view->result = result;
    make_caption(view, result);
    make_notes(view, result);
    return true;
}

/* ---- renderings ---- */

static enum role role_of(const struct effect_result *result, enum method method) {
    return method == result->first && !result->post_hoc ? ROLE_PRIMARY :
        method == ANCOVA || method == ANCOVA_HC3        ? (method == result->first ? ROLE_SUPPLEMENTARY : ROLE_SENSITIVITY) :
                                                          methods[method].role;
}

/* The planned method first, then the table's order. */
static enum method in_order(const struct effect_result *result, int place) {
    static const enum method robust_first[] = {ANCOVA_HC3, ANCOVA};
    return result->first == ANCOVA_HC3 && place < 2 ? robust_first[place] : (enum method)place;
}

static void ratio_json(struct json *json, const struct estimate *estimate, bool log10_scale) {
    if (!log10_scale || estimate->status != STATUS_OK) {
        json_field_null(json, "ratio");
        return;
    }
    json_key_object(json, "ratio");
    json_field_number(json, "estimate", pow(10, estimate->estimate));
    json_field_number(json, "low", pow(10, estimate->low));
    json_field_number(json, "high", pow(10, estimate->high));
    json_close(json);
}

static void counts_of(const struct effect_result *result, const struct view *view, const struct contrast *contrast,
    enum method method, size_t n[2]) {
    const size_t *of_arm = result->model.design.n_of_arm;
    n[0] = methods[method].adjusted ? of_arm[contrast->arm] : methods[method].of_change ? contrast->n_change[0] : contrast->n_final[0];
    n[1] = methods[method].adjusted ? of_arm[view->arms.reference] :
        methods[method].of_change   ? contrast->n_change[1] :
                                      contrast->n_final[1];
}

static void counts_json(struct json *json, const size_t n[2]) {
    json_key_array(json, "n");
    json_integer(json, (int64_t)n[0]);
    json_integer(json, (int64_t)n[1]);
    json_close(json);
}

static void contrast_json(const struct view *view, const struct effect_result *result, const struct contrast *contrast,
    struct json *json) {
    size_t n[2];
    json_object(json);
    json_field_string(json, "arm", view->arms.arm[contrast->arm].code);
    json_field_string(json, "reference", view->arms.arm[view->arms.reference].code);
    json_field_string(json, "label", contrast_words(view, contrast->arm));
    counts_of(result, view, contrast, ANCOVA, n);
    counts_json(json, n);
    json_key_array(json, "estimates");
    for (int place = 0; place < METHODS; place++) {
        enum method method = in_order(result, place);
        const struct estimate *estimate = &contrast->estimates[method];
        json_object(json);
        json_field_string(json, "method", methods[method].name);
        json_field_string(json, "label", label_of(result, method, view->scale));
        json_field_string(json, "role", role_names[role_of(result, method)]);
        counts_of(result, view, contrast, method, n);
        counts_json(json, n);
        estimate_json(json, estimate);
        ratio_json(json, estimate, view->scale == SCALE_LOG10);
        if (method == PERMUTATION) {
            json_field_integer(json, "permutations", (int64_t)contrast->permutation.permutations);
            interval_json(json, "p_interval", contrast->permutation.monte_carlo.low, contrast->permutation.monte_carlo.high);
        }
        if (method == RANK_SHIFT) {
            json_field_number(json, "achieved", estimate->status == STATUS_OK ? contrast->shift.achieved : (double)NAN);
        }
        json_close(json);
    }
    json_close(json);
    json_close(json);
}

static void json(const struct view *view, struct json *json) {
    const struct effect_result *result = view->result;
    json_field_number(json, "confidence", view->frame->plan->confidence);
    json_field_bool(json, "post_hoc", result->post_hoc);
    json_field_integer(json, "not_on_scale", (int64_t)result->model.analysis.not_on_scale);
    json_field_string(json, "unit", outcome_of(view)->unit);
    json_key_array(json, "contrasts");
    for (size_t c = 0; c < result->contrast_count; c++) {
        contrast_json(view, result, &result->contrasts[c], json);
    }
    json_close(json);
    json_key_array(json, "adjusted_means");
    for (size_t a = 0; a < view->arms.count; a++) {
        const struct estimate *mean = &result->adjusted_means[a];
        json_object(json);
        arm_json(view, a, json);
        json_field_string(json, "status", status_name(mean->status));
        json_field_number(json, "mean", mean->estimate);
        json_field_number(json, "low", mean->low);
        json_field_number(json, "high", mean->high);
        json_close(json);
    }
    json_close(json);
}

static double shown_value(const struct view *view, double value) {
    return view->scale == SCALE_LOG10 ? pow(10, value) : value;
}

static int shown_decimals(const struct view *view) {
    return view->scale == SCALE_LOG10 ? 3 : decimals_of(view, outcome_of(view), view->scale);
}

static void put_interval(struct table *table, const struct view *view, const struct estimate *estimate, int decimals) {
    table_put_number(table, shown_value(view, estimate->estimate), decimals);
    table_put_number(table, shown_value(view, estimate->low), decimals);
    table_put_number(table, shown_value(view, estimate->high), decimals);
}

static void p_cell(struct table *table, double p) {
    struct text text;
    text_init(&text);
    text_p_value(&text, p);
    table_put_text(table, text.data);
    text_release(&text);
}

/* An arm's mean without a number says why. */
static void note_missing_means(const struct view *view, const struct effect_result *result, struct table *means) {
    const struct design *design = &result->model.design;
    for (size_t a = 0; a < view->arms.count; a++) {
        enum status status = result->adjusted_means[a].status;
        if (status == STATUS_TOO_FEW && result->model.fit.status == STATUS_OK && design->n_of_arm[a]) {
            table_note(means, "Not estimable with the robust standard error: one participant alone decides a term of the "
                "model, such as a level that nobody else has.");
            return;
        }
        if (status != STATUS_OK) {
            table_note(means, arena_format(view->arena, "%s: %s", view->arms.arm[a].label, status_sentence(status)));
        }
    }
}

static void tables(const struct view *view, struct table **tables, size_t *count) {
    const struct effect_result *result = view->result;
    bool log10_scale = view->scale == SCALE_LOG10;
    int decimals = shown_decimals(view);
    const char *unit = log10_scale ? "ratio" : *outcome_of(view)->unit ? outcome_of(view)->unit : NULL;
    struct table *table = table_new(view->arena, "Estimates");
    table_column(table, "method", "Method", NULL, TABLE_WORDS);
    table_column(table, "role", "Role", NULL, TABLE_WORDS);
    table_column(table, "n_arm", "n, arm", NULL, TABLE_NUMBERS);
    table_column(table, "n_reference", "n, reference", NULL, TABLE_NUMBERS);
    table_column(table, "estimate", log10_scale ? "Ratio" : "Difference", unit, TABLE_NUMBERS);
    table_column(table, "low", arena_format(view->arena, "%s CI from", percent_words(view, view->frame->plan->confidence)), unit, TABLE_NUMBERS);
    table_column(table, "high", "to", unit, TABLE_NUMBERS);
    if (log10_scale) {
        table_column(table, "percent", "Percent", "change", TABLE_NUMBERS);
    }
    table_column(table, "standard_error", "Standard error", log10_scale ? "log10" : unit, TABLE_NUMBERS);
    table_column(table, "df", "df", NULL, TABLE_NUMBERS);
    table_column(table, "p", "p", NULL, TABLE_NUMBERS);
    table_column(table, "status", "Status", NULL, TABLE_WORDS);
    for (size_t c = 0; c < result->contrast_count; c++) {
        const struct contrast *contrast = &result->contrasts[c];
        table_group(table, contrast_words(view, contrast->arm));
        for (int place = 0; place < METHODS; place++) {
            enum method method = in_order(result, place);
            const struct estimate *estimate = &contrast->estimates[method];
            size_t n[2];
            counts_of(result, view, contrast, method, n);
            table_row(table);
            table_put_header(table, label_of(result, method, view->scale));
            table_put_text(table, role_words[role_of(result, method)]);
            table_put_count(table, (int64_t)n[0]);
            table_put_count(table, (int64_t)n[1]);
            put_interval(table, view, estimate, decimals);
            if (log10_scale) {
                table_put_signed(table, 100 * (pow(10, estimate->estimate) - 1), 1);
            }
            table_put_number(table, estimate->standard_error, log10_scale ? 4 : decimals + 1);
            table_put_number(table, estimate->df, 1);
            p_cell(table, estimate->p);
            table_put_text(table, estimate->status == STATUS_OK ? "ok" : status_sentence(estimate->status));
            if (role_of(result, method) == ROLE_PRIMARY) {
                table_row_emphasise(table);
            }
        }
    }
    tables[(*count)++] = table;
    struct table *means = table_new(view->arena, log10_scale ? "Adjusted geometric means" : "Adjusted means");
    table_column(means, "arm", "Arm", NULL, TABLE_WORDS);
    table_column(means, "n", "n", NULL, TABLE_NUMBERS);
    table_column(means, "mean", log10_scale ? "Geometric mean" : "Mean", *outcome_of(view)->unit ? outcome_of(view)->unit : NULL, TABLE_NUMBERS);
    table_column(means, "low", arena_format(view->arena, "%s CI from", percent_words(view, view->frame->plan->confidence)), NULL, TABLE_NUMBERS);
    table_column(means, "high", "to", NULL, TABLE_NUMBERS);
    for (size_t a = 0; a < view->arms.count; a++) {
        table_row(means);
        table_put_header(means, view->arms.arm[a].label);
        table_put_count(means, (int64_t)result->model.design.n_of_arm[a]);
        put_interval(means, view, &result->adjusted_means[a], log10_scale ? 2 : decimals);
    }
    table_note(means, "Average prediction over all analysed participants with the arm set for all.");
    note_missing_means(view, result, means);
    tables[(*count)++] = means;
}

static void lead(const struct view *view, struct html *html) {
    const struct effect_result *result = view->result;
    const struct contrast *contrast = &result->contrasts[result->shown];
    const struct estimate *estimate = &contrast->estimates[result->first];
    const char *arm = view->arms.arm[contrast->arm].label, *reference = view->arms.arm[view->arms.reference].label;
    bool log10_scale = view->scale == SCALE_LOG10;
    int decimals = log10_scale ? 2 : shown_decimals(view);
    bool adjusted = result->model.design.baseline_column != NOWHERE || result->adjust_count;
    const char *what = log10_scale ? "ratio of geometric means " : "mean difference ";
    html_text(html, result->post_hoc ? (adjusted ? "Post hoc, adjusted " : "Post hoc, ") : adjusted ? "Adjusted " : "");
    html_text(html, result->post_hoc || adjusted ? what : log10_scale ? "Ratio of geometric means " : "Mean difference ");
    if (estimate->status != STATUS_OK) {
        html_element(html, "strong", "large", status_sentence(estimate->status));
        return;
    }
    html_open(html, "strong");
    html_attribute(html, "class", "large");
    html_text(html, decimal_words(view, shown_value(view, estimate->estimate), decimals));
    html_text(html, log10_scale ? "" : unit_after(view, outcome_of(view)->unit));
    html_close(html);
    const char *percent = log10_scale ?
        arena_format(view->arena, " (%s%%)", signed_words(view, 100 * (pow(10, estimate->estimate) - 1), 0)) : "";
    html_format(html, "%s %s %s %s, %s CI %s, %zu %s, %zu %s, %s.", percent, arm, log10_scale ? "over" : "minus", reference,
        percent_words(view, view->frame->plan->confidence),
        interval_words(view, shown_value(view, estimate->low), shown_value(view, estimate->high), decimals),
        result->model.design.n_of_arm[contrast->arm], lower_first(view, arm), result->model.design.n_of_arm[view->arms.reference],
        lower_first(view, reference), set_words(view->set));
}

static const char *figures_words(const struct view *view, const struct estimate *estimate, int decimals) {
    const char *value = decimal_words(view, shown_value(view, estimate->estimate), decimals);
    if (isnan(estimate->low)) {
        struct text p;
        text_init(&p);
        text_p_value(&p, estimate->p);
        const char *words = arena_format(view->arena, "%s (p %s)", value, p.data);
        text_release(&p);
        return words;
    }
    return arena_format(view->arena, "%s (%s)", value,
        interval_words(view, shown_value(view, estimate->low), shown_value(view, estimate->high), decimals));
}

/* The range of differences at least as large as the important one, towards benefit; only where the arms are known. */
static void important_band(const struct view *view, struct estimates *estimates) {
    const struct outcome *outcome = outcome_of(view);
    double important = outcome->important_difference;
    estimates->band_low = estimates->band_high = NAN;
    if (isnan(important) || view->arms.coded || view->arms.pooled) {
        return;
    }
    bool log10_scale = view->scale == SCALE_LOG10;
    double size = log10_scale ? (important > 1 ? important : 1 / important) : fabs(important);
    double edge = log10_scale ? (outcome->lower_is_better ? 1 / size : size) : outcome->lower_is_better ? -size : size;
    estimates->band_low = outcome->lower_is_better ? -(double)INFINITY : edge;
    estimates->band_high = outcome->lower_is_better ? edge : (double)INFINITY;
    estimates->band_label = "at least the important difference";
}

static void figure(const struct view *view, const struct figure *figure, struct html *html) {
    const struct effect_result *result = view->result;
    const struct contrast *contrast = &result->contrasts[result->shown];
    const struct outcome *outcome = outcome_of(view);
    bool log10_scale = view->scale == SCALE_LOG10;
    int decimals = log10_scale ? 2 : shown_decimals(view);
    const char *apart = result->model.design.baseline_column != NOWHERE ? "Not adjusted for baseline as a covariate" :
                        result->adjust_count                             ? "Not adjusted for covariates" : "Other ways";
    struct estimates_row rows[METHODS];
    for (int place = 0; place < METHODS; place++) {
        enum method method = in_order(result, place);
        const struct estimate *estimate = &contrast->estimates[method];
        bool ok = estimate->status == STATUS_OK, planned = role_of(result, method) == ROLE_PRIMARY;
        rows[place] = (struct estimates_row){.label = label_of(result, method, view->scale), .role = role_words[role_of(result, method)],
            .estimate = shown_value(view, estimate->estimate), .low = shown_value(view, estimate->low),
            .high = shown_value(view, estimate->high), .figures = ok ? figures_words(view, estimate, decimals) : NULL,
            .sentence = ok ? NULL : status_sentence(estimate->status), .emphasised = planned,
            .group = method == CHANGE_WELCH ? apart : NULL};
    }
    const char *arm = lower_first(view, view->arms.arm[contrast->arm].label);
    const char *reference = lower_first(view, view->arms.arm[view->arms.reference].label);
    struct estimates estimates = {.mark = mark_of(view, contrast->arm), .rows = rows, .row_count = METHODS, .role_heading = NULL,
        .figures_heading = arena_format(view->arena, "%s (%s CI)", log10_scale ? "Ratio" : "Difference",
            percent_words(view, view->frame->plan->confidence))};
    estimates.axis = (struct axis_plan){.scale = log10_scale ? AXIS_LOG10 : AXIS_LINEAR, .low = NAN, .high = NAN,
        .null_line = log10_scale ? 1 : 0};
    estimates.axis.title = log10_scale ? "Ratio of geometric means" :
                                         arena_format(view->arena, "Difference%s%s", *outcome->unit ? ", " : "", outcome->unit);
    estimates.axis.lower = arena_format(view->arena, "favours %s", outcome->lower_is_better ? arm : reference);
    estimates.axis.upper = arena_format(view->arena, "favours %s", outcome->lower_is_better ? reference : arm);
    important_band(view, &estimates);
    estimates_svg(&estimates, figure, html);
}

static void title_of(const struct view *view, struct text *title) {
    const struct outcome *outcome = outcome_of(view);
    text_format(title, "What is the difference in %s at %s?", lower_first(view, outcome->label),
        lower_first(view, outcome->visits[view->visit].label));
}

static const struct argument_rule arguments[] = {
    {"outcome", ARGUMENT_OUTCOME, "Which outcome; default the primary", NULL, true},
    {"visit", ARGUMENT_VISIT, "At which visit; default the primary visit", NULL, true},
    {"arm", ARGUMENT_ARM, "With more than two arms, which one against the reference; default the first", NULL, true},
    {"set", ARGUMENT_SET, "full or per-protocol; default full", NULL, false},
    {"scale", ARGUMENT_SCALE, "linear or log10; default the latest decision, else the plan", NULL, false},
    {"adjust", ARGUMENT_COVARIATES, "Other covariates than the plan's, ids with commas between: marks the exhibit post hoc", NULL, false},
    {"without", ARGUMENT_PARTICIPANTS, "Participants left out, with commas between: marks the exhibit post hoc", NULL, false},
    {0},
};

const struct exhibit exhibit_effect = {
    .name = "effect",
    .item = 6,
    .title = "What is the difference between the arms?",
    .tab = "Effect",
    .says = "The baseline-adjusted difference with its interval, and the other ways of estimating it on one axis",
    .pooled = REFUSED,
    .by_arm_look = true,
    .method = "Baseline-adjusted difference: one linear model of the follow-up on indicators of the arms, the baseline and the plan's covariates, by QR "
              "of centred and scaled columns; interval estimate ± t(n − p) standard errors (Vickers & Altman 2001, BMJ 323:1123; "
              "EMA/CHMP/295050/2013). On log10 the difference is back-transformed once: 10^difference is a ratio of geometric means (Bland & "
              "Altman 1996, BMJ 312:1079).\n"
              "Robust standard error: HC3 (MacKinnon & White 1985, J Econometrics 29:305; Long & Ervin 2000, Am Stat 54:217). Huber M-estimate: k = "
              "1.345, scale from the median absolute residual (Huber 1964, Ann Math Stat 35:73). Permutation: Freedman & Lane 1983 (J Bus Econ Stat "
              "1:292) within the strata of the randomisation, p = (b + 1)/(m + 1) (Phipson & Smyth 2010).\n"
              "Unadjusted: Welch 1947 (Biometrika 34:28) on change and on the follow-up; Hodges & Lehmann 1963 (Ann Math Stat 34:598) and the rank-sum "
              "test; 20% trimmed means (Yuen 1974, Biometrika 61:165). They answer a slightly different question and are less precise "
              "where baseline predicts follow-up.\n"
              "Rows stand in a fixed order that no result changes. An interval shows which differences the data are compatible with; a wide one that "
              "spans no difference is not evidence of none.",
    .arguments = arguments,
    .compute = compute,
    .json = json,
    .tables = tables,
    .figure = figure,
    .lead = lead,
    .title_of = title_of,
};
