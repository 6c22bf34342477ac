/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "job/job_progress.h"

#include "base/error.h"

#include <stdlib.h>

enum rf_status job_add_reading(struct rf_job *job, const struct reading *reading,
                               struct rf_error *error)
{
    if (job->n_readings >= JOB_MAX_READINGS)
        return fail(error, RF_LIMIT, "%s: more than %d readings", job->source, JOB_MAX_READINGS);
    struct reading *readings = realloc(job->readings, (job->n_readings + 1) * sizeof *readings);
    if (readings == NULL)
        return fail_memory(error);
    readings[job->n_readings] = *reading;
    job->readings = readings;
    job->n_readings++;
    job->setup_in_place = reading->setup;
    return RF_OK;
}

void job_mark_opened(struct rf_job *job, size_t place)
{
    if (place == job->n_places)
        job->board_opened = true;
    else
        job->places[place].opened = true;
}

void job_mark_checked(struct rf_job *job, size_t place)
{
    job->places[place].checked = true;
}
