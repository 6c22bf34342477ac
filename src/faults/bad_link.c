/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "faults/places.h"

/* The set-ups that link the ends in question: crossed at both, linked at out or at in. */
static bool links_at(enum joining joining, bool leg_in)
{
    return joining == JOIN_CROSS || joining == (leg_in ? JOIN_LINK_IN : JOIN_LINK_OUT);
}

static void enumerate(const struct rf_job *job, const struct rf_models *models,
                      fault_callback *callback, void *context)
{
    (void)models;
    for (size_t setup = 0; setup < N_SETUPS; setup++) {
        if (!setup_has_links(&setups[setup]) || !setup_has_readings(job, setup))
            continue;
        for (int variant = 0; variant < 4; variant++) {
            struct fault fault = {.family = &fault_family_bad_link,
                                  .setup = setup,
                                  .leg_in = variant / 2 == 1,
                                  .open = variant % 2 == 1};
            if (links_at(setups[setup].joining, fault.leg_in) && !callback(context, &fault))
                return;
        }
    }
}

static size_t kind(const struct fault *fault)
{
    return fault->open ? 0 : 1;
}

static bool has_parameter(const struct fault *fault)
{
    return !fault->open;
}

/* A link that is open stays open whatever else is wrong with it. */
static void apply(const struct fault *fault, struct wiring *wiring, double median, int parameter)
{
    struct links *links = &wiring->links[fault->setup];
    enum link_state *link = fault->leg_in ? &links->in : &links->out;
    if (fault->open) {
        *link = LINK_OPEN;
    } else if (*link != LINK_OPEN) {
        *link = LINK_RESISTIVE;
        links->ohms = median;
        links->parameter = parameter;
    }
}

static void looks(const struct fault *fault, const struct rf_job *job,
                  const struct rf_models *models, look_callback *callback, void *context)
{
    (void)job;
    look_board(place_share(fault, models), callback, context);
}

static void describe_kind(const struct fault *fault, struct text *out)
{
    text_addf(out, "%s at the %s %s end for ", fault->open ? "link not made" : "bad link",
              leg_word(fault->leg_in),
              conductor_words[pair_members[setups[fault->setup].pair].first]);
    say_setup(fault->setup, out);
}

static void describe(const struct fault *fault, const struct rf_job *job, struct text *out)
{
    (void)job;
    describe_kind(fault, out);
}

static const char *const kind_names_of_link[] = {"open", "high"};

const struct fault_family fault_family_bad_link = {
    .name = "bad_link",
    .fields = FIELD_LINK_SETUP | FIELD_OPEN,
    .ohms = true,
    .enumerate = enumerate,
    .kind = kind,
    .kind_names = kind_names_of_link,
    .n_kinds = 2,
    .has_parameter = has_parameter,
    .apply = apply,
    .looks = looks,
    .share_names = place_shares,
    .n_shares = 1,
    .describe = describe,
    .describe_kind = describe_kind,
};
