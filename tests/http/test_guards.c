/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The guards, one spoiled thing at a time, and what every reply bears. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <cmocka.h>
#include "fixture.h"

static const struct {
    const char *what, *method, *target;
    size_t hosts;
    const char *host, *origin, *site, *cookie; /* NULL: as it should be; "-": not sent */
    uint64_t length;
    unsigned status;
    const char *sentence; /* NULL: none, or a page */
} cases[] = {
    {"all as it should be", "GET", "/agenda.json", 1, NULL, NULL, NULL, NULL, 0, 200, NULL},
    {"by the name localhost", "GET", "/agenda.json", 1, "LocalHost:4321", NULL, NULL, NULL, 0, 200, NULL},
    {"no Host", "GET", "/agenda.json", 0, NULL, NULL, NULL, NULL, 0, 400,
        "a request needs exactly one Host header; this one has 0"},
    {"two Hosts", "GET", "/agenda.json", 2, NULL, NULL, NULL, NULL, 0, 400,
        "a request needs exactly one Host header; this one has 2"},
    {"another name", "GET", "/agenda.json", 1, "example.org:4321", NULL, NULL, NULL, 0, 403,
        "this server answers to 127.0.0.1:4321 and localhost:4321 only; open the address that was printed"},
    {"another port", "GET", "/agenda.json", 1, "127.0.0.1:4322", NULL, NULL, NULL, 0, 403,
        "this server answers to 127.0.0.1:4321 and localhost:4321 only; open the address that was printed"},
    {"no port", "GET", "/agenda.json", 1, "127.0.0.1", NULL, NULL, NULL, 0, 403,
        "this server answers to 127.0.0.1:4321 and localhost:4321 only; open the address that was printed"},
    {"a name that only starts right", "GET", "/agenda.json", 1, "127.0.0.1:4321.example.org", NULL, NULL, NULL, 0, 403,
        "this server answers to 127.0.0.1:4321 and localhost:4321 only; open the address that was printed"},
    {"no cookie", "GET", "/agenda.json", 1, NULL, NULL, NULL, "-", 0, 403,
        "this needs the key: open the whole address that was printed at the start"},
    {"a cookie of another port", "GET", "/agenda.json", 1, NULL, NULL, NULL,
        "evenhand-80=00000000000000000000000000000000", 0, 403,
        "this needs the key: open the whole address that was printed at the start"},
    {"a made-up cookie", "GET", "/agenda.json", 1, NULL, NULL, NULL, "evenhand-4321=00000000000000000000000000000000",
        0, 403, "this needs the key: open the whole address that was printed at the start"},
    {"an empty cookie, for the free places", "GET", "/agenda.json", 1, NULL, NULL, NULL, "evenhand-4321=", 0, 403,
        "this needs the key: open the whole address that was printed at the start"},
    {"no cookie, changing something", "POST", "/close", 1, NULL, NULL, NULL, "-", 0, 403,
        "this needs the key: open the whole address that was printed at the start"},
    {"the page without a key", "GET", "/", 1, NULL, NULL, NULL, "-", 0, 403, NULL},
    {"the page with a wrong key", "GET", "/?key=00000000000000000000000000000000", 1, NULL, NULL, NULL, "-", 0, 403,
        NULL},
    {"the page with a cut key", "GET", "/?key=0", 1, NULL, NULL, NULL, "-", 0, 403, NULL},
    {"foreign Origin", "POST", "/decisions", 1, NULL, "http://example.org", NULL, NULL, 2, 403,
        "another site's page asked for this; only Evenhand's own page may"},
    {"our host, another port", "POST", "/decisions", 1, NULL, "http://127.0.0.1:80", NULL, NULL, 2, 403,
        "another site's page asked for this; only Evenhand's own page may"},
    {"Origin null", "POST", "/decisions", 1, NULL, "null", NULL, NULL, 2, 403,
        "another site's page asked for this; only Evenhand's own page may"},
    {"Origin of https", "POST", "/decisions", 1, NULL, "https://127.0.0.1:4321", NULL, NULL, 2, 403,
        "another site's page asked for this; only Evenhand's own page may"},
    {"no Origin", "POST", "/decisions", 1, NULL, "-", NULL, NULL, 2, 403,
        "a request that changes something must say its Origin, http://127.0.0.1:4321"},
    {"cross-site", "POST", "/decisions", 1, NULL, NULL, "cross-site", NULL, 2, 403,
        "another site's page asked for this; only Evenhand's own page may"},
    {"same-site is another port", "POST", "/decisions", 1, NULL, NULL, "same-site", NULL, 2, 403,
        "another site's page asked for this; only Evenhand's own page may"},
    {"data for another site's page", "GET", "/agenda.json", 1, NULL, NULL, "cross-site", NULL, 0, 403,
        "another site's page asked for this; only Evenhand's own page may"},
    {"an exhibit for another port's page", "GET", "/exhibit/decisions.json", 1, NULL, NULL, "same-site", NULL, 0, 403,
        "another site's page asked for this; only Evenhand's own page may"},
    {"a link from elsewhere to the page", "GET", "/", 1, NULL, NULL, "cross-site", NULL, 0, 200, NULL},
    {"typed by a person", "GET", "/agenda.json", 1, NULL, NULL, "none", NULL, 0, 200, NULL},
    {"a browser that says no Sec-Fetch-Site", "POST", "/open", 1, NULL, NULL, "-", NULL, 0, 400,
        "the request has no body; it must be a JSON object"},
    {"PUT", "PUT", "/decisions", 1, NULL, NULL, NULL, NULL, 0, 405, "/decisions takes POST, not PUT"},
    {"GET of what changes", "GET", "/decisions", 1, NULL, NULL, NULL, NULL, 0, 405, "/decisions takes POST, not GET"},
    {"POST of an exhibit", "POST", "/exhibit/decisions", 1, NULL, NULL, NULL, NULL, 0, 405,
        "/exhibit/decisions takes GET, HEAD, not POST"},
    {"POST of the page", "POST", "/", 1, NULL, NULL, NULL, NULL, 0, 405, "/ takes GET, HEAD, not POST"},
    {"DELETE of nothing", "DELETE", "/nowhere", 1, NULL, NULL, NULL, NULL, 0, 404, "there is nothing at /nowhere"},
    {"unknown route", "GET", "/nowhere", 1, NULL, NULL, NULL, NULL, 0, 404, "there is nothing at /nowhere"},
    {"up and out", "GET", "/../etc/passwd", 1, NULL, NULL, NULL, NULL, 0, 404, "there is nothing at /../etc/passwd"},
    {"up and out, encoded", "GET", "/..%2f..%2fetc%2fpasswd", 1, NULL, NULL, NULL, NULL, 0, 404,
        "there is nothing at /../../etc/passwd"},
    {"a file of the folder", "GET", "/quayside.study", 1, NULL, NULL, NULL, NULL, 0, 404,
        "there is nothing at /quayside.study"},
    {"NUL in the path", "GET", "/index.html%00.css", 1, NULL, NULL, NULL, NULL, 0, 400,
        "the address has a control character in it"},
    {"a broken escape", "GET", "/%zz", 1, NULL, NULL, NULL, NULL, 0, 400,
        "the address has a % without two hexadecimal digits after it"},
    {"an escape cut short", "GET", "/%4", 1, NULL, NULL, NULL, NULL, 0, 400,
        "the address has a % without two hexadecimal digits after it"},
    {"no UTF-8", "GET", "/%ff", 1, NULL, NULL, NULL, NULL, 0, 400, "the address is not UTF-8"},
    {"a whole address", "GET", "http://127.0.0.1:4321/", 1, NULL, NULL, NULL, NULL, 0, 400,
        "the address must start with a slash"},
    {"an argument twice", "GET", "/exhibit/decisions?set=full&set=full", 1, NULL, NULL, NULL, NULL, 0, 400,
        "\"set\" stands twice in the address; give it once"},
    {"a body too large", "POST", "/decisions", 1, NULL, NULL, NULL, NULL, (4 << 20) + 1, 413,
        "the request's body is larger than the 4 MB that /decisions takes"},
    {"a file too large", "POST", "/drafts?name=x.csv", 1, NULL, NULL, NULL, NULL, (256 << 20) + 1, 413,
        "the request's body is larger than the 256 MB that /drafts takes"},
    {"GET with a body", "GET", "/agenda.json", 1, NULL, NULL, NULL, NULL, 1, 413, "/agenda.json takes no body"},
};

