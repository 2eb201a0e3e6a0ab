/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Which encoding received bytes are in, and the same text in UTF-8. Inside intake only. */
#ifndef EVENHAND_SERVER_INTAKE_ENCODING_H
#define EVENHAND_SERVER_INTAKE_ENCODING_H
#include "base/fault.h"
#include <stddef.h>

struct encoded {
    const char *text;     /* UTF-8 without byte order mark; not NUL-terminated; may hold NUL bytes */
    size_t length;
    char *owned;          /* what the caller frees, NULL where text lies within the received bytes */
    const char *word;     /* the encoding, for a person */
    bool byte_order_mark;
};

/* length >= 1. Borrows bytes; encoded.text may point into them. */
bool encoding_read(struct encoded *encoded, const char *bytes, size_t length, const char *name, struct fault *fault);
/* Windows-1252 -> UTF-8 at `out`, which has room for 3 * length bytes. The first byte that Windows-1252 does not define,
 * NULL where all is written. */
const char *encoding_windows_1252(char *out, size_t *written, const char *bytes, size_t length);
#endif
