/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "network/loops.h"

#include "base/cholesky.h"
#include "base/memory.h"

#include <math.h>
#include <string.h>

/*
 * Supernodes are the nodes after links are contracted, found by union and find. Columns are the
 * edges of those components that some probe reads; C and the paths p are dense rows over them,
 * floats because their entries are −1, 0 and 1 and the rows are read whole.
 */
struct loops {
    size_t max_nodes, max_edges, max_probes, max_loops;

    /* scratch of the analysis */
    int *leader;         /* [node] union-find, then its supernode */
    int *parent, *depth; /* [supernode] tree; parent −1 at a root */
    int *parent_edge;    /* [supernode] the edge towards the parent */
    signed char *parent_sign; /* +1: that edge runs from the supernode to its parent */
    int *component;      /* [supernode] its root */
    int *first, *next;   /* adjacency: [supernode] and [2·edge] lists of half edges */
    int *queue;
    unsigned char *in_tree; /* [edge] */
    unsigned char *wanted;  /* [supernode] a root: some probe reads its component */

    /* the analysis */
    size_t n_columns, n_loops, n_probes;
    int *edge_of_column;
    int *column_of_edge;
    float *loop_rows;    /* n_loops × n_columns: C */
    float *probe_rows;   /* n_probes × n_columns: p */
    unsigned char *path; /* [probe] */

    /* the numbers */
    double *r;         /* [column] */
    double *weighted;  /* n_loops × n_columns: C D */
    double *factor;    /* n_loops × n_loops: Cholesky factor of C D Cᵀ */
    double *loop_flow; /* [loop] */
    double *flow;      /* [column] */
    double *power;     /* [column] */
};

void loops_destroy(struct loops *loops)
{
    if (loops == NULL)
        return;
    free(loops->leader);
    free(loops->parent);
    free(loops->depth);
    free(loops->parent_edge);
    free(loops->parent_sign);
    free(loops->component);
    free(loops->first);
    free(loops->next);
    free(loops->queue);
    free(loops->in_tree);
    free(loops->wanted);
    free(loops->edge_of_column);
    free(loops->column_of_edge);
    free(loops->loop_rows);
    free(loops->probe_rows);
    free(loops->path);
    free(loops->r);
    free(loops->weighted);
    free(loops->factor);
    free(loops->loop_flow);
    free(loops->flow);
    free(loops->power);
    free(loops);
}

struct loops *loops_create(size_t nodes, size_t edges, size_t probes, size_t n_loops)
{
    struct loops *l = NEW(struct loops);
    if (l == NULL)
        return NULL;
    l->max_nodes = nodes;
    l->max_edges = edges;
    l->max_probes = probes;
    l->max_loops = n_loops;
    l->leader = NEW_ARRAY(int, nodes);
    l->parent = NEW_ARRAY(int, nodes);
    l->depth = NEW_ARRAY(int, nodes);
    l->parent_edge = NEW_ARRAY(int, nodes);
    l->parent_sign = NEW_ARRAY(signed char, nodes);
    l->component = NEW_ARRAY(int, nodes);
    l->first = NEW_ARRAY(int, nodes);
    l->next = NEW_ARRAY(int, 2 * edges);
    l->queue = NEW_ARRAY(int, nodes);
    l->in_tree = NEW_ARRAY(unsigned char, edges);
    l->wanted = NEW_ARRAY(unsigned char, nodes);
    l->edge_of_column = NEW_ARRAY(int, edges);
    l->column_of_edge = NEW_ARRAY(int, edges);
    l->loop_rows = NEW_ARRAY(float, n_loops * edges);
    l->probe_rows = NEW_ARRAY(float, probes * edges);
    l->path = NEW_ARRAY(unsigned char, probes);
    l->r = NEW_ARRAY(double, edges);
    l->weighted = NEW_ARRAY(double, n_loops * edges);
    l->factor = NEW_ARRAY(double, n_loops * n_loops);
    l->loop_flow = NEW_ARRAY(double, n_loops);
    l->flow = NEW_ARRAY(double, edges);
    l->power = NEW_ARRAY(double, edges);
    if (l->leader == NULL || l->parent == NULL || l->depth == NULL || l->parent_edge == NULL ||
        l->parent_sign == NULL || l->component == NULL || l->first == NULL || l->next == NULL ||
        l->queue == NULL || l->in_tree == NULL || l->wanted == NULL ||
        l->edge_of_column == NULL || l->column_of_edge == NULL || l->loop_rows == NULL ||
        l->probe_rows == NULL || l->path == NULL || l->r == NULL || l->weighted == NULL ||
        l->factor == NULL || l->loop_flow == NULL || l->flow == NULL || l->power == NULL) {
        loops_destroy(l);
        return NULL;
    }
    return l;
}

static int find_leader(int *leader, int node)
{
    while (leader[node] != node) {
        leader[node] = leader[leader[node]];
        node = leader[node];
    }
    return node;
}

