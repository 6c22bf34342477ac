/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "cli/file.h"

#include "base/error.h"
#include "base/file.h"

#include <errno.h>
#include <stdint.h>
#include <stdio.h>
#include <string.h>
#include <sys/stat.h>

/* An old file stays whole until the new one is. */
static enum rf_status replace(const char *path, const struct text *content, struct rf_error *error)
{
    struct file_hold *hold = NULL;
    struct text old = {0};
    enum rf_status status = file_hold(path, SIZE_MAX, &hold, &old, error);
    if (status == RF_OK)
        status = file_replace(hold, content, error);
    file_release(hold);
    text_finish(&old);
    return status;
}

enum rf_status file_write(const char *path, const struct text *content, struct rf_error *error)
{
    if (content->failed)
        return fail_memory(error);
    struct stat about;
    if (stat(path, &about) == 0 && S_ISREG(about.st_mode))
        return replace(path, content, error);
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
