/* SPDX-License-Identifier: GPL-3.0-or-later */

/*
 * Laplace's evidence against numerical integration of likelihood × prior over all whitened
 * parameters (GSL, a general-purpose library). Rings are invented and small, of one and two
 * points; readings are simulated. The likelihood here is written anew from the model's definition
 * and shares nothing with src/fit/likelihood.c; the means it takes are compared with resistances by
 * nodal analysis of plain.h's network.
 *
 * The integral is over 9 to 12 dimensions, by importance sampling (e.g. C. P. Robert and
 * G. Casella, "Monte Carlo Statistical Methods", 2nd ed., 2004, ch. 3; from memory) from heavy-tailed
 * clouds around what the fit and fits from elsewhere found, mixed with the prior, so that no weight
 * can be large that the prior alone would not have made so. Where all but one or two parameters
 * drop out the sampler itself is compared with GSL's adaptive quadrature.
 */

#include "diagnosis/diagnosis.h"
#include "plain.h"

#include "../hypotheses.h"

#include <gsl/gsl_blas.h>
#include <gsl/gsl_integration.h>
#include <gsl/gsl_linalg.h>
#include <gsl/gsl_math.h>
#include <gsl/gsl_randist.h>
#include <gsl/gsl_sf_gamma.h>
#include <gsl/gsl_sort.h>
#include <gsl/gsl_statistics.h>

/* --- the likelihood of the model, written anew --- */

/* Of a reading y (NAN: over range) where the meter ought to show `mean` (NAN: over range). */
static double log_likelihood(double y, double mean)
{
    if (isnan(y))
        return log(isnan(mean) ? 0.999 : 0.001);
    double u = 1 / ((y > 0.05 ? y : 0.05) * log(99.9 / 0.05));
    if (isnan(mean))
        return log(0.001 * u);
    double s = sqrt(pow(0.015, 2) + pow(0.015 * y, 2) + pow(0.01, 2) / 12);
    double normal = exp(-pow((y - mean) / s, 2) / 2) / (s * sqrt(2 * M_PI));
    return log(0.999 * (0.99 * normal + 0.01 * u));
}

static double log_prior(const double *theta, size_t d)
{
    double sum = 0;
    for (size_t j = 0; j < d; j++)
        sum -= theta[j] * theta[j] / 2 + log(2 * M_PI) / 2;
    return sum;
}

/* log of likelihood × prior; means from the forward model. */
static double log_joint(struct bench *bench, const double *theta, size_t d)
{
    struct forward *forward = fitter_forward_to_use(bench->fitter);
    const struct observation *observations;
    double sum = log_prior(theta, d);
    if (forward_evaluate(forward, theta) != RF_OK)
        return -INFINITY;
    size_t n = fitter_observations(bench->fitter, &observations);
    for (size_t i = 0; i < n; i++) {
        const struct reading *r = &bench->job->readings[i];
        size_t m = observations[i].measurement;
        sum += log_likelihood(r->open ? NAN : r->ohms, forward_reachable(forward, m)
                                                            ? forward_mean(forward, m)
                                                            : NAN);
    }
    return sum;
}

/* --- means against plain.h --- */

static int group_of(const int *parent, int node)
{
    while (parent[node] != node)
        node = parent[node];
    return node;
}

/* Resistance between two nodes by nodal analysis: 0 Ω joins nodes, the rest is a Laplacian with one
 * node at earth. The probes must be joined by some path. */
