/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "report/scene.h"

#include <stdlib.h>
#include <string.h>

const char *const scene_role_names[N_SCENE_ROLES] = {
#define SCENE_ROLE(role, name) [role] = name,
    SCENE_ROLES(SCENE_ROLE)
#undef SCENE_ROLE
};

static const char ellipsis[] = "\u2026";

void scene_finish(struct scene *scene)
{
    for (size_t i = 0; i < scene->n; i++) {
        free(scene->items[i].words);
        free(scene->items[i].title);
    }
    free(scene->items);
    free(scene->corners);
    free(scene->title);
    free(scene->description);
    *scene = (struct scene){0};
}

/* The bytes of words that are used up; NULL, and the scene failed, where memory was short. */
static char *taken(struct scene *scene, struct text *words)
{
    char *bytes = words->bytes;
    if (words->failed || bytes == NULL) {
        scene->failed = true;
        text_finish(words);
        return NULL;
    }
    *words = (struct text){0};
    return bytes;
}

void scene_entitle(struct scene *scene, struct text *title, struct text *description)
{
    scene->title = taken(scene, title);
    scene->description = taken(scene, description);
}

static struct scene_item *add_item(struct scene *scene, enum scene_kind kind, enum scene_role role)
{
    static struct scene_item nowhere;
    if (scene->n == scene->capacity) {
        size_t capacity = scene->capacity > 0 ? 2 * scene->capacity : 64;
        struct scene_item *items = realloc(scene->items, capacity * sizeof *items);
        if (items == NULL) {
            scene->failed = true;
            return NULL;
        }
        scene->items = items;
        scene->capacity = capacity;
    }
    struct scene_item *item = &scene->items[scene->n++];
    *item = nowhere;
    item->kind = kind;
    item->role = role;
    item->first = scene->n_corners;
    return item;
}

void scene_line(struct scene *scene, enum scene_role role)
{
    add_item(scene, SCENE_LINE, role);
}

void scene_area(struct scene *scene, enum scene_role role)
{
    add_item(scene, SCENE_AREA, role);
}

void scene_corner(struct scene *scene, double x, double y)
{
    if (scene->failed || scene->n == 0)
        return;
    if (scene->n_corners == scene->corners_capacity) {
        size_t capacity = scene->corners_capacity > 0 ? 2 * scene->corners_capacity : 256;
        struct scene_corner *corners = realloc(scene->corners, capacity * sizeof *corners);
        if (corners == NULL) {
            scene->failed = true;
            return;
        }
        scene->corners = corners;
        scene->corners_capacity = capacity;
    }
    scene->corners[scene->n_corners++] = (struct scene_corner){x, y};
    scene->items[scene->n - 1].n++;
}

void scene_segment(struct scene *scene, enum scene_role role, double x1, double y1, double x2,
                   double y2)
{
    scene_line(scene, role);
    scene_corner(scene, x1, y1);
    scene_corner(scene, x2, y2);
}

static void add_shape(struct scene *scene, enum scene_kind kind, enum scene_role role, double x,
                      double y, double w, double h)
{
    struct scene_item *item = add_item(scene, kind, role);
    if (item == NULL)
        return;
    item->x = x;
    item->y = y;
    item->w = w;
    item->h = h;
}

void scene_disc(struct scene *scene, enum scene_role role, double x, double y, double radius)
{
    add_shape(scene, SCENE_DISC, role, x, y, radius, radius);
}

void scene_box(struct scene *scene, enum scene_role role, double x, double y, double w, double h)
{
    add_shape(scene, SCENE_BOX, role, x, y, w, h);
}

void scene_title(struct scene *scene, struct text *title)
{
    char *bytes = taken(scene, title);
    if (scene->failed || scene->n == 0) {
        free(bytes);
        return;
    }
    free(scene->items[scene->n - 1].title);
    scene->items[scene->n - 1].title = bytes;
}

/* --- words --- */

static size_t character_length(const char *at)
{
    size_t n = 1;
    while (((unsigned char)at[n] & 0xC0) == 0x80)
        n++;
    return n;
}

/* Widths in ems, on the wide side: typefaces differ. */
static double character_width(const char *at, size_t length)
{
    if (length == 1) {
        if (strchr("iljI.,:;'|! ()[]ft", *at) != NULL)
            return 0.42;
        if (strchr("mwMW@%", *at) != NULL)
            return 1.12;
        return *at >= 'A' && *at <= 'Z' ? 0.76 : 0.66;
    }
    if (memcmp(at, "\u00A0", 2) == 0)
        return 0.42;
    char alone[5] = {0};
    memcpy(alone, at, length < 4 ? length : 4);
    size_t columns = text_columns(alone);
    return columns == 0 ? 0.0 : columns == 1 ? 0.8 : 1.1;
}

double words_width(const char *words, double size)
{
    double width = 0;
    size_t length;
    for (const char *at = words; *at != '\0'; at += length) {
        length = character_length(at);
        width += character_width(at, length) * size;
    }
    return width;
}

/* Words cut to the room there is, on a copy. */
static void fit_words(struct text *fitting, const char *words, double size, double room)
{
    if (words_width(words, size) <= room) {
        text_add(fitting, words);
        return;
    }
    double left = room - words_width(ellipsis, size);
    size_t length, kept = 0;
    for (const char *at = words; *at != '\0'; at += length) {
        length = character_length(at);
        left -= character_width(at, length) * size;
        if (left < 0)
            break;
        kept = (size_t)(at - words) + length;
    }
    while (kept > 0 && words[kept - 1] == ' ')
        kept--;
    if (kept == 0)
        return;
    text_append(fitting, words, kept);
    text_add(fitting, ellipsis);
}

double scene_label(struct scene *scene, enum scene_role role, double x, double y,
                   enum scene_anchor anchor, double size, double room, const char *words)
{
    struct text fitting = {0};
    fit_words(&fitting, words, size, room);
    if (fitting.length == 0) {
        scene->failed = scene->failed || fitting.failed;
        text_finish(&fitting);
        return 0;
    }
    double width = fitting.failed ? 0 : words_width(fitting.bytes, size);
    add_shape(scene, SCENE_LABEL, role, x, y, 0, 0);
    char *bytes = taken(scene, &fitting);
    if (scene->failed) {
        free(bytes);
        return 0;
    }
    scene->items[scene->n - 1].anchor = anchor;
    scene->items[scene->n - 1].size = size;
    scene->items[scene->n - 1].words = bytes;
    return width;
}
