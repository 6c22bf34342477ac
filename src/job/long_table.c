/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "job/long_table.h"

#include "base/error.h"
#include "base/memory.h"
#include "job/job_parse.h"
#include "job/long_reader.h"

#include <stdlib.h>
#include <string.h>

/* --- messages, rows handed back --- */

static bool name_site(const struct json_origin *base, const cJSON *value, struct text *out)
{
    const struct long_reader *reader = (const struct long_reader *)base;
    for (size_t i = 0; i < reader->group.n_sites; i++)
        if (reader->group.sites[i].value == value) {
            text_addf(out, "row %zu, column %s", reader->group.sites[i].row,
                      reader->names[reader->group.sites[i].column]);
            return true;
        }
    return false;
}

static void hand_back(struct long_reader *reader, const char *row, size_t length)
{
    const struct long_options *options = reader->options;
    if (reader->head.length > 0) {
        reader->failed |=
            !options->reject(options->context, reader->head.bytes, reader->head.length);
        text_clear(&reader->head);
    }
    if (length > 0)
        reader->failed |= !options->reject(options->context, row, length);
}

static void complain(struct long_reader *reader, const struct rf_error *error)
{
    reader->options->complain(reader->options->context, error);
}

/* --- jobs there were --- */

/* FNV-1a, 64 bits. Two jobs of a million share a hash once in 30 million archives. */
static uint64_t hash(const char *name)
{
    uint64_t hash = 14695981039346656037u;
    for (; *name != '\0'; name++)
        hash = (hash ^ (unsigned char)*name) * 1099511628211u;
    return hash != 0 ? hash : 1;
}

static uint64_t *seek(uint64_t *seen, size_t capacity, uint64_t wanted)
{
    size_t i = (size_t)wanted & (capacity - 1);
    while (seen[i] != 0 && seen[i] != wanted)
        i = (i + 1) & (capacity - 1);
    return &seen[i];
}

/* *before: whether the job was met before; it is noted. */
static enum rf_status note_job(struct long_reader *reader, const char *name, bool *before,
                               struct rf_error *error)
{
    if (2 * (reader->n_seen + 1) > reader->seen_capacity) {
        size_t capacity = reader->seen_capacity > 0 ? 2 * reader->seen_capacity : 1024;
        uint64_t *seen = NEW_ARRAY(uint64_t, capacity);
        if (seen == NULL)
            return fail_memory(error);
        for (size_t i = 0; i < reader->seen_capacity; i++)
            if (reader->seen[i] != 0)
                *seek(seen, capacity, reader->seen[i]) = reader->seen[i];
        free(reader->seen);
        reader->seen = seen;
        reader->seen_capacity = capacity;
    }
    uint64_t *slot = seek(reader->seen, reader->seen_capacity, hash(name));
    *before = *slot != 0;
    reader->n_seen += !*before;
    *slot = hash(name);
    return RF_OK;
}

/* --- a job grows --- */

static void clear_group(struct long_group *group)
{
    cJSON_Delete(group->document);
    cJSON_Delete(group->ring);
    cJSON_Delete(group->readings);
    for (size_t i = 0; i < group->n_points; i++)
        cJSON_Delete(group->points[i].object);
    group->document = group->ring = group->readings = NULL;
    group->n_points = group->n_sites = 0;
    group->begun = group->bad = group->handed_back = false;
    text_clear(&group->name);
    text_clear(&group->raw);
}

static enum rf_status begin_group(struct long_reader *reader, const char *name, size_t row,
                                  struct rf_error *error)
{
    struct long_group *group = &reader->group;
    bool before = false;
    group->begun = true;
    group->document = cJSON_CreateObject();
    group->ring = cJSON_CreateObject();
    group->readings = cJSON_CreateObject();
    text_add(&group->name, name);
    if (group->document == NULL || group->ring == NULL || group->readings == NULL ||
        group->name.failed ||
        cJSON_AddStringToObject(group->document, "format", "ringfettle-job/1") == NULL ||
        cJSON_AddStringToObject(group->document, "job", name) == NULL)
        return fail_memory(error);
    enum rf_status status = note_job(reader, name, &before, error);
    if (status == RF_OK && before) {
        struct rf_error bad;
        fail(&bad, RF_REFUSED,
             "%s: row %zu, column %s: found job \"%.60s\" again; needs the rows of a job together",
             reader->source, row, reader->names[LONG_JOB], name);
        complain(reader, &bad);
        group->bad = true;
    }
    return status;
}

