/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef REVIEW_MERGE_H
#define REVIEW_MERGE_H

/*
 * Output of `review --json` counted again: the lines of one or more runs, each with its summary
 * behind it. The lines are counted; of a part's summary only what stands in no line is (what was
 * refused), and its number of jobs must be that of its lines, so that a part that lost some is
 * told from a whole one.
 */

#include "review/tally.h"

/* What all parts must have been reviewed with. Zeroed: nothing read yet; the caller finishes it. */
struct merge_origin {
    char *models, *rates;
};
void merge_origin_finish(struct merge_origin *origin);

extern const char review_format[]; /* of a summary */
extern const char diagnosis_format[];

/* Counts a file ("-": standard input) in. RF_SYNTAX, RF_REFUSED, RF_IO, RF_MEMORY. */
enum rf_status review_merge(const char *path, struct merge_origin *origin, struct rf_review *review,
                            struct rf_error *error);

#endif
