/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * Rings small and sound enough for a formula.
 *
 * Source of the crossed forms: "Resistance readings for Step 3 of the ring final circuit test",
 * Wiring Matters 89, IET, March 2022. With r1 and r2 the two conductors end to end and x the
 * fraction of the ring behind the point, a crossed reading is two paths in parallel, x r1 + (1−x)
 * r2 and (1−x) r1 + x r2, of sum r1 + r2 and product r1 r2 + (x − x²)(r1 − r2)²:
 *
 *     R(x) = [r1 r2 + (x − x²)(r1 − r2)²] / (r1 + r2)
 *
 * r1 r2 / (r1 + r2) at the board (x = 0 and 1), highest mid-ring, (r1 + r2)/4; for equal
 * conductors (r1 + r2)/4 everywhere. The other forms are series sums: common practice, no source.
 */
#include "../meter.h"
#include "../suite.h"


enum { N = 6, SPUR = N + 2, FURTHER = N + 3 };

static const double run_m[N + 1] = {6.5, 3.0, 8.0, 11.5, 2.5, 7.5, 9.0};
static const double spur_m = 3.0, further_m = 1.5;
static const char suffixes[3][3] = {"ln", "le", "ne"};

static struct small_ring ring;
static struct rf_models models;
static struct wiring wiring;
static double whole_m;

/* The spur hangs on P2, a further one on it. */
static void lay(double live_mm2, double cpc_mm2)
{
    models_for_tests(&models);
    ring_lay(&ring, N, run_m);
    ring_add_spur(&ring, 2, spur_m);
    ring_add_spur(&ring, SPUR, further_m);
    ring.job.live_mm2 = live_mm2;
    ring.job.cpc_mm2 = cpc_mm2;
    whole_m = 0.0;
    for (size_t place = 0; place < ring.job.n_places; place++) {
        ring.places[place].live_mm2 = live_mm2;
        ring.places[place].cpc_mm2 = cpc_mm2;
    }
    for (size_t run = 0; run <= N; run++)
        whole_m += run_m[run];
    ck_assert_int_eq(wiring_init(&wiring, &ring.job, &models, NULL), RF_OK);
}

static double read_pair(const char *setup, size_t pair, enum spot spot, size_t place)
{
    char name[24];
    snprintf(name, sizeof name, "%s_%s", setup, suffixes[pair]);
    return read_wiring(&wiring, name, spot, place);
}

/* r1, rn, r2: by the meter, end to end, as the method has it. */
static double end_to_end(enum conductor conductor)
{
    return read_wiring(&wiring, "end_to_end", SPOT_L + (enum spot)conductor, 0);
}

/* The fraction of the ring behind a ring point. */
static double fraction(size_t place)
{
    double sum = 0.0;
    for (size_t run = 0; run < place; run++)
        sum += run_m[run];
    return sum / whole_m;
}

START_TEST(equal_conductors_crossed)
{
    lay(2.5, 2.5);
    for (size_t p = 0; p < N_PAIRS; p++) {
        double quarter =
            (end_to_end(pair_members[p].first) + end_to_end(pair_members[p].second)) / 4;
        ck_assert_double_gt(quarter, 0.1);
        ck_assert_double_eq_tol(read_pair("cross", p, SPOT_BOARD, 0), quarter, 1e-13);
        for (size_t place = 1; place <= N; place++)
            ck_assert_double_eq_tol(read_pair("cross", p, SPOT_POINT, place), quarter, 1e-13);
    }
    wiring_finish(&wiring);
}
END_TEST

START_TEST(unequal_conductors_crossed)
{
    const double cables[][2] = {{1.5, 1.0}, {2.5, 1.0}, {2.5, 1.5}, {4.0, 1.5}, {6.0, 2.5}};
    for (size_t i = 0; i < sizeof cables / sizeof *cables; i++) {
        lay(cables[i][0], cables[i][1]);
        for (size_t p = 0; p < N_PAIRS; p++) {
            double r1 = end_to_end(pair_members[p].first);
            double r2 = end_to_end(pair_members[p].second);
            double board = read_pair("cross", p, SPOT_BOARD, 0);
            ck_assert_double_eq_tol(board, r1 * r2 / (r1 + r2), 1e-13);
            for (size_t place = 1; place <= N; place++) {
                double x = fraction(place), reading = read_pair("cross", p, SPOT_POINT, place);
                double expected = (r1 * r2 + (x - x * x) * (r1 - r2) * (r1 - r2)) / (r1 + r2);
                ck_assert_double_eq_tol(reading, expected, 1e-13);
                ck_assert_double_le(reading, (r1 + r2) / 4 + 1e-13);
                if (p != PAIR_LN)
                    ck_assert_double_gt(reading, board);
            }
        }
        wiring_finish(&wiring);
    }
}
END_TEST

