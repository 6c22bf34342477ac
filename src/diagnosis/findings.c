/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/error.h"
#include "base/memory.h"
#include "diagnosis/steps.h"

#include <math.h>
#include <string.h>

/*
 * What the readings cannot tell apart is one finding. Two hypotheses go together when
 *   they would read the same: no reading differs by more than `same_reading` of its noise; or
 *   they differ in the place only, and neither is more than `nearly_as_likely` times the other:
 *   "somewhere between" is then the honest answer.
 * Faults so slight that they read like no fault at all are one finding of their own, beside "no
 * defect", so that they neither hide it nor pose as found.
 */
static const double same_reading = 0.35;
static const double nearly_as_likely = 20.0;

enum { KINDS_NAMED = 3, PLACES_NAMED = 4 };

bool fault_same_kind(const struct fault *one, const struct fault *other)
{
    struct fault a = *one, b = *other;
    a.run = b.run = 0;
    a.place = b.place = 0;
    a.other = b.other = 0;
    memset(a.chain, 0, sizeof a.chain);
    memset(b.chain, 0, sizeof b.chain);
    return fault_equal(&a, &b);
}

static bool same_kind(const struct hypothesis *one, const struct hypothesis *other)
{
    if (one->n_faults != other->n_faults)
        return false;
    for (size_t i = 0; i < one->n_faults; i++)
        if (!fault_same_kind(&one->faults[i], &other->faults[i]))
            return false;
    return true;
}

static bool read_the_same(const struct rf_diagnosis *diagnosis, const struct ranked *one,
                          const struct ranked *other)
{
    for (size_t i = 0; i < diagnosis->job->n_readings; i++) {
        double a = one->fitted[i], b = other->fitted[i];
        if (isnan(a) != isnan(b))
            return false;
        const struct reading *reading = &diagnosis->job->readings[i];
        double sigma =
            isnan(a) ? 1.0 : reading_sigma(diagnosis->models, reading->setup, reading->spot, 1.0, a);
        if (!isnan(a) && fabs(a - b) > same_reading * sigma)
            return false;
    }
    return true;
}

static bool is_none(const struct ranked *ranked)
{
    return ranked->hypothesis.n_faults == 0;
}

/* The chance of one hypothesis against another is compared without their priors' splitting, which
 * both have alike when they are of one kind. */
static bool alike(const struct rf_diagnosis *diagnosis, const struct ranked *leader,
                  const struct ranked *other)
{
    if (is_none(leader) || is_none(other))
        return false;
    return (same_kind(&leader->hypothesis, &other->hypothesis) &&
            other->confidence * nearly_as_likely >= leader->confidence) ||
           read_the_same(diagnosis, leader, other);
}

/* --- words --- */

static const struct fault *single_fault(const struct rf_diagnosis *diagnosis, size_t member)
{
    const struct hypothesis *h = &diagnosis->ranked[member].hypothesis;
    return h->n_faults == 1 ? &h->faults[0] : NULL;
}

/* If the members' spans cover one stretch of the ring without a gap, that stretch. */
static bool one_stretch(const struct rf_diagnosis *diagnosis, const size_t members[], size_t n,
                        bool covered[], size_t *from, size_t *to)
{
    size_t ring_places = diagnosis->job->n_ring + 2;
    memset(covered, 0, ring_places * sizeof *covered); /* [run], or a point counted as its own */
    *from = ring_places;
    *to = 0;
    for (size_t i = 0; i < n; i++) {
        const struct fault *fault = single_fault(diagnosis, members[i]);
        size_t a = 0, b = 0;
        if (fault == NULL || fault->family->span == NULL)
            return false;
        fault->family->span(fault, diagnosis->job, &a, &b);
        if (a >= ring_places || b >= ring_places || b != a + 1)
            return false;
        covered[a] = true;
        *from = a < *from ? a : *from;
        *to = b > *to ? b : *to;
    }
    for (size_t run = *from; run < *to; run++)
        if (!covered[run])
            return false;
    return n > 1;
}

