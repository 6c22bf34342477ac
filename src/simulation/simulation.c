/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "simulation/simulation.h"

#include "base/error.h"
#include "base/memory.h"
#include "job/job_write.h"
#include "simulation/truth.h"

#include <cjson/cJSON.h>
#include <gsl/gsl_randist.h>
#include <math.h>
#include <stdio.h>

enum { DEFECTS_MOST = 2 }; /* `found` has room for: one, and `also` */

/* --- drawing what is hidden --- */

static enum rf_status draw_hypothesis(struct truth *t, const struct rf_job *ring, size_t defects,
                                      gsl_rng *generator, struct rf_error *error)
{
    enum rf_status status = RF_OK;
    size_t n = defects > 0 ? defects : 1;
    struct hypothesis *h = &t->hypothesis;
    generator_seed(generator, t->seed, "hypothesis");
    while (status == RF_OK && h->n_faults < n) {
        struct fault *fault = &h->faults[h->n_faults];
        status = draw_fault(ring, t->models, defects > 0, generator, fault, error);
        if (status != RF_OK || (h->n_faults > 0 && fault_equal(fault, &h->faults[0])))
            continue;
        if (fault->family == &fault_family_none)
            break;
        h->n_faults++;
    }
    return status;
}

static enum rf_status choose_hypothesis(struct truth *t, const struct rf_job *ring,
                                        const struct simulation *simulation, gsl_rng *generator,
                                        struct rf_error *error)
{
    size_t n = simulation->given ? simulation->hypothesis.n_faults : simulation->defects;
    if (n > DEFECTS_MOST)
        return fail(error, RF_USAGE, "%zu defects at once; needs at most %d", n, DEFECTS_MOST);
    if (!simulation->given)
        return draw_hypothesis(t, ring, n, generator, error);
    t->hypothesis = simulation->hypothesis;
    return RF_OK;
}

static enum rf_status draw_theta(struct truth *t, const struct simulation *simulation,
                                 gsl_rng *generator, struct rf_error *error)
{
    enum rf_status status = RF_OK;
    generator_seed(generator, t->seed, "theta");
    for (int j = 0; j < t->wiring.n_parameters; j++)
        t->theta[j] = gsl_ran_gaussian_ziggurat(generator, 1.0);
    if (t->departures.length_factor > 0)
        for (size_t run = 0; run < n_runs(t->wiring.job); run++)
            t->theta[(size_t)t->wiring.map.runs + run] *= t->departures.length_factor;
    for (size_t i = 0; i < t->hypothesis.n_faults && status == RF_OK; i++)
        if (fabs(simulation->value[i]) > 0)
            status = truth_set_value(t, i, simulation->value[i], error);
    return status;
}

struct look_draw {
    double left; /* of the sum of shares, before the look wanted */
    double sum;
    size_t n;
    struct look look;
};

static void sum_look(void *context, const struct look *look)
{
    struct look_draw *draw = context;
    draw->sum += look->share;
    draw->n++;
}

static void take_look(void *context, const struct look *look)
{
    struct look_draw *draw = context;
    if (draw->left >= 0)
        draw->look = *look;
    draw->left -= look->share;
}

/* Where each fault really is, by the shares of its looks. */
static void draw_spots(struct truth *t, const struct rf_job *job, gsl_rng *generator)
{
    generator_seed(generator, t->seed, "spot");
    for (size_t i = 0; i < t->hypothesis.n_faults; i++) {
        const struct fault *fault = &t->hypothesis.faults[i];
        struct look_draw draw = {0};
        fault_looks(fault, job, t->models, sum_look, &draw);
        t->spots[i].each_enough = fault->family->each_enough;
        t->spots[i].shows = draw.n > 0;
        draw.left = gsl_rng_uniform(generator) * draw.sum;
        fault_looks(fault, job, t->models, take_look, &draw);
        t->spots[i].look = draw.look;
        t->spots[i].look.share = 0;
    }
}

/* --- writing the job --- */

/* The reading as the display has it: "0.40", or "open". */
static cJSON *write_reading(const struct shown *shown, const struct instrument_model *in)
{
    char digits[32];
    int decimals = (int)fmax(0, ceil(-log10(in->step) - 1e-9));
    if (shown->open)
        return cJSON_CreateString("open");
    snprintf(digits, sizeof digits, "%.*f", decimals, shown->ohms);
    return cJSON_CreateRaw(digits);
}

static bool put(cJSON *object, const char *key, cJSON *item)
{
    if (item != NULL && cJSON_AddItemToObject(object, key, item))
        return true;
    cJSON_Delete(item);
    return false;
}

/* n readings of one spot: a value, or a list of them; nothing where `finite_only` leaves none. */
static bool put_spot(cJSON *setup, const char *key, const struct shown shown[], size_t n,
                     bool finite_only, const struct instrument_model *in)
{
    size_t kept = 0, last = 0;
    for (size_t i = 0; i < n; i++)
        if (!finite_only || !shown[i].open) {
            kept++;
            last = i;
        }
    if (kept < 2)
        return kept == 0 || put(setup, key, write_reading(&shown[last], in));
    cJSON *list = cJSON_CreateArray();
    bool good = list != NULL;
    for (size_t i = 0; i < n && good; i++) {
        if (finite_only && shown[i].open)
            continue;
        cJSON *item = write_reading(&shown[i], in);
        good = item != NULL && cJSON_AddItemToArray(list, item);
        if (!good)
            cJSON_Delete(item);
    }
    if (good)
        return put(setup, key, list);
    cJSON_Delete(list);
    return false;
}

