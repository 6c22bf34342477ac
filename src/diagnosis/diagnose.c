/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/error.h"
#include "base/memory.h"
#include "diagnosis/search.h"
#include "diagnosis/steps.h"

static void finish_ranked(struct ranked *ranked)
{
    free(ranked->words);
    free(ranked->theta);
    free(ranked->factor);
    free(ranked->fitted);
}

static void forget_ranked(struct rf_diagnosis *diagnosis)
{
    for (size_t i = 0; i < diagnosis->n_ranked; i++)
        finish_ranked(&diagnosis->ranked[i]);
    free(diagnosis->ranked);
    free(diagnosis->suspects);
    diagnosis->ranked = NULL;
    diagnosis->suspects = NULL;
    diagnosis->n_ranked = diagnosis->n_suspects = 0;
}

void rf_diagnosis_destroy(struct rf_diagnosis *diagnosis)
{
    if (diagnosis == NULL)
        return;
    forget_ranked(diagnosis);
    for (size_t i = 0; i < diagnosis->n_findings; i++) {
        free(diagnosis->findings[i].words);
        free(diagnosis->findings[i].members);
    }
    for (size_t i = 0; i < diagnosis->n_blind; i++)
        free(diagnosis->blind[i].words);
    free(diagnosis->findings);
    free(diagnosis->places);
    free(diagnosis->blind);
    free(diagnosis->sound);
    wiring_finish(&diagnosis->ring);
    free(diagnosis);
}

/* Where what was really found stands among the hypotheses. */
static void compare_with_found(struct rf_diagnosis *diagnosis, const struct candidates *candidates)
{
    diagnosis->found_rank = diagnosis->n_ranked;
    for (size_t i = 0; i < candidates->n && diagnosis->found_known; i++) {
        const struct candidate *candidate = &candidates->list[i];
        if (!hypothesis_equal(&candidate->hypothesis, &diagnosis->found))
            continue;
        diagnosis->found_confidence = candidate->confidence;
        if (i < diagnosis->n_ranked)
            diagnosis->found_rank = i;
    }
}

static enum rf_status read_found(struct rf_diagnosis *diagnosis, struct rf_error *error)
{
    diagnosis->found_known = diagnosis->job->found != NULL;
    if (!diagnosis->found_known)
        return RF_OK;
    return hypothesis_from_found(diagnosis->job, diagnosis->models, &diagnosis->found, error);
}

/* A diagnosis under one model, and what it is made with. */
struct attempt {
    struct rf_diagnosis *diagnosis;
    struct candidates candidates;
    struct fitter *fitter;
};

static void finish_attempt(struct attempt *attempt)
{
    rf_diagnosis_destroy(attempt->diagnosis);
    candidates_finish(&attempt->candidates);
    fitter_destroy(attempt->fitter);
    *attempt = (struct attempt){0};
}

/* `wider` NULL: the model as it is. The caller finishes it, whatever the answer. */
static enum rf_status begin_attempt(struct attempt *attempt, const struct rf_job *job,
                                    const struct rf_models *models, const struct widening *wider,
                                    struct rf_error *error)
{
    struct rf_diagnosis *diagnosis = NEW(struct rf_diagnosis);
    *attempt = (struct attempt){.diagnosis = diagnosis};
    if (diagnosis == NULL)
        return fail_memory(error);
    diagnosis->job = job;
    diagnosis->models = models;
    if (wider != NULL) {
        diagnosis->widened = *models;
        diagnosis->widened.wider = *wider;
        diagnosis->models = &diagnosis->widened;
    }
    enum rf_status status = wiring_init(&diagnosis->ring, job, diagnosis->models, error);
    if (status == RF_OK && wider == NULL)
        status = check_range(&diagnosis->ring, error);
    if (status == RF_OK)
        status = read_found(diagnosis, error);
    if (status != RF_OK)
        return status;
    diagnosis->sound = NEW_ARRAY(double, job->n_readings);
    attempt->fitter = fitter_create(&diagnosis->ring);
    return diagnosis->sound == NULL || attempt->fitter == NULL ? fail_memory(error) : RF_OK;
}

