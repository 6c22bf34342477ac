/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/error.h"
#include "base/memory.h"
#include "diagnosis/steps.h"

#include <math.h>

/* Chances added up over everything that would show at a place, and what would hurt. */

const char *const danger_words[N_DANGERS] = {
    [DANGER_CPC_BROKEN] = "the CPC is broken: metalwork beyond could become live and stay so",
    [DANGER_LINE_ON_CPC] = "line and CPC are changed over or touch: earthed metal could become live",
    [DANGER_LIVES_SHORTED] = "live conductors touch: a short circuit as soon as it is energised",
    [DANGER_REVERSED] = "line and neutral are changed over: live parts stay live when switched off",
    [DANGER_RING_BROKEN] = "the ring is broken: a 32 A device would not protect the one leg left",
    [DANGER_OTHER_CIRCUIT] = "another circuit is joined in: this one could be live while isolated",
    [DANGER_HEAT] = "a poor joint or contact: it gets hot under load",
};

struct adding {
    const struct rf_job *job;
    double *shows, *missed;     /* [place_chance] of one fault; of all of a hypothesis */
    struct place_chance *first; /* of those that follow, which lie in a row */
    struct place_chance *open, *check, *run, *board; /* [place], [place], [run], one */
    double confidence;
    bool together; /* the hypothesis is more than one fault */
    double left; /* share of the fault not ruled out by looks; its other looks are shares of that */
};

static void add_look(void *context, const struct look *look)
{
    struct adding *adding = context;
    if (looked_at(adding->job, look))
        return;
    struct place_chance *entry = look->where == LOOK_AT_BOARD ? adding->board
                                 : look->where == LOOK_IN_RUN ? &adding->run[look->index]
                                 : look->kind == LOOK_OPEN    ? &adding->open[look->index]
                                                              : &adding->check[look->index];
    entry->look = *look;
    if (adding->together)
        adding->shows[entry - adding->first] += look->share / adding->left;
    else
        entry->chance += adding->confidence * look->share / adding->left;
}

/* Two faults may show in one place: the chance is that not both stay hidden there. */
static void add_fault_of_several(struct adding *adding, size_t n, bool last)
{
    for (size_t i = 0; i < n; i++) {
        adding->missed[i] *= 1.0 - fmin(1.0, adding->shows[i]);
        adding->shows[i] = 0.0;
        if (last) {
            adding->first[i].chance += adding->confidence * (1.0 - adding->missed[i]);
            adding->missed[i] = 1.0;
        }
    }
}

static void add_hypothesis(struct adding *adding, struct rf_diagnosis *diagnosis,
                           const struct candidate *candidate, size_t n_entries)
{
    bool counted[N_DANGERS] = {false};
    size_t n = candidate->hypothesis.n_faults;
    adding->confidence = candidate->confidence;
    adding->together = n > 1;
    for (size_t i = 0; i < n; i++) {
        const struct fault *fault = &candidate->hypothesis.faults[i];
        adding->left = fault->family->each_enough
                           ? 1.0
                           : share_left_by_looks(fault, diagnosis->job, diagnosis->models);
        if (adding->left > 0.0)
            fault_looks(fault, diagnosis->job, diagnosis->models, add_look, adding);
        if (adding->together)
            add_fault_of_several(adding, n_entries, i + 1 == n);
        enum danger danger = fault_danger(fault, diagnosis->job);
        diagnosis->dangers[danger].danger = danger;
        if (!counted[danger])
            diagnosis->dangers[danger].chance += candidate->confidence;
        counted[danger] = true;
    }
}

static int by_chance(const void *a, const void *b)
{
    const struct place_chance *one = a, *other = b;
    /* Chances that differ by rounding only go by place. */
    double first = round(1e9 * one->chance), second = round(1e9 * other->chance);
    if (first != second)
        return first > second ? -1 : 1;
    if (one->look.where != other->look.where)
        return one->look.where < other->look.where ? -1 : 1;
    return one->look.index < other->look.index ? -1 : one->look.index > other->look.index;
}

enum rf_status add_up_places(struct rf_diagnosis *diagnosis, const struct candidates *candidates,
                             struct rf_error *error)
{
    size_t places = diagnosis->job->n_places, runs = n_runs(diagnosis->job);
    size_t n = 2 * places + runs + 1;
    double *shows = NEW_ARRAY(double, n), *missed = NEW_ARRAY(double, n);
    struct place_chance *chances = diagnosis->places = NEW_ARRAY(struct place_chance, n);
    if (shows == NULL || missed == NULL || chances == NULL) {
        free(shows);
        free(missed);
        return fail_memory(error);
    }
    struct adding adding = {
        .job = diagnosis->job,
        .shows = shows,
        .missed = missed,
        .first = chances,
        .open = chances,
        .check = chances + places,
        .run = chances + 2 * places,
        .board = chances + 2 * places + runs,
    };
    for (size_t i = 0; i < n; i++)
        missed[i] = 1.0;
    for (size_t i = 0; i < candidates->n; i++)
        add_hypothesis(&adding, diagnosis, &candidates->list[i], n);
    free(shows);
    free(missed);
    qsort(chances, n, sizeof *chances, by_chance);
    while (diagnosis->n_places < n &&
           diagnosis->places[diagnosis->n_places].chance >= confidence_shown)
        diagnosis->n_places++;
    return RF_OK;
}
