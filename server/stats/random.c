/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "stats/random.h"
#include "base/hash.h"
#include "base/memory.h"
#include <inttypes.h>
#include <stdio.h>

void generator_init(struct generator *generator, uint64_t seed, const char *task) {
    char number[32], digits[HASH_SIZE];
    struct hash hash;
    snprintf(number, sizeof number, "%" PRIu64, seed);
    hash_init(&hash);
    hash_field(&hash, number);
    hash_field(&hash, task);
    hash_finish(&hash, digits);
    for (int word = 0; word < 4; word++) {
        generator->state[word] = 0;
        for (int i = 0; i < 16; i++) {
            char c = digits[16 * word + i];
            generator->state[word] = generator->state[word] << 4 | (uint64_t)(c <= '9' ? c - '0' : c - 'a' + 10);
        }
    }
}

static uint64_t rotate(uint64_t x, int by) {
    return x << by | x >> (64 - by);
}

uint64_t generator_next(struct generator *generator) {
    uint64_t *s = generator->state, result = rotate(s[1] * 5, 7) * 9, shifted = s[1] << 17;
    s[2] ^= s[0];
    s[3] ^= s[1];
    s[1] ^= s[2];
    s[0] ^= s[3];
    s[2] ^= shifted;
    s[3] = rotate(s[3], 45);
    return result;
}

/* Lemire 2019 (ACM Trans Model Comput Simul 29:3): the high half of a product, with no division but in rare cases. */
size_t generator_below(struct generator *generator, size_t limit) {
    BUG_IF(limit == 0);
    __extension__ typedef unsigned __int128 product;
    uint64_t range = limit;
    product x = (product)generator_next(generator) * range;
    if ((uint64_t)x < range)
        for (uint64_t bias = (UINT64_MAX - range + 1) % range; (uint64_t)x < bias;)
            x = (product)generator_next(generator) * range;
    return (size_t)(x >> 64);
}

double generator_uniform(struct generator *generator) {
    return ((double)(generator_next(generator) >> 11) + 0.5) * 0x1p-53;
}
