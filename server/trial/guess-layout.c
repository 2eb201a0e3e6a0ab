/* SPDX-License-Identifier: GPL-3.0-or-later */
/* How the files of a study lie: which has one row per participant and which one row per participant and visit, by which
 * column they are joined, which codes a visit column has in order of time, which file has every participant. */
#include "base/map.h"
#include "server/trial/guess-parts.h"
#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { VISITS_MOST = 80 }; /* as many codes as a visit column may have */

/* ---- columns as numbers: which of its distinct texts stands in each record ---- */

struct ranks {
    const struct look *look;
    int32_t *of;        /* per record; NOWHERE where blank */
    const char **texts; /* per number, in order of appearance */
    size_t count, filled;
};

static void ranks_take(struct ranks *ranks, const struct look *look) {
    size_t records = look->cells->records;
    struct map map;
    map_init(&map);
    *ranks = (struct ranks){.look = look,
        .of = memory_new(records + 1, sizeof *ranks->of),
        .texts = memory_new(look->value_count + 1, sizeof *ranks->texts)};
    for (size_t r = 0; r < records; r++) {
        const char *text = cells_at(look->cells, r, look->index);
        ranks->of[r] = NOWHERE;
        if (!text_is_blank(text)) {
            ranks->of[r] = map_put(&map, text, (int32_t)ranks->count);
            if ((size_t)ranks->of[r] == ranks->count) {
                ranks->texts[ranks->count++] = text;
            }
            ranks->filled++;
        }
    }
    map_release(&map);
}

static void ranks_release(struct ranks *ranks) {
    memory_free(ranks->of);
    memory_free(ranks->texts);
}

/* ---- is a pair of columns participant and visit? ---- */

static bool is_unplanned(const char *code, struct arena *arena) {
    struct name_parts parts;
    name_take(&parts, code, arena);
    return name_has(&parts, "unscheduled unsched unsch uns unplanned extra adhoc");
}

/* 6: plainly a visit's name; 4: a unit of time; 3: the codes read as times; 0: nothing says so. */
static int names_visit(const struct look *look, struct arena *arena) {
    size_t read = 0;
    if (look->value_count < 2 || look->value_count > VISITS_MOST) {
        return 0;
    }
    if (name_has(&look->parts,
            "visit visits visitnum visitno visitcode vis visno timepoint occasion wave assessment period session")) {
        return 6;
    }
    if (name_has(&look->parts, "time week weeks wk month months mth day days hour hours year event phase")) {
        return 4;
    }
    for (size_t i = 0; i < look->value_count; i++) {
        double order;
        const char *label;
        char *end;
        const char *text = look->values[i].value.text;
        bool number = (strtod(text, &end), end != text && !*end);
        read += !number && (visit_code_read("", text, arena, &order, &label) || is_unplanned(text, arena));
    }
    return 5 * read >= 4 * look->value_count ? 3 : 0;
}

/* How many other columns of the file are the same in every record of one participant. */
static size_t constants(
    const struct guess_file *file, const struct look *looks, const struct ranks *who, const struct look *visit) {
    size_t found = 0;
    const char **seen = memory_new(who->count + 1, sizeof *seen);
    for (size_t c = 0; c < file->column_count; c++) {
        const struct look *look = &looks[file->first_column + c];
        bool same = look != who->look && look != visit && look->value_count > 1;
        memset(seen, 0, (who->count + 1) * sizeof *seen);
        for (size_t r = 0; same && r < look->cells->records; r++) {
            const char *text = cells_at(look->cells, r, look->index);
            const char **first = who->of[r] == NOWHERE ? NULL : &seen[who->of[r]];
            if (first && !text_is_blank(text)) {
                same = !*first || strcmp(*first, text) == 0;
                *first = *first ? *first : text;
            }
        }
        found += same;
    }
    memory_free(seen);
    return found;
}

