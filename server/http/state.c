/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "server/http/state.h"
#include "store/store.h"
#include <errno.h>
#include <nettle/memops.h>
#include <pwd.h>
#include <stdio.h>
#include <string.h>
#include <sys/random.h>
#include <unistd.h>

/* Together the drafts may take this much; the oldest go first. */
static const size_t draft_room = (size_t)512 << 20;

/* ---- keys and sessions ---- */

bool key_make(char key[KEY_SIZE], struct fault *fault) {
    unsigned char bytes[(KEY_SIZE - 1) / 2];
    if (getrandom(bytes, sizeof bytes, 0) != (ssize_t)sizeof bytes) {
        return fault_set(fault, FAULT_SYSTEM, "the system gives no random numbers (%s), so no safe key can be made",
            strerror(errno));
    }
    for (size_t i = 0; i < sizeof bytes; i++) {
        snprintf(key + 2 * i, 3, "%02x", bytes[i]);
    }
    return true;
}

bool key_same(const char *given, const char *wanted) {
    size_t length = strlen(wanted);
    return length == KEY_SIZE - 1 && strlen(given) == length && memeql_sec(given, wanted, length);
}

bool key_fits(struct server_state *state, const char *given) {
    pthread_mutex_lock(&state->mutex);
    bool once = key_same(given, state->key_once);
    if (once) {
        *state->key_once = '\0';
    }
    pthread_mutex_unlock(&state->mutex);
    return once || key_same(given, state->key);
}

bool server_key_once(struct server_state *state, char key[33], struct fault *fault) {
    if (!key_make(key, fault)) {
        return false;
    }
    pthread_mutex_lock(&state->mutex);
    memcpy(state->key_once, key, KEY_SIZE);
    pthread_mutex_unlock(&state->mutex);
    return true;
}

bool session_new(struct server_state *state, char token[KEY_SIZE], struct fault *fault) {
    if (!key_make(token, fault)) {
        return false;
    }
    pthread_mutex_lock(&state->mutex);
    struct session *place = &state->sessions[0];
    for (size_t i = 1; i < SESSIONS; i++) {
        if (state->sessions[i].used < place->used) {
            place = &state->sessions[i];
        }
    }
    *place = (struct session){.used = ++state->tick};
    memcpy(place->token, token, KEY_SIZE);
    pthread_mutex_unlock(&state->mutex);
    return true;
}

/* The cookie's value copied out of "a=1; evenhand-PORT=VALUE; b=2"; false where it is not there in full. */
static bool cookie_value(const struct server_state *state, const char *cookie, char value[KEY_SIZE]) {
    size_t name_length = strlen(state->cookie_name);
    for (const char *p = cookie; p && *p;) {
        p += strspn(p, " ;");
        size_t length = strcspn(p, ";");
        if (length == name_length + KEY_SIZE && strncmp(p, state->cookie_name, name_length) == 0 &&
            p[name_length] == '=') {
            memcpy(value, p + name_length + 1, KEY_SIZE - 1);
            value[KEY_SIZE - 1] = '\0';
            return true;
        }
        p += length;
    }
    return false;
}

/* With the mutex held. */
static struct session *session_find(struct server_state *state, const char *cookie) {
    char value[KEY_SIZE];
    if (!cookie_value(state, cookie, value)) {
        return NULL;
    }
    struct session *found = NULL;
    for (size_t i = 0; i < SESSIONS; i++) {
        if (key_same(value, state->sessions[i].token)) {
            found = &state->sessions[i];
            found->used = ++state->tick;
        }
    }
    return found;
}

bool session_known(struct server_state *state, const char *cookie) {
    pthread_mutex_lock(&state->mutex);
    bool known = session_find(state, cookie) != NULL;
    pthread_mutex_unlock(&state->mutex);
    return known;
}

void session_by(struct server_state *state, const char *cookie, const char *by) {
    pthread_mutex_lock(&state->mutex);
    struct session *session = session_find(state, cookie);
    if (session) {
        snprintf(session->by, sizeof session->by, "%s", by);
    }
    pthread_mutex_unlock(&state->mutex);
}

const char *session_who(struct server_state *state, const char *cookie, char by[BY_SIZE]) {
    pthread_mutex_lock(&state->mutex);
    struct session *session = session_find(state, cookie);
    snprintf(by, BY_SIZE, "%s", session && *session->by ? session->by : "not said");
    pthread_mutex_unlock(&state->mutex);
    return by;
}

void account_name(char *name, size_t size) {
    char buffer[4096];
    struct passwd entry, *found = NULL;
    bool known = getpwuid_r(getuid(), &entry, buffer, sizeof buffer, &found) == 0 && found && *found->pw_name;
    snprintf(name, size, "%s", known ? found->pw_name : "not said");
}

/* ---- drafts ---- */

static void file_release(struct draft_file *file) {
    memory_free(file->name);
    memory_free(file->sheet);
    memory_free(file->bytes);
    *file = (struct draft_file){0};
}

void draft_release(struct draft *draft) {
    for (size_t i = 0; i < draft->count; i++) {
        file_release(&draft->files[i]);
    }
    *draft = (struct draft){0};
}

void draft_drop(struct draft *draft, size_t file) {
    draft->length -= draft->files[file].length;
    file_release(&draft->files[file]);
    draft->count--;
    memmove(&draft->files[file], &draft->files[file + 1], (draft->count - file) * sizeof *draft->files);
    draft->files[draft->count] = (struct draft_file){0};
}

