/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Effective resistances of networks small enough to solve by hand; solving allocates nothing. */
#include "network/loops.h"

#include "../failing.h"
#include "../rings.h"
#include "../suite.h"

#include <check.h>

enum { MOST = 16 };

static struct loops *loops;

static void set_up(void)
{
    fail_at = 0;
    loops = loops_create(MOST, MOST, MOST, MOST);
    ck_assert_ptr_nonnull(loops);
}

static void tear_down(void)
{
    loops_destroy(loops);
}

/* The reading between a and b; r by edge, Ω. */
static double read_between(size_t nodes, const struct edge edges[], size_t n, const double r[],
                           int a, int b)
{
    struct probe probe = {a, b};
    ck_assert_int_eq(loops_analyse(loops, nodes, edges, n, &probe, 1), RF_OK);
    ck_assert(loops_has_path(loops, 0));
    const int *edge_of_column;
    double by_column[MOST], power[MOST], sum = 0.0;
    size_t columns = loops_columns(loops, &edge_of_column);
    ck_assert_uint_le(columns, n);
    for (size_t c = 0; c < columns; c++)
        by_column[c] = r[edge_of_column[c]];
    ck_assert_int_eq(loops_factor(loops, by_column), RF_OK);
    double reading = loops_read(loops, 0, power, NULL);
    for (size_t c = 0; c < columns; c++)
        sum += power[c];
    ck_assert_double_eq_tol(sum, reading, 1e-12);
    ck_assert_double_eq(loops_read(loops, 0, NULL, NULL), reading);
    return reading;
}

START_TEST(series_and_parallel)
{
    const struct edge series[] = {{0, 1, false}, {2, 1, false}};
    const struct edge parallel[] = {{0, 1, false}, {1, 0, false}, {0, 1, false}};
    const double r[] = {2, 3, 6};
    ck_assert_double_eq_tol(read_between(3, series, 2, r, 0, 2), 5.0, 1e-14);
    ck_assert_double_eq_tol(read_between(3, series, 2, r, 2, 0), 5.0, 1e-14);
    ck_assert_double_eq_tol(read_between(2, parallel, 3, r, 0, 1), 1.0, 1e-14);
}
END_TEST

/* Of equal resistances 1 Ω: across an edge of the tetrahedron 1/2, of the cube (its eight corners
 * numbered in binary) 7/12, across a face 3/4, across the cube 5/6: worked by symmetry, a common
 * exercise, no source. */
START_TEST(symmetric_bodies)
{
    struct edge tetrahedron[6], cube[12];
    double ones[12];
    size_t n = 0;
    for (int a = 0; a < 4; a++)
        for (int b = a + 1; b < 4; b++)
            tetrahedron[n++] = (struct edge){a, b, false};
    n = 0;
    for (int a = 0; a < 8; a++)
        for (int bit = 1; bit < 8; bit *= 2)
            if ((a & bit) == 0)
                cube[n++] = (struct edge){a, a + bit, false};
    for (size_t i = 0; i < 12; i++)
        ones[i] = 1.0;
    ck_assert_double_eq_tol(read_between(4, tetrahedron, 6, ones, 1, 3), 0.5, 1e-13);
    ck_assert_double_eq_tol(read_between(8, cube, 12, ones, 0, 1), 7.0 / 12.0, 1e-13);
    ck_assert_double_eq_tol(read_between(8, cube, 12, ones, 0, 3), 0.75, 1e-13);
    ck_assert_double_eq_tol(read_between(8, cube, 12, ones, 0, 7), 5.0 / 6.0, 1e-13);
}
END_TEST

/* An unbalanced bridge by star and delta: the delta 0-1-2 of 1, 2, 3 Ω is a star of 1/2 (at 0), 1/3
 * (at 1), 1 (at 2); behind it 4 and 5 Ω to node 3: 1/2 + (1/3 + 4) ∥ (1 + 5). */
START_TEST(unbalanced_bridge_with_currents)
{
    const struct edge bridge[] = {
        {0, 1, false}, {1, 2, false}, {0, 2, false}, {1, 3, false}, {2, 3, false}};
    const double r[] = {1, 2, 3, 4, 5};
    const double first = 1.0 / 3.0 + 4.0, second = 6.0;
    const double expected = 0.5 + first * second / (first + second);
    ck_assert_double_eq_tol(read_between(4, bridge, 5, r, 0, 3), expected, 1e-13);
    double current[MOST];
    loops_read(loops, 0, NULL, current);
    /* Kirchhoff: 1 A leaves 0, 1 A arrives at 3, nothing gathers between. */
    ck_assert_double_eq_tol(current[0] + current[2], 1.0, 1e-13);
    ck_assert_double_eq_tol(current[3] + current[4], 1.0, 1e-13);
    ck_assert_double_eq_tol(current[0], current[1] + current[3], 1e-13);
    ck_assert_double_eq_tol(current[3], second / (first + second), 1e-13);
    /* … and no voltage around a loop. */
    ck_assert_double_eq_tol(r[0] * current[0] + r[1] * current[1], r[2] * current[2], 1e-13);
}
END_TEST

