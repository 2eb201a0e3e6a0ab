/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Random numbers that depend on the plan's seed and the task's name alone: one generator per task, the same digits on
 * any machine and any number of threads. xoshiro256** (Blackman & Vigna 2021, ACM Trans Math Softw 47:36), its 256 bits
 * of state the SHA-256 of seed and name. Not for secrets. */
#ifndef EVENHAND_STATS_RANDOM_H
#define EVENHAND_STATS_RANDOM_H
#include <stddef.h>
#include <stdint.h>

struct generator {
    uint64_t state[4];
};

void generator_init(struct generator *generator, uint64_t seed, const char *task);
uint64_t generator_next(struct generator *generator);
size_t generator_below(struct generator *generator, size_t limit); /* 0 .. limit - 1, without bias; limit >= 1 */
double generator_uniform(struct generator *generator);             /* in (0, 1), 53 bits */
#endif
