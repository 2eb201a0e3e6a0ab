/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The study file: what goes in comes out, rows are only added, what is acknowledged survives a kill, and no altered
 * byte of the record goes unnoticed. SQLite itself (sqlite3.h) and the kernel (kill, RLIMIT_FSIZE) are the outside. */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <cmocka.h>
#include "base/clock.h"
#include "base/text.h"
#include "intake/cells.h"
#include "store/store.h"
#include <dirent.h>
#include <errno.h>
#include <pthread.h>
#include <signal.h>
#include <sqlite3.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/resource.h>
#include <sys/stat.h>
#include <sys/wait.h>
#include <time.h>
#include <unistd.h>

static char folder[64];
static const char csv[] = "pid,arm,sbp\nQ1,L,142\nQ2,W, 999\nQ3,L,\n";
static const char plan[] = "{\"title\": \"Quayside Walking Trial\"}";

static char *place(char room[256], const char *name) {
    snprintf(room, 256, "%s/%s", folder, name);
    return room;
}

static int make_folder(void **state) {
    (void)state;
    strcpy(folder, "/tmp/evenhand-test-XXXXXX");
    return mkdtemp(folder) ? 0 : -1;
}

static int remove_folder(void **state) {
    (void)state;
    char command[128];
    snprintf(command, sizeof command, "rm -rf '%s'", folder);
    return system(command);
}

static size_t count_files(void) {
    size_t count = 0;
    DIR *listing = opendir(folder);
    for (struct dirent *entry; (entry = readdir(listing));) {
        count += strcmp(entry->d_name, ".") && strcmp(entry->d_name, "..");
    }
    closedir(listing);
    return count;
}

static struct stored_decision decision_of(const char *participant, const char *reason) {
    return (struct stored_decision){.by = "M. Tide, statistician", .account = "tide", .kind = "correct",
        .participant = participant, .column = "sbp", .from = "999", .to = "99", .reason = reason, .blinding = "pooled",
        .body = "{\"kind\": \"correct\"}"};
}

/* A study of `csv` and two decisions about its codes for missing. */
static bool create(const char *path, struct fault *fault) {
    struct cells cells;
    fault_init(fault);
    if (!cells_read(&cells, csv, sizeof csv - 1, "export.csv", fault)) {
        return false;
    }
    struct store_file file = {.name = "export.csv", .bytes = csv, .length = sizeof csv - 1};
    struct store_table table = {cells.records, cells.columns, cells.names, cells.bytes, cells.start};
    const struct store_value values[] = {{"letters", "L=A W=B"}, {"seed", "20261201"}};
    struct stored_decision decisions[] = {decision_of(NULL, "code for missing"),
        decision_of("Q2", "caf\xC3\xA9 \"'\n")};
    decisions[0].kind = "missing-code";
    decisions[0].from = decisions[0].to = NULL;
    decisions[1].at = "2026-12-01T10:00:00Z";
    struct store_birth birth = {.files = &file, .tables = &table, .file_count = 1, .plan = plan, .values = values,
        .value_count = 2, .by = "M. Tide, statistician", .at = "2026-12-01T09:00:00Z", .decisions = decisions,
        .decision_count = 2};
    bool done = store_create(path, &birth, fault);
    if (done) {
        assert_int_equal(decisions[1].number, 2);
        assert_int_equal(strlen(decisions[1].hash), 64);
        assert_int_equal(strlen(file.sha256), 64);
    }
    cells_release(&cells);
    return done;
}

static void fresh(char path[256], const char *name) {
    struct fault fault;
    unlink(place(path, name));
    if (!create(path, &fault)) {
        fail_msg("%s", fault.message);
    }
}

static struct store *opened(const char *path, bool read_only) {
    struct fault fault;
    fault_init(&fault);
    struct store *store = store_open(path, read_only, &fault);
    if (!store) {
        fail_msg("%s", fault.message);
    }
    return store;
}

/* Runs SQL as anyone could, on the file; returns SQLite's message, "" where it went through. */
static const char *by_hand(const char *path, const char *sql) {
    static char message[256];
    sqlite3 *database;
    assert_int_equal(sqlite3_open(path, &database), SQLITE_OK);
    char *error = NULL;
    sqlite3_exec(database, sql, NULL, NULL, &error);
    snprintf(message, sizeof message, "%s", error ? error : "");
    sqlite3_free(error);
    sqlite3_close(database);
    return message;
}

