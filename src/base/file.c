/* SPDX-License-Identifier: GPL-3.0-or-later */
#define _DEFAULT_SOURCE /* flock, realpath */

#include "base/file.h"

#include "base/error.h"
#include "base/memory.h"

#include <errno.h>
#include <fcntl.h>
#include <stdio.h>
#include <string.h>
#include <sys/file.h>
#include <sys/stat.h>
#include <unistd.h>

struct file_hold {
    int fd;      /* the file as it now stands; the lock is on it */
    int folder;  /* it is in */
    char *name;  /* for messages, as the caller has it */
    char *path;  /* links followed */
    char *fresh; /* the file beside */
};

static enum rf_status fail_system(const char *path, const char *what, struct rf_error *error)
{
    return fail(error, RF_IO, "%s: cannot %s: %s", path, what, strerror(errno));
}

static enum rf_status read_all(int fd, const char *path, size_t most, struct text *bytes,
                               struct rf_error *error)
{
    char block[65536];
    for (;;) {
        ssize_t n = read(fd, block, sizeof block);
        if (n < 0 && errno == EINTR)
            continue;
        if (n < 0)
            return fail_system(path, "be read", error);
        if (n == 0)
            return RF_OK;
        if (bytes->length + (size_t)n > most)
            return fail(error, RF_LIMIT, "%s: found more than %zu bytes; needs at most so many",
                        path, most);
        text_append(bytes, block, (size_t)n);
        if (bytes->failed)
            return fail_memory(error);
    }
}

/* Refuses what is no file before it is opened: opening a device can do things. */
static enum rf_status check_kind(const char *path, bool pipe_too, struct rf_error *error)
{
    struct stat about;
    if (stat(path, &about) != 0)
        return fail_system(path, "be read", error);
    if (S_ISDIR(about.st_mode))
        return fail(error, RF_REFUSED, "%s: found a folder; needs a file", path);
    if (!S_ISREG(about.st_mode) && !(pipe_too && S_ISFIFO(about.st_mode)))
        return fail(error, RF_REFUSED, "%s: found a device, pipe or socket; needs a file", path);
    return RF_OK;
}

enum rf_status file_read(const char *path, size_t most, struct text *bytes, struct rf_error *error)
{
    if (strcmp(path, "-") == 0)
        return read_all(STDIN_FILENO, "standard input", most, bytes, error);
    enum rf_status status = check_kind(path, true, error);
    if (status != RF_OK)
        return status;
    int fd = open(path, O_RDONLY | O_CLOEXEC | O_NOCTTY);
    if (fd < 0)
        return fail_system(path, "be read", error);
    status = read_all(fd, path, most, bytes, error);
    close(fd);
    return status;
}

void file_release(struct file_hold *hold)
{
    if (hold == NULL)
        return;
    if (hold->fd >= 0)
        close(hold->fd);
    if (hold->folder >= 0)
        close(hold->folder);
    free(hold->name);
    free(hold->path);
    free(hold->fresh);
    free(hold);
}

/* A hold on nothing yet; takes `path`, an absolute one, over. */
static enum rf_status make_hold(const char *name, char *path, struct file_hold **hold,
                                struct rf_error *error)
{
    struct file_hold *made = path != NULL ? NEW(struct file_hold) : NULL;
    if (made == NULL) {
        free(path);
        return fail_memory(error);
    }
    *made = (struct file_hold){.fd = -1, .folder = -1, .path = path};
    char *slash = strrchr(path, '/');
    struct text fresh = {0};
    text_append(&fresh, path, (size_t)(slash + 1 - path));
    text_addf(&fresh, ".%s.new", slash + 1);
    made->fresh = fresh.bytes;
    made->name = text_duplicate(name);
    enum rf_status status = fresh.failed || made->name == NULL ? fail_memory(error) : RF_OK;
    if (status == RF_OK) {
        *slash = '\0';
        made->folder = open(path[0] != '\0' ? path : "/", O_RDONLY | O_DIRECTORY | O_CLOEXEC);
        if (made->folder < 0)
            status = fail_system(name, "open its folder", error);
        *slash = '/';
    }
    if (status == RF_OK)
        *hold = made;
    else
        file_release(made);
    return status;
}

/* Whether the name still leads to the file that was opened, and not to one that replaced it
 * between opening and locking. */
static bool is_current(const struct file_hold *hold)
{
    struct stat held, named;
    return fstat(hold->fd, &held) == 0 && stat(hold->path, &named) == 0 &&
           held.st_dev == named.st_dev && held.st_ino == named.st_ino;
}

static enum rf_status lock(struct file_hold *hold, struct rf_error *error)
{
    for (int attempt = 0; attempt < 100; attempt++) {
        if (hold->fd >= 0)
            close(hold->fd);
        hold->fd = open(hold->path, O_RDWR | O_CLOEXEC | O_NOCTTY);
        if (hold->fd < 0)
            return fail_system(hold->name, "be written", error);
        if (flock(hold->fd, LOCK_EX | LOCK_NB) != 0) {
            if (errno != EWOULDBLOCK)
                return fail_system(hold->name, "be locked", error);
            break;
        }
        if (is_current(hold))
            return RF_OK;
    }
    return fail(error, RF_BUSY,
                "%s: somebody else is writing this file; try again when they are "
                "done",
                hold->name);
}

