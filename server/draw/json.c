/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "draw/json.h"
#include "base/memory.h"
#include "draw/number.h"
#include <inttypes.h>
#include <math.h>

void json_init(struct json *json, struct text *out) {
    *json = (struct json){.out = out};
}

void json_finish(const struct json *json) {
    BUG_IF(json->depth != 0 || !json->finished);
}

/* Everything that stands where a value may passes here: it puts the comma and keeps the grammar. */
static void begin_value(struct json *json) {
    if (json->depth == 0) {
        BUG_IF(json->finished);
        json->finished = true;
        return;
    }
    size_t top = json->depth - 1;
    if (json->object[top]) {
        BUG_IF(!json->after_key);
        json->after_key = false;
        return;
    }
    if (json->filled[top]) {
        text_literal(json->out, ",");
    }
    json->filled[top] = true;
}

static void open_bracket(struct json *json, bool object) {
    begin_value(json);
    BUG_IF(json->depth == JSON_DEPTH);
    json->object[json->depth] = object;
    json->filled[json->depth] = false;
    json->depth++;
    text_char(json->out, object ? '{' : '[');
}

void json_object(struct json *json) {
    open_bracket(json, true);
}

void json_array(struct json *json) {
    open_bracket(json, false);
}

void json_close(struct json *json) {
    BUG_IF(json->depth == 0 || json->after_key);
    json->depth--;
    text_char(json->out, json->object[json->depth] ? '}' : ']');
}

static void quoted(struct text *out, const char *string) {
    text_literal(out, "\"");
    const char *plain = string;
    for (const char *at = string; *at; at++) {
        unsigned char byte = (unsigned char)*at;
        if (byte >= 0x20 && byte != '"' && byte != '\\') {
            continue;
        }
        text_append(out, plain, (size_t)(at - plain));
        plain = at + 1;
        switch (byte) {
        case '"':
            text_literal(out, "\\\"");
            break;
        case '\\':
            text_literal(out, "\\\\");
            break;
        case '\n':
            text_literal(out, "\\n");
            break;
        case '\t':
            text_literal(out, "\\t");
            break;
        default:
            text_format(out, "\\u%04x", (unsigned)byte);
        }
    }
    text_string(out, plain);
    text_literal(out, "\"");
}

void json_key(struct json *json, const char *key) {
    BUG_IF(json->depth == 0 || !json->object[json->depth - 1] || json->after_key);
    if (json->filled[json->depth - 1]) {
        text_literal(json->out, ",");
    }
    json->filled[json->depth - 1] = true;
    quoted(json->out, key);
    text_literal(json->out, ":");
    json->after_key = true;
}

void json_string(struct json *json, const char *value) {
    if (!value) {
        json_null(json);
        return;
    }
    begin_value(json);
    quoted(json->out, value);
}

void json_number(struct json *json, double value) {
    if (!isfinite(value)) {
        json_null(json);
        return;
    }
    begin_value(json);
    number_exact(json->out, value);
}

void json_integer(struct json *json, int64_t value) {
    begin_value(json);
    text_format(json->out, "%" PRId64, value);
}

void json_bool(struct json *json, bool value) {
    begin_value(json);
    text_string(json->out, value ? "true" : "false");
}

void json_null(struct json *json) {
    begin_value(json);
    text_literal(json->out, "null");
}

void json_raw(struct json *json, const char *written) {
    begin_value(json);
    text_string(json->out, written);
}

void json_key_object(struct json *json, const char *key) {
    json_key(json, key);
    json_object(json);
}

void json_key_array(struct json *json, const char *key) {
    json_key(json, key);
    json_array(json);
}

void json_field_string(struct json *json, const char *key, const char *value) {
    json_key(json, key);
    json_string(json, value);
}

void json_field_number(struct json *json, const char *key, double value) {
    json_key(json, key);
    json_number(json, value);
}

void json_field_integer(struct json *json, const char *key, int64_t value) {
    json_key(json, key);
    json_integer(json, value);
}

void json_field_bool(struct json *json, const char *key, bool value) {
    json_key(json, key);
    json_bool(json, value);
}

void json_field_null(struct json *json, const char *key) {
    json_key(json, key);
    json_null(json);
}