static void gives_back_what_went_in(void **state) {
    (void)state;
    char path[256];
    struct fault fault;
    struct arena arena;
    fault_init(&fault);
    arena_init(&arena);
    fresh(path, "whole.study");
    struct store *store = opened(path, true);
    static const struct store_value wanted[] = {{"letters", "L=A W=B"}, {"seed", "20261201"}, {"format", "1"},
        {"created_at", "2026-12-01T09:00:00Z"}, {"created_by", "M. Tide, statistician"}};
    const char *text;
    for (size_t i = 0; i < sizeof wanted / sizeof *wanted; i++) {
        assert_true(store_value(store, &arena, wanted[i].key, &text, &fault));
        assert_string_equal(text, wanted[i].value);
    }
    assert_true(store_value(store, &arena, "no such key", &text, &fault));
    assert_null(text);
    assert_true(store_plan(store, &arena, &text, &fault));
    assert_string_equal(text, plan);

    struct store_file file, *files;
    size_t count;
    assert_true(store_files(store, &arena, &files, &count, &fault));
    assert_int_equal(count, 1);
    assert_true(store_received(store, &arena, 0, &file, &fault));
    assert_int_equal(file.length, sizeof csv - 1);
    assert_memory_equal(file.bytes, csv, sizeof csv);
    assert_string_equal(file.name, "export.csv");
    assert_string_equal(file.sha256, files[0].sha256);
    assert_false(store_received(store, &arena, 2, &file, &fault));
    assert_int_equal(fault.code, FAULT_MISSING);

    struct stored_decision *decisions;
    assert_true(store_decisions(store, &arena, 0, &decisions, &count, &fault));
    assert_int_equal(count, 2);
    assert_string_equal(decisions[0].at, "2026-12-01T09:00:00Z");
    assert_null(decisions[0].participant);
    assert_null(decisions[0].from);
    assert_string_equal(decisions[1].at, "2026-12-01T10:00:00Z");
    assert_string_equal(decisions[1].reason, "caf\xC3\xA9 \"'\n");
    assert_string_equal(decisions[1].to, "99");
    assert_null(decisions[1].evidence);
    uint32_t version;
    char head[HASH_SIZE];
    assert_true(store_version(store, &version, head, &fault));
    assert_int_equal(version, 2);
    assert_string_equal(head, decisions[1].hash);
    assert_true(store_decisions(store, &arena, 1, &decisions, &count, &fault));
    assert_int_equal(count, 1);
    assert_int_equal(decisions[0].number, 2);

    struct store_verdict verdict;
    assert_true(store_verify(store, &verdict, &fault));
    assert_true(verdict.sound);
    assert_string_equal(store_path(store), path);
    store_close(store);
    arena_release(&arena);
}

/* The cells are plain SQL's, one row per record, as received. */
static void can_be_read_with_sql(void **state) {
    (void)state;
    char path[256];
    fresh(path, "sql.study");
    sqlite3 *database;
    sqlite3_stmt *statement;
    sqlite3_open_v2(path, &database, SQLITE_OPEN_READONLY, NULL);
    assert_int_equal(sqlite3_prepare_v2(database,
        "SELECT group_concat(record || c1 || c2 || '[' || c3 || ']') FROM cells",
        -1, &statement, NULL), SQLITE_OK);
    assert_int_equal(sqlite3_step(statement), SQLITE_ROW);
    assert_string_equal(sqlite3_column_text(statement, 0), "1Q1L[142],2Q2W[ 999],3Q3L[]");
    sqlite3_finalize(statement);
    sqlite3_close(database);
}

/* SHA-256 of the received bytes against coreutils' sha256sum. */
static void hashes_what_was_received(void **state) {
    (void)state;
    char path[256], name[256], command[300], wanted[HASH_SIZE] = "";
    struct fault fault;
    struct arena arena;
    struct store_file file;
    fault_init(&fault);
    arena_init(&arena);
    fresh(path, "sum.study");
    FILE *out = fopen(place(name, "sum.csv"), "w");
    fwrite(csv, 1, sizeof csv - 1, out);
    fclose(out);
    snprintf(command, sizeof command, "sha256sum '%s'", name);
    FILE *sum = popen(command, "r");
    assert_int_equal(fscanf(sum, "%64s", wanted), 1);
    pclose(sum);
    unlink(name);
    struct store *store = opened(path, true);
    assert_true(store_received(store, &arena, 1, &file, &fault));
    assert_string_equal(file.sha256, wanted);
    store_close(store);
    arena_release(&arena);
}

static void overwrites_nothing(void **state) {
    (void)state;
    char path[256], wanted[512];
    struct fault fault;
    FILE *file = fopen(place(path, "mine.txt"), "w");
    fputs("keep me", file);
    fclose(file);
    assert_false(create(path, &fault));
    assert_int_equal(fault.code, FAULT_REFUSED);
    snprintf(wanted, sizeof wanted, "%s is there already and stays as it is; choose another name or move it away",
        path);
    assert_string_equal(fault.message, wanted);
    char kept[16] = "";
    file = fopen(path, "r");
    assert_int_equal(fread(kept, 1, sizeof kept, file), 7);
    fclose(file);
    assert_string_equal(kept, "keep me");
    assert_false(create(folder, &fault));
    assert_false(create("/no/such/folder/x.study", &fault));
    assert_string_equal(fault.message, "/no/such/folder/x.study could not be written (No such file or directory) and "
        "nothing was left behind; see to the folder or the disk and try again");
}

