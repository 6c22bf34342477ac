/* SPDX-License-Identifier: GPL-3.0-or-later */

/*
 * A stream of jobs out of one file. What the file is shows in its first line that is not blank:
 * first the text format, then whether it holds one job or one a line.
 */

#include "base/error.h"
#include "base/memory.h"
#include "base/text.h"
#include "job/job_parse.h"
#include "job/sheet.h"

#include <errno.h>
#include <fcntl.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

/* A text format of jobs. To add one: a row in `formats`, before JSON. */
struct format {
    const char *name;
    /* Whether a file that begins with this line (no byte order mark, not blank) is of the format.
     * NULL: whatever no other recognises. */
    bool (*recognises)(const char *line, size_t length);
    /* Whether a line may be a whole job; if not, the file is one job. */
    bool line_may_be_job;
    enum rf_status (*parse)(const char *text, size_t length, const char *source,
                            enum json_lines lines, struct rf_job **job, struct rf_error *error);
};

static const struct format formats[] = {
    {.name = "sheet", .recognises = sheet_first_line, .parse = sheet_job_parse},
    {.name = "JSON", .line_may_be_job = true, .parse = job_parse},
};

/* One line as read, without its end. */
struct line {
    struct text text;
    size_t number; /* in the file, from 1; 0: there is none */
    bool too_long; /* beyond JOB_MAX_BYTES; `text` holds only its beginning */
};

enum { BLOCK = 64 * 1024 };

struct rf_job_reader {
    char *path; /* as messages name it */
    int file;   /* −1: none */
    bool own_file;
    const struct format *format; /* NULL: nothing read yet */
    bool finished;
    struct line line, ahead;
    size_t lines_read;
    uint64_t bytes;  /* read from the file */
    size_t from, to; /* of the block, what is not used yet */
    char block[BLOCK];
};

/* --- bytes and lines --- */

/* Fills the block; at the end of the file it stays empty. */
static enum rf_status fill(struct rf_job_reader *reader, struct rf_error *error)
{
    ssize_t n;
    if (reader->from < reader->to)
        return RF_OK;
    do
        n = read(reader->file, reader->block, BLOCK);
    while (n < 0 && errno == EINTR);
    reader->from = 0;
    reader->to = n > 0 ? (size_t)n : 0;
    reader->bytes += reader->to;
    if (n < 0)
        return fail(error, RF_IO, "%s: cannot be read: %s", reader->path, strerror(errno));
    return RF_OK;
}

/* The next line of the file; line->number is 0 behind the last. */
static enum rf_status read_line(struct rf_job_reader *reader, struct line *line,
                                struct rf_error *error)
{
    bool any = false;
    text_clear(&line->text);
    line->too_long = false;
    line->number = 0;
    for (;;) {
        enum rf_status status = fill(reader, error);
        if (status != RF_OK)
            return status;
        size_t left = reader->to - reader->from;
        if (left == 0)
            break;
        any = true;
        const char *start = reader->block + reader->from;
        const char *end = memchr(start, '\n', left);
        size_t length = end != NULL ? (size_t)(end - start) : left;
        if (length > JOB_MAX_BYTES - line->text.length)
            line->too_long = true;
        if (!line->too_long)
            text_append(&line->text, start, length);
        reader->from += end != NULL ? length + 1 : length;
        if (end != NULL)
            break;
    }
    if (any)
        line->number = ++reader->lines_read;
    if (line->text.failed) {
        text_finish(&line->text); /* the next line starts afresh */
        return fail_memory(error);
    }
    return RF_OK;
}

static bool is_blank(const struct line *line)
{
    for (size_t i = 0; i < line->text.length; i++)
        if (strchr(" \t\r", line->text.bytes[i]) == NULL || line->text.bytes[i] == '\0')
            return false;
    return !line->too_long;
}

/* The next line that is not blank: the one read ahead, if there is one. */
static enum rf_status next_line(struct rf_job_reader *reader, struct line *line,
                                struct rf_error *error)
{
    if (reader->ahead.number > 0 && line != &reader->ahead) {
        struct line last = *line;
        *line = reader->ahead;
        reader->ahead = last;
        reader->ahead.number = 0;
        return RF_OK;
    }
    enum rf_status status;
    do
        status = read_line(reader, line, error);
    while (status == RF_OK && line->number > 0 && is_blank(line));
    return status;
}

