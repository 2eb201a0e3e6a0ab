/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "trial/analysis.h"
#include <math.h>
#include <string.h>

static const double MISSING = NAN;

const char *set_name(enum set set) {
    return set == SET_FULL ? "full" : "per-protocol";
}

const char *set_words(enum set set) {
    return set == SET_FULL ? "full analysis set" : "per-protocol set";
}

bool set_holds(const struct frame *frame, enum set set, size_t participant) {
    const struct participant *who = &frame->participants[participant];
    return who->record != NO_RECORD && !(set == SET_FULL ? who->excluded_full : who->excluded_per_protocol);
}

double on_scale(enum scale scale, double value) {
    return scale == SCALE_LINEAR ? value : value > 0 ? log10(value) : MISSING;
}

static void take_member(struct analysis *analysis, size_t p, const double *baseline, const double *follow_up) {
    size_t i = analysis->count++;
    analysis->participant[i] = p;
    analysis->arm[i] = analysis->arms->of[p];
    analysis->baseline[i] = baseline ? on_scale(analysis->scale, baseline[p]) : MISSING;
    analysis->follow_up[i] = on_scale(analysis->scale, follow_up[p]);
    analysis->change[i] = analysis->follow_up[i] - analysis->baseline[i];
    bool off = (baseline && !isnan(baseline[p]) && isnan(analysis->baseline[i])) ||
               (!isnan(follow_up[p]) && isnan(analysis->follow_up[i]));
    analysis->not_on_scale += off;
}

void analysis_take(struct analysis *analysis, const struct frame *frame, const struct arms *arms, size_t outcome,
    size_t visit, enum scale scale, enum set set, struct arena *arena) {
    const struct outcome *what = &frame->plan->outcomes[outcome];
    size_t n = frame->participant_count;
    *analysis = (struct analysis){.frame = frame, .arms = arms, .outcome = what, .outcome_index = outcome, .visit = visit,
        .scale = scale, .set = set, .has_baseline = what->visit_count > 1 && visit > 0,
        .participant = ARENA_NEW(arena, n, size_t), .arm = ARENA_NEW(arena, n, int), .baseline = ARENA_NEW(arena, n, double),
        .follow_up = ARENA_NEW(arena, n, double), .change = ARENA_NEW(arena, n, double)};
    const double *follow_up = frame->columns[what->visits[visit].variable]->number;
    const double *baseline = analysis->has_baseline ? frame->columns[what->visits[0].variable]->number : NULL;
    for (size_t p = 0; p < n; p++) {
        if (frame->participants[p].record == NO_RECORD) {
            analysis->held_aside++;
        } else if (arms->of[p] == NOWHERE) {
            analysis->no_arm++;
        } else if (!set_holds(frame, set, p)) {
            analysis->excluded++;
        } else {
            take_member(analysis, p, baseline, follow_up);
        }
    }
}

/* ---- grouping ---- */

void grouping_take(struct grouping *grouping, const struct frame *frame, int covariate, struct arena *arena) {
    int *of = ARENA_NEW(arena, frame->participant_count, int);
    *grouping = (struct grouping){.of = of, .count = 1};
    if (covariate == NOWHERE) {
        return;
    }
    const struct covariate *what = &frame->plan->covariates[covariate];
    const struct column *column = frame->columns[what->variable];
    grouping->covariate = what;
    grouping->count = what->number ? what->band_count + 1 : column->level_count;
    grouping->level = ARENA_NEW(arena, grouping->count, struct level);
    for (size_t g = 0; g < grouping->count; g++) {
        const char *words = what->number ? band_words(arena, what->bands, what->band_count, g) : NULL;
        grouping->level[g] = words ? (struct level){words, words} : column->levels[g];
    }
    for (size_t p = 0; p < frame->participant_count; p++) {
        of[p] = !what->number          ? column->level[p] :
            isnan(column->number[p]) ? NOWHERE :
                                       (int)band_of(what->bands, what->band_count, column->number[p]);
    }
}

/* ---- design ---- */

struct filling { /* a design on the way: columns are appended */
    struct design *design;
    const struct analysis *analysis;
    const struct design_request *request;
    struct arena *arena;
    size_t room;
};

static double *add_column(struct filling *filling, const char *name) {
    struct design *design = filling->design;
    if (design->columns == filling->room) {
        size_t room = filling->room ? filling->room * 2 : 8;
        double **columns = ARENA_NEW(filling->arena, room, double *);
        const char **names = ARENA_NEW(filling->arena, room, const char *);
        if (design->columns) {
            memcpy(columns, design->column, design->columns * sizeof *columns);
            memcpy(names, design->name, design->columns * sizeof *names);
        }
        design->column = columns;
        design->name = names;
        filling->room = room;
    }
    design->name[design->columns] = name;
    return design->column[design->columns++] = ARENA_NEW(filling->arena, design->rows, double);
}

