/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef BENCH_PLAIN_H
#define BENCH_PLAIN_H

/*
 * The plain way to rank the hypotheses, to measure the engine against and to check it: node
 * voltages from a conductance matrix that GSL factors once a set-up, a Jacobian by forward
 * differences, GSL's Cholesky for the normal equations, no screening, nothing shared. The same
 * wirings, priors, two stages, stopping rules and evidence; none of the engine's network, forward
 * model or fit.
 *
 * Links are made exact by taking the nodes they join for one; one node of each connected part is
 * the zero of its voltages.
 */

#include "diagnosis/steps.h"

/* Fills log_evidence and confidence of each candidate, in the order they come. RF_NUMERICAL,
 * RF_MEMORY. */
enum rf_status plain_rank(struct candidates *candidates, const struct wiring *ring,
                          struct rf_error *error);

#endif
