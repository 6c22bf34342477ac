/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef REPORT_MARKUP_H
#define REPORT_MARKUP_H

/*
 * The one writer of HTML and SVG. Whatever words come in go out escaped: there is no call that adds
 * markup as text, and names of elements and attributes are refused unless they are plain names.
 * What it writes is HTML that is well-formed XML too.
 *
 *     markup_open(&m, "p"); markup_attribute(&m, "class", "note"); markup_text(&m, words);
 *     markup_close(&m);
 *
 * Control characters, which XML forbids, and those that turn the direction of all text behind them
 * (U+202A … U+202E, U+2066 … U+2069) are shown as U+FFFD.
 */

#include "base/text.h"

enum { MARKUP_DEPTH = 32 };

struct markup {
    struct text *out;
    bool in_tag; /* the start tag takes attributes still */
    bool failed; /* memory was short, or calls made no sense (names, nesting) */
    size_t depth;
    const char *open[MARKUP_DEPTH];
};

/* Begins a document: its doctype. `out` outlives the writer. */
void markup_begin(struct markup *markup, struct text *out);
/* Whether all is closed and nothing failed. */
bool markup_end(struct markup *markup);

/* `name` is a constant that outlives the element. */
void markup_open(struct markup *markup, const char *name);
void markup_close(struct markup *markup);
/* An element without content. */
void markup_void(struct markup *markup, const char *name);

/* Of the element opened last, before its content. Attributes that run scripts or load are refused:
 * on…, style, src; href that is no fragment or plain file name. */
void markup_attribute(struct markup *markup, const char *name, const char *value);
void markup_attributef(struct markup *markup, const char *name, const char *format, ...)
    RF_PRINTF(3, 4);

void markup_text(struct markup *markup, const char *words);
void markup_textf(struct markup *markup, const char *format, ...) RF_PRINTF(2, 3);

/* <name class="kind">words</name>; `kind` NULL: no class. */
void markup_element(struct markup *markup, const char *name, const char *kind, const char *words);
/* The same for words that are used up: freed, whatever happens. */
void markup_element_of(struct markup *markup, const char *name, const char *kind,
                       struct text *words);

/* A style sheet of n pieces, constants of the program; refused where one holds < or & or loads
 * anything. */
void markup_style(struct markup *markup, const char *const sheet[], size_t n);

#endif
