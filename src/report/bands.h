/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef REPORT_BANDS_H
#define REPORT_BANDS_H

#include "diagnosis/diagnosis.h"

/* What a meter would show somewhere: Ω, NAN over range; and 2 σ to either side. */
struct band {
    double ohms, low, high;
};

/* As the likeliest explanation has it at n measurements, with the instrument's noise and what the
 * readings leave open of the fit, σ² + J Σ Jᵀ. All NAN where nothing was ranked. RF_NUMERICAL,
 * RF_MEMORY. */
enum rf_status fitted_bands(const struct rf_diagnosis *diagnosis,
                            const struct measurement measurements[], size_t n, struct band bands[],
                            struct rf_error *error);

/* As a ring wired as recorded has it, by its record. RF_REFUSED, RF_NUMERICAL, RF_MEMORY. */
enum rf_status sound_bands(const struct rf_diagnosis *diagnosis,
                           const struct measurement measurements[], size_t n, struct band bands[],
                           struct rf_error *error);

#endif
