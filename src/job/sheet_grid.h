/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef JOB_SHEET_GRID_H
#define JOB_SHEET_GRID_H

/* A sheet as rows of cells, each with the bytes it was written in: what reading a sheet and
 * editing one in place have in common. */

#include "base/text.h"
#include "job/sheet.h"

struct sheet_cell {
    char *text; /* unquoted */
    char *raw;  /* as written, or as it is to be written */
};

struct sheet_row {
    size_t number; /* as a spreadsheet counts; 0 for a row that was put in */
    size_t n_cells;
    struct sheet_cell *cells;
    char *end; /* the line end as written */
};

struct sheet_grid {
    const char *source;
    bool mark; /* a byte order mark stood at the start */
    struct sheet_style style;
    size_t n_rows, capacity;
    struct sheet_row *rows;
    size_t head;  /* the row that begins `place` */
    size_t table; /* one past the table's last row */
};

/* The columns of the table that are not a set-up's. */
enum sheet_column {
    COLUMN_PLACE,
    COLUMN_LABEL,
    COLUMN_KIND,
    COLUMN_METRES,
    COLUMN_FROM,
    COLUMN_LIVE,
    COLUMN_CPC,
    COLUMN_REACH,
    COLUMN_OPEN,
    N_COLUMNS
};
extern const char *const sheet_columns[N_COLUMNS];

/* What follows r1, rn, r2 in `end_to_end`, and the rows' names. */
extern const char *const sheet_end_rows[3];
extern const char *const sheet_end_keys[3];

/* Reads the rows, finds separator, table and decimal mark. The caller finishes the grid, also
 * after a refusal. RF_SYNTAX, RF_REFUSED, RF_MEMORY. */
enum rf_status sheet_grid_read(struct sheet_grid *grid, const char *bytes, size_t length,
                               const char *source, struct rf_error *error);
void sheet_grid_finish(struct sheet_grid *grid); /* takes NULL and zeroed */

/* The text of a cell; "" where the row is shorter. */
const char *sheet_cell_text(const struct sheet_row *row, size_t column);

/* Case does not matter in the sheet's own words: phones and spreadsheets begin cells in capitals. */
bool sheet_same_word(const char *one, const char *other);
/* The set-up of a column's name, or N_SETUPS. */
size_t sheet_find_setup(const char *name);

/* Whether the column holds numbers: one of them, or readings. */
bool sheet_column_has_numbers(const char *name);

/*
 * One word of a cell of several readings, beginning at *at, which moves behind it: false at the
 * end. Words stand apart by spaces, line ends, `/`, `;`, or a comma that a space follows.
 */
bool sheet_next_word(const char **at, struct text *word);

/* Whether a word says that the meter was over range: >99.9, OL, o/c, open … */
bool sheet_is_over_range(const char *word);

/* A number in the sheet's spelling as JSON spells it; false where it is none. */
bool sheet_number(const char *word, char decimal, char *json, size_t size);

/* Names of places: "row 14, column cross_le", "row 3, column B (note)". */
void sheet_name_cell(const struct sheet_grid *grid, size_t row, size_t column, struct text *out);
enum rf_status sheet_fail(const struct sheet_grid *grid, size_t row, size_t column,
                          struct rf_error *error, const char *format, ...) RF_PRINTF(5, 6);

#endif
