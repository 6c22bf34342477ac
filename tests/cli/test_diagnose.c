/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What `diagnose` prints: text that fits a narrow screen and says what the readings determine, and
 * JSON with the fields of ringfettle-diagnosis/1. All jobs are invented. */
#include "program.h"

#include "base/text.h"
#include "report/wrap.h"

#include <math.h>

#define PROGRAM "\"$RINGFETTLE\" "
#define SCENARIOS "\"$RINGFETTLE_SOURCE\"/scenarios/"
#define REFERENCE "\"$RINGFETTLE_SOURCE\"/tests/cases/reference/"

/* --- width --- */

/* Every line of the text at most so many columns wide. */
static void expect_narrow(const char *text)
{
    size_t lines = 0;
    while (*text != '\0') {
        char line[1024];
        size_t length = strcspn(text, "\n");
        ck_assert_uint_lt(length, sizeof line);
        memcpy(line, text, length);
        line[length] = '\0';
        ck_assert_msg(text_columns(line) <= REPORT_COLUMNS, "too wide: %s", line);
        text += length + (text[length] == '\n');
        lines++;
    }
    ck_assert_uint_gt(lines, 0);
}

START_TEST(scenarios_fit_the_screen)
{
    struct run left = run(PROGRAM "diagnose " SCENARIOS "*.json");
    ck_assert_int_eq(left.status, 0);
    ck_assert_str_eq(left.err, "");
    expect_narrow(left.out);
    run_finish(&left);
    left = run("for f in " SCENARIOS "*.json; do " PROGRAM
               "expect \"$f\" --setups cross_ln,link_out_le,lead_in_e,apart_ne || exit; done");
    ck_assert_int_eq(left.status, 0);
    expect_narrow(left.out);
    run_finish(&left);
}
END_TEST

/* The job of each line of a reference file, as NDJSON. */
static void unpack_reference(const char *name)
{
    char line[128];
    sprintf(line, "cp " REFERENCE "%s reference.ndjson", name);
    struct run left = run(line);
    ck_assert_int_eq(left.status, 0);
    run_finish(&left);
    char *all = read_whole("reference.ndjson"), *rest = NULL;
    FILE *jobs = fopen("jobs.ndjson", "wb");
    ck_assert(jobs != NULL);
    for (char *at = strtok_r(all, "\n", &rest); at != NULL; at = strtok_r(NULL, "\n", &rest)) {
        cJSON *object = cJSON_Parse(at);
        char *job = cJSON_PrintUnformatted(cJSON_GetObjectItem(object, "job"));
        ck_assert(job != NULL);
        ck_assert(fprintf(jobs, "%s\n", job) > 0);
        cJSON_free(job);
        cJSON_Delete(object);
    }
    ck_assert(fclose(jobs) == 0);
    free(all);
}

START_TEST(reference_jobs_fit_the_screen)
{
    static const char *const names[] = {"standard.ndjson", "extra.ndjson", "nolength.ndjson"};
    unpack_reference(names[_i]);
    /* Plans take most of the time; those of one file, and the scenarios', are enough of them. */
    struct run left = run(_i == 1 ? PROGRAM "diagnose - <jobs.ndjson"
                                  : PROGRAM "diagnose --no-plan - <jobs.ndjson");
    ck_assert_int_eq(left.status, 0);
    expect_narrow(left.out);
    run_finish(&left);
}
END_TEST

START_TEST(long_names_fit_the_screen)
{
    /* Ids as long as they may be, wide characters, a label with a terminal's control sequence. */
    write_whole(
        "long.json",
        "{\"format\": \"ringfettle-job/1\", \"job\": \"Küche, Erdgeschoß, 台所の環状回路、"
        "長い名前を持つ配線の記録とその測定値のすべて\", \"ring\": {\"points\": ["
        "{\"id\": \"1234567890123456789012345678901234567890123456789012345678901234\"},"
        "{\"id\": \"台所台所台所台所台所台所台所台所台所台所\", \"label\": \"a\\u001b[31mred\"},"
        "{\"id\": \"P3\", \"label\": \"a label that goes on and on, far beyond what fits a "
        "line of a table of readings\"}]}, \"readings\": {\"end_to_end\": {\"l\": 0.15, \"n\": "
        "\"open\"}, \"cross_ln\": {\"P3\": \"open\"}}}");
    struct run left = run(PROGRAM "diagnose long.json; " PROGRAM "expect long.json");
    ck_assert_int_eq(left.status, 0);
    expect_narrow(left.out);
    ck_assert_msg(strchr(left.out, '\033') == NULL, "a file steers the terminal");
    run_finish(&left);
}
END_TEST

