/* SPDX-License-Identifier: GPL-3.0-or-later */
#define _DEFAULT_SOURCE /* wait4 */

/*
 * How long a diagnosis takes, against what it could be: bench_speed [JOBS [SEED [MOST [COMPARED]]]]. Jobs are
 * invented: rings laid here, faults and noise drawn from the shipped models. Each figure is a ratio
 * inside this run, of the processor's time where it is in process, medians over the jobs; each
 * job's time is the least of three where it is short.
 *
 *   plain       the plain way (plain.h) against the ranking, and against the whole diagnosis.
 *               Fails where a confidence differs by more than 0.01. JOBS (12) jobs of 10 points
 *   floor       the diagnosis against one analysis, evaluation with Jacobian and solution of the
 *               normal equations for every hypothesis; and what its steps take of it
 *   growth      rings of 5 to MOST (80) points, and the exponent of a fitted power
 *   screening   COMPARED (1000) jobs of 4 to 14 points, half of them read at some other set-ups besides,
 *               with screening and without. Fails where a confidence differs by more than 0.01
 *   command     `ringfettle diagnose` (path in RINGFETTLE) on a job of 10 and of 60 points, from
 *               start to exit by the clock, medians of several; its memory, as the system counts it
 */

#include "base/error.h"
#include "base/memory.h"
#include "diagnosis/steps.h"
#include "difference.h"
#include "plain.h"
#include "simulation/simulation.h"

#include <fcntl.h>
#include <gsl/gsl_errno.h>
#include <gsl/gsl_fit.h>
#include <gsl/gsl_randist.h>
#include <gsl/gsl_sort.h>
#include <gsl/gsl_statistics.h>
#include <math.h>
#include <ringfettle/advice.h>
#include <stdio.h>
#include <string.h>
#include <sys/resource.h>
#include <sys/wait.h>
#include <time.h>
#include <unistd.h>

enum { TRIES = 3, POINTS = 10, MOST_JOBS = 100 };
static const double same_answer = 0.01;

static double milliseconds(clockid_t clock)
{
    struct timespec time;
    clock_gettime(clock, &time);
    return (double)time.tv_sec * 1e3 + (double)time.tv_nsec / 1e6;
}

static double now(void)
{
    return milliseconds(CLOCK_PROCESS_CPUTIME_ID);
}

static double median(double values[], size_t n)
{
    gsl_sort(values, 1, n);
    return n > 0 ? gsl_stats_median_from_sorted_data(values, 1, n) : NAN;
}

/* --- jobs --- */

/* A ring of n points, 5 m from one to the next give or take three, standard readings. */
static enum rf_status lay_ring(size_t n, uint32_t seed, struct rf_job **ring,
                               struct rf_error *error)
{
    struct text text = {0};
    gsl_rng *generator = gsl_rng_alloc(gsl_rng_mt19937);
    if (generator == NULL)
        return fail_memory(error);
    generator_seed(generator, seed, "ring");
    text_add(&text, "{\"format\": \"ringfettle-job/1\", \"ring\": {\"points\": [");
    for (size_t i = 1; i <= n; i++)
        text_addf(&text, "%s{\"id\": \"P%zu\", \"run_m\": %.1f}", i > 1 ? ", " : "", i,
                  gsl_ran_flat(generator, 2.0, 8.0));
    text_addf(&text, "], \"last_run_m\": %.1f}}", gsl_ran_flat(generator, 2.0, 8.0));
    gsl_rng_free(generator);
    enum rf_status status =
        text.failed ? fail_memory(error)
                    : simulation_read_ring(text.bytes, text.length, "ring", ring, error);
    text_finish(&text);
    return status;
}

static enum rf_status make_job(size_t n, uint32_t seed, const struct rf_models *models,
                               struct truth **truth, struct rf_error *error)
{
    struct rf_job *ring = NULL;
    const struct simulation simulation = {.seed = seed};
    enum rf_status status = lay_ring(n, seed, &ring, error);
    if (status == RF_OK)
        status = simulate(ring, models, &simulation, truth, error);
    rf_job_destroy(ring);
    return status;
}

/* --- what is timed, on one job --- */

struct bench {
    const struct rf_job *job;
    const struct rf_models *models;
    struct wiring ring, wiring;
    struct fitter *fitter;
    struct candidates candidates; /* as enumerated */
    struct candidates ranked;     /* copies, to rank */
    struct rf_diagnosis *diagnosis;
};

