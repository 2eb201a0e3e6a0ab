/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The frame: what each cell becomes, what each decision changes and what it leaves alone, and that a replay from scratch
 * always gives what was built step by step. The rules are the plan's format and the project's own. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "near.h"
#include "trial_case.h"

static const char plan[] =
    "{'title': 'T', 'participant': 'pid', 'missing_codes': ['999', 'NK'],"
    " 'arm': {'column': 'grp', 'levels': [{'code': 'Lx', 'label': 'Leaflet', 'reference': true}, {'code': 'Wx', 'label': 'Walking'}]},"
    " 'outcomes': [{'id': 'y', 'role': 'primary', 'better': 'lower', 'scale': 'linear',"
    "   'visits': [{'label': 'Baseline', 'column': 'y0'}, {'label': 'End', 'column': 'y1'}]}],"
    " 'covariates': [{'id': 'sex', 'column': 'sex', 'kind': 'category', 'levels': [{'code': 'F'}, {'code': 'M'}]},"
    "   {'id': 'city', 'column': 'city', 'kind': 'category'}, {'id': 'age', 'column': 'age', 'kind': 'number'}],"
    " 'events': [{'id': 'died', 'column': 'died', 'yes': ['Y', '1'], 'no': ['N']}],"
    " 'blinding': '%s'}";

static const char csv[] =
    "pid,grp,sex,city,age,y0,y1,died\n"
    "P05,Lx,F,Ely,50,1.25,2,N\n"          /* 1 */
    "P01,Wx,M,Ayr,51,999,2.5,Y\n"         /* 2 */
    "P02,Lx,f,,52,999.0,lost,N\n"         /* 3 */
    "P03,Wx,F ,Ely,53, 999,<0.3,1\n"      /* 4 */
    "P04,Lx,NK,Ayr,54,NK,>40,y\n"         /* 5 */
    "P07,Zx,M,Ely,55,-0,\"2,5\",\n"       /* 6 */
    "P07,Wx,M,Ely,56,7,8,N\n"             /* 7 */
    ",Wx,M,Ely,57,8,9,N\n"                /* 8 */
    "P06, ,M,ayr,,1e2,  ,N\n";            /* 9 */

static void open_as(struct trial_case *c, const char *blinding) {
    char text[2048];
    snprintf(text, sizeof text, plan, blinding);
    case_open(c, csv, text);
}

static void open_case(struct trial_case *c) {
    open_as(c, "unblinded");
}

/* ---- what the cells are ---- */

static void test_cells_of_numbers(void **state) {
    (void)state;
    static const struct {
        const char *participant, *column;
        enum cell_state state;
        double number, limit;
    } cases[] = {
        {"P05", "y0", CELL_OBSERVED, 1.25, NAN},    {"P01", "y0", CELL_MISSING_CODE, NAN, NAN},
        {"P02", "y0", CELL_MISSING_CODE, NAN, NAN}, {"P03", "y0", CELL_MISSING_CODE, NAN, NAN},
        {"P04", "y0", CELL_MISSING_CODE, NAN, NAN}, {"P06", "y0", CELL_OBSERVED, 100, NAN},
        {"P07", "y0", CELL_HELD_ASIDE, NAN, NAN},   {"P02", "y1", CELL_UNREADABLE, NAN, NAN},
        {"P03", "y1", CELL_BELOW_LIMIT, NAN, 0.3},  {"P04", "y1", CELL_ABOVE_LIMIT, NAN, 40},
        {"P06", "y1", CELL_BLANK, NAN, NAN},        {"P06", "age", CELL_BLANK, NAN, NAN},
    };
    struct trial_case c;
    open_case(&c);
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        char label[32];
        snprintf(label, sizeof label, "%s %s", cases[i].participant, cases[i].column);
        size_t who = case_who(&c, cases[i].participant);
        const struct column *column = case_column(&c, cases[i].column);
        expect_text(cell_state_name((enum cell_state)column->state[who]), cell_state_name(cases[i].state), label);
        near(column->number[who], cases[i].number, 0, 0, label);
        near(column->limit ? column->limit[who] : (double)NAN, cases[i].limit, 0, 0, label);
    }
    assert_int_equal(case_column(&c, "y0")->decimals, 2);
    assert_int_equal(case_column(&c, "age")->decimals, 0);
    case_close(&c);
}

