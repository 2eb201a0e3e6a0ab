/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "intake/cells.h"
#include "base/memory.h"
#include "server/intake/encoding.h"
#include "server/intake/header.h"
#include <string.h>

enum { LENGTH_LIMIT = 512 << 20, TIE_RECORDS = 20 };

/* The characters that end a run of plain bytes; all else is copied as it stands. */
enum special { PLAIN, QUOTE, DELIMITER, LINE_FEED, CARRIAGE_RETURN, NUL_BYTE };

struct reader {
    const char *name;
    const char *at, *end;
    char *out;               /* where the next byte of a cell goes */
    size_t line;             /* 1-based physical line of `at` */
    size_t record_line;      /* where the record being read starts */
    char delimiter;
    unsigned char special[256];
    struct fault *fault;
};

enum field_end { FIELD_FOLLOWS, RECORD_ENDS, FIELD_BAD };

static bool refuse(struct reader *reader, size_t line, size_t column, const char *what) {
    return fault_at(reader->fault, FAULT_INPUT, line, column, "%s, line %zu, column %zu: %s", reader->name, line,
        column, what);
}

static void reader_init(struct reader *reader, const char *name, const char *bytes, size_t length, char delimiter,
    char *out, struct fault *fault) {
    *reader = (struct reader){.name = name, .at = bytes, .end = bytes + length, .out = out, .line = 1,
        .record_line = 1, .delimiter = delimiter, .fault = fault};
    reader->special['"'] = QUOTE;
    reader->special[(unsigned char)delimiter] = DELIMITER;
    reader->special['\n'] = LINE_FEED;
    reader->special['\r'] = CARRIAGE_RETURN;
    reader->special['\0'] = NUL_BYTE;
}

/* `at` stands on CR or LF: steps over it, and over the LF of a CRLF. */
static void step_over_line_end(struct reader *reader) {
    bool pair = *reader->at == '\r' && reader->at + 1 < reader->end && reader->at[1] == '\n';
    reader->at += pair ? 2 : 1;
    reader->line++;
}

/* Steps over lines with nothing on them but space; returns how many. A line that holds the delimiter is a record. */
static size_t skip_blank_lines(struct reader *reader) {
    size_t blank = 0;
    for (;;) {
        const char *at = reader->at;
        while (at < reader->end && (*at == ' ' || *at == '\t') && *at != reader->delimiter) {
            at++;
        }
        if (at == reader->end) {
            blank += at > reader->at;
            reader->at = at;
            return blank;
        }
        if (*at != '\n' && *at != '\r') {
            return blank;
        }
        reader->at = at;
        step_over_line_end(reader);
        blank++;
    }
}

/* What ends the field just copied. `column` is 1-based. */
static enum field_end end_field(struct reader *reader, size_t column, bool quoted) {
    if (reader->at == reader->end) {
        return RECORD_ENDS;
    }
    switch (reader->special[(unsigned char)*reader->at]) {
    case DELIMITER:
        reader->at++;
        return FIELD_FOLLOWS;
    case LINE_FEED:
    case CARRIAGE_RETURN:
        step_over_line_end(reader);
        return RECORD_ENDS;
    case NUL_BYTE:
        refuse(reader, reader->line, column,
            "a NUL byte, which no text file has; export the file again as text and load that");
        return FIELD_BAD;
    default:
        BUG_IF(!quoted);
        refuse(reader, reader->line, column,
            "text after a closing quote; a quote inside a quoted field is written twice; mend the line and load again");
        return FIELD_BAD;
    }
}

static bool read_quoted(struct reader *reader, size_t column) {
    size_t opened = reader->line;
    for (reader->at++; reader->at < reader->end;) {
        char c = *reader->at;
        if (c == '"') {
            if (reader->at + 1 == reader->end || reader->at[1] != '"') {
                reader->at++;
                return true;
            }
            reader->at++; /* the first of two: the second is text */
        } else if (c == '\0') {
            return refuse(reader, reader->line, column,
                "a NUL byte, which no text file has; export the file again as text and load that");
        }
        /* A CRLF counts once, at its LF. */
        reader->line += c == '\n' || (c == '\r' && (reader->at + 1 == reader->end || reader->at[1] != '\n'));
        *reader->out++ = *reader->at++;
    }
    return refuse(reader, opened, column,
        "the quote opened here is never closed; close it or take it out and load again");
}

