/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "cli/command.h"

#include "base/error.h"
#include "cli/file.h"
#include "cli/review_pages.h"
#include "report/report.h"
#include "report/review_report.h"
#include "review/merge.h"
#include "review/pipeline.h"

#include <cjson/cJSON.h>
#include <errno.h>
#include <fcntl.h>
#include <math.h>
#include <signal.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>
#include <unistd.h>

enum { THREADS_MOST = 1024 };
static const double default_weight = 100;

/* --- stopping --- */

static volatile sig_atomic_t interrupted;

/* What is being written is written on (SA_RESTART). A read that waits on standard input would go on
 * waiting, too: restarted, it finds the end instead. */
static void interrupt(int number)
{
    int saved = errno, nothing = open("/dev/null", O_RDONLY);
    (void)number;
    interrupted = 1;
    if (nothing >= 0) {
        dup2(nothing, STDIN_FILENO);
        close(nothing);
    }
    errno = saved;
}

/* The first interrupt ends the run in good order, a second one at once. */
static void catch_interrupt(void)
{
    struct sigaction action, before;
    memset(&action, 0, sizeof action);
    action.sa_handler = interrupt;
    action.sa_flags = (int)(SA_RESETHAND | SA_RESTART);
    sigemptyset(&action.sa_mask);
    if (sigaction(SIGINT, NULL, &before) == 0 && before.sa_handler != SIG_IGN)
        sigaction(SIGINT, &action, NULL);
}

/* Ends as an interrupted program does, so that a shell's loop around it stops too. */
static void pass_interrupt_on(void)
{
    if (interrupted == 0)
        return;
    signal(SIGINT, SIG_DFL);
    raise(SIGINT);
}

/* --- options --- */

struct settings {
    bool json;
    const char *rates_name;
    enum rf_base_rates rates;
    int threads;
    double weight;
};

static enum rf_status read_number(const char *name, const char *value, double low, double high,
                                  const char *needs, double *number, struct rf_error *error)
{
    char *end = NULL;
    errno = 0;
    double read = strtod(value, &end);
    if (end == value || *end != '\0' || errno != 0 || !(read >= low) || !(read <= high))
        return fail(error, RF_USAGE, "review: --%s: found %s; needs %s", name, value, needs);
    *number = read;
    return RF_OK;
}

static enum rf_status read_settings(const struct invocation *invocation, struct settings *settings,
                                    struct rf_error *error)
{
    const char *rates = option_value(invocation, "rates");
    const char *threads = option_value(invocation, "threads");
    const char *weight = option_value(invocation, "weight");
    double number = 0;
    enum rf_status status = RF_OK;
    *settings = (struct settings){
        .json = option_value(invocation, "json") != NULL,
        .rates_name = rates != NULL ? rates : "archive",
        .weight = default_weight,
    };
    if (strcmp(settings->rates_name, "archive") == 0)
        settings->rates = RF_RATES_ARCHIVE;
    else if (strcmp(settings->rates_name, "consulted") == 0)
        settings->rates = RF_RATES_CONSULTED;
    else
        status =
            fail(error, RF_USAGE, "review: --rates: found %s; needs archive or consulted", rates);
    if (status == RF_OK && threads != NULL) {
        status = read_number("threads", threads, 1, THREADS_MOST, "a whole number from 1 to 1024",
                             &number, error);
        settings->threads = (int)number;
    }
    if (status == RF_OK && weight != NULL)
        status = read_number("weight", weight, 1e-3, 1e9, "a number of jobs from 0.001 to 1e9",
                             &settings->weight, error);
    return status;
}

static enum rf_status load(const struct invocation *invocation, enum rf_base_rates rates,
                           struct rf_models **models, struct rf_error *error)
{
    return rf_models_load(option_value(invocation, "models"), rates, models, error);
}

/* --- one run --- */

struct progress {
    bool wanted; /* standard error is a terminal */
    bool stands; /* a line of it is there, to be written over */
    struct timespec start, last;
    uint64_t bytes; /* of the input; 0: not known */
};

