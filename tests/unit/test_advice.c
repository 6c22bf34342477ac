/* SPDX-License-Identifier: GPL-3.0-or-later */

/*
 * The order of looking against all orders there are; expected minutes against games played out; what
 * readings are predicted to show against what simulated ones do; efforts by hand. All rings are
 * invented.
 */

#include "advice/looking.h"
#include "advice/predictive.h"

#include "../hypotheses.h"

#include <gsl/gsl_permutation.h>
#include <gsl/gsl_randist.h>
#include <math.h>

static gsl_rng *generator;

static void set_up(void)
{
    load_models();
    generator = gsl_rng_alloc(gsl_rng_mt19937);
    ck_assert_ptr_nonnull(generator);
}

static void tear_down(void)
{
    gsl_rng_free(generator);
    unload_models();
}

/* --- the order of looking --- */

enum { PLACES = 7, RANKED_MOST = 32 };

/* A ring of seven points, each taking its own time to take off. */
static struct rf_job *ring_with_access(double minutes[])
{
    char more[256];
    size_t used = (size_t)snprintf(more, sizeof more, ", \"access\": {");
    for (size_t i = 0; i < PLACES; i++) {
        minutes[i] = floor(2 + 28 * gsl_rng_uniform(generator));
        used += (size_t)snprintf(more + used, sizeof more - used, "%s\"P%zu\": %.0f",
                                 i > 0 ? ", " : "", i + 1, minutes[i]);
    }
    snprintf(more + used, sizeof more - used, "}");
    return job_of("\"points\": [{\"id\": \"P1\"}, {\"id\": \"P2\"}, {\"id\": \"P3\"}, {\"id\": \"P4\"},"
                  "{\"id\": \"P5\"}, {\"id\": \"P6\"}, {\"id\": \"P7\"}]",
                  "\"cross_ln\": {\"P1\": 0.3}", more);
}

/* A diagnosis of nothing but hypotheses and their weights. */
struct belief {
    struct rf_diagnosis diagnosis;
    struct ranked ranked[RANKED_MOST];
    double weights[RANKED_MOST];
};

static void believe(struct belief *belief, const struct rf_job *job)
{
    memset(belief, 0, sizeof *belief);
    belief->diagnosis.job = job;
    belief->diagnosis.models = models;
    belief->diagnosis.ranked = belief->ranked;
}

static void add_hypothesis(struct belief *belief, const char *fields, double weight)
{
    size_t i = belief->diagnosis.n_ranked++;
    ck_assert_uint_lt(i, RANKED_MOST);
    belief->ranked[i].hypothesis = hypothesis_of(belief->diagnosis.job, fields);
    belief->weights[i] = weight;
}

/* Minutes expected in one order of places, the defect being at each with its chance. */
static double minutes_in_order(const size_t order[], const double chance[], const double minutes[],
                               double total)
{
    double left = total, sum = 0;
    for (size_t i = 0; i < PLACES; i++) {
        sum += minutes[order[i]] * left / total;
        left -= chance[order[i]];
    }
    return sum;
}

static double best_of_all_orders(const double chance[], const double minutes[], double total)
{
    gsl_permutation *order = gsl_permutation_calloc(PLACES);
    double best = INFINITY;
    do
        best = fmin(best, minutes_in_order(gsl_permutation_data(order), chance, minutes, total));
    while (gsl_permutation_next(order) == GSL_SUCCESS);
    gsl_permutation_free(order);
    return best;
}

/*
 * Kadane and Simon, "Optimal strategies for a class of constrained sequential problems", Ann.
 * Statist. 5, 1977: by chance over cost no order is better. Contacts show at one point; conductors
 * changed over in a run at either of its ends, half each.
 */
