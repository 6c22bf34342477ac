/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The wiring of a recorded ring: wires, fronts, links, probes; and what faults do it with. */
#include "network/wiring.h"

#include "../meter.h"
#include "../suite.h"

#include <check.h>

enum { MOST = 128 };

/*
 * out P1 P2 P3(junction box) in = places 0 … 4. S1 (5) on P2, S2 (6) on S1, S3 (7) on out, S4 (8)
 * on in.
 */
enum { OUT, P1, P2, P3, IN, S1, S2, S3, S4 };
static struct small_ring ring;
static struct rf_models models;
static struct wiring wiring;
static struct rf_error error;

static void lay(void)
{
    const double run_m[] = {4, 6, 3, 9};
    models_for_tests(&models);
    ring_lay(&ring, 3, run_m);
    ring.places[P3].kind = KIND_JUNCTION_BOX;
    ck_assert_uint_eq(ring_add_spur(&ring, P2, 2), S1);
    ck_assert_uint_eq(ring_add_spur(&ring, S1, 5), S2);
    ck_assert_uint_eq(ring_add_spur(&ring, OUT, 7), S3);
    ck_assert_uint_eq(ring_add_spur(&ring, IN, 1), S4);
}

static void set_up(void)
{
    lay();
    ck_assert_int_eq(wiring_init(&wiring, &ring.job, &models, &error), RF_OK);
}

static void tear_down(void)
{
    wiring_finish(&wiring);
}

/* The one piece of that run's conductor. */
static struct wire *the_piece(size_t run, enum conductor conductor)
{
    size_t next = 0;
    struct wire *wire = wiring_next_piece(&wiring, run, conductor, &next);
    ck_assert_ptr_nonnull(wire);
    ck_assert_ptr_null(wiring_next_piece(&wiring, run, conductor, &next));
    return wire;
}

/* The reading at θ = 0, Ω; a negative number: no path. */
static double read_spot(const char *name, enum spot spot, size_t place)
{
    return read_wiring(&wiring, name, spot, place);
}

#define LIVE 0.00741
#define EARTH 0.0121

START_TEST(every_run_is_three_wires)
{
    const size_t near[] = {OUT, P1, P2, P3, P2, S1, OUT, IN};
    const double metres[] = {4, 6, 3, 9, 2, 5, 7, 1};
    ck_assert_uint_eq(wiring.n_wires, 8 * 3);
    for (size_t run = 0; run < 8; run++)
        for (enum conductor c = LINE; c < N_CONDUCTORS; c++) {
            const struct wire *wire = the_piece(run, c);
            ck_assert_int_eq(wire->a, terminal(near[run], c));
            ck_assert_int_eq(wire->b, terminal(run + 1, c));
            ck_assert_double_eq_tol(wire->ohms, metres[run] * (c == CPC ? EARTH : LIVE), 1e-15);
            ck_assert_double_eq(wire->metres, metres[run]);
            ck_assert_int_eq(wire->length_parameter, wiring.map.runs + (int)run);
            ck_assert_int_eq(wire->factor_parameter, wiring.map.conductor[c]);
        }
}
END_TEST

START_TEST(fronts_are_where_a_meter_can_be_put)
{
    for (size_t place = 0; place < ring.job.n_places; place++)
        for (enum conductor c = LINE; c < N_CONDUCTORS; c++) {
            bool none = place == OUT || place == IN || place == P3;
            ck_assert_int_eq(wiring.front[terminal(place, c)], none ? -1 : terminal(place, c));
        }
}
END_TEST