/* Categories compare exactly, spaces included; an unlisted code is a level of its own, after the listed ones. */
static void test_cells_of_categories(void **state) {
    (void)state;
    static const struct {
        const char *participant, *column, *level;
        enum cell_state state;
    } cases[] = {
        {"P05", "sex", "F", CELL_OBSERVED},       {"P02", "sex", "f", CELL_OBSERVED},
        {"P03", "sex", "F ", CELL_OBSERVED},      {"P04", "sex", "", CELL_MISSING_CODE},
        {"P07", "sex", "", CELL_HELD_ASIDE},      {"P02", "city", "", CELL_BLANK},
        {"P06", "city", "ayr", CELL_OBSERVED},    {"P05", "grp", "Lx", CELL_OBSERVED},
        {"P06", "grp", "", CELL_BLANK},
    };
    struct trial_case c;
    open_case(&c);
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        assert_int_equal(case_state(&c, cases[i].participant, cases[i].column), cases[i].state);
        expect_text(case_level(&c, cases[i].participant, cases[i].column), cases[i].level, cases[i].participant);
    }
    static const char *const levels[] = {"F", "M", "F ", "f"};
    const struct column *sex = case_column(&c, "sex");
    assert_int_equal(sex->level_count, 4);
    assert_int_equal(sex->listed_count, 2);
    for (size_t i = 0; i < 4; i++) {
        assert_string_equal(sex->levels[i].code, levels[i]);
    }
    const struct column *died = case_column(&c, "died");
    static const struct {
        const char *participant;
        int level;
        enum cell_state state;
    } events[] = {{"P05", 0, CELL_OBSERVED}, {"P01", 1, CELL_OBSERVED}, {"P03", 1, CELL_OBSERVED}, {"P04", NOWHERE, CELL_UNREADABLE},
        {"P07", NOWHERE, CELL_HELD_ASIDE}};
    for (size_t i = 0; i < sizeof events / sizeof *events; i++) {
        assert_int_equal(died->level[case_who(&c, events[i].participant)], events[i].level);
        assert_int_equal(case_state(&c, events[i].participant, "died"), events[i].state);
    }
    case_close(&c);
}

static void test_roster(void **state) {
    (void)state;
    struct trial_case c;
    open_case(&c);
    static const char *const ids[] = {"P01", "P02", "P03", "P04", "P05", "P06", "P07"};
    assert_int_equal(c.frame->participant_count, 7);
    for (size_t i = 0; i < 7; i++) {
        assert_string_equal(c.frame->participants[i].id, ids[i]);
    }
    assert_int_equal(c.frame->held_aside, 3); /* two of P07 and the one without an identifier */
    assert_int_equal(c.frame->participants[6].record_count, 2);
    assert_true(c.frame->participants[6].record == NO_RECORD);
    assert_int_equal(c.frame->participants[4].record, 0);
    size_t records[2] = {9, 9};
    assert_int_equal(frame_records(c.frame, 6, records, 2), 2);
    assert_int_equal(records[0], 5);
    assert_int_equal(records[1], 6);
    assert_int_equal(frame_records(c.frame, 6, records, 1), 2);
    assert_int_equal(frame_records(c.frame, 4, records, 2), 1);
    assert_int_equal(records[0], 0);
    assert_int_equal(frame_participant(c.frame, "P08"), NOWHERE);
    assert_int_equal(frame_participant(c.frame, ""), NOWHERE);
    assert_null(frame_text(c.frame, case_column(&c, "y0"), 6));
    assert_null(frame_column(c.frame, "nothing"));
    assert_ptr_equal(frame_column(c.frame, "pid"), c.frame->identifier);
    case_close(&c);
}

/* ---- what each decision changes: only its column is built anew ---- */

static void assert_others_shared(const struct trial_case *c, const struct frame *before, const char *column) {
    for (size_t v = 0; v < c->plan.variable_count; v++) {
        bool own = strcmp(c->plan.variables[v].column, column) == 0;
        assert_int_equal(c->frame->columns[v] == before->columns[v], !own);
    }
    assert_int_equal(c->frame->arm == before->arm, strcmp(column, "grp") != 0);
    assert_ptr_equal(c->frame->identifier, before->identifier);
}

