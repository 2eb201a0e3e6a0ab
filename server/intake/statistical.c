/* SPDX-License-Identifier: GPL-3.0-or-later */
/* ReadStat tells one variable, one value, one label at a time; labels may come before or after the values, so they are
 * joined to their columns at the end. */
#include "server/intake/statistical.h"
#include "server/intake/build.h"
#include "server/intake/encoding.h"
#include "server/intake/shown.h"
#include <ctype.h>
#include <math.h>
#include <readstat.h>
#include <stdio.h>
#include <string.h>
#include <unistr.h>

enum { MISSING_LIMIT = 1000, LABEL_LIMIT = 1 << 20, CARD = 80 };
/* A card is 80 bytes of a transport file. */

/* --- the formats -------------------------------------------------------------------------------------------------- */

enum family { FAMILY_TRANSPORT, FAMILY_LABELLED, FAMILY_PERCENT }; /* how the formats of their variables are written */

struct statistical_format {
    const char *word;
    bool (*is)(const char *bytes, size_t length);
    readstat_error_t (*parse)(readstat_parser_t *parser, const char *path, void *user);
    enum family family;
    bool has_version;
};

static bool begins(const char *bytes, size_t length, const char *magic, size_t magic_length) {
    return length >= magic_length && !memcmp(bytes, magic, magic_length);
}
#define BEGINS(literal) begins(bytes, length, literal, sizeof(literal) - 1)
#define LIBRARY_5 "HEADER RECORD*******LIBRARY HEADER RECORD!!!!!!!"
#define LIBRARY_8 "HEADER RECORD*******LIBV8   HEADER RECORD!!!!!!!"

static bool is_transport(const char *bytes, size_t length) {
    return BEGINS(LIBRARY_5) || BEGINS(LIBRARY_8);
}

static bool is_sav(const char *bytes, size_t length) {
    return BEGINS("$FL2");
}

static bool is_zsav(const char *bytes, size_t length) {
    return BEGINS("$FL3");
}

/* Its signature follows 200 bytes of greeting and 256 of a character table; lines may end after 80. */
static bool is_por(const char *bytes, size_t length) {
    return length >= 480 && memmem(bytes + 440, length < 520 ? length - 440 : 80, "SPSSPORT", 8);
}

/* The first byte is the version, the second the order of bytes, the third is always 1; later ones begin with an element. */
static bool is_dta(const char *bytes, size_t length) {
    bool binary = length >= 4 && bytes[0] >= 0x68 && bytes[0] <= 0x73 && (bytes[1] == 1 || bytes[1] == 2) &&
                  bytes[2] == 1 && bytes[3] == 0;
    return binary || BEGINS("<stata_dta>");
}

static bool is_sas7bdat(const char *bytes, size_t length) {
    return BEGINS("\0\0\0\0\0\0\0\0\0\0\0\0\xC2\xEA\x81\x60\xB3\x14\x11\xCF\xBD\x92\x08\x00\x09\xC7\x31\x8C\x18\x1F\x10\x11");
}

static const struct statistical_format formats[] = {
    {"transport file (.xpt)", is_transport, readstat_parse_xport, FAMILY_TRANSPORT, true},
    {"statistical file (.sav)", is_sav, readstat_parse_sav, FAMILY_LABELLED, false},
    {"statistical file (.zsav)", is_zsav, readstat_parse_sav, FAMILY_LABELLED, false},
    {"statistical file (.por)", is_por, readstat_parse_por, FAMILY_LABELLED, false},
    {"statistical file (.dta)", is_dta, readstat_parse_dta, FAMILY_PERCENT, true},
    {"statistical file (.sas7bdat)", is_sas7bdat, readstat_parse_sas7bdat, FAMILY_TRANSPORT, false},
};

const struct statistical_format *statistical_recognise(const char *bytes, size_t length) {
    for (size_t i = 0; i < sizeof formats / sizeof *formats; i++) {
        if (formats[i].is(bytes, length)) {
            return &formats[i];
        }
    }
    return NULL;
}

