/* SPDX-License-Identifier: GPL-3.0-or-later */

/*
 * How often the diagnosis is right: bench_accuracy [JOBS [SEED]], 1000 and 1 if not given.
 * Jobs are invented: random rings (simulation/simulation.h), faults and noise drawn from the
 * shipped models, so this measures the method under its own assumptions and nothing else.
 *
 *   first, three     the true fault is first, among the first three; exact ties go by enumeration
 *                    order
 *   family           the first-ranked fault is of the true one's family
 *   log posterior    mean natural log of the confidence that the true fault has: with nothing below
 *                    10⁻⁷, since screening gives up what is far below, and with nothing below
 *                    0.001, which is not listed
 *   calibration      Σ_b n_b/N · |mean confidence in b − share right in b|, over bins b of the
 *                    first-ranked confidence, bounded by 0, .2, .4, .6, .8, .95, 1
 *   misfit           flagged with one defect or none: false alarms; with a second defect added:
 *                    detections. Many a second defect shows in no reading taken
 *
 *   screening        the largest difference of a confidence with screening and without, over every
 *                    tenth job
 *
 * `±` is one standard error. Times are of the processor, one core, in process.
 */

#include "calibration.h"
#include "difference.h"

#include "base/memory.h"
#include "diagnosis/diagnosis.h"
#include "simulation/simulation.h"

#include <gsl/gsl_errno.h>
#include <gsl/gsl_sort.h>
#include <gsl/gsl_statistics.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <time.h>

enum { POINTS_TIMED = 10, UNSCREENED_EVERY = 10 };

struct score {
    size_t n, first, three, family, flagged, hypotheses;
    double log_posterior, log_listed;
    double screening; /* largest difference of a confidence without it */
    struct bin bins[N_BINS];
    double *milliseconds; /* [n] */
    double *timed;        /* [n_timed], of rings of POINTS_TIMED points */
    size_t n_timed;
};

static double now(void)
{
    struct timespec time;
    clock_gettime(CLOCK_PROCESS_CPUTIME_ID, &time);
    return (double)time.tv_sec * 1e3 + (double)time.tv_nsec / 1e6;
}

static const struct fault_family *family_of(const struct hypothesis *hypothesis)
{
    return hypothesis->n_faults > 0 ? hypothesis->faults[0].family : &fault_family_none;
}

static void count(struct score *score, const struct rf_diagnosis *d, double milliseconds)
{
    bool right = d->found_rank == 0;
    score->first += right;
    score->three += d->found_rank < 3 && d->found_rank < d->n_ranked;
    score->family += family_of(&d->ranked[0].hypothesis) == family_of(&d->found);
    score->flagged += d->misfit.flag;
    score->hypotheses += d->n_hypotheses;
    score->log_posterior += log(fmax(d->found_confidence, 1e-7));
    score->log_listed += log(fmax(d->found_confidence, confidence_shown));
    count_in_bin(score->bins, d->ranked[0].confidence, right);
    score->milliseconds[score->n++] = milliseconds;
    if (rf_job_points(d->job) == POINTS_TIMED)
        score->timed[score->n_timed++] = milliseconds;
}

static enum rf_status compare_unscreened(struct score *score, const struct rf_diagnosis *d,
                                         const struct rf_models *models, struct rf_error *error)
{
    struct rf_diagnosis *whole = NULL;
    enum rf_status status = diagnose(d->job, models, false, &whole, error);
    if (status == RF_OK)
        score->screening = fmax(score->screening, largest_change(d, whole));
    rf_diagnosis_destroy(whole);
    return status;
}

static enum rf_status run_job(struct score *score, const struct rf_models *models, uint32_t seed,
                              enum ring_plan plan, size_t defects, struct rf_error *error)
{
    struct rf_job *ring = NULL;
    struct truth *truth = NULL;
    struct rf_diagnosis *diagnosis = NULL;
    const struct simulation simulation = {.seed = seed, .defects = defects};
    enum rf_status status = simulation_random_ring(seed, plan, &ring, error);
    if (status == RF_OK)
        status = simulate(ring, models, &simulation, &truth, error);
    if (status == RF_OK) {
        double start = now();
        status = rf_diagnose(truth->job, models, &diagnosis, error);
        if (status == RF_OK)
            count(score, diagnosis, now() - start);
    }
    if (status == RF_OK && seed % UNSCREENED_EVERY == 0)
        status = compare_unscreened(score, diagnosis, models, error);
    rf_diagnosis_destroy(diagnosis);
    truth_destroy(truth);
    rf_job_destroy(ring);
    return status;
}

