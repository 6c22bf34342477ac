/* SPDX-License-Identifier: GPL-3.0-or-later */

/*
 * From hypotheses to a ranking, places, findings and blind spots: against numbers worked out by
 * hand from the model's definition, and against what must hold of any job. Rings and readings are
 * invented.
 */

#include "diagnosis/steps.h"

#include "../hypotheses.h"

#include <math.h>

static const char two_points[] = "\"points\": [{\"id\": \"P1\", \"run_m\": 8}, {\"id\": \"P2\","
                                 "\"run_m\": 8}], \"last_run_m\": 8";
static const char four_points[] =
    "\"points\": [{\"id\": \"P1\", \"run_m\": 8}, {\"id\": \"P2\", \"run_m\": 8},"
    "{\"id\": \"P3\", \"run_m\": 8}, {\"id\": \"P4\", \"run_m\": 8}], \"last_run_m\": 8";
static const char no_lengths[] =
    "\"cpc_mm2\": null, \"points\": [{\"id\": \"P1\"}, {\"id\": \"P2\", \"run_m\": null}, {\"id\":"
    "\"P3\"}]";

static struct candidates enumerated(const struct rf_job *job)
{
    struct candidates candidates = {0};
    struct rf_error error;
    ck_assert_msg(candidates_enumerate(&candidates, job, models, &error) == RF_OK, "%s",
                  error.text);
    return candidates;
}

static struct rf_diagnosis *diagnosis_of(const struct rf_job *job, bool screen)
{
    struct rf_diagnosis *diagnosis;
    struct rf_error error;
    ck_assert_msg(diagnose(job, models, screen, &diagnosis, &error) == RF_OK, "%s", error.text);
    return diagnosis;
}

static const struct candidate *find(const struct candidates *candidates, const struct rf_job *job,
                                    const char *fields)
{
    struct hypothesis wanted = hypothesis_of(job, fields);
    for (size_t i = 0; i < candidates->n; i++)
        if (hypothesis_equal(&candidates->list[i].hypothesis, &wanted))
            return &candidates->list[i];
    ck_abort_msg("not enumerated: %s", fields);
}

/* --- priors --- */

static double sum_of_priors(const struct candidates *candidates)
{
    double sum = 0;
    for (size_t i = 0; i < candidates->n; i++)
        sum += exp(candidates->list[i].log_prior);
    return sum;
}

struct prior_row {
    const char *fault;
    double prior;
};

static void compare_priors(const char *ring, const char *readings, const struct prior_row rows[],
                           size_t n)
{
    struct rf_job *job = job_of(ring, readings, "");
    struct candidates candidates = enumerated(job);
    ck_assert_double_eq_tol(sum_of_priors(&candidates), 1, 1e-12);
    for (size_t i = 0; i < n; i++) {
        double prior = exp(find(&candidates, job, rows[i].fault)->log_prior);
        ck_assert_msg(fabs(prior - rows[i].prior) < 1e-12, "%s: %g, not %g", rows[i].fault, prior,
                      rows[i].prior);
    }
    candidates_finish(&candidates);
    rf_job_destroy(job);
}

/* Two points, three runs, one crossed set-up: every family has members, so the priors are those of
 * the table, over the members counted by hand. */