static void lets_rows_only_be_added(void **state) {
    (void)state;
    static const struct attempt {
        const char *sql, *message;
    } attempts[] = {
        {"UPDATE study SET value = 'x'", "rows of study are kept as they are"},
        {"DELETE FROM study WHERE key = 'letters'", "rows of study are kept as they are"},
        {"INSERT OR REPLACE INTO study VALUES('letters', 'x')", "rows of study are kept as they are"},
        {"UPDATE received SET name = 'x'", "rows of received are kept as they are"},
        {"DELETE FROM received", "rows of received are kept as they are"},
        {"INSERT OR REPLACE INTO received VALUES(1, 0, 'x', 'x', 'x', 'x', x'00')",
            "rows of received are numbered one by one"},
        {"UPDATE plan SET text = '{}'", "rows of plan are kept as they are"},
        {"DELETE FROM plan", "rows of plan are kept as they are"},
        {"REPLACE INTO plan VALUES(1, 0, 'x', 'x')", "rows of plan are numbered one by one"},
        {"UPDATE columns SET name = 'x'", "rows of columns are kept as they are"},
        {"DELETE FROM columns", "rows of columns are kept as they are"},
        {"REPLACE INTO columns VALUES(1, 1, 'x')", "rows of columns are kept as they are"},
        {"UPDATE cells SET c1 = 'x' WHERE record = 1", "rows of cells are kept as they are"},
        {"DELETE FROM cells", "rows of cells are kept as they are"},
        {"INSERT INTO cells VALUES(4, 'x', 'x', 'x')", "rows of cells are kept as they are"},
        {"REPLACE INTO cells VALUES(1, 'x', 'x', 'x')", "rows of cells are kept as they are"},
        {"UPDATE decisions SET reason = 'x'", "rows of decisions are kept as they are"},
        {"DELETE FROM decisions WHERE number = 2", "rows of decisions are kept as they are"},
        {"REPLACE INTO decisions SELECT * FROM decisions WHERE number = 2",
            "rows of decisions are numbered one by one"},
        {"INSERT INTO decisions(number, entered_at, entered_by, kind, blinding, body, hash) "
            "VALUES(9, 'x', 'x', 'x', 'x', 'x', 'x')", "rows of decisions are numbered one by one"},
        {"INSERT INTO looks VALUES(2, 'x', 'x', 'x', 'x', 1, 'x')", "rows of looks are numbered one by one"},
    };
    char path[256];
    fresh(path, "kept.study");
    for (size_t i = 0; i < sizeof attempts / sizeof *attempts; i++) {
        const char *got = by_hand(path, attempts[i].sql);
        if (strcmp(got, attempts[i].message)) {
            fail_msg("%s: \"%s\"", attempts[i].sql, got);
        }
    }
    struct store_verdict verdict;
    struct fault fault;
    fault_init(&fault);
    struct store *store = opened(path, true);
    assert_true(store_verify(store, &verdict, &fault) && verdict.sound);
    store_close(store);
}

static void appends_all_or_none(void **state) {
    (void)state;
    char path[256], wanted[512];
    struct fault fault;
    struct arena arena;
    fault_init(&fault);
    arena_init(&arena);
    fresh(path, "append.study");
    struct store *store = opened(path, false), *other = opened(path, false), *reader = opened(path, true);
    struct stored_decision batch[] = {decision_of("Q1", "one"), decision_of("Q3", "two")};
    assert_false(store_changed(store));
    assert_true(store_append(store, &arena, 2, batch, 2, &fault));
    assert_int_equal(batch[1].number, 4);
    assert_int_equal(strlen(batch[0].at), strlen("2026-12-01T18:30:05Z"));
    assert_false(store_changed(store));
    assert_true(store_changed(other));
    assert_false(store_changed(other));

    struct stored_decision late = decision_of("Q1", "late");
    assert_false(store_append(other, &arena, 2, &late, 1, &fault));
    assert_int_equal(fault.code, FAULT_CONFLICT);
    snprintf(wanted, sizeof wanted, "%s: the study stands at version 4 by now and this was decided at version 2; look "
        "again and decide anew", path);
    assert_string_equal(fault.message, wanted);
    fault_init(&fault);
    assert_true(store_append(other, &arena, 4, &late, 1, &fault));

    assert_false(store_append(reader, &arena, 5, &late, 1, &fault));
    assert_int_equal(fault.code, FAULT_REFUSED);
    snprintf(wanted, sizeof wanted, "%s: the study may not be written and nothing was changed; allow writing to the "
        "file and its folder and try again", path);
    assert_string_equal(fault.message, wanted);

    fault_init(&fault);
    uint32_t version;
    char head[HASH_SIZE];
    assert_true(store_version(reader, &version, head, &fault));
    assert_int_equal(version, 5);
    assert_string_equal(head, late.hash);
    struct stored_look look = {.by = "M. Tide, statistician", .exhibit = "effect", .arguments = "outcome=sbp",
        .version = 5}, *looks;
    assert_true(store_append_look(store, &arena, &look, &fault));
    look.at = NULL;
    assert_true(store_append_look(store, &arena, &look, &fault));
    size_t count;
    assert_true(store_looks(reader, &arena, &looks, &count, &fault));
    assert_int_equal(count, 2);
    assert_string_equal(looks[1].arguments, "outcome=sbp");
    assert_string_not_equal(looks[0].hash, looks[1].hash);
    struct store_verdict verdict;
    assert_true(store_verify(reader, &verdict, &fault));
    assert_string_equal(verdict.sentence, "");
    assert_true(store_version(reader, &version, NULL, &fault)); /* a look is no decision */
    assert_int_equal(version, 5);
    store_close(store);
    store_close(other);
    store_close(reader);
    arena_release(&arena);
}

/* Another program in the middle of a write: a sentence after five seconds, and nothing changed. */
static void waits_then_says_so(void **state) {
    (void)state;
    char path[256], wanted[512];
    struct fault fault;
    struct arena arena;
    fault_init(&fault);
    arena_init(&arena);
    fresh(path, "busy.study");
    struct store *store = opened(path, false);
    sqlite3 *holder;
    sqlite3_open(path, &holder);
    sqlite3_exec(holder, "BEGIN IMMEDIATE", NULL, NULL, NULL);
    struct stored_decision decision = decision_of("Q1", "waiting");
    double start = clock_seconds();
    assert_false(store_append(store, &arena, 2, &decision, 1, &fault));
    assert_true(clock_seconds() - start > 4);
    snprintf(wanted, sizeof wanted, "%s: another program has kept the study to itself for five seconds; close that "
        "program or try again", path);
    assert_string_equal(fault.message, wanted);
    sqlite3_close(holder);
    fault_init(&fault);
    assert_true(store_append(store, &arena, 2, &decision, 1, &fault));
    store_close(store);
    arena_release(&arena);
}

