/* SPDX-License-Identifier: GPL-3.0-or-later */

/*
 * The simulator against the model it claims to draw from. Seeds are fixed, so a test either always
 * passes or never does; tolerances are five standard deviations of what is compared, so that
 * another seed would pass too (but for 6 in ten million).
 */

#include "base/text.h"
#include "fit/likelihood.h"
#include "simulation/simulation.h"

#include "../suite.h"

#include <check.h>
#include <gsl/gsl_errno.h>
#include <gsl/gsl_statistics.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

static struct rf_models *models;
static gsl_rng *generator;

static void set_up(void)
{
    struct rf_error error;
    gsl_set_error_handler_off();
    generator = gsl_rng_alloc(gsl_rng_mt19937);
    ck_assert_ptr_nonnull(generator);
    ck_assert_msg(rf_models_load(NULL, RF_RATES_CONSULTED, &models, &error) == RF_OK, "%s",
                  error.text);
}

static void tear_down(void)
{
    rf_models_destroy(models);
    gsl_rng_free(generator);
}

/* An invented ring of three points and a spur; no readings, so the standard ones are planned. */
static const char ring_text[] =
    "{\"format\": \"ringfettle-job/1\", \"ring\": {\"points\": ["
    "{\"id\": \"P1\", \"run_m\": 6}, {\"id\": \"J\", \"kind\": \"junction_box\", \"run_m\": 5},"
    "{\"id\": \"P3\", \"run_m\": 8}], \"last_run_m\": 7,"
    "\"spurs\": [{\"id\": \"S1\", \"from\": \"P3\", \"run_m\": 3}]}}";

static struct rf_job *read_ring(const char *text)
{
    struct rf_job *ring;
    struct rf_error error;
    ck_assert_msg(simulation_read_ring(text, strlen(text), "ring", &ring, &error) == RF_OK, "%s",
                  error.text);
    return ring;
}

static struct truth *simulate_on(const struct rf_job *ring, const struct simulation *simulation)
{
    struct truth *truth;
    struct rf_error error;
    ck_assert_msg(simulate(ring, models, simulation, &truth, &error) == RF_OK, "%s", error.text);
    return truth;
}

static struct hypothesis neutral_joint(size_t run)
{
    return (struct hypothesis){
        .n_faults = 1,
        .faults = {{.family = &fault_family_joint, .run = run, .conductor = NEUTRAL}}};
}

/* A share of n draws within five standard deviations of p. */
static void assert_share(double count, double n, double p)
{
    double sigma = sqrt(p * (1 - p) / n);
    ck_assert_double_le(fabs(count / n - p), 5 * sigma + 1e-12);
}

/* --- the meter --- */

/* Mean and spread of what is shown of 1 Ω are the likelihood's: the σ it assumes holds the noise
 * and the display's rounding. The standard error of a spread is σ/√(2n). */
START_TEST(meter_noise)
{
    enum { N = 40000 };
    struct instrument_model in = models->instrument;
    in.misread = in.open_wrong = 0;
    double mean = 1, sigma = instrument_sigma(&in, mean), sum = 0, squares = 0;
    generator_seed(generator, 1, "meter");
    for (size_t i = 0; i < N; i++) {
        struct shown shown = draw_shown(&in, true, mean, false, generator);
        ck_assert(!shown.open);
        ck_assert_double_le(fabs(shown.ohms * 100 - round(shown.ohms * 100)), 1e-9);
        sum += shown.ohms - mean;
        squares += (shown.ohms - mean) * (shown.ohms - mean);
    }
    ck_assert_double_le(fabs(sum / N), 5 * sigma / sqrt(N));
    ck_assert_double_le(fabs(sqrt(squares / N) - sigma), 5 * sigma / sqrt(2.0 * N));
}
END_TEST

START_TEST(meter_range)
{
    struct instrument_model in = models->instrument;
    in.misread = in.open_wrong = 0;
    generator_seed(generator, 2, "meter");
    struct shown low = draw_shown(&in, true, -1, false, generator);
    ck_assert(!low.open);
    ck_assert_double_eq(low.ohms, 0);
    ck_assert(!signbit(low.ohms));
    ck_assert(draw_shown(&in, true, 150, false, generator).open);
    ck_assert(draw_shown(&in, false, 0, false, generator).open);
}
END_TEST

