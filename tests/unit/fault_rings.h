/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef TESTS_UNIT_FAULT_RINGS_H
#define TESTS_UNIT_FAULT_RINGS_H

/* What the tests of the families share: rings of several kinds, models by hand, and the members the
 * families have on a ring. All rings are invented. */

#include "faults/fault.h"

#include "../rings.h"

#include <check.h>

enum { MOST_FAULTS = 2000, MOST_READINGS = 64, MOST_MEASURED = 600 };

static struct rf_models models;
static struct reading readings[MOST_READINGS];

/* The rows of design's shipped models, by name. */
static inline void add_row(const char *name, double median, double sigma)
{
    models.families[models.n_families++] =
        (struct family_prior){.name = name, .parameter = {median, sigma}};
}

static inline struct family_prior *row_of(const char *name)
{
    for (size_t i = 0; i < models.n_families; i++)
        if (strcmp(models.families[i].name, name) == 0)
            return &models.families[i];
    return NULL;
}

static inline void add_share(const char *family, const char *name, double share)
{
    struct family_prior *row = row_of(family);
    row->shares[row->n_shares].name = name;
    row->shares[row->n_shares++].share = share;
}

static inline void add_kind(const char *family, const char *name, double share)
{
    struct family_prior *row = row_of(family);
    row->kinds[row->n_kinds].name = name;
    row->kinds[row->n_kinds++].share = share;
}

static inline void make_models(void)
{
    static const struct {
        const char *name;
        double median, sigma;
    } rows[] = {
        {"none", 0, 0},
        {"break", 0, 0},
        {"joint", 0.5, 1},
        {"contact", 0.4, 1},
        {"switched_off", 0, 0},
        {"load", 30, 0.7},
        {"interconnection", 8, 0.6},
        {"spur", 4, 0.7},
        {"reversal", 0, 0},
        {"transposed", 0, 0},
        {"short", 0.05, 1.5},
        {"parallel", 0.3, 1},
        {"size", 0, 0},
        {"wrong_leg", 0, 0},
        {"not_crossed", 0, 0},
        {"bad_link", 0.2, 1},
        {"not_nulled", 0.15, 0.5},
    };
    models_for_tests(&models);
    static char name[] = "tests";
    models.name = name;
    for (size_t i = 0; i < sizeof rows / sizeof *rows; i++)
        add_row(rows[i].name, rows[i].median, rows[i].sigma);
    static const char *const at_place[] = {
        "contact",  "switched_off", "load",      "interconnection", "spur",     "reversal",
        "parallel", "size",         "wrong_leg", "not_crossed",     "bad_link", "not_nulled"};
    for (size_t i = 0; i < sizeof at_place / sizeof *at_place; i++)
        add_share(at_place[i], "place", 1);
    add_share("break", "end", 0.45);
    add_share("break", "inside", 0.10);
    add_share("break", "whole_end", 0.3);
    add_share("break", "whole_inside", 0.4);
    add_share("joint", "end", 0.45);
    add_share("joint", "inside", 0.10);
    add_share("transposed", "end", 0.5);
    add_share("short", "point", 0.4);
    add_share("short", "runs", 0.6);
    add_kind("contact", "open", 0.3);
    add_kind("contact", "high", 0.7);
    add_kind("bad_link", "open", 0.4);
    add_kind("bad_link", "high", 0.6);
    add_kind("spur", "1", 0.60);
    add_kind("spur", "2", 0.25);
    add_kind("spur", "3", 0.15);
}

/* --- faults --- */

#define JOINT(of, c)                                                                               \
    {                                                                                              \
        .family = &fault_family_joint, .run = of, .conductor = c                                   \
    }
#define SPUR(...)                                                                                  \
    {                                                                                              \
        .family = &fault_family_spur, .chain = {__VA_ARGS__}, .chain_length = 1                    \
    }

/* --- rings --- */

static inline void add_reading(struct rf_job *job, const char *setup, enum spot spot)
{
    job->readings = readings;
    readings[job->n_readings++] =
        (struct reading){.setup = setup_find(setup), .spot = spot, .ohms = 0.5};
}

static inline void lay(struct small_ring *ring, size_t n)
{
    static const double run_m[] = {6.5, 4, 9, 3.5, 7, 5, 8, 11, 2, 6, 7.5, 4.5, 10, 3, 5.5};
    ring_lay(ring, n, run_m);
    add_reading(&ring->job, "end_to_end", SPOT_L);
    add_reading(&ring->job, "cross_ln", SPOT_BOARD);
    add_reading(&ring->job, "cross_ln", SPOT_BOARD);
    add_reading(&ring->job, "cross_le", SPOT_BOARD);
}

/* Junction boxes, a spur on a spur, spurs on the ends, and every kind of set-up. */
static inline void lay_tangled(struct small_ring *ring)
{
    lay(ring, 5);
    ring->places[2].kind = KIND_JUNCTION_BOX;
    size_t spur = ring_add_spur(ring, 2, 3);
    ring_add_spur(ring, spur, 2.5);
    ring_add_spur(ring, place_out(), 4);
    ring_add_spur(ring, place_in(&ring->job), 1.5);
    ring->places[spur + 2].kind = KIND_JUNCTION_BOX;
    ring_add_spur(ring, spur + 2, 2);
    add_reading(&ring->job, "link_out_ln", SPOT_IN);
    add_reading(&ring->job, "link_in_ne", SPOT_OUT);
    add_reading(&ring->job, "apart_ln", SPOT_OUT);
    add_reading(&ring->job, "lead_out_n", SPOT_POINT);
    readings[ring->job.n_readings - 1].place = 1;
}

/* Nothing known but how many points, and sizes of their own. */
static inline void lay_unknown(struct small_ring *ring)
{
    lay(ring, 3);
    ring_add_spur(ring, 1, NAN);
    ring->job.cpc_mm2 = NAN;
    for (size_t place = 0; place < ring->job.n_places; place++) {
        ring->places[place].run_m = NAN;
        ring->places[place].cpc_mm2 = place == 2 ? 2.5 : NAN;
    }
}

enum { N_RINGS = 5 };
static inline void lay_ring(struct small_ring *ring, int which)
{
    switch (which) {
    case 0:
        lay(ring, 1);
        break;
    case 1:
        lay(ring, 2);
        ring_add_spur(ring, 2, 4);
        break;
    case 2:
        lay(ring, 4);
        break;
    case 3:
        lay_tangled(ring);
        break;
    default:
        lay_unknown(ring);
        break;
    }
}

/* --- members --- */

struct members {
    struct fault faults[MOST_FAULTS];
    size_t n, most;
};

static inline bool collect(void *context, const struct fault *fault)
{
    struct members *members = context;
    ck_assert_uint_lt(members->n, MOST_FAULTS);
    members->faults[members->n++] = *fault;
    return members->n < members->most;
}

static struct members members;

static inline void enumerate_all(const struct rf_job *job)
{
    members.n = 0;
    members.most = MOST_FAULTS;
    for (size_t i = 0; i < n_fault_families; i++)
        fault_families[i]->enumerate(job, &models, collect, &members);
}

static inline void enumerate_family(const struct fault_family *family, const struct rf_job *job)
{
    members.n = 0;
    members.most = MOST_FAULTS;
    family->enumerate(job, &models, collect, &members);
}

#endif
