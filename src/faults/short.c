/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "faults/places.h"

static void enumerate(const struct rf_job *job, const struct rf_models *models,
                      fault_callback *callback, void *context)
{
    (void)models;
    for (size_t place = next_point(job, 0); place < job->n_places; place = next_point(job, place))
        for (int pair = 0; pair < N_PAIRS; pair++) {
            struct fault fault = {
                .family = &fault_family_short, .place = place, .pair = (enum pair)pair};
            if (!callback(context, &fault))
                return;
        }
}

static void apply(const struct fault *fault, struct wiring *wiring, double median, int parameter)
{
    wiring_add_resistor(wiring, terminal(fault->place, pair_members[fault->pair].first),
                        terminal(fault->place, pair_members[fault->pair].second), median,
                        parameter);
}

static bool run_meets(const struct rf_job *job, size_t run, size_t place)
{
    return run_near_end(job, run) == place || run_far_end(run) == place;
}

/* At the point, or a nail through one of the runs that meet there: shared evenly over them. */
static void looks(const struct fault *fault, const struct rf_job *job,
                  const struct rf_models *models, look_callback *callback, void *context)
{
    const struct family_prior *row = models_family(models, fault->family->name);
    size_t meeting = 0;
    for (size_t run = 0; run < n_runs(job); run++)
        if (run_meets(job, run, fault->place))
            meeting++;
    look_open(job, fault->place, family_share(row, "point"), callback, context);
    for (size_t run = 0; run < n_runs(job); run++)
        if (run_meets(job, run, fault->place)) {
            struct look look = {.kind = LOOK_OPEN,
                                .where = LOOK_IN_RUN,
                                .index = run,
                                .share = family_share(row, "runs") / (double)meeting};
            callback(context, &look);
        }
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
    text_addf(out, "%s touching %s", conductor_words[pair_members[fault->pair].first],
              conductor_words[pair_members[fault->pair].second]);
}

static void describe(const struct fault *fault, const struct rf_job *job, struct text *out)
{
    describe_kind(fault, out);
    say_at(job, fault->place, out);
}

static const char *const share_names[] = {"point", "runs"};

const struct fault_family fault_family_short = {
    .name = "short",
    .fields = FIELD_AT_ANY | FIELD_PAIR,
    .ohms = true,
    .enumerate = enumerate,
    .apply = apply,
    .looks = looks,
    .share_names = share_names,
    .n_shares = 2,
    .danger = danger,
    .describe = describe,
    .describe_kind = describe_kind,
    .span = span_point,
};
