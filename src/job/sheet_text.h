/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef JOB_SHEET_TEXT_H
#define JOB_SHEET_TEXT_H

/* How texts and values of a user's own stand in cells, and back. */

#include "base/text.h"

#include <cjson/cJSON.h>
#include <stdbool.h>

/* A text as it stands; one that begins with a quote and is a JSON string is that string. NULL:
 * memory is short. */
cJSON *sheet_text_value(const char *cell);
void sheet_add_text(const char *string, struct text *cell);

/* A value under a key that begins x_: what a JSON text says, a number in the sheet's decimal
 * mark, or else the cell's text. */
cJSON *sheet_private_value(const char *cell, char decimal);
void sheet_add_private(const cJSON *value, char decimal, struct text *cell);

/* A number, shortest digits that read back the same. */
void sheet_add_number(double number, char decimal, struct text *cell);

#endif