static const char *or_default(const char *given, const char *usual) {
    return !given ? usual : strcmp(given, "-") == 0 ? NULL : given;
}

static void one_spoiled_thing_is_refused(void **state) {
    const struct house *house = *state;
    static const char body[] = "{}";
    int wrong = 0;
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        struct request request = plain_request(house, cases[i].method);
        request.host_count = cases[i].hosts;
        request.host = cases[i].host ? cases[i].host : request.host;
        request.origin = or_default(cases[i].origin, request.origin);
        request.fetch_site = or_default(cases[i].site, request.fetch_site);
        request.cookie = or_default(cases[i].cookie, request.cookie);
        struct reply reply;
        send_to(house, &request, cases[i].target, body, cases[i].length, &reply);
        const char *sentence = sentence_of(&reply);
        if (reply.status != cases[i].status || strcmp(sentence, cases[i].sentence ? cases[i].sentence : "") != 0) {
            print_error("%s: got %u \"%s\"\n", cases[i].what, reply.status, sentence);
            wrong++;
        }
        reply_release(&reply);
    }
    assert_int_equal(wrong, 0);
}

static void a_person_without_key_is_told_how_to_open(void **state) {
    const struct house *house = *state;
    static const char *const targets[] = {"/", "/?key=nonsense", "/exhibit/decisions"};
    for (size_t i = 0; i < 3; i++) {
        struct request request = plain_request(house, "GET");
        request.cookie = NULL;
        request.accept = "text/html,application/xhtml+xml";
        struct reply reply;
        send_to(house, &request, targets[i], NULL, 0, &reply);
        assert_int_equal(reply.status, 403);
        assert_string_equal(reply.content_type, "text/html; charset=utf-8");
        assert_non_null(strstr(reply.body.data, "Evenhand is open at"));
        assert_null(reply_header_of(&reply, "Set-Cookie"));
        reply_release(&reply);
    }
}

