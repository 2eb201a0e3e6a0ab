/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The checks of dates. Cells that do not read in their order are looked at together by column and site first: where all
 * of them are written in one other order, that is one discrepancy and one decision. Then each cell, then each
 * participant's dates. */
#include "base/map.h"
#include "base/text.h"
#include "server/trial/checks-parts.h"
#include "trial/dates.h"
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* ---- cells ---- */

struct cell {
    const struct column *column;
    const char *name;   /* as decisions name it; of all visits where `record` counts */
    const char *shared; /* the same without a visit */
    const char *text, *site, *id;
    const char *label;
    size_t record;             /* 0-based */
    bool by_window;            /* a date by which its record finds its visit: decisions need the row */
    int variable, participant; /* NOWHERE: a window's, or an identifier that the first file has not */
    enum date_order order;
    enum date_reading reading;
    double day;
};

struct group { /* the cells of one column and site, where any of them does not read */
    const char *shared, *site;
    enum date_order order;
    struct cell *cells;
    size_t count, room;
};

struct dating { /* a run of these checks */
    struct finding *finding;
    const struct frame *frame;
    const struct dates *dates;
    struct map order; /* column and site to the order in force */
    struct map keys;  /* the same to the group */
    struct group *groups;
    size_t group_count, group_room;
    bool collecting;
    bool *reported; /* [variables * participants] asked about already */
};

static bool is_blank(const char *text) {
    return text[strspn(text, " \t\r\n\f\v")] == '\0';
}

static const char *day_words(struct dating *dating, double day) {
    return date_words(dating->finding->arena, day);
}

/* Column and site as one text, in `room` unless it is too long for it. */
static const char *key_of(struct dating *dating, const char *column, const char *site, char *room, size_t size) {
    int length = snprintf(room, size, "%s\x1f%s", column, site ? site : "");
    return length >= 0 && (size_t)length < size
               ? room
               : arena_format(dating->finding->arena, "%s\x1f%s", column, site ? site : "");
}

static bool is_missing_code(const struct frame *frame, const char *name, const char *text) {
    for (size_t i = 0; i < frame->version; i++) {
        const struct decision *decision = &frame->decisions[i];
        if (frame->stands[i] && decision->kind == DECISION_MISSING_CODE && plan_covers(decision->column, name) &&
            strcmp(decision->value, text) == 0) {
            return true;
        }
    }
    return false;
}

static void future_or_early(struct dating *dating, const struct cell *cell);

static void note_group(struct dating *dating, const struct cell *cell, const char *key) {
    if (map_get(&dating->keys, key) != NOWHERE) {
        return;
    }
    if (dating->group_count == dating->group_room) {
        dating->group_room = dating->group_room ? 2 * dating->group_room : 16;
        dating->groups = memory_grow(dating->groups, dating->group_room, sizeof *dating->groups);
    }
    map_put(&dating->keys, arena_text(dating->finding->arena, key), (int32_t)dating->group_count);
    dating->groups[dating->group_count++] =
        (struct group){.shared = cell->shared, .site = cell->site, .order = cell->order};
}

/* One cell with a text: read, looked at by itself where it reads, else noted for its group. */
static void take_cell(struct dating *dating, struct cell *cell) {
    cell->reading = date_read(cell->text, cell->order, &cell->day);
    char room[256];
    const char *key = key_of(dating, cell->shared, cell->site, room, sizeof room);
    bool bad = cell->reading != DATE_READ && !is_missing_code(dating->frame, cell->name, cell->text);
    if (!dating->collecting) {
        if (cell->reading == DATE_READ) {
            future_or_early(dating, cell);
        } else if (bad) {
            note_group(dating, cell, key);
        }
        return;
    }
    int32_t found = bad || cell->reading == DATE_READ ? map_get(&dating->keys, key) : NOWHERE;
    struct group *group = found == NOWHERE ? NULL : &dating->groups[found];
    if (group && group->count == group->room) {
        group->room = group->room ? 2 * group->room : 16;
        group->cells = memory_grow(group->cells, group->room, sizeof *group->cells);
    }
    if (group) {
        group->cells[group->count++] = *cell;
    }
}

