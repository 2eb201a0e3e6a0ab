/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Time as records need it: UTC, ISO 8601, to the second; and a monotonic stopwatch. */
#ifndef EVENHAND_BASE_CLOCK_H
#define EVENHAND_BASE_CLOCK_H

enum { CLOCK_SIZE = 32 };

void clock_utc(char text[CLOCK_SIZE]);  /* "2026-12-01T18:30:05Z" */
double clock_seconds(void);             /* monotonic, for durations only */
#endif
