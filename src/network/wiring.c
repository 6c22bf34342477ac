/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "network/wiring.h"

#include "base/error.h"
#include "base/memory.h"
#include "base/text.h"

#include <assert.h>
#include <math.h>
#include <string.h>

static enum rf_status refuse_size(const struct wiring *wiring, size_t place, const char *key,
                                  double mm2, struct rf_error *error)
{
    const struct rf_job *job = wiring->job;
    struct text known = {0};
    for (size_t i = 0; i < wiring->models->n_sizes; i++)
        text_addf(&known, "%s%g", i > 0 ? ", " : "", wiring->models->sizes[i].mm2);
    struct text path = {0};
    if (place == place_out())
        text_addf(&path, "ring.%s", key);
    else if (place == place_in(job))
        text_addf(&path, "ring.%s (for the last run)", key);
    else if (place_on_ring(job, place))
        text_addf(&path, "ring.points[%zu].%s", place - 1, key);
    else
        text_addf(&path, "ring.spurs[%zu].%s", place - place_in(job) - 1, key);
    enum rf_status status =
        known.failed || path.failed
            ? fail_memory(error)
            : fail(error, RF_REFUSED, "%s: %s: no conductor of %g mm² is known; right would be %s",
                   job->source, path.bytes, mm2, known.bytes);
    text_finish(&known);
    text_finish(&path);
    return status;
}

static double size_of(const struct wiring *wiring, double live_mm2, double cpc_mm2,
                      enum conductor conductor)
{
    if (conductor != CPC)
        return live_mm2;
    return isnan(cpc_mm2) ? wiring->models->unknown_cpc_mm2 : cpc_mm2;
}

static double ohm_per_m(const struct wiring *wiring, double live_mm2, double cpc_mm2,
                        enum conductor conductor)
{
    return models_ohm_per_m(wiring->models, size_of(wiring, live_mm2, cpc_mm2, conductor),
                            wiring->job->temperature_c);
}

/* The parameter that scales a conductor of cable whose CPC is of that size. */
static int factor_of(const struct wiring *wiring, double cpc_mm2, enum conductor conductor)
{
    return conductor == CPC && isnan(cpc_mm2) ? wiring->map.unknown_cpc
                                              : wiring->map.conductor[conductor];
}

static bool cpc_unknown(const struct rf_job *job)
{
    bool unknown = isnan(job->cpc_mm2); /* the ring's own cable, for cable not recorded */
    for (size_t run = 0; run < n_runs(job); run++)
        unknown = unknown || isnan(job->places[run_far_end(run)].cpc_mm2);
    return unknown;
}

/* Lays out θ: lengths, conductors, instrument; `parameters` holds what each one scales with. */
static void map_parameters(struct wiring *wiring)
{
    const struct rf_job *job = wiring->job;
    const struct rf_models *models = wiring->models;
    struct parameter_map *map = &wiring->map;
    map->runs = 0;
    for (size_t run = 0; run < n_runs(job); run++)
        wiring_add_parameter(wiring,
                             isnan(job->places[run_far_end(run)].run_m)
                                 ? models->unknown_length.sigma
                                 : job->length_accuracy * (1.0 + models->wider.length_excess));
    for (int c = 0; c < N_CONDUCTORS; c++)
        map->conductor[c] = wiring_add_parameter(wiring, models->conductor_sigma);
    map->unknown_cpc = cpc_unknown(job) ? wiring_add_parameter(wiring, models->unknown_cpc_sigma)
                                        : NO_PARAMETER;
    map->gain = wiring_add_parameter(wiring, models->instrument.gain_sigma);
    map->lead = wiring_add_parameter(wiring, models->instrument.lead_sigma);
    map->face = wiring_add_parameter(
        wiring, hypot(models->instrument.face_sigma, models->wider.face_ohms));
    wiring->parameters[map->face].mean = 2.0 * models->wider.face_ohms; /* of a pair's two */
    map->wander = wiring_add_parameter(wiring, models->instrument.wander_sigma);
    map->n_common = wiring->n_parameters;
}

/* Pieces lie conductor by conductor, so that neighbours in memory share a factor and their lengths
 * are neighbours too. */
static enum rf_status lay_run(struct wiring *wiring, size_t run, struct rf_error *error)
{
    const struct rf_job *job = wiring->job;
    const struct place *far = &job->places[run_far_end(run)];
    double metres = isnan(far->run_m) ? wiring->models->unknown_length.median : far->run_m;
    for (enum conductor c = LINE; c < N_CONDUCTORS; c++) {
        double per_m = ohm_per_m(wiring, far->live_mm2, far->cpc_mm2, c);
        if (isnan(per_m))
            return refuse_size(wiring, run_far_end(run), c == CPC ? "cpc_mm2" : "live_mm2",
                               size_of(wiring, far->live_mm2, far->cpc_mm2, c), error);
        wiring->n_wires++;
        wiring->wires[(size_t)c * n_runs(job) + run] = (struct wire){
            .a = terminal(run_near_end(job, run), c),
            .b = terminal(run_far_end(run), c),
            .ohms = metres * per_m,
            .metres = metres,
            .length_parameter = wiring->map.runs + (int)run,
            .factor_parameter = factor_of(wiring, far->cpc_mm2, c),
            .run = (int)run,
            .conductor = c,
        };
    }
    return RF_OK;
}

