/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Files that are no files, full disks, closed pipes: message, exit status, old files as they were. */
#include "program.h"

#include <check.h>
#include <errno.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/mount.h>

#define KITCHEN "$RINGFETTLE_SOURCE/scenarios/kitchen-neutral.json"

static void enter(void)
{
    enter_folder();
    ck_assert_int_eq(system("mkdir dir; mkfifo fifo; cp -r $RINGFETTLE_SOURCE/models models; "
                            "rm models/effort.json; mkfifo models/effort.json"),
                     0);
}

static const struct {
    const char *words;
    int status;
    const char *message;
} cases[] = {
    {"diagnose dir", 2, "dir: found a folder; needs a job file"},
    {"diagnose /dev/null", 2, "/dev/null: found a device"},
    {"diagnose nothing.json", 4, "nothing.json: cannot be read: No such file"},
    {"diagnose --models dir " KITCHEN, 4, "dir/conductor.json: cannot be opened"},
    {"diagnose --models models " KITCHEN, 2, "models/effort.json: found a device, pipe"},
    {"diagnose --page dir " KITCHEN, 4, "dir: cannot be opened for writing: Is a directory"},
    {"diagnose --page no/x.html " KITCHEN, 4, "no/x.html: cannot be opened for writing"},
    {"diagnose --page /dev/full " KITCHEN, 4, "/dev/full: cannot be written: No space left"},
    {"diagnose " KITCHEN " >/dev/full", 4, "standard output: cannot write: No space left"},
    {"expect dir", 2, "dir: found a folder"},
    {"convert --output dir " KITCHEN, 2, "dir: is there already"},
    {"record fifo opened P1", 2, "fifo: found a device, pipe or socket"},
    {"simulate dir", 2, "dir: found a folder"},
    {"answer dir look P1", 2, "dir: found a folder"},
};

START_TEST(no_files)
{
    char line[512];
    snprintf(line, sizeof line, "timeout 20 $RINGFETTLE %s", cases[_i].words);
    expect_run(line, cases[_i].status, NULL, cases[_i].message);
}
END_TEST

START_TEST(closed_pipe)
{
    expect_run("{ $RINGFETTLE diagnose --json " KITCHEN "; echo $? >&2; } | true", 0, NULL,
               "standard output: cannot write: Broken pipe\n4");
}
END_TEST

START_TEST(full_disk)
{
    if (mount("tmpfs", "dir", "tmpfs", 0, "size=64k") != 0) {
        fprintf(stderr, "SKIPPED: full_disk: no tmpfs may be mounted here: %s\n", strerror(errno));
        return;
    }
    ck_assert_int_eq(system("echo old >dir/page.html; head -c 60000 /dev/zero >dir/other; true"), 0);
    struct run run_full = run("$RINGFETTLE diagnose --page dir/page.html " KITCHEN);
    struct run left = run("cat dir/page.html; ls -A dir");
    ck_assert_int_eq(umount("dir"), 0);
    ck_assert_int_eq(run_full.status, 4);
    ck_assert_ptr_nonnull(strstr(run_full.err, "No space left on device"));
    ck_assert_str_eq(left.out, "old\nother\npage.html\n");
    run_finish(&run_full);
    run_finish(&left);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("files");
    TCase *tests = tcase_create("files");
    tcase_set_timeout(tests, 60);
    tcase_add_checked_fixture(tests, enter, leave_folder);
    tcase_add_loop_test(tests, no_files, 0, (int)(sizeof cases / sizeof cases[0]));
    tcase_add_test(tests, closed_pipe);
    tcase_add_test(tests, full_disk);
    suite_add_tcase(suite, tests);
    return run_suite(suite);
}
