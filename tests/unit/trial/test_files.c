/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A study of several files: how records join the participants of the first and what is counted of those that do not, files
 * with one row per visit, decisions on their columns, and plans whose "files" cannot be. The rules are the plan's format and
 * the project's own; the counts are made by hand from the files below. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "near.h"
#include "trial/arms.h"
#include "trial/study.h"
#include "trial_case.h"
#include <stdlib.h>

enum { PEOPLE, VISITS, EXTRA, FILES };

static const char plan[] =
    "{'title': 'T', 'participant': 'pid', 'missing_codes': ['999'],"
    " 'files': [{'id': 'people', 'participant': 'pid'},"
    "   {'id': 'visits', 'layout': 'visit', 'participant': 'PID', 'visit': 'VISIT', 'codes': ['V0', 'V8', 'V26']},"
    "   {'id': 'extra', 'layout': 'participant', 'participant': 'who'}],"
    " 'arm': {'column': 'grp', 'levels': [{'code': 'Lx', 'reference': true}, {'code': 'Wx'}]},"
    " 'outcomes': [{'id': 'y', 'role': 'primary', 'better': 'lower', 'visits': [{'label': 'Baseline', 'file': 'visits', 'visit': 'V0',"
    "   'column': 'y'}, {'label': '8 weeks', 'column': 'visits.y@V8'}, {'label': '26 weeks', 'file': 'visits', 'visit': 'V26', 'column': 'y'}]}],"
    " 'covariates': [{'id': 'sex', 'column': 'sex', 'kind': 'category', 'levels': [{'code': 'F'}, {'code': 'M'}]},"
    "   {'id': 'weight', 'file': 'visits', 'visit': 'V0', 'column': 'kg', 'kind': 'number'},"
    "   {'id': 'smokes', 'file': 'extra', 'column': 'smokes', 'kind': 'category'}],"
    " 'events': [{'id': 'died', 'file': 'extra', 'column': 'died', 'yes': ['Y'], 'no': ['N']}],"
    " 'blinding': '%s'}";

static const char people[] = "pid,grp,sex\n"
                             "P3,Wx,F\n" /* 1 */
                             "P1,Lx,M\n"
                             "P2,Wx,f\n"
                             "P4,Lx,F\n"
                             "P5,Lx,F\n" /* 5: twice */
                             "P5,Lx,M\n"
                             ",Wx,F\n";

static const char visits[] = "VISIT,PID,y,kg\n"
                             "V0,P1,10,70\n"   /* 1 */
                             "V8,P1,11,\n"
                             "V26,P1,999,\n"
                             "V0,P2,20,80\n"
                             "V8,P2,21,\n"     /* 5: twice */
                             "V8,P2,22,\n"
                             "V8,P3,31,\n"     /* 7 */
                             "V0,p4,40,90\n"   /* 8: another spelling of P4 */
                             "v8,P4,41,\n"     /* 9: another spelling of V8 */
                             "V99,P1,1,1\n"    /* 10: never planned */
                             "V0,S1,1,1\n"     /* 11: nobody of the first file */
                             "V8,,1,1\n"       /* 12: nobody at all */
                             "V0,P5,50,55\n"   /* 13 */
                             "V26,P3,x,\n";    /* 14 */

static const char extra[] = "who,smokes,died\n"
                            "P2,no,N\n"   /* 1 */
                            "P1,yes,Y\n"
                            "P3,no,N\n"   /* 3: twice */
                            "P3,yes,N\n"
                            "Z,yes,N\n"
                            " ,no,N\n";

static void open_as(struct trial_case *c, const char *blinding) {
    static const char *const csv[] = {people, visits, extra};
    char text[2048];
    snprintf(text, sizeof text, plan, blinding);
    case_open_files(c, csv, FILES, text);
}

static void open_case(struct trial_case *c) {
    open_as(c, "unblinded");
}

static void expect_join(const struct frame *frame, size_t f, const struct join *want) {
    const struct join *got = &frame->joins[f];
    assert_int_equal(got->matched, want->matched);
    assert_int_equal(got->blank, want->blank);
    assert_int_equal(got->unmatched, want->unmatched);
    assert_int_equal(got->unplanned, want->unplanned);
    assert_int_equal(got->doubled, want->doubled);
}

static void test_joins_are_counted(void **state) {
    (void)state;
    struct trial_case c;
    open_case(&c);
    assert_int_equal(c.frame->participant_count, 5);
    assert_int_equal(c.frame->held_aside, 3);
    expect_join(c.frame, PEOPLE, &(struct join){.matched = 6, .blank = 1, .doubled = 1});
    expect_join(c.frame, VISITS, &(struct join){.matched = 9, .blank = 1, .unmatched = 2, .unplanned = 2, .doubled = 1});
    expect_join(c.frame, EXTRA, &(struct join){.matched = 4, .blank = 1, .unmatched = 1, .doubled = 1});
    for (size_t f = PEOPLE; f < FILES; f++) { /* every record is somewhere, once */
        const struct join *join = &c.frame->joins[f];
        assert_int_equal(join->matched + join->blank + join->unmatched + join->unplanned, c.cells[f].records);
    }
    case_close(&c);
}

static void expect_cell(const struct trial_case *c, const char *who, const char *column, enum cell_state state, double number) {
    char label[64];
    snprintf(label, sizeof label, "%s %s", who, column);
    expect_text(cell_state_name(case_state(c, who, column)), cell_state_name(state), label);
    near(case_number(c, who, column), number, 0, 0, label);
}

