/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Broken files, plans and requests, each with the sentence a person gets for it. Structure of CSV: RFC 4180; of JSON:
 * RFC 8259; the sentences are our own. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <cmocka.h>
#include "fixture.h"

/* Compares; "FOLDER" in the sentence stands for the house's folder. */
static int same(
    const struct house *house, const char *what, const struct reply *reply, unsigned status, const char *sentence) {
    char wanted[1024];
    const char *folder = strstr(sentence, "FOLDER"), *got = sentence_of(reply);
    snprintf(wanted, sizeof wanted, "%.*s%s%s", (int)(folder ? folder - sentence : 0), sentence,
        folder ? house->folder : "", folder ? folder + strlen("FOLDER") : sentence);
    if (reply->status == status && strcmp(got, wanted) == 0) {
        return 0;
    }
    print_error(
        "%s\n    got    %u %s\n    wanted %u %s\n", what, reply->status, *got ? got : reply->body.data, status, wanted);
    return 1;
}

/* ---- files ---- */

static const struct {
    const char *what, *bytes;
    size_t length;
    int row, column; /* 0: none */
    const char *sentence;
} files[] = {
    {"empty", "", 0, 1, 1, "x.csv, line 1, column 1: the file is empty; export it again and load that"},
    {"only line ends", "\n\n", 2, 1, 1,
        "x.csv, line 1, column 1: no header, only blank lines; the first line must "
        "name the columns; export the file again and load that"},
    {"only spaces", "  \n", 3, 1, 1,
        "x.csv, line 1, column 1: no header, only blank lines; the first line must "
        "name the columns; export the file again and load that"},
    {"only a byte order mark", "\357\273\277", 3, 1, 1,
        "x.csv, line 1, column 1: no header, only blank lines; the first line must "
        "name the columns; export the file again and load that"},
    {"a quote never closed", "id,x\n\"1,2\n", 10, 2, 1,
        "x.csv, line 2, column 1: the quote opened here is never closed; close it "
        "or take it out and load again"},
    {"a field too many", "id,x\n1,2,3\n", 11, 2, 3,
        "x.csv, line 2, column 3: 3 fields where the header has 2; mend the line "
        "or its quotes and load again"},
    {"a field too few", "id,x\n1\n", 7, 2, 1,
        "x.csv, line 2, column 1: 1 field where the header has 2; mend the line or "
        "its quotes and load again"},
    {"a NUL", "id,x\n1,2\000\n", 10, 2, 2,
        "x.csv, line 2, column 2: a NUL byte, which no text file has; export the "
        "file again as text and load that"},
    {"a name twice", "id,id\n1,2\n", 10, 1, 2,
        "x.csv, line 1, column 2: the name id stands in column 1 already; give each "
        "column a name of its own and load again"},
    {"a column without name", "id,,x\n1,2,3\n", 12, 1, 2,
        "x.csv, line 1, column 2: this column has no name in the header; give it one and load again"},
    {"text behind a quoted field", "id,x\n1,\"a\"b\n", 12, 2, 2,
        "x.csv, line 2, column 2: text after a closing quote; a quote inside a quoted "
        "field is written twice; mend the line and load again"},
    {"half a character of UTF-16", "\377\376i\000d\000,\000x", 9, 1, 9,
        "x.csv, line 1, byte 9: half a character of UTF-16 at the end of the file; "
        "save the file as UTF-8 and load that"},
    {"a compressed folder", "PK\003\004\000\000\000", 7, 0, 0,
        "x.csv begins as a spreadsheet (.xlsx) does but is cut short or damaged: it is not a whole zip; copy or export it "
        "again and load that"},
    {"another delimiter in the middle", "id;x\n1;2\n1,2\n", 13, 3, 1,
        "x.csv, line 3, column 1: 1 field where the header has 2; mend the line or "
        "its quotes and load again"},
    {"line ends of every kind", "id,x\r1,2\r\n3,4,5", 15, 3, 3,
        "x.csv, line 3, column 3: 3 fields where the header has 2; mend the line "
        "or its quotes and load again"},
};

