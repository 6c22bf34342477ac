/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/cholesky.h"

#include <math.h>

static double dot(const double *restrict a, const double *restrict b, size_t n)
{
    /* Four sums, so that additions need not wait for one another. */
    double s0 = 0.0, s1 = 0.0, s2 = 0.0, s3 = 0.0;
    size_t k = 0;
    for (; k + 4 <= n; k += 4) {
        s0 += a[k] * b[k];
        s1 += a[k + 1] * b[k + 1];
        s2 += a[k + 2] * b[k + 2];
        s3 += a[k + 3] * b[k + 3];
    }
    for (; k < n; k++)
        s0 += a[k] * b[k];
    return (s0 + s1) + (s2 + s3);
}

bool cholesky_factor(double *A, size_t n, size_t stride)
{
    for (size_t i = 0; i < n; i++) {
        double *row = A + i * stride;
        for (size_t j = 0; j < i; j++) {
            const double *other = A + j * stride;
            row[j] = (row[j] - dot(row, other, j)) * other[j];
        }
        double pivot = row[i] - dot(row, row, i);
        if (!(pivot > 0.0) || !isfinite(pivot))
            return false;
        row[i] = 1.0 / sqrt(pivot);
    }
    return true;
}

double cholesky_log_det(const double *L, size_t n, size_t stride)
{
    double sum = 0.0;
    for (size_t i = 0; i < n; i++)
        sum -= log(L[i * stride + i]);
    return 2.0 * sum;
}

void cholesky_half_solve(const double *L, size_t n, size_t stride, double *x)
{
    for (size_t i = 0; i < n; i++)
        x[i] = (x[i] - dot(L + i * stride, x, i)) * L[i * stride + i];
}

void cholesky_solve(const double *L, size_t n, size_t stride, double *x)
{
    cholesky_half_solve(L, n, stride, x);
    for (size_t i = n; i-- > 0;) {
        const double *row = L + i * stride;
        double value = x[i] * row[i];
        x[i] = value;
        for (size_t j = 0; j < i; j++)
            x[j] -= row[j] * value;
    }
}
