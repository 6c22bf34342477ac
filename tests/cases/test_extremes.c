/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * Jobs at the ends of what the format allows: whatever was read, the answer is a sane one, a misfit
 * or a clear refusal, in bounded time. What counts as sane is an electrician's judgement, written
 * down in the table; common practice, no source. Rings and readings are invented.
 */
#include "advice/advice.h"
#include "diagnosis/diagnosis.h"
#include "fit/expected.h"
#include "report/page.h"
#include "report/report.h"

#include <ringfettle/review.h>

#include "../suite.h"
#include "extreme_jobs.h"

#include <cjson/cJSON.h>
#include <ctype.h>
#include <math.h>
#include <time.h>

/* Sanitizers make everything some ten times slower. */
#if defined(__SANITIZE_ADDRESS__)
#define SANITIZED 1
#elif defined(__has_feature)
#define SANITIZED __has_feature(address_sanitizer)
#else
#define SANITIZED 0
#endif

/* Points of the largest rings tried; processor time that a diagnosis with its plan may take, on any
 * machine and beside other work, on the largest and on all others. */
enum {
    LARGEST_RING = SANITIZED ? 30 : 200,
    LARGE_RING = SANITIZED ? 20 : 60,
    SECONDS_MOST_LARGEST = 600,
    SECONDS_MOST = 60
};
/* Points of the ring on which the most readings a job may have are repeats. */
enum { REPEATED_RING = 5 };

/* --- what must hold of any answer --- */

static void check_estimate(const struct estimate *e, const char *what)
{
    if (e->known)
        ck_assert_msg(e->low > 0 && e->low <= e->value && e->value <= e->high && isfinite(e->high),
                      "%s: %g, %g, %g", what, e->low, e->value, e->high);
}

static void check_chances(const struct rf_diagnosis *d, const char *what)
{
    double sum = 0, findings = 0;
    for (size_t i = 0; i < d->n_ranked; i++) {
        ck_assert_msg(d->ranked[i].confidence > 0 && isfinite(d->ranked[i].log_evidence), "%s: %zu",
                      what, i);
        for (size_t k = 0; k < FAULTS_AT_ONCE; k++)
            check_estimate(&d->ranked[i].estimates[k], what);
        sum += d->ranked[i].confidence;
    }
    for (size_t i = 0; i < d->n_findings; i++)
        findings += d->findings[i].confidence;
    double unlisted = confidence_shown * (double)(d->n_hypotheses - d->n_ranked);
    ck_assert_msg(sum < 1 + 1e-9 && sum + unlisted > 1 - 1e-9, "%s: sum %.12f", what, sum);
    ck_assert_msg(fabs(findings - sum) < 1e-9, "%s: findings %.12f of %.12f", what, findings, sum);
    for (size_t i = 0; i < d->n_places; i++)
        ck_assert_msg(d->places[i].chance >= 0 && d->places[i].chance < 1 + 1e-9, "%s", what);
    for (size_t i = 0; i < N_DANGERS; i++)
        ck_assert_msg(d->dangers[i].chance >= 0 && d->dangers[i].chance < 1 + 1e-9, "%s", what);
    ck_assert_msg(d->misfit.p >= 0 && d->misfit.p <= 1, "%s: %g", what, d->misfit.p);
}

/* cJSON writes null for what is no number. */
static void check_json_value(const cJSON *value, const char *what)
{
    ck_assert_msg(!cJSON_IsNull(value), "%s: null at %s", what,
                  value->string != NULL ? value->string : "an element");
    const cJSON *child;
    cJSON_ArrayForEach(child, value)
        check_json_value(child, what);
}

static bool says_word(const char *text, const char *word)
{
    size_t length = strlen(word);
    for (const char *at = text; (at = strstr(at, word)) != NULL; at += length) {
        bool begins = at == text || !isalpha((unsigned char)at[-1]);
        if (begins && !isalpha((unsigned char)at[length]))
            return true;
    }
    return false;
}

static void check_words(const struct text *text, const char *what)
{
    ck_assert(!text->failed && text->bytes != NULL);
    ck_assert_msg(text_is_utf8(text->bytes, text->length, NULL), "%s", what);
    ck_assert_msg(!says_word(text->bytes, "nan") && !says_word(text->bytes, "inf"), "%s:\n%s", what,
                  text->bytes);
}

