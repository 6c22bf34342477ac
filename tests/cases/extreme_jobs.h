/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef TESTS_CASES_EXTREME_JOBS_H
#define TESTS_CASES_EXTREME_JOBS_H

/*
 * Jobs at the ends of what the format allows, written as files have them. All rings and readings
 * are invented.
 */

#include "base/text.h"
#include "simulation/simulation.h"

#include "../shipped_models.h"

#include <check.h>
#include <stdio.h>
#include <string.h>

/* A ring: all runs of one length, or by turns of two. */
struct extreme_ring {
    size_t points;
    double run_m, other_m; /* m; 0: not known, the same */
    size_t spurs;          /* on the second point, or on the only one */
    bool chain;            /* each spur on the one before */
    const char *id_prefix; /* of ring points, before their number; NULL: "P" */
};

/* What is read, value for value; `i` counts from 0. A JSON value of a reading. */
typedef const char *value_of_reading(size_t i);

static inline const char *value_open(size_t i)
{
    return (void)i, "\"open\"";
}
static inline const char *value_zero(size_t i)
{
    return (void)i, "0";
}
static inline const char *value_high(size_t i)
{
    return (void)i, "99.9";
}
static inline const char *value_half(size_t i)
{
    return (void)i, "0.5";
}
static inline const char *value_extremes_in_turn(size_t i)
{
    return i % 2 == 0 ? "0" : "99.9";
}
static inline const char *value_contradictory(size_t i)
{
    static const char *const values[] = {"0.3", "\"open\"", "12", "0", "3.5", "99.9", "0.07"};
    return values[i * i % 7];
}
static inline const char *value_contradictory_repeats(size_t i)
{
    (void)i;
    return "[0.2, 4, \"open\", 0, 55]";
}

static inline void add_point_id(struct text *out, const struct extreme_ring *ring, size_t i)
{
    if (i < ring->points)
        text_addf(out, "%s%zu", ring->id_prefix != NULL ? ring->id_prefix : "P", i + 1);
    else
        text_addf(out, "S%zu", i - ring->points + 1);
}

static inline void add_length(struct text *out, const char *key, double metres)
{
    if (metres > 0)
        text_addf(out, ", \"%s\": %.1f", key, metres);
}

static inline void add_ring(struct text *out, const struct extreme_ring *ring)
{
    double other = ring->other_m > 0 ? ring->other_m : ring->run_m;
    text_add(out, "\"ring\": {\"points\": [");
    for (size_t i = 0; i < ring->points; i++) {
        text_add(out, i > 0 ? ", {\"id\": \"" : "{\"id\": \"");
        add_point_id(out, ring, i);
        text_add(out, "\"");
        add_length(out, "run_m", i % 2 == 0 ? ring->run_m : other);
        text_add(out, "}");
    }
    text_add(out, "]");
    add_length(out, "last_run_m", ring->points % 2 == 0 ? ring->run_m : other);
    size_t root = ring->points > 1 ? 1 : 0;
    for (size_t i = 0; i < ring->spurs; i++) {
        text_add(out, i > 0 ? ", {\"id\": \"" : ", \"spurs\": [{\"id\": \"");
        add_point_id(out, ring, ring->points + i);
        text_add(out, "\", \"from\": \"");
        add_point_id(out, ring, ring->chain && i > 0 ? ring->points + i - 1 : root);
        text_add(out, "\"");
        add_length(out, "run_m", ring->run_m);
        text_add(out, "}");
    }
    text_add(out, ring->spurs > 0 ? "]}" : "}");
}

/* Whether a space-separated list names the set-up; "*" names all. */
static inline bool names_set_up(const char *list, const char *name)
{
    size_t length = strlen(name);
    if (strcmp(list, "*") == 0)
        return true;
    for (const char *at = list; (at = strstr(at, name)) != NULL; at += length)
        if ((at == list || at[-1] == ' ') && (at[length] == ' ' || at[length] == '\0'))
            return true;
    return false;
}

/* Every reading that can be taken in the set-up; `highest` only where it may read so. */
static inline void add_set_up(struct text *out, const struct extreme_ring *ring,
                              const struct setup *setup, value_of_reading *value, size_t *i)
{
    size_t n = 0;
    for (size_t spot = SPOT_BOARD; spot < N_SPOTS; spot++) {
        bool open = spot == SPOT_HIGHEST && strstr(value(*i), "open") != NULL;
        if ((setup->spots >> spot & 1u) != 0 && !open)
            text_addf(out, "%s\"%s\": %s", n++ > 0 ? ", " : "", spot_keys[spot], value((*i)++));
    }
    for (size_t k = 0; k < ring->points + ring->spurs; k++) {
        if ((setup->spots >> SPOT_POINT & 1u) == 0)
            break;
        text_add(out, n++ > 0 ? ", \"" : "\"");
        add_point_id(out, ring, k);
        text_addf(out, "\": %s", value((*i)++));
    }
}

static inline void begin_job(struct text *out, const struct extreme_ring *ring)
{
    text_add(out, "{\"format\": \"ringfettle-job/1\", \"job\": \"extreme\", ");
    add_ring(out, ring);
    text_add(out, ", \"readings\": {");
}

static inline struct rf_job *end_job(struct text *out)
{
    struct rf_job *job;
    struct rf_error error;
    text_add(out, "}}");
    ck_assert(!out->failed);
    ck_assert_msg(rf_job_parse(out->bytes, out->length, "extreme", &job, &error) == RF_OK, "%s\n%s",
                  error.text, out->bytes);
    text_finish(out);
    return job;
}

/* The ring with every reading of those set-ups. The caller destroys it. */
static inline struct rf_job *extreme_job(const struct extreme_ring *ring, const char *set_ups,
                                         value_of_reading *value)
{
    struct text text = {0};
    size_t n = 0, i = 0;
    begin_job(&text, ring);
    for (size_t s = 0; s < N_SETUPS; s++) {
        if (!names_set_up(set_ups, setups[s].name))
            continue;
        text_addf(&text, "%s\"%s\": {", n++ > 0 ? ", " : "", setups[s].name);
        add_set_up(&text, ring, &setups[s], value, &i);
        text_add(&text, "}");
    }
    return end_job(&text);
}

/* The ring with one reading. */
static inline struct rf_job *job_of_one_reading(const struct extreme_ring *ring,
                                                const struct measurement *m, const char *value)
{
    struct text text = {0};
    begin_job(&text, ring);
    text_addf(&text, "\"%s\": {\"", setups[m->setup].name);
    if (m->spot == SPOT_POINT)
        add_point_id(&text, ring, m->place <= ring->points ? m->place - 1 : m->place - 2);
    else
        text_add(&text, spot_keys[m->spot]);
    text_addf(&text, "\": %s}", value);
    return end_job(&text);
}

/* The job of a simulation on that ring; the caller destroys the truth. */
static inline struct truth *simulated(const struct rf_job *ring, const struct simulation *how)
{
    struct truth *truth;
    struct rf_error error;
    ck_assert_msg(simulate(ring, models, how, &truth, &error) == RF_OK, "%s", error.text);
    return truth;
}

static const char standard_plan[] = "end_to_end cross_ln cross_le";

#endif
