/* SPDX-License-Identifier: GPL-3.0-or-later */
#define _DEFAULT_SOURCE /* gmtime_r */

#include "cli/command.h"

#include "base/error.h"
#include "base/file.h"
#include "base/json.h"
#include "base/memory.h"
#include "faults/fault.h"
#include "job/job_edit.h"
#include "job/sheet_grid.h"

#include <cjson/cJSON.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

/* What the words of the command line ask for. */
struct request {
    struct job_change *changes;
    size_t n_changes;
    char **texts; /* everything the changes point at, to be freed */
    const char **values;
    size_t n_texts, n_values;
    enum change_how how;
};

/* Words that say what the words behind them are; set-ups' names are such words too. */
enum mode { MODE_NONE, MODE_SETUP, MODE_OPENED, MODE_CHECKED, MODE_FOUND, MODE_ALSO };

struct words {
    const struct invocation *invocation;
    struct request *request;
    enum mode mode;
    size_t setup;
    cJSON *found, *also; /* being put together; also is inside found */
};

static char *keep(struct request *request, char *text)
{
    if (text != NULL)
        request->texts[request->n_texts++] = text;
    return text;
}

static struct job_change *add_change(struct request *request, enum change_what what)
{
    struct job_change *change = &request->changes[request->n_changes++];
    *change = (struct job_change){.how = request->how, .what = what};
    return change;
}

/* --- readings --- */

/* A reading as typed, as a JSON text; NULL: it is none, or memory is short. Both decimal marks
 * serve: there is no separator here that a comma could be. */
static char *read_value(const char *word)
{
    char json[64];
    if (sheet_is_over_range(word))
        return text_duplicate("\"open\"");
    if (!sheet_number(word, '.', json, sizeof json) && !sheet_number(word, ',', json, sizeof json))
        return NULL;
    return text_duplicate(json);
}

/* "P3=0.41", "P3=0.41/0.42"; to remove: "P3". */
static enum rf_status read_reading(struct words *words, const char *word, struct rf_error *error)
{
    struct request *request = words->request;
    const char *equals = strrchr(word, '=');
    bool removes = request->how == CHANGE_REMOVE;
    if (!removes && (equals == NULL || equals == word))
        return fail(error, RF_USAGE, "record: found %s; needs PLACE=READING, such as P3=0.41",
                    word);
    struct job_change *change = add_change(request, CHANGE_READING);
    struct text place = {0}, value = {0};
    change->setup = words->setup;
    text_append(&place, word, removes ? strlen(word) : (size_t)(equals - word));
    change->place = place.failed ? NULL : keep(request, place.bytes);
    if (change->place == NULL)
        return fail_memory(error);
    if (removes)
        return RF_OK;

    change->values = request->values + request->n_values;
    for (const char *at = equals + 1; sheet_next_word(&at, &value);) {
        char *json = value.failed ? NULL : keep(request, read_value(value.bytes));
        if (json == NULL) {
            enum rf_status status =
                fail(error, RF_USAGE,
                     "record: %s %s: found \"%.40s\"; needs ohms from 0 to 99.9, or OL for over "
                     "range",
                     setups[words->setup].name, word, value.failed ? "" : value.bytes);
            text_finish(&value);
            return status;
        }
        request->values[request->n_values++] = json;
        change->n_values++;
    }
    text_finish(&value);
    return change->n_values > 0
               ? RF_OK
               : fail(error, RF_USAGE, "record: %s: found nothing behind =; needs a reading", word);
}

/* --- findings --- */

static bool add_list(cJSON *into, const char *key, const char *list)
{
    cJSON *made = cJSON_AddArrayToObject(into, key);
    bool good = made != NULL;
    for (const char *at = list; good; at++) {
        size_t length = strcspn(at, ",");
        struct text id = {0};
        text_append(&id, at, length);
        cJSON *string = id.failed ? NULL : cJSON_CreateString(id.bytes);
        good = string != NULL && cJSON_AddItemToArray(made, string);
        text_finish(&id);
        at += length;
        if (*at == '\0')
            break;
    }
    return good;
}

