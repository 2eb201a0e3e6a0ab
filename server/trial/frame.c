/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "trial/frame.h"
#include "base/map.h"
#include "intake/number.h"
#include "trial/arms.h"
#include "trial/convert.h"
#include "trial/derived.h"
#include <math.h>
#include <stdlib.h>
#include <string.h>

static const struct {
    const char *name, *words;
} states[CELL_STATE_COUNT] = {
    [CELL_OBSERVED] = {"observed", "observed"},
    [CELL_BLANK] = {"blank", "blank"},
    [CELL_MISSING_CODE] = {"missing-code", "code for missing"},
    [CELL_UNREADABLE] = {"unreadable", "unreadable"},
    [CELL_BELOW_LIMIT] = {"below-limit", "below the limit"},
    [CELL_ABOVE_LIMIT] = {"above-limit", "above the limit"},
    [CELL_SET_MISSING] = {"set-missing", "set missing"},
    [CELL_AFTER_EVENT] = {"after-event", "after an event"},
    [CELL_HELD_ASIDE] = {"held-aside", "record held aside"},
};

const char *cell_state_name(enum cell_state state) {
    return states[state].name;
}

const char *cell_state_words(enum cell_state state) {
    return states[state].words;
}

/* What a frame is built from, and what is known on the way. */
struct build {
    struct frame *frame;
    const struct frame *previous; /* NULL: nothing is shared */
    const struct frame *lender;   /* previous where it is of the same plan: its columns mean the same; else NULL */
    bool check;                   /* hold decisions beyond previous->version against the data */
    size_t count;                 /* decisions */
    bool *stands;
    struct fault *fault;
};

/* ---- refusing a new decision ---- */

static bool is_new(const struct build *build, size_t i) {
    return build->check && i >= build->previous->version;
}

static bool refuse(struct build *build, size_t i, const char *what) {
    size_t entry = i + 1 - build->previous->version;
    return fault_at(build->fault, FAULT_INPUT, entry, 0, "decision %zu of the batch (%s) %s; nothing was recorded", entry,
        decision_rules[build->frame->decisions[i].kind].name, what);
}

/* While blinded, whether one participant's arm reads so or so must not be found out by trying. */
static bool refuse_hidden(struct build *build, size_t i) {
    size_t entry = i + 1 - build->previous->version;
    return fault_at(build->fault, FAULT_REFUSED, entry, 0,
        "decision %zu of the batch (%s) is about one participant's cell of %s, which is not shown while the study is %s; unblind it first; "
        "nothing was recorded", entry, decision_rules[build->frame->decisions[i].kind].name, build->frame->decisions[i].column,
        blinding_name(build->previous->blinding));
}

/* ---- the roster: participants in identifier order, and which record is in force ---- */

struct roster_row {
    const char *id;
    size_t record;
};

/* The participant whom a decision means by an identifier that may have been corrected since. */
static int participant_meant(const struct build *build, size_t i) {
    const struct frame *frame = build->frame;
    const char *name = frame->decisions[i].participant;
    int who = frame_participant(frame, name);
    for (size_t j = i + 1; who == NOWHERE && j < build->count; j++) {
        const struct decision *later = &frame->decisions[j];
        bool renames = later->kind == DECISION_READ_AS || later->kind == DECISION_CORRECT;
        if (build->stands[j] && renames && strcmp(later->column, frame->plan->participant) == 0 && later->from &&
            strcmp(later->from, name) == 0) {
            name = later->to;
            who = frame_participant(frame, name);
        }
    }
    return who;
}

static int by_id_then_record(const void *a, const void *b) {
    const struct roster_row *x = a, *y = b;
    int order = strcmp(x->id, y->id);
    return order ? order : (x->record > y->record) - (x->record < y->record);
}

static bool is_blank(const char *text) {
    return text[strspn(text, " \t\r\n\f\v")] == '\0';
}

static void build_roster(struct build *build) {
    struct frame *frame = build->frame;
    bool by_visit = frame->plan->files[0].by_visit;
    size_t records = frame->cells->records, used = 0;
    struct roster_row *rows = memory_new(records, sizeof *rows);
    for (size_t r = 0; r < records; r++) {
        const char *id = column_text(frame, frame->identifier, r);
        if (id && !is_blank(id)) {
            rows[used++] = (struct roster_row){id, r};
        }
    }
    frame->held_aside = records - used;
    bool sorted = true;
    for (size_t i = 1; i < used && sorted; i++) {
        sorted = by_id_then_record(&rows[i - 1], &rows[i]) < 0;
    }
    if (!sorted) {
        qsort(rows, used, sizeof *rows, by_id_then_record);
    }
    frame->participants = ARENA_NEW(&frame->arena, used, struct participant);
    frame->order = ARENA_NEW(&frame->arena, used, size_t);
    for (size_t i = 0; i < used; i++) {
        struct participant *last = frame->participant_count ? &frame->participants[frame->participant_count - 1] : NULL;
        frame->order[i] = rows[i].record;
        if (last && strcmp(last->id, rows[i].id) == 0) {
            last->total++;
            if (by_visit) {
                continue; /* rows of one participant are visits, not repetitions */
            }
            last->record_count++;
            last->record = NO_RECORD;
        } else {
            frame->participants[frame->participant_count++] = (struct participant){.id = rows[i].id, .record = rows[i].record,
                .record_count = 1, .first = i, .total = 1};
        }
    }
    memory_free(rows);
    frame->roster = by_visit ? frame->participant_count + frame->held_aside : records;
    for (size_t i = 0; i < frame->participant_count; i++) {
        frame->held_aside += frame->participants[i].record_count > 1 ? frame->participants[i].record_count : 0;
    }
}

/* keep-record: one of a repeated participant's records stands. */
static bool apply_keep(struct build *build, size_t i) {
    struct frame *frame = build->frame;
    const struct decision *decision = &frame->decisions[i];
    int who = frame_participant(frame, decision->participant);
    size_t record = decision->row - 1;
    const char *there = record < frame->cells->records ? column_text(frame, frame->identifier, record) : NULL;
    if (is_new(build, i) && (who == NOWHERE || !there || strcmp(there, decision->participant) != 0)) {
        return refuse(build, i,
            who == NOWHERE ? "names a participant who is not in the file" : "names a row that is not one of the participant's records");
    }
    /* An identifier corrected since goes on pointing at the same record. */
    who = there ? frame_participant(frame, there) : NOWHERE;
    if (who == NOWHERE) {
        return true;
    }
    struct participant *participant = &frame->participants[who];
    if (participant->record == NO_RECORD) {
        frame->held_aside -= participant->record_count;
        frame->held_aside += participant->record_count - 1;
    }
    participant->record = record;
    return true;
}

int frame_participant(const struct frame *frame, const char *id) {
    size_t low = 0, high = frame->participant_count;
    while (low < high) {
        size_t middle = low + (high - low) / 2;
        int order = strcmp(frame->participants[middle].id, id);
        if (order == 0) {
            return (int)middle;
        }
        if (order < 0) {
            low = middle + 1;
        } else {
            high = middle;
        }
    }
    return NOWHERE;
}

size_t frame_records(const struct frame *frame, size_t participant, size_t *records, size_t room) {
    const struct participant *who = &frame->participants[participant];
    for (size_t i = 0; i < who->total && i < room; i++) {
        records[i] = frame->order[who->first + i];
    }
    return who->total;
}

size_t frame_slot_records(const struct frame *frame, size_t slot, size_t participant, size_t *records, size_t room) {
    size_t f = frame->plan->slots[slot].file, found = 0;
    if (!frame->owner[f]) {
        return frame_records(frame, participant, records, room);
    }
    for (size_t r = 0; r < frame->cells[f].records; r++) {
        if (frame->owner[f][r] == (int32_t)participant && frame_slot_of_record(frame, f, r) == slot) {
            if (found < room) {
                records[found] = r;
            }
            found++;
        }
    }
    return found;
}

/* ---- columns: replay of the decisions about them ---- */

/* Whether replay applies it to the column of that name. */
static bool about_column(const struct decision *decision, const char *name) {
    return decision->column && decision->kind <= DECISION_CONFIRM && plan_covers(decision->column, name);
}

/* Whether any decision about the column has come, gone or come back since the previous frame. */
static bool column_touched(const struct build *build, const char *name) {
    for (size_t i = 0; i < build->count; i++) {
        bool before = i < build->previous->version && build->previous->stands[i];
        if (before != build->stands[i] && about_column(&build->frame->decisions[i], name)) {
            return true;
        }
    }
    return false;
}

