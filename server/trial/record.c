/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "trial/record.h"
#include "base/text.h"
#include "draw/json.h"
#include "trial/dates.h"
#include "trial/plan.h"
#include <cjson/cJSON.h>
#include <math.h>
#include <string.h>
#include <unistr.h>

const struct decision_rule decision_rules[DECISION_KIND_COUNT] = {
    [DECISION_READ_AS] = {"read-as", "Read one code of a column as another", "column from to", "", true, true, true},
    [DECISION_MISSING_CODE] = {"missing-code", "A value of a column is a code for missing", "column value",
        "meaning planned", true, true, true},
    [DECISION_NUMBER_FORMAT] = {"number-format", "Numbers of a column are written with this decimal sign", "column decimal",
        "", true, true, true},
    [DECISION_DATE_ORDER] = {"date-order", "Dates of a column, of one site or all, are written in this order", "column order",
        "site", true, true, true},
    [DECISION_CONVERT] = {"convert", "Numbers of a column at one site are in another unit", "column site factor unit_from unit_to source",
        "offset", true, true, true},
    [DECISION_CORRECT] = {"correct", "One value becomes another", "column participant from to", "", true, true, true},
    [DECISION_SET_MISSING] = {"set-missing", "One value is set missing", "column participant from", "", true, true, true},
    [DECISION_CONFIRM] = {"confirm", "A doubtful value is right as recorded", "column value", "participant", true, true,
        true},
    [DECISION_KEEP_RECORD] = {"keep-record", "Of a repeated participant's records this one stands", "participant row", "file",
        true, true, true},
    [DECISION_QUERY] = {"query", "A question to the site", "question", "column participant", false, true, true},
    [DECISION_RESPONSE] = {"response", "The site's answer to a query", "number text", "", false, true, false},
    [DECISION_EXCLUDE] = {"exclude", "A participant is left out of an analysis set", "participant set", "criteria", true,
        true, true},
    [DECISION_FLAG] = {"flag", "A participant is shown with and without in every effect", "outcome participant", "", false,
        true, true},
    [DECISION_SCALE] = {"scale", "An outcome is analysed on this scale", "outcome scale", "", true, true, true},
    [DECISION_PLAUSIBLE_SHIFTS] = {"plausible-shifts", "Shifts of the missing values the team finds believable",
        "outcome active reference", "", false, true, true},
    [DECISION_AMEND_PLAN] = {"amend-plan", "The plan is changed at a path from here on; a deviation, shown as one", "path from to", "",
        true, true, true},
    [DECISION_ATTENDING] = {"attending", "Who is at the meeting", "people", "", false, true, false},
    [DECISION_NOTE] = {"note", "What the team concluded at an exhibit", "exhibit text", "", false, true, false},
    [DECISION_READING] = {"reading", "What will be concluded under either reading of the letters", "if_a if_b", "", false,
        true, true},
    [DECISION_UNBLIND] = {"unblind", "The blinding is lifted", "to", "", false, false, true},
    [DECISION_LOCK] = {"lock", "Data stand still from here on", "", "", false, false, true},
    [DECISION_UNLOCK] = {"unlock", "Data may change again; everything after it is marked", "", "", false, true, true},
    [DECISION_SIGN] = {"sign", "A person signs", "meaning", "", false, false, true},
    [DECISION_REVERSE] = {"reverse", "An earlier decision is taken back", "number", "", true, true, true},
};

/* ---- fields: which there are, of what type, and where a decision keeps them ---- */

enum field_type { FIELD_TEXT, FIELD_TEXT_OR_NULL, FIELD_COUNT, FIELD_WORDS, FIELD_INTERVAL, FIELD_FLAG, FIELD_NUMBER };

