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

/* Lemire 2019 (ACM Trans Model Comput Simul 29:3): a product instead of a division; the few draws that would favour
 * some numbers are drawn again. Limits of 2^32 and more, which no trial has, take the slow way. */
size_t generator_below(struct generator *generator, size_t limit) {
    BUG_IF(limit == 0);
    uint64_t range = limit;
    if (range > UINT32_MAX) {
        uint64_t excess = (UINT64_MAX % range + 1) % range, x; /* the last, incomplete round */
        do
            x = generator_next(generator);
        while (excess && x > UINT64_MAX - excess);
        return (size_t)(x % range);
    }
    uint64_t product = (generator_next(generator) >> 32) * range;
    if ((uint32_t)product < range)
        for (uint32_t least = (uint32_t)(0x100000000u % range); (uint32_t)product < least;)
            product = (generator_next(generator) >> 32) * range;
    return (size_t)(product >> 32);
}

double generator_uniform(struct generator *generator) {
    return ((double)(generator_next(generator) >> 11) + 0.5) * 0x1p-53;
}
