/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The registry of exhibits: one numbered table or figure that answers one question is one row here and one file beside it.
 * The page, the HTTP routes, `evenhand exhibit`, the report, the help and the tests all come from this table. */
#ifndef EVENHAND_EXHIBITS_REGISTRY_H
#define EVENHAND_EXHIBITS_REGISTRY_H
#include "base/text.h"
#include "draw/figure.h"
#include "draw/html.h"
#include "draw/json.h"
#include "draw/table.h"
#include "trial/analysis.h"
#include "trial/study.h"

enum argument_kind {
    ARGUMENT_OUTCOME,      /* id of an outcome; default the primary */
    ARGUMENT_VARIABLE,     /* a column of the plan; default the first outcome's baseline */
    ARGUMENT_COVARIATE,    /* id of a covariate; default none */
    ARGUMENT_VISIT,        /* label of a visit of the outcome; default the primary visit */
    ARGUMENT_SET,          /* full or per-protocol */
    ARGUMENT_SCALE,        /* linear or log10; default the latest decision, else the plan */
    ARGUMENT_ARM,          /* a shown arm's code other than the reference; default the first */
    ARGUMENT_COVARIATES,   /* ids with commas between */
    ARGUMENT_PARTICIPANTS, /* identifiers with commas between */
    ARGUMENT_PARTICIPANT,  /* one identifier; required */
    ARGUMENT_WORD          /* one of `words` */
};

struct argument_rule {
    const char *name;
    enum argument_kind kind;
    const char *says;  /* one line for help */
    const char *words; /* ARGUMENT_WORD: the allowed ones, space-separated, the default first */
    bool tabs;         /* the page offers its values as tabs */
};

struct asked { /* one name=value as typed */
    const char *name, *value;
};

enum showing { SHOWN, SHOWN_AS_ONE_ARM, REFUSED }; /* while pooled */

struct view;
struct exhibit {
    const char *name;
    int item;            /* of the agenda, 1..9; 0: not on it (a participant's panel) */
    const char *title;   /* the question it answers */
    const char *tab;     /* short name on the page */
    const char *says;    /* one line for help */
    enum showing pooled; /* SHOWN_AS_ONE_ARM: arms are one, "all" */
    bool by_arm_look;    /* while coded, showing it is a look at an outcome by arm, entered in the table of looks */
    bool table_first;    /* the table is the exhibit; otherwise it stands behind a fold below the figure */
    bool (*applies)(const struct plan *plan); /* the page leaves it out of its tabs where false; NULL: always true */
    const char *method;  /* how it is computed, in words, with its sources */
    const struct argument_rule *arguments; /* ends with a NULL name */
    bool (*compute)(struct view *view, struct fault *fault);              /* fills view->result */
    void (*json)(const struct view *view, struct json *json);             /* its own fields; the head is common */
    void (*tables)(const struct view *view, struct table **tables, size_t *count); /* at most VIEW_TABLES */
    void (*figure)(const struct view *view, const struct figure *figure, struct html *html); /* NULL: none */
    void (*lead)(const struct view *view, struct html *html); /* the answer as a number in a sentence; NULL: none */
    void (*title_of)(const struct view *view, struct text *title); /* a title that names the outcome; NULL: title */
};
enum { VIEW_TABLES = 6, VIEW_NOTES = 24 };

extern const struct exhibit *const exhibits[]; /* in agenda order; ends with NULL */
const struct exhibit *exhibit_of(const char *name); /* or NULL */
int exhibit_number(const struct exhibit *exhibit);  /* its place within its item, from 1 */

/* One exhibit computed from one frame: arguments as understood, result, notes. Lives in its arena. */
struct view {
    const struct exhibit *exhibit;
    struct arena *arena;
    struct frame *frame, *received; /* borrowed */
    struct arms arms;
    struct study_facts facts;
    char head[HASH_SIZE]; /* of the chain at the frame's version */
    const struct asked *asked;
    size_t asked_count;
    int outcome, visit, covariate, variable, arm; /* NOWHERE where the exhibit takes none; visit indexes the outcome's */
    enum set set;
    enum scale scale;
    const char *title, *caption; /* caption: scale, unit, set, n ... one or two sentences; compute may set it */
    const char *notes[VIEW_NOTES];
    size_t note_count;
    void *result;
};

/* Understands the arguments, computes, and (by_arm_look while coded) enters the look. Fills the fault with a sentence:
 * FAULT_MISSING unknown exhibit or value, FAULT_INPUT an argument it does not take, FAULT_REFUSED by blinding. `by`: who looks. */
bool view_make(struct view *view, struct study *study, const char *exhibit, const struct asked *asked, size_t asked_count,
    const char *by, struct arena *arena, struct fault *fault);
void view_release(struct view *view); /* gives its frames back; the arena is the caller's */
const char *view_asked(const struct view *view, const char *name); /* as typed, or NULL */
void view_note(struct view *view, const char *format, ...) __attribute__((format(printf, 2, 3)));

/* The five renderings. svg false (and nothing written) where the exhibit has no figure. */
void view_text(const struct view *view, struct text *out);
void view_json(const struct view *view, struct text *out);
void view_csv(const struct view *view, struct text *out);
bool view_svg(const struct view *view, bool meeting, struct text *out);
void view_html(const struct view *view, bool meeting, struct text *out); /* a fragment: <article class="exhibit"> */

/* The agenda of the page as JSON: title, version, blinding, fingerprints, facts, items with what is open in each, exhibits with
 * number, tab, title; the decision kinds; nothing that names an arm while blinded. */
bool agenda_json(struct study *study, struct arena *arena, struct text *out, struct fault *fault);
void exhibits_help(struct text *out); /* `evenhand exhibits` */
#endif
