/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The key "derived" of a plan; and the guard that nothing recorded after randomisation is adjusted for. */
#include "server/trial/plan-parts.h"
#include "trial/dates.h"
#include <math.h>
#include <stdint.h>
#include <string.h>

/* ---- reading ---- */

static const struct {
    const char *name;
    size_t least, most; /* inputs */
} formulas[DERIVED_FORMULA_COUNT] = {
    [DERIVED_MEAN] = {"mean", 2, SIZE_MAX},
    [DERIVED_SUM] = {"sum", 2, SIZE_MAX},
    [DERIVED_DIFFERENCE] = {"difference", 2, 2},
    [DERIVED_RATIO] = {"ratio", 2, 2},
    [DERIVED_BODY_MASS_INDEX] = {"body-mass-index", 2, 2},
    [DERIVED_DAYS_BETWEEN] = {"days-between", 2, 2},
    [DERIVED_AGE_AT] = {"age-at", 2, 2},
};

static bool takes_dates(enum derived_formula formula) {
    return formula == DERIVED_DAYS_BETWEEN || formula == DERIVED_AGE_AT;
}

static bool takes_items(enum derived_formula formula) {
    return formula == DERIVED_MEAN || formula == DERIVED_SUM;
}

static bool read_formula(struct reader *reader, const cJSON *item, const char *path, struct derived *derived) {
    const char *word = NULL;
    if (!read_text(reader, item, path, "formula", true, &word)) {
        return false;
    }
    for (int i = 0; i < DERIVED_FORMULA_COUNT; i++) {
        if (strcmp(formulas[i].name, word) == 0) {
            derived->formula = (enum derived_formula)i;
            return true;
        }
    }
    return wrong(reader, join(reader, path, "formula"), 
        "must be mean, sum, difference, ratio, body-mass-index, days-between or age-at");
}

static bool read_inputs(struct reader *reader, const cJSON *item, const char *path, struct derived *derived) {
    const char *where = join(reader, path, "of");
    struct texts names = {0};
    if (!read_texts(reader, item, path, "of", &names)) {
        return false;
    }
    size_t least = formulas[derived->formula].least, most = formulas[derived->formula].most;
    if (names.count < least || names.count > most) {
        return wrong(reader, where, arena_format(&reader->plan->arena, "must list %s columns for the formula \"%s\"",
            least == most ? "two" : "two or more", formulas[derived->formula].name));
    }
    derived->of = ARENA_NEW(&reader->plan->arena, names.count, struct derived_input);
    for (size_t i = 0; i < names.count; i++) {
        struct derived_input *input = &derived->of[derived->of_count++];
        const char *here = at_index(reader, where, i);
        if (!settle_text(reader, here, names.item[i], &input->column, &input->place)) {
            return false;
        }
        for (size_t j = 0; j < i; j++) {
            if (strcmp(derived->of[j].column, input->column) == 0) {
                return wrong(reader, here, "repeats a column before it; each counts once");
            }
        }
    }
    return true;
}

static bool read_minimum(struct reader *reader, const cJSON *item, const char *path, struct derived *derived) {
    const char *where = join(reader, path, "minimum_items");
    double minimum = (double)derived->of_count;
    if (!read_number(reader, item, path, "minimum_items", &minimum)) {
        return false;
    }
    if (member(item, "minimum_items") && !takes_items(derived->formula)) {
        return wrong(reader, where, "belongs to the formulas mean and sum");
    }
    if (!(minimum >= 1 && minimum <= (double)derived->of_count) || floor(minimum) < minimum) {
        return wrong(reader, where, "must be a whole number from 1 to the number of columns it is made of");
    }
    derived->minimum_items = (size_t)minimum;
    return true;
}

static bool read_height_unit(struct reader *reader, const cJSON *item, const char *path, struct derived *derived) {
    bool wanted = derived->formula == DERIVED_BODY_MASS_INDEX, metres = false;
    if (wanted != (member(item, "height_unit") != NULL)) {
        return wrong(reader, join(reader, path, "height_unit"), wanted ?
            "is missing; say \"cm\" or \"m\" (the columns are weight in kg, then height)" : "belongs to the formula body-mass-index");
    }
    if (!wanted) {
        return true;
    }
    derived->unit = *derived->unit ? derived->unit : "kg/m\xC2\xB2";
    bool done = read_choice(reader, item, path, "height_unit", "cm", "m", &metres);
    derived->height_in_cm = !metres;
    return done;
}

