/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Dates: texts as days by a declared order, never by a guess; and what the plan says about dates. A day is its number
 * in the proleptic Gregorian calendar (ISO 8601), 0 for 1970-01-01; exact for the years 1 to 9999. Everything here is
 * pure and thread-safe. */
#ifndef EVENHAND_TRIAL_DATES_H
#define EVENHAND_TRIAL_DATES_H
#include "base/memory.h"
#include "trial/plan.h"

/* How a file or a site writes dates. YY: two digits, 69 to 99 are of the 1900s, 00 to 68 of the 2000s (POSIX.1-2017,
 * strptime, %y). Serial numbers are the days spreadsheets count. */
enum date_order {
    DATE_DMY,
    DATE_MDY,
    DATE_YMD,
    DATE_DMONY,
    DATE_DMYY,
    DATE_MDYY,
    DATE_YYMD,
    DATE_DMONYY,
    DATE_SERIAL_1900,
    DATE_SERIAL_1904,
    DATE_ORDER_COUNT
};
const char *date_order_name(
    enum date_order order); /* "D/M/Y", "M/D/Y", "Y/M/D", "D-MON-Y", "D/M/YY" ..., "serial-1900" */
const char *date_order_words(enum date_order order);            /* "day, month, year", "serial numbers from 1900" */
bool date_order_read(const char *name, enum date_order *order); /* any of / - . between the letters */

enum date_reading {
    DATE_READ,
    DATE_BLANK,
    DATE_UNREADABLE, /* no date in this order */
    DATE_IMPOSSIBLE, /* written as one, but there is no such day: 31/02/2026; or a month 14 */
    DATE_SHORT_YEAR, /* written as one with a two-digit year, where the order has four */
    DATE_SERIAL      /* a whole number from 36526 to 54789: a spreadsheet's serial number of 2000 to 2049 */
};

/* Reads a text, spaces around it trimmed. YYYY-MM-DD (ISO 8601) is read in every order, and so is a time of day after
 * any date, which is left out. Between the parts of the other orders stand / - . or a space, the same twice; months are
 * names or their first three letters in English, in any case, where the order has MON. `day` is NaN unless DATE_READ;
 * may be NULL. */
enum date_reading date_read(const char *text, enum date_order order, double *day);
/* The other order of two numbers: day and month exchanged, where both readings are dates and differ. Only D/M and M/D.
 */
bool date_read_exchanged(const char *text, enum date_order order, double *day);
bool date_is_iso(const char *text);

double date_day(int year, int month, int day); /* NaN where there is no such day */
void date_parts(double date, int *year, int *month, int *day);
const char *date_words(struct arena *arena, double day); /* "2026-03-01"; NULL for NaN */
/* The day that a spreadsheet's serial number means: in the system from 1900, whose 60 is the 29 February 1900 that
 * never was (NaN), and in that from 1904 (ECMA-376-1:2016, 18.17.4.1). NaN below the first day. A fraction is a time of
 * day. */
double date_of_serial(double serial, bool from_1904);

/* ---- the plan's key "dates" ---- */

enum moment_kind { MOMENT_RANDOMISED, MOMENT_VISIT, MOMENT_STOPPED, MOMENT_WITHDREW, MOMENT_DIED };
const char *moment_name(enum moment_kind kind); /* "randomised", "visit", "stopped" ... */

struct moment { /* a date of each participant */
    enum moment_kind kind;
    const char *label, *column; /* a visit's label, or "Randomised", "Stopped treatment", "Withdrew", "Died" */
    struct place place;
    int variable;        /* of the plan, VARIABLE_DATE */
    double target;       /* visits: planned days after randomisation; NaN where the plan says none */
    struct range window; /* days about the target, inclusive */
    const char *visit;   /* visits: the code, where the plan gives one */
};

struct site_order {
    const char *site;
    enum date_order order;
};

struct dates {
    enum date_order order;       /* unless the file or the site says otherwise */
    enum date_order *file_order; /* [files] */
    bool *file_says;             /* [files] whether file_order stands */
    struct site_order *sites;    /* before the file's */
    size_t site_count;
    double earliest;        /* day before which no date can lie; NaN where the plan says none */
    double received;        /* day the data came, NaN while unknown: filled by who loads, before frames are built */
    struct moment *moments; /* randomised, visits as the plan lists them, stopped, withdrew, died: those it has */
    size_t moment_count;
    int randomised, stopped, withdrew, died; /* index among moments, NOWHERE where there is none */
};

/* The order in which the plan reads a file's dates of a site (NULL: unknown or none). */
enum date_order dates_order(const struct dates *dates, size_t file, const char *site);
/* The visit whose planned day is nearest to `days` after randomisation among the slots of a file, within its window,
 * the later of two equally near; NOWHERE where it is in none. `tie`: two were equally near; may be NULL. */
int dates_visit_by_window(const struct plan *plan, size_t file, double days, bool *tie);
/* The moment that gives a slot its target and window, NOWHERE where none does. */
int dates_moment_of_slot(const struct plan *plan, size_t slot);
#endif
