/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "exhibits/model.h"
#include "exhibits/words.h"
#include "stats/distributions.h"
#include <math.h>
#include <string.h>

static const double NONE = NAN;

static void fit_design(struct linear_fit *fit, const struct design *design, struct arena *arena) {
    const double **columns = ARENA_NEW(arena, design->columns, const double *);
    for (size_t i = 0; i < design->columns; i++) {
        columns[i] = design->column[i];
    }
    linear_fit(fit, columns, design->columns, design->y, design->rows, arena);
}

static struct estimate effect_in(const struct model *model, int column, enum covariance_kind covariance, double confidence) {
    return model->fit.status != STATUS_OK ? estimate_none(model->fit.status) :
        column == NOWHERE                 ? estimate_none(STATUS_TOO_FEW) :
                                            linear_coefficient(&model->fit, covariance, (size_t)column, confidence);
}

struct estimate model_effect(const struct model *model, const struct view *view, size_t arm, enum covariance_kind covariance) {
    bool there = model->design.n_of_arm[arm] > 0 && model->design.n_of_arm[view->arms.reference] > 0;
    return there ? effect_in(model, model->design.arm_column[arm], covariance, view->frame->plan->confidence) :
                   estimate_none(STATUS_TOO_FEW);
}

struct estimate model_adjusted_mean(
    const struct model *model, const struct view *view, size_t arm, enum covariance_kind covariance) {
    if (model->fit.status != STATUS_OK || model->design.n_of_arm[arm] == 0) {
        return estimate_none(model->fit.status != STATUS_OK ? model->fit.status : STATUS_TOO_FEW);
    }
    double *weights = ARENA_NEW(view->arena, model->fit.p, double);
    memcpy(weights, model->fit.mean_row, model->fit.p * sizeof *weights);
    for (size_t a = 0; a < view->arms.count; a++) {
        if (model->design.arm_column[a] != NOWHERE) {
            weights[model->design.arm_column[a]] = a == arm ? 1 : 0;
        }
    }
    return linear_contrast(&model->fit, covariance, weights, view->frame->plan->confidence);
}

/* Effect in the second level minus effect in the first. */
static struct estimate difference_of_effects(const struct model *model, size_t arm, size_t arms, enum covariance_kind covariance,
    double confidence, struct arena *arena) {
    int first = model->design.cell_column[arm], second = model->design.cell_column[arms + arm];
    if (first == NOWHERE || second == NOWHERE) {
        return estimate_none(STATUS_TOO_FEW);
    }
    double *weights = ARENA_NEW(arena, model->fit.p, double);
    weights[first] = -1;
    weights[second] = 1;
    return linear_contrast(&model->fit, covariance, weights, confidence);
}

/* F of the model with an effect in each level against the one with one effect over all. */
static void test_interaction(struct model *model, const struct view *view, const struct design_request *request,
    enum covariance_kind covariance) {
    struct design_request main_only = *request;
    main_only.interaction = false;
    struct design design;
    design_take(&design, &model->analysis, &main_only, view->arena);
    struct linear_fit fit;
    fit_design(&fit, &design, view->arena);
    model->interaction.status = fit.status != STATUS_OK ? fit.status : model->fit.status;
    if (model->interaction.status != STATUS_OK) {
        return;
    }
    double df1 = (double)model->fit.p - (double)fit.p;
    if (df1 < 1) {
        model->interaction.status = STATUS_TOO_FEW;
        return;
    }
    if (model->fit.exact) {
        model->interaction.status = STATUS_NO_VARIANCE;
        return;
    }
    double explained = fit.sum_of_squares - model->fit.sum_of_squares;
    model->interaction.df1 = df1;
    model->interaction.df2 = model->fit.df;
    model->interaction.f = (explained > 0 ? explained : 0) / df1 / (model->fit.sum_of_squares / model->fit.df);
    model->interaction.p = f_upper(model->interaction.f, df1, model->fit.df);
    if (model->by.count == 2 && view->arms.count == 2) {
        model->interaction.difference = difference_of_effects(model, 1 - view->arms.reference, 2, covariance,
            view->frame->plan->confidence, view->arena);
    }
}

