/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef TESTS_OUTSIDE_PLAIN_H
#define TESTS_OUTSIDE_PLAIN_H

/*
 * A second reading of what the set-ups and the families of faults are said to do, written from
 * their definitions and sharing no code with src/network or src/faults: it takes no wiring and
 * changes none, but states for a recorded ring, its faults and a set-up which resistors there are.
 * A resistor of 0 Ω joins two nodes. Only the values that say which fault it is are taken over.
 */

#include "faults/fault.h"

#include "../rings.h"

#include <check.h>

enum { PLAIN_RESISTORS = 256, PLAIN_NODES = 256 };

struct plain {
    const struct rf_job *job;
    const struct rf_models *models;
    const struct hypothesis *faults;
    double value; /* Ω or m, of every fault that has a parameter */
    const char *setup;
    struct {
        int a, b;
        double ohms;
    } resistors[PLAIN_RESISTORS];
    size_t n_resistors;
    int n_loose; /* ends that hang in the air */
};

/* Nodes: terminals, fronts, a tee for each fault, loose ends. */
static inline int plain_terminal(int conductor, size_t place)
{
    return (int)(3 * place) + conductor;
}
static inline int plain_front(const struct plain *plain, int conductor, size_t place)
{
    return plain_terminal(conductor, plain->job->n_places + place);
}
static inline int plain_tee(const struct plain *plain, int conductor, size_t fault)
{
    return plain_terminal(conductor, 2 * plain->job->n_places + fault);
}
static inline int plain_loose_end(struct plain *plain)
{
    int node = plain_terminal(0, 2 * plain->job->n_places + FAULTS_AT_ONCE) + plain->n_loose++;
    ck_assert_int_lt(node, PLAIN_NODES);
    return node;
}

static inline void plain_add(struct plain *plain, int a, int b, double ohms)
{
    ck_assert_uint_lt(plain->n_resistors, PLAIN_RESISTORS);
    plain->resistors[plain->n_resistors].a = a;
    plain->resistors[plain->n_resistors].b = b;
    plain->resistors[plain->n_resistors++].ohms = ohms;
}

static inline bool is_family(const struct fault *fault, const char *name)
{
    return strcmp(fault->family->name, name) == 0;
}

/* The other conductor of a pair; the conductor itself where it is none of the pair's. */
static inline int plain_other(enum pair pair, int conductor)
{
    static const int other[3][3] = {{1, 0, 2}, {2, 1, 0}, {0, 2, 1}};
    return other[pair][conductor];
}

static inline double plain_ohm_per_m(const struct plain *plain, double live, double cpc,
                                     int conductor)
{
    double mm2 = conductor < 2 ? live : isnan(cpc) ? 1.5 : cpc, at_20 = NAN;
    for (size_t i = 0; i < plain->models->n_sizes; i++)
        if (plain->models->sizes[i].mm2 > mm2 - 0.01 && plain->models->sizes[i].mm2 < mm2 + 0.01)
            at_20 = plain->models->sizes[i].ohm_per_m;
    return at_20 * (1 + 0.00393 * (plain->job->temperature_c - 20));
}

static inline bool plain_is_end(const struct plain *plain, const struct fault *fault, size_t place)
{
    return place == (fault->leg_in ? plain->job->n_ring + 1 : 0);
}

