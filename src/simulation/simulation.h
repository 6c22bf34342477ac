/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef SIMULATION_SIMULATION_H
#define SIMULATION_SIMULATION_H

/*
 * Invented jobs: a ring and a defect in, a noisy job out, drawn from the very model the diagnosis
 * assumes. Everything hidden is drawn from N(0, 1) in whitened parameters (fit/forward.h), so the
 * true length of a run is its recorded one × exp(accuracy · θ), and so on. The meter then shows,
 * for a mean m (Ω) that the forward model gives,
 *
 *   where a path exists   over range with chance open_wrong; else, with chance misread, a value
 *                         drawn from U; else m + normal noise of
 *                         σ² = noise_floor² + (noise_relative · m)²
 *   where none does       a value drawn from U with chance open_wrong; else over range,
 *
 * in steps of the display: negatives as 0.00, more than the range as over range. The rounding is
 * the last term of the likelihood's σ², so it is not drawn again. U is the density of misreads,
 * 1/(max(y, y0) · c) with y0 = misread_floor and c = ln(over_range / y0): flat below y0 and
 * log-uniform above. It integrates to 1 + 1/c, so its share below y0 is 1/(1 + c).
 *
 * All is reproducible: a number comes from a generator (MT19937, M. Matsumoto and T. Nishimura,
 * ACM TOMACS 8, 1998) seeded by the job's seed and by the name of what is drawn. A reading's noise
 * goes by seed, set-up, place and repeat, so asking the same again gets the same answer, in
 * whatever order questions come.
 *
 * GSL's generators are used: see ringfettle/status.h about its error handler.
 */

#include "faults/fault.h"
#include "fit/forward.h"

#include <gsl/gsl_rng.h>
#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

/* Where a simulated ring and meter depart from what the diagnosis assumes. Zeroed: nowhere. */
struct departures {
    bool heavy_tails;     /* Student's t, 4 degrees, of the same variance, in place of normal noise */
    double contact_ohms;  /* mean Ω, exponential: in every conductor's way to every face */
    double length_factor; /* runs are so many times as wrong (of the log) as recorded; 0: once */
};

/* What to simulate on a ring. Zeroed: a hypothesis and all else drawn, seed 0. */
struct simulation {
    uint32_t seed;
    bool given;                   /* `hypothesis` says what is wrong; else it is drawn */
    struct hypothesis hypothesis; /* of the ring's job; n_faults 0: wired as recorded */
    double value[FAULTS_AT_ONCE]; /* Ω or m, each fault's parameter; 0: drawn */
    size_t defects;   /* where drawn: so many different ones; 0: one or none, from the priors */
    const char *name; /* `job`; NULL: "simulated-SEED" */
    struct departures departures;
};

/* What a meter shows. */
struct shown {
    bool open;   /* over range */
    double ohms; /* Ω, in steps of the display; 0 where open */
};

/* What is hidden behind a simulated job. On the heap; pointers inside are its own, but for
 * `models`, which must outlive it. */
struct truth {
    uint32_t seed;
    struct departures departures; /* not written to a truth's file */
    const struct rf_models *models;
    struct rf_job *job;     /* the simulated job: the ring as recorded, what was read, `found` */
    struct cJSON *document; /* the same as a document, its readings with the display's digits */
    struct hypothesis hypothesis;
    struct wiring wiring; /* with the hypothesis applied */
    int parameter_of[FAULTS_AT_ONCE];
    double *theta; /* [wiring.n_parameters] */
    struct {
        bool shows;       /* looking can show it at all */
        bool each_enough; /* at each of its looks, whichever; else only at `look` */
        struct look look;
    } spots[FAULTS_AT_ONCE]; /* where each fault really is */
};

/*
 * Simulates. The readings of `ring` say what is measured, and how often; their values are not
 * used. `found` and `job` of the document are replaced. On RF_OK *truth is the caller's, to
 * destroy. RF_USAGE for more than two defects, RF_REFUSED for a fault that cannot have the value
 * given, RF_NUMERICAL, RF_MEMORY.
 */
enum rf_status simulate(const struct rf_job *ring, const struct rf_models *models,
                        const struct simulation *simulation, struct truth **truth,
                        struct rf_error *error);
void truth_destroy(struct truth *truth); /* takes NULL */

/* The simulated job as a file: indented, or on one line for archives. */
enum rf_status truth_write_job(const struct truth *truth, bool one_line, struct text *out,
                               struct rf_error *error);

/* Writing and reading the truth, {"format": "ringfettle-truth/1", …}. Read it under the models it
 * was made with: the answers go by them. Reading: RF_SYNTAX, RF_REFUSED, RF_MEMORY. */
enum rf_status truth_write(const struct truth *truth, struct text *out, struct rf_error *error);
enum rf_status truth_read(const char *bytes, size_t length, const char *source,
                          const struct rf_models *models, struct truth **truth,
                          struct rf_error *error);

/* What the meter shows, the `repeat`-th time (from 0) it is put there. The job's own readings are
 * the answers to their repeats. RF_NUMERICAL, RF_MEMORY. */
enum rf_status truth_answer(const struct truth *truth, const struct measurement *measurement,
                            size_t repeat, struct shown *shown, struct rf_error *error);
/* The same for n at once. */
enum rf_status truth_answers(const struct truth *truth, const struct measurement measurements[],
                             const size_t repeats[], size_t n, struct shown shown[],
                             struct rf_error *error);

/* Whether looking there shows a defect (which one: *fault, may be NULL). `share` is not used. */
bool truth_look(const struct truth *truth, const struct look *look, size_t *fault);

/* A fault's true parameter, Ω or m; NAN where it has none. */
double truth_value(const struct truth *truth, size_t fault);

/* --- rings --- */

/*
 * Reads a ring to simulate on: a job, whose readings may be left out. Then these are measured:
 * end to end, and both crossed tests with the line at the board and every point with a front.
 * As rf_job_parse.
 */
enum rf_status simulation_read_ring(const char *bytes, size_t length, const char *source,
                                    struct rf_job **ring, struct rf_error *error);

enum ring_plan {
    PLAN_STANDARD, /* end to end, crossed line-neutral and line-CPC at the board and every point */
    PLAN_EXTRA     /* and besides: ends apart, and some points of other set-ups */
};

/*
 * An invented ring of 4 to 14 points and 3.5 to 8 m × (points + 1) of cable, split at random
 * (weights uniform in 0.2 … 1.8), with no, no, one or two spurs of 1.5 to 9 m on ring points;
 * 2.5/1.5 mm², lengths recorded to 0.1 m with accuracy 0.2. The plan says what is measured.
 */
enum rf_status simulation_random_ring(uint32_t seed, enum ring_plan plan, struct rf_job **ring,
                                      struct rf_error *error);

/* --- drawing --- */

/* Seeds the generator for what is drawn under that name. */
void generator_seed(gsl_rng *generator, uint32_t seed, const char *name);

/* A fault from the priors: the family among those with a member here, then the kind among those
 * present, then the member evenly. `none` is among them unless it is left out. */
enum rf_status draw_fault(const struct rf_job *job, const struct rf_models *models,
                          bool leave_out_none, gsl_rng *generator, struct fault *fault,
                          struct rf_error *error);

/* A value from U, Ω; what the meter shows of a mean (Ω). */
double draw_misread(const struct instrument_model *instrument, gsl_rng *generator);
struct shown draw_shown(const struct instrument_model *instrument, bool reachable, double mean,
                        bool heavy_tails, gsl_rng *generator);

#endif
