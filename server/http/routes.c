/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "http/routes.h"
#include "base/hash.h"
#include "exhibits/registry.h"
#include "server/http/guards.h"
#include "intake/read.h"
#include "trial/guess.h"
#include <cjson/cJSON.h>
#include <dirent.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>
#include <unistr.h>

#define ONE_MB (UINT64_C(1) << 20)

/* ---- the page and its files ---- */

static const char *content_type(const char *path) {
    static const struct pair types[] = {{".html", "text/html; charset=utf-8"},
        {".js", "text/javascript; charset=utf-8"}, {".css", "text/css; charset=utf-8"}, {".svg", "image/svg+xml"},
        {".json", "application/json"}, {".png", "image/png"}, {".ico", "image/x-icon"},
        {".txt", "text/plain; charset=utf-8"}};
    const char *ending = strrchr(path, '.');
    for (size_t i = 0; ending && i < sizeof types / sizeof *types; i++) {
        if (strcmp(types[i].name, ending) == 0) {
            return types[i].value;
        }
    }
    return "application/octet-stream";
}

static void answer_asset(const struct web_asset *asset, const struct request *request, struct reply *reply) {
    char digits[HASH_SIZE], tag[36];
    hash_of(asset->bytes, asset->length, digits);
    snprintf(tag, sizeof tag, "\"%.32s\"", digits);
    reply_header(reply, "ETag", tag);
    reply_header(reply, "Cache-Control", "no-cache");
    reply->content_type = content_type(asset->path);
    if (request->if_none_match && strstr(request->if_none_match, tag)) {
        reply->status = 304;
    } else {
        text_append(&reply->body, (const char *)asset->bytes, asset->length);
    }
}

/* ---- the folder ---- */

static int by_name(const void *left, const void *right) {
    return strcmp(*(const char *const *)left, *(const char *const *)right);
}

static bool study_name(const char *file) {
    size_t length = strlen(file);
    return length > strlen(".study") && length <= 200 && file[0] != '.' && !strpbrk(file, "/\\") &&
           strcmp(file + length - strlen(".study"), ".study") == 0;
}

static const char *in_folder(struct server_state *state, const char *file, struct arena *arena) {
    return arena_format(arena, "%s/%s", state->folder, file);
}

/* The folder's studies, sorted by name. */
static void studies(struct server_state *state, struct arena *arena, struct json *json) {
    const char **names = NULL;
    size_t count = 0;
    DIR *folder = opendir(state->folder);
    for (struct dirent *entry; folder && (entry = readdir(folder));) {
        struct stat status;
        if (study_name(entry->d_name) && !u8_check((const uint8_t *)entry->d_name, strlen(entry->d_name)) &&
            stat(in_folder(state, entry->d_name, arena), &status) == 0 && S_ISREG(status.st_mode)) {
            names = memory_grow(names, count + 1, sizeof *names);
            names[count++] = arena_text(arena, entry->d_name);
        }
    }
    if (folder) {
        closedir(folder);
    }
    if (count) {
        qsort(names, count, sizeof *names, by_name);
    }
    json_key_array(json, "studies");
    for (size_t i = 0; i < count; i++) {
        json_string(json, names[i]);
    }
    json_close(json);
    memory_free(names);
}

/* ---- agenda and exhibits ---- */

static void nothing_open(struct server_state *state, struct reply *reply) {
    struct json json;
    json_init(&json, &reply->body);
    json_object(&json);
    json_field_null(&json, "study");
    char *whole = realpath(state->folder, NULL);
    json_field_string(&json, "folder", whole ? whole : state->folder);
    free(whole);
    studies(state, &reply->arena, &json);
    json_close(&json);
    json_finish(&json);
}

static void answer_agenda(struct server_state *state, const struct request *request, struct reply *reply) {
    (void)request;
    struct fault fault;
    fault_init(&fault);
    reply->content_type = "application/json";
    pthread_rwlock_rdlock(&state->study_lock);
    if (!state->study) {
        nothing_open(state, reply);
    } else if (!agenda_json(state->study, &reply->arena, &reply->body, &fault)) {
        reply_fault(reply, &fault);
    }
    pthread_rwlock_unlock(&state->study_lock);
}

