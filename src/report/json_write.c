/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "report/json_write.h"

void json_add(struct json_writer *writer, cJSON *object, const char *key, cJSON *item)
{
    if (item != NULL && object != NULL && cJSON_AddItemToObject(object, key, item))
        return;
    cJSON_Delete(item);
    writer->failed = true;
}

void json_append(struct json_writer *writer, cJSON *list, cJSON *item)
{
    if (item != NULL && list != NULL && cJSON_AddItemToArray(list, item))
        return;
    cJSON_Delete(item);
    writer->failed = true;
}

void json_add_number(struct json_writer *writer, cJSON *object, const char *key, double number)
{
    json_add(writer, object, key, cJSON_CreateNumber(number));
}

void json_add_words(struct json_writer *writer, cJSON *object, const char *key, const char *words)
{
    json_add(writer, object, key, cJSON_CreateString(words));
}

cJSON *json_add_object(struct json_writer *writer, cJSON *object, const char *key)
{
    cJSON *made = cJSON_CreateObject();
    json_add(writer, object, key, made);
    return writer->failed ? NULL : made;
}

cJSON *json_add_list(struct json_writer *writer, cJSON *object, const char *key)
{
    cJSON *made = cJSON_CreateArray();
    json_add(writer, object, key, made);
    return writer->failed ? NULL : made;
}

void json_end_line(const struct json_writer *writer, cJSON *root, struct text *out)
{
    char *line = writer->failed ? NULL : cJSON_PrintUnformatted(root);
    if (line != NULL)
        text_addf(out, "%s\n", line);
    else
        out->failed = true;
    cJSON_free(line);
    cJSON_Delete(root);
}
