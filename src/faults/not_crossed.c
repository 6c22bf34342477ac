/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "faults/places.h"

static void enumerate(const struct rf_job *job, const struct rf_models *models,
                      fault_callback *callback, void *context)
{
    (void)models;
    for (size_t setup = 0; setup < N_SETUPS; setup++) {
        struct fault fault = {.family = &fault_family_not_crossed, .setup = setup};
        if (setups[setup].joining == JOIN_CROSS && setup_has_readings(job, setup) &&
            !callback(context, &fault))
            return;
    }
}

static void apply(const struct fault *fault, struct wiring *wiring, double median, int parameter)
{
    (void)median;
    (void)parameter;
    wiring->links[fault->setup].not_crossed = true;
}

static void looks(const struct fault *fault, const struct rf_job *job,
                  const struct rf_models *models, look_callback *callback, void *context)
{
    (void)job;
    look_board(place_share(fault, models), callback, context);
}

static void describe_kind(const struct fault *fault, struct text *out)
{
    text_addf(out, "links not crossed for the %s test", pair_words[setups[fault->setup].pair]);
}

static void describe(const struct fault *fault, const struct rf_job *job, struct text *out)
{
    (void)job;
    describe_kind(fault, out);
}

const struct fault_family fault_family_not_crossed = {
    .name = "not_crossed",
    .fields = FIELD_CROSS_SETUP,
    .enumerate = enumerate,
    .apply = apply,
    .looks = looks,
    .share_names = place_shares,
    .n_shares = 1,
    .describe = describe,
    .describe_kind = describe_kind,
};
