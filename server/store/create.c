/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/clock.h"
#include "server/store/inner.h"
#include <stdint.h>
#include <stdio.h>
#include <string.h>
#include <sys/mman.h>
#include <sys/stat.h>

#define MOST_BYTES INT64_C(2147418112) /* of a study: what one block of SQLite's may be, in whole pages */

static int insert_texts(sqlite3 *database, const char *sql, const char *const *texts, int count) {
    sqlite3_stmt *statement = NULL;
    int code = sqlite3_prepare_v2(database, sql, -1, &statement, NULL);
    if (code == SQLITE_OK) {
        for (int i = 0; i < count; i++) {
            inner_bind(statement, i + 1, texts[i]);
        }
        code = sqlite3_step(statement);
        code = code == SQLITE_DONE ? SQLITE_OK : code;
    }
    sqlite3_finalize(statement);
    return code;
}

static int insert_value(sqlite3 *database, const char *key, const char *value) {
    const char *const texts[] = {key, value};
    return insert_texts(database, "INSERT INTO study(key, value) VALUES(?1, ?2)", texts, 2);
}

static int insert_file(sqlite3 *database, struct store_file *file, const char *at, const char *by) {
    hash_of(file->bytes, file->length, file->sha256);
    sqlite3_stmt *statement = NULL;
    int code = sqlite3_prepare_v2(database, "INSERT INTO received(number, version, name, received_at, received_by, "
        "sha256, bytes) VALUES(?1, 0, ?2, ?3, ?4, ?5, ?6)", -1, &statement, NULL);
    if (code == SQLITE_OK) {
        sqlite3_bind_int64(statement, 1, file->number);
        inner_bind(statement, 2, file->name);
        inner_bind(statement, 3, at);
        inner_bind(statement, 4, by);
        inner_bind(statement, 5, file->sha256);
        sqlite3_bind_blob64(statement, 6, file->bytes, file->length, SQLITE_STATIC);
        code = sqlite3_step(statement);
        code = code == SQLITE_DONE ? SQLITE_OK : code;
    }
    sqlite3_finalize(statement);
    return code;
}

static int insert_columns(sqlite3 *database, uint32_t number, const struct store_table *table) {
    sqlite3_stmt *statement = NULL;
    int code = sqlite3_prepare_v2(database, "INSERT INTO columns(received, number, name) VALUES(?1, ?2, ?3)", -1,
        &statement, NULL);
    for (size_t c = 0; c < table->columns && code == SQLITE_OK; c++) {
        sqlite3_reset(statement);
        sqlite3_bind_int64(statement, 1, number);
        sqlite3_bind_int64(statement, 2, (sqlite3_int64)c + 1);
        inner_bind(statement, 3, table->names[c]);
        code = sqlite3_step(statement);
        code = code == SQLITE_DONE ? SQLITE_OK : code;
    }
    sqlite3_finalize(statement);
    return code;
}

static sqlite3_stmt *prepare_record(sqlite3 *database, uint32_t number, size_t columns, int *code) {
    char name[32];
    schema_cells_name(name, number);
    struct text sql;
    text_init(&sql);
    text_format(&sql, "INSERT INTO %s VALUES(?", name);
    for (size_t c = 0; c < columns; c++) {
        text_literal(&sql, ",?");
    }
    text_literal(&sql, ")");
    sqlite3_stmt *statement = NULL;
    *code = sqlite3_prepare_v2(database, sql.data, -1, &statement, NULL);
    text_release(&sql);
    return statement;
}

static int insert_cells(sqlite3 *database, uint32_t number, const struct store_table *table) {
    int code;
    sqlite3_stmt *statement = prepare_record(database, number, table->columns, &code);
    const uint32_t *start = table->start;
    int columns = (int)table->columns;
    for (size_t r = 0; r < table->records && code == SQLITE_OK; r++) {
        sqlite3_bind_int64(statement, 1, (sqlite3_int64)r + 1);
        for (int c = 0; c < columns; c++, start++) {
            sqlite3_bind_text(statement, c + 2, table->bytes + start[0], (int)(start[1] - start[0] - 1), SQLITE_STATIC);
        }
        sqlite3_step(statement);
        code = sqlite3_reset(statement);
    }
    sqlite3_finalize(statement);
    return code;
}

