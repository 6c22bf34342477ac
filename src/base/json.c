/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/json.h"

#include "base/error.h"
#include "base/json_scan.h"
#include "base/memory.h"
#include "base/text.h"

#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <string.h>

enum { SHOWN_MAX = 64 }; /* bytes of a string a message shows */

/* --- words --- */

/* Adds a string in double quotes, safe on a terminal and on one line. */
static void add_quoted(const char *string, struct text *out)
{
    size_t length = strlen(string);
    size_t shown = length > SHOWN_MAX ? SHOWN_MAX : length;
    while (shown < length && shown > 0 && ((unsigned char)string[shown] & 0xC0) == 0x80)
        shown--;

    text_add(out, "\"");
    for (size_t i = 0; i < shown; i++) {
        unsigned char byte = (unsigned char)string[i];
        if (byte < 0x20 || byte == 0x7F)
            text_addf(out, "\\u%04x", byte);
        else if (byte == 0xC2 && i + 1 < shown && (unsigned char)string[i + 1] < 0xA0)
            text_addf(out, "\\u%04x", (unsigned char)string[++i]);
        else
            text_append(out, string + i, 1);
    }
    text_add(out, shown < length ? "…\"" : "\"");
}

static void add_number(const cJSON *value, struct text *out)
{
    char digits[64];
    if (isfinite(value->valuedouble) &&
        cJSON_PrintPreallocated((cJSON *)(uintptr_t)value, digits, sizeof digits, false))
        text_add(out, digits);
    else
        text_add(out, "a number too large");
}

void json_describe(const cJSON *value, struct text *out)
{
    if (value == NULL)
        text_add(out, "nothing");
    else if (cJSON_IsString(value))
        add_quoted(value->valuestring, out);
    else if (cJSON_IsNumber(value))
        add_number(value, out);
    else if (cJSON_IsBool(value))
        text_add(out, cJSON_IsTrue(value) ? "true" : "false");
    else if (cJSON_IsNull(value))
        text_add(out, "null");
    else if (cJSON_IsObject(value))
        text_add(out, "an object");
    else if (value->child == NULL)
        text_add(out, "an empty list");
    else
        text_addf(out, "a list of %d", cJSON_GetArraySize(value));
}

/* Keys of letters, digits, _, - and characters beyond ASCII stand in a path as they are. */
static bool is_plain_key(const char *key)
{
    size_t length = 0;
    for (const unsigned char *at = (const unsigned char *)key; *at != '\0'; at++, length++) {
        bool plain = (*at >= 'a' && *at <= 'z') || (*at >= 'A' && *at <= 'Z') ||
                     (*at >= '0' && *at <= '9') || *at == '_' || *at == '-' ||
                     (*at >= 0x80 && *at != 0xC2); /* 0xC2 begins further control characters */
        if (!plain)
            return false;
    }
    return length > 0 && length <= SHOWN_MAX;
}

/* The path from `top` down to `at`. */
static void add_path(const struct json_at *at, const struct json_at *top, struct text *out)
{
    const struct json_at *steps[JSON_MAX_DEPTH + 1];
    size_t n = 0;
    for (; at != top && at->parent != NULL && n <= JSON_MAX_DEPTH; at = at->parent)
        steps[n++] = at;
    for (size_t i = n; i-- > 0;) {
        const char *key = steps[i]->key;
        if (key == NULL) {
            text_addf(out, "[%zu]", steps[i]->index);
        } else if (is_plain_key(key)) {
            text_add(out, i + 1 < n ? "." : "");
            text_add(out, key);
        } else {
            text_add(out, "[");
            add_quoted(key, out);
            text_add(out, "]");
        }
    }
}

/* Begins a message with the source and the path; with the origin's own name for the nearest place
 * that it knows, and the path from there. */
