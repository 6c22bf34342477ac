/* SPDX-License-Identifier: GPL-3.0-or-later */
/* convert: sheets from a spreadsheet under three locales, there and back, and long tables. */

#include "program.h"

static const char calc[] = "$RINGFETTLE_SOURCE/tests/cases/sheets/calc";

/* The sheets beside tests/cases/sheets/calc/make were written by LibreOffice Calc 7.4. */
static void expect_as_calc(const char *folder_of)
{
    static const char *const locales[] = {"en-GB", "de-DE", "sv-SE"};
    for (size_t i = 0; i < sizeof locales / sizeof locales[0]; i++) {
        char line[512];
        sprintf(line, "cp %s/expected.json wanted.json; $RINGFETTLE convert %s/%s.csv", calc,
                folder_of, locales[i]);
        struct run left = run(line);
        ck_assert_msg(left.status == 0, "%s: %s", locales[i], left.err);
        char *wanted = read_whole("wanted.json");
        cJSON *one = cJSON_Parse(left.out), *other = cJSON_Parse(wanted);
        ck_assert_msg(one != NULL && other != NULL && cJSON_Compare(one, other, 1), "%s:\n%s",
                      locales[i], left.out);
        cJSON_Delete(one);
        cJSON_Delete(other);
        free(wanted);
        run_finish(&left);
    }
}

START_TEST(from_calc)
{
    enter_folder();
    expect_as_calc(calc);
    leave_folder();
}
END_TEST

/* The same through LibreOffice here and now; minutes, so only where it is asked for. */
START_TEST(through_calc)
{
    enter_folder();
    if (getenv("RINGFETTLE_CALC") == NULL) {
        fprintf(stderr, "SKIPPED: through_calc: set RINGFETTLE_CALC to run LibreOffice Calc\n");
    } else {
        char line[512];
        sprintf(line, "%s/make $RINGFETTLE . >/dev/null 2>&1", calc);
        struct run left = run(line);
        if (left.status == 77) {
            fprintf(stderr, "SKIPPED: through_calc: no LibreOffice here\n");
        } else {
            ck_assert_msg(left.status == 0, "%s", left.err);
            expect_as_calc(".");
        }
        run_finish(&left);
    }
    leave_folder();
}
END_TEST

START_TEST(there_and_back)
{
    enter_folder();
    expect_run("$RINGFETTLE convert small.json >a.csv && $RINGFETTLE convert a.csv >b.json && "
               "$RINGFETTLE convert b.json | cmp - a.csv && "
               "$RINGFETTLE convert --separator tab --decimal comma - <b.json | "
               "$RINGFETTLE convert - | cmp - b.json",
               0, NULL, NULL);
    expect_run("$RINGFETTLE convert --to ndjson a.csv small.json | $RINGFETTLE convert --to ndjson - | "
               "wc -l",
               0, "2", NULL);
    expect_run("$RINGFETTLE convert --output c.csv small.json && cmp a.csv c.csv", 0, NULL, NULL);
    expect_run("$RINGFETTLE convert --output c.csv small.json", 2, NULL, "is there already");
    expect_run("$RINGFETTLE convert a.csv small.json", 2, NULL, "needs one job");
    expect_run("$RINGFETTLE convert --to yaml a.csv", 2, NULL, "needs sheet, json or ndjson");
    expect_run("$RINGFETTLE convert a.csv >/dev/full", 4, NULL, "cannot write");
    expect_run("$RINGFETTLE diagnose --json a.csv >d.txt; $RINGFETTLE diagnose --json small.json | "
               "cmp - d.txt",
               0, NULL, NULL);
    expect_run("sed 's/0.08/0.8x/' a.csv >bad.csv; $RINGFETTLE diagnose bad.csv", 2, NULL,
               "bad.csv: row 9, column cross_ln: found \"0.8x\"");
    leave_folder();
}
END_TEST

static const char table[] =
    "Ref;Test;Point;Ohms;seq;metres;from;found\n"
    "J1;cross_ln;P2;0,41;2;;;\n"
    "J1;cross_ln;P1;0,40;1;6,5;;\"{\"\"family\"\": \"\"none\"\"}\"\n"
    "J1;cross_ln;P1;0,42;;;;\n"
    "J1;cross_ln;board;0,39;;;;\n"
    "J1;end_to_end;r1;0,61;;;;\n"
    "J1;;in;;;9,0;;\n"
    "J1;cross_ln;S1;OL;;3;P2;\n"
    "\n"
    "J2;cross_ln;P1;0,4x;1;6,5;;\n"
    "J2;cross_ln;P2;0,41;2;;;\n"
    "J3;cross_ln;P1;0,40;1;6,5;;\n";