static enum rf_status run(struct score *score, const struct rf_models *models, size_t jobs,
                          uint32_t seed, enum ring_plan plan, size_t defects,
                          struct rf_error *error)
{
    enum rf_status status = RF_OK;
    *score = (struct score){.milliseconds = NEW_ARRAY(double, jobs),
                            .timed = NEW_ARRAY(double, jobs)};
    if (score->milliseconds == NULL || score->timed == NULL)
        return RF_MEMORY;
    for (size_t i = 0; i < jobs && status == RF_OK; i++)
        status = run_job(score, models, seed * 100000u + (uint32_t)i, plan, defects, error);
    return status;
}

static void print_share(const char *what, size_t count, size_t n)
{
    double share = (double)count / (double)n;
    printf("%-28s %.3f ± %.3f\n", what, share, sqrt(share * (1 - share) / (double)n));
}

static double median(double values[], size_t n)
{
    gsl_sort(values, 1, n);
    return n > 0 ? gsl_stats_median_from_sorted_data(values, 1, n) : NAN;
}

static void print_calibration(const struct score *score)
{
    for (size_t i = 0; i < N_BINS; i++) {
        const struct bin *bin = &score->bins[i];
        if (bin->n == 0)
            continue;
        double in_bin = (double)bin->n;
        printf("  first-ranked %.2f to %.2f    %5zu jobs, mean confidence %.3f, right %.3f\n",
               bounds[i], bounds[i + 1], bin->n, bin->confidence / in_bin,
               (double)bin->right / in_bin);
    }
    printf("%-28s %.3f\n", "calibration error", calibration_error(score->bins));
}

static void print_score(const char *title, struct score *score)
{
    double n = (double)score->n;
    printf("%s: %zu jobs, %.0f hypotheses on average\n", title, score->n,
           (double)score->hypotheses / n);
    print_share("true fault first", score->first, score->n);
    print_share("among the first three", score->three, score->n);
    print_share("right family", score->family, score->n);
    printf("%-28s %.3f; %.3f with nothing below 0.001\n", "mean log posterior of truth",
           score->log_posterior / n, score->log_listed / n);
    print_calibration(score);
    print_share("misfit, false alarms", score->flagged, score->n);
    printf("%-28s %.4f\n", "screening, largest change", score->screening);
    printf("%-28s %.1f ms; %.1f ms for %d points (%zu jobs)\n", "median time",
           median(score->milliseconds, score->n), median(score->timed, score->n_timed),
           POINTS_TIMED, score->n_timed);
}

static void finish(struct score *score)
{
    free(score->milliseconds);
    free(score->timed);
}

static enum rf_status bench_plan(const char *title, enum ring_plan plan,
                                 const struct rf_models *models, size_t jobs, uint32_t seed,
                                 struct rf_error *error)
{
    struct score one = {0}, two = {0};
    enum rf_status status = run(&one, models, jobs, seed, plan, 0, error);
    if (status == RF_OK)
        print_score(title, &one);
    if (status == RF_OK)
        status = run(&two, models, jobs, seed, plan, 2, error);
    if (status == RF_OK)
        print_share("misfit, two defects", two.flagged, two.n);
    fflush(stdout);
    finish(&one);
    finish(&two);
    return status;
}

int main(int argc, char **argv)
{
    struct rf_error error = {0};
    struct rf_models *models = NULL;
    size_t jobs = argc > 1 ? strtoul(argv[1], NULL, 10) : 1000;
    uint32_t seed = argc > 2 ? (uint32_t)strtoul(argv[2], NULL, 10) : 1;
    if (jobs == 0 || jobs > 100000) {
        fprintf(stderr, "usage: bench_accuracy [JOBS, 1 to 100000 [SEED]]\n");
        return 2;
    }
    gsl_set_error_handler_off();
    enum rf_status status = rf_models_load(NULL, RF_RATES_CONSULTED, &models, &error);
    if (status == RF_OK) {
        printf("seed %lu\n", (unsigned long)seed);
        status = bench_plan("standard readings", PLAN_STANDARD, models, jobs, seed, &error);
    }
    if (status == RF_OK)
        status = bench_plan("a few more readings", PLAN_EXTRA, models, jobs, seed, &error);
    if (status != RF_OK)
        fprintf(stderr, "%s: %s\n", rf_status_text(status), error.text);
    rf_models_destroy(models);
    return (int)rf_status_class(status);
}