static int by_number(const void *left, const void *right) {
    uint64_t a = *(const uint64_t *)left, b = *(const uint64_t *)right;
    return (a > b) - (a < b);
}

static size_t different_pairs(const struct ranks *who, const struct ranks *when, size_t records, size_t *both) {
    uint64_t *pairs = memory_new(records + 1, sizeof *pairs);
    size_t different = 0;
    *both = 0;
    for (size_t r = 0; r < records; r++) {
        if (who->of[r] != NOWHERE && when->of[r] != NOWHERE) {
            pairs[(*both)++] = ((uint64_t)(uint32_t)who->of[r] << 32) | (uint32_t)when->of[r];
        }
    }
    if (*both) {
        qsort(pairs, *both, sizeof *pairs, by_number);
    }
    for (size_t i = 0; i < *both; i++) {
        different += i == 0 || pairs[i] != pairs[i - 1];
    }
    memory_free(pairs);
    return different;
}

/* 0: no; else the more the likelier. */
static int pair_score(const struct guess_file *file, const struct look *looks, const struct ranks *who,
    const struct ranks *when, int visit_name, bool said) {
    size_t records = who->look->cells->records, both;
    int name = look_names_participant(who->look);
    if (who->look == when->look || who->count < 3 || 10 * who->filled < 9 * records ||
        5 * who->filled < 6 * who->count) {
        return 0; /* identifiers stand in most records, and in more than one record each */
    }
    size_t different = different_pairs(who, when, records, &both);
    if (20 * different < 19 * both || 10 * both < 8 * records) {
        return 0; /* nearly every pair once */
    }
    size_t same = constants(file, looks, who, when->look);
    bool complete = 10 * both >= 4 * who->count * when->count;
    if (!said && name < 6 && (!complete || same == 0)) {
        return 0; /* no name says so: then the table's shape must */
    }
    return visit_name * 4 + name * 2 + 3 * (same > 0) + 2 * complete;
}

/* ---- one file ---- */

static int column_of(const struct guess *guess, const struct guess_file *file, const char *name) {
    for (size_t i = 0; name && i < file->column_count; i++) {
        if (strcmp(guess->columns[file->first_column + i].name, name) == 0) {
            return (int)(file->first_column + i);
        }
    }
    return NOWHERE;
}

static bool may_identify(const struct look *look) {
    return look->value_count >= 3 && look->column->decimals == 0 && !look->dates && !look_names_site(look) &&
           10 * look->column->filled >= 9 * look->cells->records;
}

/* The likeliest pair, with what is said of either taken as it is. */
static int best_pair(struct guess *guess, const struct guess_file *file, const struct look *looks, int said_who,
    int said_when, int *participant, int *visit) {
    int most = 0;
    for (size_t v = file->first_column; v < file->first_column + file->column_count; v++) {
        int name = said_when == NOWHERE ? names_visit(&looks[v], &guess->arena) : said_when == (int)v ? 6 : 0;
        if (file->by_visit && said_when == NOWHERE && looks[v].value_count >= 2 && looks[v].value_count <= VISITS_MOST) {
            name = name ? name : 1; /* a person says that there is one */
        }
        if (!name) {
            continue;
        }
        struct ranks when;
        ranks_take(&when, &looks[v]);
        for (size_t i = file->first_column; i < file->first_column + file->column_count; i++) {
            if (said_who == NOWHERE ? !may_identify(&looks[i]) : said_who != (int)i) {
                continue;
            }
            struct ranks who;
            ranks_take(&who, &looks[i]);
            int score = pair_score(file, looks, &who, &when, name, said_who != NOWHERE);
            if (score > most) {
                most = score;
                *participant = (int)i;
                *visit = (int)v;
            }
            ranks_release(&who);
        }
        ranks_release(&when);
    }
    return most;
}

