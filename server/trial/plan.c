/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "trial/plan.h"
#include "base/text.h"
#include "server/trial/plan-parts.h"
#include "trial/dates.h"
#include <math.h>
#include <stdio.h>
#include <string.h>
#include <unistr.h>

/* ---- files, and where columns live in them ---- */

static bool read_file(struct reader *reader, const cJSON *item, const char *path) {
    struct plan *plan = reader->plan;
    struct plan_file *file = &plan->files[plan->file_count];
    if (!keys_known(reader, item, path, "id name sheet layout participant visit codes") ||
        !read_text(reader, item, path, "id", true, &file->id) || !read_text(reader, item, path, "name", false, &file->name) ||
        !read_text(reader, item, path, "sheet", false, &file->sheet) ||
        !read_choice(reader, item, path, "layout", "participant", "visit", &file->by_visit) ||
        !read_text(reader, item, path, "participant", true, &file->participant) ||
        !read_text(reader, item, path, "visit", false, &file->visit) ||
        !read_texts(reader, item, path, "codes", &file->codes)) {
        return false;
    }
    bool derived = strcmp(file->id, "derived") == 0;
    if (derived || strpbrk(file->id, ".@,=& ")) {
        return wrong(reader, join(reader, path, "id"), derived ? "\"derived\" means the derived values; give the file another" :
            "must be one word without . @ , = or &");
    }
    for (size_t i = 0; i < plan->file_count; i++) {
        if (strcmp(plan->files[i].id, file->id) == 0) {
            return wrong(reader, join(reader, path, "id"), "is that of a file before it; each file needs its own");
        }
    }
    if (file->by_visit != (file->codes.count > 0)) {
        return wrong(reader, join(reader, path, "codes"), file->by_visit ?
            "must list the planned visit codes, in order of time" : "belongs to the layout \"visit\"");
    }
    for (size_t c = 0; c < file->codes.count; c++) {
        const char *code = file->codes.item[c];
        if (code[strspn(code, " \t\r\n\f\v")] == '\0' || strchr(code, '@')) {
            return wrong(reader, join(reader, path, "codes"), "must hold texts that are not blank and without @");
        }
        for (size_t before = 0; before < c; before++) {
            if (strcmp(file->codes.item[before], code) == 0) {
                return wrong(reader, join(reader, path, "codes"),
                    arena_format(&plan->arena, "holds \"%.60s\" twice; keep one", code));
            }
        }
    }
    file->identifier_name = arena_format(&plan->arena, "%s.%s", file->id, file->participant);
    file->visit_name = file->by_visit && file->visit ? arena_format(&plan->arena, "%s.%s", file->id, file->visit) : NULL;
    plan->file_count++;
    return true;
}

/* Slots: one for a file with a row per participant, one for each planned visit of a file with a row per visit. */
static void settle_slots(struct plan *plan) {
    size_t room = 0;
    for (size_t f = 0; f < plan->file_count; f++) {
        room += plan->files[f].by_visit ? plan->files[f].codes.count : 1;
    }
    plan->slots = ARENA_NEW(&plan->arena, room, struct slot);
    for (size_t f = 0; f < plan->file_count; f++) {
        struct plan_file *file = &plan->files[f];
        file->first_slot = plan->slot_count;
        for (size_t c = 0; c < (file->by_visit ? file->codes.count : 1); c++) {
            plan->slots[plan->slot_count++] = (struct slot){f, file->by_visit ? file->codes.item[c] : NULL};
        }
    }
}

static bool settle_files(struct reader *reader, const cJSON *root) {
    struct plan *plan = reader->plan;
    if (!member(root, "files")) {
        plan->files = ARENA_NEW(&plan->arena, 1, struct plan_file);
        plan->files[0].participant = plan->files[0].identifier_name = plan->participant;
        plan->file_count = 1;
        settle_slots(plan);
        return true;
    }
    if (!read_list(reader, root, "files", (void **)&plan->files, sizeof *plan->files, read_file)) {
        return false;
    }
    if (plan->file_count == 0) {
        return wrong(reader, "files", "is empty; name at least one file, or leave the key out");
    }
    const struct plan_file *first = &plan->files[0];
    if (strcmp(plan->participant, first->participant) != 0 && strcmp(plan->participant, first->identifier_name) != 0) {
        return wrong(reader, "participant", "must be the first file's column of identifiers");
    }
    plan->participant = first->identifier_name;
    settle_slots(plan);
    return true;
}

int file_of(const struct plan *plan, const char *id, size_t length) {
    for (size_t f = 0; f < plan->file_count; f++) {
        if (plan->files[f].id && strlen(plan->files[f].id) == length && memcmp(plan->files[f].id, id, length) == 0) {
            return (int)f;
        }
    }
    return NOWHERE;
}

