/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "faults/pieces.h"
#include "faults/places.h"

/* A joint in all three conductors (one strip of connectors, say) is accepted where somebody found
 * one, but is no hypothesis of its own. */
static void enumerate(const struct rf_job *job, const struct rf_models *models,
                      fault_callback *callback, void *context)
{
    (void)models;
    enumerate_runs(&fault_family_joint, job, N_CONDUCTORS, callback, context);
}

static void apply(const struct fault *fault, struct wiring *wiring, double median, int parameter)
{
    for (int c = 0; c < N_CONDUCTORS; c++)
        if (fault->conductor == WHOLE_CABLE || fault->conductor == c)
            pieces_splice(wiring, fault->run, (enum conductor)c, median, parameter);
}

static void looks(const struct fault *fault, const struct rf_job *job,
                  const struct rf_models *models, look_callback *callback, void *context)
{
    const struct family_prior *row = models_family(models, fault->family->name);
    look_along_run(job, fault->run, family_share(row, "end"), family_share(row, "inside"), callback,
                   context);
}

/* A CPC carries no load, so its joint does not heat. */
static enum danger danger(const struct fault *fault, const struct rf_job *job)
{
    (void)job;
    return fault->conductor == CPC ? DANGER_NONE : DANGER_HEAT;
}

static void describe_kind(const struct fault *fault, struct text *out)
{
    if (fault->conductor == WHOLE_CABLE)
        text_add(out, "high-resistance joint of the whole cable");
    else
        text_addf(out, "high-resistance %s joint", conductor_words[fault->conductor]);
}

static void describe(const struct fault *fault, const struct rf_job *job, struct text *out)
{
    describe_kind(fault, out);
    say_in_run(job, fault->run, out);
}

static const char *const share_names[] = {"end", "inside"};

const struct fault_family fault_family_joint = {
    .name = "joint",
    .fields = FIELD_RUN | FIELD_ANY_CONDUCTOR,
    .ohms = true,
    .enumerate = enumerate,
    .apply = apply,
    .looks = looks,
    .share_names = share_names,
    .n_shares = 2,
    .danger = danger,
    .describe = describe,
    .describe_kind = describe_kind,
    .span = span_run,
};
