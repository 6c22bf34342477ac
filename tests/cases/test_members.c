/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * The members of every family on the reference jobs (reference/README.md): as many as the
 * independent implementation compared, and every fault it names among them.
 */
#include "base/json.h"
#include "faults/fault.h"

#include "../shipped_models.h"
#include "../suite.h"
#include "reference.h"

#include <check.h>
#include <stdio.h>
#include <stdlib.h>

enum { MOST_FAULTS = 2000, JOBS = 70 };

struct members {
    struct fault faults[MOST_FAULTS];
    size_t n;
};

static bool collect(void *context, const struct fault *fault)
{
    struct members *members = context;
    ck_assert_uint_lt(members->n, MOST_FAULTS);
    members->faults[members->n++] = *fault;
    return true;
}

static struct members members;

static void check_is_member(const cJSON *object, const struct rf_job *job)
{
    struct fault fault;
    struct rf_error error = {0};
    enum rf_status status = fault_from_json(object, job, models, "posterior", &fault, &error);
    ck_assert_msg(status == RF_OK, "%s", error.text);
    for (size_t i = 0; i < members.n; i++)
        if (fault_equal(&members.faults[i], &fault)) {
            cJSON *written = fault_to_json(&fault, job);
            ck_assert(cJSON_Compare(written, object, true));
            cJSON_Delete(written);
            return;
        }
    ck_abort_msg("%s is no member", fault.family->name);
}

static void check_line(const char *text)
{
    cJSON *line = cJSON_Parse(text);
    ck_assert_ptr_nonnull(line);
    struct rf_job *job = reference_job(line, "reference");
    members.n = 0;
    for (size_t i = 0; i < n_fault_families; i++)
        fault_families[i]->enumerate(job, models, collect, &members);
    ck_assert_double_eq(cJSON_GetObjectItem(line, "hypotheses")->valuedouble, (double)members.n);
    check_is_member(cJSON_GetObjectItem(line, "truth"), job);
    const cJSON *entry;
    cJSON_ArrayForEach(entry, cJSON_GetObjectItem(line, "posterior"))
        check_is_member(cJSON_GetArrayItem(entry, 0), job);
    rf_job_destroy(job);
    cJSON_Delete(line);
}

START_TEST(members_are_the_reference_s)
{
    size_t jobs = 0;
    for (size_t i = 0; i < N_REFERENCE_FILES; i++) {
        FILE *file = reference_open(i);
        char *line = NULL;
        size_t room = 0;
        for (; getline(&line, &room, file) > 0; jobs++)
            check_line(line);
        free(line);
        fclose(file);
    }
    ck_assert_uint_eq(jobs, JOBS);
}
END_TEST

START_TEST(shipped_models_have_every_row)
{
    struct rf_error error = {0};
    ck_assert_msg(fault_check_models(models, &error) == RF_OK, "%s", error.text);
}
END_TEST

static Suite *members_suite(void)
{
    Suite *suite = suite_create("members");
    TCase *reference = tcase_create("reference");
    tcase_add_unchecked_fixture(reference, load_models, unload_models);
    tcase_add_test(reference, members_are_the_reference_s);
    tcase_add_test(reference, shipped_models_have_every_row);
    suite_add_tcase(suite, reference);
    return suite;
}

int main(void)
{
    return run_suite(members_suite());
}
