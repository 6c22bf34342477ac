/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef BENCH_DIFFERENCE_H
#define BENCH_DIFFERENCE_H

/* How far two diagnoses of one job are apart. */

#include "diagnosis/diagnosis.h"

#include <math.h>

/* 0 where it is not listed. */
static inline double confidence_of(const struct rf_diagnosis *d,
                                   const struct hypothesis *hypothesis)
{
    for (size_t i = 0; i < d->n_ranked; i++)
        if (hypothesis_equal(&d->ranked[i].hypothesis, hypothesis))
            return d->ranked[i].confidence;
    return 0;
}

/* The largest difference of a confidence that either lists. */
static inline double largest_change(const struct rf_diagnosis *one,
                                    const struct rf_diagnosis *other)
{
    double largest = 0;
    for (size_t i = 0; i < one->n_ranked; i++)
        largest = fmax(largest, fabs(one->ranked[i].confidence -
                                     confidence_of(other, &one->ranked[i].hypothesis)));
    for (size_t i = 0; i < other->n_ranked; i++)
        largest = fmax(largest, fabs(other->ranked[i].confidence -
                                     confidence_of(one, &other->ranked[i].hypothesis)));
    return largest;
}

#endif
