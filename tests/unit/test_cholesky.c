/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Our Cholesky factor beside GSL's (gsl_linalg_cholesky_decomp1) on random matrices. */
#include "base/cholesky.h"

#include "../rings.h"
#include "../suite.h"

#include <check.h>
#include <gsl/gsl_linalg.h>

enum { MOST = 37, STRIDE = MOST + 3 };

/* A = B Bᵀ + n I / 10, both copies. */
static void fill(uint64_t *seed, size_t n, double *A, gsl_matrix *G)
{
    static double B[MOST][MOST];
    for (size_t i = 0; i < n; i++)
        for (size_t j = 0; j < n; j++)
            B[i][j] = 2.0 * random_unit(seed) - 1.0;
    for (size_t i = 0; i < n; i++)
        for (size_t j = 0; j < n; j++) {
            double sum = i == j ? 0.1 * (double)n : 0.0;
            for (size_t k = 0; k < n; k++)
                sum += B[i][k] * B[j][k];
            gsl_matrix_set(G, i, j, sum);
            /* The lower triangle must not be read. */
            A[i * STRIDE + j] = j >= i ? sum : NAN;
        }
}

START_TEST(agrees_with_gsl)
{
    uint64_t seed = 20260211;
    static double A[MOST * STRIDE];
    for (size_t n = 1; n <= MOST; n++) {
        gsl_matrix *G = gsl_matrix_alloc(n, n);
        gsl_vector *b = gsl_vector_alloc(n), *x = gsl_vector_alloc(n);
        ck_assert(G != NULL && b != NULL && x != NULL);
        double ours[MOST], half[MOST], log_det = 0.0, product = 0.0, squares = 0.0;
        fill(&seed, n, A, G);
        for (size_t i = 0; i < n; i++) {
            ours[i] = half[i] = random_unit(&seed) - 0.5;
            gsl_vector_set(b, i, ours[i]);
        }
        ck_assert(cholesky_factor(A, n, STRIDE));
        ck_assert_int_eq(gsl_linalg_cholesky_decomp1(G), 0);
        ck_assert_int_eq(gsl_linalg_cholesky_solve(G, b, x), 0);
        for (size_t i = 0; i < n; i++) {
            log_det += 2.0 * log(gsl_matrix_get(G, i, i));
            for (size_t j = 0; j < i; j++)
                ck_assert_double_eq_tol(A[j * STRIDE + i], gsl_matrix_get(G, i, j), 1e-11);
            ck_assert_double_eq_tol(1.0 / A[i * STRIDE + i], gsl_matrix_get(G, i, i), 1e-11);
        }
        ck_assert_double_eq_tol(cholesky_log_det(A, n, STRIDE), log_det, 1e-10);
        cholesky_solve(A, n, STRIDE, ours);
        cholesky_half_solve(A, n, STRIDE, half);
        for (size_t i = 0; i < n; i++) {
            ck_assert_double_eq_tol(ours[i], gsl_vector_get(x, i), 1e-10);
            product += gsl_vector_get(b, i) * gsl_vector_get(x, i);
            squares += half[i] * half[i];
        }
        ck_assert_double_eq_tol(squares, product, 1e-10);
        gsl_matrix_free(G);
        gsl_vector_free(b);
        gsl_vector_free(x);
    }
}
END_TEST

/* Eigenvalues 3 and −1; 2 and 0; and what is not a number. */
START_TEST(refuses_what_is_not_positive_definite)
{
    double indefinite[4] = {1, 2, 2, 1}, singular[4] = {1, 1, 1, 1};
    double negative[1] = {-1}, zero[1] = {0}, nan[4] = {1, NAN, NAN, 1}, infinite[1] = {INFINITY};
    ck_assert(!cholesky_factor(indefinite, 2, 2));
    ck_assert(!cholesky_factor(singular, 2, 2));
    ck_assert(!cholesky_factor(negative, 1, 1));
    ck_assert(!cholesky_factor(zero, 1, 1));
    ck_assert(!cholesky_factor(nan, 2, 2));
    ck_assert(!cholesky_factor(infinite, 1, 1));
}
END_TEST

START_TEST(takes_an_empty_matrix)
{
    double none[1] = {7};
    ck_assert(cholesky_factor(none, 0, 0));
    ck_assert_double_eq(cholesky_log_det(none, 0, 0), 0.0);
    cholesky_solve(none, 0, 0, none);
    ck_assert_double_eq(none[0], 7.0);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("cholesky");
    TCase *cases = tcase_create("cholesky");
    suite_add_tcase(suite, cases);
    tcase_add_test(cases, agrees_with_gsl);
    tcase_add_test(cases, refuses_what_is_not_positive_definite);
    tcase_add_test(cases, takes_an_empty_matrix);
    return run_suite(suite);
}
