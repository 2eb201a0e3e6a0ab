/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Memory that is there or the program stops with a sentence; and arenas, which are released whole.
 * Nothing here returns NULL. An arena belongs to one thread at a time. */
#ifndef EVENHAND_BASE_MEMORY_H
#define EVENHAND_BASE_MEMORY_H
#include <stddef.h>

/* Programmer errors stop the program and name the place; what the world does wrong is a struct fault. */
#define BUG_IF(condition) ((condition) ? bug_stop(#condition, __FILE__, __LINE__) : (void)0)
_Noreturn void bug_stop(const char *condition, const char *file, int line);

void *memory_new(size_t count, size_t size);                /* zeroed; free with memory_free */
void *memory_grow(void *old, size_t count, size_t size);    /* old may be NULL; new part is not zeroed */
char *memory_text(const char *text);                        /* a copy; text may be NULL, then NULL */
void memory_free(void *memory);

/* For a task that fills much memory once, such as loading: asks for it in large pages and keeps it until the end, which saves
 * most of what the system spends on handing pages out. Before any thread is started; where it cannot be had nothing changes. */
void memory_for_bulk(void);

struct arena {
    struct arena_block *block; /* newest first */
    size_t used;               /* bytes handed out of the newest block */
};

void arena_init(struct arena *arena);
void arena_release(struct arena *arena);
void *arena_new(struct arena *arena, size_t count, size_t size); /* zeroed, aligned for any type */
char *arena_text(struct arena *arena, const char *text);         /* a copy; NULL gives NULL */
char *arena_bytes(struct arena *arena, const char *bytes, size_t length); /* a NUL-terminated copy */
char *arena_format(struct arena *arena, const char *format, ...) __attribute__((format(printf, 2, 3)));
#define ARENA_NEW(arena, count, type) ((type *)arena_new((arena), (size_t)(count), sizeof(type)))
#endif