static cJSON *write_readings(const struct rf_job *ring, const struct shown shown[],
                             const struct instrument_model *in)
{
    cJSON *readings = cJSON_CreateObject();
    bool good = readings != NULL;
    for (size_t i = 0, n = 1; i < ring->n_readings && good; i += n) {
        const struct reading *reading = &ring->readings[i];
        const char *name = setups[reading->setup].name;
        for (n = 1; i + n < ring->n_readings && ring->readings[i + n].repeat > 0;)
            n++;
        if (cJSON_GetObjectItemCaseSensitive(readings, name) == NULL)
            good = put(readings, name, cJSON_CreateObject());
        if (good)
            good = put_spot(cJSON_GetObjectItemCaseSensitive(readings, name),
                            reading_key(ring, reading), &shown[i], n,
                            reading->spot == SPOT_HIGHEST, in); /* which is never over range */
    }
    if (good)
        return readings;
    cJSON_Delete(readings);
    return NULL;
}

static cJSON *write_found(const struct hypothesis *hypothesis, const struct rf_job *ring)
{
    const struct fault none = {.family = &fault_family_none};
    if (hypothesis->n_faults == 0)
        return fault_to_json(&none, ring);
    cJSON *found = fault_to_json(&hypothesis->faults[0], ring);
    if (found == NULL || hypothesis->n_faults == 1)
        return found;
    if (put(found, "also", fault_to_json(&hypothesis->faults[1], ring)))
        return found;
    cJSON_Delete(found);
    return NULL;
}

/* Puts the member in the place of one of its key, or at the end. */
static bool replace(cJSON *document, const char *key, cJSON *item)
{
    if (item != NULL && cJSON_HasObjectItem(document, key) &&
        cJSON_ReplaceItemInObjectCaseSensitive(document, key, item))
        return true;
    return put(document, key, item);
}

static cJSON *write_document(const struct truth *t, const struct rf_job *ring, const char *name,
                             const struct shown shown[])
{
    cJSON *document = cJSON_Duplicate(ring->document, true);
    if (document != NULL && replace(document, "job", cJSON_CreateString(name)) &&
        replace(document, "readings", write_readings(ring, shown, &t->models->instrument)) &&
        replace(document, "found", write_found(&t->hypothesis, ring)))
        return document;
    cJSON_Delete(document);
    return NULL;
}

/* Takes every reading of the ring's job. */
static enum rf_status read_all(const struct truth *t, const struct rf_job *ring,
                               struct shown shown[], struct rf_error *error)
{
    struct measurement *measurements = NEW_ARRAY(struct measurement, ring->n_readings);
    size_t *repeats = NEW_ARRAY(size_t, ring->n_readings);
    enum rf_status status = measurements != NULL && repeats != NULL ? RF_OK : fail_memory(error);
    for (size_t i = 0; i < ring->n_readings && status == RF_OK; i++) {
        const struct reading *r = &ring->readings[i];
        measurements[i] =
            (struct measurement){.setup = r->setup, .spot = r->spot, .place = r->place};
        repeats[i] = r->repeat;
    }
    if (status == RF_OK)
        status = truth_answers(t, measurements, repeats, ring->n_readings, shown, error);
    free(measurements);
    free(repeats);
    return status;
}

static enum rf_status parse_job(struct truth *t, const char *name, struct rf_error *error)
{
    struct text text = {0};
    enum rf_status status = job_write_document(t->document, &text, error);
    if (status == RF_OK)
        status = rf_job_parse(text.bytes, text.length, name, &t->job, error);
    text_finish(&text);
    return status;
}

static enum rf_status make_job(struct truth *t, const struct rf_job *ring, const char *name,
                               struct rf_error *error)
{
    struct shown *shown = NEW_ARRAY(struct shown, ring->n_readings);
    enum rf_status status = shown != NULL ? RF_OK : fail_memory(error);
    if (status == RF_OK)
        status = read_all(t, ring, shown, error);
    if (status == RF_OK && (t->document = write_document(t, ring, name, shown)) == NULL)
        status = fail_memory(error);
    if (status == RF_OK)
        status = parse_job(t, name, error);
    free(shown);
    return status == RF_OK ? truth_wire(t, t->job, error) : status;
}

enum rf_status simulate(const struct rf_job *ring, const struct rf_models *models,
                        const struct simulation *simulation, struct truth **truth,
                        struct rf_error *error)
{
    char numbered[32];
    snprintf(numbered, sizeof numbered, "simulated-%lu", (unsigned long)simulation->seed);
    const char *name = simulation->name != NULL ? simulation->name : numbered;
    struct truth *t = NEW(struct truth);
    gsl_rng *generator = gsl_rng_alloc(gsl_rng_mt19937);
    enum rf_status status = t != NULL && generator != NULL ? RF_OK : fail_memory(error);
    *truth = NULL;
    if (status == RF_OK) {
        t->seed = simulation->seed;
        t->models = models;
        t->departures = simulation->departures;
        status = choose_hypothesis(t, ring, simulation, generator, error);
    }
    if (status == RF_OK)
        status = truth_wire(t, ring, error);
    if (status == RF_OK)
        status = draw_theta(t, simulation, generator, error);
    if (status == RF_OK) {
        draw_spots(t, ring, generator);
        status = make_job(t, ring, name, error);
    }
    if (generator != NULL)
        gsl_rng_free(generator);
    if (status != RF_OK) {
        truth_destroy(t);
        return status;
    }
    *truth = t;
    return RF_OK;
}
