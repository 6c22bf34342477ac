/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "job/sheet_grid.h"

#include "base/csv.h"
#include "base/error.h"
#include "base/memory.h"
#include "job/setup.h"

#include <stdarg.h>
#include <stdio.h>
#include <string.h>
#include <strings.h>

const char *const sheet_columns[N_COLUMNS] = {
    [COLUMN_PLACE] = "place", [COLUMN_LABEL] = "label",    [COLUMN_KIND] = "kind",
    [COLUMN_METRES] = "metres", [COLUMN_FROM] = "from",    [COLUMN_LIVE] = "live_mm2",
    [COLUMN_CPC] = "cpc_mm2", [COLUMN_REACH] = "reach_min", [COLUMN_OPEN] = "open_min",
};
const char *const sheet_end_rows[3] = {"r1", "rn", "r2"};
const char *const sheet_end_keys[3] = {"l", "n", "e"};

static const char separators[] = {',', ';', '\t'};
static const char *const number_rows[] = {
    "live_mm2", "cpc_mm2", "temperature_c", "length_accuracy", "r1", "rn", "r2",
    "found.live_mm2", "found.cpc_mm2", "found.ohms", "found.metres",
    "found.also.live_mm2", "found.also.cpc_mm2", "found.also.ohms", "found.also.metres",
};

bool sheet_same_word(const char *one, const char *other)
{
    return strcasecmp(one, other) == 0;
}

size_t sheet_find_setup(const char *name)
{
    size_t i = 0;
    while (i < N_SETUPS && !sheet_same_word(setups[i].name, name))
        i++;
    return i;
}

const char *sheet_cell_text(const struct sheet_row *row, size_t column)
{
    return column < row->n_cells ? row->cells[column].text : "";
}

bool sheet_column_has_numbers(const char *name)
{
    for (size_t i = COLUMN_METRES; i < N_COLUMNS; i++)
        if (i != COLUMN_FROM && sheet_same_word(sheet_columns[i], name))
            return true;
    return sheet_find_setup(name) < N_SETUPS;
}

/* --- messages --- */

void sheet_name_cell(const struct sheet_grid *grid, size_t row, size_t column, struct text *out)
{
    const struct sheet_row *head = grid->rows + grid->head;
    char letters[16];
    text_addf(out, "row %zu", grid->rows[row].number);
    if (row > grid->head && row < grid->table && sheet_cell_text(head, column)[0] != '\0') {
        text_addf(out, ", column %s", head->cells[column].text);
        return;
    }
    csv_letters(column, letters);
    text_addf(out, ", column %s", letters);
    if (column > 0 && (row < grid->head || row >= grid->table))
        text_addf(out, " (%s)", sheet_cell_text(grid->rows + row, 0));
}

enum rf_status sheet_fail(const struct sheet_grid *grid, size_t row, size_t column,
                          struct rf_error *error, const char *format, ...)
{
    char message[sizeof error->text];
    struct text text = {0};
    va_list arguments;
    va_start(arguments, format);
    if (vsnprintf(message, sizeof message, format, arguments) < 0)
        message[0] = '\0';
    va_end(arguments);
    text_trim_partial_character(message);

    sheet_name_cell(grid, row, column, &text);
    enum rf_status status = text.failed ? fail_memory(error)
                                        : fail(error, RF_REFUSED, "%s: %s: %s", grid->source,
                                               text.bytes, message);
    text_finish(&text);
    return status;
}

/* --- rows --- */

static void finish_row(struct sheet_row *row)
{
    for (size_t i = 0; i < row->n_cells; i++) {
        free(row->cells[i].text);
        free(row->cells[i].raw);
    }
    free(row->cells);
    free(row->end);
}

void sheet_grid_finish(struct sheet_grid *grid)
{
    if (grid == NULL)
        return;
    for (size_t i = 0; i < grid->n_rows; i++)
        finish_row(grid->rows + i);
    free(grid->rows);
    *grid = (struct sheet_grid){0};
}

