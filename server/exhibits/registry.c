/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "exhibits/registry.h"
#include "exhibits/list.h"
#include <stdarg.h>
#include <stdio.h>
#include <string.h>

/* In agenda order. To add an exhibit: its file beside this one, its line in list.h, its row here. */
const struct exhibit *const exhibits[] = {
    &exhibit_columns,
    &exhibit_flow,
    &exhibit_baseline,
    &exhibit_sites,
    &exhibit_derived,
    &exhibit_dates,
    &exhibit_discrepancies,
    &exhibit_missing_grid,
    &exhibit_missing_by_arm,
    &exhibit_events,
    &exhibit_distribution,
    &exhibit_before_after,
    &exhibit_change_by_arm,
    &exhibit_effect,
    &exhibit_decisions,
    &exhibit_deviations,
    &exhibit_participant,
    NULL,
};

const struct exhibit *exhibit_of(const char *name) {
    for (size_t i = 0; exhibits[i]; i++) {
        if (strcmp(exhibits[i]->name, name) == 0) {
            return exhibits[i];
        }
    }
    return NULL;
}

int exhibit_number(const struct exhibit *exhibit) {
    int number = 0;
    for (size_t i = 0; exhibits[i]; i++) {
        number += exhibits[i]->item == exhibit->item;
        if (exhibits[i] == exhibit) {
            break;
        }
    }
    return number;
}

void exhibits_help(struct text *out) {
    for (size_t i = 0; exhibits[i]; i++) {
        text_format(out, "%s  %s\n", exhibits[i]->name, exhibits[i]->says);
        for (const struct argument_rule *rule = exhibits[i]->arguments; rule->name; rule++) {
            text_format(out, "    %s=  %s\n", rule->name, rule->says);
        }
    }
}

/* ---- understanding arguments ---- */

const char *view_asked(const struct view *view, const char *name) {
    for (size_t i = 0; i < view->asked_count; i++) {
        if (strcmp(view->asked[i].name, name) == 0) {
            return view->asked[i].value;
        }
    }
    return NULL;
}

void view_note(struct view *view, const char *format, ...) {
    va_list arguments;
    va_start(arguments, format);
    char note[480];
    vsnprintf(note, sizeof note, format, arguments);
    va_end(arguments);
    BUG_IF(view->note_count == VIEW_NOTES);
    view->notes[view->note_count++] = arena_text(view->arena, note);
}

static bool no_such(struct view *view, const char *argument, const char *value, const char *allowed, struct fault *fault) {
    return fault_set(fault, FAULT_MISSING, "%s: %s=%.60s is not known; it takes %s", view->exhibit->name, argument, value, allowed);
}

/* "sbp, uacr": for sentences. */
static const char *listed_ids(struct view *view, const struct argument_rule *rule) {
    const struct plan *plan = view->frame->plan;
    struct text text;
    text_init(&text);
    size_t count = rule->kind == ARGUMENT_OUTCOME                                        ? plan->outcome_count :
        rule->kind == ARGUMENT_VARIABLE                                                  ? plan->variable_count :
        rule->kind == ARGUMENT_COVARIATE || rule->kind == ARGUMENT_COVARIATES            ? plan->covariate_count :
        rule->kind == ARGUMENT_VISIT                                                     ? plan->outcomes[view->outcome].visit_count :
        rule->kind == ARGUMENT_ARM                                                       ? view->arms.count :
                                                                                           0;
    for (size_t i = 0; i < count; i++) {
        const char *id = rule->kind == ARGUMENT_OUTCOME   ? plan->outcomes[i].id :
            rule->kind == ARGUMENT_VARIABLE               ? plan->variables[i].column :
            rule->kind == ARGUMENT_VISIT                  ? plan->outcomes[view->outcome].visits[i].label :
            rule->kind == ARGUMENT_ARM                    ? view->arms.arm[i].code :
                                                            plan->covariates[i].id;
        text_format(&text, "%s%s", i ? ", " : "", id);
    }
    const char *list = *text.data ? arena_text(view->arena, text.data) : rule->words ? rule->words : rule->says;
    text_release(&text);
    return list;
}

static int visit_of(const struct outcome *outcome, const char *label) {
    for (size_t i = 0; i < outcome->visit_count; i++) {
        if (strcmp(outcome->visits[i].label, label) == 0) {
            return (int)i;
        }
    }
    return NOWHERE;
}

