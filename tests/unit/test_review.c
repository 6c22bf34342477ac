/* SPDX-License-Identifier: GPL-3.0-or-later */

/*
 * The arithmetic of a review: what is counted of a line, that neither order nor cutting changes
 * it, that a line survives its JSON, and what is learned. All lines and jobs are invented.
 */

#include "base/json.h"
#include "base/memory.h"
#include "report/review_report.h"
#include "review/tally.h"

#include "../suite.h"

#include <check.h>
#include <math.h>
#include <stdio.h>
#include <string.h>

static size_t family_of(const char *name)
{
    for (size_t i = 0; i < n_fault_families; i++)
        if (strcmp(fault_families[i]->name, name) == 0)
            return i;
    ck_abort_msg("no family %s", name);
    return 0;
}

/* Knuth's MMIX linear congruential generator; its upper bits. */
static unsigned below(uint64_t *state, unsigned n)
{
    *state = *state * 6364136223846793005u + 1442695040888963407u;
    return (unsigned)(*state >> 33) % n;
}

static struct fault_sort random_sort(uint64_t *state)
{
    struct fault_sort sort = {.family = below(state, (unsigned)n_sorts())};
    if (sort.family == two_defects())
        return sort;
    const struct fault_family *family = fault_families[sort.family];
    if (family->n_kinds > 0)
        sort.kind = below(state, (unsigned)family->n_kinds);
    if (family->fields & (FIELD_CONDUCTOR | FIELD_ANY_CONDUCTOR))
        sort.conductor = 1 + below(state, 3);
    return sort;
}

/* A line with whatever a line can hold, and many ties among them. */
static struct review_line random_line(uint64_t *state)
{
    static char jobs[][16] = {"alpha", "beta \"x\"", "gämma", "delta\t4"};
    static char words[][32] = {"line joint somewhere", "no defect", "neutral broken; or not"};
    struct review_line line = {
        .job = jobs[below(state, 4)],
        .words = words[below(state, 3)],
        .verdict = (enum verdict)below(state, N_VERDICTS),
        .confidence = (int64_t)below(state, 11) * (PARTS / 10) - (int64_t)below(state, 2),
        .none = (int64_t)below(state, 4) * (PARTS / 4),
        .danger = (int64_t)below(state, 3) * 333333333,
        .first = random_sort(state),
        .testing = below(state, 2) == 0,
        .readings = below(state, 40),
        .written_off = below(state, 3),
        .other_wiring = below(state, 5) == 0,
        .other_lengths = below(state, 5) == 0,
    };
    if (line.confidence < 0)
        line.confidence = 0;
    line.found.known = below(state, 3) > 0;
    if (line.found.known) {
        line.found.sort = random_sort(state);
        line.found.rank = (int64_t)below(state, 6) - 1;
        line.found.agrees = below(state, 2) == 0;
        line.found.log_posterior = -(int64_t)below(state, 1000) * 13815510;
        line.found.below = below(state, 9) == 0;
        line.found.looked = below(state, 2) == 0;
    }
    if (line.found.looked) {
        line.found.places = (int64_t)below(state, 7) * 123456789;
        line.found.looks[below(state, N_LOOK_BINS)] = PARTS / 3;
        line.found.looks[below(state, N_LOOK_BINS)] = PARTS / 3 * 2;
    }
    return line;
}

static struct rf_review *create(void)
{
    struct rf_review *review;
    ck_assert_int_eq(rf_review_create(&review, NULL), RF_OK);
    return review;
}

static void add(struct rf_review *review, const struct review_line *line)
{
    ck_assert_int_eq(review_add_line(review, line, NULL), RF_OK);
}

static void join(struct rf_review *review, const struct rf_review *part)
{
    ck_assert_int_eq(rf_review_join(review, part, NULL), RF_OK);
}

/* All that is ever shown of it: the summary as JSON and as text. */
static char *shown(const struct rf_review *review)
{
    struct text out = {0};
    report_review_json(review, "shipped", "archive", &out);
    report_review_text(review, &out);
    ck_assert(!out.failed);
    return out.bytes;
}

static void assert_same(const struct rf_review *one, const struct rf_review *other)
{
    char *a = shown(one), *b = shown(other);
    ck_assert_str_eq(a, b);
    free(a);
    free(b);
}

/* --- the scorecard --- */

