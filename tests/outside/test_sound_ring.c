/* SPDX-License-Identifier: GPL-3.0-or-later */

/*
 * Rules of the trade through a whole diagnosis. Common practice, no source: end-to-end line and
 * neutral within 0.05 Ω of one another, and crossed readings 0.02 Ω either side of the expected
 * value, are a ring without a defect; a spur reads higher than the ring in both crossed tests. The
 * rings and readings are invented.
 */

#include "diagnosis/diagnosis.h"

#include "../hypotheses.h"

#include <math.h>

/* 40 m and 64 m of 2.5 mm² with a 1.5 mm² CPC: by IEC 60228 0.296 Ω and 0.474 Ω of line, 0.484 Ω
 * and 0.774 Ω of CPC end to end. */
static const char *const rings[] = {
    "\"points\": [{\"id\": \"P1\", \"run_m\": 8}, {\"id\": \"P2\", \"run_m\": 8},"
    "{\"id\": \"P3\", \"run_m\": 8}, {\"id\": \"P4\", \"run_m\": 8}], \"last_run_m\": 8,"
    "\"spurs\": [{\"id\": \"S1\", \"from\": \"P2\", \"run_m\": 6}]",
    "\"points\": [{\"id\": \"P1\", \"run_m\": 16}, {\"id\": \"P2\", \"run_m\": 10},"
    "{\"id\": \"P3\", \"run_m\": 14}, {\"id\": \"P4\", \"run_m\": 12}], \"last_run_m\": 12,"
    "\"spurs\": [{\"id\": \"S1\", \"from\": \"P2\", \"run_m\": 6}]",
};
static const double metres[] = {40, 64}, spur_metres = 6;

/* How the readings leave the expected values. Ω, within the rule. */
static const struct {
    double neutral;    /* what the neutral reads above the line */
    double crossed[5]; /* board, P1 to P4 */
    bool all_at_the_edge;
} patterns[] = {
    {0, {0, 0, 0, 0, 0}, false},
    {0.05, {0.01, -0.01, 0.01, 0, -0.01}, false},
    {-0.05, {0, 0.02, 0, -0.02, 0}, false},
    {0.02, {0.02, 0.02, 0.02, 0.02, 0.02}, false},
    {-0.02, {-0.02, -0.02, -0.02, -0.02, -0.02}, false},
    {0.03, {0.02, -0.02, 0.02, -0.02, 0.02}, true},
    {0, {-0.02, -0.01, 0, 0.01, 0.02}, false},
};
enum { N_PATTERNS = sizeof patterns / sizeof *patterns };

/* Readings around what equal conductors read: (r1 + rn)/4 crossed, and for line and CPC their mean
 * value around r1·r2/(r1 + r2) at the board to (r1 + r2)/4 mid-ring, by where the point is. */
static void write_readings(char *text, size_t room, size_t ring, size_t pattern, double spur_adds)
{
    double r1 = 0.00741 * metres[ring], r2 = 0.0121 * metres[ring];
    double rn = r1 + patterns[pattern].neutral, ln = (r1 + rn) / 4;
    static const double shares[2][5] = {{0, 0.2, 0.4, 0.6, 0.8},
                                        {0, 0.25, 0.40625, 0.625, 0.8125}};
    const double *off = patterns[pattern].crossed;
    double le[5];
    for (size_t i = 0; i < 5; i++) {
        double x = shares[ring][i];
        le[i] = (r1 * r2 + (x - x * x) * (r1 - r2) * (r1 - r2)) / (r1 + r2);
    }
    snprintf(text, room,
             "\"end_to_end\": {\"l\": %.2f, \"n\": %.2f, \"e\": %.2f}, \"cross_ln\": {\"board\": %.2f,"
             "\"P1\": %.2f, \"P2\": %.2f, \"P3\": %.2f, \"P4\": %.2f, \"S1\": %.2f}, \"cross_le\":"
             "{\"board\": %.2f, \"P1\": %.2f, \"P2\": %.2f, \"P3\": %.2f, \"P4\": %.2f, \"S1\": "
             "%.2f}",
             r1, rn, r2, ln + off[0], ln + off[1], ln + off[2], ln + off[3], ln + off[4],
             ln + off[2] + spur_adds * 2 * 0.00741, le[0] - off[4], le[1] + off[3], le[2] - off[2],
             le[3] + off[1], le[4] + off[0], le[2] - off[2] + spur_adds * (0.00741 + 0.0121));
}

static struct rf_diagnosis *diagnose_text(struct rf_job *job)
{
    struct rf_diagnosis *diagnosis;
    struct rf_error error;
    ck_assert_msg(rf_diagnose(job, models, &diagnosis, &error) == RF_OK, "%s", error.text);
    return diagnosis;
}

