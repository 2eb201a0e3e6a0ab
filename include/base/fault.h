/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What the world did wrong, as one sentence for a person. A function that can fail returns false (or NULL) and
 * fills a fault; the first fault wins. Library code never prints and never exits. */
#ifndef EVENHAND_BASE_FAULT_H
#define EVENHAND_BASE_FAULT_H
#include <stdbool.h>
#include <stddef.h>

enum fault_code {
    FAULT_NONE,
    FAULT_INPUT,    /* a file, plan, decision or request is wrong: HTTP 400 */
    FAULT_MISSING,  /* what was asked for is not there: HTTP 404 */
    FAULT_REFUSED,  /* not allowed in this state (blinding, lock): HTTP 403 */
    FAULT_CONFLICT, /* the study has moved past the version seen: HTTP 409 */
    FAULT_SYSTEM    /* disk, permissions, network: HTTP 500 */
};

struct fault {
    enum fault_code code;
    size_t row, column; /* 1-based place in the input, 0 where there is none */
    char message[640];  /* one sentence: what, where, and the way out; UTF-8 */
};

void fault_init(struct fault *fault);
/* Fills the fault unless it is filled already; always returns false, so that `return fault_set(...)` reads well. */
bool fault_set(struct fault *fault, enum fault_code code, const char *format, ...)
    __attribute__((format(printf, 3, 4)));
bool fault_at(struct fault *fault, enum fault_code code, size_t row, size_t column, const char *format, ...)
    __attribute__((format(printf, 5, 6)));
/* Puts "CONTEXT: " before the message. */
void fault_context(struct fault *fault, const char *format, ...) __attribute__((format(printf, 2, 3)));
#endif