static bool roster_touched(const struct build *build) {
    for (size_t i = 0; i < build->count; i++) {
        bool before = i < build->previous->version && build->previous->stands[i];
        if (before != build->stands[i] && build->frame->decisions[i].kind == DECISION_KEEP_RECORD) {
            return true;
        }
    }
    return false;
}

static void put_cell(struct build *build, struct column *column, size_t record, const char *text, uint32_t number) {
    (void)build;
    size_t records = column->cells->records;
    if (!column->origin) {
        column->origin = ARENA_NEW(&column->arena, records, uint32_t);
        column->changed = ARENA_NEW(&column->arena, records, const char *);
        for (size_t r = 0; r < records; r++) {
            column->changed[r] = cells_at(column->cells, r, column->index);
        }
    }
    column->changed[record] = text;
    column->origin[record] = number;
}

static bool same_text(const char *a, const char *b) {
    return a && b ? strcmp(a, b) == 0 : a == b;
}

/* The visit's code that a decision on a column of a file with one row per visit is about; NULL: all. */
static const char *code_meant(const struct frame *frame, const struct decision *decision, const struct column *column) {
    bool texts = column->kind == VARIABLE_PARTICIPANT || column->kind == VARIABLE_VISIT;
    const char *code = texts ? NULL : frame->plan->slots[column->slot].code;
    size_t length = strlen(decision->column), tail = code ? strlen(code) : 0;
    bool said = code && length > tail && decision->column[length - tail - 1] == '@' && strcmp(decision->column + length - tail, code) == 0;
    return said ? code : NULL;
}

/* How many of the current texts that a decision is about read so. */
static size_t count_text(const struct build *build, const struct decision *decision, const struct column *column, const char *text) {
    const struct frame *frame = build->frame;
    const char *code = code_meant(frame, decision, column);
    size_t count = 0;
    for (size_t r = 0; r < column->cells->records; r++) {
        count += same_text(column_text(frame, column, r), text) &&
                 (!code || frame_slot_of_record(frame, column->file, r) == column->slot);
    }
    return count;
}

/* An identifier's own correction is addressed by the identifier as it reads at that point of the record. */
static size_t record_of_identifier(
    const struct frame *frame, const struct column *column, const char *id, const char **why) {
    size_t found = NO_RECORD;
    for (size_t r = 0; r < column->cells->records; r++) {
        if (same_text(column_text(frame, column, r), id) && found != NO_RECORD) {
            *why = "is about an identifier that several records bear; say which one with \"row\"";
            return NO_RECORD;
        }
        found = same_text(column_text(frame, column, r), id) ? r : found;
    }
    *why = "names a participant who is not in the file";
    return found;
}

/* The record a decision on one cell is about: its row, or the participant's record in force. NO_RECORD where unclear. */
static size_t record_meant(
    const struct build *build, const struct decision *decision, const struct column *column, const char **why) {
    const struct frame *frame = build->frame;
    const struct column *identifier = column->kind == VARIABLE_PARTICIPANT ? column : frame->identifiers[column->file];
    if (decision->row) {
        size_t record = decision->row - 1;
        *why = "names a row that is not one of the participant's records";
        bool new = is_new(build, (size_t)(decision - frame->decisions));
        bool fits = record < column->cells->records &&
                    (!new || same_text(column_text(frame, identifier, record), decision->participant));
        const char *code = code_meant(frame, decision, column);
        if (fits && new && code && frame_slot_of_record(frame, column->file, record) != column->slot) {
            *why = "names a row that is of another visit than the column says";
            return NO_RECORD;
        }
        return fits ? record : NO_RECORD;
    }
    if (column->kind == VARIABLE_PARTICIPANT) {
        return record_of_identifier(frame, column, decision->participant, why);
    }
    if (column == frame->windows[column->file]) { /* records have no place before their date is read */
        *why = "is about a date by which visits are found; say which record with \"row\"";
        return NO_RECORD;
    }
    int who = participant_meant(build, (size_t)(decision - frame->decisions));
    *why = who == NOWHERE ? "names a participant who is not in the file" :
                            "is about a participant with several records; say which one with \"row\", or keep one first";
    size_t record = who == NOWHERE ? NO_RECORD : frame_place(frame, column, (size_t)who);
    *why = who != NOWHERE && record == NO_RECORD ? "is about a visit of which the participant has no record" : *why;
    return record == HELD_RECORD ? NO_RECORD : record;
}

static bool from_differs(struct build *build, size_t i, const char *now) {
    const struct decision *decision = &build->frame->decisions[i];
    return refuse(build, i, arena_format(&build->frame->arena, "says %s of %s reads %s%.60s%s, but it now reads %s%.60s%s",
        decision->column, decision->participant, decision->from ? "\"" : "", decision->from ? decision->from : "nothing (set missing)",
        decision->from ? "\"" : "", now ? "\"" : "", now ? now : "nothing (set missing)", now ? "\"" : ""));
}

static bool apply_to_cell(struct build *build, size_t i, struct column *column) {
    const struct decision *decision = &build->frame->decisions[i];
    const char *why = NULL;
    if (is_new(build, i) && arms_hide_column(build->previous, decision->column)) {
        return refuse_hidden(build, i);
    }
    size_t record = record_meant(build, decision, column, &why);
    if (record == NO_RECORD) {
        return !is_new(build, i) || refuse(build, i, why);
    }
    if (decision->kind == DECISION_CONFIRM) {
        return !is_new(build, i) || same_text(column_text(build->frame, column, record), decision->value) ||
               refuse(build, i, "confirms a value that is not the text now current");
    }
    bool reads_so = same_text(column_text(build->frame, column, record), decision->from);
    if (is_new(build, i) && !reads_so) {
        return from_differs(build, i, column_text(build->frame, column, record));
    }
    if (!reads_so && !decision->row && build->frame->plan->files[column->file].window) {
        return true; /* a date corrected since has given the visit another record */
    }
    put_cell(build, column, record, decision->kind == DECISION_CORRECT ? decision->to : NULL, decision->number);
    return true;
}

static bool apply_read_as(struct build *build, size_t i, struct column *column) {
    const struct decision *decision = &build->frame->decisions[i];
    if (is_new(build, i) && count_text(build, decision, column, decision->from) == 0) {
        return refuse(build, i, "reads a code as another, but no value of the column now reads so");
    }
    for (size_t r = 0; r < column->cells->records; r++) {
        if (same_text(column_text(build->frame, column, r), decision->from)) {
            put_cell(build, column, r, decision->to, decision->number);
        }
    }
    return true;
}

/* Applies every standing decision about the column to its texts, in order. */
static bool replay(struct build *build, struct column *column, const char *name) {
    for (size_t i = 0; i < build->count; i++) {
        const struct decision *decision = &build->frame->decisions[i];
        if (!build->stands[i] || !about_column(decision, name)) {
            continue;
        }
        bool one_cell = decision->kind == DECISION_CORRECT || decision->kind == DECISION_SET_MISSING ||
                        (decision->kind == DECISION_CONFIRM && decision->participant);
        bool done = one_cell                          ? apply_to_cell(build, i, column) :
            decision->kind == DECISION_READ_AS        ? apply_read_as(build, i, column) :
            decision->kind == DECISION_CONFIRM        ? !is_new(build, i) || count_text(build, decision, column, decision->value) > 0 ||
                refuse(build, i, "confirms a value that no cell of the column now has") :
                                                        true;
        if (!done) {
            return false;
        }
    }
    return true;
}

/* ---- interpretation: from current texts to typed values, by participant ---- */

struct codes {
    size_t count;
    const char **text;
    double *number; /* NaN where the code is no number */
};

static void collect_codes(const struct build *build, struct column *column, const char *name, struct codes *codes) {
    codes->text = ARENA_NEW(&column->arena, build->count, const char *);
    codes->number = ARENA_NEW(&column->arena, build->count, double);
    for (size_t i = 0; i < build->count; i++) {
        const struct decision *decision = &build->frame->decisions[i];
        if (build->stands[i] && decision->kind == DECISION_MISSING_CODE && about_column(decision, name)) {
            codes->text[codes->count] = decision->value;
            double *number = &codes->number[codes->count++];
            *number = number_read(decision->value, '.', number, NULL) == NUMBER_READ ? *number : (double)NAN;
        }
    }
}

static bool is_code(const struct codes *codes, const char *text) {
    for (size_t i = 0; i < codes->count; i++) {
        if (strcmp(codes->text[i], text) == 0) {
            return true;
        }
    }
    return false;
}

