/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "fit/expected.h"

#include "base/cholesky.h"
#include "base/error.h"
#include "base/memory.h"
#include "fit/fit.h"

#include <math.h>
#include <string.h>

/* Where the ring's parameters stand: θ, and the Cholesky factor of their precision (NULL: the
 * prior's, the identity). */
struct state {
    size_t d;
    double *theta;   /* d */
    double *factor;  /* d × d, or NULL */
    double *scratch; /* d */
};

static bool is_end_to_end(const struct reading *reading)
{
    return setups[reading->setup].joining == JOIN_NOTHING_END_TO_END;
}

bool has_end_to_end(const struct rf_job *job)
{
    for (size_t i = 0; i < job->n_readings; i++)
        if (is_end_to_end(&job->readings[i]) && !job->readings[i].open)
            return true;
    return false;
}

static void finish_state(struct state *state)
{
    free(state->theta);
    free(state->factor);
    free(state->scratch);
}

static enum rf_status init_state(struct state *state, size_t d, bool factor, struct rf_error *error)
{
    state->d = d;
    state->theta = NEW_ARRAY(double, d);
    state->scratch = NEW_ARRAY(double, d);
    state->factor = factor ? NEW_ARRAY(double, d *d) : NULL;
    if (state->theta == NULL || state->scratch == NULL || (factor && state->factor == NULL))
        return fail_memory(error);
    return RF_OK;
}

/* --- the record, narrowed by the end-to-end readings --- */

static void note_left_out(const struct rf_job *ends, const struct fit *fit,
                          bool left_out[N_CONDUCTORS])
{
    for (size_t i = 0; i < ends->n_readings; i++)
        if (fit->weights[i] < 0.5)
            left_out[ends->readings[i].spot - SPOT_L] = true;
}

/* `ends`: the job with the readings that narrow its record, and no others. */
static enum rf_status fit_readings(const struct rf_job *ends, const struct rf_models *models,
                               struct state *state, bool left_out[N_CONDUCTORS],
                               struct rf_error *error)
{
    struct wiring ring = {0};
    struct fitter *fitter = NULL;
    struct fit fit;
    enum rf_status status = wiring_init(&ring, ends, models, error);
    if (status == RF_OK && (fitter = fitter_create(&ring)) == NULL)
        status = fail_memory(error);
    if (status == RF_OK && fitter_fit(fitter, &ring, NULL, &fit) != RF_OK)
        status = fail(error, RF_NUMERICAL, "%s: the readings could not be fitted",
                      ends->source);
    if (status == RF_OK) {
        memcpy(state->theta, fit.theta, state->d * sizeof *state->theta);
        for (size_t j = 0; j < state->d; j++)
            memcpy(state->factor + j * state->d, fit.factor + j * fit.stride,
                   state->d * sizeof *state->factor);
        if (left_out != NULL)
            note_left_out(ends, &fit, left_out);
    }
    fitter_destroy(fitter);
    wiring_finish(&ring);
    return status;
}

static enum rf_status narrow_by_ends(const struct rf_job *job, const struct rf_models *models,
                                     struct state *state, bool left_out[N_CONDUCTORS],
                                     struct rf_error *error)
{
    struct rf_job ends = *job; /* borrows everything but the readings */
    ends.readings = NEW_ARRAY(struct reading, job->n_readings);
    ends.n_readings = 0;
    if (ends.readings == NULL)
        return fail_memory(error);
    for (size_t i = 0; i < job->n_readings; i++)
        if (is_end_to_end(&job->readings[i]) && !job->readings[i].open)
            ends.readings[ends.n_readings++] = job->readings[i];
    enum rf_status status = fit_readings(&ends, models, state, left_out, error);
    free(ends.readings);
    return status;
}

/* --- means and ranges --- */

/* σ of the mean, Ω: |U⁻ᵀ g| with g the gradient. */
static double mean_sigma(const struct state *state, const double gradient[])
{
    double square = 0;
    memcpy(state->scratch, gradient, state->d * sizeof *gradient);
    if (state->factor != NULL)
        cholesky_half_solve(state->factor, state->d, state->d, state->scratch);
    for (size_t j = 0; j < state->d; j++)
        square += state->scratch[j] * state->scratch[j];
    return sqrt(square);
}

/* The wiring's share of the range goes by the logarithm, as lengths do: a run of unknown length
 * has no negative resistance. */
/* `k`: how many σ the range reaches. */
static struct expected expect_mean(double mean, double sigma, double noise, double k)
{
    double factor = exp(k * sigma / fmax(mean, sigma));
    double below = mean - mean / factor, above = mean * factor - mean;
    return (struct expected){
        .ohms = fmax(mean, 0),
        .low = fmax(mean - hypot(below, k * noise), 0),
        .high = mean + hypot(above, k * noise),
    };
}

static enum rf_status read_expected(const struct wiring *ring, const struct state *state,
                                    const struct measurement measurements[], size_t n,
                                    double k, struct expected expected[],
                                    struct rf_error *error)
{
    struct forward *forward = forward_create(ring, measurements, n);
    if (forward == NULL)
        return fail_memory(error);
    enum rf_status status = forward_analyse(forward, ring);
    if (status == RF_OK)
        status = forward_evaluate(forward, state->theta);
    if (status != RF_OK)
        fail(error, status, "%s: the ring's readings could not be computed", ring->job->source);
    for (size_t i = 0; i < n && status == RF_OK; i++) {
        if (!forward_reachable(forward, i)) {
            expected[i] = (struct expected){.open = true};
            continue;
        }
        double mean = forward_mean(forward, i);
        double noise =
            reading_sigma(ring->models, measurements[i].setup, measurements[i].spot, 1.0, mean);
        expected[i] =
            expect_mean(mean, mean_sigma(state, forward_gradient(forward, i)), noise, k);
    }
    forward_destroy(forward);
    return status;
}

enum rf_status expect_readings(const struct rf_job *job, const struct rf_models *models,
                               bool given_ends, const struct measurement measurements[], size_t n,
                               struct expected expected[], bool left_out[N_CONDUCTORS],
                               struct rf_error *error)
{
    struct wiring ring = {0};
    struct state state = {0};
    given_ends = given_ends && has_end_to_end(job);
    for (size_t i = 0; left_out != NULL && i < N_CONDUCTORS; i++)
        left_out[i] = false;
    enum rf_status status = wiring_init(&ring, job, models, error);
    if (status == RF_OK)
        status = init_state(&state, (size_t)ring.n_parameters, given_ends, error);
    if (status == RF_OK && given_ends)
        status = narrow_by_ends(job, models, &state, left_out, error);
    if (status == RF_OK)
        status = read_expected(&ring, &state, measurements, n, 2, expected, error);
    finish_state(&state);
    wiring_finish(&ring);
    return status;
}

enum rf_status expect_next(const struct rf_job *job, const struct rf_models *models,
                           const struct measurement *measurement, struct expected *expected,
                           struct rf_error *error)
{
    struct wiring ring = {0};
    struct state state = {0};
    bool read = job->n_readings > 0;
    enum rf_status status = wiring_init(&ring, job, models, error);
    if (status == RF_OK)
        status = init_state(&state, (size_t)ring.n_parameters, read, error);
    if (status == RF_OK && read)
        status = fit_readings(job, models, &state, NULL, error);
    if (status == RF_OK)
        status = read_expected(&ring, &state, measurement, 1, 3, expected, error);
    finish_state(&state);
    wiring_finish(&ring);
    return status;
}