/* Links join nodes, alone, in loops of nothing but links, and across an edge of resistance. */
START_TEST(links_join_nodes)
{
    const struct edge edges[] = {{0, 1, false}, {1, 2, true},  {2, 3, true}, {3, 1, true},
                                 {3, 4, false}, {1, 2, false}, {4, 4, true}};
    const double r[] = {2, 0, 0, 0, 3, 7, 0};
    ck_assert_double_eq_tol(read_between(5, edges, 7, r, 0, 4), 5.0, 1e-14);
    const int *edge_of_column;
    ck_assert_uint_eq(loops_columns(loops, &edge_of_column), 2);
    ck_assert_int_eq(edge_of_column[0], 0);
    ck_assert_int_eq(edge_of_column[1], 4);
    /* Across links only: a path, 0 Ω. */
    ck_assert_double_eq(read_between(5, edges, 7, r, 1, 3), 0.0);
    ck_assert_double_eq(read_between(5, edges, 7, r, 2, 2), 0.0);
}
END_TEST

START_TEST(a_loop_on_one_node_carries_nothing)
{
    const struct edge edges[] = {{0, 0, false}, {0, 1, false}, {1, 1, false}};
    const double r[] = {9, 4, 9};
    ck_assert_double_eq_tol(read_between(2, edges, 3, r, 0, 1), 4.0, 1e-14);
    ck_assert_uint_eq(loops_columns(loops, NULL), 1);
}
END_TEST

/* Two triangles and a lone node; only what a probe reads becomes a column. */
START_TEST(several_components)
{
    const struct edge edges[] = {{0, 1, false}, {1, 2, false}, {2, 0, false},
                                 {3, 4, false}, {4, 5, false}, {5, 3, false}};
    const struct probe probes[] = {{0, 1}, {0, 3}, {3, 4}, {6, 0}, {6, 6}};
    double ones[6] = {1, 1, 1, 1, 1, 1};
    ck_assert_int_eq(loops_analyse(loops, 7, edges, 6, probes, 5), RF_OK);
    ck_assert(loops_has_path(loops, 0));
    ck_assert(!loops_has_path(loops, 1));
    ck_assert(loops_has_path(loops, 2));
    ck_assert(!loops_has_path(loops, 3));
    ck_assert(loops_has_path(loops, 4));
    ck_assert_uint_eq(loops_columns(loops, NULL), 6);
    ck_assert_int_eq(loops_factor(loops, ones), RF_OK);
    ck_assert_double_eq_tol(loops_read(loops, 0, NULL, NULL), 2.0 / 3.0, 1e-14);
    ck_assert_double_eq_tol(loops_read(loops, 2, NULL, NULL), 2.0 / 3.0, 1e-14);
    ck_assert_double_eq(loops_read(loops, 1, NULL, NULL), 0.0);
    ck_assert_double_eq(loops_read(loops, 4, NULL, NULL), 0.0);

    ck_assert_int_eq(loops_analyse(loops, 7, edges, 6, &probes[2], 1), RF_OK);
    const int *edge_of_column;
    ck_assert_uint_eq(loops_columns(loops, &edge_of_column), 3);
    ck_assert_int_eq(edge_of_column[0], 3);
}
END_TEST

START_TEST(no_edges_at_all)
{
    const struct probe probes[] = {{0, 1}, {1, 1}};
    const double none[1] = {0};
    ck_assert_int_eq(loops_analyse(loops, 2, NULL, 0, probes, 2), RF_OK);
    ck_assert(!loops_has_path(loops, 0));
    ck_assert(loops_has_path(loops, 1));
    ck_assert_uint_eq(loops_columns(loops, NULL), 0);
    ck_assert_int_eq(loops_factor(loops, none), RF_OK);
    ck_assert_double_eq(loops_read(loops, 0, NULL, NULL), 0.0);
}
END_TEST

