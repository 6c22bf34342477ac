/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef RINGFETTLE_MODELS_H
#define RINGFETTLE_MODELS_H

#include <ringfettle/status.h>

#ifdef __cplusplus
extern "C" {
#endif

/* The tables every number comes from: conductors, instrument, fault priors, effort. Opaque,
 * read-only once made; threads may share one. */
struct rf_models;

/* How often what goes wrong: `consulted` for a job somebody looks at because something seems
 * wrong, `archive` for jobs that were filed, mostly without a defect, `certain` where it is known
 * that there is one, whatever the readings say. */
enum rf_base_rates { RF_RATES_CONSULTED, RF_RATES_ARCHIVE, RF_RATES_CERTAIN };

/*
 * The models compiled into the library (`directory` NULL), or those of a directory that holds
 * conductor.json, instrument.json, faults.json and effort.json. On RF_OK *models is the caller's,
 * to destroy. RF_SYNTAX, RF_REFUSED, RF_IO, RF_MEMORY.
 */
RF_API enum rf_status rf_models_load(const char *directory, enum rf_base_rates rates,
                                     struct rf_models **models, struct rf_error *error);

/* "shipped", or the directory. */
RF_API const char *rf_models_name(const struct rf_models *models);

RF_API void rf_models_destroy(struct rf_models *models); /* takes NULL */

#ifdef __cplusplus
}
#endif

#endif
