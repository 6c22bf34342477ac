/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "advice/measuring.h"

#include "base/memory.h"

#include <math.h>
#include <string.h>

/* How deep, and how wide: of a set-up's candidates only the best at looking one reading ahead are
 * looked into further. */
enum { MOST_DEPTH = 3 };
static const size_t beam[MOST_DEPTH + 1] = {0, 1, 3, 4}; /* by the depth left */
enum { SETUPS_DEEPENED = 6 };
/* Where more hypotheses than this carry weight, none carries much: three readings tell little more
 * than two of what to do first, and the search would grow with their square. */
enum { SEVERAL_HYPOTHESES = 40, DEPTH_FOR_MORE = 2 };

/* Predictions nearer than this many of their σ are one outcome. */
static const double one_outcome = 1.0;
/* Hypotheses below this share of the belief are left out of a reading's outcomes. */
static const double negligible = 1e-4;

/* The scratch of one level of the search. */
struct level {
    double *after;    /* MOST_OUTCOMES × n_hypotheses */
    double *value;    /* [candidate] one reading ahead */
    size_t *order;    /* [candidate] */
};

struct measuring {
    const struct rf_diagnosis *diagnosis;
    struct looking *looking;
    const struct predictive *predictive;
    size_t n_hypotheses, n;
    size_t depth;
    size_t *sorted;     /* [candidate · n_hypotheses] hypotheses by their mean, over range last */
    double *known;      /* [hypothesis] minutes of looking if it were known */
    size_t first[N_SETUPS + 1]; /* candidates of a set-up: first[s] … first[s+1]−1 */
    bool *taken;        /* [candidate] in the branch at hand */
    double *after_look; /* [hypothesis] */
    struct level levels[MOST_DEPTH + 1];
};

void measuring_destroy(struct measuring *m)
{
    if (m == NULL)
        return;
    for (size_t i = 0; i <= MOST_DEPTH; i++) {
        free(m->levels[i].after);
        free(m->levels[i].value);
        free(m->levels[i].order);
    }
    free(m->sorted);
    free(m->known);
    free(m->taken);
    free(m->after_look);
    free(m);
}

/* Insertion sort: some dozens of hypotheses, once a candidate. */
static void sort_by_mean(const struct measuring *m, size_t candidate, size_t *order)
{
    const double *mean = m->predictive->mean;
    for (size_t h = 0; h < m->n_hypotheses; h++) {
        double value = mean[h * m->n + candidate];
        size_t k = h;
        for (; k > 0; k--) {
            double before = mean[order[k - 1] * m->n + candidate];
            if (isnan(value) || before <= value)
                break;
            order[k] = order[k - 1];
        }
        order[k] = h;
    }
}

static void prepare(struct measuring *m)
{
    for (size_t c = 0; c < m->n; c++)
        sort_by_mean(m, c, m->sorted + c * m->n_hypotheses);
    for (size_t h = 0; h < m->n_hypotheses; h++) {
        double *alone = m->levels[0].after;
        memset(alone, 0, m->n_hypotheses * sizeof *alone);
        alone[h] = 1.0;
        m->known[h] = looking_expected(m->looking, alone, NULL, 0, NULL);
    }
    size_t c = 0;
    for (size_t setup = 0; setup < N_SETUPS; setup++) {
        m->first[setup] = c;
        while (c < m->n && m->predictive->candidates[c].setup == setup)
            c++;
    }
    m->first[N_SETUPS] = c;
}

struct measuring *measuring_create(const struct rf_diagnosis *diagnosis, struct looking *looking,
                                   const struct predictive *predictive)
{
    struct measuring *m = NEW(struct measuring);
    if (m == NULL)
        return NULL;
    size_t h = predictive->n_hypotheses, n = predictive->n;
    m->diagnosis = diagnosis;
    m->looking = looking;
    m->predictive = predictive;
    m->n_hypotheses = h;
    m->depth = h > SEVERAL_HYPOTHESES ? DEPTH_FOR_MORE : MOST_DEPTH;
    m->n = n;
    m->sorted = NEW_ARRAY(size_t, n * h);
    m->known = NEW_ARRAY(double, h);
    m->taken = NEW_ARRAY(bool, n);
    m->after_look = NEW_ARRAY(double, h);
    bool ok = m->sorted != NULL && m->known != NULL && m->taken != NULL && m->after_look != NULL;
    for (size_t i = 0; i <= MOST_DEPTH; i++) {
        struct level *level = &m->levels[i];
        level->after = NEW_ARRAY(double, h *MOST_OUTCOMES);
        level->value = NEW_ARRAY(double, n);
        level->order = NEW_ARRAY(size_t, n);
        ok = ok && level->after != NULL && level->value != NULL && level->order != NULL;
    }
    if (ok) {
        prepare(m);
        return m;
    }
    measuring_destroy(m);
    return NULL;
}

