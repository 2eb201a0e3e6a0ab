/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What the tests of exhibits share: a study in a folder of its own, made from the invented trial or from a CSV in the
 * test, and all five renderings of an exhibit with the checks that hold for any. Include after cmocka.h. */
#ifndef EVENHAND_TESTS_EXHIBIT_CASE_H
#define EVENHAND_TESTS_EXHIBIT_CASE_H
#include "base/memory.h"
#include "demo/quayside.h"
#include "exhibits/registry.h"
#include "near.h"
#include "stats/estimate.h"
#include <cJSON.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

struct exhibit_case {
    char folder[64], path[96];
    struct study *study;
};

struct renderings {
    struct text text, json, csv, html, meeting, svg, meeting_svg; /* svg empty where there is no figure */
    cJSON *parsed;
};

static inline void case_open_files(struct exhibit_case *c, const struct study_file *files, size_t count, const char *plan) {
    stats_init();
    *c = (struct exhibit_case){.folder = "/tmp/evenhand-test-XXXXXX"};
    assert_non_null(mkdtemp(c->folder));
    snprintf(c->path, sizeof c->path, "%s/trial.study", c->folder);
    struct fault fault;
    fault_init(&fault);
    if (!study_create_from(c->path, files, count, "plan.json", plan, strlen(plan), "M. Tide, statistician", NULL, &fault)) {
        fail_msg("%s", fault.message);
    }
    c->study = study_open(c->path, &fault);
    if (!c->study) {
        fail_msg("%s", fault.message);
    }
}

static inline void case_open(struct exhibit_case *c, const char *csv, const char *plan) {
    const struct study_file file = {"export.csv", csv, strlen(csv)};
    case_open_files(c, &file, 1, plan);
}

/* The text with every `from` replaced; the caller frees it. */
static inline char *replaced(const char *text, const char *from, const char *to) {
    struct text out;
    text_init(&out);
    for (const char *at; (at = strstr(text, from)); text = at + strlen(from)) {
        text_append(&out, text, (size_t)(at - text));
        text_string(&out, to);
    }
    text_string(&out, text);
    char *bytes = text_take(&out);
    text_release(&out); /* taking leaves an empty text behind */
    return bytes;
}

static inline void case_decide(struct exhibit_case *c, const struct text *decisions) {
    struct fault fault;
    fault_init(&fault);
    uint32_t version;
    if (!study_decide(c->study, "M. Tide, statistician", decisions->data, decisions->length, "decisions.json", ANY_VERSION, &version,
            &fault)) {
        fail_msg("%s", fault.message);
    }
}

/* The Quayside Walking Trial, as exported or after the right decisions, in a state of blinding. */
static inline void case_quayside(struct exhibit_case *c, const char *blinding, bool decided) {
    struct quayside quayside;
    quayside_make(QUAYSIDE_SEED, &quayside);
    char wanted[64];
    snprintf(wanted, sizeof wanted, "\"blinding\": \"%s\"", blinding);
    char *plan = replaced(quayside.plan_json.data, "\"blinding\": \"coded\"", wanted);
    case_open(c, quayside.export_csv.data, plan);
    memory_free(plan);
    if (decided) {
        case_decide(c, &quayside.decisions_json);
    }
    quayside_release(&quayside);
}

/* The same trial as its data base would give it out in four files; a seed may be given. */
static inline void case_quayside_files(struct exhibit_case *c, uint64_t seed, const char *blinding, bool decided) {
    struct quayside_files quayside;
    quayside_make_files(seed, &quayside);
    const struct study_file files[] = {{"labs.csv", quayside.labs_csv.data, quayside.labs_csv.length},
        {"people.csv", quayside.people_csv.data, quayside.people_csv.length},
        {"visits.csv", quayside.visits_csv.data, quayside.visits_csv.length},
        {"events.csv", quayside.events_csv.data, quayside.events_csv.length}};
    char wanted[64];
    snprintf(wanted, sizeof wanted, "\"blinding\": \"%s\"", blinding);
    char *plan = replaced(quayside.plan_json.data, "\"blinding\": \"coded\"", wanted);
    case_open_files(c, files, 4, plan);
    memory_free(plan);
    if (decided) {
        case_decide(c, &quayside.decisions_json);
    }
    quayside_files_release(&quayside);
}

static inline void case_close(struct exhibit_case *c) {
    char command[128];
    study_close(c->study);
    snprintf(command, sizeof command, "rm -rf '%s'", c->folder);
    assert_int_equal(system(command), 0);
}

