/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "review/input.h"

#include "base/error.h"
#include "base/memory.h"
#include "base/text.h"
#include "job/job.h"

#include <dirent.h>
#include <errno.h>
#include <string.h>
#include <sys/stat.h>

enum { DEPTH_MAX = 64 };

/* A folder being gone through. */
struct folder {
    char *path;
    char **names;
    size_t n, capacity, next;
};

struct review_input {
    char *const *paths;
    size_t n_paths, next_path;
    struct folder folders[DEPTH_MAX];
    size_t depth;
    struct rf_job_reader *reader; /* NULL: between files */
    uint64_t bytes_before;        /* of files that are closed */
    size_t passed_over;
};

/* --- folders --- */

static void finish_folder(struct folder *folder)
{
    for (size_t i = 0; i < folder->n; i++)
        free(folder->names[i]);
    free(folder->names);
    free(folder->path);
    *folder = (struct folder){0};
}

static bool add_name(struct folder *folder, const char *name)
{
    if (folder->n == folder->capacity) {
        size_t capacity = folder->capacity > 0 ? 2 * folder->capacity : 64;
        char **names = realloc(folder->names, capacity * sizeof *names);
        if (names == NULL)
            return false;
        folder->names = names;
        folder->capacity = capacity;
    }
    folder->names[folder->n] = text_duplicate(name);
    return folder->names[folder->n] != NULL && ++folder->n > 0;
}

static int by_bytes(const void *a, const void *b)
{
    char *const *one = a, *const *other = b;
    return strcmp(*one, *other);
}

static enum rf_status read_names(struct folder *folder, DIR *directory, struct rf_error *error)
{
    for (;;) {
        errno = 0;
        const struct dirent *entry = readdir(directory);
        if (entry == NULL)
            break;
        if (entry->d_name[0] != '.' && !add_name(folder, entry->d_name))
            return fail_memory(error);
    }
    if (errno != 0)
        return fail(error, RF_IO, "%s: cannot be read: %s", folder->path, strerror(errno));
    if (folder->n > 0)
        qsort(folder->names, folder->n, sizeof *folder->names, by_bytes);
    return RF_OK;
}

/* Takes `path` over. */
static enum rf_status enter_folder(struct review_input *input, char *path, struct rf_error *error)
{
    if (input->depth == DEPTH_MAX) {
        enum rf_status status =
            fail(error, RF_LIMIT, "%s: found folders %d deep; needs fewer", path, DEPTH_MAX + 1);
        free(path);
        return status;
    }
    struct folder *folder = &input->folders[input->depth];
    *folder = (struct folder){.path = path};
    DIR *directory = opendir(path);
    enum rf_status status =
        directory != NULL ? read_names(folder, directory, error)
                          : fail(error, RF_IO, "%s: cannot be read: %s", path, strerror(errno));
    if (directory != NULL)
        closedir(directory);
    if (status == RF_OK)
        input->depth++;
    else
        finish_folder(folder);
    return status;
}

static bool is_job_name(const char *name)
{
    static const char *const endings[] = {".json", ".ndjson", ".jsonl", ".csv", ".tsv"};
    size_t length = strlen(name);
    for (size_t i = 0; i < sizeof endings / sizeof endings[0]; i++) {
        size_t end = strlen(endings[i]);
        if (length > end && strcmp(name + length - end, endings[i]) == 0)
            return true;
    }
    return false;
}

/* --- files --- */

static char *join_path(const char *folder, const char *name)
{
    struct text path = {0};
    size_t length = strlen(folder);
    text_addf(&path, "%s%s%s", folder, length > 0 && folder[length - 1] == '/' ? "" : "/", name);
    if (path.failed)
        text_finish(&path);
    return path.bytes;
}

/* The next entry of the innermost folder: *path, the caller's, is a file to read, or NULL where
 * the entry was none. */
