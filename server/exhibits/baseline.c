/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Participants: who was randomised, by arm, before treatment. No p-values: at baseline any difference is chance. */
#include "exhibits/ledger.h"
#include "exhibits/list.h"
#include "exhibits/words.h"
#include "stats/describe.h"
#include "stats/table.h"
#include <math.h>

static const double MISSING = NAN;

struct baseline_arm {
    size_t n, missing;
    struct description numbers; /* of a number */
    size_t *level;              /* [level_count] of a category */
};

struct baseline_variable {
    int variable;
    const struct level *levels; /* NULL for a number */
    size_t level_count;
    struct baseline_arm *arms;
    struct standardised_difference difference;
    bool without_sign; /* more than two levels occur */
};

struct baseline_result {
    struct members members;
    struct baseline_variable *variables;
    size_t count;
    double envelope; /* NaN while there is one arm */
};

/* ---- computing ---- */

static bool before_treatment(const struct plan *plan, int variable) {
    const struct variable *what = &plan->variables[variable];
    bool first_of_several =
        what->outcome != NOWHERE && what->visit == 0 && plan->outcomes[what->outcome].visit_count > 1;
    return what->covariate != NOWHERE || first_of_several;
}

static struct baseline_arm of_number(const struct view *view, const struct members *members, int variable, int arm) {
    const double *number = view->frame->columns[variable]->number;
    double *values = ARENA_NEW(view->arena, members->count, double);
    struct baseline_arm result = {0};
    for (size_t i = 0; i < members->count; i++) {
        double value = number[members->participant[i]];
        if (members->arm[i] == arm && !isnan(value)) {
            values[result.n++] = value;
        }
    }
    result.missing = members->n_of_arm[arm] - result.n;
    result.numbers = describe(sorted_copy(view->arena, values, result.n), result.n);
    return result;
}

static struct baseline_arm of_category(
    const struct view *view, const struct members *members, const struct baseline_variable *variable, int arm) {
    const int32_t *level = view->frame->columns[variable->variable]->level;
    struct baseline_arm result = {.level = ARENA_NEW(view->arena, variable->level_count, size_t)};
    for (size_t i = 0; i < members->count; i++) {
        int32_t here = level[members->participant[i]];
        if (members->arm[i] == arm && here != NOWHERE) {
            result.level[here]++;
            result.n++;
        }
    }
    result.missing = members->n_of_arm[arm] - result.n;
    return result;
}

/* Levels that occur in either arm: two are compared by the share of the later one, more together. */
static struct standardised_difference of_levels(const struct view *view, struct baseline_variable *variable,
    const struct baseline_arm *arm, const struct baseline_arm *reference) {
    size_t *counts = ARENA_NEW(view->arena, 2 * variable->level_count, size_t),
           *others = counts + variable->level_count, used = 0;
    for (size_t l = 0; l < variable->level_count; l++) {
        if (arm->level[l] + reference->level[l]) {
            counts[used] = arm->level[l];
            others[used++] = reference->level[l];
        }
    }
    variable->without_sign |= used > 2;
    return used == 2 ? standardised_shares(counts[1], arm->n, others[1], reference->n)
                     : standardised_levels(counts, others, used);
}

static struct standardised_difference difference_of(
    const struct view *view, struct baseline_variable *variable, size_t a) {
    const struct baseline_arm *arm = &variable->arms[a], *reference = &variable->arms[view->arms.reference];
    return variable->levels
               ? of_levels(view, variable, arm, reference)
               : standardised_means(arm->numbers.mean, arm->numbers.sd, reference->numbers.mean, reference->numbers.sd);
}

/* Of all arms against the reference the largest in size. */
static struct standardised_difference largest_difference(const struct view *view, struct baseline_variable *variable) {
    struct standardised_difference largest = {
        view->arms.pooled && view->frame->arm ? STATUS_BLINDED : STATUS_TOO_FEW, MISSING};
    for (size_t a = 0; a < view->arms.count; a++) {
        if (a == view->arms.reference) {
            continue;
        }
        struct standardised_difference here = difference_of(view, variable, a);
        bool first = largest.status != STATUS_OK;
        if (first || (here.status == STATUS_OK && fabs(here.value) > fabs(largest.value))) {
            largest = here;
        }
    }
    largest.value = largest.status == STATUS_OK ? largest.value : MISSING;
    return largest;
}

static double widest_envelope(const struct view *view, const struct members *members) {
    double widest = MISSING;
    for (size_t a = 0; a < view->arms.count; a++) {
        size_t n = members->n_of_arm[a], reference = members->n_of_arm[view->arms.reference];
        if (a != view->arms.reference && n && reference) {
            double here = chance_envelope(n, reference, view->frame->plan->confidence);
            widest = isnan(widest) || here > widest ? here : widest;
        }
    }
    return widest;
}

