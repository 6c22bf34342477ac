/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * record never loses a file: killed at any moment, on a full disk, or two at once, what is there
 * is the old file or the new one, whole.
 */
#define _GNU_SOURCE /* mount, flock */

#include "program.h"

#include <errno.h>
#include <fcntl.h>
#include <signal.h>
#include <stdbool.h>
#include <stdint.h>
#include <sys/file.h>
#include <sys/mount.h>
#include <sys/stat.h>
#include <sys/wait.h>
#include <time.h>

static void put_file(const char *path, const char *bytes, size_t length)
{
    FILE *file = fopen(path, "wb");
    ck_assert(file != NULL);
    ck_assert_uint_eq(fwrite(bytes, 1, length, file), length);
    ck_assert(fclose(file) == 0);
}

/* A job with a long key of the user's own, so that writing takes a while. */
static char *long_job(size_t filler)
{
    char *job = calloc(1, filler + 1024);
    ck_assert(job != NULL);
    strcpy(job, "{\"format\": \"ringfettle-job/1\", \"x_filler\": \"");
    memset(job + strlen(job), 'a', filler);
    strcat(job, "\",\n \"ring\": {\"points\": [{\"id\": \"P1\", \"run_m\": 5.50}]},\n"
                " \"readings\": {\"cross_ln\": {\"board\": 0.070, \"P1\": 0.07}}}\n");
    return job;
}

static pid_t start_record(const char *path)
{
    pid_t child = fork();
    ck_assert(child >= 0);
    if (child > 0)
        return child;
    int quiet = open("/dev/null", O_WRONLY);
    dup2(quiet, STDERR_FILENO);
    execl(getenv("RINGFETTLE"), "ringfettle", "record", path, "cross_ln", "P1=0.08", (char *)NULL);
    _exit(127);
}

static double seconds(void)
{
    struct timespec now;
    clock_gettime(CLOCK_MONOTONIC, &now);
    return (double)now.tv_sec + (double)now.tv_nsec * 1e-9;
}

static void pause_for(double duration)
{
    struct timespec time = {.tv_sec = (time_t)duration};
    time.tv_nsec = (long)((duration - (double)time.tv_sec) * 1e9);
    nanosleep(&time, NULL);
}

START_TEST(killed)
{
    const char *asked = getenv("RINGFETTLE_KILLS");
    size_t kills = asked != NULL ? (size_t)strtoul(asked, NULL, 10) : 100;
    size_t olds = 0, news = 0, too_late = 0;
    uint64_t state = 20260211;
    enter_folder();
    char *old = long_job(200000);
    put_file("job.json", old, strlen(old));
    int status;

    double begin = seconds();
    pid_t child = start_record("job.json");
    ck_assert(waitpid(child, &status, 0) == child && status == 0);
    double window = 1.2 * (seconds() - begin);
    char *new = read_whole("job.json");
    ck_assert_str_ne(old, new);

    /* Kills that come too late do not count; the window follows the machine's pace so that about
     * one in four does. */
    for (size_t landed = 0; landed < kills;) {
        put_file("job.json", old, strlen(old));
        state = state * 6364136223846793005u + 1442695040888963407u;
        child = start_record("job.json");
        pause_for(window * (double)(state >> 33) / 2147483648.0);
        kill(child, SIGKILL);
        ck_assert(waitpid(child, &status, 0) == child);
        window *= WIFEXITED(status) ? 0.97 : 1.01;
        too_late += WIFEXITED(status);
        landed += WIFSIGNALED(status);
        char *left = read_whole("job.json");
        bool is_old = strcmp(left, old) == 0, is_new = strcmp(left, new) == 0;
        ck_assert_msg(is_old || is_new, "kill %zu left %zu bytes", landed, strlen(left));
        olds += is_old && WIFSIGNALED(status);
        news += is_new && WIFSIGNALED(status);
        free(left);
    }
    printf("%zu kills: %zu left the old file, %zu the new one (%zu more came too late)\n", kills,
           olds, news, too_late);
    ck_assert_uint_gt(olds, 0);
    /* Whatever was left behind does not stand in the way. */
    expect_run("$RINGFETTLE record job.json cross_ln P1=0.09", 0, NULL, NULL);
    expect_run("$RINGFETTLE check job.json", 0, "readings", NULL);
    expect_run("ls -A | grep -c new", 1, "0", NULL);
    free(old);
    free(new);
    leave_folder();
}
END_TEST

