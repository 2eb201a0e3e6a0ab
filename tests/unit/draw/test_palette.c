/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Colours: contrast with paper by the formula of WCAG 2.1 (relative luminance, 1.4.3 and 1.4.11), and distance between
 * arms, in CIELAB (CIE 1976), as seen, in grey, and by people without long- or middle-wave cones. The two simulating
 * matrices are those of Machado, Oliveira and Fernandes 2009 (IEEE TVCG 15:1283) for severity 1.0, on linear RGB; their
 * digits are from memory. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <cmocka.h>

#include "draw/palette.h"
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

struct colour {
    double part[3]; /* linear red, green, blue, 0 to 1 */
};

static struct colour read_colour(const char *hex) {
    struct colour colour;
    unsigned long bits = strtoul(hex + 1, NULL, 16);
    assert_int_equal(strlen(hex), 7);
    for (int i = 0; i < 3; i++) {
        double part = (double)((bits >> (16 - 8 * i)) & 255) / 255.0;
        colour.part[i] = part <= 0.03928 ? part / 12.92 : pow((part + 0.055) / 1.055, 2.4);
    }
    return colour;
}

static double luminance(struct colour colour) {
    return 0.2126 * colour.part[0] + 0.7152 * colour.part[1] + 0.0722 * colour.part[2];
}

static double contrast(const char *a, const char *b) {
    double one = luminance(read_colour(a)), two = luminance(read_colour(b));
    return (fmax(one, two) + 0.05) / (fmin(one, two) + 0.05);
}

static const double views[][3][3] = {
    {{1, 0, 0}, {0, 1, 0}, {0, 0, 1}},
    {{0.2126, 0.7152, 0.0722}, {0.2126, 0.7152, 0.0722}, {0.2126, 0.7152, 0.0722}},
    {{0.152286, 1.052583, -0.204868}, {0.114503, 0.786281, 0.099216}, {-0.003882, -0.048116, 1.051998}},
    {{0.367322, 0.860646, -0.227968}, {0.280085, 0.672501, 0.047413}, {-0.011820, 0.042940, 0.968881}},
};
static const char *const view_names[] = {"as seen", "in grey", "protanopia", "deuteranopia"};

static struct colour seen(struct colour colour, size_t view) {
    struct colour changed;
    for (int i = 0; i < 3; i++) {
        double part = 0.0;
        for (int j = 0; j < 3; j++) {
            part += views[view][i][j] * colour.part[j];
        }
        changed.part[i] = fmin(fmax(part, 0.0), 1.0);
    }
    return changed;
}

static double lab_curve(double t) {
    return t > 216.0 / 24389.0 ? cbrt(t) : (24389.0 / 27.0 * t + 16.0) / 116.0;
}

/* sRGB primaries and white D65 (IEC 61966-2-1). */
static void to_lab(struct colour colour, double lab[3]) {
    const double *c = colour.part;
    double x = (0.4124 * c[0] + 0.3576 * c[1] + 0.1805 * c[2]) / 0.9505;
    double y = 0.2126 * c[0] + 0.7152 * c[1] + 0.0722 * c[2];
    double z = (0.0193 * c[0] + 0.1192 * c[1] + 0.9505 * c[2]) / 1.089;
    lab[0] = 116.0 * lab_curve(y) - 16.0;
    lab[1] = 500.0 * (lab_curve(x) - lab_curve(y));
    lab[2] = 200.0 * (lab_curve(y) - lab_curve(z));
}

static double distance(const char *a, const char *b, size_t view) {
    double one[3], two[3];
    to_lab(seen(read_colour(a), view), one);
    to_lab(seen(read_colour(b), view), two);
    return sqrt(pow(one[0] - two[0], 2) + pow(one[1] - two[1], 2) + pow(one[2] - two[2], 2));
}

static void test_contrast(void **state) {
    (void)state;
    static const char *const texts[] = {PALETTE_INK, PALETTE_QUIET};
    for (size_t i = 0; i < 2; i++) {
        assert_true(contrast(texts[i], PALETTE_PAPER) >= 4.5);
        assert_true(contrast(texts[i], PALETTE_BAND) >= 4.5);
    }
    for (size_t i = 0; i < PALETTE_ARMS; i++) { /* arms' colours are text too: medians and labels */
        for (int coded = 0; coded < 2; coded++) {
            const struct palette_mark *mark = palette_arm(coded, i);
            double ratio = contrast(mark->colour, PALETTE_PAPER);
            if (ratio < 4.5) {
                print_message("%s %.2f\n", mark->name, ratio);
            }
            assert_true(ratio >= 4.5);
            assert_true(contrast(mark->colour, mark->tint) >= 3.0); /* the rim of a point against its fill */
        }
    }
    assert_true(contrast("#000000", "#FFFFFF") > 20.99); /* the formula itself: 21 by definition */
}

/* A difference of 5 is plain to see side by side (one of 2.3 is just noticeable: Mahy and others 1994, from memory). */
static void test_apart(void **state) {
    (void)state;
    int close = 0;
    for (int coded = 0; coded < 2; coded++) {
        for (size_t i = 0; i < PALETTE_ARMS; i++) {
            for (size_t j = i + 1; j < PALETTE_ARMS; j++) {
                const struct palette_mark *a = palette_arm(coded, i), *b = palette_arm(coded, j);
                for (size_t view = 0; view < 4; view++) {
                    double apart = distance(a->colour, b->colour, view);
                    if (apart < 5.0) {
                        print_message("%s and %s %s: %.1f\n", a->name, b->name, view_names[view], apart);
                        close++;
                    }
                }
                assert_true(a->shape != b->shape);
                assert_true(!a->dash || !b->dash || strcmp(a->dash, b->dash) != 0);
            }
        }
    }
    assert_int_equal(close, 0);
}

/* No colour of a coded arm may be taken for one of an unblinded arm. */
static void test_coded_is_not_unblinded(void **state) {
    (void)state;
    for (size_t i = 0; i < PALETTE_ARMS; i++) {
        for (size_t j = 0; j < PALETTE_ARMS; j++) {
            assert_true(distance(palette_arm(true, i)->colour, palette_arm(false, j)->colour, 0) >= 10.0);
        }
        assert_ptr_equal(palette_arm(true, i), palette_arm(true, i + PALETTE_ARMS));
    }
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_contrast),
        cmocka_unit_test(test_apart),
        cmocka_unit_test(test_coded_is_not_unblinded),
    };
    return cmocka_run_group_tests_name("draw/palette", tests, NULL, NULL);
}