static char *copy_bytes(const char *bytes, size_t length)
{
    char *copy = malloc(length + 1);
    if (copy != NULL) {
        memcpy(copy, bytes, length);
        copy[length] = '\0';
    }
    return copy;
}

static bool add_row(struct sheet_grid *grid, const struct csv_row *from)
{
    if (grid->n_rows == grid->capacity) {
        size_t capacity = grid->capacity > 0 ? 2 * grid->capacity : 64;
        struct sheet_row *rows = realloc(grid->rows, capacity * sizeof *rows);
        if (rows == NULL)
            return false;
        grid->rows = rows;
        grid->capacity = capacity;
    }
    struct sheet_row *row = grid->rows + grid->n_rows++;
    *row = (struct sheet_row){.number = from->number};
    row->cells = NEW_ARRAY(struct sheet_cell, from->n_cells);
    row->end = text_duplicate(from->end);
    bool good = row->cells != NULL && row->end != NULL;
    for (size_t i = 0; good && i < from->n_cells; i++) {
        const struct csv_cell *cell = from->cells + i;
        row->n_cells++;
        row->cells[i].text = copy_bytes(cell->text, cell->length);
        row->cells[i].raw = copy_bytes(from->raw + cell->raw, cell->raw_length);
        good = row->cells[i].text != NULL && row->cells[i].raw != NULL;
    }
    return good;
}

/* Whether the bytes have a row that begins `place` and goes on, their cells taken apart at
 * `separator`; *clean: and all before it are well-formed. Those that are not are the reader's to
 * refuse. */
static enum rf_status has_head(const char *bytes, size_t length, char separator, bool *found,
                               bool *clean, struct rf_error *error)
{
    const struct csv_row *row;
    struct rf_error ignored;
    struct csv_reader *reader = csv_open_text(bytes, length, separator, "");
    if (reader == NULL)
        return fail_memory(error);
    *found = false;
    *clean = true;
    enum rf_status status = RF_OK;
    do {
        status = csv_next(reader, &row, &ignored);
        *clean = *clean && status == RF_OK;
        if (row != NULL && status == RF_OK)
            *found = row->n_cells > 1 && sheet_same_word(row->cells[0].text, "place");
    } while (row != NULL && !*found);
    csv_close(reader);
    return status == RF_MEMORY ? fail_memory(error) : RF_OK;
}

static enum rf_status find_separator(struct sheet_grid *grid, const char *bytes, size_t length,
                                     struct rf_error *error)
{
    bool any = false;
    for (size_t i = 0; i < sizeof separators; i++) {
        bool found = false, clean = false;
        enum rf_status status = has_head(bytes, length, separators[i], &found, &clean, error);
        if (status != RF_OK)
            return status;
        /* A note may hold lines of another sheet: where quotes work out, it is taken whole. */
        if (found && (clean || !any))
            grid->style.separator = separators[i];
        if (found && clean)
            return RF_OK;
        any = any || found;
    }
    if (any)
        return RF_OK;
    return fail(error, RF_SYNTAX,
                "%s: found neither a JSON text, which begins {, nor a sheet with a row that begins "
                "\"place\"; needs one of them",
                grid->source);
}

static bool is_empty_row(const struct sheet_row *row)
{
    for (size_t i = 0; i < row->n_cells; i++)
        if (row->cells[i].text[0] != '\0')
            return false;
    return true;
}

static enum rf_status read_rows(struct sheet_grid *grid, const char *bytes, size_t length,
                                struct rf_error *error)
{
    const struct csv_row *row;
    struct csv_reader *reader =
        csv_open_text(bytes, length, grid->style.separator, grid->source);
    if (reader == NULL)
        return fail_memory(error);
    enum rf_status status = RF_OK;
    while ((status = csv_next(reader, &row, error)) == RF_OK && row != NULL)
        if (!add_row(grid, row)) {
            status = fail_memory(error);
            break;
        }
    csv_close(reader);
    if (status != RF_OK)
        return status;

    while (!sheet_same_word(sheet_cell_text(grid->rows + grid->head, 0), "place"))
        grid->head++; /* there is one: find_separator has seen it */
    grid->table = grid->head + 1;
    while (grid->table < grid->n_rows && !is_empty_row(grid->rows + grid->table))
        grid->table++;
    return RF_OK;
}

