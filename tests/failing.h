/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef TESTS_FAILING_H
#define TESTS_FAILING_H

/*
 * Allocation that fails where a test wants it to. A test that includes this is linked with
 * failing.c and with --wrap for the allocating calls (failing_memory in meson.build), which leads
 * those of the library and of the test here, and Check's, where it is linked statically. Those
 * inside shared libraries do not come here: the C library's, GSL's, and cJSON's unless led here.
 */

#include <stdbool.h>
#include <stddef.h>

extern size_t allocations; /* asked for so far; a test may set it back to 0 */
extern size_t fail_at;     /* the value of `allocations` that fails, from 1; 0: none */

/* From now on cJSON's allocations come here too, or no longer. */
void lead_cjson_here(bool here);

#endif
