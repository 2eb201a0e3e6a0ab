/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "server/intake/workbook.h"
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistr.h>

/* More than any workbook has; what is looked up among them stays quick. */
enum { PART_LIMIT = 8192, STYLE_LIMIT = 65536 };

static bool refuse(struct workbook *workbook, const char *what) {
    return fault_set(workbook->package.fault, FAULT_INPUT, "%s %s", workbook->package.name, what);
}

static bool within(struct workbook *workbook, size_t count, size_t limit) {
    return count < limit ||
           refuse(workbook, "lists more parts, sheets or formats than any workbook has; export it again and load that");
}

/* --- relationships --------------------------------------------------------------------------------------------- */

struct relation {
    const char *id, *type, *part; /* part NULL: outside the file */
};

struct relations {
    struct workbook *workbook;
    const char *source; /* the part whose relationships these are, "" for the file's own */
    struct relation *relation;
    size_t count;
};

/* One more entry at the end of an arena's array, which doubles when full. */
static void *arena_push(struct arena *arena, void *array, size_t *count, size_t size) {
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

static void take_steps(char *path) {
    char *out = path;
    for (char *at = path; *at;) {
        size_t step = strcspn(at, "/");
        char *next = at + step + (at[step] == '/');
        if (step == 2 && !strncmp(at, "..", 2)) {
            for (out -= out > path; out > path && out[-1] != '/'; out--) {
            }
        } else if (step && !(step == 1 && *at == '.')) {
            memmove(out, at, (size_t)(next - at));
            out += next - at;
        }
        at = next;
    }
    *out = '\0';
}

/* The part that a target names, seen from the source part (29500-2, annex A). */
static const char *resolve(struct arena *arena, const char *source, const char *target) {
    const char *slash = strrchr(source, '/');
    int folder = *target == '/' || !slash ? 0 : (int)(slash - source) + 1;
    char *path = arena_format(arena, "%.*s%s", folder, source, target);
    take_steps(path);
    return path;
}

static void ignore_end(void *of, const char *element) {
    (void)of, (void)element;
}

static void on_relation(void *of, const char *element, const char **attributes) {
    struct relations *relations = of;
    const char *id = package_attribute(attributes, "Id"), *type = package_attribute(attributes, "Type");
    const char *target = package_attribute(attributes, "Target"), *mode = package_attribute(attributes, "TargetMode");
    if (strcmp(element, "Relationship") || !id || !type || !target ||
        !within(relations->workbook, relations->count, PART_LIMIT)) {
        return;
    }
    struct arena *arena = &relations->workbook->arena;
    relations->relation = arena_push(arena, relations->relation, &relations->count, sizeof *relations->relation);
    bool outside = mode && !strcmp(mode, "External");
    relations->relation[relations->count - 1] = (struct relation){.id = arena_text(arena, id),
        .type = arena_text(arena, type), .part = outside ? NULL : resolve(arena, relations->source, target)};
}

static bool read_relations(struct relations *relations, struct workbook *workbook, const char *source) {
    *relations = (struct relations){.workbook = workbook, .source = source};
    const char *slash = strrchr(source, '/');
    int folder = slash ? (int)(slash - source) + 1 : 0;
    const char *part = arena_format(&workbook->arena, "%.*s_rels/%s.rels", folder, source, source + folder);
    return package_read(&workbook->package, part,
        &(struct part_reader){.start = on_relation, .end = ignore_end, .of = relations});
}

/* Types are long addresses that differ between the transitional and the strict form; their last word does not. */
static bool is_type(const struct relation *relation, const char *word) {
    const char *slash = strrchr(relation->type, '/');
    return relation->part && !strcmp(slash ? slash + 1 : relation->type, word);
}

static const char *part_of_type(const struct relations *relations, const char *word) {
    for (size_t i = 0; i < relations->count; i++) {
        if (is_type(&relations->relation[i], word)) {
            return relations->relation[i].part;
        }
    }
    return NULL;
}

/* --- the workbook's own part ------------------------------------------------------------------------------------ */

struct contents {
    struct workbook *workbook;
    const struct relations *relations;
    bool is_workbook;
};

static bool is_true(const char *value) {
    return value && (!strcmp(value, "1") || !strcmp(value, "true"));
}

static void add_sheet(struct contents *contents, const char **attributes) {
    struct workbook *workbook = contents->workbook;
    const char *name = package_attribute(attributes, "name"), *id = package_attribute(attributes, "id");
    const char *state = package_attribute(attributes, "state");
    const struct relation *found = NULL;
    for (size_t i = 0; id && i < contents->relations->count; i++) {
        found = strcmp(contents->relations->relation[i].id, id) ? found : &contents->relations->relation[i];
    }
    if (!name || !within(workbook, workbook->sheet_count, PART_LIMIT) || (found && !is_type(found, "worksheet"))) {
        return; /* a sheet of charts holds no cells */
    }
    workbook->sheets = arena_push(&workbook->arena, workbook->sheets, &workbook->sheet_count, sizeof *workbook->sheets);
    workbook->sheets[workbook->sheet_count - 1] = (struct sheet_entry){.name = arena_text(&workbook->arena, name),
        .part = found ? found->part : NULL, .hidden = state && strcmp(state, "visible")};
}

static void on_workbook(void *of, const char *element, const char **attributes) {
    struct contents *contents = of;
    if (!strcmp(element, "workbook")) {
        contents->is_workbook = true;
    } else if (!strcmp(element, "workbookPr")) {
        contents->workbook->from_1904 = is_true(package_attribute(attributes, "date1904"));
    } else if (!strcmp(element, "sheet")) {
        add_sheet(contents, attributes);
    }
}

/* --- number formats --------------------------------------------------------------------------------------------- */

/* Built-in number formats that show dates or times (29500-1, 18.8.30); those of 27 to 58 in Chinese, Japanese and Korean
 * files alone, where others leave the numbers unused. */
static const struct built_in {
    unsigned first, last;
    enum style style;
} built_in[] = {
    {14, 17, STYLE_DATE}, {18, 21, STYLE_TIME}, {22, 22, STYLE_DATE}, {27, 31, STYLE_DATE}, {32, 35, STYLE_TIME},
    {36, 36, STYLE_DATE}, {45, 45, STYLE_TIME}, {46, 46, STYLE_ELAPSED}, {47, 47, STYLE_TIME}, {50, 54, STYLE_DATE},
    {57, 58, STYLE_DATE},
};

struct formats {
    struct workbook *workbook;
    struct custom {
        unsigned long id;
        enum style style;
    } *custom;
    size_t custom_count;
    bool in_custom, in_cell_formats;
};

struct shown_parts {
    bool day_or_year, month_or_minute, hour_or_second, elapsed;
};

/* A bracket holds a colour, a condition or a locale; of h, m or s alone it shows elapsed time. */
static const char *skip_bracket(const char *at, struct shown_parts *parts) {
    size_t inside = strcspn(at + 1, "]"), units = strspn(at + 1, "hHmMsS");
    parts->elapsed = parts->elapsed || (inside > 0 && units == inside);
    return at + 1 + inside;
}

static void note_letter(struct shown_parts *parts, char c) {
    parts->day_or_year = parts->day_or_year || strchr("dDyY", c);
    parts->month_or_minute = parts->month_or_minute || strchr("mM", c);
    parts->hour_or_second = parts->hour_or_second || strchr("hHsS", c);
}

enum style workbook_style(const char *code) {
    struct shown_parts parts = {0};
    for (const char *at = code; *at && *at != ';'; at++) {
        if (*at == '"') {
            at += 1 + strcspn(at + 1, "\"");
        } else if (*at == '\\' || *at == '_' || *at == '*') {
            at++; /* the next character is shown as it is, or as space */
        } else if (*at == '[') {
            at = skip_bracket(at, &parts);
        } else {
            note_letter(&parts, *at);
        }
        if (!*at) {
            break;
        }
    }
    return parts.day_or_year      ? STYLE_DATE
           : parts.elapsed        ? STYLE_ELAPSED
           : parts.hour_or_second ? STYLE_TIME
           : parts.month_or_minute ? STYLE_DATE
                                  : STYLE_NUMBER;
}

static enum style style_of(const struct formats *formats, unsigned long id) {
    for (size_t i = 0; i < formats->custom_count; i++) {
        if (formats->custom[i].id == id) {
            return formats->custom[i].style;
        }
    }
    for (size_t i = 0; i < sizeof built_in / sizeof *built_in; i++) {
        if (id >= built_in[i].first && id <= built_in[i].last) {
            return built_in[i].style;
        }
    }
    return STYLE_NUMBER;
}

static void on_format(void *of, const char *element, const char **attributes) {
    struct formats *formats = of;
    struct workbook *workbook = formats->workbook;
    const char *id = package_attribute(attributes, "numFmtId"), *code = package_attribute(attributes, "formatCode");
    if (!strcmp(element, "numFmts") || !strcmp(element, "cellXfs")) {
        formats->in_custom = *element == 'n';
        formats->in_cell_formats = *element == 'c';
    } else if (!within(workbook, formats->custom_count, PART_LIMIT) || !within(workbook, workbook->style_count, STYLE_LIMIT)) {
        return;
    } else if (formats->in_custom && !strcmp(element, "numFmt") && id && code) {
        formats->custom = arena_push(&workbook->arena, formats->custom, &formats->custom_count, sizeof *formats->custom);
        formats->custom[formats->custom_count - 1] = (struct custom){strtoul(id, NULL, 10), workbook_style(code)};
    } else if (formats->in_cell_formats && !strcmp(element, "xf")) {
        workbook->styles = arena_push(&workbook->arena, workbook->styles, &workbook->style_count, 1);
        workbook->styles[workbook->style_count - 1] = (unsigned char)style_of(formats, id ? strtoul(id, NULL, 10) : 0);
    }
}

static void end_format(void *of, const char *element) {
    struct formats *formats = of;
    formats->in_custom = formats->in_custom && strcmp(element, "numFmts");
    formats->in_cell_formats = formats->in_cell_formats && strcmp(element, "cellXfs");
}

/* --- shared texts ----------------------------------------------------------------------------------------------- */

struct shared_reading {
    struct workbook *workbook;
    size_t room;
    bool in_text, in_phonetic;
};

static int hexadecimal(const char *at) {
    int value = 0;
    for (int i = 0; i < 4; i++) {
        const char *digits = "0123456789abcdef", *found = at[i] ? strchr(digits, at[i] | 0x20) : NULL;
        if (!found || at[i] < '0') { /* below '0' the bit just set makes digits of control characters */
            return -1;
        }
        value = value * 16 + (int)(found - digits);
    }
    return value;
}

size_t workbook_unescape(char *text, size_t length) {
    char *end = text + length, *out = text, *at = memchr(text, '_', length);
    if (!at) {
        return length;
    }
    out = at;
    while (at < end) {
        int value = end - at >= 7 && at[0] == '_' && at[1] == 'x' && at[6] == '_' ? hexadecimal(at + 2) : -1;
        /* NUL and halves of pairs are no characters: such a text stays as it stands. */
        int wrote = value > 0 ? u8_uctomb((uint8_t *)out, (ucs4_t)value, 4) : -1;
        if (wrote > 0) {
            out += wrote;
            at += 7;
        } else {
            *out++ = *at++;
        }
    }
    return (size_t)(out - text);
}

static void on_shared(void *of, const char *element, const char **attributes) {
    (void)attributes;
    struct shared_reading *reading = of;
    struct workbook *workbook = reading->workbook;
    if (!strcmp(element, "si")) {
        if (workbook->shared_count == reading->room) {
            reading->room = reading->room ? 2 * reading->room : 256;
            workbook->shared_start = memory_grow(workbook->shared_start, reading->room, sizeof *workbook->shared_start);
        }
        workbook->shared_start[workbook->shared_count++] = workbook->shared.length;
    } else if (!strcmp(element, "rPh")) {
        reading->in_phonetic = true;
    } else if (!strcmp(element, "t")) {
        reading->in_text = workbook->shared_count > 0 && !reading->in_phonetic;
    }
}

static void end_shared(void *of, const char *element) {
    struct shared_reading *reading = of;
    struct text *shared = &reading->workbook->shared;
    if (!strcmp(element, "t")) {
        reading->in_text = false;
    } else if (!strcmp(element, "rPh")) {
        reading->in_phonetic = false;
    } else if (!strcmp(element, "si")) {
        size_t start = reading->workbook->shared_start[reading->workbook->shared_count - 1];
        shared->length = start + workbook_unescape(shared->data + start, shared->length - start);
        text_char(shared, '\0');
    }
}

static void text_shared(void *of, const char *bytes, int length) {
    struct shared_reading *reading = of;
    if (reading->in_text) {
        text_append(&reading->workbook->shared, bytes, (size_t)length);
    }
}

/* --- opening ---------------------------------------------------------------------------------------------------- */

/* Other zips that a person may hold instead. */
static bool find_main_part(struct workbook *workbook, const char **part) {
    struct relations relations;
    if (!package_has(&workbook->package, "_rels/.rels")) {
        return refuse(workbook, package_has(&workbook->package, "content.xml")
                                    ? "is an OpenDocument file; save it as .xlsx or as delimited text and load that"
                                    : "is a zip with no spreadsheet in it; unpack it and load the file inside");
    }
    if (!read_relations(&relations, workbook, "")) {
        return false;
    }
    *part = part_of_type(&relations, "officeDocument");
    if (!*part) {
        return refuse(workbook, "is a zip with no spreadsheet in it; unpack it and load the file inside");
    }
    size_t length = strlen(*part);
    if (length > 4 && !strcmp(*part + length - 4, ".bin")) {
        return refuse(workbook, "is a spreadsheet in binary form (.xlsb); save it as .xlsx and load that");
    }
    return true;
}

static bool read_contents(struct workbook *workbook, const char *part, const struct relations *relations) {
    struct contents contents = {.workbook = workbook, .relations = relations};
    if (!package_read(&workbook->package, part,
            &(struct part_reader){.start = on_workbook, .end = ignore_end, .of = &contents})) {
        return false;
    }
    if (!contents.is_workbook) {
        return refuse(workbook, "holds a document that is no spreadsheet; load the spreadsheet or delimited text");
    }
    return workbook->sheet_count > 0 || refuse(workbook, "holds no sheet of cells; export it again and load that");
}

static bool read_formats(struct workbook *workbook, const char *part) {
    struct formats formats = {.workbook = workbook};
    return !part || package_read(&workbook->package, part,
                        &(struct part_reader){.start = on_format, .end = end_format, .of = &formats});
}

static bool read_shared(struct workbook *workbook, const char *part) {
    struct shared_reading reading = {.workbook = workbook};
    return !part || package_read(&workbook->package, part,
                        &(struct part_reader){
                            .start = on_shared, .end = end_shared, .text = text_shared, .of = &reading});
}

bool workbook_open(struct workbook *workbook, const char *bytes, size_t length, const char *name, struct fault *fault) {
    *workbook = (struct workbook){0};
    arena_init(&workbook->arena);
    text_init(&workbook->shared);
    const char *part = NULL;
    struct relations relations;
    return package_open(&workbook->package, bytes, length, name, fault) && find_main_part(workbook, &part) &&
           read_relations(&relations, workbook, part) && read_contents(workbook, part, &relations) &&
           read_formats(workbook, part_of_type(&relations, "styles")) &&
           read_shared(workbook, part_of_type(&relations, "sharedStrings"));
}

void workbook_close(struct workbook *workbook) {
    package_close(&workbook->package);
    arena_release(&workbook->arena);
    text_release(&workbook->shared);
    memory_free(workbook->shared_start);
    *workbook = (struct workbook){0};
}

enum { LISTED = 6, NAME_SHOWN = 40 };

/* A sheet's name as sentences have it: cut at a whole character, so that the way out stays within the sentence. */
static void show_name(struct text *text, const char *name) {
    size_t length = strlen(name), shown = length;
    if (length > NAME_SHOWN) {
        for (shown = NAME_SHOWN; shown > 0 && ((unsigned char)name[shown] & 0xC0) == 0x80; shown--) {
        }
    }
    text_format(text, "\"%.*s%s\"", (int)shown, name, shown < length ? "\u2026" : "");
}

static void list_sheets(struct text *text, const struct workbook *workbook) {
    for (size_t i = 0; i < workbook->sheet_count && i < LISTED; i++) {
        text_string(text, i ? ", " : "");
        show_name(text, workbook->sheets[i].name);
        text_string(text, workbook->sheets[i].hidden ? " (hidden)" : "");
    }
    if (workbook->sheet_count > LISTED) {
        text_format(text, " and %zu more", workbook->sheet_count - LISTED);
    }
}

static void refuse_choice(struct workbook *workbook, const char *name) {
    struct text text;
    text_init(&text);
    if (name) {
        text_literal(&text, "has no sheet ");
        show_name(&text, name);
        text_literal(&text, "; it has ");
        list_sheets(&text, workbook);
        text_literal(&text, "; correct the name in the plan's files");
    } else {
        text_format(&text, "holds %zu sheets: ", workbook->sheet_count);
        list_sheets(&text, workbook);
        text_literal(&text, "; name the one to read in the plan, as in files: [{\"id\": \"\u2026\", \"sheet\": ");
        show_name(&text, workbook->sheets[0].name);
        text_literal(&text, "}]");
    }
    refuse(workbook, text.data);
    text_release(&text);
}

const struct sheet_entry *workbook_sheet(struct workbook *workbook, const char *name) {
    if (!name && workbook->sheet_count == 1) {
        return workbook->sheets;
    }
    for (size_t i = 0; name && i < workbook->sheet_count; i++) {
        if (!strcmp(workbook->sheets[i].name, name)) {
            return &workbook->sheets[i];
        }
    }
    refuse_choice(workbook, name);
    return NULL;
}
