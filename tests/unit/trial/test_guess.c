/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What columns probably mean. The headers are invented in styles that exports commonly have, with invented values; no
 * published source says what a guess must be. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <cmocka.h>
#include "demo/quayside.h"
#include "trial/guess.h"
#include <math.h>
#include <stdio.h>
#include <string.h>

/* ---- a summary of a guess in one line per series, so that a case is a text ---- */

static void summarise(const struct guess *guess, struct text *out) {
    text_clear(out);
    text_format(out, "%s/%s", guess->participant == NOWHERE ? "-" : guess->columns[guess->participant].name,
        guess->arm == NOWHERE ? "-" : guess->columns[guess->arm].name);
    for (size_t i = 0; i < guess->series_count; i++) {
        text_format(out, " %s:", guess->series[i].id);
        for (size_t j = 0; j < guess->series[i].count; j++) {
            text_format(out, "%s%s=%s", j ? "," : "", guess->columns[guess->series[i].columns[j]].name,
                guess->series[i].visits[j]);
        }
    }
}

/* A file with this header: 24 records, identifiers first, then an arm where asked, then numbers. A header word may end
 * in
 * ":kind", which says what its values are: i identifier, a arm, s sex, d date, y yes or no, t free text, n number. */
static void make_file(const char *header, struct text *csv) {
    char kinds[32], copy[512];
    size_t count = 0;
    text_clear(csv);
    snprintf(copy, sizeof copy, "%s", header);
    for (char *word = strtok(copy, " "); word; word = strtok(NULL, " ")) {
        char *colon = strrchr(word, ':');
        kinds[count] = colon ? colon[1] : 'n';
        if (colon) {
            *colon = '\0';
        }
        text_format(csv, "%s%s", count ? "," : "", word);
        count++;
    }
    text_char(csv, '\n');
    for (size_t record = 0; record < 24; record++) {
        for (size_t i = 0; i < count; i++) {
            text_string(csv, i ? "," : "");
            size_t mixed = (record * 7 + i * 5) % 24;
            switch (kinds[i]) {
            case 'i':
                text_format(csv, "P%03zu", 100 + record);
                break;
            case 'a':
                text_string(csv, record % 2 ? "Control" : "Active");
                break;
            case 's':
                text_string(csv, mixed % 2 ? "F" : "M");
                break;
            case 'd':
                text_format(csv, "2026-%02zu-%02zu", 1 + mixed % 12, 1 + mixed);
                break;
            case 'y':
                text_string(csv, mixed % 3 ? "N" : "Y");
                break;
            case 't':
                text_format(csv, "seen by nurse number %zu", mixed);
                break;
            default:
                text_format(csv, "%zu.%zu", 100 + mixed, mixed % 10);
            }
        }
        text_char(csv, '\n');
    }
}

static const struct {
    const char *header, *wanted;
} styles[] = {
    {"pid:i grp:a sbp_0 sbp_8 sbp_26", "pid/grp sbp:sbp_0=Baseline,sbp_8=8 weeks,sbp_26=26 weeks"},
    {"SubjID:i Arm:a BP_Base BP_Final", "SubjID/Arm bp:BP_Base=Baseline,BP_Final=Final visit"},
    {"id:i treatment:a pain.pre pain.post", "id/treatment pain:pain.pre=Baseline,pain.post=Follow-up"},
    {"USUBJID:i TRT:a WEIGHTV1 WEIGHTV2 WEIGHTV3",
        "USUBJID/TRT weight:WEIGHTV1=Visit 1,WEIGHTV2=Visit 2,WEIGHTV3=Visit 3"},
    {"patient_id:i allocation:a week0_hb week8_hb", "patient_id/allocation hb:week0_hb=Baseline,week8_hb=8 weeks"},
    {"record_id:i randomised_to:a qol_baseline qol_month3 qol_month12",
        "record_id/randomised_to qol:qol_baseline=Baseline,qol_month3=3 months,qol_month12=12 months"},
    {"ptid:i Treat:a Prewt Postwt", "ptid/Treat wt:Prewt=Baseline,Postwt=Follow-up"},
    {"id:i trt:a bdi.pre bdi.2m bdi.3m bdi.8m",
        "id/trt bdi:bdi.pre=Baseline,bdi.2m=2 months,bdi.3m=3 months,bdi.8m=8 months"},
    {"id:i drug:a baseline number3m number12m",
        "id/drug number:baseline=Baseline,number3m=3 months,number12m=12 months"},
    {"id:i arm:a before month2 month8", "id/arm outcome:before=Baseline,month2=2 months,month8=8 months"},
    {"Subject:i Group:a preSBP postSBP preDBP postDBP",
        "Subject/Group sbp:preSBP=Baseline,postSBP=Follow-up dbp:preDBP=Baseline,postDBP=Follow-up"},
    {"id:i arm:a baseline_walk followup_walk", "id/arm walk:baseline_walk=Baseline,followup_walk=Follow-up"},
    {"id:i arm:a t0_score t1_score t2_score", "id/arm score:t0_score=Baseline,t1_score=Visit 1,t2_score=Visit 2"},
    {"id:i arm:a score_0 score_3 score_9", "id/arm score:score_0=Baseline,score_3=3 months,score_9=9 months"},
    {"id:i arm:a hba1c_screening hba1c_baseline hba1c_wk12",
        "id/arm hba1c:hba1c_baseline=Baseline,hba1c_wk12=12 weeks"},
    {"id:i arm:a t3_0 t3_12 t4_0 t4_12", "id/arm t3:t3_0=Baseline,t3_12=12 weeks t4:t4_0=Baseline,t4_12=12 weeks"},
    {"id:i arm:a Day1.CRP Day15.CRP", "id/arm crp:Day1.CRP=1 day,Day15.CRP=15 days"},
    /* what must not be taken for visits */
    {"id:i arm:a il6 il8 crp", "id/arm"},
    {"id:i arm:a q1 q2 q3 q4 q5 q6 q7 q8 q9", "id/arm"},
    {"id:i age_group:a sex:s pressure assure", "id/-"},
    {"arm:a weight height", "-/arm"},
};

