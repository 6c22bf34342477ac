/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "job/sheet.h"

#include "base/csv.h"
#include "base/error.h"
#include "job/setup.h"
#include "job/sheet_grid.h"
#include "job/sheet_text.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { MAX_OWN = 64 }; /* names of columns of the user's own, beyond which writing is refused */

struct writing {
    const cJSON *document, *ring, *readings, *access;
    const struct sheet_style *style;
    struct text *out;
    struct text cell; /* the one being written */
    size_t n_cells;   /* written in this row */
    bool columns[N_COLUMNS];
    size_t setups[N_SETUPS], n_setups;
    const char *own[MAX_OWN], *access_own[MAX_OWN];
    size_t n_own, n_access_own;
    bool too_many;
};

static const cJSON *member(const cJSON *object, const char *key)
{
    return cJSON_IsObject(object) ? cJSON_GetObjectItemCaseSensitive(object, key) : NULL;
}

static bool is_private(const cJSON *value)
{
    return json_is_private(value->string);
}

/* --- cells --- */

static void put_cell(struct writing *writing)
{
    if (writing->n_cells++ > 0)
        text_append(writing->out, &writing->style->separator, 1);
    if (writing->cell.length > 0)
        csv_add_cell(writing->out, writing->cell.bytes, writing->cell.length,
                     writing->style->separator);
    if (writing->cell.failed)
        writing->out->failed = true;
    text_clear(&writing->cell);
}

static void put_word(struct writing *writing, const char *word)
{
    text_add(&writing->cell, word);
    put_cell(writing);
}

static void end_row(struct writing *writing)
{
    text_add(writing->out, "\n");
    writing->n_cells = 0;
}

/* Appends a value to the cell: a number, "unknown" for null, a text; nothing for none. */
static void add_plain(struct writing *writing, const cJSON *value)
{
    if (cJSON_IsNumber(value))
        sheet_add_number(value->valuedouble, writing->style->decimal, &writing->cell);
    else if (cJSON_IsNull(value))
        text_add(&writing->cell, "unknown");
    else if (cJSON_IsBool(value))
        text_add(&writing->cell, cJSON_IsTrue(value) ? "yes" : "no");
    else if (cJSON_IsString(value))
        sheet_add_text(value->valuestring, &writing->cell);
}

/* A reading with two decimals, as a meter shows it, where it has no more. */
static void add_ohms(struct writing *writing, const cJSON *value)
{
    char digits[32];
    if (!cJSON_IsNumber(value) || value->valuedouble < 0 || value->valuedouble > 1000) {
        add_plain(writing, value);
        return;
    }
    snprintf(digits, sizeof digits, "%.2f", value->valuedouble);
    double back = strtod(digits, NULL);
    if (back < value->valuedouble || back > value->valuedouble) {
        add_plain(writing, value);
        return;
    }
    for (char *at = digits; *at != '\0'; at++) /* whatever mark the program's locale has */
        if (*at < '0' || *at > '9')
            *at = writing->style->decimal;
    text_add(&writing->cell, digits);
}

/* Readings, a space between repeats. */
static void add_readings(struct writing *writing, const cJSON *value)
{
    const cJSON *first = cJSON_IsArray(value) ? value->child : value;
    for (const cJSON *one = first; one != NULL; one = value == first ? NULL : one->next) {
        if (one != first)
            text_add(&writing->cell, " ");
        add_ohms(writing, one);
    }
}

/* The user's own numbers do not show a sheet's decimal mark, and where no other does, it is taken from
 * the separator. With a point they are read either way. */
static void add_private(struct writing *writing, const cJSON *own)
{
    char decimal = writing->style->separator == ';' ? writing->style->decimal : '.';
    sheet_add_private(own, decimal, &writing->cell);
}

/* --- rows of a key --- */

static void put_row(struct writing *writing, const char *key, const cJSON *value)
{
    if (value == NULL)
        return;
    put_word(writing, key);
    add_plain(writing, value);
    put_cell(writing);
    end_row(writing);
}

static void put_list_row(struct writing *writing, const char *key, const cJSON *list)
{
    if (!cJSON_IsArray(list))
        return;
    put_word(writing, key);
    for (const cJSON *one = list->child; one != NULL; one = one->next) {
        add_plain(writing, one);
        put_cell(writing);
    }
    end_row(writing);
}