/* A code that is a number is meant however it is written: 999, " 999", 999.0. */
static bool is_code_number(const struct codes *codes, double value) {
    for (size_t i = 0; i < codes->count; i++) {
        if (codes->number[i] >= value && codes->number[i] <= value) {
            return true;
        }
    }
    return false;
}

static char decimal_sign(const struct build *build, const char *name) {
    char sign = '.';
    for (size_t i = 0; i < build->count; i++) {
        const struct decision *decision = &build->frame->decisions[i];
        if (build->stands[i] && decision->kind == DECISION_NUMBER_FORMAT && about_column(decision, name)) {
            sign = decision->decimal[0];
        }
    }
    return sign;
}

/* Limits are rare: their array is made with the first one. */
static void note_limit(struct column *column, size_t participants, size_t p, double limit) {
    if (!column->limit) {
        column->limit = ARENA_NEW(&column->arena, participants, double);
        for (size_t i = 0; i < participants; i++) {
            column->limit[i] = NAN;
        }
    }
    column->limit[p] = limit;
}

static void interpret_number(const struct frame *frame, struct column *column, size_t p, const char *text,
    const struct codes *codes, char sign) {
    static const unsigned char state_of[] = {[NUMBER_READ] = CELL_OBSERVED, [NUMBER_BLANK] = CELL_BLANK,
        [NUMBER_UNREADABLE] = CELL_UNREADABLE, [NUMBER_BELOW_LIMIT] = CELL_BELOW_LIMIT, [NUMBER_ABOVE_LIMIT] = CELL_ABOVE_LIMIT};
    double value;
    int decimals;
    enum number_reading reading = number_read(text, sign, &value, &decimals);
    column->state[p] = state_of[reading];
    if (is_code(codes, text) || (reading == NUMBER_READ && is_code_number(codes, value))) {
        column->state[p] = CELL_MISSING_CODE;
    } else if (reading == NUMBER_READ) {
        column->number[p] = value;
        column->decimals = decimals > column->decimals ? decimals : column->decimals;
    } else if (reading == NUMBER_BELOW_LIMIT || reading == NUMBER_ABOVE_LIMIT) {
        note_limit(column, frame->participant_count, p, value);
    }
}

static int32_t event_level(const struct event *event, const char *text) {
    for (size_t i = 0; i < event->yes.count; i++) {
        if (strcmp(event->yes.item[i], text) == 0) {
            return 1;
        }
    }
    for (size_t i = 0; i < event->no.count; i++) {
        if (strcmp(event->no.item[i], text) == 0) {
            return 0;
        }
    }
    return NOWHERE;
}

static int by_text(const void *a, const void *b) {
    return strcmp(*(const char *const *)a, *(const char *const *)b);
}

/* What the file itself calls a code, the code where it says nothing. */
static const char *label_in_file(const struct column *column, const char *code) {
    const struct cell_about *about = column->cells->about ? &column->cells->about[column->index] : NULL;
    for (size_t i = 0; about && i < about->value_count; i++) {
        if (strcmp(about->values[i].code, code) == 0) {
            return about->values[i].label;
        }
    }
    return code;
}

/* Levels of a category or the arm: the listed ones, then every other text that stands there, in byte order. */
static void interpret_category(const struct frame *frame, struct column *column, const struct codes *codes) {
    struct map map;
    map_init(&map);
    for (size_t i = 0; i < column->listed_count; i++) {
        map_put(&map, column->levels[i].code, (int32_t)i);
    }
    size_t unlisted = 0, room = 0;
    const char **extra = NULL;
    for (size_t p = 0; p < frame->participant_count; p++) {
        const char *text = frame_text(frame, column, p);
        size_t place = frame_place(frame, column, p);
        column->level[p] = NOWHERE;
        column->state[p] = place == HELD_RECORD ? CELL_HELD_ASIDE :
            place == NO_RECORD    ? CELL_BLANK :
            !text                 ? CELL_SET_MISSING :
            is_blank(text)        ? CELL_BLANK :
            is_code(codes, text)  ? CELL_MISSING_CODE :
                                    CELL_OBSERVED;
        if (column->state[p] == CELL_OBSERVED && map_get(&map, text) == NOWHERE) {
            if (unlisted == room) {
                room = room ? room * 2 : 16;
                extra = memory_grow(extra, room, sizeof *extra);
            }
            extra[unlisted++] = text;
            map_put(&map, text, 0);
        }
    }
    if (unlisted) {
        qsort(extra, unlisted, sizeof *extra, by_text);
    }
    struct level *levels = ARENA_NEW(&column->arena, column->listed_count + unlisted, struct level);
    if (column->listed_count) {
        memcpy(levels, column->levels, column->listed_count * sizeof *levels);
    }
    map_release(&map);
    for (size_t i = 0; i < column->listed_count + unlisted; i++) {
        if (i >= column->listed_count) {
            const char *code = extra[i - column->listed_count];
            levels[i] = (struct level){code, column->listed_count ? arena_format(&column->arena, "\"%s\", not listed", code) :
                label_in_file(column, code)};
        }
        map_put(&map, levels[i].code, (int32_t)i);
    }
    for (size_t p = 0; p < frame->participant_count; p++) {
        if (column->state[p] == CELL_OBSERVED) {
            column->level[p] = map_get(&map, frame_text(frame, column, p));
        }
    }
    column->levels = levels;
    column->level_count = column->listed_count + unlisted;
    map_release(&map);
    memory_free(extra);
}

/* The order of each site, looked up once. */
struct site_orders {
    const char *column;
    struct map map;
};

const char *frame_site(const struct frame *frame, size_t participant) {
    const struct plan *plan = frame->plan;
    if (frame->site) {
        return frame_text(frame, frame->site, participant);
    }
    const struct cells *cells = plan->site_column ? &frame->cells[plan->site_place.file] : NULL;
    size_t record = !cells || frame->participants[participant].record == NO_RECORD ? NO_RECORD :
                                                                                   frame->place[plan->site_place.slot][participant];
    return record == NO_RECORD || record == HELD_RECORD ? NULL :
                                                          cells_at(cells, record, cells_column(cells, plan->site_place.column));
}

enum date_order frame_date_order(const struct frame *frame, const char *column, size_t file, const char *site) {
    enum date_order order = dates_order(frame->plan->dates, file, site);
    for (size_t i = 0; i < frame->version; i++) {
        const struct decision *decision = &frame->decisions[i];
        bool about = frame->stands[i] && decision->kind == DECISION_DATE_ORDER && plan_covers(decision->column, column);
        if (about && (!decision->site || (site && strcmp(decision->site, site) == 0))) {
            date_order_read(decision->order, &order);
        }
    }
    return order;
}

static enum date_order order_of_site(const struct frame *frame, struct site_orders *orders, size_t file, size_t participant) {
    const char *site = frame_site(frame, participant), *key = site ? site : "";
    int32_t order = map_get(&orders->map, key);
    return (enum date_order)(order != NOWHERE ? order :
            map_put(&orders->map, key, (int32_t)frame_date_order(frame, orders->column, file, site)));
}

static void interpret_date(const struct frame *frame, struct column *column, size_t p, const char *text, const struct codes *codes,
    struct site_orders *orders) {
    if (is_code(codes, text)) {
        column->state[p] = CELL_MISSING_CODE;
        return;
    }
    enum date_reading reading = date_read(text, order_of_site(frame, orders, column->file, p), &column->number[p]);
    column->state[p] = reading == DATE_READ ? CELL_OBSERVED : reading == DATE_BLANK ? CELL_BLANK : CELL_UNREADABLE;
}

static void interpret_dates(const struct frame *frame, struct column *column, const char *name, const struct codes *codes) {
    struct site_orders orders = {.column = name};
    map_init(&orders.map);
    for (size_t p = 0; p < frame->participant_count; p++) {
        size_t place = frame_place(frame, column, p);
        const char *text = frame_text(frame, column, p);
        if (text) {
            interpret_date(frame, column, p, text, codes, &orders);
        } else {
            column->state[p] = place == HELD_RECORD ? CELL_HELD_ASIDE : place == NO_RECORD ? CELL_BLANK : CELL_SET_MISSING;
        }
    }
    map_release(&orders.map);
}

