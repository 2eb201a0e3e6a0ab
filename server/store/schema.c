/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "server/store/inner.h"
#include <stdio.h>
#include <string.h>

/* Names here avoid the reserved words of SQL, so that anyone can write a query without quotes. */
struct object {
    const char *name, *sql;
};

#define REFUSE(action, table)                                                                                          \
    {"no_" action "_" table, "CREATE TRIGGER no_" action "_" table " BEFORE " action " ON " table                      \
        " BEGIN SELECT RAISE(ABORT, 'rows of " table " are kept as they are'); END"}
/* An INSERT OR REPLACE would take a row away without a DELETE: only the next number may come. */
#define NEXT_ONLY(table)                                                                                               \
    {"next_" table, "CREATE TRIGGER next_" table " BEFORE INSERT ON " table                                            \
        " WHEN NEW.number IS NOT (SELECT coalesce(max(number), 0) + 1 FROM " table ")"                                 \
        " BEGIN SELECT RAISE(ABORT, 'rows of " table " are numbered one by one'); END"}

static const struct object objects[] = {
    {"study", "CREATE TABLE study(key TEXT PRIMARY KEY, value TEXT NOT NULL) STRICT, WITHOUT ROWID"},
    {"received", "CREATE TABLE received(number INTEGER PRIMARY KEY, version INTEGER NOT NULL, name TEXT NOT NULL, "
        "received_at TEXT NOT NULL, received_by TEXT NOT NULL, sha256 TEXT NOT NULL, bytes BLOB NOT NULL) STRICT"},
    {"plan", "CREATE TABLE plan(number INTEGER PRIMARY KEY, version INTEGER NOT NULL, entered_at TEXT NOT NULL, "
        "text TEXT NOT NULL) STRICT"},
    {"columns", "CREATE TABLE columns(received INTEGER NOT NULL, number INTEGER NOT NULL, name TEXT NOT NULL, "
        "PRIMARY KEY (received, number)) STRICT, WITHOUT ROWID"},
    {"decisions", "CREATE TABLE decisions(number INTEGER PRIMARY KEY, entered_at TEXT NOT NULL, "
        "entered_by TEXT NOT NULL, account TEXT, kind TEXT NOT NULL, participant TEXT, column_name TEXT, "
        "value_from TEXT, value_to TEXT, reason TEXT, evidence TEXT, discrepancy TEXT, blinding TEXT NOT NULL, "
        "body TEXT NOT NULL, state_sha256 TEXT, hash TEXT NOT NULL) STRICT"},
    {"looks", "CREATE TABLE looks(number INTEGER PRIMARY KEY, seen_at TEXT NOT NULL, seen_by TEXT NOT NULL, "
        "exhibit TEXT NOT NULL, arguments TEXT NOT NULL, version INTEGER NOT NULL, hash TEXT NOT NULL) STRICT"},
    REFUSE("UPDATE", "study"), REFUSE("DELETE", "study"),
    REFUSE("UPDATE", "received"), REFUSE("DELETE", "received"), NEXT_ONLY("received"),
    REFUSE("UPDATE", "plan"), REFUSE("DELETE", "plan"), NEXT_ONLY("plan"),
    REFUSE("UPDATE", "columns"), REFUSE("DELETE", "columns"),
    {"next_columns", "CREATE TRIGGER next_columns BEFORE INSERT ON columns WHEN EXISTS (SELECT 1 FROM columns "
        "WHERE received = NEW.received AND number = NEW.number) "
        "BEGIN SELECT RAISE(ABORT, 'rows of columns are kept as they are'); END"},
    REFUSE("UPDATE", "decisions"), REFUSE("DELETE", "decisions"), NEXT_ONLY("decisions"),
    REFUSE("UPDATE", "looks"), REFUSE("DELETE", "looks"), NEXT_ONLY("looks"),
};
enum { OBJECTS = sizeof objects / sizeof *objects };
static const struct object study_seal = REFUSE("INSERT", "study");

int schema_make(sqlite3 *database) {
    int code = SQLITE_OK;
    for (size_t i = 0; i < OBJECTS && code == SQLITE_OK; i++) {
        code = inner_run(database, objects[i].sql);
    }
    return code;
}

int schema_seal_study(sqlite3 *database) {
    return inner_run(database, study_seal.sql);
}

void schema_cells_name(char name[32], uint32_t number) {
    snprintf(name, 32, number == 1 ? "cells" : "cells_%u", number);
}

static void cells_sql(struct text *sql, const char *name, size_t columns) {
    text_clear(sql);
    text_format(sql, "CREATE TABLE %s(record INTEGER PRIMARY KEY", name);
    for (size_t c = 1; c <= columns; c++) {
        text_format(sql, ", c%zu TEXT NOT NULL", c);
    }
    text_literal(sql, ") STRICT");
}

