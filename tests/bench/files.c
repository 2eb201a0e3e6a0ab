/* SPDX-License-Identifier: GPL-3.0-or-later */
/* `evenhand load` of a trial in two files, people and visits (by default 100 sites x 1,000 participants x 10 visits, a million
 * records), against the sqlite3 shell's own .import of the same two, both as processes taking turns, least of several times.
 * Usage: files FOLDER [SITES PARTICIPANTS VISITS REPEATS]; makes its files in FOLDER and removes them again. */
#include "base/clock.h"
#include <stdio.h>
#include <stdlib.h>
#include <unistd.h>

struct shape {
    int sites, participants, visits;
};

struct paths {
    char people[300], visits[300], plan[300], made[300];
};

static FILE *begin(const char *path) {
    FILE *file = fopen(path, "w");
    if (!file) {
        perror(path);
        exit(1);
    }
    return file;
}

static unsigned next(unsigned *state) { /* Knuth & Lewis' generator (Numerical Recipes, 7.1) */
    *state = *state * 1664525u + 1013904223u;
    return *state >> 8;
}

static void make_people(const char *path, const struct shape *shape, unsigned *state) {
    FILE *file = begin(path);
    fputs("pid,site,grp,sex,age\n", file);
    for (int i = 0; i < shape->sites * shape->participants; i++) {
        fprintf(file, "P%07d,S%03d,%c,%c,%u\n", i + 1, i / shape->participants + 1, "LW"[i % 2], "FM"[next(state) % 2], 40 + next(state) % 40);
    }
    fclose(file);
}

/* Each participant's visits one after the other; one in fifty did not take place. */
static void make_visits(const char *path, const struct shape *shape, unsigned *state) {
    FILE *file = begin(path);
    fputs("pid,visit,sbp,weight\n", file);
    for (int i = 0; i < shape->sites * shape->participants; i++) {
        for (int v = 0; v < shape->visits; v++) {
            if (next(state) % 50) {
                fprintf(file, "P%07d,V%d,%u,%u.%u\n", i + 1, v, 100 + next(state) % 100, 50 + next(state) % 60, next(state) % 10);
            }
        }
    }
    fclose(file);
}

static void make_plan(const char *path, const struct shape *shape) {
    FILE *file = begin(path);
    fputs("{\"title\": \"Load\", \"participant\": \"pid\", \"files\": [{\"id\": \"people\", \"participant\": \"pid\"}, {\"id\": \"visits\", \"layout\": "
          "\"visit\", \"participant\": \"pid\", \"visit\": \"visit\", \"codes\": [", file);
    for (int v = 0; v < shape->visits; v++) {
        fprintf(file, "%s\"V%d\"", v ? ", " : "", v);
    }
    fputs("]}], \"arm\": {\"column\": \"grp\", \"levels\": [{\"code\": \"L\", \"reference\": true}, {\"code\": \"W\"}]}, \"missing_codes\": [\"999\"], "
          "\"site\": {\"column\": \"site\"}, \"outcomes\": [{\"id\": \"sbp\", \"role\": \"primary\", \"better\": \"lower\", \"plausible\": [0, 500], "
          "\"visits\": [", file);
    for (int v = 0; v < shape->visits; v++) {
        fprintf(file, "%s{\"label\": \"V%d\", \"column\": \"visits.sbp@V%d\"}", v ? ", " : "", v, v);
    }
    fputs("]}], \"covariates\": [{\"id\": \"sex\", \"column\": \"sex\", \"kind\": \"category\"}, {\"id\": \"age\", \"column\": \"age\", \"kind\": \"number\"}, "
          "{\"id\": \"weight\", \"column\": \"visits.weight@V0\", \"kind\": \"number\", \"plausible\": [20, 300]}]}\n", file);
    fclose(file);
}

static double timed(const char *command, const char *made) {
    unlink(made);
    double start = clock_seconds();
    if (system(command) != 0) {
        fprintf(stderr, "failed: %s\n", command);
        exit(1);
    }
    double seconds = clock_seconds() - start;
    unlink(made);
    return seconds;
}

int main(int count, char **words) {
    const char *folder = count > 1 ? words[1] : "build";
    struct shape shape = {count > 2 ? atoi(words[2]) : 100, count > 3 ? atoi(words[3]) : 1000, count > 4 ? atoi(words[4]) : 10};
    int repeats = count > 5 ? atoi(words[5]) : 4;
    struct paths paths;
    snprintf(paths.people, sizeof paths.people, "%s/people.csv", folder);
    snprintf(paths.visits, sizeof paths.visits, "%s/visits.csv", folder);
    snprintf(paths.plan, sizeof paths.plan, "%s/files.json", folder);
    snprintf(paths.made, sizeof paths.made, "%s/files.made", folder);
    unsigned state = 20261201u;
    make_people(paths.people, &shape, &state);
    make_visits(paths.visits, &shape, &state);
    make_plan(paths.plan, &shape);
    char load[1500], shell[1500];
    snprintf(load, sizeof load, "build/evenhand load '%s' '%s' --plan '%s' --study '%s' --by 'Bench, timer' > /dev/null", paths.people, paths.visits,
        paths.plan, paths.made);
    snprintf(shell, sizeof shell, "sqlite3 '%s' '.mode csv' '.import %s p' '.import %s v'", paths.made, paths.people, paths.visits);
    double ours = 0, theirs = 0;
    for (int i = 0; i < repeats; i++) {
        double one = timed(load, paths.made), other = timed(shell, paths.made);
        ours = i == 0 || one < ours ? one : ours;
        theirs = i == 0 || other < theirs ? other : theirs;
    }
    unlink(paths.people);
    unlink(paths.visits);
    unlink(paths.plan);
    printf("files %d sites x %d participants x %d visits: evenhand load %.2f s (at most 3.00 wanted); sqlite3 .import of both files %.2f s; ratio %.2f\n",
        shape.sites, shape.participants, shape.visits, ours, theirs, ours / theirs);
    return ours < 3 ? 0 : 1;
}
