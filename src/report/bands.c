/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "report/bands.h"

#include "base/cholesky.h"
#include "base/error.h"
#include "base/memory.h"
#include "fit/expected.h"

#include <math.h>
#include <string.h>

/* Σ (U⁻ᵀ J)², Ω². `scratch` holds n_parameters. */
static double fit_variance(const struct ranked *ranked, const double gradient[], double scratch[])
{
    size_t d = ranked->n_parameters;
    double sum = 0;
    memcpy(scratch, gradient, d * sizeof *scratch);
    cholesky_half_solve(ranked->factor, d, d, scratch);
    for (size_t j = 0; j < d; j++)
        sum += scratch[j] * scratch[j];
    return sum;
}

static struct band band_around(double ohms, double sigma)
{
    return (struct band){ohms, fmax(ohms - 2 * sigma, 0), ohms + 2 * sigma};
}

/* With the topology analysed and evaluated at the fit. */
static void take_bands(const struct rf_diagnosis *diagnosis, const struct forward *forward,
                       struct band bands[], double scratch[])
{
    for (size_t i = 0; i < forward_measurements(forward); i++) {
        if (!forward_reachable(forward, i))
            continue;
        double ohms = forward_mean(forward, i);
        const struct measurement *m = forward_measurement(forward, i);
        double noise = reading_sigma(diagnosis->models, m->setup, m->spot, 1, fmax(ohms, 0));
        double variance =
            fit_variance(&diagnosis->ranked[0], forward_gradient(forward, i), scratch);
        bands[i] = band_around(ohms, sqrt(noise * noise + variance));
    }
}

enum rf_status fitted_bands(const struct rf_diagnosis *diagnosis,
                            const struct measurement measurements[], size_t n, struct band bands[],
                            struct rf_error *error)
{
    for (size_t i = 0; i < n; i++)
        bands[i] = (struct band){(double)NAN, (double)NAN, (double)NAN};
    if (diagnosis->n_ranked == 0 || n == 0)
        return RF_OK;
    struct wiring wiring = {0};
    double *scratch = NEW_ARRAY(double, diagnosis->ranked[0].n_parameters);
    struct forward *forward = forward_create(&diagnosis->ring, measurements, n);
    enum rf_status status = scratch == NULL || forward == NULL
                                ? fail_memory(error)
                                : wiring_init(&wiring, diagnosis->job, diagnosis->models, error);
    if (status == RF_OK) {
        hypothesis_apply(&diagnosis->ranked[0].hypothesis, &wiring, NULL);
        status = forward_analyse(forward, &wiring);
        if (status == RF_OK)
            status = forward_evaluate(forward, diagnosis->ranked[0].theta);
        if (status != RF_OK)
            fail(error, status, "%s: what fits the readings cannot be worked out again",
                 diagnosis->job->source);
    }
    if (status == RF_OK)
        take_bands(diagnosis, forward, bands, scratch);
    wiring_finish(&wiring);
    forward_destroy(forward);
    free(scratch);
    return status;
}

enum rf_status sound_bands(const struct rf_diagnosis *diagnosis,
                           const struct measurement measurements[], size_t n, struct band bands[],
                           struct rf_error *error)
{
    struct expected *expected = NEW_ARRAY(struct expected, n);
    if (expected == NULL)
        return fail_memory(error);
    enum rf_status status = n == 0 ? RF_OK
                                   : expect_readings(diagnosis->job, diagnosis->models, false,
                                                     measurements, n, expected, NULL, error);
    for (size_t i = 0; i < n && status == RF_OK; i++)
        bands[i] = expected[i].open
                       ? (struct band){(double)NAN, (double)NAN, (double)NAN}
                       : (struct band){expected[i].ohms, expected[i].low, expected[i].high};
    free(expected);
    return status;
}
