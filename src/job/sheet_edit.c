/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Changes in a sheet, cell by cell; what is not changed is written as it was read. */
#include "job/job_edit.h"

#include "base/csv.h"
#include "base/error.h"
#include "base/memory.h"
#include "job/sheet_grid.h"
#include "job/sheet_text.h"

#include <stdlib.h>
#include <string.h>

/* Sets a cell, the row lengthened as needed. */
static enum rf_status set_cell(struct sheet_grid *grid, size_t row, size_t column, const char *text,
                               struct rf_error *error)
{
    struct sheet_row *in = grid->rows + row;
    if (column >= in->n_cells) {
        struct sheet_cell *cells = realloc(in->cells, (column + 1) * sizeof *cells);
        if (cells == NULL)
            return fail_memory(error);
        in->cells = cells;
        while (in->n_cells <= column) {
            struct sheet_cell *added = in->cells + in->n_cells++;
            added->text = text_duplicate("");
            added->raw = text_duplicate("");
            if (added->text == NULL || added->raw == NULL)
                return fail_memory(error);
        }
    }
    struct text raw = {0};
    csv_add_cell(&raw, text, strlen(text), grid->style.separator);
    char *copy = text_duplicate(text);
    char *written = raw.bytes != NULL ? raw.bytes : text_duplicate("");
    if (raw.failed || copy == NULL || written == NULL) {
        free(copy);
        free(written);
        return fail_memory(error);
    }
    free(in->cells[column].text);
    free(in->cells[column].raw);
    in->cells[column] = (struct sheet_cell){copy, written};
    return RF_OK;
}

/* Puts an empty row in at `at`. Head and table move behind it. */
static enum rf_status insert_row(struct sheet_grid *grid, size_t at, struct rf_error *error)
{
    struct sheet_row *rows = realloc(grid->rows, (grid->n_rows + 1) * sizeof *rows);
    if (rows == NULL)
        return fail_memory(error);
    grid->rows = rows;
    grid->capacity = grid->n_rows + 1;
    /* Ends in a line as the others do; the last row of a file may have had none. */
    const char *end = rows[grid->head].end[0] != '\0' ? rows[grid->head].end
                      : grid->head > 0                ? rows[grid->head - 1].end
                                                      : "\n";
    struct sheet_row row = {.end = text_duplicate(end)};
    bool good = row.end != NULL;
    if (good && at > 0 && rows[at - 1].end[0] == '\0') {
        char *whole = text_duplicate(end);
        good = whole != NULL;
        if (good) {
            free(rows[at - 1].end);
            rows[at - 1].end = whole;
        }
    }
    if (!good) {
        free(row.end);
        return fail_memory(error);
    }
    memmove(rows + at + 1, rows + at, (grid->n_rows - at) * sizeof *rows);
    rows[at] = row;
    grid->n_rows++;
    if (at <= grid->head)
        grid->head++;
    if (at <= grid->table)
        grid->table++;
    return set_cell(grid, at, 0, "", error);
}

/* The row of a key, put in before the table if it is not there. */
static enum rf_status key_row(struct sheet_grid *grid, const char *key, size_t *row,
                              struct rf_error *error)
{
    for (*row = 0; *row < grid->n_rows; ++*row)
        if ((*row < grid->head || *row >= grid->table) &&
            sheet_same_word(sheet_cell_text(grid->rows + *row, 0), key))
            return RF_OK;
    *row = grid->head;
    while (*row > 0 && sheet_cell_text(grid->rows + *row - 1, 0)[0] == '\0')
        --*row;
    enum rf_status status = insert_row(grid, *row, error);
    return status == RF_OK ? set_cell(grid, *row, 0, key, error) : status;
}

static bool is_special(const char *place)
{
    for (size_t spot = 0; spot < N_SPOTS; spot++)
        if (spot_keys[spot] != NULL && strcmp(spot_keys[spot], place) == 0)
            return true;
    return false;
}

/* The row of a place. The board and the ends get one if they have none; a point must be there. */
static enum rf_status place_row(struct sheet_grid *grid, const char *place, size_t *row,
                                struct rf_error *error)
{
    bool special = is_special(place);
    struct text cell = {0};
    if (special)
        text_add(&cell, place);
    else
        sheet_add_text(place, &cell);
    if (cell.failed)
        return fail_memory(error);
    for (*row = grid->head + 1; *row < grid->table; ++*row) {
        const char *here = sheet_cell_text(grid->rows + *row, 0);
        if (special ? sheet_same_word(here, place)
                    : strcmp(here, cell.bytes) == 0 || strcmp(here, place) == 0)
            break;
    }
    text_finish(&cell);
    if (*row < grid->table)
        return RF_OK;
    if (!special)
        return fail(error, RF_REFUSED, "%s: found no row of \"%s\"; needs a place of the table",
                    grid->source, place);
    bool first = strcmp(place, "board") == 0 || strcmp(place, "out") == 0;
    *row = first ? grid->head + 1 : grid->table;
    size_t table = grid->table;
    enum rf_status status = insert_row(grid, *row, error);
    grid->table = table + 1;
    size_t width = grid->rows[grid->head].n_cells;
    if (status == RF_OK)
        status = set_cell(grid, *row, width - 1, "", error);
    return status == RF_OK ? set_cell(grid, *row, 0, place, error) : status;
}

