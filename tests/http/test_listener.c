/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The one test with a real socket: what only the listener can get wrong. Requests are written byte by byte (RFC 9112).
 */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <cmocka.h>
#include "base/clock.h"
#include "fixture.h"
#include "http/assets.h"
#include <arpa/inet.h>
#include <netinet/in.h>
#include <pthread.h>
#include <sys/socket.h>
#include <sys/time.h>

struct wire {
    struct house *house;
    struct listener *listener;
    unsigned port;
    char host[32];
};

static int wire_open(void **state) {
    struct wire *wire = calloc(1, sizeof *wire);
    struct fault fault;
    fault_init(&fault);
    wire->house = house_new(true);
    wire->listener = listener_start(wire->house->state, 0, &fault);
    if (!wire->listener) {
        fail_msg("%s", fault.message);
    }
    wire->port = listener_port(wire->listener);
    snprintf(wire->host, sizeof wire->host, "127.0.0.1:%u", wire->port);
    /* The cookie's name bears the port; the session itself was opened before there was one. */
    char token[64];
    snprintf(token, sizeof token, "%s", strchr(wire->house->cookie, '='));
    snprintf(wire->house->cookie, sizeof wire->house->cookie, "evenhand-%u%s", wire->port, token);
    *state = wire;
    return 0;
}

static int wire_leave(void **state) {
    struct wire *wire = *state;
    listener_stop(wire->listener);
    house_free(wire->house);
    free(wire);
    return 0;
}

static int connected(const struct wire *wire) {
    int handle = socket(AF_INET, SOCK_STREAM, 0);
    struct timeval patience = {.tv_sec = 20};
    struct sockaddr_in address = {.sin_family = AF_INET, .sin_port = htons((uint16_t)wire->port)};
    address.sin_addr.s_addr = htonl(INADDR_LOOPBACK);
    setsockopt(handle, SOL_SOCKET, SO_RCVTIMEO, &patience, sizeof patience);
    assert_int_equal(connect(handle, (struct sockaddr *)&address, sizeof address), 0);
    return handle;
}

/* Sends the bytes and reads until the other side closes. Lines end in "\n" here and in CR LF on the wire; "HOST",
 * "COOKIE" and "KEY" are filled in. */
static void talk(const struct wire *wire, const char *lines, struct text *answer) {
    struct text bytes;
    text_init(&bytes);
    for (const char *p = lines; *p; p++) {
        if (strncmp(p, "HOST", 4) == 0) {
            text_string(&bytes, wire->host);
            p += 3;
        } else if (strncmp(p, "COOKIE", 6) == 0) {
            text_string(&bytes, wire->house->cookie);
            p += 5;
        } else if (strncmp(p, "KEY", 3) == 0) {
            text_string(&bytes, server_key(wire->house->state));
            p += 2;
        } else if (*p == '\n') {
            text_literal(&bytes, "\r\n");
        } else {
            text_char(&bytes, *p);
        }
    }
    int handle = connected(wire);
    assert_int_equal(send(handle, bytes.data, bytes.length, MSG_NOSIGNAL), (ssize_t)bytes.length);
    char buffer[4096];
    text_clear(answer);
    for (ssize_t got; (got = recv(handle, buffer, sizeof buffer, 0)) > 0;) {
        text_append(answer, buffer, (size_t)got);
    }
    close(handle);
    text_release(&bytes);
}