const char *statistical_word(const struct statistical_format *format) {
    return format->word;
}

/* --- what is gathered --------------------------------------------------------------------------------------------- */

enum shown { SHOWN_NUMBER, SHOWN_DAYS, SHOWN_SECONDS, SHOWN_MILLISECONDS, SHOWN_CLOCK, SHOWN_MONTHS, SHOWN_YEARS };

struct column {
    enum shown shown;
    const char *label;
    const char *set;       /* the name of its value labels, NULL where it has none */
    const char **missing;
    size_t missing_count;
};

struct label_set {
    const char *name;
    struct cell_label *labels;
    size_t count;
};

struct received {
    const char *bytes;
    size_t length, at;
};

struct reading {
    const struct statistical_format *format;
    const char *name;
    struct fault *fault;
    struct build build;
    struct arena scratch;
    struct column *columns; /* as many as the build has */
    struct label_set *sets;
    size_t set_count, label_count;
    int version;
    const char *encoding;   /* as the file says; NULL */
    int64_t promised;       /* records the file says it has, -1 where it does not say */
    size_t row_width;       /* of a transport file's records */
    bool windows_1252;      /* texts are taken as Windows-1252 */
    bool not_utf8;          /* a text came that is not UTF-8: the file does not say its encoding */
    struct text converted;  /* the text being converted */
};

static bool refuse(struct reading *reading, const char *what) {
    return fault_set(reading->fault, FAULT_INPUT, "%s, a %s: %s", reading->name, reading->format->word, what);
}

static int stop(struct reading *reading, const char *what) {
    refuse(reading, what);
    return READSTAT_HANDLER_ABORT;
}

/* One more entry at the end of an arena's array, which doubles when full. */
static void *push(struct arena *arena, void *array, size_t *count, size_t size) {
    if ((*count & (*count - 1)) == 0) {
        char *bigger = arena_new(arena, *count ? 2 * *count : 1, size);
        if (*count) {
            memcpy(bigger, array, *count * size);
        }
        array = bigger;
    }
    (*count)++;
    return array;
}

/* Text as the cells have it: without the pad of fixed widths, in UTF-8. Borrowed until the next one. We convert, not
 * ReadStat, which leaks a variable whose name it cannot convert (1.1.8). */
static const char *plain_text(struct reading *reading, const char *text, size_t *length) {
    *length = text ? strlen(text) : 0;
    while (*length && text[*length - 1] == ' ') {
        --*length;
    }
    if (!*length) {
        return "";
    }
    if (!reading->windows_1252) {
        reading->not_utf8 = reading->not_utf8 || u8_check((const uint8_t *)text, *length);
        return text;
    }
    struct text *converted = &reading->converted;
    for (text_clear(converted); converted->length < 3 * *length;) {
        text_literal(converted, "   ");
    }
    if (encoding_windows_1252(converted->data, length, text, *length)) {
        refuse(reading, "its texts are neither UTF-8 nor Windows-1252; export it again in UTF-8 and load that");
        *length = 0;
    }
    return converted->data;
}

static const char *keep_text(struct reading *reading, const char *text) {
    size_t length;
    text = plain_text(reading, text, &length);
    return arena_bytes(&reading->build.cells->arena, text, length);
}

/* --- dates -------------------------------------------------------------------------------------------------------- */

/* Names of formats that show dates and times, without widths. From the documentation of the systems whose files these
 * are, by memory; an unknown one leaves the number as it stands. */
