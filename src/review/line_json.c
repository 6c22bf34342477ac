/* SPDX-License-Identifier: GPL-3.0-or-later */

/* A line's member "review": whole numbers of 1e-9 for chances and logs. */

#include "base/error.h"
#include "base/json.h"
#include "review/line.h"

#include <math.h>
#include <string.h>

/* --- writing --- */

static bool add(cJSON *object, const char *key, cJSON *item)
{
    if (item != NULL && object != NULL && cJSON_AddItemToObject(object, key, item))
        return true;
    cJSON_Delete(item);
    return false;
}

static bool add_number(cJSON *object, const char *key, double number)
{
    return add(object, key, cJSON_CreateNumber(number));
}

static bool add_flag(cJSON *object, const char *key, bool flag)
{
    return !flag || add(object, key, cJSON_CreateTrue());
}

/* Kind and conductor are left out where the family has none. */
static bool add_sort(cJSON *object, const struct fault_sort *sort)
{
    const struct fault_family *family =
        sort->family < n_fault_families ? fault_families[sort->family] : NULL;
    bool ok = add(object, "family", cJSON_CreateString(sort_name(sort->family)));
    if (ok && family != NULL && family->n_kinds > 0)
        ok = add(object, "kind", cJSON_CreateString(family->kind_names[sort->kind]));
    if (ok && sort->conductor > 0)
        ok = add(object, "conductor", cJSON_CreateString(conductor_kind_names[sort->conductor]));
    return ok;
}

static bool add_looks(cJSON *object, const struct review_line *line)
{
    if (!line->found.looked)
        return true;
    cJSON *list = cJSON_AddArrayToObject(object, "looks");
    bool ok = list != NULL;
    for (size_t i = 0; i < N_LOOK_BINS && ok; i++) {
        cJSON *item = cJSON_CreateNumber((double)line->found.looks[i]);
        ok = item != NULL && cJSON_AddItemToArray(list, item);
        if (!ok)
            cJSON_Delete(item);
    }
    return ok && add_number(object, "places", (double)line->found.places);
}

static bool add_found(cJSON *root, const struct review_line *line)
{
    if (!line->found.known)
        return true;
    cJSON *object = cJSON_CreateObject();
    bool ok = add_sort(object, &line->found.sort) &&
              add_number(object, "rank", (double)line->found.rank) &&
              add_flag(object, "agrees", line->found.agrees) &&
              add_number(object, "log_posterior", (double)line->found.log_posterior) &&
              add_flag(object, "below", line->found.below) && add_looks(object, line);
    return add(root, "found", object) && ok;
}

cJSON *line_to_json(const struct review_line *line)
{
    cJSON *root = cJSON_CreateObject(), *first = cJSON_CreateObject();
    bool ok = add_sort(first, &line->first);
    ok = add(root, "first", first) && ok;
    ok = ok && add(root, "verdict", cJSON_CreateString(verdict_names[line->verdict])) &&
         add_number(root, "confidence", (double)line->confidence) &&
         add_number(root, "none", (double)line->none) &&
         add_number(root, "danger", (double)line->danger) &&
         add_flag(root, "testing", line->testing) &&
         add_number(root, "readings", (double)line->readings) &&
         add_number(root, "written_off", (double)line->written_off) &&
         add_flag(root, "other_wiring", line->other_wiring) &&
         add_flag(root, "other_lengths", line->other_lengths) && add_found(root, line);
    if (ok)
        return root;
    cJSON_Delete(root);
    return NULL;
}

/* --- reading --- */

static enum rf_status read_whole(const struct json_at *object, const char *key, double low,
                                 double high, int64_t *number, struct rf_error *error)
{
    static const char needs[] = "a whole number as review --json writes it";
    struct json_at member = json_member(object, key);
    double value;
    enum rf_status status = json_number(&member, low, high, needs, &value, error);
    if (status == RF_OK && value != rint(value))
        status = json_fail_found(&member, error, needs);
    if (status == RF_OK)
        *number = (int64_t)value;
    return status;
}

static enum rf_status read_flag(const struct json_at *object, const char *key, bool *flag,
                                struct rf_error *error)
{
    struct json_at member = json_member(object, key);
    *flag = false;
    return member.value == NULL ? RF_OK : json_boolean(&member, flag, error);
}

static enum rf_status read_words(const struct json_at *at, char **words, struct rf_error *error)
{
    const char *string;
    enum rf_status status = json_string(at, "text as review --json writes it", &string, error);
    if (status != RF_OK)
        return status;
    *words = text_duplicate(string);
    return *words != NULL ? RF_OK : fail_memory(error);
}

