/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef CLI_FILE_H
#define CLI_FILE_H

#include "base/text.h"

/* A whole file, "-" standard input, up to `most` bytes. The caller finishes `content`, whatever
 * the answer. RF_IO, RF_LIMIT, RF_MEMORY. */
enum rf_status file_read(const char *path, size_t most, struct text *content,
                         struct rf_error *error);

/* Writes a file, in place of what is there. RF_IO, RF_MEMORY (a text that failed). */
enum rf_status file_write(const char *path, const struct text *content, struct rf_error *error);

#endif
