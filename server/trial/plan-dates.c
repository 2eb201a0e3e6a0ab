/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "server/trial/plan-parts.h"
#include "trial/dates.h"
#include <math.h>
#include <string.h>

static const char *order_names(struct reader *reader) {
    const char *names = "";
    for (int i = 0; i < DATE_ORDER_COUNT; i++) {
        names = arena_format(&reader->plan->arena, "%s%s%s", names, i ? ", " : "", date_order_name((enum date_order)i));
    }
    return names;
}

static bool order_of(struct reader *reader, const cJSON *item, const char *path, enum date_order *order) {
    return (cJSON_IsString(item) && date_order_read(item->valuestring, order)) ||
           wrong(reader, path,
               arena_format(&reader->plan->arena, "must be an order of dates, one of %s", order_names(reader)));
}

static bool read_file_orders(struct reader *reader, const cJSON *dates) {
    struct plan *plan = reader->plan;
    const cJSON *files = member(dates, "files");
    plan->dates->file_order = ARENA_NEW(&plan->arena, plan->file_count, enum date_order);
    plan->dates->file_says = ARENA_NEW(&plan->arena, plan->file_count, bool);
    if (files && !cJSON_IsObject(files)) {
        return wrong(
            reader, "dates.files", "must be an object of files and their orders, such as {\"visits\": \"Y/M/D\"}");
    }
    for (const cJSON *item = files ? files->child : NULL; item; item = item->next) {
        const char *path = join(reader, "dates.files", item->string);
        int file = file_of(plan, item->string, strlen(item->string));
        if (file == NOWHERE) {
            return wrong(reader, path, "is not the id of a file of this plan");
        }
        if (plan->dates->file_says[file]) {
            return wrong(reader, path, "stands there twice; keep one");
        }
        if (!order_of(reader, item, path, &plan->dates->file_order[file])) {
            return false;
        }
        plan->dates->file_says[file] = true;
    }
    return true;
}

static bool read_site_orders(struct reader *reader, const cJSON *root, const cJSON *dates) {
    struct plan *plan = reader->plan;
    const cJSON *sites = member(dates, "sites");
    if (!sites) {
        return true;
    }
    if (!cJSON_IsObject(sites)) {
        return wrong(reader, "dates.sites", "must be an object of sites and their orders, such as {\"07\": \"M/D/Y\"}");
    }
    if (!member(root, "site")) {
        return wrong(reader, "dates.sites", "needs \"site\" in the plan, with the column of the site");
    }
    plan->dates->sites = ARENA_NEW(&plan->arena, cJSON_GetArraySize(sites), struct site_order);
    for (const cJSON *item = sites->child; item; item = item->next) {
        const char *path = join(reader, "dates.sites", item->string);
        struct site_order *site = &plan->dates->sites[plan->dates->site_count];
        for (size_t i = 0; i < plan->dates->site_count; i++) {
            if (strcmp(plan->dates->sites[i].site, item->string) == 0) {
                return wrong(reader, path, "stands there twice; keep one");
            }
        }
        site->site = arena_text(&plan->arena, item->string);
        if (!order_of(reader, item, path, &site->order)) {
            return false;
        }
        plan->dates->site_count++;
    }
    return true;
}

static bool read_earliest(struct reader *reader, const cJSON *dates) {
    const char *text = NULL;
    reader->plan->dates->earliest = (double)NAN;
    if (!read_text(reader, dates, "dates", "earliest", false, &text) || !text) {
        return !member(dates, "earliest");
    }
    return (date_is_iso(text) && date_read(text, DATE_YMD, &reader->plan->dates->earliest) == DATE_READ) ||
           wrong(reader, "dates.earliest", "must be a day as YYYY-MM-DD, such as \"2019-01-01\"");
}

/* A date said once of each participant: randomised, stopped, withdrew, died. */
static bool read_single(
    struct reader *reader, const cJSON *dates, enum moment_kind kind, const char *label, int *index) {
    struct dates *to = reader->plan->dates;
    const char *key = moment_name(kind), *path = join(reader, "dates", key);
    const cJSON *item = member(dates, key);
    *index = NOWHERE;
    if (!item) {
        return true;
    }
    struct moment *moment = &to->moments[to->moment_count];
    *moment = (struct moment){.kind = kind, .label = label, .target = (double)NAN};
    if (!keys_known(reader, item, path, "column file visit") ||
        !read_place(reader, item, path, &moment->column, &moment->place)) {
        return false;
    }
    *index = (int)to->moment_count++;
    return true;
}

static bool read_moment(struct reader *reader, const cJSON *item, const char *path) {
    struct dates *to = reader->plan->dates;
    struct moment *moment = &to->moments[to->moment_count];
    *moment = (struct moment){.kind = MOMENT_VISIT, .target = (double)NAN};
    if (!keys_known(reader, item, path, "label column file visit target window") ||
        !read_text(reader, item, path, "label", true, &moment->label) ||
        !read_text(reader, item, path, "visit", false, &moment->visit) ||
        !read_place(reader, item, path, &moment->column, &moment->place) ||
        !read_number(reader, item, path, "target", &moment->target) ||
        !read_range(reader, item, path, "window", &moment->window)) {
        return false;
    }
    if (moment->window.given && isnan(moment->target)) {
        return wrong(reader, join(reader, path, "window"), "needs a target day, from which it is counted");
    }
    if (moment->window.given && (moment->window.low > 0 || moment->window.high < 0)) {
        return wrong(
            reader, join(reader, path, "window"), "is counted from the target day and must hold it, such as [-14, 14]");
    }
    for (size_t i = 0; i < to->moment_count; i++) {
        if (strcmp(to->moments[i].label, moment->label) == 0) {
            return wrong(reader, join(reader, path, "label"), "repeats that of a date before it");
        }
    }
    to->moment_count++;
    return true;
}