static int insert_table(sqlite3 *database, uint32_t number, const struct store_table *table) {
    int code = insert_columns(database, number, table);
    code = code == SQLITE_OK ? schema_make_cells(database, number, table->columns) : code;
    code = code == SQLITE_OK ? insert_cells(database, number, table) : code;
    return code == SQLITE_OK ? schema_seal_cells(database, number) : code;
}

static int insert_values(sqlite3 *database, const struct store_birth *birth, const char *at) {
    char format[16];
    snprintf(format, sizeof format, "%d", FORMAT);
    const struct store_value own[] = {{"format", format}, {"created_at", at}, {"created_by", birth->by}};
    int code = SQLITE_OK;
    for (size_t i = 0; i < sizeof own / sizeof *own && code == SQLITE_OK; i++) {
        code = insert_value(database, own[i].key, own[i].value);
    }
    for (size_t i = 0; i < birth->value_count && code == SQLITE_OK; i++) {
        code = insert_value(database, birth->values[i].key, birth->values[i].value);
    }
    return code;
}

static int insert_record(sqlite3 *database, const struct store_birth *birth, const char *at, struct arena *arena) {
    char zero[HASH_SIZE];
    int code = chain_entry_zero(database, zero);
    code = code == SQLITE_OK ? insert_value(database, "entry_zero", zero) : code;
    code = code == SQLITE_OK ? schema_seal_study(database) : code;
    /* On copies: a time given here would not outlive the arena. */
    struct stored_decision *decisions = ARENA_NEW(arena, birth->decision_count, struct stored_decision);
    for (size_t i = 0; i < birth->decision_count; i++) {
        decisions[i] = birth->decisions[i];
        decisions[i].at = decisions[i].at ? decisions[i].at : at;
    }
    code = code == SQLITE_OK ? record_add(database, arena, 0, zero, decisions, birth->decision_count) : code;
    for (size_t i = 0; i < birth->decision_count; i++) {
        birth->decisions[i].number = decisions[i].number;
        memcpy(birth->decisions[i].hash, decisions[i].hash, HASH_SIZE);
    }
    return code;
}

static int fill(sqlite3 *database, const struct store_birth *birth, const char *at, struct arena *arena) {
    const char *const plan[] = {at, birth->plan};
    int code = schema_make(database);
    for (size_t f = 0; f < birth->file_count && code == SQLITE_OK; f++) {
        struct store_file *file = &birth->files[f];
        file->number = (uint32_t)f + 1;
        code = insert_file(database, file, at, birth->by);
        code = code == SQLITE_OK ? insert_table(database, file->number, &birth->tables[f]) : code;
    }
    code = code == SQLITE_OK ? insert_texts(database, "INSERT INTO plan(number, version, entered_at, text) VALUES(1, "
        "0, ?1, ?2)", plan, 2) : code;
    code = code == SQLITE_OK ? insert_values(database, birth, at) : code;
    if (code == SQLITE_OK && birth->settle && !birth->settle(birth->context)) {
        return SQLITE_ABORT;
    }
    return code == SQLITE_OK ? insert_record(database, birth, at, arena) : code;
}

static int make(sqlite3 *database, const struct store_birth *birth, const char *at, struct arena *arena) {
    char marks[128];
    snprintf(marks, sizeof marks, "PRAGMA application_id=%d; PRAGMA user_version=%d; PRAGMA journal_mode=OFF; BEGIN",
        APPLICATION, FORMAT);
    int code = inner_run(database, marks); /* first: a defensive connection keeps its rollback journal */
    code = code == SQLITE_OK ? inner_settle(database) : code;
    code = code == SQLITE_OK ? fill(database, birth, at, arena) : code;
    return code == SQLITE_OK ? inner_run(database, "COMMIT") : code;
}

