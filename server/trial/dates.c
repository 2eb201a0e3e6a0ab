/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "trial/dates.h"
#include "intake/number.h"
#include <math.h>
#include <stdio.h>
#include <string.h>

/* ---- the calendar ---- */

static bool is_leap(int year) {
    return (year % 4 == 0 && year % 100 != 0) || year % 400 == 0;
}

static int days_in(int year, int month) {
    static const int days[] = {31, 28, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31};
    return days[month - 1] + (month == 2 && is_leap(year));
}

/* Days before the first of January of a year, from the first of January of the year 1. */
static long days_before(long year) {
    long past = year - 1;
    return past * 365 + past / 4 - past / 100 + past / 400;
}

enum { FIRST_YEAR = 1, LAST_YEAR = 9999, EPOCH_YEAR = 1970 };

double date_day(int year, int month, int day) {
    if (year < FIRST_YEAR || year > LAST_YEAR || month < 1 || month > 12 || day < 1 || day > days_in(year, month)) {
        return (double)NAN;
    }
    long number = days_before(year) - days_before(EPOCH_YEAR);
    for (int m = 1; m < month; m++) {
        number += days_in(year, m);
    }
    return (double)(number + day - 1);
}

void date_parts(double date, int *year, int *month, int *day) {
    long number = (long)floor(date) + days_before(EPOCH_YEAR);
    BUG_IF(number < 0 || number >= days_before(LAST_YEAR + 1));
    long guess = number * 400 / 146097 + 1; /* 400 years are 146,097 days: never more than one year off */
    while (days_before(guess + 1) <= number) {
        guess++;
    }
    while (days_before(guess) > number) {
        guess--;
    }
    long left = number - days_before(guess);
    *year = (int)guess;
    for (*month = 1; left >= days_in(*year, *month); ++*month) {
        left -= days_in(*year, *month);
    }
    *day = (int)left + 1;
}

const char *date_words(struct arena *arena, double day) {
    if (isnan(day)) {
        return NULL;
    }
    int year, month, of_month;
    date_parts(day, &year, &month, &of_month);
    return arena_format(arena, "%04d-%02d-%02d", year, month, of_month);
}

double date_of_serial(double serial, bool from_1904) {
    enum { BEFORE_1904 = 24107, BEFORE_1900 = 25569, NEVER_WAS = 60 };
    double whole = floor(serial);
    if (!(serial >= (from_1904 ? 0 : 1)) || serial >= 2958466) { /* 9999-12-31 is 2,958,465 */
        return (double)NAN;
    }
    if (from_1904) {
        return whole - BEFORE_1904;
    }
    /* Up to the day that never was the count runs one day ahead. */
    return whole < NEVER_WAS ? whole - BEFORE_1900 + 1 : whole > NEVER_WAS ? whole - BEFORE_1900 : (double)NAN;
}

/* ---- orders ---- */

enum part { PART_DAY, PART_MONTH, PART_MONTH_NAME, PART_YEAR };

static const struct order {
    const char *name, *words;
    enum part part[3];
    bool short_year, serial, from_1904;
} orders[DATE_ORDER_COUNT] = {
    [DATE_DMY] = {"D/M/Y", "day, month, year", {PART_DAY, PART_MONTH, PART_YEAR}, false, false, false},
    [DATE_MDY] = {"M/D/Y", "month, day, year", {PART_MONTH, PART_DAY, PART_YEAR}, false, false, false},
    [DATE_YMD] = {"Y/M/D", "year, month, day", {PART_YEAR, PART_MONTH, PART_DAY}, false, false, false},
    [DATE_DMONY] = {"D-MON-Y", "day, month's name, year", {PART_DAY, PART_MONTH_NAME, PART_YEAR}, false, false, false},
    [DATE_DMYY] = {"D/M/YY", "day, month, year of two digits", {PART_DAY, PART_MONTH, PART_YEAR}, true, false, false},
    [DATE_MDYY] = {"M/D/YY", "month, day, year of two digits", {PART_MONTH, PART_DAY, PART_YEAR}, true, false, false},
    [DATE_YYMD] = {"YY/M/D", "year of two digits, month, day", {PART_YEAR, PART_MONTH, PART_DAY}, true, false, false},
    [DATE_DMONYY] = {"D-MON-YY", "day, month's name, year of two digits", {PART_DAY, PART_MONTH_NAME, PART_YEAR}, true,
        false, false},
    [DATE_SERIAL_1900] = {"serial-1900", "a spreadsheet's serial numbers from 1900", {0}, false, true, false},
    [DATE_SERIAL_1904] = {"serial-1904", "a spreadsheet's serial numbers from 1904", {0}, false, true, true},
};