static void test_decisions_on_values(void **state) {
    (void)state;
    static const struct {
        const char *decision, *participant, *column;
        enum cell_state state;
        double number; /* or */
        const char *level;
        const char *other; /* a participant whose cell stays as it was */
    } cases[] = {
        {"'kind': 'read-as', 'column': 'sex', 'from': 'f', 'to': 'F'", "P02", "sex", CELL_OBSERVED, NAN, "F", "P03"},
        {"'kind': 'read-as', 'column': 'died', 'from': 'y', 'to': 'Y'", "P04", "died", CELL_OBSERVED, NAN, NULL, "P05"},
        {"'kind': 'missing-code', 'column': 'y1', 'value': 'lost'", "P02", "y1", CELL_MISSING_CODE, NAN, NULL, "P05"},
        {"'kind': 'missing-code', 'column': 'y1', 'value': '2.0'", "P05", "y1", CELL_MISSING_CODE, NAN, NULL, "P01"},
        {"'kind': 'missing-code', 'column': 'y1', 'value': '<0.3'", "P03", "y1", CELL_MISSING_CODE, NAN, NULL, "P05"},
        {"'kind': 'missing-code', 'column': 'died', 'value': 'y'", "P04", "died", CELL_MISSING_CODE, NAN, NULL, "P05"},
        {"'kind': 'correct', 'column': 'y1', 'participant': 'P02', 'from': 'lost', 'to': '3.5'", "P02", "y1", CELL_OBSERVED, 3.5, NULL, "P05"},
        {"'kind': 'correct', 'column': 'y1', 'participant': 'P06', 'from': '  ', 'to': '4'", "P06", "y1", CELL_OBSERVED, 4, NULL, "P05"},
        {"'kind': 'correct', 'column': 'sex', 'participant': 'P03', 'from': 'F ', 'to': 'M'", "P03", "sex", CELL_OBSERVED, NAN, "M", "P02"},
        {"'kind': 'correct', 'column': 'grp', 'participant': 'P06', 'from': ' ', 'to': 'Lx'", "P06", "grp", CELL_OBSERVED, NAN, "Lx", "P05"},
        {"'kind': 'set-missing', 'column': 'age', 'participant': 'P01', 'from': '51'", "P01", "age", CELL_SET_MISSING, NAN, NULL, "P05"},
        {"'kind': 'set-missing', 'column': 'city', 'participant': 'P01', 'from': 'Ayr'", "P01", "city", CELL_SET_MISSING, NAN, "", "P04"},
        {"'kind': 'confirm', 'column': 'age', 'participant': 'P01', 'value': '51'", "P01", "age", CELL_OBSERVED, 51, NULL, "P05"},
        {"'kind': 'confirm', 'column': 'age', 'value': '51'", "P01", "age", CELL_OBSERVED, 51, NULL, "P05"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        struct trial_case c;
        open_case(&c);
        struct frame *before = frame_retain(c.frame);
        char text[256];
        snprintf(text, sizeof text, "[{%s, 'reason': 'r'}]", cases[i].decision);
        case_must(&c, text);
        assert_int_equal(case_state(&c, cases[i].participant, cases[i].column), cases[i].state);
        if (case_column(&c, cases[i].column)->number) {
            near(case_number(&c, cases[i].participant, cases[i].column), cases[i].number, 0, 0, cases[i].decision);
        }
        if (cases[i].level) {
            expect_text(case_level(&c, cases[i].participant, cases[i].column), cases[i].level, cases[i].decision);
        }
        size_t other = case_who(&c, cases[i].other);
        assert_int_equal(case_column(&c, cases[i].column)->state[other], frame_column(before, cases[i].column)->state[other]);
        assert_others_shared(&c, before, cases[i].column);
        bool changes = !strstr(cases[i].decision, "confirm");
        assert_int_equal(strcmp(c.frame->state_sha256, before->state_sha256) != 0, changes);
        frame_release(before);
        case_close(&c);
    }
}

static void test_origin_of_values(void **state) {
    (void)state;
    struct trial_case c;
    open_case(&c);
    case_must(&c, "[{'kind': 'correct', 'column': 'y1', 'participant': 'P05', 'from': '2', 'to': '3', 'reason': 'r'},"
                  " {'kind': 'correct', 'column': 'y1', 'participant': 'P05', 'from': '3', 'to': '4', 'reason': 'r'}]");
    const struct column *y1 = case_column(&c, "y1");
    assert_int_equal(y1->origin[0], c.planned + 2);
    assert_int_equal(y1->origin[1], 0);
    assert_null(case_column(&c, "y0")->origin);
    assert_string_equal(frame_text(c.frame, y1, case_who(&c, "P05")), "4");
    case_must(&c, "[{'kind': 'set-missing', 'column': 'y1', 'participant': 'P05', 'from': '4', 'reason': 'r'},"
                  " {'kind': 'correct', 'column': 'y1', 'participant': 'P05', 'from': null, 'to': '6', 'reason': 'r'}]");
    near(case_number(&c, "P05", "y1"), 6, 0, 0, "set missing, then known after all");
    case_close(&c);
}

/* A code that stands for missing is not the limit that it names. */
static void test_code_that_is_a_limit(void **state) {
    (void)state;
    struct trial_case c;
    open_case(&c);
    case_must(&c, "[{'kind': 'correct', 'column': 'y1', 'participant': 'P05', 'from': '2', 'to': '0.3', 'reason': 'r'},"
                  " {'kind': 'missing-code', 'column': 'y1', 'value': '<0.3', 'reason': 'r'}]");
    assert_int_equal(case_state(&c, "P05", "y1"), CELL_OBSERVED);
    assert_int_equal(case_state(&c, "P03", "y1"), CELL_MISSING_CODE);
    case_close(&c);
}

static void test_number_format(void **state) {
    (void)state;
    struct trial_case c;
    open_case(&c);
    case_must(&c, "[{'kind': 'keep-record', 'participant': 'P07', 'row': 6, 'reason': 'r'}]");
    assert_int_equal(case_state(&c, "P07", "y1"), CELL_UNREADABLE);
    case_must(&c, "[{'kind': 'number-format', 'column': 'y1', 'decimal': ',', 'reason': 'r'}]");
    near(case_number(&c, "P07", "y1"), 2.5, 0, 0, "with a decimal comma");
    near(case_number(&c, "P01", "y1"), 2.5, 0, 0, "with a point as before");
    case_must(&c, "[{'kind': 'number-format', 'column': 'y1', 'decimal': '.', 'reason': 'r'}]");
    assert_int_equal(case_state(&c, "P07", "y1"), CELL_UNREADABLE);
    case_close(&c);
}

static void test_keep_record(void **state) {
    (void)state;
    struct trial_case c;
    open_case(&c);
    case_must(&c, "[{'kind': 'keep-record', 'participant': 'P07', 'row': 7, 'reason': 'r'}]");
    assert_int_equal(c.frame->held_aside, 2);
    near(case_number(&c, "P07", "y0"), 7, 0, 0, "the second record");
    expect_text(case_level(&c, "P07", "grp"), "Wx", "arm");
    case_must(&c, "[{'kind': 'keep-record', 'participant': 'P07', 'row': 6, 'reason': 'the other after all'}]");
    assert_int_equal(c.frame->held_aside, 2);
    near(case_number(&c, "P07", "y0"), 0, 0, 0, "the first record");
    expect_text(case_level(&c, "P07", "grp"), "Zx", "arm");
    char text[64];
    snprintf(text, sizeof text, "[{'kind': 'reverse', 'number': %zu, 'reason': 'r'}]", c.count);
    case_must(&c, text);
    near(case_number(&c, "P07", "y0"), 7, 0, 0, "the second again");
    snprintf(text, sizeof text, "[{'kind': 'reverse', 'number': %zu, 'reason': 'r'}]", c.planned + 1);
    case_must(&c, text);
    assert_int_equal(case_state(&c, "P07", "y0"), CELL_HELD_ASIDE);
    assert_string_equal(c.frame->state_sha256, c.received->state_sha256);
    case_close(&c);
}

/* A corrected identifier: the record moves, and what was decided about it under the old name stays with it. */
static void test_identifier(void **state) {
    (void)state;
    struct trial_case c;
    open_case(&c);
    case_must(&c, "[{'kind': 'correct', 'column': 'y1', 'participant': 'P05', 'from': '2', 'to': '2.2', 'reason': 'r'},"
                  " {'kind': 'exclude', 'participant': 'P05', 'set': 'per-protocol', 'reason': 'r'},"
                  " {'kind': 'flag', 'outcome': 'y', 'participant': 'P05', 'reason': 'r'}]");
    case_must(&c, "[{'kind': 'correct', 'column': 'pid', 'participant': 'P05', 'from': 'P05', 'to': 'P50', 'reason': 'r'}]");
    assert_int_equal(frame_participant(c.frame, "P05"), NOWHERE);
    size_t who = case_who(&c, "P50");
    near(case_number(&c, "P50", "y1"), 2.2, 0, 0, "corrected under the old name");
    assert_true(c.frame->participants[who].excluded_per_protocol);
    assert_true(c.frame->flagged[who]);
    case_must(&c, "[{'kind': 'correct', 'column': 'pid', 'participant': 'P07', 'row': 7, 'from': 'P07', 'to': 'P08', 'reason': 'r'}]");
    near(case_number(&c, "P07", "y0"), 0, 0, 0, "P07");
    near(case_number(&c, "P08", "y0"), 7, 0, 0, "P08");
    assert_int_equal(c.frame->held_aside, 1);
    /* A decision about somebody no longer in the file does no harm. */
    case_must(&c, "[{'kind': 'exclude', 'participant': 'P08', 'set': 'full', 'reason': 'r'}]");
    case_must(&c, "[{'kind': 'set-missing', 'column': 'pid', 'participant': 'P08', 'from': 'P08', 'reason': 'r'}]");
    assert_int_equal(frame_participant(c.frame, "P08"), NOWHERE);
    assert_int_equal(c.frame->held_aside, 2);
    case_close(&c);
}

static void test_sets_scales_flags(void **state) {
    (void)state;
    struct trial_case c;
    open_case(&c);
    struct frame *before = frame_retain(c.frame);
    case_must(&c, "[{'kind': 'exclude', 'participant': 'P01', 'set': 'per-protocol', 'reason': 'r'},"
                  " {'kind': 'exclude', 'participant': 'P02', 'set': 'full', 'reason': 'r'},"
                  " {'kind': 'scale', 'outcome': 'y', 'scale': 'log10', 'reason': 'r'}]");
    const struct participant *p01 = &c.frame->participants[case_who(&c, "P01")], *p02 = &c.frame->participants[case_who(&c, "P02")];
    assert_true(!p01->excluded_full && p01->excluded_per_protocol);
    assert_true(p02->excluded_full && p02->excluded_per_protocol);
    assert_int_equal(c.frame->scales[0], SCALE_LOG10);
    assert_others_shared(&c, before, "");
    assert_string_not_equal(c.frame->state_sha256, before->state_sha256);
    char state_before[HASH_SIZE];
    memcpy(state_before, c.frame->state_sha256, HASH_SIZE);
    case_must(&c, "[{'kind': 'flag', 'outcome': 'y', 'participant': 'P03', 'reason': 'r'},"
                  " {'kind': 'note', 'exhibit': 'effect', 'text': 'x'}, {'kind': 'attending', 'people': ['A']},"
                  " {'kind': 'query', 'column': 'y1', 'participant': 'P02', 'question': 'lost?', 'reason': 'r'}]");
    assert_true(c.frame->flagged[case_who(&c, "P03")]);
    assert_false(c.frame->flagged[case_who(&c, "P02")]);
    assert_string_equal(state_before, c.frame->state_sha256); /* none of these is a value, a set or a scale */
    assert_int_equal(c.frame->version, c.count);
    frame_release(before);
    case_close(&c);
}

static void test_blinding_and_lock(void **state) {
    (void)state;
    struct trial_case c;
    open_as(&c, "pooled");
    assert_int_equal(c.frame->blinding, BLINDING_POOLED);
    case_must(&c, "[{'kind': 'unblind', 'to': 'coded', 'reason': 'r'}]");
    assert_int_equal(c.frame->blinding, BLINDING_CODED);
    case_refused(&c, "[{'kind': 'unblind', 'to': 'coded', 'reason': 'r'}]",
        "decision 1 of the batch (unblind) asks for coded, but the study is coded already; nothing was recorded");
    case_must(&c, "[{'kind': 'unblind', 'to': 'unblinded', 'reason': 'r'}]");
    assert_int_equal(c.frame->blinding, BLINDING_UNBLINDED);
    case_must(&c, "[{'kind': 'lock', 'reason': 'r'}]");
    assert_true(c.frame->locked);
    static const char *const refused[] = {
        "'kind': 'read-as', 'column': 'sex', 'from': 'f', 'to': 'F'", "'kind': 'missing-code', 'column': 'y1', 'value': 'lost'",
        "'kind': 'number-format', 'column': 'y1', 'decimal': ','", "'kind': 'set-missing', 'column': 'y1', 'participant': 'P05', 'from': '2'",
        "'kind': 'correct', 'column': 'y1', 'participant': 'P05', 'from': '2', 'to': '3'",
        "'kind': 'confirm', 'column': 'y1', 'value': '2'", "'kind': 'keep-record', 'participant': 'P07', 'row': 7",
        "'kind': 'exclude', 'participant': 'P05', 'set': 'full'", "'kind': 'scale', 'outcome': 'y', 'scale': 'log10'",
        "'kind': 'reverse', 'number': 1"};
    for (size_t i = 0; i < sizeof refused / sizeof *refused; i++) {
        char text[256];
        snprintf(text, sizeof text, "[{%s, 'reason': 'r'}]", refused[i]);
        assert_false(case_decide(&c, text));
        if (!strstr(c.fault.message, "would change data, and the study is locked; unlock it first, with a reason; nothing was recorded")) {
            fail_msg("%s: %s", refused[i], c.fault.message);
        }
    }
    case_must(&c, "[{'kind': 'flag', 'outcome': 'y', 'participant': 'P03', 'reason': 'r'}, {'kind': 'sign', 'meaning': 'm', 'reason': 'r'}]");
    case_refused(&c, "[{'kind': 'lock', 'reason': 'r'}]",
        "decision 1 of the batch (lock) is not needed: the study is locked already; nothing was recorded");
    case_must(&c, "[{'kind': 'unlock', 'reason': 'r'}, {'kind': 'set-missing', 'column': 'y1', 'participant': 'P05', 'from': '2', 'reason': 'r'}]");
    assert_false(c.frame->locked);
    case_close(&c);
}

/* ---- refused, with the sentence ---- */

static void test_refused(void **state) {
    (void)state;
    static const char *const cases[][2] = {
        {"'kind': 'correct', 'column': 'y1', 'participant': 'P05', 'from': '2.0', 'to': '3'",
            "(correct) says y1 of P05 reads \"2.0\", but it now reads \"2\""},
        {"'kind': 'correct', 'column': 'y1', 'participant': 'P06', 'from': '', 'to': '3'",
            "(correct) says y1 of P06 reads \"\", but it now reads \"  \""},
        {"'kind': 'correct', 'column': 'y1', 'participant': 'P05', 'from': null, 'to': '3'",
            "(correct) says y1 of P05 reads nothing (set missing), but it now reads \"2\""},
        {"'kind': 'set-missing', 'column': 'age', 'participant': 'P01', 'from': '51'",
            "(set-missing) says age of P01 reads \"51\", but it now reads nothing (set missing)"},
        {"'kind': 'correct', 'column': 'y9', 'participant': 'P05', 'from': '2', 'to': '3'",
            "(correct) names the column \"y9\", which the plan gives no meaning"},
        {"'kind': 'correct', 'column': 'y1', 'participant': 'P99', 'from': '2', 'to': '3'",
            "(correct) names a participant who is not in the file"},
        {"'kind': 'correct', 'column': 'y1', 'participant': 'P07', 'from': '8', 'to': '3'",
            "(correct) is about a participant with several records; say which one with \"row\", or keep one first"},
        {"'kind': 'correct', 'column': 'y1', 'participant': 'P07', 'row': 1, 'from': '8', 'to': '3'",
            "(correct) names a row that is not one of the participant's records"},
        {"'kind': 'correct', 'column': 'y1', 'participant': 'P07', 'row': 10, 'from': '8', 'to': '3'",
            "(correct) names a row that is not one of the participant's records"},
        {"'kind': 'correct', 'column': 'pid', 'participant': 'P07', 'from': 'P07', 'to': 'P08'",
            "(correct) is about an identifier that several records bear; say which one with \"row\""},
        {"'kind': 'correct', 'column': 'pid', 'participant': 'P77', 'from': 'P77', 'to': 'P08'",
            "(correct) names a participant who is not in the file"},
        {"'kind': 'read-as', 'column': 'sex', 'from': 'x', 'to': 'F'",
            "(read-as) reads a code as another, but no value of the column now reads so"},
        {"'kind': 'confirm', 'column': 'y1', 'participant': 'P05', 'value': '3'",
            "(confirm) confirms a value that is not the text now current"},
        {"'kind': 'confirm', 'column': 'y1', 'value': '3'", "(confirm) confirms a value that no cell of the column now has"},
        {"'kind': 'keep-record', 'participant': 'P07', 'row': 1", "(keep-record) names a row that is not one of the participant's records"},
        {"'kind': 'keep-record', 'participant': 'P99', 'row': 1", "(keep-record) names a participant who is not in the file"},
        {"'kind': 'exclude', 'participant': 'P99', 'set': 'full'", "(exclude) names a participant who is not in the file"},
        {"'kind': 'scale', 'outcome': 'z', 'scale': 'log10'", "(scale) names \"z\", which is not the id of an outcome"},
        {"'kind': 'flag', 'outcome': 'z', 'participant': 'P05'", "(flag) names \"z\", which is not the id of an outcome"},
        {"'kind': 'query', 'participant': 'P99', 'question': 'q'", "(query) names a participant who is not in the file"},
        {"'kind': 'response', 'number': 1, 'text': 'q'", "(response) answers decision 1, which is not a query"},
        {"'kind': 'response', 'number': 99, 'text': 'q'", "(response) answers decision 99, which is not a query"},
        {"'kind': 'number-format', 'column': 'sex', 'decimal': ','", "(number-format) is about the column \"sex\", which holds no numbers"},
        {"'kind': 'number-format', 'column': 'pid', 'decimal': ','", "(number-format) is about the column \"pid\", which holds no numbers"},
        {"'kind': 'missing-code', 'column': 'pid', 'value': 'P05'",
            "(missing-code) is about the identifier, which cannot be missing; correct it, or set it missing to hold the record aside"},
        {"'kind': 'unlock'", "(unlock) is not needed: the study is not locked"},
        {"'kind': 'reverse', 'number': 99", "(reverse) reverses a decision that is not there"},
        {"'kind': 'unblind', 'to': 'coded'", "(unblind) asks for coded, but the study is unblinded already"},
    };
    struct trial_case c;
    open_case(&c);
    case_must(&c, "[{'kind': 'set-missing', 'column': 'age', 'participant': 'P01', 'from': '51', 'reason': 'r'}]");
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        char text[512], sentence[512]; /* a good decision first: the whole batch is refused */
        snprintf(text, sizeof text, "[{'kind': 'set-missing', 'column': 'age', 'participant': 'P05', 'from': '50', 'reason': 'r'},"
                                    " {%s, 'reason': 'r'}]", cases[i][0]);
        snprintf(sentence, sizeof sentence, "decision 2 of the batch %s; nothing was recorded", cases[i][1]);
        case_refused(&c, text, sentence);
        assert_int_equal(c.fault.row, 2);
        near(case_number(&c, "P05", "age"), 50, 0, 0, "all or none");
    }
    case_close(&c);
}

