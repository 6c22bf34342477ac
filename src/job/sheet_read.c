/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "job/sheet.h"

#include "base/error.h"
#include "base/memory.h"
#include "job/job_parse.h"
#include "job/setup.h"
#include "job/sheet_grid.h"
#include "job/sheet_text.h"

#include <string.h>
#include <strings.h>

/* --- where a value of the document stands in the sheet --- */

struct site {
    const cJSON *value;
    size_t row, column;
};

struct origin {
    struct json_origin base; /* first: json.h knows only it */
    struct sheet_grid grid;
    struct site *sites; /* ordered by value once the document is whole */
    size_t n_sites, capacity;
};

static int compare_sites(const void *one, const void *other)
{
    const struct site *a = one, *b = other;
    uintptr_t left = (uintptr_t)a->value, right = (uintptr_t)b->value;
    return left < right ? -1 : left > right;
}

static bool name_value(const struct json_origin *base, const cJSON *value, struct text *out)
{
    const struct origin *origin = (const struct origin *)base;
    struct site key = {.value = value};
    const struct site *site =
        origin->n_sites > 0
            ? bsearch(&key, origin->sites, origin->n_sites, sizeof key, compare_sites)
            : NULL;
    if (site == NULL)
        return false;
    sheet_name_cell(&origin->grid, site->row, site->column, out);
    return true;
}

void sheet_origin_destroy(struct json_origin *base)
{
    struct origin *origin = (struct origin *)base;
    if (origin == NULL)
        return;
    sheet_grid_finish(&origin->grid);
    free(origin->sites);
    free(origin);
}

/* --- the document as it grows --- */

enum column_holds { HOLDS_NOTHING, HOLDS_FIXED, HOLDS_SETUP, HOLDS_PRIVATE, HOLDS_ACCESS_PRIVATE };

struct column {
    enum column_holds holds;
    size_t which; /* a sheet_column or a set-up */
};

struct building {
    struct origin *origin;
    struct sheet_grid *grid;
    struct rf_error *error;
    enum rf_status status; /* the first refusal; what comes behind it does nothing */
    cJSON *document, *ring, *points, *spurs, *readings, *access, *found, *also;
    cJSON *setups[N_SETUPS];
    size_t order[N_SETUPS], n_order; /* set-ups named in a `setups` row, then as columns stand */
    cJSON *private_keys;             /* x_ at the top; they end the document */
    cJSON *opened, *checked;
    struct column *columns;
    size_t n_columns;
    bool *seen_rows; /* rows whose key has been met */
    struct text word;
};

static void refuse_memory(struct building *building)
{
    if (building->status == RF_OK)
        building->status = fail_memory(building->error);
}

/* Notes that `value` stands at a cell. */
static void note_site(struct building *building, const cJSON *value, size_t row, size_t column)
{
    struct origin *origin = building->origin;
    if (origin->n_sites == origin->capacity) {
        size_t capacity = origin->capacity > 0 ? 2 * origin->capacity : 256;
        struct site *sites = realloc(origin->sites, capacity * sizeof *sites);
        if (sites == NULL) {
            refuse_memory(building);
            return;
        }
        origin->sites = sites;
        origin->capacity = capacity;
    }
    origin->sites[origin->n_sites++] = (struct site){value, row, column};
}

/* Puts `value` (NULL: memory was short) into an object, or a list where `key` is NULL. */
static void put(struct building *building, cJSON *into, const char *key, cJSON *value, size_t row,
                size_t column)
{
    bool good = value != NULL && (key != NULL ? cJSON_AddItemToObject(into, key, value)
                                              : cJSON_AddItemToArray(into, value));
    if (!good) {
        cJSON_Delete(value);
        refuse_memory(building);
        return;
    }
    note_site(building, value, row, column);
}

/* An object made when it is first needed. */
static cJSON *need(struct building *building, cJSON **object)
{
    if (*object == NULL)
        *object = cJSON_CreateObject();
    if (*object == NULL)
        refuse_memory(building);
    return *object;
}

static const char *cell(const struct building *building, size_t row, size_t column)
{
    return sheet_cell_text(building->grid->rows + row, column);
}

