/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef FIT_EXPECTED_H
#define FIT_EXPECTED_H

/* What a ring wired as recorded would read, with its range: for the one who stands at the board and
 * wants to know whether what the meter shows is anything to worry about. */

#include "fit/forward.h"

struct expected {
    bool open;        /* over range: there is no path */
    double ohms;      /* Ω */
    double low, high; /* Ω, 2 σ: lengths, cable, instrument and the reading's own noise */
};

/*
 * The job's ring at n measurements. By its record alone; or, with `given_ends`, by the record and
 * its end-to-end readings, which pin down length and cable far better. `left_out[conductor]` (may
 * be NULL) then says which end-to-end readings no ring wired as recorded would give, so that they
 * were taken for misreads. RF_REFUSED, RF_NUMERICAL, RF_MEMORY.
 */
enum rf_status expect_readings(const struct rf_job *job, const struct rf_models *models,
                               bool given_ends, const struct measurement measurements[], size_t n,
                               struct expected expected[], bool left_out[N_CONDUCTORS],
                               struct rf_error *error);

/*
 * What the next reading would be on a ring wired as recorded, given its record and all readings
 * the job has; `low` and `high` are 3 σ here. The job may have no reading.
 */
enum rf_status expect_next(const struct rf_job *job, const struct rf_models *models,
                           const struct measurement *measurement, struct expected *expected,
                           struct rf_error *error);

/* Whether the job has an end-to-end reading within range. */
bool has_end_to_end(const struct rf_job *job);

#endif
