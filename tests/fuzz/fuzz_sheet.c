/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Any bytes as a sheet: refused, or a job that a sheet written from it gives again. */

#include "job/job_edit.h"
#include "job/job.h"
#include "job/sheet.h"

#include <cjson/cJSON.h>
#include <stdint.h>
#include <stdlib.h>

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size);

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size)
{
    struct rf_job *job = NULL, *again = NULL;
    struct rf_error error;
    struct text bytes = {0}, sheet = {0};
    const struct sheet_style style = {size % 2 ? ';' : ',', size % 3 ? '.' : ','};
    text_append(&bytes, (const char *)data, size);
    if (!bytes.failed && job_bytes_are_sheet(&bytes) &&
        job_read_bytes(&bytes, "fuzz", 0, &job, &error) == RF_OK &&
        sheet_write(job->document, &style, NULL, 0, &sheet, &error) == RF_OK) {
        if (job_read_bytes(&sheet, "again", 0, &again, &error) != RF_OK ||
            !cJSON_Compare(job->document, again->document, 1))
            abort();
    }
    rf_job_destroy(job);
    rf_job_destroy(again);
    text_finish(&bytes);
    text_finish(&sheet);
    return 0;
}