START_TEST(priors_by_hand)
{
    static const struct prior_row rows[] = {
        {"", 0.22},
        {"\"family\": \"break\", \"run\": [\"P1\", \"P2\"], \"conductor\": \"LNE\"", 0.13 / (3 * 4)},
        {"\"family\": \"joint\", \"run\": [\"P2\", \"in\"], \"conductor\": \"E\"", 0.13 / (3 * 3)},
        /* chains of two would be all points: only those of one */
        {"\"family\": \"spur\", \"points\": [\"P2\"]", 0.12 / 2},
        {"\"family\": \"contact\", \"at\": \"P1\", \"conductor\": \"N\", \"open\": true",
         0.09 * 0.3 / (2 * 3)},
        {"\"family\": \"contact\", \"at\": \"P1\", \"conductor\": \"N\"", 0.09 * 0.7 / (2 * 3)},
        /* out and P2, P1 and in */
        {"\"family\": \"interconnection\", \"between\": [\"P1\", \"in\"]", 0.06 / 2},
        {"\"family\": \"switched_off\", \"at\": \"P1\", \"poles\": \"LN\"", 0.05 / (2 * 2)},
        {"\"family\": \"reversal\", \"at\": \"P1\", \"pair\": \"ne\"", 0.04 / (2 * 3)},
        {"\"family\": \"short\", \"at\": \"P1\", \"pair\": \"ln\"", 0.03 / (2 * 3)},
        {"\"family\": \"transposed\", \"run\": [\"out\", \"P1\"], \"pair\": \"le\"", 0.02 / (3 * 3)},
        {"\"family\": \"load\", \"at\": \"P2\"", 0.02 / 2},
        {"\"family\": \"parallel\", \"between\": [\"P1\", \"P2\"]", 0.02},
        {"\"family\": \"size\", \"live_mm2\": 4.0, \"cpc_mm2\": 2.5", 0.02 / 5},
        {"\"family\": \"bad_link\", \"setup\": \"cross_ln\", \"end\": \"in\", \"open\": true",
         0.02 * 0.4 / 2},
        {"\"family\": \"bad_link\", \"setup\": \"cross_ln\", \"end\": \"out\"", 0.02 * 0.6 / 2},
        {"\"family\": \"wrong_leg\", \"leg\": \"in\"", 0.01 / 2},
        {"\"family\": \"not_crossed\", \"setup\": \"cross_ln\"", 0.01},
        {"\"family\": \"not_nulled\"", 0.01},
    };
    compare_priors(two_points, "\"cross_ln\": {\"P1\": 0.1}", rows, sizeof rows / sizeof *rows);
}
END_TEST

/* One point, end to end only: spur, interconnection, parallel, not_crossed and bad_link have no
 * member and drop out; 0.77 of the table is left. */
START_TEST(priors_renormalised)
{
    static const struct prior_row rows[] = {
        {"", 0.22 / 0.77},
        {"\"family\": \"joint\", \"run\": [\"P1\", \"in\"], \"conductor\": \"E\"", 0.13 / 6 / 0.77},
        {"\"family\": \"contact\", \"at\": \"P1\", \"conductor\": \"N\"", 0.09 * 0.7 / 3 / 0.77},
        {"\"family\": \"not_nulled\"", 0.01 / 0.77},
    };
    compare_priors("\"points\": [{\"id\": \"P1\", \"run_m\": 8}], \"last_run_m\": 8",
                   "\"end_to_end\": {\"l\": 0.1}", rows, sizeof rows / sizeof *rows);
}
END_TEST

/* Four points: chains of one, two and three are there; .60, .25, .15 over 4, 6 and 4 of them. */
START_TEST(priors_of_chains)
{
    static const struct prior_row rows[] = {
        {"\"family\": \"spur\", \"points\": [\"P2\"]", 0.12 * 0.60 / 4},
        {"\"family\": \"spur\", \"points\": [\"P3\", \"P2\"]", 0.12 * 0.25 / 6},
        {"\"family\": \"spur\", \"points\": [\"P2\", \"P3\", \"P4\"]", 0.12 * 0.15 / 4},
    };
    compare_priors(four_points, "\"cross_ln\": {\"P1\": 0.1}", rows, sizeof rows / sizeof *rows);
}
END_TEST