static double sum_of(const double *weights, size_t n)
{
    double sum = 0.0;
    for (size_t i = 0; i < n; i++)
        sum += weights[i];
    return sum;
}

/* Where the outcomes lie: means of hypotheses that carry weight, those near one another as one. */
static size_t place_outcomes(const struct measuring *m, const double weights[], double total,
                             size_t candidate, double width, struct shown_outcome outcomes[],
                             bool *too_many)
{
    const struct predictive *p = m->predictive;
    const size_t *order = m->sorted + candidate * m->n_hypotheses;
    size_t n = 0;
    double start = 0.0, weight = 0.0, moment = 0.0;
    bool open = false;
    *too_many = false;
    for (size_t k = 0; k < m->n_hypotheses; k++) {
        size_t h = order[k];
        double mean = p->mean[h * m->n + candidate], sigma = p->sigma[h * m->n + candidate];
        if (weights[h] <= negligible * total)
            continue;
        if (isnan(mean)) {
            open = true;
            continue;
        }
        if (n == 0 || mean - start > width * sigma) {
            if (n == MOST_OUTCOMES - 1) {
                *too_many = true;
                return n;
            }
            outcomes[n++] = (struct shown_outcome){0};
            start = mean;
            weight = moment = 0.0;
        }
        weight += weights[h];
        moment += weights[h] * mean;
        outcomes[n - 1].ohms = moment / weight;
    }
    if (open)
        outcomes[n++] = (struct shown_outcome){.open = true};
    return n;
}

/* How each hypothesis spreads over the outcomes; rows sum to 1. */
static void spread_over(const struct measuring *m, size_t h, size_t candidate,
                        const struct shown_outcome outcomes[], size_t n, double share[])
{
    const struct instrument_model *in = &m->diagnosis->models->instrument;
    double mean = m->predictive->mean[h * m->n + candidate];
    double sigma = m->predictive->sigma[h * m->n + candidate], sum = 0.0;
    double missed = isnan(mean) ? in->open_wrong : in->misread + in->open_wrong;
    for (size_t o = 0; o < n; o++) {
        if (isnan(mean) || outcomes[o].open) {
            share[o] = isnan(mean) && outcomes[o].open ? 1.0 : 0.0;
        } else {
            double z = (outcomes[o].ohms - mean) / sigma;
            share[o] = exp(-0.5 * z * z);
        }
        sum += share[o];
    }
    /* A prediction far from every outcome belongs to a hypothesis left out of placing them. */
    for (size_t o = 0; o < n; o++)
        share[o] = (sum > 1e-12 ? (1.0 - missed) * share[o] / sum : (1.0 - missed) / (double)n) +
                   missed / (double)n;
}

size_t measuring_outcomes(struct measuring *m, const double weights[], size_t candidate,
                          struct shown_outcome outcomes[], double after[])
{
    double total = sum_of(weights, m->n_hypotheses), width = one_outcome;
    bool too_many = true;
    size_t n = 0;
    for (; too_many; width *= 1.7)
        n = place_outcomes(m, weights, total, candidate, width, outcomes, &too_many);
    double share[MOST_OUTCOMES];
    for (size_t h = 0; h < m->n_hypotheses; h++) {
        if (weights[h] <= negligible * total) {
            for (size_t o = 0; o < n; o++)
                after[o * m->n_hypotheses + h] = 0.0;
            continue;
        }
        spread_over(m, h, candidate, outcomes, n, share);
        for (size_t o = 0; o < n; o++) {
            double w = weights[h] * share[o];
            after[o * m->n_hypotheses + h] = w;
            outcomes[o].chance += w;
        }
    }
    return n;
}

