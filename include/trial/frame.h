/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The frame: the immutable, typed, columnar picture of the data at one version = cells as received + plan + replay of the
 * record. Columns are shared between versions that do not touch them. Participants stand in byte order of their
 * identifiers. Reference-counted; read-only once built, so any number of threads may read it. */
#ifndef EVENHAND_TRIAL_FRAME_H
#define EVENHAND_TRIAL_FRAME_H
#include "base/hash.h"
#include "intake/cells.h"
#include "trial/dates.h"
#include "trial/plan.h"
#include "trial/record.h"
#include <stdatomic.h>

enum cell_state { /* why a value is missing */
    CELL_OBSERVED,
    CELL_BLANK,
    CELL_MISSING_CODE,
    CELL_UNREADABLE,
    CELL_BELOW_LIMIT,
    CELL_ABOVE_LIMIT,
    CELL_SET_MISSING,
    CELL_AFTER_EVENT,
    CELL_HELD_ASIDE,
    CELL_STATE_COUNT
};
const char *cell_state_name(enum cell_state state);  /* "missing-code" */
const char *cell_state_words(enum cell_state state); /* "code for missing" */

struct column {
    atomic_uint references;
    struct arena arena;
    const struct cells *cells; /* of the file it lives in; borrowed. NULL where it is computed */
    const char **texts;        /* [participants] computed: the value as shown, NULL where there is none; else NULL */
    size_t index;              /* column of those cells */
    size_t file;               /* of the plan's files */
    size_t slot;               /* which of a participant's records it is read from: frame.place[slot] */
    enum variable_kind kind;
    const char **changed; /* [records] current text (NULL: set missing), where any cell has changed; else NULL: as received */
    uint32_t *origin;     /* [records] number of the decision that made it, 0: as received; NULL like changed */
    double *number;       /* [participants] numbers, dates (as days): the value, NaN unless observed */
    double *limit;        /* [participants] numbers: the limit where below or above one, else NaN; NULL where there is none */
    int32_t *level;       /* [participants] categories, events (0 no, 1 yes), arm: index of the level, NOWHERE if missing */
    unsigned char *state; /* [participants] enum cell_state */
    struct level *levels; /* categories and arm: the plan's, then unlisted codes as they stand, in byte order */
    size_t level_count, listed_count;
    int decimals; /* numbers: most decimals written in an observed cell */
    char hash[HASH_SIZE];
};

#define NO_RECORD ((size_t)-1)
#define HELD_RECORD ((size_t)-2) /* in frame.place: several records, and none kept yet */
struct participant {
    const char *id;
    size_t record;       /* 0-based record of the first file in force, or NO_RECORD while held aside */
    size_t record_count; /* how many records bear this identifier; with one row per visit 1 */
    size_t first, total; /* their records of the first file: frame.order[first ...], one row per visit: of all visits */
    bool excluded_full, excluded_per_protocol;
};

/* How a file's records fit the participants of the first file; counts of records but for `doubled`. */
struct join {
    size_t matched;   /* of a participant of the first file (and a planned visit) */
    size_t blank;     /* without an identifier */
    size_t unmatched; /* of an identifier that the first file does not have */
    size_t unplanned; /* of a visit that is not among the codes */
    size_t doubled;   /* participants and visits with several records, none kept yet */
    /* where visits are found by date (plan_file.window); `unplanned` are then those outside every window: */
    size_t undated;   /* without a readable date, or of a participant without a date of randomisation */
    size_t farther;   /* in a window, but another record is nearer to the target day */
    size_t ties;      /* equally near to two target days, or two records equally near to one: the later was taken */
};