static const struct date_format {
    enum family family;
    const char *name;
    enum shown shown;
} date_formats[] = {
    {FAMILY_TRANSPORT, "DATE", SHOWN_DAYS},          {FAMILY_TRANSPORT, "DDMMYY", SHOWN_DAYS},
    {FAMILY_TRANSPORT, "DDMMYYB", SHOWN_DAYS},       {FAMILY_TRANSPORT, "DDMMYYC", SHOWN_DAYS},
    {FAMILY_TRANSPORT, "DDMMYYD", SHOWN_DAYS},       {FAMILY_TRANSPORT, "DDMMYYN", SHOWN_DAYS},
    {FAMILY_TRANSPORT, "DDMMYYP", SHOWN_DAYS},       {FAMILY_TRANSPORT, "DDMMYYS", SHOWN_DAYS},
    {FAMILY_TRANSPORT, "MMDDYY", SHOWN_DAYS},        {FAMILY_TRANSPORT, "MMDDYYB", SHOWN_DAYS},
    {FAMILY_TRANSPORT, "MMDDYYC", SHOWN_DAYS},       {FAMILY_TRANSPORT, "MMDDYYD", SHOWN_DAYS},
    {FAMILY_TRANSPORT, "MMDDYYN", SHOWN_DAYS},       {FAMILY_TRANSPORT, "MMDDYYP", SHOWN_DAYS},
    {FAMILY_TRANSPORT, "MMDDYYS", SHOWN_DAYS},       {FAMILY_TRANSPORT, "YYMMDD", SHOWN_DAYS},
    {FAMILY_TRANSPORT, "YYMMDDB", SHOWN_DAYS},       {FAMILY_TRANSPORT, "YYMMDDC", SHOWN_DAYS},
    {FAMILY_TRANSPORT, "YYMMDDD", SHOWN_DAYS},       {FAMILY_TRANSPORT, "YYMMDDN", SHOWN_DAYS},
    {FAMILY_TRANSPORT, "YYMMDDP", SHOWN_DAYS},       {FAMILY_TRANSPORT, "YYMMDDS", SHOWN_DAYS},
    {FAMILY_TRANSPORT, "E8601DA", SHOWN_DAYS},       {FAMILY_TRANSPORT, "B8601DA", SHOWN_DAYS},
    {FAMILY_TRANSPORT, "IS8601DA", SHOWN_DAYS},      {FAMILY_TRANSPORT, "WORDDATE", SHOWN_DAYS},
    {FAMILY_TRANSPORT, "WORDDATX", SHOWN_DAYS},      {FAMILY_TRANSPORT, "WEEKDATE", SHOWN_DAYS},
    {FAMILY_TRANSPORT, "WEEKDATX", SHOWN_DAYS},      {FAMILY_TRANSPORT, "JULIAN", SHOWN_DAYS},
    {FAMILY_TRANSPORT, "NLDATE", SHOWN_DAYS},        {FAMILY_TRANSPORT, "MINGUO", SHOWN_DAYS},
    {FAMILY_TRANSPORT, "DATETIME", SHOWN_SECONDS},   {FAMILY_TRANSPORT, "DATEAMPM", SHOWN_SECONDS},
    {FAMILY_TRANSPORT, "E8601DT", SHOWN_SECONDS},    {FAMILY_TRANSPORT, "B8601DT", SHOWN_SECONDS},
    {FAMILY_TRANSPORT, "IS8601DT", SHOWN_SECONDS},   {FAMILY_TRANSPORT, "MDYAMPM", SHOWN_SECONDS},
    {FAMILY_TRANSPORT, "NLDATM", SHOWN_SECONDS},     {FAMILY_TRANSPORT, "TIME", SHOWN_CLOCK},
    {FAMILY_TRANSPORT, "TIMEAMPM", SHOWN_CLOCK},     {FAMILY_TRANSPORT, "HHMM", SHOWN_CLOCK},
    {FAMILY_TRANSPORT, "TOD", SHOWN_CLOCK},          {FAMILY_TRANSPORT, "E8601TM", SHOWN_CLOCK},
    {FAMILY_TRANSPORT, "B8601TM", SHOWN_CLOCK},      {FAMILY_TRANSPORT, "IS8601TM", SHOWN_CLOCK},
    {FAMILY_TRANSPORT, "NLTIME", SHOWN_CLOCK},       {FAMILY_LABELLED, "DATE", SHOWN_SECONDS},
    {FAMILY_LABELLED, "ADATE", SHOWN_SECONDS},       {FAMILY_LABELLED, "EDATE", SHOWN_SECONDS},
    {FAMILY_LABELLED, "JDATE", SHOWN_SECONDS},       {FAMILY_LABELLED, "SDATE", SHOWN_SECONDS},
    {FAMILY_LABELLED, "DATETIME", SHOWN_SECONDS},    {FAMILY_LABELLED, "YMDHMS", SHOWN_SECONDS},
    {FAMILY_LABELLED, "TIME", SHOWN_CLOCK},          {FAMILY_LABELLED, "DTIME", SHOWN_CLOCK},
    {FAMILY_LABELLED, "MTIME", SHOWN_CLOCK},         {FAMILY_PERCENT, "td", SHOWN_DAYS},
    {FAMILY_PERCENT, "d", SHOWN_DAYS},               {FAMILY_PERCENT, "tc", SHOWN_MILLISECONDS},
    {FAMILY_PERCENT, "tm", SHOWN_MONTHS},            {FAMILY_PERCENT, "ty", SHOWN_YEARS},
};

