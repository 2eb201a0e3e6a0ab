/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "server/trial/plan-parts.h"
#include <math.h>
#include <string.h>

/* A count of participants that somebody typed in. */
static bool read_count(struct reader *reader, const cJSON *object, const char *path, const char *key, size_t *count) {
    double value = -1;
    if (!read_number(reader, object, path, key, &value)) {
        return false;
    }
    if (!(value >= 0 && value <= 1e9) || floor(value) < value) {
        return wrong(reader, join(reader, path, key), "must be a whole number from 0");
    }
    *count = (size_t)value;
    return true;
}

static bool read_screening_reason(struct reader *reader, const cJSON *item, const char *path) {
    struct screening *screening = &reader->plan->screening;
    struct screening_reason *reason = &screening->reasons[screening->reason_count];
    if (!keys_known(reader, item, path, "reason n") ||
        !read_text(reader, item, path, "reason", true, &reason->reason) ||
        !read_count(reader, item, path, "n", &reason->n)) {
        return false;
    }
    for (size_t i = 0; i < screening->reason_count; i++) {
        if (strcmp(screening->reasons[i].reason, reason->reason) == 0) {
            return wrong(reader, join(reader, path, "reason"), "is that of an entry before it; add their numbers up");
        }
    }
    screening->reason_count++;
    screening->not_randomised += reason->n;
    return true;
}

bool read_screening(struct reader *reader, const cJSON *root) {
    struct screening *screening = &reader->plan->screening;
    const cJSON *item = member(root, "screening");
    if (!item) {
        return true;
    }
    screening->given = true;
    if (!keys_known(reader, item, "screening", "source assessed reasons") ||
        !read_text(reader, item, "screening", "source", true, &screening->source) ||
        !read_count(reader, item, "screening", "assessed", &screening->assessed)) {
        return false;
    }
    const cJSON *list = member(item, "reasons");
    if (list && !cJSON_IsArray(list)) {
        return wrong(reader, "screening.reasons", "must be a list such as [{\"reason\": \"declined\", \"n\": 70}]");
    }
    screening->reasons = ARENA_NEW(&reader->plan->arena, cJSON_GetArraySize(list), struct screening_reason);
    size_t index = 0;
    for (const cJSON *child = list ? list->child : NULL; child; child = child->next) {
        if (!read_screening_reason(reader, child, at_index(reader, "screening.reasons", index++))) {
            return false;
        }
    }
    return screening->not_randomised <= screening->assessed ||
           wrong(reader, "screening", "gives reasons for more people than were assessed");
}
