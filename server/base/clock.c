/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/clock.h"
#include <time.h>

void clock_utc(char text[CLOCK_SIZE]) {
    time_t now = time(NULL);
    struct tm parts;
    gmtime_r(&now, &parts);
    strftime(text, CLOCK_SIZE, "%Y-%m-%dT%H:%M:%SZ", &parts);
}

double clock_seconds(void) {
    struct timespec now;
    clock_gettime(CLOCK_MONOTONIC, &now);
    return (double)now.tv_sec + 1e-9 * (double)now.tv_nsec;
}
