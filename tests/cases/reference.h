/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef TESTS_CASES_REFERENCE_H
#define TESTS_CASES_REFERENCE_H

/* The reference jobs (reference/README.md): a job a line, with what the reference says of it. */

#include "../project.h"

#include <ringfettle/job.h>

#include <check.h>
#include <cjson/cJSON.h>
#include <string.h>

static const char *const reference_files[] = {"standard.ndjson", "extra.ndjson", "nolength.ndjson"};
enum { N_REFERENCE_FILES = sizeof reference_files / sizeof *reference_files };

static inline FILE *reference_open(size_t file)
{
    char path[PATH_MOST];
    project_path(path, "tests/cases/reference", reference_files[file]);
    FILE *opened = fopen(path, "r");
    ck_assert_msg(opened != NULL, "%s", path);
    return opened;
}

/* The line's job, the caller's; `name` is for messages. */
static inline struct rf_job *reference_job(const cJSON *line, const char *name)
{
    struct rf_job *job;
    struct rf_error error;
    char *text = cJSON_PrintUnformatted(cJSON_GetObjectItem(line, "job"));
    ck_assert_ptr_nonnull(text);
    ck_assert_msg(rf_job_parse(text, strlen(text), name, &job, &error) == RF_OK, "%s", error.text);
    cJSON_free(text);
    return job;
}

#endif