static void test_cells_come_from_their_visit(void **state) {
    (void)state;
    static const struct {
        const char *who, *column;
        enum cell_state state;
        double number;
    } cases[] = {
        {"P1", "visits.y@V0", CELL_OBSERVED, 10},   {"P1", "visits.y@V8", CELL_OBSERVED, 11},   {"P1", "visits.y@V26", CELL_MISSING_CODE, NAN},
        {"P1", "visits.kg@V0", CELL_OBSERVED, 70},  {"P2", "visits.y@V0", CELL_OBSERVED, 20},   {"P2", "visits.y@V8", CELL_HELD_ASIDE, NAN},
        {"P2", "visits.y@V26", CELL_BLANK, NAN},    {"P3", "visits.y@V0", CELL_BLANK, NAN},     {"P3", "visits.kg@V0", CELL_BLANK, NAN},
        {"P3", "visits.y@V8", CELL_OBSERVED, 31},   {"P3", "visits.y@V26", CELL_UNREADABLE, NAN}, {"P4", "visits.y@V0", CELL_BLANK, NAN},
        {"P4", "visits.y@V8", CELL_BLANK, NAN},     {"P5", "visits.y@V0", CELL_HELD_ASIDE, NAN}, /* held aside as a whole */
    };
    struct trial_case c;
    open_case(&c);
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        expect_cell(&c, cases[i].who, cases[i].column, cases[i].state, cases[i].number);
    }
    assert_int_equal(case_state(&c, "P3", "extra.smokes"), CELL_HELD_ASIDE);
    assert_int_equal(case_state(&c, "P4", "extra.smokes"), CELL_BLANK);
    expect_text(case_level(&c, "P1", "extra.smokes"), "yes", "smokes");
    expect_text(case_level(&c, "P2", "people.sex"), "f", "sex");
    assert_int_equal(case_column(&c, "extra.died")->level[case_who(&c, "P1")], 1);
    assert_null(frame_text(c.frame, case_column(&c, "visits.y@V0"), case_who(&c, "P3")));
    expect_text(frame_received(c.frame, case_column(&c, "visits.y@V26"), case_who(&c, "P1")), "999", "as received");
    assert_null(frame_received(c.frame, case_column(&c, "visits.y@V8"), case_who(&c, "P2")));
    case_close(&c);
}

static void test_records_of_a_participant(void **state) {
    (void)state;
    struct trial_case c;
    open_case(&c);
    size_t records[4] = {9, 9, 9, 9};
    size_t slot = case_column(&c, "visits.y@V8")->slot;
    assert_int_equal(frame_slot_records(c.frame, slot, case_who(&c, "P2"), records, 4), 2);
    assert_int_equal(records[0], 4);
    assert_int_equal(records[1], 5);
    assert_int_equal(frame_slot_records(c.frame, slot, case_who(&c, "P4"), records, 4), 0);
    assert_int_equal(frame_slot_records(c.frame, case_column(&c, "people.sex")->slot, case_who(&c, "P5"), records, 4), 2);
    assert_int_equal(records[0], 4);
    assert_int_equal(frame_slot_records(c.frame, case_column(&c, "extra.died")->slot, case_who(&c, "P3"), records, 1), 2);
    assert_int_equal(records[0], 2);
    assert_int_equal(frame_slot_of_record(c.frame, VISITS, 1), slot);
    assert_true(frame_slot_of_record(c.frame, VISITS, 9) == NO_RECORD);
    case_close(&c);
}

/* ---- what the checks say, and how it is settled ---- */

static const struct discrepancy *find(const struct discrepancies *found, const char *id) {
    for (size_t i = 0; i < found->count; i++) {
        if (strcmp(found->list[i].id, id) == 0) {
            return &found->list[i];
        }
    }
    fail_msg("no discrepancy %s", id);
    return NULL;
}

static void test_checks_of_files(void **state) {
    (void)state;
    static const struct {
        const char *id, *message, *proposal;
    } cases[] = {
        {"no-identifier/people.pid/blank", "1 record has no identifier, the first is record 7; it is held aside and counted.", NULL},
        {"no-identifier/visits.PID/blank", "visits: 1 record has no identifier, the first is record 12; it is joined to nobody and counted.", NULL},
        {"no-identifier/extra.who/blank", "extra: 1 record has no identifier, the first is record 6; it is joined to nobody and counted.", NULL},
        {"unmatched-participant/visits.PID/p4", "visits, record 8: the identifier \"p4\" is not in the first file; what it says is joined to nobody, "
            "and counted.", "{\"kind\":\"read-as\",\"column\":\"visits.PID\",\"from\":\"p4\",\"to\":\"P4\"}"},
        {"unmatched-participant/visits.PID/S1", "visits, record 11: the identifier \"S1\" is not in the first file; what it says is joined to nobody, "
            "and counted.", NULL},
        {"unmatched-participant/extra.who/Z", "extra, record 5: the identifier \"Z\" is not in the first file; what it says is joined to nobody, "
            "and counted.", NULL},
        {"double-visit/visits@V8/P2", "P2 has 2 records of visits at visit V8 (5 and 6); all are held aside until one is kept. They differ in y.", NULL},
        {"double-visit/extra/P3", "P3 has 2 records of extra (3 and 4); all are held aside until one is kept. They differ in smokes.", NULL},
        {"unplanned-visit/visits.VISIT/v8", "visits reads the visit \"v8\" once, which is not among the planned codes; those records are in no "
            "analysis, and counted.", "{\"kind\":\"read-as\",\"column\":\"visits.VISIT\",\"from\":\"v8\",\"to\":\"V8\"}"},
        {"unplanned-visit/visits.VISIT/V99", "visits reads the visit \"V99\" once, which is not among the planned codes; those records are in no "
            "analysis, and counted.", NULL},
    };
    struct trial_case c;
    struct discrepancies found;
    open_case(&c);
    checks_run(c.frame, c.received, &c.arena, &found);
    size_t about_files = 0;
    for (size_t i = 0; i < found.count; i++) {
        about_files += strstr("no-identifier unmatched-participant double-visit unplanned-visit", found.list[i].check) != NULL;
    }
    assert_int_equal(about_files, sizeof cases / sizeof *cases);
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        const struct discrepancy *here = find(&found, cases[i].id);
        expect_text(here->message, cases[i].message, cases[i].id);
        assert_int_equal(here->proposal != NULL, cases[i].proposal != NULL);
        if (cases[i].proposal) {
            expect_text(here->proposal, cases[i].proposal, cases[i].id);
        }
        assert_int_equal(here->state, DISCREPANCY_OPEN);
    }
    const struct discrepancy *twice = find(&found, "double-visit/visits@V8/P2");
    assert_string_equal(twice->file, "visits");
    assert_int_equal(twice->row_count, 2);
    assert_int_equal(twice->rows[0], 5);
    assert_int_equal(twice->rows[1], 6);
    case_close(&c);
}

