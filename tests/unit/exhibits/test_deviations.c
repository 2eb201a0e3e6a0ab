/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Amendments of the plan: what they change, that a reversal gives back every digit, that a replay from the file gives the same, what
 * is refused, and how deviations are shown. The rules are the project's own. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "exhibit_case.h"
#include "trial/verify.h"

static const char *const by = "M. Tide, statistician";

static void decide(struct exhibit_case *c, const char *batch, const char *sentence) {
    char *json = replaced(batch, "'", "\"");
    struct fault fault;
    fault_init(&fault);
    uint32_t version;
    bool done = study_decide(c->study, by, json, strlen(json), "batch", ANY_VERSION, &version, &fault);
    if (done != (sentence == NULL)) {
        fail_msg("%s: %s", batch, done ? "taken" : fault.message);
    }
    if (sentence && strcmp(fault.message, sentence) != 0) {
        fail_msg("%s\n  got    %s\n  wanted %s", batch, fault.message, sentence);
    }
    memory_free(json);
}

static uint32_t version_of(struct exhibit_case *c, char *state) {
    struct fault fault;
    fault_init(&fault);
    struct frame *frame = study_frame(c->study, &fault);
    uint32_t version = frame->version;
    if (state) {
        memcpy(state, frame->state_sha256, HASH_SIZE);
    }
    frame_release(frame);
    return version;
}

static void reverse(struct exhibit_case *c, uint32_t number) {
    char batch[96];
    snprintf(batch, sizeof batch, "[{'kind': 'reverse', 'number': %u, 'reason': 'r'}]", number);
    decide(c, batch, NULL);
}

static double effect(struct exhibit_case *c, char *note, size_t room) {
    struct renderings r;
    assert_true(render(c, "effect", NULL, 0, &r, NULL));
    const cJSON *contrast = cJSON_GetArrayItem(field(r.parsed, "contrasts"), 0), *one;
    double estimate = number_at(member_with(field(contrast, "estimates"), "method", "ancova"), "estimate");
    snprintf(note, room, "%s", "");
    cJSON_ArrayForEach(one, field(r.parsed, "notes")) {
        if (strncmp(one->valuestring, "The plan was amended", 20) == 0) {
            snprintf(note, room, "%s", one->valuestring);
        }
    }
    renderings_release(&r);
    return estimate;
}

static void reopen(struct exhibit_case *c) {
    struct fault fault;
    fault_init(&fault);
    study_close(c->study);
    c->study = study_open(c->path, &fault);
    if (!c->study) {
        fail_msg("%s", fault.message);
    }
}

static void must_verify(struct exhibit_case *c) {
    struct fault fault;
    fault_init(&fault);
    struct text account;
    text_init(&account);
    bool sound = false;
    assert_true(study_verify(c->path, NULL, &sound, &account, &fault));
    if (!sound) {
        fail_msg("%s", account.data);
    }
    text_release(&account);
}

static void test_effect_follows_the_plan(void **state) {
    (void)state;
    struct exhibit_case c;
    case_quayside(&c, "unblinded", true);
    char before[HASH_SIZE], amended[HASH_SIZE], after[HASH_SIZE], note[200];
    uint32_t start = version_of(&c, before);
    double planned = effect(&c, note, sizeof note);
    assert_string_equal(note, "");
    struct fault fault;
    fault_init(&fault);
    struct frame *frame = study_frame(c.study, &fault);
    const struct plan *plan = frame->plan;
    struct text from;
    text_init(&from);
    for (size_t i = 0; i < plan->adjust_count; i++) {
        text_format(&from, "%s'%s'", i ? ", " : "", plan->covariates[plan->adjust_for[i]].id);
    }
    char batch[400];
    snprintf(batch, sizeof batch, "[{'kind': 'amend-plan', 'path': 'adjust_for', 'from': %s%s%s, 'to': [], 'reason': 'r'}]",
        plan->adjust_count ? "[" : "null", from.data, plan->adjust_count ? "]" : "");
    assert_true(plan->adjust_count > 0);
    text_release(&from);
    frame_release(frame);
    decide(&c, batch, NULL);
    uint32_t number = version_of(&c, amended);
    assert_int_equal(number, start + 1);
    double unadjusted = effect(&c, note, sizeof note);
    assert_true(fabs(unadjusted - planned) > 1e-6);
    assert_string_not_equal(before, amended);
    char wanted[80];
    snprintf(wanted, sizeof wanted, "The plan was amended (decision %u), after unblinding.", number);
    assert_string_equal(note, wanted);
    must_verify(&c);
    reopen(&c); /* the replay from the file */
    version_of(&c, after);
    assert_string_equal(after, amended);
    near(effect(&c, note, sizeof note), unadjusted, 0, 0, "after reopening");
    assert_int_equal(study_plan_at(c.study, number - 1, &fault) == study_plan(c.study), 1);
    assert_int_equal(study_plan_at(c.study, number, &fault)->adjust_count, 0);
    reverse(&c, number);
    version_of(&c, after);
    assert_string_equal(after, before);
    near(effect(&c, note, sizeof note), planned, 0, 0, "reversed");
    assert_string_equal(note, "");
    must_verify(&c);
    struct renderings r;
    assert_true(render(&c, "deviations", NULL, 0, &r, NULL));
    const cJSON *one = cJSON_GetArrayItem(field(r.parsed, "deviations"), 0);
    near(number_at(one, "number"), number, 0, 0, "number");
    assert_string_equal(string_at(one, "path"), "adjust_for");
    assert_string_equal(string_at(one, "to"), "[]");
    assert_string_equal(string_at(one, "blinding"), "unblinded");
    assert_true(cJSON_IsTrue(field(one, "after_unblinding")));
    assert_true(cJSON_IsFalse(field(one, "stands")));
    renderings_release(&r);
    case_close(&c);
}

