/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "job/job_write.h"

#include "base/error.h"

#include <cjson/cJSON.h>

/* Containers are spread over lines down to a depth, and of them only the document itself, those
 * that hold objects, and those that would make a long line. */
enum { SPREAD_DEPTH = 3, SHORT_MOST = 12 };

static bool is_container(const cJSON *value)
{
    return cJSON_IsObject(value) || cJSON_IsArray(value);
}

/* Whether objects stand in it, or in its children. */
static bool holds_objects(const cJSON *value, int levels)
{
    for (const cJSON *child = value->child; child != NULL; child = child->next)
        if (cJSON_IsObject(child) || (levels > 1 && holds_objects(child, levels - 1)))
            return true;
    return false;
}

static bool is_spread(const cJSON *value, size_t depth)
{
    if (depth == 0)
        return true;
    return depth < SPREAD_DEPTH &&
           (holds_objects(value, 2) || cJSON_GetArraySize(value) > SHORT_MOST);
}

/* What is no container, as cJSON writes it. */
static void write_leaf(const cJSON *value, struct text *out)
{
    char *printed = cJSON_PrintUnformatted(value);
    if (printed == NULL) {
        out->failed = true;
        return;
    }
    text_add(out, printed);
    cJSON_free(printed);
}

static void write_key(const char *key, struct text *out)
{
    cJSON *name = cJSON_CreateStringReference(key);
    if (name == NULL) {
        out->failed = true;
        return;
    }
    write_leaf(name, out);
    text_add(out, ": ");
    cJSON_Delete(name);
}

/* Between two children: a new line, indented, or a blank. */
static void write_gap(bool spread, size_t depth, struct text *out)
{
    if (!spread) {
        text_add(out, " ");
        return;
    }
    text_add(out, "\n");
    for (size_t i = 0; i <= depth; i++)
        text_add(out, " ");
}

/* Depth is bounded by the reader's JSON_MAX_DEPTH. */
static void write_value(const cJSON *value, size_t depth, bool may_spread, struct text *out)
{
    if (!is_container(value)) {
        write_leaf(value, out);
        return;
    }
    bool object = cJSON_IsObject(value);
    bool spread = may_spread && is_spread(value, depth);
    text_add(out, object ? "{" : "[");
    for (const cJSON *child = value->child; child != NULL; child = child->next) {
        if (child != value->child) {
            text_add(out, ",");
            write_gap(spread, depth, out);
        } else if (spread && depth > 0) {
            write_gap(true, depth, out);
        }
        if (object)
            write_key(child->string, out);
        write_value(child, depth + 1, may_spread, out);
    }
    text_add(out, object ? "}" : "]");
}

static enum rf_status written(const struct text *out, struct rf_error *error)
{
    return out->failed ? fail_memory(error) : RF_OK;
}

enum rf_status job_write_document(const struct cJSON *document, struct text *out,
                                  struct rf_error *error)
{
    write_value(document, 0, true, out);
    text_add(out, "\n");
    return written(out, error);
}

enum rf_status job_write(const struct rf_job *job, struct text *out, struct rf_error *error)
{
    return job_write_document(job->document, out, error);
}

enum rf_status job_write_line(const struct rf_job *job, struct text *out, struct rf_error *error)
{
    write_value(job->document, 0, false, out);
    return written(out, error);
}