static int arm_of(const struct arms *arms, const char *code) {
    for (size_t i = 0; i < arms->count; i++) {
        if (strcmp(arms->arm[i].code, code) == 0 && i != arms->reference) {
            return (int)i;
        }
    }
    return NOWHERE;
}

static bool word_listed(const char *words, const char *word) {
    size_t length = strlen(word);
    for (const char *at = words; *at; at += strcspn(at, " "), at += *at == ' ') {
        if (strcspn(at, " ") == length && memcmp(at, word, length) == 0) {
            return true;
        }
    }
    return false;
}

static bool refuse_hidden(const struct view *view, const char *argument, struct fault *fault) {
    return fault_set(fault, FAULT_REFUSED, "%s: what %s= asks for would tell the arms apart, so it is hidden while the study is %s",
        view->exhibit->name, argument, blinding_name(view->frame->blinding));
}

static bool understand(struct view *view, const struct argument_rule *rule, const char *value, struct fault *fault) {
    const struct plan *plan = view->frame->plan;
    int found = 0;
    switch (rule->kind) {
    case ARGUMENT_OUTCOME:
        found = view->outcome = value ? plan_outcome(plan, value) : (int)plan->primary;
        break;
    case ARGUMENT_VARIABLE:
        if (value && arms_hide_column(view->frame, value)) {
            return refuse_hidden(view, rule->name, fault);
        }
        found = view->variable = value ? plan_variable(plan, value) : plan->outcomes[plan->primary].visits[0].variable;
        break;
    case ARGUMENT_COVARIATE:
        found = value ? plan_covariate(plan, value) : NOWHERE;
        view->covariate = found;
        if (found != NOWHERE && arms_hide_column(view->frame, plan->covariates[found].column)) {
            return refuse_hidden(view, rule->name, fault);
        }
        found = value ? found : 0;
        break;
    case ARGUMENT_VISIT:
        found = view->visit = value ? visit_of(&plan->outcomes[view->outcome], value) :
                                      (int)plan->outcomes[view->outcome].primary_visit;
        break;
    case ARGUMENT_SET:
        found = !value || strcmp(value, "full") == 0 || strcmp(value, "per-protocol") == 0 ? 0 : NOWHERE;
        view->set = value && strcmp(value, "per-protocol") == 0 ? SET_PER_PROTOCOL : SET_FULL;
        break;
    case ARGUMENT_SCALE:
        view->scale = view->outcome != NOWHERE ? view->frame->scales[view->outcome] : SCALE_LINEAR;
        found = !value || scale_read(value, &view->scale) ? 0 : NOWHERE;
        break;
    case ARGUMENT_ARM:
        found = view->arm = value ? arm_of(&view->arms, value) : view->arms.reference == 0 ? 1 : 0;
        break;
    case ARGUMENT_PARTICIPANT:
        found = value ? frame_participant(view->frame, value) : NOWHERE;
        if (found == NOWHERE) {
            return fault_set(fault, value ? FAULT_MISSING : FAULT_INPUT, "%s: %s%s; say participant=IDENTIFIER as the file has it",
                view->exhibit->name, value ? "no participant bears the identifier " : "it needs a participant", value ? value : "");
        }
        break;
    case ARGUMENT_WORD:
        found = !value || word_listed(rule->words, value) ? 0 : NOWHERE;
        break;
    case ARGUMENT_COVARIATES:
    case ARGUMENT_PARTICIPANTS:
        break; /* the exhibit takes its list apart itself */
    }
    return found != NOWHERE || no_such(view, rule->name, value, listed_ids(view, rule), fault);
}

static bool understand_all(struct view *view, struct fault *fault) {
    view->outcome = view->visit = view->covariate = view->variable = view->arm = NOWHERE;
    for (size_t i = 0; i < view->asked_count; i++) {
        bool known = false;
        for (const struct argument_rule *rule = view->exhibit->arguments; rule->name && !known; rule++) {
            known = strcmp(rule->name, view->asked[i].name) == 0;
        }
        if (!known) {
            return fault_set(fault, FAULT_INPUT, "%s does not take %.60s=; `evenhand exhibits` lists what each exhibit takes",
                view->exhibit->name, view->asked[i].name);
        }
        for (size_t j = 0; j < i; j++) {
            if (strcmp(view->asked[j].name, view->asked[i].name) == 0) {
                return fault_set(fault, FAULT_INPUT, "%s: %.60s= is given twice; say it once", view->exhibit->name, view->asked[i].name);
            }
        }
    }
    for (const struct argument_rule *rule = view->exhibit->arguments; rule->name; rule++) {
        const char *value = view_asked(view, rule->name);
        if (!understand(view, rule, value && *value ? value : NULL, fault)) {
            return false;
        }
    }
    return true;
}

