/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The agenda of a meeting: nine items in order, what is still open in each, and the exhibits of each. */
#include "exhibits/registry.h"
#include <string.h>

struct counts { /* one ledger for every screen */
    size_t participants, repeated, missing;
    struct discrepancies found;
};

struct item {
    const char *name;
    const char *(*open)(const struct frame *frame, const struct counts *counts, struct arena *arena);
    const char *later; /* said where this version has no exhibit for the item */
};

static const struct outcome *primary(const struct frame *frame) {
    return &frame->plan->outcomes[frame->plan->primary];
}

static const char *participants_open(const struct frame *frame, const struct counts *counts, struct arena *arena) {
    (void)frame;
    return counts->repeated ? arena_format(arena, "%zu loaded, %zu repeated", counts->participants, counts->repeated) :
                              arena_format(arena, "%zu loaded", counts->participants);
}

static const char *doubtful_open(const struct frame *frame, const struct counts *counts, struct arena *arena) {
    (void)frame;
    const char *queried = counts->found.queried ? arena_format(arena, ", %zu queried", counts->found.queried) : "";
    return counts->found.open ? arena_format(arena, "%zu open of %zu%s", counts->found.open, counts->found.count, queried) :
        counts->found.count   ? arena_format(arena, "none open of %zu%s", counts->found.count, queried) :
                                "none found";
}

static const char *missing_open(const struct frame *frame, const struct counts *counts, struct arena *arena) {
    const char *visit = primary(frame)->visits[primary(frame)->primary_visit].label;
    return counts->missing ? arena_format(arena, "%zu at %s", counts->missing, visit) : arena_format(arena, "none at %s", visit);
}

static const char *scale_open(const struct frame *frame, const struct counts *counts, struct arena *arena) {
    (void)counts;
    size_t decided = 0;
    for (size_t o = 0; o < frame->plan->outcome_count; o++) {
        for (size_t i = 0; i < frame->version; i++) {
            const struct decision *decision = &frame->decisions[i];
            if (frame->stands[i] && decision->kind == DECISION_SCALE && strcmp(decision->outcome, frame->plan->outcomes[o].id) == 0) {
                decided++;
                break;
            }
        }
    }
    return decided == frame->plan->outcome_count ? "scales decided" :
        decided                                  ? arena_format(arena, "%zu of %zu scales decided", decided, frame->plan->outcome_count) :
                                                   "scales as planned";
}

static const char *effect_open(const struct frame *frame, const struct counts *counts, struct arena *arena) {
    (void)counts;
    (void)arena;
    return !frame->arm                                ? "the plan has no arm" :
        frame->blinding == BLINDING_POOLED            ? "closed while pooled" :
        frame->blinding == BLINDING_CODED             ? "shown by letter" :
                                                        "shown by name";
}

static const char *record_open(const struct frame *frame, const struct counts *counts, struct arena *arena) {
    (void)counts;
    return arena_format(arena, "%u decision%s%s", frame->version, frame->version == 1 ? "" : "s", frame->locked ? ", locked" : "");
}

static const char *nothing_open(const struct frame *frame, const struct counts *counts, struct arena *arena) {
    (void)frame;
    (void)counts;
    (void)arena;
    return "";
}

static const struct item items[] = {
    {"Participants", participants_open, NULL},
    {"Doubtful values", doubtful_open, NULL},
    {"Missing values", missing_open, NULL},
    {"Distribution and scale", scale_open, NULL},
    {"Change", nothing_open, NULL},
    {"Effect", effect_open, NULL},
    {"Sensitivity", nothing_open, "A later version shows here how outliers and missing values could change the answer."},
    {"Subgroups", nothing_open, "A later version shows subgroup effects here; the change by arm can be split by a covariate now."},
    {"Record and report", record_open, NULL},
};
enum { ITEMS = sizeof items / sizeof *items };

static const char care[] =
    "For use by people qualified to analyse trials, beside the approved protocol and analysis plan. Not a basis for treating any one patient. It does "
    "not replace the duties of sponsor, investigator, ethics committee, data monitoring committee or regulator; local law and data-protection rules "
    "come first. Question a value at its source before correcting it.";

static void count(const struct frame *frame, const struct frame *received, struct arena *arena, struct counts *counts) {
    *counts = (struct counts){.participants = frame->participant_count};
    checks_run(frame, received, arena, &counts->found);
    const struct column *column = frame->columns[primary(frame)->visits[primary(frame)->primary_visit].variable];
    for (size_t p = 0; p < frame->participant_count; p++) {
        counts->repeated += frame->participants[p].record_count > 1 && frame->participants[p].record == NO_RECORD;
        counts->missing += column->state[p] != CELL_OBSERVED && column->state[p] != CELL_HELD_ASIDE;
    }
}

static const char *refused(const struct frame *frame, const struct exhibit *exhibit) {
    return frame->blinding != BLINDING_POOLED || exhibit->pooled != REFUSED ? NULL :
        frame->arm ? "It compares the arms and is not shown while the study is pooled; a decision to unblind opens it." :
                     "It compares the arms, and this plan has no arm.";
}

static void write_exhibits(const struct frame *frame, int item, struct json *json, struct arena *arena) {
    json_key_array(json, "exhibits");
    for (size_t i = 0; exhibits[i]; i++) {
        const struct exhibit *exhibit = exhibits[i];
        if (exhibit->item != item || (exhibit->applies && !exhibit->applies(frame->plan))) {
            continue;
        }
        json_object(json);
        json_field_string(json, "name", exhibit->name);
        json_field_string(json, "number", arena_format(arena, "%d.%d", item, exhibit_number(exhibit)));
        json_field_string(json, "tab", exhibit->tab);
        json_field_string(json, "title", exhibit->title);
        json_field_bool(json, "figure", exhibit->figure != NULL);
        json_field_string(json, "refused", refused(frame, exhibit));
        json_close(json);
    }
    json_close(json);
}

