/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef TESTS_JOB_MAKER_H
#define TESTS_JOB_MAKER_H

/* Jobs made up at random from a seed: everything the format allows, names and numbers invented. */

#include "job/setup.h"

#include <cjson/cJSON.h>
#include <stdint.h>
#include <stdio.h>
#include <string.h>

struct maker {
    uint64_t state;
    char ids[40][64];
    bool box[40];
    size_t n_ring, n_spurs;
};

static inline unsigned maker_below(struct maker *maker, unsigned n)
{
    /* Knuth's MMIX linear congruential generator; its upper bits. */
    maker->state = maker->state * 6364136223846793005u + 1442695040888963407u;
    return (unsigned)(maker->state >> 33) % n;
}

static inline bool maker_chance(struct maker *maker, unsigned percent)
{
    return maker_below(maker, 100) < percent;
}

static inline double maker_number(struct maker *maker, unsigned hundredths)
{
    return (double)maker_below(maker, hundredths) / 100.0;
}

static inline const char *maker_text(struct maker *maker)
{
    static const char *const texts[] = {
        "landing",     "under the stairs", "Küche, rechts", "says \"off\"", "a;b\tc",
        "two\nlines",  "  spaced  ",       "1,5",           "0.40",         "-",
        "\"quoted\"",  "=1+1",             "café / hall",   "open",         "true",
        "{\"a\":1}",   "a\r\nb",           "unknown",       "x",            "P9",
        "\xE2\x80\x93", "null",            "trailing\n\n",  "place",        "",
    };
    return texts[maker_below(maker, sizeof texts / sizeof texts[0])];
}

static inline cJSON *maker_value(struct maker *maker, unsigned depth)
{
    cJSON *made;
    switch (maker_below(maker, depth > 2 ? 5 : 7)) {
    case 0: return cJSON_CreateNumber(maker_number(maker, 100000) - 300.0);
    case 1: return cJSON_CreateBool(maker_chance(maker, 50));
    case 2: return cJSON_CreateNull();
    case 3:
    case 4: return cJSON_CreateString(maker_text(maker));
    case 5:
        made = cJSON_CreateArray();
        for (unsigned n = maker_below(maker, 4); n > 0; n--)
            cJSON_AddItemToArray(made, maker_value(maker, depth + 1));
        return made;
    default:
        made = cJSON_CreateObject();
        if (maker_chance(maker, 70))
            cJSON_AddItemToObject(made, "a", maker_value(maker, depth + 1));
        if (maker_chance(maker, 70))
            cJSON_AddItemToObject(made, "b, c", maker_value(maker, depth + 1));
        return made;
    }
}

static inline void maker_own(struct maker *maker, cJSON *into)
{
    static const char *const keys[] = {"x_by", "x_Why", "x_why", "x_a.b, c", "x_"};
    if (maker_chance(maker, 80))
        return;
    for (size_t i = 0; i < sizeof keys / sizeof keys[0]; i++)
        if (maker_chance(maker, 40))
            cJSON_AddItemToObject(into, keys[i], maker_value(maker, 0));
}

static inline void maker_id(struct maker *maker, size_t i)
{
    static const char *const forms[] = {"P%zu",   "kitchen-%zu", "Bad %zu", "a,%zu", "%zu",
                                        "\"%zu\"", " s%zu ",      "x_%zu",   "é;%zu", "r%zu"};
    snprintf(maker->ids[i], sizeof maker->ids[i],
             forms[maker_below(maker, sizeof forms / sizeof forms[0])], i + 1);
}

static inline cJSON *maker_point(struct maker *maker, size_t i)
{
    static const char *const kinds[] = {"socket", "fcu", "junction_box", "isolator", "other"};
    cJSON *point = cJSON_CreateObject();
    maker_id(maker, i);
    cJSON_AddStringToObject(point, "id", maker->ids[i]);
    if (i >= maker->n_ring) {
        size_t from = maker_below(maker, (unsigned)i + 2);
        cJSON_AddStringToObject(point, "from",
                                from < i      ? maker->ids[from]
                                : from == i ? "out"
                                              : "in");
    }
    if (maker_chance(maker, 40))
        cJSON_AddStringToObject(point, "label", maker_text(maker));
    if (maker_chance(maker, 40)) {
        unsigned kind = maker_below(maker, 5);
        cJSON_AddStringToObject(point, "kind", kinds[kind]);
        maker->box[i] = kind == 2;
    }
    if (maker_chance(maker, 15))
        cJSON_AddNullToObject(point, "run_m");
    else if (maker_chance(maker, 70))
        cJSON_AddNumberToObject(point, "run_m", 0.1 + maker_number(maker, 3000));
    if (maker_chance(maker, 10))
        cJSON_AddNumberToObject(point, "live_mm2", 4.0);
    if (maker_chance(maker, 10))
        cJSON_AddNullToObject(point, "cpc_mm2");
    maker_own(maker, point);
    return point;
}

