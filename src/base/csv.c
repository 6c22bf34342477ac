/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/csv.h"

#include "base/error.h"
#include "base/memory.h"
#include "base/text.h"

#include <string.h>

enum { CHUNK = 65536, USUAL_LIMIT = 1024 * 1024 };

struct csv_reader {
    FILE *file; /* NULL: the text is all in `bytes` */
    const char *source;
    char separator;
    size_t limit;

    const char *bytes; /* what is at hand: the caller's text, or `buffer` */
    size_t at, length; /* bytes[at … length) are yet to be read */
    struct text buffer;
    bool file_ended, started;

    size_t next_number, next_line;
    struct csv_row row;
    struct text texts; /* the cells' texts, one after another */
    struct csv_cell *cells;
    size_t n_cells, capacity;
    char end[3];
};

static struct csv_reader *open_reader(char separator, const char *source)
{
    struct csv_reader *reader = NEW(struct csv_reader);
    if (reader == NULL)
        return NULL;
    reader->separator = separator;
    reader->source = source;
    reader->limit = USUAL_LIMIT;
    reader->next_number = reader->next_line = 1;
    return reader;
}

struct csv_reader *csv_open_text(const char *text, size_t length, char separator,
                                 const char *source)
{
    struct csv_reader *reader = open_reader(separator, source);
    if (reader != NULL) {
        reader->bytes = text;
        reader->length = length;
        reader->file_ended = true;
    }
    return reader;
}

struct csv_reader *csv_open_file(FILE *file, char separator, const char *source)
{
    struct csv_reader *reader = open_reader(separator, source);
    if (reader != NULL)
        reader->file = file;
    return reader;
}

void csv_close(struct csv_reader *reader)
{
    if (reader == NULL)
        return;
    text_finish(&reader->buffer);
    text_finish(&reader->texts);
    free(reader->cells);
    free(reader);
}

void csv_begin_behind(struct csv_reader *reader, size_t rows)
{
    reader->next_number = reader->next_line = rows + 1;
    reader->started = true; /* no mark stands here */
}

void csv_set_limit(struct csv_reader *reader, size_t bytes)
{
    reader->limit = bytes;
}

/* More of the file behind what is at hand; what has been read goes. */
static enum rf_status fetch(struct csv_reader *reader, struct rf_error *error)
{
    struct text *buffer = &reader->buffer;
    if (reader->at > 0) {
        memmove(buffer->bytes, buffer->bytes + reader->at, buffer->length - reader->at);
        buffer->length -= reader->at;
        reader->at = 0;
    }
    char chunk[CHUNK];
    size_t got = fread(chunk, 1, sizeof chunk, reader->file);
    if (got < sizeof chunk) {
        if (ferror(reader->file))
            return fail(error, RF_IO, "%s: cannot be read", reader->source);
        reader->file_ended = true;
    }
    text_append(buffer, chunk, got);
    if (buffer->failed)
        return fail_memory(error);
    reader->bytes = buffer->bytes;
    reader->length = buffer->length;
    return RF_OK;
}

/* Whether byte `i` of the row is at hand, fetching as needed. */
static bool have(struct csv_reader *reader, size_t i, enum rf_status *status,
                 struct rf_error *error)
{
    while (*status == RF_OK && reader->at + i >= reader->length && !reader->file_ended)
        *status = fetch(reader, error);
    return *status == RF_OK && reader->at + i < reader->length;
}

/*
 * Length of the row at hand without its end, by quotes and line ends alone: a quote opens only at
 * the start of a cell, spaces before it apart. *closed is false where a quote is never closed.
 */
static enum rf_status measure(struct csv_reader *reader, size_t *length, bool *closed,
                              struct rf_error *error)
{
    enum rf_status status = RF_OK;
    bool quoted = false, at_start = true;
    size_t i = 0;
    for (; i <= reader->limit && have(reader, i, &status, error); i++) {
        char byte = reader->bytes[reader->at + i];
        if (quoted) {
            quoted = byte != '"'; /* a doubled quote closes and opens again */
            at_start = byte == '"';
        } else if (byte == '"' && at_start) {
            quoted = true;
        } else if (byte == '\n' || byte == '\r') {
            break;
        } else if (byte == reader->separator) {
            at_start = true;
        } else if (byte != ' ' && byte != '\t') {
            at_start = false;
        }
    }
    *length = i;
    *closed = !quoted;
    return status;
}

