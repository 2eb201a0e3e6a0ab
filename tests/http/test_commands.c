/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The program itself, run as people run it: what each command prints, its exit status, and one line on standard error
 * for every failure. Stands among the http tests because it, too, sees the program from outside. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <cmocka.h>
#include "base/text.h"
#include <signal.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <sys/wait.h>
#include <unistd.h>

static char program[512], folder[64];

static void slurp(const char *name, struct text *out) {
    char path[160], buffer[4096];
    snprintf(path, sizeof path, "%s/%s", folder, name);
    text_clear(out);
    FILE *file = fopen(path, "r");
    assert_non_null(file);
    for (size_t got; (got = fread(buffer, 1, sizeof buffer, file)) > 0;) {
        text_append(out, buffer, got);
    }
    fclose(file);
}

static void spill(const char *name, const char *content) {
    char path[160];
    snprintf(path, sizeof path, "%s/%s", folder, name);
    FILE *file = fopen(path, "w");
    assert_non_null(file);
    fputs(content, file);
    fclose(file);
}

/* Runs `evenhand ARGUMENTS` by the shell in the folder; standard output and error go to files there. The exit status.
 */
static int run(const char *arguments) {
    char command[1400];
    snprintf(command, sizeof command, "cd %s && timeout 60 %s %s > out 2> err < /dev/null", folder, program, arguments);
    int status = system(command);
    assert_true(WIFEXITED(status));
    return WEXITSTATUS(status);
}

/* An empty folder, and where the program of this variant is. */
static int folder_made(void **state) {
    (void)state;
    ssize_t length = readlink("/proc/self/exe", program, sizeof program - 1);
    assert_true(length > 0);
    program[length] = '\0';
    for (int i = 0; i < 2; i++) { /* build/VARIANT/tests/http/test_commands */
        *strrchr(program, '/') = '\0';
    }
    strcpy(strrchr(program, '/'), "/evenhand");
    snprintf(folder, sizeof folder, "/tmp/evenhand-test-XXXXXX");
    assert_non_null(mkdtemp(folder));
    return 0;
}

static int folder_gone(void **state) {
    (void)state;
    char command[96];
    snprintf(command, sizeof command, "rm -rf '%s'", folder);
    return system(command);
}

/* Starts `evenhand ARGUMENTS`, reads its output up to the line with the address, and gives its process and the address.
 */
static pid_t start(const char *arguments, char address[160], FILE **output) {
    int ends[2];
    assert_int_equal(pipe(ends), 0);
    pid_t child = fork();
    assert_true(child >= 0);
    if (child == 0) {
        char command[1400];
        dup2(ends[1], 1);
        close(ends[0]);
        close(ends[1]);
        snprintf(command, sizeof command, "cd %s && exec %s %s", folder, program, arguments);
        execl("/bin/sh", "sh", "-c", command, (char *)NULL);
        _exit(127);
    }
    close(ends[1]);
    *output = fdopen(ends[0], "r");
    char line[512];
    *address = '\0';
    while (!*address && fgets(line, sizeof line, *output)) {
        static const char said[] = "Evenhand is open at ";
        if (strncmp(line, said, strlen(said)) == 0) {
            snprintf(address, 160, "%.*s", (int)strcspn(line + strlen(said), "\n"), line + strlen(said));
        }
    }
    return child;
}

