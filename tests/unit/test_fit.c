/* SPDX-License-Identifier: GPL-3.0-or-later */

/*
 * The forward model's gradients, and the fit: against central differences, and against what must
 * hold whatever the numbers are. Rings are invented; readings are simulated or made to measure.
 */

#include "../hypotheses.h"

#include "base/cholesky.h"

#include <math.h>
#include <stdint.h>

/* --- gradients --- */

static const char ring[] =
    "\"cpc_mm2\": null, \"points\": [{\"id\": \"P1\", \"run_m\": 7, \"live_mm2\": 4, \"cpc_mm2\": 1.5},"
    "{\"id\": \"P2\", \"run_m\": null}, {\"id\": \"P3\", \"run_m\": 9}], \"last_run_m\": 8,"
    "\"spurs\": [{\"id\": \"S1\", \"from\": \"P2\", \"run_m\": 4}]";

enum { THETA_MOST = 32, MEASURED_MOST = 256 };

/* All set-ups at all places; `highest` too. */
static size_t measure_everything(const struct rf_job *job, struct measurement list[])
{
    size_t n = 0;
    for (size_t setup = 0; setup < N_SETUPS; setup++)
        for (size_t spot = 0; spot < N_SPOTS; spot++) {
            bool point = spot == SPOT_POINT;
            if ((setups[setup].spots >> spot & 1u) == 0)
                continue;
            for (size_t place = 0; place < (point ? job->n_places : 1); place++)
                if (!point || place_has_front(job, place))
                    list[n++] = (struct measurement){setup, (enum spot)spot, place};
        }
    ck_assert_uint_le(n, MEASURED_MOST);
    return n;
}

struct gradients {
    const struct rf_job *job;
    const struct wiring *ring;
    struct wiring wiring;
    struct forward *forward;
    size_t members, compared;
    gsl_rng *generator;
};

static void means_at(struct gradients *g, const double theta[], double means[])
{
    ck_assert_int_eq(forward_evaluate(g->forward, theta), RF_OK);
    for (size_t i = 0; i < forward_measurements(g->forward); i++)
        means[i] = forward_mean(g->forward, i);
}

/* Which point is the highest can change within the step; there the derivative has no meaning. */
static void compare_gradients(struct gradients *g, const double theta[])
{
    static double below[MEASURED_MOST], above[MEASURED_MOST];
    const double step = 1e-4;
    double shifted[THETA_MOST];
    size_t d = (size_t)g->wiring.n_parameters;
    ck_assert_uint_le(d, THETA_MOST);
    for (size_t j = 0; j < d; j++) {
        memcpy(shifted, theta, d * sizeof *theta);
        shifted[j] = theta[j] - step;
        means_at(g, shifted, below);
        shifted[j] = theta[j] + step;
        means_at(g, shifted, above);
        ck_assert_int_eq(forward_evaluate(g->forward, theta), RF_OK);
        for (size_t i = 0; i < forward_measurements(g->forward); i++) {
            double ours = forward_gradient(g->forward, i)[j];
            double difference = (above[i] - below[i]) / (2 * step);
            if (!forward_reachable(g->forward, i))
                continue;
            g->compared++;
            ck_assert_msg(fabs(ours - difference) <= 1e-6 * fmax(1, fabs(difference)) ||
                              forward_measurement(g->forward, i)->spot == SPOT_HIGHEST,
                          "%s, parameter %zu of %zu: gradient %g, difference %g",
                          setups[forward_measurement(g->forward, i)->setup].name, j, d, ours,
                          difference);
        }
    }
}

static bool compare_member(void *context, const struct fault *fault)
{
    struct gradients *g = context;
    struct hypothesis hypothesis = {.faults = {*fault},
                                    .n_faults = fault->family->apply != NULL};
    double theta[THETA_MOST];
    wiring_copy(&g->wiring, g->ring);
    hypothesis_apply(&hypothesis, &g->wiring, NULL);
    ck_assert_int_eq(forward_analyse(g->forward, &g->wiring), RF_OK);
    for (size_t j = 0; j < THETA_MOST; j++)
        theta[j] = 2 * gsl_rng_uniform(g->generator) - 1;
    compare_gradients(g, theta);
    g->members++;
    return true;
}