static bool read_moments(struct reader *reader, const cJSON *dates) {
    struct dates *to = reader->plan->dates;
    const cJSON *visits = member(dates, "visits");
    if (visits && !cJSON_IsArray(visits)) {
        return wrong(
            reader, "dates.visits", "must be a list of visits in order of time, each with its label and column");
    }
    to->moments = ARENA_NEW(&reader->plan->arena, 4 + (visits ? cJSON_GetArraySize(visits) : 0), struct moment);
    if (!read_single(reader, dates, MOMENT_RANDOMISED, "Randomised", &to->randomised)) {
        return false;
    }
    size_t index = 0;
    for (const cJSON *item = visits ? visits->child : NULL; item; item = item->next) {
        if (!read_moment(reader, item, at_index(reader, "dates.visits", index++))) {
            return false;
        }
    }
    if (!read_single(reader, dates, MOMENT_STOPPED, "Stopped treatment", &to->stopped) ||
        !read_single(reader, dates, MOMENT_WITHDREW, "Withdrew", &to->withdrew) ||
        !read_single(reader, dates, MOMENT_DIED, "Died", &to->died)) {
        return false;
    }
    return to->moment_count > 0 ||
           wrong(reader, "dates", "names no date; give \"randomised\" or \"visits\" a column, or leave the key out");
}

/* ---- visits found by their date ---- */

static bool window_fits(struct reader *reader, const char *path, size_t f) {
    const struct plan *plan = reader->plan;
    const struct plan_file *file = &plan->files[f];
    for (size_t c = 0; c < file->codes.count; c++) {
        int m = dates_moment_of_slot(plan, file->first_slot + c);
        if (m == NOWHERE || !plan->dates->moments[m].window.given) {
            return wrong(reader, path,
                arena_format(&reader->plan->arena,
                    "finds visits by their window, but no visit of \"dates\" gives the code \"%.60s\" a target and a "
                    "window",
                    file->codes.item[c]));
        }
    }
    return true;
}

static bool read_window(struct reader *reader, const cJSON *item, const char *path) {
    struct plan *plan = reader->plan;
    const char *id = NULL, *column = NULL;
    if (!keys_known(reader, item, path, "file column") || !read_text(reader, item, path, "file", true, &id) ||
        !read_text(reader, item, path, "column", true, &column)) {
        return false;
    }
    int f = file_of(plan, id, strlen(id));
    if (f == NOWHERE || !plan->files[f].by_visit) {
        return wrong(
            reader, join(reader, path, "file"), "must be the id of a file of this plan that has one row per visit");
    }
    const struct dates *dates = plan->dates;
    if (dates->randomised == NOWHERE || (plan->files[dates->moments[dates->randomised].place.file].by_visit &&
                                            (int)dates->moments[dates->randomised].place.file == f)) {
        return wrong(reader, path,
            "counts days from randomisation: give \"dates.randomised\" a column that is not in that file");
    }
    struct plan_file *file = &plan->files[f];
    if (file->window) {
        return wrong(reader, join(reader, path, "file"), "is named twice; keep one");
    }
    file->window = column;
    file->window_name = arena_format(&plan->arena, "%s.%s", file->id, column);
    return window_fits(reader, path, (size_t)f);
}

static bool read_windows(struct reader *reader, const cJSON *dates) {
    const cJSON *windows = member(dates, "by_window");
    size_t index = 0;
    if (!windows || cJSON_IsObject(windows)) {
        return !windows || read_window(reader, windows, "dates.by_window");
    }
    if (!cJSON_IsArray(windows)) {
        return wrong(
            reader, "dates.by_window", "must be an object with the file and the column of its date, or a list of such");
    }
    for (const cJSON *item = windows->child; item; item = item->next) {
        if (!read_window(reader, item, at_index(reader, "dates.by_window", index++))) {
            return false;
        }
    }
    return true;
}

/* Without a date that says it, a visit's code must. */
static bool visits_found(struct reader *reader) {
    for (size_t f = 0; f < reader->plan->file_count; f++) {
        const struct plan_file *file = &reader->plan->files[f];
        if (file->by_visit && !file->visit && !file->window) {
            return wrong(reader, join(reader, at_index(reader, "files", f), "visit"),
                "is missing; a plan needs it, unless \"dates.by_window\" finds the visits of the file by date");
        }
    }
    return true;
}

bool read_dates(struct reader *reader, const cJSON *root) {
    const cJSON *dates = member(root, "dates");
    if (!dates) {
        return visits_found(reader);
    }
    if (!keys_known(
            reader, dates, "dates", "order files sites earliest randomised visits stopped withdrew died by_window")) {
        return false;
    }
    struct dates *to = reader->plan->dates = ARENA_NEW(&reader->plan->arena, 1, struct dates);
    to->received = (double)NAN;
    if (!member(dates, "order")) {
        return wrong(
            reader, "dates.order", "is missing: say how dates are written, such as \"D/M/Y\"; it is never guessed");
    }
    return order_of(reader, member(dates, "order"), "dates.order", &to->order) && read_file_orders(reader, dates) &&
           read_site_orders(reader, root, dates) && read_earliest(reader, dates) && read_moments(reader, dates) &&
           read_windows(reader, dates) && visits_found(reader);
}
