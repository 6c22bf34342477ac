/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Any bytes as a file of jobs: the reader comes to its end, each job good or refused, and never
 * more of them than lines. */
#define _DEFAULT_SOURCE
#include "fuzz.h"
#include "scratch_file.h"

#include "job/job.h"

#include <string.h>

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size)
{
    struct rf_job_reader *reader = NULL;
    struct rf_error error = {0};
    char path[128];
    size_t lines = 1, seen = 0;
    for (size_t i = 0; i < size; i++)
        lines += data[i] == '\n';
    scratch_write("stream", data, size, path);
    MUST(rf_job_reader_open(path, &reader, &error) == RF_OK, "%s", error.text);
    for (bool more = true; more; seen++) {
        struct rf_job *job = NULL;
        enum rf_status status = rf_job_reader_next(reader, &job, &error);
        MUST(status == RF_OK || rf_status_class(status) == RF_CLASS_INPUT, "%s", error.text);
        MUST(status == RF_OK || (job == NULL && strstr(error.text, path) == error.text), "%s",
             error.text);
        more = status != RF_OK || job != NULL;
        rf_job_destroy(job);
        MUST(seen <= lines, "%zu of %zu lines", seen, lines);
    }
    MUST(job_reader_bytes(reader) == size, "%llu of %zu", (unsigned long long)job_reader_bytes(reader),
         size);
    rf_job_reader_close(reader);
    return 0;
}
