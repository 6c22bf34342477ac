/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "network/loops.h"

#include "base/cholesky.h"
#include "base/memory.h"

#include <math.h>
#include <string.h>

/*
 * Supernodes are the nodes after links are contracted, found by union and find. Columns are the
 * edges of those components that some probe reads. The way from a supernode to the root of its tree
 * is kept as tails: columns in a row that it passes in one direction, then the way of the supernode
 * where they end. In a ring, whose edges are numbered along it, that is one tail or two, whatever the
 * number of points. C is dense, but told apart by sections: columns in a row, alike in every loop.
 */
struct tail {
    size_t from, to; /* columns; none at a root */
    int sign;        /* +1: passed from a to b */
    int next;        /* supernode */
};

/* A loop that passes a section, +1: from a to b. */
struct member {
    size_t loop;
    double sign;
};

/* A row over the columns that changes by `by` at `column`. */
struct change {
    size_t column;
    int by;
};

struct loops {
    size_t max_nodes, max_edges, max_probes, max_loops;

    /* scratch of the analysis */
    int *leader;              /* [node] union-find, then its supernode */
    int *parent;              /* [supernode] tree; −1 at a root */
    int *parent_edge;         /* [supernode] the edge towards the parent */
    signed char *parent_sign; /* +1: that edge runs from the supernode to its parent */
    int *component;           /* [supernode] its root */
    int *first, *next;        /* adjacency: [supernode] and [2·edge] lists of half edges */
    int *queue;               /* supernodes, each after its parent */
    size_t n_queue;
    struct tail *tail;      /* [supernode] */
    unsigned char *in_tree; /* [edge] */
    unsigned char *wanted;  /* [supernode] a root: some probe reads its component */
    unsigned char *starts;  /* [column] a section may start there */
    struct change *changes;
    size_t n_changes;

    /* the analysis */
    size_t n_columns, n_loops, n_probes, n_sections;
    int *edge_of_column;
    int *column_of_edge;
    signed char *loop_rows; /* n_loops × n_columns: C */
    size_t *section_from;   /* [section], and n_columns behind the last */
    size_t *member_first;   /* [section], and the end behind the last */
    struct member *members; /* the loops each section lies in */
    size_t *stretch_first;  /* [probe], and the end behind the last */
    struct stretch *stretches;
    unsigned char *path; /* [probe] */

    /* the numbers */
    double *r;              /* [column] */
    double *up_to;          /* [column] Σ r of the columns before it; and of all behind the last */
    double *factor;         /* n_loops × n_loops: Cholesky factor of C D Cᵀ */
    double *loop_flow;      /* [loop] */
    double *ohms, *current; /* [stretch of one probe] */
};

