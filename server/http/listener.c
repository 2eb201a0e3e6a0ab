/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "server/http/guards.h"
#include <arpa/inet.h>
#include <errno.h>
#include <microhttpd.h>
#include <netinet/in.h>
#include <stdlib.h>
#include <string.h>
#include <strings.h>
#include <sys/socket.h>
#include <unistd.h>

enum { CONNECTIONS = 64, IDLE_SECONDS = 120, HEADER_BYTES = 64 * 1024 };
/* While its size is not announced a body grows; this is the most any route takes. */
static const uint64_t body_most = UINT64_C(256) << 20;

struct listener {
    struct MHD_Daemon *daemon;
    struct server_state *state;
    unsigned port;
};

/* One request on its way in. */
struct call {
    struct arena arena;
    struct request request;
    struct fault fault; /* of the address */
    struct text body;
    bool headers_seen, too_large;
};

static void *call_begin(void *closure, const char *target, struct MHD_Connection *connection) {
    (void)closure;
    (void)connection;
    struct call *call = memory_new(1, sizeof *call);
    arena_init(&call->arena);
    fault_init(&call->fault);
    text_init(&call->body);
    request_target(&call->request, target, &call->arena, &call->fault);
    return call;
}

static void call_end(
    void *closure, struct MHD_Connection *connection, void **place, enum MHD_RequestTerminationCode why) {
    (void)closure;
    (void)connection;
    (void)why;
    struct call *call = *place;
    if (call) {
        text_release(&call->body);
        arena_release(&call->arena);
        memory_free(call);
        *place = NULL;
    }
}

/* A header given twice is as good as a wrong one: "" passes no guard. */
static void once(const char **field, const char *value) {
    *field = *field ? "" : value;
}

static enum MHD_Result header(void *closure, enum MHD_ValueKind kind, const char *name, const char *value) {
    (void)kind;
    struct call *call = closure;
    struct request *request = &call->request;
    const char *copy = arena_text(&call->arena, value ? value : "");
    if (strcasecmp(name, "Host") == 0) {
        request->host = request->host_count++ ? request->host : copy;
    } else if (strcasecmp(name, "Origin") == 0) {
        once(&request->origin, copy);
    } else if (strcasecmp(name, "Sec-Fetch-Site") == 0) {
        once(&request->fetch_site, copy);
    } else if (strcasecmp(name, "Cookie") == 0) {
        once(&request->cookie, copy);
    } else if (strcasecmp(name, "Accept") == 0) {
        request->accept = copy;
    } else if (strcasecmp(name, "If-None-Match") == 0) {
        request->if_none_match = copy;
    } else if (strcasecmp(name, "Content-Length") == 0) {
        request->body_length = strtoull(copy, NULL, 10);
    }
    return MHD_YES;
}

static enum MHD_Result send_reply(struct MHD_Connection *connection, const struct reply *reply) {
    struct MHD_Response *response =
        MHD_create_response_from_buffer(reply->body.length, reply->body.data, MHD_RESPMEM_MUST_COPY);
    if (!response) {
        return MHD_NO;
    }
    if (reply->body.length) {
        MHD_add_response_header(response, MHD_HTTP_HEADER_CONTENT_TYPE, reply->content_type);
    }
    for (size_t i = 0; i < reply->header_count; i++) {
        MHD_add_response_header(response, reply->headers[i].name, reply->headers[i].value);
    }
    enum MHD_Result queued = MHD_queue_response(connection, reply->status, response);
    MHD_destroy_response(response);
    return queued;
}

/* Only the headers are here. Refusing now saves the body; otherwise MHD_YES and nothing is queued. */
static enum MHD_Result see_headers(struct server_state *state, struct call *call, struct MHD_Connection *connection) {
    call->headers_seen = true;
    MHD_get_connection_values(connection, MHD_HEADER_KIND, header, call);
    struct reply reply;
    reply_init(&reply);
    enum MHD_Result result = MHD_YES;
    if (call->fault.code != FAULT_NONE) {
        reply_fault(&reply, &call->fault);
        reply_secure(&reply);
        result = send_reply(connection, &reply);
    } else if (!admit(state, &call->request, &reply)) {
        result = send_reply(connection, &reply);
    }
    reply_release(&reply);
    return result;
}