static void every_style_of_header_is_read(void **state) {
    (void)state;
    struct text csv, summary;
    text_init(&csv);
    text_init(&summary);
    int wrong = 0;
    for (size_t i = 0; i < sizeof styles / sizeof *styles; i++) {
        struct fault fault;
        fault_init(&fault);
        struct cells cells;
        struct guess guess;
        make_file(styles[i].header, &csv);
        assert_true(cells_read(&cells, csv.data, csv.length, "export.csv", &fault));
        guess_take(&guess, &cells, "export.csv");
        summarise(&guess, &summary);
        if (strcmp(summary.data, styles[i].wanted) != 0) {
            print_error("%s\n    got    %s\n    wanted %s\n", styles[i].header, summary.data, styles[i].wanted);
            wrong++;
        }
        guess_release(&guess);
        cells_release(&cells);
    }
    text_release(&csv);
    text_release(&summary);
    assert_int_equal(wrong, 0);
}

/* Open data whose columns nobody named for us: see the sources at the head of each file. */
static const struct {
    const char *file, *wanted;
} open_data[] = {
    {"anorexia.csv", "-/Treat wt:Prewt=Baseline,Postwt=Follow-up"},
    {"btheb.csv",
        "-/treatment outcome:before=Baseline,month2=2 months,month3=3 months,month5=5 months,month8=8 months"},
    {"polyps.csv", "-/treatment number:baseline=Baseline,number3m=3 months"},
    {"sleep.csv", "-/group"},
};

static void open_data_are_read(void **state) {
    (void)state;
    struct text csv, summary;
    text_init(&csv);
    text_init(&summary);
    for (size_t i = 0; i < sizeof open_data / sizeof *open_data; i++) {
        char path[96], line[4096];
        snprintf(path, sizeof path, "tests/reference/data/%s", open_data[i].file);
        FILE *file = fopen(path, "r"); /* tests run in the project's folder */
        assert_non_null(file);
        text_clear(&csv);
        while (fgets(line, sizeof line, file)) {
            text_string(&csv, *line == '#' ? "" : line);
        }
        fclose(file);
        struct fault fault;
        fault_init(&fault);
        struct cells cells;
        struct guess guess;
        assert_true(cells_read(&cells, csv.data, csv.length, open_data[i].file, &fault));
        guess_take(&guess, &cells, open_data[i].file);
        summarise(&guess, &summary);
        assert_string_equal(summary.data, open_data[i].wanted);
        guess_release(&guess);
        cells_release(&cells);
    }
    text_release(&csv);
    text_release(&summary);
}

/* ---- one column at a time ---- */

