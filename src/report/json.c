/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "report/report.h"

#include "advice/advice.h"
#include "report/json_write.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>

/* The format ringfettle-diagnosis/1. */
struct writer {
    struct json_writer json;
    const struct rf_diagnosis *diagnosis;
};

enum { OHM_DIGITS = 6 };

/* Ω, to as many digits as say something; NAN is over range. */
static void add_ohms(struct writer *writer, cJSON *object, const char *key, double ohms)
{
    if (isnan(ohms)) {
        json_add_words(&writer->json, object, key, "open");
        return;
    }
    char digits[32];
    snprintf(digits, sizeof digits, "%.*g", OHM_DIGITS, ohms);
    json_add_number(&writer->json, object, key, strtod(digits, NULL));
}

/* --- faults, findings, places --- */

static void add_estimate(struct writer *writer, cJSON *object, const char *ohms, const char *metres,
                         const struct estimate *estimate)
{
    if (!estimate->known)
        return;
    cJSON *range = cJSON_CreateObject();
    add_ohms(writer, range, "value", estimate->value);
    add_ohms(writer, range, "low", estimate->low);
    add_ohms(writer, range, "high", estimate->high);
    json_add(&writer->json, object, estimate->metres ? metres : ohms, range);
}

static cJSON *fault_object(struct writer *writer, const struct ranked *ranked)
{
    static const struct fault none = {.family = &fault_family_none};
    const struct hypothesis *hypothesis = &ranked->hypothesis;
    const struct rf_job *job = writer->diagnosis->job;
    cJSON *object = cJSON_CreateObject();
    const struct fault *first = hypothesis->n_faults > 0 ? &hypothesis->faults[0] : &none;
    json_add(&writer->json, object, "fault", fault_to_json(first, job));
    if (hypothesis->n_faults > 1)
        json_add(&writer->json, object, "also", fault_to_json(&hypothesis->faults[1], job));
    json_add_number(&writer->json, object, "confidence", ranked->confidence);
    if (hypothesis->n_faults > 0)
        add_estimate(writer, object, "ohms", "metres", &ranked->estimates[0]);
    if (hypothesis->n_faults > 1)
        add_estimate(writer, object, "also_ohms", "also_metres", &ranked->estimates[1]);
    json_add_words(&writer->json, object, "text", ranked->words);
    return object;
}

static void add_faults(struct writer *writer, cJSON *root)
{
    const struct rf_diagnosis *diagnosis = writer->diagnosis;
    cJSON *list = json_add_list(&writer->json, root, "faults");
    for (size_t i = 0; i < diagnosis->n_ranked; i++)
        json_append(&writer->json, list, fault_object(writer, &diagnosis->ranked[i]));
}

static void add_findings(struct writer *writer, cJSON *root)
{
    const struct rf_diagnosis *diagnosis = writer->diagnosis;
    cJSON *list = json_add_list(&writer->json, root, "findings");
    for (size_t i = 0; i < diagnosis->n_findings; i++) {
        const struct finding *finding = &diagnosis->findings[i];
        cJSON *object = cJSON_CreateObject();
        json_add_words(&writer->json, object, "text", finding->words);
        json_add_number(&writer->json, object, "confidence", finding->confidence);
        cJSON *members = json_add_list(&writer->json, object, "faults");
        for (size_t j = 0; j < finding->n_members; j++)
            json_append(&writer->json, members, cJSON_CreateNumber((double)finding->members[j]));
        json_append(&writer->json, list, object);
    }
}

/* "look" with its "place" or "run". */
static void add_look(struct writer *writer, cJSON *object, const struct look *look)
{
    const struct rf_job *job = writer->diagnosis->job;
    json_add_words(&writer->json, object, "look", look->kind == LOOK_CHECK ? "check" : "open");
    switch (look->where) {
    case LOOK_AT_BOARD:
        json_add_words(&writer->json, object, "place", "board");
        break;
    case LOOK_AT_PLACE:
        json_add_words(&writer->json, object, "place", job->places[look->index].id);
        break;
    case LOOK_IN_RUN: {
        cJSON *run = json_add_list(&writer->json, object, "run");
        json_append(&writer->json, run,
                    cJSON_CreateString(job->places[run_near_end(job, look->index)].id));
        json_append(&writer->json, run,
                    cJSON_CreateString(job->places[run_far_end(look->index)].id));
        break;
    }
    }
}