/* --- numbers and words --- */

static bool is_digit(char byte)
{
    return byte >= '0' && byte <= '9';
}

static bool is_apart(const char *at)
{
    return *at == '\0' || *at == ' ' || *at == '\t' || *at == '\n' || *at == '\r' || *at == '/' ||
           *at == ';' ||
           (*at == ',' && (at[1] == ' ' || at[1] == '\t' || at[1] == '\n' || at[1] == '\r'));
}

bool sheet_next_word(const char **at, struct text *word)
{
    text_clear(word);
    while (**at != '\0' && is_apart(*at))
        ++*at;
    if (**at == '\0')
        return false;
    if ((strncasecmp(*at, "o/c", 3) == 0 || strncasecmp(*at, "o/l", 3) == 0) &&
        is_apart(*at + 3)) {
        text_append(word, *at, 3);
        *at += 3;
        return true;
    }
    do { /* a > may stand apart from its number */
        while (!is_apart(*at))
            text_append(word, (*at)++, 1);
        if (strcmp(word->bytes != NULL ? word->bytes : "", ">") != 0)
            break;
        while (**at == ' ')
            ++*at;
    } while (!is_apart(*at));
    return true;
}

bool sheet_number(const char *word, char decimal, char *json, size_t size)
{
    size_t n = 0, i = 0;
    if (strlen(word) + 2 > size)
        return false;
    if (word[i] == '-')
        json[n++] = word[i++];
    if (word[i] == decimal && is_digit(word[i + 1]))
        json[n++] = '0'; /* .45 */
    else if (!is_digit(word[i]) || (word[i] == '0' && is_digit(word[i + 1])))
        return false;
    while (is_digit(word[i]))
        json[n++] = word[i++];
    if (word[i] == decimal) {
        if (!is_digit(word[i + 1]))
            return false;
        json[n++] = '.';
        for (i++; is_digit(word[i]);)
            json[n++] = word[i++];
    }
    if (word[i] == 'e' || word[i] == 'E') {
        json[n++] = word[i++];
        if (word[i] == '+' || word[i] == '-')
            json[n++] = word[i++];
        if (!is_digit(word[i]))
            return false;
        while (is_digit(word[i]))
            json[n++] = word[i++];
    }
    json[n] = '\0';
    return word[i] == '\0';
}

bool sheet_is_over_range(const char *word)
{
    static const char *const words[] = {"open", "OL", "O/L", "o/c", "OC", ">99.9", ">99,9"};
    for (size_t i = 0; i < sizeof words / sizeof words[0]; i++)
        if (sheet_same_word(words[i], word))
            return true;
    return false;
}

/* The decimal mark of a word that is a number with one; else '\0'. */
static char mark_of(const char *word)
{
    char json[64];
    if (*word == '>')
        word++;
    bool point = sheet_number(word, '.', json, sizeof json);
    bool comma = sheet_number(word, ',', json, sizeof json);
    return point == comma ? '\0' : point ? '.' : ',';
}

struct marks {
    struct sheet_grid *grid;
    size_t row[2], column[2]; /* where a point, a comma was first met */
    bool met[2];
    struct text word, first[2];
};

static enum rf_status note_marks(struct marks *marks, size_t row, size_t column,
                                 struct rf_error *error)
{
    struct sheet_grid *grid = marks->grid;
    const char *at = sheet_cell_text(grid->rows + row, column);
    while (sheet_next_word(&at, &marks->word)) {
        if (marks->word.failed)
            return fail_memory(error);
        char mark = mark_of(marks->word.bytes);
        if (mark == '\0')
            continue;
        size_t which = mark == ',';
        if (!marks->met[which]) {
            marks->met[which] = true;
            marks->row[which] = row;
            marks->column[which] = column;
            text_add(&marks->first[which], marks->word.bytes);
        }
        if (marks->met[!which] && !marks->first[0].failed && !marks->first[1].failed)
            return sheet_fail(grid, row, column, error,
                              "found %s, but %s in row %zu: a decimal %s beside a decimal %s; "
                              "needs one of them throughout",
                              marks->word.bytes, marks->first[!which].bytes,
                              grid->rows[marks->row[!which]].number,
                              mark == ',' ? "comma" : "point", mark == ',' ? "point" : "comma");
    }
    return RF_OK;
}

