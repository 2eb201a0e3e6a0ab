/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Dates: texts by order, what the plan says of them, each check with a case where it speaks and one where it is silent,
 * one order for a site by one decision, visits found by date with ties, and that a decision taken back leaves no trace.
 * The calendar itself is held against R and glibc in tests/reference. Serial numbers: ECMA-376-1:2016, 18.17.4.1
 * (1900-01-01 is 1, 60 stands for 29 February 1900, 1900-03-01 is 61; from 1904, 1904-01-01 is 0). Years of two digits:
 * POSIX.1-2017, strptime, %y. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "near.h"
#include "trial_case.h"

/* ---- texts ---- */

static const struct {
    const char *text;
    enum date_order order;
    enum date_reading reading;
    const char *day; /* ISO, NULL where not read */
} texts[] = {
    {"2026-03-01", DATE_DMY, DATE_READ, "2026-03-01"}, /* ISO 8601 in every order */
    {"2026-03-01", DATE_MDY, DATE_READ, "2026-03-01"},
    {"2026-03-01", DATE_SERIAL_1900, DATE_READ, "2026-03-01"},
    {" 2026-03-01\t", DATE_DMY, DATE_READ, "2026-03-01"},
    {"2026-03-01T09:30:00Z", DATE_DMY, DATE_READ, "2026-03-01"},
    {"2026-03-01 00:00", DATE_DMY, DATE_READ, "2026-03-01"},
    {"2026-03-01T23:59:59.5+05:30", DATE_MDY, DATE_READ, "2026-03-01"},
    {"2026-02-29", DATE_DMY, DATE_IMPOSSIBLE, NULL},
    {"2024-02-29", DATE_DMY, DATE_READ, "2024-02-29"},
    {"2026-13-01", DATE_DMY, DATE_IMPOSSIBLE, NULL},
    {"0000-01-01", DATE_DMY, DATE_IMPOSSIBLE, NULL},
    {"03/04/2026", DATE_DMY, DATE_READ, "2026-04-03"},
    {"03/04/2026", DATE_MDY, DATE_READ, "2026-03-04"},
    {"3/4/2026", DATE_DMY, DATE_READ, "2026-04-03"},
    {"03.04.2026", DATE_DMY, DATE_READ, "2026-04-03"},
    {"03-04-2026", DATE_DMY, DATE_READ, "2026-04-03"},
    {"03 04 2026", DATE_DMY, DATE_READ, "2026-04-03"},
    {"03/04/2026 09:15", DATE_DMY, DATE_READ, "2026-04-03"},
    {"03/04-2026", DATE_DMY, DATE_UNREADABLE, NULL},
    {"31/02/2026", DATE_DMY, DATE_IMPOSSIBLE, NULL},
    {"29/02/1900", DATE_DMY, DATE_IMPOSSIBLE, NULL}, /* 1900 was no leap year */
    {"29/02/2000", DATE_DMY, DATE_READ, "2000-02-29"},
    {"03/14/2026", DATE_DMY, DATE_IMPOSSIBLE, NULL},
    {"03/14/2026", DATE_MDY, DATE_READ, "2026-03-14"},
    {"00/01/2026", DATE_DMY, DATE_IMPOSSIBLE, NULL},
    {"2026/03/04", DATE_YMD, DATE_READ, "2026-03-04"},
    {"2026.3.4", DATE_YMD, DATE_READ, "2026-03-04"},
    {"2026/03/04", DATE_DMY, DATE_UNREADABLE, NULL},
    {"03/04/2026", DATE_YMD, DATE_UNREADABLE, NULL},
    {"01-MAR-2026", DATE_DMONY, DATE_READ, "2026-03-01"},
    {"1 mar 2026", DATE_DMONY, DATE_READ, "2026-03-01"},
    {"01MAR2026", DATE_DMONY, DATE_READ, "2026-03-01"},
    {"1 September 2026", DATE_DMONY, DATE_READ, "2026-09-01"},
    {"30-Feb-2026", DATE_DMONY, DATE_IMPOSSIBLE, NULL},
    {"01-XYZ-2026", DATE_DMONY, DATE_UNREADABLE, NULL},
    {"01-MAR-2026", DATE_DMY, DATE_UNREADABLE, NULL},
    {"01/03/2026", DATE_DMONY, DATE_UNREADABLE, NULL},
    {"03/04/26", DATE_DMY, DATE_SHORT_YEAR, NULL},
    {"03/04/26", DATE_DMYY, DATE_READ, "2026-04-03"},
    {"03/04/68", DATE_DMYY, DATE_READ, "2068-04-03"},
    {"03/04/69", DATE_DMYY, DATE_READ, "1969-04-03"},
    {"03/04/2026", DATE_DMYY, DATE_READ, "2026-04-03"},
    {"31/02/26", DATE_DMY, DATE_UNREADABLE, NULL},
    {"26/3/4", DATE_YYMD, DATE_READ, "2026-03-04"},
    {"01MAR26", DATE_DMONYY, DATE_READ, "2026-03-01"},
    {"01-MAR-26", DATE_DMONY, DATE_SHORT_YEAR, NULL},
    {"03/04/026", DATE_DMY, DATE_UNREADABLE, NULL},
    {"36526", DATE_DMY, DATE_SERIAL, NULL},
    {"54789", DATE_DMY, DATE_SERIAL, NULL},
    {"46082.5", DATE_DMY, DATE_SERIAL, NULL},
    {"36525", DATE_DMY, DATE_UNREADABLE, NULL},
    {"54790", DATE_DMY, DATE_UNREADABLE, NULL},
    {"36526", DATE_SERIAL_1900, DATE_READ, "2000-01-01"},
    {"46082.75", DATE_SERIAL_1900, DATE_READ, "2026-03-01"},
    {"59", DATE_SERIAL_1900, DATE_READ, "1900-02-28"},
    {"60", DATE_SERIAL_1900, DATE_IMPOSSIBLE, NULL},
    {"61", DATE_SERIAL_1900, DATE_READ, "1900-03-01"},
    {"1", DATE_SERIAL_1900, DATE_READ, "1900-01-01"},
    {"0", DATE_SERIAL_1900, DATE_IMPOSSIBLE, NULL},
    {"0", DATE_SERIAL_1904, DATE_READ, "1904-01-01"},
    {"36526", DATE_SERIAL_1904, DATE_READ, "2004-01-02"},
    {"03/04/2026", DATE_SERIAL_1900, DATE_UNREADABLE, NULL},
    {"-46082", DATE_SERIAL_1900, DATE_UNREADABLE, NULL},
    {"", DATE_DMY, DATE_BLANK, NULL},
    {"  ", DATE_DMY, DATE_BLANK, NULL},
    {"not known", DATE_DMY, DATE_UNREADABLE, NULL},
    {"//", DATE_DMY, DATE_UNREADABLE, NULL},
    {"1/2", DATE_DMY, DATE_UNREADABLE, NULL},
    {"01/02/2026/", DATE_DMY, DATE_UNREADABLE, NULL},
    {"20260301", DATE_DMY, DATE_UNREADABLE, NULL},
    {"99999999999999999999", DATE_DMY, DATE_UNREADABLE, NULL},
};

