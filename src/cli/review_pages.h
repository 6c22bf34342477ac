/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef CLI_REVIEW_PAGES_H
#define CLI_REVIEW_PAGES_H

#include "cli/command.h"
#include "review/tally.h"

/* Writes the pages `review --page DIR` asks for: the jobs of the operands are read once more, those
 * among the worst diagnosed again. RF_IO, RF_NUMERICAL, RF_MEMORY. */
enum rf_status write_review_pages(const struct invocation *invocation,
                                  const struct rf_models *models, const struct rf_review *review,
                                  struct rf_error *error);

#endif
