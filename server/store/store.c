/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "server/store/inner.h"
#include <errno.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

enum { QUICK_CHECK_BYTES = 4 << 20 }; /* about 10 ms of checking at opening; `store_verify` checks any size */

/* ---- opening ---- */

/* Looks at the path without opening it. */
static bool check_file(const char *path, off_t *size, struct fault *fault) {
    struct stat there;
    if (stat(path, &there) != 0) {
        return errno == ENOENT || errno == ENOTDIR
            ? fault_set(fault, FAULT_MISSING, "%s is not there; check the name, or make the study with `evenhand load`",
                  path)
            : fault_set(fault, FAULT_SYSTEM, "%s cannot be reached (%s); ask its owner for access", path,
                  strerror(errno));
    }
    if (S_ISDIR(there.st_mode)) {
        return fault_set(fault, FAULT_INPUT, "%s is a folder; name the study file in it", path);
    }
    if (!S_ISREG(there.st_mode)) {
        return fault_set(fault, FAULT_INPUT, "%s is not an ordinary file; name a study file", path);
    }
    if (there.st_size == 0) {
        return fault_set(fault, FAULT_INPUT, "%s is empty and no study; a study is made by `evenhand load`", path);
    }
    *size = there.st_size;
    return access(path, R_OK) == 0 ||
        fault_set(fault, FAULT_SYSTEM, "%s may not be read (%s); ask its owner for permission", path, strerror(errno));
}

static bool check_marks(struct store *store, struct fault *fault) {
    sqlite3_int64 application, format;
    int code = inner_number(store->database, "PRAGMA application_id", &application);
    code = code == SQLITE_OK ? inner_number(store->database, "PRAGMA user_version", &format) : code;
    if (code != SQLITE_OK) {
        return inner_fault(store->database, code, store->path, fault);
    }
    if (application != APPLICATION || format < 1) {
        return fault_set(fault, FAULT_INPUT, "%s: this SQLite file belongs to another program and is no study; a study "
            "is made by `evenhand load`", store->path);
    }
    return format <= FORMAT || fault_set(fault, FAULT_INPUT, "%s: a newer Evenhand made this study (format %lld, this "
        "one reads up to %d); open it with that", store->path, (long long)format, FORMAT);
}

static bool settle(struct store *store, struct fault *fault) {
    /* A file that somebody left in another journal mode goes back to one file without companions. */
    int code = inner_run(store->database, store->read_only
        ? "PRAGMA query_only=ON; PRAGMA cell_size_check=ON"
        : "PRAGMA journal_mode=DELETE; PRAGMA synchronous=EXTRA; PRAGMA cell_size_check=ON");
    code = code == SQLITE_OK ? inner_number(store->database, "PRAGMA data_version", &store->data_version) : code;
    return code == SQLITE_OK || inner_fault(store->database, code, store->path, fault);
}

static bool check_inside(struct store *store, off_t size, struct fault *fault) {
    char differs[64];
    int code = schema_check(store->database, differs);
    if (code == SQLITE_OK && *differs) {
        return fault_set(fault, FAULT_INPUT, "%s: the study was altered: %s is not as this program makes it; take a "
            "copy kept elsewhere", store->path, differs);
    }
    sqlite3_int64 wrong = 0;
    if (code == SQLITE_OK && size <= QUICK_CHECK_BYTES) {
        code = inner_number(store->database, "SELECT count(*) FROM pragma_quick_check WHERE quick_check <> 'ok'",
            &wrong);
    }
    code = code == SQLITE_OK && wrong ? SQLITE_CORRUPT : code;
    return code == SQLITE_OK || inner_fault(store->database, code, store->path, fault);
}

static bool open_database(struct store *store, struct fault *fault) {
    char *real = realpath(store->path, NULL); /* also keeps SQLite's special names out */
    if (!real) {
        return fault_set(fault, FAULT_SYSTEM, "%s cannot be reached (%s); check its folder", store->path,
            strerror(errno));
    }
    /* Read-write even for readers, so that a journal left by a kill can be rolled back; without permission to write
     * SQLite opens read-only by itself. */
    int code = sqlite3_open_v2(real, &store->database, SQLITE_OPEN_READWRITE | SQLITE_OPEN_NOMUTEX, NULL);
    free(real);
    code = code == SQLITE_OK ? inner_settle(store->database) : code;
    if (code != SQLITE_OK) {
        return inner_fault(store->database, code, store->path, fault);
    }
    store->read_only = store->read_only || sqlite3_db_readonly(store->database, "main") == 1;
    return true;
}

