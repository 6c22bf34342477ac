/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef BASE_ERROR_H
#define BASE_ERROR_H

#include <ringfettle/status.h>

/* Writes `status` and the message into `error` (which may be NULL) and returns `status`. */
enum rf_status fail(struct rf_error *error, enum rf_status status, const char *format, ...)
    RF_PRINTF(3, 4);

/* RF_MEMORY, with its message. */
enum rf_status fail_memory(struct rf_error *error);

#endif
