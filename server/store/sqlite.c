/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "server/store/inner.h"
#include <string.h>

struct meaning {
    int code; /* SQLite's primary result code */
    enum fault_code fault;
    const char *sentence;
};

static const struct meaning meanings[] = {
    {SQLITE_BUSY, FAULT_SYSTEM,
        "another program has kept the study to itself for five seconds; close that program or try again"},
    {SQLITE_FULL, FAULT_SYSTEM, "the disk is full and nothing was changed; free some space and try again"},
    {SQLITE_READONLY, FAULT_REFUSED,
        "the study may not be written and nothing was changed; allow writing to the file and its folder and try again"},
    {SQLITE_CANTOPEN, FAULT_SYSTEM,
        "the study or the journal beside it cannot be opened and nothing was changed; allow writing to its folder and "
        "try again"},
    {SQLITE_PERM, FAULT_SYSTEM, "the study may not be opened; ask its owner for permission to read it"},
    {SQLITE_CORRUPT, FAULT_INPUT, "the study is damaged; take a copy of it kept elsewhere"},
    {SQLITE_NOTADB, FAULT_INPUT, "this is not a study; a study is made by `evenhand load`"},
    {SQLITE_IOERR, FAULT_SYSTEM,
        "the disk could not be read or written and nothing was changed; see to the disk (is it full, or gone?) and "
        "try again"},
    {SQLITE_NOMEM, FAULT_SYSTEM, "this machine has no memory left for the study; close other programs and try again"},
    {SQLITE_TOOBIG, FAULT_INPUT, "a text or file is larger than a study takes; load less at a time"},
};

bool inner_fault(sqlite3 *database, int code, const char *path, struct fault *fault) {
    for (size_t i = 0; i < sizeof meanings / sizeof *meanings; i++) {
        if (meanings[i].code == (code & 0xFF)) {
            return fault_set(fault, meanings[i].fault, "%s: %s", path, meanings[i].sentence);
        }
    }
    return fault_set(fault, FAULT_SYSTEM, "%s: SQLite refused with \"%s\" and nothing was changed; check the file with "
        "`evenhand verify`", path, database ? sqlite3_errmsg(database) : sqlite3_errstr(code));
}

int inner_run(sqlite3 *database, const char *sql) {
    return sqlite3_exec(database, sql, NULL, NULL, NULL);
}

int inner_number(sqlite3 *database, const char *sql, sqlite3_int64 *number) {
    sqlite3_stmt *statement = NULL;
    int code = sqlite3_prepare_v2(database, sql, -1, &statement, NULL);
    *number = 0;
    if (code == SQLITE_OK) {
        code = sqlite3_step(statement);
        if (code == SQLITE_ROW) {
            *number = sqlite3_column_int64(statement, 0);
        }
        code = code == SQLITE_ROW || code == SQLITE_DONE ? SQLITE_OK : code;
    }
    sqlite3_finalize(statement);
    return code;
}

const char *inner_text(struct arena *arena, sqlite3_stmt *statement, int column) {
    const char *text = (const char *)sqlite3_column_text(statement, column);
    return text ? arena_bytes(arena, text, (size_t)sqlite3_column_bytes(statement, column)) : NULL;
}

void inner_bind(sqlite3_stmt *statement, int place, const char *text) {
    if (text) {
        sqlite3_bind_text(statement, place, text, -1, SQLITE_STATIC);
    } else {
        sqlite3_bind_null(statement, place);
    }
}

int inner_settle(sqlite3 *database) {
    static const struct setting {
        int name, on;
    } settings[] = {
        {SQLITE_DBCONFIG_DEFENSIVE, 1},
        {SQLITE_DBCONFIG_TRUSTED_SCHEMA, 0},
        {SQLITE_DBCONFIG_DQS_DML, 0},
        {SQLITE_DBCONFIG_DQS_DDL, 0},
        {SQLITE_DBCONFIG_ENABLE_LOAD_EXTENSION, 0},
        {SQLITE_DBCONFIG_ENABLE_TRIGGER, 1},
        {SQLITE_DBCONFIG_ENABLE_FKEY, 1},
    };
    int code = SQLITE_OK;
    for (size_t i = 0; i < sizeof settings / sizeof *settings && code == SQLITE_OK; i++) {
        code = sqlite3_db_config(database, settings[i].name, settings[i].on, NULL);
    }
    sqlite3_extended_result_codes(database, 1);
    sqlite3_busy_timeout(database, BUSY_MILLISECONDS);
    return code;
}
