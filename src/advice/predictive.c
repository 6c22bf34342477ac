/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "advice/predictive.h"

#include "base/cholesky.h"
#include "base/error.h"
#include "base/memory.h"

#include <math.h>
#include <string.h>

static bool with_lead(size_t setup)
{
    return setups[setup].joining == JOIN_LEAD_OUT || setups[setup].joining == JOIN_LEAD_IN;
}

bool lead_is_out(const struct rf_job *job)
{
    for (size_t i = 0; i < job->n_readings; i++)
        if (with_lead(job->readings[i].setup))
            return true;
    return false;
}

double minutes_of_reading(const struct effort_model *effort, const struct measurement *measurement,
                          bool lead_out)
{
    if (with_lead(measurement->setup))
        return lead_out ? effort->wander_next : effort->wander_first;
    return measurement->spot == SPOT_POINT ? effort->reading_at_point : effort->reading_at_board;
}

void predictive_finish(struct predictive *p)
{
    free(p->candidates);
    free(p->minutes);
    free(p->mean);
    free(p->sigma);
    *p = (struct predictive){0};
}

static bool has_been_read(const struct rf_job *job, const struct measurement *m)
{
    for (size_t i = 0; i < job->n_readings; i++) {
        const struct reading *r = &job->readings[i];
        if (r->setup == m->setup && r->spot == m->spot && r->place == m->place)
            return true;
    }
    return false;
}

static void add_candidate(struct predictive *p, const struct rf_diagnosis *diagnosis,
                          struct measurement m, bool lead_out)
{
    if (has_been_read(diagnosis->job, &m))
        return;
    p->minutes[p->n] = minutes_of_reading(&diagnosis->models->effort, &m, lead_out);
    p->candidates[p->n++] = m;
}

static void list_candidates(struct predictive *p, const struct rf_diagnosis *diagnosis)
{
    const struct rf_job *job = diagnosis->job;
    bool lead_out = lead_is_out(job);
    for (size_t setup = 0; setup < N_SETUPS; setup++) {
        for (enum spot spot = SPOT_BOARD; spot < N_SPOTS; spot++)
            if (spot != SPOT_HIGHEST && (setups[setup].spots & (1u << spot)) != 0)
                add_candidate(p, diagnosis, (struct measurement){setup, spot, 0}, lead_out);
        for (size_t place = 0; place < job->n_places; place++)
            if ((setups[setup].spots & (1u << SPOT_POINT)) != 0 && place_has_front(job, place))
                add_candidate(p, diagnosis, (struct measurement){setup, SPOT_POINT, place},
                              lead_out);
    }
}

/* Σ (U⁻ᵀ J)²: the variance the fit leaves in a mean, Ω². */
static double fit_variance(const struct ranked *ranked, const double gradient[], double scratch[])
{
    size_t d = ranked->n_parameters;
    double sum = 0.0;
    memcpy(scratch, gradient, d * sizeof *scratch);
    cholesky_half_solve(ranked->factor, d, d, scratch);
    for (size_t j = 0; j < d; j++)
        sum += scratch[j] * scratch[j];
    return sum;
}

static enum rf_status predict_under(struct predictive *p, size_t h,
                                    const struct rf_diagnosis *diagnosis, struct forward *forward,
                                    struct wiring *wiring, double scratch[])
{
    const struct ranked *ranked = &diagnosis->ranked[h];
    wiring_copy(wiring, &diagnosis->ring);
    hypothesis_apply(&ranked->hypothesis, wiring, NULL);
    enum rf_status status = forward_analyse(forward, wiring);
    if (status == RF_OK)
        status = forward_evaluate(forward, ranked->theta);
    for (size_t i = 0; i < p->n && status == RF_OK; i++) {
        double *mean = &p->mean[h * p->n + i], *sigma = &p->sigma[h * p->n + i];
        *mean = NAN;
        if (!forward_reachable(forward, i))
            continue;
        *mean = forward_mean(forward, i);
        double noise = reading_sigma(diagnosis->models, p->candidates[i].setup,
                                     p->candidates[i].spot, 1.0, fmax(*mean, 0.0));
        *sigma = sqrt(noise * noise + fit_variance(ranked, forward_gradient(forward, i), scratch));
    }
    return status;
}

enum rf_status predictive_init(struct predictive *p, const struct rf_diagnosis *diagnosis,
                               size_t n_hypotheses, struct rf_error *error)
{
    size_t most = N_SETUPS * (diagnosis->job->n_places + N_SPOTS);
    *p = (struct predictive){.n_hypotheses = n_hypotheses};
    struct wiring wiring = {0};
    struct forward *forward = NULL;
    double *scratch = NEW_ARRAY(double, diagnosis->ring.map.n_common + FAULTS_AT_ONCE);
    p->candidates = NEW_ARRAY(struct measurement, most);
    p->minutes = NEW_ARRAY(double, most);
    enum rf_status status = RF_OK;
    if (scratch == NULL || p->candidates == NULL || p->minutes == NULL)
        status = fail_memory(error);
    if (status == RF_OK) {
        list_candidates(p, diagnosis);
        p->mean = NEW_ARRAY(double, n_hypotheses *p->n);
        p->sigma = NEW_ARRAY(double, n_hypotheses *p->n);
        forward = forward_create(&diagnosis->ring, p->candidates, p->n);
        status = p->mean == NULL || p->sigma == NULL || forward == NULL
                     ? fail_memory(error)
                     : wiring_init(&wiring, diagnosis->job, diagnosis->models, error);
    }
    for (size_t h = 0; h < n_hypotheses && status == RF_OK; h++) {
        status = predict_under(p, h, diagnosis, forward, &wiring, scratch);
        if (status != RF_OK)
            fail(error, status, "%s: readings to come cannot be predicted for: %s",
                 diagnosis->job->source, diagnosis->ranked[h].words);
    }
    wiring_finish(&wiring);
    forward_destroy(forward);
    free(scratch);
    if (status != RF_OK)
        predictive_finish(p);
    return status;
}
