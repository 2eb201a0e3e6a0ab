/* SPDX-License-Identifier: GPL-3.0-or-later */
/* One line for each exhibit; the registry puts them in order. */
#ifndef EVENHAND_EXHIBITS_LIST_H
#define EVENHAND_EXHIBITS_LIST_H
#include "exhibits/registry.h"

extern const struct exhibit exhibit_columns;
extern const struct exhibit exhibit_flow;
extern const struct exhibit exhibit_sites;
extern const struct exhibit exhibit_baseline;
extern const struct exhibit exhibit_dates;
extern const struct exhibit exhibit_derived;
extern const struct exhibit exhibit_discrepancies;
extern const struct exhibit exhibit_missing_grid;
extern const struct exhibit exhibit_missing_by_arm;
extern const struct exhibit exhibit_events;
extern const struct exhibit exhibit_distribution;
extern const struct exhibit exhibit_before_after;
extern const struct exhibit exhibit_change_by_arm;
extern const struct exhibit exhibit_effect;
extern const struct exhibit exhibit_decisions;
extern const struct exhibit exhibit_deviations;
extern const struct exhibit exhibit_participant;
#endif
