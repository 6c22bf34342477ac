/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Reading a job: what is taken, limits, short memory. All jobs are invented. */
#include "base/text.h"
#include "job/job.h"
#include "job/job_write.h"

#include "../failing.h"
#include "../suite.h"
#include "job_texts.h"

#include <check.h>
#include <cjson/cJSON.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

static struct rf_job *read_job(const char *text)
{
    struct rf_error error = {0};
    struct rf_job *job = NULL;
    enum rf_status status = rf_job_parse(text, strlen(text), "kitchen.json", &job, &error);
    ck_assert_msg(status == RF_OK, "%s", error.text);
    return job;
}

START_TEST(takes_the_least)
{
    struct rf_job *job = read_job(RING("{\"points\": [{\"id\": \"P1\"}]}"));
    ck_assert_str_eq(rf_job_name(job), "kitchen.json");
    ck_assert_uint_eq(rf_job_points(job), 1);
    ck_assert_uint_eq(rf_job_spurs(job), 0);
    ck_assert_uint_eq(rf_job_readings(job), 1);
    ck_assert(!rf_job_has_found(job));
    ck_assert_double_eq(job->live_mm2, 2.5);
    ck_assert_double_eq(job->cpc_mm2, 1.5);
    ck_assert_double_eq(job->temperature_c, 20.0);
    ck_assert_double_eq(job->length_accuracy, 0.2);
    ck_assert_uint_eq(job->n_places, 3);
    ck_assert_str_eq(job->places[0].id, "out");
    ck_assert_str_eq(job->places[2].id, "in");
    ck_assert_int_eq(job->places[1].kind, KIND_SOCKET);
    ck_assert(isnan(job->places[1].run_m) && isnan(job->places[2].run_m));
    ck_assert(isnan(job->places[1].open_minutes) && isnan(job->board_open_minutes));
    ck_assert_double_eq(job->places[1].reach_minutes, 0.0);
    ck_assert(!place_has_front(job, 0) && place_has_front(job, 1) && !place_has_front(job, 2));
    rf_job_destroy(job);
}
END_TEST

static const char full[] =
    "{\"format\": \"ringfettle-job/1\", \"job\": \"0417-first-floor\", \"date\": \"2024-02-29\",\n"
    " \"note\": \"free\\ntext\", \"x_more\": {\"points\": []},\n"
    " \"ring\": {\"live_mm2\": 4, \"cpc_mm2\": null, \"temperature_c\": -40,\n"
    "  \"length_accuracy\": 2, \"order\": \"known\", \"x_colour\": \"red\",\n"
    "  \"points\": [{\"id\": \"P1\", \"label\": \"landing\", \"kind\": \"fcu\", \"run_m\": 0.1,\n"
    "    \"x_a\": 1}, {\"id\": \"küche 2\", \"run_m\": null, \"live_mm2\": 2.5,\n"
    "    \"cpc_mm2\": 1.5}, {\"id\": \"L\", \"kind\": \"junction_box\", \"run_m\": 500,\n"
    "    \"cpc_mm2\": null}],\n"
    "  \"last_run_m\": 9.5,\n"
    "  \"spurs\": [{\"id\": \"S1\", \"from\": \"S3\", \"run_m\": 3},\n"
    "   {\"id\": \"S2\", \"from\": \"out\"}, {\"id\": \"S3\", \"from\": \"küche 2\", \"x_b\": 2}]},\n"
    " \"readings\": {\"end_to_end\": {\"l\": 0.61, \"n\": \"open\", \"e\": 0},\n"
    "  \"x_own\": {\"P9\": -1},\n"
    "  \"cross_ln\": {\"board\": 99.9, \"highest\": 0.5, \"küche 2\": [0.4, \"open\", 0.41],\n"
    "   \"S1\": 0.45, \"x_by\": \"me\"},\n"
    "  \"link_in_le\": {\"out\": 1}},\n"
    " \"access\": {\"P1\": {\"reach\": 10, \"open\": 6}, \"S2\": 4, \"board\": {\"reach\": 1.5}},\n"
    " \"opened\": [\"board\", \"L\", \"S2\"], \"checked\": [\"P1\", \"S1\"],\n"
    " \"found\": {\"family\": \"joint\", \"run\": [\"P1\", \"küche 2\"], \"conductor\": \"N\"}}\n";