static void test_texts(void **state) {
    (void)state;
    struct arena arena;
    arena_init(&arena);
    for (size_t i = 0; i < sizeof texts / sizeof *texts; i++) {
        double day;
        enum date_reading reading = date_read(texts[i].text, texts[i].order, &day);
        const char *got = date_words(&arena, day),
                   *about = arena_format(&arena, "%s as %s", texts[i].text, date_order_name(texts[i].order));
        if (reading != texts[i].reading) {
            fail_msg("%s: reading %d, wanted %d", about, reading, texts[i].reading);
        }
        expect_text(got ? got : "none", texts[i].day ? texts[i].day : "none", about);
    }
    arena_release(&arena);
}

static void test_exchanged(void **state) {
    (void)state;
    static const struct {
        const char *text;
        enum date_order order;
        const char *other;
    } cases[] = {
        {"03/04/2026", DATE_DMY, "2026-03-04"},
        {"03/04/2026", DATE_MDY, "2026-04-03"},
        {"03/04/26", DATE_DMYY, "2026-03-04"},
        {"04/04/2026", DATE_DMY, NULL},
        {"13/04/2026", DATE_DMY, NULL},
        {"2026-03-04", DATE_DMY, NULL},
        {"2026/03/04", DATE_YMD, NULL},
        {"03-APR-2026", DATE_DMONY, NULL},
        {"", DATE_DMY, NULL},
    };
    struct arena arena;
    arena_init(&arena);
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        double day;
        assert_int_equal(date_read_exchanged(cases[i].text, cases[i].order, &day), cases[i].other != NULL);
        expect_text(cases[i].other ? date_words(&arena, day) : "", cases[i].other ? cases[i].other : "", cases[i].text);
    }
    arena_release(&arena);
}

static void test_order_names(void **state) {
    (void)state;
    for (int i = 0; i < DATE_ORDER_COUNT; i++) {
        enum date_order order;
        assert_true(date_order_read(date_order_name((enum date_order)i), &order) && order == (enum date_order)i);
        assert_true(strlen(date_order_words((enum date_order)i)) > 10);
    }
    enum date_order order;
    assert_true(date_order_read("Y-M-D", &order) && order == DATE_YMD);
    assert_true(date_order_read("D.M.YY", &order) && order == DATE_DMYY);
    assert_true(date_order_read("D/MON/Y", &order) && order == DATE_DMONY);
    static const char *const others[] = {"", "D/Y/M", "d/m/y", "D/M", "D/M/Y ", "DMY", "serial"};
    for (size_t i = 0; i < sizeof others / sizeof *others; i++) {
        assert_false(date_order_read(others[i], &order));
    }
}

/* ---- a study of one file ---- */

static const char one_plan[] =
    "{'title': 'T', 'participant': 'pid', 'site': {'column': 'site'},"
    " 'outcomes': [{'id': 'y', 'label': 'Why', 'role': 'primary', 'better': 'lower', 'visits': [{'label': 'End', "
    "'column': 'y'}]}],"
    " 'dates': {'order': 'D/M/Y', 'sites': {'09': 'Y/M/D'}, 'earliest': '2020-01-01', 'randomised': {'column': 'rand'},"
    "  'visits': [{'label': 'Baseline', 'column': 'd0', 'target': 0, 'window': [-28, 7]},"
    "             {'label': '8 weeks', 'column': 'd8', 'target': 56, 'window': [-14, 14]}],"
    "  'withdrew': {'column': 'out'}, 'died': {'column': 'dead'}}}";
static const char one_header[] = "pid,site,y,rand,d0,d8,out,dead\n";

struct dated {
    struct trial_case c;
    struct arena arena;
    struct discrepancies found;
};

static void look(struct dated *dated) {
    dated->c.plan.dates->received = date_day(2026, 12, 1);
    checks_run(dated->c.frame, dated->c.received, &dated->arena, &dated->found);
}

static void open_dated(struct dated *dated, const char *records) {
    arena_init(&dated->arena);
    case_open(&dated->c, arena_format(&dated->arena, "%s%s", one_header, records), one_plan);
    look(dated);
}

static void close_dated(struct dated *dated) {
    arena_release(&dated->arena);
    case_close(&dated->c);
}

