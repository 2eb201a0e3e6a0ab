/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Whole trials through the whole program: reading, plan, decisions, sets, scales, models, against what R finds from the
 * same export by the same rules written again (pipeline.R). Open data: MASS::anorexia, HSAUR3::BtheB, HSAUR3::polyps3,
 * datasets::sleep (sources in data/ and in the plans' titles); the others are trials seeded in R. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "../unit/exhibits/exhibit_case.h"

#define FOLDER "tests/reference/pipeline/"
enum { PATH_ROOM = 512, LINE_ROOM = 1024, ARGUMENTS = 8 };
static const double TOLERANCE = 1e-10;

static char *file_text(const char *case_name, const char *ending, bool needed) {
    char path[256];
    snprintf(path, sizeof path, FOLDER "%s%s", case_name, ending);
    FILE *file = fopen(path, "rb");
    if (!file && needed) {
        fail_msg("%s is not here: run the tests from the repository's top folder", path);
    }
    if (!file) {
        return NULL;
    }
    struct text text;
    text_init(&text);
    char part[4096];
    for (size_t n; (n = fread(part, 1, sizeof part, file)) > 0;) {
        text_append(&text, part, n);
    }
    fclose(file);
    char *bytes = text_take(&text);
    text_release(&text); /* taking leaves an empty text behind */
    return bytes;
}

static void open_case(struct exhibit_case *c, const char *name) {
    char *csv = file_text(name, ".csv", true), *plan = file_text(name, ".json", true);
    char *decisions = file_text(name, ".decisions.json", false);
    case_open(c, csv, plan);
    if (decisions) {
        struct text text;
        text_init(&text);
        text_string(&text, decisions);
        case_decide(c, &text);
        text_release(&text);
    }
    memory_free(csv);
    memory_free(plan);
    memory_free(decisions);
}

/* "effect;outcome=y;without=p1+p2" as the exhibit's JSON. */
static cJSON *exhibit(struct exhibit_case *c, const char *asked) {
    char copy[PATH_ROOM];
    struct asked arguments[ARGUMENTS];
    size_t count = 0;
    snprintf(copy, sizeof copy, "%s", asked);
    for (char *at = strchr(copy, ';'); at; at = strchr(at + 1, ';')) {
        *at = '\0';
        char *value = strchr(at + 1, '=');
        assert_non_null(value);
        assert_true(count < ARGUMENTS);
        arguments[count++] = (struct asked){at + 1, value + 1};
    }
    for (size_t i = 0; i < count; i++) {
        ((char *)(uintptr_t)arguments[i].value)[-1] = '\0'; /* the = */
        for (char *plus = strchr(arguments[i].value, '+'); plus; plus = strchr(plus, '+')) {
            *plus = ',';
        }
    }
    struct renderings r;
    render(c, copy, arguments, count, &r, NULL);
    cJSON *parsed = r.parsed;
    r.parsed = NULL;
    renderings_release(&r);
    return parsed;
}

/* ---- the path into the JSON ---- */

static bool is_field(const cJSON *member, const char *condition, size_t length) {
    const char *equals = memchr(condition, '=', length);
    char name[64];
    snprintf(name, sizeof name, "%.*s", (int)(equals - condition), condition);
    const char *value = cJSON_GetStringValue(cJSON_GetObjectItemCaseSensitive(member, name));
    size_t wanted = length - (size_t)(equals + 1 - condition);
    return value && strlen(value) == wanted && memcmp(value, equals + 1, wanted) == 0;
}

static bool meets(const cJSON *member, const char *conditions, size_t length) {
    while (length) {
        const char *end = memchr(conditions, '&', length);
        size_t here = end ? (size_t)(end - conditions) : length;
        if (!is_field(member, conditions, here)) {
            return false;
        }
        length -= end ? here + 1 : here;
        conditions += end ? here + 1 : here;
    }
    return true;
}

static const cJSON *in_brackets(const cJSON *array, const char *inside, size_t length) {
    if (!memchr(inside, '=', length)) {
        return cJSON_GetArrayItem(array, atoi(inside));
    }
    const cJSON *member;
    cJSON_ArrayForEach(member, array) {
        if (meets(member, inside, length)) {
            return member;
        }
    }
    return NULL;
}

/* NULL where the path leads nowhere. `number` takes what no member holds: a count or a sum. */
static const cJSON *follow(const cJSON *from, const char *path, double *number) {
    *number = NAN;
    while (*path && from) {
        path += *path == '.';
        if (*path == '[') {
            const char *end = strchr(path, ']');
            from = in_brackets(from, path + 1, (size_t)(end - path) - 1);
            path = end + 1;
            continue;
        }
        char name[64];
        size_t length = strcspn(path, ".[#+");
        snprintf(name, sizeof name, "%.*s", (int)length, path);
        from = cJSON_GetObjectItemCaseSensitive(from, name);
        path += length;
        if (*path == '#') {
            *number = cJSON_GetArraySize(from);
            return from;
        }
        if (*path == '+') {
            const cJSON *member;
            *number = 0;
            cJSON_ArrayForEach(member, from) {
                *number += field(member, path + 1)->valuedouble;
            }
            return from;
        }
    }
    return from;
}

/* ---- comparing ---- */

struct wanted {
    char path[PATH_ROOM];
    const char *value;
    double error, tolerance;
};

static void read_wanted(struct wanted *wanted, char *line) {
    char *cells[4] = {line, NULL, NULL, NULL};
    for (size_t i = 1; i < 4 && cells[i - 1]; i++) {
        cells[i] = strchr(cells[i - 1], ',');
        if (cells[i]) {
            *cells[i]++ = '\0';
        }
    }
    if (line[0] == '.') {
        char *place = strrchr(wanted->path, '.');
        assert_non_null(place);
        snprintf(place, (size_t)(wanted->path + PATH_ROOM - place), "%s", line);
    } else {
        snprintf(wanted->path, PATH_ROOM, "%s", line);
    }
    assert_non_null(cells[1]);
    wanted->value = cells[1];
    wanted->error = cells[2] && *cells[2] ? strtod(cells[2], NULL) : 0;
    wanted->tolerance = cells[3] && *cells[3] ? strtod(cells[3], NULL) : TOLERANCE;
}

/* Says what differs; true where nothing does. */
static bool agrees(const cJSON *json, const struct wanted *wanted, const char *where) {
    double counted;
    const cJSON *got = follow(json, wanted->path, &counted);
    char shown[64];
    bool same;
    if (!got) {
        same = false;
        snprintf(shown, sizeof shown, "nothing");
    } else if (cJSON_IsString(got)) {
        same = strcmp(got->valuestring, wanted->value) == 0;
        snprintf(shown, sizeof shown, "%s", got->valuestring);
    } else if (cJSON_IsNull(got) || strcmp(wanted->value, "null") == 0) {
        same = cJSON_IsNull(got) && strcmp(wanted->value, "null") == 0;
        snprintf(shown, sizeof shown, "%s", cJSON_IsNull(got) ? "null" : "a value");
    } else {
        double number = isnan(counted) ? got->valuedouble : counted;
        same = near_holds(number, strtod(wanted->value, NULL), wanted->tolerance, wanted->tolerance * wanted->error);
        snprintf(shown, sizeof shown, "%.17g", number);
    }
    if (!same) {
        print_error("%s %s: got %s, R has %s (tolerance %g)\n", where, wanted->path, shown, wanted->value,
            wanted->tolerance);
    }
    return same;
}

/* ---- what must hold whatever R says ---- */

static const cJSON *stage_of(const cJSON *flow, const char *stage) {
    return member_with(field(flow, "stages"), "stage", stage);
}

static double stage_total(const cJSON *flow, const char *stage) {
    return number_at(stage_of(flow, stage), "total");
}

static double stage_arm(const cJSON *flow, const char *stage, const char *arm) {
    return number_at(member_with(field(stage_of(flow, stage), "arms"), "arm", arm), "n");
}

/* records = held aside + no arm + randomised; nobody analysed who is not randomised and in the set, arm by arm. */
static void check_flow(const cJSON *flow) {
    assert_true(stage_total(flow, "records") ==
        stage_total(flow, "held-aside") + stage_total(flow, "no-arm") + stage_total(flow, "randomised"));
    const cJSON *arm;
    cJSON_ArrayForEach(arm, field(stage_of(flow, "randomised"), "arms")) {
        const char *code = string_at(arm, "arm");
        double left_out = stage_arm(flow, "excluded", code), analysed = stage_arm(flow, "analysed", code);
        assert_true(analysed >= 0 && left_out >= 0 && analysed + left_out <= number_at(arm, "n"));
    }
}

/* The same question, the same digits: permutations are seeded. */
static void check_repeatable(struct exhibit_case *c, const char *asked, const cJSON *first) {
    cJSON *again = exhibit(c, asked);
    assert_true(cJSON_Compare(first, again, true));
    cJSON_Delete(again);
}

/* ---- cases ---- */

static const char *const cases[] = {"anorexia", "btheb", "polyps", "sleep", "messy-mean", "messy-drop", "messy-robust",
    "arm-of-one", "empty-cell", "constant", "collinear", "tiny-2", "tiny-3", "tiny-4", "tiny-5", "tiny-6", "offset"};
enum { CASES = sizeof cases / sizeof *cases };

static void test_case(void **state) {
    const char *name = *state;
    struct exhibit_case c;
    open_case(&c, name);
    char *values = file_text("values", ".csv", true), *next = values;
    char where[LINE_ROOM], prefix[64];
    snprintf(prefix, sizeof prefix, "> %s ", name);
    struct wanted wanted = {.path = ""};
    cJSON *json = NULL;
    size_t compared = 0, wrong = 0;
    for (char *line; (line = next) && *line;) {
        next = strchr(line, '\n');
        if (next) {
            *next++ = '\0';
        }
        if (*line == '>' || *line == '#') {
            cJSON_Delete(json);
            json = NULL;
        }
        if (strncmp(line, prefix, strlen(prefix)) == 0) {
            snprintf(where, sizeof where, "%s", line + 2);
            const char *asked = where + strlen(prefix) - 2;
            json = exhibit(&c, asked);
            if (strncmp(asked, "flow", 4) == 0) {
                check_flow(json);
            }
            if (strncmp(asked, "effect", 6) == 0) {
                check_repeatable(&c, asked, json);
            }
        } else if (json) {
            read_wanted(&wanted, line);
            wrong += !agrees(json, &wanted, where);
            compared++;
        }
    }
    cJSON_Delete(json);
    memory_free(values);
    case_close(&c);
    assert_true(compared > 0);
    if (wrong) {
        fail_msg("%zu of %zu values of %s differ", wrong, compared, name);
    }
}

/* What the numbers alone do not say: why n is less than observed, why a mean has no interval, which interval stands there.
 * The counts are those of the export, counted by R in its flow: 48 observed, 2 not positive, 7 without a baseline. */
static void test_words(void **state) {
    (void)state;
    static const struct {
        const char *case_name, *exhibit, *words;
    } wanted[] = {
        {"messy-drop", "flow", "2 values at 26 weeks not analysed: log10 cannot take them."},
        {"messy-drop", "flow", "7 participants with a value at 26 weeks not analysed: no baseline, and the plan drops those."},
        {"messy-drop", "effect", "Not estimable with the robust standard error: one participant alone decides a term"},
        {"messy-drop", "effect", "robust (HC3) standard error because the planned allocation is unequal, t with 29 df"},
        {"messy-mean", "effect", "3 participants have a value that log10 cannot take; such values are out of this analysis."},
        {"btheb", "change-by-arm", "with 90% CI (classical standard error)"},
        {"btheb", "effect", "Computer minus Usual care"},
    };
    for (size_t i = 0; i < sizeof wanted / sizeof *wanted; i++) {
        struct exhibit_case c;
        struct renderings r;
        open_case(&c, wanted[i].case_name);
        render(&c, wanted[i].exhibit, NULL, 0, &r, NULL);
        if (!strstr(r.text.data, wanted[i].words)) {
            fail_msg("%s of %s does not say: %s", wanted[i].exhibit, wanted[i].case_name, wanted[i].words);
        }
        renderings_release(&r);
        case_close(&c);
    }
}

/* Nothing in the table of values that no test reads. */
static void test_every_case_is_read(void **state) {
    (void)state;
    char *values = file_text("values", ".csv", true);
    for (const char *at = values; (at = strstr(at, "\n> ")); at++) {
        bool known = false;
        for (size_t i = 0; i < CASES; i++) {
            size_t length = strlen(cases[i]);
            known |= strncmp(at + 3, cases[i], length) == 0 && at[3 + length] == ' ';
        }
        assert_true(known);
    }
    memory_free(values);
}

int main(void) {
    struct CMUnitTest tests[CASES + 2];
    for (size_t i = 0; i < CASES; i++) {
        tests[i] = (struct CMUnitTest){cases[i], test_case, NULL, NULL, (void *)(uintptr_t)cases[i]};
    }
    tests[CASES] = (struct CMUnitTest)cmocka_unit_test(test_every_case_is_read);
    tests[CASES + 1] = (struct CMUnitTest)cmocka_unit_test(test_words);
    return cmocka_run_group_tests_name("reference/pipeline", tests, NULL, NULL);
}