/* The order in force for a column and site, looked up once. */
static enum date_order order_of(struct dating *dating, const struct cell *cell, size_t file) {
    char room[256];
    const char *key = key_of(dating, cell->name, cell->site, room, sizeof room);
    int32_t known = map_get(&dating->order, key);
    return (enum date_order)(known != NOWHERE
                                 ? known
                                 : map_put(&dating->order, arena_text(dating->finding->arena, key),
                                       (int32_t)frame_date_order(dating->frame, cell->name, file, cell->site)));
}

static bool is_window(const struct frame *frame, const struct place *place) {
    const char *window = frame->plan->files[place->file].window;
    return window && strcmp(window, place->column) == 0;
}

static void each_of_variable(struct dating *dating, size_t v) {
    const struct frame *frame = dating->frame;
    const struct variable *variable = &frame->plan->variables[v];
    const struct column *column = frame->columns[v];
    const char *shared =
        plan_column_name(dating->finding->arena, frame->plan, variable->place.file, variable->place.column);
    for (size_t p = 0; p < frame->participant_count; p++) {
        const char *text = frame_text(frame, column, p);
        if (!text || is_blank(text)) {
            continue;
        }
        struct cell cell = {.column = column,
            .name = variable->column,
            .shared = shared,
            .text = text,
            .site = frame_site(frame, p),
            .id = frame->participants[p].id,
            .label = variable->label,
            .record = frame_place(frame, column, p),
            .variable = (int)v,
            .participant = (int)p};
        cell.order = order_of(dating, &cell, variable->place.file);
        take_cell(dating, &cell);
    }
}

static void each_of_window(struct dating *dating, size_t f) {
    const struct frame *frame = dating->frame;
    const struct plan_file *file = &frame->plan->files[f];
    for (size_t r = 0; r < frame->cells[f].records; r++) {
        const char *text = column_text(frame, frame->windows[f], r), *id = column_text(frame, frame->identifiers[f], r);
        if (!text || is_blank(text) || !id || is_blank(id)) {
            continue;
        }
        int who = frame->owner[f][r];
        struct cell cell = {.column = frame->windows[f],
            .name = file->window_name,
            .shared = file->window_name,
            .text = text,
            .id = id,
            .site = who == NOWHERE ? NULL : frame_site(frame, (size_t)who),
            .label = "The date",
            .record = r,
            .by_window = true,
            .variable = NOWHERE,
            .participant = who};
        cell.order = order_of(dating, &cell, f);
        take_cell(dating, &cell);
    }
}

static void each_cell(struct dating *dating) {
    const struct plan *plan = dating->frame->plan;
    for (size_t v = 0; v < plan->variable_count; v++) {
        if (plan->variables[v].kind == VARIABLE_DATE && !is_window(dating->frame, &plan->variables[v].place)) {
            each_of_variable(dating, v);
        }
    }
    for (size_t f = 0; f < plan->file_count; f++) {
        if (plan->files[f].window) {
            each_of_window(dating, f);
        }
    }
}

/* ---- what is found of one cell ---- */

static struct discrepancy *of_cell(struct dating *dating, const char *check, const struct cell *cell) {
    struct finding *finding = dating->finding;
    const char *what =
        cell->by_window ? arena_format(finding->arena, "%s/record %zu", cell->id, cell->record + 1) : cell->id;
    struct discrepancy *new = finding_add(finding, check, cell->name, what);
    finding_concerns(finding, new, cell->id);
    new->value = cell->text;
    if (cell->by_window) {
        unsigned *rows = ARENA_NEW(finding->arena, 1, unsigned);
        rows[0] = (unsigned)cell->record + 1;
        new->rows = rows;
        new->row_count = 1;
        new->file = dating->frame->plan->files[cell->column->file].id;
    }
    return new;
}

/* "Date of 26 weeks of Q1032", "The date of Q1032 (visits, record 17)". */
static const char *whose(struct dating *dating, const struct cell *cell) {
    struct arena *arena = dating->finding->arena;
    return cell->by_window ? arena_format(arena, "%s of %s (%s, record %zu)", cell->label, cell->id,
                                 dating->frame->plan->files[cell->column->file].id, cell->record + 1)
                           : arena_format(arena, "%s of %s", cell->label, cell->id);
}

