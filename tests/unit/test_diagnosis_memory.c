/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * A diagnosis when memory is short: each allocation of the library, and of cJSON on its behalf,
 * fails in turn, from reading the job over diagnosing and planning to text, JSON and page. What was
 * allocated until then is freed again, which the address sanitizer watches over where it runs.
 */
#include "advice/advice.h"
#include "report/page.h"
#include "report/report.h"

#include "../failing.h"
#include "../shipped_models.h"
#include "../suite.h"

#include <check.h>
#include <stdio.h>
#include <string.h>

#define TWO_POINTS                                                                                 \
    "{\"format\": \"ringfettle-job/1\", \"ring\": {\"points\": [{\"id\": \"P1\", \"run_m\": 6}, "  \
    "{\"id\": \"P2\", \"run_m\": 5}], \"last_run_m\": 7}, \"readings\": {\"end_to_end\": {\"l\": " \
    "0.14, \"n\": 0.14, \"e\": 0.22}, \"cross_ln\": {\"board\": 0.07, "

/* Invented: a bad joint, spur and all, something of every section; a job nothing explains; one that
 * bad faces explain; one that two defects do. */
static const char *const jobs[] = {
    "{\"format\": \"ringfettle-job/1\", \"job\": \"j\", \"ring\": {\"points\": [{\"id\": \"P1\", "
    "\"label\": \"landing\", \"run_m\": 6}, {\"id\": \"P2\", \"run_m\": 5}, {\"id\": \"P3\"}], "
    "\"last_run_m\": 7, \"spurs\": [{\"id\": \"S1\", \"from\": \"P2\", \"run_m\": 3}]}, "
    "\"readings\": {\"end_to_end\": {\"l\": 0.18, \"n\": 0.68, \"e\": 0.3}, \"cross_ln\": "
    "{\"board\": 0.2, \"P1\": 0.23, \"P2\": [0.21, 0.22], \"P3\": 0.17, \"S1\": 0.25}}, "
    "\"access\": {\"P3\": {\"reach\": 10, \"open\": 6}}, \"opened\": [\"P1\"], "
    "\"found\": {\"family\": \"joint\", \"run\": [\"P2\", \"P3\"], \"conductor\": \"N\"}}",
    "{\"format\": \"ringfettle-job/1\", \"ring\": {\"points\": [{\"id\": \"P1\", \"run_m\": 6}], "
    "\"last_run_m\": 7}, \"readings\": {\"end_to_end\": {\"l\": 9.0, \"n\": \"open\", \"e\": 0}, "
    "\"cross_ln\": {\"P1\": 3.0}, \"cross_le\": {\"P1\": 0}}}",
    TWO_POINTS "\"P1\": [0.08, 0.12], \"P2\": [0.11, 0.11]}, \"cross_le\": {\"board\": 0.09, "
               "\"P1\": [0.39, 0.32], \"P2\": [0.17, 0.16]}}}",
    TWO_POINTS "\"P1\": 0.67, \"P2\": 0.57}, \"cross_le\": {\"board\": 0.09, \"P1\": 0.69, "
               "\"P2\": 0.59}}}",
};

static const char *const assumes[] = {NULL, NULL, "faces", "two_defects"};
enum {
    N_JOBS = sizeof jobs / sizeof *jobs,
    IN_ALL_STEPS = 2 /* the others differ in the first only */
};

enum step { STEP_DIAGNOSE, STEP_ADVISE, STEP_TEXT, STEP_JSON, STEP_PAGE, N_STEPS };
static const char *const step_names[N_STEPS] = {"diagnose", "advise", "text", "JSON", "page"};

static enum rf_status write_report(enum step step, const struct rf_diagnosis *diagnosis,
                                   const struct rf_advice *advice, struct rf_error *error)
{
    struct text out = {0};
    enum rf_status status = RF_OK;
    if (step == STEP_TEXT)
        report_text(diagnosis, advice, &out);
    else if (step == STEP_JSON)
        report_json(diagnosis, advice, &out);
    else
        status = report_page(diagnosis, advice, &out, error);
    if (status == RF_OK && out.failed)
        status = RF_MEMORY;
    text_finish(&out);
    return status;
}

