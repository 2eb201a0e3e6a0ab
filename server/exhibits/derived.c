/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Participants: the values computed from others, and whether the file claims the same. */
#include "trial/derived.h"
#include "exhibits/list.h"
#include "exhibits/words.h"
#include <math.h>

struct differing {
    size_t participant;
    double claimed, value, tolerance;
    const char *inputs;
};

struct entry { /* of one derived value; counts are of participants */
    const struct derived *derived;
    const struct column *column;
    size_t status[DERIVED_STATUS_COUNT], prorated, compared, claimed_only;
    struct differing *differing;
    size_t differing_count;
};

struct derived_result {
    struct entry *entries;
    size_t count;
};

static void take_entry(struct view *view, struct entry *entry, const struct derived *derived) {
    const struct frame *frame = view->frame;
    *entry = (struct entry){.derived = derived, .column = frame->columns[derived->variable],
        .differing = ARENA_NEW(view->arena, frame->participant_count, struct differing)};
    for (size_t p = 0; p < frame->participant_count; p++) {
        struct derived_value taken;
        derived_take(&taken, frame, derived, p);
        entry->status[taken.status]++;
        entry->prorated += taken.prorated;
        entry->compared += taken.status == DERIVED_COMPUTED && !isnan(taken.claimed) ? 1 : 0;
        entry->claimed_only += taken.status != DERIVED_COMPUTED && !isnan(taken.claimed) ? 1 : 0;
        if (taken.differs) {
            entry->differing[entry->differing_count++] = (struct differing){p, taken.claimed, taken.value, taken.tolerance,
                derived_inputs(view->arena, frame, derived, p)};
        }
    }
}

static bool compute(struct view *view, struct fault *fault) {
    (void)fault;
    const struct plan *plan = view->frame->plan;
    struct derived_result *result = ARENA_NEW(view->arena, 1, struct derived_result);
    result->count = plan->derived_count;
    result->entries = ARENA_NEW(view->arena, plan->derived_count, struct entry);
    for (size_t i = 0; i < plan->derived_count; i++) {
        take_entry(view, &result->entries[i], &plan->derived[i]);
    }
    view->result = result;
    view->caption = result->count ? "Counts are of participants. A value follows every correction of what it rests on." :
                                    "The plan has no derived values.";
    return true;
}

static size_t missing_of(const struct entry *entry) {
    return entry->status[DERIVED_INPUT_MISSING] + entry->status[DERIVED_UNDEFINED];
}

static void entry_json(const struct view *view, const struct entry *entry, struct json *json) {
    const struct derived *derived = entry->derived;
    json_object(json);
    json_field_string(json, "id", derived->id);
    json_field_string(json, "column", derived->column);
    json_field_string(json, "label", view->frame->plan->variables[derived->variable].label);
    json_field_string(json, "unit", derived->unit);
    json_field_string(json, "formula", derived_formula_name(derived->formula));
    json_field_string(json, "words", derived_words(view->arena, derived));
    json_key_array(json, "of");
    for (size_t i = 0; i < derived->of_count; i++) {
        json_string(json, derived->of[i].column);
    }
    json_close(json);
    json_field_integer(json, "n", (int64_t)entry->status[DERIVED_COMPUTED]);
    json_field_integer(json, "missing", (int64_t)missing_of(entry));
    json_field_integer(json, "undefined", (int64_t)entry->status[DERIVED_UNDEFINED]);
    json_field_integer(json, "held_aside", (int64_t)entry->status[DERIVED_HELD_ASIDE]);
    json_field_integer(json, "prorated", (int64_t)entry->prorated);
    json_field_string(json, "claims", derived->claims);
    json_field_integer(json, "agreeing", (int64_t)(entry->compared - entry->differing_count));
    json_field_integer(json, "differing", (int64_t)entry->differing_count);
    json_field_integer(json, "claimed_only", (int64_t)entry->claimed_only);
    json_key_array(json, "participants");
    for (size_t i = 0; i < entry->differing_count; i++) {
        const struct differing *one = &entry->differing[i];
        json_object(json);
        json_field_string(json, "participant", view->frame->participants[one->participant].id);
        json_field_number(json, "claimed", one->claimed);
        json_field_number(json, "derived", one->value);
        json_field_number(json, "tolerance", one->tolerance);
        json_field_string(json, "inputs", one->inputs);
        json_close(json);
    }
    json_close(json);
    json_close(json);
}

static void json(const struct view *view, struct json *json) {
    const struct derived_result *result = view->result;
    json_key_array(json, "derived");
    for (size_t i = 0; i < result->count; i++) {
        entry_json(view, &result->entries[i], json);
    }
    json_close(json);
}