enum rendering { AS_HTML, AS_JSON, AS_CSV, AS_SVG };
static const struct {
    const char *ending, *type;
    enum rendering rendering;
    bool meeting, to_keep;
} renderings[] = {
    {".json", "application/json", AS_JSON, false, false},
    {".csv", "text/csv; charset=utf-8", AS_CSV, false, true},
    {".svg", "image/svg+xml", AS_SVG, true, true},
    {"", "text/html; charset=utf-8", AS_HTML, true, false},
};

static size_t rendering_of(const char *name) {
    size_t i = 0;
    for (size_t length = strlen(name); *renderings[i].ending; i++) {
        size_t ending = strlen(renderings[i].ending);
        if (length > ending && strcmp(name + length - ending, renderings[i].ending) == 0) {
            break;
        }
    }
    return i;
}

static void render(const struct view *view, size_t kind, bool meeting, struct reply *reply) {
    bool done = true;
    switch (renderings[kind].rendering) {
    case AS_HTML:
        view_html(view, meeting, &reply->body);
        break;
    case AS_JSON:
        view_json(view, &reply->body);
        break;
    case AS_CSV:
        view_csv(view, &reply->body);
        break;
    case AS_SVG:
        done = view_svg(view, meeting, &reply->body);
        break;
    }
    if (!done) {
        reply_refuse(reply, 404, "the exhibit %s is a table without a figure; ask for its .csv", view->exhibit->name);
        return;
    }
    reply->content_type = renderings[kind].type;
    if (renderings[kind].to_keep) {
        reply_header(reply, "Content-Disposition",
            arena_format(&reply->arena, "attachment; filename=\"%s-after-decision-%u%s\"", view->exhibit->name,
                view->frame->version, renderings[kind].ending));
    }
}

/* Takes "meeting" out of the arguments where the rendering knows it; the rest is the exhibit's business. */
static bool arguments_of(const struct request *request, size_t kind, struct arena *arena, struct asked **asked,
    size_t *count, bool *meeting, struct fault *fault) {
    *asked = ARENA_NEW(arena, request->query_count + 1, struct asked);
    *count = 0;
    *meeting = false;
    for (size_t i = 0; i < request->query_count; i++) {
        const struct pair *pair = &request->query[i];
        if (renderings[kind].meeting && strcmp(pair->name, "meeting") == 0) {
            if (strcmp(pair->value, "1") != 0) {
                return fault_set(
                    fault, FAULT_INPUT, "meeting=%.40s is not known; the meeting view is meeting=1", pair->value);
            }
            *meeting = true;
        } else {
            (*asked)[(*count)++] = (struct asked){pair->name, pair->value};
        }
    }
    return true;
}

static bool no_study(struct fault *fault) {
    return fault_set(fault, FAULT_MISSING, "no study is open; open or make one on the first page");
}

static bool exhibit_with(
    struct server_state *state, const struct request *request, struct reply *reply, struct fault *fault) {
    if (!state->study) {
        return no_study(fault);
    }
    const char *last = request->path + strlen("/exhibit/");
    size_t kind = rendering_of(last), count;
    const char *name = arena_bytes(&reply->arena, last, strlen(last) - strlen(renderings[kind].ending));
    struct asked *asked;
    bool meeting;
    if (!arguments_of(request, kind, &reply->arena, &asked, &count, &meeting, fault)) {
        return false;
    }
    char by[BY_SIZE];
    struct view view;
    if (!view_make(
            &view, state->study, name, asked, count, session_who(state, request->cookie, by), &reply->arena, fault)) {
        return false;
    }
    render(&view, kind, meeting, reply);
    view_release(&view);
    return true;
}

static void answer_exhibit(struct server_state *state, const struct request *request, struct reply *reply) {
    struct fault fault;
    fault_init(&fault);
    pthread_rwlock_rdlock(&state->study_lock);
    if (!exhibit_with(state, request, reply, &fault)) {
        reply_fault(reply, &fault);
    }
    pthread_rwlock_unlock(&state->study_lock);
}

/* ---- what changes something ---- */

