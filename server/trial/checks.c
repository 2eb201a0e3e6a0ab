/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "trial/checks.h"
#include "base/map.h"
#include "base/text.h"
#include "draw/json.h"
#include "intake/number.h"
#include "server/trial/checks-parts.h"
#include "trial/arms.h"
#include "trial/convert.h"
#include "trial/derived.h"
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unicase.h>
#include <uninorm.h>
#include <unictype.h>
#include <unistr.h>

const char *severity_name(enum severity severity) {
    return severity == SEVERITY_MUST_SETTLE ? "must-settle" : "worth-a-look";
}

const char *discrepancy_state_name(enum discrepancy_state state) {
    static const char *const names[] = {"open", "settled", "queried"};
    return names[state];
}

enum check_kind {
    CHECK_SCREENING,
    CHECK_REPEATED,
    CHECK_NO_IDENTIFIER,
    CHECK_UNMATCHED,
    CHECK_DOUBLE_VISIT,
    CHECK_UNPLANNED_VISIT,
    CHECK_ARM,
    CHECK_MISSING_CODE,
    CHECK_VARIANT,
    CHECK_UNLISTED,
    CHECK_UNREADABLE,
    CHECK_LIMIT,
    CHECK_SITE_UNIT,
    CHECK_PLAUSIBLE,
    CHECK_ELIGIBLE,
    CHECK_SCALE,
    CHECK_DERIVED,
    CHECK_DATE_UNREADABLE,
    CHECK_DATE_ORDER,
    CHECK_DATE_AMBIGUOUS,
    CHECK_DATE_IMPOSSIBLE,
    CHECK_DATE_SHORT_YEAR,
    CHECK_DATE_SERIAL,
    CHECK_DATE_FUTURE,
    CHECK_DATE_EARLY,
    CHECK_DATE_SEQUENCE,
    CHECK_DATE_WINDOW,
    CHECK_COUNT
};

const struct check checks[] = {
    [CHECK_SCREENING] = {"screening-sum", "Screening does not add up",
        "Assessed less those not randomised is another number than the participants in the data.", SEVERITY_MUST_SETTLE},
    [CHECK_REPEATED] = {"repeated-participant", "Repeated participants", "An identifier stands on more than one record.",
        SEVERITY_MUST_SETTLE},
    [CHECK_NO_IDENTIFIER] = {"no-identifier", "Records without an identifier", "A record names no participant.",
        SEVERITY_MUST_SETTLE},
    [CHECK_UNMATCHED] = {"unmatched-participant", "Identifiers the first file does not have",
        "A record of another file names a participant who is not in the first.", SEVERITY_MUST_SETTLE},
    [CHECK_DOUBLE_VISIT] = {"double-visit", "Several records of one visit", "A participant has more than one record of a visit or file.",
        SEVERITY_MUST_SETTLE},
    [CHECK_UNPLANNED_VISIT] = {"unplanned-visit", "Visits never planned", "A visit's code that the plan does not list.",
        SEVERITY_WORTH_A_LOOK},
    [CHECK_ARM] = {"unlisted-arm", "Arms that are blank or not in the plan", "A participant has no arm the plan lists.",
        SEVERITY_MUST_SETTLE},
    [CHECK_MISSING_CODE] = {"missing-code", "Codes for missing", "A value that looks like a code for missing.",
        SEVERITY_MUST_SETTLE},
    [CHECK_VARIANT] = {"category-variant", "Variants of a code", "A code that differs from a listed one by case, space or form.",
        SEVERITY_MUST_SETTLE},
    [CHECK_UNLISTED] = {"unlisted-category", "Codes the plan does not list", "A code that the plan does not list.",
        SEVERITY_MUST_SETTLE},
    [CHECK_UNREADABLE] = {"unreadable-number", "Unreadable numbers", "A cell of a number's column that is no number as written.",
        SEVERITY_MUST_SETTLE},
    [CHECK_LIMIT] = {"below-limit", "Below or above a limit of detection", "A value given only as beyond a limit.",
        SEVERITY_WORTH_A_LOOK},
    [CHECK_SITE_UNIT] = {"site-unit", "One site in another unit",
        "Numbers of a site that fit those of the other sites only after a published factor.", SEVERITY_MUST_SETTLE},
    [CHECK_PLAUSIBLE] = {"out-of-plausible-range", "Out of plausible range", "A number outside what the plan calls plausible.",
        SEVERITY_MUST_SETTLE},
    [CHECK_ELIGIBLE] = {"out-of-eligibility", "Outside eligibility", "A number outside what the plan calls eligible.",
        SEVERITY_MUST_SETTLE},
    [CHECK_SCALE] = {"not-on-scale", "Not on the logarithmic scale", "A value that is not positive on an outcome analysed on log10.",
        SEVERITY_MUST_SETTLE},
    [CHECK_DERIVED] = {"derived-differs", "Unlike what it is derived from",
        "A column of the file says another value than its formula gives.", SEVERITY_MUST_SETTLE},
    [CHECK_DATE_UNREADABLE] = {"unreadable-date", "Unreadable dates", "A cell of a date's column that is no date in the declared order.",
        SEVERITY_MUST_SETTLE},
    [CHECK_DATE_ORDER] = {"date-order", "Dates that read only in another order",
        "All dates of a site, or of a column, read in an order that is not the declared one.", SEVERITY_MUST_SETTLE},
    [CHECK_DATE_AMBIGUOUS] = {"ambiguous-date", "Dates that read two ways",
        "Day and month may be exchanged, and the order in which the dates were written is in doubt.", SEVERITY_MUST_SETTLE},
    [CHECK_DATE_IMPOSSIBLE] = {"impossible-date", "Impossible dates", "There is no such day.", SEVERITY_MUST_SETTLE},
    [CHECK_DATE_SHORT_YEAR] = {"two-digit-year", "Years of two digits", "A date whose century is not written.", SEVERITY_MUST_SETTLE},
    [CHECK_DATE_SERIAL] = {"serial-number-date", "Serial numbers for dates", "A number that a spreadsheet counts days by.",
        SEVERITY_MUST_SETTLE},
    [CHECK_DATE_FUTURE] = {"date-in-the-future", "Dates in the future", "A date after the day the data were received.",
        SEVERITY_MUST_SETTLE},
    [CHECK_DATE_EARLY] = {"date-too-early", "Dates before the trial", "A date before the earliest that the plan allows.",
        SEVERITY_MUST_SETTLE},
    [CHECK_DATE_SEQUENCE] = {"dates-out-of-order", "Dates out of order",
        "A date before one that must come first: randomisation, an earlier visit; or after withdrawal or death.", SEVERITY_MUST_SETTLE},
    [CHECK_DATE_WINDOW] = {"outside-window", "Outside the visit's window", "A visit earlier or later than the plan's window.",
        SEVERITY_WORTH_A_LOOK},
    [CHECK_COUNT] = {NULL, NULL, NULL, SEVERITY_MUST_SETTLE},
};

