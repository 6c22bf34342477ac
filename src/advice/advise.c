/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "advice/steps.h"

#include "base/error.h"
#include "base/memory.h"

#include <math.h>
#include <string.h>

enum {
    READ_PLANS_MOST = 3,   /* the advice, and up to two other set-ups */
    HYPOTHESES_MOST = 100, /* that the plan weighs */
    READS_NAMED = 3        /* of a plan: the first, and what would follow */
};

/* The plan weighs the likeliest that make up this share of the confidence listed. */
static const double share_weighed = 0.995;

/* A reading is worth advising when it saves at least this many minutes: below, the estimate is
 * noise, and looking is at least sure. */
static const double worth_saving = 0.1;

void rf_advice_destroy(struct rf_advice *advice)
{
    if (advice == NULL)
        return;
    for (size_t i = 0; i < advice->n_plans; i++) {
        struct plan *plan = &advice->plans[i];
        for (size_t o = 0; o < plan->n_outcomes; o++)
            free(plan->outcomes[o].words);
        free(plan->outcomes);
        free(plan->reads);
        free(plan->words);
    }
    for (size_t i = 0; i < advice->n_lifts; i++)
        free(advice->lifts[i].words);
    free(advice->plans);
    free(advice->steps);
    free(advice->lifts);
    free(advice->stop_words);
    free(advice);
}

struct planning {
    struct rf_advice *advice;
    const struct rf_diagnosis *diagnosis;
    size_t n; /* hypotheses weighed */
    double *weights;
    double *after; /* MOST_OUTCOMES × n */
    struct looking looking;
    struct predictive predictive;
    struct measuring *measuring;
};

static void finish_planning(struct planning *p)
{
    measuring_destroy(p->measuring);
    predictive_finish(&p->predictive);
    looking_finish(&p->looking);
    free(p->weights);
    free(p->after);
}

static size_t how_many_to_weigh(const struct rf_diagnosis *diagnosis)
{
    double total = 0.0, sum = 0.0;
    size_t n = 0;
    for (size_t i = 0; i < diagnosis->n_ranked; i++)
        total += diagnosis->ranked[i].confidence;
    while (n < diagnosis->n_ranked && n < HYPOTHESES_MOST && sum < share_weighed * total)
        sum += diagnosis->ranked[n++].confidence;
    return n;
}

static enum rf_status init_planning(struct planning *p, struct rf_error *error)
{
    const struct rf_diagnosis *diagnosis = p->diagnosis;
    p->n = how_many_to_weigh(diagnosis);
    p->weights = NEW_ARRAY(double, p->n);
    p->after = NEW_ARRAY(double, p->n *MOST_OUTCOMES);
    if (p->weights == NULL || p->after == NULL)
        return fail_memory(error);
    double sum = 0.0;
    for (size_t i = 0; i < p->n; i++)
        sum += diagnosis->ranked[i].confidence;
    for (size_t i = 0; i < p->n; i++)
        p->weights[i] = diagnosis->ranked[i].confidence / sum;
    return looking_init(&p->looking, diagnosis, p->n, error);
}

static enum rf_status order_looks(struct planning *p, struct rf_error *error)
{
    struct rf_advice *advice = p->advice;
    advice->steps = NEW_ARRAY(struct look_step, p->looking.n_locations);
    if (advice->steps == NULL)
        return fail_memory(error);
    advice->look_now = looking_expected(&p->looking, p->weights, advice->steps,
                                        p->looking.n_locations, &advice->n_steps);
    for (size_t i = 0; i < p->n; i++)
        if (p->looking.defect[i])
            advice->defect_chance += p->weights[i];
    return RF_OK;
}

enum rf_status order_of_looking(const struct rf_diagnosis *diagnosis, struct look_step **steps,
                                size_t *n_steps, struct rf_error *error)
{
    struct rf_advice advice = {.diagnosis = diagnosis};
    struct planning planning = {.advice = &advice, .diagnosis = diagnosis};
    enum rf_status status = init_planning(&planning, error);
    if (status == RF_OK)
        status = order_looks(&planning, error);
    finish_planning(&planning);
    *steps = advice.steps;
    *n_steps = advice.n_steps;
    return status;
}

static int by_chance(const void *a, const void *b)
{
    const struct outcome *one = a, *other = b;
    return one->chance > other->chance ? -1 : one->chance < other->chance;
}

static double minutes_of_plan(const struct planning *p, const struct plan *plan)
{
    const struct effort_model *effort = &p->diagnosis->models->effort;
    bool lead_out = lead_is_out(p->diagnosis->job);
    double minutes = plan->setup_in_place ? 0.0 : effort->change_of_setup;
    for (size_t i = 0; i < plan->n_reads; i++) {
        const struct measurement *read = &plan->reads[i];
        minutes += minutes_of_reading(effort, read, lead_out || i > 0);
        if (read->spot == SPOT_POINT)
            minutes += minutes_to_reach(p->diagnosis->job, read->place);
    }
    return minutes;
}