static bool is_unread(const char *text)
{
    return strcmp(text, "-") == 0 || strcmp(text, "\xE2\x80\x93") == 0 ||
           strcmp(text, "\xE2\x80\x94") == 0; /* - and the dashes spreadsheets make of it */
}

/* A number, or the text as it stands for the job's reader to refuse. */
static cJSON *number_value(const struct building *building, const char *text)
{
    char json[64];
    if (!sheet_number(text, building->grid->style.decimal, json, sizeof json))
        return cJSON_CreateString(text);
    return cJSON_Parse(json);
}

static void put_number(struct building *building, cJSON *into, const char *key, size_t row,
                       size_t column)
{
    const char *text = cell(building, row, column);
    if (sheet_same_word(text, "unknown") || strcmp(text, "?") == 0)
        put(building, into, key, cJSON_CreateNull(), row, column);
    else if (text[0] != '\0' && !is_unread(text))
        put(building, into, key, number_value(building, text), row, column);
}

static void put_text(struct building *building, cJSON *into, const char *key, size_t row,
                     size_t column)
{
    const char *text = cell(building, row, column);
    if (text[0] != '\0')
        put(building, into, key, sheet_text_value(text), row, column);
}

/* The readings of the cells from `first` to `last` of a row, as one value under `key`. */
static void put_readings(struct building *building, cJSON **into, const char *key, size_t row,
                         size_t first, size_t last)
{
    cJSON *list = cJSON_CreateArray();
    if (list == NULL || need(building, into) == NULL) {
        cJSON_Delete(list);
        refuse_memory(building);
        return;
    }
    for (size_t column = first; column <= last; column++) {
        const char *at = cell(building, row, column);
        if (is_unread(at))
            continue;
        while (building->status == RF_OK && sheet_next_word(&at, &building->word)) {
            if (building->word.failed)
                refuse_memory(building);
            else
                put(building, list, NULL,
                    sheet_is_over_range(building->word.bytes)
                        ? cJSON_CreateString("open")
                        : number_value(building, building->word.bytes),
                    row, column);
        }
    }
    int n = cJSON_GetArraySize(list);
    if (n == 1 && building->status == RF_OK) {
        cJSON *only = cJSON_DetachItemFromArray(list, 0);
        if (!cJSON_AddItemToObject(*into, key, only)) {
            cJSON_Delete(only);
            refuse_memory(building);
        }
    }
    if (n > 1 && building->status == RF_OK)
        put(building, *into, key, list, row, first);
    else
        cJSON_Delete(list);
}

/* --- rows of a key and what it says --- */

enum form { TEXT, NUMBER, READINGS, LIST, BOOLEAN, SETUPS, FORMAT };

struct key_row {
    const char *name;
    enum form form;
    const char *key;
    size_t into; /* where in struct building the object stands */
};

#define INTO(member) offsetof(struct building, member)
static const struct key_row key_rows[] = {
    {"format", FORMAT, "format", INTO(document)},
    {"job", TEXT, "job", INTO(document)},
    {"date", TEXT, "date", INTO(document)},
    {"note", TEXT, "note", INTO(document)},
    {"instrument", TEXT, "x_instrument", INTO(private_keys)},
    {"live_mm2", NUMBER, "live_mm2", INTO(ring)},
    {"cpc_mm2", NUMBER, "cpc_mm2", INTO(ring)},
    {"temperature_c", NUMBER, "temperature_c", INTO(ring)},
    {"length_accuracy", NUMBER, "length_accuracy", INTO(ring)},
    {"order", TEXT, "order", INTO(ring)},
    {"setups", SETUPS, NULL, 0},
    {"r1", READINGS, "l", 0},
    {"rn", READINGS, "n", 0},
    {"r2", READINGS, "e", 0},
    {"opened", LIST, "opened", INTO(document)},
    {"checked", LIST, "checked", INTO(document)},
    {"found", TEXT, "family", INTO(found)},
};
static const struct key_row found_rows[] = {
    {"family", TEXT, "family", 0},       {"run", LIST, "run", 0},
    {"conductor", TEXT, "conductor", 0}, {"at", TEXT, "at", 0},
    {"open", BOOLEAN, "open", 0},        {"poles", TEXT, "poles", 0},
    {"between", LIST, "between", 0},     {"points", LIST, "points", 0},
    {"pair", TEXT, "pair", 0},           {"live_mm2", NUMBER, "live_mm2", 0},
    {"cpc_mm2", NUMBER, "cpc_mm2", 0},   {"leg", TEXT, "leg", 0},
    {"setup", TEXT, "setup", 0},         {"end", TEXT, "end", 0},
    {"ohms", NUMBER, "ohms", 0},         {"metres", NUMBER, "metres", 0},
};
enum {
    N_KEY_ROWS = sizeof key_rows / sizeof key_rows[0],
    N_FOUND_ROWS = sizeof found_rows / sizeof found_rows[0]
};