static bool is_number_row(const char *key)
{
    for (size_t i = 0; i < sizeof number_rows / sizeof number_rows[0]; i++)
        if (sheet_same_word(number_rows[i], key))
            return true;
    return false;
}

static enum rf_status find_decimal(struct sheet_grid *grid, struct rf_error *error)
{
    enum rf_status status = RF_OK;
    struct marks marks = {.grid = grid};
    const struct sheet_row *head = grid->rows + grid->head;
    for (size_t i = 0; i < grid->n_rows; i++) {
        const struct sheet_row *row = grid->rows + i;
        bool in_table = i > grid->head && i < grid->table;
        bool number_row = !in_table && i != grid->head && is_number_row(row->cells[0].text);
        for (size_t j = 1; status == RF_OK && j < row->n_cells; j++)
            if (number_row ||
                (in_table && sheet_column_has_numbers(sheet_cell_text(head, j))))
                status = note_marks(&marks, i, j, error);
    }
    /* Where no number shows it, semicolons do: they stand where a comma is the decimal mark. */
    grid->style.decimal = marks.met[1]                    ? ','
                          : marks.met[0]                  ? '.'
                          : grid->style.separator == ';' ? ','
                                                          : '.';
    text_finish(&marks.word);
    text_finish(&marks.first[0]);
    text_finish(&marks.first[1]);
    return status;
}

/* Between commas a row must have every cell: 0,40 without quotes would pass for two of them. */
static enum rf_status check_widths(const struct sheet_grid *grid, struct rf_error *error)
{
    size_t width = grid->rows[grid->head].n_cells;
    for (size_t i = grid->head + 1; i < grid->table; i++) {
        const struct sheet_row *row = grid->rows + i;
        size_t used = row->n_cells;
        while (used > 0 && row->cells[used - 1].text[0] == '\0')
            used--;
        bool short_row = grid->style.separator == ',' && row->n_cells < width;
        if (used > width || short_row)
            return fail(error, RF_REFUSED,
                        "%s: row %zu: found %zu cells; needs %zu, as the row that begins \"place\" "
                        "has%s",
                        grid->source, row->number, used > width ? used : row->n_cells, width,
                        grid->style.separator != ','
                            ? ""
                            : " (between commas, a decimal comma needs its number in quotes)");
    }
    return RF_OK;
}

enum rf_status sheet_grid_read(struct sheet_grid *grid, const char *bytes, size_t length,
                               const char *source, struct rf_error *error)
{
    *grid = (struct sheet_grid){.source = source};
    grid->mark = length >= 3 && memcmp(bytes, "\xEF\xBB\xBF", 3) == 0;
    size_t bad = 0;
    if (length >= 2 && (memcmp(bytes, "\xFF\xFE", 2) == 0 || memcmp(bytes, "\xFE\xFF", 2) == 0))
        return fail(error, RF_SYNTAX, "%s: found UTF-16; needs the file saved as UTF-8", source);
    if (!text_is_utf8(bytes, length, &bad)) {
        size_t line = 1;
        for (size_t i = 0; i < bad; i++)
            line += bytes[i] == '\n';
        return fail(error, RF_SYNTAX,
                    "%s: line %zu: found byte 0x%02X, which is not UTF-8; needs the file saved as "
                    "UTF-8",
                    source, line, (unsigned)(unsigned char)bytes[bad]);
    }
    enum rf_status status = find_separator(grid, bytes, length, error);
    if (status == RF_OK)
        status = read_rows(grid, bytes, length, error);
    if (status == RF_OK)
        status = check_widths(grid, error);
    if (status == RF_OK)
        status = find_decimal(grid, error);
    return status;
}