/* Shares of misreads and wrong opens. At 0.30 Ω a misread lands within 5 σ of the mean, and is not
 * counted, with the chance that U gives that stretch. */
START_TEST(meter_errors)
{
    enum { N = 100000 };
    const struct instrument_model *in = &models->instrument;
    double mean = 0.3, near = 5 * instrument_sigma(in, mean), c = log(99.9 / 0.05);
    double unnoticed = log((mean + near) / (mean - near)) / (1 + c);
    double far = 0, open = 0, finite = 0;
    generator_seed(generator, 3, "meter");
    for (size_t i = 0; i < N; i++) {
        struct shown shown = draw_shown(in, true, mean, false, generator);
        open += shown.open;
        far += !shown.open && fabs(shown.ohms - mean) > near;
        finite += !draw_shown(in, false, 0, false, generator).open;
    }
    assert_share(open, N, 0.001);
    assert_share(finite, N, 0.001);
    assert_share(far, N, 0.999 * 0.01 * (1 - unnoticed));
}
END_TEST

/* U: flat to 0.05 Ω with 1/(1+c) of it all, log-uniform above. */
START_TEST(meter_misreads)
{
    enum { N = 50000 };
    const struct instrument_model *in = &models->instrument;
    double c = log(in->over_range / in->misread_floor), below = 0, half = 0, middle = 0;
    generator_seed(generator, 4, "meter");
    for (size_t i = 0; i < N; i++) {
        double y = draw_misread(in, generator);
        ck_assert(y >= 0 && y <= in->over_range);
        below += y < in->misread_floor;
        half += y < in->misread_floor / 2;
        middle += y < sqrt(in->misread_floor * in->over_range);
    }
    assert_share(below, N, 1 / (1 + c));
    assert_share(half, N, 0.5 / (1 + c));
    assert_share(middle, N, (1 + c / 2) / (1 + c));
}
END_TEST

/* --- drawing --- */

/* Families, kinds and conductors come as often as the priors say: `not_crossed` has members here,
 * since both crossed tests are planned; all families do but those that need more points. */
START_TEST(faults_drawn)
{
    enum { N = 40000 };
    struct rf_job *ring = read_ring(ring_text);
    double none = 0, joint = 0, whole = 0, contact = 0, open = 0, transposed = 0, present = 0;
    for (size_t i = 0; i < n_fault_families; i++)
        present += models_family(models, fault_families[i]->name)->prior;
    generator_seed(generator, 5, "faults");
    for (size_t i = 0; i < N; i++) {
        struct fault fault;
        ck_assert(draw_fault(ring, models, false, generator, &fault, NULL) == RF_OK);
        none += fault.family == &fault_family_none;
        joint += fault.family == &fault_family_joint;
        whole += fault.family == &fault_family_break && fault.conductor == WHOLE_CABLE;
        contact += fault.family == &fault_family_contact;
        open += fault.family == &fault_family_contact && fault.open;
        transposed += fault.family == &fault_family_transposed;
    }
    assert_share(none, N, 0.22 / present);
    assert_share(joint, N, 0.13 / present);
    assert_share(whole, N, 0.13 / 4 / present);
    assert_share(contact, N, 0.09 / present);
    assert_share(open, N, 0.09 * 0.3 / present);
    assert_share(transposed, N, 0.02 / present);
    rf_job_destroy(ring);
}
END_TEST

/* Hidden parameters are standard normal: mean, spread, and independent of the seed's neighbours. */
START_TEST(theta_is_standard_normal)
{
    enum { N = 400 };
    struct rf_job *ring = read_ring(ring_text);
    double sum = 0, squares = 0, product = 0, before = 0;
    size_t n = 0;
    for (uint32_t seed = 0; seed < N; seed++) {
        struct truth *truth =
            simulate_on(ring, &(struct simulation){.seed = seed, .given = true});
        for (int j = 0; j < truth->wiring.n_parameters; j++, n++) {
            sum += truth->theta[j];
            squares += truth->theta[j] * truth->theta[j];
        }
        product += before * truth->theta[0];
        before = truth->theta[0];
        truth_destroy(truth);
    }
    double count = (double)n;
    ck_assert_double_le(fabs(sum / count), 5 / sqrt(count));
    ck_assert_double_le(fabs(squares / count - 1), 5 * sqrt(2 / count));
    ck_assert_double_le(fabs(product / N), 5 / sqrt(N));
    rf_job_destroy(ring);
}
END_TEST