START_TEST(within_the_rule_there_is_no_defect)
{
    char readings[512];
    bool flag;
    size_t ring = (size_t)_i / N_PATTERNS, pattern = (size_t)_i % N_PATTERNS;
    write_readings(readings, sizeof readings, ring, pattern, spur_metres);
    struct rf_job *job = job_of(rings[ring], readings, "");
    struct rf_diagnosis *diagnosis = diagnose_text(job);
    double p = rf_diagnosis_misfit(diagnosis, &flag);
    printf("ring %zu, pattern %zu: %s %.3f, then %s %.3f; misfit p %.2f\n", ring, pattern,
           rf_diagnosis_family(diagnosis, 0), rf_diagnosis_confidence(diagnosis, 0),
           rf_diagnosis_family(diagnosis, 1), rf_diagnosis_confidence(diagnosis, 1), p);
    ck_assert_str_eq(rf_diagnosis_family(diagnosis, 0), "none");
    /* All readings at the rule's very edge, by turns above and below: hardly a ring and a meter of
     * this noise give that: the misfit test may say so (1 in 30 would be as far out). */
    ck_assert(!flag || patterns[pattern].all_at_the_edge);
    ck_assert_uint_eq(diagnosis->n_suspects, 0);
    rf_diagnosis_destroy(diagnosis);
    rf_job_destroy(job);
}
END_TEST

/* The other side of the rule: neutral 0.3 Ω above the line with the crossed readings that makes,
 * or one point reading 0.15 Ω above the rest, is no such ring. */
START_TEST(beyond_the_rule_there_is_one)
{
    static const char *const readings[] = {
        "\"end_to_end\": {\"l\": 0.30, \"n\": 0.60, \"e\": 0.48}, \"cross_ln\": {\"board\": 0.20,"
        "\"P1\": 0.21, \"P2\": 0.22, \"P3\": 0.23, \"P4\": 0.22}",
        "\"end_to_end\": {\"l\": 0.30, \"n\": 0.30, \"e\": 0.48}, \"cross_ln\": {\"board\": 0.15,"
        "\"P1\": 0.15, \"P2\": 0.15, \"P3\": [0.30, 0.31], \"P4\": 0.15}",
    };
    struct rf_job *job = job_of(rings[0], readings[_i], "");
    struct rf_diagnosis *diagnosis = diagnose_text(job);
    ck_assert_str_ne(rf_diagnosis_family(diagnosis, 0), "none");
    for (size_t i = 0; i < rf_diagnosis_faults(diagnosis); i++)
        if (strcmp(rf_diagnosis_family(diagnosis, i), "none") == 0)
            ck_assert_double_lt(rf_diagnosis_confidence(diagnosis, i), 0.05);
    rf_diagnosis_destroy(diagnosis);
    rf_job_destroy(job);
}
END_TEST

/* A spur on record that reads higher in both tests is as it should be; the same readings on a point
 * of the ring are a spur not on record, and that is said. */
START_TEST(a_spur_reads_higher)
{
    static const char on_the_ring[] =
        "\"points\": [{\"id\": \"P1\", \"run_m\": 8}, {\"id\": \"P2\", \"run_m\": 8},"
        "{\"id\": \"S1\", \"run_m\": 2}, {\"id\": \"P3\", \"run_m\": 6}, {\"id\": \"P4\", \"run_m\":"
        "8}], \"last_run_m\": 8";
    char readings[512];
    write_readings(readings, sizeof readings, 0, 0, 10);
    struct rf_job *job = job_of(rings[0], readings, "");
    struct rf_diagnosis *diagnosis = diagnose_text(job);
    ck_assert_str_eq(rf_diagnosis_family(diagnosis, 0), "none");
    rf_diagnosis_destroy(diagnosis);
    rf_job_destroy(job);
    job = job_of(on_the_ring, readings, "");
    diagnosis = diagnose_text(job);
    ck_assert_str_eq(rf_diagnosis_family(diagnosis, 0), "spur");
    const struct fault *spur = &diagnosis->ranked[0].hypothesis.faults[0];
    ck_assert_uint_eq(spur->chain_length, 1);
    ck_assert_uint_eq(spur->chain[0], job_find_place(job, "S1"));
    rf_diagnosis_destroy(diagnosis);
    rf_job_destroy(job);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("sound ring");
    TCase *tests = tcase_create("sound ring");
    suite_add_tcase(suite, tests);
    tcase_add_checked_fixture(tests, load_models, unload_models);
    tcase_add_loop_test(tests, within_the_rule_there_is_no_defect, 0, 2 * N_PATTERNS);
    tcase_add_loop_test(tests, beyond_the_rule_there_is_one, 0, 2);
    tcase_add_test(tests, a_spur_reads_higher);
    return run_suite(suite);
}
