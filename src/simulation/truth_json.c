/* SPDX-License-Identifier: GPL-3.0-or-later */

/*
 * The truth as a file:
 *
 *   {"format": "ringfettle-truth/1", "seed": 7, "models": "shipped",
 *    "faults": [{"fault": {…}, "ohms": 0.52, "look": "open", "place": "P2"}],
 *    "hidden": {"runs": [θ, …], "conductors": [θ, θ, θ], "unknown_cpc": θ, "gain": θ, "lead": θ,
 *               "face": θ, "wander": θ},
 *    "job": {…}}
 *
 * A fault without a spot of its own has no `look`: it shows nowhere, or at each of its looks.
 */

#include "base/error.h"
#include "base/json.h"
#include "base/memory.h"
#include "base/text.h"
#include "job/job_write.h"
#include "simulation/truth.h"

#include <cjson/cJSON.h>
#include <math.h>
#include <string.h>

static const char truth_format[] = "ringfettle-truth/1";
static const double theta_most = 40; /* whitened; nothing drawn comes near */

const char *const look_names[N_LOOKS] = {[LOOK_OPEN] = "open", [LOOK_CHECK] = "check"};

/* One hidden number, or `n` of them, where θ has them. */
struct hidden_field {
    const char *key;
    int first; /* NO_PARAMETER: the ring has none */
    size_t n;  /* 0: a number; else a list */
};

enum { N_HIDDEN = 7 };

static void list_hidden(const struct wiring *wiring, struct hidden_field fields[N_HIDDEN])
{
    const struct parameter_map *map = &wiring->map;
    fields[0] = (struct hidden_field){"runs", map->runs, n_runs(wiring->job)};
    fields[1] = (struct hidden_field){"conductors", map->conductor[0], N_CONDUCTORS};
    fields[2] = (struct hidden_field){"unknown_cpc", map->unknown_cpc, 0};
    fields[3] = (struct hidden_field){"gain", map->gain, 0};
    fields[4] = (struct hidden_field){"lead", map->lead, 0};
    fields[5] = (struct hidden_field){"face", map->face, 0};
    fields[6] = (struct hidden_field){"wander", map->wander, 0};
}

/* --- writing --- */

static bool put(cJSON *object, const char *key, cJSON *item)
{
    if (item != NULL && cJSON_AddItemToObject(object, key, item))
        return true;
    cJSON_Delete(item);
    return false;
}

static cJSON *write_hidden(const struct truth *t)
{
    struct hidden_field fields[N_HIDDEN];
    cJSON *hidden = cJSON_CreateObject();
    bool good = hidden != NULL;
    list_hidden(&t->wiring, fields);
    for (size_t i = 0; i < N_HIDDEN && good; i++) {
        const double *theta = t->theta + fields[i].first;
        if (fields[i].first == NO_PARAMETER)
            continue;
        good = put(hidden, fields[i].key,
                   fields[i].n > 0 ? cJSON_CreateDoubleArray(theta, (int)fields[i].n)
                                   : cJSON_CreateNumber(*theta));
    }
    if (good)
        return hidden;
    cJSON_Delete(hidden);
    return NULL;
}

static bool put_look(cJSON *object, const struct rf_job *job, const struct look *look)
{
    if (!put(object, "look", cJSON_CreateString(look_names[look->kind])))
        return false;
    if (look->where == LOOK_AT_BOARD)
        return put(object, "place", cJSON_CreateString("board"));
    if (look->where == LOOK_AT_PLACE)
        return put(object, "place", cJSON_CreateString(job->places[look->index].id));
    const char *ends[2] = {job->places[run_near_end(job, look->index)].id,
                           job->places[run_far_end(look->index)].id};
    return put(object, "run", cJSON_CreateStringArray(ends, 2));
}

static cJSON *write_fault(const struct truth *t, size_t i)
{
    const struct fault *fault = &t->hypothesis.faults[i];
    cJSON *object = cJSON_CreateObject();
    bool good = object != NULL && put(object, "fault", fault_to_json(fault, t->job));
    if (good && t->parameter_of[i] != NO_PARAMETER)
        good = put(object, fault->family->metres ? "metres" : "ohms",
                   cJSON_CreateNumber(truth_value(t, i)));
    if (good && t->spots[i].shows && !t->spots[i].each_enough)
        good = put_look(object, t->job, &t->spots[i].look);
    if (good)
        return object;
    cJSON_Delete(object);
    return NULL;
}

static bool put_faults(cJSON *document, const struct truth *t)
{
    cJSON *faults = cJSON_CreateArray();
    bool good = faults != NULL;
    for (size_t i = 0; i < t->hypothesis.n_faults && good; i++) {
        cJSON *fault = write_fault(t, i);
        good = fault != NULL && cJSON_AddItemToArray(faults, fault);
        if (!good)
            cJSON_Delete(fault);
    }
    if (good)
        return put(document, "faults", faults);
    cJSON_Delete(faults);
    return false;
}