static const char *const actions[] = {"INSERT", "UPDATE", "DELETE"};
enum { ACTIONS = sizeof actions / sizeof *actions };

static void cells_seal_sql(struct text *sql, const char *name, const char *action) {
    text_clear(sql);
    text_format(sql, "CREATE TRIGGER no_%s_%s BEFORE %s ON %s BEGIN SELECT RAISE(ABORT, 'rows of %s are kept as they "
        "are'); END", action, name, action, name, name);
}

int schema_make_cells(sqlite3 *database, uint32_t number, size_t columns) {
    char name[32];
    schema_cells_name(name, number);
    struct text sql;
    text_init(&sql);
    cells_sql(&sql, name, columns);
    int code = inner_run(database, sql.data);
    text_release(&sql);
    return code;
}

int schema_seal_cells(sqlite3 *database, uint32_t number) {
    char name[32];
    schema_cells_name(name, number);
    struct text sql;
    text_init(&sql);
    int code = SQLITE_OK;
    for (size_t i = 0; i < ACTIONS && code == SQLITE_OK; i++) {
        cells_seal_sql(&sql, name, actions[i]);
        code = inner_run(database, sql.data);
    }
    text_release(&sql);
    return code;
}

/* Sets `differs` to `name` unless the schema has exactly that object. */
static int check_object(sqlite3 *database, const char *name, const char *sql, char differs[64]) {
    sqlite3_stmt *statement = NULL;
    int code = sqlite3_prepare_v2(database, "SELECT count(*) FROM sqlite_schema WHERE name = ?1 AND sql = ?2", -1,
        &statement, NULL);
    if (code == SQLITE_OK) {
        inner_bind(statement, 1, name);
        inner_bind(statement, 2, sql);
        code = sqlite3_step(statement);
        if (code == SQLITE_ROW) {
            if (sqlite3_column_int(statement, 0) != 1) {
                snprintf(differs, 64, "%s", name);
            }
            code = SQLITE_OK;
        }
    }
    sqlite3_finalize(statement);
    return code;
}

static int check_cells(sqlite3 *database, uint32_t number, size_t columns, char differs[64]) {
    char name[32], trigger[64];
    schema_cells_name(name, number);
    struct text sql;
    text_init(&sql);
    cells_sql(&sql, name, columns);
    int code = check_object(database, name, sql.data, differs);
    for (size_t i = 0; i < ACTIONS && code == SQLITE_OK && !*differs; i++) {
        snprintf(trigger, sizeof trigger, "no_%s_%s", actions[i], name);
        cells_seal_sql(&sql, name, actions[i]);
        code = check_object(database, trigger, sql.data, differs);
    }
    text_release(&sql);
    return code;
}

/* A trigger of somebody else's could undo what ours keep. Views, tables and indices of theirs are let be. */
static int check_triggers(sqlite3 *database, sqlite3_int64 wanted, char differs[64]) {
    sqlite3_int64 triggers;
    int code = inner_number(database, "SELECT count(*) FROM sqlite_schema WHERE type = 'trigger'", &triggers);
    if (code == SQLITE_OK && triggers != wanted) {
        snprintf(differs, 64, "a trigger that is not its own");
    }
    return code;
}

int schema_check(sqlite3 *database, char differs[64]) {
    *differs = '\0';
    int code = check_object(database, study_seal.name, study_seal.sql, differs);
    sqlite3_int64 triggers = 1;
    for (size_t i = 0; i < OBJECTS && code == SQLITE_OK && !*differs; i++) {
        code = check_object(database, objects[i].name, objects[i].sql, differs);
        triggers += !strncmp(objects[i].sql, "CREATE TRIGGER", 14);
    }
    if (code != SQLITE_OK || *differs) {
        return code;
    }
    sqlite3_stmt *statement = NULL;
    code = sqlite3_prepare_v2(database, "SELECT received.number, count(columns.number) FROM received LEFT JOIN columns "
        "ON columns.received = received.number GROUP BY received.number", -1, &statement, NULL);
    while (code == SQLITE_OK && !*differs && (code = sqlite3_step(statement)) == SQLITE_ROW) {
        code = check_cells(database, (uint32_t)sqlite3_column_int64(statement, 0),
            (size_t)sqlite3_column_int64(statement, 1), differs);
        triggers += ACTIONS;
    }
    sqlite3_finalize(statement);
    code = code == SQLITE_DONE ? SQLITE_OK : code;
    return code == SQLITE_OK && !*differs ? check_triggers(database, triggers, differs) : code;
}