/* ---- a small trial, for what is refused ---- */

static const char plan[] =
    "{\"title\": \"T\", \"participant\": \"pid\", \"blinding\": \"coded\", \"missing_codes\": [\"9\"],"
    " \"arm\": {\"column\": \"arm\", \"levels\": [{\"code\": \"armLx\", \"label\": \"Leaf\", \"reference\": true}, {\"code\": \"armWx\", \"label\": \"Walk\"}]},"
    " \"outcomes\": [{\"id\": \"y\", \"role\": \"primary\", \"better\": \"lower\", \"scale\": \"linear\","
    "   \"visits\": [{\"label\": \"Start\", \"column\": \"y0\"}, {\"label\": \"End\", \"column\": \"y1\"}]}],"
    " \"covariates\": [{\"id\": \"sex\", \"column\": \"sex\", \"kind\": \"category\", \"levels\": [{\"code\": \"F\"}, {\"code\": \"M\"}]}]}";

static const char csv[] = "pid,arm,sex,age,y0,y1\nP1,armLx,F,50,1,2\nP2,armWx,M,9,2,3\nP3,armLx,F,52,3,3\nP4,armWx,M,53,4,5\nP5,armLx,M,54,5,4\n";

static void test_refusals(void **state) {
    (void)state;
#define AMEND(path, from, to) "[{'kind': 'amend-plan', 'path': '" path "', 'from': " from ", 'to': " to ", 'reason': 'r'}]"
#define OF "decision 1 of the batch (amend-plan) "
#define NONE "; nothing was recorded"
    static const struct {
        const char *batch, *sentence;
    } cases[] = {
        {AMEND("outcomes[0].scale", "'log10'", "'linear'"),
            OF "says outcomes[0].scale is \"log10\", but the plan now has \"linear\" there" NONE},
        {AMEND("outcomes[0].scale", "null", "'log10'"), OF "says outcomes[0].scale is absent, but the plan now has \"linear\" there" NONE},
        {AMEND("adjust_for", "[]", "['sex']"), OF "says adjust_for is [], but the plan now has nothing there" NONE},
        {AMEND("outcomes[1].scale", "'linear'", "'log10'"),
            OF "has the path \"outcomes[1].scale\", which leads nowhere in the plan; write it as outcomes[0].scale or adjust_for" NONE},
        {AMEND("outcomes[9]", "null", "{}"),
            OF "has the path \"outcomes[9]\", which leads nowhere in the plan; write it as outcomes[0].scale or adjust_for" NONE},
        {AMEND("title.x", "null", "1"),
            OF "has the path \"title.x\", which leads nowhere in the plan; write it as outcomes[0].scale or adjust_for" NONE},
        {AMEND("outcomes[0].scale", "'linear'", "'ln'"),
            OF "cannot be: the amended plan: outcomes[0].scale must be \"linear\" or \"log10\"" NONE},
        {AMEND("adjust_for", "null", "['age']"),
            OF "cannot be: the amended plan: adjust_for names \"age\", which is not the id of a covariate of this plan" NONE},
        {AMEND("outcomes[0].visits[1].column", "'y1'", "'y2'"),
            OF "cannot be: the amended plan: the column \"y2\" (y, End) is not in export.csv, line 1, which has: pid, arm, sex, age, y0, y1; mend "
               "the plan or the header" NONE},
        {AMEND("participant", "'pid'", "'age'"),
            OF "is about the identifier, which the record stands on; load the data anew with another plan" NONE},
        {AMEND("files", "null", "[]"), OF "is about the files, which the kept bytes stand on; load the data anew with another plan" NONE},
        {AMEND("blinding", "'coded'", "'unblinded'"), OF "is about the blinding, which is lifted by unblind" NONE},
        {AMEND("missing_codes", "['9']", "[]"),
            OF "is about codes for missing, which are decisions of their own: use missing-code, or reverse one" NONE},
        {AMEND("arm.levels[0].label", "'Leaf'", "'Leaflet'"),
            OF "is about the arms, which are not shown while the study is blinded; unblind it first" NONE},
        {AMEND("arm.levels[0].label", "'guess'", "'Leaflet'"),
            OF "is about the arms, which are not shown while the study is blinded; unblind it first" NONE},
        {"[{'kind': 'amend-plan', 'path': 'adjust_for', 'from': null, 'to': ['sex']}]",
            "batch: decision 1 of the batch (amend-plan) has no reason; every decision of this kind needs one; nothing was recorded"},
        {"[{'kind': 'amend-plan', 'path': 'title', 'from': 'T', 'to': 'T', 'reason': 'r'}]",
            "batch: decision 1 of the batch (amend-plan) changes nothing: \"from\" and \"to\" are the same; nothing was recorded"},
        {"[{'kind': 'amend-plan', 'path': 'title', 'from': 'T', 'to': [[[[[[[[[[[[[[]]]]]]]]]]]]]], 'reason': 'r'}]",
            "batch: decision 1 of the batch (amend-plan) has a \"to\" that nests deeper than a plan does; nothing was recorded"},
        /* All or none: the first of the two would be fine. */
        {"[{'kind': 'amend-plan', 'path': 'title', 'from': 'T', 'to': 'U', 'reason': 'r'},"
         " {'kind': 'amend-plan', 'path': 'title', 'from': 'T', 'to': 'V', 'reason': 'r'}]",
            "decision 2 of the batch (amend-plan) says title is \"T\", but the plan now has \"U\" there; nothing was recorded"},
    };
    struct exhibit_case c;
    case_open(&c, csv, plan);
    char before[HASH_SIZE], after[HASH_SIZE];
    uint32_t version = version_of(&c, before);
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        decide(&c, cases[i].batch, cases[i].sentence);
        assert_int_equal(version_of(&c, after), version);
        assert_string_equal(before, after);
    }
    case_close(&c);
}

