/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The guess as JSON, and as the draft of a plan. */
#include "server/trial/guess-parts.h"
#include <math.h>
#include <stdlib.h>
#include <string.h>

/* ---- suspected codes, over all columns ---- */

struct code {
    const char *text;
    size_t *columns, count;
    bool everywhere; /* no column of the plan has it as an ordinary value */
};

struct codes {
    struct code *list;
    size_t count;
};

static bool column_has(const struct guess_column *column, const char *text, bool *as_code) {
    for (size_t i = 0; i < column->value_count; i++) {
        if (strcmp(column->values[i].text, text) == 0) {
            *as_code = column->values[i].missing_code;
            return true;
        }
    }
    return false;
}

static bool in_plan(const struct guess_column *column) {
    return column->role == GUESS_NUMBER || column->role == GUESS_CATEGORY || column->role == GUESS_EVENT;
}

static void add_code(struct codes *codes, const char *text, size_t columns) {
    for (size_t i = 0; i < codes->count; i++) {
        if (strcmp(codes->list[i].text, text) == 0) {
            return;
        }
    }
    codes->list = memory_grow(codes->list, codes->count + 1, sizeof *codes->list);
    codes->list[codes->count++] =
        (struct code){.text = text, .columns = memory_new(columns, sizeof(size_t)), .everywhere = true};
}

static void codes_take(struct codes *codes, const struct guess *guess) {
    *codes = (struct codes){0};
    for (size_t i = 0; i < guess->column_count; i++) {
        const struct guess_column *column = &guess->columns[i];
        for (size_t j = 0; j < column->value_count && in_plan(column); j++) {
            if (column->values[j].missing_code) {
                add_code(codes, column->values[j].text, guess->column_count);
            }
        }
    }
    for (size_t k = 0; k < codes->count; k++) {
        for (size_t i = 0; i < guess->column_count; i++) {
            bool as_code;
            if (in_plan(&guess->columns[i]) && column_has(&guess->columns[i], codes->list[k].text, &as_code)) {
                codes->list[k].everywhere = codes->list[k].everywhere && as_code;
                if (as_code) {
                    codes->list[k].columns[codes->list[k].count++] = i;
                }
            }
        }
    }
}

static void codes_release(struct codes *codes) {
    for (size_t i = 0; i < codes->count; i++) {
        memory_free(codes->list[i].columns);
    }
    memory_free(codes->list);
}

/* ---- the guess as JSON ---- */

/* FILE.COLUMN@CODE, FILE.COLUMN or COLUMN. */
static const char *place_name(const struct guess *guess, size_t column, const char *code, struct arena *arena) {
    const char *name = guess->columns[column].full_name;
    return code ? arena_format(arena, "%s@%s", name, code) : name;
}

static const char *visit_of(const struct guess *guess, size_t column) {
    int series = guess->columns[column].series;
    for (size_t i = 0;
         series != NOWHERE && !guess->files[guess->columns[column].file].by_visit && i < guess->series[series].count;
         i++) {
        if (guess->series[series].columns[i] == column) {
            return guess->series[series].visits[i];
        }
    }
    return NULL;
}

static void values_json(const struct guess_column *column, struct json *json) {
    json_key_array(json, "values");
    for (size_t i = 0; i < column->value_count; i++) {
        const struct guess_value *value = &column->values[i];
        json_object(json);
        json_field_string(json, "text", value->text);
        json_field_string(json, "label", value->label);
        json_field_integer(json, "count", (int64_t)value->count);
        json_field_bool(json, "listed", value->listed);
        json_field_bool(json, "missing_code", value->missing_code);
        json_close(json);
    }
    json_close(json);
}

static void column_json(const struct guess *guess, size_t index, struct json *json) {
    const struct guess_column *column = &guess->columns[index];
    json_object(json);
    json_field_string(json, "name", column->full_name);
    if (guess->with_files) {
        const struct guess_file *file = &guess->files[column->file];
        json_field_string(json, "file", file->id);
        json_field_string(json, "layout", file->by_visit ? "visit" : "participant");
        json_field_bool(json, "varies", column->varies);
    }
    json_field_string(json, "label", column->label);
    json_field_string(json, "unit", column->unit);
    json_field_string(json, "role", guess_role_name(column->role));
    json_field_integer(json, "filled", (int64_t)column->filled);
    json_field_integer(json, "blank", (int64_t)column->blank);
    json_field_integer(json, "distinct", (int64_t)column->distinct);
    json_field_integer(json, "numbers", (int64_t)column->numbers);
    json_field_integer(json, "unreadable", (int64_t)column->unreadable);
    json_field_number(json, "low", column->low);
    json_field_number(json, "median", column->median);
    json_field_number(json, "high", column->high);
    json_field_integer(json, "decimals", column->decimals);
    json_field_string(json, "series", column->series == NOWHERE ? NULL : guess->series[column->series].id);
    json_field_string(json, "visit", visit_of(guess, index));
    values_json(column, json);
    json_close(json);
}