/* In a loop and in the tree alone; never does a wrong number come back instead. */
START_TEST(refuses_resistances)
{
    const struct edge edges[] = {{0, 1, false}, {0, 1, false}, {1, 2, false}};
    const struct probe probe = {0, 2};
    const double bad[] = {0.0, -1.0, NAN, INFINITY, -INFINITY};
    ck_assert_int_eq(loops_analyse(loops, 3, edges, 3, &probe, 1), RF_OK);
    for (size_t at = 0; at < 3; at++)
        for (size_t i = 0; i < sizeof bad / sizeof *bad; i++) {
            double r[] = {1, 5, 1};
            r[at] = bad[i];
            ck_assert_msg(loops_factor(loops, r) == RF_NUMERICAL, "%g Ω in edge %zu passed", bad[i],
                          at);
        }
    const double good[] = {1, 5, 1};
    ck_assert_int_eq(loops_factor(loops, good), RF_OK);
    ck_assert_double_eq_tol(loops_read(loops, 0, NULL, NULL), 5.0 / 6.0 + 1.0, 1e-14);
}
END_TEST

START_TEST(says_when_the_workspace_is_too_small)
{
    const struct edge edges[] = {{0, 1, false}, {1, 2, false}, {2, 0, false}, {0, 1, false}};
    const struct probe probes[] = {{0, 1}, {1, 2}};
    const size_t enough[] = {3, 4, 2, 2}; /* nodes, edges, probes, loops */
    for (size_t less = 0; less <= 4; less++) {
        size_t size[4];
        for (size_t i = 0; i < 4; i++)
            size[i] = enough[i] - (i == less);
        struct loops *small = loops_create(size[0], size[1], size[2], size[3]);
        ck_assert_ptr_nonnull(small);
        ck_assert_int_eq(loops_analyse(small, 3, edges, 4, probes, 2),
                         less == 4 ? RF_OK : RF_NUMERICAL);
        loops_destroy(small);
    }
}
END_TEST

START_TEST(solving_allocates_nothing)
{
    const struct edge edges[] = {{0, 1, false}, {1, 2, true}, {2, 0, false}, {0, 3, false}};
    const struct probe probes[] = {{0, 1}, {3, 2}};
    double power[4], current[4], r[] = {1, 2, 3};
    ck_assert_uint_gt(allocations, 0); /* loops_create's: the counter counts */
    size_t before = allocations;       /* Check's own calls allocate: none from here … */
    enum rf_status status[3];
    for (int round = 0; round < 3; round++) {
        status[0] = loops_analyse(loops, 4, edges, 4, probes, 2);
        status[1] = loops_factor(loops, r);
        loops_read(loops, 0, power, current);
        loops_read(loops, 1, power, NULL);
        r[1] = -r[1];
        status[2] = loops_factor(loops, r);
        r[1] = -r[1];
    }
    size_t after = allocations; /* … to here */
    ck_assert_uint_eq(after, before);
    ck_assert(status[0] == RF_OK && status[1] == RF_OK && status[2] == RF_NUMERICAL);
}
END_TEST

/* Each allocation fails in turn; address sanitizer or valgrind see what would be left behind. */
START_TEST(survives_short_memory)
{
    size_t before = allocations;
    struct loops *whole = loops_create(4, 4, 4, 4);
    size_t needed = allocations - before;
    ck_assert_ptr_nonnull(whole);
    loops_destroy(whole);
    ck_assert_uint_gt(needed, 1);
    for (size_t i = 1; i <= needed; i++) {
        fail_at = allocations + i;
        struct loops *made = loops_create(4, 4, 4, 4);
        fail_at = 0;
        ck_assert_ptr_null(made);
    }
    loops_destroy(NULL);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("loops");
    TCase *cases = tcase_create("loops");
    suite_add_tcase(suite, cases);
    tcase_add_checked_fixture(cases, set_up, tear_down);
    tcase_add_test(cases, series_and_parallel);
    tcase_add_test(cases, symmetric_bodies);
    tcase_add_test(cases, unbalanced_bridge_with_currents);
    tcase_add_test(cases, links_join_nodes);
    tcase_add_test(cases, a_loop_on_one_node_carries_nothing);
    tcase_add_test(cases, several_components);
    tcase_add_test(cases, no_edges_at_all);
    tcase_add_test(cases, refuses_resistances);
    tcase_add_test(cases, says_when_the_workspace_is_too_small);
    tcase_add_test(cases, solving_allocates_nothing);
    tcase_add_test(cases, survives_short_memory);
    return run_suite(suite);
}
