/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef ADVICE_MEASURING_H
#define ADVICE_MEASURING_H

/*
 * Which reading saves most. The value of a belief (weights over hypotheses) is the expected minutes
 * to the find: by looking, or by one more reading in the set-up in place and going on from what it
 * says, whichever is less,
 *
 *     V(w) = min( look(w), min_c [ cost(c) + Σ_o P(o | w, c) V(w | o) ] )
 *
 * to a depth of `most_depth` readings. Readings are chosen anew after every outcome: halving a ring by plugging
 * in is worth more than its readings taken blindly together. What a reading can show is made
 * discrete: outcomes are where hypotheses' predictions lie, about one of their σ apart, and each
 * hypothesis spreads its weight over them by its density there, so that weights after an outcome
 * are Bayes' for this coarser meter and a little short of what the real one tells. Readings are
 * taken for independent under a hypothesis.
 */

#include "advice/looking.h"
#include "advice/predictive.h"

enum { MOST_OUTCOMES = 12 };

/* The best reading to start a set-up with. */
struct choice {
    size_t setup;
    size_t candidate; /* index into the predictive's */
    double value;     /* expected minutes to the find, this set-up's change and readings included */
};

struct measuring;

/* All three must outlive it. NULL when memory is short. */
struct measuring *measuring_create(const struct rf_diagnosis *diagnosis,
                                   struct looking *looking, const struct predictive *predictive);
void measuring_destroy(struct measuring *measuring); /* takes NULL */

/* The best start in every set-up that has one that saves anything, best first. `choices` holds
 * N_SETUPS; returns how many. `weights`: [hypothesis], any sum. */
size_t measuring_choose(struct measuring *measuring, const double weights[],
                        struct choice choices[]);

/*
 * Expected minutes to the find by looking at the first place in the order of looking and, where
 * nothing shows, going on with the best of looking and reading. INFINITY where there is nothing to
 * look at; some value above `to_beat` where it cannot be below it.
 */
double measuring_look_first(struct measuring *measuring, const double weights[], double to_beat);

/* The readings that would follow `candidate` in its set-up if the likeliest came out each time, as
 * long as one saves anything: up to `most` candidates; returns how many. */
size_t measuring_follow(struct measuring *measuring, const double weights[], size_t candidate,
                        size_t follow[], size_t most);

/* What the candidate can show: up to MOST_OUTCOMES outcomes with their chances and the weights
 * after them, [outcome · n_hypotheses + hypothesis], each outcome's summing to its chance. */
struct shown_outcome {
    bool open;
    double ohms;
    double chance;
};
size_t measuring_outcomes(struct measuring *measuring, const double weights[], size_t candidate,
                          struct shown_outcome outcomes[], double after[]);

#endif