struct crowd {
    struct store *store;
    int appended, conflicts;
};

static void *append_some(void *argument) {
    struct crowd *crowd = argument;
    struct arena arena;
    arena_init(&arena);
    while (crowd->appended < 20) {
        struct fault fault;
        uint32_t version;
        fault_init(&fault);
        struct stored_decision decision = decision_of("Q1", "crowd");
        if (store_version(crowd->store, &version, NULL, &fault) &&
            store_append(crowd->store, &arena, version, &decision, 1, &fault)) {
            crowd->appended++;
        } else if (fault.code == FAULT_CONFLICT) {
            crowd->conflicts++;
        } else {
            break;
        }
    }
    arena_release(&arena);
    return NULL;
}

static void serves_several_threads(void **state) {
    (void)state;
    char path[256];
    struct fault fault;
    fault_init(&fault);
    fresh(path, "crowd.study");
    struct store *store = opened(path, false);
    struct crowd crowds[3] = {{store, 0, 0}, {store, 0, 0}, {store, 0, 0}};
    pthread_t threads[3];
    for (int i = 0; i < 3; i++) {
        assert_int_equal(pthread_create(&threads[i], NULL, append_some, &crowds[i]), 0);
    }
    for (int i = 0; i < 3; i++) {
        pthread_join(threads[i], NULL);
        assert_int_equal(crowds[i].appended, 20);
    }
    uint32_t version;
    struct store_verdict verdict;
    assert_true(store_version(store, &version, NULL, &fault));
    assert_int_equal(version, 62);
    assert_true(store_verify(store, &verdict, &fault) && verdict.sound);
    store_close(store);
}

/* ---- what is not a study ---- */

static void write_bytes(const char *path, const char *bytes) {
    FILE *file = fopen(path, "w");
    fputs(bytes, file);
    fclose(file);
}
static void make_missing(const char *path) { unlink(path); }
static void make_empty(const char *path) { write_bytes(path, ""); }
static void make_text(const char *path) { write_bytes(path, "pid,arm\n1,L\n"); }
static void make_a_folder(const char *path) { mkdir(path, 0700); }
static void make_long_text(const char *path) {
    FILE *file = fopen(path, "w");
    for (int i = 0; i < 5000; i++) {
        fputs("pid,arm\n", file);
    }
    fclose(file);
}
static void make_foreign(const char *path) { by_hand(path, "CREATE TABLE t(x); INSERT INTO t VALUES(1)"); }
static void make_pipe(const char *path) { mkfifo(path, 0600); }
static void alter(const char *path, const char *sql) {
    struct fault fault;
    assert_true(create(path, &fault));
    assert_string_equal(by_hand(path, sql), "");
}
static void make_newer(const char *path) { alter(path, "PRAGMA user_version = 2"); }
static void make_unversioned(const char *path) { alter(path, "PRAGMA user_version = 0"); }
static void drop_trigger(const char *path) { alter(path, "DROP TRIGGER no_UPDATE_decisions"); }
static void drop_table(const char *path) { alter(path, "DROP TABLE looks"); }
static void widen_table(const char *path) { alter(path, "ALTER TABLE decisions ADD COLUMN more TEXT"); }
static void add_trigger(const char *path) {
    alter(path, "CREATE TRIGGER mine AFTER INSERT ON decisions BEGIN SELECT 1; END");
}
static void soften_cells(const char *path) { alter(path, "DROP TRIGGER no_UPDATE_cells"); }
static void cut_off(const char *path) {
    struct fault fault;
    assert_true(create(path, &fault));
    assert_int_equal(truncate(path, 3 * 4096), 0);
}
static void scribble(const char *path) {
    struct fault fault;
    assert_true(create(path, &fault));
    FILE *file = fopen(path, "r+");
    fseek(file, 4096, SEEK_SET);
    for (int i = 0; i < 4096; i++) {
        fputc(0x55, file);
    }
    fclose(file);
}

#define NO_STUDY "; a study is made by `evenhand load`"
#define DAMAGED ": the study is damaged; take a copy of it kept elsewhere"
static const struct refusal {
    const char *what;
    void (*make)(const char *path);
    enum fault_code code;
    const char *sentence; /* after the path */
} refusals[] = {
    {"missing", make_missing, FAULT_MISSING, " is not there; check the name, or make the study with `evenhand load`"},
    {"empty", make_empty, FAULT_INPUT, " is empty and no study" NO_STUDY},
    {"folder", make_a_folder, FAULT_INPUT, " is a folder; name the study file in it"},
    {"pipe", make_pipe, FAULT_INPUT, " is not an ordinary file; name a study file"},
    {"text", make_text, FAULT_INPUT, ": this is not a study" NO_STUDY},
    {"long text", make_long_text, FAULT_INPUT, ": this is not a study" NO_STUDY},
    {"foreign", make_foreign, FAULT_INPUT, ": this SQLite file belongs to another program and is no study" NO_STUDY},
    {"no version", make_unversioned, FAULT_INPUT,
        ": this SQLite file belongs to another program and is no study" NO_STUDY},
    {"newer", make_newer, FAULT_INPUT,
        ": a newer Evenhand made this study (format 2, this one reads up to 1); open it with that"},
    {"trigger dropped", drop_trigger, FAULT_INPUT, ": the study was altered: no_UPDATE_decisions is not as this "
        "program makes it; take a copy kept elsewhere"},
    {"table dropped", drop_table, FAULT_INPUT, ": the study was altered: looks is not as this program makes it; take a "
        "copy kept elsewhere"},
    {"table widened", widen_table, FAULT_INPUT, ": the study was altered: decisions is not as this program makes it; "
        "take a copy kept elsewhere"},
    {"trigger of somebody else's", add_trigger, FAULT_INPUT, ": the study was altered: a trigger that is not its own "
        "is not as this program makes it; take a copy kept elsewhere"},
    {"cells without their trigger", soften_cells, FAULT_INPUT, ": the study was altered: no_UPDATE_cells is not as "
        "this program makes it; take a copy kept elsewhere"},
    {"cut off", cut_off, FAULT_INPUT, DAMAGED},
    {"scribbled over", scribble, FAULT_INPUT, DAMAGED},
};

