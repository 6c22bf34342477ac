/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "plain.h"

#include "base/error.h"
#include "base/memory.h"
#include "fit/likelihood.h"

#include <gsl/gsl_blas.h>
#include <gsl/gsl_linalg.h>
#include <math.h>

/* The nodes of one set-up, numbered for its conductance matrix. */
struct network {
    bool measured;
    size_t n_edges, n_rows;
    struct edge *edges;
    int *wire_of_edge; /* [edge] −1: a link */
    int *part;   /* [node] one node for all that is connected */
    int *merged; /* [node] one node for all that links join */
    int *row;    /* [node] of the matrix, −1 where the voltage is zero */
};

struct plain {
    const struct rf_job *job;
    struct wiring wiring;
    struct observation *observations; /* [reading] */
    struct network networks[N_SETUPS];
    double *mean;     /* [reading] NAN: no path */
    double *stepped;  /* [reading] the same one parameter on */
    double *jacobian; /* reading × parameter, Ω */
    double *weights, *z;
    gsl_vector *theta, *trial, *gradient, *step;
    gsl_matrix *hessian;
    gsl_matrix *conductance; /* the largest network's */
    gsl_vector *current;
    size_t d;
};

enum noise { NORMAL, MIXTURE };
static const double difference = 1e-6;

static void finish(struct plain *p)
{
    for (size_t s = 0; s < N_SETUPS; s++) {
        free(p->networks[s].edges);
        free(p->networks[s].wire_of_edge);
        free(p->networks[s].part);
        free(p->networks[s].merged);
        free(p->networks[s].row);
    }
    wiring_finish(&p->wiring);
    free(p->observations);
    free(p->mean);
    free(p->stepped);
    free(p->jacobian);
    free(p->weights);
    free(p->z);
    gsl_vector_free(p->theta);
    gsl_vector_free(p->trial);
    gsl_vector_free(p->gradient);
    gsl_vector_free(p->step);
    gsl_matrix_free(p->hessian);
    gsl_matrix_free(p->conductance);
    gsl_vector_free(p->current);
}

static bool init_networks(struct plain *p)
{
    const struct wiring *w = &p->wiring;
    for (size_t i = 0; i < p->job->n_readings; i++)
        p->networks[p->job->readings[i].setup].measured = true;
    for (size_t s = 0; s < N_SETUPS; s++) {
        struct network *network = &p->networks[s];
        if (!network->measured)
            continue;
        network->edges = NEW_ARRAY(struct edge, w->max_wires + 2);
        network->wire_of_edge = NEW_ARRAY(int, w->max_wires + 2);
        network->part = NEW_ARRAY(int, w->max_nodes);
        network->merged = NEW_ARRAY(int, w->max_nodes);
        network->row = NEW_ARRAY(int, w->max_nodes);
        if (network->edges == NULL || network->wire_of_edge == NULL || network->part == NULL ||
            network->merged == NULL || network->row == NULL)
            return false;
    }
    return true;
}

static enum rf_status init(struct plain *p, const struct wiring *ring, struct rf_error *error)
{
    const struct rf_job *job = ring->job;
    size_t n = job->n_readings, most = (size_t)ring->map.n_common + FAULTS_AT_ONCE;
    size_t nodes = (size_t)ring->max_nodes;
    enum rf_status status = wiring_init(&p->wiring, job, ring->models, error);
    if (status != RF_OK)
        return status;
    p->job = job;
    p->observations = NEW_ARRAY(struct observation, n);
    p->mean = NEW_ARRAY(double, n);
    p->stepped = NEW_ARRAY(double, n);
    p->jacobian = NEW_ARRAY(double, n *most);
    p->weights = NEW_ARRAY(double, n);
    p->z = NEW_ARRAY(double, n);
    p->theta = gsl_vector_alloc(most);
    p->trial = gsl_vector_alloc(most);
    p->gradient = gsl_vector_alloc(most);
    p->step = gsl_vector_alloc(most);
    p->hessian = gsl_matrix_alloc(most, most);
    p->conductance = gsl_matrix_alloc(nodes, nodes);
    p->current = gsl_vector_alloc(nodes);
    if (p->observations == NULL || p->mean == NULL || p->stepped == NULL || p->jacobian == NULL ||
        p->weights == NULL || p->z == NULL || p->theta == NULL || p->trial == NULL ||
        p->gradient == NULL || p->step == NULL || p->hessian == NULL || p->conductance == NULL ||
        p->current == NULL || !init_networks(p))
        return fail_memory(error);
    for (size_t i = 0; i < n; i++)
        p->observations[i] = observe(&job->readings[i], i, 1, ring->models);
    return RF_OK;
}

