/* SPDX-License-Identifier: GPL-3.0-or-later */
/* First the truth is drawn, then troubles are planted in a copy of it, then five texts are written. Every number
 * comes from integers and the four operations, so that the bytes do not hang on a mathematics library. */
#include "demo/quayside.h"
#include "base/memory.h"
#include "demo/inner.h"
#include <inttypes.h>
#include <stdio.h>
#include <string.h>

static const char *const column_names[COLUMNS] = {"pid",   "site",   "grp",    "sex",    "age",     "bmi",   "sbp_0",
                                                  "sbp_8", "sbp_26", "uacr_0", "uacr_8", "uacr_26", "rescue"};

/* What the trial's arms truly do. Effects add to the pressure in mmHg and to the natural log of the ratio. */
static const struct truth {
    const char *code, *label;
    double sbp_8, sbp_26;     /* mmHg against printed advice */
    double uacr_8, uacr_26;   /* ratio against printed advice */
    double log_8, log_26;     /* their natural logarithms, written out so that no log is taken */
    double lost_8, lost_26;   /* proportion gone by 8 weeks, by 26 weeks */
    double rescue;            /* proportion who start medication, at an ordinary pressure at 8 weeks */
} truths[ARMS] = {
    {"L", "Printed advice", 0, 0, 1, 1, 0, 0, 0.05, 0.12, 0.17},
    {"W", "Walking group", -3, -5, 0.88, 0.80, -0.127833371509885, -0.223143551314210, 0.08, 0.17, 0.11},
};

static const double site_shift[SITES] = {-2.0, 0.5, 1.5, 0.0, 1.0, -1.0}; /* mmHg at follow-up */
static const double site_share[SITES] = {0.26, 0.20, 0.18, 0.14, 0.12, 0.10};

static const struct kind_facts {
    const char *name, *check;
    enum settling settling;
    const char *reason, *evidence; /* NULL where there is no decision, or no source document */
} kinds[KINDS] = {
    [MISSING_CODE] = {"999 entered for a missing value", "missing-code", BY_PLAN, NULL, NULL},
    [SEX_VARIANT] = {"sex in another spelling", "category-variant", READ_AS,
                     "The same sex in another spelling; the case form offers only F and M", NULL},
    [AGE_TENFOLD] = {"age ten times too large", "out-of-plausible-range", CORRECT,
                     "A zero too many: the date of birth gives the age", "Screening log, date of birth"},
    [PRESSURE_TENFOLD] = {"pressure ten times too large", "out-of-plausible-range", CORRECT,
                          "A zero too many at data entry", "Clinic worksheet, 26 weeks, second reading"},
    [DECIMAL_COMMA] = {"decimal comma", "unreadable-number", NUMBER_FORMAT,
                       "The decimal point was typed as a comma", NULL},
    [UNIT_INSIDE] = {"unit inside the cell", "unreadable-number", CORRECT,
                     "The unit was typed with the number", "Clinic worksheet, baseline"},
    [WORD_INSIDE] = {"word in place of a number", "unreadable-number", SET_MISSING,
                     "The laboratory has no result: the sample was lost on the way",
                     "Laboratory's list of rejected samples"},
    [ENTERED_TWICE] = {"participant entered twice", "repeated-participant", KEEP_RECORD,
                       "The second record was typed after the worksheet was checked; in the first two digits are "
                       "swapped",
                       "Clinic worksheet, 8 weeks"},
    [BEYOND_ELIGIBILITY] = {"genuine value outside eligibility", "out-of-eligibility", CONFIRM,
                            "Height and weight checked: randomised outside the eligible range, a protocol deviation",
                            "Screening log and deviation form"},
    [GENUINE_OUTLIER] = {"genuine outlier", "beyond-fences", CONFIRM,
                         "Three readings agree; the clinic confirms them", "Clinic worksheet"},
    [BELOW_LIMIT] = {"below the detection limit", "below-limit", LEFT, NULL, NULL},
};

/* What is planted, and on whom: a participant whose true cell reads `wanted` ("" is blank, NULL any number). Without
 * `received` the cell's point becomes a comma; a genuine kind writes its value into the truth as well. */
