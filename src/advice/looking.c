/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "advice/looking.h"

#include "base/error.h"
#include "base/memory.h"

#include <math.h>
#include <string.h>

double minutes_of_look(const struct rf_job *job, const struct effort_model *effort,
                       const struct look *look)
{
    if (look->where == LOOK_IN_RUN)
        return effort->open_run;
    if (look->where == LOOK_AT_BOARD)
        return isnan(job->board_open_minutes) ? effort->open_board : job->board_open_minutes;
    if (look->kind == LOOK_CHECK)
        return effort->check_face;
    const struct place *place = &job->places[look->index];
    if (!isnan(place->open_minutes))
        return place->open_minutes;
    return place->kind == KIND_JUNCTION_BOX ? effort->open_junction_box : effort->open_accessory;
}

double minutes_to_reach(const struct rf_job *job, size_t place)
{
    return place == job->n_places ? job->board_reach_minutes : job->places[place].reach_minutes;
}

void looking_finish(struct looking *l)
{
    free(l->locations);
    free(l->showings);
    free(l->defect);
    free(l->reach_minutes);
    free(l->left);
    free(l->chance);
    free(l->looked);
    free(l->reached);
    *l = (struct looking){0};
}

struct listing {
    struct looking *looking;
    const struct rf_diagnosis *diagnosis;
    size_t hypothesis, part;
    bool each_enough;
    bool count_only;
};

static bool same_location(const struct look *one, const struct look *other)
{
    return one->kind == other->kind && one->where == other->where && one->index == other->index;
}

static size_t locate(struct listing *listing, const struct look *look)
{
    struct looking *l = listing->looking;
    const struct rf_job *job = listing->diagnosis->job;
    for (size_t i = 0; i < l->n_locations; i++)
        if (same_location(&l->locations[i].look, look))
            return i;
    l->locations[l->n_locations] = (struct location){
        .look = *look,
        .minutes = minutes_of_look(job, &listing->diagnosis->models->effort, look),
        /* A run is reached from the place it leads to. */
        .reach = look->where == LOOK_AT_BOARD ? job->n_places
                 : look->where == LOOK_IN_RUN ? run_far_end(look->index)
                                              : look->index,
    };
    return l->n_locations++;
}

static bool looked_at_already(const struct rf_job *job, const struct look *look)
{
    if (look->where == LOOK_AT_BOARD)
        return job->board_opened;
    if (look->where == LOOK_IN_RUN)
        return false;
    return look->kind == LOOK_OPEN ? job->places[look->index].opened
                                   : job->places[look->index].checked;
}

static void list_showing(void *context, const struct look *look)
{
    struct listing *listing = context;
    struct looking *l = listing->looking;
    if (look->share <= 0.0)
        return;
    if (listing->count_only) {
        l->n_showings++;
        return;
    }
    double *left = &l->left[listing->hypothesis * FAULTS_AT_ONCE + listing->part];
    if (looked_at_already(listing->diagnosis->job, look)) {
        *left = listing->each_enough ? 0.0 : *left - look->share;
        return;
    }
    l->showings[l->n_showings++] = (struct showing){
        .hypothesis = listing->hypothesis,
        .part = listing->part,
        .location = locate(listing, look),
        .share = look->share,
        .each_enough = listing->each_enough,
    };
}

static void list_showings(struct looking *l, const struct rf_diagnosis *diagnosis, bool count_only)
{
    l->n_showings = 0;
    for (size_t h = 0; h < l->n_hypotheses; h++) {
        const struct hypothesis *hypothesis = &diagnosis->ranked[h].hypothesis;
        for (size_t part = 0; part < hypothesis->n_faults; part++) {
            const struct fault *fault = &hypothesis->faults[part];
            struct listing listing = {l, diagnosis, h, part, fault->family->each_enough,
                                      count_only};
            fault_looks(fault, diagnosis->job, diagnosis->models, list_showing, &listing);
        }
    }
}

/* The confidences already know of the places looked at; shares are made conditional on that, so
 * that they are shares of what is left. */
static void condition_shares(struct looking *l)
{
    for (size_t i = 0; i < l->n_showings; i++) {
        struct showing *s = &l->showings[i];
        double left = l->left[s->hypothesis * FAULTS_AT_ONCE + s->part];
        if (!s->each_enough && left > 0.0)
            s->share = fmin(1.0, s->share / left);
    }
}

