/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The one rule by which a cell is a number. Expected values are the compiler's own reading of the same literal
 * (correct rounding is required of it by IEEE 754 and done by GCC with MPFR); the hard cases are named. */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <cmocka.h>
#include "intake/number.h"
#include <locale.h>
#include <math.h>
#include <stdbool.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

struct row {
    const char *text;
    char decimal;
    enum number_reading reading;
    double value;
    int decimals;
};

static const struct row rows[] = {
    {"0", '.', NUMBER_READ, 0, 0},
    {"142", '.', NUMBER_READ, 142, 0},
    {"  142\t", '.', NUMBER_READ, 142, 0},
    {"\r\n7\v\f", '.', NUMBER_READ, 7, 0},
    {"+1.50", '.', NUMBER_READ, 1.5, 2},
    {"-0.3", '.', NUMBER_READ, -0.3, 1},
    {"5.", '.', NUMBER_READ, 5, 0},
    {".5", '.', NUMBER_READ, .5, 1},
    {"007.250", '.', NUMBER_READ, 7.25, 3},
    {"1.5e3", '.', NUMBER_READ, 1500, 1},
    {"15E-1", '.', NUMBER_READ, 1.5, 0},
    {"1e+22", '.', NUMBER_READ, 1e22, 0},
    {"1e23", '.', NUMBER_READ, 1e23, 0}, /* the smallest power of ten that is no double */
    {"9007199254740993", '.', NUMBER_READ, 9007199254740993.0, 0},      /* 2^53 + 1: a tie, to even */
    {"9007199254740993.00000001", '.', NUMBER_READ, 9007199254740993.00000001, 8}, /* just above the tie */
    {"123456789012345678901234567890", '.', NUMBER_READ, 123456789012345678901234567890.0, 0},
    {"2.2250738585072011e-308", '.', NUMBER_READ, 2.2250738585072011e-308, 16}, /* next to the subnormals */
    {"1.7976931348623157e308", '.', NUMBER_READ, 1.7976931348623157e308, 16},   /* the largest double */
    {"4.9406564584124654e-324", '.', NUMBER_READ, 4.9406564584124654e-324, 16}, /* the smallest */
    {"1e-9999999999999", '.', NUMBER_READ, 0, 0},
    {"0e99999999999999", '.', NUMBER_READ, 0, 0},
    {"0.1", '.', NUMBER_READ, 0.1, 1},
    {"", '.', NUMBER_BLANK, NAN, 0},
    {" \t ", '.', NUMBER_BLANK, NAN, 0},
    {"1e309", '.', NUMBER_UNREADABLE, NAN, 0},
    {"-1e99999999999999999999", '.', NUMBER_UNREADABLE, NAN, 0},
    {"0x1F", '.', NUMBER_UNREADABLE, NAN, 0},
    {"inf", '.', NUMBER_UNREADABLE, NAN, 0},
    {"-Infinity", '.', NUMBER_UNREADABLE, NAN, 0},
    {"nan", '.', NUMBER_UNREADABLE, NAN, 0},
    {"NA", '.', NUMBER_UNREADABLE, NAN, 0},
    {"1,234", '.', NUMBER_UNREADABLE, NAN, 0},
    {"1,234.5", '.', NUMBER_UNREADABLE, NAN, 0},
    {"1 234", '.', NUMBER_UNREADABLE, NAN, 0},
    {"1'234", '.', NUMBER_UNREADABLE, NAN, 0},
    {"1.2.3", '.', NUMBER_UNREADABLE, NAN, 0},
    {".", '.', NUMBER_UNREADABLE, NAN, 0},
    {"-", '.', NUMBER_UNREADABLE, NAN, 0},
    {"+-1", '.', NUMBER_UNREADABLE, NAN, 0},
    {"- 1", '.', NUMBER_UNREADABLE, NAN, 0},
    {"e5", '.', NUMBER_UNREADABLE, NAN, 0},
    {"1e", '.', NUMBER_UNREADABLE, NAN, 0},
    {"1e+", '.', NUMBER_UNREADABLE, NAN, 0},
    {"1e1.5", '.', NUMBER_UNREADABLE, NAN, 0},
    {"1f", '.', NUMBER_UNREADABLE, NAN, 0},
    {"142 mmHg", '.', NUMBER_UNREADABLE, NAN, 0},
    {"12%", '.', NUMBER_UNREADABLE, NAN, 0},
    {"\xE2\x88\x92" "3", '.', NUMBER_UNREADABLE, NAN, 0}, /* U+2212: typeset, not typed */
    {"\xC2\xA0" "3", '.', NUMBER_UNREADABLE, NAN, 0},     /* no-break space is no ASCII space */
    {"\xD9\xA3", '.', NUMBER_UNREADABLE, NAN, 0},         /* a digit, but not of ASCII */
    {"<0.3", '.', NUMBER_BELOW_LIMIT, 0.3, 1},
    {" < 0.30 ", '.', NUMBER_BELOW_LIMIT, 0.3, 2},
    {">1000", '.', NUMBER_ABOVE_LIMIT, 1000, 0},
    {"<", '.', NUMBER_UNREADABLE, NAN, 0},
    {"<=0.3", '.', NUMBER_UNREADABLE, NAN, 0},
    {"<<0.3", '.', NUMBER_UNREADABLE, NAN, 0},
    {"0.3<", '.', NUMBER_UNREADABLE, NAN, 0},
    {">1e999", '.', NUMBER_UNREADABLE, NAN, 0},
    {"1,5", ',', NUMBER_READ, 1.5, 1},
    {"-3,25e1", ',', NUMBER_READ, -32.5, 2},
    {",5", ',', NUMBER_READ, .5, 1},
    {"1.5", ',', NUMBER_READ, 1.5, 1},
    {"1,234.5", ',', NUMBER_UNREADABLE, NAN, 0},
    {"1.234,5", ',', NUMBER_UNREADABLE, NAN, 0},
    {"1,2,3", ',', NUMBER_UNREADABLE, NAN, 0},
    {"<0,3", ',', NUMBER_BELOW_LIMIT, 0.3, 1},
    {"0,10000000000000000000000000000000000001", ',', NUMBER_READ, 0.1, 38},
};

