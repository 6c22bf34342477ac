/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/error.h"
#include "base/memory.h"
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

static enum rf_status rank_and_test(struct rf_diagnosis *diagnosis, struct candidates *candidates,
                                    struct fitter *fitter, bool screen, struct rf_error *error)
{
    candidates_finish(candidates);
    forget_ranked(diagnosis);
    enum rf_status status =
        candidates_enumerate(candidates, diagnosis->job, diagnosis->models, error);
    diagnosis->n_hypotheses = candidates->n;
    if (status == RF_OK)
        status = candidates_rank(candidates, fitter, &diagnosis->ring, screen, error);
    if (status == RF_OK)
        status = keep_ranked(diagnosis, candidates, fitter, error);
    if (status == RF_OK)
        status = test_misfit(diagnosis, fitter, error);
    return status;
}

/*
 * Screening judges a fit by its first steps, which can be trusted where something explains the
 * readings. Where nothing seems to, a fit may yet turn a corner late, with many readings to write
 * off; so below this p-value of the misfit test, every fit is followed to its end.
 */
static const double screening_trusted = 0.2;

static enum rf_status diagnose_with(struct rf_diagnosis *diagnosis, struct candidates *candidates,
                                    struct fitter *fitter, struct rf_error *error)
{
    enum rf_status status =
        rank_and_test(diagnosis, candidates, fitter, diagnosis->screened, error);
    if (status == RF_OK && diagnosis->screened && diagnosis->misfit.p < screening_trusted)
        status = rank_and_test(diagnosis, candidates, fitter, false, error);
    if (status == RF_OK)
        status = add_up_places(diagnosis, candidates, error);
    if (status == RF_OK)
        status = group_findings(diagnosis, error);
    if (status == RF_OK)
        status = seek_blind_spots(diagnosis, candidates, fitter, error);
    if (status == RF_OK)
        compare_with_found(diagnosis, candidates);
    return status;
}

static enum rf_status read_found(struct rf_diagnosis *diagnosis, struct rf_error *error)
{
    diagnosis->found_known = diagnosis->job->found != NULL;
    if (!diagnosis->found_known)
        return RF_OK;
    return hypothesis_from_found(diagnosis->job, diagnosis->models, &diagnosis->found, error);
}

enum rf_status rf_diagnose(const struct rf_job *job, const struct rf_models *models,
                           struct rf_diagnosis **result, struct rf_error *error)
{
    return diagnose(job, models, true, result, error);
}

enum rf_status diagnose(const struct rf_job *job, const struct rf_models *models, bool screen,
                        struct rf_diagnosis **result, struct rf_error *error)
{
    *result = NULL;
    struct rf_diagnosis *diagnosis = NEW(struct rf_diagnosis);
    if (diagnosis == NULL)
        return fail_memory(error);
    diagnosis->job = job;
    diagnosis->models = models;
    diagnosis->screened = screen;
    struct candidates candidates = {0};
    struct fitter *fitter = NULL;
    enum rf_status status = wiring_init(&diagnosis->ring, job, models, error);
    if (status == RF_OK)
        status = check_range(&diagnosis->ring, error);
    if (status == RF_OK)
        status = read_found(diagnosis, error);
    if (status == RF_OK) {
        diagnosis->sound = NEW_ARRAY(double, job->n_readings);
        fitter = fitter_create(&diagnosis->ring);
        status = diagnosis->sound == NULL || fitter == NULL
                     ? fail_memory(error)
                     : diagnose_with(diagnosis, &candidates, fitter, error);
    }
    fitter_destroy(fitter);
    candidates_finish(&candidates);
    if (status == RF_OK)
        *result = diagnosis;
    else
        rf_diagnosis_destroy(diagnosis);
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