static void write_words(struct json *json, const char *key, const char *words, struct arena *arena) {
    json_key_array(json, key);
    for (const char *at = words; *at; at += strcspn(at, " "), at += *at == ' ') {
        json_string(json, arena_bytes(arena, at, strcspn(at, " ")));
    }
    json_close(json);
}

static void write_kinds(struct json *json, struct arena *arena) {
    json_key_array(json, "kinds");
    for (int i = 0; i < DECISION_KIND_COUNT; i++) {
        const struct decision_rule *rule = &decision_rules[i];
        json_object(json);
        json_field_string(json, "name", rule->name);
        json_field_string(json, "says", rule->says);
        write_words(json, "required", rule->required, arena);
        write_words(json, "optional", rule->optional, arena);
        json_field_bool(json, "reason", rule->reason_needed);
        json_field_bool(json, "reversible", rule->reversible);
        json_close(json);
    }
    json_close(json);
}

static void write_outcomes(const struct frame *frame, struct json *json) {
    json_key_array(json, "outcomes");
    for (size_t o = 0; o < frame->plan->outcome_count; o++) {
        const struct outcome *outcome = &frame->plan->outcomes[o];
        json_object(json);
        json_field_string(json, "id", outcome->id);
        json_field_string(json, "label", outcome->label);
        json_field_string(json, "unit", outcome->unit);
        json_field_string(json, "planned_scale", scale_name(outcome->scale));
        json_field_string(json, "scale", scale_name(frame->scales[o]));
        json_key_array(json, "visits");
        for (size_t v = 0; v < outcome->visit_count; v++) {
            json_string(json, outcome->visits[v].label);
        }
        json_close(json);
        json_close(json);
    }
    json_close(json);
}

/* People of the last "attending" decision that stands, as JSON, and every note, newest last. */
static void write_meeting(const struct frame *frame, struct json *json) {
    const char *people = NULL;
    json_key_array(json, "notes");
    for (size_t i = 0; i < frame->version; i++) {
        const struct decision *decision = &frame->decisions[i];
        if (frame->stands[i] && decision->kind == DECISION_NOTE) {
            json_object(json);
            json_field_integer(json, "number", decision->number);
            json_field_string(json, "exhibit", decision->exhibit);
            json_field_string(json, "text", decision->text);
            json_field_string(json, "by", decision->by);
            json_field_string(json, "at", decision->at);
            json_close(json);
        }
        people = frame->stands[i] && decision->kind == DECISION_ATTENDING ? decision->people : people;
    }
    json_close(json);
    json_key(json, "attending");
    if (people) {
        json_raw(json, people);
    } else {
        json_null(json);
    }
}

static void write_data(const struct study_facts *facts, struct json *json) {
    size_t records = 0, columns = 0; /* of all files */
    for (size_t f = 0; f < facts->file_count; f++) {
        records += facts->files[f].records;
        columns += facts->files[f].columns;
    }
    json_key_object(json, "data");
    json_field_string(json, "name", facts->data_name);
    json_field_string(json, "received_at", facts->received_at);
    json_field_integer(json, "length", (int64_t)facts->data_length);
    json_field_string(json, "encoding", facts->encoding);
    json_field_string(json, "delimiter", facts->delimiter);
    json_field_integer(json, "records", (int64_t)records);
    json_field_integer(json, "columns", (int64_t)columns);
    json_close(json);
}

static const char *file_part(const char *path) {
    const char *slash = strrchr(path, '/');
    return slash ? slash + 1 : path;
}

bool agenda_json(struct study *study, struct arena *arena, struct text *out, struct fault *fault) {
    struct frame *frame = study_frame(study, fault);
    if (!frame) {
        return false;
    }
    struct frame *received = study_received_frame(study);
    struct study_facts facts;
    study_facts(study, &facts);
    char head[HASH_SIZE];
    study_head(study, frame->version, head);
    struct counts counts;
    count(frame, received, arena, &counts);
    struct json json;
    json_init(&json, out);
    json_object(&json);
    json_field_string(&json, "study", file_part(study_path(study)));
    json_field_string(&json, "title", frame->plan->title);
    json_field_integer(&json, "version", frame->version);
    json_field_string(&json, "blinding", blinding_name(frame->blinding));
    json_field_bool(&json, "has_arm", frame->arm != NULL);
    json_field_string(&json, "state_sha256", frame->state_sha256);
    json_field_string(&json, "data_sha256", frame->data_sha256);
    json_field_string(&json, "head", head);
    json_field_bool(&json, "locked", frame->locked);
    write_data(&facts, &json);
    json_field_integer(&json, "decisions", frame->version);
    json_field_string(&json, "care", care);
    json_key_array(&json, "items");
    for (int i = 0; i < ITEMS; i++) {
        json_object(&json);
        json_field_integer(&json, "number", i + 1);
        json_field_string(&json, "name", items[i].name);
        json_field_string(&json, "open", items[i].open(frame, &counts, arena));
        json_field_string(&json, "later", items[i].later);
        write_exhibits(frame, i + 1, &json, arena);
        json_close(&json);
    }
    json_close(&json);
    write_kinds(&json, arena);
    write_outcomes(frame, &json);
    write_meeting(frame, &json);
    json_close(&json);
    json_finish(&json);
    text_char(out, '\n');
    frame_release(frame);
    frame_release(received);
    return true;
}
