/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef TESTS_FUZZ_SCRATCH_FILE_H
#define TESTS_FUZZ_SCRATCH_FILE_H

/* A folder of this process in memory (/dev/shm) where there is one, for what is read by path. */

#include "fuzz.h"

#include <unistd.h>

static char scratch_folder[] = "/dev/shm/ringfettle-fuzz-XXXXXX";
static char scratch_fallback[] = "/tmp/ringfettle-fuzz-XXXXXX";
static const char *scratch_in;

static void scratch_remove(void)
{
    static const char *const names[] = {"conductor.json", "instrument.json", "faults.json",
                                        "effort.json", "stream"};
    char path[128];
    for (size_t i = 0; i < sizeof names / sizeof names[0]; i++) {
        snprintf(path, sizeof path, "%s/%s", scratch_in, names[i]);
        unlink(path);
    }
    rmdir(scratch_in);
}

static void scratch_write(const char *name, const void *bytes, size_t length, char path[128])
{
    if (scratch_in == NULL) {
        scratch_in = mkdtemp(scratch_folder);
        if (scratch_in == NULL)
            scratch_in = mkdtemp(scratch_fallback);
        MUST(scratch_in != NULL, "no folder");
        atexit(scratch_remove);
    }
    snprintf(path, 128, "%s/%s", scratch_in, name);
    FILE *file = fopen(path, "wb");
    MUST(file != NULL, "%s", path);
    MUST(fwrite(bytes, 1, length, file) == length, "%s", path);
    MUST(fclose(file) == 0, "%s", path);
}

#endif
