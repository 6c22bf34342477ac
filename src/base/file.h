/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef BASE_FILE_H
#define BASE_FILE_H

/*
 * Files that are read whole, and files that are replaced so that nobody ever finds half of one:
 * what is new goes into a file beside the old, to the disk, and takes the old one's name.
 *
 * A held file is locked (flock) against others that hold files. The lock goes with the process, so
 * a killed one leaves none behind; what it may leave is the file beside, ".NAME.new", which the
 * next one overwrites.
 */

#include "base/text.h"

#include <ringfettle/status.h>

struct file_hold;

/* Appends the bytes of a file, or of standard input ("-"); at most `most`. RF_IO, RF_REFUSED (no
 * file, a folder, a device), RF_LIMIT, RF_MEMORY. */
enum rf_status file_read(const char *path, size_t most, struct text *bytes, struct rf_error *error);

/*
 * Holds a regular file that may be written and appends its bytes; symbolic links are followed.
 * On RF_OK the caller releases *hold; else it is NULL. RF_BUSY: somebody else holds it. As
 * file_read else.
 */
enum rf_status file_hold(const char *path, size_t most, struct file_hold **hold, struct text *bytes,
                         struct rf_error *error);

/* Makes and holds a file that is not there yet. RF_REFUSED: it is there; RF_IO, RF_MEMORY. */
enum rf_status file_create(const char *path, const struct text *bytes, struct file_hold **hold,
                           struct rf_error *error);

/* Replaces what the file holds; it keeps its mode, and its owner where that may be set. Whatever
 * is refused, and whenever the process dies, the file holds the old bytes or the new. Still held
 * afterwards. RF_IO, RF_MEMORY. */
enum rf_status file_replace(struct file_hold *hold, const struct text *bytes,
                            struct rf_error *error);

void file_release(struct file_hold *hold); /* takes NULL */

#endif