/* --- text --- */

static void expect_in_order(const char *text, const char *const words[], size_t n)
{
    const char *at = text;
    for (size_t i = 0; i < n; i++) {
        const char *found = strstr(at, words[i]);
        ck_assert_msg(found != NULL, "no \"%s\" where it should be in\n%s", words[i], text);
        at = found + strlen(words[i]);
    }
}

/* Readings between P4 and P5 jump by 0.5 Ω on the neutral, and by nothing on the line: only the
 * neutral of that run can do so, though not which of its ends. */
START_TEST(says_where_the_joint_is)
{
    static const char *const words[] = {
        "kitchen-neutral, 2026-03-04",
        "DANGER IF RE-ENERGISED",
        "gets hot under load",
        "WHERE",
        "Take P4 (worktop right of the hob) off first: 45 %",
        "45 %  take P5 (fridge) off",
        "WHAT IT MAY BE",
        ">99 %  high-resistance neutral joint in the run P4",
        "(90 %: ",
        "NEXT",
        "Take P4 (worktop right of the hob) off.",
        "BLIND SPOTS",
        "READINGS",
        "as read      fitted   no defect",
        "FOR THE SCHEDULE OF TEST RESULTS",
        "r1 0.36 Ω, rn 0.82 Ω, r2 0.58 Ω, as read.",
        "Highest R1+R2: not given while a defect stands.",
        "CAUTIONS",
        "BS 7671",
    };
    struct run left = run(PROGRAM "diagnose " SCENARIOS "kitchen-neutral.json");
    ck_assert_int_eq(left.status, 0);
    expect_in_order(left.out, words, sizeof words / sizeof words[0]);
    ck_assert_msg(strstr(left.out, "NOTHING COMPARED") == NULL, "a joint explains these readings");
    run_finish(&left);
}
END_TEST

START_TEST(says_that_nothing_shows)
{
    static const char *const words[] = {
        "WHERE",
        "These readings show no defect (",
        "They could not have shown",
        "WHAT IT MAY BE",
        "no defect, wired as recorded",
        "FOR THE SCHEDULE OF TEST RESULTS",
        "Highest R1+R2 0.",
        "CAUTIONS",
    };
    struct run left = run(PROGRAM "diagnose " SCENARIOS "cottage-sound-with-spur.json");
    ck_assert_int_eq(left.status, 0);
    expect_in_order(left.out, words, sizeof words / sizeof words[0]);
    ck_assert_msg(strstr(left.out, "sound") == NULL || strstr(left.out, "cottage-sound") != NULL,
                  "no ring is called sound");
    run_finish(&left);
}
END_TEST

/* And what would: two defects, or bad faces, which the rest then assumes. */
START_TEST(says_first_that_no_one_defect_explains_it)
{
    static const char *const of_two[] = {
        "chapel-two-defects",
        "NO ONE DEFECT EXPLAINS THESE READINGS",
        "Two at once would",
        "before you take anything off",
        "WHAT IT MAY BE",
        ", and ",
    };
    static const char *const of_faces[] = {
        "dairy-worn-faces",
        "NO ONE DEFECT EXPLAINS THESE READINGS",
        "Bad contacts at the faces would",
        "0.02 Ω in each",
        "Clean the faces",
        "read again",
        "WHAT IT MAY BE",
    };
    struct run left = run(PROGRAM "diagnose " SCENARIOS "chapel-two-defects.json");
    expect_in_order(left.out, of_two, sizeof of_two / sizeof of_two[0]);
    run_finish(&left);
    left = run(PROGRAM "diagnose " SCENARIOS "dairy-worn-faces.json");
    expect_in_order(left.out, of_faces, sizeof of_faces / sizeof of_faces[0]);
    run_finish(&left);
}
END_TEST