/* Five invented jobs, all numbers of the score worked out by hand. */
START_TEST(score_by_hand)
{
    struct rf_review *review = create();
    struct review_line line = {.job = (char[]){"a"},
                               .words = (char[]){"w"},
                               .confidence = PARTS,
                               .verdict = VERDICT_DEFECT,
                               .first.family = family_of("joint")};
    line.found.known = true;
    line.found.agrees = true;
    line.found.sort.family = family_of("joint");
    line.found.log_posterior = -PARTS / 2;
    add(review, &line); /* first, right, 1.0 said */
    line.found.rank = 2;
    line.confidence = PARTS / 10 * 9;
    add(review, &line);   /* third */
    line.found.rank = -1; /* not listed: though nothing else may be listed either */
    line.found.agrees = false;
    line.found.below = true;
    line.found.log_posterior = -13815510558;
    line.confidence = PARTS / 10 * 9 - 1;
    line.found.sort.family = family_of("contact");
    add(review, &line);
    line.verdict = VERDICT_UNEXPLAINED;
    add(review, &line);
    line.found.known = false;
    add(review, &line);

    const struct scorecard *score = &review->score;
    ck_assert_uint_eq(rf_review_jobs(review), 5);
    ck_assert_uint_eq(rf_review_confirmed(review), 4);
    ck_assert_uint_eq(rf_review_first(review), 1);
    ck_assert_uint_eq(rf_review_first_three(review), 2);
    ck_assert_uint_eq(score->below, 2);
    ck_assert_uint_eq(score->unexplained, 1);
    ck_assert_double_eq_tol(rf_review_mean_log_posterior(review),
                            (-0.5 - 0.5 - 2 * 13.815510558) / 4, 1e-12);
    ck_assert_uint_eq(score->calibration[9].jobs, 2);
    ck_assert_uint_eq(score->calibration[9].right, 2);
    ck_assert_int_eq(score->calibration[9].confidence, (int64_t)PARTS / 10 * 19);
    ck_assert_uint_eq(score->calibration[8].jobs, 1);
    ck_assert_uint_eq(score->calibration[8].right, 0);
    ck_assert_uint_eq(score->confusion[family_of("joint")][family_of("joint")], 2);
    ck_assert_uint_eq(score->confusion[family_of("contact")][family_of("joint")], 2);
    rf_review_destroy(review);
}
END_TEST

START_TEST(score_of_nothing)
{
    struct rf_review *review = create();
    ck_assert(isnan(rf_review_mean_log_posterior(review)));
    char *text = shown(review);
    ck_assert_ptr_null(strstr(text, "nan"));
    free(text);
    rf_review_destroy(review);
    rf_review_destroy(NULL);
}
END_TEST

/* What hides a defect nobody wrote down comes first; what was written down does not come. */
START_TEST(worry)
{
    struct review_line line = {.verdict = VERDICT_DEFECT, .none = PARTS / 10, .danger = PARTS / 2};
    ck_assert_int_eq(line_worry(&line), (int64_t)PARTS / 10 * 14);
    line.verdict = VERDICT_UNEXPLAINED;
    ck_assert_int_eq(line_worry(&line), (int64_t)PARTS / 2 * 3);
    line.verdict = VERDICT_NO_DEFECT;
    ck_assert_int_eq(line_worry(&line), 0);
    line.verdict = VERDICT_UNDECIDED;
    ck_assert_int_gt(line_worry(&line), 0);
    line.found.known = true;
    line.found.sort.family = family_of("spur"); /* somebody found something */
    ck_assert_int_eq(line_worry(&line), 0);
    line.found.sort.family = family_of("none"); /* "nothing wrong" */
    ck_assert_int_gt(line_worry(&line), 0);
    line.verdict = VERDICT_DEFECT;
    line.found.agrees = true;
    ck_assert_int_eq(line_worry(&line), 0);
}
END_TEST

/* --- order and cutting --- */

enum { LINES = 600, PARTS_CUT = 4 };

START_TEST(order_and_cutting_change_nothing)
{
    uint64_t state = (uint64_t)_i + 1;
    struct review_line lines[LINES];
    struct rf_review *whole = create(), *backwards = create(), *joined = create();
    struct rf_review *left = create(), *right = create(), *part[PARTS_CUT];
    for (size_t i = 0; i < PARTS_CUT; i++)
        part[i] = create();
    for (size_t i = 0; i < LINES; i++) {
        lines[i] = random_line(&state);
        add(whole, &lines[i]);
        add(part[below(&state, PARTS_CUT)], &lines[i]);
    }
    for (size_t i = LINES; i-- > 0;)
        add(backwards, &lines[i]);
    assert_same(whole, backwards);

    for (size_t i = PARTS_CUT; i-- > 0;)
        join(joined, part[i]);
    assert_same(whole, joined);

    /* (0 + 1) + (2 + 3) */
    join(left, part[0]);
    join(left, part[1]);
    join(right, part[2]);
    join(right, part[3]);
    join(left, right);
    assert_same(whole, left);
    ck_assert_uint_eq(whole->n_worst, WORST_SHOWN);
    for (size_t i = 1; i < whole->n_worst; i++)
        ck_assert_int_ge(line_worry(&whole->worst[i - 1]), line_worry(&whole->worst[i]));

    for (size_t i = 0; i < PARTS_CUT; i++)
        rf_review_destroy(part[i]);
    rf_review_destroy(whole);
    rf_review_destroy(backwards);
    rf_review_destroy(joined);
    rf_review_destroy(left);
    rf_review_destroy(right);
}
END_TEST

