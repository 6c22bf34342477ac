/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * Sheets read, written and changed, and JSON changed, with each allocation failing in turn: the
 * answer is that memory is short, or the same as with plenty.
 */

#include "job/job_edit.h"
#include "job/sheet.h"

#include "../failing.h"
#include "../suite.h"

#include <cjson/cJSON.h>
#include <check.h>
#include <string.h>

static const char sheet[] =
    "job;\"\"\"a\\u00e9\"\"\"\nx_a;\"[1,{\"\"b\"\":2}]\"\nr1;0,6;OL\nopened;P1;board\nfound;joint\n"
    "found.run;P1;P2\nfound.conductor;N\nfound.also.family;none\nsetups;cross_ln;end_to_end\n\n"
    "place;label;metres;from;reach_min;open_min;x_b;cross_ln\nboard;;;;;3;;0,39\n"
    "P1;hall;6,5;;10;6;true;0,40 0,41\nP2;;?;;;;1,5;\nin;;9;;;;;\nS1;;3;P2;;;;OL\n";
static const char json[] =
    "{\"format\": \"ringfettle-job/1\", \"ring\": {\"points\": [{\"id\": \"P1\"}, {\"id\": \"P2\"}]},"
    " \"readings\": {\"cross_ln\": {\"P1\": 0.40}}, \"opened\": [\"P1\"]}";
static const char ill[] = "place,cross_ln\nP1,0.4x\n";

/* What is done with memory failing; the text it gives is the caller's to finish. */
typedef enum rf_status action(struct text *result);

static enum rf_status read_and_write(struct text *result)
{
    struct rf_job *job = NULL;
    struct rf_error error;
    const struct sheet_style style = {';', ','};
    const size_t wanted[] = {0, 4};
    enum rf_status status =
        sheet_job_parse(sheet, strlen(sheet), "t", JSON_DOCUMENT, &job, &error);
    if (status == RF_OK)
        status = sheet_write(job->document, &style, wanted, 2, result, &error);
    rf_job_destroy(job);
    return status;
}

static enum rf_status read_ill(struct text *result)
{
    struct rf_job *job = NULL;
    struct rf_error error;
    (void)result;
    return sheet_job_parse(ill, strlen(ill), "t", JSON_DOCUMENT, &job, &error);
}

static enum rf_status change(const char *text, struct text *result)
{
    const char *values[] = {"0.42", "\"open\""};
    const struct job_change changes[] = {
        {.setup = 2, .place = "P2", .values = values, .n_values = 2},
        {.how = CHANGE_CORRECT, .setup = 1, .place = "P1", .values = values, .n_values = 1},
        {.what = CHANGE_OPENED, .place = "P2"},
        {.how = CHANGE_REMOVE, .what = CHANGE_OPENED, .place = "P1"},
        {.what = CHANGE_FOUND, .found = "{\"family\": \"none\"}"},
    };
    struct rf_job *job = NULL;
    struct rf_error error;
    text_add(result, text);
    if (result->failed)
        return RF_MEMORY;
    enum rf_status status = job_edit(result, "t", changes, 5, "now", &job, &error);
    rf_job_destroy(job);
    return status;
}

static enum rf_status change_sheet(struct text *result)
{
    return change(sheet, result);
}

static enum rf_status change_json(struct text *result)
{
    return change(json, result);
}

static void fail_each(action *act, enum rf_status at_last)
{
    struct text plenty = {0};
    lead_cjson_here(true);
    fail_at = 0;
    ck_assert_int_eq(act(&plenty), at_last);
    for (size_t n = 1;; n++) {
        struct text result = {0};
        fail_at = n;
        allocations = 0;
        enum rf_status status = act(&result);
        bool failed = allocations >= n;
        fail_at = 0;
        ck_assert_msg(status == RF_MEMORY || status == at_last, "allocation %zu: status %d", n,
                      (int)status);
        if (status == RF_OK)
            ck_assert_str_eq(result.bytes, plenty.bytes);
        text_finish(&result);
        if (!failed)
            break;
    }
    text_finish(&plenty);
    lead_cjson_here(false);
}

START_TEST(short_of_memory)
{
    fail_each(read_and_write, RF_OK);
    fail_each(read_ill, RF_REFUSED);
    fail_each(change_sheet, RF_OK);
    fail_each(change_json, RF_OK);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("sheet_memory");
    TCase *tests = tcase_create("sheet_memory");
    tcase_set_timeout(tests, 120);
    tcase_add_test(tests, short_of_memory);
    suite_add_tcase(suite, tests);
    return run_suite(suite);
}