static const struct discrepancy *find(const struct dated *dated, const char *id) {
    for (size_t i = 0; i < dated->found.count; i++) {
        if (strcmp(dated->found.list[i].id, id) == 0) {
            return &dated->found.list[i];
        }
    }
    return NULL;
}

static void show(const struct dated *dated) {
    for (size_t i = 0; i < dated->found.count; i++) {
        print_message("  %s: %s %s\n", dated->found.list[i].id, dated->found.list[i].message,
            dated->found.list[i].proposal ? dated->found.list[i].proposal : "");
    }
}

static void expect_found(struct dated *dated, const char *id, const char *message, const char *proposal) {
    const struct discrepancy *found = find(dated, id);
    if (!found) {
        show(dated);
        fail_msg("%s was not found", id);
    }
    expect_text(found->message, message, id);
    const char *wanted = proposal ? quoted(&dated->arena, proposal) : "none";
    expect_text(found->proposal ? found->proposal : "none", wanted, id);
}

static const struct {
    const char *records;
    size_t count; /* of open discrepancies */
    const char *id, *message, *proposal;
} one[] = {
    /* in order and inside windows: nothing */
    {"P1,01,5,03/03/2026,01/03/2026,28/04/2026,,\n", 0, NULL, NULL, NULL},
    {"P1,01,5,2026-03-03,2026-03-01,2026-04-28,,\nP2,09,5,2026/03/03,2026/03/01,2026/04/28,,\n", 0, NULL, NULL, NULL},
    {"P1,01,5,03/03/2026,31/02/2026,28/04/2026,,\n", 1, "impossible-date/d0/P1",
        "Date of Baseline of P1 reads \"31/02/2026\", and there is no such day.", NULL},
    {"P1,01,5,03/03/2026,02/28/2026,28/04/2026,,\n", 1, "impossible-date/d0/P1",
        "Date of Baseline of P1 reads \"02/28/2026\", which is no day as D/M/Y; as M/D/Y it is 2026-02-28.",
        "{'kind':'correct','column':'d0','participant':'P1','from':'02/28/2026','to':'2026-02-28'}"},
    {"P1,01,5,03/03/2026,1 Mar 2026,28/04/2026,,\n", 1, "unreadable-date/d0/P1",
        "Date of Baseline of P1 reads \"1 Mar 2026\", which cannot be read as D/M/Y; as D-MON-Y it is 2026-03-01.",
        "{'kind':'correct','column':'d0','participant':'P1','from':'1 Mar 2026','to':'2026-03-01'}"},
    {"P1,01,5,03/03/2026,soon,28/04/2026,,\n", 1, "unreadable-date/d0/P1",
        "Date of Baseline of P1 reads \"soon\", which is no date in the order D/M/Y.", NULL},
    {"P1,01,5,03/03/2026,01/03/26,28/04/2026,,\n", 1, "two-digit-year/d0/P1",
        "Date of Baseline of P1 reads \"01/03/26\", with a year of two digits; as D/M/Y it would be 2026-03-01.",
        "{'kind':'correct','column':'d0','participant':'P1','from':'01/03/26','to':'2026-03-01'}"},
    {"P1,01,5,03/03/2026,46082,28/04/2026,,\n", 1, "serial-number-date/d0/P1",
        "Date of Baseline of P1 reads 46082, no date but the number that a spreadsheet counts days by: 2026-03-01 in "
        "the system from 1900, "
        "2030-03-02 in that from 1904.",
        "{'kind':'correct','column':'d0','participant':'P1','from':'46082','to':'2026-03-01'}"},
    {"P1,01,5,03/03/2026,01/03/2026,28/04/2027,,\n", 1, "date-in-the-future/d8/P1",
        "Date of 8 weeks of P1 is 2027-04-28, after the day the data were received (2026-12-01).", NULL},
    {"P1,01,5,03/03/2026,01/03/2026,01/12/2026,,\n", 1, "outside-window/d8/P1",
        "Date of 8 weeks of P1 is 2026-12-01, day 273 after randomisation, 217 days after the planned day 56; the "
        "window is 42 to 70.",
        NULL},
    {"P1,01,5,03/03/2026,28/02/2016,28/04/2026,,\n", 1, "date-too-early/d0/P1",
        "Date of Baseline of P1 is 2016-02-28, before the earliest day the plan allows (2020-01-01).", NULL},
    {"P1,01,5,20/03/2026,20/03/2026,19/03/2026,,\n", 1, "dates-out-of-order/d8/P1",
        "Date of 8 weeks of P1 is 2026-03-19, before \"Baseline\" (2026-03-20), which must come first.", NULL},
    {"P1,01,5,20/03/2026,20/03/2026,15/05/2026,,14/05/2026\n", 1, "dates-out-of-order/d8/P1",
        "Date of 8 weeks of P1 is 2026-05-15, after \"Died\" (2026-05-14), which must come later.", NULL},
    {"P1,01,5,20/03/2026,20/03/2026,15/05/2026,14/05/2026,\n", 1, "dates-out-of-order/d8/P1",
        "Date of 8 weeks of P1 is 2026-05-15, after \"Withdrew\" (2026-05-14), which must come later.", NULL},
    {"P1,01,5,20/03/2026,20/03/2026,15/05/2026,15/05/2026,15/05/2026\n", 0, NULL, NULL,
        NULL}, /* the same day is in order */
    /* as declared it is outside the window or out of order, exchanged it is neither */
    {"P1,01,5,10/02/2026,10/02/2026,04/07/2026,,\n", 1, "ambiguous-date/d8/P1",
        "Date of 8 weeks of P1 reads \"04/07/2026\", taken as 2026-07-04, which is outside the visit's window; with "
        "day and month exchanged it is "
        "2026-04-07, inside.",
        "{'kind':'correct','column':'d8','participant':'P1','from':'04/07/2026','to':'2026-04-07'}"},
    {"P1,01,5,10/02/2026,10/02/2026,04/01/2026,,\n", 1, "ambiguous-date/d8/P1",
        "Date of 8 weeks of P1 reads \"04/01/2026\", taken as 2026-01-04, which is out of order with Baseline "
        "(2026-02-10); with day and month "
        "exchanged it is 2026-04-01, which is in order.",
        "{'kind':'correct','column':'d8','participant':'P1','from':'04/01/2026','to':'2026-04-01'}"},
    /* exchanged it would be day 80, outside the window: no such proposal */
    {"P1,01,5,10/02/2026,10/02/2026,05/01/2026,,\n", 1, "dates-out-of-order/d8/P1",
        "Date of 8 weeks of P1 is 2026-01-05, before \"Baseline\" (2026-02-10), which must come first.", NULL},
};

