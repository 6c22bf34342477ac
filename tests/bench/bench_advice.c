/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * What the plan saves. Simulated jobs with one defect each are played to the find, in four ways:
 *
 *   looking    take off what is likeliest per minute, read nothing further
 *   planner    do what the advice says, diagnose again after every answer
 * and, for breaks and joints on the ring, two human ways that err never:
 *   halving    take the middle accessory off, split the ring, test both halves (8 minutes a time),
 *              then the last run's ends, then inside it
 *   skilled    join the pair of the faulty conductor at one leg (4 minutes), halve by plugging in
 *              (1 minute a reading), then the last run's ends, then inside it
 *
 * When a plan would stop, it is told that there is a defect, as the player knows, and goes on.
 * Counted: minutes to the find, and minutes before the look that finds it, which no plan can save.
 * Usage: bench_advice [jobs [seed]].
 */
#include "advice/looking.h"
#include "job/job_progress.h"
#include "simulation/simulation.h"

#include <gsl/gsl_errno.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

enum { MOST_ACTS = 400 };

struct game {
    const struct truth *truth;
    const struct rf_models *models;
    struct rf_job *job;
    struct look looked[MOST_ACTS];
    size_t n_looked;
    double minutes;
    double before_find;
    bool found;
    bool reached_lead;
    const struct rf_models *certain; /* taken for `models` once the plan would stop */
};

struct tally {
    double sum, square, before, before_square;
    size_t n;
};

static struct tally looking_all, planner_all, looking_ring, planner_ring, halving, skilled;
static size_t first_read, first_check, first_open, first_stop, reads_taken, looks_taken, unfound;
static double diagnosis_seconds, advice_seconds;

