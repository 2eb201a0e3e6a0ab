/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Numbers and dates that a file holds in binary, as the text a cell gets. Locale-free, thread-safe. Inside intake only. */
#ifndef EVENHAND_SERVER_INTAKE_SHOWN_H
#define EVENHAND_SERVER_INTAKE_SHOWN_H
#include <stdbool.h>
#include <stdint.h>

enum { SHOWN_ROOM = 48 };
#define MILLISECONDS_PER_DAY INT64_C(86400000)

/* The shortest decimal text that reads back as the same double (float). Digits alone between 1e-7 and 1e21 in size, with
 * an exponent beyond ("1.5e-9"). value: finite. */
void shown_number(char out[SHOWN_ROOM], double value);
void shown_float(char out[SHOWN_ROOM], float value);
/* The same with 15 significant digits at most, as a spreadsheet shows numbers, so that 0.30000000000000004 is "0.3"; whole
 * numbers below 2^53 keep all their digits, for they may be identifiers. */
void shown_typed(char out[SHOWN_ROOM], double value);

/* Days from 1970-01-01 to a day of the proleptic Gregorian calendar, month 1 to 12. */
int64_t days_of(int year, int month, int day);
/* ISO 8601 date of that day: "2026-03-14". False outside the years 0001 to 9999. */
bool shown_date(char out[SHOWN_ROOM], int64_t days);
/* Milliseconds since 1970-01-01: the date, and the time where it is not midnight: "2026-03-14T09:30:00". */
bool shown_date_time(char out[SHOWN_ROOM], int64_t milliseconds);
/* A time of day or an elapsed time: "09:30:00", "26:30:00", "00:00:01.250". milliseconds >= 0. */
void shown_time(char out[SHOWN_ROOM], int64_t milliseconds);
#endif
