/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef DIAGNOSIS_DIAGNOSIS_H
#define DIAGNOSIS_DIAGNOSIS_H

/*
 * The path of a diagnosis, one file a step:
 *
 *   enumerate → rank (fit each, weigh) → misfit → places → findings → blind
 *
 * and, where the misfit test says that no one defect explains the readings, before places: widen,
 * pairs; and rank and misfit again under what explains them.
 *
 * What is over range is NAN wherever ohms are kept here.
 */

#include "faults/fault.h"
#include "fit/fit.h"

#include <ringfettle/diagnosis.h>

/* A fault's parameter, Ω or m, and its 90 % interval. */
struct estimate {
    bool known;  /* this fault has a parameter */
    bool metres; /* else Ω */
    double value, low, high;
};

/* A hypothesis with at least `confidence_shown` of the confidence. */
struct ranked {
    struct hypothesis hypothesis;
    double confidence;
    double log_prior, log_evidence; /* the prior is that of the base rates in the models */
    struct estimate estimates[FAULTS_AT_ONCE]; /* one a fault */
    char *words;
    size_t n_parameters;
    double *theta;  /* θ̂ */
    double *factor; /* n_parameters², Cholesky factor of I + JᵀWJ; θ ~ N(θ̂, its inverse) */
    double *fitted; /* [reading of the job] Ω, NAN: over range */
};

/* Hypotheses the readings cannot tell apart, as one finding. */
struct finding {
    char *words;
    double confidence;
    size_t n_members;
    size_t *members; /* indices into ranked, best first */
    bool is_none;    /* the finding that nothing is wrong with the ring or the test */
};

/* Where looking would show something, and the chance that it does. */
struct place_chance {
    struct look look; /* `share` unused */
    double chance;
};

/* A reading that does not fit the best explanation: chance of being a misread above one half. */
struct suspect {
    size_t reading; /* of the job */
};

/* A kind of fault the readings taken could not have shown. */
struct blind_spot {
    struct fault example; /* one member of the kind */
    double share;         /* of the kind's members that would not have shown; 1: none would */
    char *words;
};

/* Summed confidence of what would be dangerous in one way. */
struct danger_chance {
    enum danger danger;
    double chance;
};

struct rf_diagnosis {
    const struct rf_job *job;
    const struct rf_models *models;
    struct rf_models widened; /* `models`, where the model was widened */
    struct wiring ring;       /* as recorded */
    size_t n_hypotheses;
    size_t n_ranked;
    struct ranked *ranked; /* best first */
    size_t n_findings;
    struct finding *findings; /* best first */
    size_t n_places;
    struct place_chance *places; /* by chance */
    size_t n_suspects;
    struct suspect *suspects;
    size_t n_blind;
    struct blind_spot *blind;
    struct danger_chance dangers[N_DANGERS]; /* indexed by danger; [0] unused */
    double *sound; /* [reading] what this ring would read if it were wired as recorded: with the
                    * lengths, cable and instrument of the best fit, and without its faults */
    struct {
        double p;
        bool flag;
        size_t written_off; /* readings the best fit takes for misreads or wrong opens */
        double chi_square;  /* of the rest, with the penalty */
        size_t degrees;
    } misfit;
    /* Where `misfit.flag` is up and something wider explains what one fault under the model does
     * not: all that is ranked here assumes it, and `misfit` but for p and flag is of its best. */
    struct {
        bool assumed;         /* and then one of these three: */
        double face_ohms;     /* Ω on average, as the readings have it; else 0 */
        double length_factor; /* so many times as wrong as recorded; else 0 */
        bool two_defects;     /* pairs were compared, too */
        double p;             /* of the misfit test, under it */
        double log_odds;      /* log of its evidence over that of the model as it is, which would
                               * have … */
        struct hypothesis otherwise_first; /* … this first, */
        double otherwise_confidence;       /* … with this confidence */
    } wider;
    bool found_known; /* the job says what was found */
    struct hypothesis found;
    size_t found_rank;       /* 0: first; n_ranked where it is not among them */
    double found_confidence; /* 0 where it was not compared */
};

/* Whether two faults differ in nothing but the place. */
bool fault_same_kind(const struct fault *one, const struct fault *other);

/* As rf_diagnose, with screening or (to check it) without. */
enum rf_status diagnose(const struct rf_job *job, const struct rf_models *models, bool screen,
                        struct rf_diagnosis **diagnosis, struct rf_error *error);

/* Whether over range tells anything wherever the job has it: RF_REFUSED, with the reading, where the
 * ring as recorded could read beyond the meter's range itself. `diagnose` begins with this.
 * RF_NUMERICAL, RF_MEMORY. */
enum rf_status check_range(const struct wiring *ring, struct rf_error *error);

/* Hypotheses below this are not listed. */
extern const double confidence_shown;

/* Words for a whole hypothesis: its faults joined by "and". */
void hypothesis_words(const struct hypothesis *hypothesis, const struct rf_job *job,
                      struct text *out);

/* Words for several of the ranked together, kind by kind ("neutral joint somewhere between P2 and
 * P5; or …"), the likeliest first as they are given. False: memory is short. */
bool describe_together(const struct rf_diagnosis *diagnosis, const size_t members[], size_t n,
                       struct text *out);

/* Words for a danger: "if re-energised, …". Never NULL for a danger there is. */
extern const char *const danger_words[N_DANGERS];

#endif
