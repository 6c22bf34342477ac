/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "job/job_edit.h"

#include "base/error.h"
#include "base/json_edit.h"
#include "job/job_parse.h"
#include "job/sheet.h"

#include <stdint.h>
#include <string.h>

static const char history_key[] = "x_history";
static const char *const mark_keys[] = {[CHANGE_OPENED] = "opened", [CHANGE_CHECKED] = "checked"};

bool job_bytes_are_sheet(const struct text *bytes)
{
    const char *at = bytes->bytes != NULL ? bytes->bytes : "";
    if (strncmp(at, "\xEF\xBB\xBF", 3) == 0)
        at += 3;
    at += strspn(at, " \t\r\n");
    return *at != '{' && *at != '[' && *at != '\0';
}

enum rf_status job_read_bytes(const struct text *bytes, const char *source, size_t least,
                              struct rf_job **job, struct rf_error *error)
{
    cJSON *document = NULL;
    struct json_origin *origin = NULL;
    const char *text = bytes->bytes != NULL ? bytes->bytes : "";
    *job = NULL;
    if (bytes->length > JOB_MAX_BYTES)
        return fail(error, RF_LIMIT, "%s: found more than 16 MiB; needs at most 16 MiB a job",
                    source);
    enum rf_status status =
        job_bytes_are_sheet(bytes)
            ? sheet_parse(text, bytes->length, source, &document, &origin, error)
            : json_parse(text, bytes->length, source, JSON_DOCUMENT, &document, error);
    if (status == RF_OK)
        status = job_from_document(document, origin, source, least, job, error);
    sheet_origin_destroy(origin);
    return status;
}

/* --- what was there --- */

static const cJSON *member(const cJSON *object, const char *key)
{
    return cJSON_IsObject(object) ? cJSON_GetObjectItemCaseSensitive(object, key) : NULL;
}

/* Index of the place in the list, or SIZE_MAX. */
static size_t find_mark(const cJSON *list, const char *place)
{
    size_t i = 0;
    const cJSON *mark;
    cJSON_ArrayForEach(mark, list) {
        if (cJSON_IsString(mark) && strcmp(mark->valuestring, place) == 0)
            return i;
        i++;
    }
    return SIZE_MAX;
}

/* What a change takes away or replaces; NULL: nothing. */
static const cJSON *find_old(const cJSON *document, const struct job_change *change)
{
    if (change->what == CHANGE_FOUND)
        return member(document, "found");
    if (change->what == CHANGE_READING)
        return change->how == CHANGE_ADD
                   ? NULL
                   : member(member(member(document, "readings"), setups[change->setup].name),
                            change->place);
    const cJSON *list = member(document, mark_keys[change->what]);
    size_t i = change->how == CHANGE_ADD ? SIZE_MAX : find_mark(list, change->place);
    return i != SIZE_MAX ? cJSON_GetArrayItem(list, (int)i) : NULL;
}

static enum rf_status refuse_missing(const struct job_change *change, const char *source,
                                     struct rf_error *error)
{
    if (change->what == CHANGE_READING)
        return fail(error, RF_REFUSED,
                    "%s: readings.%s.%s: nothing read there; needs a reading to %s", source,
                    setups[change->setup].name, change->place,
                    change->how == CHANGE_REMOVE ? "remove" : "correct");
    return fail(error, RF_REFUSED, "%s: %s: nothing of the kind is recorded; needs one to remove",
                source, change->what == CHANGE_FOUND ? "found" : mark_keys[change->what]);
}

/* An entry of the history; NULL: memory is short. The caller deletes. */
static cJSON *make_entry(const struct job_change *change, const cJSON *old, const char *time)
{
    cJSON *entry = cJSON_CreateObject();
    cJSON *was = cJSON_Duplicate(old, true);
    const char *key = "was";
    bool good = entry != NULL && was != NULL && cJSON_AddStringToObject(entry, "time", time);
    if (good && change->what == CHANGE_READING)
        good = cJSON_AddStringToObject(entry, "setup", setups[change->setup].name) &&
               cJSON_AddStringToObject(entry, "place", change->place);
    else if (good)
        key = change->what == CHANGE_FOUND ? "found" : mark_keys[change->what];
    if (good && cJSON_AddItemToObject(entry, key, was))
        return entry;
    cJSON_Delete(was);
    cJSON_Delete(entry);
    return NULL;
}