/* Settles a place from its parts and gives its name; visit may be NULL. */
static bool settle_place(struct reader *reader, const char *path, size_t file, const char *column, const char *visit,
    const char **name, struct place *place) {
    struct plan *plan = reader->plan;
    const struct plan_file *from = &plan->files[file];
    *place = (struct place){file, from->first_slot, column};
    if (!from->id) {
        *name = column;
        return true;
    }
    if (!from->by_visit) {
        *name = arena_format(&plan->arena, "%s.%s", from->id, column);
        return !visit || wrong(reader, join(reader, path, "visit"), "is said of a file that has one row per participant");
    }
    if (!visit) {
        return wrong(reader, join(reader, path, "visit"),
            arena_format(&plan->arena, "is missing: \"%s\" has one row per visit, so say the visit's code", from->id));
    }
    *name = arena_format(&plan->arena, "%s.%s@%s", from->id, column, visit);
    for (size_t c = 0; c < from->codes.count; c++) {
        if (strcmp(from->codes.item[c], visit) == 0) {
            place->slot = from->first_slot + c;
            return true;
        }
    }
    return wrong(reader, join(reader, path, "visit"),
        arena_format(&plan->arena, "\"%.60s\" is not among the codes of the file \"%s\"", visit, from->id));
}

/* A column in one text: derived.ID, FILE.COLUMN, FILE.COLUMN@CODE, or a column of the first file. */
bool settle_text(struct reader *reader, const char *path, const char *text, const char **name, struct place *place) {
    struct plan *plan = reader->plan;
    int derived = plan_derived(plan, text);
    if (derived != NOWHERE) {
        *name = plan->derived[derived].column;
        *place = (struct place){0};
        return true;
    }
    if (plan->derived && strncmp(text, "derived.", strlen("derived.")) == 0) {
        return wrong(reader, path, arena_format(&plan->arena,
            "\"%.60s\" is not the name of a derived value of this plan; one may rest on those before it in the list only", text));
    }
    const char *dot = strchr(text, '.');
    int found = dot ? file_of(plan, text, (size_t)(dot - text)) : NOWHERE;
    if (found == NOWHERE) {
        return settle_place(reader, path, 0, text, NULL, name, place);
    }
    const char *at = plan->files[found].by_visit ? strrchr(dot, '@') : NULL;
    const char *column = at ? arena_bytes(&plan->arena, dot + 1, (size_t)(at - dot - 1)) : dot + 1;
    return settle_place(reader, path, (size_t)found, column, at ? at + 1 : NULL, name, place);
}

bool of_a_file(struct reader *reader, const char *path, const struct place *place) {
    return place->column || wrong(reader, path, "must be a column of a file; a derived value stands for numbers only");
}

/* A key whose text names a column; left alone where the key is not there. */
bool read_column(struct reader *reader, const cJSON *item, const char *path, const char *key, const char **name,
    struct place *place) {
    const char *text = NULL;
    return read_text(reader, item, path, key, false, &text) &&
           (!text || (settle_text(reader, join(reader, path, key), text, name, place) &&
                         of_a_file(reader, join(reader, path, key), place)));
}

/* "column", with "file" and "visit" beside it where there are several files. */
bool read_place(struct reader *reader, const cJSON *item, const char *path, const char **name, struct place *place) {
    struct plan *plan = reader->plan;
    const char *column = NULL, *file = NULL, *visit = NULL;
    if (!read_text(reader, item, path, "column", true, &column) || !read_text(reader, item, path, "file", false, &file) ||
        !read_text(reader, item, path, "visit", false, &visit)) {
        return false;
    }
    if (!file && !visit) {
        return settle_text(reader, path, column, name, place);
    }
    int found = file ? file_of(plan, file, strlen(file)) : 0;
    if (found == NOWHERE || (file && !plan->files[0].id)) {
        return wrong(reader, join(reader, path, "file"),
            arena_format(&plan->arena, "\"%.60s\" is not the id of a file of this plan", file));
    }
    if (visit && !plan->files[0].id) {
        return wrong(reader, join(reader, path, "visit"), "needs \"files\" in the plan, with a file that has one row per visit");
    }
    return settle_place(reader, path, (size_t)found, column, visit, name, place);
}

/* ---- the parts of a plan ---- */

static bool read_arms(struct reader *reader, const cJSON *root) {
    struct plan *plan = reader->plan;
    const cJSON *arm = member(root, "arm");
    if (!arm) {
        return true;
    }
    if (!keys_known(reader, arm, "arm", "column levels file visit") ||
        !read_place(reader, arm, "arm", &plan->arm_column, &plan->arm_place) ||
        !of_a_file(reader, "arm.column", &plan->arm_place)) {
        return false;
    }
    const cJSON *levels = member(arm, "levels");
    if (!cJSON_IsArray(levels) || cJSON_GetArraySize(levels) < 2) {
        return wrong(reader, "arm.levels", "must list two or more arms, each with its code and label");
    }
    plan->arms = ARENA_NEW(&plan->arena, cJSON_GetArraySize(levels), struct arm_level);
    size_t references = 0;
    for (const cJSON *item = levels->child; item; item = item->next) {
        const char *path = at_index(reader, "arm.levels", plan->arm_count);
        struct arm_level *level = &plan->arms[plan->arm_count];
        level->ratio = 1;
        if (!keys_known(reader, item, path, "code label reference ratio") ||
            !read_text(reader, item, path, "code", true, &level->code) ||
            !read_text(reader, item, path, "label", false, &level->label) ||
            !read_flag(reader, item, path, "reference", &level->reference) ||
            !read_number(reader, item, path, "ratio", &level->ratio)) {
            return false;
        }
        if (!(level->ratio > 0)) {
            return wrong(reader, join(reader, path, "ratio"), "must be a number above 0");
        }
        level->label = level->label ? level->label : level->code;
        for (size_t i = 0; i < plan->arm_count; i++) {
            if (strcmp(plan->arms[i].code, level->code) == 0) {
                return wrong(reader, path, "has the code of an arm before it; each arm needs its own");
            }
        }
        if (level->reference) {
            plan->reference = plan->arm_count;
            references++;
        }
        plan->arm_count++;
    }
    if (plan->arm_count > 26) {
        return wrong(reader, "arm.levels", "has more than 26 arms, more than there are letters to code them");
    }
    return references == 1 ||
           wrong(reader, "arm.levels", "must mark exactly one arm as the reference, with \"reference\": true");
}