/* The name in "DATE9.", "YYMMDD10", "DATETIME20.2", "%tdDD/NN/CCYY", "%-d": letters up to the width; in the last family
 * t and one letter, or d. */
static enum shown shown_by(enum family family, const char *format) {
    char name[16];
    size_t length = strlen(format);
    if (family == FAMILY_PERCENT) {
        format += *format == '%';
        format += *format == '-';
        length = *format == 't' ? 2 : 1;
    } else {
        while (length && (isdigit((unsigned char)format[length - 1]) || format[length - 1] == '.')) {
            length--;
        }
    }
    snprintf(name, sizeof name, "%.*s", (int)(length < sizeof name ? length : sizeof name - 1), format);
    for (size_t i = 0; i < sizeof date_formats / sizeof *date_formats; i++) {
        const struct date_format *known = &date_formats[i];
        if (known->family == family && !(family == FAMILY_PERCENT ? strcmp : strcasecmp)(known->name, name)) {
            return known->shown;
        }
    }
    return SHOWN_NUMBER;
}

/* Milliseconds or days must be whole and of modest size to be a date; else false, and the number stays. */
static bool show_date(const struct reading *reading, enum shown shown, double value, char out[SHOWN_ROOM]) {
    bool labelled = reading->format->family == FAMILY_LABELLED;
    int64_t origin = labelled ? days_of(1582, 10, 14) : days_of(1960, 1, 1);
    double scaled = shown == SHOWN_SECONDS || shown == SHOWN_CLOCK ? round(value * 1000) : value;
    if (!(fabs(scaled) < 1e15) || fabs(scaled - (double)(int64_t)scaled) > 0) {
        return false;
    }
    int64_t whole = (int64_t)scaled, year = 1960 + whole / 12 - (whole % 12 < 0);
    switch (shown) {
    case SHOWN_DAYS:
        return shown_date(out, whole + origin);
    case SHOWN_SECONDS:
    case SHOWN_MILLISECONDS:
        return shown_date_time(out, whole + origin * MILLISECONDS_PER_DAY);
    case SHOWN_CLOCK:
        if (whole < 0) {
            return false;
        }
        shown_time(out, whole);
        return true;
    case SHOWN_MONTHS:
        if (year < 1 || year > 9999) {
            return false;
        }
        snprintf(out, SHOWN_ROOM, "%04d-%02d", (int)year, (int)((whole % 12 + 12) % 12) + 1);
        return true;
    case SHOWN_YEARS:
    case SHOWN_NUMBER:
        break;
    }
    return false;
}

/* --- values ------------------------------------------------------------------------------------------------------- */

