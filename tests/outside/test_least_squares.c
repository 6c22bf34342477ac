/* SPDX-License-Identifier: GPL-3.0-or-later */

/*
 * The stage of the fit with normal noise against GSL's nonlinear least squares (a general-purpose
 * library): residuals (read − fitted)/σ, and a row θ_j for each parameter's prior. GSL takes its
 * own differences for the Jacobian, so it knows nothing of the engine's gradients. Jobs are
 * invented and simulated.
 */

#include "../hypotheses.h"

#include <gsl/gsl_blas.h>
#include <gsl/gsl_multifit_nlinear.h>
#include <math.h>

struct problem {
    struct forward *forward;
    const struct rf_job *job;
    const struct observation *observations;
    size_t n, d;
};

/* σ as the model defines it; `open` readings and those without a path have no residual. */
static int residuals(const gsl_vector *theta, void *context, gsl_vector *f)
{
    const struct problem *p = context;
    if (forward_evaluate(p->forward, theta->data) != RF_OK)
        return GSL_EFAILED;
    for (size_t i = 0; i < p->n; i++) {
        double y = p->job->readings[i].ohms, r = 0;
        size_t m = p->observations[i].measurement;
        if (!p->job->readings[i].open && forward_reachable(p->forward, m))
            r = (y - forward_mean(p->forward, m)) /
                sqrt(0.015 * 0.015 + 0.015 * 0.015 * y * y + 0.01 * 0.01 / 12);
        gsl_vector_set(f, i, r);
    }
    for (size_t j = 0; j < p->d; j++)
        gsl_vector_set(f, p->n + j, gsl_vector_get(theta, j));
    return GSL_SUCCESS;
}

/* ½ Σ residual² where GSL ends; θ̂ and its covariance. */
static double solve(struct problem *p, gsl_vector *theta, gsl_matrix *covariance)
{
    gsl_multifit_nlinear_parameters parameters = gsl_multifit_nlinear_default_parameters();
    gsl_multifit_nlinear_fdf fdf = {
        .f = residuals, .n = p->n + p->d, .p = p->d, .params = p};
    gsl_multifit_nlinear_workspace *work = gsl_multifit_nlinear_alloc(
        gsl_multifit_nlinear_trust, &parameters, p->n + p->d, p->d);
    double sum = 0;
    int info;
    ck_assert_ptr_nonnull(work);
    gsl_vector_set_zero(theta);
    ck_assert_int_eq(gsl_multifit_nlinear_init(theta, &fdf, work), 0);
    ck_assert_int_eq(gsl_multifit_nlinear_driver(300, 1e-10, 1e-10, 0, NULL, NULL, &info, work), 0);
    gsl_vector_memcpy(theta, gsl_multifit_nlinear_position(work));
    gsl_multifit_nlinear_covar(gsl_multifit_nlinear_jac(work), 0, covariance);
    const gsl_vector *f = gsl_multifit_nlinear_residual(work);
    gsl_blas_ddot(f, f, &sum);
    gsl_multifit_nlinear_free(work);
    return sum / 2;
}

static const char ring[] =
    "\"points\": [{\"id\": \"P1\", \"run_m\": 7}, {\"id\": \"P2\", \"run_m\": null},"
    "{\"id\": \"P3\", \"run_m\": 9}, {\"id\": \"P4\", \"run_m\": 6}], \"last_run_m\": 8,"
    "\"spurs\": [{\"id\": \"S1\", \"from\": \"P3\", \"run_m\": 4}]";

static const char *const truths[] = {
    "",
    "\"family\": \"joint\", \"run\": [\"P2\", \"P3\"], \"conductor\": \"N\"",
    "\"family\": \"contact\", \"at\": \"P2\", \"conductor\": \"L\"",
    "\"family\": \"break\", \"run\": [\"P1\", \"P2\"], \"conductor\": \"L\"",
    "\"family\": \"interconnection\", \"between\": [\"P1\", \"P4\"]",
    "\"family\": \"spur\", \"points\": [\"P2\"]",
    "\"family\": \"short\", \"at\": \"P3\", \"pair\": \"ln\"",
    "\"family\": \"parallel\", \"between\": [\"P1\", \"P3\"]",
    "\"family\": \"not_nulled\"",
    "\"family\": \"bad_link\", \"setup\": \"cross_ln\", \"end\": \"out\"",
    "\"family\": \"size\", \"live_mm2\": 4.0, \"cpc_mm2\": 1.5",
    "\"family\": \"transposed\", \"run\": [\"P1\", \"P2\"], \"pair\": \"ne\"",
};

/*
 * The first stage only prepares the second: it stops when the next step promises less than 1e-3 of
 * the objective or a thousandth of it. So GSL may come lower by about that, never higher; and θ̂ is
 * as near as that much of the objective allows, ½ Δθᵀ H Δθ.
 */