/* --- a job is whole --- */

static int compare_seq(const void *one, const void *other)
{
    const struct long_point *a = one, *b = other;
    if (a->seq < b->seq || a->seq > b->seq)
        return a->seq < b->seq ? -1 : 1;
    return a->row < b->row ? -1 : a->row > b->row;
}

/* By number where there is a column of numbers: every ring point then needs its own. */
static void order_points(struct long_reader *reader)
{
    struct long_group *group = &reader->group;
    if (reader->columns[LONG_SEQ] == SIZE_MAX)
        return;
    qsort(group->points, group->n_points, sizeof group->points[0], compare_seq);
    double last = 0;
    for (size_t i = 0; i < group->n_points; i++) {
        const struct long_point *point = &group->points[i];
        struct rf_error error;
        if (cJSON_HasObjectItem(point->object, "from"))
            continue;
        if (point->seq > last) {
            last = point->seq;
            continue;
        }
        fail(&error, RF_REFUSED,
             "%s: row %zu, column %s: found %s; needs a number of its own for "
             "every point of the ring",
             reader->source, point->row, reader->names[LONG_SEQ],
             point->seq > 0 ? "a number that another point has" : "nothing");
        complain(reader, &error);
        group->bad = true;
    }
}

static enum rf_status put_together(struct long_group *group, struct rf_error *error)
{
    cJSON *points = cJSON_AddArrayToObject(group->ring, "points");
    cJSON *spurs = NULL;
    for (size_t i = 0; i < group->n_points && points != NULL; i++) {
        cJSON *object = group->points[i].object;
        cJSON **list = cJSON_HasObjectItem(object, "from") ? &spurs : &points;
        if (*list == NULL)
            *list = cJSON_AddArrayToObject(group->ring, "spurs");
        if (*list == NULL || !cJSON_AddItemToArray(*list, object))
            return fail_memory(error);
        group->points[i].object = NULL;
    }
    cJSON *found = cJSON_DetachItemFromObjectCaseSensitive(group->document, "found");
    bool good = points != NULL && cJSON_AddItemToObject(group->document, "ring", group->ring);
    if (good) {
        group->ring = NULL;
        good = cJSON_AddItemToObject(group->document, "readings", group->readings);
    }
    if (good) {
        group->readings = NULL;
        if (found != NULL && cJSON_AddItemToObject(group->document, "found", found))
            found = NULL;
        good = found == NULL;
    }
    cJSON_Delete(found);
    return good ? RF_OK : fail_memory(error);
}

/* Ends the group: a job, or its rows handed back. */
static enum rf_status end_group(struct long_reader *reader, struct rf_job **job,
                                struct rf_error *error)
{
    struct long_group *group = &reader->group;
    enum rf_status status = RF_OK;
    if (!group->bad)
        order_points(reader);
    if (!group->bad)
        status = put_together(group, error);
    if (!group->bad && status == RF_OK) {
        cJSON *document = group->document;
        struct rf_error refused;
        group->document = NULL;
        status = job_from_document(document, &reader->base, reader->source, 1, job, &refused);
        if (rf_status_class(status) == RF_CLASS_INPUT) {
            complain(reader, &refused);
            group->bad = true;
            status = RF_OK;
        } else if (status != RF_OK) {
            fail(error, status, "%s", refused.text);
        }
    }
    if (group->bad)
        hand_back(reader, group->raw.bytes, group->raw.length);
    clear_group(group);
    return status;
}

static enum rf_status keep_row(struct long_reader *reader, const struct csv_row *row,
                               struct rf_error *error)
{
    struct long_group *group = &reader->group;
    text_append(&group->raw, row->raw, row->raw_length);
    text_add(&group->raw, row->end[0] != '\0' ? row->end : "\n");
    if (group->raw.failed)
        return fail_memory(error);
    if (group->raw.length <= JOB_MAX_BYTES && group->n_sites <= 20 * JOB_MAX_READINGS)
        return RF_OK;
    if (!group->handed_back) {
        struct rf_error bad;
        fail(&bad, RF_LIMIT, "%s: row %zu: found more rows than a job may have", reader->source,
             row->number);
        complain(reader, &bad);
    }
    group->bad = group->handed_back = true;
    hand_back(reader, group->raw.bytes, group->raw.length);
    text_clear(&group->raw);
    return RF_OK;
}

/* A row that cannot be taken apart: whose it is nobody knows, so neither the job before it nor the
 * one behind it is made. */
