/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The commands: one table from which the arguments are parsed, the help is written and wrong usage is explained. */
#include "base/memory.h"
#include "demo/quayside.h"
#include "exhibits/registry.h"
#include "trial/verify.h"
#include "http/server.h"
#include "stats/estimate.h"
#include <errno.h>
#include <fcntl.h>
#include <pthread.h>
#include <signal.h>
#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <sys/wait.h>
#include <unistd.h>

enum exit_status { EXIT_DONE, EXIT_REFUSED, EXIT_USAGE };

enum option {
    OPTION_PLAN,
    OPTION_STUDY,
    OPTION_BY,
    OPTION_PORT,
    OPTION_NO_BROWSER,
    OPTION_FOLDER,
    OPTION_AS,
    OPTION_EXPECT,
    OPTION_COUNT
};

static const struct option_rule {
    const char *name, *value, *says; /* value NULL: a flag */
} option_rules[OPTION_COUNT] = {
    [OPTION_PLAN] = {"--plan", "PLAN.json", "what the columns mean and what was decided in advance"},
    [OPTION_STUDY] = {"--study", "FILE.study", "the study file to make"},
    [OPTION_BY] = {"--by", "\"Name, role\"", "who loads or decides; the record says so"},
    [OPTION_PORT] = {"--port", "N", "the port of 127.0.0.1 to serve on; 0, the default, takes a free one"},
    [OPTION_NO_BROWSER] = {"--no-browser", NULL, "only print the address"},
    [OPTION_FOLDER] = {"--folder", "DIR", "where studies are kept"},
    [OPTION_EXPECT] = {"--expect", "HASH", "the head of the record as it was noted elsewhere"},
    [OPTION_AS] = {"--as", "text|json|csv|svg|html", "the form of the exhibit; text is the default"},
};
#define WITH(option) (1u << (option))

enum { MOST_WORDS = 64 };
struct given { /* a command line taken apart */
    const struct command *command;
    const char *words[MOST_WORDS];
    size_t word_count;
    const char *options[OPTION_COUNT]; /* NULL where not given; "" for a flag */
};

struct command {
    const char *name, *arguments, *says, *details;
    unsigned options, required;
    size_t least, most; /* words after the command */
    enum exit_status (*run)(const struct given *given);
};

/* ---- saying what is wrong ---- */

static enum exit_status refuse(const struct fault *fault) {
    fprintf(stderr, "evenhand: %s\n", fault->message);
    return EXIT_REFUSED;
}

__attribute__((format(printf, 2, 3))) static enum exit_status wrong_usage(
    const struct command *command, const char *format, ...) {
    va_list arguments;
    va_start(arguments, format);
    fputs("evenhand: ", stderr);
    vfprintf(stderr, format, arguments);
    va_end(arguments);
    fprintf(stderr, "; see: evenhand help%s%s\n", command ? " " : "", command ? command->name : "");
    return EXIT_USAGE;
}

/* Everything printed is on its way, or the exit says otherwise. */
static enum exit_status printed(void) {
    if (fflush(stdout) != 0 || ferror(stdout)) {
        fprintf(stderr, "evenhand: cannot write to standard output (%s); free space or choose another place\n",
            strerror(errno));
        return EXIT_REFUSED;
    }
    return EXIT_DONE;
}

/* ---- files ---- */

static bool read_file(const char *path, struct text *out, struct fault *fault) {
    int handle = open(path, O_RDONLY | O_CLOEXEC);
    if (handle < 0) {
        return fault_set(fault, FAULT_MISSING, "%s: cannot be read (%s); check the name", path, strerror(errno));
    }
    char buffer[1 << 16];
    ssize_t got;
    while ((got = read(handle, buffer, sizeof buffer)) > 0) {
        text_append(out, buffer, (size_t)got);
    }
    int why = errno;
    close(handle);
    return got == 0 || fault_set(fault, FAULT_SYSTEM, "%s: cannot be read (%s); check the file", path, strerror(why));
}

static bool write_file(const char *path, const struct text *content, struct fault *fault) {
    int handle = open(path, O_WRONLY | O_CREAT | O_EXCL | O_CLOEXEC, 0666);
    if (handle < 0) {
        return fault_set(fault, FAULT_SYSTEM, "%s: cannot be made (%s); choose another folder", path, strerror(errno));
    }
    size_t done = 0;
    ssize_t put = 0;
    while (done < content->length && (put = write(handle, content->data + done, content->length - done)) > 0) {
        done += (size_t)put;
    }
    int why = errno;
    bool whole = done == content->length && put >= 0;
    if (close(handle) != 0 || !whole) {
        unlink(path);
        return fault_set(fault, FAULT_SYSTEM, "%s: cannot be written (%s); free space or choose another folder", path,
            strerror(why));
    }
    return true;
}

