/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "faults/places.h"

static void enumerate(const struct rf_job *job, const struct rf_models *models,
                      fault_callback *callback, void *context)
{
    (void)models;
    for (size_t place = next_front(job, 0); place < job->n_places; place = next_front(job, place))
        for (int variant = 0; variant < 2 * N_CONDUCTORS; variant++) {
            struct fault fault = {.family = &fault_family_contact,
                                  .place = place,
                                  .conductor = variant / 2,
                                  .open = variant % 2 == 1};
            if (!callback(context, &fault))
                return;
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

static void apply(const struct fault *fault, struct wiring *wiring, double median, int parameter)
{
    int *front = &wiring->front[terminal(fault->place, (enum conductor)fault->conductor)];
    int node = wiring_add_node(wiring);
    if (!fault->open)
        wiring_add_resistor(wiring, *front, node, median, parameter);
    *front = node;
}

static void looks(const struct fault *fault, const struct rf_job *job,
                  const struct rf_models *models, look_callback *callback, void *context)
{
    look_open(job, fault->place, place_share(fault, models), callback, context);
}

/* An open contact carries nothing, but what is plugged in has then no protective conductor. */
static enum danger danger(const struct fault *fault, const struct rf_job *job)
{
    (void)job;
    if (fault->conductor == CPC)
        return fault->open ? DANGER_CPC_BROKEN : DANGER_NONE;
    return fault->open ? DANGER_NONE : DANGER_HEAT;
}

static const char *state_word(const struct fault *fault)
{
    return fault->open ? " not made" : " poor";
}

static void describe_kind(const struct fault *fault, struct text *out)
{
    text_addf(out, "%s contact%s", conductor_words[fault->conductor], state_word(fault));
}

static void describe(const struct fault *fault, const struct rf_job *job, struct text *out)
{
    text_addf(out, "%s contact", conductor_words[fault->conductor]);
    say_at(job, fault->place, out);
    text_add(out, state_word(fault));
}

static const char *const kind_names_of_contact[] = {"open", "high"};

const struct fault_family fault_family_contact = {
    .name = "contact",
    .fields = FIELD_AT | FIELD_CONDUCTOR | FIELD_OPEN,
    .ohms = true,
    .enumerate = enumerate,
    .kind = kind,
    .kind_names = kind_names_of_contact,
    .n_kinds = 2,
    .has_parameter = has_parameter,
    .apply = apply,
    .looks = looks,
    .share_names = place_shares,
    .n_shares = 1,
    .danger = danger,
    .describe = describe,
    .describe_kind = describe_kind,
    .span = span_point,
};