/* "joint", "run=P1,P2", "conductor=N", "open". */
static enum rf_status read_field(cJSON *into, const char *word, struct rf_error *error)
{
    const char *equals = strchr(word, '=');
    char key[32];
    size_t length = equals != NULL ? (size_t)(equals - word) : 0;
    bool good;
    if (into->child == NULL) {
        if (word[0] == '\0' || equals != NULL)
            return fail(error, RF_USAGE, "record: found %s; needs the family of what was found, "
                        "such as joint",
                        word);
        return cJSON_AddStringToObject(into, "family", word) != NULL ? RF_OK : fail_memory(error);
    }
    if (strcmp(word, "open") == 0)
        return cJSON_AddTrueToObject(into, "open") != NULL ? RF_OK : fail_memory(error);
    if (equals == NULL || length == 0 || length >= sizeof key)
        return fail(error, RF_USAGE, "record: found %s; needs FIELD=VALUE, such as conductor=N",
                    word);
    memcpy(key, word, length);
    key[length] = '\0';
    if (cJSON_GetObjectItemCaseSensitive(into, key) != NULL)
        return fail(error, RF_USAGE, "record: found %s twice; needs it once", key);
    if (strcmp(key, "run") == 0 || strcmp(key, "between") == 0 || strcmp(key, "points") == 0)
        good = add_list(into, key, equals + 1);
    else if (strcmp(key, "live_mm2") == 0 || strcmp(key, "cpc_mm2") == 0 ||
             strcmp(key, "ohms") == 0 || strcmp(key, "metres") == 0) {
        char json[64];
        if (!sheet_number(equals + 1, '.', json, sizeof json) &&
            !sheet_number(equals + 1, ',', json, sizeof json))
            return fail(error, RF_USAGE, "record: found %s; needs a number", word);
        good = cJSON_AddRawToObject(into, key, json) != NULL;
    } else {
        good = cJSON_AddStringToObject(into, key, equals + 1) != NULL;
    }
    return good ? RF_OK : fail_memory(error);
}

/* A whole finding as JSON, {"family": …}. */
static enum rf_status read_whole(cJSON **into, const char *word, struct rf_error *error)
{
    cJSON *made;
    enum rf_status status =
        json_parse(word, strlen(word), "record: found", JSON_ONE_LINE, &made, error);
    if (status == RF_OK) {
        cJSON_Delete(*into);
        *into = made;
    }
    return status;
}

static enum rf_status finish_found(struct words *words, struct rf_error *error)
{
    struct request *request = words->request;
    if (words->found == NULL)
        return RF_OK;
    if (words->found->child == NULL)
        return fail(error, RF_USAGE, "record: needs the family of what was found, such as joint");
    if (words->also != NULL) {
        if (!cJSON_AddItemToObject(words->found, "also", words->also))
            return fail_memory(error);
        words->also = NULL;
    }
    char *json = cJSON_PrintUnformatted(words->found);
    char *copy = json != NULL ? keep(request, text_duplicate(json)) : NULL;
    cJSON_free(json);
    if (copy == NULL)
        return fail_memory(error);
    add_change(request, CHANGE_FOUND)->found = copy;
    return RF_OK;
}

/* --- the words --- */

/* Whether the word changes what those behind it mean. */
static enum rf_status take_mode(struct words *words, const char *word, bool *taken,
                                struct rf_error *error)
{
    size_t setup = setup_find(word);
    *taken = true;
    if (setup < N_SETUPS) {
        words->mode = MODE_SETUP;
        words->setup = setup;
    } else if (strcmp(word, "opened") == 0) {
        words->mode = MODE_OPENED;
    } else if (strcmp(word, "checked") == 0) {
        words->mode = MODE_CHECKED;
    } else if (strcmp(word, "found") == 0) {
        words->mode = MODE_FOUND;
        if (words->request->how == CHANGE_REMOVE) {
            add_change(words->request, CHANGE_FOUND);
        } else if (words->found == NULL) {
            words->found = cJSON_CreateObject();
            return words->found != NULL ? RF_OK : fail_memory(error);
        }
    } else if (strcmp(word, "also") == 0 && words->found != NULL && words->also == NULL) {
        words->mode = MODE_ALSO;
        words->also = cJSON_CreateObject();
        return words->also != NULL ? RF_OK : fail_memory(error);
    } else {
        *taken = false;
    }
    return RF_OK;
}

static enum rf_status refuse_first(const char *word, struct rf_error *error)
{
    const char *names[N_SETUPS + 3] = {"opened", "checked", "found"};
    for (size_t i = 0; i < N_SETUPS; i++)
        names[i + 3] = setups[i].name;
    const char *nearest = text_nearest(word, names, N_SETUPS + 3);
    if (nearest != NULL)
        return fail(error, RF_USAGE, "record: found %s; did you mean %s?", word, nearest);
    return fail(error, RF_USAGE, "record: found %s; needs a set-up (such as cross_ln), opened, "
                "checked or found first",
                word);
}

static enum rf_status take_word(struct words *words, const char *word, struct rf_error *error)
{
    bool taken;
    enum rf_status status = take_mode(words, word, &taken, error);
    if (status != RF_OK || taken)
        return status;
    switch (words->mode) {
    case MODE_NONE: return refuse_first(word, error);
    case MODE_SETUP: return read_reading(words, word, error);
    case MODE_FOUND:
    case MODE_ALSO: {
        cJSON **into = words->mode == MODE_FOUND ? &words->found : &words->also;
        if (*into == NULL)
            return fail(error, RF_USAGE, "record: found %s; needs nothing behind found", word);
        return word[0] == '{' ? read_whole(into, word, error) : read_field(*into, word, error);
    }
    case MODE_OPENED:
    case MODE_CHECKED: break;
    }
    struct job_change *change = add_change(
        words->request, words->mode == MODE_OPENED ? CHANGE_OPENED : CHANGE_CHECKED);
    change->place = word;
    return RF_OK;
}