static const struct field {
    const char *name;
    enum field_type type;
    bool column; /* has a column of its own in the study file; the others live in the body */
    size_t place; /* offset of a const char * in struct decision, 0 where only the body keeps it */
} fields[] = {
    {"column", FIELD_TEXT, true, offsetof(struct decision, column)},
    {"participant", FIELD_TEXT, true, offsetof(struct decision, participant)},
    {"from", FIELD_TEXT_OR_NULL, true, offsetof(struct decision, from)},
    {"to", FIELD_TEXT_OR_NULL, true, offsetof(struct decision, to)},
    {"reason", FIELD_TEXT, true, offsetof(struct decision, reason)},
    {"evidence", FIELD_TEXT, true, offsetof(struct decision, evidence)},
    {"discrepancy", FIELD_TEXT, true, offsetof(struct decision, discrepancy)},
    {"path", FIELD_TEXT, false, offsetof(struct decision, path)},
    {"value", FIELD_TEXT, false, offsetof(struct decision, value)},
    {"meaning", FIELD_TEXT, false, offsetof(struct decision, meaning)},
    {"decimal", FIELD_TEXT, false, offsetof(struct decision, decimal)},
    {"order", FIELD_TEXT, false, offsetof(struct decision, order)},
    {"outcome", FIELD_TEXT, false, offsetof(struct decision, outcome)},
    {"scale", FIELD_TEXT, false, offsetof(struct decision, scale)},
    {"set", FIELD_TEXT, false, offsetof(struct decision, set)},
    {"text", FIELD_TEXT, false, offsetof(struct decision, text)},
    {"question", FIELD_TEXT, false, offsetof(struct decision, text)},
    {"exhibit", FIELD_TEXT, false, offsetof(struct decision, exhibit)},
    {"site", FIELD_TEXT, false, offsetof(struct decision, site)},
    {"unit_from", FIELD_TEXT, false, offsetof(struct decision, unit_from)},
    {"unit_to", FIELD_TEXT, false, offsetof(struct decision, unit_to)},
    {"source", FIELD_TEXT, false, offsetof(struct decision, source)},
    {"factor", FIELD_NUMBER, false, 0},
    {"offset", FIELD_NUMBER, false, 0},
    {"people", FIELD_WORDS, false, 0},
    {"criteria", FIELD_WORDS, false, 0},
    {"active", FIELD_INTERVAL, false, 0},
    {"reference", FIELD_INTERVAL, false, 0},
    {"if_a", FIELD_TEXT, false, 0},
    {"if_b", FIELD_TEXT, false, 0},
    {"file", FIELD_TEXT, false, offsetof(struct decision, file)},
    {"row", FIELD_COUNT, false, 0},
    {"number", FIELD_COUNT, false, 0},
    {"planned", FIELD_FLAG, false, 0},
};
enum { FIELDS = sizeof fields / sizeof *fields };

static const struct field *field_of(const char *name) {
    for (size_t i = 0; i < FIELDS; i++) {
        if (strcmp(fields[i].name, name) == 0) {
            return &fields[i];
        }
    }
    return NULL;
}

static bool listed(const char *words, const char *name) {
    size_t length = strlen(name);
    for (const char *word = words; *word; word += strcspn(word, " "), word += *word == ' ') {
        if (strcspn(word, " ") == length && memcmp(word, name, length) == 0) {
            return true;
        }
    }
    return false;
}

int decision_kind_of(const char *name) {
    for (int i = 0; i < DECISION_KIND_COUNT; i++) {
        if (strcmp(decision_rules[i].name, name) == 0) {
            return i;
        }
    }
    return NOWHERE;
}

static void put_text(struct decision *decision, size_t place, const char *text) {
    memcpy((char *)decision + place, &text, sizeof text);
}

static const char *type_words(enum field_type type) {
    static const char *const words[] = {"a text in quotes", "a text in quotes or null", "a whole number from 1",
        "a list of texts, such as [\"A. Reader, statistician\"]", "two numbers, the lower first, such as [-5, 0]", "true or false",
        "a number"};
    return words[type];
}

static bool all_words(const cJSON *list) {
    const cJSON *item = cJSON_IsArray(list) ? list->child : NULL;
    bool fits = item != NULL;
    for (; item && fits; item = item->next) {
        fits = cJSON_IsString(item) && *item->valuestring;
    }
    return fits;
}

