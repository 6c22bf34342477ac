/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef MODELS_SHIPPED_H
#define MODELS_SHIPPED_H

#include <stddef.h>

/* The files of models/, in the order they are read: effort.json's rows go with those of
 * faults.json. src/models/meson.build has the same order. */
enum model_file { FILE_CONDUCTOR, FILE_INSTRUMENT, FILE_FAULTS, FILE_EFFORT, N_MODEL_FILES };

/* One of them as compiled in; a terminating 0 stands behind the bytes. */
struct shipped_file {
    const char *name;
    const char *bytes;
    size_t length;
};

extern const struct shipped_file shipped_files[N_MODEL_FILES];

#endif
