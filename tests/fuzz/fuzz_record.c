/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * A change and any bytes as a job's file, JSON or sheet: refused, or changed so that nothing else
 * is. The first three bytes say what and how; the place is the first line, the value (a JSON text)
 * the second, the file the rest.
 */

#include "fuzz.h"

#include "base/json.h"
#include "job/job.h"
#include "job/job_edit.h"

#include <cjson/cJSON.h>
#include <string.h>

static const char *const mark_keys[] = {[CHANGE_OPENED] = "opened", [CHANGE_CHECKED] = "checked"};

/* The next line as a string of its own, the caller's. */
static char *take_line(const uint8_t **at, const uint8_t *end)
{
    const uint8_t *stop = memchr(*at, '\n', (size_t)(end - *at));
    size_t length = (size_t)((stop != NULL ? stop : end) - *at);
    char *line = calloc(length + 1, 1);
    MUST(line != NULL, "memory");
    memcpy(line, *at, length);
    *at = stop != NULL ? stop + 1 : end;
    return line;
}

/* Whether the value is what the program would pass on: an object to be found, or a reading. */
static bool may_be_value(const char *value, bool object)
{
    struct rf_error error;
    cJSON *parsed = NULL;
    bool may = json_parse(value, strlen(value), "value", JSON_DOCUMENT, &parsed, &error) == RF_OK &&
               (object ? cJSON_IsObject(parsed)
                       : cJSON_IsNumber(parsed) || cJSON_IsString(parsed));
    cJSON_Delete(parsed);
    return may;
}

static void drop_if_empty(cJSON *in, const char *key)
{
    const cJSON *item = cJSON_GetObjectItemCaseSensitive(in, key);
    if (item != NULL && item->child == NULL && (cJSON_IsObject(item) || cJSON_IsArray(item)))
        cJSON_DeleteItemFromObjectCaseSensitive(in, key);
}

/* The document without what the change is about, the history and what stands empty then. */
static cJSON *without(const cJSON *document, const struct job_change *change)
{
    cJSON *copy = cJSON_Duplicate(document, true);
    MUST(copy != NULL, "memory");
    cJSON_DeleteItemFromObjectCaseSensitive(copy, "x_history");
    if (change->what == CHANGE_READING) {
        cJSON *readings = cJSON_GetObjectItemCaseSensitive(copy, "readings");
        for (size_t i = 0; i < N_SETUPS; i++) {
            if (i == change->setup)
                cJSON_DeleteItemFromObjectCaseSensitive(
                    cJSON_GetObjectItemCaseSensitive(readings, setups[i].name), change->place);
            drop_if_empty(readings, setups[i].name);
        }
        drop_if_empty(copy, "readings");
    } else {
        cJSON_DeleteItemFromObjectCaseSensitive(
            copy, change->what == CHANGE_FOUND ? "found" : mark_keys[change->what]);
    }
    return copy;
}

static bool is_kept(const struct text *old, const struct text *new)
{
    size_t at = 0;
    for (size_t i = 0; i < new->length && at < old->length; i++)
        at += new->bytes[i] == old->bytes[at];
    return at == old->length;
}

static void check(const struct text *before, const struct text *after, const struct rf_job *old,
                  const struct rf_job *new, const struct job_change *change)
{
    cJSON *was = without(old->document, change), *is = without(new->document, change);
    MUST(cJSON_Compare(was, is, 1), "was\n%s\nis\n%s", before->bytes, after->bytes);
    MUST(change->how != CHANGE_ADD || change->what == CHANGE_FOUND || is_kept(before, after),
         "was\n%s\nis\n%s", before->bytes, after->bytes);
    cJSON_Delete(was);
    cJSON_Delete(is);
}

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size)
{
    if (size < 3)
        return 0;
    struct rf_job *old = NULL, *new = NULL;
    struct rf_error error = {0};
    struct text before = {0}, after = {0};
    const uint8_t *at = data + 3, *end = data + size;
    char *place = take_line(&at, end), *value = take_line(&at, end);
    const char *values[] = {value, "0.4"};
    struct job_change change = {
        .how = (enum change_how)(data[0] % 3),
        .what = (enum change_what)(data[1] % 4),
        .setup = data[2] % N_SETUPS,
        .place = place,
        .values = values,
        .n_values = data[0] % 3 == CHANGE_REMOVE ? 0 : 1 + data[0] / 3 % 2,
        .found = value,
    };
    text_append(&before, (const char *)at, (size_t)(end - at));
    text_append(&after, (const char *)at, (size_t)(end - at));
    if (may_be_value(value, change.what == CHANGE_FOUND) &&
        job_read_bytes(&before, "fuzz", 0, &old, &error) == RF_OK) {
        enum rf_status status =
            job_edit(&after, "fuzz", &change, 1, "2026-02-11T08:00:00Z", &new, &error);
        if (status == RF_OK)
            check(&before, &after, old, new, &change);
        else
            MUST(new == NULL && rf_status_class(status) == RF_CLASS_INPUT, "%s", error.text);
    }
    rf_job_destroy(old);
    rf_job_destroy(new);
    text_finish(&before);
    text_finish(&after);
    free(place);
    free(value);
    return 0;
}
