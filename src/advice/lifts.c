/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "advice/steps.h"
#include "advice/words.h"

#include "base/cholesky.h"
#include "base/error.h"
#include "base/memory.h"
#include "fit/equations.h"

#include <math.h>
#include <string.h>

/*
 * Which reading would lift a blind spot: put some members of the kind, at their median, into the
 * ring without other fault, and see at which readings not yet taken they would show. What the ring
 * would be taken for meanwhile counts: readings taken move by δ, so its parameters would be fitted
 * Δθ = (I + JᵀJ)⁻¹ Jᵀδ away, and only what a new reading moves beyond that tells. The reading that
 * shows most members a minute is it.
 */

enum { MEMBERS_TRIED = 4 };

/* A member shows where the reading moves by this many of its σ, or a path is lost or made. */
static const double shows = 3.0;

struct seeker {
    const struct rf_diagnosis *diagnosis;
    const struct predictive *predictive;
    struct forward *forward; /* measures what has been read, then the candidates */
    size_t n_read, n, d;     /* what has been read, each once; candidates; parameters of the ring */
    double *times;           /* [read] how often */
    struct wiring wiring;
    double *theta;    /* the ring's, of the best fit; faults at their median */
    double *sound;    /* [measurement] Ω without fault; NAN: over range */
    double *jacobian; /* (n_read + n) × d, Ω per whitened unit, without fault */
    struct equations equations; /* H = I + JᵀJ over the readings, factored */
    double *shift;    /* [parameter] Δθ */
    double *shown;    /* [candidate] members that would show there */
};

static void finish_seeker(struct seeker *s)
{
    forward_destroy(s->forward);
    wiring_finish(&s->wiring);
    free(s->times);
    free(s->theta);
    free(s->sound);
    free(s->jacobian);
    equations_free(&s->equations);
    free(s->shift);
    free(s->shown);
}

static double mean_or_nan(const struct seeker *s, size_t measurement)
{
    return forward_reachable(s->forward, measurement) ? forward_mean(s->forward, measurement) : NAN;
}

/* Of the ring without fault. */
static double noise_at(const struct seeker *s, size_t measurement)
{
    const struct measurement *m = forward_measurement(s->forward, measurement);
    double ohms = s->sound[measurement], repeats = 1.0;
    if (measurement < s->n_read)
        repeats = s->times[measurement];
    return reading_sigma(s->diagnosis->models, m->setup, m->spot, repeats, ohms > 0.0 ? ohms : 0.0);
}

/* Means and gradients without fault, and the factor of what the readings say of the ring. */
static bool look_at_ring(struct seeker *s)
{
    if (forward_analyse(s->forward, &s->wiring) != RF_OK ||
        forward_evaluate(s->forward, s->theta) != RF_OK)
        return false;
    equations_begin(&s->equations, s->d);
    for (size_t i = 0; i < s->n_read + s->n; i++) {
        s->sound[i] = mean_or_nan(s, i);
        memcpy(s->jacobian + i * s->d, forward_gradient(s->forward, i), s->d * sizeof(double));
        if (i >= s->n_read || isnan(s->sound[i]))
            continue;
        double sigma = noise_at(s, i), weight = s->times[i] / (sigma * sigma);
        equations_add(&s->equations, forward_slopes(s->forward, i), weight, 0.0);
    }
    equations_finish(&s->equations, s->forward, s->theta);
    return cholesky_factor(s->equations.hessian, s->d, s->equations.stride);
}

/* Lists what has been read, each once: repeats stand behind the reading they repeat. */
static void list_read(struct seeker *s, struct measurement list[])
{
    const struct rf_job *job = s->diagnosis->job;
    for (size_t i = 0; i < job->n_readings; i++) {
        const struct reading *r = &job->readings[i];
        struct measurement m = {r->setup, r->spot, r->place};
        if (s->n_read == 0 || !measurement_equal(&list[s->n_read - 1], &m))
            list[s->n_read++] = m;
        s->times[s->n_read - 1] += 1.0;
    }
}

