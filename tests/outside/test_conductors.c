/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Conductors against the standard and against rules of the trade. */
#include "models/models.h"

#include "../suite.h"

#include <check.h>

static struct rf_models *models;

static void load(void)
{
    struct rf_error error;
    ck_assert_int_eq(rf_models_load(NULL, RF_RATES_CONSULTED, &models, &error), RF_OK);
}

static void unload(void)
{
    rf_models_destroy(models);
}

/* IEC 60228, class 1 (solid), plain copper: greatest resistance at 20 °C, Ω/km. */
static const struct {
    double mm2, ohm_per_km;
} class_1[] = {{1.0, 18.1}, {1.5, 12.1}, {2.5, 7.41}, {4, 4.61}, {6, 3.08}, {10, 1.83}, {16, 1.15}};

START_TEST(resistances_are_those_of_iec_60228)
{
    double ohm_per_km = 1000 * models_ohm_per_m(models, class_1[_i].mm2, 20);
    ck_assert_double_eq_tol(ohm_per_km, class_1[_i].ohm_per_km, 1e-9);
}
END_TEST

/* IEC 60228, annex on temperature correction: the factor that refers a resistance measured at
 * t °C to 20 °C, copper. The annex rounds and takes a coefficient of its own, hence 0.003. */
static const struct {
    double temperature_c, factor;
} corrections[] = {{5, 1.064}, {10, 1.042}, {15, 1.020}, {20, 1},
                   {25, .980}, {30, .962},  {40, .926}};

START_TEST(temperature_factors_are_those_of_iec_60228)
{
    double at_20 = models_ohm_per_m(models, 2.5, 20);
    double at_t = models_ohm_per_m(models, 2.5, corrections[_i].temperature_c);
    ck_assert_double_eq_tol(at_20 / at_t, corrections[_i].factor, 0.003);
}
END_TEST

/* Common practice, no source: the protective conductor of 2.5/1.5 mm² reads about 1.67 × the line,
 * the ratio of the areas. By IEC 60228 it is 12.1 / 7.41 = 1.63. */
START_TEST(a_smaller_cpc_reads_about_two_thirds_more)
{
    double ratio = models_ohm_per_m(models, 1.5, 20) / models_ohm_per_m(models, 2.5, 20);
    ck_assert_double_eq_tol(ratio, 1.67, 0.05);
    ck_assert_double_eq_tol(ratio, 12.1 / 7.41, 1e-9);
}
END_TEST

/* Common practice, no source: 0.52 Ω end to end on 2.5 mm² is about 70 m of cable. */
START_TEST(half_an_ohm_is_about_seventy_metres)
{
    ck_assert_double_eq_tol(0.52 / models_ohm_per_m(models, 2.5, 20), 70, 1);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("conductors");
    TCase *tests = tcase_create("conductors");
    tcase_add_checked_fixture(tests, load, unload);
    tcase_add_loop_test(tests, resistances_are_those_of_iec_60228, 0,
                        (int)(sizeof class_1 / sizeof class_1[0]));
    tcase_add_loop_test(tests, temperature_factors_are_those_of_iec_60228, 0,
                        (int)(sizeof corrections / sizeof corrections[0]));
    tcase_add_test(tests, a_smaller_cpc_reads_about_two_thirds_more);
    tcase_add_test(tests, half_an_ohm_is_about_seventy_metres);
    suite_add_tcase(suite, tests);
    return run_suite(suite);
}
