/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "diagnosis/diagnosis.h"

#include "base/error.h"
#include "base/memory.h"

#include <math.h>

/*
 * The likelihood takes a reading over range for a missing path. On a ring so long that it reads
 * beyond the meter's range with nothing wrong, over range says nothing, and a break would be found
 * in every such job: so the reading is refused.
 */
static const double reach = 2.0; /* σ of the ring as recorded */

static double highest_expected(const struct forward *forward, size_t measurement, size_t d)
{
    const double *gradient = forward_gradient(forward, measurement);
    double square = 0.0;
    for (size_t j = 0; j < d; j++)
        square += gradient[j] * gradient[j];
    return forward_mean(forward, measurement) + reach * sqrt(square);
}

static enum rf_status refuse(const struct wiring *ring, const struct measurement *m,
                             double expected, struct rf_error *error)
{
    const struct reading reading = {.setup = m->setup, .spot = m->spot, .place = m->place};
    return fail(
        error, RF_REFUSED,
        "%s: readings.%s.%s: found \"open\"; needs to be left out, because this ring, wired "
        "as recorded, could read %.0f Ω there, and the meter reads to %.1f Ω: over range "
        "would show nothing",
        ring->job->source, setups[m->setup].name, reading_key(ring->job, &reading), expected,
        ring->models->instrument.over_range);
}

/* What is over range in the job, repeats in a row once; how many. */
static size_t list_open(const struct rf_job *job, struct measurement list[])
{
    size_t n = 0;
    for (size_t i = 0; i < job->n_readings; i++) {
        const struct reading *r = &job->readings[i];
        struct measurement m = {r->setup, r->spot, r->place};
        if (r->open && (n == 0 || !measurement_equal(&list[n - 1], &m)))
            list[n++] = m;
    }
    return n;
}

static enum rf_status check_open(const struct wiring *ring, struct forward *forward,
                                 const double theta[], struct rf_error *error)
{
    enum rf_status status = forward_analyse(forward, ring);
    if (status == RF_OK)
        status = forward_evaluate(forward, theta);
    if (status != RF_OK)
        return fail(error, status, "%s: the recorded ring's readings cannot be computed",
                    ring->job->source);
    for (size_t i = 0; i < forward_measurements(forward) && status == RF_OK; i++) {
        double expected = forward_reachable(forward, i)
                              ? highest_expected(forward, i, (size_t)ring->n_parameters)
                              : 0.0;
        if (expected > ring->models->instrument.over_range)
            status = refuse(ring, forward_measurement(forward, i), expected, error);
    }
    return status;
}

enum rf_status check_range(const struct wiring *ring, struct rf_error *error)
{
    struct measurement *list = NEW_ARRAY(struct measurement, ring->job->n_readings);
    double *theta = NEW_ARRAY(double, ring->n_parameters);
    size_t n = list != NULL ? list_open(ring->job, list) : 0;
    struct forward *forward = n > 0 ? forward_create(ring, list, n) : NULL;
    enum rf_status status = RF_OK;
    if (list == NULL || theta == NULL || (n > 0 && forward == NULL))
        status = fail_memory(error);
    else if (n > 0)
        status = check_open(ring, forward, theta, error);
    forward_destroy(forward);
    free(theta);
    free(list);
    return status;
}
