/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The first row of a long table: which columns there are. */
#include "job/long_reader.h"

#include "base/error.h"
#include "job/sheet_grid.h"

const char *const long_columns[N_LONG_COLUMNS] = {
    [LONG_JOB] = "job",
    [LONG_SETUP] = "setup",
    [LONG_PLACE] = "place",
    [LONG_VALUE] = "value",
    [LONG_SEQ] = "seq",
    [LONG_LABEL] = "label",
    [LONG_KIND] = "kind",
    [LONG_METRES] = "metres",
    [LONG_FROM] = "from",
    [LONG_DATE] = "date",
    [LONG_NOTE] = "note",
    [LONG_LIVE] = "live_mm2",
    [LONG_CPC] = "cpc_mm2",
    [LONG_TEMPERATURE] = "temperature_c",
    [LONG_ACCURACY] = "length_accuracy",
    [LONG_FOUND] = "found",
};

static enum rf_status read_head(FILE *file, const char *source, struct text *head,
                                struct rf_error *error)
{
    for (int byte = getc(file); byte != EOF; byte = getc(file)) {
        char character = (char)byte;
        text_append(head, &character, 1);
        if (head->length > LONG_ROW_LIMIT)
            return fail(error, RF_SYNTAX, "%s: row 1: found no row of columns' names", source);
        if (byte == '\n')
            break;
    }
    if (ferror(file))
        return fail(error, RF_IO, "%s: cannot be read", source);
    return head->failed ? fail_memory(error) : RF_OK;
}

/* Where the columns stand in a first row; the name of one that must be there and is not. */
static const char *find_columns(struct long_reader *reader, const struct csv_row *row)
{
    const char *missing = NULL;
    reader->width = row->n_cells;
    for (size_t i = 0; i < N_LONG_COLUMNS; i++) {
        const char *asked = reader->options->names[i];
        const char *name = asked != NULL ? asked : long_columns[i];
        snprintf(reader->names[i], sizeof reader->names[i], "%s", name);
        text_trim_partial_character(reader->names[i]);
        reader->columns[i] = SIZE_MAX;
        for (size_t j = 0; j < row->n_cells && reader->columns[i] == SIZE_MAX; j++)
            if (sheet_same_word(row->cells[j].text, name))
                reader->columns[i] = j;
        if (reader->columns[i] == SIZE_MAX && (asked != NULL || i <= LONG_VALUE) && missing == NULL)
            missing = name;
    }
    return missing;
}

/* Tries a separator: *good if all columns that must be there are. */
static enum rf_status try_separator(struct long_reader *reader, char separator, bool *good,
                                    struct rf_error *error)
{
    const struct csv_row *row;
    struct csv_reader *csv =
        csv_open_text(reader->head.bytes, reader->head.length, separator, reader->source);
    if (csv == NULL)
        return fail_memory(error);
    enum rf_status status = csv_next(csv, &row, error);
    *good = false;
    if (status == RF_OK && row != NULL) {
        const char *missing = find_columns(reader, row);
        *good = missing == NULL;
        if (missing != NULL)
            fail(error, RF_REFUSED,
                 "%s: row 1: found no column \"%s\"; needs the names of the columns, job, setup, "
                 "place and value, or which they are",
                 reader->source, missing);
    } else if (status == RF_OK) { /* a byte order mark and no more */
        fail(error, RF_SYNTAX, "%s: found nothing; needs a table", reader->source);
    }
    csv_close(csv);
    return status == RF_SYNTAX ? RF_OK : status;
}

enum rf_status long_begin_table(struct long_reader *reader, FILE *file, struct rf_error *error)
{
    static const char separators[] = {',', ';', '\t'};
    bool good = false;
    size_t most = 0;
    char likeliest = ',', separator = reader->options->separator;
    enum rf_status status = read_head(file, reader->source, &reader->head, error);
    if (status == RF_OK && reader->head.length == 0)
        return fail(error, RF_SYNTAX, "%s: found nothing; needs a table", reader->source);
    if (status == RF_OK && separator != '\0')
        status = try_separator(reader, separator, &good, error);
    for (size_t i = 0; separator == '\0' && !good && status == RF_OK && i < sizeof separators;
         i++) {
        status = try_separator(reader, separators[i], &good, error);
        if (good)
            separator = separators[i];
        if (reader->width > most) {
            most = reader->width;
            likeliest = separators[i];
        }
    }
    if (status == RF_OK && !good && separator == '\0') /* for the message */
        status = try_separator(reader, likeliest, &good, error);
    if (status != RF_OK)
        return status;
    if (!good)
        return error != NULL ? error->status : RF_REFUSED;
    if (reader->head.bytes[reader->head.length - 1] != '\n')
        text_add(&reader->head, "\n");
    reader->csv = csv_open_file(file, separator, reader->source);
    if (reader->csv == NULL || reader->head.failed)
        return fail_memory(error);
    csv_set_limit(reader->csv, LONG_ROW_LIMIT);
    csv_begin_behind(reader->csv, 1);
    return RF_OK;
}