static bool read_claim(struct reader *reader, const cJSON *item, const char *path, struct derived *derived) {
    if (!read_column(reader, item, path, "claims", &derived->claims, &derived->claims_place) ||
        !read_number(reader, item, path, "tolerance", &derived->tolerance)) {
        return false;
    }
    for (size_t i = 0; derived->claims && i < derived->of_count; i++) {
        if (strcmp(derived->of[i].column, derived->claims) == 0) {
            return wrong(reader, join(reader, path, "claims"), "is one of the columns it is made of");
        }
    }
    if (member(item, "tolerance") && !(derived->claims && derived->tolerance >= 0)) {
        return wrong(reader, join(reader, path, "tolerance"), derived->claims ? "must not be negative" :
            "needs \"claims\": the column of the file to compare with");
    }
    return true;
}

bool read_derived(struct reader *reader, const cJSON *item, const char *path) {
    struct plan *plan = reader->plan;
    struct derived *derived = &plan->derived[plan->derived_count];
    *derived = (struct derived){.unit = "", .tolerance = NAN, .claims_variable = NOWHERE, .variable = NOWHERE};
    if (!keys_known(reader, item, path,
            "id label unit formula of minimum_items height_unit claims tolerance plausible missing_codes") ||
        !read_text(reader, item, path, "id", true, &derived->id) ||
        !read_text(reader, item, path, "label", false, &derived->label) ||
        !read_text(reader, item, path, "unit", false, &derived->unit) || !read_formula(reader, item, path, derived) ||
        !read_inputs(reader, item, path, derived) || !read_minimum(reader, item, path, derived) ||
        !read_height_unit(reader, item, path, derived) || !read_claim(reader, item, path, derived) ||
        !read_range(reader, item, path, "plausible", &derived->plausible) ||
        !read_codes(reader, item, path, &derived->missing_codes)) {
        return false;
    }
    derived->unit = *derived->unit                   ? derived->unit :
        derived->formula == DERIVED_DAYS_BETWEEN     ? "days" :
        derived->formula == DERIVED_AGE_AT           ? "years" :
                                                       "";
    derived->column = arena_format(&plan->arena, "derived.%s", derived->id);
    derived->label = derived->label ? derived->label : derived->id;
    if (strpbrk(derived->id, ".@,=& ") || plan_derived(plan, derived->column) != NOWHERE) {
        return wrong(reader, join(reader, path, "id"), strpbrk(derived->id, ".@,=& ") ?
            "must be one word without . @ , = or &" : "is that of a derived value before it; each needs its own");
    }
    plan->derived_count++;
    return true;
}

/* ---- among the variables ---- */

/* A column that a derived value rests on or is compared with: what else the plan says of it stands. */
static bool place_input(struct reader *reader, const struct derived *derived, const char *column, const struct place *place,
    enum variable_kind kind, int *index) {
    struct plan *plan = reader->plan;
    *index = plan_variable(plan, column);
    if (kind == VARIABLE_DATE && !plan->dates) {
        return fault_set(reader->fault, FAULT_INPUT, "%s: %s is made of dates, so the plan needs \"dates\" with the order they are written in",
            reader->name, derived->column);
    }
    if (*index != NOWHERE && plan->variables[*index].kind == kind) {
        return true;
    }
    struct variable variable = {.column = column, .place = *place, .label = column, .unit = "", .kind = kind,
        .outcome = NOWHERE, .visit = NOWHERE, .covariate = NOWHERE, .event = NOWHERE, .derived = NOWHERE,
        .moment = NOWHERE,
        .missing_codes = derived->missing_codes};
    return place_variable(reader, &variable, index);
}