/* Each parameter stands once, with its sigma; an unknown run has the wider one. */
START_TEST(parameters_have_their_places)
{
    wiring_finish(&wiring);
    ring.places[P2].run_m = NAN;
    ck_assert_int_eq(wiring_init(&wiring, &ring.job, &models, &error), RF_OK);
    const struct parameter_map *map = &wiring.map;
    ck_assert_int_eq(map->unknown_cpc, NO_PARAMETER);
    ck_assert_int_eq(map->n_common, 8 + 3 + 4);
    ck_assert_int_eq(wiring.n_parameters, map->n_common);
    bool seen[15] = {false};
    for (int run = 0; run < 8; run++) {
        ck_assert_double_eq(wiring.parameters[map->runs + run].sigma, run == 1 ? 0.7 : 0.2);
        seen[map->runs + run] = true;
    }
    ck_assert_double_eq_tol(the_piece(1, LINE)->ohms, 5 * LIVE, 1e-15);
    const int others[] = {map->conductor[LINE],
                          map->conductor[NEUTRAL],
                          map->conductor[CPC],
                          map->gain,
                          map->lead,
                          map->face,
                          map->wander};
    const double sigma[] = {0.02, 0.02, 0.02, 0.01, 0.01, 0.01, 0.03};
    for (int i = 0; i < 7; i++) {
        ck_assert(others[i] >= 0 && others[i] < 15 && !seen[others[i]]);
        seen[others[i]] = true;
        ck_assert_double_eq(wiring.parameters[others[i]].sigma, sigma[i]);
    }
}
END_TEST

/* Not known, the CPC is taken as 1.5 mm² and scales with a parameter of its own. */
START_TEST(unknown_cpc)
{
    wiring_finish(&wiring);
    ring.job.cpc_mm2 = NAN;
    for (size_t place = 0; place < ring.job.n_places; place++)
        ring.places[place].cpc_mm2 = place == P2 ? 2.5 : NAN;
    ck_assert_int_eq(wiring_init(&wiring, &ring.job, &models, &error), RF_OK);
    ck_assert_int_ne(wiring.map.unknown_cpc, NO_PARAMETER);
    ck_assert_double_eq(wiring.parameters[wiring.map.unknown_cpc].sigma, 0.7);
    ck_assert_int_eq(the_piece(0, CPC)->factor_parameter, wiring.map.unknown_cpc);
    ck_assert_double_eq_tol(the_piece(0, CPC)->ohms, 4 * EARTH, 1e-15);
    ck_assert_int_eq(the_piece(0, LINE)->factor_parameter, wiring.map.conductor[LINE]);
    /* The one run whose CPC the record names. */
    ck_assert_int_eq(the_piece(1, CPC)->factor_parameter, wiring.map.conductor[CPC]);
    ck_assert_double_eq_tol(the_piece(1, CPC)->ohms, 6 * LIVE, 1e-15);
}
END_TEST

START_TEST(points_of_their_own_size_and_a_warm_ring)
{
    wiring_finish(&wiring);
    ring.job.temperature_c = 30;
    ring.places[P2].live_mm2 = 4;
    ring.places[S1].live_mm2 = 1.5;
    ring.places[S1].cpc_mm2 = 1;
    ck_assert_int_eq(wiring_init(&wiring, &ring.job, &models, &error), RF_OK);
    const double warm = 1 + 0.00393 * 10;
    ck_assert_double_eq_tol(the_piece(0, LINE)->ohms, 4 * LIVE * warm, 1e-15);
    ck_assert_double_eq_tol(the_piece(1, NEUTRAL)->ohms, 6 * 0.00461 * warm, 1e-15);
    ck_assert_double_eq_tol(the_piece(1, CPC)->ohms, 6 * EARTH * warm, 1e-15);
    ck_assert_double_eq_tol(the_piece(4, LINE)->ohms, 2 * 0.0121 * warm, 1e-15);
    ck_assert_double_eq_tol(the_piece(4, CPC)->ohms, 2 * 0.0181 * warm, 1e-15);
}
END_TEST

/* file, path in it, what was found, what would be right */
static void expect_refused(const char *path, const char *found)
{
    struct wiring refused;
    memset(&error, 0, sizeof error);
    ck_assert_int_eq(wiring_init(&refused, &ring.job, &models, &error), RF_REFUSED);
    ck_assert_int_eq(error.status, RF_REFUSED);
    ck_assert_ptr_nonnull(strstr(error.text, "small-ring.json"));
    ck_assert_msg(strstr(error.text, path) != NULL, "%s", error.text);
    ck_assert_msg(strstr(error.text, found) != NULL, "%s", error.text);
    ck_assert_msg(strstr(error.text, "1, 1.5, 2.5, 4, 6") != NULL, "%s", error.text);
    ck_assert_int_eq(wiring_init(&refused, &ring.job, &models, NULL), RF_REFUSED);
}