static void test_reversals_refused(void **state) {
    (void)state;
    struct trial_case c;
    open_as(&c, "pooled");
    size_t first = c.count + 1;
    case_must(&c, "[{'kind': 'set-missing', 'column': 'age', 'participant': 'P05', 'from': '50', 'reason': 'r'},"
                  " {'kind': 'unblind', 'to': 'unblinded', 'reason': 'r'}, {'kind': 'lock', 'reason': 'r'},"
                  " {'kind': 'sign', 'meaning': 'm', 'reason': 'r'}, {'kind': 'unlock', 'reason': 'r'}]");
    static const char *const why[] = {"what has been unblinded cannot be unseen", "a lock is opened by unlock", "a signature stands for good"};
    char text[128], sentence[256];
    for (size_t i = 0; i < 3; i++) {
        snprintf(text, sizeof text, "[{'kind': 'reverse', 'number': %zu, 'reason': 'r'}]", first + 1 + i);
        snprintf(sentence, sizeof sentence, "decision 1 of the batch (reverse) cannot reverse decision %zu: %s; nothing was recorded",
            first + 1 + i, why[i]);
        case_refused(&c, text, sentence);
    }
    snprintf(text, sizeof text, "[{'kind': 'reverse', 'number': %zu, 'reason': 'r'}]", first);
    case_must(&c, text);
    snprintf(sentence, sizeof sentence,
        "decision 1 of the batch (reverse) reverses decision %zu, which decision %zu has reversed already; nothing was recorded", first, c.count);
    case_refused(&c, text, sentence);
    snprintf(text, sizeof text, "[{'kind': 'reverse', 'number': %zu, 'reason': 'r'}]", c.count + 1);
    case_refused(&c, text, "decision 1 of the batch (reverse) reverses a decision that is not there; nothing was recorded");
    case_close(&c);
}