/* ---- making a view ---- */

static bool showable(const struct view *view, struct fault *fault) {
    if (view->arms.pooled && view->exhibit->pooled == REFUSED) {
        return view->frame->arm ?
            fault_set(fault, FAULT_REFUSED, "%s compares the arms and is not shown while the study is pooled; a decision to unblind opens it",
                view->exhibit->name) :
            fault_set(fault, FAULT_REFUSED, "%s compares the arms, and this plan has no arm", view->exhibit->name);
    }
    return true;
}

/* Nothing changes silently: whatever shows data or results under an amended plan says so. */
static void note_amendments(struct view *view) {
    enum { RECORD = 9 };
    const struct frame *frame = view->frame;
    struct text numbers;
    text_init(&numbers);
    size_t count = 0, late = 0;
    for (size_t i = 0; i < frame->version; i++) {
        const struct decision *decision = &frame->decisions[i];
        if (frame->stands[i] && decision->kind == DECISION_AMEND_PLAN) {
            text_format(&numbers, "%s%u", count++ ? ", " : "", decision->number);
            late += decision->blinding && strcmp(decision->blinding, blinding_name(BLINDING_UNBLINDED)) == 0;
        }
    }
    if (count && view->exhibit->item && view->exhibit->item != RECORD && view->note_count < VIEW_NOTES) {
        view_note(view, "The plan was amended (decision%s %.200s)%s.", count == 1 ? "" : "s", numbers.data,
            late ? count == 1 ? ", after unblinding" : ", partly or wholly after unblinding" : "");
    }
    text_release(&numbers);
}

static const char *asked_text(const struct view *view) {
    struct text text;
    text_init(&text);
    for (size_t i = 0; i < view->asked_count; i++) {
        text_format(&text, "%s%s=%s", i ? " " : "", view->asked[i].name, view->asked[i].value);
    }
    const char *copy = arena_text(view->arena, text.data);
    text_release(&text);
    return copy;
}

bool view_make(struct view *view, struct study *study, const char *name, const struct asked *asked, size_t asked_count,
    const char *by, struct arena *arena, struct fault *fault) {
    *view = (struct view){.arena = arena, .asked = asked, .asked_count = asked_count, .exhibit = exhibit_of(name)};
    if (!view->exhibit) {
        return fault_set(fault, FAULT_MISSING, "there is no exhibit \"%.60s\"; `evenhand exhibits` lists them", name);
    }
    view->frame = study_frame(study, fault);
    if (!view->frame) {
        return false;
    }
    view->received = study_received_frame(study);
    study_facts(study, &view->facts);
    study_head(study, view->frame->version, view->head);
    arms_shown(view->frame, arena, &view->arms);
    bool done = showable(view, fault) && understand_all(view, fault) && view->exhibit->compute(view, fault);
    if (done && view->exhibit->by_arm_look && view->arms.coded) {
        done = study_look(study, view->frame, name, asked_text(view), by && *by ? by : "not said", fault);
    }
    if (done) {
        note_amendments(view);
    }
    if (done && !view->title) {
        view->title = view->exhibit->title;
        if (view->exhibit->title_of) {
            struct text title;
            text_init(&title);
            view->exhibit->title_of(view, &title);
            view->title = arena_text(arena, title.data);
            text_release(&title);
        }
    }
    if (!done) {
        view_release(view);
    }
    return done;
}

void view_release(struct view *view) {
    frame_release(view->frame);
    frame_release(view->received);
    view->frame = view->received = NULL;
}

/* ---- renderings ---- */

static const char *state_word(enum blinding blinding) {
    static const char *const words[] = {"POOLED", "CODED", "UNBLINDED"};
    return words[blinding];
}