static void refuses_what_is_no_study(void **state) {
    (void)state;
    for (size_t i = 0; i < sizeof refusals / sizeof *refusals; i++) {
        char path[256], wanted[700];
        struct fault fault;
        fault_init(&fault);
        refusals[i].make(place(path, "odd.study"));
        for (int read_only = 0; read_only < 2; read_only++) {
            fault_init(&fault);
            struct store *store = store_open(path, read_only, &fault);
            snprintf(wanted, sizeof wanted, "%s%s", path, refusals[i].sentence);
            if (store || fault.code != refusals[i].code || strcmp(fault.message, wanted)) {
                fail_msg("%s: %s", refusals[i].what, store ? "was opened" : fault.message);
            }
        }
        remove(path);
    }
    store_close(NULL);
}

/* A view or an index of the reader's own does no harm and is let be. */
static void lets_views_be(void **state) {
    (void)state;
    char path[256];
    fresh(path, "view.study");
    assert_string_equal(by_hand(path, "CREATE VIEW mine AS SELECT c1 FROM cells"), "");
    store_close(opened(path, false));
}

/* Somebody's tool left write-ahead logging on: back to one file. */
static void goes_back_to_one_file(void **state) {
    (void)state;
    char path[256];
    fresh(path, "wal.study");
    assert_string_equal(by_hand(path, "PRAGMA journal_mode = WAL"), "");
    store_close(opened(path, false));
    sqlite3 *database;
    sqlite3_stmt *statement;
    sqlite3_open(path, &database);
    sqlite3_prepare_v2(database, "PRAGMA journal_mode", -1, &statement, NULL);
    assert_int_equal(sqlite3_step(statement), SQLITE_ROW);
    assert_string_equal(sqlite3_column_text(statement, 0), "delete");
    sqlite3_finalize(statement);
    sqlite3_close(database);
}

static void may_not_be_read(void **state) {
    (void)state;
    char path[256], wanted[400];
    struct fault fault;
    fault_init(&fault);
    fresh(path, "private.study");
    /* Root reads everything, so the question is asked by somebody who is not root. */
    chmod(folder, 0755);
    chmod(path, 0000);
    pid_t child = fork();
    if (child == 0) {
        if (getuid() == 0 && setuid(65534) != 0) {
            _exit(2);
        }
        snprintf(wanted, sizeof wanted, "%s may not be read (Permission denied); ask its owner for permission", path);
        bool refused = !store_open(path, true, &fault) && !strcmp(fault.message, wanted);
        _exit(refused ? 0 : 1);
    }
    int status;
    waitpid(child, &status, 0);
    assert_int_equal(status, 0);
    /* And what may be read but not written opens, shows, and refuses to append. */
    chmod(path, 0444);
    child = fork();
    if (child == 0) {
        if (getuid() == 0 && setuid(65534) != 0) {
            _exit(2);
        }
        struct arena arena;
        arena_init(&arena);
        struct store *store = store_open(path, false, &fault);
        struct stored_decision decision = decision_of("Q1", "unwanted");
        bool refused = store && !store_append(store, &arena, 2, &decision, 1, &fault) && fault.code == FAULT_REFUSED;
        store_close(store);
        arena_release(&arena);
        _exit(refused ? 0 : 1);
    }
    waitpid(child, &status, 0);
    assert_int_equal(status, 0);
}

/* ---- alterations ---- */

/* Takes the trigger away, alters, and puts it back exactly as it was: only the hashes can tell. */
static void alter_behind(const char *path, const char *table, const char *sql) {
    sqlite3 *database;
    sqlite3_open(path, &database);
    struct text kept;
    text_init(&kept);
    char *query = sqlite3_mprintf("SELECT name, sql FROM sqlite_schema WHERE type = 'trigger' AND tbl_name = %Q",
        table);
    sqlite3_stmt *statement;
    sqlite3_prepare_v2(database, query, -1, &statement, NULL);
    struct text drops;
    text_init(&drops);
    while (sqlite3_step(statement) == SQLITE_ROW) {
        text_format(&drops, "DROP TRIGGER %s;", (const char *)sqlite3_column_text(statement, 0));
        text_format(&kept, "%s;", (const char *)sqlite3_column_text(statement, 1));
    }
    sqlite3_finalize(statement);
    sqlite3_free(query);
    assert_int_equal(sqlite3_exec(database, drops.data, NULL, NULL, NULL), SQLITE_OK);
    assert_int_equal(sqlite3_exec(database, sql, NULL, NULL, NULL), SQLITE_OK);
    assert_int_equal(sqlite3_exec(database, kept.data, NULL, NULL, NULL), SQLITE_OK);
    sqlite3_close(database);
    text_release(&kept);
    text_release(&drops);
}

