/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Plans: one that says everything, what stands where nothing is said, and broken ones with the sentence each must get.
 * The format is our own, so these cases have no source outside the project. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "near.h"
#include "trial_case.h"

static const char whole[] =
    "{'title': 'Harbour Trial', 'participant': 'pid',"
    " 'arm': {'column': 'grp', 'levels': [{'code': 'L', 'label': 'Leaflet', 'reference': true},"
    "   {'code': 'W', 'label': 'Walking', 'ratio': 2}, {'code': 'S'}]},"
    " 'missing_codes': ['999', 'NK'],"
    " 'outcomes': ["
    "  {'id': 'sbp', 'label': 'Pressure', 'unit': 'mmHg', 'role': 'primary', 'better': 'lower', 'scale': 'linear',"
    "   'plausible': [70, 260], 'important_difference': 5, 'responder_threshold': 10, 'auxiliary': ['hr'],"
    "   'limit': {'lower': 1}, 'primary_visit': '8 weeks',"
    "   'estimand': {'population': 'all', 'event_strategy': 'treatment-policy', 'summary': 'mean difference'},"
    "   'visits': [{'label': 'Baseline', 'column': 'sbp_0'}, {'label': '8 weeks', 'column': 'sbp_8'},"
    "     {'label': '26 weeks', 'column': 'sbp_26'}]},"
    "  {'id': 'steps', 'role': 'secondary', 'better': 'higher', 'scale': 'log10', 'missing_codes': ['-1'],"
    "   'visits': [{'label': 'End', 'column': 'steps'}]}],"
    " 'covariates': ["
    "  {'id': 'sex', 'label': 'Sex', 'column': 'sex', 'kind': 'category',"
    "   'levels': [{'code': 'F', 'label': 'Female'}, {'code': 'M'}]},"
    "  {'id': 'age', 'label': 'Age', 'column': 'age', 'kind': 'number', 'unit': 'years', 'eligible': [40, 75],"
    "   'plausible': [18, 110], 'bands': [55, 65], 'missing_codes': []},"
    "  {'id': 'start', 'label': 'Pressure at start', 'column': 'sbp_0', 'kind': 'number', 'bands': [140]}],"
    " 'events': [{'id': 'rescue', 'label': 'Medication', 'column': 'rescue', 'yes': ['Y', '1'], 'no': ['N'],"
    "   'kind': 'rescue', 'date': 'rescue_on', 'reason': 'rescue_why'}],"
    " 'adjust_for': ['age', 'sex'], 'subgroups': ['sex'], 'stratified_by': ['sex'], 'missing_baseline': 'drop',"
    " 'standard_error': 'classical', 'confidence': 0.9, 'blinding': 'coded', 'seed': 9007199254740992,"
    " 'site': {'column': 'centre'}}";

static void read_plan(struct plan *plan, const char *text) {
    struct arena arena;
    arena_init(&arena);
    struct fault fault;
    fault_init(&fault);
    const char *json = quoted(&arena, text);
    if (!plan_read(plan, json, strlen(json), "plan.json", &fault)) {
        fail_msg("%s", fault.message);
    }
    arena_release(&arena);
}

static void test_whole_plan(void **state) {
    (void)state;
    struct plan plan;
    read_plan(&plan, whole);
    assert_string_equal(plan.title, "Harbour Trial");
    assert_string_equal(plan.participant, "pid");
    assert_string_equal(plan.arm_column, "grp");
    assert_int_equal(plan.arm_count, 3);
    assert_int_equal(plan.reference, 0);
    assert_string_equal(plan.arms[1].label, "Walking");
    assert_string_equal(plan.arms[2].label, "S"); /* the code where no label is given */
    near(plan.arms[1].ratio, 2, 0, 0, "ratio");
    near(plan.arms[2].ratio, 1, 0, 0, "ratio by default");
    assert_int_equal(plan.missing_codes.count, 2);
    assert_string_equal(plan.site_column, "centre");
    assert_true(plan.drop_missing_baseline);
    assert_true(plan.robust);
    assert_string_equal(plan.robust_because, "the planned allocation is unequal");
    near(plan.confidence, 0.9, 0, 0, "confidence");
    assert_int_equal(plan.blinding, BLINDING_CODED);
    assert_true(plan.seed == UINT64_C(9007199254740992));
    assert_int_equal(plan.adjust_count, 2);
    assert_int_equal(plan.adjust_for[0], 1);
    assert_int_equal(plan.adjust_for[1], 0);
    assert_int_equal(plan.subgroup_count, 1);
    assert_int_equal(plan.stratified_count, 1);
    plan_release(&plan);
}