static void every_broken_file_gets_its_sentence_and_place(void **state) {
    const struct house *house = *state;
    int wrong = 0;
    for (size_t i = 0; i < sizeof files / sizeof *files; i++) {
        struct request request = plain_request(house, "POST");
        struct reply reply;
        send_to(house, &request, "/drafts?name=x.csv", files[i].bytes, files[i].length, &reply);
        wrong += same(house, files[i].what, &reply, 400, files[i].sentence);
        cJSON *json = cJSON_Parse(reply.body.data);
        const cJSON *row = cJSON_GetObjectItem(json, "row"), *column = cJSON_GetObjectItem(json, "column");
        assert_int_equal(cJSON_IsNumber(row) ? row->valueint : 0, files[i].row);
        assert_int_equal(cJSON_IsNumber(column) ? column->valueint : 0, files[i].column);
        cJSON_Delete(json);
        reply_release(&reply);
    }
    assert_int_equal(wrong, 0);
}

/* ---- plans: one that is right, with one text in it replaced ---- */

static const char right_plan[] = "{\"title\":\"T\",\"participant\":\"id\",\"arm\":{\"column\":\"arm\","
                                 "\"levels\":[{\"code\":\"a\",\"reference\":true},{\"code\":\"b\"}]},"
                                 "\"outcomes\":[{\"id\":\"y\",\"role\":\"primary\",\"better\":\"lower\","
                                 "\"visits\":[{\"label\":\"Baseline\",\"column\":\"y0\"},{\"label\":\"End\","
                                 "\"column\":\"y1\"}]}],\"covariates\":[{\"id\":\"sex\",\"label\":\"Sex\","
                                 "\"column\":\"sex\",\"kind\":\"category\"}]}";
static const char small_export[] = "id,arm,sex,y0,y1\nP1,a,F,1,2\nP2,b,M,2,3\nP3,a,F,3,4\nP4,b,M,4,5\n";