static const char *last_part(const char *path) {
    const char *slash = strrchr(path, '/');
    return slash ? slash + 1 : path;
}

/* ---- open and demo ---- */

static void start_browser(const char *address) {
    if (!getenv("DISPLAY") && !getenv("WAYLAND_DISPLAY")) {
        return;
    }
    pid_t child = fork();
    if (child == 0) {
        sigset_t none;
        sigemptyset(&none);
        sigprocmask(SIG_SETMASK, &none, NULL);
        /* The browser's own chatter belongs on no one's screen, and it must outlive nothing of ours. */
        int nowhere = open("/dev/null", O_RDWR);
        if (nowhere >= 0) {
            dup2(nowhere, 0);
            dup2(nowhere, 1);
            dup2(nowhere, 2);
        }
        if (fork() == 0) {
            setsid();
            execlp("xdg-open", "xdg-open", address, (char *)NULL);
        }
        _exit(0);
    }
    if (child > 0) {
        waitpid(child, NULL, 0);
    }
}

static bool port_of(const struct given *given, unsigned *port) {
    const char *text = given->options[OPTION_PORT] ? given->options[OPTION_PORT] : "0";
    char *end;
    long value = strtol(text, &end, 10);
    *port = (unsigned)value;
    return *text >= '0' && *text <= '9' && !*end && value <= 65535;
}

/* Serves until the program is told to end. study NULL: the first page. */
static bool serve(const struct given *given, const char *study, const char *folder, struct fault *fault) {
    unsigned port;
    bool known = port_of(given, &port);
    BUG_IF(!known);
    sigset_t ends;
    sigemptyset(&ends);
    sigaddset(&ends, SIGINT);
    sigaddset(&ends, SIGTERM);
    sigaddset(&ends, SIGHUP);
    pthread_sigmask(SIG_BLOCK, &ends, NULL); /* before the threads, which inherit it */
    signal(SIGPIPE, SIG_IGN);
    struct server_state *state = server_new(folder, fault);
    struct listener *listener = NULL;
    bool done =
        state && (!study || server_open_study(state, study, fault)) && (listener = listener_start(state, port, fault));
    if (done) {
        char address[128];
        snprintf(address, sizeof address, "http://127.0.0.1:%u/?key=%s", listener_port(listener), server_key(state));
        printf("Evenhand is open at %s\n", address);
        fflush(stdout);
        char once[33];
        if (!given->options[OPTION_NO_BROWSER] && server_key_once(state, once, fault)) {
            snprintf(address, sizeof address, "http://127.0.0.1:%u/?key=%s", listener_port(listener), once);
            start_browser(address);
        }
        int which;
        sigwait(&ends, &which);
    }
    listener_stop(listener);
    server_free(state);
    return done;
}

static enum exit_status check_port(const struct given *given) {
    unsigned port;
    return port_of(given, &port) ? EXIT_DONE
                                 : wrong_usage(given->command, "--port %s is no port; it is a number from 0 to 65535",
                                       given->options[OPTION_PORT]);
}

static enum exit_status run_open(const struct given *given) {
    struct fault fault;
    fault_init(&fault);
    const char *folder = given->options[OPTION_FOLDER] ? given->options[OPTION_FOLDER] : ".";
    struct stat status;
    if (check_port(given) != EXIT_DONE) {
        return EXIT_USAGE;
    }
    if (stat(folder, &status) != 0 || !S_ISDIR(status.st_mode)) {
        fault_set(&fault, FAULT_MISSING, "%s: is not a folder; name one that is there with --folder", folder);
        return refuse(&fault);
    }
    bool done = serve(given, given->word_count ? given->words[0] : NULL, folder, &fault);
    return done ? printed() : refuse(&fault);
}

