/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "faults/places.h"

#include <strings.h>

size_t next_point(const struct rf_job *job, size_t place)
{
    do
        place++;
    while (place < job->n_places && place_is_end(job, place));
    return place;
}

size_t next_front(const struct rf_job *job, size_t place)
{
    do
        place++;
    while (place < job->n_places && !place_has_front(job, place));
    return place;
}

bool setup_has_readings(const struct rf_job *job, size_t setup)
{
    for (size_t i = 0; i < job->n_readings; i++)
        if (job->readings[i].setup == setup)
            return true;
    return false;
}

void enumerate_runs(const struct fault_family *family, const struct rf_job *job, int n_conductors,
                    fault_callback *callback, void *context)
{
    for (size_t run = 0; run < n_runs(job); run++)
        for (int conductor = 0; conductor < n_conductors; conductor++) {
            struct fault fault = {.family = family, .run = run, .conductor = conductor};
            if (!callback(context, &fault))
                return;
        }
}

void enumerate_front_pairs(const struct fault_family *family, const struct rf_job *job,
                           fault_callback *callback, void *context)
{
    for (size_t place = next_front(job, 0); place < job->n_places; place = next_front(job, place))
        for (int pair = 0; pair < N_PAIRS; pair++) {
            struct fault fault = {.family = family, .place = place, .pair = (enum pair)pair};
            if (!callback(context, &fault))
                return;
        }
}

/* --- looks --- */

const char *const place_shares[1] = {"place"};

double place_share(const struct fault *fault, const struct rf_models *models)
{
    return family_share(models_family(models, fault->family->name), place_shares[0]);
}

void look_board(double share, look_callback *callback, void *context)
{
    struct look look = {.kind = LOOK_OPEN, .where = LOOK_AT_BOARD, .share = share};
    callback(context, &look);
}

void look_open(const struct rf_job *job, size_t place, double share, look_callback *callback,
               void *context)
{
    if (place_is_end(job, place)) {
        look_board(share, callback, context);
        return;
    }
    struct look look = {.kind = LOOK_OPEN, .where = LOOK_AT_PLACE, .index = place, .share = share};
    callback(context, &look);
}

void look_check(size_t place, double share, look_callback *callback, void *context)
{
    struct look look = {.kind = LOOK_CHECK, .where = LOOK_AT_PLACE, .index = place, .share = share};
    callback(context, &look);
}

void look_along_run(const struct rf_job *job, size_t run, double end, double inside,
                    look_callback *callback, void *context)
{
    look_open(job, run_near_end(job, run), end, callback, context);
    look_open(job, run_far_end(run), end, callback, context);
    if (inside > 0) {
        struct look look = {.kind = LOOK_OPEN, .where = LOOK_IN_RUN, .index = run, .share = inside};
        callback(context, &look);
    }
}

void span_run(const struct fault *fault, const struct rf_job *job, size_t *from, size_t *to)
{
    *from = run_near_end(job, fault->run);
    *to = run_far_end(fault->run);
}

void span_point(const struct fault *fault, const struct rf_job *job, size_t *from, size_t *to)
{
    (void)job;
    *from = *to = fault->place;
}

/* --- words --- */

const char *leg_word(bool leg_in)
{
    return leg_in ? "incoming" : "outgoing";
}

void say_place(const struct rf_job *job, size_t place, struct text *out)
{
    if (place_is_end(job, place)) {
        text_addf(out, "board (%s)", leg_word(place != place_out()));
        return;
    }
    const struct place *at = &job->places[place];
    text_add(out, at->id);
    if (at->label != NULL && at->label[0] != '\0' && strcasecmp(at->label, at->id) != 0)
        text_addf(out, " (%s)", at->label);
}

void say_in_run(const struct rf_job *job, size_t run, struct text *out)
{
    text_add(out, " in the run ");
    say_place(job, run_near_end(job, run), out);
    text_add(out, " to ");
    say_place(job, run_far_end(run), out);
}

void say_at(const struct rf_job *job, size_t place, struct text *out)
{
    text_add(out, " at ");
    say_place(job, place, out);
}

void say_pair(enum pair pair, struct text *out)
{
    text_addf(out, "%s and %s", conductor_words[pair_members[pair].first],
              conductor_words[pair_members[pair].second]);
}

void say_setup(size_t setup, struct text *out)
{
    const char *pair = pair_words[setups[setup].pair];
    if (setups[setup].joining == JOIN_CROSS)
        text_addf(out, "the crossed %s test", pair);
    else
        text_addf(out, "the %s test linked at the %s ends", pair,
                  leg_word(setups[setup].joining == JOIN_LINK_IN));
}
