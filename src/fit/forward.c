/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "fit/forward.h"

#include "base/memory.h"

#include <math.h>
#include <string.h>

/* Columns in a row that one factor scales, and lengths that are in a row, too. */
struct stretch {
    size_t column, n;
    int length, factor;
};

/* One set-up at the board, with everything that is measured in it. */
struct board {
    size_t setup;
    struct loops *loops;
    size_t n_probes;
    struct measurement *reads; /* [probe] */
    struct probe *probes;      /* [probe], nodes of the wiring analysed */
    size_t first_point, n_points; /* the probes `highest` looks at; n_points 0: not measured */

    size_t n_columns;
    double *ohms; /* [column] at θ = 0 */
    int *length;  /* [column] the parameters that scale it; n_parameters: none */
    int *factor;
    double *r; /* [column] */
    size_t n_stretches;
    struct stretch *stretches;
};

struct target {
    size_t board, probe;
    bool highest;
};

struct forward {
    size_t n;
    struct measurement *measurements;
    struct target *targets;
    size_t n_boards;
    struct board boards[N_SETUPS];
    const struct wiring *wiring;
    struct edge *edges; /* scratch of the analysis */
    int *wire_of_edge;
    double *factors; /* [parameter] exp(σθ), then a 1 */
    double *power;   /* [column] */
    bool *reachable; /* [measurement] */
    double *mean;
    double *gradient; /* n × stride */
    size_t stride;
};

enum {
    /* A ring as recorded closes at most two loops with its links; each wire a fault adds, and each
     * end a fault moves, can close one more. */
    MAX_LOOPS = 2 + FAULTS_AT_ONCE * (WIRES_PER_FAULT + 2 * N_CONDUCTORS)
};

bool measurement_equal(const struct measurement *one, const struct measurement *other)
{
    return one->setup == other->setup && one->spot == other->spot && one->place == other->place;
}

static void finish_board(struct board *board)
{
    loops_destroy(board->loops);
    free(board->reads);
    free(board->probes);
    free(board->ohms);
    free(board->length);
    free(board->factor);
    free(board->r);
    free(board->stretches);
}

void forward_destroy(struct forward *f)
{
    if (f == NULL)
        return;
    for (size_t b = 0; b < f->n_boards; b++)
        finish_board(&f->boards[b]);
    free(f->measurements);
    free(f->targets);
    free(f->edges);
    free(f->wire_of_edge);
    free(f->factors);
    free(f->power);
    free(f->reachable);
    free(f->mean);
    free(f->gradient);
    free(f);
}

/* The probe that reads it on its board, added where it is new. */
static size_t add_probe(struct board *board, const struct measurement *read)
{
    for (size_t i = 0; i < board->n_probes; i++)
        if (measurement_equal(&board->reads[i], read))
            return i;
    board->reads[board->n_probes] = *read;
    return board->n_probes++;
}

/* `highest` looks at every point with a front, whether or not it is measured by itself. Called
 * before other probes are added, so that these stand together. */
static void add_all_points(struct board *board, const struct rf_job *job)
{
    board->first_point = board->n_probes;
    for (size_t place = 0; place < job->n_places; place++)
        if (place_has_front(job, place))
            board->reads[board->n_probes++] =
                (struct measurement){.setup = board->setup, .spot = SPOT_POINT, .place = place};
    board->n_points = board->n_probes - board->first_point;
}

static struct board *open_board(struct forward *f, size_t setup, const struct rf_job *job)
{
    struct board *board = &f->boards[f->n_boards];
    board->setup = setup;
    size_t most = job->n_places + N_SPOTS;
    board->reads = NEW_ARRAY(struct measurement, most);
    board->probes = NEW_ARRAY(struct probe, most);
    f->n_boards++;
    return board->reads != NULL && board->probes != NULL ? board : NULL;
}

static bool collect_board(struct forward *f, size_t setup, const struct rf_job *job)
{
    struct board *board = NULL;
    for (int highest_first = 1; highest_first >= 0; highest_first--)
        for (size_t i = 0; i < f->n; i++) {
            const struct measurement *m = &f->measurements[i];
            if (m->setup != setup || (m->spot == SPOT_HIGHEST) != highest_first)
                continue;
            if (board == NULL && (board = open_board(f, setup, job)) == NULL)
                return false;
            struct target *target = &f->targets[i];
            target->board = f->n_boards - 1;
            target->highest = highest_first;
            if (!target->highest)
                target->probe = add_probe(board, m);
            else if (board->n_points == 0)
                add_all_points(board, job);
        }
    return true;
}

