/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Which columns are one quantity at several visits: names are read as stem and visit in every way that common practice
 * offers, columns with a stem in common are brought together, and the larger groups win. */
#include "server/trial/guess-parts.h"
#include <math.h>
#include <stdlib.h>
#include <string.h>

static const char baseline_words[] = "base baseline bl bsl pre before initial init start entry";
static const char screening_words[] = "screening screen scr";
static const char final_words[] = "final last exit close eot eos end";
static const char after_words[] = "post after followup fu fup";

enum { ORDER_SCREENING = -2, ORDER_BASELINE = -1 };
static const double order_after = 1e8, order_final = 1e9;

static const struct unit {
    const char *words, *one, *many; /* one NULL: a visit's number */
    double days;
} units[] = {
    {"v visit vis t time tp timepoint", NULL, NULL, 1},
    {"d day days", "day", "days", 1},
    {"w wk wks week weeks", "week", "weeks", 7},
    {"m mo mos mth mths mon month months", "month", "months", 30.4375},
    {"y yr yrs year years", "year", "years", 365.25},
    {"h hr hrs hour hours", "hour", "hours", 1.0 / 24},
};
enum { UNITS = sizeof units / sizeof *units };

enum way { WAY_SUFFIX, WAY_PREFIX, WAY_GLUED_PREFIX, WAY_GLUED_SUFFIX, WAYS };

struct reading { /* one way of reading one column's name */
    size_t column;
    enum way way;
    const char *stem;        /* parts with "_" for the signs between, "" for a bare "baseline" */
    const struct unit *unit; /* NULL: a word, or a bare number */
    double number;           /* NaN: a word */
    double order;
    bool glued;   /* a bare number right behind the stem: il6 */
    size_t group; /* how many readings have this way and stem */
};

struct readings {
    struct reading *list;
    size_t count;
    struct arena *arena;
};

static bool read_word(const char *word, struct reading *reading) {
    reading->number = NAN;
    reading->unit = NULL;
    reading->order = among(word, baseline_words)    ? ORDER_BASELINE
                     : among(word, screening_words) ? ORDER_SCREENING
                     : among(word, after_words)     ? order_after
                     : among(word, final_words)     ? order_final
                                                    : (double)NAN;
    return !isnan(reading->order);
}

static const struct unit *unit_of(const char *word) {
    for (size_t i = 0; i < UNITS; i++) {
        if (among(word, units[i].words)) {
            return &units[i];
        }
    }
    return NULL;
}

/* Reads exactly `count` parts as a visit. */
static bool read_visit(const struct name_part *part, size_t count, bool number_alone, struct reading *reading) {
    reading->glued = false;
    if (count == 1 && !part[0].digits) {
        return read_word(part[0].text, reading);
    }
    if (count == 1) {
        reading->unit = NULL;
        reading->number = reading->order = strtod(part[0].text, NULL);
        reading->glued = part[0].glued;
        return number_alone && strlen(part[0].text) <= 3;
    }
    if (count != 2) {
        return false;
    }
    if (strcmp(part[0].text, "follow") == 0 && strcmp(part[1].text, "up") == 0) {
        return read_word("followup", reading);
    }
    const struct name_part *number = part[0].digits ? &part[0] : &part[1], *word = part[0].digits ? &part[1] : &part[0];
    reading->unit = number->digits && !word->digits ? unit_of(word->text) : NULL;
    if (!reading->unit) {
        return false;
    }
    reading->number = strtod(number->text, NULL);
    reading->order = reading->number * reading->unit->days;
    return strlen(number->text) <= 4;
}

static const char *joined(const struct name_part *part, size_t count, struct arena *arena) {
    const char *stem = "";
    for (size_t i = 0; i < count; i++) {
        stem = arena_format(arena, "%s%s%s", stem, i && !part[i].glued ? "_" : "", part[i].text);
    }
    return stem;
}

static bool has_letter(const char *stem) {
    for (; *stem; stem++) {
        if ((*stem < '0' || *stem > '9') && *stem != '_') {
            return true;
        }
    }
    return false;
}

static void add_reading(struct readings *readings, struct reading reading) {
    readings->list = memory_grow(readings->list, readings->count + 1, sizeof *readings->list);
    readings->list[readings->count++] = reading;
}

