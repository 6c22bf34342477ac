/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "faults/places.h"

#include <math.h>

/* Sizes come out of decimal numbers in files: equal ones are equal to the last bit. */
static bool is_recorded(const struct rf_job *job, const struct cable_row *cable)
{
    return !(cable->live_mm2 < job->live_mm2 || cable->live_mm2 > job->live_mm2) &&
           cable->cpc_mm2 <= job->cpc_mm2 && cable->cpc_mm2 >= job->cpc_mm2;
}

static void enumerate(const struct rf_job *job, const struct rf_models *models,
                      fault_callback *callback, void *context)
{
    for (size_t i = 0; i < models->n_cables; i++) {
        const struct cable_row *cable = &models->cables[i];
        struct fault fault = {
            .family = &fault_family_size, .live_mm2 = cable->live_mm2, .cpc_mm2 = cable->cpc_mm2};
        if (!is_recorded(job, cable) && !callback(context, &fault))
            return;
    }
}

static void apply(const struct fault *fault, struct wiring *wiring, double median, int parameter)
{
    (void)median;
    (void)parameter;
    wiring_set_cable(wiring, fault->live_mm2, fault->cpc_mm2);
}

/* Any point of the ring shows what cable comes into it. */
static void looks(const struct fault *fault, const struct rf_job *job,
                  const struct rf_models *models, look_callback *callback, void *context)
{
    for (size_t place = 1; place <= job->n_ring; place++)
        look_open(job, place, place_share(fault, models), callback, context);
}

static void describe_kind(const struct fault *fault, struct text *out)
{
    text_addf(out, "whole ring in %.1f/%.1f mm²", fault->live_mm2, fault->cpc_mm2);
}

static void describe(const struct fault *fault, const struct rf_job *job, struct text *out)
{
    describe_kind(fault, out);
    if (isnan(job->cpc_mm2))
        text_addf(out, " instead of %.1f with a CPC not recorded", job->live_mm2);
    else
        text_addf(out, " instead of %.1f/%.1f", job->live_mm2, job->cpc_mm2);
}

const struct fault_family fault_family_size = {
    .name = "size",
    .fields = FIELD_CABLE,
    .each_enough = true,
    .enumerate = enumerate,
    .apply = apply,
    .looks = looks,
    .share_names = place_shares,
    .n_shares = 1,
    .describe = describe,
    .describe_kind = describe_kind,
};
