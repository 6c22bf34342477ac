/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef REPORT_PAGE_PARTS_H
#define REPORT_PAGE_PARTS_H

/* The parts of the page that are more than lists of lines. */

#include "advice/advice.h"
#include "report/markup.h"
#include "report/ring_map.h"

struct page {
    const struct rf_diagnosis *diagnosis;
    const struct rf_advice *advice; /* may be NULL */
    struct markup *markup;
};

/* page.c */
void open_section(struct page *page, const char *id, const char *kind, const char *heading);
void close_section(struct page *page);
/* An item of a list of chances; `letter` of a finding on the map, or 0. */
void chance_item(struct page *page, double chance, char letter, const char *words);

/* page_map.c: the map with its legend, and the list of places. */
void page_map(struct page *page);
void page_places(struct page *page);

/* page_plan.c */
void section_next(struct page *page);

/* page_readings.c: plots and table. RF_NUMERICAL, RF_MEMORY. */
enum rf_status section_readings(struct page *page, struct rf_error *error);

#endif
