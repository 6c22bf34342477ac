/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "report/lengths.h"

#include <math.h>

double run_metres(const struct rf_diagnosis *diagnosis, size_t run)
{
    double recorded = diagnosis->job->places[run_far_end(run)].run_m;
    double median = isnan(recorded) ? diagnosis->models->unknown_length.median : recorded;
    size_t parameter = (size_t)diagnosis->ring.map.runs + run;
    if (diagnosis->n_ranked == 0 || parameter >= diagnosis->ranked[0].n_parameters)
        return median;
    return median *
           exp(diagnosis->ring.parameters[parameter].sigma * diagnosis->ranked[0].theta[parameter]);
}

size_t spur_depth(const struct rf_job *job, size_t place)
{
    size_t depth = 0;
    for (; !place_on_ring(job, place); place = job->places[place].from)
        depth++;
    return depth;
}

size_t ring_place_of(const struct rf_job *job, size_t place)
{
    while (!place_on_ring(job, place))
        place = job->places[place].from;
    return place;
}

void place_distances(const struct rf_diagnosis *diagnosis, double at[])
{
    const struct rf_job *job = diagnosis->job;
    at[place_out()] = 0;
    for (size_t run = 0; run <= job->n_ring; run++)
        at[run_far_end(run)] = at[run] + run_metres(diagnosis, run);
    for (size_t place = job->n_ring + 2; place < job->n_places; place++) {
        at[place] = 0;
        for (size_t on = place; !place_on_ring(job, on); on = job->places[on].from)
            at[place] += run_metres(diagnosis, on - 1);
        at[place] += at[ring_place_of(job, place)];
    }
}