START_TEST(takes_everything)
{
    struct rf_job *job = read_job(full);
    const struct place *p = job->places;
    ck_assert_str_eq(rf_job_name(job), "0417-first-floor");
    ck_assert_str_eq(job->note, "free\ntext");
    ck_assert_uint_eq(job->n_ring, 3);
    ck_assert_uint_eq(job->n_spurs, 3);
    ck_assert_uint_eq(job->n_places, 8);
    ck_assert(isnan(job->cpc_mm2) && isnan(p[1].cpc_mm2) && !p[1].own_cpc);
    ck_assert_double_eq(p[1].live_mm2, 4.0);
    ck_assert_double_eq(p[2].live_mm2, 2.5);
    ck_assert_double_eq(p[2].cpc_mm2, 1.5);
    ck_assert(p[2].own_live && p[2].own_cpc && p[3].own_cpc && isnan(p[3].cpc_mm2));
    ck_assert_double_eq(p[4].run_m, 9.5);
    ck_assert(place_on_ring(job, 4) && place_is_end(job, 4));
    ck_assert(!place_has_front(job, 3));

    /* Spurs: S1 on S3, which comes later, on the ring's second point; S2 on out. */
    ck_assert_uint_eq(p[5].from, 7);
    ck_assert_uint_eq(p[6].from, 0);
    ck_assert_uint_eq(p[7].from, 2);
    ck_assert_uint_eq(job_find_run(job, 7, 5), 4);
    ck_assert_uint_eq(job_find_run(job, 5, 7), 4);
    ck_assert_uint_eq(job_find_run(job, 0, 6), 5);
    ck_assert_uint_eq(run_near_end(job, 4), 7);
    ck_assert_uint_eq(job_find_run(job, 2, 3), 2);
    ck_assert_uint_eq(job_find_run(job, 4, 3), 3);
    ck_assert_uint_eq(job_find_run(job, 1, 3), n_runs(job));
    ck_assert_uint_eq(job_find_run(job, 1, 1), n_runs(job));
    ck_assert_uint_eq(job_find_run(job, 5, 2), n_runs(job));
    ck_assert_uint_eq(job_find_place(job, "küche 2"), 2);
    ck_assert_uint_eq(job_find_place(job, "kueche"), job->n_places);

    ck_assert_double_eq(p[1].reach_minutes, 10.0);
    ck_assert_double_eq(p[1].open_minutes, 6.0);
    ck_assert_double_eq(p[6].open_minutes, 4.0);
    ck_assert_double_eq(job->board_reach_minutes, 1.5);
    ck_assert(isnan(job->board_open_minutes));
    ck_assert(job->board_opened && p[3].opened && p[6].opened && !p[1].opened);
    ck_assert(p[1].checked && p[5].checked && !p[2].checked);
    ck_assert(rf_job_has_found(job));
    rf_job_destroy(job);
}
END_TEST

