/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "fit/fit.h"

#include "base/cholesky.h"
#include "base/memory.h"
#include "fit/equations.h"

#include <math.h>
#include <string.h>

struct fitter {
    const struct wiring *ring;
    const struct wiring *wiring; /* of the hypothesis at hand */
    struct forward *forward;
    size_t n_observations;
    struct observation *observations;
    double log_open_with_path;
    struct equations equations; /* at theta; H becomes its factor */

    double *theta, *trial, *step;
    double step_promise; /* of `step`, if it is one from theta; else negative */
    double *weights, *z; /* [observation] */
    double *pull, *grip; /* [measurement] Σ w z / σ and Σ curvature / σ² over its readings */
};

enum noise { NOISE_NORMAL, NOISE_MIXTURE };

void fitter_destroy(struct fitter *f)
{
    if (f == NULL)
        return;
    forward_destroy(f->forward);
    free(f->observations);
    free(f->theta);
    free(f->trial);
    free(f->step);
    equations_free(&f->equations);
    free(f->weights);
    free(f->z);
    free(f->pull);
    free(f->grip);
    free(f);
}

/* Lists what is measured, each once, and turns the readings into observations of it. */
static bool list_measurements(struct fitter *f, struct measurement *list, size_t *n)
{
    const struct rf_job *job = f->ring->job;
    size_t slots = N_SETUPS * (job->n_places + N_SPOTS);
    size_t *index = NEW_ARRAY(size_t, slots); /* 1 + index of the measurement in that slot */
    size_t *repeats = NEW_ARRAY(size_t, f->n_observations); /* [measurement] */
    bool ok = index != NULL && repeats != NULL;
    *n = 0;
    for (size_t i = 0; ok && i < job->n_readings; i++) {
        const struct reading *r = &job->readings[i];
        size_t slot = r->setup * (job->n_places + N_SPOTS) +
                      (r->spot == SPOT_POINT ? N_SPOTS + r->place : (size_t)r->spot);
        if (index[slot] == 0) {
            list[*n] = (struct measurement){r->setup, r->spot, r->place};
            index[slot] = ++*n;
        }
        f->observations[i].measurement = index[slot] - 1;
        repeats[index[slot] - 1]++;
    }
    for (size_t i = 0; ok && i < job->n_readings; i++) {
        size_t m = f->observations[i].measurement;
        f->observations[i] = observe(&job->readings[i], m, repeats[m], f->ring->models);
    }
    free(index);
    free(repeats);
    return ok;
}

struct fitter *fitter_create(const struct wiring *ring)
{
    struct fitter *f = NEW(struct fitter);
    if (f == NULL)
        return NULL;
    size_t n = 0, d = (size_t)ring->map.n_common + FAULTS_AT_ONCE;
    f->ring = ring;
    f->n_observations = ring->job->n_readings;
    f->log_open_with_path = log_open_with_path(&ring->models->instrument);
    struct measurement *list = NEW_ARRAY(struct measurement, f->n_observations);
    f->observations = NEW_ARRAY(struct observation, f->n_observations);
    f->theta = NEW_ARRAY(double, d);
    f->trial = NEW_ARRAY(double, d);
    f->step = NEW_ARRAY(double, d);
    f->weights = NEW_ARRAY(double, f->n_observations);
    f->z = NEW_ARRAY(double, f->n_observations);
    f->pull = NEW_ARRAY(double, f->n_observations);
    f->grip = NEW_ARRAY(double, f->n_observations);
    bool ok = list != NULL && f->observations != NULL && f->theta != NULL && f->trial != NULL &&
              f->step != NULL && f->weights != NULL && f->z != NULL && f->pull != NULL &&
              f->grip != NULL && list_measurements(f, list, &n);
    if (ok)
        f->forward = forward_create(ring, list, n);
    free(list);
    if (f->forward != NULL && equations_create(&f->equations, f->forward, ring))
        return f;
    fitter_destroy(f);
    return NULL;
}

const struct forward *fitter_forward(const struct fitter *f)
{
    return f->forward;
}

struct forward *fitter_forward_to_use(struct fitter *f)
{
    return f->forward;
}

size_t fitter_observations(const struct fitter *f, const struct observation **observations)
{
    *observations = f->observations;
    return f->n_observations;
}

