/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/text.h"
#include "server/trial/guess-parts.h"
#include <string.h>

static bool is_digit(char c) {
    return c >= '0' && c <= '9';
}
static bool is_upper(char c) {
    return c >= 'A' && c <= 'Z';
}
static bool is_letter(char c) {
    return is_upper(c) || (c >= 'a' && c <= 'z') || (unsigned char)c >= 0x80;
}
static char lower(char c) {
    return is_upper(c) ? (char)(c - 'A' + 'a') : c;
}

static char *lowered(const char *text, size_t length, struct arena *arena) {
    char *copy = arena_bytes(arena, text, length);
    for (size_t i = 0; i < length; i++) {
        copy[i] = lower(copy[i]);
    }
    return copy;
}

void name_take(struct name_parts *parts, const char *name, struct arena *arena) {
    parts->count = 0;
    bool glued = false;
    for (const char *p = name; *p && parts->count < PART_MOST;) {
        if (!is_digit(*p) && !is_letter(*p)) {
            glued = false;
            p++;
            continue;
        }
        size_t length = 1;
        bool digits = is_digit(*p);
        while (p[length] && is_digit(p[length]) == digits && (digits || is_letter(p[length])) &&
               !(is_upper(p[length]) && !is_upper(p[length - 1]))) {
            length++;
        }
        parts->part[parts->count++] = (struct name_part){lowered(p, length, arena), digits, glued};
        glued = true;
        p += length;
    }
}

bool among(const char *text, const char *words) {
    size_t length = strlen(text);
    for (const char *word = words; *word;) {
        size_t span = strcspn(word, " ");
        if (span == length && memcmp(word, text, span) == 0) {
            return true;
        }
        word += span + (word[span] == ' ');
    }
    return false;
}

bool name_has(const struct name_parts *parts, const char *words) {
    for (size_t i = 0; i < parts->count; i++) {
        if (among(parts->part[i].text, words)) {
            return true;
        }
    }
    return false;
}

const char *folded(const char *text, struct arena *arena) {
    text += strspn(text, " \t\r\n");
    size_t length = strlen(text);
    while (length && strchr(" \t\r\n", text[length - 1])) {
        length--;
    }
    return lowered(text, length, arena);
}

/* Abbreviations as trials commonly use them. Units stand only where there is one that everybody uses. */
static const struct known_name known_names[] = {
    {"sbp systolic systolicbp sysbp", "Systolic blood pressure", "mmHg", false},
    {"dbp diastolic diastolicbp diabp", "Diastolic blood pressure", "mmHg", false},
    {"bp bloodpressure", "Blood pressure", "mmHg", false},
    {"hr heartrate pulse", "Heart rate", "beats/min", false},
    {"age agey ageyears ageyrs", "Age", "years", false},
    {"sex gender", "Sex", "", false},
    {"bmi", "Body mass index", "kg/m\u00B2", false},
    {"weight wt bodyweight", "Weight", "", false},
    {"height ht", "Height", "", false},
    {"site centre center clinic hospital siteid", "Site", "", false},
    {"uacr acr", "Urine albumin-to-creatinine ratio", "", false},
    {"egfr", "Estimated glomerular filtration rate", "", true},
    {"hba1c a1c", "HbA1c", "", false},
    {"chol cholesterol", "Cholesterol", "", false},
    {"ldl", "LDL cholesterol", "", false},
    {"hdl", "HDL cholesterol", "", true},
    {"crp", "C-reactive protein", "", false},
    {"fev1 fev", "Forced expiratory volume in 1 s", "", true},
    {"hb haemoglobin hemoglobin", "Haemoglobin", "", true},
    {"qol qualityoflife", "Quality of life", "", true},
    {"walk sixmwd smwd walkingdistance distance", "Walking distance", "", true},
    {"race ethnicity ethnic", "Ethnic group", "", false},
    {"rescue", "Rescue medication", "", false},
    {0},
};

const struct known_name *known_name_of(const char *stem) {
    for (const struct known_name *known = known_names; known->words; known++) {
        if (among(stem, known->words)) {
            return known;
        }
    }
    return NULL;
}

const char *name_words(const char *name, struct arena *arena) {
    char *plain = arena_new(arena, strlen(name) + 1, 1), *spaced = arena_text(arena, name);
    size_t used = 0, length = 0, letters = 0;
    for (const char *p = name; *p; p++) {
        if (is_digit(*p) || is_letter(*p)) {
            plain[used++] = lower(*p);
            spaced[length++] = *p;
            letters += is_letter(*p);
        } else if (length && spaced[length - 1] != ' ') {
            spaced[length++] = ' ';
        }
    }
    spaced[length - (length && spaced[length - 1] == ' ')] = '\0';
    const struct known_name *known = known_name_of(plain);
    if (known) {
        return known->label;
    }
    bool short_name = letters == used && used <= 3; /* "bdi" is BDI */
    for (char *p = spaced; *p && (short_name || p == spaced); p++) {
        *p = *p >= 'a' && *p <= 'z' ? (char)(*p - 'a' + 'A') : *p;
    }
    return *spaced ? spaced : name;
}

const char *name_id(const char *name, struct arena *arena) {
    char *id = arena_new(arena, strlen(name) + 3, 1);
    size_t used = 0;
    for (const char *p = name; *p; p++) {
        bool plain = is_digit(*p) || (is_letter(*p) && (unsigned char)*p < 0x80);
        if (plain) {
            id[used++] = lower(*p);
        } else if (used && id[used - 1] != '_') {
            id[used++] = '_';
        }
    }
    if (used && id[used - 1] == '_') {
        used--;
    }
    id[used] = '\0';
    return used ? id : "x";
}