/* The value's text, in `room` or borrowed from the value. */
static const char *text_of(struct reading *reading, enum shown shown, readstat_value_t value, char room[SHOWN_ROOM]) {
    if (readstat_value_type_class(value) == READSTAT_TYPE_CLASS_STRING) {
        const char *text = readstat_string_value(value);
        return text ? text : "";
    }
    if (readstat_value_is_tagged_missing(value)) {
        snprintf(room, SHOWN_ROOM, ".%c", readstat_value_tag(value));
        return room;
    }
    double number = readstat_double_value(value);
    if (readstat_value_is_system_missing(value) || !isfinite(number)) {
        return "";
    }
    if (shown != SHOWN_NUMBER && show_date(reading, shown, number, room)) {
        return room;
    }
    if (readstat_value_type(value) == READSTAT_TYPE_FLOAT) {
        shown_float(room, readstat_float_value(value));
    } else {
        shown_number(room, number);
    }
    return room;
}

/* code: plain text. */
static bool declare_missing(struct reading *reading, struct column *column, const char *code) {
    for (size_t i = 0; i < column->missing_count; i++) {
        if (!strcmp(column->missing[i], code)) {
            return true;
        }
    }
    if (!*code) {
        return true;
    }
    if (column->missing_count == MISSING_LIMIT) {
        return refuse(reading, "a column has more than 1,000 different values that the file declares as missing; declare "
                               "fewer and export it again");
    }
    column->missing = push(&reading->build.cells->arena, column->missing, &column->missing_count, sizeof *column->missing);
    column->missing[column->missing_count - 1] = arena_text(&reading->build.cells->arena, code);
    return true;
}

static int on_metadata(readstat_metadata_t *metadata, void *of) {
    struct reading *reading = of;
    int columns = readstat_get_var_count(metadata);
    const char *encoding = readstat_get_file_encoding(metadata);
    reading->version = readstat_get_file_format_version(metadata);
    reading->promised = readstat_get_row_count(metadata);
    reading->encoding = encoding && *encoding ? arena_text(&reading->scratch, encoding) : NULL;
    if (columns > COLUMN_LIMIT) {
        return stop(reading, "it holds more than 1999 columns, the most a study takes; take out what the plan does not need "
                             "and load again");
    }
    if (columns > 0 && reading->promised > (64 << 20) / columns) {
        return stop(reading, build_limit);
    }
    return READSTAT_HANDLER_OK;
}

static bool take_ranges(struct reading *reading, struct column *column, const readstat_variable_t *variable) {
    int ranges = readstat_variable_get_missing_ranges_count(variable);
    for (int i = 0; i < ranges; i++) {
        readstat_value_t low = readstat_variable_get_missing_range_lo(variable, i);
        readstat_value_t high = readstat_variable_get_missing_range_hi(variable, i);
        char room[2][SHOWN_ROOM];
        const char *code = text_of(reading, column->shown, low, room[0]);
        bool one = !strcmp(code, text_of(reading, column->shown, high, room[1]));
        /* Of a span only the codes that come are listed. */
        if (one && !declare_missing(reading, column, keep_text(reading, code))) {
            return false;
        }
    }
    return true;
}

static int on_variable(int index, readstat_variable_t *variable, const char *set, void *of) {
    struct reading *reading = of;
    size_t count = reading->build.cells->columns;
    if ((size_t)index != count || reading->build.cells->records) {
        return stop(reading, "its variables come out of order; export it again and load that");
    }
    if (count == COLUMN_LIMIT) {
        return stop(reading, "it holds more than 1999 columns, the most a study takes; take out what the plan does not need "
                             "and load again");
    }
    const char *name = readstat_variable_get_name(variable), *format = readstat_variable_get_format(variable);
    bool number = readstat_variable_get_type_class(variable) == READSTAT_TYPE_CLASS_NUMERIC;
    build_column(&reading->build, keep_text(reading, name));
    reading->columns = push(&reading->scratch, reading->columns, &count, sizeof *reading->columns);
    struct column *column = &reading->columns[count - 1];
    *column = (struct column){.shown = number && format ? shown_by(reading->format->family, format) : SHOWN_NUMBER,
        .label = keep_text(reading, readstat_variable_get_label(variable)),
        .set = set && *set ? arena_text(&reading->scratch, set) : NULL};
    reading->row_width += readstat_variable_get_storage_width(variable);
    return take_ranges(reading, column, variable) && reading->fault->code == FAULT_NONE ? READSTAT_HANDLER_OK : READSTAT_HANDLER_ABORT;
}