static const struct {
    const char *what, *lines, *status, *holds, *not ; /* status "": hung up; NULL: not looked for */
} talks[] = {
    {"the page without a key", "GET / HTTP/1.1\nHost: HOST\nConnection: close\n\n", "403", "Evenhand is open at",
        "Set-Cookie"},
    {"the key", "GET /?key=KEY HTTP/1.1\nHost: HOST\nConnection: close\n\n", "303", "Location: /\r\n", NULL},
    {"a session", "GET /agenda.json HTTP/1.1\nHost: HOST\nCookie: COOKIE\nConnection: close\n\n", "200",
        "Content-Type: application/json", NULL},
    {"security headers", "GET /agenda.json HTTP/1.1\nHost: HOST\nCookie: COOKIE\nConnection: close\n\n", "200",
        "Content-Security-Policy: default-src 'none'", NULL},
    {"HEAD has the headers and no body",
        "HEAD /exhibit/decisions.json HTTP/1.1\nHost: HOST\nCookie: COOKIE\nConnection: close\n\n", "200",
        "Content-Length: ", "{"},
    {"two Hosts", "GET / HTTP/1.1\nHost: HOST\nHost: HOST\nConnection: close\n\n", "400", NULL, "Set-Cookie"},
    {"two Hosts, the second foreign",
        "GET /agenda.json HTTP/1.1\nHost: HOST\nHost: example.org\nCookie: COOKIE\nConnection: close\n\n", "400",
        "exactly one Host header", NULL},
    {"no Host in HTTP/1.0", "GET /?key=KEY HTTP/1.0\n\n", "400", NULL, "Set-Cookie"},
    {"foreign Host", "GET /?key=KEY HTTP/1.1\nHost: example.org\nConnection: close\n\n", "403", NULL, "Set-Cookie"},
    {"two cookies headers", "GET /agenda.json HTTP/1.1\nHost: HOST\nCookie: COOKIE\nCookie: a=b\nConnection: close\n\n",
        "403", NULL, NULL},
    {"two Origins",
        "POST /close HTTP/1.1\nHost: HOST\nCookie: COOKIE\nOrigin: http://HOST\nOrigin: http://HOST\nContent-Length: "
        "0\n"
        "Connection: close\n\n",
        "403", NULL, "closed"},
    {"a lone word", "NONSENSE\n\n", "", NULL, NULL}, /* the library hangs up without a word */
    {"NUL encoded", "GET /index.html%00 HTTP/1.1\nHost: HOST\nCookie: COOKIE\nConnection: close\n\n", "400",
        "control character", NULL},
    {"up and out", "GET /..%2f..%2fetc/passwd HTTP/1.1\nHost: HOST\nCookie: COOKIE\nConnection: close\n\n", "404",
        "there is nothing at", "root:"},
    {"another server's address", "GET http://example.org/ HTTP/1.1\nHost: HOST\nCookie: COOKIE\nConnection: close\n\n",
        "400", NULL, NULL},
    {"an announced terabyte is refused before it comes",
        "POST /decisions HTTP/1.1\nHost: HOST\nCookie: COOKIE\nOrigin: http://HOST\n"
        "Content-Length: 1099511627776\nConnection: close\n\n",
        "413", "larger than the 4 MB", NULL},
    {"a body in chunks",
        "POST /open HTTP/1.1\nHost: HOST\nCookie: COOKIE\nOrigin: http://HOST\nTransfer-Encoding: chunked\n"
        "Connection: close\n\n5\n{\"fil\n4\ne\":1\n1\n}\n0\n\n",
        "400", "name a study of the folder", NULL},
    {"a body at once",
        "POST /open HTTP/1.1\nHost: HOST\nCookie: COOKIE\nOrigin: http://HOST\nContent-Length: 2\nConnection: "
        "close\n\n[]",
        "400", "must be a JSON object in braces", NULL},
    {"PUT",
        "PUT /decisions HTTP/1.1\nHost: HOST\nCookie: COOKIE\nOrigin: http://HOST\nContent-Length: 0\nConnection: "
        "close\n\n",
        "405", "Allow: POST", NULL},
    {"a foreign page's post",
        "POST /decisions HTTP/1.1\nHost: HOST\nCookie: COOKIE\nOrigin: http://example.org\nContent-Length: 2\n"
        "Connection: close\n\n{}",
        "403", "another site's page", NULL},
};

static void what_is_said_on_the_wire(void **state) {
    const struct wire *wire = *state;
    struct text answer;
    text_init(&answer);
    int wrong = 0;
    for (size_t i = 0; i < sizeof talks / sizeof *talks; i++) {
        talk(wire, talks[i].lines, &answer);
        bool status = !*talks[i].status ? answer.length == 0
                                        : answer.length > 12 && strncmp(answer.data, "HTTP/1.", 7) == 0 &&
                                              strncmp(answer.data + 9, talks[i].status, 3) == 0;
        if (!status || (talks[i].holds && !strstr(answer.data, talks[i].holds)) ||
            (talks[i].not &&strstr(answer.data, talks[i].not ))) {
            print_error("%s: got\n%.900s\n", talks[i].what, answer.data);
            wrong++;
        }
    }
    text_release(&answer);
    assert_int_equal(wrong, 0);
}