static size_t last_used(const struct building *building, size_t row)
{
    size_t column = building->grid->rows[row].n_cells;
    while (column > 1 && cell(building, row, column - 1)[0] == '\0')
        column--;
    return column - 1; /* 0: the key alone */
}

static void refuse_cells(struct building *building, size_t row, size_t last)
{
    building->status = sheet_fail(
        building->grid, row, 2, building->error,
        "found a value in %zu cells; needs it in one: in quotes if it holds a %s", last,
        building->grid->style.separator == ',' ? "comma" : "separator");
}

static void put_list(struct building *building, cJSON *into, const char *key, size_t row,
                     size_t last)
{
    cJSON *list = cJSON_CreateArray();
    put(building, into, key, list, row, 1);
    for (size_t i = 1; building->status == RF_OK && i <= last; i++)
        if (cell(building, row, i)[0] != '\0')
            put(building, list, NULL, sheet_text_value(cell(building, row, i)), row, i);
}

static void read_setups_row(struct building *building, size_t row, size_t last)
{
    for (size_t i = 1; building->status == RF_OK && i <= last; i++) {
        const char *name = cell(building, row, i);
        size_t setup = sheet_find_setup(name);
        if (name[0] == '\0')
            continue;
        for (size_t k = 0; k < building->n_order; k++)
            if (building->order[k] == setup)
                setup = N_SETUPS;
        if (setup == N_SETUPS) {
            building->status = sheet_fail(building->grid, row, i, building->error,
                                          "found \"%.80s\"; needs the names of set-ups, each "
                                          "once",
                                          name);
            return;
        }
        need(building, &building->setups[setup]);
        building->order[building->n_order++] = setup;
    }
}

static void put_boolean(struct building *building, cJSON *into, const char *key, size_t row)
{
    const char *text = cell(building, row, 1);
    bool yes = sheet_same_word(text, "yes") || sheet_same_word(text, "true");
    bool no = sheet_same_word(text, "no") || sheet_same_word(text, "false");
    put(building, into, key, yes || no ? cJSON_CreateBool(yes) : cJSON_CreateString(text), row, 1);
}

static void read_known_row(struct building *building, const struct key_row *key, cJSON **into,
                           size_t row)
{
    size_t last = last_used(building, row);
    if (last == 0)
        return;
    bool several = key->form == READINGS || key->form == LIST || key->form == SETUPS;
    if (last > 1 && !several) {
        refuse_cells(building, row, last);
        return;
    }
    if (key->form == READINGS) {
        put_readings(building, &building->setups[0], key->key, row, 1, last);
        return;
    }
    if (key->form == SETUPS) {
        read_setups_row(building, row, last);
        return;
    }
    if (key->form == FORMAT) {
        if (!sheet_same_word(cell(building, row, 1), "ringfettle-sheet/1"))
            building->status = sheet_fail(building->grid, row, 1, building->error,
                                          "found \"%.80s\"; needs ringfettle-sheet/1",
                                          cell(building, row, 1));
        return;
    }
    if (need(building, into) == NULL)
        return;
    if (cJSON_GetObjectItemCaseSensitive(*into, key->key) != NULL)
        building->status = sheet_fail(building->grid, row, 0, building->error,
                                      "found \"%.80s\", which another row has said; needs it once",
                                      cell(building, row, 0));
    else if (key->form == TEXT)
        put_text(building, *into, key->key, row, 1);
    else if (key->form == NUMBER)
        put_number(building, *into, key->key, row, 1);
    else if (key->form == BOOLEAN)
        put_boolean(building, *into, key->key, row);
    else
        put_list(building, *into, key->key, row, last);
}

