/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "simulation/simulation.h"

#include "base/error.h"
#include "base/json.h"
#include "job/job_write.h"

#include <cjson/cJSON.h>
#include <gsl/gsl_randist.h>
#include <math.h>
#include <stdio.h>
#include <string.h>

/* --- readings still to be taken: a plan is a job whose readings are all 0 --- */

static void plan_spot(cJSON *setup, const char *key, bool *failed)
{
    if (!*failed && cJSON_AddNumberToObject(setup, key, 0) == NULL)
        *failed = true;
}

static cJSON *plan_setup(cJSON *readings, const char *name, bool *failed)
{
    cJSON *setup = *failed ? NULL : cJSON_AddObjectToObject(readings, name);
    *failed = *failed || setup == NULL;
    return setup;
}

/* Those of `points` (ring.points, ring.spurs) that have a front, as far as they can be read; what
 * is wrong with them is for the job's reader to say. */
static void plan_points(cJSON *setup, const cJSON *points, bool *failed)
{
    const cJSON *point = NULL;
    cJSON_ArrayForEach(point, points) {
        const char *id = cJSON_GetStringValue(cJSON_GetObjectItemCaseSensitive(point, "id"));
        const char *kind = cJSON_GetStringValue(cJSON_GetObjectItemCaseSensitive(point, "kind"));
        bool box = kind != NULL && strcmp(kind, kind_names[KIND_JUNCTION_BOX]) == 0;
        if (id != NULL && !box && !cJSON_HasObjectItem(setup, id))
            plan_spot(setup, id, failed);
    }
}

static bool plan_standard(cJSON *document)
{
    static const char *const crossed[] = {"cross_ln", "cross_le"};
    static const char *const conductors[] = {"l", "n", "e"};
    const cJSON *ring = cJSON_GetObjectItemCaseSensitive(document, "ring");
    bool failed = false;
    cJSON *readings = plan_setup(document, "readings", &failed);
    cJSON *end_to_end = plan_setup(readings, "end_to_end", &failed);
    for (size_t i = 0; i < 3; i++)
        plan_spot(end_to_end, conductors[i], &failed);
    for (size_t i = 0; i < 2; i++) {
        cJSON *setup = plan_setup(readings, crossed[i], &failed);
        plan_spot(setup, "board", &failed);
        plan_points(setup, cJSON_GetObjectItemCaseSensitive(ring, "points"), &failed);
        plan_points(setup, cJSON_GetObjectItemCaseSensitive(ring, "spurs"), &failed);
    }
    return !failed;
}

static enum rf_status parse_document(const cJSON *document, const char *source,
                                     struct rf_job **ring, struct rf_error *error)
{
    struct text text = {0};
    enum rf_status status = job_write_document(document, &text, error);
    if (status == RF_OK)
        status = rf_job_parse(text.bytes, text.length, source, ring, error);
    text_finish(&text);
    return status;
}

enum rf_status simulation_read_ring(const char *bytes, size_t length, const char *source,
                                    struct rf_job **ring, struct rf_error *error)
{
    cJSON *document = NULL;
    *ring = NULL;
    enum rf_status status = json_parse(bytes, length, source, JSON_DOCUMENT, &document, error);
    bool planned =
        status == RF_OK && cJSON_GetObjectItemCaseSensitive(document, "readings") == NULL;
    if (planned && cJSON_IsObject(document))
        status = plan_standard(document) ? parse_document(document, source, ring, error)
                                         : fail_memory(error);
    else if (status == RF_OK)
        status = rf_job_parse(bytes, length, source, ring, error);
    cJSON_Delete(document);
    return status;
}

/* --- random rings --- */

enum { POINTS_LEAST = 4, POINTS_MOST = 14 };

static double tenth(double metres)
{
    return fmax(0.1, round(metres * 10) / 10);
}

static void write_lengths(size_t n, gsl_rng *generator, struct text *out)
{
    double weights[POINTS_MOST + 1], sum = 0;
    double total = gsl_ran_flat(generator, 3.5, 8.0) * (double)(n + 1);
    for (size_t i = 0; i <= n; i++)
        sum += weights[i] = gsl_ran_flat(generator, 0.2, 1.8);
    text_add(out, "\"points\": [");
    for (size_t i = 0; i < n; i++)
        text_addf(out, "%s{\"id\": \"P%zu\", \"run_m\": %.1f}", i > 0 ? ", " : "", i + 1,
                  tenth(total * weights[i] / sum));
    text_addf(out, "], \"last_run_m\": %.1f", tenth(total * weights[n] / sum));
}

