/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "trial/study.h"
#include "base/clock.h"
#include "base/version.h"
#include "draw/json.h"
#include "intake/read.h"
#include "store/store.h"
#include "trial/amend.h"
#include <pthread.h>
#include <pwd.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/random.h>
#include <unistd.h>

struct look {
    struct look *next;
    const char *exhibit, *arguments, *by;
    uint32_t version;
};

struct amended { /* a plan that amendments have made; lives as long as the study, for frames point into it */
    struct amended *next;
    const char *text;
    struct plan plan;
    char fingerprint[HASH_SIZE];
};

struct study {
    pthread_mutex_t mutex;
    struct arena arena; /* what lives as long as the study: plan text, facts, decisions' texts */
    struct store *store;
    struct cells *cells; /* [plan.file_count] */
    struct plan plan; /* as loaded */
    const char *plan_text;
    const char **names;      /* of the files received */
    struct amended *amended; /* newest first */
    struct record record;
    unsigned char letters[32];
    struct study_facts facts;
    char entry_zero[HASH_SIZE];
    struct frame *frame, *received;
    struct look *looks; /* entered by this process, so that drawing the same screen again is one look */
};

static const char *file_part(const char *path) {
    const char *slash = strrchr(path, '/');
    return slash ? slash + 1 : path;
}

/* ---- the plan against the files ---- */

static bool column_is_there(const struct cells *cells, const struct place *place, const char *what,
    const char *const *names, const char *plan_name, struct fault *fault) {
    const struct cells *file = &cells[place->file];
    if (cells_column(file, place->column) != SIZE_MAX) {
        return true;
    }
    char listed[256] = "";
    size_t used = 0;
    for (size_t i = 0; i < file->columns && used + 40 < sizeof listed; i++) {
        used += (size_t)snprintf(listed + used, sizeof listed - used, "%s%.32s", i ? ", " : "", file->names[i]);
    }
    return fault_set(fault, FAULT_INPUT, "%s: the column \"%.60s\" (%.80s) is not in %s, line 1, which has: %s; mend the plan or the header",
        plan_name, place->column, what, names[place->file], listed);
}

static bool file_fits(const struct plan *plan, const struct cells *cells, size_t f, const char *const *names, const char *plan_name,
    struct fault *fault) {
    struct place identifier = {f, 0, plan->files[f].participant}, visit = {f, 0, plan->files[f].visit},
                 window = {f, 0, plan->files[f].window};
    return column_is_there(cells, &identifier, "the participant's identifier", names, plan_name, fault) &&
           (!plan->files[f].visit || column_is_there(cells, &visit, "the visit's code", names, plan_name, fault)) &&
           (!plan->files[f].window || column_is_there(cells, &window, "the date that says the visit", names, plan_name, fault)) &&
           (cells[f].records > 0 || fault_at(fault, FAULT_INPUT, 2, 0,
               "%s has a header and no record below it; load a file with at least one participant", names[f]));
}

static bool plan_fits(const struct plan *plan, const struct cells *cells, const char *const *names, const char *plan_name,
    struct fault *fault) {
    for (size_t f = 0; f < plan->file_count; f++) {
        if (!file_fits(plan, cells, f, names, plan_name, fault)) {
            return false;
        }
    }
    if ((plan->arm_column && !column_is_there(cells, &plan->arm_place, "the arm", names, plan_name, fault)) ||
        (plan->site_column && !column_is_there(cells, &plan->site_place, "the site", names, plan_name, fault))) {
        return false;
    }
    for (size_t i = 0; i < plan->variable_count; i++) {
        bool of_a_file = plan->variables[i].derived == NOWHERE;
        if (of_a_file &&
            !column_is_there(cells, &plan->variables[i].place, plan->variables[i].label, names, plan_name, fault)) {
            return false;
        }
    }
    for (size_t i = 0; i < plan->event_count; i++) {
        const struct event *event = &plan->events[i];
        if ((event->date && !column_is_there(cells, &event->date_place, "an event's date", names, plan_name, fault)) ||
            (event->reason && !column_is_there(cells, &event->reason_place, "an event's reason", names, plan_name, fault))) {
            return false;
        }
    }
    return true;
}

