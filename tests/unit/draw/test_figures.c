/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Every figure on every example, in the page's and the meeting's size: well-formed as XML, no text upon another or over
 * an edge, none too small, every participant reachable. Text is taken to be 0.6 em a character wide and from 0.72 em
 * above its baseline to 0.18 em below. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <cmocka.h>

#include "draw/number.h"
#include "examples.h"
#include <ctype.h>
#include <stdio.h>
#include <string.h>

enum { DEPTH = 32, NAME = 32, WORDS = 2000 };

struct words {
    double left, top, right, bottom, size;
    char string[120];
};

struct reading {
    const char *at;
    char open[DEPTH][NAME];
    size_t depth, elements, participants;
    double width, height;
    struct words words[WORDS];
    size_t word_count;
    const char *wrong;
};

static bool wrong(struct reading *reading, const char *why) {
    reading->wrong = reading->wrong ? reading->wrong : why;
    return false;
}

/* A run of characters up to `end`: no "<", "&" only in one of the five entities XML has or a numeric one, no controls.
 */
static bool read_characters(struct reading *reading, char end, char *out, size_t room) {
    static const struct {
        const char *entity, *character;
    } entities[] = {{"&amp;", "&"}, {"&lt;", "<"}, {"&gt;", ">"}, {"&quot;", "\""}, {"&#39;", "'"}, {"&#10;", "\n"}};
    size_t used = 0;
    while (*reading->at && *reading->at != end) {
        const char *put = NULL;
        size_t take = 1;
        for (size_t i = 0; *reading->at == '&' && i < sizeof entities / sizeof *entities; i++) {
            if (strncmp(reading->at, entities[i].entity, strlen(entities[i].entity)) == 0) {
                put = entities[i].character;
                take = strlen(entities[i].entity);
            }
        }
        if ((*reading->at == '&' && !put) || *reading->at == '<' || (unsigned char)*reading->at < 0x20) {
            return wrong(reading, "a character that must be escaped");
        }
        if (used + 2 < room) {
            out[used++] = put ? *put : *reading->at;
        }
        reading->at += take;
    }
    out[used] = '\0';
    return *reading->at == end || wrong(reading, "an end that is missing");
}

static bool read_name(struct reading *reading, char name[NAME]) {
    size_t length = strspn(reading->at, "abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ0123456789-:");
    if (length == 0 || length >= NAME || !isalpha((unsigned char)*reading->at)) {
        return wrong(reading, "a name");
    }
    memcpy(name, reading->at, length);
    name[length] = '\0';
    reading->at += length;
    return true;
}

struct text_element {
    double x, y, size;
    char anchor[16];
};

static bool note_attribute(
    struct reading *reading, const char *element, const char *name, const char *value, struct text_element *text) {
    reading->participants += strcmp(name, "data-participant") == 0;
    if (strncmp(name, "on", 2) == 0 || strcmp(name, "style") == 0) {
        return wrong(reading, "an attribute the security policy forbids");
    }
    if (strcmp(element, "svg") == 0 && strcmp(name, "viewBox") == 0) {
        sscanf(value, "0 0 %lf %lf", &reading->width, &reading->height);
    }
    if (strcmp(value, "nan") == 0 || strstr(value, "inf")) {
        return wrong(reading, "a number that is none");
    }
    if (strcmp(element, "text") == 0) {
        text->x = strcmp(name, "x") == 0 ? strtod(value, NULL) : text->x;
        text->y = strcmp(name, "y") == 0 ? strtod(value, NULL) : text->y;
        text->size = strcmp(name, "font-size") == 0 ? strtod(value, NULL) : text->size;
        if (strcmp(name, "text-anchor") == 0) {
            snprintf(text->anchor, sizeof text->anchor, "%.15s", value);
        }
    }
    return true;
}

/* Attributes up to the end of a start tag; *empty when it closes itself. */
static bool read_attributes(struct reading *reading, const char *element, bool *empty, struct text_element *text) {
    char names[24][NAME], value[4000];
    size_t count = 0;
    while (*reading->at == ' ') {
        reading->at++;
        if (count == 24 || !read_name(reading, names[count]) || strncmp(reading->at, "=\"", 2) != 0) {
            return wrong(reading, "an attribute");
        }
        for (size_t i = 0; i < count; i++) {
            if (strcmp(names[i], names[count]) == 0) {
                return wrong(reading, "an attribute given twice");
            }
        }
        reading->at += 2;
        if (!read_characters(reading, '"', value, sizeof value) ||
            !note_attribute(reading, element, names[count], value, text)) {
            return false;
        }
        reading->at++;
        count++;
    }
    *empty = *reading->at == '/';
    reading->at += *empty;
    return *reading->at++ == '>' || wrong(reading, "an end of a tag");
}

