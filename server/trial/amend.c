/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "trial/amend.h"
#include "base/text.h"
#include "trial/plan.h"
#include <cjson/cJSON.h>
#include <stdlib.h>
#include <string.h>

bool amend_any(const struct decision *decisions, const bool *stands, size_t count) {
    for (size_t i = 0; i < count; i++) {
        if (stands[i] && decisions[i].kind == DECISION_AMEND_PLAN) {
            return true;
        }
    }
    return false;
}

/* Whether the path is this key or lies below it. */
static bool below(const char *path, const char *key) {
    size_t length = strlen(key);
    return strncmp(path, key, length) == 0 && (path[length] == '\0' || path[length] == '.' || path[length] == '[');
}

static bool ends_with(const char *path, const char *end) {
    size_t length = strlen(path), tail = strlen(end);
    return length >= tail && strcmp(path + length - tail, end) == 0;
}

bool amend_about_arms(const char *path) {
    return below(path, "arm");
}

/* Words for why what is at a path may not be amended, NULL where it may. */
static const char *not_amendable(const char *path) {
    bool arm_words = below(path, "arm.levels") && (ends_with(path, "].label") || ends_with(path, "].ratio"));
    return below(path, "participant")        ? "is about the identifier, which the record stands on; load the data anew with another plan" :
        below(path, "files")                 ? "is about the files, which the kept bytes stand on; load the data anew with another plan" :
        below(path, "arm") && !arm_words     ? "is about the arms' column, codes or reference, on which the letters stand; load the data anew with another plan" :
        below(path, "blinding")              ? "is about the blinding, which is lifted by unblind" :
        strstr(path, "missing_codes") != NULL ? "is about codes for missing, which are decisions of their own: use missing-code, or reverse one" :
                                               NULL;
}

/* ---- the place a path means ---- */

struct spot {
    cJSON *parent, *item; /* item NULL: absent */
    const char *key;      /* of an object; NULL in a list */
    int index;            /* of a list */
};

/* One step: ".name", "name" at the start, or "[0]". NULL where the path is not one. */
static const char *step(const char *at, bool first, cJSON *inside, struct spot *spot, struct arena *arena) {
    spot->parent = inside;
    if (*at == '[' && cJSON_IsArray(inside)) {
        char *end;
        long index = at[1] >= '0' && at[1] <= '9' ? strtol(at + 1, &end, 10) : -1;
        if (index < 0 || index > cJSON_GetArraySize(inside) || *end != ']') {
            return NULL;
        }
        spot->key = NULL;
        spot->index = (int)index;
        spot->item = cJSON_GetArrayItem(inside, spot->index);
        return end + 1;
    }
    at += !first && *at == '.' ? 1 : 0;
    size_t length = strcspn(at, ".[");
    if (length == 0 || !cJSON_IsObject(inside)) {
        return NULL;
    }
    spot->key = arena_bytes(arena, at, length);
    spot->item = cJSON_GetObjectItemCaseSensitive(inside, spot->key);
    return at + length;
}

static bool locate(cJSON *root, const char *path, struct spot *spot, struct arena *arena) {
    cJSON *inside = root;
    for (const char *at = path; at;) {
        at = inside ? step(at, at == path, inside, spot, arena) : NULL;
        if (at && !*at) {
            return true;
        }
        inside = spot->item;
    }
    return false;
}

/* ---- applying ---- */

struct amending {
    cJSON *root;
    struct decision *decisions;
    size_t count, new_from;
    bool blinded;
    struct arena *arena;
    struct fault *fault;
};

static const char *canonical(struct arena *arena, const cJSON *item) {
    char *printed = item ? cJSON_PrintUnformatted(item) : NULL;
    const char *text = arena_text(arena, printed);
    cJSON_free(printed);
    return text;
}

static bool same(const cJSON *a, const cJSON *b) {
    return a && b ? cJSON_Compare(a, b, 1) != 0 : !a && !b;
}

static bool refuse(struct amending *amending, size_t i, enum fault_code code, const char *what) {
    size_t entry = i + 1 - amending->new_from;
    return fault_at(amending->fault, code, entry, 0, "decision %zu of the batch (amend-plan) %s; nothing was recorded", entry, what);
}

static cJSON *parsed(const char *text) {
    return text ? cJSON_ParseWithOpts(text, NULL, 1) : NULL;
}

/* JSON given as the text of it, in quotes: what stands in the string. NULL where it is no such string. */
static cJSON *within(const cJSON *item) {
    return cJSON_IsString(item) ? parsed(item->valuestring) : NULL;
}

