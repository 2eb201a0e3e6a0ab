/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Guesses for what really comes: open data sets whose columns nobody named for us, files with one row per visit,
 * several files. What each open data set's columns are is said by the help page of the R package it is from; the tables
 * below say it in one line each. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <cmocka.h>
#include "demo/quayside.h"
#include "trial/guess.h"
#include <stdio.h>
#include <string.h>

/* ---- a guess in one line: everything that the form starts from ---- */

static const char *name_in(const struct guess *guess, const struct guess_column *column) {
    return guess->file_count > 1 ? column->full_name : column->name;
}

static void list_role(const struct guess *guess, enum guess_role role, const char *word, struct text *out) {
    bool any = false;
    for (size_t i = 0; i < guess->column_count; i++) {
        const struct guess_column *column = &guess->columns[i];
        if (column->role == role && column->series == NOWHERE) {
            text_format(out, "%s%s", any ? " " : word, name_in(guess, column));
            any = true;
        }
    }
}

static void say_files(const struct guess *guess, struct text *out) {
    for (size_t f = 0; f < guess->file_count; f++) {
        const struct guess_file *file = &guess->files[f];
        text_format(out, "%s%s%s", f ? ", " : "", guess->file_count > 1 && f == guess->first ? "first " : "",
            file->by_visit ? "visits" : "participants");
        text_format(
            out, " of %s", file->participant == NOWHERE ? "-" : name_in(guess, &guess->columns[file->participant]));
        if (file->by_visit) {
            text_format(out, " by %s", file->visit == NOWHERE ? "-" : guess->columns[file->visit].name);
            for (size_t i = 0; i < file->code_count; i++) {
                text_format(out, " %s", file->codes[i].code);
            }
        }
    }
}

static void say_series(const struct guess *guess, struct text *out) {
    for (size_t i = 0; i < guess->series_count; i++) {
        const struct guess_series *series = &guess->series[i];
        text_format(out, "; %s:", series->id);
        for (size_t j = 0; j < series->count; j++) {
            text_format(out, "%s%s", j ? ", " : " ", name_in(guess, &guess->columns[series->columns[j]]));
            text_format(out, "%s%s=%s", series->codes[j] ? "@" : "", series->codes[j] ? series->codes[j] : "",
                series->visits[j]);
        }
    }
}

static void summarise(const struct guess *guess, struct text *out) {
    text_clear(out);
    say_files(guess, out);
    text_format(out, "; arm %s", guess->arm == NOWHERE ? "-" : name_in(guess, &guess->columns[guess->arm]));
    say_series(guess, out);
    list_role(guess, GUESS_NUMBER, "; numbers ", out);
    list_role(guess, GUESS_CATEGORY, "; categories ", out);
    list_role(guess, GUESS_EVENT, "; events ", out);
    list_role(guess, GUESS_DATE, "; dates ", out);
    list_role(guess, GUESS_NOTHING, "; nothing ", out);
}

static void read_data(const char *name, struct text *csv) {
    char path[96], line[4096];
    snprintf(path, sizeof path, "tests/reference/data/%s", name);
    FILE *file = fopen(path, "r"); /* tests run in the project's folder */
    assert_non_null(file);
    text_clear(csv);
    while (fgets(line, sizeof line, file)) {
        text_string(csv, *line == '#' ? "" : line);
    }
    fclose(file);
}

/* ---- open data ---- */

