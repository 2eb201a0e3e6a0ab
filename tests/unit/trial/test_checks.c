/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Discrepancies: each check finds what it should and nothing beside it, what it proposes, and how a discrepancy's state
 * follows the record. Texts in categories are folded by Unicode's rules (UAX 15, full case folding), through libunistring. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "base/text.h"
#include "demo/quayside.h"
#include "trial_case.h"

static const char plan[] =
    "{'title': 'T', 'participant': 'pid', 'arm': {'column': 'grp', 'levels': [{'code': 'Lx', 'reference': true}, {'code': 'Wx'}]},"
    " 'outcomes': [{'id': 'y', 'label': 'Why', 'unit': 'mmHg', 'role': 'primary', 'better': 'lower', 'scale': '%s', 'plausible': [0, 260],"
    "   'visits': [{'label': 'End', 'column': 'y'}]}],"
    " 'covariates': [{'id': 'sex', 'label': 'Sex', 'column': 'sex', 'kind': 'category',"
    "   'levels': [{'code': 'F', 'label': 'Female'}, {'code': 'M', 'label': 'Male'}, {'code': 'A+'}, {'code': 'Non-smoker'}]},"
    "  {'id': 'city', 'label': 'City', 'column': 'city', 'kind': 'category'},"
    "  {'id': 'age', 'label': 'Age', 'column': 'age', 'kind': 'number', 'eligible': [40, 75], 'plausible': [18, 110]},"
    "  {'id': 'free', 'label': 'Free', 'column': 'free', 'kind': 'number'}],"
    " 'events': [{'id': 'died', 'label': 'Died', 'column': 'died', 'yes': ['Y'], 'no': ['N']}], 'blinding': '%s'}";

struct checked {
    struct trial_case c;
    struct arena arena;
    struct discrepancies found;
};

static void run_checks(struct checked *checked) {
    checks_run(checked->c.frame, checked->c.received, &checked->arena, &checked->found);
}

/* Ten quiet records and those of the test; each line: pid,grp,sex,city,age,free,y,died. */
static void open_checked(struct checked *checked, const char *records, const char *scale, const char *blinding) {
    char filled[2048];
    struct text csv;
    text_init(&csv);
    text_literal(&csv, "pid,grp,sex,city,age,free,y,died\n");
    for (int i = 0; i < 10; i++) {
        text_format(&csv, "Q%d,%s,%s,%s,%d,%d,%d,N\n", i, i % 2 ? "Lx" : "Wx", i % 3 ? "F" : "M", i % 4 ? "Ely" : "Ayr", 50 + i, 20 + i, 120 + i);
    }
    text_string(&csv, records);
    snprintf(filled, sizeof filled, plan, scale, blinding);
    arena_init(&checked->arena);
    char *kept = arena_text(&checked->arena, csv.data);
    text_release(&csv);
    case_open(&checked->c, kept, filled);
    run_checks(checked);
}

static void close_checked(struct checked *checked) {
    arena_release(&checked->arena);
    case_close(&checked->c);
}

static const struct discrepancy *find(const struct checked *checked, const char *id) {
    for (size_t i = 0; i < checked->found.count; i++) {
        if (strcmp(checked->found.list[i].id, id) == 0) {
            return &checked->found.list[i];
        }
    }
    return NULL;
}

/* ---- what one record more makes the checks find ---- */