struct store *store_open(const char *path, bool read_only, struct fault *fault) {
    off_t size = 0;
    if (!check_file(path, &size, fault)) {
        return NULL;
    }
    struct store *store = memory_new(1, sizeof *store);
    store->path = memory_text(path);
    store->read_only = read_only;
    pthread_mutex_init(&store->mutex, NULL);
    if (open_database(store, fault) && check_marks(store, fault) && settle(store, fault) &&
        check_inside(store, size, fault)) {
        return store;
    }
    store_close(store);
    return NULL;
}

void store_close(struct store *store) {
    if (store) {
        sqlite3_close(store->database);
        pthread_mutex_destroy(&store->mutex);
        memory_free(store->path);
        memory_free(store);
    }
}

const char *store_path(const struct store *store) {
    return store->path;
}

/* ---- reading: each call is one statement, hence one snapshot ---- */

/* Takes one row of the result; returns SQLite's code. */
typedef int take_row(struct store *store, sqlite3_stmt *statement, void *result);

static bool query(struct store *store, const char *sql, uint32_t number, const char *text, take_row *take, void *result,
    struct fault *fault) {
    sqlite3_stmt *statement = NULL;
    pthread_mutex_lock(&store->mutex);
    int code = sqlite3_prepare_v2(store->database, sql, -1, &statement, NULL);
    if (code == SQLITE_OK) {
        sqlite3_bind_int64(statement, 1, number); /* a place the statement has not is let be */
        inner_bind(statement, 2, text);
    }
    while (code == SQLITE_OK && (code = sqlite3_step(statement)) == SQLITE_ROW) {
        code = take(store, statement, result);
    }
    bool done = code == SQLITE_DONE || inner_fault(store->database, code, store->path, fault);
    sqlite3_finalize(statement);
    pthread_mutex_unlock(&store->mutex);
    return done;
}

struct text_result {
    struct arena *arena;
    const char *text;
};

static int take_text(struct store *store, sqlite3_stmt *statement, void *result) {
    (void)store;
    struct text_result *wanted = result;
    wanted->text = inner_text(wanted->arena, statement, 0);
    return SQLITE_OK;
}

bool store_value(struct store *store, struct arena *arena, const char *key, const char **value, struct fault *fault) {
    struct text_result result = {arena, NULL};
    bool done = query(store, "SELECT value FROM study WHERE key = ?2", 0, key, take_text, &result, fault);
    *value = result.text;
    return done;
}

bool store_plan(struct store *store, struct arena *arena, const char **text, struct fault *fault) {
    struct text_result result = {arena, NULL};
    bool done = query(store, "SELECT text FROM plan ORDER BY number DESC LIMIT 1", 0, NULL, take_text, &result, fault);
    *text = result.text;
    return done && (*text || inner_fault(store->database, SQLITE_CORRUPT, store->path, fault));
}

/* Rows of any kind, gathered in a growing block and handed over in the arena. */
struct rows {
    struct arena *arena;
    char *data;
    size_t count, size;
};

static void *next_row(struct rows *rows) {
    if ((rows->count & (rows->count - 1)) == 0) {
        rows->data = memory_grow(rows->data, rows->count ? 2 * rows->count : 1, rows->size);
    }
    void *row = rows->data + rows->count++ * rows->size;
    return memset(row, 0, rows->size);
}

static void *hand_over(struct rows *rows, size_t *count) {
    void *copy = arena_new(rows->arena, rows->count, rows->size);
    if (rows->count) {
        memcpy(copy, rows->data, rows->count * rows->size);
    }
    *count = rows->count;
    memory_free(rows->data);
    return copy;
}

static int take_file(struct store *store, sqlite3_stmt *statement, void *result) {
    (void)store;
    struct rows *rows = result;
    struct store_file *file = next_row(rows);
    file->number = (uint32_t)sqlite3_column_int64(statement, 0);
    file->name = inner_text(rows->arena, statement, 1);
    file->at = inner_text(rows->arena, statement, 2);
    file->by = inner_text(rows->arena, statement, 3);
    file->length = (size_t)sqlite3_column_int64(statement, 5);
    snprintf(file->sha256, HASH_SIZE, "%s", (const char *)sqlite3_column_text(statement, 4));
    return SQLITE_OK;
}