/* Rows for the user's own keys of an object; `path` leads to it. Keys that are points' ids are
 * none (NULL: there are no ids among the keys). */
static void put_private_rows(struct writing *writing, const cJSON *object, const char *path,
                             bool (*is_id)(const struct writing *, const char *))
{
    if (!cJSON_IsObject(object))
        return;
    for (const cJSON *own = object->child; own != NULL; own = own->next) {
        if (!is_private(own) || (is_id != NULL && is_id(writing, own->string)))
            continue;
        if (strcmp(own->string, "x_instrument") == 0 && path[0] == '\0' && cJSON_IsString(own)) {
            put_row(writing, "instrument", own);
            continue;
        }
        text_add(&writing->cell, path);
        put_word(writing, own->string);
        add_private(writing, own);
        put_cell(writing);
        end_row(writing);
    }
}

static bool list_has_id(const cJSON *list, const char *id)
{
    const cJSON *point;
    cJSON_ArrayForEach(point, list) {
        const cJSON *has = member(point, "id");
        if (cJSON_IsString(has) && strcmp(has->valuestring, id) == 0)
            return true;
    }
    return false;
}

static bool is_point_id(const struct writing *writing, const char *key)
{
    return list_has_id(member(writing->ring, "points"), key) ||
           list_has_id(member(writing->ring, "spurs"), key);
}

static void put_found(struct writing *writing, const cJSON *found, const char *path)
{
    if (!cJSON_IsObject(found))
        return;
    for (const cJSON *field = found->child; field != NULL; field = field->next) {
        struct text key = {0};
        if (is_private(field) || strcmp(field->string, "also") == 0)
            continue;
        text_addf(&key, "%s%s", path, field->string);
        if (key.failed)
            writing->out->failed = true;
        else if (cJSON_IsArray(field))
            put_list_row(writing, key.bytes, field);
        else if (strcmp(key.bytes, "found.family") == 0)
            put_row(writing, "found", field);
        else
            put_row(writing, key.bytes, field);
        text_finish(&key);
    }
    put_private_rows(writing, found, path, NULL);
}

/* The order of the set-ups, where it cannot be told from the columns: end to end not first, or a
 * set-up without a reading. */
static void put_setups_row(struct writing *writing)
{
    bool tell = false;
    size_t n = 0;
    const cJSON *setup;
    cJSON_ArrayForEach(setup, writing->readings) {
        if (is_private(setup))
            continue;
        bool read = false;
        for (const cJSON *reading = setup->child; reading != NULL; reading = reading->next)
            read |= !is_private(reading) || is_point_id(writing, reading->string);
        tell |= !read || (n > 0 && strcmp(setup->string, setups[0].name) == 0);
        n++;
    }
    if (!tell)
        return;
    put_word(writing, "setups");
    cJSON_ArrayForEach(setup, writing->readings) {
        if (!is_private(setup))
            put_word(writing, setup->string);
    }
    end_row(writing);
}

static void put_head(struct writing *writing)
{
    static const char *const texts[] = {"job", "date", "note"};
    static const char *const numbers[] = {"live_mm2", "cpc_mm2", "temperature_c", "length_accuracy",
                                          "order"};
    const cJSON *ends = member(writing->readings, setups[0].name);
    put_word(writing, "format");
    put_word(writing, "ringfettle-sheet/1");
    end_row(writing);
    for (size_t i = 0; i < sizeof texts / sizeof texts[0]; i++)
        put_row(writing, texts[i], member(writing->document, texts[i]));
    for (size_t i = 0; i < sizeof numbers / sizeof numbers[0]; i++)
        put_row(writing, numbers[i], member(writing->ring, numbers[i]));
    put_setups_row(writing);
    for (size_t i = 0; i < 3; i++) {
        const cJSON *end = member(ends, sheet_end_keys[i]);
        bool asked = writing->n_setups > 0 && writing->setups[0] == 0;
        if (end == NULL && !asked)
            continue;
        put_word(writing, sheet_end_rows[i]);
        add_readings(writing, end);
        put_cell(writing);
        end_row(writing);
    }
    put_list_row(writing, "opened", member(writing->document, "opened"));
    put_list_row(writing, "checked", member(writing->document, "checked"));
    put_found(writing, member(writing->document, "found"), "found.");
    put_found(writing, member(member(writing->document, "found"), "also"), "found.also.");
    put_private_rows(writing, writing->document, "", NULL);
    put_private_rows(writing, writing->ring, "ring.", NULL);
    put_private_rows(writing, writing->readings, "readings.", NULL);
    put_private_rows(writing, writing->access, "access.", is_point_id);
    const cJSON *setup;
    cJSON_ArrayForEach(setup, writing->readings) {
        struct text path = {0};
        text_addf(&path, "readings.%s.", setup->string);
        if (path.failed)
            writing->out->failed = true;
        else if (!is_private(setup))
            put_private_rows(writing, setup, path.bytes, is_point_id);
        text_finish(&path);
    }
}

