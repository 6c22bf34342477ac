/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "job/sheet.h"

#include "base/error.h"
#include "base/memory.h"
#include "job/job_parse.h"
#include "job/sheet_build.h"

#include <stdlib.h>

/* --- put together --- */

/* The set-ups in the order they were made: as a `setups` row says, end to end first, then as
 * the columns stand. */
static void order_setups(struct sheet_build *building)
{
    bool placed[N_SETUPS] = {false};
    for (size_t i = 0; i < building->n_order; i++)
        placed[building->order[i]] = true;
    if (!placed[0])
        building->order[building->n_order++] = 0;
    placed[0] = true;
    for (size_t i = 0; i < building->n_columns; i++) {
        size_t setup = building->columns[i].which;
        if (building->columns[i].holds == HOLDS_SETUP && !placed[setup]) {
            placed[setup] = true;
            building->order[building->n_order++] = setup;
        }
    }
    for (size_t i = 0; i < N_SETUPS; i++) /* those with keys of the user's own only */
        if (!placed[i])
            building->order[building->n_order++] = i;
}

/* Hands `part` over into `into`, where there is any. */
static void hand_over(struct sheet_build *building, cJSON *into, const char *key, cJSON **part)
{
    if (*part == NULL || building->status != RF_OK)
        return;
    if (!cJSON_AddItemToObject(into, key, *part))
        build_refuse_memory(building);
    else
        *part = NULL;
}

static bool names_nothing(const cJSON *setup)
{
    return setup->child == NULL;
}

static void assemble_readings(struct sheet_build *building, size_t n_named)
{
    for (size_t i = 0; i < building->n_order && building->status == RF_OK; i++) {
        cJSON **setup = &building->setups[building->order[i]];
        if (*setup == NULL || (names_nothing(*setup) && i >= n_named))
            continue;
        if (build_need(building, &building->readings) != NULL)
            hand_over(building, building->readings, setups[building->order[i]].name, setup);
    }
}

static void assemble(struct sheet_build *building)
{
    cJSON *list = building->document; /* so far: job, date, note, opened, checked */
    building->opened = cJSON_DetachItemFromObjectCaseSensitive(list, "opened");
    building->checked = cJSON_DetachItemFromObjectCaseSensitive(list, "checked");
    size_t n_named = building->n_order;
    order_setups(building);
    if (build_need(building, &building->ring) != NULL) {
        cJSON *last = cJSON_DetachItemFromObjectCaseSensitive(building->ring, "last_run_m");
        hand_over(building, building->ring, "points", &building->points);
        hand_over(building, building->ring, "last_run_m", &last);
        hand_over(building, building->ring, "spurs", &building->spurs);
        cJSON_Delete(last);
    }
    hand_over(building, list, "ring", &building->ring);
    build_need(building, &building->readings); /* that there is none in it is then the complaint */
    assemble_readings(building, n_named);
    hand_over(building, list, "readings", &building->readings);
    hand_over(building, list, "access", &building->access);
    hand_over(building, list, "opened", &building->opened);
    hand_over(building, list, "checked", &building->checked);
    if (building->also != NULL && build_need(building, &building->found) != NULL)
        hand_over(building, building->found, "also", &building->also);
    hand_over(building, list, "found", &building->found);
    while (building->status == RF_OK && building->private_keys != NULL &&
           building->private_keys->child != NULL) {
        cJSON *own = building->private_keys->child;
        char *key = text_duplicate(own->string);
        own = cJSON_DetachItemViaPointer(building->private_keys, own);
        if (key == NULL || !cJSON_AddItemToObject(list, key, own)) {
            cJSON_Delete(own);
            build_refuse_memory(building);
        }
        free(key);
    }
}

static void finish_building(struct sheet_build *building)
{
    cJSON *parts[] = {building->document,     building->ring,   building->points, building->spurs,
                      building->readings,     building->access, building->found,  building->also,
                      building->private_keys, building->opened, building->checked};
    for (size_t i = 0; i < sizeof parts / sizeof parts[0]; i++)
        cJSON_Delete(parts[i]);
    for (size_t i = 0; i < N_SETUPS; i++)
        cJSON_Delete(building->setups[i]);
    free(building->columns);
    text_finish(&building->word);
}

static bool is_of_key(char byte)
{
    return (byte >= 'a' && byte <= 'z') || (byte >= 'A' && byte <= 'Z') ||
           (byte >= '0' && byte <= '9') || byte == '_' || byte == '.' || byte == ' ' ||
           byte == '-' || (unsigned char)byte >= 0x80;
}

bool sheet_first_line(const char *line, size_t length)
{
    size_t i = 0;
    while (i < length && line[i] == ' ')
        i++;
    if (i < length && line[i] == '"')
        i++;
    while (i < length && is_of_key(line[i]))
        i++;
    if (i < length && line[i] == '"')
        i++;
    while (i < length && line[i] == ' ')
        i++;
    return i < length && (line[i] == ',' || line[i] == ';' || line[i] == '\t');
}

enum rf_status sheet_parse(const char *bytes, size_t length, const char *source, cJSON **document,
                           struct json_origin **origin, struct rf_error *error)
{
    *document = NULL;
    *origin = NULL;
    struct sheet_origin *made = NEW(struct sheet_origin);
    if (made == NULL)
        return fail_memory(error);
    made->base.name = sheet_name_value;
    struct sheet_build building = {.origin = made, .grid = &made->grid, .error = error};

    building.status = sheet_grid_read(&made->grid, bytes, length, source, error);
    if (building.status == RF_OK && build_need(&building, &building.document) != NULL &&
        cJSON_AddStringToObject(building.document, "format", "ringfettle-job/1") == NULL)
        build_refuse_memory(&building);
    for (size_t i = 0; building.status == RF_OK && i < made->grid.n_rows; i++)
        if (i < made->grid.head || i >= made->grid.table)
            sheet_read_key_row(&building, i);
    if (building.status == RF_OK)
        sheet_read_table(&building);
    if (building.status == RF_OK)
        assemble(&building);
    if (building.status == RF_OK) {
        sheet_order_sites(made);
        *document = building.document;
        *origin = &made->base;
        building.document = NULL;
    } else {
        sheet_origin_destroy(&made->base);
    }
    finish_building(&building);
    return building.status;
}

enum rf_status sheet_job_parse(const char *bytes, size_t length, const char *source,
                               enum json_lines lines, struct rf_job **job, struct rf_error *error)
{
    cJSON *document;
    struct json_origin *origin;
    (void)lines;
    *job = NULL;
    enum rf_status status = sheet_parse(bytes, length, source, &document, &origin, error);
    if (status == RF_OK)
        status = job_from_document(document, origin, source, 1, job, error);
    sheet_origin_destroy(origin);
    return status;
}
