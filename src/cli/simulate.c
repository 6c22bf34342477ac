/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "cli/command.h"

#include "base/error.h"
#include "base/json.h"
#include "cli/file.h"
#include "simulation/simulation.h"

#include <ctype.h>
#include <errno.h>
#include <stdlib.h>
#include <string.h>

static const unsigned long seed_most = 0xFFFFFFFFul;
enum { COUNT_MOST = 1000000, DEFECTS_MOST = 2 };

/* --- options --- */

static enum rf_status read_whole(const char *option, const char *value, unsigned long most,
                                 unsigned long *number, struct rf_error *error)
{
    char *end = NULL;
    errno = 0;
    unsigned long read = strtoul(value, &end, 10);
    if (!isdigit((unsigned char)value[0]) || *end != '\0' || errno != 0 || read > most)
        return fail(error, RF_USAGE, "simulate: --%s: found %s; needs a whole number from 0 to %lu",
                    option, value, most);
    *number = read;
    return RF_OK;
}

static enum rf_status number_option(const struct invocation *invocation, const char *option,
                                    unsigned long most, unsigned long *number,
                                    struct rf_error *error)
{
    const char *value = option_value(invocation, option);
    return value == NULL ? RF_OK : read_whole(option, value, most, number, error);
}

/* --- the defect asked for --- */

/* Its `ohms` or `metres`, 0 where it has none. */
static enum rf_status read_value(const struct json_at *fault, double *value, struct rf_error *error)
{
    static const char *const keys[] = {"ohms", "metres"};
    enum rf_status status = RF_OK;
    for (size_t i = 0; i < sizeof keys / sizeof keys[0] && status == RF_OK; i++) {
        struct json_at member = json_member(fault, keys[i]);
        if (json_given(&member))
            status = json_number(&member, 1e-4, 1e4, "a number from 0.0001 to 10000", value, error);
    }
    return status;
}

/* `--fault`, as `found` has it, with the value of its parameter beside its fields. */
static enum rf_status read_fault(const char *text, const struct rf_job *ring,
                                 const struct rf_models *models, struct simulation *simulation,
                                 struct rf_error *error)
{
    static char source[] = "--fault";
    cJSON *document = NULL;
    enum rf_status status = json_parse(text, strlen(text), source, JSON_DOCUMENT, &document, error);
    struct rf_job with = *ring; /* borrows all of it */
    with.source = source;
    with.found = document;
    if (status == RF_OK)
        status = hypothesis_from_found(&with, models, &simulation->hypothesis, error);
    struct json_at fault = json_document(document, source);
    struct json_at also = json_member(&fault, "also");
    if (status == RF_OK)
        status = read_value(&fault, &simulation->value[0], error);
    if (status == RF_OK && json_given(&also))
        status = read_value(&also, &simulation->value[1], error);
    simulation->given = true;
    cJSON_Delete(document);
    return status;
}

/* --- one job --- */

static enum rf_status read_ring(const struct invocation *invocation, uint32_t seed,
                                const struct text *file, struct rf_job **ring,
                                struct rf_error *error)
{
    enum ring_plan plan = option_value(invocation, "extra") != NULL ? PLAN_EXTRA : PLAN_STANDARD;
    if (invocation->n_operands == 0)
        return simulation_random_ring(seed, plan, ring, error);
    const char *path = invocation->operands[0];
    const char *name = strcmp(path, "-") == 0 ? "standard input" : path;
    return simulation_read_ring(file->bytes != NULL ? file->bytes : "", file->length, name, ring,
                                error);
}

/* Writes the truth to its file, and takes what was found out of the job. */
static enum rf_status hold_back(struct truth *truth, const char *path, struct rf_error *error)
{
    struct text out = {0};
    enum rf_status status = truth_write(truth, &out, error);
    if (status == RF_OK)
        status = file_write(path, &out, error);
    text_finish(&out);
    cJSON_DeleteItemFromObjectCaseSensitive(truth->document, "found");
    return status;
}

static enum rf_status put_job(const struct truth *truth, bool one_line, struct rf_error *error)
{
    struct text out = {0};
    enum rf_status status = truth_write_job(truth, one_line, &out, error);
    if (status == RF_OK && (out.length == 0 || out.bytes[out.length - 1] != '\n'))
        text_add(&out, "\n");
    if (status == RF_OK)
        status = put(&out, error);
    text_finish(&out);
    return status;
}

