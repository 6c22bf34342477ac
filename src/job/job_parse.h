/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef JOB_JOB_PARSE_H
#define JOB_JOB_PARSE_H

/* The parts of a job's reader. Each fills its fields of a job whose places are there already
 * (but for `job_parse_ring`, which makes them) and leaves what it allocated to the job. */

#include "base/json.h"
#include "job/job.h"

/* rf_job_parse, with the way positions in the text are named. */
enum rf_status job_parse(const char *text, size_t length, const char *source, enum json_lines lines,
                         struct rf_job **job, struct rf_error *error);

/*
 * A job from a document that another format's reader made; `origin` names its places in messages
 * (NULL: by their paths). `least`: how many readings it must have; a job that was only begun has
 * none. Takes the document over, also where it refuses.
 */
enum rf_status job_from_document(cJSON *document, const struct json_origin *origin,
                                 const char *source, size_t least, struct rf_job **job,
                                 struct rf_error *error);

enum rf_status job_parse_ring(const struct json_at *ring, struct rf_job *job,
                              struct rf_error *error);
/* `least`: how many there must be. Where that is none, `readings` may be missing. */
enum rf_status job_parse_readings(const struct json_at *readings, size_t least, struct rf_job *job,
                                  struct rf_error *error);
/* `access`, `opened`, `checked`. */
enum rf_status job_parse_looks(const struct json_at *document, struct rf_job *job,
                               struct rf_error *error);

/* A copy of the string, if it is given at all; *copy is NULL where it is not. */
enum rf_status job_parse_words(const struct json_at *at, char **copy, struct rf_error *error);

/* "no such point; the ring has P1 to P8", at a key or at a string that names it. */
enum rf_status job_fail_no_point(const struct json_at *at, const struct rf_job *job,
                                 struct rf_error *error);

#endif