static bool is_interval(const cJSON *list) {
    const cJSON *low = cJSON_GetArrayItem(list, 0), *high = cJSON_GetArrayItem(list, 1);
    return cJSON_IsArray(list) && cJSON_GetArraySize(list) == 2 && cJSON_IsNumber(low) && cJSON_IsNumber(high) &&
           isfinite(low->valuedouble) && isfinite(high->valuedouble) && low->valuedouble <= high->valuedouble;
}

static bool type_fits(const cJSON *item, enum field_type type) {
    switch (type) {
    case FIELD_TEXT:
        return cJSON_IsString(item);
    case FIELD_TEXT_OR_NULL:
        return cJSON_IsString(item) || cJSON_IsNull(item);
    case FIELD_COUNT:
        return cJSON_IsNumber(item) && item->valuedouble >= 1 && item->valuedouble <= 4294967294.0 &&
               floor(item->valuedouble) >= item->valuedouble;
    case FIELD_WORDS:
        return all_words(item);
    case FIELD_INTERVAL:
        return is_interval(item);
    case FIELD_FLAG:
        return cJSON_IsBool(item);
    case FIELD_NUMBER:
        return cJSON_IsNumber(item) && isfinite(item->valuedouble);
    }
    return false;
}

/* ---- the body: canonical JSON of what has no column of its own, in the order of the table ---- */

static void write_item(struct json *json, const cJSON *item) {
    if (cJSON_IsString(item)) {
        json_string(json, item->valuestring);
    } else if (cJSON_IsNumber(item)) {
        json_number(json, item->valuedouble);
    } else if (cJSON_IsBool(item)) {
        json_bool(json, cJSON_IsTrue(item));
    } else if (cJSON_IsArray(item)) {
        json_array(json);
        for (const cJSON *child = item->child; child; child = child->next) {
            write_item(json, child);
        }
        json_close(json);
    } else if (cJSON_IsObject(item)) {
        json_object(json);
        for (const cJSON *child = item->child; child; child = child->next) {
            json_key(json, child->string);
            write_item(json, child);
        }
        json_close(json);
    } else {
        json_null(json);
    }
}

static const char *body_of(struct arena *arena, const cJSON *entry) {
    struct text text;
    text_init(&text);
    struct json json;
    json_init(&json, &text);
    json_object(&json);
    for (size_t i = 0; i < FIELDS; i++) {
        const cJSON *item = cJSON_GetObjectItemCaseSensitive(entry, fields[i].name);
        if (item && !fields[i].column) {
            json_key(&json, fields[i].name);
            write_item(&json, item);
        }
    }
    json_close(&json);
    json_finish(&json);
    const char *body = arena_text(arena, text.data);
    text_release(&text);
    return body;
}

static const char *list_text(struct arena *arena, const cJSON *list) {
    struct text text;
    text_init(&text);
    struct json json;
    json_init(&json, &text);
    write_item(&json, list);
    const char *copy = arena_text(arena, text.data);
    text_release(&text);
    return copy;
}

/* Takes the fields an object has out into the decision. */
static void take_fields(struct arena *arena, const cJSON *object, struct decision *decision) {
    for (const cJSON *item = object->child; item; item = item->next) {
        const struct field *field = field_of(item->string);
        if (field && field->place && cJSON_IsString(item)) {
            put_text(decision, field->place, arena_text(arena, item->valuestring));
        }
    }
    const cJSON *people = cJSON_GetObjectItemCaseSensitive(object, "people");
    decision->people = people ? list_text(arena, people) : NULL;
    const cJSON *row = cJSON_GetObjectItemCaseSensitive(object, "row");
    const cJSON *number = cJSON_GetObjectItemCaseSensitive(object, "number");
    decision->row = row && type_fits(row, FIELD_COUNT) ? (uint32_t)row->valuedouble : 0;
    decision->reverses = number && type_fits(number, FIELD_COUNT) ? (uint32_t)number->valuedouble : 0;
    const cJSON *factor = cJSON_GetObjectItemCaseSensitive(object, "factor");
    const cJSON *offset = cJSON_GetObjectItemCaseSensitive(object, "offset");
    decision->factor = factor && type_fits(factor, FIELD_NUMBER) ? factor->valuedouble : 0;
    decision->offset = offset && type_fits(offset, FIELD_NUMBER) ? offset->valuedouble : 0;
    decision->planned = cJSON_IsTrue(cJSON_GetObjectItemCaseSensitive(object, "planned"));
}

