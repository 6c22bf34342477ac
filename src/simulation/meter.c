/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "simulation/simulation.h"

#include <gsl/gsl_randist.h>
#include <math.h>

/* FNV-1a (G. Fowler, L. C. Noll, K.-P. Vo, 1991; RFC 9923), folded to the 32 bits MT19937 takes. */
void generator_seed(gsl_rng *generator, uint32_t seed, const char *name)
{
    uint64_t hash = UINT64_C(14695981039346656037);
    for (int shift = 0; shift < 32; shift += 8)
        hash = (hash ^ ((seed >> shift) & 0xffu)) * UINT64_C(1099511628211);
    for (const char *byte = name; *byte != '\0'; byte++)
        hash = (hash ^ (unsigned char)*byte) * UINT64_C(1099511628211);
    gsl_rng_set(generator, (unsigned long)((hash >> 32) ^ (hash & UINT32_MAX)));
}

double draw_misread(const struct instrument_model *in, gsl_rng *generator)
{
    double c = log(in->over_range / in->misread_floor);
    double below = gsl_rng_uniform(generator) * (1.0 + c);
    double u = gsl_rng_uniform(generator);
    return below < 1.0 ? in->misread_floor * u : in->misread_floor * exp(c * u);
}

/* Negatives as 0; more than the range as over range. */
static struct shown display(const struct instrument_model *in, double ohms)
{
    double steps = floor(ohms / in->step + 0.5);
    double value = fmax(0.0, steps * in->step);
    if (value > in->over_range + 1e-6 * in->step)
        return (struct shown){.open = true};
    return (struct shown){.ohms = value};
}

struct shown draw_shown(const struct instrument_model *in, bool reachable, double mean,
                        bool heavy_tails, gsl_rng *generator)
{
    bool wrong = gsl_rng_uniform(generator) < in->open_wrong;
    bool misread = gsl_rng_uniform(generator) < in->misread;
    if (reachable == wrong) /* over range, rightly or not */
        return (struct shown){.open = true};
    if (!reachable)
        return display(in, draw_misread(in, generator));
    if (misread)
        return display(in, draw_misread(in, generator));
    double sigma = hypot(in->noise_floor, in->noise_relative * mean);
    if (heavy_tails) /* the variance of t with ν degrees is ν/(ν − 2) */
        return display(in, mean + sigma * gsl_ran_tdist(generator, 4.0) / sqrt(2.0));
    return display(in, mean + gsl_ran_gaussian_ziggurat(generator, sigma));
}
