/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A study file proved against itself: sound as made, and every alteration behind the program's back is noticed. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <cmocka.h>
#include "demo/quayside.h"
#include "trial/study.h"
#include "trial/verify.h"
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

struct bench {
    char folder[64], path[96], copy[96], head[HASH_SIZE];
};

static int make(void **state) {
    struct bench *bench = memory_new(1, sizeof *bench);
    *state = bench;
    snprintf(bench->folder, sizeof bench->folder, "/tmp/evenhand-verify-XXXXXX");
    assert_non_null(mkdtemp(bench->folder));
    snprintf(bench->path, sizeof bench->path, "%s/q.study", bench->folder);
    snprintf(bench->copy, sizeof bench->copy, "%s/altered.study", bench->folder);
    struct quayside demo;
    quayside_make(QUAYSIDE_SEED, &demo);
    struct fault fault;
    fault_init(&fault);
    uint32_t version = 0;
    bool done = study_create(bench->path, "export.csv", demo.export_csv.data, demo.export_csv.length, "plan.json", demo.plan_json.data,
        demo.plan_json.length, "T. Ester, statistician", NULL, &fault);
    struct study *study = done ? study_open(bench->path, &fault) : NULL;
    done = study && study_decide(study, "T. Ester, statistician", demo.decisions_json.data, demo.decisions_json.length, "d.json",
                        ANY_VERSION, &version, &fault);
    if (done) {
        study_head(study, version, bench->head);
    }
    study_close(study);
    quayside_release(&demo);
    if (!done) {
        fail_msg("%s", fault.message);
    }
    return 0;
}

static int clear(void **state) {
    struct bench *bench = *state;
    char command[256];
    snprintf(command, sizeof command, "rm -rf '%s'", bench->folder);
    int status = system(command);
    memory_free(bench);
    return status;
}

/* True where the file is sound; the account is checked for a word. */
static bool verified(const char *path, const char *expect, const char *word) {
    struct fault fault;
    fault_init(&fault);
    struct text account;
    text_init(&account);
    bool sound = false, read = study_verify(path, expect, &sound, &account, &fault);
    const char *said = read ? account.data : fault.message;
    if (!strstr(said, word)) {
        fail_msg("wanted \"%s\" in: %s", word, said);
    }
    text_release(&account);
    return read && sound;
}

static void test_sound(void **state) {
    const struct bench *bench = *state;
    assert_true(verified(bench->path, NULL, "Everything agrees"));
    assert_true(verified(bench->path, bench->head, "Everything agrees"));
    char other[HASH_SIZE];
    memcpy(other, bench->head, HASH_SIZE);
    other[10] = other[10] == 'a' ? 'b' : 'a';
    assert_false(verified(bench->path, other, "not the one expected"));
    assert_false(verified(bench->path, "abc", "64 hexadecimal digits"));
    assert_false(verified("/nowhere/q.study", NULL, "/nowhere/q.study"));
}

/* Alters a copy with the sqlite3 shell, as somebody with the file and some knowledge could. */
static void test_altered_with_sql(void **state) {
    static const char *const alterations[] = {
        "drop trigger no_UPDATE_decisions; update decisions set reason = 'other' where number = 12",
        "drop trigger no_UPDATE_decisions; update decisions set entered_by = 'N. Obody' where number = 3",
        "drop trigger no_UPDATE_decisions; update decisions set value_to = '47' where kind = 'correct' and value_to = '46'",
        "drop trigger no_DELETE_decisions; delete from decisions where number = 24",
        "drop trigger no_DELETE_decisions",
        "drop trigger no_UPDATE_cells; update cells set c5 = '50' where record = 7",
        "drop trigger no_UPDATE_plan; update plan set text = replace(text, 'linear', 'log10')",
        "drop trigger no_UPDATE_study; update study set value = 'AB' where key = 'letters'; update study set value = 'BA' where key = 'letters' "
        "and value = 'AB'",
    };
    const struct bench *bench = *state;
    for (size_t i = 0; i < sizeof alterations / sizeof *alterations; i++) {
        char command[700];
        snprintf(command, sizeof command, "cp '%s' '%s' && sqlite3 '%s' \"%s\"", bench->path, bench->copy, bench->copy, alterations[i]);
        assert_int_equal(system(command), 0);
        if (verified(bench->copy, NULL, "")) {
            fail_msg("not noticed: %s", alterations[i]);
        }
    }
}

/* One byte of the kept export, of a cell and of a reason, changed in the file itself. */
static void test_altered_bytes(void **state) {
    static const char *const texts[] = {"152 mmHg", "A zero too many at data entry", "Printed advice", "Q1187", "<0.3"};
    const struct bench *bench = *state;
    for (size_t i = 0; i < sizeof texts / sizeof *texts; i++) {
        FILE *from = fopen(bench->path, "rb"), *to = fopen(bench->copy, "wb");
        assert_true(from && to);
        static char bytes[1 << 20];
        size_t length = fread(bytes, 1, sizeof bytes, from);
        char *at = memmem(bytes, length, texts[i], strlen(texts[i]));
        assert_non_null(at);
        at[2] ^= 1;
        assert_int_equal(fwrite(bytes, 1, length, to), length);
        fclose(from);
        fclose(to);
        if (verified(bench->copy, NULL, "")) {
            fail_msg("a changed byte in \"%s\" was not noticed", texts[i]);
        }
    }
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test_setup_teardown(test_sound, make, clear),
        cmocka_unit_test_setup_teardown(test_altered_with_sql, make, clear),
        cmocka_unit_test_setup_teardown(test_altered_bytes, make, clear),
    };
    return cmocka_run_group_tests_name("trial/verify", tests, NULL, NULL);
}
