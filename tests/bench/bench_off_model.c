/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * How far the diagnosis can be trusted where its assumptions do not hold: bench_off_model
 * [JOBS [SEED]], 400 and 1 if not given. Invented rings, standard readings, and
 *
 *   on the model         nothing departs; for comparison
 *   heavy tails          noise of Student's t, 4 degrees, of the same variance
 *   faces                an exponential resistance, 0.02 Ω on average, in every way to a face
 *   lengths              runs twice as wrong, of the log, as recorded
 *   second defect        two; right is what is first and is one of them, or both where two are first
 *
 * first: the true fault is first; error: calibration (calibration.h). Of all jobs, as reported and as
 * it would be if only one defect under the model were compared; of those flagged, too; of those not
 * flagged; and of those that something wider explains (diagnosis/widen.c, pairs.c).
 */

#include "calibration.h"

#include "diagnosis/diagnosis.h"
#include "simulation/simulation.h"

#include <gsl/gsl_errno.h>
#include <stdio.h>
#include <stdlib.h>

struct departure {
    const char *name;
    struct departures departures;
    size_t defects;
};

static const struct departure table[] = {
    {"on the model", {0}, 0},
    {"heavy tails", {.heavy_tails = true}, 0},
    {"faces", {.contact_ohms = 0.02}, 0},
    {"lengths", {.length_factor = 2}, 0},
    {"second defect", {0}, 2},
};

enum group { ALL, ALL_BEFORE, UNFLAGGED, FLAGGED, FLAGGED_BEFORE, FACES, LENGTHS, TWO, N_GROUPS };

static const char *const group_names[N_GROUPS] = {"as reported",  "  otherwise",     "not flagged",
                                                  "flagged",      "  otherwise",     "  by faces",
                                                  "  by lengths", "  by two defects"};

struct score {
    struct group_score {
        size_t n, right;
        struct bin bins[N_BINS];
    } groups[N_GROUPS];
};

static bool is_right(const struct rf_diagnosis *d, const struct hypothesis *first)
{
    for (size_t i = 0; i < d->found.n_faults; i++)
        if (first->n_faults == 1 && fault_equal(&first->faults[0], &d->found.faults[i]))
            return true;
    return hypothesis_equal(first, &d->found);
}

static void count(struct score *score, enum group group, double confidence, bool right)
{
    score->groups[group].n++;
    score->groups[group].right += right;
    count_in_bin(score->groups[group].bins, confidence, right);
}

static void count_job(struct score *score, const struct rf_diagnosis *d)
{
    double confidence = d->ranked[0].confidence, before = confidence;
    bool right = is_right(d, &d->ranked[0].hypothesis), right_before = right;
    if (d->wider.assumed) {
        before = d->wider.otherwise_confidence;
        right_before = is_right(d, &d->wider.otherwise_first);
        count(score,
              d->wider.two_defects     ? TWO
              : d->wider.face_ohms > 0 ? FACES
                                       : LENGTHS,
              confidence, right);
    }
    count(score, ALL, confidence, right);
    count(score, ALL_BEFORE, before, right_before);
    count(score, d->misfit.flag ? FLAGGED : UNFLAGGED, confidence, right);
    if (d->misfit.flag)
        count(score, FLAGGED_BEFORE, before, right_before);
}

static enum rf_status run_job(const struct departure *departure, const struct rf_models *models,
                              uint32_t seed, struct score *score, struct rf_error *error)
{
    struct rf_job *ring = NULL;
    struct truth *truth = NULL;
    struct rf_diagnosis *d = NULL;
    const struct simulation simulation = {
        .seed = seed, .defects = departure->defects, .departures = departure->departures};
    enum rf_status status = simulation_random_ring(seed, PLAN_STANDARD, &ring, error);
    if (status == RF_OK)
        status = simulate(ring, models, &simulation, &truth, error);
    if (status == RF_OK)
        status = rf_diagnose(truth->job, models, &d, error);
    if (status == RF_OK)
        count_job(score, d);
    rf_diagnosis_destroy(d);
    truth_destroy(truth);
    rf_job_destroy(ring);
    return status;
}

static void print_score(const char *name, const struct score *score)
{
    printf("%s\n", name);
    for (size_t g = 0; g < N_GROUPS; g++) {
        const struct group_score *group = &score->groups[g];
        if (group->n > 0)
            printf("  %-16s %4zu jobs, first %.3f, error %.3f\n", group_names[g], group->n,
                   (double)group->right / (double)group->n, calibration_error(group->bins));
    }
    for (size_t i = 0; i < N_BINS; i++) {
        const struct bin *bin = &score->groups[ALL].bins[i];
        if (bin->n > 0)
            printf("    confidence %.2f to %.2f: %4zu jobs, mean %.3f, right %.3f\n", bounds[i],
                   bounds[i + 1], bin->n, bin->confidence / (double)bin->n,
                   (double)bin->right / (double)bin->n);
    }
    fflush(stdout);
}

int main(int argc, char **argv)
{
    struct rf_error error = {0};
    struct rf_models *models = NULL;
    size_t jobs = argc > 1 ? strtoul(argv[1], NULL, 10) : 400;
    uint32_t seed = argc > 2 ? (uint32_t)strtoul(argv[2], NULL, 10) : 1;
    if (jobs == 0 || jobs > 100000) {
        fprintf(stderr, "usage: bench_off_model [JOBS, 1 to 100000 [SEED]]\n");
        return 2;
    }
    gsl_set_error_handler_off();
    enum rf_status status = rf_models_load(NULL, RF_RATES_CONSULTED, &models, &error);
    for (size_t i = 0; i < sizeof table / sizeof table[0] && status == RF_OK; i++) {
        struct score score = {0};
        for (size_t job = 0; job < jobs && status == RF_OK; job++)
            status = run_job(&table[i], models, seed * 100000u + (uint32_t)job, &score, &error);
        if (status == RF_OK)
            print_score(table[i].name, &score);
    }
    if (status != RF_OK)
        fprintf(stderr, "%s: %s\n", rf_status_text(status), error.text);
    rf_models_destroy(models);
    return (int)rf_status_class(status);
}