static int on_value(int observation, readstat_variable_t *variable, readstat_value_t value, void *of) {
    struct reading *reading = of;
    struct cells *cells = reading->build.cells;
    size_t index = (size_t)readstat_variable_get_index(variable);
    if (index >= cells->columns || (size_t)observation * cells->columns + index != reading->build.count) {
        return stop(reading, "its values come out of order; export it again and load that");
    }
    if (index == 0 && !build_record(&reading->build, (size_t)observation + 1)) {
        return stop(reading, build_limit);
    }
    struct column *column = &reading->columns[index];
    char room[SHOWN_ROOM];
    size_t length;
    const char *text = plain_text(reading, text_of(reading, column->shown, value, room), &length);
    if (!build_cell(&reading->build, text, length)) {
        return stop(reading, build_limit);
    }
    bool missing = length && (readstat_value_is_tagged_missing(value) || readstat_value_is_defined_missing(value, variable));
    if (missing && !declare_missing(reading, column, reading->build.text.data + cells->start[reading->build.count - 1])) {
        return READSTAT_HANDLER_ABORT;
    }
    return reading->fault->code == FAULT_NONE ? READSTAT_HANDLER_OK : READSTAT_HANDLER_ABORT;
}

static struct label_set *set_named(struct reading *reading, const char *name) {
    for (size_t i = reading->set_count; i-- > 0;) { /* labels come set by set: mostly it is the last */
        if (!strcmp(reading->sets[i].name, name)) {
            return &reading->sets[i];
        }
    }
    return NULL;
}

/* How the values of this set's columns are shown, so that a code reads as the cell does. */
static enum shown shown_in(const struct reading *reading, const char *set) {
    for (size_t i = 0; i < reading->build.cells->columns; i++) {
        if (reading->columns[i].set && !strcmp(reading->columns[i].set, set)) {
            return reading->columns[i].shown;
        }
    }
    return SHOWN_NUMBER;
}

static int on_label(const char *name, readstat_value_t value, const char *label, void *of) {
    struct reading *reading = of;
    struct label_set *set = set_named(reading, name);
    if (++reading->label_count > LABEL_LIMIT) {
        return stop(reading, "it holds more than 1,048,576 value labels; export it with fewer and load that");
    }
    if (!set) {
        if (reading->set_count == (size_t)COLUMN_LIMIT * 2) {
            return stop(reading, "it holds more sets of value labels than columns; export it again and load that");
        }
        reading->sets = push(&reading->scratch, reading->sets, &reading->set_count, sizeof *reading->sets);
        set = &reading->sets[reading->set_count - 1];
        *set = (struct label_set){.name = arena_text(&reading->scratch, name)};
    }
    char room[SHOWN_ROOM];
    const char *code = keep_text(reading, text_of(reading, shown_in(reading, name), value, room));
    if (*code) {
        set->labels = push(&reading->build.cells->arena, set->labels, &set->count, sizeof *set->labels);
        set->labels[set->count - 1] = (struct cell_label){code, keep_text(reading, label)};
    }
    return reading->fault->code == FAULT_NONE ? READSTAT_HANDLER_OK : READSTAT_HANDLER_ABORT;
}

/* --- bytes -------------------------------------------------------------------------------------------------------- */

static int open_bytes(const char *path, void *of) {
    (void)path;
    ((struct received *)of)->at = 0;
    return 0;
}

static int close_bytes(void *of) {
    (void)of;
    return 0;
}