static enum rf_status read_request(const struct invocation *invocation, struct request *request,
                                   struct rf_error *error)
{
    size_t n = invocation->n_operands, letters = 0;
    for (size_t i = 0; i < n; i++)
        letters += strlen(invocation->operands[i]);
    request->changes = NEW_ARRAY(struct job_change, n);
    request->texts = NEW_ARRAY(char *, n + letters);
    request->values = NEW_ARRAY(const char *, letters);
    if (request->changes == NULL || request->texts == NULL || request->values == NULL)
        return fail_memory(error);
    struct words words = {.invocation = invocation, .request = request};
    enum rf_status status = RF_OK;
    for (size_t i = 1; i < n && status == RF_OK; i++)
        status = take_word(&words, invocation->operands[i], error);
    if (status == RF_OK)
        status = finish_found(&words, error);
    if (status == RF_OK && request->n_changes == 0)
        status = fail(error, RF_USAGE, "record: nothing to record; needs readings, places or a "
                      "finding");
    cJSON_Delete(words.found);
    cJSON_Delete(words.also);
    return status;
}

static void finish_request(struct request *request)
{
    for (size_t i = 0; i < request->n_texts; i++)
        free(request->texts[i]);
    free(request->texts);
    free(request->values);
    free(request->changes);
}

/* --- the command --- */

/* What was found must be a fault this ring can have. */
static enum rf_status check_found(const struct invocation *invocation, const struct rf_job *job,
                                  struct rf_error *error)
{
    struct rf_models *models = NULL;
    struct hypothesis found;
    if (!rf_job_has_found(job))
        return RF_OK;
    enum rf_status status = rf_models_load(option_value(invocation, "models"), RF_RATES_CONSULTED,
                                           &models, error);
    if (status == RF_OK)
        status = hypothesis_from_found(job, models, &found, error);
    rf_models_destroy(models);
    return status;
}

static enum rf_status record(const struct invocation *invocation, const struct request *request,
                             struct rf_error *error)
{
    const char *path = invocation->operands[0];
    struct file_hold *hold = NULL;
    struct rf_job *job = NULL;
    struct text bytes = {0};
    char now[32];
    time_t seconds = time(NULL);
    struct tm utc;
    if (gmtime_r(&seconds, &utc) == NULL || strftime(now, sizeof now, "%Y-%m-%dT%H:%M:%SZ", &utc) == 0)
        now[0] = '\0';

    enum rf_status status = file_hold(path, JOB_MAX_BYTES, &hold, &bytes, error);
    if (status == RF_OK)
        status = job_edit(&bytes, path, request->changes, request->n_changes, now, &job, error);
    if (status == RF_OK)
        status = check_found(invocation, job, error);
    if (status == RF_OK)
        status = file_replace(hold, &bytes, error);
    rf_job_destroy(job);
    text_finish(&bytes);
    file_release(hold);
    return status;
}

static enum rf_class run(const struct invocation *invocation)
{
    struct rf_error error;
    struct request request = {0};
    bool corrects = option_value(invocation, "correct") != NULL;
    bool removes = option_value(invocation, "remove") != NULL;
    if (corrects && removes)
        return complain_usage(invocation->command, "needs one of --correct and --remove");
    request.how = corrects ? CHANGE_CORRECT : removes ? CHANGE_REMOVE : CHANGE_ADD;
    enum rf_status status = read_request(invocation, &request, &error);
    if (status == RF_OK)
        status = record(invocation, &request, &error);
    finish_request(&request);
    return status == RF_OK ? RF_CLASS_DONE : complain_of(&error);
}

const struct command command_record = {
    .name = "record",
    .summary = "add readings, places looked at or a finding to a job's file",
    .operands = "JOB WORD…",
    .about =
        "Writes into JOB, a JSON file of one job or a sheet. A set-up's name comes first, then "
        "PLACE=READING for each reading (cross_ln P3=0.41 P4=OL board=0.39; P3=0.41/0.42 for "
        "repeats). A reading where there is one already is a repeat of it. opened and checked "
        "come before places that were taken off, or whose face was seen to, with nothing wrong. "
        "found comes before what it really was: joint run=P1,P2 conductor=N, contact at=P4 "
        "conductor=L open, none, or a JSON object; also comes before the second of two.\n\n"
        "What is corrected, removed or replaced is kept in the file under x_history. All else in "
        "it stays as it is, byte for byte. The file is replaced whole or not at all, and a second "
        "writer at the same time is refused.",
    .n_options = 3,
    .options = {{"correct", NULL, "put the readings in the place of those that are there"},
                {"remove", NULL, "take away the readings, marks or finding named (PLACE alone)"},
                {"models", "DIR", "take the models from DIR instead of those compiled in"}},
    .least = 2,
    .most = SEVERAL,
    .needs = "a job file and what to record",
    .run = run,
};
