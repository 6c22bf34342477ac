/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "job/long_table.h"

#include "base/csv.h"
#include "base/error.h"
#include "base/json.h"
#include "base/memory.h"
#include "job/job_parse.h"
#include "job/sheet_grid.h"

#include <stdint.h>
#include <stdlib.h>
#include <string.h>

const char *const long_columns[N_LONG_COLUMNS] = {
    [LONG_JOB] = "job",           [LONG_SETUP] = "setup",
    [LONG_PLACE] = "place",       [LONG_VALUE] = "value",
    [LONG_SEQ] = "seq",           [LONG_LABEL] = "label",
    [LONG_KIND] = "kind",         [LONG_METRES] = "metres",
    [LONG_FROM] = "from",         [LONG_DATE] = "date",
    [LONG_NOTE] = "note",         [LONG_LIVE] = "live_mm2",
    [LONG_CPC] = "cpc_mm2",       [LONG_TEMPERATURE] = "temperature_c",
    [LONG_ACCURACY] = "length_accuracy", [LONG_FOUND] = "found",
};

enum { ROW_LIMIT = 65536, MAX_PLACES = 2 * JOB_MAX_POINTS };

struct site {
    const cJSON *value;
    size_t row;
    enum long_column column;
};

/* A point as its rows tell of it. */
struct long_point {
    cJSON *object;
    double seq; /* of the ring; 0: not told */
    size_t row;
};

/* The job whose rows are being read. */
struct group {
    struct text name;
    struct text raw; /* its rows as they were */
    bool begun, bad;
    bool handed_back; /* its rows so far have been: they were too many */
    cJSON *document, *ring, *readings;
    struct long_point points[MAX_PLACES + 1];
    size_t n_points;
    struct site *sites;
    size_t n_sites, capacity;
};

struct long_reader {
    struct json_origin base; /* first */
    const struct long_options *options;
    const char *source;
    struct csv_reader *csv;
    size_t columns[N_LONG_COLUMNS]; /* SIZE_MAX: not there */
    size_t width;                   /* cells of the first row */
    const struct csv_row *pending;  /* of the next job, read while this one ended */
    char names[N_LONG_COLUMNS][80];
    char decimal;
    struct text head; /* the first row, until a row is handed back */
    struct group group;
    size_t unreadable; /* number of a row of which nobody knows whose it is; 0: none */
    uint64_t *seen;    /* hashes of the jobs there were; 0: free */
    size_t n_seen, seen_capacity;
    bool ended, failed; /* `failed`: a row could not be handed back */
};

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
        reader->failed |= !options->reject(options->context, reader->head.bytes,
                                           reader->head.length);
        text_clear(&reader->head);
    }
    if (length > 0)
        reader->failed |= !options->reject(options->context, row, length);
}

static void complain(struct long_reader *reader, const struct rf_error *error)
{
    reader->options->complain(reader->options->context, error);
}

