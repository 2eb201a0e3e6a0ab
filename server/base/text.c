/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/text.h"
#include "base/memory.h"
#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <string.h>

void text_init(struct text *text) {
    *text = (struct text){.data = memory_new(64, 1), .capacity = 64};
}

void text_release(struct text *text) {
    memory_free(text->data);
    *text = (struct text){0};
}

void text_clear(struct text *text) {
    text->length = 0;
    text->data[0] = '\0';
}

static void text_reserve(struct text *text, size_t more) {
    size_t wanted = text->length + more + 1;
    if (wanted <= text->capacity) {
        return;
    }
    while (text->capacity < wanted) {
        text->capacity = text->capacity ? text->capacity * 2 : 64;
    }
    text->data = memory_grow(text->data, text->capacity, 1);
}

void text_append(struct text *text, const char *bytes, size_t length) {
    text_reserve(text, length);
    if (length) {
        memcpy(text->data + text->length, bytes, length);
    }
    text->length += length;
    text->data[text->length] = '\0';
}

void text_string(struct text *text, const char *string) {
    if (string) {
        text_append(text, string, strlen(string));
    }
}

void text_char(struct text *text, char c) {
    text_append(text, &c, 1);
}

void text_format(struct text *text, const char *format, ...) {
    va_list arguments;
    va_start(arguments, format);
    int length = vsnprintf(NULL, 0, format, arguments);
    va_end(arguments);
    BUG_IF(length < 0);
    text_reserve(text, (size_t)length);
    va_start(arguments, format);
    vsnprintf(text->data + text->length, (size_t)length + 1, format, arguments);
    va_end(arguments);
    text->length += (size_t)length;
}

char *text_take(struct text *text) {
    char *data = text->data;
    text_init(text);
    return data;
}

static void decimal(struct text *text, double value, int decimals, const char *plus) {
    if (isnan(value)) {
        text_literal(text, "\u2013");
        return;
    }
    if (isinf(value)) {
        text_string(text, value < 0 ? "\u2212\u221e" : "\u221e");
        return;
    }
    char digits[512];
    snprintf(digits, sizeof digits, "%.*f", decimals, fabs(value));
    bool zero = strspn(digits, "0.") == strlen(digits);
    if (!zero) {
        text_string(text, value < 0 ? "\u2212" : plus);
    }
    text_string(text, digits);
}

void text_decimal(struct text *text, double value, int decimals) {
    decimal(text, value, decimals, "");
}

void text_signed(struct text *text, double value, int decimals) {
    decimal(text, value, decimals, "+");
}

void text_p_value(struct text *text, double p) {
    if (isnan(p)) {
        text_literal(text, "\u2013");
    } else if (p < 0.001) {
        text_literal(text, "<0.001");
    } else {
        text_format(text, "%.*f", p < 0.0995 ? 3 : 2, p);
    }
}