static double nodal_resistance(const struct plain *plain, int a, int b)
{
    int parent[PLAIN_NODES];
    for (int i = 0; i < PLAIN_NODES; i++)
        parent[i] = i;
    for (size_t i = 0; i < plain->n_resistors; i++)
        if (!(plain->resistors[i].ohms > 0))
            parent[group_of(parent, plain->resistors[i].a)] =
                group_of(parent, plain->resistors[i].b);
    gsl_matrix *laplacian = gsl_matrix_calloc(PLAIN_NODES, PLAIN_NODES);
    gsl_vector *current = gsl_vector_calloc(PLAIN_NODES), *v = gsl_vector_calloc(PLAIN_NODES);
    for (size_t i = 0; i < plain->n_resistors; i++) {
        size_t p = (size_t)group_of(parent, plain->resistors[i].a);
        size_t q = (size_t)group_of(parent, plain->resistors[i].b);
        double g = p == q ? 0 : 1 / plain->resistors[i].ohms;
        *gsl_matrix_ptr(laplacian, p, p) += g;
        *gsl_matrix_ptr(laplacian, q, q) += g;
        *gsl_matrix_ptr(laplacian, p, q) -= g;
        *gsl_matrix_ptr(laplacian, q, p) -= g;
    }
    /* A leak of 1e9 Ω to earth from every node keeps floating parts solvable. */
    for (size_t i = 0; i < PLAIN_NODES; i++)
        *gsl_matrix_ptr(laplacian, i, i) += 1e-9;
    size_t from = (size_t)group_of(parent, a), to = (size_t)group_of(parent, b);
    *gsl_vector_ptr(current, from) += 1;
    *gsl_vector_ptr(current, to) -= 1;
    ck_assert_int_eq(gsl_linalg_cholesky_decomp1(laplacian), 0);
    gsl_linalg_cholesky_solve(laplacian, current, v);
    double ohms = gsl_vector_get(v, from) - gsl_vector_get(v, to);
    gsl_matrix_free(laplacian);
    gsl_vector_free(current);
    gsl_vector_free(v);
    return ohms;
}

/* --- the jobs --- */

static const char one_point[] =
    "\"points\": [{\"id\": \"P1\", \"run_m\": 9}], \"last_run_m\": 14";
static const char two_points[] =
    "\"points\": [{\"id\": \"P1\", \"run_m\": 8}, {\"id\": \"P2\", \"run_m\": 12}],"
    "\"last_run_m\": 7, \"spurs\": [{\"id\": \"S1\", \"from\": \"P2\", \"run_m\": 4}]";
static const char few[] = "\"end_to_end\": {\"l\": 1, \"n\": 1, \"e\": 1},"
                          "\"cross_ln\": {\"board\": 1, \"P1\": 1}";
static const char most[] =
    "\"end_to_end\": {\"l\": 1, \"n\": 1, \"e\": 1}, \"cross_ln\": {\"board\": 1, \"P1\": [1, 1],"
    "\"P2\": 1, \"S1\": 1}, \"cross_le\": {\"P1\": 1, \"P2\": 1}, \"link_out_ln\": {\"P2\": 1}";
static const char less[] = "\"end_to_end\": {\"l\": 1, \"n\": 1}, \"cross_ln\": {\"highest\": 1}";

static const struct {
    const char *ring, *readings, *truth;
} cases[] = {
    {one_point, few, ""},
    {one_point, few, "\"family\": \"joint\", \"run\": [\"P1\", \"in\"], \"conductor\": \"N\""},
    {one_point, few, "\"family\": \"contact\", \"at\": \"P1\", \"conductor\": \"L\""},
    {one_point, few, "\"family\": \"not_nulled\""},
    {one_point, few, "\"family\": \"short\", \"at\": \"P1\", \"pair\": \"ln\""},
    {two_points, most, ""},
    {two_points, most, "\"family\": \"joint\", \"run\": [\"P1\", \"P2\"], \"conductor\": \"L\""},
    {two_points, most, "\"family\": \"spur\", \"points\": [\"P1\"]"},
    {two_points, most, "\"family\": \"not_nulled\""},
    {two_points, most, "\"family\": \"contact\", \"at\": \"S1\", \"conductor\": \"N\""},
    {two_points, most, "\"family\": \"break\", \"run\": [\"P1\", \"P2\"], \"conductor\": \"N\""},
    {two_points, less, ""},
    {two_points, less, "\"family\": \"load\", \"at\": \"P2\""},
    {two_points, less, "\"family\": \"short\", \"at\": \"P2\", \"pair\": \"ln\""},
};
enum { N_CASES = sizeof cases / sizeof *cases, RANKED_TRIED = 6 };

