/* SPDX-License-Identifier: GPL-3.0-or-later */
/* `review` from outside: archives with bad lines, threads, parts and merging, what is learned, an
 * interrupt. All jobs are invented. */
#include "program.h"

#include <errno.h>
#include <fcntl.h>
#include <signal.h>
#include <sys/ioctl.h>
#include <time.h>

#define PROGRAM "\"$RINGFETTLE\" "

#define JOB "{\"format\": \"ringfettle-job/1\", "
#define RING(more)                                                                                 \
    "\"ring\": {\"points\": [{\"id\": \"P1\"}, {\"id\": \"P2\"}, {\"id\": \"P3\"}]" more "}"
#define READ "\"readings\": {\"cross_ln\": {\"P1\": 0.3}}"

/* A line that is no job, and what the complaint about it says. */
static const struct {
    const char *line, *says;
} bad_lines[] = {
    {"{broken", "found \"broken\""},
    {JOB RING("") ", \"readings\": {\"cross_ln\": {\"P1\": 0.3", "needs"},
    {"[1, 2, 3]", "object"},
    {"{\"format\": \"ringfettle-job/2\"}", "ringfettle-job/2"},
    {"{" RING("") ", " READ "}", "format: missing"},
    {JOB READ "}", "ring: missing"},
    {JOB "\"ring\": {\"points\": []}, " READ "}", "points"},
    {JOB "\"ring\": {\"points\": [{\"id\": \"P1\"}, {\"id\": \"P1\"}]}, " READ "}", "P1"},
    {JOB "\"ring\": {\"points\": [{\"id\": \"P1\"}, {\"id\": \"board\"}]}, " READ "}", "board"},
    {JOB RING("") "}", "readings"},
    {JOB RING("") ", \"readings\": {\"cross_ln\": {\"P1\": -0.3}}}", "-0.3"},
    {JOB RING("") ", \"readings\": {\"cross_ln\": {\"P1\": 120}}}", "120"},
    {JOB RING("") ", \"readings\": {\"cross_ln\": {\"P9\": 0.3}}}", "P9"},
    {JOB RING("") ", \"readings\": {\"crossed\": {\"P1\": 0.3}}}", "crossed"},
    {JOB RING("") ", " READ ", \"notes\": \"x\"}", "notes"},
    {JOB RING("") ", " READ ", " READ "}", "readings"},
    {JOB RING(", \"spurs\": [{\"id\": \"S1\", \"from\": \"S2\"}, {\"id\": \"S2\", \"from\": "
              "\"S1\"}]") ", " READ "}",
     "S"},
    {JOB RING("") ", \"readings\": {\"cross_ln\": {\"P1\": 1e999}}}", "found a number too large"},
    {JOB RING("") ", \"date\": \"2026-02-30\", " READ "}", "2026-02-30"},
    {JOB RING("") ", " READ ", \"note\": \"\xFF\"}", "UTF-8"},
    {JOB RING("") ", " READ ", \"found\": {\"family\": \"jont\"}}", "joint"},
    {JOB RING("") ", " READ
                  ", \"found\": {\"family\": \"joint\", \"run\": [\"P1\", \"P3\"], \"conductor\": "
                  "\"N\"}}",
     "found"},
    {JOB RING(", \"order\": \"unknown\"") ", " READ "}", "order"},
    {JOB RING(", \"live_mm2\": 2.7") ", " READ "}", "2.7"},
};
enum { N_BAD = sizeof bad_lines / sizeof bad_lines[0] };

static size_t count_lines(const char *text)
{
    size_t n = 0;
    for (; *text != '\0'; text++)
        n += *text == '\n';
    return n;
}

static void add_good(FILE *file, int number)
{
    ck_assert(
        fprintf(file,
                JOB "\"job\": \"good-%02d\", " RING(
                    "") ", \"readings\": {\"end_to_end\": "
                        "{\"l\": 0.30, \"n\": 0.30}, \"cross_ln\": {\"P1\": 0.15, \"P2\": 0.15, "
                        "\"P3\": 0.%d}}}\n",
                number, 15 + number % 3) > 0);
}

/* good-00, a bad line, good-01, a bad line, … */
static void write_mixed(void)
{
    FILE *file = fopen("mixed.ndjson", "wb");
    ck_assert(file != NULL);
    for (int i = 0; i < N_BAD; i++) {
        add_good(file, i);
        ck_assert(fprintf(file, "%s\n", bad_lines[i].line) > 0);
    }
    add_good(file, N_BAD);
    ck_assert(fclose(file) == 0);
}

