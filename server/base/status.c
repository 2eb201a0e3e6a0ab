/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/status.h"

static const struct {
    const char *name, *sentence;
} statuses[STATUS_COUNT] = {
    [STATUS_OK] = {"ok", ""},
    [STATUS_TOO_FEW] = {"too-few", "Not estimable: too few participants have the values this method needs."},
    [STATUS_NO_VARIANCE] = {"no-variance", "Not estimable: the values do not vary."},
    [STATUS_SINGULAR] = {"singular", "Not estimable: the terms of the model cannot be told apart in these data."},
    [STATUS_SEPARATED] = {"separated", "Not estimable: a covariate separates those with and without the event."},
    [STATUS_NOT_CONVERGED] = {"not-converged", "Not estimable: the iterations did not settle."},
    [STATUS_NO_BASELINE] = {"no-baseline", "Not estimable: the outcome has no baseline, so there is no change."},
    [STATUS_NOT_ON_SCALE] = {"not-on-scale", "Not estimable: no value can be placed on this scale."},
    [STATUS_BEYOND_METHOD] = {"beyond-method", "Not computed: the method is published for smaller samples only."},
    [STATUS_BLINDED] = {"blinded", "Not shown while blinded: it would need to know which arm is the reference."},
};

const char *status_name(enum status status) {
    return statuses[status].name;
}

const char *status_sentence(enum status status) {
    return statuses[status].sentence;
}
