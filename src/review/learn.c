/* SPDX-License-Identifier: GPL-3.0-or-later */

/*
 * Fault priors from confirmed jobs. Family and kind of what was found are multinomial with a
 * Dirichlet prior whose pseudo-counts are the models' priors times a weight; the estimate is the
 * posterior's mean, (weight · prior + count) / (weight + confirmed). A job with two defects says
 * nothing about how often one comes alone, and is left out. Confirmed jobs are jobs somebody looked
 * into, so it is the rates of consulted jobs that are learned; the share of filed jobs without a
 * defect stays.
 */

#include "base/error.h"
#include "review/tally.h"

#include <math.h>
#include <string.h>

enum { LEAST_CONFIRMED = 20 };

static uint64_t count_family(const struct scorecard *score, size_t family)
{
    uint64_t sum = 0;
    for (size_t kind = 0; kind < MODELS_MAX_KINDS; kind++)
        sum += score->kinds[family][kind];
    return sum;
}

/* The row's `kinds`, each re-estimated within its family. */
static void add_kinds(struct text *out, const struct scorecard *score, size_t family,
                      const struct family_prior *row, double weight)
{
    const struct fault_family *of = fault_families[family];
    double seen = (double)count_family(score, family);
    if (row->n_kinds == 0)
        return;
    text_add(out, ", \"kinds\": {");
    for (size_t i = 0; i < row->n_kinds; i++) {
        double count = 0;
        for (size_t kind = 0; kind < of->n_kinds; kind++)
            if (strcmp(of->kind_names[kind], row->kinds[i].name) == 0)
                count = (double)score->kinds[family][kind];
        text_addf(out, "%s\"%s\": %.12g", i > 0 ? ", " : "", row->kinds[i].name,
                  (weight * row->prior * row->kinds[i].share + count) /
                      (weight * row->prior + seen));
    }
    text_add(out, "}");
}

static void add_row(struct text *out, const struct scorecard *score, size_t family,
                    const struct family_prior *row, double weight, double confirmed)
{
    uint64_t count = count_family(score, family);
    text_addf(out, "      {\"family\": \"%s\", \"prior\": %.12g", row->name,
              (weight * row->prior + (double)count) / (weight + confirmed));
    if (row->parameter.median > 0)
        text_addf(out, ", \"%s\": %.12g, \"sigma\": %.12g", row->metres ? "metres" : "ohm",
                  row->parameter.median, row->parameter.sigma);
    add_kinds(out, score, family, row, weight);
    text_addf(out, ", \"count\": %llu}", (unsigned long long)count);
}

static void write_models(struct text *out, const struct scorecard *score,
                         const struct rf_models *models, double weight, uint64_t confirmed)
{
    text_addf(out,
              "{\n  \"format\": \"ringfettle-models/1\",\n  \"kind\": \"faults\",\n"
              "  \"archive\": {\n    \"source\": \"as in the models this was learned with: not "
              "learned\",\n    \"none\": %.12g\n  },\n",
              models->archive_none);
    text_addf(out,
              "  \"families\": {\n    \"source\": \"priors and kinds re-estimated from %llu "
              "confirmed jobs, count of each beside it; the priors learned with counted as %.12g "
              "jobs (Dirichlet); medians and sigmas as there: not learned\",\n    \"rows\": [\n",
              (unsigned long long)confirmed, weight);
    size_t n = 0;
    for (size_t i = 0; i < n_fault_families; i++) {
        const struct family_prior *row = models_family(models, fault_families[i]->name);
        if (row == NULL)
            continue;
        text_add(out, n++ > 0 ? ",\n" : "");
        add_row(out, score, i, row, weight, (double)confirmed);
    }
    text_add(out, "\n    ]\n  }\n}\n");
}

enum rf_status rf_review_learn(const struct rf_review *review, const struct rf_models *models,
                               double weight, char **text, struct rf_error *error)
{
    const struct scorecard *score = &review->score;
    uint64_t confirmed = score->confirmed - count_family(score, two_defects());
    struct text out = {0};
    *text = NULL;
    if (!(weight > 0) || !isfinite(weight))
        return fail(error, RF_USAGE, "found a weight of %g for the priors; needs one above 0",
                    weight);
    if (confirmed < LEAST_CONFIRMED)
        return fail(error, RF_REFUSED,
                    "found %llu jobs that say what was found (one defect or none); needs at least "
                    "%d to learn priors from",
                    (unsigned long long)confirmed, LEAST_CONFIRMED);
    write_models(&out, score, models, weight, confirmed);
    if (out.failed) {
        text_finish(&out);
        return fail_memory(error);
    }
    *text = out.bytes;
    return RF_OK;
}