static void finish_bench(struct bench *b)
{
    rf_diagnosis_destroy(b->diagnosis);
    fitter_destroy(b->fitter);
    candidates_finish(&b->candidates);
    candidates_finish(&b->ranked);
    wiring_finish(&b->ring);
    wiring_finish(&b->wiring);
}

static enum rf_status init_bench(struct bench *b, const struct rf_job *job,
                                 const struct rf_models *models, struct rf_error *error)
{
    *b = (struct bench){.job = job, .models = models};
    enum rf_status status = wiring_init(&b->ring, job, models, error);
    if (status == RF_OK)
        status = wiring_init(&b->wiring, job, models, error);
    if (status == RF_OK)
        status = candidates_enumerate(&b->candidates, job, models, error);
    if (status == RF_OK && (b->fitter = fitter_create(&b->ring)) == NULL)
        status = fail_memory(error);
    return status;
}

static enum rf_status copy_candidates(struct bench *b, struct rf_error *error)
{
    candidates_finish(&b->ranked);
    b->ranked.list = NEW_ARRAY(struct candidate, b->candidates.n);
    if (b->ranked.list == NULL)
        return fail_memory(error);
    b->ranked.n = b->ranked.capacity = b->candidates.n;
    memcpy(b->ranked.list, b->candidates.list, b->candidates.n * sizeof *b->ranked.list);
    return RF_OK;
}

typedef enum rf_status bench_step(struct bench *b, struct rf_error *error);

/* One analysis, evaluation and solution for every hypothesis: the prospect is exactly that. */
static enum rf_status floor_step(struct bench *b, struct rf_error *error)
{
    double theta[b->ring.map.n_common + FAULTS_AT_ONCE];
    struct fit fit;
    struct prospect prospect;
    memset(theta, 0, sizeof theta);
    for (size_t i = 0; i < b->candidates.n; i++) {
        wiring_copy(&b->wiring, &b->ring);
        hypothesis_apply(&b->candidates.list[i].hypothesis, &b->wiring, NULL);
        if (fitter_analyse(b->fitter, &b->wiring) != RF_OK ||
            fitter_resume(b->fitter, theta, &fit) != RF_OK ||
            fitter_prospect(b->fitter, &prospect) != RF_OK)
            return fail(error, RF_NUMERICAL, "the floor fails for hypothesis %zu", i);
    }
    return RF_OK;
}

static enum rf_status whole_step(struct bench *b, struct rf_error *error)
{
    rf_diagnosis_destroy(b->diagnosis);
    b->diagnosis = NULL;
    return rf_diagnose(b->job, b->models, &b->diagnosis, error);
}

static enum rf_status rank_step(struct bench *b, struct rf_error *error)
{
    enum rf_status status = copy_candidates(b, error);
    return status == RF_OK ? candidates_rank(&b->ranked, b->fitter, &b->ring, true, error) : status;
}

static enum rf_status plain_step(struct bench *b, struct rf_error *error)
{
    return plain_rank(&b->candidates, &b->ring, error);
}

/* What the diagnosis does after ranking, on the candidates ranked last; each leaves the diagnosis. */
static enum rf_status keep_step(struct bench *b, struct rf_error *error)
{
    rf_diagnosis_destroy(b->diagnosis);
    b->diagnosis = NEW(struct rf_diagnosis);
    if (b->diagnosis == NULL)
        return fail_memory(error);
    b->diagnosis->job = b->job;
    b->diagnosis->models = b->models;
    b->diagnosis->sound = NEW_ARRAY(double, b->job->n_readings);
    if (b->diagnosis->sound == NULL)
        return fail_memory(error);
    enum rf_status status = wiring_init(&b->diagnosis->ring, b->job, b->models, error);
    return status == RF_OK ? keep_ranked(b->diagnosis, &b->ranked, b->fitter, error) : status;
}

static enum rf_status blind_step(struct bench *b, struct rf_error *error)
{
    for (size_t i = 0; i < b->diagnosis->n_blind; i++)
        free(b->diagnosis->blind[i].words);
    free(b->diagnosis->blind);
    b->diagnosis->blind = NULL;
    b->diagnosis->n_blind = 0;
    return seek_blind_spots(b->diagnosis, &b->ranked, b->fitter, error);
}

static enum rf_status advise_step(struct bench *b, struct rf_error *error)
{
    struct rf_advice *advice = NULL;
    enum rf_status status = rf_advise(b->diagnosis, &advice, error);
    rf_advice_destroy(advice);
    return status;
}

/* Adds to *status what went wrong; the least of several tries, in ms. */
static double time_step(bench_step *step, struct bench *b, int tries, enum rf_status *status,
                        struct rf_error *error)
{
    double least = INFINITY;
    for (int i = 0; i < tries && *status == RF_OK; i++) {
        double start = now();
        *status = step(b, error);
        least = fmin(least, now() - start);
    }
    return least;
}

