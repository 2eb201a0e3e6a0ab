/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/hash.h"
#include <stdio.h>
#include <string.h>

void hash_init(struct hash *hash) {
    sha256_init(&hash->context);
}

void hash_bytes(struct hash *hash, const void *bytes, size_t length) {
    sha256_update(&hash->context, length, bytes);
}

void hash_field(struct hash *hash, const char *string) {
    char head[32];
    int length = string ? snprintf(head, sizeof head, "%zu:", strlen(string)) : snprintf(head, sizeof head, "-:");
    hash_bytes(hash, head, (size_t)length);
    if (string) {
        hash_bytes(hash, string, strlen(string));
    }
}

void hash_finish(struct hash *hash, char digits[HASH_SIZE]) {
    unsigned char digest[SHA256_DIGEST_SIZE];
    sha256_digest(&hash->context, sizeof digest, digest);
    for (size_t i = 0; i < sizeof digest; i++) {
        snprintf(digits + 2 * i, 3, "%02x", digest[i]);
    }
}

void hash_of(const void *bytes, size_t length, char digits[HASH_SIZE]) {
    struct hash hash;
    hash_init(&hash);
    hash_bytes(&hash, bytes, length);
    hash_finish(&hash, digits);
}
