/* SPDX-License-Identifier: GPL-3.0-or-later */

/*
 * Posteriors against those of an independent implementation of the same model that screens nothing
 * (reference/README.md): invented jobs, seventy of them. As many hypotheses compared; every fault
 * that either of the two gives more than 0.01 gets the same from both, within `tolerance`; with
 * screening and without.
 */

#include "diagnosis/diagnosis.h"

#include "../shipped_models.h"
#include "../suite.h"
#include "reference.h"

#include <cjson/cJSON.h>
#include <check.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>

enum { NAME_MOST = 256 };

static const double compared = 0.01;
static const double tolerance = 0.01;

static const size_t jobs_in[N_REFERENCE_FILES] = {30, 25, 15};

/* The reference's posterior of a hypothesis, 0 where it is not among its leading ones. */
static double reference_posterior(const cJSON *posterior, const struct rf_job *job,
                                  const struct hypothesis *hypothesis)
{
    const cJSON *entry;
    cJSON_ArrayForEach (entry, posterior) {
        struct hypothesis other = {0};
        struct rf_error error;
        ck_assert_msg(fault_from_json(cJSON_GetArrayItem(entry, 0), job, models, "posterior",
                                      &other.faults[0], &error) == RF_OK,
                      "%s", error.text);
        other.n_faults = other.faults[0].family->apply != NULL;
        if (hypothesis_equal(&other, hypothesis))
            return exp(cJSON_GetArrayItem(entry, 1)->valuedouble);
    }
    return 0;
}

/* Largest difference over what we give weight; the sum of what the reference gives the same faults
 * (*met), so that what we give none shows too. */
static double compare(const struct rf_diagnosis *diagnosis, const cJSON *posterior, double *met)
{
    double largest = 0;
    *met = 0;
    for (size_t i = 0; i < diagnosis->n_ranked; i++) {
        const struct ranked *ours = &diagnosis->ranked[i];
        double theirs = reference_posterior(posterior, diagnosis->job, &ours->hypothesis);
        double difference = fabs(ours->confidence - theirs);
        if (theirs > compared)
            *met += theirs;
        if (fmax(ours->confidence, theirs) <= compared)
            continue;
        if (difference > tolerance)
            fprintf(stderr, "%s: %s: %.4f here, %.4f in the reference\n", diagnosis->job->source,
                    ours->words, ours->confidence, theirs);
        largest = fmax(largest, difference);
    }
    return largest;
}

static double leading(const cJSON *posterior)
{
    double sum = 0;
    const cJSON *entry;
    cJSON_ArrayForEach (entry, posterior) {
        double p = exp(cJSON_GetArrayItem(entry, 1)->valuedouble);
        sum += p > compared ? p : 0;
    }
    return sum;
}

/* Whether the job agrees. */
static bool check_job(const cJSON *line, const char *name, bool screen)
{
    struct rf_diagnosis *diagnosis;
    struct rf_error error;
    struct rf_job *job = reference_job(line, name);
    const cJSON *posterior = cJSON_GetObjectItem(line, "posterior");
    ck_assert_msg(diagnose(job, models, screen, &diagnosis, &error) == RF_OK, "%s", error.text);
    ck_assert_uint_eq(rf_diagnosis_hypotheses(diagnosis),
                      (size_t)cJSON_GetObjectItem(line, "hypotheses")->valuedouble);
    double met, largest = compare(diagnosis, posterior, &met);
    bool agrees = largest <= tolerance && leading(posterior) - met <= tolerance;
    if (!agrees)
        fprintf(stderr, "%s: differs by up to %.4f; %.4f of the reference's weight is not here\n",
                name, largest, leading(posterior) - met);
    rf_diagnosis_destroy(diagnosis);
    rf_job_destroy(job);
    return agrees;
}

START_TEST(posteriors_agree)
{
    char name[NAME_MOST], *text = NULL;
    size_t room = 0, jobs = 0, differ = 0, which = (size_t)_i / 2;
    bool screen = _i % 2 == 0;
    FILE *file = reference_open(which);
    for (; getline(&text, &room, file) > 0; jobs++) {
        cJSON *line = cJSON_Parse(text);
        ck_assert_ptr_nonnull(line);
        snprintf(name, sizeof name, "%s:%zu", reference_files[which], jobs + 1);
        differ += !check_job(line, name, screen);
        cJSON_Delete(line);
    }
    free(text);
    fclose(file);
    ck_assert_uint_eq(jobs, jobs_in[which]);
    ck_assert_uint_eq(differ, 0);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("reference");
    TCase *tests = tcase_create("posteriors");
    tcase_add_checked_fixture(tests, load_models, unload_models);
    tcase_set_timeout(tests, 120);
    tcase_add_loop_test(tests, posteriors_agree, 0, 2 * N_REFERENCE_FILES);
    suite_add_tcase(suite, tests);
    return run_suite(suite);
}