/* A joint's ohms are log-normal: the median and the spread of the log. */
START_TEST(value_drawn_and_given)
{
    enum { N = 400 };
    struct rf_job *ring = read_ring(ring_text);
    struct simulation simulation = {.given = true, .hypothesis = neutral_joint(1)};
    double sum = 0, squares = 0;
    for (simulation.seed = 0; simulation.seed < N; simulation.seed++) {
        struct truth *truth = simulate_on(ring, &simulation);
        double log_ratio = log(truth_value(truth, 0) / 0.5);
        sum += log_ratio;
        squares += log_ratio * log_ratio;
        truth_destroy(truth);
    }
    ck_assert_double_le(fabs(sum / N), 5 / sqrt(N));
    ck_assert_double_le(fabs(squares / N - 1), 5 * sqrt(2.0 / N));

    simulation.value[0] = 0.8;
    struct truth *truth = simulate_on(ring, &simulation);
    ck_assert_double_eq_tol(truth_value(truth, 0), 0.8, 1e-12);
    truth_destroy(truth);
    rf_job_destroy(ring);
}
END_TEST

START_TEST(value_refused)
{
    struct rf_job *ring = read_ring(ring_text);
    struct truth *truth;
    struct rf_error error;
    struct simulation simulation = {.given = true, .value = {0.8}};
    simulation.hypothesis.n_faults = 1;
    simulation.hypothesis.faults[0] =
        (struct fault){.family = &fault_family_break, .run = 1, .conductor = NEUTRAL};
    ck_assert(simulate(ring, models, &simulation, &truth, &error) == RF_REFUSED);
    ck_assert_ptr_null(truth);
    simulation.hypothesis = neutral_joint(1);
    simulation.value[0] = -1;
    ck_assert(simulate(ring, models, &simulation, &truth, &error) == RF_REFUSED);
    rf_job_destroy(ring);
}
END_TEST

/* --- jobs --- */

static void write_job(const struct truth *truth, struct text *text)
{
    struct rf_error error;
    ck_assert_msg(truth_write_job(truth, true, text, &error) == RF_OK, "%s", error.text);
}

static char *reading_text(const struct truth *truth, const char *needle)
{
    struct text text = {0};
    write_job(truth, &text);
    char *found = strstr(text.bytes, needle);
    char *copy = found != NULL ? text_duplicate(found) : NULL;
    text_finish(&text);
    return copy;
}

/* The plan is what the header says: no reading at the junction box. Two decimals, always. */
START_TEST(standard_plan)
{
    struct rf_job *ring = read_ring(ring_text);
    ck_assert_uint_eq(rf_job_readings(ring), 3 + 2 * 4);
    struct truth *truth = simulate_on(ring, &(struct simulation){.seed = 9, .given = true});
    ck_assert_uint_eq(rf_job_readings(truth->job), 3 + 2 * 4);
    ck_assert_str_eq(rf_job_name(truth->job), "simulated-9");
    char *text = reading_text(truth, "\"end_to_end\":{\"l\":");
    ck_assert_ptr_nonnull(text);
    const char *number = text + strlen("\"end_to_end\":{\"l\":");
    ck_assert_uint_eq(strspn(number, "0123456789."), 4);
    ck_assert_int_eq(number[1], '.');
    free(text);
    ck_assert_ptr_nonnull(text = reading_text(truth, "\"found\":{\"family\":\"none\"}"));
    free(text);
    truth_destroy(truth);
    rf_job_destroy(ring);
}
END_TEST

/* The same seed gives the same bytes; another seed others. */
START_TEST(reproducible)
{
    struct text texts[3] = {{0}};
    struct rf_job *rings[3];
    for (uint32_t i = 0; i < 3; i++) {
        uint32_t seed = i < 2 ? 77 : 78;
        ck_assert(simulation_random_ring(seed, PLAN_EXTRA, &rings[i], NULL) == RF_OK);
        struct truth *truth = simulate_on(rings[i], &(struct simulation){.seed = seed});
        write_job(truth, &texts[i]);
        truth_destroy(truth);
        rf_job_destroy(rings[i]);
    }
    ck_assert_str_eq(texts[0].bytes, texts[1].bytes);
    ck_assert_str_ne(texts[0].bytes, texts[2].bytes);
    for (size_t i = 0; i < 3; i++)
        text_finish(&texts[i]);
}
END_TEST