/* Every member of the family, in every set-up, at a θ drawn anew. */
START_TEST(gradients_are_central_differences)
{
    struct rf_job *job =
        job_of(ring, "\"cross_ln\": {\"P1\": 1}, \"cross_le\": {\"P1\": 1}, \"link_in_ne\": {\"P1\": 1}",
               "");
    struct measurement measurements[MEASURED_MOST];
    size_t n = measure_everything(job, measurements);
    struct bench bench;
    bench_init(&bench, job);
    struct gradients g = {.job = job, .ring = &bench.ring};
    struct rf_error error;
    g.generator = gsl_rng_alloc(gsl_rng_mt19937);
    g.forward = forward_create(&bench.ring, measurements, n);
    ck_assert_ptr_nonnull(g.forward);
    ck_assert_int_eq(wiring_init(&g.wiring, job, models, &error), RF_OK);
    fault_families[_i]->enumerate(job, models, compare_member, &g);
    ck_assert_uint_gt(g.members, 0);
    ck_assert_uint_gt(g.compared, 500);
    wiring_finish(&g.wiring);
    forward_destroy(g.forward);
    gsl_rng_free(g.generator);
    bench_finish(&bench);
    rf_job_destroy(job);
}
END_TEST

/* `highest` is the point's own reading that is highest, gradient and all. */
START_TEST(highest_is_the_highest_point)
{
    struct rf_job *job = job_of(ring,
                                "\"cross_le\": {\"highest\": 1, \"P1\": 1, \"P2\": 1, \"P3\": 1,"
                                "\"S1\": 1}",
                                "");
    static const char *const faults[] = {
        "", "\"family\": \"contact\", \"at\": \"P1\", \"conductor\": \"E\"",
        "\"family\": \"break\", \"run\": [\"P2\", \"S1\"], \"conductor\": \"LNE\""};
    static const char *const highest[] = {"S1", "P1", "P2"};
    struct bench bench;
    bench_init(&bench, job);
    struct hypothesis hypothesis = hypothesis_of(job, faults[_i]);
    bench_wire(&bench, &hypothesis);
    struct forward *forward = fitter_forward_to_use(bench.fitter);
    double theta[THETA_MOST] = {0};
    ck_assert_int_eq(forward_analyse(forward, &bench.wiring), RF_OK);
    ck_assert_int_eq(forward_evaluate(forward, theta), RF_OK);
    ck_assert_int_eq(forward_measurement(forward, 0)->spot, SPOT_HIGHEST);
    ck_assert(forward_reachable(forward, 0));
    size_t at = 0;
    for (size_t i = 1; i < 5; i++) {
        if (forward_reachable(forward, i))
            ck_assert_double_le(forward_mean(forward, i), forward_mean(forward, 0));
        if (forward_measurement(forward, i)->place == job_find_place(job, highest[_i]))
            at = i;
    }
    ck_assert_double_eq(forward_mean(forward, 0), forward_mean(forward, at));
    for (int j = 0; j < bench.wiring.n_parameters; j++)
        ck_assert_double_eq(forward_gradient(forward, 0)[j], forward_gradient(forward, at)[j]);
    bench_finish(&bench);
    rf_job_destroy(job);
}
END_TEST

/* --- the fit --- */

static const char plain_ring[] =
    "\"points\": [{\"id\": \"P1\", \"run_m\": 8}, {\"id\": \"P2\", \"run_m\": 8},"
    "{\"id\": \"P3\", \"run_m\": 8}, {\"id\": \"P4\", \"run_m\": 8}], \"last_run_m\": 8";

/* F and its terms as the header has them, from likelihoods one reading at a time; the gradient of F
 * vanishes; the factor is that of I + JᵀWJ. */
static void assert_fit_is_as_said(struct bench *bench, const struct fit *fit)
{
    const struct observation *observations;
    struct forward *forward = fitter_forward_to_use(bench->fitter);
    size_t n = fitter_observations(bench->fitter, &observations), d = fit->n_parameters;
    double hessian[THETA_MOST * THETA_MOST] = {0}, gradient[THETA_MOST], sum = 0, penalty = 0;
    ck_assert_int_eq(forward_evaluate(forward, fit->theta), RF_OK);
    for (size_t j = 0; j < d; j++) {
        hessian[j * THETA_MOST + j] = 1;
        gradient[j] = fit->theta[j];
        penalty += fit->theta[j] * fit->theta[j] / 2;
    }
    for (size_t i = 0; i < n; i++) {
        const struct observation *o = &observations[i];
        if (!forward_reachable(forward, o->measurement)) {
            sum += o->open ? log(0.999) : log(0.001 * instrument_misread_density(&models->instrument,
                                                                                o->ohms));
            continue;
        }
        if (o->open) {
            sum += log(0.001);
            continue;
        }
        double w, z;
        const double *row = forward_gradient(forward, o->measurement);
        sum += log_mixture(o, forward_mean(forward, o->measurement), &w, &z);
        ck_assert_double_eq_tol(fit->weights[i], w, 1e-9);
        for (size_t j = 0; j < d; j++) {
            gradient[j] -= w * z * row[j] / o->sigma;
            for (size_t k = 0; k < d; k++)
                hessian[j * THETA_MOST + k] += w * row[j] * row[k] / (o->sigma * o->sigma);
        }
    }
    ck_assert(cholesky_factor(hessian, d, THETA_MOST));
    ck_assert_double_eq_tol(fit->log_likelihood, sum, 1e-9);
    ck_assert_double_eq_tol(fit->penalty, penalty, 1e-9);
    ck_assert_double_eq_tol(fit->log_det, cholesky_log_det(hessian, d, THETA_MOST), 1e-9);
    ck_assert_double_eq_tol(fit->log_evidence, sum - penalty - fit->log_det / 2, 1e-9);
    cholesky_half_solve(hessian, d, THETA_MOST, gradient);
    for (size_t j = 0; j < d; j++)
        ck_assert_double_le(fabs(gradient[j]), 0.01);
}