/* The same trial as its data base would give it out in four files. */
static bool write_long(const char *folder, struct arena *arena, struct fault *fault) {
    const char *place = arena_format(arena, "%s/long", folder);
    if (mkdir(place, 0777) != 0 && errno != EEXIST) {
        return fault_set(fault, FAULT_SYSTEM, "%s: cannot be made (%s); choose another folder", place, strerror(errno));
    }
    struct quayside_files quayside;
    quayside_make_files(QUAYSIDE_SEED, &quayside);
    const struct {
        const char *name;
        const struct text *content;
    } files[] = {{"people.csv", &quayside.people_csv}, {"visits.csv", &quayside.visits_csv}, {"labs.csv", &quayside.labs_csv},
        {"events.csv", &quayside.events_csv}, {"plan.json", &quayside.plan_json}, {"decisions.json", &quayside.decisions_json}};
    bool done = true;
    for (size_t i = 0; done && i < sizeof files / sizeof *files; i++) {
        done = write_file(arena_format(arena, "%s/%s", place, files[i].name), files[i].content, fault);
    }
    quayside_files_release(&quayside);
    return done;
}

/* Writes the demonstration's files into the folder and makes the study of them. */
static bool make_demo(
    const char *folder, struct arena *arena, const char **study, struct text *account, struct fault *fault) {
    struct quayside quayside;
    quayside_make(QUAYSIDE_SEED, &quayside);
    const struct {
        const char *name;
        const struct text *content;
    } files[] = {{"export.csv", &quayside.export_csv}, {"plan.json", &quayside.plan_json},
        {"decisions.json", &quayside.decisions_json}, {"clean.csv", &quayside.clean_csv},
        {"key.json", &quayside.key_json}};
    *study = arena_format(arena, "%s/quayside.study", folder);
    bool done = access(*study, F_OK) != 0 ||
                fault_set(fault, FAULT_CONFLICT,
                    "%s: is there already; open it, or give the demonstration another folder", *study);
    for (size_t i = 0; done && i < sizeof files / sizeof *files; i++) {
        done = write_file(arena_format(arena, "%s/%s", folder, files[i].name), files[i].content, fault);
    }
    done = done && write_long(folder, arena, fault);
    done = done && study_create(*study, "export.csv", quayside.export_csv.data, quayside.export_csv.length, "plan.json",
                       quayside.plan_json.data, quayside.plan_json.length, "Demonstration, made by the program",
                       account, fault);
    quayside_release(&quayside);
    return done;
}

static bool demo_folder(const struct given *given, struct arena *arena, const char **folder, struct fault *fault) {
    const char *wanted = given->options[OPTION_FOLDER];
    if (wanted) {
        *folder = wanted;
        return mkdir(wanted, 0777) == 0 || errno == EEXIST ||
               fault_set(
                   fault, FAULT_SYSTEM, "%s: cannot be made (%s); choose another folder", wanted, strerror(errno));
    }
    const char *temporary = getenv("TMPDIR");
    char *made = arena_format(arena, "%s/evenhand-demo-XXXXXX", temporary && *temporary ? temporary : "/tmp");
    *folder = mkdtemp(made);
    return *folder || fault_set(fault, FAULT_SYSTEM, "%s: no temporary folder can be made (%s); name one with --folder",
                          made, strerror(errno));
}

static enum exit_status run_demo(const struct given *given) {
    struct fault fault;
    fault_init(&fault);
    if (check_port(given) != EXIT_DONE) {
        return EXIT_USAGE;
    }
    struct arena arena;
    arena_init(&arena);
    struct text account;
    text_init(&account);
    const char *folder, *study;
    bool done = demo_folder(given, &arena, &folder, &fault) && make_demo(folder, &arena, &study, &account, &fault);
    if (done) {
        /* Standard output has the one line with the address; this is for the person who reads along. */
        fprintf(stderr, "The invented Quayside Walking Trial is in %s: the study quayside.study, what it was made from "
               "(export.csv, "
               "plan.json),\nthe right decisions (decisions.json) and the truth (clean.csv, key.json); in its folder long the "
               "same trial as four files.\n",
            folder);
        done = serve(given, study, folder, &fault);
    }
    text_release(&account);
    arena_release(&arena);
    return done ? printed() : refuse(&fault);
}

/* ---- load, decide, exhibit, exhibits ---- */

static void print_account(const struct text *account) {
    fputs(account->data, stdout);
    if (account->length && account->data[account->length - 1] != '\n') {
        putchar('\n');
    }
}