static void test_outcomes(void **state) {
    (void)state;
    struct plan plan;
    read_plan(&plan, whole);
    assert_int_equal(plan.outcome_count, 2);
    assert_int_equal(plan.primary, 0);
    const struct outcome *sbp = &plan.outcomes[0], *steps = &plan.outcomes[1];
    assert_string_equal(sbp->label, "Pressure");
    assert_string_equal(sbp->unit, "mmHg");
    assert_true(sbp->primary && sbp->lower_is_better && sbp->scale == SCALE_LINEAR && sbp->plausible.given);
    near(sbp->plausible.low, 70, 0, 0, "low");
    near(sbp->plausible.high, 260, 0, 0, "high");
    near(sbp->important_difference, 5, 0, 0, "important difference");
    near(sbp->responder_threshold, 10, 0, 0, "threshold");
    assert_int_equal(sbp->visit_count, 3);
    assert_int_equal(sbp->primary_visit, 1);
    assert_string_equal(sbp->event_strategy, "treatment-policy");
    assert_ptr_equal(sbp->missing_codes, &plan.missing_codes);
    assert_string_equal(steps->label, "steps");
    assert_string_equal(steps->unit, "");
    assert_true(!steps->primary && !steps->lower_is_better && steps->scale == SCALE_LOG10 && !steps->plausible.given);
    assert_int_equal(steps->visit_count, 1);
    assert_int_equal(steps->primary_visit, 0);
    assert_int_equal(steps->missing_codes->count, 1);
    assert_true(isnan(steps->important_difference) && isnan(steps->responder_threshold));
    plan_release(&plan);
}

/* Every column once: covariates, then visits, then events; a column that is both covariate and baseline is one variable. */
static void test_variables(void **state) {
    (void)state;
    static const struct {
        const char *column, *label;
        enum variable_kind kind;
        int outcome, visit, covariate, event;
        size_t codes;
    } wanted[] = {
        {"sex", "Sex", VARIABLE_CATEGORY, NOWHERE, NOWHERE, 0, NOWHERE, 2},
        {"age", "Age", VARIABLE_NUMBER, NOWHERE, NOWHERE, 1, NOWHERE, 0},
        {"sbp_0", "Pressure at start", VARIABLE_NUMBER, 0, 0, 2, NOWHERE, 2},
        {"sbp_8", "Pressure, 8 weeks", VARIABLE_NUMBER, 0, 1, NOWHERE, NOWHERE, 2},
        {"sbp_26", "Pressure, 26 weeks", VARIABLE_NUMBER, 0, 2, NOWHERE, NOWHERE, 2},
        {"steps", "steps", VARIABLE_NUMBER, 1, 0, NOWHERE, NOWHERE, 1},
        {"rescue", "Medication", VARIABLE_EVENT, NOWHERE, NOWHERE, NOWHERE, 0, 0},
    };
    struct plan plan;
    read_plan(&plan, whole);
    assert_int_equal(plan.variable_count, sizeof wanted / sizeof *wanted);
    for (size_t i = 0; i < plan.variable_count; i++) {
        const struct variable *got = &plan.variables[i];
        assert_string_equal(got->column, wanted[i].column);
        assert_string_equal(got->label, wanted[i].label);
        assert_int_equal(got->kind, wanted[i].kind);
        assert_int_equal(got->outcome, wanted[i].outcome);
        assert_int_equal(got->visit, wanted[i].visit);
        assert_int_equal(got->covariate, wanted[i].covariate);
        assert_int_equal(got->event, wanted[i].event);
        assert_int_equal(got->missing_codes->count, wanted[i].codes);
        assert_int_equal(plan_variable(&plan, wanted[i].column), i);
    }
    assert_true(plan.variables[2].plausible.given); /* from the outcome */
    assert_string_equal(plan.variables[2].unit, "mmHg");
    assert_int_equal(plan.outcomes[0].visits[0].variable, 2);
    assert_int_equal(plan.covariates[2].variable, 2);
    assert_int_equal(plan_variable(&plan, "pid"), NOWHERE);
    assert_int_equal(plan_outcome(&plan, "steps"), 1);
    assert_int_equal(plan_covariate(&plan, "age"), 1);
    assert_int_equal(plan_event(&plan, "rescue"), 0);
    assert_int_equal(plan_outcome(&plan, "rescue"), NOWHERE);
    plan_release(&plan);
}

