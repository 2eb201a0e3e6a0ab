/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Open studies: made, decided upon, read again, shared between handles, processes and threads; and the invented trial's
 * key: every planted trouble is found, and the right decisions lead to the truth. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "demo/quayside.h"
#include "store/store.h"
#include "trial/study.h"
#include <cJSON.h>
#include <math.h>
#include <pthread.h>
#include <stdatomic.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/wait.h>
#include <unistd.h>

static const char who[] = "M. Tide, data manager";

/* ---- a folder with studies in it ---- */

static char folder[64];

static int make_folder(void **state) {
    (void)state;
    snprintf(folder, sizeof folder, "/tmp/evenhand-study-XXXXXX");
    return mkdtemp(folder) ? 0 : -1;
}

static int remove_folder(void **state) {
    (void)state;
    char command[96];
    snprintf(command, sizeof command, "rm -rf '%s'", folder);
    return system(command);
}

static const char *path_of(const char *name) {
    static char path[128];
    snprintf(path, sizeof path, "%s/%s.study", folder, name);
    return path;
}

static bool create(const char *path, const char *csv, const char *plan, struct text *account, struct fault *fault) {
    fault_init(fault);
    return study_create(path, "in/export.csv", csv, strlen(csv), "in/plan.json", plan, strlen(plan), who, account, fault);
}

static struct study *reopen(const char *path) {
    struct fault fault;
    fault_init(&fault);
    struct study *study = study_open(path, &fault);
    if (!study) {
        fail_msg("%s", fault.message);
    }
    return study;
}

static struct study *made(const char *path, const char *csv, const char *plan) {
    struct fault fault;
    if (!create(path, csv, plan, NULL, &fault)) {
        fail_msg("%s", fault.message);
    }
    return reopen(path);
}

static bool decide(struct study *study, const char *batch, uint32_t seen, uint32_t *version, struct fault *fault) {
    fault_init(fault);
    return study_decide(study, who, batch, strlen(batch), "batch", seen, version, fault);
}

static uint32_t must_decide(struct study *study, const char *batch) {
    struct fault fault;
    uint32_t version = 0;
    if (!decide(study, batch, ANY_VERSION, &version, &fault)) {
        fail_msg("%s: %s", batch, fault.message);
    }
    return version;
}

static struct frame *frame_of(struct study *study) {
    struct fault fault;
    fault_init(&fault);
    struct frame *frame = study_frame(study, &fault);
    if (!frame) {
        fail_msg("%s", fault.message);
    }
    return frame;
}

static void state_of(struct study *study, char state[HASH_SIZE]) {
    struct frame *frame = frame_of(study);
    memcpy(state, frame->state_sha256, HASH_SIZE);
    frame_release(frame);
}

static const char plan[] = "{\"title\": \"T\", \"participant\": \"p\", \"missing_codes\": [\"999\"], \"arm\": {\"column\": \"g\", \"levels\":"
                           " [{\"code\": \"L\", \"reference\": true}, {\"code\": \"W\"}]}, \"outcomes\": [{\"id\": \"y\", \"role\": \"primary\","
                           " \"better\": \"lower\", \"visits\": [{\"label\": \"B\", \"column\": \"y0\"}, {\"label\": \"E\", \"column\": \"y1\"}]}]}";
static const char csv[] = "p,g,y0,y1\nA,L,1,2\nB,W,2,999\nC,L,3,4\nD,W,4,5\n";

/* ---- making and opening ---- */

