/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What a row of a long table says of its job. */
#include "job/long_reader.h"

#include "base/error.h"
#include "job/job.h"
#include "job/sheet_grid.h"

#include <stdlib.h>
#include <string.h>

const char *long_cell(const struct long_reader *reader, const struct csv_row *row,
                      enum long_column column)
{
    size_t at = reader->columns[column];
    return at < row->n_cells ? row->cells[at].text : "";
}

/* The group is bad, for a reason at a cell of a row. */
static void bad_row(struct long_reader *reader, const struct csv_row *row, enum long_column column,
                    const char *found, const char *needs)
{
    struct rf_error error;
    fail(&error, RF_REFUSED, "%s: row %zu, column %s: found \"%.60s\"; needs %s", reader->source,
         row->number, reader->names[column], found, needs);
    reader->options->complain(reader->options->context, &error);
    reader->group.bad = true;
}

/* --- values --- */

static enum rf_status note_site(struct long_group *group, const cJSON *value, size_t row,
                                enum long_column column, struct rf_error *error)
{
    if (group->n_sites == group->capacity) {
        size_t capacity = group->capacity > 0 ? 2 * group->capacity : 256;
        struct long_site *sites = realloc(group->sites, capacity * sizeof *sites);
        if (sites == NULL)
            return fail_memory(error);
        group->sites = sites;
        group->capacity = capacity;
    }
    group->sites[group->n_sites++] = (struct long_site){value, row, column};
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
    const char *text = long_cell(reader, row, column);
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
    const char *text = long_cell(reader, row, LONG_FOUND);
    if (text[0] == '\0')
        return RF_OK;
    enum rf_status status = json_parse(text, strlen(text), "", JSON_ONE_LINE, &value, &ignored);
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

/* --- the job, its places --- */

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
    struct long_group *group = &reader->group;
    enum rf_status status = RF_OK;
    for (size_t i = 0; i < sizeof fields / sizeof fields[0] && status == RF_OK; i++)
        status = set_field(reader, fields[i].of_ring ? group->ring : group->document,
                           long_columns[fields[i].column], row, fields[i].column, fields[i].of_ring,
                           error);
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
                                     const char *id, enum rf_status *status, struct rf_error *error)
{
    struct long_group *group = &reader->group;
    for (size_t i = 0; i < group->n_points; i++) {
        const cJSON *has = cJSON_GetObjectItemCaseSensitive(group->points[i].object, "id");
        if (cJSON_IsString(has) && strcmp(has->valuestring, id) == 0)
            return &group->points[i];
    }
    if (group->n_points == LONG_MAX_PLACES) {
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

static void set_seq(struct long_reader *reader, const struct csv_row *row, struct long_point *point)
{
    char *end;
    const char *text = long_cell(reader, row, LONG_SEQ);
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

/* --- the reading --- */

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
    const char *text = long_cell(reader, row, LONG_VALUE);
    const char *setup = long_cell(reader, row, LONG_SETUP);
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

enum rf_status long_take_row(struct long_reader *reader, const struct csv_row *row,
                             struct rf_error *error)
{
    const char *place = long_cell(reader, row, LONG_PLACE);
    /* l, n, e of end to end are no points; nor are r1, rn, r2. */
    bool ends = sheet_find_setup(long_cell(reader, row, LONG_SETUP)) == 0;
    enum rf_status status = set_job_fields(reader, row, error);
    if (status == RF_OK && place[0] != '\0' && !ends)
        status = set_place_fields(reader, row, place, error);
    return status == RF_OK ? read_value(reader, row, place, error) : status;
}