static void interpret_cell(const struct frame *frame, struct column *column, size_t p, const struct codes *codes,
    const struct event *event, char sign) {
    const char *text = frame_text(frame, column, p);
    size_t place = frame_place(frame, column, p);
    if (place == HELD_RECORD || place == NO_RECORD) {
        column->state[p] = place == HELD_RECORD ? CELL_HELD_ASIDE : CELL_BLANK;
    } else if (!text) {
        column->state[p] = CELL_SET_MISSING;
    } else if (event) {
        column->level[p] = event_level(event, text);
        column->state[p] = column->level[p] != NOWHERE ? CELL_OBSERVED : is_blank(text) ? CELL_BLANK :
            is_code(codes, text) ? CELL_MISSING_CODE : CELL_UNREADABLE;
    } else {
        interpret_number(frame, column, p, text, codes, sign);
    }
}

/* The fingerprint of a column's values: state, then the value, by participant. */
static void hash_column(const struct frame *frame, struct column *column) {
    struct hash hash;
    hash_init(&hash);
    for (size_t p = 0; p < frame->participant_count; p++) {
        hash_bytes(&hash, &column->state[p], 1);
        double number = column->number ? column->number[p] : (double)NAN;
        double limit = column->limit ? column->limit[p] : (double)NAN;
        if (!isnan(number) || !isnan(limit)) {
            double value = (isnan(number) ? limit : number) + 0.0; /* −0 becomes 0 */
            hash_bytes(&hash, &value, sizeof value);
        } else if (column->level && column->level[p] != NOWHERE) {
            hash_field(&hash, column->kind == VARIABLE_EVENT ? (column->level[p] ? "1" : "0") : column->levels[column->level[p]].code);
        }
    }
    hash_finish(&hash, column->hash);
}

/* Conversions come last: they are of what the texts read as numbers. */
static bool apply_conversions(struct build *build, struct column *column, const char *name) {
    for (size_t i = 0; column->number && i < build->count; i++) {
        const struct decision *decision = &build->frame->decisions[i];
        bool applies = build->stands[i] && convert_covers(decision, name);
        if (applies && convert_apply(build->frame, column, decision) == 0 && is_new(build, i)) {
            return refuse(build, i, arena_format(&build->frame->arena, "is about the site \"%.60s\", where the file has no participant",
                decision->site));
        }
    }
    return true;
}

static bool interpret(struct build *build, struct column *column, const char *name, const struct event *event) {
    struct frame *frame = build->frame;
    size_t n = frame->participant_count;
    struct codes codes = {0};
    collect_codes(build, column, name, &codes);
    column->state = ARENA_NEW(&column->arena, n, unsigned char);
    if (column->kind == VARIABLE_NUMBER || column->kind == VARIABLE_DATE) {
        column->number = ARENA_NEW(&column->arena, n, double);
        for (size_t p = 0; p < n; p++) {
            column->number[p] = NAN;
        }
    } else {
        column->level = ARENA_NEW(&column->arena, n, int32_t);
        for (size_t p = 0; p < n; p++) {
            column->level[p] = NOWHERE;
        }
    }
    if (column->kind == VARIABLE_CATEGORY || column->kind == VARIABLE_ARM) {
        interpret_category(frame, column, &codes);
    } else if (column->kind == VARIABLE_DATE) {
        interpret_dates(frame, column, name, &codes);
    } else {
        char sign = decimal_sign(build, name);
        for (size_t p = 0; p < n; p++) {
            interpret_cell(frame, column, p, &codes, event, sign);
        }
    }
    if (!apply_conversions(build, column, name)) {
        return false;
    }
    hash_column(frame, column);
    return true;
}

static struct column *column_new(const struct frame *frame, const struct place *place, enum variable_kind kind) {
    struct column *column = memory_new(1, sizeof *column);
    atomic_init(&column->references, 1);
    arena_init(&column->arena);
    column->file = place->file;
    column->slot = place->slot;
    column->cells = &frame->cells[place->file];
    column->index = cells_column(column->cells, place->column);
    column->kind = kind;
    return column;
}

static struct column *column_retain(struct column *column) {
    atomic_fetch_add(&column->references, 1);
    return column;
}

static void column_release(struct column *column) {
    if (column && atomic_fetch_sub(&column->references, 1) == 1) {
        arena_release(&column->arena);
        memory_free(column);
    }
}

/* ---- the parts of a frame ---- */

/* A column of texts only, shared where nothing has touched it. */
static bool build_texts(struct build *build, const char *name, const struct place *place, enum variable_kind kind,
    struct column *before, struct column **column) {
    if (before && !column_touched(build, name)) {
        *column = column_retain(before);
        return true;
    }
    *column = column_new(build->frame, place, kind);
    return replay(build, *column, name);
}

static bool build_identifiers(struct build *build) {
    struct frame *frame = build->frame;
    const struct plan *plan = frame->plan;
    frame->identifiers = ARENA_NEW(&frame->arena, plan->file_count, struct column *);
    frame->visits = ARENA_NEW(&frame->arena, plan->file_count, struct column *);
    frame->windows = ARENA_NEW(&frame->arena, plan->file_count, struct column *);
    frame->dated = ARENA_NEW(&frame->arena, plan->file_count, size_t *);
    frame->columns = ARENA_NEW(&frame->arena, plan->variable_count, struct column *);
    for (size_t f = 0; f < plan->file_count; f++) {
        const struct plan_file *file = &plan->files[f];
        struct place identifier = {f, file->first_slot, file->participant}, visit = {f, file->first_slot, file->visit};
        const struct frame *previous = build->lender;
        if (!build_texts(build, file->identifier_name, &identifier, VARIABLE_PARTICIPANT,
                previous ? previous->identifiers[f] : NULL, &frame->identifiers[f]) ||
            (file->visit_name && !build_texts(build, file->visit_name, &visit, VARIABLE_VISIT, previous ? previous->visits[f] : NULL,
                                   &frame->visits[f]))) {
            return false;
        }
    }
    frame->identifier = frame->identifiers[0];
    return true;
}

/* ---- the join: which record of each file and visit is a participant's ---- */

struct joining {
    struct frame *frame;
    struct map participants; /* identifier to index */
    struct map codes;        /* visit code to place among the file's codes */
    const char *id;          /* of the record before: files mostly come sorted */
    int32_t who;
};

static int32_t owner_of(struct joining *joining, const char *id) {
    if (!joining->id || strcmp(joining->id, id) != 0) {
        joining->id = id;
        joining->who = map_get(&joining->participants, id);
    }
    return joining->who;
}

static void join_record(struct joining *joining, size_t f, size_t record) {
    struct frame *frame = joining->frame;
    const struct plan_file *file = &frame->plan->files[f];
    struct join *join = &frame->joins[f];
    const char *id = column_text(frame, frame->identifiers[f], record);
    const char *code = file->by_visit && !file->window ? column_text(frame, frame->visits[f], record) : NULL;
    frame->owner[f][record] = NOWHERE;
    if (!id || is_blank(id)) {
        join->blank++;
        return;
    }
    int32_t who = owner_of(joining, id), visit = file->by_visit ? code ? map_get(&joining->codes, code) : NOWHERE : 0;
    if (who == NOWHERE) {
        join->unmatched++;
        return;
    }
    frame->owner[f][record] = who;
    if (file->window) {
        return; /* placed by its date, when that is known */
    }
    if (visit == NOWHERE) {
        join->unplanned++;
        return;
    }
    join->matched++;
    size_t *place = &frame->place[file->first_slot + (size_t)visit][who];
    join->doubled += *place != NO_RECORD && *place != HELD_RECORD ? 1 : 0;
    *place = *place == NO_RECORD ? record : HELD_RECORD;
}

static void join_file(struct joining *joining, size_t f) {
    const struct plan_file *file = &joining->frame->plan->files[f];
    map_init(&joining->codes);
    joining->id = NULL;
    joining->frame->owner[f] = ARENA_NEW(&joining->frame->arena, joining->frame->cells[f].records, int32_t);
    for (size_t c = 0; c < file->codes.count; c++) {
        map_put(&joining->codes, file->codes.item[c], (int32_t)c);
    }
    for (size_t r = 0; r < joining->frame->cells[f].records; r++) {
        join_record(joining, f, r);
    }
    map_release(&joining->codes);
}