static void keep_words(struct reading *reading, const struct text_element *text, const char *string) {
    if (reading->word_count == WORDS) {
        wrong(reading, "more text than the test holds");
        return;
    }
    struct words *words = &reading->words[reading->word_count++];
    double width = 0.6 * text->size * (double)number_columns(string);
    double back = strcmp(text->anchor, "end") == 0 ? 1.0 : strcmp(text->anchor, "middle") == 0 ? 0.5 : 0.0;
    words->left = text->x - back * width;
    words->right = words->left + width;
    words->top = text->y - 0.72 * text->size;
    words->bottom = text->y + 0.18 * text->size;
    words->size = text->size;
    snprintf(words->string, sizeof words->string, "%.119s", string);
}

static bool read_element(struct reading *reading) {
    char name[NAME];
    if (*reading->at == '/') {
        reading->at++;
        if (!read_name(reading, name) || reading->depth == 0 || strcmp(reading->open[reading->depth - 1], name) != 0) {
            return wrong(reading, "an end tag without its start");
        }
        reading->depth--;
        return *reading->at++ == '>' || wrong(reading, "an end tag");
    }
    struct text_element text = {0};
    bool empty;
    if (!read_name(reading, name) || !read_attributes(reading, name, &empty, &text)) {
        return false;
    }
    reading->elements++;
    if (empty) {
        return true;
    }
    if (reading->depth == DEPTH) {
        return wrong(reading, "more depth than the test holds");
    }
    snprintf(reading->open[reading->depth++], NAME, "%s", name);
    char string[2000];
    if (!read_characters(reading, '<', string, sizeof string)) {
        return false;
    }
    if (strcmp(name, "text") == 0) {
        keep_words(reading, &text, string);
    } else if (*string && strcmp(name, "title") != 0 && strcmp(name, "desc") != 0) {
        return wrong(reading, "words outside a text");
    }
    return true;
}

static bool read_svg(struct reading *reading, const char *svg) {
    *reading = (struct reading){.at = svg};
    while (*reading->at == '<') {
        reading->at++;
        if (!read_element(reading)) {
            return false;
        }
    }
    return (*reading->at == '\0' && reading->depth == 0) || wrong(reading, "something after the end");
}

static size_t check_words(const struct reading *reading, const char *name, double smallest) {
    size_t faults = 0;
    for (size_t i = 0; i < reading->word_count; i++) {
        const struct words *a = &reading->words[i];
        if (a->size < smallest || a->left < -1.0 || a->right > reading->width + 1.0 || a->top < -1.0 ||
            a->bottom > reading->height + 1.0) {
            print_message("%s: \"%s\" is too small or over an edge\n", name, a->string);
            faults++;
        }
        for (size_t j = i + 1; j < reading->word_count; j++) {
            const struct words *b = &reading->words[j];
            if (a->left < b->right && b->left < a->right && a->top < b->bottom && b->top < a->bottom) {
                print_message("%s: \"%s\" lies upon \"%s\"\n", name, a->string, b->string);
                faults++;
            }
        }
    }
    return faults;
}

/* The page; the page with a participant beside; the meeting view. */
static const struct {
    double width, drawn, smallest;
    bool meeting;
} sizes[] = {{0.0, FIGURE_WIDTH, 13.0, false}, {740.0, 740.0, 13.0, false}, {0.0, FIGURE_MEETING_WIDTH, 25.0, true}};

static void draw_example(const struct example *example, size_t size, struct text *out) {
    struct arena arena;
    arena_init(&arena);
    struct figure figure = {.id = "figure",
        .title = "Does the <change> differ & where?",
        .description = "Said \"so\".",
        .identity = "Quayside Walking Trial \u00b7 after decision 14 \u00b7 CODED",
        .width = sizes[size].width,
        .meeting = sizes[size].meeting};
    struct html html;
    html_init(&html, out);
    example->draw(&arena, &figure, &html);
    html_finish(&html);
    arena_release(&arena);
}

