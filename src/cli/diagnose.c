/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "cli/command.h"
#include "cli/file.h"

#include "advice/advice.h"
#include "base/error.h"
#include "diagnosis/diagnosis.h"
#include "report/page.h"
#include "report/report.h"

#include <string.h>

struct context {
    const struct rf_models *models;
    bool json, plan;
    const char *page; /* NULL: none is asked for */
    size_t reported;
};

/* One file holds one page. */
static enum rf_status write_page(struct context *in, const struct rf_diagnosis *diagnosis,
                                 const struct rf_advice *advice, struct rf_error *error)
{
    struct text page = {0};
    if (in->reported > 0)
        return fail(error, RF_USAGE,
                    "diagnose: --page: found more than one job; needs one, since a page is of one");
    enum rf_status status = report_page(diagnosis, advice, &page, error);
    if (status == RF_OK)
        status =
            strcmp(in->page, "-") == 0 ? put(&page, error) : file_write(in->page, &page, error);
    text_finish(&page);
    return status;
}

static enum rf_status one_job(void *context, const struct rf_job *job, struct rf_error *error)
{
    struct context *in = context;
    struct rf_diagnosis *diagnosis = NULL;
    struct rf_advice *advice = NULL;
    struct text out = {0};
    enum rf_status status = rf_diagnose(job, in->models, &diagnosis, error);
    if (status == RF_OK && in->plan)
        status = rf_advise(diagnosis, &advice, error);
    if (status == RF_OK && in->page != NULL) {
        status = write_page(in, diagnosis, advice, error);
        in->reported++;
    } else if (status == RF_OK) {
        if (in->json) {
            report_json(diagnosis, advice, &out);
        } else {
            if (in->reported > 0)
                report_divider(&out);
            report_text(diagnosis, advice, &out);
        }
        in->reported++;
        status = put(&out, error);
    }
    text_finish(&out);
    rf_advice_destroy(advice);
    rf_diagnosis_destroy(diagnosis);
    return status;
}

static enum rf_class run(const struct invocation *invocation)
{
    struct rf_models *models = NULL;
    enum rf_status status = load_models_and_rates(invocation, "consulted", &models);
    if (status != RF_OK)
        return rf_status_class(status);
    struct context context = {
        .models = models,
        .json = option_value(invocation, "json") != NULL,
        .plan = option_value(invocation, "no-plan") == NULL,
        .page = option_value(invocation, "page"),
    };
    enum rf_class class = each_job(invocation, one_job, &context);
    rf_models_destroy(models);
    return class;
}

const struct command command_diagnose = {
    .name = "diagnose",
    .summary = "say what the readings of a job show, where, and with what confidence",
    .operands = "JOB…",
    .about =
        "Compares every plausible defect and testing mistake with the readings and reports what "
        "they show: what would be dangerous first, then what can be checked without a screw, "
        "where to look, what to do next, what the readings could not show, the readings beside "
        "what fits them, and the figures for a schedule of test results.\n\n"
        "JOB is a file of one job, or of one job a line; - reads standard input. A job that is "
        "refused is named on standard error; the others are reported all the same.",
    .n_options = 5,
    .options =
        {
            {"json", NULL, "one JSON object a job, each on a line, instead of text"},
            {"page", "FILE",
             "write a page to look at, HTML that needs no network, to FILE (- is "
             "standard output) instead of text"},
            {"no-plan", NULL, "leave out what to do next: faster, for archives"},
            {"rates", "NAME",
             "how often what goes wrong: consulted, for a job somebody looks into; archive, mostly "
             "nothing; certain, where it is known that there is a defect, whatever shows; else "
             "consulted"},
            {"models", "DIR", "take the models from DIR instead of those compiled in"},
        },
    .least = 1,
    .most = SEVERAL,
    .needs = "a job file, or - for standard input",
    .run = run,
};
