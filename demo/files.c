/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The invented trial as four files. Its dates come from a stream of chance of their own, so that the values of the wide
 * export stay what they are. */
#include "base/memory.h"
#include "demo/inner.h"
#include <stdio.h>
#include <string.h>

enum { VISITS = 3, DATE_SIZE = 16 };

static const char *const column_names[COLUMNS] = {
    "people.pid",     "people.site",    "people.grp",     "people.sex",   "people.age",   "people.bmi",    "visits.sbp@V0",
    "visits.sbp@V8", "visits.sbp@V26", "labs.uacr@V0", "labs.uacr@V8", "labs.uacr@V26", "events.rescue"};

static const char files_json[] =
    "[\n"
    "    {\"id\": \"people\", \"name\": \"people.csv\", \"layout\": \"participant\", \"participant\": \"pid\"},\n"
    "    {\"id\": \"visits\", \"name\": \"visits.csv\", \"layout\": \"visit\", \"participant\": \"pid\",\n"
    "     \"visit\": \"visit\", \"codes\": [\"V0\", \"V8\", \"V26\"]},\n"
    "    {\"id\": \"labs\", \"name\": \"labs.csv\", \"layout\": \"visit\", \"participant\": \"pid\",\n"
    "     \"visit\": \"visit\", \"codes\": [\"V0\", \"V8\", \"V26\"]},\n"
    "    {\"id\": \"events\", \"name\": \"events.csv\", \"layout\": \"participant\", \"participant\": \"pid\"}]";

static const char dates_json[] =
    "{\n"
    "    \"order\": \"D/M/Y\", \"earliest\": \"2024-01-01\", \"randomised\": {\"file\": \"people\", \"column\": \"randomised\"},\n"
    "    \"visits\": [\n"
    "      {\"label\": \"Baseline\", \"file\": \"visits\", \"visit\": \"V0\", \"column\": \"date\", \"target\": 0, \"window\": [-14, 0]},\n"
    "      {\"label\": \"8 weeks\", \"file\": \"visits\", \"visit\": \"V8\", \"column\": \"date\", \"target\": 56, \"window\": [-14, 14]},\n"
    "      {\"label\": \"26 weeks\", \"file\": \"visits\", \"visit\": \"V26\", \"column\": \"date\", \"target\": 182,\n"
    "       \"window\": [-21, 21]}]}";

static const struct planned_visit {
    const char *code;
    enum column pressure, ratio;
    unsigned target, early, spread; /* days after randomisation, and how many before that and in all a visit may fall */
} visits[VISITS] = {{"V0", SBP_0, UACR_0, 0, 6, 7}, {"V8", SBP_8, UACR_8, 56, 6, 13}, {"V26", SBP_26, UACR_26, 182, 13, 27}};

struct dates { /* of one participant, as days since 1 January 2024 */
    unsigned randomised, visit[VISITS], sampled[VISITS], rescue;
};

static unsigned days_below(uint64_t *state, unsigned count) {
    return (unsigned)((split_next(state) >> 11) % count);
}

/* Clinics are closed at weekends; 1 January 2024 was a Monday. */
static unsigned working_day(unsigned day) {
    return day % 7 < 5 ? day : day + 7 - day % 7;
}

static void draw_dates(uint64_t *state, size_t participant, struct dates *dates) {
    enum { FIRST = 70, APART = 2 };
    dates->randomised = working_day(FIRST + APART * (unsigned)participant + days_below(state, 2));
    for (size_t v = 0; v < VISITS; v++) {
        unsigned day = dates->randomised + visits[v].target + days_below(state, visits[v].spread) - visits[v].early;
        day = working_day(day);
        dates->visit[v] = v == 0 && day > dates->randomised ? dates->randomised : day;
        dates->sampled[v] = dates->visit[v] + (days_below(state, 5) == 0 ? 1 : 0);
    }
    dates->rescue = dates->randomised + 63 + days_below(state, 112);
}

static const char *date_words(char words[DATE_SIZE], unsigned day) {
    static const unsigned lengths[] = {31, 28, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31};
    unsigned year = 2024, month = 0, length = 31;
    while (day >= length) {
        day -= length;
        year += month == 11;
        month = month == 11 ? 0 : month + 1;
        length = lengths[month] + (month == 1 && year % 4 == 0 ? 1 : 0);
    }
    snprintf(words, DATE_SIZE, "%02u/%02u/%u", day + 1, month + 1, year);
    return words;
}

