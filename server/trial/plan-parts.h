/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What the files that read a plan share: JSON taken apart with sentences. Where we are is a path such as
 * outcomes[0].visits[1]. Functions that read leave their value alone where the key is not there, and return false with
 * the fault filled where it is wrong. */
#ifndef EVENHAND_TRIAL_PLAN_PARTS_H
#define EVENHAND_TRIAL_PLAN_PARTS_H
#include "trial/plan.h"
#include <cjson/cJSON.h>

struct reader {
    struct plan *plan;
    const char *name; /* the file's, for the sentence */
    struct fault *fault;
};

bool wrong(struct reader *reader, const char *path, const char *what); /* always false */
const char *join(struct reader *reader, const char *path, const char *key);
const char *at_index(struct reader *reader, const char *path, size_t index);
/* Refuses keys that are not in the space-separated list, and keys given twice. */
bool keys_known(struct reader *reader, const cJSON *object, const char *path, const char *known);
const cJSON *member(const cJSON *object, const char *key);
bool read_text(
    struct reader *reader, const cJSON *object, const char *path, const char *key, bool required, const char **value);
bool read_number(struct reader *reader, const cJSON *object, const char *path, const char *key, double *value);
bool read_range(struct reader *reader, const cJSON *object, const char *path, const char *key, struct range *range);
bool read_texts(struct reader *reader, const cJSON *object, const char *path, const char *key, struct texts *texts);
bool read_code_list(struct reader *reader, const cJSON *object, const char *path, struct texts *codes);
bool read_codes(struct reader *reader, const cJSON *object, const char *path, const struct texts **codes);
bool read_flag(struct reader *reader, const cJSON *object, const char *path, const char *key, bool *flag);
bool read_choice(struct reader *reader, const cJSON *object, const char *path, const char *key, const char *first,
    const char *other, bool *second);
bool read_list(struct reader *reader, const cJSON *root, const char *key, void **memory, size_t size,
    bool (*read)(struct reader *, const cJSON *, const char *));

/* In plan.c. */
int file_of(const struct plan *plan, const char *id, size_t length); /* or NOWHERE */
/* "column", with "file" and "visit" beside it where there are several files. */
bool read_place(struct reader *reader, const cJSON *item, const char *path, const char **name, struct place *place);
/* A key whose text names a column; left alone where the key is not there. */
bool read_column(struct reader *reader, const cJSON *item, const char *path, const char *key, const char **name,
    struct place *place);

/* In plan-screening.c: the key "screening". */
bool read_screening(struct reader *reader, const cJSON *root);

/* A column in one text: derived.ID, FILE.COLUMN, FILE.COLUMN@CODE, or a column of the first file. */
bool settle_text(struct reader *reader, const char *path, const char *text, const char **name, struct place *place);
bool of_a_file(struct reader *reader, const char *path, const struct place *place); /* not a derived value */
/* Adds the column to the variables, or finds it there; a column has one kind. */
bool place_variable(struct reader *reader, const struct variable *wanted, int *index);

/* In plan-derived.c: an item of the key "derived"; its variables, after all others; what may not rest on a follow-up.
 */
bool read_derived(struct reader *reader, const cJSON *item, const char *path);
bool settle_derived(struct reader *reader);
bool nothing_comes_late(struct reader *reader);

/* In plan-dates.c: the key "dates". */
bool read_dates(struct reader *reader, const cJSON *root);
#endif
