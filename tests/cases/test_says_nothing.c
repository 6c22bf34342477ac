/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * Where the readings say nothing of the place, no place is named with confidence: what a diagnosis
 * may say then is what the priors gave, and what the reading tells of the kind. Rings are invented,
 * readings simulated from the model or what it expects.
 */
#include "diagnosis/diagnosis.h"
#include "fit/expected.h"

#include <ringfettle/review.h>

#include "../suite.h"
#include "extreme_jobs.h"

#include <cjson/cJSON.h>
#include <math.h>

static const struct extreme_ring six = {.points = 6, .run_m = 5};

static struct rf_diagnosis *diagnosis_of(const struct rf_job *job)
{
    struct rf_diagnosis *d;
    struct rf_error error;
    ck_assert_msg(rf_diagnose(job, models, &d, &error) == RF_OK, "%s", error.text);
    return d;
}

/* --- one reading, as the sound ring gives it --- */

/* The factor a reading that fits may put between posterior and prior: what it rules out falls to the
 * rest, and that is less than half. */
static const double little = 2.0;

/* What the meter shows of a sound ring. */
static void sound_value(const struct rf_job *ring, const struct measurement *m, char value[16])
{
    struct expected expected;
    struct rf_error error;
    ck_assert_msg(expect_readings(ring, models, false, m, 1, &expected, NULL, &error) == RF_OK,
                  "%s", error.text);
    if (expected.open)
        strcpy(value, "\"open\"");
    else
        snprintf(value, 16, "%.2f", expected.ohms);
}

static void check_little_is_said(const struct rf_job *ring, const struct measurement *m)
{
    char value[16];
    sound_value(ring, m, value);
    struct rf_job *job = job_of_one_reading(&six, m, value);
    struct rf_diagnosis *d = diagnosis_of(job);
    ck_assert(!d->misfit.flag);
    for (size_t i = 0; i < d->n_ranked; i++) {
        double factor = d->ranked[i].confidence / exp(d->ranked[i].log_prior);
        ck_assert_msg(factor < little, "%s %s: %s: %.4f, a priori %.4f", setups[m->setup].name,
                      value, d->ranked[i].words, d->ranked[i].confidence,
                      exp(d->ranked[i].log_prior));
    }
    rf_diagnosis_destroy(d);
    rf_job_destroy(job);
}

START_TEST(one_reading_that_fits_names_no_place)
{
    struct rf_job *ring = extreme_job(&six, "end_to_end", value_zero);
    for (size_t setup = 0; setup < N_SETUPS; setup++) {
        for (size_t spot = SPOT_BOARD; spot < N_SPOTS; spot++)
            if ((setups[setup].spots >> spot & 1u) != 0)
                check_little_is_said(ring, &(struct measurement){setup, (enum spot)spot, 0});
        for (size_t place = 1; place <= 6 && (setups[setup].spots >> SPOT_POINT & 1u) != 0;
             place += 2)
            check_little_is_said(ring, &(struct measurement){setup, SPOT_POINT, place});
    }
    rf_job_destroy(ring);
}
END_TEST

/* --- readings that cannot place --- */

/* Of the confidence in faults of that kind, the most that goes to one of its members. */
static double most_of_kind(const struct rf_diagnosis *d, const struct fault *fault, size_t *n)
{
    double sum = 0, most = 0;
    *n = 0;
    for (size_t i = 0; i < d->n_ranked; i++) {
        const struct hypothesis *h = &d->ranked[i].hypothesis;
        if (h->n_faults != 1 || !fault_same_kind(&h->faults[0], fault))
            continue;
        sum += d->ranked[i].confidence;
        most = fmax(most, d->ranked[i].confidence);
        ++*n;
    }
    return sum > 0 ? most / sum : NAN;
}

/* Readings taken at the board, or crossed between equal conductors, are the same wherever in the
 * ring a conductor is poor or missing. */
START_TEST(readings_that_cannot_place_place_nothing)
{
    static const struct {
        const char *set_ups, *fault;
        double ohms;
    } rows[] = {
        {"end_to_end", "\"family\": \"joint\", \"conductor\": \"N\"", 1},
        {"end_to_end", "\"family\": \"break\", \"conductor\": \"LNE\"", 0},
        {"end_to_end", "\"family\": \"break\", \"conductor\": \"E\"", 0},
        {"end_to_end cross_ln", "\"family\": \"joint\", \"conductor\": \"N\"", 1},
        {"end_to_end cross_ln", "\"family\": \"joint\", \"conductor\": \"L\"", 0.3},
        {"cross_ln", "\"family\": \"joint\", \"conductor\": \"L\"", 1},
    };
    for (size_t i = 0; i < sizeof rows / sizeof *rows; i++) {
        struct rf_job *ring = extreme_job(&six, rows[i].set_ups, value_zero);
        struct rf_error error;
        char text[128];
        struct simulation how = {.seed = (uint32_t)i, .given = true, .value = {rows[i].ohms}};
        snprintf(text, sizeof text, "{%s, \"run\": [\"P2\", \"P3\"]}", rows[i].fault);
        cJSON *object = cJSON_Parse(text);
        ck_assert_msg(fault_from_json(object, ring, models, "test", &how.hypothesis.faults[0],
                                      &error) == RF_OK,
                      "%s", error.text);
        how.hypothesis.n_faults = 1;
        struct truth *truth = simulated(ring, &how);
        struct rf_diagnosis *d = diagnosis_of(truth->job);
        size_t members;
        double most = most_of_kind(d, &how.hypothesis.faults[0], &members);
        ck_assert_msg(members == 7 && most < 1.5 / 7, "%s, %s: %.3f of %zu", rows[i].set_ups, text,
                      most, members);
        rf_diagnosis_destroy(d);
        truth_destroy(truth);
        rf_job_destroy(ring);
        cJSON_Delete(object);
    }
}
END_TEST

