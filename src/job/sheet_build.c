/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "job/sheet_build.h"

#include "base/error.h"
#include "job/sheet_text.h"

#include <stdint.h>
#include <stdlib.h>
#include <string.h>

/* --- where a value of the document stands in the sheet --- */

static int compare_sites(const void *one, const void *other)
{
    const struct sheet_site *a = one, *b = other;
    uintptr_t left = (uintptr_t)a->value, right = (uintptr_t)b->value;
    return left < right ? -1 : left > right;
}

bool sheet_name_value(const struct json_origin *base, const cJSON *value, struct text *out)
{
    const struct sheet_origin *origin = (const struct sheet_origin *)base;
    struct sheet_site key = {.value = value};
    const struct sheet_site *site =
        origin->n_sites > 0
            ? bsearch(&key, origin->sites, origin->n_sites, sizeof key, compare_sites)
            : NULL;
    if (site == NULL)
        return false;
    sheet_name_cell(&origin->grid, site->row, site->column, out);
    return true;
}

void sheet_order_sites(struct sheet_origin *origin)
{
    if (origin->n_sites > 0)
        qsort(origin->sites, origin->n_sites, sizeof *origin->sites, compare_sites);
}

void sheet_origin_destroy(struct json_origin *base)
{
    struct sheet_origin *origin = (struct sheet_origin *)base;
    if (origin == NULL)
        return;
    sheet_grid_finish(&origin->grid);
    free(origin->sites);
    free(origin);
}

/* --- the document as it grows --- */

void build_refuse_memory(struct sheet_build *building)
{
    if (building->status == RF_OK)
        building->status = fail_memory(building->error);
}

/* Notes that `value` stands at a cell. */
static void note_site(struct sheet_build *building, const cJSON *value, size_t row, size_t column)
{
    struct sheet_origin *origin = building->origin;
    if (origin->n_sites == origin->capacity) {
        size_t capacity = origin->capacity > 0 ? 2 * origin->capacity : 256;
        struct sheet_site *sites = realloc(origin->sites, capacity * sizeof *sites);
        if (sites == NULL) {
            build_refuse_memory(building);
            return;
        }
        origin->sites = sites;
        origin->capacity = capacity;
    }
    origin->sites[origin->n_sites++] = (struct sheet_site){value, row, column};
}

void build_put(struct sheet_build *building, cJSON *into, const char *key, cJSON *value, size_t row,
               size_t column)
{
    bool good = value != NULL && (key != NULL ? cJSON_AddItemToObject(into, key, value)
                                              : cJSON_AddItemToArray(into, value));
    if (!good) {
        cJSON_Delete(value);
        build_refuse_memory(building);
        return;
    }
    note_site(building, value, row, column);
}

cJSON *build_need(struct sheet_build *building, cJSON **object)
{
    if (*object == NULL)
        *object = cJSON_CreateObject();
    if (*object == NULL)
        build_refuse_memory(building);
    return *object;
}

const char *build_cell(const struct sheet_build *building, size_t row, size_t column)
{
    return sheet_cell_text(building->grid->rows + row, column);
}

static bool is_unread(const char *text)
{
    return strcmp(text, "-") == 0 || strcmp(text, "\xE2\x80\x93") == 0 ||
           strcmp(text, "\xE2\x80\x94") == 0; /* - and the dashes spreadsheets make of it */
}

/* A number, or the text as it stands for the job's reader to refuse. */
static cJSON *number_value(const struct sheet_build *building, const char *text)
{
    char json[64];
    if (!sheet_number(text, building->grid->style.decimal, json, sizeof json))
        return cJSON_CreateString(text);
    return cJSON_Parse(json);
}

void build_put_number(struct sheet_build *building, cJSON *into, const char *key, size_t row,
                      size_t column)
{
    const char *text = build_cell(building, row, column);
    if (sheet_same_word(text, "unknown") || strcmp(text, "?") == 0)
        build_put(building, into, key, cJSON_CreateNull(), row, column);
    else if (text[0] != '\0' && !is_unread(text))
        build_put(building, into, key, number_value(building, text), row, column);
}

void build_put_text(struct sheet_build *building, cJSON *into, const char *key, size_t row,
                    size_t column)
{
    const char *text = build_cell(building, row, column);
    if (text[0] != '\0')
        build_put(building, into, key, sheet_text_value(text), row, column);
}

void build_put_readings(struct sheet_build *building, cJSON **into, const char *key, size_t row,
                        size_t first, size_t last)
{
    cJSON *list = cJSON_CreateArray();
    if (list == NULL || build_need(building, into) == NULL) {
        cJSON_Delete(list);
        build_refuse_memory(building);
        return;
    }
    for (size_t column = first; column <= last; column++) {
        const char *at = build_cell(building, row, column);
        if (is_unread(at))
            continue;
        while (building->status == RF_OK && sheet_next_word(&at, &building->word)) {
            if (building->word.failed)
                build_refuse_memory(building);
            else
                build_put(building, list, NULL,
                          sheet_is_over_range(building->word.bytes)
                              ? cJSON_CreateString("open")
                              : number_value(building, building->word.bytes),
                          row, column);
        }
    }
    int n = cJSON_GetArraySize(list);
    if (n == 1 && building->status == RF_OK) {
        cJSON *only = cJSON_DetachItemFromArray(list, 0);
        if (!cJSON_AddItemToObject(*into, key, only)) {
            cJSON_Delete(only);
            build_refuse_memory(building);
        }
    }
    if (n > 1 && building->status == RF_OK)
        build_put(building, *into, key, list, row, first);
    else
        cJSON_Delete(list);
}
