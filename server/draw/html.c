/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "draw/html.h"
#include "base/memory.h"
#include "draw/number.h"
#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <string.h>
#include <strings.h>

static const char *const void_tags[] = {
    "area", "base", "br", "col", "embed", "hr", "img", "input", "link", "meta", "param", "source", "track", "wbr"};

static bool is_void(const char *tag) {
    for (size_t i = 0; i < sizeof void_tags / sizeof *void_tags; i++) {
        if (strcmp(tag, void_tags[i]) == 0) {
            return true;
        }
    }
    return false;
}

void html_init(struct html *html, struct text *out) {
    *html = (struct html){.out = out};
}

void html_finish(const struct html *html) {
    BUG_IF(html->depth != 0);
}

/* Ends a start tag that was left open for attributes. */
static void begin_content(struct html *html) {
    if (html->opening) {
        text_literal(html->out, ">");
        html->opening = false;
    }
}

void html_open(struct html *html, const char *tag) {
    BUG_IF(html->depth == HTML_DEPTH);
    BUG_IF(strcmp(tag, "script") == 0 || strcmp(tag, "style") == 0);
    begin_content(html);
    BUG_IF(html->depth > 0 && !html->svg_depth && is_void(html->tags[html->depth - 1]));
    html->tags[html->depth++] = tag;
    if (!html->svg_depth && strcmp(tag, "svg") == 0) {
        html->svg_depth = html->depth;
    }
    text_literal(html->out, "<");
    text_string(html->out, tag);
    html->opening = true;
}

void html_close(struct html *html) {
    BUG_IF(html->depth == 0);
    const char *tag = html->tags[--html->depth];
    bool in_svg = html->svg_depth != 0;
    if (html->svg_depth > html->depth) {
        html->svg_depth = 0;
    }
    if (html->opening && (in_svg || is_void(tag))) {
        text_string(html->out, in_svg ? "/>" : ">");
        html->opening = false;
        return;
    }
    begin_content(html);
    if (!in_svg && is_void(tag)) {
        return;
    }
    text_literal(html->out, "</");
    text_string(html->out, tag);
    text_literal(html->out, ">");
}

/* What stands for a byte that cannot stand for itself; NULL when it can. U+FFFE and U+FFFF, which XML forbids too, are
 * noncharacters that intake never lets through. */
static const char *replacement(unsigned char byte, bool attribute) {
    switch (byte) {
    case '&':
        return "&amp;";
    case '<':
        return "&lt;";
    case '>':
        return "&gt;";
    case '"':
        return attribute ? "&quot;" : NULL;
    case '\'':
        return attribute ? "&#39;" : NULL;
    case '\t':
        return attribute ? "&#9;" : NULL;
    case '\n':
        return attribute ? "&#10;" : NULL;
    case '\r':
        return "&#13;";
    default:
        return byte < 0x20 ? "\ufffd" : NULL;
    }
}

static void escaped(struct text *out, const char *string, bool attribute) {
    const char *plain = string;
    for (const char *at = string; *at; at++) {
        const char *instead = replacement((unsigned char)*at, attribute);
        if (instead) {
            text_append(out, plain, (size_t)(at - plain));
            text_string(out, instead);
            plain = at + 1;
        }
    }
    text_string(out, plain);
}

void html_attribute(struct html *html, const char *name, const char *value) {
    BUG_IF(!html->opening);
    BUG_IF(strcasecmp(name, "style") == 0 || strncasecmp(name, "on", 2) == 0);
    if (!value) {
        return;
    }
    text_literal(html->out, " ");
    text_string(html->out, name);
    text_literal(html->out, "=\"");
    escaped(html->out, value, true);
    text_literal(html->out, "\"");
}

void html_number_attribute(struct html *html, const char *name, double value) {
    BUG_IF(!isfinite(value));
    char form[400];
    snprintf(form, sizeof form, "%.2f", value);
    size_t length = strlen(form);
    while (form[length - 1] == '0') {
        form[--length] = '\0';
    }
    if (form[length - 1] == '.') {
        form[--length] = '\0';
    }
    html_attribute(html, name, strcmp(form, "-0") == 0 ? "0" : form);
}

void html_flag(struct html *html, const char *name) {
    BUG_IF(!html->opening || html->svg_depth);
    text_literal(html->out, " ");
    text_string(html->out, name);
}

void html_text(struct html *html, const char *string) {
    if (!string) {
        return;
    }
    begin_content(html);
    BUG_IF(html->depth > 0 && !html->svg_depth && is_void(html->tags[html->depth - 1]));
    escaped(html->out, string, false);
}

void html_format(struct html *html, const char *format, ...) {
    va_list arguments;
    va_start(arguments, format);
    char *string = NULL;
    int length = vasprintf(&string, format, arguments);
    va_end(arguments);
    BUG_IF(length < 0);
    html_text(html, string);
    memory_free(string);
}

void html_number(struct html *html, double value, int decimals, bool with_sign) {
    begin_content(html);
    number_shown(html->out, value, decimals, with_sign);
}

void html_element(struct html *html, const char *tag, const char *class_name, const char *string) {
    html_open(html, tag);
    html_attribute(html, "class", class_name);
    html_text(html, string);
    html_close(html);
}