/* One conductor of one run, with whatever the faults do to it. */
static inline void plain_run(struct plain *plain, size_t run, int conductor)
{
    const struct place *far = &plain->job->places[run + 1];
    const size_t near_place = run <= plain->job->n_ring ? run : far->from;
    double live = far->live_mm2, cpc = far->cpc_mm2, series = 0.0;
    int from = plain_terminal(conductor, near_place), to = plain_terminal(conductor, run + 1);
    for (size_t i = 0; i < plain->faults->n_faults; i++) {
        const struct fault *f = &plain->faults->faults[i];
        bool here = f->run == run && (f->conductor == conductor || f->conductor == 3);
        if (is_family(f, "break") && here)
            return;
        if (is_family(f, "joint") && here)
            series += plain->value;
        if (is_family(f, "transposed") && f->run == run)
            to = plain_terminal(plain_other(f->pair, conductor), run + 1);
        if (is_family(f, "size")) {
            live = f->live_mm2;
            cpc = f->cpc_mm2;
        }
        if (is_family(f, "wrong_leg")) {
            if (plain_is_end(plain, f, near_place))
                from = plain_loose_end(plain);
            if (plain_is_end(plain, f, run + 1))
                to = plain_loose_end(plain);
        }
        if (is_family(f, "spur") && run <= plain->job->n_ring) {
            size_t first = f->chain[0], last = f->chain[f->chain_length - 1];
            if (run + 1 == (first < last ? first : last))
                to = plain_tee(plain, conductor, i);
            if (run == (first < last ? last : first))
                from = plain_tee(plain, conductor, i);
        }
    }
    double metres = isnan(far->run_m) ? 5.0 : far->run_m;
    plain_add(plain, from, to, series + metres * plain_ohm_per_m(plain, live, cpc, conductor));
}

/* From a point's terminals to its front. */
static inline void plain_accessory(struct plain *plain, size_t place, int conductor)
{
    int to = conductor;
    double ohms = 0.0;
    for (size_t i = 0; i < plain->faults->n_faults; i++) {
        const struct fault *f = &plain->faults->faults[i];
        if (f->place != place)
            continue;
        if (is_family(f, "switched_off") &&
            (conductor == 0 || (conductor == 1 && f->poles == POLES_LN)))
            return;
        if (is_family(f, "reversal"))
            to = plain_other(f->pair, conductor);
        if (is_family(f, "contact") && f->conductor == conductor) {
            if (f->open)
                return;
            ohms += plain->value;
        }
    }
    plain_add(plain, plain_front(plain, conductor, place), plain_terminal(to, place), ohms);
}

/* What a fault adds. */
static inline void plain_addition(struct plain *plain, size_t fault)
{
    static const int first[3] = {0, 0, 1}, second[3] = {1, 2, 2};
    const struct fault *f = &plain->faults->faults[fault];
    const struct rf_job *job = plain->job;
    if (is_family(f, "load"))
        plain_add(plain, plain_front(plain, 0, f->place), plain_front(plain, 1, f->place),
                  plain->value);
    if (is_family(f, "short"))
        plain_add(plain, plain_terminal(first[f->pair], f->place),
                  plain_terminal(second[f->pair], f->place), plain->value);
    if (is_family(f, "parallel"))
        plain_add(plain, plain_terminal(2, f->place), plain_terminal(2, f->other), plain->value);
    for (int c = 0; c < 3; c++) {
        double ohms = plain->value * plain_ohm_per_m(plain, job->live_mm2, job->cpc_mm2, c);
        if (is_family(f, "interconnection"))
            plain_add(plain, plain_terminal(c, f->place), plain_terminal(c, f->other), ohms);
        if (is_family(f, "spur"))
            plain_add(plain, plain_tee(plain, c, fault), plain_terminal(c, f->chain[0]), ohms);
    }
}

static inline bool begins(const char *text, const char *with)
{
    return strncmp(text, with, strlen(with)) == 0;
}

/* The conductors of the set-up's pair, by the end of its name. */
static inline void plain_pair(const char *setup, int *first, int *second)
{
    const char *letters = setup + strlen(setup) - 2;
    *first = letters[0] == 'l' ? 0 : 1;
    *second = letters[1] == 'n' ? 1 : 2;
}

