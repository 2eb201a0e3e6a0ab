/* SPDX-License-Identifier: GPL-3.0-or-later */
/* One site's wrong unit: its values, taken together, are far from those of the other sites on the logarithmic scale and
 * fit them only after one published factor. Pooled data only; nothing here looks at an arm. */
#include "base/map.h"
#include "base/text.h"
#include "draw/json.h"
#include "server/trial/checks-parts.h"
#include "stats/describe.h"
#include "trial/arms.h"
#include "trial/convert.h"
#include <ctype.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

static const char check_name[] = "site-unit";

enum { FEWEST = 5, FAR = 5 };          /* values of a site; standard errors of a difference of medians */
static const double near_enough = 2.5; /* standard errors, after the factor */
static const double least_between =
    0.05; /* sites differ by as much on the natural logarithm without anything being wrong */
static const double least_shift = 0.4; /* well below the smallest factor of the table, ln 2.2 */

struct site_value {
    double log;
    size_t participant;
};

struct site_run { /* the values of one site, ascending */
    const char *site;
    struct site_value *first;
    size_t n;
    double median;
};

struct sites { /* one variable, or one column of a file with one row per visit */
    const struct variable *variable;
    const char *column;
    const int32_t *of;       /* [participants] place among the runs, NOWHERE where the site is not known */
    struct site_run *runs;   /* a site without values has n = 0 */
    size_t n, count, filled; /* values; sites; sites with values */
    double median;           /* of the sites' medians, weighted by their values */
};

static int by_log(const void *a, const void *b) {
    const struct site_value *x = a, *y = b;
    int order = (x->log > y->log) - (x->log < y->log);
    return order ? order : (x->participant > y->participant) - (x->participant < y->participant);
}

static int by_value(const void *a, const void *b) {
    double x = *(const double *)a, y = *(const double *)b;
    return (x > y) - (x < y);
}

static double middle(double *values, size_t n) {
    qsort(values, n, sizeof *values, by_value);
    return quantile(values, n, 0.5);
}

/* ---- gathering ---- */

/* The sites that participants name, once for all variables. */
static const char **list_sites(const struct finding *finding, int32_t *of, size_t *count) {
    const struct frame *frame = finding->frame;
    const char **codes = ARENA_NEW(finding->arena, frame->participant_count, const char *);
    struct map known;
    map_init(&known);
    for (size_t p = 0; p < frame->participant_count; p++) {
        const char *site = site_of(frame, p);
        of[p] = *site ? map_put(&known, site, (int32_t)*count) : NOWHERE;
        if (of[p] == (int32_t)*count) {
            codes[(*count)++] = site;
        }
    }
    map_release(&known);
    return codes;
}

/* Counts the positive values of each site, or puts them at their site's place. */
static void each_value(const struct finding *finding, struct sites *sites, bool put) {
    const struct frame *frame = finding->frame;
    const struct plan *plan = frame->plan;
    for (size_t v = 0; v < plan->variable_count; v++) {
        const struct column *column = frame->columns[v];
        bool taken =
            plan->variables[v].kind == VARIABLE_NUMBER && plan_covers(sites->column, plan->variables[v].column);
        for (size_t p = 0; taken && p < frame->participant_count; p++) {
            if (!(column->number[p] > 0) || sites->of[p] == NOWHERE) {
                continue;
            }
            struct site_run *run = &sites->runs[sites->of[p]];
            if (put) {
                run->first[run->n] = (struct site_value){log(column->number[p]), p};
            }
            run->n++;
        }
    }
}

static void take_values(const struct finding *finding, struct sites *sites) {
    each_value(finding, sites, false);
    for (size_t s = 0; s < sites->count; s++) {
        struct site_run *run = &sites->runs[s];
        run->first = ARENA_NEW(finding->arena, run->n, struct site_value);
        sites->n += run->n;
        sites->filled += run->n > 0;
        run->n = 0;
    }
    each_value(finding, sites, true);
    for (size_t s = 0; s < sites->count; s++) {
        struct site_run *run = &sites->runs[s];
        if (run->n) {
            qsort(run->first, run->n, sizeof *run->first, by_log);
            run->median = (run->first[(run->n - 1) / 2].log + run->first[run->n / 2].log) / 2;
        }
    }
}

