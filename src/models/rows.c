/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "models/read.h"

#include <float.h>
#include <math.h>
#include <string.h>

#define COUNT(array) (sizeof(array) / sizeof(array)[0])

static const double SUM_TOLERANCE = 1e-6;
static const char share_needs[] = "a share above 0, at most 1";
static const char size_needs[] = "a size in mm² from 0.1 to 1000";

/* Member `key` of a row; missing where it must not be is the checked reader's to refuse. */
static enum rf_status number_of(const struct json_at *row, const char *key, double low, double high,
                                const char *needs, double *number, struct rf_error *error)
{
    struct json_at member = json_member(row, key);
    return json_number(&member, low, high, needs, number, error);
}

/* A copy of the name among the tables' strings, which have room for every name in the files. */
static const char *keep_name(struct rf_models *models, const char *name)
{
    char *kept = models->strings + models->strings_used;
    size_t size = strlen(name) + 1;
    memcpy(kept, name, size);
    models->strings_used += size;
    return kept;
}

/* --- conductor.json --- */

static enum rf_status read_size(const struct json_at *row, struct rf_models *models,
                                struct rf_error *error)
{
    static const char *const keys[] = {"mm2", "ohm_per_km"};
    struct conductor_row size;
    double ohm_per_km;
    enum rf_status status = json_object(row, keys, COUNT(keys), error);
    if (status == RF_OK)
        status = number_of(row, "mm2", 0.1, 1000, size_needs, &size.mm2, error);
    if (status == RF_OK)
        status =
            number_of(row, "ohm_per_km", 1e-3, 1000, "Ω/km from 0.001 to 1000", &ohm_per_km, error);
    if (status != RF_OK)
        return status;
    size.ohm_per_m = ohm_per_km / 1000;
    if (models->n_sizes > 0) {
        const struct conductor_row *before = &models->sizes[models->n_sizes - 1];
        if (size.mm2 <= before->mm2 || size.ohm_per_m >= before->ohm_per_m)
            return json_fail(row, error, RF_REFUSED,
                             "found %g mm² of %g Ω/km behind %g mm² of %g Ω/km; needs rows in "
                             "ascending size and falling resistance",
                             size.mm2, ohm_per_km, before->mm2, before->ohm_per_m * 1000);
    }
    models->sizes[models->n_sizes++] = size;
    return RF_OK;
}

static enum rf_status read_cable(const struct json_at *row, struct rf_models *models,
                                 struct rf_error *error)
{
    static const char *const keys[] = {"live_mm2", "cpc_mm2"};
    struct cable_row cable;
    double *const sizes[] = {&cable.live_mm2, &cable.cpc_mm2};
    enum rf_status status = json_object(row, keys, COUNT(keys), error);
    for (size_t i = 0; status == RF_OK && i < COUNT(keys); i++) {
        status = number_of(row, keys[i], 0.1, 1000, size_needs, sizes[i], error);
        if (status == RF_OK && isnan(models_ohm_per_m(models, *sizes[i], 20))) {
            struct json_at member = json_member(row, keys[i]);
            return json_fail_found(&member, error, "a size that has a row in sizes");
        }
    }
    if (status != RF_OK)
        return status;
    for (size_t i = 0; i < models->n_cables; i++) {
        const struct cable_row *before = &models->cables[i];
        if (before->live_mm2 == cable.live_mm2 && before->cpc_mm2 == cable.cpc_mm2)
            return json_fail(row, error, RF_REFUSED, "found %g/%g mm² again; needs each cable once",
                             cable.live_mm2, cable.cpc_mm2);
    }
    models->cables[models->n_cables++] = cable;
    return RF_OK;
}

/* --- faults.json --- */