static void test_one_participant(void **state) {
    (void)state;
    for (size_t i = 0; i < sizeof one / sizeof *one; i++) {
        struct dated dated;
        open_dated(&dated, one[i].records);
        if (dated.found.open != one[i].count) {
            show(&dated);
            fail_msg("%s has %zu discrepancies, wanted %zu", one[i].records, dated.found.open, one[i].count);
        }
        if (one[i].id) {
            expect_found(&dated, one[i].id, one[i].message, one[i].proposal);
        }
        if (one[i].proposal) { /* taken, it settles it, and nothing new comes up */
            const char *proposal = find(&dated, one[i].id)->proposal;
            const char *batch =
                arena_format(&dated.arena, "[%.*s,\"reason\":\"r\"}]", (int)strlen(proposal) - 1, proposal);
            case_must(&dated.c, batch);
            look(&dated);
            assert_int_equal(dated.found.open, 0);
            assert_int_equal(find(&dated, one[i].id)->state, DISCREPANCY_SETTLED);
            assert_int_equal(find(&dated, one[i].id)->settled_by, 1);
        }
        close_dated(&dated);
    }
}

/* ---- a site that writes another order ---- */

static void take(struct dated *dated, const char *id) {
    const char *proposal = find(dated, id)->proposal;
    assert_non_null(proposal);
    case_must(&dated->c, arena_format(&dated->arena, "[%.*s,\"reason\":\"r\"}]", (int)strlen(proposal) - 1, proposal));
    look(dated);
}

static const char *day_of(struct dated *dated, const char *id, const char *column) {
    const char *words = date_words(&dated->arena, case_number(&dated->c, id, column));
    return words ? words : cell_state_name(case_state(&dated->c, id, column));
}

static const char two_sites[] = "P1,01,5,03/03/2026,03/03/2026,28/04/2026,,\n"
                                "P2,01,5,04/03/2026,04/03/2026,29/04/2026,,\n"
                                "P3,07,5,03/13/2026,03/13/2026,05/08/2026,,\n"
                                "P4,07,5,03/05/2026,2026-03-05,04/30/2026,,\n";

static void test_site_at_once(void **state) {
    (void)state;
    struct dated dated;
    open_dated(&dated, two_sites);
    expect_found(&dated, "date-order/rand/site 07",
        "Site 07, rand: 1 of 2 dates cannot be read as D/M/Y; all of them read as M/D/Y (month, day, year).",
        "{'kind':'date-order','column':'rand','order':'M/D/Y','site':'07'}");
    assert_int_equal(find(&dated, "date-order/rand/site 07")->participant_count, 2);
    assert_string_equal(find(&dated, "date-order/rand/site 07")->participants[1], "P4");
    assert_non_null(find(&dated, "date-order/d8/site 07"));
    expect_text(day_of(&dated, "P3", "rand"), "unreadable", "until settled");
    expect_text(day_of(&dated, "P4", "rand"), "2026-05-03", "as declared until settled");
    char before[HASH_SIZE];
    memcpy(before, dated.c.frame->state_sha256, HASH_SIZE);
    take(&dated, "date-order/rand/site 07");
    take(&dated, "date-order/d8/site 07");
    expect_text(day_of(&dated, "P3", "rand"), "2026-03-13", "settled");
    expect_text(day_of(&dated, "P4", "rand"), "2026-03-05", "settled");
    expect_text(day_of(&dated, "P1", "rand"), "2026-03-03", "another site");
    assert_int_equal(find(&dated, "date-order/rand/site 07")->state, DISCREPANCY_SETTLED);
    assert_int_equal(find(&dated, "date-order/rand/site 07")->settled_by, 1);
    assert_int_equal(find(&dated, "date-order/d8/site 07")->settled_by, 2);
    /* one date alone in its column and site is corrected by itself */
    expect_found(&dated, "impossible-date/d0/P3",
        "Date of Baseline of P3 reads \"03/13/2026\", which is no day as D/M/Y; as M/D/Y it is 2026-03-13.",
        "{'kind':'correct','column':'d0','participant':'P3','from':'03/13/2026','to':'2026-03-13'}");
    take(&dated, "impossible-date/d0/P3");
    assert_int_equal(dated.found.open, 0);
    /* taken back, all of it leaves no trace */
    case_must(&dated.c,
        "[{'kind': 'reverse', 'number': 3, 'reason': 'r'}, {'kind': 'reverse', 'number': 1, 'reason': 'r'},"
        " {'kind': 'reverse', 'number': 2, 'reason': 'r'}]");
    assert_string_equal(before, dated.c.frame->state_sha256);
    look(&dated);
    assert_int_equal(find(&dated, "date-order/rand/site 07")->state, DISCREPANCY_OPEN);
    /* a frame from nothing is the frame decision by decision */
    struct frame *fresh = case_build(&dated.c, dated.c.count, NULL, false);
    assert_string_equal(fresh->state_sha256, dated.c.frame->state_sha256);
    frame_release(fresh);
    close_dated(&dated);
}

