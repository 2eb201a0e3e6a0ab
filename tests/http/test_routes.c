/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Every route through the dispatcher, without a port. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <cmocka.h>
#include "exhibits/registry.h"
#include "fixture.h"
#include "http/assets.h"
#include <pthread.h>
#include <sys/stat.h>

static cJSON *json_of(const struct reply *reply) {
    cJSON *json = cJSON_Parse(reply->body.data);
    if (!json) {
        fail_msg("not JSON: %s", reply->body.data);
    }
    assert_string_equal(reply->content_type, "application/json");
    return json;
}

static uint32_t version_of(const struct house *house) {
    struct reply reply;
    ask(house, "GET", "/exhibit/decisions.json", NULL, &reply);
    assert_int_equal(reply.status, 200);
    cJSON *json = json_of(&reply);
    uint32_t version = (uint32_t)cJSON_GetObjectItem(json, "version")->valuedouble;
    cJSON_Delete(json);
    reply_release(&reply);
    return version;
}

static void the_page_and_its_files_come_from_the_table(void **state) {
    const struct house *house = *state;
    for (const struct web_asset *asset = web_assets; asset->path; asset++) {
        struct reply reply;
        ask(house, "GET", asset->path, NULL, &reply);
        assert_int_equal(reply.status, 200);
        assert_int_equal(reply.body.length, asset->length);
        assert_memory_equal(reply.body.data, asset->bytes, asset->length);
        const char *ending = strrchr(asset->path, '.');
        const char *type = strcmp(ending, ".html") == 0  ? "text/html; charset=utf-8"
                           : strcmp(ending, ".js") == 0  ? "text/javascript; charset=utf-8"
                           : strcmp(ending, ".css") == 0 ? "text/css; charset=utf-8"
                                                         : reply.content_type;
        assert_string_equal(reply.content_type, type);
        /* asked again with its tag there is nothing to send */
        struct request request = plain_request(house, "GET");
        char tag[64];
        snprintf(tag, sizeof tag, "%s", reply_header_of(&reply, "ETag"));
        reply_release(&reply);
        request.if_none_match = tag;
        send_to(house, &request, asset->path, NULL, 0, &reply);
        assert_int_equal(reply.status, 304);
        assert_int_equal(reply.body.length, 0);
        reply_release(&reply);
        request.if_none_match = "\"other\"";
        send_to(house, &request, asset->path, NULL, 0, &reply);
        assert_int_equal(reply.status, 200);
        reply_release(&reply);
    }
    struct reply page, file;
    ask(house, "GET", "/", NULL, &page);
    ask(house, "HEAD", "/index.html", NULL, &file);
    assert_string_equal(page.body.data, file.body.data); /* the listener leaves the body of HEAD out */
    reply_release(&page);
    reply_release(&file);
}

static void every_exhibit_is_served_in_its_four_forms(void **state) {
    const struct house *house = *state;
    static const struct pair forms[] = {{"", "text/html; charset=utf-8"}, {".json", "application/json"},
        {".csv", "text/csv; charset=utf-8"}, {".svg", "image/svg+xml"}};
    for (size_t i = 0; exhibits[i]; i++) {
        for (size_t j = 0; j < 4; j++) {
            char target[96];
            struct reply reply;
            snprintf(target, sizeof target, "/exhibit/%s%s%s", exhibits[i]->name, forms[j].name,
                strcmp(exhibits[i]->name, "participant") == 0 ? "?participant=none" : "");
            ask(house, "GET", target, NULL, &reply);
            if (reply.status == 200) {
                assert_string_equal(reply.content_type, forms[j].value);
                assert_true(reply.body.length > 0);
                assert_true((reply_header_of(&reply, "Content-Disposition") != NULL) == (j >= 2));
            } else {
                assert_true(reply.status == 404 || reply.status == 403 || reply.status == 400);
                assert_true(*sentence_of(&reply));
            }
            assert_string_equal(reply_header_of(&reply, "Cache-Control"), "no-store");
            reply_release(&reply);
        }
    }
}

static void a_kept_file_is_named_after_exhibit_and_version(void **state) {
    const struct house *house = *state;
    struct reply reply;
    ask(house, "GET", "/exhibit/decisions.csv", NULL, &reply);
    char wanted[96];
    snprintf(wanted, sizeof wanted, "attachment; filename=\"decisions-after-decision-%u.csv\"", version_of(house));
    assert_string_equal(reply_header_of(&reply, "Content-Disposition"), wanted);
    reply_release(&reply);
}