/* The object a path before an x_ key leads to ("ring.", "readings.cross_ln."); NULL: none. */
static cJSON **find_object(struct building *building, const char *path, size_t length)
{
    static const struct {
        const char *path;
        size_t into;
    } objects[] = {
        {"", INTO(private_keys)},  {"ring.", INTO(ring)},   {"readings.", INTO(readings)},
        {"access.", INTO(access)}, {"found.", INTO(found)}, {"found.also.", INTO(also)},
    };
    for (size_t i = 0; i < sizeof objects / sizeof objects[0]; i++)
        if (strlen(objects[i].path) == length && strncmp(objects[i].path, path, length) == 0)
            return (cJSON **)(void *)((char *)building + objects[i].into);
    char name[32];
    if (length > 10 && length - 10 < sizeof name && strncmp(path, "readings.", 9) == 0) {
        memcpy(name, path + 9, length - 10);
        name[length - 10] = '\0';
        size_t setup = sheet_find_setup(name);
        if (setup < N_SETUPS)
            return &building->setups[setup];
    }
    return NULL;
}

/* A row whose key is a user's own: false where it is not. */
static bool read_private_row(struct building *building, const char *key, size_t row)
{
    const char *own = strncmp(key, "x_", 2) == 0 ? key : NULL;
    if (own == NULL) {
        own = strstr(key, ".x_");
        if (own == NULL)
            return false;
        own++;
    }
    cJSON **into = find_object(building, key, (size_t)(own - key));
    size_t last = last_used(building, row);
    if (into == NULL)
        return false;
    if (last > 1)
        refuse_cells(building, row, last);
    else if (last == 1 && need(building, into) != NULL)
        put(building, *into, own,
            sheet_private_value(cell(building, row, 1), building->grid->style.decimal), row, 1);
    return true;
}

static const struct key_row *find_row(const struct key_row rows[], size_t n, const char *name)
{
    for (size_t i = 0; i < n; i++)
        if (sheet_same_word(rows[i].name, name))
            return rows + i;
    return NULL;
}

static void refuse_key(struct building *building, const char *key, size_t row)
{
    const char *names[N_KEY_ROWS];
    for (size_t i = 0; i < N_KEY_ROWS; i++)
        names[i] = key_rows[i].name;
    const char *nearest = text_nearest(key, names, N_KEY_ROWS);
    if (nearest != NULL)
        building->status = sheet_fail(building->grid, row, 0, building->error,
                                      "found \"%.80s\"; did you mean \"%s\"?", key, nearest);
    else
        building->status = sheet_fail(
            building->grid, row, 0, building->error, "found \"%.80s\"; needs %s", key,
            row >= building->grid->table
                ? "a key of the sheet (an empty row ends the table of places)"
                : "a key of the sheet, such as job, date or live_mm2; keys of your own begin x_");
}

static void read_key_row(struct building *building, size_t row)
{
    const char *key = cell(building, row, 0);
    if (key[0] == '\0') {
        if (last_used(building, row) > 0)
            building->status = sheet_fail(building->grid, row, 0, building->error,
                                          "found nothing before a value; needs its key");
        return;
    }
    for (size_t i = 0; i < row; i++)
        if ((i < building->grid->head || i >= building->grid->table) &&
            (strcmp(cell(building, i, 0), key) == 0 ||
             (find_row(key_rows, N_KEY_ROWS, key) != NULL &&
              sheet_same_word(cell(building, i, 0), key)))) {
            building->status =
                sheet_fail(building->grid, row, 0, building->error,
                           "found \"%.80s\", as in row %zu; needs it once", key,
                           building->grid->rows[i].number);
            return;
        }

    const struct key_row *known = find_row(key_rows, N_KEY_ROWS, key);
    if (known != NULL) {
        read_known_row(building, known, (cJSON **)(void *)((char *)building + known->into), row);
        return;
    }
    if (read_private_row(building, key, row))
        return;
    bool also = strncasecmp(key, "found.also.", 11) == 0;
    if (also || strncasecmp(key, "found.", 6) == 0)
        known = find_row(found_rows, N_FOUND_ROWS, key + (also ? 11 : 6));
    if (known != NULL)
        read_known_row(building, known, also ? &building->also : &building->found, row);
    else
        refuse_key(building, key, row);
}

