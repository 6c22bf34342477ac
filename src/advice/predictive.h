/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef ADVICE_PREDICTIVE_H
#define ADVICE_PREDICTIVE_H

/*
 * What the meter would show, under each hypothesis, at readings not yet taken: normal around the
 * fitted mean, with the instrument's noise and the fit's uncertainty, σ² + J Σ Jᵀ; or over range.
 */

#include "diagnosis/diagnosis.h"

struct predictive {
    size_t n_hypotheses;    /* the first of the diagnosis' ranked */
    size_t n;               /* candidates */
    struct measurement *candidates;
    double *minutes;        /* [candidate] the reading alone, without reaching it or the set-up */
    double *mean;           /* [hypothesis · n + candidate] Ω; NAN: over range */
    double *sigma;          /* likewise, Ω */
};

/* Candidates: every set-up at every place, but what has been read, and `highest`. RF_MEMORY,
 * RF_NUMERICAL. */
enum rf_status predictive_init(struct predictive *predictive, const struct rf_diagnosis *diagnosis,
                               size_t n_hypotheses, struct rf_error *error);
void predictive_finish(struct predictive *predictive); /* takes zeroed */

/* Minutes of one more reading of that kind; `lead_out` says whether the wander lead is fetched and
 * nulled already. */
double minutes_of_reading(const struct effort_model *effort, const struct measurement *measurement,
                          bool lead_out);
/* Whether the job has a reading with a wander lead. */
bool lead_is_out(const struct rf_job *job);

#endif
