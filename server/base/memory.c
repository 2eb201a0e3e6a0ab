/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/memory.h"
#include <stdalign.h>
#include <stdarg.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <malloc.h>
#include <sys/mman.h>

enum { BLOCK_SIZE = 1 << 16 };

struct arena_block {
    struct arena_block *next;
    size_t size;
    alignas(max_align_t) unsigned char bytes[];
};

void bug_stop(const char *condition, const char *file, int line) {
    fprintf(stderr, "evenhand: a fault in the program itself at %s:%d (%s); nothing was written\n", file, line,
        condition);
    abort();
}

static void *or_stop(void *memory) {
    if (!memory) {
        fputs("evenhand: this machine has no memory left for the task; close other programs and try again\n", stderr);
        exit(1);
    }
    return memory;
}

void *memory_new(size_t count, size_t size) {
    return or_stop(calloc(count ? count : 1, size ? size : 1));
}

void *memory_grow(void *old, size_t count, size_t size) {
    BUG_IF(size && count > SIZE_MAX / size);
    size_t wanted = count * size;
    return or_stop(realloc(old, wanted ? wanted : 1));
}

char *memory_text(const char *text) {
    return text ? or_stop(strdup(text)) : NULL;
}

void memory_for_bulk(void) {
    enum { PAGE = 2 << 20, ROOM = 256 << 20 };
    mallopt(M_ARENA_MAX, 1);
    mallopt(M_MMAP_THRESHOLD, ROOM);
    mallopt(M_TRIM_THRESHOLD, 2 * ROOM);
    /* The heap grows once to its room, untouched; then its whole large pages are asked for. */
    char *room = malloc(ROOM - PAGE);
    if (room) {
        uintptr_t start = ((uintptr_t)room + PAGE - 1) / PAGE * PAGE;
        madvise((void *)start, ROOM - 2 * (size_t)PAGE, MADV_HUGEPAGE);
        free(room);
    }
}

void memory_free(void *memory) {
    free(memory);
}

void arena_init(struct arena *arena) {
    *arena = (struct arena){0};
}

void arena_release(struct arena *arena) {
    for (struct arena_block *next, *block = arena->block; block; block = next) {
        next = block->next;
        free(block);
    }
    arena_init(arena);
}

void *arena_new(struct arena *arena, size_t count, size_t size) {
    BUG_IF(size && count > (SIZE_MAX - 2 * alignof(max_align_t)) / size);
    size_t wanted = (count * size + alignof(max_align_t) - 1) / alignof(max_align_t) * alignof(max_align_t);
    if (!arena->block || arena->block->size - arena->used < wanted) {
        size_t room = wanted > BLOCK_SIZE ? wanted : BLOCK_SIZE;
        struct arena_block *block = or_stop(calloc(1, sizeof *block + room)); /* zeroed once, handed out once */
        *block = (struct arena_block){.next = arena->block, .size = room};
        arena->block = block;
        arena->used = 0;
    }
    void *memory = arena->block->bytes + arena->used;
    arena->used += wanted;
    return memory;
}

char *arena_bytes(struct arena *arena, const char *bytes, size_t length) {
    char *copy = arena_new(arena, length + 1, 1);
    if (length) {
        memcpy(copy, bytes, length);
    }
    return copy;
}

char *arena_text(struct arena *arena, const char *text) {
    return text ? arena_bytes(arena, text, strlen(text)) : NULL;
}

char *arena_format(struct arena *arena, const char *format, ...) {
    va_list arguments;
    va_start(arguments, format);
    int length = vsnprintf(NULL, 0, format, arguments);
    va_end(arguments);
    BUG_IF(length < 0);
    char *text = arena_new(arena, (size_t)length + 1, 1);
    va_start(arguments, format);
    vsnprintf(text, (size_t)length + 1, format, arguments);
    va_end(arguments);
    return text;
}
