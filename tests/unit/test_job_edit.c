/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * Changes in files: over made-up jobs in several layouts, what was there stays, byte for byte and
 * in its order, and what comes out is the same job with the change and nothing else.
 */

#include "../job_maker.h"
#include "../suite.h"

#include "job/job_edit.h"
#include "job/job_write.h"
#include "job/sheet.h"

#include <check.h>
#include <stdlib.h>

enum { N_JOBS = 400, N_LAYOUTS = 6 };

/* The document as text in one of several layouts. */
static void lay_out(const cJSON *document, size_t layout, struct text *out)
{
    static const struct sheet_style styles[] = {{',', '.'}, {';', ','}, {'\t', '.'}};
    struct rf_error error = {0};
    if (layout == 0) {
        ck_assert_int_eq(job_write_document(document, out, &error), RF_OK);
    } else if (layout <= 2) {
        char *json = layout == 1 ? cJSON_Print(document) : cJSON_PrintUnformatted(document);
        text_add(out, json);
        free(json);
    } else {
        ck_assert_int_eq(sheet_write(document, &styles[layout - 3], NULL, 0, out, &error), RF_OK);
    }
}

/* Whether all bytes of `old` are in `new`, in their order: nothing of it was touched. */
static bool is_kept(const struct text *old, const struct text *new)
{
    size_t at = 0;
    for (size_t i = 0; i < new->length && at < old->length; i++)
        at += new->bytes[i] == old->bytes[at];
    return at == old->length;
}

static struct rf_job *edit(struct text *bytes, const struct job_change *change)
{
    struct rf_job *job;
    struct rf_error error = {0};
    enum rf_status status =
        job_edit(bytes, "made", change, 1, "2026-02-11T08:00:00Z", &job, &error);
    ck_assert_msg(status == RF_OK, "%s\n%s", error.text, bytes->bytes);
    return job;
}

static cJSON *object(cJSON *in, const char *key)
{
    cJSON *found = cJSON_GetObjectItemCaseSensitive(in, key);
    return found != NULL ? found : cJSON_AddObjectToObject(in, key);
}

/* The change made to a document: a reading put behind those that are there. */
static void add_value(cJSON *setup, const char *place, cJSON *value)
{
    cJSON *old = cJSON_DetachItemFromObjectCaseSensitive(setup, place);
    if (old != NULL && !cJSON_IsArray(old)) {
        cJSON *list = cJSON_CreateArray();
        cJSON_AddItemToArray(list, old);
        old = list;
    }
    if (old != NULL)
        cJSON_AddItemToArray(old, value);
    cJSON_AddItemToObject(setup, place, old != NULL ? old : value);
}

static void expect_same(const cJSON *wanted, const struct rf_job *job, const struct text *bytes)
{
    if (!cJSON_Compare(wanted, job->document, true)) {
        char *json = cJSON_PrintUnformatted(wanted);
        char *have = cJSON_PrintUnformatted(job->document);
        ck_abort_msg("wanted %s\nhave   %s\n%s", json, have, bytes->bytes);
    }
}