/* --- what the meter would show --- */

static int find(int *label, int node)
{
    while (label[node] != node)
        node = label[node];
    return node;
}

static void join(int *label, const struct edge *edge)
{
    label[find(label, edge->a)] = find(label, edge->b);
}

/* Joined nodes share a row; one of each connected part is left out. */
static void number_nodes(struct plain *p, size_t setup)
{
    struct network *network = &p->networks[setup];
    int nodes = p->wiring.n_nodes, *part = network->part, *merged = network->merged;
    network->n_edges = wiring_join(&p->wiring, setup, network->edges, network->wire_of_edge);
    for (int v = 0; v < nodes; v++)
        part[v] = merged[v] = v;
    for (size_t e = 0; e < network->n_edges; e++) {
        join(part, &network->edges[e]);
        if (network->edges[e].zero)
            join(merged, &network->edges[e]);
    }
    network->n_rows = 0;
    for (int v = 0; v < nodes; v++)
        if (find(merged, v) == v)
            network->row[v] = v == find(merged, find(part, v)) ? -1 : (int)network->n_rows++;
    for (int v = 0; v < nodes; v++)
        network->row[v] = network->row[find(merged, v)];
}

static double scale(const struct plain *p, int parameter, const gsl_vector *theta)
{
    if (parameter == NO_PARAMETER)
        return 1.0;
    size_t j = (size_t)parameter;
    return exp(p->wiring.parameters[j].sigma * gsl_vector_get(theta, j));
}

static double resistance_of(const struct plain *p, size_t setup, int wire, const gsl_vector *theta)
{
    const struct wiring *w = &p->wiring;
    if (wire < 0)
        return w->links[setup].ohms * scale(p, w->links[setup].parameter, theta);
    return w->wires[wire].ohms * scale(p, w->wires[wire].length_parameter, theta) *
           scale(p, w->wires[wire].factor_parameter, theta);
}

static void add(gsl_matrix *G, int i, int j, double conductance)
{
    if (i >= 0 && j >= 0)
        *gsl_matrix_ptr(G, (size_t)i, (size_t)j) += conductance;
}

static bool factor_conductance(struct plain *p, size_t setup, const gsl_vector *theta)
{
    const struct network *network = &p->networks[setup];
    if (network->n_rows == 0)
        return true;
    gsl_matrix_view G =
        gsl_matrix_submatrix(p->conductance, 0, 0, network->n_rows, network->n_rows);
    gsl_matrix_set_zero(&G.matrix);
    for (size_t e = 0; e < network->n_edges; e++) {
        const struct edge *edge = &network->edges[e];
        int a = network->row[edge->a], b = network->row[edge->b];
        if (edge->zero || a == b)
            continue;
        double conductance = 1.0 / resistance_of(p, setup, network->wire_of_edge[e], theta);
        add(&G.matrix, a, a, conductance);
        add(&G.matrix, b, b, conductance);
        add(&G.matrix, a, b, -conductance);
        add(&G.matrix, b, a, -conductance);
    }
    return gsl_linalg_cholesky_decomp1(&G.matrix) == GSL_SUCCESS;
}

/* Ω between the probe's nodes, for the matrix factored last; NAN where there is no path. */
static double effective(struct plain *p, size_t setup, struct probe probe)
{
    const struct network *network = &p->networks[setup];
    if (find(network->part, probe.a) != find(network->part, probe.b))
        return NAN;
    int a = network->row[probe.a], b = network->row[probe.b];
    if (a == b)
        return 0.0;
    gsl_matrix_view G =
        gsl_matrix_submatrix(p->conductance, 0, 0, network->n_rows, network->n_rows);
    gsl_vector_view v = gsl_vector_subvector(p->current, 0, network->n_rows);
    gsl_vector_set_zero(&v.vector);
    if (a >= 0)
        gsl_vector_set(&v.vector, (size_t)a, 1.0);
    if (b >= 0)
        gsl_vector_set(&v.vector, (size_t)b, -1.0);
    gsl_linalg_cholesky_svx(&G.matrix, &v.vector);
    return (a >= 0 ? gsl_vector_get(&v.vector, (size_t)a) : 0.0) -
           (b >= 0 ? gsl_vector_get(&v.vector, (size_t)b) : 0.0);
}

