/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef TESTS_CLI_PROGRAM_H
#define TESTS_CLI_PROGRAM_H

/*
 * Runs the built program as a shell would, so that a test reads like what one types. $RINGFETTLE is
 * the program, $RINGFETTLE_SOURCE the project; both must be set. The shell stands in a folder of the
 * test's own, which `leave_folder` removes.
 */

#include "../suite.h"

#include <check.h>
#include <cjson/cJSON.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/wait.h>
#include <unistd.h>

/* What one run left: free with `run_finish`. */
struct run {
    int status;
    char *out, *err;
};

static inline char *read_whole(const char *path)
{
    FILE *file = fopen(path, "rb");
    ck_assert_msg(file != NULL, "%s", path);
    ck_assert(fseek(file, 0, SEEK_END) == 0);
    long length = ftell(file);
    ck_assert(length >= 0);
    rewind(file);
    char *bytes = calloc((size_t)length + 1, 1);
    ck_assert(bytes != NULL);
    ck_assert_uint_eq(fread(bytes, 1, (size_t)length, file), (size_t)length);
    fclose(file);
    return bytes;
}

static inline void write_whole(const char *path, const char *content)
{
    FILE *file = fopen(path, "wb");
    ck_assert_msg(file != NULL, "%s", path);
    ck_assert(fputs(content, file) >= 0);
    ck_assert(fclose(file) == 0);
}

/* A shell's line; what it says of standard output or error itself goes before ours. */
static inline struct run run(const char *line)
{
    static const char frame[] = "{ %s\n} >out.txt 2>err.txt </dev/null";
    ck_assert_msg(getenv("RINGFETTLE") != NULL, "RINGFETTLE names the program");
    char *command = calloc(strlen(line) + sizeof frame, 1);
    ck_assert(command != NULL);
    sprintf(command, frame, line);
    int status = system(command);
    free(command);
    ck_assert_msg(WIFEXITED(status), "%s: ended by a signal", line);
    return (struct run){
        .status = WEXITSTATUS(status),
        .out = read_whole("out.txt"),
        .err = read_whole("err.txt"),
    };
}

static inline void run_finish(struct run *run)
{
    free(run->out);
    free(run->err);
}

static inline void expect_words(const char *line, const char *where, const char *text,
                                const char *words)
{
    ck_assert_msg(strstr(text, words) != NULL, "%s: no \"%s\" on %s:\n%s", line, words, where,
                  text);
}

/* Runs, and wants that status, and those words in what it says (NULL: nothing at all). */
static inline void expect_run(const char *line, int status, const char *out, const char *err)
{
    struct run left = run(line);
    ck_assert_msg(left.status == status, "%s: status %d, not %d:\n%s%s", line, left.status, status,
                  left.out, left.err);
    if (out == NULL)
        ck_assert_msg(left.out[0] == '\0', "%s: said\n%s", line, left.out);
    else
        expect_words(line, "standard output", left.out, out);
    if (err == NULL)
        ck_assert_msg(left.err[0] == '\0', "%s: complained\n%s", line, left.err);
    else
        expect_words(line, "standard error", left.err, err);
    run_finish(&left);
}

/* A small job without defect; invented. */
static const char small_job[] =
    "{\"format\": \"ringfettle-job/1\", \"job\": \"small\", \"ring\": {\"points\": ["
    "{\"id\": \"P1\", \"run_m\": 5}, {\"id\": \"P2\", \"run_m\": 5}, {\"id\": \"P3\", \"run_m\": "
    "5}],"
    " \"last_run_m\": 5}, \"readings\": {\"end_to_end\": {\"l\": 0.15, \"n\": 0.15, \"e\": 0.24},"
    " \"cross_ln\": {\"board\": 0.07, \"P1\": 0.08, \"P2\": 0.07, \"P3\": 0.07}}}\n";

static char folder[] = "/tmp/ringfettle-test-XXXXXX";

static inline void enter_folder(void)
{
    strcpy(folder + sizeof folder - 7, "XXXXXX");
    ck_assert(mkdtemp(folder) != NULL);
    ck_assert(chdir(folder) == 0);
    write_whole("small.json", small_job);
}

static inline void leave_folder(void)
{
    char command[sizeof folder + 16];
    ck_assert(chdir("/") == 0);
    sprintf(command, "rm -r %s", folder);
    ck_assert_int_eq(system(command), 0);
}

#endif
