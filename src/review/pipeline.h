/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef REVIEW_PIPELINE_H
#define REVIEW_PIPELINE_H

/*
 * Jobs read, diagnosed and handed on, a window of them at a time: reading and handing on happen in
 * one thread and in input order, diagnosing in several (OpenMP). What comes out does not depend on
 * their number, and memory is a window's.
 */

#include "review/input.h"
#include "review/tally.h"

#include <signal.h>

struct review_sink {
    void *context;
    /* What is to be written of a job. Called from several threads at once. */
    void (*render)(const void *context, const struct rf_diagnosis *diagnosis,
                   const struct review_line *line, struct text *out);
    /* One job, in input order, with what `render` made of it. Anything but RF_OK ends the run. */
    enum rf_status (*accept)(void *context, const struct review_line *line, const struct text *out,
                             struct rf_error *error);
    /* One job or file that could not be reviewed, in its place in that order. */
    void (*refuse)(void *context, const struct rf_error *error);
    /* All that was read so far has been handed on. NULL: nothing to do then. */
    void (*pause)(void *context);
};

/*
 * Reviews all of the input on `threads` threads (0: as many as OpenMP has) and counts it into
 * `review`. Once *stop (may be NULL) is not 0, jobs not begun are left, those finished are handed
 * on, and it ends. RF_MEMORY, or what `accept` said.
 */
enum rf_status review_run(struct review_input *input, const struct rf_models *models, int threads,
                          const volatile sig_atomic_t *stop, const struct review_sink *sink,
                          struct rf_review *review, struct rf_error *error);

#endif
