/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "cli/convert.h"
#include "cli/form.h"

#include "base/error.h"

#include <stdlib.h>
#include <string.h>
#include <unistd.h>

enum { USUAL_POINTS = 8 };

static bool ends_in(const char *path, const char *end)
{
    size_t length = strlen(path), of_end = strlen(end);
    return length > of_end && strcmp(path + length - of_end, end) == 0;
}

static enum rf_status read_points(const char *text, size_t *n, struct rf_error *error)
{
    char *end;
    unsigned long number = strtoul(text, &end, 10);
    if (text[0] < '0' || text[0] > '9' || *end != '\0' || number < 1 || number > JOB_MAX_POINTS)
        return fail(error, RF_USAGE, "new: --points: found %s; needs a number from 1 to 200", text);
    *n = (size_t)number;
    return RF_OK;
}

static enum rf_status begin(const struct invocation *invocation, struct form *form,
                            struct rf_error *error)
{
    const char *points = option_value(invocation, "points");
    const char *list = option_value(invocation, "setups");
    form->document = cJSON_CreateObject();
    if (form->document == NULL ||
        cJSON_AddStringToObject(form->document, "format", "ringfettle-job/1") == NULL)
        return fail_memory(error);
    form->n_points = USUAL_POINTS;
    enum rf_status status =
        form_choose_setups(form, list != NULL ? list : "end_to_end,cross_ln,cross_le", error);
    if (status != RF_OK)
        return status;
    return points != NULL ? read_points(points, &form->n_points, error) : RF_OK;
}

static enum rf_status fill(const struct invocation *invocation, struct form *form,
                           struct rf_error *error)
{
    struct rf_models *models = NULL;
    bool points_known = option_value(invocation, "points") != NULL;
    bool asks = !points_known || option_value(invocation, "ask") != NULL;
    enum rf_status status = points_known ? form_lay_points(form, error) : RF_OK;
    if (status == RF_OK && points_known)
        status = form_save(form, error);
    if (status != RF_OK || !asks)
        return status;
    status = rf_models_load(option_value(invocation, "models"), RF_RATES_CONSULTED, &models, error);
    if (status == RF_OK)
        status = form_ask(form, models, points_known, error);
    rf_models_destroy(models);
    return status;
}

static enum rf_class run(const struct invocation *invocation)
{
    struct rf_error error;
    struct form form = {.path = invocation->operands[0]};
    if (!read_style(invocation, &form.style))
        return RF_CLASS_INPUT;
    if (form.style.separator == '\0')
        form.style.separator = form.style.decimal == ',' ? ';' : ',';
    if (form.style.decimal == '\0')
        form.style.decimal = '.';
    form.as_json = ends_in(form.path, ".json");
    if (access(form.path, F_OK) == 0)
        return complain_usage(invocation->command,
                              "%s is there already; needs the name of a new "
                              "file",
                              form.path);
    enum rf_status status = begin(invocation, &form, &error);
    if (status == RF_OK)
        status = fill(invocation, &form, &error);
    file_release(form.hold);
    cJSON_Delete(form.document);
    return status == RF_OK ? RF_CLASS_DONE : complain_of(&error);
}

const struct command command_new = {
    .name = "new",
    .summary = "begin a job: a sheet to fill in, or questions to answer",
    .operands = "FILE",
    .about =
        "With --points, writes FILE for a ring of so many points with the set-ups wanted, ready to "
        "be filled in: a sheet, or JSON where the name ends in .json. Without, or with --ask, "
        "asks: how many points and spurs, lengths where known, then set-up by set-up and place by "
        "place in the order one walks. Enter skips a question or keeps its answer, - takes an "
        "answer away, b goes back, q stops. The file is saved after each answer. A reading that "
        "the ring as told and the readings before it do not lead one to expect is pointed out at "
        "once.\n\n"
        "FILE must be new.",
    .n_options = 6,
    .options = {{"points", "N", "points on the ring, P1 to PN"},
                {"setups", "LIST", "set-ups wanted (usual: end_to_end,cross_ln,cross_le)"},
                {"ask", NULL, "ask for the rest although --points is given"},
                {"separator", "NAME", "comma, semicolon or tab between the sheet's cells"},
                {"decimal", "NAME", "point or comma in the sheet's numbers"},
                {"models", "DIR", "take the models from DIR instead of those compiled in"}},
    .least = 1,
    .most = 1,
    .needs = "the name of the file to begin",
    .run = run,
};