/* Every bad line is named with its number and its reason, in order; the others come in order. */
START_TEST(bad_lines_are_named_and_passed)
{
    write_mixed();
    struct run left = run(PROGRAM "review mixed.ndjson --csv table.csv");
    ck_assert_int_eq(left.status, 2);
    ck_assert_uint_eq(count_lines(left.err), N_BAD);
    const char *at = left.err, *good = left.out;
    for (int i = 0; i < N_BAD; i++) {
        char start[64];
        snprintf(start, sizeof start, "mixed.ndjson:%d", 2 * i + 2);
        const char *found = strstr(at, start);
        ck_assert_msg(found != NULL, "%s is not named in\n%s", start, left.err);
        size_t length = strcspn(found, "\n");
        const char *says = strstr(found, bad_lines[i].says);
        ck_assert_msg(says != NULL && says < found + length, "no \"%s\" in %.*s", bad_lines[i].says,
                      (int)length, found);
        at = found + length;
    }
    for (int i = 0; i <= N_BAD; i++) {
        char name[16];
        snprintf(name, sizeof name, "good-%02d ", i);
        ck_assert_msg(strncmp(good, name, strlen(name)) == 0, "%s is not where it should be in\n%s",
                      name, left.out);
        good += strcspn(good, "\n") + 1;
    }
    char refused[64];
    snprintf(refused, sizeof refused, "refused%27d\n", N_BAD);
    ck_assert_msg(strstr(left.out, refused) != NULL, "no \"%s\" in\n%s", refused, left.out);
    char *table = read_whole("table.csv");
    ck_assert_uint_eq(count_lines(table), N_BAD + 2);
    ck_assert(strncmp(table, "job,verdict,", 12) == 0);
    free(table);
    run_finish(&left);
}
END_TEST

/* A line is a diagnosis, the last is the summary. */
START_TEST(json_lines)
{
    write_mixed();
    struct run left = run(PROGRAM "review --json mixed.ndjson");
    ck_assert_int_eq(left.status, 2);
    ck_assert_uint_eq(count_lines(left.out), N_BAD + 2);
    char *rest = NULL;
    int number = 0;
    for (char *line = strtok_r(left.out, "\n", &rest); line != NULL;
         line = strtok_r(NULL, "\n", &rest), number++) {
        cJSON *object = cJSON_Parse(line);
        const char *format = cJSON_GetStringValue(cJSON_GetObjectItem(object, "format"));
        ck_assert(format != NULL);
        ck_assert_str_eq(format,
                         number <= N_BAD ? "ringfettle-diagnosis/1" : "ringfettle-review/1");
        if (number > N_BAD) {
            ck_assert_int_eq(cJSON_GetObjectItem(object, "jobs")->valueint, N_BAD + 1);
            ck_assert_int_eq(cJSON_GetObjectItem(object, "refused")->valueint, N_BAD);
            ck_assert(cJSON_IsTrue(cJSON_GetObjectItem(object, "complete")));
        }
        cJSON_Delete(object);
    }
    run_finish(&left);
}
END_TEST

START_TEST(threads_change_nothing)
{
    expect_run(PROGRAM
               "simulate --count 30 --seed 100 >jobs.ndjson; cat jobs.ndjson "
               "\"$RINGFETTLE_SOURCE\"/tests/cli/program.h | head -40 >some.ndjson; " PROGRAM
               "review --json --threads 1 some.ndjson >one.out 2>one.err; " PROGRAM
               "review --json --threads 2 some.ndjson >two.out 2>two.err; " PROGRAM
               "review --json --threads 7 - <some.ndjson >seven.out 2>seven.err; "
               "cmp one.out two.out && cmp one.err two.err && cmp one.out seven.out && "
               "test -s one.err && echo alike",
               0, "alike\n", NULL);
}
END_TEST

/* Four parts, one of them with bad lines, merged in whatever order: the summary of one run. */
START_TEST(parts_merge)
{
    expect_run(
        "{ " PROGRAM "simulate --count 22 --seed 200; echo '{no'; " PROGRAM
        "simulate --count 5 --seed 300; echo '[]'; } >jobs.ndjson; " PROGRAM
        "review --json jobs.ndjson 2>/dev/null | tail -n 1 >whole.json; " PROGRAM
        "review jobs.ndjson 2>/dev/null | tail -n +28 >whole.txt; split -l 8 -d jobs.ndjson part; "
        "for p in part0?; do " PROGRAM
        "review --json - <$p >$p.out 2>/dev/null; done; ls part0?.out "
        "| wc -l; " PROGRAM "review --merge --json part0?.out >merged.json && cmp whole.json "
        "merged.json && " PROGRAM
        "review --merge --json part03.out part00.out part02.out part01.out | cmp - whole.json && "
        "cat part0?.out | " PROGRAM "review --merge - | cmp - whole.txt && echo alike",
        0, "4\nalike\n", NULL);
    expect_run(PROGRAM "review --merge part00.out nowhere.out", 4, NULL,
               "nowhere.out: cannot be opened");
}
END_TEST

