/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef SIMULATION_TRUTH_H
#define SIMULATION_TRUTH_H

/* What making a truth and reading one share. */

#include "simulation/simulation.h"

struct cJSON;

/* Wires the job's ring with the truth's hypothesis and makes room for θ, which is kept where it is
 * there already. May be called again for another reading of the same ring. */
enum rf_status truth_wire(struct truth *truth, const struct rf_job *job, struct rf_error *error);

/* Sets θ of that fault's parameter from its value, Ω or m. RF_REFUSED where it has none. */
enum rf_status truth_set_value(struct truth *truth, size_t fault, double value,
                               struct rf_error *error);

/* Names in files: of a look's kind, by enum look_kind. */
extern const char *const look_names[N_LOOKS];

#endif
