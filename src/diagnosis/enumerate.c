/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/error.h"
#include "base/memory.h"
#include "diagnosis/steps.h"

#include <math.h>

/*
 * Hypotheses are sets of none or one fault today. What follows the enumeration takes sets of any
 * size up to FAULTS_AT_ONCE.
 */

void candidates_finish(struct candidates *candidates)
{
    free(candidates->list);
    *candidates = (struct candidates){0};
}

struct collector {
    struct candidates *candidates;
    bool failed;
};

static bool grow(struct candidates *candidates)
{
    size_t capacity = candidates->capacity > 0 ? 2 * candidates->capacity : 512;
    struct candidate *list = realloc(candidates->list, capacity * sizeof *list);
    if (list == NULL)
        return false;
    candidates->list = list;
    candidates->capacity = capacity;
    return true;
}

static bool collect(void *context, const struct fault *fault)
{
    struct collector *collector = context;
    struct candidates *candidates = collector->candidates;
    if (candidates->n == candidates->capacity && !grow(candidates)) {
        collector->failed = true;
        return false;
    }
    /* What changes nothing is the empty set. */
    size_t n_faults = fault->family->apply != NULL;
    candidates->list[candidates->n] = (struct candidate){
        .hypothesis = {.faults = {*fault}, .n_faults = n_faults},
        .index = candidates->n,
        .log_evidence = -INFINITY,
        .log_likely = -INFINITY,
    };
    candidates->n++;
    return true;
}

static size_t kind_of(const struct fault_family *family, const struct fault *fault)
{
    return family->kind != NULL ? family->kind(fault) : 0;
}

/* Splits the family's prior over the kinds present, then evenly over each kind's members. */
static void split_prior(const struct fault_family *family, const struct family_prior *row,
                        struct candidate *members, size_t n)
{
    size_t count[MODELS_MAX_KINDS] = {0};
    double present = 0.0;
    for (size_t i = 0; i < n; i++) {
        const struct fault *fault = &members[i].hypothesis.faults[0];
        if (count[kind_of(family, fault)]++ == 0)
            present += fault_kind_share(fault, row);
    }
    for (size_t i = 0; i < n; i++) {
        const struct fault *fault = &members[i].hypothesis.faults[0];
        double share = fault_kind_share(fault, row) / present;
        members[i].log_prior = log(row->prior * share / (double)count[kind_of(family, fault)]);
    }
}

struct looked {
    const struct rf_job *job;
    bool each_enough;
    double share; /* of the fault that would have shown where somebody looked */
};

static void count_looked(void *context, const struct look *look)
{
    struct looked *looked = context;
    if (!looked_at(looked->job, look))
        return;
    if (looked->each_enough)
        looked->share = fmax(looked->share, look->share);
    else
        looked->share += look->share;
}

double share_left_by_looks(const struct fault *fault, const struct rf_job *job,
                           const struct rf_models *models)
{
    struct looked looked = {.job = job, .each_enough = fault->family->each_enough};
    fault_looks(fault, job, models, count_looked, &looked);
    /* A sum of shares can miss 1 by rounding. */
    return looked.share < 1.0 - 1e-9 ? 1.0 - looked.share : 0.0;
}

/* Nothing was found where somebody looked: what is left of the fault's weight. */
static double log_left_by_looks(const struct hypothesis *hypothesis, const struct rf_job *job,
                                const struct rf_models *models)
{
    double left = 1.0;
    for (size_t i = 0; i < hypothesis->n_faults; i++)
        left *= share_left_by_looks(&hypothesis->faults[i], job, models);
    return log(left);
}

static enum rf_status enumerate_family(struct candidates *candidates,
                                       const struct fault_family *family, const struct rf_job *job,
                                       const struct rf_models *models, double *prior_present,
                                       struct rf_error *error)
{
    const struct family_prior *row = models_family(models, family->name);
    struct collector collector = {.candidates = candidates};
    size_t first = candidates->n;
    family->enumerate(job, models, collect, &collector);
    if (collector.failed)
        return fail_memory(error);
    if (candidates->n > first) {
        split_prior(family, row, candidates->list + first, candidates->n - first);
        *prior_present += row->prior;
    }
    return RF_OK;
}

enum rf_status candidates_enumerate(struct candidates *candidates, const struct rf_job *job,
                                    const struct rf_models *models, struct rf_error *error)
{
    double prior_present = 0.0;
    enum rf_status status = fault_check_models(models, error);
    for (size_t i = 0; i < n_fault_families && status == RF_OK; i++)
        status =
            enumerate_family(candidates, fault_families[i], job, models, &prior_present, error);
    /* Families without a member here drop out; the rest is renormalised. */
    for (size_t i = 0; i < candidates->n && status == RF_OK; i++) {
        struct candidate *candidate = &candidates->list[i];
        candidate->log_prior -= log(prior_present);
        candidate->log_looks = log_left_by_looks(&candidate->hypothesis, job, models);
    }
    return status;
}