static void write_cell(struct text *out, const char *cell, char end) {
    const char *quote = strchr(cell, ',') ? "\"" : "";
    text_format(out, "%s%s%s%c", quote, cell, quote, end);
}

static void write_person(struct text *out, const struct record *record, const struct dates *dates) {
    char words[DATE_SIZE];
    for (enum column column = PID; column <= BMI; column++) {
        write_cell(out, record->cell[column], ',');
    }
    text_format(out, "%s\n", date_words(words, dates->randomised));
}

static void write_visit(struct text *out, const struct record *record, size_t visit, unsigned day, const char *value) {
    char words[DATE_SIZE];
    text_format(out, "%s,%s,%s,", record->cell[PID], visits[visit].code, date_words(words, day));
    write_cell(out, value, '\n');
}

static size_t records_in(const struct text *csv) {
    size_t lines = 0;
    for (const char *at = csv->data; (at = strchr(at, '\n')); at++) {
        lines++;
    }
    return lines - 1;
}

/* A visit with neither pressure nor sample did not take place. */
static void write_visits(const struct trial *trial, size_t i, const struct dates *dates, struct quayside_files *out,
                         size_t *visit_row) {
    const struct record *record = &trial->received[i];
    for (size_t v = 0; v < VISITS; v++) {
        const char *pressure = record->cell[visits[v].pressure], *ratio = record->cell[visits[v].ratio];
        bool twice = i == trial->twice && visits[v].pressure == SBP_8;
        if (twice) {
            write_visit(&out->visits_csv, record, v, dates->visit[v], trial->first_entry);
        }
        if (*pressure || *ratio) {
            write_visit(&out->visits_csv, record, v, dates->visit[v], pressure);
        }
        if (*ratio) {
            write_visit(&out->labs_csv, record, v, dates->sampled[v], ratio);
        }
        *visit_row = twice ? records_in(&out->visits_csv) : *visit_row;
    }
}

static void write_event(struct text *out, const struct record *record, const struct dates *dates) {
    char words[DATE_SIZE];
    const char *rescue = record->cell[RESCUE];
    if (*rescue) {
        text_format(out, "%s,%s,%s\n", record->cell[PID], rescue, *rescue == 'Y' ? date_words(words, dates->rescue) : "");
    }
}

void quayside_make_files(uint64_t seed, struct quayside_files *out) {
    struct text *const texts[] = {&out->people_csv, &out->visits_csv, &out->labs_csv, &out->events_csv, &out->plan_json,
                                  &out->decisions_json};
    for (size_t i = 0; i < sizeof texts / sizeof *texts; i++) {
        text_init(texts[i]);
    }
    text_literal(&out->people_csv, "pid,site,grp,sex,age,bmi,randomised\n");
    text_literal(&out->visits_csv, "pid,visit,date,sbp\n");
    text_literal(&out->labs_csv, "pid,visit,sampled,uacr\n");
    text_literal(&out->events_csv, "pid,rescue,rescue_date\n");
    struct trial *trial = trial_new(seed);
    struct naming naming = {.columns = column_names, .files = files_json, .dates = dates_json};
    uint64_t state = ~seed;
    for (size_t i = 0; i < PARTICIPANTS; i++) {
        struct dates dates;
        draw_dates(&state, i, &dates);
        for (int times = i == trial->twice ? 2 : 1; times > 0; times--) {
            write_person(&out->people_csv, &trial->received[i], &dates);
        }
        write_visits(trial, i, &dates, out, &naming.visit_row);
        write_event(&out->events_csv, &trial->received[i], &dates);
    }
    trial_write_plan(&naming, seed, &out->plan_json);
    trial_write_decisions(trial, &naming, &out->decisions_json);
    memory_free(trial);
}

void quayside_files_release(struct quayside_files *files) {
    text_release(&files->people_csv);
    text_release(&files->visits_csv);
    text_release(&files->labs_csv);
    text_release(&files->events_csv);
    text_release(&files->plan_json);
    text_release(&files->decisions_json);
}