static const char *const fitted_faults[] = {
    "", "\"family\": \"joint\", \"run\": [\"P2\", \"P3\"], \"conductor\": \"N\"",
    "\"family\": \"contact\", \"at\": \"P2\", \"conductor\": \"L\", \"open\": true",
    "\"family\": \"break\", \"run\": [\"P1\", \"P2\"], \"conductor\": \"L\"",
    "\"family\": \"wrong_leg\", \"leg\": \"in\"", "\"family\": \"not_nulled\""};

/* Readings: finite, repeated, over range with a path and without. */
START_TEST(evidence_is_as_said)
{
    struct rf_job *job = job_of(plain_ring,
                                "\"end_to_end\": {\"l\": \"open\", \"n\": 0.31, \"e\": 0.47},"
                                "\"cross_ln\": {\"board\": 0.14, \"P1\": [0.16, 0.15], \"P2\": \"open\","
                                "\"P3\": 0.27, \"P4\": 0.15, \"highest\": 0.28},"
                                "\"apart_ln\": {\"out\": \"open\", \"in\": 0.4}",
                                "");
    struct bench bench;
    bench_init(&bench, job);
    struct hypothesis hypothesis = hypothesis_of(job, fitted_faults[_i]);
    struct fit fit = bench_fit(&bench, &hypothesis);
    ck_assert(fit.converged);
    assert_fit_is_as_said(&bench, &fit);
    bench_finish(&bench);
    rf_job_destroy(job);
}
END_TEST

/* Design 4's four cases where nothing can move: a reading open or not, path or not. */
START_TEST(open_readings)
{
    static const struct {
        const char *readings, *fault;
        double log_likelihood;
    } rows[] = {
        {"\"end_to_end\": {\"l\": \"open\"}", "", -6.907755},       /* log 0.001 */
        {"\"end_to_end\": {\"l\": \"open\"}",
         "\"family\": \"break\", \"run\": [\"P1\", \"P2\"], \"conductor\": \"L\"", -0.0010005},
        /* log(0.001/(0.5 ln 1998)) */
        {"\"end_to_end\": {\"l\": 0.50}",
         "\"family\": \"break\", \"run\": [\"P1\", \"P2\"], \"conductor\": \"L\"", -8.242743},
    };
    struct rf_job *job = job_of(plain_ring, rows[_i].readings, "");
    struct bench bench;
    bench_init(&bench, job);
    struct hypothesis hypothesis = hypothesis_of(job, rows[_i].fault);
    struct fit fit = bench_fit(&bench, &hypothesis);
    ck_assert_double_eq_tol(fit.log_likelihood, rows[_i].log_likelihood, 1e-5);
    /* Nothing is learned: θ̂ is the prior's and the evidence the likelihood. */
    ck_assert_double_eq(fit.penalty, 0);
    ck_assert_double_eq_tol(fit.log_evidence, fit.log_likelihood, 1e-12);
    bench_finish(&bench);
    rf_job_destroy(job);
}
END_TEST

