/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/error.h"
#include "base/memory.h"
#include "diagnosis/steps.h"

#include <math.h>
#include <stdlib.h>

/* Logs of posteriors nearer than this are ties; rounding alone moves them by less. */
static const double tie = 1e-6;

static double log_weight(const struct candidate *candidate)
{
    return candidate->log_prior + candidate->log_looks + candidate->log_evidence;
}

static enum rf_status fit_all(struct candidates *candidates, struct fitter *fitter,
                              struct wiring *wiring, const struct wiring *ring,
                              struct rf_error *error)
{
    for (size_t i = 0; i < candidates->n; i++) {
        struct candidate *candidate = &candidates->list[i];
        struct fit fit;
        wiring_copy(wiring, ring);
        hypothesis_apply(&candidate->hypothesis, wiring, NULL);
        if (fitter_fit(fitter, wiring, NULL, &fit) != RF_OK) {
            struct text words = {0};
            hypothesis_words(&candidate->hypothesis, ring->job, &words);
            fail(error, RF_NUMERICAL, "%s: the fit failed for: %s", ring->job->source,
                 words.bytes != NULL ? words.bytes : "a hypothesis");
            text_finish(&words);
            return RF_NUMERICAL;
        }
        candidate->log_evidence = fit.log_evidence;
    }
    return RF_OK;
}

struct ordered {
    double log_weight;
    size_t index;
};

static int by_weight(const void *a, const void *b)
{
    const struct ordered *one = a, *other = b;
    if (one->log_weight != other->log_weight)
        return one->log_weight > other->log_weight ? -1 : 1;
    return one->index < other->index ? -1 : 1;
}

static int by_index(const void *a, const void *b)
{
    const struct ordered *one = a, *other = b;
    return one->index < other->index ? -1 : one->index > other->index;
}

/* Best first; stretches of ties go back to enumeration order. */
static void sort_order(struct ordered *order, size_t n)
{
    qsort(order, n, sizeof *order, by_weight);
    for (size_t from = 0, to = 0; from < n; from = to) {
        for (to = from + 1; to < n; to++)
            if (!(order[to - 1].log_weight - order[to].log_weight < tie))
                break;
        qsort(order + from, to - from, sizeof *order, by_index);
    }
}

static void normalise(struct candidates *candidates)
{
    double largest = -INFINITY, sum = 0.0;
    for (size_t i = 0; i < candidates->n; i++)
        largest = fmax(largest, log_weight(&candidates->list[i]));
    for (size_t i = 0; i < candidates->n; i++)
        sum += exp(log_weight(&candidates->list[i]) - largest);
    for (size_t i = 0; i < candidates->n; i++)
        candidates->list[i].confidence = exp(log_weight(&candidates->list[i]) - largest) / sum;
}

static bool sort_candidates(struct candidates *candidates)
{
    struct ordered *order = NEW_ARRAY(struct ordered, candidates->n);
    struct candidate *sorted = NEW_ARRAY(struct candidate, candidates->n);
    bool ok = order != NULL && sorted != NULL;
    if (ok) {
        for (size_t i = 0; i < candidates->n; i++)
            order[i] = (struct ordered){log_weight(&candidates->list[i]), i};
        sort_order(order, candidates->n);
        for (size_t i = 0; i < candidates->n; i++)
            sorted[i] = candidates->list[order[i].index];
        free(candidates->list);
        candidates->list = sorted;
        candidates->capacity = candidates->n;
        sorted = NULL;
    }
    free(order);
    free(sorted);
    return ok;
}

enum rf_status candidates_rank(struct candidates *candidates, struct fitter *fitter,
                               const struct wiring *ring, struct rf_error *error)
{
    struct wiring wiring = {0};
    enum rf_status status = wiring_init(&wiring, ring->job, ring->models, error);
    if (status == RF_OK)
        status = fit_all(candidates, fitter, &wiring, ring, error);
    wiring_finish(&wiring);
    if (status != RF_OK)
        return status;
    normalise(candidates);
    return sort_candidates(candidates) ? RF_OK : fail_memory(error);
}
