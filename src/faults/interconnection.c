/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "faults/places.h"

static void enumerate(const struct rf_job *job, const struct rf_models *models,
                      fault_callback *callback, void *context)
{
    (void)models;
    size_t last = place_in(job);
    for (size_t one = place_out(); one <= last; one++)
        for (size_t other = one + 2; other <= last; other++) {
            if (one == place_out() && other == last)
                continue; /* both at the board */
            struct fault fault = {
                .family = &fault_family_interconnection, .place = one, .other = other};
            if (!callback(context, &fault))
                return;
        }
}

static void apply(const struct fault *fault, struct wiring *wiring, double median, int parameter)
{
    for (int c = 0; c < N_CONDUCTORS; c++)
        wiring_add_cable(wiring, (enum conductor)c, terminal(fault->place, (enum conductor)c),
                         terminal(fault->other, (enum conductor)c), median, parameter);
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
    text_add(out, "unrecorded cable between two places (interconnection)");
}

static void describe(const struct fault *fault, const struct rf_job *job, struct text *out)
{
    text_add(out, "unrecorded cable from ");
    say_place(job, fault->place, out);
    text_add(out, " to ");
    say_place(job, fault->other, out);
    text_add(out, " (interconnection)");
}

const struct fault_family fault_family_interconnection = {
    .name = "interconnection",
    .fields = FIELD_BETWEEN_RING,
    .metres = true,
    .each_enough = true,
    .enumerate = enumerate,
    .apply = apply,
    .looks = looks,
    .share_names = place_shares,
    .n_shares = 1,
    .describe = describe,
    .describe_kind = describe_kind,
};
