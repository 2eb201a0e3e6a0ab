/* SPDX-License-Identifier: GPL-3.0-or-later */
/* One decision against building a frame from scratch, and the checks, over 10,000 participants and 40 columns; least of
 * several times. Usage: trial FOLDER [RECORDS REPEATS]; writes no file. */
#include "base/clock.h"
#include "base/text.h"
#include "trial/checks.h"
#include "trial/frame.h"
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { NUMBERS = 30, CATEGORIES = 8 }; /* and the identifier and the arm: 40 columns */

struct bench {
    struct plan plan;
    struct cells cells;
    unsigned char letters[26];
    struct fault fault;
};

static void or_stop(const struct bench *bench, bool done) {
    if (!done) {
        fprintf(stderr, "%s\n", bench->fault.message);
        exit(1);
    }
}

static void make_plan(struct bench *bench) {
    struct text text;
    text_init(&text);
    text_literal(&text, "{\"title\": \"Bench\", \"participant\": \"pid\", \"arm\": {\"column\": \"grp\", \"levels\": [{\"code\": \"L\", "
                        "\"reference\": true}, {\"code\": \"W\"}]}, \"outcomes\": [");
    for (int i = 0; i < NUMBERS; i++) {
        text_format(&text, "%s{\"id\": \"v%d\", \"role\": \"%s\", \"better\": \"lower\", \"plausible\": [60, 199.5], \"visits\": [{\"label\": \"End\", "
            "\"column\": \"v%d\"}]}", i ? ", " : "", i, i ? "secondary" : "primary", i);
    }
    text_literal(&text, "], \"covariates\": [");
    for (int i = 0; i < CATEGORIES; i++) {
        text_format(&text, "%s{\"id\": \"c%d\", \"column\": \"c%d\", \"kind\": \"category\"%s}", i ? ", " : "", i, i,
            i % 2 ? "" : ", \"levels\": [{\"code\": \"F\"}, {\"code\": \"M\"}]");
    }
    text_literal(&text, "], \"blinding\": \"coded\"}");
    or_stop(bench, plan_read(&bench->plan, text.data, text.length, "bench", &bench->fault));
    text_release(&text);
}

/* One in 32 numbers is blank, one in 256 no number; every second category has as many codes as participants. */
static void make_cells(struct bench *bench, int records) {
    struct text text;
    text_init(&text);
    text_literal(&text, "pid,grp");
    for (int i = 0; i < NUMBERS + CATEGORIES; i++) {
        text_format(&text, ",%s%d", i < NUMBERS ? "v" : "c", i < NUMBERS ? i : i - NUMBERS);
    }
    unsigned state = 20261201u;
    for (int r = 0; r < records; r++) {
        text_format(&text, "\nP%06d,%c", (r * 7919) % records, "LW"[r % 2]);
        for (int i = 0; i < NUMBERS + CATEGORIES; i++) {
            state = state * 1664525u + 1013904223u; /* Knuth & Lewis' generator (Numerical Recipes, 7.1) */
            if (i >= NUMBERS) {
                if (i % 2 == 0) {
                    text_format(&text, ",%s", state >> 24 == 0 ? "f" : state >> 31 ? "F" : "M");
                } else {
                    text_format(&text, ",word %u", state >> 8);
                }
            } else if (state >> 27 == 0) {
                text_char(&text, ',');
            } else {
                text_format(&text, ",%u.%u%s", 60 + (state >> 16) % 140, (state >> 8) % 10, (state & 0xFF00) == 0 ? " mmHg" : "");
            }
        }
    }
    or_stop(bench, cells_read(&bench->cells, text.data, text.length, "bench.csv", &bench->fault));
    text_release(&text);
}

static struct frame *build(struct bench *bench, const struct decision *decisions, size_t count, struct frame *previous) {
    struct frame *frame = frame_build(&bench->plan, &bench->cells, "", bench->letters, decisions, count, previous, previous != NULL, &bench->fault);
    or_stop(bench, frame != NULL);
    return frame;
}

static void least(double *so_far, double seconds) {
    *so_far = *so_far <= 0 || seconds < *so_far ? seconds : *so_far;
}

int main(int count, char **words) {
    int records = count > 2 ? atoi(words[2]) : 10000, repeats = count > 3 ? atoi(words[3]) : 7;
    struct bench bench = {.letters = {1, 0}};
    make_plan(&bench);
    make_cells(&bench, records);
    struct decision decision = {.number = 1, .kind = DECISION_SET_MISSING, .column = "v3", .participant = "P000000",
        .reason = "r", .body = "{}"};
    decision.from = cells_at(&bench.cells, 0, 5);
    double scratch = 0, decided = 0, checked = 0;
    size_t found = 0;
    for (int i = 0; i < repeats; i++) {
        double start = clock_seconds();
        struct frame *first = build(&bench, NULL, 0, NULL);
        double built = clock_seconds();
        struct frame *second = build(&bench, &decision, 1, first);
        double after = clock_seconds();
        struct arena arena;
        arena_init(&arena);
        struct discrepancies all;
        checks_run(second, first, &arena, &all);
        least(&checked, clock_seconds() - after);
        least(&scratch, built - start);
        least(&decided, after - built);
        found = all.count;
        arena_release(&arena);
        frame_release(first);
        frame_release(second);
    }
    printf("frame %d x %d: from scratch %.1f ms, after one decision %.1f ms; ratio %.2f (at most 0.25 wanted)\n", records,
        NUMBERS + CATEGORIES + 2, scratch * 1000, decided * 1000, decided / scratch);
    printf("checks %d x %d: %.1f ms for %zu discrepancies; ratio %.2f to building the frame (at most 5.00 wanted)\n", records,
        NUMBERS + CATEGORIES + 2, checked * 1000, found, checked / scratch);
    plan_release(&bench.plan);
    cells_release(&bench.cells);
    return decided <= 0.25 * scratch && checked <= 5 * scratch ? 0 : 1;
}
