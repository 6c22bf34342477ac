/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Usage, help, exit statuses, and what happens when files and pipes do not hold. */
#include "program.h"

#define PROGRAM "\"$RINGFETTLE\" "

static const char *const commands[] = {"diagnose", "check", "expect", "simulate", "answer",
                                       "review"};
enum { N_COMMANDS = sizeof commands / sizeof commands[0] };

START_TEST(helps)
{
    char line[64];
    expect_run(PROGRAM "--version", 0, "ringfettle 0.", NULL);
    for (size_t i = 0; i < N_COMMANDS; i++) {
        expect_run(PROGRAM "--help", 0, commands[i], NULL);
        sprintf(line, PROGRAM "%s --help", commands[i]);
        expect_run(line, 0, "usage: ringfettle ", NULL);
        expect_run(line, 0, "--models DIR", NULL);
    }
    expect_run(PROGRAM "diagnose --help", 0, "--json", NULL);
    expect_run(PROGRAM, 2, NULL, "usage: ringfettle COMMAND");
}
END_TEST

START_TEST(names_the_nearest)
{
    expect_run(PROGRAM "diagnos small.json", 2, NULL, "no command diagnos; did you mean diagnose?");
    expect_run(PROGRAM "zzzzzzzz", 2, NULL, "no command zzzzzzzz; ringfettle --help lists");
    expect_run(PROGRAM "--versio", 2, NULL, "no option --versio; did you mean --version?");
    expect_run(PROGRAM "diagnose --jsn small.json", 2, NULL,
               "diagnose: no option --jsn; did you mean --json?");
    expect_run(PROGRAM "diagnose -x small.json", 2, NULL, "diagnose: no option -x");
    expect_run(PROGRAM "diagnose small.json --json=3", 2, NULL, "--json takes no value");
    expect_run(PROGRAM "diagnose small.json --models", 2, NULL, "--models needs a value");
    expect_run(PROGRAM "expect small.json --setups cros_ln", 2, NULL, "did you mean cross_ln?");
    expect_run(PROGRAM "answer small.json lok P2", 2, NULL, "small.json");
}
END_TEST

START_TEST(wants_operands)
{
    expect_run(PROGRAM "diagnose", 2, NULL, "needs a job file, or - for standard input");
    expect_run(PROGRAM "check", 2, NULL, "needs a job file");
    expect_run(PROGRAM "expect", 2, NULL, "needs a job file");
    expect_run(PROGRAM "expect small.json small.json", 2, NULL, "nothing to do with small.json");
    expect_run(PROGRAM "answer small.json P1", 2, NULL, "needs a truth");
    expect_run(PROGRAM "simulate --seed -1", 2, NULL, "found -1; needs a whole number");
    expect_run(PROGRAM "simulate --seed 4294967296", 2, NULL, "needs a whole number from 0 to");
    expect_run(PROGRAM "simulate --count 2 --hold-back t.json", 2, NULL, "needs no --count");
}
END_TEST

START_TEST(names_files_that_do_not_open)
{
    expect_run(PROGRAM "diagnose nowhere.json", 4, NULL, "nowhere.json: ");
    expect_run(PROGRAM "diagnose small.json/x", 4, NULL, "small.json/x: ");
    expect_run(PROGRAM "diagnose .", 2, NULL, ".: found a folder; needs a job file");
    expect_run(PROGRAM "simulate nowhere.json", 4, NULL, "nowhere.json: ");
    expect_run(PROGRAM "answer nowhere.json look P1", 4, NULL, "nowhere.json: ");
    expect_run(PROGRAM "simulate --hold-back none/t.json", 4, NULL, "none/t.json: ");
    expect_run(PROGRAM "diagnose --models nowhere small.json", 4, NULL, "nowhere/conductor.json");
    /* The others go on, and the gravest status stands. */
    expect_run(PROGRAM "check nowhere.json small.json", 4, "small.json: can be diagnosed",
               "nowhere");
    if (geteuid() != 0) { /* root reads everything */
        expect_run("chmod 000 small.json; " PROGRAM "check small.json", 4, NULL, "small.json: ");
    }
}
END_TEST

START_TEST(sees_that_output_arrives)
{
    expect_run(PROGRAM "diagnose small.json >/dev/full", 4, NULL,
               "standard output: cannot write: No space left on device");
    expect_run(PROGRAM "--help >/dev/full", 4, NULL, "No space left on device");
    expect_run(PROGRAM "check small.json >&-", 4, NULL, "standard output: cannot write");
    expect_run(PROGRAM "simulate --hold-back /dev/full", 4, NULL, "/dev/full: cannot be written");
}
END_TEST

/* A closed pipe is status 4 and a message, not a signal. */
START_TEST(outlives_its_reader)
{
    expect_run("{ " PROGRAM "simulate --count 5000 2>complaint; echo $? >status; } | head -c 10 "
               ">/dev/null; cat status complaint",
               0, "4\nringfettle: standard output: cannot write: Broken pipe", NULL);
}
END_TEST

START_TEST(goes_on_behind_what_is_refused)
{
    write_whole("bad.json", "{\"format\": \"ringfettle-job/1\", \"ring\": {\"points\": "
                            "[{\"id\": \"P1\"}]}, \"readings\": {\"cross_ln\": {\"P9\": 0.3}}}");
    expect_run(PROGRAM "diagnose bad.json", 2, NULL,
               "bad.json: readings.cross_ln.P9: no such point; the ring has P1");
    expect_run(PROGRAM "check bad.json small.json", 2, "small.json: can be diagnosed", "bad.json");
    expect_run("{ tr -d '\\n' <bad.json; echo; cat small.json; } >two.ndjson; " PROGRAM
               "diagnose --json two.ndjson",
               2, "\"job\":\"small\"", "two.ndjson:1: readings.cross_ln.P9");
    expect_run("echo nonsense | " PROGRAM "check -", 2, NULL, "standard input");
    expect_run(PROGRAM "check /dev/null", 2, NULL, "/dev/null");
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("usage");
    TCase *cases = tcase_create("usage");
    suite_add_tcase(suite, cases);
    tcase_set_timeout(cases, 60);
    tcase_add_checked_fixture(cases, enter_folder, leave_folder);
    tcase_add_test(cases, helps);
    tcase_add_test(cases, names_the_nearest);
    tcase_add_test(cases, wants_operands);
    tcase_add_test(cases, names_files_that_do_not_open);
    tcase_add_test(cases, sees_that_output_arrives);
    tcase_add_test(cases, outlives_its_reader);
    tcase_add_test(cases, goes_on_behind_what_is_refused);
    return run_suite(suite);
}
