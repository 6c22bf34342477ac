/* SPDX-License-Identifier: GPL-3.0-or-later */

/*
 * Priors learned from confirmed jobs serve jobs that were held back. A firm whose jobs go wrong in
 * another way than the shipped priors say is invented: mostly joints and contacts. What was found
 * in some of its simulated jobs is learned from; others, held back, are diagnosed under the shipped
 * and under the learned priors. Seeds are fixed.
 */

#include "base/text.h"
#include "review/tally.h"
#include "simulation/simulation.h"

#include "../suite.h"

#include <check.h>
#include <gsl/gsl_errno.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

enum { LEARNED_FROM = 150, HELD_BACK = 60, FIRST_HELD_BACK = 5000 };

static char folder[] = "/tmp/ringfettle-learn-XXXXXX";

/* joint .40, contact .30, none .10; the others share the rest in their old proportions. */
static void shift(struct rf_models *models)
{
    static const struct {
        const char *name;
        double prior;
    } shifted[] = {{"joint", 0.40}, {"contact", 0.30}, {"none", 0.10}};
    enum { N = sizeof shifted / sizeof shifted[0] };
    double others = 0;
    for (size_t pass = 0; pass < 2; pass++)
        for (size_t i = 0; i < models->n_families; i++) {
            struct family_prior *row = &models->families[i];
            size_t j = 0;
            while (j < N && strcmp(row->name, shifted[j].name) != 0)
                j++;
            if (pass == 0)
                others += j == N ? row->prior : 0;
            else
                row->prior = j < N ? shifted[j].prior : row->prior * 0.20 / others;
        }
}

static struct rf_models *load(const char *directory)
{
    struct rf_models *models;
    struct rf_error error;
    ck_assert_msg(rf_models_load(directory, RF_RATES_CONSULTED, &models, &error) == RF_OK, "%s",
                  error.text);
    return models;
}

static struct truth *invent(const struct rf_models *models, uint32_t seed)
{
    struct rf_job *ring;
    struct truth *truth;
    struct rf_error error;
    const struct simulation simulation = {.seed = seed};
    ck_assert_int_eq(simulation_random_ring(seed, PLAN_STANDARD, &ring, &error), RF_OK);
    ck_assert_msg(simulate(ring, models, &simulation, &truth, &error) == RF_OK, "%s", error.text);
    rf_job_destroy(ring);
    return truth;
}

/* Learning goes by what was found alone, so these need no diagnosis. */
static void confirm(struct rf_review *review, const struct truth *truth)
{
    struct review_line line = {.job = (char[]){"j"}, .words = (char[]){"w"}};
    const struct fault_family *family =
        truth->hypothesis.n_faults > 0 ? truth->hypothesis.faults[0].family : &fault_family_none;
    line.found.known = true;
    while (fault_families[line.found.sort.family] != family)
        line.found.sort.family++;
    if (family->kind != NULL)
        line.found.sort.kind = family->kind(&truth->hypothesis.faults[0]);
    ck_assert_int_eq(review_add_line(review, &line, NULL), RF_OK);
}

/* A models directory: the shipped files, but for these fault priors. */
static void write_models(const char *faults)
{
    char command[512], path[64];
    snprintf(command, sizeof command, "cp \"$RINGFETTLE_SOURCE\"/models/*.json %s", folder);
    ck_assert_int_eq(system(command), 0);
    snprintf(path, sizeof path, "%s/faults.json", folder);
    FILE *file = fopen(path, "wb");
    ck_assert_ptr_nonnull(file);
    ck_assert_int_ge(fputs(faults, file), 0);
    ck_assert_int_eq(fclose(file), 0);
}

static double score(const struct rf_models *shifted, const struct rf_models *models)
{
    struct rf_review *review;
    ck_assert_int_eq(rf_review_create(&review, NULL), RF_OK);
    for (uint32_t i = 0; i < HELD_BACK; i++) {
        struct truth *truth = invent(shifted, FIRST_HELD_BACK + i);
        struct rf_diagnosis *diagnosis;
        struct rf_error error;
        ck_assert_msg(rf_diagnose(truth->job, models, &diagnosis, &error) == RF_OK, "%s",
                      error.text);
        ck_assert_int_eq(rf_review_add(review, diagnosis, &error), RF_OK);
        rf_diagnosis_destroy(diagnosis);
        truth_destroy(truth);
    }
    ck_assert_uint_eq(rf_review_confirmed(review), HELD_BACK);
    double mean = rf_review_mean_log_posterior(review);
    rf_review_destroy(review);
    return mean;
}

START_TEST(learned_priors_serve_jobs_held_back)
{
    struct rf_models *shipped = load(NULL), *shifted = load(NULL);
    struct rf_review *review;
    struct rf_error error;
    char *text;
    shift(shifted);
    ck_assert_int_eq(rf_review_create(&review, NULL), RF_OK);
    for (uint32_t i = 0; i < LEARNED_FROM; i++) {
        struct truth *truth = invent(shifted, i);
        confirm(review, truth);
        truth_destroy(truth);
    }
    ck_assert_msg(rf_review_learn(review, shipped, 100, &text, &error) == RF_OK, "%s", error.text);
    ck_assert_ptr_nonnull(mkdtemp(folder));
    write_models(text);
    struct rf_models *learned = load(folder);
    ck_assert_double_gt(models_family(learned, "joint")->prior,
                        models_family(shipped, "joint")->prior);
    ck_assert_double_gt(models_family(learned, "joint")->count, 0);

    double before = score(shifted, shipped), after = score(shifted, learned);
    printf("mean log posterior of %d jobs held back: %.4f shipped, %.4f learned from %d\n",
           HELD_BACK, before, after, LEARNED_FROM);
    ck_assert_double_gt(after, before + 0.05);

    char command[64];
    snprintf(command, sizeof command, "rm -r %s", folder);
    ck_assert_int_eq(system(command), 0);
    free(text);
    rf_models_destroy(learned);
    rf_models_destroy(shifted);
    rf_models_destroy(shipped);
    rf_review_destroy(review);
}
END_TEST

int main(void)
{
    gsl_set_error_handler_off();
    Suite *suite = suite_create("review_learn");
    TCase *cases = tcase_create("learn");
    tcase_set_timeout(cases, 120);
    tcase_add_test(cases, learned_priors_serve_jobs_held_back);
    suite_add_tcase(suite, cases);
    return run_suite(suite);
}
