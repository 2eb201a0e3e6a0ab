/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "stats/estimate.h"
#include "base/memory.h"
#include "stats/distributions.h"
#include <gsl/gsl_errno.h>
#include <math.h>

void stats_init(void) {
    gsl_set_error_handler_off();
}

struct estimate estimate_none(enum status status) {
    return (struct estimate){status, (double)NAN, (double)NAN, (double)NAN, (double)NAN, (double)NAN, (double)NAN};
}

struct estimate estimate_by_t(double estimate, double standard_error, double df, double confidence) {
    BUG_IF(!(confidence > 0.0 && confidence < 1.0));
    if (!(df > 0.0))
        return estimate_none(STATUS_TOO_FEW);
    if (!(standard_error > 0.0))
        return estimate_none(STATUS_NO_VARIANCE);
    double half = student_quantile(0.5 + confidence / 2.0, df) * standard_error;
    return (struct estimate){STATUS_OK, estimate, standard_error, df, estimate - half, estimate + half,
        student_two_sided(estimate / standard_error, df)};
}