static const struct {
    const char *file, *wanted;
    bool is_plan; /* an identifier and a number are there, so that the draft is a whole plan */
} open_data[] = {
    {"anorexia.csv", "participants of -; arm Treat; wt: Prewt=Baseline, Postwt=Follow-up", false},
    {"btheb.csv",
        "participants of -; arm treatment; outcome: before=Baseline, month2=2 months, month3=3 months, month5=5 "
        "months, "
        "month8=8 months; categories drug length",
        false},
    {"polyps.csv",
        "participants of -; arm treatment; number: baseline=Baseline, number3m=3 months; numbers age; categories "
        "gender",
        false},
    {"respiratory.csv",
        "visits of subject by month 0 1 2 3 4; arm treatment; numbers age; categories centre gender status", false},
    {"toenail.csv", "visits of patientID by visit 1 2 3 4 5 6 7; arm treatment; categories outcome; nothing time",
        false},
    {"seizures.csv",
        "visits of subject by period 1 2 3 4; arm treatment; seizure_rate: seizure.rate@1=Period 1, "
        "seizure.rate@2=Period 2, seizure.rate@3=Period 3, seizure.rate@4=Period 4; numbers base age",
        true},
    {"seizures-wide.csv",
        "participants of ID; arm Trt; y: Y1=Visit 1, Y2=Visit 2, Y3=Visit 3, Y4=Visit 4; numbers Base Age Ysum Age10 "
        "Base4",
        true},
    {"bacteria.csv", "visits of ID by week 0 2 4 6 11; arm trt; categories y ap hilo", false},
    {"chicks.csv",
        "visits of Chick by Time 0 2 4 6 8 10 12 14 16 18 20 21; arm Diet; weight: weight@0=Baseline, weight@2=Time 2, "
        "weight@4=Time 4, weight@6=Time 6, weight@8=Time 8, weight@10=Time 10, weight@12=Time 12, weight@14=Time 14, "
        "weight@16=Time 16, weight@18=Time 18, weight@20=Time 20, weight@21=Time 21",
        true},
    {"plasma.csv", "participants of -; arm -; numbers fibrinogen globulin; categories ESR", false},
    {"trees-ozone.csv",
        "visits of tree by Time 152 174 201 227 258; arm treat; size: size@152=Time 152, size@174=Time 174, "
        "size@201=Time 201, size@227=Time 227, size@258=Time 258",
        true},
    {"schizophrenia.csv", "visits of subject by month 0 2 6 8 10; arm -; categories onset disorder", false},
    {"calcium.csv", "participants of -; arm -; numbers time cal", false},
};

static void open_data_are_read(void **state) {
    (void)state;
    struct text csv, summary;
    text_init(&csv);
    text_init(&summary);
    int wrong = 0;
    for (size_t i = 0; i < sizeof open_data / sizeof *open_data; i++) {
        struct fault fault;
        fault_init(&fault);
        struct cells cells;
        struct guess guess;
        read_data(open_data[i].file, &csv);
        assert_true(cells_read(&cells, csv.data, csv.length, open_data[i].file, &fault));
        guess_take(&guess, &cells, open_data[i].file);
        summarise(&guess, &summary);
        struct json json;
        struct plan plan;
        text_clear(&csv);
        json_init(&json, &csv);
        guess_plan_json(&guess, &json);
        json_finish(&json);
        bool is_plan = plan_read(&plan, csv.data, csv.length, "the draft", &fault);
        if (is_plan) {
            plan_release(&plan);
        }
        if (is_plan != open_data[i].is_plan) {
            print_error("%s: %s\n", open_data[i].file, is_plan ? "became a plan" : fault.message);
            wrong++;
        }
        if (strcmp(summary.data, open_data[i].wanted) != 0) {
            print_error("%s\n    got    %s\n    wanted %s\n", open_data[i].file, summary.data, open_data[i].wanted);
            wrong++;
        }
        guess_release(&guess);
        cells_release(&cells);
    }
    text_release(&csv);
    text_release(&summary);
    assert_int_equal(wrong, 0);
}

/* ---- several files ---- */

struct given { /* texts of files with their names, and what is said of each */
    struct guess_source source[6];
    struct cells cells[6];
    size_t count;
};

static void give(struct given *given, const char *name, const char *csv, size_t length) {
    struct fault fault;
    fault_init(&fault);
    assert_true(cells_read(&given->cells[given->count], csv, length, name, &fault));
    given->source[given->count] = (struct guess_source){.name = name, .cells = &given->cells[given->count]};
    given->count++;
}

static void given_release(struct given *given) {
    for (size_t i = 0; i < given->count; i++) {
        cells_release(&given->cells[i]);
    }
}

static void guessed(const struct given *given, const char *wanted, struct plan *plan) {
    struct guess guess;
    struct text out;
    struct json json;
    struct fault fault;
    fault_init(&fault);
    text_init(&out);
    guess_take_all(&guess, given->source, given->count);
    summarise(&guess, &out);
    if (strcmp(out.data, wanted) != 0) {
        fail_msg("got    %s\nwanted %s", out.data, wanted);
    }
    text_clear(&out);
    json_init(&json, &out);
    guess_json(&guess, &json);
    json_finish(&json);
    text_clear(&out);
    json_init(&json, &out);
    guess_plan_json(&guess, &json);
    json_finish(&json);
    if (plan && !plan_read(plan, out.data, out.length, "the draft", &fault)) {
        fail_msg("%s\n%s", fault.message, out.data);
    }
    text_release(&out);
    guess_release(&guess);
}

