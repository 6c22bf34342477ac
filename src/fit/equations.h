/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef FIT_EQUATIONS_H
#define FIT_EQUATIONS_H

/*
 * The normal equations of the readings at θ: H = I + JᵀWJ and g = θ − Jᵀv, W diagonal. Rows of J are
 * added one by one. In the runs a row is a few steps (forward.h), so what is added is the second
 * difference of JᵀWJ, at few places; summing up along rows and columns at the end gives the matrix.
 * An observation costs O(steps²) that way, instead of O(parameters²).
 */

#include "fit/forward.h"

struct equations {
    size_t d, n_runs, stride; /* parameters; the first of them runs; of a row of H */
    double *hessian;          /* d × stride; its upper triangle when finished */
    double *gradient;         /* [parameter] */
    double *carry;            /* [stride] scratch */
};

/* Room for the parameters of a wiring that is a copy of the forward model's. False: memory is short;
 * the caller frees it either way. */
bool equations_create(struct equations *equations, const struct forward *forward,
                      const struct wiring *ring);
void equations_free(struct equations *equations); /* takes zeroed */

/* Begins for d parameters. Then add rows; then finish, at the θ where the rows were evaluated. */
void equations_begin(struct equations *equations, size_t d);
void equations_add(struct equations *equations, const struct slopes *slopes, double weight,
                   double pull);
void equations_finish(struct equations *equations, const struct forward *forward,
                      const double theta[]);

/* The gradient alone; H stays as it is. */
void equations_begin_gradient(struct equations *equations, size_t d);
void equations_add_gradient(struct equations *equations, const struct slopes *slopes, double pull);
void equations_finish_gradient(struct equations *equations, const struct forward *forward,
                               const double theta[]);

#endif
