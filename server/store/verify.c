/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "server/store/inner.h"
#include <stdarg.h>
#include <stdio.h>
#include <string.h>

/* Notes what differs, the first time; returns SQLITE_OK so that a chain of steps goes on. */
__attribute__((format(printf, 2, 3))) static int differs(struct store_verdict *verdict, const char *format, ...) {
    if (verdict->sound) {
        va_list arguments;
        va_start(arguments, format);
        vsnprintf(verdict->sentence, sizeof verdict->sentence, format, arguments);
        va_end(arguments);
        verdict->sound = false;
    }
    return SQLITE_OK;
}

static int check_pages(struct store *store, struct store_verdict *verdict) {
    sqlite3_stmt *statement = NULL;
    int code = sqlite3_prepare_v2(store->database, "PRAGMA integrity_check(1)", -1, &statement, NULL);
    code = code == SQLITE_OK ? sqlite3_step(statement) : code;
    if (code == SQLITE_ROW) {
        const char *found = (const char *)sqlite3_column_text(statement, 0);
        code = strcmp(found, "ok") ? differs(verdict, "the file is damaged: %.200s", found) : SQLITE_OK;
    }
    sqlite3_finalize(statement);
    return code;
}

static int check_schema(struct store *store, struct store_verdict *verdict) {
    char name[64];
    int code = schema_check(store->database, name);
    return code == SQLITE_OK && *name ? differs(verdict, "%s is not as this program makes it", name) : code;
}

static int hash_received(sqlite3 *database, sqlite3_int64 number, char digits[HASH_SIZE]) {
    enum { CHUNK = 1 << 16 };
    char *chunk = memory_grow(NULL, CHUNK, 1);
    struct hash hash;
    hash_init(&hash);
    sqlite3_blob *blob = NULL;
    int code = sqlite3_blob_open(database, "main", "received", "bytes", number, 0, &blob);
    int length = code == SQLITE_OK ? sqlite3_blob_bytes(blob) : 0;
    for (int at = 0; at < length && code == SQLITE_OK; at += CHUNK) {
        int part = length - at < CHUNK ? length - at : CHUNK;
        code = sqlite3_blob_read(blob, chunk, part, at);
        hash_bytes(&hash, chunk, code == SQLITE_OK ? (size_t)part : 0);
    }
    sqlite3_blob_close(blob);
    memory_free(chunk);
    hash_finish(&hash, digits);
    return code;
}

static int check_received(struct store *store, struct store_verdict *verdict) {
    sqlite3_stmt *statement = NULL;
    char digits[HASH_SIZE];
    int code = sqlite3_prepare_v2(store->database, "SELECT number, name, sha256 FROM received ORDER BY number", -1,
        &statement, NULL);
    while (code == SQLITE_OK && (code = sqlite3_step(statement)) == SQLITE_ROW) {
        code = hash_received(store->database, sqlite3_column_int64(statement, 0), digits);
        if (code == SQLITE_OK && strcmp(digits, (const char *)sqlite3_column_text(statement, 2))) {
            code = differs(verdict, "the kept bytes of %.200s no longer have the SHA-256 they were received with",
                (const char *)sqlite3_column_text(statement, 1));
        }
    }
    sqlite3_finalize(statement);
    return code == SQLITE_DONE ? SQLITE_OK : code;
}

static int check_entry_zero(struct store *store, struct store_verdict *verdict) {
    char zero[HASH_SIZE];
    int code = chain_entry_zero(store->database, zero);
    sqlite3_stmt *statement = NULL;
    code = code == SQLITE_OK ? sqlite3_prepare_v2(store->database, "SELECT count(*) FROM study WHERE key = "
        "'entry_zero' AND value = ?1", -1, &statement, NULL) : code;
    if (code == SQLITE_OK) {
        inner_bind(statement, 1, zero);
        code = sqlite3_step(statement);
        code = code != SQLITE_ROW ? code : sqlite3_column_int(statement, 0) == 1 ? SQLITE_OK :
            differs(verdict, "entry 0 does not fit its hash: what the study was made with (files, plan, letters) was "
                "altered");
    }
    sqlite3_finalize(statement);
    return code;
}

/* Recomputes one row's hash from the one before; `kept` is the hash that stands in the row. */
typedef uint32_t check_row(struct arena *arena, sqlite3_stmt *statement, const char *before, char kept[HASH_SIZE],
    char wanted[HASH_SIZE]);

static uint32_t check_decision(struct arena *arena, sqlite3_stmt *statement, const char *before, char kept[HASH_SIZE],
    char wanted[HASH_SIZE]) {
    struct stored_decision decision;
    record_decision(arena, statement, &decision);
    chain_decision(before, &decision, wanted);
    memcpy(kept, decision.hash, HASH_SIZE);
    return decision.number;
}

static uint32_t check_look(struct arena *arena, sqlite3_stmt *statement, const char *before, char kept[HASH_SIZE],
    char wanted[HASH_SIZE]) {
    struct stored_look look;
    record_look(arena, statement, &look);
    chain_look(before, &look, wanted);
    memcpy(kept, look.hash, HASH_SIZE);
    return look.number;
}