static enum rf_status keep_and_test(struct attempt *attempt, struct rf_error *error)
{
    struct rf_diagnosis *diagnosis = attempt->diagnosis;
    enum rf_status status = keep_ranked(diagnosis, &attempt->candidates, attempt->fitter, error);
    diagnosis->n_hypotheses = attempt->candidates.n;
    return status == RF_OK ? test_misfit(diagnosis, attempt->fitter, error) : status;
}

static enum rf_status rank_and_test(struct attempt *attempt, bool screen, struct rf_error *error)
{
    struct rf_diagnosis *diagnosis = attempt->diagnosis;
    struct candidates *candidates = &attempt->candidates;
    enum rf_status status = RF_OK;
    forget_ranked(diagnosis);
    if (candidates->n == 0)
        status = candidates_enumerate(candidates, diagnosis->job, diagnosis->models, error);
    if (status == RF_OK)
        status = candidates_rank(candidates, attempt->fitter, &diagnosis->ring, screen, error);
    return status == RF_OK ? keep_and_test(attempt, error) : status;
}

/*
 * Screening judges a fit by its first steps, which can be trusted where something explains the
 * readings. Where nothing seems to, a fit may yet turn a corner late, with many readings to write
 * off; so below this p-value of the misfit test, every fit is followed to its end, unless there are too
 * many (search.h).
 */
static const double screening_trusted = 0.2;

/*
 * What else may explain the readings, where one fault under the model as it is does not (widen.c,
 * pairs.c). To be believed it must be e⁴ times as probable by them, and fit. Odds of evidence are 1
 * on average where the model holds, so there they are e⁴ in fewer than 1 of 54 jobs (Markov's
 * inequality), and in far fewer by measurement (tests/bench).
 */
static const double log_odds_needed = 4.0;
static const double fits_from = 0.05; /* p-value of the misfit test */
/* Where the misfit test raises no flag, leaders must promise as much before all are ranked. */
static const double log_odds_promised = 2.0;

/* Keeps the other attempt in place of `best` if it explains the readings better. */
static void keep_better(struct attempt *best, struct attempt *other, double log_odds,
                        double *best_odds)
{
    if (!(log_odds > *best_odds) || other->diagnosis->misfit.p < fits_from)
        return;
    struct attempt swap = *best;
    *best = *other;
    *other = swap;
    *best_odds = log_odds;
}

static enum rf_status try_widened(const struct attempt *narrow, const struct rf_models *models,
                                  const struct widening *wider, struct attempt *best,
                                  double *best_odds, struct rf_error *error)
{
    struct attempt other;
    enum rf_status status = begin_attempt(&other, narrow->diagnosis->job, models, wider, error);
    if (status == RF_OK)
        status = rank_and_test(&other, false, error);
    if (status == RF_OK)
        keep_better(best, &other,
                    log_evidence_of_all(&other.candidates) -
                        log_evidence_of_all(&narrow->candidates),
                    best_odds);
    finish_attempt(&other);
    return status;
}

static enum rf_status try_pairs(const struct attempt *narrow, struct attempt *best,
                                double *best_odds, struct rf_error *error)
{
    struct attempt other;
    double log_narrow = log_evidence_of_all(&narrow->candidates), log_pairs = 0.0;
    enum rf_status status =
        begin_attempt(&other, narrow->diagnosis->job, narrow->diagnosis->models, NULL, error);
    if (status == RF_OK)
        status = candidates_add_pairs(&other.candidates, &narrow->candidates, other.fitter,
                                      &other.diagnosis->ring, log_narrow + *best_odds, &log_pairs,
                                      error);
    if (status == RF_OK && log_pairs - log_narrow > *best_odds)
        status = keep_and_test(&other, error);
    if (status == RF_OK && other.diagnosis->n_ranked > 0)
        keep_better(best, &other, log_pairs - log_narrow, best_odds);
    finish_attempt(&other);
    return status;
}

/* Puts what explains the readings in the attempt's place, if something does. Two defects are not tried
 * where one alone has so many places that not all are. */
