/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/error.h"
#include "base/memory.h"
#include "diagnosis/steps.h"

#include <gsl/gsl_cdf.h>
#include <math.h>

/*
 * Does the best hypothesis explain the readings at all? Two parts, each with half of the 5 %
 * (Bonferroni):
 *
 *   written off   readings the fit takes for misreads, or for wrongly over range. Under the model
 *                 their number is binomial, with the instrument's own rates.
 *   the rest      Σ z² + |θ̂|² over the m readings not written off: in a linear model with normal
 *                 noise and priors that is y's distance from its prior mean in its own covariance,
 *                 and χ² with m degrees of freedom.
 *
 * The best of some hundreds was picked because it fits, so true false alarms are rarer than 5 %;
 * tests/bench counts them.
 */

static bool written_off(const struct observation *o, double fitted, double weight)
{
    return o->open ? !isnan(fitted) : isnan(fitted) || weight < 0.5;
}

static double misfit_p(const struct rf_diagnosis *diagnosis, size_t n)
{
    const struct instrument_model *in = &diagnosis->models->instrument;
    double rate = in->open_wrong + (1.0 - in->open_wrong) * in->misread;
    size_t k = diagnosis->misfit.written_off;
    double p_written_off =
        k == 0 ? 1.0 : gsl_cdf_binomial_Q((unsigned)(k - 1), rate, (unsigned)n);
    double p_rest = diagnosis->misfit.degrees == 0
                        ? 1.0
                        : gsl_cdf_chisq_Q(diagnosis->misfit.chi_square,
                                          (double)diagnosis->misfit.degrees);
    return fmin(1.0, 2.0 * fmin(p_written_off, p_rest));
}

enum rf_status test_misfit(struct rf_diagnosis *diagnosis, struct fitter *fitter,
                           struct rf_error *error)
{
    const struct observation *observations = NULL;
    size_t n = fitter_observations(fitter, &observations);
    const struct ranked *best = &diagnosis->ranked[0];
    diagnosis->suspects = NEW_ARRAY(struct suspect, n);
    if (diagnosis->suspects == NULL)
        return fail_memory(error);
    double square = 0.0;
    for (size_t j = 0; j < best->n_parameters; j++)
        square += best->theta[j] * best->theta[j];
    size_t degrees = 0;
    for (size_t i = 0; i < n; i++) {
        const struct observation *o = &observations[i];
        double weight = 1.0, z = 0.0;
        if (!o->open && !isnan(best->fitted[i]))
            log_mixture(o, best->fitted[i], &weight, &z);
        if (written_off(o, best->fitted[i], weight)) {
            diagnosis->suspects[diagnosis->n_suspects++].reading = i;
        } else if (!o->open) {
            square += z * z;
            degrees++;
        }
    }
    diagnosis->misfit.written_off = diagnosis->n_suspects;
    diagnosis->misfit.chi_square = square;
    diagnosis->misfit.degrees = degrees;
    diagnosis->misfit.p = misfit_p(diagnosis, n);
    diagnosis->misfit.flag = diagnosis->misfit.p < 0.05;
    return RF_OK;
}
