/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Streams of jobs: documents, archives, and what is neither. All jobs are invented. */
#include "job/job.h"

#include "../suite.h"

#include <check.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <sys/wait.h>
#include <unistd.h>

#define JOB(name)                                                                                  \
    "{\"format\": \"ringfettle-job/1\", \"job\": \"" name "\", "                                   \
    "\"ring\": {\"points\": [{\"id\": \"P1\"}]}, \"readings\": {\"cross_ln\": {\"P1\": 0.4}}}"
#define NAMELESS                                                                                   \
    "{\"format\": \"ringfettle-job/1\", "                                                          \
    "\"ring\": {\"points\": [{\"id\": \"P1\"}]}, \"readings\": {\"cross_ln\": {\"P1\": 0.4}}}"
#define SPREAD                                                                                     \
    "{\"format\": \"ringfettle-job/1\",\n \"ring\":\n{\"points\": [\n{\"id\": \"P1\"}]},\n\n"      \
    " \"readings\": {\"cross_ln\": {\"P1\": 0.4}}}\n"
#define MARK "\xEF\xBB\xBF"

static char folder[] = "/tmp/ringfettle-stream-XXXXXX";
static char path[64], fifo[64];

static void make_folder(void)
{
    strcpy(folder + strlen(folder) - 6, "XXXXXX");
    ck_assert_ptr_nonnull(mkdtemp(folder));
    snprintf(path, sizeof path, "%s/jobs", folder);
    snprintf(fifo, sizeof fifo, "%s/fifo", folder);
}

static void remove_folder(void)
{
    unlink(path);
    unlink(fifo);
    rmdir(folder);
}

static void write_file(const char *bytes, size_t length)
{
    FILE *file = fopen(path, "wb");
    ck_assert_ptr_nonnull(file);
    ck_assert_uint_eq(fwrite(bytes, 1, length, file), length);
    ck_assert_int_eq(fclose(file), 0);
}

/* Reads the stream to its end and writes what it gave as lines: a job's name, or the message,
 * both without the folder. */
static void read_all(const char *from, char *out, size_t size)
{
    struct rf_job_reader *reader;
    struct rf_error error = {0};
    struct rf_job *job;
    size_t used = 0;
    out[0] = '\0';
    ck_assert_int_eq(rf_job_reader_open(from, &reader, &error), RF_OK);
    for (int i = 0; i < 20; i++) {
        enum rf_status status = rf_job_reader_next(reader, &job, &error);
        if (status == RF_OK && job == NULL)
            break;
        const char *said = status == RF_OK ? rf_job_name(job) : error.text;
        if (strncmp(said, folder, strlen(folder)) == 0)
            said += strlen(folder) + 1;
        used += (size_t)snprintf(out + used, size - used, "%s\n", said);
        ck_assert_uint_lt(used, size);
        ck_assert(status == RF_OK || job == NULL);
        rf_job_destroy(job);
    }
    rf_job_reader_close(reader);
}

static const struct {
    const char *bytes, *said;
} rows[] = {
    /* documents */
    {JOB("a"), "a\n"},
    {JOB("a") "\n", "a\n"},
    {"\r\n \n" JOB("a") "\r\n\r\n", "a\n"},
    {NAMELESS, "jobs\n"},
    {SPREAD, "jobs\n"},
    {MARK SPREAD, "jobs\n"},
    {"{\n" "\"format\": \"ringfettle-job/1\",\n \"ring\": 7 8}",
     "jobs:3:12: found \"8\"; needs a comma or the closing bracket\n"},
    {"\n\n{\n  nothing\n}\n", "jobs:4:3: found \"nothing\"; needs a key in double quotes or }\n"},
    {MARK "\n{\n 1", "jobs:3:2: found \"1\"; needs a key in double quotes or }\n"},
    {SPREAD "more", "jobs:7:1: found \"more\"; needs nothing more behind the closing bracket\n"},
    {"", "jobs: found nothing; needs a job\n"},
    {" \n\t\r\n", "jobs: found nothing; needs a job\n"},
    {MARK, "jobs: found nothing; needs a job\n"},
    {"{}", "jobs: format: missing; needs \"ringfettle-job/1\"\n"},
    /* archives */
    {JOB("a") "\n" JOB("b") "\n", "a\nb\n"},
    {JOB("a") "\r\n" JOB("b"), "a\nb\n"},
    {MARK JOB("a") "\n\n  \n\r\n" JOB("b") "\n\n", "a\nb\n"},
    {NAMELESS "\n\n" NAMELESS, "jobs:1\njobs:3\n"},
    {JOB("a") "\n{\"format\": 1,\n" JOB("c") "\n",
     "a\njobs:2:14: found the text's end; needs a key in double quotes\nc\n"},
    {JOB("a") "\n\nnothing\n{}\n" JOB("c"),
     "a\njobs:3:1: found \"nothing\"; needs a value\n"
     "jobs:4: format: missing; needs \"ringfettle-job/1\"\nc\n"},
    {JOB("a") " x\n" JOB("b"),
     "jobs:1:119: found \"x\"; needs nothing more behind the closing bracket\nb\n"},
    {"{\"format\": \"ringf\n" JOB("b") "\n" JOB("c"),
     "jobs:1:18: found the text's end; needs the closing double quote\nb\nc\n"},
    {"# our archive\n" JOB("b"), "jobs:1:1: found \"#\"; needs a value\nb\n"},
    {JOB("a") "\n\"\xFF\"\n" JOB("c"),
     "a\njobs:2:2: found byte 0xFF, which is not UTF-8; needs text saved as UTF-8\nc\n"},
};

