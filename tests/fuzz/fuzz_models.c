/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * Any bytes as one of the four models files, beside the other three as shipped: refused with a
 * message, or models under which a small job is diagnosed and planned with numbers for answers, or
 * refused as one that contradicts the models. Which file it is shows in its `kind`.
 */
#define _DEFAULT_SOURCE
#include "fuzz.h"
#include "scratch_file.h"

#include "advice/advice.h"
#include "models/shipped.h"

#include <gsl/gsl_errno.h>
#include <math.h>
#include <string.h>

static const char job_text[] =
    "{\"format\": \"ringfettle-job/1\", \"ring\": {\"points\": [{\"id\": \"P1\", \"run_m\": 5}, "
    "{\"id\": \"P2\"}], \"spurs\": [{\"id\": \"S1\", \"from\": \"P2\"}]}, \"readings\": "
    "{\"end_to_end\": {\"l\": 0.31, \"n\": 0.8, \"e\": 0.5}, \"cross_ln\": {\"board\": 0.2, "
    "\"P1\": 0.2, \"P2\": 0.35, \"S1\": \"open\"}}}";

static enum model_file file_of(const uint8_t *data, size_t size)
{
    static const char *const kinds[N_MODEL_FILES] = {
        [FILE_CONDUCTOR] = "\"conductor\"",
        [FILE_INSTRUMENT] = "\"instrument\"",
        [FILE_FAULTS] = "\"faults\"",
        [FILE_EFFORT] = "\"effort\"",
    };
    for (size_t at = 0; at < size && at < 200; at++)
        for (int i = 0; i < N_MODEL_FILES; i++)
            if (size - at >= strlen(kinds[i]) && memcmp(data + at, kinds[i], strlen(kinds[i])) == 0)
                return (enum model_file)i;
    return FILE_CONDUCTOR;
}

static void use(const struct rf_models *models)
{
    struct rf_job *job = NULL;
    struct rf_diagnosis *diagnosis = NULL;
    struct rf_advice *advice = NULL;
    struct rf_error error = {0};
    MUST(rf_job_parse(job_text, strlen(job_text), "job", &job, &error) == RF_OK, "%s", error.text);
    enum rf_status status = rf_diagnose(job, models, &diagnosis, &error);
    if (status == RF_OK) {
        for (size_t i = 0; i < diagnosis->n_ranked; i++)
            MUST(diagnosis->ranked[i].confidence >= 0 && diagnosis->ranked[i].confidence <= 1, "%g",
                 diagnosis->ranked[i].confidence);
        MUST(diagnosis->misfit.p >= 0 && diagnosis->misfit.p <= 1, "%g", diagnosis->misfit.p);
        status = rf_advise(diagnosis, &advice, &error);
    }
    MUST(status == RF_OK || status == RF_REFUSED || status == RF_NUMERICAL, "%d: %s", (int)status,
         error.text);
    MUST(status != RF_OK || isfinite(advice->look_now), "%g", advice->look_now);
    rf_advice_destroy(advice);
    rf_diagnosis_destroy(diagnosis);
    rf_job_destroy(job);
}

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size)
{
    struct rf_models *models = NULL;
    struct rf_error error = {0};
    enum model_file which = file_of(data, size);
    char path[128];
    gsl_set_error_handler_off();
    if (scratch_in == NULL)
        for (int i = 0; i < N_MODEL_FILES; i++)
            scratch_write(shipped_files[i].name, shipped_files[i].bytes, shipped_files[i].length,
                          path);
    scratch_write(shipped_files[which].name, data, size, path);
    enum rf_status status = rf_models_load(scratch_in, RF_RATES_CONSULTED, &models, &error);
    if (status == RF_OK)
        use(models);
    else
        MUST(models == NULL && rf_status_class(status) == RF_CLASS_INPUT && error.text[0] != '\0',
             "%d", (int)status);
    rf_models_destroy(models);
    scratch_write(shipped_files[which].name, shipped_files[which].bytes,
                  shipped_files[which].length, path);
    return 0;
}
