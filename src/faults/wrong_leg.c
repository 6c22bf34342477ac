/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "faults/places.h"

static void enumerate(const struct rf_job *job, const struct rf_models *models,
                      fault_callback *callback, void *context)
{
    (void)job;
    (void)models;
    for (int leg = 0; leg < 2; leg++) {
        struct fault fault = {.family = &fault_family_wrong_leg, .leg_in = leg == 1};
        if (!callback(context, &fault))
            return;
    }
}

static bool is_terminal_of(size_t place, int node)
{
    return node >= terminal(place, LINE) && node <= terminal(place, CPC);
}

/* Whatever ends at that leg's ends, spurs hung there too. */
static void apply(const struct fault *fault, struct wiring *wiring, double median, int parameter)
{
    (void)median;
    (void)parameter;
    size_t end = fault->leg_in ? place_in(wiring->job) : place_out();
    for (size_t i = 0; i < wiring->n_wires; i++) {
        struct wire *wire = &wiring->wires[i];
        if (wire->a >= 0 && (is_terminal_of(end, wire->a) || is_terminal_of(end, wire->b)))
            wire->a = -1;
    }
}

static void looks(const struct fault *fault, const struct rf_job *job,
                  const struct rf_models *models, look_callback *callback, void *context)
{
    (void)job;
    look_board(place_share(fault, models), callback, context);
}

static enum danger danger(const struct fault *fault, const struct rf_job *job)
{
    (void)fault;
    (void)job;
    return DANGER_OTHER_CIRCUIT;
}

static void describe_kind(const struct fault *fault, struct text *out)
{
    text_addf(out, "%s leg belongs to another circuit", leg_word(fault->leg_in));
}

static void describe(const struct fault *fault, const struct rf_job *job, struct text *out)
{
    (void)job;
    describe_kind(fault, out);
}

const struct fault_family fault_family_wrong_leg = {
    .name = "wrong_leg",
    .fields = FIELD_LEG,
    .enumerate = enumerate,
    .apply = apply,
    .looks = looks,
    .share_names = place_shares,
    .n_shares = 1,
    .danger = danger,
    .describe = describe,
    .describe_kind = describe_kind,
};