static void check_reports(const struct rf_diagnosis *d, const struct rf_advice *advice,
                          const char *what)
{
    struct text text = {0}, json = {0}, page = {0};
    struct rf_error error;
    report_text(d, advice, &text);
    report_json(d, advice, &json);
    ck_assert_msg(report_page(d, advice, &page, &error) == RF_OK, "%s: %s", what, error.text);
    check_words(&text, what);
    check_words(&page, what);
    cJSON *parsed = cJSON_Parse(json.bytes);
    ck_assert_msg(parsed != NULL, "%s", what);
    check_json_value(parsed, what);
    if (d->misfit.flag)
        ck_assert_msg(strstr(text.bytes, "NO ONE DEFECT EXPLAINS THESE READINGS") != NULL, "%s",
                      what);
    cJSON_Delete(parsed);
    text_finish(&text);
    text_finish(&json);
    text_finish(&page);
}

static void check_advice(const struct rf_diagnosis *d, const char *what)
{
    struct rf_advice *advice;
    struct rf_error error;
    ck_assert_msg(rf_advise(d, &advice, &error) == RF_OK, "%s: %s", what, error.text);
    ck_assert_msg(isfinite(advice->look_now) && advice->look_now >= 0, "%s", what);
    ck_assert_msg(isfinite(advice->measure_first) && advice->measure_first >= 0, "%s", what);
    ck_assert_msg(advice->n_plans > 0 || advice->stop, "%s", what);
    check_reports(d, advice, what);
    rf_advice_destroy(advice);
}

static void check_expected(const struct rf_job *job, const char *what)
{
    const struct reading *first = &job->readings[0];
    const struct measurement m = {first->setup, first->spot, first->place};
    struct expected expected;
    struct rf_error error;
    for (int given_ends = 0; given_ends < 2; given_ends++) {
        bool left_out[N_CONDUCTORS] = {false};
        ck_assert_msg(expect_readings(job, models, given_ends && has_end_to_end(job), &m, 1,
                                      &expected, left_out, &error) == RF_OK,
                      "%s: %s", what, error.text);
        ck_assert_msg(expected.open || (expected.low >= 0 && expected.low <= expected.ohms &&
                                        expected.ohms <= expected.high && isfinite(expected.high)),
                      "%s: %g, %g, %g", what, expected.low, expected.ohms, expected.high);
    }
}

/* Diagnoses and checks all of that, and the time. The caller destroys it. */
static struct rf_diagnosis *answer_of(const struct rf_job *job, const char *what)
{
    struct rf_diagnosis *d;
    struct rf_error error;
    clock_t start = clock();
    ck_assert_msg(rf_diagnose(job, models, &d, &error) == RF_OK, "%s: %s", what, error.text);
    check_chances(d, what);
    check_advice(d, what);
    check_expected(job, what);
    double seconds = (double)(clock() - start) / CLOCKS_PER_SEC;
    if (getenv("EXTREMES_TIMES") != NULL)
        fprintf(stderr, "%7.2f s  %s%s  %s\n", seconds, what, d->misfit.flag ? ": misfit" : "",
                rf_diagnosis_words(d, 0));
    double most = job->n_places > LARGE_RING + 10 ? SECONDS_MOST_LARGEST : SECONDS_MOST;
    ck_assert_msg(seconds < most, "%s: %.1f s", what, seconds);
    return d;
}

static double share_of(const struct rf_diagnosis *d, const char *families)
{
    double sum = 0;
    for (size_t i = 0; i < d->n_ranked; i++)
        if (names_set_up(families, rf_diagnosis_family(d, i)))
            sum += d->ranked[i].confidence;
    return sum;
}

/* --- readings nobody would believe --- */

static const struct extreme_ring one_point = {.points = 1, .run_m = 5},
                                 six = {.points = 6, .run_m = 5},
                                 short_runs = {.points = 6, .run_m = 0.1},
                                 long_runs = {.points = 6, .run_m = 500},
                                 mixed_runs = {.points = 6, .run_m = 0.1, .other_m = 500},
                                 unknown_runs = {.points = 6},
                                 deep = {.points = 3, .run_m = 3, .spurs = 10, .chain = true},
                                 bushy = {.points = 3, .run_m = 3, .spurs = 6},
                                 long_ids = {.points = 6,
                                             .run_m = 5,
                                             .id_prefix = "ééééééééééééééééééééééééééééé"};