/* The column of a set-up, put in behind the last named one if it is not there. */
static enum rf_status setup_column(struct sheet_grid *grid, size_t setup, size_t *column,
                                   struct rf_error *error)
{
    const struct sheet_row *head = grid->rows + grid->head;
    for (*column = 1; *column < head->n_cells; ++*column)
        if (sheet_same_word(head->cells[*column].text, setups[setup].name))
            return RF_OK;
    while (*column > 1 && head->cells[*column - 1].text[0] == '\0')
        --*column;
    enum rf_status status = set_cell(grid, grid->head, *column, setups[setup].name, error);
    for (size_t i = grid->head + 1; i < grid->table && status == RF_OK; i++)
        if (grid->rows[i].n_cells <= *column && grid->style.separator == ',')
            status = set_cell(grid, i, *column, "", error);
    return status;
}

/* A reading's cell: end-to-end values have rows of their own. */
static enum rf_status reading_cell(struct sheet_grid *grid, const struct job_change *change,
                                   size_t *row, size_t *column, struct rf_error *error)
{
    if (change->setup != 0) {
        enum rf_status status = setup_column(grid, change->setup, column, error);
        return status == RF_OK ? place_row(grid, change->place, row, error) : status;
    }
    *column = 1;
    for (size_t i = 0; i < 3; i++)
        if (strcmp(sheet_end_keys[i], change->place) == 0)
            return key_row(grid, sheet_end_rows[i], row, error);
    return fail(error, RF_REFUSED, "%s: \"%s\" is not read in end_to_end; needs l, n or e",
                grid->source, change->place);
}

static void add_value(const struct sheet_grid *grid, const char *json, struct text *cell)
{
    if (json[0] == '"') {
        text_add(cell, "open");
        return;
    }
    for (const char *at = json; *at != '\0'; at++)
        text_append(cell, *at == '.' ? &grid->style.decimal : at, 1);
}

static bool says_nothing(const char *cell)
{
    return cell[0] == '\0' || strcmp(cell, "-") == 0;
}

static enum rf_status edit_reading(struct sheet_grid *grid, const struct job_change *change,
                                   struct rf_error *error)
{
    size_t row, column;
    enum rf_status status = reading_cell(grid, change, &row, &column, error);
    if (status != RF_OK)
        return status;
    struct text cell = {0};
    const char *old = sheet_cell_text(grid->rows + row, column);
    if (change->how == CHANGE_ADD && !says_nothing(old))
        text_add(&cell, old);
    for (size_t i = 0; i < change->n_values && change->how != CHANGE_REMOVE; i++) {
        if (cell.length > 0)
            text_add(&cell, " ");
        add_value(grid, change->values[i], &cell);
    }
    status = cell.failed ? fail_memory(error)
                         : set_cell(grid, row, column, cell.bytes != NULL ? cell.bytes : "", error);
    /* End-to-end repeats may stand in further cells. */
    if (change->how != CHANGE_ADD && change->setup == 0)
        for (size_t i = column + 1; status == RF_OK && i < grid->rows[row].n_cells; i++)
            status = set_cell(grid, row, i, "", error);
    text_finish(&cell);
    return status;
}

static enum rf_status edit_mark(struct sheet_grid *grid, const struct job_change *change,
                                struct rf_error *error)
{
    size_t row;
    struct text cell = {0};
    enum rf_status status =
        key_row(grid, change->what == CHANGE_OPENED ? "opened" : "checked", &row, error);
    if (status != RF_OK)
        return status;
    sheet_add_text(change->place, &cell);
    if (cell.failed)
        return fail_memory(error);
    size_t column = 1, last = 0;
    for (size_t i = 1; i < grid->rows[row].n_cells; i++) {
        const char *here = sheet_cell_text(grid->rows + row, i);
        if (here[0] != '\0')
            last = i;
        if (change->how == CHANGE_REMOVE &&
            (strcmp(here, cell.bytes) == 0 || strcmp(here, change->place) == 0))
            column = i;
    }
    if (change->how == CHANGE_ADD)
        status = set_cell(grid, row, last + 1, cell.bytes, error);
    else
        status = set_cell(grid, row, column, "", error);
    text_finish(&cell);
    return status;
}

static bool is_found_key(const char *key)
{
    return sheet_same_word(key, "found") || strncmp(key, "found.", 6) == 0;
}