/* The ring's own cable is what an interconnection or a tail to a tee is taken to be. */
static enum rf_status check_ring_cable(const struct wiring *wiring, struct rf_error *error)
{
    const struct rf_job *job = wiring->job;
    for (enum conductor c = LINE; c < N_CONDUCTORS; c++)
        if (isnan(ohm_per_m(wiring, job->live_mm2, job->cpc_mm2, c)))
            return refuse_size(wiring, place_out(), c == CPC ? "cpc_mm2" : "live_mm2",
                               size_of(wiring, job->live_mm2, job->cpc_mm2, c), error);
    return RF_OK;
}

static bool allocate(struct wiring *wiring)
{
    size_t places = wiring->job->n_places, runs = n_runs(wiring->job);
    wiring->max_nodes = (int)(places * N_CONDUCTORS) + FAULTS_AT_ONCE * NODES_PER_FAULT;
    wiring->max_wires = runs * N_CONDUCTORS + FAULTS_AT_ONCE * WIRES_PER_FAULT;
    size_t fixed = runs + N_CONDUCTORS + 5;
    wiring->parameters = NEW_ARRAY(struct parameter, fixed + FAULTS_AT_ONCE);
    wiring->front = NEW_ARRAY(int, places * N_CONDUCTORS);
    wiring->wires = NEW_ARRAY(struct wire, wiring->max_wires);
    return wiring->parameters != NULL && wiring->front != NULL && wiring->wires != NULL;
}

enum rf_status wiring_init(struct wiring *wiring, const struct rf_job *job,
                           const struct rf_models *models, struct rf_error *error)
{
    *wiring = (struct wiring){.job = job, .models = models, .offset_parameter = NO_PARAMETER};
    if (!allocate(wiring)) {
        wiring_finish(wiring);
        return fail_memory(error);
    }
    wiring->n_nodes = (int)(job->n_places * N_CONDUCTORS);
    for (size_t place = 0; place < job->n_places; place++)
        for (enum conductor c = LINE; c < N_CONDUCTORS; c++)
            wiring->front[terminal(place, c)] =
                place_has_front(job, place) ? terminal(place, c) : -1;
    map_parameters(wiring);
    enum rf_status status = check_ring_cable(wiring, error);
    for (size_t run = 0; run < n_runs(job) && status == RF_OK; run++)
        status = lay_run(wiring, run, error);
    if (status != RF_OK)
        wiring_finish(wiring);
    return status;
}

void wiring_finish(struct wiring *wiring)
{
    free(wiring->parameters);
    free(wiring->front);
    free(wiring->wires);
    *wiring = (struct wiring){0};
}

void wiring_copy(struct wiring *wiring, const struct wiring *from)
{
    assert(wiring->job == from->job && wiring->max_wires == from->max_wires);
    struct wiring copy = *from;
    copy.parameters = wiring->parameters;
    copy.front = wiring->front;
    copy.wires = wiring->wires;
    memcpy(copy.parameters, from->parameters, (size_t)from->n_parameters * sizeof *from->parameters);
    memcpy(copy.front, from->front, from->job->n_places * N_CONDUCTORS * sizeof *from->front);
    memcpy(copy.wires, from->wires, from->n_wires * sizeof *from->wires);
    *wiring = copy;
}

int wiring_add_node(struct wiring *wiring)
{
    assert(wiring->n_nodes < wiring->max_nodes);
    return wiring->n_nodes++;
}

int wiring_add_parameter(struct wiring *wiring, double sigma)
{
    wiring->parameters[wiring->n_parameters] = (struct parameter){.sigma = sigma};
    return wiring->n_parameters++;
}

static struct wire *add_wire(struct wiring *wiring)
{
    assert(wiring->n_wires < wiring->max_wires);
    return &wiring->wires[wiring->n_wires++];
}

void wiring_add_resistor(struct wiring *wiring, int a, int b, double ohms, int parameter)
{
    *add_wire(wiring) = (struct wire){.a = a,
                                      .b = b,
                                      .ohms = ohms,
                                      .length_parameter = parameter,
                                      .factor_parameter = NO_PARAMETER,
                                      .run = -1};
}

void wiring_add_cable(struct wiring *wiring, enum conductor conductor, int a, int b, double metres,
                      int parameter)
{
    const struct rf_job *job = wiring->job;
    *add_wire(wiring) = (struct wire){
        .a = a,
        .b = b,
        .ohms = metres * ohm_per_m(wiring, job->live_mm2, job->cpc_mm2, conductor),
        .metres = metres,
        .length_parameter = parameter,
        .factor_parameter = factor_of(wiring, job->cpc_mm2, conductor),
        .run = -1,
        .conductor = conductor,
    };
}

