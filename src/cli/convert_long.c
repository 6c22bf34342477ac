/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "cli/convert.h"

#include "base/error.h"
#include "base/file.h"
#include "job/job_write.h"
#include "job/long_table.h"

#include <errno.h>
#include <fcntl.h>
#include <stdio.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

enum { NAMES_ROOM = 2048 };

struct work {
    const char *rejects_path; /* NULL: bad rows are only named */
    FILE *rejects;            /* made for the first of them */
    size_t n_jobs, n_bad;
};

static void complain_bad(void *context, const struct rf_error *error)
{
    struct work *work = context;
    work->n_bad++;
    complain("%s", error->text);
}

static bool keep_reject(void *context, const char *row, size_t length)
{
    struct work *work = context;
    if (work->rejects_path == NULL)
        return true;
    if (work->rejects == NULL) {
        int fd = open(work->rejects_path, O_WRONLY | O_CREAT | O_EXCL | O_CLOEXEC, 0666);
        work->rejects = fd >= 0 ? fdopen(fd, "w") : NULL;
        if (work->rejects == NULL) {
            complain("%s: cannot be made: %s", work->rejects_path, strerror(errno));
            return false;
        }
    }
    return fwrite(row, 1, length, work->rejects) == length;
}

static enum rf_status finish_rejects(struct work *work, enum rf_status status,
                                     struct rf_error *error)
{
    if (work->rejects == NULL)
        return status;
    bool good = fflush(work->rejects) == 0 && fsync(fileno(work->rejects)) == 0;
    good &= fclose(work->rejects) == 0;
    if (status == RF_OK && !good)
        return fail(error, RF_IO, "%s: cannot be written", work->rejects_path);
    return status;
}

/* "job=Ref,value=Ohms" into names; `room` holds the words they point at. */
static bool read_columns(const struct invocation *invocation, const char *list, char *room,
                         const char *names[N_LONG_COLUMNS])
{
    if (list == NULL)
        return true;
    if (strlen(list) >= NAMES_ROOM) {
        complain_usage(invocation->command, "--columns: found too long a list");
        return false;
    }
    memcpy(room, list, strlen(list) + 1);
    for (char *rest = NULL, *item = strtok_r(room, ",", &rest); item != NULL;
         item = strtok_r(NULL, ",", &rest)) {
        char *equals = strchr(item, '=');
        size_t which = 0;
        if (equals != NULL)
            *equals = '\0';
        while (which < N_LONG_COLUMNS && strcmp(long_columns[which], item) != 0)
            which++;
        if (equals == NULL || equals[1] == '\0' || which == N_LONG_COLUMNS) {
            const char *nearest = text_nearest(item, long_columns, N_LONG_COLUMNS);
            if (which == N_LONG_COLUMNS && nearest != NULL)
                complain_usage(invocation->command, "--columns: found %s; did you mean %s?", item,
                               nearest);
            else
                complain_usage(invocation->command,
                               "--columns: found %s; needs KEY=NAME, such as value=Ohms", item);
            return false;
        }
        names[which] = equals + 1;
    }
    return true;
}

static enum rf_status convert(FILE *file, const char *source, const struct long_options *options,
                              struct work *work, struct rf_error *error)
{
    struct long_reader *reader = NULL;
    struct rf_job *job = NULL;
    enum rf_status status = long_reader_open(file, source, options, &reader, error);
    while (status == RF_OK) {
        struct text line = {0};
        status = long_reader_next(reader, &job, error);
        if (status != RF_OK || job == NULL)
            break;
        work->n_jobs++;
        status = job_write_line(job, &line, error);
        text_add(&line, "\n");
        if (status == RF_OK)
            status = put(&line, error);
        text_finish(&line);
        rf_job_destroy(job);
    }
    long_reader_close(reader);
    return status;
}

static enum rf_status open_table(const char *path, FILE **file, struct rf_error *error)
{
    struct stat about;
    if (strcmp(path, "-") == 0) {
        *file = stdin;
        return RF_OK;
    }
    if (stat(path, &about) == 0 && !S_ISREG(about.st_mode) && !S_ISFIFO(about.st_mode))
        return fail(error, RF_REFUSED, "%s: found no file; needs a table", path);
    *file = fopen(path, "r");
    return *file != NULL ? RF_OK
                         : fail(error, RF_IO, "%s: cannot be read: %s", path, strerror(errno));
}

enum rf_class convert_long(const struct invocation *invocation, const struct sheet_style *style)
{
    char room[NAMES_ROOM];
    struct rf_error error;
    FILE *file = NULL;
    const char *path = invocation->operands[0];
    struct work work = {.rejects_path = option_value(invocation, "rejects")};
    struct long_options options = {.separator = style->separator,
                                   .decimal = style->decimal,
                                   .context = &work,
                                   .complain = complain_bad,
                                   .reject = keep_reject};
    if (option_value(invocation, "output") != NULL)
        return complain_usage(invocation->command, "ndjson goes to standard output");
    if (!read_columns(invocation, option_value(invocation, "columns"), room, options.names))
        return RF_CLASS_INPUT;
    if (work.rejects_path != NULL && access(work.rejects_path, F_OK) == 0)
        return complain_usage(invocation->command, "--rejects: %s is there already",
                              work.rejects_path);
    enum rf_status status = open_table(path, &file, &error);
    if (status == RF_OK)
        status = convert(file, file == stdin ? "standard input" : path, &options, &work, &error);
    if (file != NULL && file != stdin)
        fclose(file);
    status = finish_rejects(&work, status, &error);
    if (status != RF_OK)
        return complain_of(&error);
    return work.n_bad > 0 ? RF_CLASS_INPUT : RF_CLASS_DONE;
}
