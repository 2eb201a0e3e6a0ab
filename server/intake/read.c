/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "intake/read.h"
#include "server/intake/spreadsheet.h"
#include "server/intake/statistical.h"
#include <string.h>

enum { LENGTH_LIMIT = 512 << 20 };

/* Formats that begin like no text and are not taken, and what to do instead. */
struct other {
    const char *begin;
    size_t length;
    const char *what;
};
#define BYTES(literal) literal, sizeof(literal) - 1

static const struct other others[] = {
    {BYTES("\x1F\x8B"), "is packed (.gz); unpack it and load the file inside"},
    {BYTES("7z\xBC\xAF\x27\x1C"), "is packed (.7z); unpack it and load the file inside"},
    {BYTES("%PDF-"), "is a document for printing (.pdf); export the data themselves and load those"},
    {BYTES("SQLite format 3"), "is a data base file; export its table as delimited text and load that"},
    {BYTES("**COMPRESSED**"), "is a transport file of the packed kind; write it in the regulators' transport format (.xpt) "
                              "and load that"},
};

/* "EncryptedPackage" in UTF-16: a spreadsheet with a password stands in a file of the older kind. */
static const char locked[] = "E\0n\0c\0r\0y\0p\0t\0e\0d\0P\0a\0c\0k\0a\0g\0e";

static bool refuse_other(const char *bytes, size_t length, const char *name, struct fault *fault) {
    static const char older[] = "\xD0\xCF\x11\xE0\xA1\xB1\x1A\xE1";
    if (length >= 8 && !memcmp(bytes, older, 8)) {
        return fault_set(fault, FAULT_INPUT,
            memmem(bytes, length, locked, sizeof locked)
                ? "%s is locked with a password; save it without one and load that"
                : "%s is a spreadsheet or document of the older kind (.xls); save it as .xlsx or as delimited text and load "
                  "that",
            name);
    }
    for (size_t i = 0; i < sizeof others / sizeof *others; i++) {
        if (length >= others[i].length && !memcmp(bytes, others[i].begin, others[i].length)) {
            return fault_set(fault, FAULT_INPUT, "%s %s", name, others[i].what);
        }
    }
    return true;
}

static bool refuse_sheet(const char *name, const char *sheet, const char *format, struct fault *fault) {
    return !sheet || fault_set(fault, FAULT_INPUT,
                         "%s is a %s and has no sheets; take sheet \"%.100s\" out of the plan's files", name, format, sheet);
}

bool read_cells(struct cells *cells, const char *bytes, size_t length, const char *name, const char *sheet,
    struct fault *fault) {
    *cells = (struct cells){0};
    if (length > LENGTH_LIMIT) {
        return fault_set(fault, FAULT_INPUT,
            "%s is larger than 512 MiB, the most a study takes; load a file with fewer columns or records", name);
    }
    if (length >= 4 && (!memcmp(bytes, "PK\3\4", 4) || !memcmp(bytes, "PK\5\6", 4))) {
        return spreadsheet_read(cells, bytes, length, name, sheet, fault);
    }
    const struct statistical_format *format = statistical_recognise(bytes, length);
    if (format) {
        return refuse_sheet(name, sheet, statistical_word(format), fault) &&
               statistical_read(cells, format, bytes, length, name, fault);
    }
    return refuse_other(bytes, length, name, fault) && refuse_sheet(name, sheet, "file of delimited text", fault) &&
           cells_read(cells, bytes, length, name, fault);
}
