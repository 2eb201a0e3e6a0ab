/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A streaming writer of HTML (the living standard's syntax) and of SVG as XML, over a text. Every tag opened is
 * closed by html_close, void elements too (they get no end tag). Within <svg> an element without content closes
 * itself, so that the same bytes stand in a page and as a file. The page's content security policy allows no inline
 * style or script: a `style` or `on...` attribute and a <script> or <style> element are programmer errors and stop
 * the program, as is any misuse. Tag and attribute names are borrowed literals; values and text are escaped here.
 * Characters XML forbids are written as U+FFFD. One writer belongs to one thread. */
#ifndef EVENHAND_DRAW_HTML_H
#define EVENHAND_DRAW_HTML_H
#include "base/text.h"
#include <stdbool.h>
#include <stdint.h>

enum { HTML_DEPTH = 48 };

struct html {
    struct text *out;
    size_t depth;
    const char *tags[HTML_DEPTH];
    size_t svg_depth; /* depth at which <svg> was opened, 0 outside */
    bool opening;     /* the last start tag still takes attributes */
};

void html_init(struct html *html, struct text *out);
void html_finish(const struct html *html); /* stops the program when something is open still */

void html_open(struct html *html, const char *tag);
void html_close(struct html *html);
/* The next three are valid right after html_open only. A NULL value leaves the attribute out. */
void html_attribute(struct html *html, const char *name, const char *value);
void html_number_attribute(struct html *html, const char *name, double value); /* at most 2 decimals; finite */
void html_flag(struct html *html, const char *name);                           /* an attribute without value: hidden */
void html_text(struct html *html, const char *string);                         /* NULL writes nothing */
void html_format(struct html *html, const char *format, ...) __attribute__((format(printf, 2, 3)));
void html_number(struct html *html, double value, int decimals, bool with_sign); /* see number_shown */

/* open, class unless NULL, text, close. */
void html_element(struct html *html, const char *tag, const char *class_name, const char *string);
#endif
