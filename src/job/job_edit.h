/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef JOB_JOB_EDIT_H
#define JOB_JOB_EDIT_H

/* Changes to a job's file, JSON or sheet, that leave every byte they do not concern as it was. */

#include "base/text.h"
#include "job/job.h"

struct json_origin;

enum change_how { CHANGE_ADD, CHANGE_CORRECT, CHANGE_REMOVE };
enum change_what { CHANGE_READING, CHANGE_OPENED, CHANGE_CHECKED, CHANGE_FOUND };

struct job_change {
    enum change_how how;
    enum change_what what;
    size_t setup;              /* of a reading */
    const char *place;         /* its key: a point's id, "board", "l" …; of a mark, the place */
    const char *const *values; /* readings as JSON texts: 0.40, "open"; none to remove */
    size_t n_values;
    const char *found; /* the object, as JSON text */
};

/*
 * Applies n changes in order to the bytes of a job's file. To add a reading where there is one is
 * to repeat it; to correct it puts the values in the place of all that are there. What is
 * corrected, removed or replaced goes into the list `x_history` with `time`, as it was. The job
 * is read before and after as any other (it may have no reading): RF_SYNTAX, RF_REFUSED, RF_LIMIT,
 * RF_MEMORY; the bytes are then worth nothing. On RF_OK *job (the caller's) is the job after.
 */
enum rf_status job_edit(struct text *bytes, const char *source, const struct job_change changes[],
                        size_t n, const char *time, struct rf_job **job, struct rf_error *error);

/* A job file's bytes, whichever its format, as a job with at least `least` readings. */
enum rf_status job_read_bytes(const struct text *bytes, const char *source, size_t least,
                              struct rf_job **job, struct rf_error *error);
/* Whether bytes are of a sheet: they do not begin as a JSON text does. */
bool job_bytes_are_sheet(const struct text *bytes);

/* The sheet's half of job_edit (sheet_edit.c): one change, and an entry (JSON) put into the list
 * `x_history` or, where NULL, none. */
struct cJSON;
enum rf_status sheet_edit(struct text *bytes, const char *source, const struct job_change *change,
                          const struct cJSON *document, const struct cJSON *entry,
                          struct rf_error *error);

#endif
