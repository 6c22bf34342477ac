/* SPDX-License-Identifier: GPL-3.0-or-later */
#define _GNU_SOURCE /* getline */

#include "review/merge.h"

#include "base/error.h"
#include "base/json.h"

#include <errno.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

const char review_format[] = "ringfettle-review/1";
const char diagnosis_format[] = "ringfettle-diagnosis/1";

struct part {
    struct merge_origin *origin;
    struct rf_review *review;
    uint64_t jobs; /* since the last summary */
    uint64_t summaries;
};

void merge_origin_finish(struct merge_origin *origin)
{
    free(origin->models);
    free(origin->rates);
    *origin = (struct merge_origin){0};
}

/* The first to come is kept; those after it must be the same. */
static enum rf_status same_origin(const struct json_at *document, const char *key, char **kept,
                                  struct rf_error *error)
{
    const char *name;
    struct json_at at = json_member(document, key);
    enum rf_status status = json_string(&at, "text as review --json writes it", &name, error);
    if (status != RF_OK)
        return status;
    if (*kept == NULL)
        *kept = text_duplicate(name);
    if (*kept == NULL)
        return fail_memory(error);
    if (strcmp(*kept, name) != 0)
        return json_fail(&at, error, RF_REFUSED,
                         "found \"%s\" and before it \"%s\"; needs parts reviewed alike", name,
                         *kept);
    return RF_OK;
}

static enum rf_status merge_job(struct part *part, const struct json_at *document,
                                struct rf_error *error)
{
    struct review_line line = {0};
    enum rf_status status = same_origin(document, "models", &part->origin->models, error);
    if (status == RF_OK)
        status = line_from_json(&line, document, error);
    if (status == RF_OK)
        status = review_add_line(part->review, &line, error);
    line_finish(&line);
    part->jobs++;
    return status;
}

static enum rf_status read_count(const struct json_at *document, const char *key, uint64_t *count,
                                 struct rf_error *error)
{
    double number = 0;
    struct json_at at = json_member(document, key);
    enum rf_status status = json_number(&at, 0, 1e15, "a number of jobs", &number, error);
    *count = (uint64_t)number;
    return status;
}

static enum rf_status merge_summary(struct part *part, const struct json_at *document,
                                    struct rf_error *error)
{
    static const char *const keys[] = {"jobs", "refused", "failed", "unread"};
    uint64_t counts[4] = {0};
    bool complete = true;
    struct json_at at = json_member(document, "complete");
    struct json_at jobs = json_member(document, "jobs");
    enum rf_status status = same_origin(document, "models", &part->origin->models, error);
    if (status == RF_OK)
        status = same_origin(document, "rates", &part->origin->rates, error);
    for (size_t i = 0; i < 4 && status == RF_OK; i++)
        status = read_count(document, keys[i], &counts[i], error);
    if (status == RF_OK)
        status = json_boolean(&at, &complete, error);
    if (status == RF_OK && counts[0] != part->jobs)
        status = json_fail(&jobs, error, RF_REFUSED,
                           "found %llu and %llu lines of jobs before it; needs the whole part",
                           (unsigned long long)counts[0], (unsigned long long)part->jobs);
    if (status != RF_OK)
        return status;
    part->review->refused += counts[1];
    part->review->failed += counts[2];
    part->review->unread += counts[3];
    part->review->stopped = part->review->stopped || !complete;
    part->jobs = 0;
    part->summaries++;
    return RF_OK;
}

static enum rf_status merge_line(struct part *part, const char *bytes, size_t length,
                                 const char *source, struct rf_error *error)
{
    const char *const formats[] = {diagnosis_format, review_format};
    cJSON *tree = NULL;
    size_t format = 0;
    enum rf_status status = json_parse(bytes, length, source, JSON_ONE_LINE, &tree, error);
    if (status != RF_OK)
        return status;
    struct json_at document = json_document(tree, source);
    struct json_at at = json_member(&document, "format");
    status = json_choice(&at, formats, 2, &format, error);
    if (status == RF_OK)
        status =
            format == 0 ? merge_job(part, &document, error) : merge_summary(part, &document, error);
    cJSON_Delete(tree);
    return status;
}

static enum rf_status merge_stream(struct part *part, FILE *file, const char *name,
                                   struct rf_error *error)
{
    char *line = NULL;
    size_t room = 0, number = 0;
    ssize_t length;
    enum rf_status status = RF_OK;
    struct text source = {0};
    errno = 0;
    while (status == RF_OK && (length = getline(&line, &room, file)) >= 0) {
        text_clear(&source);
        text_addf(&source, "%s:%zu", name, ++number);
        status = source.failed ? fail_memory(error)
                               : merge_line(part, line, (size_t)length, source.bytes, error);
        errno = 0;
    }
    if (status == RF_OK && errno == ENOMEM)
        status = fail_memory(error);
    else if (status == RF_OK && ferror(file))
        status = fail(error, RF_IO, "%s: cannot be read: %s", name, strerror(errno));
    text_finish(&source);
    free(line);
    return status;
}

enum rf_status review_merge(const char *path, struct merge_origin *origin, struct rf_review *review,
                            struct rf_error *error)
{
    bool standard_input = strcmp(path, "-") == 0;
    const char *name = standard_input ? "standard input" : path;
    struct part part = {.origin = origin, .review = review};
    FILE *file = standard_input ? stdin : fopen(path, "rb");
    if (file == NULL)
        return fail(error, RF_IO, "%s: cannot be opened: %s", path, strerror(errno));
    enum rf_status status = merge_stream(&part, file, name, error);
    if (!standard_input)
        fclose(file);
    if (status == RF_OK && (part.jobs > 0 || part.summaries == 0))
        status =
            fail(error, RF_REFUSED,
                 "%s: found no summary at the end; needs the whole output of review --json", name);
    return status;
}
