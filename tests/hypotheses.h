/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef TESTS_HYPOTHESES_H
#define TESTS_HYPOTHESES_H

/*
 * Jobs and hypotheses from texts as files have them, for tests of the rooms from the fit upwards.
 * All rings made with these are invented.
 */

#include "faults/fault.h"
#include "fit/fit.h"
#include "simulation/simulation.h"

#include "shipped_models.h"
#include "suite.h"

#include <cjson/cJSON.h>
#include <check.h>
#include <stdlib.h>
#include <string.h>

/* `ring` and `readings` without their outer braces; `more` goes behind them, with its comma. */
static inline struct rf_job *job_of(const char *ring, const char *readings, const char *more)
{
    struct rf_job *job;
    struct rf_error error;
    static const char form[] =
        "{\"format\": \"ringfettle-job/1\", \"ring\": {%s}, \"readings\": {%s}%s}";
    size_t room = sizeof form + strlen(ring) + strlen(readings) + strlen(more);
    char *text = malloc(room);
    ck_assert_ptr_nonnull(text);
    snprintf(text, room, form, ring, readings, more);
    enum rf_status status = rf_job_parse(text, strlen(text), "test", &job, &error);
    ck_assert_msg(status == RF_OK, "%s", error.text);
    free(text);
    return job;
}

/* A hypothesis from a fault's fields, without braces; "" is no fault. */
static inline struct hypothesis hypothesis_of(const struct rf_job *job, const char *fields)
{
    struct hypothesis hypothesis = {0};
    struct rf_error error;
    char text[256];
    if (*fields == '\0')
        return hypothesis;
    snprintf(text, sizeof text, "{%s}", fields);
    cJSON *object = cJSON_Parse(text);
    ck_assert_msg(object != NULL, "no JSON: %s", text);
    ck_assert_msg(fault_from_json(object, job, models, "test", &hypothesis.faults[0], &error) ==
                      RF_OK,
                  "%s", error.text);
    cJSON_Delete(object);
    hypothesis.n_faults = hypothesis.faults[0].family->apply != NULL;
    return hypothesis;
}

/* A job's ring and a fitter for its readings. It points to itself: it must not be copied. */
struct bench {
    const struct rf_job *job;
    struct wiring ring, wiring;
    int parameter_of[FAULTS_AT_ONCE];
    struct fitter *fitter;
};

static inline void bench_init(struct bench *bench, const struct rf_job *job)
{
    struct rf_error error;
    *bench = (struct bench){.job = job};
    ck_assert_int_eq(wiring_init(&bench->ring, job, models, &error), RF_OK);
    ck_assert_int_eq(wiring_init(&bench->wiring, job, models, &error), RF_OK);
    bench->fitter = fitter_create(&bench->ring);
    ck_assert_ptr_nonnull(bench->fitter);
}

static inline void bench_finish(struct bench *bench)
{
    fitter_destroy(bench->fitter);
    wiring_finish(&bench->wiring);
    wiring_finish(&bench->ring);
}

static inline void bench_wire(struct bench *bench, const struct hypothesis *hypothesis)
{
    wiring_copy(&bench->wiring, &bench->ring);
    hypothesis_apply(hypothesis, &bench->wiring, bench->parameter_of);
}

static inline struct fit bench_fit(struct bench *bench, const struct hypothesis *hypothesis)
{
    struct fit fit;
    bench_wire(bench, hypothesis);
    ck_assert_int_eq(fitter_fit(bench->fitter, &bench->wiring, NULL, &fit), RF_OK);
    return fit;
}

#endif
