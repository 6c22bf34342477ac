/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef ADVICE_STEPS_H
#define ADVICE_STEPS_H

/* What the steps of an advice hand one another; nothing outside the room includes this. */

#include "advice/advice.h"
#include "advice/measuring.h"

/* plan_words.c: fills `words` of the plan and of its outcomes. `after` is what measuring_outcomes
 * left for the plan's first reading. False: memory is short. */
bool write_read_words(const struct rf_diagnosis *diagnosis, struct plan *plan,
                      size_t n_hypotheses, const double after[]);
bool write_look_words(const struct rf_diagnosis *diagnosis, struct plan *plan);
bool write_stop_words(struct rf_advice *advice);

/* lifts.c: what would lift the blind spots. */
enum rf_status seek_lifts(struct rf_advice *advice, const struct predictive *predictive,
                          struct rf_error *error);

#endif