static bool check_width(sqlite3 *database, const struct store_birth *birth, const char *path, struct fault *fault) {
    size_t most = (size_t)sqlite3_limit(database, SQLITE_LIMIT_COLUMN, -1) - 1; /* one is the record's number */
    for (size_t f = 0; f < birth->file_count; f++) {
        if (birth->tables[f].columns > most) {
            return fault_set(fault, FAULT_INPUT, "%s has %zu columns and a study takes at most %zu; take out what the "
                "plan does not need and load again (%s was not made)", birth->files[f].name, birth->tables[f].columns,
                most, path);
        }
    }
    return true;
}

static bool write_out(sqlite3 *database, const char *path, struct fault *fault) {
    sqlite3_int64 length;
    const unsigned char *bytes = sqlite3_serialize(database, "main", &length, SQLITE_SERIALIZE_NOCOPY); /* the database's own */
    if (!bytes) {
        return fault_set(fault, FAULT_SYSTEM, "%s would be larger than this machine's memory or 2 GB; load fewer "
            "columns or records", path);
    }
    bool done = newfile_write(path, bytes, (size_t)length, fault);
    return done;
}

/* About what the study will take: the received bytes, each cell with a byte for its length, some bytes a record, and a tenth
 * for the pages. It grows where that is too little. */
static sqlite3_int64 room_wanted(const struct store_birth *birth) {
    double room = 1 << 20;
    for (size_t f = 0; f < birth->file_count; f++) {
        const struct store_table *table = &birth->tables[f];
        room += 1.1 * ((double)birth->files[f].length + (double)table->start[table->records * table->columns] + 10.0 * (double)table->records);
    }
    return room < MOST_BYTES ? (sqlite3_int64)room : MOST_BYTES;
}

/* One block for the whole study, in large pages where the system has them: filling it for the first time is then half as
 * dear. That is advice only. */
static int make_room(sqlite3 *database, const struct store_birth *birth) {
    enum { LARGE_PAGE = 1 << 21 };
    sqlite3_int64 room = room_wanted(birth), most = MOST_BYTES;
    unsigned char *block = sqlite3_malloc64((sqlite3_uint64)room);
    if (!block) {
        return SQLITE_NOMEM;
    }
    uintptr_t start = ((uintptr_t)block + LARGE_PAGE - 1) / LARGE_PAGE * LARGE_PAGE, end = ((uintptr_t)block + (size_t)room) / LARGE_PAGE * LARGE_PAGE;
    if (start < end) {
        madvise((void *)start, end - start, MADV_HUGEPAGE);
    }
    int code = sqlite3_deserialize(database, "main", block, 0, room, SQLITE_DESERIALIZE_FREEONCLOSE | SQLITE_DESERIALIZE_RESIZEABLE);
    return code == SQLITE_OK ? sqlite3_file_control(database, "main", SQLITE_FCNTL_SIZE_LIMIT, &most) : code;
}

/* The study is built in memory and written in one go: no half of it is ever on disk under its name. */
bool store_create(const char *path, const struct store_birth *birth, struct fault *fault) {
    BUG_IF(!birth->file_count || !birth->plan || !birth->by);
    struct stat there;
    if (lstat(path, &there) == 0) {
        return newfile_refuse_existing(path, fault);
    }
    char now[CLOCK_SIZE];
    clock_utc(now);
    struct arena arena;
    arena_init(&arena);
    sqlite3 *database = NULL;
    int code = sqlite3_open_v2(":memory:", &database, SQLITE_OPEN_READWRITE | SQLITE_OPEN_CREATE | SQLITE_OPEN_NOMUTEX,
        NULL);
    code = code == SQLITE_OK ? make_room(database, birth) : code;
    bool done = code == SQLITE_OK || inner_fault(database, code, path, fault);
    done = done && check_width(database, birth, path, fault);
    if (done) {
        code = make(database, birth, birth->at ? birth->at : now, &arena);
        done = code == SQLITE_OK ? write_out(database, path, fault) : inner_fault(database, code, path, fault);
    }
    sqlite3_close(database);
    arena_release(&arena);
    return done;
}
