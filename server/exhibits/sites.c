/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Sites: how complete each is, what is doubtful there, what was asked. No arm, in no state of blinding. */
#include "base/map.h"
#include "exhibits/conversions.h"
#include "exhibits/ledger.h"
#include "exhibits/list.h"
#include "exhibits/words.h"
#include "trial/convert.h"
#include <stdlib.h>
#include <string.h>

struct visit_column {
    const struct outcome *outcome;
    const struct visit *visit;
};

struct site {
    const char *code; /* "" where it is blank */
    size_t participants, in_force, held_aside;
    size_t *observed;        /* [visits] of those in force */
    size_t discrepancies[3]; /* by state */
    size_t queries, unanswered;
};

struct sites_result {
    struct site *sites; /* in byte order of the code */
    size_t count;
    struct visit_column *visits;
    size_t visit_count;
};

/* ---- conversions ---- */

static bool in_force(const struct view *view, size_t i) {
    const struct decision *decision = &view->frame->decisions[i];
    return view->frame->stands[i] && decision->kind == DECISION_CONVERT && !decision_hidden(view, decision);
}

void conversions_json(const struct view *view, struct json *json) {
    json_key_array(json, "conversions");
    for (size_t i = 0; i < view->frame->version; i++) {
        const struct decision *decision = &view->frame->decisions[i];
        if (!in_force(view, i)) {
            continue;
        }
        json_object(json);
        json_field_integer(json, "number", decision->number);
        json_field_string(json, "column", decision->column);
        json_field_string(json, "site", decision->site);
        json_field_number(json, "factor", decision->factor);
        json_field_number(json, "offset", decision->offset);
        json_field_string(json, "unit_from", decision->unit_from);
        json_field_string(json, "unit_to", decision->unit_to);
        json_field_string(json, "source", decision->source);
        json_field_integer(json, "cells", (int64_t)convert_cells(view->frame, decision));
        json_close(json);
    }
    json_close(json);
}

struct table *conversions_table(const struct view *view) {
    struct table *table = table_new(view->arena, "Units converted at a site");
    table_column(table, "decision", "Decision", NULL, TABLE_NUMBERS);
    table_column(table, "column", "Column", NULL, TABLE_WORDS);
    table_column(table, "site", "Site", NULL, TABLE_WORDS);
    table_column(table, "conversion", "Conversion", NULL, TABLE_WORDS);
    table_column(table, "source", "Source of the factor", NULL, TABLE_WORDS);
    table_column(table, "cells", "Cells", NULL, TABLE_NUMBERS);
    bool any = false;
    for (size_t i = 0; i < view->frame->version; i++) {
        const struct decision *decision = &view->frame->decisions[i];
        if (!in_force(view, i)) {
            continue;
        }
        any = true;
        table_row(table);
        table_put_count(table, decision->number);
        table_put_text(table, decision->column);
        table_put_text(table, *decision->site ? decision->site : "none recorded");
        table_put_text(table, convert_words(view->arena, decision));
        table_put_text(table, decision->source);
        table_put_count(table, (int64_t)convert_cells(view->frame, decision));
    }
    return any ? table : NULL;
}

/* ---- counting ---- */

static bool is_blank(const char *text) {
    return !text || text[strspn(text, " \t\r\n\f\v")] == '\0';
}

/* Whether a record of the first file says by itself where its participant is. */
static bool site_on_record(const struct frame *frame) {
    return frame->site->file == 0 && !frame->plan->files[0].by_visit;
}

/* The site of a participant; while several records are held aside that of the first of them. */
static const char *participant_site(const struct frame *frame, size_t p) {
    size_t record;
    if (frame->participants[p].record == NO_RECORD && site_on_record(frame) && frame_records(frame, p, &record, 1)) {
        const char *text = column_text(frame, frame->site, record);
        return is_blank(text) ? "" : text;
    }
    return site_of(frame, p);
}