static void test_groups(void **state) {
    (void)state;
    static const struct {
        const char *records, *id, *message, *proposal;
        size_t open;
    } cases[] = {
        {"P1,01,5,46082,2026-03-01,2026-04-28,,\nP2,01,5,46083,2026-03-02,2026-04-29,,\n",
            "serial-number-date/rand/site 01",
            "Site 01, rand: 2 dates are numbers that a spreadsheet counts days by, from 1900 (or from 1904: then 1,462 "
            "days later).",
            "{'kind':'date-order','column':'rand','order':'serial-1900','site':'01'}", 1},
        {"P1,01,5,01/03/26,2026-03-01,2026-04-28,,\nP2,01,5,02/03/26,2026-03-02,2026-04-29,,\n",
            "two-digit-year/rand/site 01",
            "Site 01, rand: 2 dates have a year of two digits; 69 to 99 would be the 1900s, 00 to 68 the 2000s.",
            "{'kind':'date-order','column':'rand','order':'D/M/YY','site':'01'}", 1},
        /* site 09 writes Y/M/D by the plan; what it wrote reads as D/M/Y and as M/D/Y: nothing is proposed */
        {"P1,09,5,01/03/2026,2026-01-03,2026-02-28,,\nP2,09,5,02/03/2026,2026-02-03,2026-03-31,,\n",
            "date-order/rand/site 09",
            "Site 09, rand: 2 dates cannot be read as Y/M/D; all of them read as D/M/Y (day, month, year), and so do "
            "they as M/D/Y: ask the "
            "site.",
            NULL, 1},
        {"P1,,5,03/13/2026,2026-03-13,2026-05-08,,\nP2,,5,03/14/2026,2026-03-14,2026-05-08,,\n",
            "date-order/rand/site ",
            "Without a site, rand: 2 dates cannot be read as D/M/Y; all of them read as M/D/Y (month, day, year).",
            "{'kind':'date-order','column':'rand','order':'M/D/Y','site':''}", 1},
        /* mixed: one reads only as M/D/Y, one only as D/M/Y, so the third is in doubt; its other dates are not given */
        {"P1,01,5,03/13/2026,,,,\nP2,01,5,13/03/2026,,,,\nP3,01,5,03/04/2026,,,,\n", "ambiguous-date/rand/site 01",
            "Site 01, rand: 1 date reads only as M/D/Y where the order is D/M/Y, so 1 other, with day and month up to "
            "12, can be read two ways; "
            "it is read as D/M/Y.",
            "{'kind':'date-order','column':'rand','order':'D/M/Y','site':'01'}", 2},
        /* the same, but another date of the third speaks against the other reading */
        {"P1,01,5,03/13/2026,,,,\nP2,01,5,13/03/2026,,,,\nP3,01,5,03/04/2026,,2026-05-29,,\n",
            "impossible-date/rand/P1",
            "Date of randomisation of P1 reads \"03/13/2026\", which is no day as D/M/Y; as M/D/Y it is 2026-03-13.",
            "{'kind':'correct','column':'rand','participant':'P1','from':'03/13/2026','to':'2026-03-13'}", 1},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        struct dated dated;
        open_dated(&dated, cases[i].records);
        expect_found(&dated, cases[i].id, cases[i].message, cases[i].proposal);
        if (dated.found.open != cases[i].open) {
            show(&dated);
            fail_msg("%s: %zu open", cases[i].records, dated.found.open);
        }
        if (cases[i].proposal) {
            take(&dated, cases[i].id);
            assert_int_equal(find(&dated, cases[i].id)->state, DISCREPANCY_SETTLED);
            assert_int_equal(dated.found.open, cases[i].open - 1);
        }
        close_dated(&dated);
    }
}

static void test_refused_orders(void **state) {
    (void)state;
    static const struct {
        const char *decision, *sentence;
    } cases[] = {
        {"'column': 'y', 'order': 'M/D/Y'", "decision 1 of the batch (date-order) is about the column \"y\", which "
                                            "holds no dates; nothing was recorded"},
        {"'column': 'rand', 'order': 'M/D/Y', 'site': '77'", "decision 1 of the batch (date-order) names the site "
                                                             "\"77\", which no participant has; nothing was recorded"},
        {"'column': 'rand', 'order': 'Y/D/M'",
            "batch.json: decision 1 of the batch (date-order) has an \"order\" that is none of D/M/Y, M/D/Y, "
            "Y/M/D, D-MON-Y, the same with YY, serial-1900 and serial-1904; nothing was recorded"},
        {"'column': 'rand'", "batch.json: decision 1 of the batch (date-order) lacks \"order\"; it needs: column "
                             "order; nothing was recorded"},
    };
    struct dated dated;
    open_dated(&dated, two_sites);
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        case_refused(&dated.c,
            arena_format(&dated.arena, "[{'kind': 'date-order', %s, 'reason': 'r'}]", cases[i].decision),
            cases[i].sentence);
    }
    case_must(&dated.c, "[{'kind': 'lock', 'reason': 'r'}]");
    case_refused(&dated.c, "[{'kind': 'date-order', 'column': 'rand', 'order': 'M/D/Y', 'reason': 'r'}]",
        "decision 1 of the batch (date-order) would change data, and the study is locked; unlock it first, with a "
        "reason; nothing was recorded");
    close_dated(&dated);
}

