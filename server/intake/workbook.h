/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What a spreadsheet file (ISO/IEC 29500-1, SpreadsheetML) says beside its sheets: which sheets there are, the calendar,
 * the shared texts, and which number formats show dates or times. Inside intake only. */
#ifndef EVENHAND_SERVER_INTAKE_WORKBOOK_H
#define EVENHAND_SERVER_INTAKE_WORKBOOK_H
#include "base/memory.h"
#include "base/text.h"
#include "server/intake/package.h"

/* How a number format shows numbers. */
enum style { STYLE_NUMBER, STYLE_DATE, STYLE_TIME, STYLE_ELAPSED };

struct sheet_entry {
    const char *name, *part; /* part: where its cells are, NULL where it holds none (charts) or names no part */
    bool hidden;
};

struct workbook {
    struct package package;
    struct arena arena;
    struct sheet_entry *sheets; /* those of cells only, in order */
    size_t sheet_count;
    bool from_1904;             /* day 0 is 1904-01-01 */
    unsigned char *styles;      /* per cell format an enum style */
    size_t style_count;
    struct text shared;         /* shared texts, each NUL-terminated */
    size_t *shared_start;
    size_t shared_count;
};

/* Borrows bytes, name and fault until workbook_close, which is due in either case. */
bool workbook_open(struct workbook *workbook, const char *bytes, size_t length, const char *name, struct fault *fault);
void workbook_close(struct workbook *workbook);
/* The sheet of that name, or the only one where name is NULL; NULL with a fault that lists the sheets. */
const struct sheet_entry *workbook_sheet(struct workbook *workbook, const char *name);
/* How a number format code shows numbers (its first section). */
enum style workbook_style(const char *code);
/* Texts may hold characters as _xHHHH_ (29500-1, 22.9.2.19): puts the characters in their place. Returns the length. */
size_t workbook_unescape(char *text, size_t length);
#endif