static inline cJSON *maker_reading(struct maker *maker, bool may_be_open)
{
    if (may_be_open && maker_chance(maker, 10))
        return cJSON_CreateString("open");
    return cJSON_CreateNumber(maker_number(maker, maker_chance(maker, 90) ? 300 : 9990));
}

static inline void maker_read(struct maker *maker, cJSON *setup, const char *key,
                              bool may_be_open)
{
    if (maker_chance(maker, 85)) {
        cJSON_AddItemToObject(setup, key, maker_reading(maker, may_be_open));
        return;
    }
    cJSON *list = cJSON_AddArrayToObject(setup, key);
    for (unsigned n = 2 + maker_below(maker, 2); n > 0; n--)
        cJSON_AddItemToArray(list, maker_reading(maker, may_be_open));
}

static inline void maker_setup(struct maker *maker, cJSON *readings, const struct setup *setup)
{
    cJSON *made = cJSON_AddObjectToObject(readings, setup->name);
    for (size_t spot = SPOT_BOARD; spot < N_SPOTS; spot++)
        if ((setup->spots >> spot & 1u) != 0 && maker_chance(maker, 60))
            maker_read(maker, made, spot_keys[spot], spot != SPOT_HIGHEST);
    if ((setup->spots & 1u << SPOT_POINT) != 0)
        for (size_t i = 0; i < maker->n_ring + maker->n_spurs; i++)
            if (!maker->box[i] && maker_chance(maker, 70))
                maker_read(maker, made, maker->ids[i], true);
    if (maker_chance(maker, 10))
        cJSON_AddItemToObject(made, "x_by", maker_value(maker, 0));
}

static inline void maker_looks(struct maker *maker, cJSON *document)
{
    cJSON *access = cJSON_CreateObject(), *opened = cJSON_CreateArray();
    cJSON *checked = cJSON_CreateArray();
    for (size_t i = maker->n_ring + maker->n_spurs; i-- > 0;) {
        if (maker_chance(maker, 10)) {
            cJSON *item = cJSON_AddObjectToObject(access, maker->ids[i]);
            cJSON_AddNumberToObject(item, "reach", maker_number(maker, 3000));
            if (maker_chance(maker, 50))
                cJSON_AddNumberToObject(item, "open", maker_below(maker, 60));
            maker_own(maker, item);
        } else if (maker_chance(maker, 10)) {
            cJSON_AddNumberToObject(access, maker->ids[i], maker_below(maker, 60));
        }
        if (maker_chance(maker, 15))
            cJSON_AddItemToArray(opened, cJSON_CreateString(maker->ids[i]));
        if (!maker->box[i] && maker_chance(maker, 15))
            cJSON_AddItemToArray(checked, cJSON_CreateString(maker->ids[i]));
    }
    if (maker_chance(maker, 10))
        cJSON_AddItemToArray(opened, cJSON_CreateString("board"));
    if (maker_chance(maker, 10))
        cJSON_AddNumberToObject(access, "board", 3);
    maker_own(maker, access);
    cJSON *parts[] = {access, opened, checked};
    static const char *const keys[] = {"access", "opened", "checked"};
    for (size_t i = 0; i < 3; i++)
        if (parts[i]->child != NULL)
            cJSON_AddItemToObject(document, keys[i], parts[i]);
        else
            cJSON_Delete(parts[i]);
}