/* A point half-way round reads (r1 + r2)/4, more than its neighbours. */
START_TEST(highest_in_the_middle)
{
    const double even_m[] = {5, 5, 5, 5};
    models_for_tests(&models);
    ring_lay(&ring, 3, even_m);
    ck_assert_int_eq(wiring_init(&wiring, &ring.job, &models, NULL), RF_OK);
    for (size_t p = PAIR_LE; p <= PAIR_NE; p++) {
        double r1 = end_to_end(pair_members[p].first), r2 = end_to_end(CPC);
        double middle = read_pair("cross", p, SPOT_POINT, 2);
        ck_assert_double_eq_tol(middle, (r1 + r2) / 4, 1e-13);
        ck_assert_double_gt(middle, read_pair("cross", p, SPOT_POINT, 1) + 1e-4);
        ck_assert_double_gt(middle, read_pair("cross", p, SPOT_POINT, 3) + 1e-4);
    }
    wiring_finish(&wiring);
}
END_TEST

/*
 * Common practice, no source: a spur reads higher than the ring, in both crossed tests. Exactly: it
 * reads its own two conductors more than the point it hangs on. Line with neutral that is more than
 * any point of the ring; line with CPC only more than where it hangs, since the ring's middle reads
 * high there anyway.
 */
START_TEST(spurs_read_higher)
{
    lay(2.5, 1.5);
    for (size_t p = 0; p < N_PAIRS; p++) {
        double per_m = 0.0;
        const enum conductor members[] = {pair_members[p].first, pair_members[p].second};
        for (int i = 0; i < 2; i++)
            per_m += end_to_end(members[i]) / whole_m;
        double tap = read_pair("cross", p, SPOT_POINT, 2);
        double spur = read_pair("cross", p, SPOT_POINT, SPUR);
        ck_assert_double_eq_tol(spur, tap + spur_m * per_m, 1e-13);
        ck_assert_double_eq_tol(read_pair("cross", p, SPOT_POINT, FURTHER),
                                tap + (spur_m + further_m) * per_m, 1e-13);
        for (size_t place = 1; p == PAIR_LN && place <= N; place++)
            ck_assert_double_gt(spur, read_pair("cross", p, SPOT_POINT, place) + 0.01);
    }
    wiring_finish(&wiring);
}
END_TEST

/* A link at one end: out along one conductor, back along the other. A wander lead: one conductor,
 * the one way; the rest of the ring hangs loose and carries nothing. */
START_TEST(links_and_leads_are_series_sums)
{
    lay(2.5, 1.5);
    for (size_t p = 0; p < N_PAIRS; p++) {
        double both = end_to_end(pair_members[p].first) + end_to_end(pair_members[p].second);
        double spur = both * spur_m / whole_m;
        ck_assert_double_eq_tol(read_pair("link_out", p, SPOT_IN, 0), both, 1e-13);
        ck_assert_double_eq_tol(read_pair("link_in", p, SPOT_OUT, 0), both, 1e-13);
        ck_assert_double_eq_tol(read_pair("link_out", p, SPOT_POINT, SPUR),
                                fraction(2) * both + spur, 1e-13);
        ck_assert_double_eq_tol(read_pair("link_in", p, SPOT_POINT, SPUR),
                                (1 - fraction(2)) * both + spur, 1e-13);
        for (size_t place = 1; place <= N; place++) {
            double out = read_pair("link_out", p, SPOT_POINT, place);
            double in = read_pair("link_in", p, SPOT_POINT, place);
            ck_assert_double_eq_tol(out, fraction(place) * both, 1e-13);
            ck_assert_double_eq_tol(in + out, both, 1e-13);
        }
    }
    const char *const leads[2][3] = {{"lead_out_l", "lead_out_n", "lead_out_e"},
                                     {"lead_in_l", "lead_in_n", "lead_in_e"}};
    for (enum conductor c = LINE; c < N_CONDUCTORS; c++) {
        double whole = end_to_end(c);
        for (size_t place = 1; place <= N; place++) {
            ck_assert_double_eq_tol(read_wiring(&wiring, leads[0][c], SPOT_POINT, place),
                                    whole * fraction(place), 1e-13);
            ck_assert_double_eq_tol(read_wiring(&wiring, leads[1][c], SPOT_POINT, place),
                                    whole * (1 - fraction(place)), 1e-13);
        }
        ck_assert_double_eq_tol(read_wiring(&wiring, leads[0][c], SPOT_POINT, SPUR),
                                whole * (fraction(2) + spur_m / whole_m), 1e-13);
    }
    wiring_finish(&wiring);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("closed forms");
    TCase *cases = tcase_create("closed forms");
    suite_add_tcase(suite, cases);
    tcase_add_test(cases, equal_conductors_crossed);
    tcase_add_test(cases, unequal_conductors_crossed);
    tcase_add_test(cases, highest_in_the_middle);
    tcase_add_test(cases, spurs_read_higher);
    tcase_add_test(cases, links_and_leads_are_series_sums);
    return run_suite(suite);
}
