/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef REVIEW_LINE_H
#define REVIEW_LINE_H

/*
 * What a review keeps of a job: all that its summary needs. Chances are whole numbers of 1e-9, so
 * that sums of them are exact and come out the same in whatever order; a line of `review --json`
 * carries them as such, in its member "review".
 */

#include "diagnosis/diagnosis.h"

#include <stdint.h>

struct cJSON;
struct json_at;

enum { PARTS = 1000000000 }; /* of one */

/* How many places come before the find: none, 1, 2, 3 to 5, 6 and more, or the order ends first. */
enum { N_LOOK_BINS = 6, LOOK_BIN_NEVER = 5 };

enum verdict {
    VERDICT_NO_DEFECT,   /* nothing wrong carries at least four fifths */
    VERDICT_DEFECT,      /* something wrong does */
    VERDICT_UNDECIDED,   /* neither */
    VERDICT_UNEXPLAINED, /* the misfit test says that no one defect explains the readings */
    N_VERDICTS
};
extern const char *const verdict_names[N_VERDICTS];

/* Which conductor or pair a fault is about. */
enum { N_CONDUCTOR_KINDS = 8 };
extern const char *const conductor_kind_names[N_CONDUCTOR_KINDS]; /* [0]: "", none in particular */

/* A hypothesis without its place. `family` counts in fault_families[]; TWO_DEFECTS stands behind
 * them, its other fields 0. */
struct fault_sort {
    size_t family;
    size_t kind; /* of the family */
    size_t conductor;
};
size_t two_defects(void);
const char *sort_name(size_t family); /* the family's name, "two_defects" */
size_t n_sorts(void);                 /* families and two_defects */

struct review_line {
    uint64_t number;   /* of the job among those read in this run, from 1; 0: not of this run */
    char *job, *words; /* the job's name; the likeliest finding */
    enum verdict verdict;
    int64_t confidence;      /* of that finding */
    int64_t none;            /* that nothing is wrong */
    int64_t danger;          /* that something would hurt if it were re-energised */
    struct fault_sort first; /* the likeliest hypothesis */
    bool testing;            /* it is a mistake in testing, to be seen at faces or the board */
    uint64_t readings, written_off;
    bool other_wiring;  /* it says that the ring is not wired, or not in the cable, recorded */
    bool other_lengths; /* the recorded lengths as a whole are off by more than three sigmas */
    struct {
        bool known; /* the rest is 0 if not */
        struct fault_sort sort;
        int64_t rank;          /* among the hypotheses listed, from 0; −1: not among them */
        bool agrees;           /* it is part of the likeliest finding */
        int64_t log_posterior; /* 1e-9 of the natural log, ≤ 0, not below that of 1e-6 */
        bool below;            /* it was below */
        bool looked;           /* one defect that looking can show; what follows is 0 if not */
        int64_t places;        /* 1e-9: expected places before the find; all, where it is never */
        int64_t looks[N_LOOK_BINS]; /* 1e-9: chances */
    } found;
};

/* Fills a zeroed line. RF_MEMORY. The caller finishes it, whatever the answer. */
enum rf_status line_of_diagnosis(struct review_line *line, const struct rf_diagnosis *diagnosis,
                                 struct rf_error *error);
/* Its part in that, looks.c: `found.looked` and what follows. */
enum rf_status line_count_looks(struct review_line *line, const struct rf_diagnosis *diagnosis,
                                struct rf_error *error);
void line_finish(struct review_line *line); /* takes zeroed */

/* Whether the readings speak against what was found: it carries less than 5 %. */
bool line_found_disagrees(const struct review_line *line);
/* 1e-9: how much a job wants looking at; 0 where no defect shows or it was written down. */
int64_t line_worry(const struct review_line *line);

/* The member "review"; NULL when memory is short. */
struct cJSON *line_to_json(const struct review_line *line);
/* From a line of `review --json`. RF_REFUSED, RF_MEMORY. As line_of_diagnosis. */
enum rf_status line_from_json(struct review_line *line, const struct json_at *document,
                              struct rf_error *error);

#endif