/* What is no whole part is told from one. */
START_TEST(broken_parts_are_refused)
{
    expect_run("for i in 1 2 3; do cat small.json; done >jobs.ndjson; " PROGRAM
               "review --json jobs.ndjson >all.out; head -n 3 all.out >cut.out; sed 2d all.out "
               ">lost.out; " PROGRAM "review --merge cut.out",
               2, NULL, "found no summary at the end");
    expect_run(PROGRAM "review --merge lost.out", 2, NULL,
               "lost.out:3: jobs: found 3 and 2 lines of jobs before it");
    expect_run(PROGRAM "review --merge small.json", 2, NULL, "small.json:1: format");
    expect_run(PROGRAM "review --json --rates consulted jobs.ndjson >other.out; " PROGRAM
                       "review --merge all.out other.out",
               2, NULL, "found \"consulted\" and before it \"archive\"");
    expect_run("sed 's/\"none\":[0-9]*/\"none\":-1/' all.out | " PROGRAM "review --merge -", 2,
               NULL, "standard input:1: review.none: found -1");
}
END_TEST

START_TEST(folders)
{
    expect_run("mkdir -p a/b a/c; for j in a/z a/b/y a/c/x; do sed \"s:small:$j:\" small.json "
               ">$j.json; done; echo not a job >a/readme.txt; ln -s .. a/b/up; echo "
               ">a/.hidden.json; " PROGRAM "review a | cut -d ' ' -f 1 | head -n 3 | tr '\\n' ' '",
               0, "a/b/y a/c/x a/z ", "passed over for their names: 2 files");
    expect_run(PROGRAM "review a nowhere >/dev/null", 4, "", "nowhere: cannot be read");
    expect_run("mkdir empty; " PROGRAM "review empty", 0, "jobs                             0",
               NULL);
}
END_TEST

START_TEST(learns)
{
    expect_run("mkdir models; cp \"$RINGFETTLE_SOURCE\"/models/*.json models; " PROGRAM
               "simulate --count 22 --seed 5 >jobs.ndjson; " PROGRAM
               "review jobs.ndjson --learn models/faults.json >/dev/null; grep -c '\"count\"' "
               "models/faults.json; " PROGRAM "diagnose --models models small.json >/dev/null",
               0, "17\n", NULL);
    expect_run("head -n 19 jobs.ndjson | " PROGRAM "review - --learn few.json >/dev/null; test -e "
               "few.json",
               1, "", "found 19 jobs that say what was found");
    expect_run(PROGRAM "review --json jobs.ndjson >all.out; " PROGRAM
                       "review --merge all.out --learn merged.json >/dev/null; cmp merged.json "
                       "models/faults.json",
               0, "", NULL);
    expect_run(PROGRAM "review jobs.ndjson --learn x.json --weight 0", 2, NULL, "--weight");
    expect_run(PROGRAM "review jobs.ndjson --weight 5", 2, NULL, "--weight goes with --learn");
    expect_run(PROGRAM "review jobs.ndjson --rates often", 2, NULL, "needs archive or consulted");
    expect_run(PROGRAM "review jobs.ndjson --threads none", 2, NULL, "--threads");
    expect_run(PROGRAM "review --merge all.out --threads 2", 2, NULL, "--merge reads parts");
}
END_TEST

/* A name that a spreadsheet would calculate stays a name. */
START_TEST(table_holds_no_formulas)
{
    expect_run("sed 's/\"small\"/\"=1+1,2\"/' small.json >f.json; " PROGRAM
               "review f.json --csv t.csv >/dev/null; cat t.csv",
               0, "\"'=1+1,2\",no_defect,", NULL);
    expect_run(PROGRAM "review small.json --csv /nowhere/t.csv", 4, NULL, "/nowhere/t.csv");
}
END_TEST

/* --- an interrupt --- */

enum { WAITING_AT = 64, FED = 70, TENTHS = 600 };

