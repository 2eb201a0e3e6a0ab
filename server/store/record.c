/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/clock.h"
#include "server/store/inner.h"
#include <stdio.h>
#include <string.h>

int record_last(sqlite3 *database, const char *table, uint32_t *number, char hash[HASH_SIZE]) {
    char sql[256];
    snprintf(sql, sizeof sql, "SELECT number, hash FROM (SELECT number, hash FROM %s ORDER BY number DESC LIMIT 1) "
        "UNION ALL SELECT 0, value FROM study WHERE key = 'entry_zero' ORDER BY 1 DESC LIMIT 1", table);
    sqlite3_stmt *statement = NULL;
    int code = sqlite3_prepare_v2(database, sql, -1, &statement, NULL);
    if (code == SQLITE_OK) {
        code = sqlite3_step(statement);
        if (code == SQLITE_ROW) {
            *number = (uint32_t)sqlite3_column_int64(statement, 0);
            snprintf(hash, HASH_SIZE, "%s", (const char *)sqlite3_column_text(statement, 1));
            code = SQLITE_OK;
        } else if (code == SQLITE_DONE) {
            code = SQLITE_CORRUPT; /* a study without entry 0 */
        }
    }
    sqlite3_finalize(statement);
    return code;
}

static const char *time_or_now(struct arena *arena, const char *at) {
    char now[CLOCK_SIZE];
    if (at) {
        return at;
    }
    clock_utc(now);
    return arena_text(arena, now);
}

static int add_decision(sqlite3_stmt *statement, const struct stored_decision *decision) {
    const char *const fields[] = {decision->at, decision->by, decision->account, decision->kind, decision->participant,
        decision->column, decision->from, decision->to, decision->reason, decision->evidence, decision->discrepancy,
        decision->blinding, decision->body, decision->state_sha256, decision->hash};
    sqlite3_reset(statement);
    sqlite3_bind_int64(statement, 1, decision->number);
    for (size_t i = 0; i < sizeof fields / sizeof *fields; i++) {
        inner_bind(statement, (int)i + 2, fields[i]);
    }
    int code = sqlite3_step(statement);
    return code == SQLITE_DONE ? SQLITE_OK : code;
}

int record_add(sqlite3 *database, struct arena *arena, uint32_t last, const char *hash,
    struct stored_decision *decisions, size_t count) {
    sqlite3_stmt *statement = NULL;
    int code = sqlite3_prepare_v2(database, "INSERT INTO decisions(" DECISION_COLUMNS ") VALUES(?1, ?2, ?3, ?4, ?5, "
        "?6, ?7, ?8, ?9, ?10, ?11, ?12, ?13, ?14, ?15, ?16)", -1, &statement, NULL);
    for (size_t i = 0; i < count && code == SQLITE_OK; i++) {
        struct stored_decision *decision = &decisions[i];
        BUG_IF(!decision->by || !decision->kind || !decision->blinding || !decision->body);
        decision->number = ++last;
        decision->at = time_or_now(arena, decision->at);
        chain_decision(hash, decision, decision->hash);
        hash = decision->hash;
        code = add_decision(statement, decision);
    }
    sqlite3_finalize(statement);
    return code;
}

void record_decision(struct arena *arena, sqlite3_stmt *statement, struct stored_decision *decision) {
    const char **const fields[] = {&decision->at, &decision->by, &decision->account, &decision->kind,
        &decision->participant, &decision->column, &decision->from, &decision->to, &decision->reason,
        &decision->evidence, &decision->discrepancy, &decision->blinding, &decision->body, &decision->state_sha256};
    enum { FIELDS = sizeof fields / sizeof *fields };
    decision->number = (uint32_t)sqlite3_column_int64(statement, 0);
    for (int i = 0; i < FIELDS; i++) {
        *fields[i] = inner_text(arena, statement, i + 1);
    }
    snprintf(decision->hash, HASH_SIZE, "%s", (const char *)sqlite3_column_text(statement, FIELDS + 1));
}