static void visits_json(const struct guess *guess, const struct guess_series *series, struct json *json) {
    struct arena arena;
    arena_init(&arena);
    json_key_array(json, "visits");
    for (size_t i = 0; i < series->count; i++) {
        json_object(json);
        json_field_string(json, "label", series->visits[i]);
        json_field_string(json, "column", place_name(guess, series->columns[i], series->codes[i], &arena));
        json_close(json);
    }
    json_close(json);
    arena_release(&arena);
}

static void series_json(const struct guess *guess, struct json *json) {
    json_key_array(json, "series");
    for (size_t i = 0; i < guess->series_count; i++) {
        const struct guess_series *series = &guess->series[i];
        json_object(json);
        json_field_string(json, "id", series->id);
        json_field_string(json, "label", series->label);
        json_field_string(json, "unit", series->unit);
        json_field_string(json, "scale", scale_name(series->scale));
        json_field_string(json, "better", series->lower_is_better ? "lower" : "higher");
        visits_json(guess, series, json);
        json_close(json);
    }
    json_close(json);
}

static void codes_json(const struct guess *guess, struct json *json) {
    struct codes codes;
    codes_take(&codes, guess);
    json_key_array(json, "missing_codes");
    for (size_t i = 0; i < codes.count; i++) {
        json_object(json);
        json_field_string(json, "code", codes.list[i].text);
        json_key_array(json, "columns");
        for (size_t j = 0; j < codes.list[i].count; j++) {
            json_string(json, guess->columns[codes.list[i].columns[j]].full_name);
        }
        json_close(json);
        json_close(json);
    }
    json_close(json);
    codes_release(&codes);
}

static void file_json(const struct guess *guess, size_t index, struct json *json) {
    const struct guess_file *file = &guess->files[index];
    json_object(json);
    json_field_string(json, "id", file->id);
    json_field_string(json, "name", file->name);
    json_field_string(json, "sheet", file->sheet);
    json_field_integer(json, "records", (int64_t)file->records);
    json_key_array(json, "columns");
    for (size_t i = 0; i < file->column_count; i++) {
        json_string(json, guess->columns[file->first_column + i].name);
    }
    json_close(json);
    json_field_bool(json, "first", index == guess->first);
    json_field_string(json, "layout", file->by_visit ? "visit" : "participant");
    json_field_string(
        json, "participant", file->participant == NOWHERE ? NULL : guess->columns[file->participant].name);
    json_field_integer(json, "participants", (int64_t)file->participants);
    json_field_integer(json, "shared", (int64_t)file->shared);
    json_field_string(json, "visit", file->visit == NOWHERE ? NULL : guess->columns[file->visit].name);
    json_key_array(json, "codes");
    for (size_t i = 0; i < file->code_count; i++) {
        json_object(json);
        json_field_string(json, "code", file->codes[i].code);
        json_field_string(json, "label", file->codes[i].label);
        json_field_integer(json, "records", (int64_t)file->codes[i].records);
        json_close(json);
    }
    json_close(json);
    json_close(json);
}

void guess_json(const struct guess *guess, struct json *json) {
    json_object(json);
    json_field_string(json, "name", guess->name);
    json_field_integer(json, "records", (int64_t)guess->records);
    json_field_string(
        json, "participant", guess->participant == NOWHERE ? NULL : guess->columns[guess->participant].full_name);
    json_field_string(json, "arm", guess->arm == NOWHERE ? NULL : guess->columns[guess->arm].full_name);
    json_key_array(json, "columns");
    for (size_t i = 0; i < guess->column_count; i++) {
        column_json(guess, i, json);
    }
    json_close(json);
    series_json(guess, json);
    codes_json(guess, json);
    json_key_array(json, "files");
    for (size_t i = 0; i < guess->file_count; i++) {
        file_json(guess, i, json);
    }
    json_close(json);
    json_close(json);
}