static void describe_kind_of(const struct fault *fault, struct text *out)
{
    fault->family->describe_kind(fault, out);
}

/* A place by its id alone; an end of the ring is the board. */
static const char *short_name(const struct rf_job *job, size_t place)
{
    return place_is_end(job, place) ? "the board" : job->places[place].id;
}

/* Members of one kind, in words. */
static void describe_members(const struct rf_diagnosis *diagnosis, const size_t members[], size_t n,
                             bool covered[], struct text *out)
{
    const struct rf_job *job = diagnosis->job;
    size_t from = 0, to = 0;
    if (one_stretch(diagnosis, members, n, covered, &from, &to)) {
        describe_kind_of(single_fault(diagnosis, members[0]), out);
        if (from == place_out() && to == place_in(job))
            text_add(out, " somewhere on the ring");
        else
            text_addf(out, " somewhere between %s and %s", short_name(job, from),
                      short_name(job, to));
        return;
    }
    for (size_t i = 0; i < n && i < PLACES_NAMED; i++)
        text_addf(out, "%s%s", i > 0 ? ", or " : "", diagnosis->ranked[members[i]].words);
    if (n > PLACES_NAMED)
        text_addf(out, ", or %zu more such place%s", n - PLACES_NAMED,
                  n - PLACES_NAMED == 1 ? "" : "s");
}

struct scratch {
    size_t *kind_members; /* [ranked] */
    bool *told;           /* [member] */
    bool *covered;        /* [ring place] */
};

static bool init_scratch(struct scratch *scratch, const struct rf_diagnosis *diagnosis)
{
    scratch->kind_members = NEW_ARRAY(size_t, diagnosis->n_ranked);
    scratch->told = NEW_ARRAY(bool, diagnosis->n_ranked);
    scratch->covered = NEW_ARRAY(bool, diagnosis->job->n_ring + 2);
    return scratch->kind_members != NULL && scratch->told != NULL && scratch->covered != NULL;
}

static void finish_scratch(struct scratch *scratch)
{
    free(scratch->kind_members);
    free(scratch->told);
    free(scratch->covered);
}

/* Kind by kind, the likeliest first. */
static void describe_members_by_kind(const struct rf_diagnosis *diagnosis, const size_t members[],
                                     size_t n_members, struct scratch *scratch, struct text *out)
{
    size_t kinds = 0, left_out = 0;
    memset(scratch->told, 0, n_members * sizeof *scratch->told);
    for (size_t i = 0; i < n_members; i++) {
        const struct hypothesis *leader = &diagnosis->ranked[members[i]].hypothesis;
        size_t n = 0;
        if (scratch->told[i])
            continue;
        for (size_t j = i; j < n_members; j++)
            if (same_kind(leader, &diagnosis->ranked[members[j]].hypothesis)) {
                scratch->kind_members[n++] = members[j];
                scratch->told[j] = true;
            }
        if (kinds++ < KINDS_NAMED) {
            text_add(out, kinds > 1 ? "; or " : "");
            describe_members(diagnosis, scratch->kind_members, n, scratch->covered, out);
        } else {
            left_out += n;
        }
    }
    if (left_out > 0)
        text_addf(out, "; or %zu other possibilit%s", left_out, left_out == 1 ? "y" : "ies");
}

bool describe_together(const struct rf_diagnosis *diagnosis, const size_t members[], size_t n,
                       struct text *out)
{
    struct scratch scratch = {0};
    bool ok = init_scratch(&scratch, diagnosis);
    if (ok)
        describe_members_by_kind(diagnosis, members, n, &scratch, out);
    finish_scratch(&scratch);
    return ok;
}