static size_t first_line(const struct csv_reader *reader)
{
    size_t i = 0;
    while (reader->at + i < reader->length && i <= reader->limit &&
           reader->bytes[reader->at + i] != '\n' && reader->bytes[reader->at + i] != '\r')
        i++;
    return i;
}

static bool add_cell(struct csv_reader *reader, struct csv_cell cell)
{
    if (reader->n_cells == reader->capacity) {
        size_t capacity = reader->capacity > 0 ? 2 * reader->capacity : 32;
        struct csv_cell *cells = realloc(reader->cells, capacity * sizeof *cells);
        if (cells == NULL)
            return false;
        reader->cells = cells;
        reader->capacity = capacity;
    }
    reader->cells[reader->n_cells++] = cell;
    return true;
}

static bool is_blank(char byte)
{
    return byte == ' ' || byte == '\t';
}

/* Appends the text of the cell `raw` and a terminator; says what is wrong, or NULL. */
static const char *unwrap(struct text *texts, const char *raw, size_t length, struct csv_cell *cell)
{
    while (length > 0 && is_blank(raw[0])) {
        raw++;
        length--;
    }
    while (length > 0 && is_blank(raw[length - 1]))
        length--;
    size_t before = texts->length;
    cell->quoted = length > 0 && raw[0] == '"';
    if (!cell->quoted) {
        if (memchr(raw, '"', length) != NULL)
            return "a quote inside a cell that is not quoted; needs the cell in quotes and "
                   "its quotes doubled";
        text_append(texts, raw, length);
    } else {
        if (length < 2 || raw[length - 1] != '"')
            return "text behind the closing quote; needs the cell's own quotes doubled";
        for (size_t i = 1; i + 1 < length; i++) {
            if (raw[i] == '"' && (i + 2 >= length || raw[++i] != '"'))
                return "text behind the closing quote; needs the cell's own quotes doubled";
            text_append(texts, raw + i, 1);
        }
    }
    cell->length = texts->length - before;
    text_append(texts, "", 1);
    return NULL;
}

/* Where the cell that begins at raw[from] ends, at a separator or the row's end. */
static size_t cell_end(const struct csv_reader *reader, const char *raw, size_t from, size_t length)
{
    size_t i = from;
    while (i < length && is_blank(raw[i]) && raw[i] != reader->separator)
        i++;
    bool quoted = i < length && raw[i] == '"';
    if (quoted)
        i++;
    for (; i < length && (quoted || raw[i] != reader->separator); i++)
        if (quoted && raw[i] == '"') {
            if (i + 1 < length && raw[i + 1] == '"')
                i++;
            else
                quoted = false;
        }
    return i;
}

static enum rf_status bad_cell(const struct csv_reader *reader, size_t column, const char *why,
                               struct rf_error *error)
{
    char letters[16];
    csv_letters(column, letters);
    return fail(error, RF_SYNTAX, "%s: row %zu, column %s: found %s", reader->source,
                reader->next_number, letters, why);
}

static enum rf_status split(struct csv_reader *reader, const char *raw, size_t length,
                            struct rf_error *error)
{
    reader->n_cells = 0;
    text_clear(&reader->texts);
    for (size_t from = 0;; from++) {
        size_t end = cell_end(reader, raw, from, length);
        struct csv_cell cell = {.raw = from, .raw_length = end - from};
        const char *wrong = unwrap(&reader->texts, raw + from, end - from, &cell);
        if (wrong != NULL)
            return bad_cell(reader, reader->n_cells, wrong, error);
        if (reader->texts.failed || !add_cell(reader, cell))
            return fail_memory(error);
        from = end;
        if (end >= length)
            break;
    }
    /* The texts may have moved while they grew. */
    const char *text = reader->texts.bytes;
    for (size_t i = 0; i < reader->n_cells; i++) {
        reader->cells[i].text = text;
        text += reader->cells[i].length + 1;
    }
    return RF_OK;
}

static enum rf_status refuse_bytes(const struct csv_reader *reader, const char *raw, size_t length,
                                   struct rf_error *error)
{
    size_t bad = 0;
    if (!text_is_utf8(raw, length, &bad))
        return fail(error, RF_SYNTAX,
                    "%s: row %zu: found byte 0x%02X, which is not UTF-8; needs the file saved as "
                    "UTF-8",
                    reader->source, reader->next_number, (unsigned)(unsigned char)raw[bad]);
    if (memchr(raw, '\0', length) != NULL)
        return fail(error, RF_SYNTAX, "%s: row %zu: found a NUL byte; needs text in UTF-8",
                    reader->source, reader->next_number);
    return RF_OK;
}

