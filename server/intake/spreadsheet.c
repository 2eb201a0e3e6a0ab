/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Rows are gathered one at a time: only at its end is it known whether a row is blank, a header or a record. */
#include "server/intake/spreadsheet.h"
#include "intake/number.h"
#include "server/intake/build.h"
#include "server/intake/shown.h"
#include "server/intake/workbook.h"
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { ROW_LIMIT = 1048576, SHEET_COLUMN_LIMIT = 16384 }; /* of the format: 29500-1, 18.3.1.73 and common practice */
enum taking { TAKING_NOTHING, TAKING_VALUE, TAKING_TEXT };

struct placed {
    size_t column, start, length; /* column 0-based; the rest within the row's text */
};

struct sheet {
    struct workbook *workbook;
    struct build build;
    const char *name;
    bool in_data, in_row, in_cell, in_phonetic;
    enum taking taking;
    size_t row, header_row;  /* 1-based; header_row 0 until there is one */
    size_t column;           /* 1-based, of the cell being read or read last */
    char type[12];           /* the cell's t */
    enum style style;
    bool has_formula, has_value;
    struct text value;       /* what stands in v, or in the inline text */
    struct text row_text;
    struct placed *placed;   /* the row's cells that hold anything, by column */
    size_t placed_count, placed_room;
    bool row_hidden, row_filled; /* filled: some cell holds more than space */
    size_t hidden_rows, hidden_columns, formulas, merges, covered_area;
    bool hidden_column[COLUMN_LIMIT];
};

/* --- places ------------------------------------------------------------------------------------------------------ */

/* 0-based column -> "A", "AB". */
static void letters_of(char out[COLUMN_WORD_ROOM], size_t column) {
    char room[COLUMN_WORD_ROOM];
    size_t at = sizeof room;
    for (size_t rest = column + 1; rest > 0; rest = (rest - 1) / 26) {
        room[--at] = (char)('A' + (rest - 1) % 26);
    }
    memcpy(out, room + at, sizeof room - at);
    out[sizeof room - at] = '\0';
}

/* "AB12" -> 1-based column and row; what follows the reference, NULL where it is none. */
static const char *read_reference(const char *text, size_t *column, size_t *row) {
    *column = *row = 0;
    for (; *text >= 'A' && *text <= 'Z' && *column <= SHEET_COLUMN_LIMIT; text++) {
        *column = *column * 26 + (size_t)(*text - 'A' + 1);
    }
    for (; *text >= '0' && *text <= '9' && *row <= ROW_LIMIT; text++) {
        *row = *row * 10 + (size_t)(*text - '0');
    }
    return *column && *column <= SHEET_COLUMN_LIMIT && *row && *row <= ROW_LIMIT ? text : NULL;
}

static struct fault *fault_of(const struct sheet *sheet) {
    return sheet->workbook->package.fault;
}

static bool refuse_sheet(struct sheet *sheet, const char *what) {
    return fault_set(fault_of(sheet), FAULT_INPUT, "%s, sheet \"%.100s\": %s", sheet->workbook->package.name, sheet->name,
        what);
}

/* row, column: 1-based. */
static bool refuse_cell(struct sheet *sheet, size_t row, size_t column, const char *what) {
    char letters[COLUMN_WORD_ROOM];
    letters_of(letters, column - 1);
    return fault_at(fault_of(sheet), FAULT_INPUT, row, column, "%s, sheet \"%.100s\", cell %s%zu: %s",
        sheet->workbook->package.name, sheet->name, letters, row, what);
}

static bool refuse_row(struct sheet *sheet, const char *what) {
    return fault_at(fault_of(sheet), FAULT_INPUT, sheet->row, 1, "%s, sheet \"%.100s\", row %zu: %s",
        sheet->workbook->package.name, sheet->name, sheet->row, what);
}

static bool refuse_here(struct sheet *sheet, const char *what) {
    return refuse_cell(sheet, sheet->row, sheet->column, what);
}

/* --- dates ------------------------------------------------------------------------------------------------------- */

/* In the 1900 calendar day 1 is 1900-01-01 and day 60 the 29th of February 1900, which never was (29500-1, 18.17.4.1);
 * in the other day 0 is 1904-01-01. */