/* ---- blinded, no text of the arm stands in a fault, and trying values finds nothing out ---- */

static void test_arm_stays_hidden(void **state) {
    (void)state;
    static const char *const tries[] = {
        "'kind': 'correct', 'column': 'grp', 'participant': 'P05', 'from': 'Lx', 'to': 'Wx'",
        "'kind': 'correct', 'column': 'grp', 'participant': 'P05', 'from': 'Wx', 'to': 'Lx'",
        "'kind': 'set-missing', 'column': 'grp', 'participant': 'P05', 'from': '?'",
        "'kind': 'set-missing', 'column': 'grp', 'participant': 'P05', 'from': 'Lx'",
        "'kind': 'confirm', 'column': 'grp', 'participant': 'P05', 'value': 'Lx'",
        "'kind': 'confirm', 'column': 'grp', 'participant': 'P05', 'value': 'Wx'",
    };
    static const char *const blinding[] = {"pooled", "coded"};
    for (size_t b = 0; b < 2; b++) {
        struct trial_case c;
        open_as(&c, blinding[b]);
        for (size_t i = 0; i < sizeof tries / sizeof *tries; i++) {
            char text[256], kind[32], sentence[320];
            sscanf(tries[i], "'kind': '%31[^']", kind);
            snprintf(text, sizeof text, "[{%s, 'reason': 'r'}]", tries[i]);
            snprintf(sentence, sizeof sentence, "decision 1 of the batch (%s) is about one participant's cell of grp, which is not shown while "
                "the study is %s; unblind it first; nothing was recorded", kind, blinding[b]);
            case_refused(&c, text, sentence);
            assert_int_equal(c.fault.code, FAULT_REFUSED);
        }
        assert_false(case_decide(&c, "[{'kind': 'read-as', 'column': 'grp', 'from': 'zz', 'to': 'Wx', 'reason': 'r'}]"));
        assert_null(strstr(c.fault.message, "Wx"));
        assert_null(strstr(c.fault.message, "Lx"));
        case_must(&c, "[{'kind': 'unblind', 'to': 'unblinded', 'reason': 'r'}]");
        case_must(&c, "[{'kind': 'correct', 'column': 'grp', 'participant': 'P05', 'from': 'Lx', 'to': 'Wx', 'reason': 'r'}]");
        case_close(&c);
    }
}