static const struct plant {
    enum kind kind;
    enum column column;
    const char *wanted, *received;
    int count;
} plants[] = {
    {ENTERED_TWICE, SBP_8, NULL, NULL, 1},
    {GENUINE_OUTLIER, SBP_26, NULL, "209", 1},
    {GENUINE_OUTLIER, SBP_8, NULL, "97", 1},
    {BEYOND_ELIGIBILITY, BMI, NULL, "43.1", 1},
    {BEYOND_ELIGIBILITY, BMI, NULL, "18.7", 1},
    {AGE_TENFOLD, AGE, "46", "460", 1},
    {PRESSURE_TENFOLD, SBP_26, "148", "1480", 1},
    {UNIT_INSIDE, SBP_0, "152", "152 mmHg", 1},
    {WORD_INSIDE, UACR_8, "", "lost", 1},
    {MISSING_CODE, BMI, "", "999", 2},
    {MISSING_CODE, SBP_8, "", "999", 3},
    {MISSING_CODE, SBP_26, "", "999", 4},
    {MISSING_CODE, UACR_26, "", "999", 4},
    {SEX_VARIANT, SEX, "F", "f", 4},
    {SEX_VARIANT, SEX, "M", "m", 3},
    {SEX_VARIANT, SEX, "F", "Female", 1},
    {SEX_VARIANT, SEX, "M", "M ", 1},
    {DECIMAL_COMMA, BMI, NULL, NULL, 4},
};

/* Not every seed has someone below the limit; the demonstration needs a few. */
enum { BELOW_LIMIT_LEAST = 3 };

/* --- chance --------------------------------------------------------------------------------------------------- */

/* splitmix64: Steele, Lea & Flood 2014, OOPSLA, "Fast splittable pseudorandom number generators". */
uint64_t split_next(uint64_t *state) {
    uint64_t z = (*state += UINT64_C(0x9e3779b97f4a7c15));
    z = (z ^ (z >> 30)) * UINT64_C(0xbf58476d1ce4e5b9);
    z = (z ^ (z >> 27)) * UINT64_C(0x94d049bb133111eb);
    return z ^ (z >> 31);
}

static uint64_t rotate(uint64_t x, int by) {
    return (x << by) | (x >> (64 - by));
}

/* xoshiro256**: Blackman & Vigna 2021, ACM Trans. Math. Software 47:36. */
static uint64_t next(struct trial *trial) {
    uint64_t *s = trial->state;
    uint64_t result = rotate(s[1] * 5, 7) * 9;
    uint64_t shifted = s[1] << 17;
    s[2] ^= s[0];
    s[3] ^= s[1];
    s[1] ^= s[2];
    s[0] ^= s[3];
    s[2] ^= shifted;
    s[3] = rotate(s[3], 45);
    return result;
}

static double uniform(struct trial *trial) {
    return (double)(next(trial) >> 11) * 0x1p-53;
}

static size_t below(struct trial *trial, size_t count) {
    return (size_t)(uniform(trial) * (double)count);
}

static bool chance(struct trial *trial, double probability) {
    return uniform(trial) < probability;
}

static const double log_2 = 0.69314718055994530942;

/* log of x in (0, 1], by halving and the series of the inverse hyperbolic tangent; good to about 1e-16. */
static double logarithm(double x) {
    double result = 0;
    for (; x < 0.70710678118654752; x *= 2) {
        result -= log_2;
    }
    double t = (x - 1) / (x + 1), square = t * t, power = t, sum = 0;
    for (int k = 1; k < 40; k += 2) {
        sum += power / k;
        power *= square;
    }
    return result + 2 * sum;
}

/* exp of a number of modest size, by halving the argument into the Taylor series and squaring back. */
static double exponential(double x) {
    double small = x / 256, term = 1, sum = 1;
    for (int k = 1; k < 16; k++) {
        term *= small / k;
        sum += term;
    }
    for (int k = 0; k < 8; k++) {
        sum *= sum;
    }
    return sum;
}

/* The root by Newton's steps from above; x in (0, 1e4). */
static double root(double x) {
    double guess = x > 1 ? x : 1;
    for (int k = 0; k < 40; k++) {
        guess = (guess + x / guess) / 2;
    }
    return guess;
}

