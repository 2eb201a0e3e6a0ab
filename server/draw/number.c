/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "draw/number.h"
#include "base/memory.h"
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistr.h>
#include <uniwidth.h>

void number_exact(struct text *out, double value) {
    BUG_IF(!isfinite(value));
    if (fabs(value) < 9007199254740992.0 && value == trunc(value)) {
        text_format(out, "%.0f", value == 0.0 ? 0.0 : value);
        return;
    }
    /* %g drops trailing zeros, so 15 digits give the shortest form whenever 15 or fewer are enough. */
    for (int digits = 15; digits <= 17; digits++) {
        char form[40];
        snprintf(form, sizeof form, "%.*g", digits, value);
        if (digits == 17 || strtod(form, NULL) == value) {
            text_string(out, form);
            return;
        }
    }
}

void number_powers(struct text *out, double value, bool with_sign) {
    static const char *const raised[] = {
        "\u2070", "\u00b9", "\u00b2", "\u00b3", "\u2074", "\u2075", "\u2076", "\u2077", "\u2078", "\u2079"};
    BUG_IF(!isfinite(value) || value == 0.0);
    int power = (int)floor(log10(fabs(value)) + 1e-9);
    double multiple = fabs(value) / pow(10.0, power);
    char digits[32];
    text_string(out, value < 0.0 ? "\u2212" : with_sign ? "+" : "");
    snprintf(digits, sizeof digits, "%.6g", multiple);
    if (strcmp(digits, "1") != 0) {
        text_format(out, "%s\u00d7", digits);
    }
    text_string(out, power < 0 ? "10\u207b" : "10");
    snprintf(digits, sizeof digits, "%d", abs(power));
    for (const char *at = digits; *at; at++) {
        text_string(out, raised[*at - '0']);
    }
}

void number_shown(struct text *out, double value, int decimals, bool with_sign) {
    if (isfinite(value) && fabs(value) >= 1e12) {
        number_powers(out, value, with_sign);
    } else if (with_sign) {
        text_signed(out, value, decimals);
    } else {
        text_decimal(out, value, decimals);
    }
}

int number_decimals(double step) {
    double scaled = fabs(step);
    int decimals = 0;
    while (decimals < 8 && fabs(scaled - round(scaled)) > 1e-6 * scaled) {
        scaled *= 10.0;
        decimals++;
    }
    return decimals;
}

size_t number_columns(const char *string) {
    const uint8_t *at = (const uint8_t *)string, *end = at + strlen(string);
    size_t columns = 0;
    while (at < end) {
        ucs4_t character;
        int used = u8_mbtoucr(&character, at, (size_t)(end - at));
        if (used <= 0) { /* a broken byte is shown as one replacement character */
            columns++;
            at++;
            continue;
        }
        int width = uc_width(character, "UTF-8");
        columns += width > 0 ? (size_t)width : 0;
        at += used;
    }
    return columns;
}

/* Widths in em, measured once on DejaVu Sans, the widest font a browser is likely to choose. */
static double em(unsigned char byte) {
    if (byte >= '0' && byte <= '9') {
        return 0.637;
    }
    if (strchr("ijlI.,:;'|! ()[]-/ftr", byte)) {
        return 0.415;
    }
    if (strchr("mwMWQO%@", byte)) {
        return 0.98;
    }
    return byte >= 'A' && byte <= 'Z' ? 0.74 : 0.635;
}

double number_width(const char *string, double size, bool bold) {
    if (!string) {
        return 0.0;
    }
    double width = 0.0;
    size_t ascii = 0;
    for (const char *at = string; *at; at++) {
        if ((unsigned char)*at < 128) {
            width += em((unsigned char)*at);
            ascii++;
        }
    }
    size_t columns = number_columns(string);
    width += 0.84 * (double)(columns - ascii); /* minus signs and dashes; a wide character counts two */
    return size * fmax(width * (bold ? 1.1 : 1.0), 0.6 * (double)columns);
}