/* Leaves `length` bytes and the line end behind them, which is noted in `end`. */
static enum rf_status step_over(struct csv_reader *reader, size_t length, struct rf_error *error)
{
    enum rf_status status = RF_OK;
    size_t n_end = 0;
    if (have(reader, length, &status, error)) {
        char first = reader->bytes[reader->at + length];
        if (first == '\n' || first == '\r')
            reader->end[n_end++] = first;
        if (first == '\r' && have(reader, length + 1, &status, error) &&
            reader->bytes[reader->at + length + 1] == '\n')
            reader->end[n_end++] = '\n';
    }
    reader->end[n_end] = '\0';
    reader->row.raw = reader->bytes + reader->at; /* have() may have moved it */
    reader->at += length + n_end;
    return status;
}

static size_t count_lines(const char *raw, size_t length)
{
    size_t lines = 0;
    for (size_t i = 0; i < length; i++)
        lines += raw[i] == '\n' || (raw[i] == '\r' && (i + 1 == length || raw[i + 1] != '\n'));
    return lines;
}

static enum rf_status pass_mark(struct csv_reader *reader, struct rf_error *error)
{
    enum rf_status status = RF_OK;
    reader->started = true;
    if (have(reader, 2, &status, error) &&
        memcmp(reader->bytes + reader->at, "\xEF\xBB\xBF", 3) == 0)
        reader->at += 3;
    if (status == RF_OK && have(reader, 1, &status, error) &&
        (memcmp(reader->bytes + reader->at, "\xFF\xFE", 2) == 0 ||
         memcmp(reader->bytes + reader->at, "\xFE\xFF", 2) == 0))
        return fail(error, RF_SYNTAX, "%s: found UTF-16; needs the file saved as UTF-8",
                    reader->source);
    return status;
}

enum rf_status csv_next(struct csv_reader *reader, const struct csv_row **row,
                        struct rf_error *error)
{
    *row = NULL;
    enum rf_status status = reader->started ? RF_OK : pass_mark(reader, error);
    if (status != RF_OK || !have(reader, 0, &status, error))
        return status;

    size_t length = 0;
    bool closed = true;
    status = measure(reader, &length, &closed, error);
    if (status != RF_OK)
        return status;
    enum rf_status well_formed = RF_OK;
    if (length > reader->limit || !closed)
        well_formed =
            fail(error, RF_SYNTAX, "%s: row %zu: found %s", reader->source, reader->next_number,
                 !closed ? "a quote that is never closed; needs the quote that ends the "
                           "cell, or doubled quotes inside it"
                         : "more bytes than a row may have; needs a row a line");
    if (well_formed == RF_OK)
        well_formed = refuse_bytes(reader, reader->bytes + reader->at, length, error);
    if (well_formed == RF_OK)
        well_formed = split(reader, reader->bytes + reader->at, length, error);
    if (well_formed != RF_OK) {
        if (well_formed != RF_SYNTAX)
            return well_formed;
        length = first_line(reader);
        reader->n_cells = 0;
    }
    status = step_over(reader, length, error);
    if (status != RF_OK)
        return status;

    reader->row.number = reader->next_number++;
    reader->row.line = reader->next_line;
    reader->next_line += 1 + count_lines(reader->row.raw, length);
    reader->row.cells = reader->cells;
    reader->row.n_cells = reader->n_cells;
    reader->row.raw_length = length;
    reader->row.end = reader->end;
    *row = &reader->row;
    return well_formed;
}

void csv_add_cell(struct text *out, const char *cell, size_t length, char separator)
{
    bool quote = length > 0 && (is_blank(cell[0]) || is_blank(cell[length - 1]));
    for (size_t i = 0; i < length && !quote; i++)
        quote = cell[i] == separator || cell[i] == '"' || cell[i] == '\n' || cell[i] == '\r';
    if (!quote) {
        text_append(out, cell, length);
        return;
    }
    text_add(out, "\"");
    for (size_t i = 0; i < length; i++) {
        if (cell[i] == '"')
            text_add(out, "\"");
        text_append(out, cell + i, 1);
    }
    text_add(out, "\"");
}

void csv_letters(size_t column, char out[16])
{
    char reversed[16];
    size_t n = 0;
    for (size_t left = column + 1; left > 0 && n < sizeof reversed - 1; left = (left - 1) / 26)
        reversed[n++] = (char)('A' + (left - 1) % 26);
    for (size_t i = 0; i < n; i++)
        out[i] = reversed[n - 1 - i];
    out[n] = '\0';
}
