/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef REPORT_RING_MAP_H
#define REPORT_RING_MAP_H

#include "diagnosis/diagnosis.h"
#include "report/scene.h"

enum { FINDINGS_DRAWN = 3 };

/* The ring as it runs from the board and back, with what the diagnosis says of it. */
void ring_map(const struct rf_diagnosis *diagnosis, struct scene *scene);

/* Whether places stand on the map by their number in the list of places. */
bool ring_map_numbers(const struct rf_job *job);
/* The place's number there, from 1: ring points in ring order, spur points behind them. */
size_t place_number(const struct rf_job *job, size_t place);

/* The letter of the i-th finding on the map and in lists, or 0 where it is not drawn. */
char finding_letter(const struct rf_diagnosis *diagnosis, size_t finding);

/* Chances added over opening and checking: at a place, in a run, in the board. */
double chance_at_place(const struct rf_diagnosis *diagnosis, size_t place);
double chance_in_run(const struct rf_diagnosis *diagnosis, size_t run);
double chance_at_board(const struct rf_diagnosis *diagnosis);

#endif