static const struct {
    const char *instead_of, *stands, *sentence;
} plans[] = {
    {"\"title\":\"T\",", "", "the plan: title is missing; a plan needs it"},
    {"\"title\":\"T\"", "\"title\":\"\"", "the plan: title must be a text in quotes that is not empty"},
    {"\"participant\":\"id\",", "", "the plan: participant is missing; a plan needs it"},
    {"\"participant\":\"id\"", "\"participant\":\"zz\"",
        "the plan: the column \"zz\" (the participant's identifier) is not in x.csv, "
        "line 1, which has: id, arm, sex, y0, y1; mend the plan or the header"},
    {"\"column\":\"arm\"", "\"column\":\"zz\"",
        "the plan: the column \"zz\" (the arm) is not in x.csv, line 1, which has: "
        "id, arm, sex, y0, y1; mend the plan or the header"},
    {"\"column\":\"y1\"", "\"column\":\"zz\"",
        "the plan: the column \"zz\" (y, End) is not in x.csv, line 1, which has: "
        "id, arm, sex, y0, y1; mend the plan or the header"},
    {"\"title\":\"T\"", "\"title\":\"T\",\"colour\":1",
        "the plan: the key \"colour\" is not one a plan has here; known are: title "
        "participant arm missing_codes outcomes covariates events adjust_for missing_baseline "
        "subgroups confidence blinding seed site stratified_by standard_error files screening dates derived"},
    {"\"title\":\"T\"", "\"title\":\"T\",\"title\":\"U\"", "the plan: the key \"title\" stands there twice; keep one"},
    {",\"reference\":true", "",
        "the plan: arm.levels must mark exactly one arm as the reference, with \"reference\": true"},
    {"{\"code\":\"b\"}", "{\"code\":\"b\",\"reference\":true}",
        "the plan: arm.levels must mark exactly one arm as the reference, with \"reference\": true"},
    {",{\"code\":\"b\"}", "", "the plan: arm.levels must list two or more arms, each with its code and label"},
    {"{\"code\":\"b\"}", "{\"code\":\"a\"}",
        "the plan: arm.levels[1] has the code of an arm before it; each arm needs its own"},
    {"\"better\":\"lower\"", "\"better\":\"up\"", "the plan: outcomes[0].better must be \"lower\" or \"higher\""},
    {"\"better\":\"lower\"", "\"better\":\"lower\",\"scale\":\"sqrt\"",
        "the plan: outcomes[0].scale must be \"linear\" or \"log10\""},
    {"\"role\":\"primary\"", "\"role\":\"secondary\"",
        "the plan: outcomes has none with \"role\": \"primary\"; a plan needs exactly one"},
    {"\"id\":\"sex\"", "\"id\":\"y\"",
        "the plan: covariates[0].id repeats \"y\"; every outcome, covariate and event needs its own"},
    {"\"column\":\"sex\"", "\"column\":\"arm\"",
        "the plan: the column \"arm\" is both Sex and the arm; a column has one meaning"},
    {"\"kind\":\"category\"", "\"type\":\"category\"",
        "the plan: the key \"type\" in covariates[0] is not one a plan has here; "
        "known are: id label column file visit kind levels unit eligible plausible bands missing_codes"},
    {"\"kind\":\"category\"", "\"kind\":\"category\",\"bands\":[1]",
        "the plan: covariates[0] is a category; bands, eligible and plausible belong to numbers"},
    {"\"kind\":\"category\"", "\"kind\":\"number\",\"bands\":[2,1]",
        "the plan: covariates[0].bands must be a list of increasing cut points, such as [55, 65]"},
    {"\"better\":\"lower\"", "\"better\":\"lower\",\"plausible\":[5,1]",
        "the plan: outcomes[0].plausible must be two numbers, the lower first, such as [70, 260]"},
    {"\"title\":\"T\"", "\"title\":\"T\",\"adjust_for\":[\"bmi\"]",
        "the plan: adjust_for names \"bmi\", which is not the id of a covariate of this plan"},
    {"\"title\":\"T\"", "\"title\":\"T\",\"subgroups\":[\"bmi\"]",
        "the plan: subgroups names \"bmi\", which is not the id of a covariate of this plan"},
    {"\"title\":\"T\"", "\"title\":\"T\",\"confidence\":95",
        "the plan: confidence must be at least 0.5 and below 1, such as 0.95"},
    {"\"title\":\"T\"", "\"title\":\"T\",\"blinding\":\"masked\"",
        "the plan: blinding must be \"pooled\", \"coded\" or \"unblinded\""},
    {"\"title\":\"T\"", "\"title\":\"T\",\"seed\":-1", "the plan: seed must be a whole number from 0"},
    {"\"title\":\"T\"", "\"title\":\"T\",\"missing_codes\":[999]",
        "the plan: missing_codes must hold texts in quotes only, such as [\"999\"]"},
    {"\"label\":\"End\"", "\"label\":\"Baseline\"",
        "the plan: outcomes[0].visits[1] repeats the label or column of a visit before it"},
    {"\"title\":\"T\"", "\"title\":\"T\",\"missing_baseline\":\"guess\"",
        "the plan: missing_baseline must be \"mean\" or \"drop\""},
};

static int draft_of(const struct house *house) {
    struct reply reply;
    ask(house, "POST", "/drafts?name=x.csv", small_export, &reply);
    assert_int_equal(reply.status, 200);
    cJSON *json = cJSON_Parse(reply.body.data);
    int draft = cJSON_GetObjectItem(json, "draft")->valueint;
    cJSON_Delete(json);
    reply_release(&reply);
    return draft;
}

static void post_plan(
    const struct house *house, int draft, const char *instead_of, const char *stands, struct reply *reply) {
    char body[4096];
    const char *at = strstr(right_plan, instead_of);
    assert_non_null(at);
    snprintf(body, sizeof body,
        "{\"draft\":%d,\"file\":\"x.study\",\"by\":\"A Tester, statistician\",\"plan\":%.*s%s%s}", draft,
        (int)(at - right_plan), right_plan, stands, at + strlen(instead_of));
    ask(house, "POST", "/studies", body, reply);
}