/* --- the table --- */

static enum rf_status know_column(struct building *building, size_t column)
{
    const struct sheet_grid *grid = building->grid;
    struct column *holds = building->columns + column;
    const char *name = cell(building, grid->head, column);
    for (size_t i = 0; i < column; i++)
        if (name[0] != '\0' && sheet_same_word(cell(building, grid->head, i), name) &&
            strncmp(name, "x_", 2) != 0 && strncmp(name, "access.", 7) != 0)
            return sheet_fail(grid, grid->head, column, building->error,
                              "found \"%.80s\" twice; needs a column once", name);
        else if (name[0] != '\0' && strcmp(cell(building, grid->head, i), name) == 0)
            return sheet_fail(grid, grid->head, column, building->error,
                              "found \"%.80s\" twice; needs a column once", name);
    if (name[0] == '\0')
        return RF_OK;
    *holds = (struct column){HOLDS_FIXED, 0};
    for (; holds->which < N_COLUMNS; holds->which++)
        if (sheet_same_word(sheet_columns[holds->which], name))
            return RF_OK;
    *holds = (struct column){HOLDS_SETUP, sheet_find_setup(name)};
    if (holds->which < N_SETUPS && holds->which != 0)
        return RF_OK;
    holds->holds = strncmp(name, "x_", 2) == 0          ? HOLDS_PRIVATE
                   : strncmp(name, "access.x_", 9) == 0 ? HOLDS_ACCESS_PRIVATE
                                                        : HOLDS_NOTHING;
    if (holds->holds != HOLDS_NOTHING)
        return RF_OK;
    if (holds->which == 0)
        return sheet_fail(grid, grid->head, column, building->error,
                          "found \"end_to_end\"; needs its readings in rows r1, rn and r2");

    const char *names[N_COLUMNS + N_SETUPS];
    for (size_t i = 0; i < N_COLUMNS; i++)
        names[i] = sheet_columns[i];
    for (size_t i = 0; i < N_SETUPS; i++)
        names[N_COLUMNS + i] = setups[i].name;
    const char *nearest = text_nearest(name, names, N_COLUMNS + N_SETUPS);
    return nearest != NULL
               ? sheet_fail(grid, grid->head, column, building->error,
                            "found \"%.80s\"; did you mean \"%s\"?", name, nearest)
               : sheet_fail(grid, grid->head, column, building->error,
                            "found \"%.80s\"; needs place, label, kind, metres, from, live_mm2, "
                            "cpc_mm2, reach_min, open_min, the name of a set-up, or a name of "
                            "your own that begins x_",
                            name);
}

static bool is_special(const char *place)
{
    static const char *const special[] = {"board", "highest", "out", "in"};
    for (size_t i = 0; i < sizeof special / sizeof special[0]; i++)
        if (sheet_same_word(special[i], place))
            return true;
    return false;
}

static void put_fixed(struct building *building, cJSON *point, enum sheet_column which,
                      size_t row, size_t column)
{
    static const char *const keys[N_COLUMNS] = {
        [COLUMN_PLACE] = "id",  [COLUMN_LABEL] = "label",   [COLUMN_KIND] = "kind",
        [COLUMN_FROM] = "from", [COLUMN_METRES] = "run_m",  [COLUMN_LIVE] = "live_mm2",
        [COLUMN_CPC] = "cpc_mm2",
    };
    if (which == COLUMN_METRES || which == COLUMN_LIVE || which == COLUMN_CPC)
        put_number(building, point, keys[which], row, column);
    else if (which != COLUMN_REACH && which != COLUMN_OPEN)
        put_text(building, point, keys[which], row, column);
}