enum rf_status truth_write(const struct truth *t, struct text *out, struct rf_error *error)
{
    cJSON *document = cJSON_CreateObject();
    bool good = document != NULL && put(document, "format", cJSON_CreateString(truth_format)) &&
                put(document, "seed", cJSON_CreateNumber(t->seed)) &&
                put(document, "models", cJSON_CreateString(rf_models_name(t->models))) &&
                put_faults(document, t) && put(document, "hidden", write_hidden(t)) &&
                put(document, "job", cJSON_Duplicate(t->document, true));
    enum rf_status status = good ? job_write_document(document, out, error) : fail_memory(error);
    cJSON_Delete(document);
    return status;
}

/* --- reading --- */

static enum rf_status read_format(const struct json_at *document, struct rf_error *error)
{
    static const char *const known[] = {"format", "seed", "models", "faults", "hidden", "job"};
    const char *const formats[] = {truth_format};
    size_t index = 0;
    struct json_at at = json_member(document, "format");
    enum rf_status status = json_object(document, known, sizeof known / sizeof *known, error);
    return status == RF_OK ? json_choice(&at, formats, 1, &index, error) : status;
}

static enum rf_status read_seed(const struct json_at *document, uint32_t *seed,
                                struct rf_error *error)
{
    static const char needs[] = "a whole number from 0 to 4294967295";
    double number = 0;
    struct json_at at = json_member(document, "seed");
    enum rf_status status = json_number(&at, 0, UINT32_MAX, needs, &number, error);
    if (status == RF_OK && number > floor(number))
        status = json_fail_found(&at, error, needs);
    *seed = status == RF_OK ? (uint32_t)number : 0;
    return status;
}

static enum rf_status read_job(const struct json_at *document, struct truth *t,
                               struct rf_error *error)
{
    struct text text = {0};
    struct json_at at = json_member(document, "job");
    enum rf_status status = json_object(&at, NULL, 0, error);
    if (status == RF_OK)
        status = job_write_document(at.value, &text, error);
    if (status == RF_OK)
        status = rf_job_parse(text.bytes, text.length, document->source, &t->job, error);
    if (status == RF_OK && (t->document = cJSON_Duplicate(t->job->document, true)) == NULL)
        status = fail_memory(error);
    text_finish(&text);
    return status;
}

static enum rf_status read_place(const struct json_at *at, const struct rf_job *job, size_t *place,
                                 struct rf_error *error)
{
    const char *id = NULL;
    enum rf_status status = json_string(at, "a place of the ring", &id, error);
    if (status != RF_OK)
        return status;
    *place = job_find_place(job, id);
    return *place < job->n_places ? RF_OK : json_fail_found(at, error, "a place of the ring");
}

static enum rf_status read_run(const struct json_at *at, const struct rf_job *job,
                               struct look *look, struct rf_error *error)
{
    static const char needs[] = "the two places of a run";
    size_t ends[2] = {0};
    enum rf_status status = json_array(at, 2, 2, needs, error);
    JSON_EACH(at, element, i) {
        if (status == RF_OK)
            status = read_place(&element, job, &ends[i], error);
    }
    if (status != RF_OK)
        return status;
    look->where = LOOK_IN_RUN;
    look->index = job_find_run(job, ends[0], ends[1]);
    return look->index < n_runs(job) ? RF_OK : json_fail_found(at, error, needs);
}

static enum rf_status read_look(const struct json_at *object, const struct rf_job *job,
                                struct look *look, struct rf_error *error)
{
    size_t kind = 0;
    struct json_at at = json_member(object, "look");
    struct json_at place = json_member(object, "place"), run = json_member(object, "run");
    enum rf_status status = json_choice(&at, look_names, N_LOOKS, &kind, error);
    look->kind = (enum look_kind)kind;
    if (status != RF_OK)
        return status;
    if (run.value != NULL)
        return read_run(&run, job, look, error);
    bool board = cJSON_IsString(place.value) && strcmp(place.value->valuestring, "board") == 0;
    look->where = board ? LOOK_AT_BOARD : LOOK_AT_PLACE;
    return board ? RF_OK : read_place(&place, job, &look->index, error);
}

static void note_look(void *context, const struct look *look)
{
    struct look *noted = context;
    *noted = *look;
}

static enum rf_status read_spot(const struct json_at *object, struct truth *t, size_t i,
                                struct rf_error *error)
{
    const struct fault *fault = &t->hypothesis.faults[i];
    struct look any = {.share = -1};
    fault_looks(fault, t->job, t->models, note_look, &any);
    t->spots[i].shows = any.share >= 0;
    t->spots[i].each_enough = fault->family->each_enough;
    t->spots[i].look = any;
    if (!t->spots[i].shows || t->spots[i].each_enough)
        return RF_OK;
    return read_look(object, t->job, &t->spots[i].look, error);
}