static void propose_day(struct dating *dating, struct discrepancy *what, const struct cell *cell, double day) {
    const char *to = day_words(dating, day);
    const char *const fields[][2] = {
        {"column", cell->name}, {"participant", cell->id}, {"from", cell->text}, {"to", to}};
    what->proposal =
        finding_proposal(dating->finding, "correct", fields, 4, cell->by_window ? (uint32_t)cell->record + 1 : 0);
    what->proposal_words = arena_format(dating->finding->arena, "Correct it to %s", to);
}

static void future_or_early(struct dating *dating, const struct cell *cell) {
    struct arena *arena = dating->finding->arena;
    if (cell->day > dating->dates->received) {
        struct discrepancy *new = of_cell(dating, "date-in-the-future", cell);
        new->message = arena_format(arena, "%s is %s, after the day the data were received (%s).", whose(dating, cell),
            day_words(dating, cell->day), day_words(dating, dating->dates->received));
    } else if (cell->day < dating->dates->earliest) {
        struct discrepancy *new = of_cell(dating, "date-too-early", cell);
        new->message = arena_format(arena, "%s is %s, before the earliest day the plan allows (%s).",
            whose(dating, cell), day_words(dating, cell->day), day_words(dating, dating->dates->earliest));
    } else {
        return;
    }
    if (cell->variable != NOWHERE && cell->participant != NOWHERE) {
        dating->reported[(size_t)cell->variable * dating->frame->participant_count + (size_t)cell->participant] = true;
    }
}

static bool is_short(enum date_order order) {
    return order >= DATE_DMYY && order <= DATE_DMONYY;
}

static enum date_order short_of(enum date_order order) {
    return order <= DATE_DMONY ? (enum date_order)(order + DATE_DMYY) : order;
}

static bool is_serial(enum date_order order) {
    return order == DATE_SERIAL_1900 || order == DATE_SERIAL_1904;
}

/* The one day that orders other than its own give the text, with four-digit years; NaN where none or several. */
static double other_day(const struct cell *cell, enum date_order *by) {
    double found = (double)NAN;
    for (int order = 0; order <= DATE_DMONY; order++) {
        double day;
        if (date_read(cell->text, (enum date_order)order, &day) != DATE_READ) {
            continue;
        }
        if (!isnan(found) && (found < day || found > day)) {
            return (double)NAN;
        }
        found = day;
        *by = (enum date_order)order;
    }
    return found;
}

static void bad_cell(struct dating *dating, const struct cell *cell) {
    struct arena *arena = dating->finding->arena;
    enum date_order by = cell->order;
    double day = (double)NAN, number = (double)NAN;
    const char *who = whose(dating, cell), *name = date_order_name(cell->order);
    if (cell->reading == DATE_SERIAL) {
        date_read(cell->text, DATE_SERIAL_1904, &number);
        date_read(cell->text, DATE_SERIAL_1900, &day);
        struct discrepancy *new = of_cell(dating, "serial-number-date", cell);
        new->message = arena_format(arena,
            "%s reads %s, no date but the number that a spreadsheet counts days by: %s in the system from 1900, "
            "%s in that from 1904.",
            who, cell->text, day_words(dating, day), day_words(dating, number));
        propose_day(dating, new, cell, day);
        return;
    }
    if (cell->reading == DATE_SHORT_YEAR) {
        date_read(cell->text, short_of(cell->order), &day);
        struct discrepancy *new = of_cell(dating, "two-digit-year", cell);
        new->message = arena_format(arena, "%s reads \"%s\", with a year of two digits; as %s it would be %s.", who,
            cell->text, name, day_words(dating, day));
        propose_day(dating, new, cell, day);
        return;
    }
    day = other_day(cell, &by);
    struct discrepancy *new =
        of_cell(dating, cell->reading == DATE_IMPOSSIBLE ? "impossible-date" : "unreadable-date", cell);
    new->message =
        !isnan(day) ? arena_format(arena, "%s reads \"%s\", which %s as %s; as %s it is %s.", who, cell->text,
                          cell->reading == DATE_IMPOSSIBLE ? "is no day" : "cannot be read", name, date_order_name(by),
                          day_words(dating, day))
        : cell->reading == DATE_IMPOSSIBLE
            ? arena_format(arena, "%s reads \"%s\", and there is no such day.", who, cell->text)
            : arena_format(arena, "%s reads \"%s\", which is no date in the order %s.", who, cell->text, name);
    if (!isnan(day)) {
        propose_day(dating, new, cell, day);
    }
}