/* `access`: a number alone where only opening is given. */
static void put_access(struct building *building, const char *key, size_t row)
{
    cJSON *access = cJSON_CreateObject();
    if (access == NULL) {
        refuse_memory(building);
        return;
    }
    for (size_t i = 1; i < building->n_columns && building->status == RF_OK; i++) {
        const struct column *column = building->columns + i;
        const char *text = cell(building, row, i);
        if (column->holds == HOLDS_FIXED && column->which == COLUMN_REACH)
            put_number(building, access, "reach", row, i);
        else if (column->holds == HOLDS_FIXED && column->which == COLUMN_OPEN)
            put_number(building, access, "open", row, i);
        else if (column->holds == HOLDS_ACCESS_PRIVATE && text[0] != '\0')
            put(building, access, cell(building, building->grid->head, i) + strlen("access."),
                sheet_private_value(text, building->grid->style.decimal), row, i);
    }
    if (access->child == NULL || need(building, &building->access) == NULL) {
        cJSON_Delete(access);
        return;
    }
    if (access->child->next == NULL && strcmp(access->child->string, "open") == 0) {
        cJSON *alone = cJSON_DetachItemViaPointer(access, access->child);
        cJSON_Delete(access);
        access = alone;
        if (!cJSON_AddItemToObject(building->access, key, alone)) {
            cJSON_Delete(alone);
            refuse_memory(building);
        }
    } else {
        put(building, building->access, key, access, row, 0);
    }
}

/* What the row of an end, of the board or of `highest` may say about it: `in` the last run's
 * metres, `board` the minutes. */
static void read_special_row(struct building *building, const char *place, size_t row)
{
    bool in = strcmp(place, "in") == 0;
    for (size_t i = 1; i < building->n_columns && building->status == RF_OK; i++) {
        const struct column *column = building->columns + i;
        if (cell(building, row, i)[0] == '\0' || column->holds == HOLDS_SETUP ||
            column->holds == HOLDS_NOTHING)
            continue;
        bool minutes = column->holds == HOLDS_ACCESS_PRIVATE ||
                       (column->holds == HOLDS_FIXED &&
                        (column->which == COLUMN_REACH || column->which == COLUMN_OPEN));
        if (in && column->holds == HOLDS_FIXED && column->which == COLUMN_METRES) {
            if (need(building, &building->ring) != NULL)
                put_number(building, building->ring, "last_run_m", row, i);
        } else if (!(minutes && strcmp(place, "board") == 0)) {
            building->status =
                sheet_fail(building->grid, row, i, building->error,
                           "found \"%.80s\"; needs nothing here: \"%s\" is no point",
                           cell(building, row, i), place);
        }
    }
}

static void read_point_row(struct building *building, size_t row)
{
    cJSON *point = cJSON_CreateObject();
    if (point == NULL) {
        refuse_memory(building);
        return;
    }
    bool spur = false;
    for (size_t i = 0; i < building->n_columns && building->status == RF_OK; i++) {
        const struct column *column = building->columns + i;
        const char *text = cell(building, row, i);
        if (column->holds == HOLDS_FIXED) {
            put_fixed(building, point, (enum sheet_column)column->which, row, i);
            spur |= column->which == COLUMN_FROM && text[0] != '\0';
        } else if (column->holds == HOLDS_PRIVATE && text[0] != '\0') {
            put(building, point, cell(building, building->grid->head, i),
                sheet_private_value(text, building->grid->style.decimal), row, i);
        }
    }
    cJSON **list = spur ? &building->spurs : &building->points;
    if (*list == NULL)
        *list = cJSON_CreateArray();
    if (*list == NULL) {
        cJSON_Delete(point);
        refuse_memory(building);
        return;
    }
    put(building, *list, NULL, point, row, 0);
}

/* Whether an earlier row is of the same place; the job's reader sees ids twice, but not the
 * board's. */
static bool refuse_twice(struct building *building, const char *place, size_t row)
{
    for (size_t i = building->grid->head + 1; i < row; i++)
        if (strcmp(cell(building, i, 0), place) == 0) {
            building->status = sheet_fail(building->grid, row, 0, building->error,
                                          "found \"%.80s\", as in row %zu; needs a place once",
                                          place, building->grid->rows[i].number);
            return true;
        }
    return false;
}