static bool read_visits(struct reader *reader, const cJSON *item, const char *path, struct outcome *outcome) {
    const cJSON *visits = member(item, "visits");
    const char *where = join(reader, path, "visits");
    if (!cJSON_IsArray(visits) || !visits->child) {
        return wrong(reader, where, "must list at least one visit with its label and column, the baseline first");
    }
    outcome->visits = ARENA_NEW(&reader->plan->arena, cJSON_GetArraySize(visits), struct visit);
    for (const cJSON *child = visits->child; child; child = child->next) {
        struct visit *visit = &outcome->visits[outcome->visit_count];
        const char *place = at_index(reader, where, outcome->visit_count);
        if (!keys_known(reader, child, place, "label column file visit") ||
            !read_text(reader, child, place, "label", true, &visit->label) ||
            !read_place(reader, child, place, &visit->column, &visit->place)) {
            return false;
        }
        for (size_t i = 0; i < outcome->visit_count; i++) {
            if (strcmp(outcome->visits[i].label, visit->label) == 0 ||
                strcmp(outcome->visits[i].column, visit->column) == 0) {
                return wrong(reader, place, "repeats the label or column of a visit before it");
            }
        }
        outcome->visit_count++;
    }
    const char *primary = NULL;
    if (!read_text(reader, item, path, "primary_visit", false, &primary)) {
        return false;
    }
    outcome->primary_visit = outcome->visit_count - 1;
    if (!primary) {
        return true;
    }
    for (size_t i = 0; i < outcome->visit_count; i++) {
        if (strcmp(outcome->visits[i].label, primary) == 0) {
            outcome->primary_visit = i;
            return i > 0 || outcome->visit_count == 1 ||
                   wrong(reader, join(reader, path, "primary_visit"), "is the baseline; name a follow-up");
        }
    }
    return wrong(reader, join(reader, path, "primary_visit"), "is not the label of one of its visits");
}

static bool read_estimand(struct reader *reader, const cJSON *item, const char *path, struct outcome *outcome) {
    const cJSON *estimand = member(item, "estimand");
    const char *where = join(reader, path, "estimand");
    return !estimand ||
           (keys_known(reader, estimand, where, "population event_strategy summary") &&
               read_text(reader, estimand, where, "population", false, &outcome->population) &&
               read_text(reader, estimand, where, "event_strategy", false, &outcome->event_strategy) &&
               read_text(reader, estimand, where, "summary", false, &outcome->summary));
}

static bool id_is_new(struct reader *reader, const char *path, const char *id) {
    const struct plan *plan = reader->plan;
    if (strpbrk(id, ",=&")) {
        return wrong(reader, join(reader, path, "id"), "must not hold a comma, = or &");
    }
    return (plan_outcome(plan, id) == NOWHERE && plan_covariate(plan, id) == NOWHERE && plan_event(plan, id) == NOWHERE) ||
           fault_set(reader->fault, FAULT_INPUT, "%s: %s.id repeats \"%.60s\"; every outcome, covariate and event needs its own",
               reader->name, path, id);
}

static bool read_outcome(struct reader *reader, const cJSON *item, const char *path) {
    struct plan *plan = reader->plan;
    struct outcome *outcome = &plan->outcomes[plan->outcome_count];
    *outcome = (struct outcome){.unit = "", .important_difference = NAN, .responder_threshold = NAN};
    bool secondary = false, higher = false, log10_scale = false;
    struct texts unused = {0};
    if (!keys_known(reader, item, path,
            "id label unit role better scale plausible important_difference visits primary_visit missing_codes limit "
            "responder_threshold auxiliary estimand") ||
        !read_text(reader, item, path, "id", true, &outcome->id) || !id_is_new(reader, path, outcome->id) ||
        !read_text(reader, item, path, "label", false, &outcome->label) ||
        !read_text(reader, item, path, "unit", false, &outcome->unit) ||
        !read_choice(reader, item, path, "role", "primary", "secondary", &secondary) ||
        !read_choice(reader, item, path, "better", "lower", "higher", &higher) ||
        !read_choice(reader, item, path, "scale", "linear", "log10", &log10_scale) ||
        !read_range(reader, item, path, "plausible", &outcome->plausible) ||
        !read_number(reader, item, path, "important_difference", &outcome->important_difference) ||
        !read_number(reader, item, path, "responder_threshold", &outcome->responder_threshold) ||
        !read_texts(reader, item, path, "auxiliary", &unused) || !read_visits(reader, item, path, outcome) ||
        !read_estimand(reader, item, path, outcome) || !read_codes(reader, item, path, &outcome->missing_codes)) {
        return false;
    }
    if (member(item, "limit") && !keys_known(reader, member(item, "limit"), join(reader, path, "limit"), "lower upper rule")) {
        return false;
    }
    if (!member(item, "role") || !member(item, "better")) {
        return wrong(reader, path, "must say its role (primary or secondary) and which way is better (lower or higher)");
    }
    outcome->label = outcome->label ? outcome->label : outcome->id;
    outcome->primary = !secondary;
    outcome->lower_is_better = !higher;
    outcome->scale = log10_scale ? SCALE_LOG10 : SCALE_LINEAR;
    plan->outcome_count++;
    return true;
}