static int by_median(const void *a, const void *b) {
    double x = ((const struct site_run *)a)->median, y = ((const struct site_run *)b)->median;
    return (x > y) - (x < y);
}

static void take_median(const struct finding *finding, struct sites *sites) {
    struct site_run *order = ARENA_NEW(finding->arena, sites->filled, struct site_run);
    size_t filled = 0, passed = 0;
    for (size_t s = 0; s < sites->count; s++) {
        if (sites->runs[s].n) {
            order[filled++] = sites->runs[s];
        }
    }
    if (filled) {
        qsort(order, filled, sizeof *order, by_median);
    }
    for (size_t s = 0; s < filled && 2 * passed < sites->n; s++) {
        passed += order[s].n;
        sites->median = order[s].median;
    }
}

/* ---- one site against the others ---- */

struct others {
    size_t n, sites;
    double median, spread; /* of their values */
    double error;          /* standard error of the site's median minus theirs, sites' own differences included */
};

static void take_others(
    const struct finding *finding, const struct sites *sites, const struct site_run *run, struct others *others) {
    double *logs = ARENA_NEW(finding->arena, sites->n, double),
           *medians = ARENA_NEW(finding->arena, sites->count, double);
    size_t judged = 0;
    *others = (struct others){0};
    for (size_t s = 0; s < sites->count; s++) {
        const struct site_run *other = &sites->runs[s];
        for (size_t i = 0; other != run && i < other->n; i++) {
            logs[others->n++] = other->first[i].log;
        }
        others->sites += other != run && other->n > 0;
        if (other != run && other->n >= FEWEST) {
            medians[judged++] = other->median;
        }
    }
    if (others->n == 0) {
        return;
    }
    others->median = middle(logs, others->n);
    others->spread = median_absolute_deviation(logs, others->n);
    double between = least_between;
    if (judged >= 3) {
        qsort(medians, judged, sizeof *medians, by_value);
        between = fmax(between, median_absolute_deviation(medians, judged));
    }
    /* The median of a normal sample has pi/2 times the variance of its mean. */
    double sampling = others->spread * others->spread * (acos(-1.0) / 2) * (1 / (double)run->n + 1 / (double)others->n);
    others->error = sqrt(sampling + between * between);
}

/* The share of the values, shifted, that lie in the plausible range or, without one, within four spreads of the others.
 */
static double share_inside(
    const struct sites *sites, const struct site_value *values, size_t n, const struct others *others, double shift) {
    const struct range *range = &sites->variable->plausible;
    size_t inside = 0;
    for (size_t i = 0; i < n; i++) {
        double at = values[i].log + shift;
        inside += range->given ? exp(at) >= range->low && exp(at) <= range->high
                               : fabs(at - others->median) <= 4 * others->spread;
    }
    return n ? (double)inside / (double)n : 0;
}

/* With two sites only the plausible range can say which of them is wrong. */
static bool others_can_judge(const struct sites *sites, const struct site_run *run, const struct others *others) {
    if (others->n < FEWEST || others->n < run->n / 2) {
        return false;
    }
    if (others->sites > 1 && others->n >= run->n) {
        return true;
    }
    const struct site_run *first = sites->runs;
    size_t theirs = 0;
    for (size_t s = 0; s < sites->count; s++) {
        double share = first[s].n ? share_inside(sites, first[s].first, first[s].n, others, 0) : 0;
        theirs += &first[s] != run && share >= 0.9 ? first[s].n : 0;
    }
    return sites->variable->plausible.given && share_inside(sites, run->first, run->n, others, 0) < 0.5 &&
           (double)theirs >= 0.9 * (double)others->n;
}

/* ---- which factor ---- */

struct guess_of_unit {
    const struct unit_factor *entry;
    double factor; /* that brings the site's values to the others */
    const char *from, *to;
    double rank, apart;
};

