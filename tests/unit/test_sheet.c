/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Sheets: round trips over made-up jobs, spelling rules, and every refusal's message. */

#include "../job_maker.h"
#include "../project.h"
#include "../suite.h"

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

/* --- refusals --- */

static char *read_file(const char *name, size_t *length)
{
    char path[PATH_MOST];
    project_path(path, "tests/cases/sheets", name);
    FILE *file = fopen(path, "rb");
    ck_assert_msg(file != NULL, "%s", path);
    char *bytes = calloc(1, 200000);
    *length = fread(bytes, 1, 199999, file);
    fclose(file);
    return bytes;
}

/* \n and \xHH in place; answers the length. */
static size_t unescape(char *text)
{
    char *to = text;
    for (const char *at = text; *at != '\0'; at++) {
        unsigned byte;
        if (at[0] == '\\' && at[1] == 'n') {
            *to++ = '\n';
            at++;
        } else if (at[0] == '\\' && at[1] == 'x' && sscanf(at + 2, "%2x", &byte) == 1) {
            *to++ = (char)byte;
            at += 3;
        } else {
            *to++ = *at;
        }
    }
    *to = '\0';
    return (size_t)(to - text);
}

static void refuse_one(const char *base, char *fields[4])
{
    struct rf_error error = {0};
    struct rf_job *job;
    struct text sheet = {0}, wanted = {0};
    size_t old_length = unescape(fields[1]), new_length = unescape(fields[2]);
    const char *at = strstr(base, fields[1]);
    ck_assert_msg(at != NULL, "%s is not in the sheet", fields[1]);
    text_append(&sheet, base, (size_t)(at - base));
    text_append(&sheet, fields[2], new_length);
    text_add(&sheet, at + old_length);
    text_addf(&wanted, "t.csv: %s", fields[3]);
    enum rf_status status = sheet_job_parse(sheet.bytes, sheet.length, "t.csv", JSON_DOCUMENT,
                                            &job, &error);
    ck_assert_msg(rf_status_class(status) == RF_CLASS_INPUT, "accepted:\n%s", sheet.bytes);
    ck_assert_ptr_null(job);
    ck_assert_str_eq(error.text, wanted.bytes);
    text_finish(&sheet);
    text_finish(&wanted);
}

START_TEST(refusals)
{
    size_t length, n = 0;
    char *bases[2] = {read_file("comma.csv", &length), read_file("semicolon.csv", &length)};
    char *cases = read_file("malformed.tsv", &length);
    for (size_t i = 0; i < 2; i++) {
        struct rf_job *job;
        struct rf_error error = {0};
        ck_assert_msg(sheet_job_parse(bases[i], strlen(bases[i]), "base", JSON_DOCUMENT, &job,
                                      &error) == RF_OK,
                      "%s", error.text);
        rf_job_destroy(job);
    }
    for (char *line = cases, *next; *line != '\0'; line = next) {
        char *fields[4] = {0};
        next = line + strcspn(line, "\n");
        if (*next != '\0')
            *next++ = '\0';
        if (line[0] == '#' || line[0] == '\0')
            continue;
        for (size_t i = 0; i < 4; i++) {
            fields[i] = line;
            line += strcspn(line, "\t");
            ck_assert_msg(*line != '\0' || i == 3, "a case of too few fields: %s", fields[0]);
            if (*line != '\0')
                *line++ = '\0';
        }
        refuse_one(bases[fields[0][0] == 'B'], fields);
        n++;
    }
    ck_assert_uint_ge(n, 200);
    free(cases);
    free(bases[0]);
    free(bases[1]);
}
END_TEST

/* --- spelling --- */

static void expect_document(const char *sheet, const char *json)
{
    cJSON *document = read_sheet(sheet, strlen(sheet)), *wanted = cJSON_Parse(json);
    ck_assert_ptr_nonnull(wanted);
    if (!cJSON_Compare(document, wanted, true)) {
        char *printed = cJSON_Print(document);
        ck_abort_msg("%s\n%s", sheet, printed);
    }
    cJSON_Delete(document);
    cJSON_Delete(wanted);
}

#define POINTS "\"format\": \"ringfettle-job/1\", \"ring\": {\"points\": [{\"id\": \"P1\"}]}"

START_TEST(spellings)
{
    static const char *const over[] = {">99.9", "> 99.9", "OL", "ol",  "O/L", "o/c",
                                       "O/C",   "open",   "Open", "oc", ">99,9"};
    static const char *const unread[] = {"", "-", "\xE2\x80\x93", "\xE2\x80\x94"};
    static const char *const several[] = {"0.4 0.5", "0.4/0.5",   "0.4 / 0.5", "0.4; 0.5",
                                          "0.4;0.5", "\"0.4, 0.5\"", "\"0.4\n0.5\"", "  .4   .5 "};
    char sheet[256];
    for (size_t i = 0; i < sizeof over / sizeof over[0]; i++) {
        snprintf(sheet, sizeof sheet, "place,cross_ln\nP1,%s%s%s\n", strchr(over[i], ',') ? "\"" : "",
                 over[i], strchr(over[i], ',') ? "\"" : "");
        expect_document(sheet,
                        "{" POINTS ", \"readings\": {\"cross_ln\": {\"P1\": \"open\"}}}");
    }
    for (size_t i = 0; i < sizeof unread / sizeof unread[0]; i++) {
        snprintf(sheet, sizeof sheet, "place,cross_ln,\nP1,%s,\n", unread[i]);
        expect_document(sheet, "{" POINTS ", \"readings\": {}}");
    }
    for (size_t i = 0; i < sizeof several / sizeof several[0]; i++) {
        snprintf(sheet, sizeof sheet, "place,cross_ln\nP1,%s\n", several[i]);
        expect_document(sheet,
                        "{" POINTS ", \"readings\": {\"cross_ln\": {\"P1\": [0.4, 0.5]}}}");
    }
    static const char wanted[] =
        "{" POINTS ", \"readings\": {\"cross_ln\": {\"P1\": [0.4, \"open\"]}}}";
    expect_document("\xEF\xBB\xBFPlace;Cross_LN\r\nP1;0,4 o/c\r\n", wanted); /* BOM, capitals */
    expect_document("\"place\"\t\"cross_ln\"\rP1\t0,4/o/c\r", wanted);      /* CR alone */
    expect_document("place;cross_ln\nP1;0,4, OL", wanted);                 /* no last line end */
    expect_document("place,cross_ln\nP1,\"0,4 OL\"\n\n\n", wanted); /* comma twice, quoted */
    expect_document(",,\n,,\nplace,cross_ln,\nP1,0.4 OL,\n,,\n", wanted);
    expect_document("place;label;cross_ln\nP1\n\nr1;0,5;0,6\n", /* short rows; behind the table */
                    "{" POINTS ", \"readings\": {\"end_to_end\": {\"l\": [0.5, 0.6]}}}");
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("sheet");
    TCase *tests = tcase_create("sheet");
    tcase_set_timeout(tests, 120);
    tcase_add_test(tests, round_trips);
    tcase_add_test(tests, refusals);
    tcase_add_test(tests, spellings);
    suite_add_tcase(suite, tests);
    return run_suite(suite);
}