static void the_meeting_view_is_for_html_and_figures(void **state) {
    const struct house *house = *state;
    static const struct {
        const char *target;
        unsigned status;
    } cases[] = {{"/exhibit/decisions?meeting=1", 200}, {"/exhibit/decisions?meeting=2", 400},
        {"/exhibit/decisions.json?meeting=1", 400}, {"/exhibit/decisions.csv?meeting=1", 400}};
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        struct reply reply;
        ask(house, "GET", cases[i].target, NULL, &reply);
        assert_int_equal(reply.status, cases[i].status);
        reply_release(&reply);
    }
}

static void decisions_move_the_version_and_a_late_one_conflicts(void **state) {
    const struct house *house = *state;
    uint32_t before = version_of(house);
    char body[512];
    struct reply reply;
    snprintf(body, sizeof body,
        "{\"version\": %u, \"by\": \"B Decider, data manager\", \"decisions\": [{\"kind\": \"note\", \"exhibit\": "
        "\"decisions\", "
        "\"text\": \"Seen.\"}]}",
        before);
    ask(house, "POST", "/decisions", body, &reply);
    if (reply.status != 200) {
        fail_msg("%u %s", reply.status, reply.body.data);
    }
    cJSON *json = json_of(&reply);
    assert_int_equal((uint32_t)cJSON_GetObjectItem(json, "version")->valuedouble, before + 1);
    cJSON_Delete(json);
    reply_release(&reply);
    assert_int_equal(version_of(house), before + 1);

    ask(house, "POST", "/decisions", body, &reply); /* the same version seen again */
    assert_int_equal(reply.status, 409);
    json = json_of(&reply);
    assert_true(*cJSON_GetObjectItem(json, "fault")->valuestring);
    assert_int_equal((uint32_t)cJSON_GetObjectItem(json, "version")->valuedouble, before + 1);
    cJSON_Delete(json);
    reply_release(&reply);
    assert_int_equal(version_of(house), before + 1);

    ask(house, "GET", "/exhibit/decisions.json", NULL, &reply);
    assert_non_null(strstr(reply.body.data, "B Decider, data manager"));
    reply_release(&reply);
}

static void the_decider_is_remembered_in_the_session(void **state) {
    const struct house *house = *state;
    char body[512];
    struct reply reply;
    snprintf(body, sizeof body,
        "{\"version\": %u, \"by\": \"C Remembered, statistician\", \"decisions\": [{\"kind\": \"note\", \"exhibit\": "
        "\"decisions\", "
        "\"text\": \"One.\"}]}",
        version_of(house));
    ask(house, "POST", "/decisions", body, &reply);
    assert_int_equal(reply.status, 200);
    reply_release(&reply);
    snprintf(body, sizeof body,
        "{\"version\": %u, \"decisions\": [{\"kind\": \"note\", \"exhibit\": \"decisions\", \"text\": \"Two.\"}]}",
        version_of(house));
    ask(house, "POST", "/decisions", body, &reply);
    assert_int_equal(reply.status, 200);
    reply_release(&reply);
    ask(house, "GET", "/exhibit/decisions.json", NULL, &reply);
    cJSON *json = json_of(&reply);
    const cJSON *list = cJSON_GetObjectItem(json, "decisions");
    const cJSON *last = cJSON_GetArrayItem(list, cJSON_GetArraySize(list) - 1);
    assert_string_equal(cJSON_GetObjectItem(last, "by")->valuestring, "C Remembered, statistician");
    cJSON_Delete(json);
    reply_release(&reply);
}

static void refused_decisions_name_their_entry_and_record_nothing(void **state) {
    const struct house *house = *state;
    uint32_t before = version_of(house);
    char body[1024];
    struct reply reply;
    snprintf(body, sizeof body,
        "{\"version\": %u, \"by\": \"B, x\", \"decisions\": [{\"kind\": \"note\", \"exhibit\": \"decisions\", "
        "\"text\": \"Good.\"}, "
        "{\"kind\": \"correct\", \"column\": \"age\", \"participant\": \"nobody\", \"from\": \"1\", \"to\": \"2\", "
        "\"reason\": \"r\"}]}",
        before);
    ask(house, "POST", "/decisions", body, &reply);
    assert_true(reply.status == 400 || reply.status == 404);
    cJSON *json = json_of(&reply);
    assert_int_equal((int)cJSON_GetObjectItem(json, "row")->valuedouble, 2);
    assert_true(cJSON_IsNull(cJSON_GetObjectItem(json, "column")));
    cJSON_Delete(json);
    reply_release(&reply);
    assert_int_equal(version_of(house), before);
}

