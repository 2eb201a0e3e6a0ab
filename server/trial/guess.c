/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "trial/guess.h"
#include "server/trial/guess-parts.h"
#include <math.h>
#include <stdlib.h>
#include <string.h>

static const char *const role_names[GUESS_ROLE_COUNT] = {
    "nothing", "participant", "arm", "number", "category", "event", "date", "visit"};

const char *guess_role_name(enum guess_role role) {
    return role_names[role];
}

/* ---- counting the distinct texts of a column ---- */

struct tally_slot {
    const char *text;
    size_t entry;
};
struct tally { /* open addressing into entries in order of appearance; room is a power of two */
    struct tally_slot *slot;
    size_t room, used;
    struct look_value *entry;
};

static size_t slot_of(const struct tally *tally, const char *text) {
    uint64_t hash = 14695981039346656037u; /* FNV-1a */
    for (const unsigned char *p = (const unsigned char *)text; *p; p++) {
        hash = (hash ^ *p) * 1099511628211u;
    }
    size_t at = (size_t)(hash ^ (hash >> 32)) & (tally->room - 1);
    while (tally->slot[at].text && strcmp(tally->slot[at].text, text) != 0) {
        at = (at + 1) & (tally->room - 1);
    }
    return at;
}

static void tally_add(struct tally *tally, const char *text) {
    struct tally_slot *slot = &tally->slot[slot_of(tally, text)];
    if (!slot->text) {
        *slot = (struct tally_slot){text, tally->used};
        tally->entry[tally->used] = (struct look_value){.value.text = text, .first = tally->used};
        tally->used++;
    }
    tally->entry[slot->entry].value.count++;
}

static int frequent_first(const void *left, const void *right) {
    const struct look_value *a = left, *b = right;
    return a->value.count != b->value.count ? (a->value.count > b->value.count ? -1 : 1)
                                            : (a->first > b->first) - (a->first < b->first);
}

/* ---- what the values of one column are ---- */

bool text_is_blank(const char *text) {
    return !text[strspn(text, " \t\r\n")];
}

static void count_values(struct look *look) {
    size_t records = look->cells->records;
    struct tally tally = {.room = 16};
    while (tally.room < 2 * records) {
        tally.room *= 2;
    }
    tally.slot = memory_new(tally.room, sizeof *tally.slot);
    tally.entry = memory_new(records + 1, sizeof *tally.entry);
    for (size_t record = 0; record < records; record++) {
        const char *text = cells_at(look->cells, record, look->index);
        if (text_is_blank(text)) {
            look->column->blank++;
        } else {
            look->column->filled++;
            tally_add(&tally, text);
        }
    }
    memory_free(tally.slot);
    look->values = tally.entry;
    look->value_count = look->column->distinct = tally.used;
    qsort(look->values, look->value_count, sizeof *look->values, frequent_first);
}

/* A word that stands for "missing"; "none" does so among numbers only, for it may be a level. */
static bool word_code(const char *raw, bool in_number, struct arena *arena) {
    if ((*raw >= '0' && *raw <= '9') || strlen(raw) > 16) {
        return false;
    }
    const char *text = folded(raw, arena);
    return among(text, "na n/a nan null missing . .. - -- ? #n/a n.a. unknown unk nk nd miss") ||
           strcmp(text, "not known") == 0 || strcmp(text, "not done") == 0 || (in_number && strcmp(text, "none") == 0);
}

static bool looks_like_date(const char *text) {
    size_t groups = 0, digits = 0, longest = 0;
    bool letters = false;
    for (const char *p = text; *p && *p != 'T' && *p != ' '; p++) {
        bool digit = *p >= '0' && *p <= '9', letter = (*p >= 'a' && *p <= 'z') || (*p >= 'A' && *p <= 'Z');
        if (!digit && !letter && !strchr("-/.", *p)) {
            return false;
        }
        letters = letters || letter;
        groups += strchr("-/.", *p) && p != text;
        digits = digit ? digits + 1 : 0;
        longest = digits > longest ? digits : longest;
    }
    size_t length = strcspn(text, "T ");
    bool with_month =
        letters && longest >= 2 && length >= 7 && length <= 11 && text[0] >= '0' && text[0] <= '9' && groups != 1;
    return (!letters && groups == 2 && length >= 6 && length <= 10 && longest <= 4) || with_month;
}

