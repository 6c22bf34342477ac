/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "job/sheet_text.h"

#include "base/json.h"
#include "job/sheet_grid.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

cJSON *sheet_text_value(const char *cell)
{
    cJSON *value = NULL;
    struct rf_error ignored;
    enum rf_status status =
        cell[0] == '"' ? json_parse(cell, strlen(cell), "", JSON_ONE_LINE, &value, &ignored)
                       : RF_SYNTAX;
    if (status == RF_MEMORY || cJSON_IsString(value))
        return value;
    cJSON_Delete(value);
    return cJSON_CreateString(cell);
}

/* A value as JSON text. */
static void add_json(const cJSON *value, struct text *cell)
{
    char *json = cJSON_PrintUnformatted(value);
    if (json == NULL)
        cell->failed = true;
    else
        text_add(cell, json);
    cJSON_free(json);
}

static void add_string(const char *string, struct text *cell)
{
    cJSON *value = cJSON_CreateString(string);
    if (value == NULL)
        cell->failed = true;
    else
        add_json(value, cell);
    cJSON_Delete(value);
}

void sheet_add_text(const char *string, struct text *cell)
{
    if (string[0] == '\0' || string[0] == '"')
        add_string(string, cell);
    else
        text_add(cell, string);
}

cJSON *sheet_private_value(const char *cell, char decimal)
{
    char json[64];
    cJSON *value = NULL;
    struct rf_error ignored;
    if (sheet_number(cell, decimal, json, sizeof json))
        return cJSON_Parse(json);
    enum rf_status status = json_parse(cell, strlen(cell), "", JSON_ONE_LINE, &value, &ignored);
    return status == RF_OK || status == RF_MEMORY ? value : cJSON_CreateString(cell);
}

/* Whether the text as a cell is that text again, whatever decimal mark the sheet turns out to have. */
static bool reads_as_itself(const char *string)
{
    for (const char *mark = ".,"; *mark != '\0'; mark++) {
        cJSON *back = sheet_private_value(string, *mark);
        bool same = cJSON_IsString(back) && strcmp(back->valuestring, string) == 0;
        cJSON_Delete(back);
        if (!same)
            return false;
    }
    return true;
}

void sheet_add_private(const cJSON *value, char decimal, struct text *cell)
{
    if (cJSON_IsNumber(value)) {
        sheet_add_number(value->valuedouble, decimal, cell);
        return;
    }
    /* An empty cell says nothing. */
    if (cJSON_IsString(value) && value->valuestring[0] != '\0' &&
        reads_as_itself(value->valuestring)) {
        text_add(cell, value->valuestring);
        return;
    }
    add_json(value, cell);
}

/* cJSON's own printing gives up the last digit; 17 are always enough. */
void sheet_add_number(double number, char decimal, struct text *cell)
{
    char digits[40];
    for (int precision = 15; precision <= 17; precision++) {
        snprintf(digits, sizeof digits, "%.*g", precision, number);
        if (strtod(digits, NULL) >= number && strtod(digits, NULL) <= number)
            break;
    }
    for (char *at = digits; *at != '\0'; at++) /* whatever mark the program's locale has */
        if (strchr("+-0123456789e", *at) == NULL)
            *at = decimal;
    text_add(cell, digits);
}
