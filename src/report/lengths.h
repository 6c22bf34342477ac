/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef REPORT_LENGTHS_H
#define REPORT_LENGTHS_H

#include "diagnosis/diagnosis.h"

/* Metres of a run as the likeliest explanation fits it; as recorded where nothing was fitted. */
double run_metres(const struct rf_diagnosis *diagnosis, size_t run);

/* at[place], m from the out end: along the ring, and on along spurs. */
void place_distances(const struct rf_diagnosis *diagnosis, double at[]);

/* How deep a spur point hangs: 1 on a ring place, 2 on a spur point of that … 0: on the ring. */
size_t spur_depth(const struct rf_job *job, size_t place);
/* The ring place that a spur point hangs on in the end. */
size_t ring_place_of(const struct rf_job *job, size_t place);

#endif
