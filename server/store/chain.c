/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "server/store/inner.h"
#include <stdio.h>
#include <string.h>

static void field_number(struct hash *hash, uint32_t number) {
    char text[16];
    snprintf(text, sizeof text, "%u", number);
    hash_field(hash, text);
}

/* Hashes every row of a query, field by field, after a word that says what follows and how many rows there are. */
static int hash_rows(struct hash *hash, sqlite3 *database, const char *what, const char *sql) {
    sqlite3_stmt *statement = NULL;
    uint32_t rows = 0;
    hash_field(hash, what);
    int code = sqlite3_prepare_v2(database, sql, -1, &statement, NULL);
    while (code == SQLITE_OK && (code = sqlite3_step(statement)) == SQLITE_ROW) {
        for (int c = 0; c < sqlite3_column_count(statement); c++) {
            hash_field(hash, (const char *)sqlite3_column_text(statement, c));
        }
        rows++;
        code = SQLITE_OK;
    }
    sqlite3_finalize(statement);
    field_number(hash, rows);
    return code == SQLITE_DONE ? SQLITE_OK : code;
}

int chain_entry_zero(sqlite3 *database, char digits[HASH_SIZE]) {
    static const struct part {
        const char *what, *sql;
    } parts[] = {
        {"received", "SELECT number, name, received_at, received_by, sha256 FROM received WHERE version = 0 "
            "ORDER BY number"},
        {"columns", "SELECT received, number, name FROM columns WHERE received IN (SELECT number FROM received WHERE "
            "version = 0) ORDER BY received, number"},
        {"plan", "SELECT number, entered_at, text FROM plan WHERE version = 0 ORDER BY number"},
        {"study", "SELECT key, value FROM study WHERE key <> 'entry_zero' ORDER BY key"},
    };
    struct hash hash;
    hash_init(&hash);
    int code = SQLITE_OK;
    for (size_t i = 0; i < sizeof parts / sizeof *parts && code == SQLITE_OK; i++) {
        code = hash_rows(&hash, database, parts[i].what, parts[i].sql);
    }
    hash_finish(&hash, digits);
    return code;
}

void chain_decision(const char *before, const struct stored_decision *decision, char digits[HASH_SIZE]) {
    const char *const fields[] = {decision->at, decision->by, decision->account, decision->kind, decision->participant,
        decision->column, decision->from, decision->to, decision->reason, decision->evidence, decision->discrepancy,
        decision->blinding, decision->body, decision->state_sha256};
    struct hash hash;
    hash_init(&hash);
    hash_field(&hash, "decision");
    hash_field(&hash, before);
    field_number(&hash, decision->number);
    for (size_t i = 0; i < sizeof fields / sizeof *fields; i++) {
        hash_field(&hash, fields[i]);
    }
    hash_finish(&hash, digits);
}

void chain_look(const char *before, const struct stored_look *look, char digits[HASH_SIZE]) {
    struct hash hash;
    hash_init(&hash);
    hash_field(&hash, "look");
    hash_field(&hash, before);
    field_number(&hash, look->number);
    hash_field(&hash, look->at);
    hash_field(&hash, look->by);
    hash_field(&hash, look->exhibit);
    hash_field(&hash, look->arguments);
    field_number(&hash, look->version);
    hash_finish(&hash, digits);
}
