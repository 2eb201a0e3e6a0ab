/* SPDX-License-Identifier: GPL-3.0-or-later */
/* `evenhand load` against the sqlite3 shell's own .import of the same file, both as processes taking turns, least of several
 * times; and the parts of it that read and write. Usage: load FOLDER [RECORDS COLUMNS REPEATS]; makes its files in FOLDER and
 * removes them again. */
#include "base/clock.h"
#include "base/memory.h"
#include "intake/cells.h"
#include "store/store.h"
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

struct times {
    double read, make, command, shell;
};

/* Every third number is an outcome with a baseline and a follow-up, the others are covariates. */
static void make_plan(const char *path, int columns) {
    FILE *file = fopen(path, "w");
    if (!file) {
        perror(path);
        exit(1);
    }
    fputs("{\"title\": \"Load\", \"participant\": \"pid\", \"arm\": {\"column\": \"grp\", \"levels\": [{\"code\": \"L\", \"reference\": "
          "true}, {\"code\": \"W\"}]}, \"missing_codes\": [\"999\"], \"outcomes\": [{\"id\": \"y\", \"role\": \"primary\", \"better\": "
          "\"lower\", \"plausible\": [0, 500], \"visits\": [{\"label\": \"Baseline\", \"column\": \"v3\"}, {\"label\": \"Later\", \"column\": "
          "\"v4\"}]}], \"covariates\": [{\"id\": \"sex\", \"column\": \"sex\", \"kind\": \"category\"}", file);
    for (int c = 5; c < columns; c++) {
        fprintf(file, ", {\"id\": \"c%d\", \"column\": \"v%d\", \"kind\": \"number\", \"plausible\": [0, 500]}", c, c);
    }
    fputs("]}\n", file);
    fclose(file);
}

/* An identifier, an arm, a sex, and then numbers of the trade's usual shapes, some blank. */
static void make_file(const char *path, int records, int columns) {
    FILE *file = fopen(path, "w");
    if (!file) {
        perror(path);
        exit(1);
    }
    fputs("pid,grp,sex", file);
    for (int c = 3; c < columns; c++) {
        fprintf(file, ",v%d", c);
    }
    unsigned state = 20261201u;
    for (int r = 0; r < records; r++) {
        fprintf(file, "\nP%06d,%c,%c", r + 1, "LW"[r % 2], "FM"[r / 2 % 2]);
        for (int c = 3; c < columns; c++) {
            state = state * 1664525u + 1013904223u; /* Knuth & Lewis' generator (Numerical Recipes, 7.1) */
            if (state >> 27 == 0) {
                fputc(',', file);
            } else {
                fprintf(file, ",%u.%u", 60 + (state >> 16) % 140, (state >> 8) % 10);
            }
        }
    }
    fputc('\n', file);
    fclose(file);
}

static char *read_file(const char *path, size_t *length) {
    FILE *file = fopen(path, "r");
    if (!file || fseek(file, 0, SEEK_END) != 0) {
        perror(path);
        exit(1);
    }
    *length = (size_t)ftell(file);
    rewind(file);
    char *bytes = memory_grow(NULL, *length, 1);
    if (fread(bytes, 1, *length, file) != *length) {
        perror(path);
        exit(1);
    }
    fclose(file);
    return bytes;
}

static void least(double *kept, double seconds) {
    *kept = *kept == 0 || seconds < *kept ? seconds : *kept;
}

static void time_parts(const char *csv, const char *study, struct times *times) {
    struct fault fault;
    struct cells cells;
    fault_init(&fault);
    unlink(study);
    double start = clock_seconds();
    size_t length;
    char *bytes = read_file(csv, &length);
    bool done = cells_read(&cells, bytes, length, csv, &fault);
    double after_read = clock_seconds();
    struct store_file file = {.name = "load.csv", .bytes = bytes, .length = length};
    struct store_table table = {cells.records, cells.columns, cells.names, cells.bytes, cells.start};
    struct store_birth birth = {.files = &file, .tables = &table, .file_count = 1, .plan = "{}", .by = "Bench, timer"};
    done = done && store_create(study, &birth, &fault);
    double end = clock_seconds();
    if (!done) {
        fprintf(stderr, "%s\n", fault.message);
        exit(1);
    }
    least(&times->read, after_read - start);
    least(&times->make, end - after_read);
    cells_release(&cells);
    memory_free(bytes);
    unlink(study);
}

static void time_command(const char *csv, const char *plan, const char *study, struct times *times) {
    char command[1200];
    snprintf(command, sizeof command, "build/evenhand load '%s' --plan '%s' --study '%s' --by 'Bench, timer' > /dev/null", csv, plan,
        study);
    unlink(study);
    double start = clock_seconds();
    if (system(command) != 0) {
        fprintf(stderr, "loading failed: %s\n", command);
        exit(1);
    }
    least(&times->command, clock_seconds() - start);
    unlink(study);
}

static void time_shell(const char *csv, const char *database, struct times *times) {
    char command[1200];
    snprintf(command, sizeof command, "sqlite3 '%s' '.mode csv' '.import %s t'", database, csv);
    unlink(database);
    double start = clock_seconds();
    if (system(command) != 0) {
        fprintf(stderr, "the sqlite3 shell failed: %s\n", command);
        exit(1);
    }
    least(&times->shell, clock_seconds() - start);
    unlink(database);
}

int main(int count, char **words) {
    const char *folder = count > 1 ? words[1] : "build";
    int records = count > 2 ? atoi(words[2]) : 100000, columns = count > 3 ? atoi(words[3]) : 20;
    int repeats = count > 4 ? atoi(words[4]) : 5;
    char csv[300], plan[300], study[300], database[300];
    snprintf(csv, sizeof csv, "%s/load.csv", folder);
    snprintf(plan, sizeof plan, "%s/load.json", folder);
    snprintf(study, sizeof study, "%s/load.study", folder);
    snprintf(database, sizeof database, "%s/load.db", folder);
    make_file(csv, records, columns);
    make_plan(plan, columns);
    struct times times = {0};
    for (int i = 0; i < repeats; i++) {
        time_command(csv, plan, study, &times);
        time_shell(csv, database, &times);
        time_parts(csv, study, &times);
    }
    unlink(csv);
    unlink(plan);
    printf("load %d x %d: evenhand load %.3f s (of it reading %.3f, writing the study %.3f); sqlite3 .import %.3f s; ratio %.2f (at "
           "most 1.00 wanted)\n", records, columns, times.command, times.read, times.make, times.shell,
        times.command / times.shell);
    return times.command <= times.shell ? 0 : 1;
}
