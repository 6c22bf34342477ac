/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "faults/places.h"

static void enumerate(const struct rf_job *job, const struct rf_models *models,
                      fault_callback *callback, void *context)
{
    (void)models;
    for (size_t place = next_front(job, 0); place < job->n_places; place = next_front(job, place))
        for (int poles = POLES_L; poles <= POLES_LN; poles++) {
            struct fault fault = {
                .family = &fault_family_switched_off, .place = place, .poles = (enum poles)poles};
            if (!callback(context, &fault))
                return;
        }
}

static void apply(const struct fault *fault, struct wiring *wiring, double median, int parameter)
{
    (void)median;
    (void)parameter;
    wiring->front[terminal(fault->place, LINE)] = wiring_add_node(wiring);
    if (fault->poles == POLES_LN)
        wiring->front[terminal(fault->place, NEUTRAL)] = wiring_add_node(wiring);
}

static void looks(const struct fault *fault, const struct rf_job *job,
                  const struct rf_models *models, look_callback *callback, void *context)
{
    (void)job;
    look_check(fault->place, place_share(fault, models), callback, context);
}

static void describe_kind(const struct fault *fault, struct text *out)
{
    text_addf(out, "switched off, or adaptor not home (%s)",
              fault->poles == POLES_L ? "line" : "line and neutral");
}

static void describe(const struct fault *fault, const struct rf_job *job, struct text *out)
{
    say_place(job, fault->place, out);
    text_add(out, " ");
    describe_kind(fault, out);
}

const struct fault_family fault_family_switched_off = {
    .name = "switched_off",
    .fields = FIELD_AT | FIELD_POLES,
    .enumerate = enumerate,
    .apply = apply,
    .looks = looks,
    .share_names = place_shares,
    .n_shares = 1,
    .describe = describe,
    .describe_kind = describe_kind,
    .span = span_point,
};
