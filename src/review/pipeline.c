/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "review/pipeline.h"

#include "base/error.h"
#include "base/memory.h"

#include <omp.h>

/* Long enough that threads seldom wait for the window's last job. */
enum { WINDOW = 64 };

/* A job on its way; `job` NULL: what stands there was refused. */
struct passage {
    struct rf_job *job;
    uint64_t number; /* of the job among those read */
    bool done;
    enum rf_status status;
    struct rf_error error;
    struct review_line line;
    struct text out; /* kept from window to window */
};

struct run {
    struct review_input *input;
    const struct rf_models *models;
    const struct review_sink *sink;
    const volatile sig_atomic_t *stop;
    struct rf_review *review;
    uint64_t n_read;
    struct passage window[WINDOW];
};

static bool stopped(const struct run *run)
{
    return run->stop != NULL && *run->stop != 0;
}

/* Fills the window; *n is less than WINDOW at the end. */
static enum rf_status read_window(struct run *run, size_t *n, struct rf_error *error)
{
    for (*n = 0; *n < WINDOW && !stopped(run); ++*n) {
        struct passage *passage = &run->window[*n];
        passage->status = review_input_next(run->input, &passage->job, &passage->error);
        passage->done = passage->status != RF_OK;
        passage->number = passage->done ? 0 : ++run->n_read;
        if (passage->status == RF_MEMORY)
            return fail_memory(error);
        if (passage->status == RF_OK && passage->job == NULL)
            break;
    }
    return RF_OK;
}

static void diagnose_passage(const struct run *run, struct passage *passage)
{
    struct rf_diagnosis *diagnosis = NULL;
    passage->status = rf_diagnose(passage->job, run->models, &diagnosis, &passage->error);
    if (passage->status == RF_OK)
        passage->status = line_of_diagnosis(&passage->line, diagnosis, &passage->error);
    if (passage->status == RF_OK) {
        passage->line.number = passage->number;
        run->sink->render(run->sink->context, diagnosis, &passage->line, &passage->out);
        if (passage->out.failed)
            passage->status = fail_memory(&passage->error);
    }
    rf_diagnosis_destroy(diagnosis);
    passage->done = true;
}

static void diagnose_window(struct run *run, size_t n, int threads)
{
#pragma omp parallel for schedule(dynamic, 1) num_threads(threads)
    for (size_t i = 0; i < n; i++) {
        struct passage *passage = &run->window[i];
        if (!passage->done && !stopped(run))
            diagnose_passage(run, passage);
    }
}

static void count_refusal(struct rf_review *review, enum rf_status status)
{
    switch (rf_status_class(status)) {
    case RF_CLASS_DONE:
        break;
    case RF_CLASS_INPUT:
        review->refused++;
        break;
    case RF_CLASS_NUMERICAL:
        review->failed++;
        break;
    case RF_CLASS_SYSTEM:
        review->unread++;
        break;
    }
}

static enum rf_status hand_on(struct run *run, struct passage *passage, struct rf_error *error)
{
    if (passage->status == RF_MEMORY)
        return fail_memory(error);
    if (passage->status != RF_OK) {
        count_refusal(run->review, passage->status);
        run->sink->refuse(run->sink->context, &passage->error);
        return RF_OK;
    }
    enum rf_status status = review_add_line(run->review, &passage->line, error);
    if (status == RF_OK)
        status = run->sink->accept(run->sink->context, &passage->line, &passage->out, error);
    return status;
}

static void clear_window(struct run *run)
{
    for (size_t i = 0; i < WINDOW; i++) {
        struct passage *passage = &run->window[i];
        rf_job_destroy(passage->job);
        passage->job = NULL;
        passage->done = false;
        line_finish(&passage->line);
        text_clear(&passage->out);
    }
}

static enum rf_status run_window(struct run *run, int threads, bool *more, struct rf_error *error)
{
    size_t n;
    enum rf_status status = read_window(run, &n, error);
    *more = n == WINDOW;
    if (status != RF_OK)
        return status;
    diagnose_window(run, n, threads);
    for (size_t i = 0; i < n && status == RF_OK; i++) {
        if (run->window[i].done)
            status = hand_on(run, &run->window[i], error);
    }
    if (status == RF_OK && run->sink->pause != NULL)
        run->sink->pause(run->sink->context);
    return status;
}

enum rf_status review_run(struct review_input *input, const struct rf_models *models, int threads,
                          const volatile sig_atomic_t *stop, const struct review_sink *sink,
                          struct rf_review *review, struct rf_error *error)
{
    struct run *run = NEW(struct run);
    if (run == NULL)
        return fail_memory(error);
    run->input = input;
    run->models = models;
    run->sink = sink;
    run->stop = stop;
    run->review = review;
    if (threads <= 0)
        threads = omp_get_max_threads();
    enum rf_status status = RF_OK;
    bool more = true;
    while (more && status == RF_OK && !stopped(run)) {
        status = run_window(run, threads, &more, error);
        clear_window(run);
    }
    review->stopped = review->stopped || (status == RF_OK && stopped(run));
    for (size_t i = 0; i < WINDOW; i++)
        text_finish(&run->window[i].out);
    free(run);
    return status;
}
