/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "cli/command.h"

#include "base/error.h"
#include "base/memory.h"
#include "report/expected_text.h"

#include <string.h>

/* What is asked: set-ups, then every place one can read there. */
struct question {
    bool asked[N_SETUPS];
    size_t n;
    struct measurement *measurements;
    struct expected *expected;
    bool left_out[N_CONDUCTORS];
};

/* --- which set-ups --- */

/* The crossed tests are what comes next where only the ends were read. */
static void ask_as_read(const struct rf_job *job, bool asked[N_SETUPS])
{
    bool more_than_ends = false;
    for (size_t i = 0; i < job->n_readings; i++) {
        size_t setup = job->readings[i].setup;
        asked[setup] = true;
        more_than_ends |= setups[setup].joining != JOIN_NOTHING_END_TO_END;
    }
    if (!more_than_ends) {
        asked[setup_find("cross_ln")] = true;
        asked[setup_find("cross_le")] = true;
    }
}

static enum rf_status refuse_setup(const char *name, struct rf_error *error)
{
    const char *names[N_SETUPS];
    struct text all = {0};
    for (size_t i = 0; i < N_SETUPS; i++) {
        names[i] = setups[i].name;
        text_addf(&all, "%s%s", i > 0 ? ", " : "", names[i]);
    }
    const char *nearest = text_nearest(name, names, N_SETUPS);
    enum rf_status status =
        all.failed        ? fail_memory(error)
        : nearest != NULL ? fail(error, RF_USAGE,
                                 "expect: --setups: no set-up %s; did you mean %s?", name, nearest)
                          : fail(error, RF_USAGE, "expect: --setups: no set-up %s; there are %s",
                                 name, all.bytes);
    text_finish(&all);
    return status;
}

/* "cross_ln,link_out_ln" */
static enum rf_status ask_by_name(const char *list, bool asked[N_SETUPS], struct rf_error *error)
{
    for (const char *at = list; *at != '\0';) {
        size_t length = strcspn(at, ",");
        char name[64];
        size_t kept = length < sizeof name ? length : sizeof name - 1;
        memcpy(name, at, kept);
        name[kept] = '\0';
        size_t setup = setup_find(name);
        if (setup == N_SETUPS)
            return refuse_setup(name, error);
        asked[setup] = true;
        at += length + (at[length] == ',' ? 1 : 0);
    }
    return RF_OK;
}

/* --- which places --- */

static bool was_read(const struct rf_job *job, size_t setup, enum spot spot)
{
    for (size_t i = 0; i < job->n_readings; i++)
        if (job->readings[i].setup == setup && job->readings[i].spot == spot)
            return true;
    return false;
}

static void ask_setup(const struct rf_job *job, size_t setup, struct question *question)
{
    for (int spot = 0; spot < N_SPOTS; spot++)
        if (spot != SPOT_POINT && (setups[setup].spots & 1u << spot) != 0 &&
            (spot != SPOT_HIGHEST || was_read(job, setup, SPOT_HIGHEST)))
            question->measurements[question->n++] =
                (struct measurement){.setup = setup, .spot = (enum spot)spot};
    for (size_t place = 0; place < job->n_places; place++)
        if ((setups[setup].spots & 1u << SPOT_POINT) != 0 && place_has_front(job, place))
            question->measurements[question->n++] =
                (struct measurement){.setup = setup, .spot = SPOT_POINT, .place = place};
}

static enum rf_status ask(const struct rf_job *job, struct question *question,
                          struct rf_error *error)
{
    size_t most = N_SETUPS * (job->n_places + N_SPOTS);
    question->measurements = NEW_ARRAY(struct measurement, most);
    question->expected = NEW_ARRAY(struct expected, most);
    if (question->measurements == NULL || question->expected == NULL)
        return fail_memory(error);
    for (size_t setup = 0; setup < N_SETUPS; setup++)
        if (question->asked[setup])
            ask_setup(job, setup, question);
    return RF_OK;
}

/* --- answers --- */

/* By the end-to-end readings where there are any; those themselves, which come first, by the
 * record. */
static enum rf_status answer(const struct rf_job *job, const struct rf_models *models,
                             bool given_ends, struct question *question, struct rf_error *error)
{
    size_t ends = 0;
    while (ends < question->n &&
           setups[question->measurements[ends].setup].joining == JOIN_NOTHING_END_TO_END)
        ends++;
    enum rf_status status = expect_readings(job, models, false, question->measurements, ends,
                                            question->expected, NULL, error);
    if (status == RF_OK)
        status = expect_readings(job, models, given_ends, question->measurements + ends,
                                 question->n - ends, question->expected + ends, question->left_out,
                                 error);
    return status;
}

static enum rf_status expect(const struct invocation *invocation, const struct rf_job *job,
                             const struct rf_models *models, struct rf_error *error)
{
    const char *list = option_value(invocation, "setups");
    bool given_ends = option_value(invocation, "record") == NULL && has_end_to_end(job);
    struct question question = {0};
    struct text out = {0};
    enum rf_status status = RF_OK;
    if (list != NULL)
        status = ask_by_name(list, question.asked, error);
    else
        ask_as_read(job, question.asked);
    if (status == RF_OK)
        status = ask(job, &question, error);
    if (status == RF_OK)
        status = answer(job, models, given_ends, &question, error);
    if (status == RF_OK) {
        const struct expected_sheet sheet = {
            .job = job,
            .n = question.n,
            .measurements = question.measurements,
            .expected = question.expected,
            .given_ends = given_ends,
            .left_out = question.left_out,
        };
        report_expected(&sheet, &out);
        status = put(&out, error);
    }
    text_finish(&out);
    free(question.measurements);
    free(question.expected);
    return status;
}

static enum rf_status expect_of_file(const struct invocation *invocation,
                                     const struct rf_models *models, struct rf_error *error)
{
    struct rf_job *job = NULL;
    enum rf_status status = read_one_job(invocation->operands[0], &job, error);
    if (status == RF_OK)
        status = expect(invocation, job, models, error);
    rf_job_destroy(job);
    return status;
}

static enum rf_class run(const struct invocation *invocation)
{
    return run_with_models(invocation, expect_of_file);
}

const struct command command_expect = {
    .name = "expect",
    .summary = "say what the ring would read if it were wired as recorded",
    .operands = "JOB",
    .about =
        "For every place one can read in the set-ups the job has readings of, what the meter would "
        "show on a ring without defect, from where to where 19 of 20 such readings lie, and what "
        "was read there, marked if it lies outside. Where only end-to-end readings are there, the "
        "crossed tests are added.\n\n"
        "End-to-end readings, where there are any, narrow down length and cable: the values are "
        "what the ring would read given them. JOB is a file of one job; - reads standard input.",
    .n_options = 3,
    .options =
        {
            {"setups", "LIST", "these set-ups instead: names with commas between, as in job files"},
            {"record", NULL, "by the recorded lengths alone, whatever was read end to end"},
            {"models", "DIR", "take the models from DIR instead of those compiled in"},
        },
    .least = 1,
    .most = 1,
    .needs = "a job file, or - for standard input",
    .run = run,
};
