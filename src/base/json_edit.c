/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/json_edit.h"

#include "base/error.h"

#include <cjson/cJSON.h>
#include <stdint.h>
#include <string.h>

/* Bytes from … to of the text. */
struct span {
    size_t from, to;
};

/* A member of an object, or an element of a list, and its neighbours' spacing. */
struct item {
    struct span key; /* with its quotes; empty: an element */
    struct span value;
    struct span gap; /* between the comma or bracket before it and it */
    size_t comma;    /* the comma or bracket before it */
    size_t end;      /* the comma or bracket behind it */
    size_t index;
    bool found;
};

static size_t skip_space(const char *json, size_t at)
{
    return at + strspn(json + at, " \t\r\n");
}

static size_t skip_string(const char *json, size_t at)
{
    for (at++; json[at] != '"'; at++)
        if (json[at] == '\\')
            at++;
    return at + 1;
}

static size_t skip_value(const char *json, size_t at)
{
    if (json[at] == '"')
        return skip_string(json, at);
    if (json[at] != '{' && json[at] != '[')
        return at + strcspn(json + at, ",]} \t\r\n");
    size_t depth = 0;
    do {
        if (json[at] == '"') {
            at = skip_string(json, at);
            continue;
        }
        if (json[at] == '{' || json[at] == '[')
            depth++;
        else if (json[at] == '}' || json[at] == ']')
            depth--;
        at++;
    } while (depth > 0);
    return at;
}

static bool key_is(const char *json, struct span key, const char *wanted)
{
    size_t length = key.to - key.from - 2;
    if (memchr(json + key.from, '\\', key.to - key.from) == NULL)
        return strlen(wanted) == length && memcmp(json + key.from + 1, wanted, length) == 0;
    cJSON *string = cJSON_ParseWithLength(json + key.from, key.to - key.from);
    bool same = cJSON_IsString(string) && strcmp(string->valuestring, wanted) == 0;
    cJSON_Delete(string);
    return same;
}

/* The item behind the comma or bracket at `comma`; false at the container's end. */
static bool next_item(const char *json, size_t comma, bool object, struct item *item)
{
    size_t at = skip_space(json, comma + 1);
    item->comma = comma;
    item->gap = (struct span){comma + 1, at};
    if (json[at] == '}' || json[at] == ']')
        return false;
    item->key = (struct span){at, at};
    if (object) {
        item->key.to = skip_string(json, at);
        at = skip_space(json, item->key.to) + 1; /* the colon */
        at = skip_space(json, at);
    }
    item->value = (struct span){at, skip_value(json, at)};
    item->end = skip_space(json, item->value.to);
    return true;
}

/* Item `index` (or the one with `key`) of the container at `open`; if there is none, the last,
 * with found false; its `end` is 0 where the container is empty. */
static struct item find_item(const char *json, size_t open, const char *key, size_t index)
{
    struct item item = {0}, last = {0};
    bool object = json[open] == '{';
    for (size_t comma = open; next_item(json, comma, object, &item); comma = item.end) {
        item.found = object ? key != NULL && key_is(json, item.key, key) : item.index == index;
        last = item;
        if (item.found || json[item.end] != ',')
            break;
        item.index++;
    }
    return last;
}

static enum rf_status replace(struct text *json, struct span span, const struct text *with,
                              struct rf_error *error)
{
    struct text made = {0};
    text_append(&made, json->bytes, span.from);
    text_append(&made, with->bytes != NULL ? with->bytes : "", with->length);
    text_append(&made, json->bytes + span.to, json->length - span.to);
    if (made.failed || with->failed) {
        text_finish(&made);
        return fail_memory(error);
    }
    text_finish(json);
    *json = made;
    return RF_OK;
}

static void add_string(const char *string, struct text *out)
{
    cJSON *value = cJSON_CreateString(string);
    char *json = value != NULL ? cJSON_PrintUnformatted(value) : NULL;
    if (json == NULL)
        out->failed = true;
    else
        text_add(out, json);
    cJSON_free(json);
    cJSON_Delete(value);
}

/* Puts an item behind the last one of the container at `open`. */
static enum rf_status insert(struct text *json, size_t open, const char *key, const char *value,
                             struct rf_error *error)
{
    struct text made = {0};
    const char *bytes = json->bytes;
    struct item last = find_item(bytes, open, NULL, SIZE_MAX);
    size_t at = open + 1;
    if (last.end > 0) {
        bool close = key != NULL && last.value.from == last.key.to + 1; /* "a":1 */
        at = last.value.to;
        text_add(&made, ",");
        if (last.gap.to > last.gap.from || last.index > 0)
            text_append(&made, bytes + last.gap.from, last.gap.to - last.gap.from);
        else if (!close)
            text_add(&made, " ");
    }
    if (key != NULL) {
        add_string(key, &made);
        if (last.end > 0)
            text_append(&made, bytes + last.key.to, last.value.from - last.key.to);
        else
            text_add(&made, ": ");
    }
    text_add(&made, value);
    enum rf_status status = replace(json, (struct span){at, at}, &made, error);
    text_finish(&made);
    return status;
}