static void take_variable(const struct view *view, struct baseline_result *result, int variable) {
    struct baseline_variable *row = &result->variables[result->count++];
    *row = (struct baseline_variable){
        .variable = variable, .arms = ARENA_NEW(view->arena, view->arms.count, struct baseline_arm)};
    row->levels = levels_of(view->frame, variable, &row->level_count);
    for (size_t a = 0; a < view->arms.count; a++) {
        row->arms[a] = row->levels ? of_category(view, &result->members, row, (int)a)
                                   : of_number(view, &result->members, variable, (int)a);
    }
    row->difference = largest_difference(view, row);
}

static const char *caption_of(const struct view *view, const struct baseline_result *result) {
    const char *head = arena_format(view->arena,
        "%s of the %s; mean (SD) and median (lower to upper quartile) of values as recorded, n (%%) "
        "of those with a value.",
        count_words(view, result->members.count, "participant"), set_words(view->set));
    return isnan(result->envelope)
               ? head
               : arena_format(view->arena,
                     "%s By chance alone a standardised difference lies between %s and %s in %s of trials of this "
                     "size.",
                     head, signed_words(view, -result->envelope, 2), signed_words(view, result->envelope, 2),
                     percent_words(view, view->frame->plan->confidence));
}

static bool compute(struct view *view, struct fault *fault) {
    (void)fault;
    size_t count;
    int *variables = variables_in_time(view, &count);
    struct baseline_result *result = ARENA_NEW(view->arena, 1, struct baseline_result);
    result->variables = ARENA_NEW(view->arena, count, struct baseline_variable);
    members_take(&result->members, view, MEMBERS_WITH_ARM);
    for (size_t i = 0; i < count; i++) {
        if (before_treatment(view->frame->plan, variables[i])) {
            take_variable(view, result, variables[i]);
        }
    }
    result->envelope = widest_envelope(view, &result->members);
    members_note(view, &result->members);
    if (view->arms.count > 2) {
        view_note(view,
            "With more than two arms the standardised difference is the largest in size of all arms against %s, and "
            "the range "
            "of chance is that of the smallest of these pairs.",
            view->arms.arm[view->arms.reference].label);
    }
    view->caption = caption_of(view, result);
    view->result = result;
    return true;
}

/* ---- JSON ---- */

static void arm_numbers_json(const struct baseline_arm *arm, struct json *json) {
    json_field_number(json, "mean", arm->numbers.mean);
    json_field_number(json, "sd", arm->numbers.sd);
    json_field_number(json, "median", arm->numbers.median);
    json_field_number(json, "lower_quartile", arm->numbers.lower_quartile);
    json_field_number(json, "upper_quartile", arm->numbers.upper_quartile);
}

static void arm_levels_json(
    const struct baseline_variable *variable, const struct baseline_arm *arm, struct json *json) {
    json_key_array(json, "levels");
    for (size_t l = 0; l < variable->level_count; l++) {
        json_object(json);
        json_field_string(json, "level", variable->levels[l].code);
        json_field_string(json, "label", variable->levels[l].label);
        json_field_integer(json, "n", (int64_t)arm->level[l]);
        json_close(json);
    }
    json_close(json);
}

static void variable_json(const struct view *view, const struct baseline_variable *variable, struct json *json) {
    const struct variable *what = &view->frame->plan->variables[variable->variable];
    json_object(json);
    json_field_string(json, "variable", what->column);
    json_field_string(json, "label", what->label);
    json_field_string(json, "unit", what->unit);
    json_key_array(json, "arms");
    for (size_t a = 0; a < view->arms.count; a++) {
        json_object(json);
        arm_json(view, a, json);
        json_field_integer(json, "n", (int64_t)variable->arms[a].n);
        json_field_integer(json, "missing", (int64_t)variable->arms[a].missing);
        if (variable->levels) {
            arm_levels_json(variable, &variable->arms[a], json);
        } else {
            arm_numbers_json(&variable->arms[a], json);
        }
        json_close(json);
    }
    json_close(json);
    json_field_string(json, "status", status_name(variable->difference.status));
    json_field_number(json, "standardised_difference", variable->difference.value);
    json_close(json);
}

static void json(const struct view *view, struct json *json) {
    const struct baseline_result *result = view->result;
    json_key_array(json, "variables");
    for (size_t i = 0; i < result->count; i++) {
        variable_json(view, &result->variables[i], json);
    }
    json_close(json);
    json_field_number(json, "chance_envelope", result->envelope);
}

/* ---- the table ---- */