/* ---- collecting ---- */

static struct discrepancy *found(struct finding *finding, enum check_kind check, const char *column, const char *what) {
    if (finding->count == finding->room) {
        size_t room = finding->room ? finding->room * 2 : 32;
        struct discrepancy *list = ARENA_NEW(finding->arena, room, struct discrepancy);
        if (finding->count) {
            memcpy(list, finding->list, finding->count * sizeof *list);
        }
        finding->list = list;
        finding->room = room;
    }
    struct discrepancy *new = &finding->list[finding->count++];
    *new = (struct discrepancy){.check = checks[check].name, .severity = checks[check].severity, .column = column};
    new->id = column ? arena_format(finding->arena, "%s/%s/%s", checks[check].name, column, what) :
                       arena_format(finding->arena, "%s/%s", checks[check].name, what);
    return new;
}

static int check_order(const char *name) {
    int order = 0;
    while (strcmp(checks[order].name, name) != 0) {
        order++;
    }
    return order;
}

struct discrepancy *finding_add(struct finding *finding, const char *check, const char *column, const char *what) {
    return found(finding, (enum check_kind)check_order(check), column, what);
}

static void concerns(struct finding *finding, struct discrepancy *what, const char *participant) {
    const char **list = ARENA_NEW(finding->arena, 1, const char *);
    list[0] = participant;
    what->participants = list;
    what->participant_count = 1;
    what->participant = participant;
}

void finding_concerns(struct finding *finding, struct discrepancy *what, const char *participant) {
    concerns(finding, what, participant);
}

/* Everyone whose current text in the column is this one. */
static void concerns_text(struct finding *finding, struct discrepancy *what, const struct column *column, const char *text) {
    const struct frame *frame = finding->frame;
    const char **list = ARENA_NEW(finding->arena, frame->participant_count, const char *);
    for (size_t p = 0; p < frame->participant_count; p++) {
        const char *here = frame_text(frame, column, p);
        if (here && strcmp(here, text) == 0) {
            list[what->participant_count++] = frame->participants[p].id;
        }
    }
    what->participants = list;
    what->participant = what->participant_count == 1 ? list[0] : NULL;
}

static const char *times(struct finding *finding, size_t count) {
    return count == 1 ? "once" : count == 2 ? "twice" : arena_format(finding->arena, "%zu times", count);
}

const char *finding_proposal(
    struct finding *finding, const char *kind, const char *const fields[][2], size_t count, uint32_t row) {
    struct text text;
    text_init(&text);
    struct json json;
    json_init(&json, &text);
    json_object(&json);
    json_field_string(&json, "kind", kind);
    for (size_t i = 0; i < count; i++) {
        json_field_string(&json, fields[i][0], fields[i][1]);
    }
    if (row) {
        json_field_integer(&json, "row", row);
    }
    json_close(&json);
    json_finish(&json);
    const char *made = arena_text(finding->arena, text.data);
    text_release(&text);
    return made;
}

/* A decision's JSON of up to three fields after its kind. */
static const char *proposal(struct finding *finding, const char *kind, const char *const fields[][2], size_t count) {
    return finding_proposal(finding, kind, fields, count, 0);
}

static const char *number_words(struct finding *finding, double value) {
    return arena_format(finding->arena, "%.15g", value);
}

/* ---- texts that are variants of each other ---- */

static bool is_letter(ucs4_t c) {
    return uc_is_general_category(c, UC_LETTER);
}

/* The text that variants share: compatibility form, no case, no space or invisible characters, no hyphen, underscore or
 * full stop after a letter but where a sign may be meant (A- and A+, 1.5 and 15 stay apart). */
static const char *folded(struct arena *arena, const char *text) {
    size_t length = 0;
    uint8_t *made = u8_casefold((const uint8_t *)text, strlen(text), NULL, UNINORM_NFKC, NULL, &length);
    if (!made) { /* not UTF-8, or nothing to fold */
        return arena_text(arena, text);
    }
    char *kept = ARENA_NEW(arena, length + 1, char);
    size_t used = 0;
    ucs4_t before = 0;
    for (size_t i = 0; i < length;) {
        ucs4_t c = 0, next = 0;
        size_t width = (size_t)u8_mbtouc(&c, made + i, length - i);
        if (i + width < length) {
            u8_mbtouc(&next, made + i + width, length - i - width);
        }
        bool joins = (c == '-' || c == '_' || c == 0x2010) && is_letter(before) && is_letter(next);
        bool ends = c == '.' && is_letter(before) && (next == 0 || is_letter(next));
        if (!joins && !ends && !uc_is_property_white_space(c) && !uc_is_general_category(c, UC_FORMAT)) {
            memcpy(kept + used, made + i, width);
            used += width;
            before = c;
        }
        i += width;
    }
    free(made); /* libunistring's own allocation */
    return kept;
}

/* ---- screening ---- */

/* Who was randomised by the data: everyone but those whose record in force has no arm that the plan lists. */
size_t checks_randomised(const struct frame *frame) {
    size_t count = 0;
    for (size_t p = 0; p < frame->participant_count; p++) {
        bool held = frame->participants[p].record == NO_RECORD;
        int32_t arm = frame->arm ? frame->arm->level[p] : 0;
        count += held || (arm != NOWHERE && (size_t)arm < (frame->arm ? frame->arm->listed_count : 1));
    }
    return count;
}

static void check_screening(struct finding *finding) {
    const struct screening *screening = &finding->frame->plan->screening;
    size_t expected = screening->assessed - screening->not_randomised, randomised = checks_randomised(finding->frame);
    if (!screening->given || expected == randomised) {
        return;
    }
    struct discrepancy *new = found(finding, CHECK_SCREENING, NULL, "randomised");
    const char *sum = arena_format(finding->arena, "%s: %zu assessed less %zu not randomised is %zu, and the data have %zu randomised",
        screening->source, screening->assessed, screening->not_randomised, expected, randomised);
    const char *const fields[][2] = {{"exhibit", "flow"}, {"text", arena_format(finding->arena, "%s.", sum)}};
    new->message = arena_format(finding->arena, "%s. Mend the screening numbers of the plan or find who is missing; a note that names this "
        "settles it with the reason.", sum);
    new->proposal = proposal(finding, "note", fields, 2);
    new->proposal_words = "Note both numbers as they are";
}

/* ---- records ---- */

