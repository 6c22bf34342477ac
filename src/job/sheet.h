/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef JOB_SHEET_H
#define JOB_SHEET_H

/*
 * A job as a sheet: text a person writes in an editor or a spreadsheet. ringfettle-sheet(5) has
 * every rule. A sheet is read into the document that the same job's JSON would give, so that one
 * reader checks both; an origin beside it lets that reader's messages name rows and columns.
 */

#include "base/json.h"
#include "base/text.h"

#include <ringfettle/job.h>

#include <stdbool.h>
#include <stddef.h>

struct sheet_style {
    char separator; /* ',' ';' or '\t' */
    char decimal;   /* '.' or ',' */
};

/* Whether a file that begins with this line, which is not blank, is a sheet: a word, or nothing,
 * and a separator. No JSON text begins so. */
bool sheet_first_line(const char *line, size_t length);

/*
 * Reads a sheet. On RF_OK the caller deletes *document (cJSON_Delete) and destroys *origin
 * (sheet_origin_destroy), which must outlive the messages about it; else both are NULL. What a
 * cell says is not checked here beyond what it takes to read it. RF_SYNTAX, RF_REFUSED, RF_MEMORY.
 */
enum rf_status sheet_parse(const char *bytes, size_t length, const char *source, cJSON **document,
                           struct json_origin **origin, struct rf_error *error);
void sheet_origin_destroy(struct json_origin *origin); /* takes NULL */

/* A job out of a sheet, as rf_job_parse; `lines` is for the stream's table of formats, and unused. */
enum rf_status sheet_job_parse(const char *bytes, size_t length, const char *source,
                               enum json_lines lines, struct rf_job **job, struct rf_error *error);

/*
 * Appends the document of a job (one that the job reader accepts, or has no readings yet) as a
 * sheet. `columns` (n of them, indices of set-ups) are written even if nothing is read there yet.
 */
enum rf_status sheet_write(const cJSON *document, const struct sheet_style *style,
                           const size_t columns[], size_t n, struct text *out,
                           struct rf_error *error);

#endif
