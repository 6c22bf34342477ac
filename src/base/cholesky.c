/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/cholesky.h"

#include <math.h>

/* Every pass is along rows of the upper triangle, neighbours in memory, and independent from
 * element to element, so that compilers make vectors of it. */

/* y −= scale · x */
static void subtract(double *restrict y, const double *restrict x, double scale, size_t n)
{
    for (size_t k = 0; k < n; k++)
        y[k] -= scale * x[k];
}

bool cholesky_factor(double *A, size_t n, size_t stride)
{
    for (size_t k = 0; k < n; k++) {
        double *row = A + k * stride;
        double pivot = row[k];
        if (!(pivot > 0.0) || !isfinite(pivot))
            return false;
        double inverse = 1.0 / sqrt(pivot);
        row[k] = inverse;
        for (size_t j = k + 1; j < n; j++)
            row[j] *= inverse;
        for (size_t i = k + 1; i < n; i++)
            subtract(A + i * stride + i, row + i, row[i], n - i);
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

void cholesky_half_solve(const double *U, size_t n, size_t stride, double *x)
{
    for (size_t k = 0; k < n; k++) {
        const double *row = U + k * stride;
        x[k] *= row[k];
        subtract(x + k + 1, row + k + 1, x[k], n - k - 1);
    }
}

void cholesky_solve(const double *U, size_t n, size_t stride, double *x)
{
    cholesky_half_solve(U, n, stride, x);
    for (size_t k = n; k-- > 0;) {
        const double *row = U + k * stride;
        double sum = x[k];
        for (size_t j = k + 1; j < n; j++)
            sum -= row[j] * x[j];
        x[k] = sum * row[k];
    }
}
