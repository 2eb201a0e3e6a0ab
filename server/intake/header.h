/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The rule for a header's names, one for every received format: none empty, none twice, not all of them numbers.
 * Inside intake only. */
#ifndef EVENHAND_SERVER_INTAKE_HEADER_H
#define EVENHAND_SERVER_INTAKE_HEADER_H
#include <stdbool.h>
#include <stddef.h>

enum header_problem { HEADER_NAME_EMPTY, HEADER_NAME_TWICE, HEADER_ALL_NUMBERS };
enum { HEADER_FLAW_ROOM = 400, COLUMN_WORD_ROOM = 16, COLUMN_LIMIT = 1999 };

struct header_flaw {
    enum header_problem problem;
    size_t column, first; /* 0-based; first: where the name stood before */
};

/* Takes the ASCII space off both ends. */
void header_trim(char *name);
/* Names are trimmed already. False fills `flaw`. */
bool header_check(char *const *names, size_t count, struct header_flaw *flaw);
/* What is wrong and the way out, without the place; `line` is what the format calls a line. column_word writes what the
 * format calls a 0-based column; NULL: its 1-based number. Returns `out`. */
const char *header_sentence(char out[HEADER_FLAW_ROOM], const struct header_flaw *flaw, const char *line,
    char *const *names, void (*column_word)(char out[COLUMN_WORD_ROOM], size_t column));
#endif