static bool size_board(struct board *board, const struct wiring *ring)
{
    size_t edges = ring->max_wires + 2;
    board->loops =
        loops_create((size_t)ring->max_nodes, edges, board->n_probes, MAX_LOOPS);
    board->ohms = NEW_ARRAY(double, edges);
    board->length = NEW_ARRAY(int, edges);
    board->factor = NEW_ARRAY(int, edges);
    board->r = NEW_ARRAY(double, edges);
    board->stretches = NEW_ARRAY(struct stretch, edges);
    return board->loops != NULL && board->ohms != NULL && board->length != NULL &&
           board->factor != NULL && board->r != NULL && board->stretches != NULL;
}

struct forward *forward_create(const struct wiring *ring, const struct measurement measurements[],
                               size_t n)
{
    struct forward *f = NEW(struct forward);
    if (f == NULL)
        return NULL;
    size_t edges = ring->max_wires + 2;
    f->n = n;
    /* Room for the parameter that is none, and whole blocks of four for those who read rows so. */
    f->stride = ((size_t)ring->map.n_common + FAULTS_AT_ONCE + 1 + 3) & ~(size_t)3;
    f->measurements = NEW_ARRAY(struct measurement, n);
    f->targets = NEW_ARRAY(struct target, n);
    f->edges = NEW_ARRAY(struct edge, edges);
    f->wire_of_edge = NEW_ARRAY(int, edges);
    f->factors = NEW_ARRAY(double, f->stride);
    f->power = NEW_ARRAY(double, edges);
    f->reachable = NEW_ARRAY(bool, n);
    f->mean = NEW_ARRAY(double, n);
    f->gradient = NEW_ARRAY(double, n * f->stride);
    bool ok = f->measurements != NULL && f->targets != NULL && f->edges != NULL &&
              f->wire_of_edge != NULL && f->factors != NULL && f->power != NULL &&
              f->reachable != NULL && f->mean != NULL && f->gradient != NULL;
    if (ok && n > 0)
        memcpy(f->measurements, measurements, n * sizeof *measurements);
    for (size_t setup = 0; ok && setup < N_SETUPS; setup++)
        ok = collect_board(f, setup, ring->job);
    for (size_t b = 0; ok && b < f->n_boards; b++)
        ok = size_board(&f->boards[b], ring);
    if (ok)
        return f;
    forward_destroy(f);
    return NULL;
}

size_t forward_measurements(const struct forward *f)
{
    return f->n;
}

const struct measurement *forward_measurement(const struct forward *f, size_t i)
{
    return &f->measurements[i];
}

/* Writes down what scales each column, so that evaluating needs no more of the wiring. */
static void scale_columns(struct forward *f, struct board *board)
{
    const struct wiring *w = f->wiring;
    const int *edge_of_column = NULL;
    board->n_columns = loops_columns(board->loops, &edge_of_column);
    for (size_t c = 0; c < board->n_columns; c++) {
        int wire = f->wire_of_edge[edge_of_column[c]];
        const struct links *links = &w->links[board->setup];
        double ohms = wire >= 0 ? w->wires[wire].ohms : links->ohms;
        int length = wire >= 0 ? w->wires[wire].length_parameter : links->parameter;
        int factor = wire >= 0 ? w->wires[wire].factor_parameter : NO_PARAMETER;
        board->ohms[c] = ohms;
        board->length[c] = length == NO_PARAMETER ? w->n_parameters : length;
        board->factor[c] = factor == NO_PARAMETER ? w->n_parameters : factor;
    }
}

static void find_stretches(struct board *board)
{
    struct stretch *last = NULL;
    board->n_stretches = 0;
    for (size_t c = 0; c < board->n_columns; c++) {
        if (last != NULL && board->factor[c] == last->factor &&
            board->length[c] == last->length + (int)last->n) {
            last->n++;
            continue;
        }
        last = &board->stretches[board->n_stretches++];
        *last = (struct stretch){c, 1, board->length[c], board->factor[c]};
    }
}

/* Adds each column's power to the gradients of the two parameters that scale it. */
static void add_powers(const struct board *board, const double *restrict power,
                       double *restrict gradient)
{
    for (size_t s = 0; s < board->n_stretches; s++) {
        const struct stretch *stretch = &board->stretches[s];
        double *restrict lengths = gradient + stretch->length;
        double sum = 0.0;
        for (size_t k = 0; k < stretch->n; k++)
            lengths[k] += power[stretch->column + k];
        for (size_t k = 0; k < stretch->n; k++)
            sum += power[stretch->column + k];
        gradient[stretch->factor] += sum;
    }
}

static enum rf_status analyse_board(struct forward *f, struct board *board)
{
    const struct wiring *w = f->wiring;
    for (size_t i = 0; i < board->n_probes; i++)
        board->probes[i] =
            wiring_probe(w, board->setup, board->reads[i].spot, board->reads[i].place);
    size_t n_edges = wiring_join(w, board->setup, f->edges, f->wire_of_edge);
    enum rf_status status = loops_analyse(board->loops, (size_t)w->n_nodes, f->edges, n_edges,
                                          board->probes, board->n_probes);
    if (status == RF_OK) {
        scale_columns(f, board);
        find_stretches(board);
    }
    return status;
}

