/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "review/tally.h"

#include "base/error.h"
#include "base/memory.h"

#include <gsl/gsl_cdf.h>
#include <math.h>
#include <string.h>

/* --- the most worrying --- */

static int compare_texts(const char *one, const char *other)
{
    int order = strcmp(one, other);
    return order < 0 ? -1 : order > 0;
}

/* A total order over all that is shown of them, so that ties do not depend on who came first. */
static int compare_worry(const struct review_line *one, const struct review_line *other)
{
    int64_t a = line_worry(one), b = line_worry(other);
    if (a != b)
        return a > b ? -1 : 1;
    int order = compare_texts(one->job, other->job);
    if (order == 0)
        order = compare_texts(one->words, other->words);
    if (order == 0 && one->confidence != other->confidence)
        order = one->confidence > other->confidence ? -1 : 1;
    if (order == 0)
        order = (int)one->verdict - (int)other->verdict;
    if (order == 0)
        order = (int)one->found.known - (int)other->found.known;
    if (order == 0 && one->danger != other->danger)
        order = one->danger > other->danger ? -1 : 1;
    return order;
}

static enum rf_status copy_line(struct review_line *copy, const struct review_line *line,
                                struct rf_error *error)
{
    *copy = *line;
    copy->job = text_duplicate(line->job);
    copy->words = text_duplicate(line->words);
    if (copy->job != NULL && copy->words != NULL)
        return RF_OK;
    line_finish(copy);
    return fail_memory(error);
}

static enum rf_status keep_if_worst(struct rf_review *review, const struct review_line *line,
                                    struct rf_error *error)
{
    struct review_line copy;
    size_t at = review->n_worst;
    if (line_worry(line) == 0)
        return RF_OK;
    while (at > 0 && compare_worry(line, &review->worst[at - 1]) < 0)
        at--;
    if (at == WORST_SHOWN)
        return RF_OK;
    enum rf_status status = copy_line(&copy, line, error);
    if (status != RF_OK)
        return status;
    if (review->n_worst == WORST_SHOWN)
        line_finish(&review->worst[--review->n_worst]);
    memmove(&review->worst[at + 1], &review->worst[at],
            (review->n_worst - at) * sizeof review->worst[0]);
    review->worst[at] = copy;
    review->n_worst++;
    return RF_OK;
}

/* --- counting in --- */

static void add_score(struct scorecard *score, const struct review_line *line)
{
    if (!line->found.known)
        return;
    score->confirmed++;
    score->first += line->found.rank == 0;
    score->first_three += line->found.rank >= 0 && line->found.rank < 3;
    score->agrees += line->found.agrees;
    score->below += line->found.below;
    score->log_posterior += line->found.log_posterior;
    score->confusion[line->found.sort.family][line->first.family]++;
    score->kinds[line->found.sort.family][line->found.sort.kind]++;
    score->looked += line->found.looked;
    score->places += line->found.places;
    for (size_t i = 0; i < N_LOOK_BINS; i++)
        score->looks[i] += line->found.looks[i];
    if (line->verdict == VERDICT_UNEXPLAINED) {
        score->unexplained++;
        return;
    }
    int64_t tenth = line->confidence / (PARTS / CALIBRATION_BINS);
    struct calibration_bin *bin =
        &score->calibration[tenth < CALIBRATION_BINS ? tenth : CALIBRATION_BINS - 1];
    bin->jobs++;
    bin->right += line->found.agrees;
    bin->confidence += line->confidence;
}

enum rf_status review_add_line(struct rf_review *review, const struct review_line *line,
                               struct rf_error *error)
{
    enum rf_status status = keep_if_worst(review, line, error);
    if (status != RF_OK)
        return status;
    bool found = line_found_disagrees(line);
    review->jobs++;
    review->verdicts[line->verdict]++;
    if (line->verdict == VERDICT_DEFECT) {
        review->defects[line->first.family][line->first.conductor]++;
        review->testing[line->first.family] += line->testing;
    }
    review->readings += line->readings;
    review->written_off += line->written_off;
    review->jobs_written_off += line->written_off > 0;
    review->disagree += found || line->other_wiring || line->other_lengths;
    review->disagree_found += found;
    review->disagree_wiring += line->other_wiring;
    review->disagree_lengths += line->other_lengths;
    add_score(&review->score, line);
    return RF_OK;
}

/* --- joining parts --- */

static void join_counts(uint64_t *into, const uint64_t *part, size_t n)
{
    for (size_t i = 0; i < n; i++)
        into[i] += part[i];
}

