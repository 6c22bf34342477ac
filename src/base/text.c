/* SPDX-License-Identifier: GPL-3.0-or-later */
#define _XOPEN_SOURCE 700 /* wcwidth, uselocale */

#include "base/text.h"

#include <locale.h>
#include <stdarg.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <wchar.h>

/* Makes room for `more` bytes and the terminator. */
static bool reserve(struct text *text, size_t more)
{
    if (text->failed)
        return false;
    if (more >= SIZE_MAX / 2 - text->length) {
        text->failed = true;
        return false;
    }
    size_t needed = text->length + more + 1;
    if (needed <= text->capacity)
        return true;

    size_t capacity = text->capacity * 2 > needed ? text->capacity * 2 : needed;
    if (capacity < 64)
        capacity = 64;
    char *bytes = realloc(text->bytes, capacity);
    if (bytes == NULL) {
        text->failed = true;
        return false;
    }
    text->bytes = bytes;
    text->capacity = capacity;
    return true;
}

void text_append(struct text *text, const char *bytes, size_t length)
{
    if (!reserve(text, length))
        return;
    if (length > 0)
        memcpy(text->bytes + text->length, bytes, length);
    text->length += length;
    text->bytes[text->length] = '\0';
}

void text_add(struct text *text, const char *terminated)
{
    text_append(text, terminated, strlen(terminated));
}

void text_addf(struct text *text, const char *format, ...)
{
    va_list arguments;
    va_start(arguments, format);
    int length = vsnprintf(NULL, 0, format, arguments);
    va_end(arguments);
    if (length < 0) {
        text->failed = true;
        return;
    }
    if (!reserve(text, (size_t)length))
        return;

    va_start(arguments, format);
    vsnprintf(text->bytes + text->length, (size_t)length + 1, format, arguments);
    va_end(arguments);
    text->length += (size_t)length;
}

void text_clear(struct text *text)
{
    text->length = 0;
    if (text->bytes != NULL)
        text->bytes[0] = '\0';
}

void text_finish(struct text *text)
{
    if (text == NULL)
        return;
    free(text->bytes);
    *text = (struct text){0};
}

char *text_duplicate(const char *terminated)
{
    size_t size = strlen(terminated) + 1;
    char *copy = malloc(size);
    return copy != NULL ? memcpy(copy, terminated, size) : NULL;
}

/* Bytes of the character that `lead` begins; 0 where it begins none. */
static size_t character_length(unsigned char lead)
{
    if (lead < 0x80)
        return 1;
    if (lead >= 0xC2 && lead <= 0xDF)
        return 2;
    if (lead >= 0xE0 && lead <= 0xEF)
        return 3;
    if (lead >= 0xF0 && lead <= 0xF4)
        return 4;
    return 0;
}

static bool is_continuation(unsigned char byte)
{
    return (byte & 0xC0) == 0x80;
}

void text_trim_partial_character(char *terminated)
{
    size_t length = strlen(terminated);
    size_t lead = length;
    while (lead > 0 && length - lead < 3 && is_continuation((unsigned char)terminated[lead - 1]))
        lead--;
    if (lead == 0)
        return;
    lead--;
    if (character_length((unsigned char)terminated[lead]) > length - lead)
        terminated[lead] = '\0';
}

/* Length of the valid character at `bytes`, of which `left` remain; 0 where there is none. The
 * narrower ranges of the second byte (RFC 3629, section 4) keep out overlong forms, surrogates
 * and what lies beyond U+10FFFF. */
static size_t valid_character(const unsigned char *bytes, size_t left)
{
    size_t length = character_length(bytes[0]);
    if (length == 0 || length > left)
        return 0;
    if (length == 1)
        return 1;

    unsigned char low = 0x80, high = 0xBF;
    switch (bytes[0]) {
    case 0xE0: low = 0xA0; break;
    case 0xED: high = 0x9F; break;
    case 0xF0: low = 0x90; break;
    case 0xF4: high = 0x8F; break;
    default: break;
    }
    if (bytes[1] < low || bytes[1] > high)
        return 0;
    for (size_t i = 2; i < length; i++)
        if (!is_continuation(bytes[i]))
            return 0;
    return length;
}

