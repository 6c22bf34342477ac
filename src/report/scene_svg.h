/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef REPORT_SCENE_SVG_H
#define REPORT_SCENE_SVG_H

#include "report/markup.h"
#include "report/scene.h"

/* A scene as SVG inside a page; roles become classes, which the page's style sheet draws. `id` is
 * a plain name, one of its own for each scene of a page. */
void scene_svg(struct markup *markup, const struct scene *scene, const char *id);

#endif