static void the_demonstration_opens_and_ends_cleanly(void **state) {
    (void)state;
    static const int signals[] = {SIGTERM, SIGINT};
    for (size_t i = 0; i < 2; i++) {
        char address[160], arguments[64];
        FILE *output;
        snprintf(arguments, sizeof arguments, "demo --no-browser --folder demo%s", i ? "2" : "");
        pid_t child = start(arguments, address, &output);
        unsigned port;
        char key[64];
        assert_int_equal(sscanf(address, "http://127.0.0.1:%u/?key=%63[0-9a-f]", &port, key), 2);
        assert_int_equal(strlen(key), 32);
        kill(child, signals[i]);
        int status;
        assert_int_equal(waitpid(child, &status, 0), child);
        fclose(output);
        assert_true(WIFEXITED(status));
        assert_int_equal(WEXITSTATUS(status), 0);
    }
    static const char *const made[] = {
        "export.csv", "plan.json", "decisions.json", "clean.csv", "key.json", "quayside.study"};
    for (size_t i = 0; i < sizeof made / sizeof *made; i++) {
        char path[160];
        struct stat there;
        snprintf(path, sizeof path, "%s/demo/%s", folder, made[i]);
        assert_int_equal(stat(path, &there), 0);
        assert_true(there.st_size > 100);
    }
}

static void a_second_open_of_a_study_is_refused(void **state) {
    (void)state;
    char address[160];
    FILE *output;
    pid_t child = start("open demo/quayside.study --no-browser", address, &output);
    assert_true(*address);
    struct text err;
    text_init(&err);
    assert_int_equal(run("open demo/quayside.study --no-browser"), 1);
    slurp("err", &err);
    assert_non_null(strstr(err.data, "demo/quayside.study is open already in another Evenhand"));
    assert_int_equal(
        run("exhibit demo/quayside.study decisions"), 0); /* but it may be read beside it, and decided on */
    spill("note.json", "[{\"kind\": \"note\", \"exhibit\": \"decisions\", \"text\": \"Beside an open one.\"}]");
    assert_int_equal(run("decide demo/quayside.study note.json --by 'A Tester, statistician'"), 0);
    kill(child, SIGTERM);
    waitpid(child, NULL, 0);
    fclose(output);
    text_release(&err);
}

static void load_decide_exhibit(void **state) {
    (void)state;
    struct text out;
    text_init(&out);
    assert_int_equal(
        run("load demo/export.csv --plan demo/plan.json --study q.study --by 'A Tester, statistician'"), 0);
    slurp("out", &out);
    assert_non_null(strstr(out.data, "export.csv: 241 records of 13 columns, UTF-8"));
    assert_int_equal(run("decide q.study demo/decisions.json --by 'A Tester, statistician'"), 0);
    slurp("out", &out);
    assert_int_equal(strncmp(out.data, "Recorded ", 9), 0);
    assert_int_equal(run("exhibit q.study decisions"), 0);
    slurp("out", &out);
    assert_non_null(strstr(out.data, "A Tester, statistician"));
    static const char *const forms[][2] = {
        {"json", "{\"exhibit\":\"decisions\""}, {"html", "<article"}, {"csv", ""}, {"text", ""}};
    for (size_t i = 0; i < sizeof forms / sizeof *forms; i++) {
        char arguments[96];
        snprintf(arguments, sizeof arguments, "exhibit q.study decisions --as %s", forms[i][0]);
        assert_int_equal(run(arguments), 0);
        slurp("out", &out);
        assert_int_equal(strncmp(out.data, forms[i][1], strlen(forms[i][1])), 0);
        assert_true(out.length > 100);
    }
    text_release(&out);
}

static void help_comes_from_the_table(void **state) {
    (void)state;
    static const char *const names[] = {"demo", "load", "open", "exhibit", "exhibits", "decide", "help"};
    struct text all, one;
    text_init(&all);
    text_init(&one);
    assert_int_equal(run("help"), 0);
    slurp("out", &all);
    for (size_t i = 0; i < sizeof names / sizeof *names; i++) {
        char arguments[64], line[64];
        snprintf(line, sizeof line, "\n  evenhand %s", names[i]);
        assert_non_null(strstr(all.data, line));
        snprintf(arguments, sizeof arguments, "help %s", names[i]);
        assert_int_equal(run(arguments), 0);
        slurp("out", &one);
        assert_int_equal(strncmp(one.data, line + 3, strlen(line) - 3), 0);
        struct text again;
        text_init(&again);
        snprintf(arguments, sizeof arguments, "%s --help", names[i]);
        assert_int_equal(run(arguments), 0);
        slurp("out", &again);
        assert_string_equal(again.data, one.data);
        text_release(&again);
    }
    assert_int_equal(run("--help"), 0);
    slurp("out", &one);
    assert_string_equal(one.data, all.data);
    assert_int_equal(run("exhibits"), 0);
    slurp("out", &one);
    assert_non_null(strstr(one.data, "decisions"));
    text_release(&all);
    text_release(&one);
}