static enum exit_status run_load(const struct given *given) {
    memory_for_bulk();
    struct fault fault;
    fault_init(&fault);
    size_t count = given->word_count;
    struct text *data = memory_new(count, sizeof *data), plan, account;
    struct study_file *files = memory_new(count, sizeof *files);
    text_init(&plan);
    text_init(&account);
    const char *plan_path = given->options[OPTION_PLAN];
    bool done = read_file(plan_path, &plan, &fault);
    for (size_t i = 0; i < count; i++) {
        text_init(&data[i]);
        done = done && read_file(given->words[i], &data[i], &fault);
        files[i] = (struct study_file){last_part(given->words[i]), data[i].data, data[i].length};
    }
    done = done && study_create_from(given->options[OPTION_STUDY], files, count, last_part(plan_path), plan.data, plan.length,
                       given->options[OPTION_BY], &account, &fault);
    if (done) {
        print_account(&account);
    }
    for (size_t i = 0; i < count; i++) {
        text_release(&data[i]);
    }
    memory_free(data);
    memory_free(files);
    text_release(&plan);
    text_release(&account);
    return done ? printed() : refuse(&fault);
}

static enum exit_status run_decide(const struct given *given) {
    struct fault fault;
    fault_init(&fault);
    struct text batch;
    text_init(&batch);
    struct study *study = NULL;
    uint32_t version = 0;
    const char *path = given->words[1];
    bool done = read_file(path, &batch, &fault) && (study = study_open(given->words[0], &fault));
    struct frame *before = done ? study_frame(study, &fault) : NULL;
    uint32_t first = before ? before->version : 0;
    done = before && study_decide(study, given->options[OPTION_BY], batch.data, batch.length, last_part(path),
                         ANY_VERSION, &version, &fault);
    frame_release(before);
    if (done) {
        printf("Recorded %u decision%s; %s now stands after decision %u.\n", version - first,
            version - first == 1 ? "" : "s", given->words[0], version);
    }
    if (study) {
        study_close(study);
    }
    text_release(&batch);
    return done ? printed() : refuse(&fault);
}

static void as_text(const struct view *view, struct text *out) {
    view_text(view, out);
}
static void as_html(const struct view *view, struct text *out) {
    view_html(view, false, out);
}
static void as_svg(const struct view *view, struct text *out) {
    view_svg(view, false, out); /* nothing is written where there is no figure */
}

static const struct {
    const char *name;
    void (*write)(const struct view *view, struct text *out);
} forms[] = {{"text", as_text}, {"json", view_json}, {"csv", view_csv}, {"svg", as_svg}, {"html", as_html}, {0}};

static size_t form_of(const struct given *given) {
    const char *wanted = given->options[OPTION_AS] ? given->options[OPTION_AS] : "text";
    size_t i = 0;
    while (forms[i].name && strcmp(forms[i].name, wanted) != 0) {
        i++;
    }
    return i;
}

/* The words after the exhibit's name as name=value pairs. */
static enum exit_status arguments_of(
    const struct given *given, struct arena *arena, struct asked *asked, size_t *count) {
    for (size_t i = 2; i < given->word_count; i++) {
        const char *word = given->words[i], *equals = strchr(word, '=');
        if (!equals || equals == word) {
            return wrong_usage(given->command, "\"%s\" is not an argument; arguments are written name=value", word);
        }
        asked[*count] = (struct asked){arena_bytes(arena, word, (size_t)(equals - word)), equals + 1};
        for (size_t j = 0; j < *count; j++) {
            if (strcmp(asked[j].name, asked[*count].name) == 0) {
                return wrong_usage(given->command, "the argument %s is given twice", asked[j].name);
            }
        }
        (*count)++;
    }
    return EXIT_DONE;
}

static bool show(struct study *study, const struct given *given, const struct asked *asked, size_t count,
    struct arena *arena, struct text *out, struct fault *fault) {
    char by[256];
    account_name(by, sizeof by);
    struct view view;
    if (!view_make(&view, study, given->words[1], asked, count, by, arena, fault)) {
        return false;
    }
    forms[form_of(given)].write(&view, out);
    bool done = out->length || fault_set(fault, FAULT_REFUSED,
                                   "the exhibit %s is a table without a figure; ask for it --as csv", given->words[1]);
    view_release(&view);
    return done;
}

static enum exit_status run_exhibit(const struct given *given) {
    struct fault fault;
    fault_init(&fault);
    if (!forms[form_of(given)].name) {
        return wrong_usage(
            given->command, "--as %s is not known; it is one of text, json, csv, svg, html", given->options[OPTION_AS]);
    }
    struct arena arena;
    arena_init(&arena);
    struct text out;
    text_init(&out);
    struct asked asked[MOST_WORDS];
    size_t count = 0;
    enum exit_status status = arguments_of(given, &arena, asked, &count);
    if (status == EXIT_DONE) {
        struct study *study = study_open(given->words[0], &fault);
        if (study && show(study, given, asked, count, &arena, &out, &fault)) {
            fwrite(out.data, 1, out.length, stdout);
            status = printed();
        } else {
            status = refuse(&fault);
        }
        if (study) {
            study_close(study);
        }
    }
    text_release(&out);
    arena_release(&arena);
    return status;
}

