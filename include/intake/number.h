/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A cell's text as a number, by the one rule: after trimming ASCII space it is an optional sign, digits with at most
 * one point among them, and an optional exponent. Never hex, infinity, NaN or thousands. Locale-free, thread-safe. */
#ifndef EVENHAND_INTAKE_NUMBER_H
#define EVENHAND_INTAKE_NUMBER_H

enum number_reading {
    NUMBER_READ,
    NUMBER_BLANK,       /* nothing but ASCII space */
    NUMBER_UNREADABLE,  /* anything else, also what overflows a double */
    NUMBER_BELOW_LIMIT, /* "<0.3", "< 0.3": value is the limit */
    NUMBER_ABOVE_LIMIT  /* ">1000": value is the limit */
};

/* decimal '.' or ','. With ',' a cell whose only separator is one comma reads it as the point; a cell with a point
 * still reads as it stands. value: correctly rounded; NaN where blank or unreadable. decimals: digits written after
 * the point (0 where none); may be NULL, as may value. */
enum number_reading number_read(const char *text, char decimal, double *value, int *decimals);
#endif
