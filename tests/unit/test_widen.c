/* SPDX-License-Identifier: GPL-3.0-or-later */

/*
 * What is made of readings that no one defect explains: bad faces named as such, two defects not
 * mistaken for them, and jobs that fit the model left as they are. Jobs are simulated, all invented.
 */

#include "diagnosis/steps.h"

#include "../hypotheses.h"

#include <math.h>

struct simulated {
    struct rf_job *ring;
    struct truth *truth;
    struct rf_diagnosis *diagnosis;
};

static struct simulated simulated(uint32_t seed, size_t defects, struct departures departures)
{
    struct simulated s;
    struct rf_error error;
    const struct simulation simulation = {
        .seed = seed, .defects = defects, .departures = departures};
    ck_assert_int_eq(simulation_random_ring(seed, PLAN_STANDARD, &s.ring, &error), RF_OK);
    ck_assert_int_eq(simulate(s.ring, models, &simulation, &s.truth, &error), RF_OK);
    ck_assert_int_eq(rf_diagnose(s.truth->job, models, &s.diagnosis, &error), RF_OK);
    return s;
}

static void finish(struct simulated *s)
{
    rf_diagnosis_destroy(s->diagnosis);
    truth_destroy(s->truth);
    rf_job_destroy(s->ring);
}

/* --- noise --- */

START_TEST(noise_at_faces)
{
    const size_t crossed = setup_find("cross_ln"), lead = setup_find("lead_in_e");
    struct rf_models wide = *models;
    double narrow = instrument_sigma(&models->instrument, 0.4);
    wide.wider.face_ohms = 0.03;
    ck_assert_double_eq(reading_sigma(models, crossed, SPOT_POINT, 1, 0.4), narrow);
    ck_assert_double_eq(reading_sigma(&wide, crossed, SPOT_BOARD, 1, 0.4), narrow);
    /* The variances of what it goes through add up: two faces, or one. */
    ck_assert_double_eq_tol(reading_sigma(&wide, crossed, SPOT_POINT, 1, 0.4),
                            sqrt(narrow * narrow + 2 * 0.03 * 0.03), 1e-12);
    ck_assert_double_eq_tol(reading_sigma(&wide, lead, SPOT_POINT, 1, 0.4),
                            sqrt(narrow * narrow + 0.03 * 0.03), 1e-12);
    /* Four readings together know the place no better than its face lets them. */
    const struct reading reading = {.setup = crossed, .spot = SPOT_POINT, .ohms = 0.4};
    double of_mean = pow(observe(&reading, 0, 4, &wide).sigma, 2) / 4;
    ck_assert_double_eq_tol(of_mean, narrow * narrow / 4 + 2 * 0.03 * 0.03, 1e-12);
}
END_TEST

/* --- what fits stays as it is --- */

/* The same as ranking alone makes of it, to the last bit; screened or not, as a diagnosis does. */
static void expect_untouched(const struct simulated *s)
{
    const struct rf_diagnosis *d = s->diagnosis;
    struct candidates candidates = {0};
    struct rf_error error;
    struct bench bench;
    bool screen = d->misfit.p >= 0.2;
    bench_init(&bench, d->job);
    ck_assert_int_eq(candidates_enumerate(&candidates, d->job, models, &error), RF_OK);
    ck_assert_int_eq(candidates_rank(&candidates, bench.fitter, &bench.ring, screen, &error),
                     RF_OK);
    ck_assert_uint_eq(candidates.n, d->n_hypotheses);
    for (size_t i = 0; i < d->n_ranked; i++) {
        ck_assert(hypothesis_equal(&candidates.list[i].hypothesis, &d->ranked[i].hypothesis));
        ck_assert(memcmp(&candidates.list[i].confidence, &d->ranked[i].confidence,
                         sizeof d->ranked[i].confidence) == 0);
    }
    candidates_finish(&candidates);
    bench_finish(&bench);
}

START_TEST(what_fits_is_left_alone)
{
    enum { JOBS = 40 };
    size_t untouched = 0;
    for (uint32_t seed = 1; seed <= JOBS; seed++) {
        struct simulated s = simulated(seed, 0, (struct departures){0});
        ck_assert(s.diagnosis->misfit.flag || !s.diagnosis->wider.assumed);
        if (!s.diagnosis->wider.assumed) {
            ck_assert_ptr_eq(s.diagnosis->models, models);
            expect_untouched(&s);
            untouched++;
        }
        finish(&s);
    }
    ck_assert_uint_ge(untouched, JOBS - 1); /* tests/bench: fewer than 1 in 200 */
}
END_TEST

/* --- bad faces --- */