static void test_every_figure(void **state) {
    (void)state;
    struct reading *reading = memory_new(1, sizeof *reading);
    size_t faults = 0;
    for (size_t i = 0; i < EXAMPLES; i++) {
        for (size_t size = 0; size < 3; size++) {
            struct text out, again;
            text_init(&out);
            text_init(&again);
            draw_example(&examples[i], size, &out);
            draw_example(&examples[i], size, &again);
            assert_string_equal(out.data, again.data); /* nothing is left to chance */
            if (!read_svg(reading, out.data)) {
                print_message("%s: %s at: %.80s\n", examples[i].name, reading->wrong, reading->at);
                faults++;
            }
            assert_true(reading->width == sizes[size].drawn);
            faults += check_words(reading, examples[i].name, sizes[size].smallest);
            text_release(&out);
            text_release(&again);
        }
    }
    memory_free(reading);
    assert_int_equal(faults, 0);
}

/* Who is drawn can be opened, and nobody is left out: one mark for each point of the data. */
static const struct {
    const char *name;
    size_t participants;
} drawn[] = {{"boxes-sex", 4 * 61}, {"boxes-crowded", 2 * 2000}, {"boxes-awkward", 60 + 0 + 1 + 2 + 40},
    {"pairs-lines", 2 * 70}, {"pairs-scatter", 2 * 120}, {"histogram-both", 2 * 231}, {"estimates-effect", 1},
    {"flow-two", 0}};

static void test_participants(void **state) {
    (void)state;
    struct reading *reading = memory_new(1, sizeof *reading);
    for (size_t d = 0; d < sizeof drawn / sizeof *drawn; d++) {
        for (size_t i = 0; i < EXAMPLES; i++) {
            if (strcmp(examples[i].name, drawn[d].name) == 0) {
                struct text out;
                text_init(&out);
                draw_example(&examples[i], 0, &out);
                assert_true(read_svg(reading, out.data));
                assert_int_equal(reading->participants, drawn[d].participants);
                assert_non_null(strstr(out.data, drawn[d].participants ? "role=\"group\"" : "role=\"img\""));
                text_release(&out);
            }
        }
    }
    memory_free(reading);
}

static void test_words_of_a_point(void **state) {
    (void)state;
    const struct figure_point points[] = {{"Q2400", -41.2, true}, {"Q<1>", 3.0, false}};
    const struct boxes_row row = {.arm = "A",
        .mark = palette_arm(true, 0),
        .sentence = "Too few values for a box.",
        .points = points,
        .point_count = 2};
    const struct boxes_group group = {.rows = &row, .row_count = 1};
    const struct boxes boxes = {
        .axis = {.low = -20.0, .high = 20.0}, .decimals = 1, .groups = &group, .group_count = 1};
    const struct figure figure = {.id = "x", .title = "Change"};
    struct text out;
    text_init(&out);
    struct html html;
    html_init(&html, &out);
    boxes_svg(&boxes, &figure, &html);
    html_finish(&html);
    assert_non_null(strstr(out.data, "data-participant=\"Q2400\" tabindex=\"0\" role=\"button\" "
                                     "aria-label=\"Q2400, \u221241.2\""));
    assert_non_null(strstr(out.data, ">Q2400 \u221241.2</text>")); /* beyond the axis: named with its value */
    assert_non_null(strstr(out.data, "data-participant=\"Q&lt;1&gt;\""));
    text_release(&out);
}

/* The reader of the test has to find what it looks for. */
static void test_reader(void **state) {
    (void)state;
    static const char *const bad[] = {"<svg><g></svg>", "<svg a=\"1\" a=\"2\"/>", "<svg>a & b</svg>", "<svg x=\"<\"/>",
        "<svg/>x", "<svg><text style=\"x\">a</text></svg>", "<svg"};
    struct reading *reading = memory_new(1, sizeof *reading);
    for (size_t i = 0; i < sizeof bad / sizeof *bad; i++) {
        assert_false(read_svg(reading, bad[i]));
    }
    assert_true(read_svg(reading, "<svg viewBox=\"0 0 100 50\"><text x=\"1\" y=\"20\" font-size=\"13\">abc</text>"
                                  "<text x=\"20\" y=\"25\" font-size=\"13\">d</text></svg>"));
    assert_int_equal(check_words(reading, "expected", 13.0), 1);
    memory_free(reading);
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_reader),
        cmocka_unit_test(test_every_figure),
        cmocka_unit_test(test_participants),
        cmocka_unit_test(test_words_of_a_point),
    };
    return cmocka_run_group_tests_name("draw/figures", tests, NULL, NULL);
}
