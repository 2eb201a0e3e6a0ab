/* SPDX-License-Identifier: GPL-3.0-or-later */
/* SHA-256 (FIPS 180-4, by nettle) as 64 lower-case hexadecimal digits. */
#ifndef EVENHAND_BASE_HASH_H
#define EVENHAND_BASE_HASH_H
#include <nettle/sha2.h>
#include <stddef.h>

enum { HASH_SIZE = 65 }; /* digits and the NUL */

struct hash {
    struct sha256_ctx context;
};

void hash_init(struct hash *hash);
void hash_bytes(struct hash *hash, const void *bytes, size_t length);
/* A field with its length before it, so that no two lists of fields read alike; NULL differs from "". */
void hash_field(struct hash *hash, const char *string);
void hash_finish(struct hash *hash, char digits[HASH_SIZE]);
void hash_of(const void *bytes, size_t length, char digits[HASH_SIZE]);
#endif
