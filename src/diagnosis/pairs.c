/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/error.h"
#include "base/memory.h"
#include "diagnosis/steps.h"

#include <math.h>

/*
 * Two defects at once. All pairs would be too many; so the likeliest fault is kept and every other
 * put beside it, then what stands best beside it is kept and the first one freed, and so on while
 * that finds a better pair. Each pass compares as many as there are single faults.
 */
enum { PASSES_MOST = 3 };

/* A second defect beside one is so likely as this. */
static const double second_share = 0.05;

/* Of the log of their weight, by passes after the first. */
static const double hardly_gained = 12.0;

static bool is_kept(const struct candidate kept[], size_t n, const struct hypothesis *hypothesis)
{
    for (size_t i = 0; i < n; i++)
        if (hypothesis_equal(&kept[i].hypothesis, hypothesis))
            return true;
    return false;
}

/* Every single fault beside the one kept last. Those kept before have been beside it already. */
static bool pair_up(struct candidates *pairs, const struct candidates *singles,
                    const struct candidate kept[], size_t n_kept)
{
    const struct candidate *with = &kept[n_kept - 1];
    *pairs = (struct candidates){.list = NEW_ARRAY(struct candidate, singles->n),
                                 .capacity = singles->n};
    if (pairs->list == NULL)
        return false;
    for (size_t i = 0; i < singles->n; i++) {
        struct candidate pair = singles->list[i];
        if (pair.hypothesis.n_faults == 0 || is_kept(kept, n_kept, &pair.hypothesis))
            continue;
        pair.hypothesis.faults[pair.hypothesis.n_faults++] = with->hypothesis.faults[0];
        pair.log_prior += with->log_prior + log(second_share);
        pair.log_looks += with->log_looks;
        pair.log_evidence = pair.log_likely = -INFINITY;
        pair.fitted = false;
        pair.index = pairs->n;
        pairs->list[pairs->n++] = pair;
    }
    return true;
}

/* Adds the pairs; there is room. */
static void take_over(struct candidates *all, const struct candidates *pairs)
{
    for (size_t i = 0; i < pairs->n; i++) {
        all->list[all->n] = pairs->list[i];
        all->list[all->n].index = all->n;
        all->n++;
    }
}

static const struct candidate *best_of(const struct candidate list[], size_t from, size_t n)
{
    const struct candidate *best = NULL;
    for (size_t i = from; i < n; i++)
        if (list[i].hypothesis.n_faults > 0 &&
            (best == NULL || log_weight(&list[i]) > log_weight(best)))
            best = &list[i];
    return best;
}

/* Of the pair, the fault that was put beside the one kept last, as a single one. */
static const struct candidate *partner_in(const struct candidates *singles,
                                          const struct candidate *pair)
{
    const struct hypothesis partner = {.faults = {pair->hypothesis.faults[0]}, .n_faults = 1};
    for (size_t i = 0; i < singles->n; i++)
        if (hypothesis_equal(&singles->list[i].hypothesis, &partner))
            return &singles->list[i];
    return NULL;
}

/* Log of what those from there on weigh together. */
static double log_sum(const struct candidates *all, size_t from)
{
    const struct candidate *best = best_of(all->list, from, all->n);
    double sum = 0.0;
    if (best == NULL)
        return -INFINITY;
    for (size_t i = from; i < all->n; i++)
        sum += exp(log_weight(&all->list[i]) - log_weight(best));
    return log_weight(best) + log(sum);
}

enum rf_status candidates_add_pairs(struct candidates *all, const struct candidates *singles,
                                    struct fitter *fitter, const struct wiring *ring,
                                    double log_wanted, double *log_evidence, struct rf_error *error)
{
    struct candidate kept[PASSES_MOST];
    const struct candidate *next = best_of(singles->list, 0, singles->n);
    size_t room = singles->n * (1 + PASSES_MOST);
    double best = -INFINITY;
    *log_evidence = -INFINITY;
    *all = (struct candidates){.list = NEW_ARRAY(struct candidate, room), .capacity = room};
    if (all->list == NULL)
        return fail_memory(error);
    for (size_t i = 0; i < singles->n; i++)
        all->list[all->n++] = singles->list[i];
    enum rf_status status = RF_OK;
    for (size_t pass = 0; pass < PASSES_MOST && next != NULL && status == RF_OK; pass++) {
        struct candidates pairs;
        kept[pass] = *next;
        status = pair_up(&pairs, singles, kept, pass + 1)
                     ? candidates_rank(&pairs, fitter, ring, false, error)
                     : fail_memory(error);
        next = NULL;
        if (status == RF_OK) {
            size_t before = all->n;
            take_over(all, &pairs);
            *log_evidence = log_sum(all, singles->n) - log(second_share);
            const struct candidate *found = best_of(all->list, before, all->n);
            if (found != NULL && log_weight(found) > best &&
                *log_evidence + hardly_gained > log_wanted) {
                best = log_weight(found);
                next = partner_in(singles, found);
            }
        }
        candidates_finish(&pairs);
    }
    return status == RF_OK ? candidates_sort(all, error) : status;
}