static const char *differing_columns(struct finding *finding, size_t f, const size_t *records, size_t count) {
    const struct frame *frame = finding->frame;
    const struct cells *cells = &frame->cells[f];
    char words[160] = "";
    size_t used = 0, more = 0;
    for (size_t c = 0; c < cells->columns; c++) {
        bool differs = false;
        for (size_t i = 1; i < count && !differs; i++) {
            differs = strcmp(cells_at(cells, records[0], c), cells_at(cells, records[i], c)) != 0;
        }
        if (!differs || arms_hide_column(frame, plan_column_name(finding->arena, frame->plan, f, cells->names[c]))) {
            continue;
        }
        if (used + 48 < sizeof words) {
            used += (size_t)snprintf(words + used, sizeof words - used, "%s%.40s", used ? ", " : "", cells->names[c]);
        } else {
            more++;
        }
    }
    return used ? arena_format(finding->arena, "They differ in %s%s.", words, more ? " and more" : "") :
                  "They are alike in every column shown.";
}

enum { ROWS_SHOWN = 16 };

/* Records of one participant of whom one is to be kept: their rows in the discrepancy, and "3, 4 and 7" for a sentence. */
static const char *take_rows(struct finding *finding, struct discrepancy *what, const size_t *records, size_t count) {
    unsigned *rows = ARENA_NEW(finding->arena, count, unsigned);
    struct text words;
    text_init(&words);
    for (size_t i = 0; i < count; i++) {
        rows[i] = (unsigned)records[i] + 1;
        text_format(&words, "%s%u", i == 0 ? "" : i + 1 == count ? " and " : ", ", rows[i]);
    }
    what->rows = rows;
    what->row_count = count;
    const char *made = arena_text(finding->arena, words.data);
    text_release(&words);
    return made;
}

static void check_repeated(struct finding *finding) {
    const struct frame *frame = finding->frame;
    for (size_t p = 0; p < frame->participant_count; p++) {
        const struct participant *who = &frame->participants[p];
        if (who->record_count < 2 || who->record != NO_RECORD) {
            continue;
        }
        size_t records[ROWS_SHOWN], all = frame_records(frame, p, records, ROWS_SHOWN), count = all < ROWS_SHOWN ? all : ROWS_SHOWN;
        struct discrepancy *new = found(finding, CHECK_REPEATED, NULL, who->id);
        concerns(finding, new, who->id);
        const char *rows = take_rows(finding, new, records, count);
        new->message = arena_format(finding->arena, "%s stands on %zu records (%s); all are held aside until one is kept. %s", who->id,
            who->record_count, rows, differing_columns(finding, 0, records, count));
    }
}

static void check_no_identifier(struct finding *finding) {
    const struct frame *frame = finding->frame;
    for (size_t f = 0; f < frame->plan->file_count; f++) {
        const struct plan_file *file = &frame->plan->files[f];
        size_t blank = 0, first = 0;
        for (size_t r = 0; r < frame->cells[f].records; r++) {
            const char *id = column_text(frame, frame->identifiers[f], r);
            if (!id || id[strspn(id, " \t\r\n\f\v")] == '\0') {
                first = blank++ == 0 ? r + 1 : first;
            }
        }
        if (blank) {
            struct discrepancy *new = found(finding, CHECK_NO_IDENTIFIER, file->identifier_name, "blank");
            new->message = arena_format(finding->arena, "%s%s%zu record%s no identifier, the first is record %zu; %s %s and counted.",
                f ? file->id : "", f ? ": " : "", blank, blank == 1 ? " has" : "s have", first, blank == 1 ? "it is" : "they are",
                f ? "joined to nobody" : "held aside");
        }
    }
}

/* ---- several files ---- */

/* The identifier of the first file that an unmatched one is a variant of, NULL where there is none. */
static const char *similar_identifier(struct finding *finding, struct map *folds, const char *id) {
    const struct frame *frame = finding->frame;
    if (!folds->room) {
        for (size_t p = 0; p < frame->participant_count; p++) {
            map_put(folds, folded(finding->arena, frame->participants[p].id), (int32_t)p);
        }
    }
    int32_t found_at = map_get(folds, folded(finding->arena, id));
    return found_at == NOWHERE ? NULL : frame->participants[found_at].id;
}

static void unmatched(struct finding *finding, struct map *folds, size_t f, size_t record, const char *id) {
    const struct plan_file *file = &finding->frame->plan->files[f];
    const char *column = file->identifier_name, *like = similar_identifier(finding, folds, id);
    struct discrepancy *new = found(finding, CHECK_UNMATCHED, column, id);
    new->value = id;
    new->message = arena_format(finding->arena, "%s, record %zu: the identifier \"%s\" is not in the first file; what it says is joined to nobody, "
        "and counted.", file->id, record + 1, id);
    if (like) {
        const char *const fields[][2] = {{"column", column}, {"from", id}, {"to", like}};
        new->proposal = proposal(finding, "read-as", fields, 3);
        new->proposal_words = arena_format(finding->arena, "Read \"%s\" as \"%s\"", id, like);
    }
}

static void check_unmatched(struct finding *finding) {
    const struct frame *frame = finding->frame;
    struct map folds;
    map_init(&folds);
    for (size_t f = 1; f < frame->plan->file_count; f++) {
        struct map seen;
        map_init(&seen);
        for (size_t r = 0; frame->joins[f].unmatched && r < frame->cells[f].records; r++) {
            const char *id = column_text(frame, frame->identifiers[f], r);
            bool blank = !id || id[strspn(id, " \t\r\n\f\v")] == '\0';
            if (!blank && frame->owner[f][r] == NOWHERE && map_get(&seen, id) == NOWHERE) {
                map_put(&seen, id, 1);
                unmatched(finding, &folds, f, r, id);
            }
        }
        map_release(&seen);
    }
    map_release(&folds);
}

struct held { /* a participant's records of one slot, none of them kept yet */
    size_t slot, participant;
    size_t records[ROWS_SHOWN], count;
};

static void double_visit(struct finding *finding, const struct held *held) {
    const struct frame *frame = finding->frame;
    size_t f = frame->plan->slots[held->slot].file, count = held->count < ROWS_SHOWN ? held->count : ROWS_SHOWN;
    const struct plan_file *file = &frame->plan->files[f];
    const char *code = frame->plan->slots[held->slot].code, *id = frame->participants[held->participant].id;
    struct discrepancy *new = found(finding, CHECK_DOUBLE_VISIT, NULL,
        code ? arena_format(finding->arena, "%s@%s/%s", file->id, code, id) : arena_format(finding->arena, "%s/%s", file->id, id));
    concerns(finding, new, id);
    new->file = file->id;
    const char *rows = take_rows(finding, new, held->records, count);
    new->message = arena_format(finding->arena, "%s has %zu records of %s%s%s (%s); all are held aside until one is kept. %s", id, held->count,
        file->id, code ? " at visit " : "", code ? code : "", rows, differing_columns(finding, f, held->records, count));
}