/* The mean that stands for a missing value: of the set without those left out, who are as if excluded. */
static double mean_of(const struct filling *filling, const double *of_member) {
    const struct analysis *analysis = filling->analysis;
    const bool *without = filling->request->without;
    long double sum = 0;
    size_t n = 0;
    for (size_t i = 0; i < analysis->count; i++) {
        if (!isnan(of_member[i]) && !(without && without[analysis->participant[i]])) {
            sum += (long double)of_member[i];
            n++;
        }
    }
    return n ? (double)(sum / (long double)n) : MISSING;
}

static int group_of_row(const struct filling *filling, size_t row) {
    const struct grouping *by = filling->request->by;
    return by ? by->of[filling->analysis->participant[filling->design->member[row]]] : 0;
}

/* One indicator of an arm, over all rows (group NOWHERE) or within one group; returns its column. */
static int add_arm(struct filling *filling, size_t arm, int group) {
    struct design *design = filling->design;
    const struct arms *arms = filling->analysis->arms;
    double *x = add_column(filling, arena_format(filling->arena, "%s minus %s%s%s", arms->arm[arm].label,
        arms->arm[arms->reference].label, group == NOWHERE ? "" : " in ",
        group == NOWHERE ? "" : filling->request->by->level[group].label));
    for (size_t r = 0; r < design->rows; r++) {
        bool here = filling->analysis->arm[design->member[r]] == (int)arm && (group == NOWHERE || group_of_row(filling, r) == group);
        x[r] = here ? 1 : 0;
    }
    return (int)design->columns - 1;
}

static void add_arms(struct filling *filling) {
    struct design *design = filling->design;
    const struct arms *arms = filling->analysis->arms;
    for (size_t a = 0; a < arms->count; a++) {
        bool needed = a != arms->reference && design->n_of_arm[a] > 0 && !filling->request->interaction;
        design->arm_column[a] = needed ? add_arm(filling, a, NOWHERE) : NOWHERE;
    }
}

/* Within a level every arm present but one has an indicator, of its difference from the reference; where the reference
 * has nobody in the level it is from the first arm there, so that the model still fits each cell; no effect to report. */
static void add_cells(struct filling *filling, size_t group) {
    struct design *design = filling->design;
    size_t arms = filling->analysis->arms->count, reference = filling->analysis->arms->reference;
    const size_t *n = &design->n_of_cell[group * arms];
    size_t against = reference;
    for (size_t a = arms; a > 0 && !n[reference]; a--) {
        against = n[a - 1] ? a - 1 : against;
    }
    for (size_t a = 0; a < arms; a++) {
        if (a != against && n[a]) {
            int column = add_arm(filling, a, (int)group);
            design->cell_column[group * arms + a] = against == reference ? column : NOWHERE;
        }
    }
}

/* Levels of the grouping (all present but the first), and each arm within each level where asked. */
static void add_groups(struct filling *filling) {
    struct design *design = filling->design;
    const struct grouping *by = filling->request->by;
    size_t arms = filling->analysis->arms->count;
    bool first = true;
    for (size_t g = 0; by && g < by->count; g++) {
        size_t here = 0;
        for (size_t a = 0; a < arms; a++) {
            here += design->n_of_cell[g * arms + a];
            design->cell_column[g * arms + a] = NOWHERE;
        }
        if (here && !first) {
            double *x = add_column(filling, by->level[g].label);
            for (size_t r = 0; r < design->rows; r++) {
                x[r] = group_of_row(filling, r) == (int)g ? 1 : 0;
            }
        }
        first = first && !here;
        if (filling->request->interaction) {
            add_cells(filling, g);
        }
    }
}

static void add_baseline(struct filling *filling) {
    struct design *design = filling->design;
    const struct analysis *analysis = filling->analysis;
    double mean = mean_of(filling, analysis->baseline);
    design->baseline_column = NOWHERE;
    if (!analysis->has_baseline || isnan(mean)) {
        return;
    }
    double *x = add_column(filling, "baseline");
    design->baseline_column = (int)design->columns - 1;
    for (size_t r = 0; r < design->rows; r++) {
        double value = analysis->baseline[design->member[r]];
        x[r] = isnan(value) ? mean : value;
        design->baseline_filled += isnan(value) ? 1 : 0;
    }
}