/* ---- what is found of a column and site together ---- */

static bool reads_in_any(const struct cell *cell) {
    for (int order = 0; order < DATE_ORDER_COUNT; order++) {
        if (date_read(cell->text, (enum date_order)order, NULL) == DATE_READ) {
            return true;
        }
    }
    return false;
}

static bool reads_in(const struct cell *cell, enum date_order order) {
    return date_read(cell->text, order, NULL) == DATE_READ;
}

/* The order in which all texts of a group but those no order reads are dates; the present one where there is none;
 * `other`: another one that does as well and gives other days. */
static enum date_order common_order(const struct group *group, enum date_order *other) {
    bool fits[DATE_ORDER_COUNT];
    size_t texts = 0, bad = 0;
    for (int o = 0; o < DATE_ORDER_COUNT; o++) {
        fits[o] = o != (int)group->order;
    }
    for (size_t i = 0; i < group->count; i++) {
        const struct cell *cell = &group->cells[i];
        if (date_is_iso(cell->text) || !reads_in_any(cell)) {
            continue;
        }
        texts++;
        bad += cell->reading != DATE_READ;
        for (int o = 0; o < DATE_ORDER_COUNT; o++) {
            fits[o] = fits[o] && reads_in(cell, (enum date_order)o);
        }
    }
    enum date_order found = group->order;
    *other = group->order;
    if (texts < 2 || bad == 0) {
        return found;
    }
    if (short_of(group->order) != group->order && fits[short_of(group->order)]) {
        return short_of(group->order);
    }
    for (int o = DATE_SERIAL_1900; o >= 0; o--) { /* the first of the table stays */
        bool with_four = is_short((enum date_order)o) && fits[o - DATE_DMYY];
        if (fits[o] && !with_four) {
            *other = found;
            found = (enum date_order)o;
        }
    }
    return found;
}

static int by_index(const void *a, const void *b) {
    const char *const *x = a, *const *y = b;
    return strcmp(*x, *y);
}

/* A discrepancy about every cell of the group that `holds` picks, its participants once each in identifier order. */
static struct discrepancy *of_group(
    struct dating *dating, const char *check, const struct group *group, const bool *holds) {
    struct finding *finding = dating->finding;
    struct discrepancy *new = finding_add(
        finding, check, group->shared, group->site ? arena_format(finding->arena, "site %s", group->site) : "all");
    const char **list = ARENA_NEW(finding->arena, group->count, const char *);
    size_t count = 0, kept = 0;
    for (size_t i = 0; i < group->count; i++) {
        if (holds[i] && group->cells[i].participant != NOWHERE) {
            list[count++] = group->cells[i].id;
        }
    }
    if (count) {
        qsort(list, count, sizeof *list, by_index);
    }
    for (size_t i = 0; i < count; i++) {
        if (i == 0 || strcmp(list[kept - 1], list[i]) != 0) {
            list[kept++] = list[i];
        }
    }
    new->participants = list;
    new->participant_count = kept;
    return new;
}

static void propose_order(
    struct dating *dating, struct discrepancy *what, const struct group *group, enum date_order order) {
    struct arena *arena = dating->finding->arena;
    if (!group->site && dating->frame->plan->site_column) {
        return; /* of nobody in the first file: an order without a site would be that of all */
    }
    const char *const fields[][2] = {
        {"column", group->shared}, {"order", date_order_name(order)}, {"site", group->site}};
    what->proposal = finding_proposal(dating->finding, "date-order", fields, group->site ? 3 : 2, 0);
    what->proposal_words =
        group->site ? arena_format(arena, "Read the dates of site %s in %s as %s", group->site, group->shared,
                          date_order_name(order))
                    : arena_format(arena, "Read the dates in %s as %s", group->shared, date_order_name(order));
}