struct review_context {
    const struct settings *settings;
    const struct review_input *input;
    struct progress progress;
    FILE *csv; /* NULL: none asked for */
    const char *csv_path;
    const struct rf_review *review;
    enum rf_class gravest;
};

static double seconds_since(const struct timespec *then)
{
    struct timespec now;
    clock_gettime(CLOCK_MONOTONIC, &now);
    return (double)(now.tv_sec - then->tv_sec) + 1e-9 * (double)(now.tv_nsec - then->tv_nsec);
}

static void clear_progress(struct progress *progress)
{
    if (progress->stands)
        fputs("\r\033[K", stderr);
    progress->stands = false;
}

/* "640 jobs, 31.2 a second, 4:07 left" */
static void show_progress(void *context)
{
    struct review_context *in = context;
    struct progress *progress = &in->progress;
    if (!progress->wanted || seconds_since(&progress->last) < 0.5)
        return;
    clock_gettime(CLOCK_MONOTONIC, &progress->last);
    double elapsed = seconds_since(&progress->start);
    double done = (double)review_input_read(in->input);
    clear_progress(progress);
    fprintf(stderr, "%llu jobs, %.1f a second", (unsigned long long)in->review->jobs,
            (double)in->review->jobs / elapsed);
    if (progress->bytes > 0 && done > 0) {
        long left = lround(fmax(0, elapsed * ((double)progress->bytes - done) / done));
        fprintf(stderr, ", %ld:%02ld left", left / 60, left % 60);
    }
    fflush(stderr);
    progress->stands = true;
}

/* The diagnosis with what a merge needs as its last member. */
static void add_review_member(const struct review_line *line, struct text *out)
{
    cJSON *member = line_to_json(line);
    char *printed = member != NULL ? cJSON_PrintUnformatted(member) : NULL;
    if (printed != NULL && !out->failed && out->length >= 2) {
        out->length -= 2; /* "}\n" */
        text_addf(out, ",\"review\":%s}\n", printed);
    } else {
        out->failed = true;
    }
    cJSON_free(printed);
    cJSON_Delete(member);
}

static void render(const void *context, const struct rf_diagnosis *diagnosis,
                   const struct review_line *line, struct text *out)
{
    const struct review_context *in = context;
    if (in->settings->json) {
        report_json(diagnosis, NULL, out);
        add_review_member(line, out);
    } else {
        report_review_line(line, out);
    }
}

static enum rf_status put_csv(struct review_context *in, const struct text *row,
                              struct rf_error *error)
{
    if (row->failed)
        return fail_memory(error);
    if (fwrite(row->bytes, 1, row->length, in->csv) == row->length)
        return RF_OK;
    return fail(error, RF_IO, "%s: cannot be written: %s", in->csv_path, strerror(errno));
}

static enum rf_status accept(void *context, const struct review_line *line, const struct text *out,
                             struct rf_error *error)
{
    struct review_context *in = context;
    clear_progress(&in->progress);
    enum rf_status status = put(out, error);
    if (status == RF_OK && in->csv != NULL) {
        struct text row = {0};
        report_review_csv(line, &row);
        status = put_csv(in, &row, error);
        text_finish(&row);
    }
    return status;
}

static void refuse(void *context, const struct rf_error *error)
{
    struct review_context *in = context;
    clear_progress(&in->progress);
    in->gravest = graver(in->gravest, complain_of(error));
}

static enum rf_status open_csv(struct review_context *in, struct rf_error *error)
{
    if (in->csv_path == NULL)
        return RF_OK;
    in->csv = fopen(in->csv_path, "wb");
    if (in->csv == NULL)
        return fail(error, RF_IO, "%s: cannot be opened for writing: %s", in->csv_path,
                    strerror(errno));
    struct text heading = {0};
    report_review_csv_heading(&heading);
    enum rf_status status = put_csv(in, &heading, error);
    text_finish(&heading);
    return status;
}