static enum rf_status read_sort(const struct json_at *object, struct fault_sort *sort,
                                struct rf_error *error)
{
    const char *names[MODELS_MAX_FAMILIES + 1];
    size_t n = 0;
    for (; n < n_sorts(); n++)
        names[n] = sort_name(n);
    struct json_at at = json_member(object, "family");
    enum rf_status status = json_choice(&at, names, n, &sort->family, error);
    if (status != RF_OK || sort->family >= n_fault_families)
        return status;
    const struct fault_family *family = fault_families[sort->family];
    if (family->n_kinds > 0) {
        at = json_member(object, "kind");
        status = json_choice(&at, family->kind_names, family->n_kinds, &sort->kind, error);
    }
    at = json_member(object, "conductor");
    if (status == RF_OK && at.value != NULL)
        status = json_choice(&at, conductor_kind_names, N_CONDUCTOR_KINDS, &sort->conductor, error);
    return status;
}

static enum rf_status read_looks(const struct json_at *found, struct review_line *line,
                                 struct rf_error *error)
{
    static const char needs[] = "chances as review --json writes them";
    struct json_at looks = json_member(found, "looks");
    if (looks.value == NULL)
        return RF_OK;
    line->found.looked = true;
    enum rf_status status = json_array(&looks, N_LOOK_BINS, N_LOOK_BINS, needs, error);
    if (status == RF_OK)
        status = read_whole(found, "places", 0, 1e6 * PARTS, &line->found.places, error);
    JSON_EACH(&looks, look, i) {
        double chance = 0;
        if (status == RF_OK)
            status = json_number(&look, 0, PARTS, needs, &chance, error);
        if (status == RF_OK)
            line->found.looks[i] = (int64_t)chance;
    }
    return status;
}

static enum rf_status read_found(const struct json_at *found, struct review_line *line,
                                 struct rf_error *error)
{
    line->found.known = true;
    enum rf_status status = read_sort(found, &line->found.sort, error);
    if (status == RF_OK)
        status = read_whole(found, "rank", -1, 1e9, &line->found.rank, error);
    if (status == RF_OK)
        status = read_flag(found, "agrees", &line->found.agrees, error);
    if (status == RF_OK)
        status =
            read_whole(found, "log_posterior", -20.0 * PARTS, 0, &line->found.log_posterior, error);
    if (status == RF_OK)
        status = read_flag(found, "below", &line->found.below, error);
    if (status == RF_OK)
        status = read_looks(found, line, error);
    return status;
}

static enum rf_status read_verdict(const struct json_at *root, struct review_line *line,
                                   struct rf_error *error)
{
    size_t index = 0;
    struct json_at verdict = json_member(root, "verdict");
    struct json_at first = json_member(root, "first");
    enum rf_status status = json_choice(&verdict, verdict_names, N_VERDICTS, &index, error);
    line->verdict = (enum verdict)index;
    if (status == RF_OK)
        status = read_sort(&first, &line->first, error);
    if (status == RF_OK)
        status = read_flag(root, "testing", &line->testing, error);
    if (status == RF_OK)
        status = read_flag(root, "other_wiring", &line->other_wiring, error);
    if (status == RF_OK)
        status = read_flag(root, "other_lengths", &line->other_lengths, error);
    return status;
}

static enum rf_status read_numbers(const struct json_at *root, struct review_line *line,
                                   struct rf_error *error)
{
    int64_t readings = 0, written_off = 0;
    enum rf_status status = read_whole(root, "confidence", 0, PARTS, &line->confidence, error);
    if (status == RF_OK)
        status = read_whole(root, "none", 0, PARTS, &line->none, error);
    if (status == RF_OK)
        status = read_whole(root, "danger", 0, PARTS, &line->danger, error);
    if (status == RF_OK)
        status = read_whole(root, "readings", 0, 1e9, &readings, error);
    if (status == RF_OK)
        status = read_whole(root, "written_off", 0, 1e9, &written_off, error);
    line->readings = (uint64_t)readings;
    line->written_off = (uint64_t)written_off;
    return status;
}

enum rf_status line_from_json(struct review_line *line, const struct json_at *document,
                              struct rf_error *error)
{
    struct json_at root = json_member(document, "review");
    struct json_at job = json_member(document, "job");
    struct json_at findings = json_member(document, "findings");
    struct json_at finding = json_child(&findings, 0, json_first(&findings));
    struct json_at words = json_member(&finding, "text");
    struct json_at found = json_member(&root, "found");
    enum rf_status status = json_object(&root, NULL, 0, error);
    if (status == RF_OK)
        status = read_words(&job, &line->job, error);
    if (status == RF_OK)
        status = read_words(&words, &line->words, error);
    if (status == RF_OK)
        status = read_verdict(&root, line, error);
    if (status == RF_OK)
        status = read_numbers(&root, line, error);
    if (status == RF_OK && found.value != NULL)
        status = read_found(&found, line, error);
    return status;
}