static const struct {
    const char *what;
    const struct extreme_ring *ring;
    const char *set_ups;
    value_of_reading *value;
    const char *sane; /* families that make sense of it, together above 95 %; NULL: a misfit */
} extremes[] = {
    /* Nothing has a path: the legs are not there, or no cable goes all the way round. */
    {"all over range", &six, standard_plan, value_open, "wrong_leg break"},
    {"all over range, end to end", &six, "end_to_end", value_open, "wrong_leg break"},
    {"all over range, crossed", &six, "cross_ln", value_open, "wrong_leg break transposed"},
    {"all over range, from the lead", &six, "lead_out_l", value_open, "wrong_leg break transposed"},
    {"all over range, one point", &one_point, standard_plan, value_open, "wrong_leg break"},
    {"all over range, 0.1 m", &short_runs, standard_plan, value_open, "wrong_leg break"},
    {"all over range, 0.1 and 500 m", &mixed_runs, standard_plan, value_open, "wrong_leg break"},
    {"all over range, deep spur", &deep, standard_plan, value_open, "wrong_leg break"},
    {"all over range, many spurs on a point", &bushy, standard_plan, value_open, "wrong_leg break"},
    {"all over range, lengths unknown", &unknown_runs, standard_plan, value_open,
     "wrong_leg break"},
    /* One leg alone, or one break, leaves paths in some set-up. */
    {"all over range, every set-up", &six, "*", value_open, NULL},
    {"all over range, every set-up, one point", &one_point, "*", value_open, NULL},
    /* The ends apart are to be over range: nothing is wrong, and nothing more is known. */
    {"apart over range", &six, "apart_ln apart_le apart_ne", value_open, ""},
    /* 0.00 Ω all round is what a ring of 0.7 m reads, and no other. */
    {"all zero", &six, standard_plan, value_zero, NULL},
    {"all zero, end to end", &six, "end_to_end", value_zero, NULL},
    {"all zero, every set-up", &six, "*", value_zero, NULL},
    {"all zero, every set-up, one point", &one_point, "*", value_zero, NULL},
    {"all zero, apart", &six, "apart_ln apart_le apart_ne", value_zero, NULL},
    {"all zero, 0.1 and 500 m", &mixed_runs, standard_plan, value_zero, NULL},
    {"all zero, 500 m", &long_runs, standard_plan, value_zero, NULL},
    {"all zero, deep spur", &deep, standard_plan, value_zero, NULL},
    {"all zero, 0.1 m", &short_runs, standard_plan, value_zero, ""},
    /* Some metres of thicker cable, recorded too long, are within a meter's error of nothing. */
    {"all zero, one point", &one_point, standard_plan, value_zero, "size"},
    {"all zero, crossed", &six, "cross_ln", value_zero, "size"},
    /* A lead along which nothing is lost: every point is as good as at the board. */
    {"all zero, from the lead", &six, "lead_out_l", value_zero, "interconnection"},
    {"all 99.9", &six, standard_plan, value_high, NULL},
    {"all 99.9, every set-up", &six, "*", value_high, NULL},
    {"all 99.9, end to end", &six, "end_to_end", value_high, NULL},
    {"all 99.9, crossed", &six, "cross_ln", value_high, NULL},
    {"all 99.9, from the lead", &six, "lead_out_l", value_high, NULL},
    {"all 99.9, one point", &one_point, standard_plan, value_high, NULL},
    {"all 99.9, one point, every set-up", &one_point, "*", value_high, NULL},
    {"all 99.9, 0.1 m", &short_runs, standard_plan, value_high, NULL},
    {"all 99.9, 500 m", &long_runs, standard_plan, value_high, NULL},
    {"all 99.9, long ids", &long_ids, standard_plan, value_high, NULL},
    /* The same half ohm on everything is in the leads. */
    {"all half an ohm, 0.1 m", &short_runs, standard_plan, value_half, "not_nulled"},
    {"0 and 99.9 in turn", &six, standard_plan, value_extremes_in_turn, NULL},
    {"0 and 99.9 in turn, every set-up", &six, "*", value_extremes_in_turn, NULL},
    {"0 and 99.9 in turn, one point", &one_point, standard_plan, value_extremes_in_turn, NULL},
    {"contradictory", &six, standard_plan, value_contradictory, NULL},
    {"contradictory, every set-up", &six, "*", value_contradictory, NULL},
    {"contradictory, 500 m", &long_runs, standard_plan, value_contradictory, NULL},
    {"contradictory, many spurs on a point", &bushy, standard_plan, value_contradictory, NULL},
    {"contradictory, lengths unknown", &unknown_runs, standard_plan, value_contradictory, NULL},
    {"contradictory repeats", &six, standard_plan, value_contradictory_repeats, NULL},
};