/* The same data without dates have the same fingerprint, until a decision changes a date. */
static void test_state_with_and_without(void **state) {
    (void)state;
    struct dated dated;
    struct trial_case bare;
    open_dated(&dated, two_sites);
    char *cut = arena_text(&dated.arena, one_plan);
    strcpy(strstr(cut, ", 'dates'") ? strstr(cut, ", 'dates'") : strstr(cut, " 'dates'") - 1, "}");
    case_open(&bare, arena_format(&dated.arena, "%s%s", one_header, two_sites), cut);
    assert_string_equal(dated.c.frame->state_sha256, bare.frame->state_sha256);
    case_must(&dated.c, "[{'kind': 'confirm', 'column': 'rand', 'value': '03/03/2026', 'reason': 'r'}]");
    assert_string_equal(dated.c.frame->state_sha256, bare.frame->state_sha256);
    take(&dated, "date-order/rand/site 07");
    assert_string_not_equal(dated.c.frame->state_sha256, bare.frame->state_sha256);
    case_close(&bare);
    close_dated(&dated);
}

/* Codes for missing, corrections to ISO and values set missing, as in any column. */
static void test_states(void **state) {
    (void)state;
    struct dated dated;
    open_dated(&dated, "P1,01,5,03/03/2026,01/01/1900,,,\n");
    expect_text(day_of(&dated, "P1", "d0"), "1900-01-01", "a code before it is known as one");
    expect_text(day_of(&dated, "P1", "d8"), "blank", "blank");
    case_must(&dated.c, "[{'kind': 'missing-code', 'column': 'd0', 'value': '01/01/1900', 'reason': 'r'}]");
    expect_text(day_of(&dated, "P1", "d0"), "missing-code", "code");
    case_must(&dated.c,
        "[{'kind': 'correct', 'column': 'd8', 'participant': 'P1', 'from': '', 'to': '2026-04-28', 'reason': 'r'},"
        " {'kind': 'set-missing', 'column': 'rand', 'participant': 'P1', 'from': '03/03/2026', 'reason': 'r'}]");
    expect_text(day_of(&dated, "P1", "d8"), "2026-04-28", "corrected");
    expect_text(day_of(&dated, "P1", "rand"), "set-missing", "set missing");
    close_dated(&dated);
}

/* ---- visits found by date ---- */

static const char window_plan[] =
    "{'title': 'T', 'participant': 'pid', 'site': {'column': 'people.site'},"
    " 'files': [{'id': 'people', 'participant': 'pid'},"
    "   {'id': 'visits', 'layout': 'visit', 'participant': 'pid', 'codes': ['0', '8', '16']}],"
    " 'outcomes': [{'id': 'y', 'label': 'Why', 'role': 'primary', 'better': 'lower', 'visits': ["
    "   {'label': 'Baseline', 'file': 'visits', 'visit': '0', 'column': 'y'}, {'label': '8 weeks', 'file': 'visits', "
    "'visit': '8', 'column': 'y'},"
    "   {'label': '16 weeks', 'file': 'visits', 'visit': '16', 'column': 'y'}]}],"
    " 'dates': {'order': 'D/M/Y', 'files': {'people': 'Y/M/D'}, 'randomised': {'column': 'people.rand'}, 'visits': ["
    "   {'label': 'Baseline', 'file': 'visits', 'visit': '0', 'column': 'on', 'target': 0, 'window': [-14, 14]},"
    "   {'label': '8 weeks', 'file': 'visits', 'visit': '8', 'column': 'on', 'target': 56, 'window': [-28, 28]},"
    "   {'label': '16 weeks', 'file': 'visits', 'visit': '16', 'column': 'on', 'target': 112, 'window': [-28, 28]}],"
    "  'by_window': {'file': 'visits', 'column': 'on'}}}";

/* Randomised on 1 January 2026: day 56 is 26 February, day 112 is 23 April, day 84, between them, 26 March. */
static const char window_people[] = "pid,site,rand\nP1,01,2026/01/01\nP2,01,2026/01/01\nP3,02,2026/01/01\nP4,02,\n";
static const char window_visits[] = "pid,on,y\n"
                                    "P1,30/12/2025,10\n" /* 1: baseline, 2 days before */
                                    "P1,20/02/2026,11\n" /* 2: 8 weeks, 6 days before: farther than the next */
                                    "P1,01/03/2026,12\n" /* 3: 8 weeks, 3 days after: stands */
                                    "P1,26/03/2026,13\n" /* 4: day 84, as near to 8 as to 16 weeks: the later */
                                    "P1,01/06/2026,14\n" /* 5: day 151, in no window */
                                    "P2,24/02/2026,20\n" /* 6: 2 days before */
                                    "P2,28/02/2026,21\n" /* 7: 2 days after: as near, the later stands */
                                    "P2,23/04/2026,22\n" /* 8: two of one day: held aside */
                                    "P2,23/04/2026,23\n" /* 9 */
                                    "P3,03/13/2026,30\n" /* 10: reads only as M/D/Y */
                                    "P3,01/02/2026,31\n" /* 11 */
                                    "P4,01/01/2026,40\n" /* 12: no date of randomisation */
                                    "P9,01/01/2026,90\n" /* 13: nobody of the first file */
                                    ",01/01/2026,91\n"   /* 14: nobody */
                                    "P1,,92\n";          /* 15: no date */

static void open_windows(struct dated *dated) {
    const char *const files[] = {window_people, window_visits};
    arena_init(&dated->arena);
    case_open_files(&dated->c, files, 2, window_plan);
    look(dated);
}

static void expect_cell(struct dated *dated, const char *id, const char *column, double value, enum cell_state state) {
    assert_int_equal(case_state(&dated->c, id, column), state);
    near(case_number(&dated->c, id, column), value, 0, 0, column);
}