/* "prewt", "wtpost": a word without any sign between. Such a reading counts only where another column answers it. */
static void read_glued(struct readings *readings, size_t column, const char *name) {
    static const char *const words[] = {"pre", "post", "baseline", "base", "bl", "final", "end", "init", "fu"};
    const char *text = folded(name, readings->arena);
    size_t length = strlen(text);
    for (size_t i = 0; i < sizeof words / sizeof *words; i++) {
        size_t span = strlen(words[i]);
        struct reading reading = {.column = column};
        if (length < span + 2 || !read_word(words[i], &reading)) {
            continue;
        }
        if (strncmp(text, words[i], span) == 0) {
            reading.way = WAY_GLUED_PREFIX;
            reading.stem = arena_text(readings->arena, text + span);
            add_reading(readings, reading);
        }
        if (strcmp(text + length - span, words[i]) == 0) {
            reading.way = WAY_GLUED_SUFFIX;
            reading.stem = arena_bytes(readings->arena, text, length - span);
            add_reading(readings, reading);
        }
    }
}

/* "Y1 Y2 Y3" without anything else in the name: the letter by which an outcome is commonly called, not years. */
static void outcome_letter(struct reading *reading, const struct name_parts *parts) {
    if (parts->count == 2 && reading->unit && parts->part[1].glued && strcmp(parts->part[0].text, "y") == 0) {
        reading->stem = "y";
        reading->unit = NULL;
        reading->order = reading->number;
        reading->glued = true;
    }
}

/* "weightv1": where the stem without its last letter is a known name and with it is none, the letter is the unit. */
static void split_unit(struct reading *reading, struct arena *arena) {
    size_t length = strlen(reading->stem);
    if (reading->unit || isnan(reading->number) || length < 3 || known_name_of(reading->stem)) {
        return;
    }
    const char *shorter = arena_bytes(arena, reading->stem, length - 1);
    const struct unit *unit = unit_of(reading->stem + length - 1);
    if (unit && known_name_of(shorter)) {
        reading->stem = shorter;
        reading->unit = unit;
        reading->order = reading->number * unit->days;
    }
}

static void read_name(struct readings *readings, size_t column, const char *name) {
    struct name_parts parts;
    name_take(&parts, name, readings->arena);
    for (size_t length = 2; length >= 1; length--) {
        struct reading reading = {.column = column, .way = WAY_SUFFIX};
        if (parts.count < length || !read_visit(parts.part + parts.count - length, length, true, &reading)) {
            continue;
        }
        reading.stem = joined(parts.part, parts.count - length, readings->arena);
        split_unit(&reading, readings->arena);
        outcome_letter(&reading, &parts);
        if (has_letter(reading.stem) || (parts.count == length && (reading.unit || isnan(reading.number)))) {
            add_reading(readings, reading);
            break;
        }
    }
    for (size_t length = 2; length >= 1; length--) {
        struct reading reading = {.column = column, .way = WAY_PREFIX};
        if (parts.count > length && read_visit(parts.part, length, false, &reading)) {
            reading.stem = joined(parts.part + length, parts.count - length, readings->arena);
            if (has_letter(reading.stem)) {
                add_reading(readings, reading);
                break;
            }
        }
    }
    read_glued(readings, column, name);
}

static bool same_group(const struct reading *left, const struct reading *right) {
    return left->way == right->way && strcmp(left->stem, right->stem) == 0;
}

static int by_order(const void *left, const void *right) {
    const struct reading *a = *(const struct reading *const *)left, *b = *(const struct reading *const *)right;
    return a->order != b->order ? (a->order < b->order ? -1 : 1) : (a->column > b->column) - (a->column < b->column);
}

/* Members of the group of `first` whose columns are free yet, in order of time, one per time. */
static size_t members_of(const struct guess *guess, const struct readings *readings, const struct reading *first,
    const struct reading **members) {
    size_t count = 0, kept = 0;
    for (size_t i = 0; i < readings->count; i++) {
        if (same_group(&readings->list[i], first) && guess->columns[readings->list[i].column].series == NOWHERE) {
            members[count++] = &readings->list[i];
        }
    }
    qsort(members, count, sizeof *members, by_order);
    for (size_t i = 0; i < count; i++) {
        if (kept == 0 || members[i]->order > members[kept - 1]->order) {
            members[kept++] = members[i];
        }
    }
    /* A screening value is no baseline where there is one. */
    if (kept > 2 && members[0]->order <= ORDER_SCREENING && members[1]->order <= 0) {
        memmove(members, members + 1, --kept * sizeof *members);
    }
    return kept;
}

/* Numbers without a unit may be items of a questionnaire (q1 q2 ... q9) or part of a name (il6 il8). */
static bool believable(const struct reading *const *members, size_t count) {
    bool bare = true, in_a_row = true, glued = true;
    for (size_t i = 0; i < count; i++) {
        bare = bare && !members[i]->unit && !isnan(members[i]->number);
        glued = glued && members[i]->glued;
        in_a_row = in_a_row && members[i]->number == (double)(i + 1);
    }
    if (!bare || count == 0) {
        return true;
    }
    return !(in_a_row && count >= 5) && !(glued && members[0]->number > 1);
}