static enum rf_status pass_unreadable(struct long_reader *reader, const struct csv_row *row,
                                      const struct rf_error *why, struct rf_error *error)
{
    complain(reader, why);
    reader->unreadable = row->number;
    reader->group.bad = true;
    return keep_row(reader, row, error);
}

/* A row of the group, or of one that begins with it. */
static enum rf_status read_row(struct long_reader *reader, const struct csv_row *row,
                               struct rf_error *error)
{
    struct long_group *group = &reader->group;
    enum rf_status status = RF_OK;
    if (!group->begun)
        status = begin_group(reader, long_cell(reader, row, LONG_JOB), row->number, error);
    if (status == RF_OK && reader->unreadable != 0) {
        struct rf_error bad;
        fail(&bad, RF_REFUSED,
             "%s: row %zu: the job \"%.60s\" is not made: row %zu may have been one of its rows",
             reader->source, row->number, group->name.bytes, reader->unreadable);
        complain(reader, &bad);
        group->bad = true;
        reader->unreadable = 0;
    }
    if (status == RF_OK)
        status = keep_row(reader, row, error);
    if (status == RF_OK && !group->handed_back)
        status = long_take_row(reader, row, error);
    return status;
}

static bool is_empty(const struct csv_row *row)
{
    for (size_t i = 0; i < row->n_cells; i++)
        if (row->cells[i].length > 0)
            return false;
    return true;
}

/* Every row has as many cells as the first: one too many is a comma without quotes. */
static bool is_whole(const struct long_reader *reader, const struct csv_row *row,
                     struct rf_error *error)
{
    if (row->n_cells != reader->width) {
        fail(error, RF_REFUSED, "%s: row %zu: found %zu cells; needs %zu, as the first row has",
             reader->source, row->number, row->n_cells, reader->width);
        return false;
    }
    if (long_cell(reader, row, LONG_JOB)[0] == '\0') {
        fail(error, RF_REFUSED, "%s: row %zu, column %s: found nothing; needs the job's name",
             reader->source, row->number, reader->names[LONG_JOB]);
        return false;
    }
    return true;
}

/* Ends what is left at the end of the table. */
static enum rf_status finish(struct long_reader *reader, struct rf_job **job,
                             struct rf_error *error)
{
    reader->ended = true;
    return reader->group.begun || reader->group.bad ? end_group(reader, job, error) : RF_OK;
}

enum rf_status long_reader_next(struct long_reader *reader, struct rf_job **job,
                                struct rf_error *error)
{
    struct long_group *group = &reader->group;
    struct rf_error why;
    enum rf_status status = RF_OK;
    *job = NULL;
    while (status == RF_OK && *job == NULL && !reader->ended) {
        const struct csv_row *row = reader->pending;
        reader->pending = NULL;
        if (row == NULL)
            status = csv_next(reader->csv, &row, &why);
        if (status == RF_SYNTAX)
            status = pass_unreadable(reader, row, &why, error);
        else if (status != RF_OK)
            fail(error, status, "%s", why.text);
        else if (row == NULL)
            status = finish(reader, job, error);
        else if (is_empty(row))
            continue;
        else if (!is_whole(reader, row, &why))
            status = pass_unreadable(reader, row, &why, error);
        else if (group->begun && strcmp(group->name.bytes, long_cell(reader, row, LONG_JOB)) != 0) {
            reader->pending = row;
            status = end_group(reader, job, error);
        } else {
            status = read_row(reader, row, error);
        }
        if (status == RF_OK && reader->failed)
            status = fail(error, RF_IO, "%s: its bad rows cannot be kept", reader->source);
    }
    return status;
}

enum rf_status long_reader_open(FILE *file, const char *source, const struct long_options *options,
                                struct long_reader **reader, struct rf_error *error)
{
    *reader = NULL;
    struct long_reader *made = NEW(struct long_reader);
    if (made == NULL)
        return fail_memory(error);
    made->base.name = name_site;
    made->options = options;
    made->source = source;
    made->decimal = options->decimal;
    enum rf_status status = long_begin_table(made, file, error);
    if (status == RF_OK)
        *reader = made;
    else
        long_reader_close(made);
    return status;
}

void long_reader_close(struct long_reader *reader)
{
    if (reader == NULL)
        return;
    clear_group(&reader->group);
    text_finish(&reader->group.name);
    text_finish(&reader->group.raw);
    text_finish(&reader->head);
    free(reader->group.sites);
    free(reader->seen);
    csv_close(reader->csv);
    free(reader);
}
