/* SPDX-License-Identifier: GPL-3.0-or-later */

/*
 * Every job of scenarios/ against expected/NAME.json (expected/README.md): discovered, so that a
 * new scenario without its expectation fails.
 */

#include "base/json.h"
#include "base/text.h"
#include "diagnosis/diagnosis.h"

#include "../project.h"
#include "../shipped_models.h"
#include "../suite.h"

#include <cjson/cJSON.h>
#include <check.h>
#include <dirent.h>
#include <math.h>
#include <stdio.h>
#include <string.h>

enum { LEAST_SCENARIOS = 14 };

/* --- files --- */

static bool is_json(const char *name)
{
    size_t length = strlen(name);
    return length > 5 && strcmp(name + length - 5, ".json") == 0;
}

static bool exists(const char *folder, const char *name)
{
    char path[PATH_MOST];
    project_path(path, folder, name);
    FILE *file = fopen(path, "r");
    if (file != NULL)
        fclose(file);
    return file != NULL;
}

static cJSON *read_expected(const char *name)
{
    static const char *const known[] = {"source", "found", "least_confidence", "misfit", "wider",
                                        "value",  "look",  "suspects"};
    char path[PATH_MOST], bytes[8192];
    struct rf_error error;
    cJSON *tree;
    project_path(path, "tests/cases/expected", name);
    FILE *file = fopen(path, "r");
    ck_assert_msg(file != NULL, "%s is not there", path);
    size_t length = fread(bytes, 1, sizeof bytes, file);
    fclose(file);
    ck_assert_msg(json_parse(bytes, length, name, JSON_DOCUMENT, &tree, &error) == RF_OK, "%s",
                  error.text);
    struct json_at document = json_document(tree, name);
    ck_assert_msg(json_object(&document, known, sizeof known / sizeof *known, &error) == RF_OK,
                  "%s", error.text);
    const char *source = cJSON_GetStringValue(cJSON_GetObjectItem(tree, "source"));
    ck_assert_msg(source != NULL && strlen(source) > 20, "%s: says not where it comes from", name);
    return tree;
}

static struct rf_job *read_scenario(const char *name)
{
    char path[PATH_MOST];
    struct rf_job_reader *reader;
    struct rf_job *job;
    struct rf_error error;
    project_path(path, "scenarios", name);
    ck_assert_msg(rf_job_reader_open(path, &reader, &error) == RF_OK, "%s", error.text);
    ck_assert_msg(rf_job_reader_next(reader, &job, &error) == RF_OK, "%s", error.text);
    ck_assert_ptr_nonnull(job);
    rf_job_reader_close(reader);
    return job;
}

/* --- what is expected --- */

static size_t finding_of(const struct rf_diagnosis *diagnosis, size_t ranked)
{
    for (size_t i = 0; i < diagnosis->n_findings; i++)
        for (size_t k = 0; k < diagnosis->findings[i].n_members; k++)
            if (diagnosis->findings[i].members[k] == ranked)
                return i;
    return diagnosis->n_findings;
}

static void check_found(const struct rf_diagnosis *d, const cJSON *expected, const char *name)
{
    const char *where = cJSON_GetStringValue(cJSON_GetObjectItem(expected, "found"));
    const cJSON *least = cJSON_GetObjectItem(expected, "least_confidence");
    size_t finding = finding_of(d, d->found_rank);
    ck_assert_ptr_nonnull(where);
    ck_assert_msg(d->found_known, "%s has no `found`", name);
    if (strcmp(where, "not compared") == 0) {
        ck_assert_msg(d->found_rank == d->n_ranked, "%s: `found` was compared after all", name);
        return;
    }
    bool good = (strcmp(where, "first") == 0 && d->found_rank == 0) ||
                (strcmp(where, "first finding") == 0 && finding == 0) ||
                (strcmp(where, "first three") == 0 && d->found_rank < 3);
    ck_assert_msg(good && d->found_rank < d->n_ranked,
                  "%s: `found` stands at %zu, in finding %zu; expected %s; first is %s", name,
                  d->found_rank + 1, finding + 1, where, d->ranked[0].words);
    if (least != NULL)
        ck_assert_msg(d->findings[finding].confidence >= least->valuedouble,
                      "%s: confidence %.3f; expected %.3f or more", name,
                      d->findings[finding].confidence, least->valuedouble);
}

/* What else explains the readings where no one defect does; nothing where nothing is said. */
static void check_wider(const struct rf_diagnosis *d, const cJSON *expected, const char *name)
{
    const char *wider = cJSON_GetStringValue(cJSON_GetObjectItem(expected, "wider"));
    const char *assumed = rf_diagnosis_assumes(d);
    assumed = assumed != NULL ? assumed : "nothing";
    wider = wider != NULL ? wider : "nothing";
    ck_assert_msg(strcmp(assumed, wider) == 0, "%s: assumes %s; expected %s", name, assumed, wider);
}