static void headers_without_end_are_cut_off(void **state) {
    const struct wire *wire = *state;
    struct text lines, answer;
    text_init(&lines);
    text_init(&answer);
    text_literal(&lines, "GET / HTTP/1.1\nHost: HOST\nX-Long: ");
    for (size_t i = 0; i < 100000; i++) {
        text_literal(&lines, "x");
    }
    text_literal(&lines, "\nConnection: close\n\n");
    talk(wire, lines.data, &answer);
    assert_true(strncmp(answer.data + 9, "200", 3) != 0);
    text_release(&lines);
    text_release(&answer);
}

/* A connection that says nothing, and one that stops in the middle, keep nobody waiting. */
static void a_slow_talker_stalls_nobody(void **state) {
    const struct wire *wire = *state;
    int silent = connected(wire), half = connected(wire);
    assert_true(send(half, "POST /open HTTP/1.1\r\nHost: ", 27, MSG_NOSIGNAL) == 27);
    struct text answer;
    text_init(&answer);
    double begin = clock_seconds();
    for (int i = 0; i < 10; i++) {
        talk(wire, "GET /agenda.json HTTP/1.1\nHost: HOST\nCookie: COOKIE\nConnection: close\n\n", &answer);
        assert_int_equal(strncmp(answer.data + 9, "200", 3), 0);
    }
    assert_true(clock_seconds() - begin < 10);
    close(silent);
    close(half);
    text_release(&answer);
}

static void only_the_loopback_answers(void **state) {
    const struct wire *wire = *state;
    int handle = socket(AF_INET, SOCK_STREAM, 0);
    struct sockaddr_in address = {.sin_family = AF_INET, .sin_port = htons((uint16_t)wire->port)};
    address.sin_addr.s_addr = htonl(INADDR_LOOPBACK + 1); /* 127.0.0.2: this machine too, but not where we listen */
    assert_int_not_equal(connect(handle, (struct sockaddr *)&address, sizeof address), 0);
    close(handle);
}

static void a_taken_port_is_refused_with_the_way_out(void **state) {
    const struct wire *wire = *state;
    struct fault fault;
    fault_init(&fault);
    struct server_state *other = server_new("/tmp", &fault);
    assert_null(listener_start(other, wire->port, &fault));
    char wanted[160];
    snprintf(wanted, sizeof wanted,
        "cannot listen on port %u of 127.0.0.1 (Address already in use); --port 0 takes a free one", wire->port);
    assert_string_equal(fault.message, wanted);
    server_free(other);
}

static void *talk_much(void *closure) {
    const struct wire *wire = closure;
    struct text answer;
    text_init(&answer);
    size_t good = 0;
    for (int i = 0; i < 20; i++) {
        talk(wire, "GET /exhibit/decisions.json HTTP/1.1\nHost: HOST\nCookie: COOKIE\nConnection: close\n\n", &answer);
        good += answer.length > 12 && strncmp(answer.data + 9, "200", 3) == 0 &&
                strrchr(answer.data, '}') + 2 >= answer.data + answer.length;
    }
    text_release(&answer);
    return (void *)good;
}

static void many_talk_at_once(void **state) {
    struct wire *wire = *state;
    pthread_t threads[8];
    for (size_t i = 0; i < 8; i++) {
        assert_int_equal(pthread_create(&threads[i], NULL, talk_much, wire), 0);
    }
    for (size_t i = 0; i < 8; i++) {
        void *good;
        pthread_join(threads[i], &good);
        assert_int_equal((size_t)good, 20);
    }
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(what_is_said_on_the_wire),
        cmocka_unit_test(headers_without_end_are_cut_off),
        cmocka_unit_test(a_slow_talker_stalls_nobody),
        cmocka_unit_test(only_the_loopback_answers),
        cmocka_unit_test(a_taken_port_is_refused_with_the_way_out),
        cmocka_unit_test(many_talk_at_once),
    };
    return cmocka_run_group_tests_name("http/listener", tests, wire_open, wire_leave);
}
