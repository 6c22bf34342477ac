/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef REPORT_PAGE_STYLE_H
#define REPORT_PAGE_STYLE_H

#include "report/markup.h"

/* What every page begins and ends with. `title` is the page's own. */
void page_head(struct markup *markup, const char *title);
void page_foot(struct markup *markup);

/* A share of the whole as a bar, for the eye only: the number stands beside it. */
void page_bar(struct markup *markup, double share);

#endif