START_TEST(answer_makes_sense_or_is_a_misfit)
{
    const char *what = extremes[_i].what;
    struct rf_job *job = extreme_job(extremes[_i].ring, extremes[_i].set_ups, extremes[_i].value);
    struct rf_diagnosis *d = answer_of(job, what);
    const char *sane = extremes[_i].sane;
    if (sane == NULL)
        ck_assert_msg(d->misfit.flag, "%s: p %g, %s", what, d->misfit.p, rf_diagnosis_words(d, 0));
    else if (*sane == '\0')
        ck_assert_msg(!d->misfit.flag && d->ranked[0].hypothesis.n_faults == 0, "%s: %s", what,
                      rf_diagnosis_words(d, 0));
    else
        ck_assert_msg(!d->misfit.flag && share_of(d, sane) > 0.95, "%s: p %g, %.3f, %s", what,
                      d->misfit.p, share_of(d, sane), rf_diagnosis_words(d, 0));
    rf_diagnosis_destroy(d);
    rf_job_destroy(job);
}
END_TEST

/* --- the meter before the ring --- */

static bool says_prove_the_meter(const struct extreme_ring *ring, const char *set_ups,
                                 value_of_reading *value)
{
    struct rf_job *job = extreme_job(ring, set_ups, value);
    struct rf_diagnosis *d;
    struct text text = {0};
    struct rf_error error;
    ck_assert_msg(rf_diagnose(job, models, &d, &error) == RF_OK, "%s", error.text);
    report_text(d, NULL, &text);
    ck_assert(!text.failed);
    bool says = strstr(text.bytes, "prove the meter") != NULL;
    text_finish(&text);
    rf_diagnosis_destroy(d);
    rf_job_destroy(job);
    return says;
}

/* No fault compared is a probe that hangs in the air, or two that touch. */
START_TEST(same_reading_everywhere_asks_to_prove_the_meter)
{
    ck_assert(says_prove_the_meter(&six, standard_plan, value_open));
    ck_assert(says_prove_the_meter(&six, "end_to_end", value_open));
    ck_assert(says_prove_the_meter(&six, standard_plan, value_zero));
    ck_assert(says_prove_the_meter(&six, "lead_out_l", value_zero));
    ck_assert(!says_prove_the_meter(&six, "apart_ln apart_le", value_open));
    ck_assert(!says_prove_the_meter(&short_runs, standard_plan, value_zero));
    ck_assert(!says_prove_the_meter(&six, standard_plan, value_half));
    ck_assert(!says_prove_the_meter(&six, standard_plan, value_extremes_in_turn));
}
END_TEST

/* --- beyond the meter --- */

/* With 15.5 km of cable a ring reads over range with nothing wrong: that shows no break. */
START_TEST(over_range_is_refused_where_the_ring_reads_so)
{
    const struct extreme_ring ring = {.points = 30, .run_m = 500};
    struct rf_job *job = extreme_job(&ring, "end_to_end", value_open);
    struct rf_diagnosis *d;
    struct rf_error error;
    ck_assert_int_eq(rf_diagnose(job, models, &d, &error), RF_REFUSED);
    ck_assert_ptr_null(d);
    static const char *const named[] = {"extreme: readings.end_to_end.l: found \"open\"", "needs",
                                        "99.9 Ω"};
    for (size_t i = 0; i < sizeof named / sizeof *named; i++)
        ck_assert_msg(strstr(error.text, named[i]) != NULL, "no \"%s\" in: %s", named[i],
                      error.text);
    rf_job_destroy(job);
    /* Ends apart are to be over range, however long the ring. */
    job = extreme_job(&ring, "apart_ln", value_open);
    ck_assert_msg(rf_diagnose(job, models, &d, &error) == RF_OK, "%s", error.text);
    check_chances(d, "15.5 km, apart");
    rf_diagnosis_destroy(d);
    rf_job_destroy(job);
}
END_TEST

/* --- many points, many readings --- */