static void test_windows(void **state) {
    (void)state;
    struct dated dated;
    open_windows(&dated);
    expect_cell(&dated, "P1", "visits.y@0", 10, CELL_OBSERVED);
    expect_cell(&dated, "P1", "visits.y@8", 12, CELL_OBSERVED);
    expect_cell(&dated, "P1", "visits.y@16", 13, CELL_OBSERVED);
    expect_cell(&dated, "P2", "visits.y@0", (double)NAN, CELL_BLANK);
    expect_cell(&dated, "P2", "visits.y@8", 21, CELL_OBSERVED);
    expect_cell(&dated, "P2", "visits.y@16", (double)NAN, CELL_HELD_ASIDE);
    expect_cell(&dated, "P3", "visits.y@8", 31, CELL_OBSERVED); /* 1 February is day 31, 25 before the target */
    expect_cell(&dated, "P4", "visits.y@0", (double)NAN, CELL_BLANK);
    expect_text(day_of(&dated, "P1", "visits.on@8"), "2026-03-01", "the date goes with its record");
    const struct join *join = &dated.c.frame->joins[1];
    assert_int_equal(join->matched, 9);   /* 1 to 4, 6 to 9, 11 */
    assert_int_equal(join->farther, 2);   /* 2, 6 */
    assert_int_equal(join->ties, 2);      /* 4 by targets, 7 by records */
    assert_int_equal(join->unplanned, 1); /* 5 */
    assert_int_equal(join->undated, 3);   /* 10, 12, 15 */
    assert_int_equal(join->unmatched, 1);
    assert_int_equal(join->blank, 1);
    assert_int_equal(join->doubled, 1);
    expect_found(&dated, "outside-window/visits.on/P1/record 5",
        "The date of P1 (visits, record 5) is 2026-06-01, day 151 after randomisation, in no visit's window; what the "
        "record says is in no "
        "analysis, and counted.",
        NULL);
    /* one site's other order; read so, record 10 is of day 71, 15 after the 8 weeks */
    expect_found(&dated, "date-order/visits.on/site 02",
        "Site 02, visits.on: 1 of 3 dates cannot be read as D/M/Y; all of them read as M/D/Y (month, day, year).",
        "{'kind':'date-order','column':'visits.on','order':'M/D/Y','site':'02'}");
    close_dated(&dated);
}

/* Decisions move records between visits, and taken back leave no trace; sharing columns between versions changes
 * nothing. */
static void test_windows_follow_decisions(void **state) {
    (void)state;
    static const struct {
        const char *decisions, *id, *column;
        double value;
        enum cell_state state;
    } steps[] = {
        {"[{'kind': 'keep-record', 'file': 'visits', 'participant': 'P2', 'row': 9, 'reason': 'r'}]", "P2",
            "visits.y@16", 23, CELL_OBSERVED},
        {"[{'kind': 'date-order', 'column': 'visits.on', 'order': 'M/D/Y', 'site': '02', 'reason': 'r'}]", "P3",
            "visits.y@8", 30, CELL_OBSERVED},
        {"[{'kind': 'correct', 'column': 'visits.on', 'participant': 'P1', 'row': 5, 'from': '01/06/2026', 'to': "
         "'2026-04-22', 'reason': 'r'}]",
            "P1", "visits.y@16", 14, CELL_OBSERVED},
        {"[{'kind': 'correct', 'column': 'people.rand', 'participant': 'P4', 'from': '', 'to': '2025-12-30', 'reason': "
         "'r'}]",
            "P4", "visits.y@0", 40, CELL_OBSERVED},
        {"[{'kind': 'set-missing', 'column': 'visits.on', 'participant': 'P1', 'row': 3, 'from': '01/03/2026', "
         "'reason': 'r'}]",
            "P1", "visits.y@8", 11, CELL_OBSERVED},
        {"[{'kind': 'correct', 'column': 'visits.y@8', 'participant': 'P1', 'from': '11', 'to': '111', 'reason': 'r'}]",
            "P1", "visits.y@8", 111, CELL_OBSERVED},
        {"[{'kind': 'read-as', 'column': 'visits.pid', 'from': 'P9', 'to': 'P3', 'reason': 'r'}]", "P3", "visits.y@0",
            90, CELL_OBSERVED},
    };
    enum { STEPS = sizeof steps / sizeof *steps };
    struct dated dated;
    open_windows(&dated);
    char states[STEPS + 1][HASH_SIZE];
    memcpy(states[0], dated.c.frame->state_sha256, HASH_SIZE);
    for (size_t i = 0; i < STEPS; i++) {
        case_must(&dated.c, steps[i].decisions);
        expect_cell(&dated, steps[i].id, steps[i].column, steps[i].value, steps[i].state);
        struct frame *fresh = case_build(&dated.c, dated.c.count, NULL, false);
        assert_string_equal(fresh->state_sha256, dated.c.frame->state_sha256);
        frame_release(fresh);
        memcpy(states[i + 1], dated.c.frame->state_sha256, HASH_SIZE);
        look(&dated);
    }
    for (size_t i = STEPS; i-- > 0;) {
        case_must(&dated.c, arena_format(&dated.arena, "[{'kind': 'reverse', 'number': %zu, 'reason': 'r'}]", i + 1));
        assert_string_equal(dated.c.frame->state_sha256, states[i]);
    }
    case_refused(&dated.c,
        "[{'kind': 'correct', 'column': 'visits.on@8', 'participant': 'P1', 'from': '01/03/2026', 'to': '2026-03-02', "
        "'reason': 'r'}]",
        "decision 1 of the batch (correct) is about one visit of a date by which visits are found; name visits.on and "
        "the record's row; nothing "
        "was recorded");
    case_refused(&dated.c,
        "[{'kind': 'correct', 'column': 'visits.on', 'participant': 'P1', 'from': '01/03/2026', 'to': '2026-03-02', "
        "'reason': 'r'}]",
        "decision 1 of the batch (correct) is about a date by which visits are found; say which record with \"row\"; "
        "nothing was recorded");
    close_dated(&dated);
}

