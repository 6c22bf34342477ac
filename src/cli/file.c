/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "cli/file.h"

#include "base/error.h"

#include <errno.h>
#include <stdio.h>
#include <string.h>

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