static void test_checks_are_settled(void **state) {
    (void)state;
    struct trial_case c;
    struct discrepancies found;
    open_case(&c);
    size_t first = c.count;
    case_must(&c, "[{'kind': 'read-as', 'column': 'visits.PID', 'from': 'p4', 'to': 'P4', 'reason': 'r'},"
                  " {'kind': 'confirm', 'column': 'visits.PID', 'value': 'S1', 'reason': 'screened only'},"
                  " {'kind': 'read-as', 'column': 'visits.VISIT', 'from': 'v8', 'to': 'V8', 'reason': 'r'},"
                  " {'kind': 'keep-record', 'participant': 'P5', 'row': 6, 'reason': 'r'},"
                  " {'kind': 'keep-record', 'participant': 'P2', 'file': 'visits', 'row': 5, 'reason': 'r'},"
                  " {'kind': 'keep-record', 'participant': 'P3', 'file': 'extra', 'row': 4, 'reason': 'r'}]");
    static const struct {
        const char *id;
        size_t by; /* of the batch, from 1 */
    } cases[] = {{"unmatched-participant/visits.PID/p4", 1}, {"unmatched-participant/visits.PID/S1", 2}, {"unplanned-visit/visits.VISIT/v8", 3},
        {"repeated-participant/P5", 4}, {"double-visit/visits@V8/P2", 5}, {"double-visit/extra/P3", 6}};
    checks_run(c.frame, c.received, &c.arena, &found);
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        const struct discrepancy *here = find(&found, cases[i].id);
        assert_string_equal(discrepancy_state_name(here->state), "settled");
        assert_int_equal(here->settled_by, first + cases[i].by);
    }
    assert_int_equal(find(&found, "unmatched-participant/extra.who/Z")->state, DISCREPANCY_OPEN);
    expect_join(c.frame, VISITS, &(struct join){.matched = 11, .blank = 1, .unmatched = 1, .unplanned = 1});
    expect_join(c.frame, EXTRA, &(struct join){.matched = 4, .blank = 1, .unmatched = 1});
    expect_cell(&c, "P4", "visits.y@V0", CELL_OBSERVED, 40);
    expect_cell(&c, "P4", "visits.kg@V0", CELL_OBSERVED, 90);
    expect_cell(&c, "P4", "visits.y@V8", CELL_OBSERVED, 41);
    expect_cell(&c, "P2", "visits.y@V8", CELL_OBSERVED, 21);
    expect_cell(&c, "P5", "visits.y@V0", CELL_OBSERVED, 50);
    expect_text(case_level(&c, "P5", "people.sex"), "M", "the second record");
    expect_text(case_level(&c, "P3", "extra.smokes"), "yes", "the second record");
    case_close(&c);
}

/* ---- decisions on columns of several visits ---- */

static void test_a_column_at_every_visit(void **state) {
    (void)state;
    struct trial_case c;
    open_case(&c);
    case_must(&c, "[{'kind': 'missing-code', 'column': 'visits.y', 'value': '10', 'reason': 'r'},"
                  " {'kind': 'missing-code', 'column': 'visits.y@V8', 'value': '31', 'reason': 'r'},"
                  " {'kind': 'read-as', 'column': 'visits.y', 'from': '11', 'to': '20', 'reason': 'r'},"
                  " {'kind': 'read-as', 'column': 'visits.y@V0', 'from': '20', 'to': '25', 'reason': 'r'}]");
    expect_cell(&c, "P1", "visits.y@V0", CELL_MISSING_CODE, NAN);
    expect_cell(&c, "P3", "visits.y@V8", CELL_MISSING_CODE, NAN);
    expect_cell(&c, "P1", "visits.y@V8", CELL_OBSERVED, 20); /* the last is about the baseline only */
    expect_cell(&c, "P2", "visits.y@V0", CELL_OBSERVED, 25);
    case_must(&c, "[{'kind': 'number-format', 'column': 'visits.y', 'decimal': ',', 'reason': 'r'},"
                  " {'kind': 'correct', 'column': 'visits.y@V26', 'participant': 'P3', 'from': 'x', 'to': '2,5', 'reason': 'r'}]");
    expect_cell(&c, "P3", "visits.y@V26", CELL_OBSERVED, 2.5);
    case_close(&c);
}

static void test_one_value(void **state) {
    (void)state;
    struct trial_case c;
    open_case(&c);
    case_must(&c, "[{'kind': 'correct', 'column': 'visits.y@V8', 'participant': 'P1', 'from': '11', 'to': '12', 'reason': 'r'},"
                  " {'kind': 'correct', 'column': 'visits.y', 'participant': 'P1', 'row': 1, 'from': '10', 'to': '13', 'reason': 'r'},"
                  " {'kind': 'correct', 'column': 'visits.y@V8', 'participant': 'P2', 'row': 6, 'from': '22', 'to': '23', 'reason': 'r'},"
                  " {'kind': 'set-missing', 'column': 'extra.died', 'participant': 'P1', 'from': 'Y', 'reason': 'r'},"
                  " {'kind': 'confirm', 'column': 'visits.y@V8', 'participant': 'P3', 'value': '31', 'reason': 'r'},"
                  " {'kind': 'correct', 'column': 'visits.VISIT', 'participant': 'P1', 'row': 10, 'from': 'V99', 'to': 'V26', 'reason': 'r'}]");
    expect_cell(&c, "P1", "visits.y@V8", CELL_OBSERVED, 12);
    expect_cell(&c, "P1", "visits.y@V0", CELL_OBSERVED, 13);
    expect_cell(&c, "P2", "visits.y@V8", CELL_HELD_ASIDE, NAN);
    assert_int_equal(case_state(&c, "P1", "extra.died"), CELL_SET_MISSING);
    expect_cell(&c, "P1", "visits.y@V26", CELL_HELD_ASIDE, NAN); /* two records of that visit now */
    assert_int_equal(c.frame->joins[VISITS].doubled, 2);
    case_must(&c, "[{'kind': 'keep-record', 'participant': 'P2', 'file': 'visits', 'row': 6, 'reason': 'r'},"
                  " {'kind': 'correct', 'column': 'visits.PID', 'participant': 'S1', 'from': 'S1', 'to': 'P3', 'reason': 'r'}]");
    expect_cell(&c, "P2", "visits.y@V8", CELL_OBSERVED, 23);
    expect_cell(&c, "P3", "visits.y@V0", CELL_OBSERVED, 1);
    case_close(&c);
}

#define RECORDED "; nothing was recorded"