static void without_a_study_the_folder_is_listed(void **state) {
    const struct house *house = *state;
    char path[128];
    snprintf(path, sizeof path, "%s/folder.study", house->folder);
    assert_int_equal(mkdir(path, 0755), 0);
    snprintf(path, sizeof path, "%s/another.study", house->folder);
    FILE *file = fopen(path, "w");
    assert_non_null(file);
    fclose(file);
    struct reply reply;
    ask(house, "GET", "/agenda.json", NULL, &reply);
    cJSON *json = json_of(&reply);
    assert_true(cJSON_IsNull(cJSON_GetObjectItem(json, "study")));
    assert_non_null(strstr(cJSON_GetObjectItem(json, "folder")->valuestring, "evenhand-test-"));
    char *studies = cJSON_PrintUnformatted(cJSON_GetObjectItem(json, "studies"));
    assert_string_equal(studies, "[\"another.study\",\"quayside.study\"]");
    free(studies);
    cJSON_Delete(json);
    reply_release(&reply);
    unlink(path);
}

static void a_study_is_made_from_a_dropped_file_by_the_guesses_alone(void **state) {
    const struct house *house = *state;
    struct request request = plain_request(house, "POST");
    struct reply reply;
    send_to(house, &request, "/drafts?name=export.csv", house->quayside.export_csv.data,
        house->quayside.export_csv.length, &reply);
    assert_int_equal(reply.status, 200);
    cJSON *draft = json_of(&reply);
    cJSON *guess = cJSON_GetObjectItem(draft, "guess");
    assert_string_equal(cJSON_GetObjectItem(guess, "participant")->valuestring, "pid");
    assert_int_equal(cJSON_GetArraySize(cJSON_GetObjectItem(guess, "columns")), 13);
    cJSON *ask_for = cJSON_CreateObject();
    cJSON_AddNumberToObject(ask_for, "draft", cJSON_GetObjectItem(draft, "draft")->valuedouble);
    cJSON_AddStringToObject(ask_for, "file", "made here.study");
    cJSON_AddItemToObject(ask_for, "plan", cJSON_DetachItemFromObject(draft, "plan"));
    cJSON_AddStringToObject(ask_for, "by", "D Loader, data manager");
    char *body = cJSON_PrintUnformatted(ask_for);
    cJSON_Delete(ask_for);
    cJSON_Delete(draft);
    reply_release(&reply);

    ask(house, "POST", "/studies", body, &reply);
    if (reply.status != 201) {
        fail_msg("%u %s", reply.status, reply.body.data);
    }
    cJSON *made = json_of(&reply);
    assert_string_equal(cJSON_GetObjectItem(made, "file")->valuestring, "made here.study");
    assert_non_null(strstr(cJSON_GetObjectItem(made, "account")->valuestring, "241 records"));
    cJSON_Delete(made);
    reply_release(&reply);
    char path[128];
    snprintf(path, sizeof path, "%s/made here.study", house->folder);
    assert_int_equal(access(path, F_OK), 0);

    ask(house, "GET", "/exhibit/decisions.json", NULL, &reply); /* it is open */
    assert_int_equal(reply.status, 200);
    assert_non_null(strstr(reply.body.data, "D Loader, data manager"));
    reply_release(&reply);

    ask(house, "POST", "/studies", body, &reply); /* one at a time */
    assert_int_equal(reply.status, 409);
    reply_release(&reply);
    ask(house, "POST", "/close", "{}", &reply);
    assert_int_equal(reply.status, 200);
    assert_string_equal(reply.body.data, "{\"closed\":true}");
    reply_release(&reply);
    ask(house, "POST", "/studies", body, &reply); /* the draft is used up */
    assert_int_equal(reply.status, 404);
    assert_string_equal(sentence_of(&reply), "that file is no longer at hand; drop it on the page again");
    reply_release(&reply);
    free(body);
}