static struct truth *simulate_case(size_t i)
{
    struct truth *truth;
    struct rf_error error;
    struct rf_job *ring = job_of(cases[i].ring, cases[i].readings, "");
    struct simulation simulation = {.seed = 100 + (uint32_t)i,
                                    .given = true,
                                    .hypothesis = hypothesis_of(ring, cases[i].truth)};
    ck_assert_msg(simulate(ring, models, &simulation, &truth, &error) == RF_OK, "%s", error.text);
    rf_job_destroy(ring);
    return truth;
}

/* θ as a job of other lengths, other conductors and another fault: what plain.h makes of it, read
 * through the instrument. Line and neutral get the same factor, because they share a size. */
static void compare_means(struct bench *bench, const struct hypothesis *hypothesis,
                          gsl_rng *generator)
{
    struct forward *forward = fitter_forward_to_use(bench->fitter);
    const struct parameter_map *map = &bench->ring.map;
    struct rf_job job = *bench->job;
    struct place places[8];
    struct rf_models cable = *models;
    double theta[32], value = 0;
    size_t d = (size_t)bench->wiring.n_parameters;
    ck_assert_uint_le(job.n_places, 8);
    ck_assert_uint_le(d, 32);
    for (size_t j = 0; j < d; j++)
        theta[j] = gsl_ran_gaussian(generator, 1);
    theta[map->conductor[NEUTRAL]] = theta[map->conductor[LINE]];
    memcpy(places, job.places, job.n_places * sizeof *places);
    job.places = places;
    for (size_t run = 0; run < n_runs(&job); run++)
        places[run + 1].run_m *= exp(0.2 * theta[(size_t)map->runs + run]);
    for (size_t i = 0; i < cable.n_sizes; i++) {
        if (fabs(cable.sizes[i].mm2 - 2.5) < 0.01)
            cable.sizes[i].ohm_per_m *= exp(0.02 * theta[map->conductor[LINE]]);
        if (fabs(cable.sizes[i].mm2 - 1.5) < 0.01)
            cable.sizes[i].ohm_per_m *= exp(0.02 * theta[map->conductor[CPC]]);
    }
    if (hypothesis->n_faults > 0 && bench->parameter_of[0] != NO_PARAMETER) {
        struct lognormal prior =
            models_family(models, hypothesis->faults[0].family->name)->parameter;
        value = prior.median * exp(prior.sigma * theta[bench->parameter_of[0]]);
        /* A joint's ohms are its own: the conductor's factor is not on them. */
    }
    ck_assert_int_eq(forward_analyse(forward, &bench->wiring), RF_OK);
    ck_assert_int_eq(forward_evaluate(forward, theta), RF_OK);
    for (size_t i = 0; i < forward_measurements(forward); i++) {
        const struct measurement *m = forward_measurement(forward, i);
        struct plain plain;
        int a, b;
        if (!forward_reachable(forward, i) || m->spot == SPOT_HIGHEST)
            continue;
        plain_state(&plain, &job, &cable, hypothesis, value, setups[m->setup].name);
        plain_probe(&plain, spot_keys[m->spot], m->place, &a, &b);
        double mean = exp(0.01 * theta[map->gain]) * nodal_resistance(&plain, a, b) +
                      0.01 * theta[map->lead] + plain_offset(&plain);
        if (m->spot == SPOT_POINT)
            mean += 0.01 * theta[map->face];
        ck_assert_double_eq_tol(forward_mean(forward, i), mean, 1e-6);
    }
}

START_TEST(means_are_those_of_the_plain_network)
{
    gsl_rng *generator = gsl_rng_alloc(gsl_rng_mt19937);
    struct truth *truth = simulate_case((size_t)_i);
    struct bench bench;
    bench_init(&bench, truth->job);
    bench_wire(&bench, &truth->hypothesis);
    for (int repeat = 0; repeat < 3; repeat++)
        compare_means(&bench, &truth->hypothesis, generator);
    bench_finish(&bench);
    truth_destroy(truth);
    gsl_rng_free(generator);
}
END_TEST

/* --- the sampler --- */

enum { CENTRES = 3, D_MOST = 16, FREEDOM = 5 };