static void test_refused(void **state) {
    (void)state;
    static const struct {
        const char *batch, *sentence;
    } cases[] = {
        {"'kind': 'correct', 'column': 'visits.y', 'participant': 'P1', 'from': '10', 'to': '1'", "decision 1 of the batch (correct) names visits.y, of "
            "which a participant has one value per visit; add @ and the visit's code, or say which record with \"row\"" RECORDED},
        {"'kind': 'correct', 'column': 'visits.VISIT', 'participant': 'P1', 'from': 'V99', 'to': 'V26'", "decision 1 of the batch (correct) is about one "
            "record's visit code; say which record with \"row\"" RECORDED},
        {"'kind': 'correct', 'column': 'visits.PID', 'participant': 'P1', 'from': 'P1', 'to': 'P2'", "decision 1 of the batch (correct) is about an "
            "identifier that several records bear; say which one with \"row\"" RECORDED},
        {"'kind': 'correct', 'column': 'visits.y@V8', 'participant': 'P2', 'from': '21', 'to': '1'", "decision 1 of the batch (correct) is about a "
            "participant with several records; say which one with \"row\", or keep one first" RECORDED},
        {"'kind': 'correct', 'column': 'visits.y@V26', 'participant': 'P2', 'from': '', 'to': '1'", "decision 1 of the batch (correct) is about a visit "
            "of which the participant has no record" RECORDED},
        {"'kind': 'correct', 'column': 'visits.y@V8', 'participant': 'P1', 'row': 1, 'from': '10', 'to': '1'", "decision 1 of the batch (correct) names a "
            "row that is of another visit than the column says" RECORDED},
        {"'kind': 'correct', 'column': 'visits.y@V8', 'participant': 'P1', 'row': 5, 'from': '21', 'to': '1'", "decision 1 of the batch (correct) names a "
            "row that is not one of the participant's records" RECORDED},
        {"'kind': 'correct', 'column': 'visits.y@V8', 'participant': 'P1', 'row': 99, 'from': '21', 'to': '1'", "decision 1 of the batch (correct) names "
            "a row that is not one of the participant's records" RECORDED},
        {"'kind': 'correct', 'column': 'visits.y@V8', 'participant': 'P1', 'from': '10', 'to': '1'", "decision 1 of the batch (correct) says visits.y@V8 of "
            "P1 reads \"10\", but it now reads \"11\"" RECORDED},
        {"'kind': 'correct', 'column': 'visits.y@V9', 'participant': 'P1', 'from': '10', 'to': '1'", "decision 1 of the batch (correct) names the column "
            "\"visits.y@V9\", which the plan gives no meaning" RECORDED},
        {"'kind': 'correct', 'column': 'y', 'participant': 'P1', 'from': '10', 'to': '1'", "decision 1 of the batch (correct) names the column \"y\", which "
            "the plan gives no meaning" RECORDED},
        {"'kind': 'read-as', 'column': 'visits.y@V8', 'from': '10', 'to': '1'", "decision 1 of the batch (read-as) reads a code as another, but no value of "
            "the column now reads so" RECORDED},
        {"'kind': 'confirm', 'column': 'visits.y@V26', 'value': '31'", "decision 1 of the batch (confirm) confirms a value that no cell of the column now "
            "has" RECORDED},
        {"'kind': 'missing-code', 'column': 'extra.who', 'value': 'Z'", "decision 1 of the batch (missing-code) is about the identifier, which cannot be "
            "missing; correct it, or set it missing to hold the record aside" RECORDED},
        {"'kind': 'number-format', 'column': 'extra.smokes', 'decimal': ','", "decision 1 of the batch (number-format) is about the column "
            "\"extra.smokes\", which holds no numbers" RECORDED},
        {"'kind': 'keep-record', 'participant': 'P2', 'file': 'labs', 'row': 5", "decision 1 of the batch (keep-record) names a file that is not in the "
            "plan" RECORDED},
        {"'kind': 'keep-record', 'participant': 'P2', 'file': 'visits', 'row': 7", "decision 1 of the batch (keep-record) names a row that is not one of "
            "the participant's records at a planned visit of that file" RECORDED},
        {"'kind': 'keep-record', 'participant': 'P1', 'file': 'visits', 'row': 10", "decision 1 of the batch (keep-record) names a row that is not one of "
            "the participant's records at a planned visit of that file" RECORDED},
        {"'kind': 'keep-record', 'participant': 'P2', 'file': 'visits', 'row': 99", "decision 1 of the batch (keep-record) names a row that is not one of "
            "the participant's records at a planned visit of that file" RECORDED},
        {"'kind': 'keep-record', 'participant': 'P2', 'row': 5", "decision 1 of the batch (keep-record) names a row that is not one of the participant's "
            "records" RECORDED},
    };
    struct trial_case c;
    open_case(&c);
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        char batch[512];
        snprintf(batch, sizeof batch, "[{%s, 'reason': 'r'}]", cases[i].batch);
        case_refused(&c, batch, cases[i].sentence);
    }
    case_close(&c);
}

/* ---- other shapes ---- */

static const char long_plan[] =
    "{'title': 'T', 'participant': 'id', 'files': [{'id': 'all', 'layout': 'visit', 'participant': 'id', 'visit': 'day', 'codes': ['0', '90']}],"
    " 'arm': {'column': 'grp', 'visit': '0', 'levels': [{'code': 'L', 'reference': true}, {'code': 'W'}]},"
    " 'outcomes': [{'id': 'y', 'role': 'primary', 'better': 'lower', 'visits': [{'label': 'Baseline', 'visit': '0', 'column': 'y'},"
    " {'label': 'End', 'file': 'all', 'visit': '90', 'column': 'y'}]}], 'covariates': [{'id': 'sex', 'column': 'all.sex@0', 'kind': 'category'}],"
    " 'blinding': '%s'}";
static const char long_csv[] = "id,day,grp,sex,y\n"
                               "B,0,W,F,1\n"
                               "A,0,L,M,2\n"
                               "A,90,L,M,3\n"
                               "C,90,W,F,4\n" /* 4 */
                               "B,30,W,F,5\n"
                               ",0,W,F,6\n"
                               "A,0,L,M,7\n"; /* 7: again */

static void open_long(struct trial_case *c, const char *blinding) {
    char text[1024];
    snprintf(text, sizeof text, long_plan, blinding);
    case_open(c, long_csv, text);
}