START_TEST(no_order_is_better)
{
    double minutes[PLACES], chance[PLACES] = {0}, none = 0.3 * gsl_rng_uniform(generator);
    struct belief belief;
    struct looking looking;
    struct rf_error error;
    char fields[128];
    gsl_rng_set(generator, 40 + (unsigned long)_i);
    struct rf_job *job = ring_with_access(minutes);
    believe(&belief, job);
    if (_i % 2 == 1)
        add_hypothesis(&belief, "", none);
    double total = _i % 2 == 1 ? none : 0;
    for (size_t i = 0; i < PLACES; i++) {
        double weight = gsl_rng_uniform_pos(generator), run = gsl_rng_uniform_pos(generator);
        snprintf(fields, sizeof fields,
                 "\"family\": \"contact\", \"at\": \"P%zu\", \"conductor\": \"N\"", i + 1);
        add_hypothesis(&belief, fields, weight);
        chance[i] += weight;
        total += weight;
        if (i + 1 == PLACES)
            break;
        snprintf(fields, sizeof fields,
                 "\"family\": \"transposed\", \"run\": [\"P%zu\", \"P%zu\"], \"pair\": \"ne\"", i + 1,
                 i + 2);
        add_hypothesis(&belief, fields, run);
        chance[i] += run / 2;
        chance[i + 1] += run / 2;
        total += run;
    }
    models->effort.stop_share = 0;
    ck_assert_int_eq(looking_init(&looking, &belief.diagnosis, belief.diagnosis.n_ranked, &error),
                     RF_OK);
    ck_assert_uint_eq(looking.n_locations, PLACES);
    struct look_step steps[PLACES];
    size_t n_steps, order[PLACES];
    double expected = looking_expected(&looking, belief.weights, steps, PLACES, &n_steps);
    ck_assert_double_eq_tol(expected, best_of_all_orders(chance, minutes, total), 1e-9);
    ck_assert_uint_eq(n_steps, PLACES);
    for (size_t i = 0; i < PLACES; i++) {
        order[i] = steps[i].look.index - 1;
        ck_assert_double_eq_tol(steps[i].chance, chance[order[i]] / total, 1e-9);
        ck_assert_double_eq_tol(steps[i].minutes, minutes[order[i]], 1e-12);
    }
    ck_assert_double_eq_tol(expected, minutes_in_order(order, chance, minutes, total), 1e-9);
    looking_finish(&looking);
    rf_job_destroy(job);
}
END_TEST

/* --- expected minutes, played out --- */

static const char with_a_box[] =
    "\"points\": [{\"id\": \"P1\", \"run_m\": 8}, {\"id\": \"J\", \"kind\": \"junction_box\","
    "\"run_m\": 6}, {\"id\": \"P3\", \"run_m\": 9}, {\"id\": \"P4\", \"run_m\": 5}], \"last_run_m\": 7,"
    "\"spurs\": [{\"id\": \"S1\", \"from\": \"P3\", \"run_m\": 4}]";

static const struct {
    const char *readings, *more;
} played[] = {
    {"\"end_to_end\": {\"l\": 0.26, \"n\": 0.80, \"e\": 0.42}", ""},
    {"\"end_to_end\": {\"l\": \"open\", \"n\": 0.26, \"e\": 0.42}",
     ", \"access\": {\"P1\": {\"reach\": 15, \"open\": 4}, \"board\": 10}"},
    {"\"end_to_end\": {\"l\": 0.26, \"n\": 0.26, \"e\": 0.42}, \"cross_ln\": {\"P1\": 0.45, \"P3\":"
     "0.13, \"P4\": 0.13, \"S1\": 0.19}",
     ""},
    {"\"end_to_end\": {\"l\": 0.26, \"n\": 0.80, \"e\": 0.42}",
     ", \"opened\": [\"P3\", \"board\"], \"checked\": [\"P1\"]"},
};

/* A spot already looked at would have shown it: such truths are not those of this job. */
static bool ruled_out(const struct truth *truth)
{
    const struct rf_job *job = truth->job;
    struct look look = {.kind = LOOK_OPEN, .where = LOOK_AT_BOARD};
    if (job->board_opened && truth_look(truth, &look, NULL))
        return true;
    look.where = LOOK_AT_PLACE;
    for (look.index = 1; look.index < job->n_places; look.index++) {
        look.kind = LOOK_OPEN;
        if (job->places[look.index].opened && truth_look(truth, &look, NULL))
            return true;
        look.kind = LOOK_CHECK;
        if (job->places[look.index].checked && truth_look(truth, &look, NULL))
            return true;
    }
    return false;
}

static double play(const struct truth *truth, const struct look_step steps[], size_t n)
{
    double minutes = 0;
    for (size_t i = 0; i < n; i++) {
        minutes += steps[i].minutes;
        if (truth_look(truth, &steps[i].look, NULL))
            break;
    }
    return minutes;
}