/* The polar method: Marsaglia & Bray 1964, SIAM Review 6:260. */
static double normal(struct trial *trial) {
    if (trial->has_spare) {
        trial->has_spare = false;
        return trial->spare;
    }
    double u, v, square;
    do {
        u = 2 * uniform(trial) - 1;
        v = 2 * uniform(trial) - 1;
        square = u * u + v * v;
    } while (square >= 1 || square < 1e-12);
    double factor = root(-2 * logarithm(square) / square);
    trial->spare = v * factor;
    trial->has_spare = true;
    return u * factor;
}

static double normal_within(struct trial *trial, double mean, double deviation, double low, double high) {
    double value;
    do {
        value = mean + deviation * normal(trial);
    } while (value < low || value >= high);
    return value;
}

/* --- the truth ------------------------------------------------------------------------------------------------ */

static void write_whole(char cell[CELL_SIZE], double value) {
    snprintf(cell, CELL_SIZE, "%ld", (long)(value + 0.5));
}

static void write_tenths(char cell[CELL_SIZE], double value) {
    long tenths = (long)(value * 10 + 0.5);
    snprintf(cell, CELL_SIZE, "%ld.%ld", tenths / 10, tenths % 10);
}

/* The laboratory's detection limit is 0.3 mg/mmol. */
static void write_ratio(char cell[CELL_SIZE], double value) {
    write_tenths(cell, value);
    if (value * 10 + 0.5 < 3) {
        snprintf(cell, CELL_SIZE, "<0.3");
    }
}

static size_t draw_site(struct trial *trial) {
    double at = uniform(trial);
    size_t site = 0;
    for (; site + 1 < SITES && at >= site_share[site]; site++) {
        at -= site_share[site];
    }
    return site;
}

/* Permuted blocks of four within site. */
static enum arm draw_arm(struct trial *trial, size_t left[ARMS]) {
    if (left[ADVICE] + left[WALKING] == 0) {
        left[ADVICE] = left[WALKING] = 2;
    }
    enum arm arm = below(trial, left[ADVICE] + left[WALKING]) < left[ADVICE] ? ADVICE : WALKING;
    left[arm]--;
    return arm;
}

static void blank(struct record *record, enum column column) {
    record->cell[column][0] = '\0';
}

/* Who is gone stays gone; those who came with a higher pressure leave a little more often. Apart from that single
 * visits and samples are missed now and then. */
static void draw_missing(struct trial *trial, struct record *record, const struct truth *arm, double baseline) {
    double tendency = 1 + 0.03 * (baseline - 158), gone = uniform(trial);
    bool gone_8 = gone < arm->lost_8 * tendency, gone_26 = gone < arm->lost_26 * tendency;
    static const struct {
        enum column column;
        double missed;
    } lone[] = {{BMI, 0.02}, {SBP_8, 0.015}, {UACR_0, 0.012}, {UACR_8, 0.02}, {UACR_26, 0.02}};
    for (size_t i = 0; i < sizeof lone / sizeof *lone; i++) {
        if (chance(trial, lone[i].missed)) {
            blank(record, lone[i].column);
        }
    }
    if (gone_8) {
        blank(record, SBP_8);
        blank(record, UACR_8);
        blank(record, RESCUE);
    }
    if (gone_26) {
        blank(record, SBP_26);
        blank(record, UACR_26);
    }
}

