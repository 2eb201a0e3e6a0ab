/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Decisions: every kind with the least it needs, broken batches with the sentence each must get, and what stands after
 * reversals. The format is our own, so these cases have no source outside the project. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "trial_case.h"

struct reading {
    struct arena arena;
    struct decision *decisions;
    size_t count;
    uint32_t version;
    struct fault fault;
};

static bool read_batch(struct reading *reading, const char *text) {
    memset(reading, 0, sizeof *reading);
    arena_init(&reading->arena);
    const char *json = quoted(&reading->arena, text);
    return decisions_read(&reading->arena, json, strlen(json), "batch.json", &reading->decisions, &reading->count,
        &reading->version, &reading->fault);
}

/* ---- every kind ---- */

static const struct {
    const char *kind, *fields, *body; /* body: what the study file keeps of the fields without a column of their own */
} kinds[] = {
    {"read-as", "'column': 'sex', 'from': 'f', 'to': 'F', 'reason': 'r'", "{}"},
    {"missing-code", "'column': 'bmi', 'value': '999', 'reason': 'r'", "{'value':'999'}"},
    {"missing-code", "'reason': 'r', 'meaning': 'not done', 'value': '999', 'column': 'bmi'", "{'value':'999','meaning':'not done'}"},
    {"number-format", "'column': 'bmi', 'decimal': ',', 'reason': 'r'", "{'decimal':','}"},
    {"date-order", "'column': 'seen_on', 'order': 'M/D/Y', 'site': '07', 'reason': 'r'", "{'order':'M/D/Y','site':'07'}"},
    {"convert", "'column': 'g', 'site': '02', 'factor': 0.0555, 'offset': -1.5, 'unit_from': 'a', 'unit_to': 'b', 'source': 's', 'reason': 'r'",
        "{'site':'02','unit_from':'a','unit_to':'b','source':'s','factor':0.0555,'offset':-1.5}"},
    {"correct", "'column': 'bmi', 'participant': 'P1', 'from': '460', 'to': '46', 'reason': 'r'", "{}"},
    {"correct", "'column': 'bmi', 'participant': 'P1', 'row': 3, 'from': null, 'to': '', 'reason': 'r'", "{'row':3}"},
    {"set-missing", "'column': 'bmi', 'participant': 'P1', 'from': '', 'reason': 'r'", "{}"},
    {"confirm", "'column': 'bmi', 'value': '43.1', 'reason': 'r'", "{'value':'43.1'}"},
    {"keep-record", "'participant': 'P1', 'row': 2, 'reason': 'r'", "{'row':2}"},
    {"query", "'question': 'Is it so?', 'reason': 'r'", "{'question':'Is it so?'}"},
    {"response", "'number': 4, 'text': 'It is.'", "{'text':'It is.','number':4}"},
    {"exclude", "'participant': 'P1', 'set': 'full', 'criteria': ['age'], 'reason': 'r'", "{'set':'full','criteria':['age']}"},
    {"flag", "'outcome': 'sbp', 'participant': 'P1', 'reason': 'r'", "{'outcome':'sbp'}"},
    {"scale", "'outcome': 'sbp', 'scale': 'log10', 'reason': 'r'", "{'outcome':'sbp','scale':'log10'}"},
    {"plausible-shifts", "'outcome': 'sbp', 'active': [-5, 0.5], 'reference': [0, 0], 'reason': 'r'",
        "{'outcome':'sbp','active':[-5,0.5],'reference':[0,0]}"},
    {"amend-plan", "'path': 'adjust_for', 'from': ['sex'], 'to': null, 'reason': 'r'", "{'path':'adjust_for'}"},
    {"attending", "'people': ['A. Reader']", "{'people':['A. Reader']}"},
    {"note", "'exhibit': 'effect', 'text': 'As planned.'", "{'text':'As planned.','exhibit':'effect'}"},
    {"reading", "'if_a': 'x', 'if_b': 'y', 'reason': 'r'", "{'if_a':'x','if_b':'y'}"},
    {"unblind", "'to': 'coded', 'reason': 'r'", "{}"},
    {"lock", "'reason': 'r'", "{}"},
    {"unlock", "'reason': 'r'", "{}"},
    {"sign", "'meaning': 'approved', 'reason': 'r'", "{'meaning':'approved'}"},
    {"reverse", "'number': 7, 'reason': 'r', 'evidence': 'e', 'discrepancy': 'd'", "{'number':7}"},
};

