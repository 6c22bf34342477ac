/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "report/markup.h"

#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static bool is_name(const char *name)
{
    static const char first[] = "abcdefghijklmnopqrstuvwxyz";
    static const char others[] = "abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ0123456789-";
    return *name != '\0' && strchr(first, *name) != NULL && strspn(name, others) == strlen(name);
}

/* Elements that run, load or embed something. */
static bool is_allowed_element(const char *name)
{
    static const char *const refused[] = {"script", "iframe", "object", "embed", "link",
                                          "base",   "form",   "img",    "image", "use"};
    for (size_t i = 0; i < sizeof refused / sizeof refused[0]; i++)
        if (strcmp(name, refused[i]) == 0)
            return false;
    return is_name(name);
}

/* A place in this page or a page beside it. */
static bool is_near(const char *reference)
{
    static const char plain[] = "abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ0123456789-_.";
    const char *rest = *reference == '#' ? reference + 1 : reference;
    return *rest != '\0' && strspn(rest, plain) == strlen(rest);
}

static bool is_allowed_attribute(const char *name, const char *value)
{
    if (!is_name(name) || strncmp(name, "on", 2) == 0 || strcmp(name, "style") == 0 ||
        strcmp(name, "src") == 0)
        return false;
    return strcmp(name, "href") != 0 || is_near(value);
}

/* --- characters --- */

/* The character's code point and length; text in here is valid UTF-8 already, and anything that is
 * not counts as one byte that is shown as U+FFFD. */
static unsigned long code_point(const char *at, size_t *length)
{
    const unsigned char *byte = (const unsigned char *)at;
    size_t n = byte[0] < 0x80 ? 1 : byte[0] >= 0xF0 ? 4 : byte[0] >= 0xE0 ? 3 : 2;
    unsigned long code = n == 1 ? byte[0] : byte[0] & (0x7Fu >> n);
    *length = 1;
    if (byte[0] >= 0x80 && byte[0] < 0xC2)
        return 0xFFFD;
    for (size_t i = 1; i < n; i++) {
        if ((byte[i] & 0xC0) != 0x80)
            return 0xFFFD;
        code = code << 6 | (byte[i] & 0x3Fu);
    }
    *length = n;
    return code;
}

static bool is_shown(unsigned long code)
{
    if (code < 0x20)
        return code == '\t' || code == '\n';
    return !(code >= 0x7F && code < 0xA0) && !(code >= 0x202A && code <= 0x202E) &&
           !(code >= 0x2066 && code <= 0x2069) && !(code >= 0xD800 && code < 0xE000) &&
           (code & 0xFFFE) != 0xFFFE;
}

static void escape(struct text *out, const char *words)
{
    size_t length;
    for (const char *at = words; *at != '\0'; at += length) {
        unsigned long code = code_point(at, &length);
        if (code == '&')
            text_add(out, "&amp;");
        else if (code == '<')
            text_add(out, "&lt;");
        else if (code == '>')
            text_add(out, "&gt;");
        else if (code == '"')
            text_add(out, "&quot;");
        else if (code == '\'')
            text_add(out, "&#39;");
        else if (!is_shown(code) || (code == 0xFFFD && length == 1))
            text_add(out, "\xEF\xBF\xBD");
        else
            text_append(out, at, length);
    }
}

/* --- elements --- */

static void end_tag(struct markup *markup)
{
    if (markup->in_tag)
        text_add(markup->out, ">");
    markup->in_tag = false;
}

void markup_begin(struct markup *markup, struct text *out)
{
    *markup = (struct markup){.out = out};
    text_add(out, "<!DOCTYPE html>\n");
}

bool markup_end(struct markup *markup)
{
    return !markup->failed && !markup->out->failed && markup->depth == 0;
}

void markup_open(struct markup *markup, const char *name)
{
    if (markup->failed || !is_allowed_element(name) || markup->depth == MARKUP_DEPTH) {
        markup->failed = true;
        return;
    }
    end_tag(markup);
    text_addf(markup->out, "<%s", name);
    markup->open[markup->depth++] = name;
    markup->in_tag = true;
}

