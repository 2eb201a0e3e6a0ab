/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The study file: one plain SQLite file that holds the received bytes, the cells as received, the plan and the record.
 * Rows are only ever added (triggers refuse the rest); every decision and every look carries the SHA-256 of the one
 * before it and of all its own fields. This is the only layer that knows SQLite. It knows nothing of what plans and
 * decisions mean.
 *
 * Tables, for people with SQL: study(key, value); received(number, version, name, received_at, received_by, sha256,
 * bytes); plan(number, version, entered_at, text); columns(received, number, name); cells(record, c1..cN), for a
 * second file cells_2 and so on; decisions(number, entered_at, entered_by, account, kind, participant, column_name,
 * value_from, value_to, reason, evidence, discrepancy, blinding, body, state_sha256, hash); looks(number, seen_at,
 * seen_by, exhibit, arguments, version, hash).
 *
 * Every function that can fail returns false with one sentence in the fault, which names the file: FAULT_INPUT where
 * the file is not such a study, FAULT_CONFLICT where the record has moved on, FAULT_REFUSED where the file or its
 * lock forbids it, FAULT_SYSTEM for disk and permissions. A failed call leaves the file as it was.
 * Threads: a struct store has a mutex inside; any thread may call anything but store_close at any time. Never open the
 * study file by other means in the same process: closing it would drop SQLite's locks. */
#ifndef EVENHAND_STORE_STORE_H
#define EVENHAND_STORE_STORE_H
#include "base/fault.h"
#include "base/hash.h"
#include "base/memory.h"
#include <stddef.h>
#include <stdint.h>

struct store;

/* Cells of one file in one block: cell k = record * columns + column is the NUL-terminated text at bytes + start[k],
 * start[k + 1] - start[k] - 1 bytes long. (The shape of struct cells of intake; all borrowed.) */
struct store_table {
    size_t records, columns;
    char *const *names;
    const char *bytes;
    const uint32_t *start;
};

struct store_value {
    const char *key, *value;
};

/* A file as received. Going in, `number`, `at` and `by` are filled by the store; coming out, all of it is. */
struct store_file {
    uint32_t number;    /* 1, 2, ... */
    const char *name;   /* without its folder */
    const char *at, *by;
    const char *bytes;
    size_t length;
    char sha256[HASH_SIZE];
};

/* One entry of the record. NULL is SQL's NULL; the fields without "may be NULL" must be there. */
struct stored_decision {
    uint32_t number;          /* given by the store: 1, 2, ... */
    const char *at;           /* UTC, ISO 8601; NULL going in: now */
    const char *by;           /* name and role, as the person gave them */
    const char *account;      /* may be NULL: the account of the operating system */
    const char *kind;
    const char *participant;  /* may be NULL, like all below but blinding and body */
    const char *column;
    const char *from, *to;    /* the texts before and after */
    const char *reason, *evidence, *discrepancy;
    const char *blinding;     /* the state the person saw */
    const char *body;         /* the whole decision as JSON */
    const char *state_sha256; /* of the values after it; may be NULL */
    char hash[HASH_SIZE];     /* given by the store */
};

/* One look at an outcome by arm while arms are coded. */
struct stored_look {
    uint32_t number;  /* given by the store */
    const char *at;   /* NULL going in: now */
    const char *by, *exhibit, *arguments;
    uint32_t version; /* of the record that was looked at */
    char hash[HASH_SIZE];
};

/* What a study is born with. All borrowed. Entry 0 of the chain covers files, plan and values. */
struct store_birth {
    struct store_file *files;             /* sha256 is computed by the store and filled in */
    const struct store_table *tables;     /* one per file */
    size_t file_count;                    /* at least 1 */
    const char *plan;                     /* JSON text as given */
    const struct store_value *values;     /* letters, seed, program version ...; keys unique; the store adds its own */
    size_t value_count;
    const char *by;                       /* the person loading */
    const char *at;                       /* NULL: now */
    struct stored_decision *decisions;    /* the first entries of the record; number and hash are filled in */
    size_t decision_count;
    /* Called once, when all but the record is in, and may be NULL: what the decisions' state_sha256 hang on can be made
     * meanwhile on another thread. False: nothing is made; the caller knows why. */
    bool (*settle)(void *context);
    void *context;
};

