/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "fit/forward.h"

#include "base/memory.h"

#include <math.h>
#include <string.h>

/* Columns in a row whose lengths are runs in a row, of the same cable. */
struct cable {
    size_t from, to;    /* columns */
    int run;            /* of column `from`; −1: one column that no run scales */
    int length, factor; /* the parameters that scale it; the sink: none */
    double rate;        /* Ω at θ = 0 per metre of the run as recorded */
    double rate_now;    /* at θ */
};

/*
 * ∂R/∂θ over the runs, of a probe: a run's share is its resistance times i², and i is the same all
 * along a stretch. Divided by the run's length it therefore changes in few places only: at `step_run`.
 * A piece is where a stretch and a cable overlap; it adds what it has per metre at one step and takes
 * it off again at another.
 */
struct piece {
    size_t stretch, cable;
    size_t from, to; /* columns */
    int begin, end;  /* steps */
};

/* One set-up at the board, with everything that is measured in it. */
struct board {
    size_t setup;
    struct loops *loops;
    size_t n_probes;
    struct measurement *reads;    /* [probe] */
    struct probe *probes;         /* [probe], nodes of the wiring analysed */
    size_t first_point, n_points; /* the probes `highest` looks at; n_points 0: not measured */

    size_t n_columns;
    double *ohms; /* [column] at θ = 0 */
    int *length;  /* [column] the parameters that scale it; the sink: none */
    int *factor;
    double *r; /* [column] */
    size_t n_cables, n_pieces;
    struct cable *cables;
    size_t max_pieces;
    size_t *first_piece; /* [probe], and the end behind the last */
    struct piece *pieces;
    int *n_steps;    /* [probe] */
    int *step_run;   /* [probe × max_steps] */
    double *current; /* [stretch of one probe] */
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
    int n_runs;
    double *metres;     /* [run] as recorded */
    struct edge *edges; /* scratch of the analysis */
    int *wire_of_edge;
    double *factors;     /* [parameter] exp(σθ), then a 1: the sink, the parameter that is none */
    double *scale;       /* [run] σ × its length at θ, m */
    double *other_scale; /* [MAX_OTHERS] σ × gain; 0 from the sink on */
    bool *reachable;     /* [measurement] */
    double *mean;
    struct slopes *slopes; /* [measurement] */
    double *steps;         /* n × max_steps */
    double *others;        /* n × MAX_OTHERS */
    double *gradient;      /* n × stride, written when asked for */
    size_t stride, max_steps;
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
    free(board->cables);
    free(board->first_piece);
    free(board->pieces);
    free(board->n_steps);
    free(board->step_run);
    free(board->current);
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
    free(f->metres);
    free(f->factors);
    free(f->scale);
    free(f->other_scale);
    free(f->reachable);
    free(f->mean);
    free(f->slopes);
    free(f->steps);
    free(f->others);
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

static bool size_board(struct board *board, const struct wiring *ring, size_t max_steps)
{
    size_t edges = ring->max_wires + 2;
    board->loops = loops_create((size_t)ring->max_nodes, edges, board->n_probes, MAX_LOOPS);
    board->ohms = NEW_ARRAY(double, edges);
    board->length = NEW_ARRAY(int, edges);
    board->factor = NEW_ARRAY(int, edges);
    board->r = NEW_ARRAY(double, edges);
    board->cables = NEW_ARRAY(struct cable, edges);
    board->first_piece = NEW_ARRAY(size_t, board->n_probes + 1);
    board->pieces = NEW_ARRAY(struct piece, board->n_probes * edges);
    board->n_steps = NEW_ARRAY(int, board->n_probes);
    board->step_run = NEW_ARRAY(int, board->n_probes * max_steps);
    board->current = NEW_ARRAY(double, edges);
    return board->loops != NULL && board->ohms != NULL && board->length != NULL &&
           board->factor != NULL && board->r != NULL && board->cables != NULL &&
           board->first_piece != NULL && board->pieces != NULL && board->n_steps != NULL &&
           board->step_run != NULL && board->current != NULL;
}

static bool allocate(struct forward *f, const struct wiring *ring, size_t n)
{
    size_t edges = ring->max_wires + 2, runs = n_runs(ring->job);
    f->n_runs = (int)runs;
    f->stride = (size_t)ring->map.n_common + FAULTS_AT_ONCE + 1;
    f->max_steps = runs + 1; /* the last: steps behind the last run, which change nothing */
    f->measurements = NEW_ARRAY(struct measurement, n);
    f->targets = NEW_ARRAY(struct target, n);
    f->metres = NEW_ARRAY(double, runs);
    f->edges = NEW_ARRAY(struct edge, edges);
    f->wire_of_edge = NEW_ARRAY(int, edges);
    f->factors = NEW_ARRAY(double, f->stride);
    f->scale = NEW_ARRAY(double, runs);
    f->other_scale = NEW_ARRAY(double, MAX_OTHERS);
    f->reachable = NEW_ARRAY(bool, n);
    f->mean = NEW_ARRAY(double, n);
    f->slopes = NEW_ARRAY(struct slopes, n);
    f->steps = NEW_ARRAY(double, n * f->max_steps);
    f->others = NEW_ARRAY(double, n * MAX_OTHERS);
    f->gradient = NEW_ARRAY(double, n * f->stride);
    return f->measurements != NULL && f->targets != NULL && f->metres != NULL && f->edges != NULL &&
           f->wire_of_edge != NULL && f->factors != NULL && f->scale != NULL &&
           f->other_scale != NULL && f->reachable != NULL && f->mean != NULL && f->slopes != NULL &&
           f->steps != NULL && f->others != NULL && f->gradient != NULL;
}

struct forward *forward_create(const struct wiring *ring, const struct measurement measurements[],
                               size_t n)
{
    struct forward *f = NEW(struct forward);
    if (f == NULL)
        return NULL;
    f->n = n;
    bool ok = allocate(f, ring, n);
    if (ok && n > 0)
        memcpy(f->measurements, measurements, n * sizeof *measurements);
    for (int run = 0; ok && run < f->n_runs; run++)
        f->metres[run] = ring->wires[run].metres;
    for (size_t setup = 0; ok && setup < N_SETUPS; setup++)
        ok = collect_board(f, setup, ring->job);
    for (size_t b = 0; ok && b < f->n_boards; b++)
        ok = size_board(&f->boards[b], ring, f->max_steps);
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

/* The next run, of cable that is the same but for rounding. */
static bool continues(const struct cable *cable, const struct cable *next)
{
    return cable->run >= 0 && next->run == cable->run + (int)(cable->to - cable->from) &&
           next->factor == cable->factor && fabs(next->rate - cable->rate) <= 1e-12 * cable->rate;
}

static void find_cables(const struct forward *f, struct board *board)
{
    board->n_cables = 0;
    for (size_t c = 0; c < board->n_columns; c++) {
        struct cable one = {.from = c, .to = c + 1, .run = -1};
        one.length = board->length[c];
        one.factor = board->factor[c];
        if (one.length < f->n_runs) {
            one.run = one.length;
            one.rate = board->ohms[c] / f->metres[one.run];
        }
        struct cable *last = &board->cables[board->n_cables - (board->n_cables > 0)];
        if (board->n_cables > 0 && continues(last, &one))
            last->to++;
        else
            board->cables[board->n_cables++] = one;
    }
}

/* The step at a run, added where there is none yet. */
static int step_at(const struct forward *f, struct board *board, size_t probe, int run)
{
    int *runs = board->step_run + probe * f->max_steps, n = board->n_steps[probe];
    if (run >= f->n_runs)
        return f->n_runs; /* none: nothing is behind the last */
    for (int i = 0; i < n; i++)
        if (runs[i] == run)
            return i;
    runs[n] = run;
    return board->n_steps[probe]++;
}

static void find_pieces(const struct forward *f, struct board *board, size_t probe)
{
    const struct stretch *stretches = NULL;
    size_t n = loops_stretches(board->loops, probe, &stretches), cable = 0;
    board->n_steps[probe] = 0;
    for (size_t s = 0; s < n; s++)
        for (size_t c = stretches[s].from; c < stretches[s].to;) {
            while (board->cables[cable].to <= c)
                cable++;
            const struct cable *here = &board->cables[cable];
            struct piece *piece = &board->pieces[board->n_pieces++];
            *piece = (struct piece){.stretch = s, .cable = cable, .from = c};
            piece->to = here->to < stretches[s].to ? here->to : stretches[s].to;
            if (here->run >= 0) {
                int run = here->run + (int)(c - here->from);
                piece->begin = step_at(f, board, probe, run);
                piece->end = step_at(f, board, probe, run + (int)(piece->to - c));
            }
            c = piece->to;
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
    if (status != RF_OK)
        return status;
    scale_columns(f, board);
    find_cables(f, board);
    board->n_pieces = 0;
    for (size_t i = 0; i < board->n_probes; i++) {
        board->first_piece[i] = board->n_pieces;
        find_pieces(f, board, i);
    }
    board->first_piece[board->n_probes] = board->n_pieces;
    return RF_OK;
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
        double r = loops_read_stretches(board->loops, i, board->current);
        if (r > most) {
            most = r;
            highest = i;
        }
    }
    return highest;
}

/* R of a probe, and its derivatives by the logs of what scales it. */
static double read_slopes(const struct forward *f, const struct board *board, size_t probe,
                          double *restrict steps, double others[restrict MAX_OTHERS])
{
    double resistance = loops_read_stretches(board->loops, probe, board->current);
    const struct piece *pieces = board->pieces, *end = pieces + board->first_piece[probe + 1];
    int n_runs = f->n_runs;
    for (int i = 0; i < board->n_steps[probe]; i++)
        steps[i] = 0.0;
    for (const struct piece *piece = pieces + board->first_piece[probe]; piece < end; piece++) {
        const struct cable *cable = &board->cables[piece->cable];
        double current = board->current[piece->stretch], square = current * current;
        double power = square * loops_sum(board->loops, piece->from, piece->to);
        if (cable->run >= 0) {
            steps[piece->begin] += square * cable->rate_now;
            steps[piece->end] -= square * cable->rate_now;
        } else {
            others[cable->length - n_runs] += power;
        }
        others[cable->factor - n_runs] += power;
    }
    return resistance;
}

/* The mean: the instrument's gain and offsets, a lead left un-nulled. `others` (may be NULL) comes with
 * derivatives of R by logs, and leaves with those of the mean by θ. */
static double read_through_instrument(const struct forward *f,
                                      const struct measurement *measurement, double resistance,
                                      const double theta[], double *others)
{
    const struct wiring *w = f->wiring;
    const struct parameter_map *map = &w->map;
    enum joining joining = setups[measurement->setup].joining;
    bool through_face = measurement->spot == SPOT_POINT || measurement->spot == SPOT_HIGHEST;
    bool by_lead = joining == JOIN_LEAD_OUT || joining == JOIN_LEAD_IN;
    double by_gain = f->factors[map->gain] * resistance, mean = by_gain;
    double lead = w->parameters[map->lead].sigma, face = w->parameters[map->face].sigma;
    double wander = w->parameters[map->wander].sigma, offset = 0.0;
    mean += lead * theta[map->lead];
    if (through_face)
        mean += w->parameters[map->face].mean + face * theta[map->face];
    if (by_lead)
        mean += wander * theta[map->wander];
    if (w->offset_parameter != NO_PARAMETER)
        mean += offset = w->offset_ohms * f->factors[w->offset_parameter];
    if (others == NULL)
        return mean;
    others -= f->n_runs;
    for (int j = f->n_runs; j < f->n_runs + MAX_OTHERS; j++)
        others[j] *= f->other_scale[j - f->n_runs];
    others[map->gain] = w->parameters[map->gain].sigma * by_gain;
    others[map->lead] = lead;
    others[map->face] = through_face ? face : 0.0;
    others[map->wander] = by_lead ? wander : 0.0;
    if (w->offset_parameter != NO_PARAMETER)
        others[w->offset_parameter] = w->parameters[w->offset_parameter].sigma * offset;
    return mean;
}

static size_t probe_of(const struct forward *f, struct board *board, size_t i)
{
    return f->targets[i].highest ? highest_probe(board) : f->targets[i].probe;
}

static void evaluate_measurement(struct forward *f, size_t i, const double theta[])
{
    struct board *board = &f->boards[f->targets[i].board];
    double *steps = f->steps + i * f->max_steps, gain = f->factors[f->wiring->map.gain];
    double others[MAX_OTHERS] = {0};
    struct slopes *slopes = &f->slopes[i];
    *slopes = (struct slopes){.steps = steps, .others = f->others + i * MAX_OTHERS};
    f->mean[i] = 0.0;
    if (f->reachable[i]) {
        size_t probe = probe_of(f, board, i);
        double resistance = read_slopes(f, board, probe, steps, others);
        slopes->n_steps = (size_t)board->n_steps[probe];
        slopes->step_run = board->step_run + probe * f->max_steps;
        for (size_t k = 0; k < slopes->n_steps; k++)
            steps[k] *= gain;
        f->mean[i] = read_through_instrument(f, &f->measurements[i], resistance, theta, others);
    }
    memcpy(f->others + i * MAX_OTHERS, others, sizeof others);
}

static enum rf_status evaluate_board(struct forward *f, struct board *board)
{
    for (size_t c = 0; c < board->n_columns; c++)
        board->r[c] = board->ohms[c] * f->factors[board->length[c]] * f->factors[board->factor[c]];
    for (size_t i = 0; i < board->n_cables; i++)
        board->cables[i].rate_now = board->cables[i].rate * f->factors[board->cables[i].factor];
    return loops_factor(board->loops, board->r);
}

/* Everything that θ changes before a single reading is taken. */
static enum rf_status evaluate_boards(struct forward *f, const double theta[])
{
    const struct wiring *w = f->wiring;
    for (int j = 0; j < w->n_parameters; j++)
        f->factors[j] = exp(w->parameters[j].sigma * theta[j]);
    f->factors[w->n_parameters] = 1.0;
    for (size_t b = 0; b < f->n_boards; b++) {
        enum rf_status status = evaluate_board(f, &f->boards[b]);
        if (status != RF_OK)
            return status;
    }
    return RF_OK;
}

enum rf_status forward_evaluate(struct forward *f, const double theta[])
{
    const struct wiring *w = f->wiring;
    enum rf_status status = evaluate_boards(f, theta);
    if (status != RF_OK)
        return status;
    for (int run = 0; run < f->n_runs; run++)
        f->scale[run] = w->parameters[run].sigma * f->metres[run] * f->factors[run];
    for (int k = 0; k < MAX_OTHERS; k++) {
        int j = f->n_runs + k;
        f->other_scale[k] =
            j < w->n_parameters ? w->parameters[j].sigma * f->factors[w->map.gain] : 0.0;
    }
    for (size_t i = 0; i < f->n; i++)
        evaluate_measurement(f, i, theta);
    return RF_OK;
}

enum rf_status forward_evaluate_means(struct forward *f, const double theta[])
{
    enum rf_status status = evaluate_boards(f, theta);
    for (size_t i = 0; i < f->n && status == RF_OK; i++) {
        struct board *board = &f->boards[f->targets[i].board];
        f->mean[i] = 0.0;
        if (!f->reachable[i])
            continue;
        double resistance =
            loops_read_stretches(board->loops, probe_of(f, board, i), board->current);
        f->mean[i] = read_through_instrument(f, &f->measurements[i], resistance, theta, NULL);
    }
    return status;
}

double forward_mean(const struct forward *f, size_t i)
{
    return f->mean[i];
}

size_t forward_runs(const struct forward *f)
{
    return (size_t)f->n_runs;
}

const double *forward_scale(const struct forward *f)
{
    return f->scale;
}

const struct slopes *forward_slopes(const struct forward *f, size_t i)
{
    return &f->slopes[i];
}

const double *forward_gradient(const struct forward *f, size_t i)
{
    const struct slopes *slopes = &f->slopes[i];
    double *gradient = f->gradient + i * f->stride, sum = 0.0;
    memset(gradient, 0, (size_t)f->n_runs * sizeof *gradient);
    for (size_t k = 0; k < slopes->n_steps; k++)
        gradient[slopes->step_run[k]] = slopes->steps[k];
    for (int run = 0; run < f->n_runs; run++) {
        sum += gradient[run];
        gradient[run] = sum * f->scale[run];
    }
    memcpy(gradient + f->n_runs, slopes->others,
           (size_t)(f->wiring->n_parameters - f->n_runs) * sizeof *gradient);
    return gradient;
}