static void test_made_and_read_again(void **state) {
    (void)state;
    const char *path = path_of("made");
    struct study *study = made(path, csv, plan);
    struct frame *frame = frame_of(study);
    assert_string_equal(study_path(study), path);
    assert_string_equal(study_plan(study)->title, "T");
    assert_int_equal(frame->version, 2); /* the code for missing, in both columns of numbers */
    assert_true(frame->decisions[0].planned);
    assert_int_equal(frame->columns[1]->state[1], CELL_MISSING_CODE);
    struct frame *received = study_received_frame(study);
    assert_string_equal(received->state_sha256, frame->state_sha256);
    struct study_facts facts;
    study_facts(study, &facts);
    char digits[HASH_SIZE], head[HASH_SIZE], before[HASH_SIZE], zero[HASH_SIZE];
    hash_of(csv, strlen(csv), digits);
    assert_string_equal(facts.data_sha256, digits);
    assert_string_equal(facts.data_name, "export.csv");
    assert_int_equal(facts.data_length, strlen(csv));
    frame_release(received);
    frame_release(frame);
    study_head(study, 0, zero);
    study_head(study, 2, before);
    assert_string_not_equal(zero, before);
    assert_int_equal(must_decide(study, "[{\"kind\": \"set-missing\", \"column\": \"y1\", \"participant\": \"C\", \"from\": \"4\", \"reason\": \"r\"},"
                                        " {\"kind\": \"unblind\", \"to\": \"coded\", \"reason\": \"r\"}]"), 4);
    frame = frame_of(study);
    assert_int_equal(frame->columns[1]->state[2], CELL_SET_MISSING);
    assert_string_equal(frame->decisions[3].blinding, "pooled"); /* the state the person saw */
    assert_string_equal(frame->decisions[3].by, who);
    assert_string_equal(frame->decisions[3].state, frame->state_sha256);
    study_head(study, 4, head);
    assert_string_equal(frame->decisions[3].hash, head);
    struct study *again = reopen(path);
    struct frame *same = frame_of(again);
    assert_string_equal(same->state_sha256, frame->state_sha256);
    assert_int_equal(same->version, 4);
    assert_int_equal(same->blinding, BLINDING_CODED);
    assert_string_equal(same->decisions[2].participant, "C");
    assert_memory_equal(same->letters, frame->letters, 2);
    char head_again[HASH_SIZE];
    study_head(again, 4, head_again);
    assert_string_equal(head, head_again);
    frame_release(same);
    study_close(again);
    frame_release(frame);
    study_close(study);
}

static void test_account(void **state) {
    (void)state;
    struct text account;
    text_init(&account);
    struct fault fault;
    assert_true(create(path_of("account"), "p;g;y0;y1\nA;L;1;2\nA;W;2;x\nB;W;999;4\n", plan, &account, &fault));
    static const char *const wanted[] = {"export.csv: 3 records of 4 columns", "semicolon", "2 participants; 1 repeated, 2 records held aside"};
    for (size_t i = 0; i < sizeof wanted / sizeof *wanted; i++) {
        if (!strstr(account.data, wanted[i])) {
            fail_msg("\"%s\" is not in: %s", wanted[i], account.data);
        }
    }
    text_release(&account);
}

static void test_not_made(void **state) {
    (void)state;
    static const struct {
        const char *csv, *plan, *sentence;
    } cases[] = {
        {"p,g,y0\nA,L,1\n", plan,
            "plan.json: the column \"y1\" (y, E) is not in export.csv, line 1, which has: p, g, y0; mend the plan or the header"},
        {"q,g,y0,y1\nA,L,1,2\n", plan,
            "plan.json: the column \"p\" (the participant's identifier) is not in export.csv, line 1, which has: q, g, y0, y1; mend the plan or the "
            "header"},
        {"p,G,y0,y1\nA,L,1,2\n", plan, "plan.json: the column \"g\" (the arm) is not in export.csv, line 1, which has: p, G, y0, y1; mend the plan or "
            "the header"},
        {"p,g,y0,y1\n", plan, "export.csv has a header and no record below it; load a file with at least one participant"},
        {csv, "{", "plan.json, line 1, column 2: this is not JSON from here on; mend the text (a comma, a quote or a bracket?) and try again"},
    };
    const char *path = path_of("not-made");
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        struct fault fault;
        assert_false(create(path, cases[i].csv, cases[i].plan, NULL, &fault));
        if (strcmp(fault.message, cases[i].sentence) != 0) {
            fail_msg("got    %s\nwanted %s", fault.message, cases[i].sentence);
        }
        assert_int_equal(access(path, F_OK), -1);
    }
    struct fault fault;
    fault_init(&fault);
    assert_false(study_create(path, "d", csv, strlen(csv), "p", plan, strlen(plan), " ", NULL, &fault));
    assert_string_equal(fault.message, "say who is loading, by name and role, such as --by \"A. Reader, data manager\"");
    assert_true(create(path, csv, plan, NULL, &fault));
    assert_false(create(path, csv, plan, NULL, &fault)); /* never overwritten */
    assert_non_null(strstr(fault.message, path));
    fault_init(&fault);
    assert_null(study_open("/nowhere/at.study", &fault));
    assert_non_null(strstr(fault.message, "/nowhere/at.study"));
}

