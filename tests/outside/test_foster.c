/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * Theorems that hold for every network of resistors, tried on seeded random ones with links,
 * parallel edges, self loops and several components.
 */
#include "network/loops.h"

#include "../rings.h"
#include "../suite.h"

#include <check.h>

enum { NODES = 12, EDGES = 26, NETWORKS = 300 };

struct network {
    size_t nodes, n;
    struct edge edges[EDGES];
    double r[EDGES];
    int group[NODES];     /* nodes that links join have one group */
    int component[NODES]; /* … and that any edges join, one component */
};

/* Repeated relabelling: slow and plain, on purpose not the way of the code under test. */
static void relabel(const struct network *network, int label[NODES], bool links_only)
{
    for (size_t v = 0; v < network->nodes; v++)
        label[v] = (int)v;
    for (bool changed = true; changed;) {
        changed = false;
        for (size_t e = 0; e < network->n; e++) {
            const struct edge *edge = &network->edges[e];
            int *a = &label[edge->a], *b = &label[edge->b];
            if ((links_only && !edge->zero) || *a == *b)
                continue;
            *a = *b = *a < *b ? *a : *b;
            changed = true;
        }
    }
}

static void draw(struct network *network, uint64_t *seed)
{
    network->nodes = 2 + random_below(seed, NODES - 1);
    network->n = 1 + random_below(seed, EDGES);
    for (size_t e = 0; e < network->n; e++) {
        network->edges[e].a = (int)random_below(seed, network->nodes);
        network->edges[e].b = (int)random_below(seed, network->nodes);
        network->edges[e].zero = random_unit(seed) < 0.1;
        network->r[e] = random_between(seed, 1e-3, 1e2);
    }
    relabel(network, network->group, true);
    relabel(network, network->component, false);
}

static struct loops *loops;
static uint64_t seed;

static void set_up(void)
{
    seed = 1949;
    loops = loops_create(NODES, EDGES, EDGES, EDGES);
    ck_assert_ptr_nonnull(loops);
}

static void tear_down(void)
{
    loops_destroy(loops);
}

/* A probe across every edge. */
static void analyse(const struct network *network)
{
    struct probe probes[EDGES];
    for (size_t e = 0; e < network->n; e++)
        probes[e] = (struct probe){network->edges[e].a, network->edges[e].b};
    ck_assert_int_eq(
        loops_analyse(loops, network->nodes, network->edges, network->n, probes, network->n),
        RF_OK);
}

static void factor(const double r_of_edge[])
{
    const int *edge_of_column;
    double r[EDGES];
    size_t columns = loops_columns(loops, &edge_of_column);
    for (size_t c = 0; c < columns; c++)
        r[c] = r_of_edge[edge_of_column[c]];
    ck_assert_int_eq(loops_factor(loops, r), RF_OK);
}

/* R. M. Foster, "The average impedance of an electrical network", 1949: over the edges of a
 * connected network, Σ R_e / r_e = nodes − 1, R_e being the resistance across edge e. */
START_TEST(foster)
{
    size_t several = 0;
    for (int i = 0; i < NETWORKS; i++) {
        struct network network;
        double sum[NODES] = {0};
        int groups[NODES] = {0}, found = 0;
        draw(&network, &seed);
        analyse(&network);
        factor(network.r);
        for (size_t e = 0; e < network.n; e++)
            if (!network.edges[e].zero)
                sum[network.component[network.edges[e].a]] +=
                    loops_read(loops, e, NULL, NULL) / network.r[e];
        for (size_t v = 0; v < network.nodes; v++)
            if (network.group[v] == (int)v)
                groups[network.component[v]]++;
        for (size_t v = 0; v < network.nodes; v++)
            if (network.component[v] == (int)v) {
                ck_assert_double_eq_tol(sum[v], groups[v] - 1, 1e-9);
                found += groups[v] > 1;
            }
        several += found > 1;
    }
    ck_assert_uint_gt(several, NETWORKS / 20); /* the draw was not all of one component */
}
END_TEST