static const struct {
    const char *records, *ids; /* all discrepancies, space-separated (spaces in ids as _) */
    const char *message, *proposal; /* of the first; NULL: not looked at, "" none */
} cases[] = {
    {"", "", NULL, NULL},
    {"P1,Lx,F,Ely,40,21,0,Y\n", "", NULL, NULL}, /* bounds are inclusive */
    {"P1,Lx,F,Ely,75,21,260,Y\n", "", NULL, NULL},
    {"P1,Lx,,,,,,\n", "", NULL, NULL}, /* blanks are missing values, not discrepancies */
    {"P1,Lx,F,Ely,50,21,120,N\nP1,Lx,F,Ely,51,21,120,N\n", "repeated-participant/P1",
        "P1 stands on 2 records (11 and 12); all are held aside until one is kept. They differ in age.", ""},
    {"P1,Lx,F,Ely,50,21,120,N\nP1,Lx,F,Ely,50,21,120,N\nP1,Lx,F,Ely,50,21,120,N\n", "repeated-participant/P1",
        "P1 stands on 3 records (11, 12 and 13); all are held aside until one is kept. They are alike in every column shown.", ""},
    {",Lx,F,Ely,50,21,120,N\n , Lx,F,Ely,50,21,120,N\n", "no-identifier/pid/blank",
        "2 records have no identifier, the first is record 11; they are held aside and counted.", ""},
    {"P1,,F,Ely,50,21,120,N\nP2,lx,F,Ely,50,21,120,N\n", "unlisted-arm/count",
        "2 participants have no arm that the plan lists; they are out of every exhibit by arm, and counted.", ""},
    {"P1,Lx,F,Ely,999,21,120,N\nP2,Lx,F,Ely,999.0,21,120,N\n",
        "missing-code/age/999 out-of-plausible-range/age/P1 out-of-plausible-range/age/P2",
        "Age reads 999 twice, far from every other value: a code for missing?", "{'kind':'missing-code','column':'age','value':'999'}"},
    {"P1,Lx,F,Ely,50,-99,120,N\n", "missing-code/free/-99", "Free reads -99 once, far from every other value: a code for missing?",
        "{'kind':'missing-code','column':'free','value':'-99'}"},
    {"P1,Lx,F,Ely,50,9,120,N\n", "", NULL, NULL},   /* 9 is near the others: a measurement */
    {"P1,Lx,F,Ely,50,500,120,N\n", "", NULL, NULL}, /* far, but no code that anybody uses */
    {"P1,Lx,F,Ely,50,99,99,N\n", "missing-code/free/99", NULL, NULL}, /* 99 mmHg is plausible */
    {"P1,Lx,f,Ely,50,21,120,N\n", "category-variant/sex/f", "Sex reads \"f\" once; it differs from \"F\" by case, space or form only.",
        "{'kind':'read-as','column':'sex','from':'f','to':'F'}"},
    {"P1,Lx,F ,Ely,50,21,120,N\n", "category-variant/sex/F_", NULL, "{'kind':'read-as','column':'sex','from':'F ','to':'F'}"},
    {"P1,Lx,FEMALE,Ely,50,21,120,N\n", "category-variant/sex/FEMALE", NULL, "{'kind':'read-as','column':'sex','from':'FEMALE','to':'F'}"},
    {"P1,Lx,\xEF\xBC\xA6,Ely,50,21,120,N\n", "category-variant/sex/\xEF\xBC\xA6", NULL, NULL}, /* full-width F */
    {"P1,Lx,F\xC2\xA0,Ely,50,21,120,N\n", "category-variant/sex/F\xC2\xA0", NULL, NULL},       /* no-break space */
    {"P1,Lx,\xE2\x80\x8B" "F,Ely,50,21,120,N\n", "category-variant/sex/\xE2\x80\x8B" "F", NULL, NULL}, /* zero width space */
    {"P1,Lx,F.,Ely,50,21,120,N\n", "category-variant/sex/F.", NULL, NULL},
    {"P1,Lx,non smoker,Ely,50,21,120,N\n", "category-variant/sex/non_smoker", NULL, NULL},
    {"P1,Lx,NON_SMOKER,Ely,50,21,120,N\n", "category-variant/sex/NON_SMOKER", NULL, NULL},
    {"P1,Lx,A-,Ely,50,21,120,N\n", "unlisted-category/sex/A-", "Sex reads \"A-\" once, which the plan does not list.", ""}, /* not a variant of A+ */
    {"P1,Lx,X,Ely,50,21,120,N\n", "unlisted-category/sex/X", NULL, ""},
    {"P1,Lx,-,Ely,50,21,120,N\n", "unlisted-category/sex/-", NULL, ""},
    {"P1,Lx,F,ely,50,21,120,N\n", "category-variant/city/ely", "City reads \"ely\" once; it differs from \"Ely\" by case, space or form only.",
        "{'kind':'read-as','column':'city','from':'ely','to':'Ely'}"},
    {"P1,Lx,F,York,50,21,120,N\n", "", NULL, NULL}, /* without a list every code is its own level */
    {"P1,Lx,F,Ely,50,21,120,y\n", "category-variant/died/y", NULL, "{'kind':'read-as','column':'died','from':'y','to':'Y'}"},
    {"P1,Lx,F,Ely,50,21,120,?\n", "unlisted-category/died/?", "Died reads \"?\" once, which the plan lists neither as yes nor as no.", ""},
    {"P1,Lx,F,Ely,\"50,5\",21,120,N\n", "unreadable-number/age/P1",
        "Age of P1 reads \"50,5\", no number as written; with a decimal comma it is 50.5.", "{'kind':'number-format','column':'age','decimal':','}"},
    {"P1,Lx,F,Ely,50,21,\"1,200\",N\n", "unreadable-number/y/P1", NULL, NULL},
    {"P1,Lx,F,Ely,\"1,050\",21,120,N\n", "unreadable-number/age/P1",
        "Age of P1 reads \"1,050\", no number as written; with a decimal comma it is 1.05, which is not plausible.", ""},
    {"P1,Lx,F,Ely,50,21,152 mmHg,N\n", "unreadable-number/y/P1", "Why of P1 reads \"152 mmHg\": a number with something after it, perhaps its unit.",
        "{'kind':'correct','column':'y','participant':'P1','from':'152 mmHg','to':'152'}"},
    {"P1,Lx,F,Ely,50,21,120/80,N\n", "unreadable-number/y/P1", "Why of P1 reads \"120/80\", which is no number.", ""},
    {"P1,Lx,F,Ely,50,21,lost,N\n", "unreadable-number/y/P1", "Why of P1 reads \"lost\", which is no number.", ""},
    {"P1,Lx,F,Ely,50,21,<0.3,N\nP2,Lx,F,Ely,50,21,<0.3,N\n", "below-limit/y/<0.3",
        "Why reads <0.3 twice: below the limit, so neither a number nor simply missing; left out of analyses and counted.",
        "{'kind':'confirm','column':'y','value':'<0.3'}"},
    {"P1,Lx,F,Ely,50,21,>500,N\n", "below-limit/y/>500", NULL, NULL},
    {"P1,Lx,F,Ely,460,21,120,N\n", "out-of-plausible-range/age/P1",
        "Age of P1 is 460, outside the plausible range 18 to 110. A tenth of it, 46, would fit: a decimal slip?", ""},
    {"P1,Lx,F,Ely,50,21,-1,N\n", "missing-code/y/-1 out-of-plausible-range/y/P1", NULL, NULL},
    {"P1,Lx,F,Ely,50,21,-7,N\n", "out-of-plausible-range/y/P1", "Why of P1 is -7 mmHg, outside the plausible range 0 to 260.", ""},
    {"P1,Lx,F,Ely,39.9,21,120,N\n", "out-of-eligibility/age/P1",
        "Age of P1 is 39.9, outside the eligible range 40 to 75. A breach of eligibility is classified, not deleted.", ""},
};