/* A correction of a visit's value does not fall on another record that a date corrected since has put in its place. */
static void test_corrections_stay_with_their_value(void **state) {
    (void)state;
    struct dated dated;
    open_windows(&dated);
    case_must(&dated.c,
        "[{'kind': 'correct', 'column': 'visits.y@8', 'participant': 'P1', 'from': '12', 'to': '120', 'reason': 'r'}]");
    case_must(&dated.c, "[{'kind': 'correct', 'column': 'visits.on', 'participant': 'P1', 'row': 2, 'from': "
                        "'20/02/2026', 'to': '2026-02-26', 'reason': 'r'}]");
    expect_cell(&dated, "P1", "visits.y@8", 11, CELL_OBSERVED);
    close_dated(&dated);
}

/* ---- plans ---- */

static void test_broken_plans(void **state) {
    (void)state;
    static const struct {
        const char *from, *to, *sentence;
    } cases[] = {
        {"'order': 'D/M/Y', ", "",
            "plan.json: dates.order is missing: say how dates are written, such as \"D/M/Y\"; it is never guessed"},
        {"'order': 'D/M/Y'", "'order': 'DMY'",
            "plan.json: dates.order must be an order of dates, one of D/M/Y, M/D/Y, Y/M/D, D-MON-Y, D/M/YY, "
            "M/D/YY, YY/M/D, D-MON-YY, serial-1900, serial-1904"},
        {"'order': 'D/M/Y'", "'order': 'D/M/Y', 'mood': 1",
            "plan.json: the key \"mood\" in dates is not one a plan has here; known are: order files "
            "sites earliest randomised visits stopped withdrew died by_window"},
        {"{'people': 'Y/M/D'}", "{'persons': 'Y/M/D'}",
            "plan.json: dates.files.persons is not the id of a file of this plan"},
        {"{'people': 'Y/M/D'}", "{'people': 3}",
            "plan.json: dates.files.people must be an order of dates, one of D/M/Y, M/D/Y, Y/M/D, D-MON-Y, "
            "D/M/YY, M/D/YY, YY/M/D, D-MON-YY, serial-1900, serial-1904"},
        {"'order': 'D/M/Y'", "'order': 'D/M/Y', 'earliest': '01/01/2019'",
            "plan.json: dates.earliest must be a day as YYYY-MM-DD, such as \"2019-01-01\""},
        {"'target': 56, ", "", "plan.json: dates.visits[1].window needs a target day, from which it is counted"},
        {"[-14, 14]", "[3, 14]",
            "plan.json: dates.visits[0].window is counted from the target day and must hold it, such as [-14, 14]"},
        {", 'target': 112, 'window': [-28, 28]", "",
            "plan.json: dates.by_window finds visits by their window, but no visit of \"dates\" gives the "
            "code \"16\" a target and a window"},
        {"'randomised': {'column': 'people.rand'}, ", "",
            "plan.json: dates.by_window counts days from randomisation: give \"dates.randomised\" a "
            "column that is not in that file"},
        {"'by_window': {'file': 'visits'", "'by_window': {'file': 'people'",
            "plan.json: dates.by_window.file must be the id of a file of this plan that has one row per visit"},
        {",  'by_window': {'file': 'visits', 'column': 'on'}", "",
            "plan.json: files[1].visit is missing; a plan needs it, unless "
            "\"dates.by_window\" finds the visits of the file by date"},
        {"'site': {'column': 'people.site'},", "", NULL},
        {"'order': 'D/M/Y'", "'order': 'D/M/Y', 'sites': {'01': 'M.D.Y'}", NULL},
        {"'randomised': {'column': 'people.rand'}", "'randomised': {'column': 'people.pid'}",
            "plan.json: the column \"people.pid\" is both Date of "
            "randomisation and the participant's identifier; a column has one meaning"},
    };
    struct arena arena;
    arena_init(&arena);
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        const char *at = strstr(window_plan, cases[i].from);
        assert_non_null(at);
        const char *json = quoted(&arena, arena_format(&arena, "%.*s%s%s", (int)(at - window_plan), window_plan,
                                              cases[i].to, at + strlen(cases[i].from)));
        struct plan plan;
        struct fault fault;
        fault_init(&fault);
        bool read = plan_read(&plan, json, strlen(json), "plan.json", &fault);
        expect_text(read ? "read" : fault.message, cases[i].sentence ? cases[i].sentence : "read", cases[i].to);
        if (read) {
            plan_release(&plan);
        }
    }
    arena_release(&arena);
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_texts),
        cmocka_unit_test(test_exchanged),
        cmocka_unit_test(test_order_names),
        cmocka_unit_test(test_one_participant),
        cmocka_unit_test(test_site_at_once),
        cmocka_unit_test(test_groups),
        cmocka_unit_test(test_refused_orders),
        cmocka_unit_test(test_states),
        cmocka_unit_test(test_state_with_and_without),
        cmocka_unit_test(test_windows),
        cmocka_unit_test(test_windows_follow_decisions),
        cmocka_unit_test(test_corrections_stay_with_their_value),
        cmocka_unit_test(test_broken_plans),
    };
    return cmocka_run_group_tests_name("trial/dates", tests, NULL, NULL);
}