static bool show_day(const struct sheet *sheet, char out[SHOWN_ROOM], int64_t day) {
    if (sheet->workbook->from_1904) {
        return shown_date(out, day + days_of(1904, 1, 1));
    }
    if (day == 60 || day == 0) {
        snprintf(out, SHOWN_ROOM, "%s", day ? "1900-02-29" : "1900-01-00");
        return true;
    }
    return shown_date(out, day + days_of(1899, 12, 31) - (day > 60));
}

/* A number that its format shows as date or time; false where it shows none (negative, or beyond the year 9999). */
static bool show_serial(const struct sheet *sheet, char out[SHOWN_ROOM], double value) {
    if (!(value >= 0 && value < 2958466)) {
        return false;
    }
    int64_t milliseconds = llround(value * (double)MILLISECONDS_PER_DAY);
    int64_t rest = milliseconds % MILLISECONDS_PER_DAY;
    if (sheet->style == STYLE_ELAPSED || (sheet->style == STYLE_TIME && milliseconds < MILLISECONDS_PER_DAY)) {
        shown_time(out, milliseconds);
        return true;
    }
    if (!show_day(sheet, out, milliseconds / MILLISECONDS_PER_DAY)) {
        return false;
    }
    if (rest) {
        char time[SHOWN_ROOM];
        shown_time(time, rest);
        size_t length = strlen(out);
        snprintf(out + length, SHOWN_ROOM - length, "T%.30s", time);
    }
    return true;
}

/* --- cells ------------------------------------------------------------------------------------------------------- */

static bool is_blank(const char *text, size_t length) {
    for (size_t i = 0; i < length; i++) {
        if (text[i] != ' ' && !(text[i] >= '\t' && text[i] <= '\r')) {
            return false;
        }
    }
    return true;
}

static void place(struct sheet *sheet, const char *text, size_t length) {
    if (!length) {
        return;
    }
    if (sheet->placed_count == sheet->placed_room) {
        sheet->placed_room = sheet->placed_room ? 2 * sheet->placed_room : 64;
        sheet->placed = memory_grow(sheet->placed, sheet->placed_room, sizeof *sheet->placed);
    }
    sheet->placed[sheet->placed_count++] = (struct placed){sheet->column - 1, sheet->row_text.length, length};
    text_append(&sheet->row_text, text, length);
    text_char(&sheet->row_text, '\0');
    sheet->row_filled = sheet->row_filled || !is_blank(text, length);
}

/* Whether a plain decimal is shown just as it is written, which saves reading it: "12", "-0.5", "27.25"; at most 15
 * digits, no zeros that say nothing. */
static bool is_as_shown(const char *text) {
    const char *first = text + (*text == '-');
    size_t whole = strspn(first, "0123456789"), decimals = 0;
    const char *end = first + whole;
    if (*end == '.') {
        decimals = strspn(end + 1, "0123456789");
        end += 1 + decimals;
    }
    bool even = *first == '0' ? whole == 1 && decimals > 0 && decimals < 7 : whole > 0;
    bool plain = !*end && (first[whole] != '.' || (decimals > 0 && end[-1] != '0'));
    return (even || !strcmp(text, "0")) && plain && whole + decimals <= 15;
}

static void place_number(struct sheet *sheet) {
    char shown[SHOWN_ROOM];
    double value;
    if (sheet->style == STYLE_NUMBER && is_as_shown(sheet->value.data)) {
        place(sheet, sheet->value.data, sheet->value.length);
        return;
    }
    if (number_read(sheet->value.data, '.', &value, NULL) != NUMBER_READ) {
        place(sheet, sheet->value.data, sheet->value.length); /* no number after all: as it stands, for a person to settle */
        return;
    }
    if (sheet->style == STYLE_NUMBER || !show_serial(sheet, shown, value)) {
        shown_typed(shown, value);
    }
    place(sheet, shown, strlen(shown));
}

