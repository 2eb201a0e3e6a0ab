/* SPDX-License-Identifier: GPL-3.0-or-later */
/* "Not estimable" is a status with a sentence for the reader, never a silent 0 or NaN. */
#ifndef EVENHAND_BASE_STATUS_H
#define EVENHAND_BASE_STATUS_H

enum status {
    STATUS_OK,
    STATUS_TOO_FEW,
    STATUS_NO_VARIANCE,
    STATUS_SINGULAR,
    STATUS_SEPARATED,
    STATUS_NOT_CONVERGED,
    STATUS_NO_BASELINE,
    STATUS_NOT_ON_SCALE,
    STATUS_BEYOND_METHOD,
    STATUS_BLINDED,
    STATUS_COUNT
};

const char *status_name(enum status status);     /* "too-few": as JSON has it */
const char *status_sentence(enum status status); /* for a person; "" for STATUS_OK */
#endif