const char *date_order_name(enum date_order order) {
    return orders[order].name;
}

const char *date_order_words(enum date_order order) {
    return orders[order].words;
}

static bool is_separator(char c) {
    return c == '/' || c == '-' || c == '.' || c == ' ';
}

bool date_order_read(const char *name, enum date_order *order) {
    for (int i = 0; i < DATE_ORDER_COUNT; i++) {
        const char *a = name, *b = orders[i].name;
        while (*a && (*a == *b || (is_separator(*a) && is_separator(*b)))) {
            a++;
            b++;
        }
        if (*a == *b) {
            *order = (enum date_order)i;
            return true;
        }
    }
    return false;
}

/* ---- texts ---- */

static bool is_digit(char c) {
    return c >= '0' && c <= '9';
}

static bool is_letter(char c) {
    return (c >= 'A' && c <= 'Z') || (c >= 'a' && c <= 'z');
}

static bool is_space(char c) {
    return c == ' ' || (c >= '\t' && c <= '\r');
}

/* The text of a date with ASCII space around it and a time of day after it left out. */
struct span {
    const char *at, *end;
};

static bool two_digits(const char **at, const char *end, int most) {
    bool there =
        end - *at >= 2 && is_digit((*at)[0]) && is_digit((*at)[1]) && ((*at)[0] - '0') * 10 + ((*at)[1] - '0') <= most;
    *at += there ? 2 : 0;
    return there;
}

/* hh:mm, hh:mm:ss, hh:mm:ss.fff, then Z or an offset: to the end. */
static bool is_time(const char *at, const char *end) {
    if (!two_digits(&at, end, 24) || at == end || *at++ != ':' || !two_digits(&at, end, 59)) {
        return false;
    }
    if (at < end && *at == ':') {
        at++;
        if (!two_digits(&at, end, 60)) {
            return false;
        }
        for (at += at < end && *at == '.'; at < end && is_digit(*at); at++) {
        }
    }
    if (at < end && *at == 'Z') {
        at++;
    } else if (at < end && (*at == '+' || *at == '-')) {
        at++;
        if (!two_digits(&at, end, 24)) {
            return false;
        }
        at += at < end && *at == ':';
        if (at < end && !two_digits(&at, end, 59)) {
            return false;
        }
    }
    return at == end;
}

static struct span span_of(const char *text) {
    struct span span = {text, text + strlen(text)};
    while (span.at < span.end && is_space(*span.at)) {
        span.at++;
    }
    while (span.end > span.at && is_space(span.end[-1])) {
        span.end--;
    }
    for (const char *at = span.at; at < span.end; at++) {
        if ((*at == 'T' || *at == ' ') && is_time(at + 1, span.end)) {
            span.end = at;
            break;
        }
    }
    return span;
}

static int month_named(const char *at, size_t length) {
    static const char *const names[] = {"january", "february", "march", "april", "may", "june", "july", "august",
        "september", "october", "november", "december"};
    for (int m = 0; m < 12; m++) {
        bool same = length == 3 || length == strlen(names[m]);
        for (size_t i = 0; i < length && same; i++) {
            same = (at[i] | 0x20) == names[m][i];
        }
        if (same) {
            return m + 1;
        }
    }
    return 0;
}