static void place_shared(struct sheet *sheet) {
    const struct workbook *workbook = sheet->workbook;
    char *end;
    unsigned long index = strtoul(sheet->value.data, &end, 10);
    if (end == sheet->value.data || *end || index >= workbook->shared_count) {
        refuse_here(sheet, "it points at a shared text that the file does not hold; export the file again and load that");
        return;
    }
    const char *text = workbook->shared.data + workbook->shared_start[index];
    place(sheet, text, strlen(text));
}

static void place_text(struct sheet *sheet) {
    sheet->value.length = workbook_unescape(sheet->value.data, sheet->value.length);
    sheet->value.data[sheet->value.length] = '\0';
    place(sheet, sheet->value.data, sheet->value.length);
}

/* "true", "1" -> TRUE; what is neither true nor false stays as it stands. */
static void place_boolean(struct sheet *sheet) {
    const char *value = sheet->value.data;
    const char *shown = !strcmp(value, "1") || !strcmp(value, "true")    ? "TRUE"
                        : !strcmp(value, "0") || !strcmp(value, "false") ? "FALSE"
                                                                         : value;
    place(sheet, shown, strlen(shown));
}

/* The strict form may write a date as ISO 8601 text: only a midnight is taken off. */
static void place_date(struct sheet *sheet) {
    char *midnight = strstr(sheet->value.data, "T00:00:00");
    size_t length = sheet->value.length;
    if (midnight && strspn(midnight + 9, ".0Z") == strlen(midnight + 9)) {
        length = (size_t)(midnight - sheet->value.data);
    }
    place(sheet, sheet->value.data, length);
}

static const struct cell_type {
    const char *word;
    void (*place)(struct sheet *sheet);
} cell_types[] = { /* 29500-1, 18.18.11 */
    {"", place_number}, {"n", place_number}, {"s", place_shared}, {"str", place_text}, {"inlineStr", place_text},
    {"b", place_boolean}, {"e", place_text}, {"d", place_date},
};

static void end_cell(struct sheet *sheet) {
    sheet->in_cell = false;
    sheet->formulas += sheet->has_formula;
    bool empty = !sheet->has_value || (!sheet->value.length && strcmp(sheet->type, "str"));
    if (sheet->has_formula && empty) {
        refuse_here(sheet, "it holds a formula whose value was never computed; open the file in a spreadsheet program, save "
                           "it and load that");
        return;
    }
    if (!sheet->has_value || (!sheet->value.length && strcmp(sheet->type, "s"))) {
        return;
    }
    for (size_t i = 0; i < sizeof cell_types / sizeof *cell_types; i++) {
        if (!strcmp(sheet->type, cell_types[i].word)) {
            cell_types[i].place(sheet);
            return;
        }
    }
    refuse_here(sheet, "its type is none that the format knows; export the file again and load that");
}

static void start_cell(struct sheet *sheet, const char **attributes) {
    const char *reference = NULL, *type = "", *style = "0";
    for (; *attributes; attributes += 2) {
        const char *name = attributes[0];
        reference = !strcmp(name, "r") ? attributes[1] : reference;
        type = !strcmp(name, "t") ? attributes[1] : type;
        style = !strcmp(name, "s") ? attributes[1] : style;
    }
    size_t column = sheet->column + 1, row = sheet->row;
    const char *rest = reference ? read_reference(reference, &column, &row) : "";
    if (!rest || *rest || column > SHEET_COLUMN_LIMIT) {
        refuse_row(sheet, "a cell in it names a place that no sheet has; export the file again and load that");
        return;
    }
    if (row != sheet->row) {
        refuse_cell(sheet, row, column, "it stands in another row than it says; export the file again and load that");
        return;
    }
    if (column <= sheet->column) {
        refuse_cell(sheet, row, column,
            column == sheet->column ? "it stands in the file twice; export the file again and load that"
                                    : "it stands after a cell further right; export the file again and load that");
        return;
    }
    unsigned long number = strtoul(style, NULL, 10);
    sheet->column = column;
    sheet->style = number < sheet->workbook->style_count ? (enum style)sheet->workbook->styles[number] : STYLE_NUMBER;
    snprintf(sheet->type, sizeof sheet->type, "%s", type);
    sheet->in_cell = true;
    sheet->has_formula = sheet->has_value = false;
    text_clear(&sheet->value);
}

