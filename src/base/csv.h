/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef BASE_CSV_H
#define BASE_CSV_H

/*
 * Tables of separated values, a row at a time (RFC 4180; any separator; rows end in LF, CR LF or
 * CR). Memory is one row's, however long the table.
 *
 * libcsv reads such tables too. It does not say where in the text a cell stood, which editing a
 * cell in place needs; it does not say whether a cell was quoted; and it cannot go on behind a
 * row whose quotes are wrong, which an archive of a million rows needs.
 */

#include <ringfettle/status.h>

#include <stdbool.h>
#include <stddef.h>
#include <stdio.h>

struct csv_cell {
    const char *text; /* quotes taken off, terminated; what is not quoted has lost the spaces and
                       * tabs around it */
    size_t length;
    bool quoted;
    size_t raw, raw_length; /* where the cell as written stands in the row as written */
};

struct csv_row {
    size_t number; /* from 1, as a spreadsheet counts: empty rows count, lines inside quotes not */
    size_t line;   /* from 1, of the text, where the row begins */
    struct csv_cell *cells;
    size_t n_cells;  /* at least 1; an empty line is one empty cell */
    const char *raw; /* as written, without its end */
    size_t raw_length;
    const char *end; /* "\n", "\r\n", "\r", or "" at the end of the text */
};

struct csv_reader;

/* Of a text in memory, which must outlive the reader, or of an open file, which stays the
 * caller's. `source` is for messages and must outlive the reader. A byte order mark at the start
 * is passed over. NULL: memory is short. */
struct csv_reader *csv_open_text(const char *text, size_t length, char separator,
                                 const char *source);
struct csv_reader *csv_open_file(FILE *file, char separator, const char *source);
void csv_close(struct csv_reader *reader); /* takes NULL */

/* For a reader whose caller has read the first n rows, a line each, elsewhere: numbers go on. */
void csv_begin_behind(struct csv_reader *reader, size_t rows);

/* No row may be longer than this (1 MiB unless set). */
void csv_set_limit(struct csv_reader *reader, size_t bytes);

/*
 * The next row; *row is NULL at the end. It lives until the next call. RF_SYNTAX: the row is not
 * well-formed (quotes, bytes that are not UTF-8, a NUL, too long); `error` names row and, where
 * one is at fault, the cell. *row then holds the row's first line, raw, without cells, and the
 * next call goes on behind that line. RF_MEMORY, RF_IO: the end.
 */
enum rf_status csv_next(struct csv_reader *reader, const struct csv_row **row,
                        struct rf_error *error);

struct text;
/* Appends a cell, quoted where `separator`, quotes, line ends or outer spaces need it. */
void csv_add_cell(struct text *out, const char *cell, size_t length, char separator);

/* The column's name as a spreadsheet shows it: 0 is "A", 26 "AA". `out` has room for 16 bytes. */
void csv_letters(size_t column, char out[16]);

#endif