static enum rf_status simulate_one(const struct invocation *invocation,
                                   const struct rf_models *models, const struct text *file,
                                   struct simulation simulation, bool one_line,
                                   struct rf_error *error)
{
    const char *fault = option_value(invocation, "fault");
    const char *held_back = option_value(invocation, "hold-back");
    struct rf_job *ring = NULL;
    struct truth *truth = NULL;
    enum rf_status status = read_ring(invocation, simulation.seed, file, &ring, error);
    if (status == RF_OK && fault != NULL)
        status = read_fault(fault, ring, models, &simulation, error);
    if (status == RF_OK)
        status = simulate(ring, models, &simulation, &truth, error);
    if (status == RF_OK && held_back != NULL)
        status = hold_back(truth, held_back, error);
    if (status == RF_OK)
        status = put_job(truth, one_line, error);
    truth_destroy(truth);
    rf_job_destroy(ring);
    return status;
}

/* --- the command --- */

static enum rf_status refuse_together(const struct invocation *invocation, struct rf_error *error)
{
    bool count = option_value(invocation, "count") != NULL;
    if (count && option_value(invocation, "hold-back") != NULL)
        return fail(error, RF_USAGE,
                    "simulate: --hold-back keeps one job's truth; needs no --count");
    if (option_value(invocation, "fault") != NULL && option_value(invocation, "defects") != NULL)
        return fail(error, RF_USAGE,
                    "simulate: --defects draws defects and --fault gives them; needs one of them");
    if (invocation->n_operands > 0 && option_value(invocation, "extra") != NULL)
        return fail(error, RF_USAGE,
                    "simulate: --extra is for invented rings; a ring's file says "
                    "itself what is read on it");
    return RF_OK;
}

static enum rf_status simulate_all(const struct invocation *invocation,
                                   const struct rf_models *models, struct rf_error *error)
{
    unsigned long seed = 0, count = 1, defects = 0;
    struct text file = {0};
    enum rf_status status = refuse_together(invocation, error);
    if (status == RF_OK)
        status = number_option(invocation, "seed", seed_most, &seed, error);
    if (status == RF_OK)
        status = number_option(invocation, "count", COUNT_MOST, &count, error);
    if (status == RF_OK)
        status = number_option(invocation, "defects", DEFECTS_MOST, &defects, error);
    if (status == RF_OK && invocation->n_operands > 0)
        status = file_read(invocation->operands[0], JOB_MAX_BYTES, &file, error);
    bool one_line = option_value(invocation, "count") != NULL;
    for (unsigned long i = 0; i < count && status == RF_OK; i++) {
        const struct simulation simulation = {
            .seed = (uint32_t)(seed + i), /* beyond the last comes the first again */
            .defects = (size_t)defects,
        };
        status = simulate_one(invocation, models, &file, simulation, one_line, error);
    }
    text_finish(&file);
    return status;
}

static enum rf_class run(const struct invocation *invocation)
{
    return run_with_models(invocation, simulate_all);
}

const struct command command_simulate = {
    .name = "simulate",
    .summary = "make up a job: a ring and a fault in, noisy readings out",
    .operands = "[RING]",
    .about =
        "Writes a job as it might have been recorded on a ring with a defect, or with none: "
        "lengths, cable, instrument and noise are drawn from the models a diagnosis uses. What is "
        "wrong stands in the job as what was found.\n\n"
        "RING is a job file; its readings say what is read and how often, and where it has none, "
        "the ends and both crossed tests with the line are. - reads standard input. Without RING, "
        "a "
        "ring of 4 to 14 points is made up too.\n\n"
        "The same seed makes the same job. Every number in it is invented.",
    .n_options = 7,
    .options =
        {
            {"fault", "JSON",
             "this defect, as \"found\" has it, with \"ohms\" or \"metres\" beside the fields if "
             "they are not to be drawn; else one is drawn, or none, as the models have it"},
            {"defects", "N", "draw so many defects, 1 or 2; 0: one or none"},
            {"seed", "N", "draw from this seed, 0 to 4294967295; else 0"},
            {"count", "N", "so many jobs, each on one line, with the seeds from there on"},
            {"extra", NULL, "on a ring that is made up, read at some other set-ups besides"},
            {"hold-back", "FILE",
             "keep what is wrong out of the job and write it to FILE, for ringfettle answer"},
            {"models", "DIR", "take the models from DIR instead of those compiled in"},
        },
    .least = 0,
    .most = 1,
    .needs = "nothing",
    .run = run,
};