/* Joins nodes across edges without resistance; leader[node] becomes the supernode. */
static void contract(struct loops *l, size_t nodes, const struct edge edges[], size_t n_edges)
{
    for (size_t v = 0; v < nodes; v++)
        l->leader[v] = (int)v;
    for (size_t e = 0; e < n_edges; e++)
        if (edges[e].zero) {
            int a = find_leader(l->leader, edges[e].a), b = find_leader(l->leader, edges[e].b);
            l->leader[a > b ? a : b] = a > b ? b : a;
        }
    for (size_t v = 0; v < nodes; v++)
        l->leader[v] = find_leader(l->leader, (int)v);
}

/* Half edge 2e leaves edge e's a, half edge 2e+1 its b. Loops within one supernode carry nothing
 * and stay out. */
static void list_neighbours(struct loops *l, size_t nodes, const struct edge edges[],
                            size_t n_edges)
{
    for (size_t v = 0; v < nodes; v++)
        l->first[v] = -1;
    for (size_t e = n_edges; e-- > 0;) {
        int a = l->leader[edges[e].a], b = l->leader[edges[e].b];
        if (edges[e].zero || a == b)
            continue;
        l->next[2 * e + 1] = l->first[b];
        l->first[b] = (int)(2 * e + 1);
        l->next[2 * e] = l->first[a];
        l->first[a] = (int)(2 * e);
    }
}

/* Breadth first, so that paths stay short.  */
static void grow_tree(struct loops *l, int root, const struct edge edges[])
{
    size_t head = 0, tail = 0;
    l->parent[root] = -1;
    l->depth[root] = 0;
    l->component[root] = root;
    l->queue[tail++] = root;
    while (head < tail) {
        int v = l->queue[head++];
        for (int half = l->first[v]; half >= 0; half = l->next[half]) {
            int e = half / 2;
            bool from_a = half % 2 == 0;
            int w = l->leader[from_a ? edges[e].b : edges[e].a];
            if (l->component[w] >= 0)
                continue;
            l->component[w] = root;
            l->parent[w] = v;
            l->depth[w] = l->depth[v] + 1;
            l->parent_edge[w] = e;
            l->parent_sign[w] = from_a ? -1 : 1;
            l->in_tree[e] = 1;
            l->queue[tail++] = w;
        }
    }
}

static void grow_forest(struct loops *l, size_t nodes, const struct edge edges[], size_t n_edges)
{
    memset(l->in_tree, 0, n_edges);
    for (size_t v = 0; v < nodes; v++)
        l->component[v] = -1;
    for (size_t v = 0; v < nodes; v++)
        if (l->leader[v] == (int)v && l->component[v] < 0)
            grow_tree(l, (int)v, edges);
}

static void mark_paths(struct loops *l, size_t nodes, const struct probe probes[], size_t n_probes)
{
    memset(l->wanted, 0, nodes);
    l->n_probes = n_probes;
    for (size_t i = 0; i < n_probes; i++) {
        int a = l->leader[probes[i].a], b = l->leader[probes[i].b];
        l->path[i] = l->component[a] == l->component[b];
        if (l->path[i] && a != b)
            l->wanted[l->component[a]] = 1;
    }
}

/* Numbers the columns and counts the loops. */
static void choose_columns(struct loops *l, const struct edge edges[], size_t n_edges)
{
    l->n_columns = l->n_loops = 0;
    for (size_t e = 0; e < n_edges; e++) {
        int a = l->leader[edges[e].a], b = l->leader[edges[e].b];
        l->column_of_edge[e] = -1;
        if (edges[e].zero || a == b || !l->wanted[l->component[a]])
            continue;
        l->column_of_edge[e] = (int)l->n_columns;
        l->edge_of_column[l->n_columns++] = (int)e;
        l->n_loops += !l->in_tree[e];
    }
}

/* Adds the signed tree path from supernode a to b to a row over the columns. */
static void add_tree_path(const struct loops *l, int a, int b, float *row)
{
    while (a != b) {
        if (l->depth[a] >= l->depth[b]) {
            row[l->column_of_edge[l->parent_edge[a]]] += (float)l->parent_sign[a];
            a = l->parent[a];
        } else {
            row[l->column_of_edge[l->parent_edge[b]]] -= (float)l->parent_sign[b];
            b = l->parent[b];
        }
    }
}

/* Each edge beside the tree closes one loop: along it, and back through the tree. */
static void write_loops(struct loops *l, const struct edge edges[])
{
    size_t n = l->n_columns, k = 0;
    memset(l->loop_rows, 0, l->n_loops * n * sizeof *l->loop_rows);
    for (size_t c = 0; c < n; c++) {
        int e = l->edge_of_column[c];
        if (l->in_tree[e])
            continue;
        float *row = l->loop_rows + k++ * n;
        row[c] = 1.0F;
        add_tree_path(l, l->leader[edges[e].b], l->leader[edges[e].a], row);
    }
}