/* ---- deciding, and who saw what ---- */

static const char note[] = "[{\"kind\": \"note\", \"exhibit\": \"effect\", \"text\": \"seen\"}]";

static void test_conflict(void **state) {
    (void)state;
    struct study *study = made(path_of("conflict"), csv, plan);
    struct fault fault;
    uint32_t version = 0;
    assert_true(decide(study, note, 2, &version, &fault));
    assert_int_equal(version, 3);
    assert_false(decide(study, note, 2, &version, &fault));
    assert_int_equal(fault.code, FAULT_CONFLICT);
    assert_int_equal(version, 3);
    assert_string_equal(fault.message, "the study has moved on: it is after decision 3, and this page last saw 2; look at what happened meanwhile "
                                       "and decide again");
    assert_false(decide(study, "{\"version\": 2, \"decisions\": [{\"kind\": \"note\", \"exhibit\": \"e\", \"text\": \"t\"}]}", ANY_VERSION, &version, &fault));
    assert_int_equal(fault.code, FAULT_CONFLICT);
    assert_true(decide(study, "{\"version\": 3, \"decisions\": [{\"kind\": \"note\", \"exhibit\": \"e\", \"text\": \"t\"}]}", ANY_VERSION, &version, &fault));
    assert_int_equal(version, 4);
    fault_init(&fault);
    assert_false(study_decide(study, "", note, strlen(note), "batch", ANY_VERSION, &version, &fault));
    assert_string_equal(fault.message, "say who is deciding, by name and role, such as \"A. Reader, data manager\"");
    study_close(study);
}

static void test_refused_leaves_all(void **state) {
    (void)state;
    const char *path = path_of("refused");
    struct study *study = made(path, csv, plan);
    char before[HASH_SIZE], after[HASH_SIZE];
    state_of(study, before);
    struct fault fault;
    uint32_t version = 0;
    assert_false(decide(study, "[{\"kind\": \"set-missing\", \"column\": \"y1\", \"participant\": \"C\", \"from\": \"4\", \"reason\": \"r\"},"
                               " {\"kind\": \"set-missing\", \"column\": \"y1\", \"participant\": \"D\", \"from\": \"4\", \"reason\": \"r\"}]",
        ANY_VERSION, &version, &fault));
    assert_string_equal(fault.message,
        "decision 2 of the batch (set-missing) says y1 of D reads \"4\", but it now reads \"5\"; nothing was recorded");
    assert_int_equal(fault.row, 2);
    assert_int_equal(version, 2);
    state_of(study, after);
    assert_string_equal(before, after);
    struct study *again = reopen(path);
    state_of(again, after);
    assert_string_equal(before, after);
    study_close(again);
    assert_int_equal(must_decide(study, note), 3); /* and the next one is taken */
    study_close(study);
}

static void test_two_handles(void **state) {
    (void)state;
    const char *path = path_of("two");
    struct study *one = made(path, csv, plan), *two = reopen(path);
    struct frame *held = frame_of(two); /* a frame in use stays as it is */
    must_decide(one, "[{\"kind\": \"correct\", \"column\": \"y1\", \"participant\": \"A\", \"from\": \"2\", \"to\": \"7\", \"reason\": \"r\"}]");
    assert_true(fabs(held->columns[1]->number[0] - 2) < 1e-12);
    struct frame *now = frame_of(two);
    assert_int_equal(now->version, 3);
    assert_true(fabs(now->columns[1]->number[0] - 7) < 1e-12);
    assert_ptr_equal(now->columns[0], held->columns[0]);
    frame_release(now);
    frame_release(held);
    struct fault fault;
    uint32_t version;
    must_decide(one, note);
    assert_false(decide(two, note, 3, &version, &fault)); /* has not looked since */
    assert_int_equal(fault.code, FAULT_CONFLICT);
    assert_int_equal(must_decide(two, note), 5);
    char a[HASH_SIZE], b[HASH_SIZE];
    state_of(one, a);
    state_of(two, b);
    assert_string_equal(a, b);
    study_head(two, 5, b);
    study_head(one, 5, a);
    assert_string_equal(a, b);
    study_close(one);
    study_close(two);
}

