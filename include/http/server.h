/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What a running server knows: its key, the sessions, the drafts, the folder and the one open study; and the listener
 * that brings requests to it. Everything here may be called from any thread once server_new has returned. */
#ifndef EVENHAND_HTTP_SERVER_H
#define EVENHAND_HTTP_SERVER_H
#include "http/exchange.h"
#include "http/routes.h"
#include "trial/study.h"

struct server_state;

/* `folder`: where studies are listed and made; copied. The key is 128 bits of the system's randomness: FAULT_SYSTEM
 * where there is none. */
struct server_state *server_new(const char *folder, struct fault *fault);
void server_free(struct server_state *state);                /* closes the study; no request may be running */
void server_port(struct server_state *state, unsigned port); /* the port in Host, Origin and the cookie's name */
const char *server_key(const struct server_state *state);    /* 32 hexadecimal digits */
/* A key for the browser that the program starts itself: good for one exchange, because the arguments of a process can
 * be read by everyone on the machine. Each call makes a new one in place of the last. */
bool server_key_once(struct server_state *state, char key[33], struct fault *fault);
const char *server_folder(const struct server_state *state);

/* Opens the study at `path` and takes its lock. FAULT_CONFLICT where one is open already. */
bool server_open_study(struct server_state *state, const char *path, struct fault *fault);
/* Waits for requests that use the study, then closes it. FAULT_MISSING where none is open. */
bool server_close_study(struct server_state *state, struct fault *fault);

/* The name of the operating system's account that runs this, as it stands in records; "not said" where it has none. */
void account_name(char *name, size_t size);

struct listener;
/* Serves on 127.0.0.1 alone, from threads of its own; port 0 takes a free one. Tells the state the port. FAULT_SYSTEM,
 * with the way out, where the port is taken. */
struct listener *listener_start(struct server_state *state, unsigned port, struct fault *fault);
unsigned listener_port(const struct listener *listener);
void listener_stop(struct listener *listener); /* waits for running requests; NULL is fine */
#endif