static bool read_levels(struct reader *reader, const cJSON *item, const char *path, struct covariate *covariate) {
    const cJSON *levels = member(item, "levels");
    if (!levels) {
        return true;
    }
    const char *where = join(reader, path, "levels");
    if (!cJSON_IsArray(levels)) {
        return wrong(reader, where, "must be a list of levels, each with its code and label");
    }
    covariate->levels = ARENA_NEW(&reader->plan->arena, cJSON_GetArraySize(levels), struct level);
    for (const cJSON *child = levels->child; child; child = child->next) {
        struct level *level = &covariate->levels[covariate->level_count];
        const char *place = at_index(reader, where, covariate->level_count);
        if (!keys_known(reader, child, place, "code label") || !read_text(reader, child, place, "code", true, &level->code) ||
            !read_text(reader, child, place, "label", false, &level->label)) {
            return false;
        }
        level->label = level->label ? level->label : level->code;
        for (size_t i = 0; i < covariate->level_count; i++) {
            if (strcmp(covariate->levels[i].code, level->code) == 0) {
                return wrong(reader, place, "has the code of a level before it; each level needs its own");
            }
        }
        covariate->level_count++;
    }
    return true;
}

static bool read_bands(struct reader *reader, const cJSON *item, const char *path, struct covariate *covariate) {
    const cJSON *bands = member(item, "bands");
    if (!bands) {
        return true;
    }
    const char *where = join(reader, path, "bands");
    if (!cJSON_IsArray(bands)) {
        return wrong(reader, where, "must be a list of increasing cut points, such as [55, 65]");
    }
    covariate->bands = ARENA_NEW(&reader->plan->arena, cJSON_GetArraySize(bands), double);
    for (const cJSON *child = bands->child; child; child = child->next) {
        if (!cJSON_IsNumber(child) || !isfinite(child->valuedouble) ||
            (covariate->band_count && child->valuedouble <= covariate->bands[covariate->band_count - 1])) {
            return wrong(reader, where, "must be a list of increasing cut points, such as [55, 65]");
        }
        covariate->bands[covariate->band_count++] = child->valuedouble;
    }
    return true;
}

static bool read_covariate(struct reader *reader, const cJSON *item, const char *path) {
    struct plan *plan = reader->plan;
    struct covariate *covariate = &plan->covariates[plan->covariate_count];
    *covariate = (struct covariate){.unit = ""};
    if (!keys_known(reader, item, path, "id label column file visit kind levels unit eligible plausible bands missing_codes") ||
        !read_text(reader, item, path, "id", true, &covariate->id) || !id_is_new(reader, path, covariate->id) ||
        !read_text(reader, item, path, "label", false, &covariate->label) ||
        !read_place(reader, item, path, &covariate->column, &covariate->place) ||
        !read_text(reader, item, path, "unit", false, &covariate->unit) ||
        !read_choice(reader, item, path, "kind", "category", "number", &covariate->number) ||
        !read_levels(reader, item, path, covariate) || !read_range(reader, item, path, "eligible", &covariate->eligible) ||
        !read_range(reader, item, path, "plausible", &covariate->plausible) || !read_bands(reader, item, path, covariate) ||
        !read_codes(reader, item, path, &covariate->missing_codes)) {
        return false;
    }
    if (!member(item, "kind")) {
        return wrong(reader, join(reader, path, "kind"), "is missing; say \"number\" or \"category\"");
    }
    if (covariate->number && covariate->level_count) {
        return wrong(reader, join(reader, path, "levels"), "belong to a category, and this is a number; use bands for cut points");
    }
    if (!covariate->number && (covariate->band_count || covariate->eligible.given || covariate->plausible.given)) {
        return wrong(reader, path, "is a category; bands, eligible and plausible belong to numbers");
    }
    covariate->label = covariate->label ? covariate->label : covariate->id;
    plan->covariate_count++;
    return true;
}

static bool one_of(const char *word, const char *const *words, size_t count) {
    for (size_t i = 0; i < count; i++) {
        if (strcmp(word, words[i]) == 0) {
            return true;
        }
    }
    return false;
}