/* What nothing in the values supports but a person has said: the best names that are left. */
static void fill_from_names(struct guess *guess, struct guess_file *file, const struct look *looks) {
    int most = 0;
    for (size_t i = file->first_column; i < file->first_column + file->column_count && file->participant == NOWHERE;
         i++) {
        int score = (int)i == file->visit ? 0 : look_names_participant(&looks[i]);
        if (score > most) {
            most = score;
            file->participant = (int)i;
        }
    }
    most = 0;
    int found = NOWHERE;
    for (size_t i = file->first_column; i < file->first_column + file->column_count && file->visit == NOWHERE; i++) {
        int score = (int)i == file->participant ? 0 : names_visit(&looks[i], &guess->arena);
        if (score > most) {
            most = score;
            found = (int)i;
        }
    }
    file->visit = file->visit == NOWHERE ? found : file->visit;
}

static void settle_layout(struct guess *guess, struct guess_file *file, const struct guess_source *source,
    const struct look *looks, int who) {
    int said_when = column_of(guess, file, source->visit);
    int participant = NOWHERE, visit = NOWHERE;
    int alone = guess_identifier(looks + file->first_column, file->column_count);
    alone = alone == NOWHERE ? NOWHERE : alone + (int)file->first_column;
    bool named = alone != NOWHERE && look_names_participant(&looks[alone]) >= 6;
    file->by_visit = source->layout == LAYOUT_VISIT;
    if (source->layout != LAYOUT_PARTICIPANT && (file->by_visit || who != NOWHERE || !named) &&
        best_pair(guess, file, looks, who, said_when, &participant, &visit)) {
        file->by_visit = true;
        file->participant = participant;
        file->visit = visit;
        return;
    }
    file->participant = who;
    file->visit = file->by_visit ? said_when : NOWHERE;
    if (file->by_visit) {
        fill_from_names(guess, file, looks);
    } else if (who == NOWHERE) {
        file->participant = alone;
    }
}

/* ---- the codes of a visit column ---- */

static int in_time(const void *left, const void *right) {
    const struct guess_code *a = left, *b = right;
    double first = isnan(a->order) ? HUGE_VAL : a->order, second = isnan(b->order) ? HUGE_VAL : b->order;
    return first != second ? (first < second ? -1 : 1) : (a->records < b->records) - (a->records > b->records);
}

/* A visit "unscheduled", or one that next to nobody has, was not planned. */
static bool planned(const struct guess_code *code, size_t participants, struct arena *arena) {
    return !is_unplanned(code->code, arena) && (participants < 20 || 20 * code->records >= participants);
}

static void label_apart(struct guess_file *file) {
    for (size_t i = 0; i < file->code_count; i++) {
        for (size_t j = 0; j < i; j++) {
            if (strcmp(file->codes[i].label, file->codes[j].label) == 0) {
                file->codes[i].label = file->codes[i].code;
                file->codes[j].label = file->codes[j].code;
            }
        }
    }
}

static void settle_codes(
    struct guess *guess, struct guess_file *file, const struct guess_source *source, const struct look *look) {
    file->codes = ARENA_NEW(&guess->arena, look->value_count + source->code_count + 1, struct guess_code);
    for (size_t i = 0; i < source->code_count; i++) {
        struct guess_code *code = &file->codes[file->code_count++];
        code->code = arena_text(&guess->arena, source->codes[i]);
        visit_code_read(look->column->name, code->code, &guess->arena, &code->order, &code->label);
        for (size_t j = 0; j < look->value_count; j++) {
            code->records += strcmp(look->values[j].value.text, code->code) == 0 ? look->values[j].value.count : 0;
        }
    }
    for (size_t i = 0; i < look->value_count && source->code_count == 0 && file->code_count < VISITS_MOST; i++) {
        struct guess_code code = {.code = look->values[i].value.text, .records = look->values[i].value.count};
        visit_code_read(look->column->name, code.code, &guess->arena, &code.order, &code.label);
        if (planned(&code, file->participants, &guess->arena) && !look->values[i].value.missing_code) {
            file->codes[file->code_count++] = code;
        }
    }
    if (source->code_count == 0 && file->code_count) {
        qsort(file->codes, file->code_count, sizeof *file->codes, in_time);
    }
    label_apart(file);
}

