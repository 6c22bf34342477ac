/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef REPORT_REVIEW_REPORT_H
#define REPORT_REVIEW_REPORT_H

/* A review for people, for programs and for spreadsheets. */

#include "base/text.h"
#include "review/tally.h"

extern const char *const review_verdict_words[N_VERDICTS];
extern const double review_level; /* of the intervals */
/* The name of a sort of fault in words: "two defects". */
void say_sort(size_t family, struct text *out);

/* One line of the terminal: job, verdict, confidence, where, whether what was found agrees. */
void report_review_line(const struct review_line *line, struct text *out);

/* The most worrying jobs, then the summary, then the scorecard where something was confirmed. */
void report_review_text(const struct rf_review *review, struct text *out);

/* One object and a newline: the format ringfettle-review/1. `rates`: the base rates' name. */
void report_review_json(const struct rf_review *review, const char *models, const char *rates,
                        struct text *out);

/* A row of the table, ended by CR LF (RFC 4180); its heading. */
void report_review_csv_heading(struct text *out);
void report_review_csv(const struct review_line *line, struct text *out);

#endif
