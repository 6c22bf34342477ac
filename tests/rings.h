/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef TESTS_RINGS_H
#define TESTS_RINGS_H

/*
 * Small rings and models made by hand, for tests of rooms below the reading of files. All lengths
 * are invented. Resistances are the maxima of IEC 60228:2004, table 1 (class 1, plain copper, at
 * 20 °C; from memory); tests compare ways of computing, so they would pass with any others.
 */

#include "job/job.h"
#include "models/models.h"

#include <assert.h>
#include <math.h>
#include <stdint.h>
#include <stdio.h>
#include <string.h>

enum { RING_MAX_PLACES = 24, RING_ID = 8 };

struct small_ring {
    struct rf_job job;
    struct place places[RING_MAX_PLACES];
    char ids[RING_MAX_PLACES][RING_ID];
    char source[16];
};

static inline void ring_name(struct small_ring *ring, size_t place, const char *letter,
                             size_t number)
{
    snprintf(ring->ids[place], RING_ID, "%s%u", letter, (unsigned)(number % 1000u));
    ring->places[place].id = ring->ids[place];
}

/* A ring of n points, 2.5 mm² with a 1.5 mm² CPC; run_m[0 … n], the last one back to the board.
 * The ring points to itself: it must not be copied. */
static inline void ring_lay(struct small_ring *ring, size_t n, const double run_m[])
{
    assert(n + 2 <= RING_MAX_PLACES);
    memset(ring, 0, sizeof *ring);
    strcpy(ring->source, "small-ring.json");
    ring->job = (struct rf_job){
        .source = ring->source,
        .live_mm2 = 2.5,
        .cpc_mm2 = 1.5,
        .temperature_c = 20,
        .length_accuracy = 0.2,
        .n_ring = n,
        .n_places = n + 2,
        .places = ring->places,
        .setup_in_place = N_SETUPS,
    };
    for (size_t place = 0; place < n + 2; place++) {
        ring->places[place] = (struct place){
            .from = place > 0 ? place - 1 : 0,
            .run_m = place > 0 ? run_m[place - 1] : NAN,
            .live_mm2 = 2.5,
            .cpc_mm2 = 1.5,
            .open_minutes = NAN,
        };
        ring_name(ring, place, "P", place);
    }
    strcpy(ring->ids[0], "out");
    strcpy(ring->ids[n + 1], "in");
}

/* Hangs a further spur point on `from`; its place. */
static inline size_t ring_add_spur(struct small_ring *ring, size_t from, double run_m)
{
    size_t place = ring->job.n_places++;
    assert(place < RING_MAX_PLACES);
    ring->job.n_spurs++;
    ring->places[place] = (struct place){.from = from,
                                         .run_m = run_m,
                                         .live_mm2 = ring->job.live_mm2,
                                         .cpc_mm2 = ring->job.cpc_mm2,
                                         .open_minutes = NAN};
    ring_name(ring, place, "S", ring->job.n_spurs);
    return place;
}

static inline void models_for_tests(struct rf_models *models)
{
    memset(models, 0, sizeof *models);
    static const struct conductor_row sizes[] = {
        {1.0, 0.0181}, {1.5, 0.0121}, {2.5, 0.00741}, {4.0, 0.00461}, {6.0, 0.00308},
    };
    models->n_sizes = sizeof sizes / sizeof *sizes;
    memcpy(models->sizes, sizes, sizeof sizes);
    models->temperature_coefficient = 0.00393;
    static const struct cable_row cables[] = {
        {1.5, 1.0}, {2.5, 1.0}, {2.5, 1.5}, {4.0, 1.5}, {4.0, 2.5}, {6.0, 2.5},
    };
    models->n_cables = sizeof cables / sizeof *cables;
    memcpy(models->cables, cables, sizeof cables);
    models->unknown_length = (struct lognormal){5, 0.7};
    models->conductor_sigma = 0.02;
    models->unknown_cpc_mm2 = 1.5;
    models->unknown_cpc_sigma = 0.7;
    models->instrument.gain_sigma = 0.01;
    models->instrument.lead_sigma = 0.01;
    models->instrument.face_sigma = 0.01;
    models->instrument.wander_sigma = 0.03;
}

/* Seeded numbers the same on every machine: xorshift64* (S. Vigna, "An experimental exploration of
 * Marsaglia's xorshift generators, scrambled", ACM TOMS 42, 2016). State must not be 0. */
static inline double random_unit(uint64_t *state)
{
    *state ^= *state >> 12;
    *state ^= *state << 25;
    *state ^= *state >> 27;
    return (double)((*state * UINT64_C(2685821657736338717)) >> 11) / 9007199254740992.0;
}
static inline size_t random_below(uint64_t *state, size_t n)
{
    return (size_t)(random_unit(state) * (double)n);
}
/* Log-uniform. */
static inline double random_between(uint64_t *state, double low, double high)
{
    return low * exp(random_unit(state) * log(high / low));
}

#endif