/* 99, 999, -9, -88, 777.7 ...: one digit repeated, 7, 8 or 9 (or -1), two or more unless negative. */
static bool sentinel_shape(const char *text) {
    text += strspn(text, " ");
    bool negative = *text == '-';
    text += negative;
    size_t digits = strspn(text, "0123456789.");
    if (text[digits] && text[digits] != ' ') {
        return false;
    }
    if (negative && digits == 1 && *text == '1') {
        return true;
    }
    size_t same = 0;
    for (size_t i = 0; i < digits; i++) {
        if (text[i] != '.' && (text[i] != *text || !strchr("789", text[i]))) {
            return false;
        }
        same += text[i] != '.';
    }
    return same >= (negative ? 1u : 2u) && same <= 6;
}

/* Reads every distinct text as a number, with the decimal sign that most of them have. */
static void read_numbers(struct look *look) {
    struct guess_column *column = look->column;
    size_t by_comma = 0;
    for (int round = 0; round < 2; round++) {
        char decimal = round ? ',' : '.';
        column->numbers = 0;
        column->decimals = 0;
        for (size_t i = 0; i < look->value_count; i++) {
            struct look_value *entry = &look->values[i];
            int decimals = 0;
            entry->reading = number_read(entry->value.text, decimal, &entry->number, &decimals);
            if (entry->reading != NUMBER_UNREADABLE) {
                column->numbers += entry->value.count;
                column->decimals = decimals > column->decimals ? decimals : column->decimals;
            } else if (strchr(entry->value.text, ',')) {
                by_comma += number_read(entry->value.text, ',', NULL, NULL) == NUMBER_READ ? entry->value.count : 0;
            }
        }
        if (3 * by_comma <= column->filled) {
            break;
        }
    }
    column->unreadable = column->filled - column->numbers;
}

static void weigh_values(struct look *look) {
    struct guess_column *column = look->column;
    size_t words = 0;
    read_numbers(look);
    for (size_t i = 0; i < look->value_count; i++) {
        struct look_value *entry = &look->values[i];
        const char *text = entry->value.text;
        entry->sentinel = entry->reading == NUMBER_READ && sentinel_shape(text);
        look->dates += entry->reading != NUMBER_READ && looks_like_date(text) ? entry->value.count : 0;
        words += entry->reading != NUMBER_READ && word_code(text, true, &look->guess->arena) ? entry->value.count : 0;
    }
    look->numeric =
        column->numbers && 10 * column->numbers >= 8 * (column->filled - (words < column->filled ? words : 0));
}

/* ---- codes that seem to stand for "missing" ---- */

static int by_value(const void *left, const void *right) {
    double a = *(const double *)left, b = *(const double *)right;
    return (a > b) - (a < b);
}

static double quantile(const double *sorted, size_t count, double share) {
    double at = share * (double)(count - 1);
    size_t below = (size_t)at;
    return below + 1 < count ? sorted[below] + (at - (double)below) * (sorted[below + 1] - sorted[below])
                             : sorted[count - 1];
}

/* The numbers of the column that are no suspected codes, sorted; the caller frees them. With `but_sentinels` what has
 * the shape of a code is left out, suspected or not. */
static double *plain_numbers(const struct look *look, bool but_sentinels, size_t *count) {
    double *numbers = memory_new(look->column->numbers + 1, sizeof *numbers);
    *count = 0;
    for (size_t i = 0; i < look->value_count; i++) {
        const struct look_value *entry = &look->values[i];
        if (entry->reading != NUMBER_READ || entry->value.missing_code || (but_sentinels && entry->sentinel)) {
            continue;
        }
        for (size_t n = 0; n < entry->value.count; n++) {
            numbers[(*count)++] = entry->number;
        }
    }
    qsort(numbers, *count, sizeof *numbers, by_value);
    return numbers;
}

