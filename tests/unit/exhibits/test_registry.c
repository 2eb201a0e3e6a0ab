/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The registry as a whole: every row complete, every exhibit in every state of blinding with every value of every
 * argument, refusals word by word; and that while blinded no arm's code or label stands in any byte that goes out. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "exhibit_case.h"
#include <ctype.h>

static const char *const states[] = {"pooled", "coded", "unblinded"};
enum { STATES = 3 };

/* ---- rows ---- */

static bool kebab(const char *name) {
    for (const char *p = name; *p; p++) {
        if (!islower((unsigned char)*p) && *p != '-') {
            return false;
        }
    }
    return *name != '\0';
}

static void test_rows_are_complete(void **state) {
    (void)state;
    int item = 1;
    for (size_t i = 0; exhibits[i]; i++) {
        const struct exhibit *exhibit = exhibits[i];
        assert_true(kebab(exhibit->name));
        assert_ptr_equal(exhibit_of(exhibit->name), exhibit); /* so names are unique */
        assert_true(strlen(exhibit->title) > 10 && strlen(exhibit->tab) > 2 && strlen(exhibit->says) > 20);
        assert_true(strlen(exhibit->method) > 60);
        assert_true(exhibit->compute && exhibit->json && exhibit->tables && exhibit->arguments);
        assert_true(exhibit->item >= 0 && exhibit->item <= 9);
        if (exhibit->item) { /* in agenda order */
            assert_true(exhibit->item >= item);
            item = exhibit->item;
        }
        for (const struct argument_rule *rule = exhibit->arguments; rule->name; rule++) {
            assert_true(kebab(rule->name) || strchr(rule->name, '_'));
            assert_true(strlen(rule->says) > 10);
            assert_int_equal(rule->kind == ARGUMENT_WORD, rule->words != NULL);
            for (const struct argument_rule *other = exhibit->arguments; other < rule; other++) {
                assert_string_not_equal(other->name, rule->name);
            }
        }
    }
    assert_null(exhibit_of("no-such"));
}

static void test_help_lists_everything(void **state) {
    (void)state;
    struct text help;
    text_init(&help);
    exhibits_help(&help);
    for (size_t i = 0; exhibits[i]; i++) {
        assert_non_null(strstr(help.data, exhibits[i]->says));
        for (const struct argument_rule *rule = exhibits[i]->arguments; rule->name; rule++) {
            assert_non_null(strstr(help.data, rule->says));
        }
    }
    text_release(&help);
}

/* ---- every exhibit with every value ---- */

/* Called with what came out; refused has the sentence in fault. */
typedef void watch(const struct exhibit *exhibit, const struct asked *asked, bool made, const struct renderings *r,
    const struct fault *fault);

static void ask(struct exhibit_case *c, const struct exhibit *exhibit, const char *participant, const char *name,
    const char *value, watch *seen) {
    struct asked asked[2];
    size_t count = 0;
    for (const struct argument_rule *rule = exhibit->arguments; rule->name; rule++) {
        if (rule->kind == ARGUMENT_PARTICIPANT) {
            asked[count++] = (struct asked){rule->name, participant};
        }
    }
    if (name) {
        asked[count++] = (struct asked){name, value};
    }
    struct renderings r;
    struct fault fault;
    fault_init(&fault);
    bool made = render(c, exhibit->name, asked, count, &r, &fault);
    seen(exhibit, name ? &asked[count - 1] : NULL, made, &r, &fault);
    renderings_release(&r);
}

static void ask_words(struct exhibit_case *c, const struct exhibit *exhibit, const char *participant,
    const struct argument_rule *rule, const char *words, watch *seen) {
    char *copy = memory_text(words), *rest = NULL;
    for (char *word = strtok_r(copy, " ", &rest); word; word = strtok_r(NULL, " ", &rest)) {
        ask(c, exhibit, participant, rule->name, word, seen);
    }
    memory_free(copy);
}

static void ask_rule(struct exhibit_case *c, const struct exhibit *exhibit, const char *participant,
    const struct argument_rule *rule, watch *seen) {
    const struct plan *plan = study_plan(c->study);
    const struct outcome *primary = &plan->outcomes[plan->primary];
    switch (rule->kind) {
    case ARGUMENT_OUTCOME:
        for (size_t i = 0; i < plan->outcome_count; i++) {
            ask(c, exhibit, participant, rule->name, plan->outcomes[i].id, seen);
        }
        break;
    case ARGUMENT_VARIABLE:
        for (size_t i = 0; i < plan->variable_count; i++) {
            ask(c, exhibit, participant, rule->name, plan->variables[i].column, seen);
        }
        break;
    case ARGUMENT_COVARIATE:
    case ARGUMENT_COVARIATES:
        for (size_t i = 0; i < plan->covariate_count; i++) {
            ask(c, exhibit, participant, rule->name, plan->covariates[i].id, seen);
        }
        break;
    case ARGUMENT_VISIT:
        for (size_t i = 0; i < primary->visit_count; i++) {
            ask(c, exhibit, participant, rule->name, primary->visits[i].label, seen);
        }
        break;
    case ARGUMENT_SET:
        ask_words(c, exhibit, participant, rule, "full per-protocol", seen);
        break;
    case ARGUMENT_SCALE:
        ask_words(c, exhibit, participant, rule, "linear log10", seen);
        break;
    case ARGUMENT_WORD:
        ask_words(c, exhibit, participant, rule, rule->words, seen);
        break;
    default:
        break;
    }
}