/* --- every reading missing but a few --- */

struct score {
    size_t n, right;
    double said;
};

static void count(struct score *score, double said, bool right)
{
    score->n++;
    score->said += said;
    score->right += right;
}

static void check_score(const struct score *score, const char *what)
{
    double low, high, said = score->said / (double)score->n;
    rf_wilson(score->right, score->n, 0.99, &low, &high);
    ck_assert_msg(said > low && said < high, "%s: said %.4f, was %zu of %zu: %.4f to %.4f", what,
                  said, score->right, score->n, low, high);
}

/* A ring of 3 to 6 points and its `kept` readings, of all that can be taken. */
static struct rf_job *draw_sparse_ring(gsl_rng *generator, size_t kept)
{
    struct extreme_ring ring = {.points = 3 + gsl_rng_uniform_int(generator, 4),
                                .run_m = 2 + 6 * gsl_rng_uniform(generator),
                                .other_m = 2 + 6 * gsl_rng_uniform(generator),
                                .spurs = gsl_rng_uniform_int(generator, 2)};
    struct text text = {0};
    begin_job(&text, &ring);
    size_t taken[8];
    for (size_t k = 0; k < kept; k++) {
        size_t setup;
        bool new_one;
        do {
            setup = gsl_rng_uniform_int(generator, N_SETUPS);
            new_one = true;
            for (size_t j = 0; j < k; j++)
                new_one = new_one && taken[j] != setup;
        } while (!new_one);
        taken[k] = setup;
        text_addf(&text, "%s\"%s\": {\"", k > 0 ? ", " : "", setups[setup].name);
        size_t spot = N_SPOTS, point = gsl_rng_uniform_int(generator, ring.points + ring.spurs);
        if ((setups[setup].spots >> SPOT_POINT & 1u) == 0 || gsl_rng_uniform(generator) < 0.3)
            for (size_t s = N_SPOTS; s-- > SPOT_BOARD;)
                if (s != SPOT_HIGHEST && (setups[setup].spots >> s & 1u) != 0 &&
                    (spot == N_SPOTS || gsl_rng_uniform(generator) < 0.5))
                    spot = s;
        if (spot < N_SPOTS)
            text_add(&text, spot_keys[spot]);
        else if ((setups[setup].spots >> SPOT_POINT & 1u) != 0)
            add_point_id(&text, &ring, point);
        text_add(&text, "\": 0}");
    }
    return end_job(&text);
}

/* With readings drawn from the model, how often the first hypothesis and the first place are right
 * is how often they say so, however few readings were kept. */
START_TEST(few_readings_are_believed_as_far_as_they_go)
{
    static const size_t kept[] = {1, 3};
    enum { JOBS = 400 };
    gsl_rng *generator = gsl_rng_alloc(gsl_rng_mt19937);
    struct score first = {0}, place = {0}, sure = {0};
    for (uint32_t seed = 0; seed < JOBS; seed++) {
        generator_seed(generator, seed, "sparse");
        struct rf_job *ring = draw_sparse_ring(generator, kept[_i]);
        struct truth *truth = simulated(ring, &(struct simulation){.seed = seed});
        struct rf_diagnosis *d = diagnosis_of(truth->job);
        double said = d->ranked[0].confidence;
        bool right = hypothesis_equal(&d->ranked[0].hypothesis, &truth->hypothesis);
        count(&first, said, right);
        if (said > 0.5)
            count(&sure, said, right);
        if (d->n_places > 0)
            count(&place, d->places[0].chance, truth_look(truth, &d->places[0].look, NULL));
        rf_diagnosis_destroy(d);
        truth_destroy(truth);
        rf_job_destroy(ring);
    }
    gsl_rng_free(generator);
    check_score(&first, "first hypothesis");
    check_score(&place, "first place");
    if (sure.n > 10)
        check_score(&sure, "first hypothesis, above one half");
}
END_TEST

static Suite *says_nothing_suite(void)
{
    Suite *suite = suite_create("says_nothing");
    TCase *few = tcase_create("few");
    tcase_add_unchecked_fixture(few, load_models, unload_models);
    tcase_set_timeout(few, 120);
    tcase_add_test(few, one_reading_that_fits_names_no_place);
    tcase_add_test(few, readings_that_cannot_place_place_nothing);
    tcase_add_loop_test(few, few_readings_are_believed_as_far_as_they_go, 0, 2);
    suite_add_tcase(suite, few);
    return suite;
}

int main(void)
{
    return run_suite(says_nothing_suite());
}
