/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/error.h"
#include "base/memory.h"
#include "diagnosis/steps.h"

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

static enum rf_status refuse(const struct rf_diagnosis *diagnosis, const struct reading *reading,
                             double expected, struct rf_error *error)
{
    const struct rf_job *job = diagnosis->job;
    return fail(
        error, RF_REFUSED,
        "%s: readings.%s.%s: found \"open\"; needs to be left out, because this ring, wired "
        "as recorded, could read %.0f Ω there, and the meter reads to %.1f Ω: over range "
        "would show nothing",
        job->source, setups[reading->setup].name, reading_key(job, reading), expected,
        diagnosis->models->instrument.over_range);
}

enum rf_status check_range(const struct rf_diagnosis *diagnosis, struct fitter *fitter,
                           struct rf_error *error)
{
    const struct observation *observations = NULL;
    struct forward *forward = fitter_forward_to_use(fitter);
    size_t n = fitter_observations(fitter, &observations);
    size_t d = (size_t)diagnosis->ring.n_parameters;
    double *theta = NEW_ARRAY(double, d);
    if (theta == NULL)
        return fail_memory(error);
    enum rf_status status = forward_analyse(forward, &diagnosis->ring);
    if (status == RF_OK)
        status = forward_evaluate(forward, theta);
    free(theta);
    if (status != RF_OK)
        return fail(error, status, "%s: the recorded ring's readings cannot be computed",
                    diagnosis->job->source);
    for (size_t i = 0; i < n && status == RF_OK; i++) {
        size_t m = observations[i].measurement;
        if (!observations[i].open || !forward_reachable(forward, m))
            continue;
        double expected = highest_expected(forward, m, d);
        if (expected > diagnosis->models->instrument.over_range)
            status = refuse(diagnosis, &diagnosis->job->readings[i], expected, error);
    }
    return status;
}