static void list_ids(const struct checked *checked, struct text *ids) {
    text_clear(ids);
    for (size_t i = 0; i < checked->found.count; i++) {
        text_format(ids, "%s%s", i ? " " : "", checked->found.list[i].id);
    }
}

static void test_what_is_found(void **state) {
    (void)state;
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        struct checked checked;
        open_checked(&checked, cases[i].records, "linear", "unblinded");
        struct text got;
        text_init(&got);
        list_ids(&checked, &got);
        char *wanted = arena_text(&checked.arena, cases[i].ids);
        for (char *p = wanted, *q = got.data; *p && *q; p++, q++) { /* a space within an identifier */
            *p = *p == '_' && *q == ' ' ? ' ' : *p;
        }
        expect_text(got.data, wanted, cases[i].records);
        if (cases[i].message) {
            expect_text(checked.found.list[0].message, cases[i].message, cases[i].records);
        }
        if (cases[i].proposal) {
            const char *proposal = checked.found.list[0].proposal;
            expect_text(proposal ? proposal : "", quoted(&checked.arena, cases[i].proposal), cases[i].records);
            assert_int_equal(proposal != NULL, checked.found.list[0].proposal_words != NULL);
        }
        assert_int_equal(checked.found.open, checked.found.count);
        text_release(&got);
        close_checked(&checked);
    }
}

/* A proposal, with a reason, is a decision that the frame takes and that settles its discrepancy. */
static void test_proposals_settle(void **state) {
    (void)state;
    size_t tried = 0;
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        struct checked checked;
        open_checked(&checked, cases[i].records, "linear", "unblinded");
        if (checked.found.count && checked.found.list[0].proposal) {
            const char *proposal = checked.found.list[0].proposal, *id = checked.found.list[0].id;
            case_must(&checked.c, arena_format(&checked.arena, "[{\"reason\": \"r\", %s]", proposal + 1));
            run_checks(&checked);
            const struct discrepancy *now = find(&checked, id);
            if (!now || now->state != DISCREPANCY_SETTLED || now->settled_by != 1) {
                fail_msg("%s after %s: %s", id, proposal, now ? discrepancy_state_name(now->state) : "gone");
            }
            case_must(&checked.c, "[{'kind': 'reverse', 'number': 1, 'reason': 'r'}]");
            run_checks(&checked);
            assert_int_equal(find(&checked, id)->state, DISCREPANCY_OPEN);
            tried++;
        }
        close_checked(&checked);
    }
    assert_true(tried > 12);
}

