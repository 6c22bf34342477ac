/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef JOB_SHEET_BUILD_H
#define JOB_SHEET_BUILD_H

/*
 * The document of a sheet as it grows: what the files that read a sheet share (sheet_build.c,
 * sheet_keys.c, sheet_table.c, sheet_read.c). The first refusal stays in `status`; what comes
 * behind it does nothing.
 */

#include "job/setup.h"
#include "job/sheet_grid.h"

struct sheet_site {
    const cJSON *value;
    size_t row, column;
};

struct sheet_origin {
    struct json_origin base; /* first: json.h knows only it */
    struct sheet_grid grid;
    struct sheet_site *sites; /* ordered by value once the document is whole */
    size_t n_sites, capacity;
};

enum column_holds { HOLDS_NOTHING, HOLDS_FIXED, HOLDS_SETUP, HOLDS_PRIVATE, HOLDS_ACCESS_PRIVATE };

struct build_column {
    enum column_holds holds;
    size_t which; /* a sheet_column or a set-up */
};

struct sheet_build {
    struct sheet_origin *origin;
    struct sheet_grid *grid;
    struct rf_error *error;
    enum rf_status status;
    cJSON *document, *ring, *points, *spurs, *readings, *access, *found, *also;
    cJSON *setups[N_SETUPS];
    size_t order[N_SETUPS], n_order; /* set-ups named in a `setups` row, then as columns stand */
    cJSON *private_keys;             /* x_ at the top; they end the document */
    cJSON *opened, *checked;
    struct build_column *columns;
    size_t n_columns;
    struct text word;
};

void build_refuse_memory(struct sheet_build *building);

const char *build_cell(const struct sheet_build *building, size_t row, size_t column);

/* An object made when it is first needed; NULL: memory is short, and has been refused. */
cJSON *build_need(struct sheet_build *building, cJSON **object);

/* Puts `value` (NULL: memory was short), which stands at a cell, into an object, or a list where
 * `key` is NULL. */
void build_put(struct sheet_build *building, cJSON *into, const char *key, cJSON *value, size_t row,
               size_t column);
/* The same for what a cell says; nothing where it says nothing. What should be a number and is
 * none goes in as text, for the job's reader to refuse. */
void build_put_number(struct sheet_build *building, cJSON *into, const char *key, size_t row,
                      size_t column);
void build_put_text(struct sheet_build *building, cJSON *into, const char *key, size_t row,
                    size_t column);
/* The readings of the cells from `first` to `last` of a row, as one value under `key`. */
void build_put_readings(struct sheet_build *building, cJSON **into, const char *key, size_t row,
                        size_t first, size_t last);

/* A row before or behind the table: a key and what it says. */
void sheet_read_key_row(struct sheet_build *building, size_t row);
/* The table of places. */
void sheet_read_table(struct sheet_build *building);

/* The origin's way to name a value; its sites must be in order. */
void sheet_order_sites(struct sheet_origin *origin);
bool sheet_name_value(const struct json_origin *base, const cJSON *value, struct text *out);

#endif