/* The body as a JSON object; the caller deletes it. */
static cJSON *body_object(const struct request *request, struct fault *fault) {
    size_t length = (size_t)request->body_length;
    if (!request->body || length == 0) {
        fault_set(fault, FAULT_INPUT, "the request has no body; it must be a JSON object");
        return NULL;
    }
    if (memchr(request->body, 0, length) || u8_check((const uint8_t *)request->body, length)) {
        fault_set(fault, FAULT_INPUT, "the request's body is not UTF-8 text");
        return NULL;
    }
    const char *end = request->body;
    cJSON *object = cJSON_ParseWithOpts(request->body, &end, 1);
    if (!object) {
        size_t line = 1, column = 1;
        for (const char *p = request->body; p < end; p++) {
            column = *p == '\n' ? 1 : column + 1;
            line += *p == '\n';
        }
        fault_at(fault, FAULT_INPUT, line, column, "the request's body is not JSON from line %zu, column %zu on", line,
            column);
        return NULL;
    }
    if (!cJSON_IsObject(object)) {
        fault_set(fault, FAULT_INPUT, "the request's body must be a JSON object in braces");
        cJSON_Delete(object);
        return NULL;
    }
    return object;
}

static bool only_keys(const cJSON *object, const char *known, struct fault *fault) {
    for (const cJSON *child = object->child; child; child = child->next) {
        size_t length = strlen(child->string);
        bool found = false;
        for (const char *word = known; *word && !found; word += strcspn(word, " "), word += *word == ' ') {
            found = strcspn(word, " ") == length && memcmp(word, child->string, length) == 0;
        }
        if (!found) {
            return fault_set(fault, FAULT_INPUT, "\"%.60s\" is not known here; known are: %s", child->string, known);
        }
        if (cJSON_GetObjectItemCaseSensitive(object, child->string) != child) {
            return fault_set(fault, FAULT_INPUT, "\"%.60s\" stands twice in the request; keep one", child->string);
        }
    }
    return true;
}

static const char *text_field(const cJSON *object, const char *key, const char *says, struct fault *fault) {
    const cJSON *item = cJSON_GetObjectItemCaseSensitive(object, key);
    if (!cJSON_IsString(item) || !item->valuestring[strspn(item->valuestring, " \t")]) {
        fault_set(fault, FAULT_INPUT, "\"%s\" is missing: %s", key, says);
        return NULL;
    }
    return item->valuestring;
}

/* Who decides: as said now and remembered, as said before in this session, or else the account that runs the server. */
static bool decider(struct server_state *state, const struct request *request, const cJSON *object, char by[BY_SIZE],
    struct fault *fault) {
    const char *said = NULL;
    if (cJSON_GetObjectItemCaseSensitive(object, "by")) {
        said = text_field(object, "by", "give the name and role of who is deciding as text", fault);
        if (!said) {
            return false;
        }
        if (strlen(said) >= BY_SIZE) {
            return fault_set(fault, FAULT_INPUT, "\"by\" is too long; a name and a role are enough");
        }
        session_by(state, request->cookie, said);
    }
    session_who(state, request->cookie, by);
    if (strcmp(by, "not said") == 0) {
        account_name(by, BY_SIZE);
    }
    return true;
}

static bool version_seen(const cJSON *object, uint32_t *version, struct fault *fault) {
    const cJSON *item = cJSON_GetObjectItemCaseSensitive(object, "version");
    double value = cJSON_IsNumber(item) ? item->valuedouble : -1;
    if (!(value >= 0 && value < ANY_VERSION) || value != (double)(uint32_t)value) {
        return fault_set(
            fault, FAULT_INPUT, "\"version\" is missing: give the number of the last decision that was seen");
    }
    *version = (uint32_t)value;
    return true;
}

static bool decide(struct server_state *state, const struct request *request, const cJSON *object, uint32_t *version,
    struct fault *fault) {
    char by[BY_SIZE];
    uint32_t seen = 0;
    if (!only_keys(object, "version by decisions", fault) || !version_seen(object, &seen, fault)) {
        return false;
    }
    if (!cJSON_GetObjectItemCaseSensitive(object, "decisions")) {
        return fault_set(fault, FAULT_INPUT, "\"decisions\" is missing: give a list with at least one decision");
    }
    if (!state->study) {
        return no_study(fault);
    }
    return decider(state, request, object, by, fault) &&
           study_decide(
               state->study, by, request->body, (size_t)request->body_length, "the request", seen, version, fault);
}