static int by_code(const void *a, const void *b) {
    return strcmp(((const struct site *)a)->code, ((const struct site *)b)->code);
}

static void add_site(struct sites_result *result, struct map *known, const char *code) {
    if (map_put(known, code, (int32_t)result->count) == (int32_t)result->count) {
        result->sites[result->count++] = (struct site){.code = code};
    }
}

/* Every site that a participant or a record held aside names. */
static void list_sites(struct view *view, struct sites_result *result, struct map *places) {
    const struct frame *frame = view->frame;
    struct map known;
    map_init(&known);
    result->sites = ARENA_NEW(view->arena, frame->participant_count + frame->cells->records + 1, struct site);
    for (size_t p = 0; p < frame->participant_count; p++) {
        add_site(result, &known, participant_site(frame, p));
    }
    for (size_t r = 0; site_on_record(frame) && r < frame->cells->records; r++) {
        const char *text = column_text(frame, frame->site, r);
        add_site(result, &known, is_blank(text) ? "" : text);
    }
    map_release(&known);
    if (result->count) {
        qsort(result->sites, result->count, sizeof *result->sites, by_code);
    }
    for (size_t s = 0; s < result->count; s++) {
        result->sites[s].observed = ARENA_NEW(view->arena, result->visit_count, size_t);
        map_put(places, result->sites[s].code, (int32_t)s);
    }
}

static struct site *site_at(struct sites_result *result, const struct map *places, const char *code) {
    return &result->sites[map_get(places, code)];
}

static void count_participants(const struct view *view, struct sites_result *result, const struct map *places) {
    const struct frame *frame = view->frame;
    for (size_t p = 0; p < frame->participant_count; p++) {
        struct site *site = site_at(result, places, participant_site(frame, p));
        site->participants++;
        if (frame->participants[p].record == NO_RECORD) {
            continue;
        }
        site->in_force++;
        for (size_t v = 0; v < result->visit_count; v++) {
            site->observed[v] += frame->columns[result->visits[v].visit->variable]->state[p] == CELL_OBSERVED;
        }
    }
}

static void count_held(const struct view *view, struct sites_result *result, const struct map *places) {
    const struct frame *frame = view->frame;
    for (size_t r = 0; site_on_record(frame) && r < frame->cells->records; r++) {
        const char *id = column_text(frame, frame->identifier, r), *code = column_text(frame, frame->site, r);
        int who = is_blank(id) ? NOWHERE : frame_participant(frame, id);
        bool held = who == NOWHERE || frame->participants[who].record != r;
        site_at(result, places, is_blank(code) ? "" : code)->held_aside += held;
    }
    for (size_t s = 0; s < frame->plan->slot_count; s++) {
        bool roster = frame->plan->slots[s].file == 0 && !frame->plan->files[0].by_visit;
        for (size_t p = 0; !roster && p < frame->participant_count; p++) {
            site_at(result, places, participant_site(frame, p))->held_aside += frame->place[s][p] == HELD_RECORD;
        }
    }
}

/* A discrepancy counts once at each site that it concerns. */
static size_t count_discrepancies(struct view *view, struct sites_result *result, const struct map *places) {
    const struct frame *frame = view->frame;
    struct discrepancies found;
    checks_run(frame, view->received, view->arena, &found);
    size_t nowhere = 0, *last = ARENA_NEW(view->arena, result->count, size_t);
    for (size_t i = 0; i < found.count; i++) {
        const struct discrepancy *what = &found.list[i];
        nowhere += what->participant_count == 0;
        for (size_t k = 0; k < what->participant_count; k++) {
            int who = frame_participant(frame, what->participants[k]);
            int32_t s = who == NOWHERE ? NOWHERE : map_get(places, participant_site(frame, (size_t)who));
            if (s != NOWHERE && last[s] != i + 1) {
                last[s] = i + 1;
                result->sites[s].discrepancies[what->state]++;
            }
        }
    }
    return nowhere;
}