/* P1 was taken off and P2's face seen to: what each would have shown there has gone. */
START_TEST(looks_leave_the_rest)
{
    static const struct {
        const char *fault;
        double left;
    } rows[] = {
        {"", 1},
        {"\"family\": \"joint\", \"run\": [\"out\", \"P1\"], \"conductor\": \"N\"", 0.55},
        {"\"family\": \"joint\", \"run\": [\"P1\", \"P2\"], \"conductor\": \"N\"", 0.55},
        {"\"family\": \"joint\", \"run\": [\"P2\", \"in\"], \"conductor\": \"N\"", 1},
        {"\"family\": \"break\", \"run\": [\"P1\", \"P2\"], \"conductor\": \"LNE\"", 0.7},
        {"\"family\": \"transposed\", \"run\": [\"out\", \"P1\"], \"pair\": \"le\"", 0.5},
        {"\"family\": \"contact\", \"at\": \"P1\", \"conductor\": \"N\"", 0},
        {"\"family\": \"contact\", \"at\": \"P2\", \"conductor\": \"N\"", 1},
        {"\"family\": \"short\", \"at\": \"P1\", \"pair\": \"ln\"", 0.6},
        {"\"family\": \"switched_off\", \"at\": \"P1\", \"poles\": \"L\"", 1},
        {"\"family\": \"switched_off\", \"at\": \"P2\", \"poles\": \"L\"", 0},
        {"\"family\": \"load\", \"at\": \"P2\"", 0},
        {"\"family\": \"interconnection\", \"between\": [\"P1\", \"in\"]", 0},
        {"\"family\": \"interconnection\", \"between\": [\"out\", \"P2\"]", 1},
        {"\"family\": \"parallel\", \"between\": [\"P1\", \"P2\"]", 0},
        {"\"family\": \"spur\", \"points\": [\"P1\"]", 0},
        {"\"family\": \"size\", \"live_mm2\": 4.0, \"cpc_mm2\": 2.5", 0},
        {"\"family\": \"wrong_leg\", \"leg\": \"in\"", 1},
    };
    struct rf_job *job = job_of(two_points, "\"cross_ln\": {\"P1\": 0.1}",
                                ", \"opened\": [\"P1\"], \"checked\": [\"P2\"]");
    struct candidates candidates = enumerated(job);
    for (size_t i = 0; i < sizeof rows / sizeof *rows; i++) {
        double left = exp(find(&candidates, job, rows[i].fault)->log_looks);
        ck_assert_msg(fabs(left - rows[i].left) < 1e-12, "%s: %g, not %g", rows[i].fault, left,
                      rows[i].left);
    }
    candidates_finish(&candidates);
    rf_job_destroy(job);
    job = job_of(two_points, "\"cross_ln\": {\"P1\": 0.1}", ", \"opened\": [\"board\"]");
    candidates = enumerated(job);
    ck_assert_double_eq(
        exp(find(&candidates, job, "\"family\": \"wrong_leg\", \"leg\": \"in\"")->log_looks), 0);
    ck_assert_double_eq_tol(
        exp(find(&candidates, job, "\"family\": \"joint\", \"run\": [\"P2\", \"in\"],"
                                   "\"conductor\": \"N\"")
                ->log_looks),
        0.55, 1e-12);
    candidates_finish(&candidates);
    rf_job_destroy(job);
}
END_TEST

/* --- ranking --- */

