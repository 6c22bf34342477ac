/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef ADVICE_LOOKING_H
#define ADVICE_LOOKING_H

/*
 * The order of looking. Places are taken by chance per minute, which is optimal for independent
 * shares (Kadane and Simon, "Optimal strategies for a class of constrained sequential problems",
 * Ann. Statist. 5, 1977), ranked anew after each look because one look can rule out what would
 * have shown elsewhere too. It ends when what is left of all defects is under the models'
 * `stop_share` of itself and "no defect" together.
 */

#include "advice/advice.h"

/* A place one can look at. */
struct location {
    struct look look;
    double minutes;
    size_t reach; /* index into reach_minutes; its minutes are added once */
};

/* One way a hypothesis shows at a location. */
struct showing {
    size_t hypothesis, part, location;
    double share, recorded_share;
    bool each_enough;
};

/* What there is to look at for a diagnosis' ranked hypotheses (the first n of them). */
struct looking {
    size_t n_hypotheses;
    size_t n_locations;
    struct location *locations;
    size_t n_showings;
    struct showing *showings;     /* a hypothesis' own stand together: */
    size_t *first_of_hypothesis;  /* [n_hypotheses + 1] */
    size_t *showings_at;          /* indices of showings, those at a location together: */
    size_t *first_at;             /* [n_locations + 1] */
    bool *defect;            /* [hypothesis] something is wrong, somewhere */
    double *reach_minutes;   /* [place], the board at the end */
    size_t n_reach;
    double stop_share;
    /* workspace */
    double *left;   /* [hypothesis · FAULTS_AT_ONCE + part] share of the part not ruled out */
    double *weight; /* [showing] what would show if one looked there now */
    double *chance; /* [location] the sum of that */
    bool *looked;   /* [location] */
    bool *reached;  /* [place] */
    bool *steady;   /* [hypothesis] looks that show nothing leave its other shares alone */
    size_t n_live;
    size_t *live;   /* the locations where the belief at hand could show */
    double *rate;   /* [live] chance per minute there */
    size_t *slot;   /* [location] where it stands in `live` */
    double rounding; /* chances up to this are none */
};

/* Minutes of looking there, without reaching it. */
double minutes_of_look(const struct rf_job *job, const struct effort_model *effort,
                       const struct look *look);
/* Minutes of reaching a place (the board: n_places), and which place a look has to reach: a run is
 * reached from the place it leads to. */
double minutes_to_reach(const struct rf_job *job, size_t place);
size_t place_to_reach(const struct rf_job *job, const struct look *look);

enum rf_status looking_init(struct looking *looking, const struct rf_diagnosis *diagnosis, size_t n,
                            struct rf_error *error);
void looking_finish(struct looking *looking); /* takes zeroed */

/*
 * Expected minutes of looking, for weights (n_hypotheses, ≥ 0, any sum; those that have nothing
 * wrong among them) per unit of weight: Σ cost of a look × chance that it comes to it. `steps` (may
 * be NULL) gets up to `most` looks in order and *n_steps their number. Allocates nothing.
 */
double looking_expected(struct looking *looking, const double weights[], struct look_step steps[],
                        size_t most, size_t *n_steps);

/* The first of those looks (an index into locations, n_locations: none) and its minutes. */
size_t looking_best(struct looking *looking, const double weights[], double *minutes);

/* Nothing showed at a location: takes that from the weights, and makes the shares those of what is
 * left. `looking_restore` puts the shares back. */
void looking_rule_out(struct looking *looking, size_t location, double weights[]);
void looking_restore(struct looking *looking);

#endif