static void test_first_file_with_one_row_per_visit(void **state) {
    (void)state;
    struct trial_case c;
    open_long(&c, "unblinded");
    assert_int_equal(c.frame->participant_count, 3);
    assert_int_equal(c.frame->roster, 4);     /* three, and one record of nobody */
    assert_int_equal(c.frame->held_aside, 1);
    expect_join(c.frame, 0, &(struct join){.matched = 5, .blank = 1, .unplanned = 1, .doubled = 1});
    expect_cell(&c, "A", "all.y@0", CELL_HELD_ASIDE, NAN);
    expect_cell(&c, "A", "all.y@90", CELL_OBSERVED, 3);
    expect_cell(&c, "B", "all.y@0", CELL_OBSERVED, 1);
    expect_cell(&c, "B", "all.y@90", CELL_BLANK, NAN);
    expect_cell(&c, "C", "all.y@0", CELL_BLANK, NAN);
    expect_text(case_level(&c, "B", "all.grp@0"), "W", "arm");
    expect_text(case_level(&c, "C", "all.grp@0"), "", "no baseline record, no arm");
    size_t records[4];
    assert_int_equal(frame_records(c.frame, case_who(&c, "A"), records, 4), 3); /* of all visits */
    assert_int_equal(records[0], 1);
    assert_int_equal(records[1], 2);
    assert_int_equal(records[2], 6);
    struct discrepancies found;
    checks_run(c.frame, c.received, &c.arena, &found);
    expect_text(find(&found, "double-visit/all@0/A")->message,
        "A has 2 records of all at visit 0 (2 and 7); all are held aside until one is kept. They differ in y.", "double");
    case_must(&c, "[{'kind': 'keep-record', 'participant': 'A', 'row': 7, 'reason': 'r'}]"); /* the first file may be left out */
    expect_cell(&c, "A", "all.y@0", CELL_OBSERVED, 7);
    expect_text(case_level(&c, "A", "all.grp@0"), "L", "arm");
    case_must(&c, "[{'kind': 'keep-record', 'participant': 'A', 'file': 'all', 'row': 2, 'reason': 'r'},"
                  " {'kind': 'correct', 'column': 'all.day', 'participant': 'B', 'row': 5, 'from': '30', 'to': '90', 'reason': 'r'},"
                  " {'kind': 'correct', 'column': 'all.id', 'participant': '', 'row': 6, 'from': '', 'to': 'C', 'reason': 'r'}]");
    expect_cell(&c, "A", "all.y@0", CELL_OBSERVED, 2);
    expect_cell(&c, "B", "all.y@90", CELL_OBSERVED, 5);
    expect_cell(&c, "C", "all.y@0", CELL_OBSERVED, 6);
    assert_int_equal(c.frame->roster, 3);
    case_close(&c);
}

/* While blinded nothing is told about one participant's arm, by whatever name the column goes. */
static void test_arm_in_any_file_is_hidden(void **state) {
    (void)state;
    static const char *const names[] = {"all.grp", "all.grp@0"};
    struct trial_case c;
    open_long(&c, "coded");
    for (size_t i = 0; i < 2; i++) {
        char batch[256], sentence[256];
        snprintf(batch, sizeof batch, "[{'kind': 'correct', 'column': '%s', 'participant': 'B', 'row': 1, 'from': 'L', 'to': 'x', 'reason': 'r'}]", names[i]);
        snprintf(sentence, sizeof sentence, "decision 1 of the batch (correct) is about one participant's cell of %s, which is not shown while the "
            "study is coded; unblind it first; nothing was recorded", names[i]);
        case_refused(&c, batch, sentence);
        assert_true(arms_hide_column(c.frame, names[i]));
    }
    assert_false(arms_hide_column(c.frame, "all.y"));
    struct discrepancies found;
    checks_run(c.frame, c.received, &c.arena, &found);
    for (size_t i = 0; i < found.count; i++) {
        assert_null(strstr(found.list[i].message, "grp"));
    }
    case_close(&c);
    open_long(&c, "unblinded");
    assert_false(arms_hide_column(c.frame, "all.grp"));
    case_close(&c);
}

/* The same values have the same fingerprint in one file, in two, and with one row per visit. */
static void test_same_values_same_fingerprint(void **state) {
    (void)state;
    static const char *const wide[] = {"id,sex,y0,y1\nA,F,1,2\nB,M,3,\n"};
    static const char *const two[] = {"id,sex\nB,M\nA,F\n", "w,y0,y1\nB,3,\nA,1,2\n"};
    static const char *const tall[] = {"id,sex\nA,F\nB,M\n", "y,v,id\n2,1,A\n3,0,B\n1,0,A\n"};
    static const struct {
        const char *const *csv;
        size_t count;
        const char *files, *baseline, *end;
    } cases[] = {{wide, 1, "", "'column': 'y0'", "'column': 'y1'"},
        {two, 2, "'files': [{'id': 'a', 'participant': 'id'}, {'id': 'b', 'participant': 'w'}],", "'file': 'b', 'column': 'y0'", "'column': 'b.y1'"},
        {tall, 2, "'files': [{'id': 'a', 'participant': 'id'}, {'id': 'b', 'layout': 'visit', 'participant': 'id', 'visit': 'v', 'codes': ['0', '1']}],",
            "'file': 'b', 'visit': '0', 'column': 'y'", "'column': 'b.y@1'"}};
    char first[HASH_SIZE] = "";
    for (size_t i = 0; i < 3; i++) {
        struct trial_case c;
        char text[1024];
        snprintf(text, sizeof text, "{'title': 'T', %s 'participant': 'id', 'outcomes': [{'id': 'y', 'role': 'primary', 'better': 'lower', 'visits': "
            "[{'label': 'B', %s}, {'label': 'E', %s}]}], 'covariates': [{'id': 'sex', 'column': 'sex', 'kind': 'category'}]}", cases[i].files,
            cases[i].baseline, cases[i].end);
        case_open_files(&c, cases[i].csv, cases[i].count, text);
        if (i == 0) {
            memcpy(first, c.frame->state_sha256, sizeof first);
        }
        assert_string_equal(c.frame->state_sha256, first);
        case_close(&c);
    }
}

/* ---- what versions share, and that a replay is one ---- */

static void test_columns_are_shared(void **state) {
    (void)state;
    static const struct {
        const char *decision, *column;
        bool shared;
    } cases[] = {
        {"'kind': 'missing-code', 'column': 'visits.y@V0', 'value': '10'", "visits.y@V8", true},
        {"'kind': 'missing-code', 'column': 'visits.y@V0', 'value': '11'", "visits.y@V0", false},
        {"'kind': 'missing-code', 'column': 'visits.y', 'value': '12'", "visits.y@V26", false},
        {"'kind': 'missing-code', 'column': 'visits.y', 'value': '13'", "visits.kg@V0", true},
        {"'kind': 'scale', 'outcome': 'y', 'scale': 'log10'", "visits.y@V0", true},
        {"'kind': 'keep-record', 'participant': 'P2', 'file': 'visits', 'row': 5", "visits.y@V8", false},
        {"'kind': 'read-as', 'column': 'visits.PID', 'from': 'p4', 'to': 'P4'", "visits.y@V0", false},
        {"'kind': 'read-as', 'column': 'visits.VISIT', 'from': 'v8', 'to': 'V8'", "visits.y@V0", false},
    };
    struct trial_case c;
    open_case(&c);
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        const struct column *before = case_column(&c, cases[i].column);
        char batch[256];
        snprintf(batch, sizeof batch, "[{%s, 'reason': 'r'}]", cases[i].decision);
        case_must(&c, batch);
        if ((case_column(&c, cases[i].column) == before) != cases[i].shared) {
            fail_msg("%s: %s", cases[i].decision, cases[i].shared ? "not shared" : "shared");
        }
    }
    case_close(&c);
}