/* Jobs of every kind of poverty; none may be refused, and what must hold holds of all. */
static const struct {
    const char *ring, *readings, *more;
} jobs[] = {
    {four_points, "\"end_to_end\": {\"l\": 0.30, \"n\": 0.31, \"e\": 0.47}", ""},
    {four_points, "\"end_to_end\": {\"l\": 0.30, \"n\": 0.80, \"e\": 0.47}", ""},
    {four_points, "\"end_to_end\": {\"l\": 0.30, \"n\": 0.31, \"e\": 0.47}, \"cross_le\":"
                  "{\"highest\": 0.19}",
     ""},
    {four_points, "\"end_to_end\": {\"l\": 0.30, \"n\": 0.31, \"e\": 0.47}, \"cross_le\":"
                  "{\"highest\": 0.45}",
     ""},
    {four_points, "\"end_to_end\": {\"e\": 0.47}", ""},
    {four_points, "\"cross_ln\": {\"P2\": 0.15}", ""},
    {four_points, "\"cross_ln\": {\"P2\": \"open\"}", ""},
    {four_points, "\"lead_out_e\": {\"P3\": 0.25}", ""},
    {no_lengths, "\"end_to_end\": {\"l\": 0.30, \"n\": 0.31, \"e\": 0.47}", ""},
    {no_lengths, "\"end_to_end\": {\"l\": 0.30, \"n\": 0.31, \"e\": \"open\"}, \"cross_ln\": {\"P1\":"
                 "0.15, \"P2\": 0.16, \"P3\": 0.15}",
     ""},
    {four_points, "\"end_to_end\": {\"l\": \"open\", \"n\": \"open\", \"e\": \"open\"}, \"cross_ln\":"
                  "{\"P1\": \"open\", \"P2\": \"open\", \"P3\": \"open\", \"P4\": \"open\"}",
     ""},
    {four_points, "\"cross_ln\": {\"board\": 0.15, \"P1\": [0.15, 0.16], \"P2\": 0.42, \"P3\": 0.15}",
     ""},
    {four_points, "\"cross_ln\": {\"board\": 0.15, \"P1\": [0.15, 0.16], \"P2\": 0.42, \"P3\": 0.15}",
     ", \"opened\": [\"P2\"], \"checked\": [\"P1\", \"P4\"]"},
    {"\"points\": [{\"id\": \"P1\"}]", "\"end_to_end\": {\"l\": 0.30}", ""},
};
enum { N_JOBS = sizeof jobs / sizeof *jobs };

static struct rf_job *job_at(int i)
{
    return job_of(jobs[i].ring, jobs[i].readings, jobs[i].more);
}

static struct candidates ranked_in_full(const struct rf_job *job, bool screen)
{
    struct candidates candidates = enumerated(job);
    struct bench bench;
    struct rf_error error;
    bench_init(&bench, job);
    ck_assert_msg(candidates_rank(&candidates, bench.fitter, &bench.ring, screen, &error) == RF_OK,
                  "%s", error.text);
    bench_finish(&bench);
    return candidates;
}

static size_t place_in_enumeration(const struct candidates *enumeration,
                                   const struct hypothesis *hypothesis)
{
    for (size_t i = 0; i < enumeration->n; i++)
        if (hypothesis_equal(&enumeration->list[i].hypothesis, hypothesis))
            return i;
    ck_abort_msg("ranked but not enumerated");
}

/* Confidences sum to 1 and go as prior × looks × evidence, best first, ties as enumerated. */
START_TEST(confidences)
{
    struct rf_job *job = job_at(_i);
    struct candidates enumeration = enumerated(job), candidates = ranked_in_full(job, false);
    double sum = 0, total = 0;
    ck_assert_uint_eq(candidates.n, enumeration.n);
    for (size_t i = 0; i < candidates.n; i++) {
        const struct candidate *c = &candidates.list[i];
        sum += c->confidence;
        total += exp(c->log_prior + c->log_looks + c->log_evidence);
    }
    ck_assert_double_eq_tol(sum, 1, 1e-12);
    for (size_t i = 0; i < candidates.n; i++) {
        const struct candidate *c = &candidates.list[i], *before = &candidates.list[i > 0 ? i - 1 : 0];
        ck_assert_double_eq_tol(c->confidence,
                                exp(c->log_prior + c->log_looks + c->log_evidence) / total, 1e-9);
        ck_assert_double_le(c->confidence, before->confidence * (1 + 2e-6));
        if (i > 0 && before->confidence - c->confidence <= 1e-9 * before->confidence)
            ck_assert_uint_lt(place_in_enumeration(&enumeration, &before->hypothesis),
                              place_in_enumeration(&enumeration, &c->hypothesis));
    }
    candidates_finish(&candidates);
    candidates_finish(&enumeration);
    rf_job_destroy(job);
}
END_TEST

