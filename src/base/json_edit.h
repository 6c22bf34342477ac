/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef BASE_JSON_EDIT_H
#define BASE_JSON_EDIT_H

/*
 * Changes in a JSON text that leave every byte they do not concern as it was: number spelling,
 * order, indentation. The text must be one json_parse has accepted, its document an object;
 * `path` is n keys that lead from the document to a member. What is put in follows the spacing
 * of its neighbours. RF_REFUSED: something on the path is no object; RF_MEMORY.
 */

#include "base/text.h"

#include <ringfettle/status.h>

/* Sets a member to `value`, a JSON text; objects that are missing on the way are made. */
enum rf_status json_edit_set(struct text *json, const char *const path[], size_t n,
                             const char *value, struct rf_error *error);

/* Adds to the list at `path`. One value becomes a list of two; nothing becomes the value alone, or
 * a list of it where `always_list`. */
enum rf_status json_edit_append(struct text *json, const char *const path[], size_t n,
                                const char *value, bool always_list, struct rf_error *error);

/* Takes a member away, or element `index` of the list that it is. Nothing there: nothing done. */
enum rf_status json_edit_remove(struct text *json, const char *const path[], size_t n,
                                struct rf_error *error);
enum rf_status json_edit_remove_element(struct text *json, const char *const path[], size_t n,
                                        size_t index, struct rf_error *error);

#endif