#define FILE_COLUMNS "number, name, received_at, received_by, sha256, length(bytes)"

bool store_files(struct store *store, struct arena *arena, struct store_file **files, size_t *count,
    struct fault *fault) {
    struct rows rows = {.arena = arena, .size = sizeof **files};
    bool done = query(store, "SELECT " FILE_COLUMNS " FROM received ORDER BY number", 0, NULL, take_file, &rows, fault);
    *files = hand_over(&rows, count);
    return done;
}

static int take_received(struct store *store, sqlite3_stmt *statement, void *result) {
    struct rows *rows = result;
    take_file(store, statement, rows);
    struct store_file *file = (struct store_file *)(void *)rows->data;
    char *bytes = arena_new(rows->arena, file->length + 1, 1);
    file->bytes = bytes;
    sqlite3_blob *blob = NULL;
    int code = sqlite3_blob_open(store->database, "main", "received", "bytes", file->number, 0, &blob);
    code = code == SQLITE_OK ? sqlite3_blob_read(blob, bytes, (int)file->length, 0) : code;
    sqlite3_blob_close(blob);
    return code;
}

bool store_received(struct store *store, struct arena *arena, uint32_t number, struct store_file *file,
    struct fault *fault) {
    struct rows rows = {.arena = arena, .size = sizeof *file};
    bool done = query(store, "SELECT " FILE_COLUMNS " FROM received WHERE ?1 IN (0, number) ORDER BY number DESC "
        "LIMIT 1", number, NULL, take_received, &rows, fault);
    size_t count;
    struct store_file *found = hand_over(&rows, &count);
    if (done && !count) {
        return fault_set(fault, FAULT_MISSING, "%s: no file %u was received; `evenhand verify` lists those that were",
            store->path, number);
    }
    *file = count ? *found : (struct store_file){0};
    return done;
}

static int take_decision(struct store *store, sqlite3_stmt *statement, void *result) {
    (void)store;
    struct rows *rows = result;
    record_decision(rows->arena, statement, next_row(rows));
    return SQLITE_OK;
}

bool store_decisions(struct store *store, struct arena *arena, uint32_t after, struct stored_decision **decisions,
    size_t *count, struct fault *fault) {
    struct rows rows = {.arena = arena, .size = sizeof **decisions};
    bool done = query(store, "SELECT " DECISION_COLUMNS " FROM decisions WHERE number > ?1 ORDER BY number", after,
        NULL, take_decision, &rows, fault);
    *decisions = hand_over(&rows, count);
    return done;
}

static int take_look(struct store *store, sqlite3_stmt *statement, void *result) {
    (void)store;
    struct rows *rows = result;
    record_look(rows->arena, statement, next_row(rows));
    return SQLITE_OK;
}

bool store_looks(struct store *store, struct arena *arena, struct stored_look **looks, size_t *count,
    struct fault *fault) {
    struct rows rows = {.arena = arena, .size = sizeof **looks};
    bool done = query(store, "SELECT " LOOK_COLUMNS " FROM looks ORDER BY number", 0, NULL, take_look, &rows, fault);
    *looks = hand_over(&rows, count);
    return done;
}

bool store_version(struct store *store, uint32_t *version, char head[HASH_SIZE], struct fault *fault) {
    char unused[HASH_SIZE];
    pthread_mutex_lock(&store->mutex);
    int code = record_last(store->database, "decisions", version, head ? head : unused);
    bool done = code == SQLITE_OK || inner_fault(store->database, code, store->path, fault);
    pthread_mutex_unlock(&store->mutex);
    return done;
}

bool store_changed(struct store *store) {
    sqlite3_int64 seen;
    pthread_mutex_lock(&store->mutex);
    int code = inner_number(store->database, "PRAGMA data_version", &seen);
    bool changed = code == SQLITE_OK && seen != store->data_version;
    if (changed) {
        store->data_version = seen;
    }
    pthread_mutex_unlock(&store->mutex);
    return changed;
}
