/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "report/review_report.h"

#include "report/json_write.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>

/* The format ringfettle-review/1. */
struct writer {
    struct json_writer json;
    const struct rf_review *review;
};

static const double level = 0.9; /* of the intervals */

static void add_count(struct writer *writer, cJSON *object, const char *key, uint64_t count)
{
    json_add(&writer->json, object, key, cJSON_CreateNumber((double)count));
}

/* Six digits behind the point: what is beyond them says nothing. */
static void add_share(struct writer *writer, cJSON *object, const char *key, double share)
{
    char digits[48];
    snprintf(digits, sizeof digits, "%.6f", share);
    json_add(&writer->json, object, key, cJSON_CreateNumber(strtod(digits, NULL)));
}

static void add_defects(struct writer *writer, cJSON *root)
{
    cJSON *list = json_add_list(&writer->json, root, "defects");
    for (size_t family = 0; family < n_sorts(); family++)
        for (size_t conductor = 0; conductor < N_CONDUCTOR_KINDS; conductor++) {
            uint64_t jobs = writer->review->defects[family][conductor];
            if (jobs == 0)
                continue;
            cJSON *row = cJSON_CreateObject();
            json_add_words(&writer->json, row, "family", sort_name(family));
            if (conductor > 0)
                json_add_words(&writer->json, row, "conductor", conductor_kind_names[conductor]);
            add_count(writer, row, "jobs", jobs);
            json_append(&writer->json, list, row);
        }
}

static void add_testing(struct writer *writer, cJSON *root)
{
    cJSON *list = json_add_list(&writer->json, root, "testing_mistakes");
    for (size_t family = 0; family < n_sorts(); family++) {
        if (writer->review->testing[family] == 0)
            continue;
        cJSON *row = cJSON_CreateObject();
        json_add_words(&writer->json, row, "family", sort_name(family));
        add_count(writer, row, "jobs", writer->review->testing[family]);
        json_append(&writer->json, list, row);
    }
}

static void add_counts(struct writer *writer, cJSON *root)
{
    const struct rf_review *review = writer->review;
    json_add(&writer->json, root, "complete", cJSON_CreateBool(!review->stopped));
    add_count(writer, root, "jobs", review->jobs);
    add_count(writer, root, "refused", review->refused);
    add_count(writer, root, "failed", review->failed);
    add_count(writer, root, "unread", review->unread);
    cJSON *verdicts = json_add_object(&writer->json, root, "verdicts");
    for (size_t i = 0; i < N_VERDICTS; i++)
        add_count(writer, verdicts, verdict_names[i], review->verdicts[i]);
    add_defects(writer, root);
    cJSON *disagree = json_add_object(&writer->json, root, "record_disagrees");
    add_count(writer, disagree, "jobs", review->disagree);
    add_count(writer, disagree, "found", review->disagree_found);
    add_count(writer, disagree, "wiring", review->disagree_wiring);
    add_count(writer, disagree, "lengths", review->disagree_lengths);
    add_testing(writer, root);
    cJSON *readings = json_add_object(&writer->json, root, "readings");
    add_count(writer, readings, "taken", review->readings);
    add_count(writer, readings, "written_off", review->written_off);
    add_count(writer, readings, "jobs", review->jobs_written_off);
}

static void add_calibration(struct writer *writer, cJSON *score)
{
    cJSON *list = json_add_list(&writer->json, score, "calibration");
    for (size_t i = 0; i < CALIBRATION_BINS; i++) {
        const struct calibration_bin *bin = &writer->review->score.calibration[i];
        if (bin->jobs == 0)
            continue;
        double low, high;
        rf_wilson((size_t)bin->right, (size_t)bin->jobs, level, &low, &high);
        cJSON *row = cJSON_CreateObject();
        add_share(writer, row, "from", (double)i / CALIBRATION_BINS);
        add_share(writer, row, "to", (double)(i + 1) / CALIBRATION_BINS);
        add_count(writer, row, "jobs", bin->jobs);
        add_count(writer, row, "right", bin->right);
        add_share(writer, row, "mean_confidence",
                  (double)bin->confidence / (double)bin->jobs / PARTS);
        add_share(writer, row, "share", (double)bin->right / (double)bin->jobs);
        add_share(writer, row, "low", low);
        add_share(writer, row, "high", high);
        json_append(&writer->json, list, row);
    }
}