/* --- rows -------------------------------------------------------------------------------------------------------- */

static void start_row(struct sheet *sheet, const char **attributes) {
    const char *number = package_attribute(attributes, "r"), *hidden = package_attribute(attributes, "hidden");
    char *end = NULL;
    unsigned long row = number ? strtoul(number, &end, 10) : sheet->row + 1;
    if (row < 1 || row > ROW_LIMIT || (number && *end)) {
        refuse_sheet(sheet, "a row has a number that no sheet has; export the file again and load that");
        return;
    }
    if (row <= sheet->row) {
        bool twice = row == sheet->row;
        sheet->row = row;
        refuse_row(sheet, twice ? "it stands in the file twice; export the file again and load that"
                                : "it stands after a row further down; export the file again and load that");
        return;
    }
    sheet->row = row;
    sheet->column = 0;
    sheet->in_row = true;
    sheet->row_filled = false;
    sheet->row_hidden = hidden && (!strcmp(hidden, "1") || !strcmp(hidden, "true"));
    sheet->placed_count = 0;
    text_clear(&sheet->row_text);
}

static bool placed_is_blank(const struct sheet *sheet, const struct placed *placed) {
    return is_blank(sheet->row_text.data + placed->start, placed->length);
}

static bool take_header(struct sheet *sheet) {
    struct cells *cells = sheet->build.cells;
    sheet->header_row = sheet->row;
    for (size_t i = 0; i < sheet->placed_count; i++) {
        const struct placed *placed = &sheet->placed[i];
        if (placed_is_blank(sheet, placed)) {
            continue;
        }
        if (placed->column >= COLUMN_LIMIT) {
            return refuse_cell(sheet, sheet->row, placed->column + 1,
                "more than 1999 columns, the most a study takes; take out what the plan does not need and load again");
        }
        while (cells->columns < placed->column) {
            build_column(&sheet->build, "");
        }
        build_column(&sheet->build, sheet->row_text.data + placed->start);
    }
    struct header_flaw flaw;
    char what[HEADER_FLAW_ROOM];
    return header_check(cells->names, cells->columns, &flaw) ||
           refuse_cell(sheet, sheet->row, flaw.column + 1, header_sentence(what, &flaw, "row", cells->names, letters_of));
}

static bool refuse_beyond(struct sheet *sheet, size_t column) {
    char last[COLUMN_WORD_ROOM], what[200];
    letters_of(last, sheet->build.cells->columns - 1);
    snprintf(what, sizeof what,
        "it holds text beyond the header, whose last column is %s; give the column a name or clear the cell and load again",
        last);
    return refuse_cell(sheet, sheet->row, column + 1, what);
}

static bool take_record(struct sheet *sheet) {
    size_t columns = sheet->build.cells->columns, next = 0;
    bool fits = build_record(&sheet->build, sheet->row);
    for (size_t i = 0; fits && i < sheet->placed_count; i++) {
        const struct placed *placed = &sheet->placed[i];
        if (placed->column >= columns) {
            if (placed_is_blank(sheet, placed)) {
                continue;
            }
            return refuse_beyond(sheet, placed->column);
        }
        for (; fits && next < placed->column; next++) {
            fits = build_cell(&sheet->build, "", 0);
        }
        fits = fits && build_cell(&sheet->build, sheet->row_text.data + placed->start, placed->length);
        next++;
    }
    for (; fits && next < columns; next++) {
        fits = build_cell(&sheet->build, "", 0);
    }
    return fits || refuse_sheet(sheet, build_limit);
}

static void end_row(struct sheet *sheet) {
    sheet->in_row = false;
    if (!sheet->row_filled) {
        return;
    }
    sheet->hidden_rows += sheet->row_hidden;
    if (sheet->header_row) {
        take_record(sheet);
    } else {
        take_header(sheet);
    }
}

/* --- merged cells and hidden columns ------------------------------------------------------------------------------ */