static void test_scale(void **state) {
    (void)state;
    struct checked checked;
    open_checked(&checked, "P1,Lx,F,Ely,50,0,0,N\n", "log10", "unblinded");
    assert_int_equal(checked.found.count, 1);
    expect_text(checked.found.list[0].id, "not-on-scale/y/P1", "log10");
    expect_text(checked.found.list[0].message, "Why of P1 is 0, which the logarithmic scale cannot take; it is left out there and counted.", "log10");
    case_must(&checked.c, "[{'kind': 'scale', 'outcome': 'y', 'scale': 'linear', 'reason': 'r'}]");
    run_checks(&checked);
    assert_int_equal(checked.found.open, 0);
    assert_int_equal(checked.found.settled, 1);
    close_checked(&checked);
}

/* ---- states ---- */

static void expect_state(struct checked *checked, const char *id, enum discrepancy_state state, uint32_t by) {
    run_checks(checked);
    const struct discrepancy *now = find(checked, id);
    assert_non_null(now);
    if (now->state != state || now->settled_by != by) {
        fail_msg("%s is %s by %u", id, discrepancy_state_name(now->state), now->settled_by);
    }
    assert_int_equal(checked->found.count, checked->found.open + checked->found.settled + checked->found.queried);
}

static void test_states(void **state) {
    (void)state;
    struct checked checked;
    open_checked(&checked, "P1,Lx,f,Ely,460,21,120,N\nP2,Lx,f,Ely,39,21,<1,N\n", "linear", "unblinded");
    static const char age[] = "out-of-plausible-range/age/P1";
    expect_state(&checked, age, DISCREPANCY_OPEN, 0);
    case_must(&checked.c, "[{'kind': 'query', 'column': 'age', 'participant': 'P1', 'question': 'q', 'reason': 'r'}]");
    expect_state(&checked, age, DISCREPANCY_QUERIED, 0);
    expect_state(&checked, "out-of-eligibility/age/P2", DISCREPANCY_OPEN, 0);
    case_must(&checked.c, "[{'kind': 'correct', 'column': 'age', 'participant': 'P1', 'from': '460', 'to': '46', 'reason': 'r'}]");
    expect_state(&checked, age, DISCREPANCY_SETTLED, 2);
    case_must(&checked.c, "[{'kind': 'correct', 'column': 'age', 'participant': 'P1', 'from': '46', 'to': '640', 'reason': 'r'}]");
    expect_state(&checked, age, DISCREPANCY_QUERIED, 0); /* wrong again, under the same name */
    case_must(&checked.c, "[{'kind': 'confirm', 'column': 'age', 'participant': 'P1', 'value': '640', 'reason': 'r'}]");
    expect_state(&checked, age, DISCREPANCY_SETTLED, 4);
    case_must(&checked.c, "[{'kind': 'reverse', 'number': 4, 'reason': 'r'}]");
    expect_state(&checked, age, DISCREPANCY_QUERIED, 0);
    case_must(&checked.c, "[{'kind': 'reverse', 'number': 5, 'reason': 'r'}]");
    expect_state(&checked, age, DISCREPANCY_SETTLED, 4);
    case_must(&checked.c, "[{'kind': 'set-missing', 'column': 'age', 'participant': 'P1', 'from': '640', 'reason': 'r'}]");
    expect_state(&checked, age, DISCREPANCY_SETTLED, 7);
    case_must(&checked.c, "[{'kind': 'confirm', 'column': 'y', 'value': '<1', 'reason': 'r'}]");
    expect_state(&checked, "below-limit/y/<1", DISCREPANCY_SETTLED, 8);
    case_must(&checked.c, "[{'kind': 'correct', 'column': 'sex', 'participant': 'P1', 'from': 'f', 'to': 'F', 'reason': 'r'}]");
    expect_state(&checked, "category-variant/sex/f", DISCREPANCY_OPEN, 0); /* one of two */
    case_must(&checked.c, "[{'kind': 'read-as', 'column': 'sex', 'from': 'f', 'to': 'F', 'reason': 'r'}]");
    expect_state(&checked, "category-variant/sex/f", DISCREPANCY_SETTLED, 10);
    /* A confirmation that names one discrepancy settles that one only, and only while the value is what it was. */
    case_must(&checked.c, "[{'kind': 'confirm', 'column': 'age', 'participant': 'P2', 'value': '39', 'discrepancy': 'out-of-eligibility/age/P2',"
                          " 'reason': 'r'}]");
    expect_state(&checked, "out-of-eligibility/age/P2", DISCREPANCY_SETTLED, 11);
    case_must(&checked.c, "[{'kind': 'correct', 'column': 'age', 'participant': 'P2', 'from': '39', 'to': '38', 'reason': 'r'}]");
    expect_state(&checked, "out-of-eligibility/age/P2", DISCREPANCY_OPEN, 0);
    close_checked(&checked);
}

