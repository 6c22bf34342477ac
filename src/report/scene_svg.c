/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "report/scene_svg.h"

/* A tenth of a px is as fine as anybody sees. */
static void coordinate(struct markup *markup, const char *name, double value)
{
    markup_attributef(markup, name, "%.4g", value > -0.05 && value < 0.05 ? 0.0 : value);
}

static void add_path(struct markup *markup, const struct scene *scene,
                     const struct scene_item *item)
{
    struct text path = {0};
    for (size_t i = 0; i < item->n; i++) {
        const struct scene_corner *corner = &scene->corners[item->first + i];
        text_addf(&path, "%s%.1f %.1f", i == 0 ? "M" : "L", corner->x, corner->y);
    }
    if (item->kind == SCENE_AREA)
        text_add(&path, "Z");
    if (path.failed)
        markup->failed = true;
    else
        markup_attribute(markup, "d", path.bytes != NULL ? path.bytes : "");
    text_finish(&path);
}

static void add_shape(struct markup *markup, const struct scene *scene,
                      const struct scene_item *item)
{
    static const char *const anchors[] = {
        [ANCHOR_START] = "start", [ANCHOR_MIDDLE] = "middle", [ANCHOR_END] = "end"};
    switch (item->kind) {
    case SCENE_LINE:
    case SCENE_AREA:
        add_path(markup, scene, item);
        break;
    case SCENE_DISC:
        coordinate(markup, "cx", item->x);
        coordinate(markup, "cy", item->y);
        coordinate(markup, "r", item->w);
        break;
    case SCENE_BOX:
        coordinate(markup, "x", item->x);
        coordinate(markup, "y", item->y);
        coordinate(markup, "width", item->w);
        coordinate(markup, "height", item->h);
        break;
    case SCENE_LABEL:
        coordinate(markup, "x", item->x);
        coordinate(markup, "y", item->y);
        coordinate(markup, "font-size", item->size);
        markup_attribute(markup, "text-anchor", anchors[item->anchor]);
        break;
    }
}

static void add_item(struct markup *markup, const struct scene *scene,
                     const struct scene_item *item)
{
    static const char *const elements[] = {[SCENE_LINE] = "path",
                                           [SCENE_AREA] = "path",
                                           [SCENE_DISC] = "circle",
                                           [SCENE_BOX] = "rect",
                                           [SCENE_LABEL] = "text"};
    const char *element = elements[item->kind];
    markup_open(markup, element);
    markup_attribute(markup, "class", scene_role_names[item->role]);
    add_shape(markup, scene, item);
    if (item->title == NULL && item->words == NULL) {
        markup_void(markup, element);
        return;
    }
    if (item->title != NULL)
        markup_element(markup, "title", NULL, item->title);
    if (item->words != NULL)
        markup_text(markup, item->words);
    markup_close(markup);
}

void scene_svg(struct markup *markup, const struct scene *scene, const char *id)
{
    if (scene->failed || scene->title == NULL || scene->description == NULL) {
        markup->failed = true;
        return;
    }
    markup_open(markup, "svg");
    markup_attribute(markup, "role", "img");
    markup_attributef(markup, "aria-labelledby", "%s-title", id);
    markup_attributef(markup, "aria-describedby", "%s-about", id);
    markup_attribute(markup, "class", id);
    markup_attributef(markup, "viewBox", "0 0 %.0f %.0f", scene->width, scene->height);
    markup_open(markup, "title");
    markup_attributef(markup, "id", "%s-title", id);
    markup_text(markup, scene->title);
    markup_close(markup);
    markup_open(markup, "desc");
    markup_attributef(markup, "id", "%s-about", id);
    markup_text(markup, scene->description);
    markup_close(markup);
    for (size_t i = 0; i < scene->n; i++)
        add_item(markup, scene, &scene->items[i]);
    markup_close(markup);
}