/* Minutes of the candidate's reading as the next in its set-up. */
static double cost_of(const struct measuring *m, size_t candidate, bool first)
{
    const struct predictive *p = m->predictive;
    const struct measurement *read = &p->candidates[candidate];
    const struct effort_model *effort = &m->diagnosis->models->effort;
    double minutes = first ? p->minutes[candidate] : minutes_of_reading(effort, read, true);
    if (read->spot == SPOT_POINT)
        minutes += minutes_to_reach(m->diagnosis->job, read->place);
    return minutes;
}

static double value_of(struct measuring *m, const double weights[], size_t setup, size_t depth,
                       bool first);

/* Per unit of weight: the reading's cost, and what is expected after it. Where that is not below
 * `limit`, any value that is not. */
static double value_after(struct measuring *m, const double weights[], double total,
                          size_t candidate, size_t depth, bool first, double limit)
{
    struct shown_outcome outcomes[MOST_OUTCOMES];
    double *after = m->levels[depth].after;
    size_t n = measuring_outcomes(m, weights, candidate, outcomes, after);
    double value = 0.0, cost = cost_of(m, candidate, first);
    if (n < 2)
        return INFINITY; /* tells nothing */
    m->taken[candidate] = true;
    for (size_t o = 0; o < n && cost + value / total < limit; o++)
        if (outcomes[o].chance > 0.0)
            value += outcomes[o].chance * value_of(m, after + o * m->n_hypotheses,
                                                   m->predictive->candidates[candidate].setup,
                                                   depth - 1, false);
    m->taken[candidate] = false;
    return cost + value / total;
}

/*
 * The set-up's candidates that are best one reading ahead, at most `most` of them and none that is
 * not below `limit`, with their values, in order; returns how many. Others need no looking into:
 * more readings only improve a candidate.
 */
static size_t survey(struct measuring *m, const double weights[], double total, size_t setup,
                     bool first, size_t most, double limit, struct level *level)
{
    size_t n = 0;
    for (size_t c = m->first[setup]; c < m->first[setup + 1]; c++) {
        if (m->taken[c])
            continue;
        double value = value_after(m, weights, total, c, 1, first, limit);
        level->value[c] = value;
        if (!(value < limit))
            continue;
        size_t k = n < most ? n++ : n - 1;
        for (; k > 0 && level->value[level->order[k - 1]] > value; k--)
            level->order[k] = level->order[k - 1];
        level->order[k] = c;
        if (n == most)
            limit = level->value[level->order[n - 1]];
    }
    return n;
}

/* What looking costs if readings told everything: no plan is better. */
static double best_conceivable(const struct measuring *m, const double weights[], double total)
{
    double sum = 0.0;
    for (size_t h = 0; h < m->n_hypotheses; h++)
        sum += weights[h] * m->known[h];
    return sum / total;
}

static double cheapest_reading(const struct measuring *m)
{
    const struct effort_model *e = &m->diagnosis->models->effort;
    return fmin(fmin(e->reading_at_board, e->reading_at_point), e->wander_next);
}

static double value_of(struct measuring *m, const double weights[], size_t setup, size_t depth,
                       bool first)
{
    if (depth == 0)
        return looking_expected(m->looking, weights, NULL, 0, NULL);
    double total = sum_of(weights, m->n_hypotheses);
    double best = looking_expected(m->looking, weights, NULL, 0, NULL);
    if (best - best_conceivable(m, weights, total) <= cheapest_reading(m))
        return best;
    struct level *level = &m->levels[depth];
    size_t n = survey(m, weights, total, setup, first, beam[depth],
                      depth > 1 ? INFINITY : best, level);
    if (n > 0)
        best = fmin(best, level->value[level->order[0]]);
    for (size_t k = 0; k < n && depth > 1; k++)
        best = fmin(best, value_after(m, weights, total, level->order[k], depth, first, best));
    return best;
}

static double cost_of_change(const struct measuring *m, size_t setup)
{
    return setup == m->diagnosis->job->setup_in_place
               ? 0.0
               : m->diagnosis->models->effort.change_of_setup;
}

static int by_value(const void *a, const void *b)
{
    const struct choice *one = a, *other = b;
    if (one->value != other->value)
        return one->value < other->value ? -1 : 1;
    return one->setup < other->setup ? -1 : one->setup > other->setup;
}