/* −log-likelihood at the means evaluated last; fills weights and z. With normal noise every
 * finite reading with a path weighs 1, and constants are left out. */
static double misfit_of_readings(struct fitter *f, enum noise noise)
{
    double sum = 0.0, product = 1.0;
    for (size_t i = 0; i < f->n_observations; i++) {
        const struct observation *o = &f->observations[i];
        f->weights[i] = 1.0;
        f->z[i] = 0.0;
        if (!forward_reachable(f->forward, o->measurement)) {
            sum -= o->log_no_path;
        } else if (o->open) {
            sum -= f->log_open_with_path;
        } else if (noise == NOISE_NORMAL) {
            f->z[i] = (o->ohms - forward_mean(f->forward, o->measurement)) / o->sigma;
            sum += 0.5 * f->z[i] * f->z[i];
        } else {
            double mean = forward_mean(f->forward, o->measurement);
            sum -= log_mixture_term(o, mean, &f->weights[i], &f->z[i], &product);
        }
        if (i % MIXTURE_PRODUCTS == MIXTURE_PRODUCTS - 1) {
            sum -= log(product);
            product = 1.0;
        }
    }
    return sum - log(product);
}

static double half_square(const double *theta, size_t d)
{
    double sum = 0.0;
    for (size_t j = 0; j < d; j++)
        sum += theta[j] * theta[j];
    return 0.5 * sum;
}

/* F at θ, with weights, means and gradients there; infinity where the arithmetic fails, so that a
 * step there is never taken. */
static double objective(struct fitter *f, enum noise noise, const double *theta, size_t d)
{
    if (forward_evaluate(f->forward, theta) != RF_OK)
        return INFINITY;
    double value = misfit_of_readings(f, noise) + half_square(theta, d);
    return isnan(value) ? INFINITY : value;
}

static bool observed(const struct fitter *f, const struct observation *o)
{
    return !o->open && forward_reachable(f->forward, o->measurement);
}

enum curvature {
    CURVATURE_INLIERS, /* W, as the evidence has it */
    CURVATURE_OBSERVED /* −∂² log-likelihood/∂mean², where it is positive: steps are longer where a
                        * reading is on its way to being written off, and fewer */
};

/* Repeats of a reading share their row of J, so they are summed before it is used. */
static void gather(struct fitter *f, enum curvature curvature)
{
    size_t n = forward_measurements(f->forward);
    memset(f->pull, 0, n * sizeof *f->pull);
    memset(f->grip, 0, n * sizeof *f->grip);
    for (size_t i = 0; i < f->n_observations; i++) {
        const struct observation *o = &f->observations[i];
        if (!observed(f, o))
            continue;
        double w = f->weights[i], z = f->z[i], grip = w;
        if (curvature == CURVATURE_OBSERVED)
            grip = fmax(0.0, w * (1.0 - (1.0 - w) * z * z));
        f->pull[o->measurement] += w * z / o->sigma;
        f->grip[o->measurement] += grip / (o->sigma * o->sigma);
    }
}

/* H = I + JᵀWJ and the gradient of F at θ, from what was evaluated there. */
static void normal_equations(struct fitter *f, enum curvature curvature, size_t d)
{
    size_t n = forward_measurements(f->forward);
    gather(f, curvature);
    equations_begin(&f->equations, d);
    for (size_t i = 0; i < n; i++)
        if (f->grip[i] != 0.0 || f->pull[i] != 0.0)
            equations_add(&f->equations, forward_slopes(f->forward, i), f->grip[i], f->pull[i]);
    equations_finish(&f->equations, f->forward, f->theta);
}

/*
 * Gauss-Newton leaves the second derivative of the mean out. In a resistance exp(σθ) that is
 * σ ∂mean/∂θ, so its part of the Hessian is −σ_j Σ pull_i J_ij = σ_j (g_j − θ_j), for nothing. It is
 * added where it is positive: a fault that would rather not be there otherwise overshoots.
 */
static void add_second_derivatives(struct fitter *f, size_t d)
{
    for (size_t j = 0; j < d; j++) {
        double second = f->wiring->parameters[j].sigma * (f->equations.gradient[j] - f->theta[j]);
        if (second > 0.0)
            f->equations.hessian[j * f->equations.stride + j] += second;
    }
}

