/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Transport files and files of statistical systems as cells, by the ReadStat library; see intake/read.h. Inside intake
 * only. */
#ifndef EVENHAND_SERVER_INTAKE_STATISTICAL_H
#define EVENHAND_SERVER_INTAKE_STATISTICAL_H
#include "intake/cells.h"

struct statistical_format;

/* The format that the bytes begin with, NULL where it is none of these. */
const struct statistical_format *statistical_recognise(const char *bytes, size_t length);
/* For a person: "transport file (.xpt)". */
const char *statistical_word(const struct statistical_format *format);
bool statistical_read(struct cells *cells, const struct statistical_format *format, const char *bytes, size_t length,
    const char *name, struct fault *fault);
#endif
