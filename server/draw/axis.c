/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "draw/axis.h"
#include "base/memory.h"
#include "draw/number.h"
#include <math.h>

static double nice_step(double span, size_t wanted) {
    double rough = span / (double)wanted;
    double power = pow(10.0, floor(log10(rough)));
    double multiple = rough / power;
    return power * (multiple < 1.5 ? 1.0 : multiple < 3.5 ? 2.0 : multiple < 7.5 ? 5.0 : 10.0);
}

/* Ticks at whole multiples of the step from the first at or after low to the last at or before high. */
static void linear_ticks(struct axis *axis, double step) {
    axis->decimals = number_decimals(step);
    double slack = step * 1e-9;
    double first = ceil((axis->low - slack) / step), last = floor((axis->high + slack) / step);
    for (double k = first; k <= last && axis->tick_count < AXIS_TICKS; k += 1.0) {
        axis->ticks[axis->tick_count++] = k * step == 0.0 ? 0.0 : k * step;
    }
}

static void linear(struct axis *axis, size_t wanted, bool exact) {
    if (axis->low == axis->high) {
        double margin = axis->low == 0.0 ? 1.0 : fabs(axis->low) * 0.1;
        axis->low -= margin;
        axis->high += margin;
    }
    double step = nice_step(axis->high - axis->low, wanted);
    if (!exact) {
        axis->low = floor(axis->low / step + 1e-9) * step;
        axis->high = ceil(axis->high / step - 1e-9) * step;
    }
    linear_ticks(axis, step);
}

static const double log_steps[] = {1.0, 2.0, 5.0};

/* The largest 1-2-5 value at or below, or the smallest at or above. */
static double log_nice(double value, bool above) {
    double power = pow(10.0, floor(log10(value) + 1e-12));
    double multiple = value / power;
    if (above) {
        for (size_t i = 0; i < 3; i++) {
            if (multiple <= log_steps[i] * (1.0 + 1e-9)) {
                return log_steps[i] * power;
            }
        }
        return 10.0 * power;
    }
    for (size_t i = 3; i-- > 0;) {
        if (multiple >= log_steps[i] * (1.0 - 1e-9)) {
            return log_steps[i] * power;
        }
    }
    return power;
}

static void log_ticks(struct axis *axis, size_t wanted) {
    double decades = log10(axis->high) - log10(axis->low);
    bool all = decades <= (double)AXIS_TICKS / 3.0 - 1.0;
    double within = floor(log10(axis->high) + 1e-9) - ceil(log10(axis->low) - 1e-9) + 1.0; /* powers on the axis */
    axis->powers = decades * 3.0 > (double)wanted * 1.7 && within >= 2.0;
    int every = 1; /* powers between ticks */
    while (!all && decades / every > (double)wanted * 1.7) {
        every++;
    }
    int first = (int)floor(log10(axis->low) - 1e-9), last = (int)ceil(log10(axis->high) + 1e-9);
    for (int power = first; power <= last; power++) {
        if (power % every != 0) {
            continue;
        }
        for (size_t i = 0; i < (all ? 3u : 1u) && axis->tick_count < AXIS_TICKS; i++) {
            double tick = log_steps[i] * pow(10.0, power);
            if (tick >= axis->low * (1.0 - 1e-9) && tick <= axis->high * (1.0 + 1e-9)) {
                axis->ticks[axis->tick_count++] = tick;
            }
        }
    }
}

bool axis_labelled(const struct axis *axis, double tick) {
    double power = log10(fabs(tick));
    return axis->scale != AXIS_LOG10 || !axis->powers || fabs(power - round(power)) < 1e-9;
}

static void logarithmic(struct axis *axis, size_t wanted, bool exact) {
    if (!(axis->high > 0.0)) {
        axis->low = 1.0;
        axis->high = 10.0;
    }
    if (!(axis->low > 0.0)) {
        axis->low = axis->high / 1000.0;
    }
    if (axis->low == axis->high) {
        axis->low /= 2.0;
        axis->high *= 2.0;
    }
    if (axis->high < 3.0 * axis->low) { /* within one power 1-2-5 leaves hardly a tick: whole steps serve better */
        double step = nice_step(axis->high - axis->low, wanted), low = floor(axis->low / step + 1e-9) * step;
        axis->low = exact || low <= 0.0 ? axis->low : low;
        axis->high = exact ? axis->high : ceil(axis->high / step - 1e-9) * step;
        linear_ticks(axis, step);
        return;
    }
    if (!exact) {
        axis->low = log_nice(axis->low, false);
        axis->high = log_nice(axis->high, true);
    }
    log_ticks(axis, wanted);
}

static void prepare(struct axis *axis, enum axis_scale scale, double low, double high, double from, double to,
    size_t wanted, bool exact) {
    BUG_IF(wanted < 2);
    if (!isfinite(low) || !isfinite(high)) {
        low = scale == AXIS_LOG10 ? 1.0 : 0.0;
        high = scale == AXIS_LOG10 ? 10.0 : 1.0;
    }
    *axis = (struct axis){.scale = scale, .low = fmin(low, high), .high = fmax(low, high), .from = from, .to = to};
    if (scale == AXIS_LOG10) {
        logarithmic(axis, wanted, exact);
    } else {
        linear(axis, wanted, exact);
    }
}

void axis_init(
    struct axis *axis, enum axis_scale scale, double low, double high, double from, double to, size_t wanted) {
    prepare(axis, scale, low, high, from, to, wanted, false);
}

void axis_init_exact(
    struct axis *axis, enum axis_scale scale, double low, double high, double from, double to, size_t wanted) {
    prepare(axis, scale, low, high, from, to, wanted, true);
}

int axis_beyond(const struct axis *axis, double value) {
    double slack = axis->scale == AXIS_LOG10 ? 0.0 : (axis->high - axis->low) * 1e-12;
    return value < axis->low - slack ? -1 : value > axis->high + slack ? 1 : 0;
}

double axis_place(const struct axis *axis, double value) {
    double held = fmin(fmax(value, axis->low), axis->high);
    double share = axis->scale == AXIS_LOG10 ? (log10(held) - log10(axis->low)) / (log10(axis->high) - log10(axis->low))
                                             : (held - axis->low) / (axis->high - axis->low);
    return axis->from + share * (axis->to - axis->from);
}

void axis_label(const struct axis *axis, double tick, struct text *out) {
    bool log10_scale = axis->scale == AXIS_LOG10;
    double largest = log10_scale ? tick : fmax(fabs(axis->low), fabs(axis->high));
    double smallest = log10_scale ? tick : axis->high - axis->low;
    bool far = largest > 9999999.0 || smallest < 1e-4;
    if (far && tick != 0.0) {
        number_powers(out, tick, axis->with_sign);
        return;
    }
    int decimals = far ? 0 : log10_scale ? number_decimals(tick) : axis->decimals;
    number_shown(out, tick, decimals, axis->with_sign);
}