static void add_places(struct writer *writer, cJSON *root)
{
    const struct rf_diagnosis *diagnosis = writer->diagnosis;
    cJSON *list = json_add_list(&writer->json, root, "places");
    for (size_t i = 0; i < diagnosis->n_places; i++) {
        cJSON *object = cJSON_CreateObject();
        add_look(writer, object, &diagnosis->places[i].look);
        json_add_number(&writer->json, object, "chance", diagnosis->places[i].chance);
        json_append(&writer->json, list, object);
    }
}

/* --- readings, blind spots --- */

/* Which reading it is, as read, and what the best explanation gives. */
static cJSON *reading_object(struct writer *writer, size_t i)
{
    const struct rf_diagnosis *diagnosis = writer->diagnosis;
    const struct reading *reading = &diagnosis->job->readings[i];
    cJSON *object = cJSON_CreateObject();
    json_add_words(&writer->json, object, "setup", setups[reading->setup].name);
    json_add_words(&writer->json, object, "place", reading_key(diagnosis->job, reading));
    add_ohms(writer, object, "read", reading->open ? NAN : reading->ohms);
    if (diagnosis->n_ranked > 0)
        add_ohms(writer, object, "fitted", diagnosis->ranked[0].fitted[i]);
    return object;
}

static void add_suspects(struct writer *writer, cJSON *root)
{
    const struct rf_diagnosis *diagnosis = writer->diagnosis;
    cJSON *list = json_add_list(&writer->json, root, "suspect");
    for (size_t i = 0; i < diagnosis->n_suspects; i++)
        json_append(&writer->json, list, reading_object(writer, diagnosis->suspects[i].reading));
}

static void add_readings(struct writer *writer, cJSON *root)
{
    const struct rf_diagnosis *diagnosis = writer->diagnosis;
    cJSON *list = json_add_list(&writer->json, root, "readings");
    for (size_t i = 0; i < diagnosis->job->n_readings; i++) {
        cJSON *object = reading_object(writer, i);
        add_ohms(writer, object, "sound", diagnosis->sound[i]);
        json_append(&writer->json, list, object);
    }
}

/* The kind: the example's fields without those that say where. */
static cJSON *blind_object(struct writer *writer, const struct blind_spot *blind)
{
    static const char *const where[] = {"run", "at", "between", "points"};
    cJSON *object = fault_to_json(&blind->example, writer->diagnosis->job);
    for (size_t i = 0; i < sizeof where / sizeof where[0]; i++)
        cJSON_DeleteItemFromObjectCaseSensitive(object, where[i]);
    json_add_words(&writer->json, object, "text", blind->words);
    return object;
}

static const char *measurement_key(const struct rf_job *job, const struct measurement *read)
{
    return read->spot == SPOT_POINT ? job->places[read->place].id : spot_keys[read->spot];
}

/* The reading that would lift it, as a plan has it. */
static void add_lift(struct writer *writer, cJSON *object, const struct rf_advice *advice,
                     size_t blind)
{
    for (size_t i = 0; advice != NULL && i < advice->n_lifts; i++) {
        const struct lift *lift = &advice->lifts[i];
        if (lift->blind != blind)
            continue;
        cJSON *read = cJSON_CreateObject();
        json_add_words(&writer->json, read, "setup", setups[lift->read.setup].name);
        json_add_words(&writer->json, read, "place",
                       measurement_key(writer->diagnosis->job, &lift->read));
        json_add_number(&writer->json, read, "minutes", lift->minutes);
        json_add_words(&writer->json, read, "text", lift->words);
        json_add(&writer->json, object, "lift", read);
    }
}

