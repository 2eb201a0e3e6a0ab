/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "exhibits/words.h"
#include "draw/number.h"
#include "trial/convert.h"
#include "stats/describe.h"
#include "trial/amend.h"
#include <ctype.h>
#include <math.h>
#include <stdio.h>
#include <string.h>

/* ---- decisions and the chain ---- */

const char *head_of(const struct view *view) {
    return view->head;
}

/* An amendment may quote the arms, or the levels of a category that gives them away. */
static bool amendment_hidden(const struct view *view, const char *path) {
    const struct frame *frame = view->frame;
    bool quotes = strncmp(path, "covariates", strlen("covariates")) == 0 || strncmp(path, "events", strlen("events")) == 0;
    bool hide = frame->blinding != BLINDING_UNBLINDED && amend_about_arms(path);
    for (size_t v = 0; v < frame->plan->variable_count && quotes && !hide; v++) {
        hide = arms_hide_column(frame, frame->plan->variables[v].column);
    }
    return hide;
}

static bool hidden(const struct view *view, const struct decision *decision) {
    if (decision->kind == DECISION_AMEND_PLAN) {
        return amendment_hidden(view, decision->path);
    }
    const char *site = view->frame->plan->site_column; /* an amendment can have taken it out of the plan */
    return (decision->column && arms_hide_column(view->frame, decision->column)) ||
           (decision->kind == DECISION_CONVERT && site && arms_hide_column(view->frame, site));
}

bool decision_hidden(const struct view *view, const struct decision *decision) {
    while (!hidden(view, decision)) {
        if (decision->reverses == 0 || decision->reverses >= decision->number) {
            return false;
        }
        decision = &view->frame->decisions[decision->reverses - 1]; /* a reversal or a response speaks of that one */
    }
    return true;
}

static const char *or_nothing(const char *text) {
    return text ? *text ? text : "blank" : "nothing";
}

static const char *label_of(const struct view *view, const char *column) {
    int variable = column ? plan_variable(view->frame->plan, column) : NOWHERE;
    return variable != NOWHERE ? view->frame->plan->variables[variable].label : column ? column : "";
}

const char *decision_words(const struct view *view, const struct decision *decision) {
    struct arena *arena = view->arena;
    const char *label = label_of(view, decision->column), *who = decision->participant ? decision->participant : "";
    if (hidden(view, decision)) {
        return "About a column whose texts are not shown while blinded";
    }
    switch (decision->kind) {
    case DECISION_READ_AS:
        return arena_format(arena, "%s: \"%s\" is read as \"%s\"", label, or_nothing(decision->from), or_nothing(decision->to));
    case DECISION_MISSING_CODE:
        return arena_format(arena, "%s: %s is a code for missing%s%s", label, decision->value, decision->meaning ? ", " : "",
            decision->meaning ? decision->meaning : "");
    case DECISION_NUMBER_FORMAT:
        return arena_format(arena, "%s: decimal %s", label, decision->decimal[0] == ',' ? "comma" : "point");
    case DECISION_DATE_ORDER:
        return arena_format(arena, "%s%s%s: dates are %s", label, decision->site ? ", site " : "", decision->site ? decision->site : "",
            decision->order);
    case DECISION_CONVERT:
        return arena_format(arena, "%s at site %s: %s; %s", label, *decision->site ? decision->site : "not recorded",
            convert_words(arena, decision), decision->source);
    case DECISION_CORRECT:
    case DECISION_SET_MISSING:
        return arena_format(arena, "%s of %s: %s becomes %s", label, who, or_nothing(decision->from),
            decision->kind == DECISION_CORRECT ? or_nothing(decision->to) : "missing");
    case DECISION_CONFIRM:
        return arena_format(arena, "%s%s%s: %s is right as recorded", label, *who ? " of " : "", who, or_nothing(decision->value));
    case DECISION_KEEP_RECORD:
        return arena_format(arena, "%s: record %u%s%s stands", who, decision->row, decision->file ? " of " : "", decision->file ? decision->file : "");
    case DECISION_QUERY:
        return arena_format(arena, "%s%s%s%s%s", label, *label && *who ? " of " : "", who, *label || *who ? ": " : "",
            decision->text ? decision->text : "");
    case DECISION_RESPONSE:
        return arena_format(arena, "To decision %u: %s", decision->reverses,
            decision_hidden(view, decision) ? "not shown while blinded" : decision->text ? decision->text : "");
    case DECISION_EXCLUDE:
        return arena_format(arena, "%s is left out of the %s set", who, decision->set);
    case DECISION_FLAG:
        return arena_format(arena, "%s is shown with and without in %s", who, decision->outcome);
    case DECISION_SCALE:
        return arena_format(arena, "%s is analysed on the %s scale", decision->outcome, decision->scale);
    case DECISION_AMEND_PLAN:
        return decision_hidden(view, decision) ? arena_format(arena, "%s of the plan is changed; not shown while blinded", decision->path) :
            arena_format(arena, "%s of the plan: %s becomes %s", decision->path, or_nothing(decision->from), or_nothing(decision->to));
    case DECISION_NOTE:
        return arena_format(arena, "%s: %s", decision->exhibit, decision->text);
    case DECISION_UNBLIND:
        return arena_format(arena, "The study is %s from here on", decision->to);
    case DECISION_LOCK:
        return "Data stand still from here on";
    case DECISION_UNLOCK:
        return "Data may change again";
    case DECISION_SIGN:
        return decision->meaning;
    case DECISION_REVERSE:
        return arena_format(arena, "Decision %u is taken back", decision->reverses);
    default:
        return decision_rules[decision->kind].says;
    }
}