START_TEST(sizes_that_are_not_known)
{
    ring.places[P2].live_mm2 = 3.3;
    expect_refused("ring.points[1].live_mm2", "3.3");
    lay();
    ring.places[S2].cpc_mm2 = 0.75;
    expect_refused("ring.spurs[1].cpc_mm2", "0.75");
    lay();
    ring.job.live_mm2 = 7;
    expect_refused("ring.live_mm2", "7");
    lay();
    ring.job.cpc_mm2 = 16;
    expect_refused("ring.cpc_mm2", "16");
}
END_TEST

/* Through every set-up, worked by hand at places 0.4 (P1) and on the spur S2 (2 + 5 m off P2). */
START_TEST(what_each_set_up_reads)
{
    const double ring_live = 22 * LIVE, ring_earth = 22 * EARTH;
    const struct {
        const char *suffix;
        double first, second; /* Ω/m */
    } pairs[] = {{"ln", LIVE, LIVE}, {"le", LIVE, EARTH}, {"ne", LIVE, EARTH}};
    const struct {
        size_t place;
        double tap, off; /* m from out along the ring, m of spur */
    } spots[] = {{P1, 4, 0}, {P2, 10, 0}, {S2, 10, 7}, {S3, 0, 7}, {S4, 22, 1}};
    char name[24];
    ck_assert_double_eq_tol(read_spot("end_to_end", SPOT_L, 0), ring_live, 1e-13);
    ck_assert_double_eq_tol(read_spot("end_to_end", SPOT_N, 0), ring_live, 1e-13);
    ck_assert_double_eq_tol(read_spot("end_to_end", SPOT_E, 0), ring_earth, 1e-13);
    for (size_t p = 0; p < 3; p++) {
        double a = pairs[p].first, b = pairs[p].second, both = a + b;
        for (size_t s = 0; s < 5; s++) {
            double x = spots[s].tap, y = 22 - x, spur = spots[s].off * both;
            double one = a * x + b * y, other = a * y + b * x;
            snprintf(name, sizeof name, "cross_%s", pairs[p].suffix);
            ck_assert_double_eq_tol(read_spot(name, SPOT_POINT, spots[s].place),
                                    one * other / (one + other) + spur, 1e-12);
            snprintf(name, sizeof name, "link_out_%s", pairs[p].suffix);
            ck_assert_double_eq_tol(read_spot(name, SPOT_POINT, spots[s].place), both * x + spur,
                                    1e-12);
            snprintf(name, sizeof name, "link_in_%s", pairs[p].suffix);
            ck_assert_double_eq_tol(read_spot(name, SPOT_POINT, spots[s].place), both * y + spur,
                                    1e-12);
            snprintf(name, sizeof name, "apart_%s", pairs[p].suffix);
            ck_assert_double_lt(read_spot(name, SPOT_OUT, 0), 0);
            ck_assert_double_lt(read_spot(name, SPOT_IN, 0), 0);
            char letter = "lne"[p];
            double per_m = p == 2 ? EARTH : LIVE, alone = spots[s].off * per_m;
            snprintf(name, sizeof name, "lead_out_%c", letter);
            ck_assert_double_eq_tol(read_spot(name, SPOT_POINT, spots[s].place), per_m * x + alone,
                                    1e-12);
            snprintf(name, sizeof name, "lead_in_%c", letter);
            ck_assert_double_eq_tol(read_spot(name, SPOT_POINT, spots[s].place), per_m * y + alone,
                                    1e-12);
        }
        snprintf(name, sizeof name, "cross_%s", pairs[p].suffix);
        ck_assert_double_eq_tol(read_spot(name, SPOT_BOARD, 0), 22 * a * b / both, 1e-12);
        snprintf(name, sizeof name, "link_out_%s", pairs[p].suffix);
        ck_assert_double_eq_tol(read_spot(name, SPOT_IN, 0), 22 * both, 1e-12);
        snprintf(name, sizeof name, "link_in_%s", pairs[p].suffix);
        ck_assert_double_eq_tol(read_spot(name, SPOT_OUT, 0), 22 * both, 1e-12);
    }
}
END_TEST

