/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef TESTS_BENCH_CALIBRATION_H
#define TESTS_BENCH_CALIBRATION_H

/* How far confidence and share right are apart, over bins of the first-ranked confidence. */

#include <math.h>
#include <stdbool.h>
#include <stddef.h>

enum { N_BINS = 6 };

static const double bounds[N_BINS + 1] = {0, 0.2, 0.4, 0.6, 0.8, 0.95, 1};

struct bin {
    size_t n, right;
    double confidence; /* summed */
};

static inline void count_in_bin(struct bin bins[N_BINS], double confidence, bool right)
{
    size_t bin = 0;
    while (bin + 1 < N_BINS && confidence >= bounds[bin + 1])
        bin++;
    bins[bin].n++;
    bins[bin].right += right;
    bins[bin].confidence += confidence;
}

/* Σ_b n_b/N · |mean confidence in b − share right in b|. */
static inline double calibration_error(const struct bin bins[N_BINS])
{
    double error = 0, n = 0;
    for (size_t i = 0; i < N_BINS; i++) {
        error += fabs(bins[i].confidence - (double)bins[i].right);
        n += (double)bins[i].n;
    }
    return n > 0 ? error / n : NAN;
}

#endif
