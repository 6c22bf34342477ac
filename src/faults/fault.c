/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "faults/fault.h"

#include "base/error.h"

#include <string.h>

static bool same_number(double one, double other)
{
    return !(one < other) && !(one > other);
}

static bool same_chain(const struct fault *one, const struct fault *other)
{
    if (one->chain_length != other->chain_length)
        return false;
    for (size_t i = 0; i < one->chain_length; i++)
        if (one->chain[i] != other->chain[i])
            return false;
    return true;
}

bool fault_equal(const struct fault *one, const struct fault *other)
{
    return one->family == other->family && one->run == other->run &&
           one->conductor == other->conductor && one->place == other->place &&
           one->other == other->other && same_chain(one, other) && one->pair == other->pair &&
           one->poles == other->poles && one->open == other->open && one->leg_in == other->leg_in &&
           one->setup == other->setup && same_number(one->live_mm2, other->live_mm2) &&
           same_number(one->cpc_mm2, other->cpc_mm2);
}

bool fault_has_parameter(const struct fault *fault)
{
    const struct fault_family *family = fault->family;
    if (family->has_parameter != NULL)
        return family->has_parameter(fault);
    return family->ohms || family->metres;
}

double fault_kind_share(const struct fault *fault, const struct family_prior *row)
{
    const struct fault_family *family = fault->family;
    if (family->kind == NULL)
        return 1;
    const char *name = family->kind_names[family->kind(fault)];
    for (size_t i = 0; i < row->n_kinds; i++)
        if (strcmp(row->kinds[i].name, name) == 0)
            return row->kinds[i].share;
    return 0;
}

void fault_looks(const struct fault *fault, const struct rf_job *job,
                 const struct rf_models *models, look_callback *callback, void *context)
{
    if (fault->family->looks != NULL)
        fault->family->looks(fault, job, models, callback, context);
}

enum danger fault_danger(const struct fault *fault, const struct rf_job *job)
{
    return fault->family->danger != NULL ? fault->family->danger(fault, job) : DANGER_NONE;
}

/* --- hypotheses --- */

static bool holds(const struct hypothesis *hypothesis, const struct fault *fault)
{
    for (size_t i = 0; i < hypothesis->n_faults; i++)
        if (fault_equal(&hypothesis->faults[i], fault))
            return true;
    return false;
}

/* Sets: in whatever order, no fault twice. */
bool hypothesis_equal(const struct hypothesis *one, const struct hypothesis *other)
{
    if (one->n_faults != other->n_faults)
        return false;
    for (size_t i = 0; i < one->n_faults; i++)
        if (!holds(other, &one->faults[i]))
            return false;
    return true;
}

void hypothesis_apply(const struct hypothesis *hypothesis, struct wiring *wiring,
                      int parameter_of[FAULTS_AT_ONCE])
{
    for (size_t i = 0; i < hypothesis->n_faults; i++) {
        const struct fault *fault = &hypothesis->faults[i];
        double median = 0;
        int parameter = NO_PARAMETER;
        if (fault_has_parameter(fault)) {
            const struct family_prior *row = models_family(wiring->models, fault->family->name);
            median = row->parameter.median;
            parameter = wiring_add_parameter(wiring, row->parameter.sigma);
        }
        if (fault->family->apply != NULL)
            fault->family->apply(fault, wiring, median, parameter);
        if (parameter_of != NULL)
            parameter_of[i] = parameter;
    }
}

/* --- the models' rows against the list --- */

/* Between the models' name and a file's: "shipped faults.json", "DIR/faults.json". */
static char between_names(const struct rf_models *models)
{
    return strcmp(models->name, "shipped") == 0 ? ' ' : '/';
}

/* The names a family knows, of kinds or of shares, and those its row has. */
struct names {
    const char *file, *what; /* "faults.json", "kinds" */
    const char *const *known;
    size_t n_known;
    const char *in_row[MODELS_MAX_KINDS];
    size_t n_in_row;
};

static bool is_among(const char *name, const char *const names[], size_t n)
{
    for (size_t i = 0; i < n; i++)
        if (strcmp(names[i], name) == 0)
            return true;
    return false;
}