void decision_json(const struct view *view, const struct decision *decision, bool stands, struct json *json) {
    bool hide = decision_hidden(view, decision);
    json_object(json);
    json_field_integer(json, "number", decision->number);
    json_field_string(json, "at", decision->at);
    json_field_string(json, "by", decision->by);
    json_field_string(json, "account", decision->account);
    json_field_string(json, "kind", decision_rules[decision->kind].name);
    json_field_string(json, "column", hide ? NULL : decision->column);
    json_field_string(json, "participant", decision->participant);
    json_field_string(json, "path", decision->path);
    json_field_string(json, "from", hide ? NULL : decision->from);
    json_field_string(json, "to", hide ? NULL : decision->to);
    json_field_string(json, "value", hide ? NULL : decision->value);
    json_field_string(json, "order", decision->order);
    json_field_string(json, "site", decision->site);
    json_field_string(json, "reason", hide ? NULL : decision->reason);
    json_field_string(json, "evidence", hide ? NULL : decision->evidence);
    json_field_string(json, "discrepancy", hide ? NULL : decision->discrepancy);
    json_field_string(json, "exhibit", decision->exhibit);
    json_field_string(json, "text", hide ? NULL : decision->text);
    json_field_string(json, "words", decision_words(view, decision));
    json_field_bool(json, "stands", stands);
    json_field_bool(json, "reversible", stands && decision_rules[decision->kind].reversible);
    json_field_bool(json, "hidden", hide);
    json_field_string(json, "blinding", decision->blinding);
    json_field_string(json, "state_sha256", decision->state);
    json_field_string(json, "hash", decision->hash);
    json_close(json);
}

/* ---- arms and groups ---- */

const struct palette_mark *mark_of(const struct view *view, size_t arm) {
    return view->arms.pooled ? palette_pooled() : palette_arm(view->arms.coded, view->arms.arm[arm].palette);
}

const char *contrast_words(const struct view *view, size_t arm) {
    return arena_format(view->arena, "%s minus %s", view->arms.arm[arm].label, view->arms.arm[view->arms.reference].label);
}

void arm_json(const struct view *view, size_t arm, struct json *json) {
    json_field_string(json, "arm", view->arms.arm[arm].code);
    json_field_string(json, "label", view->arms.arm[arm].label);
}

const char *grouping_words(const struct view *view, const struct covariate *covariate) {
    return covariate->number ? arena_format(view->arena, "%s band", covariate->label) : covariate->label;
}

/* ---- numbers ---- */