bool draft_add(
    struct draft *draft, const char *name, const char *sheet, const char *bytes, size_t length, struct fault *fault) {
    size_t at = 0;
    while (at < draft->count && strcmp(draft->files[at].name, name) != 0) {
        at++;
    }
    size_t others = draft->length - (at < draft->count ? draft->files[at].length : 0);
    if (at == DRAFT_FILES) {
        return fault_set(fault, FAULT_INPUT, "a study takes at most %d files here", DRAFT_FILES);
    }
    if (others + length > draft_room) {
        return fault_set(fault, FAULT_INPUT,
            "%.80s and the files before it are together larger than the %zu MB that a study takes here", name,
            draft_room >> 20);
    }
    if (at < draft->count) {
        file_release(&draft->files[at]);
    }
    draft->files[at] = (struct draft_file){memory_text(name), memory_text(sheet), memory_new(length + 1, 1), length};
    memcpy(draft->files[at].bytes, bytes, length);
    draft->count += at == draft->count;
    draft->length = others + length;
    return true;
}

/* With the mutex held: the place of the oldest draft, or a free one. */
static struct draft *oldest(struct server_state *state, bool free_too) {
    struct draft *place = NULL;
    for (size_t i = 0; i < DRAFTS; i++) {
        struct draft *draft = &state->drafts[i];
        if ((free_too || draft->id) && (!place || draft->id < place->id)) {
            place = draft;
        }
    }
    return place;
}

static void place_draft(struct server_state *state, const struct draft *draft) {
    size_t total = draft->length;
    for (size_t i = 0; i < DRAFTS; i++) {
        total += state->drafts[i].length;
    }
    for (struct draft *old; total > draft_room && (old = oldest(state, false));) {
        total -= old->length;
        draft_release(old);
    }
    struct draft *place = oldest(state, true);
    draft_release(place);
    *place = *draft;
}

bool draft_take(struct server_state *state, uint64_t id, struct draft *draft) {
    bool found = false;
    pthread_mutex_lock(&state->mutex);
    for (size_t i = 0; i < DRAFTS && !found && id; i++) {
        if (state->drafts[i].id == id) {
            *draft = state->drafts[i];
            state->drafts[i] = (struct draft){0};
            found = true;
        }
    }
    pthread_mutex_unlock(&state->mutex);
    return found;
}

uint64_t draft_number(struct server_state *state) {
    pthread_mutex_lock(&state->mutex);
    uint64_t id = ++state->last_draft;
    pthread_mutex_unlock(&state->mutex);
    return id;
}

void draft_give_back(struct server_state *state, struct draft *draft) {
    pthread_mutex_lock(&state->mutex);
    place_draft(state, draft);
    pthread_mutex_unlock(&state->mutex);
    *draft = (struct draft){0};
}

/* ---- the server ---- */

struct server_state *server_new(const char *folder, struct fault *fault) {
    struct server_state *state = memory_new(1, sizeof *state);
    if (!key_make(state->key, fault)) {
        memory_free(state);
        return NULL;
    }
    state->folder = memory_text(folder);
    pthread_mutex_init(&state->mutex, NULL);
    pthread_rwlockattr_t attributes;
    pthread_rwlockattr_init(&attributes);
    /* Someone who closes the study must not wait for ever behind a page that keeps asking. */
    pthread_rwlockattr_setkind_np(&attributes, PTHREAD_RWLOCK_PREFER_WRITER_NONRECURSIVE_NP);
    pthread_rwlock_init(&state->study_lock, &attributes);
    pthread_rwlockattr_destroy(&attributes);
    server_port(state, 0);
    return state;
}

static void close_study(struct server_state *state) {
    study_close(state->study);
    store_unlock(state->study_hold);
    state->study = NULL;
}

void server_free(struct server_state *state) {
    if (!state) {
        return;
    }
    if (state->study) {
        close_study(state);
    }
    for (size_t i = 0; i < DRAFTS; i++) {
        draft_release(&state->drafts[i]);
    }
    pthread_rwlock_destroy(&state->study_lock);
    pthread_mutex_destroy(&state->mutex);
    memory_free(state->folder);
    memory_free(state);
}

void server_port(struct server_state *state, unsigned port) {
    state->port = port;
    snprintf(state->cookie_name, sizeof state->cookie_name, "evenhand-%u", port);
}

const char *server_key(const struct server_state *state) {
    return state->key;
}

const char *server_folder(const struct server_state *state) {
    return state->folder;
}

bool server_open_study(struct server_state *state, const char *path, struct fault *fault) {
    pthread_rwlock_wrlock(&state->study_lock);
    bool done = true;
    if (state->study) {
        done =
            fault_set(fault, FAULT_CONFLICT, "the study %s is open already; close it first", study_path(state->study));
    } else {
        state->study_hold = store_lock_take(path, fault);
        state->study = state->study_hold < 0 ? NULL : study_open(path, fault);
        done = state->study != NULL;
        if (!done && state->study_hold >= 0) {
            store_unlock(state->study_hold);
        }
    }
    pthread_rwlock_unlock(&state->study_lock);
    return done;
}

bool server_close_study(struct server_state *state, struct fault *fault) {
    pthread_rwlock_wrlock(&state->study_lock);
    bool done = true;
    if (state->study) {
        close_study(state);
    } else {
        done = fault_set(fault, FAULT_MISSING, "no study is open, so there is none to close");
    }
    pthread_rwlock_unlock(&state->study_lock);
    return done;
}