static const char *identity(const struct view *view) {
    return arena_format(view->arena, "%s · after decision %u · %.8s · %s", view->frame->plan->title, view->frame->version,
        view->frame->state_sha256, state_word(view->frame->blinding));
}

/* What an argument came to mean, as the contract's words; NULL where none. */
static const char *argument_value(const struct view *view, const struct argument_rule *rule) {
    const struct plan *plan = view->frame->plan;
    switch (rule->kind) {
    case ARGUMENT_OUTCOME:
        return plan->outcomes[view->outcome].id;
    case ARGUMENT_VARIABLE:
        return plan->variables[view->variable].column;
    case ARGUMENT_COVARIATE:
        return view->covariate == NOWHERE ? NULL : plan->covariates[view->covariate].id;
    case ARGUMENT_VISIT:
        return plan->outcomes[view->outcome].visits[view->visit].label;
    case ARGUMENT_SET:
        return set_name(view->set);
    case ARGUMENT_SCALE:
        return scale_name(view->scale);
    case ARGUMENT_ARM:
        return view->arms.count > 1 ? view->arms.arm[view->arm].code : NULL;
    case ARGUMENT_WORD: {
        const char *word = view_asked(view, rule->name);
        return word ? word : arena_bytes(view->arena, rule->words, strcspn(rule->words, " "));
    }
    default:
        return view_asked(view, rule->name);
    }
}

void view_json(const struct view *view, struct text *out) {
    struct json json;
    json_init(&json, out);
    json_object(&json);
    json_field_string(&json, "exhibit", view->exhibit->name);
    json_field_string(&json, "title", view->title);
    json_field_integer(&json, "version", view->frame->version);
    json_field_string(&json, "data_sha256", view->frame->data_sha256);
    json_field_string(&json, "state_sha256", view->frame->state_sha256);
    json_field_string(&json, "blinding", blinding_name(view->frame->blinding));
    json_field_string(&json, "set", set_name(view->set));
    json_key_object(&json, "arguments");
    for (const struct argument_rule *rule = view->exhibit->arguments; rule->name; rule++) {
        json_field_string(&json, rule->name, argument_value(view, rule));
    }
    json_close(&json);
    json_key_array(&json, "notes");
    for (size_t i = 0; i < view->note_count; i++) {
        json_string(&json, view->notes[i]);
    }
    json_close(&json);
    view->exhibit->json(view, &json);
    json_close(&json);
    json_finish(&json);
    text_char(out, '\n');
}

static size_t make_tables(const struct view *view, struct table **tables) {
    size_t count = 0;
    view->exhibit->tables(view, tables, &count);
    BUG_IF(count > VIEW_TABLES);
    return count;
}

void view_text(const struct view *view, struct text *out) {
    struct table *tables[VIEW_TABLES];
    size_t count = make_tables(view, tables);
    text_format(out, "%s\n%s\n", view->title, identity(view));
    if (view->caption) {
        text_format(out, "%s\n", view->caption);
    }
    for (size_t i = 0; i < count; i++) {
        text_char(out, '\n');
        table_text(tables[i], out);
    }
    for (size_t i = 0; i < view->note_count; i++) {
        text_format(out, "%s%s\n", i ? "" : "\n", view->notes[i]);
    }
}

void view_csv(const struct view *view, struct text *out) {
    struct table *tables[VIEW_TABLES];
    size_t count = make_tables(view, tables);
    for (size_t i = 0; i < count; i++) {
        if (i) {
            text_char(out, '\n');
        }
        table_csv(tables[i], out);
    }
}

static void draw(const struct view *view, bool meeting, bool alone, struct html *html) {
    struct figure figure = {.id = arena_format(view->arena, "figure-%s", view->exhibit->name), .title = view->title,
        .description = view->caption, .identity = alone ? identity(view) : NULL, .meeting = meeting};
    view->exhibit->figure(view, &figure, html);
}

bool view_svg(const struct view *view, bool meeting, struct text *out) {
    if (!view->exhibit->figure) {
        return false;
    }
    struct html html;
    html_init(&html, out);
    draw(view, meeting, true, &html);
    html_finish(&html);
    text_char(out, '\n');
    return true;
}

/* ---- the page's fragment ---- */