static enum exit_status run_exhibits(const struct given *given) {
    (void)given;
    struct text out;
    text_init(&out);
    exhibits_help(&out);
    fputs(out.data, stdout);
    text_release(&out);
    return printed();
}

/* ---- help, from the table ---- */

static const struct command *command_of(const char *name);

static void help_command(const struct command *command) {
    printf("evenhand %s%s%s\n\n%s.\n%s\n", command->name, *command->arguments ? " " : "", command->arguments,
        command->says, command->details);
    for (size_t i = 0; i < OPTION_COUNT; i++) {
        if (command->options & WITH(i)) {
            const struct option_rule *rule = &option_rules[i];
            printf("\n  %s%s%s\n      %s%s\n", rule->name, rule->value ? " " : "", rule->value ? rule->value : "",
                rule->says, command->required & WITH(i) ? " (needed)" : "");
        }
    }
}

static enum exit_status run_help(const struct given *given);

static enum exit_status run_verify(const struct given *given) {
    struct fault fault;
    fault_init(&fault);
    struct text account;
    text_init(&account);
    bool sound = false;
    bool read = study_verify(given->words[0], given->options[OPTION_EXPECT], &sound, &account, &fault);
    if (read) {
        fputs(account.data, stdout);
        fault_set(&fault, FAULT_INPUT, "%s is not as it was recorded; see above, and ask for an earlier copy", given->words[0]);
    }
    text_release(&account);
    return read && sound ? printed() : refuse(&fault);
}

static const struct command commands[] = {
    {"demo", "[--port N] [--no-browser] [--folder DIR]", "makes the demonstration study and opens it",
        "The study of the invented Quayside Walking Trial is made in a new temporary folder, or in DIR, beside the "
        "files it was\n"
        "made from, the right decisions and the truth.",
        WITH(OPTION_PORT) | WITH(OPTION_NO_BROWSER) | WITH(OPTION_FOLDER), 0, 0, 0, run_demo},
    {"load", "DATA.csv [MORE.csv ...] --plan PLAN.json --study FILE.study --by \"Name, role\"",
        "makes a new study file from an export", "Several files are matched to the plan's \"files\" by name, or in order where it gives no names. Prints a short account\n"
        "of what was read. Never overwrites a file.",
        WITH(OPTION_PLAN) | WITH(OPTION_STUDY) | WITH(OPTION_BY),
        WITH(OPTION_PLAN) | WITH(OPTION_STUDY) | WITH(OPTION_BY), 1, MOST_WORDS, run_load},
    {"open", "[FILE.study] [--port N] [--no-browser] [--folder DIR]", "serves a study to a browser on this machine",
        "Without a study it serves the first page, where a study is made from a dropped file and kept in DIR (the "
        "working folder\n"
        "by default). It prints the address with its key and runs until it is interrupted.",
        WITH(OPTION_PORT) | WITH(OPTION_NO_BROWSER) | WITH(OPTION_FOLDER), 0, 0, 1, run_open},
    {"exhibit", "FILE.study NAME [key=value ...] [--as text|json|csv|svg|html]",
        "writes one exhibit to standard output",
        "While arms are coded, showing an outcome by arm is entered in the study's table of looks under the account's "
        "name.\n"
        "evenhand exhibits lists the exhibits and their arguments.",
        WITH(OPTION_AS), 0, 2, MOST_WORDS, run_exhibit},
    {"exhibits", "", "lists every exhibit with its arguments", "", 0, 0, 0, 0, run_exhibits},
    {"decide", "FILE.study DECISIONS.json --by \"Name, role\"", "records a batch of decisions, all or none",
        "Every decision but a few needs a reason. Where one is refused none is recorded, and the sentence names it.",
        WITH(OPTION_BY), WITH(OPTION_BY), 2, 2, run_decide},
    {"verify", "FILE.study [--expect HASH]", "proves a study file against itself and against a head noted elsewhere",
        "Reads the kept bytes again, replays every decision, checks the chain and its head, and says what differs first.",
        WITH(OPTION_EXPECT), 0, 1, 1, run_verify},
    {"help", "[COMMAND]", "says what the commands do", "", 0, 0, 0, 1, run_help},
    {0},
};