enum { MOST_ITERATIONS = 100, MOST_HALVINGS = 12 };

/* A whitened parameter is hardly ever beyond ±5; a longer step is a sign of a poor linearisation,
 * most of all in the logarithm of a fault's resistance. */
static const double longest_step = 4.0;

static void shorten(double *step, size_t d)
{
    double longest = 0.0;
    for (size_t j = 0; j < d; j++)
        longest = fmax(longest, fabs(step[j]));
    if (longest > longest_step)
        for (size_t j = 0; j < d; j++)
            step[j] *= longest_step / longest;
}

/* Halves the step until F falls; leaves θ and everything evaluated there. Answers the share of the
 * step taken; 0: F never falls. */
static double descend(struct fitter *f, enum noise noise, size_t d, double *value)
{
    double scale = 1.0;
    for (int halving = 0; halving <= MOST_HALVINGS; halving++, scale *= 0.5) {
        for (size_t j = 0; j < d; j++)
            f->trial[j] = f->theta[j] + scale * f->step[j];
        double trial_value = objective(f, noise, f->trial, d);
        if (trial_value < *value) {
            double *swap = f->theta;
            f->theta = f->trial;
            f->trial = swap;
            *value = trial_value;
            return scale;
        }
    }
    return 0.0;
}

/* The step −H⁻¹g, shortened; returns the decrease of F it promises, ½ gᵀH⁻¹g. */
static double solve_step(struct fitter *f, size_t d)
{
    const double *gradient = f->equations.gradient;
    double promise = 0.0;
    for (size_t j = 0; j < d; j++)
        f->step[j] = -gradient[j];
    cholesky_solve(f->equations.hessian, d, f->equations.stride, f->step);
    for (size_t j = 0; j < d; j++)
        promise -= 0.5 * f->step[j] * gradient[j];
    shorten(f->step, d);
    return fmax(promise, 0.0);
}

/* The Newton step at θ, and what it promises. Negative: the arithmetic failed. */
static double newton_step(struct fitter *f, enum curvature curvature, size_t d)
{
    normal_equations(f, curvature, d);
    add_second_derivatives(f, d);
    if (!cholesky_factor(f->equations.hessian, d, f->equations.stride))
        return -1.0;
    return solve_step(f, d);
}

/* The same with H as it was factored last, at an earlier θ (the chord method: Ortega and Rheinboldt,
 * "Iterative Solution of Nonlinear Equations in Several Variables", 1970, 7.1). */
static double chord_step(struct fitter *f, size_t d)
{
    size_t n = forward_measurements(f->forward);
    gather(f, CURVATURE_INLIERS);
    equations_begin_gradient(&f->equations, d);
    for (size_t i = 0; i < n; i++)
        if (f->pull[i] != 0.0)
            equations_add_gradient(&f->equations, forward_slopes(f->forward, i), f->pull[i]);
    equations_finish_gradient(&f->equations, f->forward, f->theta);
    return solve_step(f, d);
}

/* When to stop: at a promise below `promise`, or below `share` of what F is; or, with log Z as good
 * as certain to stay below `hopeless`, at once. */
struct patience {
    double promise, share, hopeless;
};

/* A decrease of F, promised by the step before. */
static const double near_optimum = 0.1;

/* Whether a whole step gave what it promised, but for a share of it: to a tenth, and less than a tenth
 * is left to be had; to a third, and the same H serves for the next step. */
static bool kept_its_promise(double scale, double promise, double decrease, double share)
{
    return scale == 1.0 && fabs(decrease - promise) < share * promise;
}

/* F where the forward model was evaluated last, which must be f->theta. */
static double objective_here(struct fitter *f, enum noise noise, size_t d)
{
    return misfit_of_readings(f, noise) + half_square(f->theta, d);
}

/* A reading between these chances is neither kept nor written off. Once it tips over, others may fall
 * into place, and F falls by more than any step here promises. */
static const double written_off = 0.005, kept = 0.97;

static bool may_tip(const struct fitter *f)
{
    for (size_t i = 0; i < f->n_observations; i++)
        if (f->weights[i] > written_off && f->weights[i] < kept)
            return true;
    return false;
}