/* --- the table --- */

static void note_own(struct writing *writing, const char *names[MAX_OWN], size_t *n,
                     const cJSON *object)
{
    if (!cJSON_IsObject(object))
        return;
    for (const cJSON *own = object->child; own != NULL; own = own->next) {
        size_t i = 0;
        if (!is_private(own))
            continue;
        while (i < *n && strcmp(names[i], own->string) != 0)
            i++;
        if (i == MAX_OWN)
            writing->too_many = true;
        else if (i == *n)
            names[(*n)++] = own->string;
    }
}

static const char *const column_keys[N_COLUMNS] = {
    [COLUMN_LABEL] = "label", [COLUMN_KIND] = "kind",     [COLUMN_METRES] = "run_m",
    [COLUMN_FROM] = "from",   [COLUMN_LIVE] = "live_mm2", [COLUMN_CPC] = "cpc_mm2",
};

static void note_columns_of(struct writing *writing, const cJSON *list)
{
    const cJSON *point;
    cJSON_ArrayForEach(point, list) {
        for (size_t i = 0; i < N_COLUMNS; i++)
            if (column_keys[i] != NULL && member(point, column_keys[i]) != NULL)
                writing->columns[i] = true;
        note_own(writing, writing->own, &writing->n_own, point);
    }
}

static void note_access_of(struct writing *writing, const char *place)
{
    note_own(writing, writing->access_own, &writing->n_access_own, member(writing->access, place));
}

/* In the order of places, so that a sheet read and written again is the same. */
static void note_access_of_points(struct writing *writing, const cJSON *list)
{
    const cJSON *point;
    cJSON_ArrayForEach(point, list) {
        const cJSON *id = member(point, "id");
        if (cJSON_IsString(id))
            note_access_of(writing, id->valuestring);
    }
}

static void note_setup(struct writing *writing, size_t setup)
{
    for (size_t i = 0; i < writing->n_setups; i++)
        if (writing->setups[i] == setup)
            return;
    writing->setups[writing->n_setups++] = setup;
}

/* Which columns the table needs. */
static void note_columns(struct writing *writing, const size_t wanted[], size_t n)
{
    writing->columns[COLUMN_PLACE] = writing->columns[COLUMN_LABEL] = true;
    writing->columns[COLUMN_METRES] = true;
    note_columns_of(writing, member(writing->ring, "points"));
    note_columns_of(writing, member(writing->ring, "spurs"));
    const cJSON *item;
    cJSON_ArrayForEach(item, writing->access) {
        if (is_private(item) && !is_point_id(writing, item->string))
            continue;
        writing->columns[COLUMN_OPEN] |= cJSON_IsNumber(item) || member(item, "open") != NULL;
        writing->columns[COLUMN_REACH] |= member(item, "reach") != NULL;
    }
    note_access_of(writing, "board");
    note_access_of_points(writing, member(writing->ring, "points"));
    note_access_of_points(writing, member(writing->ring, "spurs"));
    for (size_t i = 0; i < n; i++)
        if (wanted[i] == 0) /* end to end: rows, the first */
            note_setup(writing, 0);
    cJSON_ArrayForEach(item, writing->readings) {
        size_t setup = setup_find(item->string);
        if (setup != N_SETUPS && setup != 0)
            note_setup(writing, setup);
    }
    for (size_t i = 0; i < n; i++)
        note_setup(writing, wanted[i]);
}

