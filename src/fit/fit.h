/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef FIT_FIT_H
#define FIT_FIT_H

/*
 * The most probable parameters of one hypothesis, and its evidence. The objective is
 *
 *     F(θ) = −log-likelihood(θ) + ½ |θ|²
 *
 * minimised by damped Gauss-Newton, first with plain normal noise from θ = 0, then with the
 * mixture from where that ended: from θ = 0 the mixture would write the tell-tale reading off as a
 * misread. The evidence is Laplace's (MacKay, "Information Theory, Inference, and Learning
 * Algorithms", 2003, ch. 27) with the Gauss-Newton Hessian,
 *
 *     log Z = −F(θ̂) − ½ log det(I + JᵀWJ).
 */

#include "fit/forward.h"
#include "fit/likelihood.h"

struct fitter;

/* A workspace for the job's readings; `ring` is the wiring as recorded and outlives it. NULL when
 * memory is short. */
struct fitter *fitter_create(const struct wiring *ring);
void fitter_destroy(struct fitter *fitter); /* takes NULL */

/* The measurements the job's readings are values of, each once; readings of the job, in its order,
 * as observations. */
const struct forward *fitter_forward(const struct fitter *fitter);
/* The same, for others to analyse and evaluate wirings with between fits. */
struct forward *fitter_forward_to_use(struct fitter *fitter);
size_t fitter_observations(const struct fitter *fitter, const struct observation **observations);

/* What a fit found. Pointers are into the fitter, good until its next fit. */
struct fit {
    double log_evidence;
    double log_likelihood; /* at θ̂ */
    double penalty;        /* ½ |θ̂|² */
    double log_det;        /* of I + JᵀWJ */
    double objective;      /* F of the stage fitted last, constants left out by the normal one */
    size_t iterations;
    bool converged;
    bool abandoned; /* log Z would stay below `hopeless`; the rest holds where the fit stopped */
    size_t n_parameters;
    const double *theta;  /* θ̂ */
    const double *factor; /* Cholesky factor of I + JᵀWJ, row stride fit.stride */
    size_t stride;
    const double *weights; /* [observation] chance that it is no misread; 1 for what has none */
    const double *z;       /* [observation] (read − fitted)/σ; 0 for what has none */
};

/*
 * Fits the wiring (recorded ring with a hypothesis applied). `start` (n_parameters, may be NULL:
 * 0) is where the first stage starts. RF_NUMERICAL when the arithmetic fails. Allocates nothing.
 */
enum rf_status fitter_fit(struct fitter *fitter, const struct wiring *wiring, const double start[],
                          struct fit *fit);

/*
 * The same in steps: analyse a wiring, fit it with normal noise from `start`, and with the mixture
 * from where the first ended. The second gives up once log Z is as good as certain to stay below
 * `hopeless` (-INFINITY: never). To resume a fit later, analyse again and `fitter_resume` at its θ.
 */
enum rf_status fitter_analyse(struct fitter *fitter, const struct wiring *wiring);
enum rf_status fitter_fit_normal(struct fitter *fitter, const double start[], struct fit *fit);
enum rf_status fitter_fit_mixture(struct fitter *fitter, double hopeless, struct fit *fit);
enum rf_status fitter_resume(struct fitter *fitter, const double theta[], struct fit *fit);

/* What log Z of the wiring analysed cannot exceed: its paths and the readings over range say so,
 * before anything is evaluated. */
double fitter_ceiling(const struct fitter *fitter);

/* What log Z may come to, from how the mixture stands where the first stage ended. */
struct prospect {
    double most;   /* what it can hardly exceed */
    double likely; /* what the next step promises */
};
/* RF_NUMERICAL. */
enum rf_status fitter_prospect(struct fitter *fitter, struct prospect *prospect);

/* Standard deviation of θ_j under the fit, from its factor; `scratch` holds n_parameters. */
double fit_parameter_sigma(const struct fit *fit, size_t j, double scratch[]);

#endif
