/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Cells grown one by one, for formats that are not read in place. Inside intake only. */
#ifndef EVENHAND_SERVER_INTAKE_BUILD_H
#define EVENHAND_SERVER_INTAKE_BUILD_H
#include "base/text.h"
#include "intake/cells.h"
#include "server/intake/header.h"

struct build {
    struct cells *cells;
    struct text text;  /* the cells' bytes so far */
    size_t count;      /* cells so far */
    size_t cell_room, record_room, name_room;
};

/* `cells` is emptied. Afterwards either build_finish hands the bytes over, or build_drop lets everything go. */
void build_init(struct build *build, struct cells *cells);
void build_finish(struct build *build);
void build_drop(struct build *build);
/* Columns first, at most COLUMN_LIMIT; the name is copied, and trimmed as every header is. */
void build_column(struct build *build, const char *name);
/* Then records in order, each as many cells as there are columns. False where a limit is met: see build_limit. */
bool build_record(struct build *build, size_t line);
bool build_cell(struct build *build, const char *text, size_t length);
/* What to say then, without the file's name. */
extern const char *const build_limit;
#endif