static struct forward *measure_all(struct seeker *s)
{
    struct measurement *all = NEW_ARRAY(struct measurement, s->diagnosis->job->n_readings + s->n);
    if (all == NULL)
        return NULL;
    list_read(s, all);
    memcpy(all + s->n_read, s->predictive->candidates, s->n * sizeof *all);
    struct forward *forward = forward_create(&s->diagnosis->ring, all, s->n_read + s->n);
    free(all);
    return forward;
}

static enum rf_status init_seeker(struct seeker *s, struct rf_error *error)
{
    const struct rf_diagnosis *d = s->diagnosis;
    s->n = s->predictive->n;
    s->d = (size_t)d->ring.map.n_common;
    s->times = NEW_ARRAY(double, d->job->n_readings);
    s->forward = s->times != NULL ? measure_all(s) : NULL;
    s->theta = NEW_ARRAY(double, s->d + FAULTS_AT_ONCE);
    s->sound = NEW_ARRAY(double, s->n_read + s->n);
    s->jacobian = NEW_ARRAY(double, (s->n_read + s->n) * s->d);
    s->shift = NEW_ARRAY(double, s->d);
    s->shown = NEW_ARRAY(double, s->n);
    if (s->theta == NULL || s->sound == NULL || s->jacobian == NULL || s->shift == NULL ||
        s->shown == NULL || s->forward == NULL ||
        !equations_create(&s->equations, s->forward, &d->ring))
        return fail_memory(error);
    memcpy(s->theta, d->ranked[0].theta, s->d * sizeof *s->theta);
    enum rf_status status = wiring_init(&s->wiring, d->job, d->models, error);
    if (status == RF_OK && !look_at_ring(s))
        status = fail(error, RF_NUMERICAL, "%s: the recorded ring's readings cannot be computed",
                      d->job->source);
    return status;
}

/* Δθ: what the ring would be taken for, with the fault in and not thought of. */
static void shift_ring(struct seeker *s)
{
    memset(s->shift, 0, s->d * sizeof *s->shift);
    for (size_t i = 0; i < s->n_read; i++) {
        double mean = mean_or_nan(s, i), sigma = noise_at(s, i);
        if (isnan(mean) || isnan(s->sound[i]))
            continue;
        double pull = s->times[i] * (mean - s->sound[i]) / (sigma * sigma);
        for (size_t j = 0; j < s->d && pull != 0.0; j++)
            s->shift[j] += pull * s->jacobian[i * s->d + j];
    }
    cholesky_solve(s->equations.hessian, s->d, s->equations.stride, s->shift);
}

/* Whether the member would show at a candidate. */
static bool shows_at(const struct seeker *s, size_t candidate)
{
    size_t i = s->n_read + candidate;
    double mean = mean_or_nan(s, i), expected = s->sound[i];
    if (isnan(mean) || isnan(expected))
        return isnan(mean) != isnan(expected);
    for (size_t j = 0; j < s->d; j++)
        expected += s->jacobian[i * s->d + j] * s->shift[j];
    /* The likeliest hypothesis' uncertainty stands for the ring's. */
    double sigma = fmax(s->predictive->sigma[candidate], noise_at(s, i));
    return fabs(mean - expected) > shows * sigma;
}

static enum rf_status try_member(struct seeker *s, const struct fault *fault,
                                 struct rf_error *error)
{
    struct hypothesis hypothesis = {.faults = {*fault}, .n_faults = 1};
    wiring_copy(&s->wiring, &s->diagnosis->ring);
    hypothesis_apply(&hypothesis, &s->wiring, NULL);
    enum rf_status status = forward_analyse(s->forward, &s->wiring);
    if (status == RF_OK)
        status = forward_evaluate_means(s->forward, s->theta);
    if (status != RF_OK)
        return fail(error, status, "%s: readings to come cannot be computed",
                    s->diagnosis->job->source);
    shift_ring(s);
    for (size_t c = 0; c < s->n; c++)
        s->shown[c] += shows_at(s, c);
    return RF_OK;
}