static bool months_rather(const struct reading *const *members, size_t count) {
    bool all = true, telling = false;
    for (size_t i = 0; i < count; i++) {
        int number = isnan(members[i]->number) || members[i]->unit ? 0 : (int)members[i]->number;
        all = all && (number % 3 == 0) && number <= 60;
        telling = telling || number == 3 || number == 9 || number == 18 || number == 36;
    }
    return all && telling;
}

static bool visits_rather(const struct reading *const *members, size_t count) {
    for (size_t i = 0; i < count; i++) {
        if (members[i]->unit || isnan(members[i]->number) || members[i]->number > (double)(i + 1)) {
            return false;
        }
    }
    return true;
}

static const char *visit_label(const struct reading *const *members, size_t count, size_t which, struct arena *arena) {
    const struct reading *member = members[which];
    if (isnan(member->number)) {
        return member->order <= ORDER_SCREENING ? "Screening"
               : member->order < 0              ? "Baseline"
               : member->order < order_final    ? "Follow-up"
                                                : "Final visit";
    }
    if (member->number == 0) {
        return which == 0 ? "Baseline" : "Start of treatment";
    }
    const struct unit *unit = member->unit;
    if (!unit && !visits_rather(members, count)) {
        unit = &units[months_rather(members, count) ? 3 : 2];
    }
    if (!unit || !unit->one) {
        return arena_format(arena, "Visit %g", member->number);
    }
    return arena_format(arena, "%g %s", member->number, member->number == 1 ? unit->one : unit->many);
}

/* A quantity over a factor of four between its outer tenths that leans to the right is read on the log scale. */
static enum scale scale_of(const struct guess *guess, const struct guess_series *series) {
    size_t leaning = 0;
    for (size_t i = 0; i < series->count; i++) {
        const struct guess_column *column = &guess->columns[series->columns[i]];
        leaning += column->skewness > 0.3 && column->spread > 4;
    }
    return 2 * leaning > series->count ? SCALE_LOG10 : SCALE_LINEAR;
}

static const char *free_id(const struct guess *guess, const char *wanted, struct arena *arena) {
    const char *id = wanted;
    for (size_t i = 0, n = 2; i < guess->series_count; i++) {
        if (strcmp(guess->series[i].id, id) == 0) {
            id = arena_format(arena, "%s_%zu", wanted, n++);
            i = (size_t)-1;
        }
    }
    return id;
}

void guess_add_series(struct guess *guess, struct guess_series series) {
    series.id = free_id(guess, series.id, &guess->arena);
    for (size_t i = 0; i < series.count; i++) {
        guess->columns[series.columns[i]].series = (int)guess->series_count;
    }
    series.scale = scale_of(guess, &series);
    guess->series[guess->series_count++] = series;
}

static void add_series(struct guess *guess, const struct reading *const *members, size_t count) {
    struct arena *arena = &guess->arena;
    struct guess_series *series = &guess->series[guess->series_count];
    const char *stem = members[count - 1]->stem;
    stem = *stem ? stem : "outcome"; /* "before month2 month8": the visits have names, the quantity has none */
    const struct known_name *known = known_name_of(name_id(stem, arena));
    *series = (struct guess_series){.id = free_id(guess, name_id(stem, arena), arena),
        .label = name_words(stem, arena),
        .unit = known ? known->unit : "",
        .count = count,
        .lower_is_better = !(known && known->higher_is_better)};
    series->columns = ARENA_NEW(arena, count, size_t);
    series->codes = ARENA_NEW(arena, count, const char *);
    series->visits = ARENA_NEW(arena, count, const char *);
    for (size_t i = 0; i < count; i++) {
        series->columns[i] = members[i]->column;
        series->visits[i] = visit_label(members, count, i, arena);
        for (size_t j = 0; j < i; j++) {
            if (strcmp(series->visits[j], series->visits[i]) == 0) {
                series->visits[i] = guess->columns[members[i]->column].full_name;
            }
        }
        guess->columns[members[i]->column].series = (int)guess->series_count;
    }
    series->scale = scale_of(guess, series);
    guess->series_count++;
}

/* Of the same size, within a factor of three: a count of eight weeks is no baseline of counts of two. */
static bool same_size(const struct guess *guess, size_t left, size_t right) {
    double a = fabs(guess->columns[left].median), b = fabs(guess->columns[right].median);
    return isnan(a) || isnan(b) || (a <= 3 * b && b <= 3 * a);
}

/* "baseline number3m number12m": a column that is called baseline and nothing else belongs to the one series without.
 */
