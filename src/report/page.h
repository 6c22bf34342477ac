/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef REPORT_PAGE_H
#define REPORT_PAGE_H

#include "diagnosis/diagnosis.h"

struct rf_advice;

/* The report as a page of its own: HTML with the drawings in it, nothing from outside, no script.
 * `advice` NULL: the plan is left out. RF_NUMERICAL, RF_MEMORY. */
enum rf_status report_page(const struct rf_diagnosis *diagnosis, const struct rf_advice *advice,
                           struct text *out, struct rf_error *error);

#endif