enum rf_status looking_init(struct looking *l, const struct rf_diagnosis *diagnosis, size_t n,
                            struct rf_error *error)
{
    const struct rf_job *job = diagnosis->job;
    *l = (struct looking){.n_hypotheses = n,
                          .n_reach = job->n_places + 1,
                          .stop_share = diagnosis->models->effort.stop_share};
    list_showings(l, diagnosis, true);
    size_t most_locations = 2 * job->n_places + n_runs(job) + 1;
    l->locations = NEW_ARRAY(struct location, most_locations);
    l->showings = NEW_ARRAY(struct showing, l->n_showings);
    l->defect = NEW_ARRAY(bool, n);
    l->reach_minutes = NEW_ARRAY(double, l->n_reach);
    l->left = NEW_ARRAY(double, n *FAULTS_AT_ONCE);
    l->chance = NEW_ARRAY(double, most_locations);
    l->looked = NEW_ARRAY(bool, most_locations);
    l->reached = NEW_ARRAY(bool, l->n_reach);
    if (l->locations == NULL || l->showings == NULL || l->defect == NULL ||
        l->reach_minutes == NULL || l->left == NULL || l->chance == NULL || l->looked == NULL ||
        l->reached == NULL) {
        looking_finish(l);
        return fail_memory(error);
    }
    for (size_t h = 0; h < n; h++)
        l->defect[h] = diagnosis->ranked[h].hypothesis.n_faults > 0;
    for (size_t i = 0; i < n * FAULTS_AT_ONCE; i++)
        l->left[i] = 1.0;
    for (size_t place = 0; place < l->n_reach; place++)
        l->reach_minutes[place] = minutes_to_reach(job, place);
    list_showings(l, diagnosis, false);
    condition_shares(l);
    return RF_OK;
}

/* What is left of a hypothesis' parts but one. */
static double others_left(const struct looking *l, size_t hypothesis, size_t part)
{
    double product = 1.0;
    for (size_t p = 0; p < FAULTS_AT_ONCE; p++)
        if (p != part)
            product *= l->left[hypothesis * FAULTS_AT_ONCE + p];
    return product;
}

/* The weight that would show at each location if one looked there now. */
static void count_chances(struct looking *l, const double weights[])
{
    memset(l->chance, 0, l->n_locations * sizeof *l->chance);
    for (size_t i = 0; i < l->n_showings; i++) {
        const struct showing *s = &l->showings[i];
        double weight = weights[s->hypothesis];
        if (weight <= 0.0 || l->looked[s->location])
            continue;
        double left = l->left[s->hypothesis * FAULTS_AT_ONCE + s->part];
        l->chance[s->location] += weight * others_left(l, s->hypothesis, s->part) *
                                  (s->each_enough ? left : fmin(s->share, left));
    }
}

static double cost_of(const struct looking *l, size_t location)
{
    const struct location *at = &l->locations[location];
    return at->minutes + (l->reached[at->reach] ? 0.0 : l->reach_minutes[at->reach]);
}

static size_t best_location(const struct looking *l)
{
    size_t best = l->n_locations;
    double most = 0.0;
    for (size_t i = 0; i < l->n_locations; i++) {
        /* A look that costs nothing comes first. */
        double rate = l->chance[i] / fmax(cost_of(l, i), 1e-9);
        if (l->chance[i] > 0.0 && rate > most) {
            most = rate;
            best = i;
        }
    }
    return best;
}

static void rule_out(struct looking *l, size_t location)
{
    l->looked[location] = true;
    l->reached[l->locations[location].reach] = true;
    for (size_t i = 0; i < l->n_showings; i++) {
        const struct showing *s = &l->showings[i];
        if (s->location != location)
            continue;
        double *left = &l->left[s->hypothesis * FAULTS_AT_ONCE + s->part];
        *left = s->each_enough ? 0.0 : fmax(0.0, *left - s->share);
    }
}

double looking_expected(struct looking *l, const double weights[], struct look_step steps[],
                        size_t most, size_t *n_steps)
{
    double defects = 0.0, none = 0.0, expected = 0.0;
    size_t n = 0;
    for (size_t h = 0; h < l->n_hypotheses; h++)
        *(l->defect[h] ? &defects : &none) += weights[h];
    double total = defects + none;
    for (size_t i = 0; i < l->n_hypotheses * FAULTS_AT_ONCE; i++)
        l->left[i] = 1.0;
    memset(l->looked, 0, l->n_locations * sizeof *l->looked);
    memset(l->reached, 0, l->n_reach * sizeof *l->reached);
    while (defects > 0.0 && defects >= l->stop_share * (defects + none)) {
        count_chances(l, weights);
        size_t location = best_location(l);
        if (location == l->n_locations)
            break;
        double cost = cost_of(l, location);
        expected += cost * (defects + none) / total;
        if (steps != NULL && n < most)
            steps[n] = (struct look_step){.look = l->locations[location].look,
                                          .chance = l->chance[location] / total,
                                          .minutes = cost,
                                          .expected = expected};
        n++;
        defects -= l->chance[location];
        rule_out(l, location);
    }
    if (n_steps != NULL)
        *n_steps = n < most ? n : most;
    return expected;
}