static void draw_participant(struct trial *trial, struct record *record, size_t site, enum arm code) {
    const struct truth *arm = &truths[code];
    bool man = chance(trial, 0.47);
    double age = normal_within(trial, 58, 9, 40, 75.4), bmi = normal_within(trial, 29, 4, 20, 39.9);
    double baseline = normal_within(trial, 157 + 0.1 * (age - 58), 10, 140, 179.4);
    double shift = site_shift[site] + (man ? 1.5 : 0) + 0.15 * (bmi - 29) + 6 * normal(trial);
    double sbp_8 = 154 + 0.60 * (baseline - 158) + shift + arm->sbp_8 + 7.5 * normal(trial);
    double sbp_26 = 153 + 0.55 * (baseline - 158) + shift + arm->sbp_26 + 8 * normal(trial);
    double ratio = 0.875 + 0.95 * normal(trial), own = 0.30 * normal(trial);
    double ratio_8 = 0.875 + 0.80 * (ratio - 0.875) + own + arm->log_8 + 0.40 * normal(trial);
    double ratio_26 = 0.875 + 0.78 * (ratio - 0.875) + own + arm->log_26 + 0.42 * normal(trial);
    snprintf(record->cell[SITE], CELL_SIZE, "%02d", (int)site + 1);
    snprintf(record->cell[GRP], CELL_SIZE, "%s", arm->code);
    snprintf(record->cell[SEX], CELL_SIZE, man ? "M" : "F");
    write_whole(record->cell[AGE], age);
    write_tenths(record->cell[BMI], bmi);
    write_whole(record->cell[SBP_0], baseline);
    write_whole(record->cell[SBP_8], sbp_8);
    write_whole(record->cell[SBP_26], sbp_26);
    write_ratio(record->cell[UACR_0], exponential(ratio));
    write_ratio(record->cell[UACR_8], exponential(ratio_8));
    write_ratio(record->cell[UACR_26], exponential(ratio_26));
    bool rescued = chance(trial, arm->rescue * (sbp_8 >= 162 ? 2 : 1));
    snprintf(record->cell[RESCUE], CELL_SIZE, rescued ? "Y" : "N");
    draw_missing(trial, record, arm, baseline);
}

static void draw_truth(struct trial *trial) {
    size_t left[SITES][ARMS] = {{0}};
    for (size_t i = 0; i < PARTICIPANTS; i++) {
        size_t site = draw_site(trial);
        trial->arm[i] = draw_arm(trial, left[site]);
        snprintf(trial->truth[i].cell[PID], CELL_SIZE, "Q%zu", FIRST_IDENTIFIER + i);
        draw_participant(trial, &trial->truth[i], site, trial->arm[i]);
    }
}

/* --- the troubles --------------------------------------------------------------------------------------------- */

static struct trouble *add_trouble(struct trial *trial, enum kind kind, enum column column, size_t participant) {
    BUG_IF(trial->trouble_count == TROUBLES_MAX);
    struct trouble *trouble = &trial->troubles[trial->trouble_count++];
    *trouble = (struct trouble){.kind = kind, .column = column, .participant = participant};
    memcpy(trouble->truth, trial->truth[participant].cell[column], CELL_SIZE);
    memcpy(trouble->received, trial->received[participant].cell[column], CELL_SIZE);
    trial->troubled[participant] = true;
    return trouble;
}

static bool note_below_limit(struct trial *trial) {
    for (size_t i = 0; i < PARTICIPANTS; i++) {
        for (enum column column = UACR_0; column <= UACR_26; column++) {
            if (trial->truth[i].cell[column][0] == '<') {
                add_trouble(trial, BELOW_LIMIT, column, i);
            }
        }
    }
    return trial->trouble_count >= BELOW_LIMIT_LEAST;
}

static bool fits(const struct trial *trial, const struct plant *plant, size_t participant) {
    const char *cell = trial->truth[participant].cell[plant->column];
    if (trial->troubled[participant]) {
        return false;
    }
    if (plant->wanted) {
        return strcmp(cell, plant->wanted) == 0;
    }
    if (plant->kind == ENTERED_TWICE) { /* a pressure whose last two digits can be swapped to a likely one */
        return strlen(cell) == 3 && cell[1] > cell[2] && cell[2] >= '1' && cell[1] <= '6';
    }
    return cell[0] != '\0';
}

static bool pick(struct trial *trial, const struct plant *plant, size_t *participant) {
    size_t candidates = 0;
    for (size_t i = 0; i < PARTICIPANTS; i++) {
        if (fits(trial, plant, i)) {
            candidates++;
            if (below(trial, candidates) == 0) { /* each of those seen so far is as likely as any other */
                *participant = i;
            }
        }
    }
    return candidates > 0;
}