START_TEST(long_table)
{
    enter_folder();
    write_whole("t.csv", table);
    expect_run("$RINGFETTLE convert --long --columns job=Ref,setup=Test,place=Point,value=Ohms "
               "--rejects r.csv t.csv >j.ndjson",
               2, NULL, "t.csv: row 10, column Ohms: found \"0,4x\"");
    expect_run("cat r.csv", 0,
               "Ref;Test;Point;Ohms;seq;metres;from;found\nJ2;cross_ln;P1;0,4x;1;6,5;;\n"
               "J2;cross_ln;P2;0,41;2;;;\n",
               NULL);
    expect_run("cat j.ndjson", 0,
               "{\"format\": \"ringfettle-job/1\", \"job\": \"J1\", \"ring\": {\"last_run_m\": 9, "
               "\"points\": [{\"id\": \"P1\", \"run_m\": 6.5}, {\"id\": \"P2\"}], \"spurs\": [{\"id\": "
               "\"S1\", \"run_m\": 3, \"from\": \"P2\"}]}, \"readings\": {\"cross_ln\": {\"P2\": 0.41, "
               "\"P1\": [0.4, 0.42], \"board\": 0.39, \"S1\": \"open\"}, \"end_to_end\": {\"l\": "
               "0.61}}, \"found\": {\"family\": \"none\"}}\n",
               NULL);
    /* Put right, the rejects are read by the same command. */
    expect_run("sed 's/0,4x/0,44/' r.csv >s.csv; $RINGFETTLE convert --long --columns "
               "job=Ref,setup=Test,place=Point,value=Ohms s.csv | $RINGFETTLE check -",
               0, "2 points", NULL);
    leave_folder();
}
END_TEST

START_TEST(long_refusals)
{
    static const struct {
        const char *rows, *message;
    } cases[] = {
        {"A,cross_nl,P1,0.4\n", "t.csv: row 2, column setup: found \"cross_nl\""},
        {"A,cross_ln,,0.4\n", "t.csv: row 2, column place: found \"\""},
        {"A,cross_ln,P1,x\n", "t.csv: row 2, column value: found \"x\""},
        {"A,cross_ln,P1,100\n", "t.csv: row 2, column value: found 100"},
        {"A,cross_ln,P1,0.4\nA,cross_ln,P2,\"0,4\"\n", "t.csv: row 3, column value: found \"0,4\""},
        {"A,cross_ln,P1,0,4\n", "t.csv: row 2: found 5 cells; needs 4"},
        {"A,cross_ln,P1\n", "t.csv: row 2: found 3 cells; needs 4"},
        {",cross_ln,P1,0.4\n", "t.csv: row 2, column job: found nothing"},
        {"A,cross_ln,P1,0.4\nB,cross_ln,P1,0.4\nA,cross_ln,P1,0.4\n",
         "t.csv: row 4, column job: found job \"A\" again"},
        {"A,cross_ln,P1,\"0.4\n", "t.csv: row 2: found a quote that is never closed"},
        {"A,cross_ln,P\"1,0.4\n", "t.csv: row 2, column C: found a quote"},
        {"A,link_out_ln,board,0.4\nA,cross_ln,P1,0.4\n",
         "t.csv: row 2, column value: not read in link_out_ln"},
    };
    enter_folder();
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        char text[512];
        sprintf(text, "job,setup,place,value\n%s", cases[i].rows);
        write_whole("t.csv", text);
        struct run left = run("$RINGFETTLE convert --long --rejects r.csv t.csv");
        ck_assert_int_eq(left.status, 2);
        expect_words(cases[i].rows, "standard error", left.err, cases[i].message);
        char *kept = read_whole("r.csv");
        ck_assert_msg(strncmp(kept, text, 22) == 0, "%s", kept); /* the columns */
        ck_assert_uint_gt(strlen(kept), 22);
        free(kept);
        run_finish(&left);
        unlink("r.csv");
    }
    write_whole("t.csv", "job,setup,place\nA,B,C\n");
    expect_run("$RINGFETTLE convert --long t.csv", 2, NULL, "row 1: found no column \"value\"");
    leave_folder();
}
END_TEST

/* A long archive in little memory: half a million rows in 200 MB of address space, where the program
 * can be held to that: sanitizers take far more. */
START_TEST(long_stream)
{
    enter_folder();
    expect_run("awk 'BEGIN { print \"job,setup,place,value\"; for (j = 0; j < 50000; j++) "
               "for (p = 1; p <= 10; p++) printf \"J%d,cross_ln,P%d,0.%d\\n\", j, p, 30 + p }' "
               ">t.csv; { (ulimit -v 200000; $RINGFETTLE --version >version.txt) && narrow=200000; } "
               "2>version.txt; "
               "(ulimit -v ${narrow:-unlimited}; $RINGFETTLE convert --long t.csv) | wc -l",
               0, "50000", NULL);
    leave_folder();
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("convert");
    TCase *tests = tcase_create("convert");
    tcase_set_timeout(tests, 280);
    tcase_add_test(tests, from_calc);
    tcase_add_test(tests, through_calc);
    tcase_add_test(tests, there_and_back);
    tcase_add_test(tests, long_table);
    tcase_add_test(tests, long_refusals);
    tcase_add_test(tests, long_stream);
    suite_add_tcase(suite, tests);
    return run_suite(suite);
}