static const struct frame *current(struct exhibit_case *c) {
    struct fault fault;
    fault_init(&fault);
    struct frame *frame = study_frame(c->study, &fault);
    assert_non_null(frame);
    frame_release(frame); /* the study still holds it */
    return frame;
}

static void test_chain_of_amendments(void **state) {
    (void)state;
    struct exhibit_case c;
    case_open(&c, csv, plan);
    uint32_t start = version_of(&c, NULL);
    /* A covariate that comes later: its codes for missing are entered with it, as at load. */
    decide(&c, AMEND("covariates[1]", "null", "{'id': 'age', 'column': 'age', 'kind': 'number'}"), NULL);
    assert_int_equal(version_of(&c, NULL), start + 2);
    const struct frame *frame = current(&c);
    assert_int_equal(frame->plan->covariate_count, 2);
    assert_int_equal(frame->decisions[start + 1].kind, DECISION_MISSING_CODE);
    assert_string_equal(frame->decisions[start + 1].column, "age");
    assert_int_equal(frame_column(frame, "age")->state[1], CELL_MISSING_CODE);
    /* From and to as the text of JSON, as a form sends them. */
    decide(&c, "[{'kind': 'amend-plan', 'path': 'adjust_for', 'from': null, 'to': '[\\\"age\\\"]', 'reason': 'r'}]", NULL);
    uint32_t adjust = version_of(&c, NULL);
    assert_int_equal(current(&c)->plan->adjust_count, 1);
    assert_string_equal(current(&c)->decisions[adjust - 1].to, "[\"age\"]");
    decide(&c, "[{'kind': 'amend-plan', 'path': 'outcomes[0].scale', 'from': 'linear', 'to': 'log10', 'reason': 'r'}]", NULL);
    assert_int_equal(current(&c)->scales[0], SCALE_LOG10);
    /* What another amendment rests on cannot be taken from under it. */
    char batch[96], sentence[300];
    snprintf(batch, sizeof batch, "[{'kind': 'reverse', 'number': %u, 'reason': 'r'}]", start + 1);
    snprintf(sentence, sizeof sentence, "%s", "decision 1 of the batch (reverse) cannot be: the amended plan: adjust_for names "
        "\"age\", which is not the id of a covariate of this plan; nothing was recorded");
    decide(&c, batch, sentence);
    decide(&c, AMEND("adjust_for", "['age']", "['sex', 'age']"), NULL);
    snprintf(batch, sizeof batch, "[{'kind': 'reverse', 'number': %u, 'reason': 'r'}]", adjust);
    snprintf(sentence, sizeof sentence, "decision 1 of the batch (reverse) cannot be: decision %u amended \"adjust_for\" from something that would no "
        "longer stand there; reverse that one first; nothing was recorded", adjust + 2);
    decide(&c, batch, sentence);
    reverse(&c, adjust + 2);
    reverse(&c, adjust);
    assert_int_equal(current(&c)->plan->adjust_count, 0);
    assert_int_equal(current(&c)->scales[0], SCALE_LOG10);
    char before[HASH_SIZE], after[HASH_SIZE];
    version_of(&c, before);
    must_verify(&c);
    reopen(&c);
    version_of(&c, after);
    assert_string_equal(before, after);
    /* null removes: the scale falls back to its default. */
    decide(&c, AMEND("outcomes[0].scale", "'log10'", "null"), NULL);
    assert_int_equal(current(&c)->scales[0], SCALE_LINEAR);
    case_close(&c);
}

