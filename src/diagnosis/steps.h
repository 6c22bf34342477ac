/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef DIAGNOSIS_STEPS_H
#define DIAGNOSIS_STEPS_H

/* What the steps of a diagnosis hand one another; nothing outside the room includes this. */

#include "diagnosis/diagnosis.h"

/* A hypothesis compared. Logs of probabilities throughout; -INFINITY: impossible. */
struct candidate {
    struct hypothesis hypothesis;
    double log_prior;
    double log_looks; /* log of the share that opened and checked places have left of it */
    size_t index;        /* in the order of enumeration */
    bool fitted;
    double log_evidence; /* -INFINITY until fitted */
    double log_likely;   /* what it was likely to be, if given up; -INFINITY: impossible, untried */
    double confidence;   /* after ranking */
};

/* Logs of what it weighs before it is fitted, and after. */
static inline double log_share(const struct candidate *candidate)
{
    return candidate->log_prior + candidate->log_looks;
}

static inline double log_weight(const struct candidate *candidate)
{
    return log_share(candidate) + candidate->log_evidence;
}

struct candidates {
    struct candidate *list;
    size_t n, capacity;
};

/* enumerate.c: every hypothesis the job allows, with its prior, in enumeration order. RF_MEMORY;
 * RF_REFUSED where the models have no row for a family. The caller finishes it. */
enum rf_status candidates_enumerate(struct candidates *candidates, const struct rf_job *job,
                                    const struct rf_models *models, struct rf_error *error);
void candidates_finish(struct candidates *candidates); /* takes zeroed */
/* The share of the fault that is left by the places the job says were looked at. */
double share_left_by_looks(const struct fault *fault, const struct rf_job *job,
                           const struct rf_models *models);

/* rank.c: fits each that is not fitted yet, in the order that search.h gives, sorts them best first
 * (ties keep enumeration order) and makes the confidences sum to one. With `screen`, what cannot reach a confidence worth telling is given up early; no
 * other confidence moves by more than some ten thousandths. */
enum rf_status candidates_rank(struct candidates *candidates, struct fitter *fitter,
                               const struct wiring *ring, bool screen, struct rf_error *error);

/* Of those fitted, the last part of that. RF_MEMORY. */
enum rf_status candidates_sort(struct candidates *candidates, struct rf_error *error);

/* pairs.c: the ranked singles and pairs of them, ranked. More than a pass over pairs only if these
 * may come to weigh e to the `log_wanted`. *log_evidence: what they weigh, if two defects were as
 * likely as one. The caller finishes `all`, whatever the answer. */
enum rf_status candidates_add_pairs(struct candidates *all, const struct candidates *singles,
                                    struct fitter *fitter, const struct wiring *ring,
                                    double log_wanted, double *log_evidence,
                                    struct rf_error *error);

/* The steps after that. Each fills its part of the diagnosis. `best` is the fit of the first. */
enum rf_status keep_ranked(struct rf_diagnosis *diagnosis, const struct candidates *candidates,
                           struct fitter *fitter, struct rf_error *error);
enum rf_status test_misfit(struct rf_diagnosis *diagnosis, struct fitter *fitter,
                           struct rf_error *error);
enum rf_status add_up_places(struct rf_diagnosis *diagnosis, const struct candidates *candidates,
                             struct rf_error *error);
enum rf_status group_findings(struct rf_diagnosis *diagnosis, struct rf_error *error);
enum rf_status seek_blind_spots(struct rf_diagnosis *diagnosis, const struct candidates *candidates,
                                struct fitter *fitter, struct rf_error *error);

/* Log of what all that was compared weighs: Σ_h prior(h) · Z(h). */
double log_evidence_of_all(const struct candidates *candidates);

/* widen.c: the wider model that explains the readings best, by the likeliest of the candidates, and
 * the log of its evidence by them. */
enum rf_status choose_widening(const struct rf_diagnosis *diagnosis,
                               const struct candidates *candidates, struct widening *wider,
                               double *log_evidence, struct rf_error *error);
/* Notes in `wider` what it assumes that `diagnosis`, which it takes the place of, does not. */
void note_widening(const struct rf_diagnosis *diagnosis, struct rf_diagnosis *wider,
                   double log_odds);

#endif