enum rf_status file_hold(const char *path, size_t most, struct file_hold **hold, struct text *bytes,
                         struct rf_error *error)
{
    struct file_hold *made = NULL;
    *hold = NULL;
    enum rf_status status = check_kind(path, false, error);
    if (status != RF_OK)
        return status;
    char *real = realpath(path, NULL);
    if (real == NULL)
        return fail_system(path, "be read", error);
    status = make_hold(path, real, &made, error);
    if (status == RF_OK)
        status = lock(made, error);
    if (status == RF_OK)
        status = read_all(made->fd, path, most, bytes, error);
    if (status == RF_OK)
        *hold = made;
    else
        file_release(made);
    return status;
}

static enum rf_status write_all(int fd, const struct text *bytes, const char *name,
                                struct rf_error *error)
{
    for (size_t at = 0; at < bytes->length;) {
        ssize_t n = write(fd, bytes->bytes + at, bytes->length - at);
        if (n < 0 && errno == EINTR)
            continue;
        if (n < 0)
            return fail_system(name, "be written", error);
        at += (size_t)n;
    }
    return fsync(fd) == 0 ? RF_OK : fail_system(name, "be written", error);
}

/* Writes the file beside, on the disk and locked; *fd is the caller's. */
static enum rf_status write_fresh(const struct file_hold *hold, const struct stat *like,
                                  const struct text *bytes, int *fd, struct rf_error *error)
{
    if (bytes->failed)
        return fail_memory(error);
    unlink(hold->fresh); /* of one that was killed; the lock says that none is at work */
    *fd = open(hold->fresh, O_RDWR | O_CREAT | O_EXCL | O_CLOEXEC | O_NOFOLLOW, 0666);
    if (*fd < 0)
        return fail_system(hold->name, "make a file beside it", error);
    enum rf_status status = RF_OK;
    if (like != NULL) {
        /* Only the owner or root may keep another owner; the mode comes after, for chown
         * takes bits away. */
        if (fchown(*fd, like->st_uid, like->st_gid) != 0)
            errno = 0;
        if (fchmod(*fd, like->st_mode & 07777) != 0)
            status = fail_system(hold->name, "keep its mode", error);
    }
    if (status == RF_OK && flock(*fd, LOCK_EX | LOCK_NB) != 0)
        status = fail_system(hold->name, "be locked", error);
    if (status == RF_OK)
        status = write_all(*fd, bytes, hold->name, error);
    if (status != RF_OK) {
        unlink(hold->fresh);
        close(*fd);
        *fd = -1;
    }
    return status;
}

enum rf_status file_replace(struct file_hold *hold, const struct text *bytes,
                            struct rf_error *error)
{
    struct stat about;
    int fd = -1;
    if (fstat(hold->fd, &about) != 0)
        return fail_system(hold->name, "be read", error);
    enum rf_status status = write_fresh(hold, &about, bytes, &fd, error);
    if (status != RF_OK)
        return status;
    if (rename(hold->fresh, hold->path) != 0) {
        status = fail_system(hold->name, "be replaced", error);
        unlink(hold->fresh);
        close(fd);
        return status;
    }
    close(hold->fd);
    hold->fd = fd;
    return fsync(hold->folder) == 0 ? RF_OK : fail_system(hold->name, "be written", error);
}

/* The path of a file that may not be there yet, from its folder's; NULL, with errno. */
static char *path_of_new(const char *path)
{
    const char *slash = strrchr(path, '/');
    struct text whole = {0};
    text_append(&whole, slash != NULL ? path : "./",
                slash != NULL ? (size_t)(slash + 1 - path) : 2);
    char *folder = whole.failed ? NULL : realpath(whole.bytes, NULL);
    int reason = whole.failed ? ENOMEM : errno;
    text_clear(&whole);
    if (folder != NULL)
        text_addf(&whole, "%s/%s", strcmp(folder, "/") == 0 ? "" : folder,
                  slash != NULL ? slash + 1 : path);
    if (folder == NULL || whole.failed) {
        text_finish(&whole);
        errno = folder == NULL ? reason : ENOMEM;
    }
    free(folder);
    return whole.bytes;
}

enum rf_status file_create(const char *path, const struct text *bytes, struct file_hold **hold,
                           struct rf_error *error)
{
    struct file_hold *made = NULL;
    int fd = -1;
    *hold = NULL;
    char *whole = path_of_new(path);
    if (whole == NULL)
        return errno == ENOMEM ? fail_memory(error) : fail_system(path, "be made", error);
    enum rf_status status = make_hold(path, whole, &made, error);
    if (status != RF_OK)
        return status;
    status = write_fresh(made, NULL, bytes, &fd, error);
    if (status == RF_OK) {
        /* link, unlike rename, takes no name that is in use. */
        if (link(made->fresh, made->path) != 0)
            status = errno == EEXIST
                         ? fail(error, RF_REFUSED,
                                "%s: is there already; needs the name of a new file", path)
                         : fail_system(path, "be made", error);
        unlink(made->fresh);
    }
    made->fd = fd;
    if (status == RF_OK && fsync(made->folder) != 0)
        status = fail_system(path, "be made", error);
    if (status == RF_OK)
        *hold = made;
    else
        file_release(made);
    return status;
}