static const char *escaped_value(struct arena *arena, const char *value) {
    static const char plain[] = "ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789-_.~";
    struct text text;
    text_init(&text);
    for (const unsigned char *p = (const unsigned char *)value; *p; p++) {
        if (strchr(plain, *p)) {
            text_char(&text, (char)*p);
        } else {
            text_format(&text, "%%%02X", *p);
        }
    }
    const char *copy = arena_text(arena, text.data);
    text_release(&text);
    return copy;
}

/* The address of this exhibit with one argument changed; an outcome's own arguments do not outlive the outcome. */
static const char *address(const struct view *view, const struct argument_rule *changed, const char *value) {
    struct text text;
    text_init(&text);
    text_format(&text, "#%s", view->exhibit->name);
    char mark = '?';
    for (const struct argument_rule *rule = view->exhibit->arguments; rule->name; rule++) {
        const char *asked = view_asked(view, rule->name);
        bool outlived = changed->kind == ARGUMENT_OUTCOME && (rule->kind == ARGUMENT_VISIT || rule->kind == ARGUMENT_SCALE);
        const char *now = rule == changed ? value : outlived ? NULL : asked && *asked ? asked : NULL;
        if (now) {
            text_format(&text, "%c%s=%s", mark, rule->name, escaped_value(view->arena, now));
            mark = '&';
        }
    }
    const char *copy = arena_text(view->arena, text.data);
    text_release(&text);
    return copy;
}

static void tab(const struct view *view, struct html *html, const struct argument_rule *rule, const char *value,
    const char *label) {
    const char *now = argument_value(view, rule);
    bool current = value && now ? strcmp(value, now) == 0 : value == now;
    html_open(html, "a");
    html_attribute(html, "href", address(view, rule, value));
    html_attribute(html, "data-value", value ? value : "");
    html_attribute(html, "aria-current", current ? "true" : NULL);
    html_text(html, label);
    html_close(html);
}

static const char *band_label(struct arena *arena, const struct covariate *covariate) {
    return covariate->number ? arena_format(arena, "%s band", covariate->label) : covariate->label;
}

static void tabs_of_words(const struct view *view, struct html *html, const struct argument_rule *rule) {
    for (const char *at = rule->words; *at; at += strcspn(at, " "), at += *at == ' ') {
        char *word = arena_bytes(view->arena, at, strcspn(at, " ")), *label = arena_text(view->arena, word);
        if (strcmp(word, "arm") == 0 && view->arms.pooled) {
            continue; /* it would only be refused */
        }
        for (char *p = label; *p; p++) {
            *p = *p == '-' ? ' ' : *p;
        }
        label[0] = label[0] >= 'a' && label[0] <= 'z' ? (char)(label[0] - 'a' + 'A') : label[0];
        tab(view, html, rule, word, label);
    }
}

static void tabs_of(const struct view *view, struct html *html, const struct argument_rule *rule) {
    const struct plan *plan = view->frame->plan;
    switch (rule->kind) {
    case ARGUMENT_OUTCOME:
        for (size_t i = 0; i < plan->outcome_count; i++) {
            tab(view, html, rule, plan->outcomes[i].id, plan->outcomes[i].label);
        }
        break;
    case ARGUMENT_VARIABLE:
        for (size_t i = 0; i < plan->variable_count; i++) {
            bool first = plan_variable(plan, plan->variables[i].column) == (int)i; /* of several events on one column */
            if (first && !arms_hide_column(view->frame, plan->variables[i].column)) {
                tab(view, html, rule, plan->variables[i].column, plan->variables[i].label);
            }
        }
        break;
    case ARGUMENT_COVARIATE:
        tab(view, html, rule, NULL, "All");
        for (size_t i = 0; i < plan->covariate_count; i++) {
            const struct covariate *covariate = &plan->covariates[i];
            if (!arms_hide_column(view->frame, covariate->column) && (!covariate->number || covariate->band_count)) {
                tab(view, html, rule, covariate->id, band_label(view->arena, covariate));
            }
        }
        break;
    case ARGUMENT_VISIT:
        for (size_t i = plan->outcomes[view->outcome].visit_count > 1; i < plan->outcomes[view->outcome].visit_count; i++) {
            const char *label = plan->outcomes[view->outcome].visits[i].label;
            tab(view, html, rule, label, label);
        }
        break;
    case ARGUMENT_SCALE:
        tab(view, html, rule, "linear", "Linear");
        tab(view, html, rule, "log10", "Log10");
        break;
    case ARGUMENT_SET:
        tab(view, html, rule, "full", "Full analysis set");
        tab(view, html, rule, "per-protocol", "Per-protocol set");
        break;
    case ARGUMENT_ARM:
        for (size_t i = 0; i < view->arms.count; i++) {
            if (i != view->arms.reference) {
                tab(view, html, rule, view->arms.arm[i].code, view->arms.arm[i].label);
            }
        }
        break;
    case ARGUMENT_WORD:
        tabs_of_words(view, html, rule);
        break;
    default:
        break;
    }
}