START_TEST(normal_stage)
{
    struct rf_job *plan = job_of(ring,
                                 "\"end_to_end\": {\"l\": 1, \"n\": 1, \"e\": 1},"
                                 "\"cross_ln\": {\"board\": 1, \"P1\": 1, \"P2\": [1, 1], \"P3\": 1,"
                                 "\"P4\": 1, \"S1\": 1}, \"cross_le\": {\"P1\": 1, \"P2\": 1,"
                                 "\"P3\": 1}, \"link_out_ln\": {\"P2\": 1}, \"lead_in_l\": {\"P1\":"
                                 "1}",
                                 "");
    struct simulation simulation = {
        .seed = 11, .given = true, .hypothesis = hypothesis_of(plan, truths[_i])};
    struct truth *truth;
    struct rf_error error;
    ck_assert_int_eq(simulate(plan, models, &simulation, &truth, &error), RF_OK);
    struct bench bench;
    struct fit fit = {0};
    bench_init(&bench, truth->job);
    bench_wire(&bench, &truth->hypothesis);
    ck_assert_int_eq(fitter_analyse(bench.fitter, &bench.wiring), RF_OK);
    ck_assert_int_eq(fitter_fit_normal(bench.fitter, NULL, &fit), RF_OK);
    ck_assert(fit.converged);
    size_t d = fit.n_parameters;
    gsl_vector *ours = gsl_vector_alloc(d), *theirs = gsl_vector_alloc(d);
    gsl_matrix *covariance = gsl_matrix_alloc(d, d);
    memcpy(ours->data, fit.theta, d * sizeof *fit.theta);
    struct problem problem = {.forward = fitter_forward_to_use(bench.fitter),
                              .job = truth->job,
                              .d = d};
    problem.n = fitter_observations(bench.fitter, &problem.observations);
    double least = solve(&problem, theirs, covariance);
    /* Constants of readings without a residual are in ours. */
    gsl_vector *f = gsl_vector_alloc(problem.n + d);
    double objective;
    residuals(ours, &problem, f);
    gsl_blas_ddot(f, f, &objective);
    objective /= 2;
    double allowed = 2 * fmax(1e-3, 1e-3 * fit.objective);
    double apart = 0, sigmas = 0;
    for (size_t j = 0; j < d; j++) {
        double delta = gsl_vector_get(ours, j) - gsl_vector_get(theirs, j);
        apart = fmax(apart, fabs(delta));
        sigmas = fmax(sigmas, fabs(delta) / sqrt(gsl_matrix_get(covariance, j, j)));
    }
    printf("%-12.12s objective %8.4f, GSL %8.4f; θ apart by at most %.4f, %.4f of its σ\n",
           *truths[_i] == '\0' ? "none" : truths[_i] + 11, objective, least, apart, sigmas);
    ck_assert_double_ge(objective, least - 1e-6);
    ck_assert_double_le(objective, least + allowed);
    ck_assert_double_le(sigmas, sqrt(2 * allowed));
    gsl_vector_free(f);
    gsl_vector_free(ours);
    gsl_vector_free(theirs);
    gsl_matrix_free(covariance);
    bench_finish(&bench);
    truth_destroy(truth);
    rf_job_destroy(plan);
}
END_TEST

/* Where no reading is doubtful the two stages agree, and then the spread of each parameter is that
 * of GSL's covariance. */
START_TEST(spread_of_parameters)
{
    struct rf_job *job = job_of(ring,
                                "\"end_to_end\": {\"l\": 0.26, \"n\": 0.26, \"e\": 0.43},"
                                "\"cross_ln\": {\"board\": 0.13, \"P1\": 0.13, \"P2\": 0.13, \"P4\":"
                                "0.13}",
                                "");
    struct bench bench;
    bench_init(&bench, job);
    struct hypothesis none = {0};
    struct fit fit = bench_fit(&bench, &none);
    size_t d = fit.n_parameters;
    gsl_vector *theta = gsl_vector_alloc(d);
    gsl_matrix *covariance = gsl_matrix_alloc(d, d);
    double scratch[32], at[32];
    ck_assert_uint_le(d, 32);
    struct problem problem = {.forward = fitter_forward_to_use(bench.fitter), .job = job, .d = d};
    problem.n = fitter_observations(bench.fitter, &problem.observations);
    for (size_t i = 0; i < problem.n; i++)
        ck_assert_double_gt(fit.weights[i], 0.99);
    memcpy(at, fit.theta, d * sizeof *at);
    solve(&problem, theta, covariance);
    for (size_t j = 0; j < d; j++) {
        ck_assert_double_eq_tol(at[j], gsl_vector_get(theta, j), 0.01);
        ck_assert_double_eq_tol(fit_parameter_sigma(&fit, j, scratch),
                                sqrt(gsl_matrix_get(covariance, j, j)), 0.003);
    }
    gsl_vector_free(theta);
    gsl_matrix_free(covariance);
    bench_finish(&bench);
    rf_job_destroy(job);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("least squares");
    TCase *tests = tcase_create("least squares");
    suite_add_tcase(suite, tests);
    tcase_add_checked_fixture(tests, load_models, unload_models);
    tcase_add_loop_test(tests, normal_stage, 0, (int)(sizeof truths / sizeof *truths));
    tcase_add_test(tests, spread_of_parameters);
    return run_suite(suite);
}
