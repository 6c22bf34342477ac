/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "review/line.h"

#include "base/error.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static const int64_t decided = PARTS / 5 * 4;
static const double least_posterior = 1e-6;
static const double lengths_off = 3; /* standard deviations */

const char *const verdict_names[N_VERDICTS] = {
    [VERDICT_NO_DEFECT] = "no_defect",
    [VERDICT_DEFECT] = "defect",
    [VERDICT_UNDECIDED] = "undecided",
    [VERDICT_UNEXPLAINED] = "unexplained",
};

const char *const conductor_kind_names[N_CONDUCTOR_KINDS] = {
    "", "L", "N", "E", "LNE", "ln", "le", "ne",
};
enum { FIRST_CONDUCTOR = 1, FIRST_PAIR = 5 };

size_t two_defects(void)
{
    return n_fault_families;
}

size_t n_sorts(void)
{
    return n_fault_families + 1;
}

const char *sort_name(size_t family)
{
    return family < n_fault_families ? fault_families[family]->name : "two_defects";
}

/* --- from a diagnosis --- */

static int64_t parts(double chance)
{
    return (int64_t)llround(fmin(1, fmax(0, chance)) * PARTS);
}

static size_t family_index(const struct fault_family *family)
{
    size_t i = 0;
    while (i < n_fault_families && fault_families[i] != family)
        i++;
    return i;
}

static struct fault_sort sort_of(const struct hypothesis *hypothesis)
{
    struct fault_sort sort = {0};
    if (hypothesis->n_faults == 0) {
        sort.family = family_index(&fault_family_none);
    } else if (hypothesis->n_faults > 1) {
        sort.family = two_defects();
    } else {
        const struct fault *fault = &hypothesis->faults[0];
        sort.family = family_index(fault->family);
        sort.kind = fault->family->kind != NULL ? fault->family->kind(fault) : 0;
        if (fault->family->fields & (FIELD_CONDUCTOR | FIELD_ANY_CONDUCTOR))
            sort.conductor = FIRST_CONDUCTOR + (size_t)fault->conductor;
        else if (fault->family->fields & FIELD_PAIR)
            sort.conductor = FIRST_PAIR + (size_t)fault->pair;
    }
    return sort;
}

static void see_look(void *context, const struct look *look)
{
    bool *screw = context;
    if (look->kind != LOOK_CHECK && look->where != LOOK_AT_BOARD)
        *screw = true;
}

/* What shows at faces or at the board only is not in the ring: somebody tested it wrongly. */
static bool is_testing_mistake(const struct rf_diagnosis *diagnosis)
{
    const struct hypothesis *first = &diagnosis->ranked[0].hypothesis;
    bool screw = first->n_faults == 0;
    for (size_t i = 0; i < first->n_faults; i++)
        fault_looks(&first->faults[i], diagnosis->job, diagnosis->models, see_look, &screw);
    return !screw;
}

/* Cable where none is recorded, or another. */
static bool is_other_wiring(const struct hypothesis *hypothesis)
{
    for (size_t i = 0; i < hypothesis->n_faults; i++)
        if (hypothesis->faults[i].family->metres ||
            hypothesis->faults[i].family->fields & FIELD_CABLE)
            return true;
    return false;
}

/* The log of the fitted length of all recorded runs over their recorded one, in its own standard
 * deviations before anything was read. */
static bool lengths_disagree(const struct rf_diagnosis *diagnosis)
{
    const struct rf_job *job = diagnosis->job;
    const double *theta = diagnosis->ranked[0].theta + diagnosis->ring.map.runs;
    double accuracy = job->length_accuracy, recorded = 0, squares = 0, fitted = 0;
    for (size_t run = 0; run < n_runs(job); run++) {
        double metres = job->places[run_far_end(run)].run_m;
        if (isnan(metres))
            continue;
        recorded += metres;
        squares += metres * metres;
        fitted += metres * exp(accuracy * theta[run]);
    }
    if (!(recorded > 0) || !(accuracy > 0))
        return false;
    return fabs(log(fitted / recorded)) > lengths_off * accuracy * sqrt(squares) / recorded;
}

