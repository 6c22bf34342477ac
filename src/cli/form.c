/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "cli/form.h"

#include "base/error.h"
#include "job/job_parse.h"
#include "job/job_write.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

cJSON *form_object(cJSON *in, const char *key)
{
    cJSON *object = cJSON_GetObjectItemCaseSensitive(in, key);
    return object != NULL ? object : cJSON_AddObjectToObject(in, key);
}

cJSON *form_ring(const struct form *form)
{
    return cJSON_GetObjectItemCaseSensitive(form->document, "ring");
}

enum rf_status form_lay_points(struct form *form, struct rf_error *error)
{
    cJSON *ring = form_object(form->document, "ring");
    cJSON *points = cJSON_GetObjectItemCaseSensitive(ring, "points");
    if (ring != NULL && points == NULL)
        points = cJSON_AddArrayToObject(ring, "points");
    if (points == NULL)
        return fail_memory(error);
    while ((size_t)cJSON_GetArraySize(points) > form->n_points)
        cJSON_DeleteItemFromArray(points, cJSON_GetArraySize(points) - 1);
    for (size_t i = (size_t)cJSON_GetArraySize(points); i < form->n_points; i++) {
        char id[24];
        snprintf(id, sizeof id, "P%zu", i + 1);
        cJSON *point = cJSON_CreateObject();
        if (point == NULL || cJSON_AddStringToObject(point, "id", id) == NULL ||
            !cJSON_AddItemToArray(points, point)) {
            cJSON_Delete(point);
            return fail_memory(error);
        }
    }
    return RF_OK;
}

/* Index of the spur point in the list, or its length. */
static int find_spur(const cJSON *spurs, const char *id)
{
    int i = 0;
    const cJSON *spur;
    cJSON_ArrayForEach(spur, spurs) {
        if (strcmp(cJSON_GetObjectItemCaseSensitive(spur, "id")->valuestring, id) == 0)
            break;
        i++;
    }
    return i;
}

enum rf_status form_hang_spur(struct form *form, size_t spur, const char *from,
                              struct rf_error *error)
{
    char id[24];
    cJSON *ring = form_ring(form), *spurs = cJSON_GetObjectItemCaseSensitive(ring, "spurs");
    snprintf(id, sizeof id, "S%zu", spur + 1);
    if (spurs == NULL && from == NULL)
        return RF_OK;
    if (spurs == NULL)
        spurs = cJSON_AddArrayToObject(ring, "spurs");
    if (spurs == NULL)
        return fail_memory(error);
    int at = find_spur(spurs, id);
    cJSON *point = cJSON_GetArrayItem(spurs, at);
    if (from == NULL) {
        cJSON_DeleteItemFromArray(spurs, at);
        if (spurs->child == NULL)
            cJSON_DeleteItemFromObjectCaseSensitive(ring, "spurs");
        return RF_OK;
    }
    if (point == NULL) {
        point = cJSON_CreateObject();
        if (point == NULL || cJSON_AddStringToObject(point, "id", id) == NULL ||
            !cJSON_AddItemToArray(spurs, point)) {
            cJSON_Delete(point);
            return fail_memory(error);
        }
    }
    cJSON_DeleteItemFromObjectCaseSensitive(point, "from");
    return cJSON_AddStringToObject(point, "from", from) != NULL ? RF_OK : fail_memory(error);
}

enum rf_status form_choose_setups(struct form *form, const char *list, struct rf_error *error)
{
    const char *names[N_SETUPS];
    for (size_t i = 0; i < N_SETUPS; i++)
        names[i] = setups[i].name;
    form->n_setups = 0;
    for (const char *at = list; *at != '\0';) {
        char name[64];
        size_t length = strcspn(at, ", ");
        snprintf(name, sizeof name, "%.*s", (int)(length < 63 ? length : 63), at);
        at += length;
        at += strspn(at, ", ");
        if (length == 0)
            continue;
        size_t setup = setup_find(name);
        if (setup == N_SETUPS) {
            const char *nearest = text_nearest(name, names, N_SETUPS);
            return fail(error, RF_USAGE, "no set-up %s; %s%s%s", name,
                        nearest != NULL ? "did you mean " : "there are end_to_end, cross_ln, ",
                        nearest != NULL ? nearest : "link_out_ln, lead_out_l, apart_ln and so on",
                        nearest != NULL ? "?" : "");
        }
        for (size_t i = 0; i < form->n_setups; i++)
            if (form->setups[i] == setup)
                return fail(error, RF_USAGE, "set-up %s twice; needs it once", name);
        form->setups[form->n_setups++] = setup;
    }
    return RF_OK;
}

enum rf_status form_job(const struct form *form, struct rf_job **job, struct rf_error *error)
{
    cJSON *copy = cJSON_Duplicate(form->document, true);
    *job = NULL;
    if (copy == NULL)
        return fail_memory(error);
    return job_from_document(copy, NULL, form->path, 0, job, error);
}

/* JSON has no empty cells; a set-up to be read stands there as an empty object. */
static enum rf_status write_json(const struct form *form, struct text *out, struct rf_error *error)
{
    cJSON *copy = cJSON_Duplicate(form->document, true);
    cJSON *readings = copy != NULL ? form_object(copy, "readings") : NULL;
    bool good = readings != NULL;
    for (size_t i = 0; i < form->n_setups && good; i++)
        good = form_object(readings, setups[form->setups[i]].name) != NULL;
    enum rf_status status = good ? job_write_document(copy, out, error) : fail_memory(error);
    cJSON_Delete(copy);
    return status;
}

enum rf_status form_save(struct form *form, struct rf_error *error)
{
    struct text out = {0};
    enum rf_status status = form->as_json ? write_json(form, &out, error)
                                          : sheet_write(form->document, &form->style, form->setups,
                                                        form->n_setups, &out, error);
    if (status == RF_OK)
        status = form->hold == NULL ? file_create(form->path, &out, &form->hold, error)
                                    : file_replace(form->hold, &out, error);
    text_finish(&out);
    return status;
}