static size_t below(uint64_t *state, size_t count) { /* splitmix64: Steele, Lea & Flood 2014, OOPSLA */
    uint64_t z = (*state += UINT64_C(0x9e3779b97f4a7c15));
    z = (z ^ (z >> 30)) * UINT64_C(0xbf58476d1ce4e5b9);
    z = (z ^ (z >> 27)) * UINT64_C(0x94d049bb133111eb);
    return (size_t)((z ^ (z >> 31)) % count);
}

static const char *random_decision(struct trial_case *c, uint64_t *state) {
    static const struct {
        const char *name;
        size_t file;
    } columns[] = {{"visits.y", VISITS}, {"visits.y@V0", VISITS}, {"visits.y@V8", VISITS}, {"visits.y@V26", VISITS}, {"visits.PID", VISITS},
        {"visits.VISIT", VISITS}, {"visits.kg@V0", VISITS}, {"extra.smokes", EXTRA}, {"extra.who", EXTRA}, {"extra.died", EXTRA},
        {"people.sex", PEOPLE}, {"people.pid", PEOPLE}};
    static const char *const texts[] = {"V0", "V8", "V26", "P1", "P2", "P3", "P4", "10", "Y", "2,5", "999", ""};
    static const char *const ids[] = {"people", "visits", "extra"};
    size_t which = below(state, 12), file = columns[which].file, record = below(state, c->cells[file].records);
    const char *column = columns[which].name, *to = texts[below(state, 12)];
    const struct column *some = frame_column(c->frame, strcmp(column, "visits.y") == 0 ? "visits.y@V0" : column);
    const char *text = column_text(c->frame, some, record), *from = text ? arena_format(&c->arena, "'%s'", text) : "null";
    const char *who = column_text(c->frame, c->frame->identifiers[file], record);
    who = who ? who : "P1";
    const char *row = below(state, 3) ? arena_format(&c->arena, ", 'row': %zu", record + 1) : "";
    switch (below(state, 9)) {
    case 0:
    case 1:
        return arena_format(&c->arena, "[{'kind': 'read-as', 'column': '%s', 'from': %s, 'to': '%s', 'reason': 'r'}]", column, from, to);
    case 2:
        return arena_format(&c->arena, "[{'kind': 'missing-code', 'column': '%s', 'value': '%s', 'reason': 'r'}]", column, to);
    case 3:
        return arena_format(&c->arena, "[{'kind': 'set-missing', 'column': '%s', 'participant': '%s', 'from': %s%s, 'reason': 'r'}]", column, who, from,
            row);
    case 4:
        return arena_format(&c->arena, "[{'kind': 'keep-record', 'participant': '%s', 'file': '%s', 'row': %zu, 'reason': 'r'}]", who, ids[file],
            record + 1);
    case 5:
        return arena_format(&c->arena, "[{'kind': 'reverse', 'number': %zu, 'reason': 'r'}]", below(state, c->count + 1) + 1);
    default:
        return arena_format(&c->arena, "[{'kind': 'correct', 'column': '%s', 'participant': '%s', 'from': %s, 'to': '%s'%s, 'reason': 'r'}]", column, who,
            from, to, row);
    }
}

static void assert_same_frames(const struct frame *a, const struct frame *b) {
    assert_string_equal(a->state_sha256, b->state_sha256);
    assert_int_equal(a->participant_count, b->participant_count);
    assert_memory_equal(a->joins, b->joins, FILES * sizeof *a->joins);
    for (size_t s = 0; s < a->plan->slot_count; s++) {
        assert_memory_equal(a->place[s], b->place[s], a->participant_count * sizeof *a->place[s]);
    }
    for (size_t v = 0; v < a->plan->variable_count; v++) {
        assert_string_equal(a->columns[v]->hash, b->columns[v]->hash);
        assert_memory_equal(a->columns[v]->state, b->columns[v]->state, a->participant_count);
    }
}

static void test_replay_is_one(void **state) {
    (void)state;
    size_t taken = 0, refused = 0;
    for (uint64_t seed = 1; seed <= 80; seed++) {
        struct trial_case c;
        open_case(&c);
        uint64_t random = seed;
        for (size_t i = 0; i < 60; i++) {
            bool done = case_decide(&c, random_decision(&c, &random));
            taken += done;
            refused += !done;
            if (i % 10 == 9) {
                struct frame *scratch = case_build(&c, c.count, NULL, false), *half = case_build(&c, c.count / 2, NULL, false);
                struct frame *from_half = case_build(&c, c.count, half, false);
                assert_same_frames(c.frame, scratch);
                assert_same_frames(c.frame, from_half);
                struct discrepancies found; /* the checks stand any state of the data */
                checks_run(c.frame, c.received, &c.arena, &found);
                frame_release(scratch);
                frame_release(half);
                frame_release(from_half);
            }
            for (size_t f = VISITS; f < FILES; f++) {
                const struct join *join = &c.frame->joins[f];
                assert_int_equal(join->matched + join->blank + join->unmatched + join->unplanned, c.cells[f].records);
            }
        }
        case_close(&c);
    }
    assert_true(taken > 1200 && refused > 800);
}

/* ---- plans that cannot be ---- */

static const char rest[] = "'title': 'T', 'participant': 'p', 'outcomes': [{'id': 'y', 'role': 'primary', 'better': 'lower', 'visits': [{'label': 'E', %s}]}]";
#define ONE "'files': [{'id': 'a', 'participant': 'p'}]"
#define TWO "'files': [{'id': 'a', 'participant': 'p'}, {'id': 'b', 'layout': 'visit', 'participant': 'p', 'visit': 'v', 'codes': ['1', '2']}]"