static void test_another_process(void **state) {
    (void)state;
    const char *path = path_of("process");
    struct fault fault;
    assert_true(create(path, csv, plan, NULL, &fault));
    pid_t child = fork();
    if (child == 0) { /* SQLite connections do not cross a fork: each process opens its own */
        struct study *study = study_open(path, &fault);
        uint32_t version;
        bool done = study && decide(study, "[{\"kind\": \"set-missing\", \"column\": \"y0\", \"participant\": \"A\", \"from\": \"1\", \"reason\": \"r\"}]",
                                 ANY_VERSION, &version, &fault);
        study_close(study);
        _exit(done ? 0 : 1);
    }
    struct study *study = reopen(path);
    int status = -1;
    assert_int_equal(waitpid(child, &status, 0), child);
    assert_true(WIFEXITED(status) && WEXITSTATUS(status) == 0);
    struct frame *frame = frame_of(study);
    assert_int_equal(frame->version, 3);
    assert_int_equal(frame->columns[0]->state[0], CELL_SET_MISSING);
    frame_release(frame);
    study_close(study);
}

static void test_looks(void **state) {
    (void)state;
    const char *path = path_of("looks");
    struct study *study = made(path, csv, plan);
    struct frame *frame = frame_of(study);
    struct fault fault;
    fault_init(&fault);
    static const char *const looks[][2] = {{"effect", "outcome=y"}, {"effect", "outcome=y"}, {"change-by-arm", "outcome=y"}, {"effect", ""}};
    for (size_t i = 0; i < 4; i++) {
        assert_true(study_look(study, frame, looks[i][0], looks[i][1], who, &fault));
    }
    assert_int_equal(frame->version, 2); /* a look never changes the version */
    frame_release(frame);
    frame = frame_of(study);
    assert_int_equal(frame->version, 2);
    frame_release(frame);
    study_close(study);
    struct store *store = store_open(path, true, &fault);
    struct arena arena;
    arena_init(&arena);
    struct stored_look *stored;
    size_t count = 0;
    assert_true(store_looks(store, &arena, &stored, &count, &fault));
    assert_int_equal(count, 3); /* drawing the same screen again is one look */
    assert_string_equal(stored[1].exhibit, "change-by-arm");
    arena_release(&arena);
    store_close(store);
}

/* ---- the invented trial's key ---- */

static const char *string_of(const cJSON *object, const char *name) {
    const cJSON *value = cJSON_GetObjectItemCaseSensitive(object, name);
    return cJSON_IsString(value) ? value->valuestring : NULL;
}

static bool concerns(const struct discrepancy *what, const char *participant) {
    for (size_t i = 0; i < what->participant_count; i++) {
        if (strcmp(what->participants[i], participant) == 0) {
            return true;
        }
    }
    return false;
}

/* The discrepancy that is about a planted trouble. */
static const struct discrepancy *found_for(const struct discrepancies *found, const cJSON *trouble) {
    const char *check = string_of(trouble, "check"), *column = string_of(trouble, "column");
    for (size_t i = 0; i < found->count; i++) {
        const struct discrepancy *what = &found->list[i];
        bool place = column ? what->column && strcmp(what->column, column) == 0 : !what->column;
        bool value = !column || (what->value && strcmp(what->value, string_of(trouble, "received")) == 0);
        if (strcmp(what->check, check) == 0 && place && value && concerns(what, string_of(trouble, "participant"))) {
            return what;
        }
    }
    return NULL;
}

/* Every trouble of the key has its discrepancy, and every must-settle discrepancy its trouble or a number out of
 * eligibility that nobody planted. */