/* The most the log-likelihood can be: every reading fitted, but for those written off, if they are. */
static double best_likelihood(const struct fitter *f, bool written_off_stay)
{
    double sum = 0.0;
    for (size_t i = 0; i < f->n_observations; i++) {
        const struct observation *o = &f->observations[i];
        if (!forward_reachable(f->forward, o->measurement))
            sum += o->log_no_path;
        else if (written_off_stay && !o->open && f->weights[i] <= 1e-6)
            sum += o->log_misread;
        else
            sum += o->log_best;
    }
    return sum;
}

/* Whether a reading is beyond the bend of its log-likelihood, where that is no longer concave: it may slide
 * off however small the steps are that it begins with. */
static bool may_slide(const struct fitter *f)
{
    for (size_t i = 0; i < f->n_observations; i++)
        if (f->weights[i] > written_off && (1.0 - f->weights[i]) * f->z[i] * f->z[i] > 1.0)
            return true;
    return false;
}

/* By how much F hardly falls any more, the next step promising `promise`; measured on simulated jobs.
 * With a reading about to tip over there is no telling, until steps have become small. */
static double most_to_come(const struct fitter *f, double promise)
{
    if (promise > 1.0 || may_slide(f))
        return INFINITY;
    if (!may_tip(f))
        return 10.0 * promise + 1.0;
    return 30.0 * promise + (promise < 0.01 ? 5.0 : fmax(50.0, 2.0 * (double)f->n_observations));
}

/* What log Z may come to, F being `value` and the next step promising so much less; the factor is of
 * that step. The determinant changes little from here to the optimum, so most of it counts. */
static struct prospect judge(const struct fitter *f, size_t d, double value, double promise)
{
    double log_det = cholesky_log_det(f->equations.hessian, d, f->equations.stride);
    double most = most_to_come(f, promise) - value;
    return (struct prospect){
        .most =
            fmin(most, best_likelihood(f, promise < 1.0)) - 0.5 * fmax(0.0, 0.8 * log_det - 4.0),
        .likely = promise - value - 0.5 * log_det,
    };
}

/*
 * Minimises F from f->theta, where the forward model has been evaluated. On return means, gradients
 * and weights are those at f->theta. False: the arithmetic failed.
 */
static bool minimise(struct fitter *f, enum noise noise, size_t d, struct patience patience,
                     struct fit *fit)
{
    double value = objective_here(f, noise, d), promise = INFINITY;
    bool chord = false;
    int stalled = 0;
    fit->converged = false;
    for (int iteration = 0; isfinite(value); iteration++) {
        /* Longer steps only once near an optimum: further off they can jump past it, into one that
         * writes the tell-tale readings off. */
        bool near = noise == NOISE_MIXTURE && promise < near_optimum;
        promise = f->step_promise;
        if (promise < 0.0)
            promise = chord ? chord_step(f, d)
                            : newton_step(f, near ? CURVATURE_OBSERVED : CURVATURE_INLIERS, d);
        f->step_promise = -1.0;
        if (promise < 0.0)
            return false;
        fit->objective = value;
        fit->abandoned =
            patience.hopeless > -INFINITY && judge(f, d, value, promise).most < patience.hopeless;
        double enough = fmax(patience.promise, patience.share * value), before = value;
        fit->converged = promise < enough;
        if (fit->abandoned || fit->converged || iteration == MOST_ITERATIONS)
            return true;
        fit->iterations++;
        double scale = descend(f, noise, d, &value);
        if (scale == 0.0) {
            /* At the floor of the arithmetic, if H is of here: put back what belongs to θ. */
            if (!isfinite(objective(f, noise, f->theta, d)))
                return false;
            fit->converged = !chord;
            if (fit->converged)
                return true;
        }
        double decrease = before - value;
        /* Where another point becomes the highest, F has a kink, and steps along it lead nowhere. */
        bool stalls = !chord && scale < 1.0 && decrease < 10.0 * enough;
        stalled = stalls ? stalled + 1 : 0;
        if ((promise < 10.0 * enough && kept_its_promise(scale, promise, decrease, 0.1)) ||
            stalled == 2) {
            fit->objective = value;
            fit->converged = true;
            return true;
        }
        chord = noise == NOISE_NORMAL && kept_its_promise(scale, promise, decrease, 0.3);
    }
    return false;
}