/* Elements that stand on lines of their own, so that the page can be read as it is. */
static bool ends_line(const char *name)
{
    static const char *const blocks[] = {"p",  "li",   "tr",      "h1",     "h2",   "h3",  "div",
                                         "ul", "meta", "section", "figure", "path", "svg", "ol"};
    for (size_t i = 0; i < sizeof blocks / sizeof blocks[0]; i++)
        if (strcmp(name, blocks[i]) == 0)
            return true;
    return false;
}

static void line_end(struct markup *markup, const char *name)
{
    if (ends_line(name))
        text_add(markup->out, "\n");
}

void markup_close(struct markup *markup)
{
    if (markup->failed || markup->depth == 0) {
        markup->failed = true;
        return;
    }
    end_tag(markup);
    const char *name = markup->open[--markup->depth];
    text_addf(markup->out, "</%s>", name);
    line_end(markup, name);
}

void markup_void(struct markup *markup, const char *name)
{
    if (markup->failed || !markup->in_tag || strcmp(markup->open[markup->depth - 1], name) != 0) {
        markup->failed = true;
        return;
    }
    text_add(markup->out, "/>");
    line_end(markup, name);
    markup->in_tag = false;
    markup->depth--;
}

void markup_attribute(struct markup *markup, const char *name, const char *value)
{
    if (markup->failed || !markup->in_tag || !is_allowed_attribute(name, value)) {
        markup->failed = true;
        return;
    }
    text_addf(markup->out, " %s=\"", name);
    escape(markup->out, value);
    text_add(markup->out, "\"");
}

static void format_words(struct text *words, const char *format, va_list arguments)
{
    va_list again;
    va_copy(again, arguments);
    int needed = vsnprintf(NULL, 0, format, again);
    va_end(again);
    char *bytes = needed < 0 ? NULL : malloc((size_t)needed + 1);
    if (bytes == NULL) {
        words->failed = true;
        return;
    }
    vsnprintf(bytes, (size_t)needed + 1, format, arguments);
    text_append(words, bytes, (size_t)needed);
    free(bytes);
}

void markup_attributef(struct markup *markup, const char *name, const char *format, ...)
{
    struct text value = {0};
    va_list arguments;
    va_start(arguments, format);
    format_words(&value, format, arguments);
    va_end(arguments);
    if (value.failed)
        markup->failed = true;
    else
        markup_attribute(markup, name, value.bytes != NULL ? value.bytes : "");
    text_finish(&value);
}

void markup_text(struct markup *markup, const char *words)
{
    if (markup->failed || markup->depth == 0) {
        markup->failed = true;
        return;
    }
    end_tag(markup);
    escape(markup->out, words);
}

void markup_textf(struct markup *markup, const char *format, ...)
{
    struct text words = {0};
    va_list arguments;
    va_start(arguments, format);
    format_words(&words, format, arguments);
    va_end(arguments);
    if (words.failed)
        markup->failed = true;
    else
        markup_text(markup, words.bytes != NULL ? words.bytes : "");
    text_finish(&words);
}

void markup_element(struct markup *markup, const char *name, const char *kind, const char *words)
{
    markup_open(markup, name);
    if (kind != NULL)
        markup_attribute(markup, "class", kind);
    markup_text(markup, words);
    markup_close(markup);
}

void markup_element_of(struct markup *markup, const char *name, const char *kind,
                       struct text *words)
{
    if (words->failed)
        markup->failed = true;
    else
        markup_element(markup, name, kind, words->bytes != NULL ? words->bytes : "");
    text_finish(words);
}

static bool is_allowed_style(const char *piece)
{
    return strpbrk(piece, "<&") == NULL && strstr(piece, "url") == NULL &&
           strstr(piece, "@import") == NULL;
}

void markup_style(struct markup *markup, const char *const sheet[], size_t n)
{
    markup_open(markup, "style");
    end_tag(markup);
    for (size_t i = 0; i < n; i++) {
        if (is_allowed_style(sheet[i]))
            text_add(markup->out, sheet[i]);
        else
            markup->failed = true;
    }
    markup_close(markup);
}