static const char *where_words(struct dating *dating, const struct group *group) {
    struct arena *arena = dating->finding->arena;
    return !group->site   ? group->shared
           : *group->site ? arena_format(arena, "Site %s, %s", group->site, group->shared)
                          : arena_format(arena, "Without a site, %s", group->shared);
}

/* One discrepancy for all of them; false where there is no one order. */
static bool one_order(struct dating *dating, const struct group *group) {
    enum date_order other, order = common_order(group, &other);
    if (order == group->order) {
        return false;
    }
    struct arena *arena = dating->finding->arena;
    bool *holds = ARENA_NEW(arena, group->count, bool);
    size_t texts = 0, bad = 0;
    for (size_t i = 0; i < group->count; i++) {
        const struct cell *cell = &group->cells[i];
        holds[i] = !date_is_iso(cell->text) && reads_in(cell, order);
        texts += holds[i];
        bad += holds[i] && cell->reading != DATE_READ;
    }
    bool short_year = order == short_of(group->order);
    struct discrepancy *new = of_group(dating,
        is_serial(order) ? "serial-number-date"
        : short_year     ? "two-digit-year"
                         : "date-order",
        group, holds);
    const char *how_many =
        bad == texts ? arena_format(arena, "%zu", texts) : arena_format(arena, "%zu of %zu", bad, texts);
    const char *doubt = other == group->order || is_serial(order)
                            ? ""
                            : arena_format(arena, ", and so do they as %s: ask the site", date_order_name(other));
    new->message = is_serial(order) ? arena_format(arena,
                                          "%s: %zu dates are numbers that a spreadsheet counts days by, from 1900 (or "
                                          "from 1904: then 1,462 days later).",
                                          where_words(dating, group), texts)
                   : short_year
                       ? arena_format(arena,
                             "%s: %s dates have a year of two digits; 69 to 99 would be the 1900s, 00 to 68 the 2000s.",
                             where_words(dating, group), how_many)
                       : arena_format(arena, "%s: %s dates cannot be read as %s; all of them read as %s (%s)%s.",
                             where_words(dating, group), how_many, date_order_name(group->order),
                             date_order_name(order), date_order_words(order), doubt);
    if (!*doubt) {
        propose_order(dating, new, group, order);
    }
    return true;
}

/* ---- each participant's dates against each other ---- */

/* Whether moment a can never come after moment b. */
static bool must_precede(const struct dates *dates, size_t a, size_t b) {
    const struct moment *first = &dates->moments[a], *second = &dates->moments[b];
    if (a == b || first->kind == MOMENT_DIED) {
        return false;
    }
    switch (second->kind) {
    case MOMENT_RANDOMISED:
        return false;
    case MOMENT_VISIT: /* one planned on or before the day of randomisation may come before it */
        return (first->kind == MOMENT_RANDOMISED && !(second->target <= 0)) || (first->kind == MOMENT_VISIT && a < b);
    case MOMENT_STOPPED:
        return first->kind == MOMENT_RANDOMISED;
    case MOMENT_WITHDREW:
        return first->kind == MOMENT_RANDOMISED || first->kind == MOMENT_VISIT;
    case MOMENT_DIED:
        return true;
    }
    return false;
}

struct course { /* one participant's dates */
    size_t participant;
    double *day;   /* [moments] NaN where missing or out of consideration */
    double *other; /* [moments] day and month exchanged, NaN where there is no such reading */
};

/* How many other dates one is on the wrong side of, were it `day`; the last such. */
static size_t conflicts(const struct dates *dates, const struct course *course, size_t m, double day, size_t *with) {
    size_t count = 0;
    for (size_t i = 0; i < dates->moment_count; i++) {
        bool wrong =
            (must_precede(dates, i, m) && course->day[i] > day) || (must_precede(dates, m, i) && day > course->day[i]);
        if (wrong) {
            count++;
            *with = i;
        }
    }
    return count;
}

static bool outside(const struct dates *dates, const struct course *course, size_t m, double day) {
    const struct moment *moment = &dates->moments[m];
    double off = dates->randomised == NOWHERE ? (double)NAN : day - course->day[dates->randomised] - moment->target;
    return moment->kind == MOMENT_VISIT && moment->window.given &&
           (off < moment->window.low || off > moment->window.high);
}