/* ---- several files ---- */

static const char people[] = "pid,arm,sex\nA1,x,F\nA2,y,M\nA3,x,F\nA4,y,M\nA5,x,F\nA6,y,M\n";
static const char visits[] =
    "pid,visit,pain\nA1,V0,40\nA1,V8,31\nA2,V0,52\nA2,V8,50\nA3,V0,43\nA3,V8,33\nA4,V0,61\nA4,V8,57\n"
    "A5,V0,38\nA5,V8,30\nA6,V0,47\nA6,V8,46\n";

static cJSON *draft_with(const struct house *house, const char *name, const char *csv, double draft) {
    char target[96];
    struct reply reply;
    snprintf(target, sizeof target, draft > 0 ? "/drafts?name=%s&draft=%.0f" : "/drafts?name=%s", name, draft);
    ask(house, "POST", target, csv, &reply);
    if (reply.status != 200) {
        fail_msg("%u %s", reply.status, reply.body.data);
    }
    cJSON *answer = json_of(&reply);
    reply_release(&reply);
    return answer;
}

static const char *in_guess(const cJSON *answer, int file, const char *key) {
    const cJSON *files = cJSON_GetObjectItem(cJSON_GetObjectItem(answer, "guess"), "files");
    const cJSON *value = cJSON_GetObjectItem(cJSON_GetArrayItem(files, file), key);
    return cJSON_IsString(value) ? value->valuestring : NULL;
}

static int files_in(const cJSON *answer) {
    return cJSON_GetArraySize(cJSON_GetObjectItem(cJSON_GetObjectItem(answer, "guess"), "files"));
}

static double id_of(const cJSON *answer) {
    return cJSON_GetObjectItem(answer, "draft")->valuedouble;
}

static void a_study_is_made_from_two_files(void **state) {
    const struct house *house = *state;
    struct reply reply;
    cJSON *first = draft_with(house, "visits.csv", visits, 0);
    assert_string_equal(in_guess(first, 0, "layout"), "visit");
    cJSON *both = draft_with(house, "people.csv", people, id_of(first));
    assert_true(id_of(both) == id_of(first));
    assert_int_equal(files_in(both), 2);
    char target[96];
    snprintf(target, sizeof target, "/drafts?name=people.csv&draft=%.0f", id_of(first));
    ask(house, "POST", target, "id,x\n1\n", &reply); /* leaves the draft as it was */
    assert_int_equal(reply.status, 400);
    reply_release(&reply);
    cJSON *ask_for = cJSON_CreateObject();
    cJSON_AddNumberToObject(ask_for, "draft", id_of(both));
    cJSON_AddStringToObject(ask_for, "file", "two.study");
    cJSON_AddItemToObject(ask_for, "plan", cJSON_DetachItemFromObject(both, "plan"));
    cJSON_AddStringToObject(ask_for, "by", "D Loader, data manager");
    char *body = cJSON_PrintUnformatted(ask_for);
    ask(house, "POST", "/studies", body, &reply);
    if (reply.status != 201) {
        fail_msg("%u %s", reply.status, reply.body.data);
    }
    cJSON *made = json_of(&reply);
    assert_non_null(strstr(cJSON_GetObjectItem(made, "account")->valuestring, "visits.csv"));
    reply_release(&reply);
    ask(house, "GET", "/exhibit/flow.json", NULL, &reply);
    assert_int_equal(reply.status, 200);
    reply_release(&reply);
    ask(house, "POST", "/close", "{}", &reply);
    reply_release(&reply);
    free(body);
    cJSON_Delete(ask_for);
    cJSON_Delete(made);
    cJSON_Delete(first);
    cJSON_Delete(both);
}

