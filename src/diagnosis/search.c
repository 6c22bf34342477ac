/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "diagnosis/search.h"

#include "base/memory.h"

#include <math.h>

enum {
    FEW_ENOUGH = 2500, /* hypotheses; rings of 36 points have fewer */
    GRID_PLACES = 36,  /* at most */
    BEST = 12,         /* of each family */
    FAMILIES_MOST = 4,
};

struct search {
    const struct candidates *candidates;
    size_t n_places, step;
    bool begun;
    size_t n_families;
    const struct fault_family *families[FAMILIES_MOST]; /* of faults between two places */
    size_t *index_of[FAMILIES_MOST]; /* [one · n_places + other] 1 + index; 0: no such fault */
    unsigned char *taken;            /* [candidate] */
    size_t *list;
    size_t n_list;
};

bool search_is_coarse(const struct candidates *candidates)
{
    return candidates->n > FEW_ENOUGH;
}

static const struct fault *fault_of(const struct search *s, size_t index)
{
    return &s->candidates->list[index].hypothesis.faults[0];
}

static bool between_places(const struct search *s, size_t index)
{
    return s->candidates->list[index].hypothesis.n_faults > 0 &&
           (fault_of(s, index)->family->fields & (FIELD_BETWEEN_RING | FIELD_BETWEEN_POINTS)) != 0;
}

void search_destroy(struct search *s)
{
    if (s == NULL)
        return;
    for (size_t i = 0; i < s->n_families; i++)
        free(s->index_of[i]);
    free(s->taken);
    free(s->list);
    free(s);
}

/* The family's number, added where it is new; FAMILIES_MOST: there are too many, or no memory. */
static size_t family_number(struct search *s, const struct fault_family *family)
{
    size_t i = 0;
    while (i < s->n_families && s->families[i] != family)
        i++;
    if (i < s->n_families || i == FAMILIES_MOST)
        return i;
    s->index_of[i] = NEW_ARRAY(size_t, s->n_places * s->n_places);
    if (s->index_of[i] == NULL)
        return FAMILIES_MOST;
    s->families[s->n_families++] = family;
    return i;
}

static bool map_places(struct search *s)
{
    for (size_t i = 0; i < s->candidates->n; i++) {
        if (!between_places(s, i))
            continue;
        const struct fault *fault = fault_of(s, i);
        size_t family = family_number(s, fault->family);
        if (family == FAMILIES_MOST)
            return false;
        s->index_of[family][fault->place * s->n_places + fault->other] = i + 1;
    }
    return true;
}

struct search *search_create(const struct candidates *candidates, size_t n_places)
{
    struct search *s = NEW(struct search);
    if (s == NULL)
        return NULL;
    s->candidates = candidates;
    s->n_places = n_places;
    s->step = search_is_coarse(candidates) ? (n_places + GRID_PLACES - 1) / GRID_PLACES : 1;
    s->taken = NEW_ARRAY(unsigned char, candidates->n);
    s->list = NEW_ARRAY(size_t, candidates->n);
    if (s->taken != NULL && s->list != NULL && (s->step == 1 || map_places(s)))
        return s;
    search_destroy(s);
    return NULL;
}

static void take(struct search *s, size_t index)
{
    if (s->taken[index])
        return;
    s->taken[index] = 1;
    s->list[s->n_list++] = index;
}

static void take_grid(struct search *s)
{
    for (size_t i = 0; i < s->candidates->n; i++) {
        const struct fault *fault = fault_of(s, i);
        if (!between_places(s, i) || (fault->place % s->step == 0 && fault->other % s->step == 0))
            take(s, i);
    }
}

/* Both places a step away, either way, or one of them. */
static void take_neighbours(struct search *s, size_t family, size_t index)
{
    const struct fault *fault = fault_of(s, index);
    for (int i = -1; i <= 1; i++)
        for (int j = -1; j <= 1; j++) {
            /* Below 0 wraps to far above every place. */
            size_t one = fault->place + (size_t)i * s->step;
            size_t other = fault->other + (size_t)j * s->step;
            if (one >= s->n_places || other >= s->n_places)
                continue;
            size_t found = s->index_of[family][one * s->n_places + other];
            if (found > 0)
                take(s, found - 1);
        }
}

/* Log of the weight, or of what it was likely to be when it was given up. */
static double worth(const struct candidate *candidate)
{
    return log_share(candidate) +
           (candidate->fitted ? candidate->log_evidence : candidate->log_likely);
}

static void take_around_best(struct search *s, size_t family)
{
    size_t best[BEST], n = 0;
    for (size_t i = 0; i < s->candidates->n; i++) {
        if (!s->taken[i] || !between_places(s, i) || fault_of(s, i)->family != s->families[family])
            continue;
        double weight = worth(&s->candidates->list[i]);
        size_t at = n < BEST ? n++ : BEST;
        for (; at > 0 && weight > worth(&s->candidates->list[best[at - 1]]); at--)
            if (at < BEST)
                best[at] = best[at - 1];
        if (at < BEST)
            best[at] = i;
    }
    for (size_t i = 0; i < n; i++)
        if (worth(&s->candidates->list[best[i]]) > -INFINITY)
            take_neighbours(s, family, best[i]);
}

static void take_around_all_in_reach(struct search *s, double reach)
{
    for (size_t i = 0; i < s->candidates->n; i++)
        for (size_t family = 0; family < s->n_families; family++)
            if (s->taken[i] && between_places(s, i) && s->candidates->list[i].fitted &&
                fault_of(s, i)->family == s->families[family] &&
                worth(&s->candidates->list[i]) >= reach)
                take_neighbours(s, family, i);
}

size_t search_next(struct search *s, double reach, const size_t **indices)
{
    s->n_list = 0;
    *indices = s->list;
    if (!s->begun) {
        s->begun = true;
        take_grid(s);
        return s->n_list;
    }
    while (s->n_families > 0 && s->n_list == 0) {
        for (size_t family = 0; family < s->n_families; family++)
            take_around_best(s, family);
        if (s->n_list > 0 || s->step == 1)
            break;
        s->step /= 2;
    }
    if (s->n_list == 0)
        take_around_all_in_reach(s, reach);
    return s->n_list;
}
