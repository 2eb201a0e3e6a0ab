/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "server/trial/plan-parts.h"
#include <math.h>
#include <string.h>

bool wrong(struct reader *reader, const char *path, const char *what) {
    return fault_set(reader->fault, FAULT_INPUT, "%s: %s%s%s", reader->name, path, *path ? " " : "", what);
}

const char *join(struct reader *reader, const char *path, const char *key) {
    return arena_format(&reader->plan->arena, "%s%s%s", path, *path ? "." : "", key);
}

const char *at_index(struct reader *reader, const char *path, size_t index) {
    return arena_format(&reader->plan->arena, "%s[%zu]", path, index);
}

/* Refuses keys that are not in the space-separated list, and keys given twice. */
bool keys_known(struct reader *reader, const cJSON *object, const char *path, const char *known) {
    if (!cJSON_IsObject(object)) {
        return wrong(reader, *path ? path : "the plan", "must be an object in braces");
    }
    for (const cJSON *child = object->child; child; child = child->next) {
        size_t length = strlen(child->string);
        bool found = false;
        for (const char *word = known; *word && !found; word += strcspn(word, " "), word += *word == ' ') {
            found = strcspn(word, " ") == length && memcmp(word, child->string, length) == 0;
        }
        if (!found) {
            return fault_set(reader->fault, FAULT_INPUT,
                "%s: the key \"%.60s\"%s%s is not one a plan has here; known are: %s", reader->name, child->string,
                *path ? " in " : "", path, known);
        }
        for (const cJSON *before = object->child; before != child; before = before->next) {
            if (strcmp(before->string, child->string) == 0) {
                return fault_set(reader->fault, FAULT_INPUT, "%s: the key \"%.60s\"%s%s stands there twice; keep one",
                    reader->name, child->string, *path ? " in " : "", path);
            }
        }
    }
    return true;
}

const cJSON *member(const cJSON *object, const char *key) {
    return cJSON_GetObjectItemCaseSensitive(object, key);
}

bool read_text(
    struct reader *reader, const cJSON *object, const char *path, const char *key, bool required, const char **value) {
    const cJSON *item = member(object, key);
    if (!item) {
        return required ? wrong(reader, join(reader, path, key), "is missing; a plan needs it") : true;
    }
    if (!cJSON_IsString(item) || (required && !*item->valuestring)) {
        return wrong(reader, join(reader, path, key), "must be a text in quotes that is not empty");
    }
    *value = arena_text(&reader->plan->arena, item->valuestring);
    return true;
}

bool read_number(struct reader *reader, const cJSON *object, const char *path, const char *key, double *value) {
    const cJSON *item = member(object, key);
    if (item && (!cJSON_IsNumber(item) || !isfinite(item->valuedouble))) {
        return wrong(reader, join(reader, path, key), "must be a number");
    }
    if (item) {
        *value = item->valuedouble;
    }
    return true;
}

bool read_range(struct reader *reader, const cJSON *object, const char *path, const char *key, struct range *range) {
    const cJSON *item = member(object, key);
    if (!item) {
        return true;
    }
    const cJSON *low = cJSON_GetArrayItem(item, 0), *high = cJSON_GetArrayItem(item, 1);
    if (!cJSON_IsArray(item) || cJSON_GetArraySize(item) != 2 || !cJSON_IsNumber(low) || !cJSON_IsNumber(high) ||
        !(low->valuedouble < high->valuedouble) || !isfinite(low->valuedouble) || !isfinite(high->valuedouble)) {
        return wrong(reader, join(reader, path, key), "must be two numbers, the lower first, such as [70, 260]");
    }
    *range = (struct range){true, low->valuedouble, high->valuedouble};
    return true;
}

bool read_texts(struct reader *reader, const cJSON *object, const char *path, const char *key, struct texts *texts) {
    const cJSON *list = member(object, key);
    if (!list) {
        return true;
    }
    if (!cJSON_IsArray(list)) {
        return wrong(reader, join(reader, path, key), "must be a list of texts, such as [\"999\"]");
    }
    texts->item = ARENA_NEW(&reader->plan->arena, cJSON_GetArraySize(list), const char *);
    for (const cJSON *item = list->child; item; item = item->next) {
        if (!cJSON_IsString(item)) {
            return wrong(reader, join(reader, path, key), "must hold texts in quotes only, such as [\"999\"]");
        }
        texts->item[texts->count++] = arena_text(&reader->plan->arena, item->valuestring);
    }
    return true;
}

bool read_code_list(struct reader *reader, const cJSON *object, const char *path, struct texts *codes) {
    if (!read_texts(reader, object, path, "missing_codes", codes)) {
        return false;
    }
    for (size_t i = 0; i < codes->count; i++) {
        if (codes->item[i][strspn(codes->item[i], " \t\r\n\f\v")] == '\0') {
            return wrong(reader, join(reader, path, "missing_codes"),
                "holds a blank; a blank cell is missing without a code, leave it out");
        }
        for (size_t j = 0; j < i; j++) {
            if (strcmp(codes->item[i], codes->item[j]) == 0) {
                return fault_set(reader->fault, FAULT_INPUT, "%s: %s holds \"%.60s\" twice; keep one", reader->name,
                    join(reader, path, "missing_codes"), codes->item[i]);
            }
        }
    }
    return true;
}

/* An own list of codes, or else the plan's. */
bool read_codes(struct reader *reader, const cJSON *object, const char *path, const struct texts **codes) {
    *codes = &reader->plan->missing_codes;
    if (!member(object, "missing_codes")) {
        return true;
    }
    struct texts *own = ARENA_NEW(&reader->plan->arena, 1, struct texts);
    *codes = own;
    return read_code_list(reader, object, path, own);
}

bool read_flag(struct reader *reader, const cJSON *object, const char *path, const char *key, bool *flag) {
    const cJSON *item = member(object, key);
    if (item && !cJSON_IsBool(item)) {
        return wrong(reader, join(reader, path, key), "must be true or false");
    }
    *flag = item && cJSON_IsTrue(item);
    return true;
}

/* One of two words. second is set where the second stands. */
bool read_choice(struct reader *reader, const cJSON *object, const char *path, const char *key, const char *first,
    const char *other, bool *second) {
    const char *word = NULL;
    if (!read_text(reader, object, path, key, false, &word)) {
        return false;
    }
    if (word && strcmp(word, first) != 0 && strcmp(word, other) != 0) {
        return wrong(reader, join(reader, path, key),
            arena_format(&reader->plan->arena, "must be \"%s\" or \"%s\"", first, other));
    }
    *second = word && strcmp(word, other) == 0;
    return true;
}

bool read_list(struct reader *reader, const cJSON *root, const char *key, void **memory, size_t size,
    bool (*read)(struct reader *, const cJSON *, const char *)) {
    const cJSON *list = member(root, key);
    if (!list) {
        return true;
    }
    if (!cJSON_IsArray(list)) {
        return wrong(reader, key, "must be a list in square brackets");
    }
    *memory = arena_new(&reader->plan->arena, (size_t)cJSON_GetArraySize(list), size);
    size_t index = 0;
    for (const cJSON *item = list->child; item; item = item->next) {
        if (!read(reader, item, at_index(reader, key, index++))) {
            return false;
        }
    }
    return true;
}