/* --- what the file is --- */

/* Only the file's first bytes can be a byte order mark. */
static enum rf_status skip_byte_order_mark(struct rf_job_reader *reader, struct rf_error *error)
{
    static const char mark[] = "\xEF\xBB\xBF";
    size_t got = 0;
    /* A pipe may hand the three bytes over one by one. */
    while (got < sizeof mark - 1) {
        ssize_t n = read(reader->file, reader->block + got, BLOCK - got);
        if (n < 0 && errno == EINTR)
            continue;
        if (n < 0)
            return fail(error, RF_IO, "%s: cannot be read: %s", reader->path, strerror(errno));
        if (n == 0)
            break;
        got += (size_t)n;
    }
    reader->to = got;
    reader->bytes += got;
    reader->from = got >= sizeof mark - 1 && memcmp(reader->block, mark, sizeof mark - 1) == 0
                       ? sizeof mark - 1
                       : 0;
    return RF_OK;
}

static const struct format *recognise(const struct line *line)
{
    enum { N_FORMATS = sizeof formats / sizeof formats[0] };
    for (size_t i = 0; i < N_FORMATS; i++)
        if (formats[i].recognises == NULL ||
            formats[i].recognises(line->text.bytes, line->text.length))
            return &formats[i];
    return &formats[N_FORMATS - 1];
}

/*
 * Whether the file is one job a line, from its first line and the one read ahead. It is if the
 * first is a whole JSON value and something follows. It is, too, if the first is broken, the
 * second begins an object, and no JSON text could go on like that: so a broken first line does
 * not take the rest of an archive with it.
 */
static bool is_one_a_line(struct rf_job_reader *reader, struct rf_error *error,
                          enum rf_status *status)
{
    struct text *first = &reader->line.text;
    const struct text *second = &reader->ahead.text;
    bool complete;
    *status = RF_OK;
    if (reader->line.too_long)
        return true;
    if (reader->ahead.number == 0)
        return false;
    json_scan(first->bytes, first->length, &complete);
    if (complete)
        return true;
    if (reader->ahead.too_long || second->bytes[0] != '{')
        return false;

    size_t length = first->length;
    text_add(first, "\n{");
    if (first->failed) {
        *status = fail_memory(error);
        return false;
    }
    bool goes_on = json_scan(first->bytes, first->length, NULL) == first->length;
    first->length = length;
    first->bytes[length] = '\0';
    return !goes_on;
}

/* Puts the whole file into one text; empty lines stand for blank ones passed over, so that
 * messages name the right line. */
static enum rf_status read_document(struct rf_job_reader *reader, struct text *document,
                                    struct rf_error *error)
{
    size_t line = 1;
    struct line *next = &reader->line;
    enum rf_status status = RF_OK;
    while (status == RF_OK && next->number > 0) {
        size_t gap = next->number - line;
        if (next->too_long || document->length + gap + next->text.length > JOB_MAX_BYTES)
            return fail(error, RF_LIMIT, "%s: found more than 16 MiB; needs at most 16 MiB a job",
                        reader->path);
        for (; line < next->number; line++)
            text_add(document, "\n");
        text_append(document, next->text.bytes, next->text.length);
        if (document->failed)
            return fail_memory(error);
        /* Blank lines stay as they are: they may stand inside a sheet's quotes. */
        status = reader->ahead.number > 0 ? next_line(reader, next, error)
                                          : read_line(reader, next, error);
    }
    return status;
}

static enum rf_status next_in_document(struct rf_job_reader *reader, struct rf_job **job,
                                       struct rf_error *error)
{
    struct text document = {0};
    reader->finished = true;
    enum rf_status status = read_document(reader, &document, error);
    if (status == RF_OK)
        status = reader->format->parse(document.bytes, document.length, reader->path, JSON_DOCUMENT,
                                       job, error);
    text_finish(&document);
    return status;
}

