/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What the files of the guess share: names taken apart, and the words that names and values are held against. */
#ifndef EVENHAND_TRIAL_GUESS_PARTS_H
#define EVENHAND_TRIAL_GUESS_PARTS_H
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

/* Finds the series among columns whose values are numbers, and sets the columns' series. */
void guess_visits(struct guess *guess);
bool guess_says_yes(const char *text, struct arena *arena); /* "Y", "yes", "1", "true" */
bool guess_says_no(const char *text, struct arena *arena);
#endif