static void the_key_is_exchanged_for_a_cookie(void **state) {
    const struct house *house = *state;
    char target[160];
    assert_int_equal(strlen(server_key(house->state)), 32); /* 128 bits */
    snprintf(target, sizeof target, "/?key=%s&item=effect&outcome=s%%26p+x", server_key(house->state));
    struct request request = plain_request(house, "GET");
    request.cookie = NULL;
    struct reply reply;
    send_to(house, &request, target, NULL, 0, &reply);
    assert_int_equal(reply.status, 303);
    assert_string_equal(reply_header_of(&reply, "Location"), "/?item=effect&outcome=s%26p%20x");
    const char *cookie = reply_header_of(&reply, "Set-Cookie");
    assert_int_equal(strncmp(cookie, "evenhand-4321=", 14), 0);
    assert_non_null(strstr(cookie, "; HttpOnly"));
    assert_non_null(strstr(cookie, "; SameSite=Strict"));
    assert_null(strstr(cookie, server_key(house->state))); /* the cookie is no key */
    assert_int_equal(reply.body.length, 0);
    char beside[256];
    snprintf(beside, sizeof beside, "other=1; %.*s; more=2", (int)strcspn(cookie, ";"), cookie);
    reply_release(&reply);
    request.cookie = beside;
    send_to(house, &request, "/agenda.json", NULL, 0, &reply);
    assert_int_equal(reply.status, 200);
    reply_release(&reply);
    /* not elsewhere than on the page */
    request.cookie = NULL;
    snprintf(target, sizeof target, "/agenda.json?key=%s", server_key(house->state));
    send_to(house, &request, target, NULL, 0, &reply);
    assert_int_equal(reply.status, 403);
    reply_release(&reply);
}

static void a_key_for_once_opens_once(void **state) {
    const struct house *house = *state;
    static const unsigned wanted[] = {303, 403};
    char key[33], target[64];
    struct fault fault;
    fault_init(&fault);
    assert_true(server_key_once(house->state, key, &fault));
    assert_string_not_equal(key, server_key(house->state));
    snprintf(target, sizeof target, "/?key=%s", key);
    for (size_t i = 0; i < 2; i++) {
        struct request request = plain_request(house, "GET");
        struct reply reply;
        request.cookie = NULL;
        send_to(house, &request, target, NULL, 0, &reply);
        assert_int_equal(reply.status, wanted[i]);
        reply_release(&reply);
    }
    struct request request = plain_request(house, "GET"); /* used up is not open to nothing */
    struct reply reply;
    request.cookie = NULL;
    send_to(house, &request, "/?key=", NULL, 0, &reply);
    assert_int_equal(reply.status, 403);
    reply_release(&reply);
}