struct frame {
    atomic_uint references;
    struct arena arena;
    uint32_t version;
    const struct plan *plan;     /* borrowed from the study, as are cells, letters and data_sha256 */
    const struct cells *cells;   /* [plan->file_count] */
    struct decision *decisions;  /* [version], a copy of the list; texts are borrowed */
    const bool *stands;          /* [version] which decisions stand */
    struct participant *participants;
    size_t participant_count;
    size_t held_aside;           /* records held aside: repeated, or without an identifier */
    struct column **columns;     /* [plan->variable_count], same order */
    struct column *arm;          /* NULL where the plan has none */
    struct column *site;         /* NULL where the plan names none; a variable's own where it is one */
    struct column *identifier;   /* of the first file; texts only, as are the next two */
    struct column **identifiers; /* [files] identifiers[0] == identifier */
    struct column **visits;      /* [files] visit codes; NULL where a file has one row per participant */
    struct column **windows;     /* [files] texts of plan_file.window, NULL where there is none */
    size_t *order;               /* 0-based records of the first file by participant, then as in the file */
    int32_t **owner;             /* [files][records] participant of each record, NOWHERE where none; NULL for a first file with
                                    one row per participant */
    size_t **dated;              /* [files][records] slot by date, NO_RECORD in no window; NULL where codes say the visit */
    size_t **place;              /* [slots][participants] 0-based record of the slot's file, NO_RECORD or HELD_RECORD */
    struct join *joins;          /* [files] */
    size_t roster;               /* records that stand for participants in the first file: all of them, or with one row per
                                    visit one for each identifier */
    enum scale *scales;          /* [outcomes] latest decision, else the plan */
    bool *flagged;               /* [outcomes * participants] */
    enum blinding blinding;
    const unsigned char *letters; /* letters[level of arm] = 0 for A, 1 for B ... */
    bool locked;
    const char *data_sha256;
    char state_sha256[HASH_SIZE];
};

/* Builds the frame after `count` decisions over `cells` (one for each file of the plan, in its order); `previous` (may be NULL) lends columns that nothing has touched. With `check`
 * (which needs previous) decisions beyond previous->version are held against the data on the way: a `from` that is not the
 * current text, an unknown column or participant, a lock ... are refused, the position among the new ones in fault.row.
 * Texts of decisions, plan, cells and letters are borrowed and must outlive the frame. */
struct frame *frame_build(const struct plan *plan, const struct cells *cells, const char *data_sha256,
    const unsigned char *letters, const struct decision *decisions, size_t count, struct frame *previous, bool check,
    struct fault *fault);
struct frame *frame_retain(struct frame *frame);
void frame_release(struct frame *frame); /* NULL is fine */

/* The participant's index by binary search, or NOWHERE. */
int frame_participant(const struct frame *frame, const char *id);
/* Current text of a column of a file in a 0-based record: NULL where set missing. */
static inline const char *column_text(const struct frame *frame, const struct column *column, size_t record) {
    (void)frame;
    return column->changed ? column->changed[record] : cells_at(column->cells, record, column->index);
}
/* The record a participant's value of a column is read from, NO_RECORD (no such visit) or HELD_RECORD. */
static inline size_t frame_place(const struct frame *frame, const struct column *column, size_t participant) {
    return frame->participants[participant].record == NO_RECORD ? HELD_RECORD : frame->place[column->slot][participant];
}
/* The text as received, NULL where the participant has no record to read it from, and of what is computed. */
const char *frame_received(const struct frame *frame, const struct column *column, size_t participant);
/* Current text of a column for a participant: NULL where set missing, held aside or without a record of the visit. Of a computed
 * value the text it is shown with. */
const char *frame_text(const struct frame *frame, const struct column *column, size_t participant);
/* The slot that a file's record speaks of, by its visit's code or date; NO_RECORD where of no planned visit. */
size_t frame_slot_of_record(const struct frame *frame, size_t file, size_t record);
/* The participant's site as it now reads, NULL where the plan has none or it is not known. */
const char *frame_site(const struct frame *frame, size_t participant);
/* The order in which a date's column is read for a site: the last decision that stands, else the plan. */
enum date_order frame_date_order(const struct frame *frame, const char *column, size_t file, const char *site);
/* The frame's column of that name (variable, arm, identifier) or NULL. */
const struct column *frame_column(const struct frame *frame, const char *name);
/* The 0-based records of the first file that bear a participant's identifier, in file order: at most `room` are written; returns how many. */
size_t frame_records(const struct frame *frame, size_t participant, size_t *records, size_t room);
/* The same of the file, and where it has one row per visit the visit, that a slot of the plan is. */
size_t frame_slot_records(const struct frame *frame, size_t slot, size_t participant, size_t *records, size_t room);
#endif
