/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "faults/places.h"

/* The chain of `length` ring points from `first` on, or, backwards, down to it. */
static struct fault chain_of(size_t first, size_t length, bool backwards)
{
    struct fault fault = {.family = &fault_family_spur, .chain_length = length};
    for (size_t i = 0; i < length; i++)
        fault.chain[i] = backwards ? first + length - 1 - i : first + i;
    return fault;
}

static void enumerate(const struct rf_job *job, const struct rf_models *models,
                      fault_callback *callback, void *context)
{
    (void)models;
    for (size_t length = 1; length <= CHAIN_MAX && length < job->n_ring; length++)
        for (size_t first = 1; first + length - 1 <= job->n_ring; first++)
            for (int backwards = 0; backwards < (length > 1 ? 2 : 1); backwards++) {
                struct fault fault = chain_of(first, length, backwards == 1);
                if (!callback(context, &fault))
                    return;
            }
}

static size_t kind(const struct fault *fault)
{
    return fault->chain_length - 1;
}

static void apply(const struct fault *fault, struct wiring *wiring, double median, int parameter)
{
    size_t near = fault->chain[0], far = fault->chain[fault->chain_length - 1];
    size_t lowest = near < far ? near : far, highest = near < far ? far : near;
    int tee[N_CONDUCTORS];
    for (int c = 0; c < N_CONDUCTORS; c++)
        tee[c] = wiring_add_node(wiring);
    wiring_move_end(wiring, lowest - 1, lowest, tee);
    wiring_move_end(wiring, highest, highest, tee);
    for (int c = 0; c < N_CONDUCTORS; c++)
        wiring_add_cable(wiring, (enum conductor)c, tee[c], terminal(near, (enum conductor)c),
                         median, parameter);
}

/* The last point of the chain has one cable where two are recorded. */
static void looks(const struct fault *fault, const struct rf_job *job,
                  const struct rf_models *models, look_callback *callback, void *context)
{
    look_open(job, fault->chain[fault->chain_length - 1], place_share(fault, models), callback,
              context);
}

static void describe_kind(const struct fault *fault, struct text *out)
{
    static const char *const words[CHAIN_MAX] = {"a point", "two points", "three points"};
    text_addf(out, "%s on an unrecorded spur", words[fault->chain_length - 1]);
}

static void describe(const struct fault *fault, const struct rf_job *job, struct text *out)
{
    size_t n = fault->chain_length;
    for (size_t i = 0; i < n; i++) {
        if (i > 0)
            text_add(out, i + 1 == n ? " and " : ", ");
        say_place(job, fault->chain[i], out);
    }
    text_add(out, " on an unrecorded spur");
    if (n > 1) {
        text_add(out, ", ");
        say_place(job, fault->chain[0], out);
        text_add(out, " first");
    }
}

static void span(const struct fault *fault, const struct rf_job *job, size_t *from, size_t *to)
{
    (void)job;
    size_t near = fault->chain[0], far = fault->chain[fault->chain_length - 1];
    *from = near < far ? near : far;
    *to = near < far ? far : near;
}

static const char *const kind_names_of_spur[CHAIN_MAX] = {"1", "2", "3"};

const struct fault_family fault_family_spur = {
    .name = "spur",
    .fields = FIELD_POINTS,
    .metres = true,
    .enumerate = enumerate,
    .kind = kind,
    .kind_names = kind_names_of_spur,
    .n_kinds = CHAIN_MAX,
    .apply = apply,
    .looks = looks,
    .share_names = place_shares,
    .n_shares = 1,
    .describe = describe,
    .describe_kind = describe_kind,
    .span = span,
};