/* A broken neutral, read end to end only, is a tie of all runs and says so in ring order. */
START_TEST(ties_in_ring_order)
{
    struct rf_job *job =
        job_of(four_points, "\"end_to_end\": {\"l\": 0.30, \"n\": \"open\", \"e\": 0.48}", "");
    struct rf_diagnosis *diagnosis = diagnosis_of(job, true);
    ck_assert_uint_ge(diagnosis->n_ranked, 5);
    for (size_t i = 0; i < 5; i++) {
        const struct fault *fault = &diagnosis->ranked[i].hypothesis.faults[0];
        ck_assert_ptr_eq(fault->family, &fault_family_break);
        ck_assert_int_eq(fault->conductor, NEUTRAL);
        ck_assert_uint_eq(fault->run, i);
        ck_assert_double_eq_tol(diagnosis->ranked[i].confidence, diagnosis->ranked[0].confidence,
                                1e-6);
    }
    rf_diagnosis_destroy(diagnosis);
    rf_job_destroy(job);
}
END_TEST

START_TEST(screening_changes_nothing)
{
    struct rf_job *job = job_at(_i);
    struct candidates full = ranked_in_full(job, false), screened = ranked_in_full(job, true);
    double sum = 0;
    for (size_t i = 0; i < screened.n; i++) {
        size_t k = place_in_enumeration(&full, &screened.list[i].hypothesis);
        sum += screened.list[i].confidence;
        ck_assert_double_eq_tol(screened.list[i].confidence, full.list[k].confidence, 0.01);
    }
    ck_assert_double_eq_tol(sum, 1, 1e-12);
    candidates_finish(&full);
    candidates_finish(&screened);
    rf_job_destroy(job);
}
END_TEST

/* --- findings --- */

/* Each of the ranked is in one finding, whose confidence is its members'. */
START_TEST(findings_partition_the_ranked)
{
    struct rf_job *job = job_at(_i);
    struct rf_diagnosis *diagnosis = diagnosis_of(job, true);
    size_t members = 0, *times = calloc(diagnosis->n_ranked, sizeof *times);
    ck_assert_ptr_nonnull(times);
    for (size_t f = 0; f < diagnosis->n_findings; f++) {
        const struct finding *finding = &diagnosis->findings[f];
        double sum = 0;
        ck_assert_uint_gt(finding->n_members, 0);
        ck_assert_uint_gt(strlen(finding->words), 0);
        for (size_t i = 0; i < finding->n_members; i++) {
            const struct ranked *member = &diagnosis->ranked[finding->members[i]];
            times[finding->members[i]]++;
            sum += member->confidence;
            ck_assert(finding->is_none == (member->hypothesis.n_faults == 0));
        }
        members += finding->n_members;
        ck_assert_double_eq_tol(finding->confidence, sum, 1e-9);
        if (f > 0)
            ck_assert_double_le(finding->confidence, diagnosis->findings[f - 1].confidence);
    }
    ck_assert_uint_eq(members, diagnosis->n_ranked);
    for (size_t i = 0; i < diagnosis->n_ranked; i++)
        ck_assert_uint_eq(times[i], 1);
    free(times);
    rf_diagnosis_destroy(diagnosis);
    rf_job_destroy(job);
}
END_TEST

/* --- places --- */

/* Chance of seeing it when looking: by hand for two points, from the table of where defects show.
 * The place is 1 or 2 for a point, 0 for the board. */
static double shows_when_opened(const struct fault *f, size_t place)
{
    const char *family = f->family->name;
    bool at_run = f->run == place || f->run + 1 == place || (place == 0 && f->run == 2);
    bool between = f->place == place || f->other == place || (place == 0 && f->other == 3);
    if (strcmp(family, "break") == 0 && f->conductor == WHOLE_CABLE)
        return at_run ? 0.3 : 0;
    if (strcmp(family, "break") == 0 || strcmp(family, "joint") == 0)
        return at_run ? 0.45 : 0;
    if (strcmp(family, "transposed") == 0)
        return at_run ? 0.5 : 0;
    if (strcmp(family, "contact") == 0 || strcmp(family, "reversal") == 0)
        return f->place == place;
    if (strcmp(family, "spur") == 0)
        return f->chain[0] == place;
    if (strcmp(family, "interconnection") == 0 || strcmp(family, "parallel") == 0)
        return between;
    if (strcmp(family, "short") == 0)
        return f->place == place ? 0.4 : 0;
    if (strcmp(family, "size") == 0)
        return place > 0;
    if (strcmp(family, "switched_off") == 0 || strcmp(family, "load") == 0)
        return 0;
    return place == 0; /* legs, links, nulling */
}