/* Whether a date, were it `day`, would be in order and leave no visit that hangs on it outside its window. */
static bool sits(const struct dates *dates, struct course *course, size_t m, double day) {
    double kept = course->day[m];
    size_t with = m;
    bool fits = conflicts(dates, course, m, day, &with) == 0;
    course->day[m] = day;
    for (size_t i = 0; i < dates->moment_count && fits; i++) {
        bool hangs = i == m || (int)m == dates->randomised;
        fits = !hangs || !outside(dates, course, i, course->day[i]);
    }
    course->day[m] = kept;
    return fits;
}

static struct cell cell_of_moment(struct dating *dating, size_t p, size_t m) {
    const struct frame *frame = dating->frame;
    int v = dating->dates->moments[m].variable;
    const struct variable *variable = &frame->plan->variables[v];
    struct cell cell = {.column = frame->columns[v],
        .name = variable->column,
        .text = frame_text(frame, frame->columns[v], p),
        .site = frame_site(frame, p),
        .id = frame->participants[p].id,
        .label = variable->label,
        .record = frame_place(frame, frame->columns[v], p),
        .variable = v,
        .participant = (int)p};
    cell.shared =
        is_window(frame, &variable->place) ? frame->plan->files[variable->place.file].window_name : variable->column;
    cell.day = frame->columns[v]->number[p];
    return cell;
}

/* As the decision that corrects it must name it. */
static void propose_for_moment(struct dating *dating, struct discrepancy *what, struct cell cell, double day) {
    cell.by_window = cell.shared != cell.name;
    cell.name = cell.shared;
    propose_day(dating, what, &cell, day);
}

static void take_course(struct dating *dating, struct course *course, size_t p) {
    course->participant = p;
    for (size_t m = 0; m < dating->dates->moment_count; m++) {
        struct cell cell = cell_of_moment(dating, p, m);
        course->day[m] = cell.day;
        course->other[m] = (double)NAN;
        if (!isnan(cell.day)) {
            size_t file = dating->frame->plan->variables[cell.variable].place.file;
            date_read_exchanged(cell.text, order_of(dating, &cell, file), &course->other[m]);
            bool reported = dating->reported[(size_t)cell.variable * dating->frame->participant_count + p];
            course->day[m] = reported ? (double)NAN : course->day[m];
        }
    }
}

/* A date out of order, or outside its window, whose exchanged reading would be in order and inside: read wrongly, it
 * seems. */
static void exchange(struct dating *dating, struct course *course) {
    const struct dates *dates = dating->dates;
    for (size_t m = 0; m < dates->moment_count; m++) {
        size_t with = m, now = conflicts(dates, course, m, course->day[m], &with);
        if (isnan(course->other[m]) || isnan(course->day[m]) || sits(dates, course, m, course->day[m]) ||
            !sits(dates, course, m, course->other[m]) || course->other[m] > dates->received ||
            course->other[m] < dates->earliest) {
            continue;
        }
        struct cell cell = cell_of_moment(dating, course->participant, m);
        struct discrepancy *new = of_cell(dating, "ambiguous-date", &cell);
        const char *read = day_words(dating, course->day[m]), *other = day_words(dating, course->other[m]);
        new->message =
            now ? arena_format(dating->finding->arena,
                      "%s reads \"%s\", taken as %s, which is out of order with %s (%s); with day and month exchanged "
                      "it is %s, which is in order.",
                      whose(dating, &cell), cell.text, read, dates->moments[with].label,
                      day_words(dating, course->day[with]), other)
                : arena_format(dating->finding->arena,
                      "%s reads \"%s\", taken as %s, which is outside %s window; with day and month exchanged it is "
                      "%s, "
                      "inside.",
                      whose(dating, &cell), cell.text, read, (int)m == dates->randomised ? "a visit's" : "the visit's",
                      other);
        propose_for_moment(dating, new, cell, course->other[m]);
        course->day[m] = course->other[m];
    }
}

