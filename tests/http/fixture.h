/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A server without a port on a fresh folder with the Quayside study in it, a session, and requests that pass every
 * guard unless a test spoils one thing. Include after cmocka.h. */
#ifndef EVENHAND_TESTS_HTTP_FIXTURE_H
#define EVENHAND_TESTS_HTTP_FIXTURE_H
#include "demo/quayside.h"
#include "http/server.h"
#include <cjson/cJSON.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

enum { TEST_PORT = 4321 };
#define TEST_HOST "127.0.0.1:4321"

struct house {
    char folder[64], study[96], cookie[96];
    struct quayside quayside;
    struct server_state *state;
};

static inline struct request plain_request(const struct house *house, const char *method) {
    struct request request = {.method = method, .host_count = 1, .host = TEST_HOST, .cookie = house->cookie};
    if (strcmp(method, "GET") != 0 && strcmp(method, "HEAD") != 0) {
        request.origin = "http://" TEST_HOST;
        request.fetch_site = "same-origin";
    }
    return request;
}

/* Sends a prepared request; the reply is the caller's to release. */
static inline void send_to(const struct house *house, struct request *request, const char *target, const char *body,
    size_t length, struct reply *reply) {
    struct arena arena;
    struct fault fault;
    arena_init(&arena);
    fault_init(&fault);
    reply_init(reply);
    if (request_target(request, target, &arena, &fault)) {
        request->body = body ? body : "";
        request->body_length = length;
        dispatch(house->state, request, reply);
    } else {
        reply_fault(reply, &fault); /* as the listener does */
    }
    arena_release(&arena);
}

static inline void ask(
    const struct house *house, const char *method, const char *target, const char *body, struct reply *reply) {
    struct request request = plain_request(house, method);
    send_to(house, &request, target, body, body ? strlen(body) : 0, reply);
}

/* The sentence of a fault; "" where the reply is none. Lives until the next call. */
static inline const char *sentence_of(const struct reply *reply) {
    static char sentence[1024];
    cJSON *json = cJSON_Parse(reply->body.data);
    const cJSON *fault = cJSON_GetObjectItemCaseSensitive(json, "fault");
    snprintf(sentence, sizeof sentence, "%s", cJSON_IsString(fault) ? fault->valuestring : "");
    cJSON_Delete(json);
    return sentence;
}

static inline void open_session(struct house *house) {
    char target[96];
    struct reply reply;
    snprintf(target, sizeof target, "/?key=%s", server_key(house->state));
    ask(house, "GET", target, NULL, &reply);
    assert_int_equal(reply.status, 303);
    const char *cookie = reply_header_of(&reply, "Set-Cookie");
    assert_non_null(cookie);
    snprintf(house->cookie, sizeof house->cookie, "%.*s", (int)strcspn(cookie, ";"), cookie);
    reply_release(&reply);
}

/* What the study of a fixture is blinded like is the plan's: "coded". */
static inline struct house *house_new(bool open) {
    struct house *house = calloc(1, sizeof *house);
    struct fault fault;
    fault_init(&fault);
    quayside_make(QUAYSIDE_SEED, &house->quayside);
    snprintf(house->folder, sizeof house->folder, "/tmp/evenhand-test-XXXXXX");
    assert_non_null(mkdtemp(house->folder));
    snprintf(house->study, sizeof house->study, "%s/quayside.study", house->folder);
    if (!study_create(house->study, "export.csv", house->quayside.export_csv.data, house->quayside.export_csv.length,
            "plan.json", house->quayside.plan_json.data, house->quayside.plan_json.length, "A Tester, statistician",
            NULL, &fault)) {
        fail_msg("%s", fault.message);
    }
    house->state = server_new(house->folder, &fault);
    assert_non_null(house->state);
    server_port(house->state, TEST_PORT);
    if (open && !server_open_study(house->state, house->study, &fault)) {
        fail_msg("%s", fault.message);
    }
    open_session(house);
    return house;
}

static inline void house_free(struct house *house) {
    char command[96];
    server_free(house->state);
    quayside_release(&house->quayside);
    snprintf(command, sizeof command, "rm -rf '%s'", house->folder);
    assert_int_equal(system(command), 0);
    free(house);
}

static inline int house_open(void **state) {
    *state = house_new(true);
    return 0;
}
static inline int house_closed(void **state) {
    *state = house_new(false);
    return 0;
}
static inline int house_leave(void **state) {
    house_free(*state);
    return 0;
}
#endif