/* ---- what varies by visit ---- */

/* Does the number go up whenever the visit is a later one? For nearly all records that follow one of the same
 * participant. */
static bool rises(const struct look *look, const struct ranks *who, const int32_t *when) {
    size_t *last = memory_new(who->count + 1, sizeof *last); /* 1 + the record before */
    size_t steps = 0, with_time = 0;
    for (size_t r = 0; r < look->cells->records; r++) {
        if (who->of[r] == NOWHERE || when[r] == NOWHERE || text_is_blank(cells_at(look->cells, r, look->index))) {
            continue;
        }
        size_t before = last[who->of[r]];
        if (before && when[before - 1] != when[r]) {
            double step = strtod(cells_at(look->cells, r, look->index), NULL) -
                          strtod(cells_at(look->cells, before - 1, look->index), NULL);
            steps++;
            with_time += when[r] > when[before - 1] ? step > 0 : step < 0;
        }
        last[who->of[r]] = r + 1;
    }
    memory_free(last);
    return steps > 0 && 20 * with_time >= 19 * steps;
}

/* A number that names the record, or a time that the visit's code says already, is no outcome. */
static bool counts_records(const struct look *look, const struct ranks *who, const int32_t *when) {
    static const char times[] =
        "visit visitnum time day days week weeks month months year years hour hours date wk mth";
    return look->column->role == GUESS_NUMBER && look->column->varies &&
           (look_names_participant(look) || (name_has(&look->parts, times) && rises(look, who, when)));
}

static void count_by_visit(struct guess *guess, const struct guess_file *file, const struct look *look,
    const struct ranks *who, const int32_t *when) {
    struct guess_column *column = look->column;
    const char **seen = memory_new(who->count + 1, sizeof *seen);
    bool *differs = memory_new(who->count + 1, sizeof *differs);
    size_t with = 0, unlike = 0;
    column->filled_at = ARENA_NEW(&guess->arena, file->code_count + 1, size_t);
    for (size_t r = 0; r < look->cells->records; r++) {
        const char *text = cells_at(look->cells, r, look->index);
        if (who->of[r] == NOWHERE || text_is_blank(text)) {
            continue;
        }
        if (when[r] != NOWHERE) {
            column->filled_at[when[r]]++;
        }
        const char **first = &seen[who->of[r]];
        differs[who->of[r]] = differs[who->of[r]] || (*first && strcmp(*first, text) != 0);
        *first = *first ? *first : text;
    }
    for (size_t p = 0; p < who->count; p++) {
        with += seen[p] != NULL;
        unlike += differs[p];
    }
    column->varies = 10 * unlike > with;
    memory_free(seen);
    memory_free(differs);
}

static void look_by_visit(
    struct guess *guess, const struct guess_file *file, const struct look *looks, const struct ranks *who) {
    const struct look *visit = &looks[file->visit];
    int32_t *when = memory_new(file->records + 1, sizeof *when);
    struct map codes;
    map_init(&codes);
    for (size_t i = 0; i < file->code_count; i++) {
        map_put(&codes, file->codes[i].code, (int32_t)i);
    }
    for (size_t r = 0; r < file->records; r++) {
        when[r] = map_get(&codes, cells_at(visit->cells, r, visit->index));
    }
    for (size_t c = file->first_column; c < file->first_column + file->column_count; c++) {
        count_by_visit(guess, file, &looks[c], who, when);
        if (counts_records(&looks[c], who, when)) {
            looks[c].column->role = GUESS_NOTHING;
        }
    }
    map_release(&codes);
    memory_free(when);
}