static void check_value(const struct rf_diagnosis *d, const cJSON *expected, const char *name)
{
    const cJSON *value = cJSON_GetObjectItem(expected, "value");
    if (value == NULL)
        return;
    const struct estimate *estimate = &d->ranked[0].estimates[0];
    const cJSON *right = cJSON_GetObjectItem(value, estimate->metres ? "metres" : "ohms");
    ck_assert_msg(estimate->known && right != NULL, "%s: no such value", name);
    double within = cJSON_GetObjectItem(value, "within")->valuedouble;
    ck_assert_msg(fabs(log(estimate->value / right->valuedouble)) <= within,
                  "%s: %g; expected %g, its log within %g", name, estimate->value,
                  right->valuedouble, within);
}

static void check_look(const struct rf_diagnosis *d, const cJSON *expected, const char *name)
{
    const cJSON *look = cJSON_GetObjectItem(expected, "look");
    if (look == NULL)
        return;
    const char *kind = cJSON_GetStringValue(cJSON_GetObjectItem(look, "look"));
    const char *place = cJSON_GetStringValue(cJSON_GetObjectItem(look, "place"));
    ck_assert(kind != NULL && place != NULL && d->n_places > 0);
    const struct look *first = &d->places[0].look;
    ck_assert_msg((first->kind == LOOK_CHECK) == (strcmp(kind, "check") == 0),
                  "%s: the first look is of another kind than %s", name, kind);
    if (strcmp(place, "board") == 0)
        ck_assert_msg(first->where == LOOK_AT_BOARD, "%s: the first look is not at the board", name);
    else
        ck_assert_msg(first->where == LOOK_AT_PLACE &&
                          strcmp(d->job->places[first->index].id, place) == 0,
                      "%s: the first look is not at %s", name, place);
}

static void check_suspects(const struct rf_diagnosis *d, const cJSON *expected, const char *name)
{
    const cJSON *suspects = cJSON_GetObjectItem(expected, "suspects");
    if (suspects == NULL)
        return;
    ck_assert_uint_eq(d->n_suspects, (size_t)cJSON_GetArraySize(suspects));
    for (size_t i = 0; i < d->n_suspects; i++) {
        const struct reading *reading = &d->job->readings[d->suspects[i].reading];
        const cJSON *suspect = cJSON_GetArrayItem(suspects, (int)i);
        const char *setup = cJSON_GetStringValue(cJSON_GetObjectItem(suspect, "setup"));
        const char *place = cJSON_GetStringValue(cJSON_GetObjectItem(suspect, "place"));
        ck_assert(setup != NULL && place != NULL);
        ck_assert_msg(strcmp(setups[reading->setup].name, setup) == 0 &&
                          strcmp(reading_key(d->job, reading), place) == 0,
                      "%s: suspects %s.%s; expected %s.%s", name, setups[reading->setup].name,
                      reading_key(d->job, reading), setup, place);
    }
}

static void check_scenario(const char *name)
{
    struct rf_diagnosis *diagnosis;
    struct rf_error error;
    struct rf_job *job = read_scenario(name);
    cJSON *expected = read_expected(name);
    ck_assert_msg(job->note != NULL && strncmp(job->note, "Invented. ", 10) == 0,
                  "%s: a scenario's note says that it is invented", name);
    ck_assert_msg(rf_diagnose(job, models, &diagnosis, &error) == RF_OK, "%s", error.text);
    check_found(diagnosis, expected, name);
    ck_assert_msg(diagnosis->misfit.flag == cJSON_IsTrue(cJSON_GetObjectItem(expected, "misfit")),
                  "%s: misfit p = %g", name, diagnosis->misfit.p);
    check_wider(diagnosis, expected, name);
    check_value(diagnosis, expected, name);
    check_look(diagnosis, expected, name);
    check_suspects(diagnosis, expected, name);
    rf_diagnosis_destroy(diagnosis);
    cJSON_Delete(expected);
    rf_job_destroy(job);
}

START_TEST(scenarios_show_what_is_expected)
{
    char path[PATH_MOST];
    size_t n = 0;
    project_path(path, "scenarios", ".");
    DIR *folder = opendir(path);
    ck_assert_ptr_nonnull(folder);
    for (struct dirent *entry; (entry = readdir(folder)) != NULL;) {
        if (!is_json(entry->d_name))
            continue;
        check_scenario(entry->d_name);
        n++;
    }
    closedir(folder);
    ck_assert_uint_ge(n, LEAST_SCENARIOS);
}
END_TEST

START_TEST(expectations_have_a_scenario)
{
    char path[PATH_MOST];
    project_path(path, "tests/cases/expected", ".");
    DIR *folder = opendir(path);
    ck_assert_ptr_nonnull(folder);
    for (struct dirent *entry; (entry = readdir(folder)) != NULL;)
        if (is_json(entry->d_name))
            ck_assert_msg(exists("scenarios", entry->d_name), "%s has no scenario", entry->d_name);
    closedir(folder);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("scenarios");
    TCase *tests = tcase_create("scenarios");
    tcase_add_checked_fixture(tests, load_models, unload_models);
    tcase_set_timeout(tests, 60);
    tcase_add_test(tests, scenarios_show_what_is_expected);
    tcase_add_test(tests, expectations_have_a_scenario);
    suite_add_tcase(suite, tests);
    return run_suite(suite);
}