static const struct command *command_of(const char *name) {
    for (const struct command *command = commands; command->name; command++) {
        if (strcmp(command->name, name) == 0) {
            return command;
        }
    }
    return NULL;
}

static enum exit_status run_help(const struct given *given) {
    const struct command *about = given->word_count ? command_of(given->words[0]) : NULL;
    if (about) {
        help_command(about);
        return printed();
    }
    if (given->word_count) {
        return wrong_usage(NULL, "there is no command \"%s\"", given->words[0]);
    }
    puts("Evenhand takes a randomised trial's export, settles its doubtful values by recorded decisions, and shows "
         "what is missing,\n"
         "what changed and the baseline-adjusted effect. It serves a page to a browser on this machine and to no "
         "other.\n");
    for (const struct command *command = commands; command->name; command++) {
        printf("  evenhand %s%s%s\n      %s\n", command->name, *command->arguments ? " " : "", command->arguments,
            command->says);
    }
    puts("\nFor use by people qualified to analyse trials, beside the approved protocol and analysis plan. Not a basis "
         "for treating any\n"
         "one patient.");
    return printed();
}

/* ---- the command line ---- */

static size_t option_of(const char *word) {
    size_t i = 0;
    while (i < OPTION_COUNT && strcmp(option_rules[i].name, word) != 0) {
        i++;
    }
    return i;
}

/* Takes the option at words[*at] and, where it has one, the value after it. */
static enum exit_status take_option(struct given *given, char **words, int count, int *at) {
    const struct command *command = given->command;
    const char *word = words[*at];
    size_t which = option_of(word);
    if (which == OPTION_COUNT || !(command->options & WITH(which))) {
        return wrong_usage(command, "%s does not take %s", command->name, word);
    }
    if (given->options[which]) {
        return wrong_usage(command, "%s is given twice", word);
    }
    given->options[which] = "";
    if (option_rules[which].value) {
        if (*at + 1 >= count || !*words[*at + 1]) {
            return wrong_usage(command, "%s needs a value: %s %s", word, word, option_rules[which].value);
        }
        given->options[which] = words[++*at];
    }
    return EXIT_DONE;
}

static enum exit_status check_given(const struct given *given) {
    const struct command *command = given->command;
    if (given->word_count < command->least) {
        return wrong_usage(command, "something is missing: evenhand %s %s", command->name, command->arguments);
    }
    if (given->word_count > command->most) {
        return wrong_usage(command, "\"%s\" is one word too many: evenhand %s%s%s", given->words[command->most],
            command->name, *command->arguments ? " " : "", command->arguments);
    }
    for (size_t i = 0; i < OPTION_COUNT; i++) {
        if ((command->required & WITH(i)) && !given->options[i]) {
            return wrong_usage(command, "%s needs %s %s", command->name, option_rules[i].name, option_rules[i].value);
        }
    }
    return EXIT_DONE;
}

static enum exit_status say_what_to_do(void) {
    struct text names;
    text_init(&names);
    for (const struct command *command = commands; command->name; command++) {
        text_format(&names, "%s%s", command == commands ? "" : ", ", command->name);
    }
    enum exit_status status = wrong_usage(NULL, "say what to do, one of %s", names.data);
    text_release(&names);
    return status;
}

static enum exit_status run(int count, char **words) {
    if (count < 2) {
        return say_what_to_do();
    }
    bool help_asked = strcmp(words[1], "--help") == 0 || strcmp(words[1], "-h") == 0;
    struct given given = {.command = command_of(help_asked ? "help" : words[1])};
    if (!given.command) {
        return wrong_usage(NULL, "there is no command \"%s\"", words[1]);
    }
    bool only_words = false;
    for (int at = 2; at < count; at++) {
        if (!only_words && strcmp(words[at], "--help") == 0) {
            help_command(given.command);
            return printed();
        }
        if (!only_words && strcmp(words[at], "--") == 0) {
            only_words = true;
        } else if (!only_words && words[at][0] == '-' && words[at][1]) {
            enum exit_status status = take_option(&given, words, count, &at);
            if (status != EXIT_DONE) {
                return status;
            }
        } else if (given.word_count == MOST_WORDS) {
            return wrong_usage(given.command, "too many words on the command line");
        } else {
            given.words[given.word_count++] = words[at];
        }
    }
    enum exit_status status = check_given(&given);
    return status == EXIT_DONE ? given.command->run(&given) : status;
}

int main(int count, char **words) {
    stats_init();
    return (int)run(count, words);
}
