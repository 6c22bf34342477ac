/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef BASE_JSON_SCAN_H
#define BASE_JSON_SCAN_H

#include <stdbool.h>
#include <stddef.h>

/*
 * The grammar of RFC 8259, to the letter. cJSON lets some of what that forbids pass (control
 * characters, numbers such as 01, text cut at U+0000) and says badly where it stopped; what has
 * passed here, cJSON reads as it stands.
 */
struct json_scan {
    bool good;         /* nothing wrong as far as the text goes */
    bool complete;     /* one whole value, nothing behind it */
    size_t bad;        /* where it is wrong, or the text's end */
    const char *needs; /* what would be right there; a constant */
};

struct json_scan json_scan_text(const char *bytes, size_t length);

#endif