/* The group is bad, for a reason at a cell of a row. */
static void bad_row(struct long_reader *reader, const struct csv_row *row,
                    enum long_column column, const char *found, const char *needs)
{
    struct rf_error error;
    fail(&error, RF_REFUSED, "%s: row %zu, column %s: found \"%.60s\"; needs %s", reader->source,
         row->number, reader->names[column], found, needs);
    complain(reader, &error);
    reader->group.bad = true;
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

static void clear_group(struct group *group)
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
    struct group *group = &reader->group;
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

static enum rf_status note_site(struct group *group, const cJSON *value, size_t row,
                                enum long_column column, struct rf_error *error)
{
    if (group->n_sites == group->capacity) {
        size_t capacity = group->capacity > 0 ? 2 * group->capacity : 256;
        struct site *sites = realloc(group->sites, capacity * sizeof *sites);
        if (sites == NULL)
            return fail_memory(error);
        group->sites = sites;
        group->capacity = capacity;
    }
    group->sites[group->n_sites++] = (struct site){value, row, column};
    return RF_OK;
}

/* Takes `value` over (NULL: memory is short) into `into`, under `key` or as an element. */
static enum rf_status add(struct long_reader *reader, cJSON *into, const char *key, cJSON *value,
                          const struct csv_row *row, enum long_column column,
                          struct rf_error *error)
{
    bool good = value != NULL && (key != NULL ? cJSON_AddItemToObject(into, key, value)
                                              : cJSON_AddItemToArray(into, value));
    if (!good) {
        cJSON_Delete(value);
        return fail_memory(error);
    }
    return note_site(&reader->group, value, row->number, column, error);
}

static const char *cell(const struct long_reader *reader, const struct csv_row *row,
                        enum long_column column)
{
    size_t at = reader->columns[column];
    return at < row->n_cells ? row->cells[at].text : "";
}

/* A number in the table's decimal mark, which the first number that has one shows. False: none. */
static bool read_number(struct long_reader *reader, const char *text, char json[64])
{
    bool point = sheet_number(text, '.', json, 64);
    bool comma = sheet_number(text, ',', json, 64);
    if (point == comma)
        return point; /* no mark, or no number */
    char mark = point ? '.' : ',';
    if (reader->decimal == '\0')
        reader->decimal = mark;
    return reader->decimal == mark && sheet_number(text, mark, json, 64);
}

/* What a field's cell says, and must go on saying in every row that says something. */
static enum rf_status set_field(struct long_reader *reader, cJSON *into, const char *key,
                                const struct csv_row *row, enum long_column column, bool number,
                                struct rf_error *error)
{
    char json[64];
    const char *text = cell(reader, row, column);
    cJSON *value;
    if (text[0] == '\0')
        return RF_OK;
    if (number && !read_number(reader, text, json)) {
        bad_row(reader, row, column, text, "a number, with one decimal mark throughout");
        return RF_OK;
    }
    value = number ? cJSON_Parse(json) : cJSON_CreateString(text);
    const cJSON *old = cJSON_GetObjectItemCaseSensitive(into, key);
    if (old == NULL || value == NULL)
        return add(reader, into, key, value, row, column, error);
    if (!cJSON_Compare(old, value, true))
        bad_row(reader, row, column, text, "what the rows before say of the same");
    cJSON_Delete(value);
    return RF_OK;
}

static enum rf_status set_found(struct long_reader *reader, const struct csv_row *row,
                                struct rf_error *error)
{
    cJSON *value = NULL;
    struct rf_error ignored;
    const char *text = cell(reader, row, LONG_FOUND);
    if (text[0] == '\0')
        return RF_OK;
    enum rf_status status =
        json_parse(text, strlen(text), "", JSON_ONE_LINE, &value, &ignored);
    if (status == RF_MEMORY)
        return fail_memory(error);
    const cJSON *old = cJSON_GetObjectItemCaseSensitive(reader->group.document, "found");
    if (!cJSON_IsObject(value) || (old != NULL && !cJSON_Compare(old, value, true))) {
        bad_row(reader, row, LONG_FOUND, text,
                "a JSON object such as {\"family\": \"none\"}, the same in every row");
        cJSON_Delete(value);
        return RF_OK;
    }
    if (old == NULL)
        return add(reader, reader->group.document, "found", value, row, LONG_FOUND, error);
    cJSON_Delete(value);
    return RF_OK;
}

static enum rf_status set_job_fields(struct long_reader *reader, const struct csv_row *row,
                                     struct rf_error *error)
{
    static const struct {
        enum long_column column;
        bool of_ring;
    } fields[] = {
        {LONG_DATE, false}, {LONG_NOTE, false},       {LONG_LIVE, true},
        {LONG_CPC, true},   {LONG_TEMPERATURE, true}, {LONG_ACCURACY, true},
    };
    struct group *group = &reader->group;
    enum rf_status status = RF_OK;
    for (size_t i = 0; i < sizeof fields / sizeof fields[0] && status == RF_OK; i++)
        status = set_field(reader, fields[i].of_ring ? group->ring : group->document,
                           long_columns[fields[i].column], row, fields[i].column,
                           fields[i].of_ring, error);
    return status == RF_OK ? set_found(reader, row, error) : status;
}

static bool is_reserved(const char *place)
{
    for (size_t spot = 0; spot < N_SPOTS; spot++)
        if (spot_keys[spot] != NULL && strcmp(spot_keys[spot], place) == 0)
            return true;
    return false;
}

/* The point of that id, made if it is new; NULL: one too many, or memory is short (*status). */
static struct long_point *find_point(struct long_reader *reader, const struct csv_row *row,
                                     const char *id, enum rf_status *status,
                                     struct rf_error *error)
{
    struct group *group = &reader->group;
    for (size_t i = 0; i < group->n_points; i++) {
        const cJSON *has = cJSON_GetObjectItemCaseSensitive(group->points[i].object, "id");
        if (cJSON_IsString(has) && strcmp(has->valuestring, id) == 0)
            return &group->points[i];
    }
    if (group->n_points == MAX_PLACES) {
        bad_row(reader, row, LONG_PLACE, id, "at most 200 points and 200 spur points in a job");
        return NULL;
    }
    struct long_point *point = &group->points[group->n_points];
    *point = (struct long_point){.object = cJSON_CreateObject(), .row = row->number};
    if (point->object == NULL) {
        *status = fail_memory(error);
        return NULL;
    }
    group->n_points++;
    *status = add(reader, point->object, "id", cJSON_CreateString(id), row, LONG_PLACE, error);
    return *status == RF_OK ? point : NULL;
}

static void set_seq(struct long_reader *reader, const struct csv_row *row,
                    struct long_point *point)
{
    char *end;
    const char *text = cell(reader, row, LONG_SEQ);
    if (text[0] == '\0')
        return;
    unsigned long seq = strtoul(text, &end, 10);
    if (*end != '\0' || text[0] < '0' || text[0] > '9' || seq < 1 || seq > 100000) {
        bad_row(reader, row, LONG_SEQ, text, "the place's number on the ring, from 1");
        return;
    }
    if (point->seq > 0 && (unsigned long)point->seq != seq)
        bad_row(reader, row, LONG_SEQ, text, "what the rows before say of the same");
    point->seq = (double)seq;
}

static enum rf_status set_place_fields(struct long_reader *reader, const struct csv_row *row,
                                       const char *place, struct rf_error *error)
{
    enum rf_status status = RF_OK;
    if (strcmp(place, "in") == 0)
        return set_field(reader, reader->group.ring, "last_run_m", row, LONG_METRES, true, error);
    if (is_reserved(place))
        return RF_OK;
    struct long_point *point = find_point(reader, row, place, &status, error);
    if (point == NULL)
        return status;
    set_seq(reader, row, point);
    status = set_field(reader, point->object, "label", row, LONG_LABEL, false, error);
    if (status == RF_OK)
        status = set_field(reader, point->object, "kind", row, LONG_KIND, false, error);
    if (status == RF_OK)
        status = set_field(reader, point->object, "run_m", row, LONG_METRES, true, error);
    if (status == RF_OK)
        status = set_field(reader, point->object, "from", row, LONG_FROM, false, error);
    return status;
}

/* Adds a reading; a second one at the place makes a list. */
static enum rf_status add_reading(struct long_reader *reader, const struct csv_row *row,
                                  const char *setup, const char *key, cJSON *value,
                                  struct rf_error *error)
{
    cJSON *readings = reader->group.readings;
    cJSON *in = cJSON_GetObjectItemCaseSensitive(readings, setup);
    if (in == NULL)
        in = cJSON_AddObjectToObject(readings, setup);
    if (in == NULL) {
        cJSON_Delete(value);
        return fail_memory(error);
    }
    cJSON *old = cJSON_GetObjectItemCaseSensitive(in, key);
    if (old == NULL)
        return add(reader, in, key, value, row, LONG_VALUE, error);
    if (!cJSON_IsArray(old)) {
        cJSON *list = cJSON_CreateArray();
        cJSON *first = cJSON_DetachItemViaPointer(in, old);
        if (list == NULL || !cJSON_AddItemToArray(list, first) ||
            !cJSON_AddItemToObject(in, key, list)) {
            cJSON_Delete(value);
            cJSON_Delete(list);
            return fail_memory(error);
        }
        old = list;
    }
    return add(reader, old, NULL, value, row, LONG_VALUE, error);
}

static enum rf_status read_value(struct long_reader *reader, const struct csv_row *row,
                                 const char *place, struct rf_error *error)
{
    char json[64];
    const char *text = cell(reader, row, LONG_VALUE);
    const char *setup = cell(reader, row, LONG_SETUP);
    if (text[0] == '\0' || strcmp(text, "-") == 0)
        return RF_OK;
    size_t which = sheet_find_setup(setup);
    if (which == N_SETUPS) {
        bad_row(reader, row, LONG_SETUP, setup, "the name of a set-up, such as cross_ln");
        return RF_OK;
    }
    if (place[0] == '\0') {
        bad_row(reader, row, LONG_PLACE, place, "a place for the reading");
        return RF_OK;
    }
    if (which == 0)
        for (size_t i = 0; i < 3; i++)
            if (sheet_same_word(sheet_end_rows[i], place))
                place = sheet_end_keys[i];
    bool over = sheet_is_over_range(text);
    if (!over && !read_number(reader, text, json)) {
        bad_row(reader, row, LONG_VALUE, text,
                "ohms from 0 to 99.9, with one decimal mark throughout, or OL for over range");
        return RF_OK;
    }
    return add_reading(reader, row, setups[which].name, place,
                       over ? cJSON_CreateString("open") : cJSON_Parse(json), error);
}

static enum rf_status take_row(struct long_reader *reader, const struct csv_row *row,
                               struct rf_error *error)
{
    const char *place = cell(reader, row, LONG_PLACE);
    /* l, n, e of end to end are no points; nor are r1, rn, r2. */
    bool ends = sheet_find_setup(cell(reader, row, LONG_SETUP)) == 0;
    enum rf_status status = set_job_fields(reader, row, error);
    if (status == RF_OK && place[0] != '\0' && !ends)
        status = set_place_fields(reader, row, place, error);
    return status == RF_OK ? read_value(reader, row, place, error) : status;
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
    struct group *group = &reader->group;
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
        fail(&error, RF_REFUSED, "%s: row %zu, column %s: found %s; needs a number of its own for "
             "every point of the ring",
             reader->source, point->row, reader->names[LONG_SEQ],
             point->seq > 0 ? "a number that another point has" : "nothing");
        complain(reader, &error);
        group->bad = true;
    }
}