static void read_table_row(struct building *building, size_t row)
{
    char word[16];
    const char *place = cell(building, row, 0);
    cJSON *text = NULL;
    if (place[0] == '\0') {
        building->status = sheet_fail(building->grid, row, 0, building->error,
                                      "found nothing; needs a place: board, out, in, or a "
                                      "point's id");
        return;
    }
    for (size_t i = building->n_columns; i-- > 0;)
        if (building->columns[i].holds == HOLDS_NOTHING && cell(building, row, i)[0] != '\0') {
            building->status = sheet_fail(building->grid, row, i, building->error,
                                          "found \"%.80s\" in a column without a name; needs its "
                                          "name in row %zu",
                                          cell(building, row, i),
                                          building->grid->rows[building->grid->head].number);
            return;
        }
    if (is_special(place)) {
        size_t n = 0;
        for (; place[n] != '\0'; n++)
            word[n] = (char)(place[n] | 0x20); /* is_special has seen ASCII letters only */
        word[n] = '\0';
        place = word;
    } else {
        text = sheet_text_value(place);
        if (text == NULL) {
            refuse_memory(building);
            return;
        }
        place = text->valuestring;
    }
    if (!refuse_twice(building, cell(building, row, 0), row)) {
        if (text == NULL)
            read_special_row(building, place, row);
        else
            read_point_row(building, row);
        if (building->status == RF_OK && (text != NULL || strcmp(place, "board") == 0))
            put_access(building, place, row);
    }
    for (size_t i = 1; i < building->n_columns && building->status == RF_OK; i++)
        if (building->columns[i].holds == HOLDS_SETUP && cell(building, row, i)[0] != '\0')
            put_readings(building, &building->setups[building->columns[i].which], place, row, i,
                         i);
    cJSON_Delete(text);
}

static void read_table(struct building *building)
{
    struct sheet_grid *grid = building->grid;
    building->n_columns = grid->rows[grid->head].n_cells;
    building->columns = NEW_ARRAY(struct column, building->n_columns);
    if (building->columns == NULL) {
        refuse_memory(building);
        return;
    }
    for (size_t i = 0; building->status == RF_OK && i < building->n_columns; i++)
        building->status = know_column(building, i);
    for (size_t i = grid->head + 1; building->status == RF_OK && i < grid->table; i++)
        read_table_row(building, i);
}

/* --- put together --- */

/* The set-ups in the order they were made: as a `setups` row says, end to end first, then as
 * the columns stand. */
static void order_setups(struct building *building)
{
    bool placed[N_SETUPS] = {false};
    for (size_t i = 0; i < building->n_order; i++)
        placed[building->order[i]] = true;
    if (!placed[0])
        building->order[building->n_order++] = 0;
    placed[0] = true;
    for (size_t i = 0; i < building->n_columns; i++) {
        size_t setup = building->columns[i].which;
        if (building->columns[i].holds == HOLDS_SETUP && !placed[setup]) {
            placed[setup] = true;
            building->order[building->n_order++] = setup;
        }
    }
    for (size_t i = 0; i < N_SETUPS; i++) /* those with keys of the user's own only */
        if (!placed[i])
            building->order[building->n_order++] = i;
}

/* Hands `part` over into `into`, where there is any. */
static void hand_over(struct building *building, cJSON *into, const char *key, cJSON **part)
{
    if (*part == NULL || building->status != RF_OK)
        return;
    if (!cJSON_AddItemToObject(into, key, *part))
        refuse_memory(building);
    else
        *part = NULL;
}

static bool names_nothing(const cJSON *setup)
{
    return setup->child == NULL;
}

static void assemble_readings(struct building *building, size_t n_named)
{
    for (size_t i = 0; i < building->n_order && building->status == RF_OK; i++) {
        cJSON **setup = &building->setups[building->order[i]];
        if (*setup == NULL || (names_nothing(*setup) && i >= n_named))
            continue;
        if (need(building, &building->readings) != NULL)
            hand_over(building, building->readings, setups[building->order[i]].name, setup);
    }
}

