/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "intake/number.h"
#include "base/memory.h"
#include <float.h>
#include <locale.h>
#include <math.h>
#include <pthread.h>
#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>

/* Where the parts of a number stand in its text, and what is gathered on the way. */
struct parts {
    const char *separator; /* the point or comma, NULL where there is none */
    uint64_t digits;       /* the first 19 significant digits */
    int digit_count;       /* significant digits in all */
    int decimals;
    int exponent;          /* as written after e, held within +-99999 */
    bool negative;
};

static bool is_digit(char c) {
    return c >= '0' && c <= '9';
}

static bool is_space(char c) {
    return c == ' ' || (c >= '\t' && c <= '\r');
}

static void take_digit(struct parts *parts, char c) {
    if (parts->digit_count == 0 && c == '0') {
        return;
    }
    if (parts->digit_count < 19) {
        parts->digits = parts->digits * 10 + (uint64_t)(c - '0');
    }
    parts->digit_count++;
}

static const char *scan_mantissa(const char *at, const char *end, char decimal, struct parts *parts) {
    bool any = false;
    for (; at < end; at++) {
        if (is_digit(*at)) {
            any = true;
            parts->decimals += parts->separator != NULL;
            take_digit(parts, *at);
        } else if ((*at == '.' || *at == decimal) && !parts->separator) {
            parts->separator = at;
        } else {
            break;
        }
    }
    return any ? at : NULL;
}

static const char *scan_exponent(const char *at, const char *end, struct parts *parts) {
    bool negative = at < end && *at == '-';
    at += at < end && (*at == '-' || *at == '+');
    if (at == end) {
        return NULL;
    }
    for (; at < end && is_digit(*at); at++) {
        if (parts->exponent < 99999) {
            parts->exponent = parts->exponent * 10 + (*at - '0');
        }
    }
    parts->exponent = negative ? -parts->exponent : parts->exponent;
    return at;
}

static bool scan(const char *at, const char *end, char decimal, struct parts *parts) {
    *parts = (struct parts){.negative = at < end && *at == '-'};
    at += at < end && (*at == '-' || *at == '+');
    at = scan_mantissa(at, end, decimal, parts);
    if (at && at < end && (*at == 'e' || *at == 'E')) {
        at = scan_exponent(at + 1, end, parts);
    }
    return at == end;
}

/* Both operands are exact doubles, so one IEEE operation rounds correctly (Clinger 1990, "How to read floating point
 * numbers accurately", PLDI). */
static bool exact(const struct parts *parts, double *value) {
    static const double powers[] = {1e0, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9, 1e10, 1e11, 1e12, 1e13, 1e14,
        1e15, 1e16, 1e17, 1e18, 1e19, 1e20, 1e21, 1e22};
    int power = parts->exponent - parts->decimals;
    if (FLT_EVAL_METHOD != 0 || parts->digit_count > 19 || parts->digits > (UINT64_C(1) << 53) || power > 22 ||
        power < -22) {
        return false;
    }
    double digits = (double)parts->digits;
    double size = power < 0 ? digits / powers[-power] : digits * powers[power];
    *value = parts->negative ? -size : size;
    return true;
}

static locale_t plain_locale;

static void make_plain_locale(void) {
    plain_locale = newlocale(LC_ALL_MASK, "C", (locale_t)0);
}

static double by_library(const char *at, size_t length, const char *separator) {
    static pthread_once_t once = PTHREAD_ONCE_INIT;
    pthread_once(&once, make_plain_locale);
    char room[256], *copy = length < sizeof room ? room : memory_new(length + 1, 1);
    memcpy(copy, at, length);
    copy[length] = '\0';
    if (separator) {
        copy[separator - at] = '.';
    }
    double value = strtod_l(copy, NULL, plain_locale);
    if (copy != room) {
        memory_free(copy);
    }
    return value;
}

static enum number_reading read_limits(const char **at, const char *end) {
    enum number_reading reading = **at == '<' ? NUMBER_BELOW_LIMIT : **at == '>' ? NUMBER_ABOVE_LIMIT : NUMBER_READ;
    if (reading != NUMBER_READ) {
        for (++*at; *at < end && is_space(**at); ++*at) {
        }
    }
    return reading;
}

enum number_reading number_read(const char *text, char decimal, double *value, int *decimals) {
    double unused_value;
    int unused_decimals;
    value = value ? value : &unused_value;
    decimals = decimals ? decimals : &unused_decimals;
    *value = NAN;
    *decimals = 0;
    while (is_space(*text)) {
        text++;
    }
    const char *end = text + strlen(text);
    while (end > text && is_space(end[-1])) {
        end--;
    }
    if (text == end) {
        return NUMBER_BLANK;
    }
    enum number_reading reading = read_limits(&text, end);
    struct parts parts;
    if (!scan(text, end, decimal, &parts)) {
        return NUMBER_UNREADABLE;
    }
    double found;
    if (!exact(&parts, &found)) {
        found = by_library(text, (size_t)(end - text), parts.separator);
    }
    if (!isfinite(found)) {
        return NUMBER_UNREADABLE;
    }
    *value = found;
    *decimals = parts.decimals;
    return reading;
}
