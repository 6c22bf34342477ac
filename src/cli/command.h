/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef CLI_COMMAND_H
#define CLI_COMMAND_H

/*
 * A command of the program: what it takes, and what it runs. One file each, ending in its
 * descriptor; one list, in main.c. To add one: the file, a line in the list, a line in
 * meson.build, a section in ringfettle.1.
 */

#include "base/text.h"

#include <ringfettle/job.h>
#include <ringfettle/models.h>
#include <ringfettle/status.h>

#include <stdbool.h>
#include <stddef.h>

enum { OPTIONS_MAX = 10, SEVERAL = -1 };

struct command_option {
    const char *name;     /* long, without the dashes */
    const char *argument; /* what follows it, as help names it ("DIR"); NULL: nothing does */
    const char *help;     /* one sentence, no capital at the start, no full stop */
};

struct invocation;

struct command {
    const char *name;
    const char *summary;  /* one line, for the list of commands */
    const char *operands; /* as usage has them: "JOB…" */
    const char *about;    /* paragraphs for --help, parted by blank lines */
    size_t n_options;
    struct command_option options[OPTIONS_MAX];
    size_t least;      /* operands needed */
    int most;          /* operands taken, or SEVERAL */
    const char *needs; /* what is missing when there are too few: "a job file, …" */
    /* Does it; complains about what fails, and answers the exit status. */
    enum rf_class (*run)(const struct invocation *invocation);
};

/* A command with what it was given. */
struct invocation {
    const struct command *command;
    const char
        *values[OPTIONS_MAX]; /* as `options`; "" for one without argument; NULL: not given */
    size_t n_operands;
    char *const *operands;
};

/* The value of an option, "" for one without argument; NULL: not given. `name` must be one of the
 * command's. */
const char *option_value(const struct invocation *invocation, const char *name);

/* The models asked for (`--models`), or those compiled in; complains. The second takes the base
 * rates asked for (`--rates`), or else those named `usual`. */
enum rf_status load_models(const struct invocation *invocation, struct rf_models **models);
enum rf_status load_models_and_rates(const struct invocation *invocation, const char *usual,
                                     struct rf_models **models);

/* Runs `act` with the models asked for, complains of what failed, and answers its class. */
typedef enum rf_status models_callback(const struct invocation *invocation,
                                       const struct rf_models *models, struct rf_error *error);
enum rf_class run_with_models(const struct invocation *invocation, models_callback *act);

/* A line on standard error: "ringfettle: …". */
void complain(const char *format, ...) RF_PRINTF(1, 2);
/* The same for a failed call, whose class it answers. */
enum rf_class complain_of(const struct rf_error *error);
/* "diagnose: … (ringfettle diagnose --help says more)"; answers RF_CLASS_INPUT. */
enum rf_class complain_usage(const struct command *command, const char *format, ...)
    RF_PRINTF(2, 3);

/* The graver of two: numerical failures outrank refusals, failures of the system outrank all. */
enum rf_class graver(enum rf_class one, enum rf_class other);

/* Writes to standard output and sees that it arrives. RF_IO, RF_MEMORY (a text that failed). */
enum rf_status put(const struct text *text, struct rf_error *error);

/*
 * Goes through the jobs of all operands; each is handed to `one_job`, which answers how it went
 * and leaves the job to the caller. What is refused is complained about here, and the others go
 * on; what fails otherwise ends it. Answers the gravest class.
 */
typedef enum rf_status job_callback(void *context, const struct rf_job *job,
                                    struct rf_error *error);
enum rf_class each_job(const struct invocation *invocation, job_callback *one_job, void *context);

/* The one job of a file that must hold one, the caller's to destroy. */
enum rf_status read_one_job(const char *path, struct rf_job **job, struct rf_error *error);

extern const struct command command_check, command_diagnose, command_expect, command_simulate,
    command_answer;
extern const struct command command_record, command_convert, command_new, command_review;

#endif