START_TEST(full_disk)
{
    enter_folder();
    ck_assert(mkdir("small", 0700) == 0);
    if (mount("tmpfs", "small", "tmpfs", 0, "size=256k") != 0) {
        fprintf(stderr, "SKIPPED: full_disk: no tmpfs may be mounted here: %s\n",
                strerror(errno));
        leave_folder();
        return;
    }
    char *old = long_job(100000);
    size_t refused = 0, done = 0;
    /* What else is on the disk leaves less and less room for the new file. */
    for (size_t other = 0; other <= 40; other++) {
        char line[256];
        put_file("small/job.json", old, strlen(old));
        sprintf(line, "head -c %zu /dev/zero > small/other 2>/dev/null; true", other * 4096);
        ck_assert_int_eq(system(line), 0);
        struct run left = run("$RINGFETTLE record small/job.json cross_ln P1=0.08");
        char *bytes = read_whole("small/job.json");
        if (left.status == 0) {
            done++;
            ck_assert_str_ne(bytes, old);
            ck_assert(strstr(bytes, "\"P1\": [0.07, 0.08]}}}\n") != NULL);
        } else {
            refused++;
            ck_assert_int_eq(left.status, 4);
            ck_assert_msg(strstr(left.err, "No space left on device") != NULL, "%s", left.err);
            ck_assert_str_eq(bytes, old);
        }
        ck_assert(access("small/.job.json.new", F_OK) != 0);
        free(bytes);
        run_finish(&left);
        unlink("small/other");
    }
    printf("disk filling up: %zu written, %zu refused with the old file whole\n", done, refused);
    ck_assert_uint_gt(done, 0);
    ck_assert_uint_gt(refused, 0);
    ck_assert(umount("small") == 0);
    free(old);
    leave_folder();
}
END_TEST

START_TEST(two_at_once)
{
    enter_folder();
    int file = open("small.json", O_RDWR);
    ck_assert(file >= 0 && flock(file, LOCK_EX) == 0);
    expect_run("$RINGFETTLE record small.json cross_ln P1=0.08", 2, NULL,
               "small.json: somebody else is writing this file");
    close(file);
    expect_run("$RINGFETTLE record small.json cross_ln P1=0.08", 0, NULL, NULL);
    /* Twenty at the same time: none lost, none half; those that came too late say so. */
    expect_run("for i in $(seq 20); do ($RINGFETTLE record small.json cross_ln P2=0.1 2>/dev/null; "
               "echo $? >rc.$i) & done; wait; "
               "done=$(cat rc.* | grep -c '^0$'); late=$(cat rc.* | grep -c '^2$'); "
               "test $((done + late)) = 20; test $done -ge 1; "
               "test $(grep -o '0\\.1[],]' small.json | wc -l) = $done && echo counted",
               0, "counted", NULL);
    leave_folder();
}
END_TEST

START_TEST(kept)
{
    enter_folder();
    ck_assert(mkdir("folder", 0700) == 0);
    expect_run("mv small.json folder; chmod 640 folder/small.json; ln -s folder/small.json job.json",
               0, NULL, NULL);
    expect_run("$RINGFETTLE record job.json opened P1", 0, NULL, NULL);
    expect_run("test -L job.json && stat -c %a folder/small.json", 0, "640", NULL);
    expect_run("grep -c '\"opened\": \\[\"P1\"\\]' folder/small.json", 0, "1", NULL);
    expect_run("ls -A folder", 0, "small.json", NULL);
    expect_run("$RINGFETTLE record /dev/null opened P1", 2, NULL, "found a device");
    expect_run("$RINGFETTLE record folder opened P1", 2, NULL, "found a folder");
    expect_run("$RINGFETTLE record nothing.json opened P1", 4, NULL, "nothing.json: cannot be read");
    leave_folder();
}
END_TEST