static void add_blind(struct writer *writer, cJSON *root, const struct rf_advice *advice)
{
    const struct rf_diagnosis *diagnosis = writer->diagnosis;
    cJSON *list = json_add_list(&writer->json, root, "blind");
    for (size_t i = 0; i < diagnosis->n_blind; i++) {
        cJSON *object = blind_object(writer, &diagnosis->blind[i]);
        add_lift(writer, object, advice, i);
        json_append(&writer->json, list, object);
    }
}

static void add_misfit(struct writer *writer, cJSON *root)
{
    cJSON *object = cJSON_CreateObject();
    json_add_number(&writer->json, object, "p", writer->diagnosis->misfit.p);
    json_add(&writer->json, object, "flag", cJSON_CreateBool(writer->diagnosis->misfit.flag));
    json_add(&writer->json, root, "misfit", object);
}

/* What the ranking assumes beyond the model, where that explains the readings and it does not. */
static void add_wider(struct writer *writer, cJSON *root)
{
    const struct rf_diagnosis *diagnosis = writer->diagnosis;
    if (!diagnosis->wider.assumed)
        return;
    cJSON *object = cJSON_CreateObject();
    if (diagnosis->wider.face_ohms > 0)
        add_ohms(writer, object, "face_ohms", diagnosis->wider.face_ohms);
    else if (diagnosis->wider.length_factor > 0)
        json_add_number(&writer->json, object, "length_factor", diagnosis->wider.length_factor);
    else
        json_add_number(&writer->json, object, "defects", 2);
    json_add_number(&writer->json, object, "p", diagnosis->wider.p);
    json_add(&writer->json, root, "wider", object);
}

/* --- the plan --- */

static cJSON *plan_object(struct writer *writer, const struct plan *plan)
{
    cJSON *object = cJSON_CreateObject();
    bool read = plan->action == ACTION_READ;
    json_add_words(&writer->json, object, "action", read ? "read" : "look");
    if (read) {
        json_add_words(&writer->json, object, "setup", setups[plan->setup].name);
        cJSON *places = json_add_list(&writer->json, object, "places");
        for (size_t i = 0; i < plan->n_reads; i++)
            json_append(
                &writer->json, places,
                cJSON_CreateString(measurement_key(writer->diagnosis->job, &plan->reads[i])));
    } else {
        add_look(writer, object, &plan->look);
    }
    json_add_number(&writer->json, object, "minutes", plan->minutes);
    if (read)
        json_add_number(&writer->json, object, "saves", plan->saves);
    json_add_words(&writer->json, object, "text", plan->words);
    return object;
}

/* Nothing where nothing is worth doing. */
static void add_next(struct writer *writer, cJSON *root, const struct rf_advice *advice)
{
    cJSON *list = json_add_list(&writer->json, root, "next");
    for (size_t i = 0; i < advice->n_plans && !advice->stop; i++)
        json_append(&writer->json, list, plan_object(writer, &advice->plans[i]));
}

static void add_minutes(struct writer *writer, cJSON *root, const struct rf_advice *advice)
{
    cJSON *object = cJSON_CreateObject();
    json_add_number(&writer->json, object, "look_now", advice->look_now);
    json_add_number(&writer->json, object, "measure_first", advice->measure_first);
    json_add(&writer->json, root, "expected_minutes", object);
}

void report_json(const struct rf_diagnosis *diagnosis, const struct rf_advice *advice,
                 struct text *out)
{
    struct writer writer = {.diagnosis = diagnosis};
    cJSON *root = cJSON_CreateObject();
    json_add_words(&writer.json, root, "format", "ringfettle-diagnosis/1");
    json_add_words(&writer.json, root, "job", rf_job_name(diagnosis->job));
    json_add_words(&writer.json, root, "models", rf_models_name(diagnosis->models));
    json_add_number(&writer.json, root, "hypotheses", (double)diagnosis->n_hypotheses);
    add_misfit(&writer, root);
    add_wider(&writer, root);
    add_faults(&writer, root);
    add_findings(&writer, root);
    add_places(&writer, root);
    add_suspects(&writer, root);
    add_blind(&writer, root, advice);
    add_readings(&writer, root);
    if (advice != NULL) {
        add_next(&writer, root, advice);
        add_minutes(&writer, root, advice);
    }
    json_end_line(&writer.json, root, out);
}