static struct table *values_table(const struct view *view, const struct derived_result *result) {
    struct table *table = table_new(view->arena, "Derived values");
    table_column(table, "label", "Value", NULL, TABLE_WORDS);
    table_column(table, "column", "Name", NULL, TABLE_WORDS);
    table_column(table, "words", "Computed as", NULL, TABLE_WORDS);
    table_column(table, "n", "Computed", NULL, TABLE_NUMBERS);
    table_column(table, "prorated", "of these prorated", NULL, TABLE_NUMBERS);
    table_column(table, "missing", "Missing", NULL, TABLE_NUMBERS);
    table_column(table, "undefined", "of these not defined", NULL, TABLE_NUMBERS);
    table_column(table, "claims", "Claimed by", NULL, TABLE_WORDS);
    table_column(table, "agreeing", "Agree", NULL, TABLE_NUMBERS);
    table_column(table, "differing", "Differ", NULL, TABLE_NUMBERS);
    for (size_t i = 0; i < result->count; i++) {
        const struct entry *entry = &result->entries[i];
        const struct derived *derived = entry->derived;
        const char *label = view->frame->plan->variables[derived->variable].label;
        table_row(table);
        table_put_header(table, *derived->unit ? arena_format(view->arena, "%s, %s", label, derived->unit) : label);
        table_put_text(table, derived->column);
        table_put_text(table, derived_words(view->arena, derived));
        table_put_count(table, (int64_t)entry->status[DERIVED_COMPUTED]);
        table_put_count(table, (int64_t)entry->prorated);
        table_put_count(table, (int64_t)missing_of(entry));
        table_put_count(table, (int64_t)entry->status[DERIVED_UNDEFINED]);
        table_put_text(table, derived->claims);
        if (derived->claims) {
            table_put_count(table, (int64_t)(entry->compared - entry->differing_count));
            table_put_count(table, (int64_t)entry->differing_count);
        }
    }
    return table;
}

static struct table *differing_table(const struct view *view, const struct derived_result *result) {
    struct table *table = table_new(view->arena, "Where the file claims another value");
    table_column(table, "participant", "Participant", NULL, TABLE_WORDS);
    table_column(table, "value", "Value", NULL, TABLE_WORDS);
    table_column(table, "claimed", "The file says", NULL, TABLE_NUMBERS);
    table_column(table, "derived", "Computed", NULL, TABLE_NUMBERS);
    table_column(table, "tolerance", "May differ by", NULL, TABLE_NUMBERS);
    table_column(table, "inputs", "From", NULL, TABLE_WORDS);
    for (size_t i = 0; i < result->count; i++) {
        const struct entry *entry = &result->entries[i];
        int decimals = entry->column->decimals;
        for (size_t d = 0; d < entry->differing_count; d++) {
            const struct differing *one = &entry->differing[d];
            const char *id = view->frame->participants[one->participant].id;
            table_row(table);
            table_row_opens(table, id);
            table_put_header(table, id);
            table_put_text(table, view->frame->plan->variables[entry->derived->variable].label);
            table_put_number(table, one->claimed, decimals);
            table_put_number(table, one->value, decimals);
            table_put_number(table, one->tolerance, decimals + 1);
            table_put_text(table, one->inputs);
        }
    }
    return table;
}

static void tables(const struct view *view, struct table **tables, size_t *count) {
    const struct derived_result *result = view->result;
    bool claims = false;
    for (size_t i = 0; i < result->count; i++) {
        claims = claims || result->entries[i].derived->claims;
    }
    tables[(*count)++] = values_table(view, result);
    if (claims) {
        tables[(*count)++] = differing_table(view, result);
    }
}

static bool applies(const struct plan *plan) {
    return plan->derived_count > 0;
}

static const struct argument_rule arguments[] = {{0}};

const struct exhibit exhibit_derived = {
    .name = "derived",
    .item = 1,
    .title = "Which values are computed, and does the file claim the same?",
    .tab = "Derived values",
    .says = "Each derived value with its formula, inputs and counts, and where a column of the file claims another value",
    .pooled = SHOWN,
    .table_first = true,
    .applies = applies,
    .method = "Values are computed in full precision from the inputs as they now read. A sum of fewer items than all is the mean of those present times "
              "the number of all. A claim differs where it is farther from the computed value than the plan's tolerance; without one, than half a unit in "
              "the claim's last place, to which a body mass index adds BMI (h_w / weight + 2 h_h / height), each h half a unit in the last recorded place: what "
              "rounding of weight and height can carry into it, to first order.",
    .arguments = arguments,
    .compute = compute,
    .json = json,
    .tables = tables,
};