/* The job of the line at hand. */
static enum rf_status parse_line(struct rf_job_reader *reader, struct rf_job **job,
                                 struct rf_error *error)
{
    struct text source = {0};
    enum rf_status status;
    text_addf(&source, "%s:%zu", reader->path, reader->line.number);
    if (source.failed)
        status = fail_memory(error);
    else if (reader->line.too_long)
        status = fail(error, RF_LIMIT, "%s: found more than 16 MiB; needs at most 16 MiB a job",
                      source.bytes);
    else
        status = reader->format->parse(reader->line.text.bytes, reader->line.text.length,
                                       source.bytes, JSON_ONE_LINE, job, error);
    text_finish(&source);
    return status;
}

/* The first job, and with it what the file is. */
static enum rf_status begin(struct rf_job_reader *reader, struct rf_job **job,
                            struct rf_error *error)
{
    bool one_a_line = false;
    enum rf_status status = skip_byte_order_mark(reader, error);
    if (status == RF_OK)
        status = next_line(reader, &reader->line, error);
    if (status == RF_OK && reader->line.number == 0)
        status = fail(error, RF_SYNTAX, "%s: found nothing; needs a job", reader->path);
    if (status != RF_OK) {
        reader->finished = true;
        return status;
    }

    reader->format = recognise(&reader->line);
    if (reader->format->line_may_be_job) {
        status = next_line(reader, &reader->ahead, error);
        if (status == RF_OK)
            one_a_line = is_one_a_line(reader, error, &status);
    }
    if (status != RF_OK) {
        reader->finished = true;
        return status;
    }
    return one_a_line ? parse_line(reader, job, error) : next_in_document(reader, job, error);
}

/* --- the public side --- */

/* Refuses what is no file of jobs before it is opened: opening a device can do things. */
static enum rf_status check_path(const char *path, struct rf_error *error)
{
    struct stat about;
    if (stat(path, &about) != 0)
        return fail(error, RF_IO, "%s: cannot be read: %s", path, strerror(errno));
    if (S_ISDIR(about.st_mode))
        return fail(error, RF_REFUSED, "%s: found a folder; needs a job file", path);
    if (!S_ISREG(about.st_mode) && !S_ISFIFO(about.st_mode))
        return fail(error, RF_REFUSED, "%s: found a device or socket; needs a job file", path);
    return RF_OK;
}

enum rf_status rf_job_reader_open(const char *path, struct rf_job_reader **reader,
                                  struct rf_error *error)
{
    bool standard_input = strcmp(path, "-") == 0;
    *reader = NULL;
    enum rf_status status = standard_input ? RF_OK : check_path(path, error);
    if (status != RF_OK)
        return status;

    struct rf_job_reader *made = NEW(struct rf_job_reader);
    if (made == NULL)
        return fail_memory(error);
    made->path = text_duplicate(standard_input ? "standard input" : path);
    made->own_file = !standard_input;
    made->file = standard_input ? STDIN_FILENO : open(path, O_RDONLY | O_CLOEXEC | O_NOCTTY);
    if (made->path == NULL)
        status = fail_memory(error);
    else if (made->file < 0)
        status = fail(error, RF_IO, "%s: cannot be read: %s", path, strerror(errno));
    if (status == RF_OK)
        *reader = made;
    else
        rf_job_reader_close(made);
    return status;
}

enum rf_status rf_job_reader_next(struct rf_job_reader *reader, struct rf_job **job,
                                  struct rf_error *error)
{
    *job = NULL;
    if (reader->finished)
        return RF_OK;
    if (reader->format == NULL)
        return begin(reader, job, error);

    enum rf_status status = next_line(reader, &reader->line, error);
    if (status == RF_OK && reader->line.number > 0)
        return parse_line(reader, job, error);
    if (status != RF_MEMORY)
        reader->finished = true;
    return status;
}

uint64_t job_reader_bytes(const struct rf_job_reader *reader)
{
    return reader->bytes - (reader->to - reader->from);
}

void rf_job_reader_close(struct rf_job_reader *reader)
{
    if (reader == NULL)
        return;
    if (reader->own_file && reader->file >= 0)
        close(reader->file);
    text_finish(&reader->line.text);
    text_finish(&reader->ahead.text);
    free(reader->path);
    free(reader);
}
