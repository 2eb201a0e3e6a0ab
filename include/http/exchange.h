/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A request and its reply as plain structs: what lies between the listener, which alone knows sockets, and the
 * dispatcher, which tests call without a port. */
#ifndef EVENHAND_HTTP_EXCHANGE_H
#define EVENHAND_HTTP_EXCHANGE_H
#include "base/fault.h"
#include "base/memory.h"
#include "base/text.h"
#include <stdbool.h>
#include <stdint.h>

struct pair {
    const char *name, *value;
};

/* All texts are borrowed from the caller; headers that were not sent are NULL. */
struct request {
    const char *method;       /* as sent: "GET" */
    const char *path;         /* decoded, starts with "/"; see request_target */
    const struct pair *query; /* decoded, in the order sent */
    size_t query_count;
    size_t host_count; /* how many Host headers came */
    const char *host;  /* the first of them */
    const char *origin, *fetch_site, *cookie, *accept, *if_none_match;
    uint64_t body_length; /* of the body, or what Content-Length announces while only headers are here */
    const char *body;     /* NULL while only headers are here; NUL-terminated beyond body_length */
};

enum { REPLY_HEADERS = 16 };

/* Filled by the dispatcher; texts of headers live in the reply's arena. */
struct reply {
    unsigned status;
    const char *content_type; /* a literal */
    struct text body;         /* empty with 303 and 304 */
    struct pair headers[REPLY_HEADERS];
    size_t header_count;
    struct arena arena;
};

void reply_init(struct reply *reply);
void reply_release(struct reply *reply);
void reply_header(struct reply *reply, const char *name, const char *value); /* copies the value */
const char *reply_header_of(const struct reply *reply, const char *name);    /* or NULL */
/* {"fault": sentence, "row", "column"}; row and column are null where there is no place. The status follows the code.
 */
void reply_fault(struct reply *reply, const struct fault *fault);
/* The same with a status of its own. */
void reply_refuse(struct reply *reply, unsigned status, const char *format, ...) __attribute__((format(printf, 3, 4)));

/* Takes "/path?name=value&..." apart into the arena: percent-decoded ("+" in the query is a space), each text valid
 * UTF-8 without NUL or control characters, no name twice. FAULT_INPUT otherwise. */
bool request_target(struct request *request, const char *target, struct arena *arena, struct fault *fault);
/* The value of a name in the query, or NULL. */
const char *request_asked(const struct request *request, const char *name);
#endif