static void reads_each_row(void **state) {
    (void)state;
    for (size_t i = 0; i < sizeof rows / sizeof *rows; i++) {
        const struct row *row = &rows[i];
        double value = 1;
        int decimals = -1;
        enum number_reading reading = number_read(row->text, row->decimal, &value, &decimals);
        bool same = memcmp(&value, &row->value, sizeof value) == 0 || (isnan(value) && isnan(row->value));
        if (reading != row->reading || !same || decimals != row->decimals) {
            fail_msg("\"%s\" with '%c': reading %d, value %.17g, decimals %d", row->text, row->decimal, (int)reading,
                value, decimals);
        }
        assert_int_equal(number_read(row->text, row->decimal, NULL, NULL), row->reading);
    }
}

/* Every double printed with 17 digits reads back as itself (IEEE 754-2008, 5.12.2). */
static void round_trips(void **state) {
    (void)state;
    uint64_t bits = 88172645463325252u;
    for (int i = 0; i < 200000; i++) {
        bits ^= bits << 13; /* Marsaglia 2003, "Xorshift RNGs", J. Stat. Softw. 8(14) */
        bits ^= bits >> 7;
        bits ^= bits << 17;
        double wanted, got;
        memcpy(&wanted, &bits, sizeof wanted);
        if (!isfinite(wanted)) {
            continue;
        }
        char text[64];
        snprintf(text, sizeof text, i % 2 ? "%.17g" : "%.4f", i % 2 ? wanted : fmod(wanted, 1e9));
        wanted = i % 2 ? wanted : strtod(text, NULL);
        assert_int_equal(number_read(text, '.', &got, NULL), NUMBER_READ);
        if (memcmp(&got, &wanted, sizeof got) != 0) {
            fail_msg("%s reads as %.17g", text, got);
        }
    }
}

/* Long texts leave the small buffer: 1 and 5,000 zeros, divided by as much. */
static void reads_long_texts(void **state) {
    (void)state;
    static char text[6000];
    memset(text, '0', 5001);
    text[0] = '1';
    strcpy(text + 5001, "e-5000");
    double value;
    assert_int_equal(number_read(text, '.', &value, NULL), NUMBER_READ);
    assert_true(value == 1.0);
}

/* Another locale changes nothing. The test says so where the machine has none with a comma. */
static void ignores_the_locale(void **state) {
    (void)state;
    static const char *const names[] = {"de_DE.UTF-8", "de_DE.utf8", "fr_FR.UTF-8", "nl_NL.UTF-8"};
    bool found = false;
    for (size_t i = 0; i < sizeof names / sizeof *names && !found; i++) {
        found = setlocale(LC_ALL, names[i]) != NULL;
    }
    if (!found) {
        print_message("no locale with a decimal comma here: the C locale alone was tried\n");
    }
    double value;
    assert_int_equal(number_read("123456789012345678901.5", '.', &value, NULL), NUMBER_READ);
    setlocale(LC_ALL, "C");
    assert_true(value == 123456789012345678901.5);
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(reads_each_row),
        cmocka_unit_test(round_trips),
        cmocka_unit_test(reads_long_texts),
        cmocka_unit_test(ignores_the_locale),
    };
    return cmocka_run_group_tests_name("intake/number", tests, NULL, NULL);
}