static void test_every_kind(void **state) {
    (void)state;
    bool seen[DECISION_KIND_COUNT] = {false};
    for (size_t i = 0; i < sizeof kinds / sizeof *kinds; i++) {
        struct reading reading;
        char text[512];
        snprintf(text, sizeof text, "[{'kind': '%s', %s}]", kinds[i].kind, kinds[i].fields);
        if (!read_batch(&reading, text)) {
            fail_msg("%s: %s", text, reading.fault.message);
        }
        assert_int_equal(reading.count, 1);
        assert_int_equal(reading.version, UINT32_MAX);
        assert_string_equal(decision_rules[reading.decisions[0].kind].name, kinds[i].kind);
        expect_text(reading.decisions[0].body, quoted(&reading.arena, kinds[i].body), text);
        seen[reading.decisions[0].kind] = true;
        arena_release(&reading.arena);
    }
    for (size_t i = 0; i < DECISION_KIND_COUNT; i++) {
        assert_true(seen[i]);
        assert_true(decision_rules[i].says[0] != '\0');
        assert_int_equal(decision_kind_of(decision_rules[i].name), i);
    }
    assert_int_equal(decision_kind_of("delete"), NOWHERE);
}

/* What is kept in the study file gives the same decision again. */
static void test_body_comes_back(void **state) {
    (void)state;
    for (size_t i = 0; i < sizeof kinds / sizeof *kinds; i++) {
        struct reading reading;
        char text[512];
        snprintf(text, sizeof text, "[{'kind': '%s', %s}]", kinds[i].kind, kinds[i].fields);
        assert_true(read_batch(&reading, text));
        const struct decision *was = &reading.decisions[0];
        struct decision again = {.number = 9, .kind = was->kind, .column = was->column, .participant = was->participant,
            .from = was->from, .to = was->to, .body = was->body};
        if (!decision_unpack(&reading.arena, &again, &reading.fault)) {
            fail_msg("%s: %s", text, reading.fault.message);
        }
        assert_int_equal(again.row, was->row);
        assert_int_equal(again.reverses, was->reverses);
        const char *const pairs[][2] = {{again.value, was->value}, {again.meaning, was->meaning}, {again.decimal, was->decimal},
            {again.outcome, was->outcome}, {again.scale, was->scale}, {again.set, was->set}, {again.text, was->text},
            {again.exhibit, was->exhibit}, {again.people, was->people}};
        for (size_t k = 0; k < sizeof pairs / sizeof *pairs; k++) {
            expect_text(pairs[k][0] ? pairs[k][0] : "none", pairs[k][1] ? pairs[k][1] : "none", text);
        }
        arena_release(&reading.arena);
    }
}

