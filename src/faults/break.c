/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "faults/pieces.h"
#include "faults/places.h"

static void enumerate(const struct rf_job *job, const struct rf_models *models,
                      fault_callback *callback, void *context)
{
    (void)models;
    enumerate_runs(&fault_family_break, job, WHOLE_CABLE + 1, callback, context);
}

static void apply(const struct fault *fault, struct wiring *wiring, double median, int parameter)
{
    (void)median;
    (void)parameter;
    for (int c = 0; c < N_CONDUCTORS; c++)
        if (fault->conductor == WHOLE_CABLE || fault->conductor == c)
            pieces_take_out(wiring, fault->run, (enum conductor)c);
}

static void looks(const struct fault *fault, const struct rf_job *job,
                  const struct rf_models *models, look_callback *callback, void *context)
{
    const struct family_prior *row = models_family(models, fault->family->name);
    bool whole = fault->conductor == WHOLE_CABLE;
    look_along_run(job, fault->run, family_share(row, whole ? "whole_end" : "end"),
                   family_share(row, whole ? "whole_inside" : "inside"), callback, context);
}

/* On a spur a broken live conductor, or the whole cable, leaves what is behind it dead; on the
 * ring one half goes on feeding all. */
static enum danger danger(const struct fault *fault, const struct rf_job *job)
{
    if (fault->conductor == CPC)
        return DANGER_CPC_BROKEN;
    return run_on_ring(job, fault->run) ? DANGER_RING_BROKEN : DANGER_NONE;
}

static void describe_kind(const struct fault *fault, struct text *out)
{
    text_addf(out, "%s broken",
              fault->conductor == WHOLE_CABLE ? "whole cable" : conductor_words[fault->conductor]);
}

static void describe(const struct fault *fault, const struct rf_job *job, struct text *out)
{
    describe_kind(fault, out);
    say_in_run(job, fault->run, out);
}

static const char *const share_names[] = {"end", "inside", "whole_end", "whole_inside"};

const struct fault_family fault_family_break = {
    .name = "break",
    .fields = FIELD_RUN | FIELD_ANY_CONDUCTOR,
    .enumerate = enumerate,
    .apply = apply,
    .looks = looks,
    .share_names = share_names,
    .n_shares = 4,
    .danger = danger,
    .describe = describe,
    .describe_kind = describe_kind,
    .span = span_run,
};
