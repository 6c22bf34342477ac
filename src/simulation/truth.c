/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "simulation/truth.h"

#include "base/error.h"
#include "base/memory.h"
#include "job/job_write.h"

#include <cjson/cJSON.h>
#include <gsl/gsl_randist.h>
#include <math.h>
#include <stdio.h>
#include <string.h>

void truth_destroy(struct truth *t)
{
    if (t == NULL)
        return;
    wiring_finish(&t->wiring);
    rf_job_destroy(t->job);
    cJSON_Delete(t->document);
    free(t->theta);
    free(t);
}

enum rf_status truth_wire(struct truth *t, const struct rf_job *job, struct rf_error *error)
{
    wiring_finish(&t->wiring);
    t->wiring = (struct wiring){0};
    enum rf_status status = wiring_init(&t->wiring, job, t->models, error);
    if (status != RF_OK)
        return status;
    hypothesis_apply(&t->hypothesis, &t->wiring, t->parameter_of);
    if (t->theta == NULL)
        t->theta = NEW_ARRAY(double, t->wiring.n_parameters);
    return t->theta != NULL ? RF_OK : fail_memory(error);
}

enum rf_status truth_write_job(const struct truth *t, bool one_line, struct text *out,
                               struct rf_error *error)
{
    if (!one_line)
        return job_write_document(t->document, out, error);
    char *printed = cJSON_PrintUnformatted(t->document);
    if (printed == NULL)
        return fail_memory(error);
    text_add(out, printed);
    cJSON_free(printed);
    return out->failed ? fail_memory(error) : RF_OK;
}

/* --- a fault's value --- */

static const struct family_prior *row_of(const struct truth *t, size_t fault)
{
    return models_family(t->models, t->hypothesis.faults[fault].family->name);
}

double truth_value(const struct truth *t, size_t fault)
{
    int j = t->parameter_of[fault];
    if (j == NO_PARAMETER)
        return NAN;
    return row_of(t, fault)->parameter.median * exp(t->wiring.parameters[j].sigma * t->theta[j]);
}

enum rf_status truth_set_value(struct truth *t, size_t fault, double value, struct rf_error *error)
{
    const struct fault_family *family = t->hypothesis.faults[fault].family;
    int j = t->parameter_of[fault];
    if (j == NO_PARAMETER)
        return fail(error, RF_REFUSED,
                    "a fault of the family %s, as given, takes no value; found %g", family->name,
                    value);
    if (!(value > 0) || !isfinite(value))
        return fail(error, RF_REFUSED, "found %g for a fault of the family %s; needs %s above 0",
                    value, family->name, family->metres ? "metres" : "ohms");
    double sigma = t->wiring.parameters[j].sigma;
    t->theta[j] = sigma > 0 ? log(value / row_of(t, fault)->parameter.median) / sigma : 0;
    return RF_OK;
}

/* --- asking the meter --- */

static void name_answer(const struct rf_job *job, const struct measurement *m, size_t repeat,
                        char *name, size_t size)
{
    const struct reading reading = {.setup = m->setup, .spot = m->spot, .place = m->place};
    snprintf(name, size, "reading %s %s %zu", setups[m->setup].name, reading_key(job, &reading),
             repeat);
}

/* The resistance of the faces a reading goes through, Ω. It stays what it is. */
static double draw_contacts(const struct truth *t, const struct measurement *m, gsl_rng *generator)
{
    const struct setup *setup = &setups[m->setup];
    const struct pair_members pair = pair_members[setup->pair];
    double ohms = 0;
    if (!(t->departures.contact_ohms > 0) || m->spot != SPOT_POINT)
        return 0;
    for (int conductor = 0; conductor < N_CONDUCTORS; conductor++) {
        char name[JOB_MAX_ID + 64];
        bool met = setup_is_pair(setup)
                       ? conductor == (int)pair.first || conductor == (int)pair.second
                       : conductor == (int)setup->conductor;
        snprintf(name, sizeof name, "face %s %s", conductor_names[conductor],
                 t->wiring.job->places[m->place].id);
        generator_seed(generator, t->seed, name);
        ohms += met ? gsl_ran_exponential(generator, t->departures.contact_ohms) : 0;
    }
    return ohms;
}

static enum rf_status show(const struct truth *t, struct forward *forward, const size_t repeats[],
                           gsl_rng *generator, struct shown shown[], struct rf_error *error)
{
    enum rf_status status = forward_analyse(forward, &t->wiring);
    if (status == RF_OK)
        status = forward_evaluate(forward, t->theta);
    if (status != RF_OK)
        return fail(error, status, "%s: the readings cannot be computed", t->wiring.job->source);
    for (size_t i = 0; i < forward_measurements(forward); i++) {
        char name[JOB_MAX_ID + 64];
        const struct measurement *m = forward_measurement(forward, i);
        double mean = forward_mean(forward, i) + draw_contacts(t, m, generator);
        name_answer(t->wiring.job, m, repeats[i], name, sizeof name);
        generator_seed(generator, t->seed, name);
        shown[i] = draw_shown(&t->models->instrument, forward_reachable(forward, i), mean,
                              t->departures.heavy_tails, generator);
    }
    return RF_OK;
}

enum rf_status truth_answers(const struct truth *t, const struct measurement measurements[],
                             const size_t repeats[], size_t n, struct shown shown[],
                             struct rf_error *error)
{
    struct forward *forward = forward_create(&t->wiring, measurements, n);
    gsl_rng *generator = gsl_rng_alloc(gsl_rng_mt19937);
    enum rf_status status = forward != NULL && generator != NULL
                                ? show(t, forward, repeats, generator, shown, error)
                                : fail_memory(error);
    if (generator != NULL)
        gsl_rng_free(generator);
    forward_destroy(forward);
    return status;
}

enum rf_status truth_answer(const struct truth *t, const struct measurement *measurement,
                            size_t repeat, struct shown *shown, struct rf_error *error)
{
    return truth_answers(t, measurement, &repeat, 1, shown, error);
}

/* --- looking --- */

static bool same_spot(const struct look *one, const struct look *other)
{
    return one->kind == other->kind && one->where == other->where &&
           (one->where == LOOK_AT_BOARD || one->index == other->index);
}

struct look_search {
    const struct look *look;
    bool met;
};

static void meet_look(void *context, const struct look *look)
{
    struct look_search *search = context;
    search->met = search->met || same_spot(look, search->look);
}

bool truth_look(const struct truth *t, const struct look *look, size_t *fault)
{
    for (size_t i = 0; i < t->hypothesis.n_faults; i++) {
        struct look_search search = {.look = look};
        if (!t->spots[i].shows)
            continue;
        if (t->spots[i].each_enough)
            fault_looks(&t->hypothesis.faults[i], t->job, t->models, meet_look, &search);
        else
            meet_look(&search, &t->spots[i].look);
        if (!search.met)
            continue;
        if (fault != NULL)
            *fault = i;
        return true;
    }
    return false;
}