/* ---- the draft of a plan ---- */

struct draft {
    const struct guess *guess;
    struct json *json;
    struct codes codes;
    struct arena arena;
    const char **ids; /* given so far */
    size_t id_count;
    int lone; /* without any series: the column that is the outcome */
};

static const char *take_id(struct draft *draft, const char *wanted) {
    const char *id = wanted;
    size_t n = 2;
    for (size_t i = 0; i < draft->id_count; i++) {
        if (strcmp(draft->ids[i], id) == 0) {
            id = arena_format(&draft->arena, "%s_%zu", wanted, n++);
            i = (size_t)-1;
        }
    }
    draft->ids[draft->id_count++] = id;
    return id;
}

/* A list of its own where one of the columns has a code that is an ordinary value elsewhere. */
static void own_codes(struct draft *draft, const size_t *columns, size_t count) {
    bool own = false;
    for (size_t k = 0; k < draft->codes.count; k++) {
        const struct code *code = &draft->codes.list[k];
        for (size_t i = 0; i < count && !code->everywhere; i++) {
            bool as_code = false;
            own = own || (column_has(&draft->guess->columns[columns[i]], code->text, &as_code) && as_code);
        }
    }
    if (!own) {
        return;
    }
    json_key_array(draft->json, "missing_codes");
    for (size_t k = 0; k < draft->codes.count; k++) {
        bool here = draft->codes.list[k].everywhere;
        for (size_t i = 0; i < count && !here; i++) {
            bool as_code = false;
            here = column_has(&draft->guess->columns[columns[i]], draft->codes.list[k].text, &as_code) && as_code;
        }
        if (here) {
            json_string(draft->json, draft->codes.list[k].text);
        }
    }
    json_close(draft->json);
}

static void draft_outcome(struct draft *draft, const struct guess_series *series, bool primary) {
    struct json *json = draft->json;
    json_object(json);
    json_field_string(json, "id", take_id(draft, series->id));
    json_field_string(json, "label", series->label);
    if (*series->unit) {
        json_field_string(json, "unit", series->unit);
    }
    json_field_string(json, "role", primary ? "primary" : "secondary");
    json_field_string(json, "better", series->lower_is_better ? "lower" : "higher");
    json_field_string(json, "scale", scale_name(series->scale));
    visits_json(draft->guess, series, json);
    own_codes(draft, series->columns, series->count);
    json_close(json);
}

/* The code of the first visit at which a column of a file with one row per visit has values; NULL in other files. */
static const char *at_first_visit(const struct guess *guess, size_t index) {
    const struct guess_column *column = &guess->columns[index];
    const struct guess_file *file = &guess->files[column->file];
    for (size_t i = 0; file->by_visit && i < file->code_count; i++) {
        if (column->filled_at && column->filled_at[i]) {
            return file->codes[i].code;
        }
    }
    return file->code_count ? file->codes[0].code : NULL;
}

static const char *column_place(struct draft *draft, size_t index) {
    return place_name(draft->guess, index, at_first_visit(draft->guess, index), &draft->arena);
}

/* Without a series the last number is taken for the outcome, measured once. */
static void draft_lone(struct draft *draft) {
    const struct guess *guess = draft->guess;
    for (size_t i = 0; i < guess->column_count; i++) {
        const struct guess_column *column = &guess->columns[i];
        bool may_be =
            column->role == GUESS_NUMBER && strcmp(column->label, "Age") != 0 && !guess->files[column->file].by_visit;
        draft->lone = may_be ? (int)i : draft->lone;
    }
    if (draft->lone != NOWHERE) {
        const struct guess_column *column = &guess->columns[draft->lone];
        size_t columns[] = {(size_t)draft->lone};
        const char *visits[] = {"Follow-up"}, *codes[] = {at_first_visit(guess, (size_t)draft->lone)};
        const struct known_name *known = known_name_of(name_id(column->name, &draft->arena));
        struct guess_series series = {.id = name_id(column->name, &draft->arena),
            .label = column->label,
            .unit = column->unit,
            .columns = columns,
            .codes = codes,
            .visits = visits,
            .count = 1,
            .lower_is_better = !(known && known->higher_is_better),
            .scale = column->skewness > 0.3 && column->spread > 4 ? SCALE_LOG10 : SCALE_LINEAR};
        draft_outcome(draft, &series, true);
    }
}