static enum rf_status try_wider(struct attempt *narrow, const struct rf_models *models,
                                struct rf_error *error)
{
    struct attempt best = {0};
    struct widening wider;
    double log_evidence = 0.0, best_odds = log_odds_needed;
    enum rf_status status =
        choose_widening(narrow->diagnosis, &narrow->candidates, &wider, &log_evidence, error);
    double promised = log_evidence - log_evidence_of_all(&narrow->candidates);
    if (status != RF_OK || (!narrow->diagnosis->misfit.flag && !(promised > log_odds_promised)))
        return status;
    if (promised > 0.0)
        status = try_widened(narrow, models, &wider, &best, &best_odds, error);
    if ((status == RF_OK || status == RF_NUMERICAL) && !search_is_coarse(&narrow->candidates))
        status = try_pairs(narrow, &best, &best_odds, error);
    if (best.diagnosis != NULL && status != RF_MEMORY) {
        struct attempt swap = *narrow;
        note_widening(narrow->diagnosis, best.diagnosis, best_odds);
        *narrow = best;
        best = swap;
    }
    finish_attempt(&best);
    /* What cannot be computed explains nothing. */
    return status == RF_NUMERICAL ? RF_OK : status;
}

static enum rf_status finish_diagnosis(struct attempt *attempt, struct rf_error *error)
{
    struct rf_diagnosis *diagnosis = attempt->diagnosis;
    enum rf_status status = add_up_places(diagnosis, &attempt->candidates, error);
    if (status == RF_OK)
        status = group_findings(diagnosis, error);
    if (status == RF_OK)
        status = seek_blind_spots(diagnosis, &attempt->candidates, attempt->fitter, error);
    if (status == RF_OK)
        compare_with_found(diagnosis, &attempt->candidates);
    return status;
}

enum rf_status rf_diagnose(const struct rf_job *job, const struct rf_models *models,
                           struct rf_diagnosis **result, struct rf_error *error)
{
    return diagnose(job, models, true, result, error);
}

enum rf_status diagnose(const struct rf_job *job, const struct rf_models *models, bool screen,
                        struct rf_diagnosis **result, struct rf_error *error)
{
    struct attempt attempt = {0};
    enum rf_status status = begin_attempt(&attempt, job, models, NULL, error);
    *result = NULL;
    if (status == RF_OK)
        status = rank_and_test(&attempt, screen, error);
    if (status == RF_OK && screen && attempt.diagnosis->misfit.p < screening_trusted &&
        !search_is_coarse(&attempt.candidates))
        status = rank_and_test(&attempt, false, error);
    if (status == RF_OK && attempt.diagnosis->misfit.p < screening_trusted)
        status = try_wider(&attempt, models, error);
    if (status == RF_OK)
        status = finish_diagnosis(&attempt, error);
    if (status == RF_OK) {
        *result = attempt.diagnosis;
        attempt.diagnosis = NULL;
    }
    finish_attempt(&attempt);
    return status;
}

size_t rf_diagnosis_hypotheses(const struct rf_diagnosis *diagnosis)
{
    return diagnosis->n_hypotheses;
}

size_t rf_diagnosis_faults(const struct rf_diagnosis *diagnosis)
{
    return diagnosis->n_ranked;
}

double rf_diagnosis_confidence(const struct rf_diagnosis *diagnosis, size_t i)
{
    return diagnosis->ranked[i].confidence;
}

const char *rf_diagnosis_words(const struct rf_diagnosis *diagnosis, size_t i)
{
    return diagnosis->ranked[i].words;
}

const char *rf_diagnosis_family(const struct rf_diagnosis *diagnosis, size_t i)
{
    const struct hypothesis *hypothesis = &diagnosis->ranked[i].hypothesis;
    return hypothesis->n_faults > 0 ? hypothesis->faults[0].family->name : fault_family_none.name;
}

double rf_diagnosis_misfit(const struct rf_diagnosis *diagnosis, bool *flag)
{
    if (flag != NULL)
        *flag = diagnosis->misfit.flag;
    return diagnosis->misfit.p;
}

const char *rf_diagnosis_assumes(const struct rf_diagnosis *diagnosis)
{
    if (!diagnosis->wider.assumed)
        return NULL;
    if (diagnosis->wider.two_defects)
        return "two_defects";
    return diagnosis->wider.face_ohms > 0.0 ? "faces" : "lengths";
}