static enum rf_status read_fault(const struct json_at *object, struct truth *t,
                                 struct rf_error *error)
{
    static const char *const known[] = {"fault", "ohms", "metres", "look", "place", "run"};
    size_t i = t->hypothesis.n_faults;
    struct json_at at = json_member(object, "fault");
    enum rf_status status = json_object(object, known, sizeof known / sizeof *known, error);
    if (status == RF_OK)
        status = json_object(&at, NULL, 0, error);
    if (status == RF_OK)
        status = fault_from_json(at.value, t->job, t->models, "faults.fault",
                                 &t->hypothesis.faults[i], error);
    if (status == RF_OK && t->hypothesis.faults[i].family == &fault_family_none)
        status = json_fail_found(&at, error, "a defect, or an empty list of faults");
    if (status != RF_OK)
        return status;
    t->hypothesis.n_faults++;
    return read_spot(object, t, i, error);
}

static enum rf_status read_faults(const struct json_at *document, struct truth *t,
                                  struct rf_error *error)
{
    struct json_at at = json_member(document, "faults");
    enum rf_status status = json_array(&at, 0, 2, "a list of at most two faults", error);
    JSON_EACH(&at, element, i) {
        if (status == RF_OK)
            status = read_fault(&element, t, error);
    }
    return status;
}

/* The values of the faults' parameters; θ is there. */
static enum rf_status read_values(const struct json_at *document, struct truth *t,
                                  struct rf_error *error)
{
    enum rf_status status = RF_OK;
    struct json_at faults = json_member(document, "faults");
    JSON_EACH(&faults, element, i) {
        if (status != RF_OK || t->parameter_of[i] == NO_PARAMETER)
            continue;
        bool metres = t->hypothesis.faults[i].family->metres;
        struct json_at at = json_member(&element, metres ? "metres" : "ohms");
        double value = 0;
        status = json_number(&at, 1e-9, 1e9, "a value above 0", &value, error);
        if (status == RF_OK)
            status = truth_set_value(t, i, value, error);
    }
    return status;
}

static enum rf_status read_theta(const struct json_at *at, double *theta, struct rf_error *error)
{
    return json_number(at, -theta_most, theta_most, "a number from -40 to 40", theta, error);
}

static enum rf_status read_hidden_field(const struct json_at *hidden,
                                        const struct hidden_field *field, double theta[],
                                        struct rf_error *error)
{
    struct json_at at = json_member(hidden, field->key);
    if (field->n == 0)
        return read_theta(&at, theta, error);
    enum rf_status status =
        json_array(&at, field->n, field->n, "as many numbers as the ring has", error);
    JSON_EACH(&at, element, i) {
        if (status == RF_OK)
            status = read_theta(&element, &theta[i], error);
    }
    return status;
}

static enum rf_status read_hidden(const struct json_at *document, struct truth *t,
                                  struct rf_error *error)
{
    struct hidden_field fields[N_HIDDEN];
    const char *known[N_HIDDEN];
    struct json_at hidden = json_member(document, "hidden");
    size_t n = 0;
    list_hidden(&t->wiring, fields);
    for (size_t i = 0; i < N_HIDDEN; i++)
        if (fields[i].first != NO_PARAMETER)
            known[n++] = fields[i].key;
    enum rf_status status = json_object(&hidden, known, n, error);
    for (size_t i = 0; i < N_HIDDEN && status == RF_OK; i++)
        if (fields[i].first != NO_PARAMETER)
            status = read_hidden_field(&hidden, &fields[i], t->theta + fields[i].first, error);
    return status;
}

static enum rf_status read_document(const struct json_at *document, struct truth *t,
                                    struct rf_error *error)
{
    enum rf_status status = read_format(document, error);
    if (status == RF_OK)
        status = read_seed(document, &t->seed, error);
    if (status == RF_OK)
        status = read_job(document, t, error);
    if (status == RF_OK)
        status = read_faults(document, t, error);
    if (status == RF_OK)
        status = truth_wire(t, t->job, error);
    if (status == RF_OK)
        status = read_hidden(document, t, error);
    return status == RF_OK ? read_values(document, t, error) : status;
}

enum rf_status truth_read(const char *bytes, size_t length, const char *source,
                          const struct rf_models *models, struct truth **truth,
                          struct rf_error *error)
{
    cJSON *tree = NULL;
    struct truth *t = NEW(struct truth);
    enum rf_status status = t != NULL ? RF_OK : fail_memory(error);
    *truth = NULL;
    if (status == RF_OK)
        status = json_parse(bytes, length, source, JSON_DOCUMENT, &tree, error);
    if (status == RF_OK) {
        struct json_at document = json_document(tree, source);
        t->models = models;
        status = read_document(&document, t, error);
    }
    cJSON_Delete(tree);
    if (status == RF_OK)
        *truth = t;
    else
        truth_destroy(t);
    return status;
}
