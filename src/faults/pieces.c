/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "faults/pieces.h"

void pieces_take_out(struct wiring *wiring, size_t run, enum conductor conductor)
{
    struct wire *wire;
    for (size_t next = 0; (wire = wiring_next_piece(wiring, run, conductor, &next)) != NULL;)
        wire->a = -1;
}

/* Whether a piece of the run's conductor goes on from `node` towards the far place. */
static bool goes_on(struct wiring *wiring, size_t run, enum conductor conductor, int node)
{
    const struct wire *wire;
    for (size_t next = 0; (wire = wiring_next_piece(wiring, run, conductor, &next)) != NULL;)
        if (wire->a == node)
            return true;
    return false;
}

struct wire *pieces_far_end(struct wiring *wiring, size_t run, enum conductor conductor)
{
    struct wire *wire;
    for (size_t next = 0; (wire = wiring_next_piece(wiring, run, conductor, &next)) != NULL;)
        if (wire->a >= 0 && !goes_on(wiring, run, conductor, wire->b))
            return wire;
    return NULL;
}

void pieces_splice(struct wiring *wiring, size_t run, enum conductor conductor, double ohms,
                   int parameter)
{
    struct wire *piece = pieces_far_end(wiring, run, conductor);
    if (piece == NULL)
        return;
    int end = piece->b;
    int node = wiring_add_node(wiring);
    piece->b = node;
    wiring_add_resistor(wiring, node, end, ohms, parameter);
    struct wire *added = &wiring->wires[wiring->n_wires - 1];
    added->run = (int)run;
    added->conductor = conductor;
}