/* Does a number with the shape of a code stand apart from the others? */
static bool stands_apart(const double *sorted, size_t count, double value, size_t times) {
    if (count < 4) {
        return false;
    }
    double q1 = quantile(sorted, count, 0.25), q3 = quantile(sorted, count, 0.75), reach = 5 * (q3 - q1);
    reach = reach > 0 ? reach : 2 * (sorted[count - 1] - sorted[0]);
    if (value < 0) {
        return sorted[0] >= 0 || value < q1 - reach;
    }
    if (value <= q3 + reach || (value < 100 && times < 2)) {
        return false;
    }
    for (size_t i = 0; i < count; i++) { /* company nearby: a long tail rather than a code */
        if (sorted[i] >= 0.8 * value && sorted[i] <= 1.25 * value) {
            return false;
        }
    }
    return true;
}

static void suspect_codes(struct look *look) {
    bool any = false;
    for (size_t i = 0; i < look->value_count; i++) {
        struct look_value *entry = &look->values[i];
        entry->value.missing_code =
            entry->reading != NUMBER_READ && word_code(entry->value.text, look->numeric, &look->guess->arena);
        any = any || entry->sentinel;
    }
    if (!any || !look->numeric) {
        return;
    }
    size_t count;
    double *sorted = plain_numbers(look, true, &count);
    for (size_t i = 0; i < look->value_count; i++) {
        struct look_value *entry = &look->values[i];
        if (entry->sentinel) {
            entry->value.missing_code = stands_apart(sorted, count, entry->number, entry->value.count);
        }
    }
    memory_free(sorted);
}

/* Among levels that are small numbers a single 9 is the usual code for "not known". */
static void suspect_nine(struct look *look) {
    bool small = look->numeric;
    for (size_t i = 0; i < look->value_count && small; i++) {
        const struct look_value *entry = &look->values[i];
        small = entry->reading != NUMBER_READ || entry->number <= 5 || entry->number >= 9;
    }
    for (size_t i = 0; i < look->value_count && small; i++) {
        struct guess_value *value = &look->values[i].value;
        value->missing_code = value->missing_code || strcmp(value->text, "9") == 0;
    }
}

static void describe_numbers(struct look *look) {
    struct guess_column *column = look->column;
    size_t count = 0;
    double *sorted = plain_numbers(look, false, &count);
    column->low = column->median = column->high = column->skewness = column->spread = NAN;
    if (count) {
        column->low = sorted[0];
        column->median = quantile(sorted, count, 0.5);
        column->high = sorted[count - 1];
        column->positive = sorted[0] > 0;
        double low = quantile(sorted, count, 0.1), high = quantile(sorted, count, 0.9);
        if (high > low) {
            column->skewness = (high - 2 * column->median + low) / (high - low);
        }
        if (column->positive) {
            column->spread = high / low;
        }
    }
    memory_free(sorted);
}

/* ---- levels ---- */

bool guess_says_yes(const char *text, struct arena *arena) {
    return among(folded(text, arena), "y yes true t 1");
}

bool guess_says_no(const char *text, struct arena *arena) {
    return among(folded(text, arena), "n no false f 0");
}

static size_t plain_values(const struct look *look) {
    size_t count = 0;
    for (size_t i = 0; i < look->value_count; i++) {
        count += !look->values[i].value.missing_code;
    }
    return count;
}

/* Two or more texts, each of which says yes or no, both of them said. */
static bool yes_and_no(const struct look *look) {
    bool yes = false, no = false;
    for (size_t i = 0; i < look->value_count; i++) {
        const char *text = look->values[i].value.text;
        if (look->values[i].value.missing_code) {
            continue;
        }
        bool says_yes = guess_says_yes(text, &look->guess->arena), says_no = guess_says_no(text, &look->guess->arena);
        if (!says_yes && !says_no) {
            return false;
        }
        yes = yes || says_yes;
        no = no || says_no;
    }
    return yes && no;
}