static void out_of_order(struct dating *dating, struct course *course) {
    const struct dates *dates = dating->dates;
    for (;;) { /* whichever is on the wrong side of most others is asked about, then left out: one slip is one question
                */
        size_t worst = 0, most = 0, with = 0;
        for (size_t m = 0; m < dates->moment_count; m++) {
            size_t other = m, count = conflicts(dates, course, m, course->day[m], &other);
            bool visit = dates->moments[m].kind == MOMENT_VISIT,
                 worst_visit = dates->moments[worst].kind == MOMENT_VISIT;
            if (count > most || (count && count == most && (visit || !worst_visit))) {
                worst = m;
                most = count;
                with = other;
            }
        }
        if (!most) {
            return;
        }
        struct cell cell = cell_of_moment(dating, course->participant, worst);
        struct discrepancy *new = of_cell(dating, "dates-out-of-order", &cell);
        new->message = arena_format(dating->finding->arena, "%s is %s, %s \"%s\" (%s), which must come %s.",
            whose(dating, &cell), day_words(dating, course->day[worst]),
            must_precede(dates, with, worst) ? "before" : "after", dates->moments[with].label,
            day_words(dating, course->day[with]), must_precede(dates, with, worst) ? "first" : "later");
        course->day[worst] = (double)NAN;
    }
}

static void out_of_window(struct dating *dating, const struct course *course) {
    const struct dates *dates = dating->dates;
    for (size_t m = 0; m < dates->moment_count; m++) {
        if (!outside(dates, course, m, course->day[m])) {
            continue;
        }
        const struct moment *moment = &dates->moments[m];
        double days = course->day[m] - course->day[dates->randomised], off = days - moment->target;
        struct cell cell = cell_of_moment(dating, course->participant, m);
        struct discrepancy *new = of_cell(dating, "outside-window", &cell);
        new->message = arena_format(dating->finding->arena,
            "%s is %s, day %.0f after randomisation, %.0f days %s the planned day %.0f; the window is "
            "%.0f to %.0f.",
            whose(dating, &cell), day_words(dating, course->day[m]), days, fabs(off), off < 0 ? "before" : "after",
            moment->target, moment->target + moment->window.low, moment->target + moment->window.high);
    }
}

static void check_courses(struct dating *dating) {
    const struct frame *frame = dating->frame;
    struct course course = {.day = ARENA_NEW(dating->finding->arena, dating->dates->moment_count, double),
        .other = ARENA_NEW(dating->finding->arena, dating->dates->moment_count, double)};
    for (size_t p = 0; p < frame->participant_count; p++) {
        take_course(dating, &course, p);
        exchange(dating, &course);
        out_of_order(dating, &course);
        out_of_window(dating, &course);
    }
}

/* Records of a file whose visits are found by date that are in no window. */
static void check_windows(struct dating *dating) {
    const struct frame *frame = dating->frame;
    const struct dates *dates = dating->dates;
    for (size_t f = 0; f < frame->plan->file_count; f++) {
        if (!frame->plan->files[f].window || frame->joins[f].unplanned == 0) {
            continue;
        }
        const double *randomised = frame->columns[dates->moments[dates->randomised].variable]->number;
        for (size_t r = 0; r < frame->cells[f].records; r++) {
            const char *id = column_text(frame, frame->identifiers[f], r),
                       *text = column_text(frame, frame->windows[f], r);
            int who = frame->owner[f][r];
            struct cell cell = {.column = frame->windows[f],
                .name = frame->plan->files[f].window_name,
                .text = text,
                .id = id,
                .label = "The date",
                .record = r,
                .by_window = true,
                .variable = NOWHERE,
                .participant = who};
            cell.site = who == NOWHERE ? NULL : frame_site(frame, (size_t)who);
            double days = (double)NAN;
            if (who != NOWHERE && text && date_read(text, order_of(dating, &cell, f), &cell.day) == DATE_READ) {
                days = cell.day - randomised[who];
            }
            if (!isnan(days) && dates_visit_by_window(frame->plan, f, days, NULL) == NOWHERE) {
                struct discrepancy *new = of_cell(dating, "outside-window", &cell);
                new->message = arena_format(dating->finding->arena,
                    "%s is %s, day %.0f after randomisation, in no visit's window; what the record "
                    "says is in no analysis, and counted.",
                    whose(dating, &cell), day_words(dating, cell.day), days);
            }
        }
    }
}