START_TEST(large_ring_is_done_in_time)
{
    static const struct extreme_ring largest = {.points = LARGEST_RING, .run_m = 4};
    static const struct extreme_ring large = {.points = LARGE_RING, .run_m = 4};
    static const struct {
        const char *what, *set_ups;
        value_of_reading *value;
        const struct extreme_ring *ring;
        bool simulated;
    } rows[] = {
        {"large ring, simulated", standard_plan, value_half, &large, true},
        {"largest ring, all over range", standard_plan, value_open, &largest, false},
        /* Everything as likely as before: the plan's worst case. */
        {"large ring, one reading apart", "apart_ln", value_open, &large, false},
    };
    for (size_t i = 0; i < sizeof rows / sizeof *rows; i++) {
        struct rf_job *ring = extreme_job(rows[i].ring, rows[i].set_ups, rows[i].value);
        struct truth *truth = NULL;
        if (rows[i].simulated)
            truth = simulated(ring, &(struct simulation){.seed = 3, .defects = 1});
        struct rf_diagnosis *d = answer_of(truth != NULL ? truth->job : ring, rows[i].what);
        ck_assert_msg(!d->misfit.flag, "%s", rows[i].what);
        rf_diagnosis_destroy(d);
        truth_destroy(truth);
        rf_job_destroy(ring);
    }
}
END_TEST

/* Every point and end read so often that no job may hold more. */
static struct rf_job *most_readings(value_of_reading *value)
{
    const struct extreme_ring ring = {.points = REPEATED_RING, .run_m = 5};
    struct text text = {0};
    size_t left = JOB_MAX_READINGS, spots = REPEATED_RING + 1, each = left / spots;
    begin_job(&text, &ring);
    text_add(&text, "\"cross_ln\": {");
    for (size_t k = 0; k < spots; k++) {
        text_add(&text, k > 0 ? ", \"" : "\"");
        if (k + 1 < spots)
            add_point_id(&text, &ring, k);
        else
            text_add(&text, "board");
        size_t n = k + 1 < spots ? each : left;
        for (size_t i = 0; i < n; i++)
            text_addf(&text, "%s%s", i > 0 ? ", " : "\": [", value(i));
        left -= n;
        text_add(&text, "]");
    }
    text_add(&text, "}");
    return end_job(&text);
}

START_TEST(most_readings_are_done_in_time)
{
    struct rf_job *ring = most_readings(value_zero);
    ck_assert_uint_eq(rf_job_readings(ring), JOB_MAX_READINGS);
    struct truth *truth = simulated(ring, &(struct simulation){.seed = 5, .given = true});
    struct rf_diagnosis *d = answer_of(truth->job, "5000 readings, simulated");
    ck_assert(!d->misfit.flag);
    rf_diagnosis_destroy(d);
    /* Repeats that agree do not make up for what they agree on. */
    d = answer_of(ring, "5000 readings of 0");
    ck_assert(d->misfit.flag);
    rf_diagnosis_destroy(d);
    truth_destroy(truth);
    rf_job_destroy(ring);
    struct rf_job *job = most_readings(value_contradictory);
    d = answer_of(job, "5000 contradictory readings");
    ck_assert(d->misfit.flag);
    rf_diagnosis_destroy(d);
    rf_job_destroy(job);
}
END_TEST

static const char *value_of_four_repeats(size_t i)
{
    return (void)i, "[0, 0, 0, 0]";
}

START_TEST(repeats_raise_no_false_alarm)
{
    enum { JOBS = 100 };
    const struct extreme_ring four = {.points = 4, .run_m = 6};
    struct rf_job *ring = extreme_job(&four, standard_plan, value_of_four_repeats);
    size_t flagged = 0;
    double low, high;
    for (uint32_t seed = 0; seed < JOBS; seed++) {
        struct truth *truth = simulated(ring, &(struct simulation){.seed = seed});
        struct rf_diagnosis *d;
        struct rf_error error;
        ck_assert_msg(rf_diagnose(truth->job, models, &d, &error) == RF_OK, "%s", error.text);
        flagged += d->misfit.flag;
        rf_diagnosis_destroy(d);
        truth_destroy(truth);
    }
    rf_wilson(flagged, JOBS, 0.99, &low, &high);
    ck_assert_msg(low < 0.05, "%zu of %d flagged", flagged, JOBS);
    rf_job_destroy(ring);
}
END_TEST

/* --- the order of the readings --- */

static double confidence_in(const struct rf_diagnosis *d, const struct hypothesis *hypothesis)
{
    for (size_t i = 0; i < d->n_ranked; i++)
        if (hypothesis_equal(&d->ranked[i].hypothesis, hypothesis))
            return d->ranked[i].confidence;
    return 0;
}