static double resistance_read(struct plain *p, const struct reading *reading)
{
    double highest = NAN;
    if (reading->spot != SPOT_HIGHEST)
        return effective(p, reading->setup,
                         wiring_probe(&p->wiring, reading->setup, reading->spot, reading->place));
    for (size_t place = 0; place < p->job->n_places; place++)
        if (place_has_front(p->job, place))
            highest = fmax(highest,
                           effective(p, reading->setup, wiring_probe(&p->wiring, reading->setup,
                                                                     SPOT_POINT, place)));
    return highest;
}

static double through_instrument(const struct plain *p, const struct reading *reading, double ohms,
                                 const gsl_vector *theta)
{
    const struct wiring *w = &p->wiring;
    const struct parameter *q = w->parameters;
    enum joining joining = setups[reading->setup].joining;
    double mean = ohms * scale(p, w->map.gain, theta);
    mean += q[w->map.lead].sigma * gsl_vector_get(theta, (size_t)w->map.lead);
    if (reading->spot == SPOT_POINT || reading->spot == SPOT_HIGHEST)
        mean += q[w->map.face].sigma * gsl_vector_get(theta, (size_t)w->map.face);
    if (joining == JOIN_LEAD_OUT || joining == JOIN_LEAD_IN)
        mean += q[w->map.wander].sigma * gsl_vector_get(theta, (size_t)w->map.wander);
    if (w->offset_parameter != NO_PARAMETER)
        mean += w->offset_ohms * scale(p, w->offset_parameter, theta);
    return mean;
}

static bool predict(struct plain *p, const gsl_vector *theta, double mean[])
{
    for (size_t s = 0; s < N_SETUPS; s++) {
        if (!p->networks[s].measured)
            continue;
        if (!factor_conductance(p, s, theta))
            return false;
        for (size_t i = 0; i < p->job->n_readings; i++) {
            const struct reading *reading = &p->job->readings[i];
            if (reading->setup == s)
                mean[i] = through_instrument(p, reading, resistance_read(p, reading), theta);
        }
    }
    return true;
}

static bool differentiate(struct plain *p)
{
    for (size_t j = 0; j < p->d; j++) {
        double at = gsl_vector_get(p->theta, j);
        gsl_vector_set(p->theta, j, at + difference);
        bool ok = predict(p, p->theta, p->stepped);
        gsl_vector_set(p->theta, j, at);
        if (!ok)
            return false;
        for (size_t i = 0; i < p->job->n_readings; i++)
            p->jacobian[i * p->d + j] = (p->stepped[i] - p->mean[i]) / difference;
    }
    return true;
}

/* --- the fit --- */

static double half_square(const gsl_vector *theta, size_t d)
{
    double sum = 0.0;
    for (size_t j = 0; j < d; j++)
        sum += gsl_vector_get(theta, j) * gsl_vector_get(theta, j);
    return 0.5 * sum;
}

/* F at θ; means, weights and z there. */
static double objective(struct plain *p, enum noise noise, const gsl_vector *theta)
{
    const struct instrument_model *instrument = &p->wiring.models->instrument;
    if (!predict(p, theta, p->mean))
        return INFINITY;
    double sum = half_square(theta, p->d);
    for (size_t i = 0; i < p->job->n_readings; i++) {
        const struct observation *o = &p->observations[i];
        p->weights[i] = p->z[i] = 0.0;
        if (isnan(p->mean[i])) {
            sum -= o->log_no_path;
        } else if (o->open) {
            sum -= log_open_with_path(instrument);
        } else if (noise == MIXTURE) {
            sum -= log_mixture(o, p->mean[i], &p->weights[i], &p->z[i]);
        } else {
            p->weights[i] = 1.0;
            p->z[i] = (o->ohms - p->mean[i]) / o->sigma;
            sum += 0.5 * p->z[i] * p->z[i];
        }
    }
    return sum;
}

/* The factor of I + JᵀWJ at θ, and the gradient of F. */
static bool normal_equations(struct plain *p)
{
    if (!differentiate(p))
        return false;
    gsl_matrix_view H = gsl_matrix_submatrix(p->hessian, 0, 0, p->d, p->d);
    gsl_vector_view g = gsl_vector_subvector(p->gradient, 0, p->d);
    gsl_vector_view theta = gsl_vector_subvector(p->theta, 0, p->d);
    gsl_matrix_set_identity(&H.matrix);
    gsl_vector_memcpy(&g.vector, &theta.vector);
    for (size_t i = 0; i < p->job->n_readings; i++) {
        double sigma = p->observations[i].sigma, w = p->weights[i];
        if (w == 0.0)
            continue;
        gsl_vector_view row = gsl_vector_view_array(p->jacobian + i * p->d, p->d);
        gsl_blas_dsyr(CblasLower, w / (sigma * sigma), &row.vector, &H.matrix);
        gsl_blas_daxpy(-w * p->z[i] / sigma, &row.vector, &g.vector);
    }
    return gsl_linalg_cholesky_decomp1(&H.matrix) == GSL_SUCCESS;
}