static void check_found(const struct discrepancies *found, const cJSON *troubles) {
    const cJSON *trouble;
    cJSON_ArrayForEach(trouble, troubles) {
        const char *check = string_of(trouble, "check");
        if (strcmp(check, "beyond-fences") == 0) {
            continue; /* an outlier is shown by the distribution, and no check of cells is about it */
        }
        if (!found_for(found, trouble)) {
            fail_msg("not found: %s of %s, %s", check, string_of(trouble, "participant"), string_of(trouble, "received"));
        }
    }
    for (size_t i = 0; i < found->count; i++) {
        const struct discrepancy *what = &found->list[i];
        bool planted = strcmp(what->check, "out-of-eligibility") == 0 || what->severity != SEVERITY_MUST_SETTLE;
        cJSON_ArrayForEach(trouble, troubles) {
            planted = planted || (strcmp(what->check, string_of(trouble, "check")) == 0 && concerns(what, string_of(trouble, "participant")));
        }
        if (!planted) {
            fail_msg("found, but not in the key: %s", what->id);
        }
    }
}

static void check_settled(const struct discrepancies *found, const cJSON *troubles) {
    const cJSON *trouble;
    cJSON_ArrayForEach(trouble, troubles) {
        const struct discrepancy *what = found_for(found, trouble);
        const char *check = string_of(trouble, "check");
        if (what && strcmp(check, "below-limit") != 0 && (what->state != DISCREPANCY_SETTLED || what->settled_by == 0)) {
            fail_msg("%s is %s by %u", what->id, discrepancy_state_name(what->state), what->settled_by);
        }
        assert_true(what || strcmp(check, "beyond-fences") == 0);
    }
    for (size_t i = 0; i < found->count; i++) {
        bool open = found->list[i].state == DISCREPANCY_OPEN && found->list[i].severity == SEVERITY_MUST_SETTLE;
        if (open && strcmp(found->list[i].check, "out-of-eligibility") != 0) {
            fail_msg("still open: %s", found->list[i].id);
        }
    }
}

static enum cell_state as_clean(unsigned char state) {
    return state == CELL_MISSING_CODE || state == CELL_SET_MISSING ? CELL_BLANK : (enum cell_state)state;
}

static void assert_same_column(const struct frame *a, const struct column *x, const struct column *y, const char *name) {
    for (size_t p = 0; p < a->participant_count; p++) {
        bool same = as_clean(x->state[p]) == as_clean(y->state[p]);
        if (same && x->number && x->state[p] == CELL_OBSERVED) {
            same = memcmp(&x->number[p], &y->number[p], sizeof(double)) == 0; /* to the last digit */
        } else if (same && x->level && x->state[p] == CELL_OBSERVED) {
            same = x->levels ? strcmp(x->levels[x->level[p]].code, y->levels[y->level[p]].code) == 0 : x->level[p] == y->level[p];
        }
        if (!same) {
            fail_msg("%s of %s differs from the truth", name, a->participants[p].id);
        }
    }
}

static void assert_same_values(const struct frame *decided, const struct frame *clean) {
    assert_int_equal(decided->participant_count, clean->participant_count);
    for (size_t p = 0; p < clean->participant_count; p++) {
        assert_string_equal(decided->participants[p].id, clean->participants[p].id);
    }
    for (size_t v = 0; v < clean->plan->variable_count; v++) {
        assert_same_column(decided, decided->columns[v], clean->columns[v], clean->plan->variables[v].column);
    }
    assert_same_column(decided, decided->arm, clean->arm, "arm");
}

static void take_back_all(struct study *study, uint32_t planned, uint32_t last) {
    for (uint32_t number = last; number > planned; number--) {
        char batch[96];
        snprintf(batch, sizeof batch, "[{\"kind\": \"reverse\", \"number\": %u, \"reason\": \"r\"}]", number);
        must_decide(study, batch);
    }
}