static void plant_on(struct trial *trial, const struct plant *plant, size_t participant) {
    char *truth = trial->truth[participant].cell[plant->column];
    char *received = trial->received[participant].cell[plant->column];
    if (plant->kind == ENTERED_TWICE) {
        struct trouble *trouble = add_trouble(trial, plant->kind, plant->column, participant);
        memcpy(trial->first_entry, truth, CELL_SIZE);
        trial->first_entry[1] = truth[2];
        trial->first_entry[2] = truth[1];
        memcpy(trouble->received, trial->first_entry, CELL_SIZE);
        trial->twice = participant;
        return;
    }
    if (kinds[plant->kind].settling == CONFIRM) {
        snprintf(truth, CELL_SIZE, "%s", plant->received);
    }
    if (plant->received) {
        snprintf(received, CELL_SIZE, "%s", plant->received);
    } else {
        *strchr(received, '.') = ',';
    }
    add_trouble(trial, plant->kind, plant->column, participant);
}

static bool plant_all(struct trial *trial) {
    trial->trouble_count = 0;
    memset(trial->troubled, 0, sizeof trial->troubled);
    memcpy(trial->received, trial->truth, sizeof trial->received);
    bool found = note_below_limit(trial);
    for (size_t i = 0; found && i < sizeof plants / sizeof *plants; i++) {
        for (int k = 0; found && k < plants[i].count; k++) {
            size_t participant = 0;
            found = pick(trial, &plants[i], &participant);
            if (found) {
                plant_on(trial, &plants[i], participant);
            }
        }
    }
    return found;
}

/* --- the texts ------------------------------------------------------------------------------------------------ */

static void write_header(struct text *out) {
    for (size_t c = 0; c < COLUMNS; c++) {
        text_string(out, column_names[c]);
        text_char(out, c + 1 < COLUMNS ? ',' : '\n');
    }
}

static void write_record(struct text *out, const struct record *record) {
    for (size_t c = 0; c < COLUMNS; c++) {
        const char *quote = strchr(record->cell[c], ',') ? "\"" : "";
        text_format(out, "%s%s%s%c", quote, record->cell[c], quote, c + 1 < COLUMNS ? ',' : '\n');
    }
}

static void write_csv(const struct trial *trial, struct text *export_csv, struct text *clean_csv) {
    write_header(export_csv);
    write_header(clean_csv);
    for (size_t i = 0; i < PARTICIPANTS; i++) {
        if (i == trial->twice) {
            struct record first = trial->received[i];
            memcpy(first.cell[SBP_8], trial->first_entry, CELL_SIZE);
            write_record(export_csv, &first);
        }
        write_record(export_csv, &trial->received[i]);
        write_record(clean_csv, &trial->truth[i]);
    }
}

/* The record number, 1-based, that holds what stands of a participant. */
static size_t row_of(const struct trial *trial, size_t participant) {
    return participant + 1 + (participant >= trial->twice ? 1 : 0);
}

static void write_outcome_visits(struct text *out, const char *id, bool files) {
    static const char *const visits[][3] = {{"Baseline", "0"}, {"8 weeks", "8"}, {"26 weeks", "26"}};
    if (files) {
        text_literal(out, "     \"visits\": [");
        for (size_t v = 0; v < 3; v++) {
            text_format(out, "%s{\"label\": \"%s\", \"file\": \"%s\", \"visit\": \"V%s\", \"column\": \"%s\"}",
                        v ? ",\n                " : "", visits[v][0], strcmp(id, "sbp") == 0 ? "visits" : "labs",
                        visits[v][1], id);
        }
        text_literal(out, "]}");
        return;
    }
    text_format(out,
                "     \"visits\": [{\"label\": \"Baseline\", \"column\": \"%s_0\"}, "
                "{\"label\": \"8 weeks\", \"column\": \"%s_8\"},\n"
                "                {\"label\": \"26 weeks\", \"column\": \"%s_26\"}]}",
                id, id, id);
}