static bool is_empty(const char *text) {
    return text[strspn(text, " \t\r\n\f\v")] == '\0';
}

/* amend-plan takes any JSON for from and to; what nests deeper than any plan is no plan's. */
static bool is_shallow(const cJSON *item, int depth) {
    enum { DEPTH = 12 };
    bool shallow = depth < DEPTH;
    for (const cJSON *child = item->child; child && shallow; child = child->next) {
        shallow = is_shallow(child, depth + 1);
    }
    return shallow;
}

static void take_amendment(struct arena *arena, const cJSON *entry, struct decision *decision) {
    const cJSON *from = cJSON_GetObjectItemCaseSensitive(entry, "from"), *to = cJSON_GetObjectItemCaseSensitive(entry, "to");
    decision->from = cJSON_IsNull(from) ? NULL : list_text(arena, from);
    decision->to = cJSON_IsNull(to) ? NULL : list_text(arena, to);
}

/* What only one kind asks of its values: words for what is wrong, or NULL. */
static const char *value_wrong(const struct decision *decision) {
    enum scale scale;
    enum blinding blinding;
    enum date_order order;
    switch (decision->kind) {
    case DECISION_DATE_ORDER:
        return date_order_read(decision->order, &order) ? NULL :
            "has an \"order\" that is none of D/M/Y, M/D/Y, Y/M/D, D-MON-Y, the same with YY, serial-1900 and serial-1904";
    case DECISION_NUMBER_FORMAT:
        return strcmp(decision->decimal, ".") == 0 || strcmp(decision->decimal, ",") == 0 ? NULL :
            "has a \"decimal\" that is neither \".\" nor \",\"";
    case DECISION_CONVERT:
        return !(decision->factor > 0) ? "has a \"factor\" that is not above 0" :
            is_empty(decision->source) ? "has a blank \"source\"; say where the factor is published" : NULL;
    case DECISION_MISSING_CODE:
        return is_empty(decision->value) ? "has a blank \"value\"; a blank cell is missing without a code" : NULL;
    case DECISION_AMEND_PLAN:
        return is_empty(decision->path)           ? "has an empty \"path\"" :
            !decision->from && !decision->to      ? "says null for both \"from\" and \"to\"" :
            decision->from && decision->to && strcmp(decision->from, decision->to) == 0 ? "changes nothing: \"from\" and \"to\" are the same" :
                                                                                           NULL;
    case DECISION_SCALE:
        return scale_read(decision->scale, &scale) ? NULL : "has a \"scale\" that is neither linear nor log10";
    case DECISION_EXCLUDE:
        return strcmp(decision->set, "full") == 0 || strcmp(decision->set, "per-protocol") == 0 ? NULL :
            "has a \"set\" that is neither full nor per-protocol";
    case DECISION_UNBLIND:
        return decision->to && blinding_read(decision->to, &blinding) && blinding != BLINDING_POOLED ? NULL :
            "has a \"to\" that is neither coded nor unblinded";
    case DECISION_READ_AS:
        return !decision->from || !decision->to ? "needs texts for \"from\" and \"to\"; use set-missing for null" :
            strcmp(decision->from, decision->to) == 0 ? "reads a code as itself" : NULL;
    case DECISION_CORRECT:
        return !decision->to ? "needs a text for \"to\"; use set-missing for a value that is to be missing" :
            decision->from && strcmp(decision->from, decision->to) == 0 ? "corrects a value to itself; use confirm for one that is right" :
            NULL;
    case DECISION_NOTE:
    case DECISION_QUERY:
    case DECISION_RESPONSE:
        return is_empty(decision->text) ? "says nothing" : NULL;
    default:
        return NULL;
    }
}

/* Whether the text fields that the kind cannot do without are there. */
static bool texts_there(const struct decision *decision) {
    const struct decision_rule *rule = &decision_rules[decision->kind];
    for (size_t i = 0; i < FIELDS; i++) {
        const char *text = NULL;
        memcpy(&text, (const char *)decision + fields[i].place, sizeof text);
        if (fields[i].type == FIELD_TEXT && fields[i].place && !text && listed(rule->required, fields[i].name)) {
            return false;
        }
    }
    return true;
}