/* Lists of repeats stay lists, and their values differ; x_ keys and labels are kept. */
START_TEST(repeats_and_what_is_kept)
{
    struct rf_job *ring = read_ring(
        "{\"format\": \"ringfettle-job/1\", \"x_origin\": \"invented\", \"ring\": {\"points\": ["
        "{\"id\": \"P1\", \"label\": \"hall\"}]}, \"readings\": {\"cross_ln\": {\"P1\": "
        "[0, 0, 0, 0, 0, 0, 0, 0], \"highest\": 1}}}");
    struct truth *truth = simulate_on(ring, &(struct simulation){.seed = 1, .given = true});
    ck_assert_uint_eq(rf_job_readings(truth->job), 9);
    double least = 100, most = 0;
    for (size_t i = 0; i < 8; i++) {
        ck_assert_uint_eq(truth->job->readings[i].repeat, i);
        least = fmin(least, truth->job->readings[i].ohms);
        most = fmax(most, truth->job->readings[i].ohms);
    }
    ck_assert_double_gt(most, least);
    char *kept = reading_text(truth, "\"x_origin\":\"invented\"");
    ck_assert_ptr_nonnull(kept);
    free(kept);
    truth_destroy(truth);
    rf_job_destroy(ring);
}
END_TEST

/* Two defects: both in `found`, different, and readable as such. */
START_TEST(two_defects)
{
    struct rf_job *ring = read_ring(ring_text);
    for (uint32_t seed = 0; seed < 40; seed++) {
        struct hypothesis found;
        struct rf_error error;
        struct truth *truth =
            simulate_on(ring, &(struct simulation){.seed = seed, .defects = 2});
        ck_assert_msg(hypothesis_from_found(truth->job, models, &found, &error) == RF_OK, "%s",
                      error.text);
        ck_assert_uint_eq(found.n_faults, 2);
        ck_assert(hypothesis_equal(&found, &truth->hypothesis));
        truth_destroy(truth);
    }
    rf_job_destroy(ring);
}
END_TEST

/* --- the truth --- */

static const struct measurement asked = {.spot = SPOT_POINT, .place = 3};

static struct shown ask(const struct truth *truth, size_t repeat)
{
    struct shown shown;
    struct measurement measurement = asked;
    struct rf_error error;
    measurement.setup = setup_find("link_out_ln");
    ck_assert_msg(truth_answer(truth, &measurement, repeat, &shown, &error) == RF_OK, "%s",
                  error.text);
    return shown;
}

/* The same question gets the same answer, repeats differ, and what the job has was answered so. */
START_TEST(answers)
{
    struct rf_job *ring = read_ring(ring_text);
    struct simulation simulation = {.seed = 4, .given = true, .hypothesis = neutral_joint(1)};
    struct truth *truth = simulate_on(ring, &simulation);
    struct shown first = ask(truth, 0);
    bool differs = false;
    for (size_t repeat = 1; repeat < 8; repeat++)
        differs = differs || fabs(ask(truth, repeat).ohms - first.ohms) > 0.005;
    ck_assert(differs);
    ck_assert_double_eq(ask(truth, 0).ohms, first.ohms);
    for (size_t i = 0; i < truth->job->n_readings; i++) {
        const struct reading *r = &truth->job->readings[i];
        struct measurement m = {.setup = r->setup, .spot = r->spot, .place = r->place};
        struct shown shown;
        ck_assert(truth_answer(truth, &m, r->repeat, &shown, NULL) == RF_OK);
        ck_assert(shown.open == r->open);
        ck_assert_double_eq_tol(shown.ohms, r->ohms, 1e-9);
    }
    truth_destroy(truth);
    rf_job_destroy(ring);
}
END_TEST

/* Over many seeds and repeats, what goes wrong with readings is as frequent as the model says, so
 * the many generators are as good as one. Counted as misread is what is more than 5 σ off the
 * median of the repeats; the chance that U puts a misread nearer is taken off. */
