/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/error.h"
#include "simulation/simulation.h"

/* The members of one family counted by kind, and the one that is wanted. */
struct members {
    const struct fault_family *family;
    const struct family_prior *row;
    size_t count[MODELS_MAX_KINDS];
    double share[MODELS_MAX_KINDS];
    size_t kind, wanted; /* the wanted-th member of that kind … */
    struct fault fault;  /* … is this */
};

static size_t kind_of(const struct fault *fault)
{
    return fault->family->kind != NULL ? fault->family->kind(fault) : 0;
}

static bool count_member(void *context, const struct fault *fault)
{
    struct members *members = context;
    size_t kind = kind_of(fault);
    members->count[kind]++;
    members->share[kind] = fault_kind_share(fault, members->row);
    return true;
}

static bool take_member(void *context, const struct fault *fault)
{
    struct members *members = context;
    if (kind_of(fault) != members->kind)
        return true;
    members->fault = *fault;
    return members->wanted-- > 0;
}

/* Index drawn in proportion to n weights. */
static size_t draw_weighted(const double weights[], size_t n, gsl_rng *generator)
{
    double sum = 0;
    for (size_t i = 0; i < n; i++)
        sum += weights[i];
    double left = gsl_rng_uniform(generator) * sum;
    size_t last = 0;
    for (size_t i = 0; i < n; i++) {
        if (weights[i] <= 0)
            continue;
        last = i;
        left -= weights[i];
        if (left < 0)
            break;
    }
    return last;
}

static size_t count_members(struct members *members, const struct fault_family *family,
                            const struct rf_job *job, const struct rf_models *models)
{
    *members = (struct members){.family = family, .row = models_family(models, family->name)};
    if (members->row == NULL)
        return 0;
    family->enumerate(job, models, count_member, members);
    size_t n = 0;
    for (size_t kind = 0; kind < MODELS_MAX_KINDS; kind++)
        n += members->count[kind];
    return n;
}

enum rf_status draw_fault(const struct rf_job *job, const struct rf_models *models,
                          bool leave_out_none, gsl_rng *generator, struct fault *fault,
                          struct rf_error *error)
{
    double weights[MODELS_MAX_FAMILIES] = {0};
    struct members members;
    double sum = 0;
    for (size_t i = 0; i < n_fault_families && i < MODELS_MAX_FAMILIES; i++) {
        const struct fault_family *family = fault_families[i];
        if (leave_out_none && family == &fault_family_none)
            continue;
        if (count_members(&members, family, job, models) > 0)
            weights[i] = members.row->prior;
        sum += weights[i];
    }
    if (!(sum > 0))
        return fail(error, RF_REFUSED, "%s: no family of faults has a member on this ring",
                    job->source);
    size_t index = draw_weighted(weights, n_fault_families, generator);
    count_members(&members, fault_families[index], job, models);
    members.kind = draw_weighted(members.share, MODELS_MAX_KINDS, generator);
    members.wanted = (size_t)gsl_rng_uniform_int(generator, members.count[members.kind]);
    members.family->enumerate(job, models, take_member, &members);
    *fault = members.fault;
    return RF_OK;
}