static void list_names(const char *const names[], size_t n, struct text *out)
{
    if (n == 0)
        text_add(out, "none");
    for (size_t i = 0; i < n; i++)
        text_addf(out, "%s%s", i > 0 ? ", " : "", names[i]);
}

/* As many names as known, each of them there (a row's names differ): the same names. */
static enum rf_status check_names(const struct rf_models *models, const char *family,
                                  const struct names *names, struct rf_error *error)
{
    bool right = names->n_in_row == names->n_known;
    for (size_t i = 0; i < names->n_known && right; i++)
        right = is_among(names->known[i], names->in_row, names->n_in_row);
    if (right)
        return RF_OK;
    struct text found = {0}, known = {0};
    list_names(names->in_row, names->n_in_row, &found);
    list_names(names->known, names->n_known, &known);
    enum rf_status status =
        found.failed || known.failed
            ? fail_memory(error)
            : fail(error, RF_REFUSED, "%s%c%s: family %s: found the %s %s; right would be %s",
                   models->name, between_names(models), names->file, family, names->what,
                   found.bytes, known.bytes);
    text_finish(&found);
    text_finish(&known);
    return status;
}

static enum rf_status check_parameter(const struct rf_models *models,
                                      const struct fault_family *family,
                                      const struct lognormal *parameter, struct rf_error *error)
{
    bool wanted = family->ohms || family->metres;
    if (wanted == (parameter->median > 0))
        return RF_OK;
    if (!wanted)
        return fail(error, RF_REFUSED,
                    "%s%cfaults.json: family %s: found a parameter; right would be none",
                    models->name, between_names(models), family->name);
    return fail(error, RF_REFUSED,
                "%s%cfaults.json: family %s: no parameter; right would be its median in %s and "
                "its sigma",
                models->name, between_names(models), family->name,
                family->ohms ? "ohms" : "metres");
}

static enum rf_status check_row(const struct rf_models *models, const struct fault_family *family,
                                struct rf_error *error)
{
    const struct family_prior *row = models_family(models, family->name);
    if (row == NULL)
        return fail(error, RF_REFUSED,
                    "%s%cfaults.json: no row for the family %s; right would be one row for each "
                    "family",
                    models->name, between_names(models), family->name);
    struct names kinds = {.file = "faults.json",
                          .what = "kinds",
                          .known = family->kind_names,
                          .n_known = family->n_kinds,
                          .n_in_row = row->n_kinds};
    for (size_t i = 0; i < row->n_kinds; i++)
        kinds.in_row[i] = row->kinds[i].name;
    struct names shares = {.file = "effort.json",
                           .what = "shares",
                           .known = family->share_names,
                           .n_known = family->n_shares,
                           .n_in_row = row->n_shares};
    for (size_t i = 0; i < row->n_shares; i++)
        shares.in_row[i] = row->shares[i].name;
    enum rf_status status = check_names(models, family->name, &kinds, error);
    if (status == RF_OK)
        status = check_names(models, family->name, &shares, error);
    if (status == RF_OK)
        status = check_parameter(models, family, &row->parameter, error);
    return status;
}

enum rf_status fault_check_models(const struct rf_models *models, struct rf_error *error)
{
    for (size_t i = 0; i < models->n_families; i++) {
        const char *name = models->families[i].name;
        if (fault_family_find(name) != NULL)
            continue;
        const char *names[MODELS_MAX_FAMILIES];
        for (size_t k = 0; k < n_fault_families && k < MODELS_MAX_FAMILIES; k++)
            names[k] = fault_families[k]->name;
        const char *nearest = text_nearest(name, names, n_fault_families);
        return fail(error, RF_REFUSED, "%s%cfaults.json: there is no family \"%s\"%s%s",
                    models->name, between_names(models), name,
                    nearest != NULL ? "; nearest is " : "", nearest != NULL ? nearest : "");
    }
    for (size_t i = 0; i < n_fault_families; i++) {
        enum rf_status status = check_row(models, fault_families[i], error);
        if (status != RF_OK)
            return status;
    }
    return RF_OK;
}

bool looked_at(const struct rf_job *job, const struct look *look)
{
    if (look->where == LOOK_AT_BOARD)
        return job->board_opened;
    if (look->where == LOOK_IN_RUN)
        return false;
    const struct place *place = &job->places[look->index];
    return look->kind == LOOK_OPEN ? place->opened : place->checked;
}
