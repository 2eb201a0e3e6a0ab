/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Missing values: how many of each variable, why, and whether the arms differ. */
#include "exhibits/ledger.h"
#include "exhibits/list.h"
#include "exhibits/words.h"
#include "stats/table.h"
#include <math.h>

static const double UNKNOWN = NAN;

struct missing_arm {
    size_t n, missing;
    size_t state[CELL_STATE_COUNT];
};

struct missing_variable {
    int variable;
    struct missing_arm *arms;
    struct exact_test fisher;
};

struct missing_result {
    struct members members;
    struct missing_variable *variables;
    size_t count;
    size_t primary; /* the row of the primary outcome at its primary visit; count where it is hidden */
};

/* ---- computing ---- */

static void count_states(const struct view *view, const struct members *members, struct missing_variable *row) {
    const unsigned char *state = view->frame->columns[row->variable]->state;
    for (size_t i = 0; i < members->count; i++) {
        struct missing_arm *arm = &row->arms[members->arm[i]];
        arm->n++;
        arm->state[state[members->participant[i]]]++;
    }
    for (size_t a = 0; a < view->arms.count; a++) {
        row->arms[a].missing = row->arms[a].n - row->arms[a].state[CELL_OBSERVED];
    }
}

static struct exact_test compare(const struct view *view, const struct missing_variable *row) {
    if (view->arms.count < 2) {
        return (struct exact_test){view->frame->arm ? STATUS_BLINDED : STATUS_TOO_FEW, UNKNOWN};
    }
    size_t *missing = ARENA_NEW(view->arena, view->arms.count, size_t);
    size_t *observed = ARENA_NEW(view->arena, view->arms.count, size_t);
    for (size_t a = 0; a < view->arms.count; a++) {
        missing[a] = row->arms[a].missing;
        observed[a] = row->arms[a].n - row->arms[a].missing;
    }
    struct exact_test test = fisher_exact(missing, observed, view->arms.count);
    test.p = test.status == STATUS_OK ? test.p : UNKNOWN;
    return test;
}

static bool compute(struct view *view, struct fault *fault) {
    (void)fault;
    size_t count;
    const struct plan *plan = view->frame->plan;
    int *variables = variables_in_time(view, &count);
    struct missing_result *result = ARENA_NEW(view->arena, 1, struct missing_result);
    *result = (struct missing_result){
        .variables = ARENA_NEW(view->arena, count, struct missing_variable), .count = count, .primary = count};
    members_take(&result->members, view, MEMBERS_WITH_ARM);
    const struct outcome *outcome = &plan->outcomes[plan->primary];
    for (size_t i = 0; i < count; i++) {
        struct missing_variable *row = &result->variables[i];
        *row = (struct missing_variable){
            .variable = variables[i], .arms = ARENA_NEW(view->arena, view->arms.count, struct missing_arm)};
        count_states(view, &result->members, row);
        row->fisher = compare(view, row);
        result->primary = variables[i] == outcome->visits[outcome->primary_visit].variable ? i : result->primary;
    }
    members_note(view, &result->members);
    view->caption = arena_format(view->arena,
        "%s of the %s. Missing is every cell without an observed value, those below or above a limit "
        "of measurement among them.%s",
        count_words(view, result->members.count, "participant"), set_words(view->set),
        view->arms.count > 1
            ? " Fisher's p describes how far the arms differ; it decides nothing about why values are missing."
            : "");
    view->result = result;
    return true;
}

/* ---- JSON ---- */

static void arm_counts_json(const struct view *view, size_t a, const struct missing_arm *arm, struct json *json) {
    json_object(json);
    arm_json(view, a, json);
    json_field_integer(json, "n", (int64_t)arm->n);
    json_field_integer(json, "missing", (int64_t)arm->missing);
    json_key_object(json, "reasons");
    for (int state = CELL_OBSERVED + 1; state < CELL_STATE_COUNT; state++) {
        if (arm->state[state]) {
            json_field_integer(json, cell_state_name((enum cell_state)state), (int64_t)arm->state[state]);
        }
    }
    json_close(json);
    json_close(json);
}

static void json(const struct view *view, struct json *json) {
    const struct missing_result *result = view->result;
    json_key_array(json, "variables");
    for (size_t i = 0; i < result->count; i++) {
        const struct missing_variable *row = &result->variables[i];
        json_object(json);
        json_field_string(json, "variable", view->frame->plan->variables[row->variable].column);
        json_field_string(json, "label", variable_label(view, row->variable));
        json_key_array(json, "arms");
        for (size_t a = 0; a < view->arms.count; a++) {
            arm_counts_json(view, a, &row->arms[a], json);
        }
        json_close(json);
        json_field_string(json, "status", status_name(row->fisher.status));
        json_field_number(json, "fisher_p", row->fisher.p);
        json_close(json);
    }
    json_close(json);
}