static void what_is_said_of_files_is_guessed_with_and_files_are_taken_out(void **state) {
    const struct house *house = *state;
    struct reply reply;
    char body[512];
    cJSON *first = draft_with(house, "visits.csv", visits, 0),
          *both = draft_with(house, "people.csv", people, id_of(first));
    static const struct {
        const char *files;
        unsigned status;
        const char *wanted; /* a part of the answer */
    } asked[] = {
        {"[{\"name\":\"visits.csv\",\"layout\":\"participant\"},{\"name\":\"people.csv\"}]", 200,
            "\"layout\":\"participant\",\"participant\":\"pid\""},
        {"[{\"name\":\"visits.csv\",\"layout\":\"visit\",\"visit\":\"visit\",\"codes\":[\"V8\",\"V0\"]},{\"name\":"
         "\"people.csv\"}]",
            200, "\"codes\":[\"V8\",\"V0\"]"},
        {"[{\"name\":\"visits.csv\",\"layout\":\"table\"}]", 400, "must be \\\"participant\\\" or \\\"visit\\\""},
        {"[{\"name\":\"visits.csv\",\"codes\":[\"V8\",\"V8\"]}]", 400, "lists \\\"V8\\\" twice"},
        {"[{\"name\":\"visits.csv\",\"codes\":\"V8\"}]", 400, "must be a list of at most 80 visit codes"},
        {"[{\"name\":\"visits.csv\",\"participant\":5}]", 400,
            "\\\"participant\\\" of a file must be a text in quotes"},
        {"[{\"name\":\"visits.csv\"},{\"name\":\"visits.csv\"}]", 400, "names \\\"visits.csv\\\" twice"},
        {"[{\"name\":\"x.csv\"}]", 400, "no such file has been dropped"}, {"[5]", 400, "must list objects"},
        {"[{\"name\":\"people.csv\"}]", 200, "\"name\":\"people.csv\""},
        {"[{\"name\":\"people.csv\"},{\"name\":\"visits.csv\"}]", 400,
            "no such file has been dropped"}, /* it was taken out */
    };
    for (size_t i = 0; i < sizeof asked / sizeof *asked; i++) {
        snprintf(body, sizeof body, "{\"draft\":%.0f,\"files\":%s}", id_of(first), asked[i].files);
        ask(house, "POST", "/guesses", body, &reply);
        if (reply.status != asked[i].status || !strstr(reply.body.data, asked[i].wanted)) {
            fail_msg("%s\n%u %s", asked[i].files, reply.status, reply.body.data);
        }
        reply_release(&reply);
    }
    cJSON_Delete(first);
    cJSON_Delete(both);
    cJSON *again = draft_with(house, "people.csv", people, 0);
    cJSON *same = draft_with(house, "people.csv", "id,x\n1,2\n2,3\n", id_of(again)); /* the same name: in its place */
    assert_int_equal(files_in(same), 1);
    assert_null(strstr(cJSON_GetObjectItem(cJSON_GetObjectItem(same, "guess"), "name")->valuestring, "visits"));
    cJSON_Delete(again);
    cJSON_Delete(same);
}

static void a_refused_plan_leaves_the_draft_and_no_file(void **state) {
    const struct house *house = *state;
    struct reply reply;
    ask(house, "POST", "/drafts?name=small.csv", "id,x\nA,1\nB,2\n", &reply);
    cJSON *draft = json_of(&reply);
    double id = cJSON_GetObjectItem(draft, "draft")->valuedouble;
    cJSON_Delete(draft);
    reply_release(&reply);
    char body[512];
    for (int again = 0; again < 2; again++) { /* the second time the draft is there still */
        snprintf(body, sizeof body,
            "{\"draft\": %.0f, \"file\": \"small.study\", \"plan\": {\"title\": \"T\"}, \"by\": \"E, x\"}", id);
        ask(house, "POST", "/studies", body, &reply);
        assert_int_equal(reply.status, 400);
        assert_int_equal(strncmp(sentence_of(&reply), "the plan: ", 10), 0);
        reply_release(&reply);
    }
    char path[128];
    snprintf(path, sizeof path, "%s/small.study", house->folder);
    assert_int_not_equal(access(path, F_OK), 0);
}

static void old_drafts_make_room(void **state) {
    const struct house *house = *state;
    struct reply reply;
    double first = 0;
    for (int i = 0; i < 6; i++) {
        ask(house, "POST", "/drafts?name=small.csv", "id,x\nA,1\nB,2\n", &reply);
        cJSON *draft = json_of(&reply);
        first = i ? first : cJSON_GetObjectItem(draft, "draft")->valuedouble;
        cJSON_Delete(draft);
        reply_release(&reply);
    }
    char body[256];
    snprintf(body, sizeof body, "{\"draft\": %.0f, \"file\": \"small.study\", \"plan\": {}, \"by\": \"E, x\"}", first);
    ask(house, "POST", "/studies", body, &reply);
    assert_int_equal(reply.status, 404);
    reply_release(&reply);
}