static uint32_t current_version(struct server_state *state) {
    struct fault unused;
    fault_init(&unused);
    struct frame *frame = study_frame(state->study, &unused);
    uint32_t version = frame ? frame->version : 0;
    frame_release(frame);
    return version;
}

/* Writes {"version": N}, or puts the version beside the fault. */
static void say_version(struct reply *reply, uint32_t version) {
    if (reply->body.length) {
        reply->body.length--; /* the closing brace */
        text_format(&reply->body, ",\"version\":%u}", version);
    } else {
        text_format(&reply->body, "{\"version\":%u}", version);
    }
    reply->content_type = "application/json";
}

static void answer_decisions(struct server_state *state, const struct request *request, struct reply *reply) {
    struct fault fault;
    fault_init(&fault);
    uint32_t version = 0;
    cJSON *object = body_object(request, &fault);
    pthread_rwlock_rdlock(&state->study_lock);
    if (object && decide(state, request, object, &version, &fault)) {
        say_version(reply, version);
    } else {
        reply_fault(reply, &fault);
        if (fault.code == FAULT_CONFLICT && state->study) {
            say_version(reply, current_version(state));
        }
    }
    pthread_rwlock_unlock(&state->study_lock);
    cJSON_Delete(object);
}

/* ---- drafts: files on their way to a study ---- */

/* Reads all files of the draft and answers what they mean; `sources` says per file what a person has said (name and
 * cells are filled in here). */
static bool answer_guess(
    const struct draft *draft, struct guess_source *sources, uint64_t id, struct reply *reply, struct fault *fault) {
    struct cells *cells = ARENA_NEW(&reply->arena, draft->count, struct cells);
    size_t read = 0;
    while (read < draft->count) {
        const struct draft_file *file = &draft->files[read];
        if (!read_cells(&cells[read], file->bytes, file->length, file->name, file->sheet, fault)) {
            break;
        }
        sources[read].name = file->name;
        sources[read].sheet = file->sheet;
        sources[read].cells = &cells[read];
        read++;
    }
    bool done = read == draft->count;
    if (done) {
        struct guess guess;
        struct json json;
        guess_take_all(&guess, sources, draft->count);
        json_init(&json, &reply->body);
        json_object(&json);
        json_field_integer(&json, "draft", (int64_t)id);
        json_key(&json, "guess");
        guess_json(&guess, &json);
        json_key(&json, "plan");
        guess_plan_json(&guess, &json);
        json_close(&json);
        json_finish(&json);
        guess_release(&guess);
        reply->content_type = "application/json";
    }
    while (read) {
        cells_release(&cells[--read]);
    }
    return done;
}

static bool take_draft(struct server_state *state, double id, struct draft *taken, struct fault *fault) {
    return (id >= 1 && id < 1e15 && draft_take(state, (uint64_t)id, taken)) ||
           fault_set(fault, FAULT_MISSING, "that file is no longer at hand; drop it on the page again");
}

static bool is_sheet_or_file(const char *text) {
    return *text && strlen(text) <= 200;
}

