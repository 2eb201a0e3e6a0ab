/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "trial/verify.h"
#include "store/store.h"
#include "trial/study.h"
#include <stdarg.h>
#include <stdio.h>
#include <string.h>
#include <strings.h>

struct verifying {
    const char *path;
    struct text *account;
    bool sound;
};

__attribute__((format(printf, 2, 3))) static void differs(struct verifying *verifying, const char *format, ...) {
    va_list arguments;
    va_start(arguments, format);
    char sentence[600];
    vsnprintf(sentence, sizeof sentence, format, arguments);
    va_end(arguments);
    text_format(verifying->account, "%s\n", sentence);
    verifying->sound = false;
}

static bool check_store(struct verifying *verifying, struct fault *fault) {
    struct store *store = store_open(verifying->path, true, fault);
    struct store_verdict verdict;
    bool read = store && store_verify(store, &verdict, fault);
    if (read && !verdict.sound) {
        differs(verifying, "%s", verdict.sentence);
    }
    store_close(store);
    return read;
}

/* The table of cells against the kept bytes read again. */
static bool check_cells(struct verifying *verifying, const struct frame *frame, const struct study_facts *facts, struct fault *fault) {
    struct store *store = store_open(verifying->path, true, fault);
    bool read = store != NULL;
    for (size_t f = 0; read && f < facts->file_count; f++) {
        const struct cells *cells = &frame->cells[f];
        struct store_table table = {cells->records, cells->columns, cells->names, cells->bytes, cells->start};
        bool same = true;
        size_t record = 0, column = 0;
        read = store_compare(store, (uint32_t)f + 1, &table, &same, &record, &column, fault);
        if (read && !same) {
            differs(verifying, "The table of cells differs from the kept bytes of %s, first at record %zu, column %zu.", facts->files[f].name,
                record + 1, column + 1);
        }
    }
    store_close(store);
    return read;
}

/* Decisions of one batch share a fingerprint: the one after the batch. */
static bool ends_batch(const struct frame *frame, size_t i) {
    const char *state = frame->decisions[i].state, *next = i + 1 < frame->version ? frame->decisions[i + 1].state : NULL;
    return state && (!next || strcmp(state, next) != 0);
}

static bool check_replay(struct verifying *verifying, struct study *study, const struct frame *frame, struct fault *fault) {
    struct frame *before = NULL;
    bool read = true;
    for (size_t i = 0; i < frame->version && verifying->sound && read; i++) {
        if (!ends_batch(frame, i)) {
            continue;
        }
        const struct plan *plan = study_plan_at(study, (uint32_t)i + 1, fault);
        struct frame *after = !plan ? NULL : frame_build(plan, frame->cells, frame->data_sha256, frame->letters, frame->decisions, i + 1, before,
            false, fault);
        read = after != NULL;
        if (read && strcmp(after->state_sha256, frame->decisions[i].state) != 0) {
            differs(verifying, "After decision %zu the values are not those that were recorded: the fingerprint is %.8s, recorded was %.8s.", i + 1,
                after->state_sha256, frame->decisions[i].state);
        }
        frame_release(before);
        before = after;
    }
    frame_release(before);
    return read;
}

static void check_head(struct verifying *verifying, const char *head, const char *expect) {
    if (expect && strcasecmp(head, expect) != 0) {
        differs(verifying, "The head of the record is %s, and not the one expected, %.64s: the record has grown, or it is another one.", head,
            expect);
    }
}

static bool check_study(struct verifying *verifying, const char *expect, struct fault *fault) {
    struct study *study = study_open(verifying->path, fault);
    struct frame *frame = study ? study_frame(study, fault) : NULL;
    bool read = frame != NULL;
    if (read) {
        struct study_facts facts;
        char head[HASH_SIZE];
        study_facts(study, &facts);
        study_head(study, frame->version, head);
        read = check_cells(verifying, frame, &facts, fault) && check_replay(verifying, study, frame, fault);
        check_head(verifying, head, expect);
        text_format(verifying->account, "%s: %u decisions, %zu file%s kept, head %s.\n", verifying->path, frame->version, facts.file_count,
            facts.file_count == 1 ? "" : "s", head);
    }
    frame_release(frame);
    study_close(study);
    return read;
}

bool study_verify(const char *path, const char *expect, bool *sound, struct text *account, struct fault *fault) {
    struct verifying verifying = {path, account, true};
    if (expect && (strlen(expect) != 64 || strspn(expect, "0123456789abcdefABCDEF") != 64)) {
        return fault_set(fault, FAULT_INPUT, "--expect takes the head as it was noted, 64 hexadecimal digits");
    }
    bool read = check_store(&verifying, fault);
    /* What the chain shows to be altered is not replayed: its values would only repeat the same finding. */
    read = read && (!verifying.sound || check_study(&verifying, expect, fault));
    text_string(account, !read ? "" : verifying.sound ?
        "Everything agrees: the kept bytes, the cells, the plan, the chain of decisions and looks, and every fingerprint on replay.\n"
        "What this cannot prove: who sat at the keyboard, and that the whole file was not made anew; for that compare the head "
        "with one noted elsewhere (--expect).\n" : "The file is not as it was recorded.\n");
    *sound = verifying.sound;
    return read;
}