/* Which of the files received is each of the plan's: by name where the plan gives one, else in the order given. */
static bool match_files(const struct plan *plan, struct arena *arena, const struct study_file *files, size_t count, const struct study_file **matched,
    const char *plan_name, struct fault *fault) {
    if (count != plan->file_count) {
        return fault_set(fault, FAULT_INPUT, plan->files[0].id ?
            "%s: the plan's \"files\" lists %zu, and %zu came; load all of them together" :
            "%s: the plan takes %zu file, and %zu came; list them under \"files\" in the plan, or load one", plan_name,
            plan->file_count, count);
    }
    bool *taken = ARENA_NEW(arena, count, bool);
    for (size_t f = 0; f < count; f++) { /* named ones first, so that the others take what is left */
        const char *wanted = plan->files[f].name;
        for (size_t i = 0; wanted && i < count && !matched[f]; i++) {
            bool fits = !taken[i] && strcmp(file_part(files[i].name), wanted) == 0;
            matched[f] = fits ? &files[i] : NULL;
            taken[i] = taken[i] || fits;
        }
        if (wanted && !matched[f]) {
            return fault_set(fault, FAULT_INPUT, "%s: no file named \"%.80s\" came, which the plan's file \"%s\" asks for; load it too, or mend the name",
                plan_name, wanted, plan->files[f].id);
        }
    }
    size_t next = 0;
    for (size_t f = 0; f < count; f++) {
        while (!matched[f] && taken[next]) {
            next++;
        }
        matched[f] = matched[f] ? matched[f] : &files[next++];
    }
    return true;
}

/* The day from a moment's ISO text: dates after it are in the future. */
static void note_received(struct plan *plan, const char *at) {
    if (plan->dates) {
        date_read(at, DATE_YMD, &plan->dates->received);
    }
}

/* ---- making a study ---- */

/* A random order of the arms' letters from the system's randomness (Fisher & Yates; rejection keeps it even). */
static bool draw_letters(unsigned char *letters, size_t count, struct fault *fault) {
    for (size_t i = 0; i < count; i++) {
        letters[i] = (unsigned char)i;
    }
    for (size_t i = count; i > 1; i--) {
        unsigned char byte;
        do {
            if (getrandom(&byte, 1, 0) != 1) {
                return fault_set(fault, FAULT_SYSTEM, "this system gives no random numbers, which coding the arms needs; try again");
            }
        } while (byte >= 256 / i * i);
        size_t j = byte % i;
        unsigned char swap = letters[i - 1];
        letters[i - 1] = letters[j];
        letters[j] = swap;
    }
    return true;
}

static const char *letters_text(struct arena *arena, const unsigned char *letters, size_t count) {
    char *text = ARENA_NEW(arena, count + 1, char);
    for (size_t i = 0; i < count; i++) {
        text[i] = (char)('A' + letters[i]);
    }
    return text;
}

static const char *account_name(struct arena *arena) {
    char room[4096];
    struct passwd entry, *found = NULL;
    bool known = getpwuid_r(geteuid(), &entry, room, sizeof room, &found) == 0 && found;
    return known ? arena_text(arena, entry.pw_name) : arena_format(arena, "account %u", (unsigned)geteuid());
}

struct planning { /* the first decisions on their way: codes for missing that the plan, or a file itself, declares */
    const struct plan *plan;
    struct arena *arena;
    struct decision *decisions;
    size_t count, room;
};

static void plan_code(struct planning *planning, const char *column, const char *code, const char *reason) {
    for (size_t i = 0; i < planning->count; i++) {
        if (strcmp(planning->decisions[i].column, column) == 0 && strcmp(planning->decisions[i].value, code) == 0) {
            return; /* at another visit of the same column, or by the plan already */
        }
    }
    if (planning->count == planning->room) {
        planning->room = planning->room ? planning->room * 2 : 32;
        struct decision *grown = ARENA_NEW(planning->arena, planning->room, struct decision);
        if (planning->count) {
            memcpy(grown, planning->decisions, planning->count * sizeof *grown);
        }
        planning->decisions = grown;
    }
    struct text body;
    text_init(&body);
    struct json json;
    json_init(&json, &body);
    json_object(&json);
    json_field_string(&json, "value", code);
    json_field_bool(&json, "planned", true);
    json_close(&json);
    struct decision *decision = &planning->decisions[planning->count++];
    *decision = (struct decision){.number = (uint32_t)planning->count, .kind = DECISION_MISSING_CODE, .column = column, .value = code,
        .reason = reason, .planned = true, .body = arena_text(planning->arena, body.data)};
    text_release(&body);
}

/* Whether every column of the same place at another visit has the same codes: they are then entered once for all. */
static bool codes_shared(const struct plan *plan, const struct variable *variable) {
    const struct texts *codes = variable->missing_codes;
    for (size_t v = 0; v < plan->variable_count; v++) {
        const struct variable *other = &plan->variables[v];
        bool alike = other->missing_codes->count == codes->count;
        for (size_t c = 0; alike && c < codes->count; c++) {
            alike = strcmp(other->missing_codes->item[c], codes->item[c]) == 0;
        }
        if (!alike && other->place.file == variable->place.file && strcmp(other->place.column, variable->place.column) == 0) {
            return false;
        }
    }
    return true;
}

