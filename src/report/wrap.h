/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef REPORT_WRAP_H
#define REPORT_WRAP_H

/* Text that fits a narrow screen: nothing is wider than REPORT_COLUMNS. */

#include "base/text.h"

enum { REPORT_COLUMNS = 72 };

/* Adds `words` filled into lines, the first behind `first`, the others behind `rest` (both
 * narrower than a line). White space parts words, but for the no-break space; control characters are shown as ?, since
 * what a file says must not steer the terminal; a word wider than a line is broken. */
void wrap_words(struct text *out, const char *first, const char *rest, const char *words);

/* An entry of a list: "  name" and from a fixed column on what it means. */
void wrap_entry(struct text *out, const char *name, const char *meaning);

/* Adds `words` as a cell of `columns`, filled up with spaces on the right (or left), cut with an
 * ellipsis where it is wider; control characters as above. */
void cell_left(struct text *out, const char *words, size_t columns);
void cell_right(struct text *out, const char *words, size_t columns);

/* The same on the left of a row whose other cells follow; words that do not fit get a line of their
 * own before it. */
void cell_heading(struct text *out, const char *words, size_t columns);

#endif