/* `highest` has a path as long as one point has. */
START_TEST(highest_without_a_path)
{
    struct rf_job *job = job_of(plain_ring, "\"cross_ln\": {\"highest\": 0.2}", "");
    struct bench bench;
    bench_init(&bench, job);
    struct hypothesis one = hypothesis_of(
        job, "\"family\": \"contact\", \"at\": \"P2\", \"conductor\": \"L\", \"open\": true");
    bench_wire(&bench, &one);
    ck_assert_int_eq(fitter_analyse(bench.fitter, &bench.wiring), RF_OK);
    ck_assert(forward_reachable(fitter_forward(bench.fitter), 0));
    bench_finish(&bench);
    rf_job_destroy(job);
    job = job_of("\"points\": [{\"id\": \"P1\", \"run_m\": 8}], \"last_run_m\": 8",
                 "\"cross_ln\": {\"highest\": 0.2}", "");
    bench_init(&bench, job);
    one = hypothesis_of(job,
                        "\"family\": \"contact\", \"at\": \"P1\", \"conductor\": \"L\", \"open\": true");
    struct fit fit = bench_fit(&bench, &one);
    ck_assert(!forward_reachable(fitter_forward(bench.fitter), 0));
    ck_assert_double_eq_tol(fit.log_likelihood, log(0.001 / (0.2 * log(99.9 / 0.05))), 1e-9);
    bench_finish(&bench);
    rf_job_destroy(job);
}
END_TEST

/* A reading four times over is one of a quarter of the variance: the same θ̂, and as sure. */
START_TEST(repeats_weigh)
{
    static const char *const readings[] = {
        "\"end_to_end\": {\"l\": [0.33, 0.33, 0.33, 0.33], \"n\": 0.30}, \"cross_ln\": {\"P1\": 0.15}",
        "\"end_to_end\": {\"l\": 0.33, \"n\": 0.30}, \"cross_ln\": {\"P1\": 0.15}"};
    double theta[2][THETA_MOST], sigma[2], scratch[THETA_MOST];
    struct instrument_model *in = &models->instrument;
    in->misread = 1e-12;
    in->step = 0;
    for (size_t once = 0; once < 2; once++) {
        struct rf_job *job = job_of(plain_ring, readings[once], "");
        struct bench bench;
        bench_init(&bench, job);
        struct observation *observations;
        fitter_observations(bench.fitter, (const struct observation **)&observations);
        if (once) { /* the fitter's own list: the first reading is as good as four */
            observations[0].sigma /= 2;
            observations[0].log_peak += log(2);
        }
        struct hypothesis none = {0};
        struct fit fit = bench_fit(&bench, &none);
        ck_assert_uint_le(fit.n_parameters, THETA_MOST);
        memcpy(theta[once], fit.theta, fit.n_parameters * sizeof *fit.theta);
        sigma[once] = fit_parameter_sigma(&fit, 0, scratch);
        for (size_t j = 0; once && j < fit.n_parameters; j++)
            ck_assert_double_eq_tol(theta[0][j], theta[1][j], 1e-3);
        bench_finish(&bench);
        rf_job_destroy(job);
    }
    ck_assert_double_eq_tol(sigma[0], sigma[1], 1e-6);
}
END_TEST

/* Among many readings that agree one wild one weighs nothing: the fit is that without it, and the
 * evidence less by what a misread costs, log(0.999 · 0.01 · U). */
START_TEST(a_wild_reading_is_written_off)
{
    static const char *const readings[] = {
        "\"end_to_end\": {\"l\": 0.30, \"n\": 0.29, \"e\": 0.48}, \"cross_ln\": {\"board\": 0.15,"
        "\"P1\": 0.15, \"P2\": 0.14, \"P3\": 2.50, \"P4\": 0.15}",
        "\"end_to_end\": {\"l\": 0.30, \"n\": 0.29, \"e\": 0.48}, \"cross_ln\": {\"board\": 0.15,"
        "\"P1\": 0.15, \"P2\": 0.14, \"P4\": 0.15}"};
    double theta[2][THETA_MOST], log_evidence[2];
    for (size_t without = 0; without < 2; without++) {
        struct rf_job *job = job_of(plain_ring, readings[without], "");
        struct bench bench;
        bench_init(&bench, job);
        struct hypothesis none = {0};
        struct fit fit = bench_fit(&bench, &none);
        for (size_t i = 0; i < job->n_readings; i++)
            if (job->readings[i].ohms > 1)
                ck_assert_double_lt(fit.weights[i], 1e-9);
            else
                ck_assert_double_gt(fit.weights[i], 0.9);
        memcpy(theta[without], fit.theta, fit.n_parameters * sizeof *fit.theta);
        log_evidence[without] = fit.log_evidence;
        for (size_t j = 0; without && j < fit.n_parameters; j++)
            ck_assert_double_eq_tol(theta[0][j], theta[1][j], 0.01);
        bench_finish(&bench);
        rf_job_destroy(job);
    }
    double u = 1 / (2.5 * log(99.9 / 0.05));
    ck_assert_double_eq_tol(log_evidence[0] - log_evidence[1], log(0.999 * 0.01 * u), 0.001);
}
END_TEST

