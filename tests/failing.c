/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "failing.h"

#include <cjson/cJSON.h>
#include <stdlib.h>

/* The linker leads every call of malloc to __wrap_malloc, and __real_malloc to the C library's. */
void *__real_malloc(size_t size);
void *__real_calloc(size_t n, size_t size);
void *__real_realloc(void *old, size_t size);
void *__wrap_malloc(size_t size);
void *__wrap_calloc(size_t n, size_t size);
void *__wrap_realloc(void *old, size_t size);

size_t allocations, fail_at;

static bool refused(void)
{
    return ++allocations == fail_at;
}

void *__wrap_malloc(size_t size)
{
    return refused() ? NULL : __real_malloc(size);
}

void *__wrap_calloc(size_t n, size_t size)
{
    return refused() ? NULL : __real_calloc(n, size);
}

void *__wrap_realloc(void *old, size_t size)
{
    return refused() ? NULL : __real_realloc(old, size);
}

void lead_cjson_here(bool here)
{
    cJSON_Hooks hooks = {__wrap_malloc, free};
    cJSON_InitHooks(here ? &hooks : NULL);
}