/* One for each column and code; a column of a file with one row per visit once for all its visits. */
static size_t planned_decisions(const struct plan *plan, const struct cells *cells, struct arena *arena, struct decision **decisions) {
    struct planning planning = {plan, arena, NULL, 0, 0};
    for (size_t v = 0; v < plan->variable_count; v++) {
        const struct variable *variable = &plan->variables[v];
        if (variable->derived != NOWHERE) {
            continue;
        }
        const struct cells *file = &cells[variable->place.file];
        const char *column = plan_column_name(arena, plan, variable->place.file, variable->place.column);
        for (size_t c = 0; c < variable->missing_codes->count; c++) {
            plan_code(&planning, codes_shared(plan, variable) ? column : variable->column, variable->missing_codes->item[c],
                "The plan lists it as a code for missing.");
        }
        const struct cell_about *about = file->about ? &file->about[cells_column(file, variable->place.column)] : NULL;
        for (size_t c = 0; about && c < about->missing_count; c++) {
            plan_code(&planning, column, about->missing[c], "The file itself declares it as a code for missing.");
        }
    }
    *decisions = planning.decisions;
    return planning.count;
}

static void to_stored(const struct decision *decision, struct stored_decision *stored) {
    *stored = (struct stored_decision){.number = decision->number, .at = decision->at, .by = decision->by,
        .account = decision->account, .kind = decision_rules[decision->kind].name, .participant = decision->participant,
        .column = decision->column, .from = decision->from, .to = decision->to, .reason = decision->reason,
        .evidence = decision->evidence, .discrepancy = decision->discrepancy, .blinding = decision->blinding,
        .body = decision->body, .state_sha256 = decision->state};
}

static void tell_file(struct text *account, const char *name, const struct cells *cells) {
    text_format(account, "%s: %zu records of %zu columns, %s%s%s%s.%s%s\n", name, cells->records, cells->columns, cells->encoding,
        cells->delimiter ? ", delimiter " : "", cells->delimiter ? cells->delimiter_word : "",
        cells->byte_order_mark ? ", byte order mark" : "", *cells->notes ? " " : "", cells->notes);
}

static void tell_join(struct text *account, const struct frame *frame, size_t f) {
    const struct join *join = &frame->joins[f];
    if (frame->plan->files[f].window) {
        text_format(account, "%s: visits found by date: %zu records in a window, %zu of them farther from the target day than another, %zu ties "
            "(the later was taken), %zu outside every window, %zu without a date to count from; %zu of participants the first file does not "
            "have, %zu without an identifier; %zu visits with several records of one day, held aside.\n", frame->plan->files[f].id,
            join->matched, join->farther, join->ties, join->unplanned, join->undated, join->unmatched, join->blank, join->doubled);
        return;
    }
    text_format(account, "%s: %zu records joined, %zu of participants the first file does not have, %zu of visits never planned, %zu without an "
        "identifier; %zu participants and visits with several records, held aside.\n", frame->plan->files[f].id, join->matched,
        join->unmatched, join->unplanned, join->blank, join->doubled);
}

static void tell_account(struct text *account, const char *const *names, const struct frame *frame, size_t planned) {
    const struct plan *plan = frame->plan;
    size_t repeated = 0;
    for (size_t p = 0; p < frame->participant_count; p++) {
        repeated += frame->participants[p].record_count > 1;
    }
    for (size_t f = 0; f < plan->file_count; f++) {
        tell_file(account, names[f], &frame->cells[f]);
    }
    text_format(account, "%zu participant%s; %zu repeated, %zu records held aside until a decision says which stands.\n",
        frame->participant_count, frame->participant_count == 1 ? "" : "s", repeated, frame->held_aside);
    for (size_t f = plan->files[0].by_visit ? 0 : 1; f < plan->file_count; f++) {
        tell_join(account, frame, f);
    }
    size_t meant = plan->variable_count + 1 + (plan->arm_column != NULL);
    text_format(account, "%zu column%s a meaning in the plan; %zu code%s for missing entered from it.\n", meant,
        meant == 1 ? " has" : "s have", planned, planned == 1 ? "" : "s");
    struct arena arena;
    arena_init(&arena);
    struct discrepancies found;
    checks_run(frame, frame, &arena, &found);
    text_format(account, "%zu discrepanc%s to settle, blinding %s.\n", found.open, found.open == 1 ? "y" : "ies", blinding_name(frame->blinding));
    arena_release(&arena);
}

struct birth { /* everything on the way to a new study */
    struct arena arena;
    struct plan plan;
    const struct study_file **files; /* [plan.file_count] in the plan's order */
    const char **names;
    struct cells *cells;
    struct decision *planned;
    struct stored_decision *stored;
    size_t count; /* of both */
    unsigned char letters[32];
    struct text *account; /* may be NULL */
    /* The frame and the account are made on a thread of their own while the store writes cells. */
    pthread_t thread;
    bool running;
    struct frame *frame;
    struct fault frame_fault;
};