/* A body that somebody else has written into the file is refused, not replayed. */
static void test_foreign_bodies(void **state) {
    (void)state;
    static const struct {
        enum decision_kind kind;
        const char *body;
    } cases[] = {
        {DECISION_MISSING_CODE, "{}"}, {DECISION_MISSING_CODE, "not JSON"}, {DECISION_MISSING_CODE, "[]"},
        {DECISION_MISSING_CODE, "{'value': ' '}"}, {DECISION_NUMBER_FORMAT, "{'decimal': ';'}"},
        {DECISION_DATE_ORDER, "{'order': 'D/Y/M'}"}, {DECISION_SCALE, "{'outcome': 'sbp'}"},
        {DECISION_SCALE, "{'outcome': 'sbp', 'scale': 'ln'}"}, {DECISION_EXCLUDE, "{'set': 'none'}"}, {DECISION_REVERSE, "{}"},
        {DECISION_REVERSE, "{'number': 0}"}, {DECISION_REVERSE, "{'number': 9}"}, {DECISION_REVERSE, "{'number': 1e30}"},
        {DECISION_REVERSE, "{'number': 'x'}"}, {DECISION_KEEP_RECORD, "{'row': -1}"}, {DECISION_RESPONSE, "{'text': 'x'}"},
        {DECISION_FLAG, "{}"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        struct arena arena;
        arena_init(&arena);
        struct fault fault;
        fault_init(&fault);
        struct decision decision = {.number = 9, .kind = cases[i].kind, .column = "c", .participant = "P1", .from = "a", .to = "b",
            .body = quoted(&arena, cases[i].body)};
        if (decision_unpack(&arena, &decision, &fault)) {
            fail_msg("%s of %s was taken", cases[i].body, decision_rules[cases[i].kind].name);
        }
        assert_string_equal(fault.message, "the study file's decision 9 cannot be read; ask for an earlier copy of the file");
        arena_release(&arena);
    }
    struct decision none = {.number = 3, .kind = DECISION_CORRECT, .participant = "P1", .to = "x", .body = "{}"}; /* no column */
    struct fault fault;
    fault_init(&fault);
    struct arena arena;
    arena_init(&arena);
    assert_false(decision_unpack(&arena, &none, &fault));
    arena_release(&arena);
}

static void test_fields(void **state) {
    (void)state;
    struct reading reading;
    assert_true(read_batch(&reading, "\xEF\xBB\xBF{'version': 12, 'decisions': [{'kind': 'correct', 'column': 'bmi', 'participant': 'P1',"
                                     " 'from': 'a', 'to': 'b', 'reason': 'why', 'evidence': 'log', 'discrepancy': 'x/y', 'row': 4},"
                                     " {'kind': 'set-missing', 'column': 'bmi', 'participant': 'P1', 'from': null, 'reason': 'r'}]}"));
    assert_int_equal(reading.version, 12);
    assert_int_equal(reading.count, 2);
    const struct decision *first = &reading.decisions[0];
    assert_string_equal(first->column, "bmi");
    assert_string_equal(first->participant, "P1");
    assert_string_equal(first->from, "a");
    assert_string_equal(first->to, "b");
    assert_string_equal(first->reason, "why");
    assert_string_equal(first->evidence, "log");
    assert_string_equal(first->discrepancy, "x/y");
    assert_int_equal(first->row, 4);
    assert_false(first->planned);
    assert_null(reading.decisions[1].from);
    assert_int_equal(reading.decisions[1].row, 0);
    arena_release(&reading.arena);
}

/* ---- broken batches ---- */

#define SECOND(fields) "[{'kind': 'lock', 'reason': 'r'}, {" fields "}]"

static const struct {
    const char *text, *sentence;
    size_t entry;
} broken[] = {
    {"", "batch.json, line 1: this is not JSON from here on; mend the text and try again", 0},
    {"[\n{'kind': 'lock',}]", "batch.json, line 2: this is not JSON from here on; mend the text and try again", 0},
    {"[{'kind': '\xE9'}]", "batch.json, line 1: a character that is not UTF-8; save the text as UTF-8 and try again", 0},
    {"[]", "batch.json: decisions are a list in square brackets with at least one in it", 0},
    {"{}", "batch.json: decisions are a list in square brackets with at least one in it", 0},
    {"7", "batch.json: decisions are a list in square brackets with at least one in it", 0},
    {"{'version': 1, 'decisions': []}", "batch.json: decisions are a list in square brackets with at least one in it", 0},
    {"{'version': '1', 'decisions': [{'kind': 'lock', 'reason': 'r'}]}", "batch.json: \"version\" must be the number of the last decision seen", 0},
    {"{'version': 1.5, 'decisions': [{'kind': 'lock', 'reason': 'r'}]}", "batch.json: \"version\" must be the number of the last decision seen", 0},
    {"{'vershion': 1, 'decisions': [{'kind': 'lock', 'reason': 'r'}]}",
        "batch.json: the key \"vershion\" is not one a batch has; known are: version decisions", 0},
    {"['lock']", "batch.json: decision 1 of the batch is not an object with a \"kind\"; nothing was recorded", 1},
    {SECOND("'reason': 'r'"), "batch.json: decision 2 of the batch is not an object with a \"kind\"; nothing was recorded", 2},
    {SECOND("'kind': 'delete', 'reason': 'r'"),
        "batch.json: decision 2 of the batch has the kind \"delete\", which this version does not know; nothing was recorded", 2},
    {SECOND("'kind': 'limit-rule', 'outcome': 'sbp', 'reason': 'r'"),
        "batch.json: decision 2 of the batch has the kind \"limit-rule\", which this version does not know; nothing was recorded", 2},
    {SECOND("'kind': 'lock'"), "batch.json: decision 2 of the batch (lock) has no reason; every decision of this kind needs one; nothing was recorded", 2},
    {SECOND("'kind': 'lock', 'reason': ' \\t'"),
        "batch.json: decision 2 of the batch (lock) has no reason; every decision of this kind needs one; nothing was recorded", 2},
    {SECOND("'kind': 'lock', 'reason': 7"), "batch.json: decision 2 of the batch (lock) has a \"reason\" that is not a text in quotes; nothing was recorded", 2},
    {SECOND("'kind': 'lock', 'reason': 'r', 'column': 'x'"),
        "batch.json: decision 2 of the batch (lock) has the field \"column\", which this kind does not take; nothing was recorded", 2},
    {SECOND("'kind': 'lock', 'reason': 'r', 'by': 'me'"),
        "batch.json: decision 2 of the batch (lock) has the field \"by\", which this kind does not take; nothing was recorded", 2},
    {SECOND("'kind': 'lock', 'reason': 'r', 'reason': 's'"), "batch.json: decision 2 of the batch (lock) gives \"reason\" twice; nothing was recorded", 2},
    {SECOND("'kind': 'missing-code', 'column': 'x', 'value': '9', 'planned': true, 'reason': 'r'"),
        "batch.json: decision 2 of the batch (missing-code) has the field \"planned\", which this kind does not take; nothing was recorded", 2},
    {SECOND("'kind': 'missing-code', 'column': 'x', 'reason': 'r'"),
        "batch.json: decision 2 of the batch (missing-code) lacks \"value\"; it needs: column value; nothing was recorded", 2},
    {SECOND("'kind': 'missing-code', 'column': 'x', 'value': '', 'reason': 'r'"),
        "batch.json: decision 2 of the batch (missing-code) has a blank \"value\"; a blank cell is missing without a code; nothing was recorded", 2},
    {SECOND("'kind': 'missing-code', 'column': 'x', 'value': 999, 'reason': 'r'"),
        "batch.json: decision 2 of the batch (missing-code) has a \"value\" that is not a text in quotes; nothing was recorded", 2},
    {SECOND("'kind': 'read-as', 'column': 'x', 'from': null, 'to': 'F', 'reason': 'r'"),
        "batch.json: decision 2 of the batch (read-as) needs texts for \"from\" and \"to\"; use set-missing for null; nothing was recorded", 2},
    {SECOND("'kind': 'read-as', 'column': 'x', 'from': 'F', 'to': 'F', 'reason': 'r'"),
        "batch.json: decision 2 of the batch (read-as) reads a code as itself; nothing was recorded", 2},
    {SECOND("'kind': 'correct', 'column': 'x', 'participant': 'P', 'from': 'F', 'to': null, 'reason': 'r'"),
        "batch.json: decision 2 of the batch (correct) needs a text for \"to\"; use set-missing for a value that is to be missing; nothing was "
        "recorded", 2},
    {SECOND("'kind': 'correct', 'column': 'x', 'participant': 'P', 'from': 'F', 'to': 'F', 'reason': 'r'"),
        "batch.json: decision 2 of the batch (correct) corrects a value to itself; use confirm for one that is right; nothing was recorded", 2},
    {SECOND("'kind': 'correct', 'column': 'x', 'participant': 'P', 'to': 'F', 'reason': 'r'"),
        "batch.json: decision 2 of the batch (correct) lacks \"from\"; it needs: column participant from to; nothing was recorded", 2},
    {SECOND("'kind': 'number-format', 'column': 'x', 'decimal': ';', 'reason': 'r'"),
        "batch.json: decision 2 of the batch (number-format) has a \"decimal\" that is neither \".\" nor \",\"; nothing was recorded", 2},
    {SECOND("'kind': 'keep-record', 'participant': 'P', 'row': 0, 'reason': 'r'"),
        "batch.json: decision 2 of the batch (keep-record) has a \"row\" that is not a whole number from 1; nothing was recorded", 2},
    {SECOND("'kind': 'keep-record', 'participant': 'P', 'row': 1.5, 'reason': 'r'"),
        "batch.json: decision 2 of the batch (keep-record) has a \"row\" that is not a whole number from 1; nothing was recorded", 2},
    {SECOND("'kind': 'scale', 'outcome': 'y', 'scale': 'ln', 'reason': 'r'"),
        "batch.json: decision 2 of the batch (scale) has a \"scale\" that is neither linear nor log10; nothing was recorded", 2},
    {SECOND("'kind': 'exclude', 'participant': 'P', 'set': 'all', 'reason': 'r'"),
        "batch.json: decision 2 of the batch (exclude) has a \"set\" that is neither full nor per-protocol; nothing was recorded", 2},
    {SECOND("'kind': 'exclude', 'participant': 'P', 'set': 'full', 'criteria': 'age', 'reason': 'r'"),
        "batch.json: decision 2 of the batch (exclude) has a \"criteria\" that is not a list of texts, such as [\"A. Reader, statistician\"]; nothing was "
        "recorded", 2},
    {SECOND("'kind': 'attending', 'people': []"),
        "batch.json: decision 2 of the batch (attending) has a \"people\" that is not a list of texts, such as [\"A. Reader, statistician\"]; nothing was "
        "recorded", 2},
    {SECOND("'kind': 'plausible-shifts', 'outcome': 'y', 'active': [0, -5], 'reference': [0, 0], 'reason': 'r'"),
        "batch.json: decision 2 of the batch (plausible-shifts) has a \"active\" that is not two numbers, the lower first, such as [-5, 0]; nothing was "
        "recorded", 2},
    {SECOND("'kind': 'unblind', 'to': 'pooled', 'reason': 'r'"),
        "batch.json: decision 2 of the batch (unblind) has a \"to\" that is neither coded nor unblinded; nothing was recorded", 2},
    {SECOND("'kind': 'unblind', 'to': null, 'reason': 'r'"),
        "batch.json: decision 2 of the batch (unblind) has a \"to\" that is neither coded nor unblinded; nothing was recorded", 2},
    {SECOND("'kind': 'note', 'exhibit': 'effect', 'text': ''"), "batch.json: decision 2 of the batch (note) says nothing; nothing was recorded", 2},
    {SECOND("'kind': 'query', 'question': ' ', 'reason': 'r'"), "batch.json: decision 2 of the batch (query) says nothing; nothing was recorded", 2},
    {SECOND("'kind': 'reverse', 'number': -1, 'reason': 'r'"),
        "batch.json: decision 2 of the batch (reverse) has a \"number\" that is not a whole number from 1; nothing was recorded", 2},
};

static void test_broken_batches(void **state) {
    (void)state;
    for (size_t i = 0; i < sizeof broken / sizeof *broken; i++) {
        struct reading reading;
        if (read_batch(&reading, broken[i].text)) {
            fail_msg("%s was taken", broken[i].text);
        }
        expect_text(reading.fault.message, broken[i].sentence, broken[i].text);
        assert_int_equal(reading.fault.row, broken[i].entry);
        assert_int_equal(reading.fault.code, FAULT_INPUT);
        arena_release(&reading.arena);
    }
}

/* ---- what stands: 'd' a decision, a digit a reversal of that number; below it 1 where it stands ---- */

static void test_standing(void **state) {
    (void)state;
    static const char *const cases[][2] = {
        {"d", "1"},
        {"dd", "11"},
        {"d1", "01"},
        {"d12", "101"},     /* the reversal reversed: the decision stands again */
        {"d123", "0101"},   /* and that reversed */
        {"d1234", "10101"},
        {"dd1d2", "00111"},
        {"d13", "011"},     /* a reversal that names itself does nothing */
        {"9d", "11"},       /* nor one of what is not there */
        {"2d", "11"},
        {"d11", "011"},
        {"d1211", "00111"},
        {"", ""},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        struct decision decisions[8] = {{0}};
        bool stands[8];
        char got[9] = "";
        size_t count = strlen(cases[i][0]);
        for (size_t k = 0; k < count; k++) {
            bool reverse = cases[i][0][k] != 'd';
            decisions[k] = (struct decision){.number = (uint32_t)k + 1, .kind = reverse ? DECISION_REVERSE : DECISION_NOTE,
                .reverses = reverse ? (uint32_t)(cases[i][0][k] - '0') : 0};
        }
        record_standing(decisions, count, stands);
        for (size_t k = 0; k < count; k++) {
            got[k] = stands[k] ? '1' : '0';
        }
        expect_text(got, cases[i][1], cases[i][0]);
    }
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_every_kind), cmocka_unit_test(test_body_comes_back), cmocka_unit_test(test_foreign_bodies),
        cmocka_unit_test(test_fields), cmocka_unit_test(test_broken_batches), cmocka_unit_test(test_standing),
    };
    return cmocka_run_group_tests_name("trial/record", tests, NULL, NULL);
}
