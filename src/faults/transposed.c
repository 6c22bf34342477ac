/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "faults/pieces.h"
#include "faults/places.h"

static void enumerate(const struct rf_job *job, const struct rf_models *models,
                      fault_callback *callback, void *context)
{
    (void)models;
    for (size_t run = 0; run < n_runs(job) && run_on_ring(job, run); run++)
        for (int pair = 0; pair < N_PAIRS; pair++) {
            struct fault fault = {
                .family = &fault_family_transposed, .run = run, .pair = (enum pair)pair};
            if (!callback(context, &fault))
                return;
        }
}

/* Beside a broken conductor the other changes its terminal all the same; the nodes of a place, or
 * of a tee, lie side by side in the order of the conductors. */
static void apply(const struct fault *fault, struct wiring *wiring, double median, int parameter)
{
    (void)median;
    (void)parameter;
    const struct pair_members pair = pair_members[fault->pair];
    struct wire *first = pieces_far_end(wiring, fault->run, pair.first);
    struct wire *second = pieces_far_end(wiring, fault->run, pair.second);
    int across = (int)pair.second - (int)pair.first;
    if (first == NULL || second == NULL) {
        if (first != NULL)
            first->b += across;
        if (second != NULL)
            second->b -= across;
        return;
    }
    int kept = first->b;
    first->b = second->b;
    second->b = kept;
}

static void looks(const struct fault *fault, const struct rf_job *job,
                  const struct rf_models *models, look_callback *callback, void *context)
{
    const struct family_prior *row = models_family(models, fault->family->name);
    look_along_run(job, fault->run, family_share(row, "end"), 0, callback, context);
}

static enum danger danger(const struct fault *fault, const struct rf_job *job)
{
    (void)job;
    static const enum danger of_pair[N_PAIRS] = {
        [PAIR_LN] = DANGER_LIVES_SHORTED,
        [PAIR_LE] = DANGER_LINE_ON_CPC,
        [PAIR_NE] = DANGER_NONE,
    };
    return of_pair[fault->pair];
}

static void describe_kind(const struct fault *fault, struct text *out)
{
    say_pair(fault->pair, out);
    text_add(out, " change over in a run and stay so");
}

static void describe(const struct fault *fault, const struct rf_job *job, struct text *out)
{
    say_pair(fault->pair, out);
    text_add(out, " change over");
    say_in_run(job, fault->run, out);
    text_add(out, " and stay so");
}

static const char *const share_names[] = {"end"};

const struct fault_family fault_family_transposed = {
    .name = "transposed",
    .fields = FIELD_RING_RUN | FIELD_PAIR,
    .enumerate = enumerate,
    .apply = apply,
    .looks = looks,
    .share_names = share_names,
    .n_shares = 1,
    .danger = danger,
    .describe = describe,
    .describe_kind = describe_kind,
    .span = span_run,
};
