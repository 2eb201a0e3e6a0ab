/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Received bytes -> text cells. Recognises the encoding (UTF-8 and UTF-16 with or without byte order mark, else
 * Windows-1252) and the delimiter (comma, semicolon or tab), then reads records by RFC 4180, with LF, CRLF or CR.
 * Nothing is mended: a file whose structure cannot be read is refused, a doubtful value is kept as it stands. */
#ifndef EVENHAND_INTAKE_CELLS_H
#define EVENHAND_INTAKE_CELLS_H
#include "base/fault.h"
#include <stddef.h>
#include <stdint.h>

/* One file's cells. Filled by cells_read, emptied by cells_release; read-only in between, so any number of threads
 * may read it. Cell k = record * columns + column is the UTF-8 text at bytes + start[k], NUL-terminated, spaces kept,
 * start[k + 1] - start[k] - 1 bytes long: start has records * columns + 1 entries. */
struct cells {
    size_t records, columns;   /* data records (without the header), columns >= 1 */
    char **names;              /* the header's names, ASCII space around them trimmed; not empty, none twice */
    char *bytes;
    uint32_t *start;
    uint32_t *line;            /* per record: 1-based physical line of the file where it starts */
    size_t blank_lines;        /* lines with nothing on them, skipped */
    char delimiter;            /* ',' ';' '\t' */
    bool byte_order_mark;
    const char *encoding;      /* for a person: "UTF-8", "UTF-16, little-endian", "Windows-1252", ... */
    const char *delimiter_word; /* for a person: "comma", "semicolon", "tab", "none (one column)" */
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