static inline void maker_found(struct maker *maker, cJSON *into, const char *key)
{
    cJSON *found = cJSON_AddObjectToObject(into, key);
    const char *ends[2] = {"out", maker->ids[0]};
    switch (maker_below(maker, 5)) {
    case 0:
        cJSON_AddStringToObject(found, "family", "joint");
        cJSON_AddItemToObject(found, "run", cJSON_CreateStringArray(ends, 2));
        cJSON_AddStringToObject(found, "conductor", "N");
        cJSON_AddNumberToObject(found, "ohms", 0.5);
        break;
    case 1:
        cJSON_AddStringToObject(found, "family", "contact");
        cJSON_AddStringToObject(found, "at", maker->ids[0]);
        cJSON_AddStringToObject(found, "conductor", "L");
        cJSON_AddTrueToObject(found, "open");
        break;
    case 2:
        cJSON_AddStringToObject(found, "family", "size");
        cJSON_AddNumberToObject(found, "live_mm2", 1.5);
        cJSON_AddNumberToObject(found, "cpc_mm2", 1.0);
        break;
    case 3:
        cJSON_AddStringToObject(found, "family", "reversal");
        cJSON_AddStringToObject(found, "at", maker->ids[0]);
        cJSON_AddStringToObject(found, "pair", "ln");
        break;
    default: cJSON_AddStringToObject(found, "family", "none");
    }
    maker_own(maker, found);
}

/* A job's document; the caller deletes it. */
static inline cJSON *make_job(uint64_t seed)
{
    struct maker maker = {.state = seed};
    for (int i = 0; i < 8; i++)
        maker_below(&maker, 2);
    maker.n_ring = 1 + maker_below(&maker, maker_chance(&maker, 20) ? 24 : 8);
    maker.n_spurs = maker_chance(&maker, 50) ? maker_below(&maker, 5) : 0;

    cJSON *document = cJSON_CreateObject();
    cJSON_AddStringToObject(document, "format", "ringfettle-job/1");
    if (maker_chance(&maker, 70))
        cJSON_AddStringToObject(document, "job", maker_text(&maker));
    if (maker_chance(&maker, 70))
        cJSON_AddStringToObject(document, "date", "2026-02-11");
    if (maker_chance(&maker, 50))
        cJSON_AddStringToObject(document, "note", maker_text(&maker));
    cJSON *ring = cJSON_AddObjectToObject(document, "ring");
    if (maker_chance(&maker, 50))
        cJSON_AddNumberToObject(ring, "live_mm2", 4);
    if (maker_chance(&maker, 20))
        cJSON_AddNullToObject(ring, "cpc_mm2");
    else if (maker_chance(&maker, 50))
        cJSON_AddNumberToObject(ring, "cpc_mm2", 1.5);
    if (maker_chance(&maker, 50))
        cJSON_AddNumberToObject(ring, "temperature_c", maker_number(&maker, 6000) - 5.0);
    if (maker_chance(&maker, 30))
        cJSON_AddNumberToObject(ring, "length_accuracy", 0.01 + maker_number(&maker, 90));
    if (maker_chance(&maker, 10))
        cJSON_AddStringToObject(ring, "order", "known");
    cJSON *points = cJSON_AddArrayToObject(ring, "points");
    size_t i = 0;
    for (; i < maker.n_ring; i++)
        cJSON_AddItemToArray(points, maker_point(&maker, i));
    if (maker_chance(&maker, 50))
        cJSON_AddNumberToObject(ring, "last_run_m", 0.1 + maker_number(&maker, 3000));
    cJSON *spurs = maker.n_spurs > 0 ? cJSON_AddArrayToObject(ring, "spurs") : NULL;
    for (; i < maker.n_ring + maker.n_spurs; i++)
        cJSON_AddItemToArray(spurs, maker_point(&maker, i));
    maker_own(&maker, ring);

    cJSON *readings = cJSON_AddObjectToObject(document, "readings");
    for (unsigned n = maker_below(&maker, 5), k = 0; k < n; k++) {
        const struct setup *setup = &setups[maker_below(&maker, N_SETUPS)];
        if (cJSON_GetObjectItemCaseSensitive(readings, setup->name) == NULL)
            maker_setup(&maker, readings, setup);
    }
    cJSON *ends = cJSON_GetObjectItemCaseSensitive(readings, "end_to_end");
    if (ends == NULL)
        ends = cJSON_AddObjectToObject(readings, "end_to_end");
    if (!cJSON_HasObjectItem(ends, "l"))
        cJSON_AddNumberToObject(ends, "l", 0.61);
    maker_own(&maker, readings);
    maker_looks(&maker, document);
    if (maker_chance(&maker, 30)) {
        maker_found(&maker, document, "found");
        if (maker_chance(&maker, 30))
            maker_found(&maker, cJSON_GetObjectItemCaseSensitive(document, "found"), "also");
    }
    maker_own(&maker, document);
    return document;
}

#endif