static void test_defaults(void **state) {
    (void)state;
    struct plan plan;
    read_plan(&plan, "\xEF\xBB\xBF{'title': 'T', 'participant': 'pid', 'outcomes': [{'id': 'y', 'role': 'primary',"
                     " 'better': 'higher', 'visits': [{'label': 'End', 'column': 'y'}]}]}");
    assert_null(plan.arm_column);
    assert_int_equal(plan.arm_count, 0);
    assert_int_equal(plan.missing_codes.count + plan.covariate_count + plan.event_count + plan.adjust_count +
                         plan.subgroup_count + plan.stratified_count, 0);
    assert_false(plan.drop_missing_baseline);
    assert_false(plan.robust);
    assert_null(plan.robust_because);
    assert_null(plan.site_column);
    near(plan.confidence, 0.95, 0, 0, "confidence");
    assert_int_equal(plan.blinding, BLINDING_POOLED);
    assert_true(plan.seed == 1);
    assert_int_equal(plan.outcomes[0].scale, SCALE_LINEAR);
    plan_release(&plan);
}

static void test_why_robust(void **state) {
    (void)state;
    static const struct {
        const char *arms, *key, *because;
    } cases[] = {
        {"{'code': 'L', 'reference': true}, {'code': 'W'}", "'seed': 1", NULL},
        {"{'code': 'L', 'reference': true}, {'code': 'W'}", "'standard_error': 'classical'", NULL},
        {"{'code': 'L', 'reference': true}, {'code': 'W'}", "'standard_error': 'robust'", "the plan asks for it"},
        {"{'code': 'L', 'reference': true, 'ratio': 2}, {'code': 'W', 'ratio': 2}", "'seed': 1", NULL},
        {"{'code': 'L', 'reference': true}, {'code': 'W', 'ratio': 2}", "'seed': 1", "the planned allocation is unequal"},
        {"{'code': 'L', 'reference': true}, {'code': 'W'}, {'code': 'S'}", "'seed': 1", "there are more than two arms"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        char text[512];
        snprintf(text, sizeof text, "{'title': 'T', 'participant': 'pid', 'arm': {'column': 'g', 'levels': [%s]}, %s, 'outcomes':"
            " [{'id': 'y', 'role': 'primary', 'better': 'higher', 'visits': [{'label': 'End', 'column': 'y'}]}]}", cases[i].arms,
            cases[i].key);
        struct plan plan;
        read_plan(&plan, text);
        assert_int_equal(plan.robust, cases[i].because != NULL);
        expect_text(plan.robust_because ? plan.robust_because : "", cases[i].because ? cases[i].because : "", text);
        plan_release(&plan);
    }
}

/* ---- broken plans: in `whole` the first `find` becomes `put` ---- */

static const struct {
    const char *find, *put, *sentence;
} broken[] = {
    {"'title':", "'titel':", "plan.json: the key \"titel\" is not one a plan has here; known are: title participant arm missing_codes "
        "outcomes covariates events adjust_for missing_baseline subgroups confidence blinding seed site stratified_by standard_error files screening dates derived"},
    {"'title': 'Harbour Trial',", "'title': 'A', 'title': 'B',", "plan.json: the key \"title\" stands there twice; keep one"},
    {"'title': 'Harbour Trial',", "", "plan.json: title is missing; a plan needs it"},
    {"'Harbour Trial'", "''", "plan.json: title must be a text in quotes that is not empty"},
    {"'Harbour Trial'", "7", "plan.json: title must be a text in quotes that is not empty"},
    {"'participant': 'pid',", "", "plan.json: participant is missing; a plan needs it"},
    {"'Harbour Trial',", "'Harbour Trial'", "plan.json, line 1, column 27: this is not JSON from here on; mend the text (a comma, a quote or a "
        "bracket?) and try again"},
    {"'column': 'grp'", "'columns': 'grp'", "plan.json: the key \"columns\" in arm is not one a plan has here; known are: column levels file visit"},
    {"'column': 'grp', 'levels'", "'levels'", "plan.json: arm.column is missing; a plan needs it"},
    {"'grp'", "'pid'", "plan.json: arm.column is the participant's column; a column has one meaning"},
    {"'code': 'W', 'label': 'Walking', 'ratio': 2", "'code': 'W', 'reference': true",
        "plan.json: arm.levels must mark exactly one arm as the reference, with \"reference\": true"},
    {"'reference': true", "'reference': false", "plan.json: arm.levels must mark exactly one arm as the reference, with \"reference\": true"},
    {"'reference': true", "'reference': 'yes'", "plan.json: arm.levels[0].reference must be true or false"},
    {"'ratio': 2", "'ratio': 0", "plan.json: arm.levels[1].ratio must be a number above 0"},
    {"{'code': 'S'}", "{'code': 'L'}", "plan.json: arm.levels[2] has the code of an arm before it; each arm needs its own"},
    {"{'code': 'S'}", "'S'", "plan.json: arm.levels[2] must be an object in braces"},
    {"['999', 'NK']", "'999'", "plan.json: missing_codes must be a list of texts, such as [\"999\"]"},
    {"['999', 'NK']", "[999]", "plan.json: missing_codes must hold texts in quotes only, such as [\"999\"]"},
    {"['999', 'NK']", "['999', ' ']", "plan.json: missing_codes holds a blank; a blank cell is missing without a code, leave it out"},
    {"['999', 'NK']", "['999', '999']", "plan.json: missing_codes holds \"999\" twice; keep one"},
    {"'role': 'primary'", "'role': 'secondary'", "plan.json: outcomes has none with \"role\": \"primary\"; a plan needs exactly one"},
    {"'role': 'secondary'", "'role': 'primary'",
        "plan.json: outcomes has more than one with \"role\": \"primary\"; keep one and make the others secondary"},
    {"'role': 'primary'", "'role': 'main'", "plan.json: outcomes[0].role must be \"primary\" or \"secondary\""},
    {"'role': 'secondary', ", "", "plan.json: outcomes[1] must say its role (primary or secondary) and which way is better (lower or higher)"},
    {"'scale': 'linear'", "'scale': 'ln'", "plan.json: outcomes[0].scale must be \"linear\" or \"log10\""},
    {"[70, 260]", "[260, 70]", "plan.json: outcomes[0].plausible must be two numbers, the lower first, such as [70, 260]"},
    {"[70, 260]", "[70, 1e999]", "plan.json: outcomes[0].plausible must be two numbers, the lower first, such as [70, 260]"},
    {"[70, 260]", "[70, 260, 300]", "plan.json: outcomes[0].plausible must be two numbers, the lower first, such as [70, 260]"},
    {"'important_difference': 5", "'important_difference': '5'", "plan.json: outcomes[0].important_difference must be a number"},
    {"'primary_visit': '8 weeks'", "'primary_visit': '9 weeks'", "plan.json: outcomes[0].primary_visit is not the label of one of its visits"},
    {"'primary_visit': '8 weeks'", "'primary_visit': 'Baseline'", "plan.json: outcomes[0].primary_visit is the baseline; name a follow-up"},
    {"'column': 'sbp_8'", "'column': 'sbp_0'", "plan.json: outcomes[0].visits[1] repeats the label or column of a visit before it"},
    {"'column': 'sbp_8'", "'file': 'x', 'column': 'sbp_8'",
        "plan.json: outcomes[0].visits[1].file \"x\" is not the id of a file of this plan"},
    {"[{'label': 'End', 'column': 'steps'}]", "[]",
        "plan.json: outcomes[1].visits must list at least one visit with its label and column, the baseline first"},
    {"'column': 'steps'", "'column': 'sbp_26'",
        "plan.json: the column \"sbp_26\" is used twice, for Pressure, 26 weeks and for steps; a column has one meaning"},
    {"'column': 'steps'", "'column': 'sex'",
        "plan.json: the column \"sex\" is used as two different kinds, for Sex and for steps; a column has one meaning"},
    {"'column': 'steps'", "'column': 'grp'", "plan.json: the column \"grp\" is both steps and the arm; a column has one meaning"},
    {"'column': 'steps'", "'column': 'pid'",
        "plan.json: the column \"pid\" is both steps and the participant's identifier; a column has one meaning"},
    {"'column': 'age'", "'column': 'sbp_0'",
        "plan.json: the column \"sbp_0\" is used twice, for Age and for Pressure at start; a column has one meaning"},
    {"'id': 'age'", "'id': 'sex'", "plan.json: covariates[1].id repeats \"sex\"; every outcome, covariate and event needs its own"},
    {"'id': 'rescue'", "'id': 'sbp'", "plan.json: events[0].id repeats \"sbp\"; every outcome, covariate and event needs its own"},
    {"'id': 'age'", "'id': 'a,b'", "plan.json: covariates[1].id must not hold a comma, = or &"},
    {"'kind': 'number', 'unit': 'years'", "'unit': 'years'", "plan.json: covariates[1].kind is missing; say \"number\" or \"category\""},
    {"'kind': 'number', 'unit': 'years'", "'kind': 'date'", "plan.json: covariates[1].kind must be \"category\" or \"number\""},
    {"'kind': 'number', 'unit': 'years'", "'kind': 'category'",
        "plan.json: covariates[1] is a category; bands, eligible and plausible belong to numbers"},
    {"'kind': 'category'", "'kind': 'number'",
        "plan.json: covariates[0].levels belong to a category, and this is a number; use bands for cut points"},
    {"{'code': 'M'}", "{'code': 'F'}", "plan.json: covariates[0].levels[1] has the code of a level before it; each level needs its own"},
    {"[55, 65]", "[65, 55]", "plan.json: covariates[1].bands must be a list of increasing cut points, such as [55, 65]"},
    {"[55, 65]", "[55, 55]", "plan.json: covariates[1].bands must be a list of increasing cut points, such as [55, 65]"},
    {"'no': ['N']", "'no': ['Y']", "plan.json: events[0] has a code that means yes and no at once"},
    {"'no': ['N']", "'no': []", "plan.json: events[0] must list the codes that mean yes and those that mean no"},
    {"'kind': 'rescue'", "'kind': 'moved'", "plan.json: events[0].kind must be stopped-treatment, rescue, withdrew or died"},
    {"['age', 'sex']", "['age', 'weight']", "plan.json: adjust_for names \"weight\", which is not the id of a covariate of this plan"},
    {"['age', 'sex']", "['age', 'age']", "plan.json: adjust_for names \"age\" twice"},
    {"'subgroups': ['sex']", "'subgroups': ['sbp']", "plan.json: subgroups names \"sbp\", which is not the id of a covariate of this plan"},
    {"'missing_baseline': 'drop'", "'missing_baseline': 'locf'", "plan.json: missing_baseline must be \"mean\" or \"drop\""},
    {"'standard_error': 'classical'", "'standard_error': 'hc3'", "plan.json: standard_error must be \"classical\" or \"robust\""},
    {"'confidence': 0.9", "'confidence': 95", "plan.json: confidence must be at least 0.5 and below 1, such as 0.95"},
    {"'confidence': 0.9", "'confidence': '95%'", "plan.json: confidence must be a number"},
    {"'blinding': 'coded'", "'blinding': 'blind'", "plan.json: blinding must be \"pooled\", \"coded\" or \"unblinded\""},
    {"9007199254740992", "1.5", "plan.json: seed must be a whole number from 0"},
    {"9007199254740992", "-1", "plan.json: seed must be a whole number from 0"},
    {"9007199254740992", "1e300", "plan.json: seed must be a whole number from 0"},
    {"'site': {'column': 'centre'}", "'site': 'centre'", "plan.json: site must be an object in braces"},
    {"'outcomes': [", "'files': [], 'outcomes': [", "plan.json: files is empty; name at least one file, or leave the key out"},
    {"'kind': 'rescue'", "'strategy': 'ignore'",
        "plan.json: events[0].strategy must be treatment-policy, hypothetical, composite, while-on-treatment or principal-stratum"},
    {"'reason': 'rescue_why'}", "'reason': 'rescue_why'}, {'id': 'again', 'column': 'rescue', 'yes': ['1', 'Y'], 'no': ['N']}",
        "plan.json: Medication and again rest on the column \"rescue\" with the same codes for yes; keep one"},
    {"'outcomes': [", "'screening': {}, 'outcomes': [", "plan.json: screening.source is missing; a plan needs it"},
    {"'outcomes': [", "'screening': {'source': 'log', 'assessed': 1.5}, 'outcomes': [",
        "plan.json: screening.assessed must be a whole number from 0"},
    {"'outcomes': [", "'screening': {'source': 'log'}, 'outcomes': [",
        "plan.json: screening.assessed must be a whole number from 0"},
    {"'outcomes': [", "'screening': {'source': 'log', 'assessed': 9, 'reasons': {}}, 'outcomes': [",
        "plan.json: screening.reasons must be a list such as [{\"reason\": \"declined\", \"n\": 70}]"},
    {"'outcomes': [", "'screening': {'source': 'log', 'assessed': 9, 'reasons': [{'reason': 'a', 'n': 9}, {'reason': 'b', 'n': 1}]}, 'outcomes': [",
        "plan.json: screening gives reasons for more people than were assessed"},
    {"'outcomes': [", "'screening': {'source': 'log', 'assessed': 9, 'reasons': [{'reason': 'a', 'n': 1}, {'reason': 'a', 'n': 1}]}, 'outcomes': [",
        "plan.json: screening.reasons[1].reason is that of an entry before it; add their numbers up"},
    {"'outcomes': [", "'derived': {}, 'outcomes': [", "plan.json: derived must be a list in square brackets"},
    {"'Female'", "'Femme \xE9'", "plan.json, line 1: a character that is not UTF-8; save the file as UTF-8 and try again"},
};

static void refuse_plan(const char *json, size_t length, const char *sentence) {
    struct plan plan;
    struct fault fault;
    fault_init(&fault);
    if (plan_read(&plan, json, length, "plan.json", &fault)) {
        fail_msg("a plan was taken that must get: %s", sentence);
    }
    expect_text(fault.message, sentence, json);
    assert_int_equal(fault.code, FAULT_INPUT);
    assert_null(plan.arena.block); /* everything released */
}

static void test_broken_plans(void **state) {
    (void)state;
    for (size_t i = 0; i < sizeof broken / sizeof *broken; i++) {
        const char *at = strstr(whole, broken[i].find);
        if (!at) {
            fail_msg("case %zu: \"%s\" is not in the plan", i, broken[i].find);
        }
        struct arena arena;
        arena_init(&arena);
        const char *json = quoted(&arena, arena_format(&arena, "%.*s%s%s", (int)(at - whole), whole, broken[i].put, at + strlen(broken[i].find)));
        refuse_plan(json, strlen(json), broken[i].sentence);
        arena_release(&arena);
    }
}

static void test_no_plan_at_all(void **state) {
    (void)state;
    static const struct {
        const char *text;
        size_t length;
        const char *sentence;
    } cases[] = {
        {"", 0, "plan.json: the file is empty; a plan is an object in braces"},
        {"  \n", 3, "plan.json: the file is empty; a plan is an object in braces"},
        {"[]", 2, "plan.json: the plan must be an object in braces"},
        {"{}\n{}", 5, "plan.json, line 2, column 1: this is not JSON from here on; mend the text (a comma, a quote or a bracket?) and try again"},
        {"{\"\xC3\xA9\" 1}", 8, "plan.json, line 1, column 6: this is not JSON from here on; mend the text (a comma, a quote or a bracket?) and try "
                                "again"},
        {"{}\0", 3, "plan.json, line 1, column 3: this is not JSON from here on; mend the text (a comma, a quote or a bracket?) and try again"},
        {"\xFF\xFE{\0", 4, "plan.json, line 1: a character that is not UTF-8; save the file as UTF-8 and try again"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        refuse_plan(cases[i].text, cases[i].length, cases[i].sentence);
    }
}

/* A plan cut off anywhere is refused with a sentence, never read and never a crash. */
static void test_cut_off_anywhere(void **state) {
    (void)state;
    struct arena arena;
    arena_init(&arena);
    const char *json = quoted(&arena, whole);
    for (size_t length = 0; length < strlen(json); length++) {
        struct plan plan;
        struct fault fault;
        fault_init(&fault);
        assert_false(plan_read(&plan, json, length, "plan.json", &fault));
        assert_true(strncmp(fault.message, "plan.json", 9) == 0);
    }
    arena_release(&arena);
}

static void test_bands(void **state) {
    (void)state;
    static const double bands[] = {50, 60.5};
    static const struct {
        double value;
        size_t band;
        const char *words;
    } cases[] = {{-1, 0, "below 50"}, {49.999, 0, "below 50"}, {50, 1, "50 to below 60.5"}, {60.4, 1, "50 to below 60.5"},
        {60.5, 2, "60.5 and above"}, {1e9, 2, "60.5 and above"}};
    struct arena arena;
    arena_init(&arena);
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        size_t band = band_of(bands, 2, cases[i].value);
        assert_int_equal(band, cases[i].band);
        assert_string_equal(band_words(&arena, bands, 2, band), cases[i].words);
    }
    assert_int_equal(band_of(bands, 0, 5), 0);
    assert_string_equal(band_words(&arena, bands, 0, 0), "all");
    arena_release(&arena);
}

static void test_words_of_settings(void **state) {
    (void)state;
    enum scale scale;
    enum blinding blinding;
    assert_true(scale_read("linear", &scale) && scale == SCALE_LINEAR);
    assert_true(scale_read("log10", &scale) && scale == SCALE_LOG10);
    assert_false(scale_read("Log10", &scale) || scale_read("", &scale));
    for (int i = 0; i < 3; i++) {
        assert_true(blinding_read(blinding_name((enum blinding)i), &blinding) && (int)blinding == i);
    }
    assert_false(blinding_read("open", &blinding));
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_whole_plan), cmocka_unit_test(test_outcomes), cmocka_unit_test(test_variables),
        cmocka_unit_test(test_defaults), cmocka_unit_test(test_why_robust), cmocka_unit_test(test_broken_plans),
        cmocka_unit_test(test_no_plan_at_all), cmocka_unit_test(test_cut_off_anywhere), cmocka_unit_test(test_bands),
        cmocka_unit_test(test_words_of_settings),
    };
    return cmocka_run_group_tests_name("trial/plan", tests, NULL, NULL);
}
