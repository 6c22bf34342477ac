/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef RINGFETTLE_ADVICE_H
#define RINGFETTLE_ADVICE_H

#include <ringfettle/diagnosis.h>

#ifdef __cplusplus
extern "C" {
#endif

/* What to do next: the reading that saves most, or the place to look at first, with the minutes it
 * costs and is expected to save. Opaque; read-only once made. */
struct rf_advice;

/*
 * Plans on a diagnosis, which must outlive the advice. On RF_OK *advice is the caller's, to
 * destroy. RF_NUMERICAL, RF_MEMORY.
 */
RF_API enum rf_status rf_advise(const struct rf_diagnosis *diagnosis, struct rf_advice **advice,
                                struct rf_error *error);

RF_API void rf_advice_destroy(struct rf_advice *advice); /* takes NULL */

/* How many plans there are, the advice first, and the words of the i-th. */
RF_API size_t rf_advice_plans(const struct rf_advice *advice);
RF_API const char *rf_advice_words(const struct rf_advice *advice, size_t i);

/* Expected minutes to the find by looking only, and with the best readings first. */
RF_API double rf_advice_look_now(const struct rf_advice *advice);
RF_API double rf_advice_measure_first(const struct rf_advice *advice);

#ifdef __cplusplus
}
#endif

#endif