static enum MHD_Result take_body(struct call *call, const char *bytes, size_t *length) {
    if (call->body.length + *length > body_most) {
        call->too_large = true; /* drained to its end, answered then */
        text_clear(&call->body);
    } else if (!call->too_large) {
        text_append(&call->body, bytes, *length);
    }
    *length = 0;
    return MHD_YES;
}

static enum MHD_Result answer(void *closure, struct MHD_Connection *connection, const char *url, const char *method,
    const char *version, const char *bytes, size_t *length, void **place) {
    (void)url;
    (void)version;
    struct server_state *state = closure;
    struct call *call = *place;
    if (!call->headers_seen) {
        call->request.method = arena_text(&call->arena, method);
        return see_headers(state, call, connection);
    }
    if (*length) {
        return take_body(call, bytes, length);
    }
    struct reply reply;
    reply_init(&reply);
    call->request.body_length = call->too_large ? body_most + 1 : call->body.length;
    call->request.body = call->body.data;
    dispatch(state, &call->request, &reply);
    enum MHD_Result queued = send_reply(connection, &reply);
    reply_release(&reply);
    return queued;
}

/* A socket on 127.0.0.1 and nowhere else; *port becomes the one it got. */
static int bound_socket(unsigned *port, struct fault *fault) {
    int handle = socket(AF_INET, SOCK_STREAM | SOCK_CLOEXEC, 0);
    int yes = 1;
    struct sockaddr_in address = {.sin_family = AF_INET, .sin_port = htons((uint16_t)*port)};
    address.sin_addr.s_addr = htonl(INADDR_LOOPBACK);
    socklen_t size = sizeof address;
    if (handle >= 0 && setsockopt(handle, SOL_SOCKET, SO_REUSEADDR, &yes, sizeof yes) == 0 &&
        bind(handle, (struct sockaddr *)&address, sizeof address) == 0 && listen(handle, CONNECTIONS) == 0 &&
        getsockname(handle, (struct sockaddr *)&address, &size) == 0) {
        *port = ntohs(address.sin_port);
        return handle;
    }
    fault_set(fault, FAULT_SYSTEM, "cannot listen on port %u of 127.0.0.1 (%s); --port 0 takes a free one", *port,
        strerror(errno));
    if (handle >= 0) {
        close(handle);
    }
    return -1;
}

struct listener *listener_start(struct server_state *state, unsigned port, struct fault *fault) {
    int handle = bound_socket(&port, fault);
    if (handle < 0) {
        return NULL;
    }
    server_port(state, port);
    /* A thread for each connection: one slow exhibit does not keep the others waiting. */
    struct MHD_Daemon *daemon =
        MHD_start_daemon(MHD_USE_INTERNAL_POLLING_THREAD | MHD_USE_POLL | MHD_USE_THREAD_PER_CONNECTION, (uint16_t)port,
            NULL, NULL, answer, state, MHD_OPTION_LISTEN_SOCKET, (MHD_socket)handle, MHD_OPTION_CONNECTION_LIMIT,
            (unsigned)CONNECTIONS, MHD_OPTION_CONNECTION_TIMEOUT, (unsigned)IDLE_SECONDS,
            MHD_OPTION_CONNECTION_MEMORY_LIMIT, (size_t)HEADER_BYTES, MHD_OPTION_STRICT_FOR_CLIENT, 1,
            MHD_OPTION_URI_LOG_CALLBACK, call_begin, NULL, MHD_OPTION_NOTIFY_COMPLETED, call_end, NULL, MHD_OPTION_END);
    if (!daemon) {
        close(handle);
        fault_set(fault, FAULT_SYSTEM, "the server cannot start on port %u (%s)", port, strerror(errno));
        return NULL;
    }
    struct listener *listener = memory_new(1, sizeof *listener);
    *listener = (struct listener){daemon, state, port};
    return listener;
}

unsigned listener_port(const struct listener *listener) {
    return listener->port;
}

void listener_stop(struct listener *listener) {
    if (listener) {
        MHD_stop_daemon(listener->daemon);
        memory_free(listener);
    }
}