static void test_broken_plans(void **state) {
    (void)state;
    static const struct {
        const char *files, *column, *sentence;
    } cases[] = {
        {TWO, "'file': 'c', 'column': 'y'", "plan.json: outcomes[0].visits[0].file \"c\" is not the id of a file of this plan"},
        {TWO, "'file': 'b', 'visit': '3', 'column': 'y'", "plan.json: outcomes[0].visits[0].visit \"3\" is not among the codes of the file \"b\""},
        {TWO, "'column': 'b.y@3'", "plan.json: outcomes[0].visits[0].visit \"3\" is not among the codes of the file \"b\""},
        {TWO, "'file': 'b', 'column': 'y'", "plan.json: outcomes[0].visits[0].visit is missing: \"b\" has one row per visit, so say the visit's code"},
        {TWO, "'column': 'b.y'", "plan.json: outcomes[0].visits[0].visit is missing: \"b\" has one row per visit, so say the visit's code"},
        {TWO, "'file': 'a', 'visit': '1', 'column': 'y'", "plan.json: outcomes[0].visits[0].visit is said of a file that has one row per participant"},
        {"'missing_codes': []", "'file': 'a', 'column': 'y'", "plan.json: outcomes[0].visits[0].file \"a\" is not the id of a file of this plan"},
        {"'missing_codes': []", "'visit': '1', 'column': 'y'",
            "plan.json: outcomes[0].visits[0].visit needs \"files\" in the plan, with a file that has one row per visit"},
        {"'files': []", "'column': 'y'", "plan.json: files is empty; name at least one file, or leave the key out"},
        {"'files': {}", "'column': 'y'", "plan.json: files must be a list in square brackets"},
        {"'files': ['a']", "'column': 'y'", "plan.json: files[0] must be an object in braces"},
        {"'files': [{'participant': 'p'}]", "'column': 'y'", "plan.json: files[0].id is missing; a plan needs it"},
        {"'files': [{'id': 'a'}]", "'column': 'y'", "plan.json: files[0].participant is missing; a plan needs it"},
        {"'files': [{'id': 'a', 'participant': 'q'}]", "'column': 'y'", "plan.json: participant must be the first file's column of identifiers"},
        {"'files': [{'id': 'a.b', 'participant': 'p'}]", "'column': 'y'", "plan.json: files[0].id must be one word without . @ , = or &"},
        {"'files': [{'id': 'a b', 'participant': 'p'}]", "'column': 'y'", "plan.json: files[0].id must be one word without . @ , = or &"},
        {"'files': [{'id': 'a', 'participant': 'p'}, {'id': 'a', 'participant': 'p'}]", "'column': 'y'",
            "plan.json: files[1].id is that of a file before it; each file needs its own"},
        {"'files': [{'id': 'a', 'participant': 'p', 'codes': ['1']}]", "'column': 'y'", "plan.json: files[0].codes belongs to the layout \"visit\""},
        {"'files': [{'id': 'a', 'layout': 'visit', 'participant': 'p', 'visit': 'v'}]", "'column': 'y'",
            "plan.json: files[0].codes must list the planned visit codes, in order of time"},
        {"'files': [{'id': 'a', 'layout': 'visit', 'participant': 'p', 'codes': ['1']}]", "'visit': '1', 'column': 'y'",
            "plan.json: files[0].visit is missing; a plan needs it, unless \"dates.by_window\" finds the visits of the file by date"},
        {"'files': [{'id': 'a', 'layout': 'visit', 'participant': 'p', 'visit': 'v', 'codes': ['1', '1']}]", "'column': 'y'",
            "plan.json: files[0].codes holds \"1\" twice; keep one"},
        {"'files': [{'id': 'a', 'layout': 'visit', 'participant': 'p', 'visit': 'v', 'codes': ['1', ' ']}]", "'column': 'y'",
            "plan.json: files[0].codes must hold texts that are not blank and without @"},
        {"'files': [{'id': 'a', 'layout': 'visit', 'participant': 'p', 'visit': 'v', 'codes': ['x@y']}]", "'column': 'y'",
            "plan.json: files[0].codes must hold texts that are not blank and without @"},
        {"'files': [{'id': 'a', 'layout': 'wide', 'participant': 'p'}]", "'column': 'y'",
            "plan.json: files[0].layout must be \"participant\" or \"visit\""},
        {"'files': [{'id': 'a', 'participant': 'p', 'key': 'x'}]", "'column': 'y'", "plan.json: the key \"key\" in files[0] is not one a plan has here; "
            "known are: id name sheet layout participant visit codes"},
        {ONE ", 'covariates': [{'id': 'c', 'column': 'y@2', 'kind': 'number'}]", "'column': 'y'", "plan.json: the columns \"a.y\" and \"a.y@2\" cannot be "
            "told apart in decisions, where @ stands before a visit; rename one in the export"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        struct arena arena;
        arena_init(&arena);
        struct fault fault;
        fault_init(&fault);
        struct plan read;
        char text[1024];
        snprintf(text, sizeof text, rest, cases[i].column);
        const char *json = quoted(&arena, arena_format(&arena, "{%s, %s}", text, cases[i].files));
        if (plan_read(&read, json, strlen(json), "plan.json", &fault)) {
            fail_msg("%s was taken", json);
        }
        expect_text(fault.message, cases[i].sentence, json);
        arena_release(&arena);
    }
}

static void test_names_of_places(void **state) {
    (void)state;
    static const struct {
        const char *column, *name;
        size_t file, slot;
    } cases[] = {{"'column': 'y'", "a.y", 0, 0}, {"'file': 'a', 'column': 'y.z'", "a.y.z", 0, 0}, {"'column': 'z.y'", "a.z.y", 0, 0},
        {"'column': 'a.y'", "a.y", 0, 0}, {"'file': 'b', 'visit': '2', 'column': 'y'", "b.y@2", 1, 2}, {"'column': 'b.y@1'", "b.y@1", 1, 1},
        {"'column': 'b.y@z@1'", "b.y@z@1", 1, 1}};
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        struct arena arena;
        arena_init(&arena);
        struct fault fault;
        fault_init(&fault);
        struct plan read;
        char text[512];
        snprintf(text, sizeof text, rest, cases[i].column);
        const char *json = quoted(&arena, arena_format(&arena, "{%s, %s}", text, TWO));
        assert_true(plan_read(&read, json, strlen(json), "plan.json", &fault));
        assert_string_equal(read.variables[0].column, cases[i].name);
        assert_int_equal(read.variables[0].place.file, cases[i].file);
        assert_int_equal(read.variables[0].place.slot, cases[i].slot);
        plan_release(&read);
        arena_release(&arena);
    }
    assert_true(plan_covers("b.y", "b.y@1"));
    assert_true(plan_covers("b.y@1", "b.y@1"));
    assert_false(plan_covers("b.y", "b.yy@1"));
    assert_false(plan_covers("b.y@1", "b.y"));
    assert_false(plan_covers("b.y@1", "b.y@10"));
}

/* ---- the files that come ---- */