/* ---- properties over random records ---- */

static uint64_t next_random(uint64_t *state) { /* splitmix64: Steele, Lea & Flood 2014, OOPSLA */
    uint64_t z = (*state += UINT64_C(0x9e3779b97f4a7c15));
    z = (z ^ (z >> 30)) * UINT64_C(0xbf58476d1ce4e5b9);
    z = (z ^ (z >> 27)) * UINT64_C(0x94d049bb133111eb);
    return z ^ (z >> 31);
}

static size_t below(uint64_t *state, size_t count) {
    return (size_t)(next_random(state) % count);
}

/* One decision at random, often fitting the data, sometimes not. */
static const char *random_decision(struct trial_case *c, uint64_t *state) {
    static const char *const columns[] = {"sex", "city", "age", "y0", "y1", "died", "grp", "pid"};
    static const char *const texts[] = {"F", "M", "1", "2.5", "999", "<3", "", "Lx", "Y", "2,5", "P50", "P07"};
    const char *column = columns[below(state, 8)], *to = texts[below(state, 12)];
    const struct participant *who = &c->frame->participants[below(state, c->frame->participant_count)];
    size_t record = who->record == NO_RECORD ? below(state, c->cells[0].records) : who->record;
    const char *text = column_text(c->frame, frame_column(c->frame, column), record);
    const char *from = text ? arena_format(&c->arena, "'%s'", text) : "null";
    char row[32] = "";
    if (who->record == NO_RECORD || below(state, 4) == 0) {
        snprintf(row, sizeof row, ", 'row': %zu", record + 1);
    }
    switch (below(state, 12)) {
    case 0:
        return arena_format(&c->arena, "[{'kind': 'read-as', 'column': '%s', 'from': %s, 'to': '%s', 'reason': 'r'}]", column, from, to);
    case 1:
        return arena_format(&c->arena, "[{'kind': 'missing-code', 'column': '%s', 'value': '%s', 'reason': 'r'}]", column, to);
    case 2:
        return arena_format(&c->arena, "[{'kind': 'number-format', 'column': '%s', 'decimal': ',', 'reason': 'r'}]", column);
    case 3:
        return arena_format(&c->arena, "[{'kind': 'keep-record', 'participant': '%s', 'row': %zu, 'reason': 'r'}]", who->id, record + 1);
    case 4:
        return arena_format(&c->arena, "[{'kind': 'exclude', 'participant': '%s', 'set': 'full', 'reason': 'r'}]", who->id);
    case 5:
        return arena_format(&c->arena, "[{'kind': 'scale', 'outcome': 'y', 'scale': '%s', 'reason': 'r'}]", below(state, 2) ? "log10" : "linear");
    case 6:
        return arena_format(&c->arena, "[{'kind': 'set-missing', 'column': '%s', 'participant': '%s', 'from': %s%s, 'reason': 'r'}]", column,
            who->id, from, row);
    case 7:
        return arena_format(&c->arena, "[{'kind': 'flag', 'outcome': 'y', 'participant': '%s', 'reason': 'r'}]", who->id);
    case 8:
    case 9:
        return arena_format(&c->arena, "[{'kind': 'reverse', 'number': %zu, 'reason': 'r'}]", below(state, c->count + 1) + 1);
    default:
        return arena_format(&c->arena, "[{'kind': 'correct', 'column': '%s', 'participant': '%s', 'from': %s, 'to': '%s'%s, 'reason': 'r'}]",
            column, who->id, from, to, row);
    }
}

