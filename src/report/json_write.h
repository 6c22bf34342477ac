/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef REPORT_JSON_WRITE_H
#define REPORT_JSON_WRITE_H

/*
 * JSON put together object by object. `failed` stays true once memory was short; further additions
 * do nothing, and the caller looks once, at the end. A NULL object or list takes nothing.
 */

#include "base/text.h"

#include <cjson/cJSON.h>
#include <stdbool.h>

struct json_writer {
    bool failed;
};

/* Take the item over, whatever happens; NULL is one that there was no memory for. */
void json_add(struct json_writer *writer, cJSON *object, const char *key, cJSON *item);
void json_append(struct json_writer *writer, cJSON *list, cJSON *item);

void json_add_number(struct json_writer *writer, cJSON *object, const char *key, double number);
void json_add_words(struct json_writer *writer, cJSON *object, const char *key, const char *words);

/* One made empty, the object's; NULL once memory was short. */
cJSON *json_add_object(struct json_writer *writer, cJSON *object, const char *key);
cJSON *json_add_list(struct json_writer *writer, cJSON *object, const char *key);

/* Appends the whole as one line, or has `out` fail; deletes it. */
void json_end_line(const struct json_writer *writer, cJSON *root, struct text *out);

#endif