/* ---- tables ---- */

static void arm_columns(const struct view *view, const struct missing_result *result, struct table *table) {
    for (size_t a = 0; a < view->arms.count; a++) {
        table_column(table, view->arms.arm[a].code, view->arms.arm[a].label,
            arena_format(view->arena, "n = %zu", result->members.n_of_arm[a]), TABLE_NUMBERS);
    }
}

static struct table *missing_table(const struct view *view, const struct missing_result *result) {
    struct table *table = table_new(view->arena,
        view->arms.count > 1 ? "Without an observed value, n (%), by arm" : "Without an observed value, n (%)");
    table_column(table, "variable", "Variable", NULL, TABLE_WORDS);
    arm_columns(view, result, table);
    if (view->arms.count > 1) {
        table_column(table, "fisher_p", "Fisher's p", NULL, TABLE_NUMBERS);
    }
    for (size_t i = 0; i < result->count; i++) {
        const struct missing_variable *row = &result->variables[i];
        table_row(table);
        table_put_header(table, variable_label(view, row->variable));
        for (size_t a = 0; a < view->arms.count; a++) {
            table_put_text(table, part_words(view, row->arms[a].missing, row->arms[a].n));
        }
        if (view->arms.count > 1) {
            table_put_text(table, p_words(view, row->fisher.p));
        }
        if (i == result->primary) {
            table_row_emphasise(table);
        }
    }
    return table;
}

/* One row for each reason that occurs in any arm. */
static void reason_rows(const struct view *view, struct table *table, const struct missing_variable *row) {
    bool begun = false;
    for (int state = CELL_OBSERVED + 1; state < CELL_STATE_COUNT; state++) {
        size_t sum = 0;
        for (size_t a = 0; a < view->arms.count; a++) {
            sum += row->arms[a].state[state];
        }
        if (!sum) {
            continue;
        }
        if (!begun) {
            table_group(table, variable_label(view, row->variable));
        }
        begun = true;
        table_row(table);
        table_put_header(table, cell_state_words((enum cell_state)state));
        for (size_t a = 0; a < view->arms.count; a++) {
            table_put_count(table, (int64_t)row->arms[a].state[state]);
        }
    }
}

static void tables(const struct view *view, struct table **tables, size_t *count) {
    const struct missing_result *result = view->result;
    tables[(*count)++] = missing_table(view, result);
    struct table *reasons = table_new(view->arena, "Why there is no observed value");
    table_column(reasons, "reason", "Reason", NULL, TABLE_WORDS);
    arm_columns(view, result, reasons);
    for (size_t i = 0; i < result->count; i++) {
        reason_rows(view, reasons, &result->variables[i]);
    }
    tables[(*count)++] = reasons;
}

static void lead(const struct view *view, struct html *html) {
    const struct missing_result *result = view->result;
    if (result->primary == result->count) {
        return;
    }
    const struct missing_variable *row = &result->variables[result->primary];
    size_t missing = 0;
    for (size_t a = 0; a < view->arms.count; a++) {
        missing += row->arms[a].missing;
    }
    html_format(html, "%s: ", variable_label(view, row->variable));
    html_element(html, "strong", NULL, part_of_words(view, missing, result->members.count));
    html_text(html, " missing");
    for (size_t a = 0; a < view->arms.count && view->arms.count > 1; a++) {
        html_format(html, "%s %s %s", a ? "," : ";", view->arms.arm[a].label,
            part_of_words(view, row->arms[a].missing, row->arms[a].n));
    }
}

static const struct argument_rule arguments[] = {{0}};

const struct exhibit exhibit_missing_by_arm = {
    .name = "missing-by-arm",
    .item = 3,
    .title = "How many values are missing, and do the arms differ?",
    .tab = "By arm",
    .says = "Missing values of every variable by arm, with their reasons",
    .pooled = SHOWN_AS_ONE_ARM,
    .table_first = true,
    .method =
        "A value is missing where the cell gives none: blank, a code for missing, unreadable, below or above a limit "
        "of "
        "measurement, set missing by a decision. The reason is kept for every cell. n counts participants.\n"
        "Fisher's exact test sums the tables no more probable than the observed one (Fisher 1934; more than two arms: "
        "Freeman & Halton 1951, Biometrika 38:141). A large p does not show that values are missing at random, and a "
        "small one "
        "does not say why they are missing.",
    .arguments = arguments,
    .compute = compute,
    .json = json,
    .tables = tables,
    .lead = lead,
};