/* Arms stay hidden, also in the record of what was amended while it could be seen; a scale other than planned is a deviation. */
static void test_shown_as_deviations(void **state) {
    (void)state;
    struct exhibit_case c;
    struct renderings r;
    case_open(&c, csv, plan);
    decide(&c, "[{'kind': 'scale', 'outcome': 'y', 'scale': 'log10', 'reason': 'skewed'},"
               " {'kind': 'scale', 'outcome': 'y', 'scale': 'linear', 'reason': 'back'}]", NULL);
    decide(&c, AMEND("confidence", "null", "0.9"), NULL);
    decide(&c, "[{'kind': 'unblind', 'to': 'unblinded', 'reason': 'r'}]", NULL);
    decide(&c, AMEND("arm.levels[0].label", "'Leaf'", "'Leaflet'"), NULL);
    decide(&c, AMEND("arm.levels[0].code", "'armLx'", "'x'"),
        OF "is about the arms' column, codes or reference, on which the letters stand; load the data anew with another plan" NONE);
    assert_true(render(&c, "deviations", NULL, 0, &r, NULL));
    const cJSON *list = field(r.parsed, "deviations");
    assert_int_equal(cJSON_GetArraySize(list), 3);
    const cJSON *scale = cJSON_GetArrayItem(list, 0), *level = cJSON_GetArrayItem(list, 1), *label = cJSON_GetArrayItem(list, 2);
    assert_string_equal(string_at(scale, "path"), "outcomes[0].scale");
    assert_string_equal(string_at(scale, "from"), "linear");
    assert_string_equal(string_at(scale, "to"), "log10");
    assert_string_equal(string_at(scale, "blinding"), "coded");
    assert_true(cJSON_IsFalse(field(scale, "after_unblinding")));
    assert_string_equal(string_at(level, "to"), "0.9");
    assert_true(cJSON_IsNull(field(level, "from")));
    assert_string_equal(string_at(label, "to"), "\"Leaflet\"");
    assert_true(cJSON_IsTrue(field(label, "after_unblinding")));
    renderings_release(&r);
    assert_true(render(&c, "effect", NULL, 0, &r, NULL));
    assert_non_null(strstr(r.json.data, "Leaflet"));
    assert_non_null(strstr(r.text.data, "), partly or wholly after unblinding."));
    renderings_release(&r);
    case_close(&c);
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_effect_follows_the_plan),
        cmocka_unit_test(test_refusals),
        cmocka_unit_test(test_chain_of_amendments),
        cmocka_unit_test(test_shown_as_deviations),
    };
    return cmocka_run_group_tests_name("exhibits/deviations", tests, NULL, NULL);
}
