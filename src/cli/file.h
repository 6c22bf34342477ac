/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef CLI_FILE_H
#define CLI_FILE_H

#include "base/file.h" /* file_read */

/* Writes a file, in place of what is there. RF_IO, RF_MEMORY (a text that failed). */
enum rf_status file_write(const char *path, const struct text *content, struct rf_error *error);

#endif
