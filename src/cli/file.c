/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "cli/file.h"

#include "base/error.h"

#include <errno.h>
#include <stdio.h>
#include <string.h>

enum { BLOCK = 16 * 1024 };

static enum rf_status read_stream(FILE *file, const char *name, size_t most, struct text *content,
                                  struct rf_error *error)
{
    char block[BLOCK];
    size_t n;
    errno = 0;
    while (!content->failed && (n = fread(block, 1, sizeof block, file)) > 0) {
        text_append(content, block, n);
        if (content->length > most)
            return fail(error, RF_LIMIT, "%s: found more than %zu MiB; needs less", name,
                        most / (1024 * 1024));
    }
    if (content->failed)
        return fail_memory(error);
    if (ferror(file))
        return fail(error, RF_IO, "%s: cannot be read: %s", name, strerror(errno));
    return RF_OK;
}

enum rf_status file_read(const char *path, size_t most, struct text *content,
                         struct rf_error *error)
{
    if (strcmp(path, "-") == 0)
        return read_stream(stdin, "standard input", most, content, error);
    FILE *file = fopen(path, "rb");
    if (file == NULL)
        return fail(error, RF_IO, "%s: cannot be opened: %s", path, strerror(errno));
    enum rf_status status = read_stream(file, path, most, content, error);
    fclose(file);
    return status;
}

enum rf_status file_write(const char *path, const struct text *content, struct rf_error *error)
{
    if (content->failed)
        return fail_memory(error);
    FILE *file = fopen(path, "wb");
    if (file == NULL)
        return fail(error, RF_IO, "%s: cannot be opened for writing: %s", path, strerror(errno));
    const char *bytes = content->bytes != NULL ? content->bytes : "";
    bool written = fwrite(bytes, 1, content->length, file) == content->length;
    int reason = errno;
    bool closed = fclose(file) == 0;
    if (!written || !closed)
        return fail(error, RF_IO, "%s: cannot be written: %s", path,
                    strerror(written ? errno : reason));
    return RF_OK;
}