static bool read_files(struct birth *birth, struct fault *fault) {
    for (size_t f = 0; f < birth->plan.file_count; f++) {
        birth->names[f] = file_part(birth->files[f]->name);
        if (!read_cells(&birth->cells[f], birth->files[f]->bytes, birth->files[f]->length, birth->names[f], birth->plan.files[f].sheet, fault)) {
            return false;
        }
    }
    return true;
}

static void *make_frame(void *context) {
    struct birth *birth = context;
    birth->frame = frame_build(&birth->plan, birth->cells, "", birth->letters, birth->planned, birth->count, NULL, false, &birth->frame_fault);
    if (birth->frame && birth->account) {
        tell_account(birth->account, birth->names, birth->frame, birth->count);
    }
    return NULL;
}

static void await_frame(struct birth *birth) {
    if (birth->running) {
        pthread_join(birth->thread, NULL);
        birth->running = false;
    }
}

/* For the store, before it enters the record. */
static bool settle_states(void *context) {
    struct birth *birth = context;
    await_frame(birth);
    for (size_t i = 0; birth->frame && i < birth->count; i++) {
        birth->stored[i].state_sha256 = birth->frame->state_sha256;
    }
    return birth->frame != NULL;
}

static void plan_decisions(struct birth *birth, const char *by, const char *at) {
    birth->count = planned_decisions(&birth->plan, birth->cells, &birth->arena, &birth->planned);
    birth->stored = ARENA_NEW(&birth->arena, birth->count, struct stored_decision);
    const char *account = account_name(&birth->arena);
    for (size_t i = 0; i < birth->count; i++) {
        birth->planned[i].at = at;
        birth->planned[i].by = by;
        birth->planned[i].account = account;
        birth->planned[i].blinding = blinding_name(birth->plan.blinding);
        to_stored(&birth->planned[i], &birth->stored[i]);
    }
}

static bool write_birth(struct birth *birth, const char *path, const char *plan_text, const char *by, struct fault *fault) {
    char at[CLOCK_SIZE];
    clock_utc(at);
    if (!draw_letters(birth->letters, birth->plan.arm_count, fault)) {
        return false;
    }
    note_received(&birth->plan, at);
    plan_decisions(birth, by, at);
    size_t files = birth->plan.file_count;
    struct store_file *received = ARENA_NEW(&birth->arena, files, struct store_file);
    struct store_table *tables = ARENA_NEW(&birth->arena, files, struct store_table);
    for (size_t f = 0; f < files; f++) {
        const struct cells *cells = &birth->cells[f];
        received[f] = (struct store_file){.name = birth->names[f], .bytes = birth->files[f]->bytes, .length = birth->files[f]->length};
        tables[f] = (struct store_table){cells->records, cells->columns, cells->names, cells->bytes, cells->start};
    }
    struct store_value values[] = {{"letters", letters_text(&birth->arena, birth->letters, birth->plan.arm_count)},
        {"program", "Evenhand " EVENHAND_VERSION}};
    struct store_birth store = {.files = received, .tables = tables, .file_count = files, .plan = plan_text, .values = values,
        .value_count = 2, .by = by, .at = at, .decisions = birth->stored, .decision_count = birth->count, .settle = settle_states,
        .context = birth};
    fault_init(&birth->frame_fault);
    birth->running = pthread_create(&birth->thread, NULL, make_frame, birth) == 0;
    if (!birth->running) {
        make_frame(birth);
    }
    bool done = store_create(path, &store, fault);
    await_frame(birth);
    if (!birth->frame) {
        *fault = birth->frame_fault;
    }
    return done;
}

bool study_create_from(const char *path, const struct study_file *files, size_t count, const char *plan_name, const char *plan,
    size_t plan_length, const char *by, struct text *account, struct fault *fault) {
    struct birth birth = {.account = account};
    if (!by || !by[strspn(by, " \t")]) {
        return fault_set(fault, FAULT_INPUT, "say who is loading, by name and role, such as --by \"A. Reader, data manager\"");
    }
    plan_name = file_part(plan_name);
    arena_init(&birth.arena);
    const char *plan_text = arena_bytes(&birth.arena, plan, plan_length);
    bool done = plan_read(&birth.plan, plan, plan_length, plan_name, fault);
    if (done) {
        birth.files = ARENA_NEW(&birth.arena, birth.plan.file_count, const struct study_file *);
        birth.names = ARENA_NEW(&birth.arena, birth.plan.file_count, const char *);
        birth.cells = ARENA_NEW(&birth.arena, birth.plan.file_count, struct cells);
        done = match_files(&birth.plan, &birth.arena, files, count, birth.files, plan_name, fault) && read_files(&birth, fault) &&
               plan_fits(&birth.plan, birth.cells, birth.names, plan_name, fault) &&
               write_birth(&birth, path, plan_text, by, fault);
    }
    frame_release(birth.frame);
    for (size_t f = 0; birth.cells && f < birth.plan.file_count; f++) {
        cells_release(&birth.cells[f]);
    }
    plan_release(&birth.plan);
    arena_release(&birth.arena);
    return done;
}