static void test_repeated_settled(void **state) {
    (void)state;
    struct checked checked;
    open_checked(&checked, "P1,Lx,F,Ely,50,21,120,N\nP1,Lx,F,Ely,51,21,120,N\n", "linear", "unblinded");
    const struct discrepancy *now = find(&checked, "repeated-participant/P1");
    assert_int_equal(now->row_count, 2);
    assert_int_equal(now->rows[0], 11);
    assert_int_equal(now->rows[1], 12);
    case_must(&checked.c, "[{'kind': 'query', 'participant': 'P1', 'question': 'which?', 'reason': 'r'}]");
    expect_state(&checked, "repeated-participant/P1", DISCREPANCY_QUERIED, 0);
    case_must(&checked.c, "[{'kind': 'keep-record', 'participant': 'P1', 'row': 12, 'reason': 'r'}]");
    expect_state(&checked, "repeated-participant/P1", DISCREPANCY_SETTLED, 2);
    close_checked(&checked);
}

static void test_planned_codes(void **state) {
    (void)state;
    static const char small[] = "{'title': 'T', 'participant': 'p', 'missing_codes': ['999', 'NK'], 'outcomes': [{'id': 'y', 'label': 'Why',"
                                " 'role': 'primary', 'better': 'lower', 'visits': [{'label': 'E', 'column': 'y'}]}]}";
    struct checked checked;
    arena_init(&checked.arena);
    case_open(&checked.c, "p,y\nA,1\nB,999.0\nC,999\nD,2\n", small);
    run_checks(&checked);
    assert_int_equal(checked.found.count, 1); /* NK stands nowhere */
    expect_text(checked.found.list[0].id, "missing-code/y/999", "id");
    expect_text(checked.found.list[0].message, "Why reads 999 twice, a code for missing by the plan.", "message");
    assert_int_equal(checked.found.list[0].participant_count, 2);
    expect_state(&checked, "missing-code/y/999", DISCREPANCY_SETTLED, 1);
    close_checked(&checked);
}

/* ---- blinded ---- */

static void assert_nowhere(const char *text, const char *what) {
    if (text && (strstr(text, "Lx") || strstr(text, "Wx") || strstr(text, "Zz"))) {
        fail_msg("%s says \"%s\"", what, text);
    }
}

static void test_blinded(void **state) {
    (void)state;
    static const char *const blinding[] = {"pooled", "coded"};
    /* Two records of one participant differ in the arm; one arm is not listed; the city tells the arm. */
    static const char records[] = "P1,Lx,f,Ely,50,21,120,N\nP1,Wx,f,Ely,50,21,120,N\nP2,Zz,F,Ely,50,21,120,N\nP3,,F,Ely,50,21,120,N\n";
    for (size_t b = 0; b < 2; b++) {
        struct checked checked;
        open_checked(&checked, records, "linear", blinding[b]);
        for (size_t i = 0; i < checked.found.count; i++) {
            const struct discrepancy *what = &checked.found.list[i];
            assert_nowhere(what->id, what->check);
            assert_nowhere(what->value, what->id);
            assert_nowhere(what->message, what->id);
            assert_nowhere(what->proposal, what->id);
        }
        const struct discrepancy *arm = find(&checked, "unlisted-arm/count");
        assert_non_null(arm);
        assert_int_equal(arm->participant_count, 0);
        assert_null(arm->participant);
        assert_null(arm->value);
        assert_null(arm->column);
        assert_non_null(strstr(find(&checked, "repeated-participant/P1")->message, "They are alike in every column shown."));
        case_must(&checked.c, "[{'kind': 'unblind', 'to': 'unblinded', 'reason': 'r'}]");
        run_checks(&checked);
        arm = find(&checked, "unlisted-arm/count");
        assert_int_equal(arm->participant_count, 2);
        assert_string_equal(arm->column, "grp");
        assert_non_null(strstr(find(&checked, "repeated-participant/P1")->message, "They differ in grp."));
        close_checked(&checked);
    }
}

