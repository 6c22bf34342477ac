/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/cholesky.h"
#include "base/error.h"
#include "base/memory.h"
#include "diagnosis/steps.h"
#include "fit/equations.h"

#include <math.h>
#include <string.h>

/*
 * Which kinds of fault could these readings not have shown? Take the ring without a fault, as the
 * best fit has it, and put each fault in at its median: the readings move by δ (in σ of their
 * noise). What lengths, cable and instrument could explain as well does not count, so what is left
 * is δᵀ(I + JJᵀ)⁻¹δ = |δ|² − uᵀ(I + JᵀJ)⁻¹u with u = Jᵀδ (Woodbury): twice the log of the odds the
 * readings would give against "no fault". A kind is listed when the better part of its members
 * stays below `shows`.
 */
static const double shows = 9.0;
static const double better_part = 0.5;

struct sight {
    const struct rf_diagnosis *diagnosis;
    const struct observation *observations;
    size_t n, d;       /* what was measured, each once; parameters of the recorded ring */
    double *times;     /* [measured] how many readings of it there are */
    double *mean;      /* [measured] Ω, of the ring without fault; NAN: over range */
    double *sigma;     /* [measured] Ω, of its readings together */
    double *jacobian;  /* n × d, in σ */
    struct equations equations; /* H = I + JᵀJ, factored */
    double *delta, *u; /* [measured], [parameter] */
    double *theta;     /* [parameter, with faults'] */
    struct wiring wiring;
};

static void finish_sight(struct sight *s)
{
    free(s->times);
    free(s->mean);
    free(s->sigma);
    free(s->jacobian);
    equations_free(&s->equations);
    free(s->delta);
    free(s->u);
    free(s->theta);
    wiring_finish(&s->wiring);
}

static enum rf_status init_sight(struct sight *s, const struct rf_diagnosis *diagnosis,
                                 const struct fitter *fitter, struct rf_error *error)
{
    s->diagnosis = diagnosis;
    size_t n_readings = fitter_observations(fitter, &s->observations);
    s->n = forward_measurements(fitter_forward(fitter));
    s->d = (size_t)diagnosis->ring.map.n_common;
    s->times = NEW_ARRAY(double, s->n);
    s->mean = NEW_ARRAY(double, s->n);
    s->sigma = NEW_ARRAY(double, s->n);
    s->jacobian = NEW_ARRAY(double, s->n * s->d);
    s->delta = NEW_ARRAY(double, s->n);
    s->u = NEW_ARRAY(double, s->d);
    s->theta = NEW_ARRAY(double, s->d + FAULTS_AT_ONCE);
    if (s->times == NULL || s->mean == NULL || s->sigma == NULL || s->jacobian == NULL ||
        s->delta == NULL || s->u == NULL || s->theta == NULL)
        return fail_memory(error);
    if (!equations_create(&s->equations, fitter_forward(fitter), &diagnosis->ring))
        return fail_memory(error);
    for (size_t i = 0; i < n_readings; i++)
        s->times[s->observations[i].measurement] += 1.0;
    memcpy(s->theta, diagnosis->ranked[0].theta, s->d * sizeof *s->theta);
    return wiring_init(&s->wiring, diagnosis->job, diagnosis->models, error);
}

/* Means, noise and whitened Jacobian of the ring without a fault; factors I + JᵀJ. */
static bool look_at_ring(struct sight *s, struct forward *forward)
{
    if (forward_analyse(forward, &s->wiring) != RF_OK ||
        forward_evaluate(forward, s->theta) != RF_OK)
        return false;
    equations_begin(&s->equations, s->d);
    for (size_t m = 0; m < s->n; m++) {
        double *row = s->jacobian + m * s->d;
        s->mean[m] = forward_reachable(forward, m) ? forward_mean(forward, m) : NAN;
        if (isnan(s->mean[m]))
            continue;
        const struct measurement *read = forward_measurement(forward, m);
        s->sigma[m] = reading_sigma(s->diagnosis->models, read->setup, read->spot, s->times[m],
                                    s->mean[m]) /
                      sqrt(s->times[m]);
        const double *gradient = forward_gradient(forward, m);
        for (size_t j = 0; j < s->d; j++)
            row[j] = gradient[j] / s->sigma[m];
        equations_add(&s->equations, forward_slopes(forward, m), 1.0 / (s->sigma[m] * s->sigma[m]),
                      0.0);
    }
    equations_finish(&s->equations, forward, s->theta);
    return cholesky_factor(s->equations.hessian, s->d, s->equations.stride);
}

