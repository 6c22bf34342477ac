/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef REPORT_EXPECTED_TEXT_H
#define REPORT_EXPECTED_TEXT_H

#include "fit/expected.h"

/* What `expect` shows. Measurements of one set-up follow one another. */
struct expected_sheet {
    const struct rf_job *job;
    size_t n;
    const struct measurement *measurements;
    const struct expected *expected;
    bool given_ends;
    const bool *left_out; /* [conductor] */
};

/* Place, expected, from – to, as read if it was; what lies outside its range is marked. */
void report_expected(const struct expected_sheet *sheet, struct text *out);

#endif