START_TEST(order_of_readings_does_not_matter)
{
    static const struct extreme_ring *const rings[] = {&one_point, &six, &mixed_runs, &bushy};
    for (uint32_t seed = 0; seed < 12; seed++) {
        struct rf_job *ring =
            extreme_job(rings[seed % 4], "end_to_end cross_ln link_out_le", value_zero);
        struct truth *truth = simulated(ring, &(struct simulation){.seed = seed});
        struct rf_job *job = truth->job; /* ours to turn round: nothing else looks at it now */
        struct rf_diagnosis *d[2];
        struct rf_error error;
        for (int turned = 0; turned < 2; turned++) {
            ck_assert_msg(rf_diagnose(job, models, &d[turned], &error) == RF_OK, "%s", error.text);
            for (size_t i = 0, k = job->n_readings; i + 1 < k; i++) {
                struct reading swap = job->readings[i];
                job->readings[i] = job->readings[--k];
                job->readings[k] = swap;
            }
        }
        for (size_t i = 0; i < d[0]->n_ranked && !d[0]->misfit.flag; i++) {
            const struct ranked *r = &d[0]->ranked[i];
            double other = confidence_in(d[1], &r->hypothesis);
            ck_assert_msg(fabs(r->confidence - other) < 1e-3 || r->confidence < 0.002,
                          "seed %u: %s: %.6f, turned round %.6f", seed, r->words, r->confidence,
                          other);
        }
        rf_diagnosis_destroy(d[0]);
        rf_diagnosis_destroy(d[1]);
        truth_destroy(truth);
        rf_job_destroy(ring);
    }
}
END_TEST

/* --- odd rings, with a true answer --- */

/* How often what ranks first is the truth, against how often it says so, over rings of every odd
 * shape with defects drawn from the priors. */
START_TEST(odd_rings_are_judged_as_often_right_as_said)
{
    static const struct extreme_ring *const rings[] = {
        &one_point, &short_runs, &long_runs, &mixed_runs, &unknown_runs, &deep, &bushy, &long_ids};
    static const char *const plans[] = {standard_plan, "end_to_end cross_ln link_out_ln lead_out_n",
                                        "apart_ln apart_le apart_ne cross_ne"};
    enum { N_RINGS = sizeof rings / sizeof *rings, N_PLANS = sizeof plans / sizeof *plans };
    enum { SEEDS = 2 };
    size_t n = 0, right = 0, flagged = 0;
    double said = 0, low, high;
    for (size_t i = 0; i < (size_t)N_RINGS * N_PLANS * SEEDS; i++) {
        struct rf_job *ring =
            extreme_job(rings[i % N_RINGS], plans[i / N_RINGS % N_PLANS], value_zero);
        struct truth *truth = simulated(ring, &(struct simulation){.seed = (uint32_t)i});
        struct rf_diagnosis *d;
        struct rf_error error;
        ck_assert_msg(rf_diagnose(truth->job, models, &d, &error) == RF_OK, "%s", error.text);
        check_chances(d, "odd ring");
        check_reports(d, NULL, "odd ring");
        check_expected(truth->job, "odd ring");
        n++;
        flagged += d->misfit.flag;
        said += d->ranked[0].confidence;
        right += hypothesis_equal(&d->ranked[0].hypothesis, &truth->hypothesis);
        rf_diagnosis_destroy(d);
        truth_destroy(truth);
        rf_job_destroy(ring);
    }
    rf_wilson(right, n, 0.99, &low, &high);
    ck_assert_msg(said / (double)n > low && said / (double)n < high, "said %.3f, was %.3f to %.3f",
                  said / (double)n, low, high);
    rf_wilson(flagged, n, 0.99, &low, &high);
    ck_assert_msg(low < 0.05, "%zu of %zu flagged", flagged, n);
}
END_TEST

static Suite *extremes_suite(void)
{
    Suite *suite = suite_create("extremes");
    TCase *tables = tcase_create("tables");
    tcase_add_unchecked_fixture(tables, load_models, unload_models);
    tcase_set_timeout(tables, SECONDS_MOST_LARGEST);
    tcase_add_loop_test(tables, answer_makes_sense_or_is_a_misfit, 0,
                        (int)(sizeof extremes / sizeof *extremes));
    tcase_add_test(tables, same_reading_everywhere_asks_to_prove_the_meter);
    tcase_add_test(tables, over_range_is_refused_where_the_ring_reads_so);
    tcase_add_test(tables, large_ring_is_done_in_time);
    tcase_add_test(tables, most_readings_are_done_in_time);
    tcase_add_test(tables, repeats_raise_no_false_alarm);
    tcase_add_test(tables, order_of_readings_does_not_matter);
    tcase_add_test(tables, odd_rings_are_judged_as_often_right_as_said);
    suite_add_tcase(suite, tables);
    return suite;
}

int main(void)
{
    return run_suite(extremes_suite());
}