/* --- plain and floor --- */

/* One row a job. */
enum figure {
    PLAIN_TO_RANK,
    PLAIN_TO_WHOLE,
    WHOLE_TO_FLOOR,
    RANK_TO_FLOOR,
    KEEP_TO_FLOOR,
    BLIND_TO_FLOOR,
    ADVICE_TO_FLOOR,
    WHOLE_MS,
    N_FIGURES
};

static const char *const figure_words[N_FIGURES] = {
    "plain / ranking",         "plain / whole diagnosis", "whole diagnosis / floor",
    "  ranking / floor",       "  keeping fits / floor",  "  blind spots / floor",
    "advice, besides / floor", "whole diagnosis, ms",
};

static double largest_difference(const struct bench *b)
{
    double largest = 0;
    for (size_t i = 0; i < b->ranked.n; i++)
        for (size_t k = 0; k < b->candidates.n; k++)
            if (hypothesis_equal(&b->ranked.list[i].hypothesis, &b->candidates.list[k].hypothesis))
                largest = fmax(
                    largest, fabs(b->ranked.list[i].confidence - b->candidates.list[k].confidence));
    return largest;
}

static enum rf_status measure_steps(struct bench *b, double figures[N_FIGURES], double *difference,
                                    struct rf_error *error)
{
    enum rf_status status = RF_OK;
    double least = time_step(floor_step, b, TRIES, &status, error);
    double whole = time_step(whole_step, b, TRIES, &status, error);
    /* A second ranking, where nothing explains the readings, is the whole's and not the step's. */
    double advice = time_step(advise_step, b, TRIES, &status, error);
    double rank = time_step(rank_step, b, TRIES, &status, error);
    double keep = time_step(keep_step, b, TRIES, &status, error);
    double blind = time_step(blind_step, b, TRIES, &status, error);
    double plain = difference != NULL ? time_step(plain_step, b, 1, &status, error) : NAN;
    if (status == RF_OK && difference != NULL)
        *difference = largest_difference(b);
    figures[PLAIN_TO_RANK] = plain / rank;
    figures[PLAIN_TO_WHOLE] = plain / whole;
    figures[WHOLE_TO_FLOOR] = whole / least;
    figures[RANK_TO_FLOOR] = rank / least;
    figures[KEEP_TO_FLOOR] = keep / least;
    figures[BLIND_TO_FLOOR] = blind / least;
    figures[ADVICE_TO_FLOOR] = advice / least;
    figures[WHOLE_MS] = whole;
    return status;
}

static enum rf_status measure_job(size_t points, uint32_t seed, const struct rf_models *models,
                                  double figures[N_FIGURES], double *difference,
                                  struct rf_error *error)
{
    struct truth *truth = NULL;
    struct bench bench = {0};
    enum rf_status status = make_job(points, seed, models, &truth, error);
    if (status == RF_OK)
        status = init_bench(&bench, truth->job, models, error);
    if (status == RF_OK)
        status = measure_steps(&bench, figures, difference, error);
    finish_bench(&bench);
    truth_destroy(truth);
    return status;
}

static enum rf_status measure_jobs(size_t points, size_t jobs, uint32_t seed, bool plainly,
                                   const struct rf_models *models, bool *same,
                                   struct rf_error *error)
{
    static double figures[MOST_JOBS][N_FIGURES];
    double largest = 0;
    enum rf_status status = RF_OK;
    for (size_t i = 0; i < jobs && status == RF_OK; i++) {
        double difference = 0;
        status = measure_job(points, seed * 1000u + (uint32_t)i, models, figures[i],
                             plainly ? &difference : NULL, error);
        largest = fmax(largest, difference);
    }
    if (status != RF_OK)
        return status;
    printf("%zu jobs of %zu points:                median       least     largest\n", jobs, points);
    for (size_t f = plainly ? 0 : WHOLE_TO_FLOOR; f < N_FIGURES; f++) {
        double values[MOST_JOBS];
        for (size_t i = 0; i < jobs; i++)
            values[i] = figures[i][f];
        double middle = median(values, jobs);
        printf("  %-30s %11.2f %11.2f %11.2f\n", figure_words[f], middle, values[0],
               values[jobs - 1]);
    }
    if (plainly) {
        *same = largest <= same_answer;
        printf("  largest difference of a confidence, plain and ours: %.5f%s\n", largest,
               *same ? "" : ": NOT THE SAME");
    }
    fflush(stdout);
    return RF_OK;
}