static void check_trial(uint64_t seed) {
    struct quayside quayside;
    quayside_make(seed, &quayside);
    char name[32];
    snprintf(name, sizeof name, "quayside-%llu", (unsigned long long)seed);
    struct study *study = made(path_of(name), quayside.export_csv.data, quayside.plan_json.data);
    snprintf(name, sizeof name, "clean-%llu", (unsigned long long)seed);
    struct study *truth = made(path_of(name), quayside.clean_csv.data, quayside.plan_json.data);
    cJSON *key = cJSON_Parse(quayside.key_json.data);
    const cJSON *troubles = cJSON_GetObjectItemCaseSensitive(key, "troubles");
    struct arena arena;
    arena_init(&arena);
    struct discrepancies found;
    struct frame *received = study_received_frame(study), *clean = frame_of(truth);
    checks_run(received, received, &arena, &found);
    check_found(&found, troubles);
    uint32_t last = must_decide(study, quayside.decisions_json.data);
    struct frame *decided = frame_of(study);
    checks_run(decided, received, &arena, &found);
    check_settled(&found, troubles);
    assert_same_values(decided, clean);
    take_back_all(study, received->version, last);
    struct frame *back = frame_of(study);
    assert_string_equal(back->state_sha256, received->state_sha256);
    frame_release(back);
    frame_release(decided);
    frame_release(received);
    frame_release(clean);
    arena_release(&arena);
    cJSON_Delete(key);
    study_close(study);
    study_close(truth);
    quayside_release(&quayside);
}

static void test_key(void **state) {
    (void)state;
    check_trial(QUAYSIDE_SEED);
    for (uint64_t seed = 1; seed <= 4; seed++) {
        check_trial(seed);
    }
}

/* ---- many threads ---- */

enum { ROUNDS = 12, DECIDERS = 2, READERS = 2 };

struct shared {
    struct study *study;
    atomic_int failures, deciding;
};

static void *decide_often(void *argument) {
    struct shared *shared = argument;
    struct fault fault;
    uint32_t version;
    for (int i = 0; i < ROUNDS; i++) {
        const char *batch = i % 2 ? note : "[{\"kind\": \"exclude\", \"participant\": \"A\", \"set\": \"full\", \"reason\": \"r\"},"
                                           " {\"kind\": \"missing-code\", \"column\": \"y0\", \"value\": \"3\", \"reason\": \"r\"}]";
        shared->failures += !decide(shared->study, batch, ANY_VERSION, &version, &fault);
    }
    shared->deciding--;
    return NULL;
}

static void *read_often(void *argument) {
    struct shared *shared = argument;
    uint32_t last = 0;
    while (shared->deciding > 0) {
        struct fault fault;
        fault_init(&fault);
        struct frame *frame = study_frame(shared->study, &fault), *received = study_received_frame(shared->study);
        struct arena arena;
        arena_init(&arena);
        struct discrepancies found;
        shared->failures += !frame || frame->version < last;
        checks_run(frame, received, &arena, &found);
        shared->failures += frame->version > 2 && strcmp(frame->decisions[frame->version - 1].state, frame->state_sha256) != 0;
        char head[HASH_SIZE];
        study_head(shared->study, frame->version, head);
        shared->failures += strcmp(head, frame->decisions[frame->version - 1].hash) != 0;
        shared->failures += !study_look(shared->study, frame, "effect", "", who, &fault);
        last = frame->version;
        arena_release(&arena);
        frame_release(frame);
        frame_release(received);
    }
    return NULL;
}

static void test_threads(void **state) {
    (void)state;
    struct shared shared = {.study = made(path_of("threads"), csv, plan)};
    shared.deciding = DECIDERS;
    pthread_t threads[DECIDERS + READERS];
    for (size_t i = 0; i < DECIDERS + READERS; i++) {
        assert_int_equal(pthread_create(&threads[i], NULL, i < DECIDERS ? decide_often : read_often, &shared), 0);
    }
    for (size_t i = 0; i < DECIDERS + READERS; i++) {
        pthread_join(threads[i], NULL);
    }
    assert_int_equal(shared.failures, 0);
    struct frame *frame = frame_of(shared.study);
    assert_int_equal(frame->version, 2 + DECIDERS * (ROUNDS / 2 * 3));
    frame_release(frame);
    study_close(shared.study);
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_made_and_read_again), cmocka_unit_test(test_account), cmocka_unit_test(test_not_made),
        cmocka_unit_test(test_conflict), cmocka_unit_test(test_refused_leaves_all), cmocka_unit_test(test_two_handles),
        cmocka_unit_test(test_another_process), cmocka_unit_test(test_looks), cmocka_unit_test(test_key), cmocka_unit_test(test_threads),
    };
    return cmocka_run_group_tests_name("trial/study", tests, make_folder, remove_folder);
}