static bool says_sex(const struct look *look) {
    bool all = true;
    for (size_t i = 0; i < look->value_count; i++) {
        all = all && (look->values[i].value.missing_code ||
                         among(folded(look->values[i].value.text, &look->guess->arena), "f m female male"));
    }
    return all || name_has(&look->parts, "sex gender");
}

static const char *level_label(const struct look *look, const char *text) {
    struct arena *arena = &look->guess->arena;
    const char *plain = folded(text, arena);
    if (says_sex(look)) {
        return among(plain, "f female") ? "Female" : among(plain, "m male") ? "Male" : text;
    }
    if (yes_and_no(look) && among(plain, "y yes n no")) {
        return *plain == 'y' ? "Yes" : "No";
    }
    char *label = arena_text(arena, text + strspn(text, " "));
    if (strlen(label) > 2 && *label >= 'a' && *label <= 'z') {
        *label = (char)(*label - 'a' + 'A');
    }
    return label;
}

/* The most frequent spelling of each level is listed; others, codes for missing, and what occurs once among many are
 * not. */
static void list_levels(struct look *look) {
    struct arena *arena = &look->guess->arena;
    for (size_t i = 0; i < look->value_count; i++) {
        struct guess_value *value = &look->values[i].value;
        value->listed = !value->missing_code && (value->count > 1 || look->column->filled < 50);
        for (size_t j = 0; j < i && value->listed; j++) {
            value->listed = strcmp(folded(look->values[j].value.text, arena), folded(value->text, arena)) != 0;
        }
        value->label = level_label(look, value->text);
    }
}

static size_t listed(const struct look *look) {
    size_t count = 0;
    for (size_t i = 0; i < look->value_count; i++) {
        count += look->values[i].value.listed;
    }
    return count;
}

/* ---- roles ---- */

bool look_names_site(const struct look *look) {
    return name_has(&look->parts, "site siteid centre center clinic hospital practice ward");
}

static enum guess_role role_of(const struct look *look) {
    const struct guess_column *column = look->column;
    size_t plain = plain_values(look);
    if (plain < 2) {
        return GUESS_NOTHING;
    }
    if (10 * look->dates >= 8 * column->filled) {
        return GUESS_DATE;
    }
    if (look->numeric && look->parts.count && strcmp(look->parts.part[look->parts.count - 1].text, "id") == 0) {
        return look_names_site(look) ? GUESS_CATEGORY : GUESS_NOTHING; /* a number that only names something */
    }
    bool small_codes = look->numeric && column->decimals == 0 && plain <= (look_names_site(look) ? 50u : 5u) &&
                       column->filled >= 4 * plain && fabs(column->low) <= 1000 &&
                       fabs(column->high) <= (look_names_site(look) ? 1e6 : 20);
    if (look->numeric && !small_codes) {
        return GUESS_NUMBER;
    }
    return plain <= (look_names_site(look) ? 60u : 24u) && 2 * plain <= column->filled + 1 ? GUESS_CATEGORY
                                                                                           : GUESS_NOTHING;
}

int look_names_participant(const struct look *look) {
    static const char words[] =
        "id pid ptid subjid usubjid subject subj participant patient patid pat pt record recordid studyid "
        "study randno screenno person";
    static const char weak[] = "rownames row rown obs case no nr num number x index";
    const char *last = look->parts.count ? look->parts.part[look->parts.count - 1].text : "";
    int score = name_has(&look->parts, words) ? 6 : name_has(&look->parts, weak) ? 3 : 0;
    return score + (score && strlen(last) > 2 && strcmp(last + strlen(last) - 2, "id") == 0);
}

static int participant_score(const struct look *look) {
    const struct guess_column *column = look->column;
    if (column->filled == 0 || 10 * column->distinct < 9 * column->filled ||
        10 * column->filled < 9 * look->cells->records || column->decimals > 0 || look->dates) {
        return 0;
    }
    bool unique = column->distinct == column->filled;
    int score = look_names_participant(look);
    score = score < 6 && !unique ? 0 : score;
    if (!score && unique && !look->numeric && look->index == 0) {
        score = 2;
    }
    return score ? score + (look->index == 0) + unique : 0;
}