static double shows_in_run(const struct fault *f, size_t run)
{
    const char *family = f->family->name;
    if (strcmp(family, "break") == 0 && f->conductor == WHOLE_CABLE)
        return f->run == run ? 0.4 : 0;
    if (strcmp(family, "break") == 0 || strcmp(family, "joint") == 0)
        return f->run == run ? 0.1 : 0;
    if (strcmp(family, "short") == 0)
        return f->place == run || f->place == run + 1 ? 0.3 : 0;
    return 0;
}

static double shows_on_the_face(const struct fault *f, size_t place)
{
    const char *family = f->family->name;
    return (strcmp(family, "switched_off") == 0 || strcmp(family, "load") == 0) &&
           f->place == place;
}

static double chance_told(const struct rf_diagnosis *diagnosis, enum look_kind kind, int where,
                          size_t index)
{
    for (size_t i = 0; i < diagnosis->n_places; i++) {
        const struct place_chance *p = &diagnosis->places[i];
        if (p->look.kind == kind && (int)p->look.where == where && p->look.index == index)
            return p->chance;
    }
    return 0;
}

static const char *const readings_of_two[] = {
    "\"end_to_end\": {\"l\": 0.17, \"n\": 0.18, \"e\": 0.30}, \"cross_ln\": {\"P1\": 0.15, \"P2\": 0.09}",
    "\"end_to_end\": {\"l\": 0.17, \"n\": 0.60, \"e\": 0.30}, \"cross_ln\": {\"P1\": 0.20}",
    "\"cross_ln\": {\"P1\": \"open\", \"P2\": 0.09}",
};

START_TEST(places_add_up)
{
    struct rf_job *job = job_of(two_points, readings_of_two[_i], "");
    struct rf_diagnosis *diagnosis = diagnosis_of(job, false);
    struct candidates all = ranked_in_full(job, false);
    double opened[3] = {0}, runs[3] = {0}, faces[3] = {0};
    for (size_t i = 0; i < all.n; i++)
        for (size_t k = 0; k < 3 && all.list[i].hypothesis.n_faults > 0; k++) {
            const struct fault *fault = &all.list[i].hypothesis.faults[0];
            opened[k] += all.list[i].confidence * shows_when_opened(fault, k);
            runs[k] += all.list[i].confidence * shows_in_run(fault, k);
            faces[k] += all.list[i].confidence * shows_on_the_face(fault, k);
        }
    for (size_t k = 0; k < 3; k++) {
        /* What is below a thousandth is not listed. */
        double told = chance_told(diagnosis, LOOK_OPEN, k > 0 ? LOOK_AT_PLACE : LOOK_AT_BOARD, k);
        ck_assert_double_eq_tol(told, opened[k] < 0.001 ? 0 : opened[k], 1e-9);
        told = chance_told(diagnosis, LOOK_OPEN, LOOK_IN_RUN, k);
        ck_assert_double_eq_tol(told, runs[k] < 0.001 ? 0 : runs[k], 1e-9);
        told = chance_told(diagnosis, LOOK_CHECK, LOOK_AT_PLACE, k);
        ck_assert_double_eq_tol(told, faces[k] < 0.001 ? 0 : faces[k], 1e-9);
    }
    candidates_finish(&all);
    rf_diagnosis_destroy(diagnosis);
    rf_job_destroy(job);
}
END_TEST

/* P1 was taken off without a find: nothing is to be seen there any more, and of what it left of each
 * defect the other places show their part: a joint in a run at P1 shows at the run's other end with
 * .45/.55. */
