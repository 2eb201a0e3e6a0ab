/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What every method of stats/ gives back for one quantity, and what all of stats/ has in common:
 *  - arrays in, result structs out; nothing here knows a trial;
 *  - every value handed in is finite: the caller has dropped and counted what is missing;
 *  - "not estimable" is a status; then every number of the estimate is NaN;
 *  - arrays are borrowed; memory that comes back lies in the arena the caller gave; scratch is freed;
 *  - no state is kept: all functions may run side by side on different results, and give the same digits each time. */
#ifndef EVENHAND_STATS_ESTIMATE_H
#define EVENHAND_STATS_ESTIMATE_H
#include "base/status.h"

struct estimate {
    enum status status;
    double estimate, standard_error; /* in the unit of the values */
    double df;                       /* residual or Welch degrees of freedom; NaN where the method has none */
    double low, high;                /* two-sided interval at the confidence asked for */
    double p;                        /* two-sided, against no difference */
};

struct interval {
    double low, high;
};

/* Once, first thing in main, before any thread starts: numerical errors of the library come back as values. */
void stats_init(void);

/* All NaN, with that status. */
struct estimate estimate_none(enum status status);
/* estimate +- t(df) standard_error, and p; df may be INFINITY (normal). confidence in (0, 1).
 * A standard error that is not positive gives STATUS_NO_VARIANCE, df not positive STATUS_TOO_FEW. */
struct estimate estimate_by_t(double estimate, double standard_error, double df, double confidence);
#endif