int guess_arm_score(const struct look *look) {
    static const char strong[] =
        "arm armcd actarm trt trtp treat treatment allocation alloc allocated randomised randomized "
        "randomisation randomization assigned assignment intervention rand trtgrp treatgrp studyarm";
    static const char weak[] = "grp group tx rx therapy regimen condition drug cohort rgroup diet";
    size_t levels = listed(look), least = SIZE_MAX, most = 0, total = 0;
    if (levels < 2 || levels > 8 || look->column->series != NOWHERE || look->column->varies ||
        name_has(&look->parts, "age bmi blood ethnic ethnicity risk race sex day date week duration") ||
        (look->column->role != GUESS_CATEGORY && look->column->role != GUESS_EVENT)) {
        return 0;
    }
    for (size_t i = 0; i < look->value_count; i++) {
        if (look->values[i].value.listed) {
            least = look->values[i].value.count < least ? look->values[i].value.count : least;
            most = look->values[i].value.count > most ? look->values[i].value.count : most;
            total += look->values[i].value.count;
        }
    }
    int score = name_has(&look->parts, strong) ? 4 : name_has(&look->parts, weak) ? 2 : 0;
    return score && 10 * total >= 8 * look->column->filled ? 2 * score + (3 * least >= most) + (2 * levels <= 6) : 0;
}

static bool event_name(const struct look *look) {
    return name_has(&look->parts,
        "rescue died death dead withdrew withdrawn withdrawal withdraw dropout dropped discontinued stopped "
        "stop event ae sae hospitalised hospitalized relapse switched crossover lost started");
}

/* Keeps of the values what the form and the plan need: all of a level's column; else the most frequent, and what is or
 * might be a code for missing. */
static void keep_values(struct look *look) {
    struct guess_column *column = look->column;
    bool all = column->role == GUESS_CATEGORY || column->role == GUESS_EVENT || column->role == GUESS_ARM ||
               column->role == GUESS_VISIT;
    for (int filling = 0; filling < 2; filling++) {
        size_t kept = 0;
        for (size_t i = 0; i < look->value_count; i++) {
            const struct look_value *entry = &look->values[i];
            if (!all && i >= GUESS_VALUES && !entry->value.missing_code && !entry->sentinel) {
                continue;
            }
            if (filling) {
                column->values[kept] = entry->value;
                column->values[kept].label = all ? entry->value.label : entry->value.text;
                column->values[kept].listed = all && entry->value.listed;
            }
            kept++;
        }
        column->value_count = kept;
        column->values = filling ? column->values : ARENA_NEW(&look->guess->arena, kept, struct guess_value);
    }
}

static void begin_look(struct look *look, struct guess *guess, const struct cells *cells, size_t file, size_t index) {
    struct guess_column *column = &guess->columns[guess->files[file].first_column + index];
    *look = (struct look){.cells = cells, .guess = guess, .column = column, .index = index, .file = file};
    *column = (struct guess_column){
        .name = cells->names[index], .full_name = cells->names[index], .unit = "", .series = NOWHERE, .file = file};
    name_take(&look->parts, column->name, &guess->arena);
    column->label = name_words(column->name, &guess->arena);
    const struct known_name *known = known_name_of(name_id(column->name, &guess->arena));
    column->unit = known ? known->unit : "";
    count_values(look);
    weigh_values(look);
    suspect_codes(look);
    describe_numbers(look);
    column->role = role_of(look);
    if (column->role == GUESS_CATEGORY) {
        suspect_nine(look);
        list_levels(look);
    }
}

/* The column with the best score, among equals the first file's. */
static int best_arm(const struct guess *guess, struct look *looks) {
    int found = NOWHERE, most = 0;
    for (size_t i = 0; i < guess->column_count; i++) {
        int here = guess_arm_score(&looks[i]);
        here = here ? 2 * here + (looks[i].file == guess->first) : 0;
        if (here > most) {
            most = here;
            found = (int)i;
        }
    }
    return found;
}