/* Defects drawn from the confidences, their spots by simulation; places looked at in order until
 * one shows, or the order ends. */
START_TEST(expected_minutes_are_those_of_games)
{
    enum { GAMES = 4000 };
    struct rf_job *job = job_of(with_a_box, played[_i].readings, played[_i].more);
    struct rf_diagnosis *diagnosis;
    struct rf_error error;
    struct looking looking;
    ck_assert_int_eq(rf_diagnose(job, models, &diagnosis, &error), RF_OK);
    size_t n = diagnosis->n_ranked, n_steps;
    double *weights = calloc(n, sizeof *weights), sum = 0, squares = 0;
    ck_assert_ptr_nonnull(weights);
    for (size_t i = 0; i < n; i++)
        weights[i] = diagnosis->ranked[i].confidence;
    ck_assert_int_eq(looking_init(&looking, diagnosis, n, &error), RF_OK);
    struct look_step *steps = calloc(looking.n_locations, sizeof *steps);
    ck_assert_ptr_nonnull(steps);
    double expected =
        looking_expected(&looking, weights, steps, looking.n_locations, &n_steps);
    gsl_ran_discrete_t *drawing = gsl_ran_discrete_preproc(n, weights);
    for (uint32_t game = 0, seed = 0; game < GAMES; seed++) {
        struct truth *truth;
        size_t h = gsl_ran_discrete(generator, drawing);
        do { /* of this hypothesis, a spot that looks have left */
            struct simulation simulation = {.seed = seed += 7919,
                                            .given = true,
                                            .hypothesis = diagnosis->ranked[h].hypothesis};
            ck_assert_int_eq(simulate(job, models, &simulation, &truth, &error), RF_OK);
            if (!ruled_out(truth))
                break;
            truth_destroy(truth);
        } while (true);
        double minutes = play(truth, steps, n_steps);
        sum += minutes;
        squares += minutes * minutes;
        truth_destroy(truth);
        game++;
    }
    double mean = sum / GAMES, deviation = sqrt((squares / GAMES - mean * mean) / GAMES);
    printf("looking: expected %.2f minutes, played %.2f ± %.2f\n", expected, mean, deviation);
    ck_assert_double_le(fabs(mean - expected), 4 * deviation);
    gsl_ran_discrete_free(drawing);
    free(steps);
    free(weights);
    looking_finish(&looking);
    rf_diagnosis_destroy(diagnosis);
    rf_job_destroy(job);
}
END_TEST

/* --- predictions --- */

/* One reading not yet taken, drawn among all, under the true hypothesis: NAN where it could not be
 * compared, else its distance from the mean in the prediction's σ. */
static double distance_of_answer(const struct truth *truth)
{
    struct bench bench;
    struct predictive predictive;
    struct rf_error error;
    struct shown shown;
    double z = NAN;
    bench_init(&bench, truth->job);
    struct fit fit = bench_fit(&bench, &truth->hypothesis);
    struct ranked ranked = {.hypothesis = truth->hypothesis, .n_parameters = fit.n_parameters};
    size_t d = fit.n_parameters;
    ranked.theta = calloc(d, sizeof *ranked.theta);
    ranked.factor = calloc(d * d, sizeof *ranked.factor);
    ck_assert(ranked.theta != NULL && ranked.factor != NULL);
    memcpy(ranked.theta, fit.theta, d * sizeof *fit.theta);
    for (size_t j = 0; j < d; j++)
        memcpy(ranked.factor + j * d, fit.factor + j * fit.stride, d * sizeof *fit.factor);
    struct rf_diagnosis diagnosis = {.job = truth->job,
                                     .models = models,
                                     .ring = bench.ring,
                                     .n_ranked = 1,
                                     .ranked = &ranked};
    ck_assert_int_eq(predictive_init(&predictive, &diagnosis, 1, &error), RF_OK);
    size_t c = (size_t)gsl_rng_uniform_int(generator, predictive.n);
    ck_assert_int_eq(truth_answer(truth, &predictive.candidates[c], 0, &shown, &error), RF_OK);
    /* Wrongly over range is 1 in 1000; a path is there or not under the true hypothesis. */
    if (!isnan(predictive.mean[c]) && !shown.open)
        z = (shown.ohms - predictive.mean[c]) / predictive.sigma[c];
    predictive_finish(&predictive);
    free(ranked.theta);
    free(ranked.factor);
    bench_finish(&bench);
    return z;
}