START_TEST(refused)
{
    static const struct {
        const char *words, *message;
    } cases[] = {
        {"cross_ln P9=0.4", "small.json: readings.cross_ln.P9: no such point"},
        {"cross_ln P1=100", "small.json: readings.cross_ln.P1[1]: found 100"},
        {"cross_ln P1=-0.1", "found -0.1"},
        {"cross_ln P1=0.4x", "found \"0.4x\"; needs ohms"},
        {"cross_ln P1=", "found nothing behind ="},
        {"cross_ln P1", "needs PLACE=READING"},
        {"cross_nl P1=0.4", "did you mean cross_ln?"},
        {"P1=0.4", "needs a set-up"},
        {"opened P9", "no such point"},
        {"opened in", "ends are at the board"},
        {"found joint", "found"},
        {"found joint run=P1,P3 conductor=N", "found.run"},
        {"found run=P1,P2", "needs the family"},
        {"found joint run=P1,P2 run=P1,P2", "found run twice"},
        {"--remove cross_le P1", "nothing read there"},
        {"--correct cross_le P1=0.4", "nothing read there"},
        {"--remove opened P1", "nothing of the kind"},
        {"--remove --correct cross_ln P1", "one of --correct and --remove"},
        {"cross_ln", "nothing to record"},
    };
    enter_folder();
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        char line[256];
        sprintf(line, "$RINGFETTLE record small.json %s", cases[i].words);
        expect_run(line, 2, NULL, cases[i].message);
        char *left = read_whole("small.json");
        ck_assert_str_eq(left, small_job);
        free(left);
    }
    leave_folder();
}
END_TEST

START_TEST(history)
{
    enter_folder();
    expect_run("$RINGFETTLE record --correct small.json cross_ln P2=0.09/0.10", 0, NULL, NULL);
    expect_run("$RINGFETTLE record small.json found joint run=P1,P2 conductor=N", 0, NULL, NULL);
    expect_run("$RINGFETTLE record small.json found none", 0, NULL, NULL);
    expect_run("$RINGFETTLE record --remove small.json found", 0, NULL, NULL);
    char *text = read_whole("small.json");
    cJSON *job = cJSON_Parse(text);
    const cJSON *entry = cJSON_GetObjectItem(job, "x_history")->child;
    ck_assert_double_eq(cJSON_GetObjectItem(entry, "was")->valuedouble, 0.07);
    ck_assert_str_eq(cJSON_GetObjectItem(entry, "place")->valuestring, "P2");
    ck_assert_uint_eq(strlen(cJSON_GetObjectItem(entry, "time")->valuestring), 20);
    entry = cJSON_GetObjectItem(entry->next, "found");
    ck_assert_str_eq(cJSON_GetObjectItem(entry, "family")->valuestring, "joint");
    ck_assert_int_eq(cJSON_GetArraySize(cJSON_GetObjectItem(job, "x_history")), 3);
    ck_assert(!cJSON_HasObjectItem(job, "found"));
    cJSON_Delete(job);
    free(text);
    leave_folder();
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("record");
    TCase *tests = tcase_create("record");
    tcase_set_timeout(tests, 280);
    tcase_add_test(tests, killed);
    tcase_add_test(tests, full_disk);
    tcase_add_test(tests, two_at_once);
    tcase_add_test(tests, kept);
    tcase_add_test(tests, refused);
    tcase_add_test(tests, history);
    suite_add_tcase(suite, tests);
    return run_suite(suite);
}
