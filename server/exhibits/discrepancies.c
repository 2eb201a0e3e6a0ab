/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Doubtful values: everything the checks noticed, and what became of it. */
#include "exhibits/doubtful.h"
#include "exhibits/list.h"
#include "exhibits/words.h"
#include <string.h>

const struct check *check_of(const char *name) {
    size_t i = 0;
    while (checks[i].name && strcmp(checks[i].name, name) != 0) {
        i++;
    }
    return &checks[i];
}

bool discrepancy_concerns(const struct discrepancy *discrepancy, const char *participant) {
    for (size_t i = 0; i < discrepancy->participant_count; i++) {
        if (strcmp(discrepancy->participants[i], participant) == 0) {
            return true;
        }
    }
    return false;
}

void discrepancy_json(const struct discrepancy *discrepancy, struct json *json) {
    json_object(json);
    json_field_string(json, "id", discrepancy->id);
    json_field_string(json, "check", discrepancy->check);
    json_field_string(json, "title", check_of(discrepancy->check)->title);
    json_field_string(json, "severity", severity_name(discrepancy->severity));
    json_field_string(json, "column", discrepancy->column);
    json_field_string(json, "participant", discrepancy->participant);
    json_key_array(json, "participants");
    for (size_t i = 0; i < discrepancy->participant_count; i++) {
        json_string(json, discrepancy->participants[i]);
    }
    json_close(json);
    json_field_string(json, "value", discrepancy->value);
    json_field_string(json, "message", discrepancy->message);
    json_key(json, "proposal");
    if (discrepancy->proposal) {
        json_raw(json, discrepancy->proposal);
    } else {
        json_null(json);
    }
    json_field_string(json, "proposal_words", discrepancy->proposal_words);
    json_field_string(json, "state", discrepancy_state_name(discrepancy->state));
    if (discrepancy->rows) {
        json_key_array(json, "rows");
        for (size_t i = 0; i < discrepancy->row_count; i++) {
            json_integer(json, discrepancy->rows[i]);
        }
        json_close(json);
    } else {
        json_field_null(json, "rows");
    }
    json_field_string(json, "file", discrepancy->file);
    if (discrepancy->settled_by) {
        json_field_integer(json, "settled_by", discrepancy->settled_by);
    } else {
        json_field_null(json, "settled_by");
    }
    json_close(json);
}

static bool compute(struct view *view, struct fault *fault) {
    (void)fault;
    struct discrepancies *found = ARENA_NEW(view->arena, 1, struct discrepancies);
    checks_run(view->frame, view->received, view->arena, found);
    view->result = found;
    view->caption = arena_format(view->arena, "%zu open, %zu queried, %zu settled, %zu in all. A check notices, a decision settles; nothing is changed "
        "by the program.", found->open, found->queried, found->settled, found->count);
    return true;
}

static void json(const struct view *view, struct json *json) {
    const struct discrepancies *found = view->result;
    json_key_array(json, "discrepancies");
    for (size_t i = 0; i < found->count; i++) {
        discrepancy_json(&found->list[i], json);
    }
    json_close(json);
    json_key_object(json, "counts");
    json_field_integer(json, "open", (int64_t)found->open);
    json_field_integer(json, "settled", (int64_t)found->settled);
    json_field_integer(json, "queried", (int64_t)found->queried);
    json_field_integer(json, "all", (int64_t)found->count);
    json_close(json);
}

static void tables(const struct view *view, struct table **tables, size_t *count) {
    const struct discrepancies *found = view->result;
    struct table *table = table_new(view->arena, "Doubtful values");
    table_column(table, "state", "State", NULL, TABLE_WORDS);
    table_column(table, "column", "Column", NULL, TABLE_WORDS);
    table_column(table, "participant", "Participant", NULL, TABLE_WORDS);
    table_column(table, "value", "Value", NULL, TABLE_WORDS);
    table_column(table, "message", "What was noticed", NULL, TABLE_WORDS);
    table_column(table, "proposal", "Proposal", NULL, TABLE_WORDS);
    for (size_t i = 0; i < found->count; i++) {
        const struct discrepancy *discrepancy = &found->list[i];
        if (i == 0 || strcmp(found->list[i - 1].check, discrepancy->check) != 0) {
            table_group(table, check_of(discrepancy->check)->title);
        }
        table_row(table);
        if (discrepancy->settled_by) {
            table_put_format(table, "%s, decision %u", discrepancy_state_name(discrepancy->state), discrepancy->settled_by);
        } else {
            table_put_text(table, discrepancy_state_name(discrepancy->state));
        }
        table_put_text(table, discrepancy->column);
        if (discrepancy->participant) {
            table_put_header(table, discrepancy->participant);
            table_cell_opens(table, discrepancy->participant, discrepancy->column);
        } else if (discrepancy->participant_count) {
            table_put_format(table, "%zu participants", discrepancy->participant_count);
        } else {
            table_put_empty(table);
        }
        table_put_text(table, discrepancy->value);
        table_put_text(table, discrepancy->message);
        table_put_text(table, discrepancy->proposal_words);
    }
    tables[(*count)++] = table;
}

static const struct argument_rule arguments[] = {{0}};

const struct exhibit exhibit_discrepancies = {
    .name = "discrepancies",
    .item = 2,
    .title = "Which values are doubtful, and what was decided?",
    .tab = "Doubtful values",
    .says = "Everything a check noticed, with its proposal where there is one, open, queried or settled",
    .pooled = SHOWN,
    .table_first = true,
    .method = "Checks compare every current value with what the plan says of its column: codes, plausible and eligible ranges (bounds included), "
              "identifiers. Variants of a code are found by Unicode compatibility form and case folding (NFKC, Unicode Standard Annex 15), letters and "
              "digits only. A code for missing is suspected where a number long used as one stands outside the plausible range, or, without such a "
              "range, apart from all others by more than three times the distance between the quartiles.\n"
              "All checks look at pooled data; while blinded the arm's own column shows a count and nothing else. Question a value at its source before "
              "correcting it.",
    .arguments = arguments,
    .compute = compute,
    .json = json,
    .tables = tables,
};