bool study_create(const char *path, const char *data_name, const char *data, size_t data_length, const char *plan_name,
    const char *plan, size_t plan_length, const char *by, struct text *account, struct fault *fault) {
    struct study_file file = {data_name, data, data_length};
    return study_create_from(path, &file, 1, plan_name, plan, plan_length, by, account, fault);
}

/* ---- opening ---- */

static struct decision *record_push(struct record *record) {
    if (record->count == record->capacity) {
        record->capacity = record->capacity ? record->capacity * 2 : 64;
        record->decisions = memory_grow(record->decisions, record->capacity, sizeof *record->decisions);
    }
    return &record->decisions[record->count++];
}

/* Takes decisions that the file has and the record has not. */
static bool take_decisions(struct study *study, struct fault *fault) {
    struct stored_decision *stored = NULL;
    size_t count = 0;
    if (!store_decisions(study->store, &study->record.arena, (uint32_t)study->record.count, &stored, &count, fault)) {
        return false;
    }
    for (size_t i = 0; i < count; i++) {
        int kind = decision_kind_of(stored[i].kind);
        if (kind == NOWHERE) {
            return fault_set(fault, FAULT_INPUT, "%s: decision %u is of the kind \"%.40s\", which this version does not know; use a newer one",
                store_path(study->store), stored[i].number, stored[i].kind);
        }
        struct decision *decision = record_push(&study->record);
        *decision = (struct decision){.number = stored[i].number, .kind = (enum decision_kind)kind, .at = stored[i].at,
            .by = stored[i].by, .account = stored[i].account, .participant = stored[i].participant, .column = stored[i].column,
            .from = stored[i].from, .to = stored[i].to, .reason = stored[i].reason, .evidence = stored[i].evidence,
            .discrepancy = stored[i].discrepancy, .blinding = stored[i].blinding, .body = stored[i].body,
            .state = stored[i].state_sha256, .hash = arena_text(&study->record.arena, stored[i].hash)};
        if (!decision_unpack(&study->record.arena, decision, fault)) {
            return false;
        }
    }
    return true;
}

static size_t planned_count(const struct record *record) {
    size_t count = 0;
    while (count < record->count && record->decisions[count].planned) {
        count++;
    }
    return count;
}

/* With the mutex held: the plan that a text makes, read once. */
static const struct plan *plan_of_text(struct study *study, const char *text, struct fault *fault) {
    for (const struct amended *known = study->amended; known; known = known->next) {
        if (strcmp(known->text, text) == 0) {
            return &known->plan;
        }
    }
    struct amended *made = memory_new(1, sizeof *made);
    if (!plan_read(&made->plan, text, strlen(text), "the amended plan", fault)) {
        memory_free(made);
        return NULL;
    }
    note_received(&made->plan, study->facts.received_at);
    if (!plan_fits(&made->plan, study->cells, study->names, "the amended plan", fault)) {
        plan_release(&made->plan);
        memory_free(made);
        return NULL;
    }
    made->text = arena_text(&study->arena, text);
    hash_of(text, strlen(text), made->fingerprint);
    made->plan.amended = made->fingerprint;
    made->next = study->amended;
    study->amended = made;
    return &made->plan;
}

/* With the mutex held: the plan in force after `count` decisions, of which those from new_from on are new. */
static const struct plan *plan_at(struct study *study, size_t count, size_t new_from, struct fault *fault) {
    struct arena scratch;
    arena_init(&scratch);
    bool *stands = ARENA_NEW(&scratch, count ? count : 1, bool);
    record_standing(study->record.decisions, count, stands);
    const struct plan *plan = &study->plan;
    if (amend_any(study->record.decisions, stands, count)) {
        const char *text = NULL;
        bool blinded = study->frame && study->frame->blinding != BLINDING_UNBLINDED;
        bool fits = amend_plan(study->plan_text, study->record.decisions, stands, count, new_from, blinded, &study->record.arena, &text, fault);
        plan = fits ? plan_of_text(study, text, fault) : NULL;
    }
    arena_release(&scratch);
    return plan;
}

static struct frame *build(struct study *study, size_t count, struct frame *previous, struct fault *fault) {
    const struct plan *plan = plan_at(study, count, count, fault);
    return !plan ? NULL : frame_build(plan, study->cells, study->facts.data_sha256, study->letters, study->record.decisions, count,
        previous, false, fault);
}