/* The rows of a finding, as the sheet's writer makes them, put in before the table. */
static enum rf_status put_found(struct sheet_grid *grid, const cJSON *found, const char *path,
                                struct rf_error *error)
{
    enum rf_status status = RF_OK;
    for (const cJSON *field = found->child; field != NULL && status == RF_OK; field = field->next) {
        struct text key = {0}, cell = {0};
        size_t row, column = 1;
        if (cJSON_IsObject(field) && strcmp(field->string, "also") == 0) {
            status = put_found(grid, field, "found.also.", error);
            continue;
        }
        text_addf(&key, "%s%s", path, field->string);
        status = key.failed ? fail_memory(error) : key_row(grid, key.bytes, &row, error);
        const cJSON *first = cJSON_IsArray(field) ? field->child : field;
        for (const cJSON *one = first; one != NULL && status == RF_OK;
             one = field == first ? NULL : one->next) {
            text_clear(&cell);
            if (cJSON_IsString(one))
                sheet_add_text(one->valuestring, &cell);
            else if (cJSON_IsNumber(one))
                sheet_add_number(one->valuedouble, grid->style.decimal, &cell);
            else
                text_add(&cell, cJSON_IsTrue(one) ? "yes" : "no");
            status =
                cell.failed ? fail_memory(error) : set_cell(grid, row, column++, cell.bytes, error);
        }
        text_finish(&key);
        text_finish(&cell);
    }
    return status;
}

static enum rf_status edit_found(struct sheet_grid *grid, const struct job_change *change,
                                 struct rf_error *error)
{
    for (size_t i = grid->n_rows; i-- > 0;) {
        struct sheet_row *row = grid->rows + i;
        if ((i > grid->head && i < grid->table) || !is_found_key(sheet_cell_text(row, 0)))
            continue;
        for (size_t j = 0; j < row->n_cells; j++) {
            free(row->cells[j].text);
            free(row->cells[j].raw);
        }
        free(row->cells);
        free(row->end);
        memmove(row, row + 1, (grid->n_rows - i - 1) * sizeof *row);
        grid->n_rows--;
        grid->head -= i < grid->head;
        grid->table -= i < grid->table;
    }
    if (change->how == CHANGE_REMOVE)
        return RF_OK;
    cJSON *found = NULL;
    enum rf_status status =
        json_parse(change->found, strlen(change->found), "found", JSON_ONE_LINE, &found, error);
    if (status == RF_OK && !cJSON_IsObject(found))
        status = fail(error, RF_REFUSED,
                      "%s: found: needs an object such as {\"family\": \"none\"}", grid->source);
    if (status == RF_OK)
        status = put_found(grid, found, "found.", error);
    cJSON_Delete(found);
    return status;
}

static enum rf_status add_history(struct sheet_grid *grid, const cJSON *document,
                                  const cJSON *entry, struct rf_error *error)
{
    size_t row;
    const cJSON *old = cJSON_GetObjectItemCaseSensitive(document, "x_history");
    cJSON *list = old != NULL ? cJSON_Duplicate(old, true) : cJSON_CreateArray();
    cJSON *copy = cJSON_Duplicate(entry, true);
    char *json = NULL;
    if (list == NULL || copy == NULL || !cJSON_AddItemToArray(list, copy))
        cJSON_Delete(copy);
    else
        json = cJSON_PrintUnformatted(list);
    enum rf_status status =
        json != NULL ? key_row(grid, "x_history", &row, error) : fail_memory(error);
    if (status == RF_OK)
        status = set_cell(grid, row, 1, json, error);
    cJSON_free(json);
    cJSON_Delete(list);
    return status;
}

static void write_grid(const struct sheet_grid *grid, struct text *out)
{
    if (grid->mark)
        text_add(out, "\xEF\xBB\xBF");
    for (size_t i = 0; i < grid->n_rows; i++) {
        for (size_t j = 0; j < grid->rows[i].n_cells; j++) {
            if (j > 0)
                text_append(out, &grid->style.separator, 1);
            text_add(out, grid->rows[i].cells[j].raw);
        }
        text_add(out, grid->rows[i].end);
    }
}

enum rf_status sheet_edit(struct text *bytes, const char *source, const struct job_change *change,
                          const struct cJSON *document, const struct cJSON *entry,
                          struct rf_error *error)
{
    struct sheet_grid grid;
    struct text out = {0};
    enum rf_status status = sheet_grid_read(&grid, bytes->bytes, bytes->length, source, error);
    if (status == RF_OK)
        status = change->what == CHANGE_READING ? edit_reading(&grid, change, error)
                 : change->what == CHANGE_FOUND ? edit_found(&grid, change, error)
                                                : edit_mark(&grid, change, error);
    if (status == RF_OK && entry != NULL)
        status = add_history(&grid, document, entry, error);
    if (status == RF_OK)
        write_grid(&grid, &out);
    sheet_grid_finish(&grid);
    if (status == RF_OK && out.failed)
        status = fail_memory(error);
    if (status != RF_OK) {
        text_finish(&out);
        return status;
    }
    text_finish(bytes);
    *bytes = out;
    return RF_OK;
}
