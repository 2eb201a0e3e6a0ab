/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The invented trial as four files, one row per participant or per visit, against its one wide export, read here anew: the
 * same cells, the same state to the byte at load and after the right decisions, and the same numbers to the last digit. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "unit/exhibits/exhibit_case.h"
#include <time.h>

static const uint64_t seeds[] = {QUAYSIDE_SEED, 1, 2, 77, 4096};
enum { SEEDS = sizeof seeds / sizeof *seeds };

static void open_wide(struct exhibit_case *c, uint64_t seed, bool decided) {
    struct quayside quayside;
    quayside_make(seed, &quayside);
    char *plan = replaced(quayside.plan_json.data, "\"blinding\": \"coded\"", "\"blinding\": \"unblinded\"");
    case_open(c, quayside.export_csv.data, plan);
    memory_free(plan);
    if (decided) {
        case_decide(c, &quayside.decisions_json);
    }
    quayside_release(&quayside);
}

static void assert_same_state(struct exhibit_case *wide, struct exhibit_case *files) {
    struct fault fault;
    fault_init(&fault);
    struct frame *a = study_frame(wide->study, &fault), *b = study_frame(files->study, &fault);
    assert_non_null(a);
    assert_non_null(b);
    assert_string_equal(a->state_sha256, b->state_sha256);
    frame_release(a);
    frame_release(b);
}

static void test_state_is_that_of_the_wide_export(void **state) {
    (void)state;
    for (size_t i = 0; i < SEEDS; i++) {
        for (int decided = 0; decided < 2; decided++) {
            struct exhibit_case wide, files;
            open_wide(&wide, seeds[i], decided);
            case_quayside_files(&files, seeds[i], "unblinded", decided);
            assert_same_state(&wide, &files);
            case_close(&wide);
            case_close(&files);
        }
    }
}

/* From the arguments on: the head before them names file and version. The caller frees it. */
static char *body_made(struct exhibit_case *c, const char *exhibit, const char *name, const char *value) {
    struct renderings r;
    struct asked asked = {name, value};
    render(c, exhibit, &asked, name != NULL, &r, NULL);
    char *body = strstr(r.json.data, "\"arguments\"");
    assert_non_null(body);
    body = memory_text(body);
    renderings_release(&r);
    return body;
}

static void test_numbers_are_those_of_the_wide_export(void **state) {
    (void)state;
    static const struct {
        const char *exhibit, *name, *value;
    } compared[] = {{"effect", "outcome", "sbp"}, {"effect", "outcome", "uacr"}, {"change-by-arm", "outcome", "sbp"},
        {"change-by-arm", "outcome", "uacr"}, {"flow", NULL, NULL}, {"before-after", "outcome", "sbp"}};
    for (int decided = 0; decided < 2; decided++) {
        struct exhibit_case wide, files;
        open_wide(&wide, QUAYSIDE_SEED, decided);
        case_quayside_files(&files, QUAYSIDE_SEED, "unblinded", decided);
        for (size_t i = 0; i < sizeof compared / sizeof *compared; i++) {
            char *one = body_made(&wide, compared[i].exhibit, compared[i].name, compared[i].value);
            char *four = body_made(&files, compared[i].exhibit, compared[i].name, compared[i].value);
            assert_string_equal(four, one);
            memory_free(one);
            memory_free(four);
        }
        case_close(&wide);
        case_close(&files);
    }
}

/* ---- the cells, without the program's own reading ---- */

/* The text of a comma-separated line's field, quotes taken off; field 0 is the first. */
static void field_of(const char *line, size_t number, char *out, size_t room) {
    size_t used = 0;
    bool quote = false;
    for (; *line && *line != '\n'; line++) {
        quote = *line == '"' ? !quote : quote;
        if (*line == ',' && !quote) {
            if (number-- == 0) {
                break;
            }
        } else if (*line != '"' && number == 0) {
            assert_true(used + 1 < room);
            out[used++] = *line;
        }
    }
    out[used] = '\0';
}