/* One link, from the pair's first conductor at `end` to the second's at `other`. */
static inline void plain_link(struct plain *plain, bool end_in, bool other_in)
{
    int first, second;
    double ohms = 0.0;
    size_t in = plain->job->n_ring + 1;
    plain_pair(plain->setup, &first, &second);
    for (size_t i = 0; i < plain->faults->n_faults; i++) {
        const struct fault *f = &plain->faults->faults[i];
        if (is_family(f, "not_crossed") && strcmp(setups[f->setup].name, plain->setup) == 0)
            other_in = end_in;
        if (is_family(f, "bad_link") && strcmp(setups[f->setup].name, plain->setup) == 0 &&
            f->leg_in == end_in) {
            if (f->open)
                return;
            ohms += plain->value;
        }
    }
    plain_add(plain, plain_terminal(first, end_in ? in : 0),
              plain_terminal(second, other_in ? in : 0), ohms);
}

static inline void plain_links(struct plain *plain)
{
    if (begins(plain->setup, "cross_")) {
        plain_link(plain, false, true);
        plain_link(plain, true, false);
    } else if (begins(plain->setup, "link_out_")) {
        plain_link(plain, false, false);
    } else if (begins(plain->setup, "link_in_")) {
        plain_link(plain, true, true);
    }
}

/* All resistors there are. A family this file does not know ends the test. */
static inline void plain_state(struct plain *plain, const struct rf_job *job,
                               const struct rf_models *models, const struct hypothesis *faults,
                               double value, const char *setup)
{
    static const char *const known[] = {
        "none", "break",     "joint",       "contact",  "switched_off", "load",
        "spur", "reversal",  "short",       "parallel", "transposed",   "interconnection",
        "size", "wrong_leg", "not_crossed", "bad_link", "not_nulled"};
    *plain = (struct plain){
        .job = job, .models = models, .faults = faults, .value = value, .setup = setup};
    for (size_t i = 0; i < faults->n_faults; i++) {
        bool is_known = false;
        for (size_t k = 0; k < sizeof known / sizeof *known; k++)
            is_known = is_known || is_family(&faults->faults[i], known[k]);
        ck_assert_msg(is_known, "state what the family %s does in plain.h",
                      faults->faults[i].family->name);
        plain_addition(plain, i);
    }
    for (int c = 0; c < 3; c++) {
        for (size_t run = 0; run + 1 < job->n_places; run++)
            plain_run(plain, run, c);
        for (size_t place = 0; place < job->n_places; place++)
            if (place != 0 && place != job->n_ring + 1 &&
                job->places[place].kind != KIND_JUNCTION_BOX)
                plain_accessory(plain, place, c);
    }
    plain_links(plain);
}

/* Where the meter is put: a key of a job file ("board", "l" …), or NULL with the place of a point. */
static inline void plain_probe(const struct plain *plain, const char *key, size_t place, int *a,
                               int *b)
{
    const char *setup = plain->setup;
    size_t in = plain->job->n_ring + 1;
    int first = 0, second = 0;
    if (begins(setup, "end_to_end")) {
        first = key[0] == 'l' ? 0 : key[0] == 'n' ? 1 : 2;
        *a = plain_terminal(first, 0);
        *b = plain_terminal(first, in);
        return;
    }
    if (begins(setup, "lead_")) {
        char letter = setup[strlen(setup) - 1];
        first = letter == 'l' ? 0 : letter == 'n' ? 1 : 2;
        *a = plain_terminal(first, begins(setup, "lead_in_") ? in : 0);
        *b = plain_front(plain, first, place);
        return;
    }
    plain_pair(setup, &first, &second);
    if (key == NULL) {
        *a = plain_front(plain, first, place);
        *b = plain_front(plain, second, place);
    } else {
        bool at_in = strcmp(key, "in") == 0;
        *a = plain_terminal(first, at_in ? in : 0);
        *b = plain_terminal(second, at_in ? in : 0);
    }
}

/* Ω on every reading. */
static inline double plain_offset(const struct plain *plain)
{
    double ohms = 0.0;
    for (size_t i = 0; i < plain->faults->n_faults; i++)
        if (is_family(&plain->faults->faults[i], "not_nulled"))
            ohms += plain->value;
    return ohms;
}

#endif
