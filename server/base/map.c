/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/map.h"
#include "base/memory.h"
#include <string.h>

void map_init(struct map *map) {
    *map = (struct map){0};
}

void map_release(struct map *map) {
    memory_free(map->keys);
    memory_free(map->values);
    map_init(map);
}

/* FNV-1a, 64 bits (Fowler, Noll, Vo). */
static size_t place_of(const struct map *map, const char *key) {
    uint64_t hash = 14695981039346656037u;
    for (const unsigned char *p = (const unsigned char *)key; *p; p++) {
        hash = (hash ^ *p) * 1099511628211u;
    }
    size_t place = (size_t)(hash ^ (hash >> 32)) & (map->room - 1);
    while (map->keys[place] && strcmp(map->keys[place], key) != 0) {
        place = (place + 1) & (map->room - 1);
    }
    return place;
}

static void map_grow(struct map *map) {
    struct map old = *map;
    map->room = old.room ? old.room * 2 : 64;
    map->keys = memory_new(map->room, sizeof *map->keys);
    map->values = memory_new(map->room, sizeof *map->values);
    for (size_t i = 0; i < old.room; i++) {
        if (old.keys[i]) {
            size_t place = place_of(map, old.keys[i]);
            map->keys[place] = old.keys[i];
            map->values[place] = old.values[i];
        }
    }
    memory_free(old.keys);
    memory_free(old.values);
}

int32_t map_put(struct map *map, const char *key, int32_t value) {
    if ((map->count + 1) * 2 > map->room) {
        map_grow(map);
    }
    size_t place = place_of(map, key);
    if (!map->keys[place]) {
        map->keys[place] = key;
        map->values[place] = value;
        map->count++;
    }
    return map->values[place];
}

int32_t map_get(const struct map *map, const char *key) {
    if (!map->room) {
        return -1;
    }
    size_t place = place_of(map, key);
    return map->keys[place] ? map->values[place] : -1;
}