static size_t write_spurs(size_t n, gsl_rng *generator, struct text *out)
{
    static const size_t counts[] = {0, 0, 1, 2};
    size_t n_spurs = counts[gsl_rng_uniform_int(generator, 4)];
    text_add(out, ", \"spurs\": [");
    for (size_t i = 0; i < n_spurs; i++) {
        size_t from = 1 + (size_t)gsl_rng_uniform_int(generator, n);
        text_addf(out, "%s{\"id\": \"S%zu\", \"from\": \"P%zu\", \"run_m\": %.1f}",
                  i > 0 ? ", " : "", i + 1, from, tenth(gsl_ran_flat(generator, 1.5, 9.0)));
    }
    text_add(out, "]");
    return n_spurs;
}

/* 2 to 5 points, none twice, in order. */
static void write_some_points(const char *setup, size_t n, size_t n_spurs, gsl_rng *generator,
                              struct text *out)
{
    size_t places[POINTS_MOST + 2], chosen[5], count = 2 + gsl_rng_uniform_int(generator, 4);
    size_t total = n + n_spurs;
    for (size_t i = 0; i < total; i++)
        places[i] = i;
    if (count > total)
        count = total;
    if (gsl_ran_choose(generator, chosen, count, places, total, sizeof *places) != 0)
        return;
    text_addf(out, ", \"%s\": {", setup);
    for (size_t i = 0; i < count; i++) {
        bool spur = chosen[i] >= n;
        text_addf(out, "%s\"%c%zu\": 0", i > 0 ? ", " : "", spur ? 'S' : 'P',
                  spur ? chosen[i] - n + 1 : chosen[i] + 1);
    }
    text_add(out, "}");
}

static void write_all_points(const char *setup, size_t n, size_t n_spurs, struct text *out)
{
    text_addf(out, ", \"%s\": {\"board\": 0", setup);
    for (size_t i = 0; i < n; i++)
        text_addf(out, ", \"P%zu\": 0", i + 1);
    for (size_t i = 0; i < n_spurs; i++)
        text_addf(out, ", \"S%zu\": 0", i + 1);
    text_add(out, "}");
}

static void write_plan(enum ring_plan plan, size_t n, size_t n_spurs, gsl_rng *generator,
                       struct text *out)
{
    static const struct {
        const char *setup;
        double chance;
    } extra[] = {
        {"link_out_ln", 0.5}, {"link_out_le", 0.6}, {"cross_ne", 0.3}, {"lead_out_n", 0.45}};
    text_add(out, "\"readings\": {\"end_to_end\": {\"l\": 0, \"n\": 0, \"e\": 0}");
    write_all_points("cross_ln", n, n_spurs, out);
    write_all_points("cross_le", n, n_spurs, out);
    if (plan == PLAN_EXTRA) {
        text_add(out, ", \"apart_ln\": {\"out\": 0}, \"apart_le\": {\"out\": 0},"
                      " \"apart_ne\": {\"out\": 0}");
        for (size_t i = 0; i < sizeof extra / sizeof *extra; i++)
            if (gsl_rng_uniform(generator) < extra[i].chance)
                write_some_points(extra[i].setup, n, n_spurs, generator, out);
    }
    text_add(out, "}");
}

enum rf_status simulation_random_ring(uint32_t seed, enum ring_plan plan, struct rf_job **ring,
                                      struct rf_error *error)
{
    char name[32];
    struct text text = {0};
    gsl_rng *generator = gsl_rng_alloc(gsl_rng_mt19937);
    *ring = NULL;
    if (generator == NULL)
        return fail_memory(error);
    generator_seed(generator, seed, "ring");
    snprintf(name, sizeof name, "ring-%lu", (unsigned long)seed);
    size_t n = POINTS_LEAST + gsl_rng_uniform_int(generator, POINTS_MOST - POINTS_LEAST + 1);
    text_addf(&text,
              "{\"format\": \"ringfettle-job/1\", \"job\": \"%s\", \"ring\": {"
              "\"live_mm2\": 2.5, \"cpc_mm2\": 1.5, \"length_accuracy\": 0.2, ",
              name);
    write_lengths(n, generator, &text);
    size_t n_spurs = write_spurs(n, generator, &text);
    text_add(&text, "}, ");
    write_plan(plan, n, n_spurs, generator, &text);
    text_add(&text, "}");
    gsl_rng_free(generator);
    enum rf_status status =
        text.failed ? fail_memory(error) : rf_job_parse(text.bytes, text.length, name, ring, error);
    text_finish(&text);
    return status;
}
