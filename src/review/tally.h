/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef REVIEW_TALLY_H
#define REVIEW_TALLY_H

/* struct rf_review as the other rooms see it. Whole numbers throughout: see ringfettle/review.h.
 * Sums of 1e-9 hold for more than ten million jobs of the largest rings. */

#include "review/line.h"

#include <ringfettle/review.h>

enum {
    MAX_SORTS = MODELS_MAX_FAMILIES + 1, /* families, and two defects at once */
    CALIBRATION_BINS = 10,
    WORST_SHOWN = 50
};

/* Jobs whose likeliest finding had a confidence in that tenth; the last holds 1 too. */
struct calibration_bin {
    uint64_t jobs, right;
    int64_t confidence; /* sum, 1e-9 */
};

struct scorecard {
    uint64_t confirmed;
    uint64_t first, first_three; /* hypotheses */
    uint64_t agrees;             /* the likeliest finding holds it */
    uint64_t below;              /* confidence below 1e-6, counted as that */
    int64_t log_posterior;       /* sum, 1e-9 */
    struct calibration_bin calibration[CALIBRATION_BINS];
    uint64_t unexplained;                        /* left out of the calibration */
    uint64_t looked;                             /* jobs whose one defect looking can show */
    int64_t places;                              /* sum over them, 1e-9 */
    int64_t looks[N_LOOK_BINS];                  /* likewise */
    uint64_t confusion[MAX_SORTS][MAX_SORTS];    /* [found][likeliest] */
    uint64_t kinds[MAX_SORTS][MODELS_MAX_KINDS]; /* [found][kind] */
};

struct rf_review {
    uint64_t jobs;
    uint64_t refused; /* input that is no job */
    uint64_t failed;  /* the arithmetic failed */
    uint64_t unread;  /* files that could not be read */
    bool stopped;     /* before the end of the input */
    uint64_t verdicts[N_VERDICTS];
    uint64_t defects[MAX_SORTS][N_CONDUCTOR_KINDS]; /* of verdict defect, by the likeliest */
    uint64_t testing[MAX_SORTS];                    /* of these, mistakes in testing */
    uint64_t readings, written_off, jobs_written_off;
    uint64_t disagree; /* jobs whose record and readings disagree, and in what: */
    uint64_t disagree_found, disagree_wiring, disagree_lengths;
    struct scorecard score;
    size_t n_worst;
    struct review_line worst[WORST_SHOWN]; /* most worrying first */
};

/* Counts a line in. RF_MEMORY. */
enum rf_status review_add_line(struct rf_review *review, const struct review_line *line,
                               struct rf_error *error);

#endif
