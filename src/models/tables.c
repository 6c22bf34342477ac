/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "models/models.h"

#include <math.h>
#include <string.h>

enum { REFERENCE_TEMPERATURE = 20 }; /* °C, of resistances in tables (IEC 60228) */

double models_ohm_per_m(const struct rf_models *models, double mm2, double temperature_c)
{
    for (size_t i = 0; i < models->n_sizes; i++) {
        const struct conductor_row *row = &models->sizes[i];
        if (fabs(row->mm2 - mm2) <= 1e-9 * row->mm2)
            return row->ohm_per_m *
                   (1 + models->temperature_coefficient * (temperature_c - REFERENCE_TEMPERATURE));
    }
    return NAN;
}

const struct family_prior *models_family(const struct rf_models *models, const char *name)
{
    for (size_t i = 0; i < models->n_families; i++) {
        if (strcmp(models->families[i].name, name) == 0)
            return &models->families[i];
    }
    return NULL;
}

double family_share(const struct family_prior *row, const char *name)
{
    for (size_t i = 0; i < row->n_shares; i++) {
        if (strcmp(row->shares[i].name, name) == 0)
            return row->shares[i].share;
    }
    return 0;
}
