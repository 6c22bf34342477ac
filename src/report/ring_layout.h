/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef REPORT_RING_LAYOUT_H
#define REPORT_RING_LAYOUT_H

/*
 * Where things stand on the ring map: the ring runs from the board down one rail, around a bend
 * and up the other. Runs are drawn in proportion to their lengths, but never shorter than a mark.
 * Labels stand outside in a column on either side, spread so that none covers another; spurs hang
 * between the rail and the labels.
 */

#include "diagnosis/diagnosis.h"

/* How much is written at a place. */
enum label_style {
    LABEL_WRAPPED,   /* id, and under it the label in up to two lines */
    LABEL_TWO_LINES, /* id, and under it the label */
    LABEL_ONE_LINE,
    LABEL_NUMBER /* its number in the list, in two columns by turns */
};

enum label_style label_style(const struct rf_job *job);

struct position {
    double x, y;
};

struct ring_layout {
    enum label_style style;
    double width, height;
    double left, right, middle; /* x of the rails and between */
    double top, rail, bend;     /* y of the rails' upper ends; a rail's length; the bend's radius */
    double spur_step; /* from the rail to a spur point, and from that to the next */
    double length;              /* of the ring as drawn, px */
    double *along;              /* [ring place] px from the out end */
    struct position *mark;      /* [place] */
    double *row;                /* [place] y of its label */
    bool *on_left;              /* [place] */
};

/* Lays the ring out; the caller finishes it. False where memory is short. */
bool ring_layout_init(struct ring_layout *layout, const struct rf_diagnosis *diagnosis);
void ring_layout_finish(struct ring_layout *layout); /* takes zeroed */

/* The spot so far along the ring, moved `aside` px away from the ring's inside (negative: into
 * it). */
struct position along_ring(const struct ring_layout *layout, double along, double aside);

/* Moves n sorted heights apart to at least `gap`, as little as possible, within low … high where
 * they fit there at all. `scratch` holds 2n. */
void spread_apart(double y[], size_t n, double gap, double low, double high, double scratch[]);

#endif