static inline void renderings_init(struct renderings *r) {
    struct text *const all[] = {&r->text, &r->json, &r->csv, &r->html, &r->meeting, &r->svg, &r->meeting_svg};
    for (size_t i = 0; i < sizeof all / sizeof *all; i++) {
        text_init(all[i]);
    }
    r->parsed = NULL;
}

static inline void renderings_release(struct renderings *r) {
    struct text *const all[] = {&r->text, &r->json, &r->csv, &r->html, &r->meeting, &r->svg, &r->meeting_svg};
    for (size_t i = 0; i < sizeof all / sizeof *all; i++) {
        text_release(all[i]);
    }
    cJSON_Delete(r->parsed);
}

/* Well-formed as far as tags go: every start tag has its end tag in order (svg and XML have no void elements). */
static inline void assert_well_formed(const char *xml) {
    const char *stack[64];
    size_t depth = 0, length[64];
    for (const char *at = xml; (at = strchr(at, '<')); at++) {
        const char *end = strchr(at, '>');
        assert_non_null(end);
        if (at[1] == '/') {
            assert_true(depth > 0);
            depth--;
            assert_int_equal((size_t)(end - at) - 2, length[depth]);
            assert_memory_equal(at + 2, stack[depth], length[depth]);
        } else if (end[-1] != '/') {
            assert_true(depth < 64);
            stack[depth] = at + 1;
            length[depth++] = strcspn(at + 1, " >");
        }
    }
    assert_int_equal(depth, 0);
}

static inline void assert_common(const struct view *view, struct renderings *r) {
    assert_true(r->text.length > 40 && r->csv.length > 10 && r->html.length > 100 && r->meeting.length > 100);
    r->parsed = cJSON_ParseWithOpts(r->json.data, NULL, true);
    assert_non_null(r->parsed);
    static const char *const fields[] = {
        "exhibit", "title", "version", "data_sha256", "state_sha256", "blinding", "set", "arguments", "notes"};
    for (size_t i = 0; i < sizeof fields / sizeof *fields; i++) {
        assert_non_null(cJSON_GetObjectItemCaseSensitive(r->parsed, fields[i]));
    }
    assert_string_equal(cJSON_GetObjectItemCaseSensitive(r->parsed, "exhibit")->valuestring, view->exhibit->name);
    assert_non_null(strstr(r->text.data, view->title));
    assert_int_equal(r->svg.length > 0, view->exhibit->figure != NULL);
    assert_well_formed(r->svg.data);
    assert_well_formed(r->meeting_svg.data);
}

/* Makes the exhibit and all its renderings; false where it is refused, with the sentence in `fault` (may be NULL: then
 * it must not be). The arena may be released afterwards. */
static inline bool render(struct exhibit_case *c, const char *name, const struct asked *asked, size_t asked_count,
    struct renderings *r, struct fault *fault) {
    struct arena arena;
    struct view view;
    struct fault own;
    arena_init(&arena);
    fault_init(&own);
    renderings_init(r);
    bool made = view_make(&view, c->study, name, asked, asked_count, "M. Tide, statistician", &arena, &own);
    if (made) {
        view_text(&view, &r->text);
        view_json(&view, &r->json);
        view_csv(&view, &r->csv);
        view_html(&view, false, &r->html);
        view_html(&view, true, &r->meeting);
        view_svg(&view, false, &r->svg);
        view_svg(&view, true, &r->meeting_svg);
        assert_common(&view, r);
        view_release(&view);
    } else if (!fault) {
        fail_msg("%s", own.message);
    } else {
        *fault = own;
    }
    arena_release(&arena);
    return made;
}

/* ---- reading what came out ---- */

static inline const cJSON *field(const cJSON *object, const char *name) {
    const cJSON *found = cJSON_GetObjectItemCaseSensitive(object, name);
    if (!found) {
        fail_msg("no field %s", name);
    }
    return found;
}

static inline double number_at(const cJSON *object, const char *name) {
    const cJSON *found = field(object, name);
    return cJSON_IsNull(found) ? (double)NAN : found->valuedouble;
}

static inline const char *string_at(const cJSON *object, const char *name) {
    return cJSON_GetStringValue(field(object, name));
}

/* The member of an array whose field is this text. */
static inline const cJSON *member_with(const cJSON *array, const char *name, const char *value) {
    const cJSON *member;
    cJSON_ArrayForEach(member, array) {
        if (strcmp(string_at(member, name), value) == 0) {
            return member;
        }
    }
    fail_msg("no member with %s %s", name, value);
    return NULL;
}
#endif
