/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef JOB_JOB_WRITE_H
#define JOB_JOB_WRITE_H

#include "base/text.h"
#include "job/job.h"

/*
 * Append a job's document as JSON text, keys and their order as they are in it, x_ keys included.
 * `job_write` gives one place, one set-up or one key a line and ends in a newline;
 * `job_write_line` gives one line without its end. The same document always gives the same bytes,
 * and reading them gives the same document. RF_MEMORY.
 */
enum rf_status job_write(const struct rf_job *job, struct text *out, struct rf_error *error);
enum rf_status job_write_line(const struct rf_job *job, struct text *out, struct rf_error *error);

/* The same for a document that is not a job yet (the simulator's, a form's). */
struct cJSON;
enum rf_status job_write_document(const struct cJSON *document, struct text *out,
                                  struct rf_error *error);

#endif
