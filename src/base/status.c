/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/error.h"
#include "base/text.h"

#include <stdarg.h>
#include <stdio.h>

#ifndef RINGFETTLE_VERSION
#error "the build passes RINGFETTLE_VERSION"
#endif

struct entry {
    enum rf_class class;
    const char *text;
};

static const struct entry entries[] = {
#define ENTRY(code, class, text) [code] = {class, text},
    RF_STATUS_LIST(ENTRY)
#undef ENTRY
};

enum { N_ENTRIES = sizeof entries / sizeof entries[0] };

enum rf_class rf_status_class(enum rf_status status)
{
    return (unsigned)status < N_ENTRIES ? entries[status].class : RF_CLASS_INPUT;
}

const char *rf_status_text(enum rf_status status)
{
    return (unsigned)status < N_ENTRIES ? entries[status].text : "unknown status";
}

const char *rf_version(void)
{
    return RINGFETTLE_VERSION;
}

enum rf_status fail(struct rf_error *error, enum rf_status status, const char *format, ...)
{
    if (error != NULL) {
        va_list arguments;
        error->status = status;
        va_start(arguments, format);
        int length = vsnprintf(error->text, sizeof error->text, format, arguments);
        va_end(arguments);
        if (length < 0)
            error->text[0] = '\0';
        else if ((size_t)length >= sizeof error->text)
            text_trim_partial_character(error->text);
    }
    return status;
}

enum rf_status fail_memory(struct rf_error *error)
{
    return fail(error, RF_MEMORY, "%s", rf_status_text(RF_MEMORY));
}