/* ∂R/∂(log r_e) = r_e i_e² (Cohn's theorem) against central differences. */
START_TEST(powers_are_the_sensitivities)
{
    const double h = 1e-4;
    for (int i = 0; i < NETWORKS / 5; i++) {
        struct network network;
        const int *edge_of_column;
        double power[EDGES];
        draw(&network, &seed);
        analyse(&network);
        size_t columns = loops_columns(loops, &edge_of_column);
        for (size_t probe = 0; probe < network.n; probe++)
            for (size_t c = 0; c < columns; c++) {
                double r[EDGES], value[2];
                memcpy(r, network.r, sizeof r);
                for (int side = 0; side < 2; side++) {
                    r[edge_of_column[c]] = network.r[edge_of_column[c]] * exp(side ? h : -h);
                    factor(r);
                    value[side] = loops_read(loops, probe, NULL, NULL);
                }
                factor(network.r);
                double reading = loops_read(loops, probe, power, NULL);
                ck_assert_double_eq_tol(power[c], (value[1] - value[0]) / (2 * h),
                                        1e-7 * (reading + 1e-6));
            }
    }
}
END_TEST

/* Reciprocity, in any handbook of networks (from memory): 1 A through probe e makes the
 * voltage across f that 1 A through f makes across e. */
START_TEST(reciprocity)
{
    for (int i = 0; i < NETWORKS; i++) {
        struct network network;
        const int *edge_of_column;
        static double voltage[EDGES][EDGES];
        memset(voltage, 0, sizeof voltage);
        draw(&network, &seed);
        analyse(&network);
        factor(network.r);
        size_t columns = loops_columns(loops, &edge_of_column);
        for (size_t e = 0; e < network.n; e++) {
            double current[EDGES] = {0};
            double own = loops_read(loops, e, NULL, current);
            for (size_t c = 0; c < columns; c++)
                voltage[e][edge_of_column[c]] = current[c] * network.r[edge_of_column[c]];
            if (!network.edges[e].zero)
                ck_assert_double_eq_tol(voltage[e][e], own, 1e-10 * (own + 1));
        }
        for (size_t e = 0; e < network.n; e++)
            for (size_t f = 0; f < e; f++)
                if (!network.edges[e].zero && !network.edges[f].zero)
                    ck_assert_double_eq_tol(voltage[e][f], voltage[f][e], 1e-10);
    }
}
END_TEST

/* Rayleigh's law: more resistance anywhere, or an edge cut, lowers no reading; a short raises none
 * (P. G. Doyle and J. L. Snell, "Random Walks and Electric Networks", 1984). */
START_TEST(rayleigh)
{
    for (int i = 0; i < NETWORKS; i++) {
        struct network network, cut, shorted;
        double before[EDGES], r[EDGES];
        draw(&network, &seed);
        analyse(&network);
        factor(network.r);
        for (size_t e = 0; e < network.n; e++)
            before[e] = loops_read(loops, e, NULL, NULL);
        size_t changed = random_below(&seed, network.n);
        memcpy(r, network.r, sizeof r);
        r[changed] *= 3;
        factor(r);
        for (size_t e = 0; e < network.n; e++)
            ck_assert_double_ge(loops_read(loops, e, NULL, NULL), before[e] * (1 - 1e-12));

        shorted = network;
        shorted.edges[changed].zero = true;
        analyse(&shorted);
        factor(network.r);
        for (size_t e = 0; e < network.n; e++)
            ck_assert_double_le(loops_read(loops, e, NULL, NULL), before[e] * (1 + 1e-12));

        cut = network;
        cut.edges[changed].b = cut.edges[changed].a;
        analyse(&cut);
        factor(network.r);
        for (size_t e = 0; e < network.n; e++)
            if (e != changed && loops_has_path(loops, e))
                ck_assert_double_ge(loops_read(loops, e, NULL, NULL), before[e] * (1 - 1e-12));
    }
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("foster");
    TCase *cases = tcase_create("foster");
    suite_add_tcase(suite, cases);
    tcase_add_checked_fixture(cases, set_up, tear_down);
    tcase_set_timeout(cases, 60);
    tcase_add_test(cases, foster);
    tcase_add_test(cases, powers_are_the_sensitivities);
    tcase_add_test(cases, reciprocity);
    tcase_add_test(cases, rayleigh);
    return run_suite(suite);
}