static void put_column_names(struct writing *writing)
{
    for (size_t i = 0; i < N_COLUMNS; i++)
        if (writing->columns[i])
            put_word(writing, sheet_columns[i]);
    for (size_t i = 0; i < writing->n_own; i++)
        put_word(writing, writing->own[i]);
    for (size_t i = 0; i < writing->n_access_own; i++) {
        text_add(&writing->cell, "access.");
        put_word(writing, writing->access_own[i]);
    }
    for (size_t i = 0; i < writing->n_setups; i++)
        if (writing->setups[i] != 0)
            put_word(writing, setups[writing->setups[i]].name);
    end_row(writing);
}

/* One place. `point`: its object, NULL for the board, the ends and `highest`. */
static void put_place(struct writing *writing, const char *place, const cJSON *point)
{
    const cJSON *access = member(writing->access, place);
    if (point != NULL)
        sheet_add_text(place, &writing->cell);
    else
        text_add(&writing->cell, place);
    put_cell(writing);
    for (size_t i = 1; i < N_COLUMNS; i++) {
        if (!writing->columns[i])
            continue;
        if (i == COLUMN_REACH)
            add_plain(writing, member(access, "reach"));
        else if (i == COLUMN_OPEN)
            add_plain(writing, cJSON_IsNumber(access) ? access : member(access, "open"));
        else if (point != NULL)
            add_plain(writing, member(point, column_keys[i]));
        else if (i == COLUMN_METRES && strcmp(place, "in") == 0)
            add_plain(writing, member(writing->ring, "last_run_m"));
        put_cell(writing);
    }
    for (size_t i = 0; i < writing->n_own + writing->n_access_own; i++) {
        const cJSON *own = i < writing->n_own
                               ? member(point, writing->own[i])
                               : member(access, writing->access_own[i - writing->n_own]);
        if (own != NULL)
            add_private(writing, own);
        put_cell(writing);
    }
    for (size_t i = 0; i < writing->n_setups; i++) {
        if (writing->setups[i] == 0)
            continue;
        add_readings(writing,
                     member(member(writing->readings, setups[writing->setups[i]].name), place));
        put_cell(writing);
    }
    end_row(writing);
}

/* Whether the place, which is no point, needs a row of its own. */
static bool is_needed(const struct writing *writing, const char *place, enum spot spot)
{
    if (strcmp(place, "in") == 0 || (spot == SPOT_BOARD && member(writing->access, place) != NULL))
        return true;
    for (size_t i = 0; i < writing->n_setups; i++) {
        const struct setup *setup = &setups[writing->setups[i]];
        if (member(member(writing->readings, setup->name), place) != NULL)
            return true;
        if (spot != SPOT_HIGHEST && (setup->spots >> spot & 1u) != 0)
            return true; /* to be filled in */
    }
    return false;
}

static void put_places(struct writing *writing, const cJSON *list)
{
    const cJSON *point;
    cJSON_ArrayForEach(point, list) {
        const cJSON *id = member(point, "id");
        if (cJSON_IsString(id))
            put_place(writing, id->valuestring, point);
    }
}

static void put_table(struct writing *writing)
{
    end_row(writing); /* an empty one, for the eye */
    put_column_names(writing);
    if (is_needed(writing, "board", SPOT_BOARD))
        put_place(writing, "board", NULL);
    if (is_needed(writing, "out", SPOT_OUT))
        put_place(writing, "out", NULL);
    put_places(writing, member(writing->ring, "points"));
    put_place(writing, "in", NULL);
    put_places(writing, member(writing->ring, "spurs"));
    if (is_needed(writing, "highest", SPOT_HIGHEST))
        put_place(writing, "highest", NULL);
}

enum rf_status sheet_write(const cJSON *document, const struct sheet_style *style,
                           const size_t columns[], size_t n, struct text *out,
                           struct rf_error *error)
{
    struct writing writing = {
        .document = document,
        .ring = member(document, "ring"),
        .readings = member(document, "readings"),
        .access = member(document, "access"),
        .style = style,
        .out = out,
    };
    note_columns(&writing, columns, n);
    put_head(&writing);
    put_table(&writing);
    text_finish(&writing.cell);
    if (writing.too_many)
        return fail(error, RF_LIMIT,
                    "found more than %d kinds of keys that begin x_ at points; "
                    "needs at most so many columns in a sheet",
                    MAX_OWN);
    return out->failed ? fail_memory(error) : RF_OK;
}