static void settle_events(struct guess *guess, struct look *looks) {
    size_t last = 0;
    for (size_t i = 0; i < guess->series_count; i++) {
        size_t at = guess->series[i].columns[guess->series[i].count - 1];
        last = at > last && !guess->series[i].codes[guess->series[i].count - 1] ? at : last;
    }
    for (size_t i = 0; i < guess->column_count; i++) {
        struct guess_column *column = &guess->columns[i];
        bool after = guess->series_count && i > last && !looks[i].numeric && !guess->files[looks[i].file].by_visit;
        if (column->role == GUESS_CATEGORY && yes_and_no(&looks[i]) && (event_name(&looks[i]) || after)) {
            column->role = GUESS_EVENT;
        }
    }
}

int guess_identifier(const struct look *looks, size_t count) {
    int found = NOWHERE, most = 0;
    for (size_t i = 0; i < count; i++) {
        int here = participant_score(&looks[i]);
        if (here > most) {
            most = here;
            found = (int)i;
        }
    }
    return found;
}

static const char *free_file_id(const struct guess *guess, size_t count, const char *name, struct arena *arena) {
    const char *end = strrchr(name, '.');
    const char *wanted = name_id(end && end != name ? arena_bytes(arena, name, (size_t)(end - name)) : name, arena);
    const char *id = wanted;
    for (size_t i = 0, n = 2; i < count; i++) {
        if (strcmp(guess->files[i].id, id) == 0) {
            id = arena_format(arena, "%s_%zu", wanted, n++);
            i = (size_t)-1;
        }
    }
    return id;
}

static void begin_files(struct guess *guess, const struct guess_source *sources, size_t count) {
    *guess = (struct guess){.file_count = count, .participant = NOWHERE, .arm = NOWHERE};
    arena_init(&guess->arena);
    guess->files = ARENA_NEW(&guess->arena, count, struct guess_file);
    for (size_t f = 0; f < count; f++) {
        guess->files[f] = (struct guess_file){.id = free_file_id(guess, f, sources[f].name, &guess->arena),
            .name = sources[f].name,
            .sheet = sources[f].sheet,
            .records = sources[f].cells->records,
            .first_column = guess->column_count,
            .column_count = sources[f].cells->columns,
            .participant = NOWHERE,
            .visit = NOWHERE};
        guess->column_count += sources[f].cells->columns;
    }
    guess->columns = ARENA_NEW(&guess->arena, guess->column_count, struct guess_column);
}

static void name_columns(struct guess *guess) {
    const struct guess_file *first = &guess->files[guess->first];
    guess->name = first->name;
    guess->records = first->records;
    guess->participant = first->participant;
    guess->with_files = guess->file_count > 1 || first->by_visit || first->sheet;
    for (size_t i = 0; i < guess->column_count && guess->with_files; i++) {
        struct guess_column *column = &guess->columns[i];
        column->full_name = arena_format(&guess->arena, "%s.%s", guess->files[column->file].id, column->name);
    }
}

void guess_take_all(struct guess *guess, const struct guess_source *sources, size_t count) {
    begin_files(guess, sources, count);
    struct look *looks = memory_new(guess->column_count, sizeof *looks);
    for (size_t f = 0; f < count; f++) {
        for (size_t i = 0; i < sources[f].cells->columns; i++) {
            begin_look(&looks[guess->files[f].first_column + i], guess, sources[f].cells, f, i);
        }
    }
    guess_layouts(guess, sources, looks);
    name_columns(guess);
    guess->arm = best_arm(guess, looks);
    if (guess->arm != NOWHERE) {
        guess->columns[guess->arm].role = GUESS_ARM;
    }
    guess_visits(guess);
    guess_visit_columns(guess, looks);
    settle_events(guess, looks);
    for (size_t i = 0; i < guess->column_count; i++) {
        keep_values(&looks[i]);
        memory_free(looks[i].values);
    }
    memory_free(looks);
}

void guess_take(struct guess *guess, const struct cells *cells, const char *name) {
    const struct guess_source source = {.name = name, .cells = cells};
    guess_take_all(guess, &source, 1);
}

void guess_release(struct guess *guess) {
    arena_release(&guess->arena);
    *guess = (struct guess){0};
}