static const struct {
    const char *arguments;
    int status;
    const char *sentence; /* after "evenhand: "; the whole of it */
} wrong[] = {
    {"", 2, "say what to do, one of demo, load, open, exhibit, exhibits, decide, verify, help; see: evenhand help"},
    {"lode x.csv", 2, "there is no command \"lode\"; see: evenhand help"},
    {"help lode", 2, "there is no command \"lode\"; see: evenhand help"},
    {"load", 2,
        "something is missing: evenhand load DATA.csv [MORE.csv ...] --plan PLAN.json --study FILE.study --by \"Name, role\"; see: "
        "evenhand help load"},
    {"load a.csv", 2, "load needs --plan PLAN.json; see: evenhand help load"},
    {"load a.csv --plan p.json", 2, "load needs --study FILE.study; see: evenhand help load"},
    {"load a.csv --plan p.json --study s.study", 2, "load needs --by \"Name, role\"; see: evenhand help load"},
    {"load a.csv --plan", 2, "--plan needs a value: --plan PLAN.json; see: evenhand help load"},
    {"load a.csv --plan p --plan q", 2, "--plan is given twice; see: evenhand help load"},
    {"load a.csv --colour red", 2, "load does not take --colour; see: evenhand help load"},
    {"exhibit s.study decisions --port 1", 2, "exhibit does not take --port; see: evenhand help exhibit"},
    {"exhibits all", 2, "\"all\" is one word too many: evenhand exhibits; see: evenhand help exhibits"},
    {"open a.study b.study", 2,
        "\"b.study\" is one word too many: evenhand open [FILE.study] [--port N] [--no-browser] [--folder DIR]; see: "
        "evenhand help open"},
    {"open --port 70000", 2, "--port 70000 is no port; it is a number from 0 to 65535; see: evenhand help open"},
    {"demo --port x", 2, "--port x is no port; it is a number from 0 to 65535; see: evenhand help demo"},
    {"exhibit s.study decisions --as pdf", 2,
        "--as pdf is not known; it is one of text, json, csv, svg, html; see: evenhand help exhibit"},
    {"exhibit s.study decisions sbp", 2,
        "\"sbp\" is not an argument; arguments are written name=value; see: evenhand help exhibit"},
    {"exhibit s.study decisions set=full set=full", 2, "the argument set is given twice; see: evenhand help exhibit"},
    {"load none.csv --plan demo/plan.json --study s.study --by A", 1,
        "none.csv: cannot be read (No such file or directory); check the name"},
    {"load demo/export.csv --plan none.json --study s.study --by A", 1,
        "none.json: cannot be read (No such file or directory); check the name"},
    {"load demo --plan demo/plan.json --study s.study --by A", 1,
        "demo: cannot be read (Is a directory); check the file"},
    {"load demo/export.csv demo/clean.csv --plan demo/plan.json --study s.study --by A", 1,
        "plan.json: the plan takes 1 file, and 2 came; list them under \"files\" in the plan, or load one"},
    {"load demo/export.csv --plan demo/plan.json --study demo/quayside.study --by A", 1,
        "demo/quayside.study is there already and stays as it is; choose another name or move it away"},
    {"load broken.csv --plan demo/plan.json --study s.study --by A", 1,
        "broken.csv, line 3, column 3: 3 fields where the header has 2; mend the line or its quotes and load again"},
    {"load demo/export.csv --plan broken.json --study s.study --by A", 1,
        "broken.json, line 2, column 1: this is not JSON from here on; mend the text (a comma, a quote or a bracket?) "
        "and try "
        "again"},
    {"open none.study --no-browser", 1, "none.study cannot be reached (No such file or directory); check the name"},
    {"open --folder none --no-browser", 1, "none: is not a folder; name one that is there with --folder"},
    {"demo --no-browser --folder demo", 1,
        "demo/quayside.study: is there already; open it, or give the demonstration another folder"},
    {"demo --no-browser --folder none/deeper", 1,
        "none/deeper: cannot be made (No such file or directory); choose another folder"},
    {"exhibit demo/quayside.study nope", 1, "there is no exhibit \"nope\"; `evenhand exhibits` lists them"},
    {"exhibit demo/quayside.study decisions colour=red", 1,
        "decisions does not take colour=; `evenhand exhibits` lists what each exhibit takes"},
    {"exhibit demo/quayside.study decisions --as svg", 1,
        "the exhibit decisions is a table without a figure; ask for it --as csv"},
    {"decide demo/quayside.study none.json --by A", 1,
        "none.json: cannot be read (No such file or directory); check the name"},
    {"decide demo/quayside.study empty.json --by A", 1,
        "empty.json: decisions are a list in square brackets with at least one in it"},
    {"decide demo/quayside.study wish.json --by A", 1,
        "wish.json: decision 1 of the batch has the kind \"wish\", which this version does not know; nothing was "
        "recorded"},
};

