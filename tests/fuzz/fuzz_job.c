/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * Any bytes as a job: refused with a message, or a job that, written as JSON (indented, on a line)
 * and as a sheet, is read again as the same document.
 */

#include "fuzz.h"

#include "job/job.h"
#include "job/job_edit.h"
#include "job/job_write.h"
#include "job/sheet.h"

#include <cjson/cJSON.h>
#include <string.h>

/* A sheet keeps no empty list or object. */
static void expect_again(const struct rf_job *job, const struct text *written, const char *how)
{
    struct rf_job *again = NULL;
    struct rf_error error = {0};
    MUST(!written->failed, "%s", how);
    enum rf_status status = job_read_bytes(written, how, 0, &again, &error);
    MUST(status == RF_OK, "%s: %s\n%s", how, error.text, written->bytes);
    MUST(cJSON_Compare(job->document, again->document, 1), "%s\n%s", how, written->bytes);
    rf_job_destroy(again);
}

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size)
{
    struct rf_job *job = NULL;
    struct rf_error error = {0};
    struct text indented = {0}, line = {0};
    enum rf_status status = rf_job_parse((const char *)data, size, "fuzz", &job, &error);
    if (status != RF_OK) {
        MUST(job == NULL && rf_status_class(status) == RF_CLASS_INPUT, "%d", (int)status);
        MUST(strncmp(error.text, "fuzz", 4) == 0 && strchr(error.text, '\n') == NULL, "%s",
             error.text);
        return 0;
    }
    if (job_write(job, &indented, &error) == RF_OK)
        expect_again(job, &indented, "indented");
    if (job_write_line(job, &line, &error) == RF_OK)
        expect_again(job, &line, "line");
    MUST(strchr(line.bytes, '\n') == NULL, "%s", line.bytes);
    text_finish(&indented);
    text_finish(&line);
    rf_job_destroy(job);
    return 0;
}
