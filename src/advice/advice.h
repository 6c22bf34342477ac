/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef ADVICE_ADVICE_H
#define ADVICE_ADVICE_H

#include "diagnosis/diagnosis.h"

#include <ringfettle/advice.h>

/* One look of the order of looking. */
struct look_step {
    struct look look; /* `share` unused */
    double chance;    /* that the defect shows there, if it has not before; the steps' chances and
                       * what is left add up to 1 − none */
    double minutes;   /* reaching and opening, or checking */
    double expected;  /* minutes of this look and those before it, each by the chance that it comes
                       * to it */
};

/* What an outcome of a reading would mean. */
struct outcome {
    bool open;    /* over range */
    double ohms;  /* about */
    double chance;
    char *words;  /* "the joint is between P2 and P5" */
};

enum action { ACTION_READ, ACTION_LOOK };

/* Something to do next. */
struct plan {
    enum action action;
    size_t setup;             /* ACTION_READ */
    bool setup_in_place;      /* its links are still in */
    size_t n_reads;           /* ACTION_READ: in the order to take them; the first is what counts, */
    struct measurement *reads; /* the rest is what would follow if it settles nothing */
    struct look look;         /* ACTION_LOOK */
    double minutes;           /* of the action: all its readings, or the look */
    double saves;             /* expected minutes to the find it saves against looking now */
    size_t n_outcomes;        /* ACTION_READ: of its first reading, likeliest first */
    struct outcome *outcomes;
    char *words; /* what to do, a sentence or two */
};

/* A reading that would lift a blind spot. */
struct lift {
    size_t blind; /* index into the diagnosis' blind spots */
    struct measurement read;
    double minutes;
    char *words;
};

struct rf_advice {
    const struct rf_diagnosis *diagnosis;
    size_t n_plans;
    struct plan *plans; /* the advice, then runners-up: other set-ups, or looking */
    size_t n_steps;
    struct look_step *steps; /* looking only, in order, to where it stops being worth it */
    double look_now, measure_first; /* expected minutes to the find */
    bool stop;                      /* neither looking nor measuring on is worth it */
    double defect_chance;           /* that there is a defect at all, after what was looked at */
    char *stop_words;               /* NULL unless `stop` */
    size_t n_lifts;
    struct lift *lifts;
};

/* The order of looking alone, which costs little: rf_advice's steps. On RF_OK the caller frees
 * *steps. RF_MEMORY. */
enum rf_status order_of_looking(const struct rf_diagnosis *diagnosis, struct look_step **steps,
                                size_t *n_steps, struct rf_error *error);

#endif