static bool read_event_words(struct reader *reader, const cJSON *item, const char *path, struct event *event) {
    static const char *const kinds[] = {"stopped-treatment", "rescue", "withdrew", "died"};
    static const char *const strategies[] = {
        "treatment-policy", "hypothetical", "composite", "while-on-treatment", "principal-stratum"};
    if (!read_text(reader, item, path, "kind", false, &event->kind) ||
        !read_text(reader, item, path, "strategy", false, &event->strategy)) {
        return false;
    }
    if (event->kind && !one_of(event->kind, kinds, sizeof kinds / sizeof *kinds)) {
        return wrong(reader, join(reader, path, "kind"), "must be stopped-treatment, rescue, withdrew or died");
    }
    return !event->strategy || one_of(event->strategy, strategies, sizeof strategies / sizeof *strategies) ||
           wrong(reader, join(reader, path, "strategy"),
               "must be treatment-policy, hypothetical, composite, while-on-treatment or principal-stratum");
}

static bool read_event(struct reader *reader, const cJSON *item, const char *path) {
    struct plan *plan = reader->plan;
    struct event *event = &plan->events[plan->event_count];
    if (!keys_known(reader, item, path, "id label column file visit yes no date reason kind strategy") ||
        !read_text(reader, item, path, "id", true, &event->id) || !id_is_new(reader, path, event->id) ||
        !read_text(reader, item, path, "label", false, &event->label) ||
        !read_place(reader, item, path, &event->column, &event->place) ||
        !of_a_file(reader, join(reader, path, "column"), &event->place) ||
        !read_texts(reader, item, path, "yes", &event->yes) || !read_texts(reader, item, path, "no", &event->no) ||
        !read_column(reader, item, path, "date", &event->date, &event->date_place) ||
        !read_column(reader, item, path, "reason", &event->reason, &event->reason_place)) {
        return false;
    }
    if (!event->yes.count || !event->no.count) {
        return wrong(reader, path, "must list the codes that mean yes and those that mean no");
    }
    for (size_t i = 0; i < event->yes.count; i++) {
        if (one_of(event->yes.item[i], event->no.item, event->no.count)) {
            return wrong(reader, path, "has a code that means yes and no at once");
        }
    }
    event->label = event->label ? event->label : event->id;
    plan->event_count++;
    return read_event_words(reader, item, path, event);
}

/* A list of covariates' ids as indices. */
static bool read_ids(struct reader *reader, const cJSON *root, const char *key, int **ids, size_t *count) {
    struct texts texts = {0};
    if (!read_texts(reader, root, "", key, &texts)) {
        return false;
    }
    *ids = ARENA_NEW(&reader->plan->arena, texts.count, int);
    for (size_t i = 0; i < texts.count; i++) {
        int index = plan_covariate(reader->plan, texts.item[i]);
        for (size_t j = 0; j < *count; j++) {
            if ((*ids)[j] == index && index != NOWHERE) {
                return fault_set(reader->fault, FAULT_INPUT, "%s: %s names \"%.60s\" twice", reader->name, key, texts.item[i]);
            }
        }
        if (index == NOWHERE) {
            return fault_set(reader->fault, FAULT_INPUT, "%s: %s names \"%.60s\", which is not the id of a covariate of this plan",
                reader->name, key, texts.item[i]);
        }
        (*ids)[(*count)++] = index;
    }
    return true;
}

static bool settle_primary(struct reader *reader) {
    struct plan *plan = reader->plan;
    size_t primaries = 0;
    for (size_t i = 0; i < plan->outcome_count; i++) {
        if (plan->outcomes[i].primary) {
            plan->primary = i;
            primaries++;
        }
    }
    return primaries == 1 ||
           wrong(reader, "outcomes", primaries == 0 ? "has none with \"role\": \"primary\"; a plan needs exactly one" :
                   "has more than one with \"role\": \"primary\"; keep one and make the others secondary");
}

static bool same_codes(const struct texts *a, const struct texts *b) {
    bool same = a->count == b->count;
    for (size_t i = 0; i < a->count && same; i++) {
        same = one_of(a->item[i], b->item, b->count);
    }
    return same;
}

/* Adds the column to the variables, or finds it there; a column has one kind. */
bool place_variable(struct reader *reader, const struct variable *wanted, int *index) {
    struct plan *plan = reader->plan;
    bool identifier = plan_identifier_file(plan, wanted->column) != NOWHERE;
    if (identifier || (plan->arm_column && strcmp(wanted->column, plan->arm_column) == 0)) {
        return fault_set(reader->fault, FAULT_INPUT, "%s: the column \"%.60s\" is both %s and %s; a column has one meaning",
            reader->name, wanted->column, wanted->label,
            identifier ? "the participant's identifier" : "the arm");
    }
    *index = plan_variable(plan, wanted->column);
    if (*index == NOWHERE) {
        *index = (int)plan->variable_count;
        plan->variables[plan->variable_count++] = *wanted;
        return true;
    }
    struct variable *there = &plan->variables[*index];
    if (there->kind != wanted->kind) {
        return fault_set(reader->fault, FAULT_INPUT, "%s: the column \"%.60s\" is used as two different kinds, for %s and for %s; a column has one meaning",
            reader->name, wanted->column, there->label, wanted->label);
    }
    /* Several events may rest on one column, each with its own codes, and each is read from it by itself. */
    if (wanted->event != NOWHERE && there->event != NOWHERE) {
        if (same_codes(&plan->events[wanted->event].yes, &plan->events[there->event].yes)) {
            return fault_set(reader->fault, FAULT_INPUT, "%s: %s and %s rest on the column \"%.60s\" with the same codes for yes; keep one",
                reader->name, there->label, wanted->label, wanted->column);
        }
        *index = (int)plan->variable_count;
        plan->variables[plan->variable_count++] = *wanted;
        return true;
    }
    /* A covariate may be an outcome's visit, such as its baseline; whichever says more about the numbers is heard. */
    if (wanted->outcome != NOWHERE && there->outcome == NOWHERE) {
        there->outcome = wanted->outcome;
        there->visit = wanted->visit;
        there->plausible = there->plausible.given ? there->plausible : wanted->plausible;
        there->unit = *there->unit ? there->unit : wanted->unit;
        there->missing_codes = there->missing_codes == &plan->missing_codes ? wanted->missing_codes : there->missing_codes;
        return true;
    }
    return fault_set(reader->fault, FAULT_INPUT, "%s: the column \"%.60s\" is used twice, for %s and for %s; a column has one meaning",
        reader->name, wanted->column, there->label, wanted->label);
}