int decimals_of(const struct view *view, const struct outcome *outcome, enum scale scale) {
    enum { LOG_DECIMALS = 3, MOST = 6 };
    int most = 0;
    for (size_t i = 0; i < outcome->visit_count; i++) {
        int here = view->frame->columns[outcome->visits[i].variable]->decimals;
        most = here > most ? here : most;
    }
    return scale == SCALE_LOG10 ? LOG_DECIMALS : most + 1 < MOST ? most + 1 : MOST;
}

const char *decimal_words(const struct view *view, double value, int decimals) {
    struct text text;
    text_init(&text);
    text_decimal(&text, value, decimals);
    const char *copy = arena_text(view->arena, text.data);
    text_release(&text);
    return copy;
}

const char *signed_words(const struct view *view, double value, int decimals) {
    struct text text;
    text_init(&text);
    text_signed(&text, value, decimals);
    const char *copy = arena_text(view->arena, text.data);
    text_release(&text);
    return copy;
}

const char *interval_words(const struct view *view, double low, double high, int decimals) {
    return arena_format(view->arena, "%s to %s", decimal_words(view, low, decimals), decimal_words(view, high, decimals));
}

const char *percent_words(const struct view *view, double confidence) {
    return arena_format(view->arena, "%.15g%%", 100 * confidence);
}

const char *p_words(const struct view *view, double p) {
    struct text text;
    text_init(&text);
    text_p_value(&text, p);
    const char *copy = arena_text(view->arena, text.data);
    text_release(&text);
    return copy;
}

const char *unit_after(const struct view *view, const char *unit) {
    return unit && *unit ? arena_format(view->arena, " %s", unit) : "";
}

const char *lower_first(const struct view *view, const char *text) {
    char *copy = arena_text(view->arena, text);
    bool word = isupper((unsigned char)copy[0]) && islower((unsigned char)copy[1]);
    copy[0] = word ? (char)tolower((unsigned char)copy[0]) : copy[0];
    return copy;
}

void direction_words(const struct outcome *outcome, const char **lower, const char **upper) {
    *lower = outcome->lower_is_better ? "better: it fell" : "worse: it fell";
    *upper = outcome->lower_is_better ? "worse: it rose" : "better: it rose";
}

void interval_json(struct json *json, const char *key, double low, double high) {
    json_key_array(json, key);
    json_number(json, low);
    json_number(json, high);
    json_close(json);
}

void estimate_json(struct json *json, const struct estimate *estimate) {
    json_field_number(json, "estimate", estimate->estimate);
    json_field_number(json, "standard_error", estimate->standard_error);
    json_field_number(json, "df", estimate->df);
    json_field_number(json, "low", estimate->low);
    json_field_number(json, "high", estimate->high);
    json_field_number(json, "p", estimate->p);
    json_field_string(json, "status", status_name(estimate->status));
}

void axis_about(const struct view *view, const double *values, size_t count, bool log10_scale, struct axis_plan *axis) {
    enum { ENOUGH = 8 };
    double *placed = ARENA_NEW(view->arena, count, double), low = INFINITY, high = -(double)INFINITY;
    for (size_t i = 0; i < count; i++) {
        placed[i] = log10_scale ? log10(values[i]) : values[i];
    }
    const double *sorted = sorted_copy(view->arena, placed, count);
    struct description s = describe(sorted, count);
    double reach = 6 * (s.upper_quartile - s.lower_quartile);
    if (count < ENOUGH || !(reach > 0)) {
        return;
    }
    for (size_t i = 0; i < count; i++) {
        bool within = sorted[i] >= s.lower_quartile - reach && sorted[i] <= s.upper_quartile + reach;
        low = within && sorted[i] < low ? sorted[i] : low;
        high = within && sorted[i] > high ? sorted[i] : high;
    }
    axis->low = log10_scale ? pow(10, low) : low;
    axis->high = log10_scale ? pow(10, high) : high;
}

size_t keep_finite(const double *values, size_t count, double *kept) {
    size_t n = 0;
    for (size_t i = 0; i < count; i++) {
        if (!isnan(values[i])) {
            kept[n++] = values[i];
        }
    }
    return n;
}