START_TEST(bad_faces_are_named)
{
    enum { JOBS = 30 };
    size_t named = 0, of_them_right = 0, two = 0, right_before = 0;
    double ohms = 0, confidence = 0, before = 0;
    for (uint32_t seed = 1; seed <= JOBS; seed++) {
        struct simulated s = simulated(seed, 0, (struct departures){.contact_ohms = 0.02});
        const struct rf_diagnosis *d = s.diagnosis;
        two += d->wider.two_defects;
        if (d->wider.assumed && d->wider.face_ohms > 0) {
            ck_assert(d->misfit.flag && d->misfit.p < 0.05 && d->wider.p >= 0.05);
            ck_assert(d->wider.log_odds > 0);
            named++;
            ohms += d->wider.face_ohms;
            of_them_right += d->found_rank == 0;
            right_before += hypothesis_equal(&d->wider.otherwise_first, &d->found);
            confidence += d->ranked[0].confidence;
            before += d->wider.otherwise_confidence;
        }
        finish(&s);
    }
    /* Three of four, by tests/bench; and how bad they are. */
    ck_assert_uint_ge(named, JOBS / 2);
    ck_assert_uint_le(two, 2);
    ck_assert_double_eq_tol(ohms / (double)named, 0.02, 0.008);
    /* Right oftener, and not much surer than that. */
    ck_assert_uint_ge(of_them_right, right_before);
    ck_assert_double_lt(confidence - (double)of_them_right, 0.2 * (double)named);
    ck_assert_double_lt(confidence - (double)of_them_right, before - (double)right_before);
}
END_TEST

/* --- two defects --- */

START_TEST(two_defects_are_no_bad_faces)
{
    enum { JOBS = 40 };
    size_t flagged = 0, faces = 0, two = 0, both_first = 0;
    for (uint32_t seed = 1; seed <= JOBS; seed++) {
        struct simulated s = simulated(seed, 2, (struct departures){0});
        const struct rf_diagnosis *d = s.diagnosis;
        flagged += d->misfit.flag;
        faces += d->wider.assumed && d->wider.face_ohms > 0;
        two += d->wider.two_defects;
        both_first += d->wider.two_defects && d->found_rank == 0;
        finish(&s);
    }
    ck_assert_uint_ge(flagged, JOBS / 5);
    ck_assert_uint_le(faces, flagged / 5);
    ck_assert_uint_ge(two, flagged / 2);
    ck_assert_uint_ge(3 * both_first, two);
}
END_TEST

/* Every pair once, none of a fault with itself; single faults stay; it sums to one; and what stands
 * first is as good as the best that goes with either of its faults. */
START_TEST(pairs)
{
    struct simulated s = simulated(100006, 2, (struct departures){0});
    struct candidates singles = {0}, all = {0};
    struct rf_error error;
    struct bench bench;
    double evidence, sum = 0;
    size_t n_pairs = 0;
    bench_init(&bench, s.truth->job);
    ck_assert_int_eq(candidates_enumerate(&singles, s.truth->job, models, &error), RF_OK);
    ck_assert_int_eq(candidates_rank(&singles, bench.fitter, &bench.ring, false, &error), RF_OK);
    ck_assert_int_eq(candidates_add_pairs(&all, &singles, bench.fitter, &bench.ring, -INFINITY,
                                          &evidence, &error),
                     RF_OK);
    for (size_t i = 0; i < all.n; i++) {
        const struct hypothesis *h = &all.list[i].hypothesis;
        sum += all.list[i].confidence;
        if (h->n_faults < 2)
            continue;
        n_pairs++;
        ck_assert(!fault_equal(&h->faults[0], &h->faults[1]));
        for (size_t k = i + 1; k < all.n; k++)
            ck_assert(!hypothesis_equal(h, &all.list[k].hypothesis));
    }
    ck_assert_double_eq_tol(sum, 1, 1e-9);
    ck_assert_uint_eq(all.n - n_pairs, singles.n);
    ck_assert_uint_ge(n_pairs, singles.n - 2);
    ck_assert_uint_eq(all.list[0].hypothesis.n_faults, 2);
    ck_assert_double_gt(evidence, log_evidence_of_all(&singles));
    candidates_finish(&all);
    candidates_finish(&singles);
    bench_finish(&bench);
    finish(&s);
}
END_TEST

/* Chances of places stay chances where two defects may show at one. */
START_TEST(places_of_two)
{
    size_t two = 0;
    for (uint32_t seed = 100000; seed < 100030; seed++) {
        struct simulated s = simulated(seed, 2, (struct departures){0});
        two += s.diagnosis->wider.two_defects;
        for (size_t i = 0; i < s.diagnosis->n_places; i++)
            ck_assert_double_le(s.diagnosis->places[i].chance, 1 + 1e-9);
        finish(&s);
    }
    ck_assert_uint_gt(two, 0);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("widen");
    TCase *tests = tcase_create("widen");
    suite_add_tcase(suite, tests);
    tcase_add_checked_fixture(tests, load_models, unload_models);
    tcase_set_timeout(tests, 120);
    tcase_add_test(tests, noise_at_faces);
    tcase_add_test(tests, what_fits_is_left_alone);
    tcase_add_test(tests, bad_faces_are_named);
    tcase_add_test(tests, two_defects_are_no_bad_faces);
    tcase_add_test(tests, pairs);
    tcase_add_test(tests, places_of_two);
    return run_suite(suite);
}
