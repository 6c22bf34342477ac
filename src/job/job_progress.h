/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef JOB_JOB_PROGRESS_H
#define JOB_JOB_PROGRESS_H

/* Going on with a job in memory: what is read, and where somebody has looked. The document it was
 * read from stays as it was. */

#include "job/job.h"

/* Adds a reading, the set-up of which is then in place. Its fields must be as job.h says.
 * RF_LIMIT, RF_MEMORY. */
enum rf_status job_add_reading(struct rf_job *job, const struct reading *reading,
                               struct rf_error *error);

/* Marks a place as taken off (the board: n_places), or its face as seen to. */
void job_mark_opened(struct rf_job *job, size_t place);
void job_mark_checked(struct rf_job *job, size_t place);

#endif
