/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Texts to numbers: an open-addressing table. Keys are borrowed and must outlive the map. One thread at a time while it is
 * filled; any number may look things up afterwards. */
#ifndef EVENHAND_BASE_MAP_H
#define EVENHAND_BASE_MAP_H
#include <stddef.h>
#include <stdint.h>

struct map {
    const char **keys;
    int32_t *values;
    size_t count, room; /* room is a power of two, or 0 */
};

void map_init(struct map *map);
void map_release(struct map *map);
/* The value of the key; where it is new it gets `value` first. */
int32_t map_put(struct map *map, const char *key, int32_t value);
int32_t map_get(const struct map *map, const char *key); /* -1 where it is not there */
#endif