START_TEST(checks_before_screws)
{
    static const char *const words[] = {
        "FIRST, WITHOUT A SCREW",
        "see to the face of P4 (bay left): switched on",
        "WHAT IT MAY BE",
        "over range",
    };
    struct run left = run(PROGRAM "diagnose " SCENARIOS "lounge-switch-off.json");
    expect_in_order(left.out, words, sizeof words / sizeof words[0]);
    run_finish(&left);
}
END_TEST

/* --- JSON --- */

static const cJSON *member(const cJSON *object, const char *key)
{
    const cJSON *item = cJSON_GetObjectItemCaseSensitive(object, key);
    ck_assert_msg(item != NULL, "no %s", key);
    return item;
}

static double number(const cJSON *object, const char *key)
{
    ck_assert_msg(cJSON_IsNumber(member(object, key)), "%s is no number", key);
    return member(object, key)->valuedouble;
}

static const char *string(const cJSON *object, const char *key)
{
    ck_assert_msg(cJSON_IsString(member(object, key)), "%s is no string", key);
    return member(object, key)->valuestring;
}

/* Ω, or "open". */
static void expect_ohms(const cJSON *object, const char *key)
{
    const cJSON *value = member(object, key);
    ck_assert_msg(cJSON_IsNumber(value) ||
                      (cJSON_IsString(value) && strcmp(value->valuestring, "open") == 0),
                  "%s is neither ohms nor open", key);
}

static void expect_faults(const cJSON *root)
{
    const cJSON *item = NULL, *faults = member(root, "faults");
    double last = 1, sum = 0;
    ck_assert(cJSON_GetArraySize(faults) > 0);
    cJSON_ArrayForEach(item, faults)
    {
        double confidence = number(item, "confidence");
        string(member(item, "fault"), "family");
        string(item, "text");
        ck_assert(confidence >= 0.001 && confidence <= last);
        last = confidence;
        sum += confidence;
        const cJSON *ohms = cJSON_GetObjectItemCaseSensitive(item, "ohms");
        if (ohms != NULL)
            ck_assert(number(ohms, "low") <= number(ohms, "value") &&
                      number(ohms, "value") <= number(ohms, "high"));
    }
    ck_assert(sum <= 1 + 1e-9);
}

static void expect_findings(const cJSON *root)
{
    const cJSON *item = NULL, *index = NULL;
    int n = cJSON_GetArraySize(member(root, "faults"));
    cJSON_ArrayForEach(item, member(root, "findings"))
    {
        string(item, "text");
        ck_assert(number(item, "confidence") > 0);
        ck_assert(cJSON_GetArraySize(member(item, "faults")) > 0);
        cJSON_ArrayForEach(index, member(item, "faults"))
            ck_assert(index->valuedouble >= 0 && index->valuedouble < n);
    }
}

static void expect_places(const cJSON *root)
{
    const cJSON *item = NULL;
    cJSON_ArrayForEach(item, member(root, "places"))
    {
        const char *look = string(item, "look");
        ck_assert(strcmp(look, "open") == 0 || strcmp(look, "check") == 0);
        ck_assert(cJSON_HasObjectItem(item, "place") != cJSON_HasObjectItem(item, "run"));
        if (cJSON_HasObjectItem(item, "run"))
            ck_assert_int_eq(cJSON_GetArraySize(member(item, "run")), 2);
        ck_assert(number(item, "chance") >= 0 && number(item, "chance") <= 1 + 1e-9);
    }
}

static void expect_plan(const cJSON *root)
{
    const cJSON *item = NULL;
    cJSON_ArrayForEach(item, member(root, "next"))
    {
        ck_assert(number(item, "minutes") > 0);
        string(item, "text");
        if (strcmp(string(item, "action"), "read") == 0) {
            string(item, "setup");
            ck_assert(cJSON_GetArraySize(member(item, "places")) > 0);
            ck_assert(cJSON_IsNumber(member(item, "saves")));
        } else {
            ck_assert_str_eq(string(item, "action"), "look");
            string(item, "look");
            ck_assert(cJSON_HasObjectItem(item, "place") != cJSON_HasObjectItem(item, "run"));
        }
    }
    const cJSON *minutes = member(root, "expected_minutes");
    ck_assert(number(minutes, "measure_first") <= number(minutes, "look_now") + 1e-9);
}

