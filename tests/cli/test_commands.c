/* SPDX-License-Identifier: GPL-3.0-or-later */
/* check, expect, simulate and answer from outside. All jobs are invented. */
#include "program.h"

#define PROGRAM "\"$RINGFETTLE\" "
#define SCENARIOS "\"$RINGFETTLE_SOURCE\"/scenarios/"

START_TEST(checks)
{
    expect_run(PROGRAM "check small.json", 0,
               "small.json: can be diagnosed: 3 points, 0 spur points, 7 readings", NULL);
    expect_run(PROGRAM "check - <small.json", 0, "standard input: can be diagnosed", NULL);
    expect_run("sed 's/\"points\"/\"live_mm2\": 2.7, \"points\"/' small.json >size.json; " PROGRAM
               "check size.json",
               2, NULL, "size.json");
    expect_run("sed 's/^{/{\"found\": {\"family\": \"jont\"},/' small.json >found.json; " PROGRAM
               "check found.json",
               2, NULL, "did you mean \"joint\"");
}
END_TEST

/* 20 m of 2.5/1.5 mm²: 4 × 5 m × 7.41 mΩ/m = 0.148 Ω end to end by IEC 60228, a quarter of r1 + rn
 * crossed. */
START_TEST(expects)
{
    expect_run(PROGRAM "expect small.json", 0, "small: what a ring wired as recorded would read",
               NULL);
    expect_run(PROGRAM "expect small.json", 0, "line (r1)                         0.15", NULL);
    expect_run(PROGRAM "expect small.json", 0, "board                             0.07", NULL);
    expect_run(PROGRAM "expect --record small.json", 0, "By the recorded", NULL);
    expect_run(PROGRAM "expect small.json --setups apart_le", 0, "over range", NULL);
    expect_run("sed 's/\"P2\": 0.07/\"P2\": 0.57/' small.json | " PROGRAM "expect -", 0, "* P2",
               NULL);
    expect_run("cat small.json small.json >two.ndjson; " PROGRAM "expect two.ndjson", 2, NULL,
               "found several jobs; needs one");
}
END_TEST

/* With only the ends read, the crossed tests are what comes next. */
START_TEST(expects_the_next_test)
{
    write_whole("ends.json", "{\"format\": \"ringfettle-job/1\", \"ring\": {\"points\": [{\"id\": "
                             "\"P1\"}, {\"id\": \"P2\"}]}, \"readings\": {\"end_to_end\": "
                             "{\"l\": 0.40, \"n\": 0.40}}}");
    expect_run(PROGRAM "expect ends.json", 0, "crossed line-neutral", NULL);
    /* (r1 + rn)/4 */
    expect_run(PROGRAM "expect ends.json", 0, "P1                                0.20", NULL);
}
END_TEST

START_TEST(simulates)
{
    struct run one = run(PROGRAM "simulate --seed 11"), same = run(PROGRAM "simulate --seed 11");
    struct run other = run(PROGRAM "simulate --seed 12");
    ck_assert_int_eq(one.status, 0);
    ck_assert_str_eq(one.out, same.out);
    ck_assert_str_ne(one.out, other.out);
    ck_assert(strstr(one.out, "\"found\"") != NULL);
    run_finish(&one);
    run_finish(&same);
    run_finish(&other);
    expect_run(PROGRAM "simulate --count 3 | " PROGRAM "check -", 0, "standard input:3", NULL);
    expect_run(
        PROGRAM "simulate small.json --fault '{\"family\": \"break\", \"run\": [\"P1\", \"P2\"],"
                " \"conductor\": \"N\"}' | tr -d ' \\n'",
        0, "\"found\":{\"family\":\"break\",\"run\":[\"P1\",\"P2\"],\"conductor\":\"N\"}", NULL);
    expect_run(PROGRAM
               "simulate small.json --fault '{\"family\": \"joint\", \"run\": [\"P1\", \"P3\"],"
               " \"conductor\": \"N\"}'",
               2, NULL, "--fault: ");
    expect_run(PROGRAM "simulate --fault nonsense", 2, NULL, "--fault");
}
END_TEST

/* What was held back is not in the job; the answers repeat the readings, and looks find it. */
START_TEST(answers)
{
    expect_run(PROGRAM
               "simulate small.json --seed 3 --hold-back truth.json --fault '{\"family\": "
               "\"contact\", \"at\": \"P2\", \"conductor\": \"N\", \"open\": true}' >job.json; "
               "grep -c found job.json",
               1, "0", NULL);
    expect_run(PROGRAM "answer truth.json cross_ln P2", 0, "open\n", NULL);
    expect_run(PROGRAM "answer truth.json look P2", 0, "found: neutral contact at P2 not made",
               NULL);
    expect_run(PROGRAM "answer truth.json look P1", 0, "nothing wrong there", NULL);
    expect_run(PROGRAM "answer truth.json look P1 P2", 0, "nothing wrong there", NULL);
    expect_run(PROGRAM "answer truth.json check P2", 0, "nothing wrong there", NULL);
    expect_run("grep -q \"\\\"P1\\\": $(" PROGRAM "answer truth.json cross_ln P1)\" job.json", 0,
               "", NULL);
    expect_run(PROGRAM "answer truth.json cross_ln P7", 2, NULL,
               "no place P7; the ring has P1 to P3");
    expect_run(PROGRAM "answer truth.json end_to_end P1", 2, NULL, "nothing is read at a point");
    expect_run(PROGRAM "answer truth.json crss_ln P1", 2, NULL, "did you mean cross_ln?");
    expect_run(PROGRAM "answer small.json cross_ln P1", 2, NULL, "small.json");
}
END_TEST

START_TEST(simulates_on_every_scenario)
{
    expect_run("for f in " SCENARIOS "*.json; do " PROGRAM "simulate \"$f\" | " PROGRAM
               "check - || exit; done",
               0, "can be diagnosed", NULL);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("commands");
    TCase *cases = tcase_create("commands");
    suite_add_tcase(suite, cases);
    tcase_set_timeout(cases, 60);
    tcase_add_checked_fixture(cases, enter_folder, leave_folder);
    tcase_add_test(cases, checks);
    tcase_add_test(cases, expects);
    tcase_add_test(cases, expects_the_next_test);
    tcase_add_test(cases, simulates);
    tcase_add_test(cases, answers);
    tcase_add_test(cases, simulates_on_every_scenario);
    return run_suite(suite);
}