/* Makes a new study at `path`; refuses where anything is there already. The file appears whole, on disk, or not at
 * all, also when the process is killed or the disk is full. */
bool store_create(const char *path, const struct store_birth *birth, struct fault *fault);

/* Opens a study. read_only: never writes; a file without write permission opens like that by itself and then refuses
 * store_append with a sentence. NULL with a fault where the file is missing, empty, a folder, no SQLite file, of
 * another program, of a newer Evenhand, or damaged. store_close(NULL) is allowed. */
struct store *store_open(const char *path, bool read_only, struct fault *fault);
void store_close(struct store *store);
const char *store_path(const struct store *store); /* as given to store_open; borrowed */

/* ---- reading; what comes back lives in `arena` ---- */

/* *value is NULL where the study has no such key. Keys of the store: format, created_at, created_by, entry_zero. */
bool store_value(struct store *store, struct arena *arena, const char *key, const char **value, struct fault *fault);
/* The plan in force (the newest). */
bool store_plan(struct store *store, struct arena *arena, const char **text, struct fault *fault);
/* Files received so far; all but their bytes (NULL, length is right). */
bool store_files(struct store *store, struct arena *arena, struct store_file **files, size_t *count,
    struct fault *fault);
/* File `number` with its bytes (NUL-terminated beyond length); 0 is the newest. FAULT_MISSING where there is none. */
bool store_received(struct store *store, struct arena *arena, uint32_t number, struct store_file *file,
    struct fault *fault);
/* Decisions with number > after, in order, from one snapshot; after = 0 gives all. */
bool store_decisions(struct store *store, struct arena *arena, uint32_t after, struct stored_decision **decisions,
    size_t *count, struct fault *fault);
bool store_looks(struct store *store, struct arena *arena, struct stored_look **looks, size_t *count,
    struct fault *fault);
/* The number of the last decision (0: none yet), and the hash at the head of the record: of the last decision, or of
 * entry 0. `head` may be NULL. */
bool store_version(struct store *store, uint32_t *version, char head[HASH_SIZE], struct fault *fault);
/* True when another connection or process has written since the last call (or since opening); own writes do not
 * count. Cheap: meant to be asked before each request. False too where the file cannot be asked just now. */
bool store_changed(struct store *store);

/* ---- writing: on disk before it returns true ---- */

/* Appends all or none in one transaction. FAULT_CONFLICT where the last number is no longer version_seen. Fills in
 * number, at (where NULL: borrowed from `arena`) and hash. */
bool store_append(struct store *store, struct arena *arena, uint32_t version_seen, struct stored_decision *decisions,
    size_t count, struct fault *fault);
bool store_append_look(struct store *store, struct arena *arena, struct stored_look *look, struct fault *fault);

/* ---- checking ---- */

struct store_verdict {
    bool sound;             /* nothing differs */
    uint32_t decision, look; /* the first that does not fit its hash, 0 where all do */
    char sentence[480];     /* what differs, for a person; "" where sound */
};
/* Recomputes everything the file claims of itself: SQLite's own integrity check, the tables and triggers as this
 * program makes them, the SHA-256 of each kept file, entry 0, every decision and every look. */
bool store_verify(struct store *store, struct store_verdict *verdict, struct fault *fault);
/* Compares the table of cells of file `number` with freshly read cells. Where they differ *same is false and *record
 * and *column are the first 0-based place (or record = the smaller number of records). */
bool store_compare(struct store *store, uint32_t number, const struct store_table *table, bool *same, size_t *record,
    size_t *column, struct fault *fault);

/* ---- one server per study ---- */

/* Takes the lock on the study at `path`, held until the process ends, in a folder of this account outside the study's
 * own. FAULT_REFUSED with a sentence that names the study where another process holds it. */
bool store_lock(const char *path, struct fault *fault);
/* The same for a lock that is given back before the process ends: what store_unlock takes, or -1. */
int store_lock_take(const char *path, struct fault *fault);
void store_unlock(int lock);
#endif