/* A contact of 3 Ω is far from its prior's median, 0.4 Ω: from there the mixture alone writes the
 * one reading that tells of it off. Normal noise first leads to it. */
START_TEST(two_stages_find_the_tell_tale)
{
    struct rf_job *job = job_of(plain_ring,
                                "\"end_to_end\": {\"l\": 0.30, \"n\": 0.30, \"e\": 0.48}, \"cross_ln\":"
                                "{\"board\": 0.15, \"P1\": 0.15, \"P2\": 0.15, \"P3\": 3.15, \"P4\": 0.15}",
                                "");
    struct bench bench;
    struct fit fit = {0};
    double start[THETA_MOST] = {0};
    size_t tell_tale = job->n_readings - 2;
    bench_init(&bench, job);
    ck_assert_double_gt(job->readings[tell_tale].ohms, 3);
    struct hypothesis contact =
        hypothesis_of(job, "\"family\": \"contact\", \"at\": \"P3\", \"conductor\": \"L\"");
    bench_wire(&bench, &contact);
    ck_assert_int_eq(fitter_analyse(bench.fitter, &bench.wiring), RF_OK);
    fitter_resume(bench.fitter, start, &fit);
    ck_assert_int_eq(fitter_fit_mixture(bench.fitter, -INFINITY, &fit), RF_OK);
    double one_stage = fit.log_evidence;
    ck_assert_double_lt(fit.weights[tell_tale], 0.01);
    fit = bench_fit(&bench, &contact);
    ck_assert_double_gt(fit.weights[tell_tale], 0.99);
    ck_assert_double_gt(fit.log_evidence, one_stage + 3);
    struct lognormal prior = models_family(models, "contact")->parameter;
    ck_assert_double_eq_tol(prior.median * exp(prior.sigma * fit.theta[bench.parameter_of[0]]), 3,
                            0.05);
    bench_finish(&bench);
    rf_job_destroy(job);
}
END_TEST

/* Given up where log Z would stay below what is hopeless, and only there. */
START_TEST(gives_up_what_is_hopeless)
{
    struct rf_job *job = job_of(plain_ring,
                                "\"end_to_end\": {\"l\": 0.30, \"n\": 1.30, \"e\": 0.48}, \"cross_ln\":"
                                "{\"board\": 0.25, \"P1\": 0.25, \"P2\": 0.24, \"P3\": 0.25}",
                                "");
    struct bench bench;
    bench_init(&bench, job);
    for (size_t i = 0; i < sizeof fitted_faults / sizeof *fitted_faults; i++) {
        struct hypothesis hypothesis = hypothesis_of(job, fitted_faults[i]);
        struct fit fit = bench_fit(&bench, &hypothesis);
        double log_evidence = fit.log_evidence;
        for (double off = -30; off < 31; off += 5) {
            double hopeless = log_evidence + off;
            ck_assert_int_eq(fitter_fit_normal(bench.fitter, NULL, &fit), RF_OK);
            ck_assert_int_eq(fitter_fit_mixture(bench.fitter, hopeless, &fit), RF_OK);
            if (off < 0)
                ck_assert(!fit.abandoned);
            if (fit.abandoned)
                continue;
            ck_assert_double_eq_tol(fit.log_evidence, log_evidence, 1e-9);
        }
        ck_assert(fit.abandoned); /* 30 above log Z: beyond ½ log det and all slack */
    }
    bench_finish(&bench);
    rf_job_destroy(job);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("fit");
    TCase *tests = tcase_create("fit");
    suite_add_tcase(suite, tests);
    tcase_add_checked_fixture(tests, load_models, unload_models);
    tcase_set_timeout(tests, 60);
    tcase_add_loop_test(tests, gradients_are_central_differences, 0, (int)n_fault_families);
    tcase_add_loop_test(tests, highest_is_the_highest_point, 0, 3);
    tcase_add_loop_test(tests, evidence_is_as_said, 0,
                        (int)(sizeof fitted_faults / sizeof *fitted_faults));
    tcase_add_loop_test(tests, open_readings, 0, 3);
    tcase_add_test(tests, highest_without_a_path);
    tcase_add_test(tests, repeats_weigh);
    tcase_add_test(tests, a_wild_reading_is_written_off);
    tcase_add_test(tests, two_stages_find_the_tell_tale);
    tcase_add_test(tests, gives_up_what_is_hopeless);
    return run_suite(suite);
}