static void expect_diagnosis(const char *line)
{
    const cJSON *item = NULL;
    cJSON *root = cJSON_ParseWithOpts(line, NULL, true);
    ck_assert_msg(root != NULL, "no JSON: %s", line);
    ck_assert_str_eq(string(root, "format"), "ringfettle-diagnosis/1");
    string(root, "job");
    ck_assert_str_eq(string(root, "models"), "shipped");
    ck_assert(number(root, "hypotheses") > 10);
    double p = number(member(root, "misfit"), "p");
    ck_assert(p >= 0 && p <= 1);
    ck_assert(cJSON_IsBool(member(member(root, "misfit"), "flag")));
    if (cJSON_HasObjectItem(root, "wider")) {
        const cJSON *wider = member(root, "wider");
        ck_assert(cJSON_IsTrue(member(member(root, "misfit"), "flag")));
        ck_assert(number(wider, "p") >= 0.05);
        ck_assert_int_eq(cJSON_HasObjectItem(wider, "face_ohms") +
                             cJSON_HasObjectItem(wider, "length_factor") +
                             cJSON_HasObjectItem(wider, "defects"),
                         1);
    }
    expect_faults(root);
    expect_findings(root);
    expect_places(root);
    expect_plan(root);
    cJSON_ArrayForEach(item, member(root, "blind"))
    {
        string(item, "family");
        string(item, "text");
        ck_assert(!cJSON_HasObjectItem(item, "at") && !cJSON_HasObjectItem(item, "run"));
    }
    cJSON_ArrayForEach(item, member(root, "suspect"))
    {
        string(item, "setup");
        string(item, "place");
        expect_ohms(item, "read");
        expect_ohms(item, "fitted");
    }
    ck_assert(cJSON_GetArraySize(member(root, "readings")) > 0);
    cJSON_ArrayForEach(item, member(root, "readings"))
    {
        string(item, "setup");
        string(item, "place");
        expect_ohms(item, "read");
        expect_ohms(item, "fitted");
        expect_ohms(item, "sound");
    }
    cJSON_Delete(root);
}

START_TEST(writes_json_a_line_a_job)
{
    struct run left = run(PROGRAM "diagnose --json " SCENARIOS "*.json");
    ck_assert_int_eq(left.status, 0);
    size_t n = 0;
    char *rest = NULL;
    for (char *at = strtok_r(left.out, "\n", &rest); at != NULL; at = strtok_r(NULL, "\n", &rest)) {
        expect_diagnosis(at);
        n++;
    }
    ck_assert_uint_ge(n, 12);
    run_finish(&left);
}
END_TEST

START_TEST(leaves_the_plan_out_when_asked)
{
    struct run left = run(PROGRAM "diagnose --json --no-plan " SCENARIOS "kitchen-neutral.json");
    cJSON *root = cJSON_Parse(left.out);
    ck_assert(root != NULL && !cJSON_HasObjectItem(root, "next") &&
              !cJSON_HasObjectItem(root, "expected_minutes"));
    cJSON_Delete(root);
    run_finish(&left);
}
END_TEST

START_TEST(json_says_what_the_readings_determine)
{
    struct run left = run(PROGRAM "diagnose --json - <" SCENARIOS "kitchen-neutral.json");
    cJSON *root = cJSON_Parse(left.out);
    const cJSON *first = cJSON_GetArrayItem(member(root, "faults"), 0);
    const cJSON *fault = member(first, "fault");
    ck_assert_str_eq(string(root, "job"), "kitchen-neutral");
    ck_assert_str_eq(string(fault, "family"), "joint");
    ck_assert_str_eq(string(fault, "conductor"), "N");
    ck_assert_str_eq(cJSON_GetArrayItem(member(fault, "run"), 0)->valuestring, "P4");
    ck_assert_str_eq(cJSON_GetArrayItem(member(fault, "run"), 1)->valuestring, "P5");
    ck_assert(number(first, "confidence") > 0.95);
    /* The jump that was read, to what the meter can be off. */
    ck_assert(fabs(number(member(first, "ohms"), "value") - 0.47) < 0.05);
    cJSON_Delete(root);
    run_finish(&left);
}
END_TEST