/* Units as people write them: spaces, case and the two signs for micro apart. */
static bool same_unit(const char *a, const char *b) {
    char folded[2][32];
    const char *const text[2] = {a, b};
    for (int i = 0; i < 2; i++) {
        size_t used = 0;
        for (const char *p = text[i]; *p && used + 1 < sizeof folded[i]; p++) {
            bool micro = strncmp(p, "\xC2\xB5", 2) == 0 || strncmp(p, "\xCE\xBC", 2) == 0;
            if (micro) {
                p++;
            }
            if (*p != ' ') {
                folded[i][used++] = micro ? 'u' : (char)tolower((unsigned char)*p);
            }
        }
        folded[i][used] = '\0';
    }
    return strcmp(folded[0], folded[1]) == 0;
}

static void try_factor(const struct finding *finding, const struct sites *sites, const struct site_run *run,
    const struct others *others, const struct unit_factor *entry, bool inverse, struct guess_of_unit *best) {
    const char *unit = sites->variable->unit && *sites->variable->unit ? sites->variable->unit : NULL;
    double factor = inverse ? 1 / entry->factor : entry->factor;
    const char *from = inverse ? entry->to : entry->from, *to = inverse ? entry->from : entry->to;
    bool ten = !entry->from, told = entry->analyte && strcasestr(sites->variable->label, entry->analyte);
    if (!ten && unit && !same_unit(unit, to)) {
        return;
    }
    double apart = fabs(run->median + log(factor) - others->median);
    if (apart > near_enough * others->error || share_inside(sites, run->first, run->n, others, log(factor)) < 0.9) {
        return;
    }
    double rank = told ? 0 : !ten && unit && !entry->analyte ? 1 : 2;
    if (best->entry && (rank > best->rank || (rank >= best->rank && apart >= best->apart))) {
        return;
    }
    to = ten ? (unit ? unit : "the unit of the other sites") : to;
    from = ten ? arena_format(finding->arena, "%.15g %s", factor, unit ? unit : "of that unit") : from;
    *best = (struct guess_of_unit){entry, factor, from, to, rank, apart};
}

static const char *convert_proposal(
    struct finding *finding, const struct sites *sites, const char *site, const struct guess_of_unit *guess) {
    struct text text;
    text_init(&text);
    struct json json;
    json_init(&json, &text);
    json_object(&json);
    json_field_string(&json, "kind", "convert");
    json_field_string(&json, "column", sites->column);
    json_field_string(&json, "site", site);
    json_field_number(&json, "factor", guess->factor);
    json_field_string(&json, "unit_from", guess->from);
    json_field_string(&json, "unit_to", guess->to);
    json_field_string(&json, "source", guess->entry->source);
    json_close(&json);
    json_finish(&json);
    const char *made = arena_text(finding->arena, text.data);
    text_release(&text);
    return made;
}

static bool noted(const struct frame *frame, const char *id) {
    for (size_t i = 0; i < frame->version; i++) {
        const struct decision *decision = &frame->decisions[i];
        if (frame->stands[i] && decision->kind == DECISION_NOTE && decision->discrepancy &&
            strcmp(decision->discrepancy, id) == 0) {
            return true;
        }
    }
    return false;
}

static int by_index(const void *a, const void *b) {
    size_t x = *(const size_t *)a, y = *(const size_t *)b;
    return (x > y) - (x < y);
}

/* Everyone of the site with a value, once. While the question is open their values are not asked about one by one. */
static void concerns_site(
    struct finding *finding, struct discrepancy *what, const struct sites *sites, const struct site_run *run) {
    const struct frame *frame = finding->frame;
    const char **list = ARENA_NEW(finding->arena, run->n, const char *);
    size_t *who = ARENA_NEW(finding->arena, run->n, size_t);
    for (size_t i = 0; i < run->n; i++) {
        who[i] = run->first[i].participant;
    }
    qsort(who, run->n, sizeof *who, by_index);
    for (size_t i = 0; i < run->n; i++) {
        if (i == 0 || who[i] != who[i - 1]) {
            list[what->participant_count++] = frame->participants[who[i]].id;
        }
    }
    what->participants = list;
    for (size_t v = 0; !noted(frame, what->id) && v < frame->plan->variable_count; v++) {
        if (!plan_covers(sites->column, frame->plan->variables[v].column)) {
            continue;
        }
        if (!finding->site_asked[v]) {
            finding->site_asked[v] = ARENA_NEW(finding->arena, frame->participant_count, bool);
        }
        for (size_t i = 0; i < run->n; i++) {
            finding->site_asked[v][who[i]] = true;
        }
    }
}

