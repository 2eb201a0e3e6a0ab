/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "draw/palette.h"

/* Fern and plum are as dark as they are so that the four are four greys too. */
static const struct palette_mark unblinded[PALETTE_ARMS] = {
    {"indigo", "#2F4B9A", "#CFD5E6", SHAPE_CIRCLE, NULL},
    {"rust", "#B8501B", "#EBD3C4", SHAPE_DIAMOND, "7 3"},
    {"fern", "#306A40", "#CCDAD0", SHAPE_TRIANGLE, "2 3"},
    {"plum", "#5F2A67", "#D7CADA", SHAPE_SQUARE, "9 3 2 3"},
};

static const struct palette_mark coded[PALETTE_ARMS] = {
    {"slate", "#56616F", "#C9CDD1", SHAPE_CIRCLE, NULL},
    {"umber", "#8A6D3B", "#D9CBB0", SHAPE_DIAMOND, "7 3"},
    {"moss", "#47552B", "#D3D7C8", SHAPE_TRIANGLE, "2 3"},
    {"stone", "#3F3A36", "#D5D2CE", SHAPE_SQUARE, "9 3 2 3"},
};

static const struct palette_mark pooled = {"ink", PALETTE_INK, "#D2D3D6", SHAPE_CIRCLE, NULL};

const struct palette_mark *palette_arm(bool is_coded, size_t place) {
    return is_coded ? &coded[place % PALETTE_ARMS] : &unblinded[place % PALETTE_ARMS];
}

const struct palette_mark *palette_pooled(void) {
    return &pooled;
}
