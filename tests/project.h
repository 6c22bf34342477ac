/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef TESTS_PROJECT_H
#define TESTS_PROJECT_H

/* Files of the project that tests read. */

#include <check.h>
#include <stdio.h>
#include <stdlib.h>

enum { PATH_MOST = 4096 };

/* The path of a file in one of the project's folders, which meson test names. */
static inline void project_path(char path[PATH_MOST], const char *folder, const char *name)
{
    const char *source = getenv("RINGFETTLE_SOURCE");
    ck_assert_msg(source != NULL, "run through meson test: RINGFETTLE_SOURCE is not set");
    int n = snprintf(path, PATH_MOST, "%s/%s/%s", source, folder, name);
    ck_assert(n > 0 && n < PATH_MOST);
}

#endif