static double log_det(const struct plain *p)
{
    double sum = 0.0;
    for (size_t j = 0; j < p->d; j++)
        sum += 2.0 * log(gsl_matrix_get(p->hessian, j, j));
    return sum;
}

/* Puts the step at p->step, none of it beyond ±4; returns the decrease it promises. */
static double find_step(struct plain *p)
{
    gsl_matrix_view H = gsl_matrix_submatrix(p->hessian, 0, 0, p->d, p->d);
    gsl_vector_view g = gsl_vector_subvector(p->gradient, 0, p->d);
    gsl_vector_view step = gsl_vector_subvector(p->step, 0, p->d);
    double promise = 0.0;
    gsl_linalg_cholesky_solve(&H.matrix, &g.vector, &step.vector);
    gsl_blas_ddot(&g.vector, &step.vector, &promise);
    double longest = fabs(gsl_vector_get(&step.vector, gsl_blas_idamax(&step.vector)));
    gsl_vector_scale(&step.vector, longest > 4.0 ? -4.0 / longest : -1.0);
    return 0.5 * promise;
}

/* Halves the step until F falls; F there. What was found at θ belongs to it unless F never falls. */
static double descend(struct plain *p, enum noise noise, double value)
{
    gsl_vector_view trial = gsl_vector_subvector(p->trial, 0, p->d);
    gsl_vector_view step = gsl_vector_subvector(p->step, 0, p->d);
    double share = 1.0;
    for (int halving = 0; halving <= 12; halving++, share *= 0.5) {
        gsl_vector_memcpy(p->trial, p->theta);
        gsl_blas_daxpy(share, &step.vector, &trial.vector);
        double trial_value = objective(p, noise, p->trial);
        if (trial_value < value) {
            gsl_vector_memcpy(p->theta, p->trial);
            return trial_value;
        }
    }
    return value;
}

static bool minimise(struct plain *p, enum noise noise)
{
    double value = objective(p, noise, p->theta);
    for (int iteration = 0; isfinite(value); iteration++) {
        if (!normal_equations(p))
            return false;
        double enough = noise == NORMAL ? fmax(1e-3, 1e-3 * value) : 1e-5;
        if (find_step(p) < enough || iteration == 100)
            return true;
        double before = value;
        value = descend(p, noise, before);
        if (!(value < before)) /* at the floor of the arithmetic */
            return isfinite(objective(p, noise, p->theta)) && normal_equations(p);
    }
    return false;
}

static bool fit(struct plain *p, const struct wiring *ring, struct candidate *candidate)
{
    wiring_copy(&p->wiring, ring);
    hypothesis_apply(&candidate->hypothesis, &p->wiring, NULL);
    p->d = (size_t)p->wiring.n_parameters;
    for (size_t s = 0; s < N_SETUPS; s++)
        if (p->networks[s].measured)
            number_nodes(p, s);
    gsl_vector_set_zero(p->theta);
    if (!minimise(p, NORMAL) || !minimise(p, MIXTURE))
        return false;
    candidate->log_evidence = -objective(p, MIXTURE, p->theta) - 0.5 * log_det(p);
    return isfinite(candidate->log_evidence);
}

static void normalise(struct candidates *candidates)
{
    double largest = -INFINITY, sum = 0.0;
    for (size_t i = 0; i < candidates->n; i++) {
        struct candidate *c = &candidates->list[i];
        c->confidence = c->log_prior + c->log_looks + c->log_evidence;
        largest = fmax(largest, c->confidence);
    }
    for (size_t i = 0; i < candidates->n; i++)
        sum += candidates->list[i].confidence = exp(candidates->list[i].confidence - largest);
    for (size_t i = 0; i < candidates->n; i++)
        candidates->list[i].confidence /= sum;
}

enum rf_status plain_rank(struct candidates *candidates, const struct wiring *ring,
                          struct rf_error *error)
{
    struct plain plain = {0};
    enum rf_status status = init(&plain, ring, error);
    for (size_t i = 0; i < candidates->n && status == RF_OK; i++)
        if (!fit(&plain, ring, &candidates->list[i]))
            status = fail(error, RF_NUMERICAL, "%s: the plain way fails for hypothesis %zu",
                          ring->job->source, i);
    if (status == RF_OK)
        normalise(candidates);
    finish(&plain);
    return status;
}