static const struct {
    const char *name, *values; /* every value is repeated in turn up to 60 records */
    enum guess_role role;
    const char *codes; /* the suspected codes for missing */
} columns[] = {
    {"sex", "F M F M M", GUESS_CATEGORY, ""},
    {"age", "41 52 63 70 58 47 999", GUESS_NUMBER, "999"},
    {"age", "41 52 63 70 58 47 -9", GUESS_NUMBER, "-9"},
    {"bmi", "21.5 24.4 29.9 31.2 27.0 25.5 99", GUESS_NUMBER, "99"},
    {"age", "41 52 63 77 58 47 88 99 91 85 81", GUESS_NUMBER, ""},
    {"change", "-9 -4 0 3 -1 8 -12 2", GUESS_NUMBER, ""},
    {"crp", "1.2 3.4 88 2.2 40 99 250 130 17 5 80 110 300", GUESS_NUMBER, ""},
    {"weight", "70.1 82.5 NA 91.0 66.4 75.2", GUESS_NUMBER, "NA"},
    {"weight", "70,1 82,5 64,8 91,0 66,4 75,2 93,3", GUESS_NUMBER, ""},
    {"smoker", "1 2 1 9 2 2", GUESS_CATEGORY, "9"},
    {"ethnicity", "White Black Asian White unknown White", GUESS_CATEGORY, "unknown"},
    {"started", "2026-01-05 2026-02-11 2026-03-01 2026-02-02", GUESS_DATE, ""},
    {"started_on", "05/01/2026 11/02/2026 01/03/2026", GUESS_DATE, ""},
    {"seen", "05-Jan-2026 11-Feb-2026 01Mar2026", GUESS_DATE, ""},
    {"died", "0 1 0 0 0", GUESS_EVENT, ""},
    {"rescue", "Y N N N", GUESS_EVENT, ""},
    {"diabetes", "yes no no", GUESS_CATEGORY, ""},
    {"constant", "7 7 7", GUESS_NOTHING, ""},
    {"site", "101 102 103 104 105 106 107", GUESS_CATEGORY, ""},
};

static void role_and_codes_follow_from_name_and_values(void **state) {
    (void)state;
    struct text csv, codes;
    text_init(&csv);
    text_init(&codes);
    int wrong = 0;
    for (size_t i = 0; i < sizeof columns / sizeof *columns; i++) {
        text_clear(&csv);
        text_clear(&codes);
        text_format(&csv, "%s\tother\n", columns[i].name);
        const char *at = columns[i].values;
        for (size_t record = 0; record < 60; record++) {
            size_t length = strcspn(at, " ");
            text_format(&csv, "%.*s\tx\n", (int)length, at);
            at = at[length] ? at + length + 1 : columns[i].values;
        }
        struct fault fault;
        fault_init(&fault);
        struct cells cells;
        struct guess guess;
        assert_true(cells_read(&cells, csv.data, csv.length, "export.csv", &fault));
        guess_take(&guess, &cells, "export.csv");
        const struct guess_column *column = &guess.columns[0];
        for (size_t j = 0; j < column->value_count; j++) {
            if (column->values[j].missing_code) {
                text_format(&codes, "%s%s", codes.length ? " " : "", column->values[j].text);
            }
        }
        if (column->role != columns[i].role || strcmp(codes.data, columns[i].codes) != 0) {
            print_error("%s: %s\n    got %s, codes \"%s\"; wanted %s, codes \"%s\"\n", columns[i].name,
                columns[i].values, guess_role_name(column->role), codes.data, guess_role_name(columns[i].role),
                columns[i].codes);
            wrong++;
        }
        guess_release(&guess);
        cells_release(&cells);
    }
    text_release(&csv);
    text_release(&codes);
    assert_int_equal(wrong, 0);
}

/* ---- the draft of a plan ---- */

static void draft_of(const char *csv, size_t length, struct text *out, struct plan *plan) {
    struct fault fault;
    fault_init(&fault);
    struct cells cells;
    struct guess guess;
    struct json json;
    assert_true(cells_read(&cells, csv, length, "walk_trial.csv", &fault));
    guess_take(&guess, &cells, "walk_trial.csv");
    text_clear(out);
    json_init(&json, out);
    guess_json(&guess, &json);
    json_finish(&json);
    text_clear(out);
    json_init(&json, out);
    guess_plan_json(&guess, &json);
    json_finish(&json);
    guess_release(&guess);
    cells_release(&cells);
    if (!plan_read(plan, out->data, out->length, "the draft", &fault)) {
        fail_msg("%s\n%s", fault.message, out->data);
    }
}

