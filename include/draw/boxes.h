/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Box plots lying on their side, one row for each arm within each group, over one axis. Above the box its median; in
 * it a cross at the mean; below it every participant's point at its exact value, stacked so that none hides
 * another; outliers filled and named. Rows of more than BOXES_POINTS points become a density strip with the outliers
 * drawn. The difference between arms stands at the right of its group. */
#ifndef EVENHAND_DRAW_BOXES_H
#define EVENHAND_DRAW_BOXES_H
#include "draw/axis.h"
#include "draw/figure.h"
#include "draw/palette.h"

enum { BOXES_POINTS = 2000 };

struct figure_point {
    const char *participant;
    double value;
    bool outlier; /* beyond the fences: filled and named */
};

struct boxes_row {
    const char *arm; /* "A"; NULL where there is one row for all */
    const struct palette_mark *mark;
    const char *counts; /* "61 analysed of 72" */
    /* said instead of a box ("Too few values for a box."), points are drawn still; or NULL */
    const char *sentence;
    double low_whisker, low_quartile, median, mean, high_quartile, high_whisker; /* unused when there is a sentence */
    const struct figure_point *points;
    size_t point_count;
};

struct boxes_contrast {
    const char *label;    /* "B minus A" */
    const char *estimate; /* "+7.6" */
    const char *interval; /* "4.0 to 11.2" */
    const char *sentence; /* instead of the two when not estimable */
};

struct boxes_group {
    const char *level; /* "Female"; NULL where there is one group for all */
    const struct boxes_row *rows;
    size_t row_count;
    const struct boxes_contrast *contrasts;
    size_t contrast_count;
    bool banded; /* a stretch of the axis is shaded behind the group: a planned window */
    double band_low, band_high;
};

struct boxes {
    struct axis_plan axis;
    /* of medians and labels of points: those of the data and one more for medians is the caller's choice */
    int decimals;
    const struct boxes_group *groups;
    size_t group_count;
    const char *interaction; /* a line below: "Sex by group: difference of differences 4.8 (−0.3 to 9.9)."; or NULL */
};

void boxes_svg(const struct boxes *boxes, const struct figure *figure, struct html *html);
#endif
