/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef BASE_MEMORY_H
#define BASE_MEMORY_H

#include <stdint.h>
#include <stdlib.h>

/* An array of n zeroed elements, NULL when memory is short or n × size overflows (calloc checks).
 * Never asks for 0 bytes, so NULL always means failure. */
#define NEW_ARRAY(type, n) ((type *)calloc((n) > 0 ? (size_t)(n) : 1, sizeof(type)))
#define NEW(type) NEW_ARRAY(type, 1)

#endif