static void add_number(struct filling *filling, const struct covariate *covariate) {
    struct design *design = filling->design;
    const struct analysis *analysis = filling->analysis;
    const double *values = analysis->frame->columns[covariate->variable]->number;
    double *of_member = ARENA_NEW(filling->arena, analysis->count, double);
    for (size_t i = 0; i < analysis->count; i++) {
        of_member[i] = values[analysis->participant[i]];
    }
    double mean = mean_of(filling, of_member);
    double *x = add_column(filling, covariate->label);
    for (size_t r = 0; r < design->rows; r++) {
        double value = of_member[design->member[r]];
        x[r] = !isnan(value) ? value : isnan(mean) ? 0 : mean;
        design->covariate_filled += isnan(value) ? 1 : 0;
    }
}

/* Indicators for every level present but the first; a blank is a level of its own, the last. */
static void add_category(struct filling *filling, const struct covariate *covariate) {
    struct design *design = filling->design;
    const struct analysis *analysis = filling->analysis;
    const struct column *column = analysis->frame->columns[covariate->variable];
    size_t levels = column->level_count + 1;
    size_t *level_of = ARENA_NEW(filling->arena, design->rows, size_t), *present = ARENA_NEW(filling->arena, levels, size_t);
    for (size_t r = 0; r < design->rows; r++) {
        int32_t level = column->level[analysis->participant[design->member[r]]];
        level_of[r] = level == NOWHERE ? column->level_count : (size_t)level;
        present[level_of[r]]++;
    }
    design->blank_category += present[column->level_count];
    bool first = true;
    for (size_t l = 0; l < levels; l++) {
        if (!present[l]) {
            continue;
        }
        if (!first) {
            double *x = add_column(filling, arena_format(filling->arena, "%s: %s", covariate->label,
                l == column->level_count ? "blank" : column->levels[l].label));
            for (size_t r = 0; r < design->rows; r++) {
                x[r] = level_of[r] == l;
            }
        }
        first = false;
    }
}

static void take_rows(struct filling *filling) {
    struct design *design = filling->design;
    const struct analysis *analysis = filling->analysis;
    const struct grouping *by = filling->request->by;
    const bool *without = filling->request->without;
    bool drop = analysis->frame->plan->drop_missing_baseline && analysis->has_baseline;
    size_t arms = analysis->arms->count;
    design->y = ARENA_NEW(filling->arena, analysis->count, double);
    design->member = ARENA_NEW(filling->arena, analysis->count, size_t);
    design->n_of_arm = ARENA_NEW(filling->arena, arms, size_t);
    design->arm_column = ARENA_NEW(filling->arena, arms, int);
    design->n_of_cell = by ? ARENA_NEW(filling->arena, by->count * arms, size_t) : NULL;
    design->cell_column = by ? ARENA_NEW(filling->arena, by->count * arms, int) : NULL;
    for (size_t i = 0; i < analysis->count; i++) {
        int group = by ? by->of[analysis->participant[i]] : 0;
        bool out = isnan(analysis->follow_up[i]) || (without && without[analysis->participant[i]]);
        bool dropped = !out && drop && isnan(analysis->baseline[i]);
        design->baseline_dropped += dropped ? 1 : 0;
        design->no_level += !out && !dropped && group == NOWHERE ? 1 : 0;
        if (out || dropped || group == NOWHERE) {
            continue;
        }
        design->member[design->rows] = i;
        design->y[design->rows++] = analysis->follow_up[i];
        design->n_of_arm[analysis->arm[i]]++;
        if (by) {
            design->n_of_cell[(size_t)group * arms + (size_t)analysis->arm[i]]++;
        }
    }
}

void design_take(
    struct design *design, const struct analysis *analysis, const struct design_request *request, struct arena *arena) {
    *design = (struct design){.baseline_column = NOWHERE};
    struct filling filling = {design, analysis, request, arena, 0};
    take_rows(&filling);
    double *one = add_column(&filling, "intercept");
    for (size_t r = 0; r < design->rows; r++) {
        one[r] = 1;
    }
    add_arms(&filling);
    add_groups(&filling);
    add_baseline(&filling);
    for (size_t i = 0; i < request->adjust_count; i++) {
        const struct covariate *covariate = &analysis->frame->plan->covariates[request->adjust[i]];
        if (request->by && request->by->covariate == covariate) {
            continue; /* stands in the model as its levels already */
        }
        if (covariate->number) {
            add_number(&filling, covariate);
        } else {
            add_category(&filling, covariate);
        }
    }
}