/* The links as they really are: left out, of some resistance, or joining what they should not. */
START_TEST(links_that_are_not_as_they_should_be)
{
    size_t cross = setup_find("cross_ln"), out = setup_find("link_out_ln"),
           in = setup_find("link_in_le");
    struct edge edges[MOST];
    int wire_of_edge[MOST];
    ck_assert_uint_eq(wiring_join(&wiring, cross, edges, wire_of_edge), 24 + 2);
    ck_assert_uint_eq(wiring_join(&wiring, out, edges, wire_of_edge), 24 + 1);
    ck_assert_uint_eq(wiring_join(&wiring, setup_find("apart_ln"), edges, wire_of_edge), 24);

    wiring.links[out].out = LINK_RESISTIVE;
    wiring.links[out].ohms = 0.5;
    ck_assert_double_eq_tol(read_spot("link_out_ln", SPOT_POINT, P1), 8 * LIVE + 0.5, 1e-13);
    wiring.links[in].in = LINK_OPEN;
    ck_assert_double_lt(read_spot("link_in_le", SPOT_POINT, P1), 0);

    /* cross, the link at the line's out end (with the neutral's in end) left out: from P1's line
     * to in, there the link to the neutral's out, and to P1. */
    wiring.links[cross].out = LINK_OPEN;
    ck_assert_double_eq_tol(read_spot("cross_ln", SPOT_POINT, P1), 18 * LIVE + 4 * LIVE, 1e-13);
    ck_assert_double_eq_tol(read_spot("cross_ln", SPOT_BOARD, 0), 22 * LIVE, 1e-13);
    wiring.links[cross].out = LINK_MADE;
    wiring.links[cross].in = LINK_OPEN;
    ck_assert_double_eq_tol(read_spot("cross_ln", SPOT_POINT, P1), 4 * LIVE + 18 * LIVE, 1e-13);
    wiring.links[cross].in = LINK_RESISTIVE;
    wiring.links[cross].ohms = 0.1;
    ck_assert_double_eq_tol(read_spot("cross_ln", SPOT_POINT, P1),
                            1 / (1 / (22 * LIVE) + 1 / (22 * LIVE + 0.1)), 1e-13);
    wiring.links[cross].in = LINK_MADE;
    wiring.links[cross].not_crossed = true;
    ck_assert_double_eq(read_spot("cross_ln", SPOT_BOARD, 0), 0.0);
    ck_assert_double_eq_tol(read_spot("cross_ln", SPOT_POINT, P1), 8.0 * 36.0 / 44.0 * LIVE, 1e-13);
}
END_TEST

/* Another cable for the whole ring: spurs and points of their own size too, but no resistors. */
START_TEST(another_cable)
{
    wiring_finish(&wiring);
    ring.job.cpc_mm2 = NAN;
    for (size_t place = 0; place < ring.job.n_places; place++)
        ring.places[place].cpc_mm2 = NAN;
    ring.places[P2].live_mm2 = 6;
    ck_assert_int_eq(wiring_init(&wiring, &ring.job, &models, &error), RF_OK);
    wiring_add_resistor(&wiring, terminal(P1, LINE), terminal(P2, CPC), 0.3, NO_PARAMETER);
    wiring_add_cable(&wiring, NEUTRAL, terminal(P1, NEUTRAL), terminal(IN, NEUTRAL), 10, 3);
    wiring_set_cable(&wiring, 4, 2.5);
    for (size_t run = 0; run < 8; run++)
        for (enum conductor c = LINE; c < N_CONDUCTORS; c++) {
            const struct wire *wire = the_piece(run, c);
            ck_assert_double_eq_tol(wire->ohms, wire->metres * (c == CPC ? 0.00741 : 0.00461),
                                    1e-15);
            ck_assert_int_eq(wire->factor_parameter, wiring.map.conductor[c]);
        }
    ck_assert_double_eq(wiring.wires[24].ohms, 0.3);
    ck_assert_double_eq_tol(wiring.wires[25].ohms, 0.0461, 1e-15);
    ck_assert_int_eq(wiring.wires[25].length_parameter, 3);
    ck_assert_int_eq(wiring.wires[25].run, -1);
    wiring_set_cable(&wiring, 4, NAN);
    ck_assert_double_eq_tol(the_piece(0, CPC)->ohms, 4 * EARTH, 1e-15);
    ck_assert_int_eq(the_piece(0, CPC)->factor_parameter, wiring.map.unknown_cpc);
}
END_TEST