/* Whether there is anything to choose. */
static bool choice_of(const struct view *view, const struct argument_rule *rule) {
    const struct plan *plan = view->frame->plan;
    return rule->kind == ARGUMENT_OUTCOME ? plan->outcome_count > 1 :
        rule->kind == ARGUMENT_VISIT      ? plan->outcomes[view->outcome].visit_count > 2 :
        rule->kind == ARGUMENT_ARM        ? view->arms.count > 2 :
                                            true;
}

static void write_tabs(const struct view *view, struct html *html) {
    for (const struct argument_rule *rule = view->exhibit->arguments; rule->name; rule++) {
        if (!rule->tabs || !choice_of(view, rule)) {
            continue;
        }
        html_open(html, "nav");
        html_attribute(html, "class", "tabs");
        html_attribute(html, "data-argument", rule->name);
        html_attribute(html, "aria-label", rule->says);
        tabs_of(view, html, rule);
        html_close(html);
    }
}

static void write_tables(const struct view *view, struct html *html) {
    struct table *tables[VIEW_TABLES];
    size_t count = make_tables(view, tables);
    bool folded = !view->exhibit->table_first && count > 0;
    html_open(html, folded ? "details" : "div");
    html_attribute(html, "class", folded ? "numbers" : "tables");
    if (folded) {
        html_element(html, "summary", NULL, "The numbers behind it");
    }
    for (size_t i = 0; i < count; i++) {
        table_html(tables[i], html);
    }
    html_close(html);
}

static void write_paragraphs(struct html *html, const char *text) {
    for (const char *at = text; *at;) {
        size_t length = strcspn(at, "\n");
        html_open(html, "p");
        html_format(html, "%.*s", (int)length, at);
        html_close(html);
        at += length + (at[length] == '\n');
    }
}

static void write_folds(const struct view *view, struct html *html) {
    html_open(html, "details");
    html_attribute(html, "class", "method");
    html_element(html, "summary", NULL, "How this was computed");
    write_paragraphs(html, view->exhibit->method);
    html_element(html, "p", "identity", identity(view));
    html_close(html);
    if (view->note_count) {
        html_open(html, "ul");
        html_attribute(html, "class", "notes");
        for (size_t i = 0; i < view->note_count; i++) {
            html_element(html, "li", NULL, view->notes[i]);
        }
        html_close(html);
    }
}

void view_html(const struct view *view, bool meeting, struct text *out) {
    struct html html;
    html_init(&html, out);
    html_open(&html, "article");
    html_attribute(&html, "class", "exhibit");
    html_attribute(&html, "data-exhibit", view->exhibit->name);
    html_attribute(&html, "data-version", arena_format(view->arena, "%u", view->frame->version));
    const char *number = arena_format(view->arena, "%d.%d", view->exhibit->item, exhibit_number(view->exhibit));
    html_attribute(&html, "data-number", number);
    html_element(&html, "p", "number", number);
    html_element(&html, "h2", "question", view->title);
    write_tabs(view, &html);
    if (view->exhibit->lead) {
        html_open(&html, "p");
        html_attribute(&html, "class", "lead");
        view->exhibit->lead(view, &html);
        html_close(&html);
    }
    if (view->exhibit->table_first) {
        write_tables(view, &html);
    }
    if (view->exhibit->figure) {
        html_open(&html, "figure");
        draw(view, meeting, false, &html);
        if (view->caption) {
            html_element(&html, "figcaption", NULL, view->caption);
        }
        html_close(&html);
    } else if (view->caption) {
        html_element(&html, "p", "caption", view->caption);
    }
    if (!view->exhibit->table_first) {
        write_tables(view, &html);
    }
    write_folds(view, &html);
    html_close(&html);
    html_finish(&html);
    text_char(out, '\n');
}