static enum rf_status read_parameter(const struct json_at *row, struct family_prior *family,
                                     struct rf_error *error)
{
    struct json_at ohm = json_member(row, "ohm");
    struct json_at metres = json_member(row, "metres");
    struct json_at sigma = json_member(row, "sigma");
    if (ohm.value != NULL && metres.value != NULL)
        return json_fail(row, error, RF_REFUSED, "found ohm and metres; needs one of them");
    if (ohm.value == NULL && metres.value == NULL) {
        if (sigma.value != NULL)
            return json_fail(row, error, RF_REFUSED,
                             "found sigma alone; needs ohm or metres, the median, beside it");
        return RF_OK;
    }
    family->metres = metres.value != NULL;
    enum rf_status status = family->metres
                                ? json_number(&metres, 0.1, 500, "metres from 0.1 to 500",
                                              &family->parameter.median, error)
                                : json_number(&ohm, 1e-4, 1e4, "ohms from 0.0001 to 10000",
                                              &family->parameter.median, error);
    if (status != RF_OK)
        return status;
    return json_number(&sigma, 0, 5, "a standard deviation of the log from 0 to 5",
                       &family->parameter.sigma, error);
}

/* `kinds` and `shares` are the same: names with a share each. */
struct named_share {
    const char *name;
    double share;
};

static enum rf_status read_shares(const struct json_at *at, struct rf_models *models,
                                  struct named_share shares[MODELS_MAX_KINDS], size_t *n,
                                  struct rf_error *error)
{
    *n = 0;
    enum rf_status status = json_object(at, NULL, 0, error);
    if (status != RF_OK)
        return status;
    JSON_EACH (at, member, i) {
        if (json_is_private(member.key))
            continue;
        if (*n == MODELS_MAX_KINDS)
            return json_fail(at, error, RF_REFUSED, "found more than %d shares; needs 1 to %d",
                             MODELS_MAX_KINDS, MODELS_MAX_KINDS);
        status = json_number(&member, DBL_MIN, 1, share_needs, &shares[*n].share, error);
        if (status != RF_OK)
            return status;
        shares[*n].name = keep_name(models, member.key);
        ++*n;
    }
    if (*n == 0)
        return json_fail(at, error, RF_REFUSED, "found no share; needs 1 to %d", MODELS_MAX_KINDS);
    return RF_OK;
}

static enum rf_status read_kinds(const struct json_at *row, struct rf_models *models,
                                 struct family_prior *family, struct rf_error *error)
{
    struct json_at kinds = json_member(row, "kinds");
    if (kinds.value == NULL)
        return RF_OK;
    struct named_share shares[MODELS_MAX_KINDS];
    enum rf_status status = read_shares(&kinds, models, shares, &family->n_kinds, error);
    if (status != RF_OK)
        return status;
    double sum = 0;
    for (size_t i = 0; i < family->n_kinds; i++) {
        family->kinds[i].name = shares[i].name;
        family->kinds[i].share = shares[i].share;
        sum += shares[i].share;
    }
    if (fabs(sum - 1) > SUM_TOLERANCE)
        return json_fail(&kinds, error, RF_REFUSED, "found shares that sum to %.7g; needs 1", sum);
    return RF_OK;
}

/* The family's name as the row has it, the document's string. */
static enum rf_status read_name(const struct json_at *row, const char **name,
                                struct rf_error *error)
{
    struct json_at member = json_member(row, "family");
    return json_string(&member, "the name of a family", name, error);
}

static enum rf_status read_family(const struct json_at *row, struct rf_models *models,
                                  struct rf_error *error)
{
    static const char *const keys[] = {"family", "prior", "ohm",  "metres",
                                       "sigma",  "kinds", "count"};
    struct family_prior family = {0};
    const char *name;
    enum rf_status status = json_object(row, keys, COUNT(keys), error);
    if (status == RF_OK)
        status = read_name(row, &name, error);
    if (status != RF_OK)
        return status;
    if (models_family(models, name) != NULL)
        return json_fail(row, error, RF_REFUSED, "found a second row for %s; needs one", name);
    family.name = keep_name(models, name);
    status = number_of(row, "prior", DBL_MIN, 1, share_needs, &family.prior, error);
    if (status == RF_OK)
        status = read_parameter(row, &family, error);
    if (status == RF_OK)
        status = read_kinds(row, models, &family, error);
    struct json_at count = json_member(row, "count");
    if (status == RF_OK && count.value != NULL)
        status = json_number(&count, 0, 1e12, "how many confirmed jobs, 0 or more", &family.count,
                             error);
    if (status == RF_OK)
        models->families[models->n_families++] = family;
    return status;
}

