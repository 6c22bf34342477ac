/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef TESTS_FUZZ_FUZZ_H
#define TESTS_FUZZ_FUZZ_H

/* What the targets share. A target is LLVMFuzzerTestOneInput of its fuzz_NAME.c, linked with
 * libFuzzer, or with replay.c to run over files (the seeds, a find, AFL++). */

#include <stddef.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size);

/* What must hold, whatever the input; says what did not and dies, as fuzzers take notice of. */
#define MUST(holds, ...)                                                                           \
    do {                                                                                           \
        if (!(holds)) {                                                                            \
            fprintf(stderr, "%s:%d: not so: %s: ", __FILE__, __LINE__, #holds);                    \
            fprintf(stderr, __VA_ARGS__);                                                          \
            fprintf(stderr, "\n");                                                                 \
            abort();                                                                               \
        }                                                                                          \
    } while (0)

#endif
