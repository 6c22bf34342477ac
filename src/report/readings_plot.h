/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef REPORT_READINGS_PLOT_H
#define REPORT_READINGS_PLOT_H

#include "diagnosis/diagnosis.h"
#include "report/scene.h"

/* The readings of a set-up along the ring by fitted distance: as read, fitted, as a sound ring
 * would have them, the last two with their 2 σ. RF_NUMERICAL, RF_MEMORY, RF_REFUSED. */
enum rf_status readings_plot(const struct rf_diagnosis *diagnosis, size_t setup,
                             struct scene *scene, struct rf_error *error);

/* Rounds up to 1, 2 or 5 times a power of ten: steps of an axis. */
double axis_step(double range, double steps);

#endif