static enum rf_status read_and_diagnose(const char *text, struct rf_job **job,
                                        struct rf_diagnosis **diagnosis, struct rf_error *error)
{
    *diagnosis = NULL;
    enum rf_status status = rf_job_parse(text, strlen(text), "job", job, error);
    return status == RF_OK ? rf_diagnose(*job, models, diagnosis, error) : status;
}

/* The step with allocation `failing` (0: none) refused; *made: how many were asked for. `diagnosis`
 * and `advice` are of the same job, for the steps that start from them. */
static enum rf_status go(const char *text, enum step step, const struct rf_diagnosis *diagnosis,
                         const struct rf_advice *advice, size_t failing, size_t *made)
{
    struct rf_job *own_job = NULL;
    struct rf_diagnosis *own_diagnosis = NULL;
    struct rf_advice *own_advice = NULL;
    struct rf_error error = {0};
    allocations = 0;
    fail_at = failing;
    enum rf_status status = step == STEP_DIAGNOSE
                                ? read_and_diagnose(text, &own_job, &own_diagnosis, &error)
                            : step == STEP_ADVISE ? rf_advise(diagnosis, &own_advice, &error)
                                                  : write_report(step, diagnosis, advice, &error);
    fail_at = 0;
    *made = allocations;
    rf_advice_destroy(own_advice);
    rf_diagnosis_destroy(own_diagnosis);
    rf_job_destroy(own_job);
    return status;
}

START_TEST(each_fails)
{
    int whole = IN_ALL_STEPS * N_STEPS;
    int index = _i < whole ? _i / N_STEPS : IN_ALL_STEPS + _i - whole;
    const char *text = jobs[index];
    enum step step = _i < whole ? (enum step)(_i % N_STEPS) : STEP_DIAGNOSE;
    struct rf_job *job = NULL;
    struct rf_diagnosis *diagnosis = NULL;
    struct rf_advice *advice = NULL;
    struct rf_error error;
    size_t needed, made;
    lead_cjson_here(true);
    ck_assert_int_eq(read_and_diagnose(text, &job, &diagnosis, &error), RF_OK);
    if (assumes[index] == NULL)
        ck_assert_ptr_null(rf_diagnosis_assumes(diagnosis));
    else
        ck_assert_str_eq(rf_diagnosis_assumes(diagnosis), assumes[index]);
    ck_assert_int_eq(rf_advise(diagnosis, &advice, &error), RF_OK);
    ck_assert_int_eq(go(text, step, diagnosis, advice, 0, &needed), RF_OK);
    ck_assert_uint_gt(needed, 3);
    /* What is tried where no one defect explains a job comes late and takes long; the two jobs share it,
     * and every second allocation each. */
    size_t stride = index < IN_ALL_STEPS ? 1 : 2;
    for (size_t i = 1 + (size_t)index % stride; i <= needed; i += stride) {
        enum rf_status status = go(text, step, diagnosis, advice, i, &made);
        ck_assert_msg(status == RF_MEMORY, "%s: allocation %zu of %zu: status %d", step_names[step],
                      i, needed, (int)status);
    }
    printf("job %d, %s: %zu allocations\n", index, step_names[step], needed);
    rf_advice_destroy(advice);
    rf_diagnosis_destroy(diagnosis);
    rf_job_destroy(job);
    lead_cjson_here(false);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("a diagnosis when memory is short");
    TCase *tests = tcase_create("memory");
    tcase_set_timeout(tests, 60);
    tcase_add_checked_fixture(tests, load_models, unload_models);
    tcase_add_loop_test(tests, each_fails, 0, IN_ALL_STEPS * N_STEPS + N_JOBS - IN_ALL_STEPS);
    suite_add_tcase(suite, tests);
    return run_suite(suite);
}