START_TEST(keeps_readings_in_order)
{
    static const struct {
        const char *setup, *key;
        size_t repeat;
        bool open;
        double ohms;
    } expected[] = {
        {"end_to_end", "l", 0, false, 0.61},      {"end_to_end", "n", 0, true, 0},
        {"end_to_end", "e", 0, false, 0},         {"cross_ln", "board", 0, false, 99.9},
        {"cross_ln", "highest", 0, false, 0.5},   {"cross_ln", "küche 2", 0, false, 0.4},
        {"cross_ln", "küche 2", 1, true, 0},      {"cross_ln", "küche 2", 2, false, 0.41},
        {"cross_ln", "S1", 0, false, 0.45},       {"link_in_le", "out", 0, false, 1},
    };
    struct rf_job *job = read_job(full);
    ck_assert_uint_eq(job->n_readings, sizeof expected / sizeof expected[0]);
    for (size_t i = 0; i < job->n_readings; i++) {
        const struct reading *reading = &job->readings[i];
        ck_assert_str_eq(setups[reading->setup].name, expected[i].setup);
        ck_assert_str_eq(reading_key(job, reading), expected[i].key);
        ck_assert_uint_eq(reading->repeat, expected[i].repeat);
        ck_assert(reading->open == expected[i].open);
        ck_assert_double_eq(reading->ohms, expected[i].ohms);
    }
    ck_assert_str_eq(setups[job->setup_in_place].name, "link_in_le");
    rf_job_destroy(job);
}
END_TEST

/* A job of so many points, spurs and repeats of one reading. */
static void check_size(size_t points, size_t spurs, size_t repeats, enum rf_status status,
                       const char *message)
{
    struct text text = {0};
    struct rf_error error = {0};
    struct rf_job *job;
    text_add(&text, "{\"format\": \"ringfettle-job/1\", \"ring\": {\"points\": [");
    for (size_t i = 0; i < points; i++)
        text_addf(&text, "%s{\"id\": \"P%zu\"}", i > 0 ? "," : "", i + 1);
    text_add(&text, "], \"spurs\": [");
    for (size_t i = 0; i < spurs; i++) /* each on the next, the last on the ring */
        text_addf(&text, "%s{\"id\": \"S%zu\", \"from\": \"%s%zu\"}", i > 0 ? "," : "", i + 1,
                  i + 1 < spurs ? "S" : "P", i + 1 < spurs ? i + 2 : (size_t)1);
    text_add(&text, "]}, \"readings\": {\"cross_ln\": {\"P1\": [0.4");
    for (size_t i = 1; i < repeats; i++)
        text_add(&text, ", 0.4");
    text_add(&text, "]}}}");
    ck_assert(!text.failed);
    ck_assert_int_eq(rf_job_parse(text.bytes, text.length, "k", &job, &error), status);
    ck_assert_str_eq(error.text, message);
    rf_job_destroy(job);
    text_finish(&text);
}

START_TEST(keeps_to_limits)
{
    check_size(200, 200, 5000, RF_OK, "");
    check_size(201, 0, 1, RF_REFUSED,
               "k: ring.points: found a list of 201; needs a list of 1 to 200 points");
    check_size(1, 201, 1, RF_REFUSED,
               "k: ring.spurs: found a list of 201; needs a list of at most 200 spur points");
    check_size(1, 0, 5001, RF_LIMIT,
               "k: readings.cross_ln.P1[5000]: one reading too many; needs at most 5000 in a job");
}
END_TEST

START_TEST(refuses_too_many_bytes)
{
    struct rf_error error = {0};
    struct rf_job *job;
    char *bytes = calloc(JOB_MAX_BYTES + 1, 1);
    ck_assert_ptr_nonnull(bytes);
    ck_assert_int_eq(rf_job_parse(bytes, JOB_MAX_BYTES + 1, "k", &job, &error), RF_LIMIT);
    ck_assert_str_eq(error.text, "k: found a job of 16777217 bytes; needs one of at most 16 MiB");
    free(bytes);
}
END_TEST

static void check_list(const char *points, const char *expected)
{
    struct text text = {0}, list = {0};
    text_addf(&text, "{\"format\": \"ringfettle-job/1\", \"ring\": {\"points\": [%s]},"
                     " \"readings\": {\"cross_ln\": {\"board\": 0.4}}}", points);
    struct rf_job *job = read_job(text.bytes);
    job_list_places(job, false, &list);
    ck_assert_str_eq(list.bytes, expected);
    rf_job_destroy(job);
    text_finish(&text);
    text_finish(&list);
}