START_TEST(reads_documents_and_archives)
{
    char said[2000];
    write_file(rows[_i].bytes, strlen(rows[_i].bytes));
    read_all(path, said, sizeof said);
    ck_assert_str_eq(said, rows[_i].said);
}
END_TEST

START_TEST(reads_nul_bytes_as_a_refusal)
{
    static const char bytes[] = JOB("a") "\n\0\n" JOB("c");
    char said[2000];
    write_file(bytes, sizeof bytes - 1);
    read_all(path, said, sizeof said);
    ck_assert_str_eq(said, "a\njobs:2:1: found a NUL byte; needs a value\nc\n");
}
END_TEST

static void write_pipe(int file, const char *text)
{
    /* In pieces, the first shorter than a byte order mark. */
    for (size_t i = 0, piece = 1, n = strlen(text); i < n; i += piece, piece = 90) {
        if (piece > n - i)
            piece = n - i;
        if (write(file, text + i, piece) != (ssize_t)piece)
            _exit(1);
    }
    close(file);
    _exit(0);
}

START_TEST(reads_a_fifo)
{
    char said[2000];
    ck_assert_int_eq(mkfifo(fifo, 0600), 0);
    pid_t writer = fork();
    ck_assert_int_ge(writer, 0);
    if (writer == 0) {
        FILE *file = fopen(fifo, "wb");
        write_pipe(file != NULL ? fileno(file) : -1, JOB("a") "\n" NAMELESS);
    }
    read_all(fifo, said, sizeof said);
    ck_assert_str_eq(said, "a\nfifo:2\n");
    waitpid(writer, NULL, 0);
}
END_TEST

START_TEST(reads_standard_input)
{
    char said[2000];
    write_file(NAMELESS, strlen(NAMELESS));
    ck_assert_ptr_nonnull(freopen(path, "rb", stdin));
    read_all("-", said, sizeof said);
    ck_assert_str_eq(said, "standard input\n");
}
END_TEST

/* One line too long, and the job behind it. */
START_TEST(refuses_a_line_too_long)
{
    char said[2000];
    FILE *file = fopen(path, "wb");
    ck_assert_ptr_nonnull(file);
    fputs(JOB("a") "\n", file);
    for (size_t i = 0; i <= JOB_MAX_BYTES; i++)
        putc(' ', file);
    fputs("\n" JOB("c"), file);
    fclose(file);
    read_all(path, said, sizeof said);
    ck_assert_str_eq(said, "a\njobs:2: found more than 16 MiB; needs at most 16 MiB a job\nc\n");
}
END_TEST

START_TEST(refuses_a_document_too_long)
{
    char said[2000];
    FILE *file = fopen(path, "wb");
    ck_assert_ptr_nonnull(file);
    fputs("{\n", file);
    for (size_t i = 0; i <= JOB_MAX_BYTES / 8; i++)
        fputs("\"x_a\":1,\n", file);
    fclose(file);
    read_all(path, said, sizeof said);
    ck_assert_str_eq(said, "jobs: found more than 16 MiB; needs at most 16 MiB a job\n");
}
END_TEST

static void check_open(const char *what, enum rf_status status, const char *message)
{
    struct rf_error error = {0};
    struct rf_job_reader *reader;
    ck_assert_int_eq(rf_job_reader_open(what, &reader, &error), status);
    ck_assert_ptr_null(reader);
    ck_assert_str_eq(error.text, message);
}

START_TEST(refuses_what_is_no_file)
{
    char message[200];
    snprintf(message, sizeof message, "%s: found a folder; needs a job file", folder);
    check_open(folder, RF_REFUSED, message);
    check_open("/dev/null", RF_REFUSED, "/dev/null: found a device or socket; needs a job file");
    snprintf(message, sizeof message, "%s: cannot be read: No such file or directory", path);
    check_open(path, RF_IO, message);
    rf_job_reader_close(NULL);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("job stream");
    TCase *all = tcase_create("job stream");
    tcase_set_timeout(all, 60);
    tcase_add_checked_fixture(all, make_folder, remove_folder);
    tcase_add_loop_test(all, reads_documents_and_archives, 0, sizeof rows / sizeof rows[0]);
    tcase_add_test(all, reads_nul_bytes_as_a_refusal);
    tcase_add_test(all, reads_a_fifo);
    tcase_add_test(all, reads_standard_input);
    tcase_add_test(all, refuses_a_line_too_long);
    tcase_add_test(all, refuses_a_document_too_long);
    tcase_add_test(all, refuses_what_is_no_file);
    suite_add_tcase(suite, all);

    return run_suite(suite);
}
