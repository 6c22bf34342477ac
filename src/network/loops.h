/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef NETWORK_LOOPS_H
#define NETWORK_LOOPS_H

/*
 * Effective resistances of a resistor network by loop currents (Kirchhoff 1847; in matrix form
 * e.g. Strang, "Introduction to Applied Mathematics", 1986, 2.3). With a spanning tree, C the loop
 * matrix (k loops × e edges), D the edges' resistances on a diagonal and p the signed tree path
 * between the probes,
 *
 *     i = p − Cᵀ (C D Cᵀ)⁻¹ C D p        current in every edge for 1 A through the meter
 *     R = Σ r_e i_e²                      the reading
 *     ∂R/∂r_e = i_e²                      (reciprocity; Cohn's theorem)
 *
 * Edges of zero resistance are contracted before the tree is grown: a link then joins two nodes
 * into one, a loop of links only vanishes, and C D Cᵀ is positive definite for any positive
 * resistances of the rest. Topology is analysed once; solving for new resistances allocates
 * nothing. Edges that follow one another, with nothing that branches off between, carry one current:
 * in a ring whose edges are numbered along it, a reading costs no more with more points.
 */

#include <ringfettle/status.h>

#include <stdbool.h>
#include <stddef.h>

struct edge {
    int a, b;  /* nodes, 0 … nodes−1 */
    bool zero; /* no resistance, whatever `r` says */
};

struct probe {
    int a, b; /* the nodes the meter is put on */
};

/* A workspace for networks up to the sizes given; opaque. NULL when memory is short. */
struct loops;
struct loops *loops_create(size_t nodes, size_t edges, size_t probes, size_t loops);
void loops_destroy(struct loops *loops);

/*
 * Analyses the topology: tree, loops, the probes' tree paths. Keeps only edges that carry current
 * for some probe. RF_NUMERICAL where a size exceeds the workspace's. Allocates nothing.
 */
enum rf_status loops_analyse(struct loops *loops, size_t nodes, const struct edge edges[],
                             size_t n_edges, const struct probe probes[], size_t n_probes);

/* Whether there is a path between the probe's nodes. Without one the meter reads over range. */
bool loops_has_path(const struct loops *loops, size_t probe);

/* The edges that can carry current, as indices into the edges analysed: the columns below. */
size_t loops_columns(const struct loops *loops, const int **edge_of_column);

/*
 * Takes the resistances (r[column], Ω, > 0) and factors C D Cᵀ. RF_NUMERICAL where it is not
 * positive definite (a resistance that is 0, negative or not a number).
 */
enum rf_status loops_factor(struct loops *loops, const double r[]);

/* Columns in a row that carry the same current for 1 A through a probe. What carries none
 * for certain is left out. */
struct stretch {
    size_t from, to; /* columns from … to − 1 */
    double path;     /* p in them */
    double signs[2]; /* C in them, of the first two loops … */
    size_t section;  /* … and of all: the analysis's own */
};
size_t loops_stretches(const struct loops *loops, size_t probe, const struct stretch **stretches);

/* The reading of one probe for the resistances factored last, Ω; 0 for a probe without a path.
 * `current` gets that of each of its stretches, A, signed from a to b. */
double loops_read_stretches(struct loops *loops, size_t probe, double current[]);

/* Σ r over columns from … to − 1, of the resistances factored last. */
double loops_sum(const struct loops *loops, size_t from, size_t to);

/*
 * The same reading, column by column. `power[column]` (may be NULL) gets r_e i_e², W at 1 A, whose
 * sum is the reading: ∂R/∂(log r_e) = power_e. `current[column]` (may be NULL) gets i_e.
 */
double loops_read(struct loops *loops, size_t probe, double power[], double current[]);

#endif