/* A study file can have been written to by others: what the replay relies on is looked at again. */
bool decision_unpack(struct arena *arena, struct decision *decision, struct fault *fault) {
    cJSON *root = cJSON_ParseWithOpts(decision->body ? decision->body : "{}", NULL, 1);
    bool numbered = decision->kind == DECISION_REVERSE || decision->kind == DECISION_RESPONSE;
    bool done = cJSON_IsObject(root);
    if (done) {
        take_fields(arena, root, decision);
        done = texts_there(decision) && !value_wrong(decision) &&
               (!numbered || (decision->reverses > 0 && decision->reverses < decision->number)) &&
               (decision->kind != DECISION_KEEP_RECORD || decision->row > 0);
    }
    cJSON_Delete(root);
    return done || fault_set(fault, FAULT_INPUT, "the study file's decision %u cannot be read; ask for an earlier copy of the file",
                       decision->number);
}

/* ---- reading a batch ---- */

struct batch {
    struct arena *arena;
    const char *name;
    struct fault *fault;
    size_t entry; /* 1-based */
};

static bool refuse(struct batch *batch, const char *what) {
    return fault_at(batch->fault, FAULT_INPUT, batch->entry, 0, "%s: decision %zu of the batch %s; nothing was recorded",
        batch->name, batch->entry, what);
}

static bool read_field(struct batch *batch, const cJSON *item, const struct decision_rule *rule) {
    const struct field *field = field_of(item->string);
    bool allowed = strcmp(item->string, "kind") == 0 ||
                   (field && (listed("reason evidence discrepancy row", field->name) || listed(rule->required, field->name) ||
                                 (listed(rule->optional, field->name) && strcmp(field->name, "planned") != 0)));
    if (!allowed) {
        return refuse(batch, arena_format(batch->arena, "(%s) has the field \"%.60s\", which this kind does not take", rule->name,
            item->string));
    }
    bool any = rule == &decision_rules[DECISION_AMEND_PLAN] && field && field->type == FIELD_TEXT_OR_NULL;
    if (any && !is_shallow(item, 0)) {
        return refuse(batch, arena_format(batch->arena, "(%s) has a \"%s\" that nests deeper than a plan does", rule->name, field->name));
    }
    if (field && !any && !type_fits(item, field->type)) {
        return refuse(batch, arena_format(batch->arena, "(%s) has a \"%s\" that is not %s", rule->name, field->name,
            type_words(field->type)));
    }
    return true;
}

static bool required_there(struct batch *batch, const cJSON *entry, const struct decision_rule *rule) {
    for (size_t i = 0; i < FIELDS; i++) {
        if (listed(rule->required, fields[i].name) && !cJSON_GetObjectItemCaseSensitive(entry, fields[i].name)) {
            return refuse(batch, arena_format(batch->arena, "(%s) lacks \"%s\"; it needs: %s", rule->name, fields[i].name,
                rule->required));
        }
    }
    const cJSON *reason = cJSON_GetObjectItemCaseSensitive(entry, "reason");
    bool blank = !cJSON_IsString(reason) || is_empty(reason->valuestring);
    return !(rule->reason_needed && blank) ||
           refuse(batch, arena_format(batch->arena, "(%s) has no reason; every decision of this kind needs one", rule->name));
}

