/* SPDX-License-Identifier: GPL-3.0-or-later */

/*
 * What finding the defect would have cost by the order of looking: `found` says what it was, the
 * families say with which chance it shows where (a joint at either end of its run, or inside it),
 * and the order of looking says how many places come before that.
 */

#include "advice/advice.h"
#include "review/line.h"

#include <math.h>
#include <stdlib.h>

struct counting {
    const struct rf_job *job;
    const struct look_step *steps;
    size_t n_steps;
    bool each_enough;
    double share[N_LOOK_BINS];
    double places; /* Σ share × places before it */
    double total;  /* Σ share of places not looked at already */
    size_t earliest;
};

static size_t bin_of(size_t places)
{
    static const size_t firsts[] = {0, 1, 2, 3, 6};
    size_t bin = 0;
    while (bin + 1 < sizeof firsts / sizeof firsts[0] && places >= firsts[bin + 1])
        bin++;
    return bin;
}

static size_t step_of(const struct counting *counting, const struct look *look)
{
    size_t i = 0;
    for (; i < counting->n_steps; i++) {
        const struct look *step = &counting->steps[i].look;
        if (step->kind == look->kind && step->where == look->where && step->index == look->index)
            break;
    }
    return i;
}

static void count_look(void *context, const struct look *look)
{
    struct counting *counting = context;
    if (looked_at(counting->job, look))
        return;
    size_t step = step_of(counting, look);
    counting->share[step < counting->n_steps ? bin_of(step) : LOOK_BIN_NEVER] += look->share;
    counting->places += look->share * (double)step;
    counting->total += look->share;
    if (step < counting->earliest)
        counting->earliest = step;
}

/* Where every look is enough, the first of them finds it. */
static void settle(struct counting *counting)
{
    if (!counting->each_enough || !(counting->total > 0))
        return;
    for (size_t i = 0; i < N_LOOK_BINS; i++)
        counting->share[i] = 0;
    size_t step = counting->earliest;
    counting->share[step < counting->n_steps ? bin_of(step) : LOOK_BIN_NEVER] = 1;
    counting->places = (double)step;
    counting->total = 1;
}

enum rf_status line_count_looks(struct review_line *line, const struct rf_diagnosis *diagnosis,
                                struct rf_error *error)
{
    struct look_step *steps = NULL;
    if (!diagnosis->found_known || diagnosis->found.n_faults != 1)
        return RF_OK;
    const struct fault *fault = &diagnosis->found.faults[0];
    struct counting counting = {
        .job = diagnosis->job, .each_enough = fault->family->each_enough, .earliest = (size_t)-1};
    enum rf_status status = order_of_looking(diagnosis, &steps, &counting.n_steps, error);
    counting.steps = steps;
    if (status == RF_OK)
        fault_looks(fault, diagnosis->job, diagnosis->models, count_look, &counting);
    settle(&counting);
    if (status == RF_OK && counting.total > 0) {
        line->found.looked = true;
        line->found.places = llround(counting.places / counting.total * PARTS);
        for (size_t i = 0; i < N_LOOK_BINS; i++)
            line->found.looks[i] = llround(counting.share[i] / counting.total * PARTS);
    }
    free(steps);
    return status;
}