double fitter_ceiling(const struct fitter *f)
{
    return best_likelihood(f, false);
}

enum rf_status fitter_analyse(struct fitter *f, const struct wiring *wiring)
{
    f->wiring = wiring;
    return forward_analyse(f->forward, wiring);
}

enum rf_status fitter_fit_normal(struct fitter *f, const double start[], struct fit *fit)
{
    size_t d = (size_t)f->wiring->n_parameters;
    *fit = (struct fit){.n_parameters = d, .stride = f->equations.stride, .theta = f->theta};
    if (start != NULL)
        memcpy(f->theta, start, d * sizeof *start);
    else
        memset(f->theta, 0, d * sizeof *f->theta);
    struct patience patience = {.promise = 1e-3, .share = 0.001, .hopeless = -INFINITY};
    f->step_promise = -1.0;
    bool ok = forward_evaluate(f->forward, f->theta) == RF_OK &&
              minimise(f, NOISE_NORMAL, d, patience, fit);
    fit->theta = f->theta;
    return ok ? RF_OK : RF_NUMERICAL;
}

enum rf_status fitter_fit_mixture(struct fitter *f, double hopeless, struct fit *fit)
{
    size_t d = (size_t)f->wiring->n_parameters, iterations = fit->iterations;
    *fit = (struct fit){.n_parameters = d, .stride = f->equations.stride, .iterations = iterations};
    struct patience patience = {.promise = 1e-5, .hopeless = hopeless};
    if (!minimise(f, NOISE_MIXTURE, d, patience, fit))
        return RF_NUMERICAL;
    double value = objective_here(f, NOISE_MIXTURE, d);
    normal_equations(f, CURVATURE_INLIERS, d);
    if (!cholesky_factor(f->equations.hessian, d, f->equations.stride))
        return RF_NUMERICAL;
    fit->penalty = half_square(f->theta, d);
    fit->log_likelihood = fit->penalty - value;
    fit->log_det = cholesky_log_det(f->equations.hessian, d, f->equations.stride);
    fit->log_evidence = -value - 0.5 * fit->log_det;
    fit->theta = f->theta;
    fit->factor = f->equations.hessian;
    fit->weights = f->weights;
    fit->z = f->z;
    return isfinite(fit->log_evidence) ? RF_OK : RF_NUMERICAL;
}

enum rf_status fitter_prospect(struct fitter *f, struct prospect *prospect)
{
    size_t d = (size_t)f->wiring->n_parameters;
    double value = objective_here(f, NOISE_MIXTURE, d);
    f->step_promise = isfinite(value) ? newton_step(f, CURVATURE_INLIERS, d) : -1.0;
    if (f->step_promise < 0.0)
        return RF_NUMERICAL;
    *prospect = judge(f, d, value, f->step_promise);
    return RF_OK;
}

enum rf_status fitter_resume(struct fitter *f, const double theta[], struct fit *fit)
{
    size_t d = (size_t)f->wiring->n_parameters;
    *fit = (struct fit){.n_parameters = d, .stride = f->equations.stride};
    memcpy(f->theta, theta, d * sizeof *theta);
    f->step_promise = -1.0;
    return forward_evaluate(f->forward, f->theta);
}

enum rf_status fitter_fit(struct fitter *f, const struct wiring *wiring, const double start[],
                          struct fit *fit)
{
    enum rf_status status = fitter_analyse(f, wiring);
    if (status == RF_OK)
        status = fitter_fit_normal(f, start, fit);
    if (status == RF_OK)
        status = fitter_fit_mixture(f, -INFINITY, fit);
    return status;
}

double fit_parameter_sigma(const struct fit *fit, size_t j, double scratch[])
{
    memset(scratch, 0, fit->n_parameters * sizeof *scratch);
    scratch[j] = 1.0;
    cholesky_half_solve(fit->factor, fit->n_parameters, fit->stride, scratch);
    double sum = 0.0;
    for (size_t k = 0; k < fit->n_parameters; k++)
        sum += scratch[k] * scratch[k];
    return sqrt(sum);
}