/* ---- a column or site where orders are mixed: what reads two ways is in doubt ---- */

static bool decided(const struct frame *frame, const struct group *group) {
    for (size_t i = 0; i < frame->version; i++) {
        const struct decision *decision = &frame->decisions[i];
        bool about =
            frame->stands[i] && decision->kind == DECISION_DATE_ORDER && plan_covers(decision->column, group->shared);
        if (about && (!decision->site || (group->site && strcmp(decision->site, group->site) == 0))) {
            return true;
        }
    }
    return false;
}

/* Whether its other reading is as good: the participant's other dates do not speak against it. */
static bool reads_two_ways(struct dating *dating, const struct cell *cell) {
    const struct dates *dates = dating->dates;
    double other;
    if (cell->reading != DATE_READ || !date_read_exchanged(cell->text, cell->order, &other) ||
        other > dates->received || other < dates->earliest) {
        return false;
    }
    int m = cell->variable == NOWHERE ? NOWHERE : dating->frame->plan->variables[cell->variable].moment;
    if (m == NOWHERE) {
        return true;
    }
    struct course course = {.day = ARENA_NEW(dating->finding->arena, dates->moment_count, double),
        .other = ARENA_NEW(dating->finding->arena, dates->moment_count, double)};
    take_course(dating, &course, (size_t)cell->participant);
    return sits(dates, &course, (size_t)m, cell->day) && sits(dates, &course, (size_t)m, other);
}

static void mixed_orders(struct dating *dating, const struct group *group) {
    enum date_order exchanged = group->order == DATE_DMY ? DATE_MDY : DATE_DMY;
    if ((group->order != DATE_DMY && group->order != DATE_MDY) || decided(dating->frame, group)) {
        return;
    }
    bool *holds = ARENA_NEW(dating->finding->arena, group->count, bool);
    size_t bad = 0, doubtful = 0;
    for (size_t i = 0; i < group->count; i++) {
        bad += group->cells[i].reading == DATE_IMPOSSIBLE && reads_in(&group->cells[i], exchanged);
    }
    for (size_t i = 0; bad && i < group->count; i++) {
        holds[i] = reads_two_ways(dating, &group->cells[i]);
        doubtful += holds[i];
    }
    if (!doubtful) {
        return;
    }
    struct discrepancy *new = of_group(dating, "ambiguous-date", group, holds);
    new->message = arena_format(dating->finding->arena,
        "%s: %zu date%s read%s only as %s where the order is %s, so %zu other%s, with day and month up to "
        "12, can be read two ways; %s read as %s.",
        where_words(dating, group), bad, bad == 1 ? "" : "s", bad == 1 ? "s" : "", date_order_name(exchanged),
        date_order_name(group->order), doubtful, doubtful == 1 ? "" : "s", doubtful == 1 ? "it is" : "they are",
        date_order_name(group->order));
    propose_order(dating, new, group, group->order);
}

void check_dates(struct finding *finding) {
    const struct frame *frame = finding->frame;
    if (!frame->plan->dates) {
        return;
    }
    struct dating dating = {.finding = finding, .frame = frame, .dates = frame->plan->dates};
    dating.reported = ARENA_NEW(finding->arena, frame->plan->variable_count * frame->participant_count, bool);
    map_init(&dating.order);
    map_init(&dating.keys);
    each_cell(&dating);
    dating.collecting = true;
    if (dating.group_count) {
        each_cell(&dating);
    }
    for (size_t g = 0; g < dating.group_count; g++) {
        const struct group *group = &dating.groups[g];
        bool together = one_order(&dating, group);
        enum date_order unused, order = common_order(group, &unused);
        for (size_t i = 0; i < group->count; i++) {
            bool asked = together && reads_in(&group->cells[i], order);
            if (group->cells[i].reading != DATE_READ && !asked) {
                bad_cell(&dating, &group->cells[i]);
            }
        }
        if (!together) {
            mixed_orders(&dating, group);
        }
    }
    check_courses(&dating);
    check_windows(&dating);
    for (size_t g = 0; g < dating.group_count; g++) {
        memory_free(dating.groups[g].cells);
    }
    memory_free(dating.groups);
    map_release(&dating.order);
    map_release(&dating.keys);
}
