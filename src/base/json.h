/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef BASE_JSON_H
#define BASE_JSON_H

/*
 * JSON read strictly, and access to it that knows where it is: every refusal names the source and
 * the path in it, what was found and what is needed.
 *
 *     struct json_at document = json_document(tree, "kitchen.json");
 *     status = json_object(&document, keys, n_keys, error);
 *     struct json_at ring = json_member(&document, "ring");
 *     status = json_number(&ring, 0.1, 500.0, "metres from 0.1 to 500", &metres, error);
 *
 * A place in the document is a value on the caller's stack that points at its parent, so the
 * parent must outlive it. Nothing is allocated until something is refused.
 */

#include <ringfettle/status.h>

#include <cjson/cJSON.h>
#include <stdbool.h>
#include <stddef.h>

enum { JSON_MAX_DEPTH = 64 };

struct text;

/*
 * A document that was not read from JSON text names its places as its own format does: `name`
 * appends where `value` stands ("row 14, column cross_le"), or returns false where it does not
 * know. Whoever makes it keeps it while messages about the document may be written.
 */
struct json_origin {
    bool (*name)(const struct json_origin *origin, const cJSON *value, struct text *out);
};

struct json_at {
    const struct json_at *parent;     /* NULL: the document itself */
    const char *source;               /* the file's name, for messages */
    const char *key;                  /* of a member; NULL: an element, or the document */
    size_t index;                     /* of an element, from 0 */
    const cJSON *value;               /* NULL: not there */
    const struct json_origin *origin; /* NULL: places are named by their path */
};

/* How a place in the text is named in messages. */
enum json_lines {
    JSON_DOCUMENT, /* source:line:column */
    JSON_ONE_LINE  /* source:column, for a text of one line whose source ends in its line */
};

/*
 * Parses a JSON text (RFC 8259) of `length` bytes. Refused, with line and column (both from 1,
 * columns in characters): bytes that are not UTF-8, whatever the grammar does not allow, text
 * behind the value, nesting beyond JSON_MAX_DEPTH, U+0000 in a string. Refused, with the path:
 * numbers too large for a double, a key twice in an object, at whatever level. A byte order mark
 * at the start is passed over. On RF_OK the caller deletes *document (cJSON_Delete); else it is
 * NULL. RF_SYNTAX, RF_REFUSED, RF_MEMORY.
 */
enum rf_status json_parse(const char *bytes, size_t length, const char *source,
                          enum json_lines lines, cJSON **document, struct rf_error *error);

/*
 * Offset of the first byte that no JSON text could have there, `length` where the text is good as
 * far as it goes; *complete says whether it is one whole value.
 */
size_t json_scan(const char *bytes, size_t length, bool *complete);

/* Places. `json_member` of what is no object, or has no such key, has no value. */
struct json_at json_document(const cJSON *document, const char *source);
struct json_at json_member(const struct json_at *at, const char *key);
/* Element or member `value` of `at`, when going through its children: see JSON_EACH. */
struct json_at json_child(const struct json_at *at, size_t index, const cJSON *value);

/* Goes through the elements of an array or the members of an object:
 *     JSON_EACH(&points, point, i)
 *         status = read_point(&point, error);
 * `point` is a struct json_at, `i` a size_t. */
#define JSON_EACH(at, child, i)                                                                    \
    for (size_t i = 0, i##_more = 1; i##_more == 1; i##_more = 0)                                  \
        for (struct json_at child = json_child((at), 0, json_first((at))); child.value != NULL;    \
             i++, child = json_child((at), i, child.value->next))
const cJSON *json_first(const struct json_at *at); /* NULL: no children, or no container */
size_t json_count(const struct json_at *at);       /* children; 0 where it is no container */

/* Whether something other than null is there; whether the key begins x_ (kept and ignored). */
bool json_given(const struct json_at *at);
bool json_is_private(const char *key);

/*
 * Checked access. `needs` says in a few words what would be right ("metres from 0.1 to 500"); it
 * ends the message. A value that is not there is refused as missing: ask `json_given` first where
 * it may be. All: RF_REFUSED, RF_MEMORY.
 */

/* An object whose keys are all among `known` (n of them; NULL: any key) or begin x_. */
enum rf_status json_object(const struct json_at *at, const char *const known[], size_t n,
                           struct rf_error *error);
enum rf_status json_array(const struct json_at *at, size_t least, size_t most, const char *needs,
                          struct rf_error *error);
/* low ≤ number ≤ high; -0 is refused where low ≥ 0. */
enum rf_status json_number(const struct json_at *at, double low, double high, const char *needs,
                           double *number, struct rf_error *error);
/* The string lives as long as the document. */
enum rf_status json_string(const struct json_at *at, const char *needs, const char **string,
                           struct rf_error *error);
enum rf_status json_boolean(const struct json_at *at, bool *boolean, struct rf_error *error);
/* One of n names; *index says which. The refusal names the nearest, or them all. */
enum rf_status json_choice(const struct json_at *at, const char *const names[], size_t n,
                           size_t *index, struct rf_error *error);

/* Refusals of the caller's own: "source: path: message". */
enum rf_status json_fail(const struct json_at *at, struct rf_error *error, enum rf_status status,
                         const char *format, ...) RF_PRINTF(4, 5);
/* "source: path: found …; needs …", or "source: path: missing; needs …". */
enum rf_status json_fail_found(const struct json_at *at, struct rf_error *error, const char *needs);

/* A value in a few words, for a message ("\"kitchen\"", "0.4", "a list"); strings shortened. */
void json_describe(const cJSON *value, struct text *out);

#endif