/* The 90 % interval holds 90 % of what is no misread (1 in 100), the 50 % one 50 %, within four
 * standard deviations of a binomial share. */
START_TEST(predictions_cover_the_answers)
{
    size_t n = 0, within_90 = 0, within_50 = 0;
    gsl_rng_set(generator, 5);
    for (uint32_t seed = 1; n < 500; seed++) {
        struct rf_job *ring;
        struct truth *truth;
        struct rf_error error;
        struct simulation simulation = {.seed = seed};
        ck_assert_int_eq(simulation_random_ring(seed, PLAN_STANDARD, &ring, &error), RF_OK);
        ck_assert_int_eq(simulate(ring, models, &simulation, &truth, &error), RF_OK);
        double z = distance_of_answer(truth);
        if (!isnan(z)) {
            n++;
            within_90 += fabs(z) < 1.6449;
            within_50 += fabs(z) < 0.6745;
        }
        truth_destroy(truth);
        rf_job_destroy(ring);
    }
    double of_90 = (double)within_90 / (double)n, of_50 = (double)within_50 / (double)n;
    printf("predictions of %zu answers: 90 %% intervals hold %.1f %%, 50 %% ones %.1f %%\n", n,
           100 * of_90, 100 * of_50);
    ck_assert_double_eq_tol(of_90, 0.9 * 0.99, 4 * sqrt(0.9 * 0.1 / (double)n));
    ck_assert_double_eq_tol(of_50, 0.5 * 0.99, 4 * sqrt(0.25 / (double)n));
}
END_TEST

/* --- efforts --- */

START_TEST(minutes_by_hand)
{
    struct rf_job *job = job_of(with_a_box, "\"cross_ln\": {\"P1\": 0.3}",
                                ", \"access\": {\"P1\": {\"reach\": 15, \"open\": 4}, \"P3\": 20,"
                                "\"board\": 10}");
    const struct effort_model *effort = &models->effort;
    struct look look = {.kind = LOOK_OPEN, .where = LOOK_AT_PLACE, .index = 1};
    ck_assert_double_eq(minutes_of_look(job, effort, &look), 4);
    ck_assert_double_eq(minutes_to_reach(job, 1), 15);
    look.index = 2; /* the junction box */
    ck_assert_double_eq(minutes_of_look(job, effort, &look), 45);
    look.index = 3; /* a number alone is for opening */
    ck_assert_double_eq(minutes_of_look(job, effort, &look), 20);
    ck_assert_double_eq(minutes_to_reach(job, 3), 0);
    look.index = 4;
    ck_assert_double_eq(minutes_of_look(job, effort, &look), 6);
    look.kind = LOOK_CHECK;
    look.index = 3;
    ck_assert_double_eq(minutes_of_look(job, effort, &look), 1);
    look = (struct look){.kind = LOOK_OPEN, .where = LOOK_IN_RUN, .index = 2};
    ck_assert_double_eq(minutes_of_look(job, effort, &look), 90);
    look.where = LOOK_AT_BOARD;
    ck_assert_double_eq(minutes_of_look(job, effort, &look), 10);
    rf_job_destroy(job);
    job = job_of(with_a_box, "\"lead_out_l\": {\"P1\": 0.3}", "");
    ck_assert_double_eq(minutes_of_look(job, effort, &look), 2);
    struct measurement read = {setup_find("lead_in_n"), SPOT_POINT, 1};
    ck_assert(lead_is_out(job));
    ck_assert_double_eq(minutes_of_reading(effort, &read, false), 3);
    ck_assert_double_eq(minutes_of_reading(effort, &read, true), 1.5);
    read = (struct measurement){setup_find("cross_ln"), SPOT_POINT, 1};
    ck_assert_double_eq(minutes_of_reading(effort, &read, false), 1);
    read = (struct measurement){setup_find("cross_ln"), SPOT_BOARD, 0};
    ck_assert_double_eq(minutes_of_reading(effort, &read, false), 0.5);
    rf_job_destroy(job);
}
END_TEST

