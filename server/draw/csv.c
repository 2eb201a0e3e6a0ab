/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "draw/csv.h"
#include "draw/number.h"
#include <inttypes.h>
#include <math.h>
#include <string.h>

void csv_init(struct csv *csv, struct text *out) {
    *csv = (struct csv){.out = out};
}

static void begin_field(struct csv *csv) {
    if (csv->started) {
        text_literal(csv->out, ",");
    }
    csv->started = true;
}

static bool needs_quotes(const char *value) {
    size_t length = strlen(value);
    return value[strcspn(value, ",\"\r\n")] != '\0' ||
           (length && (value[0] == ' ' || value[0] == '\t' || value[length - 1] == ' ' || value[length - 1] == '\t'));
}

void csv_string(struct csv *csv, const char *value) {
    begin_field(csv);
    if (!value) {
        return;
    }
    if (!needs_quotes(value)) {
        text_string(csv->out, value);
        return;
    }
    text_literal(csv->out, "\"");
    for (const char *at = value; *at; at++) {
        if (*at == '"') {
            text_literal(csv->out, "\"");
        }
        text_char(csv->out, *at);
    }
    text_literal(csv->out, "\"");
}

void csv_number(struct csv *csv, double value) {
    begin_field(csv);
    if (isfinite(value)) {
        number_exact(csv->out, value);
    }
}

void csv_integer(struct csv *csv, int64_t value) {
    begin_field(csv);
    text_format(csv->out, "%" PRId64, value);
}

void csv_end(struct csv *csv) {
    text_literal(csv->out, "\n");
    csv->started = false;
}