static void hide_columns(struct sheet *sheet, const char **attributes) {
    const char *hidden = package_attribute(attributes, "hidden");
    const char *first = package_attribute(attributes, "min"), *last = package_attribute(attributes, "max");
    if (!hidden || (strcmp(hidden, "1") && strcmp(hidden, "true")) || !first || !last) {
        return;
    }
    unsigned long from = strtoul(first, NULL, 10), to = strtoul(last, NULL, 10);
    for (unsigned long i = from ? from : 1; i <= to && i <= COLUMN_LIMIT; i++) {
        sheet->hidden_column[i - 1] = true;
    }
}

/* The first record at that row of the sheet or below. */
static size_t record_from(const struct cells *cells, size_t row) {
    size_t low = 0, high = cells->records;
    while (low < high) {
        size_t middle = low + (high - low) / 2;
        if (cells->line[middle] < row) {
            low = middle + 1;
        } else {
            high = middle;
        }
    }
    return low;
}

/* A program shows only the first of merged cells. What another wrote into the rest is seen by no one, so it is neither
 * taken nor dropped. */
static bool check_merge(struct sheet *sheet, size_t first_row, size_t last_row, size_t first, size_t last) {
    const struct cells *cells = sheet->build.cells;
    size_t end = last < cells->columns ? last : cells->columns;
    for (size_t r = record_from(cells, first_row); r < cells->records && cells->line[r] <= last_row; r++) {
        for (size_t c = first - 1; c < end; c++) {
            bool is_first = cells->line[r] == first_row && c == first - 1;
            const char *text = sheet->build.text.data + cells->start[r * cells->columns + c];
            if (!is_first && !is_blank(text, strlen(text))) {
                return refuse_cell(sheet, cells->line[r], c + 1,
                    "it holds text but is covered by merged cells, so that nobody sees it; unmerge them and load again");
            }
        }
        sheet->covered_area += end - (first - 1 < end ? first - 1 : end);
    }
    /* Merged cells never overlap, so together they cover no more than there is. */
    return sheet->covered_area <= cells->records * cells->columns ||
           refuse_sheet(sheet, "its merged cells overlap; export the file again and load that");
}

static void take_merge(struct sheet *sheet, const char **attributes) {
    const char *reference = package_attribute(attributes, "ref");
    size_t first, last, first_row, last_row;
    const char *rest = reference ? read_reference(reference, &first, &first_row) : NULL;
    if (!rest || *rest != ':' || !(rest = read_reference(rest + 1, &last, &last_row)) || *rest || last < first ||
        last_row < first_row) {
        refuse_sheet(sheet, "merged cells name a place that no sheet has; export the file again and load that");
        return;
    }
    sheet->merges++;
    check_merge(sheet, first_row, last_row, first, last);
}

/* --- the part ----------------------------------------------------------------------------------------------------- */

static void start_in_cell(struct sheet *sheet, const char *element) {
    if (!strcmp(element, "v")) {
        sheet->taking = TAKING_VALUE;
        sheet->has_value = true;
    } else if (!strcmp(element, "t")) {
        sheet->taking = sheet->in_phonetic ? TAKING_NOTHING : TAKING_TEXT;
        sheet->has_value = true;
    } else if (!strcmp(element, "f")) {
        sheet->has_formula = true;
    } else if (!strcmp(element, "rPh")) {
        sheet->in_phonetic = true;
    }
}

static void on_start(void *of, const char *element, const char **attributes) {
    struct sheet *sheet = of;
    if (sheet->in_cell) {
        start_in_cell(sheet, element);
    } else if (sheet->in_row && !strcmp(element, "c")) {
        start_cell(sheet, attributes);
    } else if (sheet->in_data && !sheet->in_row && !strcmp(element, "row")) {
        start_row(sheet, attributes);
    } else if (!strcmp(element, "sheetData")) {
        sheet->in_data = true;
    } else if (!sheet->in_data && !strcmp(element, "col")) {
        hide_columns(sheet, attributes);
    } else if (!sheet->in_data && !strcmp(element, "mergeCell")) {
        take_merge(sheet, attributes);
    }
}