static bool draft(struct server_state *state, const struct request *request, struct reply *reply, struct fault *fault) {
    const char *name = request_asked(request, "name"), *sheet = request_asked(request, "sheet");
    const char *said = request_asked(request, "draft");
    for (size_t i = 0; i < request->query_count; i++) {
        const char *asked = request->query[i].name;
        if (strcmp(asked, "name") != 0 && strcmp(asked, "draft") != 0 && strcmp(asked, "sheet") != 0) {
            return fault_set(fault, FAULT_INPUT, "\"%.60s\" is not known here; known are: name draft sheet", asked);
        }
    }
    if (!name || !is_sheet_or_file(name) || strchr(name, '/') || (sheet && !is_sheet_or_file(sheet))) {
        return fault_set(fault, FAULT_INPUT, "say the file's name, without its folder: /drafts?name=export.csv");
    }
    struct cells cells; /* a file that cannot be read leaves the draft as it was */
    const char *bytes = request->body ? request->body : "";
    if (!read_cells(&cells, bytes, (size_t)request->body_length, name, sheet, fault)) {
        return false;
    }
    cells_release(&cells);
    struct draft held = {0};
    if (said && !take_draft(state, said[strspn(said, "0123456789")] ? 0 : strtod(said, NULL), &held, fault)) {
        return false;
    }
    held.id = held.id ? held.id : draft_number(state);
    struct guess_source sources[DRAFT_FILES] = {0};
    bool done = draft_add(&held, name, sheet, bytes, (size_t)request->body_length, fault) &&
                answer_guess(&held, sources, held.id, reply, fault);
    if (held.count) {
        draft_give_back(state, &held);
    }
    return done;
}

static void answer_drafts(struct server_state *state, const struct request *request, struct reply *reply) {
    struct fault fault;
    fault_init(&fault);
    if (!draft(state, request, reply, &fault)) {
        reply_fault(reply, &fault);
    }
}

/* A text of an entry of "files", NULL where it is not there. */
static bool said_text(const cJSON *item, const char *key, const char **text, struct fault *fault) {
    const cJSON *value = cJSON_GetObjectItemCaseSensitive(item, key);
    *text = cJSON_IsString(value) ? value->valuestring : NULL;
    return !value || *text || fault_set(fault, FAULT_INPUT, "\"%s\" of a file must be a text in quotes", key);
}

static bool said_codes(const cJSON *item, struct guess_source *source, struct arena *arena, struct fault *fault) {
    const cJSON *codes = cJSON_GetObjectItemCaseSensitive(item, "codes");
    if (!codes) {
        return true;
    }
    size_t count = cJSON_IsArray(codes) ? (size_t)cJSON_GetArraySize(codes) : SIZE_MAX;
    if (count > 80) {
        return fault_set(
            fault, FAULT_INPUT, "\"codes\" of a file must be a list of at most 80 visit codes, in order of time");
    }
    const char **list = ARENA_NEW(arena, count + 1, const char *);
    for (const cJSON *code = codes->child; code; code = code->next) {
        if (!cJSON_IsString(code) || !*code->valuestring) {
            return fault_set(fault, FAULT_INPUT, "\"codes\" of a file must be texts in quotes that are not empty");
        }
        for (size_t i = 0; i < source->code_count; i++) {
            if (strcmp(list[i], code->valuestring) == 0) {
                return fault_set(
                    fault, FAULT_INPUT, "\"codes\" of a file lists \"%.60s\" twice; keep one", code->valuestring);
            }
        }
        list[source->code_count++] = code->valuestring;
    }
    source->codes = list;
    return true;
}

/* One entry of "files": which of the draft's it is, and what is said of it. */
static bool said_of(const cJSON *item, const struct draft *draft, struct guess_source *sources, bool *named,
    struct arena *arena, struct fault *fault) {
    const char *name, *layout;
    if (!cJSON_IsObject(item)) {
        return fault_set(fault, FAULT_INPUT, "\"files\" must list objects, each with the file's \"name\"");
    }
    if (!only_keys(item, "name layout participant visit codes", fault) || !said_text(item, "name", &name, fault) ||
        !said_text(item, "layout", &layout, fault)) {
        return false;
    }
    size_t at = 0;
    while (at < draft->count && (!name || strcmp(draft->files[at].name, name) != 0)) {
        at++;
    }
    if (at == draft->count) {
        return fault_set(
            fault, FAULT_INPUT, "\"files\" names \"%.80s\", and no such file has been dropped", name ? name : "");
    }
    if (named[at]) {
        return fault_set(fault, FAULT_INPUT, "\"files\" names \"%.80s\" twice; keep one", name);
    }
    struct guess_source *source = &sources[at];
    named[at] = true;
    source->layout = !layout ? LAYOUT_GUESSED : strcmp(layout, "participant") == 0 ? LAYOUT_PARTICIPANT : LAYOUT_VISIT;
    if (layout && source->layout == LAYOUT_VISIT && strcmp(layout, "visit") != 0) {
        return fault_set(fault, FAULT_INPUT, "\"layout\" of a file must be \"participant\" or \"visit\"");
    }
    return said_text(item, "participant", &source->participant, fault) &&
           said_text(item, "visit", &source->visit, fault) && said_codes(item, source, arena, fault);
}