/* Looks into a set-up as deep as it goes, from its best candidates one reading ahead. */
static void deepen(struct measuring *m, const double weights[], double total, struct choice *choice)
{
    struct level *level = &m->levels[m->depth];
    size_t n = survey(m, weights, total, choice->setup, true, beam[m->depth], INFINITY, level);
    double change = cost_of_change(m, choice->setup);
    for (size_t k = 0; k < n; k++) {
        size_t c = level->order[k];
        double value = change + value_after(m, weights, total, c, m->depth, true,
                                            choice->value - change);
        if (value < choice->value) {
            choice->value = value;
            choice->candidate = c;
        }
    }
}

size_t measuring_choose(struct measuring *m, const double weights[], struct choice choices[])
{
    double total = sum_of(weights, m->n_hypotheses);
    double look = looking_expected(m->looking, weights, NULL, 0, NULL);
    double most_saved = look - best_conceivable(m, weights, total);
    struct level *level = &m->levels[MOST_DEPTH];
    size_t n = 0;
    for (size_t setup = 0; setup < N_SETUPS; setup++) {
        double change = cost_of_change(m, setup);
        if (most_saved <= change + cheapest_reading(m) ||
            survey(m, weights, total, setup, true, 1, INFINITY, level) == 0)
            continue;
        size_t c = level->order[0];
        choices[n++] = (struct choice){setup, c, change + level->value[c]};
    }
    qsort(choices, n, sizeof *choices, by_value);
    for (size_t i = 0; i < n && i < SETUPS_DEEPENED; i++)
        deepen(m, weights, total, &choices[i]);
    qsort(choices, n, sizeof *choices, by_value);
    size_t saving = 0;
    while (saving < n && choices[saving].value < look)
        saving++;
    return saving;
}

double measuring_look_first(struct measuring *m, const double weights[], double to_beat)
{
    struct choice choices[N_SETUPS];
    double total = sum_of(weights, m->n_hypotheses), minutes = 0.0;
    size_t location = looking_best(m->looking, weights, &minutes);
    if (location == m->looking->n_locations)
        return INFINITY;
    double *after = m->after_look;
    memcpy(after, weights, m->n_hypotheses * sizeof *after);
    looking_rule_out(m->looking, location, after);
    double left = sum_of(after, m->n_hypotheses), value = 0.0;
    if (left > 0.0)
        value = best_conceivable(m, after, left);
    if (left > 0.0 && minutes + value * left / total < to_beat) {
        value = looking_expected(m->looking, after, NULL, 0, NULL);
        if (measuring_choose(m, after, choices) > 0)
            value = choices[0].value;
    }
    looking_restore(m->looking);
    return minutes + value * left / total;
}

size_t measuring_follow(struct measuring *m, const double weights[], size_t candidate,
                        size_t follow[], size_t most)
{
    size_t setup = m->predictive->candidates[candidate].setup, n = 0;
    double *belief = m->levels[0].after; /* unused by value_after at depth 1 and deeper */
    struct shown_outcome outcomes[MOST_OUTCOMES];
    memcpy(belief, weights, m->n_hypotheses * sizeof *belief);
    for (size_t next = candidate; n <= most; n++) {
        double *after = m->levels[MOST_DEPTH].after;
        size_t n_outcomes = measuring_outcomes(m, belief, next, outcomes, after), likeliest = 0;
        for (size_t o = 1; o < n_outcomes; o++)
            if (outcomes[o].chance > outcomes[likeliest].chance)
                likeliest = o;
        memcpy(belief, after + likeliest * m->n_hypotheses, m->n_hypotheses * sizeof *belief);
        m->taken[next] = true;
        if (n > 0)
            follow[n - 1] = next;
        struct level *level = &m->levels[2];
        double total = sum_of(belief, m->n_hypotheses);
        double look = looking_expected(m->looking, belief, NULL, 0, NULL);
        if (n == most || survey(m, belief, total, setup, false, 1, INFINITY, level) == 0 ||
            level->value[level->order[0]] >= look)
            break;
        next = level->order[0];
    }
    for (size_t i = 0; i < n; i++)
        m->taken[follow[i]] = false;
    m->taken[candidate] = false;
    return n;
}