/* The program on a pipe that stays open, writing to a file. */
static pid_t start(int *feed)
{
    int ends[2];
    ck_assert(pipe(ends) == 0);
    pid_t child = fork();
    ck_assert(child >= 0);
    if (child == 0) {
        int out = open("interrupted.out", O_WRONLY | O_CREAT | O_TRUNC, 0600);
        signal(SIGINT, SIG_DFL);
        dup2(ends[0], STDIN_FILENO);
        dup2(out, STDOUT_FILENO);
        close(ends[0]);
        close(ends[1]);
        execl(getenv("RINGFETTLE"), "ringfettle", "review", "--json", "-", (char *)NULL);
        _exit(127);
    }
    close(ends[0]);
    *feed = ends[1];
    return child;
}

START_TEST(an_interrupt_ends_in_good_order)
{
    int feed, status;
    pid_t child = start(&feed);
    for (int i = 0; i < FED; i++)
        ck_assert_int_eq(write(feed, small_job, strlen(small_job)), (ssize_t)strlen(small_job));
    size_t lines = 0;
    for (int i = 0; i < TENTHS && lines < WAITING_AT; i++) {
        nanosleep(&(struct timespec){.tv_nsec = 100000000}, NULL);
        if (access("interrupted.out", R_OK) != 0)
            continue;
        char *so_far = read_whole("interrupted.out");
        lines = count_lines(so_far);
        free(so_far);
    }
    ck_assert_uint_eq(lines, WAITING_AT);
    ck_assert_int_eq(kill(child, SIGINT), 0);
    ck_assert_int_eq(waitpid(child, &status, 0), child); /* though the pipe is still open */
    close(feed);
    ck_assert(WIFSIGNALED(status) && WTERMSIG(status) == SIGINT);
    expect_run("tail -n 1 interrupted.out", 0, "\"complete\":false,\"jobs\":64,", NULL);
    expect_run(PROGRAM "review --merge interrupted.out", 0, "SUMMARY, STOPPED BEFORE THE END",
               NULL);
}
END_TEST

/* With a reader that does not read yet, the program waits in the middle of a line. */
START_TEST(an_interrupt_cuts_no_line)
{
    enum { MUCH = 30000, UNCHANGED = 5 };
    int ends[2], status, waiting = 0, before = 0, unchanged = 0;
    ck_assert(system("for i in $(seq 200); do cat small.json; done >jobs.ndjson") == 0);
    ck_assert(pipe(ends) == 0);
    pid_t child = fork();
    ck_assert(child >= 0);
    if (child == 0) {
        signal(SIGINT, SIG_DFL);
        dup2(ends[1], STDOUT_FILENO);
        close(ends[0]);
        close(ends[1]);
        execl(getenv("RINGFETTLE"), "ringfettle", "review", "--json", "jobs.ndjson", (char *)NULL);
        _exit(127);
    }
    close(ends[1]);
    for (int i = 0; i < TENTHS && unchanged < UNCHANGED; i++) {
        nanosleep(&(struct timespec){.tv_nsec = 100000000}, NULL);
        ck_assert(ioctl(ends[0], FIONREAD, &waiting) == 0);
        unchanged = waiting > MUCH && waiting == before ? unchanged + 1 : 0;
        before = waiting;
    }
    ck_assert_int_eq(unchanged, UNCHANGED); /* the pipe is full */
    ck_assert_int_eq(kill(child, SIGINT), 0);
    FILE *pipe_end = fdopen(ends[0], "rb"), *file = fopen("interrupted.out", "wb");
    ck_assert(pipe_end != NULL && file != NULL);
    for (int byte; (byte = getc(pipe_end)) != EOF;)
        putc(byte, file);
    fclose(pipe_end);
    ck_assert(fclose(file) == 0);
    ck_assert_int_eq(waitpid(child, &status, 0), child);
    ck_assert(WIFSIGNALED(status) && WTERMSIG(status) == SIGINT);
    expect_run(PROGRAM "review --merge interrupted.out", 0, "SUMMARY, STOPPED BEFORE THE END",
               NULL);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("review");
    TCase *cases = tcase_create("review");
    suite_add_tcase(suite, cases);
    tcase_set_timeout(cases, 120);
    tcase_add_checked_fixture(cases, enter_folder, leave_folder);
    tcase_add_test(cases, bad_lines_are_named_and_passed);
    tcase_add_test(cases, json_lines);
    tcase_add_test(cases, threads_change_nothing);
    tcase_add_test(cases, parts_merge);
    tcase_add_test(cases, broken_parts_are_refused);
    tcase_add_test(cases, folders);
    tcase_add_test(cases, learns);
    tcase_add_test(cases, table_holds_no_formulas);
    tcase_add_test(cases, an_interrupt_ends_in_good_order);
    tcase_add_test(cases, an_interrupt_cuts_no_line);
    return run_suite(suite);
}