static void add_place(const struct json_at *at, struct text *out)
{
    const struct json_at *top = at;
    text_add(out, at->source);
    text_add(out, ": ");
    while (top != NULL && !(at->origin != NULL && top->value != NULL &&
                            at->origin->name(at->origin, top->value, out)))
        top = top->parent;
    if (top != NULL)
        text_add(out, top != at ? ", " : ": ");
    if (top != at && at->parent != NULL) {
        add_path(at, top, out);
        text_add(out, ": ");
    }
}

/* Ends a message: takes the text, frees it. */
static enum rf_status fail_text(struct rf_error *error, enum rf_status status, struct text *text)
{
    if (text->failed)
        status = fail_memory(error);
    else
        fail(error, status, "%s", text->bytes);
    text_finish(text);
    return status;
}

enum rf_status json_fail(const struct json_at *at, struct rf_error *error, enum rf_status status,
                         const char *format, ...)
{
    struct text text = {0};
    char message[sizeof error->text];
    va_list arguments;
    va_start(arguments, format);
    int length = vsnprintf(message, sizeof message, format, arguments);
    va_end(arguments);
    if (length < 0)
        message[0] = '\0';
    text_trim_partial_character(message);

    add_place(at, &text);
    text_add(&text, message);
    return fail_text(error, status, &text);
}

enum rf_status json_fail_found(const struct json_at *at, struct rf_error *error, const char *needs)
{
    struct text text = {0};
    add_place(at, &text);
    if (at->value == NULL) {
        text_add(&text, "missing");
    } else {
        text_add(&text, "found ");
        json_describe(at->value, &text);
    }
    text_addf(&text, "; needs %s", needs);
    return fail_text(error, RF_REFUSED, &text);
}

/* --- parsing --- */

static const char byte_order_mark[] = "\xEF\xBB\xBF";

/* Begins a message with line and column of an offset. */
static void add_position(const char *bytes, size_t offset, const char *source,
                         enum json_lines lines, struct text *out)
{
    size_t line = 1, column = 1;
    for (size_t i = 0; i < offset; i++) {
        if (bytes[i] == '\n') {
            line++;
            column = 1;
        } else if (((unsigned char)bytes[i] & 0xC0) != 0x80) {
            column++;
        }
    }
    text_add(out, source);
    if (lines == JSON_DOCUMENT)
        text_addf(out, ":%zu", line);
    text_addf(out, ":%zu: ", column);
}

static bool is_of_word(char byte)
{
    return (byte >= 'a' && byte <= 'z') || (byte >= 'A' && byte <= 'Z') ||
           (byte >= '0' && byte <= '9') || byte == '+' || byte == '-' || byte == '.';
}

/* The character at an offset, or the word, number or escape that begins there, for a message. */
static void add_found(const char *bytes, size_t length, size_t offset, struct text *out)
{
    char found[24] = {0};
    size_t size = 1;
    if (offset >= length) {
        text_add(out, "the text's end");
    } else if (bytes[offset] == '\n' || bytes[offset] == '\r') {
        text_add(out, "the line's end");
    } else if (bytes[offset] == '\0') {
        text_add(out, "a NUL byte");
    } else {
        if (is_of_word(bytes[offset]) || bytes[offset] == '\\')
            while (offset + size < length && size < 20 && is_of_word(bytes[offset + size]))
                size++;
        else
            while (offset + size < length && size < 4 &&
                   ((unsigned char)bytes[offset + size] & 0xC0) == 0x80)
                size++;
        memcpy(found, bytes + offset, size);
        add_quoted(found, out);
    }
}

static enum rf_status check_text(const char *bytes, size_t length, const char *source,
                                 enum json_lines lines, struct rf_error *error)
{
    struct text text = {0};
    size_t bad;
    if (!text_is_utf8(bytes, length, &bad)) {
        add_position(bytes, bad, source, lines, &text);
        text_addf(&text, "found byte 0x%02X, which is not UTF-8; needs text saved as UTF-8",
                  (unsigned char)bytes[bad]);
        return fail_text(error, RF_SYNTAX, &text);
    }

