/* SPDX-License-Identifier: GPL-3.0-or-later */
/* An open study: store + cells + plan + record + the current frame. Safe for many threads: one mutex inside. */
#ifndef EVENHAND_TRIAL_STUDY_H
#define EVENHAND_TRIAL_STUDY_H
#include "base/text.h"
#include "trial/checks.h"
#include "trial/frame.h"

struct study;
#define ANY_VERSION UINT32_MAX

/* Makes a study file from received bytes and a plan; the plan's missing codes become the first decisions. Refuses to
 * overwrite. `account` gets a short account of what was read, for a person (may be NULL). */
bool study_create(const char *path, const char *data_name, const char *data, size_t data_length, const char *plan_name,
    const char *plan, size_t plan_length, const char *by, struct text *account, struct fault *fault);
/* The same from several files, matched to the plan's "files" by name where the plan gives names, else in order. */
struct study_file {
    const char *name, *bytes;
    size_t length;
};
bool study_create_from(const char *path, const struct study_file *files, size_t count, const char *plan_name, const char *plan,
    size_t plan_length, const char *by, struct text *account, struct fault *fault);
struct study *study_open(const char *path, struct fault *fault);
void study_close(struct study *study); /* no frame of it may be in use */

const char *study_path(const struct study *study);
const struct plan *study_plan(const struct study *study); /* as loaded */
/* The plan in force after decision `version`: as loaded, with the amendments that stood then. Lives as long as the study. NULL and a
 * fault where it cannot be put together. */
const struct plan *study_plan_at(struct study *study, uint32_t version, struct fault *fault);
/* The current frame, rebuilt first if another process has decided; release it with frame_release. NULL and a fault on failure. */
struct frame *study_frame(struct study *study, struct fault *fault);
/* The frame after the decisions entered at load; release it. */
struct frame *study_received_frame(struct study *study);
/* Records a batch, all or none, durable before it returns. version_seen ANY_VERSION: whatever is current. FAULT_CONFLICT where
 * the study has moved past version_seen. fault.row: 1-based entry of the batch. *version: the study's after it. */
bool study_decide(struct study *study, const char *by, const char *json, size_t length, const char *name,
    uint32_t version_seen, uint32_t *version, struct fault *fault);
/* Enters a look at an outcome by coded arm in the table of looks. */
bool study_look(struct study *study, const struct frame *frame, const char *exhibit, const char *arguments, const char *by,
    struct fault *fault);

struct study_file_facts {
    const char *id; /* in the plan, NULL where it has no "files" */
    const char *name, *sha256, *encoding, *delimiter;
    size_t length, records, columns;
};
struct study_facts { /* for the identifying line; texts live as long as the study */
    const char *data_name, *received_at, *data_sha256, *encoding, *delimiter; /* of several files: names with
                               commas between, the fingerprint of the list of fingerprints, the first file's encoding */
    size_t data_length;    /* of all */
    struct study_file_facts *files;
    size_t file_count;
};
void study_facts(struct study *study, struct study_facts *facts);
/* The head of the chain at a version (64 hexadecimal digits). */
void study_head(struct study *study, uint32_t version, char head[HASH_SIZE]);
#endif
