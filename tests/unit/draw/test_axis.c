/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Ticks by table (worked by hand) and properties of any axis. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <cmocka.h>

#include "draw/axis.h"
#include <math.h>
#include <string.h>

static const struct {
    enum axis_scale scale;
    double low, high;
    size_t wanted;
    bool with_sign, exact;
    const char *labels;
} cases[] = {
    {AXIS_LINEAR, -41.2, 26.9, 6, true, false, "\u221250 \u221240 \u221230 \u221220 \u221210 0 +10 +20 +30"},
    {AXIS_LINEAR, -41.2, 26.9, 6, true, true, "\u221240 \u221230 \u221220 \u221210 0 +10 +20"},
    {AXIS_LINEAR, -9.4, 1.2, 7, false, false, "\u221210 \u22128 \u22126 \u22124 \u22122 0 2"},
    {AXIS_LINEAR, 0.0, 1.0, 5, false, false, "0.0 0.2 0.4 0.6 0.8 1.0"},
    {AXIS_LINEAR, 5.0, 5.0, 5, false, false, "4.4 4.6 4.8 5.0 5.2 5.4 5.6"},
    {AXIS_LINEAR, 0.0, 0.0, 4, false, false, "\u22121.0 \u22120.5 0.0 0.5 1.0"},
    {AXIS_LINEAR, NAN, 3.0, 5, false, false, "0.0 0.2 0.4 0.6 0.8 1.0"},
    {AXIS_LINEAR, 18.0, 85.0, 7, false, false, "10 20 30 40 50 60 70 80 90"},
    {AXIS_LOG10, 0.3, 41.0, 7, false, false, "0.2 0.5 1 2 5 10 20 50"},
    {AXIS_LOG10, 0.5, 2.0, 5, false, false, "0.5 1 2"},
    {AXIS_LOG10, 139.0, 178.0, 4, false, false, "130 140 150 160 170 180"},
    {AXIS_LOG10, 0.9, 2.6, 2, false, false, "1 2 3"},
    {AXIS_LOG10, 0.2, 5.0, 2, false, false, "0.2 0.5 1 2 5"},
    {AXIS_LOG10, 0.003, 9000.0, 6, false, false, "0.01 0.1 1 10 100 1000 10000"},
    {AXIS_LOG10, 1e-9, 1e9, 5, false, false, "10\u207b\u2079 10\u207b\u2076 0.001 1 1000 1000000 10\u2079"},
    {AXIS_LINEAR, 0.0, 4e8, 2, true, false, "0 +2\u00d710\u2078 +4\u00d710\u2078"},
    {AXIS_LINEAR, -1e-6, 0.0, 2, false, false, "\u221210\u207b\u2076 \u22125\u00d710\u207b\u2077 0"},
    {AXIS_LOG10, 3.0, 3.0, 4, false, false, "1 2 5 10"},
    {AXIS_LOG10, -1.0, 10.0, 6, false, false, "0.01 0.02 0.05 0.1 0.2 0.5 1 2 5 10"},
};

static void test_ticks(void **state) {
    (void)state;
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        struct axis axis;
        (cases[i].exact ? axis_init_exact : axis_init)(
            &axis, cases[i].scale, cases[i].low, cases[i].high, 100.0, 800.0, cases[i].wanted);
        axis.with_sign = cases[i].with_sign;
        struct text out;
        text_init(&out);
        for (size_t t = 0; t < axis.tick_count; t++) {
            if (axis_labelled(&axis, axis.ticks[t])) {
                text_string(&out, out.length ? " " : "");
                axis_label(&axis, axis.ticks[t], &out);
            }
        }
        assert_string_equal(out.data, cases[i].labels);
        text_release(&out);
    }
}

/* Any range: 2 to AXIS_TICKS ticks, in order, on the axis, evenly placed, and the data within. */
static void test_any_range(void **state) {
    (void)state;
    for (int power = -12; power <= 12; power++) {
        for (int k = 1; k < 60; k++) {
            double low = (k - 30) * pow(10.0, power), high = low + k * k * 0.37 * pow(10.0, power);
            for (size_t wanted = 2; wanted <= 9; wanted++) {
                struct axis axis;
                axis_init(&axis, AXIS_LINEAR, low, high, 0.0, 700.0, wanted);
                assert_true(axis.tick_count >= 2 && axis.tick_count <= AXIS_TICKS);
                assert_int_equal(axis_beyond(&axis, low), 0);
                assert_int_equal(axis_beyond(&axis, high), 0);
                double gap = axis_place(&axis, axis.ticks[1]) - axis_place(&axis, axis.ticks[0]);
                for (size_t t = 1; t < axis.tick_count; t++) {
                    assert_true(axis.ticks[t] > axis.ticks[t - 1]);
                    double here = axis_place(&axis, axis.ticks[t]) - axis_place(&axis, axis.ticks[t - 1]);
                    assert_true(fabs(here - gap) < 1e-6);
                }
            }
        }
    }
}

/* Log axes keep ticks at 2 and 5 where only the powers are labelled. */
static void test_log_ticks(void **state) {
    (void)state;
    struct axis axis;
    axis_init(&axis, AXIS_LOG10, 0.02, 100.0, 0.0, 400.0, 4);
    static const double ticks[] = {0.02, 0.05, 0.1, 0.2, 0.5, 1, 2, 5, 10, 20, 50, 100};
    assert_int_equal(axis.tick_count, 12);
    for (size_t t = 0; t < axis.tick_count; t++) {
        assert_true(fabs(axis.ticks[t] - ticks[t]) < 1e-12);
        assert_int_equal(axis_labelled(&axis, axis.ticks[t]), t % 3 == 2);
    }
}

static void test_places(void **state) {
    (void)state;
    struct axis axis;
    axis_init(&axis, AXIS_LINEAR, 0.0, 10.0, 100.0, 600.0, 5);
    assert_true(fabs(axis_place(&axis, 5.0) - 350.0) < 1e-9);
    assert_true(axis_place(&axis, -3.0) == 100.0 && axis_place(&axis, 1e9) == 600.0);
    assert_int_equal(axis_beyond(&axis, -3.0), -1);
    assert_int_equal(axis_beyond(&axis, 10.5), 1);
    axis_init(&axis, AXIS_LOG10, 0.1, 10.0, 0.0, 200.0, 5);
    assert_true(fabs(axis_place(&axis, 1.0) - 100.0) < 1e-9);
    assert_true(axis_place(&axis, 0.0) == 0.0);
    assert_int_equal(axis_beyond(&axis, 0.0), -1);
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_ticks),
        cmocka_unit_test(test_any_range),
        cmocka_unit_test(test_log_ticks),
        cmocka_unit_test(test_places),
    };
    return cmocka_run_group_tests_name("draw/axis", tests, NULL, NULL);
}