/* A new amendment's from and to: as JSON, or both as the text of JSON. False where from is not what stands there. */
static bool resolve(const struct spot *spot, cJSON **from, cJSON **to) {
    bool structured = cJSON_IsString(*to) && strchr("[{\"", (*to)->valuestring[0] ? (*to)->valuestring[0] : 'x');
    bool direct = same(spot->item, *from);
    cJSON *inner_from = within(*from), *inner_to = NULL;
    bool as_text = !direct && inner_from && same(spot->item, inner_from);
    if (as_text || (direct && !*from && structured)) {
        inner_to = within(*to);
    }
    if (as_text) {
        cJSON_Delete(*from);
        *from = inner_from;
        inner_from = NULL;
    }
    if (inner_to) {
        cJSON_Delete(*to);
        *to = cJSON_IsNull(inner_to) ? NULL : inner_to;
        if (!*to) {
            cJSON_Delete(inner_to);
        }
    }
    cJSON_Delete(inner_from);
    return direct || as_text;
}

static void put(const struct spot *spot, const cJSON *to) {
    cJSON *copy = to ? cJSON_Duplicate(to, 1) : NULL;
    if (!copy && spot->item) {
        cJSON_Delete(cJSON_DetachItemViaPointer(spot->parent, spot->item));
    } else if (copy && spot->item) {
        if (spot->key) {
            cJSON_ReplaceItemInObjectCaseSensitive(spot->parent, spot->key, copy);
        } else {
            cJSON_ReplaceItemInArray(spot->parent, spot->index, copy);
        }
    } else if (copy) {
        if (spot->key) {
            cJSON_AddItemToObject(spot->parent, spot->key, copy);
        } else {
            cJSON_AddItemToArray(spot->parent, copy);
        }
    }
}

/* What is new is held to the rules; what stands already must still find what it changed. */
static bool from_fits(struct amending *amending, size_t i, const struct spot *spot, cJSON **from, cJSON **to) {
    struct decision *decision = &amending->decisions[i];
    if (i < amending->new_from) {
        return same(spot->item, *from) || fault_set(amending->fault, FAULT_INPUT,
            "decision %u amended \"%.80s\" from something that would no longer stand there; reverse that one first", decision->number,
            decision->path);
    }
    if (!resolve(spot, from, to)) {
        const char *now = canonical(amending->arena, spot->item);
        bool quiet = amending->blinded && (below(decision->path, "covariates") || below(decision->path, "events"));
        return refuse(amending, i, FAULT_INPUT, quiet ? arena_format(amending->arena, "says of %.80s another \"from\" than the plan now has there",
            decision->path) : arena_format(amending->arena, "says %.80s is %.120s, but the plan now has %.160s there", decision->path,
            decision->from ? decision->from : "absent", now ? now : "nothing"));
    }
    decision->from = canonical(amending->arena, *from);
    decision->to = canonical(amending->arena, *to);
    return same(*from, *to) ? refuse(amending, i, FAULT_INPUT, "changes nothing: \"from\" and \"to\" are the same") : true;
}

static bool apply(struct amending *amending, size_t i) {
    const struct decision *decision = &amending->decisions[i];
    bool new = i >= amending->new_from;
    if (new && amending->blinded && amend_about_arms(decision->path)) {
        return refuse(amending, i, FAULT_REFUSED, "is about the arms, which are not shown while the study is blinded; unblind it first");
    }
    if (new && not_amendable(decision->path)) {
        return refuse(amending, i, FAULT_INPUT, not_amendable(decision->path));
    }
    struct spot spot = {0};
    if (!locate(amending->root, decision->path, &spot, amending->arena)) {
        return new ? refuse(amending, i, FAULT_INPUT, arena_format(amending->arena,
            "has the path \"%.80s\", which leads nowhere in the plan; write it as outcomes[0].scale or adjust_for", decision->path)) :
            fault_set(amending->fault, FAULT_INPUT, "decision %u amended \"%.80s\", which would no longer be there; reverse that one first",
                decision->number, decision->path);
    }
    cJSON *from = parsed(decision->from), *to = parsed(decision->to);
    bool done = from_fits(amending, i, &spot, &from, &to);
    if (done) {
        put(&spot, to);
    }
    cJSON_Delete(from);
    cJSON_Delete(to);
    return done;
}

bool amend_plan(const char *loaded, struct decision *decisions, const bool *stands, size_t count, size_t new_from, bool blinded,
    struct arena *arena, const char **text, struct fault *fault) {
    *text = loaded;
    if (!amend_any(decisions, stands, count)) {
        return true;
    }
    bool mark = strncmp(loaded, "\xEF\xBB\xBF", 3) == 0;
    struct amending amending = {parsed(loaded + (mark ? 3 : 0)), decisions, count, new_from, blinded, arena, fault};
    bool done = amending.root != NULL || fault_set(fault, FAULT_INPUT, "the study's plan cannot be read; ask for an earlier copy of the file");
    for (size_t i = 0; i < count && done; i++) {
        done = !stands[i] || decisions[i].kind != DECISION_AMEND_PLAN || apply(&amending, i);
    }
    *text = done ? canonical(arena, amending.root) : loaded;
    cJSON_Delete(amending.root);
    return done;
}
