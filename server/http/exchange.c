/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "http/exchange.h"
#include "draw/json.h"
#include <stdarg.h>
#include <stdio.h>
#include <string.h>
#include <unistr.h>

void reply_init(struct reply *reply) {
    *reply = (struct reply){.status = 200, .content_type = "text/plain; charset=utf-8"};
    text_init(&reply->body);
    arena_init(&reply->arena);
}

void reply_release(struct reply *reply) {
    text_release(&reply->body);
    arena_release(&reply->arena);
}

void reply_header(struct reply *reply, const char *name, const char *value) {
    BUG_IF(reply->header_count == REPLY_HEADERS);
    reply->headers[reply->header_count++] = (struct pair){name, arena_text(&reply->arena, value)};
}

const char *reply_header_of(const struct reply *reply, const char *name) {
    for (size_t i = 0; i < reply->header_count; i++) {
        if (strcmp(reply->headers[i].name, name) == 0) {
            return reply->headers[i].value;
        }
    }
    return NULL;
}

static const unsigned status_of[] = {
    [FAULT_NONE] = 500,
    [FAULT_INPUT] = 400,
    [FAULT_MISSING] = 404,
    [FAULT_REFUSED] = 403,
    [FAULT_CONFLICT] = 409,
    [FAULT_SYSTEM] = 500,
};

/* Sentences quote what they refuse, cut to a length: half a character at the cut becomes U+FFFD. */
static void valid_text(struct text *out, const char *message) {
    size_t length = strlen(message);
    while (length) {
        const uint8_t *bad = u8_check((const uint8_t *)message, length);
        size_t good = bad ? (size_t)((const char *)bad - message) : length;
        text_append(out, message, good);
        if (bad) {
            text_literal(out, "\uFFFD");
            good++;
        }
        message += good;
        length -= good;
    }
}

static void place(struct json *json, const char *key, size_t value) {
    if (value) {
        json_field_integer(json, key, (int64_t)value);
    } else {
        json_field_null(json, key);
    }
}

void reply_fault(struct reply *reply, const struct fault *fault) {
    reply->status = status_of[fault->code];
    reply->content_type = "application/json";
    text_clear(&reply->body);
    struct text sentence;
    text_init(&sentence);
    valid_text(&sentence, fault->message);
    struct json json;
    json_init(&json, &reply->body);
    json_object(&json);
    json_field_string(&json, "fault", sentence.data);
    place(&json, "row", fault->row);
    place(&json, "column", fault->column);
    json_close(&json);
    json_finish(&json);
    text_release(&sentence);
}

void reply_refuse(struct reply *reply, unsigned status, const char *format, ...) {
    struct fault fault;
    fault_init(&fault);
    fault.code = FAULT_REFUSED;
    va_list arguments;
    va_start(arguments, format);
    vsnprintf(fault.message, sizeof fault.message, format, arguments);
    va_end(arguments);
    reply_fault(reply, &fault);
    reply->status = status;
}

static int hexadecimal(char c) {
    return c >= '0' && c <= '9'   ? c - '0'
           : c >= 'a' && c <= 'f' ? c - 'a' + 10
           : c >= 'A' && c <= 'F' ? c - 'A' + 10
                                  : -1;
}

/* Decodes one part of the target; `in_query`: a plus sign is a space. */
static char *decoded(const char *part, size_t length, bool in_query, struct arena *arena, struct fault *fault) {
    char *text = arena_bytes(arena, part, length);
    size_t used = 0;
    for (size_t i = 0; i < length; i++) {
        char c = part[i];
        if (c == '+' && in_query) {
            c = ' ';
        } else if (c == '%') {
            int high = -1, low = -1;
            if (length - i >= 3) {
                high = hexadecimal(part[i + 1]);
                low = hexadecimal(part[i + 2]);
            }
            if (high < 0 || low < 0) {
                fault_set(fault, FAULT_INPUT, "the address has a %% without two hexadecimal digits after it");
                return NULL;
            }
            c = (char)(high * 16 + low);
            i += 2;
        }
        if ((unsigned char)c < 0x20 || c == 0x7f) {
            fault_set(fault, FAULT_INPUT, "the address has a control character in it");
            return NULL;
        }
        text[used++] = c;
    }
    text[used] = '\0';
    if (u8_check((const uint8_t *)text, used)) {
        fault_set(fault, FAULT_INPUT, "the address is not UTF-8");
        return NULL;
    }
    return text;
}

static bool pair_read(struct pair *pair, const char *part, size_t length, struct arena *arena, struct fault *fault) {
    const char *equals = memchr(part, '=', length);
    size_t name_length = equals ? (size_t)(equals - part) : length;
    pair->name = decoded(part, name_length, true, arena, fault);
    pair->value = pair->name && equals ? decoded(equals + 1, length - name_length - 1, true, arena, fault) : "";
    return pair->name && pair->value;
}

bool request_target(struct request *request, const char *target, struct arena *arena, struct fault *fault) {
    if (target[0] != '/') {
        return fault_set(fault, FAULT_INPUT, "the address must start with a slash");
    }
    size_t path_length = strcspn(target, "?#");
    request->path = decoded(target, path_length, false, arena, fault);
    request->query = NULL;
    request->query_count = 0;
    if (!request->path || target[path_length] != '?') {
        return request->path != NULL;
    }
    const char *query = target + path_length + 1;
    size_t room = 1;
    for (const char *p = query; *p; p++) {
        room += *p == '&';
    }
    struct pair *pairs = ARENA_NEW(arena, room, struct pair);
    size_t count = 0;
    for (size_t length; *query; query += length + (query[length] == '&')) {
        length = strcspn(query, "&");
        if (length == 0) {
            continue;
        }
        if (!pair_read(&pairs[count], query, length, arena, fault)) {
            return false;
        }
        for (size_t i = 0; i < count; i++) {
            if (strcmp(pairs[i].name, pairs[count].name) == 0) {
                return fault_set(
                    fault, FAULT_INPUT, "\"%.60s\" stands twice in the address; give it once", pairs[i].name);
            }
        }
        count++;
    }
    request->query = pairs;
    request->query_count = count;
    return true;
}

const char *request_asked(const struct request *request, const char *name) {
    for (size_t i = 0; i < request->query_count; i++) {
        if (strcmp(request->query[i].name, name) == 0) {
            return request->query[i].value;
        }
    }
    return NULL;
}