struct members {
    const struct fault *example;
    size_t n, wanted, step;
    struct fault tried[MEMBERS_TRIED];
    size_t n_tried;
};

static bool count_member(void *context, const struct fault *fault)
{
    struct members *members = context;
    members->n += fault_same_kind(members->example, fault);
    return true;
}

static bool take_member(void *context, const struct fault *fault)
{
    struct members *members = context;
    if (!fault_same_kind(members->example, fault))
        return true;
    if (members->n++ == members->wanted && members->n_tried < MEMBERS_TRIED) {
        members->tried[members->n_tried++] = *fault;
        members->wanted += members->step;
    }
    return true;
}

/* Members of the kind, spread evenly over their order. */
static void sample_members(const struct rf_diagnosis *d, struct members *members)
{
    const struct fault_family *family = members->example->family;
    family->enumerate(d->job, d->models, count_member, members);
    members->step = (members->n + MEMBERS_TRIED - 1) / MEMBERS_TRIED;
    members->n = 0;
    family->enumerate(d->job, d->models, take_member, members);
}

static double minutes_of(const struct seeker *s, size_t candidate)
{
    const struct measurement *read = &s->predictive->candidates[candidate];
    const struct rf_job *job = s->diagnosis->job;
    double minutes = s->predictive->minutes[candidate];
    if (read->setup != job->setup_in_place)
        minutes += s->diagnosis->models->effort.change_of_setup;
    if (read->spot == SPOT_POINT)
        minutes += minutes_to_reach(job, read->place);
    return minutes;
}

static bool write_lift(const struct seeker *s, struct lift *lift)
{
    struct text words = {0};
    const struct rf_job *job = s->diagnosis->job;
    if (lift->read.setup == job->setup_in_place)
        text_add(&words, "with the links as they are, ");
    else {
        text_add(&words, "at the board ");
        say_connection(lift->read.setup, &words);
        text_add(&words, "; ");
    }
    say_meter(lift->read.setup, &words);
    text_add(&words, " ");
    say_where(job, &lift->read, &words);
    lift->words = words.bytes;
    return !words.failed && words.bytes != NULL;
}

static enum rf_status seek_one(struct rf_advice *advice, struct seeker *s, size_t blind,
                               struct rf_error *error)
{
    struct members members = {.example = &s->diagnosis->blind[blind].example};
    enum rf_status status = RF_OK;
    sample_members(s->diagnosis, &members);
    memset(s->shown, 0, s->n * sizeof *s->shown);
    for (size_t i = 0; i < members.n_tried && status == RF_OK; i++)
        status = try_member(s, &members.tried[i], error);
    size_t best = s->n;
    double most = 0.0;
    for (size_t c = 0; c < s->n && status == RF_OK; c++)
        if (s->shown[c] / minutes_of(s, c) > most) {
            most = s->shown[c] / minutes_of(s, c);
            best = c;
        }
    if (status != RF_OK || best == s->n)
        return status;
    struct lift *lift = &advice->lifts[advice->n_lifts++];
    lift->blind = blind;
    lift->read = s->predictive->candidates[best];
    lift->minutes = minutes_of(s, best);
    return write_lift(s, lift) ? RF_OK : fail_memory(error);
}

enum rf_status seek_lifts(struct rf_advice *advice, const struct predictive *predictive,
                          struct rf_error *error)
{
    const struct rf_diagnosis *diagnosis = advice->diagnosis;
    struct seeker seeker = {.diagnosis = diagnosis, .predictive = predictive};
    if (diagnosis->n_blind == 0)
        return RF_OK;
    advice->lifts = NEW_ARRAY(struct lift, diagnosis->n_blind);
    enum rf_status status =
        advice->lifts == NULL ? fail_memory(error) : init_seeker(&seeker, error);
    for (size_t i = 0; i < diagnosis->n_blind && status == RF_OK; i++)
        status = seek_one(advice, &seeker, i, error);
    finish_seeker(&seeker);
    return status;
}