static void join_scores(struct scorecard *into, const struct scorecard *part)
{
    into->confirmed += part->confirmed;
    into->first += part->first;
    into->first_three += part->first_three;
    into->agrees += part->agrees;
    into->below += part->below;
    into->log_posterior += part->log_posterior;
    into->unexplained += part->unexplained;
    into->looked += part->looked;
    into->places += part->places;
    for (size_t i = 0; i < N_LOOK_BINS; i++)
        into->looks[i] += part->looks[i];
    for (size_t i = 0; i < CALIBRATION_BINS; i++) {
        into->calibration[i].jobs += part->calibration[i].jobs;
        into->calibration[i].right += part->calibration[i].right;
        into->calibration[i].confidence += part->calibration[i].confidence;
    }
    for (size_t i = 0; i < MAX_SORTS; i++) {
        join_counts(into->confusion[i], part->confusion[i], MAX_SORTS);
        join_counts(into->kinds[i], part->kinds[i], MODELS_MAX_KINDS);
    }
}

enum rf_status rf_review_join(struct rf_review *review, const struct rf_review *part,
                              struct rf_error *error)
{
    for (size_t i = 0; i < part->n_worst; i++) {
        enum rf_status status = keep_if_worst(review, &part->worst[i], error);
        if (status != RF_OK)
            return status;
    }
    review->jobs += part->jobs;
    review->refused += part->refused;
    review->failed += part->failed;
    review->unread += part->unread;
    review->stopped = review->stopped || part->stopped;
    join_counts(review->verdicts, part->verdicts, N_VERDICTS);
    for (size_t i = 0; i < MAX_SORTS; i++)
        join_counts(review->defects[i], part->defects[i], N_CONDUCTOR_KINDS);
    join_counts(review->testing, part->testing, MAX_SORTS);
    review->readings += part->readings;
    review->written_off += part->written_off;
    review->jobs_written_off += part->jobs_written_off;
    review->disagree += part->disagree;
    review->disagree_found += part->disagree_found;
    review->disagree_wiring += part->disagree_wiring;
    review->disagree_lengths += part->disagree_lengths;
    join_scores(&review->score, &part->score);
    return RF_OK;
}

/* --- the public side --- */

enum rf_status rf_review_create(struct rf_review **review, struct rf_error *error)
{
    *review = NEW(struct rf_review);
    return *review != NULL ? RF_OK : fail_memory(error);
}

void rf_review_destroy(struct rf_review *review)
{
    if (review == NULL)
        return;
    for (size_t i = 0; i < review->n_worst; i++)
        line_finish(&review->worst[i]);
    free(review);
}

enum rf_status rf_review_add(struct rf_review *review, const struct rf_diagnosis *diagnosis,
                             struct rf_error *error)
{
    struct review_line line = {0};
    enum rf_status status = line_of_diagnosis(&line, diagnosis, error);
    if (status == RF_OK)
        status = review_add_line(review, &line, error);
    line_finish(&line);
    return status;
}

size_t rf_review_jobs(const struct rf_review *review)
{
    return (size_t)review->jobs;
}

size_t rf_review_confirmed(const struct rf_review *review)
{
    return (size_t)review->score.confirmed;
}

size_t rf_review_first(const struct rf_review *review)
{
    return (size_t)review->score.first;
}

size_t rf_review_first_three(const struct rf_review *review)
{
    return (size_t)review->score.first_three;
}

double rf_review_mean_log_posterior(const struct rf_review *review)
{
    if (review->score.confirmed == 0)
        return NAN;
    return (double)review->score.log_posterior / (double)review->score.confirmed / PARTS;
}

/* E. B. Wilson, "Probable inference, the law of succession, and statistical inference", J. Am.
 * Stat. Assoc. 22 (1927): the p with (right/n − p)² = z² p (1 − p) / n. Brown, Cai and DasGupta
 * (Statistical Science 16, 2001) recommend it for small n. */
void rf_wilson(size_t right, size_t n, double level, double *low, double *high)
{
    *low = 0;
    *high = 1;
    if (n == 0)
        return;
    double z = gsl_cdf_ugaussian_Pinv((1 + level) / 2);
    double count = (double)n, share = (double)right / count, square = z * z / count;
    double middle = (share + square / 2) / (1 + square);
    double half = z * sqrt(share * (1 - share) / count + square / (4 * count)) / (1 + square);
    if (right > 0) /* else exactly 0, and at the other end exactly 1 */
        *low = middle - half;
    if (right < n)
        *high = middle + half;
}