bool text_is_utf8(const char *bytes, size_t length, size_t *bad)
{
    for (size_t at = 0; at < length;) {
        size_t step = valid_character((const unsigned char *)bytes + at, length - at);
        if (step == 0) {
            if (bad != NULL)
                *bad = at;
            return false;
        }
        at += step;
    }
    return true;
}

static wchar_t code_point(const unsigned char *bytes, size_t length)
{
    if (length == 1)
        return (wchar_t)bytes[0];
    unsigned code = bytes[0] & (0x7Fu >> length);
    for (size_t i = 1; i < length; i++)
        code = code << 6 | (bytes[i] & 0x3Fu);
    return (wchar_t)code;
}

/* What is not ASCII is measured by the C library's own table, which needs a UTF-8 locale; it is
 * set for this thread only and put back. Where there is none, a character counts one. */
static size_t columns_by_locale(const char *terminated)
{
    locale_t utf8 = newlocale(LC_CTYPE_MASK, "C.UTF-8", (locale_t)0);
    locale_t before = utf8 != (locale_t)0 ? uselocale(utf8) : (locale_t)0;
    size_t columns = 0;

    size_t left = strlen(terminated);
    for (const unsigned char *at = (const unsigned char *)terminated; left > 0;) {
        size_t step = valid_character(at, left);
        int width = 1;
        if (step > 0 && utf8 != (locale_t)0)
            width = wcwidth(code_point(at, step));
        columns += width >= 0 ? (size_t)width : 1;
        step = step > 0 ? step : 1;
        at += step;
        left -= step;
    }

    if (utf8 != (locale_t)0) {
        uselocale(before);
        freelocale(utf8);
    }
    return columns;
}

size_t text_columns(const char *terminated)
{
    size_t length = 0;
    for (const unsigned char *at = (const unsigned char *)terminated; *at != '\0'; at++, length++)
        if (*at >= 0x80)
            return columns_by_locale(terminated);
    return length;
}

enum { NEAREST_MAX = 64 }; /* longer words are nobody's typing mistakes */

/* Edits (a byte put in, left out, changed, or two neighbours changed over) from one word to the
 * other, both at most NEAREST_MAX bytes: Damerau-Levenshtein in its restricted form, where no
 * part is edited twice. */
static size_t edit_distance(const char *one, size_t m, const char *other, size_t n)
{
    size_t rows[3][NEAREST_MAX + 1];
    size_t *before = rows[0], *last = rows[1], *row = rows[2];

    for (size_t j = 0; j <= n; j++)
        last[j] = j;
    for (size_t i = 1; i <= m; i++) {
        row[0] = i;
        for (size_t j = 1; j <= n; j++) {
            size_t best = last[j - 1] + (one[i - 1] != other[j - 1]);
            if (last[j] + 1 < best)
                best = last[j] + 1;
            if (row[j - 1] + 1 < best)
                best = row[j - 1] + 1;
            if (i > 1 && j > 1 && one[i - 1] == other[j - 2] && one[i - 2] == other[j - 1] &&
                before[j - 2] + 1 < best)
                best = before[j - 2] + 1;
            row[j] = best;
        }
        size_t *oldest = before;
        before = last;
        last = row;
        row = oldest;
    }
    return last[n];
}

const char *text_nearest(const char *word, const char *const known[], size_t n)
{
    size_t length = strlen(word);
    if (length > NEAREST_MAX)
        return NULL;

    size_t limit = length / 3 > 2 ? length / 3 : 2;
    const char *nearest = NULL;
    for (size_t i = 0; i < n; i++) {
        size_t other = strlen(known[i]);
        if (other > NEAREST_MAX)
            continue;
        size_t distance = edit_distance(word, length, known[i], other);
        if (distance <= limit && (nearest == NULL || distance < limit)) {
            nearest = known[i];
            limit = distance;
        }
    }
    return nearest;
}