static enum rf_status document_at(const struct text *json, size_t *open, struct rf_error *error)
{
    size_t at = json->length >= 3 && memcmp(json->bytes, "\xEF\xBB\xBF", 3) == 0 ? 3 : 0;
    *open = skip_space(json->bytes, at);
    return json->bytes[*open] == '{' ? RF_OK : fail(error, RF_REFUSED, "found no object to change");
}

/* Goes down the path as far as it leads: *depth keys of it are there, `item` is the last of them
 * and *open the object the next one would be in. */
static enum rf_status descend(const struct text *json, const char *const path[], size_t n,
                              size_t *depth, size_t *open, struct item *item,
                              struct rf_error *error)
{
    enum rf_status status = document_at(json, open, error);
    *depth = 0;
    while (status == RF_OK && *depth < n) {
        struct item next = find_item(json->bytes, *open, path[*depth], 0);
        if (!next.found)
            break;
        *item = next;
        ++*depth;
        if (*depth < n) {
            *open = next.value.from;
            if (json->bytes[*open] != '{')
                status =
                    fail(error, RF_REFUSED, "%s: found no object; needs one", path[*depth - 1]);
        }
    }
    return status;
}

enum rf_status json_edit_set(struct text *json, const char *const path[], size_t n,
                             const char *value, struct rf_error *error)
{
    size_t depth, open;
    struct item item;
    enum rf_status status = descend(json, path, n, &depth, &open, &item, error);
    if (status != RF_OK)
        return status;
    struct text made = {0};
    if (depth == n) {
        text_add(&made, value);
        status = replace(json, item.value, &made, error);
    } else {
        for (size_t i = depth + 1; i < n; i++) {
            text_add(&made, "{");
            add_string(path[i], &made);
            text_add(&made, ": ");
        }
        text_add(&made, value);
        for (size_t i = depth + 1; i < n; i++)
            text_add(&made, "}");
        status =
            made.failed ? fail_memory(error) : insert(json, open, path[depth], made.bytes, error);
    }
    text_finish(&made);
    return status;
}

enum rf_status json_edit_append(struct text *json, const char *const path[], size_t n,
                                const char *value, bool always_list, struct rf_error *error)
{
    size_t depth, open;
    struct item item;
    enum rf_status status = descend(json, path, n, &depth, &open, &item, error);
    if (status != RF_OK)
        return status;
    if (depth == n && json->bytes[item.value.from] == '[')
        return insert(json, item.value.from, NULL, value, error);
    struct text made = {0};
    if (depth == n) {
        text_add(&made, "[");
        text_append(&made, json->bytes + item.value.from, item.value.to - item.value.from);
        text_addf(&made, ", %s]", value);
        status = replace(json, item.value, &made, error);
    } else {
        text_addf(&made, always_list ? "[%s]" : "%s", value);
        status = made.failed ? fail_memory(error) : json_edit_set(json, path, n, made.bytes, error);
    }
    text_finish(&made);
    return status;
}

/* Takes an item out with the comma that parted it from its neighbour. */
static enum rf_status take_out(struct text *json, const struct item *item, struct rf_error *error)
{
    const struct text nothing = {0};
    struct span span = {item->comma, item->value.to};
    if (item->index == 0) { /* the bracket stays; the next one moves into this one's place */
        span.from = item->gap.to;
        if (json->bytes[item->end] == ',')
            span.to = skip_space(json->bytes, item->end + 1);
    }
    return replace(json, span, &nothing, error);
}

enum rf_status json_edit_remove(struct text *json, const char *const path[], size_t n,
                                struct rf_error *error)
{
    size_t depth, open;
    struct item item;
    enum rf_status status = descend(json, path, n, &depth, &open, &item, error);
    return status == RF_OK && depth == n ? take_out(json, &item, error) : status;
}

enum rf_status json_edit_remove_element(struct text *json, const char *const path[], size_t n,
                                        size_t index, struct rf_error *error)
{
    size_t depth, open;
    struct item item;
    enum rf_status status = descend(json, path, n, &depth, &open, &item, error);
    if (status != RF_OK || depth < n || json->bytes[item.value.from] != '[')
        return status;
    item = find_item(json->bytes, item.value.from, NULL, index);
    return item.found ? take_out(json, &item, error) : RF_OK;
}
