/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef NETWORK_WIRING_H
#define NETWORK_WIRING_H

/*
 * The conductors of a ring as they are joined, before any set-up at the board: what a fault
 * changes, and what a set-up is joined onto. Knows no faults; faults know it.
 *
 * Every resistance is a product base · Π exp(σ_j θ_j) over at most two whitened parameters, so
 * that all sensitivities follow from the powers the loops give: ∂R/∂θ_j = σ_j Σ_e power_e.
 */

#include "job/job.h"
#include "models/models.h"
#include "network/loops.h"

#include <ringfettle/status.h>

enum {
    FAULTS_AT_ONCE = 3,  /* a hypothesis is a set of at most so many faults */
    WIRES_PER_FAULT = 3, /* further wires one fault may add … */
    NODES_PER_FAULT = 3, /* … and further nodes */
    NO_PARAMETER = -1
};

/* A piece of conductor (or of fault) between two nodes. */
struct wire {
    int a, b;    /* nodes; a < 0: taken out */
    double ohms; /* Ω at θ = 0 */
    int length_parameter; /* or the fault's own; NO_PARAMETER: none */
    int factor_parameter; /* the conductor's, or NO_PARAMETER */
    int run;              /* of the ring as recorded; −1: none of them */
    enum conductor conductor;
    double metres; /* m at θ = 0; `ohms` is metres × Ω/m. 0 for what is not cable */
};

/* How the links of one set-up really are. */
enum link_state { LINK_MADE, LINK_RESISTIVE, LINK_OPEN };
struct links {
    bool not_crossed;        /* the pair joined at out, and at in, instead of crossed */
    enum link_state out, in; /* of the pair's first conductor's end there */
    double ohms;             /* of the resistive one, at θ = 0 */
    int parameter;
};

struct parameter {
    double sigma; /* a factor exp(σθ) on resistances, on the gain; or σθ Ω for offsets */
    double mean;  /* Ω, what offsets have besides; 0 for what is a factor */
};

/* Where the fixed parameters stand in θ. Fault parameters follow from `n_common` on. */
struct parameter_map {
    int runs;      /* the first of n_runs(job) */
    int conductor[N_CONDUCTORS];
    int unknown_cpc; /* in place of the CPC's in runs whose CPC is not known; NO_PARAMETER: none is */
    int gain, lead, face, wander;
    int n_common;
};

struct wiring {
    const struct rf_job *job;
    const struct rf_models *models;
    struct parameter_map map;
    struct parameter *parameters; /* n_parameters ≤ n_common + FAULTS_AT_ONCE */
    int n_parameters;
    int n_nodes, max_nodes;
    int *front;   /* [place·3 + conductor]: node the meter meets there, −1 on a place without */
    struct wire *wires;
    size_t n_wires, max_wires;
    struct links links[N_SETUPS];
    int offset_parameter;  /* a log-normal offset on every reading, or NO_PARAMETER */
    double offset_ohms;    /* its value at θ = 0 */
};

/* Node of a place's terminal. */
static inline int terminal(size_t place, enum conductor conductor)
{
    return (int)(place * N_CONDUCTORS + conductor);
}

/*
 * Builds the ring as recorded. RF_REFUSED where the job names a conductor size that the models do
 * not know; RF_MEMORY. On RF_OK the caller finishes it.
 */
enum rf_status wiring_init(struct wiring *wiring, const struct rf_job *job,
                           const struct rf_models *models, struct rf_error *error);
void wiring_finish(struct wiring *wiring); /* takes zeroed */

/* Makes `wiring` (initialised for the same job) a copy of `from`; allocates nothing. */
void wiring_copy(struct wiring *wiring, const struct wiring *from);

/* What faults use; none allocates. */
int wiring_add_node(struct wiring *wiring);
int wiring_add_parameter(struct wiring *wiring, double sigma);
/* A wire of `ohms` (Ω at θ = 0) that scales with `parameter`. */
void wiring_add_resistor(struct wiring *wiring, int a, int b, double ohms, int parameter);
/* `metres` of the ring's cable, one conductor of it, its length scaling with `parameter`. */
void wiring_add_cable(struct wiring *wiring, enum conductor conductor, int a, int b, double metres,
                      int parameter);
/* The pieces of that run's conductor that are there, one a call. `next` starts at 0; NULL at the
 * end. Pieces added meanwhile are met too. */
struct wire *wiring_next_piece(struct wiring *wiring, size_t run, enum conductor conductor,
                              size_t *next);
/* The run's end at `place` now goes to `nodes[conductor]` instead of the place's terminals. */
void wiring_move_end(struct wiring *wiring, size_t run, size_t place, const int nodes[N_CONDUCTORS]);
/* The whole ring in another cable: sizes become known, as if recorded so. */
void wiring_set_cable(struct wiring *wiring, double live_mm2, double cpc_mm2);

/* What one set-up makes of the wiring: edges for loops_analyse, one for each wire that is there,
 * then one for each link. `wire_of_edge[e]` is the wire, or −1 for a link; a link of resistance
 * has `ohms` and `parameter` from links[setup]. Arrays hold n_wires + 2. */
size_t wiring_join(const struct wiring *wiring, size_t setup, struct edge edges[],
                   int wire_of_edge[]);

/* The nodes the meter is put on for a spot of a set-up (not SPOT_HIGHEST). */
struct probe wiring_probe(const struct wiring *wiring, size_t setup, enum spot spot, size_t place);

#endif