static void build_places(struct build *build) {
    struct frame *frame = build->frame;
    const struct plan *plan = frame->plan;
    size_t n = frame->participant_count;
    frame->place = ARENA_NEW(&frame->arena, plan->slot_count, size_t *);
    frame->joins = ARENA_NEW(&frame->arena, plan->file_count, struct join);
    frame->owner = ARENA_NEW(&frame->arena, plan->file_count, int32_t *);
    for (size_t s = 0; s < plan->slot_count; s++) {
        frame->place[s] = ARENA_NEW(&frame->arena, n, size_t);
        for (size_t p = 0; p < n; p++) {
            frame->place[s][p] = s == 0 && !plan->files[0].by_visit ? frame->participants[p].record : NO_RECORD;
        }
    }
    for (size_t p = 0; p < n && !plan->files[0].by_visit; p++) {
        frame->joins[0].matched += frame->participants[p].record_count;
        frame->joins[0].doubled += frame->participants[p].record == NO_RECORD;
    }
    frame->joins[0].blank = frame->cells[0].records - frame->joins[0].matched;
    if (plan->file_count == 1 && !plan->files[0].by_visit) {
        return;
    }
    struct joining joining = {.frame = frame};
    map_init(&joining.participants);
    for (size_t p = 0; p < n; p++) {
        map_put(&joining.participants, frame->participants[p].id, (int32_t)p);
    }
    for (size_t f = plan->files[0].by_visit ? 0 : 1; f < plan->file_count; f++) {
        frame->joins[f] = (struct join){0};
        join_file(&joining, f);
    }
    map_release(&joining.participants);
}

/* ---- columns of values ---- */

static void list_levels(struct column *column, const struct plan *plan, int covariate) {
    if (column->kind == VARIABLE_ARM) {
        column->listed_count = plan->arm_count;
        column->levels = ARENA_NEW(&column->arena, plan->arm_count, struct level);
        for (size_t i = 0; i < plan->arm_count; i++) {
            column->levels[i] = (struct level){plan->arms[i].code, plan->arms[i].label};
        }
    } else if (column->kind == VARIABLE_CATEGORY && covariate != NOWHERE) {
        column->listed_count = plan->covariates[covariate].level_count;
        column->levels = plan->covariates[covariate].levels;
    }
}

static bool build_column(struct build *build, const char *name, const struct place *place, enum variable_kind kind,
    int covariate, int event, struct column *before, bool share, struct column **column) {
    const char *site = build->frame->plan->site_column; /* the order of a date may hang on it */
    share = share && !(kind == VARIABLE_DATE && site && before && column_touched(build, site));
    if (before && share && !column_touched(build, name)) {
        *column = column_retain(before);
        return true;
    }
    *column = column_new(build->frame, place, kind);
    list_levels(*column, build->frame->plan, covariate);
    if (!replay(build, *column, name)) {
        return false;
    }
    return interpret(build, *column, name, event == NOWHERE ? NULL : &build->frame->plan->events[event]);
}

/* Whether columns that nothing has touched can be those of the previous frame: their records are the same. */
static bool places_shared(const struct build *build) {
    const struct frame *frame = build->frame, *previous = build->lender;
    const struct dates *dates = frame->plan->dates;
    bool share = previous && !roster_touched(build);
    for (size_t f = 0; share && f < frame->plan->file_count; f++) {
        share = previous->identifiers[f] == frame->identifiers[f] && previous->visits[f] == frame->visits[f] &&
                previous->windows[f] == frame->windows[f];
        if (share && frame->windows[f]) { /* its visits hang on the date of randomisation, too, and on sites */
            size_t randomised = (size_t)dates->moments[dates->randomised].variable;
            const char *site = frame->plan->site_column;
            share = previous->columns[randomised] == frame->columns[randomised] && !(site && column_touched(build, site));
        }
    }
    return share;
}

static bool build_variable(struct build *build, size_t v, bool share) {
    struct frame *frame = build->frame;
    const struct variable *variable = &frame->plan->variables[v];
    return frame->columns[v] || build_column(build, variable->column, &variable->place, variable->kind, variable->covariate,
                                    variable->event, build->lender ? build->lender->columns[v] : NULL, share, &frame->columns[v]);
}

/* The site's column comes before those that hang on it. Where a variable is the site they share the column. */
static bool build_site(struct build *build, bool share) {
    struct frame *frame = build->frame;
    const struct plan *plan = frame->plan;
    if (!plan->site_column || frame->site) {
        return true;
    }
    int v = plan_variable(plan, plan->site_column);
    if (v == NOWHERE) {
        return build_column(build, plan->site_column, &plan->site_place, VARIABLE_CATEGORY, NOWHERE, NOWHERE,
            build->lender ? build->lender->site : NULL, share, &frame->site);
    }
    bool built = build_variable(build, (size_t)v, share);
    frame->site = built ? column_retain(frame->columns[v]) : NULL;
    return built;
}

static bool ever_converted(const struct build *build, const char *name) {
    for (size_t i = 0; i < build->count; i++) {
        if (convert_covers(&build->frame->decisions[i], name)) {
            return true;
        }
    }
    return false;
}

/* ---- visits found by date: of a participant's records in a visit's window the nearest to the target day stands ---- */

struct nearest {
    size_t record, same; /* same: how many records of that day */
    double days;
    bool tied; /* with one as far on the other side, or its record with another target */
};

struct windowing {
    struct frame *frame;
    size_t file;
    struct site_orders orders;
    struct nearest *nearest; /* [codes * participants] */
};

/* Days from a participant's randomisation to a record's date, NaN where either is not known. */
static double days_of_record(const struct frame *frame, size_t f, size_t record, size_t who, struct site_orders *orders) {
    const struct dates *dates = frame->plan->dates;
    const char *text = column_text(frame, frame->windows[f], record);
    double day = (double)NAN;
    if (text) {
        date_read(text, order_of_site(frame, orders, f, who), &day);
    }
    return day - frame->columns[dates->moments[dates->randomised].variable]->number[who];
}

static void place_in_window(struct windowing *windowing, size_t record, size_t who, double days) {
    struct frame *frame = windowing->frame;
    const struct plan *plan = frame->plan;
    struct join *join = &frame->joins[windowing->file];
    bool tie = false;
    int visit = dates_visit_by_window(plan, windowing->file, days, &tie);
    if (visit == NOWHERE) {
        join->unplanned++;
        return;
    }
    join->matched++;
    size_t slot = plan->files[windowing->file].first_slot + (size_t)visit;
    frame->dated[windowing->file][record] = slot;
    double target = plan->dates->moments[dates_moment_of_slot(plan, slot)].target, off = fabs(days - target);
    struct nearest *nearest = &windowing->nearest[(size_t)visit * frame->participant_count + who];
    double best = nearest->same ? fabs(nearest->days - target) : HUGE_VAL;
    bool other_side = off >= best && off <= best && (days > nearest->days || days < nearest->days);
    if (off < best || (other_side && days > nearest->days)) {
        join->farther += nearest->same;
        *nearest = (struct nearest){record, 1, days, tie || other_side};
    } else if (off > best || other_side) {
        join->farther++;
        nearest->tied = nearest->tied || other_side;
    } else {
        nearest->same++;
    }
}

static void place_by_window(struct windowing *windowing) {
    struct frame *frame = windowing->frame;
    size_t f = windowing->file, n = frame->participant_count, codes = frame->plan->files[f].codes.count;
    struct join *join = &frame->joins[f];
    frame->dated[f] = ARENA_NEW(&frame->arena, frame->cells[f].records, size_t);
    for (size_t r = 0; r < frame->cells[f].records; r++) {
        int32_t who = frame->owner[f][r];
        double days = who == NOWHERE ? (double)NAN : days_of_record(frame, f, r, (size_t)who, &windowing->orders);
        frame->dated[f][r] = NO_RECORD;
        join->undated += who != NOWHERE && isnan(days);
        if (!isnan(days)) {
            place_in_window(windowing, r, (size_t)who, days);
        }
    }
    for (size_t i = 0; i < codes * n; i++) {
        const struct nearest *nearest = &windowing->nearest[i];
        if (nearest->same) {
            frame->place[frame->plan->files[f].first_slot + i / n][i % n] = nearest->same > 1 ? HELD_RECORD : nearest->record;
            join->doubled += nearest->same > 1;
            join->ties += nearest->tied;
        }
    }
}

/* What days are counted from: the date of randomisation and, where its decisions speak of sites, the site. */
static bool build_early(struct build *build) {
    const struct plan *plan = build->frame->plan;
    bool share = build->lender && !roster_touched(build);
    for (size_t f = 0; share && f < plan->file_count; f++) {
        share = build->lender->identifiers[f] == build->frame->identifiers[f] && build->lender->visits[f] == build->frame->visits[f];
    }
    bool early = plan->site_column && !plan->files[plan->site_place.file].window;
    int randomised = plan->dates->moments[plan->dates->randomised].variable;
    return (!early || build_site(build, share)) &&
           build_variable(build, (size_t)randomised, share);
}

