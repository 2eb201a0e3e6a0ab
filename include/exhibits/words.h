/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Words and numbers that several exhibits write alike. Everything made lives in the view's arena. */
#ifndef EVENHAND_EXHIBITS_WORDS_H
#define EVENHAND_EXHIBITS_WORDS_H
#include "draw/axis.h"
#include "draw/palette.h"
#include "exhibits/registry.h"
#include "stats/estimate.h"

/* ---- decisions and the chain ---- */
const char *head_of(const struct view *view); /* the head of the chain at the view's version */
/* What a decision did, in a sentence: "sex: f is read as F"; texts of the arm's column are left out while blinded. */
const char *decision_words(const struct view *view, const struct decision *decision);
/* Whether its texts may not be shown now: it is about the arm or what tells it, or answers or reverses such a one. */
bool decision_hidden(const struct view *view, const struct decision *decision);
/* An object with every field of the decision; texts of the arm's column null while blinded, with "hidden": true. */
void decision_json(const struct view *view, const struct decision *decision, bool stands, struct json *json);

/* ---- arms and groups ---- */
const struct palette_mark *mark_of(const struct view *view, size_t arm);
const char *contrast_words(const struct view *view, size_t arm); /* "B minus A" */
/* "arm" and "label" fields of a shown arm. */
void arm_json(const struct view *view, size_t arm, struct json *json);
/* "Age band" for a number with bands, else its label. */
const char *grouping_words(const struct view *view, const struct covariate *covariate);

/* ---- numbers ---- */
/* Decimals to show: those of the data plus one; 3 for log10 values and ratios. */
int decimals_of(const struct view *view, const struct outcome *outcome, enum scale scale);
const char *decimal_words(const struct view *view, double value, int decimals); /* "−4.6" */
const char *signed_words(const struct view *view, double value, int decimals);  /* "+7.6" */
const char *interval_words(const struct view *view, double low, double high, int decimals); /* "4.0 to 11.2" */
const char *percent_words(const struct view *view, double confidence); /* "95%" */
const char *p_words(const struct view *view, double p);                 /* "0.31", "<0.001" */
const char *unit_after(const struct view *view, const char *unit);     /* " mmHg", "" */
/* The outcome's own words for an axis: "Change in systolic blood pressure, mmHg". */
const char *lower_first(const struct view *view, const char *text); /* "Systolic" -> "systolic"; "BMI" stays */
/* "better: fell" words for both ends of an axis of change or difference. */
void direction_words(const struct outcome *outcome, const char **lower, const char **upper);
/* "low" and "high" */
void interval_json(struct json *json, const char *key, double low, double high); /* "key": [low, high] */
/* The fields estimate, standard_error, df, low, high, p, status of an object that is open. */
void estimate_json(struct json *json, const struct estimate *estimate);

/* An axis that holds whatever lies within twice Tukey's outer fences of all `count` finite values together (on the axis' scale;
 * fewer than 8 are left to themselves): what is further out stands at the edge as an arrow with its value, so that one slip of
 * the pen does not squash everything else. */
void axis_about(const struct view *view, const double *values, size_t count, bool log10_scale, struct axis_plan *axis);

/* ---- numbers as a person reads them, sorted out of NaN ---- */
/* The finite values among `count`, in `kept` (room for all of them); how many. */
size_t keep_finite(const double *values, size_t count, double *kept);
#endif