void record_look(struct arena *arena, sqlite3_stmt *statement, struct stored_look *look) {
    look->number = (uint32_t)sqlite3_column_int64(statement, 0);
    look->at = inner_text(arena, statement, 1);
    look->by = inner_text(arena, statement, 2);
    look->exhibit = inner_text(arena, statement, 3);
    look->arguments = inner_text(arena, statement, 4);
    look->version = (uint32_t)sqlite3_column_int64(statement, 5);
    snprintf(look->hash, HASH_SIZE, "%s", (const char *)sqlite3_column_text(statement, 6));
}

static bool refuse_moved(const struct store *store, uint32_t last, uint32_t seen, struct fault *fault) {
    return fault_set(fault, FAULT_CONFLICT, "%s: the study stands at version %u by now and this was decided at version "
        "%u; look again and decide anew", store->path, last, seen);
}

/* Ends the transaction: all or nothing. */
static bool finish(struct store *store, int code, struct fault *fault) {
    if (code == SQLITE_OK) {
        code = inner_run(store->database, "COMMIT");
    }
    bool done = code == SQLITE_OK || inner_fault(store->database, code, store->path, fault);
    if (!sqlite3_get_autocommit(store->database)) {
        inner_run(store->database, "ROLLBACK");
    }
    return done;
}

static int begin(struct store *store) {
    /* query_only would let the transaction begin and fail later. */
    return store->read_only ? SQLITE_READONLY : inner_run(store->database, "BEGIN IMMEDIATE");
}

bool store_append(struct store *store, struct arena *arena, uint32_t version_seen, struct stored_decision *decisions,
    size_t count, struct fault *fault) {
    uint32_t last;
    char hash[HASH_SIZE];
    pthread_mutex_lock(&store->mutex);
    int code = begin(store);
    bool begun = code == SQLITE_OK, moved = false;
    if (begun) {
        code = record_last(store->database, "decisions", &last, hash);
        moved = code == SQLITE_OK && last != version_seen;
    }
    if (moved) {
        refuse_moved(store, last, version_seen, fault);
    } else if (begun && code == SQLITE_OK) {
        code = record_add(store->database, arena, last, hash, decisions, count);
    }
    bool done = !moved ? finish(store, code, fault) : (inner_run(store->database, "ROLLBACK"), false);
    pthread_mutex_unlock(&store->mutex);
    return done;
}

static int add_look(sqlite3 *database, const struct stored_look *look) {
    sqlite3_stmt *statement = NULL;
    int code = sqlite3_prepare_v2(database, "INSERT INTO looks(" LOOK_COLUMNS ") VALUES(?1, ?2, ?3, ?4, ?5, ?6, ?7)",
        -1, &statement, NULL);
    if (code == SQLITE_OK) {
        sqlite3_bind_int64(statement, 1, look->number);
        inner_bind(statement, 2, look->at);
        inner_bind(statement, 3, look->by);
        inner_bind(statement, 4, look->exhibit);
        inner_bind(statement, 5, look->arguments);
        sqlite3_bind_int64(statement, 6, look->version);
        inner_bind(statement, 7, look->hash);
        code = sqlite3_step(statement);
        code = code == SQLITE_DONE ? SQLITE_OK : code;
    }
    sqlite3_finalize(statement);
    return code;
}

bool store_append_look(struct store *store, struct arena *arena, struct stored_look *look, struct fault *fault) {
    BUG_IF(!look->by || !look->exhibit || !look->arguments);
    char before[HASH_SIZE];
    uint32_t last;
    pthread_mutex_lock(&store->mutex);
    int code = begin(store);
    if (code == SQLITE_OK) {
        code = record_last(store->database, "looks", &last, before);
    }
    if (code == SQLITE_OK) {
        look->number = last + 1;
        look->at = time_or_now(arena, look->at);
        chain_look(before, look, look->hash);
        code = add_look(store->database, look);
    }
    bool done = finish(store, code, fault);
    pthread_mutex_unlock(&store->mutex);
    return done;
}