static bool read_entry(struct batch *batch, const cJSON *entry, struct decision *decision) {
    const cJSON *kind = cJSON_GetObjectItemCaseSensitive(entry, "kind");
    if (!cJSON_IsObject(entry) || !cJSON_IsString(kind)) {
        return refuse(batch, "is not an object with a \"kind\"");
    }
    int found = decision_kind_of(kind->valuestring);
    if (found == NOWHERE) {
        return refuse(batch, arena_format(batch->arena, "has the kind \"%.60s\", which this version does not know", kind->valuestring));
    }
    const struct decision_rule *rule = &decision_rules[found];
    for (const cJSON *item = entry->child; item; item = item->next) {
        if (cJSON_GetObjectItemCaseSensitive(entry, item->string) != item) {
            return refuse(batch, arena_format(batch->arena, "(%s) gives \"%.60s\" twice", rule->name, item->string));
        }
        if (!read_field(batch, item, rule)) {
            return false;
        }
    }
    if (!required_there(batch, entry, rule)) {
        return false;
    }
    decision->kind = (enum decision_kind)found;
    take_fields(batch->arena, entry, decision);
    if (decision->kind == DECISION_AMEND_PLAN) {
        take_amendment(batch->arena, entry, decision);
    }
    decision->body = body_of(batch->arena, entry);
    const char *wrong = value_wrong(decision);
    return !wrong || refuse(batch, arena_format(batch->arena, "(%s) %s", rule->name, wrong));
}

static bool read_batch(struct batch *batch, const cJSON *root, struct decision **decisions, size_t *count, uint32_t *version) {
    const cJSON *list = root;
    *version = UINT32_MAX;
    if (cJSON_IsObject(root)) {
        list = cJSON_GetObjectItemCaseSensitive(root, "decisions");
        for (const cJSON *item = root->child; item; item = item->next) {
            if (!listed("version by decisions", item->string)) {
                return fault_set(batch->fault, FAULT_INPUT, "%s: the key \"%.60s\" is not one a batch has; known are: version decisions",
                    batch->name, item->string);
            }
        }
        const cJSON *seen = cJSON_GetObjectItemCaseSensitive(root, "version");
        if (seen && (!cJSON_IsNumber(seen) || seen->valuedouble < 0 || seen->valuedouble > 4294967294.0 ||
                        floor(seen->valuedouble) < seen->valuedouble)) {
            return fault_set(batch->fault, FAULT_INPUT, "%s: \"version\" must be the number of the last decision seen", batch->name);
        }
        *version = seen ? (uint32_t)seen->valuedouble : UINT32_MAX;
    }
    if (!cJSON_IsArray(list) || !list->child) {
        return fault_set(batch->fault, FAULT_INPUT, "%s: decisions are a list in square brackets with at least one in it", batch->name);
    }
    *decisions = ARENA_NEW(batch->arena, cJSON_GetArraySize(list), struct decision);
    for (const cJSON *entry = list->child; entry; entry = entry->next) {
        batch->entry++;
        if (!read_entry(batch, entry, &(*decisions)[(*count)++])) {
            return false;
        }
    }
    return true;
}

bool decisions_read(struct arena *arena, const char *json, size_t length, const char *name, struct decision **decisions,
    size_t *count, uint32_t *version, struct fault *fault) {
    struct batch batch = {arena, name, fault, 0};
    *count = 0;
    if (length >= 3 && memcmp(json, "\xEF\xBB\xBF", 3) == 0) {
        json += 3;
        length -= 3;
    }
    const char *copy = arena_bytes(arena, json, length), *end = copy;
    cJSON *root = cJSON_ParseWithOpts(copy, &end, 1);
    const char *foreign = (const char *)u8_check((const uint8_t *)copy, length);
    bool done = !foreign && root && strlen(copy) == length;
    if (!done) {
        size_t line = 1;
        end = foreign ? foreign : end;
        for (const char *p = copy; end && p < end; p++) {
            line += *p == '\n';
        }
        fault_set(fault, FAULT_INPUT, foreign ? "%s, line %zu: a character that is not UTF-8; save the text as UTF-8 and try again" :
            "%s, line %zu: this is not JSON from here on; mend the text and try again", name, line);
    }
    done = done && read_batch(&batch, root, decisions, count, version);
    cJSON_Delete(root);
    return done;
}

void record_standing(const struct decision *decisions, size_t count, bool *stands) {
    for (size_t i = 0; i < count; i++) {
        stands[i] = true;
    }
    /* Newest first: whether a reversal stands is settled before what it takes back is looked at. */
    for (size_t i = count; i-- > 0;) {
        if (stands[i] && decisions[i].kind == DECISION_REVERSE && decisions[i].reverses - 1 < i) {
            stands[decisions[i].reverses - 1] = false;
        }
    }
}