START_TEST(answers_over_seeds)
{
    enum { SEEDS = 500, REPEATS = 40 };
    struct rf_job *ring = read_ring(ring_text);
    struct measurement measurements[REPEATS];
    size_t repeats[REPEATS];
    double open = 0, far = 0, n = SEEDS * REPEATS, c = log(99.9 / 0.05);
    double near = 5 * instrument_sigma(&models->instrument, 2);
    struct simulation simulation = {.given = true, .hypothesis = neutral_joint(1), .value = {2}};
    for (size_t i = 0; i < REPEATS; i++) {
        measurements[i] = (struct measurement){.setup = setup_find("end_to_end"), .spot = SPOT_N};
        repeats[i] = i;
    }
    for (simulation.seed = 0; simulation.seed < SEEDS; simulation.seed++) {
        struct truth *truth = simulate_on(ring, &simulation);
        struct shown shown[REPEATS];
        ck_assert(truth_answers(truth, measurements, repeats, REPEATS, shown, NULL) == RF_OK);
        double values[REPEATS];
        size_t finite = 0;
        for (size_t i = 0; i < REPEATS; i++) {
            open += shown[i].open;
            if (!shown[i].open)
                values[finite++] = shown[i].ohms;
        }
        double middle = gsl_stats_median(values, 1, finite);
        for (size_t i = 0; i < finite; i++)
            far += fabs(values[i] - middle) > near;
        truth_destroy(truth);
    }
    double unnoticed = log((2 + near) / (2 - near)) / (1 + c);
    assert_share(open, n, 0.001);
    assert_share(far, n, 0.999 * 0.01 * (1 - unnoticed));
    rf_job_destroy(ring);
}
END_TEST

/* Written and read again: the same bytes, the same answers, the same spots; for any family. */
START_TEST(truth_round_trip)
{
    for (uint32_t seed = 0; seed < 60; seed++) {
        struct rf_job *ring;
        struct truth *again;
        struct rf_error error;
        struct text one = {0}, two = {0};
        ck_assert(simulation_random_ring(seed, PLAN_EXTRA, &ring, NULL) == RF_OK);
        struct truth *truth =
            simulate_on(ring, &(struct simulation){.seed = seed, .defects = seed % 3});
        ck_assert(truth_write(truth, &one, &error) == RF_OK);
        ck_assert_msg(truth_read(one.bytes, one.length, "truth", models, &again, &error) == RF_OK,
                      "%s in %s", error.text, one.bytes);
        ck_assert_uint_eq(again->seed, seed);
        ck_assert(hypothesis_equal(&again->hypothesis, &truth->hypothesis));
        for (int j = 0; j < truth->wiring.n_parameters; j++)
            ck_assert_double_eq_tol(again->theta[j], truth->theta[j], 1e-12);
        for (size_t i = 0; i < truth->hypothesis.n_faults; i++) {
            ck_assert(again->spots[i].shows == truth->spots[i].shows);
            if (truth->spots[i].shows && !truth->spots[i].each_enough)
                ck_assert(truth_look(again, &truth->spots[i].look, NULL));
        }
        ck_assert(ask(again, 3).open == ask(truth, 3).open);
        ck_assert_double_eq(ask(again, 3).ohms, ask(truth, 3).ohms);
        ck_assert(truth_write(again, &two, &error) == RF_OK);
        text_finish(&one);
        text_finish(&two);
        truth_destroy(again);
        truth_destroy(truth);
        rf_job_destroy(ring);
    }
}
END_TEST

START_TEST(truth_refused)
{
    static const char *const wrong[] = {
        "{}", "{\"format\": \"ringfettle-job/1\"}",
        "{\"format\": \"ringfettle-truth/1\", \"seed\": 1.5}",
        "{\"format\": \"ringfettle-truth/1\", \"seed\": 1, \"job\": {}}",
        "{\"format\": \"ringfettle-truth/1\", \"seed\": 1, \"luck\": 2}",
    };
    for (size_t i = 0; i < sizeof wrong / sizeof *wrong; i++) {
        struct truth *truth;
        struct rf_error error;
        ck_assert(truth_read(wrong[i], strlen(wrong[i]), "truth.json", models, &truth, &error) ==
                  RF_REFUSED);
        ck_assert_ptr_null(truth);
        ck_assert_ptr_nonnull(strstr(error.text, "truth.json"));
    }
}
END_TEST