/* The first reading, and those that would follow down the likeliest outcomes. */
static bool list_reads(struct planning *p, struct plan *plan, size_t candidate)
{
    plan->reads = NEW_ARRAY(struct measurement, READS_NAMED);
    if (plan->reads == NULL)
        return false;
    size_t reads[READS_NAMED] = {candidate};
    plan->n_reads =
        1 + measuring_follow(p->measuring, p->weights, candidate, reads + 1, READS_NAMED - 1);
    for (size_t i = 0; i < plan->n_reads; i++)
        plan->reads[i] = p->predictive.candidates[reads[i]];
    return true;
}

static bool add_read_plan(struct planning *p, const struct choice *choice)
{
    struct plan *plan = &p->advice->plans[p->advice->n_plans++];
    struct shown_outcome shown[MOST_OUTCOMES];
    plan->action = ACTION_READ;
    plan->setup = choice->setup;
    plan->setup_in_place = choice->setup == p->diagnosis->job->setup_in_place;
    plan->saves = p->advice->look_now - choice->value;
    if (!list_reads(p, plan, choice->candidate))
        return false;
    plan->minutes = minutes_of_plan(p, plan);
    size_t n = measuring_outcomes(p->measuring, p->weights, choice->candidate, shown, p->after);
    plan->outcomes = NEW_ARRAY(struct outcome, n);
    if (plan->outcomes == NULL)
        return false;
    plan->n_outcomes = n;
    for (size_t o = 0; o < n; o++)
        plan->outcomes[o] = (struct outcome){
            .open = shown[o].open, .ohms = shown[o].ohms, .chance = shown[o].chance};
    if (!write_read_words(p->diagnosis, plan, p->n, p->after))
        return false;
    qsort(plan->outcomes, n, sizeof *plan->outcomes, by_chance);
    return true;
}

static bool add_look_plan(struct planning *p)
{
    const struct look_step *first = &p->advice->steps[0];
    struct plan *plan = &p->advice->plans[p->advice->n_plans++];
    plan->action = ACTION_LOOK;
    plan->look = first->look;
    plan->minutes = first->minutes;
    return write_look_words(p->diagnosis, plan);
}

/* The best first: readings that save most against looking only; or a look, where none does, or where
 * looking at one place and then going on as best one can is better still. */
static enum rf_status choose_plans(struct planning *p, struct rf_error *error)
{
    struct rf_advice *advice = p->advice;
    struct choice choices[N_SETUPS];
    size_t n = measuring_choose(p->measuring, p->weights, choices);
    bool ok = true, can_look = advice->n_steps > 0;
    advice->plans = NEW_ARRAY(struct plan, READ_PLANS_MOST + 1);
    if (advice->plans == NULL)
        return fail_memory(error);
    while (n > 0 && advice->look_now - choices[n - 1].value < worth_saving)
        n--;
    advice->measure_first = n > 0 ? choices[0].value : advice->look_now;
    bool look_first =
        can_look && (n == 0 || measuring_look_first(p->measuring, p->weights, choices[0].value) <
                                   choices[0].value);
    if (look_first)
        ok = add_look_plan(p);
    for (size_t i = 0; i < n && i < READ_PLANS_MOST && ok; i++)
        ok = add_read_plan(p, &choices[i]);
    if (can_look && !look_first && ok)
        ok = add_look_plan(p);
    advice->stop = advice->n_plans == 0;
    if (advice->stop && ok)
        ok = write_stop_words(advice);
    return ok ? RF_OK : fail_memory(error);
}

enum rf_status rf_advise(const struct rf_diagnosis *diagnosis, struct rf_advice **result,
                         struct rf_error *error)
{
    *result = NULL;
    struct rf_advice *advice = NEW(struct rf_advice);
    if (advice == NULL)
        return fail_memory(error);
    advice->diagnosis = diagnosis;
    struct planning planning = {.advice = advice, .diagnosis = diagnosis};
    enum rf_status status = init_planning(&planning, error);
    if (status == RF_OK)
        status = order_looks(&planning, error);
    if (status == RF_OK)
        status = predictive_init(&planning.predictive, diagnosis, planning.n, error);
    if (status == RF_OK) {
        planning.measuring =
            measuring_create(diagnosis, &planning.looking, &planning.predictive);
        status = planning.measuring == NULL ? fail_memory(error) : choose_plans(&planning, error);
    }
    if (status == RF_OK)
        status = seek_lifts(advice, &planning.predictive, error);
    finish_planning(&planning);
    if (status == RF_OK)
        *result = advice;
    else
        rf_advice_destroy(advice);
    return status;
}

size_t rf_advice_plans(const struct rf_advice *advice)
{
    return advice->n_plans;
}

const char *rf_advice_words(const struct rf_advice *advice, size_t i)
{
    return advice->plans[i].words;
}

double rf_advice_look_now(const struct rf_advice *advice)
{
    return advice->look_now;
}

double rf_advice_measure_first(const struct rf_advice *advice)
{
    return advice->measure_first;
}
