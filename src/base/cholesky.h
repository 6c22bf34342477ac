/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef BASE_CHOLESKY_H
#define BASE_CHOLESKY_H

/*
 * Cholesky factors of small dense symmetric positive definite matrices (Golub and Van Loan,
 * "Matrix Computations", 4th ed., section 4.2, by outer products). GSL has them too; for the sizes here (1 to
 * some dozens) its calls cost more than the arithmetic, and hypotheses are factored by the
 * thousand. tests/unit compares with GSL's.
 */

#include <stdbool.h>
#include <stddef.h>

/* A: n×n, row-major with row stride `stride`; the upper triangle is read and overwritten with U,
 * A = UᵀU. The diagonal holds 1/U_ii afterwards: a solve then never divides. False where A is not
 * positive definite. */
bool cholesky_factor(double *A, size_t n, size_t stride);

/* log det A, from the factor. */
double cholesky_log_det(const double *U, size_t n, size_t stride);

/* x (n): overwritten with A⁻¹x. */
void cholesky_solve(const double *U, size_t n, size_t stride, double *x);

/* x (n): overwritten with U⁻ᵀx, so that xᵀA⁻¹x = Σ x_i². */
void cholesky_half_solve(const double *U, size_t n, size_t stride, double *x);

#endif
