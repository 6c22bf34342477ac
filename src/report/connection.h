/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef REPORT_CONNECTION_H
#define REPORT_CONNECTION_H

#include "fit/forward.h"
#include "report/scene.h"

/* How the ends are joined at the board for a reading, and where the meter goes. */
void connection_drawing(const struct rf_job *job, const struct measurement *read,
                        struct scene *scene);

#endif