static void add_confusion(struct writer *writer, cJSON *score)
{
    cJSON *list = json_add_list(&writer->json, score, "confusion");
    for (size_t found = 0; found < n_sorts(); found++)
        for (size_t first = 0; first < n_sorts(); first++) {
            uint64_t jobs = writer->review->score.confusion[found][first];
            if (jobs == 0)
                continue;
            cJSON *row = cJSON_CreateObject();
            json_add_words(&writer->json, row, "found", sort_name(found));
            json_add_words(&writer->json, row, "first", sort_name(first));
            add_count(writer, row, "jobs", jobs);
            json_append(&writer->json, list, row);
        }
}

/* Places looked at before the find: the mean, and how the finds spread. */
static void add_looks(struct writer *writer, cJSON *score)
{
    static const char *const keys[N_LOOK_BINS] = {"0", "1", "2", "3_to_5", "6_and_more", "never"};
    const struct scorecard *of = &writer->review->score;
    cJSON *object = json_add_object(&writer->json, score, "places_before_find");
    double jobs = (double)of->looked;
    add_count(writer, object, "jobs", of->looked);
    if (of->looked == 0)
        return;
    add_share(writer, object, "mean", (double)of->places / jobs / PARTS);
    for (size_t i = 0; i < N_LOOK_BINS; i++)
        add_share(writer, object, keys[i], (double)of->looks[i] / jobs / PARTS);
}

static void add_score(struct writer *writer, cJSON *root)
{
    const struct scorecard *score = &writer->review->score;
    cJSON *object = json_add_object(&writer->json, root, "scorecard");
    add_count(writer, object, "confirmed", score->confirmed);
    add_count(writer, object, "first", score->first);
    add_count(writer, object, "first_three", score->first_three);
    add_count(writer, object, "first_finding", score->agrees);
    if (score->confirmed > 0)
        add_share(writer, object, "mean_log_posterior",
                  rf_review_mean_log_posterior(writer->review));
    add_count(writer, object, "below_one_in_a_million", score->below);
    add_count(writer, object, "unexplained", score->unexplained);
    add_looks(writer, object);
    add_calibration(writer, object);
    add_confusion(writer, object);
}

static void add_worst(struct writer *writer, cJSON *root)
{
    cJSON *list = json_add_list(&writer->json, root, "worrying");
    for (size_t i = 0; i < writer->review->n_worst; i++) {
        const struct review_line *line = &writer->review->worst[i];
        cJSON *object = cJSON_CreateObject();
        json_add_words(&writer->json, object, "job", line->job);
        json_add_words(&writer->json, object, "verdict", verdict_names[line->verdict]);
        json_add_words(&writer->json, object, "text", line->words);
        add_share(writer, object, "confidence", (double)line->confidence / PARTS);
        add_share(writer, object, "danger", (double)line->danger / PARTS);
        json_add_words(&writer->json, object, "found", line->found.known ? "otherwise" : "nothing");
        json_append(&writer->json, list, object);
    }
}

void report_review_json(const struct rf_review *review, const char *models, const char *rates,
                        struct text *out)
{
    struct writer writer = {.review = review};
    cJSON *root = cJSON_CreateObject();
    json_add_words(&writer.json, root, "format", "ringfettle-review/1");
    json_add_words(&writer.json, root, "models", models);
    json_add_words(&writer.json, root, "rates", rates);
    add_counts(&writer, root);
    add_score(&writer, root);
    add_worst(&writer, root);
    json_end_line(&writer.json, root, out);
}
