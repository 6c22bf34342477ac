/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The rows of a sheet that are a key and what it says. */
#include "job/sheet_build.h"

#include "job/sheet_text.h"

#include <string.h>
#include <strings.h>

enum form { TEXT, NUMBER, READINGS, LIST, BOOLEAN, SETUPS, FORMAT };

struct key_row {
    const char *name;
    enum form form;
    const char *key;
    size_t into; /* where in struct sheet_build the object stands */
};

#define INTO(member) offsetof(struct sheet_build, member)
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

static size_t last_used(const struct sheet_build *building, size_t row)
{
    size_t column = building->grid->rows[row].n_cells;
    while (column > 1 && build_cell(building, row, column - 1)[0] == '\0')
        column--;
    return column - 1; /* 0: the key alone */
}

static void refuse_cells(struct sheet_build *building, size_t row, size_t last)
{
    building->status =
        sheet_fail(building->grid, row, 2, building->error,
                   "found a value in %zu cells; needs it in one: in quotes if it holds a %s", last,
                   building->grid->style.separator == ',' ? "comma" : "separator");
}

static void put_list(struct sheet_build *building, cJSON *into, const char *key, size_t row,
                     size_t last)
{
    cJSON *list = cJSON_CreateArray();
    build_put(building, into, key, list, row, 1);
    for (size_t i = 1; building->status == RF_OK && i <= last; i++)
        if (build_cell(building, row, i)[0] != '\0')
            build_put(building, list, NULL, sheet_text_value(build_cell(building, row, i)), row, i);
}

static void read_setups_row(struct sheet_build *building, size_t row, size_t last)
{
    for (size_t i = 1; building->status == RF_OK && i <= last; i++) {
        const char *name = build_cell(building, row, i);
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
        build_need(building, &building->setups[setup]);
        building->order[building->n_order++] = setup;
    }
}

static void put_boolean(struct sheet_build *building, cJSON *into, const char *key, size_t row)
{
    const char *text = build_cell(building, row, 1);
    bool yes = sheet_same_word(text, "yes") || sheet_same_word(text, "true");
    bool no = sheet_same_word(text, "no") || sheet_same_word(text, "false");
    build_put(building, into, key, yes || no ? cJSON_CreateBool(yes) : cJSON_CreateString(text),
              row, 1);
}

static void read_known_row(struct sheet_build *building, const struct key_row *key, cJSON **into,
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
        build_put_readings(building, &building->setups[0], key->key, row, 1, last);
        return;
    }
    if (key->form == SETUPS) {
        read_setups_row(building, row, last);
        return;
    }
    if (key->form == FORMAT) {
        if (!sheet_same_word(build_cell(building, row, 1), "ringfettle-sheet/1"))
            building->status = sheet_fail(building->grid, row, 1, building->error,
                                          "found \"%.80s\"; needs ringfettle-sheet/1",
                                          build_cell(building, row, 1));
        return;
    }
    if (build_need(building, into) == NULL)
        return;
    if (cJSON_GetObjectItemCaseSensitive(*into, key->key) != NULL)
        building->status = sheet_fail(building->grid, row, 0, building->error,
                                      "found \"%.80s\", which another row has said; needs it once",
                                      build_cell(building, row, 0));
    else if (key->form == TEXT)
        build_put_text(building, *into, key->key, row, 1);
    else if (key->form == NUMBER)
        build_put_number(building, *into, key->key, row, 1);
    else if (key->form == BOOLEAN)
        put_boolean(building, *into, key->key, row);
    else
        put_list(building, *into, key->key, row, last);
}

/* The object a path before an x_ key leads to ("ring.", "readings.cross_ln."); NULL: none. */
static cJSON **find_object(struct sheet_build *building, const char *path, size_t length)
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
static bool read_private_row(struct sheet_build *building, const char *key, size_t row)
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
    else if (last == 1 && build_need(building, into) != NULL)
        build_put(building, *into, own,
                  sheet_private_value(build_cell(building, row, 1), building->grid->style.decimal),
                  row, 1);
    return true;
}

static const struct key_row *find_row(const struct key_row rows[], size_t n, const char *name)
{
    for (size_t i = 0; i < n; i++)
        if (sheet_same_word(rows[i].name, name))
            return rows + i;
    return NULL;
}

static void refuse_key(struct sheet_build *building, const char *key, size_t row)
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

void sheet_read_key_row(struct sheet_build *building, size_t row)
{
    const char *key = build_cell(building, row, 0);
    if (key[0] == '\0') {
        if (last_used(building, row) > 0)
            building->status = sheet_fail(building->grid, row, 0, building->error,
                                          "found nothing before a value; needs its key");
        return;
    }
    for (size_t i = 0; i < row; i++)
        if ((i < building->grid->head || i >= building->grid->table) &&
            (strcmp(build_cell(building, i, 0), key) == 0 ||
             (find_row(key_rows, N_KEY_ROWS, key) != NULL &&
              sheet_same_word(build_cell(building, i, 0), key)))) {
            building->status = sheet_fail(building->grid, row, 0, building->error,
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
