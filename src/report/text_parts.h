/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef REPORT_TEXT_PARTS_H
#define REPORT_TEXT_PARTS_H

/* The sections of the text report. Each adds itself whole, with its heading and the blank line
 * before it, or nothing where it has nothing to say. `advice` may be NULL. */

#include "report/report.h"

typedef void report_section(const struct rf_diagnosis *diagnosis, const struct rf_advice *advice,
                            struct text *out);

report_section text_misfit, text_danger, text_checks, text_where, text_findings; /* text_where.c */
report_section text_blind, text_readings, text_figures;                          /* text_tables.c */

void text_heading(struct text *out, const char *heading);
/* "  71 %  words", wrapped. */
void text_chance_line(struct text *out, double chance, const struct text *words);

/* Whether the likeliest explanation is that nothing is wrong, and something explains the readings
 * at all. */
bool shows_no_defect(const struct rf_diagnosis *diagnosis);

#endif
