/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/error.h"
#include "base/memory.h"
#include "diagnosis/steps.h"

#include <math.h>

/*
 * What would explain readings that no one defect explains? A wider model, in which the faces have
 * resistances of their own, or the recorded lengths are worse than the job says. Which one, and how
 * much of it, is decided by the evidence of the likeliest hypotheses,
 *
 *     Z(w) = Σ_h prior(h) · Z(h | w)   over the leaders h,
 *
 * how much being the mean over a grid whose steps are equally likely beforehand: the largest alone
 * would too often be too small, and confidences under it too sharp.
 */

enum { LEADERS = 8, FACE_STEPS = 3, LENGTH_STEPS = 2 };

/* Ω, on average in each conductor's way to a face; times as wrong as recorded, and once more. */
static const double face_steps[FACE_STEPS] = {0.01, 0.02, 0.04};
static const double length_steps[LENGTH_STEPS] = {1.0, 2.0};

/*
 * Readings of two pairs at a point go through one face of theirs in common, which a noise of their
 * own for each reading does not know: their sum has a variance of 6 faces' instead of 4. So the
 * faces are given √(6/4) of what they seem to have.
 */
static const double in_common = 1.22;

static double log_add(double one, double other)
{
    double larger = fmax(one, other);
    return larger == -INFINITY ? larger : larger + log1p(exp(fmin(one, other) - larger));
}

double log_evidence_of_all(const struct candidates *candidates)
{
    const struct candidate *first = &candidates->list[0];
    return log_weight(first) - log(first->confidence);
}

static enum rf_status fit_leaders(const struct candidates *candidates, struct fitter *fitter,
                                  const struct wiring *ring, struct wiring *wiring,
                                  double *log_evidence)
{
    *log_evidence = -INFINITY;
    for (size_t i = 0; i < candidates->n && i < LEADERS; i++) {
        const struct candidate *candidate = &candidates->list[i];
        struct fit fit;
        if (log_share(candidate) == -INFINITY)
            continue;
        wiring_copy(wiring, ring);
        hypothesis_apply(&candidate->hypothesis, wiring, NULL);
        if (fitter_fit(fitter, wiring, NULL, &fit) != RF_OK)
            return RF_NUMERICAL;
        *log_evidence = log_add(*log_evidence, log_share(candidate) + fit.log_evidence);
    }
    return RF_OK;
}

/* Log of Z(w) over the leaders. A hypothesis that cannot be fitted says nothing for w. */
static enum rf_status evidence_of(const struct rf_diagnosis *diagnosis,
                                  const struct candidates *candidates, struct widening wider,
                                  double *log_evidence, struct rf_error *error)
{
    struct rf_models models = *diagnosis->models;
    struct wiring ring = {0}, wiring = {0};
    struct fitter *fitter = NULL;
    models.wider = wider;
    enum rf_status status = wiring_init(&ring, diagnosis->job, &models, error);
    if (status == RF_OK)
        status = wiring_init(&wiring, diagnosis->job, &models, error);
    if (status == RF_OK && (fitter = fitter_create(&ring)) == NULL)
        status = fail_memory(error);
    if (status == RF_OK && fit_leaders(candidates, fitter, &ring, &wiring, log_evidence) != RF_OK)
        *log_evidence = -INFINITY;
    fitter_destroy(fitter);
    wiring_finish(&wiring);
    wiring_finish(&ring);
    return status;
}

/* Σ steps · evidence ÷ Σ evidence; *log_mean: the evidence's mean. */
static double weighed_mean(const double steps[], const double log_evidence[], size_t n,
                           double *log_mean)
{
    double sum = 0.0, log_sum = -INFINITY;
    for (size_t i = 0; i < n; i++)
        log_sum = log_add(log_sum, log_evidence[i]);
    for (size_t i = 0; i < n && log_sum > -INFINITY; i++)
        sum += steps[i] * exp(log_evidence[i] - log_sum);
    *log_mean = log_sum - log((double)n);
    return sum;
}

enum rf_status choose_widening(const struct rf_diagnosis *diagnosis,
                               const struct candidates *candidates, struct widening *wider,
                               double *log_evidence, struct rf_error *error)
{
    double faces[FACE_STEPS], lengths[LENGTH_STEPS], of_faces, of_lengths;
    enum rf_status status = RF_OK;
    for (size_t i = 0; i < FACE_STEPS && status == RF_OK; i++)
        status = evidence_of(diagnosis, candidates, (struct widening){.face_ohms = face_steps[i]},
                             &faces[i], error);
    for (size_t i = 0; i < LENGTH_STEPS && status == RF_OK; i++)
        status =
            evidence_of(diagnosis, candidates, (struct widening){.length_excess = length_steps[i]},
                        &lengths[i], error);
    if (status != RF_OK)
        return status;
    double face_ohms = in_common * weighed_mean(face_steps, faces, FACE_STEPS, &of_faces);
    double length_excess = weighed_mean(length_steps, lengths, LENGTH_STEPS, &of_lengths);
    *log_evidence = fmax(of_faces, of_lengths);
    *wider = of_faces >= of_lengths ? (struct widening){.face_ohms = face_ohms}
                                    : (struct widening){.length_excess = length_excess};
    return RF_OK;
}

void note_widening(const struct rf_diagnosis *diagnosis, struct rf_diagnosis *wider,
                   double log_odds)
{
    const struct widening *assumed = &wider->models->wider;
    wider->wider.assumed = true;
    wider->wider.face_ohms = assumed->face_ohms / in_common;
    if (assumed->length_excess > 0.0)
        wider->wider.length_factor = 1.0 + assumed->length_excess;
    wider->wider.two_defects = !(assumed->face_ohms > 0.0 || assumed->length_excess > 0.0);
    wider->wider.p = wider->misfit.p;
    wider->wider.log_odds = log_odds;
    wider->wider.otherwise_first = diagnosis->ranked[0].hypothesis;
    wider->wider.otherwise_confidence = diagnosis->ranked[0].confidence;
    wider->misfit.p = fmin(diagnosis->misfit.p, exp(-log_odds));
    wider->misfit.flag = true;
}
