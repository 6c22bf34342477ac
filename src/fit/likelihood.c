/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "fit/likelihood.h"

#include <gsl/gsl_math.h>
#include <math.h>

double instrument_sigma(const struct instrument_model *in, double ohms)
{
    double relative = in->noise_relative * ohms;
    return sqrt(in->noise_floor * in->noise_floor + relative * relative +
                in->step * in->step / 12.0);
}

double reading_sigma(const struct rf_models *models, size_t setup, enum spot spot, double repeats,
                     double ohms)
{
    double sigma = instrument_sigma(&models->instrument, ohms), face = models->wider.face_ohms;
    if (!(face > 0.0) || (spot != SPOT_POINT && spot != SPOT_HIGHEST))
        return sigma;
    double faces = setup_is_pair(&setups[setup]) ? 2.0 : 1.0;
    return sqrt(sigma * sigma + repeats * faces * face * face);
}

double instrument_misread_density(const struct instrument_model *in, double ohms)
{
    return 1.0 / (fmax(ohms, in->misread_floor) * log(in->over_range / in->misread_floor));
}

struct observation observe(const struct reading *reading, size_t measurement, size_t repeats,
                           const struct rf_models *models)
{
    const struct instrument_model *in = &models->instrument;
    struct observation o = {.measurement = measurement, .open = reading->open};
    if (reading->open) {
        o.log_no_path = log(1.0 - in->open_wrong);
        o.log_best = log_open_with_path(in);
        return o;
    }
    double density = instrument_misread_density(in, reading->ohms);
    o.ohms = reading->ohms;
    o.sigma = reading_sigma(models, reading->setup, reading->spot, (double)repeats, reading->ohms);
    o.log_peak = log((1.0 - in->open_wrong) * (1.0 - in->misread) / (o.sigma * sqrt(2.0 * M_PI)));
    o.misread = (1.0 - in->open_wrong) * in->misread * density;
    o.log_misread = log(o.misread);
    o.log_no_path = log(in->open_wrong * density);
    o.log_best = log_mixture(&o, o.ohms, NULL, NULL);
    return o;
}

double log_open_with_path(const struct instrument_model *in)
{
    return log(in->open_wrong);
}

double log_mixture_term(const struct observation *o, double mean, double *weight, double *z,
                        double *product)
{
    double distance = (o->ohms - mean) / o->sigma;
    double log_normal = o->log_peak - 0.5 * distance * distance;
    /* log(e^a + e^b) without overflow: take the larger out. */
    double odds = exp(-fabs(log_normal - o->log_misread));
    bool normal = log_normal > o->log_misread;
    *weight = (normal ? 1.0 : odds) / (1.0 + odds);
    *z = distance;
    *product *= 1.0 + odds;
    return normal ? log_normal : o->log_misread;
}

double log_mixture(const struct observation *o, double mean, double *weight, double *z)
{
    double w = 1.0, distance = 0.0, product = 1.0;
    double larger = log_mixture_term(o, mean, &w, &distance, &product);
    if (weight != NULL)
        *weight = w;
    if (z != NULL)
        *z = distance;
    return larger + log(product);
}