void model_fit(struct model *model, const struct view *view, const struct model_request *request) {
    const struct plan *plan = view->frame->plan;
    size_t arms = view->arms.count;
    *model = (struct model){0};
    analysis_take(&model->analysis, view->frame, &view->arms, request->outcome, request->visit, request->scale, request->set,
        view->arena);
    grouping_take(&model->by, view->frame, request->covariate, view->arena);
    bool split = request->covariate != NOWHERE;
    struct design_request design = {.adjust = request->adjust ? request->adjust : plan->adjust_for,
        .adjust_count = request->adjust ? request->adjust_count : plan->adjust_count, .without = request->without,
        .by = split ? &model->by : NULL, .interaction = split};
    design_take(&model->design, &model->analysis, &design, view->arena);
    fit_design(&model->fit, &model->design, view->arena);
    model->effect = ARENA_NEW(view->arena, model->by.count * arms, struct estimate);
    model->n = split ? model->design.n_of_cell : model->design.n_of_arm;
    for (size_t i = 0; i < model->by.count * arms; i++) {
        model->effect[i] = split ? effect_in(model, model->design.cell_column[i], request->covariance, plan->confidence) :
                                   model_effect(model, view, i, request->covariance);
    }
    model->interaction.status = STATUS_TOO_FEW;
    model->interaction.f = model->interaction.df1 = model->interaction.df2 = model->interaction.p = NONE;
    model->interaction.difference = estimate_none(STATUS_TOO_FEW);
    if (split) {
        test_interaction(model, view, &design, request->covariance);
    }
}

static void count_note(struct view *view, size_t count, const char *one, const char *many) {
    if (count) {
        view_note(view, "%zu %s", count, count == 1 ? one : many);
    }
}

void model_notes(const struct model *model, struct view *view) {
    const struct design *design = &model->design;
    const struct analysis *analysis = &model->analysis;
    count_note(view, analysis->held_aside, "participant is held aside: several records, and none kept yet.",
        "participants are held aside: several records each, and none kept yet.");
    count_note(view, analysis->no_arm, "participant has no arm that the plan lists and is out of every exhibit by arm.",
        "participants have no arm that the plan lists and are out of every exhibit by arm.");
    count_note(view, analysis->excluded, "participant is left out of this set by a decision.",
        "participants are left out of this set by decisions.");
    count_note(view, analysis->not_on_scale,
        "participant has a value that log10 cannot take; such a value is out of this analysis.",
        "participants have a value that log10 cannot take; such values are out of this analysis.");
    count_note(view, design->baseline_filled,
        "missing baseline takes the mean of the observed baselines of the set (White & Thompson 2005).",
        "missing baselines take the mean of the observed baselines of the set (White & Thompson 2005).");
    count_note(view, design->baseline_dropped, "participant is dropped for a missing baseline, as the plan says.",
        "participants are dropped for a missing baseline, as the plan says.");
    count_note(view, design->covariate_filled, "missing value of a covariate takes the mean of the set.",
        "missing values of covariates take the mean of the set.");
    count_note(view, design->blank_category, "blank category is a level of its own in the model.",
        "blank categories are a level of their own in the model.");
    count_note(view, design->no_level, "participant has no level of the covariate shown and is out of this model.",
        "participants have no level of the covariate shown and are out of this model.");
    if (model->fit.status == STATUS_SINGULAR) {
        view_note(view, "The model cannot be estimated: its term \"%s\" is determined by the terms before it.",
            design->name[model->fit.singular_column]);
    }
}

void interaction_json(struct json *json, const struct model *model) {
    json_key_object(json, "interaction");
    json_field_number(json, "f", model->interaction.f);
    json_field_number(json, "df1", model->interaction.df1);
    json_field_number(json, "df2", model->interaction.df2);
    json_field_number(json, "p", model->interaction.p);
    json_field_string(json, "status", status_name(model->interaction.status));
    json_close(json);
    json_field_number(json, "difference_of_differences", model->interaction.difference.estimate);
    interval_json(json, "difference_of_differences_interval", model->interaction.difference.low, model->interaction.difference.high);
}