/* A level that is the only one at the first visit says nothing there. */
static bool says_nothing(const struct guess_file *file, const struct look *look, const struct look *visit) {
    if (look->column->role != GUESS_CATEGORY || !look->column->varies || file->code_count == 0) {
        return false;
    }
    const char *code = file->codes[0].code, *only = NULL;
    for (size_t r = 0; r < file->records; r++) {
        const char *text = cells_at(look->cells, r, look->index);
        if (strcmp(cells_at(visit->cells, r, visit->index), code) != 0 || text_is_blank(text)) {
            continue;
        }
        if (only && strcmp(only, text) != 0) {
            return false;
        }
        only = text;
    }
    return true;
}

/* ---- which file is first, and what the others share with it ---- */

static bool has_arm(const struct guess_file *file, const struct look *looks) {
    for (size_t i = file->first_column; i < file->first_column + file->column_count; i++) {
        if (guess_arm_score(&looks[i])) {
            return true;
        }
    }
    return false;
}

static size_t first_file(const struct guess *guess, const struct look *looks) {
    size_t found = 0, most = 0;
    for (size_t f = 0; f < guess->file_count; f++) {
        const struct guess_file *file = &guess->files[f];
        size_t worth =
            file->participant == NOWHERE ? 0 : 1u + (file->by_visit ? 0u : 4u) + (has_arm(file, looks) ? 2u : 0u);
        const struct guess_file *best = &guess->files[found];
        if (f == 0 || worth > most || (worth == most && file->participants > best->participants)) {
            most = worth;
            found = f;
        }
    }
    return found;
}

static size_t shared(const struct map *first, const struct look *look) {
    size_t count = 0;
    for (size_t i = 0; i < look->value_count; i++) {
        count += map_get(first, look->values[i].value.text) >= 0;
    }
    return count;
}

/* The column whose values are the first file's identifiers; what its name says decides between equals. */
static int shared_column(
    const struct guess_file *file, const struct look *looks, const struct map *first, const char *name) {
    int found = NOWHERE;
    size_t most = 0;
    for (size_t i = file->first_column; i < file->first_column + file->column_count; i++) {
        size_t here = shared(first, &looks[i]);
        if (2 * here < looks[i].value_count || here < 3 || !may_identify(&looks[i])) {
            continue;
        }
        here =
            20 * here + (size_t)look_names_participant(&looks[i]) + (strcmp(looks[i].column->name, name) == 0 ? 10 : 0);
        if (here > most) {
            most = here;
            found = (int)i;
        }
    }
    return found;
}

static void count_participants(struct guess_file *file, const struct look *looks) {
    file->participants = file->participant == NOWHERE ? 0 : looks[file->participant].value_count;
}

static void join_files(struct guess *guess, const struct guess_source *sources, const struct look *looks) {
    const struct guess_file *first = &guess->files[guess->first];
    if (first->participant == NOWHERE) {
        return;
    }
    const struct look *identifier = &looks[first->participant];
    struct map map;
    map_init(&map);
    for (size_t i = 0; i < identifier->value_count; i++) {
        map_put(&map, identifier->values[i].value.text, 0);
    }
    for (size_t f = 0; f < guess->file_count; f++) {
        struct guess_file *file = &guess->files[f];
        bool said = column_of(guess, file, sources[f].participant) != NOWHERE;
        bool poor = file->participant == NOWHERE ||
                    2 * shared(&map, &looks[file->participant]) < looks[file->participant].value_count;
        int better =
            f != guess->first && !said && poor ? shared_column(file, looks, &map, identifier->column->name) : NOWHERE;
        if (better != NOWHERE) {
            settle_layout(guess, file, &sources[f], looks, better);
            count_participants(file, looks);
        }
        file->shared = file->participant == NOWHERE ? 0 : shared(&map, &looks[file->participant]);
    }
    map_release(&map);
}