static enum rf_status check_families(const struct json_at *rows, const struct rf_models *models,
                                     struct rf_error *error)
{
    double sum = 0;
    for (size_t i = 0; i < models->n_families; i++)
        sum += models->families[i].prior;
    if (fabs(sum - 1) > SUM_TOLERANCE)
        return json_fail(rows, error, RF_REFUSED, "found priors that sum to %.7g; needs 1", sum);
    const struct family_prior *none = models_family(models, "none");
    if (none == NULL || models->n_families < 2)
        return json_fail(rows, error, RF_REFUSED,
                         "found no row for %s; needs none, and a family beside it",
                         none == NULL ? "none" : "a defect");
    return RF_OK;
}

/* --- effort.json --- */

static enum rf_status read_shows(const struct json_at *row, struct rf_models *models,
                                 struct rf_error *error)
{
    static const char *const keys[] = {"family", "shares"};
    const char *name;
    enum rf_status status = json_object(row, keys, COUNT(keys), error);
    if (status == RF_OK)
        status = read_name(row, &name, error);
    if (status != RF_OK)
        return status;
    struct json_at member = json_member(row, "family");
    struct family_prior *family = NULL;
    for (size_t i = 0; i < models->n_families; i++) {
        if (strcmp(models->families[i].name, name) == 0 && strcmp(name, "none") != 0)
            family = &models->families[i];
    }
    if (family == NULL)
        return json_fail_found(&member, error, "a family of faults.json, other than none");
    if (family->n_shares > 0)
        return json_fail(row, error, RF_REFUSED, "found a second row for %s; needs one", name);
    struct json_at at = json_member(row, "shares");
    struct named_share shares[MODELS_MAX_KINDS];
    status = read_shares(&at, models, shares, &family->n_shares, error);
    if (status != RF_OK)
        return status;
    for (size_t i = 0; i < family->n_shares; i++) {
        family->shares[i].name = shares[i].name;
        family->shares[i].share = shares[i].share;
    }
    return RF_OK;
}

static enum rf_status check_shows(const struct json_at *rows, const struct rf_models *models,
                                  struct rf_error *error)
{
    for (size_t i = 0; i < models->n_families; i++) {
        const struct family_prior *family = &models->families[i];
        if (family->n_shares == 0 && strcmp(family->name, "none") != 0)
            return json_fail(rows, error, RF_REFUSED,
                             "found no row for %s; needs one for each family of faults.json "
                             "but none",
                             family->name);
    }
    return RF_OK;
}

/* --- the lists --- */

static const struct row_block conductor_blocks[] = {
    {"sizes", MODELS_MAX_SIZES, read_size, NULL},
    {"cables", MODELS_MAX_CABLES, read_cable, NULL},
};
static const struct row_block faults_blocks[] = {
    {"families", MODELS_MAX_FAMILIES, read_family, check_families},
};
static const struct row_block effort_blocks[] = {
    {"shows", MODELS_MAX_FAMILIES, read_shows, check_shows},
};

const struct row_block *const row_blocks[N_MODEL_FILES] = {
    [FILE_CONDUCTOR] = conductor_blocks,
    [FILE_FAULTS] = faults_blocks,
    [FILE_EFFORT] = effort_blocks,
};
const size_t n_row_blocks[N_MODEL_FILES] = {
    [FILE_CONDUCTOR] = COUNT(conductor_blocks),
    [FILE_FAULTS] = COUNT(faults_blocks),
    [FILE_EFFORT] = COUNT(effort_blocks),
};

enum rf_status read_row_block(const struct json_at *document, const struct row_block *block,
                              struct rf_models *models, struct rf_error *error)
{
    static const char *const keys[] = {"source", "rows"};
    struct json_at at;
    enum rf_status status = open_block(document, block->name, keys, COUNT(keys), &at, error);
    if (status != RF_OK)
        return status;
    struct json_at rows = json_member(&at, "rows");
    status = json_array(&rows, 1, block->most, "a list of rows", error);
    if (status != RF_OK)
        return status;
    JSON_EACH (&rows, row, i) {
        status = block->read_row(&row, models, error);
        if (status != RF_OK)
            return status;
    }
    return block->check == NULL ? RF_OK : block->check(&rows, models, error);
}