struct wire *wiring_next_piece(struct wiring *wiring, size_t run, enum conductor conductor,
                               size_t *next)
{
    while (*next < wiring->n_wires) {
        struct wire *wire = &wiring->wires[(*next)++];
        if (wire->run == (int)run && wire->conductor == conductor && wire->a >= 0)
            return wire;
    }
    return NULL;
}

void wiring_move_end(struct wiring *wiring, size_t run, size_t place, const int nodes[N_CONDUCTORS])
{
    for (size_t i = 0; i < wiring->n_wires; i++) {
        struct wire *wire = &wiring->wires[i];
        if (wire->run != (int)run || wire->a < 0)
            continue;
        /* Which conductor's terminal it is on, not which conductor it is: a transposed run's
         * pieces are moved as they lie. */
        for (enum conductor c = LINE; c < N_CONDUCTORS; c++) {
            if (wire->a == terminal(place, c)) {
                wire->a = nodes[c];
                break;
            }
            if (wire->b == terminal(place, c)) {
                wire->b = nodes[c];
                break;
            }
        }
    }
}

void wiring_set_cable(struct wiring *wiring, double live_mm2, double cpc_mm2)
{
    for (size_t i = 0; i < wiring->n_wires; i++) {
        struct wire *wire = &wiring->wires[i];
        if (wire->metres <= 0.0)
            continue;
        wire->ohms = wire->metres * ohm_per_m(wiring, live_mm2, cpc_mm2, wire->conductor);
        wire->factor_parameter = factor_of(wiring, cpc_mm2, wire->conductor);
    }
}

/* The two links of a set-up, as pairs of nodes; the first is at the pair's first conductor's out
 * end, the second at its in end. a < 0: no such link. */
static void place_links(const struct wiring *wiring, size_t setup, struct edge links[2])
{
    const struct setup *s = &setups[setup];
    struct pair_members pair = pair_members[s->pair];
    size_t out = place_out(), in = place_in(wiring->job);
    bool crossed = s->joining == JOIN_CROSS && !wiring->links[setup].not_crossed;
    links[0] = links[1] = (struct edge){.a = -1, .b = -1, .zero = true};
    if (s->joining == JOIN_CROSS || s->joining == JOIN_LINK_OUT) {
        links[0].a = terminal(out, pair.first);
        links[0].b = terminal(crossed ? in : out, pair.second);
    }
    if (s->joining == JOIN_CROSS || s->joining == JOIN_LINK_IN) {
        links[1].a = terminal(in, pair.first);
        links[1].b = terminal(crossed ? out : in, pair.second);
    }
}

size_t wiring_join(const struct wiring *wiring, size_t setup, struct edge edges[],
                   int wire_of_edge[])
{
    size_t n = 0;
    for (size_t i = 0; i < wiring->n_wires; i++)
        if (wiring->wires[i].a >= 0) {
            edges[n] = (struct edge){.a = wiring->wires[i].a, .b = wiring->wires[i].b};
            wire_of_edge[n++] = (int)i;
        }
    struct edge links[2];
    place_links(wiring, setup, links);
    const enum link_state state[2] = {wiring->links[setup].out, wiring->links[setup].in};
    for (int i = 0; i < 2; i++)
        if (links[i].a >= 0 && state[i] != LINK_OPEN) {
            links[i].zero = state[i] == LINK_MADE;
            edges[n] = links[i];
            wire_of_edge[n++] = -1;
        }
    return n;
}

static int front_or_terminal(const struct wiring *wiring, size_t place, enum conductor conductor)
{
    int front = wiring->front[terminal(place, conductor)];
    return front >= 0 ? front : terminal(place, conductor);
}

struct probe wiring_probe(const struct wiring *wiring, size_t setup, enum spot spot, size_t place)
{
    const struct setup *s = &setups[setup];
    size_t out = place_out(), in = place_in(wiring->job);
    struct pair_members pair = pair_members[s->pair];
    switch (spot) {
    case SPOT_L:
    case SPOT_N:
    case SPOT_E: {
        enum conductor c = LINE + (enum conductor)(spot - SPOT_L);
        return (struct probe){terminal(out, c), terminal(in, c)};
    }
    case SPOT_BOARD:
    case SPOT_OUT:
        return (struct probe){terminal(out, pair.first), terminal(out, pair.second)};
    case SPOT_IN:
        return (struct probe){terminal(in, pair.first), terminal(in, pair.second)};
    case SPOT_POINT:
    case SPOT_HIGHEST:
    case N_SPOTS:
        break;
    }
    if (setup_is_pair(s))
        return (struct probe){front_or_terminal(wiring, place, pair.first),
                              front_or_terminal(wiring, place, pair.second)};
    size_t end = s->joining == JOIN_LEAD_OUT ? out : in;
    return (struct probe){terminal(end, s->conductor),
                          front_or_terminal(wiring, place, s->conductor)};
}