static readstat_off_t seek_bytes(readstat_off_t offset, readstat_io_flags_t whence, void *of) {
    struct received *received = of;
    int64_t length = (int64_t)received->length;
    int64_t from = whence == READSTAT_SEEK_SET ? 0 : whence == READSTAT_SEEK_CUR ? (int64_t)received->at : length;
    if (offset < -from || offset > length - from) {
        return -1;
    }
    received->at = (size_t)(from + offset);
    return (readstat_off_t)received->at;
}

static ssize_t read_bytes(void *room, size_t wanted, void *of) {
    struct received *received = of;
    size_t left = received->length - received->at, got = wanted < left ? wanted : left;
    if (got) {
        memcpy(room, received->bytes + received->at, got);
    }
    received->at += got;
    return (ssize_t)got;
}

static readstat_parser_t *new_parser(struct received *received) {
    readstat_parser_t *parser = readstat_parser_init();
    if (!parser) {
        return NULL;
    }
    readstat_set_open_handler(parser, open_bytes);
    readstat_set_close_handler(parser, close_bytes);
    readstat_set_seek_handler(parser, seek_bytes);
    readstat_set_read_handler(parser, read_bytes);
    readstat_set_io_ctx(parser, received);
    readstat_set_metadata_handler(parser, on_metadata);
    readstat_set_variable_handler(parser, on_variable);
    readstat_set_value_handler(parser, on_value);
    readstat_set_value_label_handler(parser, on_label);
    return parser;
}

/* --- whole files -------------------------------------------------------------------------------------------------- */

/* The place of the next card that begins so, at or after `at`; `length` where there is none. */
static size_t find_card(const char *bytes, size_t length, size_t at, const char *begin) {
    size_t size = strlen(begin);
    for (; at + CARD <= length; at += CARD) {
        if (!memcmp(bytes + at, begin, size)) {
            return at;
        }
    }
    return length;
}

#define MEMBER_5 "HEADER RECORD*******MEMBER  HEADER RECORD!!!!!!!"
#define MEMBER_8 "HEADER RECORD*******MEMBV8  HEADER RECORD!!!!!!!"
#define OBSERVATIONS "HEADER RECORD*******OBS"

/* A transport file has no count of its records: what can be seen is that it ends within a card, or holds more than one
 * data set, of which the later would be read as records of the first. */
static bool check_cards(struct reading *reading, const char *bytes, size_t length) {
    if (length % CARD) {
        return refuse(reading, "it is cut short (its length is no multiple of 80 bytes); copy or export it again and load "
                               "that");
    }
    const char *member = BEGINS(LIBRARY_8) ? MEMBER_8 : MEMBER_5;
    size_t first = find_card(bytes, length, 0, member);
    if (find_card(bytes, length, first < length ? first + CARD : length, member) < length) {
        return refuse(reading, "it holds several data sets; write each to a file of its own and load those");
    }
    return true;
}

/* After the last whole record only the pad of the last card may stand. */
static bool check_tail(struct reading *reading, const char *bytes, size_t length) {
    size_t data = find_card(bytes, length, 0, OBSERVATIONS);
    if (data == length || !reading->row_width) {
        return refuse(reading, "it is cut short before its records; copy or export it again and load that");
    }
    size_t tail = (length - data - CARD) % reading->row_width;
    for (size_t i = length - tail; i < length; i++) {
        if (bytes[i] != ' ' && bytes[i] != '\0') {
            return refuse(reading, "it ends within a record; copy or export it again and load that");
        }
    }
    return true;
}