static void draft_outcomes(struct draft *draft) {
    json_key_array(draft->json, "outcomes");
    for (size_t i = 0; i < draft->guess->series_count; i++) {
        draft_outcome(draft, &draft->guess->series[i], i == 0);
    }
    if (draft->guess->series_count == 0) {
        draft_lone(draft);
    }
    json_close(draft->json);
}

static bool is_reference(const char *text, struct arena *arena) {
    struct name_parts parts;
    name_take(&parts, text, arena);
    return name_has(&parts,
        "control controls cont ctrl ctl placebo plac pbo usual standard sham tau waitlist waiting comparator "
        "advice reference ref none no c p");
}

static void draft_arm(struct draft *draft) {
    const struct guess *guess = draft->guess;
    if (guess->arm == NOWHERE) {
        return;
    }
    const struct guess_column *column = &guess->columns[guess->arm];
    const char *reference = NULL, *first = NULL;
    for (size_t i = 0; i < column->value_count; i++) {
        const struct guess_value *value = &column->values[i];
        if (value->listed) {
            first = !first || strcmp(value->text, first) < 0 ? value->text : first;
            reference = !reference && is_reference(value->text, &draft->arena) ? value->text : reference;
        }
    }
    reference = reference ? reference : first;
    json_key_object(draft->json, "arm");
    json_field_string(draft->json, "column", column_place(draft, (size_t)guess->arm));
    json_key_array(draft->json, "levels");
    for (size_t i = 0; i < column->value_count; i++) {
        if (column->values[i].listed) {
            json_object(draft->json);
            json_field_string(draft->json, "code", column->values[i].text);
            json_field_string(draft->json, "label", column->values[i].label);
            if (column->values[i].text == reference) {
                json_field_bool(draft->json, "reference", true);
            }
            json_close(draft->json);
        }
    }
    json_close(draft->json);
    json_close(draft->json);
}

static void draft_levels(struct draft *draft, const struct guess_column *column) {
    json_key_array(draft->json, "levels");
    for (size_t i = 0; i < column->value_count; i++) {
        if (column->values[i].listed) {
            json_object(draft->json);
            json_field_string(draft->json, "code", column->values[i].text);
            json_field_string(draft->json, "label", column->values[i].label);
            json_close(draft->json);
        }
    }
    json_close(draft->json);
}

/* The subgroups people ask for first: sex, age and body mass index. */
static bool a_subgroup(const struct guess_column *column) {
    return strcmp(column->label, "Sex") == 0 || strcmp(column->label, "Age") == 0 ||
           strcmp(column->label, "Body mass index") == 0;
}

/* Cut points that make bands: overweight and obesity of WHO (Technical Report 894, 2000) for body mass index, else
 * round numbers near the middle. */
static void draft_bands(struct draft *draft, const struct guess_column *column) {
    if (!a_subgroup(column) || !(column->high > column->low)) {
        return;
    }
    double first = 25, second = 30;
    if (strcmp(column->label, "Age") == 0) {
        first = 5 * floor(column->median / 5 - 0.5);
        second = first + 10;
    }
    json_key_array(draft->json, "bands");
    if (first > column->low && first < column->high) {
        json_number(draft->json, first);
    }
    if (second > column->low && second < column->high) {
        json_number(draft->json, second);
    }
    json_close(draft->json);
}

static void draft_covariates(struct draft *draft, const char **subgroups, size_t *subgroup_count) {
    struct json *json = draft->json;
    json_key_array(json, "covariates");
    for (size_t i = 0; i < draft->guess->column_count; i++) {
        const struct guess_column *column = &draft->guess->columns[i];
        bool number = column->role == GUESS_NUMBER;
        if ((!number && column->role != GUESS_CATEGORY) || column->series != NOWHERE || (int)i == draft->lone) {
            continue;
        }
        const char *id = take_id(draft, name_id(column->name, &draft->arena));
        json_object(json);
        json_field_string(json, "id", id);
        json_field_string(json, "label", column->label);
        json_field_string(json, "column", column_place(draft, i));
        json_field_string(json, "kind", number ? "number" : "category");
        if (number && *column->unit) {
            json_field_string(json, "unit", column->unit);
        }
        if (number) {
            draft_bands(draft, column);
        } else {
            draft_levels(draft, column);
        }
        own_codes(draft, &i, 1);
        json_close(json);
        if (a_subgroup(column)) {
            subgroups[(*subgroup_count)++] = id;
        }
    }
    json_close(json);
}

