/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A streaming JSON writer (RFC 8259) over a text. Misuse (a key outside an object, two values after one key, a
 * bracket too many) is a programmer error and stops the program. The text is borrowed. Strings are valid UTF-8
 * and are copied as they are; quotes, backslashes and control characters are escaped. One writer belongs to one
 * thread. */
#ifndef EVENHAND_DRAW_JSON_H
#define EVENHAND_DRAW_JSON_H
#include "base/text.h"
#include <stdbool.h>
#include <stdint.h>

enum { JSON_DEPTH = 32 };

struct json {
    struct text *out;
    size_t depth;
    bool object[JSON_DEPTH]; /* is the bracket at this depth an object? */
    bool filled[JSON_DEPTH]; /* has it a member already? */
    bool after_key;
    bool finished; /* a whole value stands at the top */
};

void json_init(struct json *json, struct text *out);
void json_finish(const struct json *json); /* stops the program unless exactly one whole value was written */

void json_object(struct json *json);
void json_array(struct json *json);
void json_close(struct json *json); /* the innermost object or array */
void json_key(struct json *json, const char *key);

void json_string(struct json *json, const char *value); /* NULL writes null */
void json_number(struct json *json, double value);      /* NaN and infinities write null; see number_exact */
void json_integer(struct json *json, int64_t value);
void json_bool(struct json *json, bool value);
void json_null(struct json *json);
void json_raw(struct json *json, const char *written); /* a whole value that this writer made before */

void json_key_object(struct json *json, const char *key);
void json_key_array(struct json *json, const char *key);
void json_field_string(struct json *json, const char *key, const char *value);
void json_field_number(struct json *json, const char *key, double value);
void json_field_integer(struct json *json, const char *key, int64_t value);
void json_field_bool(struct json *json, const char *key, bool value);
void json_field_null(struct json *json, const char *key);
#endif