static bool answered(const struct frame *frame, uint32_t number) {
    for (size_t i = number; i < frame->version; i++) {
        if (frame->stands[i] && frame->decisions[i].kind == DECISION_RESPONSE &&
            frame->decisions[i].reverses == number) {
            return true;
        }
    }
    return false;
}

static size_t count_queries(const struct view *view, struct sites_result *result, const struct map *places) {
    const struct frame *frame = view->frame;
    size_t nowhere = 0;
    for (size_t i = 0; i < frame->version; i++) {
        const struct decision *decision = &frame->decisions[i];
        if (!frame->stands[i] || decision->kind != DECISION_QUERY) {
            continue;
        }
        int who = decision->participant ? frame_participant(frame, decision->participant) : NOWHERE;
        if (who == NOWHERE) {
            nowhere++;
            continue;
        }
        struct site *site = site_at(result, places, participant_site(frame, (size_t)who));
        site->queries++;
        site->unanswered += !answered(frame, decision->number);
    }
    return nowhere;
}

static void list_visits(struct view *view, struct sites_result *result) {
    const struct plan *plan = view->frame->plan;
    result->visits = ARENA_NEW(view->arena, plan->variable_count, struct visit_column);
    for (size_t o = 0; o < plan->outcome_count; o++) {
        for (size_t v = 0; v < plan->outcomes[o].visit_count; v++) {
            result->visits[result->visit_count++] =
                (struct visit_column){&plan->outcomes[o], &plan->outcomes[o].visits[v]};
        }
    }
}

static bool compute(struct view *view, struct fault *fault) {
    (void)fault;
    const struct frame *frame = view->frame;
    struct sites_result *result = ARENA_NEW(view->arena, 1, struct sites_result);
    view->result = result;
    if (!frame->site) {
        view_note(view, "The plan names no column of sites; \"site\": {\"column\": …} does.");
        return true;
    }
    if (arms_hide_column(frame, frame->plan->site_column)) {
        view_note(view, "Sites are not shown while the study is %s: they would tell the arms apart.",
            blinding_name(frame->blinding));
        return true;
    }
    struct map places;
    map_init(&places);
    list_visits(view, result);
    list_sites(view, result, &places);
    count_participants(view, result, &places);
    count_held(view, result, &places);
    size_t elsewhere = count_discrepancies(view, result, &places), asked = count_queries(view, result, &places);
    map_release(&places);
    if (elsewhere) {
        view_note(view, "%s about no participant, and at no site here.",
            elsewhere == 1 ? "1 discrepancy is" : arena_format(view->arena, "%zu discrepancies are", elsewhere));
    }
    if (asked) {
        view_note(view, "%s no participant, and at no site here.",
            asked == 1 ? "1 query names" : arena_format(view->arena, "%zu queries name", asked));
    }
    view->caption = arena_format(view->arena,
        "%s at %s. Observed is of participants with a record in force. A discrepancy counts once at each site it "
        "concerns. Small sites are shown as they are; no arm is shown.",
        count_words(view, frame->participant_count, "participant"), count_words(view, result->count, "site"));
    return true;
}

/* ---- writing ---- */

static void json(const struct view *view, struct json *json) {
    const struct sites_result *result = view->result;
    json_key_array(json, "sites");
    for (size_t s = 0; s < result->count; s++) {
        const struct site *site = &result->sites[s];
        json_object(json);
        json_field_string(json, "site", site->code);
        json_field_integer(json, "participants", (int64_t)site->participants);
        json_field_integer(json, "held_aside", (int64_t)site->held_aside);
        json_key_array(json, "visits");
        for (size_t v = 0; v < result->visit_count; v++) {
            json_object(json);
            json_field_string(json, "outcome", result->visits[v].outcome->id);
            json_field_string(json, "visit", result->visits[v].visit->label);
            json_field_integer(json, "n", (int64_t)site->in_force);
            json_field_integer(json, "observed", (int64_t)site->observed[v]);
            json_close(json);
        }
        json_close(json);
        json_key_object(json, "discrepancies");
        for (int state = 0; state < 3; state++) {
            json_field_integer(
                json, discrepancy_state_name((enum discrepancy_state)state), (int64_t)site->discrepancies[state]);
        }
        json_close(json);
        json_field_integer(json, "queries", (int64_t)site->queries);
        json_field_integer(json, "queries_unanswered", (int64_t)site->unanswered);
        json_close(json);
    }
    json_close(json);
    conversions_json(view, json);
}