static void every_broken_plan_gets_its_sentence(void **state) {
    const struct house *house = *state;
    int draft = draft_of(house), wrong = 0;
    char path[128];
    snprintf(path, sizeof path, "%s/x.study", house->folder);
    for (size_t i = 0; i < sizeof plans / sizeof *plans; i++) {
        struct reply reply;
        post_plan(house, draft, plans[i].instead_of, plans[i].stands, &reply);
        wrong += same(house, plans[i].stands, &reply, 400, plans[i].sentence);
        assert_int_not_equal(access(path, F_OK), 0); /* nothing was made */
        reply_release(&reply);
    }
    struct reply reply;
    post_plan(house, draft, "\"T\"", "\"T\"", &reply); /* the plan itself is right */
    assert_int_equal(reply.status, 201);
    reply_release(&reply);
    assert_int_equal(wrong, 0);
}

/* ---- requests ---- */

#define VERSION "10" /* of the demonstration as loaded: ten codes for missing from its plan */
#define NOTE "{\"kind\":\"note\",\"exhibit\":\"decisions\",\"text\":\"x\"}"

static const struct {
    const char *method, *target, *body;
    unsigned status;
    const char *sentence;
} requests[] = {
    {"POST", "/decisions", "", 400, "the request has no body; it must be a JSON object"},
    {"POST", "/decisions", "[]", 400, "the request's body must be a JSON object in braces"},
    {"POST", "/decisions", "{", 400, "the request's body is not JSON from line 1, column 2 on"},
    {"POST", "/decisions", "{\"version\":1", 400, "the request's body is not JSON from line 1, column 13 on"},
    {"POST", "/decisions", "nonsense", 400, "the request's body is not JSON from line 1, column 1 on"},
    {"POST", "/decisions", "{\"version\":1,\"version\":2,\"decisions\":[]}", 400,
        "\"version\" stands twice in the request; keep one"},
    {"POST", "/decisions", "{\"decisions\":[" NOTE "]}", 400,
        "\"version\" is missing: give the number of the last decision that was seen"},
    {"POST", "/decisions", "{\"version\":\"1\",\"decisions\":[" NOTE "]}", 400,
        "\"version\" is missing: give the number of the last decision that was seen"},
    {"POST", "/decisions", "{\"version\":1.5,\"decisions\":[" NOTE "]}", 400,
        "\"version\" is missing: give the number of the last decision that was seen"},
    {"POST", "/decisions", "{\"version\":-1,\"decisions\":[" NOTE "]}", 400,
        "\"version\" is missing: give the number of the last decision that was seen"},
    {"POST", "/decisions", "{\"version\":" VERSION "}", 400,
        "\"decisions\" is missing: give a list with at least one decision"},
    {"POST", "/decisions", "{\"version\":" VERSION ",\"decisions\":[]}", 400,
        "the request: decisions are a list in square brackets with at least one in it"},
    {"POST", "/decisions", "{\"version\":" VERSION ",\"decisions\":{}}", 400,
        "the request: decisions are a list in square brackets with at least one in it"},
    {"POST", "/decisions", "{\"version\":" VERSION ",\"by\":\"\",\"decisions\":[" NOTE "]}", 400,
        "\"by\" is missing: give the name and role of who is deciding as text"},
    {"POST", "/decisions", "{\"version\":" VERSION ",\"by\":7,\"decisions\":[" NOTE "]}", 400,
        "\"by\" is missing: give the name and role of who is deciding as text"},
    {"POST", "/decisions", "{\"version\":" VERSION ",\"colour\":1,\"decisions\":[" NOTE "]}", 400,
        "\"colour\" is not known here; known are: version by decisions"},
    {"POST", "/decisions", "{\"version\":" VERSION ",\"decisions\":[5]}", 400,
        "the request: decision 1 of the batch is not an object with a \"kind\"; nothing "
        "was recorded"},
    {"POST", "/decisions", "{\"version\":" VERSION ",\"decisions\":[{\"kind\":\"wish\"}]}", 400,
        "the request: decision 1 of the batch has the kind \"wish\", which this version "
        "does not know; nothing was recorded"},
    {"POST", "/decisions",
        "{\"version\":" VERSION ",\"decisions\":[{\"kind\":\"note\",\"text\":5,\"exhibit\":\"decisi"
        "ons\"}]}",
        400,
        "the request: decision 1 of the batch (note) has a \"text\" that is not a "
        "text in quotes; nothing was recorded"},
    {"POST", "/decisions",
        "{\"version\":" VERSION ",\"decisions\":[{\"kind\":\"correct\",\"column\":\"age\",\"partici"
        "pant\":\"Q1\",\"from\":\"1\",\"to\":\"2\"}]}",
        400,
        "the request: decision 1 of the batch (correct) has no reason; every decision "
        "of this kind needs one; nothing was recorded"},
    {"POST", "/decisions",
        "{\"version\":" VERSION ",\"decisions\":[{\"kind\":\"correct\",\"column\":\"age\",\"partici"
        "pant\":\"Q1\",\"from\":\"1\",\"to\":\"2\",\"reason\":\"r\"}]}",
        400,
        "decision 1 of the batch (correct) names a participant who is not in the "
        "file; nothing was recorded"},
    {"POST", "/decisions",
        "{\"version\":" VERSION ",\"decisions\":[{\"kind\":\"read-as\",\"column\":\"zz\",\"from\":"
        "\"f\",\"to\":\"F\",\"reason\":\"r\"}]}",
        400,
        "decision 1 of the batch (read-as) names the column \"zz\", which the plan "
        "gives no meaning; nothing was recorded"},
    {"POST", "/decisions",
        "{\"version\":" VERSION ",\"decisions\":[{\"kind\":\"reverse\",\"number\":999,\"reason\":\""
        "r\"}]}",
        400,
        "decision 1 of the batch (reverse) reverses a decision that is not there; "
        "nothing was recorded"},
    {"POST", "/decisions",
        "{\"version\":" VERSION ",\"decisions\":[{\"kind\":\"unblind\",\"to\":\"all\",\"reason\":\""
        "r\"}]}",
        400,
        "the request: decision 1 of the batch (unblind) has a \"to\" that is neither "
        "coded nor unblinded; nothing was recorded"},
    {"POST", "/decisions",
        "{\"version\":" VERSION ",\"decisions\":[" NOTE ",{\"kind\":\"note\",\"exhibit\":\"x\",\"te"
        "xt\":\"y\",\"colour\":\"z\"}]}",
        400,
        "the request: decision 2 of the batch (note) has the field \"colour\", which "
        "this kind does not take; nothing was recorded"},
    {"POST", "/decisions", "{\"version\":0,\"decisions\":[" NOTE "]}", 409,
        "the study has moved on: it is after decision " VERSION ", and this page "
        "last saw 0; look at what happened meanwhile and decide again"},
    {"POST", "/decisions", "{\"version\":999,\"decisions\":[" NOTE "]}", 409,
        "the study has moved on: it is after decision " VERSION ", and this page "
        "last saw 999; look at what happened meanwhile and decide again"},
    {"GET", "/exhibit/nope", "", 404, "there is no exhibit \"nope\"; `evenhand exhibits` lists them"},
    {"GET", "/exhibit/", "", 404, "there is no exhibit \"\"; `evenhand exhibits` lists them"},
    {"GET", "/exhibit/decisions/", "", 404, "there is no exhibit \"decisions/\"; `evenhand exhibits` lists them"},
    {"GET", "/exhibit/decisions.png", "", 404, "there is no exhibit \"decisions.png\"; `evenhand exhibits` lists them"},
    {"GET", "/exhibit/decisions.svg", "", 404, "the exhibit decisions is a table without a figure; ask for its .csv"},
    {"GET", "/exhibit/decisions?colour=red", "", 400,
        "decisions does not take colour=; `evenhand exhibits` lists what each exhibit takes"},
    {"GET", "/exhibit/decisions?meeting=yes", "", 400, "meeting=yes is not known; the meeting view is meeting=1"},
    {"GET", "/exhibit/decisions.csv?meeting=1", "", 400,
        "decisions does not take meeting=; `evenhand exhibits` lists what each exhibit takes"},
    {"GET", "/exhibit/baseline?set=some", "", 400,
        "baseline does not take set=; `evenhand exhibits` lists what each exhibit takes"},
    {"GET", "/exhibit/effect?outcome=zz", "", 404, "effect: outcome=zz is not known; it takes sbp, uacr"},
    {"GET", "/exhibit/effect?visit=Never", "", 404,
        "effect: visit=Never is not known; it takes Baseline, 8 weeks, 26 weeks"},
    {"GET", "/exhibit/effect?scale=square", "", 404,
        "effect: scale=square is not known; it takes linear or log10; default the "
        "latest decision, else the plan"},
    {"GET", "/exhibit/effect?arm=L", "", 404, "effect: arm=L is not known; it takes A, B"},
    {"GET", "/exhibit/change-by-arm?by=zz", "", 404, "change-by-arm: by=zz is not known; it takes sex, age, bmi, site"},
    {"GET", "/exhibit/participant", "", 400,
        "participant: it needs a participant; say participant=IDENTIFIER as the file has it"},
    {"GET", "/exhibit/participant?participant=nobody", "", 404,
        "participant: no participant bears the identifier nobody; say participant=IDENTIFIER "
        "as the file has it"},
    {"POST", "/open", "", 400, "the request has no body; it must be a JSON object"},
    {"POST", "/open", "{}", 400, "\"file\" is missing: name a study of the folder, such as quayside.study"},
    {"POST", "/open", "{\"file\":5}", 400, "\"file\" is missing: name a study of the folder, such as quayside.study"},
    {"POST", "/open", "{\"file\":\"../x.study\"}", 400,
        "\"../x.study\" cannot be a study's file: give a name without a folder that ends in .study"},
    {"POST", "/open", "{\"file\":\"x.csv\"}", 400,
        "\"x.csv\" cannot be a study's file: give a name without a folder that ends in .study"},
    {"POST", "/open", "{\"file\":\".study\"}", 400,
        "\".study\" cannot be a study's file: give a name without a folder that ends in .study"},
    {"POST", "/open", "{\"file\":\".x.study\"}", 400,
        "\".x.study\" cannot be a study's file: give a name without a folder that ends in .study"},
    {"POST", "/open", "{\"file\":\"none.study\"}", 404, "there is no study none.study in the folder FOLDER"},
    {"POST", "/open", "{\"file\":\"quayside.study\",\"x\":1}", 400, "\"x\" is not known here; known are: file"},
    {"POST", "/studies", "{}", 400, "\"file\" is missing: name a study of the folder, such as quayside.study"},
    {"POST", "/studies", "{\"file\":\"a.study\"}", 400,
        "\"by\" is missing: give the name and role of who loads the file"},
    {"POST", "/studies", "{\"file\":\"a.study\",\"by\":\"A\"}", 400, "\"plan\" is missing: say what the columns mean"},
    {"POST", "/studies", "{\"file\":\"a.study\",\"by\":\"A\",\"plan\":{}}", 400,
        "\"draft\" is missing: give the number that /drafts answered"},
    {"POST", "/studies", "{\"file\":\"a.study\",\"by\":\"A\",\"plan\":{},\"draft\":77}", 409,
        "the study FOLDER/quayside.study is open already; close it first"},
    {"POST", "/studies", "{\"file\":\"a/b.study\",\"by\":\"A\",\"plan\":{},\"draft\":77}", 400,
        "\"a/b.study\" cannot be a study's file: give a name without a folder that ends in .study"},
    {"POST", "/drafts", "", 400, "say the file's name, without its folder: /drafts?name=export.csv"},
    {"POST", "/drafts?name=", "", 400, "say the file's name, without its folder: /drafts?name=export.csv"},
    {"POST", "/drafts?name=a/b.csv", "", 400, "say the file's name, without its folder: /drafts?name=export.csv"},
    {"POST", "/drafts?name=x&y=1", "", 400, "\"y\" is not known here; known are: name draft sheet"},
    {"POST", "/drafts?name=x&draft=77", "id,x\n1,2\n", 404, "that file is no longer at hand; drop it on the page again"},
    {"POST", "/drafts?name=x&draft=-1", "id,x\n1,2\n", 404, "that file is no longer at hand; drop it on the page again"},
    {"POST", "/drafts?name=x&sheet=A", "id,x\n1,2\n", 400,
        "x is a file of delimited text and has no sheets; take sheet \"A\" out of the plan's files"},
    {"POST", "/guesses", "{\"files\":[]}", 400, "\"draft\" is missing: give the number that /drafts answered"},
    {"POST", "/guesses", "{\"draft\":77}", 400, "\"files\" is missing: name at least one of the files that were dropped"},
    {"POST", "/guesses", "{\"draft\":77,\"files\":[{\"name\":\"x\"}]}", 404,
        "that file is no longer at hand; drop it on the page again"},
    {"POST", "/guesses", "{\"draft\":77,\"files\":[{}],\"x\":1}", 400, "\"x\" is not known here; known are: draft files"},
};

