/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef RINGFETTLE_JOB_H
#define RINGFETTLE_JOB_H

#include <ringfettle/status.h>

#include <stdbool.h>
#include <stddef.h>
#include <stdio.h>

#ifdef __cplusplus
extern "C" {
#endif

/* A ring as recorded, and the readings taken on it. Opaque, on the heap, read-only once made: any
 * number of threads may use one at the same time. */
struct rf_job;

/*
 * Reads one job from a JSON text of `length` bytes (it need not be terminated). `name` stands for
 * the text in messages. On RF_OK *job is the caller's, to destroy; on anything else *job is NULL
 * and `error` (may be NULL) says what was found, where, and what would be right.
 * RF_SYNTAX, RF_REFUSED, RF_LIMIT, RF_MEMORY.
 */
RF_API enum rf_status rf_job_parse(const char *text, size_t length, const char *name,
                                   struct rf_job **job, struct rf_error *error);

/* Frees; takes NULL. */
RF_API void rf_job_destroy(struct rf_job *job);

/* The `job` field, or the name of the source where the file has none. Lives as long as the job. */
RF_API const char *rf_job_name(const struct rf_job *job);

/* How many ring points, spur points and readings. */
RF_API size_t rf_job_points(const struct rf_job *job);
RF_API size_t rf_job_spurs(const struct rf_job *job);
RF_API size_t rf_job_readings(const struct rf_job *job);

/* Whether the file records what was found. */
RF_API bool rf_job_has_found(const struct rf_job *job);

/*
 * A stream of jobs out of one file: a JSON document, or one job a line (NDJSON). Memory is one
 * job's, however long the file. `path` "-" is standard input. On RF_OK *reader is the caller's, to
 * close.
 */
struct rf_job_reader;
RF_API enum rf_status rf_job_reader_open(const char *path, struct rf_job_reader **reader,
                                         struct rf_error *error);
/* The next job, the caller's to destroy; RF_OK with *job NULL at the end. A job that is refused
 * (its class is RF_CLASS_INPUT) does not end the stream: the next call gives the one behind it. */
RF_API enum rf_status rf_job_reader_next(struct rf_job_reader *reader, struct rf_job **job,
                                         struct rf_error *error);
RF_API void rf_job_reader_close(struct rf_job_reader *reader); /* takes NULL */

#ifdef __cplusplus
}
#endif

#endif