static void assert_same_values(const struct frame *a, const struct frame *b) {
    assert_string_equal(a->state_sha256, b->state_sha256);
    assert_int_equal(a->participant_count, b->participant_count);
    assert_int_equal(a->held_aside, b->held_aside);
    for (size_t v = 0; v < a->plan->variable_count; v++) {
        const struct column *x = a->columns[v], *y = b->columns[v];
        assert_string_equal(x->hash, y->hash);
        assert_int_equal(x->level_count, y->level_count);
        assert_memory_equal(x->state, y->state, a->participant_count);
        for (size_t r = 0; r < a->cells->records; r++) {
            const char *one = column_text(a, x, r), *other = column_text(b, y, r);
            assert_true(one && other ? strcmp(one, other) == 0 : one == other);
        }
    }
    assert_memory_equal(a->flagged, b->flagged, a->plan->outcome_count * a->participant_count * sizeof *a->flagged);
}

/* Takes back every decision since load, newest first, skipping those already taken back. */
static void reverse_everything(struct trial_case *c) {
    for (size_t number = c->count; number > c->planned; number--) {
        bool reversal = c->decisions[number - 1].kind == DECISION_REVERSE;
        if (!c->frame->stands[number - 1] || (reversal && c->decisions[number - 1].reverses > c->planned)) {
            continue;
        }
        char text[96];
        snprintf(text, sizeof text, "[{'kind': 'reverse', 'number': %zu, 'reason': 'r'}]", number);
        case_must(c, text);
    }
}

