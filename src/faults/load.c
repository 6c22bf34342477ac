/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "faults/places.h"

static void enumerate(const struct rf_job *job, const struct rf_models *models,
                      fault_callback *callback, void *context)
{
    (void)models;
    for (size_t place = next_front(job, 0); place < job->n_places; place = next_front(job, place)) {
        struct fault fault = {.family = &fault_family_load, .place = place};
        if (!callback(context, &fault))
            return;
    }
}

static void apply(const struct fault *fault, struct wiring *wiring, double median, int parameter)
{
    wiring_add_resistor(wiring, wiring->front[terminal(fault->place, LINE)],
                        wiring->front[terminal(fault->place, NEUTRAL)], median, parameter);
}

static void looks(const struct fault *fault, const struct rf_job *job,
                  const struct rf_models *models, look_callback *callback, void *context)
{
    (void)job;
    look_check(fault->place, place_share(fault, models), callback, context);
}

static void describe_kind(const struct fault *fault, struct text *out)
{
    (void)fault;
    text_add(out, "something left plugged in");
}

static void describe(const struct fault *fault, const struct rf_job *job, struct text *out)
{
    describe_kind(fault, out);
    say_at(job, fault->place, out);
}

const struct fault_family fault_family_load = {
    .name = "load",
    .fields = FIELD_AT,
    .ohms = true,
    .enumerate = enumerate,
    .apply = apply,
    .looks = looks,
    .share_names = place_shares,
    .n_shares = 1,
    .describe = describe,
    .describe_kind = describe_kind,
    .span = span_point,
};