START_TEST(readings)
{
    for (uint64_t seed = 1; seed <= N_JOBS; seed++) {
        cJSON *document = make_job(seed + 5000);
        struct text before = {0}, bytes = {0};
        const char *values[] = {"0.40", "\"open\""};
        const cJSON *point = cJSON_GetObjectItemCaseSensitive(
                                 cJSON_GetObjectItemCaseSensitive(document, "ring"), "points")
                                 ->child;
        const cJSON *kind = cJSON_GetObjectItemCaseSensitive(point, "kind");
        bool box = kind != NULL && strcmp(kind->valuestring, "junction_box") == 0;
        struct job_change change = {
            .how = CHANGE_ADD,
            .what = CHANGE_READING,
            .setup = box ? 0 : setup_find("cross_le"),
            .place = box ? "e" : cJSON_GetObjectItemCaseSensitive(point, "id")->valuestring,
            .values = values,
            .n_values = 1 + seed % 2,
        };
        lay_out(document, seed % N_LAYOUTS, &before);
        text_append(&bytes, before.bytes, before.length);

        struct rf_job *job = edit(&bytes, &change);
        cJSON *setup = object(object(document, "readings"), setups[change.setup].name);
        add_value(setup, change.place, cJSON_CreateNumber(0.4));
        if (change.n_values > 1)
            add_value(setup, change.place, cJSON_CreateString("open"));
        expect_same(document, job, &bytes);
        ck_assert_msg(is_kept(&before, &bytes), "%s\n%s", before.bytes, bytes.bytes);
        rf_job_destroy(job);

        /* Corrected, then removed: what was there is in the history, twice. */
        cJSON *old = cJSON_DetachItemFromObjectCaseSensitive(setup, change.place);
        change.how = CHANGE_CORRECT;
        change.n_values = 1;
        values[0] = "1.25";
        rf_job_destroy(edit(&bytes, &change));
        change.how = CHANGE_REMOVE;
        job = edit(&bytes, &change);
        const cJSON *history =
            cJSON_GetObjectItemCaseSensitive(job->document, "x_history");
        ck_assert_int_eq(cJSON_GetArraySize(history), 2);
        ck_assert(cJSON_Compare(
            cJSON_GetObjectItemCaseSensitive(cJSON_GetArrayItem(history, 0), "was"), old, true));
        cJSON *second = cJSON_CreateNumber(1.25);
        ck_assert(cJSON_Compare(
            cJSON_GetObjectItemCaseSensitive(cJSON_GetArrayItem(history, 1), "was"), second,
            true));
        ck_assert_str_eq(cJSON_GetObjectItemCaseSensitive(history->child, "time")->valuestring,
                         "2026-02-11T08:00:00Z");
        cJSON_DeleteItemFromObjectCaseSensitive(job->document, "x_history");
        cJSON *left = cJSON_GetObjectItemCaseSensitive(
            cJSON_GetObjectItemCaseSensitive(job->document, "readings"),
            setups[change.setup].name);
        if (setup->child == NULL && left == NULL) /* a sheet keeps no empty set-up */
            cJSON_DeleteItemFromObjectCaseSensitive(
                cJSON_GetObjectItemCaseSensitive(document, "readings"),
                setups[change.setup].name);
        expect_same(document, job, &bytes);
        rf_job_destroy(job);

        cJSON_Delete(second);
        cJSON_Delete(old);
        cJSON_Delete(document);
        text_finish(&before);
        text_finish(&bytes);
    }
}
END_TEST

START_TEST(marks_and_findings)
{
    static const char found[] =
        "{\"family\":\"size\",\"live_mm2\":1.5,\"cpc_mm2\":1.0,\"also\":{\"family\":\"wrong_leg\","
        "\"leg\":\"in\"}}";
    for (uint64_t seed = 1; seed <= N_JOBS; seed++) {
        cJSON *document = make_job(seed + 9000);
        struct text before = {0}, bytes = {0};
        cJSON_DeleteItemFromObjectCaseSensitive(document, "opened");
        cJSON_DeleteItemFromObjectCaseSensitive(document, "found");
        lay_out(document, seed % N_LAYOUTS, &before);
        text_append(&bytes, before.bytes, before.length);

        struct job_change change = {.what = CHANGE_OPENED, .place = "board"};
        rf_job_destroy(edit(&bytes, &change));
        change = (struct job_change){.what = CHANGE_FOUND, .found = found};
        struct rf_job *job = edit(&bytes, &change);
        ck_assert_msg(is_kept(&before, &bytes), "%s\n%s", before.bytes, bytes.bytes);
        cJSON_AddItemToArray(cJSON_AddArrayToObject(document, "opened"),
                             cJSON_CreateString("board"));
        cJSON_AddItemToObject(document, "found", cJSON_Parse(found));
        expect_same(document, job, &bytes);
        rf_job_destroy(job);

        change = (struct job_change){.how = CHANGE_REMOVE, .what = CHANGE_OPENED, .place = "board"};
        rf_job_destroy(edit(&bytes, &change));
        change = (struct job_change){.how = CHANGE_REMOVE, .what = CHANGE_FOUND};
        job = edit(&bytes, &change);
        cJSON *history = cJSON_DetachItemFromObjectCaseSensitive(job->document, "x_history");
        ck_assert_int_eq(cJSON_GetArraySize(history), 2);
        cJSON_Delete(history);
        cJSON_DeleteItemFromObjectCaseSensitive(document, "found");
        cJSON *opened = cJSON_GetObjectItemCaseSensitive(job->document, "opened");
        if (opened == NULL) /* nor an empty list */
            cJSON_DeleteItemFromObjectCaseSensitive(document, "opened");
        else
            cJSON_DeleteItemFromArray(cJSON_GetObjectItemCaseSensitive(document, "opened"), 0);
        expect_same(document, job, &bytes);
        rf_job_destroy(job);
        cJSON_Delete(document);
        text_finish(&before);
        text_finish(&bytes);
    }
}
END_TEST