static bool take_letters(struct study *study, struct fault *fault) {
    const char *letters = NULL;
    if (!store_value(study->store, &study->arena, "letters", &letters, fault)) {
        return false;
    }
    size_t count = study->plan.arm_count;
    bool fits = letters && strlen(letters) == count;
    for (size_t i = 0; fits && i < count; i++) {
        fits = letters[i] >= 'A' && letters[i] < 'A' + (int)count;
        study->letters[i] = (unsigned char)(letters[i] - 'A');
    }
    return fits || fault_set(fault, FAULT_INPUT, "%s: the letters of the arms cannot be read; ask for an earlier copy of the file",
                       store_path(study->store));
}

/* The fingerprint of several files is that of the list of their fingerprints. */
static const char *fingerprint(struct study *study, const struct store_file *files, size_t count) {
    if (count == 1) {
        return arena_text(&study->arena, files[0].sha256);
    }
    struct hash hash;
    hash_init(&hash);
    for (size_t f = 0; f < count; f++) {
        hash_field(&hash, files[f].sha256);
    }
    char digits[HASH_SIZE];
    hash_finish(&hash, digits);
    return arena_text(&study->arena, digits);
}

static void take_facts(struct study *study, const struct store_file *files, size_t count) {
    struct study_facts *facts = &study->facts;
    struct text names;
    text_init(&names);
    facts->files = ARENA_NEW(&study->arena, count, struct study_file_facts);
    facts->file_count = count;
    for (size_t f = 0; f < count; f++) {
        const struct cells *cells = &study->cells[f];
        text_format(&names, "%s%s", f ? ", " : "", files[f].name);
        facts->files[f] = (struct study_file_facts){study->plan.files[f].id, arena_text(&study->arena, files[f].name),
            arena_text(&study->arena, files[f].sha256), cells->encoding, cells->delimiter_word, files[f].length, cells->records,
            cells->columns};
        facts->data_length += files[f].length;
    }
    facts->data_name = arena_text(&study->arena, names.data);
    facts->received_at = arena_text(&study->arena, files[0].at);
    facts->data_sha256 = fingerprint(study, files, count);
    facts->encoding = study->cells[0].encoding;
    facts->delimiter = study->cells[0].delimiter_word;
    text_release(&names);
}

static bool take_files(struct study *study, struct fault *fault) {
    struct arena scratch;
    arena_init(&scratch);
    struct store_file *files = NULL;
    size_t count = 0;
    bool done = store_plan(study->store, &study->arena, &study->plan_text, fault) &&
                plan_read(&study->plan, study->plan_text, strlen(study->plan_text), "the study's plan", fault) &&
                store_files(study->store, &scratch, &files, &count, fault);
    if (done && count != study->plan.file_count) {
        done = fault_set(fault, FAULT_INPUT, "%s: it holds %zu files where its plan has %zu; ask for an earlier copy of the file",
            store_path(study->store), count, study->plan.file_count);
    }
    const char **names = study->names = ARENA_NEW(&study->arena, count ? count : 1, const char *);
    study->cells = ARENA_NEW(&study->arena, count ? count : 1, struct cells);
    for (size_t f = 0; done && f < count; f++) {
        struct arena bytes;
        arena_init(&bytes);
        struct store_file file = {0};
        names[f] = arena_text(&study->arena, files[f].name);
        done = store_received(study->store, &bytes, files[f].number, &file, fault) &&
               read_cells(&study->cells[f], file.bytes, file.length, names[f], study->plan.files[f].sheet, fault);
        arena_release(&bytes);
    }
    if (done) {
        take_facts(study, files, count);
        note_received(&study->plan, study->facts.received_at);
    }
    arena_release(&scratch);
    return done && plan_fits(&study->plan, study->cells, names, "the study's plan", fault);
}

struct study *study_open(const char *path, struct fault *fault) {
    struct study *study = memory_new(1, sizeof *study);
    pthread_mutex_init(&study->mutex, NULL);
    arena_init(&study->arena);
    arena_init(&study->record.arena);
    study->store = store_open(path, false, fault);
    const char *zero = NULL;
    bool done = study->store && take_files(study, fault) && take_letters(study, fault) && take_decisions(study, fault) &&
                store_value(study->store, &study->arena, "entry_zero", &zero, fault);
    if (done) {
        snprintf(study->entry_zero, sizeof study->entry_zero, "%s", zero ? zero : "");
        study->received = build(study, planned_count(&study->record), NULL, fault);
        study->frame = study->received ? build(study, study->record.count, study->received, fault) : NULL;
    }
    if (!study->frame) {
        study_close(study);
        return NULL;
    }
    return study;
}