/* One pass over the file's records, however many are held. */
static void check_double_visits_of(struct finding *finding, size_t f) {
    const struct frame *frame = finding->frame;
    size_t first = frame->plan->files[f].first_slot, slots = frame->plan->files[f].by_visit ? frame->plan->files[f].codes.count : 1;
    size_t n = frame->participant_count, count = 0;
    struct held *held = memory_new(frame->joins[f].doubled, sizeof *held);
    int32_t *index = memory_new(slots * n, sizeof *index); /* 1-based into held */
    for (size_t s = 0; s < slots; s++) {
        for (size_t p = 0; p < n; p++) {
            if (frame->place[first + s][p] == HELD_RECORD) {
                held[count] = (struct held){.slot = first + s, .participant = p};
                index[s * n + p] = (int32_t)++count;
            }
        }
    }
    for (size_t r = 0; r < frame->cells[f].records; r++) {
        size_t slot = frame->owner[f][r] == NOWHERE ? NO_RECORD : frame_slot_of_record(frame, f, r);
        int32_t place = slot == NO_RECORD ? 0 : index[(slot - first) * n + (size_t)frame->owner[f][r]];
        if (place) {
            struct held *here = &held[place - 1];
            if (here->count < ROWS_SHOWN) {
                here->records[here->count] = r;
            }
            here->count++;
        }
    }
    for (size_t i = 0; i < count; i++) {
        double_visit(finding, &held[i]);
    }
    memory_free(index);
    memory_free(held);
}

static void check_double_visits(struct finding *finding) {
    const struct frame *frame = finding->frame;
    for (size_t f = 0; f < frame->plan->file_count; f++) {
        if (frame->joins[f].doubled && frame->owner[f]) {
            check_double_visits_of(finding, f);
        }
    }
}

static const char *similar_code(struct finding *finding, const struct plan_file *file, const char *code) {
    for (size_t c = 0; c < file->codes.count; c++) {
        if (strcmp(folded(finding->arena, file->codes.item[c]), folded(finding->arena, code)) == 0) {
            return file->codes.item[c];
        }
    }
    return NULL;
}

static void unplanned_visit(struct finding *finding, const struct plan_file *file, const char *code, size_t count) {
    const char *like = similar_code(finding, file, code);
    struct discrepancy *new = found(finding, CHECK_UNPLANNED_VISIT, file->visit_name, code);
    new->value = code;
    new->message = arena_format(finding->arena, "%s reads the visit \"%s\" %s, which is not among the planned codes; those records are in no "
        "analysis, and counted.", file->id, code, times(finding, count));
    if (like) {
        const char *const fields[][2] = {{"column", file->visit_name}, {"from", code}, {"to", like}};
        new->proposal = proposal(finding, "read-as", fields, 3);
        new->proposal_words = arena_format(finding->arena, "Read \"%s\" as \"%s\"", code, like);
    }
}

static void check_unplanned_visits(struct finding *finding) {
    enum { MOST = 1000 }; /* more kinds of visit than that are no kinds of visit */
    const struct frame *frame = finding->frame;
    for (size_t f = 0; f < frame->plan->file_count; f++) {
        const struct plan_file *file = &frame->plan->files[f];
        struct map places;
        map_init(&places);
        const char *codes[MOST];
        size_t counts[MOST], kinds = 0;
        for (size_t c = 0; c < file->codes.count; c++) {
            map_put(&places, file->codes.item[c], MOST);
        }
        for (size_t r = 0; file->by_visit && !file->window && r < frame->cells[f].records; r++) {
            const char *code = column_text(frame, frame->visits[f], r);
            int32_t place = code ? map_put(&places, code, kinds < MOST ? (int32_t)kinds : MOST) : MOST;
            if (place == (int32_t)kinds && place != MOST) {
                codes[kinds] = code;
                counts[kinds++] = 0;
            }
            if (place != MOST) {
                counts[place]++;
            }
        }
        for (size_t k = 0; k < kinds; k++) {
            unplanned_visit(finding, file, codes[k], counts[k]);
        }
        map_release(&places);
    }
}

/* While blinded a count and nothing else. */
static void check_arm(struct finding *finding) {
    const struct frame *frame = finding->frame;
    if (!frame->arm) {
        return;
    }
    size_t count = 0;
    for (size_t p = 0; p < frame->participant_count; p++) {
        bool listed = frame->arm->level[p] != NOWHERE && (size_t)frame->arm->level[p] < frame->arm->listed_count;
        count += frame->participants[p].record != NO_RECORD && !listed;
    }
    if (!count) {
        return;
    }
    bool open = frame->blinding == BLINDING_UNBLINDED;
    struct discrepancy *new = found(finding, CHECK_ARM, NULL, "count");
    new->column = open ? frame->plan->arm_column : NULL;
    new->message = arena_format(finding->arena, "%zu participant%s no arm that the plan lists; %s out of every exhibit by arm, and counted.",
        count, count == 1 ? " has" : "s have", count == 1 ? "this one is" : "they are");
    if (open) {
        const char **list = ARENA_NEW(finding->arena, count, const char *);
        for (size_t p = 0; p < frame->participant_count; p++) {
            bool listed = frame->arm->level[p] != NOWHERE && (size_t)frame->arm->level[p] < frame->arm->listed_count;
            if (frame->participants[p].record != NO_RECORD && !listed) {
                list[new->participant_count++] = frame->participants[p].id;
            }
        }
        new->participants = list;
        new->participant = count == 1 ? list[0] : NULL;
    }
}

/* ---- codes for missing ---- */

/* Numbers the trade has long used for "missing"; common practice, no source. Only with a sign in the data is one suspected. */
static bool is_sentinel(double value) {
    static const double known[] = {9, 99, 999, 9999, 99999, 99.9, 999.9, -1, -8, -9, -88, -99, -999, -9999, 77, 88, 777, 888};
    for (size_t i = 0; i < sizeof known / sizeof *known; i++) {
        if (value >= known[i] && value <= known[i]) {
            return true;
        }
    }
    return false;
}

static int by_value(const void *a, const void *b) {
    double x = *(const double *)a, y = *(const double *)b;
    return (x > y) - (x < y);
}

/* Signs that a sentinel is not a measurement: outside the plausible range, or, where the plan gives none, far from every
 * other value (a gap of more than three times the distance between the quartiles). */
static bool stands_apart(const struct variable *variable, const double *sorted, size_t n, double value) {
    if (variable->plausible.given) {
        return value < variable->plausible.low || value > variable->plausible.high;
    }
    if (n < 8) {
        return false;
    }
    double spread = sorted[3 * n / 4] - sorted[n / 4], below = -INFINITY, above = INFINITY;
    for (size_t i = 0; i < n; i++) {
        below = sorted[i] < value ? sorted[i] : below;
        above = sorted[i] > value && sorted[i] < above ? sorted[i] : above;
    }
    return value - below > 3 * spread && above - value > 3 * spread && spread > 0;
}