struct piece {
    const char *at;
    size_t length;
    int number; /* of digits; of a month's name its month, 0 where it is none */
    bool letters;
};

static const char *take_piece(const char *at, const char *end, struct piece *piece) {
    *piece = (struct piece){.at = at, .letters = at < end && is_letter(*at)};
    while (at < end && (piece->letters ? is_letter(*at) : is_digit(*at)) && piece->length < 10) {
        piece->number = piece->letters || piece->length > 4 ? piece->number : piece->number * 10 + (*at - '0');
        piece->length++;
        at++;
    }
    piece->number = piece->letters ? month_named(piece->at, piece->length) : piece->number;
    return piece->length ? at : NULL;
}

/* Three pieces with the same separator twice, or, about a month's name, none: 01MAR2026. */
static bool take_pieces(struct span span, struct piece pieces[3]) {
    const char *at = take_piece(span.at, span.end, &pieces[0]);
    char separator = at && at < span.end && is_separator(*at) ? *at : '\0';
    at = at && separator ? at + 1 : at;
    at = at ? take_piece(at, span.end, &pieces[1]) : NULL;
    if (!at || (separator && (at == span.end || *at != separator)) || (!separator && !pieces[1].letters)) {
        return false;
    }
    return take_piece(at + (separator ? 1 : 0), span.end, &pieces[2]) == span.end;
}

/* What the three pieces are in an order: DATE_UNREADABLE where they are not its shape. */
static enum date_reading in_order(const struct piece pieces[3], const struct order *order, double *day) {
    int value[4] = {0}; /* by enum part */
    bool short_year = false;
    for (int i = 0; i < 3; i++) {
        enum part part = order->part[i];
        const struct piece *piece = &pieces[i];
        if (piece->letters != (part == PART_MONTH_NAME) || (piece->letters && piece->number == 0)) {
            return DATE_UNREADABLE;
        }
        if (part == PART_YEAR) {
            if (piece->length != 4 && piece->length != 2) {
                return DATE_UNREADABLE;
            }
            short_year = piece->length == 2;
        } else if (!piece->letters && piece->length > 2) {
            return DATE_UNREADABLE;
        }
        value[part] = piece->number;
    }
    int year = value[PART_YEAR], month = value[PART_MONTH_NAME] ? value[PART_MONTH_NAME] : value[PART_MONTH];
    if (short_year) {
        enum { PIVOT = 69 };
        year += year < PIVOT ? 2000 : 1900;
    }
    double found = date_day(year, month, value[PART_DAY]);
    if (short_year && !order->short_year) {
        return isnan(found) ? DATE_UNREADABLE : DATE_SHORT_YEAR;
    }
    *day = found;
    return isnan(found) ? DATE_IMPOSSIBLE : DATE_READ;
}

static bool iso_shape(struct span span) {
    bool fits = span.end - span.at == 10;
    for (int i = 0; i < 10 && fits; i++) {
        fits = i == 4 || i == 7 ? span.at[i] == '-' : is_digit(span.at[i]);
    }
    return fits;
}

bool date_is_iso(const char *text) {
    return iso_shape(span_of(text));
}

enum { SERIAL_FROM = 36526, SERIAL_TO = 54789 };

static bool is_number(struct span span, double *number) {
    char copy[32];
    size_t length = (size_t)(span.end - span.at);
    if (length >= sizeof copy || !is_digit(*span.at)) {
        return false;
    }
    memcpy(copy, span.at, length);
    copy[length] = '\0';
    return strspn(copy, "0123456789.") == length && number_read(copy, '.', number, NULL) == NUMBER_READ;
}

