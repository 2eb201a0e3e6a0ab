/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "server/intake/header.h"
#include "base/map.h"
#include "intake/number.h"
#include <stdio.h>
#include <string.h>

void header_trim(char *name) {
    size_t length = strlen(name), lead = strspn(name, " \t\n\v\f\r");
    while (length > lead && strchr(" \t\n\v\f\r", name[length - 1])) {
        length--;
    }
    memmove(name, name + lead, length - lead);
    name[length - lead] = '\0';
}

static bool flawed(struct header_flaw *flaw, enum header_problem problem, size_t column, size_t first) {
    *flaw = (struct header_flaw){problem, column, first};
    return false;
}

static bool check_each(char *const *names, size_t count, struct map *seen, struct header_flaw *flaw) {
    bool numbers = true;
    for (size_t i = 0; i < count; i++) {
        if (!*names[i]) {
            return flawed(flaw, HEADER_NAME_EMPTY, i, i);
        }
        size_t first = (size_t)map_put(seen, names[i], (int32_t)i);
        if (first != i) {
            return flawed(flaw, HEADER_NAME_TWICE, i, first);
        }
        numbers = numbers && number_read(names[i], ',', NULL, NULL) == NUMBER_READ;
    }
    return !numbers || flawed(flaw, HEADER_ALL_NUMBERS, 0, 0);
}

bool header_check(char *const *names, size_t count, struct header_flaw *flaw) {
    struct map seen;
    map_init(&seen);
    bool good = check_each(names, count, &seen, flaw);
    map_release(&seen);
    return good;
}

const char *header_sentence(char out[HEADER_FLAW_ROOM], const struct header_flaw *flaw, const char *line,
    char *const *names, void (*column_word)(char out[COLUMN_WORD_ROOM], size_t column)) {
    char first[COLUMN_WORD_ROOM];
    snprintf(first, sizeof first, "%zu", flaw->first + 1);
    if (column_word) {
        column_word(first, flaw->first);
    }
    switch (flaw->problem) {
    case HEADER_NAME_EMPTY:
        snprintf(out, HEADER_FLAW_ROOM, "this column has no name in the header; give it one and load again");
        break;
    case HEADER_NAME_TWICE:
        snprintf(out, HEADER_FLAW_ROOM,
            "the name %.200s stands in column %s already; give each column a name of its own and load again",
            names[flaw->column], first);
        break;
    case HEADER_ALL_NUMBERS:
        snprintf(out, HEADER_FLAW_ROOM,
            "no header: the first %s holds only numbers; put a %s with the columns' names above it and load again", line,
            line);
        break;
    }
    return out;
}