static void the_four_files_of_the_demonstration_are_read(void **state) {
    (void)state;
    struct quayside_files files;
    quayside_make_files(QUAYSIDE_SEED, &files);
    static const char wanted[] =
        "participants of events.pid, visits of visits.pid by visit V0 V8 V26, visits of labs.pid by visit V0 V8 V26, "
        "first participants of "
        "people.pid; arm people.grp; sbp: visits.sbp@V0=Baseline, visits.sbp@V8=Visit 8, visits.sbp@V26=Visit 26; "
        "uacr: "
        "labs.uacr@V0=Baseline, labs.uacr@V8=Visit 8, labs.uacr@V26=Visit 26; numbers people.age people.bmi; "
        "categories people.site "
        "people.sex; events events.rescue; dates events.rescue_date visits.date labs.sampled people.randomised";
    struct given given = {0};
    give(&given, "events.csv", files.events_csv.data, files.events_csv.length); /* not in the plan's order */
    give(&given, "visits.csv", files.visits_csv.data, files.visits_csv.length);
    give(&given, "labs.csv", files.labs_csv.data, files.labs_csv.length);
    give(&given, "people.csv", files.people_csv.data, files.people_csv.length);
    struct plan plan;
    guessed(&given, wanted, &plan);
    assert_int_equal(plan.file_count, 4);
    assert_string_equal(plan.files[0].id, "people");
    assert_string_equal(plan.participant, "people.pid");
    assert_string_equal(plan.arm_column, "people.grp");
    assert_int_equal(plan.outcome_count, 2);
    assert_string_equal(plan.outcomes[0].visits[2].column, "visits.sbp@V26");
    assert_int_equal(plan.outcomes[1].scale, SCALE_LOG10);
    assert_int_equal(plan.event_count, 1);
    assert_string_equal(plan.events[0].column, "events.rescue");
    assert_int_equal(plan.subgroup_count, 3);
    plan_release(&plan);
    given_release(&given);
    quayside_files_release(&files);
}

/* Invented: the identifier has another name in each file, one file has a weak one, visits are words, an unscheduled
 * visit is no planned one, what is measured once is no series, a time beside the visit is no outcome. */
static void files_join_by_their_values(void **state) {
    (void)state;
    struct text people, visits, blood;
    text_init(&people);
    text_init(&visits);
    text_init(&blood);
    text_string(&people, "SUBJID,ALLOC,SEX,AGE\n");
    text_string(&visits, "row;code;occasion;weeks_since;height;pain;walk\n");
    text_string(&blood, "sample,who,EVENT,crp\n");
    static const char *const when[] = {"week 12", "Screening", "week 4", "Baseline"};
    static const size_t weeks[] = {14, 0, 6, 2};
    for (size_t i = 0; i < 40; i++) {
        text_format(
            &people, "N%03zu,%s,%s,%zu\n", 200 + i, i % 2 ? "placebo" : "active", i % 3 ? "F" : "M", 40 + (i * 7) % 31);
        for (size_t v = 0; v < 4; v++) {
            text_format(&visits, "%zu;N%03zu;%s;%zu;", 4 * i + v, 200 + i, when[v], weeks[v] + i % 2);
            text_format(&visits, v == 3 ? "%zu;" : ";", 150 + (i * 11) % 40);
            text_format(&visits, "%zu;", 20 + (i * 13 + v * 5) % 60);
            text_format(&visits, v == 0 ? "%zu\n" : "\n", 300 + (i * 17) % 200);
        }
        for (size_t v = 0; v < 2; v++) {
            text_format(&blood, "S%zu,N%03zu,%s,%zu.%zu\n", 9000 + 2 * i + v, 200 + i, v ? "V2" : "V1",
                1 + (i * 3 + v) % 9, i % 10);
        }
    }
    text_string(&visits, "900;N205;unscheduled;5;;44;\n");
    static const char wanted[] =
        "first participants of people.SUBJID, visits of visits.code by occasion Screening Baseline week 4 week 12, "
        "visits of "
        "blood.who by EVENT V1 V2; arm people.ALLOC; pain: visits.pain@Baseline=Baseline, visits.pain@week 4=4 weeks, "
        "visits.pain@week 12=12 weeks; walk: visits.walk@week 12=12 weeks; crp: blood.crp@V1=Visit 1, "
        "blood.crp@V2=Visit 2; numbers "
        "people.AGE visits.height; categories people.SEX; nothing visits.row visits.weeks_since blood.sample";
    struct given given = {0};
    give(&given, "people.csv", people.data, people.length);
    give(&given, "visits.txt", visits.data, visits.length);
    give(&given, "blood.csv", blood.data, blood.length);
    struct plan plan;
    guessed(&given, wanted, &plan);
    int height = plan_covariate(&plan, "height");
    assert_int_not_equal(height, NOWHERE);
    assert_string_equal(plan.covariates[height].column, "visits.height@Baseline"); /* where it was measured */
    plan_release(&plan);
    given_release(&given);
    text_release(&people);
    text_release(&visits);
    text_release(&blood);
}