START_TEST(places_looked_at_show_nothing_more)
{
    static const char readings[] = "\"end_to_end\": {\"n\": \"open\"}, \"apart_ln\": {\"out\": \"open\"}";
    struct rf_job *job = job_of(two_points, readings, ", \"opened\": [\"P1\"]");
    struct rf_diagnosis *diagnosis = diagnosis_of(job, true);
    double broken = 0;
    for (size_t i = 0; i < diagnosis->n_ranked; i++) {
        const struct fault *fault = &diagnosis->ranked[i].hypothesis.faults[0];
        if (fault->family == &fault_family_break && fault->conductor == NEUTRAL)
            broken += diagnosis->ranked[i].confidence;
    }
    ck_assert_double_gt(broken, 0.3);
    ck_assert_double_eq(chance_told(diagnosis, LOOK_OPEN, LOOK_AT_PLACE, 1), 0);
    double all = 0;
    struct candidates candidates = ranked_in_full(job, true);
    for (size_t i = 0; i < candidates.n; i++) {
        const struct fault *fault = &candidates.list[i].hypothesis.faults[0];
        double left = exp(candidates.list[i].log_looks);
        if (candidates.list[i].hypothesis.n_faults > 0 && left > 0)
            all += candidates.list[i].confidence * shows_when_opened(fault, 2) /
                   (fault->family->each_enough ? 1 : left);
    }
    ck_assert_double_eq_tol(chance_told(diagnosis, LOOK_OPEN, LOOK_AT_PLACE, 2), all, 1e-9);
    candidates_finish(&candidates);
    rf_diagnosis_destroy(diagnosis);
    rf_job_destroy(job);
}
END_TEST

/* --- misfit --- */

START_TEST(misfit)
{
    static const struct {
        const char *readings;
        bool flag;
        size_t suspects;
    } rows[] = {
        {"\"end_to_end\": {\"l\": 0.30, \"n\": 0.31, \"e\": 0.47}, \"cross_ln\": {\"board\": 0.15,"
         "\"P1\": 0.15, \"P2\": 0.16, \"P3\": 0.15, \"P4\": 0.15}",
         false, 0},
        /* Three readings of one test at odds with the ends, each in its own way. */
        {"\"end_to_end\": {\"l\": 0.30, \"n\": 0.31, \"e\": 0.47}, \"cross_ln\": {\"board\": 0.15,"
         "\"P1\": 1.70, \"P2\": 0.16, \"P3\": 5.20, \"P4\": 0.80}",
         true, 2},
    };
    struct rf_job *job = job_of(four_points, rows[_i].readings, "");
    struct rf_diagnosis *diagnosis = diagnosis_of(job, true);
    bool flag;
    double p = rf_diagnosis_misfit(diagnosis, &flag);
    ck_assert(flag == rows[_i].flag);
    ck_assert(flag == (p < 0.05));
    ck_assert_uint_eq(diagnosis->n_suspects, rows[_i].suspects);
    ck_assert_uint_eq(diagnosis->misfit.written_off, rows[_i].suspects);
    rf_diagnosis_destroy(diagnosis);
    rf_job_destroy(job);
}
END_TEST

/* --- blind spots --- */

static bool is_blind(const struct rf_diagnosis *diagnosis, const char *family, enum pair pair)
{
    for (size_t i = 0; i < diagnosis->n_blind; i++) {
        const struct fault *example = &diagnosis->blind[i].example;
        ck_assert_double_ge(diagnosis->blind[i].share, 0.5);
        ck_assert_double_le(diagnosis->blind[i].share, 1);
        if (strcmp(example->family->name, family) == 0 && example->pair == pair)
            return true;
    }
    return false;
}

/* A short between neutral and CPC carries no current in a test of other conductors, nor one alone
 * end to end; crossed line-neutral shows line to neutral, and so on. */