/* A line comes back from its JSON as it was: one tally of each shows the same. */
START_TEST(line_through_json)
{
    uint64_t state = 77;
    struct rf_review *straight = create(), *through = create();
    for (size_t i = 0; i < LINES; i++) {
        struct review_line line = random_line(&state), back = {0};
        struct rf_error error;
        cJSON *document = cJSON_CreateObject(), *finding = cJSON_CreateObject();
        cJSON *findings = cJSON_AddArrayToObject(document, "findings");
        cJSON_AddStringToObject(document, "job", line.job);
        cJSON_AddStringToObject(finding, "text", line.words);
        cJSON_AddItemToArray(findings, finding);
        cJSON_AddItemToObject(document, "review", line_to_json(&line));
        struct json_at at = json_document(document, "line");
        ck_assert_msg(line_from_json(&back, &at, &error) == RF_OK, "%s", error.text);
        ck_assert_int_eq(back.found.rank, line.found.rank);
        ck_assert_uint_eq(back.first.kind, line.first.kind);
        add(straight, &line);
        add(through, &back);
        line_finish(&back);
        cJSON_Delete(document);
    }
    assert_same(straight, through);
    rf_review_destroy(straight);
    rf_review_destroy(through);
}
END_TEST

/* --- learning --- */

static void add_found(struct rf_review *review, const char *family, size_t kind, size_t times)
{
    struct review_line line = {.job = (char[]){"j"}, .words = (char[]){"w"}};
    line.found.known = true;
    line.found.sort.family = strcmp(family, "two") == 0 ? two_defects() : family_of(family);
    line.found.sort.kind = kind;
    for (size_t i = 0; i < times; i++)
        add(review, &line);
}

/* The number behind `key` in the row of that family. */
static double in_row(const char *text, const char *family, const char *key)
{
    char start[64], member[64];
    snprintf(start, sizeof start, "{\"family\": \"%s\"", family);
    snprintf(member, sizeof member, "\"%s\": ", key);
    const char *row = strstr(text, start);
    ck_assert_ptr_nonnull(row);
    const char *at = strstr(row, member);
    ck_assert_ptr_nonnull(at);
    return strtod(at + strlen(member), NULL);
}

START_TEST(learned_by_hand)
{
    struct rf_review *review = create();
    struct rf_models *models;
    struct rf_error error;
    char *text;
    ck_assert_int_eq(rf_models_load(NULL, RF_RATES_CONSULTED, &models, &error), RF_OK);
    add_found(review, "contact", 0, 8); /* open */
    add_found(review, "contact", 1, 2); /* high */
    add_found(review, "none", 0, 9);
    add_found(review, "two", 0, 5); /* says nothing about one */
    ck_assert_int_eq(rf_review_learn(review, models, 50, &text, &error), RF_REFUSED);
    ck_assert_ptr_null(text);
    ck_assert_ptr_nonnull(strstr(error.text, "19"));
    ck_assert_ptr_nonnull(strstr(error.text, "20"));
    add_found(review, "spur", 2, 1);
    ck_assert_int_eq(rf_review_learn(review, models, 0, &text, &error), RF_USAGE);
    ck_assert_int_eq(rf_review_learn(review, models, NAN, &text, &error), RF_USAGE);
    ck_assert_msg(rf_review_learn(review, models, 50, &text, &error) == RF_OK, "%s", error.text);
    /* (50 · prior + count) / 70, priors .09, .22, .12, .13 */
    ck_assert_double_eq_tol(in_row(text, "contact", "prior"), (4.5 + 10) / 70, 1e-11);
    ck_assert_double_eq_tol(in_row(text, "none", "prior"), (11.0 + 9) / 70, 1e-11);
    ck_assert_double_eq_tol(in_row(text, "spur", "prior"), (6.0 + 1) / 70, 1e-11);
    ck_assert_double_eq_tol(in_row(text, "joint", "prior"), 6.5 / 70, 1e-11);
    /* (50 · .09 · .3 + 8) / (50 · .09 + 10), and the third of the spur's kinds, .15 */
    ck_assert_double_eq_tol(in_row(text, "contact", "open"), (1.35 + 8) / 14.5, 1e-11);
    ck_assert_double_eq_tol(in_row(text, "spur", "3"), (0.9 + 1) / 7, 1e-11);
    ck_assert_double_eq_tol(in_row(text, "contact", "count"), 10, 1e-12);
    ck_assert_double_eq_tol(in_row(text, "joint", "count"), 0, 1e-12);
    ck_assert_double_eq_tol(in_row(text, "joint", "ohm"), 0.5, 1e-12);
    free(text);
    rf_models_destroy(models);
    rf_review_destroy(review);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("review");
    TCase *score = tcase_create("score");
    tcase_add_test(score, score_by_hand);
    tcase_add_test(score, score_of_nothing);
    tcase_add_test(score, worry);
    tcase_add_loop_test(score, order_and_cutting_change_nothing, 0, 5);
    tcase_add_test(score, line_through_json);
    tcase_add_test(score, learned_by_hand);
    suite_add_tcase(suite, score);
    return run_suite(suite);
}
