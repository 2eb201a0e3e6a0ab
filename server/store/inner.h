/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What the files of the store share among themselves, and nobody else may include. */
#ifndef EVENHAND_SERVER_STORE_INNER_H
#define EVENHAND_SERVER_STORE_INNER_H
#include "base/text.h"
#include "store/store.h"
#include <pthread.h>
#include <sqlite3.h>

enum {
    FORMAT = 1,                    /* user_version */
    APPLICATION = 0x45564E48,      /* application_id: "EVNH" */
    BUSY_MILLISECONDS = 5000,
};

struct store {
    sqlite3 *database;
    char *path;
    pthread_mutex_t mutex;
    bool read_only;
    sqlite3_int64 data_version; /* as last seen by store_changed */
};

/* ---- sqlite.c: statements, settings and what SQLite's codes mean for a person ---- */

/* The sentence for `code`, the result of the last call on `database` (which may be NULL). Returns false. */
bool inner_fault(sqlite3 *database, int code, const char *path, struct fault *fault);
/* Runs statements without results; returns SQLite's code. */
int inner_run(sqlite3 *database, const char *sql);
/* The first column of the first row as a number; returns SQLite's code, SQLITE_OK also where there is no row (0). */
int inner_number(sqlite3 *database, const char *sql, sqlite3_int64 *number);
/* Text of a result column, copied; NULL where SQL has NULL. */
const char *inner_text(struct arena *arena, sqlite3_stmt *statement, int column);
/* Binds NULL for NULL; borrowed until the statement is reset or finalised. */
void inner_bind(sqlite3_stmt *statement, int place, const char *text);
/* The settings of every connection, for a file that anybody may have handed over. */
int inner_settle(sqlite3 *database);

/* ---- schema.c: the tables and the triggers that let rows be added only ---- */

/* Makes all but the tables of cells. */
int schema_make(sqlite3 *database);
/* Makes the table of cells of file `number`, without its triggers; then, after the rows, seals it. */
int schema_make_cells(sqlite3 *database, uint32_t number, size_t columns);
int schema_seal_cells(sqlite3 *database, uint32_t number);
/* After birth no key is added to the study. */
int schema_seal_study(sqlite3 *database);
void schema_cells_name(char name[32], uint32_t number);
/* *differs names a table or trigger that is not as this program makes it ("" where all are). */
int schema_check(sqlite3 *database, char differs[64]);

/* ---- chain.c: hashes ---- */

int chain_entry_zero(sqlite3 *database, char digits[HASH_SIZE]);
void chain_decision(const char *before, const struct stored_decision *decision, char digits[HASH_SIZE]);
void chain_look(const char *before, const struct stored_look *look, char digits[HASH_SIZE]);

/* ---- record.c: decisions and looks ---- */

/* The last number and hash of "decisions" or "looks"; of entry 0 where there is none. */
int record_last(sqlite3 *database, const char *table, uint32_t *number, char hash[HASH_SIZE]);
/* Adds rows within the caller's transaction; number, at and hash are filled in. */
int record_add(sqlite3 *database, struct arena *arena, uint32_t last, const char *hash,
    struct stored_decision *decisions, size_t count);
/* A row of `DECISION_COLUMNS` as a decision, of `LOOK_COLUMNS` as a look. */
#define DECISION_COLUMNS                                                                                               \
    "number, entered_at, entered_by, account, kind, participant, column_name, value_from, value_to, reason, "          \
    "evidence, discrepancy, blinding, body, state_sha256, hash"
#define LOOK_COLUMNS "number, seen_at, seen_by, exhibit, arguments, version, hash"
void record_decision(struct arena *arena, sqlite3_stmt *statement, struct stored_decision *decision);
void record_look(struct arena *arena, sqlite3_stmt *statement, struct stored_look *look);

/* ---- newfile.c: a file that appears whole or not at all ---- */

/* Refuses where anything is at `path`. On disk (file and folder) before it returns true. */
bool newfile_write(const char *path, const void *bytes, size_t length, struct fault *fault);
bool newfile_refuse_existing(const char *path, struct fault *fault);
#endif