static enum rf_status put_together(struct group *group, struct rf_error *error)
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
    struct group *group = &reader->group;
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
    struct group *group = &reader->group;
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
    struct group *group = &reader->group;
    enum rf_status status = RF_OK;
    if (!group->begun)
        status = begin_group(reader, cell(reader, row, LONG_JOB), row->number, error);
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
        status = take_row(reader, row, error);
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
    if (cell(reader, row, LONG_JOB)[0] == '\0') {
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
    struct group *group = &reader->group;
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
        else if (group->begun && strcmp(group->name.bytes, cell(reader, row, LONG_JOB)) != 0) {
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

/* --- the first row --- */

static enum rf_status read_head(FILE *file, const char *source, struct text *head,
                                struct rf_error *error)
{
    for (int byte = getc(file); byte != EOF; byte = getc(file)) {
        char character = (char)byte;
        text_append(head, &character, 1);
        if (head->length > ROW_LIMIT)
            return fail(error, RF_SYNTAX, "%s: row 1: found no row of columns' names", source);
        if (byte == '\n')
            break;
    }
    if (ferror(file))
        return fail(error, RF_IO, "%s: cannot be read", source);
    return head->failed ? fail_memory(error) : RF_OK;
}

/* Where the columns stand in a first row; the name of one that must be there and is not. */
static const char *find_columns(struct long_reader *reader, const struct csv_row *row)
{
    const char *missing = NULL;
    reader->width = row->n_cells;
    for (size_t i = 0; i < N_LONG_COLUMNS; i++) {
        const char *asked = reader->options->names[i];
        const char *name = asked != NULL ? asked : long_columns[i];
        snprintf(reader->names[i], sizeof reader->names[i], "%s", name);
        text_trim_partial_character(reader->names[i]);
        reader->columns[i] = SIZE_MAX;
        for (size_t j = 0; j < row->n_cells && reader->columns[i] == SIZE_MAX; j++)
            if (sheet_same_word(row->cells[j].text, name))
                reader->columns[i] = j;
        if (reader->columns[i] == SIZE_MAX && (asked != NULL || i <= LONG_VALUE) &&
            missing == NULL)
            missing = name;
    }
    return missing;
}

/* Tries a separator: *good if all columns that must be there are. */
static enum rf_status try_separator(struct long_reader *reader, char separator, bool *good,
                                    struct rf_error *error)
{
    const struct csv_row *row;
    struct csv_reader *csv = csv_open_text(reader->head.bytes, reader->head.length, separator,
                                           reader->source);
    if (csv == NULL)
        return fail_memory(error);
    enum rf_status status = csv_next(csv, &row, error);
    *good = false;
    if (status == RF_OK && row != NULL) {
        const char *missing = find_columns(reader, row);
        *good = missing == NULL;
        if (missing != NULL)
            fail(error, RF_REFUSED,
                 "%s: row 1: found no column \"%s\"; needs the names of the columns, job, setup, "
                 "place and value, or which they are",
                 reader->source, missing);
    }
    csv_close(csv);
    return status == RF_SYNTAX ? RF_OK : status;
}

static enum rf_status begin_table(struct long_reader *reader, FILE *file, struct rf_error *error)
{
    static const char separators[] = {',', ';', '\t'};
    bool good = false;
    size_t most = 0;
    char likeliest = ',', separator = reader->options->separator;
    enum rf_status status = read_head(file, reader->source, &reader->head, error);
    if (status == RF_OK && reader->head.length == 0)
        return fail(error, RF_SYNTAX, "%s: found nothing; needs a table", reader->source);
    if (status == RF_OK && separator != '\0')
        status = try_separator(reader, separator, &good, error);
    for (size_t i = 0; separator == '\0' && !good && status == RF_OK && i < sizeof separators;
         i++) {
        status = try_separator(reader, separators[i], &good, error);
        if (good)
            separator = separators[i];
        if (reader->width > most) {
            most = reader->width;
            likeliest = separators[i];
        }
    }
    if (status == RF_OK && !good && separator == '\0') /* for the message */
        status = try_separator(reader, likeliest, &good, error);
    if (status != RF_OK)
        return status;
    if (!good)
        return error != NULL ? error->status : RF_REFUSED;
    if (reader->head.bytes[reader->head.length - 1] != '\n')
        text_add(&reader->head, "\n");
    reader->csv = csv_open_file(file, separator, reader->source);
    if (reader->csv == NULL || reader->head.failed)
        return fail_memory(error);
    csv_set_limit(reader->csv, ROW_LIMIT);
    csv_begin_behind(reader->csv, 1);
    return RF_OK;
}

enum rf_status long_reader_open(FILE *file, const char *source,
                                const struct long_options *options, struct long_reader **reader,
                                struct rf_error *error)
{
    *reader = NULL;
    struct long_reader *made = NEW(struct long_reader);
    if (made == NULL)
        return fail_memory(error);
    made->base.name = name_site;
    made->options = options;
    made->source = source;
    made->decimal = options->decimal;
    enum rf_status status = begin_table(made, file, error);
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