/* Copies one field, NUL-terminated, to `out`. */
static enum field_end read_field(struct reader *reader, size_t column) {
    bool quoted = reader->at < reader->end && *reader->at == '"';
    if (quoted) {
        if (!read_quoted(reader, column)) {
            return FIELD_BAD;
        }
    } else {
        const char *at = reader->at, *end = reader->end;
        char *out = reader->out;
        /* A quote that does not open the field is text like any other. */
        for (; at < end && (reader->special[(unsigned char)*at] <= QUOTE); at++) {
            *out++ = *at;
        }
        reader->at = at;
        reader->out = out;
    }
    *reader->out++ = '\0';
    return end_field(reader, column, quoted);
}

/* Fields of the next record, 0 where it cannot be read. */
static size_t count_fields(struct reader *reader) {
    char *out = reader->out;
    size_t fields = 0;
    enum field_end end = FIELD_FOLLOWS;
    while (end == FIELD_FOLLOWS) {
        end = read_field(reader, ++fields);
    }
    reader->out = out;
    return end == RECORD_ENDS ? fields : 0;
}

/* Whether the first records have as many fields as the header when read with this delimiter. */
static bool is_even(const char *bytes, size_t length, char delimiter, char *scratch) {
    struct fault unused;
    fault_init(&unused);
    struct reader reader;
    reader_init(&reader, "", bytes, length, delimiter, scratch, &unused);
    skip_blank_lines(&reader);
    size_t fields = count_fields(&reader);
    for (int i = 0; i < TIE_RECORDS; i++) {
        skip_blank_lines(&reader);
        if (reader.at == reader.end) {
            break;
        }
        if (count_fields(&reader) != fields) {
            return false;
        }
    }
    return true;
}

struct delimiter {
    char character;
    const char *word;
};
static const struct delimiter delimiters[] = {{',', "comma"}, {';', "semicolon"}, {'\t', "tab"}};
enum { DELIMITERS = sizeof delimiters / sizeof delimiters[0] };

/* How often each delimiter stands in the header record outside quotes. A quote opens only where a field begins, and
 * again after another quote. */
static void count_delimiters(const char *bytes, size_t length, size_t counts[DELIMITERS]) {
    bool quoted = false, begun = false;
    char before = '\n';
    for (size_t i = 0; i < length; before = bytes[i++]) {
        char c = bytes[i];
        if ((c == '\n' || c == '\r') && !quoted && begun) {
            return;
        }
        begun = begun || (c != '\n' && c != '\r' && c != ' ');
        if (c == '"' && (quoted || strchr("\r\n\",;\t", before))) {
            quoted = !quoted;
        }
        for (size_t d = 0; d < DELIMITERS && !quoted; d++) {
            counts[d] += c == delimiters[d].character;
        }
    }
}

static void recognise_delimiter(struct cells *cells, const char *bytes, size_t length, char *scratch) {
    size_t counts[DELIMITERS] = {0}, best = 0;
    count_delimiters(bytes, length, counts);
    for (size_t d = 1; d < DELIMITERS; d++) {
        bool tie = counts[d] && counts[d] == counts[best];
        if (counts[d] > counts[best] || (tie && !is_even(bytes, length, delimiters[best].character, scratch) &&
                                            is_even(bytes, length, delimiters[d].character, scratch))) {
            best = d;
        }
    }
    cells->delimiter = delimiters[best].character;
    cells->delimiter_word = counts[best] ? delimiters[best].word : "none (one column)";
}

static bool check_names(struct reader *reader, const struct cells *cells) {
    struct header_flaw flaw;
    char what[HEADER_FLAW_ROOM];
    if (header_check(cells->names, cells->columns, &flaw)) {
        return true;
    }
    return refuse(reader, reader->record_line, flaw.column + 1, header_sentence(what, &flaw, "line", cells->names, NULL));
}

static bool read_header(struct reader *reader, struct cells *cells) {
    cells->blank_lines += skip_blank_lines(reader);
    if (reader->at == reader->end) {
        return refuse(reader, 1, 1,
            "no header, only blank lines; the first line must name the columns; export the file again and load that");
    }
    reader->record_line = reader->line;
    for (enum field_end end = FIELD_FOLLOWS; end == FIELD_FOLLOWS;) {
        if (cells->columns == COLUMN_LIMIT) {
            return refuse(reader, reader->record_line, COLUMN_LIMIT + 1,
                "more than 1999 columns, the most a study takes; take out what the plan does not need and load again");
        }
        char *name = reader->out;
        end = read_field(reader, cells->columns + 1);
        if (end == FIELD_BAD) {
            return false;
        }
        header_trim(name);
        if ((cells->columns & (cells->columns - 1)) == 0) {
            cells->names = memory_grow(cells->names, cells->columns ? 2 * cells->columns : 1, sizeof *cells->names);
        }
        cells->names[cells->columns++] = name;
    }
    return check_names(reader, cells);
}