static void what_is_said_stands(void **state) {
    (void)state;
    struct text csv;
    text_init(&csv);
    read_data("seizures.csv", &csv);
    struct given given = {0};
    give(&given, "x.csv", csv.data, csv.length);
    given.source[0].layout = LAYOUT_PARTICIPANT;
    given.source[0].participant = "subject";
    guessed(&given, "participants of subject; arm treatment; numbers base age seizure.rate; categories period", NULL);
    static const char *const codes[] = {"4", "2", "9"};
    given.source[0].layout = LAYOUT_VISIT;
    given.source[0].codes = codes;
    given.source[0].code_count = 3;
    guessed(&given,
        "visits of subject by period 4 2 9; arm treatment; seizure_rate: seizure.rate@4=Period 4, "
        "seizure.rate@2=Period 2; numbers "
        "base age",
        NULL);
    given.source[0].visit = "age"; /* nonsense is taken too: the form shows what comes of it */
    given.source[0].participant = "base";
    struct guess guess;
    guess_take_all(&guess, given.source, 1);
    assert_string_equal(guess.columns[guess.files[0].visit].name, "age");
    assert_string_equal(guess.columns[guess.files[0].participant].name, "base");
    guess_release(&guess);
    given_release(&given);
    text_release(&csv);
}

static void any_files_give_a_guess(void **state) {
    (void)state;
    static const char *const texts[] = {"a\n", "id,visit\n", "id,visit,x\n1,1,2\n1,2,3\n2,1,4\n2,2,5\n3,1,6\n3,2,8\n",
        "visit\n1\n2\n3\n", "id,week,week\u00a0,y\n,,,\n,,,\n", "id\n1\n2\n3\n"};
    enum { TEXTS = sizeof texts / sizeof *texts };
    for (size_t i = 0; i < TEXTS; i++) {
        for (size_t j = 0; j < TEXTS; j++) {
            for (int layout = LAYOUT_GUESSED; layout <= LAYOUT_VISIT; layout++) {
                struct given given = {0};
                give(&given, "x.csv", texts[i], strlen(texts[i]));
                give(&given, "x.csv", texts[j], strlen(texts[j]));
                given.source[1].layout = (enum guess_layout)layout;
                struct guess guess;
                struct text out;
                struct json json;
                text_init(&out);
                guess_take_all(&guess, given.source, given.count);
                json_init(&json, &out);
                json_array(&json);
                guess_json(&guess, &json);
                guess_plan_json(&guess, &json);
                json_close(&json);
                json_finish(&json);
                assert_string_not_equal(guess.files[0].id, guess.files[1].id);
                guess_release(&guess);
                text_release(&out);
                given_release(&given);
            }
        }
    }
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(open_data_are_read),
        cmocka_unit_test(the_four_files_of_the_demonstration_are_read),
        cmocka_unit_test(files_join_by_their_values),
        cmocka_unit_test(what_is_said_stands),
        cmocka_unit_test(any_files_give_a_guess),
    };
    return cmocka_run_group_tests_name("trial/guess-files", tests, NULL, NULL);
}