/* Spacing goes by the neighbours', to the byte. */
START_TEST(spacing)
{
    static const char *const pairs[][2] = {
        {"{\"format\":\"ringfettle-job/1\",\"ring\":{\"points\":[{\"id\":\"P1\"}]},"
         "\"readings\":{\"cross_ln\":{\"P1\":0.40}}}",
         "{\"format\":\"ringfettle-job/1\",\"ring\":{\"points\":[{\"id\":\"P1\"}]},"
         "\"readings\":{\"cross_ln\":{\"P1\":0.40,\"board\":0.390}}}"},
        {"{\"format\": \"ringfettle-job/1\",\r\n \"ring\": {\"points\": [{\"id\": \"P1\"}]},\r\n"
         " \"readings\": {\r\n  \"cross_ln\" : {\"P1\" : 4e-1}}}\r\n",
         "{\"format\": \"ringfettle-job/1\",\r\n \"ring\": {\"points\": [{\"id\": \"P1\"}]},\r\n"
         " \"readings\": {\r\n  \"cross_ln\" : {\"P1\" : 4e-1, \"board\" : 0.390}}}\r\n"},
        {"place;cross_ln;mine\nP1; 0,40 ;\n", NULL},
        {"\xEF\xBB\xBFplace;cross_ln\r\n\"P1\"; 0,40 ",
         "\xEF\xBB\xBFplace;cross_ln\r\nboard;0,390\r\n\"P1\"; 0,40 "},
        {"place,label,cross_ln\nP1,\"a, b\",.4\n",
         "place,label,cross_ln\nboard,,0.390\nP1,\"a, b\",.4\n"},
    };
    const char *value = "0.390";
    struct job_change change = {.what = CHANGE_READING,
                                .setup = setup_find("cross_ln"),
                                .place = "board",
                                .values = &value,
                                .n_values = 1};
    for (size_t i = 0; i < sizeof pairs / sizeof pairs[0]; i++) {
        struct rf_job *job;
        struct rf_error error = {0};
        struct text bytes = {0};
        text_add(&bytes, pairs[i][0]);
        enum rf_status status = job_edit(&bytes, "t", &change, 1, "", &job, &error);
        ck_assert_int_eq(status == RF_OK, pairs[i][1] != NULL);
        if (status == RF_OK)
            ck_assert_str_eq(bytes.bytes, pairs[i][1]);
        rf_job_destroy(job);
        text_finish(&bytes);
    }
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("job_edit");
    TCase *tests = tcase_create("job_edit");
    tcase_set_timeout(tests, 120);
    tcase_add_test(tests, readings);
    tcase_add_test(tests, marks_and_findings);
    tcase_add_test(tests, spacing);
    suite_add_tcase(suite, tests);
    return run_suite(suite);
}
