/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef TESTS_METER_H
#define TESTS_METER_H

/* What an ideal meter reads on a wiring, for tests of the rooms that wire. */

#include "network/wiring.h"

#include "rings.h"

#include <check.h>

enum { METER_MAX_EDGES = 128 };

/* The reading at θ = 0, Ω, without instrument or offsets; a negative number: no path. */
static inline double read_wiring(const struct wiring *wiring, const char *setup_name,
                                 enum spot spot, size_t place)
{
    size_t setup = setup_find(setup_name);
    ck_assert_uint_lt(setup, N_SETUPS);
    struct edge edges[METER_MAX_EDGES];
    int wire_of_edge[METER_MAX_EDGES];
    double r[METER_MAX_EDGES];
    ck_assert_uint_le(wiring->n_wires + 2, METER_MAX_EDGES);
    size_t n = wiring_join(wiring, setup, edges, wire_of_edge);
    size_t nodes = (size_t)wiring->n_nodes;
    struct loops *loops = loops_create(nodes, n, 1, n);
    ck_assert_ptr_nonnull(loops);
    struct probe probe = wiring_probe(wiring, setup, spot, place);
    ck_assert_int_eq(loops_analyse(loops, nodes, edges, n, &probe, 1), RF_OK);
    const int *edge_of_column;
    size_t columns = loops_columns(loops, &edge_of_column);
    for (size_t c = 0; c < columns; c++) {
        int wire = wire_of_edge[edge_of_column[c]];
        r[c] = wire >= 0 ? wiring->wires[wire].ohms : wiring->links[setup].ohms;
    }
    ck_assert_int_eq(loops_factor(loops, r), RF_OK);
    double reading = loops_has_path(loops, 0) ? loops_read(loops, 0, NULL, NULL) : -1.0;
    loops_destroy(loops);
    return reading;
}

#endif