static bool place_derived(struct reader *reader, size_t i) {
    static const struct texts no_codes = {0};
    struct plan *plan = reader->plan;
    struct derived *derived = &plan->derived[i];
    for (size_t k = 0; k < derived->of_count; k++) {
        if (!place_input(reader, derived, derived->of[k].column, &derived->of[k].place,
                takes_dates(derived->formula) ? VARIABLE_DATE : VARIABLE_NUMBER, &derived->of[k].variable)) {
            return false;
        }
    }
    if (derived->claims && !place_input(reader, derived, derived->claims, &derived->claims_place, VARIABLE_NUMBER,
                               &derived->claims_variable)) {
        return false;
    }
    derived->variable = plan_variable(plan, derived->column);
    if (derived->variable == NOWHERE) {
        struct variable variable = {.column = derived->column, .label = derived->label, .unit = derived->unit,
            .kind = VARIABLE_NUMBER, .outcome = NOWHERE, .visit = NOWHERE, .covariate = NOWHERE, .event = NOWHERE,
            .moment = NOWHERE};
        derived->variable = (int)plan->variable_count;
        plan->variables[plan->variable_count++] = variable;
    }
    struct variable *there = &plan->variables[derived->variable];
    if (there->kind != VARIABLE_NUMBER) {
        return fault_set(reader->fault, FAULT_INPUT, "%s: %s is a number, and %s uses it as something else", reader->name,
            derived->column, there->label);
    }
    there->derived = (int)i;
    there->plausible = derived->plausible.given ? derived->plausible : there->plausible;
    there->unit = *there->unit ? there->unit : derived->unit;
    there->missing_codes = &no_codes; /* those of its inputs are known by then */
    return true;
}

bool settle_derived(struct reader *reader) {
    for (size_t i = 0; i < reader->plan->derived_count; i++) {
        if (!place_derived(reader, i)) {
            return false;
        }
    }
    return true;
}

/* ---- what was recorded after randomisation is not adjusted for ---- */

/* The column of an outcome's follow-up that a variable is or is computed from, NULL where it rests on none. In a file with one row
 * per visit every column of a follow-up's row counts. */
static const char *follow_up_under(const struct plan *plan, int index) {
    const struct variable *variable = &plan->variables[index];
    if (variable->outcome != NOWHERE && (variable->visit > 0 || plan->outcomes[variable->outcome].visit_count == 1)) {
        return variable->column;
    }
    const struct moment *moment = variable->moment == NOWHERE ? NULL : &plan->dates->moments[variable->moment];
    if (moment && moment->kind != MOMENT_RANDOMISED && !(moment->kind == MOMENT_VISIT && !(moment->target > 0))) {
        return variable->column;
    }
    if (variable->derived != NOWHERE) {
        const struct derived *derived = &plan->derived[variable->derived];
        const char *found = NULL;
        for (size_t k = 0; k < derived->of_count && !found; k++) {
            found = follow_up_under(plan, derived->of[k].variable);
        }
        return found;
    }
    for (size_t v = 0; plan->files[variable->place.file].by_visit && v < plan->variable_count; v++) {
        const struct variable *other = &plan->variables[v];
        if (other->outcome != NOWHERE && other->visit > 0 && other->place.column && other->place.slot == variable->place.slot) {
            return variable->column;
        }
    }
    return NULL;
}

static bool covariates_come_first(struct reader *reader, const char *key, const int *ids, size_t count) {
    const struct plan *plan = reader->plan;
    for (size_t i = 0; i < count; i++) {
        const struct covariate *covariate = &plan->covariates[ids[i]];
        const char *late = follow_up_under(plan, covariate->variable);
        if (late) {
            return fault_set(reader->fault, FAULT_INPUT,
                "%s: %s names \"%.60s\", which rests on %.60s, recorded after randomisation, when the arms may have changed it; take a column "
                "from before", reader->name, key, covariate->id, late);
        }
    }
    return true;
}

static bool baselines_come_first(struct reader *reader) {
    const struct plan *plan = reader->plan;
    for (size_t i = 0; i < plan->outcome_count; i++) {
        const struct outcome *outcome = &plan->outcomes[i];
        const char *late = outcome->visit_count > 1 ? follow_up_under(plan, outcome->visits[0].variable) : NULL;
        if (late) {
            return fault_set(reader->fault, FAULT_INPUT,
                "%s: outcomes[%zu].visits[0] is the baseline of \"%.60s\", but it rests on %.60s, recorded after randomisation; take a column "
                "from before", reader->name, i, outcome->id, late);
        }
    }
    return true;
}

bool nothing_comes_late(struct reader *reader) {
    const struct plan *plan = reader->plan;
    return covariates_come_first(reader, "adjust_for", plan->adjust_for, plan->adjust_count) &&
           covariates_come_first(reader, "subgroups", plan->subgroups, plan->subgroup_count) &&
           covariates_come_first(reader, "stratified_by", plan->stratified_by, plan->stratified_count) &&
           baselines_come_first(reader);
}