/* Reaching a place is paid once: behind it checking and opening cost their own minutes. */
START_TEST(reached_once)
{
    struct rf_job *job = job_of(with_a_box, "\"cross_ln\": {\"P1\": 0.3}",
                                ", \"access\": {\"P4\": {\"reach\": 15, \"open\": 4}}");
    struct belief belief;
    struct looking looking;
    struct rf_error error;
    struct look_step steps[2];
    size_t n;
    believe(&belief, job);
    add_hypothesis(&belief, "\"family\": \"load\", \"at\": \"P4\"", 0.8);
    add_hypothesis(&belief, "\"family\": \"contact\", \"at\": \"P4\", \"conductor\": \"L\"", 0.2);
    ck_assert_int_eq(looking_init(&looking, &belief.diagnosis, 2, &error), RF_OK);
    double expected = looking_expected(&looking, belief.weights, steps, 2, &n);
    ck_assert_uint_eq(n, 2);
    ck_assert_int_eq(steps[0].look.kind, LOOK_CHECK);
    ck_assert_double_eq(steps[0].minutes, 16);
    ck_assert_double_eq(steps[1].minutes, 4);
    ck_assert_double_eq_tol(expected, 16 + 0.2 * 4, 1e-12);
    looking_finish(&looking);
    rf_job_destroy(job);
}
END_TEST

/* --- the advice --- */

struct advised {
    struct rf_job *job;
    struct rf_diagnosis *diagnosis;
    struct rf_advice *advice;
};

static struct advised advise(struct rf_job *job)
{
    struct advised a = {.job = job};
    struct rf_error error;
    ck_assert_int_eq(rf_diagnose(job, models, &a.diagnosis, &error), RF_OK);
    ck_assert_int_eq(rf_advise(a.diagnosis, &a.advice, &error), RF_OK);
    return a;
}

static void finish_advised(struct advised *a)
{
    rf_advice_destroy(a->advice);
    rf_diagnosis_destroy(a->diagnosis);
    rf_job_destroy(a->job);
}

static double minutes_of_reads(const struct advised *a, const struct plan *plan, bool in_place)
{
    double minutes = in_place ? 0 : 4;
    for (size_t i = 0; i < plan->n_reads; i++) {
        const struct measurement *read = &plan->reads[i];
        ck_assert_uint_eq(read->setup, plan->setup);
        for (size_t k = 0; k < a->job->n_readings; k++) /* only what has not been read */
            ck_assert(a->job->readings[k].setup != read->setup ||
                      a->job->readings[k].spot != read->spot ||
                      a->job->readings[k].place != read->place);
        if (strncmp(setups[read->setup].name, "lead_", 5) == 0)
            minutes += i == 0 ? 3 : 1.5;
        else
            minutes += read->spot == SPOT_POINT ? 1 : 0.5;
        if (read->spot == SPOT_POINT && read->place == 1)
            minutes += 15; /* P1's reach */
    }
    return minutes;
}

/* A neutral joint the ends alone tell of: worth measuring. The last set-up in the file is in place,
 * and costs no change; every plan's minutes are those of its parts. */