static void draft_answers(struct draft *draft, const struct guess_column *column, bool yes) {
    json_key_array(draft->json, yes ? "yes" : "no");
    for (size_t i = 0; i < column->value_count; i++) {
        const struct guess_value *value = &column->values[i];
        if (value->listed &&
            (yes ? guess_says_yes(value->text, &draft->arena) : guess_says_no(value->text, &draft->arena))) {
            json_string(draft->json, value->text);
        }
    }
    json_close(draft->json);
}

static void draft_events(struct draft *draft) {
    json_key_array(draft->json, "events");
    for (size_t i = 0; i < draft->guess->column_count; i++) {
        const struct guess_column *column = &draft->guess->columns[i];
        if (column->role == GUESS_EVENT && !column->varies) { /* what differs by visit is for a person to say */
            json_object(draft->json);
            json_field_string(draft->json, "id", take_id(draft, name_id(column->name, &draft->arena)));
            json_field_string(draft->json, "label", column->label);
            json_field_string(draft->json, "column", column_place(draft, i));
            draft_answers(draft, column, true);
            draft_answers(draft, column, false);
            json_close(draft->json);
        }
    }
    json_close(draft->json);
}

static const char *title_of(const char *name, struct arena *arena) {
    const char *end = strrchr(name, '.');
    return name_words(end && end != name ? arena_bytes(arena, name, (size_t)(end - name)) : name, arena);
}

static void draft_file(struct draft *draft, const struct guess_file *file) {
    const struct guess *guess = draft->guess;
    json_object(draft->json);
    json_field_string(draft->json, "id", file->id);
    json_field_string(draft->json, "name", file->name);
    if (file->sheet) {
        json_field_string(draft->json, "sheet", file->sheet);
    }
    json_field_string(draft->json, "layout", file->by_visit ? "visit" : "participant");
    json_field_string(
        draft->json, "participant", file->participant == NOWHERE ? NULL : guess->columns[file->participant].name);
    if (file->by_visit) {
        json_field_string(draft->json, "visit", file->visit == NOWHERE ? NULL : guess->columns[file->visit].name);
        json_key_array(draft->json, "codes");
        for (size_t i = 0; i < file->code_count; i++) {
            json_string(draft->json, file->codes[i].code);
        }
        json_close(draft->json);
    }
    json_close(draft->json);
}

static void draft_files(struct draft *draft) {
    const struct guess *guess = draft->guess;
    if (!guess->with_files) {
        return;
    }
    json_key_array(draft->json, "files");
    draft_file(draft, &guess->files[guess->first]);
    for (size_t f = 0; f < guess->file_count; f++) {
        if (f != guess->first) {
            draft_file(draft, &guess->files[f]);
        }
    }
    json_close(draft->json);
}

void guess_plan_json(const struct guess *guess, struct json *json) {
    struct draft draft = {.guess = guess, .json = json, .lone = NOWHERE};
    arena_init(&draft.arena);
    codes_take(&draft.codes, guess);
    draft.ids = ARENA_NEW(&draft.arena, guess->column_count + guess->series_count + 1, const char *);
    const char **subgroups = ARENA_NEW(&draft.arena, guess->column_count, const char *);
    size_t subgroup_count = 0;
    json_object(json);
    json_field_string(json, "title", title_of(guess->name, &draft.arena));
    json_field_string(
        json, "participant", guess->participant == NOWHERE ? NULL : guess->columns[guess->participant].name);
    draft_files(&draft);
    draft_arm(&draft);
    json_key_array(json, "missing_codes");
    for (size_t i = 0; i < draft.codes.count; i++) {
        if (draft.codes.list[i].everywhere) {
            json_string(json, draft.codes.list[i].text);
        }
    }
    json_close(json);
    draft_outcomes(&draft);
    draft_covariates(&draft, subgroups, &subgroup_count);
    draft_events(&draft);
    json_key_array(json, "adjust_for");
    json_close(json);
    json_field_string(json, "missing_baseline", "mean");
    json_key_array(json, "subgroups");
    for (size_t i = 0; i < subgroup_count; i++) {
        json_string(json, subgroups[i]);
    }
    json_close(json);
    json_field_number(json, "confidence", 0.95);
    json_field_string(json, "blinding", "pooled");
    json_close(json);
    codes_release(&draft.codes);
    arena_release(&draft.arena);
}
