/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef RINGFETTLE_DIAGNOSIS_H
#define RINGFETTLE_DIAGNOSIS_H

#include <ringfettle/job.h>
#include <ringfettle/models.h>
#include <ringfettle/status.h>

#include <stdbool.h>
#include <stddef.h>

#ifdef __cplusplus
extern "C" {
#endif

/* What the readings of a job say: every plausible fault with its confidence, where it would show,
 * whether anything explains the readings at all. Opaque; read-only once made. */
struct rf_diagnosis;

/*
 * Diagnoses a job. `job` and `models` must outlive the diagnosis. On RF_OK *diagnosis is the
 * caller's, to destroy. RF_REFUSED where the job contradicts the models (a conductor size they do
 * not know, a `found` that cannot be), RF_NUMERICAL, RF_MEMORY.
 */
RF_API enum rf_status rf_diagnose(const struct rf_job *job, const struct rf_models *models,
                                  struct rf_diagnosis **diagnosis, struct rf_error *error);

RF_API void rf_diagnosis_destroy(struct rf_diagnosis *diagnosis); /* takes NULL */

/* How many hypotheses were compared. */
RF_API size_t rf_diagnosis_hypotheses(const struct rf_diagnosis *diagnosis);

/* How many carry at least 0.001 of the confidence, best first from 0. */
RF_API size_t rf_diagnosis_faults(const struct rf_diagnosis *diagnosis);

/* Confidence (0 … 1) and words of the i-th; the words live as long as the diagnosis. */
RF_API double rf_diagnosis_confidence(const struct rf_diagnosis *diagnosis, size_t i);
RF_API const char *rf_diagnosis_words(const struct rf_diagnosis *diagnosis, size_t i);
/* The family's name as in files. */
RF_API const char *rf_diagnosis_family(const struct rf_diagnosis *diagnosis, size_t i);

/* The misfit test's p-value, and whether it says that no one defect explains the readings. */
RF_API double rf_diagnosis_misfit(const struct rf_diagnosis *diagnosis, bool *flag);

/* Where it says so and something wider explains them, what the ranking assumes: "faces", bad
 * contacts at every face; "lengths", worse than recorded; "two_defects", at once. Else NULL. */
RF_API const char *rf_diagnosis_assumes(const struct rf_diagnosis *diagnosis);

#ifdef __cplusplus
}
#endif

#endif