/* Everyone whose number it is, however it is written. */
static void concerns_number(struct finding *finding, struct discrepancy *what, const struct column *column, double value) {
    const struct frame *frame = finding->frame;
    const char **list = ARENA_NEW(finding->arena, frame->participant_count, const char *);
    for (size_t p = 0; p < frame->participant_count; p++) {
        if (column->number[p] >= value && column->number[p] <= value) {
            list[what->participant_count++] = frame->participants[p].id;
        }
    }
    what->participants = list;
    what->participant = what->participant_count == 1 ? list[0] : NULL;
}

static void suspect_code(struct finding *finding, const struct column *column, const struct variable *variable, double value) {
    const struct frame *frame = finding->frame;
    const char *text = NULL;
    for (size_t p = 0; p < frame->participant_count && !text; p++) {
        text = column->number[p] >= value && column->number[p] <= value ? frame_text(frame, column, p) : NULL;
    }
    struct discrepancy *new = found(finding, CHECK_MISSING_CODE, variable->column, number_words(finding, value));
    concerns_number(finding, new, column, value);
    new->value = text;
    new->message = arena_format(finding->arena, "%s reads %s %s, far from every other value: a code for missing?", variable->label, text,
        times(finding, new->participant_count));
    const char *const fields[][2] = {{"column", variable->column}, {"value", text}};
    new->proposal = proposal(finding, "missing-code", fields, 2);
    new->proposal_words = arena_format(finding->arena, "Treat %s as a code for missing", text);
}

/* Most columns have none, and need no sorting. */
static bool any_sentinel(const struct frame *frame, const struct column *column, const struct range *plausible) {
    for (size_t p = 0; p < frame->participant_count; p++) {
        double value = column->number[p];
        bool inside = plausible->given && value >= plausible->low && value <= plausible->high;
        if (!isnan(value) && !inside && is_sentinel(value)) {
            return true;
        }
    }
    return false;
}

static void suspect_codes(struct finding *finding, const struct column *column, const struct variable *variable) {
    const struct frame *frame = finding->frame;
    if (!any_sentinel(frame, column, &variable->plausible)) {
        return;
    }
    double *sorted = ARENA_NEW(finding->arena, frame->participant_count, double);
    size_t n = 0;
    for (size_t p = 0; p < frame->participant_count; p++) {
        if (!isnan(column->number[p])) {
            sorted[n++] = column->number[p];
        }
    }
    if (n) {
        qsort(sorted, n, sizeof *sorted, by_value);
    }
    for (size_t i = 0; i < n; i++) {
        if ((i == 0 || sorted[i] > sorted[i - 1]) && is_sentinel(sorted[i]) && stands_apart(variable, sorted, n, sorted[i])) {
            suspect_code(finding, column, variable, sorted[i]);
        }
    }
}

/* A code as identifiers of discrepancies have it: 999 for 999.0 too, where the column holds numbers. */
static const char *code_words(struct finding *finding, const struct column *column, const char *code) {
    double value;
    return column->number && number_read(code, '.', &value, NULL) == NUMBER_READ ? number_words(finding, value) : code;
}

static bool found_before(const struct finding *finding, size_t since, const char *code) {
    for (size_t i = since; i < finding->count; i++) {
        const char *slash = strrchr(finding->list[i].id, '/');
        if (slash && strcmp(slash + 1, code) == 0) {
            return true;
        }
    }
    return false;
}

/* Codes that stand in the column and are settled as such already. */
static void settled_codes(struct finding *finding, const struct column *column, const struct variable *variable) {
    const struct frame *frame = finding->frame;
    size_t since = finding->count;
    for (size_t i = 0; i < frame->version; i++) {
        const struct decision *decision = &frame->decisions[i];
        if (!frame->stands[i] || decision->kind != DECISION_MISSING_CODE || !plan_covers(decision->column, variable->column)) {
            continue;
        }
        const char *code = code_words(finding, column, decision->value);
        const char **list = ARENA_NEW(finding->arena, frame->participant_count, const char *);
        size_t count = 0;
        for (size_t p = 0; p < frame->participant_count; p++) {
            const char *text = column->state[p] == CELL_MISSING_CODE ? frame_text(frame, column, p) : NULL;
            if (text && strcmp(code_words(finding, column, text), code) == 0) {
                list[count++] = frame->participants[p].id;
            }
        }
        if (!count || found_before(finding, since, code)) {
            continue;
        }
        struct discrepancy *new = found(finding, CHECK_MISSING_CODE, variable->column, code);
        new->value = decision->value;
        new->participants = list;
        new->participant_count = count;
        new->participant = count == 1 ? list[0] : NULL;
        new->state = DISCREPANCY_SETTLED;
        new->settled_by = decision->number;
        new->message = arena_format(finding->arena, "%s reads %s %s, a code for missing%s.", variable->label, decision->value,
            times(finding, count), decision->planned ? " by the plan" : "");
    }
}

/* ---- categories ---- */

struct spelling { /* one code as variants see it */
    const char *key;
    size_t level;
};

static int by_key(const void *a, const void *b) {
    const struct spelling *x = a, *y = b;
    int order = strcmp(x->key, y->key);
    return order ? order : (x->level > y->level) - (x->level < y->level);
}

static size_t *count_levels(struct finding *finding, const struct column *column) {
    size_t *counts = ARENA_NEW(finding->arena, column->level_count, size_t);
    for (size_t p = 0; p < finding->frame->participant_count; p++) {
        if (column->level[p] != NOWHERE) {
            counts[column->level[p]]++;
        }
    }
    return counts;
}

/* The listed level that the code is a variant of by code or label; NOWHERE where none or more than one is. */
static int variant_of_listed(struct finding *finding, const char *key, const struct level *levels, size_t count) {
    int best = NOWHERE;
    for (size_t i = 0; i < count && *key; i++) {
        if (strcmp(key, folded(finding->arena, levels[i].code)) == 0 || strcmp(key, folded(finding->arena, levels[i].label)) == 0) {
            if (best != NOWHERE) {
                return NOWHERE;
            }
            best = (int)i;
        }
    }
    return best;
}

static void variant_found(struct finding *finding, const struct column *column, const struct variable *variable,
    const char *code, const char *to) {
    struct discrepancy *new = found(finding, to ? CHECK_VARIANT : CHECK_UNLISTED, variable->column, code);
    concerns_text(finding, new, column, code);
    new->value = code;
    const char *how_often = times(finding, new->participant_count);
    if (!to) {
        new->message = variable->kind == VARIABLE_EVENT ?
            arena_format(finding->arena, "%s reads \"%s\" %s, which the plan lists neither as yes nor as no.", variable->label, code,
                how_often) :
            arena_format(finding->arena, "%s reads \"%s\" %s, which the plan does not list.", variable->label, code, how_often);
        return;
    }
    const char *const fields[][2] = {{"column", variable->column}, {"from", code}, {"to", to}};
    new->message = arena_format(finding->arena, "%s reads \"%s\" %s; it differs from \"%s\" by case, space or form only.",
        variable->label, code, how_often, to);
    new->proposal = proposal(finding, "read-as", fields, 3);
    new->proposal_words = arena_format(finding->arena, "Read \"%s\" as \"%s\"", code, to);
}