static bool build_windows(struct build *build) {
    struct frame *frame = build->frame;
    for (size_t f = 0; f < frame->plan->file_count; f++) {
        const struct plan_file *file = &frame->plan->files[f];
        struct place place = {f, file->first_slot, file->window};
        if (!file->window) {
            continue;
        }
        if (!build_texts(build, file->window_name, &place, VARIABLE_DATE, build->lender ? build->lender->windows[f] : NULL,
                &frame->windows[f]) || !build_early(build)) {
            return false;
        }
        struct windowing windowing = {.frame = frame, .file = f, .orders = {.column = file->window_name}};
        windowing.nearest = memory_new(file->codes.count * frame->participant_count, sizeof *windowing.nearest);
        map_init(&windowing.orders.map);
        place_by_window(&windowing);
        map_release(&windowing.orders.map);
        memory_free(windowing.nearest);
    }
    return true;
}

/* The file a keep-record is about: the first unless it says. */
static int file_meant(const struct frame *frame, const struct decision *decision) {
    for (size_t f = 0; f < frame->plan->file_count; f++) {
        if (!decision->file || (frame->plan->files[f].id && strcmp(frame->plan->files[f].id, decision->file) == 0)) {
            return (int)f;
        }
    }
    return NOWHERE;
}

size_t frame_slot_of_record(const struct frame *frame, size_t f, size_t record) {
    const struct plan_file *file = &frame->plan->files[f];
    if (file->window) {
        return frame->dated[f][record];
    }
    const char *code = file->by_visit ? column_text(frame, frame->visits[f], record) : NULL;
    for (size_t c = 0; code && c < file->codes.count; c++) {
        if (strcmp(file->codes.item[c], code) == 0) {
            return file->first_slot + c;
        }
    }
    return file->by_visit ? NO_RECORD : file->first_slot;
}

/* keep-record in a file beside the first, or of one visit: that record stands. */
static bool apply_keep_of_file(struct build *build, size_t i, size_t f) {
    struct frame *frame = build->frame;
    const struct decision *decision = &frame->decisions[i];
    size_t record = decision->row - 1;
    const char *there = record < frame->cells[f].records ? column_text(frame, frame->identifiers[f], record) : NULL;
    int who = there ? frame_participant(frame, there) : NOWHERE;
    size_t slot = there ? frame_slot_of_record(frame, f, record) : NO_RECORD;
    if (is_new(build, i) && (who == NOWHERE || strcmp(there, decision->participant) != 0 || slot == NO_RECORD)) {
        return refuse(build, i, "names a row that is not one of the participant's records at a planned visit of that file");
    }
    if (who != NOWHERE && slot != NO_RECORD) {
        frame->joins[f].doubled -= frame->place[slot][who] == HELD_RECORD ? 1 : 0;
        frame->place[slot][who] = record;
    }
    return true;
}

/* The file a keep-record is about comes first, has a code for each visit, or finds its visits by date: places are settled so. */
enum keeping { KEEPING_FIRST, KEEPING_CODED, KEEPING_WINDOWED };

static bool keep_records(struct build *build, enum keeping now) {
    const struct frame *frame = build->frame;
    for (size_t i = 0; i < build->count; i++) {
        if (!build->stands[i] || frame->decisions[i].kind != DECISION_KEEP_RECORD) {
            continue;
        }
        int f = file_meant(frame, &frame->decisions[i]);
        if (f == NOWHERE) {
            if (is_new(build, i)) {
                return refuse(build, i, "names a file that is not in the plan");
            }
            continue;
        }
        enum keeping keeping = f == 0 && !frame->plan->files[0].by_visit ? KEEPING_FIRST :
            frame->plan->files[f].window                                 ? KEEPING_WINDOWED :
                                                                           KEEPING_CODED;
        if (keeping == now && !(now == KEEPING_FIRST ? apply_keep(build, i) : apply_keep_of_file(build, i, (size_t)f))) {
            return false;
        }
    }
    return true;
}

static bool build_participants(struct build *build) {
    build_roster(build);
    if (!keep_records(build, KEEPING_FIRST)) {
        return false;
    }
    build_places(build); /* they start from the first file's records */
    return keep_records(build, KEEPING_CODED) && build_windows(build) && keep_records(build, KEEPING_WINDOWED);
}

/* A confirmation is the one decision on a computed value that the replay looks at: of the value as it is shown. */
static bool confirmations_fit(struct build *build, const struct column *column, const char *name) {
    for (size_t i = 0; i < build->count; i++) {
        const struct decision *decision = &build->frame->decisions[i];
        if (!is_new(build, i) || !build->stands[i] || decision->kind != DECISION_CONFIRM || strcmp(decision->column, name) != 0) {
            continue;
        }
        int who = decision->participant ? frame_participant(build->frame, decision->participant) : NOWHERE;
        if (who == NOWHERE) {
            return refuse(build, i, decision->participant ? "names a participant who is not in the file" :
                "is about a computed value; say whose with \"participant\"");
        }
        if (!same_text(column->texts[who], decision->value)) {
            return refuse(build, i, "confirms a value that is not the one now computed");
        }
    }
    return true;
}

/* A computed column, shared where none of the columns it rests on is another than before. */
static bool build_derived(struct build *build, size_t d, bool share) {
    struct frame *frame = build->frame;
    const struct derived *derived = &frame->plan->derived[d];
    struct column **column = &frame->columns[derived->variable];
    for (size_t k = 0; k < derived->of_count && share; k++) {
        share = build->lender->columns[derived->of[k].variable] == frame->columns[derived->of[k].variable];
    }
    if (share) {
        *column = column_retain(build->lender->columns[derived->variable]);
    } else {
        *column = memory_new(1, sizeof **column);
        atomic_init(&(*column)->references, 1);
        arena_init(&(*column)->arena);
        (*column)->kind = VARIABLE_NUMBER;
        derived_fill(*column, frame, derived);
        hash_column(frame, *column);
    }
    return confirmations_fit(build, *column, derived->column);
}

static bool build_columns(struct build *build) {
    struct frame *frame = build->frame;
    const struct plan *plan = frame->plan;
    bool share = places_shared(build);
    if (!build_site(build, share)) {
        return false;
    }
    bool same_site = build->lender && build->lender->site == frame->site;
    for (size_t v = 0; v < plan->variable_count; v++) {
        bool as_before = share && (same_site || !ever_converted(build, plan->variables[v].column));
        if (plan->variables[v].derived == NOWHERE && !build_variable(build, v, as_before)) {
            return false;
        }
    }
    for (size_t d = 0; d < plan->derived_count; d++) {
        if (!build_derived(build, d, share)) {
            return false;
        }
    }
    return !plan->arm_column || build_column(build, plan->arm_column, &plan->arm_place, VARIABLE_ARM, NOWHERE, NOWHERE,
                                    build->lender ? build->lender->arm : NULL, share, &frame->arm);
}

/* ---- what is not a cell: sets, scales, flags, blinding, lock ---- */

static bool apply_unblind(struct build *build, size_t i) {
    struct frame *frame = build->frame;
    enum blinding to = BLINDING_CODED;
    blinding_read(frame->decisions[i].to ? frame->decisions[i].to : "coded", &to);
    if (is_new(build, i) && !frame->plan->arm_column) {
        return refuse(build, i, "cannot be: the plan has no arm");
    }
    if (is_new(build, i) && to <= frame->blinding) {
        return refuse(build, i, arena_format(&frame->arena, "asks for %s, but the study is %s already", blinding_name(to),
            blinding_name(frame->blinding)));
    }
    frame->blinding = to;
    return true;
}

static bool apply_setting(struct build *build, size_t i) {
    struct frame *frame = build->frame;
    const struct decision *decision = &frame->decisions[i];
    int outcome = decision->outcome ? plan_outcome(frame->plan, decision->outcome) : NOWHERE;
    int who = decision->participant ? participant_meant(build, i) : NOWHERE;
    if (is_new(build, i) && decision->outcome && outcome == NOWHERE) {
        return refuse(build, i, arena_format(&frame->arena, "names \"%.60s\", which is not the id of an outcome", decision->outcome));
    }
    /* Decisions on cells and records have been held against the data already. */
    bool unknown = decision->participant && who == NOWHERE && decision->kind > DECISION_KEEP_RECORD;
    if (is_new(build, i) && unknown) {
        return refuse(build, i, "names a participant who is not in the file");
    }
    bool about_someone = decision->kind == DECISION_FLAG || decision->kind == DECISION_EXCLUDE;
    bool about_outcome = decision->kind == DECISION_FLAG || decision->kind == DECISION_SCALE;
    if ((about_someone && who == NOWHERE) || (about_outcome && outcome == NOWHERE)) {
        return true; /* whom it was about is no longer in the file */
    }
    switch (decision->kind) {
    case DECISION_SCALE:
        scale_read(decision->scale, &frame->scales[outcome]);
        return true;
    case DECISION_FLAG:
        frame->flagged[(size_t)outcome * frame->participant_count + (size_t)who] = true;
        return true;
    case DECISION_EXCLUDE:
        /* Who is out of the full set is out of the per-protocol set too. */
        frame->participants[who].excluded_per_protocol = true;
        frame->participants[who].excluded_full |= strcmp(decision->set, "full") == 0;
        return true;
    case DECISION_UNBLIND:
        return apply_unblind(build, i);
    default:
        return true;
    }
}

