/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/cholesky.h"

#include "base/vectors.h"

#include <math.h>

/* Every pass is along rows of the upper triangle, neighbours in memory, and independent from
 * element to element, so that compilers make vectors of it. */

/* y −= scale · x */
static inline void subtract(double *restrict y, const double *restrict x, double scale, size_t n)
{
    for (size_t k = 0; k < n; k++)
        y[k] -= scale * x[k];
}

enum { PANEL = 4 };

/* y −= Σ scale_p · x_p over the four rows of a panel: y is loaded and stored once for all. */
static inline void subtract_panel(double *restrict y, const double *restrict x, size_t stride,
                                  const double scale[PANEL], size_t n)
{
    const double *restrict x1 = x + stride, *restrict x2 = x1 + stride, *restrict x3 = x2 + stride;
    for (size_t k = 0; k < n; k++)
        y[k] -= (scale[0] * x[k] + scale[1] * x1[k]) + (scale[2] * x2[k] + scale[3] * x3[k]);
}

/* Divides row k by the root of its pivot. */
static inline bool scale_row(double *row, size_t k, size_t n)
{
    double pivot = row[k];
    if (!(pivot > 0.0) || !isfinite(pivot))
        return false;
    double inverse = 1.0 / sqrt(pivot);
    row[k] = inverse;
    for (size_t j = k + 1; j < n; j++)
        row[j] *= inverse;
    return true;
}

/* Panels of four rows: each is factored within itself, then taken off all rows below at once. */
WIDE_VECTORS bool cholesky_factor(double *A, size_t n, size_t stride)
{
    for (size_t first = 0; first < n; first += PANEL) {
        size_t end = first + PANEL < n ? first + PANEL : n;
        for (size_t k = first; k < end; k++) {
            double *row = A + k * stride;
            if (!scale_row(row, k, n))
                return false;
            for (size_t i = k + 1; i < end; i++)
                subtract(A + i * stride + i, row + i, row[i], n - i);
        }
        for (size_t i = end; i < n; i++) {
            const double *panel = A + first * stride + i;
            const double scale[PANEL] = {panel[0], panel[stride], panel[2 * stride],
                                         panel[3 * stride]};
            subtract_panel(A + i * stride + i, panel, stride, scale, n - i);
        }
    }
    return true;
}

double cholesky_log_det(const double *U, size_t n, size_t stride)
{
    double sum = 0.0;
    for (size_t i = 0; i < n; i++)
        sum -= log(U[i * stride + i]);
    return 2.0 * sum;
}

/* x becomes U⁻ᵀx. */
static inline void substitute(const double *U, size_t n, size_t stride, double *x)
{
    for (size_t k = 0; k < n; k++) {
        const double *row = U + k * stride;
        x[k] *= row[k];
        subtract(x + k + 1, row + k + 1, x[k], n - k - 1);
    }
}

WIDE_VECTORS void cholesky_half_solve(const double *U, size_t n, size_t stride, double *x)
{
    substitute(U, n, stride, x);
}

/* Σ a_k b_k. Four sums, so that additions need not wait for one another. */
static inline double dot(const double *restrict a, const double *restrict b, size_t n)
{
    double sum[PANEL] = {0};
    size_t k = 0;
    for (; k + PANEL <= n; k += PANEL)
        for (size_t p = 0; p < PANEL; p++)
            sum[p] += a[k + p] * b[k + p];
    for (; k < n; k++)
        sum[0] += a[k] * b[k];
    return (sum[0] + sum[1]) + (sum[2] + sum[3]);
}

WIDE_VECTORS void cholesky_solve(const double *U, size_t n, size_t stride, double *x)
{
    substitute(U, n, stride, x);
    for (size_t k = n; k-- > 0;) {
        const double *row = U + k * stride;
        x[k] = (x[k] - dot(row + k + 1, x + k + 1, n - k - 1)) * row[k];
    }
}
