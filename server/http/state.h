/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The inside of struct server_state, for http/ alone: sessions, drafts and the open study behind their locks. */
#ifndef EVENHAND_HTTP_STATE_H
#define EVENHAND_HTTP_STATE_H
#include "http/server.h"
#include <pthread.h>

enum { KEY_SIZE = 33, SESSIONS = 32, DRAFTS = 4, BY_SIZE = 256 };

struct session {
    char token[KEY_SIZE]; /* "" where the place is free */
    char by[BY_SIZE];     /* who is deciding, as last said; "" before */
    uint64_t used;        /* for throwing out the one unused for longest */
};

struct draft_file {
    char *name, *sheet, *bytes; /* sheet: NULL where none was named */
    size_t length;
};
enum { DRAFT_FILES = 20 };
struct draft {   /* files dropped on the page that are to become one study */
    uint64_t id; /* 0 where the place is free */
    struct draft_file files[DRAFT_FILES];
    size_t count, length; /* length: of all together */
};

struct server_state {
    char key[KEY_SIZE];
    char key_once[KEY_SIZE]; /* "" where it is used up */
    char cookie_name[32];    /* "evenhand-PORT" */
    unsigned port;
    char *folder;
    pthread_mutex_t mutex; /* sessions and drafts */
    struct session sessions[SESSIONS];
    struct draft drafts[DRAFTS];
    uint64_t tick, last_draft;
    pthread_rwlock_t study_lock; /* readers use the study, the writer opens and closes it */
    struct study *study;
    int study_hold; /* the lock on the open study's file */
};

/* 128 bits of the system's randomness as 32 hexadecimal digits. */
bool key_make(char key[KEY_SIZE], struct fault *fault);
/* Compares without telling by its time where two texts differ. */
bool key_same(const char *given, const char *wanted);

/* Is this the key, or the one for a single exchange, which is then used up? */
bool key_fits(struct server_state *state, const char *given);
/* Opens a session and copies its token out. */
bool session_new(struct server_state *state, char token[KEY_SIZE], struct fault *fault);
/* Is there a session for the Cookie header? */
bool session_known(struct server_state *state, const char *cookie);
void session_by(struct server_state *state, const char *cookie, const char *by); /* remembers who is deciding */
const char *session_who(struct server_state *state, const char *cookie, char by[BY_SIZE]); /* or "not said" */

/* Adds a copy of a file to a draft that is in nobody's hands but the caller's; one of that name is replaced. A fault
 * where there are too many, or they are too large together: then the draft is as before. */
bool draft_add(
    struct draft *draft, const char *name, const char *sheet, const char *bytes, size_t length, struct fault *fault);
void draft_drop(struct draft *draft, size_t file); /* takes a file out */
/* Takes the draft out of the state (the caller gives it back or releases it), so that nobody pushes it out meanwhile.
 */
bool draft_take(struct server_state *state, uint64_t id, struct draft *draft);
uint64_t draft_number(struct server_state *state); /* for a new draft's id */
/* Puts a draft with an id into the state and empties it; the oldest drafts make room. */
void draft_give_back(struct server_state *state, struct draft *draft);
void draft_release(struct draft *draft);
#endif