static void ask(struct finding *finding, const struct sites *sites, const struct site_run *run,
    const struct others *others, const struct guess_of_unit *guess) {
    struct arena *arena = finding->arena;
    const char *site = run->site, *analyte = guess->entry->analyte;
    struct discrepancy *new = finding_add(finding, check_name, sites->column, site);
    concerns_site(finding, new, sites, run);
    new->message = arena_format(arena,
        "%s at site %s: the median of %zu values is %.3g, that of the other sites %.3g. Together they fit only after "
        "times %.6g: recorded in %s instead of %s? (Factor%s%s: %s.)",
        sites->variable->label, site, run->n, exp(run->median), exp(others->median), guess->factor, guess->from,
        guess->to, analyte ? " of " : "", analyte ? analyte : "", guess->entry->source);
    new->proposal = convert_proposal(finding, sites, site, guess);
    new->proposal_words =
        arena_format(arena, "Convert site %s: times %.6g (%s to %s)", site, guess->factor, guess->from, guess->to);
}

static void look_at(struct finding *finding, const struct sites *sites, const struct site_run *run) {
    const struct range *range = &sites->variable->plausible;
    bool far = fabs(run->median - sites->median) > least_shift;
    bool outside = range->given && (exp(run->median) < range->low || exp(run->median) > range->high);
    if (run->n < FEWEST || (!far && !outside && sites->filled > 2)) {
        return; /* most sites; the rest costs a sort of all values */
    }
    struct others others;
    take_others(finding, sites, run, &others);
    if (!others_can_judge(sites, run, &others) || fabs(run->median - others.median) <= FAR * others.error) {
        return;
    }
    struct guess_of_unit best = {0};
    for (const struct unit_factor *entry = unit_factors; entry->factor > 0; entry++) {
        try_factor(finding, sites, run, &others, entry, false, &best);
        try_factor(finding, sites, run, &others, entry, true, &best);
    }
    if (best.entry) {
        ask(finding, sites, run, &others, &best);
    }
}

static const char *column_at_all_visits(const struct finding *finding, const struct variable *variable) {
    const struct plan_file *file = &finding->frame->plan->files[variable->place.file];
    const char *at = file->by_visit ? strrchr(variable->column, '@') : NULL;
    return at ? arena_bytes(finding->arena, variable->column, (size_t)(at - variable->column)) : variable->column;
}

/* A derived value has no cells to convert: its inputs are asked about. */
static bool is_derived(const struct plan *plan, size_t variable) {
    for (size_t d = 0; d < plan->derived_count; d++) {
        if (plan->derived[d].variable == (int)variable) {
            return true;
        }
    }
    return false;
}

void check_site_units(struct finding *finding) {
    const struct frame *frame = finding->frame;
    const struct plan *plan = frame->plan;
    finding->site_asked = ARENA_NEW(finding->arena, plan->variable_count, bool *);
    if (!frame->site || arms_hide_column(frame, plan->site_column)) {
        return;
    }
    int32_t *of = ARENA_NEW(finding->arena, frame->participant_count, int32_t);
    size_t count = 0;
    const char **codes = list_sites(finding, of, &count);
    for (size_t v = 0; v < plan->variable_count; v++) {
        const struct variable *variable = &plan->variables[v];
        struct sites sites = {
            .variable = variable, .column = column_at_all_visits(finding, variable), .of = of, .count = count};
        bool before = false; /* the same column at an earlier visit has been looked at with this one */
        for (size_t w = 0; w < v && !before; w++) {
            before = plan_covers(sites.column, plan->variables[w].column);
        }
        if (variable->kind != VARIABLE_NUMBER || is_derived(plan, v) || finding->hidden[v] || before || count < 2) {
            continue;
        }
        sites.runs = ARENA_NEW(finding->arena, count, struct site_run);
        for (size_t s = 0; s < count; s++) {
            sites.runs[s].site = codes[s];
        }
        take_values(finding, &sites);
        take_median(finding, &sites);
        for (size_t s = 0; s < count && sites.filled > 1; s++) {
            look_at(finding, &sites, &sites.runs[s]);
        }
    }
}