/* --- JSON --- */

static enum rf_status put_values(struct text *json, const char *const path[3],
                                 const struct job_change *change, struct rf_error *error)
{
    enum rf_status status = RF_OK;
    if (change->how == CHANGE_ADD) {
        for (size_t i = 0; i < change->n_values && status == RF_OK; i++)
            status = json_edit_append(json, path, 3, change->values[i], false, error);
        return status;
    }
    struct text list = {0};
    if (change->n_values > 1)
        text_add(&list, "[");
    for (size_t i = 0; i < change->n_values; i++)
        text_addf(&list, "%s%s", i > 0 ? ", " : "", change->values[i]);
    if (change->n_values > 1)
        text_add(&list, "]");
    status = list.failed ? fail_memory(error) : json_edit_set(json, path, 3, list.bytes, error);
    text_finish(&list);
    return status;
}

static enum rf_status edit_json(struct text *json, const struct job_change *change,
                                const cJSON *document, const cJSON *entry, struct rf_error *error)
{
    enum rf_status status;
    if (change->what == CHANGE_READING) {
        const char *const path[3] = {"readings", setups[change->setup].name, change->place};
        status = change->how == CHANGE_REMOVE ? json_edit_remove(json, path, 3, error)
                                              : put_values(json, path, change, error);
    } else if (change->what == CHANGE_FOUND) {
        const char *const path[1] = {"found"};
        status = change->how == CHANGE_REMOVE ? json_edit_remove(json, path, 1, error)
                                              : json_edit_set(json, path, 1, change->found, error);
    } else {
        const char *const path[1] = {mark_keys[change->what]};
        cJSON *id = cJSON_CreateString(change->place);
        char *value = id != NULL ? cJSON_PrintUnformatted(id) : NULL;
        if (value == NULL)
            status = fail_memory(error);
        else if (change->how == CHANGE_REMOVE)
            status = json_edit_remove_element(
                json, path, 1, find_mark(member(document, path[0]), change->place), error);
        else
            status = json_edit_append(json, path, 1, value, true, error);
        cJSON_free(value);
        cJSON_Delete(id);
    }
    if (status == RF_OK && entry != NULL) {
        const char *const path[1] = {history_key};
        char *value = cJSON_PrintUnformatted(entry);
        status = value == NULL ? fail_memory(error)
                               : json_edit_append(json, path, 1, value, true, error);
        cJSON_free(value);
    }
    return status;
}

/* --- both --- */

static enum rf_status apply(struct text *bytes, const char *source, const struct job_change *change,
                            const char *time, const struct rf_job *job, struct rf_error *error)
{
    cJSON *entry = NULL;
    const cJSON *old = find_old(job->document, change);
    if (old == NULL && change->how != CHANGE_ADD &&
        !(change->what == CHANGE_FOUND && change->how == CHANGE_CORRECT))
        return refuse_missing(change, source, error);
    const cJSON *history = member(job->document, history_key);
    if (old != NULL && history != NULL && !cJSON_IsArray(history))
        return fail(error, RF_REFUSED,
                    "%s: %s: found something of your own; needs a list to keep "
                    "what is replaced in",
                    source, history_key);
    if (old != NULL && (entry = make_entry(change, old, time)) == NULL)
        return fail_memory(error);
    enum rf_status status = job_bytes_are_sheet(bytes)
                                ? sheet_edit(bytes, source, change, job->document, entry, error)
                                : edit_json(bytes, change, job->document, entry, error);
    cJSON_Delete(entry);
    return status;
}

enum rf_status job_edit(struct text *bytes, const char *source, const struct job_change changes[],
                        size_t n, const char *time, struct rf_job **job, struct rf_error *error)
{
    enum rf_status status = job_read_bytes(bytes, source, 0, job, error);
    for (size_t i = 0; i < n && status == RF_OK; i++) {
        status = apply(bytes, source, &changes[i], time, *job, error);
        rf_job_destroy(*job);
        *job = NULL;
        if (status == RF_OK)
            status = job_read_bytes(bytes, source, 0, job, error);
    }
    return status;
}
