/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef REVIEW_INPUT_H
#define REVIEW_INPUT_H

/*
 * The jobs of an archive one after another: files, folders searched through (entries in the order
 * of their bytes, whatever the locale), "-". Memory is one job's, and the names in the folders
 * that are open. In a folder, files are read whose names end in .json, .ndjson, .jsonl, .csv or
 * .tsv and do not begin with a dot; links to folders are not followed.
 */

#include <ringfettle/job.h>

#include <stdint.h>

struct review_input;

/* `paths` must outlive the input. On RF_OK the caller closes it. RF_MEMORY. */
enum rf_status review_input_open(char *const paths[], size_t n, struct review_input **input,
                                 struct rf_error *error);
void review_input_close(struct review_input *input); /* takes NULL */

/* The next job, the caller's to destroy; RF_OK with *job NULL at the end. After any answer but
 * RF_MEMORY the next call goes on: behind the job, or the file, that failed. */
enum rf_status review_input_next(struct review_input *input, struct rf_job **job,
                                 struct rf_error *error);

/* Files in folders passed over for their names. */
size_t review_input_passed_over(const struct review_input *input);

/* Bytes read so far; and bytes there are, 0 where that cannot be known (a pipe). The second goes
 * through the folders once. */
uint64_t review_input_read(const struct review_input *input);
uint64_t review_input_bytes(char *const paths[], size_t n);

#endif
