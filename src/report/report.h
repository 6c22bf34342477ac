/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef REPORT_REPORT_H
#define REPORT_REPORT_H

/* A diagnosis for people (text) and for programs (JSON). Reports print families by what they say of
 * themselves; they never ask which one it is. */

#include "diagnosis/diagnosis.h"

struct rf_advice;

/* The whole report, lines of at most 72 columns. `advice` NULL: the plan is left out. */
void report_text(const struct rf_diagnosis *diagnosis, const struct rf_advice *advice,
                 struct text *out);

/* What parts two reports of one stream. */
void report_divider(struct text *out);

/* One object and a newline: the format ringfettle-diagnosis/1. `advice` NULL: `next` and
 * `expected_minutes` are left out. */
void report_json(const struct rf_diagnosis *diagnosis, const struct rf_advice *advice,
                 struct text *out);

#endif