/* --- screening --- */

static enum rf_status compare_job(uint32_t seed, const struct rf_models *models, double times[2],
                                  double *largest, struct rf_error *error)
{
    struct rf_job *ring = NULL;
    struct truth *truth = NULL;
    struct rf_diagnosis *screened = NULL, *whole = NULL;
    const struct simulation simulation = {.seed = seed};
    enum rf_status status =
        simulation_random_ring(seed, seed % 2 == 0 ? PLAN_STANDARD : PLAN_EXTRA, &ring, error);
    if (status == RF_OK)
        status = simulate(ring, models, &simulation, &truth, error);
    double start = now();
    if (status == RF_OK)
        status = diagnose(truth->job, models, true, &screened, error);
    double between = now();
    if (status == RF_OK)
        status = diagnose(truth->job, models, false, &whole, error);
    times[0] += between - start;
    times[1] += now() - between;
    if (status == RF_OK)
        *largest = fmax(*largest, largest_change(screened, whole));
    rf_diagnosis_destroy(screened);
    rf_diagnosis_destroy(whole);
    truth_destroy(truth);
    rf_job_destroy(ring);
    return status;
}

static enum rf_status measure_screening(size_t jobs, uint32_t seed, const struct rf_models *models,
                                        bool *same, struct rf_error *error)
{
    double times[2] = {0, 0}, largest = 0;
    enum rf_status status = RF_OK;
    for (size_t i = 0; i < jobs && status == RF_OK; i++)
        status = compare_job(seed * 1000000u + (uint32_t)i, models, times, &largest, error);
    if (status != RF_OK || jobs == 0)
        return status;
    *same = *same && largest <= same_answer;
    printf("%zu jobs with screening and without: largest difference of a confidence %.5f%s; "
           "time %.2f of that without\n",
           jobs, largest, largest <= same_answer ? "" : ": NOT THE SAME", times[0] / times[1]);
    fflush(stdout);
    return RF_OK;
}

/* --- growth --- */

static enum rf_status measure_growth(size_t most, size_t jobs, uint32_t seed,
                                     const struct rf_models *models, struct rf_error *error)
{
    static const size_t points[] = {5, 10, 20, 40, 80, 160};
    double x[6], y[6], c0, c1, c00, c01, c11, square;
    size_t n = 0;
    enum rf_status status = RF_OK;
    for (size_t p = 0; p < 6 && points[p] <= most && status == RF_OK; p++) {
        double times[MOST_JOBS], per[MOST_JOBS];
        size_t few = points[p] <= 20 ? jobs : points[p] <= 40 ? 5 : 3;
        for (size_t i = 0; i < few && status == RF_OK; i++) {
            struct truth *truth = NULL;
            struct bench bench = {0};
            status = make_job(points[p], seed * 1000u + (uint32_t)i, models, &truth, error);
            if (status == RF_OK)
                status = init_bench(&bench, truth->job, models, error);
            int tries = points[p] <= 20 ? TRIES : 1;
            if (status == RF_OK)
                times[i] = time_step(whole_step, &bench, tries, &status, error);
            if (status == RF_OK)
                per[i] = times[i] / time_step(floor_step, &bench, tries, &status, error);
            finish_bench(&bench);
            truth_destroy(truth);
        }
        if (status != RF_OK)
            break;
        double middle = median(times, few);
        x[n] = log((double)points[p]);
        y[n++] = log(middle);
        printf("  %3zu points, %2zu jobs: %10.2f ms, %6.2f times the floor\n", points[p], few,
               middle, median(per, few));
        fflush(stdout);
    }
    if (status != RF_OK || n < 2)
        return status;
    gsl_fit_linear(x, 1, y, 1, n, &c0, &c1, &c00, &c01, &c11, &square);
    printf("  exponent %.2f; of the last doubling %.2f\n", c1, (y[n - 1] - y[n - 2]) / log(2));
    return RF_OK;
}

/* --- the program --- */

static bool write_file(const char *path, const struct truth *truth, struct rf_error *error)
{
    struct text text = {0};
    FILE *file = fopen(path, "wb");
    bool ok = file != NULL && truth_write_job(truth, false, &text, error) == RF_OK &&
              fwrite(text.bytes, 1, text.length, file) == text.length;
    text_finish(&text);
    return file != NULL && fclose(file) == 0 && ok;
}