struct cloud {
    double centre[D_MOST];
    gsl_matrix *factor; /* lower, of the precision */
    double log_scale;
};

/* Student's t around where a fit ended; its precision that of the fit. False: as one before. */
static void take_cloud(struct cloud *cloud, const struct fit *fit)
{
    size_t d = fit->n_parameters;
    cloud->factor = gsl_matrix_calloc(d, d);
    cloud->log_scale = gsl_sf_lngamma((FREEDOM + (double)d) / 2) - gsl_sf_lngamma(FREEDOM / 2.0) -
                       (double)d / 2 * log(FREEDOM * M_PI);
    for (size_t j = 0; j < d; j++) {
        cloud->centre[j] = fit->theta[j];
        for (size_t k = 0; k <= j; k++)
            gsl_matrix_set(cloud->factor, j, k,
                           j == k ? 1 / fit->factor[j * fit->stride + j]
                                  : fit->factor[k * fit->stride + j]);
        cloud->log_scale += log(gsl_matrix_get(cloud->factor, j, j));
    }
}

static double cloud_log_density(const struct cloud *cloud, const double *theta, size_t d)
{
    double square = 0;
    for (size_t j = 0; j < d; j++) {
        double sum = 0; /* (Lᵀ x)_j */
        for (size_t k = j; k < d; k++)
            sum += gsl_matrix_get(cloud->factor, k, j) * (theta[k] - cloud->centre[k]);
        square += sum * sum;
    }
    return cloud->log_scale - (FREEDOM + (double)d) / 2 * log1p(square / FREEDOM);
}

static void cloud_draw(const struct cloud *cloud, gsl_rng *generator, double *theta, size_t d)
{
    gsl_vector_view x = gsl_vector_view_array(theta, d);
    for (size_t j = 0; j < d; j++)
        theta[j] = gsl_ran_gaussian_ziggurat(generator, 1);
    gsl_blas_dtrsv(CblasLower, CblasTrans, CblasNonUnit, cloud->factor, &x.vector);
    double stretch = sqrt(FREEDOM / gsl_ran_chisq(generator, FREEDOM));
    for (size_t j = 0; j < d; j++)
        theta[j] = cloud->centre[j] + stretch * theta[j];
}

static double log_add(double a, double b)
{
    double larger = fmax(a, b);
    return isfinite(larger) ? larger + log(exp(a - larger) + exp(b - larger)) : larger;
}

struct integral {
    double log_z, error; /* of log_z, one standard deviation */
};

/* Clouds of equal shares in what the prior leaves. */
static struct integral sample(struct bench *bench, const struct cloud clouds[], size_t n_clouds,
                              size_t d, size_t n, gsl_rng *generator)
{
    const double prior_share = 0.1, cloud_share = 0.9 / (double)n_clouds;
    double top = -INFINITY, sum = 0, squares = 0, theta[D_MOST];
    for (size_t i = 0; i < n; i++) {
        double u = gsl_rng_uniform(generator);
        if (u < prior_share)
            for (size_t j = 0; j < d; j++)
                theta[j] = gsl_ran_gaussian_ziggurat(generator, 1);
        else
            cloud_draw(&clouds[(size_t)((u - prior_share) / cloud_share) % n_clouds], generator,
                       theta, d);
        double log_q = log(prior_share) + log_prior(theta, d);
        for (size_t c = 0; c < n_clouds; c++)
            log_q = log_add(log_q, log(cloud_share) + cloud_log_density(&clouds[c], theta, d));
        double log_w = log_joint(bench, theta, d) - log_q;
        if (log_w > top) {
            sum *= exp(top - log_w);
            squares *= exp(2 * (top - log_w));
            top = log_w;
        }
        sum += exp(log_w - top);
        squares += exp(2 * (log_w - top));
    }
    double mean = sum / (double)n;
    return (struct integral){top + log(mean),
                             sqrt((squares / (double)n - mean * mean) / (double)n) / mean};
}

/* By Laplace (*log_evidence) and by sampling, n at a time until the error is below `wanted` or as
 * many as `most_samples` are drawn. */