void study_close(struct study *study) {
    if (!study) {
        return;
    }
    frame_release(study->frame);
    frame_release(study->received);
    store_close(study->store);
    for (size_t f = 0; study->cells && f < study->plan.file_count; f++) {
        cells_release(&study->cells[f]);
    }
    plan_release(&study->plan);
    while (study->amended) {
        struct amended *next = study->amended->next;
        plan_release(&study->amended->plan);
        memory_free(study->amended);
        study->amended = next;
    }
    memory_free(study->record.decisions);
    arena_release(&study->record.arena);
    arena_release(&study->arena);
    pthread_mutex_destroy(&study->mutex);
    memory_free(study);
}

const char *study_path(const struct study *study) {
    return store_path(study->store);
}

const struct plan *study_plan(const struct study *study) {
    return &study->plan;
}

/* With the mutex held: brings the frame to the file's last decision, where another process has decided. */
static bool refresh(struct study *study, struct fault *fault) {
    if (!store_changed(study->store)) {
        return true;
    }
    if (!take_decisions(study, fault)) {
        return false;
    }
    if (study->record.count == study->frame->version) {
        return true;
    }
    struct frame *next = build(study, study->record.count, study->frame, fault);
    if (next) {
        frame_release(study->frame);
        study->frame = next;
    }
    return next != NULL;
}

struct frame *study_frame(struct study *study, struct fault *fault) {
    pthread_mutex_lock(&study->mutex);
    struct frame *frame = refresh(study, fault) ? frame_retain(study->frame) : NULL;
    pthread_mutex_unlock(&study->mutex);
    return frame;
}

struct frame *study_received_frame(struct study *study) {
    return frame_retain(study->received);
}

/* ---- deciding ---- */

static void push(struct study *study, const struct decision *from, const char *by, const char *at, const char *account) {
    struct arena *arena = &study->record.arena;
    struct decision *decision = record_push(&study->record);
    *decision = *from;
    decision->number = (uint32_t)study->record.count;
    decision->at = arena_text(arena, at);
    decision->by = arena_text(arena, by);
    decision->account = account;
    decision->blinding = blinding_name(study->frame->blinding);
}

/* Columns that an amendment gives a meaning for the first time get their codes for missing entered, as at load. */
static void push_codes(struct study *study, const struct plan *plan, const char *by, const char *at, const char *account) {
    struct decision *planned = NULL;
    size_t count = planned_decisions(plan, study->cells, &study->record.arena, &planned);
    for (size_t i = 0; i < count; i++) {
        bool known = false;
        for (size_t v = 0; v < study->frame->plan->variable_count && !known; v++) {
            known = plan_covers(planned[i].column, study->frame->plan->variables[v].column);
        }
        for (size_t d = 0; d < study->record.count && !known; d++) {
            const struct decision *decision = &study->record.decisions[d];
            known = decision->kind == DECISION_MISSING_CODE && strcmp(decision->column, planned[i].column) == 0 &&
                    strcmp(decision->value, planned[i].value) == 0;
        }
        if (!known) {
            push(study, &planned[i], by, at, account);
        }
    }
}

/* A plan that amendments, or a reversal, have made unreadable: the first that is new is named. */
static bool refuse_plan(const struct study *study, size_t before, struct fault *why, struct fault *fault) {
    size_t i = before;
    while (i + 1 < study->record.count && study->record.decisions[i].kind != DECISION_AMEND_PLAN &&
           study->record.decisions[i].kind != DECISION_REVERSE) {
        i++;
    }
    if (why->row) { /* refused for itself */
        *fault = *why;
        return false;
    }
    return fault_at(fault, why->code, i + 1 - before, 0, "decision %zu of the batch (%s) cannot be: %s; nothing was recorded", i + 1 - before,
        decision_rules[study->record.decisions[i].kind].name, why->message);
}

/* The next frame of a batch that stands at the end of the record. */
static struct frame *frame_of_batch(struct study *study, size_t before, const char *by, const char *at, const char *account,
    struct fault *fault) {
    struct fault why;
    fault_init(&why);
    const struct plan *plan = plan_at(study, study->record.count, before, &why);
    if (!plan) {
        refuse_plan(study, before, &why, fault);
        return NULL;
    }
    if (plan != study->frame->plan) {
        push_codes(study, plan, by, at, account);
    }
    return frame_build(plan, study->cells, study->facts.data_sha256, study->letters, study->record.decisions, study->record.count,
        study->frame, true, fault);
}