static enum rf_status next_in_folder(struct review_input *input, char **path,
                                     struct rf_error *error)
{
    struct folder *folder = &input->folders[input->depth - 1];
    *path = NULL;
    if (folder->next == folder->n) {
        finish_folder(folder);
        input->depth--;
        return RF_OK;
    }
    const char *name = folder->names[folder->next++];
    char *joined = join_path(folder->path, name);
    struct stat link, about;
    if (joined == NULL)
        return fail_memory(error);
    if (lstat(joined, &link) == 0 && S_ISDIR(link.st_mode))
        return enter_folder(input, joined, error);
    /* What cannot be looked at is left to the reader, which says why. */
    if (is_job_name(name) && (stat(joined, &about) != 0 || S_ISREG(about.st_mode))) {
        *path = joined;
        return RF_OK;
    }
    input->passed_over++;
    free(joined);
    return RF_OK;
}

/* The next file to read, the caller's; NULL at the end. */
static enum rf_status next_file(struct review_input *input, char **path, struct rf_error *error)
{
    *path = NULL;
    while (input->depth > 0) {
        enum rf_status status = next_in_folder(input, path, error);
        if (status != RF_OK || *path != NULL)
            return status;
    }
    if (input->next_path == input->n_paths)
        return RF_OK;
    const char *given = input->paths[input->next_path++];
    struct stat about;
    char *copy = text_duplicate(given);
    if (copy == NULL)
        return fail_memory(error);
    if (strcmp(given, "-") != 0 && stat(given, &about) == 0 && S_ISDIR(about.st_mode)) {
        enum rf_status status = enter_folder(input, copy, error);
        return status == RF_OK ? next_file(input, path, error) : status;
    }
    *path = copy;
    return RF_OK;
}

static void close_reader(struct review_input *input)
{
    if (input->reader != NULL)
        input->bytes_before += job_reader_bytes(input->reader);
    rf_job_reader_close(input->reader);
    input->reader = NULL;
}

/* --- the outside --- */

enum rf_status review_input_open(char *const paths[], size_t n, struct review_input **input,
                                 struct rf_error *error)
{
    *input = NEW(struct review_input);
    if (*input == NULL)
        return fail_memory(error);
    (*input)->paths = paths;
    (*input)->n_paths = n;
    return RF_OK;
}

void review_input_close(struct review_input *input)
{
    if (input == NULL)
        return;
    rf_job_reader_close(input->reader);
    for (size_t i = 0; i < input->depth; i++)
        finish_folder(&input->folders[i]);
    free(input);
}

enum rf_status review_input_next(struct review_input *input, struct rf_job **job,
                                 struct rf_error *error)
{
    *job = NULL;
    for (;;) {
        enum rf_status status;
        if (input->reader == NULL) {
            char *path;
            status = next_file(input, &path, error);
            if (status != RF_OK || path == NULL)
                return status;
            status = rf_job_reader_open(path, &input->reader, error);
            free(path);
            if (status != RF_OK)
                return status;
        }
        status = rf_job_reader_next(input->reader, job, error);
        if (status == RF_IO)
            close_reader(input);
        if (status != RF_OK || *job != NULL)
            return status;
        close_reader(input);
    }
}

size_t review_input_passed_over(const struct review_input *input)
{
    return input->passed_over;
}

uint64_t review_input_read(const struct review_input *input)
{
    return input->bytes_before + (input->reader != NULL ? job_reader_bytes(input->reader) : 0);
}

uint64_t review_input_bytes(char *const paths[], size_t n)
{
    struct review_input *input;
    uint64_t bytes = 0;
    bool known = true;
    if (review_input_open(paths, n, &input, NULL) != RF_OK)
        return 0;
    while (known) {
        char *path;
        struct stat about;
        enum rf_status status = next_file(input, &path, NULL);
        if (status == RF_MEMORY || (status == RF_OK && path == NULL))
            break;
        if (status != RF_OK)
            continue;
        if (strcmp(path, "-") == 0)
            known = false;
        else if (stat(path, &about) == 0 && S_ISREG(about.st_mode))
            bytes += (uint64_t)about.st_size;
        else
            known = false;
        free(path);
    }
    review_input_close(input);
    return known ? bytes : 0;
}