static struct integral integrate(struct bench *bench, const struct hypothesis *hypothesis,
                                 double wanted, double *log_evidence)
{
    const size_t most_samples = 128000;
    gsl_rng *generator = gsl_rng_alloc(gsl_rng_mt19937);
    struct cloud clouds[CENTRES];
    double start[D_MOST] = {0};
    struct fit fit = bench_fit(bench, hypothesis);
    size_t d = fit.n_parameters, n_clouds = 0;
    ck_assert_uint_le(d, D_MOST);
    *log_evidence = fit.log_evidence;
    take_cloud(&clouds[n_clouds++], &fit);
    int parameter = hypothesis->n_faults > 0 ? bench->parameter_of[0] : NO_PARAMETER;
    for (double at = -2; parameter != NO_PARAMETER && at < 3; at += 4) {
        start[parameter] = at;
        ck_assert_int_eq(fitter_fit(bench->fitter, &bench->wiring, start, &fit), RF_OK);
        take_cloud(&clouds[n_clouds++], &fit);
    }
    struct integral integral;
    size_t n = 4000;
    do {
        gsl_rng_set(generator, 7);
        integral = sample(bench, clouds, n_clouds, d, n, generator);
        n *= 4;
    } while (integral.error > wanted && n <= most_samples);
    for (size_t c = 0; c < n_clouds; c++)
        gsl_matrix_free(clouds[c].factor);
    gsl_rng_free(generator);
    return integral;
}

/* --- the sampler against quadrature --- */

/* One point, runs of 9 and 14 m of 7.41 mΩ/m (IEC 60228, 2.5 mm²): all that has a spread is a
 * joint in the neutral, and the lead's offset where `lead` says so. */
struct few_parameters {
    double lead_sigma;
    double lead; /* θ */
    bool joint;
    gsl_integration_workspace *inner;
};
static const double r_line = 23 * 0.00741;
static const double read_l = 0.19, read_n = 0.83, read_cross = 0.26;

static double density_of_joint(double theta, void *context)
{
    const struct few_parameters *f = context;
    double joint = f->joint ? 0.5 * exp(theta) : 0, lead = f->lead_sigma * f->lead;
    double r1 = r_line, rn = r_line + joint;
    /* Crossed, at the board: the line's whole length against the neutral's, end to end. */
    double cross = r1 * rn / (r1 + rn);
    double log_p = log_likelihood(read_l, r1 + lead) + log_likelihood(read_n, rn + lead) +
                   log_likelihood(read_cross, cross + lead);
    return exp(log_p - theta * theta / 2) / sqrt(2 * M_PI);
}

static double density_of_lead(double theta, void *context)
{
    struct few_parameters *f = context;
    double result, error;
    gsl_function function = {density_of_joint, f};
    f->lead = theta;
    ck_assert_int_eq(
        gsl_integration_qags(&function, -9, 9, 0, 1e-8, 200, f->inner, &result, &error), 0);
    return result * exp(-theta * theta / 2) / sqrt(2 * M_PI);
}

static double quadrature(double lead_sigma, bool joint)
{
    double result, error;
    struct few_parameters few_left = {.lead_sigma = lead_sigma, .joint = joint};
    gsl_integration_workspace *outer = gsl_integration_workspace_alloc(200);
    few_left.inner = gsl_integration_workspace_alloc(200);
    gsl_function function = {density_of_lead, &few_left};
    ck_assert_int_eq(gsl_integration_qags(&function, -9, 9, 0, 1e-6, 200, outer, &result, &error),
                     0);
    gsl_integration_workspace_free(outer);
    gsl_integration_workspace_free(few_left.inner);
    return log(result);
}

