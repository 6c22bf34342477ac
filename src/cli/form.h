/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef CLI_FORM_H
#define CLI_FORM_H

/* A job that is being begun: its document, and the file it goes to. */

#include "base/file.h"
#include "cli/command.h"
#include "job/job.h"
#include "job/sheet.h"

#include <cjson/cJSON.h>

struct form {
    const char *path;
    bool as_json;
    struct sheet_style style;
    cJSON *document;
    size_t n_points, n_spurs; /* asked for; spur points come in when their place is told */
    size_t setups[N_SETUPS], n_setups;
    struct file_hold *hold; /* NULL: not written yet */
};

/* Makes the document agree with n_points: points P1 … in ring order, what is known of them kept. */
enum rf_status form_lay_points(struct form *form, struct rf_error *error);
/* The spur point S1 … that hangs on `from`, made or moved; NULL takes it away. */
enum rf_status form_hang_spur(struct form *form, size_t spur, const char *from,
                              struct rf_error *error);
cJSON *form_ring(const struct form *form);
/* The member of that name, made as an object if it is not there; NULL: memory is short. */
cJSON *form_object(cJSON *in, const char *key);

/* "cross_ln,cross_le" into setups; "" is none. RF_USAGE. */
enum rf_status form_choose_setups(struct form *form, const char *list, struct rf_error *error);

/* The document as a job; it may have no reading. */
enum rf_status form_job(const struct form *form, struct rf_job **job, struct rf_error *error);
/* Writes the file, the first time a new one. */
enum rf_status form_save(struct form *form, struct rf_error *error);

/* Asks on standard output, reads answers from standard input, saves after each. */
enum rf_status form_ask(struct form *form, const struct rf_models *models, bool points_known,
                        struct rf_error *error);

#endif