static bool refuse_count(struct reader *reader, size_t fields, size_t columns) {
    size_t column = fields < columns ? fields : columns + 1;
    return fault_at(reader->fault, FAULT_INPUT, reader->record_line, column,
        "%s, line %zu, column %zu: %zu field%s where the header has %zu; mend the line or its quotes and load again",
        reader->name, reader->record_line, column, fields, fields == 1 ? "" : "s", columns);
}

static bool read_record(struct reader *reader, const char *bytes, uint32_t *start, size_t columns) {
    reader->record_line = reader->line;
    size_t fields = 0;
    for (enum field_end end = FIELD_FOLLOWS; end == FIELD_FOLLOWS; fields++) {
        if (fields < columns) {
            start[fields] = (uint32_t)(reader->out - bytes);
        }
        end = read_field(reader, fields + 1);
        if (end == FIELD_BAD) {
            return false;
        }
    }
    return fields == columns || refuse_count(reader, fields, columns);
}

static void grow_records(struct cells *cells, size_t *room) {
    *room = *room ? 2 * *room : 256;
    cells->start = memory_grow(cells->start, *room * cells->columns + 1, sizeof *cells->start);
    cells->line = memory_grow(cells->line, *room, sizeof *cells->line);
}

static bool read_records(struct reader *reader, struct cells *cells) {
    size_t room = 0;
    grow_records(cells, &room);
    for (;;) {
        cells->blank_lines += skip_blank_lines(reader);
        if (reader->at == reader->end) {
            break;
        }
        if (cells->records == room) {
            grow_records(cells, &room);
        }
        cells->line[cells->records] = (uint32_t)reader->line;
        uint32_t *start = cells->start + cells->records * cells->columns;
        if (!read_record(reader, cells->bytes, start, cells->columns)) {
            return false;
        }
        cells->records++;
    }
    cells->start[cells->records * cells->columns] = (uint32_t)(reader->out - cells->bytes);
    return true;
}

static bool read_text(struct cells *cells, const char *text, size_t length, const char *name, struct fault *fault) {
    /* A field gives its bytes and a NUL in place of what ended it; only the last of a file may have no end. */
    cells->bytes = memory_grow(NULL, length + 2, 1);
    recognise_delimiter(cells, text, length, cells->bytes);
    struct reader reader;
    reader_init(&reader, name, text, length, cells->delimiter, cells->bytes, fault);
    return read_header(&reader, cells) && read_records(&reader, cells);
}

bool cells_read(struct cells *cells, const char *bytes, size_t length, const char *name, struct fault *fault) {
    *cells = (struct cells){0};
    if (length == 0) {
        return fault_at(fault, FAULT_INPUT, 1, 1,
            "%s, line 1, column 1: the file is empty; export it again and load that", name);
    }
    if (length > LENGTH_LIMIT) {
        return fault_set(fault, FAULT_INPUT,
            "%s is larger than 512 MiB, the most a study takes; load a file with fewer columns or records", name);
    }
    struct encoded encoded;
    if (!encoding_read(&encoded, bytes, length, name, fault)) {
        return false;
    }
    cells->encoding = encoded.word;
    cells->byte_order_mark = encoded.byte_order_mark;
    cells->format = "delimited text";
    cells->place = "line";
    cells->notes = "";
    bool done = read_text(cells, encoded.text, encoded.length, name, fault);
    memory_free(encoded.owned);
    if (!done) {
        cells_release(cells);
    }
    return done;
}

void cells_release(struct cells *cells) {
    memory_free(cells->names);
    memory_free(cells->bytes);
    memory_free(cells->start);
    memory_free(cells->line);
    arena_release(&cells->arena);
    *cells = (struct cells){0};
}

size_t cells_column(const struct cells *cells, const char *name) {
    for (size_t i = 0; i < cells->columns; i++) {
        if (!strcmp(cells->names[i], name)) {
            return i;
        }
    }
    return SIZE_MAX;
}
