/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Wilson's interval against published figures, and against what defines it. */

#include <ringfettle/review.h>

#include "../suite.h"

#include <check.h>
#include <gsl/gsl_cdf.h>
#include <math.h>

/*
 * R. G. Newcombe, "Two-sided confidence intervals for the single proportion: comparison of seven
 * methods", Statistics in Medicine 17 (1998), table I: 95 % limits by the score method without
 * continuity correction, to four digits. Recalled from memory; the next test does not rest on it.
 */
static const struct {
    size_t right, n;
    double low, high;
} published[] = {
    {81, 263, 0.2553, 0.3662},
    {15, 148, 0.0624, 0.1605},
    {0, 20, 0.0000, 0.1611},
    {1, 29, 0.0061, 0.1718},
};

START_TEST(newcombe)
{
    double low, high;
    rf_wilson(published[_i].right, published[_i].n, 0.95, &low, &high);
    ck_assert_double_eq_tol(low, published[_i].low, 0.00005 + 1e-9);
    ck_assert_double_eq_tol(high, published[_i].high, 0.00005 + 1e-9);
}
END_TEST

/* E. B. Wilson, J. Am. Stat. Assoc. 22 (1927), 209-212: the limits are the two p for which the
 * share seen lies z standard deviations, those of p, from p. */
START_TEST(definition)
{
    static const size_t sizes[] = {1, 2, 5, 17, 100, 20000};
    double z = gsl_cdf_ugaussian_Pinv(0.95);
    for (size_t i = 0; i < sizeof sizes / sizeof sizes[0]; i++)
        for (size_t right = 0; right <= sizes[i]; right += 1 + sizes[i] / 13) {
            double bounds[2], n = (double)sizes[i], share = (double)right / n;
            rf_wilson(right, sizes[i], 0.9, &bounds[0], &bounds[1]);
            ck_assert(bounds[0] >= 0 && bounds[0] <= share && share <= bounds[1] && bounds[1] <= 1);
            for (int j = 0; j < 2; j++) {
                double p = bounds[j];
                ck_assert_double_eq_tol((share - p) * (share - p), z * z * p * (1 - p) / n, 1e-12);
            }
        }
}
END_TEST

START_TEST(nothing_seen)
{
    double low, high;
    rf_wilson(0, 0, 0.9, &low, &high);
    ck_assert(low <= 0 && high >= 1);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("wilson");
    TCase *cases = tcase_create("wilson");
    tcase_add_loop_test(cases, newcombe, 0, (int)(sizeof published / sizeof published[0]));
    tcase_add_test(cases, definition);
    tcase_add_test(cases, nothing_seen);
    suite_add_tcase(suite, cases);
    return run_suite(suite);
}