/* A category that gives the arm away has no discrepancies while blinded. */
static void test_given_away(void **state) {
    (void)state;
    struct text csv;
    text_init(&csv);
    text_literal(&csv, "pid,grp,sex,city,age,free,y,died\n");
    for (int i = 0; i < 24; i++) {
        text_format(&csv, "Q%02d,%s,%s,%s,50,20,120,N\n", i, i % 2 ? "Lx" : "Wx", i == 4 ? "f" : i % 3 ? "F" : "M", i == 7 ? "site l" : i % 2 ? "Site L" : "Site W");
    }
    char filled[2048];
    snprintf(filled, sizeof filled, plan, "linear", "coded");
    struct checked checked;
    arena_init(&checked.arena);
    case_open(&checked.c, csv.data, filled);
    run_checks(&checked);
    assert_non_null(find(&checked, "category-variant/sex/f"));
    assert_null(find(&checked, "category-variant/city/site l"));
    assert_false(case_decide(&checked.c, "[{'kind': 'set-missing', 'column': 'city', 'participant': 'Q01', 'from': 'Site W', 'reason': 'r'}]"));
    assert_int_equal(checked.c.fault.code, FAULT_REFUSED);
    case_must(&checked.c, "[{'kind': 'unblind', 'to': 'unblinded', 'reason': 'r'}]");
    run_checks(&checked);
    assert_non_null(find(&checked, "category-variant/city/site l"));
    close_checked(&checked);
    text_release(&csv);
}

/* ---- the whole list ---- */

static void test_order_and_names(void **state) {
    (void)state;
    size_t count = 0;
    for (; checks[count].name; count++) {
        assert_true(strlen(checks[count].title) > 3 && strlen(checks[count].says) > 10);
        for (size_t i = 0; i < count; i++) {
            assert_string_not_equal(checks[i].name, checks[count].name);
        }
    }
    assert_int_equal(count, 27);
    struct checked checked;
    open_checked(&checked, "P3,Lx,f,ely,460,21,<1,y\nP1,Lx,f,ely,460,21,lost,y\nP1,Lx,f,ely,460,21,lost,y\n,Lx,F,Ely,50,21,120,N\nP4,,X,Ely,39,21,300,N\n",
        "linear", "unblinded");
    struct text got;
    text_init(&got);
    list_ids(&checked, &got);
    expect_text(got.data, "repeated-participant/P1 no-identifier/pid/blank unlisted-arm/count category-variant/city/ely category-variant/died/y "
                          "category-variant/sex/f unlisted-category/sex/X below-limit/y/<1 out-of-plausible-range/age/P3 out-of-plausible-range/y/P4 "
                          "out-of-eligibility/age/P4", "order");
    text_release(&got);
    for (size_t i = 0; i < checked.found.count; i++) { /* no identifier twice */
        assert_ptr_equal(find(&checked, checked.found.list[i].id), &checked.found.list[i]);
    }
    close_checked(&checked);
}

/* Clean data are not doubted: over ten invented trials nothing must be settled but numbers out of eligibility. */
static void test_clean_is_silent(void **state) {
    (void)state;
    for (uint64_t seed = 1; seed <= 10; seed++) {
        struct quayside quayside;
        quayside_make(seed, &quayside);
        struct checked checked;
        arena_init(&checked.arena);
        case_open(&checked.c, quayside.clean_csv.data, quayside.plan_json.data);
        run_checks(&checked);
        for (size_t i = 0; i < checked.found.count; i++) {
            const struct discrepancy *what = &checked.found.list[i];
            if (what->severity == SEVERITY_MUST_SETTLE && strcmp(what->check, "out-of-eligibility") != 0) {
                fail_msg("seed %u: %s", (unsigned)seed, what->message);
            }
        }
        close_checked(&checked);
        quayside_release(&quayside);
    }
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_what_is_found), cmocka_unit_test(test_proposals_settle), cmocka_unit_test(test_scale),
        cmocka_unit_test(test_states), cmocka_unit_test(test_repeated_settled), cmocka_unit_test(test_planned_codes),
        cmocka_unit_test(test_blinded), cmocka_unit_test(test_given_away), cmocka_unit_test(test_order_and_names),
        cmocka_unit_test(test_clean_is_silent),
    };
    return cmocka_run_group_tests_name("trial/checks", tests, NULL, NULL);
}