static void write_paths(struct loops *l, const struct probe probes[])
{
    size_t n = l->n_columns;
    memset(l->probe_rows, 0, l->n_probes * n * sizeof *l->probe_rows);
    for (size_t i = 0; i < l->n_probes; i++)
        if (l->path[i])
            add_tree_path(l, l->leader[probes[i].a], l->leader[probes[i].b],
                          l->probe_rows + i * n);
}

enum rf_status loops_analyse(struct loops *l, size_t nodes, const struct edge edges[],
                             size_t n_edges, const struct probe probes[], size_t n_probes)
{
    if (nodes > l->max_nodes || n_edges > l->max_edges || n_probes > l->max_probes)
        return RF_NUMERICAL;
    contract(l, nodes, edges, n_edges);
    list_neighbours(l, nodes, edges, n_edges);
    grow_forest(l, nodes, edges, n_edges);
    mark_paths(l, nodes, probes, n_probes);
    choose_columns(l, edges, n_edges);
    if (l->n_loops > l->max_loops)
        return RF_NUMERICAL;
    write_loops(l, edges);
    write_paths(l, probes);
    return RF_OK;
}

bool loops_has_path(const struct loops *l, size_t probe)
{
    return l->path[probe];
}

size_t loops_columns(const struct loops *l, const int **edge_of_column)
{
    if (edge_of_column != NULL)
        *edge_of_column = l->edge_of_column;
    return l->n_columns;
}

/* Σ a_c b_c. Four sums, so that additions need not wait for one another. */
static double dot(const double *restrict a, const float *restrict b, size_t n)
{
    double s0 = 0.0, s1 = 0.0, s2 = 0.0, s3 = 0.0;
    size_t c = 0;
    for (; c + 4 <= n; c += 4) {
        s0 += a[c] * b[c];
        s1 += a[c + 1] * b[c + 1];
        s2 += a[c + 2] * b[c + 2];
        s3 += a[c + 3] * b[c + 3];
    }
    for (; c < n; c++)
        s0 += a[c] * b[c];
    return (s0 + s1) + (s2 + s3);
}

enum rf_status loops_factor(struct loops *l, const double r[])
{
    size_t n = l->n_columns, k = l->n_loops;
    /* Outside every loop a bad one would not show in the matrix. */
    for (size_t c = 0; c < n; c++) {
        if (!(r[c] > 0.0) || !isfinite(r[c]))
            return RF_NUMERICAL;
        l->r[c] = r[c];
    }
    for (size_t i = 0; i < k; i++) {
        const float *row = l->loop_rows + i * n;
        double *weighted = l->weighted + i * n;
        for (size_t c = 0; c < n; c++)
            weighted[c] = row[c] * r[c];
        for (size_t j = 0; j <= i; j++)
            l->factor[j * k + i] = dot(weighted, l->loop_rows + j * n, n);
    }
    return cholesky_factor(l->factor, k, k) ? RF_OK : RF_NUMERICAL;
}

/* Loop currents for 1 A along the probe's tree path: (C D Cᵀ)⁻¹ C D p. */
static void solve_loops(struct loops *l, const float *path)
{
    size_t n = l->n_columns, k = l->n_loops;
    for (size_t i = 0; i < k; i++)
        l->loop_flow[i] = dot(l->weighted + i * n, path, n);
    cholesky_solve(l->factor, k, k, l->loop_flow);
}

/* i = p − Cᵀ · loop currents, row by row: each pass is over neighbours in memory. */
static void add_flows(const struct loops *l, const float *restrict path, double *restrict flow)
{
    size_t n = l->n_columns;
    for (size_t c = 0; c < n; c++)
        flow[c] = path[c];
    for (size_t k = 0; k < l->n_loops; k++) {
        const float *restrict row = l->loop_rows + k * n;
        double loop_flow = l->loop_flow[k];
        for (size_t c = 0; c < n; c++)
            flow[c] -= row[c] * loop_flow;
    }
}

/* r_c i_c² in every column, and their sum. */
static double dissipate(const double *restrict r, const double *restrict flow,
                        double *restrict power, size_t n)
{
    double s0 = 0.0, s1 = 0.0;
    size_t c = 0;
    for (; c + 2 <= n; c += 2) {
        power[c] = r[c] * flow[c] * flow[c];
        power[c + 1] = r[c + 1] * flow[c + 1] * flow[c + 1];
        s0 += power[c];
        s1 += power[c + 1];
    }
    if (c < n) {
        power[c] = r[c] * flow[c] * flow[c];
        s0 += power[c];
    }
    return s0 + s1;
}

double loops_read(struct loops *l, size_t probe, double power[], double current[])
{
    const float *path = l->probe_rows + probe * l->n_columns;
    if (!l->path[probe])
        return 0.0;
    solve_loops(l, path);
    double *flow = current != NULL ? current : l->flow;
    add_flows(l, path, flow);
    return dissipate(l->r, flow, power != NULL ? power : l->power, l->n_columns);
}
