/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "cli/command.h"

#include "base/error.h"
#include "cli/file.h"
#include "report/words.h"
#include "report/wrap.h"
#include "simulation/simulation.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { TRUTH_MOST = 2 * JOB_MAX_BYTES };

static const char *const look_words[N_LOOKS] = {[LOOK_OPEN] = "look", [LOOK_CHECK] = "check"};

/* --- a question's words --- */

static enum rf_status no_such(const char *what, const char *word, const char *const known[],
                              size_t n, struct rf_error *error)
{
    const char *nearest = text_nearest(word, known, n);
    if (nearest != NULL)
        return fail(error, RF_USAGE, "answer: no %s %s; did you mean %s?", what, word, nearest);
    return fail(error, RF_USAGE, "answer: no %s %s; ringfettle answer --help says what there is",
                what, word);
}

static enum rf_status no_such_place(const struct rf_job *job, const char *word,
                                    struct rf_error *error)
{
    struct text places = {0};
    job_list_places(job, false, &places);
    enum rf_status status =
        places.failed
            ? fail_memory(error)
            : fail(error, RF_USAGE, "answer: no place %s; the ring has %s", word, places.bytes);
    text_finish(&places);
    return status;
}

static enum rf_status read_measurement(const struct rf_job *job, const char *setup_name,
                                       const char *place, struct measurement *measurement,
                                       struct rf_error *error)
{
    const char *names[N_SETUPS + N_LOOKS];
    size_t setup = setup_find(setup_name);
    for (size_t i = 0; i < N_SETUPS; i++)
        names[i] = setups[i].name;
    for (size_t i = 0; i < N_LOOKS; i++)
        names[N_SETUPS + i] = look_words[i];
    if (setup == N_SETUPS)
        return no_such("set-up", setup_name, names, N_SETUPS + N_LOOKS, error);

    *measurement = (struct measurement){.setup = setup, .spot = SPOT_POINT};
    for (int spot = 0; spot < N_SPOTS; spot++)
        if (spot != SPOT_POINT && strcmp(spot_keys[spot], place) == 0) {
            measurement->spot = (enum spot)spot;
            if ((setups[setup].spots & 1u << spot) != 0)
                return RF_OK;
            return fail(error, RF_USAGE, "answer: nothing is read at %s in %s", place, setup_name);
        }
    measurement->place = job_find_place(job, place);
    if (measurement->place == job->n_places)
        return no_such_place(job, place, error);
    if (!place_has_front(job, measurement->place))
        return fail(error, RF_USAGE, "answer: %s is a junction box; nothing is read there", place);
    if ((setups[setup].spots & 1u << SPOT_POINT) == 0)
        return fail(error, RF_USAGE, "answer: nothing is read at a point in %s", setup_name);
    return RF_OK;
}

/* A place, the board, or a run by its two places. */
static enum rf_status read_look(const struct rf_job *job, enum look_kind kind,
                                char *const operands[], size_t n, struct look *look,
                                struct rf_error *error)
{
    size_t places[2] = {0};
    *look = (struct look){.kind = kind, .where = LOOK_AT_BOARD};
    if (n == 1 && strcmp(operands[0], "board") == 0)
        return RF_OK;
    for (size_t i = 0; i < n; i++) {
        places[i] = job_find_place(job, operands[i]);
        if (places[i] == job->n_places)
            return no_such_place(job, operands[i], error);
    }
    if (n == 1) {
        if (place_is_end(job, places[0]))
            return RF_OK; /* an end is at the board */
        look->where = LOOK_AT_PLACE;
        look->index = places[0];
        return RF_OK;
    }
    look->where = LOOK_IN_RUN;
    look->index = job_find_run(job, places[0], places[1]);
    if (look->index == n_runs(job))
        return fail(error, RF_USAGE, "answer: no run from %s to %s", operands[0], operands[1]);
    return RF_OK;
}

/* --- answers --- */

