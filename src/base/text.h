/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef BASE_TEXT_H
#define BASE_TEXT_H

#include <ringfettle/status.h>

#include <stdbool.h>
#include <stddef.h>

/*
 * A growing text. Zeroed is empty and valid. After an allocation fails `failed` stays true,
 * further appends do nothing, and the caller looks once at the end.
 */
struct text {
    char *bytes; /* terminated; NULL while empty */
    size_t length, capacity;
    bool failed;
};

void text_append(struct text *text, const char *bytes, size_t length);
void text_add(struct text *text, const char *terminated);
void text_addf(struct text *text, const char *format, ...) RF_PRINTF(2, 3);
void text_clear(struct text *text);  /* empty again, keeps its memory */
void text_finish(struct text *text); /* frees; takes NULL and zeroed */

/* A copy on the heap, NULL when memory is short; the caller frees. */
char *text_duplicate(const char *terminated);

/* Cuts an unfinished UTF-8 character off the end. */
void text_trim_partial_character(char *terminated);

/* Whether the bytes are valid UTF-8 (RFC 3629: no surrogates, no overlong forms). If not and
 * `bad` is not NULL, *bad is the offset of the first byte that is not. */
bool text_is_utf8(const char *bytes, size_t length, size_t *bad);

/* Columns a terminal needs for the text: a character one, a combining mark none, East Asian wide
 * characters two. */
size_t text_columns(const char *terminated);

/* The entry of `known` (n of them) nearest to `word` by Damerau-Levenshtein distance, if it is
 * within a third of the word's length or 2, whichever is more; else NULL. */
const char *text_nearest(const char *word, const char *const known[], size_t n);

#endif
