/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Who may ask, in one place and one order: Host, key or session, Origin, method, size. (The body's own guard is the
 * route's: what JSON it takes.) Another site's page in the same browser is the adversary: it can send requests here but
 * knows no key, cannot read replies, and its Origin and Sec-Fetch-Site betray it. */
#include "draw/html.h"
#include "http/assets.h"
#include "server/http/guards.h"
#include <stdio.h>
#include <string.h>
#include <strings.h>

static const struct pair security_headers[] = {
    {"Content-Security-Policy",
        "default-src 'none'; script-src 'self'; style-src 'self'; img-src 'self'; connect-src 'self'; "
        "form-action 'self'; base-uri 'none'; frame-ancestors 'none'"},
    {"X-Content-Type-Options", "nosniff"},
    {"X-Frame-Options", "DENY"},
    {"Referrer-Policy", "no-referrer"},
    {"Cross-Origin-Opener-Policy", "same-origin"},
    {"Cross-Origin-Resource-Policy", "same-origin"},
};

void reply_secure(struct reply *reply) {
    if (reply_header_of(reply, security_headers[0].name)) {
        return;
    }
    for (size_t i = 0; i < sizeof security_headers / sizeof *security_headers; i++) {
        reply_header(reply, security_headers[i].name, security_headers[i].value);
    }
    if (!reply_header_of(reply, "Cache-Control")) {
        reply_header(reply, "Cache-Control", "no-store");
    }
}

bool request_reads(const struct request *request) {
    return strcmp(request->method, "GET") == 0 || strcmp(request->method, "HEAD") == 0;
}

/* ---- Host ---- */

static bool host_ours(const struct server_state *state, const char *host) {
    static const char *const names[] = {"127.0.0.1", "localhost"};
    for (size_t i = 0; i < sizeof names / sizeof *names; i++) {
        char wanted[64];
        snprintf(wanted, sizeof wanted, "%s:%u", names[i], state->port);
        if (strcasecmp(host, wanted) == 0 || (state->port == 80 && strcasecmp(host, names[i]) == 0)) {
            return true;
        }
    }
    return false;
}

static bool guard_host(struct server_state *state, const struct request *request, struct reply *reply) {
    if (request->host_count != 1) {
        reply_refuse(reply, 400, "a request needs exactly one Host header; this one has %zu", request->host_count);
        return false;
    }
    if (!host_ours(state, request->host)) {
        reply_refuse(reply, 403,
            "this server answers to 127.0.0.1:%u and localhost:%u only; open the address that was printed", state->port,
            state->port);
        return false;
    }
    return true;
}

/* ---- key and session ---- */

static void how_to_open(struct reply *reply) {
    reply->status = 403;
    reply->content_type = "text/html; charset=utf-8";
    text_literal(&reply->body, "<!doctype html>\n");
    struct html html;
    html_init(&html, &reply->body);
    html_open(&html, "html");
    html_attribute(&html, "lang", "en-GB");
    html_open(&html, "head");
    html_open(&html, "meta");
    html_attribute(&html, "charset", "utf-8");
    html_close(&html);
    html_element(&html, "title", NULL, "Evenhand: open it with its key");
    html_close(&html);
    html_open(&html, "body");
    html_element(&html, "h1", NULL, "Open Evenhand with its key");
    html_element(&html, "p", NULL,
        "This page belongs to whoever started the program. Copy the whole address from the line that says "
        "“Evenhand is open at …”, with its key, and open that.");
    html_element(&html, "p", NULL,
        "Each start of the program makes a new key; an address from an earlier start no longer works.");
    html_close(&html);
    html_close(&html);
    html_finish(&html);
}

static void append_encoded(struct text *out, const char *value) {
    for (const unsigned char *p = (const unsigned char *)value; *p; p++) {
        bool plain =
            (*p >= '0' && *p <= '9') || (*p >= 'A' && *p <= 'Z') || (*p >= 'a' && *p <= 'z') || strchr("-._~", *p);
        plain ? text_char(out, (char)*p) : text_format(out, "%%%02X", *p);
    }
}

/* Gives the browser its session and sends it to the same page without the key. */
static void exchange_key(struct server_state *state, const struct request *request, struct reply *reply) {
    struct fault fault;
    fault_init(&fault);
    char token[KEY_SIZE];
    if (!session_new(state, token, &fault)) {
        reply_fault(reply, &fault);
        return;
    }
    struct text clean;
    text_init(&clean);
    text_literal(&clean, "/");
    char before = '?';
    for (size_t i = 0; i < request->query_count; i++) {
        if (strcmp(request->query[i].name, "key") != 0) {
            text_char(&clean, before);
            append_encoded(&clean, request->query[i].name);
            text_literal(&clean, "=");
            append_encoded(&clean, request->query[i].value);
            before = '&';
        }
    }
    reply->status = 303;
    reply_header(reply, "Location", clean.data);
    text_clear(&clean);
    text_format(&clean, "%s=%s; Path=/; HttpOnly; SameSite=Strict", state->cookie_name, token);
    reply_header(reply, "Set-Cookie", clean.data);
    text_release(&clean);
}

static bool guard_session(struct server_state *state, const struct request *request, struct reply *reply) {
    const char *key = request_asked(request, "key");
    bool page = request_reads(request) && strcmp(request->path, "/") == 0;
    if (page && key && key_fits(state, key)) {
        exchange_key(state, request, reply);
        return false;
    }
    if (session_known(state, request->cookie)) {
        return true;
    }
    if (page || (request_reads(request) && request->accept && strstr(request->accept, "text/html"))) {
        how_to_open(reply);
    } else {
        reply_refuse(reply, 403, "this needs the key: open the whole address that was printed at the start");
    }
    return false;
}

/* ---- Origin ---- */

static bool guard_origin(struct server_state *state, const struct request *request, struct reply *reply) {
    (void)state;
    const char *site = request->fetch_site;
    bool own_site = !site || strcmp(site, "same-origin") == 0;
    if (request_reads(request)) {
        /* A link to the page may come from anywhere, data may not. */
        if (own_site || strcmp(site, "none") == 0 || strcmp(request->path, "/") == 0) {
            return true;
        }
    } else {
        char own[160];
        snprintf(own, sizeof own, "http://%.128s", request->host);
        if (own_site && request->origin && strcasecmp(request->origin, own) == 0) {
            return true;
        }
        if (own_site && !request->origin) {
            reply_refuse(reply, 403, "a request that changes something must say its Origin, %s", own);
            return false;
        }
    }
    reply_refuse(reply, 403, "another site's page asked for this; only Evenhand's own page may");
    return false;
}

/* ---- method and size ---- */

const struct web_asset *asset_of(const char *path) {
    const char *wanted = strcmp(path, "/") == 0 ? "/index.html" : path;
    for (const struct web_asset *asset = web_assets; asset->path; asset++) {
        if (strcmp(asset->path, wanted) == 0) {
            return asset;
        }
    }
    return NULL;
}

static bool path_fits(const struct route *route, const char *path) {
    size_t length = strlen(route->path);
    bool below = length > 1 && route->path[length - 1] == '/';
    return below ? strncmp(path, route->path, length) == 0 : strcmp(path, route->path) == 0;
}

const struct route *route_of(const struct request *request, const char **allowed) {
    const char *method = request_reads(request) ? "GET" : request->method;
    *allowed = NULL;
    for (const struct route *route = routes; route->path; route++) {
        if (!path_fits(route, request->path)) {
            continue;
        }
        if (strcmp(route->method, method) == 0) {
            return route;
        }
        *allowed = strcmp(route->method, "GET") == 0 ? "GET, HEAD" : route->method;
    }
    if (!*allowed && asset_of(request->path)) {
        *allowed = "GET, HEAD";
    }
    return NULL;
}

static bool guard_method(struct server_state *state, const struct request *request, struct reply *reply) {
    (void)state;
    const char *allowed;
    if (route_of(request, &allowed) || (request_reads(request) && asset_of(request->path))) {
        return true;
    }
    if (allowed) {
        reply_refuse(reply, 405, "%.100s takes %s, not %.20s", request->path, allowed, request->method);
        reply_header(reply, "Allow", allowed);
    } else {
        reply_refuse(reply, 404, "there is nothing at %.200s", request->path);
    }
    return false;
}

static bool guard_size(struct server_state *state, const struct request *request, struct reply *reply) {
    (void)state;
    const char *allowed;
    const struct route *route = route_of(request, &allowed);
    uint64_t limit = route ? route->body_limit : 0;
    if (request->body_length <= limit) {
        return true;
    }
    if (limit == 0) {
        reply_refuse(reply, 413, "%.100s takes no body", request->path);
    } else {
        reply_refuse(reply, 413, "the request's body is larger than the %llu MB that %.100s takes",
            (unsigned long long)(limit >> 20), request->path);
    }
    return false;
}

bool admit(struct server_state *state, const struct request *request, struct reply *reply) {
    static bool (*const guards[])(struct server_state *, const struct request *, struct reply *) = {
        guard_host, guard_session, guard_origin, guard_method, guard_size};
    for (size_t i = 0; i < sizeof guards / sizeof *guards; i++) {
        if (!guards[i](state, request, reply)) {
            reply_secure(reply);
            return false;
        }
    }
    return true;
}