static void end_row(
    const struct view *view, struct table *table, const struct baseline_variable *variable, bool first) {
    if (view->arms.count > 1) {
        if (first && variable->without_sign) {
            table_put_number(table, variable->difference.value, 2);
        } else if (first) {
            table_put_signed(table, variable->difference.value, 2);
        } else {
            table_put_text(table, "");
        }
    }
}

static void number_rows(const struct view *view, struct table *table, const struct baseline_variable *variable) {
    int decimals = variable_decimals(view, variable->variable);
    table_row(table);
    table_put_header(table, "Mean (SD)");
    for (size_t a = 0; a < view->arms.count; a++) {
        const struct description *numbers = &variable->arms[a].numbers;
        table_put_format(
            table, "%s (%s)", decimal_words(view, numbers->mean, decimals), decimal_words(view, numbers->sd, decimals));
    }
    end_row(view, table, variable, true);
    table_row(table);
    table_put_header(table, "Median (quartiles)");
    for (size_t a = 0; a < view->arms.count; a++) {
        const struct description *numbers = &variable->arms[a].numbers;
        table_put_format(table, "%s (%s)", decimal_words(view, numbers->median, decimals),
            interval_words(view, numbers->lower_quartile, numbers->upper_quartile, decimals));
    }
    end_row(view, table, variable, false);
}

static void level_rows(const struct view *view, struct table *table, const struct baseline_variable *variable) {
    for (size_t l = 0; l < variable->level_count; l++) {
        table_row(table);
        table_put_header(table, level_words(view, variable->variable, l));
        for (size_t a = 0; a < view->arms.count; a++) {
            table_put_text(table, part_words(view, variable->arms[a].level[l], variable->arms[a].n));
        }
        end_row(view, table, variable, l == 0);
    }
}

/* How many have a value, where any arm lacks one. */
static void value_row(const struct view *view, struct table *table, const struct baseline_variable *variable) {
    size_t missing = 0;
    for (size_t a = 0; a < view->arms.count; a++) {
        missing += variable->arms[a].missing;
    }
    if (!missing) {
        return;
    }
    table_row(table);
    table_put_header(table, "With a value");
    for (size_t a = 0; a < view->arms.count; a++) {
        const struct baseline_arm *arm = &variable->arms[a];
        table_put_format(table, "%zu of %zu", arm->n, arm->n + arm->missing);
    }
    end_row(view, table, variable, false);
}

static void tables(const struct view *view, struct table **tables, size_t *count) {
    const struct baseline_result *result = view->result;
    struct table *table =
        table_new(view->arena, view->arms.count > 1 ? "Before treatment, by arm" : "Before treatment");
    table_column(table, "characteristic", "Characteristic", NULL, TABLE_WORDS);
    for (size_t a = 0; a < view->arms.count; a++) {
        table_column(table, view->arms.arm[a].code, view->arms.arm[a].label,
            arena_format(view->arena, "n = %zu", result->members.n_of_arm[a]), TABLE_NUMBERS);
    }
    if (view->arms.count > 1) {
        table_column(table, "standardised_difference", "Standardised difference", NULL, TABLE_NUMBERS);
    }
    for (size_t i = 0; i < result->count; i++) {
        const struct baseline_variable *variable = &result->variables[i];
        table_group(table, variable->levels
                               ? arena_format(view->arena, "%s, n (%%)", variable_label(view, variable->variable))
                               : variable_heading(view, variable->variable));
        if (variable->levels) {
            level_rows(view, table, variable);
        } else {
            number_rows(view, table, variable);
        }
        value_row(view, table, variable);
    }
    tables[(*count)++] = table;
}

static const struct argument_rule arguments[] = {{0}};

const struct exhibit exhibit_baseline = {
    .name = "baseline",
    .item = 1,
    .title = "Who are the participants, arm by arm, before treatment?",
    .tab = "Baseline",
    .says = "Covariates and the outcomes' baselines by arm, with standardised differences and without p-values",
    .pooled = SHOWN_AS_ONE_ARM,
    .table_first = true,
    .method =
        "SD with divisor n \xE2\x88\x92 1; quartiles of type 7 (Hyndman & Fan 1996). Percentages are of participants "
        "with a value.\n"
        "Standardised difference of an arm from the reference: difference of means over the root of the mean of the "
        "two variances; for two "
        "levels the same of the share of the later level (Austin 2009, Stat Med 28:3083); for more levels the "
        "multivariate form, which has "
        "no sign (Yang & Dalton 2012). The range of chance is z times the root of 1/n + 1/n at the plan's confidence.\n"
        "There is no test: after randomisation any difference before treatment is due to chance (CONSORT 2025), and "
        "which covariates the "
        "model takes is settled by the plan, not by this table.",
    .arguments = arguments,
    .compute = compute,
    .json = json,
    .tables = tables,
};