/* What is left of δ when the ring's own parameters have explained what they can. */
static double unexplained(struct sight *s)
{
    double square = 0.0, explained = 0.0;
    memset(s->u, 0, s->d * sizeof *s->u);
    for (size_t i = 0; i < s->n; i++) {
        square += s->delta[i] * s->delta[i];
        for (size_t j = 0; j < s->d && s->delta[i] != 0.0; j++)
            s->u[j] += s->jacobian[i * s->d + j] * s->delta[i];
    }
    cholesky_half_solve(s->equations.hessian, s->d, s->equations.stride, s->u);
    for (size_t j = 0; j < s->d; j++)
        explained += s->u[j] * s->u[j];
    return square - explained;
}

/* Whether the fault, at its median, would have shown. RF_NUMERICAL. */
static enum rf_status would_show(struct sight *s, struct forward *forward,
                                 const struct hypothesis *hypothesis, bool *seen)
{
    wiring_copy(&s->wiring, &s->diagnosis->ring);
    hypothesis_apply(hypothesis, &s->wiring, NULL);
    if (forward_analyse(forward, &s->wiring) != RF_OK ||
        forward_evaluate_means(forward, s->theta) != RF_OK)
        return RF_NUMERICAL;
    *seen = false;
    for (size_t m = 0; m < s->n; m++) {
        bool path = forward_reachable(forward, m);
        if (path == isnan(s->mean[m])) { /* a path lost or made */
            *seen = true;
            return RF_OK;
        }
        s->delta[m] = path ? (forward_mean(forward, m) - s->mean[m]) / s->sigma[m] : 0.0;
    }
    *seen = unexplained(s) > shows;
    return RF_OK;
}

struct kind_count {
    const struct fault *example; /* an unseen member if there is one */
    size_t members, unseen;
};

static struct kind_count *count_kind(struct kind_count *kinds, size_t *n, const struct fault *fault)
{
    for (size_t k = 0; k < *n; k++)
        if (fault_same_kind(kinds[k].example, fault))
            return &kinds[k];
    kinds[*n] = (struct kind_count){.example = fault};
    return &kinds[(*n)++];
}

static bool tell_kind(struct rf_diagnosis *diagnosis, const struct kind_count *kind)
{
    struct blind_spot *spot = &diagnosis->blind[diagnosis->n_blind++];
    struct text words = {0};
    spot->example = *kind->example;
    spot->share = (double)kind->unseen / (double)kind->members;
    kind->example->family->describe_kind(kind->example, &words);
    if (kind->unseen < kind->members)
        text_addf(&words, ", at %zu of %zu places", kind->unseen, kind->members);
    spot->words = words.bytes;
    return !words.failed && words.bytes != NULL;
}

static enum rf_status tell_blind_kinds(struct rf_diagnosis *diagnosis,
                                       const struct kind_count *kinds, size_t n,
                                       struct rf_error *error)
{
    diagnosis->blind = NEW_ARRAY(struct blind_spot, n);
    bool ok = diagnosis->blind != NULL;
    for (size_t k = 0; ok && k < n; k++)
        if ((double)kinds[k].unseen >= better_part * (double)kinds[k].members)
            ok = tell_kind(diagnosis, &kinds[k]);
    return ok ? RF_OK : fail_memory(error);
}

enum rf_status seek_blind_spots(struct rf_diagnosis *diagnosis, const struct candidates *candidates,
                                struct fitter *fitter, struct rf_error *error)
{
    struct sight sight = {0};
    struct forward *forward = fitter_forward_to_use(fitter);
    struct kind_count *kinds = NEW_ARRAY(struct kind_count, candidates->n);
    size_t n_kinds = 0;
    enum rf_status status =
        kinds == NULL ? fail_memory(error) : init_sight(&sight, diagnosis, fitter, error);
    if (status == RF_OK && !look_at_ring(&sight, forward))
        status = fail(error, RF_NUMERICAL, "%s: the recorded ring's readings cannot be computed",
                      diagnosis->job->source);
    for (size_t i = 0; i < candidates->n && status == RF_OK; i++) {
        const struct hypothesis *hypothesis = &candidates->list[i].hypothesis;
        bool seen = false;
        if (hypothesis->n_faults != 1)
            continue;
        status = would_show(&sight, forward, hypothesis, &seen);
        struct kind_count *kind = count_kind(kinds, &n_kinds, &hypothesis->faults[0]);
        kind->members++;
        if (!seen && kind->unseen++ == 0)
            kind->example = &hypothesis->faults[0];
    }
    for (size_t i = 0; i < diagnosis->job->n_readings && status == RF_OK; i++)
        diagnosis->sound[i] = sight.mean[sight.observations[i].measurement];
    if (status == RF_OK)
        status = tell_blind_kinds(diagnosis, kinds, n_kinds, error);
    finish_sight(&sight);
    free(kinds);
    return status;
}