START_TEST(blind_spots_by_hand)
{
    static const struct {
        const char *readings;
        bool ln, le, ne;
    } rows[] = {
        {"\"end_to_end\": {\"l\": 0.30, \"n\": 0.30, \"e\": 0.48}", true, true, true},
        {"\"cross_ln\": {\"board\": 0.15, \"P1\": 0.15, \"P2\": 0.15, \"P3\": 0.15, \"P4\": 0.15}, "
         "\"end_to_end\": {\"l\": 0.30, \"n\": 0.30, \"e\": 0.48}",
         false, true, true},
        {"\"cross_ln\": {\"board\": 0.15, \"P1\": 0.15, \"P2\": 0.15, \"P3\": 0.15, \"P4\": 0.15}, "
         "\"cross_le\": {\"board\": 0.19, \"P1\": 0.19, \"P2\": 0.19, \"P3\": 0.19, \"P4\": 0.19}",
         false, false, true},
        {"\"apart_ln\": {\"out\": \"open\"}, \"apart_le\": {\"out\": \"open\"}, \"apart_ne\": "
         "{\"in\": \"open\"}",
         false, false, false},
    };
    struct rf_job *job = job_of(four_points, rows[_i].readings, "");
    struct rf_diagnosis *diagnosis = diagnosis_of(job, true);
    ck_assert(is_blind(diagnosis, "short", PAIR_LN) == rows[_i].ln);
    ck_assert(is_blind(diagnosis, "short", PAIR_LE) == rows[_i].le);
    ck_assert(is_blind(diagnosis, "short", PAIR_NE) == rows[_i].ne);
    rf_diagnosis_destroy(diagnosis);
    rf_job_destroy(job);
}
END_TEST

/* A found fault is met where it ranks. */
START_TEST(found_is_compared)
{
    struct rf_job *job = job_of(four_points,
                                "\"cross_ln\": {\"board\": 0.15, \"P1\": 0.15, \"P2\": 0.66, \"P3\": 0.15}",
                                ", \"found\": {\"family\": \"contact\", \"at\": \"P2\", \"conductor\":"
                                "\"N\"}");
    struct rf_diagnosis *diagnosis = diagnosis_of(job, true);
    ck_assert(diagnosis->found_known);
    ck_assert_uint_lt(diagnosis->found_rank, 3);
    const struct ranked *found = &diagnosis->ranked[diagnosis->found_rank];
    ck_assert(hypothesis_equal(&found->hypothesis, &diagnosis->found));
    ck_assert_double_eq(found->confidence, diagnosis->found_confidence);
    /* The contact's ohms are what the reading is above its neighbours. */
    ck_assert(found->estimates[0].known && !found->estimates[0].metres);
    ck_assert_double_eq_tol(found->estimates[0].value, 0.51, 0.03);
    ck_assert_double_lt(found->estimates[0].low, 0.51);
    ck_assert_double_gt(found->estimates[0].high, 0.51);
    rf_diagnosis_destroy(diagnosis);
    rf_job_destroy(job);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("diagnosis");
    TCase *tests = tcase_create("diagnosis");
    suite_add_tcase(suite, tests);
    tcase_add_checked_fixture(tests, load_models, unload_models);
    tcase_set_timeout(tests, 60);
    tcase_add_test(tests, priors_by_hand);
    tcase_add_test(tests, priors_renormalised);
    tcase_add_test(tests, priors_of_chains);
    tcase_add_test(tests, looks_leave_the_rest);
    tcase_add_loop_test(tests, confidences, 0, N_JOBS);
    tcase_add_test(tests, ties_in_ring_order);
    tcase_add_loop_test(tests, screening_changes_nothing, 0, N_JOBS);
    tcase_add_loop_test(tests, findings_partition_the_ranked, 0, N_JOBS);
    tcase_add_loop_test(tests, places_add_up, 0,
                        (int)(sizeof readings_of_two / sizeof *readings_of_two));
    tcase_add_test(tests, places_looked_at_show_nothing_more);
    tcase_add_loop_test(tests, misfit, 0, 2);
    tcase_add_loop_test(tests, blind_spots_by_hand, 0, 4);
    tcase_add_test(tests, found_is_compared);
    return run_suite(suite);
}
