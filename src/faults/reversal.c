/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "faults/places.h"

static void enumerate(const struct rf_job *job, const struct rf_models *models,
                      fault_callback *callback, void *context)
{
    (void)models;
    enumerate_front_pairs(&fault_family_reversal, job, callback, context);
}

static void apply(const struct fault *fault, struct wiring *wiring, double median, int parameter)
{
    (void)median;
    (void)parameter;
    int *first = &wiring->front[terminal(fault->place, pair_members[fault->pair].first)];
    int *second = &wiring->front[terminal(fault->place, pair_members[fault->pair].second)];
    int kept = *first;
    *first = *second;
    *second = kept;
}

static void looks(const struct fault *fault, const struct rf_job *job,
                  const struct rf_models *models, look_callback *callback, void *context)
{
    look_open(job, fault->place, place_share(fault, models), callback, context);
}

static enum danger danger(const struct fault *fault, const struct rf_job *job)
{
    (void)job;
    static const enum danger of_pair[N_PAIRS] = {
        [PAIR_LN] = DANGER_REVERSED,
        [PAIR_LE] = DANGER_LINE_ON_CPC,
        [PAIR_NE] = DANGER_NONE,
    };
    return of_pair[fault->pair];
}

static void describe_kind(const struct fault *fault, struct text *out)
{
    say_pair(fault->pair, out);
    text_add(out, " changed over");
}

static void describe(const struct fault *fault, const struct rf_job *job, struct text *out)
{
    describe_kind(fault, out);
    say_at(job, fault->place, out);
}

const struct fault_family fault_family_reversal = {
    .name = "reversal",
    .fields = FIELD_AT | FIELD_PAIR,
    .enumerate = enumerate,
    .apply = apply,
    .looks = looks,
    .share_names = place_shares,
    .n_shares = 1,
    .danger = danger,
    .describe = describe,
    .describe_kind = describe_kind,
    .span = span_point,
};
