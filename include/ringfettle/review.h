/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef RINGFETTLE_REVIEW_H
#define RINGFETTLE_REVIEW_H

#include <ringfettle/diagnosis.h>
#include <ringfettle/models.h>
#include <ringfettle/status.h>

#include <stdbool.h>
#include <stddef.h>

#ifdef __cplusplus
extern "C" {
#endif

/*
 * What many diagnosed jobs come to: a summary, a score where the job records what was found, and
 * counts to learn fault priors from. Its size does not depend on the number of jobs. It holds
 * whole numbers only, so neither the order of jobs nor the way they were split changes anything.
 * Opaque; one thread at a time.
 */
struct rf_review;

/* On RF_OK *review is the caller's, to destroy. RF_MEMORY. */
RF_API enum rf_status rf_review_create(struct rf_review **review, struct rf_error *error);
RF_API void rf_review_destroy(struct rf_review *review); /* takes NULL */

/* Counts a job in, from its diagnosis, which is not needed any longer afterwards. RF_MEMORY. */
RF_API enum rf_status rf_review_add(struct rf_review *review, const struct rf_diagnosis *diagnosis,
                                    struct rf_error *error);

/* Counts in what another review counted; `part` stays as it is. RF_MEMORY. */
RF_API enum rf_status rf_review_join(struct rf_review *review, const struct rf_review *part,
                                     struct rf_error *error);

RF_API size_t rf_review_jobs(const struct rf_review *review);
/* Jobs that record what was found; of those, how often that was the likeliest hypothesis, and
 * among the three likeliest. */
RF_API size_t rf_review_confirmed(const struct rf_review *review);
RF_API size_t rf_review_first(const struct rf_review *review);
RF_API size_t rf_review_first_three(const struct rf_review *review);
/* Mean over the confirmed jobs of the log (base e) of the confidence in what was found, which counts
 * as one in a million where it was less. NAN without confirmed jobs. */
RF_API double rf_review_mean_log_posterior(const struct rf_review *review);

/*
 * Fault priors re-estimated from the confirmed jobs, as the text of a models directory's
 * faults.json: the priors of `models` count as `weight` (above 0) jobs seen before. On RF_OK
 * *text is the caller's, to free. RF_REFUSED with fewer than 20 confirmed jobs; RF_USAGE; RF_MEMORY.
 */
RF_API enum rf_status rf_review_learn(const struct rf_review *review,
                                      const struct rf_models *models, double weight, char **text,
                                      struct rf_error *error);

/*
 * Wilson's interval of a share of which `right` of `n` were seen, at a confidence `level` (0 to 1,
 * 0.9 for 90 %). n = 0 gives 0 to 1.
 */
RF_API void rf_wilson(size_t right, size_t n, double level, double *low, double *high);

#ifdef __cplusplus
}
#endif

#endif
