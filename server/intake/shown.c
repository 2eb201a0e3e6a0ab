/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "server/intake/shown.h"
#include "base/memory.h"
#include "intake/number.h"
#include <inttypes.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* The decimal digits of a number: 0.d1d2d3... times ten to the power `point`. */
struct digits {
    char digit[24];
    int count, point;
    bool negative;
};

/* printf rounds correctly; only its digits and exponent are taken, so its locale's point does not matter. */
static void digits_of(struct digits *digits, double value, int significant) {
    char room[SHOWN_ROOM];
    *digits = (struct digits){.negative = signbit(value)};
    snprintf(room, sizeof room, "%.*e", significant - 1, fabs(value));
    const char *at = room;
    for (; *at && *at != 'e'; at++) {
        if (*at >= '0' && *at <= '9') {
            digits->digit[digits->count++] = *at;
        }
    }
    digits->point = (int)strtol(at + 1, NULL, 10) + 1;
    while (digits->count > 1 && digits->digit[digits->count - 1] == '0') {
        digits->count--;
    }
}

static void lay_out(char out[SHOWN_ROOM], const struct digits *digits) {
    const char *sign = digits->negative ? "-" : "";
    int count = digits->count, point = digits->point;
    if (point <= -7 || point > 21) {
        snprintf(out, SHOWN_ROOM, "%s%c%s%.*se%d", sign, digits->digit[0], count > 1 ? "." : "", count - 1,
            digits->digit + 1, point - 1);
    } else if (point <= 0) {
        snprintf(out, SHOWN_ROOM, "%s0.%.*s%.*s", sign, -point, "0000000", count, digits->digit);
    } else if (point >= count) {
        snprintf(out, SHOWN_ROOM, "%s%.*s%.*s", sign, count, digits->digit, point - count, "000000000000000000000");
    } else {
        snprintf(out, SHOWN_ROOM, "%s%.*s.%.*s", sign, point, digits->digit, count - point, digits->digit + point);
    }
}

static bool is_whole(double value) {
    return fabs(value) < 9007199254740992.0 && (double)(int64_t)value == value;
}

static void show_whole(char out[SHOWN_ROOM], double value) {
    snprintf(out, SHOWN_ROOM, "%" PRId64, (int64_t)value);
}

/* Any decimal of 15 digits comes back from a double, so cutting zeros off 15 digits gives the shortest text if there is one
 * of 15 at most; 17 always read back (IEEE 754-2019, 5.12.2). */
void shown_number(char out[SHOWN_ROOM], double value) {
    BUG_IF(!isfinite(value));
    if (is_whole(value)) {
        show_whole(out, value);
        return;
    }
    for (int significant = 15; significant <= 17; significant++) {
        struct digits digits;
        double back;
        digits_of(&digits, value, significant);
        lay_out(out, &digits);
        if (number_read(out, '.', &back, NULL) == NUMBER_READ && fabs(back - value) <= 0) {
            return;
        }
    }
}

void shown_float(char out[SHOWN_ROOM], float value) {
    BUG_IF(!isfinite(value));
    if (is_whole((double)value)) {
        show_whole(out, (double)value);
        return;
    }
    for (int significant = 6; significant <= 9; significant++) {
        struct digits digits;
        double back;
        digits_of(&digits, (double)value, significant);
        lay_out(out, &digits);
        if (number_read(out, '.', &back, NULL) == NUMBER_READ && fabsf((float)back - value) <= 0) {
            return;
        }
    }
}

void shown_typed(char out[SHOWN_ROOM], double value) {
    BUG_IF(!isfinite(value));
    if (is_whole(value)) {
        show_whole(out, value);
        return;
    }
    struct digits digits;
    digits_of(&digits, value, 15);
    lay_out(out, &digits);
}

/* Source of both: Hinnant, "chrono-Compatible Low-Level Date Algorithms" (public, 2013): eras of 400 years, years from
 * March. */
int64_t days_of(int year, int month, int day) {
    int64_t y = (int64_t)year - (month <= 2);
    int64_t era = (y >= 0 ? y : y - 399) / 400, of_era = y - era * 400;
    int64_t of_year = (153 * (month + (month > 2 ? -3 : 9)) + 2) / 5 + day - 1;
    return era * 146097 + of_era * 365 + of_era / 4 - of_era / 100 + of_year - 719468;
}

bool shown_date(char out[SHOWN_ROOM], int64_t days) {
    if (days < -719162 || days > 2932896) { /* 0001-01-01, 9999-12-31 */
        return false;
    }
    int64_t from_march = days + 719468, era = from_march / 146097, of_era = from_march - era * 146097;
    int64_t year_of_era = (of_era - of_era / 1460 + of_era / 36524 - of_era / 146096) / 365;
    int64_t of_year = of_era - (365 * year_of_era + year_of_era / 4 - year_of_era / 100);
    int64_t shifted = (5 * of_year + 2) / 153, month = shifted < 10 ? shifted + 3 : shifted - 9;
    int64_t day = of_year - (153 * shifted + 2) / 5 + 1, year = year_of_era + era * 400 + (month <= 2);
    snprintf(out, SHOWN_ROOM, "%04d-%02d-%02d", (int)year, (int)month, (int)day);
    return true;
}

void shown_time(char out[SHOWN_ROOM], int64_t milliseconds) {
    BUG_IF(milliseconds < 0);
    int64_t seconds = milliseconds / 1000, rest = milliseconds % 1000;
    int length = snprintf(out, SHOWN_ROOM, "%02" PRId64 ":%02d:%02d", seconds / 3600, (int)(seconds / 60 % 60),
        (int)(seconds % 60));
    if (rest) {
        snprintf(out + length, (size_t)(SHOWN_ROOM - length), ".%03d", (int)rest);
    }
}

bool shown_date_time(char out[SHOWN_ROOM], int64_t milliseconds) {
    int64_t rest = milliseconds % MILLISECONDS_PER_DAY;
    rest += rest < 0 ? MILLISECONDS_PER_DAY : 0;
    char time[SHOWN_ROOM];
    if (!shown_date(out, (milliseconds - rest) / MILLISECONDS_PER_DAY)) {
        return false;
    }
    if (rest) {
        shown_time(time, rest);
        size_t length = strlen(out);
        snprintf(out + length, SHOWN_ROOM - length, "T%.30s", time);
    }
    return true;
}