/* Start to exit, ms by the clock; negative where it failed. */
static double run_program(const char *program, const char *path, double *megabytes)
{
    int status = 0;
    struct rusage usage = {0};
    double start = milliseconds(CLOCK_MONOTONIC);
    pid_t child = fork();
    if (child == 0) {
        int null = open("/dev/null", O_WRONLY);
        if (null >= 0 && dup2(null, STDOUT_FILENO) >= 0)
            execl(program, program, "diagnose", path, (char *)NULL);
        _exit(127);
    }
    if (child < 0 || wait4(child, &status, 0, &usage) < 0 || status != 0)
        return -1;
    *megabytes = fmax(*megabytes, (double)usage.ru_maxrss / 1024);
    return milliseconds(CLOCK_MONOTONIC) - start;
}

static enum rf_status measure_program(size_t points, size_t jobs, size_t runs, uint32_t seed,
                                      const struct rf_models *models, struct rf_error *error)
{
    const char *program = getenv("RINGFETTLE");
    char path[] = "/tmp/bench-speed-XXXXXX";
    double times[MOST_JOBS], middles[MOST_JOBS], megabytes = 0;
    int file = mkstemp(path);
    enum rf_status status = file >= 0 ? RF_OK : fail(error, RF_IO, "no temporary file");
    for (size_t i = 0; i < jobs && status == RF_OK; i++) {
        struct truth *truth = NULL;
        status = make_job(points, seed * 1000u + (uint32_t)i, models, &truth, error);
        if (status == RF_OK && !write_file(path, truth, error))
            status = fail(error, RF_IO, "%s cannot be written", path);
        for (size_t k = 0; k < runs && status == RF_OK; k++)
            if ((times[k] = run_program(program, path, &megabytes)) < 0)
                status = fail(error, RF_IO, "%s failed", program);
        middles[i] = median(times, runs);
        truth_destroy(truth);
    }
    if (file >= 0) {
        close(file);
        unlink(path);
    }
    if (status == RF_OK) {
        double middle = median(middles, jobs);
        printf("  %3zu points: %9.2f ms (%.2f to %.2f, %zu jobs, %zu runs each), peak %.1f MiB\n",
               points, middle, middles[0], middles[jobs - 1], jobs, runs, megabytes);
        fflush(stdout);
    }
    return status;
}

static enum rf_status measure_all(size_t jobs, uint32_t seed, size_t most, size_t compared,
                                  bool *same, const struct rf_models *models,
                                  struct rf_error *error)
{
    enum rf_status status = RF_OK;
    printf("seed %lu\n", (unsigned long)seed);
    /* First, while this process is small: a child's peak counts from its parent's. */
    if (getenv("RINGFETTLE") != NULL) {
        printf("the program, start to exit:\n");
        status = measure_program(10, jobs, 9, seed, models, error);
        if (status == RF_OK)
            status = measure_program(60, 5, 3, seed, models, error);
    }
    if (status == RF_OK)
        status = measure_jobs(POINTS, jobs, seed, true, models, same, error);
    if (status == RF_OK && most >= 40)
        status = measure_jobs(40, 3, seed, false, models, same, error);
    if (status == RF_OK)
        status = measure_screening(compared, seed, models, same, error);
    if (status == RF_OK) {
        printf("growth, whole diagnosis:\n");
        status = measure_growth(most, jobs, seed, models, error);
    }
    return status;
}

int main(int argc, char **argv)
{
    struct rf_error error = {0};
    struct rf_models *models = NULL;
    size_t jobs = argc > 1 ? strtoul(argv[1], NULL, 10) : 12;
    uint32_t seed = argc > 2 ? (uint32_t)strtoul(argv[2], NULL, 10) : 1;
    size_t most = argc > 3 ? strtoul(argv[3], NULL, 10) : 80;
    size_t compared = argc > 4 ? strtoul(argv[4], NULL, 10) : 1000;
    bool same = true;
    if (jobs == 0 || jobs > MOST_JOBS || most < 5 || most > JOB_MAX_POINTS) {
        fprintf(stderr, "usage: bench_speed [JOBS, 1 to %d [SEED [MOST, 5 to %d [COMPARED]]]]\n",
                MOST_JOBS, JOB_MAX_POINTS);
        return 2;
    }
    gsl_set_error_handler_off();
    enum rf_status status = rf_models_load(NULL, RF_RATES_CONSULTED, &models, &error);
    if (status == RF_OK)
        status = measure_all(jobs, seed, most, compared, &same, models, &error);
    if (status != RF_OK)
        fprintf(stderr, "%s: %s\n", rf_status_text(status), error.text);
    rf_models_destroy(models);
    return status != RF_OK ? (int)rf_status_class(status) : same ? 0 : 1;
}