static void ask_everything(struct exhibit_case *c, const char *participant, watch *seen) {
    for (size_t i = 0; exhibits[i]; i++) {
        ask(c, exhibits[i], participant, NULL, NULL, seen);
        for (const struct argument_rule *rule = exhibits[i]->arguments; rule->name; rule++) {
            ask_rule(c, exhibits[i], participant, rule, seen);
        }
    }
}

static const char *state_now;

/* Refused by default only where the registry says so; a refusal is a sentence that starts with the exhibit's name. */
static void refused_as_said(const struct exhibit *exhibit, const struct asked *asked, bool made,
    const struct renderings *r, const struct fault *fault) {
    bool pooled = strcmp(state_now, "pooled") == 0;
    if (pooled && exhibit->pooled == REFUSED) {
        assert_false(made);
        assert_int_equal(fault->code, FAULT_REFUSED);
    } else if (!asked && !made) {
        fail_msg("%s while %s: %s", exhibit->name, state_now, fault->message);
    }
    if (!made) {
        assert_int_equal(strncmp(fault->message, exhibit->name, strlen(exhibit->name)), 0);
        assert_true(strlen(fault->message) > strlen(exhibit->name) + 15);
    } else if (exhibit->pooled == SHOWN_AS_ONE_ARM) {
        assert_int_equal(strstr(r->json.data, "\"arm\":\"all\"") != NULL, pooled);
    }
}

static void test_every_exhibit_in_every_state(void **state) {
    (void)state;
    for (size_t i = 0; i < STATES; i++) {
        for (int decided = 0; decided < 2; decided++) {
            struct exhibit_case c;
            state_now = states[i];
            case_quayside(&c, states[i], decided);
            ask_everything(&c, "Q1001", refused_as_said);
            case_close(&c);
        }
    }
}

/* Two times the same is the same bytes, and a fresh look at the file gives them too. */
static void test_says_the_same_twice(void **state) {
    (void)state;
    struct exhibit_case c;
    case_quayside(&c, "coded", true);
    for (size_t i = 0; exhibits[i]; i++) {
        struct renderings one, two;
        const struct asked asked[] = {{"participant", "Q1001"}};
        size_t count = exhibits[i]->arguments[0].kind == ARGUMENT_PARTICIPANT && exhibits[i]->arguments[0].name;
        render(&c, exhibits[i]->name, asked, count, &one, NULL);
        render(&c, exhibits[i]->name, asked, count, &two, NULL);
        assert_string_equal(one.json.data, two.json.data);
        assert_string_equal(one.html.data, two.html.data);
        assert_string_equal(one.svg.data, two.svg.data);
        renderings_release(&one);
        renderings_release(&two);
    }
    case_close(&c);
}

/* ---- refusals ---- */

