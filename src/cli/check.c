/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "cli/command.h"

#include "diagnosis/diagnosis.h"

struct context {
    const struct rf_models *models;
};

static void say_count(struct text *out, size_t n, const char *one, const char *several)
{
    text_addf(out, "%zu %s", n, n == 1 ? one : several);
}

/* What a diagnosis would refuse, without the diagnosis. */
static enum rf_status check(const struct rf_job *job, const struct rf_models *models,
                            struct rf_error *error)
{
    struct wiring ring = {0};
    enum rf_status status = wiring_init(&ring, job, models, error);
    if (status == RF_OK)
        status = check_range(&ring, error);
    wiring_finish(&ring);
    if (status == RF_OK && rf_job_has_found(job)) {
        struct hypothesis found;
        status = hypothesis_from_found(job, models, &found, error);
    }
    return status;
}

static enum rf_status one_job(void *context, const struct rf_job *job, struct rf_error *error)
{
    const struct context *in = context;
    enum rf_status status = check(job, in->models, error);
    if (status != RF_OK)
        return status;
    struct text out = {0};
    text_addf(&out, "%s: can be diagnosed: ", job->source);
    say_count(&out, rf_job_points(job), "point", "points");
    text_add(&out, ", ");
    say_count(&out, rf_job_spurs(job), "spur point", "spur points");
    text_add(&out, ", ");
    say_count(&out, rf_job_readings(job), "reading", "readings");
    text_add(&out, rf_job_has_found(job) ? ", what was found\n" : "\n");
    status = put(&out, error);
    text_finish(&out);
    return status;
}

static enum rf_class run(const struct invocation *invocation)
{
    struct rf_models *models = NULL;
    enum rf_status status = load_models(invocation, &models);
    if (status != RF_OK)
        return rf_status_class(status);
    struct context context = {.models = models};
    enum rf_class class = each_job(invocation, one_job, &context);
    rf_models_destroy(models);
    return class;
}

const struct command command_check = {
    .name = "check",
    .summary = "read job files and say what is wrong in them",
    .operands = "JOB…",
    .about =
        "Reads each job and diagnoses nothing. A job that would be refused is named on standard "
        "error with the place in the file, what was found there and what would be right; for "
        "any other a line on standard output says how much it holds.\n\n"
        "JOB is a file of one job, or of one job a line; - reads standard input.",
    .n_options = 1,
    .options = {{"models", "DIR", "take the models from DIR instead of those compiled in"}},
    .least = 1,
    .most = SEVERAL,
    .needs = "a job file, or - for standard input",
    .run = run,
};