static const char *share(const struct view *view, size_t part, size_t whole) {
    return whole ? arena_format(view->arena, "%.0f%% (%zu)", 100 * (double)part / (double)whole, part) : NULL;
}

static void tables(const struct view *view, struct table **tables, size_t *count) {
    const struct sites_result *result = view->result;
    struct table *table = table_new(view->arena, "Sites");
    table_column(table, "site", "Site", NULL, TABLE_WORDS);
    table_column(table, "participants", "Participants", NULL, TABLE_NUMBERS);
    table_column(table, "held_aside", "Records held aside", NULL, TABLE_NUMBERS);
    for (size_t v = 0; v < result->visit_count; v++) {
        const struct visit_column *visit = &result->visits[v];
        bool one = visit->outcome->visit_count == 1;
        table_column(table, arena_format(view->arena, "observed:%s:%s", visit->outcome->id, visit->visit->label),
            one ? visit->outcome->label
                : arena_format(view->arena, "%s, %s", visit->outcome->label, lower_first(view, visit->visit->label)),
            "% observed (n)", TABLE_NUMBERS);
    }
    table_column(table, "open", "Discrepancies open", NULL, TABLE_NUMBERS);
    table_column(table, "queried", "asked of the site", NULL, TABLE_NUMBERS);
    table_column(table, "settled", "settled", NULL, TABLE_NUMBERS);
    table_column(table, "queries", "Queries", NULL, TABLE_NUMBERS);
    table_column(table, "unanswered", "without an answer", NULL, TABLE_NUMBERS);
    for (size_t s = 0; s < result->count; s++) {
        const struct site *site = &result->sites[s];
        table_row(table);
        table_put_header(table, *site->code ? site->code : "none recorded");
        table_put_count(table, (int64_t)site->participants);
        table_put_count(table, (int64_t)site->held_aside);
        for (size_t v = 0; v < result->visit_count; v++) {
            table_put_text(table, share(view, site->observed[v], site->in_force));
        }
        table_put_count(table, (int64_t)site->discrepancies[DISCREPANCY_OPEN]);
        table_put_count(table, (int64_t)site->discrepancies[DISCREPANCY_QUERIED]);
        table_put_count(table, (int64_t)site->discrepancies[DISCREPANCY_SETTLED]);
        table_put_count(table, (int64_t)site->queries);
        table_put_count(table, (int64_t)site->unanswered);
    }
    tables[(*count)++] = table;
    struct table *conversions = conversions_table(view);
    if (conversions) {
        tables[(*count)++] = conversions;
    }
}

static const struct argument_rule arguments[] = {{0}};

const struct exhibit exhibit_sites = {
    .name = "sites",
    .item = 1,
    .title = "How complete is each site, and what is open there?",
    .tab = "Sites",
    .says =
        "Participants, records held aside, values observed, discrepancies, queries and unit conversions of each site",
    .pooled = SHOWN,
    .table_first = true,
    .method = "Counts by the current text of the plan's column of sites, in byte order; a blank site has a row of its "
              "own. A participant whose records "
              "are held aside stands at the site of the first of them and has no observed value yet. Nothing here is "
              "split by arm. A conversion "
              "reads a column at one site in another unit: the text stays as received, the number is multiplied by a "
              "published factor.",
    .arguments = arguments,
    .compute = compute,
    .json = json,
    .tables = tables,
};