#define ID(x) "{\"id\": \"" x "\"}"

START_TEST(lists_places)
{
    check_list(ID("P1"), "P1");
    check_list(ID("P1") "," ID("P2"), "P1 and P2");
    check_list(ID("P9") "," ID("P10") "," ID("P11"), "P9 to P11");
    check_list(ID("P1") "," ID("hall") "," ID("3"), "P1, hall and 3");
    check_list(ID("1") "," ID("2") "," ID("3") "," ID("x"), "1 to 3 and x");
    check_list(ID("P01") "," ID("P02") "," ID("P03"), "P01, P02 and P03");
    check_list(ID("a") "," ID("b") "," ID("c") "," ID("d") "," ID("e2") "," ID("f") "," ID("g")
                   "," ID("h") "," ID("i"),
               "a, b, c, d, e2, f, g and 2 more");
}
END_TEST

START_TEST(writes_what_it_read)
{
    struct rf_job *job = read_job(full);
    struct text pretty = {0}, line = {0}, again = {0};
    ck_assert_int_eq(job_write(job, &pretty, NULL), RF_OK);
    ck_assert_int_eq(job_write_line(job, &line, NULL), RF_OK);
    ck_assert_ptr_null(strchr(line.bytes, '\n'));
    ck_assert_ptr_nonnull(strstr(line.bytes, "\"x_more\": {\"points\": []}"));
    ck_assert_ptr_nonnull(strstr(pretty.bytes, "\n   {\"id\": \"S2\", \"from\": \"out\"}"));
    rf_job_destroy(job);

    job = read_job(line.bytes);
    ck_assert_int_eq(job_write(job, &again, NULL), RF_OK);
    ck_assert_str_eq(again.bytes, pretty.bytes);
    rf_job_destroy(job);
    text_clear(&again);

    job = read_job(pretty.bytes);
    ck_assert_int_eq(job_write_line(job, &again, NULL), RF_OK);
    ck_assert_str_eq(again.bytes, line.bytes);
    rf_job_destroy(job);
    text_finish(&pretty);
    text_finish(&line);
    text_finish(&again);
}
END_TEST

/* Reads the text with the first, the second … allocation failing until one reading needs no more;
 * every failure must be said and leave nothing behind. */
static void fail_each_allocation(const char *text, enum rf_status at_last)
{
    enum rf_status status = RF_MEMORY;
    lead_cjson_here(true);
    for (size_t n = 1; n < 10000 && status == RF_MEMORY; n++) {
        struct rf_error error = {0};
        struct rf_job *job;
        allocations = 0;
        fail_at = n;
        status = rf_job_parse(text, strlen(text), "kitchen.json", &job, &error);
        fail_at = 0;
        ck_assert_int_eq(error.status, status);
        ck_assert(status == RF_OK || job == NULL);
        rf_job_destroy(job);
    }
    lead_cjson_here(false);
    ck_assert_int_eq(status, at_last);
}

START_TEST(survives_failing_allocations)
{
    fail_each_allocation(full, RF_OK);
    fail_each_allocation(READINGS("{\"cross_ln\": {\"P9\": 0.4}}"), RF_REFUSED);
    fail_each_allocation(READINGS("{\"link_in_ln\": {\"in\": 0.4}}"), RF_REFUSED);
    fail_each_allocation("{", RF_SYNTAX);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("job");
    TCase *all = tcase_create("job");
    tcase_set_timeout(all, 60);
    tcase_add_test(all, takes_the_least);
    tcase_add_test(all, takes_everything);
    tcase_add_test(all, keeps_readings_in_order);
    tcase_add_test(all, keeps_to_limits);
    tcase_add_test(all, refuses_too_many_bytes);
    tcase_add_test(all, lists_places);
    tcase_add_test(all, writes_what_it_read);
    tcase_add_test(all, survives_failing_allocations);
    suite_add_tcase(suite, all);
    return run_suite(suite);
}