/* What lies on a conductor's terminal goes to that conductor's node, even where a run's conductors
 * have changed places; other runs at the place stay. */
START_TEST(an_end_moves)
{
    int nodes[N_CONDUCTORS];
    for (enum conductor c = LINE; c < N_CONDUCTORS; c++) {
        nodes[c] = wiring_add_node(&wiring);
        ck_assert_int_eq(nodes[c], 27 + (int)c);
    }
    struct wire *line = the_piece(1, LINE), *cpc = the_piece(1, CPC);
    line->b = terminal(P2, CPC);
    cpc->b = terminal(P2, LINE);
    wiring_move_end(&wiring, 1, P2, nodes);
    ck_assert_int_eq(line->b, nodes[CPC]);
    ck_assert_int_eq(cpc->b, nodes[LINE]);
    ck_assert_int_eq(the_piece(1, NEUTRAL)->b, nodes[NEUTRAL]);
    ck_assert_int_eq(line->a, terminal(P1, LINE));
    ck_assert_int_eq(the_piece(2, LINE)->a, terminal(P2, LINE));
    ck_assert_int_eq(the_piece(4, LINE)->a, terminal(P2, LINE));
    /* Its near end, and a piece that was taken out. */
    line->a = -1;
    wiring_move_end(&wiring, 1, P1, nodes);
    ck_assert_int_eq(line->a, -1);
    ck_assert_int_eq(cpc->a, nodes[CPC]);
    size_t next = 0;
    ck_assert_ptr_null(wiring_next_piece(&wiring, 1, LINE, &next));
}
END_TEST

START_TEST(a_copy_is_its_own)
{
    struct wiring copy;
    ck_assert_int_eq(wiring_init(&copy, &ring.job, &models, &error), RF_OK);
    int parameter = wiring_add_parameter(&wiring, 1.5);
    ck_assert_int_eq(parameter, wiring.map.n_common);
    wiring_add_resistor(&wiring, 0, 1, 0.05, parameter);
    wiring.links[2].out = LINK_OPEN;
    wiring.front[3] = -1;
    wiring_copy(&copy, &wiring);
    ck_assert_uint_eq(copy.n_wires, 25);
    ck_assert_int_eq(copy.n_parameters, parameter + 1);
    ck_assert_double_eq(copy.parameters[parameter].sigma, 1.5);
    ck_assert_int_eq(copy.links[2].out, LINK_OPEN);
    ck_assert_int_eq(copy.front[3], -1);
    ck_assert_double_eq(copy.wires[24].ohms, 0.05);
    copy.wires[24].ohms = 7;
    copy.front[3] = 3;
    ck_assert_double_eq(wiring.wires[24].ohms, 0.05);
    ck_assert_int_eq(wiring.front[3], -1);
    wiring_finish(&copy);
    wiring_finish(&copy);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("wiring");
    TCase *cases = tcase_create("wiring");
    suite_add_tcase(suite, cases);
    tcase_add_checked_fixture(cases, set_up, tear_down);
    tcase_add_test(cases, every_run_is_three_wires);
    tcase_add_test(cases, fronts_are_where_a_meter_can_be_put);
    tcase_add_test(cases, parameters_have_their_places);
    tcase_add_test(cases, unknown_cpc);
    tcase_add_test(cases, points_of_their_own_size_and_a_warm_ring);
    tcase_add_test(cases, sizes_that_are_not_known);
    tcase_add_test(cases, what_each_set_up_reads);
    tcase_add_test(cases, links_that_are_not_as_they_should_be);
    tcase_add_test(cases, another_cable);
    tcase_add_test(cases, an_end_moves);
    tcase_add_test(cases, a_copy_is_its_own);
    return run_suite(suite);
}