static bool build_settings(struct build *build) {
    struct frame *frame = build->frame;
    const struct plan *plan = frame->plan;
    frame->scales = ARENA_NEW(&frame->arena, plan->outcome_count, enum scale);
    frame->flagged = ARENA_NEW(&frame->arena, plan->outcome_count * frame->participant_count, bool);
    for (size_t i = 0; i < plan->outcome_count; i++) {
        frame->scales[i] = plan->outcomes[i].scale;
    }
    for (size_t i = 0; i < build->count; i++) {
        if (build->stands[i] && !apply_setting(build, i)) {
            return false;
        }
    }
    return true;
}

/* ---- rules that hold for every new decision ---- */

static bool reverse_fits(struct build *build, size_t i) {
    const struct decision *decision = &build->frame->decisions[i];
    if (decision->reverses - 1 >= i) {
        return refuse(build, i, "reverses a decision that is not there");
    }
    const struct decision *target = &build->frame->decisions[decision->reverses - 1];
    if (!decision_rules[target->kind].reversible) {
        return refuse(build, i, arena_format(&build->frame->arena, "cannot reverse decision %u: %s", target->number,
            target->kind == DECISION_LOCK ? "a lock is opened by unlock" :
            target->kind == DECISION_SIGN ? "a signature stands for good" : "what has been unblinded cannot be unseen"));
    }
    for (size_t j = 0; j < i; j++) {
        const struct decision *other = &build->frame->decisions[j];
        bool again = other->kind == DECISION_REVERSE && other->reverses == decision->reverses && build->stands[j];
        if (again) {
            return refuse(build, i, arena_format(&build->frame->arena, "reverses decision %u, which decision %u has reversed already",
                decision->reverses, other->number));
        }
    }
    return true;
}

/* date-order: about a date, and of a site that somebody has. */
static bool date_order_fits(struct build *build, size_t i) {
    const struct frame *frame = build->frame, *previous = build->previous;
    const struct decision *decision = &frame->decisions[i];
    bool date = false, site = !decision->site;
    for (size_t v = 0; v < frame->plan->variable_count && !date; v++) {
        date = frame->plan->variables[v].kind == VARIABLE_DATE && plan_covers(decision->column, frame->plan->variables[v].column);
    }
    for (size_t f = 0; f < frame->plan->file_count && !date; f++) {
        date = frame->plan->files[f].window && strcmp(frame->plan->files[f].window_name, decision->column) == 0;
    }
    for (size_t p = 0; p < previous->participant_count && !site; p++) {
        const char *here = frame_site(previous, p);
        site = here && strcmp(here, decision->site) == 0;
    }
    return !date ? refuse(build, i, arena_format(&build->frame->arena, "is about the column \"%.60s\", which holds no dates", decision->column)) :
                   site || refuse(build, i, arena_format(&build->frame->arena, "names the site \"%.60s\", which no participant has", decision->site));
}

/* Whether it is the whole name of a column, not only FILE.COLUMN of several visits. */
static bool frame_names(const struct frame *frame, const char *name) {
    return plan_variable(frame->plan, name) != NOWHERE || (frame->plan->arm_column && strcmp(frame->plan->arm_column, name) == 0);
}

static bool column_fits(struct build *build, size_t i) {
    const struct frame *frame = build->frame;
    const struct decision *decision = &frame->decisions[i];
    const struct plan *plan = frame->plan;
    bool known = plan_identifier_file(plan, decision->column) != NOWHERE || plan_visit_file(plan, decision->column) != NOWHERE ||
                 (plan->arm_column && plan_covers(decision->column, plan->arm_column)) ||
                 (plan->site_column && plan_covers(decision->column, plan->site_column));
    for (size_t v = 0; v < plan->variable_count && !known; v++) {
        known = plan_covers(decision->column, plan->variables[v].column);
    }
    for (size_t f = 0; f < plan->file_count; f++) {
        const char *window = plan->files[f].window_name;
        bool looks = decision->kind == DECISION_CONFIRM || decision->kind == DECISION_QUERY;
        if (window && !looks && strlen(decision->column) > strlen(window) && plan_covers(window, decision->column)) {
            return refuse(build, i, arena_format(&build->frame->arena,
                "is about one visit of a date by which visits are found; name %s and the record's row", window));
        }
        known = known || (window && strcmp(decision->column, window) == 0);
    }
    if (!known) {
        return refuse(build, i, arena_format(&build->frame->arena, "names the column \"%.60s\", which the plan gives no meaning",
            decision->column));
    }
    bool of_value = decision->kind == DECISION_CONFIRM || decision->kind == DECISION_QUERY;
    if (plan_derived(plan, decision->column) != NOWHERE && !of_value) {
        return refuse(build, i, arena_format(&build->frame->arena, "is about \"%.60s\", which is computed; decide about the columns it rests on",
            decision->column));
    }
    bool number = false;
    for (size_t v = 0; v < plan->variable_count && !number; v++) {
        number = plan->variables[v].kind == VARIABLE_NUMBER && plan_covers(decision->column, plan->variables[v].column);
    }
    if ((decision->kind == DECISION_NUMBER_FORMAT || decision->kind == DECISION_CONVERT) && !number) {
        return refuse(build, i, arena_format(&build->frame->arena, "is about the column \"%.60s\", which holds no numbers", decision->column));
    }
    if (decision->kind == DECISION_DATE_ORDER && !date_order_fits(build, i)) {
        return false;
    }
    bool one_cell = decision->participant && decision->kind >= DECISION_CORRECT && decision->kind <= DECISION_CONFIRM && !decision->row;
    if (one_cell && plan_visit_file(plan, decision->column) != NOWHERE) {
        return refuse(build, i, "is about one record's visit code; say which record with \"row\"");
    }
    bool texts = plan_identifier_file(plan, decision->column) != NOWHERE || plan_window_file(plan, decision->column) != NOWHERE;
    if (one_cell && !texts && !frame_names(frame, decision->column)) {
        return refuse(build, i, arena_format(&build->frame->arena, "names %.60s, of which a participant has one value per visit; add "
            "@ and the visit's code, or say which record with \"row\"", decision->column));
    }
    return decision->kind != DECISION_MISSING_CODE || plan_identifier_file(plan, decision->column) == NOWHERE ||
           refuse(build, i, "is about the identifier, which cannot be missing; correct it, or set it missing to hold the record aside");
}

/* One conversion of a column at a site stands at a time: two would multiply. */
static bool convert_fits(struct build *build, size_t i) {
    struct frame *frame = build->frame;
    const struct decision *decision = &frame->decisions[i];
    if (!frame->plan->site_column) {
        return refuse(build, i, "is about a site, and the plan names no column of sites");
    }
    if (arms_hide_column(build->previous, frame->plan->site_column)) {
        return refuse(build, i, "is about a site, and sites would tell the arms apart while blinded");
    }
    for (size_t j = 0; j < i; j++) {
        const struct decision *other = &frame->decisions[j];
        bool same_column = other->kind == DECISION_CONVERT &&
                           (plan_covers(other->column, decision->column) || plan_covers(decision->column, other->column));
        if (build->stands[j] && same_column && strcmp(other->site, decision->site) == 0) {
            return refuse(build, i, arena_format(&frame->arena, "is about what decision %u has converted already; reverse that one first",
                other->number));
        }
    }
    return true;
}

static bool answers_query(struct build *build, size_t i) {
    uint32_t number = build->frame->decisions[i].reverses;
    return (number - 1 < i && build->frame->decisions[number - 1].kind == DECISION_QUERY) ||
           refuse(build, i, arena_format(&build->frame->arena, "answers decision %u, which is not a query", number));
}

