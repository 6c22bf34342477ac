/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef JOB_LONG_TABLE_H
#define JOB_LONG_TABLE_H

/*
 * Jobs out of a long table: one reading a row, with the job and the place it belongs to. The rows
 * of a job stand together; memory is one job's, and eight bytes for every job there was.
 *
 * A job with a bad row gives no job: without that row its ring might be another. All its rows are
 * handed back as they were, so that they can be put right and read again.
 */

#include "job/job.h"

#include <stdio.h>

enum long_column {
    LONG_JOB, /* the first four must be there */
    LONG_SETUP,
    LONG_PLACE,
    LONG_VALUE,
    LONG_SEQ, /* the place's number on the ring; without it, the order of the rows is the ring's */
    LONG_LABEL,
    LONG_KIND,
    LONG_METRES,
    LONG_FROM,
    LONG_DATE,
    LONG_NOTE,
    LONG_LIVE,
    LONG_CPC,
    LONG_TEMPERATURE,
    LONG_ACCURACY,
    LONG_FOUND, /* a JSON object */
    N_LONG_COLUMNS
};
/* What a column is called here, and in the table unless the options say otherwise. */
extern const char *const long_columns[N_LONG_COLUMNS];

struct long_options {
    const char *names[N_LONG_COLUMNS]; /* NULL: as in long_columns, and may be absent */
    char separator;                    /* '\0': what the first row shows */
    char decimal;                      /* '\0': what the first number shows */
    void *context;
    /* A row that is bad, or a job that is: the message. */
    void (*complain)(void *context, const struct rf_error *error);
    /* A row of a job that was not made, as it was, and its end; the first row of the table (its
     * columns) comes before the first of them. False: it could not be kept, reading ends. */
    bool (*reject)(void *context, const char *row, size_t length);
};

struct long_reader;

/* `options` and `file` must outlive the reader. RF_SYNTAX, RF_REFUSED (no such columns), RF_IO,
 * RF_MEMORY. */
enum rf_status long_reader_open(FILE *file, const char *source, const struct long_options *options,
                                struct long_reader **reader, struct rf_error *error);
/* The next job that is good, the caller's; RF_OK with *job NULL at the end. RF_IO, RF_MEMORY. */
enum rf_status long_reader_next(struct long_reader *reader, struct rf_job **job,
                                struct rf_error *error);
void long_reader_close(struct long_reader *reader); /* takes NULL */

#endif
