/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "faults/places.h"

static void enumerate(const struct rf_job *job, const struct rf_models *models,
                      fault_callback *callback, void *context)
{
    (void)models;
    for (size_t one = next_point(job, 0); one < job->n_places; one = next_point(job, one))
        for (size_t other = next_point(job, one); other < job->n_places;
             other = next_point(job, other)) {
            struct fault fault = {.family = &fault_family_parallel, .place = one, .other = other};
            if (!callback(context, &fault))
                return;
        }
}

static void apply(const struct fault *fault, struct wiring *wiring, double median, int parameter)
{
    wiring_add_resistor(wiring, terminal(fault->place, CPC), terminal(fault->other, CPC), median,
                        parameter);
}

static void looks(const struct fault *fault, const struct rf_job *job,
                  const struct rf_models *models, look_callback *callback, void *context)
{
    look_open(job, fault->place, place_share(fault, models), callback, context);
    look_open(job, fault->other, place_share(fault, models), callback, context);
}

static void describe_kind(const struct fault *fault, struct text *out)
{
    (void)fault;
    text_add(out, "metalwork joins the CPCs of two points");
}

static void describe(const struct fault *fault, const struct rf_job *job, struct text *out)
{
    text_add(out, "metalwork joins the CPCs of ");
    say_place(job, fault->place, out);
    text_add(out, " and ");
    say_place(job, fault->other, out);
}

const struct fault_family fault_family_parallel = {
    .name = "parallel",
    .fields = FIELD_BETWEEN_POINTS,
    .ohms = true,
    .each_enough = true,
    .enumerate = enumerate,
    .apply = apply,
    .looks = looks,
    .share_names = place_shares,
    .n_shares = 1,
    .describe = describe,
    .describe_kind = describe_kind,
};