static bool check_whole(struct reading *reading, const char *bytes, size_t length) {
    struct cells *cells = reading->build.cells;
    if (!cells->columns) {
        return refuse(reading, "it holds no variables; export it again and load that");
    }
    if (reading->build.count != cells->records * cells->columns ||
        (reading->promised >= 0 && (uint64_t)reading->promised != cells->records)) {
        return fault_at(reading->fault, FAULT_INPUT, cells->records + 1, 1,
            "%s, a %s: it says that it holds %lld records, but ends after %zu; copy or export it again and load that",
            reading->name, reading->format->word, (long long)reading->promised, cells->records);
    }
    struct header_flaw flaw;
    char what[HEADER_FLAW_ROOM];
    if (!header_check(cells->names, cells->columns, &flaw)) {
        return fault_at(reading->fault, FAULT_INPUT, 0, flaw.column + 1, "%s, a %s, column %zu: %s", reading->name,
            reading->format->word, flaw.column + 1, header_sentence(what, &flaw, "line", cells->names, NULL));
    }
    return reading->format->family != FAMILY_TRANSPORT || !is_transport(bytes, length) || check_tail(reading, bytes, length);
}

static void describe(struct reading *reading) {
    struct cells *cells = reading->build.cells;
    struct text text;
    text_init(&text);
    text_string(&text, reading->format->word);
    if (reading->format->has_version) {
        text_format(&text, ", version %d", reading->version);
    }
    if (reading->encoding) {
        text_format(&text, ", %s", reading->encoding);
    }
    struct cell_about *about = ARENA_NEW(&cells->arena, cells->columns, struct cell_about);
    for (size_t i = 0; i < cells->columns; i++) {
        const struct column *column = &reading->columns[i];
        const struct label_set *set = column->set ? set_named(reading, column->set) : NULL;
        about[i] = (struct cell_about){.label = column->label, .values = set ? set->labels : NULL,
            .value_count = set ? set->count : 0, .missing = column->missing, .missing_count = column->missing_count};
    }
    cells->about = about;
    cells->format = reading->format->word;
    cells->place = "observation";
    cells->encoding = arena_text(&cells->arena, text.data);
    cells->delimiter_word = "none (cells of variables)";
    text_release(&text);
}

static bool parse(struct reading *reading, const char *bytes, size_t length) {
    struct received received = {.bytes = bytes, .length = length};
    readstat_parser_t *parser = new_parser(&received);
    if (!parser) {
        return fault_set(reading->fault, FAULT_SYSTEM, "%s: no memory to read it; close other programs and try again",
            reading->name);
    }
    readstat_error_t error = reading->format->parse(parser, "", reading);
    readstat_parser_free(parser);
    if (error != READSTAT_OK) {
        size_t records = reading->build.cells->records;
        return fault_at(reading->fault, FAULT_INPUT, records + 1, 1, /* a fault of a handler stands first */
            "%s, a %s: it is cut short or damaged and cannot be read beyond record %zu (%s); copy or export it again and "
            "load that",
            reading->name, reading->format->word, records, readstat_error_message(error));
    }
    return check_whole(reading, bytes, length);
}

/* `not_utf8`: the texts, taken as the file or ReadStat says, turned out not to be UTF-8. */
static bool read_as(struct cells *cells, const struct statistical_format *format, const char *bytes, size_t length,
    const char *name, bool windows_1252, bool *not_utf8, struct fault *fault) {
    struct reading reading = {.format = format, .name = name, .fault = fault, .promised = -1,
        .windows_1252 = windows_1252};
    build_init(&reading.build, cells);
    arena_init(&reading.scratch);
    text_init(&reading.converted);
    bool done = (!is_transport(bytes, length) || check_cards(&reading, bytes, length)) && parse(&reading, bytes, length);
    *not_utf8 = done && reading.not_utf8;
    done = done && !reading.not_utf8;
    if (done) {
        reading.encoding = windows_1252 ? "Windows-1252" : reading.encoding;
        describe(&reading);
        build_finish(&reading.build);
    } else {
        build_drop(&reading.build);
    }
    text_release(&reading.converted);
    arena_release(&reading.scratch);
    return done;
}

bool statistical_read(struct cells *cells, const struct statistical_format *format, const char *bytes, size_t length,
    const char *name, struct fault *fault) {
    bool not_utf8;
    return read_as(cells, format, bytes, length, name, false, &not_utf8, fault) ||
           (not_utf8 && read_as(cells, format, bytes, length, name, true, &not_utf8, fault));
}