static void keys_differ_from_server_to_server(void **state) {
    const struct house *house = *state;
    struct fault fault;
    fault_init(&fault);
    struct server_state *other = server_new("/tmp", &fault);
    assert_non_null(other);
    assert_string_not_equal(server_key(other), server_key(house->state));
    server_free(other);
}

static void every_reply_bears_the_security_headers(void **state) {
    const struct house *house = *state;
    static const char *const targets[] = {
        "/", "/agenda.json", "/exhibit/decisions", "/exhibit/nothing", "/nowhere", "/?key=wrong"};
    static const char *const headers[][2] = {
        {"Content-Security-Policy",
            "default-src 'none'; script-src 'self'; style-src 'self'; img-src 'self'; connect-src 'self'; "
            "form-action 'self'; base-uri 'none'; frame-ancestors 'none'"},
        {"X-Content-Type-Options", "nosniff"}, {"Referrer-Policy", "no-referrer"},
        {"Cross-Origin-Opener-Policy", "same-origin"}, {"Cross-Origin-Resource-Policy", "same-origin"}};
    for (size_t i = 0; i < sizeof targets / sizeof *targets; i++) {
        for (int known = 0; known < 2; known++) {
            struct request request = plain_request(house, "GET");
            request.cookie = known ? request.cookie : NULL;
            struct reply reply;
            send_to(house, &request, targets[i], NULL, 0, &reply);
            for (size_t j = 0; j < sizeof headers / sizeof *headers; j++) {
                assert_non_null(reply_header_of(&reply, headers[j][0]));
                assert_string_equal(reply_header_of(&reply, headers[j][0]), headers[j][1]);
            }
            bool page = known && targets[i][1] != 'a' && targets[i][1] != 'e' && targets[i][1] != 'n';
            assert_string_equal(reply_header_of(&reply, "Cache-Control"), page ? "no-cache" : "no-store");
            assert_null(reply_header_of(&reply, "Access-Control-Allow-Origin"));
            reply_release(&reply);
        }
    }
}

/* Only headers are here yet: what will be refused is refused before its body comes. */
static void a_large_body_is_refused_before_it_comes(void **state) {
    const struct house *house = *state;
    struct request request = plain_request(house, "POST");
    request.path = "/decisions";
    request.body_length = UINT64_C(1) << 40;
    struct reply reply;
    reply_init(&reply);
    assert_false(admit(house->state, &request, &reply));
    assert_int_equal(reply.status, 413);
    reply_release(&reply);
    request.body_length = 100;
    reply_init(&reply);
    assert_true(admit(house->state, &request, &reply));
    assert_int_equal(reply.body.length, 0);
    reply_release(&reply);
}

/* The table itself. */
static void every_route_is_described_and_distinct(void **state) {
    (void)state;
    for (const struct route *route = routes; route->path; route++) {
        assert_true(*route->says && route->answer != NULL && route->path[0] == '/');
        assert_true(strcmp(route->method, "GET") == 0 ? route->body_limit == 0 : route->body_limit > 0);
        for (const struct route *other = routes; other != route; other++) {
            assert_true(strcmp(other->path, route->path) != 0 || strcmp(other->method, route->method) != 0);
        }
    }
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(one_spoiled_thing_is_refused),
        cmocka_unit_test(a_person_without_key_is_told_how_to_open),
        cmocka_unit_test(the_key_is_exchanged_for_a_cookie),
        cmocka_unit_test(a_key_for_once_opens_once),
        cmocka_unit_test(keys_differ_from_server_to_server),
        cmocka_unit_test(every_reply_bears_the_security_headers),
        cmocka_unit_test(a_large_body_is_refused_before_it_comes),
        cmocka_unit_test(every_route_is_described_and_distinct),
    };
    return cmocka_run_group_tests_name("http/guards", tests, house_open, house_leave);
}
