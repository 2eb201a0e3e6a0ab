/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The conversions in force as exhibits write them: factor, source and count of cells. */
#ifndef EVENHAND_EXHIBITS_CONVERSIONS_H
#define EVENHAND_EXHIBITS_CONVERSIONS_H
#include "exhibits/registry.h"

void conversions_json(const struct view *view, struct json *json); /* "conversions": [...] of an object that is open */
struct table *conversions_table(const struct view *view);          /* NULL where there are none */
#endif
