/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "advice/looking.h"

#include "base/error.h"
#include "base/memory.h"

#include <math.h>
#include <string.h>

static const size_t NOT_LIVE = (size_t)-1;

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

size_t place_to_reach(const struct rf_job *job, const struct look *look)
{
    return look->where == LOOK_AT_BOARD ? job->n_places
           : look->where == LOOK_IN_RUN ? run_far_end(look->index)
                                        : look->index;
}

void looking_finish(struct looking *l)
{
    free(l->locations);
    free(l->showings);
    free(l->first_of_hypothesis);
    free(l->showings_at);
    free(l->first_at);
    free(l->weight);
    free(l->defect);
    free(l->reach_minutes);
    free(l->left);
    free(l->chance);
    free(l->looked);
    free(l->reached);
    free(l->live);
    free(l->rate);
    free(l->slot);
    free(l->steady);
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
        .reach = place_to_reach(job, look),
    };
    return l->n_locations++;
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
    if (looked_at(listing->diagnosis->job, look)) {
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
        if (!count_only)
            l->first_of_hypothesis[h] = l->n_showings;
        const struct hypothesis *hypothesis = &diagnosis->ranked[h].hypothesis;
        for (size_t part = 0; part < hypothesis->n_faults; part++) {
            const struct fault *fault = &hypothesis->faults[part];
            struct listing listing = {l, diagnosis, h, part, fault->family->each_enough,
                                      count_only};
            fault_looks(fault, diagnosis->job, diagnosis->models, list_showing, &listing);
        }
    }
    if (!count_only)
        l->first_of_hypothesis[l->n_hypotheses] = l->n_showings;
}

static void index_by_location(struct looking *l)
{
    size_t n = 0;
    for (size_t location = 0; location < l->n_locations; location++) {
        l->first_at[location] = n;
        for (size_t i = 0; i < l->n_showings; i++)
            if (l->showings[i].location == location)
                l->showings_at[n++] = i;
    }
    l->first_at[l->n_locations] = n;
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
        s->recorded_share = s->share;
    }
}

/* A hypothesis of one fault that shows in parts of one: a look that shows nothing leaves what would
 * show elsewhere as it is. */