#define DECISION_2 "decision 2 does not fit its hash: it or the one before it was altered, added or taken away"
#define LOOK_1 "look 1 does not fit its hash: it or the one before it was altered, added or taken away"
#define ENTRY_0 "entry 0 does not fit its hash: what the study was made with (files, plan, letters) was altered"
static const struct alteration {
    const char *table, *sql;
    uint32_t decision, look;
    const char *sentence;
} alterations[] = {
    {"decisions", "UPDATE decisions SET entered_at = '2026-12-01T10:00:01Z' WHERE number = 2", 2, 0, DECISION_2},
    {"decisions", "UPDATE decisions SET entered_by = 'X' WHERE number = 2", 2, 0, DECISION_2},
    {"decisions", "UPDATE decisions SET account = NULL WHERE number = 2", 2, 0, DECISION_2},
    {"decisions", "UPDATE decisions SET kind = 'note' WHERE number = 2", 2, 0, DECISION_2},
    {"decisions", "UPDATE decisions SET participant = 'Q1' WHERE number = 2", 2, 0, DECISION_2},
    {"decisions", "UPDATE decisions SET column_name = 'x' WHERE number = 2", 2, 0, DECISION_2},
    {"decisions", "UPDATE decisions SET value_from = value_to, value_to = value_from WHERE number = 2", 2, 0,
        DECISION_2},
    {"decisions", "UPDATE decisions SET reason = '' WHERE number = 2", 2, 0, DECISION_2},
    {"decisions", "UPDATE decisions SET evidence = '' WHERE number = 2", 2, 0, DECISION_2}, /* NULL is not "" */
    {"decisions", "UPDATE decisions SET discrepancy = 'd' WHERE number = 2", 2, 0, DECISION_2},
    {"decisions", "UPDATE decisions SET blinding = 'coded' WHERE number = 2", 2, 0, DECISION_2},
    {"decisions", "UPDATE decisions SET body = '{}' WHERE number = 2", 2, 0, DECISION_2},
    {"decisions", "UPDATE decisions SET state_sha256 = 'x' WHERE number = 2", 2, 0, DECISION_2},
    {"decisions", "UPDATE decisions SET hash = replace(hash, substr(hash, 1, 1), 'g') WHERE number = 2", 2, 0,
        DECISION_2},
    {"decisions", "UPDATE decisions SET number = 7 WHERE number = 2", 2, 0, DECISION_2},
    {"decisions", "DELETE FROM decisions WHERE number = 2", 2, 0, DECISION_2},
    {"looks", "UPDATE looks SET exhibit = 'flow' WHERE number = 1", 0, 1, LOOK_1},
    {"looks", "UPDATE looks SET version = 1 WHERE number = 1", 0, 1, LOOK_1},
    {"plan", "UPDATE plan SET text = '{}'", 1, 1, ENTRY_0},
    {"study", "UPDATE study SET value = 'L=B W=A' WHERE key = 'letters'", 1, 1, ENTRY_0},
    {"study", "INSERT INTO study VALUES('more', '1')", 1, 1, ENTRY_0},
    {"study", "UPDATE study SET value = 'x' WHERE key = 'entry_zero'", 0, 0, ENTRY_0},
    {"columns", "UPDATE columns SET name = 'dbp' WHERE number = 3", 1, 1, ENTRY_0},
    {"received", "UPDATE received SET name = 'other.csv'", 1, 1, ENTRY_0},
    {"received", "UPDATE received SET bytes = CAST(replace(CAST(bytes AS TEXT), '142', '143') AS BLOB)", 0, 0,
        "the kept bytes of export.csv no longer have the SHA-256 they were received with"},
};

static void notices_every_alteration(void **state) {
    (void)state;
    for (size_t i = 0; i < sizeof alterations / sizeof *alterations; i++) {
        const struct alteration *alteration = &alterations[i];
        char path[256];
        struct fault fault;
        struct arena arena;
        fault_init(&fault);
        arena_init(&arena);
        fresh(path, "altered.study");
        struct store *store = opened(path, false);
        struct stored_decision decision = decision_of("Q1", "third");
        struct stored_look look = {.by = "M. Tide", .exhibit = "effect", .arguments = "", .version = 3};
        assert_true(store_append(store, &arena, 2, &decision, 1, &fault));
        assert_true(store_append_look(store, &arena, &look, &fault));
        store_close(store);
        alter_behind(path, alteration->table, alteration->sql);
        store = opened(path, true);
        struct store_verdict verdict;
        assert_true(store_verify(store, &verdict, &fault));
        if (verdict.sound || verdict.decision != alteration->decision || verdict.look != alteration->look ||
            strcmp(verdict.sentence, alteration->sentence)) {
            fail_msg("%s: decision %u, look %u, \"%s\"", alteration->sql, verdict.decision, verdict.look,
                verdict.sentence);
        }
        store_close(store);
        arena_release(&arena);
    }
}