static bool guess_again(struct server_state *state, const cJSON *object, struct reply *reply, struct fault *fault) {
    const cJSON *id = cJSON_GetObjectItemCaseSensitive(object, "draft");
    const cJSON *files = cJSON_GetObjectItemCaseSensitive(object, "files");
    if (!only_keys(object, "draft files", fault)) {
        return false;
    }
    if (!cJSON_IsNumber(id)) {
        return fault_set(fault, FAULT_INPUT, "\"draft\" is missing: give the number that /drafts answered");
    }
    if (!cJSON_IsArray(files) || !files->child) {
        return fault_set(fault, FAULT_INPUT, "\"files\" is missing: name at least one of the files that were dropped");
    }
    struct draft held;
    if (!take_draft(state, id->valuedouble, &held, fault)) {
        return false;
    }
    struct guess_source sources[DRAFT_FILES] = {0};
    bool named[DRAFT_FILES] = {false}, done = true;
    for (const cJSON *item = files->child; item && done; item = item->next) {
        done = said_of(item, &held, sources, named, &reply->arena, fault);
    }
    for (size_t i = held.count; i-- > 0 && done;) {
        if (!named[i]) {
            draft_drop(&held, i);
            memmove(&sources[i], &sources[i + 1], (held.count - i) * sizeof *sources);
        }
    }
    done = done && answer_guess(&held, sources, held.id, reply, fault);
    draft_give_back(state, &held);
    return done;
}

static void answer_guesses(struct server_state *state, const struct request *request, struct reply *reply) {
    struct fault fault;
    fault_init(&fault);
    cJSON *object = body_object(request, &fault);
    if (!object || !guess_again(state, object, reply, &fault)) {
        reply_fault(reply, &fault);
    }
    cJSON_Delete(object);
}

/* "file" of the body as a path in the folder. */
static bool file_field(struct server_state *state, const cJSON *object, struct arena *arena, const char **file,
    const char **path, struct fault *fault) {
    *file = text_field(object, "file", "name a study of the folder, such as quayside.study", fault);
    if (!*file) {
        return false;
    }
    if (!study_name(*file)) {
        return fault_set(fault, FAULT_INPUT,
            "\"%.80s\" cannot be a study's file: give a name without a folder that ends in .study", *file);
    }
    *path = in_folder(state, *file, arena);
    return true;
}

static bool none_open(struct server_state *state, struct fault *fault) {
    pthread_rwlock_rdlock(&state->study_lock);
    bool none = !state->study || fault_set(fault, FAULT_CONFLICT, "the study %s is open already; close it first",
                                     study_path(state->study));
    pthread_rwlock_unlock(&state->study_lock);
    return none;
}

static bool create(struct server_state *state, const struct request *request, const cJSON *object, struct reply *reply,
    struct text *account, const char **file, struct fault *fault) {
    const char *path;
    char by[BY_SIZE];
    const cJSON *plan = cJSON_GetObjectItemCaseSensitive(object, "plan");
    const cJSON *id = cJSON_GetObjectItemCaseSensitive(object, "draft");
    if (!only_keys(object, "draft file plan by", fault) ||
        !file_field(state, object, &reply->arena, file, &path, fault) ||
        !text_field(object, "by", "give the name and role of who loads the file", fault) ||
        !decider(state, request, object, by, fault)) {
        return false;
    }
    if (!cJSON_IsObject(plan)) {
        return fault_set(fault, FAULT_INPUT, "\"plan\" is missing: say what the columns mean");
    }
    struct draft taken;
    if (!cJSON_IsNumber(id) || !(id->valuedouble >= 0 && id->valuedouble < 1e15)) {
        return fault_set(fault, FAULT_INPUT, "\"draft\" is missing: give the number that /drafts answered");
    }
    if (!none_open(state, fault)) {
        return false;
    }
    if (!take_draft(state, id->valuedouble, &taken, fault)) {
        return false;
    }
    struct study_file files[DRAFT_FILES];
    for (size_t i = 0; i < taken.count; i++) {
        files[i] = (struct study_file){taken.files[i].name, taken.files[i].bytes, taken.files[i].length};
    }
    char *plan_text = cJSON_Print(plan);
    bool done = study_create_from(path, files, taken.count, "the plan", plan_text ? plan_text : "",
        plan_text ? strlen(plan_text) : 0, by, account, fault);
    cJSON_free(plan_text);
    done = done && server_open_study(state, path, fault);
    if (done) {
        draft_release(&taken);
    } else {
        draft_give_back(state, &taken);
    }
    return done;
}