static void find_steady(struct looking *l, const struct rf_diagnosis *diagnosis)
{
    for (size_t h = 0; h < l->n_hypotheses; h++) {
        double sum = 0.0;
        l->steady[h] = diagnosis->ranked[h].hypothesis.n_faults == 1;
        for (size_t i = l->first_of_hypothesis[h]; i < l->first_of_hypothesis[h + 1]; i++) {
            sum += l->showings[i].share;
            l->steady[h] = l->steady[h] && !l->showings[i].each_enough;
        }
        l->steady[h] = l->steady[h] && sum < 1.0 + 1e-9;
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
    l->first_of_hypothesis = NEW_ARRAY(size_t, n + 1);
    l->showings_at = NEW_ARRAY(size_t, l->n_showings);
    l->first_at = NEW_ARRAY(size_t, most_locations + 1);
    l->weight = NEW_ARRAY(double, l->n_showings);
    l->defect = NEW_ARRAY(bool, n);
    l->reach_minutes = NEW_ARRAY(double, l->n_reach);
    l->left = NEW_ARRAY(double, n *FAULTS_AT_ONCE);
    l->chance = NEW_ARRAY(double, most_locations);
    l->looked = NEW_ARRAY(bool, most_locations);
    l->reached = NEW_ARRAY(bool, l->n_reach);
    l->live = NEW_ARRAY(size_t, most_locations);
    l->rate = NEW_ARRAY(double, most_locations);
    l->slot = NEW_ARRAY(size_t, most_locations);
    l->steady = NEW_ARRAY(bool, n);
    if (l->locations == NULL || l->showings == NULL || l->first_of_hypothesis == NULL ||
        l->showings_at == NULL || l->first_at == NULL || l->weight == NULL || l->defect == NULL ||
        l->reach_minutes == NULL || l->left == NULL || l->chance == NULL || l->looked == NULL ||
        l->reached == NULL || l->live == NULL || l->rate == NULL || l->slot == NULL ||
        l->steady == NULL) {
        looking_finish(l);
        return fail_memory(error);
    }
    for (size_t h = 0; h < n; h++)
        l->defect[h] = diagnosis->ranked[h].hypothesis.n_faults > 0;
    for (size_t i = 0; i < n * FAULTS_AT_ONCE; i++)
        l->left[i] = 1.0;
    for (size_t place = 0; place < l->n_reach; place++)
        l->reach_minutes[place] = minutes_to_reach(job, place);
    for (size_t i = 0; i < most_locations; i++)
        l->slot[i] = NOT_LIVE;
    list_showings(l, diagnosis, false);
    condition_shares(l);
    find_steady(l, diagnosis);
    index_by_location(l);
    return RF_OK;
}

/* The weight of a hypothesis that would show by one of its showings, if one looked there now. */
static double showing_weight(const struct looking *l, const struct showing *s, double weight)
{
    const double *left = &l->left[s->hypothesis * FAULTS_AT_ONCE];
    if (l->looked[s->location])
        return 0.0;
    for (size_t part = 0; part < FAULTS_AT_ONCE; part++)
        if (part != s->part)
            weight *= left[part];
    return weight * (s->each_enough || left[s->part] < s->share ? left[s->part] : s->share);
}

static double cost_of(const struct looking *l, size_t location)
{
    const struct location *at = &l->locations[location];
    return at->minutes + (l->reached[at->reach] ? 0.0 : l->reach_minutes[at->reach]);
}

/* Puts a location's chance per minute in order; 0 where nothing would show more than rounding. */
static void update_rate(struct looking *l, size_t location)
{
    double cost = cost_of(l, location), chance = l->chance[location];
    bool shows = !l->looked[location] && chance > l->rounding;
    /* A look that costs nothing comes first. */
    l->rate[l->slot[location]] = shows ? chance / (cost > 1e-9 ? cost : 1e-9) : 0.0;
}

/* Puts a hypothesis' showings, and the chances they are part of, in order with what is left. */
static void update_hypothesis(struct looking *l, size_t hypothesis, double weight)
{
    for (size_t i = l->first_of_hypothesis[hypothesis]; i < l->first_of_hypothesis[hypothesis + 1];
         i++) {
        const struct showing *s = &l->showings[i];
        double now = showing_weight(l, s, weight);
        l->chance[s->location] += now - l->weight[i];
        l->weight[i] = now;
    }
}

/* Ties go by place, as the diagnosis lists them. */
static bool stands_before(const struct look *one, const struct look *other)
{
    return one->where != other->where ? one->where < other->where : one->index < other->index;
}

enum { LANES = 4 };

/* The highest rate of every fourth live location, so that the next search can pass over most. */
static double highest_rates(const struct looking *l, double most[LANES])
{
    size_t k = 0;
    for (size_t lane = 0; lane < LANES; lane++)
        most[lane] = 0.0;
    for (; k + LANES <= l->n_live; k += LANES)
        for (size_t lane = 0; lane < LANES; lane++)
            most[lane] = l->rate[k + lane] > most[lane] ? l->rate[k + lane] : most[lane];
    for (size_t lane = 0; k + lane < l->n_live; lane++)
        most[lane] = fmax(l->rate[k + lane], most[lane]);
    return fmax(fmax(most[0], most[1]), fmax(most[2], most[3]));
}

/* By chance per minute; n_locations where nothing would show. */
static size_t best_location(const struct looking *l)
{
    double highest[LANES];
    double most = highest_rates(l, highest), tied = most * (1.0 - 1e-9);
    size_t best = l->n_locations;
    for (size_t lane = 0; lane < LANES && most > 0.0; lane++)
        for (size_t k = lane; k < l->n_live && highest[lane] >= tied; k += LANES)
            if (l->rate[k] >= tied &&
                (best == l->n_locations ||
                 stands_before(&l->locations[l->live[k]].look, &l->locations[best].look)))
                best = l->live[k];
    return best;
}

static void rule_out(struct looking *l, size_t location, const double weights[])
{
    bool nearer = !l->reached[l->locations[location].reach] &&
                  l->reach_minutes[l->locations[location].reach] > 0.0;
    l->looked[location] = true;
    l->reached[l->locations[location].reach] = true;
    for (size_t k = l->first_at[location]; k < l->first_at[location + 1]; k++) {
        const struct showing *s = &l->showings[l->showings_at[k]];
        double *left = &l->left[s->hypothesis * FAULTS_AT_ONCE + s->part];
        if (weights[s->hypothesis] <= 0.0 || l->steady[s->hypothesis])
            continue;
        *left = s->each_enough || *left < s->share ? 0.0 : *left - s->share;
        update_hypothesis(l, s->hypothesis, weights[s->hypothesis]);
        for (size_t i = l->first_of_hypothesis[s->hypothesis];
             i < l->first_of_hypothesis[s->hypothesis + 1]; i++)
            update_rate(l, l->showings[i].location);
    }
    update_rate(l, location);
    for (size_t k = 0; nearer && k < l->n_live; k++)
        update_rate(l, l->live[k]);
}

/* Clears what the last belief left where it carried weight, which is often in few places. */
static void forget_last(struct looking *l)
{
    for (size_t k = 0; k < l->n_live; k++) {
        size_t location = l->live[k];
        l->slot[location] = NOT_LIVE;
        l->looked[location] = false;
        l->reached[l->locations[location].reach] = false;
    }
    l->n_live = 0;
}

static void list_live(struct looking *l, size_t location)
{
    if (l->slot[location] != NOT_LIVE)
        return;
    l->slot[location] = l->n_live;
    l->live[l->n_live++] = location;
    l->chance[location] = 0.0;
}

static void start_hypothesis(struct looking *l, size_t hypothesis, double weight)
{
    const size_t *first = &l->first_of_hypothesis[hypothesis];
    if (l->steady[hypothesis]) {
        for (size_t i = first[0]; i < first[1]; i++) {
            list_live(l, l->showings[i].location);
            l->chance[l->showings[i].location] += weight * l->showings[i].share;
        }
        return;
    }
    for (size_t part = 0; part < FAULTS_AT_ONCE; part++)
        l->left[hypothesis * FAULTS_AT_ONCE + part] = 1.0;
    for (size_t i = first[0]; i < first[1]; i++) {
        l->weight[i] = 0.0;
        list_live(l, l->showings[i].location);
    }
    update_hypothesis(l, hypothesis, weight);
}

static void start_anew(struct looking *l, const double weights[], double total)
{
    l->rounding = 1e-12 * total;
    forget_last(l);
    for (size_t h = 0; h < l->n_hypotheses; h++)
        if (weights[h] > 0.0)
            start_hypothesis(l, h, weights[h]);
    for (size_t k = 0; k < l->n_live; k++)
        update_rate(l, l->live[k]);
}

double looking_expected(struct looking *l, const double weights[], struct look_step steps[],
                        size_t most, size_t *n_steps)
{
    double defects = 0.0, none = 0.0, expected = 0.0;
    size_t n = 0;
    for (size_t h = 0; h < l->n_hypotheses; h++)
        *(l->defect[h] ? &defects : &none) += weights[h];
    double total = defects + none;
    start_anew(l, weights, total);
    while (defects > 0.0 && defects >= l->stop_share * (defects + none)) {
        size_t location = best_location(l);
        if (location == l->n_locations)
            break;
        double cost = cost_of(l, location), chance = l->chance[location];
        expected += cost * (defects + none) / total;
        if (steps != NULL && n < most)
            steps[n] = (struct look_step){.look = l->locations[location].look,
                                          .chance = chance / total,
                                          .minutes = cost,
                                          .expected = expected};
        n++;
        defects -= chance;
        rule_out(l, location, weights);
    }
    if (n_steps != NULL)
        *n_steps = n < most ? n : most;
    return expected;
}

size_t looking_best(struct looking *l, const double weights[], double *minutes)
{
    double total = 0.0;
    for (size_t h = 0; h < l->n_hypotheses; h++)
        total += weights[h];
    start_anew(l, weights, total);
    size_t location = best_location(l);
    if (location < l->n_locations)
        *minutes = cost_of(l, location);
    return location;
}

/* One part of a hypothesis did not show at a location. */
static void condition_part(struct looking *l, const struct showing *seen, double *weight)
{
    double left = seen->each_enough ? 0.0 : fmax(0.0, 1.0 - seen->share);
    *weight *= left;
    for (size_t i = l->first_of_hypothesis[seen->hypothesis];
         i < l->first_of_hypothesis[seen->hypothesis + 1]; i++) {
        struct showing *s = &l->showings[i];
        if (s->part != seen->part || s == seen || s->each_enough)
            continue;
        s->share = left > 1e-9 ? fmin(1.0, s->share / left) : 0.0;
    }
}

void looking_rule_out(struct looking *l, size_t location, double weights[])
{
    for (size_t k = l->first_at[location]; k < l->first_at[location + 1]; k++) {
        struct showing *seen = &l->showings[l->showings_at[k]];
        condition_part(l, seen, &weights[seen->hypothesis]);
        seen->share = 0.0;
    }
}

void looking_restore(struct looking *l)
{
    for (size_t i = 0; i < l->n_showings; i++)
        l->showings[i].share = l->showings[i].recorded_share;
}
