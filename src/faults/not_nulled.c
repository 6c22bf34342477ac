/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "faults/places.h"

static void enumerate(const struct rf_job *job, const struct rf_models *models,
                      fault_callback *callback, void *context)
{
    (void)job;
    (void)models;
    struct fault fault = {.family = &fault_family_not_nulled};
    callback(context, &fault);
}

static void apply(const struct fault *fault, struct wiring *wiring, double median, int parameter)
{
    (void)fault;
    wiring->offset_ohms = median;
    wiring->offset_parameter = parameter;
}

static void looks(const struct fault *fault, const struct rf_job *job,
                  const struct rf_models *models, look_callback *callback, void *context)
{
    (void)job;
    look_board(place_share(fault, models), callback, context);
}

static void describe_kind(const struct fault *fault, struct text *out)
{
    (void)fault;
    text_add(out, "leads not nulled");
}

static void describe(const struct fault *fault, const struct rf_job *job, struct text *out)
{
    (void)job;
    describe_kind(fault, out);
}

const struct fault_family fault_family_not_nulled = {
    .name = "not_nulled",
    .ohms = true,
    .enumerate = enumerate,
    .apply = apply,
    .looks = looks,
    .share_names = place_shares,
    .n_shares = 1,
    .describe = describe,
    .describe_kind = describe_kind,
};