/* Every byte of a decision, as it lies in the file, each flipped on its own. */
static void notices_every_flipped_byte(void **state) {
    (void)state;
    char path[256];
    fresh(path, "flipped.study");
    FILE *file = fopen(path, "r+");
    static char bytes[1 << 18];
    size_t length = fread(bytes, 1, sizeof bytes, file);
    static const char first[] = "2026-12-01T10:00:00ZM. Tide"; /* how decision 2 begins */
    char *begin = memmem(bytes, length, first, sizeof first - 1);
    assert_non_null(begin);
    char *end = memmem(begin, length - (size_t)(begin - bytes), "{\"kind\": \"correct\"}", 19);
    assert_non_null(end);
    end += 19 + 64; /* the body, then the hash; state_sha256 is NULL and takes no byte */
    size_t flipped = 0;
    for (char *at = begin; at < end; at++, flipped++) {
        fseek(file, at - bytes, SEEK_SET);
        fputc(*at ^ (1 << (flipped % 8)), file);
        fflush(file);
        struct fault fault;
        fault_init(&fault);
        struct store *store = store_open(path, true, &fault);
        struct store_verdict verdict = {0};
        bool noticed = !store || !store_verify(store, &verdict, &fault) || !verdict.sound;
        store_close(store);
        if (!noticed) {
            fail_msg("byte %zu of decision 2 was flipped and nobody noticed", flipped);
        }
        fseek(file, at - bytes, SEEK_SET);
        fputc(*at, file);
        fflush(file);
    }
    fclose(file);
    assert_true(flipped > 120);
    struct fault fault;
    fault_init(&fault);
    struct store *store = opened(path, true);
    struct store_verdict verdict;
    assert_true(store_verify(store, &verdict, &fault) && verdict.sound);
    store_close(store);
}

static void compares_cells(void **state) {
    (void)state;
    static const struct comparison {
        const char *bytes;
        bool same;
        size_t record, column;
    } comparisons[] = {
        {csv, true, 3, 0},
        {"pid,arm,sbp\nQ1,L,142\nQ2,W,999\nQ3,L,\n", false, 1, 2},
        {"pid,arm,sbp\nQ1,L,142\nQ2,W, 999\n", false, 2, 0},
        {"pid,arm,sbp\nQ1,L,142\nQ2,W, 999\nQ3,L,\nQ4,L,1\n", false, 3, 0},
        {"pid,arm\nQ1,L\nQ2,W\nQ3,L\n", false, 0, 0},
    };
    char path[256];
    fresh(path, "compared.study");
    struct store *store = opened(path, true);
    for (size_t i = 0; i < sizeof comparisons / sizeof *comparisons; i++) {
        struct cells cells;
        struct fault fault;
        fault_init(&fault);
        bool same;
        size_t record, column;
        assert_true(cells_read(&cells, comparisons[i].bytes, strlen(comparisons[i].bytes), "x.csv", &fault));
        struct store_table table = {cells.records, cells.columns, cells.names, cells.bytes, cells.start};
        assert_true(store_compare(store, 1, &table, &same, &record, &column, &fault));
        assert_int_equal(same, comparisons[i].same);
        assert_int_equal(record, comparisons[i].record);
        assert_true(same || column == comparisons[i].column);
        cells_release(&cells);
    }
    store_close(store);
}

/* ---- kills and full disks ---- */

static void pause_for(long microseconds) {
    nanosleep(&(struct timespec){.tv_sec = 0, .tv_nsec = microseconds * 1000}, NULL);
}

/* A child appends and tells each acknowledged number; killed at some moment, all it told of are there. */
static void keeps_what_it_acknowledged(void **state) {
    (void)state;
    char path[256];
    fresh(path, "killed.study");
    for (int round = 0; round < 6; round++) {
        int ends[2];
        assert_int_equal(pipe(ends), 0);
        pid_t child = fork();
        if (child == 0) {
            struct fault fault;
            struct arena arena;
            uint32_t version = 0;
            fault_init(&fault);
            arena_init(&arena);
            struct store *store = store_open(path, false, &fault);
            while (store && store_version(store, &version, NULL, &fault)) {
                struct stored_decision batch[] = {decision_of("Q1", "a"), decision_of("Q2", "b"), decision_of("Q3",
                    "c")};
                if (!store_append(store, &arena, version, batch, 3, &fault) ||
                    write(ends[1], &batch[2].number, sizeof batch[2].number) < 0) {
                    break;
                }
            }
            _exit(1);
        }
        close(ends[1]);
        uint32_t told = 0, number;
        assert_int_equal(read(ends[0], &told, sizeof told), sizeof told); /* at least one */
        pause_for(700 + 1300 * round);
        kill(child, SIGKILL);
        waitpid(child, NULL, 0);
        while (read(ends[0], &number, sizeof number) == sizeof number) {
            told = number;
        }
        close(ends[0]);
        struct fault fault;
        fault_init(&fault);
        struct store *store = opened(path, round % 2); /* a reader too rolls a left journal back */
        uint32_t version;
        struct store_verdict verdict;
        assert_true(store_version(store, &version, NULL, &fault));
        assert_true(store_verify(store, &verdict, &fault));
        if (version < told || (version - 2) % 3 || !verdict.sound) {
            fail_msg("round %d: told %u, kept %u, %s", round, told, version, verdict.sentence);
        }
        store_close(store);
    }
}