static bool settle_variables(struct reader *reader) {
    static const struct variable none = {.outcome = NOWHERE, .visit = NOWHERE, .covariate = NOWHERE, .event = NOWHERE,
        .derived = NOWHERE, .moment = NOWHERE};
    static const struct texts no_codes = {0};
    struct plan *plan = reader->plan;
    size_t room = plan->covariate_count + plan->event_count + (plan->dates ? plan->dates->moment_count : 0);
    for (size_t i = 0; i < plan->outcome_count; i++) {
        room += plan->outcomes[i].visit_count;
    }
    for (size_t i = 0; i < plan->derived_count; i++) {
        room += 2 + plan->derived[i].of_count;
    }
    plan->variables = ARENA_NEW(&plan->arena, room, struct variable);
    for (size_t i = 0; i < plan->covariate_count; i++) {
        struct covariate *covariate = &plan->covariates[i];
        struct variable variable = none;
        variable.column = covariate->column;
        variable.place = covariate->place;
        variable.label = covariate->label;
        variable.unit = covariate->unit;
        variable.kind = covariate->number ? VARIABLE_NUMBER : VARIABLE_CATEGORY;
        variable.covariate = (int)i;
        variable.plausible = covariate->plausible;
        variable.eligible = covariate->eligible;
        variable.missing_codes = covariate->missing_codes;
        if (!place_variable(reader, &variable, &covariate->variable)) {
            return false;
        }
    }
    for (size_t i = 0; i < plan->outcome_count; i++) {
        struct outcome *outcome = &plan->outcomes[i];
        for (size_t v = 0; v < outcome->visit_count; v++) {
            struct variable variable = none;
            variable.column = outcome->visits[v].column;
            variable.place = outcome->visits[v].place;
            variable.label = outcome->visit_count == 1 ? outcome->label :
                arena_format(&plan->arena, "%s, %s", outcome->label, outcome->visits[v].label);
            variable.unit = outcome->unit;
            variable.kind = VARIABLE_NUMBER;
            variable.outcome = (int)i;
            variable.visit = (int)v;
            variable.plausible = outcome->plausible;
            variable.missing_codes = outcome->missing_codes;
            if (!place_variable(reader, &variable, &outcome->visits[v].variable)) {
                return false;
            }
        }
    }
    for (size_t i = 0; i < plan->event_count; i++) {
        struct event *event = &plan->events[i];
        struct variable variable = none;
        variable.column = event->column;
        variable.place = event->place;
        variable.label = event->label;
        variable.unit = "";
        variable.kind = VARIABLE_EVENT;
        variable.event = (int)i;
        variable.missing_codes = &no_codes;
        if (!place_variable(reader, &variable, &event->variable)) {
            return false;
        }
    }
    for (size_t i = 0; plan->dates && i < plan->dates->moment_count; i++) {
        struct moment *moment = &plan->dates->moments[i];
        struct variable variable = none;
        variable.column = moment->column;
        variable.place = moment->place;
        variable.label = moment->kind == MOMENT_VISIT ? arena_format(&plan->arena, "Date of %s", moment->label) :
            moment->kind == MOMENT_RANDOMISED ? "Date of randomisation" : arena_format(&plan->arena, "Date: %s", moment->label);
        variable.unit = "";
        variable.kind = VARIABLE_DATE;
        variable.moment = (int)i;
        variable.missing_codes = &plan->missing_codes;
        if (!place_variable(reader, &variable, &moment->variable)) {
            return false;
        }
    }
    return settle_derived(reader);
}

/* A column called NAME@SOMETHING by its file would share the decisions on one called NAME. */
static bool names_differ(struct reader *reader) {
    const struct plan *plan = reader->plan;
    for (size_t i = 0; i < plan->variable_count; i++) {
        const char *name = plan->variables[i].column;
        for (size_t j = 0; strchr(name, '@') && j < plan->variable_count; j++) {
            if (strcmp(plan->variables[j].column, name) != 0 && plan_covers(plan->variables[j].column, name)) {
                return fault_set(reader->fault, FAULT_INPUT, "%s: the columns \"%.60s\" and \"%.60s\" cannot be told apart in decisions, where @ "
                    "stands before a visit; rename one in the export", reader->name, plan->variables[j].column, name);
            }
        }
    }
    return true;
}

