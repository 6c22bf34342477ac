/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef REPORT_ARCHIVE_PAGE_H
#define REPORT_ARCHIVE_PAGE_H

#include "report/scene.h"
#include "review/tally.h"

/* The file of a job's own page, beside this one; "": it has none. */
struct page_name {
    char name[32];
};

/* A review as a page: how well the confidences were kept, families, the jobs that need a look.
 * `pages` as review->worst. RF_MEMORY. */
enum rf_status report_archive_page(const struct rf_review *review,
                                   const struct page_name pages[WORST_SHOWN], struct text *out,
                                   struct rf_error *error);

/* The calibration: what was said against what was, with the intervals. */
void calibration_plot(const struct scorecard *score, struct scene *scene);

#endif