START_TEST(sampler_agrees_with_quadrature)
{
    static const struct {
        double lead_sigma;
        const char *fault;
    } rows[] = {
        {1e-6, "\"family\": \"joint\", \"run\": [\"P1\", \"in\"], \"conductor\": \"N\""},
        {0.01, "\"family\": \"joint\", \"run\": [\"P1\", \"in\"], \"conductor\": \"N\""},
        {0.03, "\"family\": \"joint\", \"run\": [\"out\", \"P1\"], \"conductor\": \"N\""},
        {0.03, ""},
    };
    struct rf_job *job = job_of("\"length_accuracy\": 0.000001, \"points\": [{\"id\": \"P1\","
                                "\"run_m\": 9}], \"last_run_m\": 14",
                                "\"end_to_end\": {\"l\": 0.19, \"n\": 0.83},"
                                "\"cross_ln\": {\"board\": 0.26}",
                                "");
    models->conductor_sigma = models->instrument.gain_sigma = 1e-9;
    models->instrument.lead_sigma = rows[_i].lead_sigma;
    struct bench bench;
    double laplace;
    bench_init(&bench, job);
    struct hypothesis hypothesis = hypothesis_of(job, rows[_i].fault);
    struct integral sampled = integrate(&bench, &hypothesis, 0.01, &laplace);
    double exact = quadrature(rows[_i].lead_sigma, *rows[_i].fault != '\0');
    printf("quadrature %.4f, sampled %.4f ± %.4f, Laplace %.4f\n", exact, sampled.log_z,
           sampled.error, laplace);
    ck_assert_double_lt(sampled.error, 0.02);
    ck_assert_double_le(fabs(sampled.log_z - exact), 5 * sampled.error);
    bench_finish(&bench);
    rf_job_destroy(job);
}
END_TEST

/* --- Laplace against the sampler --- */

static size_t compare_case(size_t i, double difference[], double error[])
{
    struct truth *truth = simulate_case(i);
    struct rf_diagnosis *diagnosis;
    struct rf_error refused;
    struct bench bench;
    ck_assert_msg(rf_diagnose(truth->job, models, &diagnosis, &refused) == RF_OK, "%s",
                  refused.text);
    bench_init(&bench, truth->job);
    size_t n = diagnosis->n_ranked < RANKED_TRIED ? diagnosis->n_ranked : RANKED_TRIED;
    for (size_t k = 0; k < n; k++) {
        double laplace;
        struct integral integral =
            integrate(&bench, &diagnosis->ranked[k].hypothesis, 0.01, &laplace);
        difference[k] = fabs(laplace - integral.log_z);
        error[k] = integral.error;
        if (difference[k] > 0.5)
            printf("  %s: Laplace %.2f, sampled %.2f ± %.2f\n", diagnosis->ranked[k].words,
                   laplace, integral.log_z, integral.error);
    }
    bench_finish(&bench);
    rf_diagnosis_destroy(diagnosis);
    truth_destroy(truth);
    return n;
}

START_TEST(laplace_agrees_with_integration)
{
    double difference[N_CASES * RANKED_TRIED], error[N_CASES * RANKED_TRIED];
    size_t n = 0;
    for (size_t i = 0; i < N_CASES; i++)
        n += compare_case(i, difference + n, error + n);
    gsl_sort(difference, 1, n);
    gsl_sort(error, 1, n);
    double median = gsl_stats_median_from_sorted_data(difference, 1, n);
    printf("log Z of %zu fits, Laplace against integration: median difference %.3f, 90th percentile "
           "%.3f, largest %.3f; the integration's own error: median %.3f, largest %.3f\n",
           n, median, gsl_stats_quantile_from_sorted_data(difference, 1, n, 0.9),
           difference[n - 1], gsl_stats_median_from_sorted_data(error, 1, n), error[n - 1]);
    ck_assert_uint_ge(n, 50);
    ck_assert_double_lt(gsl_stats_quantile_from_sorted_data(error, 1, n, 0.9), 0.05);
    ck_assert_double_le(median, 0.15);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("evidence");
    TCase *tests = tcase_create("evidence");
    suite_add_tcase(suite, tests);
    tcase_set_timeout(tests, 100);
    tcase_add_checked_fixture(tests, load_models, unload_models);
    tcase_add_loop_test(tests, means_are_those_of_the_plain_network, 0, N_CASES);
    tcase_add_loop_test(tests, sampler_agrees_with_quadrature, 0, 4);
    tcase_add_test(tests, laplace_agrees_with_integration);
    return run_suite(suite);
}