static enum rf_status close_csv(struct review_context *in, enum rf_status status,
                                struct rf_error *error)
{
    if (in->csv != NULL && fclose(in->csv) != 0 && status == RF_OK)
        status = fail(error, RF_IO, "%s: cannot be written: %s", in->csv_path, strerror(errno));
    return status;
}

static enum rf_status review_paths(const struct invocation *invocation,
                                   const struct settings *settings, struct rf_models *models,
                                   struct rf_review *review, enum rf_class *gravest,
                                   struct rf_error *error)
{
    struct review_input *input = NULL;
    struct review_context context = {
        .settings = settings,
        .csv_path = option_value(invocation, "csv"),
        .review = review,
        .progress.wanted = isatty(STDERR_FILENO) == 1,
    };
    const struct review_sink sink = {&context, render, accept, refuse, show_progress};
    enum rf_status status =
        review_input_open(invocation->operands, invocation->n_operands, &input, error);
    if (status == RF_OK)
        status = open_csv(&context, error);
    if (status == RF_OK) {
        if (context.progress.wanted)
            context.progress.bytes =
                review_input_bytes(invocation->operands, invocation->n_operands);
        clock_gettime(CLOCK_MONOTONIC, &context.progress.start);
        context.progress.last = context.progress.start;
        context.input = input;
        catch_interrupt();
        status = review_run(input, models, settings->threads, &interrupted, &sink, review, error);
        clear_progress(&context.progress);
        if (review_input_passed_over(input) > 0)
            complain("passed over for their names: %zu files in folders",
                     review_input_passed_over(input));
    }
    status = close_csv(&context, status, error);
    review_input_close(input);
    *gravest = graver(*gravest, context.gravest);
    return status;
}

/* --- the command --- */

static enum rf_status merge_parts(const struct invocation *invocation, struct settings *settings,
                                  struct merge_origin *origin, struct rf_review *review,
                                  struct rf_error *error)
{
    enum rf_status status = RF_OK;
    for (size_t i = 0; i < invocation->n_operands && status == RF_OK; i++)
        status = review_merge(invocation->operands[i], origin, review, error);
    if (status == RF_OK)
        settings->rates_name = origin->rates;
    return status;
}

static enum rf_status learn(const struct invocation *invocation, const struct settings *settings,
                            const struct rf_review *review, struct rf_error *error)
{
    const char *path = option_value(invocation, "learn");
    struct rf_models *models = NULL;
    char *written = NULL;
    struct text file = {0};
    if (path == NULL)
        return RF_OK;
    if (interrupted != 0) {
        complain("%s: not written: the review was stopped", path);
        return RF_OK;
    }
    enum rf_status status = load(invocation, RF_RATES_CONSULTED, &models, error);
    if (status == RF_OK)
        status = rf_review_learn(review, models, settings->weight, &written, error);
    if (status == RF_OK) {
        text_add(&file, written);
        status = file_write(path, &file, error);
    }
    text_finish(&file);
    free(written);
    rf_models_destroy(models);
    return status;
}

static enum rf_status put_summary(const struct settings *settings, const char *models,
                                  const struct rf_review *review, struct rf_error *error)
{
    struct text out = {0};
    if (settings->json)
        report_review_json(review, models, settings->rates_name, &out);
    else
        report_review_text(review, &out);
    enum rf_status status = put(&out, error);
    text_finish(&out);
    return status;
}

static enum rf_status refuse_together(const struct invocation *invocation, struct rf_error *error)
{
    static const char *const of_jobs[] = {"csv", "page", "rates", "threads"};
    for (size_t i = 0; i < invocation->n_operands; i++)
        if (option_value(invocation, "page") != NULL && strcmp(invocation->operands[i], "-") == 0)
            return fail(error, RF_USAGE,
                        "review: --page: found - among the paths; needs files or "
                        "folders, since jobs are read a second time");
    if (option_value(invocation, "weight") != NULL && option_value(invocation, "learn") == NULL)
        return fail(error, RF_USAGE, "review: --weight goes with --learn");
    for (size_t i = 0; i < sizeof of_jobs / sizeof of_jobs[0]; i++)
        if (option_value(invocation, "merge") != NULL &&
            option_value(invocation, of_jobs[i]) != NULL)
            return fail(error, RF_USAGE,
                        "review: --%s is for jobs; --merge reads parts already reviewed",
                        of_jobs[i]);
    return RF_OK;
}