static double chance_of_none(const struct rf_diagnosis *diagnosis)
{
    for (size_t i = 0; i < diagnosis->n_ranked; i++)
        if (diagnosis->ranked[i].hypothesis.n_faults == 0)
            return diagnosis->ranked[i].confidence;
    return 0;
}

static double chance_of_danger(const struct rf_diagnosis *diagnosis)
{
    double sum = 0;
    for (size_t i = 0; i < diagnosis->n_ranked; i++) {
        const struct hypothesis *hypothesis = &diagnosis->ranked[i].hypothesis;
        bool any = false;
        for (size_t j = 0; j < hypothesis->n_faults; j++)
            any = any || fault_danger(&hypothesis->faults[j], diagnosis->job) != DANGER_NONE;
        sum += any ? diagnosis->ranked[i].confidence : 0;
    }
    return sum;
}

static enum verdict verdict_of(const struct review_line *line, bool unexplained)
{
    if (unexplained)
        return VERDICT_UNEXPLAINED;
    if (line->none >= decided)
        return VERDICT_NO_DEFECT;
    return line->none <= PARTS - decided ? VERDICT_DEFECT : VERDICT_UNDECIDED;
}

static void compare_found(struct review_line *line, const struct rf_diagnosis *diagnosis)
{
    const struct finding *finding = &diagnosis->findings[0];
    double posterior = diagnosis->found_confidence;
    line->found.known = true;
    line->found.sort = sort_of(&diagnosis->found);
    line->found.rank =
        diagnosis->found_rank < diagnosis->n_ranked ? (int64_t)diagnosis->found_rank : -1;
    for (size_t i = 0; i < finding->n_members; i++)
        line->found.agrees = line->found.agrees || finding->members[i] == diagnosis->found_rank;
    line->found.below = posterior < least_posterior;
    line->found.log_posterior = llround(log(fmax(posterior, least_posterior)) * PARTS);
}

enum rf_status line_of_diagnosis(struct review_line *line, const struct rf_diagnosis *diagnosis,
                                 struct rf_error *error)
{
    const struct ranked *first = &diagnosis->ranked[0];
    line->job = text_duplicate(rf_job_name(diagnosis->job));
    line->words = text_duplicate(diagnosis->findings[0].words);
    if (line->job == NULL || line->words == NULL)
        return fail_memory(error);
    line->confidence = parts(diagnosis->findings[0].confidence);
    line->none = parts(chance_of_none(diagnosis));
    line->danger = parts(chance_of_danger(diagnosis));
    line->verdict = verdict_of(line, diagnosis->misfit.flag);
    line->first = sort_of(&first->hypothesis);
    line->testing = is_testing_mistake(diagnosis);
    line->readings = diagnosis->job->n_readings;
    line->written_off = diagnosis->misfit.written_off;
    line->other_wiring = line->verdict == VERDICT_DEFECT && is_other_wiring(&first->hypothesis);
    line->other_lengths = line->verdict != VERDICT_UNEXPLAINED && lengths_disagree(diagnosis);
    if (!diagnosis->found_known)
        return RF_OK;
    compare_found(line, diagnosis);
    return line_count_looks(line, diagnosis, error);
}

void line_finish(struct review_line *line)
{
    free(line->job);
    free(line->words);
    *line = (struct review_line){0};
}

/* --- what follows from it --- */

bool line_found_disagrees(const struct review_line *line)
{
    static const double doubted = 0.05;
    return line->found.known && line->found.log_posterior < llround(log(doubted) * PARTS);
}

int64_t line_worry(const struct review_line *line)
{
    bool defect_known =
        line->found.known && line->found.sort.family != family_index(&fault_family_none);
    if (line->verdict == VERDICT_NO_DEFECT || line->found.agrees ||
        (line->verdict == VERDICT_UNDECIDED && defect_known))
        return 0;
    return line->danger + (line->verdict == VERDICT_UNEXPLAINED ? PARTS : PARTS - line->none);
}