static void write_covariates(struct text *out) {
    text_literal(out, "  \"covariates\": [\n"
                      "    {\"id\": \"sex\", \"label\": \"Sex\", \"column\": \"sex\", \"kind\": \"category\",\n"
                      "     \"levels\": [{\"code\": \"F\", \"label\": \"Female\"}, "
                      "{\"code\": \"M\", \"label\": \"Male\"}]},\n"
                      "    {\"id\": \"age\", \"label\": \"Age\", \"column\": \"age\", \"kind\": \"number\", "
                      "\"unit\": \"years\",\n"
                      "     \"eligible\": [40, 75], \"plausible\": [18, 110], \"bands\": [55, 65]},\n"
                      "    {\"id\": \"bmi\", \"label\": \"Body mass index\", \"column\": \"bmi\", "
                      "\"kind\": \"number\", \"unit\": \"kg/m\u00b2\",\n"
                      "     \"eligible\": [20, 40], \"plausible\": [12, 80], \"bands\": [25, 30]},\n"
                      "    {\"id\": \"site\", \"label\": \"Site\", \"column\": \"site\", \"kind\": \"category\",\n"
                      "     \"levels\": [");
    for (int site = 1; site <= SITES; site++) {
        text_format(out, "%s{\"code\": \"%02d\", \"label\": \"Site %d\"}", site > 1 ? ", " : "", site, site);
    }
    text_literal(out, "]}],\n");
}

void trial_write_plan(const struct naming *naming, uint64_t seed, struct text *out) {
    text_literal(out, "{\n"
                      "  \"title\": \"Quayside Walking Trial\",\n");
    if (naming->files) {
        text_format(out, "  \"files\": %s,\n", naming->files);
    }
    if (naming->dates) {
        text_format(out, "  \"dates\": %s,\n", naming->dates);
    }
    text_literal(out, "  \"participant\": \"pid\",\n"
                      "  \"arm\": {\"column\": \"grp\", \"levels\": [\n");
    text_format(out, "    {\"code\": \"%s\", \"label\": \"%s\", \"reference\": true},\n", truths[ADVICE].code,
                truths[ADVICE].label);
    text_format(out, "    {\"code\": \"%s\", \"label\": \"%s\"}]},\n", truths[WALKING].code, truths[WALKING].label);
    text_literal(out, "  \"site\": {\"column\": \"site\"},\n"
                      "  \"missing_codes\": [\"999\"],\n"
                      "  \"outcomes\": [\n"
                      "    {\"id\": \"sbp\", \"label\": \"Systolic blood pressure\", \"unit\": \"mmHg\", "
                      "\"role\": \"primary\", \"better\": \"lower\",\n"
                      "     \"scale\": \"linear\", \"plausible\": [70, 260], \"important_difference\": 5,\n");
    write_outcome_visits(out, "sbp", naming->files);
    text_literal(out, ",\n"
                      "    {\"id\": \"uacr\", \"label\": \"Urine albumin-to-creatinine ratio\", \"unit\": \"mg/mmol\", "
                      "\"role\": \"secondary\", \"better\": \"lower\",\n"
                      "     \"scale\": \"log10\", \"plausible\": [0, 600],\n");
    write_outcome_visits(out, "uacr", naming->files);
    text_literal(out, "],\n");
    write_covariates(out);
    text_format(out, "  \"events\": [{\"id\": \"rescue\", \"label\": \"Started medication\", %s\"column\": \"rescue\", ",
                naming->files ? "\"file\": \"events\", " : "");
    text_literal(out, "\"yes\": [\"Y\"], \"no\": [\"N\"]}],\n"
                      "  \"adjust_for\": [\"sex\"],\n"
                      "  \"missing_baseline\": \"mean\",\n"
                      "  \"subgroups\": [\"sex\", \"age\", \"bmi\"],\n"
                      "  \"confidence\": 0.95,\n"
                      "  \"blinding\": \"coded\",\n");
    text_format(out, "  \"seed\": %" PRIu64 "\n}\n", seed);
}

/* Opens one decision and writes its kind and column, or, without a column, only its kind. */
static void begin_decision(struct text *out, const char *kind, const char *column) {
    text_format(out, "%s\n  {\"kind\": \"%s\"", out->length > 1 ? "," : "", kind);
    if (column) {
        text_format(out, ", \"column\": \"%s\"", column);
    }
}