static void a_study_is_opened_and_closed(void **state) {
    const struct house *house = *state;
    struct reply reply;
    for (int again = 0; again < 2; again++) {
        ask(house, "GET", "/exhibit/decisions", NULL, &reply);
        assert_int_equal(reply.status, 404);
        assert_string_equal(sentence_of(&reply), "no study is open; open or make one on the first page");
        reply_release(&reply);
        ask(house, "POST", "/open", "{\"file\": \"quayside.study\"}", &reply);
        if (reply.status != 200) {
            fail_msg("%s", reply.body.data);
        }
        reply_release(&reply);
        ask(house, "GET", "/exhibit/decisions", NULL, &reply);
        assert_int_equal(reply.status, 200);
        reply_release(&reply);
        ask(house, "GET", "/agenda.json", NULL, &reply);
        assert_int_equal(reply.status, 200);
        reply_release(&reply);
        ask(house, "POST", "/open", "{\"file\": \"quayside.study\"}", &reply);
        assert_int_equal(reply.status, 409);
        reply_release(&reply);
        ask(house, "POST", "/close", NULL, &reply);
        assert_int_equal(reply.status, 200);
        reply_release(&reply);
        ask(house, "POST", "/close", NULL, &reply);
        assert_int_equal(reply.status, 404);
        assert_string_equal(sentence_of(&reply), "no study is open, so there is none to close");
        reply_release(&reply);
    }
}

/* Requests on many threads while the study is closed and opened under them: each gets a whole answer. */
static void *keep_asking(void *closure) {
    const struct house *house = closure;
    for (int i = 0; i < 40; i++) {
        struct reply reply;
        ask(house, "GET", "/exhibit/decisions.json", NULL, &reply);
        if (reply.status != 200 && reply.status != 404) {
            reply_release(&reply);
            return (void *)1;
        }
        reply_release(&reply);
    }
    return NULL;
}

static void closing_waits_for_running_requests(void **state) {
    struct house *house = *state;
    pthread_t threads[4];
    struct fault fault;
    fault_init(&fault);
    server_open_study(house->state, house->study, &fault);
    for (size_t i = 0; i < 4; i++) {
        assert_int_equal(pthread_create(&threads[i], NULL, keep_asking, house), 0);
    }
    for (int i = 0; i < 10; i++) {
        fault_init(&fault);
        assert_true(server_close_study(house->state, &fault));
        assert_true(server_open_study(house->state, house->study, &fault));
    }
    for (size_t i = 0; i < 4; i++) {
        void *wrong = NULL;
        pthread_join(threads[i], &wrong);
        assert_null(wrong);
    }
    fault_init(&fault);
    assert_true(server_close_study(house->state, &fault));
}

#define WITH_STUDY(test) cmocka_unit_test_setup_teardown(test, house_open, house_leave)
#define WITHOUT_STUDY(test) cmocka_unit_test_setup_teardown(test, house_closed, house_leave)

int main(void) {
    const struct CMUnitTest tests[] = {
        WITH_STUDY(the_page_and_its_files_come_from_the_table),
        WITH_STUDY(every_exhibit_is_served_in_its_four_forms),
        WITH_STUDY(a_kept_file_is_named_after_exhibit_and_version),
        WITH_STUDY(the_meeting_view_is_for_html_and_figures),
        WITH_STUDY(decisions_move_the_version_and_a_late_one_conflicts),
        WITH_STUDY(the_decider_is_remembered_in_the_session),
        WITH_STUDY(refused_decisions_name_their_entry_and_record_nothing),
        WITHOUT_STUDY(without_a_study_the_folder_is_listed),
        WITHOUT_STUDY(a_study_is_made_from_a_dropped_file_by_the_guesses_alone),
        WITHOUT_STUDY(a_study_is_made_from_two_files),
        WITHOUT_STUDY(what_is_said_of_files_is_guessed_with_and_files_are_taken_out),
        WITHOUT_STUDY(a_refused_plan_leaves_the_draft_and_no_file),
        WITHOUT_STUDY(old_drafts_make_room),
        WITHOUT_STUDY(a_study_is_opened_and_closed),
        WITHOUT_STUDY(closing_waits_for_running_requests),
    };
    return cmocka_run_group_tests_name("http/routes", tests, NULL, NULL);
}
