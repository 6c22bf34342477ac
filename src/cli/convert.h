/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef CLI_CONVERT_H
#define CLI_CONVERT_H

/* The two halves of `convert`: a job between its formats, and archives of a reading a row. */

#include "cli/command.h"
#include "job/sheet.h"

/* `--separator`, `--decimal`; 0 where not given. Complains and answers false. */
bool read_style(const struct invocation *invocation, struct sheet_style *style);

enum rf_class convert_long(const struct invocation *invocation, const struct sheet_style *style);

#endif