/* How many records of a participant (and a visit) there are, and the field of the last. */
static size_t look_up(const char *csv, const char *participant, const char *visit, size_t number, char *out, size_t room) {
    size_t found = 0;
    char cell[64];
    out[0] = '\0';
    for (const char *line = strchr(csv, '\n') + 1; *line; line = strchr(line, '\n') + 1) {
        field_of(line, 0, cell, sizeof cell);
        bool here = strcmp(cell, participant) == 0;
        field_of(line, 1, cell, sizeof cell);
        if (here && (!visit || strcmp(cell, visit) == 0)) {
            field_of(line, number, out, room);
            found++;
        }
    }
    return found;
}

static void test_cells_are_those_of_the_wide_export(void **state) {
    (void)state;
    static const struct {
        size_t wide;
        int file; /* 0 people, 1 visits, 2 labs, 3 events */
        const char *visit;
        size_t number;
    } places[] = {{1, 0, NULL, 1}, {2, 0, NULL, 2}, {3, 0, NULL, 3}, {4, 0, NULL, 4}, {5, 0, NULL, 5}, {6, 1, "V0", 3}, {7, 1, "V8", 3},
        {8, 1, "V26", 3}, {9, 2, "V0", 3}, {10, 2, "V8", 3}, {11, 2, "V26", 3}, {12, 3, NULL, 1}};
    struct quayside wide;
    struct quayside_files files;
    quayside_make(QUAYSIDE_SEED, &wide);
    quayside_make_files(QUAYSIDE_SEED, &files);
    const char *const texts[] = {files.people_csv.data, files.visits_csv.data, files.labs_csv.data, files.events_csv.data};
    size_t absent = 0, doubled = 0, records = 0;
    for (const char *line = strchr(wide.export_csv.data, '\n') + 1; *line; line = strchr(line, '\n') + 1, records++) {
        char participant[64], cell[64], there[64], cells_of_last[64];
        field_of(line, 0, participant, sizeof participant);
        bool last = look_up(wide.export_csv.data, participant, NULL, 7, cells_of_last, sizeof cells_of_last) == 1;
        for (size_t i = 0; i < sizeof places / sizeof *places; i++) {
            field_of(line, places[i].wide, cell, sizeof cell);
            size_t found = look_up(texts[places[i].file], participant, places[i].visit, places[i].number, there, sizeof there);
            if (last) {
                assert_string_equal(there, cell);
                assert_true(found <= 1 && (found == 1 || *cell == '\0'));
                absent += found == 0;
            }
            doubled += found > 1;
        }
    }
    assert_int_equal(records, 241);
    assert_true(absent > 50);
    assert_int_equal(doubled, 2 * 6); /* the participant entered twice: five columns of people.csv and one visit, met twice */
    quayside_release(&wide);
    quayside_files_release(&files);
}

/* Dates are days that exist, never at a weekend but where a sample waits, and in order for each participant. */
static void test_dates(void **state) {
    (void)state;
    struct quayside_files files;
    quayside_make_files(QUAYSIDE_SEED, &files);
    char before[64] = "", cell[64];
    long last = 0, day;
    size_t seen = 0;
    for (const char *line = strchr(files.visits_csv.data, '\n') + 1; *line; line = strchr(line, '\n') + 1) {
        unsigned d, m, y;
        field_of(line, 2, cell, sizeof cell);
        assert_int_equal(sscanf(cell, "%2u/%2u/%4u", &d, &m, &y), 3);
        assert_int_equal(strlen(cell), 10);
        struct tm when = {.tm_mday = (int)d, .tm_mon = (int)m - 1, .tm_year = (int)y - 1900, .tm_hour = 12};
        day = (long)(timegm(&when) / 86400);
        assert_true(when.tm_mday == (int)d && when.tm_mon == (int)m - 1); /* the C library moved nothing */
        assert_true(when.tm_wday >= 1 && when.tm_wday <= 5);
        field_of(line, 0, cell, sizeof cell);
        assert_true(strcmp(cell, before) != 0 || day >= last);
        snprintf(before, sizeof before, "%s", cell);
        last = day;
        seen++;
    }
    assert_true(seen > 600);
    quayside_files_release(&files);
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_state_is_that_of_the_wide_export),
        cmocka_unit_test(test_numbers_are_those_of_the_wide_export),
        cmocka_unit_test(test_cells_are_those_of_the_wide_export),
        cmocka_unit_test(test_dates),
    };
    return cmocka_run_group_tests_name("demo/files", tests, NULL, NULL);
}