static void check_listed(struct finding *finding, const struct column *column, const struct variable *variable) {
    for (size_t l = column->listed_count; l < column->level_count; l++) {
        const char *code = column->levels[l].code;
        int target = variant_of_listed(finding, folded(finding->arena, code), column->levels, column->listed_count);
        variant_found(finding, column, variable, code, target == NOWHERE ? NULL : column->levels[target].code);
    }
}

/* Without a list every code is its own level, and one that folds to the same as a more frequent one is its variant. */
static void check_unlisted(struct finding *finding, const struct column *column, const struct variable *variable) {
    const size_t *counts = count_levels(finding, column);
    struct spelling *spellings = ARENA_NEW(finding->arena, column->level_count, struct spelling);
    for (size_t l = 0; l < column->level_count; l++) {
        spellings[l] = (struct spelling){folded(finding->arena, column->levels[l].code), l};
    }
    if (column->level_count) {
        qsort(spellings, column->level_count, sizeof *spellings, by_key);
    }
    for (size_t from = 0, to; from < column->level_count; from = to) {
        size_t most = spellings[from].level;
        for (to = from; to < column->level_count && strcmp(spellings[to].key, spellings[from].key) == 0; to++) {
            most = counts[spellings[to].level] > counts[most] ? spellings[to].level : most;
        }
        for (size_t i = from; i < to; i++) {
            if (spellings[i].level != most && *spellings[i].key) {
                variant_found(finding, column, variable, column->levels[spellings[i].level].code, column->levels[most].code);
            }
        }
    }
}

static void check_category(struct finding *finding, const struct column *column, const struct variable *variable) {
    if (column->listed_count) {
        check_listed(finding, column, variable);
    } else {
        check_unlisted(finding, column, variable);
    }
}

/* Whether another event that rests on the same column has asked about this text already. */
static bool event_before(const struct finding *finding, const struct variable *variable, const char *text) {
    const struct frame *frame = finding->frame;
    for (size_t v = 0; &frame->plan->variables[v] < variable; v++) {
        const struct variable *other = &frame->plan->variables[v];
        if (other->kind != VARIABLE_EVENT || strcmp(other->column, variable->column) != 0) {
            continue;
        }
        for (size_t p = 0; p < frame->participant_count; p++) {
            const char *here = frame->columns[v]->state[p] == CELL_UNREADABLE ? frame_text(frame, frame->columns[v], p) : NULL;
            if (here && strcmp(here, text) == 0) {
                return true;
            }
        }
    }
    return false;
}

static void check_event(struct finding *finding, const struct column *column, const struct variable *variable) {
    const struct frame *frame = finding->frame;
    const struct event *event = &frame->plan->events[variable->event];
    size_t count = event->yes.count + event->no.count;
    struct level *levels = ARENA_NEW(finding->arena, count, struct level);
    for (size_t i = 0; i < count; i++) {
        const char *code = i < event->yes.count ? event->yes.item[i] : event->no.item[i - event->yes.count];
        levels[i] = (struct level){code, code};
    }
    struct map seen;
    map_init(&seen);
    for (size_t p = 0; p < frame->participant_count; p++) {
        const char *text = column->state[p] == CELL_UNREADABLE ? frame_text(frame, column, p) : NULL;
        if (text && map_get(&seen, text) == NOWHERE) {
            map_put(&seen, text, 1);
            int target = variant_of_listed(finding, folded(finding->arena, text), levels, count);
            if (!event_before(finding, variable, text)) {
                variant_found(finding, column, variable, text, target == NOWHERE ? NULL : levels[target].code);
            }
        }
    }
    map_release(&seen);
}

/* ---- numbers ---- */

/* The number that a text starts with, where a unit or a word may be what follows it; "120/80" is not one number. */
static bool number_before_words(struct finding *finding, const char *text, double *value) {
    size_t digits = strspn(text, " 0123456789.,+-");
    ucs4_t next = 0;
    u8_mbtouc(&next, (const uint8_t *)text + digits, strlen(text + digits) + 1);
    bool words = is_letter(next) || next == '%' || next == 0xB0; /* the degree sign */
    return digits > 0 && words && number_read(arena_bytes(finding->arena, text, digits), '.', value, NULL) == NUMBER_READ;
}

static void check_unreadable(struct finding *finding, const struct column *column, const struct variable *variable) {
    const struct frame *frame = finding->frame;
    const struct range *plausible = &variable->plausible;
    for (size_t p = 0; p < frame->participant_count; p++) {
        if (column->state[p] != CELL_UNREADABLE) {
            continue;
        }
        const char *text = frame_text(frame, column, p), *id = frame->participants[p].id;
        struct discrepancy *new = found(finding, CHECK_UNREADABLE, variable->column, id);
        concerns(finding, new, id);
        new->value = text;
        double value;
        if (number_read(text, ',', &value, NULL) == NUMBER_READ) {
            bool fits = !plausible->given || (value >= plausible->low && value <= plausible->high);
            const char *const fields[][2] = {{"column", variable->column}, {"decimal", ","}};
            new->message = arena_format(finding->arena, "%s of %s reads \"%s\", no number as written; with a decimal comma it is %s%s.",
                variable->label, id, text, number_words(finding, value), fits ? "" : ", which is not plausible");
            new->proposal = fits ? proposal(finding, "number-format", fields, 2) : NULL;
            new->proposal_words = fits ? arena_format(finding->arena, "Read decimal commas in %s", variable->column) : NULL;
        } else if (number_before_words(finding, text, &value)) {
            const char *to = number_words(finding, value);
            const char *const fields[][2] = {{"column", variable->column}, {"participant", id}, {"from", text}, {"to", to}};
            new->message = arena_format(finding->arena, "%s of %s reads \"%s\": a number with something after it, perhaps its unit.",
                variable->label, id, text);
            new->proposal = proposal(finding, "correct", fields, 4);
            new->proposal_words = arena_format(finding->arena, "Correct it to %s", to);
        } else {
            new->message = arena_format(finding->arena, "%s of %s reads \"%s\", which is no number.", variable->label, id, text);
        }
    }
}

