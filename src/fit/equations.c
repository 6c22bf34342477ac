/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "fit/equations.h"

#include "base/memory.h"
#include "base/vectors.h"

#include <assert.h>
#include <string.h>

bool equations_create(struct equations *e, const struct forward *forward, const struct wiring *ring)
{
    size_t most = (size_t)ring->map.n_common + FAULTS_AT_ONCE;
    *e = (struct equations){.n_runs = forward_runs(forward)};
    /* `others` are added as a whole, with the zeros that may stand behind d. */
    e->stride = (e->n_runs + MAX_OTHERS + 3) & ~(size_t)3;
    e->hessian = NEW_ARRAY(double, most * e->stride);
    e->gradient = NEW_ARRAY(double, e->stride);
    e->carry = NEW_ARRAY(double, e->stride);
    return e->hessian != NULL && e->gradient != NULL && e->carry != NULL;
}

void equations_free(struct equations *e)
{
    free(e->hessian);
    free(e->gradient);
    free(e->carry);
    *e = (struct equations){0};
}

void equations_begin_gradient(struct equations *e, size_t d)
{
    e->d = d;
    memset(e->gradient, 0, e->stride * sizeof *e->gradient);
}

void equations_begin(struct equations *e, size_t d)
{
    equations_begin_gradient(e, d);
    memset(e->hessian, 0, d * e->stride * sizeof *e->hessian);
}

static_assert(MAX_OTHERS % 4 == 0, "others are added by fours");

/* target += scale · others. */
static inline void add_others(double *target, const double *others, double scale)
{
    for (size_t k = 0; k < MAX_OTHERS; k += 4)
        *(four_doubles *)(target + k) += scale * *(const four_doubles *)(others + k);
}

static inline void add_gradient(struct equations *e, const struct slopes *slopes, double pull)
{
    for (size_t k = 0; k < slopes->n_steps; k++)
        e->gradient[slopes->step_run[k]] -= pull * slopes->steps[k];
    add_others(e->gradient + e->n_runs, slopes->others, -pull);
}

WIDE_VECTORS void equations_add_gradient(struct equations *e, const struct slopes *slopes,
                                         double pull)
{
    add_gradient(e, slopes, pull);
}

WIDE_VECTORS void equations_add(struct equations *e, const struct slopes *slopes, double weight,
                                double pull)
{
    size_t n_others = e->d - e->n_runs;
    const double *others = slopes->others;
    add_gradient(e, slopes, pull);
    if (weight == 0.0)
        return;
    for (size_t k = 0; k < slopes->n_steps; k++) {
        double *row = e->hessian + (size_t)slopes->step_run[k] * e->stride;
        double step = weight * slopes->steps[k];
        for (size_t i = 0; i < slopes->n_steps; i++)
            row[slopes->step_run[i]] += step * slopes->steps[i];
        add_others(row + e->n_runs, others, step);
    }
    for (size_t k = 0; k < n_others; k++)
        if (others[k] != 0.0)
            add_others(e->hessian + (e->n_runs + k) * e->stride + e->n_runs, others,
                       weight * others[k]);
}

void equations_finish_gradient(struct equations *e, const struct forward *forward,
                               const double theta[])
{
    const double *scale = forward_scale(forward);
    double sum = 0.0;
    for (size_t j = 0; j < e->n_runs; j++) {
        sum += e->gradient[j];
        e->gradient[j] = scale[j] * sum;
    }
    for (size_t j = 0; j < e->d; j++)
        e->gradient[j] += theta[j];
}

/*
 * Rows hold the second differences D, symmetric. Summed down to row j they are `carry`, which summed
 * along the row is JᵀWJ but for the scales. Of the sum up to the diagonal nothing need be added: by
 * symmetry it is the entry of the row above, one to the right.
 */
WIDE_VECTORS static void sum_up(struct equations *e, const double *restrict scale)
{
    double *restrict carry = e->carry;
    double left = 0.0;
    size_t n = e->n_runs, d = e->d;
    memset(carry, 0, e->stride * sizeof *carry);
    for (size_t j = 0; j < n; j++) {
        double *restrict row = e->hessian + j * e->stride;
        double sum = left, own = scale[j];
        for (size_t k = j; k < d; k++)
            carry[k] += row[k];
        for (size_t k = j; k < n; k++) {
            sum += carry[k];
            row[k] = sum;
        }
        left = j + 1 < n ? row[j + 1] : 0.0;
        for (size_t k = j; k < n; k++)
            row[k] *= own * scale[k];
        for (size_t k = n; k < d; k++)
            row[k] = own * carry[k];
    }
}

void equations_finish(struct equations *e, const struct forward *forward, const double theta[])
{
    equations_finish_gradient(e, forward, theta);
    sum_up(e, forward_scale(forward));
    for (size_t j = 0; j < e->d; j++)
        e->hessian[j * e->stride + j] += 1.0;
}
