/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "job/job_parse.h"

#include "base/error.h"
#include "base/memory.h"
#include "base/text.h"

#include <string.h>

static const char job_format[] = "ringfettle-job/1";

enum rf_status job_parse_words(const struct json_at *at, char **copy, struct rf_error *error)
{
    const char *words;
    *copy = NULL;
    if (at->value == NULL)
        return RF_OK;
    enum rf_status status = json_string(at, "text in double quotes", &words, error);
    if (status != RF_OK)
        return status;
    *copy = text_duplicate(words);
    return *copy != NULL ? RF_OK : fail_memory(error);
}

enum rf_status job_fail_no_point(const struct json_at *at, const struct rf_job *job,
                                 struct rf_error *error)
{
    struct text text = {0};
    if (cJSON_IsString(at->value)) {
        text_add(&text, "found ");
        json_describe(at->value, &text);
        text_add(&text, "; ");
    }
    text_add(&text, "no such point; the ring has ");
    job_list_places(job, false, &text);
    enum rf_status status =
        text.failed ? fail_memory(error) : json_fail(at, error, RF_REFUSED, "%s", text.bytes);
    text_finish(&text);
    return status;
}

static int days_of_month(int year, int month)
{
    static const int days[] = {31, 28, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31};
    bool leap = (year % 4 == 0 && year % 100 != 0) || year % 400 == 0;
    return month == 2 && leap ? 29 : days[month - 1];
}

/* YYYY-MM-DD, a day the calendar has. */
static bool is_date(const char *date)
{
    int number[3] = {0}; /* year, month, day */
    static const char form[] = "0000-00-00";
    size_t field = 0;
    if (strlen(date) != sizeof form - 1)
        return false;
    for (size_t i = 0; form[i] != '\0'; i++) {
        if (form[i] == '-') {
            if (date[i] != '-')
                return false;
            field++;
        } else {
            if (date[i] < '0' || date[i] > '9')
                return false;
            number[field] = number[field] * 10 + (date[i] - '0');
        }
    }
    return number[0] >= 1 && number[1] >= 1 && number[1] <= 12 && number[2] >= 1 &&
           number[2] <= days_of_month(number[0], number[1]);
}

static enum rf_status parse_format(const struct json_at *document, struct rf_error *error)
{
    const char *format;
    struct json_at at = json_member(document, "format");
    enum rf_status status = json_string(&at, "\"ringfettle-job/1\"", &format, error);
    if (status == RF_OK && strcmp(format, job_format) != 0)
        status = json_fail_found(&at, error, "\"ringfettle-job/1\"");
    return status;
}

/* job, date, note */
static enum rf_status parse_heading(const struct json_at *document, struct rf_job *job,
                                    struct rf_error *error)
{
    struct json_at name = json_member(document, "job");
    struct json_at date = json_member(document, "date");
    struct json_at note = json_member(document, "note");

    enum rf_status status = job_parse_words(&name, &job->name, error);
    if (status == RF_OK)
        status = job_parse_words(&date, &job->date, error);
    if (status == RF_OK && job->date != NULL && !is_date(job->date))
        status = json_fail_found(&date, error, "a day of the calendar as YYYY-MM-DD");
    if (status == RF_OK)
        status = job_parse_words(&note, &job->note, error);
    return status;
}

static enum rf_status parse_found(const struct json_at *document, struct rf_job *job,
                                  struct rf_error *error)
{
    struct json_at found = json_member(document, "found");
    if (found.value == NULL)
        return RF_OK;
    if (!cJSON_IsObject(found.value))
        return json_fail_found(&found, error, "an object such as {\"family\": \"none\"}");
    job->found = cJSON_GetObjectItemCaseSensitive(job->document, "found");
    return RF_OK;
}

static enum rf_status parse_document(struct rf_job *job, const struct json_origin *origin,
                                     size_t least, struct rf_error *error)
{
    static const char *const keys[] = {"format",   "job",    "date",   "note",    "ring",
                                       "readings", "access", "opened", "checked", "found"};
    struct json_at document = json_document(job->document, job->source);
    document.origin = origin;
    struct json_at ring = json_member(&document, "ring");
    struct json_at readings = json_member(&document, "readings");

    enum rf_status status = json_object(&document, NULL, 0, error);
    if (status == RF_OK) /* before the keys: another kind of file is best told by its format */
        status = parse_format(&document, error);
    if (status == RF_OK)
        status = json_object(&document, keys, sizeof keys / sizeof keys[0], error);
    if (status == RF_OK)
        status = parse_heading(&document, job, error);
    if (status == RF_OK)
        status = job_parse_ring(&ring, job, error);
    if (status == RF_OK)
        status = job_parse_readings(&readings, least, job, error);
    if (status == RF_OK)
        status = job_parse_looks(&document, job, error);
    if (status == RF_OK)
        status = parse_found(&document, job, error);
    return status;
}

enum rf_status job_from_document(cJSON *document, const struct json_origin *origin,
                                 const char *source, size_t least, struct rf_job **job,
                                 struct rf_error *error)
{
    *job = NULL;
    struct rf_job *made = NEW(struct rf_job);
    if (made == NULL) {
        cJSON_Delete(document);
        return fail_memory(error);
    }
    made->document = document;
    made->source = text_duplicate(source);
    enum rf_status status = made->source != NULL ? RF_OK : fail_memory(error);
    if (status == RF_OK)
        status = parse_document(made, origin, least, error);
    if (status == RF_OK)
        *job = made;
    else
        rf_job_destroy(made);
    return status;
}

enum rf_status job_parse(const char *text, size_t length, const char *source, enum json_lines lines,
                         struct rf_job **job, struct rf_error *error)
{
    cJSON *document;
    *job = NULL;
    if (length > JOB_MAX_BYTES)
        return fail(error, RF_LIMIT, "%s: found a job of %zu bytes; needs one of at most 16 MiB",
                    source, length);
    enum rf_status status = json_parse(text, length, source, lines, &document, error);
    return status == RF_OK ? job_from_document(document, NULL, source, 1, job, error) : status;
}

enum rf_status rf_job_parse(const char *text, size_t length, const char *name, struct rf_job **job,
                            struct rf_error *error)
{
    return job_parse(text, length, name != NULL ? name : "job", JSON_DOCUMENT, job, error);
}