/* Of two records of a participant the second stands: in the wide file, or in each file that has two. */
static void write_keep(struct text *out, const struct trial *trial, const struct naming *naming, size_t participant,
                       const char *file, size_t row) {
    begin_decision(out, "keep-record", NULL);
    text_format(out, ", \"participant\": \"%s\"", trial->truth[participant].cell[PID]);
    if (naming->files) {
        text_format(out, ", \"file\": \"%s\"", file);
    }
    text_format(out, ", \"row\": %zu", row);
}

static void write_why(struct text *out, const struct kind_facts *facts) {
    text_format(out, ",\n   \"reason\": \"%s\"", facts->reason);
    if (facts->evidence) {
        text_format(out, ", \"evidence\": \"%s\"", facts->evidence);
    }
    text_char(out, '}');
}

static void write_decision(struct text *out, const struct trial *trial, const struct naming *naming,
                           const struct trouble *trouble) {
    const struct kind_facts *facts = &kinds[trouble->kind];
    const char *column = naming->columns[trouble->column];
    const char *participant = trial->truth[trouble->participant].cell[PID];
    switch (facts->settling) {
    case BY_PLAN:
    case LEFT:
        return;
    case READ_AS:
        begin_decision(out, "read-as", column);
        text_format(out, ", \"from\": \"%s\", \"to\": \"%s\"", trouble->received, trouble->truth);
        break;
    case NUMBER_FORMAT:
        begin_decision(out, "number-format", column);
        text_literal(out, ", \"decimal\": \",\"");
        break;
    case CORRECT:
        begin_decision(out, "correct", column);
        text_format(out, ", \"participant\": \"%s\", \"from\": \"%s\", \"to\": \"%s\"", participant, trouble->received,
                    trouble->truth);
        break;
    case SET_MISSING:
        begin_decision(out, "set-missing", column);
        text_format(out, ", \"participant\": \"%s\", \"from\": \"%s\"", participant, trouble->received);
        break;
    case CONFIRM:
        begin_decision(out, "confirm", column);
        text_format(out, ", \"participant\": \"%s\", \"value\": \"%s\"", participant, trouble->truth);
        break;
    case KEEP_RECORD:
        write_keep(out, trial, naming, trouble->participant, "people", row_of(trial, trouble->participant));
        if (naming->files) {
            write_why(out, facts);
            write_keep(out, trial, naming, trouble->participant, "visits", naming->visit_row);
        }
        break;
    }
    write_why(out, facts);
}

/* A decision about a whole column settles every trouble like it, so it is written once. */
static bool settled_before(const struct trial *trial, size_t at) {
    const struct trouble *trouble = &trial->troubles[at];
    enum settling settling = kinds[trouble->kind].settling;
    for (size_t i = 0; i < at; i++) {
        const struct trouble *other = &trial->troubles[i];
        bool alike = other->kind == trouble->kind && other->column == trouble->column;
        if (alike && (settling == NUMBER_FORMAT ||
                      (settling == READ_AS && strcmp(other->received, trouble->received) == 0))) {
            return true;
        }
    }
    return false;
}

void trial_write_decisions(const struct trial *trial, const struct naming *naming, struct text *out) {
    text_char(out, '[');
    for (size_t i = 0; i < trial->trouble_count; i++) {
        if (!settled_before(trial, i)) {
            write_decision(out, trial, naming, &trial->troubles[i]);
        }
    }
    text_literal(out, "\n]\n");
}

static void write_troubles(struct text *out, const struct trial *trial) {
    text_literal(out, "  \"troubles\": [");
    for (size_t i = 0; i < trial->trouble_count; i++) {
        const struct trouble *trouble = &trial->troubles[i];
        const char *quote = trouble->kind == ENTERED_TWICE ? "" : "\"";
        text_format(out, "%s\n    {\"kind\": \"%s\", \"check\": \"%s\", ", i ? "," : "", kinds[trouble->kind].name,
                    kinds[trouble->kind].check);
        text_format(out, "\"column\": %s%s%s, ", quote, *quote ? column_names[trouble->column] : "null", quote);
        text_format(out, "\"participant\": \"%s\", \"received\": \"%s\", \"true\": \"%s\", \"row\": %zu}",
                    trial->truth[trouble->participant].cell[PID], trouble->received, trouble->truth,
                    row_of(trial, trouble->participant));
    }
    text_literal(out, "],\n");
}

