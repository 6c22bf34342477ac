/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * A Murray loop test worked in a handbook: N. Hawkins, "Hawkins Electrical Guide", vol. 3, Fig.
 * 597. A wire of 16.46 Ω a mile is looped with a good one, 54.07 Ω together; a slide wire of 1000
 * divisions bridges the loop, the battery lies between its slider and the earth. It balances at
 * 332, so the earth lies 332/1000 of the loop off, 54.07 × 0.332 / 16.46 = 1.0906 miles.
 *
 * Here the same loop stands as a network with the earth where the handbook found it; that bridge
 * must balance: no current in the galvanometer.
 */
#include "network/loops.h"

#include "../suite.h"

#include <check.h>
#include <math.h>

static const double ohms_a_mile = 16.46, loop_ohms = 54.07, miles_found = 1.09;

enum { NEAR, FAR, SLIDER, FAULT, EARTH, NODES };
enum { SLIDE_NEAR, SLIDE_FAR, LINE_NEAR, LINE_FAR, GALVANOMETER, TO_EARTH, EDGES };

/* The galvanometer's current, A from near end to far end, for 1 A from the battery. */
static double galvanometer(struct loops *loops, double divisions, double miles, double earth_ohms,
                           double *reading)
{
    const struct edge edges[EDGES] = {
        [SLIDE_NEAR] = {SLIDER, NEAR, false}, [SLIDE_FAR] = {SLIDER, FAR, false},
        [LINE_NEAR] = {NEAR, FAULT, false},   [LINE_FAR] = {FAR, FAULT, false},
        [GALVANOMETER] = {NEAR, FAR, false},  [TO_EARTH] = {FAULT, EARTH, false},
    };
    const struct probe battery = {SLIDER, EARTH};
    const double slide_ohms = 10.0, meter_ohms = 100.0; /* ours: a balance does not know them */
    const double r[EDGES] = {
        [SLIDE_NEAR] = slide_ohms * divisions / 1000.0,
        [SLIDE_FAR] = slide_ohms * (1000.0 - divisions) / 1000.0,
        [LINE_NEAR] = ohms_a_mile * miles,
        [LINE_FAR] = loop_ohms - ohms_a_mile * miles,
        [GALVANOMETER] = meter_ohms,
        [TO_EARTH] = earth_ohms,
    };
    double current[EDGES], by_column[EDGES];
    const int *edge_of_column;
    ck_assert_int_eq(loops_analyse(loops, NODES, edges, EDGES, &battery, 1), RF_OK);
    ck_assert_uint_eq(loops_columns(loops, &edge_of_column), EDGES);
    for (size_t c = 0; c < EDGES; c++)
        by_column[c] = r[edge_of_column[c]];
    ck_assert_int_eq(loops_factor(loops, by_column), RF_OK);
    *reading = loops_read(loops, 0, NULL, current);
    for (size_t c = 0; c < EDGES; c++)
        if (edge_of_column[c] == GALVANOMETER)
            return current[c];
    ck_abort_msg("no galvanometer among the columns");
    return NAN;
}

START_TEST(bridge_balances_where_the_handbook_found_the_earth)
{
    struct loops *loops = loops_create(NODES, EDGES, 1, EDGES);
    double reading;
    ck_assert_ptr_nonnull(loops);
    const double exact = loop_ohms * 332.0 / 1000.0 / ohms_a_mile;
    ck_assert_double_eq_tol(exact, miles_found, 0.005);
    ck_assert_double_eq_tol(galvanometer(loops, 332, exact, 50, &reading), 0.0, 1e-14);
    /* Balanced, it reads as if the galvanometer were not there. */
    const double near = 3.32 + ohms_a_mile * exact, far = 10.0 + loop_ohms - near;
    ck_assert_double_eq_tol(reading, 50 + near * far / (near + far), 1e-11);

    /* Off balance the current turns round, either side of one division. */
    ck_assert_double_gt(galvanometer(loops, 331, exact, 50, &reading), 1e-5);
    ck_assert_double_lt(galvanometer(loops, 333, exact, 50, &reading), -1e-5);
    loops_destroy(loops);
}
END_TEST

/* Seeks the balance along the slide wire for the place as printed: at 332, to the division, however
 * good or bad the earth. */
START_TEST(balance_is_found_at_the_division_read)
{
    struct loops *loops = loops_create(NODES, EDGES, 1, EDGES);
    const double earths[] = {0.01, 20, 5000};
    ck_assert_ptr_nonnull(loops);
    for (size_t i = 0; i < 3; i++) {
        double low = 1, high = 999, reading;
        while (high - low > 1e-6) {
            double middle = (low + high) / 2;
            if (galvanometer(loops, middle, miles_found, earths[i], &reading) > 0)
                low = middle;
            else
                high = middle;
        }
        ck_assert_double_eq_tol(low, 332.0, 0.5);
    }
    loops_destroy(loops);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("murray");
    TCase *cases = tcase_create("murray");
    suite_add_tcase(suite, cases);
    tcase_add_test(cases, bridge_balances_where_the_handbook_found_the_earth);
    tcase_add_test(cases, balance_is_found_at_the_division_read);
    return run_suite(suite);
}