/* A child makes studies until it is killed: under each name stands a whole study, and nothing else is left. */
static void leaves_no_half_study(void **state) {
    (void)state;
    char path[256];
    for (int round = 0; round < 5; round++) {
        size_t before = count_files();
        pid_t child = fork();
        if (child == 0) {
            for (int i = 0;; i++) {
                char name[32];
                struct fault fault;
                snprintf(name, sizeof name, "half-%d.study", i);
                create(place(path, name), &fault);
            }
        }
        for (int i = 0; i < 5000 && access(place(path, "half-0.study"), F_OK) != 0; i++) {
            pause_for(1000);
        }
        pause_for(500 + 1700 * round);
        kill(child, SIGKILL);
        waitpid(child, NULL, 0);
        size_t whole = 0;
        for (int i = 0; i < 10000; i++) {
            char name[32];
            snprintf(name, sizeof name, "half-%d.study", i);
            if (access(place(path, name), F_OK) != 0) {
                break;
            }
            store_close(opened(path, true));
            unlink(path);
            whole++;
        }
        assert_int_equal(count_files(), before);
        assert_true(whole > 0);
    }
}

/* The kernel's limit on a file's size stands for the full disk: the write fails halfway. */
static void survives_a_full_disk(void **state) {
    (void)state;
    char path[256];
    fresh(path, "full.study");
    size_t before = count_files();
    pid_t child = fork();
    if (child == 0) {
        char other[256];
        struct fault fault;
        struct arena arena;
        fault_init(&fault);
        arena_init(&arena);
        signal(SIGXFSZ, SIG_IGN);
        struct stat there;
        stat(path, &there);
        struct rlimit limit = {(rlim_t)there.st_size, (rlim_t)there.st_size};
        struct store *store = store_open(path, false, &fault);
        struct rlimit small = {8192, (rlim_t)there.st_size};
        if (!store || setrlimit(RLIMIT_FSIZE, &small) != 0 || create(place(other, "none.study"), &fault) ||
            !strstr(fault.message, "none.study could not be written (File too large) and nothing was left behind")) {
            _exit(1);
        }
        setrlimit(RLIMIT_FSIZE, &limit);
        char *long_reason = memory_new(1 << 20, 1);
        memset(long_reason, 'x', (1 << 20) - 1);
        struct stored_decision batch[] = {decision_of("Q1", "short"), decision_of("Q2", long_reason)};
        fault_init(&fault);
        if (store_append(store, &arena, 2, batch, 2, &fault) || fault.code != FAULT_SYSTEM ||
            !strstr(fault.message, "nothing was changed")) {
            _exit(2);
        }
        uint32_t version;
        fault_init(&fault);
        _exit(store_version(store, &version, NULL, &fault) && version == 2 ? 0 : 3);
    }
    int status;
    waitpid(child, &status, 0);
    assert_int_equal(status, 0);
    struct store *store = opened(path, false);
    struct store_verdict verdict;
    struct fault fault;
    fault_init(&fault);
    assert_true(store_verify(store, &verdict, &fault) && verdict.sound);
    store_close(store);
    assert_int_equal(count_files(), before);
}

/* ---- the lock ---- */

static void locks_one_server_per_study(void **state) {
    (void)state;
    char path[256], other[256], wanted[512];
    struct fault fault;
    fault_init(&fault);
    fresh(path, "locked.study");
    fresh(other, "unlocked.study");
    size_t before = count_files();
    int ends[2], go[2];
    assert_int_equal(pipe(ends), 0);
    assert_int_equal(pipe(go), 0);
    pid_t child = fork();
    if (child == 0) {
        char ready = store_lock(path, &fault) ? 'y' : 'n';
        close(go[1]);
        _exit(write(ends[1], &ready, 1) == 1 && read(go[0], &ready, 1) == 0 ? 0 : 1);
    }
    char ready = 'n';
    assert_int_equal(read(ends[0], &ready, 1), 1);
    assert_int_equal(ready, 'y');
    assert_false(store_lock(path, &fault));
    assert_int_equal(fault.code, FAULT_REFUSED);
    snprintf(wanted, sizeof wanted, "%s is open already in another Evenhand (process %ld); use its page, or close it "
        "and try again", path, (long)child);
    assert_string_equal(fault.message, wanted);
    fault_init(&fault);
    assert_true(store_lock(other, &fault)); /* another study is another lock */
    assert_int_equal(count_files(), before); /* and no file beside the studies */
    close(go[1]);
    waitpid(child, NULL, 0);
    fault_init(&fault);
    if (!store_lock(path, &fault)) { /* free again with the process */
        fail_msg("%s", fault.message);
    }
    assert_false(store_lock(path, &fault)); /* also within one process */
    close(ends[0]);
    close(ends[1]);
    close(go[0]);
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(gives_back_what_went_in),
        cmocka_unit_test(can_be_read_with_sql),
        cmocka_unit_test(hashes_what_was_received),
        cmocka_unit_test(overwrites_nothing),
        cmocka_unit_test(lets_rows_only_be_added),
        cmocka_unit_test(appends_all_or_none),
        cmocka_unit_test(waits_then_says_so),
        cmocka_unit_test(serves_several_threads),
        cmocka_unit_test(refuses_what_is_no_study),
        cmocka_unit_test(lets_views_be),
        cmocka_unit_test(goes_back_to_one_file),
        cmocka_unit_test(may_not_be_read),
        cmocka_unit_test(notices_every_alteration),
        cmocka_unit_test(notices_every_flipped_byte),
        cmocka_unit_test(compares_cells),
        cmocka_unit_test(keeps_what_it_acknowledged),
        cmocka_unit_test(leaves_no_half_study),
        cmocka_unit_test(survives_a_full_disk),
        cmocka_unit_test(locks_one_server_per_study),
    };
    return cmocka_run_group_tests_name("store/store", tests, make_folder, remove_folder);
}