static void check_limit(struct finding *finding, const struct column *column, const struct variable *variable) {
    const struct frame *frame = finding->frame;
    struct map seen;
    map_init(&seen);
    for (size_t p = 0; p < frame->participant_count; p++) {
        bool beyond = column->state[p] == CELL_BELOW_LIMIT || column->state[p] == CELL_ABOVE_LIMIT;
        const char *text = beyond ? frame_text(frame, column, p) : NULL;
        if (text && map_get(&seen, text) == NOWHERE) {
            map_put(&seen, text, 1);
            struct discrepancy *new = found(finding, CHECK_LIMIT, variable->column, text);
            concerns_text(finding, new, column, text);
            new->value = text;
            new->message = arena_format(finding->arena, "%s reads %s %s: %s the limit, so neither a number nor simply missing; left out of "
                "analyses and counted.", variable->label, text, times(finding, new->participant_count),
                column->state[p] == CELL_BELOW_LIMIT ? "below" : "above");
            const char *const fields[][2] = {{"column", variable->column}, {"value", text}};
            new->proposal = proposal(finding, "confirm", fields, 2);
            new->proposal_words = "Confirm as recorded";
        }
    }
    map_release(&seen);
}

/* A power of ten that would bring the value into the range, as words; it is never proposed as a correction without a source. */
static const char *slip_words(struct finding *finding, const struct range *range, double value) {
    static const double factors[] = {10, 100, 0.1, 0.01};
    static const char *const words[] = {"A tenth", "A hundredth", "Ten times", "A hundred times"};
    for (size_t i = 0; i < 4; i++) {
        double slipped = value / factors[i];
        if (slipped >= range->low && slipped <= range->high) {
            return arena_format(finding->arena, " %s%s, %s, would fit: a decimal slip?", words[i], i < 2 ? " of it" : " it",
                number_words(finding, slipped));
        }
    }
    return "";
}

/* Of a computed value, what it is computed from, as a sentence to put behind another. */
static const char *computed_from(struct finding *finding, const struct variable *variable, size_t p) {
    const struct derived *derived = &finding->frame->plan->derived[variable->derived];
    return arena_format(finding->arena, " It is computed: %s (%s).", derived_words(finding->arena, derived),
        derived_inputs(finding->arena, finding->frame, derived, p));
}

static void check_range(struct finding *finding, enum check_kind check, const struct column *column,
    const struct variable *variable, const struct range *range) {
    const struct frame *frame = finding->frame;
    const bool *asked = finding->site_asked[variable - frame->plan->variables]; /* about the unit of their site */
    for (size_t p = 0; range->given && p < frame->participant_count; p++) {
        double value = column->number[p];
        if (isnan(value) || (value >= range->low && value <= range->high) || (asked && asked[p])) {
            continue;
        }
        const char *id = frame->participants[p].id, *unit = variable->unit;
        bool implausible = variable->plausible.given && (value < variable->plausible.low || value > variable->plausible.high);
        if (check == CHECK_ELIGIBLE && implausible) {
            continue; /* asked about once, as implausible */
        }
        struct discrepancy *new = found(finding, check, variable->column, id);
        concerns(finding, new, id);
        new->value = frame_text(frame, column, p);
        new->message = arena_format(finding->arena, "%s of %s is %s%s%s, outside the %s range %s to %s.%s", variable->label, id,
            number_words(finding, value), *unit ? " " : "", unit, check == CHECK_ELIGIBLE ? "eligible" : "plausible",
            number_words(finding, range->low), number_words(finding, range->high),
            variable->derived != NOWHERE ? computed_from(finding, variable, p) :
            check == CHECK_PLAUSIBLE     ? slip_words(finding, range, value) :
                                           " A breach of eligibility is classified, not deleted.");
    }
}

static void check_scale(struct finding *finding, const struct column *column, const struct variable *variable) {
    const struct frame *frame = finding->frame;
    for (size_t p = 0; p < frame->participant_count; p++) {
        if (isnan(column->number[p]) || column->number[p] > 0) {
            continue;
        }
        const char *id = frame->participants[p].id;
        struct discrepancy *new = found(finding, CHECK_SCALE, variable->column, id);
        concerns(finding, new, id);
        new->value = frame_text(frame, column, p);
        new->message = arena_format(finding->arena, "%s of %s is %s, which the logarithmic scale cannot take; it is left out there and counted.",
            variable->label, id, number_words(finding, column->number[p]));
    }
}

static void check_claims(struct finding *finding, const struct column *column, const struct variable *variable) {
    const struct frame *frame = finding->frame;
    const struct derived *derived = &frame->plan->derived[variable->derived];
    for (size_t p = 0; derived->claims && p < frame->participant_count; p++) {
        struct derived_value taken;
        derived_take(&taken, frame, derived, p);
        if (!taken.differs) {
            continue;
        }
        const char *id = frame->participants[p].id, *space = *derived->unit ? " " : "";
        struct discrepancy *new = found(finding, CHECK_DERIVED, derived->claims, id);
        concerns(finding, new, id);
        new->value = frame_text(frame, frame->columns[derived->claims_variable], p);
        new->message = arena_format(finding->arena, "%s of %s is %s%s%s by the file (%s), but %s%s%s as %s (%s); %s a difference of %.3g.", derived->label, id, new->value, space, derived->unit, derived->claims, frame_text(frame, column, p),
            space, derived->unit, derived_words(finding->arena, derived), derived_inputs(finding->arena, frame, derived, p),
            isnan(derived->tolerance) ? "rounding explains" : "the plan allows", taken.tolerance);
    }
}

/* ---- all of them, in the order of the table ---- */

static void check_variable(struct finding *finding, enum check_kind check, size_t v) {
    const struct frame *frame = finding->frame;
    const struct variable *variable = &frame->plan->variables[v];
    const struct column *column = frame->columns[v];
    if (finding->hidden[v]) {
        return;
    }
    bool number = variable->kind == VARIABLE_NUMBER, category = variable->kind == VARIABLE_CATEGORY;
    bool log10_outcome = variable->outcome != NOWHERE && frame->scales[variable->outcome] == SCALE_LOG10;
    if (variable->derived != NOWHERE && check == CHECK_DERIVED) {
        check_claims(finding, column, variable);
    } else if (variable->derived != NOWHERE && check == CHECK_MISSING_CODE) {
        return; /* codes are those of the columns it rests on */
    } else if (check == CHECK_MISSING_CODE) {
        settled_codes(finding, column, variable);
        if (number) {
            suspect_codes(finding, column, variable);
        }
    } else if (check == CHECK_VARIANT && category) {
        check_category(finding, column, variable);
    } else if (check == CHECK_VARIANT && variable->kind == VARIABLE_EVENT) {
        check_event(finding, column, variable);
    } else if (check == CHECK_UNREADABLE && number) {
        check_unreadable(finding, column, variable);
    } else if (check == CHECK_LIMIT && number) {
        check_limit(finding, column, variable);
    } else if (check == CHECK_PLAUSIBLE && number) {
        check_range(finding, check, column, variable, &variable->plausible);
    } else if (check == CHECK_ELIGIBLE && number) {
        check_range(finding, check, column, variable, &variable->eligible);
    } else if (check == CHECK_SCALE && log10_outcome) {
        check_scale(finding, column, variable);
    }
}

