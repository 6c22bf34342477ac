/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef FAULTS_PLACES_H
#define FAULTS_PLACES_H

/* What the families share: walks over places, where things show, and the words for places. */

#include "faults/fault.h"

/* The next point behind `place` (0: the first), spur points behind the ring's; n_places at the
 * end. `next_front` passes over points without a front. */
size_t next_point(const struct rf_job *job, size_t place);
size_t next_front(const struct rf_job *job, size_t place);

/* Whether the job has a reading of that set-up. */
bool setup_has_readings(const struct rf_job *job, size_t setup);

/* Every run × the conductors 0 … n_conductors−1 (WHOLE_CABLE is one more). */
void enumerate_runs(const struct fault_family *family, const struct rf_job *job, int n_conductors,
                    fault_callback *callback, void *context);
/* Every point with a front × pairs. */
void enumerate_front_pairs(const struct fault_family *family, const struct rf_job *job,
                           fault_callback *callback, void *context);

/* The shares of a family that shows at a place and nowhere else, and that share. */
extern const char *const place_shares[1];
double place_share(const struct fault *fault, const struct rf_models *models);

/* Opening a place; an end of the ring is the board. */
void look_open(const struct rf_job *job, size_t place, double share, look_callback *callback,
               void *context);
void look_check(size_t place, double share, look_callback *callback, void *context);
void look_board(double share, look_callback *callback, void *context);
/* Opening either end of a run, each `end`, and the fabric between, `inside`. */
void look_along_run(const struct rf_job *job, size_t run, double end, double inside,
                    look_callback *callback, void *context);

/* Spans: a run's two ends, and a point twice. */
void span_run(const struct fault *fault, const struct rf_job *job, size_t *from, size_t *to);
void span_point(const struct fault *fault, const struct rf_job *job, size_t *from, size_t *to);

/* The place in words: its id, and its label in brackets where that says more than the id. The
 * ring's ends are at the board. */
void say_place(const struct rf_job *job, size_t place, struct text *out);
/* " in the run P3 to P4", " at P4" */
void say_in_run(const struct rf_job *job, size_t run, struct text *out);
void say_at(const struct rf_job *job, size_t place, struct text *out);
/* "line and CPC" */
void say_pair(enum pair pair, struct text *out);
/* "the crossed line-neutral test", "the line-neutral test linked at the outgoing ends" */
void say_setup(size_t setup, struct text *out);
/* "outgoing", "incoming" */
const char *leg_word(bool leg_in);

#endif