static void every_wrong_command_gets_one_line_and_changes_nothing(void **state) {
    (void)state;
    spill("broken.csv", "id,x\n1,2\n3,4,5\n");
    spill("broken.json", "{\"title\": \"T\",\n");
    spill("empty.json", "[]");
    spill("wish.json", "[{\"kind\": \"wish\"}]");
    struct text out, err;
    text_init(&out);
    text_init(&err);
    int bad = 0;
    for (size_t i = 0; i < sizeof wrong / sizeof *wrong; i++) {
        char line[1024], path[160];
        int status = run(wrong[i].arguments);
        slurp("out", &out);
        slurp("err", &err);
        snprintf(line, sizeof line, "evenhand: %s\n", wrong[i].sentence);
        if (status != wrong[i].status || strcmp(err.data, line) != 0 || out.length) {
            print_error("evenhand %s\n    got    %d %s    wanted %d %s%s", wrong[i].arguments, status, err.data,
                wrong[i].status, line, out.data);
            bad++;
        }
        snprintf(path, sizeof path, "%s/s.study", folder);
        assert_int_not_equal(access(path, F_OK), 0);
    }
    text_release(&out);
    text_release(&err);
    assert_int_equal(bad, 0);
}

static void output_that_cannot_be_written_is_a_failure(void **state) {
    (void)state;
    if (access("/dev/full", W_OK) != 0) {
        skip();
    }
    char command[1400];
    snprintf(command, sizeof command, "cd %s && %s help > /dev/full 2> err", folder, program);
    int status = system(command);
    assert_int_equal(WEXITSTATUS(status), 1);
    struct text err;
    text_init(&err);
    slurp("err", &err);
    assert_string_equal(err.data,
        "evenhand: cannot write to standard output (No space left on device); free space or choose another place\n");
    text_release(&err);
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(the_demonstration_opens_and_ends_cleanly), /* first: it makes what the others read */
        cmocka_unit_test(a_second_open_of_a_study_is_refused),
        cmocka_unit_test(load_decide_exhibit),
        cmocka_unit_test(help_comes_from_the_table),
        cmocka_unit_test(every_wrong_command_gets_one_line_and_changes_nothing),
        cmocka_unit_test(output_that_cannot_be_written_is_a_failure),
    };
    return cmocka_run_group_tests_name("http/commands", tests, folder_made, folder_gone);
}