void loops_destroy(struct loops *loops)
{
    if (loops == NULL)
        return;
    free(loops->leader);
    free(loops->parent);
    free(loops->parent_edge);
    free(loops->parent_sign);
    free(loops->component);
    free(loops->first);
    free(loops->next);
    free(loops->queue);
    free(loops->tail);
    free(loops->in_tree);
    free(loops->wanted);
    free(loops->starts);
    free(loops->changes);
    free(loops->edge_of_column);
    free(loops->column_of_edge);
    free(loops->loop_rows);
    free(loops->section_from);
    free(loops->member_first);
    free(loops->members);
    free(loops->stretch_first);
    free(loops->stretches);
    free(loops->path);
    free(loops->r);
    free(loops->up_to);
    free(loops->factor);
    free(loops->loop_flow);
    free(loops->ohms);
    free(loops->current);
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
    l->parent_edge = NEW_ARRAY(int, nodes);
    l->parent_sign = NEW_ARRAY(signed char, nodes);
    l->component = NEW_ARRAY(int, nodes);
    l->first = NEW_ARRAY(int, nodes);
    l->next = NEW_ARRAY(int, 2 * edges);
    l->queue = NEW_ARRAY(int, nodes);
    l->tail = NEW_ARRAY(struct tail, nodes);
    l->in_tree = NEW_ARRAY(unsigned char, edges);
    l->wanted = NEW_ARRAY(unsigned char, nodes);
    l->starts = NEW_ARRAY(unsigned char, edges + 1);
    l->changes = NEW_ARRAY(struct change, 4 * edges);
    l->edge_of_column = NEW_ARRAY(int, edges);
    l->column_of_edge = NEW_ARRAY(int, edges);
    l->loop_rows = NEW_ARRAY(signed char, n_loops * edges);
    l->section_from = NEW_ARRAY(size_t, edges + 1);
    l->member_first = NEW_ARRAY(size_t, edges + 1);
    l->members = NEW_ARRAY(struct member, n_loops * edges);
    l->stretch_first = NEW_ARRAY(size_t, probes + 1);
    l->stretches = NEW_ARRAY(struct stretch, probes * edges);
    l->path = NEW_ARRAY(unsigned char, probes);
    l->r = NEW_ARRAY(double, edges);
    l->up_to = NEW_ARRAY(double, edges + 1);
    l->factor = NEW_ARRAY(double, n_loops * n_loops);
    l->loop_flow = NEW_ARRAY(double, n_loops + 2); /* two are always read */
    l->ohms = NEW_ARRAY(double, edges);
    l->current = NEW_ARRAY(double, edges);
    if (l->leader == NULL || l->parent == NULL || l->parent_edge == NULL ||
        l->parent_sign == NULL || l->component == NULL || l->first == NULL || l->next == NULL ||
        l->queue == NULL || l->tail == NULL || l->in_tree == NULL || l->wanted == NULL ||
        l->starts == NULL || l->changes == NULL || l->edge_of_column == NULL ||
        l->column_of_edge == NULL || l->loop_rows == NULL || l->section_from == NULL ||
        l->member_first == NULL || l->members == NULL || l->stretch_first == NULL ||
        l->stretches == NULL || l->path == NULL || l->r == NULL || l->up_to == NULL ||
        l->factor == NULL || l->loop_flow == NULL || l->ohms == NULL || l->current == NULL) {
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

/* Breadth first, so that paths stay short. Appends to the queue. */
static void grow_tree(struct loops *l, int root, const struct edge edges[])
{
    size_t head = l->n_queue;
    l->parent[root] = -1;
    l->component[root] = root;
    l->queue[l->n_queue++] = root;
    while (head < l->n_queue) {
        int v = l->queue[head++];
        for (int half = l->first[v]; half >= 0; half = l->next[half]) {
            int e = half / 2;
            bool from_a = half % 2 == 0;
            int w = l->leader[from_a ? edges[e].b : edges[e].a];
            if (l->component[w] >= 0)
                continue;
            l->component[w] = root;
            l->parent[w] = v;
            l->parent_edge[w] = e;
            l->parent_sign[w] = from_a ? -1 : 1;
            l->in_tree[e] = 1;
            l->queue[l->n_queue++] = w;
        }
    }
}

static void grow_forest(struct loops *l, size_t nodes, const struct edge edges[], size_t n_edges)
{
    memset(l->in_tree, 0, n_edges);
    l->n_queue = 0;
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

/* The way of each supernode to its root, from its parent's: one column more. */
static void write_tails(struct loops *l)
{
    for (size_t i = 0; i < l->n_queue; i++) {
        int v = l->queue[i], parent = l->parent[v];
        struct tail *tail = &l->tail[v];
        *tail = (struct tail){.next = -1};
        if (parent < 0 || !l->wanted[l->component[v]])
            continue;
        size_t column = (size_t)l->column_of_edge[l->parent_edge[v]];
        const struct tail *before = &l->tail[parent];
        *tail = (struct tail){column, column + 1, l->parent_sign[v], parent};
        if (before->from == before->to || before->sign != tail->sign)
            continue;
        if (before->to == column)
            *tail = (struct tail){before->from, column + 1, tail->sign, before->next};
        else if (before->from == column + 1)
            *tail = (struct tail){column, before->to, tail->sign, before->next};
    }
}

/* Adds the way from a supernode to its root, or back, to a row of C. */
static void add_way(struct loops *l, int supernode, int direction, signed char *row)
{
    for (int v = supernode; v >= 0; v = l->tail[v].next) {
        const struct tail *tail = &l->tail[v];
        for (size_t c = tail->from; c < tail->to; c++)
            row[c] = (signed char)(row[c] + direction * tail->sign);
        l->starts[tail->from] = l->starts[tail->to] = 1;
    }
}

/* Each edge beside the tree closes one loop: along it, and back through the tree. */
static void write_loops(struct loops *l, const struct edge edges[])
{
    size_t n = l->n_columns, k = 0;
    memset(l->loop_rows, 0, l->n_loops * n);
    memset(l->starts, 0, n + 1);
    for (size_t c = 0; c < n; c++) {
        int e = l->edge_of_column[c];
        if (l->in_tree[e])
            continue;
        signed char *row = l->loop_rows + k++ * n;
        row[c] = 1;
        l->starts[c] = l->starts[c + 1] = 1;
        add_way(l, l->leader[edges[e].b], 1, row);
        add_way(l, l->leader[edges[e].a], -1, row);
    }
}

/* Whether C is the same in the column as in the one before it. */
static bool same_column(const struct loops *l, size_t column)
{
    for (size_t i = 0; i < l->n_loops; i++) {
        const signed char *c = l->loop_rows + i * l->n_columns + column;
        if (c[0] != c[-1])
            return false;
    }
    return true;
}

static void write_sections(struct loops *l)
{
    size_t n = l->n_columns, k = l->n_loops, members = 0;
    l->n_sections = 0;
    for (size_t c = 0; c < n; c++) {
        if (c > 0 && (!l->starts[c] || same_column(l, c)))
            continue;
        size_t s = l->n_sections++;
        l->section_from[s] = c;
        l->member_first[s] = members;
        for (size_t i = 0; i < k; i++)
            if (l->loop_rows[i * n + c] != 0)
                l->members[members++] = (struct member){i, l->loop_rows[i * n + c]};
    }
    l->section_from[l->n_sections] = n;
    l->member_first[l->n_sections] = members;
}

static bool looped(const struct loops *l, size_t section)
{
    return l->member_first[section] < l->member_first[section + 1];
}

/* Puts a change in its place; changes in one column become one. */
static void add_change(struct loops *l, size_t column, int by)
{
    size_t i = l->n_changes;
    while (i > 0 && l->changes[i - 1].column > column)
        i--;
    if (i > 0 && l->changes[i - 1].column == column) {
        l->changes[i - 1].by += by;
        return;
    }
    memmove(l->changes + i + 1, l->changes + i, (l->n_changes - i) * sizeof *l->changes);
    l->changes[i] = (struct change){column, by};
    l->n_changes++;
}

static void add_way_changes(struct loops *l, int supernode, int direction)
{
    for (int v = supernode; v >= 0; v = l->tail[v].next) {
        const struct tail *tail = &l->tail[v];
        if (tail->from == tail->to)
            continue;
        add_change(l, tail->from, direction * tail->sign);
        add_change(l, tail->to, -direction * tail->sign);
    }
}

/* Cuts the columns wherever the probe's path or a loop changes, and keeps what may carry current. */
static size_t cut_stretches(const struct loops *l, struct stretch *stretches)
{
    size_t n = 0, change = 0, section = 0;
    int path = 0;
    for (size_t c = 0, to = 0; c < l->n_columns; c = to) {
        while (change < l->n_changes &&
               (l->changes[change].column <= c || l->changes[change].by == 0))
            path += l->changes[change++].by;
        while (l->section_from[section + 1] <= c)
            section++;
        to = l->section_from[section + 1];
        if (change < l->n_changes && l->changes[change].column < to)
            to = l->changes[change].column;
        if (path == 0 && !looped(l, section))
            continue;
        stretches[n] = (struct stretch){.from = c, .to = to, .path = path, .section = section};
        for (size_t i = 0; i < 2 && i < l->n_loops; i++)
            stretches[n].signs[i] = l->loop_rows[i * l->n_columns + c];
        n++;
    }
    return n;
}

static void write_stretches(struct loops *l, const struct probe probes[])
{
    size_t n = 0;
    for (size_t i = 0; i < l->n_probes; i++) {
        int a = l->leader[probes[i].a], b = l->leader[probes[i].b];
        l->stretch_first[i] = n;
        if (!l->path[i] || a == b)
            continue;
        l->n_changes = 0;
        add_way_changes(l, a, 1);
        add_way_changes(l, b, -1);
        n += cut_stretches(l, l->stretches + n);
    }
    l->stretch_first[l->n_probes] = n;
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
    write_tails(l);
    write_loops(l, edges);
    write_sections(l);
    write_stretches(l, probes);
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

/* A column alone is not the difference of two sums: it may be much smaller than they are. */
static inline double sum_of(const struct loops *l, size_t from, size_t to)
{
    return to == from + 1 ? l->r[from] : l->up_to[to] - l->up_to[from];
}

double loops_sum(const struct loops *l, size_t from, size_t to)
{
    return sum_of(l, from, to);
}

enum rf_status loops_factor(struct loops *l, const double r[])
{
    size_t n = l->n_columns, k = l->n_loops;
    double sum = 0.0;
    /* Outside every loop a bad one would not show in the matrix. */
    for (size_t c = 0; c < n; c++) {
        if (!(r[c] > 0.0) || !isfinite(r[c]))
            return RF_NUMERICAL;
        l->r[c] = r[c];
        l->up_to[c] = sum;
        sum += r[c];
    }
    l->up_to[n] = sum;
    memset(l->factor, 0, k * k * sizeof *l->factor);
    for (size_t s = 0; s < l->n_sections; s++) {
        const struct member *end = l->members + l->member_first[s + 1];
        if (!looped(l, s))
            continue;
        double ohms = sum_of(l, l->section_from[s], l->section_from[s + 1]);
        for (const struct member *i = l->members + l->member_first[s]; i < end; i++)
            for (const struct member *j = i; j < end; j++)
                l->factor[i->loop * k + j->loop] += i->sign * j->sign * ohms;
    }
    return cholesky_factor(l->factor, k, k) ? RF_OK : RF_NUMERICAL;
}

size_t loops_stretches(const struct loops *l, size_t probe, const struct stretch **stretches)
{
    *stretches = l->stretches + l->stretch_first[probe];
    return l->stretch_first[probe + 1] - l->stretch_first[probe];
}

/* Loop currents for 1 A along the probe's tree path, (C D Cᵀ)⁻¹ C D p, where there are more than two
 * loops. */
static void solve_loops(struct loops *l, const struct stretch *stretches, size_t n)
{
    memset(l->loop_flow, 0, l->n_loops * sizeof *l->loop_flow);
    for (size_t s = 0; s < n; s++) {
        const size_t *first = l->member_first + stretches[s].section;
        double volts = stretches[s].path * l->ohms[s];
        for (size_t i = first[0]; i < first[1] && volts != 0.0; i++)
            l->loop_flow[l->members[i].loop] += l->members[i].sign * volts;
    }
    cholesky_solve(l->factor, l->n_loops, l->n_loops, l->loop_flow);
}

/* The same for one loop or two, or none: `volts` are C D p. */
static void solve_two(struct loops *l, const double volts[2])
{
    const double *U = l->factor; /* with 1/U_ii on its diagonal */
    double *x = l->loop_flow;
    if (l->n_loops == 1) {
        x[0] = volts[0] * U[0] * U[0];
    } else if (l->n_loops == 2) {
        double y = volts[0] * U[0];
        x[1] = (volts[1] - U[1] * y) * U[3] * U[3];
        x[0] = (y - U[1] * x[1]) * U[0];
    }
}

double loops_read_stretches(struct loops *l, size_t probe, double current[])
{
    const struct stretch *stretches = NULL;
    size_t n = loops_stretches(l, probe, &stretches);
    double reading = 0.0, volts[2] = {0, 0};
    for (size_t s = 0; s < n; s++) {
        double ohms = sum_of(l, stretches[s].from, stretches[s].to);
        double along = stretches[s].path * ohms;
        l->ohms[s] = ohms;
        volts[0] += stretches[s].signs[0] * along;
        volts[1] += stretches[s].signs[1] * along;
    }
    if (l->n_loops <= 2)
        solve_two(l, volts);
    else
        solve_loops(l, stretches, n);
    for (size_t s = 0; s < n; s++) {
        const size_t *first = l->member_first + stretches[s].section;
        double flow = stretches[s].path;
        flow -= stretches[s].signs[0] * l->loop_flow[0] + stretches[s].signs[1] * l->loop_flow[1];
        for (size_t i = first[0]; l->n_loops > 2 && i < first[1]; i++)
            if (l->members[i].loop >= 2)
                flow -= l->members[i].sign * l->loop_flow[l->members[i].loop];
        current[s] = flow;
        reading += l->ohms[s] * flow * flow;
    }
    return reading;
}

double loops_read(struct loops *l, size_t probe, double power[], double current[])
{
    const struct stretch *stretches = NULL;
    size_t n = loops_stretches(l, probe, &stretches);
    double reading = loops_read_stretches(l, probe, l->current);
    if (power != NULL)
        memset(power, 0, l->n_columns * sizeof *power);
    if (current != NULL)
        memset(current, 0, l->n_columns * sizeof *current);
    for (size_t s = 0; s < n; s++) {
        double flow = l->current[s];
        for (size_t c = stretches[s].from; c < stretches[s].to; c++) {
            if (power != NULL)
                power[c] = l->r[c] * flow * flow;
            if (current != NULL)
                current[c] = flow;
        }
    }
    return reading;
}
