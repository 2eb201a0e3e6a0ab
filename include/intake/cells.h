/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Received bytes -> text cells. Recognises the encoding (UTF-8 and UTF-16 with or without byte order mark, else
 * Windows-1252) and the delimiter (comma, semicolon or tab), then reads records by RFC 4180, with LF, CRLF or CR.
 * Nothing is mended: a file whose structure cannot be read is refused, a doubtful value is kept as it stands. */
#ifndef EVENHAND_INTAKE_CELLS_H
#define EVENHAND_INTAKE_CELLS_H
#include "base/fault.h"
#include "base/memory.h"
#include <stddef.h>
#include <stdint.h>

/* A code and what the file says it means. */
struct cell_label {
    const char *code, *label; /* code: the text a cell with it has; not empty */
};

/* What a file says of one of its columns besides the cells; only statistical files do. UTF-8 throughout. */
struct cell_about {
    const char *label;               /* the variable's label, "" where it has none */
    const struct cell_label *values; /* value labels, in the file's order; columns may share one list */
    size_t value_count;
    const char *const *missing;      /* cell texts the file itself declares as missing, none twice */
    size_t missing_count;
};

/* One file's cells. Filled by cells_read (or read_cells of intake/read.h), emptied by cells_release; read-only in between, so any number of threads
 * may read it. Cell k = record * columns + column is the UTF-8 text at bytes + start[k], NUL-terminated, spaces kept,
 * start[k + 1] - start[k] - 1 bytes long: start has records * columns + 1 entries. */
struct cells {
    size_t records, columns;   /* data records (without the header), columns >= 1 */
    char **names;              /* the header's names, ASCII space around them trimmed; not empty, none twice */
    char *bytes;
    uint32_t *start;
    uint32_t *line;            /* per record: 1-based physical line of the file where it starts, row of the sheet, or
                                * number of the observation, as `place` says */
    size_t blank_lines;        /* lines or rows with nothing on them, skipped */
    char delimiter;            /* ',' ';' '\t', 0 where the file is no delimited text */
    bool byte_order_mark;
    const char *format;        /* for a person: "delimited text", "spreadsheet (.xlsx)", ... */
    const char *place;         /* what `line` counts: "line", "row" or "observation" */
    const char *encoding;      /* for a person: "UTF-8", "UTF-16, little-endian", "Windows-1252", ...; of other
                                * formats what was recognised: "spreadsheet (.xlsx), sheet \"Export\"", ... */
    const char *delimiter_word; /* for a person: "comma", "semicolon", "tab", "none (one column)", "none (...)" */
    const char *notes;         /* sentences for a person on how cells became text; "" where nothing is to be said */
    const struct cell_about *about; /* per column; NULL where the format says nothing of its columns */
    struct arena arena;        /* owns what the fields above point at, beside bytes, start, line and the names' array */
};

/* Reads `length` received bytes; `name` is how sentences call the file. On failure `cells` is empty and the fault is
 * FAULT_INPUT with row = physical line and column = field of the record (for bytes that no encoding explains: the
 * byte of the line), both also in the sentence. Borrows `bytes` only during the call. At most 512 MiB
 * and 1,999 columns. */
bool cells_read(struct cells *cells, const char *bytes, size_t length, const char *name, struct fault *fault);
void cells_release(struct cells *cells);

/* 0-based place; borrowed until cells_release. */
static inline const char *cells_at(const struct cells *cells, size_t record, size_t column) {
    return cells->bytes + cells->start[record * cells->columns + column];
}
/* The 0-based column of that name, SIZE_MAX where there is none. Names compare exactly. */
size_t cells_column(const struct cells *cells, const char *name);
#endif