static void write_counts(struct text *out, const struct trial *trial) {
    bool first = true;
    text_literal(out, "  \"counts\": {");
    for (size_t kind = 0; kind < KINDS; kind++) {
        bool seen = false;
        for (size_t before = 0; before < kind; before++) {
            seen = seen || strcmp(kinds[before].check, kinds[kind].check) == 0;
        }
        size_t count = 0;
        for (size_t i = 0; i < trial->trouble_count; i++) {
            count += strcmp(kinds[trial->troubles[i].kind].check, kinds[kind].check) == 0;
        }
        if (!seen) {
            text_format(out, "%s\"%s\": %zu", first ? "" : ", ", kinds[kind].check, count);
            first = false;
        }
    }
    text_literal(out, "},\n");
}

static size_t observed(const struct trial *trial, enum arm arm, enum column column) {
    size_t count = 0;
    for (size_t i = 0; i < PARTICIPANTS; i++) {
        count += trial->arm[i] == arm && trial->truth[i].cell[column][0] != '\0';
    }
    return count;
}

static void write_arms(struct text *out, const struct trial *trial) {
    text_literal(out, "  \"arms\": {");
    for (enum arm arm = ADVICE; arm < ARMS; arm++) {
        text_format(out, "%s\n    \"%s\": {\"label\": \"%s\", \"randomised\": %zu, ", arm ? "," : "", truths[arm].code,
                    truths[arm].label, observed(trial, arm, PID));
        text_format(out, "\"sbp_26_observed\": %zu, \"lost_8\": %.2f, \"lost_26\": %.2f, \"rescue\": %.2f}",
                    observed(trial, arm, SBP_26), truths[arm].lost_8, truths[arm].lost_26, truths[arm].rescue);
    }
    text_literal(out, "},\n");
    const struct truth *walking = &truths[WALKING];
    text_format(out, "  \"effects\": {\"sbp\": {\"8 weeks\": %.0f, \"26 weeks\": %.0f}, ", walking->sbp_8,
                walking->sbp_26);
    text_format(out, "\"uacr\": {\"8 weeks\": %.2f, \"26 weeks\": %.2f}}\n", walking->uacr_8, walking->uacr_26);
}

static void write_key(struct text *out, const struct trial *trial, uint64_t seed) {
    text_format(out, "{\n  \"seed\": %" PRIu64 ",\n  \"participants\": %d,\n  \"records\": %d,\n", seed, PARTICIPANTS,
                PARTICIPANTS + 1);
    write_troubles(out, trial);
    write_counts(out, trial);
    write_arms(out, trial);
    text_literal(out, "}\n");
}

struct trial *trial_new(uint64_t seed) {
    BUG_IF(seed > QUAYSIDE_SEED_MOST);
    struct trial *trial = memory_new(1, sizeof *trial);
    uint64_t state = seed;
    for (size_t i = 0; i < 4; i++) {
        trial->state[i] = split_next(&state);
    }
    do {
        draw_truth(trial);
    } while (!plant_all(trial));
    return trial;
}

void quayside_make(uint64_t seed, struct quayside *out) {
    const struct naming wide = {.columns = column_names};
    struct trial *trial = trial_new(seed);
    struct text *const texts[] = {&out->export_csv, &out->clean_csv, &out->plan_json, &out->decisions_json,
                                  &out->key_json};
    for (size_t i = 0; i < sizeof texts / sizeof *texts; i++) {
        text_init(texts[i]);
    }
    write_csv(trial, &out->export_csv, &out->clean_csv);
    trial_write_plan(&wide, seed, &out->plan_json);
    trial_write_decisions(trial, &wide, &out->decisions_json);
    write_key(&out->key_json, trial, seed);
    memory_free(trial);
}

void quayside_release(struct quayside *quayside) {
    text_release(&quayside->export_csv);
    text_release(&quayside->clean_csv);
    text_release(&quayside->plan_json);
    text_release(&quayside->decisions_json);
    text_release(&quayside->key_json);
}
