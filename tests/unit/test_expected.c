/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What a ring wired as recorded would read: against formulas worked out by hand, and the range
 * against its parts. The rings are invented. */
#include "fit/expected.h"

#include "../suite.h"

#include <check.h>
#include <math.h>
#include <stdio.h>
#include <string.h>

static struct rf_models *models;

static void start(void)
{
    struct rf_error error;
    ck_assert_msg(rf_models_load(NULL, RF_RATES_CONSULTED, &models, &error) == RF_OK, "%s",
                  error.text);
}

static void finish(void)
{
    rf_models_destroy(models);
}

/* Four runs; `run` and `ends` go into the text as they stand. */
static struct rf_job *ring_of(const char *run, const char *ends)
{
    char text[1024];
    struct rf_job *job = NULL;
    struct rf_error error;
    snprintf(
        text, sizeof text,
        "{\"format\": \"ringfettle-job/1\", \"ring\": {\"points\": [{\"id\": \"P1\", \"run_m\": "
        "%s},"
        "{\"id\": \"P2\", \"run_m\": %s}, {\"id\": \"P3\", \"run_m\": %s}], \"last_run_m\": %s},"
        "\"readings\": {%s \"cross_le\": {\"P1\": 0.3}}}",
        run, run, run, run, ends);
    ck_assert_msg(rf_job_parse(text, strlen(text), "ring", &job, &error) == RF_OK, "%s",
                  error.text);
    return job;
}

static struct expected expect_one(const struct rf_job *job, bool given_ends, const char *setup,
                                  enum spot spot, size_t place, bool left_out[N_CONDUCTORS])
{
    const struct measurement at = {.setup = setup_find(setup), .spot = spot, .place = place};
    struct expected expected;
    struct rf_error error;
    ck_assert_msg(expect_readings(job, models, given_ends, &at, 1, &expected, left_out, &error) ==
                      RF_OK,
                  "%s", error.text);
    return expected;
}

/* 4 × 10 m at 7.41 mΩ/m (IEC 60228, 2.5 mm²) end to end, half of it crossed at a point (equal
 * conductors: (r1 + rn)/4). */
START_TEST(by_the_record)
{
    struct rf_job *job = ring_of("10", "");
    struct expected r1 = expect_one(job, false, "end_to_end", SPOT_L, 0, NULL);
    ck_assert_double_eq_tol(r1.ohms, 0.2964, 1e-4);
    ck_assert_double_eq_tol(expect_one(job, false, "cross_ln", SPOT_POINT, 2, NULL).ohms, 0.1482,
                            1e-4);
    ck_assert(expect_one(job, false, "apart_ln", SPOT_OUT, 0, NULL).open);
    /* Four runs of 20 %, 2 % of conductor, 1 % of gain, 0.01 Ω of lead; then the reading's noise,
     * 0.015 Ω, 1.5 %, and its step: two σ, on the log scale above. */
    double wiring = hypot(0.2964 * hypot(0.2 / sqrt(4), hypot(0.02, 0.01)), 0.01);
    double noise = sqrt(0.015 * 0.015 + 0.0044 * 0.0044 + 0.0001 / 12);
    double high = 0.2964 + hypot(0.2964 * expm1(2 * wiring / 0.2964), 2 * noise);
    ck_assert_double_eq_tol(r1.high, high, 5e-4);
    rf_job_destroy(job);
}
END_TEST

/* Nothing recorded: the ends say what the crossed test will read, and narrowly. */
START_TEST(given_the_ends)
{
    struct rf_job *job = ring_of("null", "\"end_to_end\": {\"l\": 0.60, \"n\": 0.60},");
    bool left_out[N_CONDUCTORS];
    struct expected wide = expect_one(job, false, "cross_ln", SPOT_POINT, 2, NULL);
    struct expected narrow = expect_one(job, true, "cross_ln", SPOT_POINT, 2, left_out);
    ck_assert_double_eq_tol(narrow.ohms, 0.30, 0.01);
    ck_assert_double_lt(narrow.high - narrow.low, 0.1);
    ck_assert_double_gt(wide.high - wide.low, 0.1);
    ck_assert(!left_out[LINE] && !left_out[NEUTRAL] && !left_out[CPC]);
    ck_assert_double_gt(wide.low, 0);
    rf_job_destroy(job);
}
END_TEST

/* A neutral far above the line is not what such a ring reads, and is named. */
START_TEST(leaves_out_what_does_not_go_together)
{
    struct rf_job *job = ring_of("10", "\"end_to_end\": {\"l\": 0.30, \"n\": 1.40, \"e\": 0.48},");
    bool left_out[N_CONDUCTORS];
    struct expected crossed = expect_one(job, true, "cross_ln", SPOT_POINT, 2, left_out);
    ck_assert(!left_out[LINE] && left_out[NEUTRAL] && !left_out[CPC]);
    ck_assert_double_eq_tol(crossed.ohms, 0.15, 0.01);
    rf_job_destroy(job);
}
END_TEST

/* Over range end to end says nothing of lengths: as by the record. */
START_TEST(passes_over_what_is_over_range)
{
    struct rf_job *job = ring_of("10", "\"end_to_end\": {\"l\": \"open\"},");
    ck_assert(!has_end_to_end(job));
    struct expected given = expect_one(job, true, "cross_ln", SPOT_BOARD, 0, NULL);
    struct expected record = expect_one(job, false, "cross_ln", SPOT_BOARD, 0, NULL);
    ck_assert_double_eq(given.ohms, record.ohms);
    ck_assert_double_eq(given.high, record.high);
    rf_job_destroy(job);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("expected");
    TCase *cases = tcase_create("expected");
    suite_add_tcase(suite, cases);
    tcase_add_checked_fixture(cases, start, finish);
    tcase_add_test(cases, by_the_record);
    tcase_add_test(cases, given_the_ends);
    tcase_add_test(cases, leaves_out_what_does_not_go_together);
    tcase_add_test(cases, passes_over_what_is_over_range);
    return run_suite(suite);
}
