/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "server/intake/build.h"
#include <string.h>

enum { TEXT_LIMIT = 512 << 20, CELL_LIMIT = 64 << 20 };

const char *const build_limit = "it holds more than 64 Mi cells or 512 MiB of text, the most a study takes; load a file "
                                "with fewer columns or records";

void build_init(struct build *build, struct cells *cells) {
    *cells = (struct cells){.notes = ""};
    *build = (struct build){.cells = cells};
    text_init(&build->text);
}

void build_finish(struct build *build) {
    struct cells *cells = build->cells;
    BUG_IF(build->count != cells->records * cells->columns);
    cells->start = memory_grow(cells->start, build->count + 1, sizeof *cells->start);
    cells->start[build->count] = (uint32_t)build->text.length;
    cells->line = memory_grow(cells->line, cells->records, sizeof *cells->line);
    cells->bytes = text_take(&build->text);
    text_release(&build->text);
}

void build_drop(struct build *build) {
    text_release(&build->text);
    cells_release(build->cells);
}

void build_column(struct build *build, const char *name) {
    struct cells *cells = build->cells;
    BUG_IF(cells->records);
    if (cells->columns == build->name_room) {
        build->name_room = build->name_room ? 2 * build->name_room : 32;
        cells->names = memory_grow(cells->names, build->name_room, sizeof *cells->names);
    }
    char *copy = arena_text(&cells->arena, name);
    header_trim(copy);
    cells->names[cells->columns++] = copy;
}

bool build_record(struct build *build, size_t line) {
    struct cells *cells = build->cells;
    BUG_IF(build->count != cells->records * cells->columns);
    if (build->count + cells->columns > CELL_LIMIT || line > UINT32_MAX) {
        return false;
    }
    if (cells->records == build->record_room) {
        build->record_room = build->record_room ? 2 * build->record_room : 256;
        cells->line = memory_grow(cells->line, build->record_room, sizeof *cells->line);
    }
    cells->line[cells->records++] = (uint32_t)line;
    return true;
}

bool build_cell(struct build *build, const char *text, size_t length) {
    struct cells *cells = build->cells;
    if (build->text.length + length + 1 > TEXT_LIMIT) {
        return false;
    }
    if (build->count == build->cell_room) {
        build->cell_room = build->cell_room ? 2 * build->cell_room : 1024;
        cells->start = memory_grow(cells->start, build->cell_room, sizeof *cells->start);
    }
    cells->start[build->count++] = (uint32_t)build->text.length;
    text_append(&build->text, text, length);
    text_char(&build->text, '\0');
    return true;
}
