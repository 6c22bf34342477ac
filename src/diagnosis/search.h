/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef DIAGNOSIS_SEARCH_H
#define DIAGNOSIS_SEARCH_H

/*
 * Which hypotheses are fitted, and when. On most rings: all, at once. On a large one faults between two
 * places are most of them, as many as the square of the points, though neighbours among them read
 * much alike; so these are fitted from coarse to fine. First those between places of a grid; then, with
 * the grid's spacing as a step, the neighbours of the best of each family, until none of them is
 * new; the same with half the step, down to one; in the end the neighbours of everything within reach
 * of the best, until none is new. What is never fitted weighs nothing.
 */

#include "diagnosis/steps.h"

struct search;

/* NULL when memory is short. The candidates outlive it and keep their order. */
struct search *search_create(const struct candidates *candidates, size_t n_places);
void search_destroy(struct search *search); /* takes NULL */

/* The next to fit, as indices into the list, good until the next call; 0: no more. `reach`: the log
 * weight from which one counts. Reads what the fits so far have written into the candidates. */
size_t search_next(struct search *search, double reach, const size_t **indices);

/* Whether there are so many that some may never be fitted. */
bool search_is_coarse(const struct candidates *candidates);

#endif