static bool settle_standard_error(struct reader *reader, const cJSON *root) {
    struct plan *plan = reader->plan;
    if (!read_choice(reader, root, "", "standard_error", "classical", "robust", &plan->robust)) {
        return false;
    }
    bool unequal = false;
    for (size_t i = 1; i < plan->arm_count; i++) {
        unequal = unequal || plan->arms[i].ratio > plan->arms[0].ratio || plan->arms[i].ratio < plan->arms[0].ratio;
    }
    plan->robust_because = plan->robust ? "the plan asks for it" :
        unequal                         ? "the planned allocation is unequal" :
        plan->arm_count > 2             ? "there are more than two arms" :
                                          NULL;
    plan->robust = plan->robust_because != NULL;
    return true;
}

static bool settle_settings(struct reader *reader, const cJSON *root) {
    struct plan *plan = reader->plan;
    double seed = 1;
    const char *blinding = NULL;
    plan->confidence = 0.95;
    if (!read_number(reader, root, "", "confidence", &plan->confidence) || !read_number(reader, root, "", "seed", &seed) ||
        !read_text(reader, root, "", "blinding", false, &blinding) ||
        !read_choice(reader, root, "", "missing_baseline", "mean", "drop", &plan->drop_missing_baseline)) {
        return false;
    }
    if (!(plan->confidence >= 0.5 && plan->confidence < 1)) {
        return wrong(reader, "confidence", "must be at least 0.5 and below 1, such as 0.95");
    }
    if (!(seed >= 0 && seed <= 9007199254740992.0) || floor(seed) < seed) {
        return wrong(reader, "seed", "must be a whole number from 0");
    }
    plan->seed = (uint64_t)seed;
    if (blinding && !blinding_read(blinding, &plan->blinding)) {
        return wrong(reader, "blinding", "must be \"pooled\", \"coded\" or \"unblinded\"");
    }
    if (plan->blinding != BLINDING_POOLED && !plan->arm_column) {
        return wrong(reader, "blinding", "must be \"pooled\" while the plan has no arm");
    }
    const cJSON *site = member(root, "site");
    return !site || (keys_known(reader, site, "site", "column file visit") &&
                        read_place(reader, site, "site", &plan->site_column, &plan->site_place) &&
                        of_a_file(reader, "site.column", &plan->site_place));
}

static bool read_plan(struct reader *reader, const cJSON *root) {
    struct plan *plan = reader->plan;
    if (!keys_known(reader, root, "",
            "title participant arm missing_codes outcomes covariates events adjust_for missing_baseline subgroups confidence "
            "blinding seed site stratified_by standard_error files screening dates derived") ||
        !read_text(reader, root, "", "title", true, &plan->title) ||
        !read_text(reader, root, "", "participant", true, &plan->participant) || !settle_files(reader, root) ||
        !read_list(reader, root, "derived", (void **)&plan->derived, sizeof *plan->derived, read_derived) ||
        !read_arms(reader, root) ||
        !read_code_list(reader, root, "", &plan->missing_codes) ||
        !read_list(reader, root, "outcomes", (void **)&plan->outcomes, sizeof *plan->outcomes, read_outcome) ||
        !read_list(reader, root, "covariates", (void **)&plan->covariates, sizeof *plan->covariates, read_covariate) ||
        !read_list(reader, root, "events", (void **)&plan->events, sizeof *plan->events, read_event) ||
        !settle_primary(reader) || !read_ids(reader, root, "adjust_for", &plan->adjust_for, &plan->adjust_count) ||
        !read_ids(reader, root, "subgroups", &plan->subgroups, &plan->subgroup_count) ||
        !read_ids(reader, root, "stratified_by", &plan->stratified_by, &plan->stratified_count)) {
        return false;
    }
    if (plan->arm_column && strcmp(plan->arm_column, plan->participant) == 0) {
        return wrong(reader, "arm.column", "is the participant's column; a column has one meaning");
    }
    return read_dates(reader, root) && settle_variables(reader) && names_differ(reader) && nothing_comes_late(reader) &&
           settle_settings(reader, root) && settle_standard_error(reader, root) && read_screening(reader, root);
}

/* Where in the text JSON stopped being JSON: 1-based line and column, in characters. */
static bool not_json(const char *json, const char *end, const char *name, struct fault *fault) {
    size_t line = 1, column = 1;
    for (const char *p = json; p < end; p++) {
        column = *p == '\n' ? 1 : column + (((unsigned char)*p & 0xC0) != 0x80);
        line += *p == '\n';
    }
    if (json[strspn(json, " \t\r\n")] == '\0') {
        return fault_set(fault, FAULT_INPUT, "%s: the file is empty; a plan is an object in braces", name);
    }
    return fault_at(fault, FAULT_INPUT, line, column,
        "%s, line %zu, column %zu: this is not JSON from here on; mend the text (a comma, a quote or a bracket?) and try again", name,
        line, column);
}