static void assemble(struct building *building)
{
    cJSON *list = building->document; /* so far: job, date, note, opened, checked */
    building->opened = cJSON_DetachItemFromObjectCaseSensitive(list, "opened");
    building->checked = cJSON_DetachItemFromObjectCaseSensitive(list, "checked");
    size_t n_named = building->n_order;
    order_setups(building);
    if (need(building, &building->ring) != NULL) {
        cJSON *last = cJSON_DetachItemFromObjectCaseSensitive(building->ring, "last_run_m");
        hand_over(building, building->ring, "points", &building->points);
        hand_over(building, building->ring, "last_run_m", &last);
        hand_over(building, building->ring, "spurs", &building->spurs);
        cJSON_Delete(last);
    }
    hand_over(building, list, "ring", &building->ring);
    need(building, &building->readings); /* that there is none in it is then the complaint */
    assemble_readings(building, n_named);
    hand_over(building, list, "readings", &building->readings);
    hand_over(building, list, "access", &building->access);
    hand_over(building, list, "opened", &building->opened);
    hand_over(building, list, "checked", &building->checked);
    if (building->also != NULL && need(building, &building->found) != NULL)
        hand_over(building, building->found, "also", &building->also);
    hand_over(building, list, "found", &building->found);
    while (building->status == RF_OK && building->private_keys != NULL &&
           building->private_keys->child != NULL) {
        cJSON *own = building->private_keys->child;
        char *key = text_duplicate(own->string);
        own = cJSON_DetachItemViaPointer(building->private_keys, own);
        if (key == NULL || !cJSON_AddItemToObject(list, key, own)) {
            cJSON_Delete(own);
            refuse_memory(building);
        }
        free(key);
    }
}

static void finish_building(struct building *building)
{
    cJSON *parts[] = {building->document, building->ring,   building->points,
                      building->spurs,    building->readings, building->access,
                      building->found,    building->also,   building->private_keys,
                      building->opened,   building->checked};
    for (size_t i = 0; i < sizeof parts / sizeof parts[0]; i++)
        cJSON_Delete(parts[i]);
    for (size_t i = 0; i < N_SETUPS; i++)
        cJSON_Delete(building->setups[i]);
    free(building->columns);
    text_finish(&building->word);
}

static bool is_of_key(char byte)
{
    return (byte >= 'a' && byte <= 'z') || (byte >= 'A' && byte <= 'Z') ||
           (byte >= '0' && byte <= '9') || byte == '_' || byte == '.' || byte == ' ' ||
           byte == '-' || (unsigned char)byte >= 0x80;
}

bool sheet_first_line(const char *line, size_t length)
{
    size_t i = 0;
    while (i < length && line[i] == ' ')
        i++;
    if (i < length && line[i] == '"')
        i++;
    while (i < length && is_of_key(line[i]))
        i++;
    if (i < length && line[i] == '"')
        i++;
    while (i < length && line[i] == ' ')
        i++;
    return i < length && (line[i] == ',' || line[i] == ';' || line[i] == '\t');
}

enum rf_status sheet_parse(const char *bytes, size_t length, const char *source, cJSON **document,
                           struct json_origin **origin, struct rf_error *error)
{
    *document = NULL;
    *origin = NULL;
    struct origin *made = NEW(struct origin);
    if (made == NULL)
        return fail_memory(error);
    made->base.name = name_value;
    struct building building = {.origin = made, .grid = &made->grid, .error = error};

    building.status = sheet_grid_read(&made->grid, bytes, length, source, error);
    if (building.status == RF_OK && need(&building, &building.document) != NULL &&
        cJSON_AddStringToObject(building.document, "format", "ringfettle-job/1") == NULL)
        refuse_memory(&building);
    for (size_t i = 0; building.status == RF_OK && i < made->grid.n_rows; i++)
        if (i < made->grid.head || i >= made->grid.table)
            read_key_row(&building, i);
    if (building.status == RF_OK)
        read_table(&building);
    if (building.status == RF_OK)
        assemble(&building);
    if (building.status == RF_OK) {
        if (made->n_sites > 0)
            qsort(made->sites, made->n_sites, sizeof *made->sites, compare_sites);
        *document = building.document;
        *origin = &made->base;
        building.document = NULL;
    } else {
        sheet_origin_destroy(&made->base);
    }
    finish_building(&building);
    return building.status;
}

enum rf_status sheet_job_parse(const char *bytes, size_t length, const char *source,
                               enum json_lines lines, struct rf_job **job,
                               struct rf_error *error)
{
    cJSON *document;
    struct json_origin *origin;
    (void)lines;
    *job = NULL;
    enum rf_status status = sheet_parse(bytes, length, source, &document, &origin, error);
    if (status == RF_OK)
        status = job_from_document(document, origin, source, 1, job, error);
    sheet_origin_destroy(origin);
    return status;
}