START_TEST(plans_cost_what_their_parts_cost)
{
    static const char *const readings[] = {
        "\"cross_ln\": {\"board\": 0.27}, \"end_to_end\": {\"l\": 0.26, \"n\": 0.90, \"e\": 0.42}",
        "\"end_to_end\": {\"l\": 0.26, \"n\": 0.90, \"e\": 0.42}, \"link_out_ln\": {\"P1\": 0.12}",
    };
    size_t in_place = setup_find(_i == 0 ? "end_to_end" : "link_out_ln"), met = 0, reads = 0;
    struct advised a = advise(job_of(with_a_box, readings[_i],
                                     ", \"access\": {\"P1\": {\"reach\": 15, \"open\": 4}}"));
    const struct rf_advice *advice = a.advice;
    ck_assert_uint_gt(advice->n_plans, 0);
    ck_assert(!advice->stop);
    ck_assert(_i == 0 || advice->plans[0].action == ACTION_READ);
    ck_assert_double_lt(advice->measure_first, advice->look_now);
    for (size_t i = 0; i < advice->n_plans; i++) {
        const struct plan *plan = &advice->plans[i];
        ck_assert_uint_gt(strlen(plan->words), 0);
        if (plan->action == ACTION_LOOK) {
            ck_assert_double_eq(plan->minutes, advice->steps[0].minutes);
            continue;
        }
        ck_assert(plan->setup_in_place == (plan->setup == in_place));
        ck_assert_double_eq_tol(plan->minutes, minutes_of_reads(&a, plan, plan->setup == in_place),
                                1e-9);
        met += plan->setup == in_place;
        reads++;
        double chances = 0;
        for (size_t o = 0; o < plan->n_outcomes; o++)
            chances += plan->outcomes[o].chance;
        ck_assert_double_eq_tol(chances, 1, 1e-3);
        for (size_t k = 0; k < i; k++)
            ck_assert(advice->plans[k].action == ACTION_LOOK || advice->plans[k].setup != plan->setup);
    }
    ck_assert_uint_gt(reads, 0);
    if (_i == 1)
        ck_assert_uint_eq(met, 1);
    finish_advised(&a);
}
END_TEST

/* What has been looked at is not advised again. */
START_TEST(places_looked_at_are_left_out)
{
    struct advised a = advise(job_of(with_a_box, played[0].readings,
                                     ", \"opened\": [\"P1\", \"board\"], \"checked\": [\"P4\"]"));
    ck_assert_uint_gt(a.advice->n_steps, 0);
    for (size_t i = 0; i < a.advice->n_steps; i++) {
        const struct look *look = &a.advice->steps[i].look;
        ck_assert(look->where != LOOK_AT_BOARD);
        ck_assert(look->where != LOOK_AT_PLACE || look->kind != LOOK_OPEN || look->index != 1);
        ck_assert(look->where != LOOK_AT_PLACE || look->kind != LOOK_CHECK || look->index != 4);
    }
    finish_advised(&a);
}
END_TEST

/* A ring that reads as recorded, everything taken off and seen to: what is left of all defects is
 * under a twentieth, and the plan says so instead of a next step. */
START_TEST(nothing_left_is_said)
{
    struct advised a = advise(job_of(
        "\"points\": [{\"id\": \"P1\", \"run_m\": 8}, {\"id\": \"P2\", \"run_m\": 8}], \"last_run_m\": 8",
        "\"end_to_end\": {\"l\": 0.18, \"n\": 0.18, \"e\": 0.29}, \"cross_ln\": {\"board\": 0.09, \"P1\":"
        "0.09, \"P2\": 0.09}, \"cross_le\": {\"board\": 0.11, \"P1\": 0.11, \"P2\": 0.12}",
        ", \"opened\": [\"board\", \"P1\", \"P2\"], \"checked\": [\"P1\", \"P2\"]"));
    ck_assert(a.advice->stop);
    ck_assert_uint_eq(a.advice->n_plans, 0);
    ck_assert_uint_eq(a.advice->n_steps, 0);
    ck_assert_ptr_nonnull(a.advice->stop_words);
    ck_assert_double_lt(a.advice->defect_chance, 0.05);
    finish_advised(&a);
    /* With nothing looked at yet there is something to do. */
    a = advise(job_of(with_a_box, played[0].readings, ""));
    ck_assert(!a.advice->stop);
    ck_assert_ptr_null(a.advice->stop_words);
    finish_advised(&a);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("advice");
    TCase *tests = tcase_create("advice");
    suite_add_tcase(suite, tests);
    tcase_add_checked_fixture(tests, set_up, tear_down);
    tcase_set_timeout(tests, 60);
    tcase_add_loop_test(tests, no_order_is_better, 0, 20);
    tcase_add_loop_test(tests, expected_minutes_are_those_of_games, 0,
                        (int)(sizeof played / sizeof *played));
    tcase_add_test(tests, predictions_cover_the_answers);
    tcase_add_test(tests, minutes_by_hand);
    tcase_add_test(tests, reached_once);
    tcase_add_loop_test(tests, plans_cost_what_their_parts_cost, 0, 2);
    tcase_add_test(tests, places_looked_at_are_left_out);
    tcase_add_test(tests, nothing_left_is_said);
    return run_suite(suite);
}
