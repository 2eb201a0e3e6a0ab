/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The flow of participants (after the CONSORT statement's diagram): stages from top to bottom, a box for all or one
 * for each arm, with those who leave at the side. Sentences are the caller's; the numbers are drawn as given. */
#ifndef EVENHAND_DRAW_FLOW_H
#define EVENHAND_DRAW_FLOW_H
#include "draw/figure.h"
#include "draw/palette.h"

struct flow_exclusion {
    const char *reason; /* "no value at 26 weeks" */
    size_t count;
};

/* One box: how many are in it, and who left between it and the next. */
struct flow_box {
    size_t count;
    const struct flow_exclusion *exclusions;
    size_t exclusion_count;
};

struct flow_stage {
    const char *label;           /* "randomised" */
    struct flow_box total;       /* drawn when there are no arms at this stage */
    const struct flow_box *arms; /* flow.arm_count of them, or NULL */
};

struct flow_arm {
    const char *label;
    const struct palette_mark *mark;
};

struct flow {
    const struct flow_arm *arms;
    size_t arm_count;
    const struct flow_stage *stages;
    size_t stage_count;
};

void flow_svg(const struct flow *flow, const struct figure *figure, struct html *html);
#endif