/* A joint is at either end of its run, .45 each, or inside it. */
START_TEST(looks)
{
    enum { N = 600 };
    struct rf_job *ring = read_ring(ring_text);
    struct simulation simulation = {.given = true, .hypothesis = neutral_joint(1)};
    double near = 0, far = 0, inside = 0;
    for (simulation.seed = 0; simulation.seed < N; simulation.seed++) {
        struct truth *truth = simulate_on(ring, &simulation);
        size_t which = 9;
        struct look look = {.kind = LOOK_OPEN, .where = LOOK_AT_PLACE, .index = 1};
        bool at_near = truth_look(truth, &look, &which);
        ck_assert_uint_eq(which, at_near ? 0 : 9);
        look.index = 2;
        bool at_far = truth_look(truth, &look, NULL);
        look.where = LOOK_IN_RUN;
        look.index = 1;
        bool in_run = truth_look(truth, &look, NULL);
        ck_assert_int_eq(at_near + at_far + in_run, 1);
        near += at_near;
        far += at_far;
        inside += in_run;
        truth_destroy(truth);
    }
    assert_share(near, N, 0.45);
    assert_share(far, N, 0.45);
    assert_share(inside, N, 0.10);

    /* Metalwork shows at either end, whichever is opened; a face is checked, not opened. */
    simulation.hypothesis.faults[0] =
        (struct fault){.family = &fault_family_parallel, .place = 1, .other = 5};
    struct truth *truth = simulate_on(ring, &simulation);
    struct look look = {.kind = LOOK_OPEN, .where = LOOK_AT_PLACE, .index = 1};
    ck_assert(truth_look(truth, &look, NULL));
    look.index = 5;
    ck_assert(truth_look(truth, &look, NULL));
    look.kind = LOOK_CHECK;
    ck_assert(!truth_look(truth, &look, NULL));
    truth_destroy(truth);
    rf_job_destroy(ring);
}
END_TEST

/* --- rings --- */

START_TEST(random_rings)
{
    size_t spurs[3] = {0};
    bool seen[15] = {false};
    for (uint32_t seed = 0; seed < 400; seed++) {
        struct rf_job *ring;
        ck_assert(simulation_random_ring(seed, PLAN_STANDARD, &ring, NULL) == RF_OK);
        size_t n = rf_job_points(ring);
        double total = 0, rounding = 0.05 * (double)(n + 1);
        ck_assert(n >= 4 && n <= 14 && rf_job_spurs(ring) <= 2);
        seen[n] = true;
        spurs[rf_job_spurs(ring)]++;
        for (size_t run = 0; run <= n; run++)
            total += ring->places[run_far_end(run)].run_m;
        ck_assert_double_ge(total, 3.5 * (double)(n + 1) - rounding);
        ck_assert_double_le(total, 8.0 * (double)(n + 1) + rounding);
        for (size_t i = n + 2; i < ring->n_places; i++)
            ck_assert(ring->places[i].run_m >= 1.5 && ring->places[i].run_m <= 9.0);
        ck_assert_uint_eq(rf_job_readings(ring), 3 + 2 * (1 + n + rf_job_spurs(ring)));
        rf_job_destroy(ring);
    }
    for (size_t n = 4; n <= 14; n++)
        ck_assert(seen[n]);
    assert_share((double)spurs[0], 400, 0.5);
    assert_share((double)spurs[1], 400, 0.25);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("simulation");
    TCase *tests = tcase_create("simulation");
    tcase_add_checked_fixture(tests, set_up, tear_down);
    tcase_set_timeout(tests, 60);
    tcase_add_test(tests, meter_noise);
    tcase_add_test(tests, meter_range);
    tcase_add_test(tests, meter_errors);
    tcase_add_test(tests, meter_misreads);
    tcase_add_test(tests, faults_drawn);
    tcase_add_test(tests, theta_is_standard_normal);
    tcase_add_test(tests, value_drawn_and_given);
    tcase_add_test(tests, value_refused);
    tcase_add_test(tests, standard_plan);
    tcase_add_test(tests, reproducible);
    tcase_add_test(tests, repeats_and_what_is_kept);
    tcase_add_test(tests, two_defects);
    tcase_add_test(tests, answers);
    tcase_add_test(tests, answers_over_seeds);
    tcase_add_test(tests, truth_round_trip);
    tcase_add_test(tests, truth_refused);
    tcase_add_test(tests, looks);
    tcase_add_test(tests, random_rings);
    suite_add_tcase(suite, tests);
    return run_suite(suite);
}