/* Kinds only: where such a fault would be means little. */
static void describe_slight(const struct rf_diagnosis *diagnosis, const struct finding *finding,
                            struct scratch *scratch, struct text *out)
{
    size_t kinds = 0;
    memset(scratch->told, 0, finding->n_members * sizeof *scratch->told);
    text_add(out, "a fault too slight to show in these readings:");
    for (size_t i = 0; i < finding->n_members; i++) {
        const struct hypothesis *leader = &diagnosis->ranked[finding->members[i]].hypothesis;
        if (scratch->told[i])
            continue;
        for (size_t j = i; j < finding->n_members; j++)
            if (same_kind(leader, &diagnosis->ranked[finding->members[j]].hypothesis))
                scratch->told[j] = true;
        if (kinds++ < KINDS_NAMED)
            for (size_t k = 0; k < leader->n_faults; k++) {
                text_add(out, k > 0 ? " and " : kinds > 1 ? "; or " : " ");
                describe_kind_of(&leader->faults[k], out);
            }
    }
    if (kinds > KINDS_NAMED)
        text_addf(out, "; or one of %zu other kinds", kinds - KINDS_NAMED);
}

static bool write_words(const struct rf_diagnosis *diagnosis, struct finding *finding, bool slight,
                        struct scratch *scratch)
{
    struct text words = {0};
    if (slight && finding->n_members > 1)
        describe_slight(diagnosis, finding, scratch, &words);
    else
        describe_members_by_kind(diagnosis, finding->members, finding->n_members, scratch, &words);
    finding->words = words.bytes;
    return !words.failed && words.bytes != NULL;
}

/* --- grouping --- */

/* The finding "no defect", or NULL: faults that read like it go together. */
static const struct ranked *find_none(const struct rf_diagnosis *diagnosis)
{
    for (size_t i = 0; i < diagnosis->n_ranked; i++)
        if (is_none(&diagnosis->ranked[i]))
            return &diagnosis->ranked[i];
    return NULL;
}

static bool group_around(struct rf_diagnosis *diagnosis, size_t leader, const bool slight[],
                         bool taken[], struct scratch *scratch)
{
    struct finding *finding = &diagnosis->findings[diagnosis->n_findings++];
    finding->is_none = is_none(&diagnosis->ranked[leader]);
    finding->members = NEW_ARRAY(size_t, diagnosis->n_ranked - leader);
    if (finding->members == NULL)
        return false;
    for (size_t i = leader; i < diagnosis->n_ranked; i++) {
        bool joins = i == leader || (slight[leader] ? slight[i]
                                                    : !slight[i] && alike(diagnosis,
                                                                          &diagnosis->ranked[leader],
                                                                          &diagnosis->ranked[i]));
        if (taken[i] || !joins)
            continue;
        taken[i] = true;
        finding->members[finding->n_members++] = i;
        finding->confidence += diagnosis->ranked[i].confidence;
    }
    return write_words(diagnosis, finding, slight[leader], scratch);
}

static int by_confidence(const void *a, const void *b)
{
    const struct finding *one = a, *other = b;
    if (one->confidence != other->confidence)
        return one->confidence > other->confidence ? -1 : 1;
    return one->members[0] < other->members[0] ? -1 : 1;
}

enum rf_status group_findings(struct rf_diagnosis *diagnosis, struct rf_error *error)
{
    size_t n = diagnosis->n_ranked;
    bool *slight = NEW_ARRAY(bool, n), *taken = NEW_ARRAY(bool, n);
    struct scratch scratch = {0};
    diagnosis->findings = NEW_ARRAY(struct finding, n);
    bool ok = init_scratch(&scratch, diagnosis) && slight != NULL && taken != NULL &&
              diagnosis->findings != NULL;
    const struct ranked *none = find_none(diagnosis);
    for (size_t i = 0; ok && none != NULL && i < n; i++)
        slight[i] = !is_none(&diagnosis->ranked[i]) &&
                    read_the_same(diagnosis, &diagnosis->ranked[i], none);
    for (size_t i = 0; ok && i < n; i++)
        if (!taken[i])
            ok = group_around(diagnosis, i, slight, taken, &scratch);
    if (ok)
        qsort(diagnosis->findings, diagnosis->n_findings, sizeof *diagnosis->findings,
              by_confidence);
    free(slight);
    free(taken);
    finish_scratch(&scratch);
    return ok ? RF_OK : fail_memory(error);
}