/* With the mutex held: one try at recording a batch that has been read. */
static bool append(struct study *study, const char *by, struct decision *batch, size_t count, struct fault *fault) {
    struct arena *arena = &study->record.arena;
    size_t before = study->record.count;
    const char *account = account_name(arena);
    char at[CLOCK_SIZE];
    clock_utc(at);
    for (size_t i = 0; i < count; i++) {
        push(study, &batch[i], by, at, account);
    }
    struct frame *next = frame_of_batch(study, before, by, at, account, fault);
    count = study->record.count - before;
    bool done = next != NULL;
    if (done) {
        struct stored_decision *stored = ARENA_NEW(arena, count, struct stored_decision);
        for (size_t i = 0; i < count; i++) {
            struct decision *decision = &study->record.decisions[before + i];
            decision->state = arena_text(arena, next->state_sha256);
            to_stored(decision, &stored[i]);
        }
        done = store_append(study->store, arena, (uint32_t)before, stored, count, fault);
        for (size_t i = 0; done && i < count; i++) {
            study->record.decisions[before + i].hash = stored[i].hash;
            next->decisions[before + i] = study->record.decisions[before + i]; /* not shared yet */
        }
    }
    if (done) {
        frame_release(study->frame);
        study->frame = next;
    } else {
        frame_release(next);
        study->record.count = before;
    }
    return done;
}

static bool decide(struct study *study, const char *by, struct decision *batch, size_t count, uint32_t version_seen,
    struct fault *fault) {
    enum { TRIES = 3 };
    for (int attempt = 0; attempt < TRIES; attempt++) {
        if (!refresh(study, fault)) {
            return false;
        }
        if (version_seen != ANY_VERSION && version_seen != study->frame->version) {
            return fault_set(fault, FAULT_CONFLICT, "the study has moved on: it is after decision %u, and this page last saw %u; look at what "
                "happened meanwhile and decide again", study->frame->version, version_seen);
        }
        struct fault tried;
        fault_init(&tried);
        if (append(study, by, batch, count, &tried)) {
            return true;
        }
        /* Another process was quicker by a moment: see what it did and try once more. */
        if (tried.code != FAULT_CONFLICT || attempt + 1 == TRIES) {
            *fault = tried;
            return false;
        }
        if (!take_decisions(study, fault)) {
            return false;
        }
        struct frame *next = build(study, study->record.count, study->frame, fault);
        if (!next) {
            return false;
        }
        frame_release(study->frame);
        study->frame = next;
    }
    return false;
}

bool study_decide(struct study *study, const char *by, const char *json, size_t length, const char *name,
    uint32_t version_seen, uint32_t *version, struct fault *fault) {
    if (!by || !by[strspn(by, " \t")]) {
        return fault_set(fault, FAULT_INPUT, "say who is deciding, by name and role, such as \"A. Reader, data manager\"");
    }
    pthread_mutex_lock(&study->mutex);
    struct decision *batch = NULL;
    size_t count = 0;
    uint32_t said = ANY_VERSION;
    bool done = decisions_read(&study->record.arena, json, length, name, &batch, &count, &said, fault) &&
                decide(study, by, batch, count, version_seen != ANY_VERSION ? version_seen : said, fault);
    if (version) {
        *version = study->frame->version;
    }
    pthread_mutex_unlock(&study->mutex);
    return done;
}

bool study_look(struct study *study, const struct frame *frame, const char *exhibit, const char *arguments, const char *by,
    struct fault *fault) {
    pthread_mutex_lock(&study->mutex);
    bool done = false;
    for (const struct look *look = study->looks; look && !done; look = look->next) {
        done = look->version == frame->version && strcmp(look->exhibit, exhibit) == 0 &&
               strcmp(look->arguments, arguments) == 0 && strcmp(look->by, by) == 0;
    }
    if (!done) {
        struct stored_look stored = {.by = by, .exhibit = exhibit, .arguments = arguments, .version = frame->version};
        done = store_append_look(study->store, &study->arena, &stored, fault);
        struct look *look = ARENA_NEW(&study->arena, 1, struct look);
        *look = (struct look){study->looks, arena_text(&study->arena, exhibit), arena_text(&study->arena, arguments),
            arena_text(&study->arena, by), frame->version};
        study->looks = done ? look : study->looks;
    }
    pthread_mutex_unlock(&study->mutex);
    return done;
}

void study_facts(struct study *study, struct study_facts *facts) {
    *facts = study->facts;
}

const struct plan *study_plan_at(struct study *study, uint32_t version, struct fault *fault) {
    pthread_mutex_lock(&study->mutex);
    size_t count = version < study->record.count ? version : study->record.count;
    const struct plan *plan = plan_at(study, count, count, fault);
    pthread_mutex_unlock(&study->mutex);
    return plan;
}

void study_head(struct study *study, uint32_t version, char head[HASH_SIZE]) {
    pthread_mutex_lock(&study->mutex);
    bool there = version > 0 && version <= study->record.count;
    snprintf(head, HASH_SIZE, "%s", there ? study->record.decisions[version - 1].hash : study->entry_zero);
    pthread_mutex_unlock(&study->mutex);
}