static void test_refusals(void **state) {
    (void)state;
    static const struct {
        const char *blinding, *exhibit;
        struct asked asked[2];
        size_t count;
        enum fault_code code;
        const char *sentence;
    } cases[] = {
        {"coded", "no-such", {{0}}, 0, FAULT_MISSING,
            "there is no exhibit \"no-such\"; `evenhand exhibits` lists them"},
        {"coded", "baseline", {{"colour", "red"}}, 1, FAULT_INPUT,
            "baseline does not take colour=; `evenhand exhibits` lists what each exhibit takes"},
        {"coded", "missing-grid", {{"order", "sideways"}}, 1, FAULT_MISSING,
            "missing-grid: order=sideways is not known; it takes pattern arm identifier"},
        {"coded", "missing-grid", {{"order", "pattern"}, {"order", "identifier"}}, 2, FAULT_INPUT,
            "missing-grid: order= is given twice; say it once"},
        {"coded", "before-after", {{"outcome", "weight"}}, 1, FAULT_MISSING,
            "before-after: outcome=weight is not known; it takes sbp, uacr"},
        {"coded", "before-after", {{"outcome", "uacr"}, {"visit", "9 weeks"}}, 2, FAULT_MISSING,
            "before-after: visit=9 weeks is not known; it takes Baseline, 8 weeks, 26 weeks"},
        {"coded", "distribution", {{"scale", "square-root"}}, 1, FAULT_MISSING,
            "distribution: scale=square-root is not known; it takes linear or log10: which the numbers of the JSON are "
            "of; default "
            "the outcome's latest decision, else its plan, else linear"},
        {"coded", "distribution", {{"variable", "grp"}}, 1, FAULT_REFUSED,
            "distribution: what variable= asks for would tell the arms apart, so it is hidden while the study is "
            "coded"},
        {"pooled", "effect", {{0}}, 0, FAULT_REFUSED,
            "effect compares the arms and is not shown while the study is pooled; a decision to unblind opens it"},
        {"pooled", "participant", {{0}}, 0, FAULT_INPUT,
            "participant: it needs a participant; say participant=IDENTIFIER as the file has it"},
        {"pooled", "participant", {{"participant", "Q9999"}}, 1, FAULT_MISSING,
            "participant: no participant bears the identifier Q9999; say participant=IDENTIFIER as the file has it"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        struct exhibit_case c;
        struct renderings r;
        struct fault fault;
        case_quayside(&c, cases[i].blinding, false);
        assert_false(render(&c, cases[i].exhibit, cases[i].asked, cases[i].count, &r, &fault));
        assert_string_equal(fault.message, cases[i].sentence);
        assert_int_equal(fault.code, cases[i].code);
        renderings_release(&r);
        case_close(&c);
    }
}

/* ---- nothing leaks ---- */

/* Codes and labels that stand nowhere by chance: of the arms, of codes of the arm the plan does not list, and of a
 * category that goes with the arm one to one. */
static const char *const secrets[] = {"ZQX", "zqx", "Zebra", "Quokka"};

static void assert_silent(const char *where, const char *what, const char *text) {
    for (size_t i = 0; i < sizeof secrets / sizeof *secrets; i++) {
        const char *found = strstr(text, secrets[i]);
        if (found) {
            fail_msg("%s while %s, %s: ...%.120s...", where, state_now, what, found - text > 60 ? found - 60 : text);
        }
    }
}

static void silent(const struct exhibit *exhibit, const struct asked *asked, bool made, const struct renderings *r,
    const struct fault *fault) {
    (void)asked;
    if (!made) {
        assert_silent(exhibit->name, "refusal", fault->message);
        return;
    }
    const struct {
        const char *what;
        const struct text *text;
    } all[] = {{"text", &r->text}, {"json", &r->json}, {"csv", &r->csv}, {"html", &r->html}, {"meeting", &r->meeting},
        {"svg", &r->svg}, {"meeting svg", &r->meeting_svg}};
    for (size_t i = 0; i < sizeof all / sizeof *all; i++) {
        assert_silent(exhibit->name, all[i].what, all[i].text->data);
    }
}

/* The invented trial with other codes for its arms, one of them misspelt and one blank, and a column of kits that tells
 * them. */
static void write_marked(const char *csv, struct text *out) {
    size_t record = 0;
    for (const char *line = csv; *line; record++) {
        const char *end = strchr(line, '\n'), *arm = strchr(strchr(line, ',') + 1, ',') + 1;
        bool walking = *arm == 'W';
        text_append(out, line, (size_t)(arm - line));
        text_string(out, record == 0   ? "grp"
                         : record == 5 ? "zqxarm one"
                         : record == 9 ? ""
                         : walking     ? "ZQXARMONE"
                                       : "ZQXARMTWO");
        const char *rest = strchr(arm, ',');
        text_append(out, rest, (size_t)(end - rest));
        text_string(out, record == 0 ? ",kit\n" : walking ? ",ZQXKIT1\n" : ",ZQXKIT2\n");
        line = end + 1;
    }
}

static char *marked_plan(const char *plan, const char *blinding) {
    static const struct {
        const char *from, *to;
    } changes[] = {
        {"{\"code\": \"L\", \"label\": \"Printed advice\"", "{\"code\": \"ZQXARMTWO\", \"label\": \"Zebra label\""},
        {"{\"code\": \"W\", \"label\": \"Walking group\"", "{\"code\": \"ZQXARMONE\", \"label\": \"Quokka label\""},
        {"\"covariates\": [",
            "\"covariates\": [{\"id\": \"kit\", \"label\": \"Kit\", \"column\": \"kit\", \"kind\": \"category\", "
            "\"levels\": [{\"code\": \"ZQXKIT1\", \"label\": \"Quokka kit\"}]}, "},
    };
    char wanted[64];
    snprintf(wanted, sizeof wanted, "\"blinding\": \"%s\"", blinding);
    char *text = replaced(plan, "\"blinding\": \"coded\"", wanted);
    for (size_t i = 0; i < sizeof changes / sizeof *changes; i++) {
        char *next = replaced(text, changes[i].from, changes[i].to);
        memory_free(text);
        text = next;
    }
    return text;
}

/* Decisions about the arm's column and about the one that goes with it; their texts are secrets too. */
static const char about_arms[] =
    "[{\"kind\": \"read-as\", \"column\": \"grp\", \"from\": \"zqxarm one\", \"to\": \"ZQXARMONE\", \"reason\": "
    "\"Zebra it is\"},"
    " {\"kind\": \"read-as\", \"column\": \"kit\", \"from\": \"ZQXKIT2\", \"to\": \"zqxkit two\", \"reason\": \"The "
    "Quokka list\"},"
    " {\"kind\": \"query\", \"column\": \"grp\", \"question\": \"Is zqxarm one Zebra?\", \"reason\": \"Zebra or not\"},"
    " {\"kind\": \"missing-code\", \"column\": \"kit\", \"value\": \"ZQXNONE\", \"meaning\": \"no Quokka\", "
    "\"reason\": \"Zebra list\"}]";

/* What answers and reverses them: the number is filled in. */
static const char answer[] = "[{\"kind\": \"response\", \"number\": %u, \"text\": \"The Quokka it is\"}]";
static const char reversal[] = "[{\"kind\": \"reverse\", \"number\": %u, \"reason\": \"It was no Zebra\"}]";

static void open_marked(struct exhibit_case *c, const char *blinding) {
    struct quayside quayside;
    struct text csv;
    text_init(&csv);
    quayside_make(QUAYSIDE_SEED, &quayside);
    write_marked(quayside.export_csv.data, &csv);
    char *plan = marked_plan(quayside.plan_json.data, blinding);
    case_open(c, csv.data, plan);
    memory_free(plan);
    text_release(&csv);
    quayside_release(&quayside);
}

static void agenda_silent(struct exhibit_case *c) {
    struct arena arena;
    struct text agenda;
    struct fault fault;
    arena_init(&arena);
    text_init(&agenda);
    fault_init(&fault);
    assert_true(agenda_json(c->study, &arena, &agenda, &fault));
    assert_silent("agenda", "json", agenda.data);
    text_release(&agenda);
    arena_release(&arena);
}

static uint32_t decide(struct exhibit_case *c, const char *json) {
    struct fault fault;
    uint32_t version = 0;
    fault_init(&fault);
    if (!study_decide(
            c->study, "M. Tide, statistician", json, strlen(json), "decisions.json", ANY_VERSION, &version, &fault)) {
        fail_msg("%s", fault.message);
    }
    return version;
}

static void decide_about_arms(struct exhibit_case *c) {
    char json[128];
    uint32_t last = decide(c, about_arms); /* the query is the last but one */
    snprintf(json, sizeof json, answer, last - 1);
    decide(c, json);
    snprintf(json, sizeof json, reversal, last);
    decide(c, json);
}

static void test_nothing_leaks(void **state) {
    (void)state;
    for (size_t i = 0; i < 2; i++) {
        for (int decided = 0; decided < 2; decided++) {
            struct exhibit_case c;
            state_now = states[i];
            open_marked(&c, states[i]);
            if (decided) {
                decide_about_arms(&c);
            }
            static const char *const participants[] = {"Q1001", "Q1002", "Q1003", "Q1005", "Q1009"};
            for (size_t p = 0; p < sizeof participants / sizeof *participants; p++) {
                ask(&c, exhibit_of("participant"), participants[p], NULL, NULL, silent);
            }
            ask_everything(&c, "Q1005", silent);
            agenda_silent(&c);
            case_close(&c);
        }
    }
}

/* The secrets do stand in the unblinded exhibits: the test above looks for what can be found. */
static void test_secrets_show_once_unblinded(void **state) {
    (void)state;
    struct exhibit_case c;
    struct renderings r;
    open_marked(&c, "unblinded");
    render(&c, "baseline", NULL, 0, &r, NULL);
    assert_non_null(strstr(r.json.data, "ZQXARMONE"));
    assert_non_null(strstr(r.json.data, "ZQXKIT2"));
    assert_non_null(strstr(r.html.data, "Zebra label"));
    assert_non_null(strstr(r.html.data, "Quokka label"));
    renderings_release(&r);
    case_close(&c);
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_rows_are_complete),
        cmocka_unit_test(test_help_lists_everything),
        cmocka_unit_test(test_every_exhibit_in_every_state),
        cmocka_unit_test(test_says_the_same_twice),
        cmocka_unit_test(test_refusals),
        cmocka_unit_test(test_nothing_leaks),
        cmocka_unit_test(test_secrets_show_once_unblinded),
    };
    return cmocka_run_group_tests_name("exhibits/registry", tests, NULL, NULL);
}
