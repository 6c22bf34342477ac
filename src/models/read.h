/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef MODELS_READ_H
#define MODELS_READ_H

/*
 * Reading one model file into the tables, in three parts: load.c gets the files, numbers.c reads
 * the blocks that are a few named numbers, rows.c the blocks that are lists.
 *
 * Every block carries its `source`: a number nobody answers for is refused.
 */

#include "base/json.h"
#include "models/models.h"
#include "models/shipped.h"

/* A block of named numbers: {"source": …, "sigma": 0.01}. */
struct number_field {
    const char *key;
    double low, high;
    const char *needs;
    size_t offset; /* of its double in struct rf_models */
};
struct number_block {
    const char *name;
    size_t n_fields;
    const struct number_field *fields;
};

/* A block of rows: {"source": …, "rows": […]}. */
struct row_block {
    const char *name;
    size_t most; /* rows */
    enum rf_status (*read_row)(const struct json_at *row, struct rf_models *models,
                               struct rf_error *error);
    /* Once all rows are read; NULL: nothing to check. `rows` is the list. */
    enum rf_status (*check)(const struct json_at *rows, const struct rf_models *models,
                            struct rf_error *error);
};

enum { BLOCKS_MAX = 6, FIELDS_MAX = 12 };

extern const struct number_block *const number_blocks[N_MODEL_FILES];
extern const size_t n_number_blocks[N_MODEL_FILES];
extern const struct row_block *const row_blocks[N_MODEL_FILES];
extern const size_t n_row_blocks[N_MODEL_FILES];

enum rf_status read_number_block(const struct json_at *document, const struct number_block *block,
                                 struct rf_models *models, struct rf_error *error);
enum rf_status read_row_block(const struct json_at *document, const struct row_block *block,
                              struct rf_models *models, struct rf_error *error);

/* The block of that name, its keys checked against `keys` and its source found. */
enum rf_status open_block(const struct json_at *document, const char *name,
                          const char *const keys[], size_t n_keys, struct json_at *block,
                          struct rf_error *error);

#endif
