/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * A review when memory is short: each allocation of the library fails in turn, from opening a
 * folder to joining parts and learning. The jobs are invented.
 */
#include "report/review_report.h"
#include "review/pipeline.h"

#include "../failing.h"
#include "../suite.h"

#include <check.h>
#include <gsl/gsl_errno.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

static char folder[] = "/tmp/ringfettle-memory-XXXXXX";
static struct rf_models *models;

static const char job[] =
    "{\"format\": \"ringfettle-job/1\", \"job\": \"j\", \"ring\": {\"points\": [{\"id\": \"P1\"}]},"
    " \"readings\": {\"end_to_end\": {\"l\": 0.3, \"n\": \"open\"}}, \"found\": {\"family\": "
    "\"break\", \"run\": [\"out\", \"P1\"], \"conductor\": \"N\"}}\n";

static void write_job(const char *name)
{
    char path[64];
    snprintf(path, sizeof path, "%s/%s", folder, name);
    FILE *file = fopen(path, "wb");
    ck_assert_ptr_nonnull(file);
    ck_assert_int_ge(fputs(job, file), 0);
    ck_assert_int_eq(fclose(file), 0);
}

static void set_up(void)
{
    gsl_set_error_handler_off();
    strcpy(folder + sizeof folder - 7, "XXXXXX");
    ck_assert_ptr_nonnull(mkdtemp(folder));
    write_job("a.json");
    write_job("b.json");
    ck_assert_int_eq(rf_models_load(NULL, RF_RATES_ARCHIVE, &models, NULL), RF_OK);
}

static void tear_down(void)
{
    char command[64];
    rf_models_destroy(models);
    snprintf(command, sizeof command, "rm -r %s", folder);
    ck_assert_int_eq(system(command), 0);
}

static void render(const void *context, const struct rf_diagnosis *diagnosis,
                   const struct review_line *line, struct text *out)
{
    (void)context;
    (void)diagnosis;
    report_review_line(line, out);
}

static enum rf_status accept(void *context, const struct review_line *line, const struct text *out,
                             struct rf_error *error)
{
    size_t *accepted = context;
    (void)line;
    (void)out;
    (void)error;
    ++*accepted;
    return RF_OK;
}

static void refuse(void *context, const struct rf_error *error)
{
    (void)context;
    (void)error;
}

static enum rf_status review_folder(struct rf_review **review, size_t *accepted,
                                    struct rf_error *error)
{
    char *paths[] = {folder};
    struct review_input *input = NULL;
    const struct review_sink sink = {accepted, render, accept, refuse, NULL};
    *accepted = 0;
    enum rf_status status = rf_review_create(review, error);
    if (status == RF_OK)
        status = review_input_open(paths, 1, &input, error);
    if (status == RF_OK)
        status = review_run(input, models, 1, NULL, &sink, *review, error);
    review_input_close(input);
    return status;
}

START_TEST(reviewing)
{
    struct rf_error error;
    struct rf_review *review = NULL;
    size_t accepted, needed;
    allocations = fail_at = 0;
    enum rf_status first = review_folder(&review, &accepted, &error);
    needed = allocations; /* before Check allocates */
    ck_assert_int_eq(first, RF_OK);
    ck_assert_uint_eq(accepted, 2);
    ck_assert_uint_eq(rf_review_confirmed(review), 2);
    rf_review_destroy(review);
    ck_assert_uint_gt(needed, 50);
    for (size_t i = 1; i <= needed; i++) {
        review = NULL;
        allocations = 0;
        fail_at = i;
        enum rf_status status = review_folder(&review, &accepted, &error);
        fail_at = 0;
        ck_assert_msg(status == RF_MEMORY, "allocation %zu of %zu: status %d", i, needed,
                      (int)status);
        rf_review_destroy(review);
    }
}
END_TEST

static enum rf_status join_and_learn(const struct rf_review *part, struct rf_error *error)
{
    struct rf_review *whole = NULL;
    char *text = NULL;
    enum rf_status status = rf_review_create(&whole, error);
    if (status == RF_OK)
        status = rf_review_join(whole, part, error);
    if (status == RF_OK)
        status = rf_review_learn(whole, models, 10, &text, error);
    free(text);
    rf_review_destroy(whole);
    return status;
}

START_TEST(joining_and_learning)
{
    struct rf_error error;
    struct rf_review *part;
    struct review_line line = {.job = (char[]){"j"},
                               .words = (char[]){"w"},
                               .verdict = VERDICT_DEFECT,
                               .found.known = true};
    fail_at = 0;
    ck_assert_int_eq(rf_review_create(&part, &error), RF_OK);
    for (int i = 0; i < 25; i++)
        ck_assert_int_eq(review_add_line(part, &line, &error), RF_OK);
    allocations = 0;
    enum rf_status first = join_and_learn(part, &error);
    size_t needed = allocations; /* before Check allocates */
    ck_assert_int_eq(first, RF_OK);
    for (size_t i = 1; i <= needed; i++) {
        allocations = 0;
        fail_at = i;
        enum rf_status status = join_and_learn(part, &error);
        fail_at = 0;
        ck_assert_msg(status == RF_MEMORY, "allocation %zu of %zu: status %d", i, needed,
                      (int)status);
    }
    rf_review_destroy(part);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("a review when memory is short");
    TCase *tests = tcase_create("memory");
    tcase_set_timeout(tests, 60);
    tcase_add_checked_fixture(tests, set_up, tear_down);
    tcase_add_test(tests, reviewing);
    tcase_add_test(tests, joining_and_learning);
    suite_add_tcase(suite, tests);
    return run_suite(suite);
}