    struct json_scan scan = json_scan_text(bytes, length);
    if (scan.complete)
        return RF_OK;
    add_position(bytes, scan.bad, source, lines, &text);
    text_add(&text, "found ");
    add_found(bytes, length, scan.bad, &text);
    text_addf(&text, "; needs %s", scan.needs);
    return fail_text(error, RF_SYNTAX, &text);
}

static int compare_keys(const void *one, const void *other)
{
    const cJSON *const *a = one;
    const cJSON *const *b = other;
    return strcmp((*a)->string, (*b)->string);
}

/* *twice becomes a member whose key stands twice in the object, or NULL. */
static enum rf_status find_twice(const cJSON *object, const cJSON **twice, struct rf_error *error)
{
    size_t n = 0, i = 0;
    *twice = NULL;
    for (const cJSON *member = object->child; member != NULL; member = member->next)
        n++;
    if (n < 2)
        return RF_OK;

    const cJSON **members = NEW_ARRAY(const cJSON *, n);
    if (members == NULL)
        return fail_memory(error);
    for (const cJSON *member = object->child; member != NULL; member = member->next)
        members[i++] = member;
    qsort(members, n, sizeof *members, compare_keys);
    for (i = 1; i < n && *twice == NULL; i++)
        if (strcmp(members[i - 1]->string, members[i]->string) == 0)
            *twice = members[i];
    free(members);
    return RF_OK;
}

/* What the grammar does not see: numbers beyond a double, keys twice. As deep as JSON_MAX_DEPTH. */
static enum rf_status check_tree(const struct json_at *at, struct rf_error *error)
{
    enum rf_status status = RF_OK;
    if (cJSON_IsNumber(at->value) && !isfinite(at->value->valuedouble))
        return json_fail_found(at, error, "a number that is finite");
    if (cJSON_IsObject(at->value)) {
        const cJSON *twice;
        status = find_twice(at->value, &twice, error);
        if (status == RF_OK && twice != NULL) {
            struct json_at second = json_child(at, 0, twice);
            return json_fail(&second, error, RF_REFUSED, "key given twice; needs it once");
        }
    }
    JSON_EACH(at, child, i) {
        if (status != RF_OK)
            return status;
        status = check_tree(&child, error);
    }
    return status;
}

enum rf_status json_parse(const char *bytes, size_t length, const char *source,
                          enum json_lines lines, cJSON **document, struct rf_error *error)
{
    size_t mark = sizeof byte_order_mark - 1;
    *document = NULL;
    if (length >= mark && memcmp(bytes, byte_order_mark, mark) == 0) {
        bytes += mark;
        length -= mark;
    }
    enum rf_status status = check_text(bytes, length, source, lines, error);
    if (status != RF_OK)
        return status;

    cJSON *tree = cJSON_ParseWithLength(bytes, length);
    if (tree == NULL) /* the text is good: what is short is memory */
        return fail_memory(error);
    struct json_at at = json_document(tree, source);
    status = check_tree(&at, error);
    if (status == RF_OK)
        *document = tree;
    else
        cJSON_Delete(tree);
    return status;
}

/* --- places --- */

struct json_at json_document(const cJSON *document, const char *source)
{
    return (struct json_at){.source = source, .value = document};
}

struct json_at json_member(const struct json_at *at, const char *key)
{
    return (struct json_at){
        .parent = at,
        .source = at->source,
        .origin = at->origin,
        .key = key,
        .value =
            cJSON_IsObject(at->value) ? cJSON_GetObjectItemCaseSensitive(at->value, key) : NULL,
    };
}

struct json_at json_child(const struct json_at *at, size_t index, const cJSON *value)
{
    return (struct json_at){
        .parent = at,
        .source = at->source,
        .origin = at->origin,
        .key = value != NULL && cJSON_IsObject(at->value) ? value->string : NULL,
        .index = index,
        .value = value,
    };
}

const cJSON *json_first(const struct json_at *at)
{
    return cJSON_IsObject(at->value) || cJSON_IsArray(at->value) ? at->value->child : NULL;
}

size_t json_count(const struct json_at *at)
{
    size_t n = 0;
    for (const cJSON *child = json_first(at); child != NULL; child = child->next)
        n++;
    return n;
}

