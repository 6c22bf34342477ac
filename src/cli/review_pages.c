/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "cli/review_pages.h"

#include "advice/advice.h"
#include "base/error.h"
#include "cli/file.h"
#include "report/archive_page.h"
#include "report/page.h"
#include "review/input.h"

#include <errno.h>
#include <stdio.h>
#include <string.h>
#include <sys/stat.h>

/* Names are the program's own, since those of jobs can be anything. */
struct pages {
    const char *folder;
    const struct rf_models *models;
    const struct rf_review *review;
    struct page_name names[WORST_SHOWN]; /* as review->worst */
    size_t written;
};

static enum rf_status write_in(const struct pages *pages, const char *name,
                               const struct text *content, struct rf_error *error)
{
    struct text path = {0};
    text_addf(&path, "%s/%s", pages->folder, name);
    enum rf_status status =
        path.failed ? fail_memory(error) : file_write(path.bytes, content, error);
    text_finish(&path);
    return status;
}

static enum rf_status write_job(struct pages *pages, size_t worst, const struct rf_job *job,
                                struct rf_error *error)
{
    struct rf_diagnosis *diagnosis = NULL;
    struct rf_advice *advice = NULL;
    struct text page = {0};
    struct page_name file;
    snprintf(file.name, sizeof file.name, "job-%llu.html",
             (unsigned long long)pages->review->worst[worst].number);
    enum rf_status status = rf_diagnose(job, pages->models, &diagnosis, error);
    if (status == RF_OK)
        status = rf_advise(diagnosis, &advice, error);
    if (status == RF_OK)
        status = report_page(diagnosis, advice, &page, error);
    if (status == RF_OK)
        status = write_in(pages, file.name, &page, error);
    if (status == RF_OK) {
        pages->names[worst] = file;
        pages->written++;
    }
    text_finish(&page);
    rf_advice_destroy(advice);
    rf_diagnosis_destroy(diagnosis);
    return status;
}

/* The job's rank among the worst, n_worst where it has none. Files may have changed since. */
static size_t rank_of(const struct rf_review *review, uint64_t number, const char *name)
{
    size_t i = 0;
    while (i < review->n_worst &&
           (review->worst[i].number != number || strcmp(review->worst[i].job, name) != 0))
        i++;
    return i;
}

/* What is refused now was refused, and told, before. */
static enum rf_status write_jobs(struct pages *pages, struct review_input *input,
                                 struct rf_error *error)
{
    enum rf_status status = RF_OK;
    uint64_t number = 0;
    while (pages->written < pages->review->n_worst) {
        struct rf_job *job = NULL;
        struct rf_error refusal;
        status = review_input_next(input, &job, &refusal);
        if (status == RF_MEMORY)
            return fail_memory(error);
        if (status != RF_OK)
            continue;
        if (job == NULL)
            break;
        size_t worst = rank_of(pages->review, ++number, rf_job_name(job));
        if (worst < pages->review->n_worst)
            status = write_job(pages, worst, job, error);
        rf_job_destroy(job);
        if (status != RF_OK)
            return status;
    }
    return RF_OK;
}

enum rf_status write_review_pages(const struct invocation *invocation,
                                  const struct rf_models *models, const struct rf_review *review,
                                  struct rf_error *error)
{
    struct pages pages = {
        .folder = option_value(invocation, "page"), .models = models, .review = review};
    struct review_input *input = NULL;
    struct text index = {0};
    if (mkdir(pages.folder, 0777) != 0 && errno != EEXIST)
        return fail(error, RF_IO, "%s: cannot be made: %s", pages.folder, strerror(errno));
    enum rf_status status =
        review_input_open(invocation->operands, invocation->n_operands, &input, error);
    if (status == RF_OK)
        status = write_jobs(&pages, input, error);
    if (status == RF_OK)
        status = report_archive_page(review, pages.names, &index, error);
    if (status == RF_OK)
        status = write_in(&pages, "index.html", &index, error);
    review_input_close(input);
    text_finish(&index);
    return status;
}