/* *first is the number of the first row whose number or hash does not follow from the one before. */
static int check_chain(struct store *store, const char *sql, check_row *check, uint32_t *first) {
    sqlite3_stmt *statement = NULL;
    char before[HASH_SIZE], kept[HASH_SIZE], wanted[HASH_SIZE];
    int code = chain_entry_zero(store->database, before);
    code = code == SQLITE_OK ? sqlite3_prepare_v2(store->database, sql, -1, &statement, NULL) : code;
    for (uint32_t number = 1; code == SQLITE_OK && (code = sqlite3_step(statement)) == SQLITE_ROW; number++) {
        struct arena arena;
        arena_init(&arena);
        code = SQLITE_OK;
        if (check(&arena, statement, before, kept, wanted) != number || strcmp(kept, wanted)) {
            *first = *first ? *first : number;
        }
        memcpy(before, kept, HASH_SIZE); /* later rows are judged by what stands, so that only the first is blamed */
        arena_release(&arena);
    }
    sqlite3_finalize(statement);
    return code == SQLITE_DONE ? SQLITE_OK : code;
}

static int check_decisions(struct store *store, struct store_verdict *verdict) {
    int code = check_chain(store, "SELECT " DECISION_COLUMNS " FROM decisions ORDER BY number", check_decision,
        &verdict->decision);
    return code == SQLITE_OK && verdict->decision ? differs(verdict, "decision %u does not fit its hash: it or the one "
        "before it was altered, added or taken away", verdict->decision) : code;
}

static int check_looks(struct store *store, struct store_verdict *verdict) {
    int code = check_chain(store, "SELECT " LOOK_COLUMNS " FROM looks ORDER BY number", check_look, &verdict->look);
    return code == SQLITE_OK && verdict->look ? differs(verdict, "look %u does not fit its hash: it or the one before "
        "it was altered, added or taken away", verdict->look) : code;
}

bool store_verify(struct store *store, struct store_verdict *verdict, struct fault *fault) {
    static int (*const steps[])(struct store *, struct store_verdict *) = {check_pages, check_schema, check_received,
        check_entry_zero, check_decisions, check_looks};
    *verdict = (struct store_verdict){.sound = true};
    pthread_mutex_lock(&store->mutex);
    int code = inner_run(store->database, "BEGIN"); /* one snapshot for all steps */
    for (size_t i = 0; i < sizeof steps / sizeof *steps && code == SQLITE_OK; i++) {
        code = steps[i](store, verdict);
    }
    if ((code & 0xFF) == SQLITE_CORRUPT) {
        code = differs(verdict, "the file is damaged: %.200s", sqlite3_errmsg(store->database));
    }
    bool done = code == SQLITE_OK || inner_fault(store->database, code, store->path, fault);
    inner_run(store->database, "ROLLBACK");
    pthread_mutex_unlock(&store->mutex);
    return done;
}

/* The first cell of a row that differs, `columns` where none does. */
static size_t compare_row(sqlite3_stmt *statement, const struct store_table *table, size_t record) {
    const uint32_t *start = table->start + record * table->columns;
    for (size_t c = 0; c < table->columns; c++) {
        const void *kept = sqlite3_column_text(statement, (int)c + 1);
        size_t length = (size_t)sqlite3_column_bytes(statement, (int)c + 1);
        if (!kept || length != start[c + 1] - start[c] - 1 || memcmp(kept, table->bytes + start[c], length)) {
            return c;
        }
    }
    return table->columns;
}

static int compare_rows(sqlite3_stmt *statement, const struct store_table *table, bool *same, size_t *record,
    size_t *column) {
    *record = *column = 0;
    *same = sqlite3_column_count(statement) == (int)table->columns + 1;
    int code = SQLITE_OK;
    for (; *same && (code = sqlite3_step(statement)) == SQLITE_ROW; ++*record) {
        bool there = *record < table->records && sqlite3_column_int64(statement, 0) == (sqlite3_int64)*record + 1;
        *column = there ? compare_row(statement, table, *record) : 0;
        if (!there || *column < table->columns) {
            *same = false;
            return SQLITE_OK;
        }
    }
    *same = *same && *record == table->records;
    *column = 0;
    return code == SQLITE_DONE ? SQLITE_OK : code;
}

bool store_compare(struct store *store, uint32_t number, const struct store_table *table, bool *same, size_t *record,
    size_t *column, struct fault *fault) {
    char name[32], sql[96];
    schema_cells_name(name, number);
    snprintf(sql, sizeof sql, "SELECT * FROM %s ORDER BY record", name);
    sqlite3_stmt *statement = NULL;
    pthread_mutex_lock(&store->mutex);
    int code = sqlite3_prepare_v2(store->database, sql, -1, &statement, NULL);
    code = code == SQLITE_OK ? compare_rows(statement, table, same, record, column) : code;
    bool done = code == SQLITE_OK || inner_fault(store->database, code, store->path, fault);
    sqlite3_finalize(statement);
    pthread_mutex_unlock(&store->mutex);
    return done;
}
