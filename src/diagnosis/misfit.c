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

/* The upper tail; 1 without degrees of freedom. */
static double chi_square_p(double square, size_t degrees)
{
    return degrees == 0 ? 1.0 : gsl_cdf_chisq_Q(square, (double)degrees);
}

/* Readings of one measurement that are not written off: Σ 1/σ², Σ z/σ, Σ z². */
struct repeats {
    size_t n;
    double weight, pull, square;
};

struct spread {
    double of_means, of_repeats; /* χ² */
    size_t n_means, n_repeats;   /* degrees of freedom */
};

static struct spread add_up_spread(const struct repeats repeats[], size_t n)
{
    struct spread spread = {0};
    for (size_t i = 0; i < n; i++) {
        if (repeats[i].n == 0)
            continue;
        double of_mean = repeats[i].pull * repeats[i].pull / repeats[i].weight;
        spread.of_means += of_mean;
        spread.n_means++;
        if (repeats[i].n > 1)
            spread.of_repeats += fmax(0.0, repeats[i].square - of_mean);
        spread.n_repeats += repeats[i].n - 1;
    }
    return spread;
}

static double p_of_rest(const struct spread *spread, double penalty)
{
    double p_means = chi_square_p(spread->of_means + penalty, spread->n_means);
    double p_repeats = chi_square_p(spread->of_repeats, spread->n_repeats);
    return spread->n_repeats == 0 ? p_means : fmin(1.0, 2.0 * fmin(p_means, p_repeats));
}

static double misfit_p(const struct rf_diagnosis *diagnosis, size_t n, double p_rest)
{
    const struct instrument_model *in = &diagnosis->models->instrument;
    double rate = in->open_wrong + (1.0 - in->open_wrong) * in->misread;
    size_t k = diagnosis->misfit.written_off;
    double p_written_off = k == 0 ? 1.0 : gsl_cdf_binomial_Q((unsigned)(k - 1), rate, (unsigned)n);
    return fmin(1.0, 2.0 * fmin(p_written_off, p_rest));
}

enum rf_status test_misfit(struct rf_diagnosis *diagnosis, struct fitter *fitter,
                           struct rf_error *error)
{
    const struct observation *observations = NULL;
    size_t n = fitter_observations(fitter, &observations);
    size_t n_measurements = forward_measurements(fitter_forward(fitter));
    const struct ranked *best = &diagnosis->ranked[0];
    struct repeats *repeats = NEW_ARRAY(struct repeats, n_measurements);
    diagnosis->suspects = NEW_ARRAY(struct suspect, n);
    if (diagnosis->suspects == NULL || repeats == NULL) {
        free(repeats);
        return fail_memory(error);
    }
    double penalty = 0.0;
    for (size_t j = 0; j < best->n_parameters; j++)
        penalty += best->theta[j] * best->theta[j];
    for (size_t i = 0; i < n; i++) {
        const struct observation *o = &observations[i];
        double weight = 1.0, z = 0.0;
        if (!o->open && !isnan(best->fitted[i]))
            log_mixture(o, best->fitted[i], &weight, &z);
        if (written_off(o, best->fitted[i], weight)) {
            diagnosis->suspects[diagnosis->n_suspects++].reading = i;
        } else if (!o->open) {
            struct repeats *r = &repeats[o->measurement];
            r->n++;
            r->weight += 1.0 / (o->sigma * o->sigma);
            r->pull += z / o->sigma;
            r->square += z * z;
        }
    }
    struct spread spread = add_up_spread(repeats, n_measurements);
    free(repeats);
    diagnosis->misfit.written_off = diagnosis->n_suspects;
    diagnosis->misfit.chi_square = spread.of_means + spread.of_repeats + penalty;
    diagnosis->misfit.degrees = spread.n_means + spread.n_repeats;
    diagnosis->misfit.p = misfit_p(diagnosis, n, p_of_rest(&spread, penalty));
    diagnosis->misfit.flag = diagnosis->misfit.p < 0.05;
    return RF_OK;
}