static void adopt_bare(
    const struct readings *readings, const struct reading **members, size_t *count, const struct guess *guess) {
    bool bare_number = !members[0]->unit && !isnan(members[0]->number);
    if (members[0]->order <= 0 || (*count == 1 && bare_number)) {
        return;
    }
    for (size_t i = 0; i < readings->count; i++) {
        const struct reading *bare = &readings->list[i];
        if (!*bare->stem && bare->order < 0 && guess->columns[bare->column].series == NOWHERE &&
            same_size(guess, bare->column, members[0]->column)) {
            memmove(members + 1, members, *count * sizeof *members);
            members[0] = bare;
            (*count)++;
            return;
        }
    }
}

static int by_column(const void *left, const void *right) {
    const struct guess_series *a = left, *b = right;
    return (a->columns[0] > b->columns[0]) - (a->columns[0] < b->columns[0]);
}

static void number_series(struct guess *guess) {
    qsort(guess->series, guess->series_count, sizeof *guess->series, by_column);
    for (size_t i = 0; i < guess->series_count; i++) {
        for (size_t j = 0; j < guess->series[i].count; j++) {
            guess->columns[guess->series[i].columns[j]].series = (int)i;
        }
    }
}

static int larger_first(const void *left, const void *right) {
    const struct reading *a = left, *b = right;
    if (a->group != b->group) {
        return a->group > b->group ? -1 : 1;
    }
    return a->way != b->way ? (a->way < b->way ? -1 : 1) : (a->column > b->column) - (a->column < b->column);
}

void guess_visits(struct guess *guess) {
    struct readings readings = {.arena = &guess->arena};
    for (size_t i = 0; i < guess->column_count; i++) {
        if (guess->columns[i].role == GUESS_NUMBER && !guess->files[guess->columns[i].file].by_visit) {
            read_name(&readings, i, guess->columns[i].name);
        }
    }
    for (size_t i = 0; i < readings.count; i++) {
        for (size_t j = 0; j < readings.count; j++) {
            readings.list[i].group += same_group(&readings.list[i], &readings.list[j]);
        }
    }
    if (readings.count) {
        qsort(readings.list, readings.count, sizeof *readings.list, larger_first);
    }
    guess->series = ARENA_NEW(&guess->arena, guess->column_count, struct guess_series);
    const struct reading **members = memory_new(readings.count + 1, sizeof *members);
    for (size_t i = 0; i < readings.count; i++) {
        if (guess->columns[readings.list[i].column].series != NOWHERE) {
            continue;
        }
        size_t count = members_of(guess, &readings, &readings.list[i], members);
        if (!believable(members, count)) {
            continue;
        }
        adopt_bare(&readings, members, &count, guess);
        if (count >= 2 && (*members[count - 1]->stem || members[count - 1]->unit)) {
            add_series(guess, members, count);
        }
    }
    memory_free(members);
    memory_free(readings.list);
    number_series(guess);
}

/* ---- the codes of a visit column ---- */

bool visit_code_read(const char *name, const char *code, struct arena *arena, double *order, const char **label) {
    struct name_parts parts, column;
    struct reading reading = {.number = NAN, .order = NAN};
    char *end;
    *order = NAN;
    *label = code;
    double number = strtod(code, &end);
    bool bare = end != code && !end[strspn(end, " ")];
    if (bare) {
        const struct unit *unit = NULL;
        name_take(&column, name, arena);
        for (size_t i = 0; i < column.count && !(unit && unit->one); i++) {
            const struct unit *found = column.part[i].digits ? NULL : unit_of(column.part[i].text);
            unit = found ? found : unit;
        }
        reading.unit = unit;
        reading.number = number;
        reading.order = number * (unit ? unit->days : 1);
    } else {
        name_take(&parts, code, arena);
        if (!read_visit(parts.part, parts.count, false, &reading)) {
            bool any = false; /* "Week 8 follow-up", "Baseline visit": the first parts that say a time */
            for (size_t length = parts.count > 1 ? 2 : 1; length >= 1 && !any; length--) {
                for (size_t at = 0; at + length <= parts.count && !any; at++) {
                    any = read_visit(parts.part + at, length, false, &reading);
                }
            }
            if (!any) {
                return false;
            }
        }
    }
    const struct reading *member = &reading;
    *order = reading.order;
    if (bare && !(reading.unit && reading.unit->one)) {
        name_take(&column, name, arena);
        const char *what = name_has(&column, "period")                ? "Period"
                           : name_has(&column, "time t tp timepoint") ? "Time"
                                                                      : "Visit";
        *label = number == 0 ? "Baseline" : arena_format(arena, "%s %s", what, code);
    } else {
        *label = visit_label(&member, 1, 0, arena);
    }
    return true;
}

bool visit_code_is_screening(double order) {
    return order <= ORDER_SCREENING;
}

bool visit_code_is_baseline(double order) {
    return order > ORDER_SCREENING && order <= 0;
}
