/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The table of a sheet: its places, and what was read there. */
#include "job/sheet_build.h"

#include "base/memory.h"
#include "job/sheet_text.h"

#include <string.h>

static enum rf_status know_column(struct sheet_build *building, size_t column)
{
    const struct sheet_grid *grid = building->grid;
    struct build_column *holds = building->columns + column;
    const char *name = build_cell(building, grid->head, column);
    for (size_t i = 0; i < column; i++)
        if (name[0] != '\0' && sheet_same_word(build_cell(building, grid->head, i), name) &&
            strncmp(name, "x_", 2) != 0 && strncmp(name, "access.", 7) != 0)
            return sheet_fail(grid, grid->head, column, building->error,
                              "found \"%.80s\" twice; needs a column once", name);
        else if (name[0] != '\0' && strcmp(build_cell(building, grid->head, i), name) == 0)
            return sheet_fail(grid, grid->head, column, building->error,
                              "found \"%.80s\" twice; needs a column once", name);
    if (name[0] == '\0')
        return RF_OK;
    *holds = (struct build_column){HOLDS_FIXED, 0};
    for (; holds->which < N_COLUMNS; holds->which++)
        if (sheet_same_word(sheet_columns[holds->which], name))
            return RF_OK;
    *holds = (struct build_column){HOLDS_SETUP, sheet_find_setup(name)};
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

static void put_fixed(struct sheet_build *building, cJSON *point, enum sheet_column which,
                      size_t row, size_t column)
{
    static const char *const keys[N_COLUMNS] = {
        [COLUMN_PLACE] = "id",    [COLUMN_LABEL] = "label",  [COLUMN_KIND] = "kind",
        [COLUMN_FROM] = "from",   [COLUMN_METRES] = "run_m", [COLUMN_LIVE] = "live_mm2",
        [COLUMN_CPC] = "cpc_mm2",
    };
    if (which == COLUMN_METRES || which == COLUMN_LIVE || which == COLUMN_CPC)
        build_put_number(building, point, keys[which], row, column);
    else if (which != COLUMN_REACH && which != COLUMN_OPEN)
        build_put_text(building, point, keys[which], row, column);
}

/* `access`: a number alone where only opening is given. */
static void put_access(struct sheet_build *building, const char *key, size_t row)
{
    cJSON *access = cJSON_CreateObject();
    if (access == NULL) {
        build_refuse_memory(building);
        return;
    }
    for (size_t i = 1; i < building->n_columns && building->status == RF_OK; i++) {
        const struct build_column *column = building->columns + i;
        const char *text = build_cell(building, row, i);
        if (column->holds == HOLDS_FIXED && column->which == COLUMN_REACH)
            build_put_number(building, access, "reach", row, i);
        else if (column->holds == HOLDS_FIXED && column->which == COLUMN_OPEN)
            build_put_number(building, access, "open", row, i);
        else if (column->holds == HOLDS_ACCESS_PRIVATE && text[0] != '\0')
            build_put(building, access,
                      build_cell(building, building->grid->head, i) + strlen("access."),
                      sheet_private_value(text, building->grid->style.decimal), row, i);
    }
    if (access->child == NULL || build_need(building, &building->access) == NULL) {
        cJSON_Delete(access);
        return;
    }
    if (access->child->next == NULL && strcmp(access->child->string, "open") == 0) {
        cJSON *alone = cJSON_DetachItemViaPointer(access, access->child);
        cJSON_Delete(access);
        access = alone;
        if (!cJSON_AddItemToObject(building->access, key, alone)) {
            cJSON_Delete(alone);
            build_refuse_memory(building);
        }
    } else {
        build_put(building, building->access, key, access, row, 0);
    }
}

/* What the row of an end, of the board or of `highest` may say about it: `in` the last run's
 * metres, `board` the minutes. */
static void read_special_row(struct sheet_build *building, const char *place, size_t row)
{
    bool in = strcmp(place, "in") == 0;
    for (size_t i = 1; i < building->n_columns && building->status == RF_OK; i++) {
        const struct build_column *column = building->columns + i;
        if (build_cell(building, row, i)[0] == '\0' || column->holds == HOLDS_SETUP ||
            column->holds == HOLDS_NOTHING)
            continue;
        bool minutes = column->holds == HOLDS_ACCESS_PRIVATE ||
                       (column->holds == HOLDS_FIXED &&
                        (column->which == COLUMN_REACH || column->which == COLUMN_OPEN));
        if (in && column->holds == HOLDS_FIXED && column->which == COLUMN_METRES) {
            if (build_need(building, &building->ring) != NULL)
                build_put_number(building, building->ring, "last_run_m", row, i);
        } else if (!(minutes && strcmp(place, "board") == 0)) {
            building->status = sheet_fail(building->grid, row, i, building->error,
                                          "found \"%.80s\"; needs nothing here: \"%s\" is no point",
                                          build_cell(building, row, i), place);
        }
    }
}

static void read_point_row(struct sheet_build *building, size_t row)
{
    cJSON *point = cJSON_CreateObject();
    if (point == NULL) {
        build_refuse_memory(building);
        return;
    }
    bool spur = false;
    for (size_t i = 0; i < building->n_columns && building->status == RF_OK; i++) {
        const struct build_column *column = building->columns + i;
        const char *text = build_cell(building, row, i);
        if (column->holds == HOLDS_FIXED) {
            put_fixed(building, point, (enum sheet_column)column->which, row, i);
            spur |= column->which == COLUMN_FROM && text[0] != '\0';
        } else if (column->holds == HOLDS_PRIVATE && text[0] != '\0') {
            build_put(building, point, build_cell(building, building->grid->head, i),
                      sheet_private_value(text, building->grid->style.decimal), row, i);
        }
    }
    cJSON **list = spur ? &building->spurs : &building->points;
    if (*list == NULL)
        *list = cJSON_CreateArray();
    if (*list == NULL) {
        cJSON_Delete(point);
        build_refuse_memory(building);
        return;
    }
    build_put(building, *list, NULL, point, row, 0);
}

/* Whether an earlier row is of the same place; the job's reader sees ids twice, but not the
 * board's. */
static bool refuse_twice(struct sheet_build *building, const char *place, size_t row)
{
    for (size_t i = building->grid->head + 1; i < row; i++)
        if (strcmp(build_cell(building, i, 0), place) == 0) {
            building->status = sheet_fail(building->grid, row, 0, building->error,
                                          "found \"%.80s\", as in row %zu; needs a place once",
                                          place, building->grid->rows[i].number);
            return true;
        }
    return false;
}

static void read_table_row(struct sheet_build *building, size_t row)
{
    char word[16];
    const char *place = build_cell(building, row, 0);
    cJSON *text = NULL;
    if (place[0] == '\0') {
        building->status = sheet_fail(building->grid, row, 0, building->error,
                                      "found nothing; needs a place: board, out, in, or a "
                                      "point's id");
        return;
    }
    for (size_t i = building->n_columns; i-- > 0;)
        if (building->columns[i].holds == HOLDS_NOTHING &&
            build_cell(building, row, i)[0] != '\0') {
            building->status = sheet_fail(building->grid, row, i, building->error,
                                          "found \"%.80s\" in a column without a name; needs its "
                                          "name in row %zu",
                                          build_cell(building, row, i),
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
            build_refuse_memory(building);
            return;
        }
        place = text->valuestring;
    }
    if (!refuse_twice(building, build_cell(building, row, 0), row)) {
        if (text == NULL)
            read_special_row(building, place, row);
        else
            read_point_row(building, row);
        if (building->status == RF_OK && (text != NULL || strcmp(place, "board") == 0))
            put_access(building, place, row);
    }
    for (size_t i = 1; i < building->n_columns && building->status == RF_OK; i++)
        if (building->columns[i].holds == HOLDS_SETUP && build_cell(building, row, i)[0] != '\0')
            build_put_readings(building, &building->setups[building->columns[i].which], place, row,
                               i, i);
    cJSON_Delete(text);
}

void sheet_read_table(struct sheet_build *building)
{
    struct sheet_grid *grid = building->grid;
    building->n_columns = grid->rows[grid->head].n_cells;
    building->columns = NEW_ARRAY(struct build_column, building->n_columns);
    if (building->columns == NULL) {
        build_refuse_memory(building);
        return;
    }
    for (size_t i = 0; building->status == RF_OK && i < building->n_columns; i++)
        building->status = know_column(building, i);
    for (size_t i = grid->head + 1; building->status == RF_OK && i < grid->table; i++)
        read_table_row(building, i);
}
