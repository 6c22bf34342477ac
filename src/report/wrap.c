/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "report/wrap.h"

#include <string.h>

enum { CHARACTER_BYTES = 4, ENTRY_COLUMN = 20 };

/* The character at `at`, made harmless, into `shown`; answers its bytes. */
static size_t next_character(const char *at, char shown[CHARACTER_BYTES + 1])
{
    const unsigned char *bytes = (const unsigned char *)at;
    size_t n = 1;
    while (n < CHARACTER_BYTES && (bytes[n] & 0xC0) == 0x80)
        n++;
    memcpy(shown, at, n);
    shown[n] = '\0';
    bool control = bytes[0] < 0x20 || bytes[0] == 0x7F || (bytes[0] == 0xC2 && bytes[1] < 0xA0);
    if (control)
        strcpy(shown, "?");
    if (strcmp(shown, "\u00A0") == 0)
        strcpy(shown, " ");
    return n;
}

static bool is_space(char c)
{
    return c == ' ' || c == '\n' || c == '\t' || c == '\r' || c == '\v' || c == '\f';
}

/* --- filling --- */

struct line {
    struct text *out;
    const char *first, *rest;
    size_t column;
    bool empty; /* nothing behind the indent */
    bool begun;
};

static void begin_line(struct line *line)
{
    const char *indent = line->begun ? line->rest : line->first;
    if (line->begun)
        text_add(line->out, "\n");
    text_add(line->out, indent);
    line->column = text_columns(indent);
    line->empty = true;
    line->begun = true;
}

/* A word that fits no line, over as many as it takes. */
static void break_word(struct line *line, const char *word)
{
    char shown[CHARACTER_BYTES + 1];
    for (const char *at = word; *at != '\0';) {
        at += next_character(at, shown);
        size_t columns = text_columns(shown);
        if (line->column + columns > REPORT_COLUMNS)
            begin_line(line);
        text_add(line->out, shown);
        line->column += columns;
        line->empty = false;
    }
}

static void add_word(struct line *line, const char *word)
{
    size_t columns = text_columns(word);
    size_t gap = line->empty ? 0 : 1;
    if (line->column + gap + columns <= REPORT_COLUMNS) {
        text_append(line->out, " ", gap);
        text_add(line->out, word);
        line->column += gap + columns;
        line->empty = false;
        return;
    }
    if (!line->empty)
        begin_line(line);
    if (line->column + columns <= REPORT_COLUMNS) {
        text_add(line->out, word);
        line->column += columns;
        line->empty = false;
    } else {
        break_word(line, word);
    }
}

void wrap_words(struct text *out, const char *first, const char *rest, const char *words)
{
    struct line line = {.out = out, .first = first, .rest = rest};
    struct text word = {0};
    begin_line(&line);
    for (const char *at = words; *at != '\0';) {
        text_clear(&word);
        for (char shown[CHARACTER_BYTES + 1]; *at != '\0' && !is_space(*at);) {
            at += next_character(at, shown);
            text_add(&word, shown);
        }
        if (word.length > 0 && !word.failed)
            add_word(&line, word.bytes);
        while (is_space(*at))
            at++;
    }
    text_add(out, "\n");
    if (word.failed)
        out->failed = true;
    text_finish(&word);
}

void wrap_entry(struct text *out, const char *name, const char *meaning)
{
    char indent[ENTRY_COLUMN + 1];
    memset(indent, ' ', ENTRY_COLUMN);
    indent[ENTRY_COLUMN] = '\0';
    struct text first = {0};
    text_addf(&first, "  %s", name);
    if (first.failed) {
        out->failed = true;
        return;
    }
    size_t columns = text_columns(first.bytes);
    if (columns + 2 > ENTRY_COLUMN) {
        text_addf(out, "%s\n", first.bytes);
        wrap_words(out, indent, indent, meaning);
    } else {
        text_add(&first, indent + columns);
        wrap_words(out, first.failed ? "" : first.bytes, indent, meaning);
        out->failed = out->failed || first.failed;
    }
    text_finish(&first);
}

/* --- cells --- */

/* What of `words` fits `columns`, into `cut`; answers its columns. */
static size_t fit_cell(struct text *cut, const char *words, size_t columns)
{
    char shown[CHARACTER_BYTES + 1];
    size_t width = 0, kept = 0, kept_width = 0; /* what is kept if an ellipsis must follow */
    for (const char *at = words; *at != '\0';) {
        at += next_character(at, shown);
        size_t more = text_columns(shown);
        if (width + more > columns) {
            cut->length = kept;
            text_add(cut, "…");
            return kept_width + 1;
        }
        text_add(cut, shown);
        width += more;
        if (width + 1 <= columns) {
            kept = cut->length;
            kept_width = width;
        }
    }
    return width;
}

static void cell(struct text *out, const char *words, size_t columns, bool right)
{
    struct text cut = {0};
    size_t width = fit_cell(&cut, words, columns);
    for (size_t i = width; right && i < columns; i++)
        text_append(out, " ", 1);
    text_append(out, cut.bytes != NULL ? cut.bytes : "", cut.length);
    for (size_t i = width; !right && i < columns; i++)
        text_append(out, " ", 1);
    out->failed = out->failed || cut.failed;
    text_finish(&cut);
}

void cell_left(struct text *out, const char *words, size_t columns)
{
    cell(out, words, columns, false);
}

void cell_right(struct text *out, const char *words, size_t columns)
{
    cell(out, words, columns, true);
}

void cell_heading(struct text *out, const char *words, size_t columns)
{
    bool fits = text_columns(words) <= columns;
    if (!fits)
        wrap_words(out, "", "", words);
    cell_left(out, fits ? words : "", columns);
}