static void test_replay_is_one(void **state) {
    (void)state;
    size_t taken = 0, refused = 0;
    for (uint64_t seed = 1; seed <= 60; seed++) {
        struct trial_case c;
        open_case(&c);
        uint64_t random = seed;
        for (size_t i = 0; i < 60; i++) {
            bool done = case_decide(&c, random_decision(&c, &random));
            taken += done;
            refused += !done;
            assert_true(done || c.fault.message[0] != '\0');
            if (i % 10 == 9) {
                struct frame *scratch = case_build(&c, c.count, NULL, false), *half = case_build(&c, c.count / 2, NULL, false);
                struct frame *from_half = case_build(&c, c.count, half, false);
                assert_same_values(c.frame, scratch);
                assert_same_values(c.frame, from_half); /* as when another process has decided meanwhile */
                frame_release(scratch);
                frame_release(half);
                frame_release(from_half);
            }
        }
        reverse_everything(&c);
        assert_same_values(c.frame, c.received);
        case_close(&c);
    }
    assert_true(taken > 1000 && refused > 300);
}

/* The same data in another order of records, or with codes written otherwise, has the same fingerprint. */
static void test_fingerprint(void **state) {
    (void)state;
    static const char small[] = "{'title': 'T', 'participant': 'p', 'missing_codes': ['999'], 'outcomes': [{'id': 'y', 'role': 'primary',"
                                " 'better': 'lower', 'visits': [{'label': 'E', 'column': 'y'}]}]}";
    static const struct {
        const char *data;
        bool same;
    } cases[] = {
        {"p,y\nA,1\nB,2\nC,999\n", true}, {"p,y\nC,999.0\nB,2.0\nA,1\n", true}, {"y,p,z\n1,A,x\n2,B,x\n999,C,x\n", true},
        {"p,y\nA,1\nB,2\nC,\n", false}, {"p,y\nA,1\nB,2.5\nC,999\n", false}, {"p,y\nA,1\nB,2\n", false}, {"p,y\nA,1\nB,<2\nC,999\n", false},
        {"p,y\nA,1\nb,2\nC,999\n", false}, {"p,y\nA,1\nB,2\nC,lost\n", false},
    };
    char first[HASH_SIZE] = "";
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        struct trial_case c;
        case_open(&c, cases[i].data, small);
        if (i == 0) {
            memcpy(first, c.frame->state_sha256, HASH_SIZE);
        }
        assert_int_equal(strcmp(first, c.frame->state_sha256) == 0, cases[i].same);
        case_close(&c);
    }
}

static void test_words_of_states(void **state) {
    (void)state;
    for (int i = 0; i < CELL_STATE_COUNT; i++) {
        assert_true(strlen(cell_state_name((enum cell_state)i)) > 4 && strlen(cell_state_words((enum cell_state)i)) > 4);
    }
    assert_string_equal(cell_state_name(CELL_MISSING_CODE), "missing-code");
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_cells_of_numbers), cmocka_unit_test(test_cells_of_categories), cmocka_unit_test(test_roster),
        cmocka_unit_test(test_decisions_on_values), cmocka_unit_test(test_origin_of_values), cmocka_unit_test(test_code_that_is_a_limit),
        cmocka_unit_test(test_number_format), cmocka_unit_test(test_keep_record), cmocka_unit_test(test_identifier),
        cmocka_unit_test(test_sets_scales_flags), cmocka_unit_test(test_blinding_and_lock), cmocka_unit_test(test_refused),
        cmocka_unit_test(test_reversals_refused), cmocka_unit_test(test_arm_stays_hidden), cmocka_unit_test(test_replay_is_one),
        cmocka_unit_test(test_fingerprint), cmocka_unit_test(test_words_of_states),
    };
    return cmocka_run_group_tests_name("trial/frame", tests, NULL, NULL);
}
