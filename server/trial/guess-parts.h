/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What the files of the guess share: names taken apart, and the words that names and values are held against. */
#ifndef EVENHAND_TRIAL_GUESS_PARTS_H
#define EVENHAND_TRIAL_GUESS_PARTS_H
#include "intake/number.h"
#include "trial/guess.h"

/* A name in parts, lower-case: "Week8.SBP" -> week 8 sbp; cut at signs, between letters and digits, and at capitals. */
enum { PART_MOST = 24 };
struct name_part {
    const char *text;
    bool digits;
    bool glued; /* no sign stands before it */
};
struct name_parts {
    struct name_part part[PART_MOST];
    size_t count;
};
void name_take(struct name_parts *parts, const char *name, struct arena *arena);
bool name_has(const struct name_parts *parts, const char *words); /* any part among the space-separated words */

/* Trimmed of ASCII space and in ASCII lower case. */
const char *folded(const char *text, struct arena *arena);
bool among(const char *text, const char *words); /* text is one of the space-separated words */

/* What a quantity's name says about it, from common abbreviations. */
struct known_name {
    const char *words, *label, *unit;
    bool higher_is_better;
};
const struct known_name *known_name_of(const char *stem); /* stem in lower case without signs; or NULL */
/* Words for a name or stem: known ones, else the name with spaces and a capital. */
const char *name_words(const char *name, struct arena *arena);
/* A short identifier of lower-case letters, digits and underscores. */
const char *name_id(const char *name, struct arena *arena);

/* ---- one column while it is looked at ---- */

struct look_value { /* a distinct text */
    struct guess_value value;
    size_t first; /* place among the distinct texts, in order of appearance */
    double number;
    enum number_reading reading;
    bool sentinel; /* has the shape of a code for missing */
};

struct look {
    const struct cells *cells;
    struct guess *guess;
    struct guess_column *column;
    size_t index, file; /* of the column in its own file; of that file */
    struct name_parts parts;
    struct look_value *values; /* all distinct texts, the most frequent first */
    size_t value_count, dates;
    bool numeric;
};
bool look_names_site(const struct look *look);
/* How much a name speaks of a participant's identifier: 0 not at all, 3 weakly, 6 plainly, one more ending in "id". */
int look_names_participant(const struct look *look);
/* The column of one file that identifies a participant by its name and by being different in every record, or NOWHERE.
 */
int guess_identifier(const struct look *looks, size_t count);
int guess_arm_score(const struct look *look); /* 0: cannot be the arm */
bool text_is_blank(const char *text);

/* ---- layouts, see guess-layout.c ---- */

/* How a column called `name` ("" for none) with this code says a time; false where it says none. The order is that of
 * the codes of a visit column and of names of columns alike. */
bool visit_code_read(const char *name, const char *code, struct arena *arena, double *order, const char **label);
bool visit_code_is_screening(double order);
bool visit_code_is_baseline(double order);
/* Settles layout, identifier, visit column and codes of every file, and which file is first; then what varies by visit.
 */
void guess_layouts(
    struct guess *guess, const struct guess_source *sources, struct look *looks); /* sets role and varies too */
/* Series of what was measured at several visits of files with one row per visit, after guess_visits. */
void guess_visit_columns(struct guess *guess, struct look *looks);
void guess_add_series(struct guess *guess, struct guess_series series); /* sets the columns' series and a free id */

/* Finds the series among columns whose values are numbers, and sets the columns' series. */
void guess_visits(struct guess *guess);
bool guess_says_yes(const char *text, struct arena *arena); /* "Y", "yes", "1", "true" */
bool guess_says_no(const char *text, struct arena *arena);
#endif