static bool lock_fits(struct build *build, size_t i) {
    bool lock = build->frame->decisions[i].kind == DECISION_LOCK;
    return lock != build->frame->locked || refuse(build, i, lock ? "is not needed: the study is locked already" :
                                                                   "is not needed: the study is not locked");
}

/* What its kind asks of a new decision, before the data are looked at. */
static bool new_one_fits(struct build *build, size_t i) {
    const struct decision *decision = &build->frame->decisions[i];
    if (decision->column && !column_fits(build, i)) {
        return false;
    }
    switch (decision->kind) {
    case DECISION_REVERSE:
        return reverse_fits(build, i);
    case DECISION_RESPONSE:
        return answers_query(build, i);
    case DECISION_CONVERT:
        return convert_fits(build, i);
    case DECISION_LOCK:
    case DECISION_UNLOCK:
        return lock_fits(build, i);
    default:
        return true;
    }
}

static bool changes_data(const struct build *build, const struct decision *decision) {
    const struct decision *meant = decision;
    while (meant->kind == DECISION_REVERSE && meant->reverses < meant->number) {
        meant = &build->frame->decisions[meant->reverses - 1];
    }
    return meant->kind != DECISION_REVERSE && decision_rules[meant->kind].data;
}

static bool new_ones_fit(struct build *build) {
    struct frame *frame = build->frame;
    frame->locked = false;
    for (size_t i = 0; i < build->count; i++) {
        const struct decision *decision = &frame->decisions[i];
        bool stands = build->stands[i];
        if (is_new(build, i)) {
            if (!new_one_fits(build, i)) {
                return false;
            }
            if (frame->locked && changes_data(build, decision)) {
                return refuse(build, i, "would change data, and the study is locked; unlock it first, with a reason");
            }
        }
        frame->locked = stands && decision->kind == DECISION_LOCK   ? true :
            stands && decision->kind == DECISION_UNLOCK ? false :
                                                          frame->locked;
    }
    return true;
}

static void hash_derived(struct hash *hash, const struct frame *frame, const struct derived *derived) {
    hash_field(hash, derived->column);
    hash_field(hash, frame->columns[derived->variable]->hash);
    for (size_t k = 0; k < derived->of_count; k++) {
        hash_field(hash, frame->columns[derived->of[k].variable]->hash);
    }
    hash_field(hash, derived->claims ? frame->columns[derived->claims_variable]->hash : NULL);
}

static bool date_decided(const struct frame *frame, const char *column) {
    for (size_t i = 0; i < frame->version; i++) {
        const struct decision *decision = &frame->decisions[i];
        bool changes = !decision->planned && decision->kind <= DECISION_SET_MISSING; /* planned: a code entered at load */
        if (frame->stands[i] && changes && about_column(decision, column)) {
            return true;
        }
    }
    return false;
}

static void hash_state(struct frame *frame) {
    struct hash hash;
    hash_init(&hash);
    for (size_t p = 0; p < frame->participant_count; p++) {
        const struct participant *who = &frame->participants[p];
        hash_field(&hash, who->id);
        hash_field(&hash, who->record == NO_RECORD ? "held-aside" : who->excluded_full ? "excluded" :
            who->excluded_per_protocol ? "excluded-per-protocol" : "in");
    }
    /* By what the values are, not by where they came from: the same data in other files have the same fingerprint. */
    for (size_t i = 0; i < frame->plan->covariate_count; i++) {
        hash_field(&hash, frame->plan->covariates[i].id);
        hash_field(&hash, frame->columns[frame->plan->covariates[i].variable]->hash);
    }
    for (size_t i = 0; i < frame->plan->outcome_count; i++) {
        for (size_t v = 0; v < frame->plan->outcomes[i].visit_count; v++) {
            hash_field(&hash, frame->plan->outcomes[i].visits[v].label);
            hash_field(&hash, frame->columns[frame->plan->outcomes[i].visits[v].variable]->hash);
        }
    }
    for (size_t i = 0; i < frame->plan->event_count; i++) {
        hash_field(&hash, frame->plan->events[i].id);
        hash_field(&hash, frame->columns[frame->plan->events[i].variable]->hash);
    }
    /* The same data may come with dates or without: those as received are left out, what a decision has made of them is not. */
    for (size_t i = 0; frame->plan->dates && i < frame->plan->dates->moment_count; i++) {
        const struct moment *moment = &frame->plan->dates->moments[i];
        if (!date_decided(frame, moment->column)) {
            continue;
        }
        hash_field(&hash, moment_name(moment->kind));
        hash_field(&hash, moment->label);
        hash_field(&hash, frame->columns[moment->variable]->hash);
    }
    for (size_t i = 0; i < frame->plan->derived_count; i++) {
        hash_derived(&hash, frame, &frame->plan->derived[i]);
    }
    hash_field(&hash, frame->arm ? frame->arm->hash : NULL);
    for (size_t i = 0; i < frame->plan->outcome_count; i++) {
        hash_field(&hash, frame->plan->outcomes[i].id);
        hash_field(&hash, scale_name(frame->scales[i]));
    }
    if (frame->plan->amended) {
        hash_field(&hash, frame->plan->amended);
    }
    hash_finish(&hash, frame->state_sha256);
}

struct frame *frame_build(const struct plan *plan, const struct cells *cells, const char *data_sha256,
    const unsigned char *letters, const struct decision *decisions, size_t count, struct frame *previous, bool check,
    struct fault *fault) {
    struct frame *frame = memory_new(1, sizeof *frame);
    atomic_init(&frame->references, 1);
    arena_init(&frame->arena);
    frame->version = (uint32_t)count;
    frame->plan = plan;
    frame->cells = cells;
    frame->letters = letters;
    frame->data_sha256 = data_sha256;
    frame->blinding = plan->blinding;
    struct decision *copy = ARENA_NEW(&frame->arena, count, struct decision);
    if (count) {
        memcpy(copy, decisions, count * sizeof *copy);
    }
    bool *stands = ARENA_NEW(&frame->arena, count, bool);
    record_standing(copy, count, stands);
    frame->decisions = copy;
    frame->stands = stands;
    struct build build = {frame, previous, previous && previous->plan == plan ? previous : NULL, check && previous, count, stands, fault};
    if (!new_ones_fit(&build) || !build_identifiers(&build) || !build_participants(&build) || !build_columns(&build) ||
        !build_settings(&build)) {
        frame_release(frame);
        return NULL;
    }
    hash_state(frame);
    return frame;
}

struct frame *frame_retain(struct frame *frame) {
    atomic_fetch_add(&frame->references, 1);
    return frame;
}

void frame_release(struct frame *frame) {
    if (!frame || atomic_fetch_sub(&frame->references, 1) != 1) {
        return;
    }
    for (size_t v = 0; frame->columns && v < frame->plan->variable_count; v++) {
        column_release(frame->columns[v]);
    }
    column_release(frame->arm);
    column_release(frame->site);
    for (size_t f = 0; frame->identifiers && f < frame->plan->file_count; f++) {
        column_release(frame->identifiers[f]);
        column_release(frame->visits[f]);
        column_release(frame->windows[f]);
    }
    arena_release(&frame->arena);
    memory_free(frame);
}

const char *frame_text(const struct frame *frame, const struct column *column, size_t participant) {
    if (column->texts) {
        return column->texts[participant];
    }
    size_t record = frame_place(frame, column, participant);
    return record == NO_RECORD || record == HELD_RECORD ? NULL : column_text(frame, column, record);
}

const char *frame_received(const struct frame *frame, const struct column *column, size_t participant) {
    if (column->texts) {
        return NULL;
    }
    size_t record = frame_place(frame, column, participant);
    return record == NO_RECORD || record == HELD_RECORD ? NULL : cells_at(column->cells, record, column->index);
}

const struct column *frame_column(const struct frame *frame, const char *name) {
    int variable = plan_variable(frame->plan, name);
    return variable != NOWHERE                                                       ? frame->columns[variable] :
        frame->plan->arm_column && strcmp(frame->plan->arm_column, name) == 0        ? frame->arm :
        frame->plan->site_column && strcmp(frame->plan->site_column, name) == 0      ? frame->site :
        plan_identifier_file(frame->plan, name) != NOWHERE                           ? frame->identifiers[plan_identifier_file(frame->plan, name)] :
        plan_visit_file(frame->plan, name) != NOWHERE                                ? frame->visits[plan_visit_file(frame->plan, name)] :
        plan_window_file(frame->plan, name) != NOWHERE                               ? frame->windows[plan_window_file(frame->plan, name)] :
                                                                                       NULL;
}
