/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef TESTS_SHIPPED_MODELS_H
#define TESTS_SHIPPED_MODELS_H

/* The models compiled in, as a fixture. */

#include <ringfettle/models.h>

#include <check.h>
#include <gsl/gsl_errno.h>

static struct rf_models *models;

static inline void load_models(void)
{
    struct rf_error error;
    gsl_set_error_handler_off();
    ck_assert_msg(rf_models_load(NULL, RF_RATES_CONSULTED, &models, &error) == RF_OK, "%s",
                  error.text);
}

static inline void unload_models(void)
{
    rf_models_destroy(models);
}

#endif
