/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef FIT_LIKELIHOOD_H
#define FIT_LIKELIHOOD_H

/*
 * How probable a reading is when the meter ought to show `mean`: normal with the instrument's
 * noise, or now and then a misread, or over range though it should not be.
 */

#include "job/job.h"
#include "models/models.h"

#include <stdbool.h>
#include <stddef.h>

/* What of a reading's likelihood does not depend on the mean. */
struct observation {
    size_t measurement; /* index into the list of what is measured */
    bool open;
    double ohms;        /* Ω, as read */
    double sigma;       /* Ω, the noise at that reading */
    double log_peak;    /* log of 0.999 · 0.99 · the normal's peak */
    double misread;     /* 0.999 · 0.01 · U(y) */
    double log_misread; /* its log */
    double log_no_path; /* the log-likelihood where there is no path */
    double log_best;    /* where there is one: what it cannot exceed, whatever the mean */
};

/* σ(y), Ω: floor, share of the reading, and the display's step. */
double instrument_sigma(const struct instrument_model *instrument, double ohms);

/* The same of a reading: with what the faces it goes through scatter, where the models are widened
 * to that. It is one of so many `repeats`, which all go through the same faces: what those scatter
 * is not to average out over them, so each gets so many times its variance. */
double reading_sigma(const struct rf_models *models, size_t setup, enum spot spot, double repeats,
                     double ohms);

/* U(y), 1/Ω: the density of misreads. */
double instrument_misread_density(const struct instrument_model *instrument, double ohms);

/* `repeats`: how many readings there are of the measurement. */
struct observation observe(const struct reading *reading, size_t measurement, size_t repeats,
                           const struct rf_models *models);

/* Log-likelihood of a reading over range where a path exists. */
double log_open_with_path(const struct instrument_model *instrument);

/* Log-likelihood of a finite reading with a path. `weight` (may be NULL) gets the chance that it is
 * not a misread; `z` (may be NULL) its distance from the mean in σ. */
double log_mixture(const struct observation *observation, double mean, double *weight, double *z);

/* The same for sums over readings: answers the larger of the mixture's two logs, and multiplies
 * `product` by what the sum of the two is to the larger, 1 to 2; one log of the product, of at most
 * MIXTURE_PRODUCTS readings, then serves for all of them. */
enum { MIXTURE_PRODUCTS = 1000 };
double log_mixture_term(const struct observation *observation, double mean, double *weight,
                        double *z, double *product);

#endif
