/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Any bytes as a long table: the reader comes to its end, each job good or its rows handed back. */
#define _DEFAULT_SOURCE
#include "fuzz.h"

#include "job/job.h"
#include "job/long_table.h"

static void complain(void *context, const struct rf_error *error)
{
    ++*(size_t *)context;
    MUST(rf_status_class(error->status) == RF_CLASS_INPUT, "%s", error->text);
}

static bool reject(void *context, const char *row, size_t length)
{
    (void)context;
    MUST(row != NULL || length == 0, "%zu", length);
    return true;
}

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size)
{
    struct long_reader *reader = NULL;
    struct rf_error error = {0};
    size_t complaints = 0, jobs = 0;
    const struct long_options options = {.context = &complaints, .complain = complain,
                                         .reject = reject};
    static const uint8_t none[1];
    FILE *file = fmemopen((void *)(uintptr_t)(size > 0 ? data : none), size > 0 ? size : 1, "rb");
    if (file == NULL)
        return 0;
    enum rf_status status = long_reader_open(file, "fuzz", &options, &reader, &error);
    struct rf_job *job = NULL;
    while (status == RF_OK) {
        status = long_reader_next(reader, &job, &error);
        if (job == NULL)
            break;
        MUST(rf_job_readings(job) > 0 && rf_job_points(job) > 0, "an empty job");
        rf_job_destroy(job);
        MUST(++jobs <= size, "%zu jobs", jobs);
    }
    MUST(status == RF_OK || rf_status_class(status) == RF_CLASS_INPUT, "%s", error.text);
    long_reader_close(reader);
    fclose(file);
    return 0;
}
