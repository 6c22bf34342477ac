/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/error.h"
#include "base/memory.h"
#include "diagnosis/search.h"
#include "diagnosis/steps.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

/* Logs of posteriors nearer than this are ties; rounding alone moves them by less. */
static const double tie = 1e-6;

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

/*
 * Screening. A hypothesis is dropped if its evidence is as good as certain to stay `out_of_reach`
 * below the best so far: by its paths alone, or by how its fit stands. After the first stage it is
 * fitted with the mixture at once if it is likely to be better than the best, or hardly anything can
 * be; else it is put off until the batch has shown how good the best is. What is dropped weighs
 * nothing: all n of them together would have had less than n · exp(−out_of_reach) of the confidence.
 */
enum { BATCH = 1024 };

static double out_of_reach(size_t n)
{
    return 9.0 + log((double)n);
}

struct ranking {
    struct candidates *candidates;
    struct fitter *fitter;
    const struct wiring *ring;
    struct wiring wiring; /* of the hypothesis at hand */
    bool screen;
    double best;    /* the largest log weight so far … */
    bool explained; /* … of a hypothesis that explains the readings */
    double *theta;  /* BATCH × stride: where the first stage ended, of those put off */
    double *common; /* stride: where it ended without a fault, from where the others start */
    size_t stride;
    struct ordered *order; /* [BATCH] those put off, as they stand */
    double *most;          /* [BATCH] what their evidence can hardly exceed */
    size_t *put_off;       /* [BATCH] which candidates they are */
    size_t n_put_off;
};

static enum rf_status report_failure(const struct ranking *r, const struct candidate *candidate,
                                     struct rf_error *error)
{
    struct text words = {0};
    hypothesis_words(&candidate->hypothesis, r->ring->job, &words);
    fail(error, RF_NUMERICAL, "%s: the fit failed for: %s", r->ring->job->source,
         words.bytes != NULL ? words.bytes : "a hypothesis");
    text_finish(&words);
    return RF_NUMERICAL;
}

static enum rf_status analyse(struct ranking *r, const struct candidate *candidate)
{
    wiring_copy(&r->wiring, r->ring);
    hypothesis_apply(&candidate->hypothesis, &r->wiring, NULL);
    return fitter_analyse(r->fitter, &r->wiring);
}

static double hopeless_below(const struct ranking *r, const struct candidate *candidate)
{
    if (!r->screen)
        return -INFINITY;
    return r->best - out_of_reach(r->candidates->n) - log_share(candidate);
}

/* Whether the readings are as likely as with normal noise of the size assumed: ½ of log-likelihood each
 * below the most, and some to spare. Hardly anything is much better then. */
static bool explains(const struct fitter *fitter, const struct fit *fit)
{
    const struct observation *observations = NULL;
    double n = (double)fitter_observations(fitter, &observations);
    return fitter_ceiling(fitter) - fit->log_likelihood < 0.5 * n + 3.0;
}

/* The second stage, from where the fitter is. */
static enum rf_status fit_mixture(struct ranking *r, struct candidate *candidate, struct fit *fit)
{
    enum rf_status status = fitter_fit_mixture(r->fitter, hopeless_below(r, candidate), fit);
    if (status != RF_OK || fit->abandoned)
        return status;
    candidate->fitted = true;
    candidate->log_evidence = fit->log_evidence;
    if (log_weight(candidate) > r->best) {
        r->best = log_weight(candidate);
        r->explained = explains(r->fitter, fit);
    }
    return RF_OK;
}

static void put_off(struct ranking *r, const struct fit *fit, size_t index,
                    const struct prospect *prospect)
{
    size_t k = r->n_put_off++;
    memcpy(r->theta + k * r->stride, fit->theta, fit->n_parameters * sizeof *fit->theta);
    r->most[k] = prospect->most;
    r->order[k] = (struct ordered){log_share(&r->candidates->list[index]) + prospect->likely, k};
    r->put_off[k] = index;
}

static enum rf_status fit_or_put_off(struct ranking *r, size_t index)
{
    struct candidate *candidate = &r->candidates->list[index];
    double hopeless = hopeless_below(r, candidate);
    struct fit fit = {0};
    struct prospect prospect;
    if (analyse(r, candidate) != RF_OK)
        return RF_NUMERICAL;
    if (fitter_ceiling(r->fitter) < hopeless)
        return RF_OK;
    if (fitter_fit_normal(r->fitter, r->common, &fit) != RF_OK)
        return RF_NUMERICAL;
    if (hopeless > -INFINITY) {
        if (fitter_prospect(r->fitter, &prospect) != RF_OK)
            return RF_NUMERICAL;
        candidate->log_likely = prospect.likely;
        if (prospect.most < hopeless)
            return RF_OK;
        if (!r->explained && prospect.likely + log_share(candidate) < r->best) {
            put_off(r, &fit, index, &prospect);
            return RF_OK;
        }
    }
    return fit_mixture(r, candidate, &fit);
}