static void the_draft_for_the_demonstration_is_a_plan(void **state) {
    (void)state;
    struct quayside quayside;
    quayside_make(QUAYSIDE_SEED, &quayside);
    struct text out;
    text_init(&out);
    struct plan plan;
    draft_of(quayside.export_csv.data, quayside.export_csv.length, &out, &plan);
    assert_string_equal(plan.title, "Walk trial");
    assert_string_equal(plan.participant, "pid");
    assert_string_equal(plan.arm_column, "grp");
    assert_int_equal(plan.arm_count, 2);
    assert_int_equal(plan.outcome_count, 2);
    assert_string_equal(plan.outcomes[0].id, "sbp");
    assert_string_equal(plan.outcomes[0].label, "Systolic blood pressure");
    assert_string_equal(plan.outcomes[0].unit, "mmHg");
    assert_true(plan.outcomes[0].primary);
    assert_int_equal(plan.outcomes[0].scale, SCALE_LINEAR);
    assert_int_equal(plan.outcomes[0].visit_count, 3);
    assert_string_equal(plan.outcomes[0].visits[2].label, "26 weeks");
    assert_false(plan.outcomes[0].plausible.given);
    assert_string_equal(plan.outcomes[1].id, "uacr");
    assert_int_equal(plan.outcomes[1].scale, SCALE_LOG10);
    assert_int_equal(plan.missing_codes.count, 1);
    assert_string_equal(plan.missing_codes.item[0], "999");
    int sex = plan_covariate(&plan, "sex"), age = plan_covariate(&plan, "age");
    assert_int_not_equal(sex, NOWHERE);
    assert_int_equal(plan.covariates[sex].level_count, 2); /* not the lower-case variants */
    assert_string_equal(
        plan.covariates[sex].levels[0].label, *plan.covariates[sex].levels[0].code == 'F' ? "Female" : "Male");
    assert_int_not_equal(age, NOWHERE);
    assert_true(plan.covariates[age].number);
    assert_int_equal(plan.subgroup_count, 3);
    assert_int_equal(plan.event_count, 1);
    assert_string_equal(plan.events[0].yes.item[0], "Y");
    assert_int_equal(plan.adjust_count, 0);
    assert_int_equal(plan.blinding, BLINDING_POOLED);
    plan_release(&plan);
    text_release(&out);
    quayside_release(&quayside);
}

static void a_code_that_is_a_value_elsewhere_stays_with_its_column(void **state) {
    (void)state;
    struct text csv, out;
    text_init(&csv);
    text_init(&out);
    text_string(&csv, "id,arm,age,bmi,pain_0,pain_8\n");
    for (size_t i = 0; i < 60; i++) {
        text_format(&csv, "%zu,%s,%s,%zu.%zu,%zu,%zu\n", 1000 + i, i % 2 ? "placebo" : "active",
            i % 12 ? i % 2 ? "77" : "61" : "99", 20 + i % 11, i % 10, 20 + i % 50, 15 + (i * 7) % 60);
        if (i == 30) { /* one body mass index is the code 99, twice */
            text_string(&csv, "2001,active,99,99,40,30\n2002,placebo,88,99,41,31\n");
        }
    }
    for (size_t i = 0; i < 40; i++) {
        text_format(&csv, "%zu,active,%zu,25,30,30\n", 3000 + i, 60 + i);
    }
    struct plan plan;
    draft_of(csv.data, csv.length, &out, &plan);
    int bmi = plan_covariate(&plan, "bmi"), age = plan_covariate(&plan, "age");
    assert_int_equal(plan.missing_codes.count, 0);
    assert_int_equal(plan.covariates[bmi].missing_codes->count, 1);
    assert_string_equal(plan.covariates[bmi].missing_codes->item[0], "99");
    assert_int_equal(plan.covariates[age].missing_codes->count, 0);
    assert_string_equal(plan.arms[plan.reference].code, "placebo");
    plan_release(&plan);
    text_release(&csv);
    text_release(&out);
}

static void any_cells_give_a_guess(void **state) {
    (void)state;
    static const char *const files[] = {"a\n", "a,b\n", "a\n1\n", "a\n\n", "a,b\n,\n,\n",
        "\u00e9\u00e8,\u4f53\u91cd\n1,2\n", "_,-\n1,2\n", "0,1\n1,2\n3,4\n", "baseline,pre,post,0\n1,2,3,4\n",
        "id\n1\n2\n3\n"};
    for (size_t i = 0; i < sizeof files / sizeof *files; i++) {
        struct fault fault;
        fault_init(&fault);
        struct cells cells;
        if (!cells_read(&cells, files[i], strlen(files[i]), "x.csv", &fault)) {
            continue;
        }
        struct guess guess;
        struct text out;
        struct json json;
        text_init(&out);
        guess_take(&guess, &cells, "x.csv");
        json_init(&json, &out);
        json_array(&json);
        guess_json(&guess, &json);
        guess_plan_json(&guess, &json);
        json_close(&json);
        json_finish(&json);
        assert_true(out.length > 0);
        text_release(&out);
        guess_release(&guess);
        cells_release(&cells);
    }
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(every_style_of_header_is_read),
        cmocka_unit_test(open_data_are_read),
        cmocka_unit_test(role_and_codes_follow_from_name_and_values),
        cmocka_unit_test(the_draft_for_the_demonstration_is_a_plan),
        cmocka_unit_test(a_code_that_is_a_value_elsewhere_stays_with_its_column),
        cmocka_unit_test(any_cells_give_a_guess),
    };
    return cmocka_run_group_tests_name("trial/guess", tests, NULL, NULL);
}
