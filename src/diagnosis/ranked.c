/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/error.h"
#include "base/memory.h"
#include "diagnosis/steps.h"

#include <gsl/gsl_cdf.h>
#include <math.h>
#include <string.h>

/* What is kept of the hypotheses that carry weight: their fits, for the report and the plan. */

const double confidence_shown = 0.001;

void hypothesis_words(const struct hypothesis *hypothesis, const struct rf_job *job,
                      struct text *out)
{
    if (hypothesis->n_faults == 0)
        fault_family_none.describe(NULL, job, out);
    for (size_t i = 0; i < hypothesis->n_faults; i++) {
        const struct fault *fault = &hypothesis->faults[i];
        if (i > 0)
            text_add(out, ", and ");
        fault->family->describe(fault, job, out);
    }
}

/* The log-normal's median at θ̂, and its 5th and 95th percentile under the fit. */
static struct estimate estimate_parameter(const struct fault *fault, const struct fit *fit,
                                          const struct rf_models *models, int parameter,
                                          double scratch[])
{
    if (parameter == NO_PARAMETER)
        return (struct estimate){0};
    struct lognormal prior = models_family(models, fault->family->name)->parameter;
    double theta = fit->theta[parameter];
    double reach = gsl_cdf_ugaussian_Pinv(0.95) * fit_parameter_sigma(fit, (size_t)parameter, scratch);
    return (struct estimate){
        .known = true,
        .metres = fault->family->metres,
        .value = prior.median * exp(prior.sigma * theta),
        .low = prior.median * exp(prior.sigma * (theta - reach)),
        .high = prior.median * exp(prior.sigma * (theta + reach)),
    };
}

static bool keep_fit(struct ranked *ranked, const struct fit *fit, const struct fitter *fitter)
{
    const struct observation *observations = NULL;
    size_t n = fitter_observations(fitter, &observations), d = fit->n_parameters;
    const struct forward *forward = fitter_forward(fitter);
    ranked->n_parameters = d;
    ranked->theta = NEW_ARRAY(double, d);
    ranked->factor = NEW_ARRAY(double, d *d);
    ranked->fitted = NEW_ARRAY(double, n);
    if (ranked->theta == NULL || ranked->factor == NULL || ranked->fitted == NULL)
        return false;
    memcpy(ranked->theta, fit->theta, d * sizeof *fit->theta);
    for (size_t j = 0; j < d; j++)
        memcpy(ranked->factor + j * d + j, fit->factor + j * fit->stride + j,
               (d - j) * sizeof(double));
    for (size_t i = 0; i < n; i++) {
        size_t m = observations[i].measurement;
        ranked->fitted[i] = forward_reachable(forward, m) ? forward_mean(forward, m) : NAN;
    }
    return true;
}

static enum rf_status keep_one(struct rf_diagnosis *diagnosis, const struct candidate *candidate,
                               struct fitter *fitter, struct wiring *wiring, double scratch[],
                               struct rf_error *error)
{
    struct ranked *ranked = &diagnosis->ranked[diagnosis->n_ranked++];
    struct text words = {0};
    struct fit fit;
    int parameter_of[FAULTS_AT_ONCE];
    ranked->hypothesis = candidate->hypothesis;
    ranked->confidence = candidate->confidence;
    ranked->log_prior = candidate->log_prior;
    ranked->log_evidence = candidate->log_evidence;
    hypothesis_words(&candidate->hypothesis, diagnosis->job, &words);
    ranked->words = words.bytes;
    if (words.failed || words.bytes == NULL)
        return fail_memory(error);
    wiring_copy(wiring, &diagnosis->ring);
    hypothesis_apply(&candidate->hypothesis, wiring, parameter_of);
    enum rf_status status = fitter_fit(fitter, wiring, NULL, &fit);
    if (status != RF_OK)
        return fail(error, status, "%s: the fit failed for: %s", diagnosis->job->source,
                    ranked->words);
    for (size_t i = 0; i < candidate->hypothesis.n_faults; i++)
        ranked->estimates[i] =
            estimate_parameter(&candidate->hypothesis.faults[i], &fit, diagnosis->models,
                               parameter_of[i], scratch);
    return keep_fit(ranked, &fit, fitter) ? RF_OK : fail_memory(error);
}

enum rf_status keep_ranked(struct rf_diagnosis *diagnosis, const struct candidates *candidates,
                           struct fitter *fitter, struct rf_error *error)
{
    size_t n = 0;
    while (n < candidates->n && (n == 0 || candidates->list[n].confidence >= confidence_shown))
        n++;
    struct wiring wiring = {0};
    double *scratch = NEW_ARRAY(double, diagnosis->ring.map.n_common + FAULTS_AT_ONCE);
    diagnosis->ranked = NEW_ARRAY(struct ranked, n);
    enum rf_status status =
        diagnosis->ranked == NULL || scratch == NULL
            ? fail_memory(error)
            : wiring_init(&wiring, diagnosis->job, diagnosis->models, error);
    for (size_t i = 0; i < n && status == RF_OK; i++)
        status = keep_one(diagnosis, &candidates->list[i], fitter, &wiring, scratch, error);
    wiring_finish(&wiring);
    free(scratch);
    return status;
}