bool json_given(const struct json_at *at)
{
    return at->value != NULL && !cJSON_IsNull(at->value);
}

bool json_is_private(const char *key)
{
    return strncmp(key, "x_", 2) == 0;
}

/* --- checked access --- */

/* "a, b or c" */
static void add_names(const char *const names[], size_t n, struct text *out)
{
    for (size_t i = 0; i < n; i++) {
        if (i > 0)
            text_add(out, i + 1 < n ? ", " : " or ");
        text_add(out, names[i]);
    }
}

static enum rf_status fail_unknown_key(const struct json_at *at, const char *const known[],
                                       size_t n, struct rf_error *error)
{
    struct text text = {0};
    const char *nearest = text_nearest(at->key, known, n);
    add_place(at, &text);
    text_add(&text, "unknown key; ");
    if (nearest != NULL) {
        text_addf(&text, "did you mean \"%s\"?", nearest);
    } else {
        text_add(&text, "needs ");
        add_names(known, n, &text);
        text_add(&text, "; keys of your own begin x_");
    }
    return fail_text(error, RF_REFUSED, &text);
}

static bool is_among(const char *word, const char *const names[], size_t n, size_t *index)
{
    for (size_t i = 0; i < n; i++)
        if (strcmp(word, names[i]) == 0) {
            *index = i;
            return true;
        }
    return false;
}

enum rf_status json_object(const struct json_at *at, const char *const known[], size_t n,
                           struct rf_error *error)
{
    if (!cJSON_IsObject(at->value))
        return json_fail_found(at, error, "an object in braces { }");
    if (known == NULL)
        return RF_OK;
    JSON_EACH(at, member, i) {
        size_t index;
        if (!json_is_private(member.key) && !is_among(member.key, known, n, &index))
            return fail_unknown_key(&member, known, n, error);
    }
    return RF_OK;
}

enum rf_status json_array(const struct json_at *at, size_t least, size_t most, const char *needs,
                          struct rf_error *error)
{
    if (!cJSON_IsArray(at->value))
        return json_fail_found(at, error, needs);
    size_t n = json_count(at);
    return n < least || n > most ? json_fail_found(at, error, needs) : RF_OK;
}

enum rf_status json_number(const struct json_at *at, double low, double high, const char *needs,
                           double *number, struct rf_error *error)
{
    if (!cJSON_IsNumber(at->value))
        return json_fail_found(at, error, needs);
    double found = at->value->valuedouble;
    if (!(found >= low && found <= high) || (low >= 0 && signbit(found)))
        return json_fail_found(at, error, needs);
    *number = found;
    return RF_OK;
}

enum rf_status json_string(const struct json_at *at, const char *needs, const char **string,
                           struct rf_error *error)
{
    if (!cJSON_IsString(at->value))
        return json_fail_found(at, error, needs);
    *string = at->value->valuestring;
    return RF_OK;
}

enum rf_status json_boolean(const struct json_at *at, bool *boolean, struct rf_error *error)
{
    if (!cJSON_IsBool(at->value))
        return json_fail_found(at, error, "true or false");
    *boolean = cJSON_IsTrue(at->value);
    return RF_OK;
}

enum rf_status json_choice(const struct json_at *at, const char *const names[], size_t n,
                           size_t *index, struct rf_error *error)
{
    struct text text = {0};
    const char *nearest = NULL;
    if (cJSON_IsString(at->value)) {
        if (is_among(at->value->valuestring, names, n, index))
            return RF_OK;
        nearest = text_nearest(at->value->valuestring, names, n);
    }
    add_place(at, &text);
    text_add(&text, at->value == NULL ? "missing" : "found ");
    if (at->value != NULL)
        json_describe(at->value, &text);
    if (nearest != NULL) {
        text_addf(&text, "; did you mean \"%s\"?", nearest);
    } else {
        text_add(&text, "; needs ");
        add_names(names, n, &text);
    }
    return fail_text(error, RF_REFUSED, &text);
}
