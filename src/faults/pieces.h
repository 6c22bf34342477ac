/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef FAULTS_PIECES_H
#define FAULTS_PIECES_H

/*
 * What families do to the wires of a run. A run's conductor is a chain of pieces, each going from
 * its `a`, towards the run's near place, to its `b`, towards the far one; faults applied before
 * may have split it, moved its ends or taken it out.
 */

#include "network/wiring.h"

/* Takes out every piece of that run's conductor. */
void pieces_take_out(struct wiring *wiring, size_t run, enum conductor conductor);

/* Puts a resistor of `ohms` in series at the run's far end, as a piece of the run; nothing where
 * the conductor is taken out. Adds a node and a wire. */
void pieces_splice(struct wiring *wiring, size_t run, enum conductor conductor, double ohms,
                   int parameter);

/* The piece whose `b` is the run's far end; NULL where the conductor is taken out. */
struct wire *pieces_far_end(struct wiring *wiring, size_t run, enum conductor conductor);

#endif