static void test_files_are_matched(void **state) {
    (void)state;
    static const char a_csv[] = "p\nA\nB\n", b_csv[] = "p,v,y\nA,1,2\nA,2,3\nB,1,4\n";
    static const struct {
        const char *a, *b; /* names in the plan, "" for none */
        const char *names[3];
        size_t count, people; /* which of them has the participants */
        const char *sentence; /* NULL: taken */
    } cases[] = {
        {"", "", {"x/a.csv", "x/b.csv"}, 2, 0, NULL},
        {"a.csv", "b.csv", {"b.csv", "a.csv"}, 2, 1, NULL},
        {"", "b.csv", {"x/b.csv", "x/a.csv"}, 2, 1, NULL},
        {"a.csv", "", {"b.csv", "a.csv"}, 2, 1, NULL},
        {"", "", {"b.csv", "a.csv"}, 2, 1, "plan.json: the column \"v\" (the visit's code) is not in a.csv, line 1, which has: p; mend the plan or the header"},
        {"a.csv", "c.csv", {"a.csv", "b.csv"}, 2, 0, "plan.json: no file named \"c.csv\" came, which the plan's file \"b\" asks for; load it too, or mend "
            "the name"},
        {"a.csv", "a.csv", {"a.csv", "b.csv"}, 2, 0, "plan.json: no file named \"a.csv\" came, which the plan's file \"b\" asks for; load it too, or mend "
            "the name"},
        {"", "", {"a.csv"}, 1, 0, "plan.json: the plan's \"files\" lists 2, and 1 came; load all of them together"},
        {"", "", {"a.csv", "b.csv", "c.csv"}, 3, 0, "plan.json: the plan's \"files\" lists 2, and 3 came; load all of them together"},
    };
    char folder[] = "/tmp/evenhand-files-XXXXXX", path[64], command[64];
    assert_non_null(mkdtemp(folder));
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        struct arena arena;
        arena_init(&arena);
        struct fault fault;
        fault_init(&fault);
        struct study_file files[3];
        for (size_t f = 0; f < cases[i].count; f++) {
            const char *csv = f == cases[i].people ? a_csv : b_csv;
            files[f] = (struct study_file){cases[i].names[f], csv, strlen(csv)};
        }
        const char *a = *cases[i].a ? arena_format(&arena, ", 'name': '%s'", cases[i].a) : "";
        const char *b = *cases[i].b ? arena_format(&arena, ", 'name': '%s'", cases[i].b) : "";
        const char *json = quoted(&arena, arena_format(&arena, "{'title': 'T', 'participant': 'p', 'missing_codes': ['9'], 'files': [{'id': 'a', 'participant': 'p'%s}, "
            "{'id': 'b', 'layout': 'visit', 'participant': 'p', 'visit': 'v', 'codes': ['1', '2']%s}], 'outcomes': [{'id': 'y', 'role': 'primary', "
            "'better': 'lower', 'visits': [{'label': 'B', 'column': 'b.y@1'}, {'label': 'E', 'column': 'b.y@2'}]}]}", a, b));
        snprintf(path, sizeof path, "%s/%zu.study", folder, i);
        bool done = study_create_from(path, files, cases[i].count, "plan.json", json, strlen(json), "M. Tide", NULL, &fault);
        expect_text(done ? "" : fault.message, cases[i].sentence ? cases[i].sentence : "", json);
        struct study *study = done ? study_open(path, &fault) : NULL;
        assert_int_equal(done, study != NULL);
        if (study) {
            struct frame *frame = study_frame(study, &fault);
            assert_int_equal(frame->version, 1); /* the code for missing, once for both visits */
            assert_string_equal(frame->decisions[0].column, "b.y");
            near(frame_column(frame, "b.y@2")->number[0], 3, 0, 0, "A's end");
            frame_release(frame);
            study_close(study);
        }
        arena_release(&arena);
    }
    snprintf(command, sizeof command, "rm -rf '%s'", folder);
    assert_int_equal(system(command), 0);
}

/* Codes for missing of a list of its own are entered for the visits they are meant for. */
static void test_planned_codes_by_visit(void **state) {
    (void)state;
    static const char csv[] = "p,v,y\nA,1,9\nA,2,8\nB,1,8\nB,2,9\n";
    static const char json[] = "{'title': 'T', 'participant': 'p', 'missing_codes': ['9'], 'files': [{'id': 'f', 'layout': 'visit', 'participant': 'p', "
        "'visit': 'v', 'codes': ['1', '2']}], 'outcomes': [{'id': 'y', 'role': 'primary', 'better': 'lower', 'missing_codes': ['8'], 'visits': "
        "[{'label': 'E', 'column': 'f.y@2'}]}], 'covariates': [{'id': 'c', 'column': 'f.y@1', 'kind': 'number'}]}";
    char folder[] = "/tmp/evenhand-files-XXXXXX", path[64], command[64];
    assert_non_null(mkdtemp(folder));
    snprintf(path, sizeof path, "%s/t.study", folder);
    struct arena arena;
    arena_init(&arena);
    struct fault fault;
    fault_init(&fault);
    const char *plan_json = quoted(&arena, json);
    assert_true(study_create(path, "f.csv", csv, strlen(csv), "plan.json", plan_json, strlen(plan_json), "M. Tide", NULL, &fault));
    struct study *study = study_open(path, &fault);
    assert_non_null(study);
    struct frame *frame = study_frame(study, &fault);
    assert_int_equal(frame->version, 2);
    assert_string_equal(frame->decisions[0].column, "f.y@1");
    assert_string_equal(frame->decisions[1].column, "f.y@2");
    near(frame_column(frame, "f.y@1")->number[0], NAN, 0, 0, "9 at the first");
    near(frame_column(frame, "f.y@1")->number[1], 8, 0, 0, "8 at the first");
    near(frame_column(frame, "f.y@2")->number[0], NAN, 0, 0, "8 at the second");
    near(frame_column(frame, "f.y@2")->number[1], 9, 0, 0, "9 at the second");
    frame_release(frame);
    study_close(study);
    arena_release(&arena);
    snprintf(command, sizeof command, "rm -rf '%s'", folder);
    assert_int_equal(system(command), 0);
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_joins_are_counted), cmocka_unit_test(test_cells_come_from_their_visit),
        cmocka_unit_test(test_records_of_a_participant), cmocka_unit_test(test_checks_of_files), cmocka_unit_test(test_checks_are_settled),
        cmocka_unit_test(test_a_column_at_every_visit), cmocka_unit_test(test_one_value), cmocka_unit_test(test_refused),
        cmocka_unit_test(test_first_file_with_one_row_per_visit), cmocka_unit_test(test_arm_in_any_file_is_hidden),
        cmocka_unit_test(test_same_values_same_fingerprint), cmocka_unit_test(test_columns_are_shared), cmocka_unit_test(test_replay_is_one),
        cmocka_unit_test(test_broken_plans), cmocka_unit_test(test_names_of_places), cmocka_unit_test(test_files_are_matched),
        cmocka_unit_test(test_planned_codes_by_visit),
    };
    return cmocka_run_group_tests_name("trial/files", tests, NULL, NULL);
}
