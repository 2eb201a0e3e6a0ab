/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "trial/convert.h"
#include <math.h>
#include <string.h>

#define AMA "AMA Manual of Style, 11th edition, SI conversion factors"

/* Conventional factors to SI for laboratory values; units of length and mass are exact since the international yard and
 * pound agreement of 1959; the millimetre of mercury by NIST SP 811, appendix B. */
const struct unit_factor unit_factors[] = {
    {"mg/dL", "mmol/L", 0.0555, "glucose", AMA},
    {"mg/dL", "mmol/L", 0.0259, "cholesterol", AMA},
    {"mg/dL", "µmol/L", 88.4, "creatinine", AMA},
    {"mmHg", "kPa", 0.133322, NULL, "NIST Special Publication 811, appendix B"},
    {"lb", "kg", 0.45359237, NULL, "international yard and pound agreement of 1959, exact"},
    {"inch", "cm", 2.54, NULL, "international yard and pound agreement of 1959, exact"},
    {NULL, NULL, 10, NULL, "a power of ten, exact"},
    {NULL, NULL, 100, NULL, "a power of ten, exact"},
    {NULL, NULL, 1000, NULL, "a power of ten, exact"},
    {NULL, NULL, 0, NULL, NULL},
};

const char *site_of(const struct frame *frame, size_t participant) {
    const char *text = frame->site ? frame_text(frame, frame->site, participant) : NULL;
    return text && text[strspn(text, " \t\r\n\f\v")] ? text : "";
}

bool convert_covers(const struct decision *decision, const char *column) {
    return decision->kind == DECISION_CONVERT && plan_covers(decision->column, column);
}

static void convert_one(double *value, const struct decision *decision) {
    *value = *value * decision->factor + decision->offset;
}

size_t convert_apply(const struct frame *frame, struct column *column, const struct decision *decision) {
    size_t at_site = 0;
    for (size_t p = 0; p < frame->participant_count; p++) {
        if (strcmp(site_of(frame, p), decision->site) != 0) {
            continue;
        }
        at_site++;
        convert_one(&column->number[p], decision); /* a NaN stays one */
        if (column->limit) {
            convert_one(&column->limit[p], decision);
        }
    }
    return at_site;
}

size_t convert_cells(const struct frame *frame, const struct decision *decision) {
    size_t cells = 0;
    for (size_t v = 0; v < frame->plan->variable_count; v++) {
        const struct column *column = frame->columns[v];
        bool converted = column->number && convert_covers(decision, frame->plan->variables[v].column);
        for (size_t p = 0; converted && p < frame->participant_count; p++) {
            cells += !isnan(column->number[p]) && strcmp(site_of(frame, p), decision->site) == 0;
        }
    }
    return cells;
}

const struct decision *convert_of(const struct frame *frame, size_t variable, size_t participant) {
    const struct decision *last = NULL;
    for (size_t i = 0; i < frame->version; i++) {
        const struct decision *decision = &frame->decisions[i];
        if (frame->stands[i] && convert_covers(decision, frame->plan->variables[variable].column) &&
            strcmp(site_of(frame, participant), decision->site) == 0) {
            last = decision;
        }
    }
    return last;
}

const char *convert_words(struct arena *arena, const struct decision *decision) {
    const char *offset =
        decision->offset > 0 || decision->offset < 0
            ? arena_format(arena, " %s %.15g", decision->offset > 0 ? "plus" : "minus", fabs(decision->offset))
            : "";
    return arena_format(
        arena, "times %.15g%s (%s to %s)", decision->factor, offset, decision->unit_from, decision->unit_to);
}
