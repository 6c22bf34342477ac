/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef FIT_FORWARD_H
#define FIT_FORWARD_H

/*
 * The forward model: what the meter would show, at a list of measurements, for a wiring and its
 * whitened parameters θ ~ N(0, I),
 *
 *     mean = gain · R + offsets
 *
 * with R the effective resistance the loops give, and its exact Jacobian. Topology is analysed
 * once a wiring, then evaluated for as many θ as a fit needs; neither allocates.
 */

#include "network/wiring.h"

#include <stdbool.h>
#include <stddef.h>

/* What is read, and where: a reading without its value. */
struct measurement {
    size_t setup;
    enum spot spot;
    size_t place; /* SPOT_POINT: which */
};

bool measurement_equal(const struct measurement *one, const struct measurement *other);

struct forward;

/* For wirings that are copies of `ring`, at n measurements (copied). NULL when memory is short. */
struct forward *forward_create(const struct wiring *ring, const struct measurement measurements[],
                               size_t n);
void forward_destroy(struct forward *forward); /* takes NULL */

size_t forward_measurements(const struct forward *forward);
const struct measurement *forward_measurement(const struct forward *forward, size_t i);

/* Analyses a wiring's topology under every set-up that is measured. The wiring is read again by
 * `forward_evaluate`, so it must stay as it is meanwhile. RF_NUMERICAL. */
enum rf_status forward_analyse(struct forward *forward, const struct wiring *wiring);

/* Whether there is a path to measure; without one the meter reads over range. For `highest`:
 * whether any of the set-up's points has one. Needs the analysis only. */
bool forward_reachable(const struct forward *forward, size_t i);

/* θ: wiring->n_parameters. RF_NUMERICAL where a resistance is not a positive number. */
enum rf_status forward_evaluate(struct forward *forward, const double theta[]);

/* The same without derivatives, at less than half the cost. */
enum rf_status forward_evaluate_means(struct forward *forward, const double theta[]);

/* The values evaluated last: Ω; 0 where there is no path. */
double forward_mean(const struct forward *forward, size_t i);
/* ∂mean_i/∂θ_j, Ω per whitened unit, n_parameters of them: written out when asked for, good until
 * the next evaluation. */
const double *forward_gradient(const struct forward *forward, size_t i);

/*
 * The same as it is kept. θ begins with the runs (wiring.h); ∂mean/∂θ_run is scale[run] · s[run] with
 * s[run] the sum of the steps at that run and before it, and there are few steps, because a stretch of
 * ring carries one current whatever the number of runs. `others` has ∂mean/∂θ_j for the rest, from
 * θ_runs on; behind them are zeros.
 */
enum {
    /* Conductors, the CPC not known, the instrument's four, faults', one that is none. */
    MAX_OTHERS = N_CONDUCTORS + 1 + 4 + FAULTS_AT_ONCE + 1
};
struct slopes {
    size_t n_steps;
    const int *step_run;
    const double *steps;  /* Ω/m */
    const double *others; /* [MAX_OTHERS] Ω per whitened unit */
};
size_t forward_runs(const struct forward *forward);
const double *forward_scale(const struct forward *forward); /* [run] σ × length, m */
const struct slopes *forward_slopes(const struct forward *forward, size_t i);

#endif