static void on_end(void *of, const char *element) {
    struct sheet *sheet = of;
    if (sheet->in_cell) {
        if (!strcmp(element, "v") || !strcmp(element, "t")) {
            sheet->taking = TAKING_NOTHING;
        } else if (!strcmp(element, "rPh")) {
            sheet->in_phonetic = false;
        } else if (!strcmp(element, "c")) {
            end_cell(sheet);
        }
    } else if (sheet->in_row && !strcmp(element, "row")) {
        end_row(sheet);
    } else if (!strcmp(element, "sheetData")) {
        sheet->in_data = false;
    }
}

static void on_text(void *of, const char *bytes, int length) {
    struct sheet *sheet = of;
    if (sheet->taking != TAKING_NOTHING) {
        text_append(&sheet->value, bytes, (size_t)length);
    }
}

static const char *plural(size_t count) {
    return count == 1 ? "" : "s";
}

static const char *write_notes(struct sheet *sheet) {
    struct cells *cells = sheet->build.cells;
    struct text text;
    text_init(&text);
    for (size_t i = 0; i < cells->columns; i++) {
        sheet->hidden_columns += sheet->hidden_column[i];
    }
    if (sheet->hidden_rows || sheet->hidden_columns) {
        text_format(&text, "%zu hidden row%s and %zu hidden column%s of the sheet are read like the others. ",
            sheet->hidden_rows, plural(sheet->hidden_rows), sheet->hidden_columns, plural(sheet->hidden_columns));
    }
    if (sheet->formulas) {
        text_format(&text, "Formulas stand in %zu cell%s: the values computed last are read. ", sheet->formulas,
            plural(sheet->formulas));
    }
    if (sheet->merges) {
        text_format(&text, "%zu merge%s of cells: the first cell of each has the text, the others are blank. ", sheet->merges,
            plural(sheet->merges));
    }
    if (sheet->workbook->sheet_count > 1) {
        text_format(&text, "The file's other sheets (%zu) are not read. ", sheet->workbook->sheet_count - 1);
    }
    const char *notes = arena_bytes(&cells->arena, text.data, text.length ? text.length - 1 : 0);
    text_release(&text);
    return notes;
}

static void describe(struct sheet *sheet) {
    struct cells *cells = sheet->build.cells;
    size_t last = cells->records ? cells->line[cells->records - 1] : sheet->header_row;
    cells->blank_lines = last - cells->records - 1;
    cells->format = "spreadsheet (.xlsx)";
    cells->place = "row";
    cells->encoding = arena_format(&cells->arena, "spreadsheet (.xlsx), sheet \"%s\"", sheet->name);
    cells->delimiter_word = "none (cells of a sheet)";
    cells->notes = write_notes(sheet);
}

static bool read_sheet(struct sheet *sheet, const struct sheet_entry *entry) {
    if (!entry->part) {
        return refuse_sheet(sheet, "the file holds no cells for it; export the file again and load that");
    }
    struct part_reader reader = {.start = on_start, .end = on_end, .text = on_text, .of = sheet};
    if (!package_read(&sheet->workbook->package, entry->part, &reader)) {
        return false;
    }
    return sheet->header_row ||
           refuse_sheet(sheet, "no header, only blank rows; the first row must name the columns; export the file again and "
                               "load that");
}

static bool read_workbook(struct workbook *workbook, const char *name, struct cells *cells) {
    const struct sheet_entry *entry = workbook_sheet(workbook, name);
    if (!entry) {
        return false;
    }
    struct sheet *sheet = memory_new(1, sizeof *sheet);
    sheet->workbook = workbook;
    sheet->name = entry->name;
    build_init(&sheet->build, cells);
    text_init(&sheet->value);
    text_init(&sheet->row_text);
    bool done = read_sheet(sheet, entry);
    if (done) {
        describe(sheet);
        build_finish(&sheet->build);
    } else {
        build_drop(&sheet->build);
    }
    text_release(&sheet->value);
    text_release(&sheet->row_text);
    memory_free(sheet->placed);
    memory_free(sheet);
    return done;
}

bool spreadsheet_read(struct cells *cells, const char *bytes, size_t length, const char *name, const char *sheet,
    struct fault *fault) {
    *cells = (struct cells){0};
    struct workbook workbook;
    bool done = workbook_open(&workbook, bytes, length, name, fault) && read_workbook(&workbook, sheet, cells);
    workbook_close(&workbook);
    return done;
}
