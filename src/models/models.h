/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef MODELS_MODELS_H
#define MODELS_MODELS_H

/*
 * The numbers of models/ as the other rooms see them. Each file there carries the source of its
 * numbers beside them. The tables hold rows by name; the families, looks and sizes the
 * program knows are checked against them when they are loaded, so that a missing row is a refusal
 * and not a surprise later.
 */

#include <ringfettle/models.h>

#include <stdbool.h>
#include <stddef.h>

enum {
    MODELS_MAX_SIZES = 16,
    MODELS_MAX_CABLES = 16,
    MODELS_MAX_FAMILIES = 32,
    MODELS_MAX_KINDS = 4
};

/* conductor.json */
struct conductor_row {
    double mm2;
    double ohm_per_m; /* Ω/m at 20 °C, one conductor */
};

struct cable_row { /* the cables a ring may turn out to be wired in (family `size`) */
    double live_mm2, cpc_mm2;
};

/* A log-normal quantity: median · exp(sigma · θ), θ ~ N(0,1). */
struct lognormal {
    double median; /* Ω or m; 0: none */
    double sigma;  /* of the log */
};

/* instrument.json; Ω unless said otherwise. */
struct instrument_model {
    double gain_sigma; /* of the log */
    double lead_sigma, face_sigma, wander_sigma;
    double noise_floor;    /* 0.015 */
    double noise_relative; /* 0.015 of the reading */
    double step;           /* 0.01: the display's */
    double misread;        /* 0.01: share of finite readings that are misread */
    double open_wrong;     /* 0.001: share of readings over range though a path exists, or not */
    double misread_floor;  /* 0.05: below it the misread density is flat */
    double over_range;     /* 99.9 */
};

/* How much worse than the models say faces and lengths are taken to be. Nothing that is loaded: all
 * 0, until a diagnosis finds that it would explain what nothing else does. */
struct widening {
    double face_ohms; /* Ω: a resistance of its own in each conductor's way to each face, so much
                           * on average and, exponential, with so much standard deviation */
    double
        length_excess; /* recorded runs are 1 + so many times as wrong (of the log) as recorded */
};

/* faults.json: one row a family. */
struct family_prior {
    const char *name;
    double prior; /* of the base rates asked for; the rows sum to 1 */
    size_t n_kinds;
    struct {
        const char *name; /* "open", "high"; "1", "2", "3" */
        double share;     /* of the family's prior, if all kinds are present */
    } kinds[MODELS_MAX_KINDS];
    struct lognormal parameter;
    bool metres;     /* the parameter is in m, not Ω */
    size_t n_shares; /* effort.json: where the defect shows, by names the family knows */
    struct {
        const char *name; /* "end", "inside", "point" … */
        double share;
    } shares[MODELS_MAX_KINDS];
    double count; /* confirmed jobs behind the prior; 0 as shipped */
};

/* effort.json, minutes. */
struct effort_model {
    double change_of_setup, reading_at_point, reading_at_board;
    double wander_first, wander_next;
    double check_face, open_accessory, open_junction_box, open_board, open_run;
    double stop_share; /* 0.05: looking stops when all defects left are under this share */
};

struct rf_models {
    char *name;
    size_t n_sizes;
    struct conductor_row sizes[MODELS_MAX_SIZES]; /* ascending mm² */
    size_t n_cables;
    struct cable_row cables[MODELS_MAX_CABLES];
    double temperature_coefficient;  /* 0.00393 per °C, referred to 20 °C */
    struct lognormal unknown_length; /* 5 m, 0.7 */
    double conductor_sigma;          /* 0.02 of the log, each of L, N, E */
    double unknown_cpc_mm2;          /* 1.5 */
    double unknown_cpc_sigma;        /* 0.7 of the log */
    struct instrument_model instrument;
    struct widening wider;
    double archive_none; /* share of `none` among filed jobs, whatever rates were asked for */
    size_t n_families;
    struct family_prior families[MODELS_MAX_FAMILIES];
    struct effort_model effort;
    char *strings; /* owns the names above, or NULL */
    size_t strings_used;
};

/* Ω/m of one conductor at `temperature_c`; NAN for a size that is not in the table.
 * R(t) = R20 · (1 + α (t − 20)), IEC 60228 annex A's factors to 0.003. */
double models_ohm_per_m(const struct rf_models *models, double mm2, double temperature_c);

/* The row of that family, or NULL. */
const struct family_prior *models_family(const struct rf_models *models, const char *name);
/* The share of that name in the row (`shares`), 0 where it has none. */
double family_share(const struct family_prior *row, const char *name);

#endif