static void settle_roles(
    struct guess *guess, const struct guess_source *sources, struct look *looks, struct guess_file *file) {
    if (file->participant != NOWHERE) {
        looks[file->participant].column->role = GUESS_PARTICIPANT;
    }
    if (!file->by_visit || file->visit == NOWHERE) {
        return;
    }
    const struct look *visit = &looks[file->visit];
    visit->column->role = GUESS_VISIT;
    settle_codes(guess, file, &sources[file - guess->files], visit);
    if (file->participant == NOWHERE) {
        return;
    }
    struct ranks who;
    ranks_take(&who, &looks[file->participant]);
    look_by_visit(guess, file, looks, &who);
    ranks_release(&who);
    for (size_t c = file->first_column; c < file->first_column + file->column_count; c++) {
        if (says_nothing(file, &looks[c], visit)) {
            looks[c].column->role = GUESS_NOTHING;
        }
    }
}

void guess_layouts(struct guess *guess, const struct guess_source *sources, struct look *looks) {
    for (size_t f = 0; f < guess->file_count; f++) {
        struct guess_file *file = &guess->files[f];
        settle_layout(guess, file, &sources[f], looks, column_of(guess, file, sources[f].participant));
        count_participants(file, looks);
    }
    guess->first = first_file(guess, looks);
    join_files(guess, sources, looks);
    for (size_t f = 0; f < guess->file_count; f++) {
        settle_roles(guess, sources, looks, &guess->files[f]);
    }
}

/* ---- series by visit ---- */

/* The files' visits at which a column has values: more than strays. */
static size_t visits_of(const struct guess_file *file, const struct guess_column *column, size_t *visits) {
    size_t most = 0, count = 0;
    for (size_t i = 0; i < file->code_count; i++) {
        most = column->filled_at[i] > most ? column->filled_at[i] : most;
    }
    for (size_t i = 0; i < file->code_count; i++) {
        if (column->filled_at[i] && 20 * column->filled_at[i] >= most) {
            visits[count++] = i;
        }
    }
    /* A screening value is no baseline where there is one. */
    if (count > 2 && visit_code_is_screening(file->codes[visits[0]].order) &&
        visit_code_is_baseline(file->codes[visits[1]].order)) {
        memmove(visits, visits + 1, --count * sizeof *visits);
    }
    return count;
}

/* Measured at several visits and not always the same, or only after the baseline. */
static bool an_outcome(
    const struct guess_file *file, const struct guess_column *column, const size_t *visits, size_t count) {
    bool after = count && visits[0] > 0 && !visit_code_is_baseline(file->codes[visits[0]].order);
    return column->role == GUESS_NUMBER && count && (count > 1 ? column->varies : after);
}

void guess_visit_columns(struct guess *guess, struct look *looks) {
    for (size_t c = 0; c < guess->column_count; c++) {
        const struct guess_column *column = &guess->columns[c];
        const struct guess_file *file = &guess->files[column->file];
        size_t visits[VISITS_MOST + 1];
        if (!column->filled_at || file->code_count > VISITS_MOST) {
            continue;
        }
        size_t count = visits_of(file, column, visits);
        if (!an_outcome(file, column, visits, count)) {
            continue;
        }
        struct arena *arena = &guess->arena;
        const struct known_name *known = known_name_of(name_id(looks[c].column->name, arena));
        struct guess_series series = {.id = name_id(column->name, arena),
            .label = column->label,
            .unit = column->unit,
            .columns = ARENA_NEW(arena, count, size_t),
            .codes = ARENA_NEW(arena, count, const char *),
            .visits = ARENA_NEW(arena, count, const char *),
            .count = count,
            .lower_is_better = !(known && known->higher_is_better)};
        for (size_t i = 0; i < count; i++) {
            series.columns[i] = c;
            series.codes[i] = file->codes[visits[i]].code;
            series.visits[i] = file->codes[visits[i]].label;
        }
        guess_add_series(guess, series);
    }
}