static enum rf_status answer_reading(const struct invocation *invocation, const struct truth *truth,
                                     size_t repeat, struct text *out, struct rf_error *error)
{
    struct measurement measurement;
    struct shown shown;
    enum rf_status status = read_measurement(truth->job, invocation->operands[1],
                                             invocation->operands[2], &measurement, error);
    if (status == RF_OK && invocation->n_operands > 3)
        status = fail(error, RF_USAGE, "answer: nothing to do with %s", invocation->operands[3]);
    if (status == RF_OK)
        status = truth_answer(truth, &measurement, repeat, &shown, error);
    if (status == RF_OK && shown.open)
        text_add(out, "open\n");
    else if (status == RF_OK)
        text_addf(out, "%.2f\n", shown.ohms);
    return status;
}

static enum rf_status answer_look(const struct invocation *invocation, const struct truth *truth,
                                  enum look_kind kind, struct text *out, struct rf_error *error)
{
    struct look look;
    size_t fault = 0;
    enum rf_status status = read_look(truth->job, kind, invocation->operands + 2,
                                      invocation->n_operands - 2, &look, error);
    if (status != RF_OK)
        return status;
    struct text words = {0};
    if (truth_look(truth, &look, &fault)) {
        const struct fault *found = &truth->hypothesis.faults[fault];
        text_add(&words, "found: ");
        found->family->describe(found, truth->job, &words);
    } else {
        text_add(&words, "nothing wrong there");
    }
    if (!words.failed)
        wrap_words(out, "", "  ", words.bytes);
    out->failed = out->failed || words.failed;
    text_finish(&words);
    return RF_OK;
}

static enum rf_status read_repeat(const struct invocation *invocation, size_t *repeat,
                                  struct rf_error *error)
{
    const char *value = option_value(invocation, "repeat");
    char *end = NULL;
    if (value == NULL)
        return RF_OK;
    unsigned long read = strtoul(value, &end, 10);
    if (value[0] < '1' || value[0] > '9' || *end != '\0' || read > JOB_MAX_READINGS)
        return fail(error, RF_USAGE,
                    "answer: --repeat: found %s; needs a whole number from 1 to %d", value,
                    (int)JOB_MAX_READINGS);
    *repeat = read - 1;
    return RF_OK;
}

static enum rf_status answer(const struct invocation *invocation, const struct rf_models *models,
                             struct rf_error *error)
{
    const char *path = invocation->operands[0];
    struct truth *truth = NULL;
    struct text file = {0}, out = {0};
    size_t repeat = 0, kind = 0;
    enum rf_status status = read_repeat(invocation, &repeat, error);
    if (status == RF_OK)
        status = file_read(path, TRUTH_MOST, &file, error);
    if (status == RF_OK)
        status =
            truth_read(file.bytes != NULL ? file.bytes : "", file.length,
                       strcmp(path, "-") == 0 ? "standard input" : path, models, &truth, error);
    while (kind < N_LOOKS && strcmp(look_words[kind], invocation->operands[1]) != 0)
        kind++;
    if (status == RF_OK)
        status = kind < N_LOOKS ? answer_look(invocation, truth, (enum look_kind)kind, &out, error)
                                : answer_reading(invocation, truth, repeat, &out, error);
    if (status == RF_OK)
        status = put(&out, error);
    truth_destroy(truth);
    text_finish(&file);
    text_finish(&out);
    return status;
}

static enum rf_class run(const struct invocation *invocation)
{
    return run_with_models(invocation, answer);
}

const struct command command_answer = {
    .name = "answer",
    .summary = "take one more reading, or a look, on a ring whose truth was held back",
    .operands = "TRUTH SETUP PLACE | TRUTH look PLACE [PLACE] | TRUTH check PLACE",
    .about =
        "TRUTH is what ringfettle simulate --hold-back wrote. With a set-up and a place, as job "
        "files name them, it answers what the meter shows there: ohms, or open for over range. "
        "The same question gets the same answer.\n\n"
        "With look it says what one finds with that accessory off, in the board, or along the run "
        "between two places; with check what one finds at the face.",
    .n_options = 2,
    .options =
        {
            {"repeat", "N", "the reading taken for the N-th time, from 1; else the first"},
            {"models", "DIR", "the models the truth was made with, if not those compiled in"},
        },
    .least = 3,
    .most = 4,
    .needs = "a truth, and what to read or look at",
    .run = run,
};