static double now(void)
{
    struct timespec t;
    clock_gettime(CLOCK_PROCESS_CPUTIME_ID, &t);
    return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

static void add(struct tally *tally, double minutes, double before)
{
    tally->n++;
    tally->sum += minutes;
    tally->square += minutes * minutes;
    tally->before += before;
    tally->before_square += before * before;
}

static void print_mean(const char *name, double sum, double square, size_t n)
{
    double mean = sum / (double)n;
    double deviation = sqrt(fmax(0.0, square / (double)n - mean * mean));
    double half = 1.645 * deviation / sqrt((double)n);
    printf("%s %6.1f (%5.1f to %5.1f)", name, mean, mean - half, mean + half);
}

static void print_tally(const char *name, const struct tally *tally)
{
    printf("  %-22s %4zu jobs ", name, tally->n);
    if (tally->n > 0) {
        print_mean(" total", tally->sum, tally->square, tally->n);
        print_mean("   before the find", tally->before, tally->before_square, tally->n);
    }
    printf("\n");
}

static void die(const struct rf_error *error)
{
    fprintf(stderr, "%s\n", error->text);
    exit(1);
}

static bool has_looked(const struct game *game, const struct look *look)
{
    for (size_t i = 0; i < game->n_looked; i++)
        if (game->looked[i].kind == look->kind && game->looked[i].where == look->where &&
            game->looked[i].index == look->index)
            return true;
    return false;
}

static void take_look(struct game *game, const struct look *look, double minutes)
{
    size_t fault = 0;
    game->looked[game->n_looked++] = *look;
    game->found = truth_look(game->truth, look, &fault);
    if (game->found)
        game->before_find = game->minutes;
    game->minutes += minutes;
    looks_taken++;
    if (look->where == LOOK_AT_BOARD)
        job_mark_opened(game->job, game->job->n_places);
    else if (look->where == LOOK_AT_PLACE && look->kind == LOOK_OPEN)
        job_mark_opened(game->job, look->index);
    else if (look->where == LOOK_AT_PLACE)
        job_mark_checked(game->job, look->index);
}

/* Where no plan is left: everything, in the ring's order. */
static void look_anywhere(struct game *game)
{
    const struct effort_model *effort = &game->models->effort;
    struct look look = {.kind = LOOK_OPEN, .where = LOOK_AT_BOARD};
    if (!has_looked(game, &look)) {
        take_look(game, &look, effort->open_board);
        return;
    }
    for (int kind = LOOK_CHECK; kind >= LOOK_OPEN; kind--)
        for (size_t place = 1; place < game->job->n_places; place++) {
            if (place_is_end(game->job, place))
                continue;
            look = (struct look){.kind = (enum look_kind)kind, .where = LOOK_AT_PLACE, .index = place};
            if (!has_looked(game, &look)) {
                take_look(game, &look,
                          kind == LOOK_CHECK ? effort->check_face : effort->open_accessory);
                return;
            }
        }
    for (size_t run = 0; run < n_runs(game->job); run++) {
        look = (struct look){.kind = LOOK_OPEN, .where = LOOK_IN_RUN, .index = run};
        if (!has_looked(game, &look)) {
            take_look(game, &look, effort->open_run);
            return;
        }
    }
    unfound++;
    game->found = true;
    game->before_find = game->minutes;
}

static bool look_first_new(struct game *game, const struct look_step steps[], size_t n)
{
    for (size_t i = 0; i < n; i++)
        if (!has_looked(game, &steps[i].look)) {
            take_look(game, &steps[i].look, steps[i].minutes);
            return true;
        }
    return false;
}

static void look_in_order(struct game *game, const struct rf_advice *advice)
{
    if (!look_first_new(game, advice->steps, advice->n_steps))
        look_anywhere(game);
}

static void take_reading(struct game *game, const struct plan *plan)
{
    const struct measurement *m = &plan->reads[0];
    const struct effort_model *effort = &game->models->effort;
    struct rf_error error;
    struct shown shown;
    bool lead = setups[m->setup].joining == JOIN_LEAD_OUT || setups[m->setup].joining == JOIN_LEAD_IN;
    if (truth_answer(game->truth, m, 0, &shown, &error) != RF_OK)
        die(&error);
    if (m->setup != game->job->setup_in_place)
        game->minutes += effort->change_of_setup;
    game->minutes += lead ? (game->reached_lead ? effort->wander_next : effort->wander_first)
                     : m->spot == SPOT_POINT ? effort->reading_at_point
                                             : effort->reading_at_board;
    game->reached_lead = game->reached_lead || lead;
    struct reading reading = {.setup = m->setup,
                              .spot = m->spot,
                              .place = m->place,
                              .open = shown.open,
                              .ohms = shown.ohms};
    if (job_add_reading(game->job, &reading, &error) != RF_OK)
        die(&error);
    reads_taken++;
}

static void count_first(const struct rf_advice *advice)
{
    if (advice->n_plans == 0)
        first_stop++;
    else if (advice->plans[0].action == ACTION_READ)
        first_read++;
    else if (advice->plans[0].look.kind == LOOK_CHECK)
        first_check++;
    else
        first_open++;
}

/* Looking only: one diagnosis serves as long as its order of looking lasts, which takes every look
 * in vain into account already. */
static void play_looking(struct game *game)
{
    for (int act = 0; !game->found && act < MOST_ACTS; act++) {
        struct rf_diagnosis *diagnosis = NULL;
        struct rf_advice *advice = NULL;
        struct rf_error error;
        if (rf_diagnose(game->job, game->models, &diagnosis, &error) != RF_OK ||
            rf_advise(diagnosis, &advice, &error) != RF_OK)
            die(&error);
        size_t looks = advice->n_steps;
        if (looks == 0 && game->models == game->certain)
            look_anywhere(game);
        if (looks == 0)
            game->models = game->certain;
        for (size_t i = 0; i < looks && !game->found; i++)
            look_in_order(game, advice);
        rf_advice_destroy(advice);
        rf_diagnosis_destroy(diagnosis);
    }
}

static void play_planner(struct game *game)
{
    for (int act = 0; !game->found && act < MOST_ACTS; act++) {
        struct rf_diagnosis *diagnosis = NULL;
        struct rf_advice *advice = NULL;
        struct rf_error error;
        double start = now();
        if (rf_diagnose(game->job, game->models, &diagnosis, &error) != RF_OK)
            die(&error);
        double middle = now();
        if (rf_advise(diagnosis, &advice, &error) != RF_OK)
            die(&error);
        if (act == 0) {
            diagnosis_seconds += middle - start;
            advice_seconds += now() - middle;
            count_first(advice);
        }
        if (getenv("RINGFETTLE_SHOW") != NULL) {
            struct text t = {0};
            hypothesis_words(&game->truth->hypothesis, game->job, &t);
            printf("%s | top %s %.2f | %s | now %.1f measure %.1f\n", t.bytes,
                   diagnosis->ranked[0].words, diagnosis->ranked[0].confidence,
                   advice->n_plans > 0 ? advice->plans[0].words : "stop", advice->look_now,
                   advice->measure_first);
            text_finish(&t);
        }
        if (advice->n_plans == 0 && game->models != game->certain)
            game->models = game->certain;
        else if (advice->n_plans > 0 && advice->plans[0].action == ACTION_READ)
            take_reading(game, &advice->plans[0]);
        else
            look_in_order(game, advice);
        rf_advice_destroy(advice);
        rf_diagnosis_destroy(diagnosis);
    }
}

static struct rf_job *copy_job(const struct truth *truth)
{
    struct text text = {0};
    struct rf_error error;
    struct rf_job *job = NULL;
    if (truth_write_job(truth, true, &text, &error) != RF_OK ||
        rf_job_parse(text.bytes, text.length, "simulated", &job, &error) != RF_OK)
        die(&error);
    text_finish(&text);
    job->found = NULL; /* the planner is not to know */
    return job;
}

static void play_both(const struct truth *truth, const struct rf_models *models,
                      const struct rf_models *certain, bool on_ring)
{
    for (int measure = 0; measure < 2; measure++) {
        struct game *game = calloc(1, sizeof *game);
        if (game == NULL)
            exit(1);
        game->truth = truth;
        game->models = models;
        game->certain = certain;
        game->job = copy_job(truth);
        if (measure)
            play_planner(game);
        else
            play_looking(game);
        if (measure && getenv("RINGFETTLE_SHOW") != NULL)
            printf("== before the find %.1f\n", game->before_find);
        add(measure ? &planner_all : &looking_all, game->minutes, game->before_find);
        if (on_ring)
            add(measure ? &planner_ring : &looking_ring, game->minutes, game->before_find);
        rf_job_destroy(game->job);
        free(game);
    }
}

/* The last run's ends, then inside it; ends taken off before are not again. */
static void finish_run(const struct truth *truth, size_t run, const bool opened[], double minutes,
                       struct tally *tally)
{
    const struct effort_model *effort = &truth->models->effort;
    const struct look *spot = &truth->spots[0].look;
    size_t ends[2] = {run, run + 1};
    for (int i = 0; i < 2; i++) {
        bool board = place_is_end(truth->job, ends[i]);
        double cost = board ? effort->open_board : effort->open_accessory;
        bool here = board ? spot->where == LOOK_AT_BOARD
                          : spot->where == LOOK_AT_PLACE && spot->index == ends[i];
        if (opened[ends[i]])
            continue;
        if (here) {
            add(tally, minutes + cost, minutes);
            return;
        }
        minutes += cost;
    }
    add(tally, minutes + effort->open_run, minutes);
}

static void halve(const struct truth *truth, bool by_plugging_in, struct tally *tally)
{
    const struct look *spot = &truth->spots[0].look;
    size_t run = truth->hypothesis.faults[0].run, low = 0, high = truth->job->n_ring + 1;
    bool *opened = calloc(truth->job->n_places, sizeof *opened);
    double minutes = by_plugging_in ? 4.0 : 0.0;
    if (opened == NULL)
        exit(1);
    while (high - low > 1) {
        size_t middle = (low + high) / 2;
        if (!by_plugging_in) {
            opened[middle] = true;
            if (spot->where == LOOK_AT_PLACE && spot->index == middle) {
                add(tally, minutes + 8.0, minutes);
                free(opened);
                return;
            }
        }
        minutes += by_plugging_in ? 1.0 : 8.0;
        if (run >= middle)
            low = middle;
        else
            high = middle;
    }
    finish_run(truth, run, opened, minutes, tally);
    free(opened);
}

static bool break_or_joint_on_ring(const struct truth *truth)
{
    const struct fault *fault = &truth->hypothesis.faults[0];
    return (fault->family == &fault_family_break || fault->family == &fault_family_joint) &&
           run_on_ring(truth->job, fault->run);
}

int main(int argc, char **argv)
{
    size_t jobs = argc > 1 ? strtoul(argv[1], NULL, 10) : 300;
    uint32_t seed = argc > 2 ? (uint32_t)strtoul(argv[2], NULL, 10) : 20260;
    struct rf_models *models = NULL, *certain = NULL;
    struct rf_error error;
    gsl_set_error_handler_off();
    if (rf_models_load(NULL, RF_RATES_CONSULTED, &models, &error) != RF_OK ||
        rf_models_load(NULL, RF_RATES_CERTAIN, &certain, &error) != RF_OK)
        die(&error);
    for (size_t i = 0; i < jobs; i++) {
        struct rf_job *ring = NULL;
        struct truth *truth = NULL;
        struct simulation simulation = {.seed = seed + (uint32_t)i, .defects = 1};
        if (simulation_random_ring(seed + (uint32_t)i, PLAN_STANDARD, &ring, &error) != RF_OK ||
            simulate(ring, models, &simulation, &truth, &error) != RF_OK)
            die(&error);
        bool on_ring = break_or_joint_on_ring(truth);
        play_both(truth, models, certain, on_ring);
        if (on_ring) {
            halve(truth, false, &halving);
            halve(truth, true, &skilled);
        }
        truth_destroy(truth);
        rf_job_destroy(ring);
    }
    printf("minutes to the find, mean (90 %% interval), %zu simulated jobs with a defect\n", jobs);
    print_tally("looking, all", &looking_all);
    print_tally("planner, all", &planner_all);
    printf(" breaks and joints on the ring\n");
    print_tally("looking", &looking_ring);
    print_tally("planner", &planner_ring);
    print_tally("halving", &halving);
    print_tally("skilled halving", &skilled);
    printf("first advice: read %zu, check a face %zu, take off or board %zu, stop %zu\n", first_read,
           first_check, first_open, first_stop);
    printf("readings %zu, looks %zu, never found %zu\n", reads_taken, looks_taken, unfound);
    printf("time: diagnosis %.1f ms, advice %.1f ms, ratio %.2f\n",
           1e3 * diagnosis_seconds / (double)jobs, 1e3 * advice_seconds / (double)jobs,
           advice_seconds / diagnosis_seconds);
    rf_models_destroy(models);
    rf_models_destroy(certain);
    return 0;
}
