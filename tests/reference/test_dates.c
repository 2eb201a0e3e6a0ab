/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Day numbers against base R's as.Date (values/dates.csv, made by dates.R) and against glibc's timegm over 800 years.
 */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "reference.h"
#include "trial/dates.h"
#include <time.h>

static void test_as_date(void **state) {
    (void)state;
    struct table table = table_read("tests/reference/values/dates.csv");
    assert_true(table.rows > 600);
    for (size_t i = 0; i < table.rows; i++) {
        enum date_order order;
        double day;
        const char *text = table_cell(&table, i, "text");
        assert_true(date_order_read(table_cell(&table, i, "order"), &order));
        if (date_read(text, order, &day) != DATE_READ) {
            fail_msg("%s is not read", text);
        }
        near(day, table_number(&table, i, "day"), 0, 0, text);
    }
    table_release(&table);
}

/* POSIX.1-2017, "seconds since the epoch"; glibc's timegm counts back before 1970 and beyond 2038. */
static void test_timegm(void **state) {
    (void)state;
    size_t days = 0;
    for (int year = 1600; year < 2400; year++) {
        for (int month = 1; month <= 12; month++) {
            for (int day = 1; day <= 31; day++) {
                struct tm tm = {.tm_year = year - 1900, .tm_mon = month - 1, .tm_mday = day};
                time_t seconds = timegm(&tm);
                bool there = tm.tm_mon == month - 1; /* timegm rolls over a day that is not there */
                double number = date_day(year, month, day);
                assert_int_equal(there, !isnan(number));
                if (there) {
                    int y, m, d;
                    assert_true(number * 86400 >= (double)seconds && number * 86400 <= (double)seconds);
                    date_parts(number, &y, &m, &d);
                    assert_true(y == year && m == month && d == day);
                    days++;
                }
            }
        }
    }
    assert_int_equal(days, 2 * 146097); /* 400 years of the Gregorian calendar are 146,097 days */
}

int main(void) {
    const struct CMUnitTest tests[] = {cmocka_unit_test(test_as_date), cmocka_unit_test(test_timegm)};
    return cmocka_run_group_tests_name("reference/dates", tests, NULL, NULL);
}
