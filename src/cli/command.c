/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "cli/command.h"

#include "base/error.h"

#include <assert.h>
#include <errno.h>
#include <stdarg.h>
#include <stdio.h>
#include <string.h>

/* --- standard error --- */

void complain(const char *format, ...)
{
    va_list arguments;
    va_start(arguments, format);
    fputs("ringfettle: ", stderr);
    vfprintf(stderr, format, arguments);
    fputc('\n', stderr);
    va_end(arguments);
}

enum rf_class complain_of(const struct rf_error *error)
{
    complain("%s", error->text);
    return rf_status_class(error->status);
}

enum rf_class complain_usage(const struct command *command, const char *format, ...)
{
    char message[512];
    va_list arguments;
    va_start(arguments, format);
    if (vsnprintf(message, sizeof message, format, arguments) >= (int)sizeof message)
        text_trim_partial_character(message);
    va_end(arguments);
    complain("%s: %s (ringfettle %s --help says more)", command->name, message, command->name);
    return RF_CLASS_INPUT;
}

enum rf_class graver(enum rf_class one, enum rf_class other)
{
    return one > other ? one : other;
}

/* --- standard output --- */

enum rf_status put(const struct text *text, struct rf_error *error)
{
    if (text->failed)
        return fail_memory(error);
    errno = 0;
    if (fwrite(text->bytes != NULL ? text->bytes : "", 1, text->length, stdout) == text->length &&
        fflush(stdout) == 0)
        return RF_OK;
    return fail(error, RF_IO, "standard output: cannot write: %s",
                errno != 0 ? strerror(errno) : "unknown reason");
}

/* --- options --- */

const char *option_value(const struct invocation *invocation, const char *name)
{
    const struct command *command = invocation->command;
    for (size_t i = 0; i < command->n_options; i++)
        if (strcmp(command->options[i].name, name) == 0)
            return invocation->values[i];
    assert(false); /* a name that is not in the command's table */
    return NULL;
}

static enum rf_status load_at(const struct invocation *invocation, enum rf_base_rates rates,
                              struct rf_models **models)
{
    struct rf_error error;
    enum rf_status status =
        rf_models_load(option_value(invocation, "models"), rates, models, &error);
    if (status != RF_OK)
        complain_of(&error);
    return status;
}

enum rf_status load_models(const struct invocation *invocation, struct rf_models **models)
{
    return load_at(invocation, RF_RATES_CONSULTED, models);
}

/* The base rates of that name; complains of others. */
static enum rf_status find_rates(const struct command *command, const char *name,
                                 enum rf_base_rates *rates)
{
    static const char *const names[] = {[RF_RATES_CONSULTED] = "consulted",
                                        [RF_RATES_ARCHIVE] = "archive",
                                        [RF_RATES_CERTAIN] = "certain"};
    for (size_t i = 0; i < sizeof names / sizeof names[0]; i++)
        if (strcmp(name, names[i]) == 0) {
            *rates = (enum rf_base_rates)i;
            return RF_OK;
        }
    complain_usage(command, "--rates: found %s; needs consulted, archive or certain", name);
    return RF_USAGE;
}

enum rf_status load_models_and_rates(const struct invocation *invocation, const char *usual,
                                     struct rf_models **models)
{
    const char *asked = option_value(invocation, "rates");
    enum rf_base_rates rates = RF_RATES_CONSULTED;
    enum rf_status status = find_rates(invocation->command, asked != NULL ? asked : usual, &rates);
    return status == RF_OK ? load_at(invocation, rates, models) : status;
}

enum rf_class run_with_models(const struct invocation *invocation, models_callback *act)
{
    struct rf_models *models = NULL;
    struct rf_error error;
    enum rf_status status = load_models(invocation, &models);
    if (status != RF_OK)
        return rf_status_class(status);
    status = act(invocation, models, &error);
    rf_models_destroy(models);
    return status == RF_OK ? RF_CLASS_DONE : complain_of(&error);
}

/* --- jobs --- */

/* Whether the jobs behind this one may still be worth a try. */
static bool goes_on(enum rf_status status)
{
    enum rf_class class = rf_status_class(status);
    return class == RF_CLASS_INPUT || class == RF_CLASS_NUMERICAL;
}

/* All jobs of one file; false when nothing further is to be tried. */
static bool each_job_of(const char *path, job_callback *one_job, void *context,
                        enum rf_class *gravest)
{
    struct rf_job_reader *reader = NULL;
    struct rf_error error;
    enum rf_status status = rf_job_reader_open(path, &reader, &error);
    if (status != RF_OK) {
        *gravest = graver(*gravest, complain_of(&error));
        return status != RF_MEMORY; /* the next file may be readable */
    }
    bool more = true;
    while (more) {
        struct rf_job *job = NULL;
        status = rf_job_reader_next(reader, &job, &error);
        if (status == RF_OK && job == NULL)
            break;
        bool read = status == RF_OK;
        if (read)
            status = one_job(context, job, &error);
        rf_job_destroy(job);
        if (status != RF_OK) {
            *gravest = graver(*gravest, complain_of(&error));
            more = goes_on(status);
            if (!more && !read && status == RF_IO) { /* this file's trouble only */
                rf_job_reader_close(reader);
                return true;
            }
        }
    }
    rf_job_reader_close(reader);
    return more;
}

enum rf_class each_job(const struct invocation *invocation, job_callback *one_job, void *context)
{
    enum rf_class gravest = RF_CLASS_DONE;
    for (size_t i = 0; i < invocation->n_operands; i++)
        if (!each_job_of(invocation->operands[i], one_job, context, &gravest))
            break;
    return gravest;
}

enum rf_status read_one_job(const char *path, struct rf_job **job, struct rf_error *error)
{
    struct rf_job_reader *reader = NULL;
    struct rf_job *second = NULL;
    *job = NULL;
    enum rf_status status = rf_job_reader_open(path, &reader, error);
    if (status == RF_OK)
        status = rf_job_reader_next(reader, job, error);
    if (status == RF_OK && *job == NULL)
        status = fail(error, RF_SYNTAX, "%s: found nothing; needs a job", path);
    if (status == RF_OK)
        status = rf_job_reader_next(reader, &second, error);
    if (status == RF_OK && second != NULL)
        status = fail(error, RF_REFUSED, "%s: found several jobs; needs one", path);
    if (status != RF_OK) {
        rf_job_destroy(*job);
        *job = NULL;
    }
    rf_job_destroy(second);
    rf_job_reader_close(reader);
    return status;
}