static enum rf_status fit_put_off(struct ranking *r, size_t k)
{
    struct candidate *candidate = &r->candidates->list[r->put_off[k]];
    struct fit fit = {0};
    if (r->most[k] < hopeless_below(r, candidate))
        return RF_OK;
    if (analyse(r, candidate) != RF_OK ||
        fitter_resume(r->fitter, r->theta + k * r->stride, &fit) != RF_OK)
        return RF_NUMERICAL;
    return fit_mixture(r, candidate, &fit);
}

static enum rf_status fit_batch(struct ranking *r, const size_t indices[], size_t n,
                                struct rf_error *error)
{
    r->n_put_off = 0;
    for (size_t i = 0; i < n; i++) {
        struct candidate *candidate = &r->candidates->list[indices[i]];
        if (candidate->fitted || (r->screen && log_share(candidate) == -INFINITY))
            continue;
        if (fit_or_put_off(r, indices[i]) != RF_OK)
            return report_failure(r, candidate, error);
    }
    qsort(r->order, r->n_put_off, sizeof *r->order, by_weight);
    for (size_t i = 0; i < r->n_put_off; i++)
        if (fit_put_off(r, r->order[i].index) != RF_OK)
            return report_failure(r, &r->candidates->list[r->put_off[r->order[i].index]], error);
    return RF_OK;
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
        for (size_t i = 0; i < candidates->n; i++) {
            const struct candidate *candidate = &candidates->list[i];
            order[i] = (struct ordered){log_weight(candidate), candidate->index};
            sorted[candidate->index] = *candidate;
        }
        sort_order(order, candidates->n);
        for (size_t i = 0; i < candidates->n; i++)
            candidates->list[i] = sorted[order[i].index];
    }
    free(order);
    free(sorted);
    return ok;
}

enum rf_status candidates_sort(struct candidates *candidates, struct rf_error *error)
{
    if (!sort_candidates(candidates))
        return fail_memory(error);
    /* In the order of weight, so that the sum does not depend on any other. */
    normalise(candidates);
    return RF_OK;
}

/* Where the first stage ends without a fault: most faults hardly move the other parameters, so that is
 * where their fits start. */
static enum rf_status fit_common(struct ranking *r, struct rf_error *error)
{
    struct fit fit = {0};
    wiring_copy(&r->wiring, r->ring);
    if (fitter_analyse(r->fitter, &r->wiring) != RF_OK ||
        fitter_fit_normal(r->fitter, NULL, &fit) != RF_OK)
        return fail(error, RF_NUMERICAL, "%s: the fit failed for the ring as recorded",
                    r->ring->job->source);
    memcpy(r->common, fit.theta, fit.n_parameters * sizeof *fit.theta);
    return RF_OK;
}

static enum rf_status fit_all(struct ranking *r, struct rf_error *error)
{
    const size_t *indices = NULL;
    struct search *search = search_create(r->candidates, r->ring->job->n_places);
    enum rf_status status = search != NULL ? fit_common(r, error) : fail_memory(error);
    while (status == RF_OK) {
        size_t n = search_next(search, r->best - out_of_reach(r->candidates->n), &indices);
        if (n == 0)
            break;
        for (size_t first = 0; first < n && status == RF_OK; first += BATCH)
            status = fit_batch(r, indices + first, n - first < BATCH ? n - first : BATCH, error);
    }
    search_destroy(search);
    return status;
}

enum rf_status candidates_rank(struct candidates *candidates, struct fitter *fitter,
                               const struct wiring *ring, bool screen, struct rf_error *error)
{
    size_t batch = candidates->n < BATCH ? candidates->n : BATCH;
    struct ranking ranking = {
        .candidates = candidates,
        .fitter = fitter,
        .ring = ring,
        .screen = screen || search_is_coarse(candidates),
        .best = -INFINITY,
        .stride = (size_t)ring->map.n_common + FAULTS_AT_ONCE,
    };
    ranking.theta = NEW_ARRAY(double, batch * ranking.stride);
    ranking.common = NEW_ARRAY(double, ranking.stride);
    ranking.order = NEW_ARRAY(struct ordered, batch);
    ranking.most = NEW_ARRAY(double, batch);
    ranking.put_off = NEW_ARRAY(size_t, batch);
    enum rf_status status = ranking.theta == NULL || ranking.common == NULL ||
                                    ranking.order == NULL || ranking.most == NULL ||
                                    ranking.put_off == NULL
                                ? fail_memory(error)
                                : wiring_init(&ranking.wiring, ring->job, ring->models, error);
    if (status == RF_OK)
        status = fit_all(&ranking, error);
    wiring_finish(&ranking.wiring);
    free(ranking.theta);
    free(ranking.common);
    free(ranking.order);
    free(ranking.most);
    free(ranking.put_off);
    if (status != RF_OK)
        return status;
    return candidates_sort(candidates, error);
}