static bool not_utf8(const char *json, const char *at, const char *name, struct fault *fault) {
    size_t line = 1;
    for (const char *p = json; p < at; p++) {
        line += *p == '\n';
    }
    return fault_at(fault, FAULT_INPUT, line, 0, "%s, line %zu: a character that is not UTF-8; save the file as UTF-8 and try again", name,
        line);
}

bool plan_read(struct plan *plan, const char *json, size_t length, const char *name, struct fault *fault) {
    *plan = (struct plan){0};
    arena_init(&plan->arena);
    if (length >= 3 && memcmp(json, "\xEF\xBB\xBF", 3) == 0) {
        json += 3;
        length -= 3;
    }
    /* cJSON stops at a NUL byte; a copy that ends with one is what it needs. */
    const char *copy = arena_bytes(&plan->arena, json, length), *end = copy;
    struct reader reader = {plan, name, fault};
    cJSON *root = cJSON_ParseWithOpts(copy, &end, 1);
    const char *foreign = (const char *)u8_check((const uint8_t *)copy, length);
    bool done = foreign                ? not_utf8(copy, foreign, name, fault) :
        root && strlen(copy) == length ? read_plan(&reader, root) :
                                         not_json(copy, end ? end : copy, name, fault);
    cJSON_Delete(root);
    if (!done) {
        plan_release(plan);
    }
    return done;
}

void plan_release(struct plan *plan) {
    arena_release(&plan->arena);
    *plan = (struct plan){0};
}

int plan_outcome(const struct plan *plan, const char *id) {
    for (size_t i = 0; i < plan->outcome_count; i++) {
        if (strcmp(plan->outcomes[i].id, id) == 0) {
            return (int)i;
        }
    }
    return NOWHERE;
}

int plan_covariate(const struct plan *plan, const char *id) {
    for (size_t i = 0; i < plan->covariate_count; i++) {
        if (strcmp(plan->covariates[i].id, id) == 0) {
            return (int)i;
        }
    }
    return NOWHERE;
}

int plan_derived(const struct plan *plan, const char *column) {
    for (size_t i = 0; i < plan->derived_count; i++) {
        if (strcmp(plan->derived[i].column, column) == 0) {
            return (int)i;
        }
    }
    return NOWHERE;
}

int plan_event(const struct plan *plan, const char *id) {
    for (size_t i = 0; i < plan->event_count; i++) {
        if (strcmp(plan->events[i].id, id) == 0) {
            return (int)i;
        }
    }
    return NOWHERE;
}

int plan_identifier_file(const struct plan *plan, const char *column) {
    for (size_t f = 0; f < plan->file_count; f++) {
        if (strcmp(plan->files[f].identifier_name, column) == 0) {
            return (int)f;
        }
    }
    return NOWHERE;
}

bool plan_covers(const char *said, const char *name) {
    size_t length = strlen(said);
    return strncmp(said, name, length) == 0 && (name[length] == '\0' || name[length] == '@');
}

const char *plan_column_name(struct arena *arena, const struct plan *plan, size_t file, const char *column) {
    return plan->files[file].id ? arena_format(arena, "%s.%s", plan->files[file].id, column) : column;
}

int plan_visit_file(const struct plan *plan, const char *column) {
    for (size_t f = 0; f < plan->file_count; f++) {
        if (plan->files[f].visit_name && strcmp(plan->files[f].visit_name, column) == 0) {
            return (int)f;
        }
    }
    return NOWHERE;
}

int plan_window_file(const struct plan *plan, const char *column) {
    for (size_t f = 0; f < plan->file_count; f++) {
        if (plan->files[f].window_name && strcmp(plan->files[f].window_name, column) == 0) {
            return (int)f;
        }
    }
    return NOWHERE;
}

int plan_variable(const struct plan *plan, const char *column) {
    for (size_t i = 0; i < plan->variable_count; i++) {
        if (strcmp(plan->variables[i].column, column) == 0) {
            return (int)i;
        }
    }
    return NOWHERE;
}

static const char *const scale_names[] = {"linear", "log10"};
static const char *const blinding_names[] = {"pooled", "coded", "unblinded"};

const char *scale_name(enum scale scale) {
    return scale_names[scale];
}

bool scale_read(const char *name, enum scale *scale) {
    *scale = strcmp(name, "log10") == 0 ? SCALE_LOG10 : SCALE_LINEAR;
    return strcmp(name, scale_names[*scale]) == 0;
}

const char *blinding_name(enum blinding blinding) {
    return blinding_names[blinding];
}

bool blinding_read(const char *name, enum blinding *blinding) {
    for (int i = 0; i < 3; i++) {
        if (strcmp(name, blinding_names[i]) == 0) {
            *blinding = (enum blinding)i;
            return true;
        }
    }
    return false;
}

size_t band_of(const double *bands, size_t count, double value) {
    size_t band = 0;
    while (band < count && value >= bands[band]) {
        band++;
    }
    return band;
}

const char *band_words(struct arena *arena, const double *bands, size_t count, size_t band) {
    if (count == 0) {
        return "all";
    }
    return band == 0     ? arena_format(arena, "below %.15g", bands[0]) :
           band == count ? arena_format(arena, "%.15g and above", bands[count - 1]) :
                           arena_format(arena, "%.15g to below %.15g", bands[band - 1], bands[band]);
}
