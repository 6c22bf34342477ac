/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "faults/fault.h"

static void enumerate(const struct rf_job *job, const struct rf_models *models,
                      fault_callback *callback, void *context)
{
    (void)job;
    (void)models;
    struct fault fault = {.family = &fault_family_none};
    callback(context, &fault);
}

static void describe_kind(const struct fault *fault, struct text *out)
{
    (void)fault;
    text_add(out, "no defect, wired as recorded");
}

static void describe(const struct fault *fault, const struct rf_job *job, struct text *out)
{
    (void)job;
    describe_kind(fault, out);
}

const struct fault_family fault_family_none = {
    .name = "none",
    .enumerate = enumerate,
    .describe = describe,
    .describe_kind = describe_kind,
};
