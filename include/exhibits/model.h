/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The one linear model as exhibits use it: an effect for every arm against the reference, over all or within the levels of a
 * covariate, with the interaction. Everything lives in the arena given. Source: Vickers & Altman 2001, BMJ 323:1123;
 * EMA/CHMP/295050/2013; MacKinnon & White 1985, J Econometrics 29:305 (HC3). */
#ifndef EVENHAND_EXHIBITS_MODEL_H
#define EVENHAND_EXHIBITS_MODEL_H
#include "exhibits/registry.h"
#include "stats/linear.h"

struct model {
    struct analysis analysis;
    struct design design;
    struct linear_fit fit;
    struct grouping by;       /* of the request; one group for everyone without a covariate */
    struct estimate *effect;  /* [groups * arms] arm minus reference within the group; the reference's entry is unused */
    size_t *n;                /* [groups * arms] rows */
    struct {                  /* NaN and a status without a covariate, or where it cannot be estimated */
        enum status status;
        double f, df1, df2, p;
        struct estimate difference; /* with two groups and two arms: effect in the second minus effect in the first */
    } interaction;
};

struct model_request {
    size_t outcome, visit;
    enum scale scale;
    enum set set;
    int covariate;       /* NOWHERE: one effect over all */
    const int *adjust;   /* indices of covariates; NULL: the plan's adjust_for */
    size_t adjust_count;
    const bool *without; /* [participants], may be NULL */
    enum covariance_kind covariance;
};
void model_fit(struct model *model, const struct view *view, const struct model_request *request);

/* The effect of one arm from the fit, by either covariance: status too-few where arm or reference has no rows. */
struct estimate model_effect(const struct model *model, const struct view *view, size_t arm, enum covariance_kind covariance);
/* The average prediction over the analysed rows with the arm set for all. */
struct estimate model_adjusted_mean(const struct model *model, const struct view *view, size_t arm, enum covariance_kind covariance);
/* Notes about what filled in for missing covariates, who is out and why; the same words wherever the model is used. */
void model_notes(const struct model *model, struct view *view);
/* "interaction": {f, df1, df2, p, status}; with two levels and two arms the difference of the effects beside it. */
void interaction_json(struct json *json, const struct model *model);
#endif