enum date_reading date_read(const char *text, enum date_order order, double *day) {
    double unused, number;
    struct piece pieces[3];
    struct span span = span_of(text);
    day = day ? day : &unused;
    *day = (double)NAN;
    if (span.at == span.end) {
        return DATE_BLANK;
    }
    if (iso_shape(span)) {
        return take_pieces(span, pieces) ? in_order(pieces, &orders[DATE_YMD], day) : DATE_UNREADABLE;
    }
    if (is_number(span, &number)) {
        if (!orders[order].serial) {
            return number >= SERIAL_FROM && number < SERIAL_TO + 1 ? DATE_SERIAL : DATE_UNREADABLE;
        }
        *day = date_of_serial(number, orders[order].from_1904);
        return isnan(*day) ? DATE_IMPOSSIBLE : DATE_READ;
    }
    return orders[order].serial || !take_pieces(span, pieces) ? DATE_UNREADABLE : in_order(pieces, &orders[order], day);
}

bool date_read_exchanged(const char *text, enum date_order order, double *day) {
    static const int other_of[DATE_ORDER_COUNT] = {
        [DATE_DMY] = DATE_MDY, [DATE_MDY] = DATE_DMY, [DATE_DMYY] = DATE_MDYY, [DATE_MDYY] = DATE_DMYY};
    double as_read, other;
    bool two = order == DATE_DMY || order == DATE_MDY || order == DATE_DMYY || order == DATE_MDYY;
    bool both = two && !date_is_iso(text) && date_read(text, order, &as_read) == DATE_READ &&
                date_read(text, (enum date_order)other_of[order], &other) == DATE_READ &&
                (as_read < other || as_read > other);
    *day = both ? other : (double)NAN;
    return both;
}

/* ---- the plan ---- */

const char *moment_name(enum moment_kind kind) {
    static const char *const names[] = {"randomised", "visit", "stopped", "withdrew", "died"};
    return names[kind];
}

enum date_order dates_order(const struct dates *dates, size_t file, const char *site) {
    for (size_t i = 0; site && i < dates->site_count; i++) {
        if (strcmp(dates->sites[i].site, site) == 0) {
            return dates->sites[i].order;
        }
    }
    return dates->file_says[file] ? dates->file_order[file] : dates->order;
}

/* The visit in whose terms a slot stands: its own, else one with the same code or label. */
int dates_moment_of_slot(const struct plan *plan, size_t slot) {
    const struct dates *dates = plan->dates;
    const char *code = plan->slots[slot].code;
    int found = NOWHERE;
    for (size_t m = 0; m < dates->moment_count; m++) {
        const struct moment *moment = &dates->moments[m];
        if (moment->kind != MOMENT_VISIT) {
            continue;
        }
        if (moment->place.slot == slot && moment->place.file == plan->slots[slot].file) {
            return (int)m;
        }
        bool named = code && (strcmp(moment->label, code) == 0 || (moment->visit && strcmp(moment->visit, code) == 0));
        found = named && found == NOWHERE ? (int)m : found;
    }
    return found;
}

int dates_visit_by_window(const struct plan *plan, size_t file, double days, bool *tie) {
    const struct plan_file *from = &plan->files[file];
    int best = NOWHERE;
    double nearest = INFINITY;
    bool equal = false;
    for (size_t c = 0; c < from->codes.count; c++) {
        int m = dates_moment_of_slot(plan, from->first_slot + c);
        const struct moment *moment = m == NOWHERE ? NULL : &plan->dates->moments[m];
        double off = moment ? days - moment->target : 0;
        if (!moment || !(off >= moment->window.low && off <= moment->window.high) || fabs(off) > nearest) {
            continue;
        }
        equal = fabs(off) >= nearest;
        bool later =
            best == NOWHERE || !equal ||
            moment->target > plan->dates->moments[dates_moment_of_slot(plan, from->first_slot + (size_t)best)].target;
        best = later ? (int)c : best;
        nearest = fabs(off);
    }
    if (tie) {
        *tie = equal;
    }
    return best;
}
