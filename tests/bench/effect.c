/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The whole `effect` exhibit, from the request's arguments to JSON, against R doing the same analyses on the same numbers (lm,
 * sandwich's HC3 by hand, MASS::rlm, t.test twice, wilcox.test, 9,999 Freedman-Lane permutations by lm.fit), in one run.
 * Usage: effect FOLDER; the reference is left out, and said to be, where R or MASS is not installed. */
#include "base/clock.h"
#include "demo/quayside.h"
#include "exhibits/registry.h"
#include "stats/estimate.h"
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

static const char reference[] =
    "if (!requireNamespace('MASS', quietly = TRUE)) quit(status = 3)\n"
    "d <- read.csv(commandArgs(TRUE)[1]); x <- model.matrix(~ arm + base + sex, d); z <- x[, -2]; y <- d$y\n"
    "one <- function() {\n"
    "  m <- lm(y ~ arm + base + sex, d); confint(m); h <- hatvalues(m); b <- solve(crossprod(x))\n"
    "  v <- b %*% crossprod(x * (resid(m) / (1 - h))) %*% b\n"
    "  summary(MASS::rlm(x, y, acc = 1e-14, maxit = 200))\n"
    "  t.test(y - base ~ arm, d); t.test(y ~ arm, d); suppressWarnings(wilcox.test(y - base ~ arm, d, conf.int = TRUE))\n"
    "  r <- lm.fit(z, y)$residuals; s <- sqrt(b[2, 2]); k <- nrow(x) - ncol(x)\n"
    "  t <- replicate(9999, { f <- lm.fit(x, sample(r)); f$coefficients[2] / (s * sqrt(sum(f$residuals^2) / k)) })\n"
    "}\n"
    "cat(min(replicate(2, system.time(one())[['elapsed']])))\n";

static void write_file(const char *path, const char *text) {
    FILE *file = fopen(path, "w");
    if (!file || fputs(text, file) < 0 || fclose(file) != 0) {
        perror(path);
        exit(1);
    }
}

/* The rows the exhibit analyses, for R. */
static size_t write_rows(const struct view *view, const char *path) {
    struct analysis analysis;
    analysis_take(&analysis, view->frame, &view->arms, 0, 2, SCALE_LINEAR, SET_FULL, view->arena);
    const struct column *sex = view->frame->columns[plan_variable(view->frame->plan, "sex")];
    struct text text;
    text_init(&text);
    text_literal(&text, "arm,base,sex,y\n");
    size_t rows = 0;
    for (size_t i = 0; i < analysis.count; i++) {
        if (!isnan(analysis.change[i])) {
            text_format(&text, "%d,%.17g,%d,%.17g\n", analysis.arm[i], analysis.baseline[i], sex->level[analysis.participant[i]],
                analysis.follow_up[i]);
            rows++;
        }
    }
    write_file(path, text.data);
    text_release(&text);
    return rows;
}

static double time_reference(const char *folder, const char *rows) {
    char script[300], command[900], answer[64] = "";
    snprintf(script, sizeof script, "%s/effect.R", folder);
    write_file(script, reference);
    snprintf(command, sizeof command, "Rscript --vanilla '%s' '%s' 2>/dev/null", script, rows);
    FILE *pipe = popen(command, "r");
    size_t length = pipe ? fread(answer, 1, sizeof answer - 1, pipe) : 0;
    int status = pipe ? pclose(pipe) : 1;
    unlink(script);
    return status == 0 && length ? atof(answer) : (double)NAN;
}

static double time_exhibit(struct study *study, const char *rows, size_t *analysed) {
    double least = INFINITY;
    for (int repeat = 0; repeat < 9; repeat++) {
        struct arena arena;
        arena_init(&arena);
        struct fault fault;
        fault_init(&fault);
        struct text out;
        text_init(&out);
        struct view view;
        double start = clock_seconds();
        if (!view_make(&view, study, "effect", NULL, 0, "Bench, timer", &arena, &fault)) {
            fprintf(stderr, "%s\n", fault.message);
            exit(1);
        }
        view_json(&view, &out);
        double seconds = clock_seconds() - start;
        least = seconds < least ? seconds : least;
        if (repeat == 0) {
            *analysed = write_rows(&view, rows);
        }
        view_release(&view);
        text_release(&out);
        arena_release(&arena);
    }
    return least;
}

int main(int count, char **words) {
    const char *folder = count > 1 ? words[1] : "build";
    char path[300], rows[300];
    snprintf(path, sizeof path, "%s/effect.study", folder);
    snprintf(rows, sizeof rows, "%s/effect.csv", folder);
    stats_init();
    struct quayside demo;
    quayside_make(QUAYSIDE_SEED, &demo);
    struct fault fault;
    fault_init(&fault);
    struct study *study = NULL;
    if (study_create(path, "clean.csv", demo.clean_csv.data, demo.clean_csv.length, "plan.json", demo.plan_json.data,
            demo.plan_json.length, "Bench, timer", NULL, &fault)) {
        study = study_open(path, &fault);
    }
    if (!study) {
        fprintf(stderr, "%s\n", fault.message);
        return 1;
    }
    size_t analysed = 0;
    double ours = time_exhibit(study, rows, &analysed), theirs = time_reference(folder, rows);
    printf("effect, %zu analysed of 240: %.1f ms of server time, %.2f of the 50 ms wanted; ", analysed, 1e3 * ours, ours / 0.05);
    if (isnan(theirs)) {
        printf("no reference: R with MASS is not installed\n");
    } else {
        printf("R, the same analyses: %.0f ms; ratio %.4f\n", 1e3 * theirs, ours / theirs);
    }
    study_close(study);
    quayside_release(&demo);
    unlink(path);
    unlink(rows);
    return ours <= 0.05 ? 0 : 1;
}