/* --- readings nobody would believe --- */

/* A ring of three points whose every reading is `value`, runs of `metres`; invented. */
static void write_same_everywhere(const char *path, const char *value, double metres)
{
    char job[1024];
    snprintf(job, sizeof job,
             "{\"format\": \"ringfettle-job/1\", \"ring\": {\"points\": [{\"id\": \"P1\","
             " \"live_mm2\": 1.0, \"run_m\": %.1f}, {\"id\": \"P2\", \"run_m\": %.1f}, {\"id\":"
             " \"P3\", \"run_m\": %.1f}], \"last_run_m\": %.1f},"
             " \"readings\": {\"end_to_end\": {\"l\": %s, \"n\": %s, \"e\": %s},"
             " \"cross_ln\": {\"board\": %s, \"P1\": %s, \"P2\": %s, \"P3\": %s}}}\n",
             metres, metres, metres, metres, value, value, value, value, value, value, value);
    write_whole(path, job);
}

START_TEST(every_command_answers_readings_nobody_would_believe)
{
    static const char *const values[] = {"\"open\"", "0", "99.9", "[0, \"open\", 99.9]"};
    static const double metres[] = {0.1, 5, 500};
    for (size_t i = 0; i < sizeof values / sizeof *values; i++)
        for (size_t k = 0; k < sizeof metres / sizeof *metres; k++) {
            write_same_everywhere("odd.json", values[i], metres[k]);
            struct run left = run(PROGRAM "check odd.json && " PROGRAM "expect odd.json && " PROGRAM
                                          "diagnose odd.json && " PROGRAM
                                          "diagnose --json odd.json && " PROGRAM
                                          "diagnose --page page.html odd.json && " PROGRAM
                                          "review odd.json");
            ck_assert_msg(left.status == 0, "%s, %g m: status %d, %s", values[i], metres[k],
                          left.status, left.err);
            ck_assert_msg(strstr(left.out, "nan") == NULL && strstr(left.out, ":null") == NULL,
                          "%s, %g m: no number", values[i], metres[k]);
            run_finish(&left);
        }
}
END_TEST

/* 16 km of cable read over range with nothing wrong. */
START_TEST(refuses_over_range_where_the_ring_reads_so)
{
    static char job[4096];
    size_t n = (size_t)sprintf(job, "{\"format\": \"ringfettle-job/1\", \"ring\": {\"points\": [");
    for (int i = 1; i <= 32; i++)
        n += (size_t)sprintf(job + n, "%s{\"id\": \"P%d\", \"run_m\": 500}", i > 1 ? ", " : "", i);
    sprintf(job + n, "]}, \"readings\": {\"end_to_end\": {\"n\": 99.5, \"l\": \"open\"}}}\n");
    write_whole("far.json", job);
    static const char says[] =
        "far.json: readings.end_to_end.l: found \"open\"; needs to be left out";
    expect_run(PROGRAM "check far.json", 2, NULL, says);
    expect_run(PROGRAM "diagnose far.json", 2, NULL, says);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("diagnose");
    TCase *cases = tcase_create("diagnose");
    suite_add_tcase(suite, cases);
    tcase_set_timeout(cases, 180);
    tcase_add_checked_fixture(cases, enter_folder, leave_folder);
    tcase_add_test(cases, scenarios_fit_the_screen);
    tcase_add_loop_test(cases, reference_jobs_fit_the_screen, 0, 3);
    tcase_add_test(cases, long_names_fit_the_screen);
    tcase_add_test(cases, says_where_the_joint_is);
    tcase_add_test(cases, says_that_nothing_shows);
    tcase_add_test(cases, says_first_that_no_one_defect_explains_it);
    tcase_add_test(cases, checks_before_screws);
    tcase_add_test(cases, writes_json_a_line_a_job);
    tcase_add_test(cases, leaves_the_plan_out_when_asked);
    tcase_add_test(cases, json_says_what_the_readings_determine);
    tcase_add_test(cases, every_command_answers_readings_nobody_would_believe);
    tcase_add_test(cases, refuses_over_range_where_the_ring_reads_so);
    return run_suite(suite);
}