static void run(struct finding *finding) {
    const struct plan *plan = finding->frame->plan;
    bool *hidden = ARENA_NEW(finding->arena, plan->variable_count, bool);
    for (size_t v = 0; v < plan->variable_count; v++) {
        hidden[v] = arms_hide_column(finding->frame, plan->variables[v].column);
    }
    finding->hidden = hidden;
    check_screening(finding);
    check_repeated(finding);
    check_no_identifier(finding);
    check_unmatched(finding);
    check_double_visits(finding);
    check_unplanned_visits(finding);
    check_arm(finding);
    check_site_units(finding); /* before ranges: who is asked about as a site is not asked about alone */
    for (int check = CHECK_MISSING_CODE; check < CHECK_COUNT; check++) {
        for (size_t v = 0; v < plan->variable_count; v++) {
            check_variable(finding, (enum check_kind)check, v);
        }
    }
    check_dates(finding);
}

/* ---- what decisions have done about them ---- */

static bool same(const char *a, const char *b) {
    return a && b && strcmp(a, b) == 0;
}

/* Whether a confirmation or a query that stands is about this discrepancy. */
static bool decided_about(const struct decision *decision, const struct discrepancy *what) {
    if (decision->discrepancy) {
        return strcmp(decision->discrepancy, what->id) == 0;
    }
    bool about = decision->column ? what->column && plan_covers(decision->column, what->column) : !what->column && decision->participant;
    bool cell = about && (!decision->participant || same(decision->participant, what->participant));
    return cell && (decision->kind == DECISION_QUERY || same(decision->value, what->value));
}

static void look_for_decision(const struct frame *frame, struct discrepancy *what) {
    for (size_t i = 0; i < frame->version; i++) {
        const struct decision *decision = &frame->decisions[i];
        bool confirms = decision->kind == DECISION_CONFIRM && (!decision->value || !what->value || same(decision->value, what->value));
        /* Where there is no cell to confirm, a note that names the discrepancy settles it. */
        confirms |= decision->kind == DECISION_NOTE && (same(what->check, checks[CHECK_SCREENING].name) ||
                                                           same(what->check, checks[CHECK_SITE_UNIT].name));
        if (!frame->stands[i] || !(confirms || decision->kind == DECISION_QUERY) || !decided_about(decision, what)) {
            continue;
        }
        what->state = confirms ? DISCREPANCY_SETTLED : what->state == DISCREPANCY_OPEN ? DISCREPANCY_QUERIED : what->state;
        what->settled_by = confirms ? decision->number : what->settled_by;
    }
}

static bool is_of_site(const struct frame *frame, const struct discrepancy *what, const char *site) {
    int who = what->participant_count ? frame_participant(frame, what->participants[0]) : NOWHERE;
    return same(who == NOWHERE ? NULL : site_of(frame, (size_t)who), site);
}

static size_t file_index(const struct plan *plan, const char *id) {
    size_t f = 0;
    while (id && f < plan->file_count && !same(plan->files[f].id, id)) {
        f++;
    }
    return f;
}

/* Whether a keep-record chose among these records. */
static bool keeps_one_of(const struct frame *frame, const struct decision *decision, const struct discrepancy *what) {
    bool about = decision->kind == DECISION_KEEP_RECORD && same(decision->participant, what->participant) &&
                 file_index(frame->plan, decision->file) == file_index(frame->plan, what->file);
    for (size_t i = 0; about && i < what->row_count; i++) {
        if (what->rows[i] == decision->row) {
            return true;
        }
    }
    return about && what->row_count >= ROWS_SHOWN;
}

/* The decision that settled what the checks no longer find: one that names it, else the last about its cell or column. */
static uint32_t settler(const struct frame *frame, const struct discrepancy *what) {
    uint32_t by = 0;
    for (size_t i = 0; i < frame->version; i++) {
        const struct decision *decision = &frame->decisions[i];
        bool keeps = keeps_one_of(frame, decision, what);
        bool other_code = (decision->kind == DECISION_READ_AS && !same(decision->from, what->value)) ||
                          (decision->kind == DECISION_MISSING_CODE && !same(decision->value, what->value));
        bool sited = decision->kind == DECISION_DATE_ORDER || decision->kind == DECISION_CONVERT;
        const char *site = sited ? decision->site : NULL;
        bool column = decision->kind <= DECISION_SET_MISSING && !other_code && (!site || is_of_site(frame, what, site)) && decision->column && what->column &&
                      plan_covers(decision->column, what->column) &&
                      (!decision->participant || same(decision->participant, what->participant));
        if (frame->stands[i] && (keeps || column || same(decision->discrepancy, what->id))) {
            by = decision->number;
        }
    }
    return by;
}

static int by_check(const void *a, const void *b) {
    const struct discrepancy *x = a, *y = b;
    int order = check_order(x->check) - check_order(y->check);
    order = order ? order : strcmp(x->column ? x->column : "", y->column ? y->column : "");
    order = order ? order : strcmp(x->participant_count ? x->participants[0] : "", y->participant_count ? y->participants[0] : "");
    return order ? order : strcmp(x->id, y->id);
}

void checks_run(const struct frame *frame, const struct frame *received, struct arena *arena, struct discrepancies *all) {
    struct finding now = {.frame = frame, .arena = arena};
    run(&now);
    struct map ids;
    map_init(&ids);
    for (size_t i = 0; i < now.count; i++) {
        if (now.list[i].state == DISCREPANCY_OPEN) {
            look_for_decision(frame, &now.list[i]);
        }
        map_put(&ids, now.list[i].id, (int32_t)i);
    }
    struct finding before = {.frame = received, .arena = arena};
    if (received != frame) {
        /* What was found at load is looked at as blinded as the study is now. */
        run(&before);
    }
    struct discrepancy *list = ARENA_NEW(arena, now.count + before.count, struct discrepancy);
    if (now.count) {
        memcpy(list, now.list, now.count * sizeof *list);
    }
    size_t count = now.count;
    for (size_t i = 0; i < before.count; i++) {
        struct discrepancy *old = &before.list[i];
        if (map_get(&ids, old->id) != NOWHERE || (old->column && arms_hide_column(frame, old->column))) {
            continue;
        }
        old->settled_by = settler(frame, old);
        old->state = DISCREPANCY_SETTLED;
        list[count++] = *old;
    }
    map_release(&ids);
    if (count) {
        qsort(list, count, sizeof *list, by_check);
    }
    *all = (struct discrepancies){.list = list, .count = count};
    for (size_t i = 0; i < count; i++) {
        all->open += list[i].state == DISCREPANCY_OPEN;
        all->settled += list[i].state == DISCREPANCY_SETTLED;
        all->queried += list[i].state == DISCREPANCY_QUERIED;
    }
}