static enum rf_status review_all(const struct invocation *invocation, struct rf_review *review,
                                 enum rf_class *gravest, struct rf_error *error)
{
    struct settings settings;
    struct rf_models *models = NULL;
    struct merge_origin origin = {0};
    bool merge = option_value(invocation, "merge") != NULL;
    enum rf_status status = refuse_together(invocation, error);
    if (status == RF_OK)
        status = read_settings(invocation, &settings, error);
    if (status == RF_OK)
        status = load(invocation, settings.rates, &models, error);
    if (status == RF_OK)
        status = merge ? merge_parts(invocation, &settings, &origin, review, error)
                       : review_paths(invocation, &settings, models, review, gravest, error);
    if (status == RF_OK)
        status =
            put_summary(&settings, merge ? origin.models : rf_models_name(models), review, error);
    if (status == RF_OK && option_value(invocation, "page") != NULL)
        status = write_review_pages(invocation, models, review, error);
    if (status == RF_OK)
        status = learn(invocation, &settings, review, error);
    merge_origin_finish(&origin);
    rf_models_destroy(models);
    return status;
}

static enum rf_class run(const struct invocation *invocation)
{
    struct rf_review *review = NULL;
    struct rf_error error;
    enum rf_class gravest = RF_CLASS_DONE;
    enum rf_status status = rf_review_create(&review, &error);
    if (status == RF_OK)
        status = review_all(invocation, review, &gravest, &error);
    rf_review_destroy(review);
    if (status != RF_OK)
        gravest = graver(gravest, complain_of(&error));
    pass_interrupt_on();
    return gravest;
}

const struct command command_review = {
    .name = "review",
    .summary = "go through past jobs again: hidden defects, a score, what to learn",
    .operands = "PATH…",
    .about =
        "Diagnoses every job of an archive and says which ones show a defect that nobody wrote "
        "down: a line a job, the fifty most worrying, a summary, and where jobs say what was found "
        "a scorecard.\n\n"
        "PATH is a file of one job or of one a line, or a folder, which is searched through for "
        "files ending in .json, .ndjson, .jsonl, .csv or .tsv; - reads standard input. A job that "
        "is refused is named on standard error and counted, and the others go on. An interrupt "
        "ends the run in good order, with the summary so far.\n\n"
        "A large archive can be cut by lines and reviewed in parts, on several machines: "
        "--merge reads what review --json wrote of each and gives the summary of the whole.",
    .n_options = 9,
    .options =
        {
            {"json", NULL, "one diagnosis a line as JSON, and the summary as the last line"},
            {"csv", "FILE", "write a table of the jobs to FILE besides"},
            {"page", "DIR",
             "write pages to look at into DIR: index.html, and one for each of the "
             "most worrying jobs"},
            {"learn", "FILE",
             "write fault priors learned from the jobs that say what was found, at least 20, to "
             "FILE, a faults.json for --models"},
            {"weight", "N", "how many jobs the priors learned with count as, else 100"},
            {"merge", NULL, "PATH is the output of review --json; sum it up"},
            {"rates", "NAME",
             "how often what goes wrong: archive, mostly nothing, or consulted, for jobs "
             "somebody looked into; else archive"},
            {"threads", "N", "diagnose on so many threads; else as many as the machine has"},
            {"models", "DIR", "take the models from DIR instead of those compiled in"},
        },
    .least = 1,
    .most = SEVERAL,
    .needs = "a job file, a folder, or - for standard input",
    .run = run,
};