static void every_broken_request_gets_its_sentence(void **state) {
    const struct house *house = *state;
    int wrong = 0;
    for (size_t i = 0; i < sizeof requests / sizeof *requests; i++) {
        char what[1200];
        struct reply reply;
        snprintf(what, sizeof what, "%s %s %s", requests[i].method, requests[i].target, requests[i].body);
        struct request request = plain_request(house, requests[i].method);
        send_to(house, &request, requests[i].target, requests[i].body, strlen(requests[i].body), &reply);
        wrong += same(house, what, &reply, requests[i].status, requests[i].sentence);
        reply_release(&reply);
    }
    struct reply reply;
    ask(house, "GET", "/exhibit/decisions.json", NULL, &reply); /* and nothing was recorded */
    assert_non_null(strstr(reply.body.data, "\"version\":" VERSION ","));
    reply_release(&reply);
    assert_int_equal(wrong, 0);
}

/* ---- files that are no study ---- */

static void every_file_that_is_no_study_gets_its_sentence(void **state) {
    const struct house *house = *state;
    static const struct { const char *bytes; } cases[] = {{""}, {"hello"}, {"SQLite format 3"}};
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        char path[128];
        struct reply reply;
        snprintf(path, sizeof path, "%s/other.study", house->folder);
        FILE *file = fopen(path, "w");
        assert_non_null(file);
        fputs(cases[i].bytes, file);
        fclose(file);
        ask(house, "POST", "/open", "{\"file\":\"other.study\"}", &reply);
        assert_int_equal(reply.status, 400);
        assert_non_null(strstr(sentence_of(&reply), "other.study"));
        reply_release(&reply);
        ask(house, "GET", "/agenda.json", NULL, &reply); /* nothing is half open */
        assert_non_null(strstr(reply.body.data, "\"study\":null"));
        reply_release(&reply);
    }
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test_setup_teardown(every_broken_file_gets_its_sentence_and_place, house_closed, house_leave),
        cmocka_unit_test_setup_teardown(every_broken_plan_gets_its_sentence, house_closed, house_leave),
        cmocka_unit_test_setup_teardown(every_broken_request_gets_its_sentence, house_open, house_leave),
        cmocka_unit_test_setup_teardown(every_file_that_is_no_study_gets_its_sentence, house_closed, house_leave),
    };
    return cmocka_run_group_tests_name("http/bad requests", tests, NULL, NULL);
}
