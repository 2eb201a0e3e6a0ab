/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Discrepancies as exhibits write them. */
#ifndef EVENHAND_EXHIBITS_DOUBTFUL_H
#define EVENHAND_EXHIBITS_DOUBTFUL_H
#include "exhibits/registry.h"

void discrepancy_json(const struct discrepancy *discrepancy, struct json *json); /* an object */
const struct check *check_of(const char *name);
bool discrepancy_concerns(const struct discrepancy *discrepancy, const char *participant);
#endif
