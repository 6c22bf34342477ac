/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef JOB_LONG_READER_H
#define JOB_LONG_READER_H

/* A long table as it is read: what its files (long_head.c, long_row.c, long_table.c) share. */

#include "base/csv.h"
#include "base/json.h"
#include "base/text.h"
#include "job/long_table.h"

#include <stdint.h>

enum { LONG_ROW_LIMIT = 65536, LONG_MAX_PLACES = 2 * JOB_MAX_POINTS };

struct long_site {
    const cJSON *value;
    size_t row;
    enum long_column column;
};

/* A point as its rows tell of it. */
struct long_point {
    cJSON *object;
    double seq; /* of the ring; 0: not told */
    size_t row;
};

/* The job whose rows are being read. */
struct long_group {
    struct text name;
    struct text raw; /* its rows as they were */
    bool begun, bad;
    bool handed_back; /* its rows so far have been: they were too many */
    cJSON *document, *ring, *readings;
    struct long_point points[LONG_MAX_PLACES + 1];
    size_t n_points;
    struct long_site *sites;
    size_t n_sites, capacity;
};

struct long_reader {
    struct json_origin base; /* first */
    const struct long_options *options;
    const char *source;
    struct csv_reader *csv;
    size_t columns[N_LONG_COLUMNS]; /* SIZE_MAX: not there */
    size_t width;                   /* cells of the first row */
    const struct csv_row *pending;  /* of the next job, read while this one ended */
    char names[N_LONG_COLUMNS][80];
    char decimal;
    struct text head; /* the first row, until a row is handed back */
    struct long_group group;
    size_t unreadable; /* number of a row of which nobody knows whose it is; 0: none */
    uint64_t *seen;    /* hashes of the jobs there were; 0: free */
    size_t n_seen, seen_capacity;
    bool ended, failed; /* `failed`: a row could not be handed back */
};

/* The first row: finds separator and columns, and opens the table behind it. */
enum rf_status long_begin_table(struct long_reader *reader, FILE *file, struct rf_error *error);

/* The text of a cell; "" where there is no such column. */
const char *long_cell(const struct long_reader *reader, const struct csv_row *row,
                      enum long_column column);

/* What a row says of its job goes into the group; where that cannot be, the group is bad, and has
 * been complained about. RF_MEMORY. */
enum rf_status long_take_row(struct long_reader *reader, const struct csv_row *row,
                             struct rf_error *error);

#endif