static void answer_studies(struct server_state *state, const struct request *request, struct reply *reply) {
    struct fault fault;
    fault_init(&fault);
    struct text account;
    text_init(&account);
    const char *file = NULL;
    cJSON *object = body_object(request, &fault);
    if (object && create(state, request, object, reply, &account, &file, &fault)) {
        struct json json;
        json_init(&json, &reply->body);
        json_object(&json);
        json_field_string(&json, "file", file);
        json_field_string(&json, "account", account.data);
        json_close(&json);
        json_finish(&json);
        reply->status = 201;
        reply->content_type = "application/json";
    } else {
        reply_fault(reply, &fault);
    }
    cJSON_Delete(object);
    text_release(&account);
}

static bool open_file(
    struct server_state *state, const cJSON *object, struct reply *reply, const char **file, struct fault *fault) {
    const char *path;
    if (!only_keys(object, "file", fault) || !file_field(state, object, &reply->arena, file, &path, fault)) {
        return false;
    }
    if (access(path, F_OK) != 0) {
        return fault_set(fault, FAULT_MISSING, "there is no study %.80s in the folder %.200s", *file, state->folder);
    }
    return server_open_study(state, path, fault);
}

static void answer_open(struct server_state *state, const struct request *request, struct reply *reply) {
    struct fault fault;
    fault_init(&fault);
    const char *file = NULL;
    cJSON *object = body_object(request, &fault);
    if (object && open_file(state, object, reply, &file, &fault)) {
        struct json json;
        json_init(&json, &reply->body);
        json_object(&json);
        json_field_string(&json, "file", file);
        json_close(&json);
        json_finish(&json);
        reply->content_type = "application/json";
    } else {
        reply_fault(reply, &fault);
    }
    cJSON_Delete(object);
}

static void answer_close(struct server_state *state, const struct request *request, struct reply *reply) {
    (void)request;
    struct fault fault;
    fault_init(&fault);
    if (server_close_study(state, &fault)) {
        text_literal(&reply->body, "{\"closed\":true}");
        reply->content_type = "application/json";
    } else {
        reply_fault(reply, &fault);
    }
}

const struct route routes[] = {
    {"GET", "/agenda.json", "the open study's agenda, or the studies of the folder", 0, answer_agenda},
    {"GET", "/exhibit/", "an exhibit: NAME, NAME.json, NAME.csv or NAME.svg, with its arguments", 0, answer_exhibit},
    {"POST", "/decisions", "records a batch of decisions", 4 * ONE_MB, answer_decisions},
    {"POST", "/drafts", "reads an export and guesses what its columns mean", 256 * ONE_MB, answer_drafts},
    {"POST", "/guesses", "guesses again over files of a draft, with what a person says of their layout", 4 * ONE_MB,
        answer_guesses},
    {"POST", "/studies", "makes a study from a draft and a plan", 4 * ONE_MB, answer_studies},
    {"POST", "/open", "opens a study of the folder", 4 * ONE_MB, answer_open},
    {"POST", "/close", "closes the open study", 4 * ONE_MB, answer_close},
    {0},
};

void dispatch(struct server_state *state, const struct request *request, struct reply *reply) {
    if (!admit(state, request, reply)) {
        return;
    }
    const char *allowed;
    const struct route *route = route_of(request, &allowed);
    if (route) {
        route->answer(state, request, reply);
    } else {
        answer_asset(asset_of(request->path), request, reply);
    }
    reply_secure(reply);
}