static bool target_reachable(const struct forward *f, const struct target *target)
{
    const struct board *board = &f->boards[target->board];
    if (!target->highest)
        return loops_has_path(board->loops, target->probe);
    for (size_t i = 0; i < board->n_points; i++)
        if (loops_has_path(board->loops, board->first_point + i))
            return true;
    return false;
}

enum rf_status forward_analyse(struct forward *f, const struct wiring *wiring)
{
    enum rf_status status = RF_OK;
    f->wiring = wiring;
    for (size_t b = 0; b < f->n_boards && status == RF_OK; b++)
        status = analyse_board(f, &f->boards[b]);
    for (size_t i = 0; i < f->n && status == RF_OK; i++)
        f->reachable[i] = target_reachable(f, &f->targets[i]);
    return status;
}

bool forward_reachable(const struct forward *f, size_t i)
{
    return f->reachable[i];
}

/* The probe `highest` would have noted. */
static size_t highest_probe(struct board *board)
{
    size_t highest = board->first_point;
    double most = -1.0;
    for (size_t i = board->first_point; i < board->first_point + board->n_points; i++) {
        if (!loops_has_path(board->loops, i))
            continue;
        double r = loops_read(board->loops, i, NULL, NULL);
        if (r > most) {
            most = r;
            highest = i;
        }
    }
    return highest;
}

/* Adds the instrument's share: gain, the offsets, a lead left un-nulled. */
static void read_through_instrument(struct forward *f, size_t i, double resistance,
                                    const double theta[])
{
    const struct wiring *w = f->wiring;
    const struct parameter_map *map = &w->map;
    const struct parameter *p = w->parameters;
    double *gradient = f->gradient + i * f->stride;
    double gain = f->factors[map->gain];
    enum joining joining = setups[f->measurements[i].setup].joining;
    enum spot spot = f->measurements[i].spot;

    for (int j = 0; j < w->n_parameters; j++)
        gradient[j] *= gain * p[j].sigma;
    double mean = gain * resistance;
    gradient[map->gain] = p[map->gain].sigma * mean;
    mean += p[map->lead].sigma * theta[map->lead];
    gradient[map->lead] = p[map->lead].sigma;
    if (spot == SPOT_POINT || spot == SPOT_HIGHEST) {
        mean += p[map->face].mean + p[map->face].sigma * theta[map->face];
        gradient[map->face] = p[map->face].sigma;
    }
    if (joining == JOIN_LEAD_OUT || joining == JOIN_LEAD_IN) {
        mean += p[map->wander].sigma * theta[map->wander];
        gradient[map->wander] = p[map->wander].sigma;
    }
    if (w->offset_parameter != NO_PARAMETER) {
        double offset = w->offset_ohms * f->factors[w->offset_parameter];
        mean += offset;
        gradient[w->offset_parameter] = p[w->offset_parameter].sigma * offset;
    }
    f->mean[i] = mean;
}

static void evaluate_measurement(struct forward *f, size_t i, const double theta[])
{
    const struct target *target = &f->targets[i];
    struct board *board = &f->boards[target->board];
    double *gradient = f->gradient + i * f->stride;
    memset(gradient, 0, ((size_t)f->wiring->n_parameters + 1) * sizeof *gradient);
    f->mean[i] = 0.0;
    if (!f->reachable[i])
        return;
    size_t probe = target->highest ? highest_probe(board) : target->probe;
    double resistance = loops_read(board->loops, probe, f->power, NULL);
    add_powers(board, f->power, gradient);
    read_through_instrument(f, i, resistance, theta);
}

enum rf_status forward_evaluate(struct forward *f, const double theta[])
{
    const struct wiring *w = f->wiring;
    for (int j = 0; j < w->n_parameters; j++)
        f->factors[j] = exp(w->parameters[j].sigma * theta[j]);
    f->factors[w->n_parameters] = 1.0;
    for (size_t b = 0; b < f->n_boards; b++) {
        struct board *board = &f->boards[b];
        for (size_t c = 0; c < board->n_columns; c++)
            board->r[c] =
                board->ohms[c] * f->factors[board->length[c]] * f->factors[board->factor[c]];
        enum rf_status status = loops_factor(board->loops, board->r);
        if (status != RF_OK)
            return status;
    }
    for (size_t i = 0; i < f->n; i++)
        evaluate_measurement(f, i, theta);
    return RF_OK;
}

double forward_mean(const struct forward *f, size_t i)
{
    return f->mean[i];
}

const double *forward_gradient(const struct forward *f, size_t i)
{
    return f->gradient + i * f->stride;
}
